"""From a design file to values: part names completed, single values laid over them.

A value that a design file gives inline goes before the part's. Without a part an absent value stays absent:
its effect is left out.
"""

from __future__ import annotations

import math

from buckdesign.design.design_file import Design
from buckdesign.design.elements import (
    CapacitorElement,
    HeatPath,
    HeatPaths,
    RegulatorElement,
    ResolvedDesign,
)
from buckdesign.design.merging import first_known, picked, table_value, table_value_or_none
from buckdesign.design.resolve_choke import resolve_choke
from buckdesign.design.resolve_semiconductors import resolve_rectifier, resolve_transistor
from buckdesign.design.sections import (
    CapacitorSection,
    DeviceThermal,
    RegulatorSection,
    ThermalSection,
)
from buckdesign.loop.parameters import LoopParameters
from buckdesign.parts import Tables, load_tables


def resolve_design(design: Design, tables: Tables | None = None) -> ResolvedDesign:
    """Put every value of a design in place.

    Parameters
    ----------
    design : Design
        The design.
    tables : Tables, optional
        Parts that it names; the tables of the package where omitted.

    Returns
    -------
    ResolvedDesign
        Typical values for predictions, limits for checks, and what had to be assumed.

    Raises
    ------
    UnknownNameError
        A part is in no table.
    """
    known = load_tables() if tables is None else tables
    assumptions: list[str] = []
    source = design.input_capacitor
    return ResolvedDesign(
        design=design,
        regulator=resolve_regulator(design.regulator, known),
        transistor=resolve_transistor(design.transistor, known, assumptions),
        rectifier=resolve_rectifier(design.rectifier, known, assumptions),
        choke=resolve_choke(design.choke, known, assumptions),
        network=design.network,
        output_capacitor=resolve_capacitor(design.output_capacitor, known),
        input_capacitor=None if source is None else resolve_capacitor(source, known),
        heat=resolve_heat_paths(design.thermal),
        full_load=design.full_load,
        assumptions=tuple(assumptions),
    )


def loop_parameters(
    resolved: ResolvedDesign, supply: float, load_current: float, load_resistance: float = math.inf
) -> LoopParameters:
    """A design at one operating point as the loop model takes it, with typical values at 25 degC.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design.
    supply : float
        Supply voltage [V].
    load_current, load_resistance : float
        Constant-current part [A] and resistive part of the load [ohm]; infinite: none.

    Returns
    -------
    LoopParameters
        One row; several rectifiers in parallel share the current alike.
    """
    regulator, transistor, rectifier = resolved.regulator, resolved.transistor, resolved.rectifier
    network, choke, capacitor = resolved.network, resolved.choke, resolved.output_capacitor
    return LoopParameters(
        supply_voltage=supply,
        r1=network.r1,
        r2=network.r2,
        hysteresis_resistance=network.rh,
        hysteresis_capacitance=first_known(network.ch, 0.0),
        reference=regulator.reference,
        adjust_current=regulator.adjust_current,
        output_inductance=regulator.output_inductance,
        output_resistance=regulator.output_resistance,
        quiescent_current=regulator.quiescent_current,
        current_limit=regulator.current_limit,
        current_limit_knee=regulator.current_limit_knee,
        current_limit_far_voltage=regulator.current_limit_far_voltage,
        current_limit_far=regulator.current_limit_far,
        dropout=regulator.dropout,
        dropout_resistance=regulator.dropout_resistance,
        drive_resistance=network.rdrive,
        base_resistance=network.rbe,
        base_emitter=transistor.base_emitter,
        charge_time=transistor.charge_time,
        gain=transistor.gain,
        gain_knee=transistor.gain_knee,
        saturation_voltage=transistor.saturation_voltage,
        saturation_resistance=transistor.saturation_resistance,
        threshold=rectifier.threshold,
        slope=rectifier.slope / rectifier.parallel,
        recovery_charge=rectifier.recovery_charge * rectifier.parallel,
        inductance=choke.inductance,
        bias_current=choke.bias_current,
        bias_exponent=choke.bias_exponent,
        choke_resistance=choke.resistance,
        capacitance=capacitor.capacitance,
        esr=capacitor.esr,
        load_current=load_current,
        load_resistance=load_resistance,
        full_load=resolved.full_load,
    )


def own_loop_parameters(resolved: ResolvedDesign) -> LoopParameters:
    """`loop_parameters` at the operating point that the design file gives.

    Parameters
    ----------
    resolved : ResolvedDesign
        The design.

    Returns
    -------
    LoopParameters
        One row.
    """
    design = resolved.design
    resistance = math.inf if design.output.resistance is None else design.output.resistance
    return loop_parameters(
        resolved, design.supply.voltage, first_known(design.output.current, 0.0), resistance
    )


