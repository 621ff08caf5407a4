"""One winding on one ring, judged for the bench: numbers, what is wrong with it, what to mind."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np

from buckdesign.design.choke_cautions import judge
from buckdesign.design.choke_columns import Candidates, ChokeColumns, Duty, choke_columns
from buckdesign.design.choke_search import ChokeChoice
from buckdesign.design.choke_windings import Windings, evaluate_windings
from buckdesign.design.choke_work import MOST_TURNS, ChokeWork, Made, check_positive
from buckdesign.design.wound_choke import WoundChoke, wound_choke
from buckdesign.errors import InfeasibleError, InputError
from buckdesign.parts import Ring, Tables, Wire
from buckdesign.physics.choke import turns_for_biased_inductance
from buckdesign.physics.winding import layer_capacity

__all__ = [
    "ChokeWork",
    "Made",
    "WindingRequest",
    "WoundChoke",
    "check_wire_passes",
    "wind_choke",
    "wound_chokes",
]


@dataclass(frozen=True, kw_only=True)
class WindingRequest:
    """What is to be wound: turns, or the inductance at the bias current.

    Attributes
    ----------
    core, material, wire : str
        Names in the tables.
    turns : int, optional
        Turns; exclusive with `inductance`.
    inductance : float, optional
        Wanted inductance at the mean current [H].
    strands, stack : int
        Parallel strands, stacked rings.
    permeability : float
        Factor on the material's permeability [1].

    Raises
    ------
    InputError
        A value is not above zero, a number not whole, or both or neither of turns and inductance are given.
    """

    core: str
    material: str
    wire: str
    turns: int | None = None
    inductance: float | None = None
    strands: int = 1
    stack: int = 1
    permeability: float = 1.0

    def __post_init__(self) -> None:
        if self.turns is not None and self.inductance is not None:
            raise InputError("turns and inductance contradict each other: give one of them")
        if self.turns is None and self.inductance is None:
            raise InputError("turns or inductance is wanted")
        for name in ("turns", "strands", "stack"):
            value = getattr(self, name)
            if value is not None and not (1 <= value <= MOST_TURNS and value == int(value)):
                raise InputError(f"{name} = {value}: a whole number from 1 to {MOST_TURNS} is wanted")
        for name in ("inductance", "permeability"):
            check_positive(name, getattr(self, name))


def wind_choke(tables: Tables, request: WindingRequest, work: ChokeWork | None = None) -> WoundChoke:
    """Wind a choke and judge it.

    Parameters
    ----------
    tables : Tables
        Rings, materials, wires.
    request : WindingRequest
        What is to be wound.
    work : ChokeWork, optional
        What it has to do; without, only what does not depend on it is computed.

    Returns
    -------
    WoundChoke
        Numbers, warnings, and faults: limits that are broken.

    Raises
    ------
    UnknownNameError
        Ring, material or wire is in no table.
    InputError
        The wire is thicker than the bore.
    InfeasibleError
        No number of turns reaches the wanted inductance at the current.
    """
    work = work or ChokeWork()
    columns = choke_columns(tables, [request.core], [request.material], [request.wire])
    check_wire_passes(columns.rings[0], columns.wires[0])
    turns = request.turns if request.turns is not None else _turns(columns, request, work)
    candidate = Candidates(
        ring=np.zeros(1, dtype=np.intp),
        material=0,
        wire=0,
        strands=request.strands,
        stack=request.stack,
        turns=turns,
        permeability=request.permeability,
    )
    work = _with_ripple(columns, candidate, work)
    windings = evaluate_windings(columns, candidate, _duty(work))
    return _bench(tables, columns, candidate, windings, 0, work)


def wound_chokes(tables: Tables, choice: ChokeChoice, at: Sequence[int], work: ChokeWork) -> list[WoundChoke]:
    """Chokes of a choice, judged one by one.

    Parameters
    ----------
    tables : Tables
        The tables of the choice.
    choice : ChokeChoice
        What `buckdesign.design.choke_search.choose_chokes` gave.
    at : sequence of int
        Which ones.
    work : ChokeWork
        What they have to do, the same as for the choice.

    Returns
    -------
    list of WoundChoke
        In the order of `at`.
    """
    return [_bench(tables, choice.columns, choice.candidates, choice.windings, int(i), work) for i in at]


def check_wire_passes(ring: Ring, wire: Wire) -> None:
    """Refuse a wire that does not pass through the bore even once.

    Raises
    ------
    InputError
        It is thicker than the bore.
    """
    overall = wire.outer_diameter_grade1
    if not layer_capacity(ring.inner_diameter, overall) >= 1.0:
        raise InputError(
            f"wire {wire.name} ({overall * 1e3:.3g} mm with enamel) is thicker than the bore of {ring.name}, "
            f"{ring.inner_diameter * 1e3:.3g} mm"
        )


def _turns(columns: ChokeColumns, request: WindingRequest, work: ChokeWork) -> int:
    """Whole turns that reach the wanted inductance at the current."""
    factor = float(columns.factor[0, 0]) * request.stack * request.permeability
    ring, stuff = columns.rings[0], columns.material
    is_ferrite = columns.materials[0].kind == "ferrite"
    assert request.inductance is not None
    found = float(
        turns_for_biased_inductance(
            request.inductance,
            factor,
            0.0 if is_ferrite else work.current or 0.0,
            ring.outer_diameter,
            ring.inner_diameter,
            stuff.half_field[0],
            stuff.exponent[0],
        )
    )
    if not found <= MOST_TURNS:
        raise InfeasibleError(
            f"{request.inductance:g} H at {work.current or 0.0:g} A is out of reach of {ring.name} in "
            f"{columns.materials[0].name}: take a larger ring, more of them, or a higher permeability"
        )
    return max(1, math.ceil(found - 1e-9))


def _duty(work: ChokeWork) -> Duty:
    return Duty(
        current=work.current or 0.0,
        ripple=work.ripple or 0.0,
        frequency=work.frequency or 1.0,
        duty=work.duty,
        ambient_c=work.ambient_c,
        worst_current=work.worst_current,
    )


def _with_ripple(columns: ChokeColumns, candidate: Candidates, work: ChokeWork) -> ChokeWork:
    """The work with the ripple that the voltage drives through the biased inductance."""
    if work.voltage is None:
        return work
    assert work.frequency is not None
    biased = float(evaluate_windings(columns, candidate, _duty(work)).inductance_biased_h[0])
    return replace(work, ripple=work.voltage * work.duty / (work.frequency * biased), voltage=None)


def _bench(
    tables: Tables,
    columns: ChokeColumns,
    candidates: Candidates,
    windings: Windings,
    at: int,
    work: ChokeWork,
) -> WoundChoke:
    def one(name: str) -> Any:
        return np.broadcast_to(getattr(candidates, name), windings.turns.shape)[at]

    made = Made(
        ring=columns.rings[one("ring")],
        material=columns.materials[one("material")],
        wire=columns.wires[one("wire")],
        strands=int(one("strands")),
        stack=int(one("stack")),
        permeability=float(one("permeability")),
    )
    numbers = {item.name: float(getattr(windings, item.name)[at]) for item in fields(windings)}
    return wound_choke(made, numbers, work, judge(tables, made, numbers, work))
