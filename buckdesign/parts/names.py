"""Names of parts as people write them, and the one form under which they are found."""

from __future__ import annotations

import re

_NUMBER = re.compile(r"[0-9]+(?:\.[0-9]+)?")
_METRIC = re.compile(r"([0-9.]+) ?mm")
_GAUGE = re.compile(r"awg ?#?([0-9]+)|([0-9]+) ?awg")
_RING = re.compile(r"r? ?([0-9.]+) ?[/x] ?([0-9.]+) ?[/x] ?([0-9.]+)(?: ?mm)?")


def name_key(name: str) -> str:
    """The form under which a name is found: case, spaces and trailing zeros of numbers do not count.

    Parameters
    ----------
    name : str
        A part's name.

    Returns
    -------
    str
        Equal for names that mean the same part.

    Examples
    --------
    >>> name_key("1 mm") == name_key("1.00 mm"), name_key("R 26.9/14.5/11.1") == name_key("r26.90/14.5/11.1")
    (True, True)
    >>> name_key("18 AWG") == name_key("AWG18")
    True
    """
    tidy = " ".join(name.replace("\u00b5", "u").replace("\u03bc", "u").casefold().split())
    if match := _METRIC.fullmatch(tidy):
        tidy = f"{match.group(1)} mm"
    elif match := _GAUGE.fullmatch(tidy):
        tidy = f"awg {match.group(1) or match.group(2)}"
    elif match := _RING.fullmatch(tidy):
        tidy = "r " + "/".join(match.groups())
    return _NUMBER.sub(lambda found: _plain(found.group()), tidy)


def pair_key(*names: str) -> str:
    """The form under which a pair of names is found, such as a ring and a material.

    Parameters
    ----------
    *names : str
        One name or two.

    Returns
    -------
    str
        Equal for names that mean the same.

    Examples
    --------
    >>> pair_key("R 26.90/14.5/11.1", "Hydrogen-reduced iron 75")
    'r 26.9/14.5/11.1, hydrogen-reduced iron 75'
    """
    return ", ".join(name_key(name) for name in names)


def _plain(number: str) -> str:
    return number.rstrip("0").rstrip(".") if "." in number else number
