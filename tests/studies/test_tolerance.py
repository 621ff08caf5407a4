"""Tolerance studies: closed cases, reproducible units, worst case, shares of the spread, ageing, bad input."""

from __future__ import annotations

import json
from collections.abc import Mapping
from typing import Any

import numpy as np
import pytest

from buckdesign.design.design_file import Design
from buckdesign.design.tolerances import Distribution, Tolerance
from buckdesign.errors import InputError
from buckdesign.output.text import to_json
from buckdesign.studies.ageing import CAPACITANCE, ESR
from buckdesign.studies.result_columns import RESULT_COLUMNS
from buckdesign.studies.study_effort import StudyEffort
from buckdesign.studies.tolerance import (
    one_unit,
    prepare_units,
    tolerance,
    tolerance_study,
    worse_than_corners,
)
from buckdesign.studies.tolerance_result import ToleranceStudy
from buckdesign.studies.unit_designs import EDDY_LOSS
from buckdesign.studies.unit_runs import PART_LIMITS, START
from buckdesign.studies.yields import wilson_interval
from tests.design.operating_designs import bench

QUICK = StudyEffort(units=40, samples=8, seed=4)


@pytest.fixture(scope="module")
def study() -> ToleranceStudy:
    return tolerance_study(bench(requirement=True), effort=QUICK)


def with_requirement(**changes: str | list[str] | None) -> Design:
    """The bench supply at one supply and load, asked for nothing but what is given."""
    asked: dict[str, Any] = {
        "supply": {"voltage": "20 V"},
        "output": {"voltage": "15 V", "current": ["10 mA", "10 mA"]},
    }
    asked["output"] |= changes
    return _carrying(bench(requirement=True), asked)


def _carrying(design: Design, asked: Mapping[str, Any]) -> Design:
    from dataclasses import replace
    from pathlib import Path

    from buckdesign.design.design_file import design_from_tree

    tree = design.tree() | {"requirement": asked}
    return replace(design_from_tree(tree, lambda *steps: None, path=Path("bench.design.toml")), source=None)


def divider(share: float, reference: float | None = None) -> dict[str, Tolerance]:
    one = Tolerance(low=-share, high=share)
    found = {"network.r1": one, "network.r2": one}
    if reference is not None:
        found["regulator.reference"] = Tolerance(low=-reference, high=reference)
    return found


def set_voltage(factor_1: Any, factor_2: Any, factor_reference: Any = 1.0) -> Any:
    """Output of the linear regulator with its divider and the feedback resistor, whose far end is the output too.

    Derived: ``V_ref (1 + R_2 (1/R_1 + 1/R_h)) + I_adj R_2``; values of the bench supply and the 1.5 A class.
    """
    r1, r2, rh = 240.0 * factor_1, 2700.0 * factor_2, 1e6
    return 1.25 * factor_reference * (1.0 + r2 * (1.0 / r1 + 1.0 / rh)) + 50e-6 * r2


ONLY_OUTPUT = StudyEffort(units=1500, samples=0, age_hours=0.0, electrical_only=True, seed=2)


@pytest.mark.parametrize("share", [0.03, 0.08])
def test_yield_of_a_divider_is_what_it_has_to_be(share: float) -> None:
    design = with_requirement(voltage="15.4 V", tolerance="3 %")
    found = tolerance_study(design, tolerances=divider(share), effort=ONLY_OUTPUT)
    # derived: share of the square of both resistors in which the output is within its tolerance
    grid = 1.0 + share * (2.0 * (np.arange(2000) + 0.5) / 2000 - 1.0)
    inside = np.abs(set_voltage(grid[:, None], grid[None, :]) / 15.4 - 1.0) <= 0.03
    low, high = wilson_interval(found.total.passed, found.total.units, quantile=3.3)
    assert low < inside.mean() < high
    assert 0.1 < inside.mean() < 0.9 and found.yield_by("output voltage").passed == found.total.passed


