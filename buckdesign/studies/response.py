"""Margins as polynomials of the values, fitted to the units drawn: a help for estimating shares of their variance.

The polynomials are orthonormal over each value's spread, so that the shares of a fit follow from its coefficients.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.tolerances import Distribution
from buckdesign.studies.spreads import factors_at
from buckdesign.studies.tolerance_keys import Varied

Floats = NDArray[np.float64]

DEGREE = 3
"""Highest power of a value by itself [1] (own choice)."""

UNITS_A_TERM = 3
"""Units needed for each term of a fit [1] (own choice)."""

_GRID = 2000


@dataclass(frozen=True, kw_only=True)
class Response:
    """Margins as polynomials.

    Attributes
    ----------
    varied : tuple of Varied
        The values.
    has_products : bool
        Whether there are products of two values.
    coefficients : NDArray
        Of the terms, shape (terms, names); the constant first, then the powers of each value, then the products.
    """

    varied: tuple[Varied, ...]
    has_products: bool
    coefficients: Floats

    def at(self, factors: Mapping[str, Floats]) -> Floats:
        """Margins by the factors on the values [1], shape (names, n)."""
        return (_terms(self.varied, factors, self.has_products) @ self.coefficients).T

    def shares(self) -> Floats:
        """First-order and total indices of the polynomials themselves [1], shape (2, names, keys).

        Notes
        -----
        Derived: with orthonormal terms the variance is the sum of the squared coefficients, and each term belongs to
        the values in it.
        """
        count = len(self.varied)
        square = np.square(self.coefficients[1:])
        whole = square.sum(axis=0)
        first = square[: count * DEGREE].reshape(count, DEGREE, -1).sum(axis=1)
        total = first.copy()
        if self.has_products:
            for (left, right), part in zip(
                combinations(range(count), 2), square[count * DEGREE :], strict=True
            ):
                total[left] += part
                total[right] += part
        both = np.stack([first, total])
        return np.asarray(
            np.moveaxis(np.where(whole > 0.0, both / np.where(whole > 0.0, whole, 1.0), 0.0), 1, 2)
        )


def fitted_response(
    varied: Sequence[Varied], factors: Mapping[str, Floats], margins: Floats
) -> Response | None:
    """Fit margins.

    Parameters
    ----------
    varied : sequence of Varied
        Values to take into account.
    factors : Mapping
        Values over nominal of some units by key [1], shape (n,).
    margins : NDArray
        Their margins, shape (names, n) [1].

    Returns
    -------
    Response or None
        With products of two values where there are units enough; None where there are too few for any fit.
    """
    units, count = margins.shape[1], len(varied)
    single = 1 + DEGREE * count
    if units < UNITS_A_TERM * single:
        return None
    has_products = units >= UNITS_A_TERM * (single + count * (count - 1) // 2)
    terms = _terms(varied, factors, has_products)
    coefficients = np.asarray(np.linalg.lstsq(terms, margins.T, rcond=None)[0], dtype=np.float64)
    return Response(varied=tuple(varied), has_products=has_products, coefficients=coefficients)


def _terms(varied: Sequence[Varied], factors: Mapping[str, Floats], has_products: bool) -> Floats:
    """Constant, powers and products at some units, shape (n, terms)."""
    powers = [_polynomials(one, factors[one.key]) for one in varied]
    columns = [np.ones((len(powers[0]), 1)), *powers]
    if has_products and len(powers) > 1:
        pairs = [
            powers[left][:, 0] * powers[right][:, 0] for left, right in combinations(range(len(powers)), 2)
        ]
        columns.append(np.stack(pairs, axis=1))
    return np.concatenate(columns, axis=1)


def _polynomials(one: Varied, factors: Floats) -> Floats:
    """Polynomials 1 to `DEGREE` of a value, orthonormal over its spread, shape (n, DEGREE)."""
    middles = (np.arange(_GRID) + 0.5) / _GRID
    grid = np.vander(_position(one, factors_at(one.tolerance, middles)), DEGREE + 1, increasing=True)
    _, triangle = np.linalg.qr(grid / np.sqrt(_GRID))
    powers = np.vander(_position(one, factors), DEGREE + 1, increasing=True)
    return np.asarray(np.linalg.solve(triangle.T, powers.T).T[:, 1:], dtype=np.float64)


def _position(one: Varied, factors: Floats) -> Floats:
    """Place in the band, -1 to 1, of the logarithm for a lognormal spread."""
    low, high = 1.0 + one.tolerance.low, 1.0 + one.tolerance.high
    if one.tolerance.distribution is Distribution.LOGNORMAL:
        return np.asarray(2.0 * np.log(factors / low) / np.log(high / low) - 1.0, dtype=float)
    return np.asarray(2.0 * (factors - low) / (high - low) - 1.0, dtype=float)
