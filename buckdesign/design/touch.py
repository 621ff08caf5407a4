"""Surfaces that a hand can reach, and how long it may stay there."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from buckdesign.design.checks import where_text
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.hot_parameters import RECTIFIER
from buckdesign.design.losses import Floats
from buckdesign.design.operated import Operated
from buckdesign.design.sections import DEVICES
from buckdesign.design.temperatures import device_heat
from buckdesign.physics.thermal import TOUCH_LIMITS_C, touch_time

METAL = TOUCH_LIMITS_C["metal"]
"""Limits of bare and of enamelled metal [degC]: a thin enamel does not slow the heat down (own choice)."""

FAR_C = 400.0
"""Temperature beyond which a number says no more than that something is gone [degC] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Surface:
    """A surface at all points.

    Attributes
    ----------
    name : str
        ``heat sink``, ``choke``.
    temperature_c : NDArray
        [degC], shape (n,); NaN where not known.
    """

    name: str
    temperature_c: Floats


def surfaces(operated: Operated, resolved: ResolvedDesign) -> list[Surface]:
    """Heat sinks, cases in free air and the choke of a design.

    Parameters
    ----------
    operated : Operated
        Operating points of the design.
    resolved : ResolvedDesign
        The design.

    Returns
    -------
    list of Surface
        Empty without temperatures.
    """
    if operated.electrical_only:
        return []
    heat = device_heat(operated.balance.losses)
    heat[:, RECTIFIER] += operated.balance.losses["rectifier_leakage"]
    shared = resolved.heat.shared_heatsink
    together = np.zeros(len(operated))
    found = []
    for place, name in enumerate(DEVICES):
        path, element = getattr(resolved.heat, name), getattr(resolved, name)
        known = np.where(np.isfinite(operated.junction(name)), 0.0, np.nan)
        if path.heatsink is not None:
            own = operated.ambient_c + path.heatsink * heat[:, place] + known
            found.append(Surface(name=f"heat sink of the {name}", temperature_c=own))
        elif path.is_shared and shared is not None:
            together += heat[:, place] + known
        else:
            inside = (element.junction_case or 0.0) / getattr(element, "parallel", 1)
            case = operated.junction(name) - inside * heat[:, place]
            found.append(Surface(name=f"{name} case", temperature_c=case))
    if shared is not None:
        found.insert(0, Surface(name="heat sink", temperature_c=operated.ambient_c + shared * together))
    return [*found, Surface(name="choke", temperature_c=operated.balance.choke_c)]


def touch_cautions(operated: Operated, resolved: ResolvedDesign) -> list[str]:
    """Surfaces that are too hot for a hand that stays, each at its hottest point.

    Parameters
    ----------
    operated : Operated
        Operating points of one design.
    resolved : ResolvedDesign
        The design.

    Returns
    -------
    list of str
        One sentence, or none.
    """
    hot = []
    for one in surfaces(operated, resolved):
        known = np.isfinite(one.temperature_c)
        if not known.any():
            continue
        index = int(np.argmax(np.where(known, one.temperature_c, -np.inf)))
        celsius = float(one.temperature_c[index])
        time = float(touch_time(celsius, METAL))
        if np.isfinite(time):
            at = f" (at {where_text(operated, index)})" if len(operated) > 1 else ""
            shown = f"{celsius:.0f}" if celsius < FAR_C else f"far above {FAR_C:g}"
            hot.append(f"{one.name} {shown} degC, {_allowed(time)}{at}")
    if not hot:
        return []
    long, minute, seconds, second = METAL
    return [
        f"hot to the touch: {'; '.join(hot)}. Limits of metal: {long:g} degC for long, {minute:g} degC up to "
        f"1 min, {seconds:g} degC up to 10 s, {second:g} degC up to 1 s (IEC 62368-1 table 38, from memory)"
    ]


def _allowed(time: float) -> str:
    return {60.0: "1 min at most", 10.0: "10 s at most", 1.0: "1 s at most"}.get(time, "not at all")
