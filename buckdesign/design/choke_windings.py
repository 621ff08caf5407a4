"""Windings judged by the hundred thousand: what they are, how they lie, what they lose, how warm they get."""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import COPPER_REFERENCE_C
from buckdesign.design.choke_columns import Candidates, ChokeColumns, Duty
from buckdesign.design.choke_heat import CopperGeometry, Heat, copper_losses, settle
from buckdesign.design.choke_layers import Lay, lay_wires
from buckdesign.physics.bias import ring_inductance_fraction
from buckdesign.physics.core_loss import three_term_loss_triangular
from buckdesign.physics.ring import surface
from buckdesign.physics.winding import (
    CUT_LEAD_LENGTH,
    LEAD_LENGTH,
    bore_porosity,
    copper_mass,
    wire_length,
    wound_dimensions,
)
from buckdesign.physics.wire import dc_resistance

Floats = NDArray[np.float64]

_HALF, _WEIGHT = (0.5 * x for x in np.polynomial.legendre.leggauss(10))
_NODES, _WEIGHTS = (0.5 + _HALF) ** 3, 3.0 * (0.5 + _HALF) ** 2 * _WEIGHT
"""Gauss quadrature in the cube root of the current: exact to 3e-4 up to 30 times the half field."""


@dataclass(frozen=True, kw_only=True, eq=False)
class Windings:
    """What windings are and do, one array a quantity, all of one shape.

    Attributes
    ----------
    turns : ndarray
        Turns [1].
    layers, outside_layers : ndarray
        Begun layers at the bore and at the outer diameter [1].
    bore_fill : ndarray
        Share of the bore that the wires take, ``N strands d^2/ID^2`` [1].
    turns_first_layer : ndarray
        Turns that the first layer holds [1].
    turns_capacity : ndarray
        Turns that the bore holds [1].
    wire_length_m : ndarray
        Length of each strand to cut, free ends included [m].
    mean_turn_m : ndarray
        Mean length of a turn, slack included [m].
    resistance_ohm : ndarray
        DC resistance with the leads at 20 degC [ohm].
    inductance_h, inductance_biased_h : ndarray
        Without bias and at the mean current [H].
    field_a_per_m : ndarray
        Field at the mean current on the effective length [A/m].
    permeability_fraction : ndarray
        Share of the inductance that is left at the mean current, integrated over the section [1].
    flux_density_t : ndarray
        Mean over the section, at the mean current plus half the ripple [T].
    flux_swing_t : ndarray
        Swing by the ripple, peak to peak [T].
    core_loss_w, copper_loss_w, copper_ripple_loss_w : ndarray
        Losses at the temperature they lead to; the last is part of the one before [W].
    temperature_rise_k, temperature_rise_low_k : ndarray
        Larger and smaller rise of two methods [K].
    worst_field_a_per_m, worst_flux_density_t : ndarray
        At the worst current [A/m], [T].
    saturation_margin : ndarray
        Saturation over the flux density at the worst current [1].
    volume_m3 : ndarray
        Cylinder around the wound ring [m3].
    copper_kg : ndarray
        Mass of the copper to cut [kg].
    fits : ndarray of bool
        All wires pass through the bore.
    """

    turns: Floats
    layers: Floats
    outside_layers: Floats
    bore_fill: Floats
    turns_first_layer: Floats
    turns_capacity: Floats
    wire_length_m: Floats
    mean_turn_m: Floats
    resistance_ohm: Floats
    inductance_h: Floats
    inductance_biased_h: Floats
    field_a_per_m: Floats
    permeability_fraction: Floats
    flux_density_t: Floats
    flux_swing_t: Floats
    core_loss_w: Floats
    copper_loss_w: Floats
    copper_ripple_loss_w: Floats
    temperature_rise_k: Floats
    temperature_rise_low_k: Floats
    worst_field_a_per_m: Floats
    worst_flux_density_t: Floats
    saturation_margin: Floats
    volume_m3: Floats
    copper_kg: Floats
    fits: NDArray[np.bool_]

    @property
    def total_loss_w(self) -> Floats:
        """Core and copper loss [W]."""
        return self.core_loss_w + self.copper_loss_w

    def take(self, at: Any) -> Windings:
        """Some of the windings.

        Parameters
        ----------
        at : ndarray of int or bool
            Index or mask into the flattened arrays.

        Returns
        -------
        Windings
            One-dimensional arrays.
        """
        return Windings(**{one.name: getattr(self, one.name).ravel()[at] for one in fields(self)})


