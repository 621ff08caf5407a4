"""The resistors around regulator and transistor, and where the operating range is simulated.

Values come out preferred (IEC 60063). What the loop model has to decide (hysteresis network, choke, output
capacitor) is in `buckdesign.design.network_search`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

from buckdesign.design.elements import RegulatorElement, TransistorElement
from buckdesign.design.requirement import Requirement
from buckdesign.errors import InfeasibleError
from buckdesign.physics.pnp import base_current
from buckdesign.physics.preferred import nearest, next_below
from buckdesign.physics.regulator import base_drive_headroom, lower_resistor

DIVIDER_SERIES = "E96"
"""Series of the lower divider resistor: 1 % metal film (common practice)."""

UPPER_RESISTORS = (240.0, 120.0)
"""Usual resistors from output to adjust pin [ohm]: the smaller one where the load may fall below the
regulator's smallest (common practice)."""

BASE_RESISTORS = ((4.0, (10.0, 15.0, 22.0)), (0.8, (15.0, 22.0, 33.0)), (0.25, (22.0, 33.0, 47.0)))
"""Base-emitter resistors to try [ohm] from an output current [A] on (common practice: 10-47 ohm)."""

BASE_RESISTORS_SMALL = (47.0, 68.0, 100.0)
"""The same below the smallest of those currents [ohm]."""

PEAK_OVER_MEAN = 1.25
"""Peak over mean choke current that the base drive is sized for [1] (common practice: ripple half the
mean)."""

DRIVE_MARGIN = 1.15
"""Base drive available over needed at the lowest supply [1] (common practice)."""

LEAST_DRIVE_RESISTANCE = 1.0
"""Smallest drive resistor [ohm]: below it a short circuit at the output meets no resistance (common
practice)."""

POWER_RATINGS = (0.25, 0.5, 1.0, 2.0, 3.0, 5.0, 7.0, 10.0, 15.0, 25.0, 50.0)
"""Ratings that resistors are sold in [W] (common practice)."""

POWER_MARGIN = 2.0
"""Rating over dissipation of a resistor [1] (common practice)."""

LOAD_SHARES = (0.02, 0.05, 0.10, 0.25, 0.50, 1.0)
"""Loads over full load at which the range is simulated [1], besides the smallest and the onset of
switching."""

ONSET_FACTOR = 1.2
"""Load over that at which the base begins to conduct, at the point just above it [1]."""


@dataclass(frozen=True, kw_only=True)
class BaseDrive:
    """Base drive at the lowest supply.

    Attributes
    ----------
    rdrive : float
        Drive resistor [ohm].
    needed, available : float
        Regulator current at the peak choke current with guaranteed gain, and what headroom leaves [A].
    short_circuit : float
        Power in the drive resistor with the output shorted at the highest supply [W].
    """

    rdrive: float
    needed: float
    available: float
    short_circuit: float


def divider(
    requirement: Requirement, regulator: RegulatorElement, feedback_resistance: float
) -> tuple[float, float]:
    """Divider from preferred values, with the pull of a directly coupled feedback resistor.

    Parameters
    ----------
    requirement : Requirement
        Output voltage and smallest load.
    regulator : RegulatorElement
        Reference, adjust-pin and quiescent current.
    feedback_resistance : float
        Feedback resistor where it is coupled directly, else infinite [ohm].

    Returns
    -------
    tuple of float
        Output to adjust pin, adjust pin to ground [ohm].

    Raises
    ------
    InfeasibleError
        The output is not above the reference.
    """
    upper = upper_resistor(requirement, regulator)
    effective = 1.0 / (1.0 / upper + 1.0 / feedback_resistance)
    if requirement.output.voltage <= regulator.reference:
        raise InfeasibleError(
            f"an output of {requirement.output.voltage:g} V is not above the regulator's reference of "
            f"{regulator.reference:g} V"
        )
    exact = lower_resistor(
        requirement.output.voltage, regulator.reference, effective, regulator.adjust_current
    )
    return upper, float(nearest(exact, DIVIDER_SERIES))


def upper_resistor(requirement: Requirement, regulator: RegulatorElement) -> float:
    """Resistor from output to adjust pin: the larger usual one, if the smallest load carries what is missing.

    Returns
    -------
    float
        [ohm].
    """
    for value in UPPER_RESISTORS:
        drawn = regulator.reference / value + requirement.output.current_min
        if drawn >= regulator.quiescent_current_max:
            return value
    return UPPER_RESISTORS[-1]


def base_resistors(output_current: float) -> tuple[float, ...]:
    """Base-emitter resistors to try at an output current [A]; [ohm]."""
    for current, values in BASE_RESISTORS:
        if output_current >= current:
            return values
    return BASE_RESISTORS_SMALL


def regulator_current_needed(transistor: TransistorElement, collector_current: float, rbe: float) -> float:
    """Regulator current that carries a collector current, at the guaranteed gain.

    Parameters
    ----------
    transistor : TransistorElement
        The transistor.
    collector_current : float
        [A].
    rbe : float
        Base-emitter resistor [ohm].

    Returns
    -------
    float
        Base current and that of the resistor [A].
    """
    base = base_current(collector_current, transistor.gain_min, transistor.gain_knee)
    return float(base) + transistor.base_emitter_max / rbe


