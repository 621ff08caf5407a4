"""Constraints of a study: ``column comparison value`` as text, and whether they hold."""

from __future__ import annotations

import operator
import re
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from enum import Enum
from fractions import Fraction
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.keys import FlagKey, PartKey, Refused
from buckdesign.errors import QuantityError, nearest_names, quoted
from buckdesign.parts.names import name_key
from buckdesign.studies.study_keys import Column, unknown_column
from buckdesign.units import parse_quantity

if TYPE_CHECKING:
    from buckdesign.parts import Tables

WANTED = (
    "a column, one of < <= > >= == !=, and a value are wanted, "
    'such as "choke_c < 100", "ripple_v < 120 mV" or "regime == continuous"'
)

_SIGN = re.compile(r"<=|>=|==|!=|=<|=>|<>|[<>=≤≥≠]")
_REMEDY = {"=": "==", "=<": "<=", "=>": ">=", "<>": "!=", "≤": "<=", "≥": ">=", "≠": "!="}
_MIRRORED = {"<": ">", "<=": ">=", ">": "<", ">=": "<=", "==": "==", "!=": "!="}


class Comparison(Enum):
    """How a column is compared with a value."""

    BELOW = "<"
    AT_MOST = "<="
    ABOVE = ">"
    AT_LEAST = ">="
    EQUAL = "=="
    OTHER = "!="


_OPERATORS: dict[Comparison, Callable[[Any, Any], Any]] = {
    Comparison.BELOW: operator.lt,
    Comparison.AT_MOST: operator.le,
    Comparison.ABOVE: operator.gt,
    Comparison.AT_LEAST: operator.ge,
    Comparison.EQUAL: operator.eq,
    Comparison.OTHER: operator.ne,
}


@dataclass(frozen=True, kw_only=True)
class Constraint:
    """What a column should keep.

    Attributes
    ----------
    key : str
        Column.
    comparison : Comparison
        How it is compared.
    limit : float, str or bool
        With what, as the column has it: its unit, a word, or true and false.
    text : str
        As it was written.
    """

    key: str
    comparison: Comparison
    limit: float | str | bool
    text: str

    def holds(self, values: NDArray[Any] | Sequence[Any]) -> NDArray[np.bool_]:
        """Where it holds.

        Parameters
        ----------
        values : NDArray or sequence
            The column, n entries.

        Returns
        -------
        NDArray
            Truth values, shape (n,); false where an entry is not known (NaN, None or an empty word).
        """
        compare = _OPERATORS[self.comparison]
        if isinstance(self.limit, str):
            wanted = name_key(self.limit)
            words = {value for value in values if isinstance(value, str) and value}
            met = {word for word in words if compare(name_key(word), wanted)}
            return np.array([isinstance(value, str) and value in met for value in values], dtype=bool)
        numbers = np.asarray(values, dtype=np.float64)
        return np.asarray(compare(numbers, float(self.limit)) & ~np.isnan(numbers), dtype=bool)


def read_constraint(text: Any, columns: Mapping[str, Column], tables: Tables | None = None) -> Constraint:
    """Read a constraint.

    Parameters
    ----------
    text : object
        What stands in the file.
    columns : Mapping
        Columns by name.
    tables : Tables, optional
        Parts that it may name; without them part names are taken as they are.

    Returns
    -------
    Constraint
        The constraint.

    Raises
    ------
    Refused
        If it is none; says at which position of the text, counted from 1, and what is wanted.
    """
    if not isinstance(text, str):
        raise Refused(WANTED)
    signs = list(_SIGN.finditer(text))
    if not signs:
        raise Refused(f"no comparison; {WANTED}")
    if len(signs) > 1:
        raise Refused(_more_than_one(text, signs, columns))
    sign = signs[0]
    if sign[0] in _REMEDY:
        raise _refused(sign.start(), f"{quoted(sign[0])} is no comparison; write {_REMEDY[sign[0]]}")
    column = _column(text, sign, columns)
    comparison = Comparison(sign[0])
    value = text[sign.end() :].strip()
    position = len(text) - len(text[sign.end() :].lstrip())
    if not value:
        raise _refused(sign.end(), f"a value is missing behind {sign[0]}; {WANTED}")
    if value in columns:
        raise _refused(position, f"{quoted(value)} is a column; a column is compared with a value")
    if column.unit is None and comparison not in (Comparison.EQUAL, Comparison.OTHER):
        raise _refused(sign.start(), f"{column.name} holds words; only == and != compare them")
    try:
        limit = _word(value, column, tables) if column.unit is None else _number(value, column)
    except Refused as refused:
        raise _refused(position, f"{quoted(value)}: {refused}") from None
    return Constraint(key=column.name, comparison=comparison, limit=limit, text=text)


