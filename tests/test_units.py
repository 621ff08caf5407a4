"""Quantities in and out, against IEC 60062 and, where it is right, quantiphy."""

import csv
import math
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from quantiphy import Quantity

from buckdesign.errors import QuantityError
from buckdesign.units import UNITS, format_quantity, parse_quantity, unit_exponent

with (Path(__file__).parent / "published" / "marking.csv").open(encoding="utf-8") as _file:
    MARKINGS = list(csv.DictReader(_file))

LABELS = [
    ("220 uH", "H", 220e-6),
    ("220 µH", "H", 220e-6),
    ("220 μH", "H", 220e-6),
    ("4.7 kohm", "ohm", 4700.0),
    ("4.7 kOhm", "ohm", 4700.0),
    ("4.7 k\u2126", "ohm", 4700.0),
    ("4.7 k\u03a9", "ohm", 4700.0),
    ("1 Mohm", "ohm", 1e6),
    ("50 mohm", "ohm", 0.05),
    ("2.5A", "A", 2.5),
    ("1e-6 H", "H", 1e-6),
    ("1E-6 H", "H", 1e-6),
    ("0.08 uH", "H", 8e-8),
    ("4 %", "%", 0.04),
    ("+100 %", "%", 1.0),
    ("-20 degC", "degC", -20.0),
    ("\u221220 °C", "degC", -20.0),
    ("25 \u2103", "degC", 25.0),
    ("4 K/W", "K/W", 4.0),
    ("4 °C/W", "K/W", 4.0),
    ("65.9 mm2", "m2", 65.9e-6),
    ("65.9 mm²", "m2", 65.9e-6),
    ("4.28 cm³", "m3", 4.28e-6),
    ("10 V/ms", "V/s", 1e4),
    ("50 A/µs", "A/s", 5e7),
    ("3 kA/m", "A/m", 3000.0),
    ("2000 h", "h", 2000.0),
    ("12 mm", "m", 0.012),
    ("220u", "H", 220e-6),
    ("220 u", "H", 220e-6),
    ("47k", "ohm", 47e3),
    ("47K", "ohm", 47e3),
    ("3V3", "V", 3.3),
    ("4k7 ohm", "ohm", 4700.0),
    ("24", "V", 24.0),
    ("\u00a024\u202fV ", "V", 24.0),
]


@pytest.mark.parametrize("row", MARKINGS, ids=lambda row: row["inputs"])
def test_marking_of_iec_60062(row: dict[str, str]) -> None:
    assert parse_quantity(row["inputs"], row["unit"]) == float(row["expected"])


@pytest.mark.parametrize(("text", "unit", "value"), LABELS)
def test_reads(text: str, unit: str, value: float) -> None:
    assert parse_quantity(text, unit) == value


@pytest.mark.parametrize("number", [3, 2.5, np.float64(2.5), np.float32(2.5), np.int64(3)])
def test_a_number_is_the_si_value(number: float) -> None:
    value = parse_quantity(number, "V")
    assert value == number
    assert type(value) is float


REFUSED = [
    ("4,7 kohm", "ohm", 'write "4.7 kohm"'),
    ("4,7", "V", 'write "4.7"'),
    ("1,000,000", "V", "no grouping sign"),
    ("1.000,5", "V", "decimal sign is a point"),
    ("47 Kohm", "ohm", "write 47 kohm"),
    ("47 K", "ohm", "write 47 kohm"),
    ("20 KHz", "Hz", "write 20 kHz"),
    ("20 mhz", "Hz", "write 20 mHz or MHz"),
    ("12 v", "V", "write 12 V"),
    ("1 MF", "F", "write 1 mF"),
    ("1 MH", "H", "write 1 mH"),
    ("5 mohms", "ohm", "write 5 mohm"),
    ("25 C", "degC", "write 25 degC"),
    ("25 K", "degC", "a temperature difference in K"),
    ("12 A", "V", "a current in A; a voltage in V is wanted"),
    ("220 uF", "H", "a capacitance in F; an inductance in H is wanted"),
    ("670 G", "T", "unknown unit"),
    ("4R7", "H", "an inductance in H is wanted"),
    ("4k7", "V", "a voltage in V is wanted"),
    ("4 k7", "ohm", 'write "4k7"'),
    ("4E7", "ohm", "write 4R7 or 4e7"),
    ("m47", "ohm", "a resistance in ohm is wanted"),
    ("4k7k", "ohm", "a resistance in ohm is wanted"),
    ("4k7 kohm", "ohm", "a resistance in ohm is wanted"),
    ("4k-7", "ohm", "a resistance in ohm is wanted"),
    ("", "V", "empty"),
    ("   ", "V", "empty"),
    ("V", "V", "no number"),
    ("nan", "V", "no number"),
    ("inf", "V", "no number"),
    ("-inf V", "V", "no number"),
    ("1e999 V", "V", "too large"),
    ("--3 V", "V", "no number"),
    ("1.2.3 V", "V", "no number"),
    ("1_000 V", "V", "a voltage in V is wanted"),
    ("0x10", "V", "a voltage in V is wanted"),
    ("٣ V", "V", "no number"),
    ("10 %", "1", "a number without unit is wanted"),
    ("12 V 3", "V", "space inside"),
    ("12\nV", "V", "a voltage in V is wanted"),
    (True, "V", "not true/false"),
    (False, "%", "not true/false"),
    (np.bool_(True), "V", "a voltage in V is wanted"),
    (math.nan, "V", "finite"),
    (-math.inf, "V", "finite"),
    (10**400, "V", "finite"),
    (None, "V", "not NoneType"),
    ([1.0], "V", "not list"),
    (1j, "V", "not complex"),
]


