"""Long tables on disk: their text, reading them back, and going on after a kill at any moment."""

from __future__ import annotations

import csv
import errno
import io
import json
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.errors import FileAccessError, InputError
from buckdesign.studies import run_record
from buckdesign.studies.chunks import ChunkJob
from buckdesign.studies.growing_table import fill_table, open_table
from buckdesign.studies.local_workers import OwnProcess
from buckdesign.studies.table_file import Kind, csv_header, csv_lines, frame_values, kept_values, read_table
from tests.studies.plain_work import KEPT, KINDS, PlainWork, content_of, opened, run, summary

WORK = PlainWork(count=3500)
ROOT = Path(__file__).parents[2]


@pytest.fixture(scope="module")
def whole(tmp_path_factory: pytest.TempPathFactory) -> bytes:
    """The table of `WORK`, computed without a break."""
    path = tmp_path_factory.mktemp("whole") / "table.csv"
    run(path, WORK)
    return path.read_bytes()


def record_of(path: Path) -> Path:
    return path.with_name(path.name + ".run.jsonl")


def part_of(path: Path) -> Path:
    return path.with_name(path.name + ".part")


def begin(path: Path, chunks: int) -> None:
    """Compute the first chunks of the table of `WORK`, then leave it."""
    job = ChunkJob(work=WORK, kept=KEPT)
    with opened(path, WORK) as table:
        filling = fill_table(table, OwnProcess(job, 1))
        for _ in range(chunks):
            next(filling)


# the text


def test_cells() -> None:
    columns = {
        "float": np.array([1 / 3, np.nan, np.inf, -np.inf, -0.0, 1e-300]),
        "int": np.array([1, 2, 3, -4, 2**60, 6]),
        "mixed": [None, True, 2, 0.1, "x", (1.0, "1N5822")],
        "bool": np.array([True, False, True, True, True, True]),
        "same": np.full(6, 24.0),
        "percent": ["10 %"] * 6,
    }
    assert csv_lines(columns).decode().split("\n") == [
        "0.3333333333,1,,true,24,10 %",
        ",2,true,false,24,10 %",
        "inf,3,2,true,24,10 %",
        "-inf,-4,0.1,true,24,10 %",
        "0,1152921504606846976,x,true,24,10 %",
        "1e-300,6,1; 1N5822,true,24,10 %",
        "",
    ]


@given(st.lists(st.tuples(st.text(), st.text()), min_size=1))
def test_any_text_survives_a_reader_of_rfc_4180(rows: list[tuple[str, str]]) -> None:
    text = csv_lines({"a": [a for a, _ in rows], "b": [b for _, b in rows]}).decode()
    # the reader of the standard library takes a line end of any kind, inside quotes as it stands
    assert [tuple(row) for row in csv.reader(io.StringIO(text, newline=""))] == rows


def test_columns_of_different_length_are_a_fault() -> None:
    with pytest.raises(ValueError, match=r"\[1, 2\] rows"):
        csv_lines({"a": [1], "b": [1, 2]})


@pytest.mark.parametrize("suffix", [".csv", ".parquet"])
@pytest.mark.parametrize("rows", [0, 1, 70])
def test_the_same_dtypes_whatever_a_table_holds(tmp_path: Path, suffix: str, rows: int) -> None:
    if suffix == ".parquet":
        pytest.importorskip("pyarrow")
    path = tmp_path / f"table{suffix}"
    run(path, PlainWork(count=rows))
    frames = list(read_table(path, KINDS, ["holds", "row", "part", "unknown_w", "ripple_v", "failure"]))
    assert sum(len(frame) for frame in frames) == rows
    for frame in frames:
        assert list(frame.columns) == ["holds", "row", "part", "unknown_w", "ripple_v", "failure"]
        kinds = [str(dtype).replace("object", "str") for dtype in frame.dtypes]
        assert kinds == ["boolean", "Int64", "str", "float64", "float64", "str"]
        assert frame["unknown_w"].isna().all()
        assert not frame["failure"].isna().any()


def test_a_column_of_one_table_keeps_its_empty_cells(tmp_path: Path) -> None:
    path = tmp_path / "table.csv"
    path.write_bytes(csv_header(["part"]) + csv_lines({"part": ["", "1N5822", ""]}))
    (frame,) = read_table(path, {"part": "text"})
    assert list(frame["part"]) == ["", "1N5822", ""]


