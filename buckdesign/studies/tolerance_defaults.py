"""Tolerances that the trade takes where a design file gives none, each with its source.

Where a part's data sheet guarantees limits, they are the band. A value of which the sheet gives only a largest
and a typical one is taken to spread by the same ratio downward.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from buckdesign.design.elements import CapacitorElement, ResolvedDesign
from buckdesign.design.tolerances import Distribution, Tolerance
from buckdesign.parts import Tables
from buckdesign.physics.pnp import TYPICAL_GAIN_RATIO
from buckdesign.studies.unit_designs import value_of

UNIFORM, NORMAL, LOGNORMAL = Distribution.UNIFORM, Distribution.NORMAL, Distribution.LOGNORMAL

LEAKAGE_BELOW_LIMIT = 10.0
"""Leakage limit of a rectifier over that of its best unit [1] (common practice: most units leak a third)."""

SPECIFIED_L_O = 1.5
"""Spread of the regulator's output inductance between units of one type, times or divided by, where a design
file gives a value of its own [1] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Default:
    """A tolerance with where it comes from.

    Attributes
    ----------
    key : str
        Dotted key of the design file.
    tolerance : Tolerance
        Band and distribution.
    source : str
        Where it comes from.
    """

    key: str
    tolerance: Tolerance
    source: str


PART_TABLE = "part table"
"""Beginning of the source of a tolerance that a part's row gives."""

_COMMON = "common practice"
_OWN = "own choice"

USUAL: tuple[tuple[str, float, float, Distribution, str], ...] = (
    ("regulator.output_resistance", -0.5, 1.0, LOGNORMAL, f"{_OWN}, factor 2"),
    ("regulator.dropout", -0.15, 0.15, NORMAL, _OWN),
    ("network.r1", -0.01, 0.01, UNIFORM, f"{_COMMON}, metal film"),
    ("network.r2", -0.01, 0.01, UNIFORM, f"{_COMMON}, metal film"),
    ("network.rh", -0.01, 0.01, UNIFORM, f"{_COMMON}, metal film"),
    ("network.ch", -0.05, 0.05, UNIFORM, f"{_COMMON}, film or class 1 ceramic"),
    ("network.rbe", -0.01, 0.01, UNIFORM, f"{_COMMON}, metal film"),
    ("network.rdrive", -0.05, 0.05, UNIFORM, f"{_COMMON}, wirewound"),
    ("transistor.gain_knee", -0.25, 1.0 / 3.0, LOGNORMAL, f"{_OWN}, factor 1.33"),
    ("transistor.charge_time", -1.0 / 3.0, 0.5, LOGNORMAL, f"{_OWN}, factor 1.5"),
    ("transistor.base_emitter", -0.05, 0.05, NORMAL, f"{_COMMON}, about 40 mV"),
    ("rectifier.recovery_charge", -1.0 / 3.0, 0.5, LOGNORMAL, f"{_OWN}, factor 1.5"),
    ("thermal.heatsink", -0.1, 0.1, UNIFORM, f"{_OWN}, mounting and draught"),
    ("thermal.transistor.heatsink", -0.1, 0.1, UNIFORM, f"{_OWN}, mounting and draught"),
    ("thermal.regulator.heatsink", -0.1, 0.1, UNIFORM, f"{_OWN}, mounting and draught"),
    ("thermal.rectifier.heatsink", -0.1, 0.1, UNIFORM, f"{_OWN}, mounting and draught"),
)
"""Key, lowest and highest deviation [1], distribution and source, where it does not depend on the part."""


def default_tolerances(resolved: ResolvedDesign, tables: Tables) -> tuple[Default, ...]:
    """The defaults for the values that a design has.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design.
    tables : Tables
        Parts that it names.

    Returns
    -------
    tuple of Default
        One a value that differs from unit to unit and has an effect in this design.
    """
    usual = (
        Default(key=key, tolerance=Tolerance(low=low, high=high, distribution=kind), source=source)
        for key, low, high, kind, source in USUAL
    )
    found = (
        *_regulator(resolved),
        *_semiconductors(resolved),
        *_choke(resolved),
        *_capacitors(resolved, tables),
    )
    return tuple(one for one in (*usual, *found) if value_of(resolved, one.key) is not None)


def _within_factor(key: str, factor: float, source: str) -> Default:
    """Times or divided by a factor, lognormal."""
    band = Tolerance(low=1.0 / factor - 1.0, high=factor - 1.0, distribution=LOGNORMAL)
    return Default(key=key, tolerance=band, source=source)


def _band(key: str, low: float, high: float, kind: Distribution, source: str) -> Default:
    return Default(key=key, tolerance=Tolerance(low=low, high=high, distribution=kind), source=source)


