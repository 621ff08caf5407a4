"""Chunks computed by the workers of a Dask cluster; needs distributed.

``tcp://host:port``, ``tls://host:port`` or ``host:port`` is a scheduler that runs already; ``local:N`` starts one with
N worker processes on this machine. For ``tls://`` the certificates are those of distributed's own configuration
(``distributed.comm.tls`` in its files, or ``DASK_DISTRIBUTED__COMM__TLS__...`` in the environment).

Every worker must have this package in the same version and the same Python; workers that join later are checked by
the chunks themselves. The rows are shipped as a task of their own, so that each worker fetches them once, however late
it joins, and gets them again where the worker that had them has died. Finished chunks stay with the workers until
their turn comes. The scheduler gives the chunks of a worker that dies to another one, and gives up on a chunk that
takes several workers with it.
"""

from __future__ import annotations

import asyncio
import concurrent.futures
import contextlib
import hashlib
import logging
import pickle
import re
import secrets
import threading
import time
import warnings
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, TypeVar

from buckdesign import __version__
from buckdesign.errors import BuckdesignError, InputError, quoted
from buckdesign.studies.chunks import Chunk, ChunkJob
from buckdesign.studies.local_workers import deaf_to_interrupts

if TYPE_CHECKING:
    from distributed import Client, Future

Result = TypeVar("Result")

LIMIT_SECONDS = 20.0
"""Time within which the scheduler must answer and have a worker [s] (own choice)."""

GRACE_SECONDS = 1.0
"""Time that distributed has beyond the limit for its own, clearer report [s] (own choice)."""

DEATHS = 3
"""Workers that a chunk of a cluster of our own may take with it before it is given up (own choice)."""

SPARE_CHUNKS = 2
"""Chunks in flight for each thread of the cluster (own choice)."""

LOOK_SECONDS = 2.0
"""How often the number of workers is asked for [s] (own choice)."""

GO_ON = "the same command goes on from here"

LOGGERS = ("distributed", "tornado", "asyncio")
"""Loggers that are kept off standard error."""

ALLOWED = (
    "wanted: tcp://host:port, tls://host:port or host:port of a scheduler, or local:N for N processes here"
)

_SCHEDULER = re.compile(
    r"(?:(?P<scheme>tcp|tls)://)?(?P<host>\[[0-9A-Fa-f:.%]+\]|[^\s:/\[\]]+):(?P<port>\d{1,5})/?"
)
_LOCAL = re.compile(r"local:(?P<workers>\d{1,4})")

# Text, because it must be understood by whatever Python a worker has, with or without this package.
_QUESTION = """{
    "python": "%d.%d" % __import__("sys").version_info[:2],
    "buckdesign": getattr(__import__("buckdesign"), "__version__", None)
    if __import__("importlib.util").util.find_spec("buckdesign") else None,
    **{
        name: next((found.version for found in parts(name=name)), None)
        for parts in [__import__("importlib.metadata").metadata.distributions]
        for name in ("numpy", "numba")
    },
}"""

_COMPUTE = """__import__("buckdesign.studies.cluster", fromlist=["*"]).compute_remotely(*arguments)"""


@dataclass(frozen=True, kw_only=True)
class ClusterAddress:
    """Where a cluster is.

    Attributes
    ----------
    text : str
        As it was given.
    scheduler : str or None
        Address of a scheduler that runs; None: one of our own.
    workers : int
        Worker processes of our own.
    """

    text: str
    scheduler: str | None
    workers: int


def read_address(text: str) -> ClusterAddress:
    """The address of a cluster.

    Parameters
    ----------
    text : str
        Such as ``tcp://10.0.0.5:8786`` or ``local:4``.

    Returns
    -------
    ClusterAddress
        What it means.

    Raises
    ------
    InputError
        It is none.
    """
    if local := _LOCAL.fullmatch(text):
        if int(local["workers"]) < 1:
            raise InputError(f"{quoted(text)}: at least one worker process is needed")
        return ClusterAddress(text=text, scheduler=None, workers=int(local["workers"]))
    found = _SCHEDULER.fullmatch(text)
    if not found or not 0 < int(found["port"]) < 65536 or found["host"] == "local":
        raise InputError(f"{quoted(text)}: is no address of a cluster; {ALLOWED}")
    scheme = found["scheme"] or "tcp"
    return ClusterAddress(text=text, scheduler=f"{scheme}://{found['host']}:{found['port']}", workers=0)


@contextlib.contextmanager
def cluster_executor(job: ChunkJob, address: str, limit: float = LIMIT_SECONDS) -> Iterator[ClusterWorkers]:
    """What computes chunks on a cluster, for a ``with``.

    Parameters
    ----------
    job : ChunkJob
        The rows.
    address : str
        See `read_address`.
    limit : float
        Time within which it must be ready [s].

    Yields
    ------
    ClusterWorkers
        Until the end of the ``with``, which also stops what is still computed.

    Raises
    ------
    InputError
        No such cluster, no worker, a worker with other versions, or distributed is missing.
    BuckdesignError
        The cluster was lost on the way.
    """
    place = read_address(address)
    try:
        import distributed  # noqa: F401
    except ImportError:
        raise InputError(
            f'{quoted(address)}: a cluster needs distributed: install "buckdesign[cluster]"'
        ) from None
    with _quiet(), contextlib.ExitStack() as stack:
        client = _connected(stack, place, limit)
        notes = _checked_workers(client, place, limit)
        workers = ClusterWorkers(client, job, place, notes, limit)
        stack.callback(workers.stop)
        yield workers


