"""What a choke is needed for, what is acceptable, and what is searched for it."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import Enum

from buckdesign.design.choke_columns import Duty
from buckdesign.errors import InputError


class Rank(Enum):
    """What chokes are ranked by."""

    LOSS = "loss"
    SIZE = "size"
    COPPER = "copper"


@dataclass(frozen=True, kw_only=True)
class ChokeNeed:
    """What a choke has to do.

    Attributes
    ----------
    inductance : float
        Smallest inductance at the mean current [H].
    current : float
        Mean current [A].
    ripple : float
        Ripple current, peak to peak [A].
    frequency : float
        Switching frequency [Hz].
    duty : float
        Share of the period in which the current rises [1].
    ambient_c : float
        Temperature of the air [degC].
    worst_current : float, optional
        Largest current, such as start-up or overload [A]; None: mean plus half the ripple.

    Raises
    ------
    InputError
        A value is not above zero, or the duty not between 0 and 1.
    """

    inductance: float
    current: float
    ripple: float
    frequency: float
    duty: float = 0.5
    ambient_c: float = 25.0
    worst_current: float | None = None

    def __post_init__(self) -> None:
        for name in ("inductance", "current", "ripple", "frequency"):
            if not getattr(self, name) > 0.0:
                raise InputError(f"{name} = {getattr(self, name):g}: a value above 0 is wanted")
        if not 0.0 < self.duty < 1.0:
            raise InputError(f"duty = {self.duty:g}: a share between 0 and 1 is wanted")
        if self.worst_current is not None and self.worst_current < self.current:
            raise InputError(
                f"worst current = {self.worst_current:g} A: less than the current, {self.current:g} A"
            )

    def as_duty(self) -> Duty:
        """The same as numbers for `evaluate_windings`."""
        return Duty(
            current=self.current,
            ripple=self.ripple,
            frequency=self.frequency,
            duty=self.duty,
            ambient_c=self.ambient_c,
            worst_current=self.worst_current,
        )


@dataclass(frozen=True, kw_only=True)
class ChokeLimits:
    """What is still acceptable.

    Attributes
    ----------
    core_c : float
        Hottest core [degC]; 90-100 degC is the limit in use for continuous work (from memory).
    bore_fill : float
        Share of the bore that is wound by hand [1]; 0.35 is comfortable, 0.45 full (common practice).
    conductor : float
        Thickest copper that bends tightly around a ring by hand [m] (common practice).
    inductance_fraction : float
        Smallest share of the inductance left at the mean current [1]; below a third a choke swings too much
        to be predicted (own choice).
    current_density : float
        Largest mean current by copper section [A/m2]; the wire's own hot spots are not modelled (common
        practice: 3 to 8 A/mm2).
    saturation_margin : float
        Saturation over the flux density at the worst current [1] (own choice).
    """

    core_c: float = 100.0
    bore_fill: float = 0.45
    conductor: float = 1.7e-3
    inductance_fraction: float = 1.0 / 3.0
    current_density: float = 8e6
    saturation_margin: float = 1.2


@dataclass(frozen=True, kw_only=True)
class ChokeSpace:
    """What is searched.

    Attributes
    ----------
    rings, materials, wires : sequence of str, optional
        Names to choose from; all of the tables where None.
    strands, stacks : sequence of int
        Numbers of parallel strands and of stacked rings.
    unpublished : bool
        Take pairs of ring and material as well whose inductance factor no publication has; they may not be
        sold. So it is where `materials` are named.
    """

    rings: Sequence[str] | None = None
    materials: Sequence[str] | None = None
    wires: Sequence[str] | None = None
    strands: Sequence[int] = (1, 2, 3, 4)
    stacks: Sequence[int] = (1, 2)
    unpublished: bool = False
