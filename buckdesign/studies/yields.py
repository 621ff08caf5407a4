"""Yields: shares of units that pass, with intervals, and what a tighter tolerance would make of them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.studies.spreads import density, halved
from buckdesign.studies.tolerance_keys import Varied

NORMAL_QUANTILE = 1.959963984540054
"""97.5 % quantile of the standard normal distribution [1] (derived)."""


@dataclass(frozen=True, kw_only=True)
class Yield:
    """Share of units that pass.

    Attributes
    ----------
    passed, units : int
        How many [1].
    low, high : float
        95 % interval of the share [1].
    """

    passed: int
    units: int
    low: float
    high: float

    @property
    def share(self) -> float:
        """Share of the units that pass [1]."""
        return self.passed / self.units

    def to_dict(self) -> dict[str, Any]:
        """The yield by key, for JSON."""
        return {"yield": self.share, "yield_low": self.low, "yield_high": self.high}


def wilson_interval(passed: int, units: int, quantile: float = NORMAL_QUANTILE) -> tuple[float, float]:
    """Interval of a share from a count.

    Parameters
    ----------
    passed, units : int
        Units that passed, and all [1].
    quantile : float
        Of the standard normal distribution; 1.96 for 95 % [1].

    Returns
    -------
    tuple of float
        Lower and upper end [1].

    Raises
    ------
    ValueError
        No units, or more passed than there are.

    References
    ----------
    E. B. Wilson, Probable inference, J. Amer. Statist. Assoc. 22 (1927) 209 (from memory).

    Examples
    --------
    >>> low, high = wilson_interval(9, 10)
    >>> round(low, 4), round(high, 4)
    (0.5958, 0.9821)
    """
    if not 0 <= passed <= units or units < 1:
        raise ValueError(f"{passed} of {units} units")
    share, square = passed / units, quantile * quantile
    middle = (share + square / (2.0 * units)) / (1.0 + square / units)
    root = math.sqrt(share * (1.0 - share) / units + square / (4.0 * units * units))
    half = quantile / (1.0 + square / units) * root
    low = 0.0 if passed == 0 else max(middle - half, 0.0)
    high = 1.0 if passed == units else min(middle + half, 1.0)
    return low, high


def yield_of(passes: NDArray[np.bool_]) -> Yield:
    """Yield of drawn units, each of which passes or not, shape (n,)."""
    passed, units = int(np.count_nonzero(passes)), len(passes)
    low, high = wilson_interval(passed, units)
    return Yield(passed=passed, units=units, low=low, high=high)


@dataclass(frozen=True, kw_only=True)
class Tighter:
    """What half the tolerance of one value would bring.

    Attributes
    ----------
    key : str
        The value.
    low, high : float
        Half the band [1].
    share, gain : float
        Yield with it, and how much more that is [1].
    gain_error : float
        Standard error of the gain [1].
    effective_units : float
        As many units drawn with half the band would say as much [1].
    """

    key: str
    low: float
    high: float
    share: float
    gain: float
    gain_error: float
    effective_units: float

    @property
    def is_certain(self) -> bool:
        """Whether the gain is more than three times its error: the largest of many gains is large by chance."""
        return self.gain > 3.0 * self.gain_error

    def to_dict(self) -> dict[str, Any]:
        """The gain by key, for JSON."""
        return {
            "key": self.key,
            "low": self.low,
            "high": self.high,
            "yield": self.share,
            "gain": self.gain,
            "gain_error": self.gain_error,
            "effective_units": self.effective_units,
        }


def tighter_yield(one: Varied, factors: NDArray[np.float64], passes: NDArray[np.bool_]) -> Tighter:
    """The yield with half the tolerance of one value, from the units at hand.

    Parameters
    ----------
    one : Varied
        The value.
    factors : NDArray
        Its values over the nominal one in the units drawn [1], shape (n,).
    passes : NDArray
        Which units pass, shape (n,).

    Returns
    -------
    Tighter
        The units are weighted by the ratio of the two densities at their value: no unit is computed again.

    Notes
    -----
    Derived: importance sampling with normalised weights, its standard error by the delta method. The gain and its
    error are those of the difference, in which what both yields share falls out.
    """
    half = halved(one.tolerance)
    weights = density(half, factors) / density(one.tolerance, factors)
    total = float(weights.sum())
    before, n = float(passes.mean()), len(passes)
    if total <= 0.0:
        return Tighter(
            key=one.key, low=half.low, high=half.high, share=before, gain=0.0, gain_error=math.inf, effective_units=0.0
        )  # fmt: skip
    after = float((weights * passes).sum() / total)
    influence = weights * n / total * (passes - after) - (passes - before)
    return Tighter(
        key=one.key,
        low=half.low,
        high=half.high,
        share=after,
        gain=after - before,
        gain_error=float(np.sqrt(np.mean(np.square(influence)) / n)),
        effective_units=total * total / float(np.square(weights).sum()),
    )
