"""What to mind: at an operating point, with this circuit at all, and what the numbers rest on."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from buckdesign.design.checks import Limit
from buckdesign.design.elements import CapacitorElement, ResolvedDesign
from buckdesign.design.heat_paths import heat_data
from buckdesign.design.losses import flux_density_swing, loop_losses
from buckdesign.design.operated import Operated
from buckdesign.design.operating_point import Transient
from buckdesign.design.runaway_search import runaway_ambient
from buckdesign.design.sections import DEVICES
from buckdesign.design.temperatures import device_heat, runaway_reach
from buckdesign.loop.results import SteadyStates
from buckdesign.physics.capacitor import tantalum_is_safe
from buckdesign.physics.core_loss import RANGES as CORE_RANGES
from buckdesign.physics.regulator import THERMAL_SHUTDOWN_C
from buckdesign.physics.thermal import CORE_FAULT_C, CORE_WARNING_C
from buckdesign.units import format_quantity

AUDIBLE = 16e3
"""Frequency below which the choke may be heard [Hz] (common practice: the limit of hearing)."""

RUNAWAY_CLOSE = 2.0
"""Growth of the leakage up to runaway below which a warning is due [1] (own choice: parts differ by more)."""

IGNITION_POWER = 15.0
"""Output power above which a fault can ignite things [W] (IEC 62368-1 6.2.2, limit of PS1, from memory)."""

FUSE_RATIO = (1.25, 1.6)
"""Rating of a time-lag fuse over the input current at full load [1] (common practice, from memory)."""

TOUCHABLE_V = 60.0
"""Direct voltage above which touching is not safe [V] (IEC 62368-1 table 4, limit of ES1, from memory)."""

DISCHARGE_V, DISCHARGE_C = 25.0, 25e-6
"""Output above which a capacitor above this size discharges through the regulator [V], [F] (data sheets of
the class, from memory)."""

DRIVE_LIMITED = 0.05
"""Share of the conducting time in the active region from which the drive is too small [1] (own choice)."""

SET_VOLTAGE_BAND = 0.05
"""Distance of the divider's voltage from the nominal one that is worth a warning [1] (own choice)."""

START_MARGIN_LOW = 1.5
"""Start margin below which starting is worth a warning [1] (own choice)."""

RESIDUAL_LIMIT = 1e-6
"""Energy that may stay unexplained, relative to the input [1]."""

STORED_SHARE = 0.01
"""Share of the input that a window may leave stored before it is worth a warning [1] (own choice)."""

TOUCH_C = 60.0
"""Surface that burns the skin within seconds [degC] (burn data of metal: 60 degC in less than 5 s)."""

MODEL_ASSUMPTIONS = (
    "the collector-base charge of the transistor is neglected: switching takes about 20 % longer",
    "the permeability of iron powder rises a little with the ripple; here it is that without ripple",
    "the regulator's output inductance falls with its current; here it is constant",
    "inductance of the layout is neglected",
)


def point_warnings(
    operated: Operated, resolved: ResolvedDesign, limits: Sequence[Limit], index: int
) -> tuple[str, ...]:
    """What to mind at one operating point.

    Parameters
    ----------
    operated : Operated
        Operating points of one design.
    resolved : ResolvedDesign
        The design.
    limits : sequence of Limit
        Of the same points, see `buckdesign.design.checks.part_limits`.
    index : int
        Which point.

    Returns
    -------
    tuple of str
        One sentence each, the gravest first.
    """
    found = [
        *_heat_warnings(operated, resolved, index),
        *_regime_warnings(operated, index),
        *_oscillation_warnings(operated, index),
        *_start_warnings(operated, index),
        *_output_warnings(operated, resolved, index),
        *_core_warnings(operated, resolved, index),
        *_source_warnings(resolved),
    ]
    unknown = [limit.name for limit in limits if _is_unrated(limit, operated, resolved, index)]
    if unknown:
        found.append("not checked, no rating is known: " + ", ".join(unknown))
    return tuple(found)


def _is_unrated(limit: Limit, operated: Operated, resolved: ResolvedDesign, index: int) -> bool:
    if limit.applies[index] or limit.name == "base drive" or limit.name.endswith(("life", "density")):
        return False
    if limit.name.startswith("input capacitor") and resolved.input_capacitor is None:
        return False
    if limit.unit == "degC":
        return False
    return bool(np.isnan(limit.limit[index]))


