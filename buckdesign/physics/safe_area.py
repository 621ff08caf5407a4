"""Safe operating area of a bipolar power transistor, and its leakage.

The area is bounded by the rated current, by the power that the junction may have, by second breakdown and
by the
rated voltage. Second breakdown is not a matter of temperature alone: it is known only where a data sheet
gives it, and where it is not known the answer is NaN, never an estimate.
"""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {"leakage": {"temperature_c": (25.0, 200.0)}}
"""Where one exponential describes the leakage (from memory)."""

BREAKDOWN_EXPONENT = 2.0
"""Fall of the second-breakdown current with voltage, ``I V^-n`` [1]; 1.5-2.5 in curves of power
transistors (from memory)."""

LEAKAGE_COEFFICIENT = 0.0693
"""Exponent of the leakage of silicon, doubling every 10 K [1/K] (common practice, no source)."""


def power_limit(junction_limit_c: Real, case_c: Real, junction_case: Real) -> Real:
    """Power that takes the junction from the case's temperature to its limit.

    Parameters
    ----------
    junction_limit_c, case_c : float or ndarray
        Junction limit and case temperature [degC].
    junction_case : float or ndarray
        Thermal resistance, above zero [K/W].

    Returns
    -------
    float or ndarray
        Power [W]; 0 where the case is hotter than the limit.

    Notes
    -----
    Derived: the derating line of data sheets.

    Examples
    --------
    >>> float(power_limit(200.0, 25.0, 0.875))
    200.0
    """
    return plain(np.maximum(junction_limit_c - np.asarray(case_c), 0.0) / junction_case)


def safe_current(
    voltage: Real,
    rated_current: Real,
    rated_voltage: Real,
    power: Real,
    breakdown_voltage: Real,
    breakdown_current: Real,
) -> Real:
    """Collector current that may flow for long at a collector-emitter voltage.

    Parameters
    ----------
    voltage : float or ndarray
        Collector-emitter voltage [V].
    rated_current, rated_voltage : float or ndarray
        Ratings [A], [V].
    power : float or ndarray
        Power that the junction may have, see `power_limit` [W].
    breakdown_voltage, breakdown_current : float or ndarray
        A point of the second-breakdown limit [V], [A]; NaN where it is not known.

    Returns
    -------
    float or ndarray
        Current [A]; 0 above the rated voltage; NaN where second breakdown is not known.

    Notes
    -----
    From the point the second-breakdown current falls as ``V^-n``, see `BREAKDOWN_EXPONENT`; below its
    voltage it rises by the same law. Derived: the smallest of the four limits.

    Examples
    --------
    >>> safe_current(60.0, 15.0, 60.0, 115.0, 40.0, 2.87).round(3)
    np.float64(1.276)
    >>> safe_current(10.0, 15.0, 60.0, 115.0, 40.0, 2.87)
    np.float64(11.5)
    """
    across = np.maximum(voltage, 1e-9)
    breakdown = breakdown_current * (breakdown_voltage / across) ** BREAKDOWN_EXPONENT
    least = np.minimum(np.minimum(rated_current, power / across), breakdown)
    return plain(np.where(np.asarray(voltage) > rated_voltage, 0.0 * breakdown, least))


def pulse_safe_current(
    voltage: Real, duration: Real, pulse_voltage: Real, pulse_current: Real, pulse_duration: Real
) -> Real:
    """Collector current that may flow for one pulse, where a data sheet gives a pulse at least as long.

    Parameters
    ----------
    voltage : float or ndarray
        Collector-emitter voltage [V].
    duration : float or ndarray
        Length of the pulse [s].
    pulse_voltage, pulse_current, pulse_duration : float or ndarray
        A point of the pulsed safe area [V], [A] and its length [s]; NaN where it is not known.

    Returns
    -------
    float or ndarray
        Current [A]; NaN where no pulse is known or the one that is known is shorter.

    Notes
    -----
    Shorter pulses are allowed at least as much; by how much is not guessed. The law of voltage is that of
    `safe_current`.

    Examples
    --------
    >>> float(pulse_safe_current(20.0, 1e-4, 40.0, 3.0, 1e-3))
    12.0
    >>> float(pulse_safe_current(20.0, 1e-2, 40.0, 3.0, 1e-3))
    nan
    """
    law = pulse_current * (pulse_voltage / np.maximum(voltage, 1e-9)) ** BREAKDOWN_EXPONENT
    return plain(np.where(np.asarray(duration) <= pulse_duration, law, np.nan))


def safe_area_margin(current: Real, allowed: Real) -> Real:
    """Distance to the safe area, ``1 - I / I_allowed``.

    Parameters
    ----------
    current, allowed : float or ndarray
        Collector current and what may flow, see `safe_current` [A].

    Returns
    -------
    float or ndarray
        Margin [1]: 1 without current, 0 at the limit, negative beyond; NaN where the area is not known.

    Notes
    -----
    Derived: a definition.

    Examples
    --------
    >>> float(safe_area_margin(3.0, 4.0))
    0.25
    """
    known = np.asarray(allowed, dtype=float)
    return plain(np.where(np.asarray(current) > 0.0, 1.0 - current / np.maximum(known, 1e-12), 1.0 + 0.0 *
    known))


def leakage(hot_leakage: Real, temperature_c: Real, hot_c: Real) -> Real:
    """Collector leakage of the transistor that is off, base tied to the emitter.

    Parameters
    ----------
    hot_leakage : float or ndarray
        Leakage at the hot temperature [A].
    temperature_c, hot_c : float or ndarray
        Junction and hot temperature [degC].

    Returns
    -------
    float or ndarray
        Leakage [A].

    Notes
    -----
    From the hot limit, which is nearer to its use, with `LEAKAGE_COEFFICIENT` (common practice): an upper
    estimate.

    Examples
    --------
    >>> round(float(leakage(5e-3, 80.0, 150.0)) * 1e6, 1)
    39.1
    """
    return hot_leakage * np.exp(LEAKAGE_COEFFICIENT * (temperature_c - hot_c))
