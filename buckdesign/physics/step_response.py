"""Closed solutions of linear steps: what a choke and a capacitor do at switch-on (inrush, start-up)."""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real

RANGES: Ranges = {"rlc_peak_ratio": {"damping": (0.0, 1.0)}}
"""Only an underdamped circuit has a peak (circuit theory)."""


def rl_step_current(voltage: Real, resistance: Real, inductance: Real, time: Real) -> Real:
    """Current of a series R-L circuit after a voltage step.

    Parameters
    ----------
    voltage : float or ndarray
        Height of the step [V].
    resistance : float or ndarray
        Series resistance, not zero [ohm].
    inductance : float or ndarray
        Inductance [H].
    time : float or ndarray
        Time after the step [s].

    Returns
    -------
    float or ndarray
        Current ``V/R (1 - exp(-t R/L))`` [A].

    Notes
    -----
    Derived: circuit theory.

    Examples
    --------
    >>> round(float(rl_step_current(20.0, 0.1, 200e-6, 100e-6)), 5)
    9.75412
    """
    return -voltage / resistance * np.expm1(-time * resistance / inductance)


def rlc_damping(resistance: Real, inductance: Real, capacitance: Real) -> Real:
    """Damping ratio of a series R-L-C circuit, ``R/2 sqrt(C/L)``.

    Parameters
    ----------
    resistance : float or ndarray
        Series resistance [ohm].
    inductance : float or ndarray
        Inductance [H].
    capacitance : float or ndarray
        Capacitance [F].

    Returns
    -------
    float or ndarray
        Damping ratio; below 1 the capacitor voltage overshoots [1].

    Notes
    -----
    Derived: circuit theory.

    Examples
    --------
    >>> round(float(rlc_damping(0.1, 200e-6, 470e-6)), 6)
    0.076649
    """
    return resistance / 2.0 * np.sqrt(capacitance / inductance)


def rlc_peak_ratio(damping: Real) -> Real:
    """First peak of the capacitor voltage after a unit step on a series R-L-C circuit.

    Parameters
    ----------
    damping : float or ndarray
        Damping ratio of `rlc_damping`, below 1 [1].

    Returns
    -------
    float or ndarray
        ``1 + exp(-pi z / sqrt(1 - z^2))`` [1].

    Notes
    -----
    Derived: circuit theory.

    Examples
    --------
    >>> round(float(rlc_peak_ratio(0.0766485)), 5)
    1.78544
    """
    return 1.0 + np.exp(-np.pi * damping / np.sqrt(1.0 - np.square(damping)))


def rlc_peak_time(resistance: Real, inductance: Real, capacitance: Real) -> Real:
    """Time from the step to the first peak of the capacitor voltage.

    Parameters
    ----------
    resistance : float or ndarray
        Series resistance [ohm].
    inductance : float or ndarray
        Inductance [H].
    capacitance : float or ndarray
        Capacitance [F].

    Returns
    -------
    float or ndarray
        ``pi / sqrt(1/(L C) - R^2/(4 L^2))`` [s].

    Notes
    -----
    Derived: circuit theory.

    Examples
    --------
    >>> f"{rlc_peak_time(0.1, 200e-6, 470e-6):.6g}"
    '0.000966036'
    """
    return np.pi / np.sqrt(1.0 / (inductance * capacitance) - np.square(resistance / (2.0 * inductance)))
