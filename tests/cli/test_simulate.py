"""``buckdesign simulate`` as a user runs it."""

from __future__ import annotations

import csv
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from tests.design.operating_designs import BENCH, REQUIREMENT

Program = Callable[..., Any]

SPOT = """
[supply]
voltage = "24 V"
[output]
voltage = "12 V"
current = "2.5 A"
[regulator]
reference = "1.25 V"
adjust_current = "50 uA"
output_inductance = "0.2 uH"
output_resistance = "2 mohm"
current_limit = "2.2 A"
dropout = "1.6 V"
[network]
r1 = "240 ohm"
r2 = "2.05 kohm"
rh = "1 Mohm"
rbe = "22 ohm"
rdrive = "22 ohm"
[transistor]
gain = 40
gain_knee = "8 A"
charge_time = "1 us"
saturation_voltage = "0.2 V"
saturation_resistance = "0.1 ohm"
[rectifier]
threshold = "0.35 V"
slope = "50 mohm"
[choke]
inductance = "220 uH"
resistance = "80 mohm"
[output_capacitor]
capacitance = "470 uF"
esr = "60 mohm"
"""
"""The agreed spot circuit of the loop model, case "as listed"."""


@pytest.fixture
def design(tmp_path: Path) -> Path:
    path = tmp_path / "bench.design.toml"
    path.write_text(BENCH)
    return path


@pytest.fixture
def spot(tmp_path: Path) -> Path:
    path = tmp_path / "spot.design.toml"
    path.write_text(SPOT)
    return path


def test_the_table_says_what_a_reader_wants(program: Program, design: Path) -> None:
    found = program("simulate", design)
    assert found.status == 0
    assert found.err == ""
    first = found.out.splitlines()[0]
    assert first.startswith("20 V to 15.4 V at 3 A, ambient 25")
    for text in (
        "continuous conduction",
        "efficiency",
        "ripple",
        "transistor switching",
        "Checks",
        "hold",
        "Mind",
    ):
        assert text in found.out
    assert max(len(line) for line in found.out.splitlines()) <= 130


@pytest.mark.parametrize("option", ["--electrical-only", None])
def test_the_spot_circuit(program: Program, spot: Path, option: str | None) -> None:
    # two independent event solvers, 1e-7: 12 489.437 Hz; without any heat path temperatures change nothing
    found = program("simulate", spot, "--json", *([option] if option else []))
    made = json.loads(found.out)
    assert found.status == 0
    assert made["frequency_hz"] == pytest.approx(12489.437, rel=1e-7)
    assert made["period_cycles"] == 1
    assert made["choke_c"] is None and made["junction_c"]["transistor"] is None
    losses = sum(made["losses_w"].values())
    assert losses == pytest.approx(made["input_power_w"] - made["output_power_w"], rel=1e-6)


def test_options_take_quantities(program: Program, design: Path) -> None:
    found = program(
        "simulate",
        design,
        "--supply",
        "22 V",
        "--load",
        "500 mA",
        "--ambient",
        "40 degC",
        "--json",
        "--electrical-only",
    )
    made = json.loads(found.out)
    assert (made["supply_v"], made["load_a"], made["ambient_c"]) == (22.0, 0.5, 40.0)
    ohms = json.loads(program("simulate", design, "--load-resistance", "7R5", "--json").out)
    assert ohms["load_ohm"] == 7.5 and ohms["load_a"] == 0.0
    plain = json.loads(
        program("simulate", design, "--supply", "22", "--load", "0.5", "--json", "--electrical-only").out
    )
    assert plain["frequency_hz"] == made["frequency_hz"]


@pytest.mark.parametrize(
    ("options", "text"),
    [
        (["--supply", "22 A"], "--supply"),
        (["--load", "-1 A"], "load current = -1"),
        (["--load", "1,5 A"], "--load"),
        (["--supply", "0 V"], "supply = 0"),
        (["--load-resistance", "0 ohm"], "load resistance = 0"),
        (["--ambient", "-300 degC"], "ambient = -300"),
        (["--plot", "figure.pdf"], ".svg or .png"),
        (["--requirement", "nothing.toml"], "nothing.toml"),
        (["--parts", "nothing.csv"], "nothing.csv"),
        (["--waveforms", "no/such/folder/w.csv"], "folder"),
    ],
)
def test_wrong_options_are_one_line_and_status_2(
    program: Program, design: Path, options: list[str], text: str
) -> None:
    found = program("simulate", design, *options)
    assert found.status == 2
    assert found.out == ""
    assert text in found.err and len(found.err.splitlines()) == 1


def test_wrong_designs_are_status_2(program: Program, tmp_path: Path) -> None:
    assert program("simulate", tmp_path / "none.design.toml").status == 2
    broken = tmp_path / "broken.design.toml"
    broken.write_text(BENCH.replace('"2N3791"', '"2N379"').replace('"20 V"', '"20 W"'))
    found = program("simulate", broken)
    assert found.status == 2
    assert len(found.err.splitlines()) == 2
    assert "2N3791" in found.err and "voltage" in found.err


