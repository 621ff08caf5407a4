"""One step of the loop: expand, choose the length, find the first event, move, change mode.

An event function is positive while its condition holds and is a polynomial in the time since the
start of the step (with an added exponential for the charge of the saturated transistor). Its leading
coefficients that vanish to rounding are dropped before the search, so that the mode after an event is
decided by derivatives and never by the sign of a rounding error.
"""

from __future__ import annotations

import math

import numpy as np

from .compiling import compiled
from .constants import (
    ACTIVE,
    AT_LOOSENESS,
    BOUND_CONSTANT,
    BOUND_DRIVE,
    BOUND_FAR,
    BOUND_FOLD,
    BOUND_OFF,
    EMPTY,
    FREEWHEEL,
    HELD_BOTH,
    HELD_HIGH,
    HELD_LOW,
    K_BETA,
    K_FOLDS,
    K_I0_INV,
    K_IBE,
    K_IK_INV,
    K_IQ,
    K_LO_INV,
    K_QRR,
    K_RCE,
    K_SC_I,
    K_SC_IR,
    K_SC_Q,
    K_TAU,
    K_TAU_INV,
    K_TOLERANCE,
    K_VCE0,
    K_VD0,
    K_VIN,
    M_BASE,
    M_BOUND,
    M_CLAMP,
    M_JUST,
    M_LOAD,
    M_MODE,
    ORDER,
    RECOVERING,
    S_ER,
    S_EVENT,
    S_IAV,
    S_IL,
    S_IR,
    S_KEYS,
    S_Q,
    S_SWEPT,
    S_VC,
    S_VH,
    S_VOUT,
    S_VSW,
    SATURATED,
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
from .taylor import SMALL_BIAS, bound_line, expand

TINY = 1e-13
AFTER_EVENT = 1e4
SAMPLES = 3

(
    NONE, LEAVE_LOW, REACH_LOW, REACH_HIGH, LEAVE_HIGH, OTHER_BOUND, BOUND_BELOW, PINNED_FALLS, PINNED_RISES,
    BASE_ON, BASE_OFF, CHARGE_SHORT, CHOKE_EMPTY, CHARGE_ENOUGH, SWEPT, RECOVERED_EARLY, TO_SATURATION, TO_FREEWHEEL,
    NODE_FALLS, LOAD_SEGMENT,
) = range(20)  # fmt: skip


@compiled
def value(s: Array, row: int, order: int, t: float) -> float:
    """The polynomial of a row at time ``t``."""
    total = s[row, order]
    for n in range(order - 1, -1, -1):
        total = total * t + s[row, n]
    return total


@compiled
def _event_value(s: Array, low: int, order: int, decay: float, rate: float, t: float) -> float:
    total = s[S_EVENT, order]
    for n in range(order - 1, low - 1, -1):
        total = total * t + s[S_EVENT, n]
    if decay != 0.0:
        total += decay * math.exp(-rate * t)
    return total


@compiled
def _event_and_slope(s: Array, low: int, order: int, decay: float, rate: float, t: float) -> tuple[float, float]:
    f = s[S_EVENT, order]
    slope = 0.0
    for n in range(order - 1, low - 1, -1):
        slope = slope * t + f
        f = f * t + s[S_EVENT, n]
    if decay != 0.0:
        part = decay * math.exp(-rate * t)
        f += part
        slope -= rate * part
    return f, slope


@compiled
def _lowest(s: Array, low: int, order: int, decay: float, rate: float, left: float, right: float) -> float:
    """Where the event function is lowest in an interval over which its slope turns from falling to rising."""
    for _ in range(12):
        t = 0.5 * (left + right)
        f, slope = _event_and_slope(s, low, order, decay, rate, t)
        if f < 0.0:
            return t
        if slope < 0.0:
            left = t
        else:
            right = t
    return 0.5 * (left + right)


@compiled
def _refine(s: Array, low: int, order: int, decay: float, rate: float, left: float, right: float) -> float:
    """The root in (left, right], where the event function changes from positive to negative."""
    f_left = _event_value(s, low, order, decay, rate, left)
    f_right = _event_value(s, low, order, decay, rate, right)
    t = left + (right - left) * f_left / (f_left - f_right)
    close = 2e-15 * right
    for _ in range(60):
        f, slope = _event_and_slope(s, low, order, decay, rate, t)
        if f > 0.0:
            left = t
        else:
            right = t
        guess = t - f / slope if slope != 0.0 else left
        if abs(guess - t) <= close or right - left <= close:
            break
        if not (left < guess < right):
            guess = 0.5 * (left + right)
        t = guess
    return t


@compiled
def _search(
    s: Array, low: int, order: int, decay: float, rate: float, h: float, known: bool
) -> float:
    """First root by sampling, with a look for dips between the samples; infinite where there is none."""
    previous = 0.0
    falling = True
    for i in range(1, SAMPLES + 1):
        t = h * i / SAMPLES
        f, slope = _event_and_slope(s, low, order, decay, rate, t)
        if f >= 0.0 and falling and slope > 0.0:
            lowest = _lowest(s, low, order, decay, rate, previous, t)
            if _event_value(s, low, order, decay, rate, lowest) < 0.0:
                t, f = lowest, -1.0
        if f < 0.0:
            if previous == 0.0 and known:
                previous = 1e-9 * t
            return _refine(s, low, order, decay, rate, previous, t)
        previous = t
        falling = slope < 0.0
    return np.inf


@compiled
def _first_crossing(s: Array, order: int, h: float, tiny: float, drop: int) -> float:
    """First time in [0, h] at which the event polynomial turns negative; infinite when it does not.

    ``drop`` leading coefficients are known to vanish, because the step begins at the event's opposite.
    """
    low = 0
    power = 1.0
    # the first of them is zero, the second cannot be negative but for rounding
    while low < drop and (low == 0 or s[S_EVENT, low] <= 0.0):
        low += 1
        power *= h
    if low == 0 and abs(s[S_EVENT, 0]) <= tiny * s[S_KEYS, AT_LOOSENESS]:
        low = 1
        power = h
    while low <= order and abs(s[S_EVENT, low]) * power <= tiny:
        low += 1
        power *= h
    if low > order:
        return np.inf
    lead = s[S_EVENT, low]
    if lead < 0.0:
        return 0.0
    rest = 0.0
    bend = 0.0
    for n in range(order, low, -1):
        size = abs(s[S_EVENT, n])
        rest = (rest + size) * h
        if n > low + 1:
            bend = (bend + (n - low) * size) * h
    if lead > rest:
        return np.inf
    if low < order and abs(s[S_EVENT, low + 1]) >= bend:
        if s[S_EVENT, low + 1] > 0.0 or _event_value(s, low, order, 0.0, 0.0, h) >= 0.0:
            return np.inf
        return _refine(s, low, order, 0.0, 0.0, 0.0, h)
    return _search(s, low, order, 0.0, 0.0, h, False)


@compiled
def _first_shortage(s: Array, order: int, decay: float, rate: float, h: float, tiny: float, drop: int) -> float:
    """`_first_crossing` for an event polynomial with an added ``decay * exp(-rate t)``."""
    start = s[S_EVENT, 0] + decay
    if drop == 0 and (start < -tiny or (start <= tiny and s[S_EVENT, 1] - rate * decay < 0.0)):
        return 0.0
    if start > 0.0:
        rest = 0.0
        for n in range(order, 0, -1):
            rest = (rest + abs(s[S_EVENT, n])) * h
        if s[S_EVENT, 0] + min(decay, 0.0) > rest:
            return np.inf
    return _search(s, 0, order, decay, rate, h, drop > 0 or start <= tiny)


@compiled
def _spread(s: Array, row: int, order: int, h: float) -> float:
    """How far a row can move within the step."""
    rest = 0.0
    for n in range(order, 0, -1):
        rest = (rest + abs(s[row, n])) * h
    return rest


@compiled
def _known_zeros(just: int, event: int) -> int:
    """How many leading coefficients of an event function vanish right after its opposite has happened."""
    if just == NONE:
        return 0
    if (just == LEAVE_HIGH and event == REACH_HIGH) or (just == LEAVE_LOW and event == REACH_LOW):
        return 2
    if (just == TO_SATURATION and event == CHARGE_SHORT) or (just == TO_FREEWHEEL and event == CHARGE_ENOUGH):
        return 2
    if (just == BASE_ON and (event == BASE_OFF or event == CHOKE_EMPTY)) or (
        just == NODE_FALLS and event == CHOKE_EMPTY
    ):
        return 2
    if just == CHARGE_ENOUGH and (event == CHARGE_SHORT or event == RECOVERED_EARLY):
        return 1
    if event == CHARGE_ENOUGH and (just == CHARGE_SHORT or just == RECOVERED_EARLY):
        return 1
    return 0


@compiled
def _length(c: Array, m: Discrete, s: Array, order: int, limit: float) -> float:
    """Length of the step from the last two coefficients (Jorba & Zou, Exp. Math. 14 (2005) 99, sec. 3.2)."""
    last = 0.0
    before = 0.0
    saturated = m[M_MODE] == SATURATED
    for n in range(order - 1, order + 1):
        size = abs(s[S_IL, n]) / c[K_SC_I]
        size = max(size, abs(s[S_VC, n]))
        if m[M_CLAMP] == UNHELD:
            size = max(size, abs(s[S_IR, n]) / c[K_SC_IR])
        size = max(size, abs(s[S_VH, n]))
        if not saturated and m[M_BASE] == 1:
            size = max(size, abs(s[S_Q, n]) / c[K_SC_Q])
        before, last = last, size
    h = limit
    if last > 0.0:
        h = min(h, math.exp(math.log(c[K_TOLERANCE] / last) / order))
    if before > 0.0:
        h = min(h, math.exp(math.log(c[K_TOLERANCE] / before) / (order - 1)))
    if c[K_I0_INV] > 0.0 and m[M_MODE] != EMPTY and s[S_IL, 0] * c[K_I0_INV] <= SMALL_BIAS:
        while value(s, S_IL, order, h) * c[K_I0_INV] > 10.0 * SMALL_BIAS:
            h *= 0.6
    return h


@compiled
def _charge_by_exponential(c: Array, s: Array, order: int) -> float:
    """Replace the charge's coefficients by those of its particular solution; returns the decaying part.

    ``dq/dt = p(t) - q/tau`` with the polynomial ``p = i_R - V_BE/R_be`` has the solution
    ``r(t) + (q_0 - r_0) exp(-t/tau)``, ``r_n = tau (p_n - (n+1) r_{n+1})``.
    """
    start = s[S_Q, 0]
    above = 0.0
    for n in range(order - 1, -1, -1):
        p = s[S_IR, n]
        if n == 0:
            p -= c[K_IBE]
        above = c[K_TAU] * (p - (n + 1.0) * above)
        s[S_Q, n] = above
    s[S_Q, order] = 0.0
    return start - s[S_Q, 0]


@compiled
def _bound_event(c: Array, s: Array, bound: int, order: int) -> None:
    a, b = bound_line(c, bound)
    for n in range(order):
        s[S_EVENT, n] = b * s[S_VOUT, n] - s[S_IR, n]
    s[S_EVENT, 0] += a
    s[S_EVENT, order] = 0.0


@compiled
def _limit_bound(c: Array, vout: float) -> int:
    """Which of the current-limit lines rules at an output voltage."""
    if c[K_FOLDS] == 0.0:
        return BOUND_CONSTANT
    a, b = bound_line(c, BOUND_FOLD)
    fold = a + b * vout
    far, _ = bound_line(c, BOUND_FAR)
    if fold < far:
        return BOUND_FAR
    limit, _ = bound_line(c, BOUND_CONSTANT)
    return BOUND_FOLD if fold < limit else BOUND_CONSTANT


@compiled
def ruling_bound(c: Array, vout: float, base: int) -> tuple[int, float]:
    """The lowest upper bound at an output voltage: which, and its value [A]."""
    if base == 0:
        a, b = bound_line(c, BOUND_OFF)
        return BOUND_OFF, a + b * vout
    limit = _limit_bound(c, vout)
    a, b = bound_line(c, limit)
    lowest = a + b * vout
    a, b = bound_line(c, BOUND_DRIVE)
    if a + b * vout <= lowest:
        return BOUND_DRIVE, a + b * vout
    return limit, lowest


@compiled
def _leave_high(c: Array, m: Discrete, s: Array, order: int, h: float) -> float:
    """When the regulator current leaves the bound that holds it.

    It stays while ``e - R_o i_R`` pushes outward and the bound does not run away from it. In the active mode,
    where the error jumps with the release, it stays while it would move outward relative to the bound.
    """
    first = np.inf
    if m[M_MODE] != ACTIVE:
        for n in range(order):
            s[S_EVENT, n] = s[S_ER, n]
        s[S_EVENT, order] = 0.0
        first = _first_crossing(s, order - 1, h, TINY, 0)
        if s[S_IR, 1] <= 0.0:
            return first
    for n in range(order - 1):
        s[S_EVENT, n] = s[S_ER, n] * c[K_LO_INV] - (n + 1.0) * s[S_IR, n + 1]
    return min(first, _first_crossing(s, order - 2, h, TINY * c[K_LO_INV], 0))


@compiled
def _reach_bound(c: Array, m: Discrete, s: Array, bound: int, order: int, h: float) -> float:
    """When the regulator current meets an upper bound while ``e - R_o i_R`` pushes it outward."""
    _bound_event(c, s, bound, order)
    drop = _known_zeros(m[M_JUST], REACH_HIGH) if bound == m[M_BOUND] and m[M_CLAMP] == UNHELD else 0
    if drop > 0 and m[M_MODE] != ACTIVE and s[S_ER, 1] < 0.0:
        t = 0.0
    else:
        t = _first_crossing(s, order - 1, h, TINY * c[K_SC_IR], drop)
    if t > h or m[M_CLAMP] == HELD_HIGH or m[M_MODE] == ACTIVE:
        return t
    if value(s, S_ER, order - 1, t) > 0.0 and not (t == 0.0 and drop > 0):
        return t
    for n in range(order):
        s[S_EVENT, n] = -s[S_ER, n]
    if t == 0.0 and drop > 0:
        s[S_EVENT, 0] = 0.0
    later = _first_crossing(s, order - 1, h, TINY, 1 if t == 0.0 and drop > 0 else 0)
    if later > h or later < t:
        return np.inf
    a, b = bound_line(c, bound)
    over = value(s, S_IR, order, later) - a - b * value(s, S_VOUT, order - 1, later)
    return later if over > 0.0 else np.inf


@compiled
def _fold_change(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int]:
    """When the held current passes between the sloping and the far part of the fold-back."""
    a, b = bound_line(c, BOUND_FOLD)
    far, _ = bound_line(c, BOUND_FAR)
    if m[M_BOUND] == BOUND_CONSTANT:
        return np.inf, BOUND_CONSTANT
    sign = 1.0 if m[M_BOUND] == BOUND_FOLD else -1.0
    for n in range(order):
        s[S_EVENT, n] = sign * b * s[S_VOUT, n]
    s[S_EVENT, 0] += sign * (a - far)
    other = BOUND_FAR if m[M_BOUND] == BOUND_FOLD else BOUND_FOLD
    return _first_crossing(s, order - 1, h, TINY * c[K_SC_IR], 0), other


@compiled
def _clamp_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int, int]:
    """First event of the hold on the regulator current: time, event, and the bound it concerns."""
    clamp = m[M_CLAMP]
    event = NONE
    which = m[M_BOUND]
    tiny_i = TINY * c[K_SC_IR]
    if clamp == HELD_LOW or clamp == HELD_BOTH:
        sign = -1.0 if clamp == HELD_LOW else 1.0
        for n in range(order):
            s[S_EVENT, n] = sign * s[S_ER, n]
        s[S_EVENT, order] = 0.0
        t = _first_crossing(s, order - 1, h, TINY, 0)
        if t <= h:
            h = t
            event = LEAVE_LOW if clamp == HELD_LOW else PINNED_FALLS
        if clamp == HELD_BOTH:
            bound, _ = ruling_bound(c, s[S_VOUT, 0], m[M_BASE])
            a, b = bound_line(c, bound)
            for n in range(order):
                s[S_EVENT, n] = -b * s[S_VOUT, n]
            s[S_EVENT, 0] += c[K_IQ] - a
            t = _first_crossing(s, order - 1, h, tiny_i, 0)
            if t <= h:
                h, event, which = t, PINNED_RISES, bound
        return h, event, which
    top = order if clamp == UNHELD else order - 1
    move_i = _spread(s, S_IR, top, h)
    t = np.inf
    if s[S_IR, 0] - c[K_IQ] <= move_i:
        for n in range(order + 1):
            s[S_EVENT, n] = s[S_IR, n]
        s[S_EVENT, 0] -= c[K_IQ]
        t = _first_crossing(s, top, h, tiny_i, _known_zeros(m[M_JUST], REACH_LOW))
    if t <= h:
        h = t
        event = REACH_LOW if clamp == UNHELD else BOUND_BELOW
    if clamp == HELD_HIGH:
        t = _leave_high(c, m, s, order, h)
        if t <= h:
            h, event = t, LEAVE_HIGH
    if m[M_BASE] == 0:
        if clamp == UNHELD:
            t = _reach_bound(c, m, s, BOUND_OFF, order, h)
            if t <= h:
                h, event, which = t, REACH_HIGH, BOUND_OFF
        return h, event, which
    reach = REACH_HIGH if clamp == UNHELD else OTHER_BOUND
    limit = _limit_bound(c, s[S_VOUT, 0])
    move_v = _spread(s, S_VOUT, order - 1, h)
    for bound in range(BOUND_CONSTANT, BOUND_FAR + 1):
        if bound == BOUND_OFF or (clamp == HELD_HIGH and bound == m[M_BOUND]):
            continue
        if bound != BOUND_DRIVE and bound != limit and (c[K_FOLDS] == 0.0 or m[M_BOUND] == BOUND_DRIVE):
            continue
        if bound == BOUND_FAR and bound != limit:
            continue
        a, b = bound_line(c, bound)
        if a + b * s[S_VOUT, 0] - s[S_IR, 0] > move_i + abs(b) * move_v:
            continue
        t = _reach_bound(c, m, s, bound, order, h)
        if t <= h and (bound == BOUND_DRIVE or bound == limit or t > 0.0):
            h, event, which = t, reach, bound
    if clamp == HELD_HIGH and c[K_FOLDS] == 1.0 and m[M_BOUND] != BOUND_DRIVE:
        t, other = _fold_change(c, m, s, order, h)
        if t <= h:
            h, event, which = t, OTHER_BOUND, other
    return h, event, which


