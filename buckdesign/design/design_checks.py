"""Checks of a design file that need more than one key."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from buckdesign.design.keys import QuantityKey
from buckdesign.design.requirement import check_ripple_pair
from buckdesign.design.schema import Reading
from buckdesign.design.sections import (
    DEVICES,
    CapacitorSection,
    ChokeSection,
    RectifierSection,
    RegulatorSection,
    ThermalSection,
    TransistorSection,
)
from buckdesign.errors import UnknownNameError
from buckdesign.units import format_quantity, parse_quantity

NEEDED_WITHOUT_PART: Mapping[str, tuple[str, ...]] = {
    "regulator": ("reference", "output_inductance", "output_resistance", "current_limit", "dropout"),
    "transistor": ("gain", "charge_time", "saturation_voltage"),
    "rectifier": ("threshold",),
    "output_capacitor": ("capacitance", "esr"),
    "input_capacitor": ("capacitance", "esr"),
}
"""Keys without which an element has no behaviour at all; any other absent key leaves its effect out."""

_SECTIONS: Mapping[str, Any] = {
    "regulator": RegulatorSection,
    "transistor": TransistorSection,
    "rectifier": RectifierSection,
    "output_capacitor": CapacitorSection,
    "input_capacitor": CapacitorSection,
}
DEFAULT_AMBIENT_C = ThermalSection.__dataclass_fields__["ambient"].default
_WINDING = ("core", "material", "turns", "wire")
_WINDING_OPTIONS = ("permeability", "stack", "strands")
_BOUGHT = ("inductance", "resistance", "saturation")


def check_design(tree: Mapping[str, Any], reading: Reading) -> None:
    """Note the faults that show only when keys are seen together.

    Parameters
    ----------
    tree : Mapping
        The file.
    reading : Reading
        What was read from it so far; collects the faults.
    """
    sections = {name: value for name, value in tree.items() if isinstance(value, Mapping)}
    _check_complete(sections, reading)
    _check_load(sections.get("output"), reading)
    check_ripple_pair(reading.given, reading)
    _check_fold_back(sections.get("regulator", {}), reading)
    _check_leakage(sections.get("rectifier", {}), reading)
    if "choke" in sections:
        _check_choke(sections["choke"], reading)
    _check_heatsinks(sections.get("thermal", {}), reading)
    _check_junction_limits(reading)


def _check_complete(sections: Mapping[str, Any], reading: Reading) -> None:
    for name, needed in NEEDED_WITHOUT_PART.items():
        section = sections.get(name)
        if section is None or "part" in section:
            continue
        for key in needed:
            if key not in section:
                wanted = _wanted(name, key)
                reading.fault((name, key), None, f"missing, and no {name}.part completes it; {wanted}")


def _wanted(section: str, key: str) -> str:
    return str(_SECTIONS[section].__dataclass_fields__[key].metadata["key"].wanted)


def _check_load(output: Mapping[str, Any] | None, reading: Reading) -> None:
    if output is not None and "current" not in output and "resistance" not in output:
        wanted = QuantityKey(unit="A", above=False).wanted
        reading.fault(("output", "current"), None, f"missing (or output.resistance); {wanted}")


def _check_fold_back(regulator: Mapping[str, Any], reading: Reading) -> None:
    given = reading.given
    for key, other in (
        ("current_limit_knee", "current_limit_far"),
        ("current_limit_far", "current_limit_knee"),
    ):
        if key in regulator and other not in regulator and "part" not in regulator:
            wanted = RegulatorSection.__dataclass_fields__[other].metadata["key"].wanted
            reading.fault(("regulator", other), None, f"missing beside regulator.{key}; {wanted}")
    far, knee = given.get("regulator.current_limit_far"), given.get("regulator.current_limit_knee")
    if far is not None and knee is not None and parse_quantity(far[1], "V") <= parse_quantity(knee, "V"):
        reading.fault(("regulator", "current_limit_far"), far, "its voltage must be above current_limit_knee")
    limit = given.get("regulator.current_limit")
    if far is not None and limit is not None and parse_quantity(far[0], "A") > parse_quantity(limit, "A"):
        reading.fault(("regulator", "current_limit_far"), far, "its current must not be above current_limit")


def _check_leakage(rectifier: Mapping[str, Any], reading: Reading) -> None:
    if "leakage_at" in rectifier and "leakage" not in rectifier and "part" not in rectifier:
        wanted = QuantityKey(unit="A", above=False).wanted
        reading.fault(("rectifier", "leakage"), None, f"missing beside rectifier.leakage_at; {wanted}")


def _check_choke(choke: Mapping[str, Any], reading: Reading) -> None:
    wound = [key for key in _WINDING if key in choke]
    bought = [key for key in _BOUGHT if key in choke]
    if wound and bought:
        for key in bought:
            allowed = f"a winding (choke.{wound[0]}) or a bought part (choke.{bought[0]}), not both"
            reading.fault(("choke", key), choke[key], allowed)
        return
    needed: tuple[str, ...] = _WINDING
    reason = "missing in a winding"
    if not wound:
        reason = "missing (a winding; or inductance and resistance of a bought part)"
    if bought:
        needed, reason = ("inductance", "resistance"), "missing in a bought choke"
        for key in _WINDING_OPTIONS:
            if key in choke:
                reading.fault(("choke", key), choke[key], "belongs to a winding, and this choke is bought")
    members = ChokeSection.__dataclass_fields__
    for key in needed:
        if key not in choke:
            reading.fault(("choke", key), None, f"{reason}; {members[key].metadata['key'].wanted}")
    _check_bore(reading)


def _check_bore(reading: Reading) -> None:
    """A wire that does not pass the bore can't be wound at all; turns that do not fit are a result."""
    core, wire = reading.given.get("choke.core"), reading.given.get("choke.wire")
    if core is None or wire is None:
        return
    try:
        bore = reading.tables.ring(core).inner_diameter
        outer = reading.tables.wire(wire).outer_diameter_grade1
    except UnknownNameError:
        return
    if outer >= bore:
        shown = [format_quantity(value, "m", ascii_only=True) for value in (outer, bore)]
        allowed = f"with enamel {shown[0]} thick, it must be thinner than the bore of {core}, {shown[1]}"
        reading.fault(("choke", "wire"), wire, allowed)


