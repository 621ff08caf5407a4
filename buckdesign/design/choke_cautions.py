"""What to say about a winding: limits it breaks, things to mind, and where its numbers come from."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from buckdesign.design.choke_ageing import ageing_fault, ageing_note, ageing_warning
from buckdesign.design.choke_heat import HOTTEST_C
from buckdesign.design.choke_work import ChokeWork, Made
from buckdesign.parts import Material, Tables
from buckdesign.physics.arrays import within
from buckdesign.physics.bias import fraction_spread
from buckdesign.physics.choke import ferrite_saturation_current
from buckdesign.physics.core_loss import RANGES as LOSS_RANGES
from buckdesign.physics.ring import RANGES as RING_RANGES
from buckdesign.physics.ring import core_constant_c1, effective_length, inductance_factor
from buckdesign.physics.unknown_core import FORMULA_TOLERANCE, MATERIAL_TOLERANCE

COMFORTABLE_FILL = 0.35
"""Share of the bore that is wound comfortably by hand [1] (common practice)."""

FULL_FILL = 0.45
"""Share of the bore that a full winding by hand takes [1] (common practice)."""

STIFF_WIRE = 1.7e-3
"""Copper diameter from which wire no longer lies tight around a ring by hand [m] (common practice)."""

UNEVEN_SPREAD = 0.1
"""Difference of the permeability share between outside and bore that is worth mentioning [1] (own choice)."""

SATURATION_MARGIN = 1.2
"""Saturation over flux density below which it is mentioned [1] (own choice)."""

LEAST_FRACTION = 1.0 / 3.0
"""Share of the inductance below which a choke swings much [1] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Verdict:
    """What there is to say about a winding.

    Attributes
    ----------
    warnings : tuple of str
        Things to mind, broken limits among them, gravest first.
    faults : tuple of str
        Limits that are broken, apart from turns that do not fit.
    notes : tuple of str
        Where numbers come from.
    turns_by_hand : int
        Turns up to which the bore is wound by hand.
    factor, tolerance : float
        Inductance factor of one ring in use [H] and its tolerance as a fraction [1].
    """

    warnings: tuple[str, ...]
    faults: tuple[str, ...]
    notes: tuple[str, ...]
    turns_by_hand: int
    factor: float
    tolerance: float


def judge(
    tables: Tables,
    made: Made,
    numbers: Mapping[str, float],
    work: ChokeWork,
) -> Verdict:
    """Judge a winding by its numbers.

    Parameters
    ----------
    tables : Tables
        For the published inductance factor and what is said about it.
    made : Made
        What it is made from.
    numbers : mapping of str to float
        One winding of `buckdesign.design.choke_windings.Windings`.
    work : ChokeWork
        What it has to do.

    Returns
    -------
    Verdict
        Warnings, faults, notes.
    """
    ring, material = made.ring, made.material
    by_hand = _turns_by_hand(made, numbers["turns_capacity"])
    known = tables.inductance_factor(ring.name, material.name)
    c1 = core_constant_c1(ring.outer_diameter, ring.inner_diameter, ring.height)
    formula = float(inductance_factor(material.permeability, c1))
    factor = formula if known is None else known.al
    faults = tuple(_faults(made, numbers, work))
    tolerance = inductance_tolerance(material, known is not None)
    warnings = [*_room(made, numbers, by_hand), *faults]
    warnings += _bias(made, numbers, work)
    if work.current is not None:
        warnings += _heat(material, numbers, work)
    warnings += _pair(made, factor, formula, known is not None, "" if known is None else known.suspect)
    warnings += _ferrite(made, numbers, work)
    warnings += _handling(made)
    notes = [_factor_note(factor, formula, tolerance, None if known is None else known.source)]
    notes += _uneven(made, numbers, work)
    notes += _notes(material, numbers, work)
    return Verdict(
        warnings=tuple(warnings),
        faults=faults,
        notes=tuple(notes),
        turns_by_hand=by_hand,
        factor=factor,
        tolerance=tolerance,
    )


def inductance_tolerance(material: Material, published: bool) -> float:
    """How far the inductance of a ring may be off.

    Parameters
    ----------
    material : Material
        The material.
    published : bool
        Whether its inductance factor is published for the ring.

    Returns
    -------
    float
        Plus or minus, as a fraction [1].
    """
    if published:
        return MATERIAL_TOLERANCE
    own = material.permeability_tolerance or 0.0
    return own if own > 0.0 and _is_own(material) else max(FORMULA_TOLERANCE, own)


def _is_own(material: Material) -> bool:
    """Whether the material was measured on the bench, so that it needs no list."""
    return material.how.startswith(("fitted", "measured"))


