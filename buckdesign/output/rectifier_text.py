"""The rectifier comparison as text for the terminal."""

from __future__ import annotations

from buckdesign.output.rectifier_plots import shown_rows
from buckdesign.output.simulation import listing
from buckdesign.output.text import Column, signs, text_table
from buckdesign.studies.rectifier_choice import Choice
from buckdesign.studies.rectifiers import Comparison, RectifierRow
from buckdesign.units import format_quantity

COLUMNS = ("conduction", "recovery", "leakage", "total", "junction", "runaway", "rate", "efficiency")
"""Headings of the numbers."""

ROWS = 20
"""Rectifiers in the table [1]; the JSON output has all."""

CHOSEN_ROWS = 200
"""The same where the rectifiers were named [1]."""


def comparison_text(comparison: Comparison, *, is_chosen: bool) -> str:
    """The comparison as a table.

    Parameters
    ----------
    comparison : Comparison
        The rows.
    is_chosen : bool
        Whether the rectifiers were named: then all are shown.

    Returns
    -------
    str
        Heading, table, remarks.
    """
    rows = shown_rows(comparison, CHOSEN_ROWS if is_chosen else ROWS)
    columns = [Column(heading="rectifier"), Column(heading="kind")]
    columns += [Column(heading=name, right=True) for name in COLUMNS]
    table = text_table([*columns, Column(heading="")], [_cells(row, row is comparison.own) for row in rows])
    load = format_quantity(comparison.load_a, "A")
    title = f"Rectifiers at {comparison.supply_v:g} V, {load}, ambient {comparison.ambient_c:g} °C"
    blocks = [title, table]
    remarks = list(comparison.warnings)
    if len(rows) < len(comparison.rows):
        remarks.append(f"{len(comparison.rows) - len(rows)} more, with larger losses: --json lists all")
    remarks.append("runaway: how many times the leakage may grow until no temperature balances it")
    blocks.append(listing("Mind", remarks))
    return "\n\n".join(blocks)


def _cells(row: RectifierRow, is_own: bool) -> list[str]:
    losses = (row.conduction_w, row.recovery_w, row.leakage_w, row.total_w)
    margin = row.runaway_margin
    return [
        f"{row.name} (own)" if is_own else row.name,
        row.kind or "-",
        *(format_quantity(value if value >= 1e-6 else 0.0, "W") for value in losses),
        "-" if row.junction_c is None else format_quantity(row.junction_c, "degC"),
        "-" if margin is None else f"{margin:.2f}" if margin < 10.0 else "> 10",
        format_quantity(row.frequency_hz, "Hz"),
        f"{100.0 * row.efficiency:.2f} %",
        signs(_remark(row)),
    ]


def _remark(row: RectifierRow) -> str:
    """Why it drops out, and what must be known before it is chosen."""
    out = [] if row.why_not is None else [f"DROPS OUT: {row.why_not}"]
    note = row.note or ""
    return "; ".join([*out, *([note.replace("junction not checked", "JUNCTION NOT CHECKED")] if note else [])])


def choice_text(choice: Choice) -> str:
    """Where the choice flips, in words.

    Parameters
    ----------
    choice : Choice
        Curves and crossings.

    Returns
    -------
    str
        One line a crossing.
    """
    title = f"Least loss over {choice.over.value}"
    unit = choice.over.unit
    known = [(float(value), name) for value, name in zip(choice.values, choice.best(), strict=True) if name]
    if not known:
        return f"{title}: no rectifier keeps its limits"
    low, high = (format_quantity(known[end][0], unit) for end in (0, -1))
    lines = [f"from {low} to {high}: starts with {known[0][1]}"]
    for one in choice.crossings:
        lines.append(f"from {format_quantity(one.at, unit)} up: {one.above} instead of {one.below}")
    if not choice.crossings:
        lines.append("the choice does not flip")
    if choice.note:
        lines.append(choice.note)
    return listing(title, lines)
