"""The house: a module imports from its own layer or a lower one; some things are done in one place only."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from pathlib import Path

import pytest

import buckdesign

ROOT = Path(buckdesign.__file__).parent

LAYERS = {
    "units": 0,
    "constants": 0,
    "errors": 0,
    "physics": 1,
    "parts": 2,
    "loop": 3,
    "design": 4,
    "studies": 5,
    "output": 6,
    "cli": 7,
    "__init__": 8,
    "__main__": 8,
}

ONLY_IN = {
    "matplotlib": ("output",),
    "schemdraw": ("output",),
    "jinja2": ("output",),
    "typer": ("cli",),
    "rich": ("cli",),
    "numba": ("loop",),
    "pandas": ("loop", "studies", "output", "cli"),
}
"""Libraries and the packages that may import them."""

MODULES = sorted(ROOT.rglob("*.py"))


def _package(path: Path) -> str:
    first = path.relative_to(ROOT).parts[0]
    return first.removesuffix(".py")


def _imports(path: Path) -> Iterator[tuple[str, int]]:
    """Full names of the modules that a file imports, wherever in it, with the line."""
    tree = ast.parse(path.read_text(encoding="utf-8"))
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            yield from ((alias.name, node.lineno) for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            module = node.module or ""
            if node.level:
                package = ["buckdesign", *path.relative_to(ROOT).parts[: -node.level]]
                module = ".".join([*package, module]).rstrip(".")
            if module == "buckdesign":
                yield from ((f"buckdesign.{alias.name}", node.lineno) for alias in node.names)
            else:
                yield module, node.lineno


def test_every_package_has_a_layer() -> None:
    assert {_package(path) for path in MODULES} <= set(LAYERS)


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_imports_go_down(path: Path) -> None:
    own = LAYERS[_package(path)]
    for name, line in _imports(path):
        if not name.startswith("buckdesign."):
            continue
        target = name.split(".")[1]
        if target not in LAYERS:
            assert target == "__version__", f"{path}:{line}: {name}"
            continue
        assert LAYERS[target] <= own, f"{path}:{line}: {_package(path)} must not import {target}"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_libraries_stay_where_they_belong(path: Path) -> None:
    for name, line in _imports(path):
        allowed = ONLY_IN.get(name.split(".")[0])
        assert allowed is None or _package(path) in allowed, f"{path}:{line}: {name}"


@pytest.mark.parametrize(
    "path",
    [path for path in MODULES if _package(path) != "cli"],
    ids=lambda path: str(path.relative_to(ROOT)),
)
def test_only_the_command_line_prints(path: Path) -> None:
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        printing = isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "print"
        assert not printing, f"{path}:{getattr(node, 'lineno', 0)}: print"


@pytest.mark.parametrize("path", sorted((ROOT / "physics").glob("*.py")), ids=lambda path: path.name)
def test_physics_sees_numpy_and_scipy_only(path: Path) -> None:
    standard = {"__future__", "collections", "math", "typing", "enum", "functools", "itertools"}
    for name, line in _imports(path):
        top = name.split(".")[0]
        assert top in {"numpy", "scipy", "buckdesign", *standard}, f"{path}:{line}: {name}"


@pytest.mark.parametrize("path", MODULES, ids=lambda path: str(path.relative_to(ROOT)))
def test_no_star_import_and_no_path_or_host_of_a_machine(path: Path) -> None:
    text = path.read_text(encoding="utf-8")
    assert "import *" not in text
    for trace in ("http://", "https://", "/home/", "/work/", "/root/"):
        assert trace not in text, f"{path}: {trace}"
