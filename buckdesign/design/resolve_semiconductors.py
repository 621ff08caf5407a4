"""Transistor and rectifier: from data-sheet values to what the loop model and the checks take."""

from __future__ import annotations

import math

from buckdesign.design.elements import RectifierElement, TransistorElement
from buckdesign.design.merging import first_known, picked, table_value, table_value_or_none
from buckdesign.design.sections import RectifierSection, TransistorSection
from buckdesign.parts import Rectifier, Tables, Transistor
from buckdesign.physics.diode import (
    FORWARD_TEMPERATURE_COEFFICIENT,
    LEAKAGE_COEFFICIENT,
    TYPICAL_OF_LIMIT,
    threshold_and_slope,
)
from buckdesign.physics.pnp import (
    CHARGE_TIME_DEFAULT,
    TYPICAL_GAIN_RATIO,
    charge_time_from_transition_frequency,
    gain_law_from_two_points,
    gain_low_from_point,
    knee_from_rating,
    saturation_resistance,
)
from buckdesign.physics.recovery import TEST_SLOPE, charge_at_crossing
from buckdesign.physics.switching import charge_time_from_storage

BASE_EMITTER_VOLTAGE = 0.75
"""Base-emitter voltage of a conducting power transistor at 25 degC [V] (common practice, no source)."""

SATURATION_THRESHOLD = 0.2
"""Saturation voltage of a power transistor extrapolated to no current [V] (common practice, no source)."""

POWER_LEAKAGE, POWER_LEAKAGE_C = 5e-3, 150.0
"""Collector leakage of a power transistor where its sheet is not at hand [A] at a junction temperature
[degC] (from
memory: limits of registered TO-3 types are 5-10 mA; its loss is of the order of a milliwatt)."""

STANDARD_LIFETIME = 1e-6
"""Lifetime of the carriers in a rectifier without recovery data [s] (from memory: standard ones, 1 us)."""

ONE_POINT_THRESHOLD_SHARE = 0.75
"""Threshold over forward drop at rated current where a sheet gives one point (common practice, no source: the
two-point fits of Schottky and ultrafast types lie at 0.6-0.85)."""

FALLBACK_LEAKAGE_COEFFICIENT = math.log(2.0) / 10.0
"""Exponent of a leakage that doubles every 10 K [1/K] (common practice, no source)."""

LEAKAGE_TEMPERATURE_C = 25.0
"""Junction temperature of a leakage that is given without one [degC] (data sheets' usual condition)."""


def resolve_transistor(
    section: TransistorSection, tables: Tables, assumptions: list[str]
) -> TransistorElement:
    """Transistor of a design with every value in place.

    Parameters
    ----------
    section : TransistorSection
        The table ``[transistor]`` of a design file.
    tables : Tables
        Parts that it may name.
    assumptions : list of str
        Gets a sentence for each value that had to be assumed.

    Returns
    -------
    TransistorElement
        Typical and limit values.
    """
    part = None if section.part is None else tables.transistor(section.part)
    law = (math.nan, math.inf) if part is None else _gain_law(part, assumptions)
    typical = first_known(section.gain, law[0] * TYPICAL_GAIN_RATIO)
    emitter = first_known(section.base_emitter, BASE_EMITTER_VOLTAGE)
    threshold, slope = (0.0, 0.0) if part is None else _saturation(part)
    drop, resistance = section.saturation_voltage, section.saturation_resistance
    return TransistorElement(
        name=None if part is None else part.name,
        package=None if part is None else part.package or None,
        gain_min=typical if part is None else min(law[0], typical),
        gain=typical,
        gain_knee=first_known(section.gain_knee, law[1]),
        charge_time=_charge_time(section, part, law[0], assumptions),
        base_emitter=emitter,
        base_emitter_max=max(emitter, table_value(part, "base_emitter_max", emitter)),
        saturation_voltage=first_known(drop, TYPICAL_OF_LIMIT * threshold),
        saturation_resistance=first_known(resistance, TYPICAL_OF_LIMIT * slope),
        saturation_voltage_limit=first_known(drop, threshold)
        if part is None
        else max(threshold, first_known(drop, 0.0)),
        saturation_resistance_limit=first_known(resistance, slope)
        if part is None
        else max(slope, first_known(resistance, 0.0)),
        saturation_forced_gain=_forced_gain(section, part),
        leakage=0.0 if part is None else table_value(part, "leakage_hot", POWER_LEAKAGE),
        leakage_at_c=table_value(part, "leakage_hot_c", POWER_LEAKAGE_C),
        **_safe_area(part, assumptions),
        collector_voltage=first_known(
            section.collector_voltage, table_value_or_none(part, "collector_voltage")
        ),
        collector_current=first_known(
            section.collector_current, table_value_or_none(part, "collector_current")
        ),
        junction_case=first_known(section.junction_case, table_value_or_none(part, "junction_case")),
        junction_limit_c=first_known(section.junction_limit, table_value_or_none(part, "junction_limit_c")),
    )