@compiled
def _base_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int]:
    event = NONE
    if m[M_BASE] == 0:
        if m[M_CLAMP] == UNHELD or m[M_CLAMP] == HELD_HIGH:
            top = order if m[M_CLAMP] == UNHELD else order - 1
            if c[K_IBE] - s[S_IR, 0] > _spread(s, S_IR, top, h):
                return h, event
            for n in range(order + 1):
                s[S_EVENT, n] = -s[S_IR, n]
            s[S_EVENT, 0] += c[K_IBE]
            t = _first_crossing(s, top, h, TINY * c[K_SC_IR], 0)
            if t <= h:
                h, event = t, BASE_ON
    elif m[M_MODE] == FREEWHEEL or m[M_MODE] == EMPTY:
        if s[S_Q, 0] > _spread(s, S_Q, order, h):
            return h, event
        for n in range(order + 1):
            s[S_EVENT, n] = s[S_Q, n]
        t = _first_crossing(s, order, h, TINY * c[K_SC_Q], _known_zeros(m[M_JUST], BASE_OFF))
        if t <= h:
            h, event = t, BASE_OFF
    return h, event


@compiled
def _choke_event(c: Array, m: Discrete, s: Array, order: int, h: float) -> float:
    if s[S_IL, 0] > _spread(s, S_IL, order, h):
        return np.inf
    for n in range(order + 1):
        s[S_EVENT, n] = s[S_IL, n]
    drop = _known_zeros(m[M_JUST], CHOKE_EMPTY) if s[S_IL, 0] == 0.0 else 0
    return _first_crossing(s, order, h, TINY * c[K_SC_I], drop)


