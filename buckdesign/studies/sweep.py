"""Sweeps: the points of a study computed into a table, on one machine or a cluster, with what they come to."""

from __future__ import annotations

import math
import os
import tempfile
from collections.abc import Callable, Iterator, Mapping
from contextlib import AbstractContextManager, ExitStack
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from buckdesign.errors import FileAccessError
from buckdesign.parts import Tables
from buckdesign.studies.chunks import Chunk, ChunkJob, ChunkSizes, Executor, Progress
from buckdesign.studies.growing_table import GrowingTable, fill_table, open_table
from buckdesign.studies.study_file import Study
from buckdesign.studies.sweep_summary import SweepSummary
from buckdesign.studies.sweep_task import MOST_POINTS, MOST_REDESIGNS, SweepTask, check_size, sweep_task
from buckdesign.studies.table_file import PARQUET_SUFFIX, Kind, csv_header, csv_lines, read_table, split_rows

if TYPE_CHECKING:
    import pandas as pd

SUFFIXES = (".csv", PARQUET_SUFFIX)
"""Endings of a table."""


@dataclass(frozen=True, kw_only=True)
class SweepResult:
    """A finished sweep.

    Attributes
    ----------
    task : SweepTask
        What was computed.
    path : pathlib.Path
        The table.
    summary : SweepSummary
        What it comes to.
    computed : int
        Points computed now; the others were there before.
    notes : tuple of str
        What the user should know.
    """

    task: SweepTask
    path: Path
    summary: SweepSummary
    computed: int
    notes: tuple[str, ...] = field(default=())

    @property
    def failed(self) -> int:
        """Points that could not be computed."""
        return self.summary.failed

    def best(self) -> pd.DataFrame:
        """The best rows, their number in the table (from 0) as index."""
        best = self.summary.best()
        return self._frame([line for _, line in best], [number for number, _ in best])

    def front(self) -> pd.DataFrame:
        """The rows on the front, their number in the table (from 0) as index."""
        front = self.summary.front()
        return self._frame(front.lines, front.index.tolist())

    def sample(self) -> pd.DataFrame:
        """Rows evenly spread over the table, their number (from 0) as index."""
        sample = self.summary.sample
        return self._frame([line for _, line in sample], [number for number, _ in sample])

    def rows(self) -> Iterator[dict[str, Any]]:
        """The table row by row; what is not known is None."""
        for piece in read_table(self.path, self.task.kinds):
            yield from _records(piece)

    def to_dict(self) -> dict[str, Any]:
        """The summary by key, without the rows."""
        summary, objectives = self.summary, self.task.objectives
        best = self.best()
        return {
            "table": str(self.path),
            "points": summary.count,
            "computed_now": self.computed,
            "failed": summary.failed,
            "unsettled": summary.unsettled,
            "keeping_constraints": summary.keeping,
            "within_limits": summary.unviolated,
            "regimes": dict(sorted(summary.regimes.items())),
            "failures": [{"reason": reason, "points": count} for reason, count in summary.told_reasons()],
            "minimise": list(objectives.minimise),
            "maximise": list(objectives.maximise),
            "subject_to": list(objectives.subject_to),
            "best": [
                {"row": int(number), **record} for number, record in zip(best.index, _records(best), strict=True)
            ],
            "front_rows": summary.front().index.tolist(),
        }

    def _frame(self, lines: list[bytes], numbers: list[int]) -> pd.DataFrame:
        import pandas as pd

        kinds = self.task.kinds
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder) / "rows.csv"
            path.write_bytes(csv_header(tuple(kinds)) + b"".join(lines))
            pieces = list(read_table(path, kinds))
        if not pieces:
            return pd.DataFrame(columns=list(kinds), index=pd.Index([], name="row"))
        frame = pd.concat(pieces, ignore_index=True)
        frame.index = pd.Index(numbers, name="row")
        return frame


def _records(piece: pd.DataFrame) -> list[dict[str, Any]]:
    plain = piece.astype(object).where(piece.notna(), None)
    return [{str(key): value for key, value in record.items()} for record in plain.to_dict("records")]


def run_sweep(
    task: SweepTask,
    output: Path | None = None,
    *,
    jobs: int | None = None,
    cluster: str | None = None,
    restart: bool = False,
    allow: int | None = None,
    progress: Callable[[Progress], None] | None = None,
    tell: Callable[[str], None] | None = None,
) -> SweepResult:
    """Compute a study into a table, or go on with one that was begun.

    Parameters
    ----------
    task : SweepTask
        The study, see `sweep_task`.
    output : pathlib.Path, optional
        The table, CSV or ``.parquet``; `SweepTask.default_output` where omitted.
    jobs : int, optional
        Processes; as many as there are processors by default. The table does not depend on it.
    cluster : str, optional
        Address of a Dask scheduler, or ``local:N``, instead of `jobs`.
    restart : bool
        Begin anew, whatever is there.
    allow : int, optional
        Most points, where a study has more than usual.
    progress : callable, optional
        Told how far it is.
    tell : callable, optional
        Told what else happens, in a few words.

    Returns
    -------
    SweepResult
        The finished sweep.

    Raises
    ------
    InputError
        Too many points, a table of another study, a file that can't be written, or a cluster that can't be had.
    """
    check_size(task, allow)
    told = tell or (lambda words: None)
    path = task.default_output() if output is None else Path(output)
    _check_output(path, task.study)
    summary = SweepSummary(objectives=task.objectives, count=task.work.count)
    needed = {name: task.kinds[name] for name in task.objectives.needed()}
    notes = list(task.study.notes)
    job = ChunkJob(work=task.work, kept=needed)
    with ExitStack() as stack:
        # the cluster first: where it can't be had, what is on disk stays as it is
        executor = stack.enter_context(_cluster(job, cluster)) if cluster is not None else None
        table = stack.enter_context(
            open_table(
                path, content=task.content, kinds=task.kinds, count=task.work.count, restart=restart,
                sizes=task.sizes,
            )
        )  # fmt: skip
        before = table.rows_done
        _take_back(table, summary, task.kinds)
        if before:
            told(f"{before:,} of {table.count:,} points are there already")
        if not table.finished:
            executor = executor or stack.enter_context(_local(job, jobs, table.count - before, task.sizes))
            for chunk in fill_table(table, executor, progress):
                _take(summary, chunk)
            notes += getattr(executor, "notes", ())
    return SweepResult(
        task=task, path=path, summary=summary, computed=task.work.count - before, notes=tuple(notes)
    )


