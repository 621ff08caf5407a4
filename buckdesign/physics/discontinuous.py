"""Step-down stage in discontinuous conduction, and its boundary; ideal parts.

Source: R. W. Erickson and D. Maksimovic, Fundamentals of Power Electronics, 2nd ed. 2001, chapter 5 and
appendix A (from memory, every relation checked by derivation), called E&M below.
"""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {"conversion_ratio_dcm": {"k / (1 - duty)": (0.0, 1.0)}}
"""Above this the choke current no longer reaches zero (E&M sec. 5.1)."""


def conduction_parameter(inductance: Real, frequency: Real, load_resistance: Real) -> Real:
    """Dimensionless load ``K = 2 L f / R``; conduction is continuous where ``K > 1 - D``.

    Parameters
    ----------
    inductance : float or ndarray
        Choke inductance [H].
    frequency : float or ndarray
        Switching frequency [Hz].
    load_resistance : float or ndarray
        Load [ohm].

    Returns
    -------
    float or ndarray
        ``K`` [1].

    References
    ----------
    E&M eq. in sec. 5.1.

    Examples
    --------
    >>> round(conduction_parameter(200e-6, 30e3, 48.0), 6)
    0.25
    """
    return 2.0 * inductance * frequency / load_resistance


def boundary_current(supply_voltage: Real, output_voltage: Real, inductance: Real, frequency: Real) -> Real:
    """Smallest load current with continuous conduction, half the ripple current.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    inductance : float or ndarray
        Choke inductance [H].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        Load current at the boundary [A].

    References
    ----------
    E&M sec. 5.1.

    Examples
    --------
    >>> round(boundary_current(20.0, 15.0, 200e-6, 30e3), 6)
    0.3125
    """
    duty = output_voltage / supply_voltage
    return (supply_voltage - output_voltage) * duty / (2.0 * inductance * frequency)


def conversion_ratio_dcm(k: Real, duty: Real) -> Real:
    """Ratio of output to supply voltage in discontinuous conduction.

    Parameters
    ----------
    k : float or ndarray
        Conduction parameter, below ``1 - D`` [1].
    duty : float or ndarray
        Duty of the switch [1].

    Returns
    -------
    float or ndarray
        ``M = 2 / (1 + sqrt(1 + 4 K / D^2))`` [1].

    References
    ----------
    E&M sec. 5.2.

    Examples
    --------
    >>> round(float(conversion_ratio_dcm(0.1, 0.5)), 6)
    0.765564
    """
    return 2.0 / (1.0 + np.sqrt(1.0 + 4.0 * k / np.square(duty)))


def conversion_ratio(k: Real, duty: Real) -> Real:
    """Ratio of output to supply voltage in whichever conduction mode holds.

    Parameters
    ----------
    k : float or ndarray
        Conduction parameter [1].
    duty : float or ndarray
        Duty of the switch [1].

    Returns
    -------
    float or ndarray
        ``D`` where ``K >= 1 - D``, else the ratio of `conversion_ratio_dcm` [1].

    References
    ----------
    E&M sec. 5.2.

    Examples
    --------
    >>> float(conversion_ratio(2.0, 0.5))
    0.5
    """
    return plain(np.where(np.asarray(k) >= 1.0 - duty, duty, conversion_ratio_dcm(k, duty)))


def duty_dcm(
    supply_voltage: Real, output_voltage: Real, inductance: Real, frequency: Real, load_current: Real
) -> Real:
    """Duty of the switch in discontinuous conduction.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    inductance : float or ndarray
        Choke inductance [H].
    frequency : float or ndarray
        Switching frequency [Hz].
    load_current : float or ndarray
        Load, below `boundary_current` [A].

    Returns
    -------
    float or ndarray
        ``D1 = sqrt(2 L f I V_o / (V_in (V_in - V_o)))`` [1].

    References
    ----------
    E&M ch. 5.

    Examples
    --------
    >>> round(float(duty_dcm(20.0, 15.0, 200e-6, 20e3, 0.1)), 5)
    0.34641
    """
    squared_volts = supply_voltage * (supply_voltage - output_voltage)
    return np.sqrt(2.0 * inductance * frequency * load_current * output_voltage / squared_volts)


def rectifier_share_dcm(supply_voltage: Real, output_voltage: Real, duty: Real) -> Real:
    """Share of the period in which the rectifier conducts, ``D2 = D1 (V_in - V_o) / V_o``.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    duty : float or ndarray
        Duty of the switch [1].

    Returns
    -------
    float or ndarray
        Conducting share of the rectifier [1].

    References
    ----------
    E&M ch. 5.

    Examples
    --------
    >>> round(rectifier_share_dcm(20.0, 15.0, 0.34641016), 5)
    0.11547
    """
    return duty * (supply_voltage - output_voltage) / output_voltage


def peak_current_dcm(
    supply_voltage: Real, output_voltage: Real, duty: Real, inductance: Real, frequency: Real
) -> Real:
    """Peak of the choke current that starts from zero, ``(V_in - V_o) D1 / (L f)``.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    duty : float or ndarray
        Duty of the switch [1].
    inductance : float or ndarray
        Choke inductance [H].
    frequency : float or ndarray
        Switching frequency [Hz].

    Returns
    -------
    float or ndarray
        Peak choke current [A].

    References
    ----------
    E&M ch. 5.

    Examples
    --------
    >>> round(peak_current_dcm(20.0, 15.0, 0.34641016, 200e-6, 20e3), 6)
    0.433013
    """
    return (supply_voltage - output_voltage) * duty / (inductance * frequency)


def triangle_rms(peak: Real, share: Real) -> Real:
    """Rms of a triangular pulse that starts and ends at zero, ``I_pk sqrt(share / 3)``.

    Parameters
    ----------
    peak : float or ndarray
        Peak current [A].
    share : float or ndarray
        Share of the period that the pulse lasts: ``D1`` for the switch, ``D2`` for the rectifier, the sum of
        both for the choke [1].

    Returns
    -------
    float or ndarray
        Current, rms [A].

    References
    ----------
    E&M app. A.

    Examples
    --------
    >>> round(float(triangle_rms(0.433013, 0.34641016)), 6)
    0.147142
    """
    return peak * np.sqrt(share / 3.0)


def output_capacitor_rms_dcm(choke_rms: Real, load_current: Real) -> Real:
    """Output capacitor current, rms: what the choke current has beside its mean.

    Parameters
    ----------
    choke_rms : float or ndarray
        Choke current, rms [A].
    load_current : float or ndarray
        Load current, the mean of the choke current [A].

    Returns
    -------
    float or ndarray
        Capacitor current, rms [A].

    References
    ----------
    E&M app. A.

    Examples
    --------
    >>> round(float(output_capacitor_rms_dcm(0.1699044, 0.1)), 5)
    0.13736
    """
    return np.sqrt(np.square(choke_rms) - np.square(load_current))
