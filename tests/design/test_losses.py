"""Losses added on to the loop's: formulas at single points, and the whole budget over all regimes."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from buckdesign.design.losses import (
    LOSSES,
    choke_ac_rms,
    copper_ac_loss,
    core_loss,
    has_cycles,
    input_capacitor_loss,
    input_ripple_rms,
    junction_capacitance_loss,
    loss_data,
    rectifier_leakage_loss,
    winding_ac_factor,
)
from buckdesign.design.operating import operate_rows
from buckdesign.loop.results import OUTPUTS, SteadyStates
from buckdesign.physics.core_loss import three_term_loss_triangular
from buckdesign.physics.wire import effective_frequency, skin_depth, winding_factor

from .operating_designs import BOUGHT, operated_bench, random_rows, resolved_bench


def made(**columns: Any) -> SteadyStates:
    """Averages of the loop as given, everything else zero."""
    count = max(np.size(values) for values in columns.values())
    values = np.zeros((count, len(OUTPUTS)))
    for name, one in columns.items():
        values[:, OUTPUTS.index(name)] = one
    return SteadyStates(values=values, ends=np.zeros((count, 6)))


def data(changes: Any = None) -> Any:
    return loss_data([resolved_bench(changes)])


def test_the_losses_are_the_documented_ones() -> None:
    # names: the agreed keys of `simulate`
    assert set(LOSSES) == {
        "transistor_conduction", "transistor_switching", "transistor_leakage", "base", "drive_resistor",
        "regulator", "rectifier", "rectifier_recovery", "rectifier_leakage", "choke_copper",
        "choke_copper_ac", "choke_core", "output_capacitor", "input_capacitor", "divider",
    }  # fmt: skip
    assert len(LOSSES) == 15


@pytest.fixture(scope="module")
def everything() -> Any:
    """Random supplies in all regimes."""
    return operate_rows(random_rows(240, 7), resolved_bench())


def test_random_supplies_reach_all_regimes(everything: Any) -> None:
    assert {"linear", "overload", "continuous", "discontinuous"} <= set(everything.loop.regimes())


def test_losses_sum_to_input_minus_output(everything: Any) -> None:
    # the loop's own input power, which the budget is not made of; what an irregular window leaves stored is
    # in neither (derived: energy balance)
    loop = everything.loop
    losses = everything.balance.losses
    added = sum(
        losses[name]
        for name in (
            "choke_core", "choke_copper_ac", "input_capacitor", "rectifier_leakage", "transistor_leakage"
        )
    )  # fmt: skip
    added = added + junction_capacitance_loss(loop, everything.data)
    missing = loop.column("input_w") + added - everything.output_power - everything.total_loss
    relative = np.abs(missing) / np.maximum(loop.column("input_w"), 1e-6)
    steady = (loop.column("period_cycles") >= 0.0) & (loop.column("settled") > 0.0)
    assert steady.mean() > 0.8
    assert relative[steady].max() < 1e-6


def test_every_loss_is_finite_and_not_negative(everything: Any) -> None:
    for name in LOSSES:
        loss = everything.balance.losses[name]
        assert np.isfinite(loss).all(), name
        assert (loss >= -1e-6 * np.maximum(everything.input_power, 1.0)).all(), name


def test_efficiency_is_output_over_input(everything: Any) -> None:
    assert ((everything.efficiency >= 0.0) & (everything.efficiency < 1.0)).all()
    idle = everything.parameter("load_current") == 0.0
    assert idle.any()
    assert (everything.efficiency[idle] == 0.0).all()


def test_without_cycles_nothing_is_lost_by_switching(everything: Any) -> None:
    still = ~has_cycles(everything.loop)
    assert still.sum() > 10
    for name in ("choke_core", "choke_copper_ac", "rectifier_recovery"):
        assert (everything.balance.losses[name][still] == 0.0).all(), name


def test_junction_capacitance_costs_half_c_v_squared_a_turn() -> None:
    # derived: 1/2 C V^2 f, two pieces in parallel
    loop = made(frequency_hz=10e3, commutations_hz=10e3, reverse_max_v=20.0)
    found = junction_capacitance_loss(loop, data({"rectifier.capacitance": "60 pF"}))[0]
    assert found == pytest.approx(0.5 * 2 * 60e-12 * 400.0 * 10e3, rel=1e-12)


def test_core_loss_is_that_of_the_triangle() -> None:
    loop = made(frequency_hz=12e3, duty=0.3, choke_flux_swing_vs=300e-6)
    made_of = data()
    winding = resolved_bench().choke.winding
    assert winding is not None
    peak = 300e-6 / (47 * winding.effective_area) / 2.0
    density = three_term_loss_triangular(12e3, peak, 0.3, *winding.material.loss_coefficients)
    assert core_loss(loop, made_of)[0] == pytest.approx(density * winding.effective_volume, rel=1e-12)


def test_core_loss_rests_while_the_choke_is_empty() -> None:
    # derived: half of the time at rest is half of the loss of the same triangle without rest
    resting = made(frequency_hz=10e3, duty=0.15, choke_flux_swing_vs=200e-6, idle_fraction=0.5)
    always = made(frequency_hz=20e3, duty=0.30, choke_flux_swing_vs=200e-6)
    assert core_loss(resting, data())[0] == pytest.approx(0.5 * core_loss(always, data())[0], rel=1e-12)


def test_a_bought_choke_adds_nothing() -> None:
    loop = made(
        frequency_hz=12e3,
        duty=0.3,
        choke_flux_swing_vs=3e-4,
        choke_rms_a=3.1,
        choke_mean_a=3.0,
        choke_slope_rms=1e5,
    )
    assert core_loss(loop, data(BOUGHT))[0] == 0.0
    assert winding_ac_factor(loop, data(BOUGHT), np.array([25.0]))[0] == 1.0
    assert np.isnan(data(BOUGHT).choke_volume[0])


def triangle(mean: float, ripple: float, duty: float, frequency: float) -> SteadyStates:
    """Choke current of a triangle (derived: rms of value and slope)."""
    rms = np.sqrt(mean**2 + ripple**2 / 12.0)
    slope = ripple * frequency * np.sqrt(1.0 / duty + 1.0 / (1.0 - duty))
    return made(frequency_hz=frequency, choke_mean_a=mean, choke_rms_a=rms, choke_slope_rms=slope)


def test_ac_copper_is_taken_at_the_triangles_effective_frequency() -> None:
    loop = triangle(3.0, 1.2, 0.4, 30e3)
    found = winding_ac_factor(loop, data(), np.array([60.0]))[0]
    depth = skin_depth(effective_frequency(30e3, 0.4), 60.0)
    assert found == pytest.approx(
        winding_factor(1.0e-3, depth, data().layers[0], data().porosity[0]), rel=1e-9
    )
    assert found > 1.2


def test_ac_copper_loss_is_that_of_the_ripple_only() -> None:
    # derived: R dI^2/12 (F - 1), whatever the mean current
    factor, resistance = np.array([1.5]), np.array([0.05])
    for mean in (1.0, 5.0):
        loop = triangle(mean, 1.2, 0.4, 30e3)
        assert choke_ac_rms(loop)[0] == pytest.approx(1.2 / np.sqrt(12.0), rel=1e-9)
        assert copper_ac_loss(loop, resistance, factor)[0] == pytest.approx(0.05 * 0.12 * 0.5, rel=1e-9)


def test_input_capacitor_carries_the_alternating_part() -> None:
    # derived: a rectangle of 3 A and duty 0.4 has a ripple of 3 sqrt(0.4 0.6)
    loop = made(input_mean_a=1.2, input_rms_a=3.0 * np.sqrt(0.4))
    assert input_ripple_rms(loop)[0] == pytest.approx(3.0 * np.sqrt(0.24), rel=1e-12)
    esr = resolved_bench().input_capacitor.esr
    assert input_capacitor_loss(loop, data().input_esr)[0] == pytest.approx(9.0 * 0.24 * esr, rel=1e-12)
    without = loss_data([replace(resolved_bench(), input_capacitor=None)])
    assert np.isnan(without.input_esr[0]) and input_capacitor_loss(loop, without.input_esr)[0] == 0.0


def test_leakage_grows_by_its_exponent() -> None:
    # common practice: a PN leakage doubles every 10 K
    loop = made(reverse_mean_v=15.0, blocking_fraction=0.8)
    cool, warm = (rectifier_leakage_loss(loop, data(), np.array([t]))[0] for t in (50.0, 60.0))
    coefficient = resolved_bench().rectifier.leakage_coefficient
    assert warm / cool == pytest.approx(np.exp(10.0 * coefficient), rel=1e-12)
    assert warm / cool == pytest.approx(2.0, rel=1e-3)


def test_recovery_is_taken_out_of_the_switching_loss() -> None:
    with_charge = operated_bench({"rectifier.recovery_charge": "200 nC", "rectifier.capacitance": "0 F"})
    losses, loop = with_charge.balance.losses, with_charge.loop
    assert losses["rectifier_recovery"][0] == pytest.approx(loop.column("recovery_w")[0], rel=1e-12)
    assert losses["rectifier_recovery"][0] > 1e-3
    both = losses["rectifier_recovery"][0] + losses["transistor_switching"][0]
    assert both == pytest.approx(loop.column("transistor_switching_w")[0], rel=1e-12)
