"""Flux, energy and saturation of a choke, and the turns that an inductance under bias needs."""

from __future__ import annotations

import numpy as np
from numpy.polynomial.legendre import leggauss
from scipy.special import hyp2f1

from buckdesign.constants import MU_0
from buckdesign.physics.arrays import Ranges, Real, plain
from buckdesign.physics.bias import flux_density, ring_inductance_fraction

RANGES: Ranges = {
    "ferrite_saturation_current": {"flux_limit": (0.2, 0.5)},
    "turns_for_biased_inductance": {"exponent": (1.0, 2.0)},
}
"""Saturation of power ferrite between 25 and 100 degC [T] (from memory); below an exponent of 2 more turns
always
give more inductance under bias (derived)."""

FERRITE_FLUX_LIMIT = 0.39
"""Saturation of a common power ferrite at 100 degC [T] (from memory)."""

_NODES, _WEIGHTS = leggauss(12)
_BISECTIONS = 60


def inductance_at_current(inductance: Real, current: Real, bias_current: Real, bias_exponent: Real) -> Real:
    """Incremental inductance under bias, ``L0 / (1 + (i/I0)^c)``.

    Parameters
    ----------
    inductance : float or ndarray
        Inductance without bias [H].
    current : float or ndarray
        Choke current [A].
    bias_current : float or ndarray
        Current that leaves half, infinite for a constant inductance [A].
    bias_exponent : float or ndarray
        Exponent [1].

    Returns
    -------
    float or ndarray
        Incremental inductance [H].

    Notes
    -----
    Derived: the bias law of the material carried over to the winding, see
    `buckdesign.physics.bias.ring_bias_law`.

    Examples
    --------
    >>> float(inductance_at_current(220e-6, 5.0, 5.0, 1.5))
    0.00011
    """
    return inductance / (1.0 + np.abs(current / bias_current) ** bias_exponent)


def bias_current_of_bought_choke(saturation_current: Real) -> Real:
    """Bias current ``I0`` of a bought choke whose inductance falls to 70 % at a current, exponent 1.5.

    Parameters
    ----------
    saturation_current : float or ndarray
        Current at which 70 % of the inductance is left [A].

    Returns
    -------
    float or ndarray
        ``I0 = I_sat (0.7/0.3)^(1/1.5)`` [A].

    Notes
    -----
    Derived from `inductance_at_current`: ``L/(1 + 0.4286 (i/I_sat)^1.5)``.

    Examples
    --------
    >>> round(bias_current_of_bought_choke(5.0), 4)
    8.7961
    """
    return saturation_current * (0.7 / 0.3) ** (1.0 / 1.5)


def flux_linkage(inductance: Real, current: Real, bias_current: Real, bias_exponent: Real) -> Real:
    """Flux linkage, the integral of the incremental inductance over the current.

    Parameters
    ----------
    inductance : float or ndarray
        Inductance without bias [H].
    current : float or ndarray
        Choke current, not negative [A].
    bias_current : float or ndarray
        Current that leaves half, may be infinite [A].
    bias_exponent : float or ndarray
        Exponent [1].

    Returns
    -------
    float or ndarray
        Flux linkage [V s].

    Notes
    -----
    Derived: ``L0 i 2F1(1, 1/c; 1 + 1/c; -(i/I0)^c)``.

    Examples
    --------
    >>> round(float(flux_linkage(200e-6, 3.0, float("inf"), 1.5)) * 1e6, 6)
    600.0
    """
    inverse = 1.0 / np.asarray(bias_exponent, dtype=float)
    ratio = np.asarray(current / bias_current, dtype=float) ** bias_exponent
    return plain(inductance * current * hyp2f1(1.0, inverse, 1.0 + inverse, -ratio))


