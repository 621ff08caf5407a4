"""A long table on disk that grows chunk by chunk and goes on after a kill at any moment.

A chunk is written to ``NAME.part`` and is on disk before the record (`buckdesign.studies.run_record`) notes it. What
is not noted is cut off when the same run is started again, what is noted is compared with its checksum. The finished
table takes its final name at the end, whole: the record notes its checksum first, so that it can be told from any
other file of that name. A table that no run of ours has made is never replaced, unless the caller says so.

======================== ====================== ===========================================================
record                   files                  what follows
======================== ====================== ===========================================================
none                     neither part nor table begin
none                     part or table          refused
another run              any                    refused, with what differs
this run, unfinished     table of unknown make  refused
this run, unfinished     else                   on from the last chunk whose checksum is right
this run, finished       table as noted         nothing left to do
this run, finished       complete, old name     the name is changed
this run, finished       no table               begin
this run, finished       another table          refused
======================== ====================== ===========================================================

``restart`` begins in all of these cases; an old table stays until the new one is finished.
"""

from __future__ import annotations

import contextlib
import os
import stat
import zlib
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from buckdesign.errors import FileAccessError
from buckdesign.studies.chunks import (
    FAILURE_COLUMN,
    USUAL_SIZES,
    Chunk,
    ChunkSizes,
    Executor,
    Progress,
    chunk_bounds,
    chunk_count,
    count_failed,
    run_chunks,
)
from buckdesign.studies.run_record import (
    RESTART_ADVICE,
    ChunkEntry,
    Finished,
    RunRecord,
    check_same,
    naming,
    open_record,
    write_at,
)
from buckdesign.studies.table_file import PARQUET_SUFFIX, Kind, csv_header, frame_values, read_table

PART_SUFFIX = ".part"
"""Ending of the lines that are there so far."""

CONVERTED_SUFFIX = ".converted"
"""Ending of a Parquet file that has not got its name yet."""

RECORD_SUFFIX = ".run.jsonl"
"""Ending of the record."""

_BLOCK = 1 << 20
"""Bytes that are read at once."""


def open_table(
    path: Path,
    *,
    content: Mapping[str, Any],
    kinds: Mapping[str, Kind],
    count: int,
    restart: bool = False,
    sizes: ChunkSizes = USUAL_SIZES,
) -> GrowingTable:
    """Begin a table, or go on with one.

    Parameters
    ----------
    path : pathlib.Path
        The finished table: CSV, or Parquet where it ends with ``.parquet``.
    content : mapping
        All that the rows depend on, as JSON has it; only the same content goes on with a table that was begun.
        Columns, rows and bounds of the chunks are added to it as ``table``.
    kinds : mapping of str to Kind
        The columns in order.
    count : int
        Number of rows.
    restart : bool
        Begin from the start, whatever is there.
    sizes : ChunkSizes
        How the table is cut.

    Returns
    -------
    GrowingTable
        It has to be closed, best by ``with``.

    Raises
    ------
    FileAccessError
        It can't be written, something else has that name, or another run is at it.
    InputError
        It was begun with another content, or pyarrow is missing.
    """
    target = _checked_name(Path(path))
    if target.suffix == PARQUET_SUFFIX:
        from buckdesign.studies.parquet import require_pyarrow

        require_pyarrow()
    columns = [f"{name} ({kind})" for name, kind in kinds.items()]
    whole = {**content, "table": {"columns": columns, "rows": count, "chunk_rows": [sizes.first, sizes.rest]}}
    record_path = _beside(target, RECORD_SUFFIX)
    if not restart and not record_path.exists():
        _refuse_existing(target)
        _refuse_existing(_beside(target, PART_SUFFIX))
    record = open_record(record_path, force=restart)
    table = GrowingTable(target, record, kinds, count, sizes)
    try:
        table.settle(whole, restart=restart)
    except BaseException:
        table.close()
        raise
    return table