def resolve_regulator(section: RegulatorSection, tables: Tables) -> RegulatorElement:
    """The regulator with every value in place.

    Parameters
    ----------
    section : RegulatorSection
        What the file says.
    tables : Tables
        Parts that it names.

    Returns
    -------
    RegulatorElement
        Typical values and limits.

    Raises
    ------
    UnknownNameError
        The part is in no table.
    """
    part = None if section.part is None else tables.regulator(section.part)

    def pick(name: str, fallback: float) -> float:
        return picked(section, part, name, fallback)

    reference, adjust = pick("reference", math.nan), pick("adjust_current", 0.0)
    quiescent, limit = pick("quiescent_current", 0.0), pick("current_limit", math.inf)
    own_inductance = section.output_inductance is not None or part is None
    far, far_voltage = _fold_back(section, part)
    return RegulatorElement(
        name=None if part is None else part.name,
        reference_min=min(reference, table_value(part, "reference_min", reference)),
        reference=reference,
        reference_max=max(reference, table_value(part, "reference_max", reference)),
        adjust_current=adjust,
        adjust_current_max=max(adjust, table_value(part, "adjust_current_max", adjust)),
        quiescent_current=quiescent,
        quiescent_current_max=max(quiescent, table_value(part, "quiescent_current_max", quiescent)),
        output_inductance=pick("output_inductance", math.nan),
        output_inductance_factor=1.0
        if own_inductance
        else table_value(part, "output_inductance_factor", 1.0),
        output_resistance=pick("output_resistance", 0.0),
        current_limit_min=min(limit, table_value(part, "current_limit_min", limit)),
        current_limit=limit,
        current_limit_knee=_knee(section, part),
        current_limit_far_voltage=far_voltage,
        current_limit_far=min(far, limit),
        dropout=pick("dropout", 0.0),
        dropout_resistance=pick("dropout_resistance", 0.0),
        rated_current=None if part is None else part.rated_current,
        max_difference=first_known(section.max_difference, table_value_or_none(part, "max_difference")),
        junction_case=first_known(section.junction_case, table_value_or_none(part, "junction_case")),
        junction_ambient=table_value_or_none(part, "junction_ambient"),
        junction_limit_c=first_known(section.junction_limit, table_value_or_none(part, "junction_limit_c")),
    )


def _has_own_limit(section: RegulatorSection) -> bool:
    """A current limit alone is a constant one, also over a part that folds back."""
    alone = section.current_limit_knee is None and section.current_limit_far is None
    return section.current_limit is not None and alone


def _knee(section: RegulatorSection, part: object) -> float:
    if _has_own_limit(section):
        return math.inf
    return picked(section, part, "current_limit_knee", math.inf)


def _fold_back(section: RegulatorSection, part: object) -> tuple[float, float]:
    if _has_own_limit(section):
        return 0.0, math.inf
    if section.current_limit_far is not None:
        return section.current_limit_far
    far = table_value(part, "current_limit_far", 0.0)
    return far, table_value(part, "current_limit_far_voltage", math.inf)


def resolve_capacitor(section: CapacitorSection, tables: Tables) -> CapacitorElement:
    """A capacitor with every value in place.

    Parameters
    ----------
    section : CapacitorSection
        What the file says.
    tables : Tables
        Parts that it names.

    Returns
    -------
    CapacitorElement
        Without a kind where the file gives the ESR itself.

    Raises
    ------
    UnknownNameError
        The part is in no table.
    """
    part = None if section.part is None else tables.capacitor(section.part)
    volume = None
    if part is not None and part.diameter is not None and part.length is not None:
        volume = math.pi / 4 * part.diameter**2 * part.length
    return CapacitorElement(
        name=None if part is None else part.name,
        kind=None if part is None or section.esr is not None else part.kind,
        capacitance=picked(section, part, "capacitance", math.nan),
        esr=picked(section, part, "esr", math.nan),
        loss_tangent=table_value_or_none(part, "loss_tangent"),
        rated_voltage=first_known(section.rated_voltage, table_value_or_none(part, "rated_voltage")),
        ripple_current=first_known(section.ripple_current, table_value_or_none(part, "ripple_current")),
        life=first_known(section.life, table_value_or_none(part, "life")),
        life_temperature_c=table_value_or_none(part, "life_temperature_c"),
        volume=volume,
    )


def resolve_heat_paths(thermal: ThermalSection) -> HeatPaths:
    """The ways of the heat.

    Parameters
    ----------
    thermal : ThermalSection
        What the file says.

    Returns
    -------
    HeatPaths
        Of the three devices.
    """
    return HeatPaths(
        ambient_c=thermal.ambient,
        shared_heatsink=thermal.heatsink,
        transistor=_heat_path("transistor", thermal.transistor, thermal),
        regulator=_heat_path("regulator", thermal.regulator, thermal),
        rectifier=_heat_path("rectifier", thermal.rectifier, thermal),
    )


def _heat_path(name: str, own: DeviceThermal | None, thermal: ThermalSection) -> HeatPath:
    pad = thermal.pad if own is None or own.pad is None else own.pad
    return HeatPath(
        pad=first_known(pad, 0.0),
        heatsink=None if own is None else own.heatsink,
        is_shared=name in first_known(thermal.on_heatsink, ()),
    )
