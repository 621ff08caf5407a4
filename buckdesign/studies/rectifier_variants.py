"""Rectifiers worth a look in a design: each part, single and in parallel, with the way of its heat."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from buckdesign.design.design_file import Design
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.heat_paths import heat_data
from buckdesign.design.hot_parameters import RECTIFIER
from buckdesign.design.operated import Operated, Points, operate_rows, rows_at
from buckdesign.design.resolve import resolve_design
from buckdesign.design.sections import RectifierSection
from buckdesign.loop.results import STUDY, Effort
from buckdesign.parts import Rectifier, Tables

AXIAL_FREE_AIR = 50.0
"""Junction to ambient of an axial rectifier whose sheet gives none [K/W] (from memory: 30-60 for 1-3 A
bodies on short leads)."""

CURRENT_ROOM = 1.0
"""Rated average current over the current that a piece carries from which a part is worth a look [1]."""

PIECES = 2
"""Most pieces in parallel that are tried unless said otherwise [1] (own choice)."""


UNCHECKED = "junction not checked: no way for its heat is known"
"""Note of a rectifier that has no temperature."""

STANDARD = "no recovery data: taken as a standard rectifier"
"""Note of a junction rectifier whose recovery is not known."""


def marked_label(part: str | None, parallel: int, *, is_checked: bool) -> str:
    """Such as ``2 x 1N5822``, or ``1N5828 (junction not checked)``."""
    name = part or "as given"
    plain = name if parallel == 1 else f"{parallel} x {name}"
    return plain if is_checked else f"{plain} (junction not checked)"


@dataclass(frozen=True, kw_only=True)
class Variant:
    """A rectifier to try.

    Attributes
    ----------
    part : str or None
        Name in the table; None: as the design file gives it, without a part.
    kind : str or None
        As in the table.
    parallel : int
        Pieces.
    resolved : ResolvedDesign
        The design with it.
    is_own : bool
        Whether it is the design's own.
    notes : tuple of str
        What was assumed about it.
    """

    part: str | None
    kind: str | None
    parallel: int
    resolved: ResolvedDesign
    is_own: bool

    notes: tuple[str, ...] = ()

    @property
    def label(self) -> str:
        """Such as ``2 x 1N5822``; one whose junction can't be told says so."""
        return marked_label(self.part, self.parallel, is_checked=self.is_checked)

    @property
    def is_checked(self) -> bool:
        """Whether a way for its heat is known, so that its junction can be held against its limit."""
        return bool(np.isfinite(heat_data([self.resolved]).own[0, RECTIFIER]))

    @property
    def note(self) -> str | None:
        """What a reader must know before the part is chosen, in words."""
        unchecked = () if self.is_checked else (UNCHECKED,)
        return "; ".join((*unchecked, *self.notes)) or None


def variants(
    design: Design, names: Sequence[str], parallel: int, tables: Tables, points: Points
) -> tuple[list[Variant], list[str]]:
    """Rectifiers worth a look.

    Parameters
    ----------
    design : Design
        The design.
    names : sequence of str
        Parts to compare whatever they are rated; none: all of the table whose ratings suffice.
    parallel : int
        Most pieces in parallel.
    tables : Tables
        The parts.
    points : Points
        Operating points, for the ratings.

    Returns
    -------
    tuple
        The design's own first, then the others; what to mind about them.

    Raises
    ------
    UnknownNameError
        A name is in no table.
    """
    own = resolve_design(design, tables)
    given = design.rectifier
    kind, pieces_given = own.rectifier.kind, given.parallel
    own_part = None if given.part is None else tables.rectifier(given.part)
    assumed = _assumed(own_part) if given.recovery_charge is None else ()
    found = [
        Variant(
            part=given.part, kind=kind, parallel=pieces_given, resolved=own, is_own=True, notes=assumed
        )
    ]
    wanted = [tables.rectifier(name) for name in dict.fromkeys(names)] or list(tables.rectifiers.values())
    notes = [f"{given.part}: {text}" for text in assumed]
    unknown: list[str] = []
    left_out = 0
    own_is_plain = given == RectifierSection(part=given.part, parallel=given.parallel)
    for part in wanted:
        for pieces in range(1, parallel + 1):
            if own_is_plain and (part.name, pieces) == (given.part, given.parallel):
                continue
            if not names and not _is_rated(part, pieces, points):
                left_out += 1
                continue
            found.append(_variant(design, part, pieces, tables, notes, unknown))
    if unknown:
        listed = ", ".join(dict.fromkeys(unknown))
        notes.append(f"no value for free air is known, {AXIAL_FREE_AIR:g} K/W assumed: {listed}")
    if left_out:
        notes.append(f"{left_out} others of the table are not shown: rated below the voltage or current here")
    return found, list(dict.fromkeys(notes))


def _is_rated(part: Rectifier, pieces: int, points: Points) -> bool:
    current = float(np.max(points.load_current))
    enough = part.average_current * pieces >= CURRENT_ROOM * current * 0.5
    return part.reverse_voltage >= float(np.max(points.supply)) and enough


def _variant(
    design: Design, part: Rectifier, pieces: int, tables: Tables, notes: list[str], unknown: list[str]
) -> Variant:
    section = RectifierSection(part=part.name, parallel=pieces)
    resolved = resolve_design(replace(design, rectifier=section), tables)
    rectifier, heat = resolved.rectifier, resolved.heat
    is_axial = part.mounting.startswith("axial")
    if is_axial and heat.rectifier.is_shared:
        heat = replace(heat, rectifier=replace(heat.rectifier, is_shared=False))
        notes.append("axial rectifiers stand in free air, not on the shared heat sink")
    cooled = heat.rectifier.is_shared or heat.rectifier.heatsink is not None
    if is_axial and rectifier.junction_ambient is None and (not cooled or rectifier.junction_case is None):
        rectifier = replace(rectifier, junction_ambient=AXIAL_FREE_AIR)
        heat = replace(heat, rectifier=replace(heat.rectifier, heatsink=None))
        unknown.append(part.name)
    assumed = _assumed(part)
    notes += [f"{part.name}: {text}" for text in assumed]
    if part.name in unknown:
        assumed = (*assumed, f"{AXIAL_FREE_AIR:g} K/W in free air assumed")
    resolved = replace(resolved, rectifier=rectifier, heat=heat)
    return Variant(
        part=part.name, kind=part.kind, parallel=pieces, resolved=resolved, is_own=False, notes=assumed
    )


def _assumed(part: Rectifier | None) -> tuple[str, ...]:
    """What the table does not say about a part and the loop needs."""
    if part is None or part.recovery_charge is not None or part.kind == "Schottky":
        return ()
    return (STANDARD,)


def operate_variants(tried: Sequence[Variant], points: Points, effort: Effort = STUDY) -> Operated:
    """All variants at all points, the variant slowest.

    Parameters
    ----------
    tried : sequence of Variant
        The rectifiers.
    points : Points
        Operating points, the same for each.
    effort : Effort
        How long to look for each steady state.

    Returns
    -------
    Operated
        ``len(tried) * len(points)`` points.
    """
    rows = np.concatenate([rows_at(one.resolved, points) for one in tried])
    designs = [one.resolved for one in tried for _ in range(len(points))]
    return operate_rows(rows, designs, np.tile(points.ambient_c, len(tried)), effort=effort)