@pytest.mark.parametrize(("text", "unit", "said"), REFUSED, ids=repr)
def test_refuses_and_says_what_is_right(text: object, unit: str, said: str) -> None:
    with pytest.raises(QuantityError) as caught:
        parse_quantity(text, unit)  # type: ignore[arg-type]
    assert said in str(caught.value)
    assert "\n" not in str(caught.value)
    assert caught.value.exit_status == 2


def test_milli_is_not_mega() -> None:
    assert parse_quantity("5 mohm", "ohm") * 1e9 == pytest.approx(parse_quantity("5 Mohm", "ohm"), rel=1e-12)
    assert parse_quantity("1m0", "ohm") * 1e9 == pytest.approx(parse_quantity("1M0", "ohm"), rel=1e-12)


@pytest.mark.parametrize(
    ("value", "unit", "digits", "text"),
    [
        (999.96, "ohm", 3, "1 kohm"),
        (999.4, "ohm", 3, "999 ohm"),
        (999.6e-6, "H", 3, "1 mH"),
        (0.99996, "V", 4, "1 V"),
        (0.99994, "V", 4, "999.9 mV"),
        (2.2e-4, "H", 3, "220 uH"),
        (0.0, "V", 3, "0 V"),
        (-0.0, "A", 3, "0 A"),
        (0.0, "%", 3, "0 %"),
        (0.0, "1/K", 3, "0 %/K"),
        (-0.00123, "A", 3, "-1.23 mA"),
        (6.59e-5, "m2", 3, "65.9 mm2"),
        (0.04, "%", 3, "4 %"),
        (0.9999, "%", 3, "100 %"),
        (104.56, "degC", 3, "105 degC"),
        (12489.437, "Hz", 5, "12.489 kHz"),
        (220.0, "ohm", 1, "200 ohm"),
        (1.5, "1", 3, "1.5"),
        (12345.6, "h", 3, "12300 h"),
    ],
)
def test_prints_with_the_prefix_chosen_after_rounding(
    value: float, unit: str, digits: int, text: str
) -> None:
    assert format_quantity(value, unit, digits, ascii_only=True) == text


def test_prints_signs_unless_told_not_to() -> None:
    assert format_quantity(2.2e-4, "H") == "220 µH"
    assert format_quantity(4700.0, "ohm") == "4.7 kΩ"
    assert format_quantity(25.0, "degC") == "25 °C"
    assert format_quantity(6.59e-5, "m2") == "65.9 mm²"
    assert format_quantity(5e7, "A/s") == "50 A/µs"


@pytest.mark.parametrize("value", [True, math.nan, math.inf])
def test_prints_no_nonsense(value: float) -> None:
    with pytest.raises(QuantityError):
        format_quantity(value, "V")


def test_mistakes_of_the_programmer_are_no_input_errors() -> None:
    with pytest.raises(ValueError, match="no unit is named"):
        parse_quantity("1 V", "volt")
    with pytest.raises(ValueError, match="digit"):
        format_quantity(1.0, "V", 0)


@given(
    value=st.floats(min_value=-1e12, max_value=1e12, allow_nan=False),
    unit=st.sampled_from(sorted(UNITS)),
    digits=st.integers(1, 15),
    ascii_only=st.booleans(),
)
def test_what_is_printed_is_read_again(value: float, unit: str, digits: int, ascii_only: bool) -> None:
    text = format_quantity(value, unit, digits, ascii_only)
    if abs(value) < 1e-300:
        return
    assert parse_quantity(text, unit) == pytest.approx(value, rel=0.5000001 * 10.0 ** (1 - digits), abs=0)
    assert format_quantity(parse_quantity(text, unit), unit, digits, ascii_only) == text
    assert not ascii_only or text.isascii()


@given(st.integers(1, 9999), st.sampled_from("RKkMGL"), st.integers(0, 999))
def test_trade_notation_is_the_same_number_with_a_point(before: int, letter: str, after: int) -> None:
    power = {"R": 0, "K": 3, "k": 3, "M": 6, "G": 9, "L": -3}[letter]
    assert parse_quantity(f"{before}{letter}{after}", "ohm") == float(f"{before}.{after}e{power}")


@given(
    figures=st.decimals(min_value="0.001", max_value="999.999", places=3),
    prefix=st.sampled_from(["p", "n", "u", "m", ""]),
    unit=st.sampled_from(["F", "H"]),
)
def test_agrees_with_quantiphy_on_plain_prefixes(figures: object, prefix: str, unit: str) -> None:
    text = f"{figures} {prefix}{unit}"
    assert parse_quantity(text, unit) == pytest.approx(float(Quantity(text)), rel=1e-14)


@given(st.text(max_size=20))
def test_any_text_is_read_or_refused(text: str) -> None:
    for unit in ("ohm", "V", "degC", "1", "m2"):
        try:
            assert math.isfinite(parse_quantity(text, unit))
        except QuantityError as error:
            assert error.allowed
            assert str(error).isprintable()


def test_unit_of_a_header() -> None:
    assert unit_exponent("mA", "A") == -3
    assert unit_exponent("µH", "H") == -6
    with pytest.raises(QuantityError, match="a current in A is wanted"):
        unit_exponent("mV", "A")


def test_import_is_light() -> None:
    code = "import sys, buckdesign.units; print(sorted({'numpy', 'scipy', 'pandas'} & set(sys.modules)))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
