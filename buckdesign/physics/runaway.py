"""Thermal runaway of a rectifier by its own leakage.

Leakage heats the junction and a hotter junction leaks more. With the loop gain
``g = V_R d I_R(T_j) c R_th`` the
balance is stable while ``g < 1``; at the limit leakage alone lifts the junction by exactly ``1/c``.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.special import lambertw

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {"runaway_margin": {"junction_c": (25.0, 175.0)}}
"""Where one exponential describes the leakage (from memory)."""


def runaway_limit_leakage(
    reverse_voltage: Real, blocking_share: Real, coefficient: Real, thermal_resistance: Real
) -> Real:
    """Leakage at the junction temperature of the limit, ``1 / (V_R d c R_th)``.

    Parameters
    ----------
    reverse_voltage : float or ndarray
        Voltage that is blocked [V].
    blocking_share : float or ndarray
        Share of the period in which it is blocked [1].
    coefficient : float or ndarray
        Exponent of the leakage [1/K].
    thermal_resistance : float or ndarray
        Junction to ambient [K/W].

    Returns
    -------
    float or ndarray
        Leakage [A].

    References
    ----------
    Application note AN869 rev. 2 (2004).

    Examples
    --------
    >>> round(runaway_limit_leakage(15.0, 0.5, 0.055, 10.1), 4)
    0.24
    """
    return 1.0 / (reverse_voltage * blocking_share * coefficient * thermal_resistance)


def runaway_limit_temperature(
    limit_leakage: Real, reference_leakage: Real, reference_c: Real, coefficient: Real
) -> Real:
    """Junction temperature at which the leakage reaches its limit.

    Parameters
    ----------
    limit_leakage : float or ndarray
        Leakage of `runaway_limit_leakage` [A].
    reference_leakage : float or ndarray
        Leakage at the reference temperature [A].
    reference_c : float or ndarray
        Reference temperature [degC].
    coefficient : float or ndarray
        Exponent of the leakage [1/K].

    Returns
    -------
    float or ndarray
        Hottest stable junction [degC].

    References
    ----------
    Application note AN869 rev. 2 (2004).

    Examples
    --------
    >>> round(float(runaway_limit_temperature(0.242, 0.210, 125.0, 0.055)), 2)
    127.58
    """
    return reference_c + np.log(limit_leakage / reference_leakage) / coefficient


def junction_with_leakage(
    base_c: Real, thermal_resistance: Real, loss_at_base: Real, coefficient: Real
) -> Real:
    """Junction temperature including the heat of the leakage, in closed form.

    Parameters
    ----------
    base_c : float or ndarray
        Junction temperature that all other losses give [degC].
    thermal_resistance : float or ndarray
        Junction to ambient [K/W].
    loss_at_base : float or ndarray
        Leakage loss ``V_R d I_R`` at `base_c` [W].
    coefficient : float or ndarray
        Exponent of the leakage [1/K].

    Returns
    -------
    float or ndarray
        Junction temperature [degC]; NaN where no balance exists, which is thermal runaway.

    Notes
    -----
    Derived: ``x = c (T_j - T_base)`` obeys ``x = c R_th P exp(x)``, so that ``x = -W(-c R_th P)`` on the
    principal
    branch of Lambert's W function, real up to ``c R_th P = 1/e``.

    Examples
    --------
    >>> round(float(junction_with_leakage(80.0, 40.0, 0.05, 0.055)), 3)
    82.265
    """
    product: Real = np.asarray(coefficient * thermal_resistance * loss_at_base, dtype=float)
    stable = product <= np.exp(-1.0)
    argument: NDArray[np.float64] = -np.where(stable, product, 0.0)
    rise = -lambertw(argument).real  # type: ignore[call-overload]
    return plain(np.where(stable, base_c + rise / coefficient, np.nan))


def runaway_margin(leakage_loss: Real, coefficient: Real, thermal_resistance: Real) -> Real:
    """How far the leakage may still grow until runaway, ``1 / (P_leak c R_th)``; 1 is the limit.

    Parameters
    ----------
    leakage_loss : float or ndarray
        Leakage loss at the junction temperature [W].
    coefficient : float or ndarray
        Exponent of the leakage [1/K].
    thermal_resistance : float or ndarray
        Junction to ambient [K/W].

    Returns
    -------
    float or ndarray
        Inverse of the loop gain [1]; infinite without leakage, larger is safer, NaN stays NaN.

    References
    ----------
    Application note AN869 rev. 2 (2004), rearranged.

    Examples
    --------
    >>> round(float(runaway_margin(0.9, 0.055, 10.1)), 2)
    2.0
    """
    loop_gain = np.asarray(leakage_loss * coefficient * thermal_resistance, dtype=float)
    none = loop_gain == 0.0
    return plain(np.where(none, np.inf, 1.0 / np.where(none, 1.0, loop_gain)))


def runaway_room(loss_at_base: Real, coefficient: Real, thermal_resistance: Real) -> Real:
    """Rise of the ambient at which the balance is lost, ``-(1 + ln(c R_th P)) / c``.

    Parameters
    ----------
    loss_at_base : float or ndarray
        Leakage loss at the temperature that all other losses give, above zero [W].
    coefficient : float or ndarray
        Exponent of the leakage [1/K].
    thermal_resistance : float or ndarray
        Junction to ambient, above zero [K/W].

    Returns
    -------
    float or ndarray
        Rise [K]; negative where there is no balance already.

    Notes
    -----
    Derived: the leakage loss follows the ambient as ``exp(c dT)`` while the other losses stay, and balance
    ends at ``c R_th P = 1/e``, see `junction_with_leakage`.

    Examples
    --------
    >>> round(float(runaway_room(0.05, 0.055, 40.0)), 2)
    21.95
    """
    return -(1.0 + np.log(coefficient * thermal_resistance * loss_at_base)) / coefficient
