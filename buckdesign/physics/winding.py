"""A winding on a ring: layers through the bore, length of a turn, build-up, copper.

Wires lie side by side against the bore, then on the layer below; nesting between layers is neglected, which
is on
the safe side. Outside the ring there is more room, so fewer layers. The height is that of the whole stack.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import COPPER_DENSITY
from buckdesign.physics.arrays import Flag, Ranges, Real, plain

RANGES: Ranges = {
    "bore_fill": {"by hand": (0.0, 0.45)},
    "wind": {"layers": (1.0, 20.0)},
}
"""Share of the bore that a winding by hand can use; 0.35 is comfortable, 0.45 a full winding of the
catalogues
(common practice, no source)."""

TURN_SLACK = 0.05
"""Surplus length of a real turn, which does not follow the corners (common practice, no source)."""

LEAD_LENGTH = 0.025
"""Length of each lead that stays in the circuit [m] (common practice, no source)."""

CUT_LEAD_LENGTH = 0.075
"""Length of each free end when cutting the wire: the lead, and enough to hold on to [m] (common practice, no
source)."""

MOST_LAYERS = 20
"""Layers beyond which a winding is reported as not fitting; no winding by hand has more (common practice)."""


class Winding(NamedTuple):
    """How wires lie on a ring.

    Attributes
    ----------
    fits : bool or ndarray of bool
        True where all wires pass through the bore.
    layers : float or ndarray
        Layers at the bore, begun ones included [1].
    outside_layers : float or ndarray
        Layers at the outer diameter, begun ones included [1].
    wires_first_layer : float or ndarray
        Wires that the first layer at the bore can hold [1].
    capacity : float or ndarray
        Wires that the bore can hold in all its layers [1].
    mean_turn : float or ndarray
        Mean length of one turn [m], without slack; of those that fit.
    """

    fits: Flag
    layers: Real
    outside_layers: Real
    wires_first_layer: Real
    capacity: Real
    mean_turn: Real


def layer_capacity(bore: Real, wire: Real) -> Real:
    """Wires side by side on the inside of a bore, not rounded, ``pi / asin(d / (D - d))``.

    Parameters
    ----------
    bore : float or ndarray
        Free diameter [m].
    wire : float or ndarray
        Outer wire diameter, enamel included [m].

    Returns
    -------
    float or ndarray
        Number of wires [1]; 1 where only one passes, 0 where none does.

    Notes
    -----
    Derived: circles that touch each other and the bore.

    Examples
    --------
    >>> round(float(layer_capacity(14.5e-3, 1.062e-3)), 4)
    39.7106
    """
    pitch = bore - np.asarray(wire, dtype=float)
    several = pitch >= wire
    sine = np.where(several, wire / np.where(several, pitch, 1.0), 1.0)
    return plain(np.where(several, np.pi / np.arcsin(sine), np.where(pitch >= 0.0, 1.0, 0.0)))


def layer_turn_length(
    outer: Real, inner: Real, height: Real, inside_offset: Real, outside_offset: Real
) -> Real:
    """Length of a turn whose axis lies at given distances from the core's surface.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters of the ring [m].
    height : float or ndarray
        Height of the stack [m].
    inside_offset, outside_offset : float or ndarray
        Distance of the wire's axis from the bore and from the outer face [m].

    Returns
    -------
    float or ndarray
        Length [m].

    Notes
    -----
    Derived: two legs along the height, two over the faces that slope from one offset to the other, four
    quarter
    circles at the corners.

    Examples
    --------
    >>> round(float(layer_turn_length(26.9e-3, 14.5e-3, 11.1e-3, 0.5e-3, 0.5e-3)) * 1e3, 2)
    37.74
    """
    face = np.hypot((outer - inner) / 2.0, inside_offset - outside_offset)
    return 2.0 * (height + face) + np.pi * (inside_offset + outside_offset)


def wind(outer: Real, inner: Real, height: Real, wire: Real, wires: Real) -> Winding:
    """Lay wires on a ring, layer by layer through the bore.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters of the ring [m].
    height : float or ndarray
        Height of the stack [m].
    wire : float or ndarray
        Outer wire diameter, enamel included [m].
    wires : float or ndarray
        Wires through the bore, turns times strands, a whole number [1].

    Returns
    -------
    Winding
        Layers, capacity and mean turn [SI].

    Notes
    -----
    Derived: each layer at the bore takes the whole number below `layer_capacity` of what the layers before
    left
    free; the same wires fill layers on the growing outer diameter, each taking the whole number of diameters
    that its circle holds.

    Examples
    --------
    >>> winding = wind(26.9e-3, 14.5e-3, 11.1e-3, 1.062e-3, 60)
    >>> bool(winding.fits), float(winding.layers), float(winding.wires_first_layer), float(winding.capacity)
    (True, 2.0, 39.0, 142.0)
    """
    far, near, tall, thick, count = (np.asarray(x, dtype=float) for x in (outer, inner, height, wire, wires))
    shape = np.broadcast_shapes(*(x.shape for x in (far, near, tall, thick, count)))
    placed, layers, length = (np.zeros(shape) for _ in range(3))
    capacity = np.zeros(np.broadcast_shapes(near.shape, thick.shape))
    first = np.floor(np.asarray(layer_capacity(near, thick)) + 1e-9)
    outside_layer, outside_room = np.ones(shape), _outside_capacity(far, thick, 1.0)
    for index in range(MOST_LAYERS):
        bore = near - 2.0 * thick * index
        room = np.floor(np.asarray(layer_capacity(bore, thick)) + 1e-9)
        if not np.any(room > 0.0):
            break
        capacity = capacity + room
        now = np.minimum(room, count - placed)
        if np.any(now > 0.0):
            inside, outside = thick * (index + 0.5), thick * (outside_layer - 0.5)
            length = length + now * np.asarray(layer_turn_length(far, near, tall, inside, outside))
            layers, placed = layers + (now > 0.0), placed + now
            full = placed > outside_room
            outside_layer = outside_layer + full
            outside_room = outside_room + np.where(full, _outside_capacity(far, thick, outside_layer), 0.0)
    mean = length / np.where(placed > 0.0, placed, np.nan)
    fields = (placed >= count, layers, outside_layer, first, capacity, mean)
    return Winding(*(plain(np.broadcast_to(x, shape)) for x in fields))


def bore_fill(wires: Real, wire: Real, inner: Real) -> Real:
    """Share of the bore that the wires take, ``N d^2 / D^2``.

    Parameters
    ----------
    wires : float or ndarray
        Wires through the bore, turns times strands [1].
    wire : float or ndarray
        Outer wire diameter, enamel included [m].
    inner : float or ndarray
        Bore [m].

    Returns
    -------
    float or ndarray
        Share [1].

    Notes
    -----
    Derived: ratio of areas.

    Examples
    --------
    >>> round(bore_fill(60, 0.855e-3, 14.5e-3), 6)
    0.208616
    """
    return wires * wire * wire / (inner * inner)


def bore_porosity(wires: Real, layers: Real, diameter: Real, inner: Real, wire: Real) -> Real:
    """Share of a layer's width at the bore that is copper, averaged over the layers.

    Parameters
    ----------
    wires : float or ndarray
        Wires through the bore, turns times strands [1].
    layers : float or ndarray
        Layers at the bore [1].
    diameter : float or ndarray
        Conductor diameter [m].
    inner : float or ndarray
        Bore [m].
    wire : float or ndarray
        Outer wire diameter, enamel included [m].

    Returns
    -------
    float or ndarray
        ``N d / (m pi (D - m d_outer))``, at most 1 [1].

    Notes
    -----
    Derived: conductor diameters over the mean circumference of the layers.

    Examples
    --------
    >>> round(float(bore_porosity(60, 2, 1.0e-3, 14.5e-3, 1.062e-3)), 3)
    0.772
    """
    width = np.pi * np.maximum(inner - layers * wire, wire)
    return np.minimum(wires * diameter / (layers * width), 1.0)


def wire_length(turns: Real, mean_turn: Real, slack: Real = TURN_SLACK, lead: Real = LEAD_LENGTH) -> Real:
    """Length of one strand: in the circuit with the default leads, to cut with `CUT_LEAD_LENGTH`.

    Parameters
    ----------
    turns : float or ndarray
        Turns [1].
    mean_turn : float or ndarray
        Mean length of a turn, tight around the core [m].
    slack : float or ndarray
        Surplus of a real turn, as a fraction [1].
    lead : float or ndarray
        Length of each of the two free ends [m].

    Returns
    -------
    float or ndarray
        ``N l (1 + slack) + 2 lead`` [m].

    Notes
    -----
    Derived; slack and leads are common practice.

    Examples
    --------
    >>> round(wire_length(48, 40e-3), 3)
    2.066
    """
    return turns * mean_turn * (1.0 + slack) + 2.0 * lead


def copper_mass(length: Real, diameter: Real, strands: Real) -> Real:
    """Mass of the copper, enamel neglected.

    Parameters
    ----------
    length : float or ndarray
        Length of each strand [m].
    diameter : float or ndarray
        Conductor diameter [m].
    strands : float or ndarray
        Strands in parallel [1].

    Returns
    -------
    float or ndarray
        Mass [kg].

    References
    ----------
    Density of copper after IEC 60028 (from memory).

    Examples
    --------
    >>> round(copper_mass(2.0, 1.0e-3, 1) * 1e3, 2)
    13.96
    """
    return COPPER_DENSITY * length * np.pi / 4.0 * diameter * diameter * strands


def wound_dimensions(
    outer: Real, inner: Real, height: Real, wire: Real, layers: Real, outside_layers: Real
) -> tuple[Real, Real, Real]:
    """Outer diameter, free bore and height of the wound ring.

    Parameters
    ----------
    outer, inner : float or ndarray
        Diameters of the bare ring [m].
    height : float or ndarray
        Height of the stack [m].
    wire : float or ndarray
        Outer wire diameter [m].
    layers, outside_layers : float or ndarray
        Layers at the bore and at the outer diameter [1].

    Returns
    -------
    tuple of float or ndarray
        Outer diameter, bore (not below zero) and height [m].

    Notes
    -----
    Derived: build-up of the layers, on the faces that of the bore.

    Examples
    --------
    >>> [round(float(x) * 1e3, 2) for x in wound_dimensions(26.9e-3, 14.5e-3, 11.1e-3, 1e-3, 2, 1)]
    [28.9, 10.5, 15.1]
    """
    bore = np.maximum(inner - 2.0 * wire * layers, 0.0)
    return outer + 2.0 * wire * outside_layers, bore, height + 2.0 * wire * layers


def _outside_capacity(
    outer: NDArray[np.float64], wire: NDArray[np.float64], layer: Real
) -> NDArray[np.float64]:
    """Wires that the given layer on the outer diameter holds."""
    circle = outer + wire * (2.0 * np.asarray(layer) - 1.0)
    return np.floor(np.pi / np.arcsin(np.minimum(wire / circle, 1.0)) + 1e-9)
