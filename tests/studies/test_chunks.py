"""Long tables in chunks over processes of this machine: order, progress, dying workers, kills, Ctrl-C."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator, Mapping
from concurrent.futures import Future
from dataclasses import dataclass
from multiprocessing import active_children
from pathlib import Path

import numpy as np
import pytest

from buckdesign.errors import BuckdesignError
from buckdesign.studies.chunks import Chunk, ChunkJob, Progress, chunk_bounds, chunk_count, run_chunks
from buckdesign.studies.growing_table import fill_table
from buckdesign.studies.local_workers import OwnProcess, WorkerProcesses, local_executor
from buckdesign.studies.table_file import Column
from tests.studies.plain_work import KEPT, PlainWork, opened, run, summary

ROOT = Path(__file__).parents[2]
POSIX = pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")


@pytest.mark.parametrize("rows", [0, 1, 63, 64, 65, 1064, 1065, 123_456])
def test_bounds_cover_every_row_once(rows: int) -> None:
    bounds = [chunk_bounds(index, rows) for index in range(chunk_count(rows))]
    assert [start for start, _ in bounds] == ([0] + [stop for _, stop in bounds[:-1]] if rows else [])
    assert all(start < stop for start, stop in bounds)
    assert (bounds[-1][1] if bounds else 0) == rows
    assert all(stop <= 64 for _, stop in bounds[:1])


def empty_chunk(start: int, stop: int) -> Chunk:
    return Chunk(start=start, stop=stop, text=b"", kept={}, failed=0)


class Backwards:
    """An executor that finishes what it has last got first, and counts what is in flight."""

    def __init__(self, width: int) -> None:
        self.width = width
        self.most = 0
        self.pending: list[Backwards.Late] = []

    @dataclass
    class Late:
        owner: Backwards
        start: int
        stop: int
        ready: bool = False

        def done(self) -> bool:
            return self.ready

        def result(self) -> Chunk:
            while not self.ready:
                self.owner.pending.pop().ready = True
            return empty_chunk(self.start, self.stop)

    def submit(self, start: int, stop: int) -> Late:
        late = Backwards.Late(self, start, stop)
        self.pending.append(late)
        self.most = max(self.most, len(self.pending))
        return late


def test_chunks_come_in_order_with_a_bounded_number_in_flight() -> None:
    executor = Backwards(5)
    taken: list[int] = []

    def bounds() -> Iterator[tuple[int, int]]:
        for index in range(100):
            taken.append(index)
            yield index, index + 1

    for number, chunk in enumerate(run_chunks(executor, bounds(), 100)):
        assert chunk.start == number
        assert len(taken) - number <= 5
    assert number == 99
    assert executor.most == 5


def test_the_first_chunk_is_handed_on_before_the_second_one_is_begun() -> None:
    begun: list[int] = []

    class Direct:
        width = 10

        def submit(self, start: int, stop: int) -> Future[Chunk]:
            begun.append(start)
            future: Future[Chunk] = Future()
            future.set_result(empty_chunk(start, stop))
            return future

    chunks = run_chunks(Direct(), [(0, 1), (1, 2)], 2)
    next(chunks)
    assert begun == [0]


def test_progress_is_the_rate_of_the_last_minute_without_what_was_there_before() -> None:
    now = [0.0]
    told: list[Progress] = []
    bounds = [(row, row + 100) for row in range(5000, 10_000, 100)]
    for chunk in run_chunks(Backwards(1), bounds, 10_000, told.append, lambda: now[0]):
        # 100 rows in 10 s, then, from the second half on, in 20 s (10/s and 5/s)
        now[0] += 10.0 if chunk.start < 7500 else 20.0
    assert told[0] == Progress(done=5100, count=10_000, rate=10.0, remaining=490.0)
    assert told[20].rate == 10.0
    assert told[-10].rate == 5.0
    assert told[-10].remaining == 900 / 5.0
    assert told[-1] == Progress(done=10_000, count=10_000, rate=5.0, remaining=0.0)


class WrongWork(PlainWork):
    """Rows that lack a column, or have too few values in one."""

    def evaluate(self, start: int, stop: int, jobs: int = 1) -> Mapping[str, Column]:
        columns = dict(super().evaluate(start, stop, jobs))
        if self.pause:
            columns.pop("holds")
        else:
            columns["holds"] = columns["holds"][1:]
        return columns


@pytest.mark.parametrize(("pause", "what"), [(0.0, "another length"), (1e-9, "holds")])
def test_rows_with_wrong_columns_are_a_fault(pause: float, what: str) -> None:
    with pytest.raises(ValueError, match=what):
        ChunkJob(work=WrongWork(count=10, pause=pause), kept=KEPT).compute(0, 10)


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """A table of 8000 rows, computed in one process without a break."""
    path = tmp_path_factory.mktemp("whole") / "table.csv"
    run(path, PlainWork(count=8000))
    return path.read_bytes()


def test_few_rows_or_one_job_need_no_worker() -> None:
    job = ChunkJob(work=PlainWork(count=8000), kept=KEPT)
    assert isinstance(local_executor(job, jobs=8, rows=2999), OwnProcess)
    assert isinstance(local_executor(job, jobs=1, rows=8000), OwnProcess)
    assert isinstance(local_executor(job, jobs=2, rows=8000), WorkerProcesses)


def test_the_table_is_the_same_with_worker_processes(tmp_path: Path, whole: bytes) -> None:
    path = tmp_path / "table.csv"
    # 0.2 ms a row: long enough that the workers get their share, though this process computes while they start
    chunks = run(path, PlainWork(count=8000, pause=2e-4), jobs=2)
    assert path.read_bytes() == whole
    one = run(tmp_path / "one.csv", PlainWork(count=8000))
    np.testing.assert_equal(summary(chunks), summary(one))


def run_in_workers(path: Path, work: PlainWork) -> None:
    """Compute a table in two worker processes from its first row on: none is computed here meanwhile."""
    with opened(path, work) as table, WorkerProcesses(ChunkJob(work=work, kept=KEPT), 2) as workers:
        workers.wait_until_ready()
        for _ in fill_table(table, workers):
            pass


@POSIX
def test_a_chunk_whose_worker_is_killed_is_computed_again(tmp_path: Path, whole: bytes) -> None:
    work = PlainWork(count=8000, deadly=6500, once=str(tmp_path / "died"), parent=os.getpid())
    run_in_workers(tmp_path / "table.csv", work)
    assert (tmp_path / "died").exists()
    assert (tmp_path / "table.csv").read_bytes() == whole


LONG_UNGUARDED = """
from buckdesign.studies.chunks import ChunkJob
from buckdesign.studies.local_workers import WorkerProcesses
from tests.studies.plain_work import PlainWork

