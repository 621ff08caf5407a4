"""Many variants of one design as arrays: each section is read and completed once for each set of its values.

A variant means the same as a design file with these values in it; what a section makes of its values is kept,
so that a full grid costs hardly more than the different sections in it.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.ambient_limits import ambient_allowed
from buckdesign.design.design_checks import check_design
from buckdesign.design.design_file import Design, keyed_design
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.losses import Floats
from buckdesign.design.merging import first_known
from buckdesign.design.resolve import (
    loop_parameters,
    resolve_capacitor,
    resolve_design,
    resolve_heat_paths,
    resolve_regulator,
)
from buckdesign.design.resolve_choke import resolve_choke
from buckdesign.design.resolve_semiconductors import resolve_rectifier, resolve_transistor
from buckdesign.design.schema import Reading, read_section
from buckdesign.design.sections import DEVICES
from buckdesign.errors import Fault, quoted
from buckdesign.loop.parameters import COLUMN, COLUMNS
from buckdesign.parts import Tables

Values = NDArray[np.float64] | NDArray[np.int64] | list[Any]

MOST_KEPT = 20_000
"""Most sections kept with what they stand for, so that memory stays flat (own choice)."""

ROW_COLUMNS: Mapping[str, tuple[str, ...]] = {
    "supply": ("supply_voltage",),
    "output": ("load_current", "load_resistance"),
    "regulator": (
        "reference", "adjust_current", "output_inductance", "output_resistance", "quiescent_current",
        "current_limit", "current_limit_knee", "current_limit_far_voltage", "current_limit_far", "dropout",
        "dropout_resistance",
    ),
    "network": (
        "r1", "r2", "hysteresis_resistance", "hysteresis_capacitance", "drive_resistance", "base_resistance",
    ),
    "transistor": (
        "base_emitter", "charge_time", "gain", "gain_knee", "saturation_voltage", "saturation_resistance",
    ),
    "rectifier": ("threshold", "slope", "recovery_charge"),
    "choke": ("inductance", "bias_current", "bias_exponent", "choke_resistance"),
    "output_capacitor": ("capacitance", "esr"),
    "input_capacitor": (),
    "thermal": (),
}  # fmt: skip
"""Loop parameters by the section of a design file that they come from."""


@dataclass(frozen=True, kw_only=True)
class _Kept:
    """What one set of values of a section stands for."""

    section: Any
    element: Any
    row: tuple[float, ...]
    failure: str = ""


@dataclass(frozen=True, kw_only=True)
class Variants:
    """Variants of a design, entry by entry.

    Attributes
    ----------
    designs : list of ResolvedDesign
        Those that could be made, m of n.
    rows : NDArray
        Their loop parameters at 25 degC, shape (m, columns).
    ambient_c : NDArray
        [degC], shape (m,).
    is_made : NDArray
        Which of the n could be made, shape (n,).
    failures : list of str
        Why not, n texts; empty for those that could.
    """

    designs: list[ResolvedDesign]
    rows: Floats
    ambient_c: Floats
    is_made: NDArray[np.bool_]
    failures: list[str]


class DesignPoints:
    """Makes variants of a design.

    Parameters
    ----------
    base : Design
        The design that is varied.
    tables : Tables
        Parts that it and its variants name.
    is_heated : bool
        Whether temperatures are computed, so that no device may be in an ambient above its limit.
    """

    def __init__(self, base: Design, tables: Tables, *, is_heated: bool = True) -> None:
        self.base, self.tables, self.is_heated = base, tables, is_heated
        self._tree = base.tree()
        self._resolved = resolve_design(base, tables)
        self._kept: dict[tuple[str, tuple[Any, ...]], _Kept] = {}
        self._own = {name: self._own_section(name) for name in ROW_COLUMNS}

    def variants(self, values: Mapping[str, Values], count: int) -> Variants:
        """Variants with some values replaced.

        Parameters
        ----------
        values : Mapping
            New values by dotted key, `count` each, as their keys read them.
        count : int
            How many.

        Returns
        -------
        Variants
            In the order of the values.
        """
        if len(self._kept) > MOST_KEPT:
            self._kept.clear()
        taken = {name: self._sections(name, values, count) for name in ROW_COLUMNS}
        failures = [_joined(some) for some in zip(*(taken[name] for name in ROW_COLUMNS), strict=True)]
        made = np.array([not text for text in failures], dtype=bool)
        for index in np.flatnonzero(made) if self.is_heated else ():
            failures[index] = _too_hot({name: taken[name][index] for name in (*DEVICES, "thermal")})
        made = np.array([not text for text in failures], dtype=bool)
        which = np.flatnonzero(made)
        kept = {name: [some[index] for index in which] for name, some in taken.items()}
        designs = [
            self._design(dict(zip(kept, some, strict=True))) for some in zip(*kept.values(), strict=True)
        ]
        return Variants(
            designs=designs,
            rows=self._rows(kept, designs),
            ambient_c=np.array([one.heat.ambient_c for one in designs], dtype=float),
            is_made=made,
            failures=failures,
        )

    def _sections(self, name: str, values: Mapping[str, Values], count: int) -> list[_Kept]:
        keys = [key for key in values if key.partition(".")[0] == name]
        if not keys:
            return [self._own[name]] * count
        columns = [_plain(values[key]) for key in keys]
        found = []
        for some in zip(*columns, strict=True):
            mark = (name, tuple(zip(keys, some, strict=True)))
            kept = self._kept.get(mark)
            if kept is None:
                kept = self._kept[mark] = self._make(name, dict(mark[1]))
            found.append(kept)
        return found

    def _own_section(self, name: str) -> _Kept:
        section = getattr(self.base, name)
        return self._complete(name, section) if section is not None else _Kept(section=None, element=None, row=())

    def _make(self, name: str, values: Mapping[str, Any]) -> _Kept:
        made, faults = self._read(name, values)
        if faults or made is None:
            keys = keyed_design()
            _, faults = self._read(name, {key: keys[key].write(value) for key, value in values.items()})
            return _Kept(section=None, element=None, row=(), failure="; ".join(map(fault_text, faults)))
        return self._complete(name, made)

    def _read(self, name: str, values: Mapping[str, Any]) -> tuple[Any, list[Fault]]:
        """A section with some values replaced, and what is wrong with it."""
        tree = _with_values(self._tree.get(name, {}), values)
        reading = Reading(path=Path(), locate=lambda *steps: None, tables=self.tables)
        made = read_section(type(self._section_like(name)), tree, (name,), reading)
        check_design({name: tree}, reading)
        return made, reading.faults

    def _section_like(self, name: str) -> Any:
        """An instance of the section's class; the design may have none of it."""
        section = getattr(self.base, name)
        return self.base.output_capacitor if section is None else section

    def _complete(self, name: str, section: Any) -> _Kept:
        told: list[str] = []
        tables = self.tables
        match name:
            case "regulator":
                element: Any = resolve_regulator(section, tables)
            case "transistor":
                element = resolve_transistor(section, tables, told)
            case "rectifier":
                element = resolve_rectifier(section, tables, told)
            case "choke":
                element = resolve_choke(section, tables, told)
            case "output_capacitor" | "input_capacitor":
                element = resolve_capacitor(section, tables)
            case "thermal":
                element = resolve_heat_paths(section)
            case _:
                element = section
        return _Kept(section=section, element=element, row=self._row_part(name, element))

    def _row_part(self, name: str, element: Any) -> tuple[float, ...]:
        if name == "supply":
            return (element.voltage,)
        if name == "output":
            return first_known(element.current, 0.0), first_known(element.resistance, math.inf)
        if not ROW_COLUMNS[name]:
            return ()
        whole = ResolvedDesign(**{**_elements(self._resolved), name: element})
        row = loop_parameters(whole, 1.0, 0.0)
        return tuple(getattr(row, column) for column in ROW_COLUMNS[name])

    def _design(self, kept: Mapping[str, _Kept]) -> ResolvedDesign:
        design = Design(
            **{name: one.section for name, one in kept.items()}, requirement=self.base.requirement
        )
        return ResolvedDesign(
            design=design,
            full_load=design.full_load,
            heat=kept["thermal"].element,
            **{name: kept[name].element for name in _ELEMENTS},
        )

    def _rows(self, kept: Mapping[str, Sequence[_Kept]], designs: Sequence[ResolvedDesign]) -> Floats:
        rows = np.empty((len(designs), len(COLUMNS)))
        for name, columns in ROW_COLUMNS.items():
            if columns and designs:
                rows[:, [COLUMN[column] for column in columns]] = [one.row for one in kept[name]]
        rows[:, COLUMN["full_load"]] = [one.full_load for one in designs]
        return rows


