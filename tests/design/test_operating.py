"""Operating points: what is asked, what comes out, and the trade's usual example."""

from __future__ import annotations

import math
import subprocess
import sys
from typing import Any

import numpy as np
import pytest

import buckdesign
from buckdesign.design.operating import (
    operate,
    operate_rows,
    operate_table,
    points_of,
    rows_at,
    simulate,
)
from buckdesign.errors import InputError
from buckdesign.loop.results import DETAILED, Start
from buckdesign.output.text import json_value
from tests.loop.population import usual

from .operating_designs import BOUGHT, bench, random_rows, resolved_bench

KEYS = {
    "regime", "period_cycles", "cycle_spread", "frequency_hz", "duty", "start_margin", "active_fraction",
    "output_voltage_v", "ripple_v", "choke_current_a", "base_drive_a", "input_current_a",
    "capacitor_current_a", "input_power_w", "output_power_w", "efficiency", "losses_w", "total_loss_w",
    "energy_residual", "junction_c", "choke_c", "choke_volume_cm3", "checks", "warnings", "transient",
}  # fmt: skip
"""The agreed keys of `simulate`."""

CLASSIC = {
    "winding": {},
    "bought": BOUGHT,
    "larger ring": {"choke.core": "R 33.0/19.8/11.1", "choke.turns": 50},
    "less drive": {"network.rdrive": "10 ohm", "network.rbe": "33 ohm"},
    "other transistor": {"transistor.part": "2N5875"},
    "other rectifiers": {"rectifier.part": "1N5807"},
}
"""The usual example with sensible parts of several kinds (common practice, no source)."""


@pytest.mark.parametrize("changes", CLASSIC.values(), ids=CLASSIC.keys())
def test_the_usual_example(changes: Any) -> None:
    # common practice, no source: about 88 %, so 85-91 %, at 4-20 kHz
    point = simulate(bench(changes)).point
    assert point.regime == "continuous"
    assert 0.85 <= point.efficiency <= 0.91
    assert 4e3 <= point.frequency_hz <= 20e3


@pytest.mark.parametrize(("r1", "least"), [("240 ohm", 1.25 / 240.0), ("470 ohm", 3.5e-3)])
def test_no_load_input_current(r1: str, least: float) -> None:
    # common practice: the larger of I_q and V_ref/R_1 plus leakage; 5-11 mA with the usual divider
    r2 = "2.7 kohm" if r1 == "240 ohm" else "5.3 kohm"
    point = simulate(bench({"network.r1": r1, "network.r2": r2}), load_current=0.0).point
    assert point.regime == "linear"
    assert point.frequency_hz == 0.0 and point.period_cycles == 0
    assert point.efficiency == 0.0
    assert least <= point.input_current_a["mean"] <= 1.05 * least
    if r1 == "240 ohm":
        assert 5e-3 <= point.input_current_a["mean"] <= 11e-3


def test_every_key_is_there_and_json_has_no_holes() -> None:
    made = simulate(bench()).to_dict()
    assert set(made) >= KEYS
    text = json_value(made)
    assert text["choke_current_a"].keys() == {"mean", "min", "max", "rms"}
    assert text["base_drive_a"].keys() == {"max"}
    assert text["input_current_a"].keys() == {"mean", "rms"}
    assert text["capacitor_current_a"].keys() == {"input", "output"}
    assert text["junction_c"].keys() == {"transistor", "regulator", "rectifier"}
    assert len(text["losses_w"]) == 15
    for check in text["checks"]:
        assert check.keys() >= {"name", "value", "limit", "margin", "holds", "where", "note"}
    assert text["transient"] is None


@pytest.mark.parametrize(
    ("where", "regime"),
    [
        ({"load_current": 0.0}, "linear"),
        ({"load_current": 0.05}, "discontinuous"),
        ({"load_current": 3.0}, "continuous"),
        ({"load_resistance": 0.05}, "overload"),
        ({"load_current": 40.0}, "overload"),
        ({"supply": 15.0}, "dropout"),
    ],
)
def test_regimes(where: dict[str, float], regime: str) -> None:
    point = simulate(bench(), **where).point
    assert point.regime == regime
    losses = sum(point.losses_w.values())
    assert point.input_power_w - point.output_power_w == pytest.approx(losses, rel=1e-6)
    assert point.energy_residual < 1e-6
    assert "null" not in str(json_value(point.losses_w))