def base_drive(
    requirement: Requirement,
    regulator: RegulatorElement,
    transistor: TransistorElement,
    rbe: float,
    peak_current: float | None = None,
) -> BaseDrive:
    """Drive resistor from the base drive needed at the lowest supply.

    Parameters
    ----------
    requirement : Requirement
        Supply, output, largest load.
    regulator, transistor : RegulatorElement, TransistorElement
        The semiconductors.
    rbe : float
        Base-emitter resistor [ohm].
    peak_current : float, optional
        Peak choke current [A]; the largest load with a usual ripple where omitted.

    Returns
    -------
    BaseDrive
        The largest preferred resistor that leaves the margin.

    Raises
    ------
    InfeasibleError
        The headroom is too small for any resistor.
    """
    peak = requirement.output.current_max * PEAK_OVER_MEAN if peak_current is None else peak_current
    needed = regulator_current_needed(transistor, peak, rbe)
    headroom = drive_headroom(requirement, regulator, transistor)
    largest = headroom / (DRIVE_MARGIN * needed) - regulator.dropout_resistance
    if largest < LEAST_DRIVE_RESISTANCE:
        wanted = float(
            base_drive_headroom(
                DRIVE_MARGIN * needed,
                transistor.base_emitter_max,
                LEAST_DRIVE_RESISTANCE,
                regulator.dropout,
                regulator.dropout_resistance,
            )
        )
        raise InfeasibleError(
            f"base drive needs {wanted:.3g} V between supply and output, the lowest supply leaves "
            f"{requirement.supply.voltage_low - requirement.output.voltage:.3g} V"
        )
    rdrive = float(next_below(largest, "E12"))
    available = headroom / (rdrive + regulator.dropout_resistance)
    shorted = short_circuit_current(requirement, regulator, transistor, rdrive)
    return BaseDrive(rdrive=rdrive, needed=needed, available=available, short_circuit=shorted**2 * rdrive)


def drive_headroom(
    requirement: Requirement, regulator: RegulatorElement, transistor: TransistorElement
) -> float:
    """Voltage that the lowest supply leaves for drive resistor and regulator slope [V]."""
    lowest = requirement.supply.voltage_low - requirement.supply.ripple / 2
    return lowest - transistor.base_emitter_max - regulator.dropout - requirement.output.voltage


def needed_supply(
    requirement: Requirement, regulator: RegulatorElement, transistor: TransistorElement, rbe: float
) -> float:
    """Lowest supply from which the base can be driven [V]."""
    peak = requirement.output.current_max * PEAK_OVER_MEAN
    drive = DRIVE_MARGIN * regulator_current_needed(transistor, peak, rbe)
    headroom = base_drive_headroom(
        drive,
        transistor.base_emitter_max,
        LEAST_DRIVE_RESISTANCE,
        regulator.dropout,
        regulator.dropout_resistance,
    )
    return requirement.output.voltage + float(headroom) + requirement.supply.ripple / 2


def short_circuit_current(
    requirement: Requirement, regulator: RegulatorElement, transistor: TransistorElement, rdrive: float
) -> float:
    """Current through the drive resistor with the output shorted, at the highest supply [A]."""
    left = requirement.supply.voltage_high - transistor.base_emitter - regulator.dropout
    return float(min(regulator.current_limit, left / (rdrive + regulator.dropout_resistance)))


def power_rating(dissipation: float) -> float:
    """Rating of a resistor that dissipates this much, with margin [W].

    Raises
    ------
    InfeasibleError
        It is past the largest rating on offer.

    Examples
    --------
    >>> power_rating(1.2)
    3.0
    """
    for rating in POWER_RATINGS:
        if rating >= POWER_MARGIN * dissipation:
            return rating
    raise InfeasibleError(
        f"a resistor that dissipates {dissipation:.3g} W needs a rating of "
        f"{POWER_MARGIN * dissipation:.3g} W, "
        f"the largest on offer is {POWER_RATINGS[-1]:g} W"
    )


def lowest_nominal_highest(voltages: Sequence[float]) -> tuple[float, ...]:
    """Supplies without repetition [V]."""
    return tuple(sorted(set(voltages)))


def conduction_onset(
    regulator: RegulatorElement, transistor: TransistorElement, r1: float, rbe: float
) -> float:
    """Load at which the base begins to conduct [A]: below it the circuit is a linear regulator."""
    return max(0.0, transistor.base_emitter / rbe - regulator.reference / r1)


def range_loads(requirement: Requirement, onset: float) -> tuple[float, ...]:
    """Loads at which the range is simulated.

    Parameters
    ----------
    requirement : Requirement
        Smallest and largest load.
    onset : float
        Load at which the base begins to conduct [A].

    Returns
    -------
    tuple of float
        Rising, at least eight where the range is not a single load [A].
    """
    low, high = requirement.output.current
    wanted = [low, ONSET_FACTOR * onset, *(share * high for share in LOAD_SHARES)]
    inside = sorted({load for load in wanted if low <= load <= high} | {high})
    while high > low and len(inside) < 8:
        gaps = [(b - a, a, b) for a, b in pairwise(inside)]
        _, below, above = max(gaps)
        inside = sorted({*inside, 0.5 * (below + above)})
    return tuple(inside)
