"""Worst case: every value at one end of its tolerance, and the corner at which each limit is kept least.

All corners where there are few enough; else a search: each value alone at both ends, the corner that these make
one expect for each limit, random corners, and from the worst corners so far every single value turned over.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import product
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.studies.tolerance_keys import Varied
from buckdesign.studies.unit_runs import PART_LIMITS, ROUNDING, Factors, UnitRuns, some_of

Floats = NDArray[np.float64]
Signs = NDArray[np.int8]
Evaluate = Callable[[Factors], UnitRuns]

MOST_EXHAUSTIVE = 9
"""Tolerances up to which every corner is computed [1] (own choice: 512 corners)."""

RANDOM_CORNERS = 64
"""Random corners beside the ones searched [1] (own choice)."""

ROUNDS = 2
"""How often every single value is turned over [1] (own choice)."""

_SEED = 0


@dataclass(frozen=True, kw_only=True)
class WorstCorner:
    """The corner at which a limit is kept least.

    Attributes
    ----------
    name : str
        Requirement or part limit.
    value, limit : float or None
        There, SI; None where a value can't be given.
    margin : float
        Relative to the limit [1]; minus infinite where the value can't be given.
    point : int
        Index of the operating point.
    signs : dict
        Which end of its band each value is at, -1 or 1 by key.
    leading : tuple of str
        Keys that move this margin by themselves, the strongest first.
    """

    name: str
    value: float | None
    limit: float | None
    margin: float
    point: int
    signs: dict[str, int]
    leading: tuple[str, ...]

    @property
    def holds(self) -> bool:
        """Whether the limit holds even there."""
        return self.margin >= -ROUNDING

    def to_dict(self, where: str) -> dict[str, Any]:
        """The corner by key, for JSON; `where` is the operating point in words."""
        return {
            "value": self.value,
            "limit": self.limit,
            "margin": self.margin,
            "holds": self.holds,
            "where": where,
            "corner": self.signs,
            "leading": list(self.leading),
        }


@dataclass(frozen=True, kw_only=True)
class WorstCase:
    """The worst corners.

    Attributes
    ----------
    corners : int
        How many were computed [1].
    is_exhaustive : bool
        Whether these are all corners.
    worst : tuple of WorstCorner
        One a requirement and one a part limit that applies.
    alone : NDArray
        Margin of each limit with one value at an end of its band, shape (names, keys, 2); low, high.
    nominal : UnitRuns
        The design itself, one unit.
    """

    corners: int
    is_exhaustive: bool
    worst: tuple[WorstCorner, ...]
    alone: Floats
    nominal: UnitRuns


def worst_case(evaluate: Evaluate, varied: Sequence[Varied]) -> WorstCase:
    """Look for the worst corners.

    Parameters
    ----------
    evaluate : callable
        Computes units by the factors on their values.
    varied : sequence of Varied
        What differs from unit to unit.

    Returns
    -------
    WorstCase
        For each limit the corner with the smallest margin found.
    """
    search = _Search(evaluate, varied)
    singles = _single_signs(len(varied))
    search.add(singles)
    alone = _alone(search.margin[: len(singles)])
    if len(varied) <= MOST_EXHAUSTIVE:
        search.add(np.array(list(product((-1, 1), repeat=len(varied))), dtype=np.int8))
    else:
        search.add(_expected_corners(alone))
        rng = np.random.default_rng(_SEED)
        search.add(rng.choice(np.array([-1, 1], dtype=np.int8), size=(RANDOM_CORNERS, len(varied))))
        for _ in range(ROUNDS):
            search.add(_turned_over(search.worst_corners()))
    return WorstCase(
        corners=int(np.count_nonzero((search.signs != 0).all(axis=1))),
        is_exhaustive=len(varied) <= MOST_EXHAUSTIVE,
        worst=search.found(alone),
        alone=alone,
        nominal=search.nominal,
    )


def _single_signs(count: int) -> Signs:
    """The design itself, then each value alone at its low and its high end."""
    signs = np.zeros((2 * count + 1, count), dtype=np.int8)
    for place in range(count):
        signs[2 * place + 1, place], signs[2 * place + 2, place] = -1, 1
    return signs


def _alone(margin: Floats) -> Floats:
    """Margins with single values at their ends, shape (names, keys, 2)."""
    names = margin.shape[1]
    return np.moveaxis(margin[1:].reshape(-1, 2, names), -1, 0)


def moved_alone(alone: Floats, nominal: Floats) -> Floats:
    """How far single values move each margin by themselves.

    Parameters
    ----------
    alone : NDArray
        Margins with one value at an end, shape (names, keys, 2) [1].
    nominal : NDArray
        Margins of the design itself, shape (names,) [1].

    Returns
    -------
    NDArray
        Largest less smallest margin [1], shape (names, keys); a margin that can't be given counts as -1.
    """
    shown = np.clip(np.nan_to_num(alone, posinf=0.0, neginf=-1.0), -1.0, None)
    middle = np.clip(np.nan_to_num(nominal, posinf=0.0, neginf=-1.0), -1.0, None)[:, None, None]
    whole = np.concatenate([shown, np.broadcast_to(middle, (*shown.shape[:2], 1))], axis=2)
    return np.asarray(whole.max(axis=2) - whole.min(axis=2), dtype=float)


def _expected_corners(alone: Floats) -> Signs:
    """For each limit every value at the end that by itself takes more of its margin."""
    return np.where(alone[:, :, 0] < alone[:, :, 1], -1, 1).astype(np.int8)


def _turned_over(corners: Signs) -> Signs:
    """Every corner with each single value turned over."""
    count = corners.shape[1]
    flips = 1 - 2 * np.eye(count, dtype=np.int8)
    return np.asarray((corners[:, None, :] * flips[None]).reshape(-1, count), dtype=np.int8)


class _Search:
    """Corners computed so far, each once."""

    def __init__(self, evaluate: Evaluate, varied: Sequence[Varied]) -> None:
        self._evaluate, self._varied = evaluate, varied
        self._low = np.array([1.0 + one.tolerance.low for one in varied])
        self._high = np.array([1.0 + one.tolerance.high for one in varied])
        self._seen: set[bytes] = set()
        self._runs: list[UnitRuns] = []
        self.signs = np.empty((0, len(varied)), dtype=np.int8)

    def add(self, signs: Signs) -> None:
        """Compute those that are new."""
        fresh = []
        for row in signs:
            if row.tobytes() not in self._seen:
                self._seen.add(row.tobytes())
                fresh.append(row)
        if not fresh:
            return
        new = np.array(fresh, dtype=np.int8)
        factors = np.where(new < 0, self._low, np.where(new > 0, self._high, 1.0))
        keys = [one.key for one in self._varied]
        self._runs.append(self._evaluate(dict(zip(keys, factors.T, strict=True))))
        self.signs = np.concatenate([self.signs, new])

    @property
    def margin(self) -> Floats:
        """All margins so far, shape (corners, names)."""
        return np.concatenate([run.margin for run in self._runs])

    @property
    def nominal(self) -> UnitRuns:
        """The design itself; among the first computed."""
        return some_of(self._runs[0], np.array([0]))

    def worst_corners(self) -> Signs:
        """The worst corner so far of each requirement, and of the part limits together."""
        full = np.flatnonzero((self.signs != 0).all(axis=1))
        required = len(self._runs[0].requirements)
        worst = self.margin[full][:, :required].argmin(axis=0)
        return np.unique(self.signs[full][worst], axis=0)

    def found(self, alone: Floats) -> tuple[WorstCorner, ...]:
        """The worst of all for each limit; single values alone are no corners."""
        first, margin = self._runs[0], self.margin
        is_corner = (self.signs != 0).all(axis=1)
        moved = moved_alone(alone, margin[0])
        value, limit = (
            np.concatenate([getattr(run, name) for run in self._runs]) for name in ("value", "limit")
        )
        point = np.concatenate([run.point for run in self._runs])
        found = []
        for column, name in enumerate(first.names):
            index = int(np.where(is_corner, margin[:, column], np.inf).argmin())
            if name == PART_LIMITS or margin[index, column] == np.inf:
                continue
            order = np.argsort(-moved[column], kind="stable")
            found.append(
                WorstCorner(
                    name=name,
                    value=_finite(value[index, column]),
                    limit=_finite(limit[index, column]),
                    margin=float(margin[index, column]),
                    point=int(point[index, column]),
                    signs={one.key: int(self.signs[index, place]) for place, one in enumerate(self._varied)},
                    leading=tuple(self._varied[place].key for place in order if moved[column, place] > 0.0),
                )
            )
        return tuple(found)


def _finite(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
