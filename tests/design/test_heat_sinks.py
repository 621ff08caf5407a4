"""Heat sinks, capacitors and the regulator alone at an operating point."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from buckdesign.design.capacitor_load import capacitor_loads
from buckdesign.design.heat_sinks import heat_sinks, worst_heat_sinks
from buckdesign.design.linear_alternative import linear_alternative
from buckdesign.design.operating import operate, points_of, simulate
from buckdesign.physics.convection import plate_resistance

from .operating_designs import bench, operated_bench, resolved_bench


def sinks_of(changes: Any = None, **points: Any) -> Any:
    return heat_sinks(operated_bench(changes, **points), resolved_bench(changes), 0)


def test_the_sink_that_is_needed_takes_the_junction_to_its_limit() -> None:
    needed = sinks_of({"transistor.junction_limit": "120 degC"}).transistor
    own = {
        "thermal.heatsink": None,
        "thermal.on_heatsink": None,
        "transistor.junction_limit": "120 degC",
        "thermal.transistor.heatsink": f"{needed.needed_k_per_w} K/W",
    }
    assert operated_bench(own).junction("transistor")[0] == pytest.approx(120.0, abs=3.0)


def test_the_shared_sink_is_set_by_the_tightest_device() -> None:
    shared = sinks_of().shared
    assert shared.devices == ("transistor", "regulator", "rectifier")
    assert shared.limited_by == "regulator"
    assert shared.sink_c == pytest.approx(25.0 + 3.0 * shared.heat_w)
    tight = sinks_of({"transistor.junction_limit": "45 degC"}).shared
    assert tight.limited_by == "transistor" and tight.needed_k_per_w < shared.needed_k_per_w
    plate = shared.plate
    # derived: a plate of that resistance at the rise that the tightest junction leaves it
    element = resolved_bench().regulator
    rise = element.junction_limit_c - 25.0 - (element.junction_case + 0.5) * sinks_of().regulator.heat_w
    found = plate_resistance(2.0 * plate.side_m**2, plate.side_m, rise, 25.0, 0.9)
    assert found == pytest.approx(shared.needed_k_per_w, rel=0.01)
    assert plate.side_low_m < plate.side_m < plate.side_high_m < plate.bright_side_m


def test_no_sink_is_told_from_one_that_is_needed() -> None:
    found = sinks_of()
    # derived: 50 K/W of the 1.5 A class in free air
    assert found.regulator.without_sink_c == pytest.approx(25.0 + 50.0 * found.regulator.heat_w)
    assert found.regulator.needs_sink is False and found.regulator.plate is None
    hot = sinks_of({"supply.voltage": "30 V", "network.rdrive": "22 ohm"}, load_current=[3.0])
    assert hot.transistor.needs_sink and hot.transistor.plate is not None


def test_an_ambient_above_the_limit_leaves_no_sink() -> None:
    shared = sinks_of({"regulator.junction_limit": "60 degC"}, ambient_c=[70.0]).shared
    assert shared.needed_k_per_w < 0.0 and shared.plate is None


def test_without_a_common_sink_there_is_none() -> None:
    assert sinks_of({"thermal.heatsink": None, "thermal.on_heatsink": None}).shared is None


def test_capacitors_carry_what_the_loop_gives_them() -> None:
    operated = operated_bench(ambient_c=[45.0])
    found = capacitor_loads(operated, resolved_bench(), 0)
    output, source = found["output"], found["input"]
    assert output.ripple_a == pytest.approx(operated.loop.column("output_capacitor_rms_a")[0])
    assert source.esr_ohm * source.ripple_a**2 == pytest.approx(operated.balance.losses["input_capacitor"][0])
    assert 45.0 < output.temperature_c < 50.0
    # derived: doubling for each 10 K less, 15 years at most (makers' practice)
    assert output.life_h <= 15 * 8760.0
    warm = capacitor_loads(operated_bench(ambient_c=[85.0]), resolved_bench(), 0)["output"]
    assert warm.life_h < output.life_h


def test_the_regulator_alone_burns_the_difference() -> None:
    operated = operated_bench()
    found = linear_alternative(operated, resolved_bench(), 0)
    output, divider = operated.set_voltage[0], 1.25 / 240.0
    assert found.loss_w == pytest.approx(20.0 * (3.0 + divider) - 3.0 * output)
    assert found.efficiency == pytest.approx(output / 20.0, rel=3e-3)
    assert not found.is_possible
    assert 0.0 < found.pays_from_a < 0.5


def test_switching_pays_above_the_crossing_and_not_below() -> None:
    start = linear_alternative(operated_bench(), resolved_bench(), 0).pays_from_a
    loads = np.array([0.5 * start, 1.5 * start, 3.0])
    operated = operated_bench(load_current=loads)
    divider = 1.25 / 240.0
    linear = 20.0 * (loads + divider) - operated.set_voltage * loads
    saved = linear - operated.total_loss
    assert saved[0] < 2e-3 * linear[0]
    assert saved[1] > 0.0 and saved[2] > 0.0


def test_the_budget_adds_up_to_input_minus_output() -> None:
    point = simulate(bench()).point
    assert sum(point.losses_w.values()) == pytest.approx(point.input_power_w - point.output_power_w, rel=1e-6)
    made = point.to_dict()
    assert made["linear"]["loss_w"] > made["total_loss_w"]
    assert made["heat_sinks"]["shared"]["fitted_k_per_w"] == 3.0
    assert made["capacitors"]["output"]["rated_a"] == 1.05


def test_electrical_only_has_no_sinks() -> None:
    made = simulate(bench(), electrical_only=True).to_dict()
    assert made["heat_sinks"] is None and made["linear"] is None


def test_a_regulator_that_would_shut_down_is_a_warning() -> None:
    changes = {"thermal.on_heatsink": ["transistor", "rectifier"], "supply.voltage": "30 V"}
    resolved = resolved_bench(changes)
    texts = operate(resolved, points_of(resolved, load_current=3.0))[0].warnings
    assert any("would shut down" in text for text in texts)


def test_runaway_names_the_ambient_at_which_it_begins() -> None:
    changes = {
        "rectifier.part": "1N5823",
        "rectifier.parallel": 1,
        "rectifier.junction_case": "2 K/W",
        "thermal.heatsink": "14 K/W",
    }
    resolved = resolved_bench(changes)

    def warned(ambient_c: float) -> str:
        point = operate(resolved, points_of(resolved, ambient_c=ambient_c))[0]
        return next(text for text in point.warnings if "runaway" in text)

    begins = [float(warned(ambient).split("from ")[1].split()[0]) for ambient in (25.0, 60.0)]
    assert begins[0] == begins[1]
    assert warned(begins[0] + 1.0).startswith("thermal runaway")
    close = warned(begins[0] - 3.0)
    assert close.startswith("close to thermal runaway")
    # there the losses are taken as they are, so that it is an estimate
    assert float(close.split("ambient of ")[1].split()[0]) == pytest.approx(begins[0], abs=3.0)


def test_over_a_range_each_device_is_taken_where_it_asks_for_most() -> None:
    operated = operated_bench(load_current=[0.3, 1.0, 3.0], supply=[[18.0], [22.0]], ambient_c=40.0)
    resolved = resolved_bench()
    worst = worst_heat_sinks(operated, resolved)
    every = [heat_sinks(operated, resolved, index) for index in range(6)]
    for name in ("transistor", "regulator", "rectifier"):
        one = getattr(worst, name)
        needs = [getattr(other, name).needed_k_per_w for other in every]
        least = min(need for need in needs if need is not None)
        assert one.needed_k_per_w == pytest.approx(least)
        assert one.where.endswith("40 degC") and one.where.count(",") == 2
    assert worst.shared.needed_k_per_w == pytest.approx(min(one.shared.needed_k_per_w for one in every))


def test_only_the_highest_ambient_counts() -> None:
    operated = operated_bench(ambient_c=[5.0, 40.0])
    assert worst_heat_sinks(operated, resolved_bench()).transistor.where.endswith("40 degC")


def test_the_fitted_sink_has_a_plate_too() -> None:
    operated = operated_bench()
    shared = heat_sinks(operated, resolved_bench(), 0).shared
    plate = shared.fitted_plate
    # derived: a plate of 3 K/W at the rise that the heat makes on 3 K/W
    found = plate_resistance(2.0 * plate.side_m**2, plate.side_m, 3.0 * shared.heat_w, 25.0, 0.9)
    assert found == pytest.approx(3.0, rel=0.01)
    assert plate.side_low_m < plate.side_m < plate.side_high_m < plate.bright_side_m
