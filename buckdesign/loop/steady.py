"""Steady states of many designs: arrays in, table out."""

from __future__ import annotations

import numpy as np

from .accounting import (
    A_ACTIVE,
    A_BASE,
    A_BASE_TIME,
    A_BLOCKS,
    A_CAP2,
    A_COMMUTATIONS,
    A_COND,
    A_CONDUCTS,
    A_COPPER,
    A_CYCLES,
    A_DIFFERENCE_MAX,
    A_DIODE,
    A_DIVIDER,
    A_DRIVE,
    A_ESR,
    A_HELD,
    A_HIGH,
    A_IC,
    A_IC2,
    A_IC_MAX,
    A_ID,
    A_ID2,
    A_ID_MAX,
    A_IDLE,
    A_IL,
    A_IL2,
    A_IL_MAX,
    A_IL_MIN,
    A_IN2,
    A_INPUT,
    A_IR,
    A_IR2,
    A_IR_MAX,
    A_LOAD,
    A_PERIOD,
    A_PERIOD2,
    A_POWER_MAX,
    A_RATE2,
    A_RECOVERY,
    A_REGULATOR,
    A_REVERSE,
    A_REVERSE_MAX,
    A_SWITCH,
    A_TIME,
    A_VOUT,
    A_VOUT_MAX,
    A_VOUT_MIN,
    ACCOUNTS,
    clear,
    flux_linkage,
    stored_energy,
)  # fmt: skip
from .changes import classify
from .compiling import compiled, lent
from .constants import (
    CONSTANTS,
    DISCRETES,
    K_FULL,
    K_IQ,
    K_TOLERANCE,
    K_VSET,
    ORDER,
    P_CH,
    P_ILOAD,
    P_RLOAD,
    P_VREF,
    ROWS,
    STATES,
    X_IL,
    X_IR,
    X_VC,
    X_VH,
    Array,
    derive,
)  # fmt: skip
from .cycles import BEGAN, PROGRESS, run_cycle
from .margin import start_margin
from .orbit import (
    AT_REST,
    IRREGULAR,
    O_SPAN,
    O_STEPS,
    O_TOLERANCE,
    O_WINDOW,
    PERIODIC,
    UNSETTLED,
    average,
    settle,
)

# time over which a rest point, where nothing changes, is accounted [s]
AT_REST_SPAN = 2e-5

LINEAR, STUCK, DROPOUT, OVERLOAD, CONTINUOUS, DISCONTINUOUS = range(6)
REGIMES = ("linear", "stuck", "dropout", "overload", "continuous", "discontinuous")

OUTPUTS = (
    "regime", "period_cycles", "cycle_spread", "frequency_hz", "duty", "start_margin", "active_fraction",
    "output_voltage_v", "output_min_v", "output_max_v", "choke_mean_a", "choke_min_a", "choke_max_a", "choke_rms_a",
    "choke_slope_rms", "choke_flux_swing_vs", "regulator_mean_a", "regulator_rms_a", "regulator_max_a",
    "regulator_difference_max_v", "input_mean_a", "input_rms_a", "output_capacitor_rms_a", "collector_mean_a",
    "collector_rms_a", "collector_max_a", "transistor_peak_w", "rectifier_mean_a", "rectifier_rms_a", "rectifier_max_a",
    "blocking_fraction", "reverse_mean_v", "reverse_max_v", "commutations_hz", "idle_fraction", "window_s",
    "window_cycles", "input_w", "load_w", "transistor_conduction_w", "transistor_switching_w", "recovery_w", "base_w",
    "drive_resistor_w", "regulator_w", "rectifier_w", "choke_copper_w", "output_capacitor_w", "divider_w",
    "energy_residual", "settled", "steps",
)  # fmt: skip
OUTPUT = {name: index for index, name in enumerate(OUTPUTS)}
WIDTH = len(OUTPUTS)


