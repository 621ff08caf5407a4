"""A judged design in words and values: component values, alternatives, warnings."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Any

from buckdesign.design.blueprint import Blueprint
from buckdesign.design.design_result import Alternative
from buckdesign.design.judging import Judged
from buckdesign.design.operating_point import OperatingPoint
from buckdesign.design.requirement import Requirement
from buckdesign.physics.choke import inductance_at_current
from buckdesign.physics.winding import CUT_LEAD_LENGTH, wind, wire_length

_NUMBER = re.compile(r"[-+]?\d[\d.,]*(e[-+]?\d+)?\s*(m|u|k|M)?")


def component_values(judged: Judged) -> dict[str, Any]:
    """Every chosen component value; units in the keys, None where there is no such part."""
    plan, resolved = judged.plan, judged.resolved
    network, choke, output = resolved.network, resolved.choke, resolved.output_capacitor
    source = resolved.input_capacitor
    load = resolved.full_load
    return {
        "regulator": plan.regulator,
        "r1_ohm": network.r1,
        "r2_ohm": network.r2,
        "rh_ohm": network.rh,
        "ch_f": network.ch,
        "rbe_ohm": network.rbe,
        "rbe_power_w": network.rbe_power,
        "rdrive_ohm": network.rdrive,
        "rdrive_power_w": network.rdrive_power,
        "transistor": plan.transistor,
        "rectifier": plan.rectifier,
        "rectifiers_parallel": plan.parallel,
        **coil_values(judged),
        "inductance_h": choke.inductance,
        "inductance_biased_h": float(
            inductance_at_current(choke.inductance, load, choke.bias_current, choke.bias_exponent)
        ),
        "choke_resistance_ohm": choke.resistance,
        "output_capacitor": plan.capacitor.name,
        "output_capacitance_f": output.capacitance,
        "output_esr_ohm": output.esr,
        "input_capacitor": _input_name(judged),
        "input_capacitors_parallel": _input_pieces(judged),
        "input_capacitance_f": None if source is None else source.capacitance,
        "input_esr_ohm": None if source is None else source.esr,
        "heatsink_k_per_w": judged.finish.heatsink,
        "on_heatsink": list(judged.finish.on_heatsink),
        "transistor_is_bare": judged.finish.is_bare,
        "rectifier_lead_sink_k_per_w": judged.finish.lead_sink,
    }


def _input_name(judged: Judged) -> str | None:
    chosen = judged.finish.input_capacitor
    return None if chosen is None else chosen.part.name


def _input_pieces(judged: Judged) -> int:
    chosen = judged.finish.input_capacitor
    return 0 if chosen is None else chosen.parallel


def coil_values(judged: Judged) -> dict[str, Any]:
    """Ring, material, turns and wire with the length to cut."""
    coil, winding = judged.plan.coil, judged.resolved.choke.winding
    assert winding is not None
    ring, wire = winding.ring, winding.wire
    lay = wind(
        ring.outer_diameter,
        ring.inner_diameter,
        ring.height * coil.stack,
        wire.outer_diameter_grade1,
        coil.turns * coil.strands,
    )
    return {
        "core": coil.core,
        "material": coil.material,
        "stack": coil.stack,
        "turns": coil.turns,
        "wire": coil.wire,
        "strands": coil.strands,
        "wire_length_m": float(wire_length(coil.turns, lay.mean_turn, lead=CUT_LEAD_LENGTH)),
        "layers": int(lay.layers),
    }


def alternatives(
    requirement: Requirement, best: Judged, others: Sequence[Judged], most: int = 3
) -> list[Alternative]:
    """Designs next to the best that differ in more than one resistor, best first.

    Parameters
    ----------
    requirement : Requirement
        What was asked.
    best : Judged
        The design chosen.
    others : sequence of Judged
        The rest, best first.
    most : int
        At most so many.

    Returns
    -------
    list of Alternative
        Each with what is different about it.
    """
    found: list[Alternative] = []
    seen = {_kind(best.plan)}
    for one in others:
        if _kind(one.plan) in seen or not one.holds:
            continue
        seen.add(_kind(one.plan))
        found.append(_alternative(requirement, best.plan, one))
        if len(found) >= most:
            break
    return found


def _kind(plan: Blueprint) -> tuple[Any, ...]:
    return plan.transistor, plan.rectifier, plan.coil.core, plan.capacitor.name, plan.ch > 0.0


def _alternative(requirement: Requirement, base: Blueprint, judged: Judged) -> Alternative:
    operated, plan = judged.operated, judged.plan
    load = operated.load / requirement.output.current_max
    full, upper = load >= 1.0 - 1e-6, load >= 0.5 - 1e-6
    loop = operated.loop
    rate = loop.column("frequency_hz")[upper]
    return Alternative(
        differs=_difference(base, plan),
        values=component_values(judged),
        holds=judged.holds,
        efficiency=float(operated.efficiency[full].min()),
        ripple_v=float((loop.column("output_max_v") - loop.column("output_min_v")).max()),
        frequency_low_hz=float(rate.min()),
        frequency_high_hz=float(rate.max()),
    )


def _difference(base: Blueprint, plan: Blueprint) -> str:
    words = []
    for name in ("transistor", "rectifier"):
        if getattr(plan, name) != getattr(base, name):
            words.append(getattr(plan, name))
    if (plan.ch > 0.0) != (base.ch > 0.0):
        words.append("hysteresis through a capacitor" if plan.ch else "hysteresis coupled directly")
    if plan.capacitor.name != base.capacitor.name:
        words.append(f"output {plan.capacitor.name}")
    if plan.coil != base.coil:
        words.append(f"{plan.coil.turns} turns on {plan.coil.core}")
    return ", ".join(words)


def gathered_warnings(corners: Sequence[OperatingPoint]) -> tuple[str, ...]:
    """Warnings of all points; those that differ only in their numbers once, with how many points they hold
    at."""
    lots: dict[str, list[tuple[str, OperatingPoint]]] = {}
    for point in corners:
        for text in dict.fromkeys(point.warnings):
            lots.setdefault(_NUMBER.sub("#", text), []).append((text, point))
    found = []
    for shown in lots.values():
        text, point = shown[0]
        if len(shown) == len(corners) and len({one for one, _ in shown}) == 1:
            found.append(text)
            continue
        where = f"{point.supply_v:g} V, {_amperes(point.load_a)}, {point.ambient_c:g} degC"
        found.append(f"{text} (at {where}; alike at {len(shown)} of {len(corners)} points)")
    return tuple(found)


def _amperes(value: float) -> str:
    return f"{value * 1e3:.3g} mA" if value < 1.0 else f"{value:.3g} A"


def gathered(texts: Sequence[Sequence[str]]) -> tuple[str, ...]:
    """Texts of all points.

    Of those alike but for numbers, or for what follows a colon, the longest, of equal ones the last.
    """
    lots: dict[str, str] = {}
    for some in texts:
        for text in some:
            kind = _NUMBER.sub("#", text.split(": ")[0])
            if len(text) >= len(lots.get(kind, "")):
                lots[kind] = text
    return tuple(lots.values())