def test_every_unit_has_the_output_of_its_divider() -> None:
    design = with_requirement(voltage="15.4 V", tolerance="3 %")
    found = tolerance_study(design, tolerances=divider(0.05, 0.02), effort=ONLY_OUTPUT)
    factors = (found.factors[key] for key in ("network.r1", "network.r2", "regulator.reference"))
    # derived, see `set_voltage`; what is left is the drop in the output resistance, 2 mohm times the load and gain
    assert np.asarray(found.runs.columns["output_voltage_v"]) == pytest.approx(
        set_voltage(*factors), rel=5e-4
    )


def test_wider_tolerances_never_pass_more_units() -> None:
    design = with_requirement(voltage="15.4 V", tolerance="2 %")
    yields = [
        tolerance_study(design, tolerances=divider(share), effort=ONLY_OUTPUT).total.share
        for share in (0.005, 0.02, 0.05, 0.1)
    ]
    assert yields == sorted(yields, reverse=True)
    assert yields[0] > yields[-1] + 0.3


def test_shares_of_the_output_voltage_are_those_of_its_variance() -> None:
    # all units above the wanted 14 V, so that the margin is linear in the output
    design = with_requirement(voltage="14 V", tolerance="20 %")
    effort = StudyEffort(units=1, samples=256, age_hours=0.0, electrical_only=True)
    found = tolerance_study(design, tolerances=divider(0.01, 0.02), effort=effort).sensitivity
    assert found is not None and not found.held
    row = found.names.index("output voltage")
    # derived: variance of a uniform spread t is t^2/3; R_1 and R_2 act on V less V_ref, the reference on all but the
    # adjust current's part
    whole = set_voltage(1.0, 1.0)
    moves = {
        "network.r1": 0.01 * 1.25 * 2700.0 / 240.0,
        "network.r2": 0.01 * (whole - 1.25),
        "regulator.reference": 0.02 * (whole - 50e-6 * 2700.0),
    }
    total = sum(move**2 for move in moves.values())
    for place, key in enumerate(found.keys):
        wanted = moves[key] ** 2 / total
        assert found.first[row, place] == pytest.approx(wanted, abs=0.06)
        assert found.total[row, place] == pytest.approx(wanted, abs=0.06)
        assert found.first_low[row, place] <= found.first[row, place] <= found.first_high[row, place]
    assert found.variance[row] == pytest.approx(total / 3.0 / (0.2 * 14.0) ** 2, rel=0.1)


def test_worst_corner_of_a_divider() -> None:
    design = with_requirement(voltage="15.4 V", tolerance="3 %")
    found = tolerance_study(design, tolerances=divider(0.05, 0.02), effort=ONLY_OUTPUT)
    corners = found.worst_case
    assert corners.is_exhaustive
    worst = next(one for one in corners.worst if one.name == "output voltage")
    # derived: 15.4 V is below the middle, so the worst is the highest output
    assert worst.signs == {"network.r1": -1, "network.r2": 1, "regulator.reference": 1}
    assert worst.value == pytest.approx(set_voltage(0.95, 1.05, 1.02), rel=1e-3)
    assert worst.margin <= found.runs.margins("output voltage").min() and not worst.holds
    assert worst.leading[0] in worst.signs


def test_searched_corners_are_worse_than_any_unit_drawn(study: ToleranceStudy) -> None:
    assert not study.worst_case.is_exhaustive and len(study.varied) > 9
    by = {one.name: one for one in study.worst_case.worst}
    for name in ("output voltage", "highest frequency", "base drive", "transistor junction", START):
        assert by[name].margin <= study.runs.margins(name).min() + 1e-9
    assert set(by) == {name for name in study.shown if name != PART_LIMITS}
    for one in by.values():
        assert set(one.signs.values()) <= {-1, 1} and len(one.signs) == len(study.varied)


