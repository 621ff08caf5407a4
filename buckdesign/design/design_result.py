"""What `design_supply` hands back."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from buckdesign.design.design_file import Design
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.heat_sinks import HeatSinks
from buckdesign.design.operating_point import Check, OperatingPoint
from buckdesign.design.requirement import Requirement


@dataclass(frozen=True, kw_only=True)
class Blocking:
    """A line of the requirement that can't be met with all others.

    Attributes
    ----------
    key : str
        Line in the requirement file.
    unit : str
        As in `buckdesign.units`; empty for names.
    required : float or str
        What it asks.
    reachable : float or str or None
        The best that was found with everything else kept; None: nothing.
    relax_to : float or str or None
        What would do; None: no single value does.
    alone : bool
        Whether relaxing this line alone makes the requirement feasible; otherwise all lines that are listed
        have to give together.
    text : str
        One sentence for people.
    """

    key: str
    unit: str
    required: float | str
    reachable: float | str | None
    relax_to: float | str | None
    alone: bool
    text: str

    def to_dict(self) -> dict[str, Any]:
        """By key."""
        return {name: getattr(self, name) for name in self.__dataclass_fields__}


@dataclass(frozen=True, kw_only=True)
class Alternative:
    """Another design that keeps the requirement, or comes next to the one chosen.

    Attributes
    ----------
    differs : str
        In what, in words.
    values : Mapping
        Its component values, keys as in `DesignResult.values`.
    holds : bool
        Whether it keeps every limit.
    efficiency : float
        Lowest at full load [1].
    ripple_v : float
        Largest [V].
    frequency_low_hz, frequency_high_hz : float
        From half to full load [Hz].
    """

    differs: str
    values: Mapping[str, Any]
    holds: bool
    efficiency: float
    ripple_v: float
    frequency_low_hz: float
    frequency_high_hz: float

    def to_dict(self) -> dict[str, Any]:
        """By key."""
        return {name: getattr(self, name) for name in self.__dataclass_fields__}


@dataclass(frozen=True, kw_only=True)
class DesignResult:
    """A requirement turned into a design, or the reason why it can't be.

    Attributes
    ----------
    requirement : Requirement
        What was asked.
    feasible : bool
        Whether every requirement and part limit holds over the range.
    design : Design or None
        The design; None where the requirement is infeasible.
    resolved : ResolvedDesign or None
        The same with every value in place.
    corners : tuple of OperatingPoint
        The range simulated, each point with its own checks; the best attempt where infeasible.
    checks : tuple of Check
        Every limit at the point where it is nearest, smallest margin first.
    blocking : tuple of Blocking
        Empty where feasible.
    alternatives : tuple of Alternative
        Best first.
    frequency_spread_hz : tuple of float
        Lowest and highest frequency at nominal supply and full load, over the range of ambient and with the
        regulator's output inductance at both ends of its band, the largest uncertainty of all [Hz].
    values : Mapping
        Every chosen component value; units in the keys.
    heat_sinks : HeatSinks or None
        What each device and the common sink need over the range.
    warnings, cautions, assumptions : tuple of str
        What to mind, and what the numbers rest on.
    """

    requirement: Requirement
    feasible: bool
    design: Design | None = None
    resolved: ResolvedDesign | None = None
    corners: tuple[OperatingPoint, ...] = ()
    checks: tuple[Check, ...] = ()
    blocking: tuple[Blocking, ...] = ()
    alternatives: tuple[Alternative, ...] = ()
    frequency_spread_hz: tuple[float, float] = (0.0, 0.0)
    values: Mapping[str, Any] = field(default_factory=dict)
    heat_sinks: HeatSinks | None = None
    warnings: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    assumptions: tuple[str, ...] = ()

    def to_dict(self, design_file: Path | None = None) -> dict[str, Any]:
        """The result by key, for JSON.

        Parameters
        ----------
        design_file : pathlib.Path, optional
            Where the design was written.

        Returns
        -------
        dict
            Plain numbers, texts, lists and dicts.
        """
        return {
            "feasible": self.feasible,
            "design_file": None if design_file is None or not self.feasible else str(design_file),
            "blocking": [one.to_dict() for one in self.blocking],
            "values": dict(self.values),
            "frequency_spread_hz": list(self.frequency_spread_hz),
            "corners": [point.to_dict() for point in self.corners],
            "checks": [check.to_dict() for check in self.checks],
            "heat_sinks": None if self.heat_sinks is None else self.heat_sinks.to_dict(),
            "alternatives": [one.to_dict() for one in self.alternatives],
            "warnings": list(self.warnings) + list(self.cautions),
            "assumptions": list(self.assumptions),
        }
