"""Ripple regulation: closed forms against the event-driven model, and their limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.physics import hysteresis
from buckdesign.physics.comparator import ComparatorCircuit, comparator_cycle, comparator_orbit

VIN, VO, CHOKE, ESR, WINDOW = 20.0, 15.0, 200e-6, 0.1, 0.03
UP, DOWN = (VIN - VO) / CHOKE, VO / CHOKE


@given(
    st.floats(8.0, 40.0),
    st.floats(0.15, 0.85),
    st.floats(50e-6, 1e-3),
    st.floats(0.03, 0.3),
    st.floats(5e-3, 0.1),
    st.floats(0.0, 3e-6),
    st.floats(0.0, 3e-6),
)
def test_event_driven_model_gives_the_exact_form(
    supply: float, ratio: float, choke: float, esr: float, window: float, off_delay: float, on_delay: float
) -> None:
    up, down = supply * (1.0 - ratio) / choke, supply * ratio / choke
    # Zero-capacitance estimate of the longest interval, to stay where the thresholds are met on the slopes.
    swing = (window + esr * (up * off_delay + down * on_delay)) / esr
    farad = 2.0 * max(swing / up, swing / down) / esr
    values = (up, down, farad, esr, 0.0, window, off_delay, on_delay)
    ripple = hysteresis.ripple_current_exact(*values)
    orbit = comparator_orbit(ComparatorCircuit(*values))
    assert orbit.converged
    assert orbit.ripple == pytest.approx(ripple, rel=1e-8)
    assert orbit.frequency == pytest.approx(hysteresis.frequency_of_ripple(ripple, up, down), rel=1e-8)
    shift = hysteresis.dc_shift(ripple, up, down, farad, esr, 0.0, off_delay, on_delay)
    assert orbit.mean_output == pytest.approx(-shift, abs=1e-7 * window)


def test_large_capacitor_gives_the_data_sheet_form() -> None:
    """CV-11, without ESL and with a capacitor that holds its voltage, to 1e-4."""
    orbit = comparator_orbit(ComparatorCircuit(UP, DOWN, 10.0, ESR, 0.0, WINDOW, 2e-6, 2e-6))
    expected = hysteresis.frequency_esr_delay(VIN, VO, CHOKE, ESR, WINDOW, 2e-6)
    assert orbit.frequency == pytest.approx(expected, rel=1e-5)


def test_waiting_reaches_the_same_orbit() -> None:
    circuit = ComparatorCircuit(UP, DOWN, 470e-6, ESR, 20e-9, WINDOW, 3e-6, 1e-6)
    orbit = comparator_orbit(circuit)
    current, previous = 0.2, None
    for _ in range(60):
        cycle = comparator_cycle(circuit, current)
        current, previous = cycle.end_current, current
    assert 1.0 / cycle.period == pytest.approx(orbit.frequency, rel=1e-10)
    assert abs(orbit.multiplier) < 1.0
    assert current == pytest.approx(previous, rel=1e-9)


def test_no_delay_and_large_capacitor_is_the_simple_form() -> None:
    exact = hysteresis.ripple_current_exact(UP, DOWN, 1e3, ESR, 0.0, WINDOW, 0.0, 0.0)
    simple = hysteresis.frequency_esr(VIN, VO, CHOKE, ESR, WINDOW)
    assert hysteresis.frequency_of_ripple(exact, UP, DOWN) == pytest.approx(simple, rel=1e-9)


def test_published_form_is_the_exact_one_without_the_quadratic_term() -> None:
    delay, farad = 1e-9, 470e-6
    exact = hysteresis.ripple_current_exact(UP, DOWN, farad, ESR, 20e-9, WINDOW, delay, delay)
    published = hysteresis.ripple_current_published(UP, DOWN, farad, ESR, 20e-9, WINDOW, delay)
    assert published == pytest.approx(exact, rel=1e-8)
    late = 2e-6
    exact = hysteresis.ripple_current_exact(UP, DOWN, farad, ESR, 20e-9, WINDOW, late, late)
    published = hysteresis.ripple_current_published(UP, DOWN, farad, ESR, 20e-9, WINDOW, late)
    assert 1.005 < published / exact < 1.01


def test_too_small_an_esr_stops_the_ripple_control() -> None:
    ripple = hysteresis.ripple_current_exact(UP, DOWN, 100e-6, 0.01, 0.0, WINDOW, 2e-6, 2e-6)
    assert np.isinf(ripple)
    assert hysteresis.frequency_of_ripple(ripple, UP, DOWN) == 0.0
    nearly = hysteresis.ripple_current_exact(UP, DOWN, 100e-6, 0.0201, 0.0, WINDOW, 2e-6, 2e-6)
    assert hysteresis.frequency_of_ripple(nearly, UP, DOWN) < 300.0
    esr = np.array([0.005, 0.01, 0.019, 0.021, 0.03])
    orbit = comparator_orbit(ComparatorCircuit(UP, DOWN, 100e-6, esr, 0.0, WINDOW, 2e-6, 2e-6))
    assert orbit.converged.tolist() == [False, False, False, True, True]
    assert np.isnan(orbit.frequency[:3]).all()


@given(st.floats(1.5, 4.0))
def test_larger_choke_lowers_the_frequency_not_the_ripple(factor: float) -> None:
    """CV-61: in the ESR limit the ripple stays at H/r."""
    small = hysteresis.ripple_current_exact(UP, DOWN, 1e3, ESR, 0.0, WINDOW, 0.0, 0.0)
    large = hysteresis.ripple_current_exact(UP / factor, DOWN / factor, 1e3, ESR, 0.0, WINDOW, 0.0, 0.0)
    assert small == pytest.approx(WINDOW / ESR) == large
    f_small = hysteresis.frequency_of_ripple(small, UP, DOWN)
    assert hysteresis.frequency_of_ripple(large, UP / factor, DOWN / factor) == pytest.approx(
        f_small / factor
    )


@given(st.floats(10.0, 40.0), st.floats(100.0, 5e3), st.floats(1e5, 3e6))
def test_window_is_the_difference_of_the_thresholds(supply: float, r2: float, rh: float) -> None:
    high = hysteresis.switching_threshold(1.25, 240.0, r2, rh, 50e-6, supply - 0.6)
    low = hysteresis.switching_threshold(1.25, 240.0, r2, rh, 50e-6, -0.9)
    assert high - low == pytest.approx(hysteresis.hysteresis_window(supply + 0.3, r2, rh), rel=1e-9)


def test_orbits_of_an_array_are_those_of_its_elements() -> None:
    esr = np.array([[0.05, 0.1, 0.2]])
    delay = np.array([[1e-6], [2e-6]])
    table = comparator_orbit(ComparatorCircuit(UP, DOWN, 470e-6, esr, 20e-9, WINDOW, delay, 1e-6))
    assert table.frequency.shape == (2, 3)
    one = comparator_orbit(ComparatorCircuit(UP, DOWN, 470e-6, 0.2, 20e-9, WINDOW, 1e-6, 1e-6))
    assert np.ndim(one.frequency) == 0
    assert table.frequency[0, 2] == pytest.approx(one.frequency, rel=1e-10)