def saturation_current(made: Made, turns: float) -> float | None:
    """Current at which an ungapped ferrite ring saturates.

    Parameters
    ----------
    made : Made
        Ring and material.
    turns : float
        Turns [1].

    Returns
    -------
    float or None
        Current at the hot saturation, else that at 25 degC [A]; None where the material is no ferrite or has
        none.
    """
    ring, material = made.ring, made.material
    limit = material.saturation_hot or material.saturation
    if material.kind != "ferrite" or limit is None:
        return None
    length = ring.effective_length or float(effective_length(ring.outer_diameter, ring.inner_diameter))
    permeability = material.permeability * made.permeability
    return float(ferrite_saturation_current(turns, permeability, length, limit))


def _turns_by_hand(made: Made, capacity: float) -> int:
    most = FULL_FILL * (made.ring.inner_diameter / made.wire.outer_diameter_grade1) ** 2 / made.strands
    return int(min(math.floor(most), capacity))


def _faults(made: Made, numbers: Mapping[str, float], work: ChokeWork) -> Iterator[str]:
    material = made.material
    limit = saturation_current(made, numbers["turns"])
    if limit is not None and work.peak > limit:
        yield (
            f"refused: {material.name} without a gap saturates at {limit:.2g} A with "
            f"{numbers['turns']:.0f} turns, and {work.peak:.3g} A are wanted; take iron powder or a gap"
        )
    elif work.current is not None and numbers["saturation_margin"] < 1.0:
        yield (
            f"saturated: {numbers['worst_flux_density_t']:.2g} T at {work.peak:.3g} A, "
            f"saturation of {material.name} about {material.saturation_hot or material.saturation:.2g} T"
        )
    if work.current is not None and limit is None:
        fault = ageing_fault(work.ambient_c + numbers["temperature_rise_k"])
        if fault is not None and material.kind == "iron powder":
            yield fault


def _room(made: Made, numbers: Mapping[str, float], by_hand: int) -> Iterator[str]:
    fill = numbers["bore_fill"]
    if not numbers["fits"]:
        yield (
            f"{numbers['turns']:.0f} turns do not fit: the bore holds {numbers['turns_capacity']:.0f}, "
            f"by hand about {by_hand} ({FULL_FILL * 100:.0f} % of the bore)"
        )
    elif fill > FULL_FILL:
        yield (
            f"{fill * 100:.0f} % of the bore: a full winding by hand takes {FULL_FILL * 100:.0f} % "
            f"({by_hand} turns); this needs a shuttle and patience"
        )
    elif fill > COMFORTABLE_FILL:
        yield f"{fill * 100:.0f} % of the bore: tight, {COMFORTABLE_FILL * 100:.0f} % is comfortable by hand"


def _handling(made: Made) -> Iterator[str]:
    wire, strands = made.wire, made.strands
    if wire.conductor_diameter > STIFF_WIRE:
        yield (
            f"{wire.conductor_diameter * 1e3:.3g} mm wire is stiff and does not lie tight around a ring; "
            "parallel thinner strands do"
        )
    if strands > 1:
        yield f"{strands} strands: twist them lightly, so that the ripple divides evenly between them"


def _bias(made: Made, numbers: Mapping[str, float], work: ChokeWork) -> Iterator[str]:
    material = made.material
    if material.bias_field is None or material.bias_exponent is None:
        if material.kind != "ferrite" and work.current is not None:
            yield f"{material.name}: no bias law is known; the inductance is held constant under bias"
        return
    if work.current is None:
        return
    limit = material.bias_field_limit
    if limit is not None and numbers["worst_field_a_per_m"] > limit:
        yield (
            f"field of {numbers['worst_field_a_per_m'] / 1e3:.3g} kA/m at {work.peak:.3g} A is beyond the "
            f"{limit / 1e3:.3g} kA/m up to which the bias law holds"
        )
    if numbers["permeability_fraction"] < LEAST_FRACTION:
        yield (
            f"only {numbers['permeability_fraction'] * 100:.0f} % of the inductance is left at "
            f"{work.current:.3g} A: it swings much with the load"
        )
    if 1.0 <= numbers["saturation_margin"] < SATURATION_MARGIN:
        yield (
            f"{numbers['worst_flux_density_t']:.2g} T at {work.peak:.3g} A is near to saturation "
            f"(about {material.saturation_hot or material.saturation:.2g} T)"
        )
    if work.ripple is not None and work.ripple > 2.0 * work.current:
        yield "the ripple is more than twice the current: the choke current reaches zero in every cycle"


