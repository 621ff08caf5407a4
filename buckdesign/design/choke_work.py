"""What a winding is made from and what it has to do."""

from __future__ import annotations

import math
from dataclasses import dataclass

from buckdesign.errors import InputError
from buckdesign.parts import Material, Ring, Wire

MOST_TURNS = 100_000
"""More turns than anybody winds; larger numbers are taken for a slip (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Made:
    """What a winding is made from.

    Attributes
    ----------
    ring, material, wire : Ring, Material, Wire
        Parts.
    strands, stack : int
        Parallel strands, stacked rings.
    permeability : float
        Factor on the material's permeability [1].
    """

    ring: Ring
    material: Material
    wire: Wire
    strands: int
    stack: int
    permeability: float


@dataclass(frozen=True, kw_only=True)
class ChokeWork:
    """What the choke has to do; what is not known is None and what depends on it is not computed.

    Attributes
    ----------
    current : float, optional
        Mean (bias) current [A].
    ripple : float, optional
        Ripple current, peak to peak [A]; exclusive with `voltage`.
    voltage : float, optional
        Voltage across the choke while the current rises [V], from which the ripple follows.
    frequency : float, optional
        Switching frequency [Hz].
    duty : float
        Share of the period in which the current rises [1].
    ambient_c : float
        Temperature of the air [degC].
    worst_current : float, optional
        Largest current, such as start-up or overload [A].

    Raises
    ------
    InputError
        A value is out of range, or values contradict each other.
    """

    current: float | None = None
    ripple: float | None = None
    voltage: float | None = None
    frequency: float | None = None
    duty: float = 0.5
    ambient_c: float = 25.0
    worst_current: float | None = None

    def __post_init__(self) -> None:
        for name in ("current", "ripple", "voltage", "frequency", "worst_current"):
            check_positive(name.replace("_", " "), getattr(self, name))
        if not 0.0 < self.duty < 1.0:
            raise InputError(f"duty = {self.duty:g}: a share between 0 and 1 is wanted")
        if not -60.0 <= self.ambient_c <= 150.0:
            raise InputError(f"ambient = {self.ambient_c:g} degC: -60 to 150 degC is wanted")
        if self.ripple is not None and self.voltage is not None:
            raise InputError("ripple and voltage contradict each other: give one of them")
        alternating = self.ripple is not None or self.voltage is not None
        if alternating and self.frequency is None:
            raise InputError("frequency is wanted with the ripple")
        if alternating and self.current is None:
            raise InputError("current is wanted with the ripple")
        if self.worst_current is not None and self.worst_current < (self.current or 0.0):
            raise InputError(f"worst current = {self.worst_current:g} A: less than the current")

    @property
    def peak(self) -> float:
        """Largest current that is known of [A]."""
        return max((self.current or 0.0) + (self.ripple or 0.0) / 2.0, self.worst_current or 0.0)


def check_positive(name: str, value: float | None) -> None:
    """Refuse a value that is given and not a finite number above zero.

    Parameters
    ----------
    name : str
        As the message calls it.
    value : float or None
        The value.

    Raises
    ------
    InputError
        It is zero, negative, infinite or not a number.
    """
    if value is not None and not (math.isfinite(value) and value > 0.0):
        raise InputError(f"{name} = {value:g}: a value above 0 is wanted")
