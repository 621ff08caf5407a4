"""Constraints of studies: what they mean, and what each wrong one is told."""

from __future__ import annotations

import pickle
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.design.design_file import keyed_design
from buckdesign.design.keys import Refused
from buckdesign.parts import load_tables
from buckdesign.studies.constraint import Comparison, Constraint, read_constraint
from buckdesign.studies.result_columns import RESULT_COLUMNS
from buckdesign.studies.study_keys import study_columns

TABLES = load_tables(folder=Path("no such folder"))

VARIED = (
    "choke.turns", "choke.core", "choke.wire", "network.rh", "rectifier.part", "regulator.current_limit_far",
    "output.tolerance", "transistor.gain",
)  # fmt: skip
REDESIGNED = (
    "worst.efficiency",
    "values.inductance_h",
    "values.ch_f",
    "values.core",
    "values.heatsink_k_per_w",
)
COLUMNS = study_columns(
    {name: keyed_design()[name] for name in VARIED}, (*RESULT_COLUMNS, "wire_length_m", "life_h", *REDESIGNED)
)


def read(text: Any) -> Constraint:
    return read_constraint(text, COLUMNS, TABLES)


def refusal(text: Any) -> str:
    with pytest.raises(Refused) as caught:
        read(text)
    return str(caught.value)


@pytest.mark.parametrize(
    ("text", "key", "comparison", "limit"),
    [
        ("choke_c < 100", "choke_c", "<", 100.0),
        ("choke_c<100 degC", "choke_c", "<", 100.0),
        ("  junction_c.transistor  <=  -5 °C ", "junction_c.transistor", "<=", -5.0),
        ("ripple_v < 120 mV", "ripple_v", "<", 0.12),
        ("ripple_v < 0.12", "ripple_v", "<", 0.12),
        ("frequency_hz >= 4 kHz", "frequency_hz", ">=", 4000.0),
        ("choke_current_a.max != 3.5 A", "choke_current_a.max", "!=", 3.5),
        ("losses_w.choke_core > 250 mW", "losses_w.choke_core", ">", 0.25),
        ("load_ohm == 4R8", "load_ohm", "==", 4.8),
        ("efficiency >= 80 %", "efficiency", ">=", 0.8),
        ("efficiency >= 0.8", "efficiency", ">=", 0.8),
        ("worst.efficiency > 75 %", "worst.efficiency", ">", 0.75),
        ("cycle_spread < 1 %", "cycle_spread", "<", 0.01),
        ("period_cycles == 1", "period_cycles", "==", 1.0),
        ("start_margin > 1.5", "start_margin", ">", 1.5),
        ("choke_volume_cm3 <= 4.28", "choke_volume_cm3", "<=", 4.28),
        ("choke_volume_cm3 <= 4.28 cm3", "choke_volume_cm3", "<=", 4.28),
        ("choke_volume_cm3 <= 5200 mm3", "choke_volume_cm3", "<=", 5.2),
        ("wire_length_m < 90 cm", "wire_length_m", "<", 0.9),
        ("life_h > 2000 h", "life_h", ">", 2000.0),
        ("values.inductance_h >= 220 uH", "values.inductance_h", ">=", 2.2e-4),
        ("values.ch_f < 330 pF", "values.ch_f", "<", 3.3e-10),
        ("values.heatsink_k_per_w > 4 K/W", "values.heatsink_k_per_w", ">", 4.0),
        ("network.rh > 470 kohm", "network.rh", ">", 470e3),
        ("network.rh > 4k7", "network.rh", ">", 4700.0),
        ("choke.turns <= 50", "choke.turns", "<=", 50.0),
        ("transistor.gain > 40", "transistor.gain", ">", 40.0),
        ("output.tolerance < 4 %", "output.tolerance", "<", 0.04),
        ("regime == continuous", "regime", "==", "continuous"),
        ("regime != 'stuck'", "regime", "!=", "stuck"),
        ('rectifier.part == "1N5822"', "rectifier.part", "==", "1N5822"),
        ("choke.core != R 26.9/14.5/11.1", "choke.core", "!=", "R 26.9/14.5/11.1"),
        ("values.core == R 26.9/14.5/11.1", "values.core", "==", "R 26.9/14.5/11.1"),
    ],
)
def test_what_a_constraint_says(text: str, key: str, comparison: str, limit: float | str) -> None:
    found = read(text)
    assert found == Constraint(key=key, comparison=Comparison(comparison), limit=limit, text=text)
    assert pickle.loads(pickle.dumps(found)) == found


COMPARED = {"<": "__lt__", "<=": "__le__", ">": "__gt__", ">=": "__ge__", "==": "__eq__", "!=": "__ne__"}


@given(
    values=st.lists(st.one_of(st.none(), st.floats(), st.sampled_from([0.12, 0.1, 0.2]))),
    sign=st.sampled_from(sorted(COMPARED)),
)
def test_numbers_are_compared_one_by_one_and_what_is_not_known_does_not_hold(
    values: list[float | None], sign: str
) -> None:
    constraint = read(f"ripple_v {sign} 120 mV")
    wanted = [
        value is not None and value == value and getattr(float(value), COMPARED[sign])(0.12)
        for value in values
    ]
    numbers = np.array([np.nan if value is None else value for value in values])
    for column in (values, numbers):
        found = constraint.holds(column)
        assert found.dtype == np.bool_
        assert found.tolist() == wanted


