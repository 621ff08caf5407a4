"""Bench readings of inductance under bias, from a CSV file with units in its header."""

from __future__ import annotations

import csv
import io
import re
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

from buckdesign.errors import Fault, FaultsError, FileAccessError, QuantityError, TableError
from buckdesign.units import parse_quantity

_UNITS = {"current": "A", "inductance": "H"}
_ALLOWED = "columns current and inductance with their units, such as current_a,inductance_uh"
_HEADER = re.compile(r"(current|inductance)(?:_([a-z]+)| *\[([^\]]+)\])")
_SUFFIXES = {"a": "A", "ma": "mA", "h": "H", "mh": "mH", "uh": "uH", "nh": "nH"}


@dataclass(frozen=True, kw_only=True)
class BiasPoint:
    """One reading.

    Attributes
    ----------
    current : float
        Direct current through the winding [A]; 0 without bias.
    inductance : float
        Incremental inductance [H].
    """

    current: float
    inductance: float


def read_bias_points(path: Path) -> tuple[BiasPoint, ...]:
    """Read readings.

    Parameters
    ----------
    path : Path
        CSV with a column for the current and one for the inductance, units in the header
        (``current_a,inductance_uh`` or ``current [A],inductance [uH]``); lines that begin with ``#`` are
        remarks.

    Returns
    -------
    tuple of BiasPoint
        In the order of the file.

    Raises
    ------
    FileAccessError
        The file can't be read.
    TableError, FaultsError
        Header or cells are wrong.
    """
    try:
        text = Path(path).read_text(encoding="utf-8-sig")
    except UnicodeDecodeError:
        raise TableError(path, None, None, None, "no UTF-8 text; a CSV table is wanted") from None
    except OSError as error:
        raise FileAccessError(path, error.strerror or str(error)) from None
    rows = _rows(text)
    if not rows:
        raise TableError(path, None, None, None, f"is empty; {_ALLOWED}")
    line, header = rows[0]
    columns = _columns(path, line, header)
    faults: list[Fault] = []
    points = [_point(path, line, cells, columns, faults) for line, cells in rows[1:]]
    if not faults and not any(point is not None and point.current > 0.0 for point in points):
        faults.append(Fault(path, None, "", None, "at least one reading under bias is wanted"))
    if faults:
        raise FaultsError(faults)
    return tuple(point for point in points if point is not None)


def _rows(text: str) -> list[tuple[int, list[str]]]:
    """Rows with their line numbers, without remarks and empty lines."""
    reader = csv.reader(io.StringIO(text))
    found = []
    for cells in reader:
        if any(cell.strip() for cell in cells) and not cells[0].lstrip().startswith("#"):
            found.append((reader.line_num, [cell.strip() for cell in cells]))
    return found


def _columns(path: Path, line: int, header: Sequence[str]) -> dict[str, tuple[int, str]]:
    """Position and unit of each quantity."""
    found: dict[str, tuple[int, str]] = {}
    for index, cell in enumerate(header):
        match = _HEADER.fullmatch(cell.casefold().replace("\u00b5", "u").replace("\u03bc", "u"))
        if match is None:
            continue
        name = match.group(1)
        label = _SUFFIXES.get((match.group(2) or match.group(3) or "").casefold())
        if label is None or not label.endswith(_UNITS[name]) or name in found:
            raise TableError(path, line, cell, None, _ALLOWED)
        found[name] = index, label
    for name in _UNITS:
        if name not in found:
            raise TableError(path, line, name, None, f"is missing; {_ALLOWED}")
    return found


def _point(
    path: Path,
    line: int,
    cells: Sequence[str],
    columns: dict[str, tuple[int, str]],
    faults: list[Fault],
) -> BiasPoint | None:
    values = {}
    for name, (index, label) in columns.items():
        cell = cells[index] if index < len(cells) else ""
        try:
            values[name] = parse_quantity(f"{cell} {label}", _UNITS[name])
        except QuantityError:
            faults.append(Fault(path, line, name, cell, f"a number in {label} is wanted"))
            continue
        if values[name] < 0.0 or (name == "inductance" and values[name] == 0.0):
            least = "above 0" if name == "inductance" else "of at least 0"
            faults.append(Fault(path, line, name, cell, f"a number {least} is wanted"))
    if len(values) < len(columns):
        return None
    return BiasPoint(**values)
