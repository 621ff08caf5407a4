"""Names in a study file: keys that can be varied, columns that can be compared, and what is wrong with others."""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from buckdesign.design.keys import CountKey, FlagKey, Key, PartKey, QuantityKey
from buckdesign.design.schema import Reading
from buckdesign.design.toml_source import KeyPath
from buckdesign.errors import nearest_names, quoted
from buckdesign.loop.results import REGIMES
from buckdesign.studies.result_columns import TEXT_COLUMNS, TRUTH_COLUMNS

SHARES = ("efficiency", "duty", "active_fraction")
"""Columns that lie between 0 and 1, by the last part of their name."""

_SUFFIX = re.compile(r"_([a-z]_per_[a-z]|[a-z0-9]+)$")

_SUFFIX_UNITS: dict[str, tuple[str, int]] = {
    "v": ("V", 0), "a": ("A", 0), "w": ("W", 0), "hz": ("Hz", 0), "ohm": ("ohm", 0), "c": ("degC", 0),
    "h": ("h", 0), "s": ("s", 0), "j": ("J", 0), "k": ("K", 0), "t": ("T", 0), "f": ("F", 0), "m": ("m", 0),
    "mm": ("m", 3), "cm3": ("m3", 6), "k_per_w": ("K/W", 0), "a_per_m": ("A/m", 0),
}  # fmt: skip
"""Unit of `buckdesign.units` and power of ten of the column against it, by the end of the column's name."""

_INDUCTANCE = re.compile(r"inductance(_biased)?_h$")
"""Columns in henry, where others with the same end are in hours."""

_PART_COLUMNS = {
    "values.regulator": "regulator",
    "values.transistor": "transistor",
    "values.rectifier": "rectifier",
    "values.core": "ring",
    "values.material": "material",
    "values.wire": "wire",
    "values.output_capacitor": "capacitor",
    "values.input_capacitor": "capacitor",
}
"""Columns that name a chosen part, and its kind."""


@dataclass(frozen=True, kw_only=True)
class Column:
    """A column of the table of a study.

    Attributes
    ----------
    name : str
        Varied key or key of a simulation, with dots.
    unit : str or None
        Unit of its numbers as `buckdesign.units` names it, ``%`` for those without; None: no numbers.
    power : int
        The column holds SI values times this power of ten.
    key : Key or None
        What a varied key may hold.
    words : tuple of str
        Words that a column of words may hold.
    """

    name: str
    unit: str | None
    power: int = 0
    key: Key | None = None
    words: tuple[str, ...] = ()

    @property
    def is_share(self) -> bool:
        """Whether its numbers lie between 0 and 1."""
        return self.key is None and self.name.split(".")[-1] in SHARES

    @property
    def is_comparable(self) -> bool:
        """Whether it holds one number, word or truth value in each row."""
        return self.unit is not None or bool(self.words) or isinstance(self.key, PartKey | FlagKey)


def study_columns(varied: Mapping[str, Key], results: Sequence[str]) -> dict[str, Column]:
    """The columns that a study can name: its varied keys, then its results.

    Parameters
    ----------
    varied : Mapping
        Varied keys by dotted name.
    results : sequence of str
        Columns of results, with their unit at the end of the name.

    Returns
    -------
    dict
        `Column` by name.
    """
    columns = {name: _result_column(name) for name in results}
    return {name: _varied_column(name, key) for name, key in varied.items()} | columns


def _varied_column(name: str, key: Key) -> Column:
    if isinstance(key, QuantityKey):
        return Column(name=name, unit=key.unit, key=key)
    return Column(name=name, unit="1" if isinstance(key, CountKey) else None, key=key)


def _result_column(name: str) -> Column:
    if name in TEXT_COLUMNS:
        return Column(name=name, unit=None, words=REGIMES)
    if name in TRUTH_COLUMNS:
        return Column(name=name, unit=None, key=FlagKey())
    if name in _PART_COLUMNS:
        return Column(name=name, unit=None, key=PartKey(kind=_PART_COLUMNS[name]))
    if _INDUCTANCE.search(name):
        return Column(name=name, unit="H")
    for part in name.split("."):
        suffix = _SUFFIX.search(part)
        if suffix and suffix[1] in _SUFFIX_UNITS:
            unit, power = _SUFFIX_UNITS[suffix[1]]
            return Column(name=name, unit=unit, power=power)
    return Column(name=name, unit="%")


def unknown_column(name: str, columns: Iterable[str]) -> str:
    """What is wrong with the name of a column that is none, and which ones are near.

    Parameters
    ----------
    name : str
        The name.
    columns : iterable of str
        Known names.

    Returns
    -------
    str
        One line.
    """
    return f"neither a varied key nor a result, nearest: {_nearest(name, columns)}"


def unknown_key(name: str, value: Any, keys: Mapping[str, Key], kind: str) -> str:
    """What is wrong with a varied key that is none, and which ones are near.

    Parameters
    ----------
    name : str
        The key under ``[vary]``.
    value : object
        What stands there.
    keys : Mapping
        Keys that can be varied.
    kind : str
        The file that has them, such as ``design file``.

    Returns
    -------
    str
        One line.
    """
    unquoted = next((inner for inner in _inner_names(name, value) if inner in keys), None)
    if unquoted is not None:
        return f"a key with a dot goes in quotes: {quoted(unquoted)} = ..."
    inside = [key for key in keys if key.startswith(f"{name}.")]
    if inside:
        some = ", ".join(quoted(key) for key in inside[:3])
        return f"a table of a {kind}, not a key; vary its keys: {some}{', ...' if inside[3:] else ''}"
    return f"unknown key of a {kind}, nearest: {_nearest(name, keys)}"


def fault_unknown(raw: Mapping[str, Any], at: KeyPath, known: Sequence[str], reading: Reading) -> None:
    """Note a fault for each key of a table that is not known.

    Parameters
    ----------
    raw : Mapping
        The table.
    at : tuple
        Where it stands.
    known : sequence of str
        Its keys.
    reading : Reading
        Collects the faults.
    """
    for name, value in raw.items():
        if name not in known:
            is_table = isinstance(value, Mapping)
            kind = "table" if is_table else "key"
            allowed = f"unknown {kind}, nearest: {_nearest(name, known)}"
            reading.fault((*at, name), None if is_table else value, allowed)


def _inner_names(name: str, value: Any) -> Iterator[str]:
    """Dotted names of all that stands in a table."""
    if isinstance(value, Mapping):
        for inner, one in value.items():
            yield f"{name}.{inner}"
            yield from _inner_names(f"{name}.{inner}", one)


def _nearest(name: str, known: Iterable[str]) -> str:
    return ", ".join(quoted(other) for other in nearest_names(name, known))
