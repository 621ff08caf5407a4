"""Safe operating area of the transistor: what may flow, and the check of steady states against it.

Without cycles the transistor carries its mean current at its mean voltage for long. With cycles its edges pass
through large powers: each counts as one pulse of their energy at the whole supply. Second breakdown counts where
it is known; without it power and current alone bound the area.
"""

from __future__ import annotations

import numpy as np

from buckdesign.design.hot_parameters import TRANSISTOR
from buckdesign.design.limits import Limit
from buckdesign.design.losses import Floats
from buckdesign.design.operated import Operated
from buckdesign.design.ratings import RatingData
from buckdesign.design.temperatures import device_heat
from buckdesign.physics.safe_area import (
    breakdown_current,
    derating,
    power_limit,
    pulse_safe_current,
    safe_current,
    safe_current_for,
)

NAME = "transistor safe area"
"""Name of the check."""


def allowed_current(rating: RatingData, voltage: Floats, case_c: Floats, duration: Floats) -> Floats:
    """Collector current that may flow once for some time.

    Parameters
    ----------
    rating : RatingData
        Of n points, or of one for all.
    voltage : NDArray
        Across the transistor [V], shape (n,).
    case_c : NDArray
        Its case [degC], shape (n,).
    duration : NDArray
        How long [s], shape (n,); infinite: direct current.

    Returns
    -------
    NDArray
        [A], shape (n,); NaN where the ratings are not known.
    """
    limit_c = rating.junction_limit[:, TRANSISTOR]
    second = breakdown_current(voltage, *rating.breakdown.T)
    direct = safe_current(
        voltage,
        rating.collector_current,
        rating.collector_voltage,
        power_limit(limit_c, case_c, rating.transistor_case),
        np.where(np.isfinite(rating.breakdown[:, 1]), second, np.inf),
    )
    pulse_voltage, pulse_current, pulse_duration = rating.pulse.T
    pulse = pulse_safe_current(
        voltage,
        pulse_voltage,
        pulse_current * derating(limit_c, case_c),
        rating.collector_current,
        rating.collector_voltage,
    )
    return np.asarray(safe_current_for(duration, direct, pulse, pulse_duration), dtype=float)


def safe_area_limit(operated: Operated, rating: RatingData) -> Limit:
    """Collector current against the safe area, at the case's temperature.

    Parameters
    ----------
    operated : Operated
        Operating points.
    rating : RatingData
        Of the same points.

    Returns
    -------
    Limit
        It does not apply where nothing flows, where the case's temperature is not known, and where an edge
        passes outside the area for direct current of a transistor whose pulses are not known: what does not
        apply for the last reason has no limit.
    """
    current, voltage, duration = _stress(operated)
    loop = operated.loop
    heat = device_heat(operated.balance.losses)[:, TRANSISTOR]
    case_c = operated.junction("transistor") - heat * rating.transistor_case
    allowed = allowed_current(rating, voltage, case_c, duration)
    is_pulse = loop.column("frequency_hz") > 0.0
    unknown = is_pulse & (current > allowed) & np.isnan(rating.pulse[:, 2])
    conducts = (current > 0.0) & np.isfinite(case_c) & (not operated.electrical_only)
    limit = np.where(conducts, np.where(unknown, np.nan, allowed), 0.0)
    return Limit(
        name=NAME,
        unit="A",
        value=current,
        limit=limit,
        applies=conducts & np.isfinite(limit),
        across=voltage,
        note="the largest stress, case as hot as it is",
    )


def _stress(operated: Operated) -> tuple[Floats, Floats, Floats]:
    """Current [A], voltage [V] and duration [s] of the largest stress, shape (n,).

    The edges' peak power is taken at the largest voltage that they reach, where second breakdown allows least.
    """
    loop = operated.loop
    rate, mean = loop.column("frequency_hz"), loop.column("collector_mean_a")
    edges = loop.column("transistor_switching_w")
    drop = operated.parameter("threshold") + operated.parameter("slope") * loop.column("rectifier_max_a")
    whole = operated.parameter("supply_voltage") + np.where(loop.column("rectifier_max_a") > 0.0, drop, 0.0)
    peak = loop.column("transistor_peak_w")
    is_pulse = rate > 0.0
    steady = (edges + loop.column("transistor_conduction_w")) / np.where(mean > 0.0, mean, 1.0)
    energy = edges / np.where(is_pulse, rate, 1.0)
    duration = np.where(is_pulse, energy / np.where(peak > 0.0, peak, 1.0), np.inf)
    return np.where(is_pulse, peak / whole, mean), np.where(is_pulse, whole, steady), duration
