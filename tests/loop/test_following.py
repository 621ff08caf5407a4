"""From the steady state of one circuit to that of one nearly alike: the same result as from the beginning."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import STUDY, TANGENT, SteadyStates, steady_states
from tests.design.operating_designs import random_rows
from tests.loop.population import usual

Floats = np.ndarray

CHANGES = {"gain": 1.1, "charge_time": 1.1, "base_emitter": 0.96, "threshold": 0.95, "choke_resistance": 1.1}
"""About what 30 K do to a circuit (own choice)."""


def warmer(rows: Floats) -> Floats:
    changed = rows.copy()
    for name, factor in CHANGES.items():
        changed[:, COLUMN[name]] *= factor
    return changed


def followed(rows: Floats) -> tuple[SteadyStates, SteadyStates, Floats]:
    """Steady states of the warmer circuits from the cold ones, and from the beginning."""
    tangents = np.zeros((len(rows), *TANGENT))
    cold = steady_states(rows, tangents=tangents)
    near = replace(STUDY, plain=2)
    found = steady_states(warmer(rows), starts=cold.ends[:, :5], effort=near, tangents=tangents)
    return found, steady_states(warmer(rows)), tangents


@pytest.fixture(scope="module")
def pair() -> tuple[SteadyStates, SteadyStates, Floats]:
    """Usual circuits, and bench supplies many of which rest in dropout or overload."""
    return followed(np.concatenate([usual(300, 17), random_rows(500, 11)]))


def test_periodic_orbits_are_the_same(pair: tuple[SteadyStates, SteadyStates, Floats]) -> None:
    found, fresh, tangents = pair
    single = (found.column("period_cycles") == 1.0) & (fresh.column("period_cycles") == 1.0)
    assert single.sum() > 400
    assert (tangents[single, 0, 0] == 1.0).mean() > 0.9
    for name, tolerance in (("frequency_hz", 1e-6), ("output_voltage_v", 1e-7), ("choke_rms_a", 1e-6)):
        np.testing.assert_allclose(found.column(name)[single], fresh.column(name)[single], rtol=tolerance)


def test_rest_points_are_the_same(pair: tuple[SteadyStates, SteadyStates, Floats]) -> None:
    found, fresh, _ = pair
    rests = fresh.column("period_cycles") == 0.0
    assert rests.sum() > 100
    assert (found.column("period_cycles")[rests] == 0.0).all()
    np.testing.assert_array_equal(found.column("regime")[rests], fresh.column("regime")[rests])
    np.testing.assert_allclose(
        found.column("output_voltage_v")[rests], fresh.column("output_voltage_v")[rests], rtol=1e-6, atol=1e-6
    )


def test_an_orbit_that_was_followed_is_stable() -> None:
    """What is called periodic must stay so when the loop simply goes on from it."""
    rows = random_rows(1500, 3)
    found, fresh, _ = followed(rows)
    slow = np.flatnonzero((found.column("period_cycles") == 1.0) & (fresh.column("period_cycles") != 1.0))
    slow = np.concatenate([slow, np.flatnonzero(found.column("period_cycles") == 1.0)[:40]])
    patient = replace(STUDY, plain=1500, accelerated=0, more=0)
    on = steady_states(warmer(rows)[slow], starts=found.ends[slow, :5], effort=patient)
    np.testing.assert_allclose(on.column("frequency_hz"), found.column("frequency_hz")[slow], rtol=1e-6)


def test_far_circuits_are_found_all_the_same() -> None:
    """A derivative of quite another circuit must not mislead."""
    rows = usual(200, 23)
    tangents = np.zeros((len(rows), *TANGENT))
    cold = steady_states(rows, tangents=tangents)
    other = np.roll(rows, 1, axis=0)
    found = steady_states(other, starts=cold.ends[:, :5], tangents=tangents)
    fresh = steady_states(other)
    both = (found.column("period_cycles") == 1.0) & (fresh.column("period_cycles") == 1.0)
    assert both.mean() > 0.8
    assert np.isfinite(found.values).all()
    close = np.isclose(found.column("frequency_hz")[both], fresh.column("frequency_hz")[both], rtol=1e-6)
    assert close.mean() > 0.98, "several attractors are possible, but rare"
