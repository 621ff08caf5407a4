"""Which values differ from unit to unit in a study, by how much, and where that comes from."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from buckdesign.design.design_file import Design, numeric_keys
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.schema import dotted
from buckdesign.design.tolerances import NOT_VARIED, Tolerance
from buckdesign.errors import BuckdesignError, Fault, FaultsError, InputError, nearest_names, quoted
from buckdesign.parts import Tables
from buckdesign.studies.tolerance_defaults import default_tolerances
from buckdesign.studies.unit_designs import UNIT_KEYS, value_of

DESIGN_FILE = "design file"
"""Source of a tolerance that stands in the design file."""

GIVEN = "given"
"""Source of a tolerance that a script gave."""


@dataclass(frozen=True, kw_only=True)
class Varied:
    """A value that differs from unit to unit.

    Attributes
    ----------
    key : str
        Dotted key of the design file.
    unit : str
        As in `buckdesign.units`.
    value : float
        Nominal value, SI.
    tolerance : Tolerance
        Band and distribution.
    source : str
        Where the tolerance comes from.
    """

    key: str
    unit: str
    value: float
    tolerance: Tolerance
    source: str

    @property
    def place(self) -> int:
        """Place of its random numbers among those of a unit."""
        return UNIT_KEYS.index(self.key)

    def to_dict(self) -> dict[str, Any]:
        """The value by key, for JSON."""
        return {
            "key": self.key,
            "value": self.value,
            "unit": self.unit,
            "low": self.tolerance.low,
            "high": self.tolerance.high,
            "distribution": self.tolerance.distribution.value,
            "source": self.source,
        }


def varied_values(
    design: Design,
    resolved: ResolvedDesign,
    tables: Tables,
    *,
    given: Mapping[str, Tolerance] | None = None,
    with_defaults: bool = False,
) -> tuple[Varied, ...]:
    """The values that differ from unit to unit.

    Parameters
    ----------
    design, resolved : Design, ResolvedDesign
        The design; its ``[tolerance]`` table is taken where none is given.
    tables : Tables
        Parts that it names.
    given : Mapping, optional
        `Tolerance` by dotted key, instead of the table.
    with_defaults : bool
        Take the defaults of the trade for the values that the table leaves out. Without a table they are taken
        always.

    Returns
    -------
    tuple of Varied
        In the order of the file format; tolerances without any width are left out.

    Raises
    ------
    FaultsError
        A tolerance is that of a value which the design does not have.
    InputError
        A key is not known, can have no tolerance, or nothing differs.
    """
    own = dict(design.tolerance if given is None else given)
    _check_known(own)
    _check_has_values(own, design, resolved, is_file=given is None)
    source = DESIGN_FILE if given is None else GIVEN
    chosen = {key: (tolerance, source) for key, tolerance in own.items()}
    if with_defaults or not own:
        chosen = {
            one.key: (one.tolerance, one.source) for one in default_tolerances(resolved, tables)
        } | chosen
    units = numeric_keys()
    found = [
        _varied(key, units[key].unit, resolved, *chosen[key])
        for key in units
        if key in chosen and chosen[key][0].low < chosen[key][0].high
    ]
    if not found:
        place = f"{design.source}: " if given is None and design.source is not None else ""
        raise InputError(
            f"{place}no value differs from unit to unit: every tolerance is 0; widen one, or take the usual ones along "
            "(--defaults)"
        )
    return tuple(found)


def _varied(key: str, unit: str, resolved: ResolvedDesign, tolerance: Tolerance, source: str) -> Varied:
    value = value_of(resolved, key)
    assert value is not None
    return Varied(key=key, unit=unit, value=value, tolerance=tolerance, source=source)


def _check_known(own: Mapping[str, Tolerance]) -> None:
    for key in own:
        if key in UNIT_KEYS:
            continue
        why = NOT_VARIED.get(key) or NOT_VARIED.get(key.partition(".")[0])
        if why is None or key not in numeric_keys():
            near = ", ".join(quoted(name) for name in nearest_names(key, UNIT_KEYS))
            why = f"not a key of a design file that can have a tolerance, nearest: {near}"
        raise InputError(f"tolerance of {quoted(key)}: {why}")


def _check_has_values(
    own: Mapping[str, Tolerance], design: Design, resolved: ResolvedDesign, *, is_file: bool
) -> None:
    missing = [key for key in own if value_of(resolved, key) is None]
    if not missing:
        return
    allowed = "the design has no such value, or it has no effect here: nothing to spread; take the line out"
    path = design.source if is_file and design.source is not None else Path("design")
    lines = _lines(path, missing)
    raise FaultsError(
        [_fault(path, line, key, design, allowed) for key, line in zip(missing, lines, strict=True)]
    )


def _fault(path: Path, line: int | None, key: str, design: Design, allowed: str) -> Fault:
    name = dotted(("tolerance", key))
    value = design.given.get(name)
    return Fault(path, line, name, None if isinstance(value, Mapping) else value, allowed)


def _lines(path: Path, keys: Sequence[str]) -> list[int | None]:
    """Where the keys stand in the file, as far as that can be told."""
    from buckdesign.design.toml_source import read_toml

    try:
        source = read_toml(path)
    except BuckdesignError:
        return [None] * len(keys)
    return [source.locate("tolerance", key) for key in keys]


def with_tolerance(varied: Sequence[Varied], key: str, tolerance: Tolerance) -> tuple[Varied, ...]:
    """The same values with another tolerance of one of them."""
    return tuple(replace(one, tolerance=tolerance) if one.key == key else one for one in varied)
