"""One operating point as text for the terminal."""

from __future__ import annotations

from collections.abc import Sequence

from buckdesign.design.capacitor_load import CapacitorLoad
from buckdesign.design.losses import LOSSES
from buckdesign.design.operating_point import Check, OperatingPoint, Transient
from buckdesign.output.heat_text import heat_sink_text, linear_text
from buckdesign.output.text import Column, signs, text_pairs, text_table
from buckdesign.physics.capacitor import HOURS_PER_YEAR
from buckdesign.units import format_quantity

BAR_WIDTH = 24
"""Length of the bar of the largest loss [characters]."""

WIDTH = 100
"""Longest line of running text [characters]."""

NOTHING = 1e-9
"""Value in SI units below which a number is rounding, and shown as 0."""

DESTROYED_C = 400.0
"""Junction temperature beyond which a number says no more than that the part is gone [degC] (own choice)."""

REGIME_WORDS = {
    "linear": "linear, the regulator alone carries the load",
    "stuck": "stuck, regulates without oscillating",
    "dropout": "drop-out",
    "overload": "overload",
    "continuous": "continuous conduction",
    "discontinuous": "discontinuous conduction",
}


def simulation_text(point: OperatingPoint) -> str:
    """Everything about one operating point.

    Parameters
    ----------
    point : OperatingPoint
        The point.

    Returns
    -------
    str
        Several blocks with headings, a blank line between them.
    """
    blocks = [heading(point), _electrical(point), _losses(point)]
    if point.linear is not None:
        blocks[-1] += f"\n{linear_text(point.linear)}"
    if point.heat_sinks is not None:
        blocks.append(heat_sink_text(point.heat_sinks))
    if point.transient is not None:
        blocks.append(_transient(point.transient))
    blocks.append(checks_text(point.checks))
    for title, sentences in (
        ("Warnings", point.warnings),
        ("Mind", point.cautions),
        ("Assumed", point.assumptions),
    ):
        if sentences:
            blocks.append(listing(title, sentences))
    return "\n\n".join(blocks)


def heading(point: OperatingPoint) -> str:
    """The point in one line."""
    text = (
        f"{_shown(point.supply_v, 'V')} to {_shown(point.output_voltage_v, 'V')} at {load_text(point)}, "
        f"ambient {_shown(point.ambient_c, 'degC')}: {REGIME_WORDS[point.regime]}"
    )
    if point.frequency_hz > 0.0:
        text += f", {_shown(point.frequency_hz, 'Hz')}"
    if point.output_power_w > 0.0:
        text += f", efficiency {point.efficiency:.1%}".replace("%", " %")
    return text


def load_text(point: OperatingPoint) -> str:
    """The load: a current, a resistance or both."""
    parts = []
    if point.load_a > 0.0 or point.load_ohm is None:
        parts.append(_shown(point.load_a, "A"))
    if point.load_ohm is not None:
        parts.append(_shown(point.load_ohm, "ohm"))
    return " and ".join(parts)


def listing(title: str, sentences: Sequence[str]) -> str:
    """Sentences under a title, one a line, long ones broken."""
    import textwrap

    lines = [
        textwrap.fill(signs(one), width=WIDTH, initial_indent="  - ", subsequent_indent="    ")
        for one in sentences
    ]
    return "\n".join([title, *lines])


def _electrical(point: OperatingPoint) -> str:
    choke, current = point.choke_current_a, point.input_current_a
    pairs = [
        (
            "output",
            f"{_shown(point.output_voltage_v, 'V', 4)} mean, "
            f"ripple {_shown(point.ripple_v, 'V')} peak to peak",
        ),
        ("oscillation", _oscillation(point)),
        (
            "choke current",
            f"{_shown(choke['mean'], 'A')} mean, {_shown(choke['min'], 'A')} to {_shown(choke['max'], 'A')}, "
            f"{_shown(choke['rms'], 'A')} rms",
        ),
        ("base drive", f"{_shown(point.base_drive_a['max'], 'A')} peak"),
        (
            "input",
            f"{_shown(point.input_power_w, 'W')}, {_shown(current['mean'], 'A')} mean, "
            f"{_shown(current['rms'], 'A')} rms",
        ),
        ("capacitors, rms", _capacitors(point)),
        ("junctions", _junctions(point)),
        ("choke", _choke(point)),
    ]
    return "Operating point\n" + text_pairs([pair for pair in pairs if pair[1]], indent=2)


