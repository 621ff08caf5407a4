"""The ring, wire and turns for a candidate's choke."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from buckdesign.design.choke_search import ChokeChoice, ChokeLimits, ChokeNeed, ChokeSpace, choose_chokes
from buckdesign.design.network_search import Found
from buckdesign.design.requirement import Requirement
from buckdesign.design.scoring import loss_unit
from buckdesign.parts import Tables
from buckdesign.units import format_quantity

EASY_SPACE = {"strands": (1, 2), "stacks": (1,)}
HARD_SPACE = {"strands": (1, 2, 3, 4), "stacks": (1, 2)}
"""What is wound first, and what where that does not do."""

VOLUME_COSTS = (0.9, 0.3)
"""Cost of each doubling of a choke's volume, against half a unit of loss [1] (own choice)."""

CORE_C = (80.0, 105.0)
"""Hottest core that is chosen, and what is allowed where the air is so hot that there is no other way
[degC]: the powder's binder ages from 85 degC up, and 110 degC is the limit that is checked."""

LEAST_RISE = 20.0
"""Rise that a choke should be allowed [K] (own choice)."""

AWKWARD_COST = 0.4
"""Cost of a second strand or ring, the same measure [1]."""

METRIC_BONUS = 0.1
"""What a metric wire counts less than a gauge, the same measure [1]."""

SMALL_VOLUME = 1.5e-6
"""Volume of a wound ring below which smaller is no better [m3] (own choice)."""

THIN_WIRE = 0.3e-3
"""Copper below which winding by hand becomes tricky; each halving costs `AWKWARD_COST` 2.5 times [m]."""

LEAST_COST_TURNS = 120.0
"""Turns beyond which winding by hand becomes tedious; each doubling costs `AWKWARD_COST` 1.5 times [1]."""

LOWEST_RIPPLE_SHARE = 0.02
"""Least choke ripple over current that a choke is chosen for [1]."""


@dataclass(frozen=True, kw_only=True)
class Coil:
    """A winding.

    Attributes
    ----------
    core, material, wire : str
        Names.
    turns, strands, stack : int
        Whole numbers.
    """

    core: str
    material: str
    wire: str
    turns: int
    strands: int = 1
    stack: int = 1


def find_coils(requirement: Requirement, tables: Tables, found: Found, at: int) -> tuple[Coil, ...]:
    """Ring, wire and turns for one candidate: one that balances loss and size, and one of less loss.

    Parameters
    ----------
    requirement : Requirement
        What is wanted and preferred.
    tables : Tables
        Rings, materials, wires.
    found : Found
        Candidates.
    at : int
        Which one.

    Returns
    -------
    tuple of Coil
        Empty where no ring does it.
    """
    need = choke_need(requirement, found, at)
    for space in (EASY_SPACE, HARD_SPACE):
        choice = choose_chokes(tables, need, space=_space(requirement, space), limits=_limits(requirement))
        if len(choice):
            coils = [_best_coil(choice, requirement, cost) for cost in VOLUME_COSTS]
            return tuple(dict.fromkeys(coils))
    return ()


def coil_trouble(requirement: Requirement, tables: Tables, found: Found) -> str:
    """Why the best candidate's choke can't be wound, in words."""
    need = choke_need(requirement, found, 0)
    choice = choose_chokes(tables, need, space=_space(requirement, HARD_SPACE), limits=_limits(requirement))
    reasons = sorted(choice.rejected.items(), key=lambda pair: -pair[1])
    wanted = f"{format_quantity(need.inductance, 'H', ascii_only=True)} at {need.current:g} A"
    if choice.evaluated:
        counted = ", ".join(f"{count} {reason}" for reason, count in reasons[:3] if count)
        return f"no winding gives {wanted}: of {choice.evaluated} tried {counted}"
    kinds = {tables.material(name).kind for name in requirement.prefer.material}
    if kinds == {"ferrite"}:
        return f"no winding gives {wanted}: a ferrite ring without a gap saturates under the load current"
    return f"no winding gives {wanted}: the tables lack the bias law or the losses of the materials allowed"


def choke_need(requirement: Requirement, found: Found, at: int) -> ChokeNeed:
    """What the choke of one candidate has to do, at full load and the supply where it swings most."""
    output, trials = requirement.output, found.trials
    full = np.flatnonzero(found.points.load >= output.current_max * (1.0 - 1e-9))
    peaks, rates = found.behaviour.peak[at][full], found.behaviour.frequency[at][full]
    worst = int(np.argmax(peaks))
    ripple = max(2.0 * (float(peaks[worst]) - output.current_max), LOWEST_RIPPLE_SHARE * output.current_max)
    supply = float(found.points.supply[full][worst])
    return ChokeNeed(
        inductance=float(trials.inductance[at]),
        current=output.current_max,
        ripple=ripple,
        frequency=max(float(rates[worst]), 1e3),
        duty=min(max(output.voltage / supply, 0.05), 0.95),
        ambient_c=requirement.limits.ambient_high,
    )


def _limits(requirement: Requirement) -> ChokeLimits:
    usual, most = CORE_C
    return ChokeLimits(core_c=min(max(usual, requirement.limits.ambient_high + LEAST_RISE), most))


def _space(requirement: Requirement, space: Mapping[str, Any]) -> ChokeSpace:
    prefer = requirement.prefer
    return ChokeSpace(
        rings=prefer.core or None,
        materials=prefer.material or None,
        wires=prefer.wire or None,
        unpublished=bool(prefer.core and prefer.material),
        **space,
    )


def _best_coil(choice: ChokeChoice, requirement: Requirement, volume_cost: float) -> Coil:
    windings, candidates = choice.windings, choice.candidates
    unit = 0.5 * loss_unit(requirement)
    awkward = (candidates.strands > 1).astype(float) + (candidates.stack > 1)
    awkward = awkward + 1.5 * np.maximum(np.log2(windings.turns / LEAST_COST_TURNS), 0.0)
    conductor = choice.columns.wire.conductor[candidates.wire]
    awkward = awkward + 2.5 * np.maximum(np.log2(THIN_WIRE / conductor), 0.0)
    metric = np.array([wire.series == "metric" for wire in choice.columns.wires])[candidates.wire]
    cost = windings.total_loss_w / unit + volume_cost * np.log2(
        np.maximum(windings.volume_m3, SMALL_VOLUME) / SMALL_VOLUME
    )
    cost = cost + AWKWARD_COST * awkward - METRIC_BONUS * metric
    at = int(np.argmin(cost))
    core, material, wire = choice.names(at)
    return Coil(
        core=core,
        material=material,
        wire=wire,
        turns=round(float(windings.turns[at])),
        strands=int(candidates.strands[at]),
        stack=int(candidates.stack[at]),
    )
