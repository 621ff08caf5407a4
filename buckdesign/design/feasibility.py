"""Why a requirement can't be met: which line blocks it, by how much, and what would have to give.

Every line that is named alone was tried: the requirement with that line given, and nothing else, was designed
again and held.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from buckdesign.design.attempts import HEADROOM, Attempt, Progress, attempt
from buckdesign.design.choices import Lack
from buckdesign.design.design_result import Blocking
from buckdesign.design.judging import Judged, violation
from buckdesign.design.operating_point import Check
from buckdesign.design.relaxing import (
    AMBIENT,
    LOAD,
    OUTPUT_VOLTAGE,
    SEARCHED,
    SUPPLY_HIGH,
    SUPPLY_LOW,
    Line,
    eased,
    line_value,
    relaxed,
    shown,
    without_preference,
)
from buckdesign.design.requirement import Requirement
from buckdesign.design.sizing import base_resistors, needed_supply
from buckdesign.parts import Tables
from buckdesign.units import format_quantity

FIRST_EASE = 0.02
"""Share by which a line gives beyond the best that was reached [1] (own choice)."""

WIDENINGS = (0.0, 0.08, 0.25)
"""Further shares that are tried where the first does not do [1] (own choice)."""

WARM_C = 75.0
"""Ambient that is tried where a hotter one leaves no room for the parts' own heat [degC] (own choice)."""

MOST_LINES, MOST_OTHERS = 3, 2
"""Violated lines that are tried, and others where none of those does it: each costs searches."""

KINDS: tuple[tuple[str, tuple[str, ...]], ...] = (
    ("transistor", ("collector", "transistor", "base drive")),
    ("rectifier", ("rectifier",)),
    ("regulator", ("regulator", "drive resistor")),
    ("output_capacitor", ("output capacitor",)),
    ("input_capacitor", ("input capacitor",)),
    ("core", ("choke", "core")),
    ("material", ("choke", "core")),
    ("wire", ("choke", "core")),
)
"""Kinds of part and how the checks that are about them begin."""


@dataclass(frozen=True, kw_only=True)
class _Case:
    """What all functions here need."""

    requirement: Requirement
    tables: Tables
    jobs: int | None
    progress: Progress | None

    def attempt(self, requirement: Requirement, spared: str | None = None) -> Attempt:
        return attempt(requirement, self.tables, spared=spared, jobs=self.jobs)

    def tell(self, words: str) -> None:
        if self.progress is not None:
            self.progress(words)


def find_blocking(
    requirement: Requirement,
    tables: Tables,
    found: Attempt,
    *,
    jobs: int | None = None,
    progress: Progress | None = None,
) -> tuple[Blocking, ...]:
    """What blocks a requirement.

    Parameters
    ----------
    requirement : Requirement
        What was wanted.
    tables : Tables
        Parts.
    found : Attempt
        The attempt that failed.
    jobs : int, optional
        Threads.
    progress : callable, optional
        Told in a few words what is being done.

    Returns
    -------
    tuple of Blocking
        At least one. Those that are `alone` do it by themselves; otherwise all of them have to give together.
    """
    case = _Case(requirement=requirement, tables=tables, jobs=jobs, progress=progress)
    preferred = _preferences(case, found)
    if preferred:
        return preferred
    if found.lacks:
        return _from_lacks(case, found.lacks)
    if found.trouble == HEADROOM:
        return _from_headroom(case, found)
    if not found.judged:
        return _from_trouble(case, found.trouble)
    return _from_lines(case, found)


def _preferences(case: _Case, found: Attempt) -> tuple[Blocking, ...]:
    """Kinds of part whose preference alone is what blocks it."""
    prefer = case.requirement.prefer
    kinds = [kind for kind, _ in KINDS if getattr(prefer, kind)]
    blocking = []
    for kind in kinds:
        case.tell(f"trying without the preferred {kind.replace('_', ' ')}")
        free = case.attempt(without_preference(case.requirement, kind))
        if free.holds:
            blocking.append(_preference(kind, getattr(prefer, kind), found, free.judged[0]))
    return tuple(blocking)


def _preference(kind: str, names: Sequence[str], found: Attempt, free: Judged) -> Blocking:
    """What the preferred part fails, and what was taken instead."""
    instead = _part_of(free, kind)
    mine = [lack for lack in found.lacks if lack.kind == kind]
    listed = ", ".join(names)
    if mine:
        lack = mine[0]
        offered, needed = _number(lack.offered, lack.unit), _number(lack.required, lack.unit)
        text = f"{lack.part}: {lack.what} {offered}, {needed} is needed"
        required: float | str = lack.required
        reachable: float | str | None = lack.offered
        unit = lack.unit
    elif found.judged:
        check = max(found.judged[0].failed, key=violation)
        text = f"with {listed}: {_check_text(check)}"
        required = check.limit if check.limit is not None else check.name
        reachable, unit = check.value, check.unit
    else:
        text, required, reachable, unit = f"with {listed}: {found.trouble}", listed, None, ""
    return Blocking(
        key=f"prefer.{kind}",
        unit=unit,
        required=required,
        reachable=reachable,
        relax_to=instead,
        alone=True,
        text=f"{text}; {instead} does it",
    )


