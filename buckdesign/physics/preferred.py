"""Preferred values of resistors and capacitors (IEC 60063), and the divider made of them."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from buckdesign.errors import InfeasibleError
from buckdesign.physics.arrays import Ranges, Real, plain
from buckdesign.physics.regulator import output_voltage

RANGES: Ranges = {
    "resistor": {"value": (0.1, 10e6)},
    "capacitor": {"value": (1e-12, 0.1)},
}
"""Sizes that are in every shop [ohm], [F] (common practice, no source)."""

RESISTORS = RANGES["resistor"]["value"]
"""Smallest and largest common resistor [ohm] (common practice, no source)."""

CAPACITORS = RANGES["capacitor"]["value"]
"""Smallest and largest common capacitor [F] (common practice, no source)."""

_E24 = (10, 11, 12, 13, 15, 16, 18, 20, 22, 24, 27, 30, 33, 36, 39, 43, 47, 51, 56, 62, 68, 75, 82, 91)
_E192 = tuple(920 if step == 185 else round(100.0 * 10.0 ** (step / 192.0)) for step in range(192))

SERIES: Mapping[str, tuple[int, ...]] = {
    "E3": _E24[::8],
    "E6": _E24[::4],
    "E12": _E24[::2],
    "E24": _E24,
    "E48": _E192[::4],
    "E96": _E192[::2],
    "E192": _E192,
}
"""One decade of each series, two digits to E24 and three from E48 on (IEC 60063:2015; E24 as printed there,
E192 by
its formula with the one printed exception 920; from memory)."""


class Divider(NamedTuple):
    """Divider of preferred values.

    Attributes
    ----------
    r1, r2 : float or ndarray
        Output to adjust pin and adjust pin to ground [ohm].
    output_voltage : float or ndarray
        Output that it sets [V].
    relative_error : float or ndarray
        Its deviation from the wanted output, as a fraction [1].
    """

    r1: Real
    r2: Real
    output_voltage: Real
    relative_error: Real


def nearest(value: Real, series: str, limits: tuple[float, float] = RESISTORS) -> Real:
    """Preferred value nearest by ratio.

    Parameters
    ----------
    value : float or ndarray
        Wanted value, positive [any unit].
    series : str
        Name of the series, a key of `SERIES` [1].
    limits : tuple of float
        Smallest and largest value on offer [same unit].

    Returns
    -------
    float or ndarray
        Preferred value [same unit].

    Raises
    ------
    InfeasibleError
        If a value is past either end of what is on offer.

    References
    ----------
    IEC 60063:2015.

    Examples
    --------
    >>> float(nearest(2614.9, "E24")), float(nearest(2614.9, "E96"))
    (2700.0, 2610.0)
    """
    below, above = _neighbours(value, series)
    _demand_inside(value, limits)
    wanted = np.asarray(value, dtype=float)
    return _limited(np.where(wanted / below <= above / wanted, below, above), limits, value, series)


def next_above(value: Real, series: str, limits: tuple[float, float] = RESISTORS) -> Real:
    """Smallest preferred value that is not below the wanted one.

    Parameters
    ----------
    value : float or ndarray
        Wanted value, positive [any unit].
    series : str
        Name of the series, a key of `SERIES` [1].
    limits : tuple of float
        Smallest and largest value on offer [same unit].

    Returns
    -------
    float or ndarray
        Preferred value [same unit].

    Raises
    ------
    InfeasibleError
        If the largest value on offer is too small.

    References
    ----------
    IEC 60063:2015.

    Examples
    --------
    >>> float(next_above(2.3e-4, "E6", CAPACITORS))
    0.00033
    """
    return _limited(_neighbours(value, series)[1], limits, value, series)


def next_below(value: Real, series: str, limits: tuple[float, float] = RESISTORS) -> Real:
    """Largest preferred value that is not above the wanted one.

    Parameters
    ----------
    value : float or ndarray
        Wanted value, positive [any unit].
    series : str
        Name of the series, a key of `SERIES` [1].
    limits : tuple of float
        Smallest and largest value on offer [same unit].

    Returns
    -------
    float or ndarray
        Preferred value [same unit].

    Raises
    ------
    InfeasibleError
        If the smallest value on offer is too large.

    References
    ----------
    IEC 60063:2015.

    Examples
    --------
    >>> float(next_below(25.0, "E12"))
    22.0
    """
    return _limited(_neighbours(value, series)[0], limits, value, series)


def values_between(low: float, high: float, series: str) -> NDArray[np.float64]:
    """All preferred values from one value to another, ends included.

    Parameters
    ----------
    low, high : float
        Ends, positive [any unit].
    series : str
        Name of the series, a key of `SERIES` [1].

    Returns
    -------
    ndarray, shape (n,)
        Rising values [same unit]; empty where none lies between.

    References
    ----------
    IEC 60063:2015.

    Examples
    --------
    >>> values_between(100.0, 270.0, "E6").tolist()
    [100.0, 150.0, 220.0]
    """
    decades = range(int(np.floor(np.log10(low))) - 1, int(np.floor(np.log10(high))) + 2)
    numbers = np.array(SERIES[series], dtype=float)
    digits = len(str(SERIES[series][0])) - 1
    values = np.concatenate([_scaled(numbers, np.full(numbers.shape, decade - digits)) for decade in decades])
    margin = 1e-9
    return values[(values >= low * (1.0 - margin)) & (values <= high * (1.0 + margin))]


def divider_pair(
    output: Real,
    reference: Real,
    adjust_current: Real,
    r1_limits: tuple[float, float],
    series: str,
    feedback_resistance: Real = np.inf,
) -> Divider:
    """Divider of two preferred values that comes nearest to a wanted output.

    Parameters
    ----------
    output : float or ndarray
        Wanted output, above the reference [V].
    reference : float or ndarray
        Reference voltage [V].
    adjust_current : float or ndarray
        Current out of the adjust pin [A].
    r1_limits : tuple of float
        Smallest and largest resistor from output to adjust pin; the largest lets the divider draw the minimum
        load [ohm].
    series : str
        Name of the series, a key of `SERIES` [1].
    feedback_resistance : float or ndarray
        Direct resistor from the switch node, which acts as one in parallel with ``R1``; infinite for none
        [ohm].

    Returns
    -------
    Divider
        The pair, the output and its error; of equal ones the pair with the smallest ``R1``.

    Raises
    ------
    InfeasibleError
        If the series has no value between the limits of ``R1``, or the lower resistor is past what is on
        offer.

    Notes
    -----
    Derived: all ``R1`` between the limits, for each the two ``R2`` around
    `buckdesign.physics.regulator.lower_resistor`.

    Examples
    --------
    >>> pair = divider_pair(12.0, 1.25, 50e-6, (120.0, 240.0), "E24")
    >>> float(pair.r1), float(pair.r2), round(float(pair.output_voltage), 3)
    (130.0, 1100.0, 11.882)
    """
    uppers = values_between(*r1_limits, series)
    if uppers.size == 0:
        low, high = r1_limits
        raise InfeasibleError(f"{series} has no value from {low:g} to {high:g} ohm for the divider")
    given = np.broadcast_arrays(output, reference, adjust_current, feedback_resistance)
    wanted, volts, amps, shunt = (np.asarray(x, dtype=float)[..., None] for x in given)
    effective = 1.0 / (1.0 / uppers + 1.0 / shunt)
    exact = (wanted - volts) / (volts / effective + amps)
    if np.any(exact <= 0.0):
        low, least = np.min(wanted), np.max(volts)
        raise InfeasibleError(f"an output of {low:g} V is not above the reference of {least:g} V")
    below = next_below(exact, series)
    above = next_above(exact, series)
    lowers = np.concatenate([np.asarray(below), np.asarray(above)], axis=-1)
    twice = np.concatenate([effective, effective], axis=-1)
    reached = np.asarray(output_voltage(volts, twice, lowers, amps))
    error = reached / wanted - 1.0
    best = np.argmin(np.round(np.abs(error), 12), axis=-1)[..., None]
    r1 = np.broadcast_to(np.concatenate([uppers, uppers]), lowers.shape)
    chosen = (np.take_along_axis(x, best, axis=-1)[..., 0] for x in (r1, lowers, reached, error))
    return Divider(*(plain(x) for x in chosen))


def _neighbours(value: Real, series: str) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Preferred values not above and not below; a value of the series is both."""
    wanted = np.asarray(value, dtype=float)
    if not np.all((wanted > 0.0) & np.isfinite(wanted)):
        raise InfeasibleError(f"{value}: a preferred value must be positive and finite")
    numbers = np.array(SERIES[series], dtype=float)
    digits = len(str(SERIES[series][0])) - 1
    decade = np.floor(np.log10(wanted))
    around = np.concatenate([numbers[-1:] / 10.0, numbers, numbers[:2] * 10.0])
    mantissa = wanted / 10.0**decade * 10.0**digits
    above = np.searchsorted(around, mantissa * (1.0 - 1e-9), side="left")
    below = np.searchsorted(around, mantissa * (1.0 + 1e-9), side="right") - 1
    exponent = decade - digits
    return _place(numbers, below - 1, exponent), _place(numbers, above - 1, exponent)