_ELEMENTS = (*DEVICES, "network", "choke", "output_capacitor", "input_capacitor")


def _elements(resolved: ResolvedDesign) -> dict[str, Any]:
    names = (*_ELEMENTS, "design", "heat", "full_load")
    return {name: getattr(resolved, name) for name in names}


def _joined(some: Sequence[_Kept]) -> str:
    return "; ".join(one.failure for one in some if one.failure)


def _too_hot(kept: Mapping[str, _Kept]) -> str:
    """Why a device could not even work without losses, or nothing."""
    ambient = kept["thermal"].element.ambient_c
    allowed = ambient_allowed(ambient, {name: kept[name].element for name in DEVICES})
    return f"thermal.ambient = {ambient:g} degC: {allowed}" if allowed else ""


def fault_text(fault: Fault) -> str:
    """A fault of a point: its key, what stands there and what is allowed.

    Parameters
    ----------
    fault : Fault
        The fault.

    Returns
    -------
    str
        One line without a file.
    """
    value = "" if fault.value is None else f" = {quoted(fault.value)}"
    return f"{fault.key}{value}: {fault.allowed}"


def _plain(values: Values) -> list[Any]:
    """Values that can be compared and read: plain numbers, words and tuples."""
    return values.tolist() if isinstance(values, np.ndarray) else list(values)


def _with_values(tree: Mapping[str, Any], values: Mapping[str, Any]) -> dict[str, Any]:
    """A section as in a file, with values by dotted key; the section's own tree stays as it is."""
    made = {name: dict(one) if isinstance(one, Mapping) else one for name, one in tree.items()}
    for key, value in values.items():
        _, *outer, last = key.split(".")
        inner = made
        for name in outer:
            inner = inner.setdefault(name, {})
        inner[last] = list(value) if isinstance(value, tuple) else value
    return made


__all__ = ["MOST_KEPT", "ROW_COLUMNS", "DesignPoints", "Values", "Variants", "fault_text"]
