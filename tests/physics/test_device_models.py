"""Device models with temperature: sharing, recovery, safe area, saturation, ESR, plates."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.physics import capacitor, convection, converter, diode, pnp, recovery, runaway, safe_area

currents = st.floats(0.05, 20.0)
slopes = st.floats(1e5, 1e9)
lifetimes = st.floats(1e-9, 5e-6)


def test_two_pieces_on_one_sink_share_like_two_straight_lines() -> None:
    # derived: (I r2 + V2 - V1)/(r1 + r2) with 60 mohm each and 50 mV between them
    current, warmer = diode.hottest_piece(3.0, 2.0, 0.35, 0.06, 0.05, -1e-3, 0.0)
    assert current == pytest.approx(1.91667, abs=1e-5)
    assert warmer == 0.0


@given(currents, st.floats(0.0, 0.1), st.floats(1.0, 60.0), st.integers(2, 4))
def test_separate_cooling_never_evens_the_shares_out(
    current: float, spread: float, path: float, pieces: int
) -> None:
    """With a negative coefficient the hotter piece draws more (common practice: one heat sink for all)."""
    common, _ = diode.hottest_piece(current, float(pieces), 0.35, 0.06, spread, -1e-3, 0.0)
    separate, warmer = diode.hottest_piece(current, float(pieces), 0.35, 0.06, spread, -1e-3, path)
    assert current / pieces - 1e-9 <= common <= separate + 1e-9 <= current + 2e-9
    assert warmer >= 0.0


def test_one_piece_carries_everything() -> None:
    assert diode.hottest_piece(3.0, 1.0, 0.35, 0.06, 0.05, -1e-3, 40.0) == (3.0, 0.0)


@given(currents, slopes, lifetimes)
def test_recovery_charge_lies_between_its_two_limits(current: float, slope: float, lifetime: float) -> None:
    # derived: I t for a steep fall, a t^2 for a slow one; both are upper bounds
    charge = recovery.charge_at_crossing(current, slope, lifetime)
    assert 0.0 < charge <= min(current * lifetime, slope * lifetime**2) * (1.0 + 1e-9)


@given(currents, slopes, lifetimes)
def test_recovery_charge_grows_with_current_slope_and_temperature(
    current: float, slope: float, lifetime: float
) -> None:
    charge = recovery.charge_at_crossing(current, slope, lifetime)
    assert recovery.charge_at_crossing(1.1 * current, slope, lifetime) >= charge
    assert recovery.charge_at_crossing(current, 1.1 * slope, lifetime) >= charge
    assert recovery.charge_at_temperature(charge, 125.0) == pytest.approx(2.0 * charge)


@given(currents, slopes, lifetimes)
def test_lifetime_is_the_inverse(current: float, slope: float, lifetime: float) -> None:
    charge = recovery.charge_at_crossing(current, slope, lifetime)
    assert recovery.carrier_lifetime(charge, current, slope) == pytest.approx(lifetime, rel=1e-6)


def test_no_charge_has_no_lifetime() -> None:
    assert recovery.carrier_lifetime(0.0, 3.0, 50e6) == 0.0


def test_charge_agrees_with_the_charge_equation_integrated() -> None:
    # derived: dq/dt = i - q/t stepped through with 20 000 steps
    current, slope, lifetime = 3.0, 20e6, 100e-9
    steps = 20_000
    step = current / slope / steps
    charge = current * lifetime
    for index in range(steps):
        flowing = current - slope * (index + 0.5) * step
        charge = (charge * (1.0 - 0.5 * step / lifetime) + flowing * step) / (1.0 + 0.5 * step / lifetime)
    assert recovery.charge_at_crossing(current, slope, lifetime) == pytest.approx(charge, rel=1e-6)


KNOWN = {"rated_current": 15.0, "rated_voltage": 60.0}


def direct(voltage: float, power: float = 115.0) -> float:
    """60 V, 15 A, 115 W with second breakdown at 40 V and 2.87 A: the registered 2N3055 (from memory)."""
    second = safe_area.breakdown_current(voltage, 40.0, 2.87, np.nan, np.nan)
    return float(safe_area.safe_current(voltage, **KNOWN, power=power, breakdown=second))


def test_safe_area_of_a_known_transistor() -> None:
    assert direct(5.0) == 15.0
    assert direct(20.0) == pytest.approx(115.0 / 20.0)
    assert direct(40.0) == pytest.approx(2.87, rel=2e-3)
    assert direct(55.0) < 115.0 / 55.0
    assert direct(61.0) == 0.0


def test_unknown_second_breakdown_is_not_guessed() -> None:
    second = safe_area.breakdown_current(20.0, np.nan, np.nan, np.nan, np.nan)
    allowed = safe_area.safe_current(20.0, **KNOWN, power=115.0, breakdown=second)
    assert np.isnan(second) and np.isnan(allowed)
    assert np.isnan(safe_area.safe_current(61.0, **KNOWN, power=115.0, breakdown=second))
    assert np.isnan(safe_area.safe_area_margin(1.0, allowed))
    assert np.isnan(safe_area.safe_area_margin(0.0, allowed))
    assert np.isnan(safe_area.pulse_safe_current(20.0, np.nan, np.nan, 15.0, 60.0))


@given(st.floats(1.0, 59.0), st.floats(25.0, 180.0))
def test_hotter_cases_allow_less(voltage: float, case_c: float) -> None:
    cool, hot = (direct(voltage, safe_area.power_limit(200.0, c, 1.5)) for c in (case_c, case_c + 10.0))
    assert hot <= cool


def test_two_points_of_second_breakdown_are_joined_by_a_line() -> None:
    # derived: on doubly logarithmic paper the geometric means of both ends lie on the line
    points = (30.0, 10.0, 60.0, 0.64)
    assert safe_area.breakdown_current(30.0, *points) == pytest.approx(10.0)
    assert safe_area.breakdown_current(60.0, *points) == pytest.approx(0.64)
    assert safe_area.breakdown_current(np.sqrt(1800.0), *points) == pytest.approx(np.sqrt(6.4))


def test_derating_is_a_line_from_25_degrees_to_the_limit() -> None:
    # derived: 175 K from 25 to 200 degC
    assert safe_area.derating(200.0, np.array([0.0, 25.0, 112.5, 200.0, 250.0])).tolist() == [1, 1, 0.5, 0, 0]


@given(st.floats(0.5, 70.0))
def test_a_pulse_stays_inside_what_its_point_proves(voltage: float) -> None:
    allowed = safe_area.pulse_safe_current(voltage, 40.0, 6.0, **KNOWN)
    assert allowed <= 15.0
    assert allowed * voltage <= 240.0 * (1.0 + 1e-9)
    assert (allowed == 0.0) == (voltage > 60.0)


@given(st.floats(1e-7, 10.0), st.floats(1.0, 59.0))
def test_shorter_is_allowed_more_between_direct_current_and_the_pulse(duration: float, voltage: float) -> None:
    long, pulse = direct(voltage), float(safe_area.pulse_safe_current(voltage, 40.0, 6.0, **KNOWN))
    now, later = (
        safe_area.safe_current_for(time, long, pulse, 1e-3) for time in (duration, 2.0 * duration)
    )
    assert later <= now * (1.0 + 1e-12)
    assert long * (1.0 - 1e-12) <= now <= max(pulse, long) * (1.0 + 1e-12)


def test_times_between_lie_on_a_line_in_their_logarithm() -> None:
    # derived: 31.6 ms is the middle between 1 ms and 1 s, so the geometric mean of both currents
    found = safe_area.safe_current_for(np.array([1e-6, 1e-3, np.sqrt(1e-3), 1.0, np.inf]), 2.0, 8.0, 1e-3)
    assert found == pytest.approx([8.0, 8.0, 4.0, 2.0, 2.0])
    unknown = safe_area.safe_current_for(np.array([1e-6, 1.0]), 2.0, np.nan, np.nan)
    assert unknown.tolist() == [2.0, 2.0]


@given(st.floats(1.0, 38.0))
def test_less_drive_leaves_more_across_the_transistor(forced: float) -> None:
    assert pnp.saturation_with_drive(1.02 * forced, 40.0, 25.0) > pnp.saturation_with_drive(forced, 40.0, 25.0)


def test_saturation_is_bounded_where_it_ends() -> None:
    assert np.isfinite(pnp.saturation_with_drive(400.0, 40.0, 25.0))


@given(st.floats(0.01, 0.3), st.floats(120.0, 1e5))
def test_esr_falls_with_frequency_to_its_rated_value(esr: float, frequency: float) -> None:
    at = capacitor.esr_at_frequency(esr, 0.16, 470e-6, frequency)
    assert at >= esr * (1.0 - 1e-12)
    assert capacitor.esr_at_frequency(esr, 0.16, 470e-6, 1e5) == pytest.approx(esr)
    assert capacitor.esr_at_frequency(esr, np.nan, 470e-6, frequency) == esr


@given(st.floats(0.5, 40.0), st.floats(5.0, 90.0))
def test_plates_have_the_resistance_they_were_made_for(resistance: float, rise: float) -> None:
    side = convection.plate_side(resistance, rise, 25.0, 0.9)
    again = convection.plate_resistance(2.0 * side**2, side, rise, 25.0, 0.9)
    assert again == pytest.approx(resistance, rel=1e-6)
    assert convection.plate_side(resistance, rise, 25.0, 0.08) > side


@given(st.floats(0.03, 0.1), st.floats(2.0, 60.0), st.floats(20.0, 90.0))
def test_at_the_runaway_limit_leakage_alone_lifts_by_one_over_its_exponent(
    exponent: float, path: float, base_c: float
) -> None:
    # derived, application note AN869: c R P = 1/e is the last balance
    limit = np.exp(-1.0) / (exponent * path)
    hot = runaway.junction_with_leakage(base_c, path, limit * (1.0 - 1e-12), exponent)
    assert hot - base_c == pytest.approx(1.0 / exponent, rel=1e-5)
    assert np.isnan(runaway.junction_with_leakage(base_c, path, limit * (1.0 + 1e-9), exponent))
    assert runaway.runaway_room(limit, exponent, path) == pytest.approx(0.0, abs=1e-9)


@given(st.floats(0.05, 0.95), st.sampled_from([5e-3, 30e-3, 300e-3]))
def test_ripple_voltage_is_exact_in_all_three_regimes(duty: float, esr: float) -> None:
    """The closed form against the waveform itself, sampled (derived)."""
    ripple, frequency, capacitance = 0.6, 20e3, 220e-6
    period = 1.0 / frequency
    rising = np.linspace(0.0, duty * period, 40_001)
    falling = np.linspace(0.0, (1.0 - duty) * period, 40_001)
    slope_up, slope_down = ripple / (duty * period), ripple / ((1.0 - duty) * period)
    up = -ripple / 2.0 + slope_up * rising
    down = ripple / 2.0 - slope_down * falling
    charge_up = -ripple / 2.0 * rising + slope_up * rising**2 / 2.0
    charge_down = charge_up[-1] + ripple / 2.0 * falling - slope_down * falling**2 / 2.0
    volts = np.concatenate([charge_up / capacitance + esr * up, charge_down / capacitance + esr * down])
    expected = volts.max() - volts.min()
    found = converter.output_ripple(ripple, frequency, duty, capacitance, esr)
    assert found == pytest.approx(expected, rel=1e-6)