def _heat_warnings(operated: Operated, resolved: ResolvedDesign, index: int) -> list[str]:
    if operated.electrical_only:
        return []
    found = []
    margin, begins = _runaway(operated, resolved, index)
    if operated.balance.runaway[index]:
        found.append(
            "thermal runaway of the rectifier: with temperature its leakage grows faster than the heat "
            f"leaves, from {begins:.0f} degC ambient up"
        )
    elif margin < RUNAWAY_CLOSE:
        found.append(
            f"close to thermal runaway of the rectifier: {margin:.2g} times its leakage would do, or an "
            f"ambient of {begins:.0f} degC"
        )
    if operated.junction("regulator")[index] > THERMAL_SHUTDOWN_C:
        hot = operated.junction("regulator")[index]
        found.append(
            f"the regulator at {hot:.0f} degC would shut down (at about {THERMAL_SHUTDOWN_C:g} degC): "
            "the output falls"
        )
    if not operated.is_settled[index]:
        found.append("losses and temperatures did not settle; the temperatures are those of the last run")
    found += _unknown_temperatures(operated, resolved, index)
    choke = operated.balance.choke_c[index]
    if CORE_WARNING_C < choke <= CORE_FAULT_C:
        found.append(f"choke at {choke:.0f} degC: iron powder ages from {CORE_WARNING_C:g} degC up")
    return found


def _runaway(operated: Operated, resolved: ResolvedDesign, index: int) -> tuple[float, float]:
    """Margin of the rectifier's leakage [1], ambient at which runaway begins [degC]; NaN: no leakage."""
    part = slice(index, index + 1)
    loop = SteadyStates(values=operated.loop.values[part], ends=operated.loop.ends[part])
    heat = device_heat(operated.balance.losses)[part]
    data = operated.data.part(np.array([index]))
    margin, begins = runaway_reach(loop, heat, data, heat_data([resolved]), operated.ambient_c[part])
    if operated.balance.runaway[index]:
        begins = runaway_ambient(operated.base_rows[part], [resolved], operated.ambient_c[part])
    return float(margin[0]), float(begins[0])


def _unknown_temperatures(operated: Operated, resolved: ResolvedDesign, index: int) -> list[str]:
    heat = resolved.heat
    reasons: dict[str, list[str]] = {}
    for name in DEVICES:
        path, element = getattr(heat, name), getattr(resolved, name)
        cooled = path.heatsink is not None or (path.is_shared and heat.shared_heatsink is not None)
        if np.isnan(operated.junction(name)[index]) and not operated.balance.runaway[index]:
            missing = "junction_case" if cooled and element.junction_case is None else "heat sink"
            reasons.setdefault(missing, []).append(name)
    return [
        f"no {missing} is given: no temperature of {_listed(names)}" for missing, names in reasons.items()
    ]


def _listed(names: Sequence[str]) -> str:
    return names[0] if len(names) == 1 else f"{', '.join(names[:-1])} and {names[-1]}"


def _regime_warnings(operated: Operated, index: int) -> list[str]:
    loop = operated.loop
    regime = loop.regimes()[index]
    burns = operated.balance.losses["transistor_switching"][index]
    power = format_quantity(float(burns), "W", ascii_only=True)
    found = []
    match regime:
        case "stuck":
            found.append(f"regulates without oscillating: the transistor burns {power}")
        case "dropout":
            found.append("drop-out: the drive is at its limit and the output sags; the supply is too low")
        case "overload":
            found.append(f"overload: the transistor limits the current and burns {power}")
    if loop.column("settled")[index] == 0.0:
        found.append("no steady state was found in the time simulated; the averages are those of its end")
    if loop.column("energy_residual")[index] > RESIDUAL_LIMIT:
        found.append(f"the energy accounts leave {loop.column('energy_residual')[index]:.1e} unexplained")
    return found


def _oscillation_warnings(operated: Operated, index: int) -> list[str]:
    loop = operated.loop
    frequency, period = loop.column("frequency_hz")[index], loop.column("period_cycles")[index]
    found = []
    if period < 0.0:
        spread = loop.column("cycle_spread")[index]
        found.append(f"irregular oscillation: periods spread by {spread:.0%}")
        cut = abs(_stored_share(operated, index))
        if cut > STORED_SHARE:
            found.append(
                f"the bursts are longer than the time averaged over: powers are uncertain by {cut:.0%}"
            )
    elif period > 1.0:
        found.append(f"the oscillation repeats only after {period:.0f} cycles")
    if loop.column("active_fraction")[index] > DRIVE_LIMITED:
        share = loop.column("active_fraction")[index]
        found.append(f"drive-limited: the transistor conducts unsaturated {share:.0%} of its time")
    if 0.0 < frequency < AUDIBLE:
        shown = format_quantity(float(frequency), "Hz", ascii_only=True)
        found.append(f"{shown} can be heard: glue the turns down, or fix the ring in varnish")
    return found


def _stored_share(operated: Operated, index: int) -> float:
    """Input of the window that was only stored, relative to the input [1]."""
    loop = operated.loop
    drawn = loop.column("input_w")[index]
    spent = loop.column("load_w")[index] + sum(loss[index] for loss in loop_losses(loop).values())
    return float((drawn - spent) / max(drawn, 1e-12))


