"""Moving along a step, and the changes of mode at its end."""

from __future__ import annotations

import math

from .compiling import compiled
from .constants import (
    ACTIVE,
    BOUND_DRIVE,
    EMPTY,
    FREEWHEEL,
    HELD_BOTH,
    HELD_HIGH,
    HELD_LOW,
    K_BETA,
    K_IBE,
    K_IK_INV,
    K_IQ,
    K_QRR,
    K_SC_IR,
    K_TAU,
    K_TAU_INV,
    K_VCE0,
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
    S_IL,
    S_IR,
    S_Q,
    S_SWEPT,
    S_VC,
    S_VH,
    S_VOUT,
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
from .crossing import value
from .step import (
    BASE_OFF,
    BASE_ON,
    BOUND_BELOW,
    CHARGE_ENOUGH,
    CHARGE_SHORT,
    CHOKE_EMPTY,
    LEAVE_HIGH,
    LEAVE_LOW,
    LOAD_SEGMENT,
    NODE_FALLS,
    NONE,
    PINNED_FALLS,
    PINNED_RISES,
    REACH_LOW,
    RECOVERED_EARLY,
    SWEPT,
    TO_FREEWHEEL,
    TO_SATURATION,
    ruling_bound,
)
from .taylor import expand


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
