"""Event-driven model of an ideal comparator with delays: the reduced loop that the closed forms describe.

The output is ``v = v_C + r i + l di/dt`` with ``i`` the capacitor current; both intervals have constant
slopes,
so that ``v`` is a parabola in time and each event has a closed solution. No time step, continuous conduction.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from buckdesign.physics.arrays import Flag, Ranges, Real, plain

RANGES: Ranges = {"comparator_orbit": {"abs(multiplier)": (0.0, 1.0)}}
"""Above this the orbit exists but a disturbance grows from cycle to cycle (derived)."""

_MAX_STEPS = 60
_TOLERANCE = 1e-12
_LARGEST_GROWTH = 1e6
"""Ripple over that without capacitive droop beyond which the search has run away along a map without fixed
point."""


class ComparatorCircuit(NamedTuple):
    """Choke slopes, capacitor, window and delays of the reduced loop; fields broadcast against each other.

    Attributes
    ----------
    rising, falling : float or ndarray
        Slopes of the choke current, both positive [A/s].
    capacitance, esr, esl : float or ndarray
        Output capacitor [F], [ohm], [H].
    window : float or ndarray
        Comparator window at the output [V].
    turn_off_delay, turn_on_delay : float or ndarray
        Delays from crossing the upper or lower threshold to the switch acting [s].
    """

    rising: Real
    falling: Real
    capacitance: Real
    esr: Real
    esl: Real
    window: Real
    turn_off_delay: Real
    turn_on_delay: Real


class ComparatorOrbit(NamedTuple):
    """Periodic solution of the reduced loop.

    Attributes
    ----------
    frequency : float or ndarray
        Switching frequency [Hz].
    ripple : float or ndarray
        Choke ripple current, peak to peak [A].
    mean_output : float or ndarray
        Mean output, counted from the middle of the thresholds [V].
    multiplier : float or ndarray
        Factor by which a disturbance changes in one cycle; stable below 1 in magnitude [1].
    converged : bool or ndarray of bool
        True where the orbit was found; the other fields are NaN where it was not.
    """

    frequency: Real
    ripple: Real
    mean_output: Real
    multiplier: Real
    converged: Flag


class ComparatorCycle(NamedTuple):
    """One cycle from lower threshold to lower threshold.

    Attributes
    ----------
    end_current : float or ndarray
        Capacitor current at the next crossing of the lower threshold [A].
    period : float or ndarray
        Time between the two crossings [s].
    ripple : float or ndarray
        Choke current, largest minus smallest in the cycle [A].
    mean_output : float or ndarray
        Mean output over the cycle, counted from the middle of the thresholds [V].
    """

    end_current: Real
    period: Real
    ripple: Real
    mean_output: Real


def comparator_cycle(circuit: ComparatorCircuit, start_current: Real) -> ComparatorCycle:
    """Follow the reduced loop from one crossing of the lower threshold to the next.

    Parameters
    ----------
    circuit : ComparatorCircuit
        The loop [SI].
    start_current : float or ndarray
        Capacitor current at the crossing; the capacitor voltage follows from the threshold [A].

    Returns
    -------
    ComparatorCycle
        State at the next crossing and averages [SI].

    Notes
    -----
    Derived: four parabolic segments - falling on through the turn-on delay, rising to the upper threshold,
    rising on through the turn-off delay, falling to the lower threshold. A threshold that is already
    exceeded when
    the slope changes trips at once.

    Examples
    --------
    >>> circuit = ComparatorCircuit(25e3, 75e3, 470e-6, 0.1, 0.0, 0.03, 2e-6, 2e-6)
    >>> cycle = comparator_cycle(circuit, 0.0)
    >>> bool(cycle.period > 0.0)
    True
    """
    up, down, farad, esr, esl, window, off_delay, on_delay = (np.asarray(x, dtype=float) for x in circuit)
    current = np.asarray(start_current, dtype=float)
    volts = -window / 2.0 - esr * current + esl * down
    current, volts, area_1 = _advance(current, volts, -down, on_delay, circuit)
    lowest = current
    output = volts + esr * current + esl * up
    rise = _time_to_threshold(output, current / farad + esr * up, up / farad, window / 2.0)
    current, volts, area_2 = _advance(current, volts, up, rise + off_delay, circuit)
    highest = current
    output = volts + esr * current - esl * down
    fall = _time_to_threshold(-output, -current / farad + esr * down, down / farad, window / 2.0)
    current, volts, area_3 = _advance(current, volts, -down, fall, circuit)
    period = on_delay + rise + off_delay + fall
    charge = area_1 + area_2 + area_3
    return ComparatorCycle(plain(current), plain(period), plain(highest - lowest), plain(charge / period))


def comparator_orbit(circuit: ComparatorCircuit) -> ComparatorOrbit:
    """Find the periodic solution of the reduced loop by iterating the cycle map with secant steps.

    Parameters
    ----------
    circuit : ComparatorCircuit
        The loop [SI].

    Returns
    -------
    ComparatorOrbit
        Frequency, ripple, mean output and stability [SI].

    Notes
    -----
    Derived: at the lower threshold the capacitor current is the only free state, so the cycle is a map of one
    number and its fixed point is found to 1e-12 of the ripple.

    Examples
    --------
    >>> orbit = comparator_orbit(ComparatorCircuit(25e3, 75e3, 470e-6, 0.1, 20e-9, 0.03, 2e-6, 2e-6))
    >>> round(float(orbit.frequency), 1)
    37734.8
    """
    before = np.zeros(np.broadcast_shapes(*(np.shape(x) for x in circuit)))
    cycle = comparator_cycle(circuit, before)
    change = np.asarray(cycle.end_current - before)
    now = np.asarray(cycle.end_current, dtype=float)
    multiplier = np.full_like(before, np.nan)
    done = np.zeros(before.shape, dtype=bool)
    with np.errstate(all="ignore"):
        for _ in range(_MAX_STEPS):
            cycle = comparator_cycle(circuit, now)
            new_change = cycle.end_current - now
            slope = np.asarray((new_change - change) / (now - before))
            done = np.abs(new_change) <= _TOLERANCE * np.abs(cycle.ripple)
            if np.all(done | np.isnan(new_change)):
                break
            following = np.where(done | (slope == 0.0), cycle.end_current, now - new_change / slope)
            before, change, now = now, np.asarray(new_change), following
        probe = 1e-3 * np.abs(cycle.ripple)
        shifted = comparator_cycle(circuit, now + probe)
        multiplier = (shifted.end_current - cycle.end_current) / probe
    plain_ripple = np.asarray(circuit.window / np.asarray(circuit.esr))
    plain_ripple = (
        plain_ripple + circuit.rising * circuit.turn_off_delay + circuit.falling * circuit.turn_on_delay
    )
    bounded = np.abs(cycle.ripple) < _LARGEST_GROWTH * plain_ripple
    found = done & bounded & (np.asarray(cycle.period) > 0.0)
    frequency = 1.0 / np.where(found, cycle.period, np.nan)
    ripple, mean, factor = (np.where(found, x, np.nan) for x in (cycle.ripple, cycle.mean_output, multiplier))
    return ComparatorOrbit(plain(frequency), plain(ripple), plain(mean), plain(factor), plain(found))


_Array = NDArray[np.float64]


def _advance(
    current: _Array, volts: _Array, slope: _Array, time: _Array, circuit: ComparatorCircuit
) -> tuple[_Array, _Array, _Array]:
    """Capacitor current and voltage after `time`, and the integral of the output over it."""
    farad, esr, esl = circuit.capacitance, circuit.esr, circuit.esl
    gained = time * (current + slope * time / 2.0)
    area = time * volts + time * time * (current / 2.0 + slope * time / 6.0) / farad
    area = area + esr * gained + esl * slope * time
    return current + slope * time, volts + gained / farad, area


def _time_to_threshold(start: _Array, slope: _Array, bend: _Array, level: _Array) -> _Array:
    """First time at which ``start + slope t + bend t^2/2`` reaches `level` from below; 0 if it is above."""
    gap = np.maximum(level - start, 0.0)
    root = np.sqrt(slope * slope + 2.0 * bend * gap)
    steep = slope + root
    return np.where(slope >= 0.0, 2.0 * gap / np.where(steep > 0.0, steep, 1.0), (root - slope) / bend)
