"""A finished sweep as text for the terminal, and as JSON."""

from __future__ import annotations

import json
import textwrap
from collections import Counter
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

from buckdesign.output.text import Column, json_value, text_pairs, text_table
from buckdesign.studies.sweep import SweepResult
from buckdesign.units import format_quantity

if TYPE_CHECKING:
    import pandas as pd

ALWAYS = ("regime", "frequency_hz", "ripple_v", "efficiency", "total_loss_w")
"""Results that the table of the best rows shows beside the objectives."""

WIDTH = 118
"""Characters in a line of the table, beyond which it goes on in another one below [1]."""

NOISE = 1e-9
"""Voltages, currents and powers below this are nothing but rounding [V, A, W] (own choice)."""

OPERATING_KEYS = ("supply.voltage", "output.current", "output.resistance", "thermal.ambient")
"""Keys that say where a design works rather than what it is."""

_NOISY = ("V", "A", "W")
_WHOLE = ("supply.", "output.", "limits.")

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
    notes = [textwrap.fill(f"note: {note}", WIDTH, subsequent_indent="      ") for note in _notes(result)]
    parts.append("\n".join(notes))
    parts.append(f"table: {result.path}")
    return "\n\n".join(part for part in parts if part)


def _best(result: SweepResult) -> str:
    frame, objectives = result.best(), result.task.objectives
    if not len(frame):
        return _nothing(result)
    aims = [f"least {name}" for name in objectives.minimise] + [f"largest {name}" for name in objectives.maximise]
    kept = f" among those with {', '.join(objectives.subject_to)}" if objectives.subject_to else ""
    if len(objectives.names) > 1:
        front = len(result.summary.front())
        heading = f"{' and '.join(aims)}{kept}: {front:,} points on the front"
        heading += ", nearest to the best of all first" + (f" ({len(frame)} shown)" if front > len(frame) else "")
    else:
        heading = f"{aims[0]}{kept}, best first"
    return f"{textwrap.fill(heading, WIDTH, subsequent_indent='  ')}\n\n{_table(frame, result)}"


def _nothing(result: SweepResult) -> str:
    """Why there are no best rows."""
    summary, objectives = result.summary, result.task.objectives
    if summary.failed == summary.count:
        return "no point could be computed"
    if objectives.subject_to and not summary.keeping:
        return f"no point keeps every constraint: {', '.join(objectives.subject_to)}"
    return f"no point has all that is looked for: {', '.join(objectives.names)}"


def _table(frame: pd.DataFrame, result: SweepResult) -> str:
    """What differs between the rows as a table, in pieces where it is too wide; what is the same, above it."""
    keys = result.task.study.space.keys
    wanted = dict.fromkeys([*keys, *result.task.objectives.names, *ALWAYS, "violated"])
    told = {
        name: [_cell(value, name, result) for value in frame[name]] for name in wanted if name in frame.columns
    }
    alike = {name: cells[0] for name, cells in told.items() if len(cells) > 1 and len(set(cells)) == 1}
    differing = {name: cells for name, cells in told.items() if name not in alike}
    same = [
        "no limit violated" if (name, cell) == ("violated", "-") else f"{_HEADINGS.get(name, name)} {cell}"
        for name, cell in alike.items()
    ]
    parts = [textwrap.fill(f"all of them: {', '.join(same)}", WIDTH, subsequent_indent="  ")] if same else []
    numbers = _Told(heading="row", cells=tuple(map(str, frame.index)), right=True)
    columns = [
        _Told(
            heading=_HEADINGS.get(name, name),
            cells=tuple(cells),
            right=result.task.kinds[name] not in ("text", "bool"),
        )
        for name, cells in differing.items()
    ]
    if len(_pieces(numbers, columns)) > 1:
        columns = _short(columns, [name for name in differing if name in keys])
    return "\n\n".join([*parts, *(_drawn(numbers, piece) for piece in _pieces(numbers, columns))])


@dataclass(frozen=True, kw_only=True)
class _Told:
    """A column of the table of the best rows."""

    heading: str
    cells: tuple[str, ...]
    right: bool

    @property
    def width(self) -> int:
        return max(map(len, (self.heading, *self.cells)))


def _pieces(numbers: _Told, columns: Sequence[_Told]) -> list[list[_Told]]:
    """Columns that fit beside the numbers of the rows, one list for each table."""
    pieces: list[list[_Told]] = []
    width = WIDTH
    for column in columns:
        if width + 2 + column.width > WIDTH:
            pieces.append([])
            width = numbers.width
        pieces[-1].append(column)
        width += 2 + column.width
    return pieces


def _drawn(numbers: _Told, columns: Sequence[_Told]) -> str:
    together = [numbers, *columns]
    headings = [Column(heading=one.heading, right=one.right) for one in together]
    return text_table(headings, list(zip(*(one.cells for one in together), strict=True)))


def _short(columns: Sequence[_Told], keys: Sequence[str]) -> list[_Told]:
    """Varied keys without their section where that leaves no doubt; results keep their names."""
    last = {key: key.partition(".")[2] for key in keys if not key.startswith(_WHOLE)}
    counts = Counter(last.values())
    names = {key: short for key, short in last.items() if counts[short] == 1}
    return [replace(column, heading=names.get(column.heading, column.heading)) for column in columns]


def _cell(value: Any, name: str, result: SweepResult) -> str:
    if value is None or value != value:
        return "-"
    if result.task.kinds[name] == "bool":
        return "yes" if value else "no"
    if isinstance(value, str):
        return result.task.shown_text(name, value) or "-"
    unit = result.task.units.get(name, "1")
    if unit == _CUBIC:
        return f"{value:.3g} cm³"
    if unit in _NOISY and abs(value) < NOISE:
        return format_quantity(0.0, unit)
    if result.task.kinds[name] == "int":
        return f"{value:.10g}"
    if unit == "1":
        return f"{value:.4g}"
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
    task, summary = result.task, result.summary
    notes = [*result.notes, *_doubtful(result)]
    if task.study.requirement is not None:
        notes.append("results are at the nominal supply, full load and highest ambient of each design")
    if task.electrical_only:
        notes.append("electrical model alone: no temperatures, no losses added on")
    if summary.unsettled:
        notes.append(
            f"losses and temperatures did not settle at {summary.unsettled:,} points (column settled): "
            "their values are those of the last run"
        )
    if task.study.requirement is not None:
        notes.append("limits are those of the requirement over its whole range, and of the parts")
    elif task.has_requirement:
        notes.append(
            "limits are those of the parts and of the requirement that the design carries; points outside its "
            "supplies and loads are held to those of the parts alone"
        )
    else:
        notes.append("limits are those of the parts alone: the design carries no requirement")
    return notes


def _doubtful(result: SweepResult) -> Iterator[str]:
    """What makes the best rows others than one may think."""
    task, summary = result.task, result.summary
    best = result.best()
    violating = int((best["violated"].fillna("") != "").sum()) if len(best) else 0
    if violating:
        some = "all" if violating == len(best) else f"{violating} of"
        yield f'{some} the rows shown violate limits; subject_to = "within_limits == true" leaves such out'
    for name, count in summary.unknown.items():
        if count:
            follows = "ranked nowhere" if name in task.objectives.names else "taken as not keeping the constraint"
            yield f"{name} is not known at {count:,} points, which are {follows}"
    keys = task.study.space.keys
    where = [key for key in keys if key in OPERATING_KEYS]
    if task.study.base is not None and where and len(where) < len(keys):
        yield (
            f"a row is one operating point: the best ones are at the kindest {' and '.join(where)}; "
            "to choose a design, fix them at the worst"
        )


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