def _oscillation(point: OperatingPoint) -> str:
    if point.frequency_hz <= 0.0:
        return "none"
    repeats = "irregular" if point.period_cycles is None else f"repeats after {point.period_cycles} cycles"
    parts = [
        _shown(point.frequency_hz, "Hz", 4),
        f"duty {point.duty:.1%}".replace("%", " %"),
        "regular" if point.period_cycles == 1 else repeats,
    ]
    if point.start_margin is not None:
        parts.append(f"start margin {point.start_margin:.3g}")
    return ", ".join(parts)


def _capacitors(point: OperatingPoint) -> str:
    currents = point.capacitor_current_a
    if point.capacitors is not None:
        loads = [(side, one) for side, one in point.capacitors.items() if one is not None]
        return "\n".join(f"{side} {_capacitor(one)}" for side, one in loads)
    return ", ".join(f"{side} {_shown(value, 'A')}" for side, value in currents.items() if value is not None)


def _capacitor(load: CapacitorLoad) -> str:
    parts = [f"{_shown(load.ripple_a, 'A')}"]
    if load.rated_a is not None:
        parts[0] += f" of {_shown(load.rated_a, 'A')} rated"
    parts.append(f"ESR {_shown(load.esr_ohm, 'ohm')}")
    if load.temperature_c is not None:
        parts.append(_shown(load.temperature_c, "degC"))
    if load.life_h is not None:
        years = load.life_h / HOURS_PER_YEAR
        parts.append(f"life {years:.0f} years" if years >= 2.0 else f"life {load.life_h:.0f} h")
    return ", ".join(parts)


def _junctions(point: OperatingPoint) -> str:
    """Temperatures; those that a check has no value for run away."""
    lost = {check.name.removesuffix(" junction") for check in point.checks if check.value is None}
    parts = []
    for name, value in point.junction_c.items():
        unknown = "runaway" if name in lost else "not known"
        parts.append(f"{name} {unknown if value is None else _heat(value)}")
    return ", ".join(parts)


def _choke(point: OperatingPoint) -> str:
    parts = [] if point.choke_c is None else [_shown(point.choke_c, "degC")]
    if point.choke_volume_cm3 is not None:
        parts.append(f"{point.choke_volume_cm3:.3g} cm³ wound")
    return ", ".join(parts)


def _losses(point: OperatingPoint) -> str:
    found = [(name, point.losses_w[name]) for name in LOSSES if point.losses_w[name] >= NOTHING]
    found.sort(key=lambda pair: -pair[1])
    largest = max((loss for _, loss in found), default=1.0)
    total = max(point.total_loss_w, 1e-300)
    rows = [
        [
            name.replace("_", " "),
            _shown(loss, "W"),
            f"{100.0 * loss / total:.1f} %",
            "#" * round(BAR_WIDTH * loss / largest),
        ]
        for name, loss in found
    ]
    rows.append(["total", _shown(point.total_loss_w, "W"), "100.0 %" if found else "0.0 %", ""])
    columns = [Column(heading="Losses"), Column(heading="", right=True), Column(heading="share", right=True)]
    return text_table([*columns, Column(heading="")], rows)