def test_a_unit_worse_than_every_corner_is_named(study: ToleranceStudy) -> None:
    from dataclasses import replace

    worst = next(one for one in study.worst_case.worst if one.name == "output voltage")
    margins = study.runs.margins("output voltage")
    unit = int(margins.argmin())
    assert worse_than_corners(study.runs, [worst]) == []
    milder = replace(worst, margin=float(margins[unit]) + 0.1)
    assert worse_than_corners(study.runs, [milder]) == [f"output voltage (unit {unit})"]
    assert worse_than_corners(study.runs, [replace(worst, margin=float(margins[unit]) + 0.001)]) == []


def test_what_is_not_known_is_told_from_what_differs(study: ToleranceStudy) -> None:
    told = "can't be bought tighter"
    assert any(told in one for one in study.warnings)
    quick = StudyEffort(units=2, samples=0, age_hours=0.0)
    measured = bench({"regulator.output_inductance": "0.11 uH"}, requirement=True)
    by = {one.key: one for one in tolerance_study(measured, effort=quick).varied}
    # own choice of the package: factor 1.5 between units where the value is given
    assert by["regulator.output_inductance"].tolerance.high == pytest.approx(0.5)
    assert not any(told in one for one in tolerance_study(measured, effort=quick).warnings)


def test_a_unit_by_itself_is_the_one_in_the_table(study: ToleranceStudy) -> None:
    setting = prepare_units(bench(requirement=True), effort=QUICK)
    for unit in (0, 17, 39):
        alone = one_unit(setting, unit)
        for key, value in alone.values().items():
            assert value == study.values()[key][unit]
        assert alone.runs.margin[0] == pytest.approx(study.runs.margin[unit], rel=1e-9, nan_ok=True)
        assert len(alone.points["supply_v"]) == len(study.model.points)


def test_more_units_are_the_same_and_more(study: ToleranceStudy) -> None:
    setting = prepare_units(bench(requirement=True), effort=QUICK)
    for key, values in setting.drawn(0, 60).items():
        assert (values[:40] == study.factors[key]).all()
    other = prepare_units(bench(requirement=True), effort=StudyEffort(seed=5)).drawn(0, 40)
    assert all((values != study.factors[key]).any() for key, values in other.items())


def test_a_tolerance_more_leaves_the_other_values_alone() -> None:
    design = bench(requirement=True)
    few = prepare_units(design, tolerances=divider(0.05)).drawn(0, 5)
    more = prepare_units(design, tolerances=divider(0.05, 0.02)).drawn(0, 5)
    assert all((more[key] == few[key]).all() for key in few)


def test_a_unit_passes_where_its_worst_point_does(study: ToleranceStudy) -> None:
    runs = study.runs
    single = [column for column, name in enumerate(runs.names) if name != PART_LIMITS]
    assert (runs.passes == (runs.margin[:, single] >= -1e-9).all(axis=1)).all()
    assert (runs.margins(PART_LIMITS) == runs.margin[:, -len(runs.parts) :].min(axis=1)).all()
    for unit in range(len(runs)):
        assert bool(runs.violated(unit)) != bool(runs.passes[unit])


def test_points_left_out_do_not_change_the_verdict() -> None:
    design, effort = bench(requirement=True), StudyEffort(units=12, seed=4, all_points=True)
    every = prepare_units(design, effort=effort)
    some = prepare_units(design, effort=QUICK)
    factors = every.drawn(0, 12)
    assert len(some.model.points) < len(every.model.points)
    margins = [setting.model.evaluate(factors).margins("ripple") for setting in (every, some)]
    assert margins[0] == pytest.approx(margins[1], rel=0.05, abs=0.02)


def test_ambient_extremes_are_both_looked_at() -> None:
    design = _carrying(
        bench(requirement=True),
        {
            "supply": {"voltage": ["18 V", "20 V", "22 V"]},
            "output": {"voltage": "15 V", "current": ["20 mA", "3 A"], "ripple": "250 mV"},
            "limits": {"ambient": ["0 degC", "40 degC"]},
        },
    )
    setting = prepare_units(design, effort=QUICK)
    assert set(setting.model.points.ambient_c) == {0.0, 40.0}
    runs = setting.model.evaluate(setting.drawn(0, 3))
    # derived: S falls with the gain, which falls in the cold, and with the ESR, which grows there
    assert (setting.model.points.ambient_c[runs.point[:, runs.names.index(START)]] == 0.0).all()


