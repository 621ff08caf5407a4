"""Ratings of a design's parts as arrays, one entry an operating point, for the checks."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from buckdesign.design.elements import (
    CapacitorElement,
    RectifierElement,
    ResolvedDesign,
    TransistorElement,
    WindingElement,
)
from buckdesign.design.losses import Floats, data_by_point
from buckdesign.design.sections import DEVICES
from buckdesign.physics.thermal import CORE_FAULT_C


@dataclass(frozen=True, kw_only=True)
class RatingData:
    """Ratings of the parts, arrays of shape (n, ...); NaN: not known. Names and units as in the elements.

    Attributes
    ----------
    saturation_extra : NDArray
        Saturation drop at its limit over the typical one, threshold [V] and slope [ohm], shape (n, 2).
    breakdown : NDArray
        Points of the transistor's second-breakdown limit: voltage and current of the near one, of the far one
        [V], [A], shape (n, 4).
    pulse : NDArray
        Point of its safe area for one pulse [V], [A] and the length [s], shape (n, 3).
    transistor_case : NDArray
        From its junction to its case [K/W].
    threshold_extra, slope_extra : NDArray
        Forward drop of a rectifier at its limit over the typical one [V], [ohm]; in parallel the first
        also counts as the spread between pieces.
    output, input : NDArray
        Rated voltage [V], ripple current [A], life [h] and its temperature [degC], shape (n, 4).
    junction_limit : NDArray
        Devices in the order of `DEVICES` [degC], shape (n, 3).
    choke_limit : NDArray
        [degC].
    flux : NDArray
        Turns [1], effective length [m], permeability [1], bias field [A/m], exponent [1], saturation [T],
        shape (n, 6).
    """

    collector_voltage: Floats
    collector_current: Floats
    gain_min: Floats
    base_emitter_max: Floats
    saturation_extra: Floats
    breakdown: Floats
    pulse: Floats
    transistor_case: Floats
    reverse_voltage: Floats
    average_current: Floats
    threshold_extra: Floats
    forward_coefficient: Floats
    slope: Floats
    slope_extra: Floats
    pieces: Floats
    max_difference: Floats
    current_limit_min: Floats
    rdrive_power: Floats
    rbe_power: Floats
    output: Floats
    input: Floats
    junction_limit: Floats
    choke_limit: Floats
    flux: Floats


_DEPENDS = (*DEVICES, "network", "output_capacitor", "input_capacitor", "choke")


def rating_data(resolved: Sequence[ResolvedDesign]) -> RatingData:
    """`RatingData` of the design of each point."""
    return data_by_point(resolved, _rating_record, RatingData, _DEPENDS)


def _known(value: float | None) -> float:
    return np.nan if value is None else value


def _rating_record(resolved: ResolvedDesign) -> dict[str, Any]:
    transistor, rectifier, regulator = resolved.transistor, resolved.rectifier, resolved.regulator
    return {
        "collector_voltage": _known(transistor.collector_voltage),
        "collector_current": _known(transistor.collector_current),
        "gain_min": transistor.gain_min,
        "base_emitter_max": transistor.base_emitter_max,
        "saturation_extra": (
            transistor.saturation_voltage_limit - transistor.saturation_voltage,
            transistor.saturation_resistance_limit - transistor.saturation_resistance,
        ),
        **_safe_area_record(transistor),
        **_rectifier_record(rectifier),
        "max_difference": _known(regulator.max_difference),
        "current_limit_min": regulator.current_limit_min,
        "rdrive_power": _known(resolved.network.rdrive_power),
        "rbe_power": _known(resolved.network.rbe_power),
        "output": _capacitor_record(resolved.output_capacitor),
        "input": _capacitor_record(resolved.input_capacitor),
        "junction_limit": [_known(getattr(resolved, name).junction_limit_c) for name in DEVICES],
        "choke_limit": _choke_limit(resolved.choke.winding),
        "flux": _flux_record(resolved.choke.winding),
    }


def _safe_area_record(transistor: TransistorElement) -> dict[str, Any]:
    near = (transistor.breakdown_voltage, transistor.breakdown_current)
    far = (transistor.breakdown_far_voltage, transistor.breakdown_far_current)
    pulse = (transistor.pulse_voltage, transistor.pulse_current, transistor.pulse_duration)
    return {
        "breakdown": tuple(map(_known, near + far)),
        "pulse": tuple(map(_known, pulse)),
        "transistor_case": _known(transistor.junction_case),
    }


def _rectifier_record(rectifier: RectifierElement) -> dict[str, Any]:
    return {
        "reverse_voltage": _known(rectifier.reverse_voltage),
        "average_current": _known(rectifier.average_current),
        "threshold_extra": rectifier.threshold_limit - rectifier.threshold,
        "forward_coefficient": rectifier.forward_coefficient,
        "slope": rectifier.slope,
        "slope_extra": rectifier.slope_limit - rectifier.slope,
        "pieces": float(rectifier.parallel),
    }


def _capacitor_record(capacitor: CapacitorElement | None) -> tuple[float, ...]:
    if capacitor is None:
        return (np.nan,) * 4
    return (
        _known(capacitor.rated_voltage),
        _known(capacitor.ripple_current),
        _known(capacitor.life),
        _known(capacitor.life_temperature_c),
    )


def _choke_limit(winding: WindingElement | None) -> float:
    if winding is None:
        return np.nan
    limit = winding.material.temperature_limit_c
    if winding.material.kind == "iron powder" or limit is None:
        return CORE_FAULT_C
    return limit


def _flux_record(winding: WindingElement | None) -> tuple[float, ...]:
    """Turns, effective length, permeability, bias field, exponent, saturation."""
    if winding is None:
        return (np.nan,) * 6
    material = winding.material
    saturation = material.saturation_hot if material.saturation_hot is not None else material.saturation
    return (
        float(winding.turns),
        winding.effective_length,
        material.permeability * winding.permeability_factor,
        1e12 if material.bias_field is None else material.bias_field,
        1.5 if material.bias_exponent is None else material.bias_exponent,
        _known(saturation),
    )
