"""The adjustable regulator: inverses, bounds, fold-back."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.physics import hysteresis, regulator


@given(st.floats(1.5, 37.0), st.floats(100.0, 500.0), st.floats(0.0, 1e-4))
def test_lower_resistor_is_the_inverse(output: float, r1: float, adjust: float) -> None:
    r2 = regulator.lower_resistor(output, 1.25, r1, adjust)
    assert regulator.output_voltage(1.25, r1, r2, adjust) == pytest.approx(output, rel=1e-12)


@given(st.floats(200.0, 5e3), st.floats(5e3, 1e7), st.floats(0.0, 0.3))
def test_feedback_resistor_acts_in_parallel_with_r1(r2: float, rh: float, excess: float) -> None:
    mean = regulator.output_voltage_with_feedback(1.25, 240.0, r2, rh, 50e-6, excess)
    threshold = hysteresis.switching_threshold(1.25, 240.0, r2, rh, 50e-6, mean + excess)
    assert threshold == pytest.approx(mean, rel=1e-12)
    assert regulator.output_voltage_with_feedback(1.25, 240.0, r2, np.inf, 50e-6) == (
        regulator.output_voltage(1.25, 240.0, r2, 50e-6)
    )


@given(
    st.floats(0.0, 0.05), st.floats(-1.0, 1.0), st.floats(-1.0, 1.0), st.floats(0.0, 1.0), st.floats(0.0, 1.0)
)
def test_worst_case_bounds_every_sample(tol: float, a: float, b: float, ref: float, adj: float) -> None:
    low, high = regulator.worst_case_output((1.2, 1.3), (0.0, 1e-4), 240.0, 2610.0, tol)
    sample = regulator.output_voltage(
        1.2 + 0.1 * ref, 240.0 * (1 + a * tol), 2610.0 * (1 + b * tol), 1e-4 * adj
    )
    assert low * (1 - 1e-12) <= sample <= high * (1 + 1e-12)


def test_fold_back_falls_and_stays() -> None:
    difference = np.linspace(0.0, 60.0, 121)
    limit = regulator.current_limit(difference, 2.2, 15.0, 40.0, 0.4)
    assert np.all(np.diff(limit) <= 0.0)
    assert limit[0] == 2.2
    assert limit[-1] == pytest.approx(0.4)


def test_infinite_knee_is_a_constant_limit() -> None:
    knee = np.array([np.inf, 15.0])
    far = np.array([np.inf, 40.0])
    limit = regulator.current_limit(25.0, 2.2, knee, far, np.array([0.0, 0.4]))
    assert limit.tolist() == pytest.approx([2.2, 1.48])


def test_headroom_is_the_sum_of_the_drops() -> None:
    needed = regulator.base_drive_headroom(0.1, 0.75, 22.0, 1.6, 0.4)
    assert needed == pytest.approx(0.75 + regulator.dropout_voltage(0.1) + 22.0 * 0.1)


def test_minimum_load_of_the_classes() -> None:
    """CV-20: 240 ohm covers the typical minimum load, only 120 ohm the largest (looked up)."""
    typical, largest = regulator.MINIMUM_LOAD["adjustable 1.5 A"]
    assert typical < regulator.divider_current(1.25, 240.0) < largest
    assert regulator.divider_current(1.25, 120.0) > largest
    assert regulator.no_load_input_current(8e-3, 1.25, 240.0) == 8e-3
