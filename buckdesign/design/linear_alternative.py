"""The same job done by the regulator alone, and the load from which switching pays."""

from __future__ import annotations

from dataclasses import asdict, dataclass
from typing import Any

import numpy as np

from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.losses import Floats
from buckdesign.design.operated import Operated, operate_rows, points_of, rows_at
from buckdesign.physics.regulator import current_limit

LOADS = 32
"""Loads at which the crossing is looked for [1] (own choice)."""

NOTICEABLE = 1e-3
"""Share of the loss that must be saved to count [1] (own choice): at light load both are the same circuit."""

LIGHTEST = 0.002
"""Lightest of them over the full load [1] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class LinearAlternative:
    """The regulator alone at the same output.

    Attributes
    ----------
    loss_w : float
        What it would burn with its divider [W].
    efficiency : float
        Output over input power [1].
    is_possible : bool
        Whether its typical current limit at that difference carries the load at all.
    pays_from_a : float or None
        Load from which the switching stage loses less [A]; None where it never does up to full load.
    """

    loss_w: float
    efficiency: float
    is_possible: bool
    pays_from_a: float | None

    def to_dict(self) -> dict[str, Any]:
        """Everything by key."""
        return asdict(self)


def linear_loss(supply: Floats, output: Floats, load: Floats, divider: Floats, quiescent: Floats) -> Floats:
    """Loss of the regulator alone.

    Parameters
    ----------
    supply, output : NDArray
        [V].
    load, divider, quiescent : NDArray
        Load, divider and smallest regulator current [A].

    Returns
    -------
    NDArray
        ``(V_in - V_out) I + V_out I_divider`` [W]: what regulates is at least the quiescent current.

    Notes
    -----
    Derived: power in less power out.
    """
    through = np.maximum(load + divider, quiescent)
    return np.asarray(supply * through - output * load, dtype=float)


def linear_alternative(operated: Operated, resolved: ResolvedDesign, index: int) -> LinearAlternative:
    """The regulator alone at one of the operating points, and where switching begins to pay.

    Parameters
    ----------
    operated : Operated
        Operating points.
    resolved : ResolvedDesign
        The design.
    index : int
        Which point.

    Returns
    -------
    LinearAlternative
        The crossing is looked for at the same supply and ambient up to the larger of load and full load.
    """
    supply, ambient = float(operated.parameter("supply_voltage")[index]), float(operated.ambient_c[index])
    load = float(operated.load[index])
    loss = float(_linear_loss(operated)[index])
    power = float(operated.set_voltage[index]) * load
    regulator = resolved.regulator
    most = current_limit(
        supply - float(operated.set_voltage[index]),
        regulator.current_limit,
        regulator.current_limit_knee,
        regulator.current_limit_far_voltage,
        regulator.current_limit_far,
    )
    return LinearAlternative(
        loss_w=loss,
        efficiency=power / (power + loss) if power > 0.0 else 0.0,
        is_possible=bool(load <= most),
        pays_from_a=_crossing(resolved, supply, ambient, max(load, resolved.full_load)),
    )


def _linear_loss(operated: Operated) -> Floats:
    divider = operated.parameter("reference") / operated.parameter("r1")
    return linear_loss(
        operated.parameter("supply_voltage"),
        operated.set_voltage,
        operated.load,
        divider,
        operated.parameter("quiescent_current"),
    )


def _crossing(resolved: ResolvedDesign, supply: float, ambient: float, most: float) -> float | None:
    """Load above which the stage loses less than the regulator alone up to the largest load."""
    if most <= 0.0:
        return None
    loads = np.geomspace(LIGHTEST * most, most, LOADS)
    points = points_of(resolved, supply=supply, load_current=loads, ambient_c=ambient)
    stage = operate_rows(rows_at(resolved, points), resolved, points.ambient_c)
    linear = _linear_loss(stage)
    gain = (linear - stage.total_loss) / np.maximum(linear, 1e-6) - NOTICEABLE
    behind = np.flatnonzero(gain <= 0.0)
    if len(behind) == 0:
        return float(loads[0])
    last = int(behind[-1])
    if last == LOADS - 1:
        return None
    share = -gain[last] / (gain[last + 1] - gain[last])
    return float(loads[last] + share * (loads[last + 1] - loads[last]))
