"""What a sweep comes to: counts, front, best rows and a thin sample for the figures, from a stream of rows.

It holds nothing but these, so that a million points take no more memory than a thousand; and it sees only what the
table says, so that it comes to the same whether a sweep ran through or was taken up again.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.studies.front import Front, FrontPoints

SAMPLED = 3000
"""Rows kept for the figures, about, evenly spread over the table [1] (own choice)."""

_GOLDEN = np.uint64(11400714819323198485)
"""2^64 over the golden ratio: multiples of it spread evenly, whatever the period of a grid (D. E. Knuth, The Art
of Computer Programming, vol. 3, section 6.4)."""

REASONS = 5
"""Reasons for failures that are told [1] (own choice)."""

MOST_REASONS = 2000
"""Different reasons that are counted, beyond which new ones count as others [1] (own choice)."""

BEST = 10
"""Rows that are shown as the best [1] (own choice)."""

OTHERS = "other reasons"
"""What reasons beyond `MOST_REASONS` are called."""


@dataclass(frozen=True, kw_only=True)
class Objectives:
    """What a sweep looks for.

    Attributes
    ----------
    minimise, maximise : tuple of str
        Columns.
    subject_to : tuple of str
        Constraints, as text.
    compared : tuple of str
        Columns of numbers that the constraints look at.
    """

    minimise: tuple[str, ...]
    maximise: tuple[str, ...] = ()
    subject_to: tuple[str, ...] = ()
    compared: tuple[str, ...] = ()

    @property
    def watched(self) -> tuple[str, ...]:
        """Columns of numbers of which it is counted where they are not known."""
        return tuple(dict.fromkeys((*self.names, *self.compared)))

    @property
    def names(self) -> tuple[str, ...]:
        """All columns, those to be small first."""
        return (*self.minimise, *self.maximise)

    def costs(self, columns: Mapping[str, Any]) -> NDArray[np.float64]:
        """What is to be small of each row, shape (n, k)."""
        small = [np.asarray(columns[name], dtype=float) for name in self.minimise]
        large = [-np.asarray(columns[name], dtype=float) for name in self.maximise]
        return np.column_stack([*small, *large])

    def needed(self) -> tuple[str, ...]:
        """Columns that `SweepSummary.add` looks at."""
        flags = ("constraints_hold",) if self.subject_to else ()
        return (*self.watched, "settled", "regime", "violated", *flags, "failure")


@dataclass(kw_only=True)
class SweepSummary:
    """The state of a summary.

    Attributes
    ----------
    objectives : Objectives
        What is looked for.
    count : int
        Points of the whole sweep.
    """

    objectives: Objectives
    count: int
    done: int = 0
    failed: int = 0
    keeping: int = 0
    unviolated: int = 0
    unsettled: int = 0
    unknown: Counter[str] = field(default_factory=Counter)
    regimes: Counter[str] = field(default_factory=Counter)
    reasons: Counter[str] = field(default_factory=Counter)
    sample: list[tuple[int, bytes]] = field(default_factory=list)
    _front: Front = field(init=False)
    _lowest: list[tuple[float, int, bytes]] = field(default_factory=list)

    def __post_init__(self) -> None:
        self._front = Front(len(self.objectives.names))

    def add(self, start: int, line: Callable[[int], bytes], columns: Mapping[str, Any]) -> None:
        """Take in some rows.

        Parameters
        ----------
        start : int
            Number of the first, from 0.
        line : callable
            Their lines of the table, by place among these rows.
        columns : Mapping
            Their columns `Objectives.needed`, arrays or lists.
        """
        failure = columns["failure"]
        good = np.array([not text for text in failure], dtype=bool)
        clean = np.array([not text for text in columns["violated"]], dtype=bool) & good
        keeps = good & np.array(columns["constraints_hold"], dtype=bool) if self.objectives.subject_to else good
        self.done += len(failure)
        self.failed += int((~good).sum())
        self.keeping += int(keeps.sum())
        self.unviolated += int(clean.sum())
        self.unsettled += int((good & ~np.array(columns["settled"], dtype=bool)).sum())
        for name in self.objectives.watched:
            self.unknown[name] += int((good & np.isnan(np.asarray(columns[name], dtype=float))).sum())
        self.regimes.update(word for word, is_good in zip(columns["regime"], good, strict=True) if is_good)
        for text in filter(None, failure):
            self.reasons[text if text in self.reasons or len(self.reasons) < MOST_REASONS else OTHERS] += 1
        which = np.flatnonzero(keeps)
        costs = self.objectives.costs(columns)[which]
        self._front.add(start + which, costs, lambda number: line(number - start))
        self._take_lowest(start, which, costs, line)
        self.sample.extend((start + int(k), line(int(k))) for k in self._sampled(start, len(failure)))

    def best(self) -> list[tuple[int, bytes]]:
        """The best rows that keep every constraint, at most `BEST`: number in the table and line.

        Of one objective those where it is best; of several those on the front, nearest to the best of all first.
        """
        if len(self.objectives.names) == 1:
            return [(number, line) for _, number, line in self._lowest]
        front = self.front()
        order = front.by_distance()[:BEST]
        return [(int(front.index[k]), front.lines[int(k)]) for k in order]

    def _sampled(self, start: int, count: int) -> NDArray[np.intp]:
        """Places of the rows that are kept for the figures; all in a short table."""
        if self.count <= SAMPLED:
            return np.arange(count)
        share = np.uint64(SAMPLED * 2**64 // self.count)
        numbers = np.arange(start, start + count, dtype=np.uint64)
        return np.flatnonzero(numbers * _GOLDEN < share)

    def _take_lowest(
        self, start: int, which: NDArray[np.intp], costs: NDArray[np.float64], line: Callable[[int], bytes]
    ) -> None:
        if costs.shape[1] != 1:
            return
        known = np.flatnonzero(np.isfinite(costs[:, 0]))
        for k in known[np.argsort(costs[known, 0], kind="stable")[:BEST]]:
            place = int(which[k])
            self._lowest.append((float(costs[k, 0]), start + place, line(place)))
        self._lowest = sorted(self._lowest, key=lambda one: one[:2])[:BEST]

    def front(self) -> FrontPoints:
        """The front of the rows that keep every constraint."""
        return self._front.points()

    def told_reasons(self) -> list[tuple[str, int]]:
        """The most frequent reasons for failures with how often, in a fixed order."""
        ordered = sorted(self.reasons.items(), key=lambda one: (-one[1], one[0]))
        return ordered[:REASONS]
