"""Input and output capacitor at an operating point: ripple current, ESR, temperature, life."""

from __future__ import annotations

import math
from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from buckdesign.design.elements import CapacitorElement, ResolvedDesign
from buckdesign.design.hot_parameters import hot_data
from buckdesign.design.losses import input_ripple_rms
from buckdesign.design.operated import Operated
from buckdesign.physics.capacitor import electrolytic_life, ripple_rise


@dataclass(frozen=True, kw_only=True)
class CapacitorLoad:
    """One capacitor.

    Attributes
    ----------
    ripple_a, rated_a : float or None
        Ripple current and its rating, rms [A].
    esr_ohm : float
        At the rate of the loop and its temperature [ohm].
    temperature_c : float or None
        Of its core [degC]; None where no rating tells how the ripple heats it.
    life_h : float or None
        By the 10 K rule, at most what is claimed at all [h].
    """

    ripple_a: float
    rated_a: float | None
    esr_ohm: float
    temperature_c: float | None
    life_h: float | None

    def to_dict(self) -> dict[str, Any]:
        """Everything by key."""
        return asdict(self)


def capacitor_loads(
    operated: Operated, resolved: ResolvedDesign, index: int
) -> dict[str, CapacitorLoad | None]:
    """Both capacitors of a design at one of its operating points.

    Parameters
    ----------
    operated : Operated
        Operating points of the design.
    resolved : ResolvedDesign
        The design.
    index : int
        Which point.

    Returns
    -------
    dict
        ``output`` and ``input``; None without an input capacitor.
    """
    loop, ambient = operated.loop, float(operated.ambient_c[index])
    output = float(loop.column("output_capacitor_rms_a")[index])
    found: dict[str, CapacitorLoad | None] = {
        "output": _load(resolved.output_capacitor, output, float(operated.parameter("esr")[index]), ambient),
        "input": None,
    }
    if resolved.input_capacitor is not None:
        ripple = input_ripple_rms(loop)[index : index + 1]
        rate = loop.column("frequency_hz")[index : index + 1]
        law = hot_data([resolved]).input
        esr = law.esr(np.array([resolved.input_capacitor.esr]), rate, ripple, np.array([ambient]))
        found["input"] = _load(resolved.input_capacitor, float(ripple[0]), float(esr[0]), ambient)
    return found


def _load(capacitor: CapacitorElement, ripple: float, esr: float, ambient: float) -> CapacitorLoad:
    rated, life, life_c = capacitor.ripple_current, capacitor.life, capacitor.life_temperature_c
    hot = None if rated is None else ambient + float(ripple_rise(ripple, rated))
    expected = None
    if life is not None and life_c is not None:
        expected = float(electrolytic_life(life, life_c, ambient if hot is None else hot))
    return CapacitorLoad(
        ripple_a=ripple,
        rated_a=rated,
        esr_ohm=esr,
        temperature_c=hot,
        life_h=expected if expected is None or math.isfinite(expected) else None,
    )
