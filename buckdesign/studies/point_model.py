"""The points of a study computed: variants of a design, each at its own operating point, as columns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.checks import Limit, part_limits
from buckdesign.design.design_file import Design
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.operated import Operated, operate_rows
from buckdesign.design.requirement_checks import requirement_limits
from buckdesign.loop.results import STUDY, Effort
from buckdesign.parts import Tables
from buckdesign.studies.constraint import Constraint
from buckdesign.studies.design_points import DesignPoints, Values
from buckdesign.studies.result_columns import RESULT_COLUMNS, TEXT_COLUMNS, TRUTH_COLUMNS
from buckdesign.studies.space import Space

Column = NDArray[Any] | list[Any]

NO_STEADY_STATE = "no steady state found"
"""Failure of a point whose loop came to no result."""


class PointModel:
    """Computes the points of a study; it can be sent to another process.

    Parameters
    ----------
    base : Design
        The design that is varied.
    space : Space
        The points.
    tables : Tables
        Parts that the variants name.
    subject_to : sequence of Constraint
        What a point should keep.
    electrical_only : bool
        No temperatures and no losses added on.
    effort : Effort
        How long to look for each steady state.
    """

    def __init__(
        self,
        base: Design,
        space: Space,
        tables: Tables,
        *,
        subject_to: Sequence[Constraint] = (),
        electrical_only: bool = False,
        effort: Effort = STUDY,
    ) -> None:
        self.base, self.space, self.tables = base, space, tables
        self.subject_to = tuple(subject_to)
        self.electrical_only, self.effort = electrical_only, effort

    @property
    def count(self) -> int:
        """Number of points."""
        return self.space.count

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns: varied keys, results, then what is said about the point."""
        constraints = ("constraints_hold",) if self.subject_to else ()
        return (*self.space.keys, *RESULT_COLUMNS, *TRUTH_COLUMNS, "violated", *constraints, "failure")

    @cached_property
    def points(self) -> DesignPoints:
        return DesignPoints(self.base, self.tables, is_heated=not self.electrical_only)

    def __getstate__(self) -> dict[str, Any]:
        return {name: value for name, value in self.__dict__.items() if name != "points"}

    def evaluate(self, start: int, stop: int, jobs: int | None = 1) -> dict[str, Column]:
        """Some of the points.

        Parameters
        ----------
        start, stop : int
            First point and the one after the last.
        jobs : int, optional
            Threads; all processors where None.

        Returns
        -------
        dict
            By name of `columns`, arrays or lists of ``stop - start`` entries; NaN: not known. Texts are empty
            where there is nothing to say.
        """
        count = stop - start
        values = self.space.values(start, stop)
        variants = self.points.variants(values, count)
        made = variants.is_made
        found: dict[str, Column] = {name: _all_unknown(name, count) for name in RESULT_COLUMNS}
        settled, violated = np.zeros(count, dtype=bool), [""] * count
        failures = variants.failures
        if made.any():
            operated = operate_rows(
                variants.rows,
                variants.designs,
                variants.ambient_c,
                electrical_only=self.electrical_only,
                effort=self.effort,
                jobs=jobs,
            )
            which = np.flatnonzero(made)
            _place(found, operated.columns(), which)
            settled[which] = operated.is_settled
            for index, text in zip(which, self._violated(operated, variants.designs), strict=True):
                violated[index] = text
            for index in which[~np.isfinite(operated.loop.column("output_voltage_v"))]:
                failures[index] = NO_STEADY_STATE
        return self._in_order(values, found, settled, violated, failures)

    def _violated(self, operated: Operated, designs: Sequence[ResolvedDesign]) -> list[str]:
        limits = part_limits(operated, designs)
        if self.base.requirement is not None:
            limits += requirement_limits(operated, self.base.requirement, designs)
        return names_of_failed(limits, len(operated))

    def _in_order(
        self,
        values: Mapping[str, Values],
        found: Mapping[str, Column],
        settled: NDArray[np.bool_],
        violated: list[str],
        failures: list[str],
    ) -> dict[str, Column]:
        good = np.array([not text for text in failures], dtype=bool)
        within = np.array([not text for text in violated], dtype=bool) & good
        told: dict[str, Column] = {"settled": settled, "within_limits": within, "violated": violated}
        if self.subject_to:
            given: dict[str, Any] = {**values, **found, **told}
            holds = good.copy()
            for constraint in self.subject_to:
                holds &= constraint.holds(given[constraint.key])
            told["constraints_hold"] = holds
        return {**values, **{name: found[name] for name in RESULT_COLUMNS}, **told, "failure": failures}


def _all_unknown(name: str, count: int) -> Column:
    return [""] * count if name in TEXT_COLUMNS else np.full(count, np.nan)


def _place(found: dict[str, Column], columns: Mapping[str, Any], which: NDArray[np.intp]) -> None:
    """Put the columns of some points where they belong among all."""
    for name, column in found.items():
        if isinstance(column, list):
            for index, word in zip(which, columns[name], strict=True):
                column[index] = word
        else:
            column[which] = columns[name]


def names_of_failed(limits: Sequence[Limit], count: int) -> list[str]:
    """For each point the names of the limits that it does not keep, joined by semicolons.

    Parameters
    ----------
    limits : sequence of Limit
        Limits at the points.
    count : int
        Number of points.

    Returns
    -------
    list of str
        `count` texts, empty where all hold.
    """
    told = [""] * count
    for limit in limits:
        for index in np.flatnonzero(~limit.holds):
            told[index] = f"{told[index]}; {limit.name}" if told[index] else limit.name
    return told
