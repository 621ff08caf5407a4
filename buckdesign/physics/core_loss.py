"""Core loss per volume [W/m3] for sinusoidal and triangular flux; flux density in tesla, always the peak.

The published coefficients of iron powder are for mW/cm3, hertz and gauss; they are taken as printed and
converted here, so that no caller meets those units.
"""

from __future__ import annotations

import numpy as np
from scipy.special import gammaln

from buckdesign.constants import GAUSS
from buckdesign.physics.arrays import Ranges, Real

RANGES: Ranges = {
    "three_term_loss": {"frequency": (60.0, 500e3), "peak_flux": (50.0 * GAUSS, 5000.0 * GAUSS)},
    "igse_coefficient_approximate": {"alpha": (1.0, 2.0)},
}
"""Frequency [Hz] and peak flux density [T] of the published points; the approximation is good to 0.1 %
there."""

_PER_CM3 = 1000.0
"""1 mW/cm3 in W/m3."""


def three_term_hysteresis(frequency: Real, peak_flux: Real, a: Real, b: Real, c: Real) -> Real:
    """Hysteresis part of the published three-term form, ``f / (a/B^3 + b/B^2.3 + c/B^1.65)``.

    Parameters
    ----------
    frequency : float or ndarray
        Frequency [Hz].
    peak_flux : float or ndarray
        Peak of the alternating flux density [T].
    a, b, c : float or ndarray
        Coefficients as printed, for mW/cm3, Hz and gauss [as printed].

    Returns
    -------
    float or ndarray
        Loss per volume [W/m3].

    References
    ----------
    Power-conversion catalogue of an iron-powder maker, issue L, Feb 2007, "Core Losses" (from memory).

    Examples
    --------
    >>> round(float(three_term_hysteresis(80e3, 0.067, 1.0e9, 1.1e8, 2.1e6)) * 4.28e-6, 3)
    4.089
    """
    gauss = np.asarray(peak_flux) / GAUSS
    return _PER_CM3 * frequency * gauss**3 / (a + b * gauss**0.7 + c * gauss**1.35)


def three_term_eddy(frequency: Real, peak_flux: Real, d: Real) -> Real:
    """Eddy-current part of the published three-term form, ``d f^2 B^2``.

    Parameters
    ----------
    frequency : float or ndarray
        Frequency [Hz].
    peak_flux : float or ndarray
        Peak of the alternating flux density [T].
    d : float or ndarray
        Coefficient as printed, for mW/cm3, Hz and gauss [as printed].

    Returns
    -------
    float or ndarray
        Loss per volume [W/m3].

    References
    ----------
    Power-conversion catalogue of an iron-powder maker, issue L, Feb 2007, "Core Losses" (from memory).

    Examples
    --------
    >>> round(float(three_term_eddy(80e3, 0.067, 6.9e-14)) * 4.28e-6, 3)
    0.848
    """
    return _PER_CM3 * d * np.square(frequency * np.asarray(peak_flux) / GAUSS)


def three_term_loss(frequency: Real, peak_flux: Real, a: Real, b: Real, c: Real, d: Real) -> Real:
    """Loss of iron powder with sinusoidal flux.

    Parameters
    ----------
    frequency : float or ndarray
        Frequency [Hz].
    peak_flux : float or ndarray
        Peak of the alternating flux density [T].
    a, b, c, d : float or ndarray
        Coefficients as printed, for mW/cm3, Hz and gauss [as printed].

    Returns
    -------
    float or ndarray
        Loss per volume [W/m3].

    References
    ----------
    Power-conversion catalogue of an iron-powder maker, issue L, Feb 2007, "Core Losses" (from memory).

    Examples
    --------
    >>> round(float(three_term_loss(50e3, 0.0225, 1.0e9, 1.1e8, 1.9e6, 1.9e-13)))
    89359
    """
    return three_term_hysteresis(frequency, peak_flux, a, b, c) + three_term_eddy(frequency, peak_flux, d)


