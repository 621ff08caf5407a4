"""Part limits at operating points, each with its margin.

Ratings are plain ones, without a safety factor of their own: the margin says how far they are. Predictions
take typical values; where a data sheet guarantees less, the check takes the guaranteed value and says both.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.heat_paths import HeatData, heat_data
from buckdesign.design.hot_parameters import RECTIFIER, TRANSISTOR
from buckdesign.design.limits import Limit, upper_limit
from buckdesign.design.losses import Floats, input_ripple_rms
from buckdesign.design.operated import Operated
from buckdesign.design.operating_point import Check
from buckdesign.design.ratings import RatingData, rating_data
from buckdesign.design.safe_area_check import safe_area_limit
from buckdesign.design.sections import DEVICES
from buckdesign.design.temperatures import device_heat, junctions
from buckdesign.physics.bias import flux_density
from buckdesign.physics.capacitor import electrolytic_life, ripple_rise
from buckdesign.physics.diode import conduction_loss, hottest_piece
from buckdesign.physics.pnp import base_current
from buckdesign.physics.regulator import current_limit
from buckdesign.units import format_quantity

LIFE_WANTED = 8760.0
"""Life of an electrolytic below which a design is refused: a year of continuous running [h] (own choice)."""

REFERENCE_C = 25.0
"""Margins of temperatures are relative to the rise from here to the limit [degC], whatever the ambient."""


def part_limits(operated: Operated, resolved: ResolvedDesign | Sequence[ResolvedDesign]) -> list[Limit]:
    """The limits of all parts at all points.

    Parameters
    ----------
    operated : Operated
        Operating points.
    resolved : ResolvedDesign or sequence of ResolvedDesign
        The design of each point; one stands for all.

    Returns
    -------
    list of Limit
        Always the same limits in the same order; `Limit.applies` says where one is known.
    """
    designs = [resolved] * len(operated) if isinstance(resolved, ResolvedDesign) else list(resolved)
    rating, heat = rating_data(designs), heat_data(designs)
    hottest = hottest_piece_at(operated, rating, heat)
    return [
        *_transistor_limits(operated, rating),
        safe_area_limit(operated, rating),
        *_rectifier_limits(operated, rating, hottest[0]),
        *_regulator_limits(operated, rating),
        *_capacitor_limits(operated, "output", rating.output),
        *_capacitor_limits(operated, "input", rating.input),
        *_junction_limits(operated, rating, heat, hottest[1]),
        *_choke_limits(operated, rating),
    ]


def _transistor_limits(operated: Operated, rating: RatingData) -> list[Limit]:
    loop = operated.loop
    drop = operated.parameter("threshold") + operated.parameter("slope") * loop.column("rectifier_max_a")
    voltage = operated.parameter("supply_voltage") + np.where(loop.column("rectifier_max_a") > 0.0, drop, 0.0)
    return [
        upper_limit("collector voltage", "V", voltage, rating.collector_voltage),
        upper_limit("collector current", "A", loop.column("collector_max_a"), rating.collector_current),
        _base_drive(operated, rating),
    ]


def _base_drive(operated: Operated, rating: RatingData) -> Limit:
    """Drive at hand against the drive that the collector's peak needs with the guaranteed gain."""
    loop, get = operated.loop, operated.parameter
    peak = np.maximum(loop.column("collector_max_a"), operated.load)
    emitter = rating.base_emitter_max
    needed = emitter / get("base_resistance") + base_current(peak, rating.gain_min, get("gain_knee"))
    across = get("supply_voltage") - emitter - get("dropout") - loop.column("output_voltage_v")
    by_resistor = across / (get("drive_resistance") + get("dropout_resistance") + 1e-12)
    limit = rating.current_limit_min
    far = get("current_limit_far") * limit / get("current_limit")
    difference = get("dropout") + get("dropout_resistance") * np.maximum(by_resistor, 0.0)
    by_limit = current_limit(
        difference, limit, get("current_limit_knee"), get("current_limit_far_voltage"), far
    )
    at_hand = np.maximum(np.minimum(by_resistor, by_limit), 0.0)
    switching = np.array([regime != "linear" for regime in loop.regimes()])
    return Limit(
        name="base drive",
        unit="A",
        value=at_hand,
        limit=needed,
        applies=switching,
        is_upper=False,
        note="at hand; needed by the peak at the guaranteed gain",
    )