@compiled
def _saturated_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int, float]:
    """Events of the saturated transistor and the decaying part of its charge."""
    decay = 0.0
    size = abs(s[S_Q, order]) / c[K_SC_Q]
    if size > 0.0 and h > math.exp(math.log(c[K_TOLERANCE] / size) / order):
        decay = _charge_by_exponential(c, s, order)
    event = NONE
    ratio = c[K_TAU] / c[K_BETA]
    most = s[S_IL, 0] + _spread(s, S_IL, order, h)
    least = s[S_Q, 0] + min(decay, decay * math.exp(-c[K_TAU_INV] * h)) - _spread(s, S_Q, order, h)
    if least > ratio * most * (1.0 + c[K_IK_INV] * most):
        t = _choke_event(c, m, s, order, h)
        return (t, CHOKE_EMPTY, decay) if t <= h else (h, NONE, decay)
    bent = 2.0 * c[K_IK_INV]
    for n in range(order + 1):
        total = 0.0
        if bent > 0.0:
            for j in range((n + 1) // 2):
                total += s[S_IL, j] * s[S_IL, n - j]
            if n % 2 == 0:
                total += 0.5 * s[S_IL, n // 2] ** 2
        s[S_EVENT, n] = s[S_Q, n] - ratio * (s[S_IL, n] + bent * total)
    drop = _known_zeros(m[M_JUST], CHARGE_SHORT)
    if decay == 0.0:
        t = _first_crossing(s, order, h, TINY * c[K_SC_Q], drop)
    else:
        t = _first_shortage(s, order, decay, c[K_TAU_INV], h, TINY * c[K_SC_Q], drop)
    if t <= h:
        h, event = t, CHARGE_SHORT
    t = _choke_event(c, m, s, order, h)
    if t <= h:
        h, event = t, CHOKE_EMPTY
    return h, event, decay


@compiled
def _freewheel_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int]:
    event = NONE
    t = _choke_event(c, m, s, order, h)
    if t <= h:
        h, event = t, CHOKE_EMPTY
    if m[M_BASE] == 1:
        for n in range(order):
            s[S_EVENT, n] = s[S_IL, n] - s[S_IAV, n]
        t = _first_crossing(s, order - 1, h, TINY * c[K_SC_I], _known_zeros(m[M_JUST], CHARGE_ENOUGH))
        if t <= h:
            h, event = t, CHARGE_ENOUGH
    return h, event


@compiled
def _active_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int]:
    event = NONE
    for n in range(order):
        s[S_EVENT, n] = -c[K_RCE] * s[S_IL, n] - s[S_VSW, n]
    s[S_EVENT, 0] += c[K_VIN] - c[K_VCE0]
    t = _first_crossing(s, order - 1, h, TINY, 0)
    if t <= h:
        h, event = t, TO_SATURATION
    for n in range(order):
        s[S_EVENT, n] = s[S_VSW, n]
    s[S_EVENT, 0] += c[K_VD0]
    t = _first_crossing(s, order - 1, h, TINY, 0)
    if t <= h:
        h, event = t, TO_FREEWHEEL
    t = _choke_event(c, m, s, order, h)
    if t <= h:
        h, event = t, CHOKE_EMPTY
    return h, event