def _check_junction_limits(reading: Reading) -> None:
    ambient = parse_quantity(reading.given.get("thermal.ambient", DEFAULT_AMBIENT_C), "degC")
    for name in DEVICES:
        limit = reading.given.get(f"{name}.junction_limit")
        if limit is not None and parse_quantity(limit, "degC") <= ambient:
            reading.fault((name, "junction_limit"), limit, f"must be above the ambient, {ambient:g} degC")


def _check_heatsinks(thermal: Mapping[str, Any], reading: Reading) -> None:
    shared = "heatsink" in thermal
    if shared and "on_heatsink" not in thermal:
        words = ", ".join(f'"{name}"' for name in DEVICES)
        reading.fault(
            ("thermal", "on_heatsink"), None, f"missing beside thermal.heatsink; a list of some of {words}"
        )
    if "on_heatsink" in thermal and not shared:
        wanted = QuantityKey(unit="K/W").wanted
        reading.fault(("thermal", "heatsink"), None, f"missing beside thermal.on_heatsink; {wanted}")
    sitting = reading.given.get("thermal.on_heatsink", ())
    for name in DEVICES:
        own = thermal.get(name)
        if isinstance(own, Mapping) and "heatsink" in own and name in sitting:
            allowed = "an own heat sink or a seat on the shared one (thermal.on_heatsink), not both"
            reading.fault(("thermal", name, "heatsink"), own["heatsink"], allowed)
