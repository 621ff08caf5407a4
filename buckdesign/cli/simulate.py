"""``buckdesign simulate``: one operating point of a design, or its start from rest."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from buckdesign.cli.console import is_ascii_only, note_compiling, print_data, print_note
from buckdesign.cli.options import (
    DesignFile,
    ElectricalOnly,
    Force,
    Json,
    Parts,
    RequirementOption,
    new_application,
    quantity_option,
    tables_with,
)

if TYPE_CHECKING:
    from buckdesign.design.operating import Simulation

app = new_application(help="Simulate a design at one operating point.")

LIMIT_FAILS = 3
"""Exit status where a requirement or a part limit does not hold."""


@app.command(
    epilog="Example: buckdesign simulate radio.design.toml --supply 24 --load '1 A' --plot radio.svg"
)
def simulate(
    design: DesignFile,
    supply: Annotated[float | None, quantity_option("--supply", "V", "Supply voltage.")] = None,
    load: Annotated[float | None, quantity_option("--load", "A", "Load, a constant current.")] = None,
    load_resistance: Annotated[
        float | None, quantity_option("--load-resistance", "ohm", "Load, a resistance.")
    ] = None,
    ambient: Annotated[float | None, quantity_option("--ambient", "degC", "Ambient temperature.")] = None,
    from_rest: Annotated[
        bool, typer.Option("--from-rest", help="Start with everything discharged, and show the start.")
    ] = False,
    electrical_only: ElectricalOnly = False,
    requirement: RequirementOption = None,
    plot: Annotated[
        Path | None, typer.Option("--plot", metavar="FILE", help="Waveforms as a figure, .svg or .png.")
    ] = None,
    budget: Annotated[
        Path | None, typer.Option("--budget", metavar="FILE", help="Losses as a stacked bar, .svg or .png.")
    ] = None,
    waveforms: Annotated[
        Path | None, typer.Option("--waveforms", metavar="FILE", help="Waveforms as a CSV table.")
    ] = None,
    parts: Parts = None,
    json: Json = False,
    force: Force = False,
) -> None:
    """Simulate a design at one operating point: frequency, ripple, losses, temperatures, limits.

    The operating point is that of the design file unless options say otherwise. Status 3 where a limit or a
    requirement does not hold.
    """
    from buckdesign.design.design_file import read_design
    from buckdesign.design.operating import simulate as run
    from buckdesign.design.requirement import read_requirement

    _check_files((plot, budget), waveforms, force)
    tables = tables_with(parts)
    made = read_design(design, tables)
    wanted = None if requirement is None else read_requirement(requirement, tables)
    note_compiling()
    found = run(
        made,
        supply=supply,
        load_current=load,
        load_resistance=load_resistance,
        ambient_c=ambient,
        from_rest=from_rest,
        electrical_only=electrical_only,
        requirement=wanted,
        tables=tables,
    )
    _write_files(found, plot, waveforms, force)
    if budget is not None:
        _write_budget(found, budget, force)
    _print(found, json)
    if not found.point.holds:
        raise typer.Exit(LIMIT_FAILS)


def _check_files(figures: tuple[Path | None, ...], waveforms: Path | None, force: bool) -> None:
    """Refuse files that could not be written before anything is computed."""
    from buckdesign.design.safe_write import check_writable_name

    for figure in figures:
        if figure is not None:
            from buckdesign.output.plots import figure_format

            figure_format(figure)
            check_writable_name(figure, force=force)
    if waveforms is not None:
        check_writable_name(waveforms, force=force)


def _write_files(found: Simulation, plot: Path | None, waveforms: Path | None, force: bool) -> None:
    if plot is None and waveforms is None:
        return
    recorded = found.cycles() if found.start_waveforms is None else found.start_waveforms
    if waveforms is not None:
        from buckdesign.output.waveform_file import waveform_csv

        _write(waveforms, waveform_csv(recorded).encode(), force)
    if plot is not None:
        from buckdesign.output.plots import figure_bytes, figure_format, waveform_figure
        from buckdesign.output.simulation import heading

        title, mean = heading(found.point), found.point.output_voltage_v
        if found.start_waveforms is None:
            figure = waveform_figure(recorded, title, mean_output=mean)
        else:
            figure = waveform_figure(recorded, f"Start from rest: {title.split(':')[0]}")
        _write(plot, figure_bytes(figure, figure_format(plot)), force)


def _write_budget(found: Simulation, budget: Path, force: bool) -> None:
    from buckdesign.output.budget_plot import budget_figure
    from buckdesign.output.plots import figure_bytes, figure_format
    from buckdesign.output.simulation import heading

    figure = budget_figure(found.point, heading(found.point))
    _write(budget, figure_bytes(figure, figure_format(budget)), force)


def _write(path: Path, content: bytes, force: bool) -> None:
    from buckdesign.design.safe_write import write_bytes_new, write_bytes_over

    (write_bytes_over if force else write_bytes_new)(path, content)
    print_note(f"written: {path}")


def _print(found: Any, json: bool) -> None:
    from buckdesign.output.simulation import simulation_text
    from buckdesign.output.text import plain_text, to_json

    if json:
        print_data(to_json(found.to_dict()))
        return
    text = simulation_text(found.point)
    print_data(plain_text(text) if is_ascii_only() else text)
