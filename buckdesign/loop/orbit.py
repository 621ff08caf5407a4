"""From a starting state to the steady state: rest point, periodic orbit, or an average over a window.

The map from one cycle's beginning to the next is iterated plainly first, so that the attractor is the
one that the start leads to; then its fixed point is found by Anderson's method (J. ACM 12 (1965) 547)
on up to four section coordinates and accepted only where the map's derivative is a contraction.
"""

from __future__ import annotations

import numpy as np

from .accounting import A_TIME, clear
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
from .cycles import BEGAN, FROM_EMPTY, FROM_NODE, G_BEGAN, PROGRESS, RESTS, count_period, resume, run_cycle

DIMENSIONS = 4
MEMORY = 4
CLOSED = 1e-8
MOST_PERIOD = 12

PERIODIC, IRREGULAR, AT_REST, UNSETTLED = 0, 1, 2, 3

# positions in the settings array
O_PLAIN, O_ACCELERATED, O_MORE, O_WINDOW, O_STEPS, O_SPAN, O_PATIENCE, O_TOLERANCE = range(8)


@compiled
def section(c: Array, x: Array, z: Array) -> None:
    """Section coordinates of a state, scaled: (i_L, v_C, i_R, v_H)."""
    z[0] = x[X_IL] / c[K_SC_I]
    z[1] = x[X_VC] / 0.1
    z[2] = x[X_IR] / c[K_SC_IR]
    z[3] = x[X_VH]


@compiled
def _unscale(c: Array, z: Array, raw: Array) -> None:
    raw[0] = z[0] * c[K_SC_I]
    raw[1] = z[1] * 0.1
    raw[2] = z[2] * c[K_SC_IR]
    raw[3] = z[3]


@compiled
def _apart(z: Array, y: Array) -> float:
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
    _unscale(c, z, raw)
    end[:] = held
    resume(c, raw, began, x, end, s)
    for _ in range(repeats):
        if run_cycle(c, x, end, s, g, limits, a, False) != BEGAN:
            return -1
    section(c, x, y)
    return int(g[G_BEGAN])


@compiled
def _mix(points: Array, images: Array, kept: int, z: Array) -> None:
    """Anderson's next point from the last ``kept`` pairs (newest last)."""
    newest = kept - 1
    columns = kept - 1
    f = np.empty(DIMENSIONS)
    basis = np.empty((DIMENSIONS, MEMORY))
    upper = np.zeros((MEMORY, MEMORY))
    weights = np.zeros(MEMORY)
    used = np.zeros(MEMORY, np.int64)
    count = 0
    for i in range(DIMENSIONS):
        f[i] = images[newest, i] - points[newest, i]
    for k in range(columns):
        j = newest - 1 - k
        before = 0.0
        for i in range(DIMENSIONS):
            basis[i, count] = f[i] - (images[j, i] - points[j, i])
            before += basis[i, count] ** 2
        for p in range(count):
            dot = 0.0
            for i in range(DIMENSIONS):
                dot += basis[i, p] * basis[i, count]
            upper[p, count] = dot
            for i in range(DIMENSIONS):
                basis[i, count] -= dot * basis[i, p]
        norm = 0.0
        for i in range(DIMENSIONS):
            norm += basis[i, count] ** 2
        if norm <= 1e-12 * before or norm == 0.0:
            continue
        norm = norm**0.5
        upper[count, count] = norm
        for i in range(DIMENSIONS):
            basis[i, count] /= norm
        used[count] = j
        count += 1
        if count == MEMORY:
            break
    for p in range(count):
        for i in range(DIMENSIONS):
            weights[p] += basis[i, p] * f[i]
    for p in range(count - 1, -1, -1):
        for q in range(p + 1, count):
            weights[p] -= upper[p, q] * weights[q]
        weights[p] /= upper[p, p]
    for i in range(DIMENSIONS):
        z[i] = images[newest, i]
        for p in range(count):
            z[i] -= weights[p] * (images[newest, i] - images[used[p], i])


@compiled
def _spectral_radius(matrix: Array, n: int) -> float:
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
def _contracts(
    c: Array, z: Array, began: int, held: Discrete, repeats: int, s: Array, limits: Array, image: Array
) -> bool:
    """Whether the return map is a contraction at its fixed point ``z``."""
    end = np.empty(DISCRETES, np.int64)
    y = np.empty(DIMENSIONS)
    which = np.empty(DIMENSIONS, np.int64)
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
    matrix = np.zeros((DIMENSIONS, DIMENSIONS))
    moved = z.copy()
    for j in range(n):
        k = which[j]
        nudge = 1e-5
        moved[k] = z[k] + nudge
        if return_map(c, moved, began, held, repeats, s, limits, y, end) != began:
            return False
        moved[k] = z[k]
        for i in range(n):
            matrix[i, j] = (y[which[i]] - image[which[i]]) / nudge
    return _spectral_radius(matrix, n) < 1.0


