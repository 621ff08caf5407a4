"""What a key of an input file may hold: one class per kind of key.

Each says in words what is wanted, reads what stands in a file and writes a value so that it reads the same.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Any, ClassVar, Protocol

from buckdesign.errors import QuantityError, UnknownNameError, quoted
from buckdesign.units import format_quantity, parse_quantity

if TYPE_CHECKING:
    from buckdesign.parts import Tables

ABSOLUTE_ZERO_C = -273.15
"""Absolute zero [degC] (SI brochure, 9th edition, section 2.3.1)."""


class Refused(Exception):
    """A value that its key does not allow; the text says what is allowed."""


class Key(Protocol):
    """A kind of key."""

    @property
    def wanted(self) -> str:
        """What is allowed, in words."""

    def read(self, raw: Any, tables: Tables | None) -> Any:
        """The value of what stands in the file; `Refused` where it is not allowed.

        Without `tables` part names are taken as they are.
        """

    def write(self, value: Any) -> Any:
        """What to put in a file for a value; `read` gives the same value again."""


@dataclass(frozen=True, kw_only=True)
class QuantityKey:
    """A quantity with a unit, within bounds."""

    unit: str
    minimum: float = 0.0
    above: bool = True
    below: float = math.inf

    @property
    def wanted(self) -> str:
        return f"{_wanted_quantity(self.unit)}, {self.bounds}"

    @property
    def bounds(self) -> str:
        """The bounds in words."""
        if self.minimum == -math.inf:
            return "any finite value"
        low = f"above {self._shown(self.minimum)}" if self.above else f"{self._shown(self.minimum)} or more"
        return low if math.isinf(self.below) else f"{low} and below {self._shown(self.below)}"

    def read(self, raw: Any, tables: Tables | None) -> float:
        if isinstance(raw, list | dict):
            raise Refused(f"one value, not a {_kind(raw)}; {self.wanted}")
        try:
            value = parse_quantity(raw, self.unit)
        except QuantityError as error:
            raise Refused(error.allowed) from None
        too_low = value <= self.minimum if self.above else value < self.minimum
        if too_low or value >= self.below:
            raise Refused(f"must be {self.bounds}")
        return value

    def write(self, value: float) -> str | float | int:
        if self.unit == "1":
            return int(value) if float(value).is_integer() and abs(value) < 1e15 else float(value)
        for digits in range(3, 17):
            text = _bench_text(value, self.unit, digits)
            if parse_quantity(text, self.unit) == value:
                return text
        return float(value)

    def _shown(self, value: float) -> str:
        return format_quantity(value, self.unit, digits=6, ascii_only=True) if value else "0"


@dataclass(frozen=True, kw_only=True)
class SpreadKey:
    """One quantity or a list of them: ``"24 V"`` or ``["21 V", "24 V", "29 V"]``.

    The value is always a tuple of `size` floats; one value alone stands for all of them, or, with
    `alone_is_last`, for the last one while the others are 0.
    """

    each: QuantityKey
    names: tuple[str, ...]
    alone: bool = True
    alone_is_last: bool = False
    example: str

    @property
    def wanted(self) -> str:
        listed = f"a list of {len(self.names)} ({', '.join(self.names)}), such as {self.example}"
        return f"one value or {listed}" if self.alone else listed

    def read(self, raw: Any, tables: Tables | None) -> tuple[float, ...]:
        if not isinstance(raw, list):
            if not self.alone or isinstance(raw, dict):
                raise Refused(
                    f"not a single value; {self.wanted}" if not isinstance(raw, dict) else self.wanted
                )
            value = self.each.read(raw, tables)
            if self.alone_is_last:
                return (0.0,) * (len(self.names) - 1) + (value,)
            return (value,) * len(self.names)
        if len(raw) != len(self.names):
            raise Refused(f"{len(raw)} values; {self.wanted}")
        values = tuple(self._element(name, one, tables) for name, one in zip(self.names, raw, strict=True))
        if any(low > high for low, high in pairwise(values)):
            raise Refused(f"wrong order; {self.wanted}")
        return values

    def write(self, value: Sequence[float]) -> Any:
        return [self.each.write(one) for one in value]

    def _element(self, name: str, raw: Any, tables: Tables | None) -> float:
        try:
            return self.each.read(raw, tables)
        except Refused as refused:
            raise Refused(f"{name} value {quoted(raw)}: {refused}") from None


@dataclass(frozen=True, kw_only=True)
class PairKey:
    """Two quantities of different units in a list."""

    first: QuantityKey
    second: QuantityKey
    example: str

    @property
    def wanted(self) -> str:
        return f"a list of two quantities, such as {self.example}"

    def read(self, raw: Any, tables: Tables | None) -> tuple[float, float]:
        if not isinstance(raw, list) or len(raw) != 2:
            raise Refused(self.wanted)
        return self.first.read(raw[0], tables), self.second.read(raw[1], tables)

    def write(self, value: tuple[float, float]) -> Any:
        return [self.first.write(value[0]), self.second.write(value[1])]


@dataclass(frozen=True, kw_only=True)
class CountKey:
    """A whole number, 1 or more."""

    most: int = 100_000
    wanted: ClassVar[str] = "a whole number, 1 or more"

    def read(self, raw: Any, tables: Tables | None) -> int:
        if isinstance(raw, list | dict):
            raise Refused(f"one value, not a {_kind(raw)}; {self.wanted}")
        try:
            value = parse_quantity(raw, "1")
        except QuantityError:
            raise Refused(self.wanted) from None
        if value < 1 or value != int(value):
            raise Refused(self.wanted)
        if value > self.most:
            raise Refused(f"{self.wanted}, at most {self.most}")
        return int(value)

    def write(self, value: int) -> int:
        return value


@dataclass(frozen=True, kw_only=True)
class FlagKey:
    """true or false."""

    wanted: ClassVar[str] = "true or false, without quotes"

    def read(self, raw: Any, tables: Tables | None) -> bool:
        if not isinstance(raw, bool):
            raise Refused(self.wanted)
        return raw

    def write(self, value: bool) -> bool:
        return value


@dataclass(frozen=True, kw_only=True)
class PartKey:
    """The name of a part in the tables; `kind` is the table."""

    kind: str

    @property
    def wanted(self) -> str:
        return f"the name of a {self.kind} in quotes (buckdesign parts list {self.kind})"

    def read(self, raw: Any, tables: Tables | None) -> str:
        if not isinstance(raw, str) or not raw.strip():
            raise Refused(self.wanted)
        if tables is None:
            return raw
        try:
            getattr(tables, self.kind)(raw)
        except UnknownNameError as error:
            raise Refused(error.allowed) from None
        return raw

    def write(self, value: str) -> str:
        return value


@dataclass(frozen=True, kw_only=True)
class PartListKey:
    """One part name or a list of them; the value is a tuple."""

    kind: str

    @property
    def wanted(self) -> str:
        return f"the name of a {self.kind} in quotes, or a list of names (buckdesign parts list {self.kind})"

    def read(self, raw: Any, tables: Tables | None) -> tuple[str, ...]:
        names = raw if isinstance(raw, list) else [raw]
        if not names:
            raise Refused(f"empty list; {self.wanted}")
        refusals, found = [], []
        for name in names:
            try:
                found.append(PartKey(kind=self.kind).read(name, tables))
            except Refused as refused:
                refusals.append(f"{quoted(name)}: {refused}" if isinstance(raw, list) else str(refused))
        if refusals:
            raise Refused("; ".join(refusals))
        return tuple(found)

    def write(self, value: Sequence[str]) -> Any:
        return value[0] if len(value) == 1 else list(value)


@dataclass(frozen=True, kw_only=True)
class ChoicesKey:
    """A list of some of the given words."""

    words: tuple[str, ...]

    @property
    def wanted(self) -> str:
        return "a list of some of " + ", ".join(quoted(word) for word in self.words)

    def read(self, raw: Any, tables: Tables | None) -> tuple[str, ...]:
        if not isinstance(raw, list):
            raise Refused(self.wanted)
        for word in raw:
            if word not in self.words:
                raise Refused(f"{quoted(word)} is unknown; {self.wanted}")
        if len(set(raw)) != len(raw):
            raise Refused(f"a name stands twice; {self.wanted}")
        return tuple(raw)

    def write(self, value: Sequence[str]) -> Any:
        return list(value)


def _bench_text(value: float, unit: str, digits: int) -> str:
    """A quantity as the bench writes it: capacitors never in mF."""
    if unit == "F" and value >= 1e-3:
        return f"{value * 1e6:.{digits + 3}g} uF"
    return format_quantity(value, unit, digits=digits, ascii_only=True)


def _wanted_quantity(unit: str) -> str:
    try:
        parse_quantity("", unit)
    except QuantityError as error:
        return error.allowed.removeprefix("empty; ")
    raise AssertionError("an empty text is no quantity")


def _kind(raw: Any) -> str:
    return "list" if isinstance(raw, list) else "table"
