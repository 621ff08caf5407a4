"""Temperatures of junctions and choke, solved together with the losses that depend on them.

The loop is run again with the parameters that a temperature changes, until the temperatures stand still. What
feeds back quickly, the rectifier's leakage and the resistance of the copper, is solved within each run.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import Any, Protocol

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import COPPER_REFERENCE_C
from buckdesign.design.elements import HeatPath, HeatPaths, RectifierElement, ResolvedDesign
from buckdesign.design.hot_parameters import (
    COPPER_CEILING_C,
    PARAMETER_RANGE_C,
    RECTIFIER,
    REGULATOR,
    TRANSISTOR,
    HotData,
    hot_data,
    parameters_at,
)
from buckdesign.design.losses import (
    LEAKAGE_CEILING_C,
    Floats,
    LossData,
    copper_ac_loss,
    copper_resistance_factor,
    core_loss,
    data_by_point,
    input_capacitor_loss,
    input_ripple_rms,
    junction_capacitance_loss,
    leakage_factor,
    loop_losses,
    rectifier_leakage_loss,
    transistor_leakage_loss,
    winding_ac_factor,
)
from buckdesign.design.sections import DEVICES
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import SteadyStates
from buckdesign.physics.convection import ring_rise
from buckdesign.physics.runaway import junction_with_leakage, runaway_margin, runaway_room
from buckdesign.physics.thermal import ring_rise_surface_rule

MIXING = (-9.0, 0.95)
"""Bounds of the part of the last step that is taken back [1] (own choice: a slope between -20 and 0.9)."""

RUNS = 8
"""Most runs of the loop to settle the temperatures [1] (own choice; two to three are usual)."""

SETTLED = 0.5
"""Change between two runs below which temperatures stand still [K] (own choice: what is left changes the rate
of the loop by 0.3 % at most, and the temperatures by about a tenth of it)."""

SETTLED_IRREGULAR = 2.0
"""The same for oscillation that is irregular or repeats only after several cycles, whose averages jump
from run to run [K] (own choice)."""

RESTLESS = 8.0
"""The same over the change that others may have [1] (own choice: a short average scatters by some per cent)."""

IDLE_SHARE = 20.0
"""How much further the regulator may move, on which the loop hardly depends [1] (own choice)."""

ESR_FELT, LOSS_FELT, DROP_FELT = 4e-3, 4e-3, 2e-3
"""What counts like a kelvin: change of the ESR [1], of the recovery loss over all losses [1], of the
saturation voltage [V] (own choice)."""

_COPPER_STEPS = 12


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
    return data_by_point(resolved, _heat_record, HeatData)


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


@dataclass(frozen=True, kw_only=True)
class Balance:
    """Losses and temperatures that go with one run of the loop.

    Attributes
    ----------
    losses : dict of NDArray
        By name [W], shape (n,).
    junction_c : NDArray
        Junctions in the order of `DEVICES` [degC], shape (n, 3); NaN where not known or in runaway.
    choke_c : NDArray
        [degC], shape (n,); NaN for a bought choke.
    runaway : NDArray
        Where the rectifier's leakage finds no balance, shape (n,).
    """

    losses: dict[str, Floats]
    junction_c: Floats
    choke_c: Floats
    runaway: NDArray[np.bool_]


def balance(
    loop: SteadyStates, rows: Floats, data: LossData, ways: Ways, ambient_c: Floats, choke_c: Floats
) -> Balance:
    """Losses and temperatures for given averages of the loop.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    rows : NDArray
        Parameters at 25 degC, shape (n, columns): the copper's resistance at 20 degC is taken from them.
    data, ways : LossData, Ways
        Of the same points.
    ambient_c, choke_c : NDArray
        Ambient, and the choke's temperature in the loop's run [degC], shape (n,).

    Returns
    -------
    Balance
        Everything added on; the loop's own losses are left as they are.
    """
    losses = loop_losses(loop)
    losses["choke_core"] = core_loss(loop, data)
    losses["input_capacitor"] = input_capacitor_loss(loop, _input_esr(loop, data, ways.hot, ambient_c))
    losses["rectifier_recovery"] += junction_capacitance_loss(loop, data)
    copper = rows[:, COLUMN["choke_resistance"]]
    factor = winding_ac_factor(loop, data, np.where(np.isnan(choke_c), ambient_c, choke_c))
    hot_choke = _choke_temperature(loop, copper, losses["choke_core"], factor, data, ambient_c)
    followed = np.where(np.isnan(hot_choke), COPPER_REFERENCE_C, np.minimum(hot_choke, COPPER_CEILING_C))
    resistance = copper * copper_resistance_factor(followed)
    losses["choke_copper_ac"] = copper_ac_loss(loop, resistance, factor)
    junction_c, leakage, runaway = junctions(loop, device_heat(losses), data, ways.heat, ambient_c)
    losses["rectifier_leakage"] = leakage
    transistor_c = junction_c[:, TRANSISTOR]
    losses["transistor_leakage"] = transistor_leakage_loss(loop, rows, data, transistor_c, ambient_c)
    return Balance(losses=losses, junction_c=junction_c, choke_c=hot_choke, runaway=runaway)


def _input_esr(loop: SteadyStates, data: LossData, hot: HotData, ambient_c: Floats) -> Floats:
    return hot.input.esr(data.input_esr, loop.column("frequency_hz"), input_ripple_rms(loop), ambient_c)


def _choke_temperature(
    loop: SteadyStates, copper: Floats, core: Floats, factor: Floats, data: LossData, ambient_c: Floats
) -> Floats:
    """The larger of two methods, with the copper's resistance at that temperature [degC]."""
    rms2 = np.square(loop.column("choke_rms_a"))
    mean2 = np.square(loop.column("choke_mean_a"))
    effective = rms2 + (factor - 1.0) * np.maximum(rms2 - mean2, 0.0)
    wound = np.isfinite(data.surface)
    surface, diameter = np.where(wound, data.surface, 1.0), np.where(wound, data.diameter, 1.0)
    hot = ambient_c
    for _ in range(_COPPER_STEPS):
        power = core + copper * effective * copper_resistance_factor(np.minimum(hot, COPPER_CEILING_C))
        rise = np.maximum(
            ring_rise_surface_rule(power, surface), ring_rise(power, surface, diameter, ambient_c)
        )
        hot = ambient_c + rise
    return np.where(wound, hot, np.nan)