@compiled
def _recovering_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int]:
    event = NONE
    for n in range(order + 1):
        s[S_EVENT, n] = -s[S_SWEPT, n]
    s[S_EVENT, 0] += c[K_QRR]
    t = _first_crossing(s, order, h, TINY * c[K_QRR], 0)
    if t <= h:
        h, event = t, SWEPT
    for n in range(order):
        s[S_EVENT, n] = s[S_IAV, n] - s[S_IL, n]
    t = _first_crossing(s, order - 1, h, TINY * c[K_SC_I], _known_zeros(m[M_JUST], RECOVERED_EARLY))
    if t <= h:
        h, event = t, RECOVERED_EARLY
    t = _choke_event(c, m, s, order, h)
    if t <= h:
        h, event = t, CHOKE_EMPTY
    return h, event


@compiled
def _node_event(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int]:
    """Empty choke, charged base: the transistor takes over once the output falls below the supply."""
    if m[M_BASE] == 0:
        return h, NONE
    for n in range(order):
        s[S_EVENT, n] = s[S_VOUT, n]
    s[S_EVENT, 0] -= c[K_VIN] - c[K_VCE0]
    t = _first_crossing(s, order - 1, h, TINY, 0)
    if t <= h:
        return t, NODE_FALLS
    return h, NONE


