"""A single unit of a tolerance study as text for the terminal."""

from __future__ import annotations

from buckdesign.output.text import Column, signs, text_table
from buckdesign.output.tolerance_text import margin_text, value_text
from buckdesign.studies.tolerance_result import SingleUnit
from buckdesign.studies.unit_runs import PART_LIMITS
from buckdesign.units import format_quantity


def unit_text(one: SingleUnit, name: str) -> str:
    """A single unit as text.

    Parameters
    ----------
    one : SingleUnit
        The unit.
    name : str
        What the design is called.

    Returns
    -------
    str
        Its values, limits and operating points.
    """
    verdict = "passes" if one.runs.passes[0] else f"fails: {', '.join(one.runs.violated(0))}"
    return "\n\n".join(
        [
            f"Unit {one.unit} of seed {one.seed} of {name}: {verdict}",
            "Its values\n" + _unit_values(one),
            "Its limits at its worst points\n" + _unit_limits(one),
            "Its operating points\n" + _unit_points(one),
        ]
    )


def _unit_values(one: SingleUnit) -> str:
    columns = [Column(heading="value")]
    columns += [Column(heading=name, right=True) for name in ("nominal", "unit", "off by")]
    rows = [
        [
            each.key,
            format_quantity(each.value, each.unit),
            format_quantity(each.value * one.factors[each.key], each.unit, digits=4),
            f"{100.0 * (one.factors[each.key] - 1.0):+.3g} %",
        ]
        for each in one.varied
    ]
    return text_table(columns, rows)


def _unit_limits(one: SingleUnit) -> str:
    runs = one.runs
    columns = [Column(heading="limit on")]
    columns += [Column(heading=name, right=True) for name in ("value", "limit", "margin")]
    columns += [Column(heading="at"), Column(heading="")]
    rows = []
    for column in runs.margin[0].argsort(kind="stable"):
        name = runs.names[column]
        if name == PART_LIMITS or name not in runs.applied:
            continue
        value, limit = float(runs.value[0, column]), float(runs.limit[0, column])
        rows.append(
            [
                name,
                value_text(value if value == value else None, runs.units[column]),
                value_text(limit, runs.units[column]),
                margin_text(float(runs.margin[0, column])),
                signs(one.model.where(int(runs.point[0, column]))),
                "" if runs.holds[0, column] else "FAILS",
            ]
        )
    return text_table(columns, rows)


_SHOWN = (
    ("supply", "supply_v", "V"),
    ("load", "load_a", "A"),
    ("ambient", "ambient_c", "degC"),
    ("output", "output_voltage_v", "V"),
    ("ripple", "ripple_v", "V"),
    ("frequency", "frequency_hz", "Hz"),
    ("efficiency", "efficiency", "%"),
    ("loss", "total_loss_w", "W"),
)


def _unit_points(one: SingleUnit) -> str:
    columns = [Column(heading=heading, right=True) for heading, _, _ in _SHOWN]
    rows = []
    for index, regime in enumerate(one.points["regime"]):
        cells = [_shown(float(one.points[key][index]), unit, key) for _, key, unit in _SHOWN]
        rows.append([*cells, regime])
    return text_table([*columns, Column(heading="regime")], rows)


def _shown(value: float, unit: str, key: str) -> str:
    return (
        "-" if value != value else format_quantity(value, unit, digits=4 if key == "output_voltage_v" else 3)
    )
