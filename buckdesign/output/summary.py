"""A design as a page for the bench: what to buy, what to wind, what to expect, what to mind."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from buckdesign.design.design_result import Alternative, Blocking, DesignResult
from buckdesign.design.finishing import JUNCTION_RESERVE, LEAST_SINK_RISE, SINK_LIMIT_C
from buckdesign.design.losses import LOSSES
from buckdesign.design.operating_point import OperatingPoint
from buckdesign.output.heat_text import heat_sink_text, linear_text
from buckdesign.output.power_up import nominal_point, power_up_text
from buckdesign.output.simulation import checks_text, listing
from buckdesign.output.text import Column, signs, text_pairs, text_table
from buckdesign.units import format_quantity

WIDTH = 100
"""Longest line of running text [characters]."""

REGIME_SHORT = {
    "linear": "linear",
    "continuous": "continuous",
    "discontinuous": "discontinuous",
    "stuck": "STUCK",
    "dropout": "DROP-OUT",
    "overload": "OVERLOAD",
}
"""Regimes in one word; those in capitals must not occur."""

SMALL_LOSS = 0.005
"""Share of all losses below which a loss is not listed [1]."""


def design_text(result: DesignResult, target: Path | None = None) -> str:
    """Everything about a result.

    Parameters
    ----------
    result : DesignResult
        The result.
    target : pathlib.Path, optional
        Where the design was written.

    Returns
    -------
    str
        Several blocks with headings, a blank line between them.
    """
    if not result.feasible:
        return infeasible_text(result)
    blocks = [
        _title(result),
        _parts(result.values),
        _choke(result.values),
        _behaviour(result),
        _losses(result),
        _temperatures(result),
        *_sinks(result),
        checks_text(result.checks),
        power_up_text(result),
    ]
    if result.alternatives:
        blocks.append(_alternatives(result.alternatives))
    for title, sentences in (
        ("Warnings", result.warnings),
        ("Mind", result.cautions),
        ("Assumed", result.assumptions),
    ):
        if sentences:
            blocks.append(listing(title, sentences))
    if target is not None:
        blocks.append(f"written: {target}")
    return "\n\n".join(blocks)


def infeasible_text(result: DesignResult) -> str:
    """Why there is no design, what would have to give, and how far the best attempt came."""
    alone = [one for one in result.blocking if one.alone]
    listed = alone or list(result.blocking)
    if len(alone) > 1:
        lead = "Any one of these changes makes it feasible (each was tried):"
    elif alone:
        lead = "This change makes it feasible (it was tried):"
    else:
        lead = "No single line was found that makes it feasible; the nearest design violates:"
    blocks = [f"Infeasible: {_asked(result)}.", "\n".join([lead, *(_blocking(one) for one in listed)])]
    if result.checks:
        failing = [check for check in result.checks if not check.holds]
        if failing:
            blocks.append("The nearest design fails\n" + checks_text(failing))
    blocks.append("No design file was written.")
    return "\n\n".join(blocks)


def _blocking(one: Blocking) -> str:
    change = "" if one.relax_to is None else f" -> {_measure(one.relax_to, one.unit)}"
    head = f"  - {one.key} = {_measure(one.required, one.unit)}{change}"
    if one.key.startswith("prefer."):
        head = f"  - {one.key}{'' if one.relax_to is None else f' -> {one.relax_to}'}"
    return head + "\n" + textwrap.fill(signs(one.text), WIDTH, initial_indent="    ", subsequent_indent="    ")


def _measure(value: float | str, unit: str) -> str:
    return str(value) if isinstance(value, str) or not unit else format_quantity(float(value), unit)


def _asked(result: DesignResult) -> str:
    """The requirement in one line."""
    need = result.requirement
    supply, output = need.supply, need.output
    low, high = supply.voltage_low, supply.voltage_high
    source = f"{_volts(low)}-{_volts(high)} V" if low < high else f"{_volts(high)} V"
    text = f"{source} to {_volts(output.voltage)} V, "
    text += f"{_shown(output.current_min, 'A')} to {_shown(output.current_max, 'A')}"
    if output.ripple < 1e3:
        text += f", ripple below {_shown(output.ripple, 'V')}"
    low, high = need.limits.ambient
    return text + (f", ambient {low:g} to {high:g} °C" if low < high else f", ambient {high:g} °C")


def _volts(value: float) -> str:
    return f"{value:.4g}"


def _title(result: DesignResult) -> str:
    nominal = nominal_point(result)
    line = (
        f"At {_volts(nominal.supply_v)} V and full load: {_percent(nominal.efficiency)} efficient, "
        f"{_shown(nominal.frequency_hz, 'Hz')}, ripple {_shown(nominal.ripple_v, 'V')}, "
        f"{_shown(nominal.total_loss_w, 'W')} of heat."
    )
    return f"{_asked(result)}: every requirement and every rating holds.\n{line}"


def _parts(values: Mapping[str, Any]) -> str:
    hysteresis = "switch node to adjust pin"
    if values["ch_f"] is not None:
        hysteresis += f", in series with {_shown(values['ch_f'], 'F')} (film or C0G)"
    rectifier = values["rectifier"]
    if values["rectifiers_parallel"] > 1:
        rectifier = f"{values['rectifiers_parallel']} x {rectifier}"
    pairs = [
        ("regulator", f"three-terminal, {values['regulator']}"),
        ("transistor", f"{values['transistor']} (PNP), emitter to supply, collector to switch node"),
        ("rectifier", f"{rectifier}, anode to ground, cathode to switch node"),
        ("R_be", f"{_ohms(values['rbe_ohm'])}, {_watts(values['rbe_power_w'])}, base to emitter"),
        (
            "R_drive",
            f"{_ohms(values['rdrive_ohm'])}, {_watts(values['rdrive_power_w'])}, base to regulator input",
        ),
        ("R_1", f"{_ohms(values['r1_ohm'])}, 1 %, output to adjust pin"),
        ("R_2", f"{_ohms(values['r2_ohm'])}, 1 %, adjust pin to ground"),
        ("R_h", f"{_ohms(values['rh_ohm'])}, {hysteresis}"),
        ("C_out", _capacitor(values, "output")),
        ("C_in", _capacitor(values, "input")),
        ("heat sink", _heatsink(values)),
    ]
    return "Parts\n" + text_pairs(pairs, indent=2)


def _capacitor(values: Mapping[str, Any], side: str) -> str:
    name = values[f"{side}_capacitor"]
    if name is None:
        return "none in the tables is rated for the supply: choose by hand"
    pieces = values.get(f"{side}_capacitors_parallel", 1)
    times = f"{pieces} x " if pieces > 1 else ""
    where = "output to ground, short leads" if side == "output" else "emitter to ground, short leads"
    return f"{times}{signs(name)}, ESR {_shown(values[f'{side}_esr_ohm'], 'ohm')}, {where}"


def _heatsink(values: Mapping[str, Any]) -> str:
    size, who = values["heatsink_k_per_w"], values["on_heatsink"]
    text = "none"
    if values["transistor_is_bare"]:
        text = "none: the transistor's bare case in free air suffices"
    if size is not None and who and not values["transistor_is_bare"]:
        plural = ", each on its insulating pad" if len(who) > 1 else " on an insulating pad"
        text = f"{size:g} K/W or less, for {' and '.join(who)}{plural}"
    lead = values["rectifier_lead_sink_k_per_w"]
    if lead is not None:
        text += f"; rectifier leads short, in copper of {lead:g} K/W or less"
    return text


def _choke(values: Mapping[str, Any]) -> str:
    rings = "" if values["stack"] == 1 else f"{values['stack']} stacked rings "
    strands = "" if values["strands"] == 1 else f"{values['strands']} strands of "
    layers = "one layer" if values["layers"] == 1 else f"{values['layers']} layers"
    pairs = [
        ("ring", f"{rings}{values['core']} mm, {values['material']}"),
        (
            "winding",
            f"{values['turns']} turns of {strands}{values['wire']} enamelled copper, {layers}; "
            f"cut {values['wire_length_m']:.1f} m{' for each strand' if values['strands'] > 1 else ''}",
        ),
        (
            "check",
            f"{_shown(values['inductance_h'], 'H')} without current, "
            f"{_shown(values['inductance_biased_h'], 'H')} at full load; "
            f"{_shown(values['choke_resistance_ohm'], 'ohm')} of copper, cold",
        ),
    ]
    return "Choke\n" + text_pairs(pairs, indent=2)


def _behaviour(result: DesignResult) -> str:
    """Supply by load at the hottest ambient."""
    hot = max(one.ambient_c for one in result.corners)
    rows = [
        [
            _volts(one.supply_v),
            _shown(one.load_a, "A"),
            REGIME_SHORT[one.regime],
            _shown(one.frequency_hz, "Hz") if one.frequency_hz > 0.0 else "-",
            _shown(one.ripple_v, "V") if one.ripple_v >= 5e-5 else "-",
            f"{one.output_voltage_v:.2f}",
            _percent(one.efficiency) if one.load_a > 0.0 else "-",
            _shown(one.total_loss_w, "W"),
        ]
        for one in result.corners
        if one.ambient_c == hot
    ]
    columns = [
        Column(heading="V in", right=True),
        Column(heading="load", right=True),
        Column(heading="regime"),
        Column(heading="frequency", right=True),
        Column(heading="ripple", right=True),
        Column(heading="V out", right=True),
        Column(heading="efficiency", right=True),
        Column(heading="heat", right=True),
    ]
    return f"Behaviour at {hot:g} °C ambient\n{text_table(columns, rows)}"


def _losses(result: DesignResult) -> str:
    """Losses at full load, one column a supply."""
    hot = max(one.ambient_c for one in result.corners)
    load = result.requirement.output.current_max
    points = [one for one in result.corners if one.ambient_c == hot and one.load_a >= load * (1.0 - 1e-6)]
    names = [
        name for name in LOSSES if any(one.losses_w[name] >= SMALL_LOSS * one.total_loss_w for one in points)
    ]
    names.sort(key=lambda name: -max(one.losses_w[name] for one in points))
    rows = [[name.replace("_", " "), *(f"{one.losses_w[name]:.2f}" for one in points)] for name in names]
    shown = [sum(one.losses_w[name] for name in names) for one in points]
    rows.append(["others", *(f"{one.total_loss_w - part:.2f}" for one, part in zip(points, shown, strict=True))])
    rows.append(["all", *(f"{one.total_loss_w:.2f}" for one in points)])
    columns = [Column(heading="losses [W]")]
    columns += [Column(heading=f"{_volts(one.supply_v)} V", right=True) for one in points]
    text = f"Losses at full load, {hot:g} °C ambient\n{text_table(columns, rows)}"
    for one in points:
        if one.linear is not None:
            text += f"\nAt {_volts(one.supply_v)} V: {linear_text(one.linear)}"
    return text


def _temperatures(result: DesignResult) -> str:
    pairs = []
    for name in ("transistor", "regulator", "rectifier"):
        known = [(one.junction_c[name], one) for one in result.corners if one.junction_c[name] is not None]
        if known:
            value, point = max(known, key=lambda pair: float(pair[0] or 0.0))
            pairs.append((f"{name} junction", f"{float(value or 0.0):.0f} °C at {_where(point)}"))
    warm = [one for one in result.corners if one.choke_c is not None]
    if warm:
        point = max(warm, key=lambda one: one.choke_c or 0.0)
        pairs.append(("choke", f"{point.choke_c:.0f} °C at {_where(point)}"))
    return "Hottest\n" + text_pairs(pairs, indent=2)


def _sinks(result: DesignResult) -> list[str]:
    """What each device needs over the range, with the reserve that the chosen sink has on top."""
    if result.heat_sinks is None:
        return []
    is_bare = bool(result.values["transistor_is_bare"])
    text = heat_sink_text(result.heat_sinks, is_bare=is_bare)
    if is_bare or result.heat_sinks.shared is None:
        return [text]
    reserve = (
        f"Needs are those of the junctions' limits alone. The heat sink above leaves {JUNCTION_RESERVE:g} K to them "
        f"and stays below {SINK_LIMIT_C:g} °C, or {LEAST_SINK_RISE:g} K above the ambient. Plates: blackened "
        "aluminium, free on both sides, with the band of the estimate."
    )
    return [f"{text}\n{textwrap.fill(reserve, WIDTH)}"]


def _where(point: OperatingPoint) -> str:
    return f"{_volts(point.supply_v)} V, {_shown(point.load_a, 'A')}, {point.ambient_c:g} °C ambient"


def _alternatives(alternatives: Sequence[Alternative]) -> str:
    rows = [
        [
            signs(one.differs),
            _percent(one.efficiency),
            _shown(one.ripple_v, "V"),
            f"{_shown(one.frequency_low_hz, 'Hz')} to {_shown(one.frequency_high_hz, 'Hz')}",
        ]
        for one in alternatives
    ]
    columns = [
        Column(heading="instead"),
        Column(heading="efficiency", right=True),
        Column(heading="ripple", right=True),
        Column(heading="frequency"),
    ]
    title = "Alternatives that hold as well (least efficiency at full load, largest ripple)"
    return f"{title}\n{text_table(columns, rows)}"


def _ohms(value: float) -> str:
    return format_quantity(value, "ohm")


def _watts(value: float | None) -> str:
    return "any rating" if value is None else f"{value:g} W"


def _percent(value: float) -> str:
    return f"{100.0 * value:.1f} %"


def _shown(value: float, unit: str) -> str:
    return format_quantity(value, unit)
