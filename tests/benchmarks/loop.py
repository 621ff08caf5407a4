"""Speed of the loop kernel, side by side with `scipy.integrate.solve_ivp` in one run.

Run as ``python tests/benchmarks/loop.py [--json] [--designs N] [--spans N]``. Prints

- ``ratio_per_core``: time that solve_ivp (RK45, rtol 1e-6, the same events, mode by mode) needs for the window of 64
  cycles of a design, over the time that the kernel needs for its steady state, both on one core;
- ``designs_per_s``: steady states per second on two cores, and on one;
- ``agreement``: largest relative difference of the period, where a precise solve_ivp run is started on the orbit found;
- ``linearity``: time per design of the full number over that of a tenth of it;
- ``two_cores``: speed on two cores over that on one.
"""

from __future__ import annotations

import argparse
import json
import sys
import time
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2]))

from buckdesign.loop.parameters import LoopParameters
from buckdesign.loop.results import SteadyStates, steady_states, waveforms
from tests.loop.population import usual
from tests.loop.reference import Reference, Settings, steady_span
from tests.loop.reference_model import Release

CYCLES = 64


def _timed(rows: np.ndarray, jobs: int) -> tuple[float, SteadyStates]:
    begin = time.perf_counter()
    found = steady_states(rows, jobs=jobs)
    return time.perf_counter() - begin, found


def reference_time(rows: np.ndarray, frequency: np.ndarray) -> float:
    """Time that solve_ivp needs for the windows of these designs [s a design]."""
    begin = time.perf_counter()
    for row, rate in zip(rows, frequency, strict=True):
        steady_span(LoopParameters.from_row(row), CYCLES / rate, rtol=1e-6)
    return (time.perf_counter() - begin) / len(rows)


def agreement(rows: np.ndarray, found: SteadyStates) -> float:
    """Largest relative difference of the period from that of a precise run started half way along the orbit."""
    worst = 0.0
    names = ("choke_current_a", "capacitor_voltage_v", "regulator_current_a", "base_charge_c", "coupling_voltage_v")
    for k, row in enumerate(rows):
        if found.column("period_cycles")[k] != 1:
            continue
        parameters = LoopParameters.from_row(row)
        shape = waveforms(parameters, start=list(found.ends[k]), cycles=1, per_step=20)
        modes = shape.modes()
        # deep in the saturated interval, with the regulator current free of its bounds or on them alike
        inside = [i for i, mode in enumerate(modes) if mode == "saturated"]
        i = inside[len(inside) // 2]
        circuit = Reference(parameters, Settings(rtol=1e-10, atol=1e-12), Release.AT_ZERO)
        state = np.array([shape.column(name)[i] for name in names] + [0.0])
        from tests.loop.reference_model import Clamp, Load, Mode, Piece, Switch

        mode = circuit.reconcile(Mode(Switch.SATURATED, Clamp.FREE, True, Load.FULL, Piece.DRIVE), state.tolist())
        run = circuit.run((state, mode), 1.0, cycles=2)
        period = run.cycle_times[1] - run.cycle_times[0]
        worst = max(worst, abs(period * found.column("frequency_hz")[k] - 1.0))
    return worst


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--json", action="store_true")
    parser.add_argument("--designs", type=int, default=20_000)
    parser.add_argument("--spans", type=int, default=20)
    options = parser.parse_args()
    rows = usual(options.designs, seed=1)
    steady_states(rows[:4])
    few, _ = _timed(rows[: len(rows) // 10], jobs=2)
    double, found = _timed(rows, jobs=2)
    single, _ = _timed(rows[: len(rows) // 4], jobs=1)
    per_design = single / (len(rows) // 4)
    frequency = found.column("frequency_hz")
    chosen = np.flatnonzero(frequency > 0.0)[: options.spans]
    slow = reference_time(rows[chosen], frequency[chosen])
    result = {
        "ratio_per_core": slow / per_design,
        "designs_per_s": len(rows) / double,
        "designs_per_s_one_core": 1.0 / per_design,
        "agreement": agreement(rows[chosen], found_part(found, chosen)),
        "linearity": (double / len(rows)) / (few / (len(rows) // 10)),
        "two_cores": per_design * len(rows) / double,
        "periodic": float((found.column("period_cycles") > 0).mean()),
        "energy_residual": float(found.column("energy_residual").max()),
    }
    if options.json:
        print(json.dumps(result))
        return
    for name, number in result.items():
        print(f"{name:24s} {number:.6g}")


def found_part(found: SteadyStates, chosen: np.ndarray) -> SteadyStates:
    """The steady states of some designs."""
    return SteadyStates(values=found.values[chosen], ends=found.ends[chosen])


if __name__ == "__main__":
    main()
