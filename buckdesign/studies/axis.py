"""One dimension of a study: the keys that step together and where their values come from.

A source gives the values of one key. Sources with a count give them by place (0, 1, 2 ...) and are never
written out as a whole; sources without one give them along a share from 0 to 1. What a source gives depends on
nothing but place or share, to the last bit, so that a study can be cut anywhere.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from enum import Enum
from fractions import Fraction
from typing import Any, ClassVar

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.keys import CountKey, Key, QuantityKey

Values = NDArray[np.float64] | NDArray[np.int64] | list[Any]
"""Values of one key: SI numbers, whole numbers, or a list of what the key's reader gives."""

MOST_VALUES = 1_000_000_000
"""Most values of one key (own choice: a place and a value are exact far beyond)."""

ON_STEP = Fraction(1, 1_000_000_000)
"""How far `to` may be off a step, relative to it, and still count as reached (own choice: rounding of inputs)."""

_LARGEST_EXACT = 2**53
"""Whole numbers up to here are exact as floats (IEEE 754-2019 binary64, 53 bits of significand)."""


class Spacing(Enum):
    """How values lie between two ends."""

    LINEAR = "linear"
    LOG = "log"


@dataclass(frozen=True, kw_only=True)
class Listed:
    """Values one by one, as the key's reader gives them."""

    values: tuple[Any, ...]

    @property
    def count(self) -> int:
        """Number of values."""
        return len(self.values)

    def at(self, places: NDArray[np.int64]) -> list[Any]:
        """The values at places."""
        return [self.values[place] for place in places.tolist()]


@dataclass(frozen=True, kw_only=True)
class LinearSteps:
    """Values in equal steps, as exact fractions of what the file says: 0.1, 0.2, 0.3 without rounding errors.

    Attributes
    ----------
    first, step : Fraction
        The first value and the difference between two.
    count : int
        Number of values.
    """

    first: Fraction
    step: Fraction
    count: int

    @classmethod
    def stepped(cls, first: float, to: float, step: float) -> LinearSteps:
        """From `first` in steps that lead towards `to`; the last value is at `to` or the last before it."""
        start, end, difference = _exact(first), _exact(to), _exact(step)
        steps = (end - start) / difference
        whole = math.floor(steps + ON_STEP)
        if whole and abs(steps - whole) <= ON_STEP:
            difference = (end - start) / whole
        return cls(first=start, step=difference, count=whole + 1)

    @classmethod
    def counted(cls, first: float, to: float, count: int) -> LinearSteps:
        """`count` values from `first` to `to`."""
        start, end = _exact(first), _exact(to)
        return cls(first=start, step=(end - start) / max(count - 1, 1), count=count)

    def value(self, place: int) -> Fraction:
        """The exact value at a place."""
        return self.first + place * self.step

    def at(self, places: NDArray[np.int64]) -> NDArray[np.float64]:
        """The values at places, each the float nearest to the exact value."""
        shared = math.lcm(self.first.denominator, self.step.denominator)
        begin, more = int(self.first * shared), int(self.step * shared)
        largest = max(abs(begin), abs(begin + more * (self.count - 1)), abs(more))
        if largest < _LARGEST_EXACT and _is_float(shared):
            return np.asarray((begin + places * more) / float(shared), dtype=np.float64)
        return np.array([float(self.value(place)) for place in places.tolist()], dtype=np.float64)


@dataclass(frozen=True, kw_only=True)
class LogSteps:
    """Values in equal ratios, both ends exact.

    Attributes
    ----------
    first, last : float
        The ends, above 0.
    count : int
        Number of values.
    """

    first: float
    last: float
    count: int

    def at(self, places: NDArray[np.int64]) -> NDArray[np.float64]:
        """The values at places, rounded to 14 digits so that decades come out as decades."""
        top = max(self.count - 1, 1)
        found = [self._value(place / top) for place in places.tolist()]
        return np.array(found, dtype=np.float64)

    def _value(self, share: float) -> float:
        if share in (0.0, 1.0):
            return self.last if share else self.first
        return float(f"{_between(self.first, self.last, share):.14g}")