def test_table_and_summary(study: ToleranceStudy) -> None:
    frame = study.frame()
    keys = [one.key for one in study.varied]
    assert list(frame.columns[: len(keys) + len(RESULT_COLUMNS)]) == [*keys, *RESULT_COLUMNS]
    assert len(frame) == 40 and (frame["unit"] == np.arange(40)).all()
    assert frame.attrs["summary"]["yield"] == pytest.approx(frame["passes"].mean())
    assert (frame["passes"] == (frame["violated"] == "")).all()
    by = {one.key: one for one in study.varied}
    for key in keys:
        factors = frame[key] / by[key].value
        tolerance = by[key].tolerance
        assert factors.between(1.0 + tolerance.low - 1e-12, 1.0 + tolerance.high + 1e-12).all()
    worst = frame["margin"].idxmin()
    assert study.worst_units()[0].unit == worst
    assert [one.margin for one in study.worst_units()] == sorted(frame["margin"])[:10]


def test_json_has_the_agreed_keys(study: ToleranceStudy) -> None:
    def refuse(word: str) -> None:
        raise AssertionError(word)

    made = json.loads(to_json(study.to_dict()), parse_constant=refuse)
    assert made.keys() == {"rows", "summary", "warnings"}
    assert len(made["rows"]) == 40 and list(made["rows"][0]) == list(study.table())
    summary = made["summary"]
    assert {
        "yield", "yield_low", "yield_high", "requirements", "part_limits", "worst_case", "worst_units",
        "sensitivity", "tighter", "aged", "tolerances", "points", "units", "seed",
    } <= summary.keys()  # fmt: skip
    for one in (
        summary,
        summary["aged"],
        *summary["requirements"].values(),
        *summary["part_limits"].values(),
    ):
        assert 0.0 <= one["yield_low"] <= one["yield"] <= one["yield_high"] <= 1.0
    assert PART_LIMITS in summary["requirements"]
    corners = summary["worst_case"]
    assert corners["requirements"].keys() == set(study.runs.requirements) & set(study.shown) - {PART_LIMITS}
    assert corners["part_limits"].keys() == set(study.runs.parts) & set(study.shown)


def test_yields_fit_together(study: ToleranceStudy) -> None:
    single = [study.yield_by(name).share for name in study.runs.requirements]
    assert study.total.share <= min(single)
    assert study.total.share >= 1.0 - sum(1.0 - share for share in single) - 1e-12


def test_the_same_again_is_the_same(study: ToleranceStudy) -> None:
    again = tolerance_study(bench(requirement=True), effort=QUICK)
    assert to_json(again.summary()) == to_json(study.summary())


def test_from_python() -> None:
    design = with_requirement(voltage="15.4 V", tolerance="3 %")
    frame = tolerance(design, tolerances=divider(0.05), units=20, seed=1, electrical_only=True)
    assert len(frame) == 20 and frame.attrs["summary"]["seed"] == 1
    assert list(frame.columns[:2]) == ["network.r1", "network.r2"]
    assert frame.attrs["summary"]["electrical_only"] is True


