"""Step-down stage in continuous conduction: duty, ripple current, rms currents, output ripple.

Source: R. W. Erickson and D. Maksimovic, Fundamentals of Power Electronics, 2nd ed. 2001, chapters 2, 3 and
appendix A (from memory, every relation checked by derivation), called E&M below. Constant drops and
inductance.
"""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "duty_ccm": {"duty": (0.0, 1.0)},
    "output_ripple": {"duty": (1e-6, 1.0 - 1e-6)},
}
"""Where the models hold: a stage that steps down has a duty between 0 and 1 (derived)."""


def choke_voltage_on(
    supply_voltage: Real,
    output_voltage: Real,
    current: Real,
    saturation_voltage: Real = 0.0,
    choke_resistance: Real = 0.0,
) -> Real:
    """Voltage across the choke while the switch conducts, ``V_in - V_sat - V_o - I R_L``.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    current : float or ndarray
        Mean choke current [A].
    saturation_voltage : float or ndarray
        Drop of the conducting switch [V].
    choke_resistance : float or ndarray
        Winding resistance [ohm].

    Returns
    -------
    float or ndarray
        Voltage that lets the choke current rise [V].

    References
    ----------
    E&M ch. 3.

    Examples
    --------
    >>> round(choke_voltage_on(20.0, 15.0, 3.0, 0.6, 0.05), 6)
    4.25
    """
    return supply_voltage - saturation_voltage - output_voltage - current * choke_resistance


def choke_voltage_off(
    output_voltage: Real, current: Real, forward_drop: Real = 0.0, choke_resistance: Real = 0.0
) -> Real:
    """Voltage across the choke while the rectifier conducts, ``V_o + V_D + I R_L``.

    Parameters
    ----------
    output_voltage : float or ndarray
        Output [V].
    current : float or ndarray
        Mean choke current [A].
    forward_drop : float or ndarray
        Drop of the conducting rectifier [V].
    choke_resistance : float or ndarray
        Winding resistance [ohm].

    Returns
    -------
    float or ndarray
        Voltage that lets the choke current fall, counted positive [V].

    References
    ----------
    E&M ch. 3.

    Examples
    --------
    >>> round(choke_voltage_off(15.0, 3.0, 0.9, 0.05), 6)
    16.05
    """
    return output_voltage + forward_drop + current * choke_resistance


def duty_ccm(voltage_on: Real, voltage_off: Real) -> Real:
    """Share of the period in which the switch conducts, from the volt-second balance of the choke.

    Parameters
    ----------
    voltage_on, voltage_off : float or ndarray
        Choke voltages of `choke_voltage_on` and `choke_voltage_off` [V].

    Returns
    -------
    float or ndarray
        Duty ``D = v_off / (v_on + v_off)`` [1]; the current cancels the winding drop in the sum, so that
        ``D = (V_o + V_D + I R_L) / (V_in - V_sat + V_D)``.

    References
    ----------
    E&M ch. 3.

    Examples
    --------
    >>> round(duty_ccm(4.25, 16.05), 6)
    0.79064
    """
    return voltage_off / (voltage_on + voltage_off)


def volt_seconds(voltage_on: Real, duty: Real, frequency: Real) -> Real:
    """Volt-second product of the choke in one conducting interval, ``v_on D / f``.

    Parameters
    ----------
    voltage_on : float or ndarray
        Choke voltage while the switch conducts [V].
    duty : float or ndarray
        Duty [1].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        Volt-second product [V s].

    References
    ----------
    E&M sec. 2.2.

    Examples
    --------
    >>> f"{volt_seconds(15.0, 0.4, 52e3):.4g}"
    '0.0001154'
    """
    return voltage_on * duty / frequency


def ripple_current(voltage_on: Real, duty: Real, inductance: Real, frequency: Real) -> Real:
    """Choke ripple current, peak to peak, ``v_on D / (L f)``.

    Parameters
    ----------
    voltage_on : float or ndarray
        Choke voltage while the switch conducts [V].
    duty : float or ndarray
        Duty [1].
    inductance : float or ndarray
        Choke inductance [H].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        Ripple current, peak to peak [A].

    References
    ----------
    E&M sec. 2.2.

    Examples
    --------
    >>> round(ripple_current(4.25, 0.790640394, 200e-6, 30e3), 6)
    0.560037
    """
    return voltage_on * duty / (inductance * frequency)


def inductance_for_ripple(voltage_on: Real, duty: Real, ripple: Real, frequency: Real) -> Real:
    """Inductance that gives a wanted ripple current, the inverse of `ripple_current`.

    Parameters
    ----------
    voltage_on : float or ndarray
        Choke voltage while the switch conducts [V].
    duty : float or ndarray
        Duty [1].
    ripple : float or ndarray
        Ripple current, peak to peak [A].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        Inductance [H].

    References
    ----------
    E&M sec. 2.2.

    Examples
    --------
    >>> f"{inductance_for_ripple(4.25, 0.790640394, 0.5600369, 30e3):.4g}"
    '0.0002'
    """
    return voltage_on * duty / (ripple * frequency)


