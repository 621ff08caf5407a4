"""Round copper wire: gauge, resistance, skin and proximity effect, loss by the ripple of the current."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import jve

from buckdesign.constants import (
    COPPER_REFERENCE_C,
    COPPER_RESISTIVITY,
    COPPER_TEMPERATURE_COEFFICIENT,
    MU_0,
)
from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "awg_diameter": {"gauge": (0.0, 40.0)},
    "copper_resistivity": {"temperature_c": (-50.0, 200.0)},
    "round_wire_factor_series": {"diameter / skin depth": (0.0, 2.2)},
}
"""Gauges of the standard's formula; linear range of copper; the series is within 1 % there (derived)."""

_TINY = 1e-9
_FRACTION_LIMIT = 4.0
_FRACTION_TERMS = 18


def awg_diameter(gauge: Real) -> Real:
    """Conductor diameter of an American wire gauge number, ``0.127 mm * 92^((36-n)/39)``.

    Parameters
    ----------
    gauge : float or ndarray
        Gauge number; 0 for 1/0, -1 for 2/0 [1].

    Returns
    -------
    float or ndarray
        Diameter [m], not rounded; tables round to four digits.

    References
    ----------
    ASTM B258.

    Examples
    --------
    >>> round(awg_diameter(18) * 1e3, 4)
    1.0237
    """
    return 0.127e-3 * 92.0 ** ((36.0 - gauge) / 39.0)


def copper_resistivity(temperature_c: Real) -> Real:
    """Resistivity of annealed copper at a temperature.

    Parameters
    ----------
    temperature_c : float or ndarray
        Temperature [degC].

    Returns
    -------
    float or ndarray
        Resistivity [ohm m].

    References
    ----------
    IEC 60028:1925: 1/58 ohm mm2/m at 20 degC, 0.00393/K.

    Examples
    --------
    >>> f"{copper_resistivity(100.0):.5g}"
    '2.2662e-08'
    """
    return COPPER_RESISTIVITY * (1.0 + COPPER_TEMPERATURE_COEFFICIENT * (temperature_c - COPPER_REFERENCE_C))


def dc_resistance(length: Real, diameter: Real, strands: Real, temperature_c: Real) -> Real:
    """Resistance of parallel round strands.

    Parameters
    ----------
    length : float or ndarray
        Length of each strand [m].
    diameter : float or ndarray
        Conductor diameter [m].
    strands : float or ndarray
        Strands in parallel [1].
    temperature_c : float or ndarray
        Temperature [degC].

    Returns
    -------
    float or ndarray
        Resistance [ohm].

    Notes
    -----
    Derived: ``rho l / A``.

    Examples
    --------
    >>> round(dc_resistance(1.0, 0.8e-3, 1, 20.0) * 1e3, 2)
    34.3
    """
    area = np.pi / 4.0 * diameter * diameter * strands
    return copper_resistivity(temperature_c) * length / area


def skin_depth(frequency: Real, temperature_c: Real) -> Real:
    """Skin depth of copper, ``sqrt(rho / (pi f mu_0))``.

    Parameters
    ----------
    frequency : float or ndarray
        Frequency, not zero [Hz].
    temperature_c : float or ndarray
        Temperature [degC].

    Returns
    -------
    float or ndarray
        Skin depth [m].

    Notes
    -----
    Derived: Maxwell's equations in a half space.

    Examples
    --------
    >>> round(float(skin_depth(50e3, 20.0)) * 1e3, 5)
    0.29554
    """
    return np.sqrt(copper_resistivity(temperature_c) / (np.pi * frequency * MU_0))