def test_points_take_what_is_given_and_the_rest_from_the_design() -> None:
    resolved = resolved_bench({"output.resistance": "10 ohm", "thermal.ambient": "30 degC"})
    own = points_of(resolved)
    assert (own.supply[0], own.load_current[0], own.load_resistance[0], own.ambient_c[0]) == (
        20.0,
        3.0,
        10.0,
        30.0,
    )
    some = points_of(resolved, load_current=1.0)
    assert some.load_current[0] == 1.0 and math.isinf(some.load_resistance[0])
    other = points_of(resolved, load_resistance=5.0)
    assert other.load_current[0] == 0.0 and other.load_resistance[0] == 5.0
    grid = points_of(resolved, supply=[[18.0], [22.0]], load_current=[1.0, 2.0, 3.0])
    assert len(grid) == 6
    assert grid.supply.tolist() == [18.0] * 3 + [22.0] * 3


@pytest.mark.parametrize(
    ("given", "what"),
    [
        ({"supply": 0.0}, "supply"),
        ({"supply": math.nan}, "supply"),
        ({"load_current": -1.0}, "load current"),
        ({"load_resistance": 0.0}, "load resistance"),
        ({"load_current": math.inf}, "load current"),
        ({"ambient_c": -300.0}, "ambient"),
    ],
)
def test_points_that_cannot_be(given: dict[str, float], what: str) -> None:
    with pytest.raises(InputError, match=what):
        points_of(resolved_bench(), **given)


def test_a_resistive_load_draws_the_current_of_its_voltage() -> None:
    current = simulate(bench(), load_current=3.0).point
    ohms = current.output_voltage_v / 3.0
    resistive = simulate(bench(), load_resistance=ohms).point
    assert resistive.load_ohm == ohms and resistive.load_a == 0.0
    assert resistive.output_power_w == pytest.approx(current.output_power_w, rel=1e-2)
    assert resistive.frequency_hz == pytest.approx(current.frequency_hz, rel=3e-2)


def test_table_points_and_single_simulation_agree() -> None:
    resolved = resolved_bench()
    where = points_of(resolved, load_current=[0.5, 3.0])
    table = operate_table(resolved, where)
    points = operate(resolved, where)
    single = simulate(bench(), load_current=3.0).point
    for key, value in (
        ("frequency_hz", single.frequency_hz),
        ("losses_w.choke_core", single.losses_w["choke_core"]),
        ("junction_c.transistor", single.junction_c["transistor"]),
        ("choke_current_a.max", single.choke_current_a["max"]),
    ):
        assert table[key][1] == pytest.approx(value, rel=2e-3), key
    assert points[1].frequency_hz == table["frequency_hz"][1]
    assert points[0].load_a == 0.5


def test_rows_of_several_designs_are_each_their_own() -> None:
    designs = [resolved_bench(), resolved_bench(BOUGHT), resolved_bench({"thermal.heatsink": "8 K/W"})]
    rows = np.concatenate([rows_at(one, points_of(one)) for one in designs])
    together = operate_rows(rows, designs)
    for index, one in enumerate(designs):
        alone = operate_rows(rows[index], one)
        mine, own = together.columns(), alone.columns()
        for key in own:
            number = isinstance(own[key][0], float)
            assert np.array_equal(mine[key][index], own[key][0], equal_nan=number), key
    with pytest.raises(ValueError, match="2 designs for 3 rows"):
        operate_rows(rows, designs[:2])


def test_columns_are_flat_and_of_one_length() -> None:
    columns = operate_rows(random_rows(20, 3), resolved_bench()).columns()
    assert all(len(values) == 20 for values in columns.values())
    assert {"choke_current_a.rms", "losses_w.divider", "junction_c.regulator", "regime"} <= set(columns)


def test_irregular_periods_are_unknown_in_the_table() -> None:
    found = operate_rows(random_rows(240, 7), resolved_bench(), electrical_only=True)
    irregular = found.loop.column("period_cycles") < 0.0
    assert irregular.any()
    assert np.isnan(np.asarray(found.columns()["period_cycles"])[irregular]).all()


def test_start_from_rest() -> None:
    found = simulate(bench(), from_rest=True)
    transient = found.point.transient
    assert transient is not None and found.start_waveforms is not None
    steady = simulate(bench()).point
    assert found.point.frequency_hz == pytest.approx(steady.frequency_hz, rel=1e-6)
    time, output = (found.start_waveforms.column(name) for name in ("time_s", "output_voltage_v"))
    assert output[0] == pytest.approx(0.0, abs=0.3)
    assert transient.settling_s is not None and 1e-4 < transient.settling_s < 20e-3
    late = output[time > transient.settling_s]
    assert np.abs(late - steady.output_voltage_v).max() < 0.01 * 15.5 + steady.ripple_v
    assert transient.peak_choke_a > steady.choke_current_a["max"]
    assert transient.peak_output_v >= output.max()
    assert transient.lowest_output_v < steady.output_voltage_v
    # derived: the length of a pulse of that power and energy
    assert transient.stress_s == pytest.approx(transient.transistor_energy_j / transient.transistor_peak_w)
    assert transient.safe_area_basis == "direct current" and transient.safe_area_margin is not None


