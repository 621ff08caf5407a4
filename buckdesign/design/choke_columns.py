"""Rings, materials and wires as columns of numbers, so that windings can be judged many at a time."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import MU_0
from buckdesign.design.choke_layers import LayerTable, layer_table
from buckdesign.parts import Material, Ring, Tables, Wire
from buckdesign.physics.ring import (
    core_constant_c1,
    effective_area,
    effective_length,
    effective_volume,
    inductance_factor,
)

Floats = NDArray[np.float64]
Indices = NDArray[np.intp]

NO_BIAS_FIELD = 1e12
"""Half field of a material without a bias law: its permeability is then held constant [A/m] (own choice)."""

NO_BIAS_EXPONENT = 1.5
"""Exponent that goes with `NO_BIAS_FIELD` [1]; without effect."""

FERRITE_EXPONENT = 8.0
"""Exponent that makes the permeability of ferrite collapse at its saturation [1] (assumed)."""


@dataclass(frozen=True, kw_only=True, eq=False)
class RingColumns:
    """Rings as columns; effective values are the published ones where the table has them.

    Attributes
    ----------
    outer, inner, height : ndarray
        Dimensions of one ring [m].
    length, area, volume : ndarray
        Effective values of one ring [m], [m2], [m3].
    """

    outer: Floats
    inner: Floats
    height: Floats
    length: Floats
    area: Floats
    volume: Floats


@dataclass(frozen=True, kw_only=True, eq=False)
class MaterialColumns:
    """Materials as columns; what a material lacks is NaN, except the bias law.

    Attributes
    ----------
    permeability : ndarray
        Initial permeability [1].
    half_field, exponent : ndarray
        Bias law [A/m], [1]; where the table has none, a collapse at saturation for ferrite, else constant
        permeability.
    field_limit : ndarray
        Field up to which the law holds [A/m]; infinite where there is none.
    loss : ndarray, shape (4, n)
        Coefficients of the three-term loss, as printed.
    saturation : ndarray
        Saturation flux density, hot where known [T].
    """

    permeability: Floats
    half_field: Floats
    exponent: Floats
    field_limit: Floats
    loss: Floats
    saturation: Floats


@dataclass(frozen=True, kw_only=True, eq=False)
class WireColumns:
    """Wires as columns.

    Attributes
    ----------
    conductor, overall : ndarray
        Diameter of the copper and with enamel of grade 1 [m].
    """

    conductor: Floats
    overall: Floats


@dataclass(frozen=True, kw_only=True, eq=False)
class ChokeColumns:
    """All that windings are made from; candidates point into it with indices.

    Attributes
    ----------
    rings, materials, wires : tuple
        The parts in the order of the columns.
    ring, material, wire : RingColumns, MaterialColumns, WireColumns
        Their numbers.
    factor : ndarray, shape (rings, materials)
        Inductance factor of one ring: published, else by formula [H].
    published : ndarray of bool, shape (rings, materials)
        Whether a publication has the inductance factor, so that the pair is known to be sold.
    """

    rings: tuple[Ring, ...]
    materials: tuple[Material, ...]
    wires: tuple[Wire, ...]
    ring: RingColumns
    material: MaterialColumns
    wire: WireColumns
    factor: Floats
    published: NDArray[np.bool_]

    @cached_property
    def layers(self) -> LayerTable:
        """How every wire lies on every ring; row ``ring * number of wires + wire``."""
        outer, inner, overall = np.broadcast_arrays(
            self.ring.outer[:, None], self.ring.inner[:, None], self.wire.overall[None, :]
        )
        return layer_table(outer.ravel(), inner.ravel(), overall.ravel())


@dataclass(frozen=True, kw_only=True, eq=False)
class Candidates:
    """Windings to judge; arrays that broadcast against each other.

    Attributes
    ----------
    ring, material, wire : ndarray of int
        Indices into a `ChokeColumns`.
    strands, stack, turns : float or ndarray
        Parallel strands, stacked rings, turns; whole numbers [1].
    permeability : float or ndarray
        Factor on the material's initial permeability and inductance factor [1].
    """

    ring: Any
    material: Any
    wire: Any
    strands: Any = 1
    stack: Any = 1
    turns: Any = 1
    permeability: Any = 1.0


@dataclass(frozen=True, kw_only=True, eq=False)
class Duty:
    """What a choke has to do; numbers, or arrays that broadcast against the candidates.

    Attributes
    ----------
    current : float or ndarray
        Mean (bias) current [A].
    ripple : float or ndarray
        Ripple current, peak to peak [A].
    frequency : float or ndarray
        Switching frequency [Hz].
    duty : float or ndarray
        Share of the period in which the current rises [1].
    ambient_c : float or ndarray
        Temperature of the air [degC].
    worst_current : float or ndarray, optional
        Largest current, such as start-up or overload [A]; None: mean plus half the ripple.
    """

    current: Any
    ripple: Any = 0.0
    frequency: Any = 20e3
    duty: Any = 0.5
    ambient_c: Any = 25.0
    worst_current: Any = field(default=None)


def choke_columns(
    tables: Tables,
    rings: Sequence[str] | None = None,
    materials: Sequence[str] | None = None,
    wires: Sequence[str] | None = None,
) -> ChokeColumns:
    """The tables, or the named part of them, as columns.

    Parameters
    ----------
    tables : Tables
        All parts.
    rings, materials, wires : sequence of str, optional
        Names to take; all of the table where omitted.

    Returns
    -------
    ChokeColumns
        Columns in the order of the names.

    Raises
    ------
    UnknownNameError
        One of the names is in no table.
    """
    ring_parts = _parts(tables.rings, rings, tables.ring)
    material_parts = _parts(tables.materials, materials, tables.material)
    wire_parts = _parts(tables.wires, wires, tables.wire)
    ring, material = _ring_columns(ring_parts), _material_columns(material_parts)
    factor, published = _factors(tables, ring_parts, material_parts)
    return ChokeColumns(
        rings=ring_parts,
        materials=material_parts,
        wires=wire_parts,
        ring=ring,
        material=material,
        wire=WireColumns(
            conductor=_column(wire_parts, "conductor_diameter"),
            overall=_column(wire_parts, "outer_diameter_grade1"),
        ),
        factor=factor,
        published=published,
    )


def _parts(known: Mapping[str, Any], names: Sequence[str] | None, find: Any) -> tuple[Any, ...]:
    return tuple(known.values()) if names is None else tuple(find(name) for name in names)


def _column(parts: Sequence[Any], name: str) -> Floats:
    values = (getattr(part, name) for part in parts)
    return np.array([np.nan if value is None else value for value in values], dtype=float)


def _ring_columns(rings: Sequence[Ring]) -> RingColumns:
    outer, inner = _column(rings, "outer_diameter"), _column(rings, "inner_diameter")
    height = _column(rings, "height")
    length, area = _column(rings, "effective_length"), _column(rings, "effective_area")
    volume = _column(rings, "effective_volume")
    known = np.isfinite(length) & np.isfinite(area)
    volume = np.where(np.isfinite(volume), volume, length * area)
    return RingColumns(
        outer=outer,
        inner=inner,
        height=height,
        length=np.where(known, length, effective_length(outer, inner)),
        area=np.where(known, area, effective_area(outer, inner, height)),
        volume=np.where(known, volume, effective_volume(outer, inner, height)),
    )


def _material_columns(materials: Sequence[Material]) -> MaterialColumns:
    half, exponent = _column(materials, "bias_field"), _column(materials, "bias_exponent")
    limit, permeability = _column(materials, "bias_field_limit"), _column(materials, "permeability")
    hot, cold = _column(materials, "saturation_hot"), _column(materials, "saturation")
    saturation = np.where(np.isfinite(hot), hot, cold)
    ferrite = np.isnan(half) & np.array([one.kind == "ferrite" for one in materials], dtype=bool)
    half = np.where(ferrite, saturation / (MU_0 * permeability), half)
    exponent = np.where(ferrite, FERRITE_EXPONENT, exponent)
    lawful = np.isfinite(half) & np.isfinite(exponent)
    return MaterialColumns(
        permeability=permeability,
        half_field=np.where(lawful, half, NO_BIAS_FIELD),
        exponent=np.where(lawful, exponent, NO_BIAS_EXPONENT),
        field_limit=np.where(np.isfinite(limit), limit, np.inf),
        loss=np.stack([_column(materials, f"loss_{letter}") for letter in "abcd"]),
        saturation=saturation,
    )


def _factors(
    tables: Tables, rings: Sequence[Ring], materials: Sequence[Material]
) -> tuple[Floats, NDArray[np.bool_]]:
    factor = np.empty((len(rings), len(materials)))
    published = np.zeros(factor.shape, dtype=bool)
    for row, ring in enumerate(rings):
        c1 = core_constant_c1(ring.outer_diameter, ring.inner_diameter, ring.height)
        for column, material in enumerate(materials):
            known = tables.inductance_factor(ring.name, material.name)
            published[row, column] = known is not None
            factor[row, column] = inductance_factor(material.permeability, c1) if known is None else known.al
    return factor, published
