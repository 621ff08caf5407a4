"""Reverse recovery of a rectifier as a triangle: ``ta`` to the peak, ``tb`` back to zero, softness
``S = tb/ta``."""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real

RANGES: Ranges = {"recovery_peak_current": {"softness": (0.1, 3.0)}}
"""From snappy to soft (from memory). Standard JESD282-B prefers a ratio of slopes over the ratio of times."""


def recovery_charge(peak_current: Real, recovery_time: Real) -> Real:
    """Recovery charge of a triangle, ``I_rr t_rr / 2``.

    Parameters
    ----------
    peak_current : float or ndarray
        Peak reverse current [A].
    recovery_time : float or ndarray
        Recovery time [s].

    Returns
    -------
    float or ndarray
        Recovery charge [C].

    Notes
    -----
    Derived: area of a triangle.

    Examples
    --------
    >>> f"{recovery_charge(2.0, 200e-9):.3g}"
    '2e-07'
    """
    return 0.5 * peak_current * recovery_time


def recovery_peak_current(charge: Real, current_slope: Real, softness: Real) -> Real:
    """Peak reverse current, ``sqrt(2 Q_rr (di/dt) / (1 + S))``.

    Parameters
    ----------
    charge : float or ndarray
        Recovery charge [C].
    current_slope : float or ndarray
        Slope at which the forward current falls [A/s].
    softness : float or ndarray
        ``S = tb/ta`` [1].

    Returns
    -------
    float or ndarray
        Peak reverse current [A].

    Notes
    -----
    Derived: triangular recovery (from memory).

    Examples
    --------
    >>> round(float(recovery_peak_current(200e-9, 50e6, 0.5)), 5)
    3.65148
    """
    return np.sqrt(2.0 * charge * current_slope / (1.0 + softness))


def recovery_time(charge: Real, current_slope: Real, softness: Real) -> Real:
    """Recovery time, ``sqrt(2 Q_rr (1 + S) / (di/dt))``.

    Parameters
    ----------
    charge : float or ndarray
        Recovery charge [C].
    current_slope : float or ndarray
        Slope at which the forward current falls [A/s].
    softness : float or ndarray
        ``S = tb/ta`` [1].

    Returns
    -------
    float or ndarray
        Recovery time [s].

    Notes
    -----
    Derived: triangular recovery (from memory).

    Examples
    --------
    >>> f"{recovery_time(200e-9, 50e6, 0.5):.6g}"
    '1.09545e-07'
    """
    return np.sqrt(2.0 * charge * (1.0 + softness) / current_slope)


def recovery_charge_from_time(recovery_time: Real, current_slope: Real, softness: Real) -> Real:
    """Recovery charge from a data sheet's recovery time and slope, the inverse of `recovery_time`.

    Parameters
    ----------
    recovery_time : float or ndarray
        Recovery time [s].
    current_slope : float or ndarray
        Slope of the test [A/s].
    softness : float or ndarray
        ``S = tb/ta`` [1].

    Returns
    -------
    float or ndarray
        Recovery charge [C].

    Notes
    -----
    Derived from `recovery_time`.

    Examples
    --------
    >>> f"{recovery_charge_from_time(109.545e-9, 50e6, 0.5):.4g}"
    '2e-07'
    """
    return recovery_time * recovery_time * current_slope / (2.0 * (1.0 + softness))


def recovery_energy(supply_voltage: Real, current: Real, recovery_time: Real, charge: Real) -> Real:
    """Energy that recovery adds to one turn-on of the switch, ``V_in (I t_rr + Q_rr)``.

    Parameters
    ----------
    supply_voltage : float or ndarray
        Supply [V].
    current : float or ndarray
        Choke current at that moment [A].
    recovery_time : float or ndarray
        Recovery time [s].
    charge : float or ndarray
        Recovery charge [C].

    Returns
    -------
    float or ndarray
        Energy in the switch [J].

    References
    ----------
    R. W. Erickson and D. Maksimovic, Fundamentals of Power Electronics, 2nd ed. 2001, sec. 4.3.2 (from
    memory).

    Examples
    --------
    >>> f"{recovery_energy(20.0, 3.0, 109.545e-9, 200e-9):.6g}"
    '1.05727e-05'
    """
    return supply_voltage * (current * recovery_time + charge)
