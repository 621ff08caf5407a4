"""``buckdesign rectifiers``: diodes compared in a design."""

from __future__ import annotations

from enum import Enum
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from buckdesign.cli.console import is_ascii_only, note_compiling, print_data, print_note
from buckdesign.cli.options import (
    DesignFile,
    Force,
    Json,
    Parts,
    new_application,
    quantity_option,
    tables_with,
)

if TYPE_CHECKING:
    from buckdesign.studies.rectifier_choice import Choice
    from buckdesign.studies.rectifiers import Comparison

app = new_application(help="Compare rectifiers in a design.")

LIMIT_FAILS = 3
"""Exit status where the design's own rectifier does not keep a limit."""


class OverOption(Enum):
    """What `--over` can vary."""

    FREQUENCY = "frequency"
    LOAD = "load"
    SUPPLY = "supply"
    AMBIENT = "ambient"


@app.command(
    epilog="Example: buckdesign rectifiers radio.design.toml 1N5822 1N5811 --over load --plot flip.svg"
)
def rectifiers(
    design: DesignFile,
    names: Annotated[
        list[str] | None,
        typer.Argument(
            metavar="[NAMES]...", help="Rectifiers to compare; all whose ratings suffice by default."
        ),
    ] = None,
    parallel: Annotated[
        int, typer.Option("--parallel", min=1, max=8, metavar="N", help="Most pieces in parallel to try.")
    ] = 2,
    over: Annotated[
        OverOption | None, typer.Option("--over", help="Vary this, and show where the choice flips.")
    ] = None,
    supply: Annotated[float | None, quantity_option("--supply", "V", "Supply voltage.")] = None,
    load: Annotated[float | None, quantity_option("--load", "A", "Load, a constant current.")] = None,
    ambient: Annotated[float | None, quantity_option("--ambient", "degC", "Ambient temperature.")] = None,
    plot: Annotated[
        Path | None,
        typer.Option("--plot", metavar="FILE", help="Losses by mechanism, or over --over, .svg or .png."),
    ] = None,
    parts: Parts = None,
    json: Json = False,
    force: Force = False,
) -> None:
    """Compare rectifiers in this circuit: losses, junction, runaway margin, and why one drops out.

    The loop is run again with each: its rate moves with the rectifier. Status 3 where the design's own
    rectifier does not keep a limit.
    """
    from buckdesign.design.design_file import read_design
    from buckdesign.studies.rectifier_choice import Over, rectifier_choice
    from buckdesign.studies.rectifiers import compare_rectifiers

    _check_plot(plot, force)
    tables = tables_with(parts)
    made = read_design(design, tables)
    note_compiling()
    chosen = tuple(names or ())
    found = compare_rectifiers(
        made, chosen, parallel=parallel, supply=supply, load_current=load, ambient_c=ambient, tables=tables
    )
    choice = None
    if over is not None:
        choice = rectifier_choice(
            made, Over(over.value), chosen, parallel=parallel, supply=supply, load_current=load,
            ambient_c=ambient, tables=tables,
        )  # fmt: skip
    if plot is not None:
        _write_plot(found, choice, plot, force)
    _print(found, choice, json, is_chosen=bool(chosen))
    if not found.own.holds:
        raise typer.Exit(LIMIT_FAILS)


def _check_plot(plot: Path | None, force: bool) -> None:
    if plot is None:
        return
    from buckdesign.design.safe_write import check_writable_name
    from buckdesign.output.plots import figure_format

    figure_format(plot)
    check_writable_name(plot, force=force)


def _write_plot(found: Comparison, choice: Choice | None, plot: Path, force: bool) -> None:
    from buckdesign.design.safe_write import write_bytes_new, write_bytes_over
    from buckdesign.output.plots import figure_bytes, figure_format
    from buckdesign.output.rectifier_plots import bar_figure, choice_figure

    figure = bar_figure(found) if choice is None else choice_figure(choice)
    (write_bytes_over if force else write_bytes_new)(plot, figure_bytes(figure, figure_format(plot)))
    print_note(f"written: {plot}")


def _print(found: Comparison, choice: Choice | None, json: bool, *, is_chosen: bool) -> None:
    from buckdesign.output.rectifier_text import choice_text, comparison_text
    from buckdesign.output.text import plain_text, to_json

    if json:
        extra = {} if choice is None else {"over": choice.to_dict()}
        print_data(to_json(found.to_dict() | extra))
        return
    text = comparison_text(found, is_chosen=is_chosen)
    if choice is not None:
        text += "\n\n" + choice_text(choice)
    print_data(plain_text(text) if is_ascii_only() else text)
