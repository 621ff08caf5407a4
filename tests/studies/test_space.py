"""Points of studies: order, exact values, and that a study can be cut anywhere."""

from __future__ import annotations

import math
import pickle
import tracemalloc
from decimal import Decimal
from fractions import Fraction
from itertools import pairwise, product
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.stats import qmc

from buckdesign.design.keys import CountKey, PartKey, QuantityKey
from buckdesign.studies.axis import (
    Axis,
    Continuous,
    LinearSteps,
    Listed,
    LogSteps,
    Source,
    Spacing,
    Varied,
    WholeNumbers,
)
from buckdesign.studies.space import GridSpace, Method, SampledSpace, Space, most_points

VOLT = QuantityKey(unit="V", minimum=-math.inf)
TURNS = CountKey()


def axis(name: str, source: Source, key: Any = VOLT) -> Axis:
    return Axis(varied=(Varied(name=name, key=key, source=source),))


def listed(*values: Any) -> Listed:
    return Listed(values=values)


def places(*which: int) -> Any:
    return np.array(which, dtype=np.int64)


def joined(parts: list[dict[str, Any]]) -> dict[str, list[Any]]:
    return {name: [value for part in parts for value in part[name]] for name in parts[0]}


# all kinds of sources, with a group of two keys in the middle
MIXED = (
    axis("supply", Continuous(first=21.0, last=29.0)),
    Axis(
        varied=(
            Varied(name="turns", key=TURNS, source=listed(30, 40, 50)),
            Varied(name="part", key=PartKey(kind="rectifier"), source=listed("1N5822", "1N5811", "1N5820")),
        )
    ),
    axis("rh", Continuous(first=1e4, last=1e6, spacing=Spacing.LOG)),
    axis("strands", WholeNumbers(first=1, last=7), TURNS),
    axis("stack", WholeNumbers(first=90, last=3, spacing=Spacing.LOG), TURNS),
    axis("esr", LogSteps(first=0.02, last=0.2, count=10)),
)
COUNTED = (MIXED[1], axis("esr", LogSteps(first=0.02, last=0.2, count=4)), axis("v", listed(1.0, 2.0)))


@settings(max_examples=60)
@given(counts=st.lists(st.integers(1, 5), min_size=1, max_size=5), data=st.data())
def test_grid_is_the_product_of_its_axes_with_the_first_slowest(counts: list[int], data: Any) -> None:
    lists = [[float(10 * number + step) for step in range(count)] for number, count in enumerate(counts)]
    grid = GridSpace(axes=tuple(axis(str(number), listed(*values)) for number, values in enumerate(lists)))
    whole = list(product(*lists))
    start = data.draw(st.integers(0, len(whole)))
    stop = data.draw(st.integers(start, len(whole)))
    found: dict[str, Any] = grid.values(start, stop)
    assert grid.count == len(whole)
    assert grid.keys == tuple(found) == tuple(str(number) for number in range(len(counts)))
    assert list(zip(*(values.tolist() for values in found.values()), strict=True)) == whole[start:stop]


def test_keys_that_step_together_are_one_axis() -> None:
    grid = GridSpace(axes=COUNTED)
    assert grid.keys == ("turns", "part", "esr", "v")
    assert grid.count == 3 * 4 * 2
    found: dict[str, Any] = grid.values(6, 18)
    assert found["turns"].dtype == np.int64
    assert found["esr"].dtype == np.float64
    assert found["turns"].tolist() == [30] * 2 + [40] * 8 + [50] * 2
    assert found["part"] == ["1N5822"] * 2 + ["1N5811"] * 8 + ["1N5820"] * 2


