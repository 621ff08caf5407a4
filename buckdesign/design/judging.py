"""Rounded designs simulated over the whole range, with losses and temperatures, and held against all
limits."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace

import numpy as np

from buckdesign.design.blueprint import Blueprint, Finish, design_of
from buckdesign.design.checks import Limit, worst_checks
from buckdesign.design.coils import SMALL_VOLUME
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.finishing import finish, provisional
from buckdesign.design.losses import LossData
from buckdesign.design.network_search import COARSE, high_resistance_cost
from buckdesign.design.operated import Operated, Points, operate_rows, points_of, rows_at
from buckdesign.design.operating import all_limits
from buckdesign.design.operating_point import Check
from buckdesign.design.requirement import Requirement
from buckdesign.design.resolve import resolve_design
from buckdesign.design.scoring import SMALL_POWER, PointGrid, behaviour, comfort
from buckdesign.design.sizing import conduction_onset, lowest_nominal_highest, range_loads
from buckdesign.design.temperatures import Balance
from buckdesign.errors import InfeasibleError
from buckdesign.loop.results import Effort, SteadyStates
from buckdesign.parts import Tables

USUAL_VOLUME = 0.35e-6
"""Volume of a wound ring over output power [m3/W] (common practice)."""

THIN_MARGIN = 0.06
"""Margin of a check below which a design is worth improving [1] (own choice)."""

UNKNOWN_VIOLATION = 2.0
"""What a check counts whose value can't be given, such as in thermal runaway [1] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Judged:
    """A rounded design over its range.

    Attributes
    ----------
    plan : Blueprint
        Its values.
    finish : Finish
        Ratings, input capacitor, heat sink.
    resolved : ResolvedDesign
        The design with every value in place.
    operated : Operated
        The range.
    limits : tuple of Limit
        All limits there.
    checks : tuple of Check
        Each limit where it is nearest.
    score : float
        Rank; smaller is better.
    """

    plan: Blueprint
    finish: Finish
    resolved: ResolvedDesign
    operated: Operated
    limits: tuple[Limit, ...]
    checks: tuple[Check, ...]
    score: float

    @property
    def holds(self) -> bool:
        """Whether every limit holds."""
        return all(check.holds for check in self.checks)

    @property
    def failed(self) -> tuple[Check, ...]:
        """Checks that do not hold."""
        return tuple(check for check in self.checks if not check.holds)


def range_points(requirement: Requirement, resolved: ResolvedDesign, ambients: Sequence[float]) -> Points:
    """The range: every supply, at least eight loads, some ambients [degC]."""
    onset = conduction_onset(
        resolved.regulator, resolved.transistor, resolved.network.r1, resolved.network.rbe
    )
    axes = (
        np.asarray(ambients, dtype=float),
        np.asarray(lowest_nominal_highest(requirement.supply.voltage)),
        np.asarray(range_loads(requirement, onset)),
    )
    ambient, supply, load = (axis.ravel() for axis in np.meshgrid(*axes, indexing="ij"))
    return points_of(resolved, supply=supply, load_current=load, ambient_c=ambient)


def ambients_of(requirement: Requirement) -> tuple[float, ...]:
    """Ambients to look at, the highest first [degC]."""
    low, high = requirement.limits.ambient
    return (high,) if high - low < 1.0 else (high, low)


def judge(
    requirement: Requirement,
    tables: Tables,
    plans: Sequence[Blueprint],
    *,
    ambients: Sequence[float],
    effort: Effort = COARSE,
    jobs: int | None = None,
) -> list[Judged]:
    """Simulate blueprints over the range, finish them, and check everything.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    tables : Tables
        Parts.
    plans : sequence of Blueprint
        Rounded designs.
    ambients : sequence of float
        [degC].
    effort : Effort
        How long the loop looks for a steady state.
    jobs : int, optional
        Threads.

    Returns
    -------
    list of Judged
        Best first; those that can't be finished are left out.
    """
    if not plans:
        return []
    first = [provisional(requirement, tables, plan) for plan in plans]
    rough = _operate(requirement, tables, list(zip(plans, first, strict=True)), ambients[:1], effort, jobs)
    ready: list[tuple[Blueprint, Finish]] = []
    for (resolved, operated), plan in zip(rough, plans, strict=True):
        try:
            ready.append((plan, finish(requirement, tables, operated, resolved)))
        except InfeasibleError:
            continue
    if not ready:
        return []
    done = _operate(requirement, tables, ready, ambients, effort, jobs)
    found = [
        _judged(requirement, plan, ended, resolved, operated)
        for (plan, ended), (resolved, operated) in zip(ready, done, strict=True)
    ]
    return sorted(found, key=lambda one: one.score)