@compiled
def close_orbit(
    c: Array, z: Array, began: int, held: Discrete, repeats: int, s: Array, limits: Array, most: int,
    points: Array, images: Array, kept: int, surely: bool,
) -> bool:  # fmt: skip
    """Find a stable fixed point of the ``repeats``-fold return map, starting at ``z`` with a history of pairs.

    On success ``z`` and ``held`` are the section point and its discrete state. ``surely``: plain iteration
    has been seen to contract, so that the derivative need not be looked at.
    """
    y = np.empty(DIMENSIONS)
    end = np.empty(DISCRETES, np.int64)
    best = np.inf
    bad = 0
    for _ in range(most):
        begins = return_map(c, z, began, held, repeats, s, limits, y, end)
        if begins != began:
            return False
        residual = _apart(y, z)
        if residual < CLOSED:
            if not (surely or _contracts(c, z, began, held, repeats, s, limits, y)):
                return False
            z[:] = y
            held[:] = end
            return True
        if residual < 0.5 * best:
            bad = 0
            best = residual
        else:
            bad += 1
            if bad > 5:
                return False
        if kept == MEMORY + 1:
            for i in range(MEMORY):
                points[i] = points[i + 1]
                images[i] = images[i + 1]
            kept -= 1
        points[kept] = z
        images[kept] = y
        kept += 1
        held[:] = end
        _mix(points, images, kept, z)
        if not (_apart(z, y) < 30.0 * residual + 1e-6):
            z[:] = y
    return False


@compiled
def average(c: Array, x: Array, m: Discrete, s: Array, cycles: int, limits: Array, a: Array, g: Array) -> int:
    """Account ``cycles`` cycles from a cycle's beginning; returns how many were finished."""
    clear(a)
    for k in range(cycles):
        before = a[A_TIME]
        if run_cycle(c, x, m, s, g, limits, a, True) != BEGAN:
            return k
        count_period(a, before)
    return cycles


@compiled
def _find_period(trail: Array, kinds: Discrete, n: int, closeness: float) -> int:
    """Smallest period under which the last section points of the trail repeat within ``closeness``; 0: none."""
    for p in range(1, min(MOST_PERIOD, n // 2) + 1):
        worst = 0.0
        for k in range(p):
            last, first = n - 1 - k, n - 1 - k - p
            worst = max(worst, _apart(trail[last % 64], trail[first % 64]))
            if kinds[last % 64] != kinds[first % 64]:
                worst = np.inf
        if worst < closeness:
            return p
    return 0


@compiled
def _history(trail: Array, kinds: Discrete, n: int, repeats: int, points: Array, images: Array) -> int:
    """The last pairs of section point and image along the trail, oldest first; returns how many."""
    kept = 0
    began = kinds[(n - 1) % 64]
    for k in range(MEMORY - 1, -1, -1):
        j = n - 1 - (k + 1) * repeats
        if j < 0 or j < n - 60:
            continue
        if kinds[j % 64] != began or kinds[(j + repeats) % 64] != began:
            kept = 0
            continue
        points[kept] = trail[j % 64]
        images[kept] = trail[(j + repeats) % 64]
        kept += 1
    return kept


@compiled
def _shrinks(trail: Array, kinds: Discrete, n: int, repeats: int) -> bool:
    """Whether the last three steps along the trail fell to three quarters or less of the one before."""
    if n < 5 or repeats > 1:
        return False
    for k in range(1, 4):
        late = _apart(trail[(n - k) % 64], trail[(n - k - 1) % 64])
        early = _apart(trail[(n - k - 1) % 64], trail[(n - k - 2) % 64])
        if late > 0.75 * early or kinds[(n - k) % 64] != kinds[(n - k - 1) % 64]:
            return False
    return True


@compiled
def settle(
    c: Array, x: Array, m: Discrete, s: Array, settings: Array, g: Array, started_by_itself: bool
) -> tuple[int, int]:
    """Bring the state ``(x, m)`` to the steady state; returns how it ended and the period in cycles.

    Ends at a cycle's beginning (periodic, irregular), at a rest point, or wherever the limits struck.
    """
    limits = np.empty(2)
    limits[0] = settings[O_STEPS]
    limits[1] = settings[O_SPAN]
    a = np.zeros(1)
    trail = np.empty((64, DIMENSIONS))
    kinds = np.empty(64, np.int64)
    points = np.zeros((MEMORY + 1, DIMENSIONS))
    images = np.zeros((MEMORY + 1, DIMENSIONS))
    z = np.empty(DIMENSIONS)
    held = np.empty(DISCRETES, np.int64)
    raw = np.empty(DIMENSIONS)
    plain = int(settings[O_PLAIN])
    total = plain + int(settings[O_MORE])
    if not started_by_itself:
        # a rest point is stable too, and bursts may find it late
        total = plain + int(settings[O_PATIENCE])
    next_attempt = plain
    n = 0
    while n < total:
        status = run_cycle(c, x, m, s, g, limits, a, False)
        if status == RESTS:
            return AT_REST, 0
        if status != BEGAN:
            return UNSETTLED, 0
        section(c, x, trail[n % 64])
        kinds[n % 64] = int(g[G_BEGAN])
        n += 1
        if n < next_attempt:
            continue
        next_attempt = 2 * n
        period = _find_period(trail, kinds, n, CLOSED)
        if period > 0:
            return PERIODIC, period
        began = kinds[(n - 1) % 64]
        repeats = 1 if n == plain else _find_period(trail, kinds, n, 0.1)
        if began == FROM_NODE or repeats == 0:
            continue
        kept = _history(trail, kinds, n, repeats, points, images)
        surely = _shrinks(trail, kinds, n, repeats)
        newest = trail[(n - 1) % 64]
        z[:] = newest
        if kept > 0:
            _mix(points, images, kept, z)
            if not (_apart(z, newest) < 30.0 * _apart(newest, trail[(n - 1 - repeats) % 64])):
                z[:] = newest
        held[:] = m
        most = int(settings[O_ACCELERATED])
        if close_orbit(c, z, began, held, repeats, s, limits, most, points, images, kept, surely):
            _unscale(c, z, raw)
            m[:] = held
            resume(c, raw, began, x, m, s)
            return PERIODIC, repeats
    return IRREGULAR, 0
