"""Plain text and JSON."""

from __future__ import annotations

import doctest
import json
import math
from dataclasses import dataclass
from enum import Enum
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.output import text
from buckdesign.output.text import Column, plain_text, signs, text_pairs, text_table, to_json


def test_examples_in_the_docstrings() -> None:
    assert doctest.testmod(text).failed == 0


def test_columns_are_aligned_and_lines_have_no_trailing_blanks() -> None:
    columns = [Column(heading="part"), Column(heading="loss", right=True), Column(heading="note")]
    lines = text_table(columns, [["choke", "0.5 W", ""], ["a long name", "12 W", "hot"]]).split("\n")
    assert lines == [
        "part          loss  note",
        "-----------  -----  ----",
        "choke        0.5 W",
        "a long name   12 W  hot",
    ]


def test_a_short_row_is_refused() -> None:
    with pytest.raises(ValueError, match="1 cells for 2 columns"):
        text_table([Column(heading="a"), Column(heading="b")], [["x"]])


def test_pairs() -> None:
    assert text_pairs([("a", "1"), ("long", "2\n3")], indent=1) == " a     1\n long  2\n       3"


@given(st.text())
def test_plain_text_is_ascii(value: str) -> None:
    assert plain_text(value).isascii()


def test_json_of_everything_a_result_holds() -> None:
    class Regime(Enum):
        LINEAR = "linear"

    @dataclass(frozen=True)
    class Result:
        regime: Regime
        ripple_v: float
        path: Path

    value = {
        "z": np.float64(1.5),
        "a": np.array([1.0, np.nan]),
        "n": np.int64(3),
        "b": np.bool_(True),
        "r": Result(Regime.LINEAR, math.inf, Path("x")),
        "t": (1, None, "µ"),
    }
    found = json.loads(to_json(value))
    assert list(found) == ["z", "a", "n", "b", "r", "t"]
    assert found == {
        "z": 1.5,
        "a": [1.0, None],
        "n": 3,
        "b": True,
        "r": {"regime": "linear", "ripple_v": None, "path": "x"},
        "t": [1, None, "µ"],
    }
    assert found["b"] is True


def test_what_has_no_json_form_is_refused() -> None:
    with pytest.raises(TypeError, match="object"):
        to_json({"a": object()})


def test_signs_are_the_reverse_of_plain_text() -> None:
    for signed in ("470 µF at 85 °C", "2.2 kΩ, 30 mΩ and 4 Ω", "8 µs, 33 µH", "-5 °C to 40 °C"):
        assert signs(plain_text(signed)) == signed
    for untouched in ("as degC", "ohm", "5 units", "R 26.9/14.5/11.1", "3 uses", "Co 60"):
        assert signs(untouched) == untouched