def _transient(transient: Transient) -> str:
    time, least = transient.settling_s, transient.lowest_output_v
    settling = "not in the time simulated" if time is None else _shown(time, "s")
    lowest = "" if least is None else f", then not below {_shown(least, 'V', 4)}"
    pairs = [
        ("settled after", settling),
        ("choke current", f"up to {_shown(transient.peak_choke_a, 'A')}"),
        ("output", f"up to {_shown(transient.peak_output_v, 'V', 4)}{lowest}"),
        (
            "transistor",
            f"{_shown(transient.transistor_energy_j, 'J')}, up to {_shown(transient.transistor_peak_w, 'W')}",
        ),
        ("safe area", _safe_area(transient)),
        ("regulator", _shown(transient.regulator_energy_j, "J")),
        ("drive resistor", _shown(transient.drive_resistor_energy_j, "J")),
    ]
    return "Start from rest\n" + text_pairs(pairs, indent=2)


def _safe_area(transient: Transient) -> str:
    margin, lasts = transient.safe_area_margin, _shown(transient.stress_s, "s", 2)
    if margin is None:
        return "not known: no ratings of the transistor"
    far = f"margin {100.0 * margin:+.0f} %" if margin >= 0.0 else f"{1.0 - margin:.2g} times the safe current"
    return f"{far}, against {transient.safe_area_basis}; as one pulse of {lasts}"


def checks_text(checks: Sequence[Check]) -> str:
    """Checks as a table, those that fail first.

    Parameters
    ----------
    checks : sequence of Check
        The checks.

    Returns
    -------
    str
        One line a check, and one more where its note does not fit beside it; the operating point of each where they
        differ.
    """
    ordered = sorted(checks, key=lambda check: (check.holds, _order(check)))
    is_failing = not all(check.holds for check in checks)
    places = len({check.where for check in checks}) > 1
    rows = [
        [
            check.name,
            _checked(check.value, check),
            _checked(check.limit, check),
            "-" if check.margin is None else f"{100.0 * check.margin:+.0f} %",
            *([] if not is_failing else [""] if check.holds else ["FAILS"]),
            *([signs(check.where)] if places else []),
        ]
        for check in ordered
    ]
    columns = [
        Column(heading="Checks"),
        Column(heading="value", right=True),
        Column(heading="limit", right=True),
        Column(heading="margin", right=True),
        *([Column(heading="")] if is_failing else []),
        *([Column(heading="where")] if places else []),
    ]
    failing = sum(not check.holds for check in checks)
    summary = f"all {len(checks)} hold" if failing == 0 else f"{failing} of {len(checks)} fail"
    lines = _with_notes(text_table(columns, rows), [signs(check.note) for check in ordered])
    return "\n".join([*lines, summary])


def _with_notes(table: str, notes: Sequence[str]) -> list[str]:
    """The lines of a table with a note behind each row, or below it where it would get too wide."""
    head, rule, *rows = table.split("\n")
    widest = max(map(len, (head, rule, *rows)))
    lines = [head, rule]
    for row, note in zip(rows, notes, strict=True):
        if note and widest + 2 + len(note) <= WIDTH:
            lines.append(f"{row.ljust(widest)}  {note}")
        else:
            lines += [row, f"    {note}"] if note else [row]
    return lines


def _order(check: Check) -> float:
    return float("-inf") if check.margin is None else check.margin


def _checked(value: float | None, check: Check) -> str:
    """Value or limit, with a digit more where they lie close together."""
    if value is None:
        return "-"
    found, limit = check.value, check.limit
    near = found is not None and limit is not None and abs(found - limit) < 0.1 * abs(limit)
    return _shown(value, check.unit, 4 if near else 3)


def _heat(celsius: float) -> str:
    """A junction temperature, or that there is no junction left."""
    if celsius > DESTROYED_C:
        return f"destroyed (far above {_shown(DESTROYED_C, 'degC')})"
    return _shown(celsius, "degC")


def _shown(value: float, unit: str, digits: int = 3) -> str:
    return format_quantity(value if abs(value) >= NOTHING else 0.0, unit, digits=digits)
