"""One CSV table to rows of values: which kind of part it holds, its units, every fault of it.

A table is UTF-8 text with commas. Lines that begin with ``#`` are remarks. The first other line is the
header: column names, numbers with their unit in brackets (``leakage [mA]``, any SI prefix). An empty cell is
an absent value.
"""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from buckdesign.errors import Fault, FaultsError, QuantityError, TableError, nearest_names
from buckdesign.parts.fields import Column, Sign
from buckdesign.units import unit_exponent

_HEADER = re.compile(r"([a-z][a-z0-9_]*) *(?:\[([^\]]*)\])?")
_CELL = re.compile(r"([+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+))(?:[eE]([+-]?[0-9]{1,4}))?")


@dataclass(frozen=True, kw_only=True)
class Row:
    """One row of a table.

    Attributes
    ----------
    file : str
        Table it stands in.
    line : int
        Line in the file, counted from 1.
    values : mapping
        Values by attribute, SI.
    """

    file: str
    line: int
    values: Mapping[str, Any]


@dataclass(frozen=True, kw_only=True)
class _Place:
    """A column of the file at hand."""

    column: Column
    heading: str
    exponent: int


def read_rows(
    text: str,
    file: str,
    schemas: Mapping[str, Mapping[str, Column]],
    defaults: Mapping[str, str],
) -> tuple[str, list[Row]]:
    """The kind of a table and its rows.

    Parameters
    ----------
    text : str
        The whole file.
    file : str
        Its name, for messages.
    schemas : mapping of str to mapping of str to Column
        Columns by kind of part; the kind is recognised from the header.
    defaults : mapping of str to str
        Texts for columns that may be left out, here and in empty cells.

    Returns
    -------
    kind : str
        Key of `schemas`.
    rows : list of Row
        In the order of the file.

    Raises
    ------
    TableError
        If exactly one thing is wrong.
    FaultsError
        If more is wrong, with one line for each.
    """
    records = list(_records(text, file))
    if not records:
        raise TableError(file, None, None, None, "empty; a header line with column names is wanted")
    header_line, header = records[0]
    kind = _recognise(header, header_line, file, schemas)
    faults: list[Fault] = []
    places = _read_header(header, header_line, file, kind, schemas[kind], defaults, faults)
    rows = []
    if not faults:
        for line, cells in records[1:]:
            values = _read_row(cells, line, file, places, schemas[kind], defaults, faults)
            rows.append(Row(file=file, line=line, values=values))
    raise_faults(faults)
    return kind, rows


def raise_faults(faults: Sequence[Fault]) -> None:
    """Raise what was collected.

    Parameters
    ----------
    faults : sequence of Fault
        May be empty: then nothing happens.

    Raises
    ------
    TableError
        For a single fault.
    FaultsError
        For several.
    """
    if len(faults) == 1:
        only = faults[0]
        raise TableError(only.file, only.line, only.key or None, only.value, only.allowed)
    if faults:
        raise FaultsError(faults)


def _records(text: str, file: str) -> Iterator[tuple[int, list[str]]]:
    """Line number and cells of each line that is neither empty nor a remark."""
    lines = ["\n" if line.startswith("#") else line for line in text.splitlines(keepends=True)]
    reader = csv.reader(lines, strict=True)
    start = 1
    try:
        for cells in reader:
            if any(cell.strip() for cell in cells):
                yield start, [cell.strip() for cell in cells]
            start = reader.line_num + 1
    except csv.Error as error:
        raise TableError(file, start, None, None, f"no CSV row: {error}") from None


def _base_names(header: Sequence[str]) -> list[str]:
    return [cell.split("[")[0].strip() for cell in header]


def _recognise(
    header: Sequence[str], line: int, file: str, schemas: Mapping[str, Mapping[str, Column]]
) -> str:
    """The kind whose columns the header shows; `source` and `how` belong to all."""
    names = set(_base_names(header)) - {"name", "source", "how", "kind"}
    score = {kind: len(names & schema.keys()) for kind, schema in schemas.items()}
    missing = {
        kind: sum(column.required and name not in names for name, column in schema.items())
        for kind, schema in schemas.items()
    }
    best = min(schemas, key=lambda kind: (-score[kind], missing[kind]))
    if score[best] == 0:
        allowed = f"the columns of a table of {', '.join(schemas)}"
        if len(header) == 1 and ";" in header[0]:
            allowed += ", separated by commas"
        raise TableError(file, line, None, ",".join(header), f"no known column; wanted are {allowed}")
    return best


