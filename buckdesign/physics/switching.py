"""Switching of the bipolar transistor by charge control: storage time, and loss of the crossover."""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {"storage_time": {"drive_current * gain_low / collector_current": (1.0, float("inf"))}}
"""Only a transistor that was driven into saturation stores excess charge (derived)."""


def storage_time(
    charge_time: Real, drive_current: Real, reverse_current: Real, collector_current: Real, gain_low: Real
) -> Real:
    """Time from the end of the drive until a saturated transistor leaves saturation.

    Parameters
    ----------
    charge_time : float or ndarray
        Charge lifetime [s].
    drive_current : float or ndarray
        Base current before, ``I_B1`` [A].
    reverse_current : float or ndarray
        Current that then pulls charge out of the base, ``I_B2`` [A].
    collector_current : float or ndarray
        Collector current [A].
    gain_low : float or ndarray
        Gain at that current [1].

    Returns
    -------
    float or ndarray
        ``t_s = tau ln((I_B1 + I_B2) / (I_C/beta + I_B2))`` [s]; 0 where the drive did not saturate.

    References
    ----------
    S. M. Sze, Physics of Semiconductor Devices; Millman and Halkias, Integrated Electronics (from memory,
    derived
    from the charge equation).

    Examples
    --------
    >>> f"{storage_time(1e-6, 0.3, 0.3, 3.0, 50.0):.6g}"
    '5.10826e-07'
    """
    excess = (drive_current + reverse_current) / (collector_current / gain_low + reverse_current)
    return charge_time * np.log(np.maximum(excess, 1.0))


def charge_time_from_storage(
    storage: Real, drive_current: Real, reverse_current: Real, collector_current: Real, gain_low: Real
) -> Real:
    """Charge lifetime from a data sheet's storage time, the inverse of `storage_time`.

    Parameters
    ----------
    storage : float or ndarray
        Storage time [s].
    drive_current, reverse_current : float or ndarray
        Base currents of the test, into and out of saturation [A].
    collector_current : float or ndarray
        Collector current of the test [A].
    gain_low : float or ndarray
        Gain at that current [1].

    Returns
    -------
    float or ndarray
        Charge lifetime [s]; NaN where the test did not saturate the transistor.

    Notes
    -----
    Derived from `storage_time`.

    Examples
    --------
    >>> f"{charge_time_from_storage(5.10826e-7, 0.3, 0.3, 3.0, 50.0):.5g}"
    '1e-06'
    """
    excess = (drive_current + reverse_current) / (collector_current / gain_low + reverse_current)
    return plain(storage / np.log(np.where(np.asarray(excess) > 1.0, excess, np.nan)))


def switching_loss_inductive(voltage: Real, current: Real, crossover_time: Real, frequency: Real) -> Real:
    """Switching loss with a clamped inductive load, ``V I (t_on + t_off)/2 f``.

    Parameters
    ----------
    voltage : float or ndarray
        Voltage that is switched, supply plus rectifier drop [V].
    current : float or ndarray
        Current that is switched [A].
    crossover_time : float or ndarray
        Sum of the turn-on and turn-off crossover times [s].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        Loss [W].

    References
    ----------
    R. W. Erickson and D. Maksimovic, Fundamentals of Power Electronics, 2nd ed. 2001, sec. 4.3 (from memory).

    Examples
    --------
    >>> round(switching_loss_inductive(20.9, 3.0, 1.1e-6, 30e3), 5)
    1.03455
    """
    return 0.5 * voltage * current * crossover_time * frequency


def switching_loss_resistive(voltage: Real, current: Real, crossover_time: Real, frequency: Real) -> Real:
    """Switching loss with a resistive load, a third of the clamped inductive one.

    Parameters
    ----------
    voltage : float or ndarray
        Voltage that is switched [V].
    current : float or ndarray
        Current that is switched [A].
    crossover_time : float or ndarray
        Sum of the turn-on and turn-off crossover times [s].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        ``V I t / 6 f`` [W].

    References
    ----------
    R. W. Erickson and D. Maksimovic, Fundamentals of Power Electronics, 2nd ed. 2001, sec. 4.3 (from memory).

    Examples
    --------
    >>> round(switching_loss_resistive(20.9, 3.0, 1.1e-6, 30e3), 5)
    0.34485
    """
    return voltage * current * crossover_time * frequency / 6.0
