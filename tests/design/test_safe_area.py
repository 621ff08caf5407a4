"""Safe area of the transistor: steady states, edges and the start, with and without published points."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from buckdesign.design.checks import part_limits
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.operating import Simulation, operate, operate_rows, points_of, rows_at, simulate
from buckdesign.design.resolve import resolve_design
from buckdesign.design.safe_area_check import NAME
from buckdesign.parts import Tables, load_tables

from .operating_designs import bench, resolved_bench

HEADER = (
    "name,polarity,collector_voltage [V],collector_current [A],gain_1 [1],gain_1_current [A],"
    "saturation_voltage_max [V],saturation_current [A],saturation_base_current [A],transition_frequency_min [MHz],"
    "breakdown_voltage [V],breakdown_current [A],pulse_voltage [V],pulse_current [A],pulse_duration [ms],"
    "junction_case [K/W],junction_limit_c [degC]\n"
)


def with_transistor(tmp_path: Path, points: str, junction_case: float = 1.1) -> Tables:
    """The tables with a PNP of 60 V, 10 A whose points of the safe area are given (values invented)."""
    path = tmp_path / "drawer.csv"
    path.write_text(HEADER + f"drawer PNP,PNP,60,10,50,1,1,5,0.5,4,{points},{junction_case},200\n")
    return load_tables((path,), folder=tmp_path / "nothing")


def swapped(tables: Tables, changes: Any = None) -> Any:
    from buckdesign.design.design_file import design_with

    return design_with(bench(changes), {"transistor.part": "drawer PNP"}, tables)


def area_of(resolved: ResolvedDesign, **where: Any) -> tuple[Any, Any]:
    points = points_of(resolved, **where)
    operated = operate_rows(rows_at(resolved, points), resolved, points.ambient_c)
    return next(one for one in part_limits(operated, resolved) if one.name == NAME), operated


COLD = {
    "thermal.heatsink": None,
    "thermal.on_heatsink": None,
    "thermal.transistor.heatsink": "0.02 K/W",
    "thermal.transistor.pad": "0 K/W",
    "regulator.max_difference": "60 V",
}


def test_without_cycles_the_mean_current_stands_against_the_area_for_direct_current() -> None:
    resolved = resolved_bench(COLD)
    limit, operated = area_of(resolved, supply=50.0, load_resistance=0.05)
    loop = operated.loop
    assert loop.regimes() == ["overload"]
    current = loop.column("collector_mean_a")[0]
    power = loop.column("transistor_switching_w")[0] + loop.column("transistor_conduction_w")[0]
    voltage = power / current
    assert limit.value[0] == pytest.approx(current) and limit.across[0] == pytest.approx(voltage)
    # derived: the line through 40 V 3.75 A and 55 V 0.9 A of the 2N3791, far below the power limit here
    exponent = np.log(3.75 / 0.9) / np.log(55.0 / 40.0)
    second = 3.75 * (40.0 / voltage) ** exponent
    losses = operated.balance.losses
    heat = sum(losses[name][0] for name in ("transistor_switching", "transistor_conduction", "base"))
    case_c = operated.junction("transistor")[0] - 1.1 * heat
    allowed = min(second, (200.0 - case_c) / 1.1 / voltage, 10.0)
    assert limit.limit[0] == pytest.approx(max(allowed, 0.0), rel=1e-3, abs=1e-9)
    assert limit.applies[0] and not limit.holds[0]


def test_second_breakdown_decides_where_the_heat_alone_would_not(tmp_path: Path) -> None:
    """The same overload, with a light drive: inside the power limit, outside second breakdown (values invented)."""
    changes = COLD | {"network.rdrive": "1.5 kohm", "network.rbe": "470 ohm"}
    verdicts = []
    for points in (",,,,", "20,0.5,,,"):
        tables = with_transistor(tmp_path, points)
        resolved = resolve_design(swapped(tables, changes), tables)
        limit, operated = area_of(resolved, supply=40.0, load_resistance=0.2)
        assert operated.loop.regimes() == ["overload"]
        verdicts.append(bool(limit.holds[0]))
        assert limit.applies[0]
    assert verdicts == [True, False]


def test_edges_count_as_their_peak_power_at_the_whole_supply() -> None:
    limit, operated = area_of(resolved_bench())
    peak = operated.loop.column("transistor_peak_w")[0]
    assert limit.applies[0] and limit.holds[0]
    assert 20.0 < limit.across[0] < 22.0
    assert limit.value[0] * limit.across[0] == pytest.approx(peak)
    junction = operated.junction("transistor")[0]
    # derived: at 20 V power rules, so the allowed current takes the junction from its case to 200 degC
    assert limit.limit[0] * limit.across[0] < (200.0 - 25.0) / 1.1
    assert limit.limit[0] * limit.across[0] > (200.0 - junction) / 1.1


def test_edges_beyond_direct_current_fail_only_where_a_pulse_is_known(tmp_path: Path) -> None:
    """A small transistor at 3 A: its edges are pulses of microseconds (values invented)."""
    found = []
    for points in ("40,0.3,,,", "40,0.3,40,8,0.1", "40,0.3,40,0.6,0.1"):
        tables = with_transistor(tmp_path, points, junction_case=4.0)
        resolved = resolve_design(swapped(tables, {"thermal.heatsink": "1 K/W"}), tables)
        limit, operated = area_of(resolved)
        assert operated.loop.regimes()[0] == "continuous"
        found.append((bool(limit.applies[0]), bool(limit.holds[0])))
        texts = operate(resolved, points_of(resolved))[0].warnings
        told = [text for text in texts if "pass outside its safe area for direct current" in text]
        assert len(told) == (points.endswith(",,,"))
    assert found == [(False, True), (True, True), (True, False)]


def test_nothing_is_checked_without_temperatures_or_current() -> None:
    resolved = resolved_bench({"thermal.heatsink": None, "thermal.on_heatsink": None})
    assert not area_of(resolved)[0].applies[0]
    assert not area_of(resolved_bench(), load_current=0.0)[0].applies[0]


def test_what_is_not_known_is_said() -> None:
    known, unknown = (
        operate(one, points_of(one))[0].assumptions
        for one in (resolved_bench(), resolved_bench({"transistor.part": "2N5875"}))
    )
    assert not any("second-breakdown" in text for text in known)
    wanted = "2N5875: no second-breakdown data: only its power and current limits"
    assert any(text.startswith(wanted) for text in unknown)


def start(tmp_path: Path, points: str) -> Simulation:
    tables = with_transistor(tmp_path, points)
    return simulate(swapped(tables, {"supply.voltage": "24 V"}), from_rest=True, tables=tables)


def test_a_start_is_held_against_the_pulse_that_is_known(tmp_path: Path) -> None:
    cases = {
        "direct current": start(tmp_path, "40,3.75,,,").point,
        "between pulse and direct current": start(tmp_path, "40,3.75,24,20,0.05").point,
        "pulse": start(tmp_path, "40,3.75,24,20,5").point,
    }
    margins = []
    for basis, point in cases.items():
        transient = point.transient
        assert transient is not None and transient.safe_area_margin is not None
        assert transient.safe_area_basis == basis
        assert 0.05e-3 < transient.stress_s < 5e-3
        margins.append(transient.safe_area_margin)
        told = [text for text in point.warnings if "safe area" in text or "safe current for long" in text]
        assert bool(told) == (transient.safe_area_margin < 0.0)
    assert margins[0] < margins[1] < margins[2]


def test_margin_of_a_start_by_hand(tmp_path: Path) -> None:
    # derived: case at ambient of 25 degC, so the power of data sheets; second breakdown far away
    found = start(tmp_path, "59,10,,,")
    recorded, transient = found.start_waveforms, found.point.transient
    assert recorded is not None and transient is not None and transient.safe_area_margin is not None
    across = np.maximum(24.0 - recorded.column("switch_node_v"), 1e-9)
    allowed = np.minimum(10.0, (200.0 - 25.0) / 1.1 / across)
    worst = float(np.max(recorded.column("collector_current_a") / allowed))
    assert transient.safe_area_margin == pytest.approx(1.0 - worst, rel=1e-6)
