"""Requirement files: values, defaults, and every fault at once."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from buckdesign.design.requirement import (
    DEFAULT_AMBIENT_C,
    DEFAULT_TOLERANCE,
    Requirement,
    read_requirement,
    requirement_from_tree,
)
from buckdesign.design.toml_source import parse_toml
from buckdesign.design.toml_text import toml_text
from buckdesign.errors import FaultsError, InputError
from buckdesign.parts import load_tables

EXAMPLES = Path(__file__).parents[2] / "examples"
TABLES = load_tables(folder=Path("no such folder"))

SMALL = """\
[supply]
voltage = "24 V"
[output]
voltage = "12 V"
current = "2.5 A"
ripple = "120 mV"
"""


def read(text: str) -> Requirement:
    source = parse_toml(text, Path("need.toml"))
    return requirement_from_tree(source.tree, source.locate, (), path=source.path, tables=TABLES)


def faults(text: str) -> list[str]:
    with pytest.raises(FaultsError) as caught:
        read(text)
    return str(caught.value).split("\n")


def test_one_value_stands_for_the_whole_range_and_defaults_are_the_documented_ones() -> None:
    need = read(SMALL)
    assert need.supply.voltage == (24.0, 24.0, 24.0)
    assert need.output.current == (0.0, 2.5)
    assert need.output.tolerance == DEFAULT_TOLERANCE == 0.04
    assert need.limits.ambient == (DEFAULT_AMBIENT_C, DEFAULT_AMBIENT_C)
    assert need.limits.frequency is None
    assert need.limits.efficiency is None
    assert need.limits.regular is False
    assert need.prefer.rectifier == ()


def test_full_file() -> None:
    need = read(
        """
        [supply]
        voltage = ["21 V", 24, "29 V"]
        resistance = "50 mohm"
        ripple = "1 V"
        ripple_frequency = "100 Hz"
        [output]
        voltage = "12 V"
        current = ["20 mA", "2.5 A"]
        ripple = 0.12
        tolerance = 0.03
        [limits]
        ambient = ["-5 degC", "40 degC"]
        frequency = ["4 kHz", "60 kHz"]
        efficiency = "80 %"
        regular = true
        [prefer]
        rectifier = ["1N5822", "1n5811"]
        core = "R 26.9/14.5/11.1"
        wire = "1 mm"
        """
    )
    assert (need.supply.voltage_low, need.supply.voltage_nominal, need.supply.voltage_high) == (21, 24, 29)
    assert (need.supply.resistance, need.supply.ripple, need.supply.ripple_frequency) == (0.05, 1.0, 100.0)
    assert (need.output.current_min, need.output.current_max, need.output.ripple) == (0.02, 2.5, 0.12)
    assert (need.limits.ambient_low, need.limits.ambient_high) == (-5.0, 40.0)
    assert (need.limits.frequency_low, need.limits.frequency_high) == (4e3, 60e3)
    assert (need.limits.efficiency, need.limits.regular, need.output.tolerance) == (0.8, True, 0.03)
    assert need.prefer.rectifier == ("1N5822", "1n5811")
    assert need.prefer.core == ("R 26.9/14.5/11.1",)


@pytest.mark.parametrize("name", ["instrument_rail", "radio", "logger"])
def test_examples_are_read_and_written_back_the_same(name: str) -> None:
    path = EXAMPLES / f"{name}.toml"
    need = read_requirement(path, TABLES)
    text = toml_text(need.tree())
    again = parse_toml(text, Path("again.toml"))
    assert again.tree == parse_toml(path.read_text(), path).tree
    assert requirement_from_tree(again.tree, again.locate, (), path=again.path, tables=TABLES) == need
    assert "invented" in path.read_text()


def test_every_fault_is_reported_with_line_key_value_and_what_is_allowed() -> None:
    found = faults(
        """\