def device_heat(losses: dict[str, Floats]) -> Floats:
    """Heat in each device but for the rectifier's leakage.

    Parameters
    ----------
    losses : dict of NDArray
        By name [W], shape (n,).

    Returns
    -------
    NDArray
        In the order of `DEVICES` [W], shape (n, 3). Recovery and junction charge of the rectifier heat the
        transistor, which carries them at full voltage; the base's loss, a few per cent of which is in the
        base-emitter resistor, is counted to the transistor as a whole.
    """
    heat = np.empty((len(losses["base"]), len(DEVICES)))
    heat[:, TRANSISTOR] = (
        losses["transistor_conduction"]
        + losses["transistor_switching"]
        + losses["transistor_leakage"]
        + losses["rectifier_recovery"]
        + losses["base"]
    )
    heat[:, REGULATOR] = losses["regulator"]
    heat[:, RECTIFIER] = losses["rectifier"]
    return heat


def junctions(
    loop: SteadyStates, power: Floats, data: LossData, heat: HeatData, ambient_c: Floats
) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Junction temperatures with the rectifier's leakage solved for.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    power : NDArray
        Heat in each device but for the leakage [W], shape (n, 3).
    data, heat : LossData, HeatData
        Of the same points.
    ambient_c : NDArray
        [degC], shape (n,).

    Returns
    -------
    tuple of NDArray
        Junctions [degC], shape (n, 3), NaN where not known or without balance; leakage loss [W], in runaway
        the largest that could still be carried off; where the leakage finds no balance.
    """
    junction, path = _without_leakage(power, heat, ambient_c)
    base = junction[:, RECTIFIER]
    known = np.isfinite(base) & np.isfinite(path)
    start = np.where(known, np.minimum(base, LEAKAGE_CEILING_C), ambient_c)
    at_start = rectifier_leakage_loss(loop, data, start)
    leaks = known & (base < LEAKAGE_CEILING_C) & (at_start > 0.0) & (path > 0.0)
    safe_path = np.where(leaks, path, 1.0)
    hot = np.asarray(
        junction_with_leakage(start, safe_path, np.where(leaks, at_start, 0.0), data.leakage_coefficient)
    )
    runaway: NDArray[np.bool_] = np.asarray(leaks & np.isnan(hot), dtype=bool)
    limit = 1.0 / (data.leakage_coefficient * safe_path)
    leakage = np.where(leaks, np.where(runaway, limit, (hot - start) / safe_path), at_start)
    leakage = np.where(leakage_factor(loop) > 0.0, leakage, 0.0)
    junction[:, RECTIFIER] = np.where(known, base + leakage * path, np.nan)
    others = heat.is_shared & heat.is_shared[:, RECTIFIER, None]
    others[:, RECTIFIER] = False
    junction += np.where(others, (heat.sink * leakage)[:, None], 0.0)
    lost = runaway[:, None] & (others | (np.arange(len(DEVICES)) == RECTIFIER))
    return np.where(lost, np.nan, junction), leakage, runaway


def _without_leakage(power: Floats, heat: HeatData, ambient_c: Floats) -> tuple[Floats, Floats]:
    """Junctions but for the leakage's heat [degC], shape (n, 3), and the rectifier's way to ambient [K/W]."""
    on_sink = np.sum(np.where(heat.is_shared, power, 0.0), axis=1)
    junction = ambient_c[:, None] + heat.own * power + heat.is_shared * (heat.sink * on_sink)[:, None]
    path = heat.own[:, RECTIFIER] + np.where(heat.is_shared[:, RECTIFIER], heat.sink, 0.0)
    return junction, path


def runaway_reach(
    loop: SteadyStates, power: Floats, data: LossData, heat: HeatData, ambient_c: Floats
) -> tuple[Floats, Floats]:
    """How far the rectifier is from thermal runaway.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    power : NDArray
        Heat in each device but for the leakage, see `device_heat` [W], shape (n, 3).
    data, heat : LossData, HeatData
        Of the same points.
    ambient_c : NDArray
        [degC], shape (n,).

    Returns
    -------
    tuple of NDArray
        How many times the leakage may grow at the junction's temperature, 1 at the limit and below it in
        runaway
        [1]; ambient at which runaway begins with these losses [degC]. Shape (n,); NaN where there is no
        leakage or no way for the heat is known.
    """
    junction, path = _without_leakage(power, heat, ambient_c)
    base = junction[:, RECTIFIER]
    at_base = rectifier_leakage_loss(loop, data, np.where(np.isfinite(base), base, ambient_c))
    known = np.isfinite(base) & np.isfinite(path) & (at_base > 0.0) & (path > 0.0)
    path, at_base = np.where(known, path, 1.0), np.where(known, at_base, 1e-9)
    hot = np.asarray(junction_with_leakage(base, path, at_base, data.leakage_coefficient))
    at_hot = np.where(np.isnan(hot), np.e * at_base, (hot - base) / path)
    margin = runaway_margin(np.maximum(at_hot, 1e-12), data.leakage_coefficient, path)
    room = runaway_room(at_base, data.leakage_coefficient, path)
    return np.where(known, margin, np.nan), np.where(known, ambient_c + room, np.nan)


class Run(Protocol):
    """Runs the loop for some rows."""

    def __call__(
        self, some: Floats, starts: Floats | None, is_irregular: NDArray[np.bool_]
    ) -> SteadyStates:
        """Steady states of the rows, from given states near their end or the usual ones; which of them were
        irregular in the run before.
        """


@dataclass(frozen=True, kw_only=True)
class Settled:
    """The loop and its temperatures in agreement.

    Attributes
    ----------
    loop : SteadyStates
        The last run.
    rows : NDArray
        Parameters of the last run, shape (n, columns).
    balance : Balance
        Losses and temperatures.
    is_settled : NDArray
        Where the temperatures stand still, shape (n,).
    """

    loop: SteadyStates
    rows: Floats
    balance: Balance
    is_settled: NDArray[np.bool_]


def settle_temperatures(
    rows: Floats, run: Run, data: LossData, ways: Ways, ambient_c: Floats, precision: float = SETTLED
) -> Settled:
    """Run the loop until its losses and the temperatures agree.

    Parameters
    ----------
    rows : NDArray
        Parameters at 25 degC, shape (n, columns).
    run : callable
        Runs the loop for some of the rows.
    data, ways : LossData, Ways
        Of the same points.
    ambient_c : NDArray
        [degC], shape (n,).
    precision : float
        Change below which temperatures stand still [K].

    Returns
    -------
    Settled
        With at most `RUNS` runs; only points whose parameters still move are run again, each from where its
        last run ended.
    """
    ambient = np.repeat(ambient_c[:, None], len(DEVICES) + 1, axis=1)
    known = np.column_stack([np.isfinite(ways.heat.own), np.isfinite(data.surface)])
    steps = _Steps(np.where(known, ambient, np.nan))
    now = parameters_at(rows, ways.hot, steps.at[:, :-1], steps.at[:, -1], ambient_c)
    loop = run(now, None, np.zeros(len(rows), dtype=bool))
    moving = np.ones(len(rows), dtype=bool)
    which = np.arange(len(rows))
    for turn in range(1, RUNS + 1):
        part = SteadyStates(values=loop.values[which], ends=loop.ends[which])
        some = ways.part(which)
        found = balance(part, rows[which], data.part(which), some, ambient_c[which], steps.at[which, -1])
        change = np.column_stack([found.junction_c, found.choke_c]) - steps.at[which]
        change = np.where(np.isfinite(change), change, 0.0)
        irregular = part.column("period_cycles") < 0.0
        restless = irregular | (part.column("period_cycles") > 1.0)
        enough = np.where(restless, np.maximum(SETTLED_IRREGULAR, RESTLESS * precision), precision)
        there = steps.at[which]
        then = parameters_at(rows[which], some.hot, there[:, :-1], there[:, -1], ambient_c[which], part)
        moves = np.maximum(_felt(there, change), _felt_by_rows(now[which], then, part, found)) > enough
        moving[which] = moves
        if turn == RUNS or not moves.any():
            break
        steps.take(which[moves], change[moves])
        which, irregular, some = which[moves], irregular[moves], some.part(np.flatnonzero(moves))
        part = SteadyStates(values=part.values[moves], ends=part.ends[moves])
        there = steps.at[which]
        now[which] = parameters_at(rows[which], some.hot, there[:, :-1], there[:, -1], ambient_c[which], part)
        again = run(now[which], loop.ends[which, :5], irregular)
        loop.values[which], loop.ends[which] = again.values, again.ends
    last = balance(loop, rows, data, ways, ambient_c, steps.at[:, -1])
    return Settled(loop=loop, rows=now, balance=last, is_settled=~moving)


def _felt(at: Floats, change: Floats) -> Floats:
    """Largest part of a change of temperature that the loop's parameters follow [K], shape (n,)."""
    low, high = PARAMETER_RANGE_C
    tops = np.full(len(DEVICES) + 1, high)
    tops[-1] = COPPER_CEILING_C
    felt = np.abs(np.clip(at + change, low, tops) - np.clip(at, low, tops))
    felt[:, REGULATOR] /= IDLE_SHARE
    return np.where(np.isfinite(felt), felt, 0.0).max(axis=1)


