"""Parts chosen by rating: which will do, which of them first, and what those that will not lack.

Two thresholds a rating: the *wanted* one leaves a margin and rules the choice among the tables; a part that
the requirement pins, or names among a few, need only keep the rating itself.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Generic, TypeVar

from buckdesign.design.elements import RectifierElement, RegulatorElement, TransistorElement
from buckdesign.design.requirement import Requirement
from buckdesign.design.resolve import resolve_regulator
from buckdesign.design.resolve_semiconductors import resolve_rectifier, resolve_transistor
from buckdesign.design.sections import RectifierSection, RegulatorSection, TransistorSection
from buckdesign.design.sizing import PEAK_OVER_MEAN, base_resistors, drive_headroom, regulator_current_needed
from buckdesign.parts import Tables
from buckdesign.physics.pnp import gain

VOLTAGE_MARGIN = 1.25
"""Rated over applied voltage of semiconductors and the input capacitor [1] (common practice)."""

COLLECTOR_MARGIN = 3.0
"""Rated collector over output current [1] (common practice: 10 A for 3 A, because the gain falls off)."""

COLLECTOR_LIMIT = 1.3
"""The same for a part that the requirement names [1]: the peak choke current with margin."""

RECTIFIER_MARGIN = 1.3
"""Rated over average rectifier current [1] (common practice)."""

GUESSED_FREQUENCY = 12e3
"""Frequency with which losses are compared before anything was simulated [Hz] (typical of the circuit)."""

OVERSIZE = 5.0
"""Rated collector over output current beyond which a transistor counts as larger than it need be [1]."""

CASE_PATH = 5.0
"""Thermal resistance to the case up to which a rectifier has a case to mount on a heat sink [K/W]."""

SIZE_SHARE = 0.02
"""Output power that may be lost for one point of size [1] (the unit of the search's ranks)."""

BY_CLASS = 0.2
"""Points of a rectifier that is known by its class only: a registered type is easier to buy [1]."""

UNSURE = 0.3
"""Points of a part whose values are recalled without certainty [1]; of two alike the known one is taken."""

UNKNOWN_PATH = 1.0
"""Points of a rectifier whose way of heat in free air is not known, so that it can't be checked [1]."""

MOST_RECTIFIERS = 2
"""Rectifiers in parallel: more do not share the current (common practice)."""

_Element = TypeVar("_Element")


@dataclass(frozen=True, kw_only=True)
class Lack:
    """What a part lacks.

    Attributes
    ----------
    kind, part : str
        ``transistor`` and so on, and its name.
    what : str
        The rating, in words.
    unit : str
        Its unit.
    required, offered : float
        [unit].
    """

    kind: str
    part: str
    what: str
    unit: str
    required: float
    offered: float

    @property
    def shortfall(self) -> float:
        """How far it misses, relative [1]."""
        return 1.0 - self.offered / self.required if self.required > 0 else math.inf


@dataclass(frozen=True, kw_only=True)
class Choice(Generic[_Element]):
    """A part that will do.

    Attributes
    ----------
    name : str
        Part.
    element : object
        Its values.
    cost : float
        Smaller is better; estimated loss over output power with what size counts [1].
    parallel : int
        Pieces.
    size : float
        What size beyond need and uncertain values count in the ranks of the search [1].
    """

    name: str
    element: _Element
    cost: float
    parallel: int = 1
    size: float = 0.0


@dataclass(frozen=True, kw_only=True)
class Selection(Generic[_Element]):
    """Parts of one kind.

    Attributes
    ----------
    choices : tuple of Choice
        Those that will do, best first.
    lacks : tuple of Lack
        What the others lack, the smallest shortfall first.
    """

    choices: tuple[Choice[_Element], ...]
    lacks: tuple[Lack, ...]


def _names(preferred: Sequence[str], known: Iterable[str]) -> tuple[str, ...]:
    return tuple(preferred) or tuple(known)


def _select(
    found: Sequence[tuple[Choice[_Element], list[Lack], list[Lack]]], *, is_named: bool
) -> Selection[_Element]:
    """Parts that keep the wanted margins; where they are named, or none keeps them, also those within
    ratings."""
    good = [choice for choice, wants, _ in found if not wants]
    fair = [choice for choice, wants, musts in found if wants and not musts]
    good.sort(key=lambda choice: choice.cost)
    fair.sort(key=lambda choice: choice.cost)
    lacks = sorted((lack for _, _, musts in found for lack in musts), key=lambda lack: lack.shortfall)
    return Selection(choices=tuple(good + fair if is_named or not good else good), lacks=tuple(lacks))


def highest_supply(requirement: Requirement) -> float:
    """Highest supply with its ripple [V]."""
    return requirement.supply.voltage_high + requirement.supply.ripple / 2


def regulator_choices(requirement: Requirement, tables: Tables) -> Selection[RegulatorElement]:
    """Regulator classes by largest difference, base drive and reference.

    Parameters
    ----------
    requirement : Requirement
        Supply and output.
    tables : Tables
        Parts.

    Returns
    -------
    Selection
        The smallest class first.
    """
    preferred = requirement.prefer.regulator
    found = []
    for name in _names(preferred, tables.regulators):
        element = resolve_regulator(RegulatorSection(part=name), tables)
        difference = highest_supply(requirement) - requirement.output.voltage
        musts = _lack(
            "regulator", name, "largest input-output difference", "V", difference, element.max_difference
        )
        if requirement.output.voltage <= element.reference:
            musts.append(
                Lack(
                    kind="regulator",
                    part=name,
                    what="output above its reference",
                    unit="V",
                    required=element.reference,
                    offered=requirement.output.voltage,
                )
            )
        wants = musts or _lack(
            "regulator", name, "largest difference", "V", highest_supply(requirement), element.max_difference
        )
        rated = element.rated_current or element.current_limit
        choice = Choice(name=name, element=element, cost=rated)
        found.append((choice, wants, musts))
    return _select(found, is_named=bool(preferred))


def transistor_choices(
    requirement: Requirement, tables: Tables, regulator: RegulatorElement
) -> Selection[TransistorElement]:
    """Transistors by voltage, collector current, gain and the base drive that the lowest supply leaves.

    Parameters
    ----------
    requirement : Requirement
        Supply, output, load.
    tables : Tables
        Parts.
    regulator : RegulatorElement
        The regulator that drives the base.

    Returns
    -------
    Selection
        Smallest estimated loss first, oversize counted.
    """
    preferred = requirement.prefer.transistor
    found = []
    for name in _names(preferred, tables.transistors):
        element = resolve_transistor(TransistorSection(part=name), tables, [])
        wants, musts = _transistor_lacks(requirement, regulator, element, name)
        rated = element.collector_current or requirement.output.current_max
        size = _oversize(rated / requirement.output.current_max, OVERSIZE)
        size += UNSURE * ("unsure" in tables.transistor(name).how)
        cost = _transistor_cost(requirement, element) + SIZE_SHARE * size
        found.append((Choice(name=name, element=element, cost=cost, size=size), wants, musts))
    return _select(found, is_named=bool(preferred))


def distinct_choices(choices: Sequence[Choice[_Element]], most: int) -> tuple[Choice[_Element], ...]:
    """The first few that differ in cost: grades of one type that differ only in voltage count once."""
    kept: list[Choice[_Element]] = []
    for choice in choices:
        if all(abs(choice.cost - other.cost) > 1e-9 for other in kept):
            kept.append(choice)
    return tuple(kept[:most])


def _transistor_lacks(
    requirement: Requirement, regulator: RegulatorElement, element: TransistorElement, name: str
) -> tuple[list[Lack], list[Lack]]:
    supply, load = highest_supply(requirement), requirement.output.current_max
    musts = _lack("transistor", name, "collector-emitter voltage", "V", supply, element.collector_voltage)
    musts += _lack(
        "transistor", name, "collector current", "A", COLLECTOR_LIMIT * load, element.collector_current
    )
    needed = regulator_current_needed(element, PEAK_OVER_MEAN * load, base_resistors(load)[-1])
    limit = min(regulator.current_limit_min, regulator.rated_current or math.inf)
    musts += _lack("transistor", name, "gain: base current within the regulator's", "A", needed, limit)
    wants = _lack(
        "transistor", name, "voltage", "V", VOLTAGE_MARGIN * supply, element.collector_voltage
    ) + _lack("transistor", name, "current", "A", COLLECTOR_MARGIN * load, element.collector_current)
    headroom = drive_headroom(requirement, regulator, element)
    if headroom > 0 and needed * (regulator.dropout_resistance + 1.0) * 1.15 > headroom:
        wants.append(
            Lack(kind="transistor", part=name, what="gain", unit="A", required=needed, offered=headroom)
        )
    return wants + musts, musts


def _transistor_cost(requirement: Requirement, element: TransistorElement) -> float:
    """Estimated loss over output power [1]."""
    supply, output = requirement.supply.voltage_nominal, requirement.output
    load, duty = output.current_max, min(1.0, output.voltage / supply)
    conduction = duty * load * (element.saturation_voltage + element.saturation_resistance * load)
    amplification = float(gain(load, element.gain, element.gain_knee))
    base = duty * load / amplification * (supply - output.voltage)
    switching = 0.35 * supply * load * element.charge_time * GUESSED_FREQUENCY
    return (conduction + base + switching) / (output.voltage * load)


def _oversize(ratio: float, usual: float) -> float:
    """Half a point for each doubling beyond the usual ratio of rating to need [1]."""
    return 0.5 * max(0.0, math.log2(ratio / usual))


def rectifier_choices(requirement: Requirement, tables: Tables) -> Selection[RectifierElement]:
    """Rectifiers by reverse voltage, average current and temperature in free air or on the heat sink.

    Parameters
    ----------
    requirement : Requirement
        Supply, output, load.
    tables : Tables
        Parts.

    Returns
    -------
    Selection
        Smallest estimated loss first; two in parallel where one is too small and the requirement names it.
    """
    preferred = requirement.prefer.rectifier
    found = []
    for name in _names(preferred, tables.rectifiers):
        if not preferred and tables.rectifier(name).kind == "standard":
            continue
        pieces = range(1, MOST_RECTIFIERS + 1) if preferred else (1,)
        tried = [_rectifier(requirement, tables, name, count) for count in pieces]
        found.append(next((one for one in tried if not one[1]), tried[-1]))
    return _select(found, is_named=bool(preferred))


def _rectifier(
    requirement: Requirement, tables: Tables, name: str, parallel: int
) -> tuple[Choice[RectifierElement], list[Lack], list[Lack]]:
    element = resolve_rectifier(RectifierSection(part=name, parallel=parallel), tables, [])
    supply, load = highest_supply(requirement), requirement.output.current_max
    average = load * (1.0 - min(1.0, requirement.output.voltage / supply)) / parallel
    musts = _lack("rectifier", name, "reverse voltage", "V", supply, element.reverse_voltage)
    musts += _lack("rectifier", name, "average current", "A", average, element.average_current)
    wants = _lack(
        "rectifier", name, "reverse voltage", "V", VOLTAGE_MARGIN * supply, element.reverse_voltage
    ) + _lack("rectifier", name, "average current", "A", RECTIFIER_MARGIN * average, element.average_current)
    loss = average * (element.threshold + element.slope * load / parallel)
    loss += 2.0 * element.recovery_charge * supply * GUESSED_FREQUENCY
    wants += _hot(element, name, loss, requirement.limits.ambient_high)
    output = requirement.output.voltage * load
    size = 0.5 * _oversize((element.average_current or average) / average, OVERSIZE) + 0.3 * (parallel - 1)
    size += BY_CLASS * name.endswith("class")
    size += UNSURE * ("unsure" in tables.rectifier(name).how)
    if element.junction_ambient is None and (element.junction_case or math.inf) > CASE_PATH:
        size += UNKNOWN_PATH
    cost = parallel * loss / output + SIZE_SHARE * size
    choice = Choice(name=name, element=element, cost=cost, parallel=parallel, size=size)
    return choice, wants + musts, musts


def _hot(element: RectifierElement, name: str, loss: float, ambient_c: float) -> list[Lack]:
    """A diode in free air must stay 15 K below its limit; one that has a case goes on the heat sink."""
    limit, path = element.junction_limit_c, element.junction_ambient
    if limit is None or path is None or (element.junction_case or math.inf) <= CASE_PATH:
        return []
    room = limit - 15.0 - ambient_c
    return [] if loss * path <= room else _lack("rectifier", name, "temperature rise", "K", loss * path, room)


def _lack(kind: str, part: str, what: str, unit: str, required: float, offered: float | None) -> list[Lack]:
    if offered is None or offered >= required * (1.0 - 1e-9):
        return []
    return [Lack(kind=kind, part=part, what=what, unit=unit, required=required, offered=offered)]
