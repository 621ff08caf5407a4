"""Inductance of a ring under DC bias.

Law of the powder: the incremental permeability falls as ``mu/mu_i = 1/(1 + (H/H50)^c)``. On a ring the
field falls
from the bore to the outside as ``H(r) = N I/(2 pi r)``; the integral over the section has a closed form.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import hyp2f1

from buckdesign.constants import MU_0, OERSTED
from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "permeability_fraction": {"field": (0.0, 150.0 * OERSTED), "exponent": (1.0, 2.5)},
}
"""The law fits iron powder within 5 points to 100 Oe [A/m]; beyond 150 Oe its integral stays below the
saturation
that real powder reaches (check of the law, derived)."""

_MATCHED_CURRENTS = np.geomspace(0.15, 2.5, 6)


def field_strength(turns: Real, current: Real, length: Real) -> Real:
    """Magnetising field, ``N I / l``.

    Parameters
    ----------
    turns : float or ndarray
        Turns [1].
    current : float or ndarray
        Current [A].
    length : float or ndarray
        Path length; ``2 pi r`` for the field at a radius [m].

    Returns
    -------
    float or ndarray
        Field [A/m].

    Notes
    -----
    Derived: Ampere's law.

    Examples
    --------
    >>> round(field_strength(60, 3.0, 61.0691e-3), 1)
    2947.5
    """
    return turns * current / length


def permeability_fraction(field: Real, half_field: Real, exponent: Real) -> Real:
    """Share of the initial permeability that is left under bias, ``1 / (1 + (|H|/H50)^c)``.

    Parameters
    ----------
    field : float or ndarray
        Bias field [A/m].
    half_field : float or ndarray
        Field that leaves half, ``H50`` [A/m].
    exponent : float or ndarray
        Steepness ``c`` [1].

    Returns
    -------
    float or ndarray
        Incremental over initial permeability [1].

    Notes
    -----
    One-term form of the fits that powder-core makers publish (form from memory).

    Examples
    --------
    >>> float(permeability_fraction(4090.0, 4090.0, 1.5))
    0.5
    """
    return 1.0 / (1.0 + np.abs(field / half_field) ** exponent)


def half_field_from_point(field: Real, fraction: Real, exponent: Real) -> Real:
    """``H50`` of a material from one reading under bias, the inverse of `permeability_fraction`.

    Parameters
    ----------
    field : float or ndarray
        Bias field of the reading [A/m].
    fraction : float or ndarray
        Share of the initial permeability that was left, between 0 and 1 [1].
    exponent : float or ndarray
        Steepness [1].

    Returns
    -------
    float or ndarray
        ``H50`` [A/m].

    Notes
    -----
    Derived from `permeability_fraction`.

    Examples
    --------
    >>> round(float(half_field_from_point(3978.87, 0.51, 1.5)), 0)
    4086.0
    """
    return field / (1.0 / np.asarray(fraction) - 1.0) ** (1.0 / np.asarray(exponent))


def flux_density(field: Real, permeability: Real, half_field: Real, exponent: Real) -> Real:
    """Flux density at a field, the integral of the bias law from zero.

    Parameters
    ----------
    field : float or ndarray
        Field, not negative [A/m].
    permeability : float or ndarray
        Initial permeability [1].
    half_field : float or ndarray
        ``H50`` [A/m].
    exponent : float or ndarray
        Steepness [1].

    Returns
    -------
    float or ndarray
        ``B = mu_0 mu_i H 2F1(1, 1/c; 1 + 1/c; -(H/H50)^c)`` [T].

    Notes
    -----
    Derived: the integral of ``1/(1 + x^c)`` is a hypergeometric function.

    Examples
    --------
    >>> round(float(flux_density(2947.5, 75.0, 4090.0, 1.5)), 4)
    0.228
    """
    inverse = 1.0 / np.asarray(exponent, dtype=float)
    ratio = np.asarray(field / half_field, dtype=float) ** exponent
    return plain(MU_0 * permeability * field * hyp2f1(1.0, inverse, 1.0 + inverse, -ratio))


def ring_inductance_fraction(
    ampere_turns: Real, outer: Real, inner: Real, half_field: Real, exponent: Real
) -> Real:
    """Share of the unbiased inductance that a wound ring keeps, integrated over its section.

    Parameters
    ----------
    ampere_turns : float or ndarray
        Turns times current [A].
    outer, inner : float or ndarray
        Diameters of the ring [m].
    half_field : float or ndarray
        ``H50`` [A/m].
    exponent : float or ndarray
        Steepness [1].

    Returns
    -------
    float or ndarray
        Incremental over unbiased inductance [1].

    Notes
    -----
    Derived: with ``k = N I/(pi H50)`` the integral of ``mu(H(r)) dr/r`` over the section gives
    ``ln((D^c + k^c)/(d^c + k^c)) / (c ln(D/d))``.

    Examples
    --------
    >>> round(float(ring_inductance_fraction(180.0, 26.9e-3, 14.5e-3, 4090.0, 1.5)), 4)
    0.6239
    """
    bore = (np.abs(ampere_turns) / (np.pi * half_field * inner)) ** exponent
    spread = np.log(outer / inner)
    wide = np.expm1(exponent * spread)
    return np.log1p(wide / (1.0 + bore)) / (exponent * spread)


def fraction_spread(ampere_turns: Real, outer: Real, inner: Real, half_field: Real, exponent: Real) -> Real:
    """How much permeability differs between outside and bore: the difference of the two shares that are left.

    Parameters
    ----------
    ampere_turns : float or ndarray
        Turns times current [A].
    outer, inner : float or ndarray
        Diameters of the ring [m].
    half_field : float or ndarray
        ``H50`` [A/m].
    exponent : float or ndarray
        Steepness [1].

    Returns
    -------
    float or ndarray
        Share left at the outer radius minus share left at the bore [1]; a tenth and more is worth mentioning.

    Notes
    -----
    Derived from `permeability_fraction` at both radii.

    Examples
    --------
    >>> round(float(fraction_spread(180.0, 26.9e-3, 14.5e-3, 4090.0, 1.5)), 3)
    0.214
    """
    outside = permeability_fraction(field_strength(1.0, ampere_turns, np.pi * outer), half_field, exponent)
    bore = permeability_fraction(field_strength(1.0, ampere_turns, np.pi * inner), half_field, exponent)
    return outside - bore


def fit_bias_law(current: NDArray[np.float64], fraction: NDArray[np.float64]) -> tuple[Real, Real]:
    """Half current (or field) and exponent of ``1/(1 + (i/I0)^c)`` through points, by least squares.

    Parameters
    ----------
    current : ndarray, shape (..., n)
        Currents or fields, positive, at least two different [A] or [A/m].
    fraction : ndarray, shape (..., n)
        Share of the unbiased value that is left, between 0 and 1 [1].

    Returns
    -------
    tuple of float or ndarray, shape (...)
        ``I0`` [unit of `current`] and the exponent [1].

    Notes
    -----
    Derived: ``ln(1/fraction - 1)`` is a line in ``ln i``; points are weighted with
    ``fraction (1 - fraction)``, which
    turns the residual into one of the fraction itself.

    Examples
    --------
    >>> import numpy as np
    >>> i = np.array([1.0, 2.0, 5.0])
    >>> half, exponent = fit_bias_law(i, 1.0 / (1.0 + (i / 4.0) ** 1.4))
    >>> round(float(half), 6), round(float(exponent), 6)
    (4.0, 1.4)
    """
    x, y = np.log(current), np.log(1.0 / fraction - 1.0)
    weight = np.square(fraction * (1.0 - fraction))
    total = weight.sum(axis=-1)
    mean_x, mean_y = (weight * x).sum(axis=-1) / total, (weight * y).sum(axis=-1) / total
    offset = x - mean_x[..., None]
    exponent = (weight * offset * y).sum(axis=-1) / (weight * offset * offset).sum(axis=-1)
    return plain(np.exp(mean_x - mean_y / exponent)), plain(exponent)


def ring_bias_law(
    turns: Real, outer: Real, inner: Real, half_field: Real, exponent: Real
) -> tuple[Real, Real]:
    """The two numbers of ``L(i) = L0/(1 + (i/I0)^c)`` for a wound ring, fitted to its section's integral.

    Parameters
    ----------
    turns : float or ndarray
        Turns [1].
    outer, inner : float or ndarray
        Diameters of the ring [m].
    half_field : float or ndarray
        ``H50`` of the material [A/m].
    exponent : float or ndarray
        Steepness of the material [1].

    Returns
    -------
    tuple of float or ndarray
        ``I0`` [A] and the exponent of the ring [1].

    Notes
    -----
    Derived: `fit_bias_law` through `ring_inductance_fraction` from 0.15 to 2.5 times the current that gives
    ``H50``
    on the mean radius; agrees with the integral within 0.2 % of the unbiased inductance for ``D/d`` up to
    2.2.

    Examples
    --------
    >>> half, exponent = ring_bias_law(60, 26.9e-3, 14.5e-3, 4090.0, 1.5)
    >>> round(float(half), 2), round(float(exponent), 2)
    (4.23, 1.48)
    """
    scale = np.asarray(np.pi * half_field * np.sqrt(np.asarray(outer * inner, dtype=float)))
    ampere_turns = scale[..., None] * _MATCHED_CURRENTS
    last = [np.asarray(x, dtype=float)[..., None] for x in (outer, inner, half_field, exponent)]
    fraction = np.asarray(ring_inductance_fraction(ampere_turns, *last))
    half, steepness = fit_bias_law(ampere_turns, fraction)
    return half / turns, steepness
