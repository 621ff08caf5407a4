"""What is settled once a design has been simulated: resistor ratings, input capacitor, heat sink."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.blueprint import PAD, Blueprint, Finish
from buckdesign.design.capacitor_choices import input_capacitor
from buckdesign.design.choices import CASE_PATH
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.losses import input_ripple_rms
from buckdesign.design.operated import Operated
from buckdesign.design.requirement import Requirement
from buckdesign.design.sections import DEVICES
from buckdesign.design.sizing import power_rating
from buckdesign.design.temperatures import device_heat
from buckdesign.parts import Tables

HEATSINKS = (0.3, 0.5, 0.7, 1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0, 12.0, 15.0, 20.0, 25.0)
"""Heat sinks on offer [K/W] (common practice)."""

BARE_CASES = {"TO-3": 34.0, "TO-220": 60.0, "TO-126": 90.0, "TO-39": 150.0}
"""From case to air without a heat sink [K/W] (from memory: data sheets' junction-to-ambient values)."""

JUNCTION_RESERVE = 25.0
"""Junction below its limit [K] (common practice)."""

SINK_LIMIT_C = 85.0
"""Hottest heat sink [degC]: near parts and fingers (common practice)."""

LEAST_SINK_RISE = 15.0
"""Rise that a heat sink may have at any ambient [K] (own choice)."""

HEAT_RESERVE = 1.25
"""Heat counted over typical heat [1]: drops at their limits (the tables' typical values are 0.88 of them)."""

LEAD_SINK = 60.0
"""Copper at the leads of an axial diode, at most [K/W] (common practice: short leads in 2 cm2 of copper)."""

PROVISIONAL_SINK = 0.5
"""Heat sink with which a design is simulated first [K/W]."""


def provisional(
    requirement: Requirement, tables: Tables, plan: Blueprint, resolved: ResolvedDesign | None = None
) -> Finish:
    """A finish to simulate with before anything is known: everything on a large heat sink.

    Parameters
    ----------
    requirement : Requirement
        Largest load.
    tables : Tables
        Parts.
    plan : Blueprint
        The design.
    resolved : ResolvedDesign, optional
        Not used where the rectifier has a case.

    Returns
    -------
    Finish
        Ratings that stand in, half the load as ripple current of the input capacitor.
    """
    rectifier = tables.rectifier(plan.rectifier)
    has_case = rectifier.junction_case is not None and rectifier.junction_case <= CASE_PATH
    lead = not has_case and rectifier.junction_ambient is None and rectifier.junction_case is not None
    return Finish(
        rdrive_power=50.0,
        rbe_power=1.0,
        input_capacitor=input_capacitor(requirement, tables, 0.5 * requirement.output.current_max),
        heatsink=PROVISIONAL_SINK,
        on_heatsink=("transistor", "rectifier") if has_case else ("transistor",),
        lead_sink=LEAD_SINK if lead else None,
    )


def finish(requirement: Requirement, tables: Tables, operated: Operated, resolved: ResolvedDesign) -> Finish:
    """Ratings, input capacitor and heat sink from the simulated range.

    Parameters
    ----------
    requirement : Requirement
        Supply and ambient.
    tables : Tables
        Parts.
    operated : Operated
        The range of one design, provisionally finished.
    resolved : ResolvedDesign
        That design.

    Returns
    -------
    Finish
        The largest heat sink resistance that leaves the reserves, from those on offer.

    Raises
    ------
    InfeasibleError
        A resistor would need more than the largest rating.
    """
    heat = HEAT_RESERVE * np.nanmax(_device_heat(operated), axis=0)
    on_sink = _on_heatsink(requirement, resolved, heat)
    emitter = resolved.transistor.base_emitter_max
    network = resolved.network
    sink = _heatsink(requirement, tables, resolved, heat, on_sink)
    return Finish(
        rdrive_power=power_rating(float(operated.balance.losses["drive_resistor"].max())),
        rbe_power=power_rating(emitter**2 / network.rbe),
        input_capacitor=input_capacitor(requirement, tables, float(input_ripple_rms(operated.loop).max())),
        heatsink=sink,
        on_heatsink=on_sink,
        is_bare=on_sink == ("transistor",) and sink in BARE_CASES.values(),
        lead_sink=_lead_sink(requirement, resolved, float(heat[DEVICES.index("rectifier")]), on_sink),
    )


def _device_heat(operated: Operated) -> NDArray[np.float64]:
    heat = device_heat(operated.balance.losses)
    heat[:, DEVICES.index("rectifier")] += operated.balance.losses["rectifier_leakage"]
    return heat


def _room(requirement: Requirement, resolved: ResolvedDesign, name: str) -> float:
    """Rise that a junction may have [K]."""
    limit = getattr(resolved, name).junction_limit_c
    return math.inf if limit is None else limit - JUNCTION_RESERVE - requirement.limits.ambient_high


def _on_heatsink(
    requirement: Requirement, resolved: ResolvedDesign, heat: NDArray[np.float64]
) -> tuple[str, ...]:
    """The transistor; regulator and rectifier where free air does not suffice and they have a case."""
    found = ["transistor"]
    for name in ("regulator", "rectifier"):
        element = getattr(resolved, name)
        free, case = element.junction_ambient, element.junction_case
        power = float(heat[DEVICES.index(name)]) / getattr(element, "parallel", 1)
        if case is None or case > CASE_PATH:
            continue
        if free is None or power * free > _room(requirement, resolved, name):
            found.append(name)
    return tuple(found)


def _heatsink(
    requirement: Requirement,
    tables: Tables,
    resolved: ResolvedDesign,
    heat: NDArray[np.float64],
    on_sink: tuple[str, ...],
) -> float | None:
    """The smallest heat sink that suffices [K/W]."""
    total = sum(float(heat[DEVICES.index(name)]) for name in on_sink)
    rise = max(SINK_LIMIT_C - requirement.limits.ambient_high, LEAST_SINK_RISE)
    largest = rise / max(total, 1e-6)
    for name in on_sink:
        element = getattr(resolved, name)
        if element.junction_case is None:
            continue
        path = (element.junction_case + PAD) / getattr(element, "parallel", 1)
        left = _room(requirement, resolved, name) - path * float(heat[DEVICES.index(name)])
        largest = min(largest, left / max(total, 1e-6))
    package = "" if resolved.transistor.name is None else tables.transistor(resolved.transistor.name).package
    bare = BARE_CASES.get(package, math.inf)
    if on_sink == ("transistor",) and bare <= largest:
        return bare
    fitting = [size for size in HEATSINKS if size <= largest]
    return fitting[-1] if fitting else HEATSINKS[0]


def _lead_sink(
    requirement: Requirement, resolved: ResolvedDesign, heat: float, on_sink: tuple[str, ...]
) -> float | None:
    """Copper at the leads of a diode without a value for free air [K/W]."""
    rectifier = resolved.rectifier
    if "rectifier" in on_sink or rectifier.junction_ambient is not None or rectifier.junction_case is None:
        return None
    left = _room(requirement, resolved, "rectifier") / max(heat, 1e-6)
    left -= rectifier.junction_case / rectifier.parallel
    steps = (10.0, 15.0, 20.0, 30.0, 40.0, LEAD_SINK)
    fitting = [size for size in steps if size <= left]
    return fitting[-1] if fitting else steps[0]
