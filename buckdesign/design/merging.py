"""Laying the single values of a design file over those of a part."""

from __future__ import annotations

from typing import TypeVar

_T = TypeVar("_T")


def first_known(value: _T | None, fallback: _T) -> _T:
    """The value, or `fallback` where it is None.

    Parameters
    ----------
    value : object or None
        What is known, perhaps.
    fallback : object
        What stands in for it.

    Returns
    -------
    object
        One of the two.
    """
    return fallback if value is None else value


def picked(section: object, part: object, name: str, fallback: float) -> float:
    """The inline value, else the part's, else `fallback`.

    Parameters
    ----------
    section : object
        Section of a design file with the attribute.
    part : object or None
        Part with the attribute.
    name : str
        The attribute.
    fallback : float
        Value where neither has it [unit of the attribute].

    Returns
    -------
    float
        The value [unit of the attribute].
    """
    own = getattr(section, name)
    return table_value(part, name, fallback) if own is None else float(own)


def table_value(part: object, name: str, fallback: float) -> float:
    """A number of a part, or `fallback` where there is no part or no number.

    Parameters
    ----------
    part : object or None
        Part with the attribute.
    name : str
        The attribute.
    fallback : float
        Value where neither has it [unit of the attribute].

    Returns
    -------
    float
        The value [unit of the attribute].
    """
    value = None if part is None else getattr(part, name)
    return fallback if value is None else float(value)


def table_value_or_none(part: object, name: str) -> float | None:
    """A number of a part, or None.

    Parameters
    ----------
    part : object or None
        Part with the attribute.
    name : str
        The attribute.

    Returns
    -------
    float or None
        The value [unit of the attribute].
    """
    value = None if part is None else getattr(part, name)
    return None if value is None else float(value)
