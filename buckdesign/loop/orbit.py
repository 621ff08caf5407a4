"""From a starting state to the steady state: rest point, periodic orbit, or an average over a window.

The map from one cycle's beginning to the next is iterated plainly first, so that the attractor is the
one that the start leads to; then its fixed point is found by Anderson's method (J. ACM 12 (1965) 547)
on up to four section coordinates and accepted only where the map's derivative is a contraction.
"""

from __future__ import annotations

import numpy as np

from .accounting import A_TIME, clear
from .compiling import compiled
from .constants import DISCRETES, Array, Discrete
from .cycles import (
    BEGAN,
    FROM_NODE,
    G_BEGAN,
    G_NEAR_REST,
    REST_AT_BOUND,
    REST_IS_STABLE,
    RESTS,
    count_period,
    resume,
    run_cycle,
)
from .following import CLOSED, follow_orbit, note_tangent
from .return_map import DIMENSIONS, apart, derivative, return_map, section, unscale

MEMORY = 4
MOST_PERIOD = 12

PERIODIC, IRREGULAR, AT_REST, UNSETTLED = 0, 1, 2, 3

# positions in the settings array
O_PLAIN, O_ACCELERATED, O_MORE, O_WINDOW, O_STEPS, O_SPAN, O_PATIENCE, O_TOLERANCE, O_FOLLOW = range(9)


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
def close_orbit(
    c: Array, z: Array, began: int, held: Discrete, repeats: int, s: Array, limits: Array, most: int,
    points: Array, images: Array, kept: int, surely: bool, tangent: Array, wanted: bool,
) -> bool:  # fmt: skip
    """Find a stable fixed point of the ``repeats``-fold return map, starting at ``z`` with a history of pairs.

    On success ``z`` and ``held`` are the section point and its discrete state. ``surely``: plain iteration
    has been seen to contract, so that the derivative need not be looked at, unless it is ``wanted`` in
    ``tangent``.
    """
    y = np.empty(DIMENSIONS)
    end = np.empty(DISCRETES, np.int64)
    best = np.inf
    bad = 0
    for _ in range(most):
        begins = return_map(c, z, began, held, repeats, s, limits, y, end)
        if begins != began:
            return False
        residual = apart(y, z)
        if residual < CLOSED:
            if not surely or wanted:
                radius = derivative(c, z, began, held, repeats, s, limits, y, tangent[1:])
                if not surely and not radius < 1.0:
                    return False
                note_tangent(tangent, repeats, began, radius)
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
        if not (apart(z, y) < 30.0 * residual + 1e-6):
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
            worst = max(worst, apart(trail[last % 64], trail[first % 64]))
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
        late = apart(trail[(n - k) % 64], trail[(n - k - 1) % 64])
        early = apart(trail[(n - k - 1) % 64], trail[(n - k - 2) % 64])
        if late > 0.75 * early or kinds[(n - k) % 64] != kinds[(n - k - 1) % 64]:
            return False
    return True


@compiled
def settle(
    c: Array, x: Array, m: Discrete, s: Array, settings: Array, g: Array, started_by_itself: bool, tangent: Array
) -> tuple[int, int]:
    """Bring the state ``(x, m)`` to the steady state; returns how it ended and the period in cycles.

    Ends at a cycle's beginning (periodic, irregular), at a rest point, or wherever the limits struck.
    ``tangent`` is that of an orbit near by, or zeros; afterwards that of the orbit found, where it is wanted.
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
    wanted = settings[O_FOLLOW] > 0.0
    near = wanted and tangent[0, 0] > 0.0
    if wanted and tangent[0, 3] > 0.0:
        g[G_NEAR_REST] = REST_AT_BOUND if started_by_itself else REST_IS_STABLE
    tangent[0, 3] = 0.0
    while n < total:
        status = run_cycle(c, x, m, s, g, limits, a, False)
        if status == RESTS:
            tangent[0, 3] = 1.0
            return AT_REST, 0
        g[G_NEAR_REST] = 0.0
        if status != BEGAN:
            return UNSETTLED, 0
        section(c, x, trail[n % 64])
        kinds[n % 64] = int(g[G_BEGAN])
        n += 1
        if near and n == int(tangent[0, 0]):
            near = False
            z[:] = trail[n - 1]
            held[:] = m
            if follow_orbit(c, z, kinds[n - 1], held, s, limits, tangent):
                unscale(c, z, raw)
                m[:] = held
                resume(c, raw, kinds[n - 1], x, m, s)
                return PERIODIC, n
            tangent[0, 0] = 0.0
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
            if not (apart(z, newest) < 30.0 * apart(newest, trail[(n - 1 - repeats) % 64])):
                z[:] = newest
        held[:] = m
        most = int(settings[O_ACCELERATED])
        if close_orbit(c, z, began, held, repeats, s, limits, most, points, images, kept, surely, tangent, wanted):
            unscale(c, z, raw)
            m[:] = held
            resume(c, raw, began, x, m, s)
            return PERIODIC, repeats
    return IRREGULAR, 0
