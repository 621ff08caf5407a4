"""Where the choice of the rectifier flips: losses over rate, load, supply or ambient, and the crossings."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import Enum
from typing import Any, assert_never

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.ambient_limits import check_ambient
from buckdesign.design.design_file import Design
from buckdesign.design.losses import Floats
from buckdesign.design.operated import Points, operate_rows, points_of, rows_at
from buckdesign.design.resolve import resolve_design
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import STUDY, Effort
from buckdesign.parts import Tables, load_tables
from buckdesign.studies.rectifiers import PIECES, Variant, judged, variants

STEPS = 25
"""Values that the varied quantity takes [1] (own choice)."""

INDUCTANCE_SPAN = (0.2, 5.0)
"""Factors on the choke's inductance that move the rate of the loop [1] (own choice)."""

AMBIENT_SPAN = (0.0, 85.0)
"""Ambients [degC] (own choice: indoors to an enclosure in the sun)."""


class Over(Enum):
    """What is varied."""

    FREQUENCY = "frequency"
    LOAD = "load"
    SUPPLY = "supply"
    AMBIENT = "ambient"

    @property
    def unit(self) -> str:
        """As in `buckdesign.units`."""
        return {"frequency": "Hz", "load": "A", "supply": "V", "ambient": "degC"}[self.value]


@dataclass(frozen=True, kw_only=True)
class Curve:
    """One rectifier over the varied quantity.

    Attributes
    ----------
    part : str or None
        As in the table.
    parallel : int
        Pieces.
    label : str
        Such as ``2 x 1N5822``.
    is_own : bool
        Whether it is the design's own.
    total_w : NDArray
        Loss that the rectifier causes [W], shape (n,); NaN where it does not keep its limits or the loop
        does not reach that rate.
    """

    part: str | None
    parallel: int
    label: str
    is_own: bool
    total_w: Floats


@dataclass(frozen=True, kw_only=True)
class Crossing:
    """Where another rectifier becomes the best.

    Attributes
    ----------
    at : float
        Value of the varied quantity, in its SI unit or degC.
    below, above : str
        Label of the best below and above it.
    """

    at: float
    below: str
    above: str


@dataclass(frozen=True, kw_only=True)
class Choice:
    """Rectifiers over one quantity.

    Attributes
    ----------
    over : Over
        What is varied.
    values : NDArray
        Its values, rising, shape (n,).
    curves : tuple of Curve
        The rectifiers.
    crossings : tuple of Crossing
        Where the best one changes; a rectifier that drops out of its limits makes one too.
    note : str
        How the quantity was varied.
    """

    over: Over
    values: Floats
    curves: tuple[Curve, ...]
    crossings: tuple[Crossing, ...]
    note: str

    def best(self) -> list[str | None]:
        """Label of the best rectifier at each value; None where none holds."""
        return [None if index < 0 else self.curves[index].label for index in best_of(self.curves)]

    def to_dict(self) -> dict[str, Any]:
        """Everything by key."""
        return {
            "quantity": self.over.value,
            "unit": self.over.unit,
            "values": self.values.tolist(),
            "curves": [
                {"part": one.part, "parallel": one.parallel, "total_w": one.total_w.tolist()}
                for one in self.curves
            ],
            "crossings": [{"at": one.at, "below": one.below, "above": one.above} for one in self.crossings],
            "note": self.note,
        }


def rectifier_choice(
    design: Design,
    over: Over,
    names: Sequence[str] = (),
    *,
    parallel: int = PIECES,
    supply: float | None = None,
    load_current: float | None = None,
    ambient_c: float | None = None,
    tables: Tables | None = None,
    effort: Effort = STUDY,
) -> Choice:
    """Losses of rectifiers over one quantity, and where the choice flips.

    Parameters
    ----------
    design : Design
        The design.
    over : Over
        What is varied; for the rate it is the choke's inductance, which moves it.
    names : sequence of str
        Parts to compare; none: every one of the tables whose ratings suffice.
    parallel : int
        Most pieces in parallel.
    supply, load_current, ambient_c : float, optional
        [V], [A], [degC]; what is omitted is as in the design. The one that is varied has no effect.
    tables : Tables, optional
        Parts; those of the package where omitted.
    effort : Effort
        How long to look for each steady state.

    Returns
    -------
    Choice
        Curves and crossings.

    Raises
    ------
    InputError
        A value is not allowed, or a part is not known.
    """
    known = load_tables() if tables is None else tables
    resolved = resolve_design(design, known)
    base = points_of(resolved, supply=supply, load_current=load_current, ambient_c=ambient_c)
    check_ambient(resolved, ambient_c)
    tried, _ = variants(design, names, parallel, known, base)
    values, points, scale = _spread(over, base, resolved.design.output.voltage)
    totals, rates = _losses(tried, points, scale, effort)
    if over is Over.FREQUENCY:
        values, totals = _over_rate(rates, totals)
    curves = tuple(
        Curve(part=one.part, parallel=one.parallel, label=one.label, is_own=one.is_own, total_w=total)
        for one, total in zip(tried, totals, strict=True)
        if np.isfinite(total).any()
    )
    return Choice(
        over=over, values=values, curves=curves, crossings=tuple(crossings(values, curves)), note=_note(over)
    )


