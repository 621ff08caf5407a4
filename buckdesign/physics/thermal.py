"""Temperatures: the ladder from junction to air, shared heat sinks, insulators, limits of the core."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from buckdesign.physics.arrays import Ranges, Real, plain

RANGES: Ranges = {"ring_rise_surface_rule": {"rise": (5.0, 100.0)}}
"""Rises for which the surface rule is used (from memory)."""

CORE_UNAFFECTED_C = 65.0
"""Core temperature up to which ageing of the binder is hardly seen [degC] (distributor's ageing note)."""

CORE_WARNING_C = 85.0
"""Core temperature from which ageing of the binder is of concern [degC] (distributor's ageing note)."""

CORE_FAULT_C = 110.0
"""Core temperature that is refused [degC]; above the 90-100 degC in use for continuous work (own choice)."""

TOUCH_TIMES = (np.inf, 60.0, 10.0, 1.0)
"""Longest contact that each limit of `TOUCH_LIMITS_C` stands for [s]."""

TOUCH_LIMITS_C: Mapping[str, tuple[float, ...]] = {
    "metal": (48.0, 51.0, 60.0, 70.0),
    "glass": (48.0, 56.0, 71.0, 85.0),
    "plastic": (48.0, 60.0, 77.0, 94.0),
}
"""Hottest surface that may be touched for the times of `TOUCH_TIMES` [degC] (IEC 62368-1 table 38, TS1, from
memory; it is judged at 25 degC ambient)."""

INSULATOR_RESISTANCE: Mapping[str, Mapping[str, tuple[float, float]]] = {
    "TO-220": {
        "dry": (1.0, 1.5),
        "compound": (0.5, 1.0),
        "mica and compound": (1.2, 1.8),
        "silicone pad": (1.0, 2.5),
        "alumina and compound": (0.6, 1.2),
    },
    "TO-3": {
        "compound": (0.1, 0.2),
        "mica and compound": (0.3, 0.5),
        "silicone pad": (0.3, 0.7),
    },
}
"""Case to heat sink by package and mounting, low and high [K/W] (from memory; TO-220 with compound looked
up)."""

TYPICAL_RTH_CASE_SINK: Mapping[str, float] = {
    package: sum(mountings["silicone pad"]) / 2.0 for package, mountings in INSULATOR_RESISTANCE.items()
}
"""Middle of the band of a silicone pad [K/W]; derived."""


def junction_temperature(
    power: Real, ambient_c: Real, junction_case: Real, case_sink: Real, sink_ambient: Real
) -> Real:
    """Junction temperature over three thermal resistances in series.

    Parameters
    ----------
    power : float or ndarray
        Loss [W].
    ambient_c : float or ndarray
        Ambient temperature [degC].
    junction_case, case_sink, sink_ambient : float or ndarray
        Thermal resistances [K/W].

    Returns
    -------
    float or ndarray
        Junction temperature [degC].

    Notes
    -----
    Derived: the thermal ladder.

    Examples
    --------
    >>> round(junction_temperature(4.0, 40.0, 1.1, 0.5, 8.0), 3)
    78.4
    """
    return ambient_c + power * (junction_case + case_sink + sink_ambient)


def touch_time(surface_c: Real, limits_c: tuple[float, ...]) -> Real:
    """Longest contact with a surface that is safe.

    Parameters
    ----------
    surface_c : float or ndarray
        Its temperature [degC].
    limits_c : tuple of float
        An entry of `TOUCH_LIMITS_C` [degC], rising.

    Returns
    -------
    float or ndarray
        Time [s], infinite for any, 0 for none.

    References
    ----------
    IEC 62368-1 table 38, class TS1 (from memory).

    Examples
    --------
    >>> touch_time(np.array([48.0, 50.0, 65.0, 71.0]), TOUCH_LIMITS_C["metal"]).tolist()
    [inf, 60.0, 1.0, 0.0]
    """
    steps = np.searchsorted(np.array(limits_c), surface_c)
    return plain(np.array([*TOUCH_TIMES, 0.0])[steps])


def sink_resistance_needed(
    power: Real, junction_c: Real, ambient_c: Real, junction_case: Real, case_sink: Real
) -> Real:
    """Largest thermal resistance of a heat sink that keeps a junction below a limit.

    Parameters
    ----------
    power : float or ndarray
        Loss [W].
    junction_c, ambient_c : float or ndarray
        Junction limit and ambient temperature [degC].
    junction_case, case_sink : float or ndarray
        Thermal resistances [K/W].

    Returns
    -------
    float or ndarray
        Thermal resistance [K/W]; zero or negative where no sink is good enough.

    Notes
    -----
    Derived from `junction_temperature`.

    Examples
    --------
    >>> sink_resistance_needed(5.0, 150.0, 50.0, 3.0, 1.0)
    16.0
    """
    return (junction_c - ambient_c) / power - junction_case - case_sink


def shared_sink_junctions(
    power: Real, ambient_c: Real, junction_case: Real, case_sink: Real, sink_ambient: Real
) -> Real:
    """Junction temperatures of devices on one heat sink.

    Parameters
    ----------
    power : ndarray, shape (..., n)
        Losses of the n devices [W].
    ambient_c : float or ndarray, shape (...)
        Ambient temperature [degC].
    junction_case, case_sink : float or ndarray, shape (..., n)
        Thermal resistances of each device [K/W].
    sink_ambient : float or ndarray, shape (...)
        Thermal resistance of the sink [K/W].

    Returns
    -------
    ndarray, shape (..., n)
        Junction temperatures [degC].

    Notes
    -----
    Derived: the sink carries the sum of the losses.

    Examples
    --------
    >>> import numpy as np
    >>> power, case = np.array([4.0, 1.0]), np.array([1.0, 5.0])
    >>> shared_sink_junctions(power, 25.0, case, 0.5, 4.0).tolist()
    [51.0, 50.5]
    """
    sink_c = ambient_c + np.asarray(sink_ambient) * np.sum(power, axis=-1)
    return np.asarray(sink_c)[..., None] + power * (junction_case + case_sink)


def ring_rise_surface_rule(power: Real, surface: Real) -> Real:
    """Rise of a wound ring in free air by the makers' rule, ``(P[mW]/A[cm2])^0.833``.

    Parameters
    ----------
    power : float or ndarray
        Loss of core and copper together [W].
    surface : float or ndarray
        Surface of the wound ring [m2].

    Returns
    -------
    float or ndarray
        Rise [K].

    References
    ----------
    Catalogues of iron-powder makers (from memory); good to about 25 %.

    Examples
    --------
    >>> round(ring_rise_surface_rule(0.5, 31e-4), 3)
    10.138
    """
    return (power * 1e3 / (surface * 1e4)) ** 0.833


def ring_power_surface_rule(rise: Real, surface: Real) -> Real:
    """Loss that a wound ring may have for a given rise, the inverse of `ring_rise_surface_rule`.

    Parameters
    ----------
    rise : float or ndarray
        Rise [K].
    surface : float or ndarray
        Surface of the wound ring [m2].

    Returns
    -------
    float or ndarray
        Loss [W].

    Notes
    -----
    Derived from `ring_rise_surface_rule`.

    Examples
    --------
    >>> round(ring_power_surface_rule(10.1377, 31e-4), 4)
    0.5
    """
    return rise ** (1.0 / 0.833) * surface * 1e4 / 1e3
