"""Rectifiers compared in one design: each part, single and in parallel, with the loop run again for each.

The rate is the loop's own and moves with the rectifier; losses and temperatures are settled together.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np

from buckdesign.design.ambient_limits import check_ambient
from buckdesign.design.checks import Limit, hottest_piece_at, part_limits
from buckdesign.design.design_file import Design
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.heat_paths import heat_data
from buckdesign.design.losses import Floats
from buckdesign.design.operated import Operated, points_of
from buckdesign.design.ratings import rating_data
from buckdesign.design.resolve import resolve_design
from buckdesign.design.runaway_search import runaway_ambient
from buckdesign.design.temperatures import device_heat, runaway_reach
from buckdesign.loop.results import STUDY, Effort
from buckdesign.parts import Tables, load_tables
from buckdesign.studies.rectifier_variants import (
    PIECES,
    STANDARD,
    UNCHECKED,
    Variant,
    marked_label,
    operate_variants,
    variants,
)
from buckdesign.units import format_quantity


@dataclass(frozen=True, kw_only=True)
class RectifierRow:
    """One rectifier in the circuit.

    Attributes
    ----------
    part, kind : str or None
        As in the table.
    parallel : int
        Pieces.
    conduction_w, recovery_w, leakage_w, total_w : float
        Losses that the rectifier causes, in itself and in the transistor [W].
    junction_c : float or None
        Of the hottest piece [degC]; None in runaway or where no way for the heat is known.
    runaway_margin : float or None
        How many times its leakage may grow [1]; below 1 in runaway, None without leakage.
    efficiency, frequency_hz : float
        Of the whole stage [1], [Hz].
    holds : bool
        Whether it keeps every limit of a rectifier.
    why_not : str or None
        Which it does not keep.
    note : str or None
        What must be known before it is chosen: that its junction could not be checked, what was assumed.
    """

    part: str | None
    kind: str | None
    parallel: int
    conduction_w: float
    recovery_w: float
    leakage_w: float
    total_w: float
    junction_c: float | None
    runaway_margin: float | None
    efficiency: float
    frequency_hz: float
    holds: bool
    why_not: str | None
    note: str | None = None

    def to_dict(self) -> dict[str, Any]:
        """The row by key."""
        return {member.name: getattr(self, member.name) for member in fields(self)}

    @property
    def name(self) -> str:
        """Such as ``2 x 1N5822``."""
        return marked_label(self.part, self.parallel, is_checked=True)

    @property
    def label(self) -> str:
        """The name; one whose junction can't be told says so."""
        return marked_label(self.part, self.parallel, is_checked=UNCHECKED not in (self.note or ""))


@dataclass(frozen=True, kw_only=True)
class Comparison:
    """Rectifiers side by side.

    Attributes
    ----------
    rows : tuple of RectifierRow
        By total loss, the smallest first.
    own : RectifierRow
        The design's own rectifier, which is among the rows.
    supply_v, load_a, ambient_c : float
        Operating point.
    warnings : tuple of str
        What to mind.
    """

    rows: tuple[RectifierRow, ...]
    own: RectifierRow
    supply_v: float
    load_a: float
    ambient_c: float
    warnings: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        """Everything by key."""
        return {"rectifiers": [row.to_dict() for row in self.rows], "warnings": list(self.warnings)}


def compare_rectifiers(
    design: Design,
    names: Sequence[str] = (),
    *,
    parallel: int = PIECES,
    supply: float | None = None,
    load_current: float | None = None,
    ambient_c: float | None = None,
    tables: Tables | None = None,
    effort: Effort = STUDY,
) -> Comparison:
    """Compare rectifiers in a design at one operating point.

    Parameters
    ----------
    design : Design
        The design.
    names : sequence of str
        Parts to compare; none: every one of the tables whose ratings suffice.
    parallel : int
        Most pieces in parallel.
    supply, load_current, ambient_c : float, optional
        [V], [A], [degC]; what is omitted is as in the design.
    tables : Tables, optional
        Parts; those of the package where omitted.
    effort : Effort
        How long to look for each steady state.

    Returns
    -------
    Comparison
        Rows sorted by total loss, the design's own among them.

    Raises
    ------
    InputError
        A value is not allowed, or a part is not known.
    """
    known = load_tables() if tables is None else tables
    own = resolve_design(design, known)
    points = points_of(own, supply=supply, load_current=load_current, ambient_c=ambient_c)
    check_ambient(own, ambient_c)
    tried, notes = variants(design, names, parallel, known, points)
    operated = operate_variants(tried, points, effort)
    rows = rectifier_rows(tried, operated)
    unknown = [one.part or "as given" for one in tried if not one.is_checked]
    if unknown:
        listed = ", ".join(dict.fromkeys(unknown))
        notes.append(f"no way for the heat is known, junction not checked: {listed}")
    if not operated.is_settled.all():
        notes.append("losses and temperatures of some did not settle")
    ordered = sorted(rows, key=lambda row: (row.total_w, row.label))
    return Comparison(
        rows=tuple(ordered),
        own=rows[0],
        supply_v=float(points.supply[0]),
        load_a=float(operated.load[0]),
        ambient_c=float(points.ambient_c[0]),
        warnings=tuple(notes),
    )


