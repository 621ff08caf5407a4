"""Ring geometry, bias, flux, energy and the unknown core: against quadrature and sampling."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.integrate import quad

from buckdesign.constants import MU_0
from buckdesign.physics import bias, choke, ring, unknown_core

OUTER, INNER, HEIGHT = 26.9e-3, 14.5e-3, 11.1e-3
inner_diameters = st.floats(2e-3, 50e-3)
ratios = st.floats(1.2, 2.6)
exponents = st.floats(1.0, 2.5)


@given(inner_diameters, ratios, st.floats(2e-3, 50e-3))
def test_effective_parameters_are_those_of_the_core_constants(d: float, ratio: float, h: float) -> None:
    c1, c2 = ring.core_constant_c1(d * ratio, d, h), ring.core_constant_c2(d * ratio, d, h)
    assert ring.effective_length(d * ratio, d) == pytest.approx(c1**2 / c2)
    assert ring.effective_area(d * ratio, d, h) == pytest.approx(c1 / c2)
    assert ring.effective_volume(d * ratio, d, h) == pytest.approx(c1**3 / c2**2)
    assert np.pi * d < ring.effective_length(d * ratio, d) < ring.mean_length(d * ratio, d)
    assert ring.effective_area(d * ratio, d, h) < ring.geometric_area(d * ratio, d, h)


@given(st.floats(5.0, 200.0), inner_diameters, ratios, st.floats(2e-3, 50e-3))
def test_inductance_factor_and_back(mu: float, d: float, ratio: float, h: float) -> None:
    c1 = ring.core_constant_c1(d * ratio, d, h)
    factor = ring.inductance_factor(mu, c1)
    assert ring.permeability_of_inductance_factor(factor, c1) == pytest.approx(mu)
    turns = ring.turns_for_inductance(factor * 40**2, factor)
    assert turns == pytest.approx(40.0)
    found = unknown_core.permeability_from_test_winding(factor * 20**2, 20, d * ratio, d, h)
    assert found == pytest.approx(mu)


def test_surface_of_a_thin_ring_is_two_cylinders() -> None:
    assert ring.surface(10e-3, 10e-3, 5e-3) == pytest.approx(2 * np.pi * 10e-3 * 5e-3)


@pytest.mark.parametrize("exponent", [1.0, 1.3, 1.5, 2.0, 2.4])
@pytest.mark.parametrize("drive", [1e-3, 30.0, 180.0, 900.0])
def test_ring_share_against_quadrature(exponent: float, drive: float) -> None:
    """Flux of a small current change through the section, summed ring by ring (derived)."""
    half = 4090.0

    def share(radius: float) -> float:
        return bias.permeability_fraction(drive / (2 * np.pi * radius), half, exponent) / radius

    summed, _ = quad(share, INNER / 2, OUTER / 2, epsrel=1e-12)
    expected = summed / np.log(OUTER / INNER)
    found = bias.ring_inductance_fraction(drive, OUTER, INNER, half, exponent)
    assert found == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("exponent", [1.0, 1.3, 1.5, 2.0, 2.4])
@pytest.mark.parametrize("field", [10.0, 2947.5, 12000.0, 1e5])
def test_flux_density_against_quadrature(exponent: float, field: float) -> None:
    law, _ = quad(lambda h: 1.0 / (1.0 + (h / 4090.0) ** exponent), 0.0, field, epsrel=1e-12, limit=200)
    assert bias.flux_density(field, 75.0, 4090.0, exponent) == pytest.approx(MU_0 * 75.0 * law, rel=1e-9)


@pytest.mark.parametrize("drive", [20.0, 180.0, 900.0])
def test_section_mean_flux_density_against_quadrature(drive: float) -> None:
    total, _ = quad(
        lambda r: float(bias.flux_density(drive / (2 * np.pi * r), 75.0, 4090.0, 1.5)), INNER / 2, OUTER / 2
    )
    found = choke.section_mean_flux_density(drive, OUTER, INNER, 75.0, 4090.0, 1.5)
    assert found == pytest.approx(total / ((OUTER - INNER) / 2), rel=1e-9)
    at_bore = bias.flux_density(drive / (np.pi * INNER), 75.0, 4090.0, 1.5)
    at_outside = bias.flux_density(drive / (np.pi * OUTER), 75.0, 4090.0, 1.5)
    assert at_outside < found < at_bore


def test_flux_linkage_of_ring_and_of_section_agree() -> None:
    """N times the flux is the integral of the incremental inductance (derived)."""
    turns, current = 50, 4.0
    factor = ring.inductance_factor(75.0, ring.core_constant_c1(OUTER, INNER, HEIGHT)) * turns**2
    linkage, _ = quad(
        lambda i: factor * float(bias.ring_inductance_fraction(turns * i, OUTER, INNER, 4090.0, 1.5)),
        0.0,
        current,
    )
    density = choke.section_mean_flux_density(turns * current, OUTER, INNER, 75.0, 4090.0, 1.5)
    assert turns * density * ring.geometric_area(OUTER, INNER, HEIGHT) == pytest.approx(linkage, rel=1e-7)


@given(st.floats(0.1, 30.0), st.floats(0.5, 50.0), exponents)
def test_energy_and_linkage_against_quadrature(current: float, half: float, exponent: float) -> None:
    def inductance(i: float) -> float:
        return float(choke.inductance_at_current(200e-6, i, half, exponent))

    linkage, _ = quad(inductance, 0.0, current, epsrel=1e-11)
    energy, _ = quad(lambda i: i * inductance(i), 0.0, current, epsrel=1e-11)
    assert choke.flux_linkage(200e-6, current, half, exponent) == pytest.approx(linkage, rel=1e-7)
    assert choke.stored_energy(200e-6, current, half, exponent) == pytest.approx(energy, rel=1e-7)
    assert energy < linkage * current


@given(ratios.filter(lambda r: r < 2.2), st.floats(1.1, 1.8), st.integers(5, 200))
def test_ring_bias_law_follows_the_integral(ratio: float, exponent: float, turns: int) -> None:
    half, steepness = bias.ring_bias_law(turns, INNER * ratio, INNER, 4090.0, exponent)
    current = np.linspace(0.0, 3.0 * half, 200)
    exact = bias.ring_inductance_fraction(turns * current, INNER * ratio, INNER, 4090.0, exponent)
    assert np.max(np.abs(choke.inductance_at_current(1.0, current, half, steepness) - exact)) < 2e-3


def test_ring_bias_law_of_an_array() -> None:
    turns = np.array([[40], [60]])
    outer = np.array([20e-3, OUTER, 33e-3])
    half, steepness = bias.ring_bias_law(turns, outer, 12e-3, 4090.0, 1.5)
    assert half.shape == (2, 3)
    one = bias.ring_bias_law(60, OUTER, 12e-3, 4090.0, 1.5)
    assert half[1, 1] == pytest.approx(one[0], rel=1e-12)
    assert steepness[1] == pytest.approx(one[1], rel=1e-12)


@given(st.floats(0.5, 20.0), exponents)
def test_bias_fit_recovers_a_noisy_law(half: float, exponent: float) -> None:
    current = np.geomspace(0.2, 3.0, 8) * half
    clean = 1.0 / (1.0 + (current / half) ** exponent)
    noise = 1.0 + 1e-3 * np.cos(np.arange(8.0) * 2.0)
    found, steepness = bias.fit_bias_law(current, clean * noise)
    assert found == pytest.approx(half, rel=0.02)
    assert steepness == pytest.approx(exponent, rel=0.03)


@given(st.floats(10.0, 2e4), st.floats(0.05, 0.95), exponents)
def test_half_field_from_a_point(field: float, share: float, exponent: float) -> None:
    half = bias.half_field_from_point(field, share, exponent)
    assert bias.permeability_fraction(field, half, exponent) == pytest.approx(share)


@given(st.floats(0.0, 5000.0), ratios)
def test_bias_spread_grows_from_zero(drive: float, ratio: float) -> None:
    spread = bias.fraction_spread(drive, INNER * ratio, INNER, 4090.0, 1.5)
    whole = bias.ring_inductance_fraction(drive, INNER * ratio, INNER, 4090.0, 1.5)
    assert 0.0 <= spread < 0.6
    assert 0.0 < whole <= 1.0


@given(st.floats(20e-6, 2e-3), st.floats(0.0, 8.0), st.floats(1.1, 1.9))
def test_turns_for_biased_inductance(inductance: float, current: float, exponent: float) -> None:
    turns = choke.turns_for_biased_inductance(inductance, 90e-9, current, OUTER, INNER, 4090.0, exponent)
    if np.isnan(turns):
        most = 1000.0 * ring.turns_for_inductance(inductance, 90e-9)
        share = bias.ring_inductance_fraction(most * current, OUTER, INNER, 4090.0, exponent)
        assert 90e-9 * most**2 * share < inductance
    else:
        share = bias.ring_inductance_fraction(turns * current, OUTER, INNER, 4090.0, exponent)
        assert 90e-9 * turns**2 * share == pytest.approx(inductance, rel=1e-9)


def test_bought_choke_keeps_seventy_percent() -> None:
    half = choke.bias_current_of_bought_choke(5.0)
    assert choke.inductance_at_current(1.0, 5.0, half, 1.5) == pytest.approx(0.7)
    assert choke.inductance_at_current(1.0, 2.0, half, 1.5) == pytest.approx(
        1.0 / (1.0 + 0.4286 * (2.0 / 5.0) ** 1.5), rel=1e-4
    )
    assert choke.inductance_at_current(1.0, 1e6, np.inf, 1.5) == 1.0


def test_saturation_margin_without_flux_is_infinite() -> None:
    assert choke.saturation_margin(np.array([0.0, 0.5]), 1.0).tolist() == [np.inf, 2.0]


@given(
    st.floats(2.0, 3000.0),
    st.tuples(*[st.floats(-1.0, 1.0)] * 4),
    inner_diameters,
    ratios,
)
def test_bounds_contain_every_reading_within_tolerance(
    mu: float, errors: tuple[float, ...], d: float, ratio: float
) -> None:
    outer, height, turns = d * ratio, 0.7 * d, 15
    inductance = ring.inductance_factor(mu, ring.core_constant_c1(outer, d, height)) * turns**2
    read = [x / (1.0 + 0.01 * e) for x, e in zip((outer, d, height), errors[:3], strict=True)]
    meter = inductance / (1.0 + 0.03 * errors[3])
    low, high = unknown_core.permeability_bounds(meter, turns, *read, 0.01, 0.03)
    assert low * (1 - 1e-9) <= mu <= high * (1 + 1e-9)


def test_bounds_of_a_wall_thinner_than_its_tolerance() -> None:
    _, high = unknown_core.permeability_bounds(1e-6, 10, 10.1e-3, 10e-3, 5e-3)
    assert np.isinf(high)


def test_propagated_uncertainty_against_sampling() -> None:
    """200 000 readings with uniform errors, fixed seed (derived)."""
    rng = np.random.default_rng(20)
    outer, inner, height = (x * (1 + 0.01 * rng.uniform(-1, 1, 200_000)) for x in (OUTER, INNER, HEIGHT))
    meter = 40e-6 * (1 + 0.03 * rng.uniform(-1, 1, 200_000))
    sample = unknown_core.permeability_from_test_winding(meter, 20, outer, inner, height)
    expected = unknown_core.permeability_relative_uncertainty(OUTER, INNER)
    assert np.std(sample) / np.mean(sample) == pytest.approx(expected, rel=0.01)


def test_candidates_share_the_probability() -> None:
    candidates = np.array([8.5, 10.0, 35.0, 75.0])
    weights = unknown_core.candidate_probabilities(unknown_core.log_likelihood(72.0, candidates, 0.12))
    assert weights.sum() == pytest.approx(1.0)
    assert np.argmax(weights) == 3
    density = np.exp(unknown_core.log_likelihood(np.exp(np.linspace(2, 6, 4001)), 75.0, 0.12))
    assert np.trapezoid(density, np.linspace(2, 6, 4001)) == pytest.approx(1.0, rel=1e-6)