def test_a_broken_limit_is_status_3_and_printed(program: Program, design: Path) -> None:
    design.write_text(BENCH.replace('rdrive_power = "5 W"', 'rdrive_power = "0.25 W"'))
    found = program("simulate", design)
    assert found.status == 3
    lines = found.out.splitlines()
    first = lines[next(i for i, line in enumerate(lines) if line.startswith("Checks")) + 2]
    assert first.startswith("drive resistor power") and "FAILS" in first
    assert "1 of 22 fail" in found.out
    assert program("simulate", design, "--json").status == 3


def test_requirement_carried_or_given(program: Program, design: Path, tmp_path: Path) -> None:
    design.write_text(BENCH + REQUIREMENT)
    made = json.loads(program("simulate", design, "--json").out)
    assert "ripple" in {check["name"] for check in made["checks"]}
    strict = tmp_path / "strict.toml"
    strict.write_text(
        '[supply]\nvoltage = "20 V"\n[output]\nvoltage = "15 V"\ncurrent = "3 A"\nripple = "10 mV"\n'
    )
    found = program("simulate", design, "--requirement", strict, "--json")
    assert found.status == 3
    ripple = next(check for check in json.loads(found.out)["checks"] if check["name"] == "ripple")
    assert ripple["limit"] == 0.01 and not ripple["holds"] and ripple["margin"] < 0.0


def test_waveforms_and_figure(program: Program, design: Path, tmp_path: Path) -> None:
    table, figure = tmp_path / "w.csv", tmp_path / "w.svg"
    found = program("simulate", design, "--waveforms", table, "--plot", figure)
    assert found.status == 0
    assert "w.csv" in found.err and "w.svg" in found.err
    with table.open() as file:
        rows = list(csv.DictReader(file))
    assert list(rows[0])[:5] == [
        "time_s", "choke_current_a", "output_voltage_v", "switch_node_v", "regulator_current_a",
    ]  # fmt: skip
    time = [float(row["time_s"]) for row in rows]
    assert time == sorted(time) and 50 < len(time) < 20_000
    rate = json.loads(program("simulate", design, "--json").out)["frequency_hz"]
    assert time[-1] == pytest.approx(3.0 / rate, rel=1e-3)
    assert {row["mode"] for row in rows} >= {"saturated", "freewheel"}
    assert figure.read_text().startswith("<?xml")


def test_existing_files_are_kept(program: Program, design: Path, tmp_path: Path) -> None:
    for option, path in (("--waveforms", tmp_path / "w.csv"), ("--plot", tmp_path / "w.svg")):
        path.write_text("mine")
        found = program("simulate", design, option, path)
        assert found.status == 2 and "--force" in found.err
        assert path.read_text() == "mine"
        assert program("simulate", design, option, path, "--force").status == 0
        assert path.read_text() != "mine"


def test_the_same_figure_is_the_same_file(program: Program, design: Path, tmp_path: Path) -> None:
    paths = [tmp_path / "a.svg", tmp_path / "b.svg"]
    for path in paths:
        assert program("simulate", design, "--plot", path).status == 0
    assert paths[0].read_bytes() == paths[1].read_bytes()


def test_png(program: Program, design: Path, tmp_path: Path) -> None:
    path = tmp_path / "w.png"
    assert program("simulate", design, "--plot", path, "--load", "0 A").status == 0
    assert path.read_bytes().startswith(b"\x89PNG")


def test_from_rest(program: Program, design: Path, tmp_path: Path) -> None:
    table = tmp_path / "start.csv"
    made = json.loads(program("simulate", design, "--from-rest", "--json", "--waveforms", table).out)
    assert made["transient"].keys() == {
        "peak_choke_a", "peak_output_v", "lowest_output_v", "settling_s", "transistor_energy_j",
        "transistor_peak_w", "safe_area_margin", "regulator_energy_j", "drive_resistor_energy_j",
        "stress_s", "safe_area_basis",
    }  # fmt: skip
    first = table.read_text().splitlines()[1].split(",")
    assert float(first[0]) == 0.0 and float(first[1]) == 0.0
    assert "Start from rest" in program("simulate", design, "--from-rest").out


def test_help_has_an_example_and_loads_nothing(process: Callable[..., Any]) -> None:
    found = process("simulate", "--help")
    assert found.returncode == 0
    assert "Example: buckdesign simulate" in " ".join(found.stdout.split())
    for option in ("--supply", "--load-resistance", "--from-rest", "--waveforms", "--electrical-only"):
        assert option in found.stdout


def test_a_terminal_without_signs_gets_ascii(process: Callable[..., Any], design: Path) -> None:
    found = process("simulate", design, PYTHONIOENCODING="ascii", PYTHONUTF8="0")
    assert found.returncode == 0
    assert found.stdout.isascii() and "?" not in found.stdout
    assert "degC" in found.stdout
