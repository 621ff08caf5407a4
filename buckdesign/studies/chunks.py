"""A long table computed in chunks: their bounds, what a chunk is made of, and chunks in order from an executor.

The bounds depend on the number of rows alone, so that the same table comes out however many workers compute it.
"""

from __future__ import annotations

import time
from collections import deque
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from buckdesign.studies.table_file import Column, Kind, csv_lines, kept_values

FIRST_ROWS = 64
"""Rows of the first chunk: few, so that the first rows come at once (own choice)."""

CHUNK_ROWS = 1000
"""Rows of every other chunk: about a second of one processor (own choice)."""

FAILURE_COLUMN = "failure"
"""Column that tells why a row could not be computed; empty where it was."""

WINDOW_SECONDS = 60.0
"""Time over which the rate of progress is taken [s] (own choice)."""


class Work(Protocol):
    """Rows of a table, computed on demand. It must survive pickling."""

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns in order."""

    @property
    def count(self) -> int:
        """Number of rows."""

    def evaluate(self, start: int, stop: int, jobs: int = 1) -> Mapping[str, Column]:
        """The columns of rows `start` to `stop` (exclusive), with `jobs` threads; the same values each time."""


@dataclass(frozen=True, kw_only=True)
class Chunk:
    """Some rows of the table.

    Attributes
    ----------
    start, stop : int
        First row, and the one after the last.
    text : bytes
        Their lines; empty where the rows were read back from the table.
    kept : dict of str to array or list, shape (stop - start,)
        The columns that a summary needs, see `buckdesign.studies.table_file.kept_values`.
    failed : int
        Rows that could not be computed.
    """

    start: int
    stop: int
    text: bytes
    kept: dict[str, NDArray[np.float64] | list[Any]]
    failed: int


@dataclass(frozen=True, kw_only=True)
class ChunkJob:
    """What a worker needs: rows, and which columns are kept beside the text. It can be pickled.

    Attributes
    ----------
    work : Work
        The rows.
    kept : mapping of str to Kind
        Columns that go into `Chunk.kept`.
    """

    work: Work
    kept: Mapping[str, Kind]

    def compute(self, start: int, stop: int, jobs: int = 1) -> Chunk:
        """The chunk of rows `start` to `stop`, with `jobs` threads.

        Raises
        ------
        ValueError
            The rows have other columns than they should.
        """
        columns = self.work.evaluate(start, stop, jobs=jobs)
        if set(columns) != set(self.work.columns):
            raise ValueError(
                f"columns {sorted(set(columns) ^ set(self.work.columns))} are missing or too many"
            )
        ordered = {name: columns[name] for name in self.work.columns}
        if any(len(column) != stop - start for column in ordered.values()):
            raise ValueError(f"rows {start} to {stop} have columns of another length")
        return Chunk(
            start=start,
            stop=stop,
            text=csv_lines(ordered),
            kept={name: kept_values(ordered[name], kind) for name, kind in self.kept.items()},
            failed=count_failed(ordered.get(FAILURE_COLUMN, ())),
        )


def count_failed(failures: Iterable[Any]) -> int:
    """How many of the texts of a column of failures are not empty."""
    return sum(1 for failure in failures if failure)


@dataclass(frozen=True, kw_only=True)
class ChunkSizes:
    """How a table is cut.

    Attributes
    ----------
    first : int
        Rows of the first chunk.
    rest : int
        Rows of every other chunk.
    """

    first: int = FIRST_ROWS
    rest: int = CHUNK_ROWS


USUAL_SIZES = ChunkSizes()
"""How tables are cut whose rows take about a millisecond each."""


def chunk_count(rows: int, sizes: ChunkSizes = USUAL_SIZES) -> int:
    """Number of chunks of a table with so many rows."""
    return 0 if rows <= 0 else 1 + -(-max(rows - sizes.first, 0) // sizes.rest)


def chunk_bounds(index: int, rows: int, sizes: ChunkSizes = USUAL_SIZES) -> tuple[int, int]:
    """First row of a chunk and the one after its last, in a table with so many rows.

    Examples
    --------
    >>> [chunk_bounds(index, 1500) for index in range(chunk_count(1500))]
    [(0, 64), (64, 1064), (1064, 1500)]
    """
    start = 0 if index == 0 else sizes.first + (index - 1) * sizes.rest
    return start, min(sizes.first + index * sizes.rest, rows)


class Pending(Protocol):
    """A chunk that is being computed."""

    def done(self) -> bool:
        """Whether `result` has not to wait."""

    def result(self) -> Chunk:
        """The chunk, as soon as it is there; raises what went wrong."""


class Executor(Protocol):
    """Something that computes chunks."""

    @property
    def width(self) -> int:
        """Chunks that should be in flight."""

    def submit(self, start: int, stop: int) -> Pending:
        """Begin with rows `start` to `stop`."""


@dataclass(frozen=True, kw_only=True)
class Progress:
    """How far a table is.

    Attributes
    ----------
    done, count : int
        Rows that are on disk, and rows in all.
    rate : float
        Rows a second over the last minute, without those that were there before [1/s].
    remaining : float
        Time that is left at this rate [s].
    """

    done: int
    count: int
    rate: float
    remaining: float


def run_chunks(
    executor: Executor,
    bounds: Iterable[tuple[int, int]],
    count: int,
    progress: Callable[[Progress], None] | None = None,
    clock: Callable[[], float] = time.monotonic,
) -> Iterator[Chunk]:
    """Chunks in order, computed with a bounded number in flight.

    Parameters
    ----------
    executor : Executor
        Computes them.
    bounds : iterable of (int, int)
        First row and the one after the last of each.
    count : int
        Rows of the whole table.
    progress : callable, optional
        Told about each chunk once the caller has come back for the next.
    clock : callable
        Seconds.

    Yields
    ------
    Chunk
        In the order of `bounds`; nothing more is begun while the caller holds one.
    """
    waiting = iter(bounds)
    pending: deque[Pending] = deque()
    speed = _Speed(clock)
    while True:
        while len(pending) < executor.width and (bound := next(waiting, None)):
            pending.append(executor.submit(*bound))
            if pending[0].done():
                break
        if not pending:
            return
        chunk = pending.popleft().result()
        yield chunk
        if progress is not None:
            rate = speed.after(chunk.stop - chunk.start)
            progress(Progress(done=chunk.stop, count=count, rate=rate, remaining=(count - chunk.stop) / rate))


class _Speed:
    """Rows a second over a window of time."""

    def __init__(self, clock: Callable[[], float]) -> None:
        self._clock = clock
        self._rows = 0
        self._marks = deque([(clock(), 0)])

    def after(self, rows: int) -> float:
        now = self._clock()
        self._rows += rows
        self._marks.append((now, self._rows))
        while len(self._marks) > 2 and self._marks[1][0] < now - WINDOW_SECONDS:
            self._marks.popleft()
        began, before = self._marks[0]
        return (self._rows - before) / max(now - began, 1e-9)
