"""Options and arguments that several commands share, and the settings of every command's application."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer
from typer.core import TyperGroup

from buckdesign.errors import FileAccessError

if TYPE_CHECKING:
    from collections.abc import Sequence

    from buckdesign.parts import Tables

CONTEXT: dict[str, Any] = {"help_option_names": ["-h", "--help"]}


class QuickGroup(TyperGroup):
    """A command with subcommands whose own help option, when it is not used, costs no import."""

    def get_help_option(self, ctx: Any) -> Any:
        option = super().get_help_option(ctx)
        if option is not None:
            option.default = False
        return option


def new_application(**settings: Any) -> typer.Typer:
    """An application for one command file.

    Parameters
    ----------
    **settings
        Passed on to the toolkit, such as ``no_args_is_help=True`` for a command with subcommands.

    Returns
    -------
    typer.Typer
        Without completion options of its own, with plain help and without tracebacks in colours.
    """
    return typer.Typer(
        cls=QuickGroup,
        add_completion=False,
        rich_markup_mode=None,
        pretty_exceptions_enable=False,
        context_settings=CONTEXT,
        **settings,
    )


DesignFile = Annotated[Path, typer.Argument(metavar="DESIGN", help="Design file.")]
RequirementFile = Annotated[Path, typer.Argument(metavar="REQUIREMENT", help="Requirement file.")]

Json = Annotated[bool, typer.Option("--json", help="Print one JSON object instead of text.")]
Force = Annotated[bool, typer.Option("--force", help="Replace files that exist.")]
Output = Annotated[Path | None, typer.Option("--output", "-o", metavar="FILE", help="File to write.")]
Parts = Annotated[
    list[Path] | None,
    typer.Option(
        "--parts",
        metavar="FILE",
        help="CSV table of your own parts, merged over the built-in ones; may be given more than once.",
    ),
]
RequirementOption = Annotated[
    Path | None,
    typer.Option(
        "--requirement", metavar="FILE", help="Requirement to check against, instead of the carried one."
    ),
]
ElectricalOnly = Annotated[
    bool, typer.Option("--electrical-only", help="No temperatures and no losses added on to the loop model.")
]


def tables_with(extra: Sequence[Path] | None) -> Tables:
    """The tables of the package with the user's own merged over them.

    Raises
    ------
    InputError
        A table can't be read or has a fault.
    """
    from buckdesign.parts import load_tables

    for path in extra or ():
        if not Path(path).is_file() and not Path(path).exists():
            raise FileAccessError(path, "no such file")
    return load_tables(tuple(extra or ()))


def quantity_option(name: str, unit: str, text: str) -> Any:
    """An option that holds a quantity with a unit.

    Parameters
    ----------
    name : str
        Such as ``--supply``.
    unit : str
        Expected unit, see `buckdesign.units`.
    text : str
        Help line.

    Returns
    -------
    object
        For ``Annotated[float | None, ...]``.
    """
    from buckdesign.errors import QuantityError
    from buckdesign.units import parse_quantity

    def parse(value: str | float) -> float:
        try:
            return parse_quantity(value, unit)
        except QuantityError as error:
            raise typer.BadParameter(str(error)) from None

    return typer.Option(name, metavar="QUANTITY", help=text, parser=parse)
