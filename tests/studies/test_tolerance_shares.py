"""Shares of a margin's variance against closed cases, with and without the help of a fitted polynomial."""

from __future__ import annotations

import numpy as np
import pytest

from buckdesign.design.tolerances import Distribution, Tolerance
from buckdesign.studies.response import fitted_response
from buckdesign.studies.sensitivity import sobol_sensitivity
from buckdesign.studies.spreads import factors_at
from buckdesign.studies.tolerance_keys import Varied

KINDS = (Distribution.UNIFORM, Distribution.NORMAL, Distribution.LOGNORMAL, Distribution.UNIFORM)


def values() -> tuple[Varied, ...]:
    """Four values of every kind of spread (invented)."""
    return tuple(
        Varied(
            key=f"network.{name}",
            unit="ohm",
            value=1.0,
            tolerance=Tolerance(low=-0.5, high=1.0, distribution=kind),
            source="given",
        )
        for name, kind in zip(("r1", "r2", "rh", "rbe"), KINDS, strict=True)
    )


def standard(factors: dict[str, np.ndarray]) -> list[np.ndarray]:
    """Each value with mean 0 and variance 1, lognormal ones by their logarithm (moments by fine quadrature)."""
    found = []
    for one in values():
        scale = np.log if one.tolerance.distribution is Distribution.LOGNORMAL else np.asarray
        grid = scale(factors_at(one.tolerance, (np.arange(20_000) + 0.5) / 20_000))
        found.append((scale(factors[one.key]) - grid.mean()) / grid.std())
    return found


def smooth(factors: dict[str, np.ndarray]) -> np.ndarray:
    """Variance 1 + 0.36 + 0.16 + 0.25, the last from the first and the second together; the fourth does nothing."""
    first, second, third, _ = standard(factors)
    return np.array([first + 0.6 * second + 0.4 * third + 0.5 * first * second]) / 20.0


FIRST = np.array([1.0, 0.36, 0.16, 0.0]) / 1.77
"""Derived: squared coefficients over the variance, for independent values of mean 0 and variance 1."""

TOTAL = np.array([1.25, 0.61, 0.16, 0.0]) / 1.77


def drawn(count: int) -> dict[str, np.ndarray]:
    share = np.random.default_rng(8).random((4, count))
    return {one.key: factors_at(one.tolerance, share[place]) for place, one in enumerate(values())}


def kinked(factors: dict[str, np.ndarray]) -> np.ndarray:
    """No polynomial."""
    first, second, _, _ = standard(factors)
    return np.array([np.where(first > 0.3, 0.3, first) + 0.3 * np.abs(second)])


def test_shares_of_a_polynomial_are_those_of_its_coefficients() -> None:
    factors = drawn(400)
    found = fitted_response(values(), factors, smooth(factors))
    assert found is not None and found.has_products
    assert found.shares()[0, 0] == pytest.approx(FIRST, abs=1e-5)
    assert found.shares()[1, 0] == pytest.approx(TOTAL, abs=1e-5)
    other = drawn(50)
    assert found.at(other) == pytest.approx(smooth(other), abs=1e-9)


def test_a_fit_needs_units() -> None:
    few, some = drawn(20), drawn(45)
    assert fitted_response(values(), few, smooth(few)) is None
    found = fitted_response(values(), some, smooth(some))
    assert found is not None and not found.has_products


def test_with_the_polynomial_few_samples_are_enough() -> None:
    factors = drawn(400)
    response = fitted_response(values(), factors, smooth(factors))
    plain = sobol_sensitivity(smooth, values(), (), ("a",), 64, 3)
    helped = sobol_sensitivity(smooth, values(), (), ("a",), 64, 3, response)
    assert helped.first[0] == pytest.approx(FIRST, abs=2e-3)
    assert helped.total[0] == pytest.approx(TOTAL, abs=2e-3)
    assert np.abs(plain.first[0] - FIRST).max() > 0.02


def test_a_poor_polynomial_does_no_harm() -> None:
    many = sobol_sensitivity(kinked, values(), (), ("a",), 16384, 5)
    factors = drawn(400)
    response = fitted_response(values(), factors, kinked(factors))
    errors, inside = [], []
    for seed in range(12):
        plain = sobol_sensitivity(kinked, values(), (), ("a",), 64, seed)
        helped = sobol_sensitivity(kinked, values(), (), ("a",), 64, seed, response)
        errors.append([np.abs(one.first - many.first).max() for one in (plain, helped)])
        inside.append((helped.first_low <= many.first) & (many.first <= helped.first_high))
    rough, better = np.mean(errors, axis=0)
    assert better < 0.7 * rough
    assert np.mean(inside) > 0.75


def test_a_polynomial_of_nothing_to_do_with_it_changes_little() -> None:
    factors = drawn(400)
    noise = np.random.default_rng(2).random((1, 400))
    response = fitted_response(values(), factors, noise)
    plain = sobol_sensitivity(smooth, values(), (), ("a",), 256, 3)
    helped = sobol_sensitivity(smooth, values(), (), ("a",), 256, 3, response)
    assert np.abs(helped.first - FIRST).max() < np.abs(plain.first - FIRST).max() + 0.05
