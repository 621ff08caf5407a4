"""Ageing of the binder of iron powder: what a core temperature means over the years."""

from __future__ import annotations

from buckdesign.design.choke_heat import HOTTEST_C
from buckdesign.physics.thermal import CORE_FAULT_C, CORE_UNAFFECTED_C, CORE_WARNING_C

UNAFFECTED_HOURS = 100_000.0
"""Hours that a core at `CORE_UNAFFECTED_C` is taken to run without its loss rising noticeably (assumed; the
distributor's ageing note only says that ageing is hardly seen there)."""

HALVING_K = 10.0
"""Rise in temperature that halves the time (assumed: the rule of ten degrees for organic binders)."""


def ageing_hours(core_c: float) -> float:
    """Hours until ageing of the binder is to be expected, a rough guide.

    Parameters
    ----------
    core_c : float
        Core temperature [degC].

    Returns
    -------
    float
        ``UNAFFECTED_HOURS * 2^((65 degC - T)/10 K)`` [h].

    Notes
    -----
    Assumed; makers give curves that depend on core volume, frequency and flux density as well. Ageing is
    irreversible and raises the eddy-current part of the loss, so cores with low frequency and flux age least.

    Examples
    --------
    >>> ageing_hours(85.0)
    25000.0
    """
    return UNAFFECTED_HOURS * 2.0 ** ((CORE_UNAFFECTED_C - core_c) / HALVING_K)


def ageing_note(core_c: float) -> str:
    """One sentence about the hours that a core may spend at a temperature.

    Parameters
    ----------
    core_c : float
        Core temperature [degC].

    Returns
    -------
    str
        The sentence, with what is assumed.
    """
    if core_c <= CORE_UNAFFECTED_C:
        return f"binder: no ageing to be expected at {core_c:.0f} degC (up to {CORE_UNAFFECTED_C:.0f} degC)"
    assumed = (
        f"assumed: {UNAFFECTED_HOURS:.0f} h at {CORE_UNAFFECTED_C:.0f} degC, half per {HALVING_K:.0f} K more"
    )
    if core_c >= CORE_FAULT_C:
        return f"binder: {temperature_text(core_c)} is above its limit of {CORE_FAULT_C:.0f} degC"
    hours = _rounded(ageing_hours(core_c))
    return f"binder: at {core_c:.0f} degC ageing is to be expected within about {hours} h ({assumed})"


def ageing_warning(core_c: float) -> str | None:
    """A warning where ageing of the binder is of concern.

    Parameters
    ----------
    core_c : float
        Core temperature [degC].

    Returns
    -------
    str or None
        From `CORE_WARNING_C` on.
    """
    if core_c < CORE_WARNING_C:
        return None
    return (
        f"core at {core_c:.0f} degC: the binder of iron powder ages from {CORE_WARNING_C:.0f} degC on, "
        "irreversibly, and the core loss rises with it"
    )


def ageing_fault(core_c: float) -> str | None:
    """A fault where the core is too hot for its binder.

    Parameters
    ----------
    core_c : float
        Core temperature [degC].

    Returns
    -------
    str or None
        From `CORE_FAULT_C` on.
    """
    if core_c < CORE_FAULT_C:
        return None
    return f"core at {temperature_text(core_c)}: the limit is {CORE_FAULT_C:.0f} degC, the binder would decay"


def temperature_text(celsius: float) -> str:
    """A temperature, without digits where no model holds any more.

    Parameters
    ----------
    celsius : float
        Temperature [degC].

    Returns
    -------
    str
        Such as ``85 degC`` or ``over 200 degC``.
    """
    return f"{celsius:.0f} degC" if celsius <= HOTTEST_C else f"over {HOTTEST_C:.0f} degC"


def _rounded(hours: float) -> str:
    """Two digits, as the guess deserves no more."""
    return f"{float(f'{hours:.2g}'):.0f}"