@dataclass(frozen=True, kw_only=True, eq=False)
class _Core:
    """What does not depend on the wire."""

    inductance: Floats
    biased: Floats
    field: Floats
    flux: Floats
    swing: Floats
    loss: Floats
    worst_field: Floats
    worst_flux: Floats
    margin: Floats


def evaluate_windings(columns: ChokeColumns, candidates: Candidates, duty: Duty) -> Windings:
    """Judge windings: what they are, how they lie, what they lose, how warm they get.

    Parameters
    ----------
    columns : ChokeColumns
        Rings, materials, wires.
    candidates : Candidates
        Windings; its arrays broadcast. Quantities of the core are computed on the shape of ring, material,
        stack and turns alone, so a grid of cores by wires, shapes ``(n, 1)`` and ``(m,)``, is cheaper than
        its ``n m`` candidates in a row.
    duty : Duty
        What they have to do; arrays broadcast against the candidates.

    Returns
    -------
    Windings
        All arrays in the broadcast shape. Core loss is NaN for a material without loss coefficients, and the
        rise then that of the copper loss alone; flux density above saturation is not capped, see
        `saturation_margin`.

    Notes
    -----
    Flux density is the linkage over turns and effective section, with the inductance factor of the table; its
    integral over the current takes ten points.
    """
    shape = np.broadcast_shapes(*(np.shape(getattr(candidates, one.name)) for one in fields(candidates)))
    shape = np.broadcast_shapes(shape, *(np.shape(v) for v in (duty.current, duty.ripple, duty.frequency)))
    shape = np.broadcast_shapes(shape, np.shape(duty.duty), np.shape(duty.ambient_c))
    core = _core(columns, candidates, duty)
    lay = _lay(columns, candidates)
    copper, sizes = _copper(columns, candidates, lay)
    heat = _heat(copper, sizes, core, duty)
    far, _, tall = sizes
    wires = candidates.turns * np.asarray(candidates.strands, dtype=float)
    wire, ring = columns.wire, columns.ring
    length = _length(candidates, lay, CUT_LEAD_LENGTH)
    found = {
        "turns": np.asarray(candidates.turns, dtype=float),
        "layers": lay.layers,
        "outside_layers": lay.outside_layers,
        "bore_fill": wires * np.square(wire.overall[candidates.wire] / ring.inner[candidates.ring]),
        "turns_first_layer": np.floor(lay.first / candidates.strands),
        "turns_capacity": np.floor(lay.capacity / candidates.strands),
        "wire_length_m": length,
        "mean_turn_m": (_length(candidates, lay, 0.0)) / candidates.turns,
        "resistance_ohm": copper.resistance,
        "inductance_h": core.inductance,
        "inductance_biased_h": core.biased,
        "field_a_per_m": core.field,
        "permeability_fraction": core.biased / core.inductance,
        "flux_density_t": core.flux,
        "flux_swing_t": core.swing,
        "core_loss_w": core.loss,
        "copper_loss_w": heat.copper,
        "copper_ripple_loss_w": heat.copper_ripple,
        "temperature_rise_k": heat.rise,
        "temperature_rise_low_k": heat.rise_low,
        "worst_field_a_per_m": core.worst_field,
        "worst_flux_density_t": core.worst_flux,
        "saturation_margin": core.margin,
        "volume_m3": np.pi / 4.0 * far * far * tall,
        "copper_kg": copper_mass(length, wire.conductor[candidates.wire], candidates.strands),
        "fits": lay.fits,
    }
    return Windings(**{name: np.broadcast_to(value, shape) for name, value in found.items()})