class ClusterWorkers:
    """Chunks computed by the workers of a cluster; `cluster_executor` makes one.

    Attributes
    ----------
    notes : tuple of str
        What to mind: libraries that differ in version, so that last digits may.
    """

    def __init__(
        self, client: Client, job: ChunkJob, place: ClusterAddress, notes: tuple[str, ...], limit: float
    ) -> None:
        self.notes = notes
        self._client = client
        self._place = place
        self._limit = limit
        self._run = secrets.token_hex(8)
        payload = pickle.dumps(job, protocol=pickle.HIGHEST_PROTOCOL)
        self._digest = hashlib.sha256(payload).hexdigest()
        self._payload = client.submit(bytes, payload, key=f"rows-{self._run}", pure=False)
        self._open: list[_Remote] = []
        self._threads = 1
        self._looked = -LOOK_SECONDS
        self._last_seen = time.monotonic()

    @property
    def width(self) -> int:
        """Chunks in flight: more as soon as workers join."""
        self._look()
        return SPARE_CHUNKS * self._threads + 1

    def submit(self, start: int, stop: int) -> _Remote:
        """Begin with rows `start` to `stop`."""
        with self._watched():
            future = self._client.submit(
                eval,
                _COMPUTE,
                {"arguments": (self._payload, self._digest, __version__, start, stop)},
                key=f"chunk-{self._run}-{start}",
                priority=-start,
                pure=False,
            )
        remote = _Remote(self, future, start, stop)
        self._open.append(remote)
        return remote

    def result_of(self, remote: _Remote) -> Chunk:
        """Wait for a chunk, as long as there is a cluster; `_Remote.result` asks for it."""
        with self._watched():
            while not remote.future.done():
                self._look()
                with contextlib.suppress(TimeoutError):
                    remote.future.exception(timeout=LOOK_SECONDS)
            if remote.future.status == "error":
                raise self._failure(remote)
            chunk: Chunk = remote.future.result(timeout=self._limit)
        self._open.remove(remote)
        return chunk

    def stop(self) -> None:
        """Give up what is still computed."""
        if self._client.status == "running":
            with contextlib.suppress(Exception):
                self._client.cancel([remote.future for remote in self._open] + [self._payload], force=True)

    def _look(self) -> None:
        """Count the workers now and then; without any for too long, give up."""
        now = time.monotonic()
        if now - self._looked < LOOK_SECONDS:
            return
        with self._watched():
            threads = sum(self._client.nthreads().values())
        self._looked = now
        if threads:
            self._threads, self._last_seen = threads, now
        elif now - self._last_seen > self._limit:
            raise BuckdesignError(f"{self._place.text}: no worker is left; {GO_ON}")

    def _failure(self, remote: _Remote) -> BaseException:
        """What became of rows that could not be computed; a fault in computing them stays what it is."""
        from distributed import KilledWorker

        error: BaseException = remote.future.exception(timeout=self._limit)
        place, rows = self._place.text, f"rows {remote.start} to {remote.stop - 1}"
        if isinstance(error, KilledWorker):
            return BuckdesignError(
                f"{place}: {rows}: several workers died at them (killed, or out of memory)"
            )
        if isinstance(error, ModuleNotFoundError) and (error.name or "").split(".")[0] == "buckdesign":
            return InputError(f"{place}: a worker that has joined has no buckdesign, or another one; {GO_ON}")
        if isinstance(error, BuckdesignError):
            return error
        return BuckdesignError(f"{place}: {rows}: {type(error).__name__}: {' '.join(str(error).split())}")

    @contextlib.contextmanager
    def _watched(self) -> Iterator[None]:
        """Turn the loss of the scheduler into one clear error."""
        try:
            if self._client.status != "running":
                raise concurrent.futures.CancelledError
            yield
        except BuckdesignError:
            raise
        except Exception as error:
            if self._client.status == "running" and not isinstance(
                error, concurrent.futures.CancelledError | OSError
            ):
                raise
            raise BuckdesignError(
                f"{self._place.text}: the connection to the scheduler was lost; {GO_ON}"
            ) from None


class _Remote:
    """A chunk that the cluster has."""

    def __init__(self, workers: ClusterWorkers, future: Future, start: int, stop: int) -> None:
        self.start = start
        self.stop = stop
        self.future = future
        self._workers = workers

    def done(self) -> bool:
        return bool(self.future.done())

    def result(self) -> Chunk:
        return self._workers.result_of(self)