with WorkerProcesses(ChunkJob(work=PlainWork(count=8000), kept={"a" * 200_000: "float"}), 2) as workers:
    workers.wait_until_ready()
"""
"""Rows longer than a pipe takes at once: whoever writes them to a process that has died must not wait."""


def test_a_script_without_a_guard_is_told_so_however_long_its_rows(tmp_path: Path) -> None:
    script = tmp_path / "script.py"
    script.write_text(LONG_UNGUARDED)
    done = subprocess.run(
        [sys.executable, str(script)], capture_output=True, text=True, timeout=60, check=False,
        env=os.environ | {"PYTHONPATH": str(Path(__file__).parents[2])},
    )  # fmt: skip
    assert done.returncode == 1
    assert 'if __name__ == "__main__":' in done.stderr.splitlines()[-1]


class Wordy(PlainWork):
    """Rows of a chunk that does not fit into a pipe."""

    def evaluate(self, start: int, stop: int, jobs: int = 1) -> Mapping[str, Column]:
        return {**super().evaluate(start, stop, jobs), "part": ["1N5822" * 500] * (stop - start)}


def test_workers_that_are_killed_amid_a_message_are_replaced(tmp_path: Path) -> None:
    work = Wordy(count=8000)
    with (
        opened(tmp_path / "table.csv", work) as table,
        WorkerProcesses(ChunkJob(work=work, kept={}), 2) as workers,
    ):
        workers.wait_until_ready()
        filling = fill_table(table, workers)
        next(filling)
        # until each has a chunk to hand over, and nobody takes it
        time.sleep(0.5)
        for child in active_children():
            child.kill()
        assert sum(1 for _ in filling) == 8
    run(tmp_path / "one.csv", work)
    assert (tmp_path / "table.csv").read_bytes() == (tmp_path / "one.csv").read_bytes()


@POSIX
def test_rows_that_kill_every_worker_are_named_and_the_rest_is_there(tmp_path: Path, whole: bytes) -> None:
    path = tmp_path / "table.csv"
    with pytest.raises(BuckdesignError, match=r"rows 6064 to 7063: the worker process died at them 3 times"):
        run_in_workers(path, PlainWork(count=8000, deadly=6500, parent=os.getpid()))
    with opened(path, PlainWork(count=8000)) as table:
        assert table.rows_done == 6064
    run(path, PlainWork(count=8000))
    assert path.read_bytes() == whole


class Failing(PlainWork):
    """Rows of which one can't be computed."""

    def evaluate(self, start: int, stop: int, jobs: int = 1) -> Mapping[str, Column]:
        if start <= 6500 < stop:
            raise BuckdesignError("row 6500")
        return super().evaluate(start, stop, jobs)


