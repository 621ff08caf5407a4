"""Help and version must cost nothing: no heavy imports, and hardly more time than a bare application."""

from __future__ import annotations

import subprocess
import sys
import time

import pytest

HEAVY = ("numpy", "scipy", "pandas", "matplotlib", "numba", "pydantic", "rich", "jinja2", "schemdraw")

BARE = """
import typer
app = typer.Typer(rich_markup_mode=None)
@app.command()
def first(): "Do this."
@app.command()
def second(): "Do that."
app()
"""

OURS = """
import sys
from buckdesign.__main__ import main
sys.argv[0] = "buckdesign"
main()
"""


@pytest.mark.parametrize(
    "arguments",
    [["--help"], ["-h"], ["--version"], ["parts", "--help"], ["parts", "list", "-h"]],
)
def test_nothing_heavy_is_imported(arguments: list[str]) -> None:
    code = f"""
import sys
sys.argv = ["buckdesign", *{arguments!r}]
from buckdesign.__main__ import main
try:
    main()
except SystemExit:
    pass
print("loaded:", *(name for name in {HEAVY!r} if name in sys.modules))
"""
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True
    )
    assert done.stdout.rstrip("\n").split("\n")[-1].strip() == "loaded:"


def _quickest(code: str, argument: str) -> float:
    times = []
    for _ in range(9):
        start = time.perf_counter()
        subprocess.run([sys.executable, "-c", code, argument], capture_output=True, timeout=60, check=True)
        times.append(time.perf_counter() - start)
    return min(times)


@pytest.mark.parametrize("argument", ["--help", "--version"])
def test_within_one_and_a_half_of_a_bare_application(argument: str) -> None:
    assert _quickest(OURS, argument) < 1.5 * _quickest(BARE, "--help")
