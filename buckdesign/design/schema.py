"""One reader and one writer for all sections of the input files.

A section of a file is a frozen dataclass whose fields carry a `Key` in their metadata (made by `quantity`,
`count` and the other functions at the end). `read_section` reads a table into such a class and notes every
fault instead of stopping at the first; `section_tree` is the way back.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import MISSING, Field, dataclass, field, fields
from pathlib import Path
from typing import TYPE_CHECKING, Any, ClassVar, Protocol, TypeVar

from buckdesign.design.keys import (
    ABSOLUTE_ZERO_C,
    CountKey,
    FlagKey,
    Key,
    PartKey,
    PartListKey,
    QuantityKey,
    Refused,
)
from buckdesign.design.toml_source import KeyPath, Locate
from buckdesign.design.toml_text import value_text
from buckdesign.errors import Fault, FaultsError, nearest_names, quoted

if TYPE_CHECKING:
    from buckdesign.parts import Tables


class SectionClass(Protocol):
    """A dataclass, as the type checker sees it."""

    __dataclass_fields__: ClassVar[dict[str, Any]]


S = TypeVar("S", bound=SectionClass)


@dataclass(frozen=True, kw_only=True)
class SectionKey:
    """A table inside the table."""

    section: type[Any]
    wanted: ClassVar[str] = "a table"

    def read(self, raw: Any, tables: Tables | None) -> Any:
        raise AssertionError("sections are read by read_section")

    def write(self, value: Any) -> Any:
        return section_tree(value, {}, ())


@dataclass(frozen=True)
class _TomlValue:
    """A list or truth value that a fault shows as the file writes it."""

    text: str

    def __str__(self) -> str:
        return self.text if len(self.text) <= 60 else self.text[:57] + "..."


@dataclass(kw_only=True)
class Reading:
    """The state of reading one file: where it is, what is known, what was found wrong.

    Attributes
    ----------
    path : pathlib.Path
        The file, for the faults.
    locate : Callable
        Line of a key path.
    tables : Tables
        The parts that can be named.
    prefix : tuple
        Where in the file the tree that is read stands, such as ``("requirement",)``.
    faults : list of Fault
        All found so far.
    given : dict
        What stands in the file for each dotted key.
    """

    path: Path
    locate: Locate
    tables: Tables
    prefix: KeyPath = ()
    faults: list[Fault] = field(default_factory=list)
    given: dict[str, Any] = field(default_factory=dict)

    def fault(self, key: KeyPath, value: Any, allowed: str) -> None:
        """Note a fault at a key; `value` None where it is missing."""
        where = (*self.prefix, *key)
        line = self.locate(*where)
        if isinstance(value, bool | list):
            value = _TomlValue(value_text(value))
        self.faults.append(Fault(file=self.path, line=line, key=dotted(where), value=value, allowed=allowed))

    def finish(self) -> None:
        """Raise all faults, in the order of the file.

        Raises
        ------
        FaultsError
            If there is any.
        """
        if self.faults:
            raise FaultsError(sorted(self.faults, key=lambda fault: fault.line or 0))


def read_section(section: type[S], raw: Any, at: KeyPath, reading: Reading) -> S | None:
    """Read a table into a dataclass.

    Parameters
    ----------
    section : type
        Dataclass whose fields carry keys.
    raw : object
        What stands in the file.
    at : tuple
        Key path of the table.
    reading : Reading
        Collects faults and what was given.

    Returns
    -------
    object or None
        The section; None where a fault was noted.
    """
    if not isinstance(raw, Mapping):
        reading.fault(at, raw, f"a table is wanted: [{dotted((*reading.prefix, *at))}]")
        return None
    known = {member.name: member for member in fields(section) if "key" in member.metadata}
    before = len(reading.faults)
    values: dict[str, Any] = {}
    for name, value in raw.items():
        if name in known:
            _read_member(known[name], value, (*at, name), reading, values)
        else:
            _unknown_key(name, value, at, list(known), reading)
    for name, member in known.items():
        if name not in raw and member.default is MISSING and member.default_factory is MISSING:
            reading.fault((*at, name), None, f"missing; {member.metadata['key'].wanted}")
    return None if len(reading.faults) > before else section(**values)


def _read_member(member: Field[Any], raw: Any, at: KeyPath, reading: Reading, values: dict[str, Any]) -> None:
    key = member.metadata["key"]
    if isinstance(key, SectionKey):
        values[member.name] = read_section(key.section, raw, at, reading)
        return
    try:
        values[member.name] = key.read(raw, reading.tables)
        reading.given[dotted(at)] = raw
    except Refused as refused:
        reading.fault(at, raw, str(refused))


def _unknown_key(name: str, value: Any, at: KeyPath, known: Sequence[str], reading: Reading) -> None:
    kind = "table" if isinstance(value, Mapping) else "key"
    near = ", ".join(quoted(other) for other in nearest_names(name, known))
    reading.fault((*at, name), None if kind == "table" else value, f"unknown {kind}, nearest: {near}")


def section_tree(section: Any, given: Mapping[str, Any], at: KeyPath) -> dict[str, Any]:
    """A section as a tree for a file: what was given where it still says the value, else written anew.

    Parameters
    ----------
    section : object
        Dataclass whose fields carry keys.
    given : Mapping
        What stood in the file, by dotted key.
    at : tuple
        Key path of the section.

    Returns
    -------
    dict
        Without the keys that were absent or have their default.
    """
    tree: dict[str, Any] = {}
    for member in fields(section):
        key = member.metadata.get("key")
        value = getattr(section, member.name)
        path = (*at, member.name)
        raw = given.get(dotted(path))
        if key is None or value is None:
            continue
        if isinstance(key, SectionKey):
            tree[member.name] = section_tree(value, given, path)
        elif raw is not None and _still_says(key, raw, value):
            tree[member.name] = raw
        elif value != member.default and value != math.inf:
            tree[member.name] = key.write(value)
    return tree


def _still_says(key: Any, raw: Any, value: Any) -> bool:
    try:
        return bool(key.read(raw, None) == value)
    except Refused:
        return False


def dotted(path: KeyPath) -> str:
    """A key path as text: ``choke.turns``; names that hold a dot are quoted.

    Parameters
    ----------
    path : tuple
        Steps of the path; a whole number is a place in a list.

    Returns
    -------
    str
        The text.
    """
    text = ""
    for step in path:
        if isinstance(step, int):
            text += f"[{step}]"
        else:
            name = step if step and all(char.isalnum() or char in "_-" for char in step) else quoted(step)
            text += f".{name}" if text else name
    return text


def _member(key: Key, default: Any) -> Any:
    if default is MISSING:
        return field(metadata={"key": key})
    return field(default=default, metadata={"key": key})


def quantity(
    unit: str, *, default: Any = None, minimum: float = 0.0, above: bool = True, below: float = math.inf
) -> Any:
    """A field that holds a quantity; `default` `REQUIRED` where it must be given.

    Parameters
    ----------
    unit : str
        Expected unit, see `buckdesign.units`.
    default : object
        Value where the key is absent; `REQUIRED` where it must be given.
    minimum : float
        Lower bound [`unit`].
    above : bool
        Whether the value must be above the lower bound rather than at it.
    below : float
        Upper bound, itself not allowed [`unit`].

    Returns
    -------
    object
        What `dataclasses.field` gives.
    """
    return _member(QuantityKey(unit=unit, minimum=minimum, above=above, below=below), default)


def temperature(*, default: Any = None) -> Any:
    """A field that holds a temperature [degC].

    Parameters
    ----------
    default : object
        Value where the key is absent; `REQUIRED` where it must be given.

    Returns
    -------
    object
        What `dataclasses.field` gives.
    """
    return quantity("degC", default=default, minimum=ABSOLUTE_ZERO_C)


def count(*, default: Any = None) -> Any:
    """A field that holds a whole number, 1 or more.

    Parameters
    ----------
    default : object
        Value where the key is absent; `REQUIRED` where it must be given.

    Returns
    -------
    object
        What `dataclasses.field` gives.
    """
    return _member(CountKey(), default)


def part(kind: str, *, default: Any = None) -> Any:
    """A field that holds the name of a part.

    Parameters
    ----------
    kind : str
        Kind of part, as `Tables` names it.
    default : object
        Value where the key is absent; `REQUIRED` where it must be given.

    Returns
    -------
    object
        What `dataclasses.field` gives.
    """
    return _member(PartKey(kind=kind), default)


def parts(kind: str) -> Any:
    """A field that holds one part name or several.

    Parameters
    ----------
    kind : str
        Kind of part, as `Tables` names it.

    Returns
    -------
    object
        What `dataclasses.field` gives.
    """
    return _member(PartListKey(kind=kind), ())


def flag(*, default: bool = False) -> Any:
    """A field that holds true or false.

    Parameters
    ----------
    default : bool
        Value where the key is absent.

    Returns
    -------
    object
        What `dataclasses.field` gives.
    """
    return _member(FlagKey(), default)


def listed(key: Key, *, default: Any = None) -> Any:
    """A field that holds a list as `key` describes it.

    Parameters
    ----------
    key : Key
        What the list may hold.
    default : object
        Value where the key is absent; `REQUIRED` where it must be given.

    Returns
    -------
    object
        What `dataclasses.field` gives.
    """
    return _member(key, default)


def table(section: type[Any]) -> dict[str, Any]:
    """Metadata of a field that holds a table of its own.

    Parameters
    ----------
    section : type
        Dataclass of the table.

    Returns
    -------
    dict
        For ``field(metadata=...)``.
    """
    return {"key": SectionKey(section=section)}


REQUIRED: Any = MISSING
"""Default of a field that must be given."""
