"""Transistor and rectifier: inverses, charge equation, runaway."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import solve_ivp
from scipy.optimize import brentq

from buckdesign.physics import diode, pnp, recovery, runaway, switching

currents = st.floats(1e-3, 30.0)
gains = st.floats(5.0, 200.0)
knees = st.floats(0.5, 50.0)


@given(currents, gains, knees)
def test_charge_and_current_are_inverse(current: float, beta: float, knee: float) -> None:
    charge = pnp.base_charge(current, beta, 1e-6, knee)
    assert pnp.collector_current(charge, beta, 1e-6, knee) == pytest.approx(current, rel=1e-12)
    assert pnp.base_current(current, beta, knee) == pytest.approx(current / pnp.gain(current, beta, knee))


def test_no_knee_is_a_constant_gain() -> None:
    assert pnp.collector_current(1e-7, 40.0, 1e-6, np.inf) == pytest.approx(4.0)
    assert pnp.gain(100.0, 40.0, np.inf) == 40.0


@given(gains, knees, st.floats(0.1, 3.0), st.floats(1.1, 10.0))
def test_two_points_give_the_law_back(beta: float, knee: float, current: float, ratio: float) -> None:
    other = current * ratio
    found, found_knee = pnp.gain_law_from_two_points(
        pnp.gain(current, beta, knee), current, pnp.gain(other, beta, knee), other
    )
    assert found == pytest.approx(beta, rel=1e-6)
    assert found_knee == pytest.approx(knee, rel=1e-5)


def test_two_points_the_law_cannot_follow() -> None:
    flat, infinite = pnp.gain_law_from_two_points(40.0, 1.0, 40.0, 5.0)
    assert flat == pytest.approx(40.0)
    assert np.isinf(infinite)
    steep, none = pnp.gain_law_from_two_points(np.array([30.0, 40.0]), 3.0, np.array([10.0, 30.0]), 5.0)
    assert np.isnan(steep[0])
    assert np.isnan(none[0])
    assert np.isfinite(steep[1])


def test_one_point_reproduces_it() -> None:
    knee = pnp.knee_from_rating(25.0)
    beta = pnp.gain_low_from_point(20.0, 10.0, knee)
    assert pnp.gain(10.0, beta, knee) == pytest.approx(20.0)


@pytest.mark.parametrize("reverse", [0.0, 0.05, 0.3])
def test_storage_time_against_the_charge_equation(reverse: float) -> None:
    """CV-24 against an integration of dq/dt = -I_B2 - q/tau from the driven steady state (derived)."""
    tau, drive, collector, beta = 1e-6, 0.3, 3.0, 50.0
    edge = collector * tau / beta

    def saturation_ends(_: float, state: np.ndarray) -> float:
        return float(state[0] - edge)

    saturation_ends.terminal = True  # type: ignore[attr-defined]
    solution = solve_ivp(
        lambda _, state: [-reverse - state[0] / tau],
        (0.0, 10e-6),
        [drive * tau],
        events=saturation_ends,
        rtol=1e-10,
        atol=1e-18,
        max_step=1e-8,
    )
    expected = solution.t_events[0][0]
    assert switching.storage_time(tau, drive, reverse, collector, beta) == pytest.approx(expected, rel=1e-6)


def test_undriven_transistor_stores_nothing() -> None:
    assert switching.storage_time(1e-6, 0.01, 0.1, 3.0, 50.0) == 0.0
    assert np.isnan(switching.charge_time_from_storage(1e-6, 0.01, 0.1, 3.0, 50.0))


def test_switching_losses_by_integration() -> None:
    """Both losses from the mean of v i over straight edges (derived)."""
    share = np.linspace(0.0, 1.0, 100_001)
    resistive = np.trapezoid(share * (1.0 - share), share)
    assert switching.switching_loss_resistive(10.0, 2.0, 1e-6, 1e5) == pytest.approx(
        2.0 * resistive, rel=1e-6
    )
    inductive = 2 * np.trapezoid(share, share)
    found = switching.switching_loss_inductive(10.0, 2.0, 2e-6, 1e5)
    assert found == pytest.approx(2.0 * inductive, rel=1e-9)


def test_transistor_with_temperature() -> None:
    assert pnp.base_emitter_voltage(0.75, 125.0) == pytest.approx(0.55)
    assert pnp.gain_at_temperature(40.0, 25.0) == 40.0
    assert pnp.gain_at_temperature(40.0, -40.0) < 40.0 < pnp.gain_at_temperature(40.0, 100.0)
    assert pnp.charge_time_at_temperature(1e-6, 125.0) == pytest.approx(2e-6)
    assert pnp.saturation_resistance(0.05, 5.0, 0.1) == 0.0
    assert pnp.charge_time_from_transition_frequency(40.0, 4e6) == pytest.approx(40.0 / (2 * np.pi * 4e6))


@given(st.floats(0.0, 20.0), st.floats(0.1, 0.8), st.floats(1e-3, 0.3), st.floats(-0.3, 0.3))
def test_parallel_rectifiers_share_the_current(
    current: float, threshold: float, slope: float, off: float
) -> None:
    first = diode.parallel_share(current, threshold, slope, threshold + off, 1.3 * slope)
    second = diode.parallel_share(current, threshold + off, 1.3 * slope, threshold, slope)
    assert first + second == pytest.approx(current)
    assert 0.0 <= first <= current
    if 1e-9 * current < first < current * (1 - 1e-9):
        drop = threshold + slope * first
        assert drop == pytest.approx(threshold + off + 1.3 * slope * second, rel=1e-6)


@given(st.floats(0.02, 0.09), st.floats(1e-6, 1e-2), st.floats(30.0, 150.0))
def test_leakage_doubles_in_its_interval(c: float, start: float, celsius: float) -> None:
    later = celsius + diode.doubling_interval(c)
    ratio = diode.leakage(start, later, 25.0, c) / diode.leakage(start, celsius, 25.0, c)
    assert ratio == pytest.approx(2.0, rel=1e-9)
    assert diode.doubling_interval(diode.doubling_interval(c)) == pytest.approx(c)
    first, second = diode.leakage(start, 40.0, 25.0, c), diode.leakage(start, 90.0, 25.0, c)
    assert diode.leakage_coefficient(first, 40.0, second, 90.0) == pytest.approx(c, rel=1e-9)


@given(st.floats(1e-9, 1e-5), st.floats(1e6, 1e9), st.floats(0.1, 3.0))
def test_recovery_triangle_has_its_charge(charge: float, slope: float, softness: float) -> None:
    peak = recovery.recovery_peak_current(charge, slope, softness)
    time = recovery.recovery_time(charge, slope, softness)
    assert recovery.recovery_charge(peak, time) == pytest.approx(charge)
    assert time / (1.0 + softness) == pytest.approx(peak / slope)
    assert recovery.recovery_charge_from_time(time, slope, softness) == pytest.approx(charge)


@given(st.floats(0.02, 0.09), st.floats(1.0, 80.0))
def test_at_the_limit_leakage_alone_lifts_the_junction_by_the_inverse_exponent(c: float, rth: float) -> None:
    """CV-34 identity (derived)."""
    limit = runaway.runaway_limit_leakage(20.0, 0.5, c, rth)
    loss = diode.leakage_loss(20.0, limit, 0.5)
    assert loss * rth == pytest.approx(1.0 / c)
    assert runaway.runaway_margin(loss, c, rth) == pytest.approx(1.0)


@given(st.floats(0.02, 0.09), st.floats(1.0, 80.0), st.floats(0.01, 0.99))
def test_junction_balances_leakage_and_heat(c: float, rth: float, share: float) -> None:
    loss = share * np.exp(-1.0) / (c * rth)
    junction = float(runaway.junction_with_leakage(80.0, rth, loss, c))
    direct = brentq(lambda t: 80.0 + rth * loss * np.exp(c * (t - 80.0)) - t, 80.0, 80.0 + 1.0 / c)
    assert junction == pytest.approx(direct, rel=1e-9)
    at_work = diode.leakage(loss, junction, 80.0, c)
    assert runaway.runaway_margin(at_work, c, rth) > 1.0


def test_no_balance_is_runaway() -> None:
    loss = np.array([0.0, 0.1, 1.0])
    junction = runaway.junction_with_leakage(80.0, 40.0, loss, 0.055)
    assert junction[0] == 80.0
    assert np.isfinite(junction[1])
    assert np.isnan(junction[2])
    assert np.isinf(runaway.runaway_margin(0.0, 0.055, 40.0))


def test_forward_drop_at_25_degrees_is_the_line() -> None:
    threshold, slope = diode.threshold_and_slope(0.525, 3.0, 0.95, 9.4)
    assert diode.forward_drop(3.0, threshold, slope, -1e-3, 25.0) == pytest.approx(0.525)
    assert diode.forward_drop(3.0, threshold, slope, -1e-3, 75.0) == pytest.approx(0.475)
    assert diode.capacitance_loss(1e-9, 10.0, 1e5) == pytest.approx(5e-3)
