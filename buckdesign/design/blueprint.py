"""From a candidate to what can be bought and wound: preferred values, a ring with whole turns, a design."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from buckdesign.design.capacitor_choices import InputCapacitor
from buckdesign.design.coils import Coil
from buckdesign.design.design_file import Design, design_from_tree
from buckdesign.design.network_search import Found
from buckdesign.design.requirement import Requirement
from buckdesign.design.sizing import base_drive, divider
from buckdesign.design.trials import Bench
from buckdesign.parts import Capacitor, Tables
from buckdesign.physics.preferred import nearest
from buckdesign.units import format_quantity

PEAK_RESERVE = 1.05
"""Peak choke current that the base drive is sized for, over the simulated one [1] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Blueprint:
    """All values of one design, rounded.

    Attributes
    ----------
    regulator, transistor, rectifier : str
        Parts.
    parallel : int
        Rectifiers in parallel.
    capacitor : Capacitor
        Output capacitor.
    r1, r2, rh, ch, rbe, rdrive : float
        [ohm], [F]; `ch` 0: directly coupled.
    coil : Coil
        The choke.
    """

    regulator: str
    transistor: str
    rectifier: str
    parallel: int
    capacitor: Capacitor
    r1: float
    r2: float
    rh: float
    ch: float
    rbe: float
    rdrive: float
    coil: Coil


@dataclass(frozen=True, kw_only=True)
class Finish:
    """What is settled once the behaviour is known.

    Attributes
    ----------
    rdrive_power, rbe_power : float
        Ratings [W].
    input_capacitor : InputCapacitor or None
        At the supply.
    heatsink : float or None
        Shared heat sink [K/W].
    on_heatsink : tuple of str
        Who sits on it.
    lead_sink : float or None
        From the leads of an axial rectifier to the air [K/W], where its sheet gives no value in free air.
    is_bare : bool
        The transistor's bare case suffices; `heatsink` is then its case in free air.
    """

    rdrive_power: float
    rbe_power: float
    input_capacitor: InputCapacitor | None
    heatsink: float | None
    on_heatsink: tuple[str, ...]
    lead_sink: float | None = None
    is_bare: bool = False


def blueprint(requirement: Requirement, bench: Bench, found: Found, at: int, coil: Coil) -> Blueprint:
    """Round one candidate to preferred values.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    bench : Bench
        Parts.
    found : Found
        Candidates with their behaviour.
    at : int
        Which one.
    coil : Coil
        Its choke.

    Returns
    -------
    Blueprint
        Hysteresis resistor of E12, capacitor of E6, divider and base drive to match.

    Raises
    ------
    InfeasibleError
        The headroom does not suffice for the base drive at the simulated peak current.
    """
    trials, drawer = found.trials, bench.drawer
    transistor = drawer.transistors[trials.transistor[at]]
    rectifier = drawer.rectifiers[trials.rectifier[at]]
    rbe, ch = float(trials.rbe[at]), float(trials.ch[at])
    drive = base_drive(
        requirement,
        drawer.regulator.element,
        transistor.element,
        rbe,
        PEAK_RESERVE * float(found.behaviour.peak[at].max()),
    )
    return with_network(
        requirement,
        bench,
        Blueprint(
            regulator=drawer.regulator.name,
            transistor=transistor.name,
            rectifier=rectifier.name,
            parallel=rectifier.parallel,
            capacitor=drawer.capacitors[trials.capacitor[at]],
            r1=bench.r1,
            r2=0.0,
            rh=0.0,
            ch=0.0 if ch == 0.0 else float(nearest(ch, "E6")),
            rbe=rbe,
            rdrive=drive.rdrive,
            coil=coil,
        ),
        float(trials.rh[at]),
    )


def with_network(requirement: Requirement, bench: Bench, plan: Blueprint, rh: float) -> Blueprint:
    """The same with another hysteresis resistor [ohm], and the divider that goes with it."""
    rounded = float(nearest(rh, "E12"))
    pull = rounded if plan.ch == 0.0 else float("inf")
    r1, r2 = divider(requirement, bench.drawer.regulator.element, pull)
    return replace(plan, rh=rounded, r1=r1, r2=r2)


def design_of(requirement: Requirement, tables: Tables, plan: Blueprint, finish: Finish) -> Design:
    """The design file of a blueprint.

    Parameters
    ----------
    requirement : Requirement
        Carried in the design, unchanged.
    tables : Tables
        Parts.
    plan : Blueprint
        Values.
    finish : Finish
        Ratings, input capacitor and heat sink.

    Returns
    -------
    Design
        Checked like a file.
    """
    tree = _tree(requirement, plan, finish)
    source = Path("design") if requirement.source is None else requirement.source
    return design_from_tree(tree, lambda *steps: None, path=source, tables=tables)


