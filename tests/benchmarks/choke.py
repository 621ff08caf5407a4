"""How fast windings are judged: as arrays, and one by one in a Python loop over the same functions.

Run it as a script; ``--json`` prints one JSON object. The ratio is measured side by side in one run, in
processor time of one core; it passes or fails nothing.
"""

from __future__ import annotations

import argparse
import json
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

from buckdesign.design.choke_search import (
    Candidates,
    ChokeColumns,
    ChokeNeed,
    Duty,
    choke_columns,
    choose_chokes,
    evaluate_windings,
)
from buckdesign.parts import load_tables

COUNT = 200_000
CHUNK = 20_000
LOOPED = 300
REPEATS = 3
DUTY = Duty(current=2.5, ripple=0.6, frequency=20e3, duty=0.5, ambient_c=40.0)


def random_candidates(columns: ChokeColumns, count: int) -> Candidates:
    """Windings that have nothing in common, the hardest case: nothing is computed once for many."""
    rng = np.random.default_rng(1)
    powder = [index for index, one in enumerate(columns.materials) if one.kind == "iron powder"]
    return Candidates(
        ring=rng.integers(len(columns.rings), size=count),
        material=rng.choice(powder, size=count),
        wire=rng.integers(len(columns.wires), size=count),
        strands=rng.integers(1, 5, size=count),
        stack=rng.integers(1, 4, size=count),
        turns=rng.integers(5, 120, size=count),
    )


def slice_of(candidates: Candidates, at: slice) -> Candidates:
    """Some of the candidates."""
    return Candidates(
        ring=candidates.ring[at],
        material=candidates.material[at],
        wire=candidates.wire[at],
        strands=candidates.strands[at],
        stack=candidates.stack[at],
        turns=candidates.turns[at],
    )


def quickest(work: Callable[[], Any]) -> float:
    """Processor time of the best of a few runs [s]."""
    times = []
    for _ in range(REPEATS):
        start = time.process_time()
        work()
        times.append(time.process_time() - start)
    return min(times)


def measure() -> dict[str, float]:
    """Rates and their ratio."""
    tables = load_tables(folder=Path("no own tables"))
    columns = choke_columns(tables)
    candidates = random_candidates(columns, COUNT)
    evaluate_windings(columns, slice_of(candidates, slice(0, 10)), DUTY)

    def arrays() -> None:
        for start in range(0, COUNT, CHUNK):
            evaluate_windings(columns, slice_of(candidates, slice(start, start + CHUNK)), DUTY)

    def loop() -> None:
        for index in range(LOOPED):
            evaluate_windings(columns, slice_of(candidates, slice(index, index + 1)), DUTY)

    need = ChokeNeed(inductance=200e-6, current=2.5, ripple=0.6, frequency=20e3, ambient_c=40.0)
    searched = choose_chokes(tables, need).evaluated
    fast, slow = COUNT / quickest(arrays), LOOPED / quickest(loop)
    return {
        "candidates_per_second": fast,
        "loop_candidates_per_second": slow,
        "ratio": fast / slow,
        "search_candidates_per_second": searched / quickest(lambda: choose_chokes(tables, need)),
        "search_candidates": searched,
    }


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
        print(f"{name.replace('_', ' '):32s} {value:12,.0f}")


if __name__ == "__main__":
    main()
