"""Ripple (hysteretic) regulation with an ideal comparator: closed forms for frequency and mean output.

Slopes are those of the choke current: ``m1 = (V_in - V_o)/L`` rising, ``m2 = V_o/L`` falling. ``H`` is the
comparator's whole window referred to the output. These forms take the controller as a comparator; a
three-terminal regulator is slower, and only the loop model says what it does.
"""

from __future__ import annotations

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "ripple_current_exact": {"2 esr capacitance / longest interval": (1.0, float("inf"))},
    "frequency_esr": {"2 esr capacitance / longest interval": (1.0, float("inf"))},
}
"""Where the thresholds are met on the rising and falling branch (derived; sufficient, not necessary: against
event-driven simulation the exact form still held at ``r C`` = 2.2 delays and broke at 1.3 delays)."""


def rise_slope(supply_voltage: Real, output_voltage: Real, inductance: Real) -> Real:
    """Slope of the choke current while the switch conducts, ``m1 = (V_in - V_o)/L``.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    inductance : float or ndarray
        Choke inductance [H].

    Returns
    -------
    float or ndarray
        Slope [A/s].

    Notes
    -----
    Derived: ``L di/dt = v``.

    Examples
    --------
    >>> round(rise_slope(20.0, 15.0, 200e-6), 3)
    25000.0
    """
    return (supply_voltage - output_voltage) / inductance


def fall_slope(output_voltage: Real, inductance: Real) -> Real:
    """Slope of the choke current while the rectifier conducts, counted positive, ``m2 = V_o/L``.

    Parameters
    ----------
    output_voltage : float or ndarray
        Output [V].
    inductance : float or ndarray
        Choke inductance [H].

    Returns
    -------
    float or ndarray
        Slope [A/s].

    Notes
    -----
    Derived: ``L di/dt = v``.

    Examples
    --------
    >>> round(fall_slope(15.0, 200e-6), 3)
    75000.0
    """
    return output_voltage / inductance


def frequency_of_ripple(ripple: Real, rising: Real, falling: Real) -> Real:
    """Frequency of a triangular current, ``1 / (dI (1/m1 + 1/m2))``.

    Parameters
    ----------
    ripple : float or ndarray
        Ripple current, peak to peak [A].
    rising, falling : float or ndarray
        Slopes, both positive [A/s].

    Returns
    -------
    float or ndarray
        Frequency [Hz]; 0 where the ripple current is infinite.

    Notes
    -----
    Derived: the sum of both intervals is the period.

    Examples
    --------
    >>> round(frequency_of_ripple(0.3, 25e3, 75e3), 3)
    62500.0
    """
    return 1.0 / (ripple * (1.0 / rising + 1.0 / falling))


def frequency_esr(
    supply_voltage: Real, output_voltage: Real, inductance: Real, esr: Real, window: Real
) -> Real:
    """Frequency of an ideal comparator that sees only the ESR's ripple.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    inductance : float or ndarray
        Choke inductance [H].
    esr : float or ndarray
        Equivalent series resistance of the output capacitor [ohm].
    window : float or ndarray
        Comparator window at the output [V].

    Returns
    -------
    float or ndarray
        ``f = V_o (V_in - V_o) r / (V_in L H)`` [Hz].

    References
    ----------
    Data sheet SLVS171A (1999) p. 21, simplified form.

    Examples
    --------
    >>> round(frequency_esr(20.0, 15.0, 200e-6, 0.1, 0.03), 3)
    62500.0
    """
    return output_voltage * (supply_voltage - output_voltage) * esr / (supply_voltage * inductance * window)


def frequency_esr_delay(
    supply_voltage: Real, output_voltage: Real, inductance: Real, esr: Real, window: Real, delay: Real
) -> Real:
    """Frequency of a comparator with one delay for both edges that sees only the ESR's ripple.

    Parameters
    ----------
    supply_voltage, output_voltage : float or ndarray
        Supply and output [V].
    inductance : float or ndarray
        Choke inductance [H].
    esr : float or ndarray
        Equivalent series resistance of the output capacitor [ohm].
    window : float or ndarray
        Comparator window at the output [V].
    delay : float or ndarray
        Delay from crossing a threshold to the switch acting [s].

    Returns
    -------
    float or ndarray
        ``f = (V_o/V_in) (V_in - V_o) r / (H L + V_in t_d r)`` [Hz].

    References
    ----------
    Data sheet SNVS239A (2005) eq. (4).

    Examples
    --------
    >>> round(frequency_esr_delay(20.0, 15.0, 200e-6, 0.1, 0.03, 2e-6), 3)
    37500.0
    """
    swing = output_voltage * (supply_voltage - output_voltage) * esr / supply_voltage
    return swing / (window * inductance + supply_voltage * delay * esr)


