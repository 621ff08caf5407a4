"""The elements of a design with every value in place: part, overrides and the rules between table and loop.

Values without a suffix are typical ones, for predictions; those that end in ``_min``, ``_max`` or ``_limit``
are what a data sheet guarantees, for checks. None: not known. SI, temperatures in degC.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from buckdesign.design.design_file import Design
from buckdesign.design.sections import Network
from buckdesign.parts import Material, Ring, Wire


@dataclass(frozen=True, kw_only=True)
class RegulatorElement:
    """The regulator.

    Attributes
    ----------
    name : str or None
        Part.
    reference_min, reference, reference_max : float
        [V].
    adjust_current, adjust_current_max : float
        [A].
    quiescent_current, quiescent_current_max : float
        [A].
    output_inductance : float
        ``L_o`` [H].
    output_inductance_factor : float
        Uncertainty of it, times or divided by [1]; 1 where a design file gives the value itself.
    output_resistance : float
        ``R_o`` [ohm].
    current_limit_min, current_limit : float
        [A].
    current_limit_knee, current_limit_far_voltage : float
        [V]; infinite: constant limit.
    current_limit_far : float
        [A].
    dropout, dropout_resistance : float
        [V], [ohm].
    rated_current, max_difference : float or None
        [A], [V].
    junction_case, junction_ambient, junction_limit_c : float or None
        [K/W], [K/W], [degC].
    """

    name: str | None
    reference_min: float
    reference: float
    reference_max: float
    adjust_current: float
    adjust_current_max: float
    quiescent_current: float
    quiescent_current_max: float
    output_inductance: float
    output_inductance_factor: float
    output_resistance: float
    current_limit_min: float
    current_limit: float
    current_limit_knee: float
    current_limit_far_voltage: float
    current_limit_far: float
    dropout: float
    dropout_resistance: float
    rated_current: float | None
    max_difference: float | None
    junction_case: float | None
    junction_ambient: float | None
    junction_limit_c: float | None


@dataclass(frozen=True, kw_only=True)
class TransistorElement:
    """The transistor.

    Attributes
    ----------
    name, package : str or None
        Part, its case.
    gain_min, gain : float
        At small collector current, guaranteed and typical [1].
    gain_knee : float
        ``I_K`` [A]; infinite: none.
    charge_time : float
        ``tau`` [s].
    base_emitter, base_emitter_max : float
        [V].
    saturation_voltage, saturation_resistance : float
        Typical [V], [ohm].
    saturation_voltage_limit, saturation_resistance_limit : float
        Through the limit value [V], [ohm].
    saturation_forced_gain : float or None
        Collector over base current at which the saturation voltage holds [1]; None: given as it is.
    leakage, leakage_at_c : float
        Collector leakage [A] at a junction temperature [degC].
    breakdown_voltage, breakdown_current, breakdown_far_voltage, breakdown_far_current : float or None
        Points of the second-breakdown limit [V], [A].
    pulse_voltage, pulse_current, pulse_duration : float or None
        A point of the safe area for one pulse [V], [A], [s].
    collector_voltage, collector_current : float or None
        Ratings [V], [A].
    junction_case, junction_limit_c : float or None
        [K/W], [degC].
    """

    name: str | None
    package: str | None
    gain_min: float
    gain: float
    gain_knee: float
    charge_time: float
    base_emitter: float
    base_emitter_max: float
    saturation_voltage: float
    saturation_resistance: float
    saturation_voltage_limit: float
    saturation_resistance_limit: float
    saturation_forced_gain: float | None
    leakage: float
    leakage_at_c: float
    breakdown_voltage: float | None
    breakdown_current: float | None
    breakdown_far_voltage: float | None
    breakdown_far_current: float | None
    pulse_voltage: float | None
    pulse_current: float | None
    pulse_duration: float | None
    collector_voltage: float | None
    collector_current: float | None
    junction_case: float | None
    junction_limit_c: float | None


@dataclass(frozen=True, kw_only=True)
class RectifierElement:
    """The rectifier; values of one piece.

    Attributes
    ----------
    name, kind : str or None
        Part; ``Schottky``, ``ultrafast``, ``fast`` or ``standard``.
    parallel : int
        Pieces in parallel.
    threshold, slope : float
        Typical forward drop [V], [ohm].
    threshold_limit, slope_limit : float
        Through limit values [V], [ohm].
    forward_coefficient : float
        Change of the forward drop with temperature [V/K].
    recovery_charge : float
        [C].
    recovery_current : float or None
        Forward current it was measured at [A]; None: the charge holds as it is given.
    recovery_time : float or None
        [s].
    leakage, leakage_at_c : float
        Reverse current [A] at a junction temperature [degC].
    leakage_coefficient : float
        Exponent over temperature [1/K].
    capacitance : float
        [F].
    reverse_voltage, average_current : float or None
        Ratings [V], [A].
    junction_case, junction_ambient, junction_limit_c : float or None
        [K/W], [K/W], [degC].
    """

    name: str | None
    kind: str | None
    parallel: int
    threshold: float
    slope: float
    threshold_limit: float
    slope_limit: float
    forward_coefficient: float
    recovery_charge: float
    recovery_current: float | None
    recovery_time: float | None
    leakage: float
    leakage_at_c: float
    leakage_coefficient: float
    capacitance: float
    reverse_voltage: float | None
    average_current: float | None
    junction_case: float | None
    junction_ambient: float | None
    junction_limit_c: float | None


@dataclass(frozen=True, kw_only=True)
class WindingElement:
    """How a choke is wound.

    Attributes
    ----------
    ring, material, wire : Ring, Material, Wire
        Rows of the tables.
    permeability_factor : float
        On the material's initial permeability [1].
    stack, turns, strands : int
        Rings on top of each other, turns, wires in parallel.
    effective_length, effective_area, effective_volume : float
        Of the whole stack [m], [m2], [m3].
    inductance_factor : float
        Inductance by turns squared of the whole stack, with the factor [H].
    factor_is_published : bool
        Whether it comes from a table rather than from the dimensions.
    """

    ring: Ring
    material: Material
    wire: Wire
    permeability_factor: float
    stack: int
    turns: int
    strands: int
    effective_length: float
    effective_area: float
    effective_volume: float
    inductance_factor: float
    factor_is_published: bool


@dataclass(frozen=True, kw_only=True)
class ChokeElement:
    """The choke as the loop sees it.

    Attributes
    ----------
    inductance : float
        Without bias [H].
    bias_current, bias_exponent : float
        ``L(i) = inductance / (1 + (i / bias_current) ** bias_exponent)`` [A], [1]; infinite: constant.
    resistance : float
        At 20 degC [ohm].
    winding : WindingElement or None
        None for a bought choke.
    """

    inductance: float
    bias_current: float
    bias_exponent: float
    resistance: float
    winding: WindingElement | None


@dataclass(frozen=True, kw_only=True)
class CapacitorElement:
    """A capacitor.

    Attributes
    ----------
    name : str or None
        Part.
    kind : str or None
        As in the table; None: capacitance and ESR hold as they are given.
    capacitance, esr : float
        [F], [ohm].
    loss_tangent : float or None
        At 120 Hz [1].
    rated_voltage, ripple_current : float or None
        [V], rms [A].
    life, life_temperature_c : float or None
        [h] at [degC].
    volume : float or None
        Of the can [m3].
    """

    name: str | None
    kind: str | None
    capacitance: float
    esr: float
    loss_tangent: float | None
    rated_voltage: float | None
    ripple_current: float | None
    life: float | None
    life_temperature_c: float | None
    volume: float | None


@dataclass(frozen=True, kw_only=True)
class HeatPath:
    """The way of one device's heat from its case to the air.

    Attributes
    ----------
    pad : float
        Between case and heat sink [K/W]; 0 where none is given.
    heatsink : float or None
        Own heat sink [K/W].
    is_shared : bool
        Whether it sits on the shared heat sink. Neither own nor shared: it stands in free air.
    """

    pad: float
    heatsink: float | None
    is_shared: bool


@dataclass(frozen=True, kw_only=True)
class HeatPaths:
    """Ambient and the ways of all heat.

    Attributes
    ----------
    ambient_c : float
        [degC].
    shared_heatsink : float or None
        [K/W].
    transistor, regulator, rectifier : HeatPath
        By device.
    """

    ambient_c: float
    shared_heatsink: float | None
    transistor: HeatPath
    regulator: HeatPath
    rectifier: HeatPath


@dataclass(frozen=True, kw_only=True)
class ResolvedDesign:
    """A design with every value in place.

    Attributes
    ----------
    design : Design
        What it was made from.
    regulator, transistor, rectifier, choke : dataclass
        The elements.
    network : Network
        The resistors.
    output_capacitor, input_capacitor : CapacitorElement, CapacitorElement or None
        The capacitors.
    heat : HeatPaths
        Ambient and heat sinks.
    full_load : float
        Largest load of the requirement, else that of the operating point [A].
    assumptions : tuple of str
        What was assumed because the tables don't say it, one sentence each.
    """

    design: Design
    regulator: RegulatorElement
    transistor: TransistorElement
    rectifier: RectifierElement
    choke: ChokeElement
    network: Network
    output_capacitor: CapacitorElement
    input_capacitor: CapacitorElement | None
    heat: HeatPaths
    full_load: float
    assumptions: tuple[str, ...] = field(default=())
