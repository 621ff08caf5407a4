"""Sweeps: rows against single simulations, the same table however it is computed, and what it comes to."""

from __future__ import annotations

import json
import math
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from buckdesign.design.design_file import design_with, read_design
from buckdesign.design.operating import operate, points_of
from buckdesign.design.resolve import resolve_design
from buckdesign.errors import FileAccessError, InputError
from buckdesign.studies.front import is_on_front
from buckdesign.studies.point_model import PointModel
from buckdesign.studies.result_columns import RESULT_COLUMNS
from buckdesign.studies.sweep import run_sweep, sweep, sweep_task
from buckdesign.studies.sweep_summary import SweepSummary

EXAMPLES = Path(__file__).parents[2] / "examples"

STUDY = f"""
base = "{EXAMPLES / "radio_as_built.design.toml"}"
[vary]
"choke.turns" = {{ from = 60, to = 100, step = 20 }}
"network.rh" = ["1 Mohm", "2.7 Mohm"]
"rectifier.part" = ["1N5822", "1N5811"]
"output.current" = ["0.2 A", "2 A"]
[vary.together]
"supply.voltage" = ["21 V", "29 V"]
"thermal.ambient" = ["5 degC", "40 degC"]
[best]
minimise = ["total_loss_w", "ripple_v"]
subject_to = ["choke_c < 60", "frequency_hz > 5 kHz"]
"""


def written(folder: Path, text: str, name: str = "radio.study.toml") -> Path:
    path = folder / name
    path.write_text(text)
    return path