def test_an_error_of_a_worker_comes_through(tmp_path: Path) -> None:
    with pytest.raises(BuckdesignError, match=r"^row 6500"):
        run_in_workers(tmp_path / "table.csv", Failing(count=8000))


class Unreadable(PlainWork):
    """Rows that a worker can't unpickle."""

    def __reduce__(self) -> tuple[Callable[..., object], tuple[str]]:
        return int, ("no rows",)


def test_rows_that_cannot_be_unpickled_are_told_and_not_tried_for_ever(tmp_path: Path) -> None:
    with pytest.raises(ValueError, match="no rows"):
        run(tmp_path / "table.csv", Unreadable(count=50_000, pause=2e-4), jobs=2)


UNGUARDED = """
import sys
from pathlib import Path
from tests.studies.plain_work import PlainWork, run
run(Path(sys.argv[1]), PlainWork(count=50_000, pause=2e-4), jobs=2)
"""


def test_a_script_without_a_guard_is_told(tmp_path: Path) -> None:
    script = tmp_path / "script.py"
    script.write_text(UNGUARDED)
    done = subprocess.run(
        [sys.executable, script, tmp_path / "table.csv"],
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        timeout=60,
    )
    assert done.returncode == 1
    assert 'if __name__ == "__main__":' in done.stderr.splitlines()[-1], done.stderr


# a whole run from outside


def started(path: Path, rows: int, pause: float, where: str) -> subprocess.Popen[str]:
    """A run in a process group of its own; it prints the rows that are on disk."""
    return subprocess.Popen(
        [sys.executable, "-m", "tests.studies.plain_work", str(path), str(rows), str(pause), where],
        cwd=ROOT,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )


def wait_for_rows(process: subprocess.Popen[str], rows: int) -> int:
    assert process.stdout is not None
    for line in process.stdout:
        if int(line) >= rows:
            return int(line)
    assert process.stderr is not None
    raise AssertionError(process.stderr.read())


@POSIX
def test_kills_at_random_moments_lose_double_and_tear_no_row(tmp_path: Path, whole: bytes) -> None:
    path = tmp_path / "table.csv"
    part = tmp_path / "table.csv.part"
    chance = random.Random(20)
    kills, done = 0, 0
    while kills < 8 and not path.exists():
        process = started(path, 8000, 5e-4, "1" if kills % 2 else "2")
        if kills % 4:
            wait_for_rows(process, done)
        time.sleep(chance.uniform(0.0, 0.3))
        process.kill()
        kills += 1
        # the workers end too: only then nobody holds the other end of the pipes
        process.communicate(timeout=20)
        if part.exists() and part.stat().st_size:
            length = part.stat().st_size
            assert part.read_bytes() == whole[:length]
            with opened(path, PlainWork(count=8000)) as table:
                assert table.rows_done >= done
                done = table.rows_done
    assert kills > 3
    run(path, PlainWork(count=8000), jobs=2)
    assert path.read_bytes() == whole
    assert sorted(file.name for file in tmp_path.iterdir()) == ["table.csv", "table.csv.run.jsonl"]


@POSIX
@pytest.mark.parametrize("where", ["1", "2"])
def test_an_interrupt_ends_quietly_and_can_be_resumed(tmp_path: Path, whole: bytes, where: str) -> None:
    path = tmp_path / "table.csv"
    process = started(path, 8000, 5e-4, where)
    wait_for_rows(process, 3064)
    os.killpg(process.pid, signal.SIGINT)
    _, errors = process.communicate(timeout=10)
    assert (process.returncode, errors) == (130, "")
    with opened(path, PlainWork(count=8000)) as table:
        assert 3064 <= table.rows_done < 8000
    run(path, PlainWork(count=8000))
    assert path.read_bytes() == whole
