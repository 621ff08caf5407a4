"""A finished sweep as text for the terminal, and as JSON."""

from __future__ import annotations

import json
import textwrap
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any

from buckdesign.output.text import Column, json_value, text_pairs, text_table
from buckdesign.studies.sweep import SweepResult
from buckdesign.units import format_quantity

if TYPE_CHECKING:
    import pandas as pd

ALWAYS = ("regime", "frequency_hz", "ripple_v", "efficiency", "total_loss_w")
"""Results that the table of the best rows shows beside the objectives."""

WIDTH = 118
"""Characters in a line of the table, beyond which rows are shown as blocks [1]."""

_CUBIC = "cm3"
_HEADINGS = {"violated": "violates"}


def sweep_text(result: SweepResult) -> str:
    """What a sweep comes to.

    Parameters
    ----------
    result : SweepResult
        The sweep.

    Returns
    -------
    str
        The best rows first, then counts, what was assumed, and where the table is.
    """
    parts = [_best(result), text_pairs(_counts(result))]
    reasons = result.summary.told_reasons()
    if reasons:
        lines = [f"  {count:,} x {reason}" for reason, count in reasons]
        parts.append("\n".join(["why points failed:", *lines]))
    parts.append("\n".join(f"note: {note}" for note in _notes(result)))
    parts.append(f"table: {result.path}")
    return "\n\n".join(part for part in parts if part)


def _best(result: SweepResult) -> str:
    frame, objectives = result.best(), result.task.objectives
    aims = [f"least {name}" for name in objectives.minimise] + [f"largest {name}" for name in objectives.maximise]
    kept = f" among those with {', '.join(objectives.subject_to)}" if objectives.subject_to else ""
    if not len(frame):
        return f"no point keeps every constraint: {', '.join(objectives.subject_to)}" if kept else "no points"
    if len(objectives.names) > 1:
        front = len(result.summary.front())
        heading = f"{' and '.join(aims)}{kept}: {front:,} points on the front"
        heading += ", nearest to the best of all first" + (f" ({len(frame)} shown)" if front > len(frame) else "")
    else:
        heading = f"{aims[0]}{kept}, best first"
    return f"{heading}\n\n{_table(frame, result)}"


def _table(frame: pd.DataFrame, result: SweepResult) -> str:
    """What differs between the rows as a table, or as blocks where it is too wide; what is the same, above it."""
    keys = result.task.study.space.keys
    wanted = dict.fromkeys([*keys, *result.task.objectives.names, *ALWAYS, "violated"])
    told = {
        name: [_cell(value, name, result) for value in frame[name]] for name in wanted if name in frame.columns
    }
    alike = {name: cells[0] for name, cells in told.items() if len(cells) > 1 and len(set(cells)) == 1}
    differing = {name: cells for name, cells in told.items() if name not in alike}
    same = [
        "no limit violated" if (name, cell) == ("violated", "-") else f"{name} {cell}"
        for name, cell in alike.items()
    ]
    parts = [f"all of them: {', '.join(same)}"] if same else []
    headings = [_HEADINGS.get(name, name) for name in differing]
    rows = [
        [str(number), *cells] for number, *cells in zip(frame.index, *differing.values(), strict=True)
    ]
    is_right = [result.task.kinds[name] not in ("text", "bool") for name in differing]
    for tried in (headings, _short(headings)):
        columns = [Column(heading="row", right=True)]
        columns += [Column(heading=name, right=right) for name, right in zip(tried, is_right, strict=True)]
        table = text_table(columns, rows)
        if max(map(len, table.splitlines())) <= WIDTH:
            break
    else:
        table = "\n".join(_blocks(headings, rows))
    wrapped = [textwrap.fill(part, WIDTH, subsequent_indent="  ") for part in parts]
    return "\n\n".join([*wrapped, table])


def _short(headings: Sequence[str]) -> list[str]:
    """Names without their table where that leaves no doubt."""
    last = [name.rpartition(".")[2] for name in headings]
    return [
        short if last.count(short) == 1 else name for short, name in zip(last, headings, strict=True)
    ]


def _blocks(headings: Sequence[str], rows: Sequence[Sequence[str]]) -> Iterator[str]:
    for number, *cells in rows:
        yield f"row {number}"
        yield text_pairs(list(zip(headings, cells, strict=True)), indent=2)


def _cell(value: Any, name: str, result: SweepResult) -> str:
    if value is None or value != value:
        return "-"
    if isinstance(value, str):
        return value or "-"
    if isinstance(value, bool):
        return "yes" if value else "no"
    unit = result.task.units.get(name, "1")
    if unit == _CUBIC:
        return f"{value:.3g} cm³"
    if unit == "1" or result.task.kinds[name] == "int":
        return f"{value:.6g}"
    if unit == "F" and value >= 1e-3:
        return f"{value * 1e6:.4g} µF"
    return format_quantity(float(value), unit)


def _counts(result: SweepResult) -> list[tuple[str, str]]:
    summary = result.summary
    pairs = [("points", f"{summary.count:,}")]
    if result.computed < summary.count:
        pairs[0] = ("points", f"{summary.count:,}, {result.computed:,} of them computed now")
    pairs.append(("failed", f"{summary.failed:,}"))
    if result.task.objectives.subject_to:
        pairs.append(("keep every constraint", f"{summary.keeping:,}"))
    pairs.append(("within all limits", f"{summary.unviolated:,}"))
    regimes = ", ".join(f"{name} {count:,}" for name, count in summary.regimes.most_common())
    if regimes:
        pairs.append(("regimes", regimes))
    return pairs


def _notes(result: SweepResult) -> list[str]:
    study = result.task.study
    notes = list(result.notes)
    if study.requirement is not None:
        notes.append("results are at the nominal supply, full load and highest ambient of each design")
    if result.task.electrical_only:
        notes.append("electrical model alone: no temperatures, no losses added on")
    notes.append("limits are those of the parts, and of the requirement that the design carries where it carries one")
    return notes


def json_lines(result: SweepResult) -> Iterator[str]:
    """The sweep as one JSON object, piece by piece, so that a long table needs little memory.

    Parameters
    ----------
    result : SweepResult
        The sweep.

    Yields
    ------
    str
        Lines.
    """
    yield '{"rows": ['
    before = ""
    for row in result.rows():
        if before:
            yield before + ","
        before = json.dumps(json_value(row), allow_nan=False)
    yield before + "]," if before else "],"
    yield f'"summary": {json.dumps(json_value(result.to_dict()), allow_nan=False)},'
    yield f'"warnings": {json.dumps(json_value(_notes(result)))}}}'
