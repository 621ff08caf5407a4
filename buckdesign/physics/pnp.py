"""The PNP switch: gain that falls with current, charge control, saturation, temperature.

Charge control: a stored base charge ``q`` carries the collector current ``i`` with
``i (1 + i/I_K) = beta q/tau``.
"""

from __future__ import annotations

import numpy as np

from buckdesign.constants import BOLTZMANN_EV, ZERO_CELSIUS
from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "gain": {"collector_current / gain_knee": (0.0, 4.0)},
    "gain_at_temperature": {"temperature_c": (-55.0, 175.0)},
    "charge_time_at_temperature": {"temperature_c": (0.0, 150.0)},
}
"""Gain law: up to about four times the knee current, beyond that the gain falls faster (from memory)."""

BASE_EMITTER_TEMPERATURE_COEFFICIENT = -2e-3
"""Change of the base-emitter voltage [V/K] (from memory, every textbook on bipolar transistors)."""

GAIN_TEMPERATURE_EXPONENT = 1.5
"""Gain rises with the absolute temperature to this power; 1.3-1.8 in use (from memory)."""

CHARGE_TIME_DOUBLING = 100.0
"""Rise of temperature that doubles charge and storage time [K]; about twice from 25 to 125 degC (from
memory)."""

TYPICAL_GAIN_RATIO = 1.6
"""Typical over guaranteed smallest gain (common practice, no source)."""

KNEE_SHARE = 2.5
"""Rated collector current over knee current where only one gain point is known (common practice, no
source)."""

REVERSE_GAIN = 4.0
"""Inverse current gain of a power transistor [1]; 2-10 in use (from memory)."""

LARGEST_FORCED_SHARE = 0.98
"""Forced over available gain up to which the saturation voltage is followed [1] (own choice: it grows
without bound at 1, where the transistor leaves saturation)."""

CHARGE_TIME_DEFAULT = 1.5e-6
"""Charge lifetime of a slow power PNP where nothing is known [s] (common practice, no source)."""


def gain(collector_current: Real, gain_low: Real, gain_knee: Real) -> Real:
    """Current gain that falls beyond a knee, ``h = beta / (1 + I/I_K)``.

    Parameters
    ----------
    collector_current : float or ndarray
        Collector current [A].
    gain_low : float or ndarray
        Gain at small current, ``beta`` [1].
    gain_knee : float or ndarray
        Knee current, infinite for none [A].

    Returns
    -------
    float or ndarray
        Gain [1].

    Notes
    -----
    Common practice: the first-order form of high-level injection (from memory).

    Examples
    --------
    >>> gain(8.0, 40.0, 8.0)
    20.0
    """
    return gain_low / (1.0 + collector_current / gain_knee)


def gain_law_from_two_points(
    gain_1: Real, current_1: Real, gain_2: Real, current_2: Real
) -> tuple[Real, Real]:
    """Gain at small current and knee current through two points of the gain curve.

    Parameters
    ----------
    gain_1, gain_2 : float or ndarray
        Gains [1].
    current_1, current_2 : float or ndarray
        Collector currents they hold at, not equal [A].

    Returns
    -------
    tuple of float or ndarray
        ``beta`` [1] and ``I_K`` [A]. No fall between the points: the mean gain and an infinite knee. Where
        the gain
        falls faster than the law can (product ``h I`` falls), both are NaN: use one point and
        `knee_from_rating`.

    Notes
    -----
    Derived: ``1/h`` is a line in ``I``.

    Examples
    --------
    >>> beta, knee = gain_law_from_two_points(40.0, 2.0, 25.0, 6.0)
    >>> round(float(beta), 3), round(float(knee), 3)
    (57.143, 4.667)
    """
    slope = (1.0 / np.asarray(gain_2) - 1.0 / np.asarray(gain_1)) / (current_2 - np.asarray(current_1))
    start = 1.0 / np.asarray(gain_1) - slope * current_1
    flat, steep = slope <= 0.0, start <= 1e-12 / np.asarray(gain_1)
    safe_slope, safe_start = np.where(flat, 1.0, slope), np.where(steep, np.nan, start)
    mean_gain = 2.0 / (1.0 / np.asarray(gain_1) + 1.0 / np.asarray(gain_2))
    low = np.where(flat, mean_gain, 1.0 / safe_start)
    return plain(low), plain(np.where(flat, np.inf, safe_start / safe_slope))


