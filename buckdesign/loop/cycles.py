"""Running the loop from cycle to cycle, and the rest points it can settle at instead."""

from __future__ import annotations

import numpy as np

from .accounting import A_COMMUTATIONS, A_CYCLES, A_PERIOD, A_PERIOD2, A_TIME, account
from .changes import available, change, charge, move, turn_on
from .compiling import compiled
from .constants import (
    ACTIVE,
    EMPTY,
    FREEWHEEL,
    HELD_BOTH,
    HELD_HIGH,
    HELD_LOW,
    K_IBE,
    K_IQ,
    K_RCE,
    K_RHCH_INV,
    K_SC_I,
    K_SC_IR,
    K_SC_Q,
    K_VCE0,
    K_VD0,
    K_VIN,
    M_BASE,
    M_BOUND,
    M_CLAMP,
    M_JUST,
    M_MODE,
    RECOVERING,
    S_ER,
    S_IL,
    S_IR,
    S_Q,
    S_VC,
    S_VH,
    S_VOUT,
    S_VSW,
    SATURATED,
    STATES,
    UNHELD,
    X_IL,
    X_IR,
    X_Q,
    X_SWEPT,
    X_VC,
    X_VH,
    Array,
    Discrete,
)  # fmt: skip
from .step import BASE_ON, CHARGE_ENOUGH, NODE_FALLS, NONE, advance, ruling_bound
from .taylor import expand

BEGAN, RESTS, SPENT, TIME_UP = 0, 1, 2, 3
# how a cycle began
FROM_FREEWHEEL, FROM_EMPTY, FROM_NODE = 0, 1, 2

# steps without a cycle after which a rest point is looked for, and how often
REST_AFTER, REST_EVERY = 48, 12
NEAR_REST_EVERY = 4
# counters kept in the progress array
G_STEPS, G_TIME, G_STALLED, G_DISTANCE, G_BEGAN, G_NEAR_REST = range(6)
PROGRESS = 6
# how far from its rest point, in scaled coordinates, a circuit may be that rested in nearly the same state before:
# at once, and while it comes nearer
NEAR, NEARING = 1e-3, 0.1
# the static solution of the active mode is unstable, so that only a rest at a bound can be trusted; or it is stable
REST_AT_BOUND, REST_IS_STABLE = 1.0, 2.0


@compiled
def solve_linear(a: Array, b: Array, n: int) -> bool:
    """Solve ``a x = b`` in place by elimination with pivots; false where singular."""
    for k in range(n):
        pivot = k
        for i in range(k + 1, n):
            if abs(a[i, k]) > abs(a[pivot, k]):
                pivot = i
        if abs(a[pivot, k]) < 1e-14:
            return False
        for j in range(n):
            a[k, j], a[pivot, j] = a[pivot, j], a[k, j]
        b[k], b[pivot] = b[pivot], b[k]
        for i in range(k + 1, n):
            factor = a[i, k] / a[k, k]
            for j in range(k, n):
                a[i, j] -= factor * a[k, j]
            b[i] -= factor * b[k]
    for k in range(n - 1, -1, -1):
        for j in range(k + 1, n):
            b[k] -= a[k, j] * b[j]
        b[k] /= a[k, k]
    return True


@compiled
def _free_states(c: Array, m: Discrete, which: Array, scale: Array) -> int:
    """States that move freely in a discrete state, with their scales; returns how many."""
    n = 0
    if m[M_MODE] == SATURATED or m[M_MODE] == ACTIVE:
        which[n], scale[n] = X_IL, c[K_SC_I]
        n += 1
    which[n], scale[n] = X_VC, 1.0
    n += 1
    if m[M_CLAMP] == UNHELD:
        which[n], scale[n] = X_IR, c[K_SC_IR]
        n += 1
    if m[M_BASE] == 1 and m[M_MODE] != ACTIVE:
        which[n], scale[n] = X_Q, c[K_SC_Q]
        n += 1
    if c[K_RHCH_INV] > 0.0:
        which[n], scale[n] = X_VH, 1.0
        n += 1
    return n


