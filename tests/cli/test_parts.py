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


def test_no_heading_stands_twice(program: Program) -> None:
    for name in ("1N5822", "2N5884", "adjustable 1.5 A", "hydrogen-reduced iron 75"):
        lines = program("parts", "show", name).out.rstrip("\n").split("\n")
        headings = [line.split("  ")[0] for line in lines]
        assert len(set(headings)) == len(headings), name
    assert "leakage hot at       100 °C" in program("parts", "show", "1N5822").out


def test_transistors_are_in_the_order_of_their_numbers(program: Program, tmp_path: Path) -> None:
    path = tmp_path / "own.csv"
    path.write_text(
        "name,polarity,collector_voltage [V],collector_current [A],gain_1 [1],gain_1_current [A],"
        "saturation_voltage_max [V],saturation_current [A],junction_case [K/W],junction_limit_c [degC]\n"
        "2N900,PNP,60,15,20,4,1,4,1.5,200\n"
    )
    rows = json.loads(program("parts", "list", "transistor", "--json", "--parts", path).out)["transistor"]
    names = [row["name"] for row in rows]
    figures = [int(name[2:].rstrip("A")) for name in names if name.startswith("2N")]
    assert figures == sorted(figures) and names[0] == "2N900" and names[-1] == "BD912"


def test_large_capacitors_are_listed_in_microfarads(program: Program) -> None:
    rows = program("parts", "list", "capacitor").out.split("\n")
    line = next(row for row in rows if row.startswith("low-impedance electrolytic 1000 uF 16 V"))
    assert "  1000 µF  " in line and "mF" not in "".join(rows)


def test_only_what_is_odd_in_the_named_tables_is_listed(program: Program, own: Path, tmp_path: Path) -> None:
    rings, factors = tmp_path / "rings.csv", tmp_path / "al.csv"
    rings.write_text("name,outer_diameter [mm],inner_diameter [mm],height [mm]\nR 30.5/15/10,30.5,15,10\n")
    factors.write_text("ring,material,al [nH]\nR 99.9/15/10,hydrogen-reduced iron 75,100\n")
    every = program("parts", "check")
    assert len(every.out.rstrip("\n").split("\n")) >= 2
    outcome = program("parts", "check", own)
    assert (outcome.out, outcome.status) == ("", 0)
    assert "no faults, 0 remarks" in outcome.err
    outcome = program("parts", "check", rings)
    assert outcome.out == "ring R 30.5/15/10: no published A_L; it is computed from the dimensions\n"
    outcome = program("parts", "check", factors)
    assert outcome.out == "inductance factor R 99.9/15/10: this ring is in no table\n"


def test_points_of_the_safe_area_are_shown(program: Program, tmp_path: Path) -> None:
    path = tmp_path / "own.csv"
    path.write_text(AREA)
    lines = [
        " ".join(line.split())
        for line in program("parts", "show", "drawer PNP", "--parts", path).out.split("\n")
    ]
    for line in ("breakdown voltage 40 V", "breakdown current 2.87 A", "pulse current 8 A", "pulse duration 1 ms"):
        assert line in lines


AREA = (
    "name,polarity,collector_voltage [V],collector_current [A],gain_1 [1],gain_1_current [A],"
    "saturation_voltage_max [V],saturation_current [A],junction_case [K/W],junction_limit_c [degC],"
    "breakdown_voltage [V],breakdown_current [A],breakdown_far_voltage [V],breakdown_far_current [A],"
    "pulse_voltage [V],pulse_current [A],pulse_duration [ms]\n"
    "drawer PNP,PNP,60,15,20,4,1,4,1.5,200,40,2.87,60,0.9,40,8,1\n"
)


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("40,8,1", "40,8,", "pulse_duration"),
        ("40,8,1", "70,8,1", "pulse_voltage"),
        ("40,2.87,", "40,,", "breakdown_current"),
        ("40,2.87,", ",,", "breakdown_voltage"),
        ("60,0.9", "60,3", "breakdown_current"),
        ("60,0.9", "40,0.9", "breakdown_far_voltage"),
    ],
)
def test_a_safe_area_that_cannot_be_is_refused(
    program: Program, tmp_path: Path, old: str, new: str, said: str
) -> None:
    path = tmp_path / "own.csv"
    assert old in AREA
    path.write_text(AREA.replace(old, new, 1))
    outcome = program("parts", "check", path)
    assert (outcome.status, outcome.out) == (2, "")
    assert said in outcome.err and f"{path}:2" in outcome.err


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
