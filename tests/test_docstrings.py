"""Docstrings: documented parameters are those of the signature, and examples run.

Strict, with every parameter and result documented, for all of physics and for every function that a package's
``__init__`` offers; elsewhere one line is enough, but a list of parameters that is there must be true.
"""

from __future__ import annotations

import doctest
import importlib
import inspect
import pkgutil
import re
from collections.abc import Callable, Iterator
from pathlib import Path
from types import ModuleType

import pytest

import buckdesign

# The docstrings of commands are help texts for the terminal, not numpydoc.
EXEMPT = ("buckdesign.cli", "buckdesign.__main__")

Function = Callable[..., object]


def modules() -> Iterator[ModuleType]:
    yield buckdesign
    for info in pkgutil.walk_packages(buckdesign.__path__, "buckdesign."):
        if not info.name.startswith(EXEMPT):
            yield importlib.import_module(info.name)


def plain_function(value: object) -> Function | None:
    """The Python function behind a value: itself, or what a compiled dispatcher was made of."""
    value = getattr(value, "py_func", value)
    return value if inspect.isfunction(value) else None


def public_functions(module: ModuleType) -> Iterator[tuple[str, Function]]:
    for name, value in vars(module).items():
        function = plain_function(value)
        if function is not None and not name.startswith("_") and function.__module__ == module.__name__:
            yield name, function


def section(docstring: str, title: str) -> str:
    """Text of a numpydoc section, empty where there is none."""
    found = re.search(rf"^{title}\n-+\n(.*?)(?=^\S[^\n]*\n-{{3,}}\n|\Z)", docstring, re.MULTILINE | re.DOTALL)
    return found.group(1) if found else ""


def documented_parameters(docstring: str) -> dict[str, str]:
    """Parameter names in order, each with its description."""
    entries: dict[str, str] = {}
    names: list[str] = []
    for line in section(docstring, "Parameters").splitlines():
        if re.match(r"^\*{0,2}\w", line):
            names = [name.strip(" *") for name in line.split(" : ")[0].split(",")]
            entries.update(dict.fromkeys(names, ""))
        else:
            for name in names:
                entries[name] += line + "\n"
    return entries


def source(module: ModuleType) -> str:
    return Path(str(module.__file__)).read_text(encoding="utf-8")


FUNCTIONS = [
    pytest.param(function, id=f"{module.__name__.removeprefix('buckdesign.')}.{name}")
    for module in modules()
    for name, function in public_functions(module)
]
OFFERED = {
    plain_function(getattr(module, name))
    for module in modules()
    if hasattr(module, "__path__")
    for name in {*vars(module), *getattr(module, "__all__", ())}
    if not name.startswith("_")
} - {None}
STRICT = [
    case
    for case in FUNCTIONS
    if str(case.id).startswith("physics.") or any(value in OFFERED for value in case.values)
]
PHYSICS = [case for case in FUNCTIONS if str(case.id).startswith("physics.")]
DOCTESTED = [module.__name__ for module in modules() if ">>> " in source(module)]


def doc(function: Function) -> str:
    return inspect.getdoc(function) or ""


@pytest.mark.parametrize("function", FUNCTIONS)
def test_documented_parameters_exist(function: Function) -> None:
    assert doc(function), "no docstring"
    documented = documented_parameters(doc(function))
    assert not documented or set(documented) == set(inspect.signature(function).parameters)


@pytest.mark.parametrize("function", STRICT)
def test_every_parameter_is_documented(function: Function) -> None:
    assert set(documented_parameters(doc(function))) == set(inspect.signature(function).parameters)


@pytest.mark.parametrize("function", STRICT)
def test_what_is_returned_is_documented(function: Function) -> None:
    annotation = inspect.signature(function).return_annotation
    assert annotation is not inspect.Signature.empty
    if annotation not in (None, "None"):
        assert section(doc(function), "Returns") or section(doc(function), "Yields")


@pytest.mark.parametrize("function", PHYSICS)
def test_physics_names_unit_source_and_example(function: Function) -> None:
    text = doc(function)
    for name, description in documented_parameters(text).items():
        unitless = inspect.signature(function).parameters[name].annotation in ("str", str)
        assert unitless or re.search(r"\[.+\]", description, re.DOTALL), f"{name} has no unit in brackets"
    assert section(text, "Examples"), "no example"
    sources = section(text, "References") + section(text, "Notes")
    assert sources.strip(), "no source"


@pytest.mark.parametrize("name", DOCTESTED)
def test_examples_run(name: str) -> None:
    result = doctest.testmod(importlib.import_module(name))
    assert result.attempted > 0
    assert result.failed == 0


def test_the_walk_finds_the_physics() -> None:
    assert len(PHYSICS) > 100
    assert len(DOCTESTED) > 20
