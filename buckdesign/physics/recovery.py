"""Reverse recovery of a rectifier as a triangle: ``ta`` to the peak, ``tb`` back to zero, softness
``S = tb/ta``."""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {"recovery_peak_current": {"softness": (0.1, 3.0)}}
"""From snappy to soft (from memory). Standard JESD282-B prefers a ratio of slopes over the ratio of times."""


CHARGE_DOUBLING = 100.0
"""Rise of temperature that doubles the recovery charge of a PN rectifier [K]; about twice from 25 to 125
degC (from memory)."""

TEST_SLOPE = 50e6
"""Slope of the usual test of the recovery time [A/s] (data sheets of fast rectifiers)."""

_LIFETIME_STEPS = 40


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


def charge_at_crossing(current: Real, current_slope: Real, lifetime: Real) -> Real:
    """Charge left in a rectifier when its falling current passes zero.

    Parameters
    ----------
    current : float or ndarray
        Forward current before it falls [A].
    current_slope : float or ndarray
        Slope at which it falls [A/s].
    lifetime : float or ndarray
        Lifetime of the carriers [s].

    Returns
    -------
    float or ndarray
        ``a t^2 (1 - exp(-I/(a t)))`` [C]: ``I t`` for a steep fall, ``a t^2`` for a slow one.

    Notes
    -----
    Derived: charge control, ``dq/dt = i - q/t`` with ``i = I - a time`` from ``q = I t``. Form of the
    model after P. O. Lauritzen and C. L. Ma, IEEE Trans. Power Electronics 6 (1991) 188 (from memory).

    Examples
    --------
    >>> f"{charge_at_crossing(3.0, 50e6, 1e-6):.4g}"
    '2.912e-06'
    >>> f"{charge_at_crossing(3.0, 1e6, 0.1e-6):.4g}"
    '1e-08'
    """
    product = np.maximum(current_slope, 1e-30) * lifetime
    return product * lifetime * -np.expm1(-current / np.maximum(product, 1e-30))


def carrier_lifetime(charge: Real, current: Real, current_slope: Real) -> Real:
    """Lifetime of the carriers from a data sheet's recovery charge, the inverse of `charge_at_crossing`.

    Parameters
    ----------
    charge : float or ndarray
        Recovery charge [C].
    current : float or ndarray
        Forward current of the test, above zero [A].
    current_slope : float or ndarray
        Slope of the test [A/s].

    Returns
    -------
    float or ndarray
        Lifetime [s]; 0 for no charge.

    Notes
    -----
    Derived: the charge grows with the lifetime, from its square to proportional to it, and is concave in
    between on logarithmic scales; a fixed number of halvings of its logarithm.

    Examples
    --------
    >>> f"{carrier_lifetime(charge_at_crossing(1.0, 50e6, 30e-9), 1.0, 50e6):.6g}"
    '3e-08'
    """
    some = np.maximum(charge, 1e-18)
    low = np.log(some / current)
    high = np.log(np.maximum(np.sqrt(some / current_slope), some / current)) + 2.0
    for _ in range(_LIFETIME_STEPS):
        middle = 0.5 * (low + high)
        below = charge_at_crossing(current, current_slope, np.exp(middle)) < some
        low, high = np.where(below, middle, low), np.where(below, high, middle)
    return plain(np.where(np.asarray(charge) > 0.0, np.exp(0.5 * (low + high)), 0.0))


def charge_at_temperature(charge_25c: Real, temperature_c: Real) -> Real:
    """Recovery charge at a junction temperature, doubling in 100 K.

    Parameters
    ----------
    charge_25c : float or ndarray
        Recovery charge at 25 degC [C].
    temperature_c : float or ndarray
        Junction temperature [degC].

    Returns
    -------
    float or ndarray
        Recovery charge [C].

    Notes
    -----
    Doubling from memory, see `CHARGE_DOUBLING`.

    Examples
    --------
    >>> charge_at_temperature(2e-8, 125.0)
    4e-08
    """
    return charge_25c * 2.0 ** ((temperature_c - 25.0) / CHARGE_DOUBLING)
