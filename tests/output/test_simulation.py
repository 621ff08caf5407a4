"""The text about one operating point."""

from __future__ import annotations

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
