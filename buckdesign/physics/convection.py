"""Natural convection and radiation: plates as heat sinks, and the wound ring as a body of one surface.

Air at atmospheric pressure, properties at the mean of surface and ambient temperature.
"""

from __future__ import annotations

import numpy as np

from buckdesign.constants import STANDARD_GRAVITY, STEFAN_BOLTZMANN, ZERO_CELSIUS
from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {
    "plate_convection": {"rayleigh": (1e4, 1e9)},
    "horizontal_cylinder_nusselt": {"rayleigh": (1e-6, 1e12)},
    "vertical_plate_nusselt": {"rayleigh": (1e-1, 1e12)},
    "air_conductivity": {"temperature_c": (-70.0, 250.0)},
}
"""Ranges given with the correlations (from memory)."""

PLATE_UNCERTAINTY = 0.2
"""Relative uncertainty of the resistance of a plate [1] (from memory: scatter about simple correlations)."""

BRIGHT_EMISSIVITY = 0.08
"""Emissivity of bright aluminium [1]; 0.04-0.1 (from memory)."""

ENAMEL_EMISSIVITY = 0.9
"""Emissivity of enamelled copper, painted cores and anodised sinks (from memory)."""

_AIR_GAS_CONSTANT = 287.05
_AIR_HEAT_CAPACITY = 1006.0
_PRESSURE = 101325.0
_LOG_SLOPE = 1.17
_STEPS = 6


def air_viscosity(temperature_c: Real) -> Real:
    """Dynamic viscosity of air, ``1.458e-6 T^1.5 / (T + 110.4)``.

    Parameters
    ----------
    temperature_c : float or ndarray
        Temperature [degC].

    Returns
    -------
    float or ndarray
        Dynamic viscosity [Pa s].

    References
    ----------
    U.S. Standard Atmosphere 1976, eq. 51 (from memory).

    Examples
    --------
    >>> f"{air_viscosity(15.0):.5g}"
    '1.7894e-05'
    """
    kelvin = temperature_c + ZERO_CELSIUS
    return 1.458e-6 * kelvin * np.sqrt(kelvin) / (kelvin + 110.4)


def air_conductivity(temperature_c: Real) -> Real:
    """Thermal conductivity of air, ``2.64638e-3 T^1.5 / (T + 245.4 * 10^(-12/T))``.

    Parameters
    ----------
    temperature_c : float or ndarray
        Temperature [degC].

    Returns
    -------
    float or ndarray
        Thermal conductivity [W/(m K)].

    References
    ----------
    U.S. Standard Atmosphere 1976, eq. 53 (from memory).

    Examples
    --------
    >>> f"{air_conductivity(15.0):.5g}"
    '0.025326'
    """
    kelvin = temperature_c + ZERO_CELSIUS
    return 2.64638e-3 * kelvin * np.sqrt(kelvin) / (kelvin + 245.4 * 10.0 ** (-12.0 / kelvin))


def air_prandtl(temperature_c: Real) -> Real:
    """Prandtl number of air.

    Parameters
    ----------
    temperature_c : float or ndarray
        Temperature [degC].

    Returns
    -------
    float or ndarray
        ``c_p mu / k`` [1].

    Notes
    -----
    Derived from `air_viscosity` and `air_conductivity` with 1006 J/(kg K).

    Examples
    --------
    >>> round(float(air_prandtl(15.0)), 3)
    0.711
    """
    return _AIR_HEAT_CAPACITY * air_viscosity(temperature_c) / air_conductivity(temperature_c)


def rayleigh_number(rise: Real, length: Real, film_c: Real) -> Real:
    """Rayleigh number of air at a warm surface, ``g dT l^3 Pr / (T nu^2)``.

    Parameters
    ----------
    rise : float or ndarray
        Surface over ambient temperature [K].
    length : float or ndarray
        Characteristic length: plate height or cylinder diameter [m].
    film_c : float or ndarray
        Mean of surface and ambient temperature [degC].

    Returns
    -------
    float or ndarray
        Rayleigh number [1].

    Notes
    -----
    Derived: ideal gas at 101 325 Pa, expansion ``1/T``.

    Examples
    --------
    >>> f"{rayleigh_number(50.0, 0.1, 50.0):.3g}"
    '3.33e+06'
    """
    kelvin = film_c + ZERO_CELSIUS
    kinematic = air_viscosity(film_c) * _AIR_GAS_CONSTANT * kelvin / _PRESSURE
    buoyancy = STANDARD_GRAVITY * rise * length * length * length / kelvin
    return buoyancy * air_prandtl(film_c) / (kinematic * kinematic)