def triangular_eddy_factor(duty: Real) -> Real:
    """Eddy-current loss of a triangular flux over that of a sine of equal peak, ``(2/pi^2)/(D (1-D))``.

    Parameters
    ----------
    duty : float or ndarray
        Share of the period in which the flux rises [1].

    Returns
    -------
    float or ndarray
        Factor [1].

    Notes
    -----
    Derived: the mean square of the slope; `triangular_to_sine_ratio` with ``alpha = 2``.

    Examples
    --------
    >>> round(triangular_eddy_factor(0.5), 6)
    0.810569
    """
    return 2.0 / (np.pi**2 * duty * (1.0 - duty))


def three_term_loss_triangular(
    frequency: Real, peak_flux: Real, duty: Real, a: Real, b: Real, c: Real, d: Real
) -> Real:
    """Loss of iron powder with the triangular flux of a converter: only the eddy part feels the duty.

    Parameters
    ----------
    frequency : float or ndarray
        Switching frequency [Hz].
    peak_flux : float or ndarray
        Half the swing of the flux density [T].
    duty : float or ndarray
        Share of the period in which the flux rises [1].
    a, b, c, d : float or ndarray
        Coefficients as printed, for mW/cm3, Hz and gauss [as printed].

    Returns
    -------
    float or ndarray
        Loss per volume [W/m3].

    Notes
    -----
    Derived: the improved generalised Steinmetz equation leaves a term with ``f^1`` and multiplies one with
    ``f^2``
    by `triangular_eddy_factor`.

    Examples
    --------
    >>> round(float(three_term_loss_triangular(50e3, 0.0225, 0.5, 1.0e9, 1.1e8, 1.9e6, 1.9e-13)))
    84804
    """
    eddy = three_term_eddy(frequency, peak_flux, d) * triangular_eddy_factor(duty)
    return three_term_hysteresis(frequency, peak_flux, a, b, c) + eddy


def three_term_exponents(
    frequency: Real, peak_flux: Real, a: Real, b: Real, c: Real, d: Real
) -> tuple[Real, Real]:
    """Local exponents of frequency and flux density of the three-term form, as Steinmetz's equation has them.

    Parameters
    ----------
    frequency : float or ndarray
        Frequency [Hz].
    peak_flux : float or ndarray
        Peak of the alternating flux density, not zero [T].
    a, b, c, d : float or ndarray
        Coefficients as printed, for mW/cm3, Hz and gauss [as printed].

    Returns
    -------
    tuple of float or ndarray
        Exponents of frequency and of flux density [1].

    Notes
    -----
    Derived: logarithmic derivatives.

    Examples
    --------
    >>> alpha, beta = three_term_exponents(30e3, 0.03, 1.0e9, 1.1e8, 1.9e6, 1.9e-13)
    >>> round(float(alpha), 2), round(float(beta), 2)
    (1.17, 2.1)
    """
    gauss = np.asarray(peak_flux) / GAUSS
    eddy = three_term_eddy(frequency, peak_flux, d)
    share = eddy / three_term_loss(frequency, peak_flux, a, b, c, d)
    low, high = b * gauss**0.7, c * gauss**1.35
    hysteresis = 3.0 - (0.7 * low + 1.35 * high) / (a + low + high)
    return 1.0 + share, hysteresis * (1.0 - share) + 2.0 * share


def steinmetz_loss(k: Real, alpha: Real, beta: Real, frequency: Real, peak_flux: Real) -> Real:
    """Loss with sinusoidal flux, ``k f^alpha B^beta``.

    Parameters
    ----------
    k : float or ndarray
        Coefficient for hertz and tesla [W/m3].
    alpha, beta : float or ndarray
        Exponents of frequency and flux density [1].
    frequency : float or ndarray
        Frequency [Hz].
    peak_flux : float or ndarray
        Peak of the alternating flux density [T].

    Returns
    -------
    float or ndarray
        Loss per volume [W/m3].

    References
    ----------
    C. P. Steinmetz, Trans. AIEE 9 (1892), with the frequency exponent of later use (from memory).

    Examples
    --------
    >>> round(float(steinmetz_loss(2.0, 1.0, 2.0, 1e3, 0.1)), 6)
    20.0
    """
    return k * np.power(frequency, alpha) * np.power(peak_flux, beta)


