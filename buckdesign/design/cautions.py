"""What to mind with this circuit at all, with its own numbers: fuse, faults, capacitors, hot surfaces."""

from __future__ import annotations

from buckdesign.design.elements import CapacitorElement, ResolvedDesign
from buckdesign.design.operated import Operated
from buckdesign.design.touch import touch_cautions
from buckdesign.physics.capacitor import tantalum_is_safe, tantalum_rated_voltage
from buckdesign.units import format_quantity

TANTALUM = "tantalum"
"""Kind of capacitor that wants twice the voltage."""

IGNITION_POWER = 15.0
"""Output power above which a fault can ignite things [W] (IEC 62368-1 6.2.2, limit of PS1, from memory)."""

FUSE_RATIO = (1.25, 1.6)
"""Rating of a time-lag fuse over the input current at full load [1] (common practice, from memory)."""

TOUCHABLE_V = 60.0
"""Direct voltage above which touching is not safe [V] (IEC 62368-1 table 4, limit of ES1, from memory)."""

DISCHARGE_V, DISCHARGE_C = 25.0, 25e-6
"""Output above which a capacitor above this size discharges through the regulator [V], [F] (data sheets of
the class, from memory)."""


def cautions(operated: Operated, resolved: ResolvedDesign, index: int) -> tuple[str, ...]:
    """What to mind with this circuit at all, with its own numbers.

    Parameters
    ----------
    operated : Operated
        Operating points of one design.
    resolved : ResolvedDesign
        The design.
    index : int
        Which point; fuse, faults and hot surfaces go by the worst of all points.

    Returns
    -------
    tuple of str
        One sentence each.
    """
    supply = float(operated.parameter("supply_voltage").max())
    found = [
        "the transistor removes the regulator's short-circuit protection: "
        f"fuse the input ({_fuse(operated)}); "
        f"a shorted transistor puts the whole {supply:.3g} V on the load",
        _short_circuit(operated, index, supply),
        *_capacitor_cautions(resolved, operated, index, supply),
    ]
    difference = resolved.regulator.max_difference
    if difference is not None and supply > difference:
        found.append(
            f"with the output shorted the regulator sees more than the {difference:g} V that it is made for"
        )
    found += touch_cautions(operated, resolved)
    found += _safety(operated, resolved, index, supply)
    margin = operated.loop.column("start_margin")[index]
    if margin < 3.0:
        found.append("a supply that rises slowly may leave it unsaturated at first: switch it on fast")
    found += [
        "a bypass capacitor at the regulator's input or adjust pin changes the loop: leave it out",
        "low-voltage stage: whatever is on the mains side belongs to local codes and licensed practice",
    ]
    return tuple(found)


def _fuse(operated: Operated) -> str:
    current = float((operated.input_power / operated.parameter("supply_voltage")).max())
    low, high = (format_quantity(ratio * current, "A", digits=2, ascii_only=True) for ratio in FUSE_RATIO)
    return f"time-lag, {low} to {high} for this load"


def _safety(operated: Operated, resolved: ResolvedDesign, index: int, supply: float) -> list[str]:
    """Limits of safety standards that the stage passes."""
    found = []
    power, output = float(operated.output_power[index]), float(operated.set_voltage[index])
    if supply > TOUCHABLE_V:
        found.append(f"{supply:.3g} V: above {TOUCHABLE_V:g} V direct voltage is not safe to touch")
    if power > IGNITION_POWER:
        found.append(
            f"{power:.0f} W can ignite things in a fault: fuse or electronic limit, "
            "and nothing that burns close by"
        )
    if output > DISCHARGE_V and resolved.output_capacitor.capacitance > DISCHARGE_C:
        found.append("output above 25 V: a diode from output to input keeps its capacitor off the regulator")
    return found


def _short_circuit(operated: Operated, index: int, supply: float) -> str:
    resistor = float(operated.parameter("drive_resistance")[index])
    path = resistor + float(operated.parameter("dropout_resistance")[index])
    across = supply - float(operated.parameter("base_emitter")[index] + operated.parameter("dropout")[index])
    limit = float(operated.parameter("current_limit")[index])
    current = min(limit, max(across, 0.0) / path) if path > 0.0 else limit
    shown = format_quantity(resistor * current * current, "W", digits=2, ascii_only=True)
    return f"in a short circuit the drive resistor burns first: up to {shown}"


def _capacitor_cautions(resolved: ResolvedDesign, operated: Operated, index: int, supply: float) -> list[str]:
    found = ["electrolytics: mind polarity and rated voltage"]
    if resolved.input_capacitor is not None:
        found.append("the input capacitor draws an inrush: contacts and fuse must stand it")
    output = float(operated.loop.column("output_max_v")[index])
    sides = (("output", resolved.output_capacitor, output), ("input", resolved.input_capacitor, supply))
    for side, capacitor, voltage in sides:
        if capacitor is not None and capacitor.rated_voltage is not None and _is_tantalum(capacitor):
            found += _tantalum(side, capacitor.rated_voltage, voltage)
    return found


def _is_tantalum(capacitor: CapacitorElement) -> bool:
    """By its kind, or by its name where a design file gives the ESR itself."""
    return capacitor.kind == TANTALUM or (capacitor.name or "").startswith(TANTALUM)


def _tantalum(side: str, rated: float, voltage: float) -> list[str]:
    if tantalum_is_safe(rated, voltage):
        return []
    applied, needed = (
        format_quantity(value, "V", ascii_only=True)
        for value in (voltage, float(tantalum_rated_voltage(voltage)))
    )
    return [
        f"{side} capacitor: tantalum can catch fire at switch-on: rated {rated:g} V at {applied}; take one rated "
        f"{needed} or more, or another kind"
    ]
