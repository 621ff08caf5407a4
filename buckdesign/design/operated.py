"""Operating points as arrays: from loop parameters to losses and temperatures, for many points at once."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.heat_paths import Ways, ways_of
from buckdesign.design.losses import (
    LOSSES,
    Floats,
    LossData,
    input_ripple_rms,
    loop_losses,
    loss_data,
)
from buckdesign.design.operating_point import OperatingPoint
from buckdesign.design.resolve import loop_parameters
from buckdesign.design.sections import DEVICES
from buckdesign.design.settling import SETTLED, Settled, settle_temperatures
from buckdesign.design.temperatures import Balance
from buckdesign.errors import InputError
from buckdesign.loop.constants import STATES
from buckdesign.loop.parameters import COLUMN, LoopParameters
from buckdesign.loop.results import OUTPUTS, STUDY, Effort, Start, SteadyStates, steady_states

NEAR_CYCLES = 2
"""Cycles iterated plainly from a state near the steady one [1] (own choice)."""

FIRST_WINDOW = 16
"""Cycles to average irregular oscillation over before any temperature is known [1] (own choice)."""

REGULAR_SPREAD = 1e-3
"""Spread of periods below which irregular oscillation may have become regular [1] (own choice)."""

SETTLED_SINGLE = 0.005
"""Change below which the temperatures of a single point stand still [K] (own choice)."""


_NOTHING = 1e-12
"""Ripple that is rounding alone [V]."""


@dataclass(frozen=True, kw_only=True)
class Points:
    """Operating points, arrays of one length.

    Attributes
    ----------
    supply : NDArray
        [V], shape (n,).
    load_current, load_resistance : NDArray
        Constant-current part [A] and resistive part of the load [ohm], infinite for none, shape (n,).
    ambient_c : NDArray
        [degC], shape (n,).
    """

    supply: Floats
    load_current: Floats
    load_resistance: Floats
    ambient_c: Floats

    def __len__(self) -> int:
        return len(self.supply)


def points_of(
    resolved: ResolvedDesign,
    *,
    supply: ArrayLike | None = None,
    load_current: ArrayLike | None = None,
    load_resistance: ArrayLike | None = None,
    ambient_c: ArrayLike | None = None,
) -> Points:
    """Operating points of a design; what is not given is as in its file.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design.
    supply : array_like, optional
        [V].
    load_current, load_resistance : array_like, optional
        Constant-current part [A] and resistive part of the load [ohm]; one given alone is the whole load.
    ambient_c : array_like, optional
        [degC].

    Returns
    -------
    Points
        All arrays broadcast to one shape (n,).

    Raises
    ------
    InputError
        A value is negative, zero where it must not be, or not a number.
    """
    design = resolved.design
    own = load_current is None and load_resistance is None
    if load_current is None:
        load_current = (design.output.current or 0.0) if own else 0.0
    if load_resistance is None:
        resistance = design.output.resistance if own else None
        load_resistance = math.inf if resistance is None else resistance
    given = (
        design.supply.voltage if supply is None else supply,
        load_current,
        load_resistance,
        resolved.heat.ambient_c if ambient_c is None else ambient_c,
    )
    arrays = np.broadcast_arrays(*(np.atleast_1d(np.asarray(one, dtype=float)) for one in given))
    points = Points(**dict(zip(Points.__annotations__, (one.ravel().copy() for one in arrays), strict=True)))
    _check_points(points)
    return points


def _check_points(points: Points) -> None:
    for name, values, ok, wanted in (
        ("supply", points.supply, points.supply > 0.0, "above 0 V"),
        ("load current", points.load_current, points.load_current >= 0.0, "0 A or more"),
        ("load resistance", points.load_resistance, points.load_resistance > 0.0, "above 0 ohm"),
        ("ambient", points.ambient_c, points.ambient_c > -273.15, "above -273.15 degC"),
    ):
        finite = np.isfinite(values) | (values is points.load_resistance) & ~np.isnan(values)
        if not (ok & finite).all():
            raise InputError(f"{name} = {values[~(ok & finite)][0]:g}: must be {wanted}")


def rows_at(resolved: ResolvedDesign, points: Points) -> Floats:
    """Loop parameters of a design at operating points, at 25 degC, shape (n, columns)."""
    row = loop_parameters(resolved, 1.0, 0.0).row()
    rows = np.repeat(row[None, :], len(points), axis=0)
    rows[:, COLUMN["supply_voltage"]] = points.supply
    rows[:, COLUMN["load_current"]] = points.load_current
    rows[:, COLUMN["load_resistance"]] = points.load_resistance
    return rows


@dataclass(frozen=True, kw_only=True)
class Operated:
    """Operating points computed, everything by array with the point leading.

    Attributes
    ----------
    rows, base_rows : NDArray
        Loop parameters at the temperatures found and at 25 degC, shape (n, columns).
    ambient_c : NDArray
        [degC], shape (n,).
    loop : SteadyStates
        The loop's own results.
    data : LossData
        What the losses depend on.
    balance : Balance
        Losses and temperatures.
    is_settled : NDArray
        Where the temperatures stand still, shape (n,).
    electrical_only : bool
        Without temperatures and losses added on.
    """

    rows: Floats
    base_rows: Floats
    ambient_c: Floats
    loop: SteadyStates
    data: LossData
    balance: Balance
    is_settled: NDArray[np.bool_]
    electrical_only: bool

    def __len__(self) -> int:
        return len(self.rows)

    def parameter(self, name: str) -> Floats:
        """One loop parameter as it was used, shape (n,)."""
        return self.rows[:, COLUMN[name]]

    def parameters(self, index: int) -> LoopParameters:
        """The loop parameters of one point as they were used."""
        return LoopParameters.from_row(self.rows[index])

    @property
    def total_loss(self) -> Floats:
        """Sum of all losses [W], shape (n,)."""
        total = np.zeros(len(self))
        for name in LOSSES:
            total += self.balance.losses[name]
        return total

    @property
    def output_power(self) -> Floats:
        """Power in the load [W], shape (n,)."""
        return self.loop.column("load_w")

    @property
    def input_power(self) -> Floats:
        """Output power and every loss [W], shape (n,).

        What the loop draws beyond that only fills its capacitor or choke within the window, and comes back:
        it is zero over whole periods, and small where an irregular oscillation is cut off.
        """
        return self.output_power + self.total_loss

    @property
    def efficiency(self) -> Floats:
        """Output over input power [1], shape (n,)."""
        power = self.input_power
        return np.where(power > 0.0, self.output_power / np.where(power > 0.0, power, 1.0), 0.0)

    @property
    def set_voltage(self) -> Floats:
        """Output voltage that the divider sets [V], shape (n,)."""
        r1, r2 = self.parameter("r1"), self.parameter("r2")
        return self.parameter("reference") * (1.0 + r2 / r1) + self.parameter("adjust_current") * r2

    @property
    def load(self) -> Floats:
        """Load current at the set voltage [A], shape (n,)."""
        return self.parameter("load_current") + self.set_voltage / self.parameter("load_resistance")

    def junction(self, device: str) -> Floats:
        """Junction temperature of a device [degC], shape (n,); NaN where not known or in runaway."""
        return self.balance.junction_c[:, DEVICES.index(device)]

    def columns(self) -> dict[str, NDArray[np.float64] | list[str]]:
        """The keys of an operating point, nested ones with dots, each an array of shape (n,).

        What is not known is NaN; ``regime`` is a list of words. Checks and warnings are not among them.
        """
        loop = self.loop
        resistance = self.parameter("load_resistance")
        period = loop.column("period_cycles")
        power, supply = self.input_power, self.parameter("supply_voltage")
        mean = power / supply
        fitted = np.isfinite(self.data.input_esr)
        span = loop.column("output_max_v") - loop.column("output_min_v")
        found: dict[str, NDArray[np.float64] | list[str]] = {
            "supply_v": supply,
            "load_a": self.parameter("load_current"),
            "load_ohm": np.where(np.isfinite(resistance), resistance, np.nan),
            "ambient_c": self.ambient_c,
            "regime": loop.regimes(),
            "period_cycles": np.where(period < 0.0, np.nan, period),
        }
        for name in ("cycle_spread", "frequency_hz", "duty", "start_margin", "active_fraction"):
            found[name] = loop.column(name)
        found |= {
            "output_voltage_v": loop.column("output_voltage_v"),
            "ripple_v": np.where(span > _NOTHING, span, 0.0),
        }
        for name in ("mean", "min", "max", "rms"):
            found[f"choke_current_a.{name}"] = loop.column(f"choke_{name}_a")
        found |= {
            "base_drive_a.max": loop.column("regulator_max_a"),
            "input_current_a.mean": mean,
            "input_current_a.rms": np.hypot(mean, input_ripple_rms(loop)),
            "capacitor_current_a.input": np.where(fitted, input_ripple_rms(loop), np.nan),
            "capacitor_current_a.output": loop.column("output_capacitor_rms_a"),
            "input_power_w": power,
            "output_power_w": self.output_power,
            "efficiency": self.efficiency,
            **{f"losses_w.{name}": self.balance.losses[name] for name in LOSSES},
            "total_loss_w": self.total_loss,
            "energy_residual": loop.column("energy_residual"),
            **{f"junction_c.{name}": self.junction(name) for name in DEVICES},
            "choke_c": self.balance.choke_c,
            "choke_volume_cm3": self.data.choke_volume * 1e6,
        }
        return found


def operate_rows(
    rows: Floats,
    resolved: ResolvedDesign | Sequence[ResolvedDesign],
    ambient_c: ArrayLike | None = None,
    *,
    electrical_only: bool = False,
    effort: Effort = STUDY,
    start: Start = Start.OPERATING,
    jobs: int | None = None,
    data: LossData | None = None,
    ways: Ways | None = None,
) -> Operated:
    """Operating points of many designs, given as rows of loop parameters.

    Parameters
    ----------
    rows : NDArray
        Loop parameters at 25 degC, shape (n, columns), see `rows_at` and `loop_parameters`.
    resolved : ResolvedDesign or sequence of ResolvedDesign
        The design that each row comes from, for what the loop does not see; one stands for all.
    ambient_c : array_like, optional
        [degC]; that of each design where omitted.
    electrical_only : bool
        No temperatures and no losses added on.
    effort : Effort
        How long to look for the steady state.
    start : Start
        Where each trajectory begins.
    jobs : int, optional
        Threads; all processors by default.
    data, ways : LossData, Ways, optional
        What losses and temperatures depend on outside the rows, one entry a point, where it differs from what
        the designs say.

    Returns
    -------
    Operated
        All points.

    Raises
    ------
    ValueError
        The number of designs is not that of the rows.
    """
    rows = np.ascontiguousarray(np.atleast_2d(rows), dtype=np.float64)
    designs = [resolved] * len(rows) if isinstance(resolved, ResolvedDesign) else list(resolved)
    if len(designs) != len(rows):
        raise ValueError(f"{len(designs)} designs for {len(rows)} rows")
    own = [one.heat.ambient_c for one in designs] if ambient_c is None else ambient_c
    ambient = np.broadcast_to(np.asarray(own, dtype=float), (len(rows),)).copy()
    data = loss_data(designs) if data is None else data

    is_single = effort.more > STUDY.more

    def run(
        some: Floats, starts: Floats | None, is_irregular: NDArray[np.bool_], tangents: Floats
    ) -> SteadyStates:
        known = None if is_single else tangents
        if starts is None:
            first = replace(effort, window=min(effort.window, FIRST_WINDOW))
            return steady_states(some, start=start, effort=first, jobs=jobs, tangents=known)
        near = replace(effort, plain=min(effort.plain, NEAR_CYCLES))
        if is_single or not is_irregular.any():
            return steady_states(some, starts=starts, effort=near, jobs=jobs, tangents=known)
        return _run_again(some, starts, is_irregular, near, jobs, tangents)

    if electrical_only:
        settled = _without_heat(rows, steady_states(rows, start=start, effort=effort, jobs=jobs))
    else:
        paths = ways_of(designs) if ways is None else ways
        settled = settle_temperatures(
            rows, run, data, paths, ambient, SETTLED_SINGLE if is_single else SETTLED
        )
    return Operated(
        rows=settled.rows,
        base_rows=rows,
        ambient_c=ambient,
        loop=settled.loop,
        data=data,
        balance=settled.balance,
        is_settled=settled.is_settled,
        electrical_only=electrical_only,
    )


def _run_again(
    rows: Floats,
    starts: Floats,
    is_irregular: NDArray[np.bool_],
    near: Effort,
    jobs: int | None,
    tangents: Floats,
) -> SteadyStates:
    """Steady states near those before; what was irregular is only averaged, unless it looks regular."""
    values, ends = np.empty((len(rows), len(OUTPUTS))), np.empty((len(rows), STATES))

    def put(which: NDArray[np.bool_], effort: Effort) -> None:
        if which.any():
            known = tangents[which]
            found = steady_states(rows[which], starts=starts[which], effort=effort, jobs=jobs, tangents=known)
            values[which], ends[which], tangents[which] = found.values, found.ends, known

    put(~is_irregular, near)
    put(is_irregular, replace(near, accelerated=0, more=0, patience=0))
    spread = SteadyStates(values=values, ends=ends).column("cycle_spread")
    put(is_irregular & (spread < REGULAR_SPREAD), near)
    return SteadyStates(values=values, ends=ends)


def _without_heat(rows: Floats, loop: SteadyStates) -> Settled:
    unknown = Balance(
        losses=loop_losses(loop),
        junction_c=np.full((len(rows), len(DEVICES)), np.nan),
        choke_c=np.full(len(rows), np.nan),
        runaway=np.zeros(len(rows), dtype=bool),
    )
    return Settled(loop=loop, rows=rows, balance=unknown, is_settled=np.ones(len(rows), dtype=bool))


def operate_table(
    resolved: ResolvedDesign,
    points: Points,
    *,
    electrical_only: bool = False,
    effort: Effort = STUDY,
    jobs: int | None = None,
) -> dict[str, NDArray[np.float64] | list[str]]:
    """One design at many operating points, as columns.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design.
    points : Points
        Where to look, see `points_of`.
    electrical_only : bool
        No temperatures and no losses added on.
    effort : Effort
        How long to look for the steady state.
    jobs : int, optional
        Threads; all processors by default.

    Returns
    -------
    dict
        Columns of `Operated.columns`, shape (n,).
    """
    return operate_rows(
        rows_at(resolved, points),
        resolved,
        points.ambient_c,
        electrical_only=electrical_only,
        effort=effort,
        jobs=jobs,
    ).columns()


def bare_points(operated: Operated) -> list[OperatingPoint]:
    """Single points without checks and warnings."""
    columns = operated.columns()
    return [_bare_point(columns, index) for index in range(len(operated))]


def _bare_point(columns: dict[str, NDArray[np.float64] | list[str]], index: int) -> OperatingPoint:
    flat: dict[str, float | str | None] = {}
    for name, values in columns.items():
        value = values[index]
        flat[name] = value if isinstance(value, str) else _number(float(value))
    nested: dict[str, object] = {}
    for name, one in flat.items():
        outer, _, inner = name.partition(".")
        if inner:
            group = nested.setdefault(outer, {})
            assert isinstance(group, dict)
            group[inner] = one
        else:
            nested[outer] = one
    period = flat["period_cycles"]
    nested["period_cycles"] = int(period) if isinstance(period, float) else None
    return OperatingPoint(**nested)  # type: ignore[arg-type]


def _number(value: float) -> float | None:
    return value if math.isfinite(value) else None
