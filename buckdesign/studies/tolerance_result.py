"""Results of a tolerance study: the table of units and what it sums up to."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.studies.ageing import Wear
from buckdesign.studies.sensitivity import Sensitivity
from buckdesign.studies.spreads import density
from buckdesign.studies.tolerance_keys import Varied
from buckdesign.studies.unit_runs import PART_LIMITS, UnitModel, UnitRuns
from buckdesign.studies.worst_case import WorstCase, moved_alone
from buckdesign.studies.yields import Tighter, Yield, yield_of

if TYPE_CHECKING:
    import pandas as pd

WORST_UNITS = 10
"""Units listed by name [1]."""

EXTREMES = 3
"""Values listed of each [1]."""

DIGITS = 10
"""Significant digits of the numbers in rows [1], as in tables on disk."""


@dataclass(frozen=True, kw_only=True)
class WorstUnit:
    """A unit that is far from passing, or the nearest to failing.

    Attributes
    ----------
    unit, seed : int
        Its number and the seed: enough to compute it again.
    name : str
        What it keeps least.
    value, limit : float or None
        There, SI.
    margin : float
        Relative to the limit [1].
    where : str
        Operating point.
    extremes : tuple of tuple
        Key, value [SI] and deviation from nominal [1] of the values that have most to do with it: near an end of
        their band, and of weight for this margin.
    """

    unit: int
    seed: int
    name: str
    value: float | None
    limit: float | None
    margin: float
    where: str
    extremes: tuple[tuple[str, float, float], ...]

    def to_dict(self) -> dict[str, Any]:
        """The unit by key, for JSON."""
        return {
            "unit": self.unit,
            "seed": self.seed,
            "requirement": self.name,
            "value": self.value,
            "limit": self.limit,
            "margin": self.margin,
            "where": self.where,
            "extremes": [
                {"key": key, "value": value, "deviation": deviation}
                for key, value, deviation in self.extremes
            ],
        }


@dataclass(frozen=True, kw_only=True)
class ToleranceStudy:
    """A tolerance study.

    Attributes
    ----------
    varied : tuple of Varied
        What differs from unit to unit.
    model : UnitModel
        Design, requirement and points.
    range_points : int
        Points of the requirement's whole range, of which the model has some or all [1].
    seed : int
        Of the random numbers.
    factors : Mapping
        Value over nominal of each unit by key [1], shape (n,).
    runs, aged : UnitRuns, UnitRuns or None
        The units when new, and aged.
    wear : Wear or None
        How far they have aged.
    worst_case : WorstCase
        Worst corners.
    sensitivity : Sensitivity or None
        Where the spread comes from.
    tighter : tuple of Tighter
        What half of each tolerance would bring: certain gains first, then the others, each the largest first.
    warnings : tuple of str
        What to mind.
    """

    varied: tuple[Varied, ...]
    model: UnitModel
    range_points: int
    seed: int
    factors: Mapping[str, NDArray[np.float64]]
    runs: UnitRuns
    aged: UnitRuns | None
    wear: Wear | None
    worst_case: WorstCase
    sensitivity: Sensitivity | None
    tighter: tuple[Tighter, ...]
    warnings: tuple[str, ...]

    @property
    def total(self) -> Yield:
        """Yield of units that keep everything, when new."""
        return yield_of(self.runs.passes)

    @property
    def aged_total(self) -> Yield | None:
        """The same when aged."""
        return None if self.aged is None else yield_of(self.aged.passes)

    @property
    def shown(self) -> tuple[str, ...]:
        """Names of what applies somewhere: requirements, all part limits together, single part limits."""
        return self.runs.applied

    def yield_by(self, name: str, runs: UnitRuns | None = None) -> Yield:
        """Yield by one requirement or limit, of the new units unless others are given."""
        chosen = self.runs if runs is None else runs
        return yield_of(chosen.holds[:, chosen.names.index(name)])

    def values(self) -> dict[str, NDArray[np.float64]]:
        """Values of all units by key [SI], shape (n,)."""
        return {one.key: one.value * self.factors[one.key] for one in self.varied}

    def table(self) -> dict[str, Any]:
        """One column a key, one row a unit.

        Returns
        -------
        dict
            The varied values, the keys of one simulation at the unit's worst point, what it violates, what it keeps
            least and by which margin, its margin to each requirement, whether it passes, and its number.
        """
        runs = self.runs
        columns: dict[str, Any] = {**self.values(), **runs.columns}
        columns["violated"] = ["; ".join(runs.violated(unit)) for unit in range(len(runs))]
        columns["worst"] = [runs.names[column] for column in runs.worst]
        columns["margin"] = runs.least
        for name in runs.requirements:
            if name in self.shown:
                columns[f"margins.{name.replace(' ', '_')}"] = runs.margins(name)
        columns["passes"] = runs.passes
        columns["unit"] = np.arange(len(runs))
        return columns

    def frame(self) -> pd.DataFrame:
        """`table` as a data frame; ``attrs`` hold summary and warnings."""
        import pandas as pd

        frame = pd.DataFrame(self.table())
        frame.attrs["summary"] = self.summary()
        frame.attrs["warnings"] = list(self.warnings)
        return frame

    def rows(self) -> list[dict[str, Any]]:
        """`table` as one dict a unit, numbers to `DIGITS` digits."""
        return _rows(self.table())

    def worst_units(self, count: int = WORST_UNITS) -> tuple[WorstUnit, ...]:
        """The units with the smallest margins, the worst first."""
        order = np.argsort(self.runs.least, kind="stable")[:count]
        return tuple(self._worst_unit(int(unit)) for unit in order)

    def _worst_unit(self, unit: int) -> WorstUnit:
        runs = self.runs
        column = int(runs.worst[unit])
        moved = moved_alone(self.worst_case.alone, self.worst_case.nominal.margin[0])[column]
        factors = {key: float(one[unit]) for key, one in self.factors.items()}
        return WorstUnit(
            unit=unit,
            seed=self.seed,
            name=runs.names[column],
            value=_finite(runs.value[unit, column]),
            limit=_finite(runs.limit[unit, column]),
            margin=float(runs.margin[unit, column]),
            where=self.model.where(int(runs.point[unit, column])),
            extremes=extreme_values(self.varied, factors, moved),
        )

    def summary(self) -> dict[str, Any]:
        """What the units sum up to, by key, for JSON."""
        requirements = [name for name in self.runs.requirements if name in self.shown]
        parts = [name for name in self.runs.parts if name in self.shown]
        corners = self.worst_case
        return {
            **self.total.to_dict(),
            "units": len(self.runs),
            "seed": self.seed,
            "requirements": {name: self._by_name(name, self.runs) for name in requirements},
            "part_limits": {name: self._by_name(name, self.runs) for name in parts},
            "tolerances": [one.to_dict() for one in self.varied],
            "points": self._points(),
            "range_points": self.range_points,
            "electrical_only": self.model.electrical_only,
            "worst_case": {
                "exhaustive": corners.is_exhaustive,
                "corners": corners.corners,
                "requirements": self._corners(self.runs.requirements),
                "part_limits": self._corners(self.runs.parts),
            },
            "worst_units": [one.to_dict() for one in self.worst_units()],
            "sensitivity": None if self.sensitivity is None else self.sensitivity.to_dict(),
            "tighter": [one.to_dict() for one in self.tighter],
            "aged": self._aged(requirements, parts),
        }

    def _by_name(self, name: str, runs: UnitRuns) -> dict[str, Any]:
        nominal = self.worst_case.nominal
        return {
            **self.yield_by(name, runs).to_dict(),
            "nominal_margin": float(nominal.margins(name)[0]),
            "least_margin": float(runs.margins(name).min()),
        }

    def _corners(self, names: tuple[str, ...]) -> dict[str, Any]:
        found = [one for one in self.worst_case.worst if one.name in names]
        return {one.name: one.to_dict(self.model.where(one.point)) for one in found}

    def _aged(self, requirements: list[str], parts: list[str]) -> dict[str, Any] | None:
        if self.aged is None or self.wear is None:
            return None
        total = yield_of(self.aged.passes)
        return {
            **total.to_dict(),
            **self.wear.to_dict(),
            "requirements": {name: self.yield_by(name, self.aged).to_dict() for name in requirements},
            "part_limits": {name: self.yield_by(name, self.aged).to_dict() for name in parts},
        }

    def _points(self) -> list[dict[str, float]]:
        points = self.model.points
        names = {"supply_v": points.supply, "load_a": points.load_current, "ambient_c": points.ambient_c}
        return [{name: float(one[index]) for name, one in names.items()} for index in range(len(points))]

    def to_dict(self) -> dict[str, Any]:
        """The study by key, for JSON."""
        return {"rows": self.rows(), "summary": self.summary(), "warnings": list(self.warnings)}


@dataclass(frozen=True, kw_only=True)
class SingleUnit:
    """One unit by itself.

    Attributes
    ----------
    unit, seed : int
        Its number and the seed.
    varied : tuple of Varied
        What differs from unit to unit.
    factors : Mapping
        Its values over the nominal ones by key [1].
    runs : UnitRuns
        Its margins; one unit.
    points : Mapping
        Keys of a simulation at every point.
    model : UnitModel
        Design, requirement and points.
    """

    unit: int
    seed: int
    varied: tuple[Varied, ...]
    factors: Mapping[str, float]
    runs: UnitRuns
    points: Mapping[str, Any]
    model: UnitModel

    def values(self) -> dict[str, float]:
        """Its values by key [SI]."""
        return {one.key: one.value * self.factors[one.key] for one in self.varied}

    def to_dict(self) -> dict[str, Any]:
        """The unit by key, for JSON: one row a point."""
        runs = self.runs
        limits = {
            name: {
                "value": _finite(runs.value[0, column]),
                "limit": _finite(runs.limit[0, column]),
                "margin": float(runs.margin[0, column]),
                "holds": bool(runs.holds[0, column]),
                "where": self.model.where(int(runs.point[0, column])),
            }
            for column, name in enumerate(runs.names)
            if name in runs.applied and name != PART_LIMITS
        }
        summary = {
            "unit": self.unit,
            "seed": self.seed,
            "passes": bool(runs.passes[0]),
            "values": self.values(),
            "deviations": {key: factor - 1.0 for key, factor in self.factors.items()},
            "limits": limits,
        }
        return {"rows": _rows(self.points), "summary": summary, "warnings": []}


def _rows(table: Mapping[str, Any]) -> list[dict[str, Any]]:
    plain = {name: [_rounded(one) for one in _listed(column)] for name, column in table.items()}
    return [dict(zip(plain, row, strict=True)) for row in zip(*plain.values(), strict=True)]


def _listed(column: Any) -> list[Any]:
    return column.tolist() if isinstance(column, np.ndarray) else list(column)


def _rounded(value: Any) -> Any:
    return float(f"{value:.{DIGITS}g}") if isinstance(value, float) else value


def extreme_values(
    varied: tuple[Varied, ...],
    factors: Mapping[str, float],
    weights: NDArray[np.float64],
    count: int = EXTREMES,
) -> tuple[tuple[str, float, float], ...]:
    """The values of a unit that are extreme where it matters.

    Parameters
    ----------
    varied : tuple of Varied
        What differs from unit to unit.
    factors : Mapping
        Value over nominal by key [1].
    weights : NDArray
        How much each matters [1], shape (keys,).
    count : int
        How many.

    Returns
    -------
    tuple of tuple
        Key, value [SI] and deviation from nominal [1]; first those whose distance from the middle, by quantile,
        times the weight is largest.
    """
    shares = np.array([quantile_of(one, factors[one.key]) for one in varied])
    order = np.lexsort((-np.abs(shares - 0.5), -np.abs(shares - 0.5) * weights))[:count]
    chosen = [varied[place] for place in order]
    return tuple((one.key, one.value * factors[one.key], factors[one.key] - 1.0) for one in chosen)


def quantile_of(one: Varied, factor: float) -> float:
    """Share of units whose value is smaller [1], by integrating the density over the band."""
    from buckdesign.design.tolerances import Distribution

    tolerance = one.tolerance
    low, high = 1.0 + tolerance.low, 1.0 + tolerance.high
    is_log = tolerance.distribution is Distribution.LOGNORMAL
    grid = np.geomspace(low, high, 513) if is_log else np.linspace(low, high, 513)
    axis = np.log(grid) if is_log else grid
    height = density(tolerance, grid)
    steps = np.concatenate([[0.0], np.cumsum((height[1:] + height[:-1]) / 2.0 * np.diff(axis))])
    return float(np.interp(np.log(factor) if is_log else factor, axis, steps / steps[-1]))


def _finite(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