def _note(over: Over) -> str:
    if over is not Over.FREQUENCY:
        return ""
    low, high = INDUCTANCE_SPAN
    return (
        f"the rate is the loop's own: the choke's inductance was varied from {low:g} to {high:g} times "
        "its value, everything else left as it is"
    )


def _spread(over: Over, base: Points, output: float) -> tuple[Floats, Points, Floats]:
    """Values, operating points and factors on the inductance."""

    def points(**changed: Floats) -> Points:
        given = {name: np.full(STEPS, getattr(base, name)[0]) for name in Points.__annotations__}
        return Points(**(given | changed))

    scale = np.ones(STEPS)
    supply, load = float(base.supply[0]), float(base.load_current[0])
    match over:
        case Over.FREQUENCY:
            return np.zeros(STEPS), points(), np.geomspace(*INDUCTANCE_SPAN, STEPS)
        case Over.LOAD:
            values = np.linspace(0.1, 1.5, STEPS) * max(load, 0.05)
            return values, points(load_current=values), scale
        case Over.SUPPLY:
            room = max(supply - output, 1.0)
            values = np.linspace(output + 0.5 * room, supply + 0.75 * room, STEPS)
            return values, points(supply=values), scale
        case Over.AMBIENT:
            values = np.linspace(*AMBIENT_SPAN, STEPS)
            return values, points(ambient_c=values), scale
    assert_never(over)


def _losses(
    tried: Sequence[Variant], points: Points, scale: Floats, effort: Effort
) -> tuple[list[Floats], list[Floats]]:
    """Total loss of each where it keeps its limits and the loop switches, else NaN; the rate."""
    rows = np.concatenate([rows_at(one.resolved, points) for one in tried])
    rows[:, COLUMN["inductance"]] *= np.tile(scale, len(tried))
    designs = [one.resolved for one in tried for _ in range(len(points))]
    operated = operate_rows(rows, designs, np.tile(points.ambient_c, len(tried)), effort=effort)
    found = judged(operated, designs)
    rate = operated.loop.column("frequency_hz")
    total = np.where(found.holds & (rate > 0.0), found.total, np.nan)
    shape = (len(tried), len(points))
    return list(total.reshape(shape)), list(rate.reshape(shape))


def _over_rate(rates: Sequence[Floats], totals: Sequence[Floats]) -> tuple[Floats, list[Floats]]:
    """Losses at rates that all reach which keep their limits throughout; between the rates of each."""
    reached = [rate[np.isfinite(total)] for rate, total in zip(rates, totals, strict=True)]
    full = [rate for rate in reached if len(rate) == STEPS] or [rate for rate in reached if len(rate) > 1]
    low = max((float(rate.min()) for rate in full), default=1e3)
    high = min((float(rate.max()) for rate in full), default=2e3)
    values = np.geomspace(low, max(high, 1.001 * low), 4 * STEPS)
    moved = []
    for rate, total in zip(rates, totals, strict=True):
        order = np.argsort(rate)
        known = order[np.isfinite(total[order])]
        if len(known) < 2:
            moved.append(np.full(len(values), np.nan))
            continue
        moved.append(np.interp(values, rate[known], total[known], left=np.nan, right=np.nan))
    return values, moved


def best_of(curves: Sequence[Curve]) -> NDArray[np.intp]:
    """Index of the curve of least loss at each value; -1 where none is known."""
    if not curves:
        return np.zeros(0, dtype=np.intp)
    table = np.array([one.total_w for one in curves])
    filled = np.where(np.isnan(table), np.inf, table)
    return np.where(np.isinf(filled).all(axis=0), -1, filled.argmin(axis=0))


def crossings(values: Floats, curves: Sequence[Curve]) -> list[Crossing]:
    """Where the best rectifier changes, between the values by straight lines.

    Parameters
    ----------
    values : NDArray
        The varied quantity, rising, shape (n,).
    curves : sequence of Curve
        The rectifiers.

    Returns
    -------
    list of Crossing
        In rising order; where one drops out there is no line, and the middle between the values is taken.
    """
    best = best_of(curves)
    found = []
    for index in np.flatnonzero(best[1:] != best[:-1]):
        before, after = int(best[index]), int(best[index + 1])
        if before < 0 or after < 0:
            continue
        gap = curves[after].total_w[index : index + 2] - curves[before].total_w[index : index + 2]
        share = gap[0] / (gap[0] - gap[1]) if np.isfinite(gap).all() and gap[0] != gap[1] else 0.5
        at = values[index] + float(np.clip(share, 0.0, 1.0)) * (values[index + 1] - values[index])
        found.append(Crossing(at=float(at), below=curves[before].label, above=curves[after].label))
    return found
