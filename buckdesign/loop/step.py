"""One step of the loop: expand, choose the length, find the first event."""

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
    Array,
    Discrete,
)  # fmt: skip
from .crossing import first_crossing, first_shortage, spread, value
from .taylor import SMALL_BIAS, bound_line, expand

TINY = 1e-13
AFTER_EVENT = 1e4
# error of the collector current that the charge can carry, over that of the states: what it does to them is small
LOOSER = 2e3

(
    NONE, LEAVE_LOW, REACH_LOW, REACH_HIGH, LEAVE_HIGH, OTHER_BOUND, BOUND_BELOW, PINNED_FALLS, PINNED_RISES,
    BASE_ON, BASE_OFF, CHARGE_SHORT, CHOKE_EMPTY, CHARGE_ENOUGH, SWEPT, RECOVERED_EARLY, TO_SATURATION, TO_FREEWHEEL,
    NODE_FALLS, LOAD_SEGMENT,
) = range(20)  # fmt: skip


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
    if c[K_IK_INV] > 0.0 and m[M_BASE] == 1 and (m[M_MODE] == FREEWHEEL or m[M_MODE] == RECOVERING):
        # the gain knee makes a root of the charge, which converges less far; with a rectifier of no slope nothing
        # else feels it but the accounts
        size = abs(s[S_IAV, order - 1]) / c[K_SC_I]
        if size > 0.0:
            h = min(h, math.exp(math.log(LOOSER * c[K_TOLERANCE] / size) / (order - 1)))
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
def limit_bound(c: Array, vout: float) -> int:
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
    limit = limit_bound(c, vout)
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
        first = first_crossing(s, order - 1, h, TINY, 0)
        if s[S_IR, 1] <= 0.0:
            return first
    for n in range(order - 1):
        s[S_EVENT, n] = s[S_ER, n] * c[K_LO_INV] - (n + 1.0) * s[S_IR, n + 1]
    return min(first, first_crossing(s, order - 2, h, TINY * c[K_LO_INV], 0))


@compiled
def _reach_bound(c: Array, m: Discrete, s: Array, bound: int, order: int, h: float) -> float:
    """When the regulator current meets an upper bound while ``e - R_o i_R`` pushes it outward."""
    _bound_event(c, s, bound, order)
    drop = _known_zeros(m[M_JUST], REACH_HIGH) if bound == m[M_BOUND] and m[M_CLAMP] == UNHELD else 0
    if drop > 0 and m[M_MODE] != ACTIVE and s[S_ER, 1] < 0.0:
        t = 0.0
    else:
        t = first_crossing(s, order - 1, h, TINY * c[K_SC_IR], drop)
    if t > h or m[M_CLAMP] == HELD_HIGH or m[M_MODE] == ACTIVE:
        return t
    if value(s, S_ER, order - 1, t) > 0.0 and not (t == 0.0 and drop > 0):
        return t
    for n in range(order):
        s[S_EVENT, n] = -s[S_ER, n]
    if t == 0.0 and drop > 0:
        s[S_EVENT, 0] = 0.0
    later = first_crossing(s, order - 1, h, TINY, 1 if t == 0.0 and drop > 0 else 0)
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
    return first_crossing(s, order - 1, h, TINY * c[K_SC_IR], 0), other


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
        t = first_crossing(s, order - 1, h, TINY, 0)
        if t <= h:
            h = t
            event = LEAVE_LOW if clamp == HELD_LOW else PINNED_FALLS
        if clamp == HELD_BOTH:
            bound, _ = ruling_bound(c, s[S_VOUT, 0], m[M_BASE])
            a, b = bound_line(c, bound)
            for n in range(order):
                s[S_EVENT, n] = -b * s[S_VOUT, n]
            s[S_EVENT, 0] += c[K_IQ] - a
            t = first_crossing(s, order - 1, h, tiny_i, 0)
            if t <= h:
                h, event, which = t, PINNED_RISES, bound
        return h, event, which
    top = order if clamp == UNHELD else order - 1
    move_i = spread(s, S_IR, top, h)
    t = np.inf
    if s[S_IR, 0] - c[K_IQ] <= move_i:
        for n in range(order + 1):
            s[S_EVENT, n] = s[S_IR, n]
        s[S_EVENT, 0] -= c[K_IQ]
        t = first_crossing(s, top, h, tiny_i, _known_zeros(m[M_JUST], REACH_LOW))
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
    limit = limit_bound(c, s[S_VOUT, 0])
    move_v = spread(s, S_VOUT, order - 1, h)
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
            if c[K_IBE] - s[S_IR, 0] > spread(s, S_IR, top, h):
                return h, event
            for n in range(order + 1):
                s[S_EVENT, n] = -s[S_IR, n]
            s[S_EVENT, 0] += c[K_IBE]
            t = first_crossing(s, top, h, TINY * c[K_SC_IR], 0)
            if t <= h:
                h, event = t, BASE_ON
    elif m[M_MODE] == FREEWHEEL or m[M_MODE] == EMPTY:
        if s[S_Q, 0] > spread(s, S_Q, order, h):
            return h, event
        for n in range(order + 1):
            s[S_EVENT, n] = s[S_Q, n]
        t = first_crossing(s, order, h, TINY * c[K_SC_Q], _known_zeros(m[M_JUST], BASE_OFF))
        if t <= h:
            h, event = t, BASE_OFF
    return h, event