def ripple_current_published(
    rising: Real, falling: Real, capacitance: Real, esr: Real, esl: Real, window: Real, delay: Real
) -> Real:
    """Choke ripple current by the published full formula, one delay for both edges.

    Parameters
    ----------
    rising, falling : float or ndarray
        Slopes of the choke current, both positive [A/s].
    capacitance : float or ndarray
        Output capacitance [F].
    esr : float or ndarray
        Its series resistance [ohm].
    esl : float or ndarray
        Its series inductance [H].
    window : float or ndarray
        Comparator window at the output [V].
    delay : float or ndarray
        Delay from crossing a threshold to the switch acting [s].

    Returns
    -------
    float or ndarray
        Ripple current, peak to peak [A]; with `frequency_of_ripple` it is
        ``f = V_o (V_in - V_o)(r - t_d/C) / (V_in (V_in r t_d + H L - l V_in))``. Infinite where the ESR
        is too small.

    References
    ----------
    R. Miftakhutdinov, power supply design seminar SEM-1400 (2001), topic 1, and report SLVA044 (from memory,
    derived again: it drops the term of `ripple_current_exact` that is quadratic in the delay).

    Examples
    --------
    >>> ripple = ripple_current_published(25e3, 75e3, 470e-6, 0.1, 20e-9, 0.03, 2e-6)
    >>> round(float(frequency_of_ripple(ripple, 25e3, 75e3)), 1)
    37400.3
    """
    drive = window + esr * delay * (rising + falling) - esl * (rising + falling)
    return _ratio_or_infinite(drive, esr - delay / capacitance)


def ripple_current_exact(
    rising: Real,
    falling: Real,
    capacitance: Real,
    esr: Real,
    esl: Real,
    window: Real,
    turn_off_delay: Real,
    turn_on_delay: Real,
) -> Real:
    """Choke ripple current of a comparator with two delays, ESR and ESL, exact for constant slopes.

    Parameters
    ----------
    rising, falling : float or ndarray
        Slopes of the choke current, both positive [A/s].
    capacitance : float or ndarray
        Output capacitance [F].
    esr : float or ndarray
        Its series resistance [ohm].
    esl : float or ndarray
        Its series inductance [H].
    window : float or ndarray
        Comparator window at the output [V].
    turn_off_delay, turn_on_delay : float or ndarray
        Delays from crossing the upper or lower threshold to the switch acting, ``t1`` and ``t2`` [s].

    Returns
    -------
    float or ndarray
        Ripple current, peak to peak [A]. Infinite (frequency 0) where ``r <= (t1 + t2)/(2 C)``: there the ESR
        cannot control the ripple.

    Notes
    -----
    Derived: subtract the two threshold conditions in a steady state with zero charge per period,
    ``dI (r - (t1+t2)/(2C)) = H + r (m1 t1 + m2 t2) - l (m1 + m2) - (m1 t1^2 + m2 t2^2)/(2C)``.

    Examples
    --------
    >>> round(float(ripple_current_exact(25e3, 75e3, 470e-6, 0.1, 20e-9, 0.03, 3e-6, 1e-6)), 6)
    0.445778
    """
    overshoot = rising * turn_off_delay + falling * turn_on_delay
    bend = rising * turn_off_delay * turn_off_delay + falling * turn_on_delay * turn_on_delay
    drive = window + esr * overshoot - esl * (rising + falling) - bend / (2.0 * capacitance)
    return _ratio_or_infinite(drive, esr - (turn_off_delay + turn_on_delay) / (2.0 * capacitance))


