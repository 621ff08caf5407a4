"""What to do and to see when a supply is switched on for the first time."""

from __future__ import annotations

import textwrap

from buckdesign.design.design_result import DesignResult
from buckdesign.design.operating_point import OperatingPoint
from buckdesign.output.text import signs
from buckdesign.units import format_quantity

WIDTH = 100
"""Longest line of running text [characters]."""

FUSES = (
    0.1, 0.16, 0.2, 0.25, 0.315, 0.4, 0.5, 0.63, 0.8, 1.0,
    1.25, 1.6, 2.0, 2.5, 3.15, 4.0, 5.0, 6.3, 8.0, 10.0,
)  # fmt: skip
"""Rated currents of miniature fuses [A] (the R10 steps that IEC 60127 uses, from memory)."""

FUSE_MARGIN = 1.5
"""Rated current of the fuse over the largest mean input current [1] (common practice)."""

BENCH_LIMIT = 0.2
"""Current limit of the bench supply for the first switching-on [A] (common practice)."""


def power_up_text(result: DesignResult) -> str:
    """Steps from the first switching-on to full load, with the numbers to expect.

    Parameters
    ----------
    result : DesignResult
        A feasible design.

    Returns
    -------
    str
        Numbered lines under a heading.
    """
    need, nominal = result.requirement, nominal_point(result)
    slow, fast = result.frequency_spread_hz
    fuse, idle, onset = _fuse(result), _idle_current(result), _onset(result)
    half = _nearest(result, nominal, 0.5 * need.output.current_max)
    supply, output = f"{need.supply.voltage_nominal:.4g} V", f"{nominal.output_voltage_v:.4g} V"
    steps = [
        "Before the first switching-on: well above 100 ohm from output to ground, both electrolytics the "
        "right way round, no load.",
        f"Bench supply at {supply}, its current limit at {_amperes(BENCH_LIMIT)}, no load: {output} within "
        f"{100.0 * need.output.tolerance:.3g} % at the output, about {_amperes(idle)} drawn. With more than "
        f"{_amperes(4.0 * idle + 0.02)}: switch off and look for the fault.",
        f"Up to about {_amperes(onset)} of load the transistor stays off: a linear regulator, no "
        "oscillation. Above it single pulses come at a low, rising rate.",
        f"Limit at {_amperes(fuse)}, load {_amperes(half.load_a)}: about "
        f"{_shown(half.frequency_hz, 'Hz')} at the switch node, {_shown(half.ripple_v, 'V')} ripple at the "
        "output.",
        f"Full load, {_amperes(need.output.current_max)}: about {_shown(nominal.frequency_hz, 'Hz')}, "
        f"{_shown(nominal.ripple_v, 'V')} ripple, {_amperes(nominal.input_current_a['mean'])} drawn. Cold "
        "capacitors and the regulator's own lag, known within a factor of three only, move it: anything from "
        f"{_shown(slow, 'Hz')} to {_shown(fast, 'Hz')} is as designed.",
        "Watch the heat for the first minutes: a transistor that gets hot fast without oscillation is stuck "
        "in its active region; switch off.",
        f"Fuse for good: {_amperes(fuse)} slow, in the input lead.",
    ]
    lines = [
        textwrap.fill(signs(text), WIDTH, initial_indent=f"  {number}. ", subsequent_indent="     ")
        for number, text in enumerate(steps, start=1)
    ]
    return "\n".join(["First power-up", *lines])


def nominal_point(result: DesignResult) -> OperatingPoint:
    """Nominal supply, full load, hottest ambient."""
    need = result.requirement
    points = [one for one in result.corners if one.load_a >= need.output.current_max * (1.0 - 1e-6)]
    hot = max(one.ambient_c for one in points)
    points = [one for one in points if one.ambient_c == hot]
    return min(points, key=lambda one: abs(one.supply_v - need.supply.voltage_nominal))


def _idle_current(result: DesignResult) -> float:
    """Input current without load: the larger of divider and smallest regulator current [A]."""
    assert result.resolved is not None
    regulator, network = result.resolved.regulator, result.resolved.network
    return max(regulator.quiescent_current, regulator.reference / network.r1)


def _onset(result: DesignResult) -> float:
    """Load from which the base conducts [A]."""
    assert result.resolved is not None
    network, regulator = result.resolved.network, result.resolved.regulator
    return max(0.0, result.resolved.transistor.base_emitter / network.rbe - regulator.reference / network.r1)


def _nearest(result: DesignResult, like: OperatingPoint, load: float) -> OperatingPoint:
    points = [
        one for one in result.corners if one.supply_v == like.supply_v and one.ambient_c == like.ambient_c
    ]
    return min(points, key=lambda one: abs(one.load_a - load))


def _fuse(result: DesignResult) -> float:
    """Smallest usual fuse that carries the input current with margin [A]."""
    need = FUSE_MARGIN * max(one.input_current_a["mean"] for one in result.corners)
    return next((size for size in FUSES if size >= need), need)


def _amperes(value: float) -> str:
    return _shown(value, "A")


def _shown(value: float, unit: str) -> str:
    return format_quantity(value, unit)
