"""How much of a tolerance study is done."""

from __future__ import annotations

from dataclasses import dataclass

from buckdesign.errors import InputError
from buckdesign.studies.ageing import AGE_HOURS

UNITS = 1000
"""Units drawn unless said otherwise [1] (own choice: yields to about 3 %, in some ten seconds)."""

SAMPLES = 64
"""Base samples of the sensitivity unless said otherwise [1] (own choice)."""

OLDEST_HOURS = 300_000.0
"""Greatest age that is looked at [h] (own choice: 34 years)."""


@dataclass(frozen=True, kw_only=True)
class StudyEffort:
    """How much of a tolerance study is done.

    Attributes
    ----------
    units : int
        Units drawn [1], at least 1.
    seed : int
        Of the random numbers, 0 or more; unit `i` of a seed is always the same.
    samples : int
        Base samples of the sensitivity, a power of two [1]; 0: none.
    age_hours : float
        Age at which the units are judged again [h]; 0: not.
    all_points : bool
        Judge every unit over the whole range rather than where something is worst.
    electrical_only : bool
        No temperatures, no losses added on, no ageing of the core.
    jobs : int or None
        Threads; all processors where None.
    """

    units: int = UNITS
    seed: int = 0
    samples: int = SAMPLES
    age_hours: float = AGE_HOURS
    all_points: bool = False
    electrical_only: bool = False
    jobs: int | None = None

    def __post_init__(self) -> None:
        if self.units < 1:
            raise InputError(f"{self.units} units: at least 1 is needed")
        if self.seed < 0:
            raise InputError(f"seed {self.seed}: 0 or more is wanted")
        if self.samples and (self.samples < 2 or self.samples & (self.samples - 1)):
            raise InputError(f"{self.samples} samples for the sensitivity: 0 or a power of two, such as 64")
        if not 0.0 <= self.age_hours <= OLDEST_HOURS:
            raise InputError(f"age of {self.age_hours:g} h: 0 h to {OLDEST_HOURS:g} h is wanted")
