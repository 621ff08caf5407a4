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
    for _ in range(kills):
        process = start(study, broken)
        time.sleep(moments.uniform(0.2, 0.9) * span)
        process.send_signal(signal.SIGKILL)
        process.communicate()
        part = broken if broken.exists() else broken.with_name("broken.csv.part")
        if part.exists():
            assert whole.read_bytes().startswith(part.read_bytes()[: part.stat().st_size // 2])
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
