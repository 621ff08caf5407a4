"""The tables of a design file, one frozen dataclass each.

A key that is None is absent from the file: a part name completes it, or the effect it stands for is left out.
All values SI, temperatures in degC.
"""

from __future__ import annotations

from dataclasses import dataclass, field

from buckdesign.design.keys import ChoicesKey, PairKey, QuantityKey
from buckdesign.design.schema import REQUIRED, count, listed, part, quantity, table, temperature

DEVICES = ("transistor", "regulator", "rectifier")
"""The parts that sit on a heat sink."""


@dataclass(frozen=True, kw_only=True)
class DesignSupply:
    """The source at the operating point.

    Attributes
    ----------
    voltage : float
        [V].
    resistance, inductance : float
        Of source and leads [ohm], [H]; 0 where not given.
    rise_time : float
        From nothing to full voltage at switch-on [s]; 0 where not given.
    ripple : float
        Peak to peak [V]; 0 where not given.
    ripple_frequency : float or None
        [Hz].
    """

    voltage: float = quantity("V", default=REQUIRED)
    resistance: float = quantity("ohm", default=0.0, above=False)
    inductance: float = quantity("H", default=0.0, above=False)
    rise_time: float = quantity("s", default=0.0, above=False)
    ripple: float = quantity("V", default=0.0, above=False)
    ripple_frequency: float | None = quantity("Hz")


@dataclass(frozen=True, kw_only=True)
class DesignOutput:
    """The output at the operating point.

    Attributes
    ----------
    voltage : float
        Nominal, for checks; the divider rules [V].
    current : float or None
        Constant-current part of the load [A].
    resistance : float or None
        Resistive part of the load [ohm]; at least one of the two is given.
    tolerance : float or None
        Of the mean output [1].
    """

    voltage: float = quantity("V", default=REQUIRED)
    current: float | None = quantity("A", above=False)
    resistance: float | None = quantity("ohm")
    tolerance: float | None = quantity("%", below=1.0)

    @property
    def load(self) -> float:
        """Load current at the nominal voltage [A]."""
        resistive = 0.0 if self.resistance is None else self.voltage / self.resistance
        return (self.current or 0.0) + resistive


@dataclass(frozen=True, kw_only=True)
class RegulatorSection:
    """The three-terminal regulator.

    Attributes
    ----------
    part : str or None
        Name in the table.
    reference, adjust_current : float or None
        [V], [A].
    quiescent_current : float or None
        Leaves at the output [A].
    output_inductance, output_resistance : float or None
        Output impedance at unity gain [H], [ohm].
    current_limit, current_limit_knee : float or None
        [A]; constant up to the knee [V].
    current_limit_far : tuple of float or None
        Limit [A] at a large difference [V].
    dropout, dropout_resistance : float or None
        [V], [ohm].
    max_difference : float or None
        Largest input-output difference [V].
    junction_case, junction_limit : float or None
        [K/W], [degC].
    """

    part: str | None = part("regulator")
    reference: float | None = quantity("V")
    adjust_current: float | None = quantity("A", above=False)
    quiescent_current: float | None = quantity("A", above=False)
    output_inductance: float | None = quantity("H")
    output_resistance: float | None = quantity("ohm", above=False)
    current_limit: float | None = quantity("A")
    current_limit_knee: float | None = quantity("V")
    current_limit_far: tuple[float, float] | None = listed(
        PairKey(
            first=QuantityKey(unit="A", above=False),
            second=QuantityKey(unit="V"),
            example='["0.4 A", "40 V"]',
        )
    )
    dropout: float | None = quantity("V", above=False)
    dropout_resistance: float | None = quantity("ohm", above=False)
    max_difference: float | None = quantity("V")
    junction_case: float | None = quantity("K/W")
    junction_limit: float | None = temperature()


@dataclass(frozen=True, kw_only=True)
class Network:
    """The resistors round the regulator.

    Attributes
    ----------
    r1, r2 : float
        Output to adjust pin, adjust pin to ground [ohm].
    rh, ch : float, float or None
        Feedback from the switch node [ohm], [F]; without `ch` it is coupled directly.
    rbe, rdrive : float
        Base to emitter, base to regulator input [ohm].
    rdrive_power, rbe_power : float or None
        Ratings [W].
    """

    r1: float = quantity("ohm", default=REQUIRED)
    r2: float = quantity("ohm", default=REQUIRED)
    rh: float = quantity("ohm", default=REQUIRED)
    ch: float | None = quantity("F")
    rbe: float = quantity("ohm", default=REQUIRED)
    rdrive: float = quantity("ohm", default=REQUIRED)
    rdrive_power: float | None = quantity("W")
    rbe_power: float | None = quantity("W")