def hottest_piece_at(operated: Operated, rating: RatingData, heat: HeatData) -> tuple[Floats, Floats]:
    """The piece of lowest drop among rectifiers in parallel, electro-thermally.

    Parameters
    ----------
    operated : Operated
        Operating points.
    rating, heat : RatingData, HeatData
        Of the same points.

    Returns
    -------
    tuple of NDArray
        Its mean current [A], and how much warmer it is than the mean of all [K]; shape (n,).
    """
    loop, pieces = operated.loop, rating.pieces
    mean, rms = loop.column("rectifier_mean_a"), loop.column("rectifier_rms_a")
    share = np.where(rms > 0.0, np.square(mean) / np.where(rms > 0.0, np.square(rms), 1.0), 0.0)
    current = np.where(share > 0.0, mean / np.where(share > 0.0, share, 1.0), 0.0)
    path = np.where(np.isfinite(heat.piece) & (not operated.electrical_only), heat.piece, 0.0) * share
    most, warmer = hottest_piece(
        current,
        pieces,
        operated.parameter("threshold"),
        rating.slope,
        rating.threshold_extra,
        rating.forward_coefficient,
        path,
    )
    return np.asarray(most * share, dtype=float), np.asarray(warmer * (1.0 - 1.0 / pieces), dtype=float)


def _rectifier_limits(operated: Operated, rating: RatingData, share: Floats) -> list[Limit]:
    loop = operated.loop
    current = loop.column("rectifier_mean_a")
    parallel = bool((rating.pieces > 1.0).any())
    return [
        upper_limit("rectifier reverse voltage", "V", loop.column("reverse_max_v"), rating.reverse_voltage),
        upper_limit(
            "rectifier current",
            "A",
            share,
            rating.average_current,
            "mean, in the piece of lowest drop" if parallel else "mean",
            typical=current / rating.pieces,
        ),
    ]


def _regulator_limits(operated: Operated, rating: RatingData) -> list[Limit]:
    loop = operated.loop
    in_base = np.square(rating.base_emitter_max) / operated.parameter("base_resistance")
    return [
        upper_limit("regulator difference", "V", loop.column("regulator_difference_max_v"), rating.max_difference),
        upper_limit(
            "regulator current",
            "A",
            loop.column("regulator_max_a"),
            rating.current_limit_min,
            "against the guaranteed current limit",
        ),
        upper_limit("drive resistor power", "W", operated.balance.losses["drive_resistor"], rating.rdrive_power),
        upper_limit("base-emitter resistor power", "W", in_base, rating.rbe_power, "transistor always driven"),
    ]


def _capacitor_limits(operated: Operated, side: str, rating: Floats) -> list[Limit]:
    """Voltage, ripple current and life; ratings as (voltage, ripple current, life, its temperature)."""
    loop = operated.loop
    voltage, ripple_rated, life, life_c = rating.T
    if side == "output":
        peak, ripple = loop.column("output_max_v"), loop.column("output_capacitor_rms_a")
    else:
        peak, ripple = operated.parameter("supply_voltage"), input_ripple_rms(loop)
    rated = np.where(np.isfinite(ripple_rated), ripple_rated, np.inf)
    hot = operated.ambient_c + ripple_rise(ripple, rated)
    expected = electrolytic_life(life, life_c, hot)
    timed = np.isfinite(life) & np.isfinite(life_c)
    return [
        upper_limit(f"{side} capacitor voltage", "V", peak, voltage),
        upper_limit(f"{side} capacitor ripple current", "A", ripple, ripple_rated, "rms"),
        Limit(
            name=f"{side} capacitor life",
            unit="h",
            value=np.asarray(expected, dtype=float),
            limit=np.full(len(operated), LIFE_WANTED),
            applies=timed & (not operated.electrical_only),
            is_upper=False,
            note="15 years claimed at most",
        ),
    ]


