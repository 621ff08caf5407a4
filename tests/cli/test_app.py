"""The program as a whole: help, version, completion, exit status, one handler for all errors."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

import buckdesign
from buckdesign.cli import app as program_module
from buckdesign.cli.app import COMMANDS, run

pytestmark = pytest.mark.filterwarnings("default::ResourceWarning")

Program = Callable[..., Any]


def test_version(program: Program) -> None:
    outcome = program("--version")
    assert (outcome.status, outcome.out, outcome.err) == (0, f"buckdesign {buckdesign.__version__}\n", "")


@pytest.mark.parametrize("option", ["-h", "--help"])
def test_help_lists_every_command_with_one_line(program: Program, option: str) -> None:
    outcome = program(option)
    assert outcome.status == 0
    for name, line in COMMANDS.items():
        assert any(text.split(maxsplit=1) == [name, line] for text in outcome.out.split("\n"))


@pytest.mark.parametrize("name", list(COMMANDS))
def test_every_command_exists_and_its_help_has_an_example(program: Program, name: str) -> None:
    outcome = program(name, "-h")
    assert outcome.status == 0
    assert f"Usage: buckdesign {name}" in outcome.out
    texts = [outcome.out]
    if "\nCommands:" in outcome.out:
        listed = outcome.out.split("\nCommands:\n")[1].split("\n")
        inner = [line.split()[0] for line in listed if line.startswith("  ") and line[2] != " "]
        texts = [program(name, command, "-h").out for command in inner]
        assert texts
    assert all("Example: buckdesign" in text for text in texts)


def test_no_command_shows_help_on_stderr_with_status_2(program: Program) -> None:
    outcome = program()
    assert (outcome.status, outcome.out) == (2, "")
    assert "Commands:" in outcome.err


@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["part"], "no command is named 'part', nearest: parts"),
        (["--foo"], "No such option"),
        (["parts", "show"], "Missing argument"),
        (["parts", "list", "a", "b"], "extra argument"),
        (["parts", "list", "--json=3"], "does not take a value"),
    ],
)
def test_wrong_command_line_is_one_line_with_status_2(
    program: Program, arguments: list[str], said: str
) -> None:
    outcome = program(*arguments)
    assert (outcome.status, outcome.out) == (2, "")
    assert outcome.err.count("\n") == 1
    assert said in outcome.err
    assert "--help" in outcome.err


@pytest.mark.parametrize(("words", "expected"), [("buckdesign pa", "parts"), ("buckdesign parts sh", "show")])
def test_shell_completion(process: Program, words: str, expected: str) -> None:
    outcome = process(
        _BUCKDESIGN_COMPLETE="complete_bash", COMP_WORDS=words, COMP_CWORD=str(words.count(" "))
    )
    assert outcome.returncode == 0
    assert outcome.stdout.split() == [expected]


def test_completion_can_be_installed(program: Program) -> None:
    assert {"--install-completion", "--show-completion"} <= set(program("-h").out.split())


class TestHandler:
    """What becomes of an exception inside a command."""

    @pytest.fixture
    def failing(self, monkeypatch: pytest.MonkeyPatch) -> Callable[[BaseException], None]:
        def fail_with(error: BaseException) -> None:
            def loader(*args: object, **settings: object) -> None:
                raise error

            monkeypatch.setattr("buckdesign.cli.parts.tables_with", loader)

        return fail_with

    def test_internal_error_is_one_line_with_status_1(
        self, program: Program, failing: Callable[[BaseException], None], monkeypatch: pytest.MonkeyPatch
    ) -> None:
        failing(KeyError("a\nb"))
        outcome = program("parts", "list")
        assert (outcome.status, outcome.out) == (1, "")
        assert outcome.err.startswith("internal error: KeyError: ")
        assert outcome.err.count("\n") == 1
        assert "BUCKDESIGN_TRACEBACK" in outcome.err
        monkeypatch.setenv("BUCKDESIGN_TRACEBACK", "1")
        assert "Traceback" in program("parts", "list").err

    @pytest.mark.parametrize(
        ("error", "status"),
        [
            (KeyboardInterrupt(), 130),
            (BrokenPipeError(32, "Broken pipe"), 0),
            (RecursionError("deep"), 1),
            (MemoryError(), 1),
            (FileNotFoundError(2, "No such file or directory", "gone.csv"), 2),
            (SystemExit(4), 4),
        ],
    )
    def test_status(
        self,
        program: Program,
        failing: Callable[[BaseException], None],
        error: BaseException,
        status: int,
        monkeypatch: pytest.MonkeyPatch,
    ) -> None:
        monkeypatch.setattr("buckdesign.cli.errors.silence", lambda stream: None)
        failing(error)
        outcome = program("parts", "list")
        assert outcome.status == status
        assert "Traceback" not in outcome.err


@pytest.mark.skipif(sys.platform == "win32", reason="shell pipelines")
@pytest.mark.parametrize("command", ["parts list", "parts list --json", "-h", "parts list -h"])
def test_a_reader_that_stops_early_is_no_fault(command: str) -> None:
    script = f"{sys.executable} -m buckdesign {command} | head -n 1 >/dev/null; exit ${{PIPESTATUS[0]}}"
    done = subprocess.run(["bash", "-c", script], capture_output=True, text=True, timeout=60, check=False)
    assert (done.returncode, done.stderr) == (0, "")


@pytest.mark.skipif(sys.platform == "win32", reason="shell redirection")
@pytest.mark.parametrize("command", ["parts list", "--version", "-h"])
def test_closed_standard_output(command: str) -> None:
    script = f"{sys.executable} -m buckdesign {command} >&-"
    done = subprocess.run(["bash", "-c", script], capture_output=True, text=True, timeout=60, check=False)
    assert (done.returncode, done.stderr) == (0, "")


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a device that is always full")
@pytest.mark.parametrize("command", ["parts list", "--version", "-h"])
def test_full_device_is_one_line(command: str) -> None:
    script = f"{sys.executable} -m buckdesign {command} >/dev/full"
    done = subprocess.run(["bash", "-c", script], capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 2
    assert done.stderr.count("\n") == 1
    assert "No space left" in done.stderr


@pytest.mark.skipif(sys.platform == "win32", reason="signals and pipes")
def test_ctrl_c_ends_with_130_and_without_traceback(tmp_path: Path) -> None:
    pipe = tmp_path / "endless.csv"
    os.mkfifo(pipe)
    command = [sys.executable, "-m", "buckdesign", "parts", "check", str(pipe)]
    child = subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
    with pipe.open("w"):  # opens only when the child has begun to read
        for _ in range(30):
            # a signal just before the child waits for the pipe is seen only after it: then another one is needed
            child.send_signal(signal.SIGINT)
            try:
                out, err = child.communicate(timeout=2)
                break
            except subprocess.TimeoutExpired:
                continue
        else:
            child.kill()
            out, err = child.communicate()
    assert (child.returncode, out, err) == (130, "", "interrupted\n")


def test_characters_that_the_terminal_cannot_show(process: Program) -> None:
    plain = process("parts", "show", "1N5822", PYTHONIOENCODING="ascii")
    rich = process("parts", "show", "R 26.9/14.5/11.1", PYTHONIOENCODING="utf-8")
    assert plain.stdout.isascii()
    assert "degC" in plain.stdout
    assert "mm²" in rich.stdout
    assert "?" not in plain.stdout


def test_a_command_is_registered_by_one_line(program: Program, monkeypatch: pytest.MonkeyPatch) -> None:
    import types

    from buckdesign.cli.options import new_application

    module = types.ModuleType("buckdesign.cli.extra")
    module.app = new_application()  # type: ignore[attr-defined]

    @module.app.command()  # type: ignore[attr-defined, untyped-decorator]
    def extra(number: int = 3) -> int:
        """Return a status."""
        return number

    monkeypatch.setitem(sys.modules, "buckdesign.cli.extra", module)
    monkeypatch.setitem(program_module.COMMANDS, "extra", "Return a status.")
    assert run(["extra"]) == 3
    assert run(["extra", "--number", "4"]) == 4
    assert "Usage: buckdesign extra [OPTIONS]" in program("extra", "-h").out