def test_whole_numbers_hold() -> None:
    assert read("choke.turns <= 50").holds(np.array([49, 50, 51])).tolist() == [True, True, False]


def test_words_hold_where_they_mean_the_same_and_are_known() -> None:
    regimes = ["continuous", "stuck", "", None, np.nan]
    assert read("regime == continuous").holds(regimes).tolist() == [True, False, False, False, False]
    assert read("regime != continuous").holds(regimes).tolist() == [False, True, False, False, False]
    parts = np.array(["1N5822", "1n5822", "1N5811"], dtype=object)
    assert read("rectifier.part == 1N5822").holds(parts).tolist() == [True, True, False]
    assert read("choke.wire == 1 mm").holds(["1.0 mm", "0.5 mm"]).tolist() == [True, False]
    assert read("regime == stuck").holds([]).shape == (0,)


def test_truth_values() -> None:
    from buckdesign.design.requirement import requirement_keys

    columns = study_columns({"limits.regular": requirement_keys()["limits.regular"]}, ())
    constraint = read_constraint("limits.regular == true", columns)
    assert constraint.holds([True, False, None]).tolist() == [True, False, False]
    with pytest.raises(Refused, match=r"position 19.*true or false"):
        read_constraint("limits.regular == yes", columns)


@pytest.mark.parametrize(
    ("text", "parts"),
    [
        ("ripple_v", ["no comparison", "< <= > >= == !=", '"choke_c < 100"']),
        ("", ["no comparison"]),
        (3, ["a column, one of"]),
        ("riple_v < 120 mV", ["position 1:", '"riple_v"', 'nearest: "ripple_v"']),
        ("  choke.tuns < 3", ["position 3:", '"choke.turns"']),
        ("ripple_v = 120 mV", ["position 10:", "write =="]),
        ("ripple_v =< 120 mV", ["position 10:", "write <="]),
        ("ripple_v ≤ 120 mV", ["position 10:", "write <="]),
        ("ripple_v < 120 mA", ["position 12:", '"120 mA"', "a current in A", "a voltage in V"]),
        ("ripple_v < 120mv", ["position 12:", "mV"]),
        ("ripple_v < 0,12", ["position 12:", "decimal comma"]),
        ("ripple_v < nan", ["position 12:"]),
        ("ripple_v < 1e999", ["position 12:", "too large"]),
        ("ripple_v < __import__('os')", ["position 12:"]),
        ("choke_c < 100 K", ["position 11:", "degC"]),
        ("choke_volume_cm3 < 4 cm2", ["position 20:", "a volume"]),
        ("efficiency > 80", ["position 14:", "80 %"]),
        ("ripple_v <", ["position 11:", "a value is missing behind <"]),
        ("< 120 mV", ["position 1:", "a column is missing before <"]),
        ("120 mV > ripple_v", ["position 1:", "stands first", '"ripple_v < 120 mV"']),
        ("ripple_v < total_loss_w", ["position 12:", "is a column"]),
        (
            "4 kHz < frequency_hz <= 60 kHz",
            ["position 22:", '"frequency_hz > 4 kHz"', '"frequency_hz <= 60 kHz"'],
        ),
        ("ripple_v < 1 V, choke_c < 3", ["position 25:", "one comparison a constraint"]),
        ("regime < continuous", ["position 8:", "only == and !="]),
        ("regime == continous", ["position 11:", 'nearest: "continuous"']),
        ("rectifier.part == 1N58223", ["position 19:", "unknown rectifier", '"1N5822"']),
        ("regulator.current_limit_far < 3", ["position 1:", "a list"]),
        ("choke.turns < 50 A", ["position 15:", "without unit"]),
    ],
)
def test_what_a_wrong_constraint_is_told(text: Any, parts: list[str]) -> None:
    told = refusal(text)
    assert "\n" not in told
    for part in parts:
        assert part in told


@given(
    text=st.one_of(
        st.text(max_size=40),
        st.lists(
            st.sampled_from(
                ["ripple_v", "regime", "rectifier.part", "<", "==", " ", "1N5822", "120 mV", '"', "3"]
            ),
            max_size=6,
        ).map("".join),
    )
)
def test_any_text_is_read_or_refused(text: str) -> None:
    try:
        constraint = read(text)
    except Refused as refused:
        assert str(refused)
    else:
        assert constraint.key in COLUMNS


def test_every_result_column_has_a_unit_or_words() -> None:
    without = {name for name in RESULT_COLUMNS if COLUMNS[name].unit == "%"}
    # the keys of a simulation that are numbers without unit
    assert without == {
        "period_cycles", "cycle_spread", "duty", "start_margin", "active_fraction", "efficiency", "energy_residual",
    }  # fmt: skip
    assert [name for name in RESULT_COLUMNS if COLUMNS[name].unit is None] == ["regime"]