@dataclass(frozen=True, kw_only=True)
class Continuous:
    """Any value between two ends.

    Attributes
    ----------
    first, last : float
        The ends; above 0 for `Spacing.LOG`.
    spacing : Spacing
        Where shares lie between them.
    """

    count: ClassVar[None] = None
    first: float
    last: float
    spacing: Spacing = Spacing.LINEAR

    def along(self, share: NDArray[np.float64]) -> NDArray[np.float64]:
        """The values at shares from 0 to 1."""
        if self.spacing is Spacing.LINEAR:
            found = self.first * (1.0 - share) + self.last * share
        else:
            found = np.array(
                [_between(self.first, self.last, one) for one in share.tolist()], dtype=np.float64
            )
        low, high = min(self.first, self.last), max(self.first, self.last)
        return np.asarray(np.clip(found, low, high), dtype=np.float64)


@dataclass(frozen=True, kw_only=True)
class WholeNumbers:
    """Any whole number between two ends, both included; with `Spacing.LOG` in proportion to its reciprocal.

    Attributes
    ----------
    first, last : int
        The ends, 1 or more.
    spacing : Spacing
        Where shares lie between them.
    """

    count: ClassVar[None] = None
    first: int
    last: int
    spacing: Spacing = Spacing.LINEAR

    def along(self, share: NDArray[np.float64]) -> NDArray[np.float64]:
        """The whole numbers at shares from 0 to 1."""
        low, high = min(self.first, self.last), max(self.first, self.last)
        rising = share if self.first <= self.last else 1.0 - share
        if self.spacing is Spacing.LINEAR:
            found = low + np.floor(rising * (high + 1 - low))
        else:
            found = np.floor([_between(low, high + 1, one) for one in rising.tolist()])
        return np.asarray(np.clip(found, low, high), dtype=np.float64)


Source = Listed | LinearSteps | LogSteps | Continuous | WholeNumbers


@dataclass(frozen=True, kw_only=True)
class Varied:
    """A key that is varied.

    Attributes
    ----------
    name : str
        Dotted name in the file that is varied.
    key : Key
        What it may hold.
    source : Source
        Where its values come from.
    """

    name: str
    key: Key
    source: Source

    def at(self, places: NDArray[np.int64]) -> Values:
        """The values at places of a source with a count."""
        assert not isinstance(self.source, Continuous | WholeNumbers)
        return self._as_key(self.source.at(places))

    def along(self, share: NDArray[np.float64]) -> Values:
        """The values at shares of a source without a count."""
        assert isinstance(self.source, Continuous | WholeNumbers)
        return self._as_key(self.source.along(share))

    def _as_key(self, found: NDArray[np.float64] | list[Any]) -> Values:
        if isinstance(self.key, QuantityKey):
            return np.asarray(found, dtype=np.float64)
        if isinstance(self.key, CountKey):
            return np.asarray(found, dtype=np.int64)
        if isinstance(found, list):
            return found
        return [self.key.read(value, None) for value in found.tolist()]


@dataclass(frozen=True, kw_only=True)
class Axis:
    """Keys that step together.

    Attributes
    ----------
    varied : tuple of Varied
        All with the same count, or all without one.
    """

    varied: tuple[Varied, ...]

    @property
    def count(self) -> int | None:
        """Number of steps; None where any share between 0 and 1 will do."""
        return self.varied[0].source.count

    def at(self, places: NDArray[np.int64]) -> dict[str, Values]:
        """The values of all keys at places, for an axis with a count."""
        return {one.name: one.at(places) for one in self.varied}

    def along(self, share: NDArray[np.float64]) -> dict[str, Values]:
        """The values of all keys at shares from 0 to 1; each step of a counted axis has an equal part of it."""
        count = self.count
        if count is None:
            return {one.name: one.along(share) for one in self.varied}
        return self.at(np.minimum((share * count).astype(np.int64), count - 1))


def _exact(value: float) -> Fraction:
    """The number that a float is written as, not the binary one that stands for it."""
    return Fraction(repr(value))


def _is_float(value: int) -> bool:
    try:
        return int(float(value)) == value
    except OverflowError:
        return False


def _between(first: float, last: float, share: float) -> float:
    """The value at a share of the way in equal ratios; a scalar, since arrays round by place in the array."""
    return float(first * (last / first) ** share)
