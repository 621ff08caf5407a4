"""Rectifiers: forward drop, leakage and its feedback on temperature, reverse recovery, sharing in
parallel."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "leakage": {"temperature_c": (25.0, 175.0)},
}
"""Where one exponential describes the leakage (from memory)."""

TYPICAL_OF_LIMIT = 0.88
"""Typical forward drop over the fit through limit values (common practice; real parts lie 10-20 % below)."""

LEAKAGE_COEFFICIENT: Mapping[str, float] = {
    "Schottky": 0.055,
    "ultrafast": 0.0693,
    "fast recovery": 0.0693,
    "standard": 0.0693,
}
"""Exponent of the leakage current [1/K]: Schottky, application note AN869; PN, doubling every 10 K (common
practice). Limits at two temperatures must not be used for it: they are not one part."""

FORWARD_TEMPERATURE_COEFFICIENT: Mapping[str, tuple[float, float]] = {
    "Schottky": (-1.25e-3, 0.0),
    "ultrafast": (-2.0e-3, -1.0e-3),
    "fast recovery": (-2.0e-3, -1.0e-3),
    "standard": (-2.0e-3, -1.0e-3),
}
"""Change of the forward drop at small and at rated current [V/K] (from memory)."""


_SHARING_STEPS = 30


def threshold_and_slope(drop_1: Real, current_1: Real, drop_2: Real, current_2: Real) -> tuple[Real, Real]:
    """Straight forward characteristic through two points, ``V_F = V_T0 + r_d I``.

    Parameters
    ----------
    drop_1, drop_2 : float or ndarray
        Forward drops [V].
    current_1, current_2 : float or ndarray
        Forward currents they hold at, not equal [A].

    Returns
    -------
    tuple of float or ndarray
        Threshold [V] and slope [ohm].

    Notes
    -----
    Derived: a line through two points; through data-sheet limits it is a limit, see `TYPICAL_OF_LIMIT`.

    Examples
    --------
    >>> threshold, slope = threshold_and_slope(0.525, 3.0, 0.950, 9.4)
    >>> round(threshold, 5), round(slope, 6)
    (0.32578, 0.066406)
    """
    slope = (drop_2 - drop_1) / (current_2 - current_1)
    return drop_1 - slope * current_1, slope


def forward_drop(current: Real, threshold: Real, slope: Real, coefficient: Real, temperature_c: Real) -> Real:
    """Forward drop at a junction temperature.

    Parameters
    ----------
    current : float or ndarray
        Forward current [A].
    threshold, slope : float or ndarray
        Characteristic at 25 degC, threshold [V] and slope [ohm].
    coefficient : float or ndarray
        Change with temperature at that current [V/K], see `FORWARD_TEMPERATURE_COEFFICIENT`.
    temperature_c : float or ndarray
        Junction temperature [degC].

    Returns
    -------
    float or ndarray
        Forward drop [V].

    Notes
    -----
    Derived: a line in current and temperature.

    Examples
    --------
    >>> round(forward_drop(3.0, 0.9, 0.1, -2e-3, 75.0), 3)
    1.1
    """
    return threshold + slope * current + coefficient * (temperature_c - 25.0)


def conduction_loss(threshold: Real, slope: Real, mean_current: Real, rms_current: Real) -> Real:
    """Conduction loss ``V_T0 I_mean + r_d I_rms^2``.

    Parameters
    ----------
    threshold, slope : float or ndarray
        Forward characteristic, threshold [V] and slope [ohm].
    mean_current, rms_current : float or ndarray
        Forward current over the whole period, mean and rms [A].

    Returns
    -------
    float or ndarray
        Loss [W].

    Notes
    -----
    Derived: the mean of ``v i``.

    Examples
    --------
    >>> round(conduction_loss(0.325781, 0.0664062, 0.75, 1.502498), 6)
    0.394248
    """
    return threshold * mean_current + slope * rms_current * rms_current


def leakage(reference_leakage: Real, temperature_c: Real, reference_c: Real, coefficient: Real) -> Real:
    """Leakage current at a junction temperature, ``I_R0 exp(c (T - T_0))``.

    Parameters
    ----------
    reference_leakage : float or ndarray
        Leakage at the reference temperature [A].
    temperature_c, reference_c : float or ndarray
        Junction and reference temperature [degC].
    coefficient : float or ndarray
        Exponent ``c`` [1/K], see `LEAKAGE_COEFFICIENT`.

    Returns
    -------
    float or ndarray
        Leakage [A].

    References
    ----------
    Application note AN869 rev. 2 (2004).

    Examples
    --------
    >>> round(float(leakage(2e-3, 100.0, 25.0, 0.055)) * 1e3, 2)
    123.74
    """
    return reference_leakage * np.exp(coefficient * (temperature_c - reference_c))


def doubling_interval(coefficient: Real) -> Real:
    """Rise of temperature that doubles the leakage, ``ln 2 / c``; its own inverse.

    Parameters
    ----------
    coefficient : float or ndarray
        Exponent of the leakage [1/K], or a doubling interval [K].

    Returns
    -------
    float or ndarray
        Doubling interval [K], or the exponent [1/K].

    Notes
    -----
    Derived from `leakage`.

    Examples
    --------
    >>> round(doubling_interval(0.055), 1)
    12.6
    """
    return float(np.log(2.0)) / coefficient


def leakage_coefficient(leakage_1: Real, celsius_1: Real, leakage_2: Real, celsius_2: Real) -> Real:
    """Exponent of the leakage from two typical values of one part, never from two limits.

    Parameters
    ----------
    leakage_1, leakage_2 : float or ndarray
        Leakage currents [A].
    celsius_1, celsius_2 : float or ndarray
        Junction temperatures they hold at, not equal [degC].

    Returns
    -------
    float or ndarray
        Exponent ``c`` [1/K].

    Notes
    -----
    Derived from `leakage`.

    Examples
    --------
    >>> round(float(leakage_coefficient(0.1e-3, 40.0, 10e-3, 100.0)), 5)
    0.07675
    """
    return np.log(leakage_2 / leakage_1) / (celsius_2 - celsius_1)


def leakage_loss(reverse_voltage: Real, leakage_current: Real, blocking_share: Real) -> Real:
    """Loss by leakage while the rectifier blocks.

    Parameters
    ----------
    reverse_voltage : float or ndarray
        Voltage that it blocks [V].
    leakage_current : float or ndarray
        Leakage at the junction temperature [A].
    blocking_share : float or ndarray
        Share of the period in which it blocks [1].

    Returns
    -------
    float or ndarray
        Loss [W].

    Notes
    -----
    Derived: the mean of ``v i``.

    Examples
    --------
    >>> round(leakage_loss(20.0, 5e-3, 0.5), 3)
    0.05
    """
    return reverse_voltage * leakage_current * blocking_share


def parallel_share(current: Real, threshold_1: Real, slope_1: Real, threshold_2: Real, slope_2: Real) -> Real:
    """Current of the first of two rectifiers in parallel.

    Parameters
    ----------
    current : float or ndarray
        Current of both together [A].
    threshold_1, threshold_2 : float or ndarray
        Thresholds [V].
    slope_1, slope_2 : float or ndarray
        Slopes, not both zero [ohm].

    Returns
    -------
    float or ndarray
        ``(I r_2 + V_2 - V_1) / (r_1 + r_2)``, between none and all of the current [A].

    Notes
    -----
    Derived: equal drops.

    Examples
    --------
    >>> round(float(parallel_share(3.0, 0.30, 0.06, 0.35, 0.06)), 5)
    1.91667
    """
    share = (current * slope_2 + threshold_2 - threshold_1) / (slope_1 + slope_2)
    return plain(np.minimum(np.maximum(share, 0.0), current))


def hottest_piece(
    current: Real, pieces: Real, threshold: Real, slope: Real, spread: Real, coefficient: Real, path: Real
) -> tuple[Real, Real]:
    """Current and extra rise of the piece of lowest drop among rectifiers in parallel.

    Parameters
    ----------
    current : float or ndarray
        Mean current of all together [A].
    pieces : float or ndarray
        Pieces in parallel, 1 or more [1].
    threshold, slope : float or ndarray
        Forward characteristic of the others [V], [ohm].
    spread : float or ndarray
        How far the threshold of the piece lies below theirs at equal temperature [V].
    coefficient : float or ndarray
        Change of the forward drop with temperature [V/K].
    path : float or ndarray
        Thermal resistance of one piece that the others do not share: junction to sink on a common sink,
        junction to ambient where each is cooled by itself [K/W].

    Returns
    -------
    tuple of float or ndarray
        Current of the piece [A], and how much warmer it is than the others [K]. With a negative
        coefficient the hotter piece draws more; where nothing stops that it carries all of the current.

    Notes
    -----
    Derived: `parallel_share` with the difference of temperatures in balance, by a fixed number of steps.

    Examples
    --------
    >>> amperes, warmer = hottest_piece(3.0, 2.0, 0.35, 0.06, 0.05, -1e-3, 0.0)
    >>> round(float(amperes), 5), round(float(warmer), 3)
    (1.91667, 0.0)
    >>> amperes, warmer = hottest_piece(3.0, 2.0, 0.35, 0.06, 0.05, -1e-3, 40.0)
    >>> round(float(amperes), 3), round(float(warmer), 1)
    (2.071, 18.5)
    """
    others = np.maximum(np.asarray(pieces) - 1.0, 1.0)
    own_slope = np.maximum(slope, 1e-6)
    warmer: Real = np.zeros(np.broadcast(current, pieces, threshold, slope, spread, path).shape)
    share: Real = current
    for _ in range(_SHARING_STEPS):
        low = threshold - spread + coefficient * warmer
        share = parallel_share(current, low, own_slope, threshold, own_slope / others)
        rest = (current - share) / others
        heat = low * share + own_slope * share * share
        heat_rest = threshold * rest + own_slope * rest * rest
        warmer = path * np.maximum(heat - heat_rest, 0.0)
    alone = np.asarray(pieces) <= 1.0
    return plain(np.where(alone, current, share)), plain(np.where(alone, 0.0, warmer))


def capacitance_loss(capacitance: Real, reverse_voltage: Real, frequency: Real) -> Real:
    """Loss of charging the junction capacitance through the switch once a period, ``C V^2 f / 2``.

    Parameters
    ----------
    capacitance : float or ndarray
        Junction capacitance, taken as constant [F].
    reverse_voltage : float or ndarray
        Voltage it is charged to [V].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        Loss, in the switch [W].

    Notes
    -----
    Derived: the energy lost in charging a capacitor through a resistance.

    Examples
    --------
    >>> round(capacitance_loss(250e-12, 20.0, 30e3) * 1e3, 3)
    1.5
    """
    return 0.5 * capacitance * reverse_voltage * reverse_voltage * frequency