VALUES: dict[str, tuple[Kind, Any]] = {
    "numbers": ("float", np.random.default_rng(1).lognormal(0.0, 20.0, 500)),
    "unknown": ("float", np.where(np.arange(500) % 3, np.nan, 1 / 7)),
    "infinite": ("float", np.where(np.arange(500) % 3, np.inf, 1 / 7)),
    "listed": ("float", [None if row % 4 else row / 7 for row in range(500)]),
    "whole": ("int", np.arange(500)),
    "some": ("int", [None if row % 4 else row for row in range(500)]),
    "texts": ("text", ["NA", "nan", "", "null", " x ", 'a"b', "1", "c,d", "e\r\nf", "g"] * 50),
    "parts": ("text", [("1N5822", 2)] * 500),
    "truths": ("bool", np.arange(500) % 2 == 0),
    "perhaps": ("bool", [None, True, False, True] * 125),
}


@pytest.mark.parametrize("suffix", [".csv", ".parquet"])
def test_what_is_kept_is_what_is_read_back(tmp_path: Path, suffix: str) -> None:
    kinds = {name: kind for name, (kind, _) in VALUES.items()}
    path = tmp_path / "table.csv"
    path.write_bytes(
        csv_header(list(VALUES)) + csv_lines({name: values for name, (_, values) in VALUES.items()})
    )
    if suffix == ".parquet":
        pytest.importorskip("pyarrow")
        from buckdesign.studies.parquet import write_parquet

        write_parquet(path, tmp_path / "table.parquet", kinds)
    frames = list(read_table(tmp_path / f"table{suffix}", kinds, rows=150))
    assert [len(frame) for frame in frames] == [150, 150, 150, 50]
    for name, (kind, values) in VALUES.items():
        back = [value for frame in frames for value in frame_values(frame[name], kind)]
        kept = list(kept_values(values, kind))
        same = [a == b or (a != a and b != b) for a, b in zip(back, kept, strict=True)]
        assert all(same), name


@pytest.mark.parametrize("text", ["part\n1N5822\n", "row,ripple_v\nx,1\n", "row,ripple_v\n1,y\n", ""])
def test_a_file_that_is_another_table_is_refused(tmp_path: Path, text: str) -> None:
    path = tmp_path / "table.csv"
    path.write_text(text)
    with pytest.raises(InputError, match="not the table it should be"):
        list(read_table(path, {"row": "int", "ripple_v": "float"}))
    with pytest.raises(FileAccessError, match="can't be read"):
        list(read_table(tmp_path / "none.csv", {"row": "int"}))


# kills


class Killed(BaseException):
    """Stands for SIGKILL: nothing that touches the disk works afterwards."""


CALLS = ("write", "ftruncate", "fsync", "replace", "unlink")
"""All by which the disk is changed."""


