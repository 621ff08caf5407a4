"""Ways of the heat of each design from its junctions to the air, as arrays."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.elements import HeatPath, HeatPaths, RectifierElement, ResolvedDesign
from buckdesign.design.hot_parameters import HotData, hot_data
from buckdesign.design.losses import Floats, data_by_point
from buckdesign.design.sections import DEVICES


@dataclass(frozen=True, kw_only=True)
class HeatData:
    """Ways of the heat, one entry a point; devices in the order of `DEVICES`.

    Attributes
    ----------
    own : NDArray
        From junction to ambient, or to the shared heat sink where a device sits on it [K/W], shape (n, 3);
        NaN where not known. Pieces in parallel share the heat alike.
    is_shared : NDArray
        Whether it sits on the shared heat sink, shape (n, 3).
    sink : NDArray
        The shared heat sink [K/W], shape (n,).
    piece : NDArray
        Part of the way that one piece of the rectifier has for itself [K/W], shape (n,); NaN where not known.
    """

    own: Floats
    is_shared: NDArray[np.bool_]
    sink: Floats
    piece: Floats

    def part(self, which: NDArray[np.intp]) -> HeatData:
        """Some of the points."""
        return HeatData(**{one.name: getattr(self, one.name)[which] for one in fields(self)})


def heat_data(resolved: Sequence[ResolvedDesign]) -> HeatData:
    """`HeatData` of the design of each point."""
    return data_by_point(resolved, _heat_record, HeatData, ("heat", *DEVICES))


def _heat_record(resolved: ResolvedDesign) -> dict[str, Any]:
    heat = resolved.heat
    own, shared = [], []
    for name in DEVICES:
        path: HeatPath = getattr(heat, name)
        element = getattr(resolved, name)
        on_shared = path.is_shared and path.heatsink is None and heat.shared_heatsink is not None
        own.append(_own_resistance(path, element, on_shared))
        shared.append(on_shared)
    return {
        "own": own,
        "is_shared": shared,
        "sink": heat.shared_heatsink or 0.0,
        "piece": _piece_resistance(heat, resolved.rectifier),
    }


def _own_resistance(path: HeatPath, element: Any, on_shared: bool) -> float:
    pieces = getattr(element, "parallel", 1)
    case = np.nan if element.junction_case is None else element.junction_case
    if on_shared:
        return float((case + path.pad) / pieces)
    if path.heatsink is not None:
        return float(path.heatsink + (case + path.pad) / pieces)
    free = getattr(element, "junction_ambient", None)
    return np.nan if free is None else float(free / pieces)


def ways_of(resolved: Sequence[ResolvedDesign]) -> Ways:
    """`Ways` of the design of each point."""
    return Ways(heat=heat_data(resolved), hot=hot_data(resolved))


def _piece_resistance(heat: HeatPaths, rectifier: RectifierElement) -> float:
    path, case = heat.rectifier, rectifier.junction_case
    if path.heatsink is not None or (path.is_shared and heat.shared_heatsink is not None):
        return np.nan if case is None else float(case + path.pad)
    return np.nan if rectifier.junction_ambient is None else float(rectifier.junction_ambient)


@dataclass(frozen=True, kw_only=True)
class Ways:
    """Ways of the heat, and what follows it.

    Attributes
    ----------
    heat : HeatData
        Thermal resistances.
    hot : HotData
        What the loop's parameters follow.
    """

    heat: HeatData
    hot: HotData

    def part(self, which: NDArray[np.intp]) -> Ways:
        """Some of the points."""
        return Ways(heat=self.heat.part(which), hot=self.hot.part(which))