@dataclass(frozen=True, kw_only=True)
class Judged:
    """What the comparison takes from operating points, arrays of shape (n,).

    Attributes
    ----------
    conduction, recovery, leakage : NDArray
        [W].
    junction_c : NDArray
        Of the hottest piece with typical values [degC].
    margin, ambient_limit_c : NDArray
        See `buckdesign.design.temperatures.runaway_reach` [1], [degC].
    limits : list of Limit
        Those of the rectifier.
    """

    conduction: Floats
    recovery: Floats
    leakage: Floats
    junction_c: Floats
    margin: Floats
    ambient_limit_c: Floats
    limits: list[Limit]

    @property
    def total(self) -> Floats:
        """[W], shape (n,)."""
        return self.conduction + self.recovery + self.leakage

    @property
    def holds(self) -> np.ndarray[Any, np.dtype[np.bool_]]:
        """Where every limit of a rectifier holds, shape (n,)."""
        return np.all([limit.holds for limit in self.limits], axis=0)


def judged(operated: Operated, designs: Sequence[ResolvedDesign]) -> Judged:
    """Losses, junction and limits of the rectifier of each point."""
    losses = operated.balance.losses
    power = device_heat(losses)
    heat = heat_data(designs)
    margin, ambient_limit = runaway_reach(operated.loop, power, operated.data, heat, operated.ambient_c)
    warmer = hottest_piece_at(operated, rating_data(designs), heat)[1]
    limits = [one for one in part_limits(operated, designs) if one.name.startswith("rectifier")]
    return Judged(
        conduction=losses["rectifier"],
        recovery=losses["rectifier_recovery"],
        leakage=losses["rectifier_leakage"],
        junction_c=operated.junction("rectifier") + warmer,
        margin=margin,
        ambient_limit_c=ambient_limit,
        limits=limits,
    )


def rectifier_rows(tried: Sequence[Variant], operated: Operated) -> list[RectifierRow]:
    """Rows in the order of the variants, one operating point each."""
    designs = [one.resolved for one in tried]
    found = judged(operated, designs)
    lost = np.flatnonzero(operated.balance.runaway)
    begins = found.ambient_limit_c.copy()
    begins[lost] = runaway_ambient(
        operated.base_rows[lost], [designs[index] for index in lost], operated.ambient_c[lost]
    )
    found = replace(found, ambient_limit_c=begins)
    rate = operated.loop.column("frequency_hz")
    return [
        RectifierRow(
            part=one.part,
            kind=one.kind,
            parallel=one.parallel,
            conduction_w=float(found.conduction[index]),
            recovery_w=float(found.recovery[index]),
            leakage_w=float(found.leakage[index]),
            total_w=float(found.total[index]),
            junction_c=_number(found.junction_c[index]),
            runaway_margin=_number(found.margin[index]),
            efficiency=float(operated.efficiency[index]),
            frequency_hz=float(rate[index]),
            holds=bool(found.holds[index]),
            why_not=why_not(found, index),
            note=one.note,
        )
        for index, one in enumerate(tried)
    ]


def why_not(found: Judged, index: int) -> str | None:
    """Which limits a rectifier does not keep, in words; None where it keeps all."""
    reasons = []
    for limit in found.limits:
        if limit.holds[index]:
            continue
        what = limit.name.removeprefix("rectifier ")
        if np.isnan(limit.value[index]):
            reasons.append(f"thermal runaway, from {found.ambient_limit_c[index]:.0f} degC ambient up")
            continue
        value = format_quantity(float(limit.value[index]), limit.unit, ascii_only=True)
        most = format_quantity(float(limit.limit[index]), limit.unit, ascii_only=True)
        reasons.append(f"{what} {value}, limit {most}")
    return "; ".join(reasons) or None


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None


__all__ = [
    "PIECES",
    "STANDARD",
    "UNCHECKED",
    "Comparison",
    "Judged",
    "RectifierRow",
    "Variant",
    "compare_rectifiers",
    "judged",
    "operate_variants",
    "rectifier_rows",
    "variants",
    "why_not",
]
