"""What all tests share: the loop kernel, compiled before the first of them."""

from __future__ import annotations

import pytest


@pytest.fixture(scope="session", autouse=True)
def _kernel_is_compiled() -> None:
    """The first call compiles for about a minute and says so on stderr: no test should meet that by accident."""
    from buckdesign.loop.results import steady_states, trajectory, waveforms
    from tests.loop.circuits import SPOT

    steady_states(SPOT.row()[None, :])
    waveforms(SPOT, cycles=1)
    trajectory(SPOT, cycles=1)
