"""Where an event function first turns negative within a step.

An event function is positive while its condition holds and is a polynomial in the time since the
start of the step (with an added exponential for the charge of the saturated transistor). Its leading
coefficients that vanish to rounding are dropped before the search, so that the mode after an event is
decided by derivatives and never by the sign of a rounding error.
"""

from __future__ import annotations

import math

import numpy as np

from .compiling import compiled
from .constants import (
    AT_LOOSENESS,
    S_EVENT,
    S_KEYS,
    Array,
)  # fmt: skip

SAMPLES = 3


@compiled
def value(s: Array, row: int, order: int, t: float) -> float:
    """The polynomial of a row at time ``t``."""
    total = s[row, order]
    for n in range(order - 1, -1, -1):
        total = total * t + s[row, n]
    return total


@compiled
def event_value(s: Array, low: int, order: int, decay: float, rate: float, t: float) -> float:
    """The event function at ``t``: the polynomial from order ``low`` on, and the decaying part."""
    total = s[S_EVENT, order]
    for n in range(order - 1, low - 1, -1):
        total = total * t + s[S_EVENT, n]
    if decay != 0.0:
        total += decay * math.exp(-rate * t)
    return total


@compiled
def _event_and_slope(s: Array, low: int, order: int, decay: float, rate: float, t: float) -> tuple[float, float]:
    f = s[S_EVENT, order]
    slope = 0.0
    for n in range(order - 1, low - 1, -1):
        slope = slope * t + f
        f = f * t + s[S_EVENT, n]
    if decay != 0.0:
        part = decay * math.exp(-rate * t)
        f += part
        slope -= rate * part
    return f, slope


@compiled
def _lowest(s: Array, low: int, order: int, decay: float, rate: float, left: float, right: float) -> float:
    """Where the event function is lowest in an interval over which its slope turns from falling to rising."""
    for _ in range(12):
        t = 0.5 * (left + right)
        f, slope = _event_and_slope(s, low, order, decay, rate, t)
        if f < 0.0:
            return t
        if slope < 0.0:
            left = t
        else:
            right = t
    return 0.5 * (left + right)


@compiled
def _refine(s: Array, low: int, order: int, decay: float, rate: float, left: float, right: float) -> float:
    """The root in (left, right], where the event function changes from positive to negative."""
    f_left = event_value(s, low, order, decay, rate, left)
    f_right = event_value(s, low, order, decay, rate, right)
    t = left + (right - left) * f_left / (f_left - f_right)
    close = 2e-15 * right
    for _ in range(60):
        f, slope = _event_and_slope(s, low, order, decay, rate, t)
        if f > 0.0:
            left = t
        else:
            right = t
        guess = t - f / slope if slope != 0.0 else left
        if abs(guess - t) <= close or right - left <= close:
            break
        if not (left < guess < right):
            guess = 0.5 * (left + right)
        t = guess
    return t


@compiled
def _search(s: Array, low: int, order: int, decay: float, rate: float, h: float, known: bool) -> float:
    """First root by sampling, with a look for dips between the samples; infinite where there is none."""
    previous = 0.0
    falling = True
    for i in range(1, SAMPLES + 1):
        t = h * i / SAMPLES
        f, slope = _event_and_slope(s, low, order, decay, rate, t)
        if f >= 0.0 and falling and slope > 0.0:
            lowest = _lowest(s, low, order, decay, rate, previous, t)
            if event_value(s, low, order, decay, rate, lowest) < 0.0:
                t, f = lowest, -1.0
        if f < 0.0:
            if previous == 0.0 and known:
                previous = 1e-9 * t
            return _refine(s, low, order, decay, rate, previous, t)
        previous = t
        falling = slope < 0.0
    return np.inf


@compiled
def first_crossing(s: Array, order: int, h: float, tiny: float, drop: int) -> float:
    """First time in [0, h] at which the event polynomial turns negative; infinite when it does not.

    ``drop`` leading coefficients are known to vanish, because the step begins at the event's opposite.
    """
    low = 0
    power = 1.0
    # the first of them is zero, the second cannot be negative but for rounding
    while low < drop and (low == 0 or s[S_EVENT, low] <= 0.0):
        low += 1
        power *= h
    if low == 0 and abs(s[S_EVENT, 0]) <= tiny * s[S_KEYS, AT_LOOSENESS]:
        low = 1
        power = h
    while low <= order and abs(s[S_EVENT, low]) * power <= tiny:
        low += 1
        power *= h
    if low > order:
        return np.inf
    lead = s[S_EVENT, low]
    if lead < 0.0:
        return 0.0
    rest = 0.0
    bend = 0.0
    for n in range(order, low, -1):
        size = abs(s[S_EVENT, n])
        rest = (rest + size) * h
        if n > low + 1:
            bend = (bend + (n - low) * size) * h
    if lead > rest:
        return np.inf
    if low < order and abs(s[S_EVENT, low + 1]) >= bend:
        if s[S_EVENT, low + 1] > 0.0 or event_value(s, low, order, 0.0, 0.0, h) >= 0.0:
            return np.inf
        return _refine(s, low, order, 0.0, 0.0, 0.0, h)
    return _search(s, low, order, 0.0, 0.0, h, False)


@compiled
def first_shortage(s: Array, order: int, decay: float, rate: float, h: float, tiny: float, drop: int) -> float:
    """`first_crossing` for an event polynomial with an added ``decay * exp(-rate t)``."""
    start = s[S_EVENT, 0] + decay
    if drop == 0 and (start < -tiny or (start <= tiny and s[S_EVENT, 1] - rate * decay < 0.0)):
        return 0.0
    if start > 0.0:
        rest = 0.0
        for n in range(order, 0, -1):
            rest = (rest + abs(s[S_EVENT, n])) * h
        if s[S_EVENT, 0] + min(decay, 0.0) > rest:
            return np.inf
    return _search(s, 0, order, decay, rate, h, drop > 0 or start <= tiny)


@compiled
def spread(s: Array, row: int, order: int, h: float) -> float:
    """How far a row can move within the step."""
    rest = 0.0
    for n in range(order, 0, -1):
        rest = (rest + abs(s[row, n])) * h
    return rest