@compiled
def _load_event(m: Discrete, s: Array, order: int, h: float) -> float:
    """Time at which the output voltage leaves its segment of the load."""
    first = np.inf
    if m[M_LOAD] == 0 and s[S_VOUT, 0] - 0.5 > _spread(s, S_VOUT, order - 1, h):
        return first
    if m[M_LOAD] != 2:
        for n in range(order):
            s[S_EVENT, n] = s[S_VOUT, n]
        if m[M_LOAD] == 0:
            s[S_EVENT, 0] -= 0.5
        first = _first_crossing(s, order - 1, h, TINY, 0)
    if m[M_LOAD] != 0:
        for n in range(order):
            s[S_EVENT, n] = -s[S_VOUT, n]
        if m[M_LOAD] == 1:
            s[S_EVENT, 0] += 0.5
        first = min(first, _first_crossing(s, order - 1, h, TINY, 0))
    return first


@compiled
def advance(c: Array, x: Array, m: Discrete, s: Array, limit: float) -> tuple[float, int, int, float]:
    """Find the next step from ``x``: its length [s], the event at its end, its bound, the decaying charge [C].

    Leaves the coefficients of the step in ``s``; ``x`` is not changed.
    """
    order = ORDER
    # the state after an event meets the event's condition only to the accuracy of the last step
    s[S_KEYS, AT_LOOSENESS] = 1.0 if m[M_JUST] == NONE else AFTER_EVENT
    expand(c, x, m, s, order)
    h = _length(c, m, s, order, limit)
    h, event, which = _clamp_events(c, m, s, order, h)
    t, other = _base_events(c, m, s, order, h)
    if other != NONE:
        h, event = t, other
    decay = 0.0
    mode = m[M_MODE]
    other = NONE
    if mode == SATURATED:
        t, other, decay = _saturated_events(c, m, s, order, h)
    elif mode == FREEWHEEL:
        t, other = _freewheel_events(c, m, s, order, h)
    elif mode == ACTIVE:
        t, other = _active_events(c, m, s, order, h)
    elif mode == RECOVERING:
        t, other = _recovering_events(c, m, s, order, h)
    else:
        t, other = _node_event(c, m, s, order, h)
    if other != NONE:
        h, event = t, other
    t = _load_event(m, s, order, h)
    if t <= h:
        h, event = t, LOAD_SEGMENT
    return h, event, which, decay


