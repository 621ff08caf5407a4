"""The map from one cycle's beginning to the next, on up to four scaled section coordinates."""

from __future__ import annotations

import numpy as np

from .compiling import compiled
from .constants import (
    DISCRETES,
    K_RHCH_INV,
    K_SC_I,
    K_SC_IR,
    M_CLAMP,
    STATES,
    UNHELD,
    X_IL,
    X_IR,
    X_VC,
    X_VH,
    Array,
    Discrete,
)
from .cycles import BEGAN, FROM_EMPTY, G_BEGAN, PROGRESS, resume, run_cycle

DIMENSIONS = 4
# step of a derivative by differences
NUDGE = 1e-5


@compiled
def section(c: Array, x: Array, z: Array) -> None:
    """Section coordinates of a state, scaled: (i_L, v_C, i_R, v_H)."""
    z[0] = x[X_IL] / c[K_SC_I]
    z[1] = x[X_VC] / 0.1
    z[2] = x[X_IR] / c[K_SC_IR]
    z[3] = x[X_VH]


@compiled
def unscale(c: Array, z: Array, raw: Array) -> None:
    """The state of section coordinates: the inverse of `section`."""
    raw[0] = z[0] * c[K_SC_I]
    raw[1] = z[1] * 0.1
    raw[2] = z[2] * c[K_SC_IR]
    raw[3] = z[3]


@compiled
def apart(z: Array, y: Array) -> float:
    """Largest difference between two section points, scaled."""
    largest = 0.0
    for i in range(DIMENSIONS):
        largest = max(largest, abs(z[i] - y[i]))
    return largest


@compiled
def return_map(
    c: Array,
    z: Array,
    began: int,
    held: Discrete,
    repeats: int,
    s: Array,
    limits: Array,
    y: Array,
    end: Discrete,
) -> int:
    """Image of the section point ``z`` after ``repeats`` cycles in ``y``; its discrete state in ``end``.

    Returns how the last cycle began, or -1 where none did.
    """
    x = np.zeros(STATES)
    g = np.zeros(PROGRESS)
    a = np.zeros(1)
    raw = np.empty(DIMENSIONS)
    unscale(c, z, raw)
    end[:] = held
    resume(c, raw, began, x, end, s)
    for _ in range(repeats):
        if run_cycle(c, x, end, s, g, limits, a, False) != BEGAN:
            return -1
    section(c, x, y)
    return int(g[G_BEGAN])


@compiled
def spectral_radius(matrix: Array, n: int) -> float:
    """Largest modulus of the eigenvalues, by Gelfand's formula with ten squarings."""
    a = matrix.copy()
    b = np.empty_like(a)
    logarithm = 0.0
    power = 1.0
    for _ in range(10):
        norm = 0.0
        for i in range(n):
            for j in range(n):
                norm = max(norm, abs(a[i, j]))
        if norm == 0.0:
            return 0.0
        logarithm += np.log(norm) / power
        for i in range(n):
            for j in range(n):
                a[i, j] /= norm
        for i in range(n):
            for j in range(n):
                total = 0.0
                for k in range(n):
                    total += a[i, k] * a[k, j]
                b[i, j] = total
        a, b = b, a
        power *= 2.0
    norm = 0.0
    for i in range(n):
        for j in range(n):
            norm = max(norm, abs(a[i, j]))
    if norm == 0.0:
        return 0.0
    return np.exp(logarithm + np.log(norm) / power)


@compiled
def free_coordinates(c: Array, began: int, held: Discrete, which: Discrete) -> int:
    """Section coordinates that move freely where cycles begin like this; returns how many."""
    n = 0
    for k in range(DIMENSIONS):
        if began == FROM_EMPTY and (k == 0 or k == 2):
            continue
        if k == 2 and held[M_CLAMP] != UNHELD:
            continue
        if k == 3 and c[K_RHCH_INV] == 0.0:
            continue
        which[n] = k
        n += 1
    return n


@compiled
def derivative(
    c: Array, z: Array, began: int, held: Discrete, repeats: int, s: Array, limits: Array, image: Array, matrix: Array
) -> float:
    """Derivative of the return map at ``z``, whose image is given, by differences; returns its spectral radius.

    Coordinates that do not move freely have zeros in ``matrix``. Infinite where a neighbour begins its cycle
    otherwise.
    """
    end = np.empty(DISCRETES, np.int64)
    y = np.empty(DIMENSIONS)
    which = np.empty(DIMENSIONS, np.int64)
    n = free_coordinates(c, began, held, which)
    matrix[:] = 0.0
    moved = z.copy()
    for j in range(n):
        k = which[j]
        moved[k] = z[k] + NUDGE
        if return_map(c, moved, began, held, repeats, s, limits, y, end) != began:
            return np.inf
        moved[k] = z[k]
        for i in range(n):
            matrix[which[i], k] = (y[which[i]] - image[which[i]]) / NUDGE
    return spectral_radius(matrix, DIMENSIONS)
