"""``buckdesign parts``: list, show and check part and core tables."""

from __future__ import annotations

import re
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from buckdesign.cli.console import is_ascii_only, print_data, print_note
from buckdesign.cli.options import Json, Parts, new_application, tables_with
from buckdesign.errors import InputError, UnknownNameError, quoted

if TYPE_CHECKING:
    from collections.abc import Mapping

    from buckdesign.parts import Problem, Tables

app = new_application(no_args_is_help=True, help="List, show and check part and core tables.")

_SHOWN: dict[str, tuple[str, tuple[str, ...]]] = {
    "regulator": ("regulators", ("rated_current", "reference", "current_limit", "max_difference", "dropout")),
    "transistor": ("transistors", ("collector_voltage", "collector_current", "gain_1", "gain_1_current")),
    "rectifier": ("rectifiers", ("kind", "reverse_voltage", "average_current", "forward_voltage_1")),
    "capacitor": ("capacitors", ("kind", "capacitance", "rated_voltage", "esr", "ripple_current")),
    "wire": ("wires", ("series", "conductor_diameter", "outer_diameter_grade1", "resistance")),
    "ring": ("rings", ("outer_diameter", "inner_diameter", "height", "effective_length", "effective_area")),
    "material": ("materials", ("kind", "permeability", "saturation", "temperature_limit_c")),
}
"""Kind of part, its dictionary in the tables, and the values that a list shows."""


MILLIFARAD = 1e-3
"""Capacitance from which the trade still writes microfarads [F]."""


@app.command("list", epilog="Example: buckdesign parts list rectifier")
def list_parts(
    kind: Annotated[
        str | None, typer.Argument(metavar="KIND", help="One of: " + ", ".join(_SHOWN) + ".")
    ] = None,
    parts: Parts = None,
    json: Json = False,
) -> None:
    """List the parts of one kind, or all names by kind."""
    from buckdesign.output.text import to_json

    tables = tables_with(parts)
    kinds = list(_SHOWN) if kind is None else [_known_kind(kind)]
    if json:
        print_data(to_json({one: list(_parts_of(tables, one).values()) for one in kinds}))
    elif kind is None:
        print_data("\n\n".join(_names(tables, one) for one in kinds))
    else:
        print_data(_table(_parts_of(tables, kinds[0]), kinds[0]))


@app.command(epilog='Example: buckdesign parts show "R 26.9/14.5/11.1"')
def show(
    name: Annotated[str, typer.Argument(metavar="NAME", help="Name of a part, ring, wire or material.")],
    parts: Parts = None,
    json: Json = False,
) -> None:
    """Show everything the tables know about a part."""
    from buckdesign.output.text import text_pairs, to_json

    tables = tables_with(parts)
    found = {kind: part for kind in _SHOWN if (part := _find(tables, kind, name)) is not None}
    if not found:
        every = [known for kind in _SHOWN for known in _parts_of(tables, kind)]
        raise UnknownNameError.among("part", name, every)
    if json:
        print_data(to_json(found))
        return
    for kind, part in found.items():
        print_data(text_pairs([("table", kind), *_values(part)]))


@app.command(epilog="Example: buckdesign parts check my_rings.csv")
def check(
    files: Annotated[
        list[Path] | None, typer.Argument(metavar="FILE", help="Your own tables; all tables without.")
    ] = None,
    json: Json = False,
) -> None:
    """Check tables, built-in and your own.

    A fault ends with status 2; what is only odd is listed: of your own tables where they are named, else of all.
    """
    from buckdesign.output.text import to_json

    tables = tables_with(files)
    problems = tables.check() if not files else _own_problems(tables, files)
    counts = {kind: len(_parts_of(tables, kind)) for kind in _SHOWN}
    if json:
        print_data(to_json({"counts": counts, "problems": problems}))
        return
    for problem in problems:
        print_data(_ascii(str(problem)))
    print_note("; ".join(f"{kind}: {count}" for kind, count in counts.items()))
    print_note(f"no faults, {len(problems)} {'remark' if len(problems) == 1 else 'remarks'}")


def _own_problems(tables: Tables, files: list[Path]) -> list[Problem]:
    """What is odd in the given files, without what is odd elsewhere."""
    from buckdesign.parts import names_in

    own = names_in(files)
    return [one for one in tables.check() if (one.kind, one.name_key) in own]


def _known_kind(kind: str) -> str:
    singular = kind.lower().removesuffix("s")
    for known in _SHOWN:
        if singular == known.removesuffix("s"):
            return known
    raise InputError(f"{quoted(kind)}: unknown kind of part, one of {', '.join(_SHOWN)}")


def _parts_of(tables: Tables, kind: str) -> Mapping[str, Any]:
    found: Mapping[str, Any] = getattr(tables, _SHOWN[kind][0])
    if kind != "transistor":
        return found
    return {name: found[name] for name in sorted(found, key=_by_number)}


def _find(tables: Tables, kind: str, name: str) -> Any:
    try:
        return getattr(tables, kind)(name)
    except UnknownNameError:
        return None


def _names(tables: Tables, kind: str) -> str:
    names = _parts_of(tables, kind)
    return "\n".join([f"{kind} ({len(names)}):", *(_ascii(f"  {name}") for name in names)])


def _table(known: Mapping[str, Any], kind: str) -> str:
    from buckdesign.output.text import Column, text_table
    from buckdesign.parts.fields import columns_of

    if not known:
        return f"no {kind} is known"
    shown = _SHOWN[kind][1]
    units = columns_of(type(next(iter(known.values()))))
    columns = [Column(heading="name")]
    columns += [
        Column(heading=_heading(name, units[name].unit), right=not units[name].is_text) for name in shown
    ]
    rows = [
        [name, *(_cell(getattr(part, key), units[key].unit) for key in shown)] for name, part in known.items()
    ]
    return _ascii(text_table(columns, rows))


def _by_number(name: str) -> list[tuple[bool, int, str]]:
    """Type numbers in the order of their figures: 2N905 before 2N2905, both before BD140."""
    words = [word for word in re.split(r"([0-9]+)", name) if word]
    return [(not word.isdigit(), int(word) if word.isdigit() else 0, word) for word in words]


def _values(part: Any) -> list[tuple[str, str]]:
    from buckdesign.parts.fields import columns_of

    pairs = []
    columns = columns_of(type(part))
    for name, column in columns.items():
        value = getattr(part, name)
        if value is None or value == "":
            continue
        text = _cell(value, column.unit) if not column.raw_label else f"{value:g} {column.raw_label}"
        heading = _heading(name, column.unit)
        is_condition = column.unit == "degC" and name.removesuffix("_c") in columns
        pairs.append((f"{heading} at" if is_condition else heading, _ascii(text)))
    return pairs


def _heading(name: str, unit: str) -> str:
    return (name.removesuffix("_c") if unit == "degC" else name).replace("_", " ")


def _cell(value: Any, unit: str) -> str:
    """A value with its unit as the bench writes it."""
    from buckdesign.units import UNITS, format_quantity

    if value is None:
        return "-"
    if isinstance(value, str):
        return value
    if unit == "F" and value >= MILLIFARAD:
        return _ascii(f"{value * 1e6:g} µF")
    if unit in UNITS:
        return format_quantity(value, unit, digits=4, ascii_only=is_ascii_only())
    return f"{value:g} {unit}"


def _ascii(text: str) -> str:
    from buckdesign.output.text import plain_text

    return plain_text(text) if is_ascii_only() else text
