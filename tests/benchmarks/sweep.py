"""A long sweep through the command line, side by side with `scipy.integrate.solve_ivp` in one run.

Run as ``python tests/benchmarks/sweep.py [--json] [--points N] [--references N] [--electrical-only]``. Prints

- ``ratio``: time that solve_ivp (RK45, rtol 1e-6, the same events, mode by mode, one process) needs for 64 cycles of
  every point, extrapolated from some of them, over the time from the command to the finished table with two jobs;
- ``points_per_s``: points a second of the command with two jobs, start of the program and all;
- ``two_jobs``: time with one job over the time with two, of a fifth of the points;
- ``cluster``: time with ``--cluster local:2`` over the time with two jobs, of a fifth of the points;
- ``memory``: peak memory of all processes together with all points over that with a fifth of them;
- ``first_row_s``: time from the command to the first row on disk.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
import tempfile
import threading
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2]))

from buckdesign.loop.parameters import LoopParameters
from buckdesign.parts import load_tables
from buckdesign.studies.point_model import PointModel
from buckdesign.studies.sweep import sweep_task
from tests.loop.reference import steady_span

ROOT = Path(__file__).parents[2]
CYCLES = 64
PAGE = os.sysconf("SC_PAGE_SIZE")

DESIGN = """# The radio supply of a narrowboat (invented).
[supply]
voltage = "24 V"
[output]
voltage = "13.8 V"
current = "2 A"
[regulator]
part = "adjustable 1.5 A"
[network]
r1 = "240 ohm"
r2 = "2.37 kohm"
rh = "2.7 Mohm"
rbe = "15 ohm"
rdrive = "15 ohm"
[transistor]
part = "2N3791"
[rectifier]
part = "1N5822"
[choke]
core = "R 20.2/12.6/6.35"
material = "hydrogen-reduced iron 75 low loss"
turns = 93
wire = "0.8 mm"
[output_capacitor]
part = "low-impedance electrolytic 680 uF 25 V"
[input_capacitor]
part = "low-impedance electrolytic 330 uF 50 V"
[thermal]
ambient = "40 degC"
heatsink = "10 K/W"
on_heatsink = ["transistor", "regulator"]
pad = "0.5 K/W"
"""

STUDY = """# Choke, network, worn capacitor and rectifier over load, supply and ambient (invented).
base = "radio.design.toml"
[vary]
"choke.turns" = {{ from = 51, to = 100, step = 1 }}
"network.rh" = {{ from = "1 Mohm", to = "4.7 Mohm", count = {networks}, spacing = "log" }}
"output_capacitor.esr" = {{ from = "20 mohm", to = "200 mohm", count = 20, spacing = "log" }}
"rectifier.part" = ["1N5822", "1N5811"]
"output.current" = {{ from = "0.2 A", to = "2 A", count = 10 }}
[vary.together]
"supply.voltage" = ["21 V", "29 V"]
"thermal.ambient" = ["5 degC", "40 degC"]
[best]
minimise = ["total_loss_w", "choke_volume_cm3"]
subject_to = ["choke_c < 100", "ripple_v < 120 mV"]
"""

PER_NETWORK = 50 * 20 * 2 * 10 * 2


@dataclass(frozen=True)
class Run:
    """One run of the command."""

    seconds: float
    peak_bytes: int
    first_row: float


class _Watch(threading.Thread):
    """Peak of the memory of a process and all below it, and when the table got its first row."""

    def __init__(self, process: int, table: Path, began: float) -> None:
        super().__init__(daemon=True)
        self.peak, self.first_row = 0, float("nan")
        self._process, self._table, self._began = process, table, began
        self._header = 0
        self._end = threading.Event()

    def run(self) -> None:
        turn = 0
        while not self._end.wait(0.02):
            if np.isnan(self.first_row) and self._table.exists() and self._table.read_bytes().count(b"\n") > 1:
                self.first_row = time.perf_counter() - self._began
            if turn % 10 == 0:
                self.peak = max(self.peak, _tree_bytes(self._process))
            turn += 1

    def end(self) -> None:
        self._end.set()
        self.join()


def _tree_bytes(process: int) -> int:
    """Resident memory of a process and its descendants, shared pages counted once each [byte]."""
    total, waiting = 0, [process]
    while waiting:
        one = waiting.pop()
        try:
            pages = Path(f"/proc/{one}/statm").read_text().split()
            for task in Path(f"/proc/{one}/task").iterdir():
                waiting += [int(child) for child in (task / "children").read_text().split()]
        except (OSError, IndexError):
            continue
        total += (int(pages[1]) - int(pages[2])) * PAGE
    return total


def command(folder: Path, study: Path, *options: str) -> Run:
    """Run the command on a study, without a table of before."""
    table = folder / "table.csv"
    for old in folder.glob("table.csv*"):
        old.unlink()
    arguments = [sys.executable, "-m", "buckdesign", "sweep", str(study), "--output", str(table), *options]
    began = time.perf_counter()
    process = subprocess.Popen(arguments, cwd=folder, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL,
                               env=os.environ | {"PYTHONPATH": str(ROOT)})  # fmt: skip
    watch = _Watch(process.pid, table.with_name("table.csv.part"), began)
    watch.start()
    status = process.wait()
    seconds = time.perf_counter() - began
    watch.end()
    if status not in (0, 4):
        raise RuntimeError(f"the command ended with status {status}")
    return Run(seconds, watch.peak, watch.first_row)


def reference_seconds(study: Path, count: int, electrical_only: bool) -> tuple[float, int]:
    """Time that solve_ivp needs for one point, from some of them that switch [s], and how many points there are."""
    task = sweep_task(study, load_tables(), electrical_only=electrical_only)
    model = task.work
    assert isinstance(model, PointModel)
    numbers = np.random.default_rng(1).choice(model.count, count, replace=False)
    total, done = 0.0, 0
    for number in numbers.tolist():
        found = model.evaluate(number, number + 1)
        rate = float(found["frequency_hz"][0])
        if not rate > 0.0:
            continue
        row = model.points.variants(model.space.values(number, number + 1), 1).rows[0]
        began = time.perf_counter()
        steady_span(LoopParameters.from_row(row), CYCLES / rate, rtol=1e-6)
        total += time.perf_counter() - began
        done += 1
    return total / max(done, 1), model.count


def measure(points: int, references: int, options: tuple[str, ...]) -> dict[str, float]:
    """All ratios; the number of points is rounded to the grid."""
    found: dict[str, float] = {"processors": float(os.cpu_count() or 1)}
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        (folder / "radio.design.toml").write_text(DESIGN)
        whole, fifth = folder / "whole.study.toml", folder / "fifth.study.toml"
        networks = max(round(points / PER_NETWORK), 2)
        whole.write_text(STUDY.format(networks=networks))
        fifth.write_text(STUDY.format(networks=max(round(networks / 5), 1)).replace(
            'count = 1, spacing = "log"', 'count = 2, spacing = "log"'))  # fmt: skip
        command(folder, fifth, "--jobs", "2", *options)
        small = command(folder, fifth, "--jobs", "2", *options)
        single = command(folder, fifth, "--jobs", "1", *options)
        remote = command(folder, fifth, "--cluster", "local:2", *options)
        large = command(folder, whole, "--jobs", "2", "--allow", str(100 * points), *options)
        slow, count = reference_seconds(whole, references, "--electrical-only" in options)
    return found | {
        "points": float(count),
        "seconds": large.seconds,
        "points_per_s": count / large.seconds,
        "reference_ms_per_point": 1e3 * slow,
        "ratio": slow * count / large.seconds,
        "two_jobs": single.seconds / small.seconds,
        "cluster": remote.seconds / small.seconds,
        "memory": large.peak_bytes / small.peak_bytes,
        "peak_megabytes": large.peak_bytes / 1e6,
        "first_row_s": large.first_row,
    }


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=(__doc__ or "").splitlines()[0])
    parser.add_argument("--json", action="store_true", help="print one JSON object")
    parser.add_argument("--points", type=int, default=1_000_000)
    parser.add_argument("--references", type=int, default=500)
    parser.add_argument("--electrical-only", action="store_true")
    given = parser.parse_args()
    found = measure(given.points, given.references, ("--electrical-only",) if given.electrical_only else ())
    if given.json:
        print(json.dumps(found, indent=2))
        return
    for name, value in found.items():
        print(f"{name:24s} {value:,.4g}")


if __name__ == "__main__":
    main()