def round_wire_factor(diameter: Real, depth: Real) -> Real:
    """AC over DC resistance of an isolated round wire, exactly.

    Parameters
    ----------
    diameter : float or ndarray
        Conductor diameter [m].
    depth : float or ndarray
        Skin depth [m].

    Returns
    -------
    float or ndarray
        ``Re(z J0(z) / (2 J1(z)))`` with ``z = (1 - j) d/(2 delta)`` [1].

    Notes
    -----
    Up to 4 skin depths of radius by the continued fraction of the quotient,
    ``2 - z^2/(4 - z^2/(6 - ...))``, which is
    faster and exact to rounding there (derived); above with Bessel functions scaled by their exponential
    growth,
    so that thick wires do not overflow.

    References
    ----------
    J. A. Ferreira, Electromagnetic Modelling of Power Electronic Converters, 1989 (from memory).

    Examples
    --------
    >>> depth = skin_depth(100e3, 20.0)
    >>> round(float(round_wire_factor(1.0e-3, depth)), 4)
    1.4498
    """
    ratio = np.asarray(diameter / (2.0 * np.asarray(depth)), dtype=float)
    thick = ratio > _FRACTION_LIMIT
    factor = _round_wire_fraction(np.minimum(ratio, _FRACTION_LIMIT))
    if np.any(thick):
        z = (1.0 - 1.0j) * ratio[thick]
        factor[thick] = (z * jve(0.0, z) / (2.0 * jve(1.0, z))).real
    return plain(factor)


def round_wire_factor_series(diameter: Real, depth: Real) -> Real:
    """AC over DC resistance of a thin isolated round wire, ``1 + (d/delta)^4 / 768``.

    Parameters
    ----------
    diameter : float or ndarray
        Conductor diameter, below 2.2 skin depths [m].
    depth : float or ndarray
        Skin depth [m].

    Returns
    -------
    float or ndarray
        Factor [1].

    Notes
    -----
    Derived: first term of the series of `round_wire_factor`.

    Examples
    --------
    >>> round(round_wire_factor_series(0.5e-3, 0.4673e-3), 4)
    1.0017
    """
    return 1.0 + (diameter / depth) ** 4 / 768.0


def foil_height(diameter: Real, depth: Real, porosity: Real) -> Real:
    """Height of the foil that stands for a layer of round wires, in skin depths.

    Parameters
    ----------
    diameter : float or ndarray
        Conductor diameter [m].
    depth : float or ndarray
        Skin depth [m].
    porosity : float or ndarray
        Share of the layer's width that is copper, ``N d / width`` [1].

    Returns
    -------
    float or ndarray
        ``x = (sqrt(pi)/2) (d/delta) sqrt(eta)`` [1].

    References
    ----------
    P. L. Dowell, Proc. IEE 113 (1966) 1387 (from memory).

    Examples
    --------
    >>> round(float(foil_height(1.0e-3, 0.5e-3, 0.8)), 4)
    1.5853
    """
    return np.sqrt(np.pi) / 2.0 * diameter / depth * np.sqrt(porosity)


def layer_factor(height: Real, layers: Real) -> Real:
    """AC over DC resistance of a winding of several layers, averaged over the layers.

    Parameters
    ----------
    height : float or ndarray
        Foil height in skin depths, see `foil_height` [1].
    layers : float or ndarray
        Number of layers [1].

    Returns
    -------
    float or ndarray
        ``x ((sinh 2x + sin 2x)/(cosh 2x - cos 2x) + 2 (m^2 - 1)/3 (sinh x - sin x)/(cosh x + cos x))`` [1].

    Notes
    -----
    Written with decaying exponentials, so that thick wires do not overflow (derived).

    References
    ----------
    P. L. Dowell, Proc. IEE 113 (1966) 1387 (from memory).

    Examples
    --------
    >>> round(float(layer_factor(1.0, 2)), 5)
    1.40601
    """
    x = np.maximum(height, _TINY)
    once, sine, cosine = np.exp(-x), np.sin(x), np.cos(x)
    twice = once * once
    skin = (1.0 - twice * twice + 4.0 * twice * sine * cosine) / ((1.0 - twice) ** 2 + 4.0 * twice * sine**2)
    proximity = (1.0 - twice - 2.0 * once * sine) / (1.0 + twice + 2.0 * once * cosine)
    return x * (skin + 2.0 / 3.0 * (np.square(layers) - 1.0) * proximity)


def winding_factor(diameter: Real, depth: Real, layers: Real, porosity: Real) -> Real:
    """AC over DC resistance of a wound choke: the larger of isolated wire and layers.

    Parameters
    ----------
    diameter : float or ndarray
        Conductor diameter [m].
    depth : float or ndarray
        Skin depth [m].
    layers : float or ndarray
        Number of layers at the bore [1].
    porosity : float or ndarray
        Share of the layer's width that is copper, at the bore where wires lie closest [1].

    Returns
    -------
    float or ndarray
        Factor [1].

    Notes
    -----
    Derived: a loose layer tends to isolated wires, a tight one to `layer_factor`; each is a lower bound.

    Examples
    --------
    >>> round(float(winding_factor(1.0e-3, 0.5e-3, 2, 0.9)), 3)
    3.563
    """
    layered = layer_factor(foil_height(diameter, depth, porosity), layers)
    return np.maximum(round_wire_factor(diameter, depth), layered)


