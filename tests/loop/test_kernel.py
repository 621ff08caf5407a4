"""The loop kernel against spot values, an independent integrator, energy, and its own limits."""

from __future__ import annotations

import csv
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from buckdesign.loop.parameters import COLUMN, COLUMNS, LoopParameters
from buckdesign.loop.results import DETAILED, OUTPUTS, Start, Waveforms, steady_states, trajectory, waveforms
from buckdesign.physics.hysteresis import frequency_esr
from tests.loop.circuits import SPOT
from tests.loop.population import usual, wide
from tests.loop.reference import Reference, Run, Settings
from tests.loop.reference_circuits import KINDS, random_circuits
from tests.loop.reference_measures import measure
from tests.loop.reference_model import Release

SPOTS = Path(__file__).parents[1] / "published" / "loop_spot.csv"


def spot_cases() -> list[dict[str, str]]:
    lines = SPOTS.read_text(encoding="utf-8").splitlines()
    return list(csv.DictReader(line for line in lines if not line.startswith("#")))


@pytest.mark.parametrize("case", spot_cases(), ids=lambda case: case["id"])
def test_spot_values(case: dict[str, str]) -> None:
    changes = {name: float(text) for name, text in (part.split("=") for part in case["changes"].split())}
    found = steady_states(replace(SPOT, **changes).row()[None, :], effort=DETAILED)
    assert found.column("frequency_hz")[0] == pytest.approx(float(case["expected"]), abs=float(case["abs_tol"]))
    assert found.column("energy_residual")[0] < 1e-9


def reference_of(parameters: LoopParameters) -> Reference:
    return Reference(parameters, Settings(rtol=1e-11, atol=1e-13, max_step=5e-7), Release.AT_ZERO)


CASES = [(kind, rest) for kind in KINDS for rest in (False, True)] * 2


@pytest.fixture(scope="module")
def circuits() -> list[tuple[LoopParameters, bool]]:
    rng = np.random.default_rng(20)
    return [(random_circuits(rng, 1, kind)[0], rest) for kind, rest in CASES]


def case_name(index: int) -> str:
    kind, rest = CASES[index]
    return f"{index}-{kind}-{'rest' if rest else 'load'}"


@pytest.mark.parametrize("index", range(len(CASES)), ids=case_name)
def test_three_cycles_follow_the_reference(index: int, circuits: list[tuple[LoopParameters, bool]]) -> None:
    """States at the beginnings of the first cycles, from the operating point and from rest, over all regimes."""
    parameters, rest = circuits[index]
    circuit = reference_of(parameters)
    start, mode = circuit.rest_start() if rest else circuit.operating_start()
    theirs = circuit.run((start, mode), 4e-3, cycles=3)
    ours = trajectory(parameters, start=[0.0] * 5 if rest else None, cycles=3, span=theirs.time * (1 + 1e-12) + 1e-12)
    assert len(ours.times) == len(theirs.cycle_times)
    assert ours.energy_residual < 3e-7
    load = max(parameters.load_current, 0.1)
    scale = np.array([load, 1.0, 0.1, parameters.charge_time / parameters.gain * load, 1.0])
    for time, state, their_time, their_state in zip(
        ours.times, ours.states, theirs.cycle_times, theirs.cycle_states, strict=True
    ):
        assert time == pytest.approx(their_time, rel=1e-6, abs=1e-11)
        assert np.abs((state[:5] - their_state[:5]) / scale).max() < 1e-5


@pytest.mark.parametrize("index", range(0, len(CASES), 2), ids=lambda i: f"{i}-{CASES[i][0]}")
def test_the_orbit_closes_in_the_reference(index: int, circuits: list[tuple[LoopParameters, bool]]) -> None:
    """The reference, started on the orbit found, must come back after its period with its mean and waveform."""
    parameters, _ = circuits[index]
    found = steady_states(parameters.row()[None, :], effort=DETAILED)
    period = int(found.column("period_cycles")[0])
    if period < 1 or period > 4:
        pytest.skip("no orbit of few cycles")
    shape = waveforms(parameters, start=found.ends[0], cycles=period, per_step=30)
    time = shape.column("time_s")
    circuit = reference_of(parameters)
    # a moment after the beginning of the cycle, so that the mode is beyond doubt
    k = int(np.searchsorted(time, 0.3 * time[-1]))
    names = ("choke_current_a", "capacitor_voltage_v", "regulator_current_a", "base_charge_c", "coupling_voltage_v")
    state = np.array([shape.column(name)[k] for name in names] + [0.0])
    begin = trajectory(parameters, start=list(state[:5]), cycles=period + 1, span=1.0)
    section = begin.states[0]
    theirs = circuit.run((section.copy(), _mode_at(circuit, section)), 1.0, cycles=period, keep=True)
    assert period / found.column("frequency_hz")[0] == pytest.approx(theirs.cycle_times[-1], rel=1e-5)
    _compare_waveforms(circuit, theirs, waveforms(parameters, start=section[:5], cycles=period, per_step=6))
    measured = measure(circuit, theirs)
    assert measured.mean_output == pytest.approx(found.column("output_voltage_v")[0], rel=1e-5)
    ripple = found.column("output_max_v")[0] - found.column("output_min_v")[0]
    assert measured.ripple == pytest.approx(ripple, rel=1e-4)
    assert measured.highest_choke == pytest.approx(found.column("choke_max_a")[0], rel=1e-4, abs=1e-6)
    assert measured.energies["conduction"] / measured.duration == pytest.approx(
        found.column("transistor_conduction_w")[0], rel=1e-4, abs=1e-7
    )
    assert measured.energies["switching"] / measured.duration == pytest.approx(
        found.column("transistor_switching_w")[0], rel=1e-4, abs=1e-6
    )


