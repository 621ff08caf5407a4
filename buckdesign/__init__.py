"""Design of self-oscillating step-down supplies built from a three-terminal adjustable regulator.

The names below are loaded when they are first used, so that importing the package costs nothing. All
quantities are SI, temperatures in degC.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from buckdesign.design.design_file import read_design, write_design
    from buckdesign.design.designer import design_supply
    from buckdesign.design.operating import simulate
    from buckdesign.design.requirement import read_requirement
    from buckdesign.loop.parameters import LoopParameters
    from buckdesign.loop.results import steady_states, waveforms
    from buckdesign.parts import load_tables
    from buckdesign.studies.many import simulate_many
    from buckdesign.studies.sweep import sweep
    from buckdesign.studies.tolerance import tolerance

__version__ = "0.1.0"

_HOMES = {
    "LoopParameters": "buckdesign.loop.parameters",
    "design_supply": "buckdesign.design.designer",
    "load_tables": "buckdesign.parts",
    "read_design": "buckdesign.design.design_file",
    "read_requirement": "buckdesign.design.requirement",
    "simulate": "buckdesign.design.operating",
    "simulate_many": "buckdesign.studies.many",
    "steady_states": "buckdesign.loop.results",
    "sweep": "buckdesign.studies.sweep",
    "tolerance": "buckdesign.studies.tolerance",
    "waveforms": "buckdesign.loop.results",
    "write_design": "buckdesign.design.design_file",
}

__all__ = [
    "LoopParameters",
    "__version__",
    "design_supply",
    "load_tables",
    "read_design",
    "read_requirement",
    "simulate",
    "simulate_many",
    "steady_states",
    "sweep",
    "tolerance",
    "waveforms",
    "write_design",
]


def __getattr__(name: str) -> Any:
    """A public name, from the module it lives in."""
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    from importlib import import_module

    value = getattr(import_module(_HOMES[name]), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    """The public names, loaded or not."""
    return sorted({*globals(), *__all__})