@compiled
def _valid_rest(c: Array, x: Array, m: Discrete, s: Array) -> bool:
    """Whether a rest point lies inside its own discrete state (``s`` expanded there)."""
    vout = s[S_VOUT, 0]
    slack = 1e-9
    if not (vout >= 0.5 or m[4] != 0) or (m[4] == 1 and not (0.0 <= vout <= 0.5)):
        return False
    bound, limit = ruling_bound(c, vout, m[M_BASE])
    if m[M_CLAMP] == UNHELD and not (c[K_IQ] - slack <= x[X_IR] <= limit + slack):
        return False
    if m[M_CLAMP] == HELD_LOW and s[S_ER, 0] > slack:
        return False
    if m[M_CLAMP] == HELD_HIGH and (bound != m[M_BOUND] or s[S_ER, 0] < -slack or s[S_IR, 0] < c[K_IQ] - slack):
        return False
    if m[M_CLAMP] == HELD_BOTH and (limit > c[K_IQ] + slack or s[S_ER, 0] < -slack):
        return False
    if m[M_BASE] == 0 and s[S_IR, 0] > c[K_IBE] + slack:
        return False
    mode = m[M_MODE]
    if mode == SATURATED:
        return x[X_IL] >= 0.0 and available(c, x[X_Q]) >= x[X_IL] * (1.0 - slack)
    if mode == ACTIVE:
        top = c[K_VIN] - c[K_VCE0] - c[K_RCE] * x[X_IL]
        return x[X_IL] >= 0.0 and -c[K_VD0] - slack <= s[S_VSW, 0] <= top + slack
    return m[M_BASE] == 0 or vout >= c[K_VIN] - c[K_VCE0]


@compiled
def rest_point(c: Array, x: Array, m: Discrete, s: Array, target: Array) -> float:
    """Rest point of the present discrete state by Newton's method.

    Writes it to ``target`` and returns the scaled distance from ``x``; infinite where there is none, 0 where
    the state already moves straight towards it: the conditions of a discrete state are linear, so that none
    of them can fail on the way.
    """
    if m[M_MODE] == FREEWHEEL or m[M_MODE] == RECOVERING:
        return np.inf
    which = np.zeros(5)
    scale = np.ones(5)
    n = _free_states(c, m, which, scale)
    rows = np.array([S_IL, S_VC, S_IR, S_Q, S_VH, 0])
    jacobian = np.empty((5, 5))
    rhs = np.empty(5)
    y = x.copy()
    velocity = np.zeros(5)
    start = np.empty(5)
    for k in range(4):
        expand(c, y, m, s, 1)
        for i in range(n):
            start[i] = s[rows[int(which[i])], 1] / scale[i]
        if k == 0:
            velocity[:] = start
        for j in range(n):
            k = int(which[j])
            kept = y[k]
            nudge = 1e-5 * scale[j]
            y[k] = kept + nudge
            expand(c, y, m, s, 1)
            for i in range(n):
                jacobian[i, j] = (s[rows[int(which[i])], 1] / scale[i] - start[i]) / 1e-5
            y[k] = kept
        for i in range(n):
            largest = 0.0
            for j in range(n):
                largest = max(largest, abs(jacobian[i, j]))
            if largest == 0.0:
                return np.inf
            for j in range(n):
                jacobian[i, j] /= largest
            rhs[i] = -start[i] / largest
        if not solve_linear(jacobian, rhs, n):
            return np.inf
        step = 0.0
        for i in range(n):
            y[int(which[i])] += rhs[i] * scale[i]
            step = max(step, abs(rhs[i]))
        if not (step < 1e6) or y[X_IL] < 0.0:
            return np.inf
        if step < 1e-9:
            break
    expand(c, y, m, s, 1)
    if m[M_CLAMP] == HELD_HIGH:
        y[X_IR] = s[S_IR, 0]
    if m[M_MODE] == ACTIVE:
        y[X_Q] = charge(c, y[X_IL])
    if not _valid_rest(c, y, m, s):
        return np.inf
    target[:] = y
    distance = 0.0
    along = 0.0
    square = 0.0
    for i in range(n):
        gap = (y[int(which[i])] - x[int(which[i])]) / scale[i]
        distance = max(distance, abs(gap))
        along += gap * velocity[i]
        square += gap * gap
    if square == 0.0 or along <= 0.0:
        return distance
    astray = 0.0
    speed = 0.0
    for i in range(n):
        gap = (y[int(which[i])] - x[int(which[i])]) / scale[i]
        astray = max(astray, abs(velocity[i] - along / square * gap))
        speed = max(speed, abs(velocity[i]))
    return 0.0 if astray < 1e-4 * speed else distance


