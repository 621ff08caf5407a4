"""The record of a run: what is computed into a table, and which chunks of it are safely on disk.

Beside the table ``NAME`` stand, while it grows,

``NAME.part``
    the lines that are there so far, and
``NAME.run.jsonl``
    the record, one JSON object a line: first what is run, then one line for each chunk with its length and checksum
    in ``NAME.part``, last the length and checksum of the finished table. It stays beside the finished table, so that
    the same command finds out that there is nothing left to do.

A line is added only after what it tells of is on disk, so that a kill at any moment costs no more than the chunks in
flight: a line torn off at the end is dropped, and so are lines whose rows are not there (see
`buckdesign.studies.growing_table`). While a run goes on, its record is locked against a second one, by the operating
system, so that the lock ends with the process; where there is no ``fcntl``, nothing is locked.
"""

from __future__ import annotations

import contextlib
import json
import os
from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from buckdesign.errors import FileAccessError, InputError, quoted

FORMAT = 1
"""Number of this form of the record."""

SHOWN_CHANGES = 5
"""Differences that are spelled out (own choice)."""

RESTART_ADVICE = "--restart computes it from the beginning"


@dataclass(frozen=True, kw_only=True)
class ChunkEntry:
    """A chunk that is on disk.

    Attributes
    ----------
    chunk : int
        Its number, from 0.
    bytes : int
        Length of its lines.
    crc32 : int
        Checksum of its lines.
    """

    chunk: int
    bytes: int
    crc32: int


@dataclass(frozen=True, kw_only=True)
class Finished:
    """The finished table.

    Attributes
    ----------
    bytes : int
        Its length.
    crc32 : int
        Its checksum.
    """

    bytes: int
    crc32: int


class RunRecord:
    """A record, open and locked; `open_record` makes one.

    Attributes
    ----------
    path : pathlib.Path
        The file.
    content : dict or None
        What is run, as JSON gives it back; None: nothing has begun.
    replaces : bool
        Whether the finished table may take the place of one that was there before.
    entries : list of ChunkEntry
        Chunks in order.
    finished : Finished or None
        Set once the table is complete.
    """

    def __init__(self, path: Path, descriptor: int) -> None:
        self.path = path
        self.content: dict[str, Any] | None = None
        self.replaces = False
        self.entries: list[ChunkEntry] = []
        self.finished: Finished | None = None
        self._descriptor = descriptor
        self._ends: list[int] = []
        """Where each line ends."""

    def begin(self, content: Mapping[str, Any], *, replaces: bool) -> None:
        """Start anew; what was recorded is gone."""
        plain = as_json(content)
        self._cut_lines(0)
        self._add({"run_record": FORMAT, "replaces": replaces, "content": plain})
        self.content, self.replaces, self.entries, self.finished = plain, replaces, [], None

    def add(self, entry: ChunkEntry) -> None:
        """Note a chunk that is on disk."""
        self._add(asdict(entry))
        self.entries.append(entry)

    def finish(self, finished: Finished) -> None:
        """Note that the table is complete."""
        self._add({"finished": asdict(finished)})
        self.finished = finished

    def cut(self, chunks: int) -> None:
        """Forget all chunks but the first ones, and that the table was complete."""
        if chunks < len(self.entries) or self.finished is not None:
            self._cut_lines(1 + chunks)
        del self.entries[chunks:]
        self.finished = None

    def close(self) -> None:
        """Close the file, which gives the lock back."""
        if self._descriptor >= 0:
            os.close(self._descriptor)
            self._descriptor = -1

    def load(self, *, force: bool) -> None:
        """Read what is there, up to the first line that is torn; with `force` a foreign file counts as empty."""
        with naming(self.path):
            os.lseek(self._descriptor, 0, os.SEEK_SET)
            with os.fdopen(os.dup(self._descriptor), "rb") as file:
                lines = file.read().splitlines(keepends=True)
        for number, line in enumerate(lines):
            fields = _fields(line)
            if number == 0 and line.endswith(b"\n") and "run_record" not in fields and not force:
                raise FileAccessError(self.path, f"is no record of a run; {RESTART_ADVICE} and replaces it")
            if not self._take(number, fields):
                break
            self._ends.append((self._ends[-1] if self._ends else 0) + len(line))
        if len(lines) > len(self._ends):
            self._cut_lines(len(self._ends))

    def _take(self, number: int, fields: dict[str, Any]) -> bool:
        """Whether a line goes on from the ones before it; takes its content if so."""
        if number == 0:
            if fields.get("run_record") != FORMAT or not isinstance(fields.get("content"), dict):
                return False
            self.content = fields["content"]
            self.replaces = bool(fields.get("replaces"))
            return True
        if self.finished is not None:
            return False
        try:
            if "finished" in fields:
                self.finished = Finished(**fields["finished"])
                return True
            entry = ChunkEntry(**fields)
        except TypeError:
            return False
        if entry.chunk != len(self.entries):
            return False
        self.entries.append(entry)
        return True

    def _add(self, fields: Mapping[str, Any]) -> None:
        line = json.dumps(fields, ensure_ascii=True, separators=(",", ":")).encode() + b"\n"
        end = self._ends[-1] if self._ends else 0
        with naming(self.path):
            write_at(self._descriptor, end, line)
        self._ends.append(end + len(line))

    def _cut_lines(self, count: int) -> None:
        del self._ends[count:]
        with naming(self.path):
            os.ftruncate(self._descriptor, self._ends[-1] if self._ends else 0)
            os.fsync(self._descriptor)


