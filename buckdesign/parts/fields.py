"""How an attribute of a part stands in a CSV table: its unit, whether it must be there, what it may be.

The dataclasses of `buckdesign.parts.kinds` declare each attribute with one of the functions here; the
loader reads the declaration back with `columns_of`. So a part and its table cannot drift apart.
"""

from __future__ import annotations

from dataclasses import MISSING, dataclass, field, fields
from enum import Enum
from typing import Any

_KEY = "column"


class Sign(Enum):
    """What a number in a table may be."""

    ANY = "a number"
    NOT_NEGATIVE = "a number of at least 0"
    POSITIVE = "a number above 0"


@dataclass(frozen=True, kw_only=True)
class Column:
    """One column of a table.

    Attributes
    ----------
    name : str
        Attribute and column name.
    unit : str
        SI unit as `buckdesign.units` names it; empty for a text.
    raw_label : str
        Label in the header that is taken as it is, for numbers kept in a publication's units.
    sign : Sign
        What the number may be.
    choices : tuple of str
        What the text may be; empty: any.
    required : bool
        Whether column and cell must be there.
    """

    name: str
    unit: str = ""
    raw_label: str = ""
    sign: Sign = Sign.ANY
    choices: tuple[str, ...] = ()
    required: bool = False

    @property
    def is_text(self) -> bool:
        """Whether the cell is a text."""
        return not self.unit and not self.raw_label

    @property
    def header(self) -> str:
        """The column's header with the SI unit."""
        label = self.raw_label or self.unit
        return self.name if self.is_text else f"{self.name} [{label}]"


def quantity(unit: str, *, required: bool = False, sign: Sign = Sign.POSITIVE) -> Any:
    """A number with a unit; absent is None unless it is required.

    Parameters
    ----------
    unit : str
        SI unit as `buckdesign.units` names it.
    required : bool
        Whether it must be there.
    sign : Sign
        What the number may be.

    Returns
    -------
    dataclasses.Field
        For the body of a dataclass.
    """
    return _declare(Column(name="", unit=unit, sign=sign, required=required))


def raw_number(label: str) -> Any:
    """A number above zero in the units of its publication; absent is None.

    Parameters
    ----------
    label : str
        The units as they stand in the header's brackets.

    Returns
    -------
    dataclasses.Field
        For the body of a dataclass.
    """
    return _declare(Column(name="", raw_label=label, sign=Sign.POSITIVE))


def text(*choices: str, required: bool = False) -> Any:
    """A text; absent is empty unless it is required.

    Parameters
    ----------
    *choices : str
        What it may be; none: anything.
    required : bool
        Whether it must be there.

    Returns
    -------
    dataclasses.Field
        For the body of a dataclass.
    """
    return _declare(Column(name="", choices=choices, required=required))


def _declare(column: Column) -> Any:
    absent: Any = "" if column.is_text else None
    return field(default=MISSING if column.required else absent, metadata={_KEY: column})


def columns_of(kind: Any) -> dict[str, Column]:
    """The columns of a part's table by name, in the order of its attributes.

    Parameters
    ----------
    kind : type
        A dataclass of `buckdesign.parts.kinds`.

    Returns
    -------
    dict of str to Column
        One for each declared attribute.
    """
    found = {}
    for item in fields(kind):
        column = item.metadata.get(_KEY)
        if column is not None:
            found[item.name] = Column(
                name=item.name,
                unit=column.unit,
                raw_label=column.raw_label,
                sign=column.sign,
                choices=column.choices,
                required=column.required,
            )
    return found
