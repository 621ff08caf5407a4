"""Long tables on a Dask cluster: of our own, and a real scheduler with workers that come, go and are wrong."""

from __future__ import annotations

import os
import signal
import socket
import subprocess
import sys
import time
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path

import numpy as np
import pytest

from buckdesign.errors import BuckdesignError, InputError
from buckdesign.studies.chunks import Chunk, ChunkJob
from buckdesign.studies.cluster import cluster_executor, compute_remotely, read_address
from buckdesign.studies.growing_table import fill_table
from buckdesign.studies.table_file import Column
from tests.studies.plain_work import KEPT, PlainWork, opened, run, summary
from tests.studies.test_chunks import ROOT, started, wait_for_rows

ROWS = 8000


@pytest.mark.parametrize(
    ("text", "scheduler", "workers"),
    [
        ("tcp://10.0.0.5:8786", "tcp://10.0.0.5:8786", 0),
        ("tls://boat.local:8786/", "tls://boat.local:8786", 0),
        ("boat:8786", "tcp://boat:8786", 0),
        ("tcp://[::1]:8786", "tcp://[::1]:8786", 0),
        ("local:4", None, 4),
    ],
)
def test_addresses(text: str, scheduler: str | None, workers: int) -> None:
    place = read_address(text)
    assert (place.scheduler, place.workers) == (scheduler, workers)


@pytest.mark.parametrize(
    "text",
    ["", "boat", "local", "local:", "local:0", "local:x", "udp://a:1", "tcp://a:0", "tcp://a:65536", "a b:1"],
)
def test_what_is_no_address(text: str) -> None:
    with pytest.raises(InputError, match=r"no address of a cluster|at least one") as error:
        read_address(text)
    assert "\n" not in str(error.value)


def test_without_distributed_the_extra_is_named(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "distributed", None)
    job = ChunkJob(work=PlainWork(count=10), kept=KEPT)
    with pytest.raises(InputError, match=r"buckdesign\[cluster\]"), cluster_executor(job, "local:1"):
        pass


def test_a_worker_of_another_version_refuses_a_chunk() -> None:
    with pytest.raises(InputError, match=r"has buckdesign .*, here is 99\.0"):
        compute_remotely(b"", "", "99.0", 0, 1)


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """The table, computed in one process without a break."""
    path = tmp_path_factory.mktemp("whole") / "table.csv"
    run(path, PlainWork(count=ROWS))
    return path.read_bytes()


# a scheduler and its workers


