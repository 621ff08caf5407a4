"""The loop and its temperatures brought into agreement.

The loop is run again with the parameters that temperatures, currents and rate change, until they stand still.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.heat_paths import HeatData, Ways
from buckdesign.design.hot_parameters import (
    COPPER_CEILING_C,
    PARAMETER_RANGE_C,
    REGULATOR,
    parameters_at,
    turn_on_slope,
)
from buckdesign.design.losses import Floats, LossData
from buckdesign.design.sections import DEVICES
from buckdesign.design.temperatures import Balance, balance, without_leakage
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import TANGENT, SteadyStates

MIXING = (-9.0, 0.95)
"""Bounds of the part of the last step that is taken back [1] (own choice: a slope between -20 and 0.9)."""

RUNS = 8
"""Most runs of the loop to settle the temperatures [1] (own choice; two to three are usual)."""

SETTLED = 0.1
"""Change between two runs below which temperatures stand still [K] (own choice: on 6000 random circuits what was left
changed the rate of the loop by 0.13 % or less in 99 of 100, by 0.25 % at most, and temperatures by 0.06 K)."""

SETTLED_IRREGULAR = 2.0
"""The same for oscillation that is irregular or repeats only after several cycles, whose averages jump
from run to run [K] (own choice)."""

RESTLESS = 8.0
"""The same over the change that others may have [1] (own choice: a short average scatters by some per cent)."""

IDLE_SHARE = 20.0
"""How much further the regulator may move, on which the loop hardly depends [1] (own choice)."""

GUESSED_SHARE, GUESSED_DROP, GUESSED_CHOKE, GUESSED_MOST = 0.04, 0.4, 17.0, 60.0
"""First guess of the temperatures: loss of transistor and of regulator over supply times load [1], drop of the
rectifier [V], rise of the choke and largest rise of a junction [K] (own choice: middle of random designs)."""

ESR_FELT, LOSS_FELT, DROP_FELT, DELAY_FELT = 0.02, 0.01, 5e-3, 3e-4
"""What counts like a kelvin: change of the ESR [1], of the recovery loss over all losses [1], of the saturation
voltage [V], of the time that recovery takes over the period [1] (own choice; a delay moves the rate of the loop by
some ten times its share of the period)."""


class Run(Protocol):
    """Runs the loop for some rows."""

    def __call__(
        self, some: Floats, starts: Floats | None, is_irregular: NDArray[np.bool_], tangents: Floats
    ) -> SteadyStates:
        """Steady states of the rows, from given states near their end or the usual ones; which of them were
        irregular in the run before; derivatives of their return maps, changed into those found.
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
    steps = _Steps(_first_guess(rows, data, ways.heat, ambient_c))
    now = parameters_at(rows, ways.hot, steps.at[:, :-1], steps.at[:, -1], ambient_c)
    tangents = np.zeros((len(rows), *TANGENT))
    loop = run(now, None, np.zeros(len(rows), dtype=bool), tangents)
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
        known = tangents[which]
        again = run(now[which], loop.ends[which, :5], irregular, known)
        loop.values[which], loop.ends[which], tangents[which] = again.values, again.ends, known
    last = balance(loop, rows, data, ways, ambient_c, steps.at[:, -1])
    return Settled(loop=loop, rows=now, balance=last, is_settled=~moving)


def _first_guess(rows: Floats, data: LossData, heat: HeatData, ambient_c: Floats) -> Floats:
    """Temperatures to begin with [degC], shape (n, 4); only how many runs are needed depends on them."""
    r1, r2, supply = rows[:, COLUMN["r1"]], rows[:, COLUMN["r2"]], rows[:, COLUMN["supply_voltage"]]
    output = np.minimum(rows[:, COLUMN["reference"]] * (1.0 + r2 / r1), supply)
    load = rows[:, COLUMN["load_current"]] + output / rows[:, COLUMN["load_resistance"]]
    switches = load > rows[:, COLUMN["base_emitter"]] / rows[:, COLUMN["base_resistance"]]
    load = np.where(switches, np.minimum(load, rows[:, COLUMN["full_load"]]), 0.0)
    drive = GUESSED_SHARE * supply * load
    power = np.column_stack([drive, drive, GUESSED_DROP * load * (1.0 - output / supply)])
    rise = np.minimum(without_leakage(power, heat, np.zeros(len(rows)))[0], GUESSED_MOST)
    wound = np.where(np.isfinite(data.surface), np.where(switches, GUESSED_CHOKE, 0.0), np.nan)
    return ambient_c[:, None] + np.column_stack([rise, wound])


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
    slope = np.maximum(turn_on_slope(now, loop, np.maximum(loop.column("regulator_max_a"), 1e-6)), 1.0)
    delay = np.abs(np.sqrt(2.0 * then[:, charge] / slope) - np.sqrt(2.0 * now[:, charge] / slope))
    return np.maximum.reduce(
        [
            np.where(regular, delay * loop.column("frequency_hz"), 0.0) / DELAY_FELT,
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