def _tree(requirement: Requirement, plan: Blueprint, finish: Finish) -> dict[str, Any]:
    output, coil = requirement.output, plan.coil
    network = {
        "r1": _text(plan.r1, "ohm"),
        "r2": _text(plan.r2, "ohm"),
        "rh": _text(plan.rh, "ohm"),
        **({"ch": _text(plan.ch, "F")} if plan.ch else {}),
        "rbe": _text(plan.rbe, "ohm"),
        "rdrive": _text(plan.rdrive, "ohm"),
        "rdrive_power": _text(finish.rdrive_power, "W"),
        "rbe_power": _text(finish.rbe_power, "W"),
    }
    choke = {
        "core": coil.core,
        "material": coil.material,
        **({"stack": coil.stack} if coil.stack > 1 else {}),
        "turns": coil.turns,
        "wire": coil.wire,
        **({"strands": coil.strands} if coil.strands > 1 else {}),
    }
    tree: dict[str, Any] = {
        "supply": _supply(requirement),
        "output": {"voltage": _text(output.voltage, "V"), "current": _text(output.current_max, "A")},
        "regulator": {"part": plan.regulator},
        "network": network,
        "transistor": {"part": plan.transistor},
        "rectifier": {
            "part": plan.rectifier,
            **({"parallel": plan.parallel} if plan.parallel > 1 else {}),
        },
        "choke": choke,
        "output_capacitor": {"part": plan.capacitor.name},
    }
    if finish.input_capacitor is not None:
        tree["input_capacitor"] = _input_capacitor(finish.input_capacitor)
    tree["thermal"] = _thermal(requirement, finish)
    tree["requirement"] = _carried(requirement)
    return tree


def _supply(requirement: Requirement) -> dict[str, Any]:
    supply = requirement.supply
    found: dict[str, Any] = {"voltage": _text(supply.voltage_nominal, "V")}
    for name, unit in (("resistance", "ohm"), ("inductance", "H"), ("rise_time", "s"), ("ripple", "V")):
        value = getattr(supply, name)
        if value:
            found[name] = _text(value, unit)
    if supply.ripple_frequency is not None:
        found["ripple_frequency"] = _text(supply.ripple_frequency, "Hz")
    return found


def _carried(requirement: Requirement) -> dict[str, Any]:
    """The requirement as its file says it; one that was made by a script, by its values."""
    if requirement.given:
        return requirement.tree()
    supply, output, limits = requirement.supply, requirement.output, requirement.limits
    tree: dict[str, Any] = {
        "supply": {"voltage": list(supply.voltage)},
        "output": {
            "voltage": output.voltage,
            "current": list(output.current),
            "tolerance": output.tolerance,
            **({"ripple": output.ripple} if np.isfinite(output.ripple) else {}),
        },
        "limits": {"ambient": list(limits.ambient)},
    }
    for name in ("resistance", "inductance", "rise_time", "ripple"):
        if getattr(supply, name):
            tree["supply"][name] = getattr(supply, name)
    if supply.ripple_frequency is not None:
        tree["supply"]["ripple_frequency"] = supply.ripple_frequency
    if limits.frequency is not None:
        tree["limits"]["frequency"] = list(limits.frequency)
    if limits.efficiency is not None:
        tree["limits"]["efficiency"] = limits.efficiency
    if limits.regular:
        tree["limits"]["regular"] = True
    prefer = {
        name: list(getattr(requirement.prefer, name)) for name in requirement.prefer.__dataclass_fields__
    }
    return tree | ({"prefer": {k: v for k, v in prefer.items() if v}} if any(prefer.values()) else {})


def _input_capacitor(chosen: InputCapacitor) -> dict[str, Any]:
    part, pieces = chosen.part, chosen.parallel
    if pieces == 1:
        return {"part": part.name}
    found = {
        "capacitance": _text(part.capacitance * pieces, "F"),
        "esr": _text(part.esr / pieces, "ohm"),
        "rated_voltage": _text(part.rated_voltage, "V"),
    }
    if part.ripple_current is not None:
        found["ripple_current"] = _text(part.ripple_current * pieces, "A")
    if part.life is not None:
        found["life"] = _text(part.life, "h")
    return found


def _thermal(requirement: Requirement, finish: Finish) -> dict[str, Any]:
    found: dict[str, Any] = {"ambient": _text(requirement.limits.ambient_high, "degC")}
    if finish.heatsink is not None and finish.on_heatsink:
        found["heatsink"] = _text(finish.heatsink, "K/W")
        found["on_heatsink"] = list(finish.on_heatsink)
        found["pad"] = _text(0.0 if finish.is_bare else PAD, "K/W")
    if finish.lead_sink is not None:
        found["rectifier"] = {"heatsink": _text(finish.lead_sink, "K/W"), "pad": "0 K/W"}
    return found


PAD = 0.5
"""Insulating pad or mica washer with grease [K/W] (common practice)."""


def _text(value: float, unit: str, digits: int = 4) -> str:
    return format_quantity(value, unit, digits=digits, ascii_only=True)
