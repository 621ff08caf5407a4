"""The requirement: what the supply must do, read from a TOML file or carried by a design file."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field, fields, replace
from pathlib import Path
from typing import Any

from buckdesign.design.keys import Key, QuantityKey, SpreadKey
from buckdesign.design.schema import (
    REQUIRED,
    Reading,
    SectionKey,
    flag,
    listed,
    parts,
    quantity,
    read_section,
    section_tree,
    table,
)
from buckdesign.design.toml_source import KeyPath, Locate, read_toml
from buckdesign.parts import Tables, load_tables
from buckdesign.units import format_quantity

DEFAULT_AMBIENT_C = 25.0
"""Ambient where none is given [degC] (common practice: data sheets are stated at 25 degC)."""

DEFAULT_TOLERANCE = 0.04
"""Tolerance of the mean output where none is given [1] (that of the regulator's reference, 1.20-1.30 V)."""

_SUPPLY_SPREAD = SpreadKey(
    each=QuantityKey(unit="V"), names=("lowest", "nominal", "highest"), example='["21 V", "24 V", "29 V"]'
)
_LOAD_SPREAD = SpreadKey(
    each=QuantityKey(unit="A", above=False),
    names=("smallest", "largest"),
    alone_is_last=True,
    example='["20 mA", "2.5 A"]',
)
_AMBIENT_SPREAD = SpreadKey(
    each=QuantityKey(unit="degC", minimum=-273.15),
    names=("lowest", "highest"),
    example='["5 degC", "40 degC"]',
)
_FREQUENCY_SPREAD = SpreadKey(
    each=QuantityKey(unit="Hz", above=False),
    names=("lowest", "highest"),
    alone=False,
    example='["4 kHz", "60 kHz"]',
)


@dataclass(frozen=True, kw_only=True)
class SupplyNeed:
    """The source that the supply runs from.

    Attributes
    ----------
    voltage : tuple of float
        Lowest, nominal and highest voltage [V].
    resistance, inductance : float
        Of source and leads [ohm], [H]; 0 where not given.
    rise_time : float
        From nothing to full voltage at switch-on [s]; 0 where not given.
    ripple : float
        Peak to peak [V]; 0 where not given.
    ripple_frequency : float or None
        [Hz].
    """

    voltage: tuple[float, float, float] = listed(_SUPPLY_SPREAD, default=REQUIRED)
    resistance: float = quantity("ohm", default=0.0, above=False)
    inductance: float = quantity("H", default=0.0, above=False)
    rise_time: float = quantity("s", default=0.0, above=False)
    ripple: float = quantity("V", default=0.0, above=False)
    ripple_frequency: float | None = quantity("Hz")

    @property
    def voltage_low(self) -> float:
        """Lowest supply [V]."""
        return self.voltage[0]

    @property
    def voltage_nominal(self) -> float:
        """Nominal supply [V]."""
        return self.voltage[1]

    @property
    def voltage_high(self) -> float:
        """Highest supply [V]."""
        return self.voltage[2]


@dataclass(frozen=True, kw_only=True)
class OutputNeed:
    """What the output must be.

    Attributes
    ----------
    voltage : float
        Mean output [V].
    current : tuple of float
        Smallest and largest load [A].
    ripple : float
        At most, peak to peak [V]; infinite: no limit (only a design file may leave it out).
    tolerance : float
        Of the mean output, plus or minus [1].
    """

    voltage: float = quantity("V", default=REQUIRED)
    current: tuple[float, float] = listed(_LOAD_SPREAD, default=REQUIRED)
    ripple: float = quantity("V", default=math.inf)
    tolerance: float = quantity("%", default=DEFAULT_TOLERANCE, below=1.0)

    @property
    def current_min(self) -> float:
        """Smallest load [A]."""
        return self.current[0]

    @property
    def current_max(self) -> float:
        """Largest load [A]."""
        return self.current[1]


@dataclass(frozen=True, kw_only=True)
class Limits:
    """Limits that a design must keep.

    Attributes
    ----------
    ambient : tuple of float
        Lowest and highest [degC].
    frequency : tuple of float or None
        Lowest and highest from half to full load [Hz].
    efficiency : float or None
        At least, at full load and every supply [1].
    regular : bool
        Irregular oscillation counts as a violation.
    """

    ambient: tuple[float, float] = listed(_AMBIENT_SPREAD, default=(DEFAULT_AMBIENT_C, DEFAULT_AMBIENT_C))
    frequency: tuple[float, float] | None = listed(_FREQUENCY_SPREAD)
    efficiency: float | None = quantity("%", below=1.0)
    regular: bool = flag()

    @property
    def ambient_low(self) -> float:
        """Lowest ambient [degC]."""
        return self.ambient[0]

    @property
    def ambient_high(self) -> float:
        """Highest ambient [degC]."""
        return self.ambient[1]

    @property
    def frequency_low(self) -> float | None:
        """Lowest frequency allowed [Hz]."""
        return None if self.frequency is None else self.frequency[0]

    @property
    def frequency_high(self) -> float | None:
        """Highest frequency allowed [Hz]."""
        return None if self.frequency is None else self.frequency[1]


@dataclass(frozen=True, kw_only=True)
class Preferences:
    """Parts to choose from, by name; empty: any in the tables."""

    regulator: tuple[str, ...] = parts("regulator")
    transistor: tuple[str, ...] = parts("transistor")
    rectifier: tuple[str, ...] = parts("rectifier")
    core: tuple[str, ...] = parts("ring")
    material: tuple[str, ...] = parts("material")
    wire: tuple[str, ...] = parts("wire")
    output_capacitor: tuple[str, ...] = parts("capacitor")
    input_capacitor: tuple[str, ...] = parts("capacitor")


@dataclass(frozen=True, kw_only=True)
class Requirement:
    """A requirement; all values SI, temperatures in degC.

    Attributes
    ----------
    supply, output, limits, prefer : SupplyNeed, OutputNeed, Limits, Preferences
        The tables of the file.
    given : Mapping
        What the file says for each dotted key, kept so that writing it again says the same.
    source : pathlib.Path or None
        The file it was read from.
    """

    supply: SupplyNeed = field(metadata=table(SupplyNeed))
    output: OutputNeed = field(metadata=table(OutputNeed))
    limits: Limits = field(default_factory=Limits, metadata=table(Limits))
    prefer: Preferences = field(default_factory=Preferences, metadata=table(Preferences))
    given: Mapping[str, Any] = field(default_factory=dict, compare=False, repr=False)
    source: Path | None = field(default=None, compare=False)

    def tree(self) -> dict[str, Any]:
        """The requirement as it stands in a file, without what was not given."""
        return {name: content for name, content in section_tree(self, self.given, ()).items() if content}


def requirement_keys() -> dict[str, Key]:
    """All keys of a requirement file with what each may hold.

    Returns
    -------
    dict
        `Key` by dotted name, such as ``output.ripple``, in the order of the file format.
    """
    return section_keys(Requirement)


def section_keys(section: type[Any], prefix: str = "") -> dict[str, Key]:
    """The keys of a section and of the sections in it.

    Parameters
    ----------
    section : type
        Dataclass whose fields carry keys.
    prefix : str
        What stands before each name, such as ``supply.``.

    Returns
    -------
    dict
        `Key` by dotted name, in the order of the fields.
    """
    found: dict[str, Key] = {}
    for member in fields(section):
        key = member.metadata.get("key")
        if isinstance(key, SectionKey):
            found |= section_keys(key.section, f"{prefix}{member.name}.")
        elif key is not None:
            found[prefix + member.name] = key
    return found


def read_requirement(path: Path, tables: Tables | None = None) -> Requirement:
    """Read a requirement file.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    tables : Tables, optional
        Parts that it may name; the tables of the package where omitted.

    Returns
    -------
    Requirement
        The requirement.

    Raises
    ------
    FileAccessError
        The file can't be read.
    FaultsError
        All its faults at once.
    """
    source = read_toml(Path(path))
    return requirement_from_tree(source.tree, source.locate, (), path=source.path, tables=tables)


def requirement_from_tree(
    tree: Mapping[str, Any],
    locate: Locate,
    prefix: KeyPath,
    *,
    path: Path,
    tables: Tables | None = None,
) -> Requirement:
    """The requirement in a tree that was read already.

    Parameters
    ----------
    tree : Mapping
        Tables `supply`, `output` and, optional, `limits` and `prefer`.
    locate : Callable
        Line of a key path in the file.
    prefix : tuple
        Where the tree stands in the file: ``()`` or ``("requirement",)``.
    path : pathlib.Path
        The file, for errors.
    tables : Tables, optional
        Parts that it may name.

    Returns
    -------
    Requirement
        The requirement.

    Raises
    ------
    FaultsError
        All faults at once.
    """
    reading = Reading(
        path=path, locate=locate, tables=load_tables() if tables is None else tables, prefix=prefix
    )
    requirement = read_requirement_section(tree, reading)
    if isinstance(tree.get("output"), Mapping) and "ripple" not in tree["output"]:
        reading.fault(("output", "ripple"), None, f"missing; {QuantityKey(unit='V').wanted}")
    reading.finish()
    assert requirement is not None
    return requirement


def read_requirement_section(tree: Mapping[str, Any], reading: Reading) -> Requirement | None:
    """Like `requirement_from_tree`, with the faults noted in `reading`; None where there are any.

    Parameters
    ----------
    tree : Mapping
        Tables of a requirement.
    reading : Reading
        Collects the faults and what was given.

    Returns
    -------
    Requirement or None
        The requirement.
    """
    before = len(reading.faults)
    requirement = read_section(Requirement, tree, (), reading)
    _check_across(reading)
    if requirement is None or len(reading.faults) > before:
        return None
    return replace(requirement, given=dict(reading.given), source=reading.path)


def _check_across(reading: Reading) -> None:
    """Checks that need more than one key, each as far as its keys are in order."""
    given = reading.given
    supply = _value(_SUPPLY_SPREAD, given.get("supply.voltage"), reading)
    output = _value(QuantityKey(unit="V"), given.get("output.voltage"), reading)
    load = _value(_LOAD_SPREAD, given.get("output.current"), reading)
    if supply is not None and output is not None and output >= supply[0]:
        lowest = format_quantity(supply[0], "V", ascii_only=True)
        reading.fault(
            ("output", "voltage"), given["output.voltage"], f"must be below the lowest supply, {lowest}"
        )
    if load is not None and load[1] <= 0:
        reading.fault(("output", "current"), given["output.current"], "the largest load must be above 0")
    check_ripple_pair(given, reading)
    _check_frequency(given, reading)


def _check_frequency(given: Mapping[str, Any], reading: Reading) -> None:
    band = _value(_FREQUENCY_SPREAD, given.get("limits.frequency"), reading)
    if band is not None and not band[0] < band[1]:
        allowed = f"lowest and highest must differ; {_FREQUENCY_SPREAD.wanted}"
        reading.fault(("limits", "frequency"), given["limits.frequency"], allowed)


def check_ripple_pair(given: Mapping[str, Any], reading: Reading) -> None:
    """A supply ripple needs its frequency.

    Parameters
    ----------
    given : Mapping
        What the file says, by dotted key.
    reading : Reading
        Collects the fault.
    """
    ripple = _value(QuantityKey(unit="V", above=False), given.get("supply.ripple"), reading)
    if ripple and "supply.ripple_frequency" not in given:
        wanted = QuantityKey(unit="Hz").wanted
        reading.fault(("supply", "ripple_frequency"), None, f"missing beside supply.ripple; {wanted}")


def _value(key: Any, raw: Any, reading: Reading) -> Any:
    return None if raw is None else key.read(raw, reading.tables)