def _read_header(
    header: Sequence[str],
    line: int,
    file: str,
    kind: str,
    schema: Mapping[str, Column],
    defaults: Mapping[str, str],
    faults: list[Fault],
) -> list[_Place | None]:
    places: list[_Place | None] = []
    seen: set[str] = set()
    for cell in header:
        match = _HEADER.fullmatch(cell)
        column = schema.get(match.group(1)) if match else None
        if match is None or column is None:
            near = nearest_names(cell.split("[")[0].strip(), schema)
            wanted = ", ".join(schema[name].header for name in near)
            faults.append(Fault(file, line, "", cell, f"no column of a {kind} table, nearest: {wanted}"))
            continue
        if column.name in seen:
            faults.append(Fault(file, line, column.name, None, "this column stands twice"))
        seen.add(column.name)
        try:
            exponent = _header_exponent(column, match.group(2))
        except QuantityError as error:
            faults.append(Fault(file, line, column.name, error.value, error.allowed))
            continue
        places.append(_Place(column=column, heading=cell, exponent=exponent))
    for name, column in schema.items():
        if column.required and name not in seen and name not in defaults:
            faults.append(Fault(file, line, column.header, None, f"missing column of a {kind} table"))
    return places


def _header_exponent(column: Column, label: str | None) -> int:
    if column.is_text:
        if label is not None:
            raise QuantityError(f"[{label}]", "1", "a text has no unit")
        return 0
    if column.raw_label:
        if label != column.raw_label:
            raise QuantityError(f"[{label or ''}]", "1", f"the unit must be [{column.raw_label}]")
        return 0
    if label is None:
        raise QuantityError(None, column.unit, f"the header needs a unit, such as {column.header}")
    return unit_exponent("" if (label, column.unit) == ("1", "1") else label, column.unit)


def _read_row(
    cells: Sequence[str],
    line: int,
    file: str,
    places: Sequence[_Place | None],
    schema: Mapping[str, Column],
    defaults: Mapping[str, str],
    faults: list[Fault],
) -> dict[str, Any]:
    values: dict[str, Any] = {name: text for name, text in defaults.items() if name in schema}
    if len(cells) != len(places):
        allowed = f"{len(cells)} cells where the header has {len(places)} columns"
        named = places[len(cells)] if len(cells) < len(places) else None
        faults.append(Fault(file, line, named.heading if named else "", None, allowed))
        return values
    for place, cell in zip(places, cells, strict=True):
        assert place is not None
        column = place.column
        if not cell:
            if column.required and column.name not in defaults:
                faults.append(Fault(file, line, place.heading, None, "missing cell"))
            continue
        value = _text_value(cell, column) if column.is_text else _number_value(cell, place)
        if value is None:
            faults.append(Fault(file, line, place.heading, cell, _allowed(cell, column)))
        else:
            values[column.name] = value
    return values


def _text_value(cell: str, column: Column) -> str | None:
    return cell if not column.choices or cell in column.choices else None


def _number_value(cell: str, place: _Place) -> float | None:
    match = _CELL.fullmatch(cell)
    if match is None:
        return None
    mantissa, power = match.groups()
    value = float(f"{mantissa}e{int(power or 0) + place.exponent}")
    if not math.isfinite(value):
        return None
    sign = place.column.sign
    holds = sign is Sign.ANY or value > 0 or (sign is Sign.NOT_NEGATIVE and value == 0)
    return value if holds else None


def _allowed(cell: str, column: Column) -> str:
    if column.choices:
        return "one of " + ", ".join(column.choices)
    if "," in cell:
        return f"{column.sign.value} with a decimal point"
    return f"{column.sign.value} in the unit of the header"