def _start_warnings(operated: Operated, index: int) -> list[str]:
    margin = operated.loop.column("start_margin")[index]
    if np.isnan(margin) or margin >= START_MARGIN_LOW:
        return []
    if margin < 1.0:
        return [
            f"start margin {margin:.2g}: it does not start to oscillate by itself; whether it runs or burns "
            "depends on how the supply rises"
        ]
    return [f"start margin {margin:.2g}: close to 1, where it no longer starts by itself"]


def _output_warnings(operated: Operated, resolved: ResolvedDesign, index: int) -> list[str]:
    found = []
    nominal, wanted = resolved.design.output.voltage, operated.set_voltage[index]
    if abs(wanted - nominal) > SET_VOLTAGE_BAND * nominal:
        found.append(
            f"the divider sets {wanted:.4g} V, {wanted / nominal - 1.0:+.1%} from the nominal {nominal:g} V"
        )
    regulator = resolved.regulator
    least = regulator.reference / resolved.network.r1 + operated.load[index]
    if least < regulator.quiescent_current_max:
        need = format_quantity(regulator.quiescent_current_max, "A", ascii_only=True)
        found.append(f"divider and load draw less than the {need} that the regulator may need to regulate")
    return found


def _core_warnings(operated: Operated, resolved: ResolvedDesign, index: int) -> list[str]:
    winding = resolved.choke.winding
    if winding is None:
        return []
    found = []
    material = winding.material
    loop = operated.loop
    switches = loop.column("frequency_hz")[index] > 0.0
    if material.kind == "ferrite":
        found.append(f"{material.name}: a ferrite ring without a gap saturates under the load current")
    if switches and material.loss_coefficients is None and not operated.electrical_only:
        found.append(f"{material.name}: no core loss is known; losses and temperature lack it")
    peak = flux_density_swing(loop, operated.data)[index] / 2.0
    if switches and material.loss_coefficients is not None:
        low, high = CORE_RANGES["three_term_loss"]["peak_flux"]
        if peak > high or peak < 0.2 * low:
            found.append(f"core loss at {peak * 1e3:.3g} mT is beyond the published points")
    field = winding.turns * loop.column("choke_max_a")[index] / winding.effective_length
    if material.bias_field_limit is not None and field > material.bias_field_limit:
        limit = material.bias_field_limit
        found.append(f"{field:.0f} A/m in the core: the law of permeability is known up to {limit:.0f} A/m")
    return found


def _source_warnings(resolved: ResolvedDesign) -> list[str]:
    supply = resolved.design.supply
    given = [
        word
        for word, value in (
            ("resistance", supply.resistance),
            ("inductance", supply.inductance),
            ("ripple", supply.ripple),
        )
        if value > 0.0
    ]
    if not given:
        return []
    verb = "are" if len(given) > 1 else "is"
    return [f"the supply is taken as stiff: its {' and '.join(given)} {verb} not in this simulation"]


def start_warnings(transient: Transient, resolved: ResolvedDesign) -> tuple[str, ...]:
    """What to mind at a start from rest.

    Parameters
    ----------
    transient : Transient
        The start.
    resolved : ResolvedDesign
        The design.

    Returns
    -------
    tuple of str
        One sentence each.
    """
    found = []
    rated, peak = resolved.transistor.collector_current, transient.peak_choke_a
    if rated is not None and peak > rated:
        found.append(
            f"at switch-on the transistor carries up to {peak:.3g} A, rated {rated:g} A: let the supply rise over "
            "some milliseconds, or take one rated for it"
        )
    nominal = resolved.design.output.voltage
    if transient.peak_output_v > (1.0 + SET_VOLTAGE_BAND) * nominal:
        found.append(f"at switch-on the output overshoots to {transient.peak_output_v:.4g} V")
    if transient.settling_s is None:
        found.append("the output did not settle in the time simulated")
    if resolved.design.supply.rise_time > 0.0:
        found.append("the supply is switched on at once: its rise time is not in this simulation")
    return tuple(found)


def cautions(operated: Operated, resolved: ResolvedDesign, index: int) -> tuple[str, ...]:
    """What to mind with this circuit at all, with its own numbers.

    Parameters
    ----------
    operated : Operated
        Operating points of one design.
    resolved : ResolvedDesign
        The design.
    index : int
        Which point the temperatures are taken at; fuse and faults go by the worst of all points.

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
    hot = [name for name in DEVICES if operated.junction(name)[index] > TOUCH_C]
    if operated.balance.choke_c[index] > TOUCH_C:
        hot.append("choke")
    if hot:
        found.append(f"hot to the touch, and its surroundings: {_listed(hot)}")
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
        if _is_weak_tantalum(capacitor, voltage):
            found.append(f"{side} capacitor: tantalum can catch fire; rate it for twice the voltage")
    return found


def _is_weak_tantalum(capacitor: CapacitorElement | None, voltage: float) -> bool:
    if capacitor is None or capacitor.rated_voltage is None or capacitor.name is None:
        return False
    return capacitor.name.startswith("tantalum") and not tantalum_is_safe(capacitor.rated_voltage, voltage)