def open_record(path: Path, *, force: bool) -> RunRecord:
    """Open, lock and read a record; an empty one is made where there is none.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    force : bool
        Whether a file that is no record may be overwritten.

    Returns
    -------
    RunRecord
        It has to be closed.

    Raises
    ------
    FileAccessError
        Another run is at it, it can't be opened, or it is no record.
    """
    while True:
        with naming(path):
            descriptor = os.open(path, os.O_RDWR | os.O_CREAT | getattr(os, "O_BINARY", 0), 0o666)
        record = RunRecord(path, descriptor)
        try:
            _lock(path, descriptor)
            if _is_still_there(path, descriptor):
                record.load(force=force)
                return record
        except BaseException:
            record.close()
            raise
        record.close()


def _is_still_there(path: Path, descriptor: int) -> bool:
    """Whether an open file still has its name: another run may have removed it before the lock was ours."""
    try:
        return os.path.samestat(os.fstat(descriptor), path.stat())
    except FileNotFoundError:
        return False


def _lock(path: Path, descriptor: int) -> None:
    try:
        import fcntl
    except ImportError:
        return
    try:
        fcntl.flock(descriptor, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        raise FileAccessError(
            path, "another run is at this table; wait for its end, or give another --output"
        ) from None
    except OSError:
        # a file system without locks
        return


def _fields(line: bytes) -> dict[str, Any]:
    """A line as JSON; empty where it is torn."""
    if not line.endswith(b"\n"):
        return {}
    try:
        fields = json.loads(line)
    except ValueError:
        return {}
    return fields if isinstance(fields, dict) else {}


def write_at(descriptor: int, position: int, data: bytes) -> None:
    """Write bytes at a place of a file and see them on disk; what is half-written is taken back if that fails.

    Raises
    ------
    OSError
        The disk is full, or it can't be written for another reason.
    """
    try:
        os.lseek(descriptor, position, os.SEEK_SET)
        rest = memoryview(data)
        while rest:
            rest = rest[os.write(descriptor, rest) :]
        os.fsync(descriptor)
    except BaseException:
        with contextlib.suppress(OSError):
            os.ftruncate(descriptor, position)
        raise


@contextlib.contextmanager
def naming(path: Path, advice: str = "") -> Iterator[None]:
    """Turn a refusal of the operating system into an error that names the file.

    Raises
    ------
    FileAccessError
        Instead of OSError.
    """
    try:
        yield
    except OSError as error:
        raise FileAccessError(path, f"can't be written: {error.strerror or error}{advice}") from None


def as_json(content: Mapping[str, Any]) -> dict[str, Any]:
    """`content` as it comes back from JSON: lists instead of tuples, texts as keys."""
    plain: dict[str, Any] = json.loads(json.dumps(content))
    return plain


def check_same(path: Path, was: Mapping[str, Any], content: Mapping[str, Any]) -> None:
    """Refuse to go on with something else than what was begun.

    Parameters
    ----------
    path : pathlib.Path
        The table.
    was : mapping
        What was begun, from the record.
    content : mapping
        What is wanted now.

    Raises
    ------
    InputError
        They differ; the text says where.
    """
    changes = list(_differences("", was, as_json(content)))
    if not changes:
        return
    shown = "; ".join(changes[:SHOWN_CHANGES])
    more = f"; and {len(changes) - SHOWN_CHANGES} more" if len(changes) > SHOWN_CHANGES else ""
    raise InputError(f"{path}: was begun with something else: {shown}{more}; {RESTART_ADVICE}")


def _differences(place: str, was: Any, now: Any) -> Iterator[str]:
    """Each difference as ``dotted.path: was -> is``."""
    if isinstance(was, dict) and isinstance(now, dict):
        for key in [*now, *(key for key in was if key not in now)]:
            inner = f"{place}.{key}" if place else str(key)
            if key not in was:
                yield f"{inner}: absent -> {_shown(now[key])}"
            elif key not in now:
                yield f"{inner}: {_shown(was[key])} -> absent"
            else:
                yield from _differences(inner, was[key], now[key])
    elif isinstance(was, list) and isinstance(now, list):
        for index in range(max(len(was), len(now))):
            inner = f"{place}[{index}]"
            if index >= len(was):
                yield f"{inner}: absent -> {_shown(now[index])}"
            elif index >= len(now):
                yield f"{inner}: {_shown(was[index])} -> absent"
            else:
                yield from _differences(inner, was[index], now[index])
    elif json.dumps(was, sort_keys=True) != json.dumps(now, sort_keys=True):
        yield f"{place}: {_shown(was)} -> {_shown(now)}"


def _shown(value: Any) -> str:
    return quoted(value) if isinstance(value, str) else quoted(json.dumps(value)).strip('"')
