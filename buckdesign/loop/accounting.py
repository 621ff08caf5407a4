"""Integrals over the steps of the loop: charges, energies, extremes and times.

Each step is integrated by Gauss-Legendre quadrature on its Taylor polynomials (eight nodes: exact to
degree 15), so that the accounts are as exact as the trajectory.
"""

from __future__ import annotations

import numpy as np

from .compiling import compiled
from .constants import (
    ACTIVE,
    EMPTY,
    FREEWHEEL,
    HELD_BOTH,
    HELD_HIGH,
    K_C_INV,
    K_ESR,
    K_EXP,
    K_I0_INV,
    K_L_INV,
    K_R1_INV,
    K_RBE,
    K_RDRIVE,
    K_RL,
    K_SELF,
    K_VBE,
    K_VIN,
    M_BASE,
    M_CLAMP,
    M_LOAD,
    M_MODE,
    ORDER,
    RECOVERING,
    S_FEED,
    S_IAV,
    S_IL,
    S_IR,
    S_VOUT,
    S_VSW,
    SATURATED,
    UNHELD,
    Array,
    Discrete,
)  # fmt: skip
from .step import value
from .taylor import load_line

(
    A_TIME, A_VOUT, A_IL, A_IL2, A_RATE2, A_IR, A_IR2, A_IC, A_IC2, A_ID, A_ID2, A_IN2, A_CAP2, A_INPUT, A_LOAD, A_COND,
    A_SWITCH, A_RECOVERY, A_BASE, A_DRIVE, A_REGULATOR, A_DIODE, A_COPPER, A_ESR, A_DIVIDER, A_HIGH, A_ACTIVE,
    A_CONDUCTS, A_BLOCKS, A_REVERSE, A_BASE_TIME, A_HELD, A_IDLE,
) = range(33)  # fmt: skip
(
    A_VOUT_MIN, A_VOUT_MAX, A_IL_MIN, A_IL_MAX, A_IR_MAX, A_IC_MAX, A_POWER_MAX, A_DIFFERENCE_MAX,
    A_ID_MAX, A_REVERSE_MAX,
) = range(33, 43)  # fmt: skip
A_CYCLES, A_PERIOD, A_PERIOD2, A_COMMUTATIONS = range(43, 47)
ACCOUNTS = 47

_nodes, _weights = np.polynomial.legendre.leggauss(8)
NODES = 0.5 * (_nodes + 1.0)
WEIGHTS = 0.5 * _weights


@compiled
def clear(a: Array) -> None:
    """Set the accounts, shape (ACCOUNTS,), to nothing."""
    a[:] = 0.0
    a[A_VOUT_MIN] = np.inf
    a[A_IL_MIN] = np.inf
    a[A_VOUT_MAX] = -np.inf
    a[A_IL_MAX] = -np.inf
    a[A_IR_MAX] = -np.inf
    a[A_DIFFERENCE_MAX] = -np.inf


@compiled
def _slope(s: Array, row: int, order: int, t: float) -> float:
    total = order * s[row, order]
    for n in range(order - 1, 0, -1):
        total = total * t + n * s[row, n]
    return total


@compiled
def _turning_point(s: Array, row: int, order: int, h: float) -> float:
    """Where a row has zero slope inside the step; -1 where its slope does not change sign."""
    left, right = 0.0, h
    f_left = _slope(s, row, order, 0.0)
    f_right = _slope(s, row, order, h)
    if f_left * f_right >= 0.0:
        return -1.0
    t = 0.5 * h
    side = 0
    for _ in range(40):
        t = (left * f_right - right * f_left) / (f_right - f_left)
        f = _slope(s, row, order, t)
        if f == 0.0 or right - left < 1e-9 * h:
            break
        if f * f_left > 0.0:
            left, f_left = t, f
            if side == 1:
                f_right *= 0.5
            side = 1
        else:
            right, f_right = t, f
            if side == -1:
                f_left *= 0.5
            side = -1
    return t


@compiled
def _extremes(a: Array, s: Array, ir_order: int, h: float) -> None:
    """Track the extremes of output voltage, choke current and regulator current over one step."""
    for row, order, low, high in (
        (S_VOUT, ORDER - 1, A_VOUT_MIN, A_VOUT_MAX),
        (S_IL, ORDER, A_IL_MIN, A_IL_MAX),
        (S_IR, ir_order, -1, A_IR_MAX),
    ):
        first = s[row, 0]
        last = value(s, row, order, h)
        turn = first
        t = _turning_point(s, row, order, h)
        if t > 0.0:
            turn = value(s, row, order, t)
        if low >= 0:
            a[low] = min(a[low], first, last, turn)
        a[high] = max(a[high], first, last, turn)


@compiled
def _time_high(s: Array, h: float) -> float:
    """Time of the step during which the switch node stands above the output."""
    order = ORDER - 1
    first = s[S_VSW, 0] - s[S_VOUT, 0]
    if abs(first) < 1e-12:
        first = s[S_VSW, 1] - s[S_VOUT, 1]
    last = value(s, S_VSW, order, h) - value(s, S_VOUT, order, h)
    if first > 0.0 and last > 0.0:
        return h
    if first <= 0.0 and last <= 0.0:
        return 0.0
    left, right = 0.0, h
    for _ in range(50):
        t = 0.5 * (left + right)
        if (value(s, S_VSW, order, t) - value(s, S_VOUT, order, t) > 0.0) == (first > 0.0):
            left = t
        else:
            right = t
    return left if first > 0.0 else h - left


