"""Step-down relations: identities, limits, numerical waveforms."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.physics import converter, discontinuous, step_response

duties = st.floats(0.02, 0.98)


def numerical_ripple(ripple: float, frequency: float, duty: float, farad: float, esr: float) -> float:
    """Peak to peak of the output from a finely sampled triangular current; the second route of CV-8."""
    period = 1.0 / frequency
    time = np.union1d(np.linspace(0.0, period, 400_001), [duty * period])
    current = np.where(
        time <= duty * period,
        ripple * (time / (duty * period) - 0.5),
        ripple * (0.5 - (time - duty * period) / ((1.0 - duty) * period)),
    )
    charge = np.concatenate([[0.0], np.cumsum(np.diff(time) * (current[1:] + current[:-1]) / 2.0)])
    return float(np.ptp(charge / farad + esr * current))


@pytest.mark.parametrize("duty", [0.1, 0.4, 0.5, 0.75, 0.93])
@pytest.mark.parametrize("lag", [0.0, 1e-6, 5e-6, 1.2e-5, 4e-5])
def test_output_ripple_against_sampled_waveform(duty: float, lag: float) -> None:
    exact = converter.output_ripple(0.6, 30e3, duty, 100e-6, lag / 100e-6)
    assert exact == pytest.approx(numerical_ripple(0.6, 30e3, duty, 100e-6, lag / 100e-6), rel=2e-6)


@given(duties, st.floats(1e-9, 1e-2))
def test_output_ripple_lies_between_its_parts(duty: float, lag: float) -> None:
    farad, frequency, ripple = 220e-6, 20e3, 0.5
    esr = lag / farad
    capacitive = converter.output_ripple(ripple, frequency, duty, farad, 0.0)
    exact = converter.output_ripple(ripple, frequency, duty, farad, esr)
    assert max(capacitive, ripple * esr) * (1 - 1e-12) <= exact <= (capacitive + ripple * esr) * (1 + 1e-12)


@given(duties)
def test_output_ripple_is_continuous_between_its_forms(duty: float) -> None:
    farad, frequency = 100e-6, 25e3
    for interval in (duty, 1.0 - duty):
        limit = interval / frequency / 2.0 / farad
        below, above = (
            converter.output_ripple(1.0, frequency, duty, farad, limit * f) for f in (1 - 1e-9, 1 + 1e-9)
        )
        assert below == pytest.approx(above, rel=1e-7)


@given(st.floats(0.1, 20.0), st.floats(0.0, 1.9), duties)
def test_rms_identities(current: float, relative_ripple: float, duty: float) -> None:
    ripple = relative_ripple * current
    choke = converter.choke_rms(current, ripple)
    switch = converter.conducting_rms(current, ripple, duty)
    rectifier = converter.conducting_rms(current, ripple, 1.0 - duty)
    assert switch**2 + rectifier**2 == pytest.approx(choke**2)
    supply = converter.input_capacitor_rms(current, ripple, duty)
    assert supply**2 == pytest.approx(switch**2 - (duty * current) ** 2, rel=1e-6, abs=1e-12)
    assert choke**2 - current**2 == pytest.approx(converter.output_capacitor_rms(ripple) ** 2, abs=1e-9)


@given(st.floats(6.0, 60.0), st.floats(0.1, 0.9), st.floats(0.1, 5.0))
def test_duty_balances_the_volt_seconds(supply: float, ratio: float, current: float) -> None:
    on = converter.choke_voltage_on(supply, ratio * supply, current, 0.3, 0.05)
    off = converter.choke_voltage_off(ratio * supply, current, 0.5, 0.05)
    duty = converter.duty_ccm(on, off)
    assert on * duty == pytest.approx(off * (1.0 - duty), rel=1e-12)
    ripple = converter.ripple_current(on, duty, 220e-6, 20e3)
    assert converter.inductance_for_ripple(on, duty, ripple, 20e3) == pytest.approx(220e-6)


@given(duties)
def test_conversion_ratio_meets_the_duty_at_the_boundary(duty: float) -> None:
    assert discontinuous.conversion_ratio_dcm(1.0 - duty, duty) == pytest.approx(duty, rel=1e-12)
    assert discontinuous.conversion_ratio((1.0 - duty) * 0.5, duty) > duty
    assert discontinuous.conversion_ratio((1.0 - duty) * 2.0, duty) == duty


@given(st.floats(0.1, 0.9), st.floats(0.02, 0.999))
def test_discontinuous_waveform_is_consistent(ratio: float, share_of_boundary: float) -> None:
    supply, inductance, frequency = 20.0, 200e-6, 20e3
    output = ratio * supply
    load = share_of_boundary * discontinuous.boundary_current(supply, output, inductance, frequency)
    duty = discontinuous.duty_dcm(supply, output, inductance, frequency, load)
    rest = discontinuous.rectifier_share_dcm(supply, output, duty)
    peak = discontinuous.peak_current_dcm(supply, output, duty, inductance, frequency)
    assert duty + rest < 1.0 + 1e-12
    assert peak * (duty + rest) / 2.0 == pytest.approx(load)
    k = discontinuous.conduction_parameter(inductance, frequency, output / load)
    assert discontinuous.conversion_ratio(k, duty) == pytest.approx(ratio)
    rms = discontinuous.triangle_rms(peak, duty + rest)
    squares = discontinuous.triangle_rms(peak, duty) ** 2 + discontinuous.triangle_rms(peak, rest) ** 2
    assert rms**2 == pytest.approx(squares)


def test_step_response_of_a_stiff_circuit() -> None:
    time = np.array([0.0, 1e-3, 10.0])
    current = step_response.rl_step_current(20.0, 0.1, 200e-6, time)
    assert current[0] == 0.0
    assert current[-1] == pytest.approx(200.0)
    assert step_response.rlc_peak_ratio(0.0) == 2.0


def test_scalar_and_array_agree() -> None:
    supply = np.array([[18.0], [24.0]])
    esr = np.array([0.0, 0.02, 0.1])
    table = converter.output_ripple(0.5, 20e3, 12.0 / supply, 470e-6, esr)
    assert table.shape == (2, 3)
    one = converter.output_ripple(0.5, 20e3, 12.0 / 24.0, 470e-6, 0.02)
    assert np.ndim(one) == 0
    assert table[1, 1] == one
