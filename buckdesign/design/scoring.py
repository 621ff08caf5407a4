"""How well simulated candidates keep a requirement, as numbers to rank by.

Everything is an array with the candidate leading and the operating point last.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.requirement import Requirement
from buckdesign.loop.results import REGIMES, SteadyStates

Floats = NDArray[np.float64]

SAFETY = 0.12
"""Margin that the search wants on ripple and frequency band [1]: what temperature and parts take away."""

TOLERANCE_SHARE = 0.5
"""Share of the output tolerance that the switching itself may take [1]."""

EFFICIENCY_SAFETY = 0.008
"""Margin that the search wants on efficiency [1]."""

START_WANTED = 1.5
"""Start margin that a design must have [1]."""

START_SAFE = 1.8
"""Start margin that the search wants [1]."""

SMALL_POWER = 3.0
"""Power that is added to the output when losses are weighed [W]: of little power a larger share may be
lost."""

CEILING = 10.0
"""Most that one violation counts [1]."""

_LINEAR = REGIMES.index("linear")
_BAD = tuple(REGIMES.index(name) for name in ("stuck", "dropout", "overload"))


@dataclass(frozen=True, kw_only=True)
class PointGrid:
    """Operating points of the search, arrays of shape (p,).

    Attributes
    ----------
    supply, load : ndarray
        [V], [A].
    is_cold : ndarray of bool
        At the lowest instead of the highest ambient.
    """

    supply: Floats
    load: Floats
    is_cold: NDArray[np.bool_]

    def __len__(self) -> int:
        return len(self.supply)


def point_grid(supplies: Sequence[float], loads: Sequence[float], *, is_cold: bool = False) -> PointGrid:
    """All combinations of supplies [V] and loads [A], at the highest or the lowest ambient."""
    supply, load = (axis.ravel() for axis in np.meshgrid(supplies, loads, indexing="ij"))
    return PointGrid(
        supply=np.asarray(supply, dtype=float),
        load=np.asarray(load, dtype=float),
        is_cold=np.full(supply.shape, is_cold),
    )


def joined_points(parts: Sequence[PointGrid]) -> PointGrid:
    """Several grids as one."""
    return PointGrid(
        **{one.name: np.concatenate([getattr(part, one.name) for part in parts]) for one in fields(PointGrid)}
    )


@dataclass(frozen=True, kw_only=True)
class Behaviour:
    """What candidates do at the points, shape (n, p).

    Attributes
    ----------
    ripple, output, frequency, efficiency : ndarray
        [V], [V], [Hz], [1].
    regime : ndarray
        Index into the regimes.
    is_regular : ndarray of bool
        One cycle a period, or none.
    active_fraction : ndarray
        [1].
    peak, drive : ndarray
        Largest choke and regulator current [A].
    """

    ripple: Floats
    output: Floats
    frequency: Floats
    efficiency: Floats
    regime: Floats
    is_regular: NDArray[np.bool_]
    active_fraction: Floats
    peak: Floats
    drive: Floats

    def take(self, at: NDArray[np.intp] | NDArray[np.bool_]) -> Behaviour:
        """That of some of the candidates."""
        return Behaviour(**{one.name: getattr(self, one.name)[at] for one in fields(self)})


def behaviour(loop: SteadyStates, added_loss: Floats, points: int) -> Behaviour:
    """Behaviour from steady states in the order candidate by point.

    Parameters
    ----------
    loop : SteadyStates
        n p results, the point fastest.
    added_loss : ndarray
        Loss that the loop leaves out [W], shape (n p,).
    points : int
        p.

    Returns
    -------
    Behaviour
        Arrays of shape (n, p).
    """

    def shaped(values: Floats) -> Floats:
        return values.reshape(-1, points)

    power, spent = loop.column("load_w"), loop.column("input_w") + added_loss
    period = loop.column("period_cycles")
    return Behaviour(
        ripple=shaped(loop.column("output_max_v") - loop.column("output_min_v")),
        output=shaped(loop.column("output_voltage_v")),
        frequency=shaped(loop.column("frequency_hz")),
        efficiency=shaped(np.where(spent > 0.0, power / np.maximum(spent, 1e-12), 0.0)),
        regime=shaped(loop.column("regime")),
        is_regular=np.isin(shaped(period), (0.0, 1.0)),
        active_fraction=shaped(loop.column("active_fraction")),
        peak=shaped(loop.column("choke_max_a")),
        drive=shaped(loop.column("regulator_max_a")),
    )


@dataclass(frozen=True, kw_only=True)
class Violations:
    """By how much candidates violate each line of the requirement, relative; 0: it holds; shape (n,).

    Attributes
    ----------
    ripple, output, frequency_low, frequency_high, efficiency, regular, start, regime : ndarray
        [1].
    """

    ripple: Floats
    output: Floats
    frequency_low: Floats
    frequency_high: Floats
    efficiency: Floats
    regular: Floats
    start: Floats
    regime: Floats

    @property
    def total(self) -> Floats:
        """Sum over the lines, each limited [1]."""
        return np.sum([np.minimum(getattr(self, one.name), CEILING) for one in fields(self)], axis=0)

    def take(self, at: NDArray[np.intp]) -> Violations:
        """Those of some of the candidates."""
        return Violations(**{one.name: getattr(self, one.name)[at] for one in fields(self)})

    def without(self, name: str) -> Floats:
        """Sum over all lines but one [1]."""
        return self.total - np.minimum(getattr(self, name), CEILING)


def violations(
    requirement: Requirement, points: PointGrid, found: Behaviour, start: Floats, *, safe: bool
) -> Violations:
    """Compare behaviour with a requirement.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    points : PointGrid
        Where the candidates were simulated.
    found : Behaviour
        What they do there.
    start : ndarray
        Start margins, shape (n,).
    safe : bool
        Whether the margins that the search wants are demanded as well.

    Returns
    -------
    Violations
        Relative distances beyond the limits.
    """
    output, limits = requirement.output, requirement.limits
    full = points.load >= output.current_max * (1.0 - 1e-9)
    upper = points.load >= 0.5 * output.current_max * (1.0 - 1e-9)
    slack = 1.0 - SAFETY if safe else 1.0
    share = TOLERANCE_SHARE if safe else 1.0
    none = np.zeros(len(start))
    low, high, efficiency = none, none, none
    if limits.frequency is not None:
        rate = found.frequency[:, upper]
        low = _beyond(limits.frequency[0] / slack / np.maximum(rate.min(axis=1), 1.0))
        high = _beyond(rate.max(axis=1) / (limits.frequency[1] * slack))
    if limits.efficiency is not None:
        wanted = limits.efficiency + (EFFICIENCY_SAFETY if safe else 0.0)
        efficiency = np.maximum(wanted - found.efficiency[:, full].min(axis=1), 0.0) * 10.0
    deviation = np.abs(found.output / output.voltage - 1.0).max(axis=1)
    wanted_start = START_SAFE if safe else START_WANTED
    irregular = np.zeros(len(start)) if not limits.regular else (~found.is_regular).mean(axis=1)
    return Violations(
        ripple=_beyond(found.ripple.max(axis=1) / (output.ripple * slack)),
        output=_beyond(deviation / (output.tolerance * share)),
        frequency_low=low,
        frequency_high=high,
        efficiency=efficiency,
        regular=irregular,
        start=_beyond(wanted_start / np.maximum(start, 1e-3)),
        regime=_bad_regimes(found, upper),
    )


def _beyond(ratio: Floats) -> Floats:
    return np.maximum(ratio - 1.0, 0.0)


def _bad_regimes(found: Behaviour, upper: NDArray[np.bool_]) -> Floats:
    """Share of points that regulate without oscillating or not at all, or stay linear from half load on."""
    bad = np.isin(found.regime, _BAD) | (upper[None, :] & (found.regime == _LINEAR))
    return 3.0 * bad.mean(axis=1) + 1.0 * bad.any(axis=1)


def loss_unit(requirement: Requirement) -> float:
    """Loss that counts 1 in every rank: 2 % of the output power and of a few watts besides [W]."""
    return 0.02 * (requirement.output.voltage * requirement.output.current_max + SMALL_POWER)


def comfort(requirement: Requirement, points: PointGrid, found: Behaviour) -> Floats:
    """Cost of what is allowed but not liked, shape (n,).

    Loss at full load in units of `loss_unit`; irregular or multi-cycle oscillation from half load on up to
    0.6; a drive-limited transistor up to 0.5; a rate below 8 kHz and ripple above 1 % of the output 0.5 an
    octave.
    """
    full = points.load >= requirement.output.current_max * (1.0 - 1e-9)
    upper = points.load >= 0.5 * requirement.output.current_max * (1.0 - 1e-9)
    output = requirement.output
    efficiency = np.maximum(found.efficiency[:, full], 0.05)
    power = output.voltage * output.current_max
    loss = power * (1.0 / efficiency - 1.0).mean(axis=1) / loss_unit(requirement)
    rippling = np.maximum(np.log2(np.maximum(found.ripple.max(axis=1), 1e-6) / (0.01 * output.voltage)), 0.0)
    rough = 0.6 * (~found.is_regular[:, upper]).mean(axis=1)
    limited = np.minimum(found.active_fraction[:, upper].max(axis=1), 0.5)
    slow = np.maximum(np.log2(8e3 / np.maximum(found.frequency[:, upper].min(axis=1), 1.0)), 0.0)
    return loss + rough + limited + 0.5 * slow + 0.5 * rippling
