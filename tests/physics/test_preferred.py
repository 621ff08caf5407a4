"""Preferred values: the standard's lists, neighbours, ends, divider search against brute force."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.errors import InfeasibleError
from buckdesign.physics import preferred, regulator

names = st.sampled_from(sorted(preferred.SERIES))
values = st.floats(1.0, 1e7)


def test_series_have_their_sizes_and_nest() -> None:
    for name, numbers in preferred.SERIES.items():
        assert len(numbers) == int(name[1:])
        assert list(numbers) == sorted(set(numbers))
    for small, large in (("E3", "E6"), ("E6", "E12"), ("E12", "E24"), ("E48", "E96"), ("E96", "E192")):
        assert set(preferred.SERIES[small]) < set(preferred.SERIES[large])


def test_series_as_the_standard_prints_them() -> None:
    """IEC 60063:2015, lists looked up for E48 and E96, the rest from memory."""
    assert preferred.SERIES["E12"] == (10, 12, 15, 18, 22, 27, 33, 39, 47, 56, 68, 82)
    assert preferred.SERIES["E48"][:8] == (100, 105, 110, 115, 121, 127, 133, 140)
    assert preferred.SERIES["E96"][-6:] == (866, 887, 909, 931, 953, 976)
    formula = tuple(round(10.0 * 10.0 ** (i / 24.0)) for i in range(24))
    odd = [a for a, b in zip(preferred.SERIES["E24"], formula, strict=True) if a != b]
    assert odd == [27, 30, 33, 36, 39, 43, 47, 82]


@given(values, names)
def test_neighbours_enclose_the_value(value: float, name: str) -> None:
    low = float(preferred.next_below(value, name, (0.01, 1e9)))
    high = float(preferred.next_above(value, name, (0.01, 1e9)))
    assert low * (1 - 1e-9) <= value <= high * (1 + 1e-9)
    between = preferred.values_between(low, high, name)
    assert between.tolist() == sorted({low, high})
    near = float(preferred.nearest(value, name, (0.01, 1e9)))
    assert near in (low, high)
    assert abs(np.log(near / value)) <= min(abs(np.log(low / value)), abs(np.log(high / value))) + 1e-12


@given(names, st.integers(-12, 6), st.integers(0, 191))
def test_a_preferred_value_is_its_own_neighbour(name: str, decade: int, index: int) -> None:
    numbers = preferred.SERIES[name]
    number = numbers[index % len(numbers)]
    value = float(f"{number}e{decade}")
    everywhere = (1e-14, 1e12)
    for function in (preferred.nearest, preferred.next_above, preferred.next_below):
        assert float(function(value, name, everywhere)) == value


def test_past_the_end_is_refused_with_need_and_offer() -> None:
    with pytest.raises(InfeasibleError, match=r"2e\+07 is needed.*1e\+07"):
        preferred.next_above(2e7, "E24")
    with pytest.raises(InfeasibleError, match=r"0.05 is needed"):
        preferred.next_below(0.05, "E24")
    with pytest.raises(InfeasibleError, match=r"1e\+09 is needed"):
        preferred.nearest(np.array([100.0, 1e9]), "E24")
    with pytest.raises(InfeasibleError, match="positive"):
        preferred.nearest(-1.0, "E24")
    with pytest.raises(InfeasibleError, match="finite"):
        preferred.next_above(np.nan, "E24")


@pytest.mark.parametrize("series", ["E12", "E24", "E96"])
@pytest.mark.parametrize("rh", [np.inf, 47e3, 1e6])
def test_divider_pair_against_brute_force(series: str, rh: float) -> None:
    wanted = np.array([5.0, 12.0, 13.8, 15.0])
    pair = preferred.divider_pair(wanted, 1.25, 50e-6, (110.0, 240.0), series, rh)
    uppers = preferred.values_between(110.0, 240.0, series)
    lowers = preferred.values_between(10.0, 1e5, series)
    reached = regulator.output_voltage_with_feedback(1.25, uppers[:, None], lowers, rh, 50e-6)
    for index, output in enumerate(wanted):
        best = np.min(np.abs(reached / output - 1.0))
        assert abs(pair.relative_error[index]) == pytest.approx(best, rel=1e-9)
        check = regulator.output_voltage_with_feedback(1.25, pair.r1[index], pair.r2[index], rh, 50e-6)
        assert pair.output_voltage[index] == pytest.approx(check)


def test_divider_that_cannot_be() -> None:
    with pytest.raises(InfeasibleError, match="no value"):
        preferred.divider_pair(12.0, 1.25, 50e-6, (125.0, 140.0), "E6")
    with pytest.raises(InfeasibleError, match="not above the reference"):
        preferred.divider_pair(1.2, 1.25, 50e-6, (120.0, 240.0), "E24")
