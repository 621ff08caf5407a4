"""The ``[tolerance]`` table of a design file: how far single values may be off."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from enum import Enum
from typing import Any

from buckdesign.design.keys import QuantityKey, Refused
from buckdesign.design.schema import Reading, dotted
from buckdesign.design.toml_text import InlineTable
from buckdesign.errors import nearest_names, quoted

WANTED = (
    'a share such as "10 %" (plus or minus), a list such as ["-50 %", "+100 %"], '
    'or { tolerance = "4 %", distribution = "normal" }'
)


class Distribution(Enum):
    """How a value is spread over its band."""

    UNIFORM = "uniform"
    NORMAL = "normal"


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
            shown = None if isinstance(value, Mapping) else value
            reading.fault(("tolerance", name), shown, str(refused))
    return found


def _check_key(name: str, value: Any, keys: Mapping[str, QuantityKey]) -> None:
    if name in keys:
        if keys[name].unit == "degC":
            raise Refused("a share of a temperature has no meaning")
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
            raise Refused(f"{len(value)} values; {WANTED}")
        low, high = (_SHARE.read(one, None) for one in value)
        if low > high:
            raise Refused(f"wrong order; {WANTED}")
        return Tolerance(low=low, high=high)
    share = QuantityKey(unit="%", above=False, below=1.0).read(value, None)
    return Tolerance(low=-share, high=share)


def _with_distribution(value: Mapping[str, Any]) -> Tolerance:
    unknown = set(value) - {"tolerance", "distribution"}
    if unknown or "tolerance" not in value or isinstance(value["tolerance"], Mapping):
        raise Refused(WANTED)
    band = _tolerance(value["tolerance"])
    names = [kind.value for kind in Distribution]
    name = value.get("distribution", Distribution.UNIFORM.value)
    if name not in names:
        raise Refused(f"distribution {quoted(name)} is unknown; one of {', '.join(map(quoted, names))}")
    return Tolerance(low=band.low, high=band.high, distribution=Distribution(name))


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
