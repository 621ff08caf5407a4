"""Yields: Wilson's interval against scipy, and tighter tolerances where the answer is known."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from buckdesign.design.tolerances import Distribution, Tolerance
from buckdesign.studies.spreads import factors_at, halved
from buckdesign.studies.tolerance_keys import Varied
from buckdesign.studies.yields import tighter_yield, wilson_interval, yield_of


@pytest.mark.parametrize("units", [1, 2, 7, 100, 1000, 123_456])
@pytest.mark.parametrize("share", [0.0, 0.003, 0.2, 0.5, 0.79, 0.999, 1.0])
def test_wilson_interval_is_that_of_scipy(units: int, share: float) -> None:
    passed = round(share * units)
    wanted = stats.binomtest(passed, units).proportion_ci(method="wilson")
    assert wilson_interval(passed, units) == pytest.approx((wanted.low, wanted.high), rel=1e-12, abs=1e-15)


@pytest.mark.parametrize(("passed", "units"), [(0, 0), (-1, 5), (6, 5)])
def test_wilson_interval_of_nonsense(passed: int, units: int) -> None:
    with pytest.raises(ValueError, match="units"):
        wilson_interval(passed, units)


def test_yield_of_units() -> None:
    found = yield_of(np.array([True, True, False, True]))
    assert (found.passed, found.units, found.share) == (3, 4, 0.75)
    assert found.to_dict() == {"yield": 0.75, "yield_low": found.low, "yield_high": found.high}
    assert 0.0 < found.low < 0.75 < found.high < 1.0


def varied(low: float, high: float, kind: Distribution) -> Varied:
    tolerance = Tolerance(low=low, high=high, distribution=kind)
    return Varied(key="network.r1", unit="ohm", value=240.0, tolerance=tolerance, source="test")


def drawn(one: Varied, count: int = 20_000) -> np.ndarray:
    return factors_at(one.tolerance, np.random.default_rng(5).random(count))


def test_half_of_a_uniform_band() -> None:
    one = varied(-0.1, 0.1, Distribution.UNIFORM)
    factors = drawn(one)
    found = tighter_yield(one, factors, np.abs(factors - 1.0) < 0.06)
    # derived: 60 % of the whole band passes, all of its half; half of the units are in it
    assert found.share == 1.0
    assert found.gain == pytest.approx(0.4, abs=4.0 * found.gain_error)
    assert found.effective_units == pytest.approx(10_000, rel=0.03)
    assert found.is_certain and (found.low, found.high) == (-0.05, 0.05)


@pytest.mark.parametrize("kind", [Distribution.NORMAL, Distribution.LOGNORMAL])
def test_half_of_a_normal_band(kind: Distribution) -> None:
    one = varied(-0.3, 0.4, kind)
    factors = drawn(one)
    found = tighter_yield(one, factors, factors < 1.1)
    again = factors_at(halved(one.tolerance), np.random.default_rng(6).random(200_000))
    assert found.share == pytest.approx((again < 1.1).mean(), abs=4.0 * found.gain_error + 0.004)
    assert 0.0 < found.gain_error < 0.01
    assert 0.3 * len(factors) < found.effective_units < 0.8 * len(factors)


def test_error_of_the_gain_is_what_repeats_scatter_by() -> None:
    one = varied(-0.3, 0.3, Distribution.NORMAL)
    rng = np.random.default_rng(7)
    gains, errors = [], []
    for _ in range(300):
        factors = factors_at(one.tolerance, rng.random(400))
        found = tighter_yield(one, factors, factors > 0.95)
        gains.append(found.gain)
        errors.append(found.gain_error)
    assert np.mean(errors) == pytest.approx(np.std(gains), rel=0.15)


def test_a_value_that_does_not_matter_gains_nothing() -> None:
    one = varied(-0.1, 0.1, Distribution.UNIFORM)
    found = tighter_yield(one, drawn(one), np.random.default_rng(8).random(20_000) < 0.7)
    assert abs(found.gain) < 4.0 * found.gain_error and not found.is_certain


def test_no_unit_in_half_the_band() -> None:
    one = varied(-0.1, 0.1, Distribution.UNIFORM)
    found = tighter_yield(one, np.array([1.09, 0.92]), np.array([True, False]))
    assert (found.share, found.gain, found.effective_units) == (0.5, 0.0, 0.0)
    assert not found.is_certain
