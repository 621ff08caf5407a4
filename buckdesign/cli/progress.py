"""How far a long command is, on standard error."""

from __future__ import annotations

import sys
import time
from types import TracebackType
from typing import TYPE_CHECKING, Self

from buckdesign.cli.console import print_note

if TYPE_CHECKING:
    from buckdesign.studies.chunks import Progress

TERMINAL_SECONDS, FIRST_SECONDS, FILE_SECONDS = 0.5, 3.0, 15.0
"""Time between two notes on a terminal; until the first one into a file, and between two there [s] (own choice)."""


class ProgressNote:
    """Tells how far it is: on a terminal in one line that changes, elsewhere in a line now and then.

    Parameters
    ----------
    things : str
        What is counted.
    """

    def __init__(self, things: str) -> None:
        self._things = things
        self._is_terminal = sys.stderr is not None and sys.stderr.isatty()
        self._told = time.monotonic()
        self._wait = TERMINAL_SECONDS if self._is_terminal else FIRST_SECONDS
        self._untold: Progress | None = None
        self._width = 0

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._wipe()
        if self._untold is not None:
            print_note(progress_text(self._untold, self._things))

    def __call__(self, progress: Progress) -> None:
        """Tell it, unless something was told just now."""
        now = time.monotonic()
        self._untold = progress
        if now - self._told < self._wait:
            return
        self._told, self._wait = now, TERMINAL_SECONDS if self._is_terminal else FILE_SECONDS
        self._untold = progress if self._is_terminal else None
        text = progress_text(progress, self._things)
        if not self._is_terminal:
            print_note(text)
            return
        self._wipe()
        sys.stderr.write(text)
        sys.stderr.flush()
        self._width = len(text)

    def _wipe(self) -> None:
        if self._width:
            sys.stderr.write("\r" + " " * self._width + "\r")
            sys.stderr.flush()
            self._width = 0


def progress_text(progress: Progress, things: str) -> str:
    """Such as ``12,064 of 1,000,000 points, 4,310/s, 3 min 49 s left``.

    Parameters
    ----------
    progress : Progress
        How far it is.
    things : str
        What is counted.

    Returns
    -------
    str
        One line.
    """
    rate = f"{progress.rate:,.0f}/s" if progress.rate >= 10.0 else f"{progress.rate:.2g}/s"
    text = f"{progress.done:,} of {progress.count:,} {things}, {rate}"
    return text if progress.done == progress.count else f"{text}, {duration_text(progress.remaining)} left"


def duration_text(seconds: float) -> str:
    """A time in the two largest of days, hours, minutes and seconds.

    Examples
    --------
    >>> duration_text(229.0), duration_text(7.2), duration_text(90061.0)
    ('3 min 49 s', '7 s', '1 d 1 h')
    """
    whole = round(seconds)
    steps = ((86400, "d"), (3600, "h"), (60, "min"), (1, "s"))
    parts: list[str] = []
    for size, name in steps:
        count, whole = divmod(whole, size)
        if count or (parts and len(parts) < 2) or size == 1:
            parts.append(f"{count} {name}")
    return " ".join(parts[:2] if len(parts) > 1 else parts)