def _core(columns: ChokeColumns, candidates: Candidates, duty: Duty) -> _Core:
    ring, material = candidates.ring, candidates.material
    size, stuff = columns.ring, columns.material
    factor = columns.factor[ring, material] * candidates.stack * candidates.permeability
    inductance = factor * np.square(candidates.turns)
    law = size.outer[ring], size.inner[ring], stuff.half_field[material], stuff.exponent[material]
    drive = candidates.turns * np.asarray(duty.current, dtype=float)
    fraction = ring_inductance_fraction(drive, *law)
    area = size.area[ring] * candidates.stack
    peak = duty.current + np.asarray(duty.ripple) / 2.0
    worst = peak if duty.worst_current is None else duty.worst_current
    swing = inductance * fraction * duty.ripple / (candidates.turns * area)
    flux = _mean_fraction(candidates.turns * peak, *law) * factor * candidates.turns * peak / area
    worst_flux = (
        flux
        if duty.worst_current is None
        else _mean_fraction(candidates.turns * worst, *law) * factor * candidates.turns * worst / area
    )
    density = three_term_loss_triangular(
        duty.frequency, np.maximum(swing / 2.0, 1e-12), duty.duty, *stuff.loss[:, material]
    )
    return _Core(
        inductance=inductance,
        biased=inductance * fraction,
        field=drive / size.length[ring],
        flux=flux,
        swing=swing,
        loss=np.where(swing > 0.0, density * size.volume[ring] * candidates.stack, 0.0 * density),
        worst_field=candidates.turns * worst / size.length[ring],
        worst_flux=worst_flux,
        margin=stuff.saturation[material] / np.maximum(worst_flux, 1e-12),
    )


def _mean_fraction(drive: Any, outer: Any, inner: Any, half_field: Any, exponent: Any) -> Floats:
    """Mean of the inductance fraction between no current and the one given."""
    law, total = (outer, inner, half_field, exponent), np.zeros(())
    for node, weight in zip(_NODES, _WEIGHTS, strict=True):
        total = total + weight * ring_inductance_fraction(node * drive, *law)
    return np.asarray(total)


def _lay(columns: ChokeColumns, candidates: Candidates) -> Lay:
    row = np.asarray(candidates.ring) * len(columns.wires) + np.asarray(candidates.wire)
    height = columns.ring.height[candidates.ring] * candidates.stack
    return lay_wires(columns.layers, row, height, candidates.turns * np.asarray(candidates.strands))


def _length(candidates: Candidates, lay: Lay, lead: float) -> Floats:
    return np.asarray(wire_length(candidates.turns, lay.mean_turn, lead=lead))


def _copper(
    columns: ChokeColumns, candidates: Candidates, lay: Lay
) -> tuple[CopperGeometry, tuple[Floats, Floats, Floats]]:
    """Resistance, and outer diameter, bore and height of the wound ring."""
    ring, wire = columns.ring, columns.wire
    conductor, overall = wire.conductor[candidates.wire], wire.overall[candidates.wire]
    near = ring.inner[candidates.ring]
    wires = np.minimum(candidates.turns * np.asarray(candidates.strands), lay.capacity)
    length = _length(candidates, lay, LEAD_LENGTH)
    geometry = CopperGeometry(
        resistance=np.asarray(dc_resistance(length, conductor, candidates.strands, COPPER_REFERENCE_C)),
        conductor=np.asarray(conductor),
        layers=np.maximum(lay.layers, 1.0),
        porosity=np.asarray(bore_porosity(wires, np.maximum(lay.layers, 1.0), conductor, near, overall)),
    )
    far, bore, tall = wound_dimensions(
        ring.outer[candidates.ring],
        near,
        ring.height[candidates.ring] * candidates.stack,
        overall,
        lay.layers,
        lay.outside_layers,
    )
    return geometry, (np.asarray(far), np.asarray(bore), np.asarray(tall))


def _heat(copper: CopperGeometry, sizes: tuple[Floats, Floats, Floats], core: _Core, duty: Duty) -> Heat:
    far, bore, tall = sizes
    current, ripple, frequency, share, ambient = (
        np.asarray(value, dtype=float)
        for value in (duty.current, duty.ripple, duty.frequency, duty.duty, duty.ambient_c)
    )
    losses = copper_losses(copper, current, ripple, frequency, share)
    known = np.nan_to_num(core.loss)
    return settle(losses, known, np.asarray(surface(far, bore, tall)), far, ambient)
