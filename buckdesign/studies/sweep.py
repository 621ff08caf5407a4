"""Sweeps: the points of a study computed into a table, on one machine or a cluster, with what they come to."""

from __future__ import annotations

import hashlib
import math
import os
import tempfile
from collections.abc import Callable, Iterator, Mapping
from contextlib import AbstractContextManager, ExitStack
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from buckdesign import __version__
from buckdesign.design.design_file import read_design
from buckdesign.design.keys import CountKey, FlagKey, Key, QuantityKey
from buckdesign.design.requirement import read_requirement
from buckdesign.errors import InputError
from buckdesign.parts import Tables, load_tables
from buckdesign.studies.chunks import Chunk, ChunkJob, ChunkSizes, Executor, Progress, Work
from buckdesign.studies.growing_table import GrowingTable, fill_table, open_table
from buckdesign.studies.point_model import PointModel
from buckdesign.studies.redesign_model import CHOSEN, CHOSEN_NAMES, WORST, RedesignModel
from buckdesign.studies.result_columns import RESULT_COLUMNS, TEXT_COLUMNS, TRUTH_COLUMNS
from buckdesign.studies.space import SampledSpace
from buckdesign.studies.study_file import Study, read_study
from buckdesign.studies.study_keys import study_columns
from buckdesign.studies.sweep_summary import Objectives, SweepSummary
from buckdesign.studies.table_file import Kind, csv_header, csv_lines, read_table, split_rows

if TYPE_CHECKING:
    import pandas as pd

MOST_POINTS = 1_000_000
"""Points that a sweep computes without being asked twice (own choice: some minutes)."""

MOST_REDESIGNS = 500
"""The same where each point is designed anew (own choice: some minutes)."""

REDESIGN_CHUNKS = ChunkSizes(first=1, rest=4)
"""Points that are designed together: few, since each takes seconds (own choice)."""

_SAID = ("violated", "failure")
_TRUTHS = (*TRUTH_COLUMNS, "constraints_hold")


@dataclass(frozen=True, kw_only=True)
class SweepTask:
    """A study ready to be computed.

    Attributes
    ----------
    study : Study
        The study.
    work : Work
        Its points.
    kinds : Mapping
        What each column of the table holds, in order.
    units : Mapping
        Unit of each column as `buckdesign.units` names it, for those that have one.
    content : Mapping
        All that the table depends on, as plain data.
    sizes : ChunkSizes
        Points computed together.
    electrical_only : bool
        Without temperatures and losses added on.
    """

    study: Study
    work: Work
    kinds: Mapping[str, Kind]
    units: Mapping[str, str]
    content: Mapping[str, Any]
    sizes: ChunkSizes
    electrical_only: bool = False

    @property
    def objectives(self) -> Objectives:
        """What the study looks for."""
        study = self.study
        return Objectives(
            minimise=study.minimise,
            maximise=study.maximise,
            subject_to=tuple(one.text for one in study.subject_to),
        )

    def default_output(self) -> Path:
        """The table where none is named: beside the study, ``rail.study.toml`` gives ``rail.study.csv``."""
        return self.study.path.with_name(self.study.path.name.removesuffix(".toml") + ".csv")


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


def sweep_task(
    study: Path | Study, tables: Tables | None = None, *, electrical_only: bool = False
) -> SweepTask:
    """Make a study ready to be computed.

    Parameters
    ----------
    study : pathlib.Path or Study
        The file, or what was read from it.
    tables : Tables, optional
        Parts that it names; the tables of the package where omitted.
    electrical_only : bool
        No temperatures and no losses added on.

    Returns
    -------
    SweepTask
        For `run_sweep`.

    Raises
    ------
    InputError
        A file has faults, or a requirement is to be designed without temperatures.
    """
    known = load_tables() if tables is None else tables
    redesign = (*WORST, *(f"values.{name}" for name in CHOSEN))
    results = (*RESULT_COLUMNS, *TRUTH_COLUMNS)
    asked = study if isinstance(study, Study) else read_study(Path(study), known, results, redesign)
    content: dict[str, Any] = {"study": asked.tree, "electrical_only": electrical_only}
    if asked.requirement is not None:
        if electrical_only:
            raise InputError("--electrical-only: a study that designs anew at each point needs the temperatures")
        wanted = read_requirement(asked.requirement, known)
        work: Work = RedesignModel(wanted, asked.space, known, subject_to=asked.subject_to)
        content["requirement"] = wanted.tree()
    else:
        assert asked.base is not None
        base = read_design(asked.base, known)
        work = PointModel(
            base, asked.space, known, subject_to=asked.subject_to, electrical_only=electrical_only
        )
        content["design"] = base.tree()
    varied = {one.name: one.key for axis in asked.space.axes for one in axis.varied}
    columns = study_columns(varied, [*RESULT_COLUMNS, *(redesign if asked.requirement is not None else ())])
    return SweepTask(
        study=asked,
        work=work,
        kinds={name: _kind(name, varied) for name in work.columns},
        units={name: _unit(one.unit, one.power) for name, one in columns.items() if one.unit is not None},
        content=content | _versions(known, asked),
        sizes=ChunkSizes() if asked.requirement is None else REDESIGN_CHUNKS,
        electrical_only=electrical_only,
    )


def _unit(unit: str, power: int) -> str:
    return "cm3" if (unit, power) == ("m3", 6) else "mm" if (unit, power) == ("m", 3) else unit


def _kind(name: str, varied: Mapping[str, Key]) -> Kind:
    key = varied.get(name)
    if key is not None:
        if isinstance(key, QuantityKey):
            return "float"
        return "int" if isinstance(key, CountKey) else "bool" if isinstance(key, FlagKey) else "text"
    if name in _TRUTHS:
        return "bool"
    words = name in (*TEXT_COLUMNS, *_SAID) or name.removeprefix("values.") in CHOSEN_NAMES
    return "text" if words else "float"


def _versions(tables: Tables, study: Study) -> dict[str, Any]:
    """What else the values depend on."""
    digest = hashlib.sha256(repr(tables).encode()).hexdigest()[:16]
    found = {"buckdesign": __version__, "part_tables": digest}
    if isinstance(study.space, SampledSpace):
        import scipy

        found["scipy"] = scipy.__version__
    return found


def check_size(task: SweepTask, allow: int | None) -> None:
    """Refuse a study that is larger than one would expect.

    Parameters
    ----------
    task : SweepTask
        The study.
    allow : int, optional
        Points that are allowed.

    Raises
    ------
    InputError
        It has more points; says how many.
    """
    redesigns = task.study.requirement is not None
    most = allow if allow is not None else MOST_REDESIGNS if redesigns else MOST_POINTS
    count = task.work.count
    if count > most:
        raise InputError(
            f"{task.study.path}: {count:,} points, more than {most:,}; --allow {count} computes them all"
        )


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
