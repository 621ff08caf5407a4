"""Temperatures: heat paths, leakage in balance, runaway, and agreement with the loop that was run."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from buckdesign.design.heat_paths import heat_data
from buckdesign.design.hot_parameters import COPPER_CEILING_C, RECTIFIER, hot_data, parameters_at
from buckdesign.design.losses import (
    LEAKAGE_CEILING_C,
    copper_resistance_factor,
    loss_data,
    rectifier_leakage_loss,
)
from buckdesign.design.operating import operate, operate_rows, points_of, rows_at
from buckdesign.design.sections import DEVICES
from buckdesign.design.settling import SETTLED
from buckdesign.design.temperatures import device_heat, junctions
from buckdesign.loop.parameters import COLUMN
from buckdesign.physics.convection import ring_rise
from buckdesign.physics.thermal import ring_rise_surface_rule, shared_sink_junctions

from .operating_designs import BOUGHT, operated_bench, random_rows, resolved_bench
from .test_losses import made

SCHOTTKY = {"rectifier.part": "Schottky 10 A 45 V class", "rectifier.parallel": 1}


def heat_of(changes: Any) -> Any:
    return hot_data([resolved_bench(changes)])


def solved(changes: Any, power: Any, ambient: float = 40.0, **columns: float) -> Any:
    """Junctions for given heat and blocking."""
    resolved = resolved_bench(changes)
    loop = made(**({"reverse_mean_v": 0.0, "blocking_fraction": 0.0} | columns))
    return junctions(
        loop, np.array([power]), loss_data([resolved]), heat_data([resolved]), np.array([ambient])
    )


def test_devices_on_one_sink_share_its_rise() -> None:
    resolved = resolved_bench()
    pads = 0.5
    cases = np.array(
        [
            resolved.transistor.junction_case,
            resolved.regulator.junction_case,
            resolved.rectifier.junction_case / 2 - pads / 2,
        ]
    )
    power = [4.0, 1.0, 2.0]
    expected = shared_sink_junctions(np.array(power), 40.0, cases, pads, 3.0)
    found, leakage, runaway = solved(None, power)
    assert found[0] == pytest.approx(expected, rel=1e-12)
    assert leakage[0] == 0.0 and not runaway[0]


def test_own_sinks_and_free_air() -> None:
    # derived: the thermal ladder by hand; the 1.5 A class is 50 K/W in free air (table)
    changes = {
        "thermal.heatsink": None,
        "thermal.on_heatsink": None,
        "thermal.transistor.heatsink": "4 K/W",
        "thermal.transistor.pad": "1 K/W",
    }
    resolved = resolved_bench(changes)
    found = solved(changes, [5.0, 1.0, 0.0])[0][0]
    assert found[0] == pytest.approx(
        40.0 + 5.0 * (resolved.transistor.junction_case + 1.0 + 4.0), rel=1e-12
    )
    assert found[1] == pytest.approx(40.0 + 50.0, rel=1e-12)


def test_a_device_without_a_way_for_its_heat_has_no_temperature() -> None:
    changes = {"thermal.heatsink": None, "thermal.on_heatsink": None}
    point = operate(resolved_bench(changes), points_of(resolved_bench(changes)))[0]
    assert point.junction_c["transistor"] is None
    assert point.junction_c["regulator"] is not None
    assert any("no heat sink is given: no temperature of transistor" in text for text in point.warnings)


def test_leakage_is_in_balance() -> None:
    # derived: T = T_a + R (P + V d I(T)), each device of its own and all on one sink
    resolved = resolved_bench(SCHOTTKY)
    loop = made(reverse_mean_v=15.0, blocking_fraction=0.6)
    power = np.array([[3.0, 1.0, 1.5]])
    data, heat = loss_data([resolved]), heat_data([resolved])
    found, leakage, runaway = junctions(loop, power, data, heat, np.array([45.0]))
    assert not runaway[0]
    again = rectifier_leakage_loss(loop, data, found[:, RECTIFIER])
    assert leakage == pytest.approx(again, rel=1e-9)
    assert leakage[0] > 1e-3
    everything = power + np.array([[0.0, 0.0, leakage[0]]])
    sink = 45.0 + 3.0 * everything.sum()
    assert found[0] == pytest.approx(sink + heat.own[0] * everything[0], rel=1e-12)


def test_more_leakage_than_the_heat_path_carries_is_runaway() -> None:
    # derived: the limit leakage is 1/(c R), so that ten times the leakage that just holds must fail
    found, leakage, runaway = solved(
        SCHOTTKY | {"rectifier.leakage": "2 A", "rectifier.leakage_at": "100 degC"},
        [3.0, 1.0, 1.5],
        reverse_mean_v=15.0,
        blocking_fraction=0.6,
    )
    assert runaway[0]
    assert np.isnan(found[0]).all()
    assert np.isfinite(leakage[0]) and leakage[0] > 0.0


def test_runaway_reaches_the_engineer() -> None:
    leaky = {"rectifier.leakage": "2 A", "rectifier.leakage_at": "100 degC"}
    changes = SCHOTTKY | leaky | {"thermal.heatsink": "12 K/W"}
    resolved = resolved_bench(changes)
    point = operate(resolved, points_of(resolved))[0]
    assert point.junction_c["rectifier"] is None
    assert any("thermal runaway" in text for text in point.warnings)
    check = next(check for check in point.checks if check.name == "rectifier junction")
    assert check.value is None and check.margin is None and not check.holds
    assert "runaway" in check.note
    assert not point.holds
    assert sum(point.losses_w.values()) == pytest.approx(point.total_loss_w)


def test_a_junction_that_fails_by_itself_is_hot_and_not_runaway() -> None:
    found, leakage, runaway = solved(
        SCHOTTKY, [100.0, 1.0, 5.0], reverse_mean_v=15.0, blocking_fraction=0.5
    )
    assert not runaway[0]
    assert found[0, RECTIFIER] > LEAKAGE_CEILING_C
    assert np.isfinite(leakage[0])


def test_the_choke_is_as_hot_as_the_larger_of_two_methods_says() -> None:
    found = operated_bench()
    losses = found.balance.losses
    power = sum(losses[name][0] for name in ("choke_core", "choke_copper", "choke_copper_ac"))
    surface, diameter = found.data.surface[0], found.data.diameter[0]
    rise = max(ring_rise_surface_rule(power, surface), ring_rise(power, surface, diameter, 25.0))
    assert found.balance.choke_c[0] - 25.0 == pytest.approx(rise, rel=5e-3)


def test_copper_has_the_resistance_of_its_temperature() -> None:
    found = operated_bench(ambient_c=60.0)
    choke_c = found.balance.choke_c
    assert choke_c[0] > 60.0
    expected = found.base_rows[:, COLUMN["choke_resistance"]] * copper_resistance_factor(choke_c)
    assert found.parameter("choke_resistance") == pytest.approx(expected, abs=expected[0] * 0.004 * SETTLED)
    loss = expected * found.loop.column("choke_rms_a") ** 2
    assert found.balance.losses["choke_copper"] == pytest.approx(loss, rel=2e-3)


def test_parameters_follow_temperature() -> None:
    # from memory: -2 mV/K base-emitter, charge time doubling in 100 K; IEC 60028: 0.393 %/K copper
    resolved = resolved_bench()
    rows = rows_at(resolved, points_of(resolved))
    hot = parameters_at(rows, heat_of(None), np.array([[125.0, 125.0, 125.0]]), np.array([120.0]))
    ratio = hot[0] / np.where(np.isfinite(rows[0]) & (rows[0] != 0.0), rows[0], np.nan)
    assert hot[0, COLUMN["base_emitter"]] == pytest.approx(0.75 - 0.2)
    assert ratio[COLUMN["charge_time"]] == pytest.approx(2.0)
    assert ratio[COLUMN["gain"]] == pytest.approx((398.15 / 298.15) ** 1.5)
    assert ratio[COLUMN["choke_resistance"]] == pytest.approx(1.393)
    assert ratio[COLUMN["saturation_resistance"]] == pytest.approx(1.3)
    assert hot[0, COLUMN["threshold"]] < rows[0, COLUMN["threshold"]]
    cool = parameters_at(rows, heat_of(None), np.full((1, 3), np.nan), np.array([np.nan]))
    assert cool == pytest.approx(rows)


def test_the_last_run_was_made_at_the_temperatures_found() -> None:
    found = operated_bench(load_current=[0.05, 1.0, 3.0], supply=[[18.0], [22.0]])
    assert found.is_settled.all()
    again = parameters_at(found.base_rows, heat_of(None), found.balance.junction_c, found.balance.choke_c)
    for name in ("base_emitter", "gain", "charge_time", "choke_resistance", "threshold"):
        column = COLUMN[name]
        assert found.rows[:, column] == pytest.approx(again[:, column], rel=8e-3 * SETTLED), name


def test_warm_ambient_makes_everything_warmer() -> None:
    cool, warm = (operated_bench(ambient_c=ambient) for ambient in (5.0, 55.0))
    for device in DEVICES:
        assert 40.0 < warm.junction(device)[0] - cool.junction(device)[0] < 60.0
    assert warm.balance.losses["choke_copper"][0] > 1.1 * cool.balance.losses["choke_copper"][0]


def test_random_supplies_have_finite_temperatures_or_runaway() -> None:
    found = operate_rows(random_rows(120, 11), resolved_bench(SCHOTTKY))
    unknown = np.isnan(found.balance.junction_c).any(axis=1)
    assert (unknown == found.balance.runaway).all()
    assert np.isfinite(found.balance.choke_c).all()
    assert np.isfinite(found.rows).sum() == np.isfinite(found.base_rows).sum()
    hottest = found.parameter("choke_resistance") / found.base_rows[:, COLUMN["choke_resistance"]]
    assert hottest.max() <= copper_resistance_factor(np.array([COPPER_CEILING_C]))[0] + 1e-9


def test_heat_goes_where_it_arises() -> None:
    losses = operated_bench({"rectifier.recovery_charge": "200 nC"}).balance.losses
    heat = device_heat(losses)
    inside = sum(losses[name] for name in losses if name.startswith("transistor")) + losses["base"]
    assert heat[:, 0] == pytest.approx(inside + losses["rectifier_recovery"])
    assert heat[:, 2] == pytest.approx(losses["rectifier"])


def test_a_bought_choke_has_no_temperature() -> None:
    found = operated_bench(BOUGHT, ambient_c=60.0)
    assert np.isnan(found.balance.choke_c[0])
    assert found.parameter("choke_resistance")[0] == 0.06


def test_electrical_only_leaves_everything_as_it_is() -> None:
    resolved = resolved_bench()
    point = points_of(resolved)
    found = operate_rows(rows_at(resolved, point), resolved, electrical_only=True)
    assert np.isnan(found.balance.junction_c).all() and np.isnan(found.balance.choke_c).all()
    assert (found.rows == found.base_rows).all()
    for name in ("choke_core", "choke_copper_ac", "rectifier_leakage", "input_capacitor"):
        assert found.balance.losses[name][0] == 0.0
    assert found.input_power[0] == pytest.approx(found.loop.column("input_w")[0], rel=1e-9)


def test_temperatures_settle_although_losses_fall_with_them() -> None:
    # a fast supply on a small sink: hotter means slower and less lossy, where plain iteration swings
    found = operate_rows(random_rows(300, 5), resolved_bench({"thermal.heatsink": "6 K/W"}))
    regular = found.loop.column("period_cycles") >= 0.0
    assert found.is_settled[regular].all()
    assert found.is_settled.mean() > 0.97
