"""Ring core of rectangular section: effective parameters, surface, inductance factor."""

from __future__ import annotations

import numpy as np

from buckdesign.constants import MU_0
from buckdesign.physics.arrays import Ranges, Real

RANGES: Ranges = {
    "inductance_factor / catalogue, permeability 75": {"ratio": (0.79, 1.02)},
    "inductance_factor / catalogue, other iron powders": {"ratio": (0.73, 1.35)},
}
"""Published A_L over the value by formula, over 146 rings (statistics of the open core table): always
prefer the
published value, the formula is a check."""


def core_constant_c1(outer: Real, inner: Real, height: Real) -> Real:
    """Core constant ``C1``, the sum of length over area, of a ring of rectangular section.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].
    height : float or ndarray
        Height [m].

    Returns
    -------
    float or ndarray
        ``C1 = 2 pi / (h ln(D/d))`` [1/m].

    References
    ----------
    IEC 60205, ring cores of rectangular section (from memory).

    Examples
    --------
    >>> round(float(core_constant_c1(26.9e-3, 14.5e-3, 11.1e-3)), 3)
    915.976
    """
    return 2.0 * np.pi / (height * np.log(outer / inner))


def core_constant_c2(outer: Real, inner: Real, height: Real) -> Real:
    """Core constant ``C2``, the sum of length over squared area, of a ring of rectangular section.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].
    height : float or ndarray
        Height [m].

    Returns
    -------
    float or ndarray
        ``C2 = 4 pi (1/d - 1/D) / (h^2 ln^3(D/d))`` [1/m3].

    References
    ----------
    IEC 60205, ring cores of rectangular section (from memory).

    Examples
    --------
    >>> f"{core_constant_c2(26.9e-3, 14.5e-3, 11.1e-3):.6g}"
    '1.37387e+07'
    """
    return 4.0 * np.pi * (1.0 / inner - 1.0 / outer) / (np.square(height) * np.log(outer / inner) ** 3)


def effective_length(outer: Real, inner: Real) -> Real:
    """Effective magnetic path length, ``C1^2 / C2``; the height drops out.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].

    Returns
    -------
    float or ndarray
        Length ``pi ln(D/d) / (1/d - 1/D)`` [m].

    References
    ----------
    IEC 60205, ring cores of rectangular section (from memory).

    Examples
    --------
    >>> round(float(effective_length(26.9e-3, 14.5e-3)) * 1e3, 4)
    61.0691
    """
    return np.pi * np.log(outer / inner) / (1.0 / inner - 1.0 / outer)


def effective_area(outer: Real, inner: Real, height: Real) -> Real:
    """Effective section, ``C1 / C2``.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].
    height : float or ndarray
        Height [m].

    Returns
    -------
    float or ndarray
        Area [m2].

    References
    ----------
    IEC 60205, ring cores of rectangular section (from memory).

    Examples
    --------
    >>> round(float(effective_area(26.9e-3, 14.5e-3, 11.1e-3)) * 1e6, 3)
    66.671
    """
    return effective_length(outer, inner) / core_constant_c1(outer, inner, height)


def effective_volume(outer: Real, inner: Real, height: Real) -> Real:
    """Effective volume, ``C1^3 / C2^2``.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].
    height : float or ndarray
        Height [m].

    Returns
    -------
    float or ndarray
        Volume [m3].

    References
    ----------
    IEC 60205, ring cores of rectangular section (from memory).

    Examples
    --------
    >>> round(float(effective_volume(26.9e-3, 14.5e-3, 11.1e-3)) * 1e9, 2)
    4071.54
    """
    return effective_length(outer, inner) * effective_area(outer, inner, height)


def mean_length(outer: Real, inner: Real) -> Real:
    """Path length as iron-powder catalogues give it, ``pi (D + d)/2``.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].

    Returns
    -------
    float or ndarray
        Length [m], 5-7 % more than `effective_length` on usual rings.

    Notes
    -----
    Convention of the catalogues (from memory).

    Examples
    --------
    >>> round(mean_length(26.9e-3, 14.5e-3) * 1e3, 2)
    65.03
    """
    return np.pi * (outer + inner) / 2.0


def geometric_area(outer: Real, inner: Real, height: Real) -> Real:
    """Section as iron-powder catalogues start from, ``h (D - d)/2``, before corners are taken off.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters [m].
    height : float or ndarray
        Height [m].

    Returns
    -------
    float or ndarray
        Area [m2]; catalogues print 2-6 % less for the corners (from memory).

    Notes
    -----
    Derived: a rectangle.

    Examples
    --------
    >>> round(geometric_area(26.9e-3, 14.5e-3, 11.1e-3) * 1e6, 2)
    68.82
    """
    return height * (outer - inner) / 2.0


def surface(outer: Real, inner: Real, height: Real) -> Real:
    """Whole surface of a ring, bore included.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters, bare or wound [m].
    height : float or ndarray
        Height, bare or wound [m].

    Returns
    -------
    float or ndarray
        ``pi (D + d) h + pi/2 (D^2 - d^2)`` [m2].

    Notes
    -----
    Derived: two cylinders and two faces.

    Examples
    --------
    >>> round(float(surface(26.9e-3, 14.5e-3, 11.1e-3)) * 1e4, 1)
    22.5
    """
    return np.pi * (outer + inner) * height + np.pi / 2.0 * (np.square(outer) - np.square(inner))


def inductance_factor(permeability: Real, c1: Real) -> Real:
    """Inductance of one turn, ``A_L = mu_0 mu / C1``.

    Parameters
    ----------
    permeability : float or ndarray
        Relative initial permeability [1].
    c1 : float or ndarray
        Core constant [1/m]; divide by the number of stacked rings.

    Returns
    -------
    float or ndarray
        ``A_L`` [H].

    References
    ----------
    IEC 60205 (from memory).

    Examples
    --------
    >>> round(inductance_factor(75.0, 915.976) * 1e9, 2)
    102.89
    """
    return MU_0 * permeability / c1


def permeability_of_inductance_factor(factor: Real, c1: Real) -> Real:
    """Relative permeability from the inductance factor, the inverse of `inductance_factor`.

    Parameters
    ----------
    factor : float or ndarray
        ``A_L`` [H].
    c1 : float or ndarray
        Core constant [1/m].

    Returns
    -------
    float or ndarray
        Relative permeability [1].

    Notes
    -----
    Derived from `inductance_factor`.

    Examples
    --------
    >>> round(permeability_of_inductance_factor(90e-9, 915.976), 1)
    65.6
    """
    return factor * c1 / MU_0


def turns_for_inductance(inductance: Real, factor: Real) -> Real:
    """Turns for an inductance without bias, ``sqrt(L / A_L)``, not rounded.

    Parameters
    ----------
    inductance : float or ndarray
        Wanted inductance [H].
    factor : float or ndarray
        ``A_L`` [H].

    Returns
    -------
    float or ndarray
        Turns [1].

    Notes
    -----
    Derived: ``L = A_L N^2``.

    Examples
    --------
    >>> round(float(turns_for_inductance(12e-6, 4.9e-9)), 2)
    49.49
    """
    return np.sqrt(inductance / factor)
