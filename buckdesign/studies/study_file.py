"""Study files: what is varied, how points are drawn, and what counts as best."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from buckdesign.design.design_file import keyed_design
from buckdesign.design.keys import CountKey, Key, Refused
from buckdesign.design.requirement import requirement_keys
from buckdesign.design.schema import REQUIRED, Reading, listed, read_section
from buckdesign.design.toml_source import TomlSource, read_toml
from buckdesign.errors import quoted
from buckdesign.parts import Tables, load_tables
from buckdesign.studies.axis import Axis
from buckdesign.studies.constraint import Constraint, read_constraint
from buckdesign.studies.result_columns import RESULT_COLUMNS, TRUTH_COLUMNS
from buckdesign.studies.space import MOST_RANDOM, GridSpace, Method, SampledSpace, Space, most_points
from buckdesign.studies.study_keys import Column, fault_unknown, study_columns, unknown_column
from buckdesign.studies.vary_table import VaryReader

DEFAULT_OBJECTIVE = "total_loss_w"
"""What is made small where a study names nothing else (own choice: heat is what a maker pays for)."""

LARGEST_SEED = 2**63 - 1
"""Largest whole number that TOML must be able to hold (TOML 1.0.0, section Integer)."""

_STUDY_KEYS = ("base", "requirement", "vary", "sample", "best")
_BEST_KEYS = ("minimise", "maximise", "subject_to")


@dataclass(frozen=True, kw_only=True)
class Study:
    """A study.

    Attributes
    ----------
    path : pathlib.Path
        The file it was read from.
    base, requirement : pathlib.Path or None
        The design that is varied, or the requirement that is designed anew at each point; one of the two.
    space : Space
        The points.
    minimise, maximise : tuple of str
        Columns that are best small and best large; at least one.
    subject_to : tuple of Constraint
        What the best points keep.
    notes : tuple of str
        What the user should know; empty for most.
    tree : dict
        The study as the file gives it, as plain data that JSON can hold.
    """

    path: Path
    base: Path | None
    requirement: Path | None
    space: Space
    minimise: tuple[str, ...]
    maximise: tuple[str, ...]
    subject_to: tuple[Constraint, ...]
    notes: tuple[str, ...] = ()
    tree: dict[str, Any] = field(default_factory=dict, repr=False)


@dataclass(frozen=True, kw_only=True)
class _WordKey:
    """One of some words."""

    words: tuple[str, ...]

    @property
    def wanted(self) -> str:
        return "one of " + ", ".join(map(quoted, self.words))

    def read(self, raw: Any, tables: Tables | None) -> str:
        if raw not in self.words:
            raise Refused(f"{self.wanted} is wanted")
        return str(raw)

    def write(self, value: str) -> str:
        return value


@dataclass(frozen=True, kw_only=True)
class _SeedKey:
    """A whole number, 0 or more."""

    wanted = f"a whole number from 0 to {LARGEST_SEED}"

    def read(self, raw: Any, tables: Tables | None) -> int:
        if isinstance(raw, bool) or not isinstance(raw, int) or not 0 <= raw <= LARGEST_SEED:
            raise Refused(f"{self.wanted} is wanted")
        return raw

    def write(self, value: int) -> int:
        return value


@dataclass(frozen=True, kw_only=True)
class _Sample:
    """The ``[sample]`` table."""

    method: str = listed(_WordKey(words=tuple(method.value for method in Method)), default=REQUIRED)
    count: int = listed(CountKey(most=MOST_RANDOM), default=REQUIRED)
    seed: int = listed(_SeedKey(), default=1)


def read_study(
    path: Path,
    tables: Tables | None = None,
    columns: Sequence[str] = (*RESULT_COLUMNS, *TRUTH_COLUMNS),
    redesign_columns: Sequence[str] = (),
) -> Study:
    """Read a study file.

    Parameters
    ----------
    path : pathlib.Path
        The file; paths in it are relative to its folder.
    tables : Tables, optional
        Parts that it may name; the tables of the package where omitted.
    columns : sequence of str
        Columns of results that ``[best]`` may name.
    redesign_columns : sequence of str
        Those that it may name beside them where a requirement is designed anew at each point.

    Returns
    -------
    Study
        The study.

    Raises
    ------
    FileAccessError
        The file can't be read.
    FaultsError
        All its faults at once.
    """
    source = read_toml(Path(path))
    known = load_tables() if tables is None else tables
    is_redesign = "requirement" in source.tree and "base" not in source.tree
    if not is_redesign:
        return _study(source, known, "design file", keyed_design(), columns)
    return _study(source, known, "requirement file", requirement_keys(), (*columns, *redesign_columns))


def _study(
    source: TomlSource, tables: Tables, kind: str, keys: Mapping[str, Key], columns: Sequence[str]
) -> Study:
    tree = source.tree
    reading = Reading(path=source.path, locate=source.locate, tables=tables)
    fault_unknown(tree, (), _STUDY_KEYS, reading)
    base, requirement = _subject(tree, reading)
    vary = VaryReader(keys=keys, kind=kind, is_sampled="sample" in tree, reading=reading)
    axes = vary.axes(tree.get("vary"))
    space, notes = _space(tree, axes, reading)
    known = study_columns({name: keys[name] for name in vary.seen}, columns)
    best = _best(tree.get("best", {}), known, reading)
    reading.finish()
    return Study(
        path=source.path,
        base=base,
        requirement=requirement,
        space=space,
        minimise=best.minimise,
        maximise=best.maximise,
        subject_to=best.subject_to,
        notes=(*notes, *best.notes),
        tree=tree,
    )


def _subject(tree: Mapping[str, Any], reading: Reading) -> tuple[Path | None, Path | None]:
    """Paths of the design and of the requirement; one of them is None."""
    given = [name for name in ("base", "requirement") if name in tree]
    if not given:
        allowed = (
            'missing; base = "FILE.design.toml" for a design that is varied, or requirement = "FILE.toml"'
        )
        reading.fault(("base",), None, allowed)
    if len(given) == 2:
        allowed = (
            "either base, a design that is varied, or requirement, designed anew at each point; not both"
        )
        reading.fault(("requirement",), tree["requirement"], allowed)
    paths = {name: _file(name, tree[name], reading) for name in given}
    return paths.get("base"), paths.get("requirement")


def _file(name: str, raw: Any, reading: Reading) -> Path | None:
    if not isinstance(raw, str) or not raw.strip():
        shown = None if isinstance(raw, Mapping) else raw
        reading.fault((name,), shown, "the path of a file in quotes is wanted, from the folder of the study")
        return None
    path = reading.path.parent / raw
    try:
        is_there = path.is_file()
    except (OSError, ValueError):
        is_there = False
    if not is_there:
        reading.fault((name,), raw, "no such file; the path starts from the folder of the study")
    return path


def _space(
    tree: Mapping[str, Any], axes: tuple[Axis, ...], reading: Reading
) -> tuple[Space, tuple[str, ...]]:
    grid = GridSpace(axes=axes)
    if "sample" not in tree:
        return grid, ()
    sample = read_section(_Sample, tree["sample"], ("sample",), reading)
    if sample is None or reading.faults:
        return grid, ()
    method = Method(sample.method)
    most = most_points(method, len(axes))
    if sample.count > most:
        allowed = f"at most {most} for {quoted(method.value)} with {len(axes)} dimensions"
        reading.fault(("sample", "count"), sample.count, allowed)
    space = SampledSpace(axes=axes, method=method, count=sample.count, seed=sample.seed)
    return space, tuple(_sample_notes(space))


def _sample_notes(space: SampledSpace) -> list[str]:
    notes = []
    count = space.count
    if space.method is Method.SOBOL and count & (count - 1):
        below = 1 << (count.bit_length() - 1)
        notes.append(
            f"sample.count = {count} is not a power of two: Sobol points are spread most evenly"
            f" with {below} or {2 * below}"
        )
    combinations = GridSpace(axes=space.axes).count
    if 0 < combinations < count:
        notes.append(
            f"there are only {combinations} combinations for {count} points: without [sample] each is computed once"
        )
    return notes


@dataclass(frozen=True, kw_only=True)
class _Best:
    """The ``[best]`` table."""

    minimise: tuple[str, ...]
    maximise: tuple[str, ...]
    subject_to: tuple[Constraint, ...]
    notes: tuple[str, ...]


def _best(raw: Any, columns: Mapping[str, Column], reading: Reading) -> _Best:
    if not isinstance(raw, Mapping):
        reading.fault(("best",), raw, "a table is wanted: [best]")
        raw = {}
    fault_unknown(raw, ("best",), _BEST_KEYS, reading)
    minimise = _objectives("minimise", raw, columns, reading)
    maximise = _objectives("maximise", raw, columns, reading)
    for name in maximise:
        if name in minimise:
            reading.fault(("best", "maximise"), name, "stands under minimise too; one of the two is wanted")
    notes = []
    if "minimise" not in raw and "maximise" not in raw:
        minimise = (DEFAULT_OBJECTIVE,)
        notes.append(f"no objective is given: {DEFAULT_OBJECTIVE} is minimised")
    return _Best(
        minimise=minimise,
        maximise=maximise,
        subject_to=_constraints(raw, columns, reading),
        notes=tuple(notes),
    )


def _objectives(
    name: str, raw: Mapping[str, Any], columns: Mapping[str, Column], reading: Reading
) -> tuple[str, ...]:
    if name not in raw:
        return ()
    given = raw[name]
    names = given if isinstance(given, list) else [given]
    if not names:
        reading.fault(
            ("best", name), given, "an empty list; the name of a column or a list of names is wanted"
        )
    found: list[str] = []
    for index, one in enumerate(names):
        at = ("best", name, index) if isinstance(given, list) else ("best", name)
        allowed = _refused_objective(one, columns, found)
        if allowed:
            reading.fault(at, None if isinstance(one, Mapping) else one, allowed)
        else:
            found.append(one)
    return tuple(found)


def _refused_objective(name: Any, columns: Mapping[str, Column], before: Sequence[str]) -> str:
    """What is wrong with an objective; empty where nothing is."""
    if not isinstance(name, str):
        return "the name of a column in quotes is wanted"
    if name not in columns:
        return unknown_column(name, columns)
    if name in before:
        return "stands twice"
    return "" if columns[name].unit is not None else "a column of numbers is wanted"


def _constraints(
    raw: Mapping[str, Any], columns: Mapping[str, Column], reading: Reading
) -> tuple[Constraint, ...]:
    given = raw.get("subject_to", [])
    texts = given if isinstance(given, list) else [given]
    found = []
    for index, text in enumerate(texts):
        at = ("best", "subject_to", index) if isinstance(given, list) else ("best", "subject_to")
        try:
            found.append(read_constraint(text, columns, reading.tables))
        except Refused as refused:
            reading.fault(at, None if isinstance(text, Mapping) else text, str(refused))
    return tuple(found)
