"""What a sweep computes: the points of a study as rows of a table, and all that these depend on."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from buckdesign import __version__
from buckdesign.design.design_file import read_design
from buckdesign.design.keys import CountKey, FlagKey, Key, PairKey, QuantityKey, SpreadKey
from buckdesign.design.requirement import read_requirement
from buckdesign.errors import InputError
from buckdesign.parts import Tables, load_tables
from buckdesign.studies.chunks import ChunkSizes, Work
from buckdesign.studies.point_model import PointModel
from buckdesign.studies.redesign_model import CHOSEN, CHOSEN_NAMES, WORST, RedesignModel
from buckdesign.studies.result_columns import RESULT_COLUMNS, TEXT_COLUMNS, TRUTH_COLUMNS
from buckdesign.studies.space import SampledSpace
from buckdesign.studies.study_file import Study, read_study
from buckdesign.studies.study_keys import Column, study_columns
from buckdesign.studies.sweep_summary import Objectives
from buckdesign.studies.table_file import LIST_SEPARATOR, Kind
from buckdesign.units import format_quantity

MOST_POINTS = 1_000_000
"""Points that a sweep computes without being asked twice (own choice: some minutes)."""

MOST_REDESIGNS = 500
"""The same where each point is designed anew (own choice: some minutes)."""

REDESIGN_CHUNKS = ChunkSizes(first=1, rest=4)
"""Points that are designed together: few, since each takes seconds (own choice)."""

HEATED_COLUMNS = tuple(name for name in RESULT_COLUMNS if name == "choke_c" or name.startswith("junction_c."))
"""Columns that the electrical model alone does not have."""

_SAID = ("violated", "failure")
_TRUTHS = (*TRUTH_COLUMNS, "constraints_hold")


@dataclass(frozen=True, kw_only=True)
class SweepTask:
    """A study ready to be computed.

    Attributes
    ----------
    study : Study
        The study.
    work : Work
        Its points.
    kinds : Mapping
        What each column of the table holds, in order.
    units : Mapping
        Unit of each column as `buckdesign.units` names it, for those that have one.
    content : Mapping
        All that the table depends on, as plain data.
    sizes : ChunkSizes
        Points computed together.
    electrical_only : bool
        Without temperatures and losses added on.
    """

    study: Study
    work: Work
    kinds: Mapping[str, Kind]
    units: Mapping[str, str]
    content: Mapping[str, Any]
    sizes: ChunkSizes
    electrical_only: bool = False

    @property
    def objectives(self) -> Objectives:
        """What the study looks for."""
        study = self.study
        return Objectives(
            minimise=study.minimise,
            maximise=study.maximise,
            subject_to=tuple(one.text for one in study.subject_to),
            compared=tuple(one.key for one in study.subject_to if self.kinds[one.key] == "float"),
        )

    @property
    def has_requirement(self) -> bool:
        """Whether points are judged against a requirement as well as the limits of their parts."""
        return "requirement" in self.content or "requirement" in self.content["design"]

    def shown_text(self, name: str, text: str) -> str:
        """A text of the table as a reader wants it: quantities in a list with their unit.

        Parameters
        ----------
        name : str
            Column.
        text : str
            What stands in it.

        Returns
        -------
        str
            The same where it is no list of quantities.
        """
        keys = {one.name: one.key for axis in self.study.space.axes for one in axis.varied}
        key = keys.get(name)
        if isinstance(key, SpreadKey):
            units = [key.each.unit] * len(key.names)
        elif isinstance(key, PairKey):
            units = [key.first.unit, key.second.unit]
        else:
            return text
        numbers = text.split(LIST_SEPARATOR)
        return ", ".join(format_quantity(float(one), unit) for one, unit in zip(numbers, units, strict=True))

    def default_output(self) -> Path:
        """The table where none is named: beside the study, ``rail.study.toml`` gives ``rail.study.csv``."""
        return self.study.path.with_name(self.study.path.name.removesuffix(".toml") + ".csv")


def sweep_task(
    study: Path | Study, tables: Tables | None = None, *, electrical_only: bool = False
) -> SweepTask:
    """Make a study ready to be computed.

    Parameters
    ----------
    study : pathlib.Path or Study
        The file, or what was read from it.
    tables : Tables, optional
        Parts that it names; the tables of the package where omitted.
    electrical_only : bool
        No temperatures and no losses added on.

    Returns
    -------
    SweepTask
        For `run_sweep`.

    Raises
    ------
    InputError
        A file has faults, or a requirement is to be designed without temperatures.
    """
    known = load_tables() if tables is None else tables
    redesign = (*WORST, *(f"values.{name}" for name in CHOSEN))
    results = (*RESULT_COLUMNS, *TRUTH_COLUMNS)
    asked = study if isinstance(study, Study) else read_study(Path(study), known, results, redesign)
    if electrical_only:
        _check_electrical(asked)
    content: dict[str, Any] = {"study": _told_rows(asked.tree), "electrical_only": electrical_only}
    if asked.requirement is not None:
        wanted = read_requirement(asked.requirement, known)
        work: Work = RedesignModel(wanted, asked.space, known, subject_to=asked.subject_to)
        content["requirement"] = wanted.tree()
    else:
        assert asked.base is not None
        base = read_design(asked.base, known)
        work = PointModel(
            base, asked.space, known, subject_to=asked.subject_to, electrical_only=electrical_only
        )
        content["design"] = base.tree()
    varied = {one.name: one.key for axis in asked.space.axes for one in axis.varied}
    columns = study_columns(varied, [*RESULT_COLUMNS, *(redesign if asked.requirement is not None else ())])
    return SweepTask(
        study=asked,
        work=work,
        kinds={name: _kind(name, varied) for name in work.columns},
        units={name: _unit(one) for name, one in columns.items() if one.unit is not None},
        content=content | _versions(known, asked),
        sizes=ChunkSizes() if asked.requirement is None else REDESIGN_CHUNKS,
        electrical_only=electrical_only,
    )


def _check_electrical(study: Study) -> None:
    if study.requirement is not None:
        raise InputError("--electrical-only: a study that designs anew at each point needs the temperatures")
    asked = (*study.minimise, *study.maximise, *(one.key for one in study.subject_to))
    missing = [name for name in dict.fromkeys(asked) if name in HEATED_COLUMNS]
    if missing:
        named = ", ".join(missing)
        raise InputError(f"{study.path}: [best] asks for {named}, which --electrical-only does not compute")


def _told_rows(tree: Mapping[str, Any]) -> dict[str, Any]:
    """A study without what its rows do not depend on: the same table may be looked at for other aims."""
    best = {name: value for name, value in tree.get("best", {}).items() if name == "subject_to"}
    return {name: value for name, value in tree.items() if name != "best"} | ({"best": best} if best else {})


def _unit(column: Column) -> str:
    if column.unit == "%" and column.key is None and not column.is_share:
        return "1"
    known = {("m3", 6): "cm3", ("m", 3): "mm"}
    return known.get((str(column.unit), column.power), str(column.unit))


def _kind(name: str, varied: Mapping[str, Key]) -> Kind:
    key = varied.get(name)
    if key is not None:
        if isinstance(key, QuantityKey):
            return "float"
        return "int" if isinstance(key, CountKey) else "bool" if isinstance(key, FlagKey) else "text"
    if name in _TRUTHS:
        return "bool"
    words = name in (*TEXT_COLUMNS, *_SAID) or name.removeprefix("values.") in CHOSEN_NAMES
    return "text" if words else "float"


def _versions(tables: Tables, study: Study) -> dict[str, Any]:
    """What else the values depend on."""
    digest = hashlib.sha256(repr(tables).encode()).hexdigest()[:16]
    found = {"buckdesign": __version__, "part_tables": digest}
    if isinstance(study.space, SampledSpace):
        import scipy

        found["scipy"] = scipy.__version__
    return found


def check_size(task: SweepTask, allow: int | None) -> None:
    """Refuse a study that is larger than one would expect.

    Parameters
    ----------
    task : SweepTask
        The study.
    allow : int, optional
        Points that are allowed.

    Raises
    ------
    InputError
        It has more points; says how many.
    """
    redesigns = task.study.requirement is not None
    most = allow if allow is not None else MOST_REDESIGNS if redesigns else MOST_POINTS
    count = task.work.count
    if count > most:
        raise InputError(
            f"{task.study.path}: {count:,} points, more than {most:,}; --allow {count} computes them all"
        )
