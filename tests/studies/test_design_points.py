"""Variants of a design as arrays mean the same as design files with these values in them."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from buckdesign.design import resolve_choke
from buckdesign.design.design_file import Design, design_with, read_design
from buckdesign.design.heat_paths import heat_data
from buckdesign.design.losses import loss_data
from buckdesign.design.ratings import rating_data
from buckdesign.design.resolve import own_loop_parameters, resolve_design
from buckdesign.errors import FaultsError
from buckdesign.parts import Tables, load_tables
from buckdesign.studies.design_points import DesignPoints

BASE = Path(__file__).parents[2] / "examples" / "radio_as_built.design.toml"

CHOICES: dict[str, list[Any]] = {
    "supply.voltage": [21.0, 24.0, 29.0, 33.5],
    "output.current": [0.0, 0.05, 1.0, 2.0],
    "output.resistance": [6.9, 20.0],
    "network.rh": [4.7e5, 2.7e6],
    "network.ch": [3.3e-10],
    "regulator.part": ["adjustable 1.5 A", "adjustable 3 A"],
    "regulator.output_inductance": [5e-8, 2e-7],
    "regulator.current_limit": [1.0, 2.2],
    "transistor.part": ["2N3791", "2N5884"],
    "transistor.gain": [30.0, 60.0],
    "rectifier.part": ["1N5822", "1N5811"],
    "rectifier.parallel": [1, 2],
    "rectifier.slope": [0.02],
    "choke.turns": [60, 93],
    "choke.strands": [1, 2],
    "choke.permeability": [0.9, 1.1],
    "output_capacitor.esr": [0.02, 0.2],
    "output_capacitor.capacitance": [2.2e-4, 1e-3],
    "input_capacitor.esr": [0.05],
    "thermal.ambient": [-10.0, 40.0],
    "thermal.heatsink": [2.0, 10.0],
    "thermal.on_heatsink": [("transistor",), ("transistor", "regulator", "rectifier")],
    "thermal.rectifier.pad": [0.0, 1.0],
}
"""Values of every section, one of each kind of key (invented)."""


@pytest.fixture(scope="module")
def tables() -> Tables:
    return load_tables()


@pytest.fixture(scope="module")
def base(tables: Tables) -> Design:
    return read_design(BASE, tables)


@pytest.fixture(scope="module")
def points(base: Design, tables: Tables) -> DesignPoints:
    return DesignPoints(base, tables)


def as_columns(rows: list[dict[str, Any]]) -> dict[str, Any]:
    columns: dict[str, Any] = {}
    for key in rows[0]:
        values = [row[key] for row in rows]
        columns[key] = values if isinstance(values[0], str | tuple) else np.array(values)
    return columns


def in_file(values: dict[str, Any]) -> dict[str, Any]:
    return {key: list(value) if isinstance(value, tuple) else value for key, value in values.items()}


VARIED = st.lists(st.sampled_from(sorted(CHOICES)), min_size=1, max_size=6, unique=True).flatmap(
    lambda keys: st.lists(
        st.fixed_dictionaries({key: st.sampled_from(CHOICES[key]) for key in keys}), min_size=1, max_size=5
    )
)


@given(VARIED)
@settings(max_examples=60, deadline=None)
def test_a_variant_is_the_design_with_these_values(rows: list[dict[str, Any]]) -> None:
    known = load_tables()
    design = read_design(BASE, known)
    found = DesignPoints(design, known).variants(as_columns(rows), len(rows))
    assert found.is_made.all(), found.failures
    expected = [resolve_design(design_with(design, in_file(row), known), known) for row in rows]
    np.testing.assert_array_equal(found.rows, [own_loop_parameters(one).row() for one in expected])
    np.testing.assert_array_equal(found.ambient_c, [one.heat.ambient_c for one in expected])
    for data in (loss_data, heat_data, rating_data):
        one, other = data(found.designs), data(expected)
        for name in one.__dataclass_fields__:
            np.testing.assert_array_equal(getattr(one, name), getattr(other, name), err_msg=name)


@pytest.mark.parametrize(
    ("key", "value", "told"),
    [
        ("choke.wire", "20 mm", "choke.wire"),
        ("choke.inductance", 1e-4, "bought part"),
        ("thermal.ambient", 250.0, "must be below the junction limit"),
        ("thermal.transistor.heatsink", 3.0, "not both"),
    ],
)
def test_what_a_file_would_refuse_is_a_failure(
    points: DesignPoints, base: Design, tables: Tables, key: str, value: Any, told: str
) -> None:
    columns = {key: [value, value], "network.rh": np.array([1e6, 2e6])}
    found = points.variants(columns, 2)
    assert not found.is_made.any() and not found.designs
    assert all(told in failure for failure in found.failures)
    if key != "thermal.ambient":
        with pytest.raises(FaultsError, match=told):
            design_with(base, {key: value}, tables)


@pytest.mark.parametrize(
    ("key", "value", "told"),
    [
        ("supply.ripple", 1.0, 'supply.ripple_frequency: missing beside supply.ripple'),
        ("choke.inductance", 1e-4, 'choke.inductance = "100 uH": a winding'),
        ("thermal.ambient", 130.0, "thermal.ambient = 130 degC: must be below the junction limit of"),
    ],
)
def test_a_failure_says_key_value_and_what_is_allowed(
    points: DesignPoints, key: str, value: float, told: str
) -> None:
    (failure,) = points.variants({key: np.array([value])}, 1).failures
    assert failure.startswith(told)


def test_the_lowest_junction_limit_is_told(points: DesignPoints) -> None:
    values = {"thermal.ambient": np.array([130.0]), "rectifier.junction_limit": np.array([110.0])}
    (failure,) = points.variants(values, 1).failures
    assert failure.endswith("the rectifier 1N5822, 110 degC")


def test_without_temperatures_any_ambient_will_do(base: Design, tables: Tables) -> None:
    found = DesignPoints(base, tables, is_heated=False).variants({"thermal.ambient": np.array([250.0])}, 1)
    assert found.is_made.all()


def test_a_winding_is_laid_once(points: DesignPoints, monkeypatch: pytest.MonkeyPatch) -> None:
    laid = []

    def counted(*sizes: float) -> Any:
        laid.append(sizes)
        return wind(*sizes)

    wind = resolve_choke.wind
    monkeypatch.setattr(resolve_choke, "wind", counted)
    resolve_choke._mean_turn.cache_clear()
    factors = np.linspace(0.9, 1.1, 50)
    found = points.variants({"choke.permeability": factors, "choke.turns": np.repeat([70, 71], 25)}, 50)
    assert found.is_made.all() and len(laid) == 2
    inductance = np.array([one.choke.inductance for one in found.designs])
    np.testing.assert_allclose(inductance[:25] / inductance[0], factors[:25] / factors[0], rtol=1e-12)


def test_good_points_beside_bad_ones(points: DesignPoints) -> None:
    wires = ["0.8 mm", "99 mm", "1.0 mm"]
    found = points.variants({"choke.wire": wires}, 3)
    assert found.is_made.tolist() == [True, False, True]
    assert len(found.designs) == len(found.rows) == 2
    assert [bool(text) for text in found.failures] == [False, True, False]
    assert found.designs[1].design.choke.wire == "1.0 mm"


def test_same_sections_are_made_once(points: DesignPoints) -> None:
    found = points.variants({"choke.turns": np.array([70, 71, 70]), "network.rh": np.array([1e6, 1e6, 2e6])}, 3)
    assert found.designs[0].choke is found.designs[2].choke
    assert found.designs[0].network is found.designs[1].network
    assert found.designs[0].choke is not found.designs[1].choke
