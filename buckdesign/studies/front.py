"""The Pareto front of a stream of points, and the best of it, in little memory."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]

BLOCK = 512
"""Points compared with all others at a time [1] (own choice: memory stays small)."""


def is_on_front(costs: ArrayLike) -> NDArray[np.bool_]:
    """Which points no other point beats.

    Parameters
    ----------
    costs : array_like
        What is to be small, shape (n, k), without NaN.

    Returns
    -------
    NDArray
        Shape (n,). A point is beaten by one that is nowhere larger and somewhere smaller; equal points are
        all kept.

    Notes
    -----
    The usual definition of Pareto optimality. In order of the sum of the costs a point can only be beaten by
    one before it.

    Examples
    --------
    >>> is_on_front([[1.0, 3.0], [2.0, 2.0], [3.0, 3.0]]).tolist()
    [True, True, False]
    """
    given = np.asarray(costs, dtype=float)
    if given.shape[1] == 2:
        return _on_plane_front(given)
    order = np.lexsort((*given.T[::-1], _ranks(given)))
    front = np.zeros(len(given), dtype=bool)
    kept = np.empty((0, given.shape[1]))
    for first in range(0, len(order), BLOCK):
        which = order[first : first + BLOCK]
        some = given[which]
        some_kept = ~_is_beaten(some, kept)
        which, some = which[some_kept], some[some_kept]
        inside = ~_is_beaten(some, some)
        front[which[inside]] = True
        kept = np.concatenate([kept, some[inside]])
    return front


def _ranks(costs: Floats) -> Floats:
    """Sum of the ranks in each cost: a point that beats another has a smaller one, whatever the units."""
    total = np.zeros(len(costs))
    for column in costs.T:
        total += np.unique(column, return_inverse=True)[1].ravel()
    return total


def _is_beaten(some: Floats, others: Floats) -> NDArray[np.bool_]:
    if not len(others) or not len(some):
        return np.zeros(len(some), dtype=bool)
    beaten = np.zeros(len(some), dtype=bool)
    for first in range(0, len(others), BLOCK):
        part = others[first : first + BLOCK]
        no_larger = np.all(part[None, :, :] <= some[:, None, :], axis=2)
        smaller = np.any(part[None, :, :] < some[:, None, :], axis=2)
        beaten |= np.any(no_larger & smaller, axis=1)
    return beaten


def _on_plane_front(costs: Floats) -> NDArray[np.bool_]:
    """Two costs: in order of the first, the second must fall to a new low, or equal a point that did."""
    order = np.lexsort((costs[:, 1], costs[:, 0]))
    first, second = costs[order].T
    lowest = np.minimum.accumulate(second)
    before = np.concatenate([[np.inf], lowest[:-1]])
    front = second < before
    same = np.zeros(len(order), dtype=bool)
    same[1:] = (first[1:] == first[:-1]) & (second[1:] == second[:-1])
    for index in np.flatnonzero(same):
        front[index] = front[index - 1]
    found = np.empty(len(order), dtype=bool)
    found[order] = front
    return found


@dataclass(frozen=True, kw_only=True)
class FrontPoints:
    """The points on a front, in the order of the table.

    Attributes
    ----------
    index : NDArray
        Number of each in the table, from 0, shape (m,).
    costs : NDArray
        What is to be small; what is to be large with its sign changed, shape (m, k).
    lines : list of bytes
        Its line of the table.
    """

    index: NDArray[np.int64]
    costs: Floats
    lines: list[bytes]

    def __len__(self) -> int:
        return len(self.index)

    def by_distance(self) -> NDArray[np.intp]:
        """Their order by the distance to the best value of every cost, each relative to its span on the front.

        A front of one cost is in the order of the table.
        """
        low, high = self.costs.min(axis=0, initial=np.inf), self.costs.max(axis=0, initial=-np.inf)
        span = np.where(high > low, high - low, 1.0)
        distance = np.sqrt(np.square((self.costs - low) / span).sum(axis=1))
        return np.lexsort((self.index, distance))


class Front:
    """Collects the front of points that come in pieces.

    Parameters
    ----------
    dimensions : int
        Number of costs.
    """

    def __init__(self, dimensions: int) -> None:
        self._index = np.empty(0, dtype=np.int64)
        self._costs = np.empty((0, dimensions))
        self._lines: list[bytes] = []

    def add(self, index: NDArray[np.int64], costs: Floats, line: Callable[[int], bytes]) -> None:
        """Take in some points.

        Parameters
        ----------
        index : NDArray
            Their numbers in the table, shape (n,).
        costs : NDArray
            Shape (n, k); points with a cost that is not known are left out.
        line : callable
            The line of the table by number in it; asked for those that are on the front of these.
        """
        known = np.flatnonzero(np.isfinite(costs).all(axis=1))
        known = known[is_on_front(costs[known])] if len(known) else known
        merged = np.concatenate([self._costs, costs[known]])
        numbers = np.concatenate([self._index, index[known]])
        texts = self._lines + [line(int(k)) for k in index[known]]
        front = np.flatnonzero(is_on_front(merged)) if len(merged) else np.empty(0, dtype=np.intp)
        self._costs, self._index = merged[front], numbers[front]
        self._lines = [texts[int(k)] for k in front]

    def points(self) -> FrontPoints:
        """The front so far."""
        order = np.argsort(self._index, kind="stable")
        return FrontPoints(
            index=self._index[order], costs=self._costs[order], lines=[self._lines[int(k)] for k in order]
        )