class TestAgeing:
    def test_shares_are_hours_over_life(self, study: ToleranceStudy) -> None:
        wear = study.wear
        assert wear is not None and study.aged is not None
        # derived: 2000 h at 105 degC doubles every 10 K below, at most 15 years (part table, 10 K rule)
        life = np.minimum(
            (study.model.nominal.output_capacitor.life or np.nan)
            * 2.0 ** ((105.0 - study.runs.capacitor_c) / 10.0),
            15.0 * 8760.0,
        )
        assert wear.capacitor_share == pytest.approx(20_000.0 / life)
        # derived: 100 000 h at 65 degC, halved by every 10 K more
        assert wear.core_share == pytest.approx(0.2 * 2.0 ** ((study.runs.choke_c - 65.0) / 10.0))
        assert (study.runs.choke_c > 25.0).all()

    def test_factors(self, study: ToleranceStudy) -> None:
        assert study.wear is not None
        aged = study.wear.factors(study.factors)
        assert (aged[CAPACITANCE] < study.factors[CAPACITANCE]).all()
        assert (aged[ESR] > study.factors[ESR]).all()
        assert (aged[EDDY_LOSS] > 1.0).all()
        unchanged = set(study.factors) - {CAPACITANCE, ESR}
        assert all((aged[key] == study.factors[key]).all() for key in unchanged)

    def test_more_eddy_loss_heats_the_core(self, study: ToleranceStudy) -> None:
        found = study.model.evaluate({EDDY_LOSS: np.array([1.0, 3.0, 9.0, 100.0])})
        assert (np.diff(found.choke_c) > 0.0).all()
        assert (np.diff(found.margins("choke temperature")) < 0.0).all()

    def test_past_its_life_is_said(self) -> None:
        design = with_requirement(voltage="15.4 V", tolerance="3 %")
        effort = StudyEffort(units=2, samples=0, age_hours=300_000.0)
        found = tolerance_study(design, tolerances=divider(0.01), effort=effort)
        # derived: more than the 15 years that makers claim at most
        assert any("of 100 % of the units is past its life" in one for one in found.warnings)

    def test_nothing_ages_in_no_time(self, study: ToleranceStudy) -> None:
        from buckdesign.studies.ageing import wear_of

        none = wear_of(study.runs, study.model.nominal, 0.0).factors(study.factors)
        assert all((none[key] == study.factors[key]).all() for key in study.factors)
        assert (none[EDDY_LOSS] == 1.0).all()
        quick = StudyEffort(units=2, samples=0, age_hours=0.0)
        without = tolerance_study(bench(requirement=True), effort=quick)
        assert without.aged is None and without.summary()["aged"] is None

    def test_what_is_not_known_does_not_age(self) -> None:
        design = with_requirement(voltage="15.4 V", tolerance="3 %")
        effort = StudyEffort(units=2, samples=0, electrical_only=True)
        found = tolerance_study(design, tolerances=divider(0.01), effort=effort)
        assert any("core is not aged" in one for one in found.warnings)
        assert found.summary()["aged"]["core_ageing_used"] is None


class TestBadInput:
    def test_nothing_to_count_against(self) -> None:
        with pytest.raises(InputError, match="no requirement to count against"):
            tolerance(bench())

    @pytest.mark.parametrize(
        ("values", "told"),
        [
            ({"units": 0}, "at least 1"),
            ({"seed": -1}, "0 or more"),
            ({"samples": 48}, "power of two"),
            ({"samples": 1}, "power of two"),
            ({"age_hours": -1.0}, "0 h to 300000 h"),
            ({"age_hours": 1e6}, "0 h to 300000 h"),
            ({"age_hours": float("nan")}, "0 h to 300000 h"),
        ],
    )
    def test_effort(self, values: dict[str, Any], told: str) -> None:
        with pytest.raises(InputError, match=told):
            StudyEffort(**values)

    def test_a_negative_unit(self) -> None:
        with pytest.raises(InputError, match="0 or more"):
            one_unit(prepare_units(bench(requirement=True)), -1)

    def test_a_lognormal_share_below_nothing(self) -> None:
        narrow = Tolerance(low=-0.9, high=9.0, distribution=Distribution.LOGNORMAL)
        design = with_requirement(voltage="15.4 V", tolerance="3 %")
        found = tolerance_study(design, tolerances={"network.r2": narrow}, effort=ONLY_OUTPUT)
        assert found.total.share < 0.2 and np.isfinite(found.runs.margin[:, 0]).all()