@pytest.fixture(scope="module")
def study(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return written(tmp_path_factory.mktemp("study"), STUDY)


@pytest.fixture(scope="module")
def table(study: Path) -> pd.DataFrame:
    return sweep(study, jobs=1)


def test_columns_and_order(table: pd.DataFrame) -> None:
    keys = ["choke.turns", "network.rh", "rectifier.part", "output.current", "supply.voltage", "thermal.ambient"]
    said = ["settled", "within_limits", "violated", "constraints_hold", "failure"]
    assert list(table.columns) == [*keys, *RESULT_COLUMNS, *said]
    assert len(table) == 3 * 2 * 2 * 2 * 2
    assert table["choke.turns"].is_monotonic_increasing
    assert table["supply.voltage"].tolist() == [21.0, 29.0] * 24
    assert table["thermal.ambient"].tolist() == [5.0, 40.0] * 24
    assert (table["failure"] == "").all()


@pytest.mark.parametrize("row", [0, 17, 47])
def test_a_row_is_the_simulation_of_that_design(table: pd.DataFrame, row: int) -> None:
    keys = list(table.columns[:6])
    base = read_design(EXAMPLES / "radio_as_built.design.toml")
    values = {key: table[key][row].item() if hasattr(table[key][row], "item") else table[key][row] for key in keys}
    resolved = resolve_design(design_with(base, values))
    point = operate(resolved, points_of(resolved))[0]
    expected = pd.json_normalize(point.to_dict()).iloc[0]
    for name in RESULT_COLUMNS:
        found, wanted = table[name][row], expected[name]
        if isinstance(wanted, str):
            assert found == wanted
        elif wanted is None or math.isnan(wanted):
            assert math.isnan(found), name
        else:
            assert found == pytest.approx(wanted, rel=1e-5, abs=1e-7), name
    failed = [check.name for check in point.checks if not check.holds]
    assert table["violated"][row] == "; ".join(failed)
    assert bool(table["within_limits"][row]) is not bool(failed)


def test_constraints_and_front(table: pd.DataFrame) -> None:
    keeps = (table["choke_c"] < 60.0) & (table["frequency_hz"] > 5e3)
    assert table["constraints_hold"].tolist() == keeps.tolist()
    assert 0 < keeps.sum() < len(table)
    summary = table.attrs["summary"]
    costs = table.loc[keeps, ["total_loss_w", "ripple_v"]].to_numpy()
    assert summary["front_rows"] == np.flatnonzero(keeps)[is_on_front(costs)].tolist()
    assert summary["keeping_constraints"] == keeps.sum()
    assert {one["row"] for one in summary["best"]} <= set(summary["front_rows"])
    first = summary["best"][0]
    assert first["total_loss_w"] == table["total_loss_w"][first["row"]]
    json.dumps(summary, allow_nan=False)


def test_losses_sum_to_input_minus_output(table: pd.DataFrame) -> None:
    losses = table[[name for name in RESULT_COLUMNS if name.startswith("losses_w.")]].sum(axis=1)
    np.testing.assert_allclose(losses, table["total_loss_w"], rtol=1e-6)
    np.testing.assert_allclose(table["input_power_w"] - table["output_power_w"], losses, rtol=1e-6, atol=1e-7)


def test_the_same_however_it_is_cut(study: Path) -> None:
    work = sweep_task(study).work
    assert isinstance(work, PointModel)
    whole = work.evaluate(0, work.count, jobs=2)
    pieces = [work.evaluate(start, min(start + 7, work.count)) for start in range(0, work.count, 7)]
    for name in work.columns:
        joined = [value for piece in pieces for value in list(piece[name])]
        if isinstance(joined[0], float):
            np.testing.assert_allclose(np.array(joined), whole[name], rtol=1e-6, atol=1e-9, err_msg=name)
        else:
            assert joined == list(whole[name])


def test_table_does_not_depend_on_threads(study: Path, tmp_path: Path) -> None:
    for jobs in (1, 2):
        run_sweep(sweep_task(study), tmp_path / f"{jobs}.csv", jobs=jobs)
    assert (tmp_path / "1.csv").read_bytes() == (tmp_path / "2.csv").read_bytes()


def test_an_unfinished_table_goes_on_to_the_same(study: Path, tmp_path: Path) -> None:
    text = STUDY.replace("step = 20", "step = 1")
    long = written(tmp_path, text)
    task = sweep_task(long)
    whole = run_sweep(task, tmp_path / "whole.csv")

    class Stop(Exception):
        pass

    def stop(progress: object) -> None:
        raise Stop

    with pytest.raises(Stop):
        run_sweep(task, tmp_path / "broken.csv", progress=stop)
    assert not (tmp_path / "broken.csv").exists()
    again = run_sweep(task, tmp_path / "broken.csv")
    assert 0 < again.computed < task.work.count
    assert (tmp_path / "whole.csv").read_bytes() == (tmp_path / "broken.csv").read_bytes()
    assert whole.to_dict() | {"table": "", "computed_now": 0} == again.to_dict() | {"table": "", "computed_now": 0}
    pd.testing.assert_frame_equal(whole.sample(), again.sample())
    pd.testing.assert_frame_equal(whole.front(), again.front())
    third = run_sweep(task, tmp_path / "broken.csv")
    assert third.computed == 0
    assert third.to_dict()["best"] == whole.to_dict()["best"]


def test_changed_study_is_refused_and_says_what(study: Path, tmp_path: Path) -> None:
    path = tmp_path / "table.csv"
    run_sweep(sweep_task(study), path)
    before = path.read_bytes()
    changed = written(tmp_path, STUDY.replace('"2.7 Mohm"', '"3.3 Mohm"'))
    with pytest.raises(InputError, match=r"network\.rh.*2\.7 Mohm.*3\.3 Mohm.*--restart"):
        run_sweep(sweep_task(changed), path)
    assert path.read_bytes() == before
    design = EXAMPLES / "radio_as_built.design.toml"
    (tmp_path / "other.design.toml").write_text(design.read_text().replace("2.37 kohm", "2.4 kohm"))
    other = written(tmp_path, STUDY.replace(str(design), "other.design.toml"))
    with pytest.raises(InputError, match=r"design\.network\.r2"):
        run_sweep(sweep_task(other), path)
    run_sweep(sweep_task(changed), path, restart=True)
    assert path.read_bytes() != before


def test_points_that_fail_are_rows_with_their_reason(tmp_path: Path) -> None:
    text = f"""
base = "{EXAMPLES / "radio_as_built.design.toml"}"
[vary]
"choke.wire" = ["0.8 mm", "1.0 mm"]
"thermal.ambient" = ["25 degC", "230 degC"]
"""
    result = run_sweep(sweep_task(written(tmp_path, text)), tmp_path / "table.csv")
    table = pd.concat([pd.DataFrame([row]) for row in result.rows()], ignore_index=True)
    assert result.failed == 2
    assert table["failure"].str.contains("must be below the junction limit").tolist() == [False, True, False, True]
    assert table["total_loss_w"].isna().tolist() == [False, True, False, True]
    summary = result.to_dict()
    assert sum(one["points"] for one in summary["failures"]) == 2
    assert [one["row"] for one in summary["best"]] and all(one["row"] in (0, 2) for one in summary["best"])


def test_one_objective_ranks_all_rows(tmp_path: Path) -> None:
    text = STUDY.replace('minimise = ["total_loss_w", "ripple_v"]', 'maximise = "efficiency"')
    table = sweep(written(tmp_path, text))
    best = table.attrs["summary"]["best"]
    allowed = table[table["constraints_hold"].astype(bool)]
    expected = allowed["efficiency"].sort_values(ascending=False, kind="stable").index[:10].tolist()
    assert [one["row"] for one in best] == expected


def test_too_many_points_are_refused_before_anything_is_written(tmp_path: Path) -> None:
    text = STUDY.replace("step = 20", "step = 1").replace(
        '["1 Mohm", "2.7 Mohm"]', '{ from = "1 Mohm", to = "2 Mohm", count = 100_000 }'
    )
    task = sweep_task(written(tmp_path, text))
    assert task.work.count == 41 * 100_000 * 8
    with pytest.raises(InputError, match="--allow 32800000"):
        run_sweep(task, tmp_path / "table.csv")
    with pytest.raises(InputError, match="--allow 32800000"):
        run_sweep(task, tmp_path / "table.csv", allow=10)
    assert not list(tmp_path.glob("table*"))


def test_other_aims_look_at_the_same_table(study: Path, tmp_path: Path) -> None:
    first = run_sweep(sweep_task(study), tmp_path / "table.csv")
    assert first.computed == 48
    other = written(tmp_path, STUDY.replace('minimise = ["total_loss_w", "ripple_v"]', 'maximise = "efficiency"'))
    second = run_sweep(sweep_task(other), tmp_path / "table.csv")
    assert second.computed == 0
    assert second.to_dict()["maximise"] == ["efficiency"]
    best = second.best()
    assert best["efficiency"].is_monotonic_decreasing and len(best) > 1


def test_what_a_study_is_computed_from_is_never_replaced(tmp_path: Path) -> None:
    base = tmp_path / "base.csv"
    base.write_text((EXAMPLES / "radio_as_built.design.toml").read_text())
    study = written(tmp_path, STUDY.replace(str(EXAMPLES / "radio_as_built.design.toml"), "base.csv"), "study.csv")
    (tmp_path / "link.csv").symlink_to(study)
    before = {path: path.read_bytes() for path in tmp_path.iterdir()}
    for name in ("base.csv", "study.csv", "link.csv"):
        with pytest.raises(FileAccessError, match=rf"{name}.*computed from this file"):
            run_sweep(sweep_task(study), tmp_path / name, restart=True)
    assert {path: path.read_bytes() for path in tmp_path.iterdir()} == before


@pytest.mark.parametrize("name", ["table.xlsx", "table", "table.csv.gz", "table.PARQUET"])
def test_a_table_of_another_format_is_refused(study: Path, tmp_path: Path, name: str) -> None:
    with pytest.raises(FileAccessError, match=r"\.csv or \.parquet"):
        run_sweep(sweep_task(study), tmp_path / name)
    assert not list(tmp_path.iterdir())


def test_what_the_electrical_model_does_not_have_is_no_aim(study: Path) -> None:
    with pytest.raises(InputError, match=r"choke_c.*--electrical-only"):
        sweep_task(study, electrical_only=True)


def test_points_without_the_result_that_is_looked_for_are_counted(tmp_path: Path) -> None:
    text = f"""
base = "{EXAMPLES / "spot.design.toml"}"
[vary]
"output.current" = ["1 A", "2 A"]
[best]
minimise = "choke_c"
"""
    result = run_sweep(sweep_task(written(tmp_path, text)), tmp_path / "table.csv")
    assert result.summary.unknown["choke_c"] == 2 and not len(result.best())
    text = text.replace('minimise = "choke_c"', 'minimise = "ripple_v"\nsubject_to = "junction_c.rectifier < 400"')
    result = run_sweep(sweep_task(written(tmp_path, text)), tmp_path / "other.csv")
    assert result.summary.unknown == {"ripple_v": 0, "junction_c.rectifier": 2}
    assert result.to_dict()["keeping_constraints"] == 0
    again = run_sweep(sweep_task(written(tmp_path, text)), tmp_path / "other.csv")
    assert again.computed == 0 and again.summary.unknown == result.summary.unknown


def test_unsettled_points_are_counted(study: Path, tmp_path: Path) -> None:
    result = run_sweep(sweep_task(study), tmp_path / "table.csv")
    settled = [row["settled"] for row in result.rows()]
    assert result.to_dict()["unsettled"] == settled.count(False)
    lines = (tmp_path / "table.csv").read_text().replace(",true,", ",false,", 1)
    columns: dict[str, list[object]] = {name: [] for name in result.task.objectives.needed()}
    for row in result.rows():
        for name in columns:
            columns[name].append(float("nan") if row[name] is None else row[name])
    columns["settled"][:3] = [False] * 3
    summary = SweepSummary(objectives=result.task.objectives, count=48)
    summary.add(0, lambda place: lines.splitlines(keepends=True)[place + 1].encode(), columns)
    assert summary.unsettled == settled.count(False) + settled[:3].count(True)


def test_units_of_the_page(study: Path) -> None:
    units = sweep_task(study).units
    assert units["efficiency"] == units["duty"] == "%"
    assert units["start_margin"] == units["period_cycles"] == units["cycle_spread"] == "1"
    assert units["choke_volume_cm3"] == "cm3" and units["thermal.ambient"] == "degC"


def test_electrical_only_leaves_temperatures_unknown(tmp_path: Path) -> None:
    table = sweep(written(tmp_path, STUDY.replace('"choke_c < 60", ', "")), electrical_only=True)
    assert table["junction_c.transistor"].isna().all() and table["choke_c"].isna().all()
    assert (table["losses_w.choke_core"] == 0.0).all()
    assert (table["total_loss_w"] > 0.0).all()


def test_parquet_holds_the_same(study: Path, tmp_path: Path) -> None:
    pytest.importorskip("pyarrow")
    text, binary = (sweep(study, tmp_path / name) for name in ("table.csv", "table.parquet"))
    pd.testing.assert_frame_equal(text, binary)
    pd.testing.assert_frame_equal(pd.read_parquet(tmp_path / "table.parquet")[["ripple_v"]], text[["ripple_v"]])


def test_redesign_at_each_point(tmp_path: Path) -> None:
    text = f"""
requirement = "{EXAMPLES / "logger.toml"}"
[vary]
"output.voltage" = ["5 V", "23.9 V"]
[best]
minimise = "worst.total_loss_w"
"""
    result = run_sweep(sweep_task(written(tmp_path, text)), tmp_path / "table.csv")
    good, bad = result.rows()
    assert good["failure"] == "" and good["within_limits"] is True
    assert good["output_voltage_v"] == pytest.approx(5.0, rel=0.04)
    assert good["values.turns"] > 0 and good["values.rectifier"]
    assert good["worst.efficiency"] <= good["efficiency"] + 1e-9
    assert bad["failure"] and bad["output_voltage_v"] is None
    assert result.failed == 1
    assert [one["row"] for one in result.to_dict()["best"]] == [0]