foo = 1
[supply]
voltage = ["21 V", "24 A", "29 V"]
volage = 3
[output]
voltage = "12,5 V"
current = ["3 A", "20 mA"]
tolerance = 4
[limits]
frequency = "3 kHz"
regular = "no"
[prefer]
rectifier = ["1N5822", "1N5832"]
"""
    )
    expected = [
        ("need.toml:1: foo = 1: unknown key", "nearest"),
        ("need.toml:3: supply.voltage = ", '"24 A"'),
        ("need.toml:4: supply.volage = 3: unknown key", '"voltage"'),
        ("need.toml:5: output.ripple: missing", "a voltage in V"),
        ('need.toml:6: output.voltage = "12,5 V": decimal comma', 'write "12.5 V"'),
        ("need.toml:7: output.current = ", "wrong order"),
        ("need.toml:8: output.tolerance = 4: must be above 0 and below 100 %", ""),
        ('need.toml:10: limits.frequency = "3 kHz"', "a list of 2"),
        ('need.toml:11: limits.regular = "no": true or false', ""),
        ("need.toml:13: prefer.rectifier = ", '"1N5832": unknown rectifier, nearest: "1N582'),
    ]
    assert len(found) == len(expected)
    for line, (start, part) in zip(found, expected, strict=True):
        assert line.startswith(start), line
        assert part in line, line


@pytest.mark.parametrize(
    ("replaced", "by", "said"),
    [
        ('voltage = "12 V"', 'voltage = "24 V"', "must be below the lowest supply, 24 V"),
        ('voltage = "12 V"', 'voltage = "30 V"', "must be below the lowest supply, 24 V"),
        ('voltage = "24 V"', 'voltage = ["29 V", "24 V", "21 V"]', "wrong order"),
        ('voltage = "24 V"', 'voltage = ["21 V", "29 V"]', "2 values"),
        ('voltage = "24 V"', 'voltage = "-24 V"', "must be above 0"),
        ('voltage = "24 V"', "voltage = 0", "must be above 0"),
        ('voltage = "24 V"', "voltage = inf", "a finite number"),
        ('voltage = "24 V"', "voltage = nan", "a finite number"),
        ('voltage = "24 V"', "voltage = true", "not true/false"),
        ('voltage = "24 V"', "voltage = 2020-01-01", "a voltage in V is wanted"),
        ('voltage = "24 V"', "voltage = { low = 1 }", "one value or a list of 3"),
        ('voltage = "24 V"', 'voltage = "24 V"\nripple = "1 V"', "missing beside supply.ripple"),
        ('current = "2.5 A"', "current = 0", "the largest load must be above 0"),
        ('current = "2.5 A"', 'current = "2.5 W"', '"W" is a power in W'),
        ('ripple = "120 mV"\n', "", "output.ripple: missing"),
        ("[output]", "[outputs]", 'unknown table, nearest: "output"'),
        ("[supply]", 'limits = "x"\n[supply]', "a table is wanted: [limits]"),
        ('"120 mV"\n', '"120 mV"\n[limits]\nambient = ["40 degC", "5 degC"]', "wrong order"),
        ('"120 mV"\n', '"120 mV"\n[limits]\nfrequency = ["4 kHz", "4 kHz"]', "must differ"),
        ('"120 mV"\n', '"120 mV"\n[limits]\nefficiency = 80', "must be above 0 and below 100 %"),
        ('"120 mV"\n', '"120 mV"\n[prefer]\ncore = []', "empty list"),
        ('"120 mV"\n', '"120 mV"\n[prefer]\ntransistor = "2N5885"', 'unknown transistor, nearest: "2N58'),
    ],
)
def test_one_fault_each(replaced: str, by: str, said: str) -> None:
    assert replaced in SMALL
    assert any(said in line for line in faults(SMALL.replace(replaced, by, 1)))


def test_missing_tables_are_named() -> None:
    found = faults("")
    assert any("supply: missing" in line for line in found)
    assert any("output: missing" in line for line in found)


def test_a_number_is_si_and_a_bare_ripple_is_never_unlimited() -> None:
    need = read(SMALL.replace('"120 mV"', "0.05"))
    assert need.output.ripple == 0.05
    assert math.isfinite(need.output.ripple)


def test_faults_are_input_errors_with_status_2(tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        read_requirement(tmp_path / "none.toml", TABLES)
    assert caught.value.exit_status == 2