@compiled
def operating_start(row: Array, c: Array, x: Array) -> None:
    """The state from which `simulate` starts: load current in the choke, set voltage on the capacitor."""
    x[:] = 0.0
    x[X_IL] = row[P_ILOAD] + c[K_VSET] / row[P_RLOAD]
    x[X_VC] = c[K_VSET]
    x[X_IR] = c[K_IQ]
    if row[P_CH] > 0.0:
        x[X_VH] = row[P_VREF]


@compiled
def _regime(c: Array, a: Array, cycles: int, load: float) -> float:
    if cycles > 0:
        return CONTINUOUS if a[A_IL_MIN] > 0.0 else DISCONTINUOUS
    if a[A_BASE_TIME] == 0.0:
        return LINEAR
    vout = a[A_VOUT] / a[A_TIME]
    if vout < 0.5 * c[K_VSET]:
        return OVERLOAD
    if a[A_HELD] < 0.5 * a[A_TIME]:
        return STUCK
    return OVERLOAD if load > c[K_FULL] * (1.0 + 1e-9) else DROPOUT


@compiled
def _report(c: Array, a: Array, out: Array) -> None:
    """Averages, extremes and powers from the accounts."""
    over = 1.0 / a[A_TIME]
    out[3] = a[A_CYCLES] / a[A_PERIOD] if a[A_CYCLES] > 0.0 else 0.0
    out[2] = 0.0
    if a[A_CYCLES] > 1.0:
        mean = a[A_PERIOD] / a[A_CYCLES]
        out[2] = max(a[A_PERIOD2] / a[A_CYCLES] - mean * mean, 0.0) ** 0.5 / mean
        if out[2] < 1e-7:
            out[2] = 0.0
    out[4] = a[A_HIGH] * over
    out[6] = a[A_ACTIVE] / a[A_CONDUCTS] if a[A_CONDUCTS] > 0.0 else 0.0
    out[7] = a[A_VOUT] * over
    out[8] = a[A_VOUT_MIN]
    out[9] = a[A_VOUT_MAX]
    out[10] = a[A_IL] * over
    out[11] = max(a[A_IL_MIN], 0.0)
    out[12] = a[A_IL_MAX]
    out[13] = (a[A_IL2] * over) ** 0.5
    out[14] = (a[A_RATE2] * over) ** 0.5
    out[15] = flux_linkage(c, out[11], out[12])
    out[16] = a[A_IR] * over
    out[17] = (a[A_IR2] * over) ** 0.5
    out[18] = a[A_IR_MAX]
    out[19] = a[A_DIFFERENCE_MAX]
    out[20] = (a[A_IC] + a[A_IR]) * over
    out[21] = (a[A_IN2] * over) ** 0.5
    out[22] = (a[A_CAP2] * over) ** 0.5
    out[23] = a[A_IC] * over
    out[24] = (a[A_IC2] * over) ** 0.5
    out[25] = a[A_IC_MAX]
    out[26] = a[A_POWER_MAX]
    out[27] = a[A_ID] * over
    out[28] = (a[A_ID2] * over) ** 0.5
    out[29] = a[A_ID_MAX]
    out[30] = a[A_BLOCKS] * over
    out[31] = a[A_REVERSE] / a[A_BLOCKS] if a[A_BLOCKS] > 0.0 else 0.0
    out[32] = a[A_REVERSE_MAX]
    out[33] = a[A_COMMUTATIONS] * over
    out[34] = a[A_IDLE] * over
    out[35] = a[A_TIME]
    out[36] = a[A_CYCLES]
    out[37] = a[A_INPUT] * over
    out[38] = a[A_LOAD] * over
    out[39] = a[A_COND] * over
    out[40] = a[A_SWITCH] * over
    out[41] = a[A_RECOVERY] * over
    out[42] = a[A_BASE] * over
    out[43] = a[A_DRIVE] * over
    out[44] = a[A_REGULATOR] * over
    out[45] = a[A_DIODE] * over
    out[46] = a[A_COPPER] * over
    out[47] = a[A_ESR] * over
    out[48] = a[A_DIVIDER] * over