@pytest.mark.parametrize("most", [10**4, 10**9])
def test_grid_of_any_size_is_never_built(most: int) -> None:
    step = LinearSteps(first=Fraction(1), step=Fraction(1, 8), count=most)
    grid = GridSpace(axes=tuple(axis(name, step) for name in "abc"))
    assert grid.count == most**3
    row = most**3 - most**2 // 3 - 7
    tracemalloc.start()
    found = grid.values(row, row + 1000)
    size = len(pickle.dumps(grid))
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 1_000_000
    assert size < 2_000
    for index in (0, 8, 999):
        wanted = [(row + index) // most**2, (row + index) // most % most, (row + index) % most]
        assert [found[name][index] for name in "abc"] == [1 + place / 8 for place in wanted]


def test_axis_turns_over_inside_a_chunk_of_a_grid_beyond_whole_numbers_of_the_machine() -> None:
    inner = LinearSteps(first=Fraction(0), step=Fraction(1), count=10**9)
    grid = GridSpace(axes=(axis("outer", listed(1.0, 2.0, 3.0)), *(axis(name, inner) for name in "abc")))
    found: dict[str, Any] = grid.values(2 * 10**27 - 3, 2 * 10**27 + 2)
    assert found["outer"].tolist() == [2.0, 2.0, 2.0, 3.0, 3.0]
    assert found["a"].tolist() == [1e9 - 1] * 3 + [0.0] * 2
    assert found["c"].tolist() == [1e9 - 3, 1e9 - 2, 1e9 - 1, 0.0, 1.0]


@given(
    first=st.decimals("-1000", "1000", places=3),
    step=st.decimals("0.001", "10", places=3),
    power=st.integers(-15, 6),
    count=st.integers(1, 400),
)
def test_steps_are_the_floats_nearest_to_the_decimal_values(
    first: Decimal, step: Decimal, power: int, count: int
) -> None:
    scale = Decimal(10) ** power
    wanted = [float((first + place * step) * scale) for place in range(count)]
    to = float((first + (count - 1) * step) * scale)
    steps = LinearSteps.stepped(float(first * scale), to, float(step * scale))
    assert steps.count == count
    assert steps.at(np.arange(count)).tolist() == wanted
    counted = LinearSteps.counted(wanted[0], to, count)
    assert counted.at(np.arange(count)).tolist() == wanted


@pytest.mark.parametrize(
    ("ends", "wanted"),
    [
        ((30.0, 80.0, 20.0), [30.0, 50.0, 70.0]),  # `to` lies between two steps
        ((0.1, 0.3, 0.1), [0.1, 0.2, 0.3]),
        ((80.0, 30.0, -25.0), [80.0, 55.0, 30.0]),
        ((5.0, 5.0, 1.0), [5.0]),
        ((0.0, 1.0, 0.3333333333333), [0.0, 1 / 3, 2 / 3, 1.0]),  # `to` is meant to be reached
        ((0.0, 1.0, 0.33333), [0.0, 0.33333, 0.66666, 0.99999]),
        ((1.0, 2.0, 5.0), [1.0]),
    ],
)
def test_last_step_is_at_or_before_the_end(ends: tuple[float, float, float], wanted: list[float]) -> None:
    steps = LinearSteps.stepped(*ends)
    assert steps.at(np.arange(steps.count)).tolist() == wanted


@given(
    ends=st.tuples(st.floats(-1e6, 1e6), st.floats(-1e6, 1e6)),
    count=st.integers(2, 2000),
    place=st.integers(0, 1999),
)
def test_counted_steps_of_any_floats_are_right_to_the_last_bit(
    ends: tuple[float, float], count: int, place: int
) -> None:
    place = min(place, count - 1)
    low, high = (Fraction(repr(end)) for end in ends)
    wanted = float(low + (high - low) * place / (count - 1))
    assert LinearSteps.counted(*ends, count).at(places(place, place)).tolist() == [wanted, wanted]


def test_log_steps_have_one_ratio_and_exact_decades() -> None:
    decades = LogSteps(first=1e3, last=1e9, count=7).at(np.arange(7))
    assert decades.tolist() == [1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9]
    falling = LogSteps(first=0.2, last=0.02, count=10).at(np.arange(10))
    assert falling[[0, -1]].tolist() == [0.2, 0.02]
    # derived: nine equal ratios make a tenth
    assert np.allclose(falling[1:] / falling[:-1], 0.1 ** (1 / 9), rtol=1e-13)
    assert LogSteps(first=3.0, last=3.0, count=1).at(places(0)).tolist() == [3.0]


def whole_values(space: Space) -> dict[str, list[Any]]:
    return {name: list(values) for name, values in space.values(0, space.count).items()}


@settings(max_examples=40, deadline=None)
@given(
    method=st.sampled_from([None, *Method]),
    seed=st.integers(0, 2**63 - 1),
    count=st.integers(1, 300),
    data=st.data(),
)
def test_pieces_are_the_whole_wherever_it_is_cut(
    method: Method | None, seed: int, count: int, data: Any
) -> None:
    if method is None:
        space: Space = GridSpace(axes=COUNTED)
    else:
        space = SampledSpace(axes=MIXED, method=method, count=count, seed=seed)
    cuts = sorted(data.draw(st.lists(st.integers(0, space.count), max_size=5)))
    ends = [0, *cuts, space.count]
    again = pickle.loads(pickle.dumps(space))
    pieces = [again.values(start, stop) for start, stop in pairwise(ends)]
    assert joined(pieces) == whole_values(space)


def unit_cube(method: Method, count: int, seed: int, dimensions: int) -> SampledSpace:
    axes = tuple(axis(str(number), Continuous(first=0.0, last=1.0)) for number in range(dimensions))
    return SampledSpace(axes=axes, method=method, count=count, seed=seed)


def as_table(space: SampledSpace, start: int, stop: int) -> Any:
    return np.column_stack(list(space.values(start, stop).values()))


@pytest.mark.parametrize("seed", [0, 1, 20_000_003])
def test_sobol_points_are_those_of_one_generator_run_through(seed: int) -> None:
    whole = qmc.Sobol(5, scramble=True, seed=seed).random_base2(10)
    space = unit_cube(Method.SOBOL, 1024, seed, 5)
    assert np.array_equal(as_table(space, 0, 1024), whole)
    assert np.array_equal(as_table(space, 511, 777), whole[511:777])
    assert not np.array_equal(as_table(unit_cube(Method.SOBOL, 1024, seed + 1, 5), 0, 1024), whole)


@pytest.mark.parametrize("seed", [0, 1, 2**63 - 1])
def test_random_points_are_those_of_one_generator_run_through(seed: int) -> None:
    whole = np.random.Generator(np.random.PCG64(seed)).random((900, 3))
    space = unit_cube(Method.RANDOM, 10**12, seed, 3)
    assert np.array_equal(as_table(space, 0, 900), whole)
    assert np.array_equal(as_table(space, 333, 334), whole[333:334])
    last = as_table(space, 10**12 - 4, 10**12)
    assert last.shape == (4, 3)
    assert len(np.unique(last)) == 12


def test_latin_hypercube_has_one_point_in_each_row_and_column() -> None:
    table = as_table(unit_cube(Method.LATIN_HYPERCUBE, 97, 4, 3), 0, 97)
    # derived: what a Latin hypercube is; each of 97 strips of each dimension holds one point
    assert np.array_equal(
        np.sort(np.floor(table * 97), axis=0), np.repeat(np.arange(97.0)[:, None], 3, axis=1)
    )
    assert not np.array_equal(np.argsort(table[:, 0]), np.argsort(table[:, 1]))


def test_choices_have_equal_parts_and_a_group_is_one_choice() -> None:
    space = SampledSpace(axes=(COUNTED[1], COUNTED[2]), method=Method.SOBOL, count=1024, seed=3)
    found = space.values(0, 1024)
    # derived: 2^10 points of a scrambled Sobol sequence are even in every dimension over 4 and 2 equal parts
    assert np.unique(found["esr"], return_counts=True)[1].tolist() == [256] * 4
    assert np.unique(found["v"], return_counts=True)[1].tolist() == [512] * 2
    group: dict[str, Any] = SampledSpace(axes=MIXED, method=Method.RANDOM, count=600, seed=3).values(0, 600)
    assert set(zip(group["turns"].tolist(), group["part"], strict=True)) == {
        (30, "1N5822"),
        (40, "1N5811"),
        (50, "1N5820"),
    }


def test_ranges_that_step_together_share_their_place() -> None:
    both = Axis(
        varied=(
            Varied(name="a", key=VOLT, source=Continuous(first=0.0, last=10.0)),
            Varied(name="b", key=VOLT, source=Continuous(first=100.0, last=1.0, spacing=Spacing.LOG)),
        )
    )
    found: dict[str, Any] = SampledSpace(axes=(both,), method=Method.RANDOM, count=50, seed=9).values(0, 50)
    # derived: b = 100 / 100^(a/10)
    assert np.allclose(found["b"], 100.0 ** (1.0 - found["a"] / 10.0), rtol=1e-13)
    assert np.ptp(found["a"]) > 5.0


def test_whole_numbers_between_two_ends_are_equally_likely() -> None:
    share = (np.arange(6000) + 0.5) / 6000
    rising = WholeNumbers(first=3, last=8).along(share)
    falling = WholeNumbers(first=8, last=3).along(share)
    assert np.unique(rising, return_counts=True)[1].tolist() == [1000] * 6
    assert np.array_equal(rising[::-1], falling)
    assert rising[0] == 3
    log = WholeNumbers(first=1, last=9, spacing=Spacing.LOG).along(share)
    # derived: the share of k is log10(1 + 1/k) where k runs from 1 to 9
    expected = [6000 * math.log10(1 + 1 / k) for k in range(1, 10)]
    assert np.allclose(np.unique(log, return_counts=True)[1], expected, atol=1.0)


@given(
    ends=st.tuples(st.floats(1e-12, 1e9), st.floats(1e-12, 1e9)),
    spacing=st.sampled_from(Spacing),
    share=st.floats(0.0, 1.0),
)
def test_ranges_stay_between_their_ends(ends: tuple[float, float], spacing: Spacing, share: float) -> None:
    found = Continuous(first=ends[0], last=ends[1], spacing=spacing).along(np.array([0.0, share, 1.0]))
    assert min(ends) <= found.min() and found.max() <= max(ends)
    assert np.allclose(found[[0, -1]], ends, rtol=1e-13, atol=0.0)


@pytest.mark.parametrize("span", [(-1, 2), (3, 2), (0, 25)])
@pytest.mark.parametrize(
    "space",
    [GridSpace(axes=COUNTED), SampledSpace(axes=MIXED, method=Method.RANDOM, count=24)],
    ids=["grid", "sample"],
)
def test_points_that_do_not_exist(space: Space, span: tuple[int, int]) -> None:
    with pytest.raises(ValueError, match="24"):
        space.values(*span)


@pytest.mark.parametrize("method", Method)
def test_no_points_are_no_values(method: Method) -> None:
    found = SampledSpace(axes=MIXED, method=method, count=8).values(3, 3)
    assert {len(values) for values in found.values()} == {0}


def test_most_points_of_a_sample() -> None:
    assert most_points(Method.LATIN_HYPERCUBE, 4) == 2_500_000
    assert most_points(Method.SOBOL, 6) == 2**30
    assert most_points(Method.SOBOL, qmc.Sobol.MAXDIM) > 0
    assert most_points(Method.SOBOL, qmc.Sobol.MAXDIM + 1) == 0
