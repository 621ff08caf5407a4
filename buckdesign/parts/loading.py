"""The one loader of part and core tables."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import replace
from importlib.resources import files
from pathlib import Path
from typing import Any, TypeVar

from buckdesign.errors import Fault, FileAccessError, TableError
from buckdesign.parts.catalogue import Tables
from buckdesign.parts.cores import InductanceFactor, LossPoint, Material, Ring
from buckdesign.parts.fields import Column, columns_of
from buckdesign.parts.kinds import Capacitor, Rectifier, Regulator, Transistor, Wire
from buckdesign.parts.names import name_key, pair_key
from buckdesign.parts.reading import Row, raise_faults, read_rows
from buckdesign.parts.rules import broken_rules

_Part = TypeVar("_Part")

KINDS: dict[str, Callable[..., Any]] = {
    "regulator": Regulator,
    "transistor": Transistor,
    "rectifier": Rectifier,
    "capacitor": Capacitor,
    "wire": Wire,
    "ring": Ring,
    "material": Material,
    "inductance factor": InductanceFactor,
    "loss point": LossPoint,
}
"""Dataclass by kind of part."""

_BUILT_IN = (
    ("buckdesign.parts", "tables/regulators.csv"),
    ("buckdesign.parts", "tables/transistors.csv"),
    ("buckdesign.parts", "tables/rectifiers.csv"),
    ("buckdesign.parts", "tables/capacitors.csv"),
    ("buckdesign.parts", "tables/wires.csv"),
    ("cores_data", "rings.csv"),
    ("cores_data", "materials.csv"),
    ("cores_data", "al.csv"),
    ("cores_data", "loss_points.csv"),
)


def load_tables(extra: Sequence[Path] = (), folder: Path | None = None) -> Tables:
    """The built-in tables with the user's merged over them.

    Parameters
    ----------
    extra : sequence of Path
        CSV files with parts of any kind, recognised by their headers. A row replaces the part of the same
        name or adds one; a later file wins over an earlier one. `source` and `how` may be left out.
    folder : Path, optional
        Folder whose ``*.csv`` are merged before `extra`; by default `user_folder`. It need not exist.

    Returns
    -------
    Tables
        All parts.

    Raises
    ------
    TableError, FaultsError
        If a table is wrong: one fault, or several.
    FileAccessError
        If a file cannot be read.

    Examples
    --------
    >>> load_tables(folder=Path("no such folder")).rectifier("1n5822").reverse_voltage
    40.0
    """
    schemas = {kind: columns_of(part) for kind, part in KINDS.items()}
    merged: dict[str, dict[str, list[Row]]] = {kind: {} for kind in KINDS}
    for package, name in _BUILT_IN:
        text = (files(package) / name).read_text(encoding="utf-8")
        _merge(merged, *read_rows(text, f"{package}/{name}", schemas, {}))
    place = user_folder() if folder is None else folder
    for path in [*_csv_files(place), *extra]:
        _merge(merged, *_read_user(path, schemas))
    return _tables(merged)


def names_in(paths: Sequence[Path]) -> frozenset[tuple[str, str]]:
    """The parts that stand in tables of the user.

    Parameters
    ----------
    paths : sequence of Path
        CSV files with parts of any kind.

    Returns
    -------
    frozenset of tuple of str
        Kind and name as `name_key` writes it; of inductance factors ring, material and the pair of them.

    Raises
    ------
    TableError, FaultsError
        If a table is wrong.
    FileAccessError
        If a file cannot be read.
    """
    schemas = {kind: columns_of(part) for kind, part in KINDS.items()}
    found = set()
    for path in paths:
        kind, rows = _read_user(path, schemas)
        for row in rows:
            given = [row.values[column] for column in ("name", "ring", "material") if column in row.values]
            found |= {(kind, name_key(name)) for name in given} | {(kind, pair_key(*given))}
    return frozenset(found)


def user_folder() -> Path:
    """Folder of the user's own tables: ``buckdesign/parts`` in the configuration folder of the system.

    Returns
    -------
    Path
        ``$XDG_CONFIG_HOME/buckdesign/parts``, by default under ``~/.config``; on Windows under ``%APPDATA%``.
    """
    base = os.environ.get("APPDATA") if os.name == "nt" else os.environ.get("XDG_CONFIG_HOME")
    root = Path(base) if base else Path.home() / ".config"
    return root / "buckdesign" / "parts"


def _csv_files(folder: Path) -> list[Path]:
    try:
        return sorted(path for path in folder.glob("*.csv") if path.is_file())
    except OSError as error:
        raise FileAccessError(folder, error.strerror or str(error)) from None


def _read_user(path: Path, schemas: Mapping[str, Mapping[str, Column]]) -> tuple[str, list[Row]]:
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError:
        raise TableError(path, None, None, None, "no UTF-8 text; a CSV table is wanted") from None
    except OSError as error:
        raise FileAccessError(path, error.strerror or str(error)) from None
    if "\0" in text:
        raise TableError(path, None, None, None, "a binary file; a CSV table is wanted")
    return read_rows(text, str(path), schemas, {"source": f"user table {path.name}", "how": "user"})


def _row_key(kind: str, row: Row) -> str:
    """Rows of one file with the same key are alternatives; without right to any, they are duplicates."""
    match kind:
        case "inductance factor":
            return f"{name_key(row.values['ring'])}, {name_key(row.values['material'])}"
        case "loss point":
            return name_key(row.values["material"])
        case _:
            return name_key(row.values["name"])


def _distinct(kind: str, row: Row) -> tuple[object, ...]:
    match kind:
        case "inductance factor":
            return (row.values["source"],)
        case "loss point":
            return (row.values["frequency"], row.values["flux_density"])
        case _:
            return ()


def _merge(merged: Mapping[str, dict[str, list[Row]]], kind: str, rows: Iterable[Row]) -> None:
    """Put the rows of one file over what is there, after checking them."""
    faults: list[Fault] = []
    own: dict[str, list[Row]] = {}
    first: dict[tuple[object, ...], int] = {}
    for row in rows:
        key = _row_key(kind, row)
        identity = (key, *_distinct(kind, row))
        if identity in first:
            faults.append(Fault(row.file, row.line, "", key, f"stands in line {first[identity]} already"))
        first.setdefault(identity, row.line)
        for column, value, allowed in broken_rules(kind, row.values):
            faults.append(Fault(row.file, row.line, column, value, allowed))
        own.setdefault(key, []).append(row)
    raise_faults(faults)
    merged[kind].update(own)


def _tables(merged: Mapping[str, Mapping[str, Sequence[Row]]]) -> Tables:
    def named(kind: str, part: Callable[..., _Part]) -> dict[str, _Part]:
        return {rows[-1].values["name"]: part(**rows[-1].values) for rows in merged[kind].values()}

    rings = named("ring", Ring)
    materials = _with_borrowed_losses(named("material", Material))
    ring_names = {name_key(name): name for name in rings}
    material_names = {name_key(name): name for name in materials}
    factors = {}
    for rows in merged["inductance factor"].values():
        found = sorted((InductanceFactor(**row.values) for row in rows), key=_doubt)
        ring = ring_names.get(name_key(found[0].ring), found[0].ring)
        material = material_names.get(name_key(found[0].material), found[0].material)
        factors[ring, material] = tuple(found)
    points = {}
    for rows in merged["loss point"].values():
        measured = tuple(LossPoint(**row.values) for row in rows)
        points[material_names.get(name_key(measured[0].material), measured[0].material)] = measured
    return Tables(
        regulators=named("regulator", Regulator),
        transistors=named("transistor", Transistor),
        rectifiers=named("rectifier", Rectifier),
        capacitors=named("capacitor", Capacitor),
        wires=named("wire", Wire),
        rings=rings,
        materials=materials,
        inductance_factors=factors,
        loss_points=points,
    )


def _doubt(factor: InductanceFactor) -> tuple[bool, bool]:
    return bool(factor.suspect), not factor.how.startswith(("looked up", "measured", "user"))


def _with_borrowed_losses(materials: Mapping[str, Material]) -> dict[str, Material]:
    """The materials with the loss coefficients of the grade named in `loss_as` where their own are absent."""
    filled = {}
    for name, material in materials.items():
        lender = materials.get(material.loss_as)
        if material.loss_coefficients is None and lender is not None:
            material = replace(
                material,
                loss_a=lender.loss_a,
                loss_b=lender.loss_b,
                loss_c=lender.loss_c,
                loss_d=lender.loss_d,
            )
        filled[name] = material
    return filled
