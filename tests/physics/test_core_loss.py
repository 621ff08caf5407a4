"""Core loss: the improved generalised Steinmetz equation by quadrature, units, limits."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from buckdesign.physics import core_loss

PLAIN = (1.0e9, 1.1e8, 1.9e6, 1.9e-13)
duties = st.floats(0.05, 0.95)


@pytest.mark.parametrize("alpha", [1.0, 1.3, 1.7, 2.0])
@pytest.mark.parametrize("beta", [2.0, 2.5])
def test_coefficient_against_its_definition(alpha: float, beta: float) -> None:
    integral = 4.0 * quad(lambda t: np.cos(t) ** alpha, 0.0, np.pi / 2)[0]
    expected = 3.0 / ((2 * np.pi) ** (alpha - 1) * 2 ** (beta - alpha) * integral)
    assert core_loss.igse_coefficient(3.0, alpha, beta) == pytest.approx(expected, rel=1e-10)
    assert core_loss.igse_coefficient_approximate(3.0, alpha, beta) == pytest.approx(expected, rel=1.5e-3)


@given(st.floats(1.0, 2.0), st.floats(1.8, 2.8), duties)
def test_ratio_is_triangular_over_sine_for_every_beta(alpha: float, beta: float, duty: float) -> None:
    peak, frequency = 0.05, 30e3
    sine = core_loss.steinmetz_loss(1.7, alpha, beta, frequency, peak)
    coefficient = core_loss.igse_coefficient(1.7, alpha, beta)
    triangular = core_loss.igse_triangular_loss(coefficient, alpha, beta, frequency, 2 * peak, duty)
    assert triangular / sine == pytest.approx(core_loss.triangular_to_sine_ratio(alpha, duty), rel=1e-9)


@given(duties)
def test_ratio_is_exact_for_pure_hysteresis_and_pure_eddy_current(duty: float) -> None:
    assert core_loss.triangular_to_sine_ratio(1.0, duty) == pytest.approx(1.0)
    assert core_loss.triangular_to_sine_ratio(2.0, duty) == pytest.approx(
        core_loss.triangular_eddy_factor(duty)
    )
    assert core_loss.triangular_eddy_factor(duty) >= 8.0 / np.pi**2 * (1 - 1e-12)


@given(st.floats(1e3, 3e5), st.floats(1e-3, 0.4), duties)
def test_only_the_eddy_part_feels_the_duty(frequency: float, peak: float, duty: float) -> None:
    hysteresis = core_loss.three_term_hysteresis(frequency, peak, *PLAIN[:3])
    eddy = core_loss.three_term_eddy(frequency, peak, PLAIN[3])
    found = core_loss.three_term_loss_triangular(frequency, peak, duty, *PLAIN)
    assert found == pytest.approx(hysteresis + eddy * core_loss.triangular_eddy_factor(duty))


@given(st.floats(1e3, 3e5), st.floats(1e-3, 0.4))
def test_local_exponents_are_the_derivatives(frequency: float, peak: float) -> None:
    step = 1e-5
    alpha, beta = core_loss.three_term_exponents(frequency, peak, *PLAIN)

    def log_loss(f: float, b: float) -> float:
        return float(np.log(core_loss.three_term_loss(f, b, *PLAIN)))

    up, down = np.exp(step), np.exp(-step)
    assert alpha == pytest.approx(
        (log_loss(frequency * up, peak) - log_loss(frequency * down, peak)) / (2 * step), rel=1e-5
    )
    assert beta == pytest.approx(
        (log_loss(frequency, peak * up) - log_loss(frequency, peak * down)) / (2 * step), rel=1e-5
    )


def test_printed_form_in_its_own_units() -> None:
    """The form as printed, mW/cm3 with hertz and gauss, against tesla and W/m3 (from memory)."""
    f, gauss = 30e3, 300.0
    a, b, c, d = PLAIN
    printed = f / (a / gauss**3 + b / gauss**2.3 + c / gauss**1.65) + d * f**2 * gauss**2
    assert printed == pytest.approx(87.98, rel=1e-3)
    assert core_loss.three_term_loss(f, 0.03, *PLAIN) == pytest.approx(printed * 1e3)


def test_no_flux_no_loss() -> None:
    assert core_loss.three_term_loss(30e3, 0.0, *PLAIN) == 0.0
    table = core_loss.three_term_loss(np.array([[1e4], [2e4]]), np.array([0.0, 0.01, 0.02]), *PLAIN)
    assert table.shape == (2, 3)
    assert np.all(np.diff(table, axis=1) > 0.0)
