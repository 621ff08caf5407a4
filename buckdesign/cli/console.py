"""The only place that prints.

Data goes to standard output, everything else to standard error. A reader that stops early (``| head``) is no
fault: what is left is dropped, and the command ends with the status it would have had.
"""

from __future__ import annotations

import io
import os
import sys
from typing import TextIO

from buckdesign.errors import FileAccessError


def print_data(text: str) -> None:
    """Print to standard output.

    Raises
    ------
    FileAccessError
        It can't be written, for another reason than that nobody reads it.
    """
    _print(sys.stdout, text, "standard output")


def print_note(text: str) -> None:
    """Print to standard error."""
    _print(sys.stderr, text, "standard error")


def note_compiling() -> None:
    """Say that the first simulation on a machine takes longer, where it is the first."""
    from buckdesign.loop.compiling import is_cached

    if not is_cached():
        print_note("first run: compiling the simulation, about a minute; later runs start at once")


def flush_output() -> None:
    """Write out what is still buffered.

    Raises
    ------
    FileAccessError
        Standard output can't be written.
    """
    _print(sys.stdout, None, "standard output")


def be_lenient() -> None:
    """Let a character that the terminal can't show become a question mark instead of a failure."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, io.TextIOWrapper):
            stream.reconfigure(errors="replace")


def is_ascii_only() -> bool:
    """Whether standard output can't show the micro, ohm and degree signs."""
    encoding = getattr(sys.stdout, "encoding", None) or "ascii"
    try:
        "µΩ°²³±×–".encode(encoding)
    except (UnicodeEncodeError, LookupError):
        return True
    return False


def is_colourful() -> bool:
    """Whether standard output is a terminal and nobody asked for no colours (NO_COLOR, TERM=dumb)."""
    if os.environ.get("NO_COLOR") or os.environ.get("TERM") == "dumb":
        return False
    return sys.stdout is not None and sys.stdout.isatty()


def silence(stream: TextIO) -> None:
    """Send what is still to come on a stream whose reader has gone to nowhere."""
    nowhere = os.open(os.devnull, os.O_WRONLY)
    try:
        os.dup2(nowhere, stream.fileno())
    except (OSError, ValueError):
        pass
    finally:
        os.close(nowhere)


def _print(stream: TextIO | None, text: str | None, name: str) -> None:
    if stream is None:
        return
    try:
        if text is not None:
            stream.write(text if text.endswith("\n") else text + "\n")
        stream.flush()
    except BrokenPipeError:
        silence(stream)
    except OSError as error:
        silence(stream)
        raise FileAccessError(name, f"can't be written: {error.strerror or error}") from None
    except ValueError:
        return
