"""The program: its commands, `--version`, `--help` and shell completion.

Each command is a file of its own with an `app`; it is imported only when the command runs or its own help is
asked for, so that the list of commands costs nothing.
"""

from __future__ import annotations

import sys
from collections.abc import Iterator
from contextlib import contextmanager
from importlib import import_module
from typing import Annotated, Any

import typer

from buckdesign import __version__
from buckdesign.cli.console import be_lenient, flush_output, print_data
from buckdesign.cli.errors import end_quietly, report
from buckdesign.cli.options import CONTEXT, QuickGroup

PROGRAM = "buckdesign"

COMMANDS: dict[str, str] = {
    "design": "Design, simulate and check a supply from a requirement.",
    "simulate": "Simulate one operating point, or the start from rest.",
    "choke": "Wind a choke, choose one, recognise a ring, show its bias curve.",
    "rectifiers": "Compare rectifiers in a design, and where the choice flips.",
    "sweep": "Compute a study over a design space into a table.",
    "tolerance": "Yield and worst case of a design by its tolerances.",
    "parts": "List, show and check part and core tables.",
}
"""Command and its line in the list, in the order of the list; the command is `app` in ``cli/<name>.py``."""


class CommandList(QuickGroup):
    """The commands, each imported when it is used."""

    def list_commands(self, ctx: Any) -> list[str]:
        return list(COMMANDS)

    def get_command(self, ctx: Any, cmd_name: str) -> Any:
        if cmd_name not in COMMANDS:
            return None
        module = import_module(f"buckdesign.cli.{cmd_name}")
        command = typer.main.get_command(module.app)
        command.name = cmd_name
        return command

    def resolve_command(self, ctx: Any, args: list[str]) -> Any:
        if args and args[0] not in COMMANDS and not args[0].startswith("-"):
            from buckdesign.errors import nearest_names

            near = ", ".join(nearest_names(args[0], COMMANDS))
            ctx.fail(f"no command is named '{args[0]}', nearest: {near}")
        return super().resolve_command(ctx, args)

    def format_commands(self, ctx: Any, formatter: Any) -> None:
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))

    def make_context(self, *args: Any, **settings: Any) -> Any:
        with end_quietly():
            return super().make_context(*args, **settings)

    def invoke(self, ctx: Any) -> Any:
        with end_quietly():
            return super().invoke(ctx)


def _show_version(wanted: bool) -> None:
    if wanted:
        print_data(f"{PROGRAM} {__version__}")
        raise typer.Exit


def _program(
    version: Annotated[
        bool,
        typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version and end."),
    ] = False,
) -> None:
    """Design self-oscillating step-down supplies built from a three-terminal adjustable regulator.

    From a requirement to component values, a wound choke and the simulated circuit.
    """


def application(first_word: str | None = None) -> typer.Typer:
    """The program as an application of the toolkit.

    Parameters
    ----------
    first_word : str, optional
        First word of the command line. Where it is a command, the completion options are left out: checking
        them would import a validation library only to show the help of a command.

    Returns
    -------
    typer.Typer
        The application.
    """
    made = typer.Typer(
        cls=CommandList,
        rich_markup_mode=None,
        pretty_exceptions_enable=False,
        add_completion=first_word not in COMMANDS,
        no_args_is_help=True,
        context_settings=CONTEXT,
    )
    made.callback()(_program)
    return made


def run(arguments: list[str] | None = None) -> int:
    """Run the program.

    Parameters
    ----------
    arguments : list of str, optional
        Command line without the program's name; that of the process where omitted.

    Returns
    -------
    int
        Exit status: 0 done; 1 internal error; 2 wrong command line or file; 3 done, but a requirement or
        limit is violated; 4 some points failed; 130 interrupted.
    """
    be_lenient()
    words = sys.argv[1:] if arguments is None else arguments
    with _exit_status() as status:
        command = typer.main.get_command(application(words[0] if words else None))
        status.append(command.main(args=words, prog_name=PROGRAM, standalone_mode=False))
    last = status[-1]
    return last if isinstance(last, int) else 0


@contextmanager
def _exit_status() -> Iterator[list[Any]]:
    """Collects the exit status: what the block appends, or what the error it ends with stands for."""
    status: list[Any] = []
    try:
        yield status
        flush_output()
    except SystemExit as end:
        status.append(end.code)
    except typer.Exit as end:
        status.append(end.exit_code)
    except BaseException as error:
        status.append(report(error))
