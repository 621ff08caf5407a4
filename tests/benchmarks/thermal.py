"""How many electro-thermal steady states a second two processors find, and electrical ones beside them.

Run it as a script; ``--json`` prints one JSON object. Rates are measured side by side in one run, in wall time
and in processor time of both processors; it passes or fails nothing.
"""

from __future__ import annotations

import argparse
import json
import os
import sys
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

sys.path.insert(0, str(Path(__file__).parents[2]))

from buckdesign.design.operating import operate_rows
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import steady_states
from tests.design.operating_designs import random_rows, resolved_bench

COUNT = 4000
REPEATS = 3
PROCESSORS = 2


def usual(rows: np.ndarray[Any, np.dtype[np.float64]]) -> np.ndarray[Any, np.dtype[np.float64]]:
    """Those of the random supplies that have enough supply and a load that they can carry."""
    supply, load = rows[:, COLUMN["supply_voltage"]], rows[:, COLUMN["load_current"]]
    output = 1.25 * (1.0 + rows[:, COLUMN["r2"]] / rows[:, COLUMN["r1"]])
    return rows[(supply > output + 2.0) & (load > 0.0) & (load < 10.0)]


def best(work: Callable[[], Any]) -> tuple[float, float]:
    """Least wall and processor time of a few runs [s]."""
    wall, used = [], []
    for _ in range(REPEATS):
        start, began = time.perf_counter(), time.process_time()
        work()
        wall.append(time.perf_counter() - start)
        used.append(time.process_time() - began)
    return min(wall), min(used)


def measure() -> dict[str, float]:
    """Rates of two populations."""
    resolved = resolved_bench()
    mixed = random_rows(COUNT, 3)
    found: dict[str, float] = {"processors": float(os.cpu_count() or 1)}
    operate_rows(mixed[:8], resolved, jobs=PROCESSORS)
    for name, rows in (("usual", usual(mixed)), ("mixed", mixed)):
        together = operate_rows(rows, resolved, jobs=PROCESSORS)
        period = together.loop.column("period_cycles")
        for kind, work in (
            ("electrical", lambda rows=rows: steady_states(rows, jobs=PROCESSORS)),
            ("electro_thermal", lambda rows=rows: operate_rows(rows, resolved, jobs=PROCESSORS)),
        ):
            wall, used = best(work)
            found[f"{name}_{kind}_per_second"] = len(rows) / wall
            found[f"{name}_{kind}_per_processor_second"] = len(rows) / used
        found[f"{name}_designs"] = float(len(rows))
        found[f"{name}_irregular_share"] = float((period < 0.0).mean())
        found[f"{name}_settled_share"] = float(together.is_settled.mean())
    regular = usual(mixed)
    regular = regular[operate_rows(regular, resolved).loop.column("period_cycles") == 1.0]
    wall, used = best(lambda: operate_rows(regular, resolved, jobs=PROCESSORS))
    found["regular_electro_thermal_per_second"] = len(regular) / wall
    found["regular_electro_thermal_per_processor_second"] = len(regular) / used
    return found


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--json", action="store_true", help="print one JSON object")
    as_json = parser.parse_args().json
    found = measure()
    if as_json:
        print(json.dumps(found, indent=2))
        return
    for name, value in found.items():
        print(f"{name.replace('_', ' '):52s} {value:12,.3f}")


if __name__ == "__main__":
    main()