def _felt_by_rows(now: Floats, then: Floats, loop: SteadyStates, found: Balance) -> Floats:
    """Change of what follows the loop rather than a temperature, as a change of temperature [K], shape (n,).

    The rate of loops that do not repeat each cycle differs from run to run, and so does the ESR.
    """
    esr, charge, drop = COLUMN["esr"], COLUMN["recovery_charge"], COLUMN["saturation_voltage"]
    total = np.maximum(sum(found.losses.values(), np.zeros(len(now))), 1e-3)
    regular = loop.column("period_cycles") == 1.0
    swept = np.abs(then[:, charge] - now[:, charge]) * now[:, COLUMN["supply_voltage"]]
    return np.maximum.reduce(
        [
            np.where(regular, np.abs(then[:, esr] / np.maximum(now[:, esr], 1e-9) - 1.0), 0.0) / ESR_FELT,
            swept * loop.column("frequency_hz") / total / LOSS_FELT,
            np.abs(then[:, drop] - now[:, drop]) / DROP_FELT,
        ]
    )


class _Steps:
    """Temperatures on their way to a fixed point, by Anderson's method with a memory of one step.

    Plain iteration overshoots: a hotter transistor switches more slowly, so that rate and losses fall.
    """

    def __init__(self, start: Floats) -> None:
        self.at = start
        self._moved = np.full_like(start, np.nan)
        self._change = np.full_like(start, np.nan)

    def take(self, which: NDArray[np.intp], change: Floats) -> None:
        """Move some points; `change` is what the losses found ask for [K], shape (k, 4)."""
        slope = change - self._change[which]
        square = np.square(slope).sum(axis=1)
        usable = np.isfinite(square) & (square > 0.0)
        mixed = (change * slope).sum(axis=1) / np.where(usable, square, 1.0)
        share = np.where(usable, np.clip(mixed, *MIXING), 0.0)[:, None]
        step = change - np.where(share != 0.0, share * (self._moved[which] + slope), 0.0)
        self.at[which] += step
        self._moved[which], self._change[which] = step, change
