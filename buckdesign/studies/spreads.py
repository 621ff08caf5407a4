"""How the values of units are spread: quantiles, densities, and bands cut in half."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

from buckdesign.design.tolerances import Distribution, Tolerance

if TYPE_CHECKING:
    from collections.abc import Sequence

Floats = NDArray[np.float64]

CUT = 3.0
"""Standard deviations from the middle of a band to its ends, beyond which nothing lies [1] (own choice: makers
sort out what is beyond a limit)."""


def factors_at(tolerance: Tolerance, quantiles: ArrayLike) -> Floats:
    """Values over the nominal one at quantiles.

    Parameters
    ----------
    tolerance : Tolerance
        Band and distribution.
    quantiles : array_like
        Between 0 and 1 [1].

    Returns
    -------
    NDArray
        Factors within the band [1], shape of `quantiles`.

    Notes
    -----
    Derived: inverse of the distribution function; the normal ones are cut at `CUT` standard deviations.
    """
    share = np.asarray(quantiles, dtype=float)
    low, high = 1.0 + tolerance.low, 1.0 + tolerance.high
    match tolerance.distribution:
        case Distribution.UNIFORM:
            return low + (high - low) * share
        case Distribution.NORMAL:
            return (low + high) / 2.0 + (high - low) / (2.0 * CUT) * _cut_normal(share)
        case Distribution.LOGNORMAL:
            middle, half = _log_band(low, high)
            return np.asarray(
                np.clip(np.exp(middle + half / CUT * _cut_normal(share)), low, high), dtype=float
            )


def density(tolerance: Tolerance, factors: ArrayLike) -> Floats:
    """Probability density, of the logarithm of the factor for a lognormal spread.

    Parameters
    ----------
    tolerance : Tolerance
        Band of some width, and distribution.
    factors : array_like
        Values over the nominal one [1].

    Returns
    -------
    NDArray
        Density [1], 0 outside the band, shape of `factors`.
    """
    value = np.asarray(factors, dtype=float)
    low, high = 1.0 + tolerance.low, 1.0 + tolerance.high
    inside = (value >= low * (1.0 - 1e-12)) & (value <= high * (1.0 + 1e-12))
    if tolerance.distribution is Distribution.UNIFORM:
        return np.where(inside, 1.0 / (high - low), 0.0)
    if tolerance.distribution is Distribution.LOGNORMAL:
        middle, half = _log_band(low, high)
        value = np.log(np.where(inside, value, 1.0))
    else:
        middle, half = (low + high) / 2.0, (high - low) / 2.0
    sigma = half / CUT
    bell = np.exp(-0.5 * np.square((value - middle) / sigma)) / (sigma * math.sqrt(2.0 * math.pi))
    return np.where(inside, bell / math.erf(CUT / math.sqrt(2.0)), 0.0)


def halved(tolerance: Tolerance) -> Tolerance:
    """The same tolerance with half the band, about the nominal value.

    Parameters
    ----------
    tolerance : Tolerance
        The whole band.

    Returns
    -------
    Tolerance
        Half of each deviation, for a lognormal spread in its logarithm; about the middle of a band that does
        not hold the nominal value.
    """
    low, high = tolerance.low, tolerance.high
    if tolerance.distribution is Distribution.LOGNORMAL:
        log_low, log_high = _half(math.log1p(low), math.log1p(high))
        return replace(tolerance, low=math.expm1(log_low), high=math.expm1(log_high))
    half_low, half_high = _half(low, high)
    return replace(tolerance, low=half_low, high=half_high)


def unit_quantiles(seed: int, unit: int, places: Sequence[int], streams: int) -> Floats:
    """The random numbers of one unit.

    Parameters
    ----------
    seed, unit : int
        Seed of the study, number of the unit [1].
    places : sequence of int
        Which of the unit's numbers are wanted [1].
    streams : int
        How many numbers a unit has [1].

    Returns
    -------
    NDArray
        Between 0 and 1 [1], one a place. They depend on nothing but seed, unit and place, so that a unit is the
        same whatever else is drawn, and keeps its other values where one tolerance is added or taken out.
    """
    sequence = np.random.SeedSequence(entropy=seed, spawn_key=(unit,))
    numbers = np.random.Generator(np.random.PCG64(sequence)).random(streams)
    return numbers[np.asarray(places, dtype=np.intp)]


def _half(low: float, high: float) -> tuple[float, float]:
    middle = 0.0 if low <= 0.0 <= high else (low + high) / 2.0
    return middle + (low - middle) / 2.0, middle + (high - middle) / 2.0


def _log_band(low: float, high: float) -> tuple[float, float]:
    """Middle and half width of a band in logarithms."""
    return (math.log(low) + math.log(high)) / 2.0, (math.log(high) - math.log(low)) / 2.0


def _cut_normal(share: Floats) -> Floats:
    """Quantile of the normal distribution cut at `CUT` [standard deviations]."""
    from scipy.special import ndtr, ndtri

    bottom, top = ndtr(-CUT), ndtr(CUT)
    return np.asarray(np.clip(ndtri(bottom + (top - bottom) * share), -CUT, CUT), dtype=float)
