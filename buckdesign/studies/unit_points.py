"""The operating points at which units are judged: of the requirement's range those where something is worst."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.judging import ambients_of, range_points
from buckdesign.design.operated import Points
from buckdesign.design.requirement import Requirement
from buckdesign.studies.tolerance_keys import Varied
from buckdesign.studies.unit_runs import UnitModel

FEW = 12
"""Points of a range from which on it is worth leaving some out [1] (own choice)."""

_NEAR = 1e-6


def whole_range(requirement: Requirement, resolved: ResolvedDesign) -> Points:
    """Every supply, at least eight loads, highest and lowest ambient of a requirement."""
    return range_points(requirement, resolved, ambients_of(requirement))


def usual_point(requirement: Requirement, points: Points) -> int:
    """Where units are taken to spend their lives: nominal supply, full load, highest ambient."""
    nominal = requirement.supply.voltage[1]
    far = (
        np.abs(points.supply / nominal - 1.0)
        + np.abs(points.load_current / requirement.output.current_max - 1.0)
        + np.abs(points.ambient_c - requirement.limits.ambient[1]) / 100.0
    )
    return int(np.argmin(far))


def worst_places(model: UnitModel, varied: Sequence[Varied]) -> Points:
    """Of the points of a model those where some limit is worst for some unit at the end of one tolerance.

    Parameters
    ----------
    model : UnitModel
        With all points.
    varied : sequence of Varied
        What differs from unit to unit.

    Returns
    -------
    Points
        The usual point, full load at each supply and ambient, and the points where the design itself, or one
        with a single value at either end of its band, has the smallest margin to a limit.
    """
    points = model.points
    if len(points) <= FEW:
        return points
    factors = {one.key: np.ones(2 * len(varied) + 1) for one in varied}
    for place, one in enumerate(varied):
        factors[one.key][2 * place + 1] = 1.0 + one.tolerance.low
        factors[one.key][2 * place + 2] = 1.0 + one.tolerance.high
    runs = model.evaluate(factors)
    used = np.isin(np.arange(len(points)), runs.point[np.isfinite(runs.margin)])
    used |= points.load_current >= model.requirement.output.current_max * (1.0 - _NEAR)
    used[model.usual] = True
    return part_of(points, np.flatnonzero(used))


def part_of(points: Points, which: NDArray[np.intp]) -> Points:
    """Some of the points."""
    return Points(
        supply=points.supply[which],
        load_current=points.load_current[which],
        load_resistance=points.load_resistance[which],
        ambient_c=points.ambient_c[which],
    )


def with_points(model: UnitModel, points: Points) -> UnitModel:
    """The same model at other points."""
    return replace(model, points=points, usual=usual_point(model.requirement, points))