_AREA_POINTS = (
    "breakdown_voltage", "breakdown_current", "breakdown_far_voltage", "breakdown_far_current",
    "pulse_voltage", "pulse_current", "pulse_duration",
)  # fmt: skip


def _safe_area(part: Transistor | None, assumptions: list[str]) -> dict[str, float | None]:
    """Points of the safe area, or a word that there are none."""
    if part is not None and part.breakdown_voltage is None:
        assumptions.append(
            f"{part.name}: no second-breakdown data: only its power and current limits are checked; "
            "compare with the safe area of its data sheet"
        )
    return {name: table_value_or_none(part, name) for name in _AREA_POINTS}


def _gain_law(part: Transistor, assumptions: list[str]) -> tuple[float, float]:
    """Guaranteed gain at small current and knee current, through the two points at the lowest currents.

    A knee below the first of them is no result: all that is left of the gain there would be extrapolated.
    """
    (current_1, gain_1), *others = part.gain_points
    if others:
        current_2, gain_2 = others[0]
        gain, knee = gain_law_from_two_points(gain_1, current_1, gain_2, current_2)
        if math.isfinite(float(gain)) and knee >= current_1:
            return float(gain), float(knee)
    knee = float(knee_from_rating(part.collector_current))
    assumptions.append(f"{part.name}: gain knee at rated current / 2.5 = {knee:.3g} A")
    return float(gain_low_from_point(gain_1, current_1, knee)), knee


def _saturation(part: Transistor) -> tuple[float, float]:
    """Threshold and slope through the limit value."""
    limit = part.saturation_voltage_max
    threshold = min(SATURATION_THRESHOLD, limit / 2)
    return threshold, float(saturation_resistance(limit, part.saturation_current, threshold))


def _forced_gain(section: TransistorSection, part: Transistor | None) -> float | None:
    if part is None or section.saturation_voltage is not None or part.saturation_base_current is None:
        return None
    return part.saturation_current / part.saturation_base_current


def _charge_time(
    section: TransistorSection, part: Transistor | None, gain_min: float, assumptions: list[str]
) -> float:
    """``tau``: inline; from the transition frequency, guaranteed gain and frequency taken together (typical
    values of both are larger alike); from the storage time; else assumed.
    """
    if section.charge_time is not None:
        return section.charge_time
    if part is not None and part.transition_frequency_min is not None:
        return float(charge_time_from_transition_frequency(gain_min, part.transition_frequency_min))
    if part is not None and part.storage_time is not None:
        drive, collector = part.switching_base_current, part.switching_current
        if drive is not None and collector is not None:
            typical = gain_min * TYPICAL_GAIN_RATIO
            time = float(charge_time_from_storage(part.storage_time, drive, drive, collector, typical))
            if math.isfinite(time):
                return time
    name = "transistor" if part is None else part.name
    assumptions.append(f"{name}: charge lifetime {CHARGE_TIME_DEFAULT * 1e6:g} us, no value is known")
    return CHARGE_TIME_DEFAULT


