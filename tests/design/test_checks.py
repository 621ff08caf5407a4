"""Checks: part limits everywhere, requirements where they are asked, margins with the right sign."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from buckdesign.design.advisories import DRIVE_LIMITED
from buckdesign.design.checks import Limit, checks_at, part_limits, worst_checks
from buckdesign.design.operating import all_limits, operate, operate_rows, points_of, rows_at, simulate
from buckdesign.design.requirement_checks import (
    CHARGE_TIME_TOP,
    START_MARGIN_WANTED,
    in_range,
    requirement_limits,
    start_margins,
    worst_start_rows,
)
from buckdesign.design.resolve import loop_parameters
from buckdesign.loop.parameters import COLUMN

from .operating_designs import bench, resolved_bench


def checks_of(changes: Any = None, *, requirement: bool = False, **where: Any) -> dict[str, Any]:
    resolved = resolved_bench(changes, requirement=requirement)
    point = operate(resolved, points_of(resolved, **where))[0]
    return {check.name: check for check in point.checks}


PART_LIMITS = {
    "collector voltage", "collector current", "base drive", "rectifier reverse voltage",
    "rectifier current", "regulator difference", "regulator current", "drive resistor power",
    "base-emitter resistor power", "output capacitor voltage", "output capacitor ripple current",
    "output capacitor life", "input capacitor voltage", "input capacitor ripple current",
    "input capacitor life", "transistor junction", "regulator junction", "rectifier junction",
    "core flux density", "choke temperature", "transistor safe area", "wires through the bore",
}  # fmt: skip


def test_without_a_requirement_only_parts_are_checked() -> None:
    assert set(checks_of()) == PART_LIMITS


def test_the_bench_supply_holds() -> None:
    found = checks_of()
    assert all(check.holds and check.margin > 0.0 for check in found.values())
    assert all(check.where == "20 V, 3 A, 25 degC" for check in found.values())


@pytest.mark.parametrize(
    ("name", "changes", "where"),
    [
        ("collector voltage", {"transistor.collector_voltage": "20 V"}, {}),
        ("collector current", {"transistor.collector_current": "3 A"}, {}),
        ("base drive", {"network.rdrive": "22 ohm"}, {}),
        ("rectifier reverse voltage", {"rectifier.reverse_voltage": "19 V"}, {}),
        ("rectifier current", {"rectifier.average_current": "0.3 A"}, {}),
        ("regulator difference", {"regulator.max_difference": "4 V"}, {}),
        ("regulator current", {"network.rdrive": "1 ohm"}, {"load_current": 12.0}),
        ("drive resistor power", {"network.rdrive_power": "0.5 W"}, {}),
        ("base-emitter resistor power", {"network.rbe": "1 ohm"}, {}),
        ("output capacitor voltage", {"output_capacitor.rated_voltage": "15 V"}, {}),
        ("output capacitor ripple current", {"output_capacitor.ripple_current": "0.2 A"}, {}),
        ("output capacitor life", {"output_capacitor.life": "10 h"}, {"ambient_c": 60.0}),
        ("input capacitor voltage", {"input_capacitor.rated_voltage": "16 V"}, {}),
        ("input capacitor ripple current", {"input_capacitor.ripple_current": "1 A"}, {}),
        ("transistor junction", {"transistor.junction_limit": "40 degC"}, {}),
        ("regulator junction", {"regulator.junction_limit": "35 degC"}, {}),
        ("rectifier junction", {"rectifier.junction_limit": "35 degC"}, {}),
        ("choke temperature", {"choke.wire": "0.4 mm"}, {"ambient_c": 60.0}),
    ],
)
def test_each_limit_fails_when_it_is_passed(name: str, changes: Any, where: Any) -> None:
    passed, failed = checks_of()[name], checks_of(changes, **where)[name]
    assert passed.holds and passed.margin > 0.0
    assert not failed.holds and failed.margin < 0.0


def test_margin_is_relative_to_the_limit() -> None:
    # derived: 15.5 V of 25 V leave 38 %
    check = checks_of()["output capacitor voltage"]
    assert check.limit == 25.0
    assert check.margin == pytest.approx(1.0 - check.value / 25.0, rel=1e-12)
    lower = Limit(
        name="x",
        unit="A",
        value=np.array([3.0]),
        limit=np.array([2.0]),
        applies=np.array([True]),
        is_upper=False,
    )
    assert lower.margin[0] == pytest.approx(0.5)


def test_a_limit_that_is_just_met_holds() -> None:
    made = Limit(name="x", unit="A", value=np.array([2.0]), limit=np.array([2.0]), applies=np.array([True]))
    assert made.holds[0] and made.margin[0] == 0.0


def test_a_value_that_is_not_there_fails_where_it_is_asked() -> None:
    made = Limit(
        name="x", unit="degC", value=np.array([np.nan, np.nan]), limit=np.array([100.0, 100.0]),
        applies=np.array([True, False]), note_unknown="runaway",
    )  # fmt: skip
    assert made.holds.tolist() == [False, True]
    check = made.at(0, "here")
    assert check.value is None and check.margin is None and check.note == "runaway"


def test_base_drive_by_hand() -> None:
    # derived: V_BE/R_be + I (1 + I/I_K)/beta needed; (V_in - V_BE - V_do - V_out)/(R_drive + R_do) at hand
    resolved = resolved_bench()
    point = simulate(bench(), electrical_only=True).point
    check = next(one for one in point.checks if one.name == "base drive")
    transistor, regulator = resolved.transistor, resolved.regulator
    peak = point.choke_current_a["max"]
    needed = (
        transistor.base_emitter_max / 22.0
        + peak * (1.0 + peak / transistor.gain_knee) / transistor.gain_min
    )
    across = 20.0 - transistor.base_emitter_max - regulator.dropout - point.output_voltage_v
    assert check.limit == pytest.approx(needed, rel=0.02)
    assert check.value == pytest.approx(across / (4.7 + regulator.dropout_resistance), rel=1e-6)
    assert transistor.gain_min < transistor.gain


def test_the_piece_of_lowest_drop_carries_more_than_its_share() -> None:
    two = checks_of()["rectifier current"]
    mean = two.value
    one = checks_of({"rectifier.parallel": 1})["rectifier current"].value
    assert 0.5 * one < mean <= one * 1.05
    assert "typical" in two.note


def test_junctions_are_checked_at_limit_drops() -> None:
    resolved = resolved_bench()
    point = operate(resolved, points_of(resolved))[0]
    check = next(one for one in point.checks if one.name == "rectifier junction")
    assert check.value > point.junction_c["rectifier"]
    assert f"typical {point.junction_c['rectifier']:.1f} degC" in check.note


def test_what_has_no_rating_is_named_and_not_checked() -> None:
    changes = {"network.rdrive_power": None, "network.rbe_power": None}
    resolved = resolved_bench(changes)
    point = operate(resolved, points_of(resolved))[0]
    assert "drive resistor power" not in {check.name for check in point.checks}
    assert any(
        text == "not checked, no rating is known: drive resistor power, base-emitter resistor power"
        for text in point.warnings
    )


def test_electrical_only_checks_no_temperature() -> None:
    names = {check.name for check in simulate(bench(), electrical_only=True).point.checks}
    assert names == PART_LIMITS - {
        "transistor junction", "regulator junction", "rectifier junction", "choke temperature",
        "transistor safe area",
        "output capacitor life", "input capacitor life",
    }  # fmt: skip


WANTED = {
    "output voltage",
    "ripple",
    "lowest frequency",
    "highest frequency",
    "efficiency",
    "starts by itself",
}


def test_a_requirement_is_checked_where_it_asks() -> None:
    # agreed: ripple and output everywhere, frequency from half to full load, efficiency at full load
    full, half, light = (
        set(checks_of(requirement=True, load_current=load)) & WANTED for load in (3.0, 1.5, 0.3)
    )
    assert full == WANTED
    assert half == WANTED - {"efficiency"}
    assert light == {"output voltage", "ripple", "starts by itself"}


@pytest.mark.parametrize("where", [{"supply": 30.0}, {"load_current": 4.0}, {"load_current": 0.001}])
def test_points_outside_the_range_are_not_held_against_it(where: Any) -> None:
    resolved = resolved_bench(requirement=True)
    point = operate(resolved, points_of(resolved, **where))[0]
    assert not {check.name for check in point.checks} & WANTED
    assert any("outside the supplies and loads" in text for text in point.warnings)


@pytest.mark.parametrize(
    ("name", "key", "value"),
    [
        ("ripple", "ripple", "20 mV"),
        ("output voltage", "tolerance", "1 %"),
        ("lowest frequency", "frequency", ["19 kHz", "50 kHz"]),
        ("highest frequency", "frequency", ["2 kHz", "5 kHz"]),
        ("efficiency", "efficiency", 0.95),
    ],
)
def test_each_requirement_fails_when_it_is_not_met(name: str, key: str, value: Any) -> None:
    from pathlib import Path

    from buckdesign.design.requirement import requirement_from_tree

    tree: dict[str, Any] = {
        "supply": {"voltage": "20 V"},
        "output": {"voltage": "15 V", "current": ["0 A", "3 A"], "ripple": "250 mV", "tolerance": "5 %"},
        "limits": {"frequency": ["4 kHz", "20 kHz"], "efficiency": 0.8},
    }
    resolved = resolved_bench()

    def check() -> Any:
        made = requirement_from_tree(tree, lambda *steps: None, (), path=Path("r.toml"))
        found = operate(resolved, points_of(resolved), requirement=made)[0]
        return next(one for one in found.checks if one.name == name)

    assert check().holds and check().margin > 0.0
    tree["output" if key in ("ripple", "tolerance") else "limits"][key] = value
    assert not check().holds and check().margin < 0.0


def test_output_margin_is_relative_to_the_tolerance() -> None:
    check = checks_of(requirement=True)["output voltage"]
    assert check.margin == pytest.approx(1.0 - abs(check.value - 15.0) / 0.75, rel=1e-9)
    assert check.limit == pytest.approx(15.75)


def test_starting_is_judged_at_the_bad_end_of_every_band() -> None:
    resolved = resolved_bench(requirement=True)
    rows = rows_at(resolved, points_of(resolved, load_current=0.3))
    worst = worst_start_rows(rows, [resolved], 3.0)[0]
    assert worst[COLUMN["gain"]] == resolved.transistor.gain_min
    assert worst[COLUMN["load_current"]] == 3.0
    # the 1.5 A class: 0.08 uH within a factor of three (table)
    assert worst[COLUMN["output_inductance"]] == pytest.approx(0.24e-6)
    assert worst[COLUMN["charge_time"]] == pytest.approx(CHARGE_TIME_TOP)
    check = checks_of(requirement=True, load_current=0.3)["starts by itself"]
    assert check.value == pytest.approx(start_margins(worst[None, :])[0], rel=1e-9)
    assert check.limit == START_MARGIN_WANTED
    typical = start_margins(rows_at(resolved, points_of(resolved)))[0]
    assert check.value < 0.5 * typical


def test_start_margin_by_hand() -> None:
    # derived: S = beta' L(i) / (R_h G (L_o + tau (R_o + k ESR))), the agreed expression
    resolved = resolved_bench()
    given = loop_parameters(resolved, 20.0, 3.0)
    found = start_margins(given.row()[None, :])[0]
    conductance = 1.0 / given.r1 + 1.0 / given.r2 + 1.0 / given.hysteresis_resistance
    share = 1.0 - 1.0 / (given.r1 * conductance)
    current = 2.85  # of 3 A, what the base brings is missing
    gain = given.gain / (1.0 + 2.0 * current / given.gain_knee)
    inductance = given.inductance / (1.0 + (current / given.bias_current) ** given.bias_exponent)
    lag = given.output_inductance + given.charge_time * (given.output_resistance + share * given.esr)
    expected = gain * inductance / (given.hysteresis_resistance * conductance * lag)
    assert found == pytest.approx(expected, rel=0.03)


def test_regular_counts_only_where_it_is_asked() -> None:
    from dataclasses import replace

    resolved = resolved_bench(requirement=True)
    wanted = resolved.design.requirement
    assert wanted is not None
    where = points_of(resolved)
    operated = operate_rows(rows_at(resolved, where), resolved)
    assert "regular oscillation" not in {one.name for one in requirement_limits(operated, wanted, resolved)}
    strict = replace(wanted, limits=replace(wanted.limits, regular=True))
    values = operated.loop.values.copy()
    for period, holds in ((1.0, True), (2.0, False), (-1.0, False)):
        values[0, 1] = period
        loop = replace(operated.loop, values=values)
        limits = requirement_limits(replace(operated, loop=loop), strict, resolved)
        regular = next(one for one in limits if one.name == "regular oscillation")
        assert bool(regular.holds[0]) is holds, period


def test_worst_checks_are_where_the_margin_is_smallest() -> None:
    resolved = resolved_bench(requirement=True)
    where = points_of(resolved, supply=[[18.0], [20.0], [22.0]], load_current=[0.05, 1.0, 3.0])
    operated = operate_rows(rows_at(resolved, where), resolved)
    limits = all_limits(operated, resolved)
    worst = {check.name: check for check in worst_checks(limits, operated)}
    every = [check for index in range(9) for check in checks_at(limits, operated, index)]
    for name, check in worst.items():
        assert check.margin == min(one.margin for one in every if one.name == name), name
    assert worst["collector voltage"].where.startswith("22 V")
    assert worst["efficiency"].where.endswith("3 A, 25 degC")
    assert in_range(operated, resolved.design.requirement).all()


def test_the_same_limits_come_for_every_design() -> None:
    resolved = resolved_bench()
    where = points_of(resolved, load_current=[0.0, 3.0])
    operated = operate_rows(rows_at(resolved, where), resolved)
    assert [one.name for one in part_limits(operated, resolved)] == [
        one.name for one in part_limits(operated, [resolved, resolved])
    ]
    assert not next(one for one in part_limits(operated, resolved) if one.name == "base drive").applies[0]


@pytest.mark.parametrize(
    ("changes", "where", "text"),
    [
        ({}, {}, "kHz can be heard"),
        ({"network.r2": "3.3 kohm"}, {"supply": 26.0}, "from the nominal 15 V"),
        ({}, {"supply": 15.0}, "drop-out"),
        ({}, {"load_current": 40.0}, "overload"),
        ({"network.rdrive": "47 ohm"}, {}, "drive-limited"),
        ({"choke.wire": "0.5 mm"}, {"ambient_c": 60.0}, "iron powder ages"),
        ({"supply.resistance": "50 mohm"}, {}, "the supply is taken as stiff: its resistance"),
        ({"choke.material": "manganese-zinc ferrite 2200"}, {}, "a ferrite ring without a gap saturates"),
    ],
)
def test_warnings(changes: Any, where: Any, text: str) -> None:
    resolved = resolved_bench(changes)
    point = operate(resolved, points_of(resolved, **where))[0]
    assert any(text in one for one in point.warnings), point.warnings
    if text == "drive-limited":
        assert point.active_fraction > DRIVE_LIMITED


@pytest.mark.parametrize(
    ("changes", "text"),
    [
        ({}, "short-circuit protection: fuse the input"),
        ({}, "drive resistor burns first: up to"),
        ({}, "mind polarity and rated voltage"),
        ({}, "inrush"),
        ({}, "bypass capacitor"),
        ({}, "licensed practice"),
        ({"supply.voltage": "48 V", "input_capacitor.rated_voltage": "63 V"}, "more than the 40 V"),
        ({"output_capacitor.part": "tantalum 100 uF 16 V"}, "tantalum can catch fire"),
        ({"output_capacitor.part": "tantalum 100 uF 25 V"}, "tantalum can catch fire"),
        ({"output_capacitor.part": "tantalum 100 uF 25 V", "output_capacitor.esr": "0.1 ohm"}, "tantalum can catch"),
        ({"input_capacitor.part": "tantalum 100 uF 35 V"}, "input capacitor: tantalum can catch fire"),
        ({"thermal.heatsink": "10 K/W"}, "hot to the touch"),
    ],
)
def test_cautions(changes: Any, text: str) -> None:
    resolved = resolved_bench(changes)
    point = operate(resolved, points_of(resolved))[0]
    assert any(text in one for one in point.cautions), point.cautions
    assert set(point.cautions) <= set(point.to_dict()["warnings"])
    assert len(point.assumptions) >= 4


def test_short_circuit_power_by_hand() -> None:
    # derived: the 1.5 A class limits at 2.2 A, 4.7 ohm carries 23 W
    resolved = resolved_bench()
    point = operate(resolved, points_of(resolved), electrical_only=True)[0]
    assert "in a short circuit the drive resistor burns first: up to 23 W" in point.cautions


def test_switch_on_stress_is_a_warning() -> None:
    point = simulate(bench(), from_rest=True).point
    assert any(text.startswith("at switch-on the transistor carries up to") for text in point.warnings)


def test_a_tantalum_of_twice_the_voltage_is_no_caution() -> None:
    # trade rule (from memory): 35 V suffices on 15 V, 25 V does not
    resolved = resolved_bench({"output_capacitor.part": "tantalum 100 uF 35 V"})
    point = operate(resolved, points_of(resolved))[0]
    assert not any("tantalum" in text for text in point.cautions)
    weak = resolved_bench({"output_capacitor.part": "tantalum 100 uF 25 V"})
    text = next(one for one in operate(weak, points_of(weak))[0].cautions if "tantalum" in one)
    assert "rated 25 V at 15." in text and "take one rated 31 V" in text


def test_a_winding_must_pass_the_bore() -> None:
    """Turns times strands against what the layers of the bore take, as `choke wind` counts them."""
    loose = checks_of()["wires through the bore"]
    assert loose.holds and loose.value is not None and loose.limit is not None
    tight = checks_of({"choke.turns": int(loose.limit) + 1})["wires through the bore"]
    assert tight.value == loose.limit + 1 and not tight.holds
    double = checks_of({"choke.strands": 2})["wires through the bore"]
    assert double.value == 2 * loose.value
