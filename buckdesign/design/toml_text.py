"""A tree as TOML text."""

from __future__ import annotations

import datetime
from collections.abc import Mapping
from typing import Any

from buckdesign.design.toml_source import KeyPath

_ESCAPES = {"\\": "\\\\", '"': '\\"', "\n": "\\n", "\t": "\\t", "\r": "\\r", "\b": "\\b", "\f": "\\f"}


class InlineTable(dict[str, Any]):
    """A table to write as ``{ key = value }`` in its line."""


def toml_text(tree: Mapping[str, Any]) -> str:
    """TOML text for a tree of tables.

    Parameters
    ----------
    tree : Mapping
        Nested mappings, lists, texts, numbers, truth values and dates.

    Returns
    -------
    str
        Text that parses to the same tree; tables stand in the order of `tree`, plain keys first. A table
        whose name or key is no plain word is quoted; a table in a list is written inline.

    Raises
    ------
    TypeError
        For a value that TOML has no way to write.
    """
    blocks: list[str] = []
    _add_table(tree, (), blocks)
    return "\n".join(blocks)


def _add_table(table: Mapping[str, Any], at: KeyPath, blocks: list[str]) -> None:
    tables = {
        key: value
        for key, value in table.items()
        if isinstance(value, Mapping) and not isinstance(value, InlineTable)
    }
    plain = {key: value for key, value in table.items() if key not in tables}
    lines = [f"{key_text(key)} = {value_text(value)}" for key, value in plain.items()]
    if at and (lines or not tables):
        lines.insert(0, "[" + ".".join(key_text(str(step)) for step in at) + "]")
    if lines:
        blocks.append("\n".join(lines) + "\n")
    for key, value in tables.items():
        _add_table(value, (*at, key), blocks)


def key_text(key: str) -> str:
    """A key, in quotes where TOML wants them.

    Parameters
    ----------
    key : str
        One step of a key.

    Returns
    -------
    str
        TOML.
    """
    bare = bool(key) and all(char.isascii() and (char.isalnum() or char in "_-") for char in key)
    return key if bare else value_text(key)


def value_text(value: Any) -> str:
    """One value; a mapping becomes an inline table.

    Parameters
    ----------
    value : object
        Text, number, truth value, date, list or mapping.

    Returns
    -------
    str
        TOML.
    """
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, str):
        return '"' + "".join(_escaped(char) for char in value) + '"'
    if isinstance(value, int | float):
        return repr(value)
    if isinstance(value, list | tuple):
        return "[" + ", ".join(value_text(one) for one in value) + "]"
    if isinstance(value, Mapping):
        pairs = (f"{key_text(key)} = {value_text(one)}" for key, one in value.items())
        return "{ " + ", ".join(pairs) + " }" if value else "{}"
    if isinstance(value, datetime.date | datetime.time):
        return value.isoformat()
    raise TypeError(f"TOML has no way to write a {type(value).__name__}")


def _escaped(char: str) -> str:
    if char in _ESCAPES:
        return _ESCAPES[char]
    return f"\\u{ord(char):04x}" if ord(char) < 32 or ord(char) == 127 else char
