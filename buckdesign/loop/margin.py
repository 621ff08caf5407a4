"""Whether the loop starts to oscillate by itself: the margin of its static solution."""

from __future__ import annotations

import numpy as np

from .compiling import compiled
from .constants import (
    K_BETA,
    K_C_INV,
    K_ESR,
    K_EXP,
    K_G_INV,
    K_GLOAD,
    K_I0_INV,
    K_IBE,
    K_IK_INV,
    K_L_INV,
    K_LO_INV,
    K_R1_INV,
    K_R1G,
    K_RH_INV,
    K_RHCH_INV,
    K_RL,
    K_RO,
    K_SELF,
    K_TAU,
    K_VREF,
    K_VSET,
    P_ILOAD,
    P_LO,
    P_RLOAD,
    Array,
)  # fmt: skip


@compiled
def static_current(row: Array, c: Array) -> float:
    """Collector current of the static solution, transistor active [A]; 0 where the base does not conduct."""
    need = row[P_ILOAD] + c[K_VSET] / row[P_RLOAD] + c[K_VREF] * c[K_R1_INV]
    if need <= c[K_IBE]:
        return 0.0
    # i_C + I_BE + i_C (1 + i_C/I_K) / beta = need
    quadratic = c[K_IK_INV] / c[K_BETA]
    linear = 1.0 + 1.0 / c[K_BETA]
    rest = need - c[K_IBE]
    return 2.0 * rest / (linear + (linear * linear + 4.0 * quadratic * rest) ** 0.5)


@compiled
def _characteristic(a: Array, p: Array) -> None:
    """Coefficients of the characteristic polynomial of a 4 x 4 matrix, highest power first (Faddeev-LeVerrier)."""
    n = 4
    p[0] = 1.0
    work = np.zeros((n, n))
    product = np.zeros((n, n))
    for k in range(1, n + 1):
        for i in range(n):
            work[i, i] += p[k - 1]
        for i in range(n):
            for j in range(n):
                total = 0.0
                for m in range(n):
                    total += a[i, m] * work[m, j]
                product[i, j] = total
        trace = 0.0
        for i in range(n):
            trace += product[i, i]
            for j in range(n):
                work[i, j] = product[i, j]
        p[k] = -trace / k


@compiled
def _unstable(without: Array, whole: Array, share: float) -> bool:
    """Whether the active mode with a ``share`` of the feedback has an eigenvalue of positive real part (Hurwitz).

    The feedback stands in one row of the Jacobian, so that the coefficients are straight lines in its share.
    """
    p_1 = without[1] + share * (whole[1] - without[1])
    p_2 = without[2] + share * (whole[2] - without[2])
    p_3 = without[3] + share * (whole[3] - without[3])
    p_4 = without[4] + share * (whole[4] - without[4])
    if p_1 <= 0.0 or p_2 <= 0.0 or p_3 <= 0.0 or p_4 <= 0.0:
        return True
    return not (p_1 * p_2 * p_3 > p_3 * p_3 + p_1 * p_1 * p_4)


@compiled
def active_jacobian(c: Array, current: float, gain: float, inductance: float, share: float) -> Array:
    """Jacobian of the active mode about the static solution, time in units of the charge time.

    Parameters: collector current [A], gain there [1], incremental inductance [H], share of the feedback
    from the switch node that acts on the error [1]. States (i_L, v_C, i_R, v_H), v_H only with a capacitor.
    """
    tau = c[K_TAU]
    esr = c[K_ESR]
    load = c[K_GLOAD]
    # di_L/dt = (gain i_R - i_L) / tau about the static point
    d_il = np.array([-1.0, 0.0, gain, 0.0]) / tau
    coupled = c[K_RHCH_INV] > 0.0
    feed = esr * c[K_R1G] * c[K_RH_INV]
    divisor = 1.0 + esr * (load + c[K_SELF] * c[K_R1_INV]) - feed
    vout = np.zeros(4)
    for i in range(4):
        vout[i] = feed * inductance * d_il[i]
    vout[0] += esr + feed * c[K_RL]
    vout[1] += 1.0
    vout[2] += esr
    vout[3] -= feed
    vout /= divisor
    vsw = vout + inductance * d_il
    vsw[0] += c[K_RL]
    back = vsw.copy()
    if coupled:
        back[3] -= 1.0
    back *= c[K_RH_INV] * c[K_G_INV]
    error = share * back - c[K_SELF] * vout
    jacobian = np.zeros((4, 4))
    jacobian[0] = d_il
    icap = np.zeros(4)
    icap[0] = 1.0
    icap[2] = 1.0
    icap -= load * vout + (c[K_SELF] * vout - back) * c[K_R1_INV]
    jacobian[1] = icap * c[K_C_INV]
    jacobian[2] = error * c[K_LO_INV]
    jacobian[2, 2] -= c[K_RO] * c[K_LO_INV]
    if coupled:
        jacobian[3] = (vsw - vout * (1.0 - c[K_SELF]) - back) * c[K_RHCH_INV]
        jacobian[3, 3] -= c[K_RHCH_INV]
    else:
        jacobian[3, 3] = -1.0 / tau
    return jacobian * tau


@compiled
def start_margin(row: Array, c: Array) -> float:
    """Start margin S [1]: above 1 the static solution is unstable and oscillation starts by itself.

    Direct coupling: ``beta' L(i) / (R_h G (L_o + tau (R_o + k ESR)))``. With a capacitor: the factor by
    which the feedback from the switch node could be weakened before the active-mode Jacobian loses its
    last eigenvalue in the right half plane. NaN where the base does not conduct at this load.
    """
    current = static_current(row, c)
    if current <= 0.0:
        return np.nan
    gain = c[K_BETA] / (1.0 + 2.0 * c[K_IK_INV] * current)
    inductance = 1.0 / (c[K_L_INV] * (1.0 + (current * c[K_I0_INV]) ** c[K_EXP]))
    if c[K_RHCH_INV] == 0.0:
        lag = row[P_LO] + c[K_TAU] * (c[K_RO] + c[K_SELF] * c[K_ESR])
        return gain * inductance * c[K_RH_INV] * c[K_G_INV] / lag
    without, whole = np.empty(5), np.empty(5)
    _characteristic(active_jacobian(c, current, gain, inductance, 0.0), without)
    _characteristic(active_jacobian(c, current, gain, inductance, 1.0), whole)
    high = 1.0
    while _unstable(without, whole, high) and high > 1e-6:
        high *= 0.5
    if high <= 1e-6:
        return 1e6
    while not _unstable(without, whole, high):
        high *= 2.0
        if high > 1e6:
            return 0.0
    low = 0.5 * high
    for _ in range(40):
        middle = 0.5 * (low + high)
        if _unstable(without, whole, middle):
            high = middle
        else:
            low = middle
    return 1.0 / high
