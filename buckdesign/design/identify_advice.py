"""What to tell somebody who wants to know what a ring is good for, and what to measure next."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

from buckdesign.constants import OERSTED
from buckdesign.design.core_likelihood import (
    CandidateShare,
    Evidence,
    expected_fraction,
    kind_shares,
    likely_materials,
)
from buckdesign.parts import Material, Tables
from buckdesign.physics.choke import FERRITE_FLUX_LIMIT, ferrite_saturation_current

BIAS_FIELD = 50.0 * OERSTED
"""Field at which the bias laws of the materials differ most for their known points [A/m]."""

BENCH_CURRENT = 5.0
"""Direct current that most bench supplies give [A] (common practice)."""

LEAST_INDUCTANCE = 2e-6
"""Inductance below which leads and meter spoil a reading [H] (common practice)."""

SAME = 0.95
"""Share of the likelihood of the materials that are weighed against each other [1]."""


def advise(
    tables: Tables,
    evidence: Evidence,
    candidates: Sequence[CandidateShare],
    kind: str,
    permeability: float,
    turns: int,
) -> tuple[tuple[str, ...], float | None]:
    """What a ring is good for and what to measure next.

    Parameters
    ----------
    tables : Tables
        Materials.
    evidence : Evidence
        What was measured.
    candidates : sequence of CandidateShare
        Materials with their likelihood, the likeliest first.
    kind : str
        What the ring is called.
    permeability : float
        Measured permeability [1].
    turns : int
        Turns of the test winding.

    Returns
    -------
    tuple of tuple of str, and float or None
        Advice; and the current at which the test winding saturates if the ring is ferrite [A], None where it
        can't be.
    """
    possible = likely_materials(tables, candidates, SAME)
    maybe_ferrite = kind == "ferrite" or kind_shares(tables, candidates)["ferrite"] > 0.02
    saturation = None
    found: list[str] = []
    if maybe_ferrite:
        saturation, text = _ferrite(possible, evidence, kind, permeability, turns)
        found.append(text)
    found += _kind(kind, permeability, possible)
    found += _next(possible, evidence, kind, turns)
    return tuple(found), saturation


def _ferrite(
    possible: Sequence[Material], evidence: Evidence, kind: str, permeability: float, turns: int
) -> tuple[float, str]:
    hot = [one.saturation_hot for one in possible if one.kind == "ferrite" and one.saturation_hot is not None]
    limit = min(hot, default=FERRITE_FLUX_LIMIT)
    current = float(ferrite_saturation_current(turns, permeability, evidence.length, limit))
    if kind == "ferrite":
        text = (
            f"refused for a choke: as a ferrite ring without a gap it saturates at {current:.2g} A with "
            f"{turns} turns ({limit:.2g} T hot), with more turns sooner; good for transformers and "
            "interference chokes"
        )
    else:
        text = f"if it is ferrite it saturates at {current:.2g} A with {turns} turns and is no choke"
    return current, text


def _kind(kind: str, permeability: float, possible: Sequence[Material]) -> Iterator[str]:
    match kind:
        case "iron powder":
            names = _names(one for one in possible if one.kind == "iron powder")
            yield f"iron powder, most likely {names}"
            others = [one for one in possible if one.kind == "other powder"]
            if others:
                yield (
                    f"also possible by its permeability: {_names(others)}, rarer in old supplies; these keep "
                    "more inductance under bias"
                )
        case "unclear" if permeability > 110.0:
            yield (
                f"permeability {permeability:.3g} is above iron powder and below power ferrite: an alloy "
                "powder or a nickel-zinc ferrite; no choke before it has been measured under direct current"
            )
        case "unclear":
            yield f"several materials have this permeability: {_names(possible)}"


def _next(possible: Sequence[Material], evidence: Evidence, kind: str, turns: int) -> Iterator[str]:
    inductance = evidence.al * turns**2
    if inductance < LEAST_INDUCTANCE:
        more = math.ceil(math.sqrt(5.0 * LEAST_INDUCTANCE / evidence.al))
        yield (
            f"{inductance * 1e6:.2g} uH is little for a hand-held meter: wind {more} turns for about "
            f"{evidence.al * more**2 * 1e6:.2g} uH and measure again"
        )
    if evidence.drive is None and kind != "ferrite":
        yield _bias_reading(possible, evidence, turns)
    if kind != "ferrite" and evidence.fraction is not None and evidence.fraction > 0.9:
        yield "under bias nearly all inductance was left, which tells little: measure at a larger current"
    if evidence.ring is None:
        yield "the ring is in no table: measure it twice; its inductance factor is judged by formula alone"
    same = {one.permeability for one in possible if one.kind == "iron powder"}
    if kind == "iron powder" and len(same) == 1 and sum(one.kind == "iron powder" for one in possible) > 1:
        yield "grades of equal permeability differ in core loss: mind the temperature at work"


def _bias_reading(possible: Sequence[Material], evidence: Evidence, turns: int) -> str:
    """How to tell the materials apart with direct current."""
    current = BIAS_FIELD * evidence.length / turns
    wound = turns
    if current > BENCH_CURRENT:
        wound = math.ceil(BIAS_FIELD * evidence.length / BENCH_CURRENT)
        current = BIAS_FIELD * evidence.length / wound
    text = f"to be surer measure again with {current:.2g} A of direct current"
    text += "" if wound == turns else f" through {wound} turns"
    shares = []
    for one in possible:
        left = expected_fraction(one, evidence, wound * current)
        if left is not None:
            shares.append((one.name, left))
    shares = shares[:4]
    if not shares:
        return text
    return text + ": " + ", ".join(f"{name} keeps {left * 100:.0f} %" for name, left in shares)


def _names(materials: object) -> str:
    names = [one.name for one in materials]  # type: ignore[attr-defined]
    return " or ".join(names[:3]) + (" or others" if len(names) > 3 else "")
