"""Heat sinks: what each device needs, alone and on a common one, the size of a plate, the case without."""

from __future__ import annotations

import math
from dataclasses import asdict, dataclass, replace
from typing import Any

import numpy as np

from buckdesign.design.checks import where_text
from buckdesign.design.elements import HeatPath, ResolvedDesign
from buckdesign.design.heat_paths import heat_data
from buckdesign.design.hot_parameters import RECTIFIER, hot_data, parameters_at
from buckdesign.design.losses import (
    LEAKAGE_CEILING_C,
    Floats,
    junction_capacitance_loss,
    loop_losses,
    rectifier_leakage_loss,
)
from buckdesign.design.operated import Operated
from buckdesign.design.sections import DEVICES
from buckdesign.design.temperatures import device_heat
from buckdesign.loop.results import SteadyStates, steady_states
from buckdesign.physics.convection import (
    BRIGHT_EMISSIVITY,
    ENAMEL_EMISSIVITY,
    PLATE_UNCERTAINTY,
    plate_side,
)
from buckdesign.physics.thermal import sink_resistance_needed

FREE_AIR = {"TO-3": 35.0, "TO-220": 60.0, "TO-126": 90.0, "TO-39": 175.0}
"""Junction to ambient of a bare case where a sheet gives none [K/W] (from memory: usual values)."""

LARGE_RESISTANCE = 150.0
"""Resistance that any case or lead has by itself [K/W] (own choice): no plate is worth drawing for more."""

LARGEST_RISE = 150.0
"""Rise of a fitted sink beyond which the size of a plate for it says nothing [K] (own choice)."""

CANDIDATES = 3
"""Points looked at for each device, those that ask for most with the losses of the moment [1] (own choice)."""

ASSUMED_LIMIT_C = 150.0
"""Junction limit by which points are ranked where none is known [degC] (own choice)."""

