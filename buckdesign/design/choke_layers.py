"""How wires lie on rings, tabulated by layer: `buckdesign.physics.winding.wind` for many windings at once.

A winding is then a look-up instead of a walk through the layers. The results are those of `wind`.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from functools import cached_property
from itertools import count
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.physics.winding import MOST_LAYERS, layer_capacity, layer_turn_length

Floats = NDArray[np.float64]

_STRIDE = 1e6
"""More wires than any bore holds; keeps the rows of the table apart in one sorted list."""


@dataclass(frozen=True, kw_only=True, eq=False)
class LayerTable:
    """Layers of one wire on one ring a row; axis 1 is the layer, from the bore's wall inwards.

    Attributes
    ----------
    placed : ndarray, shape (rows, layers)
        Wires in this layer and those before it [1].
    turn : ndarray, shape (rows, layers)
        Length of a turn in this layer on a ring without height [m].
    before : ndarray, shape (rows, layers)
        Length of all turns of the layers before [m].
    outside : ndarray, shape (rows, layers)
        Layer at the outer diameter in which this layer's turns lie [1].
    outside_room : ndarray, shape (rows, layers)
        Wires that the outer diameter holds up to that layer [1].
    """

    placed: Floats
    turn: Floats
    before: Floats
    outside: Floats
    outside_room: Floats

    @cached_property
    def steps(self) -> Floats:
        """All of `placed` in one rising list, the rows a fixed stride apart, to be searched at once."""
        return (self.placed + _STRIDE * np.arange(len(self.placed))[:, None]).ravel()


@dataclass(frozen=True, kw_only=True, eq=False)
class Lay:
    """How the wires of windings lie.

    Attributes
    ----------
    fits : ndarray of bool
        All wires pass through the bore.
    layers, outside_layers : ndarray
        Begun layers at the bore and outside [1].
    first : ndarray
        Wires that the first layer holds [1].
    capacity : ndarray
        Wires that the bore holds [1].
    mean_turn : ndarray
        Mean length of a turn, without slack, of those that fit [m]; NaN where none does.
    """

    fits: NDArray[np.bool_]
    layers: Floats
    outside_layers: Floats
    first: Floats
    capacity: Floats
    mean_turn: Floats


def layer_table(outer: Floats, inner: Floats, wire: Floats) -> LayerTable:
    """Tabulate the layers of wires on rings.

    Parameters
    ----------
    outer, inner : ndarray, shape (rows,)
        Diameters of the ring [m].
    wire : ndarray, shape (rows,)
        Overall diameter of the wire [m].

    Returns
    -------
    LayerTable
        At most `MOST_LAYERS` layers a row.
    """
    bores = inner[:, None] - 2.0 * wire[:, None] * np.arange(MOST_LAYERS)
    room = np.floor(np.asarray(layer_capacity(bores, wire[:, None])) + 1e-9)
    placed = np.cumsum(room, axis=1)
    outside, outside_room = _outside_layers(outer, wire, placed)
    inside_offset = wire[:, None] * (np.arange(MOST_LAYERS) + 0.5)
    turn = np.asarray(
        layer_turn_length(outer[:, None], inner[:, None], 0.0, inside_offset, wire[:, None] * (outside - 0.5))
    )
    total = np.cumsum(room * turn, axis=1)
    return LayerTable(
        placed=placed, turn=turn, before=total - room * turn, outside=outside, outside_room=outside_room
    )


def lay_wires(table: LayerTable, row: Any, height: Any, wires: Any) -> Lay:
    """Look up how wires lie.

    Parameters
    ----------
    table : LayerTable
        Rings and wires.
    row : ndarray of int
        Row of the table for each winding.
    height : ndarray
        Height of the stack [m].
    wires : ndarray
        Wires through the bore, turns times strands [1].

    Returns
    -------
    Lay
        In the shape that the arguments broadcast to, or one that broadcasts to it.
    """
    wanted = np.asarray(wires, dtype=float)
    capacity = table.placed[row, -1]
    inside = np.minimum(wanted, capacity)
    levels = table.placed.shape[1]
    found = np.searchsorted(table.steps, inside + _STRIDE * np.asarray(row)) - np.asarray(row) * levels
    at = np.clip(found, 0, levels - 1)
    turn = table.turn[row, at]
    below = np.where(at > 0, table.placed[row, np.maximum(at - 1, 0)], 0.0)
    length = table.before[row, at] + (inside - below) * turn
    some = inside > 0.0
    mean = np.where(some, length / np.where(some, inside, 1.0), np.nan) + 2.0 * np.asarray(height)
    return Lay(
        fits=wanted <= capacity,
        layers=np.where(some, at + 1.0, 0.0),
        outside_layers=table.outside[row, at] + (inside > table.outside_room[row, at]),
        first=table.placed[row, 0],
        capacity=capacity,
        mean_turn=mean,
    )


def wires_by_layer(outer: float, inner: float, wire: float, wires: int) -> tuple[list[int], list[int]]:
    """Wires in each layer of one winding.

    Parameters
    ----------
    outer, inner : float
        Diameters of the ring [m].
    wire : float
        Overall diameter of the wire [m].
    wires : int
        Wires through the bore; those that do not fit are left out.

    Returns
    -------
    tuple of list of int
        At the bore, from its wall inwards, and at the outer diameter, outwards.
    """
    table = layer_table(np.array([outer]), np.array([inner]), np.array([wire]))
    rooms = np.diff(table.placed[0], prepend=0.0)
    inside = _shared_out(wires, (float(room) for room in rooms))
    circles = (float(_circle_capacity(np.array(outer), np.array(wire), np.array(k))) for k in count(1.0))
    return inside, _shared_out(sum(inside), circles)


def _shared_out(wires: int, rooms: Iterable[float]) -> list[int]:
    left, found = wires, []
    for room in rooms:
        if left <= 0:
            break
        found.append(min(left, int(room)))
        left -= found[-1]
    return [number for number in found if number > 0]


def _outside_layers(outer: Floats, wire: Floats, placed: Floats) -> tuple[Floats, Floats]:
    """Layer at the outer diameter for each layer at the bore, and the wires that fit up to it."""
    layer = np.ones_like(outer)
    room = _circle_capacity(outer, wire, layer)
    layers, rooms = np.empty_like(placed), np.empty_like(placed)
    for index in range(placed.shape[1]):
        layers[:, index], rooms[:, index] = layer, room
        full = placed[:, index] > room
        layer = layer + full
        room = room + np.where(full, _circle_capacity(outer, wire, layer), 0.0)
    return layers, rooms


def _circle_capacity(outer: Floats, wire: Floats, layer: Floats) -> Floats:
    circle = outer + wire * (2.0 * layer - 1.0)
    return np.floor(np.pi / np.arcsin(np.minimum(wire / circle, 1.0)) + 1e-9)