@compiled
def available(c: Array, q: float) -> float:
    """Collector current that a stored charge can carry [A]."""
    flow = c[K_BETA] * c[K_TAU_INV] * q
    return 2.0 * flow / (1.0 + (1.0 + 4.0 * c[K_IK_INV] * flow) ** 0.5)


@compiled
def charge(c: Array, i: float) -> float:
    """Stored charge that carries a collector current [C]."""
    return c[K_TAU] / c[K_BETA] * i * (1.0 + c[K_IK_INV] * i)


@compiled
def move(c: Array, x: Array, m: Discrete, s: Array, h: float, decay: float) -> None:
    """Put the state at the end of the step into ``x``."""
    m[M_JUST] = NONE
    order = ORDER
    mode = m[M_MODE]
    if mode != EMPTY:
        x[X_IL] = value(s, S_IL, order, h)
    x[X_VC] = value(s, S_VC, order, h)
    if m[M_CLAMP] == UNHELD:
        x[X_IR] = value(s, S_IR, order, h)
    elif m[M_CLAMP] == HELD_HIGH:
        x[X_IR] = value(s, S_IR, order - 1, h)
    else:
        x[X_IR] = c[K_IQ]
    x[X_VH] = value(s, S_VH, order, h)
    if mode == ACTIVE:
        x[X_Q] = charge(c, x[X_IL])
    elif m[M_BASE] == 1:
        x[X_Q] = value(s, S_Q, order, h)
        if decay != 0.0:
            x[X_Q] += decay * math.exp(-c[K_TAU_INV] * h)
    if mode == RECOVERING:
        x[X_SWEPT] = value(s, S_SWEPT, order, h)


