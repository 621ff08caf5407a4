"""Which value the spread of a margin comes from: Sobol' indices.

Values that hardly move any margin by themselves are held at their nominal value, the others vary together. A
polynomial fitted to units drawn before, whose indices are known, takes most of the chance out of the estimate.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from buckdesign.errors import InputError
from buckdesign.studies.response import Response
from buckdesign.studies.spreads import factors_at
from buckdesign.studies.tolerance_keys import Varied
from buckdesign.studies.unit_runs import Factors

Floats = NDArray[np.float64]

HELD_SHARE = 0.002
"""Share of the squared moves of a margin below which a value is held [1] (own choice)."""

MOST_VALUES = 16
"""Most values that vary [1] (own choice)."""

RESAMPLES = 200
"""Resamples for the intervals [1] (common practice)."""

LEAST_MARGIN = -1.0
"""Margins below count as this [1] (own choice: far beyond its limit a value says nothing any more)."""


@dataclass(frozen=True, kw_only=True)
class Sensitivity:
    """Shares of the variance of margins.

    Attributes
    ----------
    names : tuple of str
        Requirements.
    keys, held : tuple of str
        Values that vary, and those held at nominal because they hardly matter.
    samples : int
        Base samples [1]; ``(keys + 2) * samples`` units were computed.
    first, first_low, first_high : NDArray
        Share of the variance that a value causes alone, and its 95 % interval [1], shape (names, keys).
    total, total_low, total_high : NDArray
        The same with everything it takes part in [1].
    variance : NDArray
        Of each margin [1], shape (names,).
    """

    names: tuple[str, ...]
    keys: tuple[str, ...]
    held: tuple[str, ...]
    samples: int
    first: Floats
    first_low: Floats
    first_high: Floats
    total: Floats
    total_low: Floats
    total_high: Floats
    variance: Floats

    def order(self, name: str) -> list[int]:
        """Places of the values by total index, the largest first."""
        return [int(one) for one in np.argsort(-self.total[self.names.index(name)], kind="stable")]

    def to_dict(self) -> dict[str, Any]:
        """The indices by requirement and key, for JSON."""
        return {
            "samples": self.samples,
            "held_at_nominal": list(self.held),
            "requirements": {
                name: {
                    "variance": float(self.variance[row]),
                    "values": {self.keys[place]: self._entry(row, place) for place in self.order(name)},
                }
                for row, name in enumerate(self.names)
            },
        }

    def _entry(self, row: int, place: int) -> dict[str, float]:
        names = ("first", "first_low", "first_high", "total", "total_low", "total_high")
        return {name: float(getattr(self, name)[row, place]) for name in names}


def values_that_matter(varied: Sequence[Varied], moved: Floats) -> tuple[tuple[Varied, ...], tuple[str, ...]]:
    """Values worth varying, and the keys of the others.

    Parameters
    ----------
    varied : sequence of Varied
        All values.
    moved : NDArray
        How far each moves each margin by itself [1], shape (names, keys).

    Returns
    -------
    tuple
        The values, in their order; keys of those to hold.
    """
    square = np.square(moved)
    whole = square.sum(axis=1, keepdims=True)
    share = np.where(whole > 0.0, square / np.where(whole > 0.0, whole, 1.0), 0.0).max(axis=0)
    best = set(np.argsort(-share, kind="stable")[:MOST_VALUES].tolist())
    kept = [place for place in range(len(varied)) if place in best and share[place] >= HELD_SHARE]
    chosen = tuple(varied[place] for place in kept)
    return chosen, tuple(one.key for one in varied if one not in chosen)


def sobol_sensitivity(
    margins: Callable[[Factors], Floats],
    varied: Sequence[Varied],
    held: Sequence[str],
    names: Sequence[str],
    samples: int,
    seed: int,
    response: Response | None = None,
) -> Sensitivity:
    """Sobol' indices of margins.

    Parameters
    ----------
    margins : callable
        Margins of units by the factors on their values, shape (names, n).
    varied : sequence of Varied
        Values that vary, at least one.
    held : sequence of str
        Keys of values that stay as they are.
    names : sequence of str
        Of the margins.
    samples : int
        Base samples, a power of two [1].
    seed : int
        Of the samples.
    response : Response, optional
        The margins as polynomials of these values, fitted to other units than are computed here.

    Returns
    -------
    Sensitivity
        First-order and total indices.

    Raises
    ------
    InputError
        `samples` is no power of two.

    Notes
    -----
    Estimators of A. Saltelli et al., Comput. Phys. Commun. 181 (2010) 259 as `scipy.stats.sobol_indices` has them,
    on Sobol' points shifted at random; intervals by resampling the base samples. The polynomials go along as control
    variates (derived: the estimate for them on the same samples less what it has to be, times the slope of one
    error over the other, is taken off).
    """
    if samples < 2 or samples & (samples - 1):
        raise InputError(f"{samples} samples for the sensitivity: a power of two is wanted, such as 64")
    rng = np.random.default_rng(np.random.SeedSequence(entropy=seed, spawn_key=(0, 0)))
    count = len(varied)
    first, second = _base_samples(count, samples, rng)
    mixed = np.repeat(first[None], count, axis=0)
    for place in range(count):
        mixed[place, place] = second[place]
    everything = np.concatenate([first, second, *mixed], axis=1)
    factors = {one.key: factors_at(one.tolerance, everything[place]) for place, one in enumerate(varied)}
    blocks = shown_margins(margins(factors)).reshape(len(names), count + 2, samples)
    help_blocks = None if response is None else response.at(factors).reshape(blocks.shape)
    point, low, high = _estimate(blocks, help_blocks, response, rng)
    return Sensitivity(
        names=tuple(names),
        keys=tuple(one.key for one in varied),
        held=tuple(held),
        samples=samples,
        first=point[0],
        first_low=low[0],
        first_high=high[0],
        total=point[1],
        total_low=low[1],
        total_high=high[1],
        variance=blocks[:, :2].reshape(len(names), -1).var(axis=1),
    )


def shown_margins(margins: Floats) -> Floats:
    """Margins as they count here: none below `LEAST_MARGIN`, 0 where a limit applies nowhere."""
    return np.maximum(np.nan_to_num(margins, posinf=0.0, neginf=LEAST_MARGIN), LEAST_MARGIN)


def _estimate(
    blocks: Floats, help_blocks: Floats | None, response: Response | None, rng: np.random.Generator
) -> tuple[Floats, Floats, Floats]:
    """Indices and the ends of their intervals, each of shape (2, names, keys)."""
    names, samples = len(blocks), blocks.shape[2]
    both = blocks if help_blocks is None else np.concatenate([blocks, help_blocks])
    point = _indices(both)
    draws = np.array([_indices(both[:, :, rng.integers(0, samples, samples)]) for _ in range(RESAMPLES)])
    if response is not None:
        own, helping = draws[:, :, :names], draws[:, :, names:]
        apart = helping - helping.mean(axis=0)
        spread = np.square(apart).mean(axis=0)
        slope = ((own - own.mean(axis=0)) * apart).mean(axis=0) / np.where(spread > 0.0, spread, 1.0)
        known = response.shares()
        point = point[:, :names] - slope * (point[:, names:] - known)
        draws = own - slope * (helping - known)
    low, high = np.quantile(draws, (0.025, 0.975), axis=0)
    return point, low, high


def _base_samples(count: int, samples: int, rng: np.random.Generator) -> tuple[Floats, Floats]:
    """Two independent sets of quantiles, shape (count, samples)."""
    from scipy.stats.qmc import Sobol

    points = Sobol(2 * count, scramble=False).random(samples)
    shifted = ((points + rng.random(2 * count)) % 1.0).T
    return shifted[:count], shifted[count:]


def _indices(blocks: Floats) -> Floats:
    """First-order and total indices, shape (2, names, keys), from margins of A, B and the mixed sets."""
    from scipy.stats import sobol_indices

    names, count = len(blocks), blocks.shape[1] - 2
    mixed = np.moveaxis(blocks[:, 2:], 1, 0)
    data: dict[Literal["f_A", "f_B", "f_AB"], Floats] = {
        "f_A": blocks[:, 0],
        "f_B": blocks[:, 1],
        "f_AB": mixed,
    }
    found = sobol_indices(func=data, n=blocks.shape[2])
    shape = (names, count)
    return np.stack([np.reshape(found.first_order, shape), np.reshape(found.total_order, shape)])