def stored_energy(inductance: Real, current: Real, bias_current: Real, bias_exponent: Real) -> Real:
    """Energy stored in the choke, the integral of ``L(i) i`` over the current.

    Parameters
    ----------
    inductance : float or ndarray
        Inductance without bias [H].
    current : float or ndarray
        Choke current, not negative [A].
    bias_current : float or ndarray
        Current that leaves half, may be infinite [A].
    bias_exponent : float or ndarray
        Exponent [1].

    Returns
    -------
    float or ndarray
        Energy [J].

    Notes
    -----
    Derived: ``L0 i^2/2 2F1(1, 2/c; 1 + 2/c; -(i/I0)^c)``.

    Examples
    --------
    >>> round(float(stored_energy(200e-6, 3.0, float("inf"), 1.5)) * 1e6, 6)
    900.0
    """
    double = 2.0 / np.asarray(bias_exponent, dtype=float)
    ratio = np.asarray(current / bias_current, dtype=float) ** bias_exponent
    factor = hyp2f1(1.0, double, 1.0 + double, -ratio)
    return plain(0.5 * inductance * current * current * factor)


def flux_swing(volt_seconds: Real, turns: Real, area: Real) -> Real:
    """Swing of the flux density in one interval, peak to peak, ``V t / (N A_e)``.

    Parameters
    ----------
    volt_seconds : float or ndarray
        Volt-second product of the interval [V s].
    turns : float or ndarray
        Turns [1].
    area : float or ndarray
        Effective section [m2].

    Returns
    -------
    float or ndarray
        Flux swing, peak to peak [T]; core-loss formulas take half of it.

    Notes
    -----
    Derived: Faraday's law.

    Examples
    --------
    >>> round(flux_swing(4.25 * 0.790640394 / 30e3, 46, 65.9e-6) / 2.0 * 1e3, 2)
    18.47
    """
    return volt_seconds / (turns * area)


def section_mean_flux_density(
    ampere_turns: Real, outer: Real, inner: Real, permeability: Real, half_field: Real, exponent: Real
) -> Real:
    """Flux over the section of a ring divided by the section, with the field of each radius.

    Parameters
    ----------
    ampere_turns : float or ndarray
        Turns times current [A].
    outer, inner : float or ndarray
        Diameters of the ring [m].
    permeability : float or ndarray
        Initial permeability [1].
    half_field : float or ndarray
        ``H50`` [A/m].
    exponent : float or ndarray
        Steepness [1].

    Returns
    -------
    float or ndarray
        Mean flux density [T]; the largest is at the bore, `buckdesign.physics.bias.flux_density` at ``pi d``.

    Notes
    -----
    Derived: 12-point Gauss quadrature over the radius.

    Examples
    --------
    >>> round(float(section_mean_flux_density(180.0, 26.9e-3, 14.5e-3, 75.0, 4090.0, 1.5)), 4)
    0.221
    """
    given = (ampere_turns, outer, inner, permeability, half_field, exponent)
    drive, far, near, mu, half, power = (np.asarray(x, dtype=float)[..., None] for x in given)
    diameter = (far + near) / 2.0 + (far - near) / 2.0 * _NODES
    density = np.asarray(flux_density(drive / (np.pi * diameter), mu, half, power))
    return plain((density * _WEIGHTS).sum(axis=-1) / 2.0)


def turns_for_biased_inductance(
    inductance: Real,
    factor: Real,
    current: Real,
    outer: Real,
    inner: Real,
    half_field: Real,
    exponent: Real,
) -> Real:
    """Turns that keep a wanted incremental inductance at a bias current, not rounded.

    Parameters
    ----------
    inductance : float or ndarray
        Wanted inductance at the current [H].
    factor : float or ndarray
        ``A_L`` without bias, of the whole stack [H].
    current : float or ndarray
        Bias current [A].
    outer, inner : float or ndarray
        Diameters of the ring [m].
    half_field : float or ndarray
        ``H50`` [A/m].
    exponent : float or ndarray
        Steepness [1].

    Returns
    -------
    float or ndarray
        Turns [1]; NaN where no number below a thousand times the unbiased one reaches it (exponent of 2 and
        more).

    Notes
    -----
    Derived: bisection of ``A_L N^2 ring_inductance_fraction(N I)``, which rises with ``N`` for exponents
    below 2.

    Examples
    --------
    >>> round(float(turns_for_biased_inductance(200e-6, 90e-9, 3.0, 26.9e-3, 14.5e-3, 4090.0, 1.5)), 1)
    59.6
    """
    given = np.broadcast_arrays(inductance, factor, current, outer, inner, half_field, exponent)
    wanted, al, amps, far, near, half, power = (np.asarray(x, dtype=float) for x in given)

    def reached(turns: Real) -> Real:
        return al * np.square(turns) * ring_inductance_fraction(turns * amps, far, near, half, power)

    low = np.sqrt(wanted / al)
    high = 1000.0 * low
    possible = np.asarray(reached(high)) >= wanted
    for _ in range(_BISECTIONS):
        middle = np.sqrt(low * high)
        enough = np.asarray(reached(middle)) >= wanted
        low, high = np.where(enough, low, middle), np.where(enough, middle, high)
    return plain(np.where(possible, high, np.nan))


