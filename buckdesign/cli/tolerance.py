"""``buckdesign tolerance``: yield and worst case of a design with real parts."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from buckdesign.cli.console import is_ascii_only, note_compiling, print_data, print_note
from buckdesign.cli.options import (
    DesignFile,
    ElectricalOnly,
    Force,
    Json,
    Output,
    Parts,
    RequirementOption,
    new_application,
    quantity_option,
    tables_with,
)

if TYPE_CHECKING:
    from buckdesign.studies.tolerance import Setting
    from buckdesign.studies.tolerance_result import ToleranceStudy

app = new_application(help="Yield and worst case of a design.")

ENDINGS = (".design.toml", ".toml")
"""Endings of a design file that its table's name goes without."""


@app.command(
    epilog="Example: buckdesign tolerance radio.design.toml --units 500 --plot yield.svg --output units.csv"
)
def tolerance(
    design: DesignFile,
    requirement: RequirementOption = None,
    units: Annotated[
        int, typer.Option("--units", min=1, max=1_000_000, metavar="N", help="Units to draw.")
    ] = 1000,
    seed: Annotated[
        int,
        typer.Option(
            "--seed", min=0, metavar="N", help="Of the random numbers; the same gives the same units."
        ),
    ] = 0,
    unit: Annotated[
        int | None,
        typer.Option("--unit", min=0, metavar="N", help="Show this unit of the seed and nothing else."),
    ] = None,
    age: Annotated[
        float | None,
        quantity_option(
            "--age", "h", "Age at which the units are judged again; 20000 h by default, 0 for not."
        ),
    ] = None,
    sensitivity: Annotated[
        int,
        typer.Option(
            "--sensitivity",
            min=0,
            max=65536,
            metavar="N",
            help="Base samples for the shares of the spread, a power of two; 0 for none.",
        ),
    ] = 64,
    defaults: Annotated[
        bool,
        typer.Option(
            "--defaults", help="Usual tolerances for all values that the design's [tolerance] leaves out."
        ),
    ] = False,
    all_points: Annotated[
        bool, typer.Option("--all-points", help="Judge every unit at all points of the range: slower.")
    ] = False,
    electrical_only: ElectricalOnly = False,
    output: Output = None,
    plot: Annotated[
        Path | None, typer.Option("--plot", metavar="FILE", help="Yields and shares as bars, .svg or .png.")
    ] = None,
    jobs: Annotated[int | None, typer.Option("--jobs", min=1, metavar="N", help="Threads.")] = None,
    parts: Parts = None,
    json: Json = False,
    force: Force = False,
) -> None:
    """Count how many built units keep the requirement, and say which tolerance costs how much.

    Units are drawn with the tolerances of the design's [tolerance] table, or with usual ones where it has none, and
    judged over the requirement's range. The table of units goes to DESIGN.tolerance.csv unless --output says
    otherwise. Status 0 also where units fail.
    """  # fmt: skip
    from buckdesign.design.design_file import read_design
    from buckdesign.design.requirement import read_requirement
    from buckdesign.studies.ageing import AGE_HOURS
    from buckdesign.studies.study_effort import StudyEffort
    from buckdesign.studies.tolerance import prepare_units, tolerance_study

    target = default_table(design) if output is None else output
    effort = StudyEffort(
        units=units, seed=seed, samples=sensitivity, age_hours=AGE_HOURS if age is None else age,
        all_points=all_points, electrical_only=electrical_only, jobs=jobs,
    )  # fmt: skip
    tables = tables_with(parts)
    made = read_design(design, tables)
    wanted = None if requirement is None else read_requirement(requirement, tables)
    if unit is not None:
        _check_nothing_written(output, plot)
        setting = prepare_units(
            made, requirement=wanted, with_defaults=defaults, tables=tables, effort=effort
        )
        _print_unit(setting, unit, design.name, json)
        return
    _check_files(target, plot, force)
    _check_not_read((target, plot), (design, requirement, *(parts or ())))
    note_compiling()
    study = tolerance_study(
        made, requirement=wanted, with_defaults=defaults, tables=tables, effort=effort, tell=_progress()
    )
    _write_files(study, target, plot, design.name, force)
    _print_study(study, design.name, json)


def default_table(design: Path) -> Path:
    """The table of units beside a design file: ``radio.design.toml`` gives ``radio.tolerance.csv``."""
    for ending in ENDINGS:
        if design.name.endswith(ending) and design.name != ending:
            return design.with_name(design.name.removesuffix(ending) + ".tolerance.csv")
    return design.with_name(design.name + ".tolerance.csv")


def _check_files(target: Path, plot: Path | None, force: bool) -> None:
    from buckdesign.design.safe_write import check_writable_name
    from buckdesign.errors import InputError
    from buckdesign.output.plots import figure_format

    if target.suffix == ".parquet":
        raise InputError(f"{target}: the table of units is a CSV; give it another name")
    check_writable_name(target, force=force)
    if plot is not None:
        figure_format(plot)
        check_writable_name(plot, force=force)
        if plot.resolve() == target.resolve():
            raise InputError(f"{plot}: both the table and the figure have this name; give one another")


def _check_nothing_written(output: Path | None, plot: Path | None) -> None:
    """Refuse files together with ``--unit``, which writes none."""
    from buckdesign.errors import InputError

    for option, path in (("--output", output), ("--plot", plot)):
        if path is not None:
            raise InputError(f"{path}: --unit prints one unit and writes no file; leave out {option}")


def _check_not_read(written: Iterable[Path | None], read: Iterable[Path | None]) -> None:
    """Refuse to write over what is read, also with ``--force``."""
    from buckdesign.errors import InputError

    sources = [path.resolve() for path in read if path is not None]
    for path in written:
        if path is not None and path.resolve() in sources:
            raise InputError(f"{path}: is read from and would be written over; give another name")


def _progress() -> Callable[[str], None] | None:
    """Says what is being done to who sits at the terminal."""
    if sys.stderr is None or not sys.stderr.isatty():
        return None
    return lambda step: print_note(f"computing: {step}")


def _write_files(study: ToleranceStudy, target: Path, plot: Path | None, name: str, force: bool) -> None:
    from buckdesign.design.safe_write import write_bytes_new, write_bytes_over
    from buckdesign.studies.table_file import csv_header, csv_lines

    table = study.table()
    files = {target: csv_header(list(table)) + csv_lines(table)}
    if plot is not None:
        from buckdesign.output.plots import figure_bytes, figure_format
        from buckdesign.output.tolerance_plots import study_figure

        files[plot] = figure_bytes(study_figure(study, name), figure_format(plot))
    for path, data in files.items():
        (write_bytes_over if force else write_bytes_new)(path, data)
        print_note(f"written: {path}")


def _print_study(study: ToleranceStudy, name: str, json: bool) -> None:
    from buckdesign.output.text import to_json
    from buckdesign.output.tolerance_text import study_text

    _print(to_json(study.to_dict()) if json else study_text(study, name))


def _print_unit(setting: Setting, unit: int, name: str, json: bool) -> None:
    from buckdesign.output.text import to_json
    from buckdesign.output.tolerance_unit_text import unit_text
    from buckdesign.studies.tolerance import one_unit

    found = one_unit(setting, unit)
    _print(to_json(found.to_dict()) if json else unit_text(found, name))


def _print(text: str) -> None:
    from buckdesign.output.text import plain_text

    print_data(plain_text(text) if is_ascii_only() else text)
