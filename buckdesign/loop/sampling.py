"""Waveforms and trajectories of one design, sampled from the kernel's own steps."""

from __future__ import annotations

import math

from .accounting import account, clear
from .changes import available, change, move
from .compiling import compiled
from .constants import (
    ACTIVE,
    EMPTY,
    FREEWHEEL,
    K_TAU_INV,
    M_BASE,
    M_CLAMP,
    M_MODE,
    ORDER,
    RECOVERING,
    S_IL,
    S_IR,
    S_Q,
    S_VC,
    S_VH,
    S_VOUT,
    S_VSW,
    SATURATED,
    UNHELD,
    Array,
    Discrete,
)  # fmt: skip
from .crossing import value
from .cycles import count_period, nudge
from .step import NONE, advance

# columns of a recording
SAMPLES = (
    "time_s", "choke_current_a", "output_voltage_v", "switch_node_v", "regulator_current_a", "collector_current_a",
    "rectifier_current_a", "capacitor_voltage_v", "base_charge_c", "coupling_voltage_v", "mode",
)  # fmt: skip
WIDTH = len(SAMPLES)
MOST_STEPS = 2_000_000


@compiled
def sample(c: Array, m: Discrete, s: Array, t: float, decay: float, at: float, row: Array) -> None:
    """One sample of the step whose coefficients stand in ``s``, at ``t`` into it, booked at time ``at``."""
    mode = m[M_MODE]
    il = value(s, S_IL, ORDER, t) if mode != EMPTY else 0.0
    q = 0.0
    if m[M_BASE] == 1:
        q = value(s, S_Q, ORDER, t)
        if decay != 0.0:
            q += decay * math.exp(-c[K_TAU_INV] * t)
        q = max(q, 0.0)
    ic = 0.0
    if mode == SATURATED or mode == ACTIVE:
        ic = il
    elif mode == FREEWHEEL or mode == RECOVERING:
        ic = available(c, q)
    row[0] = at
    row[1] = il
    row[2] = value(s, S_VOUT, ORDER - 1, t)
    row[3] = value(s, S_VSW, ORDER - 1, t)
    row[4] = value(s, S_IR, ORDER if m[M_CLAMP] == UNHELD else ORDER - 1, t)
    row[5] = ic
    row[6] = il - ic if mode == FREEWHEEL or mode == RECOVERING else 0.0
    row[7] = value(s, S_VC, ORDER, t)
    row[8] = q
    row[9] = value(s, S_VH, ORDER, t)
    row[10] = mode


@compiled
def record(
    c: Array,
    x: Array,
    m: Discrete,
    s: Array,
    cycles: int,
    span: float,
    per_step: int,
    spacing: float,
    rows: Array,
) -> tuple[int, float, int]:
    """Run ``cycles`` cycles or ``span`` seconds; sample each step at ``per_step`` + 1 points, closer than ``spacing``.

    Returns the number of rows filled, the time run [s] and the cycles begun.
    """
    filled = 0
    clock = 0.0
    begun = 0
    stalled = 0
    steps = 0
    while clock < span and steps < MOST_STEPS and begun < cycles:
        h, event, which, decay = advance(c, x, m, s, span - clock)
        steps += 1
        if h > 0.0:
            points = max(per_step, min(int(h / spacing) + 1, 400))
            for k in range(points + 1):
                if filled >= rows.shape[0]:
                    return filled, clock, begun
                t = h * k / points
                sample(c, m, s, t, decay, clock + t, rows[filled])
                filled += 1
            move(c, x, m, s, h, decay)
            clock += h
            stalled = 0
        else:
            stalled += 1
            if stalled > 12:
                nudge(c, x, m, s)
        if event != NONE and change(c, x, m, s, event, which, h) and clock > 0.0:
            begun += 1
    return filled, clock, begun


@compiled
def cycle_starts(
    c: Array, x: Array, m: Discrete, s: Array, cycles: int, span: float, times: Array, states: Array, a: Array
) -> int:
    """Run from ``x`` until ``cycles`` cycles have begun or ``span`` is over, accounting in ``a``.

    Fills the time [s] and the state at each cycle's beginning; returns how many.
    """
    clear(a)
    clock = 0.0
    last = 0.0
    begun = 0
    stalled = 0
    steps = 0
    while clock < span and steps < MOST_STEPS and begun < cycles:
        h, event, which, decay = advance(c, x, m, s, span - clock)
        steps += 1
        if h > 0.0:
            account(c, m, s, h, a)
            move(c, x, m, s, h, decay)
            clock += h
            stalled = 0
        else:
            stalled += 1
            if stalled > 12:
                nudge(c, x, m, s)
        if event != NONE and change(c, x, m, s, event, which, h) and clock > 0.0:
            times[begun] = clock
            states[begun] = x
            if begun > 0:
                count_period(a, last)
            last = clock
            begun += 1
    return begun
