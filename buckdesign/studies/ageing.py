"""Units after some years: how far output capacitor and core have aged at their own temperatures.

Every unit is taken to run at the nominal supply, full load and the highest ambient; its temperatures are those
when new. Regulator, transistor, rectifier, resistors and input capacitor are not aged.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.choke_ageing import HALVING_K, UNAFFECTED_HOURS
from buckdesign.design.elements import ResolvedDesign
from buckdesign.physics.ageing import (
    aged_capacitance_factor,
    aged_eddy_factor,
    aged_esr_factor,
    used_share,
)
from buckdesign.physics.capacitor import electrolytic_life
from buckdesign.physics.thermal import CORE_UNAFFECTED_C
from buckdesign.studies.unit_designs import EDDY_LOSS
from buckdesign.studies.unit_runs import Factors, UnitRuns

Floats = NDArray[np.float64]

AGE_HOURS = 20_000.0
"""Age at which units are judged again unless said otherwise [h] (own choice: two and a quarter years day and
night, or ten years of six hours a day)."""

CAPACITANCE, ESR = "output_capacitor.capacitance", "output_capacitor.esr"


@dataclass(frozen=True, kw_only=True)
class Wear:
    """What some years have done to units.

    Attributes
    ----------
    hours : float
        Age [h].
    capacitor_share, core_share : NDArray
        Share of its life that the output capacitor, and of the time to ageing that the core's binder has used up
        [1], shape (n,); NaN where it is not known and no ageing is counted.
    """

    hours: float
    capacitor_share: Floats
    core_share: Floats

    def factors(self, new: Factors) -> dict[str, Floats]:
        """The factors of the aged units from those when new."""
        capacitor = np.nan_to_num(self.capacitor_share)
        one = np.ones(len(capacitor))
        aged = dict(new)
        aged[CAPACITANCE] = new.get(CAPACITANCE, one) * aged_capacitance_factor(capacitor)
        aged[ESR] = new.get(ESR, one) * aged_esr_factor(capacitor)
        aged[EDDY_LOSS] = np.asarray(aged_eddy_factor(np.nan_to_num(self.core_share)), dtype=float)
        return aged

    def to_dict(self) -> dict[str, Any]:
        """Median shares by key, for JSON; None where nothing ages."""
        return {
            "age_h": self.hours,
            "capacitor_life_used": _median(self.capacitor_share),
            "core_ageing_used": _median(self.core_share),
        }


def wear_of(runs: UnitRuns, nominal: ResolvedDesign, hours: float) -> Wear:
    """How far units have aged.

    Parameters
    ----------
    runs : UnitRuns
        The units when new.
    nominal : ResolvedDesign
        The design.
    hours : float
        Age [h].

    Returns
    -------
    Wear
        The capacitor's life by the 10 K rule, at most what makers claim; the binder's only for iron powder.
    """
    unknown = np.full(len(runs), np.nan)
    capacitor, share, core = nominal.output_capacitor, unknown, unknown
    if capacitor.life is not None and capacitor.life_temperature_c is not None:
        life = electrolytic_life(capacitor.life, capacitor.life_temperature_c, runs.capacitor_c)
        share = np.asarray(used_share(hours, life), dtype=float)
    winding = nominal.choke.winding
    if winding is not None and winding.material.kind == "iron powder":
        binder = UNAFFECTED_HOURS * 2.0 ** ((CORE_UNAFFECTED_C - runs.choke_c) / HALVING_K)
        core = np.asarray(used_share(hours, binder), dtype=float)
    return Wear(hours=hours, capacitor_share=share, core_share=core)


def wear_warnings(wear: Wear, nominal: ResolvedDesign) -> tuple[str, ...]:
    """What to know about the ageing.

    Parameters
    ----------
    wear : Wear
        How far units have aged.
    nominal : ResolvedDesign
        The design.

    Returns
    -------
    tuple of str
        Sentences.
    """
    told = []
    if np.isnan(wear.capacitor_share).all():
        told.append(
            "the output capacitor is not aged: its life and the temperature it holds at are not known"
        )
    elif (past := float(np.mean(wear.capacitor_share > 1.0))) > 0.0:
        told.append(
            f"at {wear.hours:g} h the output capacitor of {100.0 * past:.3g} % of the units is past its life"
        )
    winding = nominal.choke.winding
    if winding is not None and winding.material.kind == "iron powder" and np.isnan(wear.core_share).all():
        told.append("the core is not aged: its temperature is not computed")
    return tuple(told)


def _median(share: Floats) -> float | None:
    known = share[np.isfinite(share)]
    return float(np.median(known)) if len(known) else None
