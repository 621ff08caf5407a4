"""One attempt at a requirement: parts, search, rounding, refinement, the whole range."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from contextlib import suppress
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.blueprint import Blueprint, blueprint, with_network
from buckdesign.design.capacitor_choices import output_capacitors
from buckdesign.design.choices import (
    Lack,
    distinct_choices,
    rectifier_choices,
    regulator_choices,
    transistor_choices,
)
from buckdesign.design.coils import coil_trouble, find_coils
from buckdesign.design.judging import Judged, ambients_of, judge, violation
from buckdesign.design.network_search import Found, search_networks
from buckdesign.design.relaxing import SEARCHED, Line
from buckdesign.design.requirement import Requirement
from buckdesign.design.sizing import LEAST_DRIVE_RESISTANCE, base_resistors
from buckdesign.design.trials import Bench, Drawer, grid
from buckdesign.errors import InfeasibleError
from buckdesign.loop.results import STUDY
from buckdesign.parts import Tables
from buckdesign.physics.preferred import next_above, next_below

Progress = Callable[[str], None]

BREADTHS = ((2, 2), (5, 4))
"""Transistors and rectifiers that the search may choose from; the second only where the first does not do."""

NEARLY = 0.3
"""Sum of violations up to which the lines violated are each searched for by themselves [1] (own choice)."""

HOPELESS = 3
"""Best candidates whose choke can't be wound, after which no further are looked at."""

FINALISTS, LAST = 8, 3
"""Candidates that are rounded, and those whose whole range is simulated in the end."""


@dataclass(frozen=True, kw_only=True)
class Attempt:
    """What came of an attempt.

    Attributes
    ----------
    judged : tuple of Judged
        Rounded designs over the range, best first; empty where it did not come so far.
    lacks : tuple of Lack
        Parts that would not do, where no part of a kind does.
    bench : Bench or None
        What was searched with.
    trouble : str
        Why there is no design at all, in words; empty where there is one.
    """

    judged: tuple[Judged, ...] = ()
    lacks: tuple[Lack, ...] = ()
    bench: Bench | None = None
    trouble: str = ""

    @property
    def holds(self) -> bool:
        """Whether the best design keeps everything."""
        return bool(self.judged) and self.judged[0].holds


def attempt(
    requirement: Requirement,
    tables: Tables,
    *,
    spared: str | None = None,
    jobs: int | None = None,
    progress: Progress | None = None,
) -> Attempt:
    """Try to design a supply, first among few parts, then among more.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    tables : Tables
        Parts.
    spared : str, optional
        A line of the requirement that may give, see `search_networks`.
    jobs : int, optional
        Threads.
    progress : callable, optional
        Told in a few words what is being done.

    Returns
    -------
    Attempt
        The best of it.
    """
    tell = progress or (lambda words: None)
    best = Attempt()
    for number, breadth in enumerate(BREADTHS):
        drawer = choose_parts(requirement, tables, breadth)
        if isinstance(drawer, Attempt):
            return drawer if not best.judged else best
        tell("searching hysteresis network, choke and output capacitor" + " among more parts" * bool(number))
        best = _better(best, _once(requirement, tables, Bench(requirement, drawer), spared, jobs, tell))
        if best.holds or (spared is not None and best.judged):
            return best
    for line in _nearly_held(best):
        tell(f"searching once more, everything else before the {line.words}")
        assert best.bench is not None
        best = _better(best, _once(requirement, tables, best.bench, line.name, jobs, tell))
        if best.holds:
            break
    return best


def _better(one: Attempt, other: Attempt) -> Attempt:
    """The attempt whose best design ranks before the other's."""
    if not one.judged:
        return other
    return other if other.judged and other.judged[0].score < one.judged[0].score else one


def _nearly_held(best: Attempt) -> list[Line]:
    """Violated lines of a design that violates nothing else, and these only by little."""
    if not best.judged:
        return []
    failed = best.judged[0].failed
    lines = [line for line in SEARCHED if any(check.name in line.checks for check in failed)]
    known = {name for line in lines for name in line.checks}
    if any(check.name not in known for check in failed) or sum(map(violation, failed)) > NEARLY:
        return []
    return lines


def choose_parts(requirement: Requirement, tables: Tables, breadth: tuple[int, int]) -> Drawer | Attempt:
    """Parts that will do by their ratings, or why there are none.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    tables : Tables
        Parts.
    breadth : tuple of int
        Most transistors and rectifiers.

    Returns
    -------
    Drawer or Attempt
        An attempt that ended here.
    """
    regulators = regulator_choices(requirement, tables)
    if not regulators.choices:
        return Attempt(lacks=regulators.lacks, trouble="no regulator will do")
    rectifiers = rectifier_choices(requirement, tables)
    if not rectifiers.choices:
        return Attempt(lacks=rectifiers.lacks, trouble="no rectifier will do")
    capacitors = output_capacitors(requirement, tables)
    if not capacitors:
        return Attempt(lacks=_capacitor_lacks(requirement, tables), trouble="no output capacitor will do")
    worst: Attempt | None = None
    for regulator in regulators.choices:
        chosen = transistor_choices(requirement, tables, regulator.element)
        if not chosen.choices:
            worst = worst or Attempt(lacks=chosen.lacks, trouble="no transistor will do")
            continue
        drawer = Drawer(
            regulator=regulator,
            transistors=distinct_choices(chosen.choices, breadth[0]),
            rectifiers=rectifiers.choices[: breadth[1]],
            capacitors=capacitors,
        )
        every = replace(drawer, transistors=distinct_choices(chosen.choices, len(chosen.choices)))
        able = _drivable(requirement, every)
        if able.any():
            kept = tuple(one for one, fine in zip(every.transistors, able, strict=True) if fine)
            return replace(drawer, transistors=kept[: breadth[0]])
        worst = worst or Attempt(bench=Bench(requirement, every), trouble=HEADROOM)
    assert worst is not None
    return worst


