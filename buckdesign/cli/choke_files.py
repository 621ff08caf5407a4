"""What the choke commands share: files to write, and what is printed."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from buckdesign.cli.console import is_ascii_only, print_data, print_note
from buckdesign.errors import InputError, quoted

if TYPE_CHECKING:
    from buckdesign.design.choke_bench import WoundChoke
    from buckdesign.design.choke_need import ChokeNeed, Rank
    from buckdesign.parts import Material

SHEETS = (".svg", ".txt")
"""Endings of a winding sheet."""


def check_files(plot: Path | None, sheet: Path | None, force: bool) -> None:
    """Refuse files that could not be written before anything is computed."""
    from buckdesign.design.safe_write import check_writable_name

    if plot is not None:
        from buckdesign.output.plots import figure_format

        figure_format(plot)
        check_writable_name(plot, force=force)
    if sheet is not None:
        if sheet.suffix.lower() not in SHEETS:
            raise InputError(f"{quoted(str(sheet))}: a winding sheet ends in {' or '.join(SHEETS)}")
        check_writable_name(sheet, force=force)
    if plot is not None and sheet is not None and plot.resolve() == sheet.resolve():
        raise InputError(f"{quoted(str(plot))}: --plot and --sheet name the same file")


def write_sheet(path: Path, choke: WoundChoke, force: bool) -> None:
    """Write a winding sheet as text or drawing, by the ending of its name."""
    from buckdesign.output.winding_sheet import sheet_figure, sheet_text

    if path.suffix.lower() == ".txt":
        _write(path, sheet_text(choke).encode(), force)
        return
    from buckdesign.output.plots import figure_bytes

    _write(path, figure_bytes(sheet_figure(choke), "svg"), force)


def write_plot(path: Path, figure: Any, force: bool) -> None:
    """Write a figure."""
    from buckdesign.output.plots import figure_bytes, figure_format

    _write(path, figure_bytes(figure, figure_format(path)), force)


def store(material: Material, path: Path | None, force: bool) -> Path:
    """Write a material of the user's own and say where it went."""
    from buckdesign.design.material_table import store_material

    target = store_material(material, path, force=force)
    print_note(f"material {quoted(material.name)} stored in {target}")
    return target


def show(values: Any, text: str, json: bool) -> None:
    """Print a result as JSON or text."""
    from buckdesign.output.text import plain_text, to_json

    if json:
        print_data(to_json(values))
    else:
        print_data(plain_text(text) if is_ascii_only() else text)


def parse_rank(text: str) -> Rank:
    """The order of a choice.

    Raises
    ------
    InputError
        It is none that is known.
    """
    from buckdesign.design.choke_need import Rank

    for rank in Rank:
        if text.casefold() == rank.value:
            return rank
    raise InputError(f"--rank = {quoted(text)}: one of {', '.join(rank.value for rank in Rank)} is wanted")


def whole(name: str, value: int) -> int:
    """A number of things.

    Raises
    ------
    InputError
        It is not above zero, or more than makes sense.
    """
    if not 1 <= value <= 1000:
        raise InputError(f"{name} = {value}: a whole number from 1 to 1000 is wanted")
    return value


def choice_title(need: ChokeNeed) -> str:
    """One line that says what the chokes are for."""
    from buckdesign.units import format_quantity

    return (
        f"{format_quantity(need.inductance, 'H')} at {format_quantity(need.current, 'A')}, "
        f"ripple {format_quantity(need.ripple, 'A')} at {format_quantity(need.frequency, 'Hz')}, "
        f"air {need.ambient_c:.0f} \u00b0C"
    )


def _write(path: Path, content: bytes, force: bool) -> None:
    from buckdesign.design.safe_write import write_bytes_new, write_bytes_over

    (write_bytes_over if force else write_bytes_new)(path, content)
    print_note(f"written: {path}")
