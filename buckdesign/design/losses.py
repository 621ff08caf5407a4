"""Losses that the loop model leaves out, added on from its averages, and the whole loss budget.

Arrays first: the leading axis is the operating point. What an element is made of stands in `LossData`, one
entry a point, so that points of many designs go through in one call.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from functools import lru_cache
from operator import attrgetter
from typing import Any, TypeVar

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import COPPER_REFERENCE_C, COPPER_TEMPERATURE_COEFFICIENT
from buckdesign.design.elements import ResolvedDesign, WindingElement
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import SteadyStates
from buckdesign.physics.choke import flux_swing
from buckdesign.physics.core_loss import three_term_loss_triangular
from buckdesign.physics.diode import capacitance_loss, leakage, leakage_loss
from buckdesign.physics.ring import surface
from buckdesign.physics.safe_area import leakage as collector_leakage
from buckdesign.physics.winding import bore_porosity, wind, wound_dimensions
from buckdesign.physics.wire import skin_depth, winding_factor

Floats = NDArray[np.float64]

LOSSES: tuple[str, ...] = (
    "transistor_conduction", "transistor_switching", "transistor_leakage", "base", "drive_resistor",
    "regulator", "rectifier", "rectifier_recovery", "rectifier_leakage", "choke_copper", "choke_copper_ac",
    "choke_core", "output_capacitor", "input_capacitor", "divider",
)  # fmt: skip
"""All losses by name, disjoint; together they are input minus output."""

_LOOP_LOSSES: Mapping[str, str] = {
    "transistor_conduction": "transistor_conduction_w",
    "base": "base_w",
    "drive_resistor": "drive_resistor_w",
    "regulator": "regulator_w",
    "rectifier": "rectifier_w",
    "rectifier_recovery": "recovery_w",
    "choke_copper": "choke_copper_w",
    "output_capacitor": "output_capacitor_w",
    "divider": "divider_w",
}
"""Losses that the loop model accounts for itself, and its columns."""

LEAKAGE_CEILING_C = 200.0
"""Junction temperature up to which leakage is followed [degC] (own choice, above every junction limit): one
that is hotter without it has failed already, which is not called runaway."""

SHAPES = 4096
"""Wound shapes that are kept [1] (own choice)."""

DUTY_LIMITS = (0.02, 0.98)
"""Duty of the choke's flux beyond which its eddy loss is not extrapolated [1] (own choice)."""

Data = TypeVar("Data")


def data_by_point(
    resolved: Sequence[ResolvedDesign], record: Any, made: type[Data], depends: Sequence[str] = ()
) -> Data:
    """Values of the elements of each point's design as arrays.

    Parameters
    ----------
    resolved : sequence of ResolvedDesign
        The design of each point; the same object, or the same elements in it, may come again and again.
    record : callable
        Gives the values of one design by name, as numbers.
    made : type
        Dataclass of arrays that has a field for each.
    depends : sequence of str
        The two or more attributes of a design that the record looks at, so that it is made once for designs
        that share these; the whole design where empty.

    Returns
    -------
    object
        An instance of `made`, arrays of shape (n, ...).
    """
    marks = _marks(resolved, depends)
    first: dict[Any, int] = {}
    distinct: list[ResolvedDesign] = []
    for mark, one in zip(marks, resolved, strict=True):
        if mark not in first:
            first[mark] = len(distinct)
            distinct.append(one)
    index = np.array([first[mark] for mark in marks], dtype=np.intp)
    records = [record(one) for one in distinct]
    columns = {
        member.name: np.array([found[member.name] for found in records])[index]
        for member in fields(made)  # type: ignore[arg-type]
    }
    return made(**columns)


def _marks(resolved: Sequence[ResolvedDesign], depends: Sequence[str]) -> list[Any]:
    """Something for each design that is alike where the designs share what a record depends on."""
    if not depends:
        return [id(one) for one in resolved]
    parts = attrgetter(*depends)
    return [tuple(map(id, parts(one))) for one in resolved]