HEADROOM = "the lowest supply leaves too little for the base drive"


def _drivable(requirement: Requirement, drawer: Drawer) -> NDArray[np.bool_]:
    """Which transistors the lowest supply can drive."""
    bench = Bench(requirement, drawer)
    trials = grid(
        transistor=range(len(drawer.transistors)),
        rectifier=[0],
        capacitor=[0],
        inductance=[1e-4],
        network=[(1e6, 0.0)],
        rbe=[base_resistors(requirement.output.current_max)[-1]],
    )
    return bench.drive_resistors(trials) >= LEAST_DRIVE_RESISTANCE


def _capacitor_lacks(requirement: Requirement, tables: Tables) -> tuple[Lack, ...]:
    names = requirement.prefer.output_capacitor or tuple(tables.capacitors)
    voltage = requirement.output.voltage
    found = [
        Lack(
            kind="output_capacitor",
            part=name,
            what="rated voltage",
            unit="V",
            required=voltage,
            offered=tables.capacitor(name).rated_voltage,
        )
        for name in names
    ]
    return tuple(sorted(found, key=lambda lack: lack.shortfall))


def _once(
    requirement: Requirement,
    tables: Tables,
    bench: Bench,
    spared: str | None,
    jobs: int | None,
    tell: Progress,
) -> Attempt:
    """Search, round, refine and simulate the range with one drawer."""
    found = search_networks(requirement, bench, spared=spared, jobs=jobs)
    plans = finalists(requirement, tables, bench, found)
    if not plans:
        return Attempt(bench=bench, trouble=_no_plan(requirement, tables, found))
    tell("rounding to preferred values and whole turns, simulating the range")
    ambients = ambients_of(requirement)
    ranked = judge(requirement, tables, plans, ambients=ambients, jobs=jobs)
    if not ranked:
        return Attempt(bench=bench, trouble="the drive resistor would burn more than any on offer")
    better = judge(requirement, tables, variants(requirement, bench, ranked[0]), ambients=ambients, jobs=jobs)
    ranked = sorted([*ranked, *better], key=lambda one: one.score)
    tell("checking the best over supply, load and ambient")
    last = judge(
        requirement,
        tables,
        [one.plan for one in _different(ranked, LAST)],
        ambients=ambients,
        effort=STUDY,
        jobs=jobs,
    )
    seen = {id(one) for one in last}
    others = [one for one in ranked if id(one) not in seen and all(one.plan != other.plan for other in last)]
    return Attempt(judged=(*last, *others), bench=bench)


def _no_plan(requirement: Requirement, tables: Tables, found: Found) -> str:
    """Why no candidate could be rounded."""
    if len(found) == 0:
        return HEADROOM
    if any(find_coils(requirement, tables, found, at) for at in range(min(len(found), 3))):
        return "the peak choke current needs more base drive than the lowest supply leaves"
    return coil_trouble(requirement, tables, found)


def finalists(requirement: Requirement, tables: Tables, bench: Bench, found: Found) -> list[Blueprint]:
    """The best candidates, rounded, no two alike; with a few of the other way of coupling."""
    plans: list[Blueprint] = []
    coupled = found.trials.ch > 0.0
    order = [*range(len(found)), *np.flatnonzero(coupled != coupled[0]).tolist()] if len(found) else []
    unwound = 0
    for at in [*order[:FINALISTS], *order[len(found) : len(found) + 2], *order[FINALISTS : 2 * FINALISTS]]:
        if len(plans) >= 2 * FINALISTS + 4:
            break
        coils = find_coils(requirement, tables, found, at)
        unwound += not coils
        if unwound >= HOPELESS and not plans:
            break
        for coil in coils:
            with suppress(InfeasibleError):
                plans.append(blueprint(requirement, bench, found, at, coil))
    return list(dict.fromkeys(plans))


def variants(requirement: Requirement, bench: Bench, best: Judged) -> list[Blueprint]:
    """Neighbours of a rounded design by one preferred value."""
    plan, capacitors = best.plan, list(bench.drawer.capacitors)
    found = []
    for step, nudge in ((next_above, 1.01), (next_below, 0.99)):
        with suppress(InfeasibleError):
            found.append(with_network(requirement, bench, plan, float(step(plan.rh * nudge, "E12"))))
    found += [replace(plan, rbe=rbe) for rbe in base_resistors(requirement.output.current_max)]
    at = capacitors.index(plan.capacitor)
    found += [
        replace(plan, capacitor=capacitors[other])
        for other in (at - 1, at + 1)
        if 0 <= other < len(capacitors)
    ]
    lower = float(next_below(plan.rdrive * 0.99, "E12"))
    if lower >= LEAST_DRIVE_RESISTANCE:
        found.append(replace(plan, rdrive=lower))
    coil = plan.coil
    found += [replace(plan, coil=replace(coil, turns=round(coil.turns * step))) for step in (0.88, 0.94)]
    return [one for one in found if one != plan]


def _different(ranked: Sequence[Judged], most: int) -> list[Judged]:
    """The best, and others that differ from it in more than a resistor where there are such."""
    kept: list[Judged] = []
    for one in ranked:
        if all(one.plan != other.plan for other in kept):
            kept.append(one)
        if len(kept) >= most:
            break
    return kept
