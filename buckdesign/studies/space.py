"""The points of a study: a full grid or a sample, worked out where they are wanted.

Neither is ever held as a whole (but for the Latin hypercube, which only exists as a whole). Points depend on
nothing but their number: however a study is cut into pieces, the pieces together are the same.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import Enum
from functools import lru_cache
from typing import assert_never

import numpy as np
from numpy.typing import NDArray

from buckdesign.studies.axis import Axis, Values

LARGEST_LATIN = 10_000_000
"""Most numbers (points times dimensions) of a Latin hypercube, which is held as a whole (own choice: 80 MB)."""

MOST_SOBOL = 2**30
"""Most points of a Sobol sequence with 30 bits (Joe and Kuo's direction numbers as SciPy has them)."""

MOST_RANDOM = 1_000_000_000_000
"""Most random points (own choice, far below the period of the generator)."""

MOST_DIMENSIONS = 21_201
"""Dimensions that direction numbers are known for (S. Joe, F. Y. Kuo, SIAM J. Sci. Comput. 30, 2635, 2008)."""

_LARGEST_PLACE = 2**62


class Method(Enum):
    """How a sample is drawn."""

    SOBOL = "sobol"
    LATIN_HYPERCUBE = "latin hypercube"
    RANDOM = "random"


@dataclass(frozen=True, kw_only=True)
class GridSpace:
    """Every combination of the steps of all axes, the first axis slowest.

    Attributes
    ----------
    axes : tuple of Axis
        In the order of the file, each with a count.
    """

    axes: tuple[Axis, ...]

    @property
    def keys(self) -> tuple[str, ...]:
        """The varied keys by dotted name, in the order of the file."""
        return _keys(self.axes)

    @property
    def count(self) -> int:
        """Number of points; any size."""
        return math.prod(axis.count or 0 for axis in self.axes)

    def values(self, start: int, stop: int) -> dict[str, Values]:
        """The varied values of some points.

        Parameters
        ----------
        start, stop : int
            First point and the one after the last, counted from 0.

        Returns
        -------
        dict
            By key, ``stop - start`` values each.

        Raises
        ------
        ValueError
            If these points do not exist.
        """
        _check_span(start, stop, self.count)
        found: dict[str, Values] = {}
        repeats = self.count
        for axis in self.axes:
            count = axis.count or 0
            repeats //= count
            found |= axis.at(_places(start, stop, repeats, count))
        return found


@dataclass(frozen=True, kw_only=True)
class SampledSpace:
    """Points drawn from the ranges and lists of all axes.

    Attributes
    ----------
    axes : tuple of Axis
        In the order of the file, one dimension each.
    method : Method
        How they are drawn.
    count : int
        Number of points, at most `most_points`.
    seed : int
        Of the random numbers, 0 or more.
    """

    axes: tuple[Axis, ...]
    method: Method
    count: int
    seed: int = 1

    @property
    def keys(self) -> tuple[str, ...]:
        """The varied keys by dotted name, in the order of the file."""
        return _keys(self.axes)

    def values(self, start: int, stop: int) -> dict[str, Values]:
        """The varied values of some points.

        Parameters
        ----------
        start, stop : int
            First point and the one after the last, counted from 0.

        Returns
        -------
        dict
            By key, ``stop - start`` values each.

        Raises
        ------
        ValueError
            If these points do not exist.
        """
        _check_span(start, stop, self.count)
        shares = self._shares(start, stop)
        found: dict[str, Values] = {}
        for number, axis in enumerate(self.axes):
            found |= axis.along(shares[:, number])
        return found

    def _shares(self, start: int, stop: int) -> NDArray[np.float64]:
        """Points of the unit cube, shape (stop - start, axes)."""
        dimensions = len(self.axes)
        if start == stop:
            return np.empty((0, dimensions))
        match self.method:
            case Method.SOBOL:
                return _sobol(dimensions, self.seed, start, stop)
            case Method.LATIN_HYPERCUBE:
                return _latin_hypercube(dimensions, self.count, self.seed)[start:stop]
            case Method.RANDOM:
                generator = np.random.PCG64(self.seed).advance(start * dimensions)
                return np.random.Generator(generator).random((stop - start, dimensions))
            case _:
                assert_never(self.method)


Space = GridSpace | SampledSpace


def most_points(method: Method, dimensions: int) -> int:
    """How many points a sample may have.

    Parameters
    ----------
    method : Method
        How it is drawn.
    dimensions : int
        Number of axes.

    Returns
    -------
    int
        Points; 0 where the method has not that many dimensions.
    """
    match method:
        case Method.SOBOL:
            return MOST_SOBOL if dimensions <= MOST_DIMENSIONS else 0
        case Method.LATIN_HYPERCUBE:
            return LARGEST_LATIN // max(dimensions, 1)
        case Method.RANDOM:
            return MOST_RANDOM
        case _:
            assert_never(method)


def _keys(axes: tuple[Axis, ...]) -> tuple[str, ...]:
    return tuple(one.name for axis in axes for one in axis.varied)


def _check_span(start: int, stop: int, count: int) -> None:
    if not 0 <= start <= stop <= count:
        raise ValueError(f"points {start} to {stop} of a study that has {count}")


def _places(start: int, stop: int, repeats: int, count: int) -> NDArray[np.int64]:
    """Places on an axis of `count` steps, each of them standing for `repeats` points in a row."""
    rows = np.arange(stop - start, dtype=np.int64)
    turn, done = divmod(start, repeats)
    if repeats >= _LARGEST_PLACE:
        return np.asarray((turn % count + (rows >= repeats - done)) % count, dtype=np.int64)
    return np.asarray((turn % count + (done + rows) // repeats) % count, dtype=np.int64)


def _sobol(dimensions: int, seed: int, start: int, stop: int) -> NDArray[np.float64]:
    from scipy.stats import qmc

    engine = qmc.Sobol(dimensions, scramble=True, seed=seed)
    if start:
        engine.fast_forward(start)
        return engine.random(stop - start)
    first = engine.random(1)
    return np.concatenate([first, engine.random(stop - 1)]) if stop > 1 else first


@lru_cache(maxsize=1)
def _latin_hypercube(dimensions: int, count: int, seed: int) -> NDArray[np.float64]:
    from scipy.stats import qmc

    table = np.asarray(qmc.LatinHypercube(dimensions, seed=seed).random(count), dtype=np.float64)
    table.setflags(write=False)
    return table
