"""Operating points of designs: from supply, load and ambient to what an engineer wants to know.

`operate_rows` is the array form for many points of many designs and `operate_table` its columns; `operate`
gives single points with their checks and warnings, `simulate` one with its waveforms and, where wanted, the
start from rest.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

from buckdesign.design.advisories import MODEL_ASSUMPTIONS, point_warnings, start_warnings
from buckdesign.design.ambient_limits import check_ambient
from buckdesign.design.capacitor_load import capacitor_loads
from buckdesign.design.cautions import cautions
from buckdesign.design.checks import Limit, checks_at, part_limits
from buckdesign.design.design_file import Design
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.heat_sinks import heat_sinks
from buckdesign.design.linear_alternative import linear_alternative
from buckdesign.design.operated import (
    Operated,
    Points,
    bare_points,
    operate_rows,
    operate_table,
    points_of,
    rows_at,
)
from buckdesign.design.operating_point import OperatingPoint
from buckdesign.design.requirement import Requirement
from buckdesign.design.requirement_checks import in_range, requirement_limits
from buckdesign.design.resolve import resolve_design
from buckdesign.design.start_up import start_from_rest
from buckdesign.loop.results import DETAILED, STUDY, Effort, Start, Waveforms, waveforms
from buckdesign.parts import Tables


def operate(
    resolved: ResolvedDesign,
    points: Points,
    *,
    requirement: Requirement | None = None,
    electrical_only: bool = False,
    effort: Effort = STUDY,
    start: Start = Start.OPERATING,
) -> list[OperatingPoint]:
    """A design at operating points, each with its checks and warnings.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design.
    points : Points
        Where to look, see `points_of`.
    requirement : Requirement, optional
        What to check against; the one that the design carries where omitted. Without either only part limits
        are checked.
    electrical_only : bool
        No temperatures and no losses added on.
    effort : Effort
        How long to look for the steady state.
    start : Start
        Where each trajectory begins.

    Returns
    -------
    list of OperatingPoint
        One a point.
    """
    operated = operate_rows(
        rows_at(resolved, points),
        resolved,
        points.ambient_c,
        electrical_only=electrical_only,
        effort=effort,
        start=start,
    )
    return checked_points(operated, resolved, requirement)


def all_limits(
    operated: Operated, resolved: ResolvedDesign, requirement: Requirement | None = None
) -> list[Limit]:
    """Part limits and, with a requirement given or carried by the design, its limits."""
    wanted = requirement or resolved.design.requirement
    limits = part_limits(operated, resolved)
    return limits if wanted is None else limits + requirement_limits(operated, wanted, resolved)


def checked_points(
    operated: Operated, resolved: ResolvedDesign, requirement: Requirement | None = None
) -> list[OperatingPoint]:
    """Points of one design with checks, warnings, cautions and assumptions.

    Parameters
    ----------
    operated : Operated
        Operating points of the design.
    resolved : ResolvedDesign
        The design.
    requirement : Requirement, optional
        What to check against; the one that the design carries where omitted.

    Returns
    -------
    list of OperatingPoint
        One a point.
    """
    wanted = requirement or resolved.design.requirement
    limits = all_limits(operated, resolved, wanted)
    inside = None if wanted is None else in_range(operated, wanted)
    found = []
    for index, point in enumerate(bare_points(operated)):
        warnings = point_warnings(operated, resolved, limits, index)
        if inside is not None and not inside[index]:
            warnings += ("outside the supplies and loads of the requirement: only part limits are checked",)
        found.append(
            replace(
                point,
                checks=checks_at(limits, operated, index),
                warnings=warnings,
                cautions=cautions(operated, resolved, index),
                assumptions=resolved.assumptions + MODEL_ASSUMPTIONS,
            )
        )
    return found


@dataclass(frozen=True, kw_only=True)
class Simulation:
    """One simulated operating point and what is needed to look at its waveforms.

    Attributes
    ----------
    point : OperatingPoint
        The result.
    operated : Operated
        What it was made of; one point.
    start_waveforms : Waveforms or None
        The start from rest, where it was asked for.
    """

    point: OperatingPoint
    operated: Operated
    start_waveforms: Waveforms | None = None

    def cycles(self, count: int = 3) -> Waveforms:
        """Waveforms of some cycles in steady state; without cycles, of a millisecond."""
        rate = self.operated.loop.column("frequency_hz")[0]
        span = 20.0 * count / rate if rate > 0.0 else 1e-3
        end = [float(value) for value in self.operated.loop.ends[0]]
        return waveforms(self.operated.parameters(0), start=end, cycles=count, span=span)

    def to_dict(self) -> dict[str, object]:
        """The operating point by key."""
        return self.point.to_dict()


def simulate(
    design: Design,
    *,
    supply: float | None = None,
    load_current: float | None = None,
    load_resistance: float | None = None,
    ambient_c: float | None = None,
    from_rest: bool = False,
    electrical_only: bool = False,
    requirement: Requirement | None = None,
    tables: Tables | None = None,
    effort: Effort = DETAILED,
) -> Simulation:
    """Simulate a design at one operating point.

    Parameters
    ----------
    design : Design
        The design, see `buckdesign.read_design`.
    supply : float, optional
        Supply [V]; what is omitted is as in the design.
    load_current, load_resistance : float, optional
        Constant-current part [A] and resistive part of the load [ohm]; one given alone is the whole load.
    ambient_c : float, optional
        [degC].
    from_rest : bool
        Start with everything discharged, and report the start.
    electrical_only : bool
        No temperatures and no losses added on.
    requirement : Requirement, optional
        What to check against, instead of the one that the design carries.
    tables : Tables, optional
        Parts that the design names; the tables of the package where omitted.
    effort : Effort
        How long to look for the steady state.

    Returns
    -------
    Simulation
        The operating point with its waveforms.

    Raises
    ------
    InputError
        A value is not allowed, such as an ambient above a junction's limit, or a part is not known.
    """
    resolved = resolve_design(design, tables)
    points = points_of(
        resolved,
        supply=supply,
        load_current=load_current,
        load_resistance=load_resistance,
        ambient_c=ambient_c,
    )
    if not electrical_only:
        check_ambient(resolved, ambient_c)
    start = Start.REST if from_rest else Start.OPERATING
    operated = operate_rows(
        rows_at(resolved, points),
        resolved,
        points.ambient_c,
        electrical_only=electrical_only,
        effort=effort,
        start=start,
    )
    point = checked_points(operated, resolved, requirement)[0]
    point = replace(point, capacitors=capacitor_loads(operated, resolved, 0))
    if not electrical_only:
        point = replace(
            point,
            heat_sinks=heat_sinks(operated, resolved, 0),
            linear=linear_alternative(operated, resolved, 0),
        )
    if not from_rest:
        return Simulation(point=point, operated=operated)
    transient, recorded = start_from_rest(operated, resolved)
    point = replace(point, transient=transient, warnings=start_warnings(transient, resolved) + point.warnings)
    return Simulation(point=point, operated=operated, start_waveforms=recorded)


__all__ = [
    "Operated",
    "Points",
    "Simulation",
    "all_limits",
    "checked_points",
    "operate",
    "operate_rows",
    "operate_table",
    "points_of",
    "rows_at",
    "simulate",
]