def compute_remotely(payload: bytes, digest: str, version: str, start: int, stop: int) -> Chunk:
    """The chunk of rows `start` to `stop`, in a worker of a cluster.

    Parameters
    ----------
    payload : bytes
        The job, pickled.
    digest : str
        Of the payload, so that a worker unpickles it once.
    version : str
        Of this package where the job was made.
    start, stop : int
        Rows.

    Returns
    -------
    Chunk
        The chunk.

    Raises
    ------
    InputError
        This worker has another version.
    """
    if version != __version__:
        raise InputError(f"a worker that has joined has buckdesign {__version__}, here is {version}")
    if digest not in _JOBS:
        _JOBS.clear()
        _JOBS[digest] = pickle.loads(payload)
    job: ChunkJob = _JOBS[digest]
    return job.compute(start, stop)


_JOBS: dict[str, ChunkJob] = {}
"""In a worker: the job it is at, by digest."""


def _connected(stack: contextlib.ExitStack, place: ClusterAddress, limit: float) -> Client:
    from distributed import Client, LocalCluster

    try:
        target: Any = place.scheduler
        if target is None:
            with deaf_to_interrupts():
                target = LocalCluster(
                    n_workers=place.workers,
                    threads_per_worker=1,
                    processes=True,
                    dashboard_address=None,
                    silence_logs=logging.CRITICAL,
                    scheduler_kwargs={"allowed_failures": DEATHS - 1},
                )
            stack.callback(_close, target)
        else:
            _within(limit, lambda: asyncio.run(_greet(str(target), limit)))
        client = Client(target, timeout=limit, set_as_default=False)
    except (OSError, ValueError, TypeError, RuntimeError, ImportError) as error:
        reason = " ".join(str(error).split()) or type(error).__name__
        if place.scheduler and place.scheduler.startswith("tls:") and not isinstance(error, OSError):
            reason += " (the certificates come from the configuration of distributed)"
        raise InputError(f"{place.text}: no scheduler answers within {limit:g} s: {reason}") from None
    stack.callback(_close, client)
    return client


async def _greet(address: str, limit: float) -> None:
    """Connect once: a client waits without end for the first word of somebody who is no scheduler."""
    from distributed.comm import connect
    from distributed.security import Security

    arguments = Security().get_connection_args("client")
    comm = await asyncio.wait_for(connect(address, timeout=limit, **arguments), limit)
    await comm.close()


def _within(limit: float, call: Callable[[], Result]) -> Result:
    """The result of a call in a thread, or TimeoutError."""
    outcome: concurrent.futures.Future[Result] = concurrent.futures.Future()

    def run() -> None:
        try:
            outcome.set_result(call())
        except BaseException as error:
            outcome.set_exception(error)

    threading.Thread(target=run, daemon=True).start()
    return outcome.result(timeout=limit + GRACE_SECONDS)


def _close(closing: Any) -> None:
    with contextlib.suppress(Exception):
        closing.close(timeout=5)


def _checked_workers(client: Client, place: ClusterAddress, limit: float) -> tuple[str, ...]:
    """Refuse workers that would compute something else; what to mind about those that are taken."""
    try:
        client.wait_for_workers(1, timeout=limit)
    except TimeoutError:
        raise InputError(f"{place.text}: the scheduler has no workers within {limit:g} s") from None
    try:
        answers = _within(limit, lambda: client.run(eval, _QUESTION))
    except OSError as error:
        raise InputError(f"{place.text}: a worker does not answer within {limit:g} s: {error}") from None
    here = eval(_QUESTION)
    notes: dict[str, None] = {}
    for worker, there in sorted(answers.items()):
        if there["buckdesign"] is None:
            raise InputError(
                f"{place.text}: worker {worker} has no buckdesign; {__version__} is needed there"
            )
        for name in ("buckdesign", "python"):
            if there[name] != here[name]:
                raise InputError(
                    f"{place.text}: worker {worker} has {name} {there[name]}, here is {here[name]}; "
                    "they must be the same"
                )
        for name in ("numpy", "numba"):
            if there[name] is None:
                raise InputError(f"{place.text}: worker {worker} has no {name}")
            if there[name] != here[name]:
                notes[
                    f"{place.text}: workers with {name} {there[name]}, here is {here[name]}: digits may differ"
                ] = None
    return tuple(notes)


@contextlib.contextmanager
def _quiet() -> Iterator[None]:
    """Keep what distributed and its libraries log and warn about off standard error."""
    loggers = [logging.getLogger(name) for name in (*LOGGERS, *_children(LOGGERS))]
    before = [(logger, logger.level) for logger in loggers]
    for logger in loggers:
        logger.setLevel(logging.CRITICAL + 1)
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", module=r"(distributed|dask|tornado)\b")
        try:
            yield
        finally:
            for logger, level in before:
                logger.setLevel(level)


def _children(names: tuple[str, ...]) -> list[str]:
    """Loggers below some others, which may have levels of their own."""
    return [
        name
        for name in logging.root.manager.loggerDict
        if name.startswith(tuple(f"{name}." for name in names))
    ]
