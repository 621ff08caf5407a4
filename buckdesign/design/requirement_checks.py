"""What a requirement asks, at the operating points where it asks it.

Ripple and output voltage count at every supply and load of the requirement's range; frequency from half to
full load, efficiency at full load, each at every supply; that it starts by itself with everything at the bad
end of its band. Points outside the range are not held against a requirement.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.checks import Limit
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.losses import Floats, data_by_point
from buckdesign.design.operated import Operated
from buckdesign.design.requirement import Requirement
from buckdesign.loop.parameters import COLUMN

START_MARGIN_WANTED = 1.5
"""Start margin below which a supply is not trusted to start [1] (own choice; at 1 it stays where it is)."""

CHARGE_TIME_TOP = 2e-6
"""Top of the band of power transistors' charge lifetime, 0.3-2 us, where a file does not give it [s] (from
memory)."""

_NEAR = 1e-6


def requirement_limits(
    operated: Operated, requirement: Requirement, resolved: ResolvedDesign | Sequence[ResolvedDesign]
) -> list[Limit]:
    """The limits of a requirement at all points.

    Parameters
    ----------
    operated : Operated
        Operating points.
    requirement : Requirement
        What is asked.
    resolved : ResolvedDesign or sequence of ResolvedDesign
        The design of each point; one stands for all.

    Returns
    -------
    list of Limit
        `Limit.applies` says where each counts; limits that the requirement does not set are left out.
    """
    inside = in_range(operated, requirement)
    share = operated.load / requirement.output.current_max
    found = [_output(operated, requirement, inside)]
    if np.isfinite(requirement.output.ripple):
        found.append(_ripple(operated, requirement, inside))
    found += _frequency(operated, requirement, inside & (share >= 0.5 - _NEAR))
    efficiency = requirement.limits.efficiency
    if efficiency is not None:
        found.append(
            Limit(
                name="efficiency",
                unit="%",
                value=operated.efficiency,
                limit=np.full(len(operated), efficiency),
                applies=inside & (share >= 1.0 - _NEAR),
                is_upper=False,
                note="at full load",
            )
        )
    if requirement.limits.regular:
        found.append(_regular(operated, inside))
    found.append(_start(operated, requirement, resolved, inside))
    return found


def in_range(operated: Operated, requirement: Requirement) -> NDArray[np.bool_]:
    """Where a point lies within the supplies and loads that a requirement asks for, shape (n,)."""
    supply, load = operated.parameter("supply_voltage"), operated.load
    need, output = requirement.supply, requirement.output
    return (
        (supply >= need.voltage_low * (1.0 - _NEAR))
        & (supply <= need.voltage_high * (1.0 + _NEAR))
        & (load >= output.current_min * (1.0 - _NEAR))
        & (load <= output.current_max * _load_slack(operated))
    )


def _load_slack(operated: Operated) -> Floats:
    """A resistive load draws what the divider's rounded voltage makes it draw."""
    resistive = np.isfinite(operated.parameter("load_resistance"))
    return np.where(resistive, 1.05, 1.0 + _NEAR)


def _output(operated: Operated, requirement: Requirement, inside: NDArray[np.bool_]) -> Limit:
    wanted, tolerance = requirement.output.voltage, requirement.output.tolerance
    mean = operated.loop.column("output_voltage_v")
    low = mean < wanted
    limit = wanted * np.where(low, 1.0 - tolerance, 1.0 + tolerance)
    deviation = np.abs(mean - wanted)
    return Limit(
        name="output voltage",
        unit="V",
        value=mean,
        limit=limit,
        applies=inside,
        room=wanted * tolerance - deviation,
        span=np.full(len(operated), wanted * tolerance),
        note=f"mean, {wanted:g} V within {100.0 * tolerance:.3g} %; margin relative to that",
    )


def _ripple(operated: Operated, requirement: Requirement, inside: NDArray[np.bool_]) -> Limit:
    loop = operated.loop
    return Limit(
        name="ripple",
        unit="V",
        value=loop.column("output_max_v") - loop.column("output_min_v"),
        limit=np.full(len(operated), requirement.output.ripple),
        applies=inside,
        note="peak to peak",
    )


