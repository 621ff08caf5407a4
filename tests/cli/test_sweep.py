"""``buckdesign sweep`` as a user runs it: output, figures, bad input, and kills at any moment."""

from __future__ import annotations

import json
import os
import random
import signal
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

import pandas as pd
import pytest

from buckdesign.output.study_plots import effects_figure, front_figure, study_points
from buckdesign.studies.sweep import run_sweep, sweep_task
from tests.cli.conftest import Outcome

EXAMPLES = Path(__file__).parents[2] / "examples"
BASE = EXAMPLES / "radio_as_built.design.toml"

STUDY = f"""base = "{BASE}"
[vary]
"choke.turns" = [80, 93]
"output_capacitor.esr" = {{ from = "25 mohm", to = "100 mohm", count = 3, spacing = "log" }}
"output.current" = ["0.5 A", "2 A"]
[best]
minimise = ["total_loss_w", "ripple_v"]
subject_to = ["frequency_hz > 4 kHz"]
"""

Program = Callable[..., Outcome]


@pytest.fixture
def study(tmp_path: Path) -> Path:
    path = tmp_path / "radio.study.toml"
    path.write_text(STUDY)
    return path


def test_table_and_page(program: Program, study: Path, tmp_path: Path) -> None:
    done = program("sweep", study, "--jobs", "1")
    assert done.status == 0, done.err
    table = pd.read_csv(tmp_path / "radio.study.csv")
    assert len(table) == 12
    assert done.out.startswith("least total_loss_w and least ripple_v among those with frequency_hz > 4 kHz")
    assert "12" in done.out and str(tmp_path / "radio.study.csv") in done.out
    again = program("sweep", study)
    assert again.status == 0
    assert "12 of 12 points are there already" in again.err
    assert "0 of them computed now" in again.out


def test_json(program: Program, study: Path, tmp_path: Path) -> None:
    done = program("sweep", study, "--output", tmp_path / "table.csv", "--json")
    found = json.loads(done.out)
    assert list(found) == ["rows", "summary", "warnings"]
    table = pd.read_csv(tmp_path / "table.csv")
    assert len(found["rows"]) == found["summary"]["points"] == 12
    assert list(found["rows"][0]) == list(table.columns)
    assert found["rows"][5]["ripple_v"] == table["ripple_v"][5]
    assert found["rows"][0]["load_ohm"] is None
    assert found["rows"][0]["violated"] == "" or isinstance(found["rows"][0]["violated"], str)


@pytest.mark.parametrize("kind", ["svg", "png"])
def test_figures(program: Program, study: Path, tmp_path: Path, kind: str) -> None:
    figures = [tmp_path / f"front.{kind}", tmp_path / f"effects.{kind}"]
    options = ["--plot", figures[0], "--effects", figures[1], "--result", "choke_c", "--result", "efficiency"]
    done = program("sweep", study, "--output", tmp_path / "table.csv", *options)
    assert done.status == 0, done.err
    begins = b"<?xml" if kind == "svg" else b"\x89PNG"
    assert all(figure.read_bytes().startswith(begins) for figure in figures)
    before = [figure.read_bytes() for figure in figures]
    kept = program("sweep", study, "--output", tmp_path / "table.csv", *options)
    assert kept.status == 2 and "--force" in kept.err
    program("sweep", study, "--output", tmp_path / "table.csv", *options, "--force")
    assert [figure.read_bytes() for figure in figures] == before


def test_page_where_no_point_can_be_drawn(program: Program, study: Path, tmp_path: Path) -> None:
    study.write_text(STUDY.replace("[best]", '"thermal.ambient" = ["300 degC"]\n[best]'))
    done = program("sweep", study, "--plot", tmp_path / "front.svg")
    assert done.status == 4
    assert done.out.startswith("no point could be computed") and "why points failed" in done.out
    assert "nothing to draw" in done.err and not (tmp_path / "front.svg").exists()


def test_page_tells_what_the_best_rows_are(program: Program, study: Path) -> None:
    text = STUDY.replace('["0.5 A", "2 A"]', '["0.5 A", "2 A"]\n"supply.voltage" = ["15 V", "24 V"]')
    study.write_text(
        text.replace('["total_loss_w", "ripple_v"]', '"total_loss_w"').replace("subject_to", "#")
    )
    out = " ".join(program("sweep", study).out.split())
    assert "dropout" in out and "rows shown violate limits" in out
    assert "kindest output.current and supply.voltage" in out
    assert "requirement that the design carries" in out