def resolve_rectifier(section: RectifierSection, tables: Tables, assumptions: list[str]) -> RectifierElement:
    """Rectifier of a design with every value in place.

    Parameters
    ----------
    section : RectifierSection
        The table ``[rectifier]`` of a design file.
    tables : Tables
        Parts that it may name.
    assumptions : list of str
        Gets a sentence for each value that had to be assumed.

    Returns
    -------
    RectifierElement
        Typical and limit values.
    """
    part = None if section.part is None else tables.rectifier(section.part)
    limit = (0.0, 0.0) if part is None else _forward_limit(part, assumptions)
    typical = 1.0 if part is None or part.forward_limit == "typ" else TYPICAL_OF_LIMIT
    threshold, slope = (
        first_known(section.threshold, typical * limit[0]),
        first_known(section.slope, typical * limit[1]),
    )
    leakage, leakage_at = _leakage(section, part)
    charge, charge_current = _recovery(section, part, assumptions)
    return RectifierElement(
        name=None if part is None else part.name,
        kind=None if part is None else part.kind,
        parallel=section.parallel,
        threshold=threshold,
        slope=slope,
        threshold_limit=max(threshold, limit[0]),
        slope_limit=max(slope, limit[1]),
        forward_coefficient=_forward_coefficient(part),
        recovery_charge=charge,
        recovery_current=charge_current,
        recovery_time=table_value_or_none(part, "recovery_time"),
        leakage=leakage,
        leakage_at_c=leakage_at,
        leakage_coefficient=_leakage_coefficient(part),
        capacitance=picked(section, part, "capacitance", 0.0),
        reverse_voltage=first_known(section.reverse_voltage, table_value_or_none(part, "reverse_voltage")),
        average_current=first_known(section.average_current, table_value_or_none(part, "average_current")),
        junction_case=first_known(section.junction_case, table_value_or_none(part, "junction_case")),
        junction_ambient=table_value_or_none(part, "junction_ambient"),
        junction_limit_c=first_known(section.junction_limit, table_value_or_none(part, "junction_limit_c")),
    )


def _forward_limit(part: Rectifier, assumptions: list[str]) -> tuple[float, float]:
    """Threshold and slope through the sheet's points."""
    drop, current = part.forward_voltage_1, part.forward_current_1
    if part.forward_voltage_2 is not None and part.forward_current_2 is not None:
        threshold, slope = threshold_and_slope(drop, current, part.forward_voltage_2, part.forward_current_2)
        if threshold > 0 and slope >= 0:
            return float(threshold), float(slope)
    threshold = ONE_POINT_THRESHOLD_SHARE * drop
    assumptions.append(
        f"{part.name}: threshold {ONE_POINT_THRESHOLD_SHARE:.0%} of the drop at {current:g} A, "
        "the sheet gives one usable point"
    )
    return threshold, (drop - threshold) / current


def _leakage(section: RectifierSection, part: Rectifier | None) -> tuple[float, float]:
    """Leakage and its temperature; of the two limits of a part the hot one, which is nearer to its use."""
    if section.leakage is not None:
        return section.leakage, first_known(section.leakage_at, LEAKAGE_TEMPERATURE_C)
    if part is None:
        return 0.0, LEAKAGE_TEMPERATURE_C
    if part.leakage_hot is not None and part.leakage_hot_c is not None:
        return part.leakage_hot, part.leakage_hot_c
    return first_known(part.leakage, 0.0), LEAKAGE_TEMPERATURE_C


def _leakage_coefficient(part: Rectifier | None) -> float:
    if part is None:
        return FALLBACK_LEAKAGE_COEFFICIENT
    if part.leakage_coefficient is not None:
        return part.leakage_coefficient
    return LEAKAGE_COEFFICIENT.get(part.kind, FALLBACK_LEAKAGE_COEFFICIENT)


def _recovery(
    section: RectifierSection, part: Rectifier | None, assumptions: list[str]
) -> tuple[float, float | None]:
    """Recovery charge and the current it was measured at; a part without counts as a standard rectifier."""
    if section.recovery_charge is not None:
        return section.recovery_charge, None
    if part is None:
        return 0.0, None
    charge, current = part.recovery_charge, part.recovery_current
    if charge is None and part.kind != "Schottky":
        current = part.average_current if current is None else current
        charge = float(charge_at_crossing(current, TEST_SLOPE, STANDARD_LIFETIME))
        shown = f"{charge * 1e9:.0f} nC"
        assumptions.append(f"{part.name}: no recovery data, taken as a standard rectifier, {shown}")
    return (charge, current) if charge else (0.0, None)


def _forward_coefficient(part: Rectifier | None) -> float:
    if part is None:
        return 0.0
    if part.forward_coefficient is not None:
        return part.forward_coefficient
    return FORWARD_TEMPERATURE_COEFFICIENT.get(part.kind, (0.0, 0.0))[1]
