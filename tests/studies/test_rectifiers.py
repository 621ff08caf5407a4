"""Rectifiers compared in a circuit."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from buckdesign.design.design_file import design_with
from buckdesign.design.operating import operate, points_of
from buckdesign.errors import UnknownNameError
from buckdesign.parts import load_tables
from buckdesign.studies.rectifier_choice import Choice, Curve, Over, crossings, rectifier_choice
from buckdesign.studies.rectifiers import STANDARD, UNCHECKED, Comparison, compare_rectifiers
from tests.design.operating_designs import bench, resolved_bench

KEYS = {
    "part", "kind", "parallel", "conduction_w", "recovery_w", "leakage_w", "total_w", "junction_c",
    "runaway_margin", "efficiency", "frequency_hz", "holds", "why_not", "note",
}  # fmt: skip


@pytest.fixture(scope="module")
def found() -> Comparison:
    return compare_rectifiers(bench())


def test_rows_have_the_agreed_keys_and_order(found: Comparison) -> None:
    made = found.to_dict()
    assert made.keys() == {"rectifiers", "warnings"}
    assert all(row.keys() == KEYS for row in made["rectifiers"])
    totals = [row["total_w"] for row in made["rectifiers"]]
    assert totals == sorted(totals) and len(totals) > 20
    for row in found.rows:
        assert row.total_w == pytest.approx(row.conduction_w + row.recovery_w + row.leakage_w)
        assert (row.why_not is None) == row.holds


def test_the_own_rectifier_is_that_of_the_design(found: Comparison) -> None:
    point = operate(resolved_bench(), points_of(resolved_bench()))[0]
    own = found.own
    assert own in found.rows and (own.part, own.parallel) == ("1N5809", 2)
    assert own.conduction_w == pytest.approx(point.losses_w["rectifier"])
    assert own.efficiency == pytest.approx(point.efficiency)
    assert sum((row.part, row.parallel) == ("1N5809", 2) for row in found.rows) == 1


def test_the_rate_moves_with_the_rectifier(found: Comparison) -> None:
    by = {(row.part, row.parallel): row for row in found.rows}
    schottky, slow = by[("1N5822", 1)], by[("1N5400", 1)]
    assert schottky.frequency_hz > 1.05 * slow.frequency_hz
    # common practice: a standard rectifier costs efficiency through its recovery
    assert schottky.recovery_w < 0.02 * slow.recovery_w
    assert schottky.efficiency > slow.efficiency + 0.01


def test_named_ones_are_shown_whatever_they_are_rated() -> None:
    found = compare_rectifiers(bench(), ("1N5820", "1N5811"), supply=24.0, parallel=1)
    by = {row.part: row for row in found.rows}
    assert by.keys() == {"1N5820", "1N5811", "1N5809"}
    assert not by["1N5820"].holds and "reverse voltage 23." in (by["1N5820"].why_not or "")
    assert by["1N5811"].holds and found.own.holds


def test_runaway_drops_a_rectifier_out() -> None:
    found = compare_rectifiers(bench(), ("1N5823",), ambient_c=70.0, parallel=1)
    row = next(row for row in found.rows if row.part == "1N5823")
    assert not row.holds and "thermal runaway, from" in (row.why_not or "")
    assert row.junction_c is None and row.runaway_margin is not None and row.runaway_margin < 1.0
    begins = float((row.why_not or "").split("from ")[1].split()[0])
    just = compare_rectifiers(bench(), ("1N5823",), ambient_c=begins - 2.0, parallel=1)
    near = next(row for row in just.rows if row.part == "1N5823")
    assert near.runaway_margin is not None and near.runaway_margin > 1.0
    assert near.junction_c is not None


def test_an_overloaded_rectifier_says_which_current() -> None:
    found = compare_rectifiers(bench({"supply.voltage": "34 V", "output.current": "5 A"}), ("1N5819",), parallel=1)
    row = next(row for row in found.rows if row.part == "1N5819")
    assert not row.holds and row.why_not


def test_unknown_names_are_refused() -> None:
    with pytest.raises(UnknownNameError, match="1N5821"):
        compare_rectifiers(bench(), ("1N5821x",))


def test_parts_without_a_value_for_free_air_are_told(found: Comparison) -> None:
    assert any("no value for free air is known" in text and "1N5802" in text for text in found.warnings)
    assert any("junction not checked" in text and "1N3879" in text for text in found.warnings)


@pytest.mark.parametrize("over", list(Over))
def test_choices_over_every_quantity(over: Over) -> None:
    choice = rectifier_choice(bench(), over, ("1N5820", "1N5822", "Schottky 20 A 45 V class"))
    assert (np.diff(choice.values) > 0.0).all()
    assert all(len(one.total_w) == len(choice.values) for one in choice.curves)
    best = choice.best()
    assert len([name for name in best if name]) > len(best) // 2
    assert bool(choice.note) == (over is Over.FREQUENCY)
    made = choice.to_dict()
    assert made["quantity"] == over.value and len(made["values"]) == len(choice.values)


def test_the_choice_flips_with_ambient_where_the_lines_cross() -> None:
    """Low drop and much leakage is best in the cold, the other way round in the heat (common practice)."""
    choice = rectifier_choice(bench(), Over.AMBIENT, ("1N5823", "Schottky 10 A 45 V class"), parallel=1)
    flip = next(one for one in choice.crossings if one.below == "1N5823")
    for shift, winner in ((-4.0, "1N5823"), (4.0, "Schottky 10 A 45 V class")):
        rows = compare_rectifiers(
            bench(), ("1N5823", "Schottky 10 A 45 V class"), parallel=1, ambient_c=flip.at + shift
        ).rows
        assert next(row.part for row in rows if row.holds) == winner


def curve(label: str, values: Any) -> Curve:
    return Curve(part=label, parallel=1, label=label, is_own=False, total_w=np.array(values, dtype=float))


def test_crossings_of_straight_lines() -> None:
    # derived: 2 - x and x cross at 1
    values = np.array([0.0, 0.8, 2.0])
    found = crossings(values, [curve("a", 2.0 - values), curve("b", values)])
    assert [(one.at, one.below, one.above) for one in found] == [(pytest.approx(1.0), "b", "a")]


def test_one_that_drops_out_makes_a_crossing_between_the_values() -> None:
    found = crossings(np.array([0.0, 1.0]), [curve("a", [1.0, np.nan]), curve("b", [2.0, 2.0])])
    assert [(one.at, one.below, one.above) for one in found] == [(0.5, "a", "b")]
    assert crossings(np.array([0.0, 1.0]), []) == []


def test_nothing_holds_is_no_choice() -> None:
    choice = Choice(over=Over.LOAD, values=np.array([1.0, 2.0]), curves=(), crossings=(), note="")
    assert choice.best() == [] or choice.best() == [None, None]


def test_each_row_says_what_is_not_known_about_it(found: Comparison) -> None:
    by = {(row.part, row.parallel): row for row in found.rows}
    unchecked = by[("1N3879", 1)]
    assert unchecked.junction_c is None and unchecked.note == UNCHECKED
    assert unchecked.label == "1N3879 (junction not checked)" and unchecked.name == "1N3879"
    assert by[("1N5802", 2)].note == "50 K/W in free air assumed"
    assert by[("1N5822", 1)].note is None
    # a rectifier that has no temperature always says so, unless it runs away
    for row in found.rows:
        lost = row.junction_c is None and "runaway" not in (row.why_not or "")
        assert lost == (UNCHECKED in (row.note or "")), row.label


def test_a_diode_without_recovery_data_counts_as_standard_and_says_so(tmp_path: Path) -> None:
    path = tmp_path / "drawer.csv"
    path.write_text(
        "name,kind,reverse_voltage [V],average_current [A],forward_voltage_1 [V],forward_current_1 [A],"
        "forward_limit,junction_ambient [K/W],junction_case [K/W],junction_limit_c [degC]\n"
        "drawer diode,fast,200,8,1.1,3,max,40,2,150\n"
    )
    tables = load_tables((path,), folder=tmp_path / "nothing")
    made = design_with(bench(), {"rectifier.part": "drawer diode", "rectifier.parallel": 1}, tables)
    own = compare_rectifiers(made, ("1N5811",), tables=tables).own
    assert own.note == STANDARD
    other = compare_rectifiers(bench(), ("drawer diode",), tables=tables, parallel=1)
    row = next(row for row in other.rows if row.part == "drawer diode")
    assert row.note == STANDARD and f"drawer diode: {STANDARD}" in other.warnings
    # common practice: a standard rectifier stores some microcoulomb, an ultrafast one some nanocoulomb
    assert row.recovery_w > 5.0 * other.own.recovery_w