def _part_of(judged: Judged, kind: str) -> str:
    plan = judged.plan
    match kind:
        case "output_capacitor":
            return plan.capacitor.name
        case "input_capacitor":
            chosen = judged.finish.input_capacitor
            return "none" if chosen is None else chosen.part.name
        case "core" | "material" | "wire":
            return str(getattr(plan.coil, kind))
    return str(getattr(plan, kind))


def _from_lacks(case: _Case, lacks: Sequence[Lack]) -> tuple[Blocking, ...]:
    """No part of a kind is large enough: what would make the nearest one do."""
    requirement = case.requirement
    proposals: dict[str, tuple[Line, float]] = {}
    for lack in lacks:
        line = _line_of_lack(lack)
        current = line_value(requirement, line)
        if current is None or lack.required <= 0.0:
            continue
        value = current * lack.offered / lack.required
        if line is OUTPUT_VOLTAGE and lack.what.startswith("output above"):
            continue
        old = proposals.get(line.name)
        if old is None or abs(value - current) < abs(old[1] - current):
            proposals[line.name] = (line, value)
    first = lacks[0]
    reason = (
        f"{first.part} can't regulate below its reference of {_number(first.required, first.unit)}"
        if first.what.startswith("output above")
        else f"{first.kind.replace('_', ' ')}: the nearest, {first.part}, offers {first.what} of "
        f"{_number(first.offered, first.unit)}, {_number(first.required, first.unit)} is needed"
    )
    found = _tried(case, list(proposals.values()), reason)
    if found:
        return found
    return tuple(_plain(case, line, reason, value) for line, value in proposals.values()) or (
        _plain(case, OUTPUT_VOLTAGE, reason),
    )


def _line_of_lack(lack: Lack) -> Line:
    if lack.kind == "output_capacitor" or lack.what.startswith("output above"):
        return OUTPUT_VOLTAGE
    return SUPPLY_HIGH if lack.unit == "V" else LOAD


def _from_headroom(case: _Case, found: Attempt) -> tuple[Blocking, ...]:
    """The base can't be driven at the lowest supply."""
    requirement, bench = case.requirement, found.bench
    assert bench is not None
    regulator = bench.drawer.regulator.element
    rbe = base_resistors(requirement.output.current_max)[-1]
    needed = min(needed_supply(requirement, regulator, one.element, rbe) for one in bench.drawer.transistors)
    low, output = requirement.supply.voltage_low, requirement.output.voltage
    reason = (
        f"the base drive needs {needed - output:.3g} V between lowest supply and output "
        f"(base-emitter drop, drive resistor and the regulator's dropout), there are {low - output:.3g} V"
    )
    proposals = [(SUPPLY_LOW, needed), (OUTPUT_VOLTAGE, output - (needed - low))]
    return _tried(case, [one for one in proposals if one[1] > 0.0], reason) or tuple(
        _plain(case, line, reason, value) for line, value in proposals
    )


def _from_trouble(case: _Case, trouble: str) -> tuple[Blocking, ...]:
    """No candidate could be built at all."""
    requirement = case.requirement
    proposals = [(LOAD, 0.7 * requirement.output.current_max)]
    if requirement.limits.ambient_high > WARM_C:
        proposals.insert(0, (AMBIENT, WARM_C))
    return _tried(case, proposals, trouble) or tuple(
        _plain(case, line, trouble, value) for line, value in proposals
    )


def _tried(case: _Case, proposals: Sequence[tuple[Line, float]], reason: str) -> tuple[Blocking, ...]:
    """Those proposals that do alone, each widened until it does."""
    found = []
    for line, value in proposals:
        given = line_value(case.requirement, line)
        worked = _widened(case, line, value)
        if worked is None or given is None:
            continue
        text = f"{line.words} {shown(line, given)}: {reason}; {shown(line, worked)} would do"
        found.append(
            Blocking(
                key=line.key,
                unit=line.unit,
                required=given,
                reachable=value,
                relax_to=worked,
                alone=True,
                text=text,
            )
        )
    return tuple(found)


def _widened(case: _Case, line: Line, value: float) -> float | None:
    """The value nearest to the one reached with which the design holds; None: none of those tried."""
    case.tell(f"trying with another {line.words}")
    tried: list[float] = []
    for more in WIDENINGS:
        easy = eased(line, value, FIRST_EASE + more)
        if easy in tried or not _is_sensible(case.requirement, line, easy):
            continue
        tried.append(easy)
        if case.attempt(relaxed(case.requirement, line, easy)).holds:
            return easy
    return None


def _is_sensible(requirement: Requirement, line: Line, value: float) -> bool:
    if line.name == "ambient":
        return value > -40.0
    if line.name == "supply_high":
        return value > requirement.output.voltage
    if line.name == "output":
        return value < 0.5
    return value > 0.0