@compiled
def _rate_of_available(c: Array, x: Array) -> float:
    """``d i_av/dt`` [A/s]."""
    current = available(c, x[X_Q])
    charging = x[X_IR] - c[K_IBE] - x[X_Q] * c[K_TAU_INV]
    return c[K_BETA] * c[K_TAU_INV] / (1.0 + 2.0 * c[K_IK_INV] * current) * charging


@compiled
def _rate_of_choke(c: Array, x: Array, m: Discrete, s: Array, mode: int) -> float:
    """``d i_L/dt`` in a mode [A/s]."""
    before = m[M_MODE]
    m[M_MODE] = mode
    expand(c, x, m, s, 1)
    m[M_MODE] = before
    return s[S_IL, 1]


@compiled
def turn_on(c: Array, x: Array, m: Discrete, s: Array) -> None:
    """The charge has caught up with the choke current: recovering, saturated or active."""
    if c[K_QRR] > 0.0:
        rises = _rate_of_available(c, x) > _rate_of_choke(c, x, m, s, RECOVERING)
        m[M_MODE] = RECOVERING if rises else ACTIVE
        x[X_SWEPT] = 0.0
    elif _rate_of_available(c, x) > _rate_of_choke(c, x, m, s, SATURATED):
        m[M_MODE] = SATURATED
    else:
        m[M_MODE] = ACTIVE


@compiled
def _switch_events(c: Array, x: Array, m: Discrete, s: Array, event: int) -> None:
    """Changes of the switch mode."""
    if event == CHARGE_SHORT:
        x[X_Q] = charge(c, x[X_IL])
        falls = _rate_of_available(c, x) < _rate_of_choke(c, x, m, s, FREEWHEEL)
        m[M_MODE] = FREEWHEEL if falls else ACTIVE
    elif event == CHARGE_ENOUGH:
        x[X_Q] = charge(c, x[X_IL])
        turn_on(c, x, m, s)
    elif event == CHOKE_EMPTY:
        x[X_IL] = 0.0
        if m[M_MODE] == RECOVERING:
            return
        if m[M_MODE] == ACTIVE:
            x[X_Q] = 0.0
        if m[M_MODE] != SATURATED and x[X_IR] <= c[K_IBE]:
            x[X_Q] = 0.0
            m[M_BASE] = 0
        m[M_MODE] = EMPTY
    elif event == SWEPT or event == NODE_FALLS or event == TO_SATURATION:
        x[X_IL] = max(x[X_IL], 0.0)
        m[M_MODE] = SATURATED
    elif event == RECOVERED_EARLY or event == TO_FREEWHEEL:
        m[M_MODE] = FREEWHEEL


@compiled
def _base_changes(c: Array, x: Array, m: Discrete, s: Array, event: int) -> None:
    """The base begins or ceases to conduct."""
    if event == BASE_ON:
        m[M_BASE] = 1
        x[X_Q] = 0.0
        if m[M_CLAMP] == HELD_HIGH:
            m[M_BOUND] = BOUND_DRIVE
        else:
            x[X_IR] = c[K_IBE]
        if m[M_MODE] == EMPTY:
            expand(c, x, m, s, 1)
            if c[K_VIN] - c[K_VCE0] > s[S_VOUT, 0]:
                m[M_MODE] = ACTIVE
    else:
        m[M_BASE] = 0
        x[X_Q] = 0.0
        if m[M_CLAMP] == HELD_HIGH:
            m[M_CLAMP] = UNHELD


@compiled
def _clamp_changes(c: Array, x: Array, m: Discrete, s: Array, event: int, which: int) -> None:
    """The hold on the regulator current changes."""
    if event == LEAVE_LOW:
        _, bound = ruling_bound(c, s[S_VOUT, 0], m[M_BASE])
        m[M_CLAMP] = UNHELD if bound > c[K_IQ] else HELD_BOTH
    elif event == REACH_LOW or event == PINNED_FALLS:
        m[M_CLAMP] = HELD_LOW
        x[X_IR] = c[K_IQ]
    elif event == BOUND_BELOW:
        m[M_CLAMP] = HELD_BOTH
        x[X_IR] = c[K_IQ]
    elif event == LEAVE_HIGH:
        m[M_CLAMP] = UNHELD
    else:
        m[M_CLAMP] = HELD_HIGH
        m[M_BOUND] = which


