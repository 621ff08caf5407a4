"""Safe operating area of a bipolar power transistor, and its leakage.

The area is bounded by the rated current, by the power that the junction may have, by second breakdown and
by the rated voltage. Second breakdown is not a matter of temperature alone: it is known only where a data sheet
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

CURVES_C = 25.0
"""Case temperature at which data sheets give the safe area [degC] (from memory)."""

DIRECT_TIME = 1.0
"""Time from which a stress counts as direct current [s] (from memory: military tests of the safe area for direct
current last 1 s; the case of a power transistor warms in about that time)."""

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


def derating(junction_limit_c: Real, case_c: Real) -> Real:
    """Share of the power at a case of 25 degC that a hotter case leaves.

    Parameters
    ----------
    junction_limit_c, case_c : float or ndarray
        Junction limit and case temperature [degC].

    Returns
    -------
    float or ndarray
        Share [1], 0 to 1.

    Notes
    -----
    Derived: `power_limit` over the same at 25 degC, at which the curves of data sheets hold.

    Examples
    --------
    >>> derating(200.0, 60.0), derating(150.0, 150.0)
    (np.float64(0.8), np.float64(0.0))
    """
    room = np.asarray(junction_limit_c - np.asarray(case_c), dtype=float)
    return plain(np.clip(room / np.maximum(junction_limit_c - CURVES_C, 1e-9), 0.0, 1.0))


def breakdown_current(
    voltage: Real, near_voltage: Real, near_current: Real, far_voltage: Real, far_current: Real
) -> Real:
    """Second-breakdown limit for direct current.

    Parameters
    ----------
    voltage : float or ndarray
        Collector-emitter voltage [V].
    near_voltage, near_current : float or ndarray
        Point of the limit at the lower voltage [V], [A]; NaN where it is not known.
    far_voltage, far_current : float or ndarray
        Point at the higher voltage [V], [A]; NaN: only one is known.

    Returns
    -------
    float or ndarray
        Current [A]; NaN where no point is known.

    Notes
    -----
    A straight line on the doubly logarithmic paper of data sheets: through both points, or through one with
    `BREAKDOWN_EXPONENT`.

    Examples
    --------
    >>> round(float(breakdown_current(60.0, 40.0, 2.87, np.nan, np.nan)), 3)
    1.276
    >>> round(float(breakdown_current(55.0, 40.0, 3.75, 55.0, 0.9)), 3)
    0.9
    """
    across = np.maximum(voltage, 1e-9)
    steps = np.log(np.asarray(far_voltage, dtype=float) / near_voltage)
    fall = np.log(np.asarray(near_current, dtype=float) / far_current) / steps
    exponent = np.where(np.isfinite(fall), fall, BREAKDOWN_EXPONENT)
    return plain(near_current * (near_voltage / across) ** exponent)


def safe_current(
    voltage: Real, rated_current: Real, rated_voltage: Real, power: Real, breakdown: Real
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
    breakdown : float or ndarray
        Second-breakdown limit at that voltage, see `breakdown_current` [A]; NaN where it is not known, infinite
        where it shall not count.

    Returns
    -------
    float or ndarray
        Current [A]; 0 above the rated voltage; NaN where second breakdown is not known.

    Notes
    -----
    Derived: the smallest of the four limits.

    Examples
    --------
    >>> safe_current(60.0, 15.0, 60.0, 115.0, 1.276)
    np.float64(1.276)
    >>> safe_current(10.0, 15.0, 60.0, 115.0, np.inf)
    np.float64(11.5)
    """
    least = np.minimum(np.minimum(rated_current, power / np.maximum(voltage, 1e-9)), breakdown)
    return plain(np.where(np.asarray(voltage) > rated_voltage, np.where(np.isnan(least), np.nan, 0.0), least))


def pulse_safe_current(
    voltage: Real, pulse_voltage: Real, pulse_current: Real, rated_current: Real, rated_voltage: Real
) -> Real:
    """Collector current that may flow for one pulse of the length of a published point, or shorter.

    Parameters
    ----------
    voltage : float or ndarray
        Collector-emitter voltage [V].
    pulse_voltage, pulse_current : float or ndarray
        A point of the pulsed safe area [V], [A]; NaN where it is not known.
    rated_current, rated_voltage : float or ndarray
        Ratings for direct current [A], [V].

    Returns
    -------
    float or ndarray
        Current [A]; 0 above the rated voltage, NaN where no pulse is known.

    Notes
    -----
    At lower voltages than that of the point no more power than there (the limit may be one of heat), and no
    more current than the larger of the point's and the rated one; at higher voltages `BREAKDOWN_EXPONENT`.
    Each of these stays inside what one point proves for a curve that bends only once (derived). Shorter
    pulses are allowed at least as much; by how much is not guessed.

    Examples
    --------
    >>> pulse_safe_current(np.array([5.0, 20.0, 40.0, 60.0]), 40.0, 3.0, 10.0, 60.0).round(3).tolist()
    [10.0, 6.0, 3.0, 1.333]
    """
    across = np.maximum(voltage, 1e-9)
    ratio = np.asarray(pulse_voltage, dtype=float) / across
    law = pulse_current * np.where(ratio >= 1.0, ratio, ratio**BREAKDOWN_EXPONENT)
    most = np.minimum(law, np.maximum(rated_current, pulse_current))
    beyond = np.asarray(voltage) > rated_voltage
    return plain(np.where(beyond, 0.0 * most, most))


def safe_current_for(duration: Real, direct: Real, pulse: Real, pulse_duration: Real) -> Real:
    """Collector current that may flow once for some time.

    Parameters
    ----------
    duration : float or ndarray
        Length of the stress [s].
    direct : float or ndarray
        What may flow for long, see `safe_current` [A].
    pulse : float or ndarray
        What may flow for a pulse, see `pulse_safe_current` [A]; NaN where it is not known.
    pulse_duration : float or ndarray
        Length of that pulse [s]; NaN where it is not known.

    Returns
    -------
    float or ndarray
        Current [A]: that of the pulse up to its length, that for direct current from `DIRECT_TIME` on and
        where no pulse is known; between them the logarithm of the current falls with that of the time.

    Notes
    -----
    The curves of data sheets for 0.1, 1, 10 ms and so on lie about evenly on logarithmic paper (from memory).

    Examples
    --------
    >>> safe_current_for(np.array([1e-5, 1e-3, 1.0]), 1.0, 100.0, 1e-5).round(3).tolist()
    [100.0, 15.849, 1.0]
    """
    known = np.isfinite(pulse) & np.isfinite(pulse_duration)
    length = np.where(known, np.minimum(pulse_duration, 0.5 * DIRECT_TIME), 1e-3)
    share = np.log(np.maximum(duration, 1e-12) / length) / np.log(DIRECT_TIME / length)
    share = np.where(known, np.clip(share, 0.0, 1.0), 1.0)
    high = np.where(known, np.maximum(pulse, direct), direct)
    low, high = np.maximum(direct, 1e-12), np.maximum(high, 1e-12)
    return plain(np.where(share >= 1.0, direct, high ** (1.0 - share) * low**share))


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
    part = 1.0 - current / np.maximum(known, 1e-12)
    return plain(np.where(np.asarray(current) > 0.0, part, np.where(np.isnan(known), np.nan, 1.0)))


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
