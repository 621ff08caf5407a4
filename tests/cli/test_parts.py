"""``buckdesign parts``."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

Program = Callable[..., Any]
KINDS = ("regulator", "transistor", "rectifier", "capacitor", "wire", "ring", "material")

OWN = """\
# my drawer
name,kind,reverse_voltage [V],average_current [A],forward_voltage_1 [mV],forward_current_1 [A],\
forward_limit,junction_limit_c [degC]
1N5822,Schottky,40,3,490,3,typ,125
drawer diode,ultrafast,200,8,950,8,max,150
"""


@pytest.fixture
def own(tmp_path: Path) -> Path:
    path = tmp_path / "own.csv"
    path.write_text(OWN)
    return path


def test_all_names_by_kind(program: Program) -> None:
    outcome = program("parts", "list")
    assert (outcome.status, outcome.err) == (0, "")
    for name in ("adjustable 1.5 A", "2N5884", "1N5822", "1.0 mm", "R 26.9/14.5/11.1"):
        assert f"\n  {name}\n" in outcome.out
    assert all(f"{kind} (" in outcome.out for kind in KINDS)


@pytest.mark.parametrize("kind", KINDS)
def test_one_kind_as_a_table_and_as_json(program: Program, kind: str) -> None:
    table = program("parts", "list", kind).out.rstrip("\n").split("\n")
    rows = json.loads(program("parts", "list", kind, "--json").out)[kind]
    assert len(table) == len(rows) + 2
    for line, row in zip(table[2:], rows, strict=True):
        assert line.startswith(row["name"])
        assert row["source"]


@pytest.mark.parametrize("kind", ["Rectifiers", "rectifier"])
def test_plural_and_case_of_the_kind_do_not_count(program: Program, kind: str) -> None:
    assert "1N5822" in program("parts", "list", kind).out


def test_show_has_the_values_of_the_data_sheet(program: Program) -> None:
    # 1N5822: 0.525 V at 3 A, 40 V, leakage 2 mA, 125 degC (Diodes Inc. DS23003)
    lines = [" ".join(line.split()) for line in program("parts", "show", "1n5822").out.split("\n")]
    for line in ("table rectifier", "name 1N5822", "forward voltage 1 525 mV", "reverse voltage 40 V"):
        assert line in lines
    part = json.loads(program("parts", "show", "1N5822", "--json").out)["rectifier"]
    assert (part["leakage"], part["junction_limit_c"]) == (2e-3, 125.0)


def test_own_table_goes_before_and_adds(program: Program, own: Path) -> None:
    part = json.loads(program("parts", "show", "1N5822", "--json", "--parts", own).out)["rectifier"]
    assert part["forward_voltage_1"] == pytest.approx(0.49)
    assert "drawer diode" in program("parts", "list", "rectifier", "--parts", own).out


def test_check(program: Program, own: Path) -> None:
    outcome = program("parts", "check", own)
    assert outcome.status == 0
    assert "no faults" in outcome.err
    data = json.loads(program("parts", "check", "--json").out)
    assert data["counts"]["ring"] > 20
    assert all(set(problem) == {"kind", "name", "text"} for problem in data["problems"])


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("forward_limit,", "", "own.csv"),
        ("[V],average", "[A],average", "reverse_voltage"),
        ("typ,125", "typ,hot", "hot"),
        ("typ,125", "perhaps,125", "perhaps"),
        (",40,3,490", ",-40,3,490", "-40"),
        ("Schottky,40", "Shottky,40", "Shottky"),
        ("typ,125", "typ", "junction_limit_c"),
    ],
)
def test_faults_of_an_own_table(program: Program, own: Path, old: str, new: str, said: str) -> None:
    assert old in OWN
    own.write_text(OWN.replace(old, new, 1))
    outcome = program("parts", "check", own)
    assert (outcome.status, outcome.out) == (2, "")
    assert str(own) in outcome.err
    assert said in outcome.err


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["list", "diode"], '"diode": unknown kind of part'),
        (["show", "1N5832"], '"1N5832": unknown part, nearest: "1N582'),
        (["list", "--parts", "none.csv"], "none.csv"),
        (["check", "none.csv"], "none.csv"),
    ],
)
def test_unknown_names_and_files(program: Program, arguments: list[str], said: str) -> None:
    outcome = program("parts", *arguments)
    assert (outcome.status, outcome.out) == (2, "")
    assert said in outcome.err
