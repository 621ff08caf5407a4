"""``buckdesign rectifiers`` as a user runs it."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from tests.design.operating_designs import BENCH

Program = Callable[..., Any]


@pytest.fixture
def design(tmp_path: Path) -> Path:
    path = tmp_path / "bench.design.toml"
    path.write_text(BENCH)
    return path


def test_table_and_json(program: Program, design: Path) -> None:
    found = program("rectifiers", design, "1N5822", "1N5408")
    assert found.status == 0
    for text in ("2 x 1N5809 (own)", "2 x 1N5408", "recovery", "runaway", "Mind"):
        assert text in found.out
    made = json.loads(program("rectifiers", design, "1N5822", "--json", "--parallel", "3").out)
    assert {row["parallel"] for row in made["rectifiers"] if row["part"] == "1N5822"} == {1, 2, 3}


def test_one_that_drops_out_is_a_row_and_status_0(program: Program, design: Path) -> None:
    found = program("rectifiers", design, "1N5820", "--supply", "24 V")
    assert found.status == 0
    assert "DROPS OUT: reverse voltage" in found.out


def test_the_own_rectifier_beyond_its_rating_is_status_3(program: Program, design: Path) -> None:
    design.write_text(BENCH.replace('part = "1N5809"\nparallel = 2', 'part = "1N5820"'))
    found = program("rectifiers", design, "1N5822", "--supply", "24 V")
    assert found.status == 3
    assert "1N5820 (own)" in found.out and "DROPS OUT" in found.out
    simulated = program("simulate", design, "--supply", "24 V", "--json")
    assert simulated.status == 3
    check = next(one for one in json.loads(simulated.out)["checks"] if one["name"] == "rectifier reverse voltage")
    assert not check["holds"]


def test_a_transistor_below_what_is_needed_is_computed_and_status_3(program: Program, design: Path) -> None:
    design.write_text(BENCH.replace('part = "2N3791"', 'part = "2N3791"\ncollector_voltage = "18 V"'))
    found = program("simulate", design, "--json")
    assert found.status == 3
    assert json.loads(found.out)["frequency_hz"] > 0.0


@pytest.mark.parametrize("over", ["frequency", "load", "supply", "ambient"])
def test_over(program: Program, design: Path, tmp_path: Path, over: str) -> None:
    figure = tmp_path / "flip.svg"
    found = program("rectifiers", design, "1N5820", "1N5823", "--over", over, "--plot", figure)
    assert found.status == 0
    assert f"Least loss over {over}" in found.out
    assert figure.read_text().startswith("<?xml")
    made = json.loads(program("rectifiers", design, "1N5820", "--over", over, "--json").out)
    assert made["over"]["quantity"] == over


@pytest.mark.parametrize(
    ("options", "text"),
    [
        (["--over", "moon"], "moon"),
        (["--parallel", "0"], "--parallel"),
        (["1N58222"], "1N5822"),
        (["--supply", "0 V"], "supply = 0"),
        (["--load", "2 V"], "--load"),
        (["--ambient", "130 degC"], "ambient = 130 degC: must be below the junction limit of the regulator"),
        (["--plot", "figure.pdf"], ".svg or .png"),
        (["--parts", "nothing.csv"], "nothing.csv"),
    ],
)
def test_wrong_options_are_one_line_and_status_2(program: Program, design: Path, options: list[str], text: str) -> None:
    found = program("rectifiers", design, *options)
    assert found.status == 2
    assert found.out == ""
    assert text in found.err and len(found.err.splitlines()) == 1


@pytest.mark.parametrize(
    ("old", "new", "text"),
    [
        ('heatsink = "3 K/W"', 'heatsink = "0 K/W"', "thermal.heatsink"),
        ('heatsink = "3 K/W"', 'heatsink = "-1 K/W"', "thermal.heatsink"),
        ('part = "2N3791"', 'part = "2N3791"\njunction_case = "0 K/W"', "transistor.junction_case"),
        ('part = "2N3791"', 'part = "2N3791"\njunction_limit = "20 degC"', "must be above the ambient, 25 degC"),
    ],
)
def test_wrong_heat_paths_are_status_2(program: Program, design: Path, old: str, new: str, text: str) -> None:
    design.write_text(BENCH.replace(old, new))
    found = program("rectifiers", design)
    assert found.status == 2
    assert text in found.err and len(found.err.splitlines()) == 1


def test_a_junction_that_is_not_checked_is_marked_in_its_row(program: Program, design: Path) -> None:
    free = BENCH.replace('"transistor", "regulator", "rectifier"', '"transistor", "regulator"')
    design.write_text(free)
    found = program("rectifiers", design, "1N5828", "1N5822", "--parallel", "1")
    row = next(line for line in found.out.splitlines() if line.startswith("1N5828"))
    assert "JUNCTION NOT CHECKED: no way for its heat is known" in row
    checked = next(line for line in found.out.splitlines() if line.startswith("1N5822"))
    assert "NOT CHECKED" not in checked
    over = program("rectifiers", design, "1N5828", "1N5408", "--over", "load", "--parallel", "1")
    assert "1N5828 (junction not checked) instead of" in over.out


def test_existing_figures_are_kept(program: Program, design: Path, tmp_path: Path) -> None:
    figure = tmp_path / "bars.png"
    figure.write_text("mine")
    assert program("rectifiers", design, "1N5822", "--plot", figure).status == 2
    assert figure.read_text() == "mine"
    assert program("rectifiers", design, "1N5822", "--plot", figure, "--force").status == 0
    assert figure.read_bytes().startswith(b"\x89PNG")


def test_budget_figure(program: Program, design: Path, tmp_path: Path) -> None:
    figure = tmp_path / "budget.svg"
    found = program("simulate", design, "--budget", figure)
    assert found.status == 0 and figure.read_text().startswith("<?xml")
    assert "switching pays from" in found.out and "Heat sinks" in found.out


def test_own_parts_are_compared(program: Program, design: Path, tmp_path: Path) -> None:
    table = tmp_path / "drawer.csv"
    table.write_text(
        "name,kind,reverse_voltage [V],average_current [A],forward_voltage_1 [V],forward_current_1 [A],"
        "forward_limit,junction_ambient [K/W],junction_limit_c [degC],source,how\n"
        "drawer diode,fast,200,3,1.1,3,max,40,150,a drawer,invented\n"
    )
    found = program("rectifiers", design, "drawer diode", "--parts", table)
    assert found.status == 0
    assert "drawer diode: no recovery data: taken as a standard rectifier" in found.out


def test_help_has_an_example(process: Callable[..., Any]) -> None:
    found = process("rectifiers", "--help")
    assert found.returncode == 0
    assert "Example: buckdesign rectifiers" in " ".join(found.stdout.split())