def saturation_margin(flux_density: Real, saturation: Real) -> Real:
    """Saturation flux density over the one at work; below 1 the core is saturated.

    Parameters
    ----------
    flux_density : float or ndarray
        Largest flux density at work [T].
    saturation : float or ndarray
        Saturation of the material [T].

    Returns
    -------
    float or ndarray
        Margin [1]; infinite without flux.

    Notes
    -----
    Derived: a ratio.

    Examples
    --------
    >>> float(saturation_margin(0.5, 1.0))
    2.0
    """
    none = np.asarray(flux_density) == 0.0
    return plain(np.where(none, np.inf, saturation / np.where(none, 1.0, flux_density)))


def linear_flux_density(turns: Real, current: Real, permeability: Real, length: Real) -> Real:
    """Flux density if the core did not saturate, ``mu_0 mu N I / l``.

    Parameters
    ----------
    turns : float or ndarray
        Turns [1].
    current : float or ndarray
        Current [A].
    permeability : float or ndarray
        Relative permeability [1].
    length : float or ndarray
        Effective path length [m].

    Returns
    -------
    float or ndarray
        Flux density [T]; far above saturation it shows that the core cannot work.

    Notes
    -----
    Derived: Ampere's law.

    Examples
    --------
    >>> round(linear_flux_density(11, 3.0, 2200.0, 61.0691e-3), 3)
    1.494
    """
    return MU_0 * permeability * turns * current / length


def ferrite_saturation_current(turns: Real, permeability: Real, length: Real, flux_limit: Real) -> Real:
    """Current at which an ungapped core of constant permeability saturates, ``B l / (mu_0 mu N)``.

    Parameters
    ----------
    turns : float or ndarray
        Turns [1].
    permeability : float or ndarray
        Relative permeability [1].
    length : float or ndarray
        Effective path length [m].
    flux_limit : float or ndarray
        Saturation, such as `FERRITE_FLUX_LIMIT` [T].

    Returns
    -------
    float or ndarray
        Current [A].

    Notes
    -----
    Derived: Ampere's law.

    Examples
    --------
    >>> round(ferrite_saturation_current(11, 2200.0, 61.0691e-3, 0.39), 3)
    0.783
    """
    return flux_limit * length / (MU_0 * permeability * turns)


def turns_for_flux(inductance: Real, peak_current: Real, flux_limit: Real, area: Real) -> Real:
    """Smallest number of turns that keeps a linear choke below a flux density, ``L I / (B A_e)``.

    Parameters
    ----------
    inductance : float or ndarray
        Inductance [H].
    peak_current : float or ndarray
        Largest current [A].
    flux_limit : float or ndarray
        Largest flux density [T].
    area : float or ndarray
        Effective section [m2].

    Returns
    -------
    float or ndarray
        Turns [1], not rounded.

    Notes
    -----
    Derived: ``N Phi = L I``.

    Examples
    --------
    >>> round(turns_for_flux(334.8e-6, 3.3, 0.3, 66.671e-6), 2)
    55.24
    """
    return inductance * peak_current / (flux_limit * area)


def gap_for_inductance(turns: Real, area: Real, inductance: Real) -> Real:
    """Gap that alone sets the inductance, ``mu_0 N^2 A_e / L``; fringing and core path neglected.

    Parameters
    ----------
    turns : float or ndarray
        Turns [1].
    area : float or ndarray
        Effective section [m2].
    inductance : float or ndarray
        Inductance [H].

    Returns
    -------
    float or ndarray
        Gap length [m].

    Notes
    -----
    Derived: reluctance of the gap.

    Examples
    --------
    >>> round(gap_for_inductance(55.2384, 66.671e-6, 334.8e-6) * 1e3, 3)
    0.764
    """
    return MU_0 * turns * turns * area / inductance
