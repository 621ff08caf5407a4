"""Heat sinks, and the regulator alone, as text for the terminal."""

from __future__ import annotations

from buckdesign.design.heat_sinks import DeviceSink, HeatSinks, Plate, SharedSink
from buckdesign.design.linear_alternative import LinearAlternative
from buckdesign.output.text import Column, text_table
from buckdesign.units import format_quantity


def linear_text(linear: LinearAlternative) -> str:
    """What the regulator alone would burn, in a sentence."""
    loss = format_quantity(linear.loss_w, "W")
    text = f"The regulator alone would burn {loss} ({100.0 * linear.efficiency:.1f} % efficiency)"
    if not linear.is_possible:
        text += ", if its current limit let it"
    if linear.pays_from_a is None:
        return f"{text}; switching does not pay at any load."
    return f"{text}; switching pays from {format_quantity(linear.pays_from_a, 'A', digits=2)} up."


def heat_sink_text(sinks: HeatSinks) -> str:
    """What each device needs, and the common sink.

    Parameters
    ----------
    sinks : HeatSinks
        Of one operating point.

    Returns
    -------
    str
        A table and a line.
    """
    columns = [Column(heading="Heat sinks"), Column(heading="heat", right=True)]
    columns += [Column(heading="without one", right=True), Column(heading="needs at most", right=True)]
    rows = [
        _row(name, one)
        for name, one in (
            ("transistor", sinks.transistor),
            ("regulator", sinks.regulator),
            ("rectifier", sinks.rectifier),
        )
    ]
    text = text_table([*columns, Column(heading="alone on a vertical plate")], rows)
    return text if sinks.shared is None else f"{text}\n{_shared(sinks.shared)}"


def _row(name: str, one: DeviceSink) -> list[str]:
    bare = "not known" if one.without_sink_c is None else format_quantity(one.without_sink_c, "degC")
    if one.needs_sink:
        bare += " fails"
    return [
        name,
        format_quantity(one.heat_w, "W") if one.heat_w > 1e-6 else "0 W",
        bare,
        _resistance(one.needed_k_per_w, one.needs_sink),
        "" if one.plate is None else _plate(one.plate),
    ]


def _resistance(value: float | None, needs: bool | None) -> str:
    if needs is False:
        return "none needed"
    if value is None:
        return "-"
    return format_quantity(value, "K/W") if value > 0.0 else "no sink suffices"


def _plate(plate: Plate) -> str:
    low, middle, high, bright = (
        1e3 * side for side in (plate.side_low_m, plate.side_m, plate.side_high_m, plate.bright_side_m)
    )
    return f"{middle:.0f} mm square ({low:.0f}-{high:.0f}), bright {bright:.0f} mm"


def _shared(shared: SharedSink) -> str:
    fitted = format_quantity(shared.fitted_k_per_w, "K/W")
    together = ", ".join(shared.devices)
    text = f"Shared by {together}: {format_quantity(shared.heat_w, 'W')}, fitted {fitted}"
    text += f" at {format_quantity(shared.sink_c, 'degC')}"
    if shared.needed_k_per_w is None:
        return text
    if shared.needed_k_per_w <= 0.0:
        return f"{text}; no sink suffices for the {shared.limited_by}"
    needed = format_quantity(shared.needed_k_per_w, "K/W")
    text += f", needed {needed} at most"
    if shared.plate is None:
        return text
    return f"{text} (for the\n{shared.limited_by}): vertical plate {_plate(shared.plate)}"