@compiled
def segment_of(vout: float) -> int:
    """Segment of the load that an output voltage lies on."""
    if vout >= 0.5:
        return 0
    return 1 if vout >= 0.0 else 2


@compiled
def _next_segment(m: Discrete, s: Array, order: int, h: float) -> int:
    """The segment entered where the output voltage stands at the edge of its own."""
    v = value(s, S_VOUT, order - 1, h)
    slope = 0.0
    for n in range(order - 1, 0, -1):
        slope = slope * h + n * s[S_VOUT, n]
    edge = 0.5 if abs(v - 0.5) < abs(v) else 0.0
    rising = slope > 0.0
    if abs(v - edge) > 1e-9:
        return segment_of(v)
    if edge == 0.5:
        return 0 if rising else 1
    return 1 if rising else 2


@compiled
def _release(c: Array, x: Array, m: Discrete, s: Array, before: float) -> None:
    """A jump of the output at a change of mode that moves the bound outward frees the current; inward carries it."""
    if m[M_CLAMP] != HELD_HIGH:
        return
    expand(c, x, m, s, 1)
    if s[S_IR, 0] > before + 1e-12 * c[K_SC_IR]:
        m[M_CLAMP] = UNHELD
        x[X_IR] = before
    else:
        x[X_IR] = s[S_IR, 0]


@compiled
def change(c: Array, x: Array, m: Discrete, s: Array, event: int, which: int, h: float) -> bool:
    """Apply an event to the state; true where a cycle begins."""
    off = m[M_MODE] == FREEWHEEL or m[M_MODE] == EMPTY
    before = x[X_IR]
    if event == LOAD_SEGMENT:
        m[M_LOAD] = _next_segment(m, s, ORDER, h)
    elif event == BASE_ON or event == BASE_OFF:
        _base_changes(c, x, m, s, event)
    elif event <= PINNED_RISES:
        _clamp_changes(c, x, m, s, event, which)
    else:
        _switch_events(c, x, m, s, event)
        _release(c, x, m, s, before)
    m[M_JUST] = event
    return off and m[M_MODE] != FREEWHEEL and m[M_MODE] != EMPTY


@compiled
def classify(c: Array, x: Array, m: Discrete, s: Array) -> None:
    """Discrete state that belongs to a continuous state, deciding ties by derivatives."""
    x[X_IL] = max(x[X_IL], 0.0)
    x[X_Q] = max(x[X_Q], 0.0)
    x[X_IR] = max(x[X_IR], c[K_IQ])
    m[M_BASE] = 1 if x[X_Q] > 0.0 or x[X_IR] > c[K_IBE] else 0
    m[M_CLAMP] = UNHELD
    m[M_BOUND] = BOUND_DRIVE
    m[M_JUST] = NONE
    m[M_LOAD] = segment_of(x[X_VC])
    current = available(c, x[X_Q])
    gap = current - x[X_IL]
    if x[X_IL] == 0.0:
        m[M_MODE] = EMPTY
    elif abs(gap) <= 1e-12 * (x[X_IL] + current):
        if _rate_of_available(c, x) < _rate_of_choke(c, x, m, s, FREEWHEEL):
            m[M_MODE] = FREEWHEEL
        else:
            turn_on(c, x, m, s)
    else:
        m[M_MODE] = SATURATED if gap > 0.0 else FREEWHEEL
    expand(c, x, m, s, 1)
    m[M_LOAD] = segment_of(s[S_VOUT, 0])
    if m[M_MODE] == EMPTY and m[M_BASE] == 1 and c[K_VIN] - c[K_VCE0] > s[S_VOUT, 0]:
        m[M_MODE] = SATURATED if x[X_Q] > 0.0 else ACTIVE
        expand(c, x, m, s, 1)
    bound, limit = ruling_bound(c, s[S_VOUT, 0], m[M_BASE])
    if x[X_IR] <= c[K_IQ]:
        x[X_IR] = c[K_IQ]
        if s[S_ER, 0] <= 0.0:
            m[M_CLAMP] = HELD_LOW
        elif limit <= c[K_IQ]:
            m[M_CLAMP] = HELD_BOTH
    elif x[X_IR] >= limit:
        m[M_CLAMP] = HELD_HIGH
        m[M_BOUND] = bound
        expand(c, x, m, s, 1)
        x[X_IR] = max(s[S_IR, 0], c[K_IQ])
        if s[S_IR, 0] <= c[K_IQ]:
            m[M_CLAMP] = HELD_BOTH