def _compare_waveforms(circuit: Reference, run: Run, ours: Waveforms) -> None:
    """Choke current, output and regulator current at our samples, to 1e-4 of their range."""
    time = ours.column("time_s")
    ends = np.array([segment.begin + segment.length for segment in run.segments])
    # not at the events themselves, where the node jumps between two samples of one instant
    inner = [i for i, t in enumerate(time) if np.abs(ends - t).min() > 1e-10 and 1e-10 < t < ends[-1]]
    theirs = np.empty((len(inner), 3))
    for row, i in enumerate(inner):
        segment = run.segments[int(np.searchsorted(ends, time[i]))]
        at = circuit.point(segment.mode, segment.solution(time[i] - segment.begin).tolist())
        theirs[row] = at.choke, at.output, at.regulator
    names = ("choke_current_a", "output_voltage_v", "regulator_current_a")
    found = np.column_stack([ours.column(name)[inner] for name in names])
    assert len(inner) > 30
    assert (np.abs(found - theirs).max(axis=0) < 1e-4 * np.ptp(theirs, axis=0)).all()


def _mode_at(circuit: Reference, state: np.ndarray) -> object:
    """Mode of the reference at the beginning of a cycle."""
    from tests.loop.reference_model import Clamp, Load, Mode, Piece, Switch

    off = Switch.EMPTY if state[0] == 0.0 else Switch.FREEWHEEL
    mode = Mode(off, Clamp.FREE, True, Load.FULL, Piece.DRIVE)
    y = list(state)
    if off is Switch.EMPTY:
        return circuit.reconcile(mode._replace(switch=Switch.ACTIVE), y)
    return circuit.reconcile(circuit._after_switch("meet", mode, y), y)


def test_energy_balances_everywhere() -> None:
    for rows in (usual(1500, 3), wide(700, 4)):
        found = steady_states(rows)
        assert found.column("energy_residual").max() < 1e-6
        values = np.delete(found.values, OUTPUTS.index("start_margin"), axis=1)
        assert np.isfinite(values).all()
        assert (found.column("input_w") >= 0.0).all()


def test_a_longer_look_finds_the_same_orbit() -> None:
    rows = usual(400, 8)
    quick = steady_states(rows)
    period = quick.column("period_cycles")
    plain = steady_states(rows, effort=replace(DETAILED, plain=1500, accelerated=0, more=0))
    both = (period > 0) & (plain.column("period_cycles") > 0)
    assert both.mean() > 0.85
    for name in ("frequency_hz", "output_voltage_v", "choke_rms_a"):
        np.testing.assert_allclose(quick.column(name)[both], plain.column(name)[both], rtol=1e-6)


def static_start(row: np.ndarray) -> np.ndarray:
    """The static solution with the transistor active, from Kirchhoff's laws alone."""
    p = LoopParameters.from_row(row)
    from scipy.optimize import brentq

    g = 1 / p.r1 + 1 / p.r2 + 1 / p.hysteresis_resistance
    threshold = p.base_emitter / p.base_resistance

    def solve(collector: float) -> tuple[float, float, float]:
        regulator = threshold + collector * (1 + collector / p.gain_knee) / p.gain
        back = p.choke_resistance * collector
        # error = R_o i_R with v_sw = v_out + R_L i_L
        if p.hysteresis_capacitance > 0:
            total = 1 / p.r1 + 1 / p.r2
            excess = p.reference - p.output_resistance * regulator
            output = p.r2 * (total * excess + p.adjust_current)
        else:
            excess = p.reference - p.output_resistance * regulator
            output = p.r2 * (g * excess + p.adjust_current + back / p.hysteresis_resistance)
        divider = (p.reference - p.output_resistance * regulator) / p.r1
        return collector + regulator - p.load_current - output / p.load_resistance - divider, output, regulator

    collector = brentq(lambda i: solve(i)[0], 0.0, 20.0, xtol=1e-14, rtol=1e-14)
    _, output, regulator = solve(collector)
    q = p.charge_time / p.gain * collector * (1 + collector / p.gain_knee)
    coupling = 0.0
    if p.hysteresis_capacitance > 0:
        adjust = output - (p.reference - p.output_resistance * regulator)
        coupling = output + p.choke_resistance * collector - adjust
    return np.array([collector, output, regulator, q, coupling])


