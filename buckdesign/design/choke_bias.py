"""Inductance of a winding against direct current, by the table's bias law or refitted to own readings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.bias_fit import BiasFit, BiasLaw, fit_bias, fit_warnings, fitted_material
from buckdesign.design.bias_points import BiasPoint
from buckdesign.design.choke_work import MOST_TURNS, check_positive
from buckdesign.errors import InputError
from buckdesign.parts import Material, Ring, Tables
from buckdesign.physics.bias import ring_inductance_fraction
from buckdesign.physics.ring import core_constant_c1, effective_length, inductance_factor
from buckdesign.physics.unknown_core import FORMULA_TOLERANCE, MATERIAL_TOLERANCE

Floats = NDArray[np.float64]

CURVE_POINTS = 81
"""Rows of a curve."""

_DEEPEST_FRACTION = 0.2


@dataclass(frozen=True, kw_only=True, eq=False)
class BiasCurve:
    """Inductance against direct current with its uncertainty.

    Attributes
    ----------
    core, material : str
        Names.
    turns, stack : int
        Winding.
    current_a, inductance_h, inductance_low_h, inductance_high_h : ndarray
        The curve and its band [A], [H].
    field_a_per_m : ndarray
        Field on the effective length [A/m].
    law : BiasLaw
        In use.
    fit : BiasFit or None
        Where own readings were given.
    points : tuple of BiasPoint
        Own readings.
    band : str
        What the band means.
    warnings : tuple of str
        What to mind.
    fitted_material : Material or None
        The material with the refitted law.
    """

    core: str
    material: str
    turns: int
    stack: int
    current_a: Floats
    inductance_h: Floats
    inductance_low_h: Floats
    inductance_high_h: Floats
    field_a_per_m: Floats
    law: BiasLaw
    fit: BiasFit | None
    points: tuple[BiasPoint, ...]
    band: str
    warnings: tuple[str, ...]
    fitted_material: Material | None

    def to_dict(self, stored: Path | None = None) -> dict[str, Any]:
        """The keys of the JSON output; `stored` is the file that the fitted material was written to."""
        columns = ("current_a", "inductance_h", "inductance_low_h", "inductance_high_h", "field_a_per_m")
        values = [getattr(self, name).tolist() for name in columns]
        rows = [dict(zip(columns, row, strict=True)) for row in zip(*values, strict=True)]
        for row in rows:
            row["permeability_fraction"] = row["inductance_h"] / rows[0]["inductance_h"]
        return {
            "core": self.core,
            "material": self.material,
            "turns": self.turns,
            "stack": self.stack,
            "inductance_h": rows[0]["inductance_h"],
            "rows": rows,
            "law": self.law,
            "fit": self.fit,
            "points": [{"current_a": one.current, "inductance_h": one.inductance} for one in self.points],
            "stored_material": None if self.fitted_material is None else self.fitted_material.name,
            "stored_file": stored,
            "warnings": list(self.warnings),
        }


@dataclass(frozen=True, kw_only=True)
class BiasRequest:
    """Which winding.

    Attributes
    ----------
    core, material : str
        Names in the tables.
    turns, stack : int
        Turns and stacked rings.
    permeability : float
        Factor on the material's permeability [1].
    most_current : float, optional
        Last current of the curve [A]; where omitted, the law's limit or a fifth of the inductance left.

    Raises
    ------
    InputError
        A value is not above zero.
    """

    core: str
    material: str
    turns: int
    stack: int = 1
    permeability: float = 1.0
    most_current: float | None = None

    def __post_init__(self) -> None:
        for name in ("turns", "stack"):
            value = getattr(self, name)
            if not (1 <= value <= MOST_TURNS and value == int(value)):
                raise InputError(f"{name} = {value}: a whole number from 1 to {MOST_TURNS} is wanted")
        check_positive("current", self.most_current)
        check_positive("permeability", self.permeability)


def bias_curve(tables: Tables, request: BiasRequest, points: Sequence[BiasPoint] = ()) -> BiasCurve:
    """Inductance against direct current.

    Parameters
    ----------
    tables : Tables
        Rings and materials.
    request : BiasRequest
        The winding.
    points : sequence of BiasPoint
        Own readings on this winding; the law is then refitted to them.

    Returns
    -------
    BiasCurve
        From no current on, with the band of the law: of the table its stated uncertainty, of a fit two
        standard deviations.

    Raises
    ------
    UnknownNameError
        Ring or material is in no table.
    InputError
        Neither the table nor readings give a bias law.
    """
    ring, material = tables.ring(request.core), tables.material(request.material)
    known = tables.inductance_factor(ring.name, material.name)
    factor = _formula_factor(ring, material) if known is None else known.al
    spread = FORMULA_TOLERANCE if known is None else MATERIAL_TOLERANCE
    unbiased = factor * request.permeability * request.stack * request.turns**2
    if points:
        return _fitted_curve(ring, material, request, tuple(points), (unbiased, spread))
    if material.bias_field is None or material.bias_exponent is None:
        remedy = "ungapped ferrite saturates instead" if material.kind == "ferrite" else "give readings"
        raise InputError(f"{material.name}: no law of permeability under bias is known; {remedy}")
    current = _currents(ring, request, material.bias_field, material.bias_exponent, material.bias_field_limit)
    drive, size = request.turns * current, (ring.outer_diameter, ring.inner_diameter)
    middle = ring_inductance_fraction(drive, *size, material.bias_field, material.bias_exponent)
    corners = [ring_inductance_fraction(drive, *size, half, c) for half, c in _corners(material)]
    every = np.stack([np.asarray(one) for one in (middle, *corners)])
    law = BiasLaw(
        half_field_a_per_m=material.bias_field,
        exponent=material.bias_exponent,
        exponent_uncertainty=material.bias_exponent_uncertainty or 0.0,
        origin=material.bias_how or material.source,
    )
    return BiasCurve(
        core=ring.name,
        material=material.name,
        turns=request.turns,
        stack=request.stack,
        current_a=current,
        inductance_h=unbiased * np.asarray(middle),
        inductance_low_h=unbiased * every.min(axis=0),
        inductance_high_h=unbiased * every.max(axis=0),
        field_a_per_m=drive / _length(ring),
        law=law,
        fit=None,
        points=(),
        band="uncertainty of the bias law",
        warnings=tuple(_warnings(ring, material, known is not None, spread, drive[-1])),
        fitted_material=None,
    )


def _formula_factor(ring: Ring, material: Material) -> float:
    c1 = core_constant_c1(ring.outer_diameter, ring.inner_diameter, ring.height)
    return float(inductance_factor(material.permeability, c1))


def _length(ring: Ring) -> float:
    return ring.effective_length or float(effective_length(ring.outer_diameter, ring.inner_diameter))


def _currents(ring: Ring, request: BiasRequest, half: float, exponent: float, limit: float | None) -> Floats:
    most = request.most_current
    if most is None:
        deep = half * (1.0 / _DEEPEST_FRACTION - 1.0) ** (1.0 / exponent)
        most = min(deep, limit or deep) * _length(ring) / request.turns
    return np.linspace(0.0, most, CURVE_POINTS)


def _corners(material: Material) -> list[tuple[float, float]]:
    """Half field and exponent at the edges of what is known: the anchor moved, the law turned about it."""
    assert material.bias_field is not None and material.bias_exponent is not None
    turn = material.bias_exponent_uncertainty or 0.0
    share, field = material.bias_anchor, material.bias_anchor_field
    corners = []
    for exponent in (material.bias_exponent - turn, material.bias_exponent + turn):
        if share is None or field is None:
            corners.append((material.bias_field, exponent))
            continue
        give = material.bias_anchor_uncertainty or 0.0
        for moved in (share - give, share + give):
            inside = min(max(moved, 1e-3), 1.0 - 1e-3)
            corners.append((field * (inside / (1.0 - inside)) ** (1.0 / exponent), exponent))
    return corners


def _warnings(ring: Ring, material: Material, published: bool, spread: float, drive: float) -> list[str]:
    found = [f"the band is that of the bias law; the inductance itself spreads by {spread * 100:.0f} % more"]
    if not published:
        found.append(f"{ring.name} is not known to be sold in {material.name}: inductance by formula")
    limit = material.bias_field_limit
    if limit is not None and drive / _length(ring) > limit * (1.0 + 1e-9):
        found.append(f"the bias law holds up to {limit / 1e3:.3g} kA/m only; beyond it the curve is a guess")
    return found


def _fitted_curve(
    ring: Ring,
    material: Material,
    request: BiasRequest,
    points: tuple[BiasPoint, ...],
    prior: tuple[float, float],
) -> BiasCurve:
    fitted = fit_bias(ring, material, request.turns, request.stack, points, prior)
    reached = max(one.current for one in points)
    current = np.linspace(0.0, max(request.most_current or 0.0, 1.2 * reached), CURVE_POINTS)
    middle, low, high = fitted.curve(current)
    return BiasCurve(
        core=ring.name,
        material=material.name,
        turns=request.turns,
        stack=request.stack,
        current_a=current,
        inductance_h=middle,
        inductance_low_h=low,
        inductance_high_h=high,
        field_a_per_m=request.turns * current / _length(ring),
        law=fitted.law,
        fit=fitted.fit,
        points=points,
        band="two standard deviations of the fit",
        warnings=tuple(fit_warnings(fitted.fit, *prior)),
        fitted_material=fitted_material(ring, material, fitted, reached),
    )
