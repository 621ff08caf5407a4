"""The ring from the drawer: permeability from its dimensions and a test winding, with its uncertainty."""

from __future__ import annotations

import numpy as np

from buckdesign.constants import MU_0
from buckdesign.physics.arrays import Ranges, Real, plain
from buckdesign.physics.ring import core_constant_c1

RANGES: Ranges = {
    "iron powder": {"permeability": (4.0, 100.0)},
    "other powders": {"permeability": (125.0, 600.0)},
    "ferrite": {"permeability": (800.0, 15000.0)},
}
"""Initial permeabilities in which the kinds of core are sold (from memory)."""

CALIPER_TOLERANCE = 0.01
"""Error of a ring's dimensions: caliper, coating, rounded corners, as a fraction (common practice)."""

METER_TOLERANCE = 0.03
"""Error of a hand-held inductance meter, as a fraction (common practice)."""

MATERIAL_TOLERANCE = 0.10
"""Spread of a ring's published inductance factor, as a fraction (makers' data, from memory)."""

FORMULA_TOLERANCE = 0.12
"""Spread of published inductance factors around the formula, as a fraction (statistics of the core table)."""


def permeability_from_test_winding(
    inductance: Real, turns: Real, outer: Real, inner: Real, height: Real
) -> Real:
    """Relative permeability of a ring from a test winding without bias.

    Parameters
    ----------
    inductance : float or ndarray
        Measured inductance, less that of the leads [H].
    turns : float or ndarray
        Turns through the bore [1].
    outer, inner : float or ndarray
        Diameters [m].
    height : float or ndarray
        Height [m].

    Returns
    -------
    float or ndarray
        ``mu = L C1 / (mu_0 N^2)`` [1].

    References
    ----------
    IEC 60205 for ``C1`` (from memory).

    Examples
    --------
    >>> round(float(permeability_from_test_winding(41.157e-6, 20, 26.9e-3, 14.5e-3, 11.1e-3)), 1)
    75.0
    """
    return inductance * core_constant_c1(outer, inner, height) / (MU_0 * np.square(turns))


def permeability_bounds(
    inductance: Real,
    turns: Real,
    outer: Real,
    inner: Real,
    height: Real,
    dimension_tolerance: Real = CALIPER_TOLERANCE,
    meter_tolerance: Real = METER_TOLERANCE,
) -> tuple[Real, Real]:
    """Smallest and largest permeability that dimensions and meter allow together.

    Parameters
    ----------
    inductance : float or ndarray
        Measured inductance [H].
    turns : float or ndarray
        Turns [1].
    outer, inner : float or ndarray
        Measured diameters [m].
    height : float or ndarray
        Measured height [m].
    dimension_tolerance, meter_tolerance : float or ndarray
        Largest errors, as fractions [1].

    Returns
    -------
    tuple of float or ndarray
        Low and high [1]; high is infinite where the tolerance lets the wall of the ring vanish.

    Notes
    -----
    Derived: interval arithmetic, exact because the permeability is monotone in every reading.

    Examples
    --------
    >>> low, high = permeability_bounds(41.157e-6, 20, 26.9e-3, 14.5e-3, 11.1e-3)
    >>> round(float(low), 1), round(float(high), 1)
    (69.8, 80.6)
    """
    small, large = 1.0 - dimension_tolerance, 1.0 + dimension_tolerance
    low = permeability_from_test_winding(
        inductance * (1.0 - meter_tolerance), turns, outer * large, inner * small, height * large
    )
    solid = np.asarray(outer * small) > np.asarray(inner * large)
    bore = np.where(solid, inner * large, outer * small / 2.0)
    high = permeability_from_test_winding(
        inductance * (1.0 + meter_tolerance), turns, outer * small, bore, height * small
    )
    return low, plain(np.where(solid, high, np.inf))


def permeability_relative_uncertainty(
    outer: Real,
    inner: Real,
    dimension_tolerance: Real = CALIPER_TOLERANCE,
    meter_tolerance: Real = METER_TOLERANCE,
) -> Real:
    """Standard uncertainty of the permeability of `permeability_from_test_winding`, as a fraction.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].
    dimension_tolerance, meter_tolerance : float or ndarray
        Largest errors, as fractions, uniform between the limits [1].

    Returns
    -------
    float or ndarray
        Relative standard uncertainty [1].

    Notes
    -----
    Derived: first-order propagation of independent errors; a diameter enters as ``1/ln(D/d)``, a uniform
    error has
    the standard deviation of its limit over the square root of 3.

    Examples
    --------
    >>> round(float(permeability_relative_uncertainty(26.9e-3, 14.5e-3)), 4)
    0.0225
    """
    wall = dimension_tolerance / np.log(outer / inner)
    return np.sqrt((meter_tolerance**2 + dimension_tolerance**2 + 2.0 * wall**2) / 3.0)


def log_likelihood(permeability: Real, candidate: Real, relative_uncertainty: Real) -> Real:
    """Logarithm of the probability density of a measured permeability if a candidate is the true one.

    Parameters
    ----------
    permeability : float or ndarray
        Measured permeability [1].
    candidate : float or ndarray
        Nominal permeability of a material [1].
    relative_uncertainty : float or ndarray
        Standard uncertainty of reading and material together, as a fraction [1].

    Returns
    -------
    float or ndarray
        Log density over the logarithm of the permeability [1].

    Notes
    -----
    Derived: normal distribution of ``ln mu``.

    Examples
    --------
    >>> round(float(log_likelihood(75.0, 75.0, 0.1)), 4)
    1.3836
    """
    deviation = np.log(permeability / candidate) / relative_uncertainty
    return -0.5 * np.square(deviation) - np.log(relative_uncertainty * np.sqrt(2.0 * np.pi))


def candidate_probabilities(log_likelihoods: Real) -> Real:
    """Probabilities of candidates that are equally likely beforehand.

    Parameters
    ----------
    log_likelihoods : ndarray, shape (..., n)
        Log likelihoods of n candidates, readings already summed [1].

    Returns
    -------
    ndarray, shape (..., n)
        Probabilities that sum to 1 [1].

    Notes
    -----
    Derived: Bayes' theorem with a flat prior.

    Examples
    --------
    >>> import numpy as np
    >>> candidate_probabilities(np.log(np.array([3.0, 1.0]))).tolist()
    [0.75, 0.25]
    """
    shifted = np.exp(log_likelihoods - np.max(log_likelihoods, axis=-1, keepdims=True))
    return shifted / shifted.sum(axis=-1, keepdims=True)
