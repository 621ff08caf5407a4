"""The parts: frozen dataclasses, SI units, temperatures in degC with names that end in ``_c``.

An absent value is None (an absent text is empty). Every part says in `source` where its values come from
and in `how` whether they were looked up, recalled (``from memory``), ``derived`` or typical of a class.
"""

from __future__ import annotations

from dataclasses import dataclass

from buckdesign.parts.fields import Sign, quantity, text


@dataclass(frozen=True, kw_only=True)
class Regulator:
    """A three-terminal adjustable regulator, by class.

    Attributes
    ----------
    name, package : str
        ``adjustable 1.5 A``; case the thermal resistances belong to.
    rated_current : float
        Output current of the class [A].
    reference_min, reference, reference_max : float
        Voltage between output and adjust pin: guaranteed least, typical, guaranteed largest [V].
    adjust_current, adjust_current_max : float
        Adjust-pin current, typical and largest [A].
    quiescent_current, quiescent_current_max : float
        Smallest load current, typical and largest [A]; it always leaves at the output.
    current_limit, current_limit_min : float
        Current limit up to the knee, typical and guaranteed [A].
    current_limit_knee : float
        Input-output difference up to which the limit is constant [V].
    current_limit_far, current_limit_far_min, current_limit_far_voltage : float
        Typical and guaranteed limit [A] at the far difference [V].
    dropout, dropout_resistance : float
        Smallest input-output difference: threshold [V] and slope [ohm], typical.
    output_inductance, output_inductance_factor, output_resistance : float
        Output impedance at unity gain [H], [ohm]; the inductance lies within the factor [1] either way.
    max_difference : float
        Largest input-output difference [V].
    junction_case, junction_ambient : float
        Thermal resistances [K/W].
    junction_limit_c : float
        Highest junction temperature [degC].
    source, how : str
        Origin and certainty.
    """

    name: str = text(required=True)
    rated_current: float = quantity("A", required=True)
    reference_min: float = quantity("V", required=True)
    reference: float = quantity("V", required=True)
    reference_max: float = quantity("V", required=True)
    adjust_current: float = quantity("A", required=True)
    adjust_current_max: float = quantity("A", required=True)
    quiescent_current: float = quantity("A", required=True)
    quiescent_current_max: float | None = quantity("A")
    current_limit: float = quantity("A", required=True)
    current_limit_min: float | None = quantity("A")
    current_limit_knee: float | None = quantity("V")
    current_limit_far: float | None = quantity("A")
    current_limit_far_min: float | None = quantity("A")
    current_limit_far_voltage: float | None = quantity("V")
    dropout: float = quantity("V", required=True)
    dropout_resistance: float = quantity("ohm", required=True, sign=Sign.NOT_NEGATIVE)
    output_inductance: float = quantity("H", required=True)
    output_inductance_factor: float | None = quantity("1")
    output_resistance: float = quantity("ohm", required=True)
    max_difference: float = quantity("V", required=True)
    junction_case: float | None = quantity("K/W")
    junction_ambient: float | None = quantity("K/W")
    junction_limit_c: float | None = quantity("degC")
    package: str = text()
    source: str = text(required=True)
    how: str = text(required=True)


