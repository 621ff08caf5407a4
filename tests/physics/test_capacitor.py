"""Capacitors: bands and inverses."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.physics import capacitor


@given(st.floats(500.0, 10e3), st.floats(20.0, 95.0))
def test_ten_kelvin_double_the_life(rated: float, celsius: float) -> None:
    cool = capacitor.electrolytic_life_uncapped(rated, 105.0, celsius)
    warm = capacitor.electrolytic_life_uncapped(rated, 105.0, celsius + 10.0)
    assert cool == pytest.approx(2.0 * warm)
    capped = capacitor.electrolytic_life(rated, 105.0, celsius)
    assert capped == min(cool, capacitor.LIFE_CAP)


def test_temperature_band_of_the_esr_meets_its_points() -> None:
    celsius = np.array(list(capacitor.ESR_TEMPERATURE_FACTOR))
    low, high = capacitor.esr_factor_at_temperature(celsius)
    points = np.array(list(capacitor.ESR_TEMPERATURE_FACTOR.values()))
    assert low == pytest.approx(points[:, 0])
    assert high == pytest.approx(points[:, 1])
    middle, _ = capacitor.esr_factor_at_temperature(-12.5)
    assert middle == pytest.approx(np.sqrt(3.0 * 1.5))


def test_rise_at_rated_current_is_the_rated_rise() -> None:
    assert capacitor.ripple_rise(1.8, 1.8) == capacitor.RATED_RIPPLE_RISE
    assert capacitor.ripple_rise(0.9, 1.8, 8.0) == pytest.approx(2.0)
    assert capacitor.ripple_loss(1.5, 0.1) == pytest.approx(0.225)
