"""Integrals over the steps of the loop: charges, energies, extremes and times.

Each step is integrated by Gauss-Legendre quadrature on its Taylor polynomials (four nodes, exact to degree 7: what
the products hold above that falls below 1e-7 within the length of a step), so that the accounts are about as exact
as the trajectory.
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
    K_G_INV,
    K_I0_INV,
    K_IADJ,
    K_L_INV,
    K_R1_INV,
    K_RBE,
    K_RCE,
    K_RD,
    K_RDRIVE,
    K_RH_INV,
    K_RHCH_INV,
    K_RL,
    K_SELF,
    K_VBE,
    K_VCE0,
    K_VD0,
    K_VIN,
    M_BASE,
    M_CLAMP,
    M_LOAD,
    M_MODE,
    ORDER,
    RECOVERING,
    S_IAV,
    S_IL,
    S_IR,
    S_VH,
    S_VOUT,
    S_VSW,
    SATURATED,
    UNHELD,
    Array,
    Discrete,
)  # fmt: skip
from .crossing import value
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

_nodes, _weights = np.polynomial.legendre.leggauss(4)
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
def _turning_point(s: Array, row: int, order: int, h: float, f_right: float) -> float:
    """Where a row has zero slope inside the step, to 1e-5 of its length (false position, Illinois rule)."""
    left, right = 0.0, h
    f_left = s[row, 1]
    t = 0.5 * h
    side = 0
    for _ in range(30):
        before = t
        t = (left * f_right - right * f_left) / (f_right - f_left)
        if abs(t - before) < 1e-5 * h:
            break
        f = _slope(s, row, order, t)
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
        slope = _slope(s, row, order, h)
        if slope * s[row, 1] < 0.0:
            turn = value(s, row, order, _turning_point(s, row, order, h, slope))
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
def _node_voltage(c: Array, s: Array, mode: int, il: float, iav: float, vout: float, t: float) -> float:
    if mode == SATURATED:
        return c[K_VIN] - c[K_VCE0] - c[K_RCE] * il
    if mode == FREEWHEEL:
        return -c[K_VD0] - c[K_RD] * (il - iav)
    if mode == EMPTY:
        return vout
    if mode == RECOVERING:
        return 0.0
    return value(s, S_VSW, ORDER - 1, t)


@compiled
def _peaks(c: Array, a: Array, mode: int, il: float, ic: float, vsw: float) -> None:
    """Largest currents of rectifier and collector, and largest power of the transistor."""
    if mode == FREEWHEEL:
        a[A_ID_MAX] = max(a[A_ID_MAX], il - ic)
    a[A_IC_MAX] = max(a[A_IC_MAX], ic)
    a[A_POWER_MAX] = max(a[A_POWER_MAX], (c[K_VIN] - vsw) * ic)


@compiled
def account(c: Array, m: Discrete, s: Array, h: float, a: Array) -> None:
    """Add one step of length ``h``, whose coefficients stand in ``s``, to the accounts ``a``."""
    mode = m[M_MODE]
    base = m[M_BASE] == 1
    ir_order = ORDER if m[M_CLAMP] == UNHELD else ORDER - 1
    load_a, load_b = load_line(c, m[M_LOAD])
    on = mode == SATURATED or mode == ACTIVE
    partly = base and (mode == FREEWHEEL or mode == RECOVERING)
    coupled = c[K_RHCH_INV] > 0.0
    biased = c[K_I0_INV] > 0.0
    sum_v = sum_il = sum_il2 = sum_rate2 = sum_ir = sum_ir2 = sum_ic = sum_ic2 = sum_id = sum_id2 = 0.0
    sum_cap2 = sum_load = sum_lost = sum_drop = sum_across = sum_divider = sum_node = sum_diode = sum_both = 0.0
    for j in range(len(NODES)):
        t = h * NODES[j]
        w = h * WEIGHTS[j]
        il = value(s, S_IL, ORDER, t) if mode != EMPTY else 0.0
        ir = value(s, S_IR, ir_order, t)
        vout = value(s, S_VOUT, ORDER - 1, t)
        ic = il if on else 0.0
        if partly:
            ic = value(s, S_IAV, ORDER - 1, t)
        vsw = _node_voltage(c, s, mode, il, ic, vout, t)
        vh = value(s, S_VH, ORDER, t) if coupled else 0.0
        back = ((vsw - vh) * c[K_RH_INV] + c[K_IADJ]) * c[K_G_INV]
        idiv = (c[K_SELF] * vout - back) * c[K_R1_INV]
        load = load_a + load_b * vout
        icap = il + ir - load - idiv
        if biased:
            rate = _slope(s, S_IL, ORDER, t)
        else:
            rate = (vsw - vout - c[K_RL] * il) * c[K_L_INV]
        drop = c[K_VBE] if base else c[K_RBE] * ir
        across = c[K_VIN] - drop - c[K_RDRIVE] * ir - vout
        lost = (c[K_VIN] - vsw) * ic
        sum_v += w * vout
        sum_il += w * il
        sum_il2 += w * il * il
        sum_rate2 += w * rate * rate
        sum_ir += w * ir
        sum_ir2 += w * ir * ir
        sum_ic += w * ic
        sum_ic2 += w * ic * ic
        sum_both += w * ic * ir
        sum_cap2 += w * icap * icap
        sum_load += w * vout * load
        sum_lost += w * lost
        sum_drop += w * drop * ir
        sum_across += w * across * ir
        sum_divider += w * vout * idiv
        sum_node += w * vsw
        if mode == FREEWHEEL:
            current = il - ic
            sum_id += w * current
            sum_id2 += w * current * current
            sum_diode -= w * vsw * current
        _peaks(c, a, mode, il, ic, vsw)
        a[A_DIFFERENCE_MAX] = max(a[A_DIFFERENCE_MAX], across)
        a[A_REVERSE_MAX] = max(a[A_REVERSE_MAX], vsw)
    for t in (0.0, h):
        il = value(s, S_IL, ORDER, t) if mode != EMPTY else 0.0
        ic = il if on else (value(s, S_IAV, ORDER - 1, t) if partly else 0.0)
        _peaks(c, a, mode, il, ic, _node_voltage(c, s, mode, il, ic, value(s, S_VOUT, ORDER - 1, t), t))
    a[A_VOUT] += sum_v
    a[A_IL] += sum_il
    a[A_IL2] += sum_il2
    a[A_RATE2] += sum_rate2 if mode != EMPTY else 0.0
    a[A_IR] += sum_ir
    a[A_IR2] += sum_ir2
    a[A_IC] += sum_ic
    a[A_IC2] += sum_ic2
    a[A_IN2] += sum_ic2 + 2.0 * sum_both + sum_ir2
    a[A_CAP2] += sum_cap2
    a[A_INPUT] += c[K_VIN] * (sum_ic + sum_ir)
    a[A_LOAD] += sum_load
    a[A_BASE] += sum_drop
    a[A_DRIVE] += c[K_RDRIVE] * sum_ir2
    a[A_REGULATOR] += sum_across
    a[A_COPPER] += c[K_RL] * sum_il2
    a[A_ESR] += c[K_ESR] * sum_cap2
    a[A_DIVIDER] += sum_divider
    a[A_ID] += sum_id
    a[A_ID2] += sum_id2
    a[A_DIODE] += sum_diode
    a[A_COND if mode == SATURATED else A_SWITCH] += sum_lost
    if mode == RECOVERING:
        a[A_RECOVERY] += c[K_VIN] * (sum_ic - sum_il)
    if mode == SATURATED or mode == ACTIVE or mode == EMPTY:
        a[A_BLOCKS] += h
        a[A_REVERSE] += sum_node
    _times(a, m, s, h)
    _extremes(a, s, ir_order, h)


@compiled
def _times(a: Array, m: Discrete, s: Array, h: float) -> None:
    """Book the step's length under the states that it was spent in."""
    mode = m[M_MODE]
    base = m[M_BASE] == 1
    a[A_TIME] += h
    if mode == SATURATED or mode == ACTIVE:
        a[A_HIGH] += _time_high(s, h)
    if mode == ACTIVE:
        a[A_ACTIVE] += h
    if mode == SATURATED or mode == ACTIVE or (base and mode != EMPTY):
        a[A_CONDUCTS] += h
    if base:
        a[A_BASE_TIME] += h
    if m[M_CLAMP] == HELD_HIGH or m[M_CLAMP] == HELD_BOTH:
        a[A_HELD] += h
    if mode == EMPTY:
        a[A_IDLE] += h


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
