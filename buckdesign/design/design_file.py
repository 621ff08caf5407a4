"""Design files: every component value of one supply, its operating point and what it was made for."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, fields, replace
from pathlib import Path
from typing import Any

from buckdesign.design.design_checks import check_design
from buckdesign.design.keys import Key, QuantityKey
from buckdesign.design.requirement import Requirement, read_requirement_section, section_keys
from buckdesign.design.safe_write import write_text_new, write_text_over
from buckdesign.design.schema import Reading, SectionKey, read_section, section_tree, table
from buckdesign.design.sections import (
    CapacitorSection,
    ChokeSection,
    DesignOutput,
    DesignSupply,
    Network,
    RectifierSection,
    RegulatorSection,
    ThermalSection,
    TransistorSection,
)
from buckdesign.design.tolerances import Tolerance, read_tolerances, tolerance_tree
from buckdesign.design.toml_source import Locate, read_toml
from buckdesign.design.toml_text import toml_text
from buckdesign.errors import InputError, nearest_names, quoted
from buckdesign.parts import Tables, load_tables


@dataclass(frozen=True, kw_only=True)
class Design:
    """A design as its file says it: part names are not completed, absent keys are None.

    Attributes
    ----------
    supply, output : DesignSupply, DesignOutput
        The operating point.
    regulator, network, transistor, rectifier, choke : dataclass
        The elements.
    output_capacitor, input_capacitor : CapacitorSection, CapacitorSection or None
        The capacitors.
    thermal : ThermalSection
        Ambient and heat sinks.
    requirement : Requirement or None
        What it was made for.
    tolerance : Mapping
        `Tolerance` by dotted key.
    given : Mapping
        What the file says for each dotted key, kept so that writing it again says the same.
    source : pathlib.Path or None
        The file it was read from.
    """

    supply: DesignSupply = field(metadata=table(DesignSupply))
    output: DesignOutput = field(metadata=table(DesignOutput))
    regulator: RegulatorSection = field(metadata=table(RegulatorSection))
    network: Network = field(metadata=table(Network))
    transistor: TransistorSection = field(metadata=table(TransistorSection))
    rectifier: RectifierSection = field(metadata=table(RectifierSection))
    choke: ChokeSection = field(metadata=table(ChokeSection))
    output_capacitor: CapacitorSection = field(metadata=table(CapacitorSection))
    input_capacitor: CapacitorSection | None = field(default=None, metadata=table(CapacitorSection))
    thermal: ThermalSection = field(default_factory=ThermalSection, metadata=table(ThermalSection))
    requirement: Requirement | None = None
    tolerance: Mapping[str, Tolerance] = field(default_factory=dict)
    given: Mapping[str, Any] = field(default_factory=dict, compare=False, repr=False)
    source: Path | None = field(default=None, compare=False)

    @property
    def full_load(self) -> float:
        """The largest load of the requirement, else that of the operating point [A]."""
        return self.output.load if self.requirement is None else self.requirement.output.current_max

    def tree(self) -> dict[str, Any]:
        """The design as it stands in a file."""
        sections = section_tree(self, self.given, ())
        tree = {name: content for name, content in sections.items() if content}
        if self.requirement is not None:
            tree["requirement"] = self.requirement.tree()
        if self.tolerance:
            tree["tolerance"] = tolerance_tree(self.tolerance, self.given)
        return tree


def numeric_keys() -> dict[str, QuantityKey]:
    """The keys of a design file that hold one quantity, by dotted name, with unit and bounds.

    Returns
    -------
    dict
        `QuantityKey` by dotted name, such as ``network.rh``.
    """
    return _numeric_keys(Design, "")


def _numeric_keys(section: type[Any], prefix: str) -> dict[str, QuantityKey]:
    found: dict[str, QuantityKey] = {}
    for member in fields(section):
        key = member.metadata.get("key")
        if isinstance(key, QuantityKey):
            found[prefix + member.name] = key
        elif isinstance(key, SectionKey):
            found |= _numeric_keys(key.section, f"{prefix}{member.name}.")
    return found


def design_keys() -> tuple[str, ...]:
    """All keys of a design file by dotted name, without those of the carried requirement.

    Returns
    -------
    tuple of str
        Dotted names in the order of the file format.
    """
    return tuple(keyed_design())


def keyed_design() -> dict[str, Key]:
    """All keys of a design file with what each may hold, without those of the carried requirement.

    Returns
    -------
    dict
        `Key` by dotted name, in the order of the file format.
    """
    return section_keys(Design)


def read_design(path: Path, tables: Tables | None = None) -> Design:
    """Read a design file.

    Parameters
    ----------
    path : pathlib.Path
        The file.
    tables : Tables, optional
        Parts that it may name; the tables of the package where omitted.

    Returns
    -------
    Design
        The design.

    Raises
    ------
    FileAccessError
        The file can't be read.
    FaultsError
        All its faults at once.
    """
    source = read_toml(Path(path))
    return design_from_tree(source.tree, source.locate, path=source.path, tables=tables)


def design_from_tree(
    tree: Mapping[str, Any], locate: Locate, *, path: Path, tables: Tables | None = None
) -> Design:
    """The design in a tree that was read already.

    Parameters
    ----------
    tree : Mapping
        The tables of a design file.
    locate : Callable
        Line of a key path.
    path : pathlib.Path
        The file, for errors.
    tables : Tables, optional
        Parts that it may name.

    Returns
    -------
    Design
        The design.

    Raises
    ------
    FaultsError
        All faults at once.
    """
    known = load_tables() if tables is None else tables
    reading = Reading(path=path, locate=locate, tables=known)
    own = {name: value for name, value in tree.items() if name not in ("requirement", "tolerance")}
    design = read_section(Design, own, (), reading)
    check_design(own, reading)
    tolerances = read_tolerances(tree.get("tolerance", {}), numeric_keys(), reading)
    requirement = _carried_requirement(tree, reading)
    reading.finish()
    assert design is not None
    return replace(
        design, requirement=requirement, tolerance=tolerances, given=dict(reading.given), source=path
    )


def _carried_requirement(tree: Mapping[str, Any], reading: Reading) -> Requirement | None:
    """The requirement in a design file; what it leaves out of supply and output is taken from the design."""
    raw = tree.get("requirement")
    if raw is None:
        return None
    if not isinstance(raw, Mapping):
        reading.fault(("requirement",), raw, "a table is wanted: [requirement.supply] and so on")
        return None
    carried = dict(raw)
    for name in ("supply", "output"):
        wanted = carried.get(name, {})
        if isinstance(wanted, Mapping):
            own = {"voltage": reading.given.get(f"{name}.voltage")}
            if name == "output":
                own["current"] = _load(reading)
            carried[name] = {key: value for key, value in own.items() if value is not None} | dict(wanted)
    inner = Reading(path=reading.path, locate=reading.locate, tables=reading.tables, prefix=("requirement",))
    requirement = read_requirement_section(carried, inner)
    reading.faults += inner.faults
    return requirement


def _load(reading: Reading) -> float | None:
    """Load current of the operating point as far as it could be read [A]."""
    values = {
        name: numeric_keys()[f"output.{name}"].read(reading.given[f"output.{name}"], reading.tables)
        for name in ("voltage", "current", "resistance")
        if f"output.{name}" in reading.given
    }
    return DesignOutput(**values).load if "voltage" in values else None


def design_with(design: Design, values: Mapping[str, Any], tables: Tables | None = None) -> Design:
    """A design with some of its values replaced, checked like a file.

    Parameters
    ----------
    design : Design
        The design to start from.
    values : Mapping
        New value by dotted key, such as ``{"choke.turns": 50, "network.rh": "1 Mohm"}``; None takes a key
        out.
    tables : Tables, optional
        Parts that it may name.

    Returns
    -------
    Design
        The new design.

    Raises
    ------
    InputError
        A key is unknown, or a value isn't allowed.
    """
    tree = design.tree()
    known = design_keys()
    for key, value in values.items():
        if key not in known:
            near = ", ".join(quoted(name) for name in nearest_names(key, known))
            raise InputError(f"{quoted(key)}: unknown key of a design file, nearest: {near}")
        *outer, last = key.split(".")
        inner = tree
        for name in outer:
            inner = inner.setdefault(name, {})
        if value is None:
            inner.pop(last, None)
        else:
            inner[last] = value
    path = design.source or Path("design")
    return replace(
        design_from_tree(tree, lambda *steps: None, path=path, tables=tables), source=design.source
    )


def design_to_toml(design: Design) -> str:
    """The text of a design file.

    Parameters
    ----------
    design : Design
        The design.

    Returns
    -------
    str
        TOML; what was given is written as it was given.
    """
    return toml_text(design.tree())


def write_design(design: Design, path: Path, force: bool = False) -> None:
    """Write a design file whole or not at all.

    Parameters
    ----------
    design : Design
        The design.
    path : pathlib.Path
        The file.
    force : bool
        Replace an existing file.

    Raises
    ------
    FileAccessError
        The file exists and `force` is not set, or it can't be written.
    """
    text = design_to_toml(design)
    if force:
        write_text_over(path, text)
    else:
        write_text_new(path, text)