def test_a_wide_table_goes_on_below(program: Program, study: Path) -> None:
    more = (
        '"thermal.on_heatsink" = [["transistor"], ["transistor", "regulator"]]\n"thermal.heatsink" = [5, 6]\n'
    )
    names = [f"low-impedance electrolytic {size}" for size in ("680 uF 25 V", "330 uF 50 V")]
    parts = f'"output_capacitor.part" = {json.dumps(names)}'
    study.write_text(
        STUDY.replace("[best]", f"{more}{parts}\n[best]").replace('"ripple_v"', '"choke_c", "start_margin"')
    )
    done = program("sweep", study)
    page = [line for line in done.out.splitlines() if not line.startswith("table: ")]
    assert max(map(len, page)) <= 118
    headings = [line.split() for line in page if line.startswith("row ")]
    assert len(headings) > 1 and all(len(set(one)) == len(one) for one in headings)
    assert "on_heatsink" in headings[0]
    assert any("start_margin" in one for one in headings) and "4000 %" not in done.out


def test_failing_points_end_with_status_4(program: Program, study: Path) -> None:
    ambient = '"thermal.ambient" = ["25 degC", "300 degC"]\n'
    study.write_text(STUDY.replace('"output.current" =', f'{ambient}"output.current" ='))
    done = program("sweep", study)
    assert done.status == 4
    assert "why points failed" in done.out and "12 x" in done.out
    table = pd.read_csv(study.with_name("radio.study.csv"), keep_default_na=False)
    assert (table["failure"] != "").sum() == 12


@pytest.mark.parametrize(
    ("was", "is_now", "told"),
    [
        ('"choke.turns" =', '"choke.turn" =', "choke.turns"),
        ("[80, 93]", "[]", "empty"),
        ('from = "25 mohm"', 'from = "0 mohm"', "log"),
        ("count = 3", "count = 0", "count"),
        ('"frequency_hz > 4 kHz"', '"frequency_hz >> 4 kHz"', "frequency_hz >> 4 kHz"),
        ('"frequency_hz > 4 kHz"', '"__import__(0) > 4"', "varied key"),
        ('"frequency_hz > 4 kHz"', '"frequency_hz > 4 mV"', "4 mV"),
        ('"ripple_v"]', '"riple_v"]', "ripple_v"),
        ("[best]", "[bset]", "best"),
        (str(BASE), "nowhere.design.toml", "nowhere.design.toml"),
    ],
)
def test_bad_studies(program: Program, study: Path, was: str, is_now: str, told: str) -> None:
    assert was in STUDY
    study.write_text(STUDY.replace(was, is_now))
    done = program("sweep", study)
    assert done.status == 2
    assert told in done.err
    assert all(line.startswith(str(study)) for line in done.err.strip().splitlines()), done.err
    assert "Traceback" not in done.err and not done.out
    assert not list(study.parent.glob("*.csv*"))


