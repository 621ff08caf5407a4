"""The points of a study over requirements: each is designed anew, and its design simulated, as columns."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import numpy as np

from buckdesign.design.attempts import Attempt, attempt
from buckdesign.design.describing import component_values
from buckdesign.design.judging import Judged, part_of
from buckdesign.design.requirement import Requirement, requirement_from_tree, requirement_keys
from buckdesign.errors import FaultsError
from buckdesign.parts import Tables
from buckdesign.studies.constraint import Constraint
from buckdesign.studies.design_points import fault_text
from buckdesign.studies.point_model import Column
from buckdesign.studies.result_columns import RESULT_COLUMNS, TEXT_COLUMNS, TRUTH_COLUMNS
from buckdesign.studies.space import Space
from buckdesign.units import format_quantity

CHOSEN: tuple[str, ...] = (
    "regulator", "r1_ohm", "r2_ohm", "rh_ohm", "ch_f", "rbe_ohm", "rdrive_ohm", "rdrive_power_w", "transistor",
    "rectifier", "rectifiers_parallel", "core", "material", "stack", "turns", "wire", "strands", "inductance_h",
    "inductance_biased_h", "choke_resistance_ohm", "output_capacitor", "output_capacitance_f", "output_esr_ohm",
    "input_capacitor", "input_capacitors_parallel", "input_capacitance_f", "heatsink_k_per_w",
)  # fmt: skip
"""Component values of a design that a row carries, as ``values.<key>``; keys as `design` has them."""

CHOSEN_NAMES = frozenset(
    ("regulator", "transistor", "rectifier", "core", "material", "wire", "output_capacitor", "input_capacitor")
)
"""Those of them that are words."""

WORST: tuple[str, ...] = ("worst.efficiency", "worst.ripple_v", "worst.frequency_hz", "worst.total_loss_w")
"""Lowest efficiency at full load, largest ripple, lowest rate from half to full load and largest loss of the
whole range."""


class RedesignModel:
    """Designs each requirement of a study; it can be sent to another process.

    Parameters
    ----------
    base : Requirement
        The requirement that is varied.
    space : Space
        The points.
    tables : Tables
        Parts to choose from.
    subject_to : sequence of Constraint
        What a point should keep.
    """

    electrical_only = False

    def __init__(
        self, base: Requirement, space: Space, tables: Tables, *, subject_to: Sequence[Constraint] = ()
    ) -> None:
        self.base, self.space, self.tables = base, space, tables
        self.subject_to = tuple(subject_to)

    @property
    def count(self) -> int:
        """Number of points."""
        return self.space.count

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns: varied keys, results, what was chosen, then what is said about the point."""
        constraints = ("constraints_hold",) if self.subject_to else ()
        chosen = tuple(f"values.{name}" for name in CHOSEN)
        return (*self.space.keys, *RESULT_COLUMNS, *WORST, *chosen, *TRUTH_COLUMNS, "violated", *constraints, "failure")

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
            By name of `columns`, ``stop - start`` entries each; NaN: not known. The results are those at the
            nominal supply, the full load and the highest ambient.
        """
        values = self.space.values(start, stop)
        rows = [
            self._row({key: _plain(column[index]) for key, column in values.items()}, jobs)
            for index in range(stop - start)
        ]
        found: dict[str, Column] = {**values}
        for name in self.columns[len(values) :]:
            if name != "constraints_hold":
                found[name] = _column(name, [row.get(name) for row in rows])
        if not self.subject_to:
            return found
        holds = np.array([not row.get("failure") for row in rows], dtype=bool)
        for constraint in self.subject_to:
            holds &= constraint.holds(found[constraint.key])
        found["constraints_hold"] = holds
        return {name: found[name] for name in self.columns}

    def _row(self, values: Mapping[str, Any], jobs: int | None) -> dict[str, Any]:
        try:
            requirement = requirement_with(self.base, values, self.tables)
        except FaultsError as error:
            return {"failure": "; ".join(map(fault_text, error.faults)), "within_limits": False}
        found = attempt(requirement, self.tables, jobs=jobs)
        if not found.judged:
            return {"failure": f"infeasible: {why_not(found)}", "within_limits": False}
        best = found.judged[0]
        row = row_of(best, requirement)
        if best.holds:
            return row
        names = "; ".join(check.name for check in best.failed)
        return row | {"violated": names, "failure": f"infeasible: the best design found fails {names}"}


def requirement_with(base: Requirement, values: Mapping[str, Any], tables: Tables) -> Requirement:
    """A requirement with some values replaced, checked like a file.

    Parameters
    ----------
    base : Requirement
        The requirement to start from.
    values : Mapping
        New value by dotted key.
    tables : Tables
        Parts that it may name.

    Returns
    -------
    Requirement
        The new one.

    Raises
    ------
    FaultsError
        A value isn't allowed, by itself or beside the others.
    """
    tree, keys = base.tree(), requirement_keys()
    for key, value in values.items():
        section, _, name = key.partition(".")
        tree[section] = dict(tree.get(section, {})) | {name: keys[key].write(value)}
    path = base.source or Path("requirement")
    return requirement_from_tree(tree, lambda *steps: None, (), path=path, tables=tables)


def why_not(found: Attempt) -> str:
    """Why there is no design at all, in words."""
    if found.trouble or not found.lacks:
        return found.trouble or "no design was found"
    return "; ".join(
        f"no {one.kind} will do, {one.part} comes nearest: {one.what} "
        f"{format_quantity(one.offered, one.unit, ascii_only=True)} "
        f"of {format_quantity(one.required, one.unit, ascii_only=True)}"
        for one in found.lacks
    )


def row_of(best: Judged, requirement: Requirement) -> dict[str, Any]:
    """The row of a design.

    Parameters
    ----------
    best : Judged
        The design over its range.
    requirement : Requirement
        What it was made for.

    Returns
    -------
    dict
        By column; without what is said about the point.
    """
    operated = best.operated
    full = operated.load >= requirement.output.current_max * (1.0 - 1e-6)
    away = np.abs(operated.parameter("supply_voltage") - requirement.supply.voltage_nominal)
    index = int(np.lexsort((-operated.ambient_c, away, ~full))[0])
    point = part_of(operated, slice(index, index + 1)).columns()
    half = operated.load >= requirement.output.current_max * (0.5 - 1e-6)
    loop = operated.loop
    chosen = component_values(best)
    return {
        "settled": bool(operated.is_settled[index]),
        "within_limits": best.holds,
        **{name: point[name][0] for name in RESULT_COLUMNS},
        "worst.efficiency": operated.efficiency[full].min(),
        "worst.ripple_v": (loop.column("output_max_v") - loop.column("output_min_v")).max(),
        "worst.frequency_hz": loop.column("frequency_hz")[half].min(),
        "worst.total_loss_w": operated.total_loss.max(),
        **{f"values.{name}": chosen.get(name) for name in CHOSEN},
    }


def _plain(value: Any) -> Any:
    return value.item() if isinstance(value, np.generic) else value


def _column(name: str, cells: list[Any]) -> Column:
    words = name in TEXT_COLUMNS or name in ("violated", "failure") or name.removeprefix("values.") in CHOSEN_NAMES
    if name in TRUTH_COLUMNS:
        return [None if cell is None else bool(cell) for cell in cells]
    if words:
        return ["" if cell is None else str(cell) for cell in cells]
    return np.array([np.nan if cell is None else float(cell) for cell in cells])
