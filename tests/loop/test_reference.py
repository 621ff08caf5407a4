"""The reference integrator against itself: spot values, energy, a second method, and every regime."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from buckdesign.loop.parameters import LoopParameters
from tests.loop.circuits import SPOT
from tests.loop.reference import PRECISE, Reference, Settings, period_of, steady_span
from tests.loop.reference_circuits import KINDS, random_circuits
from tests.loop.reference_measures import Settled, settle
from tests.loop.reference_model import Clamp, Piece, Release, Switch


def settled(parameters: LoopParameters, release: Release = Release.FOLLOW) -> Settled:
    circuit = Reference(parameters, PRECISE, release)
    return settle(circuit, circuit.operating_start())


@pytest.mark.parametrize(
    ("changes", "frequency", "tolerance"),
    [
        # from two event solvers that agree to 1e-7 and release the bound at e = R_o i_R
        ({}, 12489.437, 1e-3),
        ({"gain_knee": np.inf}, 12138.998, 1e-3),
        # from fixed steps, extrapolated, with their stated certainty
        ({"hysteresis_resistance": 15e3, "hysteresis_capacitance": 300e-12}, 15907.3, 0.5),
        ({"load_current": 0.1}, 10486.0, 4.0),
        ({"recovery_charge": 200e-9}, 12096.8, 0.5),
    ],
    ids=["as listed", "no knee", "AC-coupled", "discontinuous", "recovery"],
)
def test_spot_frequency(changes: dict[str, float], frequency: float, tolerance: float) -> None:
    found = settled(replace(SPOT, **changes), Release.AT_ZERO)
    assert found.period_cycles == 1
    assert found.frequency == pytest.approx(frequency, abs=tolerance)
    assert found.measures.residual < 1e-9


def test_readings_of_the_release_differ_by_a_few_millionths() -> None:
    follow, at_zero = settled(SPOT).frequency, settled(SPOT, Release.AT_ZERO).frequency
    assert 1e-6 < follow / at_zero - 1 < 1e-5


def test_implicit_method_gives_the_same_cycle() -> None:
    runs = []
    for settings in (PRECISE, Settings(method="Radau", rtol=1e-9, atol=1e-11)):
        circuit = Reference(SPOT, settings)
        runs.append(circuit.run(circuit.operating_start(), 1.0, cycles=3))
    np.testing.assert_allclose(runs[0].cycle_times, runs[1].cycle_times, rtol=1e-8)
    np.testing.assert_allclose(runs[0].cycle_states, runs[1].cycle_states, rtol=1e-6, atol=1e-13)


def test_set_value_is_where_the_error_vanishes() -> None:
    """``v_out`` = set value with the node at ``v_out`` and no capacitor current gives ``e`` = 0."""
    for parameters in (SPOT, replace(SPOT, hysteresis_capacitance=300e-12)):
        circuit = Reference(parameters)
        state, mode = circuit.operating_start()
        y = state.tolist()
        still = mode._replace(switch=Switch.EMPTY, clamp=Clamp.FREE)
        y[1] -= circuit.p.esr * circuit.point(still, y).capacitor
        assert abs(circuit.point(still, y).error) < 1e-5


def test_available_current_and_charge_are_inverse() -> None:
    circuit = Reference(SPOT)
    for current in (0.0, 1e-3, 2.5, 20.0):
        assert circuit.available(circuit.charge(current)) == pytest.approx(current, rel=1e-13)


def test_bound_solves_the_fold_back_line() -> None:
    """On the line ``i = I_lim - s (v_r - knee)`` with ``v_r = V_in - V_BE - R_drive i - v_out``."""
    p = replace(SPOT, current_limit=1.0, current_limit_knee=5.0, current_limit_far_voltage=45.0,
                current_limit_far=0.2, drive_resistance=10.0, supply_voltage=30.0)
    circuit = Reference(p)
    constant, slope = circuit.bound_line(Piece.LINE, True)
    i = constant + slope * 12.0
    v_r = 30.0 - 0.75 - 10.0 * i - 12.0
    assert i == pytest.approx(1.0 - 0.8 / 40.0 * (v_r - 5.0), rel=1e-13)
    assert circuit.upper(12.0, True) == pytest.approx(i, rel=1e-13)


def test_fast_settings_stay_near() -> None:
    circuit = Reference(SPOT)
    exact = circuit.run(circuit.operating_start(), 0.5e-3)
    fast = steady_span(SPOT, 0.5e-3)
    np.testing.assert_allclose(fast.cycle_times, exact.cycle_times, rtol=1e-4)
    assert fast.evaluations < exact.evaluations


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("release", Release)
def test_every_kind_runs_and_keeps_its_limits(kind: str, release: Release) -> None:
    for index, parameters in enumerate(random_circuits(np.random.default_rng(7), 2, kind)):
        circuit = Reference(parameters, Settings(rtol=1e-8, atol=1e-10), release)
        start = circuit.rest_start() if index else circuit.operating_start()
        run = circuit.run(start, 2e-3, cycles=4, keep=True)
        assert run.time == pytest.approx(sum(s.length for s in run.segments), rel=1e-12)
        for segment in run.segments:
            for t in (0.0, segment.length / 2, segment.length):
                at = circuit.point(segment.mode, segment.solution(t).tolist())
                assert at.choke > -1e-9
                assert at.regulator > circuit.lowest - 1e-9
                if release is Release.FOLLOW:
                    assert at.regulator < circuit.upper(at.output, segment.mode.base) + 1e-7
                if segment.mode.switch is Switch.ACTIVE:  # the node magnifies i_R by about 1e4 to 1e5 ohm
                    top = circuit.ceiling - parameters.saturation_resistance * at.choke
                    assert -parameters.threshold - 1e-3 < at.node < top + 1e-3


def test_period_of_finds_the_lag() -> None:
    states = [np.full(6, value) for value in (9.0, 1.0, 2.0, 1.0, 2.0, 1.0, 2.0)]
    assert period_of(states[1:]) == 2
    assert period_of([np.full(6, float(k)) for k in range(6)]) is None
