"""The choke of a design file as the loop sees it: inductance, bias law and resistance."""

from __future__ import annotations

import math
from functools import lru_cache

from buckdesign.design.elements import ChokeElement, WindingElement
from buckdesign.design.sections import ChokeSection
from buckdesign.parts import Material, Ring, Tables
from buckdesign.physics.bias import ring_bias_law
from buckdesign.physics.choke import bias_current_of_bought_choke, ferrite_saturation_current
from buckdesign.physics.ring import (
    core_constant_c1,
    effective_area,
    effective_length,
    effective_volume,
    inductance_factor,
)
from buckdesign.physics.winding import wind, wire_length
from buckdesign.physics.wire import dc_resistance

BOUGHT_BIAS_EXPONENT = 1.5
"""Exponent of the bias law of a bought choke (common practice for powder cores)."""

FERRITE_BIAS_EXPONENT = 8.0
"""Exponent that makes the inductance of an ungapped ferrite ring collapse at saturation (assumed)."""

MOST_LAYS = 4096
"""Windings whose mean turn is kept [1] (own choice)."""


def resolve_choke(section: ChokeSection, tables: Tables, assumptions: list[str]) -> ChokeElement:
    """The choke with every value in place.

    Parameters
    ----------
    section : ChokeSection
        A winding or a bought part.
    tables : Tables
        Rings, materials and wires.
    assumptions : list of str
        Gets a sentence for each value that had to be assumed.

    Returns
    -------
    ChokeElement
        Inductance without bias, its fall with current, resistance at 20 degC.

    Raises
    ------
    UnknownNameError
        Ring, material or wire is in no table.
    """
    if section.core is None:
        saturation = section.saturation
        bias = math.inf if saturation is None else float(bias_current_of_bought_choke(saturation))
        assert section.inductance is not None
        return ChokeElement(
            inductance=section.inductance,
            bias_current=bias,
            bias_exponent=BOUGHT_BIAS_EXPONENT,
            resistance=section.resistance or 0.0,
            winding=None,
        )
    winding = _winding(section, tables, assumptions)
    bias_current, exponent = _bias_law(winding, assumptions)
    return ChokeElement(
        inductance=winding.inductance_factor * winding.turns**2,
        bias_current=bias_current,
        bias_exponent=exponent,
        resistance=winding_resistance(winding),
        winding=winding,
    )


def winding_resistance(winding: WindingElement, temperature_c: float = 20.0) -> float:
    """DC resistance of a winding with its leads.

    Parameters
    ----------
    winding : WindingElement
        The winding.
    temperature_c : float
        Temperature of the copper [degC].

    Returns
    -------
    float
        [ohm].
    """
    ring, wire = winding.ring, winding.wire
    length = wire_length(
        winding.turns,
        _mean_turn(
            ring.outer_diameter,
            ring.inner_diameter,
            ring.height * winding.stack,
            wire.outer_diameter_grade1,
            winding.turns * winding.strands,
        ),
    )
    return float(dc_resistance(length, wire.conductor_diameter, winding.strands, temperature_c))


@lru_cache(maxsize=MOST_LAYS)
def _mean_turn(outer: float, inner: float, height: float, wire: float, wires: int) -> float:
    """Mean turn of a winding [m]; variants of a design mostly share their winding."""
    return float(wind(outer, inner, height, wire, wires).mean_turn)


def _winding(section: ChokeSection, tables: Tables, assumptions: list[str]) -> WindingElement:
    assert section.core is not None and section.material is not None
    assert section.wire is not None and section.turns is not None
    ring, material = tables.ring(section.core), tables.material(section.material)
    published = tables.inductance_factor(ring.name, material.name)
    factor = _formula_factor(ring, material) if published is None else published.al
    if published is None:
        assumptions.append(
            f"{ring.name}, {material.name}: inductance factor from dimensions and permeability"
        )
    known = [("bias law", material.bias_how), ("core loss", material.loss_how)]
    told = "; ".join(f"{what}: {how}" for what, how in known if how)
    if told:
        assumptions.append(f"{material.name}, {told}")
    length, area, volume = _effective(ring)
    return WindingElement(
        ring=ring,
        material=material,
        wire=tables.wire(section.wire),
        permeability_factor=section.permeability,
        stack=section.stack,
        turns=section.turns,
        strands=section.strands,
        effective_length=length,
        effective_area=area * section.stack,
        effective_volume=volume * section.stack,
        inductance_factor=factor * section.permeability * section.stack,
        factor_is_published=published is not None,
    )


def _formula_factor(ring: Ring, material: Material) -> float:
    c1 = core_constant_c1(ring.outer_diameter, ring.inner_diameter, ring.height)
    return float(inductance_factor(material.permeability, c1))


def _effective(ring: Ring) -> tuple[float, float, float]:
    """Effective length, area and volume of one ring: published where known, else by dimensions."""
    size = ring.outer_diameter, ring.inner_diameter, ring.height
    if ring.effective_length is None or ring.effective_area is None:
        return (
            float(effective_length(*size[:2])),
            float(effective_area(*size)),
            float(effective_volume(*size)),
        )
    volume = ring.effective_volume
    return (
        ring.effective_length,
        ring.effective_area,
        ring.effective_length * ring.effective_area if volume is None else volume,
    )


def _bias_law(winding: WindingElement, assumptions: list[str]) -> tuple[float, float]:
    """Bias current and exponent of the incremental inductance."""
    ring, material = winding.ring, winding.material
    if material.bias_field is not None and material.bias_exponent is not None:
        half, exponent = ring_bias_law(
            winding.turns,
            ring.outer_diameter,
            ring.inner_diameter,
            material.bias_field,
            material.bias_exponent,
        )
        return float(half), float(exponent)
    if material.kind == "ferrite" and material.saturation is not None:
        permeability = material.permeability * winding.permeability_factor
        limit = ferrite_saturation_current(
            winding.turns, permeability, winding.effective_length, material.saturation
        )
        assumptions.append(
            f"{material.name}: the inductance collapses at the saturation current, {limit:.2g} A"
        )
        return float(limit), FERRITE_BIAS_EXPONENT
    assumptions.append(
        f"{material.name}: no law of permeability under bias is known; inductance held constant"
    )
    return math.inf, BOUGHT_BIAS_EXPONENT
