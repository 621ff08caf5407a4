"""Ambients at which no junction can stay within its limit, whatever the losses: refused before anything is run."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from buckdesign.design.elements import RectifierElement, RegulatorElement, ResolvedDesign, TransistorElement
from buckdesign.design.requirement import Requirement
from buckdesign.design.sections import DEVICES
from buckdesign.design.toml_source import read_toml
from buckdesign.errors import Fault, FaultsError, InputError
from buckdesign.parts import Tables

Device = RegulatorElement | TransistorElement | RectifierElement


def check_ambient(resolved: ResolvedDesign, ambient_c: float | None = None) -> None:
    """Refuse an ambient at or above the junction limit of a device.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design; its limits come from its file or from its parts.
    ambient_c : float, optional
        Ambient that was asked for instead of the design's own [degC].

    Raises
    ------
    InputError
        With the lowest of the limits; where the ambient stands in the design's file, with file and line.
    """
    ambient = resolved.heat.ambient_c if ambient_c is None else ambient_c
    allowed = ambient_allowed(ambient, {name: getattr(resolved, name) for name in DEVICES})
    if not allowed:
        return
    source = resolved.design.source
    if ambient_c is not None or source is None:
        raise InputError(f"ambient = {ambient:g} degC: {allowed}")
    raise FaultsError([_fault(source, "thermal", ambient, allowed)])


def ambient_allowed(ambient_c: float, devices: Mapping[str, Device]) -> str:
    """What is allowed instead of an ambient at or above the junction limit of a device.

    Parameters
    ----------
    ambient_c : float
        Ambient [degC].
    devices : Mapping
        Elements by the name of the device.

    Returns
    -------
    str
        With the lowest of the limits; empty where the ambient is below all that are known.
    """
    limits = [
        (limit, name) for name, one in devices.items() if (limit := one.junction_limit_c) is not None
    ]
    if not limits or ambient_c < min(limits)[0]:
        return ""
    limit, name = min(limits)
    part = devices[name].name
    which = f"the {name}" if part is None else f"the {name} {part}"
    return f"must be below the junction limit of {which}, {limit:g} degC"


def check_requirement_ambient(requirement: Requirement, tables: Tables) -> None:
    """Refuse a requirement whose highest ambient no device could stand.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    tables : Tables
        Parts to choose from, where it prefers none.

    Raises
    ------
    InputError
        With the highest junction limit among the parts that can be chosen; with file and line where it came from
        a file.
    """
    ambient = requirement.limits.ambient_high
    for name in DEVICES:
        preferred = getattr(requirement.prefer, name)
        known = getattr(tables, f"{name}s")
        parts = [getattr(tables, name)(one) for one in preferred] if preferred else list(known.values())
        limits = [one.junction_limit_c for one in parts if one.junction_limit_c is not None]
        if len(limits) < len(parts) or ambient < max(limits):
            continue
        which = f"the preferred {name}" if preferred else f"every {name} in the tables"
        allowed = f"must be below the junction limit of {which}, {max(limits):g} degC"
        if requirement.source is None:
            raise InputError(f"limits.ambient = {ambient:g} degC: {allowed}")
        raise FaultsError([_fault(requirement.source, "limits", ambient, allowed)])


def _fault(path: Path, table: str, ambient: float, allowed: str) -> Fault:
    try:
        line: int | None = read_toml(path).locate(table, "ambient")
    except InputError:
        line = None
    return Fault(file=path, line=line, key=f"{table}.ambient", value=f"{ambient:g} degC", allowed=allowed)
