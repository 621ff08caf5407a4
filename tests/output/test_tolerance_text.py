"""Texts and figure of a tolerance study."""

from __future__ import annotations

from functools import cache

import matplotlib.colors
import numpy as np
import pytest

from buckdesign.design.tolerances import Tolerance
from buckdesign.output.text import Column
from buckdesign.output.tolerance_plots import UNCERTAIN, study_figure
from buckdesign.output.tolerance_text import (
    band_text,
    margin_text,
    percent,
    share_text,
    short_names,
    study_text,
    weakest,
)
from buckdesign.output.tolerance_unit_text import unit_text
from buckdesign.output.wide_tables import WIDTH, noted_table, wrapped_table
from buckdesign.studies.study_effort import StudyEffort
from buckdesign.studies.tolerance import one_unit, prepare_units, tolerance_study
from buckdesign.studies.tolerance_result import ToleranceStudy
from tests.design.operating_designs import bench

EFFORT = StudyEffort(units=30, samples=8, seed=1)

WIDE = {
    "network.r1": Tolerance(low=-0.08, high=0.08),
    "output_capacitor.esr": Tolerance(low=-0.5, high=1.5),
    "regulator.output_inductance": Tolerance(low=-0.5, high=1.0),
}


@cache
def study() -> ToleranceStudy:
    return tolerance_study(bench(requirement=True), tolerances=WIDE, effort=EFFORT)


@pytest.mark.parametrize(
    ("low", "high", "text"),
    [(-0.1, 0.1, "±10 %"), (-0.5, 1.0, "-50 % to +100 %"), (-0.9, 0.0, "-90 % to +0 %")],
)
def test_bands(low: float, high: float, text: str) -> None:
    assert band_text(low, high) == text


@pytest.mark.parametrize(
    ("share", "text"),
    [(1.0, "100.0 %"), (0.9999, "> 99.9 %"), (0.792, "79.2 %"), (0.0, "0.0 %"), (0.0001, "< 0.1 %")],
)
def test_only_all_is_a_hundred(share: float, text: str) -> None:
    assert percent(share) == text


@pytest.mark.parametrize(
    ("margin", "text"),
    [
        (0.1234, "+12.3 %"),
        (-1.7, "-170 %"),
        (23.76, "+2380 %"),
        (1e-7, "+0 %"),
        (-np.inf, "-"),
        (np.nan, "-"),
    ],
)
def test_margins(margin: float, text: str) -> None:
    assert margin_text(margin) == text


def test_the_study_says_what_it_found() -> None:
    found, text = study(), study_text(study(), "bench.design.toml")
    assert 0.0 < found.total.share < 1.0
    assert percent(found.total.share) in text
    for name in found.runs.requirements:
        assert (name in text) == (name in found.shown)
    for one in found.worst_units():
        assert f"{one.unit:4d}  {one.name}" in text
    assert "(all 8 corners)" in text
    assert not any(line != line.rstrip() for line in text.splitlines())


def test_with_usual_tolerances_no_line_is_wider_than_a_terminal() -> None:
    found = tolerance_study(bench(requirement=True), effort=EFFORT)
    text = study_text(found, "the_supply_of_the_instrument_rail_as_built.design.toml")
    assert max(map(len, text.splitlines())) <= WIDTH
    names = short_names(found.varied)
    for one in found.worst_units():
        for key, _, deviation in one.extremes:
            assert f"{names[key]} {100.0 * deviation:+.3g} %" in text
    setting = prepare_units(bench(requirement=True), effort=EFFORT)
    assert max(map(len, unit_text(one_unit(setting, 0), "bench.design.toml").splitlines())) <= WIDTH


def test_short_names_stay_apart() -> None:
    found = tolerance_study(bench(requirement=True), effort=StudyEffort(units=1, samples=0, age_hours=0.0))
    names = short_names(found.varied)
    assert len(set(names.values())) == len(found.varied)
    assert names["regulator.output_inductance"] == "output inductance"
    assert names["output_capacitor.esr"] == "output capacitor esr"


def test_a_long_last_column_goes_on_below() -> None:
    columns = [Column(heading="a"), Column(heading="b")]
    lines = wrapped_table(columns, [["x", "word " * 60], ["y", ""]]).splitlines()
    assert max(map(len, lines)) <= WIDTH and sum(line.count("word") for line in lines) == 60
    assert lines[-1] == "y" and all(line.startswith("   word") for line in lines[3:-1])
    noted = noted_table(columns, [["x", "1"], ["y", "2"]], ["of x", ""]).splitlines()
    assert noted[2:] == ["x  1", "    of x", "y  2"]


@pytest.mark.parametrize(("share", "text"), [(-0.05, "0.00"), (1.07, "1.00"), (0.431, "0.43")])
def test_shares_are_shown_within_what_they_can_be(share: float, text: str) -> None:
    assert share_text(share) == text


def test_the_weakest_comes_first() -> None:
    found = study()
    names = [name for name in found.runs.requirements if name in found.shown]
    shares = [found.yield_by(name).share for name in weakest(found, names, len(names))]
    assert shares == sorted(shares)


def test_a_unit_says_what_it_is() -> None:
    worst = study().worst_units()[0]
    setting = prepare_units(bench(requirement=True), tolerances=WIDE, effort=EFFORT)
    text = unit_text(one_unit(setting, worst.unit), "bench.design.toml")
    assert f"Unit {worst.unit} of seed 1 of bench.design.toml: fails: " in text
    assert "FAILS" in text and "network.r1" in text and "regime" in text


def test_bars_are_the_results() -> None:
    found = study()
    figure = study_figure(found, "bench.design.toml")
    yields, shares, gains = figure.axes
    assert yields.get_yticklabels()[0].get_text() == "all of them"
    widths = [patch.get_width() for patch in yields.patches]
    assert found.aged_total is not None
    labels = len(yields.get_yticklabels())
    assert widths[0] == pytest.approx(100.0 * found.total.share)
    assert widths[labels] == pytest.approx(100.0 * found.aged_total.share)
    assert found.sensitivity is not None
    name = weakest(found, found.sensitivity.names, 1)[0]
    assert name in shares.get_title(loc="left")
    first = found.sensitivity.order(name)[0]
    row = found.sensitivity.names.index(name)
    # a share outside 0 to 1 is chance, and is drawn at the nearer end
    assert shares.patches[0].get_width() == pytest.approx(
        np.clip(found.sensitivity.first[row, first], 0.0, 1.0)
    )
    assert shares.get_xlim()[0] == 0.0 and shares.get_xlim()[1] < 1.1
    # certain gains first, each kind in its own colour
    assert [patch.get_width() for patch in gains.patches] == pytest.approx(
        [100.0 * one.gain for one in found.tighter]
    )
    colours = [matplotlib.colors.to_hex(patch.get_facecolor()) for patch in gains.patches]
    assert [colour == UNCERTAIN for colour in colours] == [not one.is_certain for one in found.tighter]


def test_figure_without_shares_and_gains() -> None:
    design = bench({"output_capacitor.esr": "20 mohm"}, requirement=True)
    tight = {"network.r1": Tolerance(low=-0.001, high=0.001)}
    found = tolerance_study(design, tolerances=tight, effort=StudyEffort(units=2, samples=0, age_hours=0.0))
    assert found.total.share in (0.0, 1.0)
    figure = study_figure(found, "bench")
    words = [text.get_text() for axes in figure.axes[1:] for text in axes.texts]
    assert words[0] == "not computed" and "unit passes" in words[1]
    assert "nothing to gain" in study_text(found, "bench") or "no unit passes" in study_text(found, "bench")
