"""A winding as the bench sees it: every number, and what there is to say about it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, fields
from typing import Any

from buckdesign.design.choke_cautions import Verdict
from buckdesign.design.choke_layers import wires_by_layer
from buckdesign.design.choke_work import ChokeWork, Made

_NEEDS_CURRENT = {
    "inductance_biased_h",
    "field_a_per_m",
    "permeability_fraction",
    "flux_density_t",
    "copper_loss_w",
    "temperature_rise_k",
    "temperature_rise_low_k",
    "saturation_margin",
}
_NEEDS_RIPPLE = {"flux_swing_t", "core_loss_w", "copper_ripple_loss_w"}
_WHOLE = {"turns", "layers", "turns_first_layer", "turns_capacity", "outside_layers"}


@dataclass(frozen=True, kw_only=True)
class WoundChoke:
    """A winding and what it does; attributes are named as in the JSON output, SI units.

    What was not computed is None. `to_dict` gives the keys of the JSON output, which are the attributes up to
    `warnings`; the others are for the winding sheet and for people. Their meaning is that of
    `buckdesign.design.choke_windings.Windings`.

    Attributes
    ----------
    core, material, turns, wire_mm, strands, stack, layers, bore_fill, turns_first_layer, wire_length_m :
        The winding; length of each strand to cut.
    mean_turn_m, resistance_ohm, inductance_h, inductance_biased_h, field_a_per_m, permeability_fraction :
        Electrical values, resistance at 20 degC.
    flux_density_t, flux_swing_t, core_loss_w, copper_loss_w, temperature_rise_k, temperature_rise_low_k :
        At work.
    fits : bool
        All wires pass through the bore.
    warnings : tuple of str
        What to mind, broken limits first.
    faults : tuple of str
        Limits that are broken, apart from turns that do not fit.
    notes : tuple of str
        Where numbers come from.
    work, made :
        What it has to do, what it is made from.
    turns_capacity, turns_by_hand : int
        Turns that the bore holds, and up to which it is wound by hand.
    wires_by_layer, outside_wires : tuple of int
        Wires in each layer at the bore and at the outer diameter.
    copper_kg, volume_m3 : float
        Mass of the copper to cut, cylinder around the wound ring.
    copper_ripple_loss_w, resistance_hot_ohm, saturation_margin : float or None
        Part of the copper loss by the ripple, DC resistance at work, saturation over flux density.
    inductance_factor_h, inductance_tolerance : float
        Inductance factor of one ring [H] and its tolerance as a fraction.
    """

    core: str
    material: str
    turns: int
    wire_mm: float
    strands: int
    stack: int
    layers: int
    bore_fill: float
    turns_first_layer: int
    wire_length_m: float
    mean_turn_m: float
    resistance_ohm: float
    inductance_h: float
    inductance_biased_h: float | None
    field_a_per_m: float | None
    permeability_fraction: float | None
    flux_density_t: float | None
    flux_swing_t: float | None
    core_loss_w: float | None
    copper_loss_w: float | None
    temperature_rise_k: float | None
    temperature_rise_low_k: float | None
    fits: bool
    warnings: tuple[str, ...]
    faults: tuple[str, ...]
    notes: tuple[str, ...]
    work: ChokeWork
    made: Made
    turns_capacity: int
    turns_by_hand: int
    outside_layers: int
    wires_by_layer: tuple[int, ...]
    outside_wires: tuple[int, ...]
    copper_kg: float
    volume_m3: float
    copper_ripple_loss_w: float | None
    resistance_hot_ohm: float | None
    saturation_margin: float | None
    inductance_factor_h: float
    inductance_tolerance: float

    @property
    def holds(self) -> bool:
        """Whether the winding fits and breaks no limit."""
        return self.fits and not self.faults

    @property
    def hottest_c(self) -> float | None:
        """Temperature of the core by the larger rise [degC]."""
        rise = self.temperature_rise_k
        return None if rise is None else self.work.ambient_c + rise

    @property
    def total_loss_w(self) -> float | None:
        """Core and copper loss, as far as they are known [W]."""
        known = [loss for loss in (self.core_loss_w, self.copper_loss_w) if loss is not None]
        return sum(known) if known else None

    def to_dict(self) -> dict[str, Any]:
        """The keys of the JSON output."""
        names = [one.name for one in fields(self)]
        return {name: getattr(self, name) for name in names[: names.index("warnings") + 1]}


def wound_choke(made: Made, numbers: Mapping[str, float], work: ChokeWork, verdict: Verdict) -> WoundChoke:
    """Put together what is known about a winding.

    Parameters
    ----------
    made : Made
        What it is made from.
    numbers : mapping of str to float
        One winding of `buckdesign.design.choke_windings.Windings`.
    work : ChokeWork
        What it has to do; what depends on a value that is not given becomes None.
    verdict : Verdict
        What there is to say.

    Returns
    -------
    WoundChoke
        The winding.
    """
    values = _known(numbers, work)
    ring, wire = made.ring, made.wire
    wires = int(numbers["turns"]) * made.strands
    overall = wire.outer_diameter_grade1
    inside, outside = wires_by_layer(ring.outer_diameter, ring.inner_diameter, overall, wires)
    hot = None
    if values["copper_loss_w"] is not None and work.current:
        hot = (numbers["copper_loss_w"] - numbers["copper_ripple_loss_w"]) / work.current**2
    shown = {one.name: values[one.name] for one in fields(WoundChoke) if one.name in values}
    return WoundChoke(
        **shown,
        core=ring.name,
        material=made.material.name,
        wire_mm=wire.conductor_diameter * 1e3,
        strands=made.strands,
        stack=made.stack,
        warnings=verdict.warnings,
        faults=verdict.faults,
        notes=verdict.notes,
        work=work,
        made=made,
        turns_by_hand=verdict.turns_by_hand,
        wires_by_layer=tuple(inside),
        outside_wires=tuple(outside),
        resistance_hot_ohm=hot,
        inductance_factor_h=verdict.factor,
        inductance_tolerance=verdict.tolerance,
    )


def _known(numbers: Mapping[str, float], work: ChokeWork) -> dict[str, Any]:
    """Whole numbers as such, and None for what is not a number or depends on what is not given."""
    absent = set() if work.current is not None else set(_NEEDS_CURRENT)
    absent |= set() if work.ripple is not None else _NEEDS_RIPPLE
    found: dict[str, Any] = {}
    for name, value in numbers.items():
        if name in absent or not math.isfinite(value):
            found[name] = None
        elif name in _WHOLE:
            found[name] = int(value)
        else:
            found[name] = bool(value) if name == "fits" else value
    return found