def igse_coefficient(k: Real, alpha: Real, beta: Real) -> Real:
    """Coefficient ``k_i`` of the improved generalised Steinmetz equation, exactly.

    Parameters
    ----------
    k : float or ndarray
        Coefficient of `steinmetz_loss` [W/m3].
    alpha, beta : float or ndarray
        Exponents of frequency and flux density [1].

    Returns
    -------
    float or ndarray
        ``k / ((2 pi)^(alpha-1) 2^(beta-alpha) integral |cos|^alpha)`` [W/m3].

    Notes
    -----
    The integral from 0 to ``2 pi`` is ``2 sqrt(pi) Gamma((alpha+1)/2)/Gamma(alpha/2+1)`` (derived).

    References
    ----------
    K. Venkatachalam, C. R. Sullivan, T. Abdallah and H. Tacca, COMPEL 2002 (from memory).

    Examples
    --------
    >>> round(float(igse_coefficient(1.0, 1.0, 2.0)), 6)
    0.125
    """
    alpha = np.asarray(alpha, dtype=float)
    logarithm = gammaln((alpha + 1.0) / 2.0) - gammaln(alpha / 2.0 + 1.0)
    integral = 2.0 * np.sqrt(np.pi) * np.exp(logarithm)
    return k / ((2.0 * np.pi) ** (alpha - 1.0) * 2.0 ** (beta - alpha) * integral)


def igse_coefficient_approximate(k: Real, alpha: Real, beta: Real) -> Real:
    """Coefficient ``k_i`` by the published approximation.

    Parameters
    ----------
    k : float or ndarray
        Coefficient of `steinmetz_loss` [W/m3].
    alpha, beta : float or ndarray
        Exponents of frequency and flux density [1].

    Returns
    -------
    float or ndarray
        ``k / (2^(beta+1) pi^(alpha-1) (0.2761 + 1.7061/(alpha + 1.354)))`` [W/m3].

    References
    ----------
    K. Venkatachalam, C. R. Sullivan, T. Abdallah and H. Tacca, COMPEL 2002 (from memory).

    Examples
    --------
    >>> round(float(igse_coefficient_approximate(1.0, 1.0, 2.0)), 4)
    0.1249
    """
    return k / (2.0 ** (beta + 1.0) * np.pi ** (alpha - 1.0) * (0.2761 + 1.7061 / (alpha + 1.354)))


def igse_triangular_loss(
    coefficient: Real, alpha: Real, beta: Real, frequency: Real, flux_swing: Real, duty: Real
) -> Real:
    """Loss with triangular flux by the improved generalised Steinmetz equation.

    Parameters
    ----------
    coefficient : float or ndarray
        ``k_i`` of `igse_coefficient` [W/m3].
    alpha, beta : float or ndarray
        Exponents of frequency and flux density [1].
    frequency : float or ndarray
        Switching frequency [Hz].
    flux_swing : float or ndarray
        Swing of the flux density, peak to peak [T].
    duty : float or ndarray
        Share of the period in which the flux rises [1].

    Returns
    -------
    float or ndarray
        ``k_i f^alpha dB^beta (D^(1-alpha) + (1-D)^(1-alpha))`` [W/m3].

    References
    ----------
    K. Venkatachalam, C. R. Sullivan, T. Abdallah and H. Tacca, COMPEL 2002 (from memory).

    Examples
    --------
    >>> round(float(igse_triangular_loss(0.125, 1.0, 2.0, 1e3, 0.2, 0.3)), 6)
    10.0
    """
    shape = np.power(duty, 1.0 - alpha) + np.power(1.0 - duty, 1.0 - alpha)
    return coefficient * np.power(frequency, alpha) * np.power(flux_swing, beta) * shape


def triangular_to_sine_ratio(alpha: Real, duty: Real) -> Real:
    """Loss of a triangular flux over that of a sine of equal peak and frequency; ``beta`` drops out.

    Parameters
    ----------
    alpha : float or ndarray
        Exponent of the frequency [1].
    duty : float or ndarray
        Share of the period in which the flux rises [1].

    Returns
    -------
    float or ndarray
        Ratio [1].

    Notes
    -----
    Derived from `igse_triangular_loss` and `steinmetz_loss`.

    Examples
    --------
    >>> round(float(triangular_to_sine_ratio(1.3, 0.25)), 5)
    1.00607
    """
    return igse_triangular_loss(igse_coefficient(1.0, alpha, 0.0), alpha, 0.0, 1.0, 1.0, duty)
