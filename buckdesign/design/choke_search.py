"""The choice of a choke among all rings, materials, wires, strands, stacks and turns of the tables."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.choke_columns import Candidates, ChokeColumns, Duty, choke_columns
from buckdesign.design.choke_need import ChokeLimits, ChokeNeed, ChokeSpace, Rank
from buckdesign.design.choke_windings import Windings, evaluate_windings
from buckdesign.errors import InputError
from buckdesign.parts import Tables
from buckdesign.physics.choke import turns_for_biased_inductance

__all__ = [
    "Candidates",
    "ChokeChoice",
    "ChokeColumns",
    "ChokeLimits",
    "ChokeNeed",
    "ChokeSpace",
    "Duty",
    "Rank",
    "Windings",
    "choke_columns",
    "choose_chokes",
    "evaluate_windings",
    "pareto_set",
]

Floats = NDArray[np.float64]

_CHUNK = 100_000
"""Candidates judged at once; keeps the arrays small."""


@dataclass(frozen=True, kw_only=True, eq=False)
class ChokeChoice:
    """The chokes that do the job, best first.

    Attributes
    ----------
    columns : ChokeColumns
        What the indices of `candidates` mean.
    candidates : Candidates
        The acceptable windings, best first; arrays of one length.
    windings : Windings
        What they are and do.
    pareto : ndarray of int
        Those that no other beats in both loss and volume, smallest first.
    evaluated : int
        Windings judged.
    rejected : mapping of str to int
        How many failed each limit; one winding may fail several.
    """

    columns: ChokeColumns
    candidates: Candidates
    windings: Windings
    pareto: NDArray[np.intp]
    evaluated: int
    rejected: Mapping[str, int] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.windings.turns)

    def names(self, at: int) -> tuple[str, str, str]:
        """Names of ring, material and wire of a choke."""
        found, columns = self.candidates, self.columns
        return (
            columns.rings[found.ring[at]].name,
            columns.materials[found.material[at]].name,
            columns.wires[found.wire[at]].name,
        )


def choose_chokes(
    tables: Tables,
    need: ChokeNeed,
    *,
    space: ChokeSpace | None = None,
    limits: ChokeLimits | None = None,
    rank: Rank = Rank.LOSS,
) -> ChokeChoice:
    """All chokes of the tables that do a job, ranked.

    Parameters
    ----------
    tables : Tables
        Rings, materials, wires.
    need : ChokeNeed
        What the choke has to do.
    space : ChokeSpace, optional
        What is searched; everything where omitted. Materials without bias law or loss coefficients are left
        out.
    limits : ChokeLimits, optional
        What is acceptable.
    rank : Rank
        Order of the result.

    Returns
    -------
    ChokeChoice
        Empty where nothing does it; `rejected` then says why.

    Raises
    ------
    UnknownNameError
        A name of the space is in no table.
    InputError
        A number of the space is not a whole one above zero.
    """
    space, limits = space or ChokeSpace(), limits or ChokeLimits()
    columns = choke_columns(tables, space.rings, space.materials, space.wires)
    core = _cores(columns, need, space)
    wire, strands = _wires(columns, space, limits)
    duty, rejected, evaluated = need.as_duty(), dict.fromkeys(_REASONS, 0), 0
    kept: list[tuple[Candidates, Windings]] = []
    rows = max(1, _CHUNK // max(1, len(wire)))
    for start in range(0, len(core.ring), rows):
        some = _grid(core, slice(start, start + rows), wire, strands)
        windings = evaluate_windings(columns, some, duty)
        evaluated += windings.turns.size
        good = _acceptable(columns, some, windings, need, limits, rejected)
        kept.append((_flat(some, windings.turns.shape, good), windings.take(good.ravel())))
    return _ranked(columns, kept, rank, evaluated, rejected)


def pareto_set(first: Floats, second: Floats) -> NDArray[np.intp]:
    """Those that no other beats in both of two quantities to be small.

    Parameters
    ----------
    first, second : ndarray, shape (n,)
        Quantities, such as volume and loss.

    Returns
    -------
    ndarray of int
        Indices, in the order of `first`; of equal ones the first.

    Examples
    --------
    >>> import numpy as np
    >>> pareto_set(np.array([1.0, 2.0, 3.0, 2.5]), np.array([9.0, 5.0, 4.0, 6.0])).tolist()
    [0, 1, 2]
    """
    order = np.lexsort((second, first))
    if len(order) == 0:
        return order
    lowest = np.minimum.accumulate(second[order])
    better = np.concatenate([[True], second[order][1:] < lowest[:-1]])
    return order[better]


_REASONS = (
    "does not pass through the bore",
    "bore too full for winding by hand",
    "core too hot",
    "too little inductance left under bias",
    "outside the bias law",
    "too near to saturation",
    "wire too thin for the current",
)


def _cores(columns: ChokeColumns, need: ChokeNeed, space: ChokeSpace) -> Candidates:
    """Ring, material, stack and the turns they need, one dimension; pairs that cannot do it are left out."""
    stacks = _whole(space.stacks, "stack")
    useful = np.isfinite(columns.material.loss).all(axis=0)
    useful &= np.array([one.kind != "ferrite" and one.bias_field is not None for one in columns.materials])
    pairs = np.broadcast_to(useful, columns.published.shape)
    if not space.unpublished and space.materials is None:
        pairs = pairs & columns.published
    ring, material = np.nonzero(pairs)
    stack = np.repeat(stacks, len(ring))
    ring, material = np.tile(ring, len(stacks)), np.tile(material, len(stacks))
    size, stuff = columns.ring, columns.material
    turns = turns_for_biased_inductance(
        need.inductance,
        columns.factor[ring, material] * stack,
        need.current,
        size.outer[ring],
        size.inner[ring],
        stuff.half_field[material],
        stuff.exponent[material],
    )
    turns = np.ceil(np.asarray(turns) - 1e-9)
    found = np.isfinite(turns)
    return Candidates(
        ring=ring[found], material=material[found], wire=0, stack=stack[found], turns=turns[found]
    )


def _wires(
    columns: ChokeColumns, space: ChokeSpace, limits: ChokeLimits
) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    thin = np.flatnonzero(columns.wire.conductor <= limits.conductor)
    strands = _whole(space.strands, "strands")
    return np.tile(thin, len(strands)), np.repeat(strands, len(thin))


def _whole(values: Sequence[int], name: str) -> NDArray[np.intp]:
    for value in values:
        if value < 1 or not math.isfinite(value) or int(value) != value:
            raise InputError(f"{name} = {value}: a whole number above 0 is wanted")
    return np.array(values, dtype=np.intp)


def _grid(core: Candidates, rows: slice, wire: NDArray[np.intp], strands: NDArray[np.intp]) -> Candidates:
    return Candidates(
        ring=core.ring[rows, None],
        material=core.material[rows, None],
        stack=core.stack[rows, None],
        turns=core.turns[rows, None],
        wire=wire[None, :],
        strands=strands[None, :],
    )


def _acceptable(
    columns: ChokeColumns,
    some: Candidates,
    windings: Windings,
    need: ChokeNeed,
    limits: ChokeLimits,
    rejected: dict[str, int],
) -> NDArray[np.bool_]:
    """Which ones keep all limits; counts those that do not."""
    section = np.pi / 4.0 * np.square(columns.wire.conductor[some.wire]) * some.strands
    passed = (
        windings.fits,
        windings.bore_fill <= limits.bore_fill,
        need.ambient_c + windings.temperature_rise_k <= limits.core_c,
        windings.permeability_fraction >= limits.inductance_fraction,
        windings.field_a_per_m <= columns.material.field_limit[some.material],
        windings.saturation_margin >= limits.saturation_margin,
        need.current <= limits.current_density * section,
    )
    good = np.ones(windings.turns.shape, dtype=bool)
    for reason, fine in zip(_REASONS, passed, strict=True):
        rejected[reason] += int(fine.size - np.count_nonzero(fine))
        good &= fine
    return good


def _flat(some: Candidates, shape: tuple[int, ...], good: NDArray[np.bool_]) -> Candidates:
    values = {one.name: np.broadcast_to(getattr(some, one.name), shape)[good] for one in fields(some)}
    return Candidates(**values)


def _joined(parts: Sequence[Any], order: Any) -> dict[str, Any]:
    names = [one.name for one in fields(parts[0])]
    return {name: np.concatenate([getattr(part, name) for part in parts])[order] for name in names}


def _ranked(
    columns: ChokeColumns,
    kept: Sequence[tuple[Candidates, Windings]],
    rank: Rank,
    evaluated: int,
    rejected: Mapping[str, int],
) -> ChokeChoice:
    if not kept:
        kept = [_nothing(columns)]
    windings = Windings(**_joined([one for _, one in kept], slice(None)))
    loss, size, copper = windings.total_loss_w, windings.volume_m3, windings.copper_kg
    match rank:
        case Rank.LOSS:
            keys = (copper, size, loss)
        case Rank.SIZE:
            keys = (copper, loss, size)
        case Rank.COPPER:
            keys = (size, loss, copper)
    order = np.lexsort(keys)
    windings = windings.take(order)
    return ChokeChoice(
        columns=columns,
        candidates=Candidates(**_joined([one for one, _ in kept], order)),
        windings=windings,
        pareto=pareto_set(windings.volume_m3, windings.total_loss_w),
        evaluated=evaluated,
        rejected=rejected,
    )


def _nothing(columns: ChokeColumns) -> tuple[Candidates, Windings]:
    """No candidate at all, in the shape of some."""
    none = np.zeros(0, dtype=np.intp)
    empty = Candidates(
        permeability=np.ones(0),
        ring=none,
        material=none,
        wire=none,
        strands=none,
        stack=none,
        turns=np.zeros(0),
    )
    numbers = {one.name: np.zeros(0) for one in fields(Windings) if one.name != "fits"}
    return empty, Windings(**numbers, fits=np.zeros(0, dtype=bool))