def _plain(case: _Case, line: Line, reason: str, reachable: float | None = None) -> Blocking:
    """A line that has to give, with no value that does alone."""
    given = line_value(case.requirement, line)
    return Blocking(
        key=line.key,
        unit=line.unit,
        required=0.0 if given is None else given,
        reachable=reachable,
        relax_to=None if reachable is None else eased(line, reachable, FIRST_EASE),
        alone=False,
        text=f"{line.words}: {reason}",
    )


def _from_lines(case: _Case, found: Attempt) -> tuple[Blocking, ...]:
    """There is a design, but it fails checks: find lines that make all of them hold."""
    best = found.judged[0]
    failing = {check.name for check in best.failed}
    lines = [line for line in SEARCHED if line_value(case.requirement, line) is not None]
    violated = [line for line in lines if failing.intersection(line.checks)]
    blocking = _reachable(case, violated[:MOST_LINES])
    if not blocking and violated:
        blocking = _reachable(case, [line for line in lines if line not in violated][:MOST_OTHERS])
    others = _part_proposals(case, best)
    if not blocking and others:
        blocking += _tried(case, others, _check_text(max(best.failed, key=violation)))
    return tuple(blocking) or _together(case, best)


def _reachable(case: _Case, lines: Sequence[Line]) -> list[Blocking]:
    """Lines of which each alone makes everything hold, with the best that everything else allows."""
    blocking: list[Blocking] = []
    for line in lines:
        case.tell(f"looking for the best {line.words} that everything else allows")
        reached = _best_reachable(case, line)
        if reached is not None:
            blocking += _tried(case, [(line, reached)], _reached_text(line, reached))
    return blocking


def _reached_text(line: Line, reached: float) -> str:
    return f"{shown(line, reached)} is the best that was reached with everything else kept"


def _best_reachable(case: _Case, line: Line) -> float | None:
    """Best value of a line among designs that keep everything else."""
    found = case.attempt(case.requirement, spared=line.name)
    values = []
    for judged in found.judged:
        if any(check.name not in line.checks for check in judged.failed):
            continue
        for check in judged.checks:
            if check.name in line.checks and check.value is not None:
                values.append(_line_measure(case.requirement, line, check.value))
    if not values:
        return None
    return min(values) if line.upward else max(values)


def _line_measure(requirement: Requirement, line: Line, value: float) -> float:
    """A check's value in terms of its line."""
    if line.name != "output":
        return value
    return abs(value / requirement.output.voltage - 1.0)


def _part_proposals(case: _Case, best: Judged) -> list[tuple[Line, float]]:
    """Lines that a failing part limit points to, with the value by which it would just hold."""
    requirement = case.requirement
    found: dict[str, tuple[Line, float]] = {}
    for check in best.failed:
        proposal = _proposal(requirement, check)
        if proposal is None:
            continue
        line, value = proposal
        old = found.get(line.name)
        if old is None or (value > old[1]) == line.upward:
            found[line.name] = proposal
    return list(found.values())


def _proposal(requirement: Requirement, check: Check) -> tuple[Line, float] | None:
    short = violation(check)
    if check.unit == "degC" or check.name.endswith("life"):
        excess = 20.0
        if check.value is not None and check.limit is not None:
            too_short = 10.0 * math.log2(check.limit / max(check.value, 1.0))
            excess = check.value - check.limit if check.unit == "degC" else too_short
        return AMBIENT, requirement.limits.ambient_high - excess
    if check.name == "base drive":
        return SUPPLY_LOW, requirement.supply.voltage_low * (1.0 + 0.1 * min(short, 2.0))
    if check.name.endswith(("voltage", "difference")) and check.name != "output voltage":
        return SUPPLY_HIGH, requirement.supply.voltage_high / (1.0 + short)
    if check.name.endswith(("current", "power", "density")):
        return LOAD, requirement.output.current_max / (1.0 + short)
    return None


def _together(case: _Case, best: Judged) -> tuple[Blocking, ...]:
    """No line does alone: all that the best compromise violates."""
    found = []
    for check in best.failed:
        line = next((one for one in SEARCHED if check.name in one.checks), None)
        if line is not None and check.value is not None:
            reached = _line_measure(case.requirement, line, check.value)
            found.append(_plain(case, line, _check_text(check), reached))
            continue
        proposal = _proposal(case.requirement, check)
        if proposal is not None:
            found.append(_plain(case, proposal[0], _check_text(check), proposal[1]))
        else:
            found.append(
                Blocking(
                    key=check.name,
                    unit=check.unit,
                    required=0.0 if check.limit is None else check.limit,
                    reachable=check.value,
                    relax_to=None,
                    alone=False,
                    text=_check_text(check),
                )
            )
    return tuple(found)


def _check_text(check: Check) -> str:
    value = "no balance" if check.value is None else _number(check.value, check.unit)
    limit = "" if check.limit is None else f", limit {_number(check.limit, check.unit)}"
    return f"{check.name} {value}{limit} at {check.where}"


def _number(value: float, unit: str) -> str:
    return format_quantity(value, unit, digits=3, ascii_only=True)
