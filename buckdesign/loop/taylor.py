"""Taylor coefficients of the loop's states over one step, mode by mode.

Between events the loop is a smooth system, linear but for the gain knee and the inductance. Its
Taylor coefficients follow order by order from the equations of motion (recurrences for products,
powers and roots: Griewank & Walther, Evaluating Derivatives, 2nd ed. 2008, ch. 13), so that a step of
order 14 costs about as much as three evaluations of the right-hand side cost elsewhere and every
event function is a polynomial in time.
"""

from __future__ import annotations

import numpy as np

from .compiling import compiled
from .constants import (
    ACTIVE,
    BOUND_DRIVE,
    BOUND_FAR,
    BOUND_FOLD,
    BOUND_OFF,
    EMPTY,
    FREEWHEEL,
    HELD_HIGH,
    INVERSE,
    K_BETA,
    K_C_INV,
    K_ESR,
    K_EXP,
    K_FOLD_A,
    K_FOLD_B,
    K_G_INV,
    K_GLOAD,
    K_I0_INV,
    K_IADJ,
    K_IBE,
    K_IFAR,
    K_IK_INV,
    K_ILIM,
    K_ILOAD,
    K_IQ,
    K_L_INV,
    K_LO_INV,
    K_OFF_A,
    K_OFF_B,
    K_ON_A,
    K_ON_B,
    K_R1_INV,
    K_R1G,
    K_RCE,
    K_RD,
    K_RH_INV,
    K_RHCH_INV,
    K_RL,
    K_RO,
    K_SELF,
    K_TAU,
    K_TAU_INV,
    K_VCE0,
    K_VD0,
    K_VIN,
    K_VREF,
    M_BASE,
    M_BOUND,
    M_CLAMP,
    M_LOAD,
    M_MODE,
    RECOVERING,
    S_DRIVE,
    S_ER,
    S_IAV,
    S_IL,
    S_INDUCT,
    S_INVERSE,
    S_IR,
    S_KEYS,
    S_LINEAR,
    S_POWER,
    S_Q,
    S_RATE,
    S_ROOT,
    S_SLOPE,
    S_SQUARE,
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

# below this share of the bias current the inductance is taken as unbiased for one step: (1e-5) ** 1.3 < 4e-7
SMALL_BIAS = 1e-5


@compiled
def bound_line(c: Array, bound: int) -> tuple[float, float]:
    """The line ``i_R = a + b v_out`` of an upper bound: a [A], b [S]."""
    if bound == BOUND_DRIVE:
        return c[K_ON_A], c[K_ON_B]
    if bound == BOUND_OFF:
        return c[K_OFF_A], c[K_OFF_B]
    if bound == BOUND_FOLD:
        return c[K_FOLD_A], c[K_FOLD_B]
    if bound == BOUND_FAR:
        return c[K_IFAR], 0.0
    return c[K_ILIM], 0.0


@compiled
def load_line(c: Array, segment: int) -> tuple[float, float]:
    """The load as ``i = a + b v_out`` on a segment of the output voltage: a [A], b [S]."""
    if segment == 0:
        return c[K_ILOAD], c[K_GLOAD]
    if segment == 1:
        return 0.0, c[K_GLOAD] + 2.0 * c[K_ILOAD]
    return 0.0, c[K_GLOAD]


@compiled
def _inverse_inductance(c: Array, s: Array, n: int) -> None:
    """Order ``n`` of ``1/L = (1 + (i/I_0)^p) / L_0`` (power recurrence)."""
    base = s[S_IL, 0] * c[K_I0_INV]
    if base <= SMALL_BIAS:
        s[S_POWER, n] = 0.0
    elif n == 0:
        s[S_POWER, 0] = base ** c[K_EXP]
    else:
        total = 0.0
        for j in range(1, n + 1):
            total += ((c[K_EXP] + 1.0) * j - n) * s[S_IL, j] * s[S_POWER, n - j]
        s[S_POWER, n] = total / (n * s[S_IL, 0])
    s[S_INVERSE, n] = c[K_L_INV] * s[S_POWER, n]
    if n == 0:
        s[S_INVERSE, 0] += c[K_L_INV]


@compiled
def square(s: Array, n: int) -> None:
    """Order ``n`` of the square of the choke current."""
    total = 0.0
    for j in range((n + 1) // 2):
        total += s[S_IL, j] * s[S_IL, n - j]
    total *= 2.0
    if n % 2 == 0:
        total += s[S_IL, n // 2] ** 2
    s[S_SQUARE, n] = total


@compiled
def _relate(c: Array, m: Discrete, inputs: Array, out: Array) -> None:
    """The linear relations of a passive mode for one set of inputs.

    ``inputs``: i_L, v_C, i_R, v_H, i_av, 1. ``out``: choke voltage [V], dv_C/dt, di_R/dt (or i_R itself where it is
    held), dv_H/dt, v_out, v_sw, ``e - R_o i_R``.
    """
    mode = m[M_MODE]
    il, vc, ir, vh, iav, one = inputs[0], inputs[1], inputs[2], inputs[3], inputs[4], inputs[5]
    load_a, load_b = load_line(c, m[M_LOAD])
    free = m[M_CLAMP] == UNHELD
    held_a = c[K_IQ]
    held_b = 0.0
    if m[M_CLAMP] == HELD_HIGH:
        held_a, held_b = bound_line(c, m[M_BOUND])
    esr = c[K_ESR]
    feed = esr * c[K_R1G] * c[K_RH_INV]
    divisor = 1.0 + esr * (load_b + c[K_SELF] * c[K_R1_INV])
    known = vc + esr * il - feed * vh + one * esr * (c[K_IADJ] * c[K_R1G] - load_a)
    vsw = 0.0
    if mode == SATURATED:
        vsw = one * (c[K_VIN] - c[K_VCE0]) - c[K_RCE] * il
    elif mode == FREEWHEEL:
        vsw = -one * c[K_VD0] - c[K_RD] * (il - iav)
    elif mode == EMPTY:
        divisor -= feed
    known += feed * vsw
    if free:
        vout = (known + esr * ir) / divisor
    else:
        vout = (known + one * esr * held_a) / (divisor - esr * held_b)
        ir = one * held_a + held_b * vout
    if mode == EMPTY:
        vsw = vout
    back = ((vsw - vh) * c[K_RH_INV] + one * c[K_IADJ]) * c[K_G_INV]
    rest = one * c[K_VREF] - c[K_SELF] * vout + back - c[K_RO] * ir
    out[0] = 0.0 if mode == EMPTY else vsw - vout - c[K_RL] * il
    out[1] = (il + ir - one * load_a - load_b * vout - (c[K_SELF] * vout - back) * c[K_R1_INV]) * c[K_C_INV]
    out[2] = rest * c[K_LO_INV] if free else ir
    out[3] = (vsw - vh - vout * (1.0 - c[K_SELF]) - back) * c[K_RHCH_INV]
    out[4] = vout
    out[5] = vsw
    out[6] = rest


@compiled
def _linear_relations(c: Array, m: Discrete, s: Array) -> int:
    """Row of ``s`` from which the relations of a discrete state stand, worked out on their first use.

    Seven relations of six inputs each, one after the other, over three rows.
    """
    hold = 0 if m[M_CLAMP] == UNHELD else (2 if m[M_CLAMP] == HELD_HIGH else 1)
    slot = 3 * m[M_MODE] + hold
    key = 1.0 + m[M_BOUND] * hold + 8.0 * m[M_LOAD]
    row = S_LINEAR + 3 * slot
    if s[S_KEYS, slot] == key:
        return row
    s[S_KEYS, slot] = key
    inputs = np.zeros(6)
    out = np.empty(7)
    for k in range(6):
        inputs[:] = 0.0
        inputs[k] = 1.0
        _relate(c, m, inputs, out)
        for i in range(7):
            place = 6 * i + k
            s[row + place // 14, place % 14] = out[i]
    return row


@compiled
def _passive_orders(c: Array, m: Discrete, s: Array, order: int) -> None:
    """All orders in the modes saturated, freewheel, recovering and empty."""
    mode = m[M_MODE]
    base = m[M_BASE] == 1
    free = m[M_CLAMP] == UNHELD
    # a choke that runs empty while the rectifier recovers stays empty, the node at 0 V
    still = mode == EMPTY or (mode == RECOVERING and s[S_IL, 0] == 0.0)
    biased = c[K_I0_INV] > 0.0 and not still
    needs_iav = base and (mode == FREEWHEEL or mode == RECOVERING)
    row = _linear_relations(c, m, s)
    l_l, l_c, l_r, l_h, l_a, l_1 = s[row, 0], s[row, 1], s[row, 2], s[row, 3], s[row, 4], s[row, 5]
    c_l, c_c, c_r, c_h, c_a, c_1 = s[row, 6], s[row, 7], s[row, 8], s[row, 9], s[row, 10], s[row, 11]
    r_l, r_c = s[row, 12], s[row, 13]
    r_r, r_h, r_a, r_1 = s[row + 1, 0], s[row + 1, 1], s[row + 1, 2], s[row + 1, 3]
    h_l, h_c, h_r, h_h, h_a, h_1 = (
        s[row + 1, 4],
        s[row + 1, 5],
        s[row + 1, 6],
        s[row + 1, 7],
        s[row + 1, 8],
        s[row + 1, 9],
    )
    tau = c[K_TAU_INV]
    il, vc, ir, q, vh, iav = s[S_IL, 0], s[S_VC, 0], s[S_IR, 0], s[S_Q, 0], s[S_VH, 0], 0.0
    if not free:
        ir = 0.0
    lift = 0.0 if still else (1.0 if biased else c[K_L_INV])
    l_l, l_c, l_r, l_h, l_a, l_1 = lift * l_l, lift * l_c, lift * l_r, lift * l_h, lift * l_a, lift * l_1
    bias = c[K_IBE]
    lift_q = c[K_BETA] * c[K_TAU_INV]
    knee = c[K_IK_INV]
    over_knee = 0.5 / knee if knee > 0.0 else 0.0
    root = 0.0
    for n in range(order):
        over = INVERSE[n]
        if needs_iav:
            # i (1 + i/I_K) = beta q / tau, by the recurrence of the square root; written out here for speed
            iav = lift_q * q
            if knee > 0.0 and n == 0:
                root = (1.0 + 4.0 * knee * iav) ** 0.5
                s[S_ROOT, 0] = root
                root = 0.5 / root
                iav = 4.0 * iav * root / (1.0 + 2.0 * root)
            elif knee > 0.0:
                total = 0.0
                for j in range(1, (n + 1) // 2):
                    total += s[S_ROOT, j] * s[S_ROOT, n - j]
                total = 4.0 * knee * iav - 2.0 * total
                if n % 2 == 0:
                    total -= s[S_ROOT, n // 2] ** 2
                total *= root
                s[S_ROOT, n] = total
                iav = total * over_knee
            s[S_IAV, n] = iav
        drive = (l_l * il + l_c * vc) + (l_r * ir + l_h * vh) + (l_a * iav + l_1)
        slope_c = (c_l * il + c_c * vc) + (c_r * ir + c_h * vh) + (c_a * iav + c_1)
        slope_r = (r_l * il + r_c * vc) + (r_r * ir + r_h * vh) + (r_a * iav + r_1)
        slope_h = (h_l * il + h_c * vc) + (h_r * ir + h_h * vh) + (h_a * iav + h_1)
        if mode == RECOVERING:
            s[S_SWEPT, n + 1] = (iav - il) * over
        if free:
            charging = ir - q * tau - bias
            ir = slope_r * over
            s[S_IR, n + 1] = ir
        else:
            s[S_IR, n] = slope_r
            charging = slope_r - q * tau - bias
        vc = slope_c * over
        s[S_VC, n + 1] = vc
        vh = slope_h * over
        s[S_VH, n + 1] = vh
        if base:
            q = charging * over
            s[S_Q, n + 1] = q
        if biased:
            s[S_DRIVE, n] = drive
            _inverse_inductance(c, s, n)
            total = 0.0
            for j in range(n + 1):
                total += s[S_INVERSE, j] * s[S_DRIVE, n - j]
            il = total * over
        else:
            il = drive * over
        s[S_IL, n + 1] = il
        l_1, c_1, r_1, h_1, bias = 0.0, 0.0, 0.0, 0.0, 0.0
    _outputs(s, row, order, free, needs_iav)


@compiled
def _outputs(s: Array, row: int, order: int, free: bool, needs_iav: bool) -> None:
    """Orders of output voltage, switch node and error from those of the states."""
    o_l, o_c, o_r, o_h = s[row + 1, 10], s[row + 1, 11], s[row + 1, 12], s[row + 1, 13]
    o_a, o_1 = s[row + 2, 0], s[row + 2, 1]
    n_l, n_c, n_r, n_h, n_a, n_1 = (
        s[row + 2, 2],
        s[row + 2, 3],
        s[row + 2, 4],
        s[row + 2, 5],
        s[row + 2, 6],
        s[row + 2, 7],
    )
    e_l, e_c, e_r, e_h, e_a, e_1 = (
        s[row + 2, 8],
        s[row + 2, 9],
        s[row + 2, 10],
        s[row + 2, 11],
        s[row + 2, 12],
        s[row + 2, 13],
    )
    if not free:
        # the relations of a held current hold it already
        o_r, n_r, e_r = 0.0, 0.0, 0.0
    for n in range(order):
        il, vc, ir, vh = s[S_IL, n], s[S_VC, n], s[S_IR, n], s[S_VH, n]
        s[S_VOUT, n] = o_l * il + o_c * vc + o_r * ir + o_h * vh
        s[S_VSW, n] = n_l * il + n_c * vc + n_r * ir + n_h * vh
        s[S_ER, n] = e_l * il + e_c * vc + e_r * ir + e_h * vh
    if needs_iav:
        for n in range(order):
            s[S_VOUT, n] += o_a * s[S_IAV, n]
            s[S_VSW, n] += n_a * s[S_IAV, n]
            s[S_ER, n] += e_a * s[S_IAV, n]
    s[S_VOUT, 0] += o_1
    s[S_VSW, 0] += n_1
    s[S_ER, 0] += e_1


@compiled
def _slope_of_gain(c: Array, s: Array, n: int) -> None:
    """Order ``n`` of ``di_av/dq = (beta/tau) / (1 + 2 i/I_K)`` (quotient recurrence)."""
    if n == 0:
        s[S_SLOPE, 0] = c[K_BETA] * c[K_TAU_INV] / (1.0 + 2.0 * c[K_IK_INV] * s[S_IL, 0])
        return
    total = 0.0
    if c[K_IK_INV] > 0.0:
        for j in range(1, n + 1):
            total += s[S_IL, j] * s[S_SLOPE, n - j]
        total *= -2.0 * c[K_IK_INV] / (1.0 + 2.0 * c[K_IK_INV] * s[S_IL, 0])
    s[S_SLOPE, n] = total


@compiled
def _inductance(c: Array, s: Array, n: int) -> None:
    """Order ``n`` of the incremental inductance, the reciprocal of its inverse."""
    if c[K_I0_INV] == 0.0:
        s[S_INDUCT, n] = 1.0 / c[K_L_INV] if n == 0 else 0.0
        return
    _inverse_inductance(c, s, n)
    if n == 0:
        s[S_INDUCT, 0] = 1.0 / s[S_INVERSE, 0]
        return
    total = 0.0
    for j in range(1, n + 1):
        total += s[S_INVERSE, j] * s[S_INDUCT, n - j]
    s[S_INDUCT, n] = -total / s[S_INVERSE, 0]


@compiled
def _active_orders(c: Array, m: Discrete, s: Array, order: int) -> None:
    """All orders in the active mode, where the charge is tied to the choke current."""
    free = m[M_CLAMP] == UNHELD
    load_a, load_b = load_line(c, m[M_LOAD])
    held_a = c[K_IQ]
    held_b = 0.0
    if m[M_CLAMP] == HELD_HIGH:
        held_a, held_b = bound_line(c, m[M_BOUND])
    esr = c[K_ESR]
    feed = esr * c[K_R1G] * c[K_RH_INV]
    coupled = c[K_RHCH_INV] > 0.0
    scale = 1.0
    lead = 0.0
    for n in range(order):
        first = 1.0 if n == 0 else 0.0
        over = 1.0 / (n + 1.0)
        il = s[S_IL, n]
        square(s, n)
        s[S_Q, n] = c[K_TAU] / c[K_BETA] * (il + c[K_IK_INV] * s[S_SQUARE, n])
        _slope_of_gain(c, s, n)
        _inductance(c, s, n)
        if n == 0:
            lead = s[S_INDUCT, 0] * s[S_SLOPE, 0]
            divisor = 1.0 + esr * (load_b + c[K_SELF] * c[K_R1_INV]) - feed
            if not free:
                divisor -= (esr + feed * lead) * held_b
            scale = 1.0 / divisor
        # S_DRIVE holds the charging current of the base, S_RATE the slope of the choke current
        charging = -first * c[K_IBE] - s[S_Q, n] * c[K_TAU_INV]
        charging += s[S_IR, n] if free else first * held_a
        s[S_DRIVE, n] = charging
        rate = 0.0
        for j in range(n + 1):
            rate += s[S_SLOPE, j] * s[S_DRIVE, n - j]
        s[S_RATE, n] = rate
        induced = 0.0
        for j in range(n + 1):
            induced += s[S_INDUCT, j] * s[S_RATE, n - j]
        vc = s[S_VC, n]
        vh = s[S_VH, n]
        known = vc + esr * il + feed * (c[K_RL] * il + induced - vh)
        known += first * esr * (c[K_IADJ] * c[K_R1G] - load_a)
        if free:
            ir = s[S_IR, n]
            vout = (known + esr * ir) * scale
        else:
            vout = (known + first * esr * held_a) * scale
            ir = first * held_a + held_b * vout
            s[S_IR, n] = ir
            s[S_DRIVE, n] += held_b * vout
            s[S_RATE, n] += s[S_SLOPE, 0] * held_b * vout
            induced += lead * held_b * vout
        vsw = vout + c[K_RL] * il + induced
        s[S_VOUT, n] = vout
        s[S_VSW, n] = vsw
        s[S_IL, n + 1] = s[S_RATE, n] * over
        back = ((vsw - vh) * c[K_RH_INV] + first * c[K_IADJ]) * c[K_G_INV]
        rest = first * c[K_VREF] - c[K_SELF] * vout + back - c[K_RO] * ir
        s[S_ER, n] = rest
        if free:
            s[S_IR, n + 1] = rest * c[K_LO_INV] * over
        icap = il + ir - first * load_a - load_b * vout - (c[K_SELF] * vout - back) * c[K_R1_INV]
        s[S_VC, n + 1] = icap * c[K_C_INV] * over
        if coupled:
            s[S_VH, n + 1] = (vsw - vh - vout * (1.0 - c[K_SELF]) - back) * c[K_RHCH_INV] * over


@compiled
def expand(c: Array, x: Array, m: Discrete, s: Array, order: int) -> None:
    """Taylor coefficients of all states (orders 0..order) and algebraic quantities (0..order-1) at ``x``."""
    s[S_IL, 0] = x[X_IL]
    s[S_VC, 0] = x[X_VC]
    s[S_IR, 0] = x[X_IR]
    s[S_Q, 0] = x[X_Q]
    s[S_VH, 0] = x[X_VH]
    s[S_SWEPT, 0] = x[X_SWEPT]
    for row in (S_IL, S_IR, S_Q, S_VH, S_SWEPT):
        for n in range(1, order + 1):
            s[row, n] = 0.0
    if m[M_MODE] == ACTIVE:
        _active_orders(c, m, s, order)
    else:
        _passive_orders(c, m, s, order)
    if m[M_MODE] == ACTIVE:
        square(s, order)
        s[S_Q, order] = c[K_TAU] / c[K_BETA] * (s[S_IL, order] + c[K_IK_INV] * s[S_SQUARE, order])
