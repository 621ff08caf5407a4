"""The README as data: its two command lines, and its examples with their output.

``python -m tests.readme main-job`` and ``python -m tests.readme tests`` print a command line, for
``.ci/run``; ``python -m tests.readme refresh`` runs every example and writes its output into the README.
Standard library only, so that it runs before anything is installed.
"""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
import sysconfig
import tempfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path

ROOT = Path(__file__).parents[1]
README = ROOT / "README.md"

MARKED = re.compile(
    r"<!-- (?P<mark>[^\n]+) -->\n```(?P<kind>\w+)\n(?P<body>.*?)^```$", re.DOTALL | re.MULTILINE
)
CONSOLE = re.compile(r"^```console\n(?P<body>.*?)^```$", re.DOTALL | re.MULTILINE)
PART = re.compile(r"main job, (?:from \"(?P<first>[^\"]+)\"|start)(?: up to \"(?P<last>[^\"]+)\")?")


@dataclass(frozen=True, kw_only=True)
class Example:
    """A command that the README shows, with its output."""

    command: str
    output: str

    @property
    def is_reproducible(self) -> bool:
        """Whether every machine prints the same: nothing in it rests on a search by simulation."""
        searching = r"buckdesign (design|simulate|rectifiers|sweep|tolerance)|\.design\.toml"
        return re.search(searching, self.command) is None


def text() -> str:
    """The README."""
    return README.read_text(encoding="utf-8")


def block(mark: str) -> str:
    """The block that follows a mark.

    Raises
    ------
    LookupError
        There is not exactly one.
    """
    found = [match["body"] for match in MARKED.finditer(text()) if match["mark"] == mark]
    if len(found) != 1:
        raise LookupError(f"README.md: one block after <!-- {mark} --> is wanted, there are {len(found)}")
    return found[0]


def command_line(mark: str) -> str:
    """The one command line that follows a mark.

    Raises
    ------
    LookupError
        There is not exactly one.
    """
    line = block(mark).strip()
    if not line or "\n" in line:
        raise LookupError(f"README.md: one line after <!-- {mark} --> is wanted, not {line!r}")
    return line


def main_job() -> str:
    """Sets up and runs the main job."""
    return command_line("main job")


def tests() -> str:
    """Sets up and runs the tests."""
    return command_line("tests")


def design_command() -> str:
    """The part of the main job after the setting up."""
    return main_job().rsplit("&& ", 1)[1].removeprefix(".venv/bin/")


def examples() -> Iterator[Example]:
    """The examples in their order."""
    for match in CONSOLE.finditer(text()):
        command, output = _split(match["body"])
        yield Example(command=command, output=output)


def _split(body: str) -> tuple[str, str]:
    lines = body.splitlines(keepends=True)
    if not lines[0].startswith("$ "):
        raise LookupError(f"README.md: an example begins with '$ ', not with {lines[0]!r}")
    end = next(index for index, line in enumerate(lines) if not line.rstrip().endswith("\\")) + 1
    return "".join(lines[:end]).removeprefix("$ ").rstrip("\n"), "".join(lines[end:])


def run(command: str, folder: Path) -> str:
    """What a command prints: on standard output or, where that stays empty, on standard error.

    Raises
    ------
    LookupError
        It ended with a fault of the program itself.
    """
    path = os.pathsep.join([sysconfig.get_path("scripts"), os.environ.get("PATH", "")])
    settings = {"PATH": path, "XDG_CONFIG_HOME": str(folder / "config"), "PYTHONUTF8": "1"}
    ended = subprocess.run(
        ["bash", "-c", command],
        cwd=folder,
        env=os.environ | settings,
        capture_output=True,
        text=True,
        encoding="utf-8",
        check=False,
    )
    if "internal error" in ended.stderr or "Traceback" in ended.stderr:
        raise LookupError(f"{command}: {ended.stderr}")
    return ended.stdout or ended.stderr


def python_example() -> str:
    """The Python that the README shows."""
    return block("python")


def run_python(code: str, folder: Path) -> str:
    """What a program prints.

    Raises
    ------
    LookupError
        It fails.
    """
    ended = subprocess.run(
        [sys.executable, "-c", code],
        cwd=folder,
        env=os.environ | {"PYTHONUTF8": "1", "XDG_CONFIG_HOME": str(folder / "config")},
        capture_output=True,
        text=True,
        check=False,
    )
    if ended.returncode != 0:
        raise LookupError(f"the Python example: {ended.stderr}")
    return ended.stdout


def workplace(folder: Path) -> Path:
    """A folder in which the examples run: as the checkout's after the main job."""
    shutil.copytree(ROOT / "examples", folder / "examples", ignore=shutil.ignore_patterns("__pycache__"))
    return folder


def excerpt(page: str, part: str) -> str:
    """Part of the main job's page, by the headings where it begins and where the rest begins."""
    match = PART.fullmatch(part)
    if match is None:
        raise LookupError(f"README.md: part of the main job's page: {part!r}")
    lines = page.splitlines(keepends=True)
    first = 0 if match["first"] is None else _heading(lines, match["first"])
    last = len(lines) if match["last"] is None else _heading(lines, match["last"])
    return "".join(lines[first:last]).rstrip() + "\n"


def _heading(lines: list[str], begins: str) -> int:
    found = [index for index, line in enumerate(lines) if line.startswith(begins)]
    if not found:
        raise LookupError(f"the main job's page has no heading {begins!r}")
    return found[0]


def excerpts() -> Iterator[tuple[str, str]]:
    """Parts of the main job's page that the README shows: which, and the text."""
    for match in MARKED.finditer(text()):
        if match["mark"].startswith("main job, "):
            yield match["mark"], match["body"]


def refresh(folder: Path) -> None:
    """Run everything that the README shows and write what it printed into the README."""
    workplace(folder)
    page = run(design_command(), folder)
    printed = run_python(python_example(), folder)

    def marked(match: re.Match[str]) -> str:
        if match["mark"].startswith("main job, "):
            body = excerpt(page, match["mark"])
        elif match["mark"] == "python output":
            body = printed
        else:
            return match[0]
        return f"<!-- {match['mark']} -->\n```{match['kind']}\n{body}```"

    def example(match: re.Match[str]) -> str:
        command, _ = _split(match["body"])
        output = run(command, folder).rstrip()
        return f"```console\n$ {command}\n{output}{chr(10) if output else ''}```"

    fresh = CONSOLE.sub(example, MARKED.sub(marked, text()))
    README.write_text(fresh, encoding="utf-8")


def main(words: list[str]) -> int:
    """Print a command line, or refresh the README."""
    known: dict[str, Callable[[], str]] = {"main-job": main_job, "tests": tests}
    try:
        if words == ["refresh"]:
            with tempfile.TemporaryDirectory() as folder:
                refresh(Path(folder))
        elif len(words) == 1 and words[0] in known:
            print(known[words[0]]())
        else:
            print("python -m tests.readme main-job | tests | refresh", file=sys.stderr)
            return 2
    except LookupError as error:
        print(error, file=sys.stderr)
        return 1
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
