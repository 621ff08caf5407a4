"""Temperatures of junctions and choke, solved together with the losses that depend on them.

The loop is run again with the parameters that a temperature changes, until the temperatures stand still. What
feeds back quickly, the rectifier's leakage and the resistance of the copper, is solved within each run.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import COPPER_REFERENCE_C
from buckdesign.design.elements import HeatPath, ResolvedDesign
from buckdesign.design.losses import (
    Floats,
    LossData,
    copper_ac_loss,
    copper_resistance_factor,
    core_loss,
    data_by_point,
    input_capacitor_loss,
    junction_capacitance_loss,
    leakage_factor,
    loop_losses,
    rectifier_leakage_loss,
    winding_ac_factor,
)
from buckdesign.design.sections import DEVICES
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import SteadyStates
from buckdesign.physics.convection import ring_rise
from buckdesign.physics.pnp import base_emitter_voltage, charge_time_at_temperature, gain_at_temperature
from buckdesign.physics.regulator import DROPOUT_TEMPERATURE_COEFFICIENT
from buckdesign.physics.runaway import junction_with_leakage
from buckdesign.physics.thermal import ring_rise_surface_rule

REFERENCE_C = 25.0
"""Junction temperature of the tables' values [degC] (data sheets' usual condition)."""

SATURATION_COEFFICIENT = 3e-3
"""Change of the saturation resistance of a silicon power transistor [1/K] (from memory: the resistance of the
collector rises as carriers get slower)."""

PARAMETER_RANGE_C = (-55.0, 175.0)
"""Temperatures within which parameters are changed [degC]; beyond, those of the end are taken (from memory:
where the laws of temperature are known)."""

COPPER_CEILING_C = 300.0
"""Temperature up to which the copper's resistance is followed [degC] (own choice: the enamel has burnt)."""

LEAKAGE_CEILING_C = 200.0
"""Junction temperature up to which leakage is followed [degC] (own choice, above every junction limit): one
that is hotter without it has failed already, which is not called runaway."""

MIXING = (-9.0, 0.95)
"""Bounds of the part of the last step that is taken back [1] (own choice: a slope between -20 and 0.9)."""

RUNS = 8
"""Most runs of the loop to settle the temperatures [1] (own choice; two to three are usual)."""

SETTLED = 0.5
"""Change between two runs below which temperatures stand still [K] (own choice: what is left changes the rate of
the loop by 0.3 % at most, and the temperatures by about a tenth of it)."""

SETTLED_IRREGULAR = 2.0
"""The same for irregular oscillation, whose averages differ from run to run [K] (own choice)."""

IDLE_SHARE = 20.0
"""How much further the regulator may move, on which the loop hardly depends [1] (own choice)."""

_COPPER_STEPS = 12
TRANSISTOR, REGULATOR, RECTIFIER = (DEVICES.index(name) for name in ("transistor", "regulator", "rectifier"))


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
    forward_coefficient : NDArray
        Change of the rectifier's forward drop [V/K], shape (n,).
    """

    own: Floats
    is_shared: NDArray[np.bool_]
    sink: Floats
    forward_coefficient: Floats

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
        "forward_coefficient": resolved.rectifier.forward_coefficient,
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


def parameters_at(rows: Floats, heat: HeatData, junction_c: Floats, choke_c: Floats) -> Floats:
    """Loop parameters at temperatures.

    Parameters
    ----------
    rows : NDArray
        Parameters at 25 degC, copper at 20 degC, shape (n, columns).
    heat : HeatData
        Of the same points.
    junction_c, choke_c : NDArray
        Temperatures [degC], shape (n, 3) and (n,); NaN leaves a parameter as it is.

    Returns
    -------
    NDArray
        New rows: base-emitter voltage, gain, charge lifetime and saturation resistance of the transistor,
        threshold and recovery charge of the rectifier, dropout of the regulator, resistance of the choke.
    """
    low, high = PARAMETER_RANGE_C
    hot = np.clip(np.where(np.isnan(junction_c), REFERENCE_C, junction_c), low, high)
    transistor, rectifier = hot[:, TRANSISTOR], hot[:, RECTIFIER]
    choke = np.where(np.isnan(choke_c), 1.0, copper_resistance_factor(np.minimum(choke_c, COPPER_CEILING_C)))
    changed = rows.copy()
    emitter, gain, time = COLUMN["base_emitter"], COLUMN["gain"], COLUMN["charge_time"]
    saturation, threshold = COLUMN["saturation_resistance"], COLUMN["threshold"]
    changed[:, emitter] = np.maximum(base_emitter_voltage(rows[:, emitter], transistor), 0.1)
    changed[:, gain] = gain_at_temperature(rows[:, gain], transistor)
    changed[:, time] = charge_time_at_temperature(rows[:, time], transistor)
    changed[:, saturation] *= 1.0 + SATURATION_COEFFICIENT * (transistor - REFERENCE_C)
    drop = heat.forward_coefficient * (rectifier - REFERENCE_C)
    changed[:, threshold] = np.maximum(rows[:, threshold] + drop, 0.2 * rows[:, threshold])
    changed[:, COLUMN["choke_resistance"]] *= choke
    dropout = DROPOUT_TEMPERATURE_COEFFICIENT * (hot[:, REGULATOR] - REFERENCE_C)
    changed[:, COLUMN["dropout"]] = np.maximum(rows[:, COLUMN["dropout"]] + dropout, 0.0)
    return changed


def balance(
    loop: SteadyStates, rows: Floats, data: LossData, heat: HeatData, ambient_c: Floats, choke_c: Floats
) -> Balance:
    """Losses and temperatures for given averages of the loop.

    Parameters
    ----------
    loop : SteadyStates
        Steady states of n points.
    rows : NDArray
        Parameters at 25 degC, shape (n, columns): the copper's resistance at 20 degC is taken from them.
    data, heat : LossData, HeatData
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
    losses["input_capacitor"] = input_capacitor_loss(loop, data)
    losses["rectifier_recovery"] += junction_capacitance_loss(loop, data)
    copper = rows[:, COLUMN["choke_resistance"]]
    factor = winding_ac_factor(loop, data, np.where(np.isnan(choke_c), ambient_c, choke_c))
    hot_choke = _choke_temperature(loop, copper, losses["choke_core"], factor, data, ambient_c)
    followed = np.where(np.isnan(hot_choke), COPPER_REFERENCE_C, np.minimum(hot_choke, COPPER_CEILING_C))
    resistance = copper * copper_resistance_factor(followed)
    losses["choke_copper_ac"] = copper_ac_loss(loop, resistance, factor)
    junction_c, leakage, runaway = junctions(loop, device_heat(losses), data, heat, ambient_c)
    losses["rectifier_leakage"] = leakage
    return Balance(losses=losses, junction_c=junction_c, choke_c=hot_choke, runaway=runaway)


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
    on_sink = np.sum(np.where(heat.is_shared, power, 0.0), axis=1)
    junction = ambient_c[:, None] + heat.own * power + heat.is_shared * (heat.sink * on_sink)[:, None]
    base = junction[:, RECTIFIER]
    path = heat.own[:, RECTIFIER] + np.where(heat.is_shared[:, RECTIFIER], heat.sink, 0.0)
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


