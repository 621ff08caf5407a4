"""Wire and winding: mpmath for the round wire, limits of the layers, geometry counted one by one."""

from __future__ import annotations

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.physics import winding, wire

OUTER, INNER, HEIGHT = 26.9e-3, 14.5e-3, 11.1e-3


def exact_round_wire(ratio: float) -> float:
    """``Re(z J0/(2 J1))`` with 40 digits, `ratio` the radius in skin depths."""
    with mpmath.workdps(40):
        z = mpmath.mpc(1, -1) * mpmath.mpf(ratio)
        return float(mpmath.re(z * mpmath.besselj(0, z) / (2 * mpmath.besselj(1, z))))


@pytest.mark.parametrize("ratio", [1e-6, 0.01, 0.3, 1.0, 2.5, 7.0, 30.0, 200.0, 1500.0])
def test_round_wire_against_mpmath(ratio: float) -> None:
    assert wire.round_wire_factor(2.0 * ratio, 1.0) == pytest.approx(exact_round_wire(ratio), rel=1e-11)


def test_round_wire_limits() -> None:
    assert wire.round_wire_factor(0.0, 1.0) == pytest.approx(1.0, rel=1e-12)
    thick = 1e5
    assert wire.round_wire_factor(thick, 1.0) == pytest.approx(thick / 4.0 + 0.25, rel=1e-6)
    thin = np.linspace(0.01, 2.2, 50)
    series = wire.round_wire_factor_series(thin, 1.0)
    assert np.all(np.abs(wire.round_wire_factor(thin, 1.0) / series - 1.0) < 0.01)


def exact_layer_factor(x: float, layers: int) -> float:
    with mpmath.workdps(40):
        x = mpmath.mpf(x)
        skin = (mpmath.sinh(2 * x) + mpmath.sin(2 * x)) / (mpmath.cosh(2 * x) - mpmath.cos(2 * x))
        near = (mpmath.sinh(x) - mpmath.sin(x)) / (mpmath.cosh(x) + mpmath.cos(x))
        return float(x * (skin + mpmath.mpf(2) / 3 * (layers**2 - 1) * near))


@pytest.mark.parametrize("x", [1e-4, 0.01, 0.3, 1.0, 3.0, 20.0, 800.0])
@pytest.mark.parametrize("layers", [1, 2, 5])
def test_layer_factor_against_mpmath(x: float, layers: int) -> None:
    assert wire.layer_factor(x, layers) == pytest.approx(exact_layer_factor(x, layers), rel=1e-10)


def test_layer_factor_limits() -> None:
    assert wire.layer_factor(0.0, 7) == pytest.approx(1.0)
    for layers in (1, 2, 4):
        small = 0.05
        expected = 1.0 + (5.0 * layers**2 - 1.0) * small**4 / 45.0
        assert wire.layer_factor(small, layers) == pytest.approx(expected, rel=1e-7)


@given(st.floats(0.05e-3, 3e-3), st.floats(0.05e-3, 3e-3), st.integers(1, 6), st.floats(0.05, 1.0))
def test_winding_factor_is_never_below_either_bound(d: float, depth: float, m: int, eta: float) -> None:
    factor = wire.winding_factor(d, depth, m, eta)
    assert factor >= wire.round_wire_factor(d, depth) >= 1.0 - 1e-12
    assert factor >= wire.layer_factor(wire.foil_height(d, depth, eta), m) * (1 - 1e-12)


@given(st.floats(0.05, 0.95), st.floats(0.01, 5.0))
def test_harmonics_have_the_energy_of_the_triangle(duty: float, ripple: float) -> None:
    squares = wire.triangle_harmonics(ripple, duty, 4000) ** 2
    assert squares.sum() == pytest.approx(ripple**2 / 12.0, rel=1e-6)


def test_harmonics_of_a_sampled_triangle() -> None:
    duty, count = 0.3, 6
    t = np.arange(200_000) / 200_000
    current = np.where(t < duty, t / duty - 0.5, 0.5 - (t - duty) / (1 - duty))
    spectrum = np.abs(np.fft.rfft(current))[1 : count + 1] / t.size * math.sqrt(2.0)
    assert wire.triangle_harmonics(1.0, duty, count) == pytest.approx(spectrum, rel=1e-6)


def test_ripple_loss_counts_the_rest_of_the_ripple_once() -> None:
    factors = np.array([1.2, 1.8, 2.5])
    loss = wire.ripple_copper_loss(0.1, 0.6, 0.4, factors)
    squares = wire.triangle_harmonics(0.6, 0.4, 3) ** 2
    rest = 0.6**2 / 12.0 - squares.sum()
    assert loss == pytest.approx(0.1 * ((squares * factors).sum() + 2.5 * rest))
    table = wire.ripple_copper_loss(0.1, np.array([0.3, 0.6]), 0.4, np.ones((2, 5)))
    assert table == pytest.approx(0.1 * np.array([0.3, 0.6]) ** 2 / 12.0)


@given(st.floats(0.1, 0.9))
def test_effective_frequency_is_the_rms_slope(duty: float) -> None:
    slopes = 1.0 / duty + 1.0 / (1.0 - duty)
    expected = math.sqrt(slopes * 12.0) / (2.0 * math.pi)
    assert wire.effective_frequency(1.0, duty) == pytest.approx(expected)


def test_effective_frequency_replaces_the_sum_for_thin_wire() -> None:
    duty, frequency = 0.5, 30e3
    order = np.arange(1, 20)
    factors = wire.round_wire_factor(0.5e-3, wire.skin_depth(order * frequency, 20.0))
    exact = wire.ripple_copper_loss(1.0, 1.0, duty, factors)
    depth = wire.skin_depth(wire.effective_frequency(frequency, duty), 20.0)
    assert wire.round_wire_factor(0.5e-3, depth) / 12.0 == pytest.approx(exact, rel=2e-3)