def _regulator(resolved: ResolvedDesign) -> Iterator[Default]:
    one = resolved.regulator
    sheet = f"data sheet, {one.name}"
    if one.reference_min < one.reference_max:
        low, high = one.reference_min / one.reference - 1.0, one.reference_max / one.reference - 1.0
        yield _band("regulator.reference", low, high, NORMAL, sheet)
    else:
        yield _band("regulator.reference", -0.04, 0.04, NORMAL, f"{_COMMON}, adjustable regulators")
    for name, usual in (("adjust_current", 2.0), ("quiescent_current", 2.0)):
        typical, most = getattr(one, name), getattr(one, f"{name}_max")
        if most > typical > 0.0:
            yield _within_factor(f"regulator.{name}", most / typical, f"{sheet}, max/typical")
        else:
            yield _within_factor(f"regulator.{name}", usual, f"{_COMMON}, factor {usual:g}")
    if one.output_inductance_factor > 1.0:
        factor = one.output_inductance_factor
        yield _within_factor(
            "regulator.output_inductance", factor, f"{PART_TABLE}, {one.name}: factor {factor:g}"
        )
    else:
        text = f"{_OWN}, factor {SPECIFIED_L_O:g}: the value is given"
        yield _within_factor("regulator.output_inductance", SPECIFIED_L_O, text)
    if 0.0 < one.current_limit_min < one.current_limit:
        factor = one.current_limit / one.current_limit_min
        yield _within_factor("regulator.current_limit", factor, f"{sheet}, typical/min")
    else:
        yield _within_factor("regulator.current_limit", 1.3, f"{_COMMON}, factor 1.3")


def _semiconductors(resolved: ResolvedDesign) -> Iterator[Default]:
    transistor, rectifier = resolved.transistor, resolved.rectifier
    if 0.0 < transistor.gain_min < transistor.gain:
        factor = transistor.gain / transistor.gain_min
        yield _within_factor(
            "transistor.gain", factor, f"guaranteed gain, {transistor.name}: factor {factor:.3g}"
        )
    else:
        yield _within_factor(
            "transistor.gain", TYPICAL_GAIN_RATIO, f"{_COMMON}, factor {TYPICAL_GAIN_RATIO:g}"
        )
    for name in ("saturation_voltage", "saturation_resistance"):
        yield _to_limit(f"transistor.{name}", getattr(transistor, name), getattr(transistor, f"{name}_limit"))
    for name in ("threshold", "slope"):
        yield _to_limit(f"rectifier.{name}", getattr(rectifier, name), getattr(rectifier, f"{name}_limit"))
    if rectifier.name is None:
        yield _within_factor("rectifier.leakage", 3.0, f"{_COMMON}, factor 3")
    else:
        low = 1.0 / LEAKAGE_BELOW_LIMIT - 1.0
        yield _band("rectifier.leakage", low, 0.0, LOGNORMAL, f"{_COMMON}, limit to a tenth of it")


def _to_limit(key: str, typical: float, limit: float) -> Default:
    """As far down as the limit is up."""
    if 0.0 < typical < limit:
        share = limit / typical - 1.0
        return _band(key, -share, share, NORMAL, "part's limit over typical, as far downward")
    return _band(key, -0.1, 0.1, NORMAL, _COMMON)


def _choke(resolved: ResolvedDesign) -> Iterator[Default]:
    winding = resolved.choke.winding
    if winding is None:
        yield _band("choke.inductance", -0.2, 0.2, UNIFORM, f"{_COMMON}, bought power chokes")
        yield _band("choke.resistance", -0.1, 0.1, UNIFORM, f"{_COMMON}, bought power chokes")
        yield _band("choke.saturation", -0.15, 0.15, UNIFORM, f"{_OWN}, bought power chokes")
        return
    material = winding.material
    share = 0.1 if material.permeability_tolerance is None else material.permeability_tolerance
    told = _COMMON if material.permeability_tolerance is None else f"material table, {material.name}"
    yield _band("choke.permeability", -share, share, UNIFORM, told)
    yield _band("choke.resistance", -0.05, 0.05, UNIFORM, f"{_OWN}, a winding by hand")


def _capacitors(resolved: ResolvedDesign, tables: Tables) -> Iterator[Default]:
    for side in ("output_capacitor", "input_capacitor"):
        one: CapacitorElement | None = getattr(resolved, side)
        if one is None:
            continue
        part = None if one.name is None else tables.capacitor(one.name)
        own = None if part is None else part.tolerance
        told = f"{_COMMON}, electrolytics" if own is None else PART_TABLE
        share = 0.2 if own is None else own
        yield _band(f"{side}.capacitance", -share, share, UNIFORM, told)
        yield _within_factor(f"{side}.esr", 1.5, f"{_COMMON}, factor 1.5")
