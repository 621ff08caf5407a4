"""Plain text for the terminal and JSON for scripts."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields, is_dataclass
from enum import Enum
from pathlib import Path
from typing import Any

_PLAIN = str.maketrans(
    {
        "\u00b5": "u",
        "\u03bc": "u",
        "\u03a9": "ohm",
        "\u2126": "ohm",
        "\u00b0": "deg",
        "\u00b2": "2",
        "\u00b3": "3",
    }
    | {
        "\u00b1": "+-",
        "\u00d7": "x",
        "\u2013": "-",
        "\u2014": "-",
        "\u2212": "-",
        "\u2500": "-",
        "\u2026": "...",
    }
    | {"\u2264": "<=", "\u2265": ">=", "\u2192": "->", "\u00b7": " ", "\u03b7": "eta", "\u0394": "d"}
)
"""Micro, ohm, degree, powers, signs and dashes, spelt out."""


_SPELT = re.compile(r"(?<=[0-9] )(?:degC|[munkMG]?ohm|u[FHAVWJCsm])\b")


@dataclass(frozen=True, kw_only=True)
class Column:
    """A column of a text table.

    Attributes
    ----------
    heading : str
        First line.
    right : bool
        Aligned to the right, as numbers are.
    """

    heading: str
    right: bool = False


def text_table(columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> str:
    """Rows in aligned columns under their headings.

    Parameters
    ----------
    columns : sequence of Column
        Headings and alignment.
    rows : sequence of sequence of str
        Cells; each row as long as `columns`.

    Returns
    -------
    str
        Lines without trailing blanks; the heading is set off by a rule.

    Raises
    ------
    ValueError
        A row has another length than `columns`.

    Examples
    --------
    >>> print(text_table([Column(heading="part"), Column(heading="loss", right=True)], [["choke", "0.51 W"]]))
    part     loss
    -----  ------
    choke  0.51 W
    """
    widths = [len(column.heading) for column in columns]
    for row in rows:
        if len(row) != len(columns):
            raise ValueError(f"{len(row)} cells for {len(columns)} columns")
        widths = [max(width, len(cell)) for width, cell in zip(widths, row, strict=True)]
    lines = [
        _line([column.heading for column in columns], columns, widths),
        "  ".join("-" * width for width in widths),
        *(_line(row, columns, widths) for row in rows),
    ]
    return "\n".join(lines)


def text_pairs(pairs: Sequence[tuple[str, str]], indent: int = 0) -> str:
    """Names and values in two aligned columns.

    Parameters
    ----------
    pairs : sequence of tuple of str
        Name and value; a value of several lines is indented as a block.
    indent : int
        Blanks before each line.

    Returns
    -------
    str
        Lines without trailing blanks.
    """
    width = max((len(name) for name, _ in pairs), default=0)
    lines = []
    for name, value in pairs:
        first, *others = value.split("\n")
        lines.append(f"{name.ljust(width)}  {first}")
        lines += [" " * (width + 2) + other for other in others]
    return "\n".join((" " * indent + line).rstrip() for line in lines)


def _line(cells: Sequence[str], columns: Sequence[Column], widths: Sequence[int]) -> str:
    aligned = (
        cell.rjust(width) if column.right else cell.ljust(width)
        for cell, column, width in zip(cells, columns, widths, strict=True)
    )
    return "  ".join(aligned).rstrip()


def plain_text(text: str) -> str:
    """The text with every sign outside ASCII spelt out or replaced by a question mark.

    Parameters
    ----------
    text : str
        Any text.

    Returns
    -------
    str
        ASCII.

    Examples
    --------
    >>> plain_text("470 µF ± 20 %, 25 °C")
    '470 uF +- 20 %, 25 degC'
    """
    return text.translate(_PLAIN).encode("ascii", errors="replace").decode("ascii")


def signs(text: str) -> str:
    """The text with the signs of units behind numbers instead of their spelling, the reverse of `plain_text`.

    Parameters
    ----------
    text : str
        Any text.

    Returns
    -------
    str
        With micro, ohm and degree signs.

    Examples
    --------
    >>> signs("470 uF at 85 degC, 2.2 kohm, ohm as a word")
    '470 µF at 85 °C, 2.2 kΩ, ohm as a word'
    """
    return _SPELT.sub(lambda found: _sign(found.group()), text)


def _sign(unit: str) -> str:
    signed = unit.replace("degC", "°C").replace("ohm", "Ω")
    return f"µ{signed[1:]}" if signed.startswith("u") else signed


def to_json(value: Any) -> str:
    """One JSON object.

    Parameters
    ----------
    value : object
        Mappings, sequences, dataclasses, enumerations, paths, NumPy numbers and arrays, texts and numbers.

    Returns
    -------
    str
        Indented text, keys in the order given; NaN and infinite numbers are null.

    Raises
    ------
    TypeError
        For a value that has no JSON form.

    Examples
    --------
    >>> print(to_json({"ripple_v": 0.08, "period_cycles": float("nan")}))
    {
      "ripple_v": 0.08,
      "period_cycles": null
    }
    """
    return json.dumps(json_value(value), indent=2, allow_nan=False, ensure_ascii=True)


def json_value(value: Any) -> Any:
    """The value in terms of dict, list, str, int, float, bool and None; see `to_json`.

    Parameters
    ----------
    value : object
        See `to_json`.

    Returns
    -------
    object
        Its form in JSON.
    """
    match value:
        case None | bool() | str():
            return str(value.value) if isinstance(value, Enum) else value
        case Enum():
            return json_value(value.value)
        case int():
            return int(value)
        case float():
            return float(value) if math.isfinite(value) else None
        case Mapping():
            return {str(key): json_value(one) for key, one in value.items()}
        case Path():
            return str(value)
        case list() | tuple() | set() | frozenset():
            return [json_value(one) for one in value]
    if is_dataclass(value) and not isinstance(value, type):
        return {member.name: json_value(getattr(value, member.name)) for member in fields(value)}
    if hasattr(value, "tolist"):
        return json_value(value.tolist())
    raise TypeError(f"no JSON form for a {type(value).__name__}")