TINY_HEAT = 1e-3
"""Heat below which no sink is worth a thought [W] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Plate:
    """A square vertical plate of aluminium, free on both sides, as a heat sink.

    Attributes
    ----------
    side_m, side_low_m, side_high_m : float
        Side of a blackened or anodised plate, and its band [m].
    bright_side_m : float
        Side of a bright one [m].
    """

    side_m: float
    side_low_m: float
    side_high_m: float
    bright_side_m: float


@dataclass(frozen=True, kw_only=True)
class DeviceSink:
    """One device.

    Attributes
    ----------
    heat_w : float
        Heat in it [W].
    junction_limit_c : float or None
        [degC].
    needed_k_per_w : float or None
        Largest thermal resistance of a sink of its own, behind its pad [K/W]; None where it can't be told,
        zero or below where no sink is good enough.
    without_sink_c : float or None
        Junction in free air [degC]; None where that is not known.
    needs_sink : bool or None
        Whether it exceeds its limit in free air.
    plate : Plate or None
        For the sink it needs; None where it needs none or none is good enough.
    where : str
        Operating point.
    """

    heat_w: float
    junction_limit_c: float | None
    needed_k_per_w: float | None
    without_sink_c: float | None
    needs_sink: bool | None
    plate: Plate | None
    where: str = ""


@dataclass(frozen=True, kw_only=True)
class SharedSink:
    """The common sink of the design.

    Attributes
    ----------
    devices : tuple of str
        Who sits on it.
    heat_w : float
        Their heat together [W].
    fitted_k_per_w : float
        As the design gives it [K/W].
    needed_k_per_w : float or None
        Largest that keeps every junction on it below its limit [K/W].
    limited_by : str or None
        The device that asks for it.
    sink_c : float
        Temperature of the fitted sink [degC].
    plate, fitted_plate : Plate or None
        Plates of the resistance that is needed, and of the one that is fitted.
    where : str
        Operating point.
    """

    devices: tuple[str, ...]
    heat_w: float
    fitted_k_per_w: float
    needed_k_per_w: float | None
    limited_by: str | None
    sink_c: float
    plate: Plate | None
    fitted_plate: Plate | None = None
    where: str = ""


@dataclass(frozen=True, kw_only=True)
class HeatSinks:
    """Heat sinks at one operating point.

    Attributes
    ----------
    transistor, regulator, rectifier : DeviceSink
        Each by itself; a rectifier of several pieces as a whole.
    shared : SharedSink or None
        The common sink, where there is one.
    """

    transistor: DeviceSink
    regulator: DeviceSink
    rectifier: DeviceSink
    shared: SharedSink | None

    def to_dict(self) -> dict[str, Any]:
        """Everything by key."""
        return asdict(self)


def heat_sinks(operated: Operated, resolved: ResolvedDesign, index: int) -> HeatSinks:
    """Heat sinks of a design at one of its operating points.

    Parameters
    ----------
    operated : Operated
        Operating points, with temperatures.
    resolved : ResolvedDesign
        The design.
    index : int
        Which point.

    Returns
    -------
    HeatSinks
        With typical losses, for what is needed those at the junction's limit, which are larger than the present
        ones; limits are those of the junctions, without a reserve.
    """
    heat = device_heat(operated.balance.losses)[index]
    heat[RECTIFIER] += operated.balance.losses["rectifier_leakage"][index]
    ambient = float(operated.ambient_c[index])
    now = dict(zip(DEVICES, (float(power) for power in heat), strict=True))
    junction = operated.balance.junction_c[index]
    limits = np.array([_limit(resolved, name) for name in DEVICES])
    tried = np.tile(junction, (len(DEVICES) + 1, 1))
    at = np.arange(len(DEVICES))
    tried[at, at] = np.where(np.isnan(limits), junction, limits)
    tightest = _shared(resolved, now, now, ambient)
    if tightest is not None and tightest.limited_by is not None:
        which = DEVICES.index(tightest.limited_by)
        tried[-1] += np.nan_to_num(limits[which] - junction[which])
    hot = _heat_at(operated, resolved, index, tried)
    found = {
        name: _device(resolved, name, now[name], float(hot[place, place]), ambient)
        for place, name in enumerate(DEVICES)
    }
    together = dict(zip(DEVICES, (float(power) for power in hot[-1]), strict=True))
    shared = _shared(resolved, now, together, ambient)
    where = where_text(operated, index)
    return HeatSinks(
        **{name: replace(one, where=where) for name, one in found.items()},
        shared=None if shared is None else replace(shared, where=where),
    )


def worst_heat_sinks(operated: Operated, resolved: ResolvedDesign) -> HeatSinks:
    """Heat sinks of a design over all its operating points, each device where it asks for most.

    Parameters
    ----------
    operated : Operated
        Operating points of one design, with temperatures.
    resolved : ResolvedDesign
        The design.

    Returns
    -------
    HeatSinks
        At the highest ambient, where a junction at its limit has least room (its own heat there hardly depends on
        the ambient): each device, and the common sink, at the point that asks for the smallest resistance.
    """
    heat = device_heat(operated.balance.losses)
    heat[:, RECTIFIER] += operated.balance.losses["rectifier_leakage"]
    limits = np.array([_limit(resolved, name) for name in DEVICES])
    room = np.where(np.isnan(limits), ASSUMED_LIMIT_C, limits) - operated.ambient_c[:, None]
    left = room - np.nan_to_num(heat_data([resolved]).own[0]) * heat
    groups = [[place] for place in range(len(DEVICES))]
    sharing = [place for place, name in enumerate(DEVICES) if getattr(resolved.heat, name).is_shared]
    groups += [sharing] if sharing else []
    hot = np.flatnonzero(operated.ambient_c >= operated.ambient_c.max())
    tried: set[int] = set()
    for group in groups:
        need = left[:, group].min(axis=1) / np.maximum(heat[:, group].sum(axis=1), TINY_HEAT)
        ranked = hot[np.argsort(need[hot], kind="stable")]
        tried.update(int(index) for index in ranked[:CANDIDATES])
    found = [heat_sinks(operated, resolved, index) for index in sorted(tried)]
    shared = [one.shared for one in found if one.shared is not None]
    return HeatSinks(
        **{name: min((getattr(one, name) for one in found), key=_demand) for name in DEVICES},
        shared=min(shared, key=_demand) if shared else None,
    )


def _demand(one: DeviceSink | SharedSink) -> tuple[float, float]:
    """Smaller where more is asked for."""
    return math.inf if one.needed_k_per_w is None else one.needed_k_per_w, -one.heat_w


def _limit(resolved: ResolvedDesign, name: str) -> float:
    limit = getattr(resolved, name).junction_limit_c
    return math.nan if limit is None else float(limit)


def _heat_at(operated: Operated, resolved: ResolvedDesign, index: int, junction_c: Floats) -> Floats:
    """Heat in each device with junctions held at temperatures, rows of `junction_c` [W]."""
    count = len(junction_c)
    same = np.full(count, index)
    ways, loop = hot_data([resolved] * count), operated.loop
    before = SteadyStates(values=loop.values[same], ends=loop.ends[same])
    ambient, choke = operated.ambient_c[same], operated.balance.choke_c[same]
    rows = parameters_at(operated.base_rows[same], ways, junction_c, choke, ambient, before)
    run = steady_states(rows, starts=before.ends[:, :5])
    losses = loop_losses(run)
    data = operated.data.part(same)
    losses["rectifier_recovery"] += junction_capacitance_loss(run, data)
    heat = device_heat(losses)
    rectifier = junction_c[:, RECTIFIER]
    leaking = np.where(np.isnan(rectifier), ambient, np.minimum(rectifier, LEAKAGE_CEILING_C))
    heat[:, RECTIFIER] += rectifier_leakage_loss(run, data, leaking)
    return heat


def plate_for(resistance: float, heat: float, ambient_c: float) -> Plate:
    """A plate of a thermal resistance while it carries some heat.

    Parameters
    ----------
    resistance : float
        Above zero [K/W].
    heat : float
        Above zero [W].
    ambient_c : float
        [degC].

    Returns
    -------
    Plate
        Sides with the band of `PLATE_UNCERTAINTY`.
    """
    rise = resistance * heat
    low, middle, high = (
        float(plate_side(resistance * factor, rise, ambient_c, ENAMEL_EMISSIVITY))
        for factor in (1.0 + PLATE_UNCERTAINTY, 1.0, 1.0 - PLATE_UNCERTAINTY)
    )
    bright = float(plate_side(resistance, rise, ambient_c, BRIGHT_EMISSIVITY))
    return Plate(side_m=middle, side_low_m=low, side_high_m=high, bright_side_m=bright)


def _device(
    resolved: ResolvedDesign, name: str, heat: float, hot_heat: float, ambient: float
) -> DeviceSink:
    element = getattr(resolved, name)
    path: HeatPath = getattr(resolved.heat, name)
    pieces = getattr(element, "parallel", 1)
    limit, case = element.junction_limit_c, element.junction_case
    free = _free_air(element)
    bare = None if free is None else ambient + heat * free / pieces
    needed = None
    if limit is not None and case is not None and heat > TINY_HEAT:
        inside = case / pieces, path.pad / pieces
        needed = float(sink_resistance_needed(hot_heat, limit, ambient, *inside))
    needs = None if bare is None or limit is None else bare > limit
    worth = needed is not None and 0.0 < needed < LARGE_RESISTANCE and needs is not False
    return DeviceSink(
        heat_w=heat,
        junction_limit_c=limit,
        needed_k_per_w=needed,
        without_sink_c=bare,
        needs_sink=needs,
        plate=plate_for(needed, hot_heat, ambient) if worth and needed is not None else None,
    )


def _free_air(element: Any) -> float | None:
    """Junction to ambient without a sink [K/W]."""
    free = getattr(element, "junction_ambient", None)
    if free is not None:
        return float(free)
    package = getattr(element, "package", None)
    return FREE_AIR.get(package) if package is not None else None


def _shared(
    resolved: ResolvedDesign, now: dict[str, float], hot: dict[str, float], ambient: float
) -> SharedSink | None:
    fitted = resolved.heat.shared_heatsink
    names = [name for name in DEVICES if getattr(resolved.heat, name).is_shared]
    if fitted is None or not names:
        return None
    total, hot_total = (float(sum(heat[name] for name in names)) for heat in (now, hot))
    needs: dict[str, float] = {}
    for name in names:
        element, path = getattr(resolved, name), getattr(resolved.heat, name)
        if element.junction_limit_c is None or element.junction_case is None or total <= TINY_HEAT:
            continue
        inside = (element.junction_case + path.pad) / getattr(element, "parallel", 1) * hot[name]
        needs[name] = float((element.junction_limit_c - ambient - inside) / hot_total)
    least = min(needs, key=lambda name: needs[name]) if needs else None
    needed = None if least is None else needs[least]
    return SharedSink(
        devices=tuple(names),
        heat_w=total,
        fitted_k_per_w=fitted,
        needed_k_per_w=needed,
        limited_by=least,
        sink_c=ambient + fitted * total,
        plate=plate_for(needed, hot_total, ambient) if needed is not None and needed > 0.0 else None,
        fitted_plate=plate_for(fitted, total, ambient) if TINY_HEAT < total < LARGEST_RISE / fitted else None,
    )


