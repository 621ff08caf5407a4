"""Rows that cost nothing, for the tests of what runs, writes and resumes long tables."""

from __future__ import annotations

import os
import signal
import sys
import time
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from buckdesign.errors import BuckdesignError
from buckdesign.studies.chunks import Chunk, ChunkJob
from buckdesign.studies.cluster import cluster_executor
from buckdesign.studies.growing_table import GrowingTable, fill_table, open_table
from buckdesign.studies.local_workers import local_executor
from buckdesign.studies.table_file import Column, Kind

KINDS: dict[str, Kind] = {
    "row": "int",
    "part": "text",
    "ripple_v": "float",
    "unknown_w": "float",
    "holds": "bool",
    "failure": "text",
}
KEPT: dict[str, Kind] = {"row": "int", "ripple_v": "float", "holds": "bool", "part": "text"}
PARTS = ("1N5822", 'a "fast" one, axial', "two\nlines", "10 % off")


@dataclass(frozen=True, kw_only=True)
class PlainWork:
    """Rows computed from their number (invented).

    Attributes
    ----------
    count : int
        Rows.
    pause : float
        Time that a row takes [s].
    deadly : int
        Row at which the process ends as if it were killed; -1: none.
    once : str
        With it only where this file does not exist yet, which is made first.
    parent : int
        Process that never ends so.
    """

    count: int
    pause: float = 0.0
    deadly: int = -1
    once: str = ""
    parent: int = 0

    @property
    def columns(self) -> tuple[str, ...]:
        return tuple(KINDS)

    def evaluate(self, start: int, stop: int, jobs: int = 1) -> Mapping[str, Column]:
        time.sleep(self.pause * (stop - start))
        if start <= self.deadly < stop and os.getpid() != self.parent:
            self._die()
        rows = np.arange(start, stop)
        return {
            "failure": ["no steady state" if row % 97 == 5 else "" for row in rows],
            "holds": [None if row % 97 == 5 else bool(row % 3) for row in rows],
            "row": rows,
            "part": [PARTS[row % len(PARTS)] for row in rows],
            "ripple_v": np.where(rows % 97 == 5, np.nan, np.sin(rows) / 3.0),
            "unknown_w": np.full(len(rows), np.nan),
        }

    def _die(self) -> None:
        if self.once:
            try:
                Path(self.once).touch(exist_ok=False)
            except FileExistsError:
                return
        os.kill(os.getpid(), signal.SIGKILL)


def content_of(work: PlainWork) -> dict[str, Any]:
    """What a record says of such rows; not how long they take."""
    return {"study": {"rows": work.count, "vary": {"choke.turns": [30, 31]}}, "version": "0.1.0"}


def opened(path: Path, work: PlainWork, *, restart: bool = False) -> GrowingTable:
    """The table of such rows."""
    return open_table(path, content=content_of(work), kinds=KINDS, count=work.count, restart=restart)


def run(
    path: Path,
    work: PlainWork,
    *,
    jobs: int = 1,
    cluster: str = "",
    restart: bool = False,
    told: Callable[[Chunk], None] = lambda chunk: None,
) -> list[Chunk]:
    """Compute such a table here or on a cluster; its rows, those that were there and those that are new."""
    with opened(path, work, restart=restart) as table:
        chunks = list(table.read_back(KEPT))
        if not table.finished:
            job = ChunkJob(work=work, kept=KEPT)
            left = table.count - table.rows_done
            workers = cluster_executor(job, cluster) if cluster else local_executor(job, jobs=jobs, rows=left)
            with workers as executor:
                for chunk in fill_table(table, executor):
                    chunks.append(chunk)
                    told(chunk)
        return chunks


def summary(chunks: list[Chunk]) -> dict[str, list[Any]]:
    """The kept columns of all rows, in order, and the failures."""
    whole: dict[str, list[Any]] = {name: [] for name in KEPT}
    for chunk in chunks:
        for name, values in chunk.kept.items():
            whole[name].extend(values)
    return {**whole, "failed": [sum(chunk.failed for chunk in chunks)]}


def main(path: str, count: str, pause: str, where: str) -> int:
    """Compute such a table as a command would: exit status 2 or 1 with one line, 130 after Ctrl-C."""
    where_to = {"jobs": int(where)} if where.isdigit() else {"cluster": where}
    work = PlainWork(count=int(count), pause=float(pause))
    try:
        run(Path(path), work, told=lambda chunk: print(chunk.stop, flush=True), **where_to)
    except BuckdesignError as error:
        print(error, file=sys.stderr)
        return error.exit_status
    except KeyboardInterrupt:
        return 130
    return 0


if __name__ == "__main__":
    sys.exit(main(*sys.argv[1:]))