@dataclass(frozen=True, kw_only=True)
class LossData:
    """What the losses added on depend on, one entry a point.

    Attributes
    ----------
    transistor_leakage, transistor_leakage_at_c : NDArray
        Collector leakage [A] at a junction temperature [degC].
    capacitance : NDArray
        Junction capacitance of all rectifiers together [F].
    leakage, leakage_at_c, leakage_coefficient : NDArray
        Reverse current of all of them together [A] at a temperature [degC], exponent over temperature [1/K].
    input_esr : NDArray
        ESR of the input capacitor [ohm]; NaN without one.
    turns, area, volume : NDArray
        Turns [1], effective area [m2] and volume [m3] of the core; NaN for a bought choke.
    core : NDArray
        Coefficients of the three-term core loss as published, shape (n, 4); NaN where not known.
    wire, layers, porosity : NDArray
        Bare wire [m], layers at the bore [1], share of copper in a layer [1]; NaN for a bought choke.
    surface, diameter, choke_volume : NDArray
        Surface [m2], outer diameter [m] and envelope [m3] of the wound ring; NaN for a bought choke.
    wires, capacity : NDArray
        Wires through the bore and how many of them it takes [1]; NaN for a bought choke.
    """

    transistor_leakage: Floats
    transistor_leakage_at_c: Floats
    capacitance: Floats
    leakage: Floats
    leakage_at_c: Floats
    leakage_coefficient: Floats
    input_esr: Floats
    turns: Floats
    area: Floats
    volume: Floats
    core: Floats
    wire: Floats
    layers: Floats
    porosity: Floats
    surface: Floats
    diameter: Floats
    choke_volume: Floats
    wires: Floats
    capacity: Floats

    def part(self, which: NDArray[np.intp]) -> LossData:
        """Some of the points."""
        return LossData(**{one.name: getattr(self, one.name)[which] for one in fields(self)})


def loss_data(resolved: Sequence[ResolvedDesign]) -> LossData:
    """`LossData` of the design of each point."""
    depends = ("transistor", "rectifier", "choke", "input_capacitor")
    return data_by_point(resolved, _loss_record, LossData, depends)


def _loss_record(resolved: ResolvedDesign) -> dict[str, Any]:
    rectifier, source = resolved.rectifier, resolved.input_capacitor
    return {
        "transistor_leakage": resolved.transistor.leakage,
        "transistor_leakage_at_c": resolved.transistor.leakage_at_c,
        "capacitance": rectifier.capacitance * rectifier.parallel,
        "leakage": rectifier.leakage * rectifier.parallel,
        "leakage_at_c": rectifier.leakage_at_c,
        "leakage_coefficient": rectifier.leakage_coefficient,
        "input_esr": np.nan if source is None else source.esr,
        **_winding_record(resolved.choke.winding),
    }


_NO_WINDING: Mapping[str, Any] = {
    **dict.fromkeys(("turns", "area", "volume", "wire", "layers", "porosity", "surface", "diameter"), np.nan),
    "core": (np.nan,) * 4,
    **dict.fromkeys(("choke_volume", "wires", "capacity"), np.nan),
}


def _winding_record(winding: WindingElement | None) -> Mapping[str, Any]:
    if winding is None:
        return _NO_WINDING
    ring, wire, wires = winding.ring, winding.wire, winding.turns * winding.strands
    shape = _wound_shape(
        ring.outer_diameter,
        ring.inner_diameter,
        ring.height * winding.stack,
        wire.outer_diameter_grade1,
        wire.conductor_diameter,
        wires,
    )
    published = ring.wound_surface if winding.stack == 1 else None
    return {
        "turns": float(winding.turns),
        "area": winding.effective_area,
        "volume": winding.effective_volume,
        "core": winding.material.loss_coefficients or (np.nan,) * 4,
        "wire": wire.conductor_diameter,
        "wires": float(wires),
        **shape,
        "surface": published or shape["surface"],
    }