def _junction_limits(
    operated: Operated, rating: RatingData, heat: HeatData, warmer: Floats
) -> list[Limit]:
    """Junctions with drops at their limit values; typical temperatures beside them."""
    loop = operated.loop
    power = device_heat(operated.balance.losses)
    extra_v, extra_r = rating.saturation_extra.T
    mean, rms = loop.column("collector_mean_a"), loop.column("collector_rms_a")
    conducting = operated.balance.losses["transistor_conduction"] > 0.0
    more = conduction_loss(extra_v, extra_r, mean, rms)
    power[:, TRANSISTOR] += np.where(conducting, more, 0.0)
    power[:, RECTIFIER] += conduction_loss(
        rating.threshold_extra,
        rating.slope_extra / rating.pieces,
        loop.column("rectifier_mean_a"),
        loop.column("rectifier_rms_a"),
    )
    junction_c, _, _ = junctions(loop, power, operated.data, heat, operated.ambient_c)
    junction_c[:, RECTIFIER] += warmer
    known = np.isfinite(heat.own) & (not operated.electrical_only)
    found = []
    for index, name in enumerate(DEVICES):
        limit = rating.junction_limit[:, index]
        applies = np.isfinite(limit) & known[:, index]
        found.append(
            Limit(
                name=f"{name} junction",
                unit="degC",
                value=junction_c[:, index],
                limit=limit,
                applies=applies,
                span=limit - REFERENCE_C,
                typical=operated.junction(name),
                note="hottest of the pieces" if name == "rectifier" and (warmer > 0.0).any() else "",
                note_unknown="thermal runaway: no temperature balances the rectifier's leakage",
            )
        )
    return found


def _choke_limits(operated: Operated, rating: RatingData) -> list[Limit]:
    turns, length, permeability, half, exponent, saturation = rating.flux.T
    field = turns * operated.loop.column("choke_max_a") / length
    density = np.asarray(flux_density(field, permeability, half, exponent), dtype=float)
    wound = np.isfinite(operated.balance.choke_c)
    return [
        Limit(
            name="core flux density",
            unit="T",
            value=density,
            limit=saturation,
            applies=np.isfinite(saturation) & np.isfinite(density),
            note="at the peak current, against saturation",
        ),
        upper_limit(
            "wires through the bore",
            "1",
            operated.data.wires,
            operated.data.capacity,
            "turns times strands; as many as fit",
        ),
        Limit(
            name="choke temperature",
            unit="degC",
            value=operated.balance.choke_c,
            limit=rating.choke_limit,
            applies=np.isfinite(rating.choke_limit) & wound,
            span=rating.choke_limit - REFERENCE_C,
            note="the larger of two methods",
        ),
    ]


def where_text(operated: Operated, index: int) -> str:
    """An operating point in a few words, such as ``24 V, 2.5 A, 25 degC``."""
    resistance = operated.parameter("load_resistance")[index]
    load = format_quantity(float(operated.parameter("load_current")[index]), "A", ascii_only=True)
    words = [format_quantity(float(operated.parameter("supply_voltage")[index]), "V", ascii_only=True)]
    if not np.isfinite(resistance) or operated.parameter("load_current")[index] > 0.0:
        words.append(load)
    if np.isfinite(resistance):
        words.append(format_quantity(float(resistance), "ohm", ascii_only=True))
    words.append(format_quantity(float(operated.ambient_c[index]), "degC", ascii_only=True))
    return ", ".join(words)


def checks_at(limits: Sequence[Limit], operated: Operated, index: int) -> tuple[Check, ...]:
    """The checks that apply at one point, in the order of the limits."""
    where = where_text(operated, index)
    return tuple(limit.at(index, where) for limit in limits if limit.applies[index])


def worst_checks(limits: Sequence[Limit], operated: Operated) -> tuple[Check, ...]:
    """Each limit at the point where its margin is smallest; limits that apply nowhere are left out."""
    found = []
    for limit in limits:
        if not limit.applies.any():
            continue
        margin = np.where(limit.applies, np.where(np.isnan(limit.value), -np.inf, limit.margin), np.inf)
        index = int(np.argmin(margin))
        found.append(limit.at(index, where_text(operated, index)))
    return tuple(found)


__all__ = [
    "LIFE_WANTED",
    "REFERENCE_C",
    "Limit",
    "checks_at",
    "hottest_piece_at",
    "part_limits",
    "where_text",
    "worst_checks",
]
