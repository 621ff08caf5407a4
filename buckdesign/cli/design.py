"""``buckdesign design``: from a requirement to a simulated, checked design file."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from buckdesign.cli.console import is_ascii_only, note_compiling, print_data, print_note
from buckdesign.cli.options import Force, Json, Output, Parts, RequirementFile, new_application, tables_with

if TYPE_CHECKING:
    from buckdesign.design.design_result import DesignResult

app = new_application(help="Design a supply from a requirement.")

INFEASIBLE = 3
"""Exit status where no design keeps the requirement."""


@app.command(epilog="Example: buckdesign design radio.toml --output radio.design.toml")
def design(
    requirement: RequirementFile,
    output: Output = None,
    force: Force = False,
    parts: Parts = None,
    budget: Annotated[
        Path | None,
        typer.Option("--budget", metavar="FILE", help="Losses at full load as a stacked bar, .svg or .png."),
    ] = None,
    json: Json = False,
) -> None:
    """Design a supply: choose every part, simulate it over the range, check every limit.

    Writes a design file (by default beside the requirement, with .design.toml) and prints what to buy, wind
    and expect. Status 3 where the requirement can't be met: then it says which line blocks it and what would
    have to give.
    """
    from buckdesign.design.ambient_limits import check_requirement_ambient
    from buckdesign.design.design_file import write_design
    from buckdesign.design.designer import design_supply
    from buckdesign.design.requirement import read_requirement
    from buckdesign.design.safe_write import check_writable_name

    target = default_target(requirement) if output is None else output
    tables = tables_with(parts)
    wanted = read_requirement(requirement, tables)
    check_requirement_ambient(wanted, tables)
    check_writable_name(target, force=force)
    if budget is not None:
        from buckdesign.output.plots import figure_format

        figure_format(budget)
        check_writable_name(budget, force=force)
    note_compiling()
    result = design_supply(wanted, tables, progress=print_note)
    if result.feasible and result.design is not None:
        write_design(result.design, target, force=force)
    _print(result, target, json)
    if budget is not None:
        _draw(result, budget, force)
    if not result.feasible:
        raise typer.Exit(INFEASIBLE)


def default_target(requirement: Path) -> Path:
    """The design file that belongs to a requirement file."""
    return requirement.with_name(f"{requirement.stem}.design.toml")


def _draw(result: DesignResult, budget: Path, force: bool) -> None:
    from buckdesign.design.safe_write import write_bytes_new, write_bytes_over
    from buckdesign.output.budget_plot import budget_figure
    from buckdesign.output.plots import figure_bytes, figure_format
    from buckdesign.output.simulation import heading

    for point in result.corners:
        if point.linear is not None:
            figure = budget_figure(point, heading(point))
            (write_bytes_over if force else write_bytes_new)(budget, figure_bytes(figure, figure_format(budget)))
            print_note(f"written: {budget}")


def _print(result: DesignResult, target: Path, json: bool) -> None:
    from buckdesign.output.summary import design_text
    from buckdesign.output.text import plain_text, to_json

    if json:
        print_data(to_json(result.to_dict(target)))
        return
    text = design_text(result, target)
    print_data(plain_text(text) if is_ascii_only() else text)
