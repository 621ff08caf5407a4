"""Names that have no place in the project: hosts, machines, and makers' numbers instead of classes."""

from __future__ import annotations

import re
import subprocess
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]

ENDINGS = {".py", ".md", ".toml", ".csv", ".svg", ".txt", ""}
IGNORED = {"build", "dist", "venv", "__pycache__"}
LISTS = {"tests/test_names.py", "tests/test_layers.py"}
"""Files that hold the forbidden names in order to look for them."""

FORBIDDEN = {
    "a web address": r"https?://|\bwww\.",
    "the host of a package registry": r"\b(?:pypi|pythonhosted|conda|npmjs|crates)\.(?:org|io|com)\b",
    "a path of a machine": r"(?<![\w.])/(?:home|root|work|Users)/|/tmp/venv",
    "a regulator by type number": r"\b(?:LM|LT|TL|MC|UA)\d{3,4}[A-Z]{0,3}\b",
    "a ring by shape code": r"\b(?:FT|T)\d{2,3}-\d{1,2}[A-D]?\b",
    "a material by mix number or colour": r"\b[Mm]ix[ -]?\d|\b(?:yellow|green|blue)[/-](?:white|blue|red)\b",
}


def text_files() -> list[Path]:
    """What is tracked or will be; all files where this is no checkout."""
    listed = subprocess.run(
        ["git", "ls-files", "--cached", "--others", "--exclude-standard"],
        cwd=ROOT,
        capture_output=True,
        text=True,
        check=False,
    )
    if listed.returncode == 0:
        found = [ROOT / name for name in listed.stdout.splitlines()]
    else:
        found = [path for path in ROOT.rglob("*") if not _is_hidden(path.relative_to(ROOT))]
    found = [path for path in found if path.suffix in ENDINGS and path.is_file()]
    return sorted(path for path in found if str(path.relative_to(ROOT)) not in LISTS)


def _is_hidden(path: Path) -> bool:
    return any(part in IGNORED or (part.startswith(".") and part != ".ci") for part in path.parts)


FILES = text_files()


def test_the_walk_finds_the_project() -> None:
    names = {str(path.relative_to(ROOT)) for path in FILES}
    assert {"README.md", "DEVELOPERS.md", ".ci/run", "pyproject.toml", "cores_data/rings.csv"} <= names
    assert len(names) > 100


@pytest.mark.parametrize("what", FORBIDDEN)
def test_no_file_names(what: str) -> None:
    pattern = re.compile(FORBIDDEN[what])
    found = [
        f"{path.relative_to(ROOT)}:{number}: {match[0]}"
        for path in FILES
        for number, line in enumerate(path.read_text(encoding="utf-8").splitlines(), start=1)
        if (match := pattern.search(line))
    ]
    assert found == []


@pytest.mark.parametrize(
    ("what", "text"),
    [
        ("a web address", "see https" + "://somewhere"),
        ("a path of a machine", "/ho" + "me/somebody/file"),
        ("a regulator by type number", "LM" + "317T"),
        ("a ring by shape code", "T106" + "-26"),
        ("a material by mix number or colour", "mix" + " 26"),
    ],
)
def test_the_patterns_find_what_they_are_for(what: str, text: str) -> None:
    assert re.search(FORBIDDEN[what], text)
