"""Chunks computed on this machine: in this process, or in worker processes beside it.

Worker processes are started anew, never forked, each gets the rows once, computes with one thread, does not hear
Ctrl-C and ends with this process however that ends. While they start, this process computes the first chunks. Each
has a pipe of its own and computes one chunk after the other, so that its death at any moment, also amid a message, is
seen at once and blamed on the right rows; another one takes its place. (The pools of the standard library share one
pipe, and wait for ever for the rest of a message whose sender was killed.)
"""

from __future__ import annotations

import contextlib
import os
import pickle
import signal
import threading
import traceback
from collections import deque
from collections.abc import Iterator
from concurrent.futures import Future
from multiprocessing import connection, get_context, parent_process
from types import TracebackType
from typing import Any, Self, TypeAlias, cast

from buckdesign.errors import BuckdesignError
from buckdesign.studies.chunks import Chunk, ChunkJob

Talk: TypeAlias = "connection.Connection[Any, Any]"
"""One end of a pipe."""

SMALL_ROWS = 3000
"""Rows below which starting worker processes takes longer than it saves (own choice)."""

TRIES = 3
"""How often a chunk is begun whose worker dies at it (own choice)."""

CHUNKS_PER_WORKER = 4
"""Chunks in flight for each worker: enough that none waits where one chunk takes longer (own choice)."""

CHUNKS_AHEAD = 2
"""Chunks that a worker has, the one it is at and those it goes on with (own choice)."""

ONE_THREAD = (
    "OMP_NUM_THREADS",
    "OPENBLAS_NUM_THREADS",
    "MKL_NUM_THREADS",
    "NUMEXPR_NUM_THREADS",
    "VECLIB_MAXIMUM_THREADS",
    "NUMBA_NUM_THREADS",
)
"""Variables of the environment that keep the numeric libraries of a worker at one thread."""


_HERE, _READY = "here", "ready"
"""What a worker says once it runs, and once it has the rows."""


def local_executor(job: ChunkJob, *, jobs: int, rows: int) -> OwnProcess | WorkerProcesses:
    """What computes chunks on this machine.

    Parameters
    ----------
    job : ChunkJob
        The rows.
    jobs : int
        Processors to use.
    rows : int
        Rows that are missing.

    Returns
    -------
    OwnProcess or WorkerProcesses
        Worker processes where they pay; to be used in a ``with``.
    """
    if jobs <= 1 or rows < SMALL_ROWS:
        return OwnProcess(job, max(jobs, 1))
    return WorkerProcesses(job, jobs)


class OwnProcess:
    """Chunks computed here, one after the other.

    Parameters
    ----------
    job : ChunkJob
        The rows.
    threads : int
        Threads that share a chunk.
    """

    width = 1

    def __init__(self, job: ChunkJob, threads: int) -> None:
        self._job = job
        self._threads = threads

    def submit(self, start: int, stop: int) -> Future[Chunk]:
        """Compute rows `start` to `stop`."""
        return _computed(self._job, start, stop, self._threads)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        return


class WorkerProcesses:
    """Chunks computed by worker processes.

    Parameters
    ----------
    job : ChunkJob
        The rows.
    jobs : int
        Worker processes.
    """

    def __init__(self, job: ChunkJob, jobs: int) -> None:
        self._job = job
        self._jobs = jobs
        self._payload = pickle.dumps(job, protocol=pickle.HIGHEST_PROTOCOL)
        self._workers: list[_Worker] = []
        self._waiting: deque[_Ticket] = deque()

    @property
    def width(self) -> int:
        """Chunks in flight."""
        return CHUNKS_PER_WORKER * self._jobs

    def __enter__(self) -> Self:
        self._workers = [_Worker(self._payload) for _ in range(self._jobs)]
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        for worker in self._workers:
            worker.end()

    def wait_until_ready(self) -> None:
        """Wait for the first worker."""
        while not any(worker.is_ready for worker in self._workers):
            self._listen(None)

    def submit(self, start: int, stop: int) -> _Ticket | Future[Chunk]:
        """Begin with rows `start` to `stop`; compute them here while the workers start.

        Raises
        ------
        BuckdesignError
            Workers can't be started, or die again and again.
        """
        self._listen(0.0)
        if not any(worker.is_ready for worker in self._workers):
            return _computed(self._job, start, stop, 1)
        ticket = _Ticket(self, start, stop)
        self._waiting.append(ticket)
        self._hand_out()
        return ticket

    def wait_for(self, ticket: _Ticket) -> None:
        """Wait until a chunk is there, over the death of workers."""
        while not ticket.done():
            self._listen(None)

    def _hand_out(self) -> None:
        """Give what waits to the workers, each one beyond what it is at, so that none is idle."""
        for most in range(1, CHUNKS_AHEAD + 1):
            for worker in self._workers:
                if self._waiting and worker.is_ready and len(worker.tickets) < most:
                    worker.give(self._waiting.popleft())

    def _listen(self, timeout: float | None) -> None:
        """Take what the workers have to say; where one has died, start another and have its chunks computed."""
        connections = {worker.connection: worker for worker in self._workers}
        for ready in connection.wait(list(connections), timeout):
            worker = connections[cast("Talk", ready)]
            try:
                message = worker.connection.recv()
            except (EOFError, OSError):
                self._replace(worker)
            else:
                worker.take(message)
        self._hand_out()

    def _replace(self, worker: _Worker) -> None:
        worker.end()
        if not worker.is_ready:
            raise BuckdesignError(
                "the worker processes end as soon as they are started; a script that starts them does so under "
                '`if __name__ == "__main__":`; with one job none are needed'
            )
        if worker.tickets:
            lost = worker.tickets[0]
            lost.losses += 1
            if lost.losses >= TRIES:
                raise BuckdesignError(
                    f"rows {lost.start} to {lost.stop - 1}: the worker process died at them {TRIES} times "
                    "(killed, or out of memory); fewer jobs need less memory"
                )
        self._waiting.extendleft(reversed(worker.tickets))
        self._workers[self._workers.index(worker)] = _Worker(self._payload)