def _heat(material: Material, numbers: Mapping[str, float], work: ChokeWork) -> Iterator[str]:
    hottest = work.ambient_c + numbers["temperature_rise_k"]
    warning = ageing_warning(hottest)
    if material.kind == "iron powder" and warning is not None and ageing_fault(hottest) is None:
        yield warning
    if hottest > HOTTEST_C:
        yield f"hotter than all models hold; the copper is judged with its resistance at {HOTTEST_C:.0f} degC"
    if work.ripple is None:
        yield "without ripple and frequency the core loss is not known; the rise counts the copper alone"
        return
    if material.loss_coefficients is None:
        yield f"{material.name}: no core loss is known; the rise counts the copper alone"
        return
    peak, limits = numbers["flux_swing_t"] / 2.0, LOSS_RANGES["three_term_loss"]
    if not within(limits["frequency"], work.frequency or 0.0):
        low, high = limits["frequency"]
        yield (
            f"{work.frequency:.3g} Hz is outside the range of the core-loss data, "
            f"{low:.0f} Hz to {high / 1e3:.0f} kHz"
        )
    if not within(limits["peak_flux"], peak) and peak > 0.0:
        low, high = limits["peak_flux"]
        yield (
            f"{peak * 1e3:.2g} mT of alternating flux is outside the range of the core-loss data, "
            f"{low * 1e3:.0f} mT to {high * 1e3:.0f} mT"
        )
    if material.loss_as:
        yield f"{material.name}: core loss taken from {material.loss_as}, none of its own is known"
    if numbers["copper_ripple_loss_w"] > 0.3 * numbers["copper_loss_w"]:
        share = numbers["copper_ripple_loss_w"] / numbers["copper_loss_w"]
        yield f"{share * 100:.0f} % of the copper loss comes from the ripple: thinner strands help"


def _pair(made: Made, factor: float, formula: float, published: bool, suspect: str) -> Iterator[str]:
    ring, material = made.ring, made.material
    if not published:
        if _is_own(material):
            return
        yield (
            f"{ring.name} is not known to be sold in {material.name}: the inductance factor is computed from "
            f"dimensions and permeability, within about {inductance_tolerance(material, False) * 100:.0f} %"
        )
        return
    band = "permeability 75" if material.permeability == 75.0 else "other iron powders"
    limits = RING_RANGES[f"inductance_factor / catalogue, {band}"]["ratio"]
    if material.kind == "iron powder" and not within(limits, factor / formula):
        yield (
            f"published inductance factor {factor * 1e9:.3g} nH, by formula {formula * 1e9:.3g} nH: "
            "further apart than usual, measure the ring"
        )
    if suspect:
        yield f"the published inductance factor is doubted: {suspect}"


def _ferrite(made: Made, numbers: Mapping[str, float], work: ChokeWork) -> Iterator[str]:
    material = made.material
    limit = saturation_current(made, numbers["turns"])
    if limit is not None and work.peak <= limit:
        yield (
            f"{material.name} without a gap saturates at {limit:.2g} A with {numbers['turns']:.0f} turns: "
            "no choke for direct current"
        )


def _factor_note(factor: float, formula: float, tolerance: float, source: str | None) -> str:
    if source is None:
        return f"inductance factor {factor * 1e9:.4g} nH by formula, within about {tolerance * 100:.0f} %"
    return (
        f"inductance factor {factor * 1e9:.3g} nH published, within about {tolerance * 100:.0f} % "
        f"(formula {formula * 1e9:.3g} nH, {factor / formula:.2f} of it); {source}"
    )


def _uneven(made: Made, numbers: Mapping[str, float], work: ChokeWork) -> Iterator[str]:
    """Where the field differs so much between bore and outside that the mean would mislead."""
    ring, material = made.ring, made.material
    if work.current is None or material.bias_field is None or material.bias_exponent is None:
        return
    size, law = (ring.outer_diameter, ring.inner_diameter), (material.bias_field, material.bias_exponent)
    spread = float(fraction_spread(numbers["turns"] * work.current, *size, *law))
    if spread >= UNEVEN_SPREAD:
        yield (
            f"the bore keeps {spread * 100:.0f} points less of its permeability than the outside; the "
            "inductance is integrated over the section"
        )


def _notes(material: Material, numbers: Mapping[str, float], work: ChokeWork) -> Iterator[str]:
    if material.bias_exponent_uncertainty is not None and work.current is not None:
        yield (
            f"bias law of {material.name}: {material.bias_how or 'origin not said'}; "
            f"exponent {material.bias_exponent:g} within {material.bias_exponent_uncertainty:g}"
        )
    if work.current is not None and material.kind == "iron powder":
        yield ageing_note(work.ambient_c + numbers["temperature_rise_k"])
