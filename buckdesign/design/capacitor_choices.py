"""Capacitors chosen by rated voltage, life and ripple current."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from buckdesign.design.checks import LIFE_WANTED
from buckdesign.design.choices import VOLTAGE_MARGIN, highest_supply
from buckdesign.design.requirement import Requirement
from buckdesign.parts import Capacitor, Tables
from buckdesign.physics.capacitor import electrolytic_life

CAPACITOR_MARGIN = 1.5
"""Rated over applied voltage of the output capacitor [1] (common practice)."""

RIPPLE_MARGIN = 1.1
"""Rated over applied ripple current [1] (common practice)."""

OWN_RISE = 5.0
"""Rise of an electrolytic by its ripple current at the rating [K] (the physics of its life assumes the
same)."""


def capacitor_voltage_class(candidates: Iterable[Capacitor], wanted: float) -> float | None:
    """Smallest rated voltage on offer that is not below the wanted one [V]; None: there is none."""
    return min((one.rated_voltage for one in candidates if one.rated_voltage >= wanted - 1e-9), default=None)


def output_capacitors(requirement: Requirement, tables: Tables) -> tuple[Capacitor, ...]:
    """Output capacitors to try: of the smallest rated voltage that leaves the margin, or those named.

    Returns
    -------
    tuple of Capacitor
        By equivalent series resistance, rising; empty: none is rated for the output.
    """
    output = requirement.output.voltage
    if requirement.prefer.output_capacitor:
        named = [tables.capacitor(name) for name in requirement.prefer.output_capacitor]
        return tuple(one for one in named if one.rated_voltage >= output)
    usual = [one for one in tables.capacitors.values() if one.kind != "tantalum"]
    usual = _lasting(usual, requirement.limits.ambient_high)
    for margin in (CAPACITOR_MARGIN, 1.2, 1.0):
        rating = capacitor_voltage_class(usual, margin * output)
        if rating is not None:
            same = [one for one in usual if one.rated_voltage == rating]
            return tuple(sorted(same, key=lambda one: one.esr))
    return ()


def _lasting(capacitors: Sequence[Capacitor], ambient_c: float) -> list[Capacitor]:
    """Those that live long enough at the highest ambient and their own heat; all where none does."""
    found = []
    for one in capacitors:
        if one.life is None or one.life_temperature_c is None:
            continue
        if electrolytic_life(one.life, one.life_temperature_c, ambient_c + OWN_RISE) >= LIFE_WANTED:
            found.append(one)
    return found or list(capacitors)


@dataclass(frozen=True, kw_only=True)
class InputCapacitor:
    """The input capacitor.

    Attributes
    ----------
    part : Capacitor
        One piece.
    parallel : int
        Pieces.
    """

    part: Capacitor
    parallel: int = 1


def input_capacitor(requirement: Requirement, tables: Tables, ripple_rms: float) -> InputCapacitor | None:
    """The smallest input capacitor that carries the stage's ripple current.

    Parameters
    ----------
    requirement : Requirement
        Supply.
    tables : Tables
        Parts.
    ripple_rms : float
        Ripple current [A].

    Returns
    -------
    InputCapacitor or None
        Several pieces where one is too small; None: none is rated for the supply.
    """
    supply = highest_supply(requirement)
    named = requirement.prefer.input_capacitor
    if named:
        known = [tables.capacitor(name) for name in named]
        usable = [one for one in known if one.rated_voltage >= supply]
    else:
        known = [one for one in tables.capacitors.values() if one.kind == "low-impedance electrolytic"]
        known = _lasting(known, requirement.limits.ambient_high)
        rating = capacitor_voltage_class(known, VOLTAGE_MARGIN * supply)
        rating = capacitor_voltage_class(known, supply) if rating is None else rating
        usable = [one for one in known if one.rated_voltage == rating and one.capacitance >= 99e-6]
    if not usable:
        return None
    return _fewest(usable, RIPPLE_MARGIN * ripple_rms)


def _fewest(usable: Sequence[Capacitor], wanted: float) -> InputCapacitor:
    for pieces in range(1, 5):
        able = [one for one in usable if (one.ripple_current or 0.0) * pieces >= wanted]
        if able:
            return InputCapacitor(part=min(able, key=lambda one: one.capacitance), parallel=pieces)
    return InputCapacitor(part=max(usable, key=lambda one: one.ripple_current or 0.0), parallel=4)