@dataclass(frozen=True, kw_only=True)
class Transistor:
    """A PNP power transistor.

    Attributes
    ----------
    name, package : str
        Registered type number; case.
    polarity : str
        ``PNP``.
    collector_voltage, collector_current : float
        Rated collector-emitter voltage with open base [V] and continuous collector current [A].
    gain_1, gain_1_current, ..., gain_4, gain_4_current : float
        Guaranteed least current gain [1] at a collector current [A], currents rising.
    saturation_voltage_max, saturation_current, saturation_base_current : float
        Largest saturation voltage [V] at collector and base current [A].
    base_emitter_max : float
        Largest base-emitter voltage at `saturation_current` [V].
    transition_frequency_min : float
        Guaranteed transition frequency [Hz].
    rise_time, storage_time, fall_time : float
        Largest switching times [s].
    switching_current, switching_base_current : float
        Collector current and equal on and off base currents at which they hold [A].
    leakage_hot, leakage_hot_c : float
        Largest collector leakage [A] at a junction temperature [degC].
    breakdown_voltage, breakdown_current : float
        A point of the second-breakdown limit for direct current, case at 25 degC [V], [A].
    breakdown_far_voltage, breakdown_far_current : float
        A second one at a higher voltage [V], [A].
    pulse_voltage, pulse_current, pulse_duration : float
        A point of the safe area for a single pulse of that length, case at 25 degC [V], [A], [s].
    safe_area_how : str
        Origin and certainty of these points.
    junction_case : float
        Thermal resistance [K/W].
    junction_limit_c : float
        Highest junction temperature [degC].
    source, how : str
        Origin and certainty.
    """

    name: str = text(required=True)
    polarity: str = text("PNP", required=True)
    collector_voltage: float = quantity("V", required=True)
    collector_current: float = quantity("A", required=True)
    gain_1: float = quantity("1", required=True)
    gain_1_current: float = quantity("A", required=True)
    gain_2: float | None = quantity("1")
    gain_2_current: float | None = quantity("A")
    gain_3: float | None = quantity("1")
    gain_3_current: float | None = quantity("A")
    gain_4: float | None = quantity("1")
    gain_4_current: float | None = quantity("A")
    saturation_voltage_max: float = quantity("V", required=True)
    saturation_current: float = quantity("A", required=True)
    saturation_base_current: float | None = quantity("A")
    base_emitter_max: float | None = quantity("V")
    transition_frequency_min: float | None = quantity("Hz")
    rise_time: float | None = quantity("s")
    storage_time: float | None = quantity("s")
    fall_time: float | None = quantity("s")
    switching_current: float | None = quantity("A")
    switching_base_current: float | None = quantity("A")
    leakage_hot: float | None = quantity("A")
    leakage_hot_c: float | None = quantity("degC")
    breakdown_voltage: float | None = quantity("V")
    breakdown_current: float | None = quantity("A")
    breakdown_far_voltage: float | None = quantity("V")
    breakdown_far_current: float | None = quantity("A")
    pulse_voltage: float | None = quantity("V")
    pulse_current: float | None = quantity("A")
    pulse_duration: float | None = quantity("s")
    safe_area_how: str = text()
    junction_case: float = quantity("K/W", required=True)
    junction_limit_c: float = quantity("degC", required=True)
    package: str = text()
    source: str = text(required=True)
    how: str = text(required=True)

    @property
    def gain_points(self) -> tuple[tuple[float, float], ...]:
        """Collector current [A] and guaranteed gain [1], currents rising."""
        pairs = (
            (self.gain_1_current, self.gain_1),
            (self.gain_2_current, self.gain_2),
            (self.gain_3_current, self.gain_3),
            (self.gain_4_current, self.gain_4),
        )
        return tuple((current, gain) for current, gain in pairs if current is not None and gain is not None)