@compiled
def run_cycle(c: Array, x: Array, m: Discrete, s: Array, g: Array, limits: Array, a: Array, accounts: bool) -> int:
    """Run until a cycle begins, a rest point is reached or a limit is met.

    ``limits`` holds the largest number of steps and the largest time [s] since the last cycle began;
    ``g`` the progress (steps, time, stalled events, last distance, how the cycle began, whether a rest point is
    known to be near).
    """
    target = np.empty(STATES)
    is_near = g[G_NEAR_REST] > 0.0
    after, every = (NEAR_REST_EVERY, NEAR_REST_EVERY) if is_near else (REST_AFTER, REST_EVERY)
    steps = 0
    elapsed = 0.0
    g[G_DISTANCE] = np.inf
    while True:
        left = limits[1] - elapsed
        if steps >= limits[0]:
            return SPENT
        if left <= 0.0:
            return TIME_UP
        h, event, which, decay = advance(c, x, m, s, left)
        if accounts and h > 0.0:
            account(c, m, s, h, a)
        if h > 0.0:
            move(c, x, m, s, h, decay)
            g[G_STALLED] = 0.0
        else:
            g[G_STALLED] += 1.0
        elapsed += h
        steps += 1
        g[G_STEPS] += 1.0
        g[G_TIME] += h
        if event != NONE:
            before = m[M_MODE]
            if change(c, x, m, s, event, which, h):
                g[G_BEGAN] = FROM_FREEWHEEL if before == FREEWHEEL else FROM_EMPTY
                if event == NODE_FALLS:
                    g[G_BEGAN] = FROM_NODE
                if accounts and before == FREEWHEEL:
                    a[A_COMMUTATIONS] += 1.0
                return BEGAN
            if g[G_STALLED] > 12.0:
                nudge(c, x, m, s)
                elapsed += 1e-12
        if steps >= after and steps % every == 0 and not accounts:
            distance = rest_point(c, x, m, s, target)
            comes_nearer = distance < g[G_DISTANCE]
            trusted = is_near and (g[G_NEAR_REST] == REST_IS_STABLE or m[M_CLAMP] != UNHELD)
            if trusted and distance < NEARING and distance < 0.9 * g[G_DISTANCE] < np.inf:
                distance = 0.0
            if comes_nearer and distance < (NEAR if trusted else 1e-7):
                x[:] = target
                return RESTS
            g[G_DISTANCE] = distance


@compiled
def nudge(c: Array, x: Array, m: Discrete, s: Array) -> None:
    """Break a stalemate of events at one instant by a picosecond of plain motion."""
    expand(c, x, m, s, 2)
    h = 1e-12
    if m[M_MODE] != EMPTY:
        x[X_IL] = max(x[X_IL] + h * s[S_IL, 1], 0.0)
    x[X_VC] += h * s[S_VC, 1]
    if m[M_CLAMP] == UNHELD:
        x[X_IR] = max(x[X_IR] + h * s[S_IR, 1], c[K_IQ])
    if m[M_BASE] == 1 and m[M_MODE] != ACTIVE:
        x[X_Q] = max(x[X_Q] + h * s[S_Q, 1], 0.0)


@compiled
def resume(c: Array, z: Array, began: int, x: Array, m: Discrete, s: Array) -> None:
    """State at the beginning of a cycle from its section coordinates (i_L, v_C, i_R, v_H); ``m`` as saved there."""
    x[X_VC] = z[1]
    x[X_VH] = z[3]
    x[X_SWEPT] = 0.0
    m[M_BASE] = 1
    if began == FROM_EMPTY:
        x[X_IL] = 0.0
        x[X_Q] = 0.0
        x[X_IR] = max(c[K_IBE], c[K_IQ])
        m[M_MODE] = ACTIVE
        m[M_JUST] = BASE_ON
    else:
        m[M_JUST] = CHARGE_ENOUGH
        x[X_IL] = max(z[0], 0.0)
        x[X_IR] = max(z[2], c[K_IQ])
        x[X_Q] = charge(c, x[X_IL])
        m[M_MODE] = RECOVERING
    if m[M_CLAMP] == HELD_HIGH:
        expand(c, x, m, s, 1)
        x[X_IR] = s[S_IR, 0]
    elif m[M_CLAMP] == UNHELD:
        expand(c, x, m, s, 1)
        bound, limit = ruling_bound(c, s[S_VOUT, 0], 1)
        if x[X_IR] > limit and limit > c[K_IQ]:
            m[M_CLAMP] = HELD_HIGH
            m[M_BOUND] = bound
            expand(c, x, m, s, 1)
            x[X_IR] = s[S_IR, 0]
    if began != FROM_EMPTY:
        turn_on(c, x, m, s)


@compiled
def count_period(a: Array, before: float) -> None:
    """Book one finished cycle that began when the account's clock stood at ``before``."""
    period = a[A_TIME] - before
    a[A_CYCLES] += 1.0
    a[A_PERIOD] += period
    a[A_PERIOD2] += period * period