def _place(
    numbers: NDArray[np.float64], index: NDArray[np.intp], exponent: NDArray[np.float64]
) -> NDArray[np.float64]:
    """Value of a series at an index that may lie in the decade before or after."""
    carry, inside = np.divmod(index, numbers.size)
    return _scaled(numbers[inside], exponent + carry)


def _scaled(numbers: NDArray[np.float64], exponent: NDArray[np.float64]) -> NDArray[np.float64]:
    """``numbers * 10^exponent``, rounded once, so that it equals the value as it is written."""
    up, down = 10.0 ** np.maximum(exponent, 0.0), 10.0 ** np.maximum(-exponent, 0.0)
    return np.asarray(numbers * up / down)


def _demand_inside(value: Real, limits: tuple[float, float]) -> None:
    wanted = np.asarray(value, dtype=float)
    if np.any(wanted < limits[0] * (1.0 - 1e-9)) or np.any(wanted > limits[1] * (1.0 + 1e-9)):
        worst = wanted.max() if wanted.max() > limits[1] else wanted.min()
        low, high = limits
        raise InfeasibleError(f"{worst:g} is needed, the values on offer go from {low:g} to {high:g}")


def _limited(found: NDArray[np.float64], limits: tuple[float, float], value: Real, series: str) -> Real:
    low, high = limits[0] * (1.0 - 1e-9), limits[1] * (1.0 + 1e-9)
    bad = (found < low) | (found > high)
    if np.any(bad):
        need = float(np.broadcast_to(np.asarray(value, dtype=float), found.shape)[bad].flat[0])
        raise InfeasibleError(
            f"{need:g} is needed, the {series} values on offer go from {limits[0]:g} to {limits[1]:g}"
        )
    result: Real = plain(found)
    return result