@dataclass(frozen=True, kw_only=True)
class Rectifier:
    """A rectifier diode.

    Attributes
    ----------
    name, mounting : str
        Registered type number or class; case.
    kind : str
        ``Schottky``, ``ultrafast``, ``fast`` or ``standard``.
    reverse_voltage, average_current : float
        Repetitive peak reverse voltage [V] and average forward current [A], ratings.
    forward_voltage_1, forward_current_1, forward_voltage_2, forward_current_2 : float
        Forward drop [V] at a current [A], junction at 25 degC, currents rising.
    forward_limit : str
        ``max`` where these are limit values, ``typ`` where typical.
    leakage, leakage_hot : float
        Largest reverse current at 25 degC and at `leakage_hot_c` at rated voltage [A]. Limits: they give no
        law of temperature.
    leakage_hot_c : float
        Temperature of `leakage_hot` [degC].
    leakage_coefficient : float
        Exponent of leakage over temperature [1/K].
    forward_coefficient : float
        Change of the forward drop with temperature near rated current [V/K].
    capacitance : float
        Junction capacitance at 4 V reverse, typical [F].
    recovery_time : float
        Largest reverse recovery time [s].
    recovery_charge, recovery_current : float
        Reverse recovery charge [C] after conducting this current [A]; 0 for Schottky diodes.
    recovery_how : str
        Where the charge comes from.
    junction_ambient, junction_case : float
        Thermal resistance to ambient and to case, stud or lead [K/W].
    junction_limit_c : float
        Highest junction temperature [degC].
    surge_current : float
        Half-sine surge current, 8.3 or 10 ms [A].
    source, how : str
        Origin and certainty.
    """

    name: str = text(required=True)
    kind: str = text("Schottky", "ultrafast", "fast", "standard", required=True)
    reverse_voltage: float = quantity("V", required=True)
    average_current: float = quantity("A", required=True)
    forward_voltage_1: float = quantity("V", required=True)
    forward_current_1: float = quantity("A", required=True)
    forward_voltage_2: float | None = quantity("V")
    forward_current_2: float | None = quantity("A")
    forward_limit: str = text("max", "typ", required=True)
    leakage: float | None = quantity("A")
    leakage_hot: float | None = quantity("A")
    leakage_hot_c: float | None = quantity("degC")
    leakage_coefficient: float | None = quantity("1/K")
    forward_coefficient: float | None = quantity("V/K", sign=Sign.ANY)
    capacitance: float | None = quantity("F")
    recovery_time: float | None = quantity("s")
    recovery_charge: float | None = quantity("C", sign=Sign.NOT_NEGATIVE)
    recovery_current: float | None = quantity("A")
    recovery_how: str = text()
    junction_ambient: float | None = quantity("K/W")
    junction_case: float | None = quantity("K/W")
    junction_limit_c: float = quantity("degC", required=True)
    surge_current: float | None = quantity("A")
    mounting: str = text()
    source: str = text(required=True)
    how: str = text(required=True)


@dataclass(frozen=True, kw_only=True)
class Capacitor:
    """An electrolytic capacitor, by class.

    Attributes
    ----------
    name : str
        ``low-impedance electrolytic 470 uF 25 V``.
    kind : str
        ``low-impedance electrolytic``, ``general-purpose electrolytic``,
        ``polymer electrolytic`` or ``tantalum``.
    capacitance, tolerance : float
        Nominal value [F] and its tolerance [1].
    rated_voltage : float
        [V].
    esr : float
        Equivalent series resistance at 100 kHz, 20 degC [ohm].
    loss_tangent : float
        tan delta at 120 Hz, 20 degC [1].
    ripple_current : float
        Rated ripple current at 100 kHz and `life_temperature_c`, rms [A].
    life, life_temperature_c : float
        Rated life [h] at a temperature [degC].
    diameter, length : float
        Can [m].
    source, how : str
        Origin and certainty.
    """

    name: str = text(required=True)
    kind: str = text(
        "low-impedance electrolytic",
        "general-purpose electrolytic",
        "polymer electrolytic",
        "tantalum",
        required=True,
    )
    capacitance: float = quantity("F", required=True)
    tolerance: float | None = quantity("%")
    rated_voltage: float = quantity("V", required=True)
    esr: float = quantity("ohm", required=True)
    loss_tangent: float | None = quantity("1")
    ripple_current: float | None = quantity("A")
    life: float | None = quantity("h")
    life_temperature_c: float | None = quantity("degC")
    diameter: float | None = quantity("m")
    length: float | None = quantity("m")
    source: str = text(required=True)
    how: str = text(required=True)


@dataclass(frozen=True, kw_only=True)
class Wire:
    """Round enamelled copper wire.

    Attributes
    ----------
    name, series : str
        ``1.0 mm`` or ``AWG 18``; ``metric`` or ``AWG``.
    conductor_diameter, conductor_tolerance : float
        Bare wire [m], plus or minus [m].
    outer_diameter_grade1, outer_diameter_grade2 : float
        Largest overall diameter with enamel of grade 1 and grade 2 [m].
    resistance : float
        Resistance by length at 20 degC [ohm/m].
    source, how : str
        Origin and certainty.
    """

    name: str = text(required=True)
    series: str = text("metric", "AWG", required=True)
    conductor_diameter: float = quantity("m", required=True)
    conductor_tolerance: float | None = quantity("m")
    outer_diameter_grade1: float = quantity("m", required=True)
    outer_diameter_grade2: float | None = quantity("m")
    resistance: float = quantity("ohm/m", required=True)
    source: str = text(required=True)
    how: str = text(required=True)