def test_start_margin_tells_whether_the_static_solution_holds() -> None:
    """100 random circuits, nudged off their static solution: above S = 1 they oscillate, below they return."""
    rng = np.random.default_rng(5)
    rows = usual(400, 6)
    rows[:, COLUMN["load_current"]] = rng.uniform(0.3, 2.5, len(rows))
    rows[:, COLUMN["supply_voltage"]] += 4.0
    rows[:, COLUMN["inductance"]] *= np.exp(rng.uniform(np.log(0.01), np.log(0.4), len(rows)))
    direct = np.flatnonzero(rows[:, COLUMN["hysteresis_capacitance"]] == 0.0)[:60]
    coupled = np.flatnonzero(rows[:, COLUMN["hysteresis_capacitance"]] > 0.0)[:40]
    rows[coupled, COLUMN["hysteresis_resistance"]] *= 50.0
    rows = rows[np.concatenate([direct, coupled])]
    starts = np.array([static_start(row) for row in rows])
    starts[:, 1] += 1e-5
    found = steady_states(rows, starts=starts, effort=DETAILED)
    margin = found.column("start_margin")
    # one of them swings within the active mode alone, which begins no cycle
    swing = found.column("output_max_v") - found.column("output_min_v")
    oscillates = (found.column("frequency_hz") > 0.0) | (swing > 5e-3)
    clear = (margin < 0.95) | (margin > 1.05)
    assert clear.sum() > 80
    assert (margin < 0.95).sum() > 15 and (margin > 1.05).sum() > 15
    assert (oscillates[clear] == (margin[clear] > 1.0)).all()


def test_ideal_limit_is_the_ripple_regulator() -> None:
    """CV-10 (data sheet SLVS171A p. 21): a fast regulator and transistor leave ESR and window alone."""
    scale = 1e3
    esr, inductance = 0.1, 200e-6
    ideal = replace(
        SPOT, supply_voltage=20.0, r2=2640.0, output_inductance=1e-11, output_resistance=0.0, charge_time=2e-9,
        gain=40.0 * scale, gain_knee=np.inf, drive_resistance=22.0 * scale, base_resistance=22.0 * scale,
        saturation_voltage=0.0, saturation_resistance=0.0, threshold=0.0, slope=0.0, choke_resistance=0.0,
        capacitance=1.0, esr=esr, inductance=inductance, load_current=2.5, adjust_current=0.0,
    )  # fmt: skip
    found = steady_states(ideal.row()[None, :], effort=DETAILED)
    output = found.column("output_voltage_v")[0]
    window = 20.0 * ideal.r2 / (ideal.r2 + ideal.hysteresis_resistance)
    expected = frequency_esr(20.0, output, inductance, esr, window)
    assert found.column("frequency_hz")[0] == pytest.approx(expected, rel=1e-3)


def test_rest_and_operating_start_agree_where_the_orbit_is_the_only_one() -> None:
    row = SPOT.row()[None, :]
    first = steady_states(row, start=Start.REST).column("frequency_hz")[0]
    assert first == pytest.approx(steady_states(row).column("frequency_hz")[0], rel=1e-8)


def test_results_do_not_depend_on_company_or_jobs() -> None:
    rows = wide(60, 9)
    together = steady_states(rows, jobs=2).values
    alone = np.concatenate([steady_states(row[None, :], jobs=1).values for row in rows])
    np.testing.assert_array_equal(together, alone)


@pytest.mark.parametrize("bad", [np.nan])
def test_a_row_that_holds_no_number_is_refused(bad: float) -> None:
    row = SPOT.row()
    row[3] = bad
    with pytest.raises(ValueError, match="not a number"):
        steady_states(row[None, :])


def test_a_row_of_another_width_is_refused() -> None:
    with pytest.raises(ValueError, match=f"{len(COLUMNS)} columns"):
        steady_states(np.ones((2, 5)))


def test_a_rectifier_without_slope_is_the_limit_of_a_small_one() -> None:
    """Without slope nothing but the accounts feels the collector current as the transistor turns off."""
    rows = usual(60, 29)
    assert np.isfinite(rows[:, COLUMN["gain_knee"]]).all()
    found = []
    for slope in (0.0, 1e-6):
        rows[:, COLUMN["slope"]] = slope
        found.append(steady_states(rows))
    flat, small = found
    both = (flat.column("period_cycles") == 1.0) & (small.column("period_cycles") == 1.0)
    assert both.sum() > 40
    for name in ("frequency_hz", "transistor_switching_w", "rectifier_w", "rectifier_mean_a", "rectifier_max_a"):
        np.testing.assert_allclose(flat.column(name)[both], small.column(name)[both], rtol=2e-5, err_msg=name)
    assert (flat.column("rectifier_max_a")[both] <= flat.column("choke_max_a")[both] * (1.0 + 1e-9)).all()