class Cluster:
    """A scheduler and workers as somebody would start them, each a process of its own."""

    def __init__(self) -> None:
        with socket.socket() as probe:
            probe.bind(("127.0.0.1", 0))
            self.port = probe.getsockname()[1]
        self.address = f"tcp://127.0.0.1:{self.port}"
        self.processes: list[subprocess.Popen[bytes]] = []
        self.scheduler = self._start(
            "scheduler", "--host", "127.0.0.1", "--port", str(self.port), "--no-dashboard", path=ROOT
        )
        deadline = time.monotonic() + 20
        while time.monotonic() < deadline:
            with socket.socket() as probe:
                if probe.connect_ex(("127.0.0.1", self.port)) == 0:
                    return
            time.sleep(0.05)
        raise AssertionError("the scheduler does not start")

    def add_worker(self, path: Path = ROOT) -> subprocess.Popen[bytes]:
        """A worker that finds packages under `path`; nobody starts it again when it dies."""
        options = ["--nthreads", "1", "--no-nanny", "--no-dashboard", "--host", "127.0.0.1"]
        return self._start("worker", self.address, *options, path=path)

    def _start(self, what: str, *options: str, path: Path) -> subprocess.Popen[bytes]:
        process = subprocess.Popen(
            [sys.executable, "-m", f"distributed.cli.dask_{what}", *options],
            cwd=path,
            env={**os.environ, "PYTHONPATH": str(path)},
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        self.processes.append(process)
        return process

    def close(self) -> None:
        for process in self.processes:
            process.kill()
        for process in self.processes:
            process.wait(timeout=20)


@pytest.fixture(autouse=True)
def _scratch(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Workers that are killed leave their folders behind: here, where they are swept away."""
    monkeypatch.setenv("DASK_TEMPORARY_DIRECTORY", str(tmp_path / "scratch"))


@contextmanager
def cluster() -> Iterator[Cluster]:
    pytest.importorskip("distributed")
    running = Cluster()
    try:
        yield running
    finally:
        running.close()


def refusal(address: str, limit: float) -> str:
    """Why a cluster is refused, in one line and in time."""
    job = ChunkJob(work=PlainWork(count=10), kept=KEPT)
    began = time.monotonic()
    with pytest.raises(InputError) as error, cluster_executor(job, address, limit):
        pass
    assert time.monotonic() - began < limit + 8.0
    assert "\n" not in str(error.value)
    assert address in str(error.value)
    return str(error.value)


def fake_package(folder: Path, version: str) -> Path:
    (folder / "buckdesign").mkdir(parents=True)
    (folder / "buckdesign" / "__init__.py").write_text(f'__version__ = "{version}"\n')
    return folder


def test_nobody_answers() -> None:
    pytest.importorskip("distributed")
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port = probe.getsockname()[1]
        # bound, but it does not listen
        assert "no scheduler answers within 1 s" in refusal(f"tcp://127.0.0.1:{port}", 1.0)
        # somebody listens who is no scheduler
        probe.listen()
        assert "no scheduler answers within 1 s" in refusal(f"tcp://127.0.0.1:{port}", 1.0)
    assert "no scheduler answers" in refusal("nowhere.invalid:8786", 1.0)
    assert "configuration of distributed" in refusal(f"tls://127.0.0.1:{port}", 1.0)


def test_workers_that_are_missing_or_wrong_are_refused(tmp_path: Path) -> None:
    with cluster() as running:
        assert "has no workers within 1 s" in refusal(running.address, 1.0)
        wrong = running.add_worker(fake_package(tmp_path / "other", "0.0.7"))
        assert "has buckdesign 0.0.7, here is" in refusal(running.address, 20.0)
        wrong.kill()
        wrong.wait(timeout=20)
        running.add_worker()
        path = tmp_path / "table.csv"

        def add_the_wrong_one(chunk: Chunk) -> None:
            if chunk.start == 0:
                running.add_worker(tmp_path / "other")

        with pytest.raises(InputError, match=r"a worker that has joined has no buckdesign, or another one"):
            run(path, PlainWork(count=30_000, pause=5e-4), cluster=running.address, told=add_the_wrong_one)
        with opened(path, PlainWork(count=30_000)) as table:
            assert 64 <= table.rows_done < 30_000


def test_a_real_cluster_that_loses_a_worker_gets_one_and_loses_its_scheduler(
    tmp_path: Path, whole: bytes, capfd: pytest.CaptureFixture[str]
) -> None:
    with cluster() as running:
        first = running.add_worker()
        running.add_worker()
        path = tmp_path / "table.csv"

        def kill_the_first(chunk: Chunk) -> None:
            if chunk.stop == 2064:
                first.kill()
            if chunk.stop == 3064:
                running.add_worker()

        chunks = run(path, PlainWork(count=ROWS, pause=2e-4), cluster=running.address, told=kill_the_first)
        assert first.poll() is not None
        assert path.read_bytes() == whole
        np.testing.assert_equal(summary(chunks), summary(run(tmp_path / "one.csv", PlainWork(count=ROWS))))

        def kill_the_scheduler(chunk: Chunk) -> None:
            if chunk.stop == 2064:
                running.scheduler.kill()

        work = PlainWork(count=ROWS, pause=2e-4)
        with pytest.raises(
            BuckdesignError, match="connection to the scheduler was lost; the same command"
        ) as error:
            run(tmp_path / "lost.csv", work, cluster=running.address, told=kill_the_scheduler)
        assert "\n" not in str(error.value)
    run(tmp_path / "lost.csv", PlainWork(count=ROWS))
    assert (tmp_path / "lost.csv").read_bytes() == whole
    assert capfd.readouterr().err == ""


def test_a_cluster_whose_last_worker_has_gone_is_given_up(tmp_path: Path) -> None:
    with cluster() as running:
        worker = running.add_worker()
        work = PlainWork(count=ROWS, pause=2e-4)
        with (
            opened(tmp_path / "table.csv", work) as table,
            cluster_executor(ChunkJob(work=work, kept={}), running.address, 5.0) as executor,
        ):
            filling = fill_table(table, executor)
            next(filling)
            worker.kill()
            with pytest.raises(BuckdesignError, match="no worker is left"):
                list(filling)
            assert table.rows_done >= 64


# a cluster of our own


class Broken(PlainWork):
    """Rows with a fault in their program."""

    def evaluate(self, start: int, stop: int, jobs: int = 1) -> Mapping[str, Column]:
        if start <= 2500 < stop:
            raise OSError("a fault of the rows")
        return super().evaluate(start, stop, jobs)


def test_a_cluster_of_our_own(tmp_path: Path, whole: bytes, capfd: pytest.CaptureFixture[str]) -> None:
    pytest.importorskip("distributed")
    work = PlainWork(count=ROWS, deadly=6500, once=str(tmp_path / "died"))
    run(tmp_path / "table.csv", work, cluster="local:2")
    assert (tmp_path / "died").exists()
    assert (tmp_path / "table.csv").read_bytes() == whole
    with pytest.raises(BuckdesignError, match=r"local:1: rows 2064 to 3063: OSError: a fault of the rows"):
        run(tmp_path / "broken.csv", Broken(count=ROWS), cluster="local:1")
    with pytest.raises(BuckdesignError, match=r"local:1: rows 1064 to 2063: several workers died"):
        run(tmp_path / "deadly.csv", PlainWork(count=ROWS, deadly=1500), cluster="local:1")
    assert capfd.readouterr().err == ""


@pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")
@pytest.mark.parametrize("number", [signal.SIGINT, signal.SIGKILL])
def test_the_end_of_a_run_is_the_end_of_its_cluster(
    tmp_path: Path, whole: bytes, number: signal.Signals
) -> None:
    pytest.importorskip("distributed")
    path = tmp_path / "table.csv"
    process = started(path, ROWS, 5e-4, "local:2")
    wait_for_rows(process, 2064)
    if number == signal.SIGINT:
        os.killpg(process.pid, number)
    else:
        process.send_signal(number)
    # ends only when no worker holds the other end of the pipes any more
    _, errors = process.communicate(timeout=20)
    assert process.returncode == (130 if number == signal.SIGINT else -number)
    if number == signal.SIGINT:
        assert errors == ""
    run(path, PlainWork(count=ROWS))
    assert path.read_bytes() == whole
