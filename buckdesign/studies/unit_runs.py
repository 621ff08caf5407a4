"""Units of a design over the range of its requirement: margins to every limit at the worst point of each.

What a requirement asks is asked of the unit itself: no guaranteed value stands in for its own, and it starts by
itself where its start margin is above 1 at full load with all parts at ambient temperature.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.checks import part_limits
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.hot_parameters import hot_data, parameters_at
from buckdesign.design.limits import Limit
from buckdesign.design.operated import Operated, Points, operate_rows, rows_at
from buckdesign.design.requirement import Requirement
from buckdesign.design.requirement_checks import requirement_limits, start_margins
from buckdesign.design.sections import DEVICES
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import STUDY, Effort
from buckdesign.physics.capacitor import ripple_rise
from buckdesign.studies.result_columns import RESULT_COLUMNS, TEXT_COLUMNS
from buckdesign.studies.unit_designs import unit_design
from buckdesign.units import format_quantity

Floats = NDArray[np.float64]
Factors = Mapping[str, Floats]

CHUNK = 4096
"""Operating points computed in one call [1] (own choice: memory, and a quick end on Ctrl-C)."""

PART_LIMITS = "part limits"
"""Name of all part limits together."""

START = "starts by itself"

START_MARGIN = 1.0
"""Start margin above which a unit starts by itself [1] (derived: the static solution is unstable)."""

ROUNDING = 1e-9
"""Margin that still counts as kept [1]."""


@dataclass(frozen=True, kw_only=True)
class UnitRuns:
    """Units and how they keep each limit at their worst point.

    Attributes
    ----------
    requirements, parts : tuple of str
        Names of what is required, `PART_LIMITS` last, and of the single part limits.
    units : tuple of str
        Of the values and limits by name, as in `buckdesign.units`; ``1`` for all part limits together.
    margin, value, limit : NDArray
        At the point where the margin of a limit is smallest, shape (n, names); a margin is infinite where the
        limit applies nowhere, and minus infinity where its value can't be given.
    point : NDArray
        Index of that point, shape (n, names).
    columns : dict
        Keys of a simulation at the worst point of all limits, arrays or lists of n.
    capacitor_c, choke_c : NDArray
        Core of the output capacitor and choke at the usual point [degC], shape (n,); NaN: not known.
    """

    requirements: tuple[str, ...]
    parts: tuple[str, ...]
    units: tuple[str, ...]
    margin: Floats
    value: Floats
    limit: Floats
    point: NDArray[np.intp]
    columns: dict[str, NDArray[np.float64] | list[str]]
    capacitor_c: Floats
    choke_c: Floats

    def __len__(self) -> int:
        return len(self.margin)

    @property
    def names(self) -> tuple[str, ...]:
        """All names, in the order of the columns of `margin`."""
        return self.requirements + self.parts

    @property
    def applied(self) -> tuple[str, ...]:
        """Names of what applies to some unit somewhere."""
        known = np.isfinite(self.margin).any(axis=0) | (self.margin == -np.inf).any(axis=0)
        return tuple(name for name, is_known in zip(self.names, known, strict=True) if is_known)

    def margins(self, name: str) -> Floats:
        """Margins of all units to one limit [1], shape (n,)."""
        return self.margin[:, self.names.index(name)]

    @property
    def worst(self) -> NDArray[np.intp]:
        """Column of the limit that each unit keeps least, a single part limit rather than all of them."""
        together = self.names.index(PART_LIMITS)
        single = self.margin.copy()
        single[:, together] = np.inf
        return np.asarray(single.argmin(axis=1), dtype=np.intp)

    @property
    def least(self) -> Floats:
        """Smallest margin of each unit [1], shape (n,)."""
        return self.margin.min(axis=1)

    @property
    def holds(self) -> NDArray[np.bool_]:
        """Whether each unit keeps each limit, shape (n, names)."""
        return np.asarray(self.margin >= -ROUNDING, dtype=bool)

    @property
    def passes(self) -> NDArray[np.bool_]:
        """Whether each unit keeps all, shape (n,)."""
        return np.asarray(self.holds.all(axis=1), dtype=bool)

    def violated(self, unit: int) -> tuple[str, ...]:
        """Names of what a unit does not keep."""
        return tuple(
            name
            for name, kept in zip(self.names, self.holds[unit], strict=True)
            if not kept and name != PART_LIMITS
        )


def some_of(runs: UnitRuns, which: NDArray[np.intp]) -> UnitRuns:
    """Some of the units."""
    taken: dict[str, Any] = {}
    for one in fields(UnitRuns):
        value = getattr(runs, one.name)
        taken[one.name] = value[which] if isinstance(value, np.ndarray) else value
    taken["columns"] = {
        name: [column[index] for index in which] if isinstance(column, list) else column[which]
        for name, column in runs.columns.items()
    }
    return UnitRuns(**taken)


def joined(runs: Sequence[UnitRuns]) -> UnitRuns:
    """Several runs of the same model as one."""
    first = runs[0]
    whole: dict[str, Any] = {}
    for one in fields(UnitRuns):
        values = [getattr(run, one.name) for run in runs]
        if isinstance(values[0], np.ndarray):
            whole[one.name] = np.concatenate(values)
        else:
            whole[one.name] = values[0]
    whole["columns"] = {
        name: [word for run in runs for word in run.columns[name]]
        if isinstance(column, list)
        else np.concatenate([np.asarray(run.columns[name], dtype=float) for run in runs])
        for name, column in first.columns.items()
    }
    return UnitRuns(**whole)


@dataclass(frozen=True, kw_only=True)
class UnitModel:
    """Computes units.

    Attributes
    ----------
    nominal : ResolvedDesign
        The design.
    requirement : Requirement
        What is asked.
    points : Points
        Where it is asked.
    usual : int
        Index of the point at which units are taken to spend their lives.
    electrical_only : bool
        No temperatures and no losses added on.
    jobs : int or None
        Threads; all processors where None.
    effort : Effort
        How long to look for each steady state.
    """

    nominal: ResolvedDesign
    requirement: Requirement
    points: Points
    usual: int
    electrical_only: bool = False
    jobs: int | None = None
    effort: Effort = STUDY

    def evaluate(self, factors: Factors) -> UnitRuns:
        """Units by the factors on their values.

        Parameters
        ----------
        factors : Mapping
            By key, shape (n,) [1]; n at least 1.

        Returns
        -------
        UnitRuns
            Their margins.
        """
        count = len(next(iter(factors.values())))
        step = max(CHUNK // len(self.points), 1)
        return joined(
            [
                self._chunk({key: values[start : start + step] for key, values in factors.items()})
                for start in range(0, count, step)
            ]
        )

    def operated(self, factors: Factors) -> tuple[Operated, list[ResolvedDesign]]:
        """Every unit at every point, the unit slowest; and the design of each row."""
        count = len(next(iter(factors.values())))
        units = [
            unit_design(self.nominal, {key: float(values[index]) for key, values in factors.items()})
            for index in range(count)
        ]
        rows = np.concatenate([rows_at(unit, self.points) for unit in units])
        designs = [unit for unit in units for _ in range(len(self.points))]
        operated = operate_rows(
            rows,
            designs,
            np.tile(self.points.ambient_c, count),
            electrical_only=self.electrical_only,
            effort=self.effort,
            jobs=self.jobs,
        )
        return operated, designs

    def _chunk(self, factors: Factors) -> UnitRuns:
        """Some units; where the values of one are so far off that a result overflows, it fails."""
        with np.errstate(over="ignore", invalid="ignore", divide="ignore"):
            operated, designs = self.operated(factors)
            required, parts = self.limits(operated, designs)
            return self._summary(operated, designs, required, parts)

    def limits(
        self, operated: Operated, designs: Sequence[ResolvedDesign]
    ) -> tuple[list[Limit], list[Limit]]:
        """What is required of the units, and the limits of their parts."""
        required = [
            self._start(operated, designs) if limit.name == START else limit
            for limit in requirement_limits(operated, self.requirement, designs)
        ]
        return required, part_limits(operated, designs)

    def _start(self, operated: Operated, designs: Sequence[ResolvedDesign]) -> Limit:
        """Start margin of the unit at full load, where the load is full, before anything gets warm."""
        full = self.requirement.output.current_max
        at_full = operated.base_rows[:, COLUMN["load_current"]] >= full * (1.0 - 1e-6)
        which = np.flatnonzero(at_full)
        rows, ambient = operated.base_rows[which], operated.ambient_c[which]
        if not self.electrical_only and len(which):
            cold = np.repeat(ambient[:, None], len(DEVICES), axis=1)
            rows = parameters_at(
                rows, hot_data([designs[int(index)] for index in which]), cold, ambient, ambient
            )
        value = np.full(len(operated), np.nan)
        value[which] = start_margins(rows)
        return Limit(
            name=START,
            unit="1",
            value=value,
            limit=np.full(len(operated), START_MARGIN),
            applies=at_full & ~np.isnan(value),
            is_upper=False,
            note="start margin of the unit itself at full load, all parts at ambient temperature",
        )

    def _summary(
        self,
        operated: Operated,
        designs: Sequence[ResolvedDesign],
        required: Sequence[Limit],
        parts: Sequence[Limit],
    ) -> UnitRuns:
        count = len(operated) // len(self.points)
        found = [_worst_points(limit, count) for limit in (*required, *parts)]
        together = _together(found[len(required) :])
        found.insert(len(required), together)
        margin, value, limit, point = (np.stack([one[place] for one in found], axis=1) for place in range(4))
        rows = np.arange(count) * len(self.points)
        where = np.take_along_axis(point, margin.argmin(axis=1)[:, None], axis=1)[:, 0]
        return UnitRuns(
            requirements=(*(one.name for one in required), PART_LIMITS),
            parts=tuple(one.name for one in parts),
            units=(*(one.unit for one in required), "1", *(one.unit for one in parts)),
            margin=margin,
            value=value,
            limit=limit,
            point=point.astype(np.intp),
            columns=_columns(operated, rows + where.astype(np.intp)),
            capacitor_c=_capacitor_c(operated, designs, rows + self.usual),
            choke_c=operated.balance.choke_c[rows + self.usual],
        )

    def where(self, point: int) -> str:
        """A point in a few words."""
        points = self.points
        words = (
            format_quantity(float(points.supply[point]), "V", ascii_only=True),
            format_quantity(float(points.load_current[point]), "A", ascii_only=True),
            format_quantity(float(points.ambient_c[point]), "degC", ascii_only=True),
        )
        return ", ".join(words)


def _worst_points(limit: Limit, count: int) -> tuple[Floats, Floats, Floats, Floats]:
    """Smallest margin of each unit, the value and limit there, and the point."""
    known = np.where(np.isnan(limit.margin) | np.isnan(limit.value), -np.inf, limit.margin)
    margin = np.where(limit.applies, known, np.inf).reshape(count, -1)
    point = margin.argmin(axis=1)
    pick = point[:, None]
    value = np.take_along_axis(limit.value.reshape(count, -1), pick, axis=1)[:, 0]
    bound = np.take_along_axis(limit.limit.reshape(count, -1), pick, axis=1)[:, 0]
    least = np.take_along_axis(margin, pick, axis=1)[:, 0]
    return least, value, bound, point.astype(float)


def _together(
    found: Sequence[tuple[Floats, Floats, Floats, Floats]],
) -> tuple[Floats, Floats, Floats, Floats]:
    """The part limit with the smallest margin of each unit."""
    least = np.stack([one[0] for one in found]).argmin(axis=0)[None, :]
    margin, value, limit, point = (
        np.take_along_axis(np.stack([one[place] for one in found]), least, axis=0)[0] for place in range(4)
    )
    return margin, value, limit, point


def _columns(operated: Operated, which: NDArray[np.intp]) -> dict[str, NDArray[np.float64] | list[str]]:
    columns = operated.columns()
    return {
        name: [str(columns[name][index]) for index in which]
        if name in TEXT_COLUMNS
        else np.asarray(columns[name], dtype=float)[which]
        for name in RESULT_COLUMNS
    }


def _capacitor_c(operated: Operated, designs: Sequence[ResolvedDesign], which: NDArray[np.intp]) -> Floats:
    """Core temperature of the output capacitors [degC]."""
    rated = [designs[int(index)].output_capacitor.ripple_current for index in which]
    known = np.array([np.inf if one is None else one for one in rated])
    ripple = operated.loop.column("output_capacitor_rms_a")[which]
    return np.asarray(operated.ambient_c[which] + ripple_rise(ripple, known), dtype=float)
