"""Requirements that several tests design for; all values invented."""

from __future__ import annotations

import math
from typing import Any

from buckdesign.design.requirement import Limits, OutputNeed, Preferences, Requirement, SupplyNeed


def requirement(
    supply: tuple[float, float, float],
    output: float,
    load: tuple[float, float],
    ripple: float = math.inf,
    *,
    prefer: dict[str, tuple[str, ...]] | None = None,
    **limits: Any,
) -> Requirement:
    return Requirement(
        supply=SupplyNeed(voltage=supply),
        output=OutputNeed(voltage=output, current=load, ripple=ripple),
        limits=Limits(**limits),
        prefer=Preferences(**(prefer or {})),
    )


BATTERY = (21.0, 24.0, 29.0)

RAIL = requirement(
    BATTERY, 12.0, (0.02, 2.5), 0.12, frequency=(4e3, 60e3), efficiency=0.8, ambient=(5.0, 40.0)
)
LOGGER = requirement(BATTERY, 5.0, (0.03, 0.8), 0.1, ambient=(0.0, 45.0))
"""Rail and logger of a narrowboat."""
