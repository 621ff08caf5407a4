"""``buckdesign tolerance`` as a user runs it."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from tests.design.operating_designs import BENCH, REQUIREMENT

Program = Callable[..., Any]

FEW = ("--units", "12", "--sensitivity", "4")

TOLERANCE = """
[tolerance]
"network.r1" = "2 %"
"output_capacitor.esr" = { tolerance = ["-30 %", "+60 %"], distribution = "lognormal" }
"""


@pytest.fixture
def design(tmp_path: Path) -> Path:
    path = tmp_path / "bench.design.toml"
    path.write_text(BENCH + REQUIREMENT + TOLERANCE)
    return path


def read_json(text: str) -> Any:
    def refuse(word: str) -> None:
        raise AssertionError(word)

    return json.loads(text, parse_constant=refuse)


def test_text_and_table(program: Program, design: Path) -> None:
    found = program("tolerance", design, *FEW)
    assert found.status == 0
    for text in (
        "Tolerances of bench.design.toml: 12 units, seed 0", "network.r1", "±2 %", "-30 % to +60 %", "lognormal",
        "design file", "Yield", "ripple", "part limits", "after 20000 h", "Worst case", "(all ", "Worst units",
        "Where the spread comes from", "Half the tolerance", "Mind", "only these values vary",
    ):  # fmt: skip
        assert text in found.out, text
    table = design.with_name("bench.tolerance.csv")
    assert f"written: {table}" in found.err
    rows = list(csv.DictReader(table.read_text().splitlines()))
    assert len(rows) == 12 and list(rows[0])[:3] == ["network.r1", "output_capacitor.esr", "supply_v"]
    assert all(abs(float(row["network.r1"]) / 240.0 - 1.0) <= 0.02 for row in rows)
    assert {row["passes"] for row in rows} <= {"true", "false"}


def test_json(program: Program, design: Path, tmp_path: Path) -> None:
    found = program("tolerance", design, *FEW, "--json", "--output", tmp_path / "units.csv", "--age", "0")
    assert found.status == 0
    made = read_json(found.out)
    assert made.keys() == {"rows", "summary", "warnings"}
    assert len(made["rows"]) == 12 and made["summary"]["aged"] is None
    assert made["summary"]["yield"] == pytest.approx(sum(row["passes"] for row in made["rows"]) / 12)
    assert (tmp_path / "units.csv").exists() and not design.with_name("bench.tolerance.csv").exists()
    assert [one["key"] for one in made["summary"]["tolerances"]] == ["network.r1", "output_capacitor.esr"]


def test_one_unit_of_it(program: Program, design: Path, tmp_path: Path) -> None:
    every = read_json(program("tolerance", design, *FEW, "--seed", "7", "--json").out)
    worst = every["summary"]["worst_units"][0]
    design.with_name("bench.tolerance.csv").unlink()
    one = read_json(program("tolerance", design, "--seed", "7", "--unit", worst["unit"], "--json").out)
    row = every["rows"][worst["unit"]]
    assert one["summary"]["values"]["network.r1"] == pytest.approx(row["network.r1"])
    assert one["summary"]["limits"][worst["requirement"]]["margin"] == pytest.approx(
        worst["margin"], rel=1e-6
    )
    assert len(one["rows"]) == len(every["summary"]["points"])
    text = program("tolerance", design, "--seed", "7", "--unit", worst["unit"])
    assert text.status == 0 and f"Unit {worst['unit']} of seed 7" in text.out
    assert not design.with_name("bench.tolerance.csv").exists()


def test_units_that_fail_are_data(program: Program, design: Path) -> None:
    design.write_text(design.read_text().replace('ripple = "250 mV"', 'ripple = "1 mV"'))
    found = program("tolerance", design, *FEW, "--json")
    assert found.status == 0
    made = read_json(found.out)
    assert made["summary"]["yield"] == 0.0 and made["summary"]["requirements"]["ripple"]["yield"] == 0.0
    assert any("design itself" in one and "ripple" in one for one in made["warnings"])
    shown = program("tolerance", design, *FEW, "--force")
    assert shown.status == 0 and "no unit passes" in shown.out


def test_requirement_of_another_file(program: Program, design: Path, tmp_path: Path) -> None:
    asked = tmp_path / "wide.toml"
    asked.write_text(
        '[supply]\nvoltage = "20 V"\n[output]\nvoltage = "15 V"\ncurrent = ["1 A", "2 A"]\nripple = "2 V"\n'
    )
    made = read_json(program("tolerance", design, *FEW, "--json", "--requirement", asked).out)
    assert "efficiency" not in made["summary"]["requirements"]
    assert {point["supply_v"] for point in made["summary"]["points"]} == {20.0}


def test_defaults_for_the_rest(program: Program, design: Path) -> None:
    found = program("tolerance", design, "--units", "3", "--sensitivity", "0", "--defaults")
    assert found.status == 0
    assert (
        "design file" in found.out and "data sheet, adjustable" in found.out and "material table" in found.out
    )
    assert "usual tolerances stand in" in found.out and "searched" in found.out


def test_without_a_table_usual_tolerances(program: Program, design: Path) -> None:
    design.write_text(BENCH + REQUIREMENT)
    found = program("tolerance", design, "--units", "3", "--sensitivity", "0", "--electrical-only")
    assert found.status == 0
    assert "has no [tolerance] table" in found.out and "electrical only" in found.out


@pytest.mark.parametrize("ending", ["svg", "png"])
def test_figure(program: Program, design: Path, tmp_path: Path, ending: str) -> None:
    figure = tmp_path / f"yield.{ending}"
    assert program("tolerance", design, *FEW, "--plot", figure).status == 0
    first = figure.read_bytes()
    assert len(first) > 5000
    if ending == "svg":
        assert program("tolerance", design, *FEW, "--plot", figure, "--force").status == 0
        assert figure.read_bytes() == first


def test_same_seed_same_table(program: Program, design: Path) -> None:
    table = design.with_name("bench.tolerance.csv")
    program("tolerance", design, *FEW, "--seed", "3", "--jobs", "1")
    first = table.read_bytes()
    program("tolerance", design, *FEW, "--seed", "3", "--jobs", "2", "--force")
    assert table.read_bytes() == first
    program("tolerance", design, *FEW, "--seed", "4", "--force")
    assert table.read_bytes() != first


class TestBadInput:
    def failed(self, program: Program, *arguments: Any) -> str:
        found = program("tolerance", *arguments)
        assert found.status == 2 and found.out == ""
        assert "Traceback" not in found.err and len(found.err.strip().splitlines()) == 1
        return str(found.err)

    def test_nothing_to_count_against(self, program: Program, design: Path) -> None:
        design.write_text(BENCH)
        told = self.failed(program, design)
        assert "no requirement to count against" in told and str(design) in told
        assert not design.with_name("bench.tolerance.csv").exists()

    def test_a_table_that_exists(self, program: Program, design: Path) -> None:
        table = design.with_name("bench.tolerance.csv")
        table.write_text("mine")
        assert "--force" in self.failed(program, design, *FEW)
        assert table.read_text() == "mine"

    @pytest.mark.parametrize(
        ("options", "told"),
        [
            (("--units", "0"), "--units"),
            (("--seed", "-1"), "--seed"),
            (("--sensitivity", "48"), "power of two"),
            (("--age", "3 V"), "--age"),
            (("--age", "1000000 h"), "300000 h"),
            (("--output", "units.parquet"), "CSV"),
            (("--plot", "yield.pdf"), "yield.pdf"),
            (("--output", "no/where.csv"), "no folder"),
            (("--jobs", "0"), "--jobs"),
        ],
    )
    def test_options(
        self,
        program: Program,
        design: Path,
        options: tuple[str, ...],
        told: str,
        monkeypatch: pytest.MonkeyPatch,
        tmp_path: Path,
    ) -> None:
        monkeypatch.chdir(tmp_path)
        assert told in self.failed(program, design, *options)
        assert {one.name for one in tmp_path.iterdir()} <= {"bench.design.toml", "config0"}

    @pytest.mark.parametrize("option", ["--output", "--plot"])
    def test_what_is_read_is_never_written_over(self, program: Program, design: Path, option: str) -> None:
        drawn = design.rename(design.with_name("bench.svg"))
        before = drawn.read_bytes()
        told = self.failed(program, drawn, *FEW, option, drawn.parent / "." / drawn.name, "--force")
        assert "is read from and would be written over" in told
        wanted = drawn.with_name("asked.svg")
        wanted.write_text(REQUIREMENT.replace("requirement.", ""))
        told = self.failed(program, drawn, *FEW, "--requirement", wanted, option, wanted, "--force")
        assert "is read from" in told and drawn.read_bytes() == before

    def test_a_single_unit_writes_no_file(self, program: Program, design: Path, tmp_path: Path) -> None:
        for option in ("--output", "--plot"):
            told = self.failed(program, design, "--unit", "0", option, tmp_path / "x.svg")
            assert f"leave out {option}" in told

    def test_table_and_figure_of_one_name(self, program: Program, design: Path, tmp_path: Path) -> None:
        same = tmp_path / "same.svg"
        assert "both" in self.failed(program, design, "--output", same, "--plot", same)

    def test_a_rating_in_the_table(self, program: Program, design: Path) -> None:
        design.write_text(design.read_text() + '"regulator.max_difference" = "5 %"\n')
        line = len(design.read_text().splitlines())
        told = self.failed(program, design)
        assert told.startswith(f'{design}:{line}: tolerance."regulator.max_difference" = "5 %": a rating')

    def test_a_value_that_the_design_does_not_have(self, program: Program, design: Path) -> None:
        design.write_text(design.read_text() + '"network.ch" = "5 %"\n')
        line = len(design.read_text().splitlines())
        assert self.failed(program, design).startswith(f'{design}:{line}: tolerance."network.ch" = "5 %": ')

    def test_an_ambient_that_no_junction_can_stand(self, program: Program, design: Path) -> None:
        text = design.read_text().replace(
            "[requirement.limits]", '[requirement.limits]\nambient = "180 degC"'
        )
        design.write_text(text)
        assert "junction limit" in self.failed(program, design)


def test_defaults_are_those_of_the_library() -> None:
    from inspect import signature

    from buckdesign.cli.tolerance import tolerance
    from buckdesign.studies.study_effort import SAMPLES, UNITS

    given = signature(tolerance).parameters
    assert (given["units"].default, given["sensitivity"].default) == (UNITS, SAMPLES)
