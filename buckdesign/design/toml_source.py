"""Read a TOML file into a tree that still knows on which line each key stands.

The standard library parses TOML but keeps no line numbers. A file is therefore parsed by it first; only
a text that it accepts is then scanned a second time for the lines, so that the scanner may rely on valid
syntax.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from buckdesign.errors import Fault, FaultsError, FileAccessError

Step = str | int
KeyPath = tuple[Step, ...]

LARGEST_FILE = 4_000_000
"""A requirement or design file has a few kilobytes; more than this many bytes is not one."""

_BARE = re.compile(r"[A-Za-z0-9_-]+")
_SCALAR = re.compile(r"[^,\]}#\n]+")
_SPACE = re.compile(r"[ \t]*")
_BLANK = re.compile(r"(?:[ \t\n]|#[^\n]*)*")
_BASIC = re.compile(r'"((?:[^"\\\n]|\\.)*)"')
_LITERAL = re.compile(r"'([^'\n]*)'")
_LONG_BASIC = re.compile(r'"""(?:[^"\\]|\\[\s\S]|"{1,2}(?!"))*"{3,5}')
_LONG_LITERAL = re.compile(r"'''(?:[^']|'{1,2}(?!'))*'{3,5}")
_ERROR_LINE = re.compile(r"\s*\(at line (\d+), column (\d+)\)$")
_ERROR_END = re.compile(r"\s*\(at end of document\)$")


@dataclass(frozen=True, kw_only=True)
class TomlSource:
    """A parsed file: its tree and the line of every key.

    Attributes
    ----------
    path : pathlib.Path
        The file, as it was named.
    tree : dict
        The content as nested dictionaries and lists.
    lines : Mapping
        Line number (from 1) for the path of each key, table and list element.
    """

    path: Path
    tree: dict[str, Any]
    lines: Mapping[KeyPath, int]

    def locate(self, *steps: Step) -> int:
        """Line of a key, or of the nearest table around it that the file has; 1 for the file itself."""
        for length in range(len(steps), 0, -1):
            line = self.lines.get(steps[:length])
            if line is not None:
                return line
        return 1


Locate = Callable[..., int | None]
"""Line of a key path; None where there is no file."""


def read_toml(path: Path) -> TomlSource:
    """Read and parse a TOML file.

    Parameters
    ----------
    path : pathlib.Path
        The file.

    Returns
    -------
    TomlSource
        Tree and lines.

    Raises
    ------
    FileAccessError
        The file is missing, is a folder or can't be read.
    FaultsError
        The file is not text, too large, or not valid TOML; the fault has the line.
    """
    return parse_toml(_read_text(path), path)


def parse_toml(text: str, path: Path) -> TomlSource:
    """Parse TOML text; `path` is only named in errors.

    Parameters
    ----------
    text : str
        The text.
    path : pathlib.Path
        The file it comes from.

    Returns
    -------
    TomlSource
        Tree and lines.
    """
    text = text.replace("\r\n", "\n")
    try:
        tree = tomllib.loads(text)
        lines = _Scanner(text).scan()
    except tomllib.TOMLDecodeError as error:
        raise FaultsError([_syntax_fault(path, text, str(error))]) from None
    except RecursionError:
        raise FaultsError([_file_fault(path, "lists or tables nested less deeply")]) from None
    except ValueError as error:
        raise FaultsError([_file_fault(path, f"valid TOML ({error})")]) from None
    return TomlSource(path=path, tree=tree, lines=lines)


def _read_text(path: Path) -> str:
    try:
        with path.open("rb") as file:
            data = file.read(LARGEST_FILE + 1)
    except OSError as error:
        raise FileAccessError(path, error.strerror or str(error)) from None
    except ValueError as error:
        raise FileAccessError(path, str(error)) from None
    if len(data) > LARGEST_FILE:
        raise FaultsError([_file_fault(path, f"a text file of at most {LARGEST_FILE} bytes")])
    if b"\0" in data:
        line = data[: data.index(b"\0")].count(b"\n") + 1
        raise FaultsError([_file_fault(path, "a text file in TOML; this one is binary", line)])
    try:
        return data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise FaultsError([_file_fault(path, "a text file in TOML, encoded as UTF-8", line)]) from None


def _file_fault(path: Path, allowed: str, line: int = 1) -> Fault:
    return Fault(file=path, line=line, key="", value=None, allowed=allowed)


def _syntax_fault(path: Path, text: str, message: str) -> Fault:
    lines = text.split("\n")
    place = _ERROR_LINE.search(message)
    if place:
        number = int(place.group(1))
        reason = message[: place.start()]
    else:
        number = len(text.rstrip("\n").split("\n"))
        reason = _ERROR_END.sub("", message)
    shown = lines[number - 1].strip() if number <= len(lines) else ""
    reason = reason[:1].lower() + reason[1:]
    allowed = f"not valid TOML ({reason}); texts and quantities go in quotes, a key stands once in its table"
    return Fault(file=path, line=number, key="", value=shown or None, allowed=allowed)


class _Scanner:
    """Walks through valid TOML text and notes the line of each key."""

    def __init__(self, text: str) -> None:
        self.text = text
        self.position = 0
        self.lines: dict[KeyPath, int] = {}
        self.counted_to = 0
        self.line = 1
        self.array_sizes: dict[KeyPath, int] = {}

    def scan(self) -> dict[KeyPath, int]:
        table: KeyPath = ()
        while self._skip(_BLANK) < len(self.text):
            if self.text.startswith("[[", self.position):
                table = self._header(2)
            elif self.text[self.position] == "[":
                table = self._header(1)
            else:
                self._pair(table)
        return self.lines

    def _skip(self, pattern: re.Pattern[str]) -> int:
        match = pattern.match(self.text, self.position)
        if match:
            self.position = match.end()
        return self.position

    def _here(self) -> int:
        self.line += self.text.count("\n", self.counted_to, self.position)
        self.counted_to = self.position
        return self.line

    def _note(self, path: KeyPath, line: int) -> None:
        for length in range(1, len(path) + 1):
            self.lines.setdefault(path[:length], line)

    def _header(self, brackets: int) -> KeyPath:
        line = self._here()
        self.position += brackets
        keys = self._dotted_key()
        self.position += brackets
        path: KeyPath = ()
        for number, key in enumerate(keys, 1):
            path = (*path, key)
            if brackets == 2 and number == len(keys):
                index = self.array_sizes.get(path, 0)
                self.array_sizes[path] = index + 1
                path = (*path, index)
            elif path in self.array_sizes:
                path = (*path, self.array_sizes[path] - 1)
        self._note(path, line)
        return path

    def _dotted_key(self) -> tuple[str, ...]:
        keys = []
        while True:
            self._skip(_SPACE)
            keys.append(self._simple_key())
            self._skip(_SPACE)
            if not self.text.startswith(".", self.position):
                return tuple(keys)
            self.position += 1

    def _simple_key(self) -> str:
        start = self.position
        for pattern in (_BASIC, _LITERAL, _BARE):
            if self._skip(pattern) > start:
                token = self.text[start : self.position]
                return token if pattern is _BARE else str(tomllib.loads(f"x={token}")["x"])
        raise AssertionError(f"no key at character {start}")

    def _pair(self, table: KeyPath) -> None:
        line = self._here()
        path = (*table, *self._dotted_key())
        self._note(path, line)
        self.position += 1
        self._skip(_SPACE)
        self._value(path)

    def _value(self, path: KeyPath) -> None:
        first = self.text[self.position]
        if first == "[":
            self._list(path)
        elif first == "{":
            self._inline_table(path)
        elif self.text.startswith('"""', self.position):
            self._skip(_LONG_BASIC)
        elif self.text.startswith("'''", self.position):
            self._skip(_LONG_LITERAL)
        elif first in "\"'":
            self._skip(_BASIC if first == '"' else _LITERAL)
        else:
            self._skip(_SCALAR)

    def _list(self, path: KeyPath) -> None:
        self.position += 1
        index = 0
        while self.text[self._skip(_BLANK)] != "]":
            element = (*path, index)
            self._note(element, self._here())
            self._value(element)
            index += 1
            if self.text[self._skip(_BLANK)] == ",":
                self.position += 1
        self.position += 1

    def _inline_table(self, path: KeyPath) -> None:
        self.position += 1
        while self.text[self._skip(_BLANK)] != "}":
            self._pair(path)
            if self.text[self._skip(_BLANK)] == ",":
                self.position += 1
        self.position += 1
