"""The text about one operating point."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from buckdesign.design.operating import simulate
from buckdesign.output.simulation import BAR_WIDTH, checks_text, heading, listing, simulation_text
from tests.design.operating_designs import bench


@pytest.fixture(scope="module")
def point():  # type: ignore[no-untyped-def]
    return simulate(bench(), from_rest=True).point


def test_losses_are_sorted_and_add_up(point) -> None:  # type: ignore[no-untyped-def]
    lines = simulation_text(point).splitlines()
    start = next(i for i, line in enumerate(lines) if line.startswith("Losses"))
    stop = next(i for i, line in enumerate(lines) if line.startswith("total"))
    shares = [float(line.split("%")[0].split()[-1]) for line in lines[start + 2 : stop]]
    assert shares == sorted(shares, reverse=True)
    assert sum(shares) == pytest.approx(100.0, abs=0.6)
    assert lines[start + 2].endswith("#" * BAR_WIDTH)
    assert "100.0 %" in lines[stop]


def test_failing_checks_come_first(point) -> None:  # type: ignore[no-untyped-def]
    last = replace(point.checks[-1], holds=False, margin=-0.5)
    text = checks_text((*point.checks[:-1], last))
    first = text.splitlines()[2]
    assert first.startswith(last.name) and "FAILS" in first and "-50 %" in first
    assert text.splitlines()[-1] == f"1 of {len(point.checks)} fail"


def test_a_check_without_a_value_shows_a_dash(point) -> None:  # type: ignore[no-untyped-def]
    lost = replace(point.checks[0], value=None, margin=None, holds=False, note="thermal runaway")
    line = checks_text((lost,)).splitlines()[2]
    assert line.split()[2] == "-" and "thermal runaway" in line


def test_every_block_is_there(point) -> None:  # type: ignore[no-untyped-def]
    text = simulation_text(point)
    for title in ("Operating point", "Losses", "Start from rest", "Checks", "Warnings", "Mind", "Assumed"):
        assert f"\n{title}" in text
    assert text.startswith(heading(point))
    assert not any(line != line.rstrip() for line in text.splitlines())


def test_a_resistive_load_is_named(point) -> None:  # type: ignore[no-untyped-def]
    assert "at 5 Ω," in heading(replace(point, load_a=0.0, load_ohm=5.0))
    assert "at 1 A and 5 Ω," in heading(replace(point, load_a=1.0, load_ohm=5.0))


def test_without_cycles_nothing_oscillates() -> None:
    text = simulation_text(simulate(bench(), load_current=0.0).point)
    assert "oscillation      none" in text
    assert "efficiency" not in text.splitlines()[0]


def test_runaway_is_named_in_the_table() -> None:
    changes = {
        "rectifier.part": "Schottky 10 A 45 V class", "rectifier.parallel": 1, "rectifier.leakage": "2 A",
        "rectifier.leakage_at": "100 degC", "thermal.heatsink": "12 K/W",
    }  # fmt: skip
    assert "rectifier runaway" in simulation_text(simulate(bench(changes)).point)


def test_long_sentences_are_broken() -> None:
    lines = listing("Mind", ["word " * 60]).splitlines()
    assert lines[0] == "Mind" and len(lines) > 3
    assert lines[1].startswith("  - word") and lines[2].startswith("    word")
    assert max(map(len, lines)) <= 100


def test_the_operating_point_stands_in_the_table_where_it_differs(point) -> None:  # type: ignore[no-untyped-def]
    assert "where" not in checks_text(point.checks).splitlines()[0]
    moved = (replace(point.checks[0], where="29 V, 2.5 A, 40 degC"), *point.checks[1:])
    lines = checks_text(moved).splitlines()
    assert "where" in lines[0]
    row = next(line for line in lines if line.startswith(point.checks[0].name))
    assert "29 V, 2.5 A, 40 °C" in row


def test_a_note_that_does_not_fit_stands_below_its_row(point) -> None:  # type: ignore[no-untyped-def]
    long = replace(point.checks[0], note="a word " * 9, where="29 V, 2.5 A, 40 degC", margin=-9.0)
    short = replace(point.checks[1], note="peak at 85 degC")
    lines = checks_text((long, short, *point.checks[2:])).splitlines()
    assert max(map(len, lines)) <= 100
    assert lines[3].startswith("    a word a word")
    assert next(line for line in lines if line.startswith(short.name)).endswith("  peak at 85 °C")


def test_human_text_has_signs_and_json_has_none(point) -> None:  # type: ignore[no-untyped-def]
    text = simulation_text(point)
    assert "degC" not in text and " ohm" not in text and not re.search(r"[0-9] u[FHAs]\b", text)
    assert any("degC" in one.note for one in point.checks)


def test_a_start_names_the_area_that_it_is_held_against(point) -> None:  # type: ignore[no-untyped-def]
    block = simulation_text(point).split("Start from rest")[1].split("\n\n")[0]
    assert "safe area" in block and "against direct current; as one pulse of" in block
    inside = replace(point.transient, safe_area_margin=0.25, safe_area_basis="pulse")
    assert "margin +25 %, against pulse" in simulation_text(replace(point, transient=inside))
    unknown = replace(point.transient, safe_area_margin=None, safe_area_basis=None)
    assert "not known: no ratings" in simulation_text(replace(point, transient=unknown))