def test_six_gauges_are_nearly_half_the_diameter() -> None:
    """ASTM B258: 2.0050 for six gauges, 1.1229322 for one (looked up)."""
    assert wire.awg_diameter(12) / wire.awg_diameter(18) == pytest.approx(2.0050, abs=5e-5)
    assert wire.awg_diameter(17) / wire.awg_diameter(18) == pytest.approx(1.1229322, abs=5e-8)
    assert wire.awg_diameter(36) == pytest.approx(0.127e-3)


def test_parallel_strands_divide_the_resistance() -> None:
    one = wire.dc_resistance(2.0, 0.5e-3, 1, 60.0)
    assert wire.dc_resistance(2.0, 0.5e-3, 3, 60.0) == pytest.approx(one / 3.0)


@given(st.floats(0.1e-3, 3e-3), st.floats(5e-3, 60e-3))
def test_one_layer_really_fits_in_the_bore(d: float, bore: float) -> None:
    count = math.floor(winding.layer_capacity(bore, d))
    centre = (bore - d) / 2.0
    if count >= 2:
        assert 2.0 * centre * math.sin(math.pi / count) >= d * (1 - 1e-9)
        assert 2.0 * centre * math.sin(math.pi / (count + 1)) < d
    else:
        assert bore < 2.0 * d * (1 + 1e-12)


def test_wires_thicker_than_the_bore() -> None:
    assert winding.layer_capacity(1.0, np.array([0.5, 0.6, 1.0, 1.1])).tolist() == [2.0, 1.0, 1.0, 0.0]
    laid = winding.wind(10e-3, 4e-3, 5e-3, 5e-3, 3)
    assert not laid.fits
    assert laid.capacity == 0.0
    assert np.isnan(laid.mean_turn)


def counted(d: float, wires: int) -> tuple[int, int, float]:
    """Layers, capacity and length of the winding, wire by wire."""
    rooms = []
    bore = INNER
    while bore > d:
        rooms.append(math.floor(winding.layer_capacity(bore, d) + 1e-9))
        bore -= 2 * d
    outside, layer, length, placed = [], 1, 0.0, 0
    while sum(outside) < wires:
        circle = OUTER + d * (2 * layer - 1)
        outside.append(math.floor(math.pi / math.asin(d / circle) + 1e-9))
        layer += 1
    layers = 0
    for index, room in enumerate(rooms):
        now = min(room, wires - placed)
        if now <= 0:
            break
        layers += 1
        at = next(i for i, _ in enumerate(outside) if placed <= sum(outside[: i + 1]))
        length += now * winding.layer_turn_length(OUTER, INNER, HEIGHT, d * (index + 0.5), d * (at + 0.5))
        placed += now
    return layers, sum(rooms), length / placed


@pytest.mark.parametrize("d", [0.4e-3, 0.855e-3, 1.062e-3, 1.7e-3])
@pytest.mark.parametrize("wires", [1, 30, 39, 40, 90, 140])
def test_winding_against_counting(d: float, wires: int) -> None:
    layers, capacity, mean = counted(d, wires)
    laid = winding.wind(OUTER, INNER, HEIGHT, d, wires)
    assert laid.capacity == capacity
    assert bool(laid.fits) == (wires <= capacity)
    assert laid.layers == layers
    assert laid.mean_turn == pytest.approx(mean, rel=1e-12)


def test_winding_of_an_array_is_that_of_its_elements() -> None:
    wires = np.arange(10, 160, 15)
    d = np.array([[0.6e-3], [1.062e-3]])
    table = winding.wind(OUTER, INNER, HEIGHT, d, wires)
    assert table.layers.shape == (2, 10)
    for row, column in ((0, 0), (1, 4), (1, 9), (0, 9)):
        one = winding.wind(OUTER, INNER, HEIGHT, float(d[row, 0]), int(wires[column]))
        assert all(
            np.asarray(a)[row, column] == pytest.approx(b, nan_ok=True)
            for a, b in zip((np.broadcast_to(x, (2, 10)) for x in table), one, strict=True)
        )


@given(st.integers(1, 120))
def test_build_up_lengthens_the_mean_turn(wires: int) -> None:
    bare = winding.layer_turn_length(OUTER, INNER, HEIGHT, 0.0, 0.0)
    assert bare == pytest.approx(2 * HEIGHT + OUTER - INNER)
    laid = winding.wind(OUTER, INNER, HEIGHT, 1.062e-3, wires)
    more = winding.wind(OUTER, INNER, HEIGHT, 1.062e-3, wires + 1)
    assert bare < laid.mean_turn <= more.mean_turn * (1 + 1e-12)
    assert laid.outside_layers <= laid.layers


def test_copper_and_dimensions() -> None:
    assert winding.copper_mass(1.0, 1e-3, 2) == pytest.approx(2 * 8890.0 * math.pi / 4 * 1e-6)
    outer, bore, height = winding.wound_dimensions(OUTER, INNER, HEIGHT, 2e-3, 5, 3)
    assert outer == pytest.approx(OUTER + 12e-3)
    assert bore == 0.0
    assert height == pytest.approx(HEIGHT + 20e-3)
    assert winding.bore_porosity(39, 1, 1.0e-3, INNER, 1.062e-3) == pytest.approx(
        39 * 1.0e-3 / (math.pi * (INNER - 1.062e-3))
    )
    cut = winding.wire_length(48, 40e-3, lead=winding.CUT_LEAD_LENGTH)
    assert cut - winding.wire_length(48, 40e-3) == pytest.approx(
        2 * (winding.CUT_LEAD_LENGTH - winding.LEAD_LENGTH)
    )
