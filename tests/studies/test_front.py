"""The Pareto front against its definition, whole and in pieces."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from buckdesign.studies.front import Front, is_on_front


def by_definition(costs: np.ndarray) -> list[bool]:
    """No other point is nowhere larger and somewhere smaller."""
    return [
        not any((other <= one).all() and (other < one).any() for other in costs) for one in costs
    ]


@given(
    st.integers(1, 4).flatmap(
        lambda k: st.lists(
            st.lists(st.one_of(st.integers(0, 4), st.floats(-1e9, 1e9)), min_size=k, max_size=k),
            min_size=1,
            max_size=30,
        )
    )
)
@settings(max_examples=200, deadline=None)
def test_front_is_what_nothing_beats(costs: list[list[float]]) -> None:
    given_costs = np.array(costs, dtype=float)
    assert is_on_front(given_costs).tolist() == by_definition(given_costs)


@pytest.mark.parametrize("dimensions", [1, 2, 3])
def test_front_in_pieces_is_the_front_of_the_whole(dimensions: int) -> None:
    costs = np.random.default_rng(dimensions).integers(0, 50, (2000, dimensions)).astype(float)
    costs[::17, 0] = np.nan
    lines = [f"line {k}".encode() for k in range(len(costs))]
    front = Front(dimensions)
    for first in range(0, len(costs), 311):
        part = slice(first, first + 311)
        front.add(np.arange(len(costs))[part], costs[part], lambda number: lines[number])
    known = np.isfinite(costs).all(axis=1)
    expected = np.flatnonzero(known)[is_on_front(costs[known])]
    found = front.points()
    assert found.index.tolist() == expected.tolist()
    assert found.lines == [lines[k] for k in expected]
    np.testing.assert_array_equal(found.costs, costs[expected])


def test_nearest_to_the_ideal_comes_first_whatever_the_units() -> None:
    front = Front(2)
    costs = np.array([[0.0, 1.0], [0.2, 0.2], [1.0, 0.0]])
    front.add(np.arange(3), costs * np.array([1e6, 1e-6]), lambda number: b"abc"[number : number + 1])
    assert front.points().by_distance().tolist()[0] == 1


def test_empty_front() -> None:
    front = Front(2)
    front.add(np.arange(2), np.full((2, 2), np.nan), lambda number: b"")
    assert len(front.points()) == 0
    assert front.points().by_distance().tolist() == []
