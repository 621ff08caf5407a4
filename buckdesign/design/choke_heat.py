"""Copper loss and temperature of wound rings, which depend on each other."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from buckdesign.constants import COPPER_REFERENCE_C, COPPER_TEMPERATURE_COEFFICIENT
from buckdesign.physics.convection import ring_heat_flow
from buckdesign.physics.thermal import ring_rise_surface_rule
from buckdesign.physics.wire import (
    foil_height,
    layer_factor,
    ripple_copper_loss,
    round_wire_factor,
    skin_depth,
)

Floats = NDArray[np.float64]

HARMONICS = 5
"""Harmonics of the ripple that get a resistance factor of their own; the rest takes that of the last."""

HOTTEST_C = 200.0
"""Temperature up to which the resistance of copper follows its straight line [degC]
(`buckdesign.physics.wire.RANGES`); a hotter winding is judged with the resistance it has there."""

_FLOW_SLOPE = 1.2
_STEPS = 3
_ROUNDS = 4
_LEAST_RISE = 1e-6
_LEAST_LOSS = 1e-9
_THICKEST = 400.0


@dataclass(frozen=True, kw_only=True, eq=False)
class CopperGeometry:
    """What the resistance of a winding at high frequency depends on.

    Attributes
    ----------
    resistance : ndarray
        DC resistance at 20 degC [ohm].
    conductor : ndarray
        Diameter of the copper [m].
    layers : ndarray
        Layers at the bore [1].
    porosity : ndarray
        Share of a layer's width at the bore that is copper [1].
    """

    resistance: Floats
    conductor: Floats
    layers: Floats
    porosity: Floats


@dataclass(frozen=True, kw_only=True, eq=False)
class Heat:
    """Copper loss and rise of windings in thermal equilibrium.

    Attributes
    ----------
    copper : ndarray
        Copper loss at the temperature of the winding, ripple included [W].
    copper_ripple : ndarray
        Its part that the ripple makes [W].
    rise_surface_rule, rise_convection : ndarray
        Rise by the makers' surface rule and by convection and radiation, of the same loss [K].
    """

    copper: Floats
    copper_ripple: Floats
    rise_surface_rule: Floats
    rise_convection: Floats

    @property
    def rise(self) -> Floats:
        """The larger of the two rises [K]."""
        return np.maximum(self.rise_surface_rule, self.rise_convection)

    @property
    def rise_low(self) -> Floats:
        """The smaller of the two rises [K]."""
        return np.minimum(self.rise_surface_rule, self.rise_convection)


def settle(
    copper: Callable[[Floats], tuple[Floats, Floats]],
    core_loss: Floats,
    surface: Floats,
    diameter: Floats,
    ambient_c: Floats,
) -> Heat:
    """Find the temperature at which losses and heat flow balance.

    Parameters
    ----------
    copper : callable
        Gives, for a temperature [degC], the copper loss [W] and the part of it that the ripple makes, as
        a function of temperature; called a few times.
    core_loss : ndarray
        Core loss [W].
    surface, diameter : ndarray
        Surface [m2] and outer diameter [m] of the wound ring.
    ambient_c : ndarray
        Air [degC].

    Returns
    -------
    Heat
        Losses and both rises.

    Notes
    -----
    The heat flow is nearly a power of the rise, so a few steps in its logarithm settle it; the loss by the
    ripple depends little on temperature and is renewed between the rounds only. Within 1e-5 of the fixed
    point where the rise is below 100 K.
    """
    rise = np.zeros(np.broadcast_shapes(np.shape(core_loss), np.shape(surface), np.shape(ambient_c)))
    celsius = ambient_c + rise
    natural: Floats | None = None
    for _ in range(_ROUNDS):
        total_copper, ripple_part = copper(celsius)
        cold = (total_copper - ripple_part) / copper_warmth(celsius)
        for _ in range(_STEPS):
            loss = core_loss + cold * copper_warmth(celsius) + ripple_part
            rule = np.asarray(ring_rise_surface_rule(loss, surface))
            natural = np.maximum(rule if natural is None else natural, _LEAST_RISE)
            flow = np.asarray(ring_heat_flow(natural, surface, diameter, ambient_c))
            natural = natural * (np.maximum(loss, _LEAST_LOSS) / flow) ** (1.0 / _FLOW_SLOPE)
            rise = np.maximum(rule, natural)
            celsius = np.minimum(ambient_c + rise, HOTTEST_C)
    assert natural is not None
    return Heat(
        copper=cold * copper_warmth(celsius) + ripple_part,
        copper_ripple=ripple_part,
        rise_surface_rule=rule,
        rise_convection=natural,
    )


def copper_losses(
    geometry: CopperGeometry, current: Floats, ripple: Floats, frequency: Floats, duty: Floats
) -> Callable[[Floats], tuple[Floats, Floats]]:
    """The copper loss of windings as a function of temperature.

    Parameters
    ----------
    geometry : CopperGeometry
        Windings.
    current, ripple : ndarray
        Mean current and ripple, peak to peak [A].
    frequency, duty : ndarray
        Frequency [Hz] and share of the period in which the current rises [1].

    Returns
    -------
    callable
        For a temperature [degC], the copper loss and its part by the ripple [W].

    Notes
    -----
    Skin and proximity effect act on the harmonics of the ripple only: the larger of the isolated round wire
    and the layer factor, as `buckdesign.physics.wire.winding_factor`, with the Bessel functions tabulated.
    """
    order = np.arange(1, HARMONICS + 1)

    def loss(celsius: Floats) -> tuple[Floats, Floats]:
        warm = geometry.resistance * copper_warmth(celsius)
        depth = np.asarray(skin_depth(frequency, celsius))[..., None] / np.sqrt(order)
        ratio = geometry.conductor[..., None] / depth
        height = foil_height(ratio, 1.0, geometry.porosity[..., None])
        layered = layer_factor(height, geometry.layers[..., None])
        factors = np.maximum(layered, tabulated_round_wire_factor(ratio))
        swing = np.asarray(ripple_copper_loss(warm, ripple, duty, factors))
        return np.square(current) * warm + swing, swing

    return loss


def tabulated_round_wire_factor(ratio: Floats) -> Floats:
    """`buckdesign.physics.wire.round_wire_factor` by interpolation, hundreds of times faster.

    Parameters
    ----------
    ratio : ndarray
        Conductor diameter over skin depth, up to 400 [1].

    Returns
    -------
    ndarray
        AC over DC resistance of an isolated round wire [1]; within 2e-5.
    """
    grid, values = _round_wire_table()
    return np.interp(ratio, grid, values)


def copper_warmth(celsius: Floats) -> Floats:
    """Resistance of copper at a temperature [degC] over that at 20 degC."""
    return 1.0 + COPPER_TEMPERATURE_COEFFICIENT * (celsius - COPPER_REFERENCE_C)


@cache
def _round_wire_table() -> tuple[Floats, Floats]:
    grid = np.concatenate([np.linspace(0.0, 20.0, 4001), np.linspace(20.0, _THICKEST, 2001)[1:]])
    return grid, np.asarray(round_wire_factor(grid, 1.0))