@pytest.mark.parametrize(
    ("options", "told"),
    [
        (["--allow", "11"], "--allow 12"),
        (["--cluster", "nonsense"], "tcp://host:port"),
        (["--output", "no/such/folder/table.csv"], "folder"),
        (["--plot", "front.gif"], ".svg"),
        (["--effects", "effects.svg", "--result", "ripple"], "ripple_v"),
        (["--jobs", "0"], "jobs"),
        (["--plot", "one.svg", "--effects", "./one.svg"], "--plot and --effects: the same file"),
        (["--output", "table.xlsx"], ".csv or .parquet"),
        (["--output", "radio.study.toml", "--restart"], ".csv or .parquet"),
    ],
)
def test_bad_command_lines(
    program: Program, study: Path, options: list[str], told: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(study.parent)
    done = program("sweep", study, *options)
    assert done.status == 2
    assert told in done.err and "Traceback" not in done.err
    assert not list(study.parent.glob("*.csv*"))


def test_a_file_of_someone_else_is_kept(program: Program, study: Path, tmp_path: Path) -> None:
    table = tmp_path / "mine.csv"
    table.write_text("precious\n")
    done = program("sweep", study, "--output", table)
    assert done.status == 2 and "mine.csv" in done.err and "--restart" in done.err
    assert table.read_text() == "precious\n"
    assert program("sweep", study, "--output", table, "--restart").status == 0
    assert len(pd.read_csv(table)) == 12


def test_a_table_of_parts_is_kept(program: Program, study: Path, tmp_path: Path) -> None:
    parts = tmp_path / "parts.csv"
    parts.write_text(
        "name,outer_diameter [mm],inner_diameter [mm],height [mm],source,how\nR 25/15/10,25,15,10,own,measured\n"
    )
    before = parts.read_bytes()
    done = program("sweep", study, "--parts", parts, "--output", parts, "--restart")
    assert done.status == 2 and "parts are read from this file" in done.err
    assert parts.read_bytes() == before and not list(tmp_path.glob("parts.csv.*"))


def test_axes_of_the_effects(study: Path, tmp_path: Path) -> None:
    names = [f"low-impedance electrolytic {size}" for size in ("680 uF 25 V", "330 uF 50 V")]
    lists = [["transistor", "regulator"], ["transistor", "regulator", "rectifier"]]
    varied = f"""
"output_capacitor.part" = {json.dumps(names)}
"thermal.on_heatsink" = {json.dumps(lists)}
"network.rh" = {{ from = "1 Mohm", to = "3 Mohm", spacing = "log" }}
"thermal.ambient" = {{ from = "0.1 degC", to = "40 degC" }}
[sample]
method = "random"
count = 40
[best]
minimise = ["total_loss_w", "ripple_v", "choke_c"]
maximise = "start_margin"
"""
    study.write_text(STUDY[: STUDY.index("[vary]")] + "[vary]" + varied)
    points = study_points(run_sweep(sweep_task(study), tmp_path / "table.csv", jobs=1))
    parts, lists_drawn, rh, ambient = effects_figure(points, ["ripple_v"]).axes
    for axes, count in ((parts, 2), (lists_drawn, 2)):
        assert len({label.get_text() for label in axes.get_xticklabels()}) == count
    assert (rh.get_xscale(), ambient.get_xscale()) == ("log", "linear")
    assert len(front_figure(points).axes) == 6


LONG = STUDY.replace("[80, 93]", "{ from = 60, to = 100, step = 1 }").replace("count = 3", "count = 40")
"""3280 points: some seconds, and enough for worker processes."""


def start(study: Path, table: Path) -> subprocess.Popen[bytes]:
    words = ["sweep", str(study), "--output", str(table), "--jobs", "2", "--electrical-only"]
    return subprocess.Popen(
        [sys.executable, "-m", "buckdesign", *words], stdout=subprocess.DEVNULL, stderr=subprocess.PIPE
    )


def finished(process: subprocess.Popen[bytes]) -> int:
    process.communicate()
    return process.returncode


def test_killed_at_random_moments_the_table_is_the_same(study: Path, tmp_path: Path) -> None:
    """What was computed stays, and what comes out is the same to the last byte."""
    study.write_text(LONG)
    whole, broken = tmp_path / "whole.csv", tmp_path / "broken.csv"
    began = time.monotonic()
    assert finished(start(study, whole)) == 0
    span = time.monotonic() - began
    moments = random.Random(5)
    kills = int(os.environ.get("BUCKDESIGN_KILLS", "6"))
    part = broken.with_name("broken.csv.part")
    amid = 0
    for _ in range(kills):
        process = start(study, broken)
        time.sleep(moments.uniform(0.3, 1.0) * span)
        process.send_signal(signal.SIGKILL)
        process.communicate()
        if broken.exists():  # begun anew, so that the next kill too hits a run that has something left to do
            assert broken.read_bytes() == whole.read_bytes()
            for path in tmp_path.glob("broken*"):
                path.unlink()
        elif part.exists():
            amid += 0 < part.stat().st_size < whole.stat().st_size
            assert whole.read_bytes().startswith(part.read_bytes())
    assert amid, "no kill hit a table that was half there"
    assert finished(start(study, broken)) == 0
    assert broken.read_bytes() == whole.read_bytes()
    assert sorted(path.name for path in tmp_path.glob("broken*")) == ["broken.csv", "broken.csv.run.jsonl"]


def test_interrupted_it_says_so_and_goes_on(study: Path, tmp_path: Path) -> None:
    study.write_text(LONG.replace("count = 40", "count = 200"))
    table = tmp_path / "table.csv"
    process = start(study, table)
    part = table.with_name("table.csv.part")
    while not part.exists() or part.stat().st_size < 200_000:
        time.sleep(0.05)
    process.send_signal(signal.SIGINT)
    _, told = process.communicate()
    assert process.returncode == 130
    assert b"Traceback" not in told
    assert part.exists() and not table.exists()
