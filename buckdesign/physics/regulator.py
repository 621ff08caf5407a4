"""The three-terminal adjustable regulator: set voltage, limits, minimum load, output impedance."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "dropout_voltage": {"current": (0.02, 1.5), "temperature_c": (-55.0, 150.0)},
    "unity_gain_inductance": {"frequency": (10e3, 400e3)},
}
"""Dropout: where the curve of the 1.5 A class was read; impedance: where it rises 20 dB a decade (from
memory)."""

THERMAL_SHUTDOWN_C = 165.0
"""Junction temperature at which the regulator's own protection takes its output current away [degC];
150-175 by class and maker (from memory)."""

DROPOUT_TEMPERATURE_COEFFICIENT = -2e-3
"""Change of the dropout voltage with temperature [V/K] (from memory)."""

MINIMUM_LOAD: Mapping[str, tuple[float, float]] = {
    "adjustable 1.5 A": (3.5e-3, 10e-3),
    "adjustable 3 A": (3.5e-3, 10e-3),
    "adjustable 5 A": (3.5e-3, 10e-3),
}
"""Typical and largest load current [A] below which a class leaves regulation (data sheets of the classes)."""


def output_voltage(reference: Real, r1: Real, r2: Real, adjust_current: Real) -> Real:
    """Output set by the divider, ``V_ref (1 + R2/R1) + I_adj R2``.

    Parameters
    ----------
    reference : float or ndarray
        Reference voltage from adjust pin to output [V].
    r1, r2 : float or ndarray
        Divider, output to adjust pin and adjust pin to ground [ohm].
    adjust_current : float or ndarray
        Current out of the adjust pin [A].

    Returns
    -------
    float or ndarray
        Output [V].

    References
    ----------
    Data sheets of the 3 A class (p. 5) and of the 1.5 A class, equation of the basic circuit.

    Examples
    --------
    >>> round(output_voltage(1.25, 240.0, 2640.0, 50e-6), 6)
    15.132
    """
    return reference * (1.0 + r2 / r1) + adjust_current * r2


def lower_resistor(output: Real, reference: Real, r1: Real, adjust_current: Real) -> Real:
    """Resistor from adjust pin to ground for a wanted output, the inverse of `output_voltage`.

    Parameters
    ----------
    output : float or ndarray
        Wanted output [V].
    reference : float or ndarray
        Reference voltage [V].
    r1 : float or ndarray
        Resistor from output to adjust pin [ohm]; with a feedback resistor from the switch node, both in
        parallel.
    adjust_current : float or ndarray
        Current out of the adjust pin [A].

    Returns
    -------
    float or ndarray
        ``R2 = (V_o - V_ref) / (V_ref/R1 + I_adj)`` [ohm].

    Notes
    -----
    Derived from `output_voltage`.

    Examples
    --------
    >>> round(lower_resistor(15.0, 1.25, 240.0, 50e-6), 2)
    2614.9
    """
    return (output - reference) / (reference / r1 + adjust_current)


def output_voltage_with_feedback(
    reference: Real,
    r1: Real,
    r2: Real,
    feedback_resistance: Real,
    adjust_current: Real,
    switch_excess: Real = 0.0,
) -> Real:
    """Mean output with a direct resistor from the switch node to the adjust pin.

    Parameters
    ----------
    reference : float or ndarray
        Reference voltage [V].
    r1, r2 : float or ndarray
        Divider, output to adjust pin and adjust pin to ground [ohm].
    feedback_resistance : float or ndarray
        Resistor from switch node to adjust pin; infinite for none or for one with a series capacitor [ohm].
    adjust_current : float or ndarray
        Current out of the adjust pin [A].
    switch_excess : float or ndarray
        Mean switch-node voltage minus output, the winding drop ``I R_L`` [V].

    Returns
    -------
    float or ndarray
        Output [V] at which the mean error is zero.

    Notes
    -----
    Derived: the mean of the switch node is the output plus the winding drop, so the resistor acts as one in
    parallel with ``R1``: ``V_ref (1 + R2/R1 + R2/Rh) + I_adj R2 + R2/Rh * excess``. The controller's delays
    shift the mean further.

    Examples
    --------
    >>> round(output_voltage_with_feedback(1.25, 240.0, 2050.0, 1e6, 50e-6), 5)
    12.03215
    """
    share = r2 / feedback_resistance
    return output_voltage(reference, r1, r2, adjust_current) + share * (reference + switch_excess)


def worst_case_output(
    reference: tuple[Real, Real], adjust_current: tuple[Real, Real], r1: Real, r2: Real, tolerance: Real
) -> tuple[Real, Real]:
    """Lowest and highest output over reference, adjust current and resistor tolerance.

    Parameters
    ----------
    reference : tuple of float or ndarray
        Smallest and largest reference voltage [V].
    adjust_current : tuple of float or ndarray
        Smallest and largest adjust-pin current [A].
    r1, r2 : float or ndarray
        Nominal divider [ohm].
    tolerance : float or ndarray
        Tolerance of each resistor, as a fraction [1].

    Returns
    -------
    tuple of float or ndarray
        Lowest and highest output [V].

    Notes
    -----
    Derived: `output_voltage` rises with every argument but ``R1``.

    Examples
    --------
    >>> low, high = worst_case_output((1.20, 1.30), (0.0, 100e-6), 240.0, 2610.0, 0.01)
    >>> round(low, 3), round(high, 3)
    (13.992, 15.987)
    """
    small, large = 1.0 - tolerance, 1.0 + tolerance
    low = output_voltage(reference[0], r1 * large, r2 * small, adjust_current[0])
    return low, output_voltage(reference[1], r1 * small, r2 * large, adjust_current[1])


def current_limit(difference: Real, limit: Real, knee: Real, far_voltage: Real, far_limit: Real) -> Real:
    """Current limit with safe-area fold-back along a straight line.

    Parameters
    ----------
    difference : float or ndarray
        Input-output difference of the regulator itself [V].
    limit : float or ndarray
        Limit up to the knee voltage [A].
    knee : float or ndarray
        Difference at which the limit begins to fall; infinite for a constant limit [V].
    far_voltage, far_limit : float or ndarray
        End of the line [V] and the limit there and beyond [A].

    Returns
    -------
    float or ndarray
        Current limit [A].

    Notes
    -----
    Derived: a line through two typical values of the data sheet. Real curves are bent and 20-30 % higher
    halfway
    (from memory).

    Examples
    --------
    >>> round(float(current_limit(25.0, 2.2, 15.0, 40.0, 0.4)), 6)
    1.48
    """
    constant = np.isinf(np.asarray(knee, dtype=float))
    start, end = np.where(constant, 0.0, knee), np.where(constant, 1.0, far_voltage)
    share = np.where(constant, 0.0, np.clip((difference - start) / (end - start), 0.0, 1.0))
    return plain(limit - (limit - np.asarray(far_limit)) * share)


def dropout_voltage(
    current: Real, threshold: Real = 1.6, resistance: Real = 0.4, temperature_c: Real = 25.0
) -> Real:
    """Smallest input-output difference at which the regulator still regulates.

    Parameters
    ----------
    current : float or ndarray
        Regulator output current [A].
    threshold : float or ndarray
        Dropout extrapolated to no current, at 25 degC [V].
    resistance : float or ndarray
        Slope [ohm].
    temperature_c : float or ndarray
        Junction temperature [degC].

    Returns
    -------
    float or ndarray
        Dropout [V].

    Notes
    -----
    A line through the typical curve of the 1.5 A class, which reads 1.5 V at 20 mA, 1.75 V at 0.2 A, 2.0 V
    at 1 A and
    2.25 V at 1.5 A, within 0.2 V; -2 mV/K (from memory).

    Examples
    --------
    >>> dropout_voltage(1.0)
    2.0
    """
    shift = DROPOUT_TEMPERATURE_COEFFICIENT * (temperature_c - 25.0)
    return threshold + resistance * current + shift


def divider_current(reference: Real, r1: Real) -> Real:
    """Current that the divider draws from the output, ``V_ref / R1``.

    Parameters
    ----------
    reference : float or ndarray
        Reference voltage [V].
    r1 : float or ndarray
        Resistor from output to adjust pin [ohm].

    Returns
    -------
    float or ndarray
        Current [A]; it should cover the minimum load of the class, see `MINIMUM_LOAD`.

    Notes
    -----
    Derived: Ohm's law. All of the regulator's quiescent current leaves at its output pin (data sheets), so
    that
    below the minimum load the output rises.

    Examples
    --------
    >>> round(divider_current(1.25, 240.0) * 1e3, 3)
    5.208
    """
    return reference / r1


def no_load_input_current(quiescent_current: Real, reference: Real, r1: Real) -> Real:
    """Input current without load, transistor off: the larger of quiescent and divider current.

    Parameters
    ----------
    quiescent_current : float or ndarray
        Current that always leaves at the regulator's output [A].
    reference : float or ndarray
        Reference voltage [V].
    r1 : float or ndarray
        Resistor from output to adjust pin [ohm].

    Returns
    -------
    float or ndarray
        Input current [A].

    Notes
    -----
    Common practice, no source; leakage comes on top.

    Examples
    --------
    >>> round(float(no_load_input_current(3.5e-3, 1.25, 240.0)) * 1e3, 3)
    5.208
    """
    return np.maximum(quiescent_current, divider_current(reference, r1))


def base_drive_headroom(
    base_current: Real,
    base_emitter: Real,
    drive_resistance: Real,
    dropout: Real,
    dropout_resistance: Real,
) -> Real:
    """Input-output difference of the whole stage that full base drive needs.

    Parameters
    ----------
    base_current : float or ndarray
        Regulator current wanted, base and base-emitter resistor together [A].
    base_emitter : float or ndarray
        Base-emitter voltage of the conducting transistor [V].
    drive_resistance : float or ndarray
        Resistor between base and regulator input [ohm].
    dropout, dropout_resistance : float or ndarray
        Dropout of the regulator, threshold [V] and slope [ohm].

    Returns
    -------
    float or ndarray
        ``V_BE + V_do + i (R_drive + R_do)`` [V].

    Notes
    -----
    Derived: Kirchhoff's law along the drive path.

    Examples
    --------
    >>> round(base_drive_headroom(0.2, 0.9, 0.0, 1.6, 0.4), 3)
    2.58
    """
    return base_emitter + dropout + base_current * (drive_resistance + dropout_resistance)


def drive_loss(
    duty: Real, base_current: Real, supply_voltage: Real, base_emitter: Real, output: Real
) -> Real:
    """Power in regulator and drive resistor while the base is driven; the current itself reaches the load.

    Parameters
    ----------
    duty : float or ndarray
        Duty of the base drive [1].
    base_current : float or ndarray
        Regulator current while driving [A].
    supply_voltage, output : float or ndarray
        Supply and output [V].
    base_emitter : float or ndarray
        Base-emitter voltage [V].

    Returns
    -------
    float or ndarray
        ``D i (V_in - V_BE - V_o)`` [W].

    Notes
    -----
    Derived: the energy balance of the drive path.

    Examples
    --------
    >>> round(drive_loss(0.79, 0.2, 20.0, 0.9, 15.0), 4)
    0.6478
    """
    return duty * base_current * (supply_voltage - base_emitter - output)


def impedance_to_inductance(impedance: Real, frequency: Real) -> Real:
    """Inductance that has a given impedance at a frequency, ``Z / (2 pi f)``.

    Parameters
    ----------
    impedance : float or ndarray
        Output impedance read from the data sheet's curve, where it rises with frequency [ohm].
    frequency : float or ndarray
        Frequency [Hz].

    Returns
    -------
    float or ndarray
        Equivalent inductance at the output [H].

    Notes
    -----
    Derived. The literature gives 0.3-5 uH at the output, falling with load current (E. Dietz in R. Pease,
    Troubleshooting Analog Circuits, 1991, appendix; from memory).

    Examples
    --------
    >>> f"{impedance_to_inductance(1.0, 250e3):.3g}"
    '6.37e-07'
    """
    return impedance / (2.0 * np.pi * frequency)


def unity_gain_inductance(inductance: Real, output: Real, reference: Real) -> Real:
    """Output inductance at unity gain, ``L_o``, from the one seen at a divided output.

    Parameters
    ----------
    inductance : float or ndarray
        Inductance measured at the output [H].
    output : float or ndarray
        Output voltage at which it was measured [V].
    reference : float or ndarray
        Reference voltage [V].

    Returns
    -------
    float or ndarray
        ``L_o = L V_ref / V_o`` [H].

    Notes
    -----
    Derived: the divider lowers the loop gain by ``V_o / V_ref``.

    Examples
    --------
    >>> f"{unity_gain_inductance(6.366e-7, 10.0, 1.25):.3g}"
    '7.96e-08'
    """
    return inductance * reference / output