def dc_shift(
    ripple: Real,
    rising: Real,
    falling: Real,
    capacitance: Real,
    esr: Real,
    esl: Real,
    turn_off_delay: Real,
    turn_on_delay: Real,
) -> Real:
    """How far the mean output lies below the middle of the two thresholds.

    Parameters
    ----------
    ripple : float or ndarray
        Ripple current of `ripple_current_exact`, peak to peak [A].
    rising, falling : float or ndarray
        Slopes of the choke current, both positive [A/s].
    capacitance : float or ndarray
        Output capacitance [F].
    esr : float or ndarray
        Its series resistance [ohm].
    esl : float or ndarray
        Its series inductance [H].
    turn_off_delay, turn_on_delay : float or ndarray
        Delays from crossing the upper or lower threshold to the switch acting, ``t1`` and ``t2`` [s].

    Returns
    -------
    float or ndarray
        Middle of the thresholds minus mean output [V].

    Notes
    -----
    Derived: ``1/2 (r (m2 t2 - m1 t1) + dI (t2 - t1)/(2C) + (m1 t1^2 - m2 t2^2)/(2C) + l (m1 - m2))
    + dI (T_on - T_off)/(12 C)``, the mean of a parabola over each interval.

    Examples
    --------
    >>> shift = dc_shift(0.4968893, 25e3, 75e3, 470e-6, 0.1, 20e-9, 2e-6, 2e-6)
    >>> f"{shift:.5g}"
    '0.005561'
    """
    up, down = rising * turn_off_delay, falling * turn_on_delay
    edge = esr * (down - up) + esl * (rising - falling)
    bend = ripple * (turn_on_delay - turn_off_delay) + up * turn_off_delay - down * turn_on_delay
    sag = ripple * (ripple / rising - ripple / falling) / (12.0 * capacitance)
    return 0.5 * (edge + bend / (2.0 * capacitance)) + sag


def switching_threshold(
    reference: Real, r1: Real, r2: Real, feedback_resistance: Real, adjust_current: Real, switch_voltage: Real
) -> Real:
    """Output voltage at which the regulator's error crosses zero, for a given switch-node voltage.

    Parameters
    ----------
    reference : float or ndarray
        Reference voltage from adjust pin to output [V].
    r1, r2 : float or ndarray
        Divider, output to adjust pin and adjust pin to ground [ohm].
    feedback_resistance : float or ndarray
        Resistor from the switch node to the adjust pin [ohm].
    adjust_current : float or ndarray
        Current out of the adjust pin [A].
    switch_voltage : float or ndarray
        Voltage of the switch node [V].

    Returns
    -------
    float or ndarray
        ``V_ref + (R2 || Rh) (V_ref/R1 + I_adj + v_sw/Rh)`` [V].

    Notes
    -----
    Derived: node equation at the adjust pin.

    Examples
    --------
    >>> round(switching_threshold(1.25, 240.0, 2400.0, 1e6, 50e-6, 19.4), 4)
    13.8862
    """
    parallel = r2 * feedback_resistance / (r2 + feedback_resistance)
    return reference + parallel * (reference / r1 + adjust_current + switch_voltage / feedback_resistance)


def hysteresis_window(switch_swing: Real, r2: Real, feedback_resistance: Real) -> Real:
    """Distance of the two thresholds at the output, ``dv_sw R2/(R2 + Rh)``.

    The upper divider resistor drops out.

    Parameters
    ----------
    switch_swing : float or ndarray
        Swing of the switch node, ``V_in - V_sat + V_D`` [V].
    r2 : float or ndarray
        Lower divider resistor [ohm].
    feedback_resistance : float or ndarray
        Resistor from the switch node to the adjust pin [ohm].

    Returns
    -------
    float or ndarray
        Window [V].

    Notes
    -----
    Derived: difference of two `switching_threshold`.

    Examples
    --------
    >>> round(hysteresis_window(20.3, 2400.0, 1e6), 6)
    0.048603
    """
    return switch_swing * r2 / (r2 + feedback_resistance)


def set_point_supply_slope(r2: Real, feedback_resistance: Real) -> Real:
    """Shift of the middle of the thresholds per volt of supply, ``R2/(2 (R2 + Rh))``.

    Parameters
    ----------
    r2 : float or ndarray
        Lower divider resistor [ohm].
    feedback_resistance : float or ndarray
        Resistor from the switch node to the adjust pin [ohm].

    Returns
    -------
    float or ndarray
        Shift [V/V].

    Notes
    -----
    Derived: half of `hysteresis_window` per volt.

    Examples
    --------
    >>> round(set_point_supply_slope(2400.0, 1e6), 8)
    0.00119713
    """
    return r2 / (2.0 * (r2 + feedback_resistance))


def _ratio_or_infinite(drive: Real, effective_esr: Real) -> Real:
    positive = np.asarray(effective_esr) > 0.0
    return plain(np.where(positive, drive / np.where(positive, effective_esr, 1.0), np.inf))