def knee_from_rating(rated_current: Real) -> Real:
    """Knee current where only one gain point is known: the rated collector current over 2.5.

    Parameters
    ----------
    rated_current : float or ndarray
        Largest continuous collector current of the type [A].

    Returns
    -------
    float or ndarray
        ``I_K`` [A].

    Notes
    -----
    Common practice, no source; see `KNEE_SHARE`.

    Examples
    --------
    >>> knee_from_rating(25.0)
    10.0
    """
    return rated_current / KNEE_SHARE


def gain_low_from_point(gain_at_current: Real, collector_current: Real, gain_knee: Real) -> Real:
    """Gain at small current from the gain at one current, the inverse of `gain`.

    Parameters
    ----------
    gain_at_current : float or ndarray
        Gain at that current [1].
    collector_current : float or ndarray
        Collector current [A].
    gain_knee : float or ndarray
        Knee current [A].

    Returns
    -------
    float or ndarray
        ``beta`` [1].

    Notes
    -----
    Derived from `gain`.

    Examples
    --------
    >>> gain_low_from_point(20.0, 10.0, 10.0)
    40.0
    """
    return gain_at_current * (1.0 + collector_current / gain_knee)


def base_current(collector_current: Real, gain_low: Real, gain_knee: Real) -> Real:
    """Base current that just carries a collector current, ``I (1 + I/I_K) / beta``.

    Parameters
    ----------
    collector_current : float or ndarray
        Collector current [A].
    gain_low : float or ndarray
        Gain at small current [1].
    gain_knee : float or ndarray
        Knee current [A].

    Returns
    -------
    float or ndarray
        Base current [A].

    Notes
    -----
    Derived from `gain`.

    Examples
    --------
    >>> base_current(8.0, 40.0, 8.0)
    0.4
    """
    return collector_current * (1.0 + collector_current / gain_knee) / gain_low


def collector_current(charge: Real, gain_low: Real, charge_time: Real, gain_knee: Real) -> Real:
    """Collector current that a stored base charge can carry.

    Parameters
    ----------
    charge : float or ndarray
        Stored base charge, not negative [C].
    gain_low : float or ndarray
        Gain at small current [1].
    charge_time : float or ndarray
        Charge lifetime ``tau`` [s].
    gain_knee : float or ndarray
        Knee current, infinite for none [A].

    Returns
    -------
    float or ndarray
        The root of ``i (1 + i/I_K) = beta q / tau`` [A], in a form that stays exact for small charges.

    Notes
    -----
    Derived: the quadratic's positive root.

    Examples
    --------
    >>> round(float(collector_current(0.4e-6, 40.0, 1e-6, 8.0)), 9)
    8.0
    """
    linear = gain_low * charge / charge_time
    return 2.0 * linear / (1.0 + np.sqrt(1.0 + 4.0 * linear / gain_knee))


def base_charge(collector_current: Real, gain_low: Real, charge_time: Real, gain_knee: Real) -> Real:
    """Stored base charge that carries a collector current, the inverse of `collector_current`.

    Parameters
    ----------
    collector_current : float or ndarray
        Collector current [A].
    gain_low : float or ndarray
        Gain at small current [1].
    charge_time : float or ndarray
        Charge lifetime ``tau`` [s].
    gain_knee : float or ndarray
        Knee current, infinite for none [A].

    Returns
    -------
    float or ndarray
        Charge ``tau i (1 + i/I_K) / beta`` [C].

    Notes
    -----
    Derived from `base_current`.

    Examples
    --------
    >>> f"{base_charge(8.0, 40.0, 1e-6, 8.0):.3g}"
    '4e-07'
    """
    return charge_time * base_current(collector_current, gain_low, gain_knee)


def charge_time_from_transition_frequency(gain_low: Real, transition_frequency: Real) -> Real:
    """Charge lifetime from the transition frequency, ``tau = beta / (2 pi f_T)``.

    Parameters
    ----------
    gain_low : float or ndarray
        Gain at small current [1].
    transition_frequency : float or ndarray
        Frequency at which the small-signal gain is one [Hz].

    Returns
    -------
    float or ndarray
        Charge lifetime [s].

    References
    ----------
    J. Millman and C. C. Halkias, Integrated Electronics, 1972 (from memory).

    Examples
    --------
    >>> f"{charge_time_from_transition_frequency(40.0, 4e6):.4g}"
    '1.592e-06'
    """
    return gain_low / (2.0 * np.pi * transition_frequency)


