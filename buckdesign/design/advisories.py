"""What to mind at an operating point and at a start, and what the numbers rest on."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from buckdesign.design.checks import Limit
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.heat_paths import heat_data
from buckdesign.design.losses import flux_density_swing, loop_losses
from buckdesign.design.operated import Operated
from buckdesign.design.operating_point import SafeAreaBasis, Transient
from buckdesign.design.runaway_search import runaway_ambient
from buckdesign.design.safe_area_check import NAME as SAFE_AREA
from buckdesign.design.sections import DEVICES
from buckdesign.design.temperatures import device_heat, runaway_reach
from buckdesign.loop.results import SteadyStates
from buckdesign.physics.core_loss import RANGES as CORE_RANGES
from buckdesign.physics.regulator import THERMAL_SHUTDOWN_C
from buckdesign.physics.thermal import CORE_FAULT_C, CORE_WARNING_C
from buckdesign.units import format_quantity

AUDIBLE = 16e3
"""Frequency below which the choke may be heard [Hz] (common practice: the limit of hearing)."""

RUNAWAY_CLOSE = 2.0
"""Growth of the leakage up to runaway below which a warning is due [1] (own choice: parts differ by more)."""

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
    found += _edge_warnings(limits, resolved, index)
    unknown = [limit.name for limit in limits if _is_unrated(limit, operated, resolved, index)]
    if unknown:
        found.append("not checked, no rating is known: " + ", ".join(unknown))
    return tuple(found)


def _is_unrated(limit: Limit, operated: Operated, resolved: ResolvedDesign, index: int) -> bool:
    if limit.applies[index] or limit.name in ("base drive", SAFE_AREA) or limit.name.endswith(("life", "density")):
        return False
    if limit.name.startswith("input capacitor") and resolved.input_capacitor is None:
        return False
    if limit.unit == "degC":
        return False
    return bool(np.isnan(limit.limit[index]))


def _edge_warnings(limits: Sequence[Limit], resolved: ResolvedDesign, index: int) -> list[str]:
    """Edges that pass where only a pulse could be allowed, and no pulse is known."""
    transistor = resolved.transistor
    rated = transistor.collector_current is not None and transistor.collector_voltage is not None
    area = next((limit for limit in limits if limit.name == SAFE_AREA), None)
    if area is None or not rated or area.across is None or not np.isnan(area.limit[index]):
        return []
    current, voltage = (
        format_quantity(float(value[index]), unit, ascii_only=True)
        for value, unit in ((area.value, "A"), (area.across, "V"))
    )
    return [
        f"the edges of the transistor, {current} at {voltage}, pass outside its safe area for direct current, and none "
        "for pulses is known: compare with its data sheet"
    ]


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
    found += _area_warnings(transient)
    nominal = resolved.design.output.voltage
    if transient.peak_output_v > (1.0 + SET_VOLTAGE_BAND) * nominal:
        found.append(f"at switch-on the output overshoots to {transient.peak_output_v:.4g} V")
    if transient.settling_s is None:
        found.append("the output did not settle in the time simulated")
    if resolved.design.supply.rise_time > 0.0:
        found.append("the supply is switched on at once: its rise time is not in this simulation")
    return tuple(found)


def _area_warnings(transient: Transient) -> list[str]:
    """A start outside the safe area that is known."""
    margin = transient.safe_area_margin
    if margin is None or margin >= 0.0:
        return []
    lasts = format_quantity(transient.stress_s, "s", digits=2, ascii_only=True)
    times = f"{1.0 - margin:.2g} times"
    if transient.safe_area_basis == SafeAreaBasis.DIRECT.value:
        return [
            f"at switch-on the transistor carries {times} its safe current for long, for about {lasts}: "
            "allowed only if the pulse curves of its data sheet say so"
        ]
    return [f"at switch-on the transistor leaves its safe area: {times} the current allowed for about {lasts}"]