@dataclass(frozen=True, kw_only=True)
class TransistorSection:
    """The external PNP transistor.

    Attributes
    ----------
    part : str or None
        Name in the table.
    gain, gain_knee : float or None
        At small current [1]; current at which it has halved [A].
    charge_time : float or None
        Charge lifetime [s].
    base_emitter : float or None
        [V].
    saturation_voltage, saturation_resistance : float or None
        [V], [ohm].
    collector_voltage, collector_current : float or None
        Ratings [V], [A].
    junction_case, junction_limit : float or None
        [K/W], [degC].
    """

    part: str | None = part("transistor")
    gain: float | None = quantity("1")
    gain_knee: float | None = quantity("A")
    charge_time: float | None = quantity("s")
    base_emitter: float | None = quantity("V")
    saturation_voltage: float | None = quantity("V", above=False)
    saturation_resistance: float | None = quantity("ohm", above=False)
    collector_voltage: float | None = quantity("V")
    collector_current: float | None = quantity("A")
    junction_case: float | None = quantity("K/W")
    junction_limit: float | None = temperature()


@dataclass(frozen=True, kw_only=True)
class RectifierSection:
    """The freewheel rectifier; values are those of one piece.

    Attributes
    ----------
    part : str or None
        Name in the table.
    parallel : int
        Pieces in parallel.
    threshold, slope : float or None
        Forward drop [V], [ohm].
    recovery_charge : float or None
        [C].
    leakage, leakage_at : float or None
        Reverse current [A] at a junction temperature [degC].
    capacitance : float or None
        [F].
    reverse_voltage, average_current : float or None
        Ratings [V], [A].
    junction_case, junction_limit : float or None
        [K/W], [degC].
    """

    part: str | None = part("rectifier")
    parallel: int = count(default=1)
    threshold: float | None = quantity("V", above=False)
    slope: float | None = quantity("ohm", above=False)
    recovery_charge: float | None = quantity("C", above=False)
    leakage: float | None = quantity("A", above=False)
    leakage_at: float | None = temperature()
    capacitance: float | None = quantity("F", above=False)
    reverse_voltage: float | None = quantity("V")
    average_current: float | None = quantity("A")
    junction_case: float | None = quantity("K/W")
    junction_limit: float | None = temperature()


@dataclass(frozen=True, kw_only=True)
class ChokeSection:
    """The choke: a winding on a ring, or a bought part.

    Attributes
    ----------
    core, material : str or None
        Names of ring and material.
    permeability : float
        Factor on the table's initial permeability [1].
    stack : int
        Rings on top of each other.
    turns : int or None
        Turns.
    wire : str or None
        Name of the wire.
    strands : int
        Wires in parallel.
    inductance, resistance, saturation : float or None
        Of a bought part [H], [ohm]; current at 70 % of the inductance [A].
    """

    core: str | None = part("ring")
    material: str | None = part("material")
    permeability: float = quantity("1", default=1.0)
    stack: int = count(default=1)
    turns: int | None = count()
    wire: str | None = part("wire")
    strands: int = count(default=1)
    inductance: float | None = quantity("H")
    resistance: float | None = quantity("ohm", above=False)
    saturation: float | None = quantity("A")

    @property
    def is_winding(self) -> bool:
        """Whether it is wound on a ring rather than bought."""
        return self.core is not None


@dataclass(frozen=True, kw_only=True)
class CapacitorSection:
    """An electrolytic capacitor.

    Attributes
    ----------
    part : str or None
        Name in the table.
    capacitance, esr : float or None
        [F], [ohm].
    rated_voltage : float or None
        [V].
    ripple_current : float or None
        Rating, rms [A].
    life : float or None
        At rated temperature [h].
    """

    part: str | None = part("capacitor")
    capacitance: float | None = quantity("F")
    esr: float | None = quantity("ohm", above=False)
    rated_voltage: float | None = quantity("V")
    ripple_current: float | None = quantity("A")
    life: float | None = quantity("h")


@dataclass(frozen=True, kw_only=True)
class DeviceThermal:
    """The way of one device's heat to the air.

    Attributes
    ----------
    heatsink, pad : float or None
        Own heat sink and insulating pad [K/W].
    """

    heatsink: float | None = quantity("K/W")
    pad: float | None = quantity("K/W", above=False)


@dataclass(frozen=True, kw_only=True)
class ThermalSection:
    """Ambient and heat sinks.

    Attributes
    ----------
    ambient : float
        [degC].
    heatsink : float or None
        Shared heat sink [K/W].
    on_heatsink : tuple of str or None
        Who sits on it.
    pad : float or None
        Pad of each device that has none of its own [K/W].
    transistor, regulator, rectifier : DeviceThermal or None
        What is different for one device.
    """

    ambient: float = temperature(default=25.0)
    heatsink: float | None = quantity("K/W")
    on_heatsink: tuple[str, ...] | None = listed(ChoicesKey(words=DEVICES))
    pad: float | None = quantity("K/W", above=False)
    transistor: DeviceThermal | None = field(default=None, metadata=table(DeviceThermal))
    regulator: DeviceThermal | None = field(default=None, metadata=table(DeviceThermal))
    rectifier: DeviceThermal | None = field(default=None, metadata=table(DeviceThermal))