@compiled
def _residual(c: Array, a: Array, first: Array, last: Array) -> float:
    spent = a[A_LOAD] + a[A_COND] + a[A_SWITCH] + a[A_BASE] + a[A_DRIVE] + a[A_REGULATOR]
    spent += a[A_DIODE] + a[A_COPPER] + a[A_ESR] + a[A_DIVIDER] + stored_energy(c, first, last)
    return abs(a[A_INPUT] - spent) / max(a[A_INPUT], 1e-6)


@compiled
def solve_one(
    row: Array, start: Array, given: bool, settings: Array, out: Array, end: Array, tangent: Array
) -> None:
    """Steady state of one design; ``out`` as `OUTPUTS`, ``end`` the state at the end of the window.

    ``start`` is the starting state (i_L, v_C, i_R, q, v_H) where ``given``, else the operating start is used;
    ``tangent`` the derivative of the return map near by, or zeros, and then that of the orbit found.
    """
    own_c = np.empty(CONSTANTS)
    own_x = np.zeros(STATES)
    own_m = np.zeros(DISCRETES, np.int64)
    own_s = np.zeros((ROWS, ORDER + 1))
    own_a = np.zeros(ACCOUNTS)
    c, x, m, s, a = lent(own_c), lent(own_x), lent(own_m), lent(own_s), lent(own_a)
    derive(row, c)
    c[K_TOLERANCE] = settings[O_TOLERANCE]
    g = np.zeros(PROGRESS)
    limits = np.empty(2)
    limits[0] = settings[O_STEPS]
    limits[1] = settings[O_SPAN]
    if given:
        for i in range(5):
            x[i] = start[i]
        if row[P_CH] <= 0.0:
            x[X_VH] = 0.0
    else:
        operating_start(row, c, x)
    classify(c, x, m, s)
    margin = start_margin(row, c)
    ended, period = settle(c, x, m, s, settings, g, margin > 1.0, tangent)
    first = x.copy()
    cycles = 0
    if ended == PERIODIC:
        cycles = average(c, x, m, s, period, limits, a, g)
    elif ended == IRREGULAR:
        cycles = average(c, x, m, s, int(settings[O_WINDOW]), limits, a, g)
    if cycles == 0:
        clear(a)
        x[:] = first
        limits[1] = AT_REST_SPAN if ended == AT_REST else settings[O_SPAN] * 0.2
        limits[0] = 4.0 * settings[O_STEPS]
        if ended != AT_REST:
            classify(c, x, m, s)
        for _ in range(64):
            if run_cycle(c, x, m, s, g, limits, a, True) != BEGAN:
                break
    out[:] = 0.0
    load = row[P_ILOAD] + c[K_VSET] / row[P_RLOAD]
    _report(c, a, out)
    out[0] = _regime(c, a, cycles, load)
    if cycles > 0:
        out[1] = period if ended == PERIODIC else -1.0
    else:
        out[3] = 0.0
    out[5] = margin
    out[49] = _residual(c, a, first, x)
    out[50] = 1.0 if ended != UNSETTLED else 0.0
    out[51] = g[0]
    end[:] = own_x
    # the owners are held until here
    out[51] += 0.0 * (own_c[0] + own_m[0] + own_s[0, 0] + own_a[0])


@compiled
def solve_rows(
    rows: Array, starts: Array, given: bool, settings: Array, out: Array, ends: Array, tangents: Array
) -> None:
    """`solve_one` over the leading axis; releases the interpreter lock, so that threads share the work."""
    for k in range(rows.shape[0]):
        tangent = tangents[k if tangents.shape[0] > 1 else 0]
        solve_one(rows[k], starts[k if given else 0], given, settings, out[k], ends[k], tangent)