def choke_rms(current: Real, ripple: Real) -> Real:
    """Choke current, rms, ``sqrt(I^2 + dI^2/12)``.

    Parameters
    ----------
    current : float or ndarray
        Mean choke current [A].
    ripple : float or ndarray
        Ripple current, peak to peak [A].

    Returns
    -------
    float or ndarray
        Choke current, rms [A].

    References
    ----------
    E&M app. A.

    Examples
    --------
    >>> round(float(choke_rms(3.0, 0.6)), 4)
    3.005
    """
    return np.sqrt(np.square(current) + np.square(ripple) / 12.0)


def conducting_rms(current: Real, ripple: Real, share: Real) -> Real:
    """Rms current of a device that carries the choke current for a share of the period.

    Parameters
    ----------
    current : float or ndarray
        Mean choke current [A].
    ripple : float or ndarray
        Ripple current, peak to peak [A].
    share : float or ndarray
        Conducting share: the duty for the switch, one minus the duty for the rectifier [1].

    Returns
    -------
    float or ndarray
        Device current, rms [A]: ``sqrt(share) I_L,rms``; its mean is ``share I``.

    References
    ----------
    E&M app. A.

    Examples
    --------
    >>> round(float(conducting_rms(3.0, 0.6, 0.75)), 4), round(float(conducting_rms(3.0, 0.6, 0.25)), 4)
    (2.6024, 1.5025)
    """
    return np.sqrt(share) * choke_rms(current, ripple)


def output_capacitor_rms(ripple: Real) -> Real:
    """Output capacitor current, rms, with a constant load current, ``dI / sqrt(12)``.

    Parameters
    ----------
    ripple : float or ndarray
        Choke ripple current, peak to peak [A].

    Returns
    -------
    float or ndarray
        Capacitor current, rms [A].

    References
    ----------
    E&M app. A.

    Examples
    --------
    >>> round(output_capacitor_rms(0.6), 6)
    0.173205
    """
    return ripple / float(np.sqrt(12.0))


def input_capacitor_rms(current: Real, ripple: Real, duty: Real) -> Real:
    """Input capacitor current, rms, when the supply delivers only the mean.

    Parameters
    ----------
    current : float or ndarray
        Mean choke current [A].
    ripple : float or ndarray
        Ripple current, peak to peak [A].
    duty : float or ndarray
        Duty [1].

    Returns
    -------
    float or ndarray
        Capacitor current, rms [A]: ``sqrt(D (I^2 (1-D) + dI^2/12))``.

    References
    ----------
    E&M app. A.

    Examples
    --------
    >>> round(float(input_capacitor_rms(3.0, 0.6, 0.75)), 5)
    1.30767
    """
    return np.sqrt(duty * (np.square(current) * (1.0 - duty) + np.square(ripple) / 12.0))


def output_ripple(ripple: Real, frequency: Real, duty: Real, capacitance: Real, esr: Real) -> Real:
    """Output ripple voltage, peak to peak, of capacitance and ESR together, exactly.

    Parameters
    ----------
    ripple : float or ndarray
        Choke ripple current, peak to peak [A].
    frequency : float or ndarray
        Switching frequency [Hz].
    duty : float or ndarray
        Duty, between 0 and 1 [1].
    capacitance : float or ndarray
        Output capacitance [F].
    esr : float or ndarray
        Equivalent series resistance [ohm].

    Returns
    -------
    float or ndarray
        Ripple, peak to peak [V].

    Notes
    -----
    Derived: the output is ``v_C + r i`` with a triangular current, a parabola in each interval. With
    ``a = D/f``, ``b = (1-D)/f``, ``lo`` and ``hi`` the smaller and the larger of them:

    * ``r C <= lo/2`` (both extremes inside): ``dI (1/(8 f C) + r^2 C/2 (1/a + 1/b))``
    * ``r C <= hi/2`` (one inside): ``dI (r/2 + hi/(8 C) + r^2 C/(2 hi))``
    * else (extremes at the corners): ``dI r``

    Examples
    --------
    >>> round(float(output_ripple(0.6, 30e3, 0.75, 100e-6, 0.05)), 6)
    0.03675
    """
    on, off = np.asarray(duty / frequency), np.asarray((1.0 - duty) / frequency)
    low, high = np.minimum(on, off), np.maximum(on, off)
    lag = esr * np.asarray(capacitance)
    both = 1.0 / (8.0 * frequency * capacitance) + esr * lag / 2.0 * (1.0 / on + 1.0 / off)
    one = esr / 2.0 + high / (8.0 * capacitance) + esr * lag / (2.0 * high)
    corner = esr + 0.0 * high
    factor = np.where(lag <= low / 2.0, both, np.where(lag <= high / 2.0, one, corner))
    return plain(ripple * factor)
