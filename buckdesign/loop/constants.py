"""Index names shared by the compiled functions of the loop kernel, and the derived constants.

The kernel keeps a design as one array ``c`` of derived constants (the ``K_*`` positions), the
continuous state as ``x`` (the ``X_*`` positions), the discrete state as ``m`` (the ``M_*`` positions)
and the Taylor coefficients of one step as rows of ``s`` (the ``S_*`` positions).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from .compiling import compiled
from .parameters import COLUMN

Array = NDArray[np.float64]
Discrete = NDArray[np.int64]

ORDER = 16
# error of one step, relative to the load current, and in volts
TOLERANCE = 1e-12
INVERSE = 1.0 / np.arange(1.0, ORDER + 2.0)

# switch modes
SATURATED, FREEWHEEL, ACTIVE, RECOVERING, EMPTY = 0, 1, 2, 3, 4
MODE_NAMES = ("saturated", "freewheel", "active", "recovering", "empty")
# what holds the regulator current
UNHELD, HELD_LOW, HELD_HIGH, HELD_BOTH = 0, 1, 2, 3
# which bound holds it from above
BOUND_CONSTANT, BOUND_DRIVE, BOUND_OFF, BOUND_FOLD, BOUND_FAR = 0, 1, 2, 3, 4

X_IL, X_VC, X_IR, X_Q, X_VH, X_SWEPT = range(6)
STATES = 6
M_MODE, M_CLAMP, M_BOUND, M_BASE, M_LOAD, M_JUST = range(6)
DISCRETES = 6

(S_IL, S_VC, S_IR, S_Q, S_VH, S_SWEPT, S_VOUT, S_VSW, S_IAV, S_ER) = range(10)
# work rows: power of the current, inverse inductance, inductance, gain slope, di/dt, squares, root, choke voltage
(S_POWER, S_INVERSE, S_INDUCT, S_SLOPE, S_RATE, S_SQUARE, S_ROOT, S_DRIVE, S_EVENT) = range(10, 19)
# linear relations of the passive modes, three rows a discrete state, behind a row of their keys
S_KEYS = 19
# place in the row of keys of the factor by which an event function may miss zero at the start of a step
AT_LOOSENESS = 16
S_LINEAR = 20
STATES_KEPT = 15
ROWS = S_LINEAR + 3 * STATES_KEPT

(
    K_VIN, K_VREF, K_IADJ, K_SELF, K_R1G, K_RH_INV, K_G_INV, K_R1_INV, K_LO_INV, K_RO, K_IQ, K_ILIM, K_IBE,
    K_VBE, K_TAU, K_TAU_INV, K_BETA, K_IK_INV, K_VCE0, K_RCE, K_VD0, K_RD, K_QRR, K_L_INV, K_I0_INV, K_EXP,
    K_RL, K_C_INV, K_ESR, K_ILOAD, K_GLOAD, K_RHCH_INV, K_ON_A, K_ON_B, K_OFF_A, K_OFF_B, K_FOLD_A, K_FOLD_B,
    K_IFAR, K_FOLDS, K_SC_I, K_SC_IR, K_SC_Q, K_VSET, K_FULL, K_RDRIVE, K_RBE, K_TOLERANCE,
) = range(48)  # fmt: skip
CONSTANTS = 48

# columns of a parameter row
P_VIN = COLUMN["supply_voltage"]
P_R1 = COLUMN["r1"]
P_R2 = COLUMN["r2"]
P_RH = COLUMN["hysteresis_resistance"]
P_CH = COLUMN["hysteresis_capacitance"]
P_VREF = COLUMN["reference"]
P_IADJ = COLUMN["adjust_current"]
P_LO = COLUMN["output_inductance"]
P_RO = COLUMN["output_resistance"]
P_IQ = COLUMN["quiescent_current"]
P_ILIM = COLUMN["current_limit"]
P_KNEE = COLUMN["current_limit_knee"]
P_FARV = COLUMN["current_limit_far_voltage"]
P_FARI = COLUMN["current_limit_far"]
P_VDO = COLUMN["dropout"]
P_RDO = COLUMN["dropout_resistance"]
P_RDRIVE = COLUMN["drive_resistance"]
P_RBE = COLUMN["base_resistance"]
P_VBE = COLUMN["base_emitter"]
P_TAU = COLUMN["charge_time"]
P_BETA = COLUMN["gain"]
P_IK = COLUMN["gain_knee"]
P_VCE0 = COLUMN["saturation_voltage"]
P_RCE = COLUMN["saturation_resistance"]
P_VD0 = COLUMN["threshold"]
P_RD = COLUMN["slope"]
P_QRR = COLUMN["recovery_charge"]
P_L = COLUMN["inductance"]
P_I0 = COLUMN["bias_current"]
P_EXP = COLUMN["bias_exponent"]
P_RL = COLUMN["choke_resistance"]
P_C = COLUMN["capacitance"]
P_ESR = COLUMN["esr"]
P_ILOAD = COLUMN["load_current"]
P_RLOAD = COLUMN["load_resistance"]
P_FULL = COLUMN["full_load"]


@compiled
def set_voltage(row: Array) -> float:
    """The output voltage at which the error is zero while the switch node stands at the output [V]."""
    g = 1.0 / row[P_R1] + 1.0 / row[P_R2]
    if row[P_CH] == 0.0:
        g += 1.0 / row[P_RH]
    return row[P_R2] * (g * row[P_VREF] + row[P_IADJ])


@compiled
def _bounds(row: Array, c: Array) -> None:
    """The straight lines ``i_R = a + b v_out`` that bound the regulator current."""
    series = max(row[P_RDRIVE] + row[P_RDO], 1e-6)
    c[K_ON_A] = (row[P_VIN] - row[P_VBE] - row[P_VDO]) / series
    c[K_ON_B] = -1.0 / series
    c[K_OFF_A] = (row[P_VIN] - row[P_VDO]) / (series + row[P_RBE])
    c[K_OFF_B] = -1.0 / (series + row[P_RBE])
    c[K_FOLDS] = 0.0
    c[K_IFAR] = row[P_FARI]
    if row[P_KNEE] < np.inf and row[P_FARV] > row[P_KNEE]:
        fall = (row[P_ILIM] - row[P_FARI]) / (row[P_FARV] - row[P_KNEE])
        rest = 1.0 - fall * row[P_RDRIVE]
        if fall > 0.0 and rest > 0.0 and rest > fall * row[P_ESR]:
            c[K_FOLDS] = 1.0
            c[K_FOLD_A] = (row[P_ILIM] - fall * (row[P_VIN] - row[P_VBE] - row[P_KNEE])) / rest
            c[K_FOLD_B] = fall / rest


@compiled
def derive(row: Array, c: Array) -> None:
    """Fill the derived constants ``c``, shape (CONSTANTS,), of one parameter row."""
    g = 1.0 / row[P_R1] + 1.0 / row[P_R2] + 1.0 / row[P_RH]
    c[K_VIN] = row[P_VIN]
    c[K_VREF] = row[P_VREF]
    c[K_IADJ] = row[P_IADJ]
    c[K_SELF] = 1.0 - 1.0 / (row[P_R1] * g)
    c[K_R1G] = 1.0 / (row[P_R1] * g)
    c[K_RH_INV] = 1.0 / row[P_RH]
    c[K_G_INV] = 1.0 / g
    c[K_R1_INV] = 1.0 / row[P_R1]
    c[K_LO_INV] = 1.0 / row[P_LO]
    c[K_RO] = row[P_RO]
    c[K_IQ] = row[P_IQ]
    c[K_ILIM] = row[P_ILIM]
    c[K_VBE] = row[P_VBE]
    c[K_IBE] = row[P_VBE] / row[P_RBE]
    c[K_TAU] = row[P_TAU]
    c[K_TAU_INV] = 1.0 / row[P_TAU]
    c[K_BETA] = row[P_BETA]
    c[K_IK_INV] = 1.0 / row[P_IK]
    c[K_VCE0] = row[P_VCE0]
    c[K_RCE] = row[P_RCE]
    c[K_VD0] = row[P_VD0]
    c[K_RD] = row[P_RD]
    c[K_QRR] = row[P_QRR]
    c[K_L_INV] = 1.0 / row[P_L]
    c[K_I0_INV] = 1.0 / row[P_I0]
    c[K_EXP] = row[P_EXP]
    c[K_RL] = row[P_RL]
    c[K_C_INV] = 1.0 / row[P_C]
    c[K_ESR] = row[P_ESR]
    c[K_ILOAD] = row[P_ILOAD]
    c[K_GLOAD] = 1.0 / row[P_RLOAD]
    c[K_RHCH_INV] = 0.0
    if row[P_CH] > 0.0:
        c[K_RHCH_INV] = 1.0 / (row[P_RH] * row[P_CH])
    _bounds(row, c)
    c[K_VSET] = set_voltage(row)
    load = row[P_ILOAD] + c[K_VSET] / row[P_RLOAD]
    c[K_SC_I] = max(load, 0.1)
    c[K_SC_IR] = max(0.1 * c[K_SC_I], 0.05)
    c[K_SC_Q] = row[P_TAU] / row[P_BETA] * c[K_SC_I]
    c[K_FULL] = row[P_FULL]
    c[K_RDRIVE] = row[P_RDRIVE]
    c[K_RBE] = row[P_RBE]
    c[K_TOLERANCE] = TOLERANCE
