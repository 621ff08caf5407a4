"""From the periodic orbit of one circuit to that of one nearly alike, by Newton's method with a known derivative.

The derivative of the return map is kept and corrected by each step (C. G. Broyden, Math. Comp. 19 (1965) 577), so
that a few cycles do.
"""

from __future__ import annotations

import numpy as np

from .compiling import compiled
from .constants import DISCRETES, Array, Discrete
from .cycles import solve_linear
from .return_map import DIMENSIONS, apart, derivative, free_coordinates, return_map, spectral_radius

CLOSED = 1e-8
# most evaluations of the return map
MOST = 8
# spectral radius below which a correction of the derivative is trusted to stay below 1
SAFE = 0.9
# rows of a tangent: the first says repeats of the cycle, how it begins and the spectral radius
TANGENT = (DIMENSIONS + 1, DIMENSIONS)


@compiled
def note_tangent(tangent: Array, repeats: int, began: int, radius: float) -> None:
    """Say in a tangent, whose derivative is there, what it belongs to; none where the map does not contract."""
    tangent[0, 0] = repeats if radius < 1.0 else 0.0
    tangent[0, 1] = began
    tangent[0, 2] = radius


@compiled
def _correct(matrix: Array, which: Discrete, n: int, moved: Array, changed: Array) -> None:
    """Broyden's correction: the derivative gives the change of the image that was seen."""
    square = 0.0
    for j in range(n):
        square += moved[which[j]] ** 2
    if square < 1e-24:
        return
    for i in range(n):
        lacking = changed[which[i]]
        for j in range(n):
            lacking -= matrix[which[i], which[j]] * moved[which[j]]
        for j in range(n):
            matrix[which[i], which[j]] += lacking * moved[which[j]] / square


@compiled
def follow_orbit(c: Array, z: Array, began: int, held: Discrete, s: Array, limits: Array, tangent: Array) -> bool:
    """Find the fixed point near ``z`` with the derivative in ``tangent``, which is corrected.

    On success ``z`` and ``held`` are the section point and its discrete state.
    """
    if began != int(tangent[0, 1]):
        return False
    repeats, matrix = int(tangent[0, 0]), tangent[1:]
    y, y_before, z_before = np.empty(DIMENSIONS), np.empty(DIMENSIONS), np.empty(DIMENSIONS)
    system, step = np.empty((DIMENSIONS, DIMENSIONS)), np.empty(DIMENSIONS)
    end, which = np.empty(DISCRETES, np.int64), np.empty(DIMENSIONS, np.int64)
    before = np.inf
    for k in range(MOST):
        if return_map(c, z, began, held, repeats, s, limits, y, end) != began:
            return False
        residual = apart(y, z)
        n = free_coordinates(c, began, held, which)
        if k > 0:
            _correct(matrix, which, n, z - z_before, y - y_before)
        if residual < CLOSED:
            radius = spectral_radius(matrix, DIMENSIONS)
            if max(radius, tangent[0, 2]) > SAFE:
                radius = derivative(c, z, began, held, repeats, s, limits, y, matrix)
            note_tangent(tangent, repeats, began, radius)
            z[:] = y
            held[:] = end
            return radius < 1.0
        if not residual < 0.5 * before:
            return False
        before = residual
        for i in range(n):
            step[i] = y[which[i]] - z[which[i]]
            for j in range(n):
                system[i, j] = (1.0 if i == j else 0.0) - matrix[which[i], which[j]]
        if not solve_linear(system, step, n):
            return False
        z_before[:] = z
        y_before[:] = y
        z[:] = y
        for i in range(n):
            z[which[i]] = z_before[which[i]] + step[i]
        held[:] = end
    return False
