"""From a requirement to a simulated, checked design: the main job."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from buckdesign.design.advisories import start_warnings
from buckdesign.design.attempts import Attempt, Progress, attempt
from buckdesign.design.describing import alternatives, component_values, gathered, gathered_warnings
from buckdesign.design.design_result import Blocking, DesignResult
from buckdesign.design.heat_sinks import worst_heat_sinks
from buckdesign.design.judging import Judged
from buckdesign.design.linear_alternative import linear_alternative
from buckdesign.design.operated import operate_rows
from buckdesign.design.operating import checked_points
from buckdesign.design.operating_point import OperatingPoint
from buckdesign.design.requirement import Requirement
from buckdesign.design.start_up import start_from_rest
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import steady_states
from buckdesign.parts import Tables, load_tables


def design_supply(
    requirement: Requirement,
    tables: Tables | None = None,
    *,
    jobs: int | None = None,
    progress: Progress | None = None,
) -> DesignResult:
    """Design a supply: choose every part, simulate the range, check every limit.

    Parameters
    ----------
    requirement : Requirement
        What is wanted, see `buckdesign.read_requirement`.
    tables : Tables, optional
        Parts to choose from; the tables of the package where omitted.
    jobs : int, optional
        Threads; all processors by default. The result does not depend on it.
    progress : callable, optional
        Told in a few words what is being done.

    Returns
    -------
    DesignResult
        The design with its simulated range, or what blocks it and what would have to give.
    """
    known = load_tables() if tables is None else tables
    found = attempt(requirement, known, jobs=jobs, progress=progress)
    if found.holds:
        return result_of(requirement, found)
    from buckdesign.design.feasibility import find_blocking

    blocking = find_blocking(requirement, known, found, jobs=jobs, progress=progress)
    return result_of(requirement, found, blocking)


def result_of(requirement: Requirement, found: Attempt, blocking: tuple[Blocking, ...] = ()) -> DesignResult:
    """The result of an attempt.

    Parameters
    ----------
    requirement : Requirement
        What was wanted.
    found : Attempt
        What came of it.
    blocking : tuple of Blocking
        What blocks it, where it does not hold.

    Returns
    -------
    DesignResult
        With the range of the best design, also where that one fails.
    """
    if not found.judged:
        return DesignResult(requirement=requirement, feasible=False, blocking=blocking)
    best, *others = found.judged
    corners = _with_linear(best, tuple(checked_points(best.operated, best.resolved, requirement)), requirement)
    return DesignResult(
        requirement=requirement,
        feasible=best.holds,
        design=best.resolved.design if best.holds else None,
        resolved=best.resolved,
        corners=corners,
        checks=tuple(sorted(best.checks, key=_urgency)),
        blocking=blocking,
        alternatives=tuple(alternatives(requirement, best, others)),
        frequency_spread_hz=frequency_spread(requirement, best),
        values=component_values(best),
        heat_sinks=worst_heat_sinks(best.operated, best.resolved),
        warnings=_start_stress(best) + gathered_warnings(corners) + _notes(best),
        cautions=gathered([point.cautions for point in corners]),
        assumptions=gathered([point.assumptions for point in corners]),
    )


def frequency_spread(requirement: Requirement, best: Judged) -> tuple[float, float]:
    """Lowest and highest frequency at nominal supply and full load, over ambient and regulator lag [Hz]."""
    operated = best.operated
    full = np.flatnonzero(operated.load >= requirement.output.current_max * (1.0 - 1e-6))
    distance = np.abs(operated.parameter("supply_voltage")[full] - requirement.supply.voltage_nominal)
    nominal = full[distance <= distance.min() + 1e-9]
    factor = best.resolved.regulator.output_inductance_factor
    rows = np.concatenate([operated.rows[nominal], operated.rows[nominal]])
    rows[:, COLUMN["output_inductance"]] *= np.repeat((factor, 1.0 / factor), len(nominal))
    found = steady_states(rows, jobs=1).column("frequency_hz")
    return float(found.min()), float(found.max())


def _urgency(check: object) -> tuple[bool, float]:
    margin = getattr(check, "margin", None)
    return bool(getattr(check, "holds", True)), float("-inf") if margin is None else float(margin)


def _with_linear(
    best: Judged, corners: tuple[OperatingPoint, ...], requirement: Requirement
) -> tuple[OperatingPoint, ...]:
    """The points, with the same job done linearly beside the one at nominal supply, full load and most heat."""
    index = max(
        range(len(corners)),
        key=lambda i: (
            corners[i].load_a >= requirement.output.current_max * (1.0 - 1e-6),
            -abs(corners[i].supply_v - requirement.supply.voltage_nominal),
            corners[i].ambient_c,
        ),
    )
    linear = linear_alternative(best.operated, best.resolved, index)
    return (*corners[:index], replace(corners[index], linear=linear), *corners[index + 1 :])


def _start_stress(best: Judged) -> tuple[str, ...]:
    """What a start from rest at the highest supply and full load asks of the parts."""
    operated = best.operated
    worst = int(np.lexsort((operated.load, operated.parameter("supply_voltage")))[-1])
    alone = operate_rows(operated.base_rows[worst : worst + 1], best.resolved, operated.ambient_c[worst : worst + 1])
    transient, _ = start_from_rest(alone, best.resolved)
    supply = float(operated.parameter("supply_voltage")[worst])
    peak = f"switched on at once into full load at {supply:g} V the choke peaks at {transient.peak_choke_a:.3g} A"
    if transient.settling_s is not None:
        peak += f"; the output settles in {transient.settling_s * 1e3:.2g} ms"
    return (peak, *start_warnings(transient, best.resolved))


def _notes(best: Judged) -> tuple[str, ...]:
    """Warnings about the choice itself."""
    chosen = best.finish.input_capacitor
    if chosen is None:
        return ("no capacitor in the tables is rated for the supply: choose the input capacitor by hand",)
    if chosen.parallel > 1:
        return (f"input capacitor: {chosen.parallel} pieces of {chosen.part.name} in parallel",)
    return ()
