"""Spreads of values: against scipy's distributions, halves within wholes, and random numbers by unit."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from scipy.integrate import quad

from buckdesign.design.tolerances import Distribution, Tolerance
from buckdesign.studies.spreads import CUT, density, factors_at, halved, unit_quantiles
from buckdesign.studies.tolerance_keys import Varied
from buckdesign.studies.tolerance_result import quantile_of

QUANTILES = np.linspace(0.0, 1.0, 41)
BANDS = [(-0.1, 0.1), (-0.5, 1.0), (-0.02, 0.3), (0.05, 0.1)]


def reference(tolerance: Tolerance):
    """The same spread as scipy has it, of the factor or of its logarithm."""
    low, high = 1.0 + tolerance.low, 1.0 + tolerance.high
    if tolerance.distribution is Distribution.UNIFORM:
        return stats.uniform(low, high - low)
    if tolerance.distribution is Distribution.LOGNORMAL:
        low, high = np.log(low), np.log(high)
    return stats.truncnorm(-CUT, CUT, (low + high) / 2.0, (high - low) / 2.0 / CUT)


@pytest.mark.parametrize("kind", list(Distribution))
@pytest.mark.parametrize(("low", "high"), BANDS)
def test_quantiles_are_those_of_scipy(kind: Distribution, low: float, high: float) -> None:
    tolerance = Tolerance(low=low, high=high, distribution=kind)
    wanted = reference(tolerance).ppf(QUANTILES)
    if kind is Distribution.LOGNORMAL:
        wanted = np.exp(wanted)
    assert factors_at(tolerance, QUANTILES) == pytest.approx(wanted, rel=1e-9)
    assert factors_at(tolerance, [0.0, 1.0]) == pytest.approx([1.0 + low, 1.0 + high], rel=1e-12)


@pytest.mark.parametrize("kind", list(Distribution))
@pytest.mark.parametrize(("low", "high"), BANDS)
def test_density_is_that_of_scipy(kind: Distribution, low: float, high: float) -> None:
    tolerance = Tolerance(low=low, high=high, distribution=kind)
    factors = np.linspace(1.0 + low, 1.0 + high, 33)[1:-1]
    is_log = kind is Distribution.LOGNORMAL
    assert density(tolerance, factors) == pytest.approx(
        reference(tolerance).pdf(np.log(factors) if is_log else factors)
    )
    assert (density(tolerance, [0.99 + low, 1.01 + high]) == 0.0).all()
    whole, _ = quad(
        lambda x: float(density(tolerance, x)) / (x if is_log else 1.0), 1.0 + low, 1.0 + high, limit=200
    )
    assert whole == pytest.approx(1.0, rel=1e-6)


@pytest.mark.parametrize("kind", list(Distribution))
@pytest.mark.parametrize(("low", "high"), BANDS)
def test_half_a_band_lies_within_the_whole(kind: Distribution, low: float, high: float) -> None:
    half = halved(Tolerance(low=low, high=high, distribution=kind))
    assert low < half.low < half.high < high
    if kind is Distribution.LOGNORMAL:
        width, whole = np.log1p(half.high) - np.log1p(half.low), np.log1p(high) - np.log1p(low)
        assert width == pytest.approx(whole / 2.0)
    else:
        assert half.high - half.low == pytest.approx((high - low) / 2.0)


@pytest.mark.parametrize("kind", list(Distribution))
def test_share_of_smaller_values(kind: Distribution) -> None:
    tolerance = Tolerance(low=-0.3, high=0.5, distribution=kind)
    one = Varied(key="network.r1", unit="ohm", value=240.0, tolerance=tolerance, source="test")
    for share in (0.0, 0.1, 0.5, 0.97, 1.0):
        assert quantile_of(one, float(factors_at(tolerance, share))) == pytest.approx(share, abs=2e-5)


def test_random_numbers_belong_to_seed_unit_and_place() -> None:
    numbers = unit_quantiles(3, 7, [4, 1], 10)
    assert (numbers == unit_quantiles(3, 7, [4, 1], 10)).all()
    assert unit_quantiles(3, 7, [1], 10)[0] == numbers[1]
    for other in (unit_quantiles(4, 7, [4, 1], 10), unit_quantiles(3, 8, [4, 1], 10)):
        assert (numbers != other).all()


def test_random_numbers_are_even_and_independent() -> None:
    drawn = np.array([unit_quantiles(0, unit, range(6), 6) for unit in range(2000)])
    for column in drawn.T:
        assert stats.kstest(column, "uniform").pvalue > 1e-3
    apart = np.corrcoef(drawn.T) - np.eye(6)
    # derived: the correlation of independent samples has standard error 1/sqrt(n)
    assert np.abs(apart).max() < 5.0 / np.sqrt(len(drawn))