def test_start_energy_is_the_integral_of_the_power() -> None:
    # derived: energy of the transistor against trapezia over the samples
    found = simulate(bench(), from_rest=True, electrical_only=True)
    transient, recorded = found.point.transient, found.start_waveforms
    assert transient is not None and recorded is not None
    time = recorded.column("time_s")
    power = (20.0 - recorded.column("switch_node_v")) * recorded.column("collector_current_a")
    power = power[time <= transient.settling_s]
    energy = np.trapezoid(power, time[: len(power)])
    assert transient.transistor_energy_j == pytest.approx(energy, rel=0.02)
    assert transient.transistor_peak_w >= power.max()


def test_overload_from_rest_never_settles_at_the_set_voltage() -> None:
    found = simulate(bench(), load_resistance=0.1, from_rest=True).point
    assert found.regime == "overload"
    assert found.transient is not None
    assert found.transient.peak_output_v < 7.5


def test_a_loop_that_does_not_start_by_itself_depends_on_its_start() -> None:
    changes = {"network.rh": "1 Gohm", "regulator.output_inductance": "1 uH"}
    resolved = resolved_bench(changes)
    running, burning = (
        operate(resolved, points_of(resolved), start=start, effort=DETAILED)[0]
        for start in (Start.OPERATING, Start.REST)
    )
    assert running.start_margin is not None and running.start_margin < 1.0
    assert running.regime == "continuous" and burning.regime == "stuck"
    assert any("does not start to oscillate by itself" in text for text in running.warnings)
    assert any("regulates without oscillating" in text for text in burning.warnings)
    assert burning.losses_w["transistor_switching"] > 3.0 * running.losses_w["transistor_switching"]


def test_the_public_names_work() -> None:
    frame = buckdesign.simulate_many(bench(), load_current=[0.0, 1.0, 3.0], electrical_only=True)
    assert list(frame["regime"]) == ["linear", "continuous", "continuous"]
    assert frame["efficiency"].iloc[2] == pytest.approx(
        buckdesign.simulate(bench(), electrical_only=True).point.efficiency, rel=1e-6
    )
    assert set(buckdesign.__all__) <= set(dir(buckdesign))
    with pytest.raises(AttributeError, match="no attribute 'simulation'"):
        buckdesign.__getattr__("simulation")


def test_importing_the_package_costs_nothing() -> None:
    code = "import sys, buckdesign; print(sorted({'numpy', 'scipy', 'numba', 'pandas'} & set(sys.modules)))"
    found = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert found.stdout.strip() == "[]"


def test_tables_agree_with_single_simulations() -> None:
    """A table's temperatures stand still within 0.1 K, a single simulation's within 0.005 K."""
    resolved = resolved_bench()
    rows = usual(120, 41)
    table = operate_rows(rows, resolved)
    alone = operate_rows(rows, resolved, effort=DETAILED)
    both = (table.loop.column("period_cycles") == 1.0) & (alone.loop.column("period_cycles") == 1.0)
    assert both.mean() > 0.8
    for found, wanted, tolerance in (
        (table.loop.column("frequency_hz"), alone.loop.column("frequency_hz"), 3e-3),
        (table.total_loss, alone.total_loss, 2e-3),
    ):
        np.testing.assert_allclose(found[both], wanted[both], rtol=tolerance)
    for device in ("transistor", "rectifier", "regulator"):
        np.testing.assert_allclose(table.junction(device)[both], alone.junction(device)[both], atol=0.1)


def test_recovery_charge_is_followed_until_the_rate_stands_still() -> None:
    """Without heat paths only the recovery charge moves; its loss is small, what it does to the rate is not."""
    resolved = resolved_bench(
        {"rectifier.part": "1N5811", "thermal.heatsink": None, "thermal.on_heatsink": None, "thermal.pad": None}
    )
    points = points_of(resolved)
    table = operate_rows(rows_at(resolved, points), resolved)
    alone = operate_rows(rows_at(resolved, points), resolved, effort=DETAILED)
    assert table.loop.column("frequency_hz") == pytest.approx(alone.loop.column("frequency_hz"), rel=5e-4)
    recovered = "rectifier_recovery"
    assert table.balance.losses[recovered] == pytest.approx(alone.balance.losses[recovered], rel=0.02)
