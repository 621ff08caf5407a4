"""Candidate circuits as arrays: what the search varies, and the loop's parameter rows that follow from it.

The choke is not a ring yet but an inductance at full load with the bias law and the copper loss that such
chokes have; the semiconductors are warm.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from enum import Enum

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.choices import Choice
from buckdesign.design.elements import RectifierElement, RegulatorElement, TransistorElement
from buckdesign.design.hot_parameters import WET_KINDS
from buckdesign.design.requirement import Requirement
from buckdesign.design.requirement_checks import CHARGE_TIME_TOP
from buckdesign.design.sizing import DRIVE_MARGIN, LEAST_DRIVE_RESISTANCE, PEAK_OVER_MEAN, upper_resistor
from buckdesign.loop.parameters import COLUMN, COLUMNS
from buckdesign.parts import Capacitor
from buckdesign.physics.capacitor import esr_at_frequency, esr_factor_at_temperature
from buckdesign.physics.pnp import (
    base_current,
    base_emitter_voltage,
    charge_time_at_temperature,
    gain_at_temperature,
)
from buckdesign.physics.regulator import lower_resistor

Floats = NDArray[np.float64]
Indices = NDArray[np.intp]

BIASED_SHARE = 0.7
"""Share of the inductance that is left at full load [1] (common practice for powdered-iron rings)."""

BIAS_EXPONENT = 1.5
"""Exponent of the bias law of powdered iron [1] (the table of materials)."""

COPPER_SHARE = 0.015
"""Copper loss of a choke over output power [1] (common practice)."""

HOTTEST_C = 140.0
"""Hottest junction that the search reckons with [degC] (own choice)."""

OWN_RISE = 2.0
"""Rise of a lightly loaded electrolytic [K] (own choice)."""

USUAL_FREQUENCY = 12e3
"""Rate of the circuit where the requirement has no band [Hz] (typical of the circuit)."""

WARM_RISE = 40.0
"""Junction of the working transistor above the highest ambient [K] (common practice)."""


@dataclass(frozen=True, kw_only=True)
class Drawer:
    """The parts that candidates are made of.

    Attributes
    ----------
    regulator : Choice of RegulatorElement
        The regulator.
    transistors, rectifiers : tuple of Choice
        Semiconductors to choose from.
    capacitors : tuple of Capacitor
        Output capacitors to choose from.
    """

    regulator: Choice[RegulatorElement]
    transistors: tuple[Choice[TransistorElement], ...]
    rectifiers: tuple[Choice[RectifierElement], ...]
    capacitors: tuple[Capacitor, ...]


@dataclass(frozen=True, kw_only=True)
class Trials:
    """Candidates; all arrays of shape (n,).

    Attributes
    ----------
    transistor, rectifier, capacitor : ndarray of int
        Indices into a `Drawer`.
    inductance : ndarray
        At full load [H].
    rh, ch : ndarray
        Hysteresis network [ohm], [F]; capacitance 0: directly coupled.
    rbe : ndarray
        Base-emitter resistor [ohm].
    """

    transistor: Indices
    rectifier: Indices
    capacitor: Indices
    inductance: Floats
    rh: Floats
    ch: Floats
    rbe: Floats

    def __len__(self) -> int:
        return len(self.rh)

    def take(self, at: NDArray[np.intp] | NDArray[np.bool_]) -> Trials:
        """Some of them, by index or mask."""
        return Trials(**{one.name: getattr(self, one.name)[at] for one in fields(self)})

    def with_values(self, **values: Floats | Indices) -> Trials:
        """The same with some values replaced."""
        kept = {one.name: getattr(self, one.name) for one in fields(self)}
        return Trials(**(kept | values))


def joined(parts: Sequence[Trials]) -> Trials:
    """Several lots as one."""
    return Trials(
        **{one.name: np.concatenate([getattr(part, one.name) for part in parts]) for one in fields(Trials)}
    )


def grid(
    *,
    transistor: Sequence[int],
    rectifier: Sequence[int],
    capacitor: Sequence[int],
    inductance: Sequence[float] | Floats,
    network: Sequence[tuple[float, float]],
    rbe: Sequence[float],
) -> Trials:
    """All combinations, `network` a sequence of hysteresis resistance and capacitance."""
    sizes = (len(transistor), len(rectifier), len(capacitor), len(inductance), len(network), len(rbe))
    index = np.indices(sizes).reshape(len(sizes), -1)
    pairs = np.asarray(network, dtype=float)[index[4]]
    return Trials(
        transistor=np.asarray(transistor, dtype=np.intp)[index[0]],
        rectifier=np.asarray(rectifier, dtype=np.intp)[index[1]],
        capacitor=np.asarray(capacitor, dtype=np.intp)[index[2]],
        inductance=np.asarray(inductance, dtype=float)[index[3]],
        rh=pairs[:, 0],
        ch=pairs[:, 1],
        rbe=np.asarray(rbe, dtype=float)[index[5]],
    )


class Climate(Enum):
    """Where in the range of ambients a candidate is simulated."""

    HOT = "hot"
    COLD = "cold"


def working_esr(capacitor: Capacitor, ambient_c: float) -> float:
    """Series resistance of a capacitor in the circuit.

    Parameters
    ----------
    capacitor : Capacitor
        Row of the table.
    ambient_c : float
        [degC].

    Returns
    -------
    float
        At the usual rate of the circuit and the capacitor's temperature [ohm].
    """
    esr = capacitor.esr
    if capacitor.loss_tangent is not None:
        esr = float(esr_at_frequency(esr, capacitor.loss_tangent, capacitor.capacitance, USUAL_FREQUENCY))
    if capacitor.kind not in WET_KINDS:
        return esr
    low, high = esr_factor_at_temperature(ambient_c + OWN_RISE)
    return esr * float(np.sqrt(low * high))


class Bench:
    """Turns trials of one requirement and drawer into parameter rows.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    drawer : Drawer
        The parts.
    """

    def __init__(self, requirement: Requirement, drawer: Drawer) -> None:
        self.requirement = requirement
        self.drawer = drawer
        self.r1 = upper_resistor(requirement, drawer.regulator.element)
        low, high = requirement.limits.ambient
        self._ambient_c = {Climate.HOT: high, Climate.COLD: low}
        self._transistors = {
            climate: [_warm(one.element, min(ambient_c + WARM_RISE, HOTTEST_C)) for one in drawer.transistors]
            for climate, ambient_c in self._ambient_c.items()
        }

    def lower_resistors(self, trials: Trials) -> Floats:
        """Divider to ground, not rounded [ohm], with the pull of a directly coupled feedback resistor."""
        effective = np.where(trials.ch > 0.0, self.r1, 1.0 / (1.0 / self.r1 + 1.0 / trials.rh))
        regulator = self.drawer.regulator.element
        output = self.requirement.output.voltage
        exact = lower_resistor(output, regulator.reference, effective, regulator.adjust_current)
        return np.asarray(exact, dtype=float)

    def drive_resistors(self, trials: Trials) -> Floats:
        """Drive resistor, not rounded [ohm]; below the smallest useful one where headroom is too small."""
        regulator, requirement = self.drawer.regulator.element, self.requirement
        gain_min = self._column("gain_min", trials.transistor)
        knee = self._column("gain_knee", trials.transistor)
        emitter = self._column("base_emitter_max", trials.transistor)
        peak = PEAK_OVER_MEAN * requirement.output.current_max
        needed = np.asarray(base_current(peak, gain_min, knee)) + emitter / trials.rbe
        lowest = requirement.supply.voltage_low - requirement.supply.ripple / 2
        headroom = lowest - emitter - regulator.dropout - requirement.output.voltage
        return headroom / (DRIVE_MARGIN * needed) - regulator.dropout_resistance

    def is_drivable(self, trials: Trials) -> NDArray[np.bool_]:
        """Where the lowest supply leaves enough for the base drive."""
        return self.drive_resistors(trials) >= LEAST_DRIVE_RESISTANCE

    def start_margins(self, trials: Trials) -> Floats:
        """Start margin of directly coupled candidates at the unfavourable end of every band [1].

        Guaranteed gain, largest load, smallest inductance, output inductance and charge lifetime at the top
        of their bands: ``S = beta' L(i) / (R_h G (L_o + tau (R_o + k ESR)))``; infinite with a capacitor.
        """
        share, lag, conductance = self._start_terms(trials)
        found = share * trials.inductance / (trials.rh * conductance * lag)
        return np.where(trials.ch > 0.0, np.inf, found)

    def feedback_for_start(self, trials: Trials, margin: Floats) -> Floats:
        """Feedback resistor that gives directly coupled candidates a start margin [ohm]."""
        found = np.full(len(trials), 1e6)
        for _ in range(3):
            share, lag, conductance = self._start_terms(trials.with_values(rh=found))
            bare = conductance - 1.0 / found
            found = np.maximum(share * trials.inductance / (margin * lag) - 1.0, 1.0) / bare
        return found

    def _start_terms(self, trials: Trials) -> tuple[Floats, Floats, Floats]:
        regulator = self.drawer.regulator.element
        load = self.requirement.output.current_max
        gain = self._column("gain_min", trials.transistor)
        knee = self._column("gain_knee", trials.transistor)
        tau = np.maximum(self._column("charge_time", trials.transistor), CHARGE_TIME_TOP)
        conductance = 1.0 / self.r1 + 1.0 / self.lower_resistors(trials) + 1.0 / trials.rh
        k = 1.0 - 1.0 / (self.r1 * conductance)
        esr = np.array([one.esr for one in self.drawer.capacitors])[trials.capacitor]
        inductance = regulator.output_inductance * regulator.output_inductance_factor
        lag = inductance + tau * (regulator.output_resistance + k * esr)
        return gain / (1.0 + 2.0 * load / knee), lag, conductance

    def rows(self, trials: Trials, supply: float, load: float, climate: Climate = Climate.HOT) -> Floats:
        """Parameter rows at one operating point, shape (n, columns)."""
        rows = np.empty((len(trials), len(COLUMNS)))
        values = self._regulator_values() | self._part_values(trials, climate) | self._choke_values(trials)
        values |= {
            "supply_voltage": supply,
            "load_current": load,
            "load_resistance": np.inf,
            "full_load": self.requirement.output.current_max,
            "r1": self.r1,
            "r2": self.lower_resistors(trials),
            "hysteresis_resistance": trials.rh,
            "hysteresis_capacitance": trials.ch,
            "drive_resistance": np.maximum(self.drive_resistors(trials), LEAST_DRIVE_RESISTANCE),
            "base_resistance": trials.rbe,
        }
        for name, value in values.items():
            rows[:, COLUMN[name]] = value
        return rows

    def _regulator_values(self) -> dict[str, float]:
        regulator = self.drawer.regulator.element
        names = (
            "reference", "adjust_current", "output_inductance", "output_resistance", "quiescent_current",
            "current_limit", "current_limit_knee", "current_limit_far_voltage", "current_limit_far",
            "dropout", "dropout_resistance",
        )  # fmt: skip
        return {name: getattr(regulator, name) for name in names}

    def _part_values(self, trials: Trials, climate: Climate) -> dict[str, Floats]:
        names = (
            "base_emitter", "charge_time", "gain", "gain_knee", "saturation_voltage", "saturation_resistance",
        )  # fmt: skip
        values = {name: self._column(name, trials.transistor, climate) for name in names}
        diodes = [one.element for one in self.drawer.rectifiers]
        values["threshold"] = np.array([one.threshold for one in diodes])[trials.rectifier]
        values["slope"] = np.array([one.slope / one.parallel for one in diodes])[trials.rectifier]
        charge = np.array([one.recovery_charge * one.parallel for one in diodes])
        values["recovery_charge"] = charge[trials.rectifier]
        values["capacitance"] = np.array([one.capacitance for one in self.drawer.capacitors])[
            trials.capacitor
        ]
        ambient_c = self._ambient_c[climate]
        values["esr"] = np.array([working_esr(one, ambient_c) for one in self.drawer.capacitors])[
            trials.capacitor
        ]
        return values

    def _choke_values(self, trials: Trials) -> dict[str, Floats | float]:
        output = self.requirement.output
        fall = (1.0 / BIASED_SHARE - 1.0) ** (1.0 / BIAS_EXPONENT)
        return {
            "inductance": trials.inductance / BIASED_SHARE,
            "bias_current": output.current_max / fall,
            "bias_exponent": BIAS_EXPONENT,
            "choke_resistance": COPPER_SHARE * output.voltage / output.current_max,
        }

    def _column(self, name: str, index: Indices, climate: Climate | None = None) -> Floats:
        """A value of the transistors at a climate's junction temperature, or at 25 degC."""
        tabled = [one.element for one in self.drawer.transistors]
        source = tabled if climate is None else self._transistors[climate]
        return np.array([getattr(one, name) for one in source])[index]


def _warm(element: TransistorElement, temperature_c: float) -> TransistorElement:
    return replace(
        element,
        gain=float(gain_at_temperature(element.gain, temperature_c)),
        charge_time=float(charge_time_at_temperature(element.charge_time, temperature_c)),
        base_emitter=float(base_emitter_voltage(element.base_emitter, temperature_c)),
    )
