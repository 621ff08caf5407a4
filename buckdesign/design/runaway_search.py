"""The ambient at which thermal runaway of the rectifier begins, with the loop run again at each ambient."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.losses import Floats
from buckdesign.design.operated import operate_rows

COLDEST_C = -60.0
"""Ambient from which on runaway is looked for [degC] (own choice: below the ratings of the parts)."""

STEPS = 12
"""Ambients tried in each of the rounds [1] (own choice)."""

ROUNDS = 3
"""Rounds, each between two ambients of the one before [1] (own choice: to a tenth of a kelvin)."""


def runaway_ambient(rows: Floats, designs: Sequence[ResolvedDesign], ambient_c: Floats) -> Floats:
    """Lowest ambient from which on, up to a given one, no temperature balances the leakage.

    Parameters
    ----------
    rows : NDArray
        Loop parameters at 25 degC, shape (n, columns).
    designs : sequence of ResolvedDesign
        The design of each.
    ambient_c : NDArray
        An ambient at which each runs away [degC], shape (n,).

    Returns
    -------
    NDArray
        [degC], shape (n,); `COLDEST_C` where it runs away even there.
    """
    low, high = np.full(len(rows), min(COLDEST_C, float(np.min(ambient_c, initial=0.0)))), ambient_c.copy()
    for _ in range(ROUNDS if len(rows) else 0):
        share = np.linspace(0.0, 1.0, STEPS)
        tried = low[:, None] + share * (high - low)[:, None]
        found = operate_rows(
            np.repeat(rows, STEPS, axis=0), [one for one in designs for _ in range(STEPS)], tried.ravel()
        )
        lost = found.balance.runaway.reshape(tried.shape)
        lost[:, -1] = True
        holds = ~lost
        last = np.where(holds.any(axis=1), STEPS - 1 - holds[:, ::-1].argmax(axis=1), -1)
        at = np.arange(len(rows))
        low, high = tried[at, np.maximum(last, 0)], tried[at, last + 1]
    return high
