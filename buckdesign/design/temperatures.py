"""Temperatures of junctions and choke, solved together with the losses that depend on them.

What feeds back quickly, the rectifier's leakage and the resistance of the copper, is solved within each run of the
loop; `buckdesign.design.settling` runs it again until the temperatures stand still.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import COPPER_REFERENCE_C
from buckdesign.design.heat_paths import HeatData, Ways
from buckdesign.design.hot_parameters import (
    COPPER_CEILING_C,
    RECTIFIER,
    REGULATOR,
    TRANSISTOR,
    HotData,
)
from buckdesign.design.losses import (
    LEAKAGE_CEILING_C,
    Floats,
    LossData,
    copper_ac_loss,
    copper_resistance_factor,
    core_loss,
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

_COPPER_STEPS = 12


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
    junction, path = without_leakage(power, heat, ambient_c)
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


def without_leakage(power: Floats, heat: HeatData, ambient_c: Floats) -> tuple[Floats, Floats]:
    """Junctions but for the leakage's heat [degC], shape (n, 3), and the rectifier's way to ambient [K/W].

    Parameters
    ----------
    power : NDArray
        Heat in each device [W], shape (n, 3).
    heat : HeatData
        Of the same points.
    ambient_c : NDArray
        [degC], shape (n,).

    Returns
    -------
    tuple of NDArray
        See above; NaN where not known.
    """
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
    junction, path = without_leakage(power, heat, ambient_c)
    base = junction[:, RECTIFIER]
    at_base = rectifier_leakage_loss(loop, data, np.where(np.isfinite(base), base, ambient_c))
    known = np.isfinite(base) & np.isfinite(path) & (at_base > 0.0) & (path > 0.0)
    path, at_base = np.where(known, path, 1.0), np.where(known, at_base, 1e-9)
    hot = np.asarray(junction_with_leakage(base, path, at_base, data.leakage_coefficient))
    at_hot = np.where(np.isnan(hot), math.e * at_base, (hot - base) / path)
    margin = runaway_margin(np.maximum(at_hot, 1e-12), data.leakage_coefficient, path)
    room = runaway_room(at_base, data.leakage_coefficient, path)
    return np.where(known, margin, np.nan), np.where(known, ambient_c + room, np.nan)