def _operate(
    requirement: Requirement,
    tables: Tables,
    plans: Sequence[tuple[Blueprint, Finish]],
    ambients: Sequence[float],
    effort: Effort,
    jobs: int | None,
) -> list[tuple[ResolvedDesign, Operated]]:
    """The range of several designs in one call."""
    designs = [resolve_design(design_of(requirement, tables, *pair), tables) for pair in plans]
    ranges = [range_points(requirement, one, ambients) for one in designs]
    rows = np.concatenate([rows_at(one, points) for one, points in zip(designs, ranges, strict=True)])
    each = [one for one, points in zip(designs, ranges, strict=True) for _ in range(len(points))]
    ambient = np.concatenate([points.ambient_c for points in ranges])
    together = operate_rows(rows, each, ambient, effort=effort, jobs=jobs)
    ends = np.cumsum([len(points) for points in ranges])
    parts = [slice(end - len(points), end) for end, points in zip(ends, ranges, strict=True)]
    return [(one, part_of(together, part)) for one, part in zip(designs, parts, strict=True)]


def part_of(operated: Operated, part: slice) -> Operated:
    """Some of the operating points."""
    balance, loop = operated.balance, operated.loop
    return replace(
        operated,
        rows=operated.rows[part],
        base_rows=operated.base_rows[part],
        ambient_c=operated.ambient_c[part],
        loop=SteadyStates(values=loop.values[part], ends=loop.ends[part]),
        data=LossData(**{one.name: getattr(operated.data, one.name)[part] for one in fields(LossData)}),
        balance=Balance(
            losses={name: values[part] for name, values in balance.losses.items()},
            junction_c=balance.junction_c[part],
            choke_c=balance.choke_c[part],
            runaway=balance.runaway[part],
        ),
        is_settled=operated.is_settled[part],
    )


def _judged(
    requirement: Requirement, plan: Blueprint, ended: Finish, resolved: ResolvedDesign, operated: Operated
) -> Judged:
    limits = all_limits(operated, resolved, requirement)
    checks = worst_checks(limits, operated)
    return Judged(
        plan=plan,
        finish=ended,
        resolved=resolved,
        operated=operated,
        limits=tuple(limits),
        checks=checks,
        score=_score(requirement, operated, limits, checks, plan.rh),
    )


def violation(check: Check) -> float:
    """How far a check misses, relative; 0 where it holds [1]."""
    if check.holds:
        return 0.0
    return UNKNOWN_VIOLATION if check.margin is None else min(max(-check.margin, 0.01), 10.0)


def _score(
    requirement: Requirement,
    operated: Operated,
    limits: Sequence[Limit],
    checks: Sequence[Check],
    plan_rh: float,
) -> float:
    broken = sum(violation(check) for check in checks)
    held = sum(float(np.mean(~limit.holds)) for limit in limits)
    thin = sum(
        max(0.0, THIN_MARGIN - check.margin) / THIN_MARGIN
        for check in checks
        if check.margin is not None and check.holds and not _is_narrow(check)
    )
    points = PointGrid(
        supply=operated.parameter("supply_voltage"),
        load=operated.load,
        is_cold=np.zeros(len(operated), dtype=bool),
    )
    added = operated.total_loss + operated.output_power - operated.loop.column("input_w")
    liked = comfort(requirement, points, behaviour(operated.loop, added, len(points)))
    return 100.0 * broken + 20.0 * held + thin + float(liked[0]) + _size(requirement, operated, plan_rh)


def _is_narrow(check: Check) -> bool:
    """Checks whose margins are small by nature: one per cent of efficiency is much."""
    return check.name in ("efficiency",) and (check.margin or 0.0) > 0.005


def _size(requirement: Requirement, operated: Operated, judged_rh: float) -> float:
    """Cost of the choke's volume, 0.6 for each doubling beyond what is usual, and of very large resistors."""
    volume = max(float(operated.data.choke_volume[0]), SMALL_VOLUME)
    usual = USUAL_VOLUME * (requirement.output.voltage * requirement.output.current_max + SMALL_POWER)
    return 0.6 * float(np.maximum(np.log2(volume / usual), -1.0)) + float(high_resistance_cost(judged_rh))


__all__ = ["Judged", "ambients_of", "judge", "part_of", "range_points", "violation"]