def _frequency(operated: Operated, requirement: Requirement, applies: NDArray[np.bool_]) -> list[Limit]:
    if requirement.limits.frequency is None:
        return []
    low, high = requirement.limits.frequency
    value = operated.loop.column("frequency_hz")
    return [
        Limit(
            name=f"{which} frequency",
            unit="Hz",
            value=value,
            limit=np.full(len(operated), limit),
            applies=applies & (limit > 0.0),
            is_upper=which == "highest",
            note="from half to full load",
        )
        for which, limit in (("lowest", low), ("highest", high))
    ]


def _regular(operated: Operated, inside: NDArray[np.bool_]) -> Limit:
    period = operated.loop.column("period_cycles")
    return Limit(
        name="regular oscillation",
        unit="1",
        value=np.where(period < 0.0, np.nan, period),
        limit=np.ones(len(operated)),
        applies=inside,
        note="cycles in a period",
        note_unknown="irregular",
    )


@dataclass(frozen=True, kw_only=True)
class StartData:
    """Parameters at the end of their bands that is bad for starting, one entry a point."""

    gain: Floats
    inductance_factor: Floats
    charge_time: Floats


def _start_record(resolved: ResolvedDesign) -> dict[str, Any]:
    own_time = resolved.design.transistor.charge_time is not None
    time = resolved.transistor.charge_time
    return {
        "gain": resolved.transistor.gain_min,
        "inductance_factor": resolved.regulator.output_inductance_factor,
        "charge_time": time if own_time else max(time, CHARGE_TIME_TOP),
    }


def worst_start_rows(
    rows: Floats, resolved: Sequence[ResolvedDesign], load: float | Floats | None = None
) -> Floats:
    """Loop parameters with everything that decides about starting at the bad end of its band.

    Parameters
    ----------
    rows : NDArray
        Parameters at 25 degC, shape (n, columns).
    resolved : sequence of ResolvedDesign
        The design of each row.
    load : float or NDArray, optional
        Largest load [A]; that of each row as it is where omitted.

    Returns
    -------
    NDArray
        Guaranteed gain, largest load, which leaves the smallest inductance, regulator inductance and charge
        lifetime at the top of their bands.
    """
    worst = rows.copy()
    depends = ("transistor", "regulator", "design.transistor")
    data = data_by_point(resolved, _start_record, StartData, depends)
    worst[:, COLUMN["gain"]] = data.gain
    worst[:, COLUMN["output_inductance"]] *= data.inductance_factor
    worst[:, COLUMN["charge_time"]] = data.charge_time
    if load is not None:
        worst[:, COLUMN["load_current"]] = load
        worst[:, COLUMN["load_resistance"]] = np.inf
    return worst


def start_margins(rows: Floats) -> Floats:
    """Start margin of each row, shape (n,); NaN where the base does not conduct at its load."""
    from buckdesign.loop.constants import CONSTANTS, derive
    from buckdesign.loop.margin import start_margin

    found = np.empty(len(rows))
    constants = np.empty(CONSTANTS)
    for index, row in enumerate(np.ascontiguousarray(rows)):
        derive(row, constants)
        found[index] = start_margin(row, constants)
    return found


def _start(
    operated: Operated,
    requirement: Requirement,
    resolved: ResolvedDesign | Sequence[ResolvedDesign],
    inside: NDArray[np.bool_],
) -> Limit:
    designs = [resolved] * len(operated) if isinstance(resolved, ResolvedDesign) else list(resolved)
    worst = worst_start_rows(operated.base_rows, designs, requirement.output.current_max)
    unique, back = np.unique(worst, axis=0, return_inverse=True)
    value = start_margins(unique)[back.ravel()]
    return Limit(
        name="starts by itself",
        unit="1",
        value=value,
        limit=np.full(len(operated), START_MARGIN_WANTED),
        applies=inside & ~np.isnan(value),
        is_upper=False,
        note="start margin at full load, lowest gain, slowest regulator and transistor",
    )