Run = Callable[[Floats, "Floats | None", "NDArray[np.bool_] | None"], SteadyStates]
"""Steady states of some rows; from given starting states near their end or the usual ones; and, with those, which
of them are known to be irregular."""


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
    rows: Floats, run: Run, data: LossData, heat: HeatData, ambient_c: Floats, precision: float = SETTLED
) -> Settled:
    """Run the loop until its losses and the temperatures agree.

    Parameters
    ----------
    rows : NDArray
        Parameters at 25 degC, shape (n, columns).
    run : callable
        Runs the loop for some of the rows.
    data, heat : LossData, HeatData
        Of the same points.
    ambient_c : NDArray
        [degC], shape (n,).
    precision : float
        Change below which temperatures stand still [K].

    Returns
    -------
    Settled
        With at most `RUNS` runs; only points whose parameters still move are run again, each from where its last
        run ended. Where the loop repeats without change the temperatures follow from its last run alone.
    """
    ambient = np.repeat(ambient_c[:, None], len(DEVICES) + 1, axis=1)
    known = np.column_stack([np.isfinite(heat.own), np.isfinite(data.surface)])
    steps = _Steps(np.where(known, ambient, np.nan))
    now = parameters_at(rows, heat, steps.at[:, :-1], steps.at[:, -1])
    loop = run(now, None, None)
    values, ends = loop.values.copy(), loop.ends.copy()
    for count in range(RUNS):
        loop = SteadyStates(values=values, ends=ends)
        found = balance(loop, rows, data, heat, ambient_c, steps.at[:, -1])
        wanted = np.column_stack([found.junction_c, found.choke_c])
        irregular = loop.column("period_cycles") < 0.0
        enough = np.where(irregular, np.maximum(SETTLED_IRREGULAR, precision), precision)
        moving = _felt_change(steps.at, wanted) > enough
        if not moving.any() or count == RUNS - 1:
            break
        again = np.flatnonzero(moving)
        change = np.where(np.isfinite(wanted), wanted - steps.at, 0.0)
        steps.take(again, change[again])
        now[again] = parameters_at(rows[again], heat.part(again), steps.at[again, :-1], steps.at[again, -1])
        part = run(now[again], ends[again, :5], irregular[again])
        values[again], ends[again] = part.values, part.ends
    return Settled(loop=loop, rows=now, balance=found, is_settled=~moving)


def _felt_change(before: Floats, after: Floats) -> Floats:
    """Largest change of temperature that the loop's parameters follow [K], shape (n,)."""
    low, high = PARAMETER_RANGE_C
    tops = np.full(len(DEVICES) + 1, high)
    tops[-1] = COPPER_CEILING_C
    change = np.abs(np.clip(after, low, tops) - np.clip(before, low, tops))
    change[:, REGULATOR] /= IDLE_SHARE
    return np.where(np.isfinite(change), change, 0.0).max(axis=1)


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