def _check_output(path: Path, study: Study) -> None:
    """Refuse a table that has no known ending or would replace what it is computed from."""
    if path.suffix not in SUFFIXES:
        raise FileAccessError(path, f"a table ends in {' or '.join(SUFFIXES)}")
    for source in (study.path, study.base, study.requirement):
        if source is not None and path.exists() and source.exists() and path.samefile(source):
            raise FileAccessError(path, "the study is computed from this file; another name is wanted")


def _cluster(job: ChunkJob, address: str) -> AbstractContextManager[Executor]:
    from buckdesign.studies.cluster import cluster_executor

    return cluster_executor(job, address)


def _local(job: ChunkJob, jobs: int | None, rows: int, sizes: ChunkSizes) -> AbstractContextManager[Executor]:
    from buckdesign.studies.local_workers import SMALL_ROWS, local_executor

    slow = sizes != ChunkSizes() and rows > sizes.rest
    workers = max(1, jobs or os.cpu_count() or 1)
    return local_executor(job, jobs=workers, rows=max(rows, SMALL_ROWS) if slow else rows)


def _take(summary: SweepSummary, chunk: Chunk) -> None:
    lines: list[bytes] = []

    def line(place: int) -> bytes:
        if not lines:
            lines.extend(split_rows(chunk.text))
        return lines[place]

    summary.add(chunk.start, line, chunk.kept)


def _take_back(table: GrowingTable, summary: SweepSummary, kinds: Mapping[str, Kind]) -> None:
    """Take in the rows that are on disk already."""
    if not table.rows_done:
        return
    for chunk in table.read_back(kinds):
        values = chunk.kept

        def line(place: int, values: Mapping[str, Any] = values) -> bytes:
            return csv_lines({name: _cell(values[name][place], kind) for name, kind in kinds.items()})

        summary.add(chunk.start, line, values)


def _cell(value: Any, kind: Kind) -> list[Any]:
    if kind == "int" and value is not None and not math.isnan(value):
        return [int(value)]
    return [value]


def sweep(
    study: Path | str,
    output: Path | None = None,
    *,
    tables: Tables | None = None,
    electrical_only: bool = False,
    jobs: int | None = None,
    cluster: str | None = None,
    restart: bool = False,
    allow: int | None = None,
    progress: Callable[[Progress], None] | None = None,
) -> pd.DataFrame:
    """Compute a study, and give back the whole table.

    Parameters
    ----------
    study : pathlib.Path or str
        The study file.
    output : pathlib.Path, optional
        A table to write as well, which can be taken up again when it was broken off; none by default.
    tables : Tables, optional
        Parts that the study names; the tables of the package where omitted.
    electrical_only : bool
        No temperatures and no losses added on.
    jobs : int, optional
        Processes; as many as there are processors by default. A script that asks for more than one of them does
        so under ``if __name__ == "__main__":``.
    cluster : str, optional
        Address of a Dask scheduler, or ``local:N``, instead of `jobs`.
    restart : bool
        Begin `output` anew, whatever is there.
    allow : int, optional
        Most points, where a study has more than usual.
    progress : callable, optional
        Told how far it is.

    Returns
    -------
    DataFrame
        One row a point: varied keys [SI], then the keys of one simulation with dots, then what is said about the
        point; ``attrs["summary"]`` is what it comes to.

    Raises
    ------
    InputError
        A file has faults, or the table can't be written.
    """
    import pandas as pd

    task = sweep_task(Path(study), tables, electrical_only=electrical_only)
    with tempfile.TemporaryDirectory() as folder:
        place = Path(folder) / "table.csv" if output is None else Path(output)
        result = run_sweep(
            task, place, jobs=jobs, cluster=cluster, restart=restart, allow=allow, progress=progress
        )
        frame = pd.concat(list(read_table(result.path, task.kinds)), ignore_index=True)
        frame.attrs["summary"] = result.to_dict() | ({"table": None} if output is None else {})
    return frame


__all__ = [
    "MOST_POINTS",
    "MOST_REDESIGNS",
    "SweepResult",
    "SweepTask",
    "check_size",
    "run_sweep",
    "sweep",
    "sweep_task",
]
