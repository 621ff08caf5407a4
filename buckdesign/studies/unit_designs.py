"""One built unit of a design: its values off by factors, with the laws of temperature and current kept.

A factor scales the value that a design comes to, whether its file gives it or a part. What a data sheet
guarantees is put in the place of nothing: a unit is checked with its own values.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

from buckdesign.design.elements import (
    ChokeElement,
    HeatPath,
    HeatPaths,
    RectifierElement,
    ResolvedDesign,
    WindingElement,
)
from buckdesign.design.sections import DEVICES

FIELDS: Mapping[str, Mapping[str, tuple[str, ...]]] = {
    "regulator": {
        "reference": ("reference",),
        "adjust_current": ("adjust_current",),
        "quiescent_current": ("quiescent_current",),
        "output_inductance": ("output_inductance",),
        "output_resistance": ("output_resistance",),
        "current_limit": ("current_limit", "current_limit_far"),
        "current_limit_knee": ("current_limit_knee",),
        "dropout": ("dropout",),
        "dropout_resistance": ("dropout_resistance",),
        "junction_case": ("junction_case",),
    },
    "network": {name: (name,) for name in ("r1", "r2", "rh", "ch", "rbe", "rdrive")},
    "transistor": {
        name: (name,)
        for name in (
            "gain", "gain_knee", "charge_time", "base_emitter", "saturation_voltage",
            "saturation_resistance", "junction_case",
        )
    },
    "rectifier": {
        name: (name,)
        for name in ("threshold", "slope", "recovery_charge", "leakage", "capacitance", "junction_case")
    },
    "output_capacitor": {"capacitance": ("capacitance",), "esr": ("esr", "loss_tangent")},
    "input_capacitor": {"capacitance": ("capacitance",), "esr": ("esr", "loss_tangent")},
}  # fmt: skip
"""What a key scales, by element: the first field is its value, the others go with it. The ESR is scaled at every
frequency, the current limit along its whole fold-back line."""

CHOKE_KEYS = ("permeability", "inductance", "resistance", "saturation")

THERMAL_KEYS = ("heatsink", "pad", *(f"{name}.{what}" for name in DEVICES for what in ("heatsink", "pad")))

UNIT_KEYS: tuple[str, ...] = (
    *(f"{element}.{name}" for element, names in FIELDS.items() for name in names),
    *(f"choke.{name}" for name in CHOKE_KEYS),
    *(f"thermal.{name}" for name in THERMAL_KEYS),
)
"""The keys of a design file that can differ from unit to unit. New ones go to the end: the random numbers of a
unit go by their place."""

EDDY_LOSS = "core.eddy_loss"
"""A factor on the eddy part of the core loss; no key of a design file, only ageing changes it."""

SATURATION_LEFT = 0.7
"""Inductance at the saturation current of a choke over that without bias [1], as in the design file."""


def value_of(resolved: ResolvedDesign, key: str) -> float | None:
    """What a design comes to for a key.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design.
    key : str
        One of `UNIT_KEYS`.

    Returns
    -------
    float or None
        SI; None where a factor would change nothing: absent, zero or infinite.
    """
    section, _, name = key.partition(".")
    if section == "choke":
        value = _choke_value(resolved.choke, name)
    elif section == "thermal":
        value = _thermal_value(resolved, name)
    elif name == "junction_case" and not _is_on_a_sink(resolved.heat, section):
        value = None
    else:
        element = getattr(resolved, section)
        value = None if element is None else getattr(element, FIELDS[section][name][0])
    return None if value is None or not math.isfinite(value) or value == 0.0 else float(value)


def _choke_value(choke: ChokeElement, name: str) -> float | None:
    match name:
        case "permeability":
            return None if choke.winding is None else choke.winding.permeability_factor
        case "saturation":
            return choke.bias_current * (1.0 / SATURATION_LEFT - 1.0) ** (1.0 / choke.bias_exponent)
        case _:
            value: float = getattr(choke, name)
            return value


def _thermal_value(resolved: ResolvedDesign, name: str) -> float | None:
    thermal = resolved.design.thermal
    device, _, what = name.rpartition(".")
    if not device:
        used = [getattr(resolved.heat, one) for one in DEVICES]
        if what == "heatsink":
            shared = any(path.is_shared and path.heatsink is None for path in used)
            return resolved.heat.shared_heatsink if shared else None
        return thermal.pad if any(_has_common_pad(resolved, one) for one in DEVICES) else None
    own = getattr(thermal, device)
    value = None if own is None else getattr(own, what)
    return value if what == "heatsink" or _is_on_a_sink(resolved.heat, device) else None


def _is_on_a_sink(heat: HeatPaths, device: str) -> bool:
    path: HeatPath = getattr(heat, device)
    return path.heatsink is not None or (path.is_shared and heat.shared_heatsink is not None)


def _has_common_pad(resolved: ResolvedDesign, device: str) -> bool:
    own = getattr(resolved.design.thermal, device)
    return (own is None or own.pad is None) and _is_on_a_sink(resolved.heat, device)


def unit_design(nominal: ResolvedDesign, factors: Mapping[str, float]) -> ResolvedDesign:
    """A built unit.

    Parameters
    ----------
    nominal : ResolvedDesign
        The design.
    factors : Mapping
        Value over nominal by key, of `UNIT_KEYS` and `EDDY_LOSS` [1].

    Returns
    -------
    ResolvedDesign
        The design with the unit's values, and the same in the place of what data sheets guarantee. Rectifiers
        in parallel still differ among each other as far as the sheet lets them.
    """
    by_section: dict[str, dict[str, float]] = {}
    for key, factor in factors.items():
        section, _, name = key.partition(".")
        by_section.setdefault(section, {})[name] = factor
    changed: dict[str, Any] = {
        section: _scaled(getattr(nominal, section), section, by_section.get(section, {}))
        for section in FIELDS
    }
    changed["regulator"] = _own_regulator(changed["regulator"])
    changed["transistor"] = _own_transistor(changed["transistor"])
    changed["rectifier"] = _own_rectifier(changed["rectifier"], nominal.rectifier)
    choke, core = by_section.get("choke", {}), by_section.get("core", {})
    if choke or core:
        changed["choke"] = _choke(nominal.choke, choke, core.get("eddy_loss", 1.0))
    if "thermal" in by_section:
        changed["heat"] = _heat(nominal, by_section["thermal"])
    return replace(nominal, **changed)


def _scaled(element: Any, section: str, factors: Mapping[str, float]) -> Any:
    values = {
        field: factor * getattr(element, field)
        for name, factor in factors.items()
        for field in FIELDS[section][name]
        if getattr(element, field) is not None
    }
    return replace(element, **values) if values else element


def _own_regulator(regulator: Any) -> Any:
    return replace(
        regulator,
        reference_min=regulator.reference,
        reference_max=regulator.reference,
        adjust_current_max=regulator.adjust_current,
        quiescent_current_max=regulator.quiescent_current,
        output_inductance_factor=1.0,
        current_limit_min=regulator.current_limit,
    )


def _own_transistor(transistor: Any) -> Any:
    return replace(
        transistor,
        gain_min=transistor.gain,
        base_emitter_max=transistor.base_emitter,
        saturation_voltage_limit=transistor.saturation_voltage,
        saturation_resistance_limit=transistor.saturation_resistance,
    )


def _own_rectifier(rectifier: RectifierElement, nominal: RectifierElement) -> RectifierElement:
    between = nominal.threshold_limit - nominal.threshold if rectifier.parallel > 1 else 0.0
    return replace(rectifier, threshold_limit=rectifier.threshold + between, slope_limit=rectifier.slope)


def _choke(choke: ChokeElement, factors: Mapping[str, float], eddy: float) -> ChokeElement:
    permeability = factors.get("permeability", 1.0)
    winding = choke.winding
    bias = factors.get("saturation", 1.0)
    if winding is not None:
        if winding.material.kind == "ferrite" and winding.material.bias_field is None:
            bias /= permeability
        winding = _winding(winding, permeability, eddy)
    return replace(
        choke,
        inductance=choke.inductance * permeability * factors.get("inductance", 1.0),
        bias_current=choke.bias_current * bias,
        resistance=choke.resistance * factors.get("resistance", 1.0),
        winding=winding,
    )


def _winding(winding: WindingElement, permeability: float, eddy: float) -> WindingElement:
    """The bias field of a powder stays as the table has it, as where a design file gives a permeability."""
    material, losses = winding.material, winding.material.loss_coefficients
    if eddy != 1.0 and losses is not None:
        material = replace(material, loss_d=losses[3] * eddy)
    return replace(
        winding,
        permeability_factor=winding.permeability_factor * permeability,
        inductance_factor=winding.inductance_factor * permeability,
        material=material,
    )


def _heat(nominal: ResolvedDesign, factors: Mapping[str, float]) -> HeatPaths:
    heat = nominal.heat
    changed: dict[str, Any] = {}
    if "heatsink" in factors and heat.shared_heatsink is not None:
        changed["shared_heatsink"] = heat.shared_heatsink * factors["heatsink"]
    for device in DEVICES:
        path: HeatPath = getattr(heat, device)
        pad = (
            factors.get("pad", 1.0) if _has_common_pad(nominal, device) else factors.get(f"{device}.pad", 1.0)
        )
        sink = path.heatsink
        if sink is not None:
            sink *= factors.get(f"{device}.heatsink", 1.0)
        changed[device] = replace(path, pad=path.pad * pad, heatsink=sink)
    return replace(heat, **changed)
