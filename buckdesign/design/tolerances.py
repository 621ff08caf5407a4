"""The ``[tolerance]`` table of a design file: how far single values may be off."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import Enum
from typing import Any

from buckdesign.design.keys import QuantityKey, Refused
from buckdesign.design.schema import Reading, dotted
from buckdesign.design.toml_text import InlineTable, value_text
from buckdesign.errors import nearest_names, quoted

WANTED = (
    'a share such as "10 %" (plus or minus), a list such as ["-50 %", "+100 %"], '
    'or { tolerance = "4 %", distribution = "normal" }'
)

NOT_VARIED: Mapping[str, str] = {
    "supply": "belongs to the operating point: yields count over the range of the requirement",
    "output": "belongs to the operating point: yields count over the range of the requirement",
} | dict.fromkeys(
    (
        "regulator.max_difference", "transistor.collector_voltage", "transistor.collector_current",
        "rectifier.reverse_voltage", "rectifier.average_current", "network.rdrive_power", "network.rbe_power",
        *(f"{side}_capacitor.{name}" for side in ("output", "input")
          for name in ("rated_voltage", "ripple_current", "life")),
    ),
    "a rating: it is checked against and does not differ from unit to unit",
)  # fmt: skip
"""Tables and keys with a quantity that can have no tolerance, and why."""


class Distribution(Enum):
    """How a value is spread over its band.

    Uniform: alike everywhere in it. Normal: its middle is the mean, its ends are three standard deviations away,
    and nothing lies beyond them. Lognormal: the same for the logarithm of the value.
    """

    UNIFORM = "uniform"
    NORMAL = "normal"
    LOGNORMAL = "lognormal"


@dataclass(frozen=True, kw_only=True)
class Tolerance:
    """How far a value may be off.

    Attributes
    ----------
    low, high : float
        Smallest and largest relative deviation, such as -0.5 and 1.0 [1].
    distribution : Distribution
        How the value is spread between them.
    """

    low: float
    high: float
    distribution: Distribution = Distribution.UNIFORM


_SHARE = QuantityKey(unit="%", minimum=-1.0)


def read_tolerances(raw: Any, keys: Mapping[str, QuantityKey], reading: Reading) -> dict[str, Tolerance]:
    """Read the table.

    Parameters
    ----------
    raw : object
        What stands in the file under ``tolerance``.
    keys : Mapping
        Keys of a design file that can have a tolerance.
    reading : Reading
        Collects the faults and what was given.

    Returns
    -------
    dict
        Tolerance by dotted key; without the faulty ones.
    """
    if not isinstance(raw, Mapping):
        reading.fault(("tolerance",), raw, "a table is wanted: [tolerance]")
        return {}
    found = {}
    for name, value in raw.items():
        try:
            _check_key(name, value, keys)
            found[name] = _tolerance(value)
            reading.given[_given_key(name)] = value
        except Refused as refused:
            reading.fault(("tolerance", name), _shown(value), str(refused))
    return found


def _shown(value: Any) -> Any:
    """A faulty tolerance as an error prints it: of a small table its band, where that is a plain one."""
    if not isinstance(value, Mapping):
        return value
    band = value.get("tolerance")
    return None if isinstance(band, Mapping) else band


def _check_key(name: str, value: Any, keys: Mapping[str, QuantityKey]) -> None:
    if name in keys:
        if keys[name].unit == "degC":
            raise Refused("a share of a temperature has no meaning")
        why = NOT_VARIED.get(name) or NOT_VARIED.get(name.partition(".")[0])
        if why:
            raise Refused(why)
        return
    inside = [f"{name}.{key}" for key in value] if isinstance(value, Mapping) else []
    if any(key in keys for key in inside):
        raise Refused(f"a key with a dot goes in quotes: {quoted(inside[0])} = ...")
    near = ", ".join(quoted(key) for key in nearest_names(name, keys))
    raise Refused(f"not a key of a design file that can have a tolerance, nearest: {near}")


def _tolerance(value: Any) -> Tolerance:
    if isinstance(value, Mapping):
        return _with_distribution(value)
    if isinstance(value, list):
        if len(value) != 2:
            raise Refused(f"{len(value)} value{'s' * (len(value) != 1)}, not 2; {WANTED}")
        low, high = (_SHARE.read(one, None) for one in value)
        if low > high:
            raise Refused(f"wrong order; {WANTED}")
        if low == high != 0.0:
            raise Refused(
                "both ends alike spread nothing; put the value itself at its key, or give the band two ends"
            )
        return Tolerance(low=low, high=high)
    try:
        share = QuantityKey(unit="%", above=False, below=1.0).read(value, None)
    except Refused as refused:
        raise Refused(_with_remedy(value, refused)) from None
    return Tolerance(low=-share, high=share)


def _with_remedy(value: Any, refused: Refused) -> str:
    """What was wrong with a single share, and what was meant if that can be guessed."""
    try:
        share = _SHARE.read(value, None)
    except Refused:
        return str(refused)
    if share >= 1.0 and "%" not in str(value):
        return f'a number alone is a fraction: write "{share:g} %"' if share < 100.0 else str(refused)
    if share < 0.0:
        return f"{refused}; it counts both ways"
    return f'{refused}; up and down apart: ["-50 %", "+{100.0 * share:g} %"]'


def _with_distribution(value: Mapping[str, Any]) -> Tolerance:
    unknown = set(value) - {"tolerance", "distribution"}
    if unknown or "tolerance" not in value or isinstance(value["tolerance"], Mapping):
        raise Refused(WANTED)
    band = _tolerance(value["tolerance"])
    names = [kind.value for kind in Distribution]
    name = value.get("distribution", Distribution.UNIFORM.value)
    if name not in names:
        raise Refused(f"distribution {_text(name)} is unknown; one of {', '.join(map(quoted, names))}")
    return Tolerance(low=band.low, high=band.high, distribution=Distribution(name))


def _text(value: Any) -> str:
    return quoted(value) if isinstance(value, str) else value_text(value)


def tolerance_tree(tolerances: Mapping[str, Tolerance], given: Mapping[str, Any]) -> dict[str, Any]:
    """The table as it stands in a file: what was given where it still says the same.

    Parameters
    ----------
    tolerances : Mapping
        `Tolerance` by dotted key.
    given : Mapping
        What stood in the file, by dotted key.

    Returns
    -------
    dict
        What to write, by dotted key.
    """
    tree = {}
    for name, tolerance in tolerances.items():
        raw = given.get(_given_key(name))
        written = raw if raw is not None and _same(raw, tolerance) else _written(tolerance)
        tree[name] = InlineTable(written) if isinstance(written, Mapping) else written
    return tree


def _given_key(name: str) -> str:
    return dotted(("tolerance", name))


def _same(raw: Any, tolerance: Tolerance) -> bool:
    try:
        return _tolerance(raw) == tolerance
    except Refused:
        return False


def _written(tolerance: Tolerance) -> Any:
    if tolerance.low == -tolerance.high:
        band: Any = _SHARE.write(tolerance.high)
    else:
        band = [_SHARE.write(tolerance.low), _SHARE.write(tolerance.high)]
    if tolerance.distribution is Distribution.UNIFORM:
        return band
    return {"tolerance": band, "distribution": tolerance.distribution.value}