class _Worker:
    """A worker process, with a pipe of its own: its death at any moment, also amid a message, ends the pipe."""

    def __init__(self, payload: bytes) -> None:
        context = get_context("spawn")
        self.connection, theirs = context.Pipe()
        self._payload = payload
        self.is_ready = False
        self.tickets: deque[_Ticket] = deque()
        """Chunks in the order in which it computes them."""
        self._process = context.Process(target=_work, args=(theirs,), daemon=True)
        with _one_thread(), deaf_to_interrupts():
            self._process.start()
        theirs.close()

    def give(self, ticket: _Ticket) -> None:
        self.tickets.append(ticket)
        # where it has died, the next look at the pipe tells
        with contextlib.suppress(OSError):
            self.connection.send((ticket.start, ticket.stop))

    def take(self, message: Chunk | Exception | str) -> None:
        """What it says: that it is there or ready, a chunk, or what went wrong with one, or with all of them."""
        if isinstance(message, str):
            self.is_ready = message == _READY
            if not self.is_ready:
                # not among its arguments: whoever writes long ones to a process that has died waits for ever
                with contextlib.suppress(OSError):
                    self.connection.send_bytes(self._payload)
        elif self.is_ready:
            self.tickets.popleft().outcome = message
        elif isinstance(message, Exception):
            raise message

    def end(self) -> None:
        self._process.kill()
        self._process.join()
        self.connection.close()


class _Ticket:
    """A chunk that a worker process has, or will have."""

    def __init__(self, workers: WorkerProcesses, start: int, stop: int) -> None:
        self.start = start
        self.stop = stop
        self.losses = 0
        self.outcome: Chunk | Exception | None = None
        self._workers = workers

    def done(self) -> bool:
        return self.outcome is not None

    def result(self) -> Chunk:
        self._workers.wait_for(self)
        if isinstance(self.outcome, Exception):
            raise self.outcome
        assert self.outcome is not None
        return self.outcome


def _computed(job: ChunkJob, start: int, stop: int, threads: int) -> Future[Chunk]:
    future: Future[Chunk] = Future()
    future.set_result(job.compute(start, stop, jobs=threads))
    return future


@contextlib.contextmanager
def _one_thread() -> Iterator[None]:
    """An environment in which the numeric libraries of processes that are started use one thread."""
    before = {name: os.environ.get(name) for name in ONE_THREAD}
    os.environ.update(dict.fromkeys(ONE_THREAD, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                os.environ.pop(name, None)
            else:
                os.environ[name] = value


@contextlib.contextmanager
def deaf_to_interrupts() -> Iterator[None]:
    """Threads and processes that are started meanwhile never see Ctrl-C; this one sees it afterwards."""
    if not hasattr(signal, "pthread_sigmask"):
        yield
        return
    from multiprocessing import resource_tracker

    # started by the first process otherwise, it would let the signal through again
    resource_tracker.ensure_running()
    before = signal.pthread_sigmask(signal.SIG_BLOCK, {signal.SIGINT})
    try:
        yield
    finally:
        signal.pthread_sigmask(signal.SIG_SETMASK, before)


def _work(talk: Talk) -> None:
    """What a worker process does: take the rows, say that it is ready, then compute chunks until the pipe ends."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with_parent, daemon=True).start()
    talk.send(_HERE)
    try:
        job: ChunkJob = pickle.loads(talk.recv_bytes())
    except EOFError:
        return
    except Exception as error:
        talk.send(_portable(error))
        return
    talk.send(_READY)
    with contextlib.suppress(EOFError, BrokenPipeError):
        while True:
            start, stop = talk.recv()
            outcome: Chunk | Exception
            try:
                outcome = job.compute(start, stop)
            except Exception as error:
                outcome = _portable(error)
            talk.send(outcome)


def _portable(error: Exception) -> Exception:
    """An error that survives the way, with the place where it happened."""
    error.add_note("".join(traceback.format_exception(error)).rstrip())
    try:
        pickle.loads(pickle.dumps(error))
    except Exception:
        return RuntimeError(f"{type(error).__name__}: {error}")
    return error


def _end_with_parent() -> None:
    parent = parent_process()
    if parent is not None:
        connection.wait([parent.sentinel])
        os._exit(1)
