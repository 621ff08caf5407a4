"""Capacitors: ESR from the loss factor, ripple loss, life of electrolytics, rating of solid tantalum."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from buckdesign.constants import BOLTZMANN_EV, ZERO_CELSIUS
from buckdesign.physics.arrays import Flag, Ranges, Real, plain

RANGES: Ranges = {"electrolytic_life": {"temperature_c": (40.0, 105.0)}}
"""Where makers let the 10 K rule be used (from memory)."""

HOURS_PER_YEAR = 8760.0
"""Hours of a common year [h]; derived."""

LIFE_CAP = 15.0 * HOURS_PER_YEAR
"""Longest life that is claimed whatever the formula says, 15 years [h] (makers' practice, from memory)."""

ESR_FREQUENCY_FACTOR = (0.3, 0.6)
"""ESR of an electrolytic at about 30 kHz over that at 100 Hz, low and high [1] (from memory)."""

ESR_TEMPERATURE_FACTOR: Mapping[float, tuple[float, float]] = {
    -25.0: (3.0, 8.0),
    0.0: (1.5, 2.0),
    20.0: (1.0, 1.0),
    85.0: (0.4, 0.6),
}
"""ESR of an electrolytic at a temperature [degC] over that at 20 degC, low and high [1] (from memory)."""

LOSS_FACTOR_FREQUENCY = 120.0
"""Frequency of the loss factor in the tables [Hz] (catalogues)."""

ESR_FREQUENCY = 100e3
"""Frequency of the ESR in the tables [Hz] (catalogues)."""

RATED_RIPPLE_RISE = 5.0
"""Rise of the core at rated ripple current [K]; makers allow 5-10 K (from memory)."""

TANTALUM_VOLTAGE_RATIO = 2.0
"""Rated over applied voltage of solid tantalum on a low-impedance rail (trade rule, from memory)."""


def esr_from_loss_factor(loss_factor: Real, capacitance: Real, frequency: Real) -> Real:
    """Equivalent series resistance, ``tan(delta) / (2 pi f C)``.

    Parameters
    ----------
    loss_factor : float or ndarray
        ``tan(delta)`` at the frequency [1].
    capacitance : float or ndarray
        Capacitance [F].
    frequency : float or ndarray
        Frequency of the loss factor, mostly 100 or 120 Hz [Hz].

    Returns
    -------
    float or ndarray
        ESR [ohm].

    Notes
    -----
    Derived: definition of the loss factor.

    Examples
    --------
    >>> round(esr_from_loss_factor(0.12, 1000e-6, 100.0), 6)
    0.190986
    """
    return loss_factor / (2.0 * np.pi * frequency * capacitance)


def esr_factor_at_temperature(temperature_c: Real) -> tuple[Real, Real]:
    """Band of the ESR over its value at 20 degC, between the points of `ESR_TEMPERATURE_FACTOR`.

    Parameters
    ----------
    temperature_c : float or ndarray
        Capacitor temperature; the end values hold outside the points [degC].

    Returns
    -------
    tuple of float or ndarray
        Low and high factor [1].

    Notes
    -----
    Points from memory; between them the logarithm of the factor is a line in temperature (derived).

    Examples
    --------
    >>> low, high = esr_factor_at_temperature(0.0)
    >>> round(float(low), 3), round(float(high), 3)
    (1.5, 2.0)
    """
    points = np.array(list(ESR_TEMPERATURE_FACTOR))
    bands = np.log(np.array(list(ESR_TEMPERATURE_FACTOR.values())))
    low, high = (np.exp(np.interp(temperature_c, points, bands[:, side])) for side in (0, 1))
    return plain(low), plain(high)


def esr_at_frequency(esr: Real, loss_factor: Real, capacitance: Real, frequency: Real) -> Real:
    """ESR between the loss factor at 120 Hz and the ESR at 100 kHz.

    Parameters
    ----------
    esr : float or ndarray
        ESR at 100 kHz [ohm].
    loss_factor : float or ndarray
        ``tan(delta)`` at 120 Hz [1]; NaN where not known: the ESR is taken as it is.
    capacitance : float or ndarray
        Capacitance [F].
    frequency : float or ndarray
        Frequency, above zero [Hz].

    Returns
    -------
    float or ndarray
        ESR [ohm].

    Notes
    -----
    Derived: a resistance (electrolyte, foils) and the loss of the oxide ``d/(2 pi f C)`` through both points.

    Examples
    --------
    >>> round(float(esr_at_frequency(0.06, 0.14, 470e-6, 120.0)), 4)
    0.3951
    >>> round(float(esr_at_frequency(0.06, 0.14, 470e-6, 20e3)), 4)
    0.0616
    """
    low = esr_from_loss_factor(loss_factor, capacitance, LOSS_FACTOR_FREQUENCY)
    oxide = np.maximum(low - esr, 0.0) / (1.0 / LOSS_FACTOR_FREQUENCY - 1.0 / ESR_FREQUENCY)
    oxide = np.where(np.isfinite(oxide), oxide, 0.0)
    return plain(esr + oxide * (1.0 / np.asarray(frequency) - 1.0 / ESR_FREQUENCY))


def ripple_loss(ripple_rms: Real, esr: Real) -> Real:
    """Loss by the ripple current, ``I^2 ESR``.

    Parameters
    ----------
    ripple_rms : float or ndarray
        Capacitor current, rms [A].
    esr : float or ndarray
        Equivalent series resistance [ohm].

    Returns
    -------
    float or ndarray
        Loss [W].

    Notes
    -----
    Derived: Joule's law.

    Examples
    --------
    >>> ripple_loss(2.0, 0.05)
    0.2
    """
    return ripple_rms * ripple_rms * esr


def ripple_rise(ripple_rms: Real, rated_ripple: Real, rated_rise: Real = RATED_RIPPLE_RISE) -> Real:
    """Rise of the core over ambient by the ripple current, the rated rise times the square of the load.

    Parameters
    ----------
    ripple_rms : float or ndarray
        Capacitor current, rms [A].
    rated_ripple : float or ndarray
        Rated ripple current [A].
    rated_rise : float or ndarray
        Rise at rated ripple current [K].

    Returns
    -------
    float or ndarray
        Rise [K].

    Notes
    -----
    Derived: loss is proportional to the square of the current.

    Examples
    --------
    >>> ripple_rise(1.0, 2.0)
    1.25
    """
    return rated_rise * (ripple_rms / rated_ripple) ** 2


def electrolytic_life_uncapped(rated_life: Real, rated_c: Real, temperature_c: Real) -> Real:
    """Life of an aluminium electrolytic by the 10 K rule, whatever it comes to.

    Parameters
    ----------
    rated_life : float or ndarray
        Life at the rated temperature, any unit of time [h].
    rated_c, temperature_c : float or ndarray
        Rated and working temperature [degC].

    Returns
    -------
    float or ndarray
        Life [h].

    References
    ----------
    Makers' application guides: doubling for each 10 K less.

    Examples
    --------
    >>> electrolytic_life_uncapped(2000.0, 105.0, 65.0)
    32000.0
    """
    return rated_life * 2.0 ** ((rated_c - temperature_c) / 10.0)


def electrolytic_life(rated_life: Real, rated_c: Real, temperature_c: Real) -> Real:
    """Life of an aluminium electrolytic by the 10 K rule, not above 15 years.

    Parameters
    ----------
    rated_life : float or ndarray
        Life at the rated temperature [h].
    rated_c, temperature_c : float or ndarray
        Rated and working temperature [degC].

    Returns
    -------
    float or ndarray
        Life that may be claimed [h], at most `LIFE_CAP`.

    References
    ----------
    Makers' application guides; the cap is makers' practice (from memory): seals age too.

    Examples
    --------
    >>> float(electrolytic_life(5000.0, 105.0, 40.0)) == LIFE_CAP
    True
    """
    return np.minimum(electrolytic_life_uncapped(rated_life, rated_c, temperature_c), LIFE_CAP)


def activation_energy(factor: Real, cool_c: Real, warm_c: Real) -> Real:
    """Activation energy that makes a rate grow by a factor between two temperatures.

    Parameters
    ----------
    factor : float or ndarray
        Rate at the warm over that at the cool temperature [1].
    cool_c, warm_c : float or ndarray
        Temperatures [degC].

    Returns
    -------
    float or ndarray
        Activation energy [eV].

    Notes
    -----
    Derived: Arrhenius' law.

    Examples
    --------
    >>> round(float(activation_energy(2.0, 85.0, 95.0)), 4)
    0.7876
    """
    inverse = 1.0 / (cool_c + ZERO_CELSIUS) - 1.0 / (warm_c + ZERO_CELSIUS)
    return BOLTZMANN_EV * np.log(factor) / inverse


def tantalum_rated_voltage(applied_voltage: Real) -> Real:
    """Smallest rated voltage of a solid tantalum capacitor on a low-impedance rail, twice the applied one.

    Parameters
    ----------
    applied_voltage : float or ndarray
        Largest voltage across it [V].

    Returns
    -------
    float or ndarray
        Rated voltage [V].

    Notes
    -----
    Trade rule (from memory): surges at first turn-on can ignite the part (A. Teverovsky, NASA/GSFC).

    Examples
    --------
    >>> tantalum_rated_voltage(15.0)
    30.0
    """
    return TANTALUM_VOLTAGE_RATIO * applied_voltage


def tantalum_is_safe(rated_voltage: Real, applied_voltage: Real) -> Flag:
    """Tell whether a solid tantalum capacitor is rated high enough for a low-impedance rail.

    Parameters
    ----------
    rated_voltage : float or ndarray
        Rated voltage [V].
    applied_voltage : float or ndarray
        Largest voltage across it [V].

    Returns
    -------
    bool or ndarray of bool
        False calls for a warning.

    Notes
    -----
    Trade rule (from memory), see `tantalum_rated_voltage`.

    Examples
    --------
    >>> tantalum_is_safe(25.0, 15.0), tantalum_is_safe(35.0, 15.0)
    (False, True)
    """
    return rated_voltage >= tantalum_rated_voltage(applied_voltage)
