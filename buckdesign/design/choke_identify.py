"""The ring from the drawer: what it is made of, how sure that is, and what to measure next."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from buckdesign.design.core_likelihood import CandidateShare, Evidence, candidate_shares, kind_shares
from buckdesign.design.identify_advice import advise
from buckdesign.errors import InputError
from buckdesign.parts import Ring, Tables
from buckdesign.physics.ring import core_constant_c1, effective_area, effective_length, inductance_factor
from buckdesign.physics.unknown_core import (
    CALIPER_TOLERANCE,
    METER_TOLERANCE,
    permeability_bounds,
    permeability_from_test_winding,
)

POWDER_LIMIT = 100.0
"""Permeability above which no ring is called iron powder [1]: the highest grade; others begin at 125."""

FERRITE_LIMIT = 750.0
"""Permeability from which a ring is called ferrite [1]: other powders end at 600, ferrites for power begin at
800 (from memory), with room for tolerances."""

SURE = 0.5
"""Share of the likelihood from which a kind is named [1] (own choice)."""

MATCH_TOLERANCE = 0.025
"""Difference of each dimension up to which a measured ring is taken for one of the table, as a fraction:
caliper and coating (common practice)."""

CONTRADICTION = 0.08
"""Difference of two readings of the inductance factor that is not the meter's, as a fraction (own choice)."""


@dataclass(frozen=True, kw_only=True)
class TestReading:
    """What was measured on a test winding.

    Attributes
    ----------
    turns : int
        Turns through the bore.
    inductance : float
        Without direct current [H].
    bias_current, biased_inductance : float, optional
        A second reading under direct current [A], [H].
    second_turns, second_inductance : float, optional
        A second test winding without direct current [1], [H].

    Raises
    ------
    InputError
        A value is not above zero, or one of a pair is missing.
    """

    __test__ = False

    turns: int
    inductance: float
    bias_current: float | None = None
    biased_inductance: float | None = None
    second_turns: int | None = None
    second_inductance: float | None = None

    def __post_init__(self) -> None:
        for name in ("turns", "second_turns"):
            value = getattr(self, name)
            if value is not None and not (1 <= value <= 100_000 and value == int(value)):
                raise InputError(f"{name.replace('_', ' ')} = {value}: a whole number above 0 is wanted")
        for name in ("inductance", "bias_current", "biased_inductance", "second_inductance"):
            value = getattr(self, name)
            if value is not None and not (math.isfinite(value) and value > 0.0):
                raise InputError(f"{name.replace('_', ' ')} = {value:g}: a value above 0 is wanted")
        for first, second in (("bias_current", "biased_inductance"), ("second_turns", "second_inductance")):
            if (getattr(self, first) is None) != (getattr(self, second) is None):
                raise InputError(
                    f"{first.replace('_', ' ')} and {second.replace('_', ' ')} are wanted together"
                )
        if self.biased_inductance is not None and self.biased_inductance > 1.1 * self.inductance:
            raise InputError(
                f"biased inductance = {self.biased_inductance:g} H: above that without bias, which can't be"
            )