def saturation_resistance(saturation_drop: Real, collector_current: Real, threshold: Real) -> Real:
    """Slope of the saturated transistor from one data-sheet drop and an assumed threshold.

    Parameters
    ----------
    saturation_drop : float or ndarray
        Collector-emitter drop [V].
    collector_current : float or ndarray
        Collector current it holds at [A].
    threshold : float or ndarray
        Drop extrapolated to no current [V].

    Returns
    -------
    float or ndarray
        ``R_CE`` [ohm], not below zero.

    Notes
    -----
    Derived: ``V_CE = V_CE0 + R_CE I``.

    Examples
    --------
    >>> round(float(saturation_resistance(1.0, 15.0, 0.1)), 6)
    0.06
    """
    return np.maximum(saturation_drop - threshold, 0.0) / collector_current


def base_emitter_voltage(voltage_25c: Real, temperature_c: Real) -> Real:
    """Base-emitter voltage at a junction temperature, -2 mV/K.

    Parameters
    ----------
    voltage_25c : float or ndarray
        Base-emitter voltage at 25 degC [V].
    temperature_c : float or ndarray
        Junction temperature [degC].

    Returns
    -------
    float or ndarray
        Base-emitter voltage [V].

    Notes
    -----
    Coefficient from memory, see `BASE_EMITTER_TEMPERATURE_COEFFICIENT`.

    Examples
    --------
    >>> round(base_emitter_voltage(0.75, 75.0), 3)
    0.65
    """
    return voltage_25c + BASE_EMITTER_TEMPERATURE_COEFFICIENT * (temperature_c - 25.0)


def gain_at_temperature(gain_25c: Real, temperature_c: Real) -> Real:
    """Gain at a junction temperature, a power of the absolute temperature.

    Parameters
    ----------
    gain_25c : float or ndarray
        Gain at 25 degC [1].
    temperature_c : float or ndarray
        Junction temperature [degC].

    Returns
    -------
    float or ndarray
        Gain [1].

    Notes
    -----
    Exponent from memory, see `GAIN_TEMPERATURE_EXPONENT`.

    Examples
    --------
    >>> round(gain_at_temperature(40.0, 125.0), 2)
    61.73
    """
    return gain_25c * ((temperature_c + ZERO_CELSIUS) / (25.0 + ZERO_CELSIUS)) ** GAIN_TEMPERATURE_EXPONENT


def charge_time_at_temperature(charge_time_25c: Real, temperature_c: Real) -> Real:
    """Charge lifetime at a junction temperature, doubling in 100 K.

    Parameters
    ----------
    charge_time_25c : float or ndarray
        Charge lifetime at 25 degC [s].
    temperature_c : float or ndarray
        Junction temperature [degC].

    Returns
    -------
    float or ndarray
        Charge lifetime [s].

    Notes
    -----
    Doubling from memory, see `CHARGE_TIME_DOUBLING`.

    Examples
    --------
    >>> charge_time_at_temperature(1.0, 125.0)
    2.0
    """
    return charge_time_25c * 2.0 ** ((temperature_c - 25.0) / CHARGE_TIME_DOUBLING)


def saturation_with_drive(
    forced_gain: Real, gain: Real, temperature_c: Real, reverse_gain: Real = REVERSE_GAIN
) -> Real:
    """Saturation voltage of the junctions as it depends on the base drive, without the collector's
    resistance.

    Parameters
    ----------
    forced_gain : float or ndarray
        Collector over base current [1].
    gain : float or ndarray
        Gain at that collector current [1].
    temperature_c : float or ndarray
        Junction temperature [degC].
    reverse_gain : float or ndarray
        Inverse gain [1].

    Returns
    -------
    float or ndarray
        Voltage [V]; forced gains above `LARGEST_FORCED_SHARE` of the gain count as that.

    References
    ----------
    J. J. Ebers and J. L. Moll, Proc. IRE 42 (1954) 1761 (from memory):
    ``V_T ln((1 + (b + 1)/b_R) / (1 - b/h))`` with the forced gain ``b``.

    Examples
    --------
    >>> round(float(saturation_with_drive(10.0, 40.0, 26.85)), 4)
    0.0416
    """
    share = np.minimum(forced_gain / gain, LARGEST_FORCED_SHARE)
    thermal = BOLTZMANN_EV * (temperature_c + ZERO_CELSIUS)
    return thermal * np.log((1.0 + (share * gain + 1.0) / reverse_gain) / (1.0 - share))
