"""The text of a long table: rows as lines of CSV, and such a table read back in pieces.

CSV by RFC 4180, in UTF-8, with ``\\n`` between the rows. A number has ten significant digits, so that a table does
not depend on the last bits of a sum. An empty cell is what is not known; an infinite number stands as ``inf``,
because it is known; truth is ``true`` and ``false``.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal, TypeAlias

import numpy as np
from numpy.typing import NDArray

from buckdesign.errors import FileAccessError, InputError

if TYPE_CHECKING:
    import pandas as pd

Kind: TypeAlias = Literal["float", "int", "text", "bool"]
"""What the cells of a column are; each of them may be empty."""

Column: TypeAlias = NDArray[Any] | Sequence[Any]
"""Values of a column: an array, or a list of texts, numbers, truths, tuples of them, and None."""

DIGITS = "%.10g"
"""How a number is written."""

PIECE_ROWS = 50_000
"""Rows that are read at once (own choice: some 20 MB of a table with 50 columns)."""

LIST_SEPARATOR = "; "
"""What stands between the values of a list."""

PARQUET_SUFFIX = ".parquet"
"""Ending of a table that is no CSV."""

DTYPES = {"float": "float64", "int": "Int64", "text": "str", "bool": "boolean"}
"""Dtypes of the data frames, whatever the cells hold."""

_SPECIAL = re.compile(r'[",\r\n]')


def csv_header(columns: Sequence[str]) -> bytes:
    """The first line of a table.

    Parameters
    ----------
    columns : sequence of str
        Names in order.

    Returns
    -------
    bytes
        One line.
    """
    return (",".join(_quote(name) for name in columns) + "\n").encode("utf-8", "replace")


def csv_lines(columns: Mapping[str, Column]) -> bytes:
    """The rows of a table as lines.

    Parameters
    ----------
    columns : mapping of str to array or list, shape (n,) each
        The columns in order.

    Returns
    -------
    bytes
        n lines.

    Raises
    ------
    ValueError
        The columns differ in length.

    Examples
    --------
    >>> csv_lines({"part": ["1N5822", None], "ripple_v": [0.1, float("nan")], "turns": [30, 31]})
    b'1N5822,0.1,30\\n,,31\\n'
    """
    lengths = {len(column) for column in columns.values()}
    if len(lengths) != 1:
        raise ValueError(f"the columns have {sorted(lengths)} rows")
    (rows,) = lengths
    if not rows:
        return b""
    formats, varying = [], []
    for column in columns.values():
        form, cells = _cells(column, alone=len(columns) == 1)
        formats.append(form)
        if cells is not None:
            varying.append(cells)
    line = ",".join(formats) + "\n"
    lines = [line % row for row in zip(*varying, strict=True)] if varying else [line % ()] * rows
    return "".join(lines).encode("utf-8", "replace")


def split_rows(text: bytes) -> list[bytes]:
    """The lines of rows one by one; a row is longer than a line where a cell holds one.

    Parameters
    ----------
    text : bytes
        From `csv_lines`.

    Returns
    -------
    list of bytes
        One entry a row, with its end.

    Examples
    --------
    >>> split_rows(b'1,"two\\nlines"\\n2,one\\n')
    [b'1,"two\\nlines"\\n', b'2,one\\n']
    """
    rows: list[bytes] = []
    for line in text.split(b"\n")[:-1]:
        if rows and rows[-1].count(b'"') % 2:
            rows[-1] += line + b"\n"
        else:
            rows.append(line + b"\n")
    return rows


def _cells(column: Column, *, alone: bool) -> tuple[str, list[Any] | None]:
    """Format of a column, and what goes into it in each row: nothing where all rows are the same."""
    values = _plain(column)
    if isinstance(values, np.ndarray):
        lowest, highest = values.min(), values.max()
        is_whole = values.dtype.kind in "iu"
        if lowest == highest:
            return _text(values[0].item()), None
        if is_whole or not np.isnan(lowest):
            return "%d" if is_whole else DIGITS, values.tolist()
        texts = [DIGITS % value if value == value else "" for value in values.tolist()]
    else:
        texts = [_quote(_text(value)) for value in values]
    if alone:
        texts = [text or '""' for text in texts]
    if texts.count(texts[0]) == len(texts):
        return texts[0].replace("%", "%%"), None
    return "%s", texts


def _plain(column: Column) -> NDArray[Any] | Sequence[Any]:
    """Numbers as an array without negative zeros, everything else as a list."""
    if not isinstance(column, np.ndarray):
        return column
    if column.dtype.kind in "iu":
        return column
    if column.dtype.kind == "f":
        return column.astype(np.float64) + 0.0
    return column.tolist()


def _text(value: Any) -> str:
    """A cell as it is read back, without quotes."""
    if isinstance(value, str):
        return value
    if value is None:
        return ""
    if isinstance(value, bool | np.bool_):
        return "true" if value else "false"
    if isinstance(value, int | np.integer):
        return str(int(value))
    if isinstance(value, float | np.floating):
        return DIGITS % (value + 0.0) if value == value else ""
    if isinstance(value, tuple | list):
        return LIST_SEPARATOR.join(_text(part) for part in value)
    return str(value)


def _quote(text: str) -> str:
    if _SPECIAL.search(text):
        return '"' + text.replace('"', '""') + '"'
    return text


def kept_values(column: Column, kind: Kind) -> NDArray[np.float64] | list[Any]:
    """The values of a column as the table will tell them, so that a summary does not depend on a break.

    Parameters
    ----------
    column : array or list, shape (n,)
        Values as they were computed.
    kind : Kind
        What they are.

    Returns
    -------
    array or list, shape (n,)
        Numbers as floats with the digits of the table, NaN where not known; texts, empty where not known; or
        truths, None where not known.
    """
    if kind in ("float", "int"):
        if isinstance(column, np.ndarray) and column.dtype.kind in "iu":
            return column.astype(np.float64)
        texts = [_text(value) or "nan" for value in column]
        return np.array(texts, dtype=np.float64)
    if kind == "text":
        return [_text(value) for value in column]
    return [None if _text(value) == "" else bool(value) for value in column]


def frame_values(column: pd.Series[Any], kind: Kind) -> NDArray[np.float64] | list[Any]:
    """Like `kept_values`, from a column of a table that was read.

    Parameters
    ----------
    column : Series, shape (n,)
        Of a frame of `read_table`.
    kind : Kind
        What it holds.

    Returns
    -------
    array or list, shape (n,)
        As from `kept_values`.
    """
    if kind in ("float", "int"):
        return column.to_numpy(dtype=np.float64, na_value=np.nan)
    if kind == "text":
        return list(column)
    return [None if missing else bool(value) for value, missing in zip(column, column.isna(), strict=True)]


def read_table(
    path: Path, kinds: Mapping[str, Kind], columns: Sequence[str] | None = None, rows: int = PIECE_ROWS
) -> Iterator[pd.DataFrame]:
    """Read a table in pieces, with the same dtypes whatever it holds.

    Parameters
    ----------
    path : pathlib.Path
        A CSV, or a Parquet file where it ends with ``.parquet``.
    kinds : mapping of str to Kind
        All columns of the table.
    columns : sequence of str, optional
        Those wanted, in this order; all where omitted.
    rows : int
        Most rows at once.

    Yields
    ------
    DataFrame
        Numbers as float64 with NaN where the cell is empty, whole ones as Int64, truths as boolean, both with
        NA; texts as str, empty where the cell is. A table without rows yields nothing.

    Raises
    ------
    FileAccessError
        It can't be read.
    InputError
        It is no table with these columns, or a cell isn't of its kind.
    """
    wanted = list(kinds) if columns is None else list(columns)
    if Path(path).suffix == PARQUET_SUFFIX:
        from buckdesign.studies.parquet import read_parquet

        pieces = read_parquet(Path(path), wanted, rows)
    else:
        pieces = _read_csv(Path(path), kinds, wanted, rows)
    dtypes = {name: DTYPES[kinds[name]] for name in wanted}
    for piece in pieces:
        if len(piece):
            yield piece[wanted].astype(dtypes)


def _read_csv(
    path: Path, kinds: Mapping[str, Kind], wanted: Sequence[str], rows: int
) -> Iterator[pd.DataFrame]:
    import pandas as pd

    try:
        with pd.read_csv(
            path,
            usecols=list(wanted),
            dtype={name: DTYPES[kinds[name]] for name in wanted},
            keep_default_na=False,
            na_values={name: [""] for name in wanted if kinds[name] != "text"},
            true_values=["true"],
            false_values=["false"],
            skip_blank_lines=False,
            chunksize=rows,
            encoding="utf-8",
            **_exact_floats(),
        ) as pieces:
            yield from pieces
    except OSError as error:
        raise FileAccessError(path, f"can't be read: {error.strerror or error}") from None
    except (ValueError, OverflowError) as error:
        raise InputError(f"{path}: is not the table it should be: {' '.join(str(error).split())}") from None


def _exact_floats() -> dict[str, Any]:
    """What makes pandas read a number to the nearest float: from 3.1 on it does, and wants not to be asked."""
    import pandas as pd

    major, minor = (int(part) for part in pd.__version__.split(".")[:2])
    return {} if (major, minor) >= (3, 1) else {"float_precision": "round_trip"}
