"""The whole error tree.

::

    BuckdesignError                 exit status 1
    +-- InputError                  exit status 2: the command line or an input file is wrong
    |   +-- QuantityError           a text is no quantity of the wanted kind
    |   +-- UnknownNameError        a part, ring, material or key that is in no table
    |   +-- TableError              a row of a CSV table is wrong
    |   +-- FaultsError             all faults of a file at once, one line each
    |   +-- FileAccessError         a file cannot be read or written
    +-- InfeasibleError             exit status 3: a requirement cannot be met

Every error says what was found, what is allowed and, where there is one, the remedy. All of them can be
pickled, so that they survive the way back from a worker process.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from pathlib import Path


class BuckdesignError(Exception):
    """Anything this package raises on purpose.

    Attributes
    ----------
    exit_status : int
        What a command ends with when the error reaches the command line.
    """

    exit_status: int = 1


class InputError(BuckdesignError):
    """The command line or an input file is wrong."""

    exit_status = 2


class QuantityError(InputError):
    """A text or number is no quantity of the wanted kind.

    Parameters
    ----------
    value : object
        What was given.
    unit : str
        The unit that is wanted.
    allowed : str
        What is wrong with it and what would be right.
    """

    def __init__(self, value: object, unit: str, allowed: str) -> None:
        super().__init__(value, unit, allowed)
        self.value = value
        self.unit = unit
        self.allowed = allowed

    def __str__(self) -> str:
        return f"{quoted(self.value)}: {self.allowed}"


class UnknownNameError(InputError):
    """A name that is in no table.

    Parameters
    ----------
    kind : str
        What was looked for, such as ``rectifier``.
    name : str
        The name that is not known.
    nearest : sequence of str
        Known names, nearest first.
    """

    def __init__(self, kind: str, name: str, nearest: Sequence[str] = ()) -> None:
        super().__init__(kind, name, tuple(nearest))
        self.kind = kind
        self.name = name
        self.nearest = tuple(nearest)

    @classmethod
    def among(cls, kind: str, name: str, known: Iterable[str], count: int = 3) -> UnknownNameError:
        """The error for `name`, with the `count` names of `known` that look most like it."""
        return cls(kind, name, nearest_names(name, known, count))

    @property
    def allowed(self) -> str:
        """What is allowed instead: the nearest known names."""
        if not self.nearest:
            return f"no {self.kind} is known"
        return f"unknown {self.kind}, nearest: " + ", ".join(quoted(name) for name in self.nearest)

    def __str__(self) -> str:
        return f"{quoted(self.name)}: {self.allowed}"


class TableError(InputError):
    """A CSV table is wrong.

    Parameters
    ----------
    file : str or Path
        The table.
    row : int or None
        Line in the file, counted from 1; None where the whole file is meant.
    column : str or None
        Column as the header names it.
    value : object
        What stands there; None where something is missing.
    allowed : str
        What is allowed there.
    """

    def __init__(
        self, file: str | Path, row: int | None, column: str | None, value: object, allowed: str
    ) -> None:
        super().__init__(file, row, column, value, allowed)
        self.file = file
        self.row = row
        self.column = column
        self.value = value
        self.allowed = allowed

    def __str__(self) -> str:
        return str(Fault(self.file, self.row, self.column or "", self.value, self.allowed))


@dataclass(frozen=True)
class Fault:
    """One fault of an input file; its text is one line.

    Attributes
    ----------
    file : str or Path
        The file.
    line : int or None
        Line counted from 1; None where it is not known.
    key : str
        Key or column; empty where the whole file or line is meant.
    value : object
        What stands there; None where something is missing.
    allowed : str
        What is allowed there.
    """

    file: str | Path
    line: int | None
    key: str
    value: object
    allowed: str

    def __str__(self) -> str:
        place = f"{self.file}" if self.line is None else f"{self.file}:{self.line}"
        if not self.key:
            found = "" if self.value is None else f"{quoted(self.value)}: "
        elif self.value is None:
            found = f"{self.key}: "
        else:
            found = f"{self.key} = {quoted(self.value)}: "
        return " ".join(f"{place}: {found}{self.allowed}".split())


class FaultsError(InputError):
    """All faults of one or more input files.

    Parameters
    ----------
    faults : sequence of Fault
        At least one; the text of the error has one line for each.

    Raises
    ------
    ValueError
        If `faults` is empty.
    """

    def __init__(self, faults: Sequence[Fault]) -> None:
        if not faults:
            raise ValueError("at least one fault is needed")
        super().__init__(tuple(faults))
        self.faults = tuple(faults)

    def __str__(self) -> str:
        return "\n".join(str(fault) for fault in self.faults)


class FileAccessError(InputError):
    """A file cannot be read or written.

    Parameters
    ----------
    path : str or Path
        The file.
    reason : str
        Why, and what would help.
    """

    def __init__(self, path: str | Path, reason: str) -> None:
        super().__init__(path, reason)
        self.path = path
        self.reason = reason

    def __str__(self) -> str:
        return f"{self.path}: {self.reason}"


class InfeasibleError(BuckdesignError):
    """A requirement cannot be met; the text says which one blocks it and what would have to give."""

    exit_status = 3


def nearest_names(name: str, known: Iterable[str], count: int = 3) -> tuple[str, ...]:
    """The names that look most like `name`.

    Parameters
    ----------
    name : str
        The misspelt name; case is ignored.
    known : iterable of str
        Names to choose from.
    count : int
        How many at most.

    Returns
    -------
    tuple of str
        Nearest first; equal ones in the order of `known`.
    """
    from difflib import SequenceMatcher

    wanted = name.casefold()
    scored = [(-SequenceMatcher(None, wanted, other.casefold()).ratio(), other) for other in known]
    scored.sort(key=lambda pair: pair[0])
    return tuple(other for _, other in scored[:count])


def quoted(value: object) -> str:
    """`value` as an error prints it: texts in quotes, on one line, cut at 60 characters.

    Parameters
    ----------
    value : object
        Anything.

    Returns
    -------
    str
        Printable text.
    """
    if not isinstance(value, str):
        return str(value)
    text = value if len(value) <= 60 else value[:57] + "..."
    return '"' + "".join(char if char.isprintable() else "?" for char in text) + '"'
