"""Heat sinks, and the regulator alone, as text for the terminal."""

from __future__ import annotations

from buckdesign.design.heat_sinks import DeviceSink, HeatSinks, Plate, SharedSink
from buckdesign.design.linear_alternative import LinearAlternative
from buckdesign.design.touch import FAR_C
from buckdesign.output.text import Column, signs, text_table
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


def heat_sink_text(sinks: HeatSinks, title: str = "Heat sinks", is_bare: bool = False) -> str:
    """What each device needs, and the common sink.

    Parameters
    ----------
    sinks : HeatSinks
        Of one operating point, or each device at its worst.
    title : str
        Heading of the first column.
    is_bare : bool
        Whether the common sink is no more than the transistor's own case.

    Returns
    -------
    str
        A table and some lines.
    """
    devices = (
        ("transistor", sinks.transistor), ("regulator", sinks.regulator), ("rectifier", sinks.rectifier)
    )  # fmt: skip
    places = len({one.where for _, one in devices}) > 1
    columns = [Column(heading=title), Column(heading="heat", right=True)]
    columns += [Column(heading="without one", right=True), Column(heading="needs at most", right=True)]
    columns += [Column(heading="at")] if places else []
    rows = [_row(name, one, places) for name, one in devices]
    text = text_table([*columns, Column(heading="alone on a vertical plate")], rows)
    if is_bare:
        return f"{text}\nNo heat sink: the transistor's bare case suffices."
    return text if sinks.shared is None else f"{text}\n{_shared(sinks.shared, places)}"


def _row(name: str, one: DeviceSink, places: bool) -> list[str]:
    bare = "not known" if one.without_sink_c is None else _warm(one.without_sink_c)
    if one.needs_sink:
        bare += " fails"
    return [
        name,
        format_quantity(one.heat_w, "W") if one.heat_w > 1e-6 else "0 W",
        bare,
        _resistance(one.needed_k_per_w, one.needs_sink),
        *([signs(one.where)] if places else []),
        "" if one.plate is None else _plate(one.plate),
    ]


def _warm(celsius: float) -> str:
    if celsius > FAR_C:
        return f"above {format_quantity(FAR_C, 'degC')}"
    return format_quantity(celsius, "degC")


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


def _shared(shared: SharedSink, places: bool) -> str:
    fitted, needed = format_quantity(shared.fitted_k_per_w, "K/W"), shared.needed_k_per_w
    text = f"Shared by {', '.join(shared.devices)}: {format_quantity(shared.heat_w, 'W')}"
    lines = [f"{text} at {signs(shared.where)}" if places else text]
    warm = _warm(shared.sink_c)
    plate = "" if shared.fitted_plate is None else f": vertical plate {_plate(shared.fitted_plate)}"
    lines.append(f"fitted {fitted} at {warm}{plate}")
    if needed is not None and needed <= 0.0:
        lines.append(f"no sink suffices for the {shared.limited_by}")
    elif needed is not None:
        plate = "" if shared.plate is None else f": vertical plate {_plate(shared.plate)}"
        lines.append(f"needed {format_quantity(needed, 'K/W')} at most, for the {shared.limited_by}{plate}")
    return "\n  ".join(lines)