def horizontal_cylinder_nusselt(rayleigh: Real, prandtl: Real) -> Real:
    """Nusselt number of a horizontal cylinder, referred to its diameter.

    Parameters
    ----------
    rayleigh : float or ndarray
        Rayleigh number of the diameter [1].
    prandtl : float or ndarray
        Prandtl number [1].

    Returns
    -------
    float or ndarray
        ``(0.6 + 0.387 Ra^(1/6) / (1 + (0.559/Pr)^(9/16))^(8/27))^2`` [1].

    References
    ----------
    S. W. Churchill and H. H. S. Chu, Int. J. Heat Mass Transfer 18 (1975) 1049.

    Examples
    --------
    >>> round(float(horizontal_cylinder_nusselt(1e5, 0.71)), 3)
    7.778
    """
    shape = (1.0 + (0.559 / prandtl) ** (9.0 / 16.0)) ** (8.0 / 27.0)
    return np.square(0.6 + 0.387 * np.power(rayleigh, 1.0 / 6.0) / shape)


def vertical_plate_nusselt(rayleigh: Real, prandtl: Real) -> Real:
    """Nusselt number of a vertical plate, referred to its height.

    Parameters
    ----------
    rayleigh : float or ndarray
        Rayleigh number of the height [1].
    prandtl : float or ndarray
        Prandtl number [1].

    Returns
    -------
    float or ndarray
        ``(0.825 + 0.387 Ra^(1/6) / (1 + (0.492/Pr)^(9/16))^(8/27))^2`` [1].

    References
    ----------
    S. W. Churchill and H. H. S. Chu, Int. J. Heat Mass Transfer 18 (1975) 1323.

    Examples
    --------
    >>> round(float(vertical_plate_nusselt(1e6, 0.71)), 2)
    16.56
    """
    shape = (1.0 + (0.492 / prandtl) ** (9.0 / 16.0)) ** (8.0 / 27.0)
    return np.square(0.825 + 0.387 * np.power(rayleigh, 1.0 / 6.0) / shape)


def plate_convection(rise: Real, height: Real) -> Real:
    """Convection coefficient of a vertical plate in air, simplified, ``1.42 (dT/l)^0.25``.

    Parameters
    ----------
    rise : float or ndarray
        Surface over ambient temperature [K].
    height : float or ndarray
        Height of the plate [m].

    Returns
    -------
    float or ndarray
        Coefficient [W/(m2 K)].

    References
    ----------
    J. P. Holman, Heat Transfer, simplified equations for laminar air (from memory).

    Examples
    --------
    >>> round(plate_convection(50.0, 0.1), 5)
    6.71477
    """
    return 1.42 * (rise / height) ** 0.25


def radiation_coefficient(surface_c: Real, ambient_c: Real, emissivity: Real) -> Real:
    """Radiation as a coefficient of the temperature difference, ``e s (T_s^2 + T_a^2)(T_s + T_a)``.

    Parameters
    ----------
    surface_c, ambient_c : float or ndarray
        Surface and ambient temperature [degC].
    emissivity : float or ndarray
        Emissivity of the surface [1].

    Returns
    -------
    float or ndarray
        Coefficient [W/(m2 K)].

    Notes
    -----
    Derived: Stefan-Boltzmann's law, surroundings at ambient temperature.

    Examples
    --------
    >>> round(radiation_coefficient(75.0, 25.0, 0.9), 5)
    6.92976
    """
    hot, cold = surface_c + ZERO_CELSIUS, ambient_c + ZERO_CELSIUS
    return emissivity * STEFAN_BOLTZMANN * (hot * hot + cold * cold) * (hot + cold)


def plate_resistance(area: Real, height: Real, rise: Real, ambient_c: Real, emissivity: Real) -> Real:
    """Thermal resistance of a vertical plate to the air at a given rise.

    Parameters
    ----------
    area : float or ndarray
        Surface, both sides [m2].
    height : float or ndarray
        Height of the plate [m].
    rise : float or ndarray
        Surface over ambient temperature [K].
    ambient_c : float or ndarray
        Ambient temperature [degC].
    emissivity : float or ndarray
        Emissivity; 0 leaves convection alone [1].

    Returns
    -------
    float or ndarray
        Thermal resistance [K/W].

    Notes
    -----
    Derived from `plate_convection` and `radiation_coefficient`; good to about 20 %.

    Examples
    --------
    >>> round(plate_resistance(0.02, 0.1, 50.0, 25.0, 0.9), 5)
    3.66447
    """
    radiation = radiation_coefficient(ambient_c + rise, ambient_c, emissivity)
    return 1.0 / (area * (plate_convection(rise, height) + radiation))