def triangle_harmonics(ripple: Real, duty: Real, count: int) -> Real:
    """Rms values of the first harmonics of a triangular current.

    Parameters
    ----------
    ripple : float or ndarray
        Ripple current, peak to peak [A].
    duty : float or ndarray
        Share of the period in which the current rises [1].
    count : int
        Number of harmonics [1].

    Returns
    -------
    ndarray, shape (..., count)
        ``dI |sin(n pi D)| / (sqrt(2) pi^2 n^2 D (1-D))`` [A].

    Notes
    -----
    Derived: Fourier series of a triangle.

    Examples
    --------
    >>> round(float(triangle_harmonics(1.0, 0.5, 3)[0]), 6)
    0.28658
    """
    order = np.arange(1, count + 1)
    swing, rise = np.asarray(ripple, dtype=float)[..., None], np.asarray(duty, dtype=float)[..., None]
    scale = np.sqrt(2.0) * np.pi**2 * order**2 * rise * (1.0 - rise)
    return swing * np.abs(np.sin(np.pi * order * rise)) / scale


def ripple_copper_loss(resistance: Real, ripple: Real, duty: Real, factors: Real) -> Real:
    """Copper loss of the ripple current alone, harmonic by harmonic.

    Parameters
    ----------
    resistance : float or ndarray
        DC resistance at temperature [ohm].
    ripple : float or ndarray
        Ripple current, peak to peak [A].
    duty : float or ndarray
        Share of the period in which the current rises [1].
    factors : ndarray, shape (..., n)
        AC over DC resistance at the first n harmonics [1]; the rest of the ripple takes the last one.

    Returns
    -------
    float or ndarray
        Loss [W]; that of the mean current comes on top.

    Notes
    -----
    Derived: Parseval's theorem, the ripple's rms is ``dI / sqrt(12)``.

    Examples
    --------
    >>> import numpy as np
    >>> round(float(ripple_copper_loss(1.0, 1.2, 0.4, np.ones(5))), 6)
    0.12
    """
    squares = np.square(triangle_harmonics(ripple, duty, np.shape(factors)[-1]))
    rest = np.maximum(np.square(ripple) / 12.0 - squares.sum(axis=-1), 0.0)
    last = np.asarray(factors)[..., -1]
    return plain(resistance * ((squares * factors).sum(axis=-1) + rest * last))


def effective_frequency(frequency: Real, duty: Real) -> Real:
    """Frequency of the sine whose slope has the rms of a triangular current's slope, at equal rms current.

    Parameters
    ----------
    frequency : float or ndarray
        Switching frequency [Hz].
    duty : float or ndarray
        Share of the period in which the current rises [1].

    Returns
    -------
    float or ndarray
        ``f sqrt(3/(D (1-D))) / pi`` [Hz]; one resistance factor at it replaces the sum over harmonics for
        thin wires.

    References
    ----------
    C. R. Sullivan, IEEE Trans. Power Electronics 14 (1999) 283 (from memory).

    Examples
    --------
    >>> round(float(effective_frequency(30e3, 0.5)))
    33080
    """
    return frequency * np.sqrt(3.0 / (duty * (1.0 - duty))) / np.pi


def _round_wire_fraction(ratio: NDArray[np.float64]) -> NDArray[np.float64]:
    """Round-wire factor of a radius in skin depths, by real and imaginary part of its continued fraction."""
    square = 2.0 * ratio * ratio
    real, imaginary = np.full_like(ratio, 2.0 * _FRACTION_TERMS), np.zeros_like(ratio)
    for term in range(_FRACTION_TERMS - 1, 0, -1):
        scale = square / (real * real + imaginary * imaginary)
        real, imaginary = 2.0 * term + scale * imaginary, scale * real
    return np.asarray(real / 2.0)
