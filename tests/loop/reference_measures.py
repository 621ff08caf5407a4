"""Quantities of a reference run: mean output, ripple, energies, and the settled state."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from scipy.integrate import quad
from scipy.optimize import minimize_scalar

from tests.loop.reference import Mode, Reference, Run, Segment, State, period_of
from tests.loop.reference_model import FOLD_VOLTAGE, STATE_SCALE, Clamp, Point, Switch

NODES, WEIGHTS = np.polynomial.legendre.leggauss(6)
CONDUCTING = (Switch.SATURATED, Switch.ACTIVE, Switch.RECOVERING, Switch.RECOVERING_EMPTY)


@dataclass(frozen=True, kw_only=True)
class Measures:
    """A window's duration [s], voltages [V], choke currents [A], energies by element [J], times [s].

    ``residual`` is |E_in - sum E - change of stored energy| / max(E_in, 1 uJ).
    """

    duration: float
    mean_output: float
    lowest_output: float
    highest_output: float
    lowest_choke: float
    highest_choke: float
    energies: dict[str, float]
    residual: float
    active_time: float
    conducting_time: float
    limited_time: float

    @property
    def ripple(self) -> float:
        """Peak to peak [V]."""
        return self.highest_output - self.lowest_output


@dataclass(frozen=True, kw_only=True)
class Settled:
    """Where a circuit ends: mean rate [Hz], period in cycles (None: irregular, 0: no cycle), spread [1]."""

    frequency: float
    period_cycles: int | None
    cycle_spread: float
    cycles_run: int
    time: float
    state: State
    mode: Mode
    measures: Measures


def powers(circuit: Reference, mode: Mode, at: Point) -> dict[str, float]:
    """Power of each element [W]; ``supply`` is what goes in."""
    p = circuit.p
    collector, diode = 0.0, 0.0
    match mode.switch:
        case Switch.SATURATED | Switch.ACTIVE:
            collector = at.choke
        case Switch.FREEWHEEL | Switch.RECOVERING | Switch.RECOVERING_EMPTY:
            collector, diode = at.available, at.choke - at.available
    i_r = at.regulator
    base = p.base_emitter if mode.base else p.base_resistance * i_r
    drop = p.supply_voltage - base - p.drive_resistance * i_r - at.output
    fold = min(max(at.output / FOLD_VOLTAGE, 0.0), 1.0)
    transistor = (p.supply_voltage - at.node) * collector
    saturated = mode.switch is Switch.SATURATED
    return {
        "supply": p.supply_voltage * (collector + i_r),
        "conduction": transistor if saturated else 0.0,
        "switching": 0.0 if saturated else transistor,
        "base": base * i_r,
        "drive": p.drive_resistance * i_r**2,
        "regulator": drop * i_r,
        "diode": -at.node * diode,
        "choke": p.choke_resistance * at.choke**2,
        "capacitor": p.esr * at.capacitor**2,
        "divider": at.output * at.port / p.r1,
        "load": at.output * (p.load_current * fold + at.output / p.load_resistance),
    }


def stored_energy(circuit: Reference, choke: float, v_c: float) -> float:
    """Energy of choke and capacitor [J]."""
    core = 0.0
    if choke > 0:
        core = quad(lambda i: circuit.choke_inductance(i) * i, 0.0, choke, epsabs=0.0, epsrel=1e-12)[0]
    return float(core + 0.5 * circuit.p.capacitance * v_c**2)


def _pieces(segment: Segment) -> Iterator[tuple[float, float]]:
    yield from pairwise(segment.solution.ts)


def _peak(circuit: Reference, segment: Segment, around: tuple[float, float], sign: float) -> float:
    """Highest ``sign * v_out`` between two instants of a segment [V]."""
    def value(t: float) -> float:
        return -sign * circuit.point(segment.mode, segment.solution(t).tolist()).output

    found = minimize_scalar(value, bounds=around, method="bounded", options={"xatol": 1e-13})
    return -float(found.fun)


def _highest(circuit: Reference, samples: list[list[tuple[float, float]]], segments: list[Segment],
             sign: float) -> float:
    """Highest ``sign * v_out`` of all samples, refined between the neighbours of the highest sample [V]."""
    rows = [int(np.argmax([sign * output for _, output in row])) for row in samples]
    k = max(range(len(samples)), key=lambda i: sign * samples[i][rows[i]][1])
    row, j = samples[k], rows[k]
    ends = row[max(j - 1, 0)][0], row[min(j + 1, len(row) - 1)][0]
    best = sign * row[j][1]
    return max(best, _peak(circuit, segments[k], ends, sign)) if ends[1] > ends[0] else best


def measure(circuit: Reference, run: Run) -> Measures:
    """Integrate over all kept segments of a run (Gauss-Legendre on the dense solution)."""
    segments = [s for s in run.segments if s.length > 0]
    energies: defaultdict[str, float] = defaultdict(float)
    area, choke = 0.0, []
    samples = []
    spent: defaultdict[str, float] = defaultdict(float)
    for segment in segments:
        row = []
        spent[segment.mode.switch.name] += segment.length
        spent["limited"] += segment.length if segment.mode.clamp is Clamp.HIGH else 0.0
        for begin, end in _pieces(segment):
            half = (end - begin) / 2
            times = np.concatenate([[begin], begin + half * (NODES + 1), [end]])
            columns = segment.solution(times).T.tolist()
            weights = [0.0, *(half * WEIGHTS), 0.0]
            for t, weight, y in zip(times, weights, columns, strict=True):
                at = circuit.point(segment.mode, y)
                row.append((float(t), at.output))
                choke.append(at.choke)
                if weight:
                    area += weight * at.output
                    for name, power in powers(circuit, segment.mode, at).items():
                        energies[name] += weight * power
        samples.append(row)
    first, last = segments[0], segments[-1]
    stored = []
    for segment, t in ((first, 0.0), (last, last.length)):
        y = segment.solution(t).tolist()
        stored.append(stored_energy(circuit, max(circuit.point(segment.mode, y).choke, 0.0), y[1]))
    duration = sum(s.length for s in segments)
    taken = sum(value for name, value in energies.items() if name != "supply")
    residual = abs(energies["supply"] - taken - (stored[1] - stored[0])) / max(energies["supply"], 1e-6)
    return Measures(
        duration=duration,
        mean_output=float(area / duration),
        lowest_output=-_highest(circuit, samples, segments, -1.0),
        highest_output=_highest(circuit, samples, segments, 1.0),
        lowest_choke=min(choke),
        highest_choke=max(choke),
        energies={name: float(value) for name, value in energies.items()},
        residual=float(residual),
        active_time=spent["ACTIVE"],
        conducting_time=sum(spent[s.name] for s in CONDUCTING),
        limited_time=spent["limited"],
    )


def _rest_of_it(circuit: Reference, at: tuple[State, Mode], patience: float, tolerance: float,
                longest: int = 20) -> tuple[tuple[State, Mode], float]:
    """Wait until a circuit without cycles stands still, at most ``longest`` times the patience."""
    time = 0.0
    for _ in range(longest):
        run = circuit.run(at, patience)
        moved = np.max(np.abs(run.state - at[0]) / STATE_SCALE)
        at, time = (run.state, run.mode), time + run.time
        if moved < tolerance:
            break
    return at, time


def settle(circuit: Reference, start: tuple[State, Mode], cycles: int = 300, tolerance: float = 1e-8,
           patience: float = 0.06) -> Settled:
    """Wait until the cycle repeats, then measure whole periods (64 cycles when irregular).

    Parameters
    ----------
    circuit : Reference
        The circuit.
    start : tuple
        State and mode.
    cycles : int
        Longest wait [1].
    tolerance : float
        Difference of the states, scaled, at which a cycle counts as repeating [1].
    patience : float
        Time without a cycle after which the circuit counts as not cycling [s].
    """
    states: list[State] = []
    time, period = 0.0, None
    at = start
    while len(states) < cycles and period is None:
        run = circuit.run(at, patience, cycles=20)
        at, time = (run.state, run.mode), time + run.time
        last = run.cycle_times[-1] if run.cycle_times else -patience
        if len(run.cycle_times) < 20 and run.time - last > patience / 2:
            period = 0
            break
        states += run.cycle_states
        period = period_of(states[-20:], tolerance)
    if period == 0:
        at, waited = _rest_of_it(circuit, at, patience, tolerance)
        time += waited
        window = circuit.run(at, 1e-3, keep=True)
        times: list[float] = []
    else:
        window = circuit.run(at, 1.0, cycles=period or 64, keep=True)
        times = [0.0, *window.cycle_times]
    lengths = np.diff(times)
    return Settled(
        frequency=len(lengths) / times[-1] if times else 0.0,
        period_cycles=period,
        cycle_spread=float(np.std(lengths) / np.mean(lengths)) if times else 0.0,
        cycles_run=len(states),
        time=time,
        state=window.state,
        mode=window.mode,
        measures=measure(circuit, window),
    )
