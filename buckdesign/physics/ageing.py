"""Ageing over the years: electrolytic capacitors dry out, the binder of iron powder decays."""

from __future__ import annotations

from buckdesign.physics.arrays import Real

CAPACITANCE_AT_END = 0.8
"""Capacitance of an electrolytic at the end of its life over that when new [1] (common practice: makers' end of
life is a change of 20 %)."""

ESR_AT_END = 2.0
"""ESR of an electrolytic at the end of its life over that when new [1] (common practice: loss factor or
impedance at twice its limit)."""

EDDY_AT_AGEING = 2.0
"""Eddy part of an iron powder's core loss, after the hours at which ageing is to be expected, over that when new
[1] (own choice: what is called ageing is read as a doubling; makers give curves only)."""


def used_share(hours: Real, life: Real) -> Real:
    """Share of a life that is used up.

    Parameters
    ----------
    hours : float or ndarray
        Time of running [h].
    life : float or ndarray
        Life at the working temperature [h].

    Returns
    -------
    float or ndarray
        Share [1]; above 1 past the end of life.

    Notes
    -----
    Derived: damage that adds up linearly in time.

    Examples
    --------
    >>> used_share(20_000.0, 80_000.0)
    0.25
    """
    return hours / life


def aged_capacitance_factor(share: Real) -> Real:
    """Capacitance of an electrolytic over that when new.

    Parameters
    ----------
    share : float or ndarray
        Share of its life that is used up [1].

    Returns
    -------
    float or ndarray
        Factor [1].

    Notes
    -----
    `CAPACITANCE_AT_END` at the end of life (common practice); between, and beyond, its reciprocal grows linearly
    (own choice: it never vanishes).

    Examples
    --------
    >>> aged_capacitance_factor(0.0), aged_capacitance_factor(1.0)
    (1.0, 0.8)
    """
    return 1.0 / (1.0 + (1.0 / CAPACITANCE_AT_END - 1.0) * share)


def aged_esr_factor(share: Real) -> Real:
    """ESR of an electrolytic over that when new.

    Parameters
    ----------
    share : float or ndarray
        Share of its life that is used up [1].

    Returns
    -------
    float or ndarray
        Factor [1].

    Notes
    -----
    `ESR_AT_END` at the end of life (common practice); between, and beyond, linear growth (own choice).

    Examples
    --------
    >>> aged_esr_factor(0.0), aged_esr_factor(1.0)
    (1.0, 2.0)
    """
    return 1.0 + (ESR_AT_END - 1.0) * share


def aged_eddy_factor(share: Real) -> Real:
    """Eddy part of the core loss of iron powder over that when new.

    Parameters
    ----------
    share : float or ndarray
        Hours at temperature over those at which ageing of the binder is to be expected [1].

    Returns
    -------
    float or ndarray
        Factor [1].

    Notes
    -----
    Own choice, see `EDDY_AT_AGEING`, linear growth; the hysteresis part stays (from memory: the binder isolates
    the grains).

    Examples
    --------
    >>> aged_eddy_factor(0.0), aged_eddy_factor(1.0)
    (1.0, 2.0)
    """
    return 1.0 + (EDDY_AT_AGEING - 1.0) * share