def _refused(position: int, text: str) -> Refused:
    return Refused(f"position {position + 1}: {text}")


def _column(text: str, sign: re.Match[str], columns: Mapping[str, Column]) -> Column:
    name = text[: sign.start()].strip()
    position = len(text) - len(text.lstrip())
    if not name:
        raise _refused(sign.start(), f"a column is missing before {sign[0]}; {WANTED}")
    column = columns.get(_unquoted(name))
    if column is None:
        other = text[sign.end() :].strip()
        if other in columns:
            turned = quoted(f"{other} {_MIRRORED[sign[0]]} {name}")
            raise _refused(position, f"{quoted(name)} is no column; the column stands first: {turned}")
        raise _refused(position, f"{quoted(name)} is {unknown_column(name, columns)}")
    if not column.is_comparable:
        raise _refused(position, f"{name} holds a list, which cannot be compared")
    return column


def _more_than_one(text: str, signs: Sequence[re.Match[str]], columns: Mapping[str, Column]) -> str:
    """Refusal of a chain of comparisons, with the two constraints that say the same where that is clear."""
    first, second = signs[0], signs[1]
    middle = text[first.end() : second.start()].strip()
    both = first[0] in _MIRRORED and second[0] in _MIRRORED
    if len(signs) == 2 and both and middle in columns:
        low, high = text[: first.start()].strip(), text[second.end() :].strip()
        pair = (
            f"{quoted(f'{middle} {_MIRRORED[first[0]]} {low}')} and {quoted(f'{middle} {second[0]} {high}')}"
        )
        return f"position {second.start() + 1}: a second comparison; write two constraints: {pair}"
    return f"position {second.start() + 1}: a second comparison; one comparison a constraint: {WANTED}"


def _number(text: str, column: Column) -> float:
    """The value in the unit of the column; a number alone is in that unit already."""
    assert column.unit is not None
    try:
        limit = parse_quantity(text, "1")
    except QuantityError:
        return _with_unit(text, column)
    if column.is_share and not 0.0 <= limit <= 1.0:
        raise Refused(f"a number alone is a fraction from 0 to 1; write {text} % for a share in %")
    return limit


def _with_unit(text: str, column: Column) -> float:
    assert column.unit is not None
    try:
        value = parse_quantity(text, column.unit)
    except QuantityError as error:
        raise Refused(error.allowed) from None
    return float(Fraction(repr(value)) * Fraction(10) ** column.power) if column.power else value


def _word(text: str, column: Column, tables: Tables | None) -> str | bool:
    word = _unquoted(text)
    if isinstance(column.key, FlagKey):
        if word not in ("true", "false"):
            raise Refused("true or false is wanted")
        return word == "true"
    if isinstance(column.key, PartKey):
        return str(column.key.read(word, tables))
    if word not in column.words:
        near = ", ".join(quoted(other) for other in nearest_names(word, column.words))
        raise Refused(f"unknown word, nearest: {near}")
    return word


def _unquoted(text: str) -> str:
    is_quoted = len(text) >= 2 and text[0] == text[-1] and text[0] in "\"'"
    return text[1:-1] if is_quoted else text
