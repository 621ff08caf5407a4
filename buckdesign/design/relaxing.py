"""A requirement with one of its lines given a little."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

from buckdesign.design.requirement import Requirement
from buckdesign.units import format_quantity


@dataclass(frozen=True, kw_only=True)
class Line:
    """A line of the requirement that may give.

    Attributes
    ----------
    name : str
        Own name of the line; for those that the search can spare, the field of `Violations`.
    key, unit : str
        In the requirement file.
    checks : tuple of str
        Names of the checks that hold it.
    upward : bool
        Whether giving means a larger number.
    words : str
        What it is.
    """

    name: str
    key: str
    unit: str
    checks: tuple[str, ...]
    upward: bool
    words: str


SEARCHED = (
    Line(name="ripple", key="output.ripple", unit="V", checks=("ripple",), upward=True, words="ripple"),
    Line(
        name="frequency_low",
        key="limits.frequency",
        unit="Hz",
        checks=("lowest frequency",),
        upward=False,
        words="lowest frequency",
    ),
    Line(
        name="frequency_high",
        key="limits.frequency",
        unit="Hz",
        checks=("highest frequency",),
        upward=True,
        words="highest frequency",
    ),
    Line(
        name="efficiency",
        key="limits.efficiency",
        unit="%",
        checks=("efficiency",),
        upward=False,
        words="efficiency at full load",
    ),
    Line(
        name="output",
        key="output.tolerance",
        unit="%",
        checks=("output voltage",),
        upward=True,
        words="tolerance of the output",
    ),
)
"""Lines that the search can spare."""

SUPPLY_LOW = Line(
    name="supply_low", key="supply.voltage", unit="V", checks=(), upward=True, words="lowest supply"
)
SUPPLY_HIGH = Line(
    name="supply_high", key="supply.voltage", unit="V", checks=(), upward=False, words="highest supply"
)
OUTPUT_VOLTAGE = Line(
    name="output_voltage", key="output.voltage", unit="V", checks=(), upward=False, words="output voltage"
)
LOAD = Line(name="load", key="output.current", unit="A", checks=(), upward=False, words="largest load")
AMBIENT = Line(
    name="ambient", key="limits.ambient", unit="degC", checks=(), upward=False, words="highest ambient"
)


def line_value(requirement: Requirement, line: Line) -> float | None:
    """What a requirement says on a line; None: nothing."""
    supply, output, limits = requirement.supply, requirement.output, requirement.limits
    values: dict[str, float | None] = {
        "ripple": output.ripple if math.isfinite(output.ripple) else None,
        "frequency_low": limits.frequency_low,
        "frequency_high": limits.frequency_high,
        "efficiency": limits.efficiency,
        "output": output.tolerance,
        "supply_low": supply.voltage_low,
        "supply_high": supply.voltage_high,
        "output_voltage": output.voltage,
        "load": output.current_max,
        "ambient": limits.ambient_high,
    }
    return values[line.name]


def relaxed(requirement: Requirement, line: Line, value: float) -> Requirement:
    """The requirement with another value on a line.

    Parameters
    ----------
    requirement : Requirement
        The requirement.
    line : Line
        Which line.
    value : float
        Its new value [unit of the line].

    Returns
    -------
    Requirement
        Neighbouring values follow where their order demands it.
    """
    supply, output, limits = requirement.supply, requirement.output, requirement.limits
    low, nominal, high = supply.voltage
    slow, fast = limits.frequency or (0.0, math.inf)
    match line.name:
        case "ripple":
            output = replace(output, ripple=value)
        case "output":
            output = replace(output, tolerance=value)
        case "output_voltage":
            output = replace(output, voltage=value)
        case "load":
            output = replace(output, current=(min(output.current_min, value), value))
        case "frequency_low":
            limits = replace(limits, frequency=(value, fast))
        case "frequency_high":
            limits = replace(limits, frequency=(slow, value))
        case "efficiency":
            limits = replace(limits, efficiency=value)
        case "ambient":
            limits = replace(limits, ambient=(min(limits.ambient_low, value), value))
        case "supply_low":
            supply = replace(supply, voltage=(value, max(nominal, value), max(high, value)))
        case "supply_high":
            supply = replace(supply, voltage=(min(low, value), min(nominal, value), value))
    return replace(requirement, supply=supply, output=output, limits=limits, given={})


def without_preference(requirement: Requirement, kind: str) -> Requirement:
    """The requirement with all parts of a kind allowed."""
    return replace(requirement, prefer=replace(requirement.prefer, **{kind: ()}), given={})


def eased(line: Line, value: float, share: float) -> float:
    """A value moved by a share in the direction in which the line gives, rounded outward to a handy number.

    Parameters
    ----------
    line : Line
        Which line.
    value : float
        [unit of the line].
    share : float
        [1]; for an ambient, of 100 K.

    Returns
    -------
    float
        Two or three significant digits.

    Examples
    --------
    >>> eased(SEARCHED[0], 0.0431, 0.02)
    0.044
    """
    if line.name == "ambient":
        return float(math.floor(value - 100.0 * share))
    if line.name == "efficiency":
        return math.floor((value - 0.2 * share) * 200.0) / 200.0
    moved = value * (1.0 + share if line.upward else 1.0 - share)
    digits = 3 if line.name in ("supply_low", "supply_high", "output_voltage") else 2
    step = 10.0 ** (math.floor(math.log10(abs(moved))) - digits + 1)
    count = moved / step
    whole = math.ceil(count - 1e-9) if line.upward else math.floor(count + 1e-9)
    return float(f"{whole * step:.12g}")


def shown(line: Line, value: float) -> str:
    """A value of a line as text."""
    return format_quantity(value, line.unit, digits=3, ascii_only=True)