@compiled
def _choke_event(c: Array, m: Discrete, s: Array, order: int, h: float) -> float:
    if s[S_IL, 0] > spread(s, S_IL, order, h):
        return np.inf
    for n in range(order + 1):
        s[S_EVENT, n] = s[S_IL, n]
    drop = _known_zeros(m[M_JUST], CHOKE_EMPTY) if s[S_IL, 0] == 0.0 else 0
    return first_crossing(s, order, h, TINY * c[K_SC_I], drop)


@compiled
def _saturated_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int, float]:
    """Events of the saturated transistor and the decaying part of its charge."""
    decay = 0.0
    size = abs(s[S_Q, order]) / c[K_SC_Q]
    if size > 0.0 and h > math.exp(math.log(c[K_TOLERANCE] / size) / order):
        decay = _charge_by_exponential(c, s, order)
    event = NONE
    ratio = c[K_TAU] / c[K_BETA]
    most = s[S_IL, 0] + spread(s, S_IL, order, h)
    least = s[S_Q, 0] + min(decay, decay * math.exp(-c[K_TAU_INV] * h)) - spread(s, S_Q, order, h)
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
        t = first_crossing(s, order, h, TINY * c[K_SC_Q], drop)
    else:
        t = first_shortage(s, order, decay, c[K_TAU_INV], h, TINY * c[K_SC_Q], drop)
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
        t = first_crossing(s, order - 1, h, TINY * c[K_SC_I], _known_zeros(m[M_JUST], CHARGE_ENOUGH))
        if t <= h:
            h, event = t, CHARGE_ENOUGH
    return h, event


@compiled
def _active_events(c: Array, m: Discrete, s: Array, order: int, h: float) -> tuple[float, int]:
    event = NONE
    for n in range(order):
        s[S_EVENT, n] = -c[K_RCE] * s[S_IL, n] - s[S_VSW, n]
    s[S_EVENT, 0] += c[K_VIN] - c[K_VCE0]
    t = first_crossing(s, order - 1, h, TINY, 0)
    if t <= h:
        h, event = t, TO_SATURATION
    for n in range(order):
        s[S_EVENT, n] = s[S_VSW, n]
    s[S_EVENT, 0] += c[K_VD0]
    t = first_crossing(s, order - 1, h, TINY, 0)
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
    t = first_crossing(s, order, h, TINY * c[K_QRR], 0)
    if t <= h:
        h, event = t, SWEPT
    for n in range(order):
        s[S_EVENT, n] = s[S_IAV, n] - s[S_IL, n]
    t = first_crossing(s, order - 1, h, TINY * c[K_SC_I], _known_zeros(m[M_JUST], RECOVERED_EARLY))
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
    t = first_crossing(s, order - 1, h, TINY, 0)
    if t <= h:
        return t, NODE_FALLS
    return h, NONE


@compiled
def _load_event(m: Discrete, s: Array, order: int, h: float) -> float:
    """Time at which the output voltage leaves its segment of the load."""
    first = np.inf
    if m[M_LOAD] == 0 and s[S_VOUT, 0] - 0.5 > spread(s, S_VOUT, order - 1, h):
        return first
    if m[M_LOAD] != 2:
        for n in range(order):
            s[S_EVENT, n] = s[S_VOUT, n]
        if m[M_LOAD] == 0:
            s[S_EVENT, 0] -= 0.5
        first = first_crossing(s, order - 1, h, TINY, 0)
    if m[M_LOAD] != 0:
        for n in range(order):
            s[S_EVENT, n] = -s[S_VOUT, n]
        if m[M_LOAD] == 1:
            s[S_EVENT, 0] += 0.5
        first = min(first, first_crossing(s, order - 1, h, TINY, 0))
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
