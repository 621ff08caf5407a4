"""Ageing of electrolytics and of iron powder: limits and what makers call the end of life."""

from __future__ import annotations

import numpy as np
import pytest

from buckdesign.physics.ageing import (
    aged_capacitance_factor,
    aged_eddy_factor,
    aged_esr_factor,
    used_share,
)

SHARES = np.linspace(0.0, 3.0, 31)


@pytest.mark.parametrize(
    ("factor", "at_end"),
    [
        # common practice: end of life is 20 % less capacitance, twice the loss factor
        (aged_capacitance_factor, 0.8),
        (aged_esr_factor, 2.0),
        # own choice: what is called ageing is read as a doubling
        (aged_eddy_factor, 2.0),
    ],
)
def test_new_and_at_the_end_of_life(factor, at_end) -> None:
    assert factor(0.0) == 1.0
    assert factor(1.0) == pytest.approx(at_end)
    course = np.diff(factor(SHARES))
    assert (course < 0.0).all() if at_end < 1.0 else (course > 0.0).all()
    assert (factor(SHARES) > 0.0).all()


def test_course_is_linear() -> None:
    # own choice: ESR, eddy loss and the reciprocal of the capacitance grow alike from year to year
    for values in (aged_esr_factor(SHARES), aged_eddy_factor(SHARES), 1.0 / aged_capacitance_factor(SHARES)):
        assert np.diff(values) == pytest.approx(np.diff(values)[0])


def test_share_is_linear_in_time() -> None:
    assert used_share(np.array([0.0, 5e3, 2e4]), 1e4) == pytest.approx([0.0, 0.5, 2.0])