@lru_cache(maxsize=SHAPES)
def _wound_shape(
    outer: float, inner: float, height: float, wire: float, conductor: float, wires: int
) -> Mapping[str, float]:
    """What a winding's geometry gives [SI]; variants of a design mostly share it."""
    lay = wind(outer, inner, height, wire, wires)
    far, bore, tall = wound_dimensions(outer, inner, height, wire, lay.layers, lay.outside_layers)
    return {
        "layers": float(lay.layers),
        "porosity": float(bore_porosity(wires, lay.layers, conductor, inner, wire)),
        "surface": float(surface(far, bore, tall)),
        "diameter": float(far),
        "choke_volume": float(np.pi / 4 * np.square(far) * tall),
        "capacity": float(lay.capacity),
    }


def has_cycles(loop: SteadyStates) -> NDArray[np.bool_]:
    """Where the loop switches, shape (n,)."""
    return loop.column("frequency_hz") > 0.0


def junction_capacitance_loss(loop: SteadyStates, data: LossData) -> Floats:
    """Loss of charging the rectifier's junction through the transistor at each turn-off of the rectifier.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    data : LossData
        Of the same points.

    Returns
    -------
    NDArray
        [W], shape (n,); 0 where the loop does not switch. The energy that stays in the junction is returned
        to the choke when the transistor turns off.
    """
    loss = capacitance_loss(data.capacitance, loop.column("reverse_max_v"), loop.column("commutations_hz"))
    return np.where(has_cycles(loop), loss, 0.0)


def leakage_factor(loop: SteadyStates) -> Floats:
    """Mean over time of the voltage that the rectifier blocks [V], shape (n,)."""
    return loop.column("reverse_mean_v") * loop.column("blocking_fraction")


def rectifier_leakage_loss(loop: SteadyStates, data: LossData, junction_c: Floats) -> Floats:
    """Loss by the rectifier's reverse current at its junction temperature [W], shape (n,)."""
    current = leakage(data.leakage, junction_c, data.leakage_at_c, data.leakage_coefficient)
    loss = leakage_loss(loop.column("reverse_mean_v"), current, loop.column("blocking_fraction"))
    return np.asarray(loss, dtype=float)


def flux_density_swing(loop: SteadyStates, data: LossData) -> Floats:
    """Swing of the core's flux density, peak to peak [T], shape (n,); NaN for a bought choke."""
    return np.asarray(flux_swing(loop.column("choke_flux_swing_vs"), data.turns, data.area), dtype=float)


def core_loss(loop: SteadyStates, data: LossData) -> Floats:
    """Core loss with the triangular flux of the choke.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    data : LossData
        Of the same points.

    Returns
    -------
    NDArray
        [W], shape (n,); 0 where the loop does not switch, for a bought choke and where a material's
        coefficients are not known.

    Notes
    -----
    While the choke current rests at zero there is no flux to change: duty and frequency are those of the
    triangle alone, and its loss counts for the share of time that it takes. Where the periods differ, the
    largest swing counts for all, which is on the safe side.
    """
    busy = np.clip(1.0 - loop.column("idle_fraction"), 1e-6, 1.0)
    known = has_cycles(loop) & np.isfinite(data.core).all(axis=1) & np.isfinite(data.turns)
    frequency = np.where(known, loop.column("frequency_hz") / busy, 1.0)
    peak = np.where(known, flux_density_swing(loop, data) / 2.0, 1e-3)
    duty = np.clip(loop.column("duty") / busy, *DUTY_LIMITS)
    a, b, c, d = np.where(known, data.core.T, 1.0)
    density = three_term_loss_triangular(frequency, np.maximum(peak, 1e-9), duty, a, b, c, d)
    return np.where(known, density * data.volume * busy, 0.0)


def copper_resistance_factor(choke_c: Floats) -> Floats:
    """Copper resistance at a temperature over that at 20 degC [1]."""
    return 1.0 + COPPER_TEMPERATURE_COEFFICIENT * (choke_c - COPPER_REFERENCE_C)


def choke_ac_rms(loop: SteadyStates) -> Floats:
    """Rms of the alternating part of the choke current [A], shape (n,)."""
    square = np.square(loop.column("choke_rms_a")) - np.square(loop.column("choke_mean_a"))
    return np.sqrt(np.maximum(square, 0.0))


