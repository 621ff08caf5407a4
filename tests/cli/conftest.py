"""Running the program as a user does."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from buckdesign.cli.app import run


@dataclass(frozen=True)
class Outcome:
    """What a command gave."""

    status: int
    out: str
    err: str


@pytest.fixture(autouse=True)
def no_user_tables(tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch) -> None:
    """The user's own tables must not decide about a test."""
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path_factory.mktemp("config")))


@pytest.fixture
def program(capsys: pytest.CaptureFixture[str]) -> Callable[..., Outcome]:
    """Runs the program in this process."""

    def call(*arguments: str | Path) -> Outcome:
        status = run([str(argument) for argument in arguments])
        caught = capsys.readouterr()
        return Outcome(status, caught.out, caught.err)

    return call


@pytest.fixture
def process() -> Callable[..., subprocess.CompletedProcess[str]]:
    """Runs ``python -m buckdesign`` in a process of its own."""

    def call(*arguments: str | Path, **environment: str) -> subprocess.CompletedProcess[str]:
        return subprocess.run(
            [sys.executable, "-m", "buckdesign", *map(str, arguments)],
            capture_output=True,
            text=True,
            encoding="utf-8",
            env=os.environ | environment,
            timeout=60,
            check=False,
        )

    return call