class GrowingTable:
    """A table that grows; `open_table` makes one.

    Attributes
    ----------
    path : pathlib.Path
        The finished table.
    count : int
        Rows of the finished table.
    finished : bool
        Whether nothing is left to do.
    """

    def __init__(
        self, path: Path, record: RunRecord, kinds: Mapping[str, Kind], count: int, sizes: ChunkSizes
    ) -> None:
        self.path = path
        self.count = count
        self.finished = False
        self._kinds = dict(kinds)
        self._sizes = sizes
        self._record = record
        self._header = csv_header(tuple(kinds))
        self._part = _beside(path, PART_SUFFIX)
        self._ready = _beside(path, CONVERTED_SUFFIX) if path.suffix == PARQUET_SUFFIX else self._part
        self._descriptor = -1
        self._size = 0
        self._crc = 0

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Close the files; what is on disk stays for the next time."""
        self._close_part()
        self._record.close()

    @property
    def rows_done(self) -> int:
        """Rows that are on disk."""
        chunks = len(self._record.entries)
        return chunk_bounds(chunks - 1, self.count, self._sizes)[1] if chunks else 0

    def remaining(self) -> Iterator[tuple[int, int]]:
        """First row and the one after the last of each chunk that is missing."""
        for index in range(len(self._record.entries), chunk_count(self.count, self._sizes)):
            yield chunk_bounds(index, self.count, self._sizes)

    def append(self, chunk: Chunk) -> None:
        """Put the next chunk on disk.

        Raises
        ------
        FileAccessError
            It can't be written; the table stays as it was before.
        ValueError
            It is not the next one.
        """
        index = len(self._record.entries)
        if (chunk.start, chunk.stop) != chunk_bounds(index, self.count, self._sizes) or self.finished:
            raise ValueError(f"rows {chunk.start} to {chunk.stop} do not follow row {self.rows_done}")
        with naming(self._part, f"; the same command goes on from row {self.rows_done}"):
            write_at(self._descriptor, self._size, chunk.text)
        self._record.add(ChunkEntry(chunk=index, bytes=len(chunk.text), crc32=zlib.crc32(chunk.text)))
        self._size += len(chunk.text)
        self._crc = zlib.crc32(chunk.text, self._crc)

    def finish(self) -> None:
        """Give the complete table its name.

        Raises
        ------
        FileAccessError
            It can't be written, or another file has got that name meanwhile.
        ValueError
            Chunks are missing.
        """
        if self.finished:
            return
        if len(self._record.entries) != chunk_count(self.count, self._sizes):
            raise ValueError(f"{self.count - self.rows_done} rows are missing")
        self._close_part()
        mark = Finished(bytes=self._size, crc32=self._crc)
        if self._ready != self._part:
            mark = self._convert()
        self._record.finish(mark)
        self._take_name()

    def read_back(self, kept: Mapping[str, Kind]) -> Iterator[Chunk]:
        """The rows that are on disk, as chunks without text (and not with the bounds they were computed in).

        Parameters
        ----------
        kept : mapping of str to Kind
            Columns that are wanted.

        Yields
        ------
        Chunk
            In order.
        """
        source = self.path if self.finished else self._part
        names = list(dict.fromkeys([*kept, *({FAILURE_COLUMN} & set(self._kinds))])) or list(self._kinds)[:1]
        start = 0
        for frame in read_table(source, self._kinds, names):
            stop = start + len(frame)
            yield Chunk(
                start=start,
                stop=stop,
                text=b"",
                kept={name: frame_values(frame[name], kind) for name, kind in kept.items()},
                failed=count_failed(frame[FAILURE_COLUMN]) if FAILURE_COLUMN in frame else 0,
            )
            start = stop

    def settle(self, content: Mapping[str, Any], *, restart: bool) -> None:
        """Find out what is there and make it ready for the next chunk; `open_table` does it."""
        record = self._record
        if restart:
            self._begin(content, replaces=self.path.exists())
        elif record.content is None:
            _refuse_existing(self.path)
            self._begin(content, replaces=False)
        else:
            check_same(self.path, record.content, content)
            if record.finished is not None:
                self._settle_finished(content, record.finished)
            else:
                if not record.replaces:
                    _refuse_existing(self.path)
                self._resume()

    def _settle_finished(self, content: Mapping[str, Any], mark: Finished) -> None:
        if _measured(self.path) == mark:
            self.finished = True
            if self._ready != self._part:
                _remove(self._part)
        elif _measured(self._ready) == mark:
            self._take_name()
        elif not self.path.exists():
            self._begin(content, replaces=False)
        else:
            raise FileAccessError(self.path, f"has been changed since it was computed; {RESTART_ADVICE}")

    def _begin(self, content: Mapping[str, Any], *, replaces: bool) -> None:
        self._record.begin(content, replaces=replaces)
        self._resume()

    def _resume(self) -> None:
        """Keep the chunks whose checksums are right, cut off the rest."""
        with naming(self._part):
            flags = os.O_RDWR | os.O_CREAT | getattr(os, "O_BINARY", 0)
            self._descriptor = os.open(self._part, flags, 0o666)
            with os.fdopen(os.dup(self._descriptor), "rb") as file:
                file.seek(0)
                has_header = file.read(len(self._header)) == self._header
                self._size, self._crc = len(self._header), zlib.crc32(self._header)
                good = 0
                for entry in self._record.entries if has_header else ():
                    text = file.read(entry.bytes)
                    if len(text) != entry.bytes or zlib.crc32(text) != entry.crc32:
                        break
                    good += 1
                    self._size += entry.bytes
                    self._crc = zlib.crc32(text, self._crc)
        self._record.cut(good)
        with naming(self._part):
            os.ftruncate(self._descriptor, self._size if has_header else 0)
            if not has_header:
                write_at(self._descriptor, 0, self._header)
            os.fsync(self._descriptor)
        _sync_folder(self._part.parent)

    def _convert(self) -> Finished:
        from buckdesign.studies.parquet import write_parquet

        with naming(self._ready, "; the same command tries it again"):
            write_parquet(self._part, self._ready, self._kinds)
        mark = _measured(self._ready)
        if mark is None:
            raise FileAccessError(self._ready, "has gone while it was written")
        return mark

    def _take_name(self) -> None:
        """Move the complete table to its name, and never over one that no run of ours has made."""
        if not self._record.replaces:
            _refuse_existing(self.path)
        with naming(self.path):
            with contextlib.suppress(FileNotFoundError):
                self._ready.chmod(stat.S_IMODE(self.path.stat().st_mode))
            self._ready.replace(self.path)
            _sync_folder(self.path.parent)
        if self._ready != self._part:
            _remove(self._part)
        self.finished = True

    def _close_part(self) -> None:
        if self._descriptor >= 0:
            os.close(self._descriptor)
            self._descriptor = -1


def fill_table(
    table: GrowingTable, executor: Executor, progress: Callable[[Progress], None] | None = None
) -> Iterator[Chunk]:
    """Compute what is missing of a table and finish it.

    Parameters
    ----------
    table : GrowingTable
        The table.
    executor : Executor
        Computes the chunks.
    progress : callable, optional
        Told about each chunk.

    Yields
    ------
    Chunk
        Those that were computed, once they are on disk.

    Raises
    ------
    FileAccessError
        The table can't be written.
    """
    for chunk in run_chunks(executor, table.remaining(), table.count, progress):
        table.append(chunk)
        yield chunk
    table.finish()


def _beside(target: Path, suffix: str) -> Path:
    return target.with_name(target.name + suffix)


def _checked_name(path: Path) -> Path:
    """The real place of a table, if one can be made there."""
    with naming(path):
        try:
            target = path.resolve()
        except RuntimeError:  # what Python before 3.13 says of a loop
            raise FileAccessError(path, "is a link that leads back to itself") from None
        if target.is_symlink():
            raise FileAccessError(path, "is a link that leads back to itself")
        if target.is_dir():
            raise FileAccessError(path, "is a folder")
        if target.exists() and not target.is_file():
            raise FileAccessError(path, "is no regular file; a table that can be resumed needs one")
        if not target.parent.is_dir():
            raise FileAccessError(path, f"there is no folder {target.parent}")
        if not os.access(target.parent, os.W_OK):
            raise FileAccessError(path, f"the folder {target.parent} can't be written to")
    return target


def _refuse_existing(path: Path) -> None:
    if path.exists():
        raise FileAccessError(
            path, f"exists already, and is no part of this run; {RESTART_ADVICE} and replaces it"
        )


def _measured(path: Path) -> Finished | None:
    """Length and checksum of a file; None where there is none."""
    size, crc = 0, 0
    try:
        with path.open("rb") as file:
            while block := file.read(_BLOCK):
                size += len(block)
                crc = zlib.crc32(block, crc)
    except FileNotFoundError:
        return None
    except OSError as error:
        raise FileAccessError(path, f"can't be read: {error.strerror or error}") from None
    return Finished(bytes=size, crc32=crc)


def _remove(path: Path) -> None:
    with naming(path):
        path.unlink(missing_ok=True)


def _sync_folder(folder: Path) -> None:
    """See a new name on disk, where the system can."""
    with contextlib.suppress(OSError):
        descriptor = os.open(folder, os.O_RDONLY)
        try:
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