def winding_ac_factor(loop: SteadyStates, data: LossData, choke_c: Floats) -> Floats:
    """AC over DC resistance of the winding for the choke's ripple current.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    data : LossData
        Of the same points.
    choke_c : NDArray
        Temperature of the winding [degC], shape (n,).

    Returns
    -------
    NDArray
        [1], shape (n,); 1 where the loop does not switch and for a bought choke.

    Notes
    -----
    At the frequency of the sine whose slope and current have the rms values of the ripple,
    ``rms(di/dt) / (2 pi rms(i))``: C. R. Sullivan, IEEE Trans. Power Electronics 14 (1999) 283 (from memory).
    """
    ripple = choke_ac_rms(loop)
    known = has_cycles(loop) & np.isfinite(data.wire) & (ripple > 1e-9)
    factor = np.ones(len(loop))
    if known.any():
        frequency = loop.column("choke_slope_rms")[known] / (2.0 * np.pi * ripple[known])
        depth = skin_depth(frequency, choke_c[known])
        factor[known] = winding_factor(data.wire[known], depth, data.layers[known], data.porosity[known])
    return factor


def copper_ac_loss(loop: SteadyStates, resistance: Floats, factor: Floats) -> Floats:
    """Copper loss that the ripple causes beyond its share at DC resistance.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    resistance : NDArray
        DC resistance at temperature [ohm], shape (n,).
    factor : NDArray
        AC over DC resistance, see `winding_ac_factor` [1], shape (n,).

    Returns
    -------
    NDArray
        [W], shape (n,).
    """
    return resistance * np.square(choke_ac_rms(loop)) * (factor - 1.0)


def input_ripple_rms(loop: SteadyStates) -> Floats:
    """Rms of the alternating part of the stage's input current, which an input capacitor carries [A]."""
    square = np.square(loop.column("input_rms_a")) - np.square(loop.column("input_mean_a"))
    return np.sqrt(np.maximum(square, 0.0))


def input_capacitor_loss(loop: SteadyStates, esr: Floats) -> Floats:
    """Loss in the ESR of the input capacitor [W], shape (n,); 0 where the ESR is NaN, without one."""
    return np.where(np.isnan(esr), 0.0, esr) * np.square(input_ripple_rms(loop))


def transistor_leakage_loss(
    loop: SteadyStates, rows: Floats, data: LossData, junction_c: Floats, ambient_c: Floats
) -> Floats:
    """Loss by the transistor's leakage while it is off.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    rows : NDArray
        Loop parameters, shape (n, columns).
    data : LossData
        Of the same points.
    junction_c, ambient_c : NDArray
        Junction, ambient where it is not known [degC], shape (n,).

    Returns
    -------
    NDArray
        [W], shape (n,).

    Notes
    -----
    Derived: the voltage across it averages to ``V_in - V_out - R_L I`` over all times, nearly all of it
    while it is off.
    """
    across = rows[:, COLUMN["supply_voltage"]] - loop.column("output_voltage_v")
    across = np.maximum(across - rows[:, COLUMN["choke_resistance"]] * loop.column("choke_mean_a"), 0.0)
    hot = np.minimum(np.where(np.isnan(junction_c), ambient_c, junction_c), LEAKAGE_CEILING_C)
    idle = ~np.isin(loop.column("regime"), [1.0, 2.0, 3.0])
    current = collector_leakage(data.transistor_leakage, hot, data.transistor_leakage_at_c)
    return np.where(idle, across * current, 0.0)


def loop_losses(loop: SteadyStates) -> dict[str, Floats]:
    """The losses of the loop model itself by name [W], those added on as zeros.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.

    Returns
    -------
    dict of NDArray
        One entry for each of `LOSSES`, shape (n,). What sweeping the charge out of the rectifier costs stands
        under ``rectifier_recovery`` and not in ``transistor_switching``, although it heats the transistor.
    """
    losses = {name: np.zeros(len(loop)) for name in LOSSES}
    for name, column in _LOOP_LOSSES.items():
        losses[name] = loop.column(column).copy()
    losses["transistor_switching"] = loop.column("transistor_switching_w") - loop.column("recovery_w")
    return losses
