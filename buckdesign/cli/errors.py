"""The one handler for everything that goes wrong in a command."""

from __future__ import annotations

import contextlib
import errno
import os
import sys
from collections.abc import Iterator

import typer

from buckdesign.cli.console import print_note, silence
from buckdesign.errors import BuckdesignError

INTERRUPTED = 130
"""Exit status after Ctrl-C (128 + SIGINT, the shells' convention)."""

USAGE = 2
"""Exit status for a wrong command line or input file."""

INTERNAL = 1
"""Exit status for a fault of the program itself."""

TRACEBACK_VARIABLE = "BUCKDESIGN_TRACEBACK"
"""Environment variable that asks for the traceback of an internal error."""


@contextlib.contextmanager
def end_quietly() -> Iterator[None]:
    """Turn Ctrl-C and a reader that has gone into an exit status, before the toolkit does."""
    try:
        yield
    except KeyboardInterrupt:
        print_note("interrupted")
        raise typer.Exit(INTERRUPTED) from None
    except BrokenPipeError:
        if sys.stdout is not None:
            silence(sys.stdout)
        raise typer.Exit(0) from None


def report(error: BaseException) -> int:
    """Say what went wrong, on standard error, and give the exit status.

    Parameters
    ----------
    error : BaseException
        What a command ended with.

    Returns
    -------
    int
        Exit status.
    """
    if isinstance(error, BuckdesignError):
        print_note(str(error))
        return error.exit_status
    if isinstance(error, KeyboardInterrupt | typer.Abort):
        print_note("interrupted")
        return INTERRUPTED
    if hasattr(error, "format_message") and hasattr(error, "exit_code"):
        print_note(_usage_line(error))
        return int(error.exit_code)
    if isinstance(error, OSError) and (error.filename is not None or error.errno == errno.ENOSPC):
        print_note(f"{error.filename or 'output'}: {error.strerror or error}")
        if sys.stdout is not None:
            silence(sys.stdout)
        return USAGE
    return _report_internal(error)


def _usage_line(error: BaseException) -> str:
    """A fault of the command line in one line, with the command whose help says more."""
    text: str = error.format_message()  # type: ignore[attr-defined]
    if type(error).__name__ == "NoArgsIsHelpError":
        return text
    message = " ".join(text.split())
    context = getattr(error, "ctx", None)
    path = context.command_path if context is not None else "buckdesign"
    return f"{path}: {message} ({path} --help says more)"


def _report_internal(error: BaseException) -> int:
    if os.environ.get(TRACEBACK_VARIABLE):
        import traceback

        print_note("".join(traceback.format_exception(error)).rstrip())
    message = " ".join(str(error).split())
    kind = type(error).__name__
    print_note(
        f"internal error: {kind}{': ' if message else ''}{message} "
        f"(set {TRACEBACK_VARIABLE}=1 to see where it happened)"
    )
    return INTERNAL
