"""Tables that would be too wide for a terminal: the last column wrapped, or a line of its own below each row."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

from buckdesign.output.text import Column, text_table

WIDTH = 118
"""Characters in a line of the tables [1]."""

LEAST_WRAP = 24
"""Characters that the last column of a table gets at least [1]."""


def wrapped_table(columns: Sequence[Column], rows: Sequence[Sequence[str]]) -> str:
    """A table of at most `WIDTH` characters: the last column goes on below itself.

    Parameters
    ----------
    columns : sequence of Column
        Headings and alignment.
    rows : sequence of sequence of str
        Cells.

    Returns
    -------
    str
        Lines of the table.
    """
    others = zip(*(row[:-1] for row in rows), strict=True)
    taken = sum(
        2 + max(len(column.heading), *map(len, cells))
        for column, cells in zip(columns[:-1], others, strict=True)
    )
    room = max(WIDTH - taken, LEAST_WRAP)
    lines: list[list[str]] = []
    for row in rows:
        first, *more = textwrap.wrap(row[-1], room, break_on_hyphens=False) or [""]
        lines.append([*row[:-1], first])
        lines += [[*[""] * (len(columns) - 1), text] for text in more]
    return text_table(columns, lines)


def noted_table(columns: Sequence[Column], rows: Sequence[Sequence[str]], notes: Sequence[str]) -> str:
    """A table with a line below each row.

    Parameters
    ----------
    columns : sequence of Column
        Headings and alignment.
    rows : sequence of sequence of str
        Cells.
    notes : sequence of str
        One a row; none where it is empty.

    Returns
    -------
    str
        Lines of the table, the notes indented.
    """
    heading, rule, *lines = text_table(columns, rows).split("\n")
    found = [heading, rule]
    for line, note in zip(lines, notes, strict=True):
        found.append(line)
        found += textwrap.wrap(note, WIDTH, initial_indent="    ", subsequent_indent="    ")
    return "\n".join(found)