def plate_side(resistance: Real, rise: Real, ambient_c: Real, emissivity: Real) -> Real:
    """Side of a square vertical plate, free on both sides, that has a thermal resistance at a given rise.

    Parameters
    ----------
    resistance : float or ndarray
        Thermal resistance to the air, above zero [K/W].
    rise : float or ndarray
        Surface over ambient temperature, above zero [K].
    ambient_c : float or ndarray
        Ambient temperature [degC].
    emissivity : float or ndarray
        Emissivity; 0 leaves convection alone [1].

    Returns
    -------
    float or ndarray
        Side [m]; `PLATE_UNCERTAINTY` says how good that is.

    Notes
    -----
    Derived from `plate_resistance` by a fixed number of halvings; heat spreads well in a plate of
    aluminium of 2-3 mm up to about 0.15 m (from memory), beyond that it takes more.

    Examples
    --------
    >>> round(float(plate_side(3.66447, 50.0, 25.0, 0.9)), 5)
    0.1
    """
    low, high = np.log(1e-4), np.log(1e2)
    for _ in range(50):
        middle = 0.5 * (low + high)
        side = np.exp(middle)
        found = plate_resistance(2.0 * side * side, side, rise, ambient_c, emissivity)
        low, high = np.where(found > resistance, middle, low), np.where(found > resistance, high, middle)
    return plain(np.exp(0.5 * (low + high)))


def ring_heat_flow(
    rise: Real, surface: Real, diameter: Real, ambient_c: Real, emissivity: Real = ENAMEL_EMISSIVITY
) -> Real:
    """Heat that a wound ring gives to the air at a given rise, by convection and radiation.

    Parameters
    ----------
    rise : float or ndarray
        Surface over ambient temperature [K].
    surface : float or ndarray
        Surface of the wound ring [m2].
    diameter : float or ndarray
        Outer diameter of the wound ring [m].
    ambient_c : float or ndarray
        Ambient temperature [degC].
    emissivity : float or ndarray
        Emissivity of the winding [1].

    Returns
    -------
    float or ndarray
        Heat flow [W].

    Notes
    -----
    Derived: `horizontal_cylinder_nusselt` of the outer diameter over the whole surface, plus radiation.

    Examples
    --------
    >>> round(float(ring_heat_flow(30.0, 31e-4, 29e-3, 25.0)), 2)
    1.17
    """
    film_c = ambient_c + rise / 2.0
    rayleigh = rayleigh_number(rise, diameter, film_c)
    nusselt = horizontal_cylinder_nusselt(rayleigh, air_prandtl(film_c))
    convection = nusselt * air_conductivity(film_c) / diameter
    return surface * rise * (convection + radiation_coefficient(ambient_c + rise, ambient_c, emissivity))


def ring_rise(
    power: Real, surface: Real, diameter: Real, ambient_c: Real, emissivity: Real = ENAMEL_EMISSIVITY
) -> Real:
    """Rise of a wound ring in free air by convection and radiation, the inverse of `ring_heat_flow`.

    Parameters
    ----------
    power : float or ndarray
        Loss of core and copper together [W].
    surface : float or ndarray
        Surface of the wound ring [m2].
    diameter : float or ndarray
        Outer diameter of the wound ring [m].
    ambient_c : float or ndarray
        Ambient temperature [degC].
    emissivity : float or ndarray
        Emissivity of the winding [1].

    Returns
    -------
    float or ndarray
        Rise [K].

    Notes
    -----
    Derived: the heat flow is nearly a power of the rise, so that a fixed number of secant steps in its
    logarithm
    converges.

    Examples
    --------
    >>> round(float(ring_rise(1.17, 31e-4, 29e-3, 25.0)), 1)
    30.0
    """
    load = np.maximum(power, 1e-9)
    rise = np.asarray(load / (surface * 12.0))
    slope, step, error = np.asarray(_LOG_SLOPE), np.zeros(()), np.zeros(())
    for _ in range(_STEPS):
        flow = ring_heat_flow(rise, surface, diameter, ambient_c, emissivity)
        new_error = np.log(flow / load)
        moved = np.abs(step) > 1e-7
        slope = np.where(moved, (new_error - error) / np.where(moved, step, 1.0), slope)
        step, error = -new_error / slope, new_error
        rise = rise * np.exp(step)
    return plain(np.where(np.asarray(power) > 0.0, rise, 0.0))