LARGEST_RING = 0.5
"""Dimension above which a number without a unit was surely meant in millimetres [m] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class RingSize:
    """Measured dimensions and how well they are known.

    Attributes
    ----------
    outer, inner, height : float
        [m].
    dimension_tolerance, meter_tolerance : float
        Largest errors of dimensions and of inductances, as fractions [1].

    Raises
    ------
    InputError
        A dimension is not above zero, the bore not smaller than the ring, a tolerance not below a half.
    """

    outer: float
    inner: float
    height: float
    dimension_tolerance: float = CALIPER_TOLERANCE
    meter_tolerance: float = METER_TOLERANCE

    def __post_init__(self) -> None:
        for name in ("outer", "inner", "height"):
            value = getattr(self, name)
            if not (math.isfinite(value) and value > 0.0):
                raise InputError(f"{name} = {value:g} m: a value above 0 is wanted")
            if value > LARGEST_RING:
                raise InputError(f'{name} = {value:g} m: no ring is that large; write "{value:g} mm" for millimetres')
        if self.inner >= self.outer:
            raise InputError(f"inner = {self.inner:g} m: must be smaller than outer, {self.outer:g} m")
        for name in ("dimension_tolerance", "meter_tolerance"):
            value = getattr(self, name)
            if not 0.0 <= value < 0.5:
                raise InputError(f"{name.replace('_', ' ')} = {value:g}: 0 to 50 % is wanted")


@dataclass(frozen=True, kw_only=True)
class Identification:
    """What a ring was recognised as.

    Attributes
    ----------
    permeability, permeability_low, permeability_high : float or None
        By the ring formula, and what dimensions and meter allow [1]; high is None where the wall of the ring
        may vanish within the tolerance.
    candidates : tuple of CandidateShare
        Materials with their likelihood, the likeliest first; they sum to 1.
    kind : str
        ``iron powder``, ``ferrite`` or ``unclear``.
    effective_length_m, effective_area_m2 : float
        Published where the ring is in the table, else by formula [m], [m2].
    al_h : float
        Inductance by turns squared [H].
    advice : tuple of str
        What it is good for and what to measure next.
    ring : str or None
        Ring of the table that was recognised.
    saturation_current_a : float or None
        Current at which the test winding saturates, where it may be ferrite [A].
    refused : bool
        Whether it is refused for a choke.
    """

    permeability: float
    permeability_low: float
    permeability_high: float | None
    candidates: tuple[CandidateShare, ...]
    kind: str
    effective_length_m: float
    effective_area_m2: float
    al_h: float
    advice: tuple[str, ...]
    ring: str | None
    saturation_current_a: float | None
    refused: bool

    def to_dict(self) -> dict[str, Any]:
        """The keys of the JSON output."""
        names = ("permeability", "permeability_low", "permeability_high")
        found: dict[str, Any] = {name: getattr(self, name) for name in names}
        found["candidates"] = [
            {"material": one.material, "likelihood": one.likelihood} for one in self.candidates
        ]
        last = ("kind", "effective_length_m", "effective_area_m2", "al_h", "advice")
        return found | {name: getattr(self, name) for name in last}


def identify_core(tables: Tables, size: RingSize, reading: TestReading) -> Identification:
    """Recognise a ring from its dimensions and a test winding.

    Parameters
    ----------
    tables : Tables
        Rings, materials, published inductance factors.
    size : RingSize
        Measured dimensions.
    reading : TestReading
        Measured inductances.

    Returns
    -------
    Identification
        Permeability with its uncertainty, candidates, kind, advice.

    Raises
    ------
    InputError
        Two test windings contradict each other.
    """
    ring = match_ring(tables.rings.values(), size)
    shape = (size.outer, size.inner, size.height)
    if ring is not None:
        shape = (ring.outer_diameter, ring.inner_diameter, ring.height)
    al = _inductance_factor(reading)
    dimension_tolerance = size.dimension_tolerance
    permeability = float(permeability_from_test_winding(al, 1.0, *shape))
    low, high = permeability_bounds(al, 1.0, *shape, dimension_tolerance, size.meter_tolerance)
    length, area = _effective(ring, shape)
    evidence = Evidence(
        ring=ring,
        outer=shape[0],
        inner=shape[1],
        al=al,
        formula_al_of_one=float(inductance_factor(1.0, core_constant_c1(*shape))),
        dimension_tolerance=0.0 if ring is not None else dimension_tolerance,
        meter_tolerance=size.meter_tolerance,
        length=length,
        drive=None if reading.bias_current is None else reading.bias_current * reading.turns,
        fraction=None
        if reading.biased_inductance is None
        else reading.biased_inductance / reading.inductance,
    )
    candidates = candidate_shares(tables, evidence)
    kind = _kind(tables, candidates, permeability)
    advice, saturation = advise(tables, evidence, candidates, kind, permeability, reading.turns)
    return Identification(
        permeability=permeability,
        permeability_low=float(low),
        permeability_high=float(high) if math.isfinite(high) else None,
        candidates=candidates,
        kind=kind,
        effective_length_m=length,
        effective_area_m2=area,
        al_h=al,
        advice=advice,
        ring=None if ring is None else ring.name,
        saturation_current_a=saturation,
        refused=kind == "ferrite",
    )


def match_ring(rings: Any, size: RingSize) -> Ring | None:
    """The ring of the table that a measured one is.

    Parameters
    ----------
    rings : iterable of Ring
        Rings to choose from.
    size : RingSize
        Measured dimensions.

    Returns
    -------
    Ring or None
        The nearest, if every dimension is within `MATCH_TOLERANCE`, or twice the caliper's if that is more.
    """
    limit = max(MATCH_TOLERANCE, 2.0 * size.dimension_tolerance)
    best, least = None, limit
    for ring in rings:
        pairs = (
            (size.outer, ring.outer_diameter),
            (size.inner, ring.inner_diameter),
            (size.height, ring.height),
        )
        off = max(abs(measured / nominal - 1.0) for measured, nominal in pairs)
        if off <= least:
            best, least = ring, off
    return best


def _inductance_factor(reading: TestReading) -> float:
    """Inductance factor from one or two test windings [H]."""
    first = reading.inductance / reading.turns**2
    if reading.second_turns is None or reading.second_inductance is None:
        return first
    second = reading.second_inductance / reading.second_turns**2
    if abs(math.log(second / first)) > CONTRADICTION:
        raise InputError(
            f"the two test windings contradict each other: {first * 1e9:.3g} nH and {second * 1e9:.3g} nH "
            "by turns squared; count the turns again and keep the leads short"
        )
    return math.sqrt(first * second)


def _effective(ring: Ring | None, shape: Sequence[float]) -> tuple[float, float]:
    outer, inner, height = shape
    if ring is not None and ring.effective_length is not None and ring.effective_area is not None:
        return ring.effective_length, ring.effective_area
    return float(effective_length(outer, inner)), float(effective_area(outer, inner, height))


def _kind(tables: Tables, candidates: Sequence[CandidateShare], permeability: float) -> str:
    shares = kind_shares(tables, candidates)
    if permeability >= FERRITE_LIMIT:
        return "ferrite" if shares["ferrite"] >= SURE else "unclear"
    if permeability <= POWDER_LIMIT and shares["iron powder"] >= SURE:
        return "iron powder"
    return "unclear"
