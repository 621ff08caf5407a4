"""How likely each material is, given what was measured on a ring."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from buckdesign.constants import MU_0
from buckdesign.parts import Material, Ring, Tables
from buckdesign.physics.bias import permeability_fraction, ring_inductance_fraction
from buckdesign.physics.unknown_core import (
    FORMULA_TOLERANCE,
    MATERIAL_TOLERANCE,
    candidate_probabilities,
    log_likelihood,
)

KIND_WEIGHTS = {"iron powder": 1.0, "other powder": 0.05, "ferrite": 0.5}
"""How often a material of each kind turns up among salvaged rings [1] (guess of common practice)."""

UNPUBLISHED_WEIGHT = 0.25
"""How often a ring of the table turns up in an iron powder in which no list has it [1] (guess)."""

LAW_UNCERTAINTY = 0.05
"""Uncertainty of the bias law to 100 Oe, as a share of the permeability [1] (core table)."""

FERRITE_EXPONENT = 8.0
"""Exponent that makes the permeability of ferrite collapse at its saturation [1] (assumed)."""

LEAST_SHARE = 1e-3
"""Candidates below this likelihood are left out [1]."""


@dataclass(frozen=True, kw_only=True)
class CandidateShare:
    """A material and how likely it is.

    Attributes
    ----------
    material : str
        Name.
    likelihood : float
        Of all candidates together 1.
    """

    material: str
    likelihood: float


@dataclass(frozen=True, kw_only=True)
class Evidence:
    """What was measured, in the terms of the likelihood.

    Attributes
    ----------
    ring : Ring or None
        Ring of the table that was recognised.
    outer, inner : float
        Diameters [m].
    al : float
        Inductance by turns squared [H].
    formula_al_of_one : float
        The same by formula for a permeability of 1 [H].
    dimension_tolerance, meter_tolerance : float
        Largest errors as fractions [1].
    length : float
        Effective length [m].
    drive, fraction : float or None
        Turns times direct current [A], and the share of the inductance that was left [1].
    """

    ring: Ring | None
    outer: float
    inner: float
    al: float
    formula_al_of_one: float
    dimension_tolerance: float
    meter_tolerance: float
    length: float
    drive: float | None
    fraction: float | None


def candidate_shares(tables: Tables, evidence: Evidence) -> tuple[CandidateShare, ...]:
    """Likelihood of every material of the tables.

    Parameters
    ----------
    tables : Tables
        Materials and published inductance factors.
    evidence : Evidence
        What was measured.

    Returns
    -------
    tuple of CandidateShare
        The likeliest first, without those below `LEAST_SHARE`; they sum to 1.

    Notes
    -----
    Bayes' theorem. The inductance factor is compared with the published one where the ring is in the table,
    else with the formula; the share left under bias with the material's law. For materials without a law
    every share is taken to be equally likely.
    """
    names, logs = [], []
    for name, material in tables.materials.items():
        names.append(name)
        logs.append(_log_weight(tables, material, evidence))
    shares = np.asarray(candidate_probabilities(np.array(logs)))
    kept = [(share, name) for share, name in zip(shares.tolist(), names, strict=True) if share >= LEAST_SHARE]
    kept.sort(key=lambda pair: -pair[0])
    total = sum(share for share, _ in kept)
    return tuple(CandidateShare(material=name, likelihood=share / total) for share, name in kept)


def kind_shares(tables: Tables, candidates: Iterable[CandidateShare]) -> dict[str, float]:
    """Likelihood of each kind of material.

    Parameters
    ----------
    tables : Tables
        For the kinds of the materials.
    candidates : iterable of CandidateShare
        Materials with their likelihood.

    Returns
    -------
    dict of str to float
        For iron powder, other powder and ferrite [1].
    """
    shares = dict.fromkeys(KIND_WEIGHTS, 0.0)
    for one in candidates:
        shares[tables.material(one.material).kind] += one.likelihood
    return shares


def likely_materials(tables: Tables, candidates: Sequence[CandidateShare], share: float) -> list[Material]:
    """The materials that make up a share of the likelihood, the likeliest first.

    Parameters
    ----------
    tables : Tables
        Materials.
    candidates : sequence of CandidateShare
        The likeliest first.
    share : float
        Sum of likelihoods to reach [1].

    Returns
    -------
    list of Material
        At least one.
    """
    found, total = [], 0.0
    for one in candidates:
        found.append(tables.material(one.material))
        total += one.likelihood
        if total >= share:
            break
    return found


def expected_fraction(material: Material, evidence: Evidence, drive: float) -> float | None:
    """Share of the inductance that a material keeps under bias.

    Parameters
    ----------
    material : Material
        The material.
    evidence : Evidence
        For the ring's dimensions.
    drive : float
        Turns times current [A].

    Returns
    -------
    float or None
        Share [1]; None where no law is known.
    """
    if material.bias_field is not None and material.bias_exponent is not None:
        law = material.bias_field, material.bias_exponent
        return float(ring_inductance_fraction(drive, evidence.outer, evidence.inner, *law))
    if material.kind == "ferrite" and material.saturation is not None:
        collapse = material.saturation / (MU_0 * material.permeability)
        return float(permeability_fraction(drive / evidence.length, collapse, FERRITE_EXPONENT))
    return None


def _log_weight(tables: Tables, material: Material, evidence: Evidence) -> float:
    """Logarithm of prior and likelihood together."""
    weight = KIND_WEIGHTS[material.kind]
    known = None if evidence.ring is None else tables.inductance_factor(evidence.ring.name, material.name)
    if known is not None:
        expected, spread = known.al, MATERIAL_TOLERANCE
    else:
        expected = material.permeability * evidence.formula_al_of_one
        spread = FORMULA_TOLERANCE
        if material.permeability_tolerance is not None and material.kind != "iron powder":
            spread = material.permeability_tolerance
        if evidence.ring is not None and material.kind == "iron powder":
            weight *= UNPUBLISHED_WEIGHT
    wall = evidence.dimension_tolerance / math.log(evidence.outer / evidence.inner)
    parts = (spread, evidence.meter_tolerance, evidence.dimension_tolerance, wall, wall)
    uncertainty = math.sqrt(sum(part * part for part in parts) / 3.0)
    logarithm = float(log_likelihood(evidence.al, expected, uncertainty)) + math.log(weight)
    return logarithm + _log_bias(material, evidence)


def _log_bias(material: Material, evidence: Evidence) -> float:
    """Logarithm of the density of the share left under bias; 0, a flat one, where no law is known."""
    if evidence.drive is None or evidence.fraction is None:
        return 0.0
    expected = expected_fraction(material, evidence, evidence.drive)
    if expected is None:
        return 0.0
    anchor = material.bias_anchor_uncertainty or 0.0
    meter = evidence.meter_tolerance * evidence.fraction
    parts = (LAW_UNCERTAINTY, anchor, meter, meter)
    deviation = math.sqrt(sum(part * part for part in parts) / 3.0)
    off = (evidence.fraction - expected) / deviation
    return -0.5 * off * off - math.log(deviation * math.sqrt(2.0 * math.pi))