@compiled
def account(c: Array, m: Discrete, s: Array, h: float, a: Array) -> None:
    """Add one step of length ``h``, whose coefficients stand in ``s``, to the accounts ``a``."""
    mode = m[M_MODE]
    base = m[M_BASE] == 1
    free = m[M_CLAMP] == UNHELD
    ir_order = ORDER if free else ORDER - 1
    load_a, load_b = load_line(c, m[M_LOAD])
    conducts = mode == SATURATED or mode == ACTIVE or (base and (mode == FREEWHEEL or mode == RECOVERING))
    for j in range(len(NODES)):
        t = h * NODES[j]
        w = h * WEIGHTS[j]
        il = value(s, S_IL, ORDER, t) if mode != EMPTY else 0.0
        ir = value(s, S_IR, ir_order, t)
        vout = value(s, S_VOUT, ORDER - 1, t)
        vsw = value(s, S_VSW, ORDER - 1, t)
        back = value(s, S_FEED, ORDER - 1, t)
        ic = 0.0
        if mode == SATURATED or mode == ACTIVE:
            ic = il
        elif base and mode != EMPTY:
            ic = value(s, S_IAV, ORDER - 1, t)
        current = il - ic
        idiv = (c[K_SELF] * vout - back) * c[K_R1_INV]
        load = load_a + load_b * vout
        icap = il + ir - load - idiv
        rate = _slope(s, S_IL, ORDER, t) if mode != EMPTY else 0.0
        a[A_VOUT] += w * vout
        a[A_IL] += w * il
        a[A_IL2] += w * il * il
        a[A_RATE2] += w * rate * rate
        a[A_IR] += w * ir
        a[A_IR2] += w * ir * ir
        a[A_IC] += w * ic
        a[A_IC2] += w * ic * ic
        a[A_IN2] += w * (ic + ir) ** 2
        a[A_CAP2] += w * icap * icap
        a[A_INPUT] += w * c[K_VIN] * (ic + ir)
        a[A_LOAD] += w * vout * load
        lost = (c[K_VIN] - vsw) * ic
        if mode == SATURATED:
            a[A_COND] += w * lost
        else:
            a[A_SWITCH] += w * lost
        if mode == RECOVERING:
            a[A_RECOVERY] += w * c[K_VIN] * (ic - il)
        if mode == FREEWHEEL:
            a[A_ID] += w * current
            a[A_ID2] += w * current * current
            a[A_DIODE] -= w * vsw * current
            a[A_ID_MAX] = max(a[A_ID_MAX], current)
        drop = c[K_VBE] if base else c[K_RBE] * ir
        across = c[K_VIN] - drop - c[K_RDRIVE] * ir - vout
        a[A_BASE] += w * drop * ir
        a[A_DRIVE] += w * c[K_RDRIVE] * ir * ir
        a[A_REGULATOR] += w * across * ir
        a[A_COPPER] += w * c[K_RL] * il * il
        a[A_ESR] += w * c[K_ESR] * icap * icap
        a[A_DIVIDER] += w * vout * idiv
        if vsw > 0.0:
            a[A_BLOCKS] += w
            a[A_REVERSE] += w * vsw
        a[A_IC_MAX] = max(a[A_IC_MAX], ic)
        a[A_POWER_MAX] = max(a[A_POWER_MAX], lost)
        a[A_DIFFERENCE_MAX] = max(a[A_DIFFERENCE_MAX], across)
        a[A_REVERSE_MAX] = max(a[A_REVERSE_MAX], vsw)
    a[A_TIME] += h
    if mode == SATURATED or mode == ACTIVE:
        a[A_HIGH] += _time_high(s, h)
    if mode == ACTIVE:
        a[A_ACTIVE] += h
    if conducts:
        a[A_CONDUCTS] += h
    if base:
        a[A_BASE_TIME] += h
    if m[M_CLAMP] == HELD_HIGH or m[M_CLAMP] == HELD_BOTH:
        a[A_HELD] += h
    if mode == EMPTY:
        a[A_IDLE] += h
    _extremes(a, s, ir_order, h)


@compiled
def _along_current(c: Array, low: float, high: float, energy: bool) -> float:
    """Integral of ``L(i)`` [V s] or of ``L(i) i`` [J] from ``low`` to ``high``."""
    if c[K_I0_INV] == 0.0:
        if energy:
            return 0.5 * (high * high - low * low) / c[K_L_INV]
        return (high - low) / c[K_L_INV]
    total = 0.0
    parts = 4
    width = (high - low) / parts
    for k in range(parts):
        for j in range(len(NODES)):
            i = max(low + width * (k + NODES[j]), 0.0)
            inductance = 1.0 / (c[K_L_INV] * (1.0 + (i * c[K_I0_INV]) ** c[K_EXP]))
            total += width * WEIGHTS[j] * (inductance * i if energy else inductance)
    return total


@compiled
def flux_linkage(c: Array, low: float, high: float) -> float:
    """Change of flux linkage of the choke between two currents [V s]."""
    return _along_current(c, low, high, False)


@compiled
def stored_energy(c: Array, x_from: Array, x_to: Array) -> float:
    """Change of the energy stored in choke and output capacitor between two states [J]."""
    v_from, v_to = x_from[1], x_to[1]
    return _along_current(c, x_from[0], x_to[0], True) + 0.5 * (v_to * v_to - v_from * v_from) / c[K_C_INV]