class Killer:
    """Lets a number of calls pass, then tears the next one and refuses all that follow."""

    def __init__(self, monkeypatch: pytest.MonkeyPatch, calls: int) -> None:
        self.left = calls
        for name in CALLS:
            monkeypatch.setattr(os, name, self._deadly(name, getattr(os, name)))

    def _deadly(self, name: str, call: Callable[..., Any]) -> Callable[..., Any]:
        def instead(*arguments: Any) -> Any:
            self.left -= 1
            if self.left == -1 and name == "write":
                call(arguments[0], arguments[1][: len(arguments[1]) // 2])
            if self.left < 0:
                raise Killed
            return call(*arguments)

        return instead


def calls_survived(path: Path, calls: int, *, restart: bool = False) -> bool:
    """Run with a kill after so many calls; whether it came to an end before."""
    with pytest.MonkeyPatch.context() as patch:
        killer = Killer(patch, calls)
        try:
            run(path, WORK, restart=restart)
        except Killed:
            return False
        return killer.left >= 0


@pytest.mark.parametrize("suffix", [".csv", ".parquet"])
def test_a_kill_before_every_single_change_of_the_disk(tmp_path: Path, whole: bytes, suffix: str) -> None:
    if suffix == ".parquet":
        pytest.importorskip("pyarrow")
    calls = 0
    path = tmp_path / "none"
    while True:
        path = tmp_path / f"{calls}{suffix}"
        if calls_survived(path, calls):
            break
        # the second kill falls into what the first one has left to mend
        calls_survived(path, 1 + calls % 3)
        again = summary(run(path, WORK))
        assert again["failed"] == [sum(row % 97 == 5 for row in range(WORK.count))]
        assert again["row"] == list(range(WORK.count))
        assert not part_of(path).exists()
        if suffix == ".csv":
            assert path.read_bytes() == whole
        calls += 1
    assert calls > 25
    if suffix == ".parquet":
        assert len({file.read_bytes() for file in tmp_path.glob("*.parquet")}) == 1


def test_a_kill_of_a_restart_keeps_the_old_table_until_the_new_one_is_there(
    tmp_path: Path, whole: bytes
) -> None:
    calls = 0
    while True:
        path = tmp_path / f"{calls}.csv"
        path.write_text("something else\n")
        if calls_survived(path, calls, restart=True):
            break
        assert path.read_bytes() in (b"something else\n", whole)
        if not record_of(path).exists() or b"\n" not in record_of(path).read_bytes():
            # nothing says yet that this table may be replaced
            with pytest.raises(FileAccessError, match="exists already"):
                run(path, WORK)
            run(path, WORK, restart=True)
        else:
            run(path, WORK)
        assert path.read_bytes() == whole
        calls += 1
    assert calls > 25


@pytest.mark.parametrize(
    "tail", [b"{", b'{"chunk":2,"bytes":', b'{"chunk":7,"bytes":1,"crc32":1}\n', b"\0\0\0\n", b"[]\n"]
)
def test_a_torn_or_foreign_line_of_the_record_is_dropped(tmp_path: Path, whole: bytes, tail: bytes) -> None:
    path = tmp_path / "table.csv"
    begin(path, 2)
    with record_of(path).open("ab") as file:
        file.write(tail)
    with opened(path, WORK) as table:
        assert table.rows_done == 1064
    run(path, WORK)
    assert path.read_bytes() == whole


@pytest.mark.parametrize("cut", [0, 10, 500, 3000, 10_000])
def test_rows_that_are_noted_but_not_there_are_computed_again(tmp_path: Path, whole: bytes, cut: int) -> None:
    path = tmp_path / "table.csv"
    begin(path, 3)
    os.truncate(part_of(path), cut)
    with opened(path, WORK) as table:
        assert table.rows_done < 2064
    run(path, WORK)
    assert path.read_bytes() == whole


def test_rows_that_are_damaged_are_computed_again(tmp_path: Path, whole: bytes) -> None:
    path = tmp_path / "table.csv"
    begin(path, 3)
    text = bytearray(part_of(path).read_bytes())
    text[len(text) // 2] ^= 1
    part_of(path).write_bytes(text)
    run(path, WORK)
    assert path.read_bytes() == whole


# what is begun with what


def test_the_same_again_computes_nothing(
    tmp_path: Path, whole: bytes, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "table.csv"
    first = run(path, WORK)
    stamp = path.stat().st_mtime_ns

    def never(*arguments: Any, **named: Any) -> Any:
        raise AssertionError("computed again")

    monkeypatch.setattr(PlainWork, "evaluate", never)
    with opened(path, WORK) as table:
        assert table.finished
        assert list(table.remaining()) == []
        table.finish()
    again = run(path, WORK)
    assert path.stat().st_mtime_ns == stamp
    np.testing.assert_equal(summary(again), summary(first))


def test_a_summary_does_not_depend_on_a_break(tmp_path: Path) -> None:
    run(tmp_path / "a.csv", WORK)
    begin(tmp_path / "b.csv", 2)
    np.testing.assert_equal(
        summary(run(tmp_path / "b.csv", WORK)),
        summary(run(tmp_path / "c.csv", WORK)),
    )


def test_another_content_is_refused_with_what_differs(tmp_path: Path) -> None:
    path = tmp_path / "table.csv"
    begin(path, 1)
    part = part_of(path).read_bytes()
    other = content_of(WORK)
    other["study"]["vary"]["choke.turns"] = [30, 32, 33]
    other["version"] = "0.2.0"
    other["new"] = None
    with pytest.raises(InputError) as error:
        open_table(path, content=other, kinds=KINDS, count=WORK.count)
    assert str(error.value) == (
        f"{path}: was begun with something else: study.vary.choke.turns[1]: 31 -> 32; "
        'study.vary.choke.turns[2]: absent -> 33; version: "0.1.0" -> "0.2.0"; new: absent -> null; '
        "--restart computes it from the beginning"
    )
    with pytest.raises(InputError, match=r"table\.rows: 3500 -> 4000"):
        open_table(path, content=content_of(WORK), kinds=KINDS, count=4000)
    reordered = dict(reversed(KINDS.items()))
    with pytest.raises(
        InputError, match=r'table\.columns\[0\]: "row \(int\)" -> "failure \(text\)".*and 1 more'
    ):
        open_table(path, content=content_of(WORK), kinds=reordered, count=WORK.count)
    assert part_of(path).read_bytes() == part
    with opened(path, WORK) as table:
        assert table.rows_done == 64


def test_another_content_begins_anew_where_it_is_asked_for(tmp_path: Path) -> None:
    path = tmp_path / "table.csv"
    begin(path, 2)
    other = PlainWork(count=100)
    run(path, other, restart=True)
    run(tmp_path / "other.csv", other)
    assert path.read_bytes() == (tmp_path / "other.csv").read_bytes()


@pytest.mark.parametrize("name", ["table.csv", "table.csv.part"])
def test_a_file_of_unknown_make_is_never_replaced(tmp_path: Path, name: str) -> None:
    stranger = tmp_path / name
    stranger.write_text("mine\n")
    with pytest.raises(FileAccessError, match=r"exists already.*--restart"):
        run(tmp_path / "table.csv", WORK)
    assert stranger.read_text() == "mine\n"
    assert list(tmp_path.iterdir()) == [stranger]


def test_a_table_of_unknown_make_that_appears_meanwhile_is_never_replaced(
    tmp_path: Path, whole: bytes
) -> None:
    path = tmp_path / "table.csv"
    with opened(path, WORK) as table:
        filling = fill_table(table, OwnProcess(ChunkJob(work=WORK, kept={}), 1))
        next(filling)
        path.write_text("mine\n")
        with pytest.raises(FileAccessError, match="exists already"):
            list(filling)
    with pytest.raises(FileAccessError, match=r"exists already|has been changed"):
        run(path, WORK)
    assert path.read_text() == "mine\n"
    path.unlink()
    run(path, WORK)
    assert path.read_bytes() == whole


def test_a_foreign_record_is_refused(tmp_path: Path, whole: bytes) -> None:
    path = tmp_path / "table.csv"
    record_of(path).write_text('{"mine": 1}\n')
    with pytest.raises(FileAccessError, match="is no record of a run"):
        run(path, WORK)
    assert record_of(path).read_text() == '{"mine": 1}\n'
    run(path, WORK, restart=True)
    assert path.read_bytes() == whole


def test_a_finished_table_that_was_changed_is_refused_and_one_that_has_gone_is_computed_again(
    tmp_path: Path, whole: bytes
) -> None:
    path = tmp_path / "table.csv"
    run(path, WORK)
    changed = whole.replace(b"true", b"trUe", 1)
    path.write_bytes(changed)
    with pytest.raises(FileAccessError, match="has been changed since it was computed; --restart"):
        run(path, WORK)
    assert path.read_bytes() == changed
    path.unlink()
    run(path, WORK)
    assert path.read_bytes() == whole


def test_a_second_run_of_the_same_table_is_refused(tmp_path: Path, whole: bytes) -> None:
    pytest.importorskip("fcntl")
    path = tmp_path / "table.csv"
    command = [sys.executable, "-m", "tests.studies.plain_work", str(path), "3500", "1e-6", "1"]
    with opened(path, WORK):
        second = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, timeout=60)
        assert second.returncode == 2
        assert second.stderr.count("\n") == 1
        assert "another run is at this table" in second.stderr
        with pytest.raises(FileAccessError, match="another run"):
            run(path, WORK, restart=True)
    run(path, WORK)
    assert path.read_bytes() == whole


def test_a_record_that_another_run_removes_meanwhile_is_made_anew(
    tmp_path: Path, whole: bytes, monkeypatch: pytest.MonkeyPatch
) -> None:
    pytest.importorskip("fcntl")
    path = tmp_path / "table.csv"
    lock = run_record._lock
    removed = []

    def late_lock(record: Path, descriptor: int) -> None:
        if not removed:
            record.unlink()
            removed.append(record)
        lock(record, descriptor)

    monkeypatch.setattr(run_record, "_lock", late_lock)
    with opened(path, WORK), pytest.raises(FileAccessError, match="another run"):
        opened(path, WORK)
    run(path, WORK)
    assert path.read_bytes() == whole


# places that can't be written


def test_what_is_no_place_for_a_table(tmp_path: Path) -> None:
    with pytest.raises(FileAccessError, match="is a folder"):
        opened(tmp_path, WORK)
    with pytest.raises(FileAccessError, match="there is no folder"):
        opened(tmp_path / "none" / "table.csv", WORK)
    (tmp_path / "other.csv.part").mkdir()
    (tmp_path / "other.csv.run.jsonl").mkdir()
    with pytest.raises(FileAccessError, match="Is a directory"):
        opened(tmp_path / "other.csv", WORK)
    if os.name == "posix":
        with pytest.raises(FileAccessError, match="no regular file"):
            opened(Path(os.devnull), WORK)


@pytest.mark.skipif(not hasattr(os, "geteuid") or os.geteuid() == 0, reason="everything is allowed here")
def test_a_folder_without_permission(tmp_path: Path) -> None:
    tmp_path.chmod(0o500)
    with pytest.raises(FileAccessError, match="can't be written"):
        opened(tmp_path / "table.csv", WORK)
    tmp_path.chmod(0o700)


def test_a_link_to_itself_is_no_place_for_a_table(tmp_path: Path) -> None:
    path = tmp_path / "loop.csv"
    path.symlink_to(path)
    with pytest.raises(FileAccessError, match="leads back to itself"):
        open_table(path, content={}, kinds={"a": "float"}, count=1)


def test_a_link_is_followed(tmp_path: Path, whole: bytes) -> None:
    (tmp_path / "there").mkdir()
    link = tmp_path / "table.csv"
    link.symlink_to(tmp_path / "there" / "real.csv")
    run(link, WORK)
    assert link.is_symlink()
    assert (tmp_path / "there" / "real.csv").read_bytes() == whole


@pytest.mark.parametrize("call", ["write", "fsync"])
def test_a_full_disk_at_every_single_write(
    tmp_path: Path, whole: bytes, monkeypatch: pytest.MonkeyPatch, call: str
) -> None:
    original = getattr(os, call)
    passed = 0
    for passed in range(200):
        path = tmp_path / f"{passed}.csv"
        left = passed

        def full(descriptor: int, *data: bytes) -> Any:
            nonlocal left
            left -= 1
            if left >= 0:
                return original(descriptor, *data)
            if data and left == -1:
                return original(descriptor, data[0][: len(data[0]) // 2])
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

        with monkeypatch.context() as patch:
            patch.setattr(os, call, full)
            try:
                run(path, WORK)
                break
            except FileAccessError as error:
                assert "No space left on device" in str(error)
                assert str(path) in str(error)
                assert "\n" not in str(error)
        run(path, WORK)
        assert path.read_bytes() == whole
    assert passed > 5


LIMITED = """
import resource, sys
from tests.studies.plain_work import main
resource.setrlimit(resource.RLIMIT_FSIZE, (60_000, 60_000))
sys.exit(main(*sys.argv[1:]))
"""


def test_a_file_that_may_not_grow_further(tmp_path: Path, whole: bytes) -> None:
    pytest.importorskip("resource")
    path = tmp_path / "table.csv"
    command = [sys.executable, "-c", LIMITED, str(path), str(WORK.count), "0", "1"]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, timeout=60)
    assert done.returncode == 2
    assert (
        done.stderr.strip()
        == f"{path}.part: can't be written: File too large; the same command goes on from row 1064"
    )
    run(path, WORK)
    assert path.read_bytes() == whole


# Parquet


def test_parquet_without_pyarrow_is_refused_at_the_start(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setitem(sys.modules, "pyarrow.csv", None)
    with pytest.raises(InputError, match=r"buckdesign\[parquet\]"):
        opened(tmp_path / "table.parquet", WORK)
    assert list(tmp_path.iterdir()) == []


def test_parquet_has_the_declared_schema(tmp_path: Path) -> None:
    pq = pytest.importorskip("pyarrow.parquet")
    path = tmp_path / "table.parquet"
    run(path, WORK)
    schema = pq.read_schema(path)
    assert [f"{field.name} {field.type}" for field in schema] == [
        "row int64",
        "part string",
        "ripple_v double",
        "unknown_w double",
        "holds bool",
        "failure string",
    ]
    table = pq.read_table(path)
    assert table["row"].to_pylist() == list(range(WORK.count))
    assert table["unknown_w"].null_count == WORK.count
    assert table["part"].null_count == 0
    assert sorted(file.name for file in tmp_path.iterdir()) == ["table.parquet", "table.parquet.run.jsonl"]


def test_the_record_is_plain_json(tmp_path: Path, whole: bytes) -> None:
    path = tmp_path / "table.csv"
    run(path, WORK)
    first, *chunks, last = (json.loads(line) for line in record_of(path).read_text().splitlines())
    assert first["content"]["study"] == content_of(WORK)["study"]
    assert [chunk["chunk"] for chunk in chunks] == [0, 1, 2, 3, 4]
    assert last["finished"]["bytes"] == len(whole)


def test_a_chunk_out_of_turn_is_a_fault(tmp_path: Path) -> None:
    job = ChunkJob(work=WORK, kept={})
    with opened(tmp_path / "table.csv", WORK) as table:
        with pytest.raises(ValueError, match="do not follow row 0"):
            table.append(job.compute(64, 1064))
        with pytest.raises(ValueError, match="3500 rows are missing"):
            table.finish()
