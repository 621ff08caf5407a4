"""A tolerance study as text for the terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

from buckdesign.output.simulation import listing
from buckdesign.output.text import Column, signs, text_table
from buckdesign.output.wide_tables import WIDTH, noted_table, wrapped_table
from buckdesign.studies.ageing import Wear
from buckdesign.studies.sensitivity import LEAST_MARGIN, Sensitivity
from buckdesign.studies.tolerance_keys import DESIGN_FILE, GIVEN, Varied
from buckdesign.studies.tolerance_result import ToleranceStudy, WorstUnit
from buckdesign.studies.worst_case import WorstCorner
from buckdesign.studies.yields import Tighter, Yield
from buckdesign.units import format_quantity

LEADING = 3
"""Values named of a worst corner [1]."""

SENSITIVE, SENSITIVE_LIMITS = 6, 3
"""Values listed by their share of a margin's spread, and margins for which they are [1]."""

TIGHTER = 6
"""Values listed by what a tighter tolerance brings [1]."""

NEAR_MARGIN = 0.1
"""Margin at the worst corner below which a single part limit is listed [1] (own choice)."""


def study_text(study: ToleranceStudy, name: str) -> str:
    """The study as text.

    Parameters
    ----------
    study : ToleranceStudy
        The results.
    name : str
        What the design is called.

    Returns
    -------
    str
        Tolerances, yields, worst case, worst units, where the spread comes from, what a tighter part brings.
    """
    blocks = [
        _title(study, name),
        "Tolerances\n" + _tolerances(study.varied),
        "Yield: units that keep it at every point\n" + _yields(study),
        _worst_title(study) + "\n" + _corners(study),
        "Worst units, and their most extreme values; the same command with --unit N shows one\n"
        + _units(study),
    ]
    if study.sensitivity is not None:
        blocks.append(
            "Where the spread comes from: share of a margin's variance, by itself and in all it takes part in\n"
            + _sensitivity(study, study.sensitivity)
        )
    blocks.append("Half the tolerance of one value: what the yield becomes\n" + _tighter(study))
    blocks.append(listing("Mind", _remarks(study)))
    return "\n\n".join(blocks)


def _title(study: ToleranceStudy, name: str) -> str:
    kind = "electrical only" if study.model.electrical_only else "with losses and temperatures"
    points = len(study.model.points)
    share = f"all {points}" if points == study.range_points else f"{points} of the {study.range_points}"
    text = f"Tolerances of {name}: {len(study.runs)} units, seed {study.seed}, {kind}, at {share} points of the range"
    return textwrap.fill(text, WIDTH, break_long_words=False, break_on_hyphens=False)


def _tolerances(varied: Sequence[Varied]) -> str:
    columns = [
        Column(heading="value"),
        Column(heading="nominal", right=True),
        Column(heading="tolerance", right=True),
        Column(heading="spread"),
        Column(heading="source"),
    ]
    rows = [
        [
            one.key,
            format_quantity(one.value, one.unit),
            band_text(one.tolerance.low, one.tolerance.high),
            one.tolerance.distribution.value,
            one.source,
        ]
        for one in varied
    ]
    return wrapped_table(columns, rows)


def short_names(varied: Sequence[Varied]) -> dict[str, str]:
    """Keys without their table where no other key ends alike, and in words."""
    ends = [one.key.rpartition(".")[2] for one in varied]
    return {
        one.key: (end if ends.count(end) == 1 else one.key.replace(".", " ")).replace("_", " ")
        for one, end in zip(varied, ends, strict=True)
    }


def band_text(low: float, high: float) -> str:
    """A band of deviations, such as ``±10 %`` or ``-50 % to +100 %``."""
    if abs(low + high) < 1e-9:
        return f"±{100.0 * high:.3g} %"
    return f"{100.0 * low:+.3g} % to {100.0 * high:+.3g} %"


def percent(share: float) -> str:
    """A share in per cent, 100 and 0 only where they are exact."""
    text = f"{100.0 * share:.1f}"
    if share < 1.0 and text == "100.0":
        return "> 99.9 %"
    if share > 0.0 and text == "0.0":
        return "< 0.1 %"
    return f"{text} %"


def margin_text(margin: float) -> str:
    """A relative margin; a dash where a value can't be given."""
    if not abs(margin) < 1e6:
        return "-"
    rounded = float(f"{100.0 * margin:.3g}")
    return f"{rounded:+.10g} %" if abs(rounded) >= 0.01 else "+0 %"


def _yields(study: ToleranceStudy) -> str:
    columns = [Column(heading="requirement"), *_yield_columns("new")]
    if study.aged is not None and study.wear is not None:
        columns += _yield_columns(f"after {study.wear.hours:g} h")
    columns.append(Column(heading="design itself", right=True))
    rows = [["all of them", *_yield_cells(study.total), *_aged_cells(study, None), ""]]
    rows += [_yield_row(study, name, name) for name in study.runs.requirements if name in study.shown]
    rows += [_yield_row(study, f"  {name}", name) for name in _parts_worth_listing(study)]
    return text_table(columns, rows)


def _yield_columns(heading: str) -> list[Column]:
    return [Column(heading=heading, right=True), Column(heading="95 % interval", right=True)]


def _yield_row(study: ToleranceStudy, shown: str, name: str) -> list[str]:
    nominal = float(study.worst_case.nominal.margins(name)[0])
    return [shown, *_yield_cells(study.yield_by(name)), *_aged_cells(study, name), margin_text(nominal)]


def _yield_cells(one: Yield) -> list[str]:
    return [percent(one.share), f"{100.0 * one.low:.1f} to {100.0 * one.high:.1f}"]


def _aged_cells(study: ToleranceStudy, name: str | None) -> list[str]:
    if study.aged is None:
        return []
    total = study.aged_total
    assert total is not None
    return _yield_cells(total if name is None else study.yield_by(name, study.aged))


def _parts_worth_listing(study: ToleranceStudy) -> list[str]:
    """Single part limits that some unit does not keep."""
    found = []
    for name in study.runs.parts:
        aged = study.aged
        if name in study.shown and (
            study.yield_by(name).share < 1.0 or (aged is not None and study.yield_by(name, aged).share < 1.0)
        ):
            found.append(name)
    return found


def _worst_title(study: ToleranceStudy) -> str:
    how = "all" if study.worst_case.is_exhaustive else "searched,"
    return (
        f"Worst case: every value at an end of its tolerance ({how} {study.worst_case.corners} corners), and what "
        "matters there most"
    )


def _corners(study: ToleranceStudy) -> str:
    columns = [
        Column(heading="requirement"),
        Column(heading="worst", right=True),
        Column(heading="limit", right=True),
        Column(heading="margin", right=True),
        Column(heading="at"),
    ]
    required = [one for one in study.worst_case.worst if one.name in study.runs.requirements]
    parts = [one for one in study.worst_case.worst if one.name in study.runs.parts]
    near = sorted((one for one in parts if one.margin < NEAR_MARGIN), key=lambda one: one.margin)
    shown = (*required, *near)
    return noted_table(
        columns, [_corner_row(study, one) for one in shown], [_leading(study, one) for one in shown]
    )


def _corner_row(study: ToleranceStudy, corner: WorstCorner) -> list[str]:
    unit = study.runs.units[study.runs.names.index(corner.name)]
    return [
        corner.name,
        value_text(corner.value, unit),
        value_text(corner.limit, unit),
        margin_text(corner.margin),
        signs(study.model.where(corner.point)),
    ]


def _leading(study: ToleranceStudy, corner: WorstCorner) -> str:
    """The values that matter most at a corner, and where they stand there."""
    by, names = {one.key: one for one in study.varied}, short_names(study.varied)
    told = []
    for key in corner.leading[:LEADING]:
        band = by[key].tolerance
        told.append(f"{names[key]} {100.0 * (band.high if corner.signs[key] > 0 else band.low):+.3g} %")
    return ", ".join(told)


def value_text(value: float | None, unit: str) -> str:
    """A value with its unit; a dash where it can't be given."""
    return "-" if value is None else format_quantity(value, unit, digits=4)


def _units(study: ToleranceStudy) -> str:
    columns = [
        Column(heading="unit", right=True),
        Column(heading="keeps least"),
        Column(heading="value", right=True),
        Column(heading="limit", right=True),
        Column(heading="margin", right=True),
        Column(heading="at"),
    ]
    units, names = study.worst_units(), short_names(study.varied)
    notes = [
        ", ".join(f"{names[key]} {100.0 * deviation:+.3g} %" for key, _, deviation in one.extremes)
        for one in units
    ]
    return noted_table(columns, [_unit_row(study, one) for one in units], notes)


def _unit_row(study: ToleranceStudy, one: WorstUnit) -> list[str]:
    unit = study.runs.units[study.runs.names.index(one.name)]
    return [
        str(one.unit),
        one.name,
        value_text(one.value, unit),
        value_text(one.limit, unit),
        margin_text(one.margin),
        signs(one.where),
    ]


def weakest(study: ToleranceStudy, names: Sequence[str], count: int) -> list[str]:
    """Requirements that most units fail, then those with the smallest margins.

    Parameters
    ----------
    study : ToleranceStudy
        The results.
    names : sequence of str
        To choose from.
    count : int
        How many.

    Returns
    -------
    list of str
        The weakest first.
    """
    order = sorted(
        names, key=lambda name: (study.yield_by(name).share, float(study.runs.margins(name).min()))
    )
    return order[:count]


def _sensitivity(study: ToleranceStudy, found: Sensitivity) -> str:
    columns = [
        Column(heading="margin to"),
        Column(heading="value"),
        Column(heading="itself", right=True),
        Column(heading="95 % interval", right=True),
        Column(heading="in all", right=True),
        Column(heading="95 % interval", right=True),
    ]
    rows = []
    for name in weakest(study, found.names, SENSITIVE_LIMITS):
        row = found.names.index(name)
        for rank, place in enumerate(found.order(name)[:SENSITIVE]):
            cells = [name if rank == 0 else "", found.keys[place]]
            for kind in ("first", "total"):
                value, low, high = (
                    getattr(found, f"{kind}{end}")[row, place] for end in ("", "_low", "_high")
                )
                cells += [share_text(value), f"{share_text(low)} to {share_text(high)}"]
            rows.append(cells)
    return text_table(columns, rows)


def share_text(share: float) -> str:
    """A share of a variance; an estimate that chance has put outside 0 to 1 as the nearer of these."""
    return f"{min(max(share, 0.0), 1.0):.2f}"


def _tighter(study: ToleranceStudy) -> str:
    if study.total.passed == study.total.units:
        return "every unit passes: nothing to gain"
    if study.total.passed == 0:
        return "no unit passes: a tighter tolerance of one value alone does not help; see the design itself"
    columns = [
        Column(heading="value"),
        Column(heading="half the tolerance", right=True),
        Column(heading="yield", right=True),
        Column(heading="gain", right=True),
        Column(heading=""),
    ]
    return text_table(columns, [_tighter_row(one) for one in study.tighter[:TIGHTER]])


def _tighter_row(one: Tighter) -> list[str]:
    gain = f"{100.0 * one.gain:+.1f} ± {200.0 * one.gain_error:.1f} points"
    note = "" if one.is_certain else "not certain"
    return [one.key, band_text(one.low, one.high), percent(one.share), gain, note]


def _chosen(varied: Sequence[Varied]) -> str:
    """Which values vary, and what else could."""
    given = sum(one.source in (DESIGN_FILE, GIVEN) for one in varied)
    if given == len(varied):
        return "only these values vary; usual tolerances for the others come with --defaults"
    if given:
        return "usual tolerances stand in for what the design's [tolerance] table leaves out"
    return "the design has no [tolerance] table: these are usual tolerances; a table of its own replaces them"


def _remarks(study: ToleranceStudy) -> list[str]:
    told = [*study.warnings, _chosen(study.varied)]
    told.append(
        "a unit passes where its worst point does; it is judged by its own values, not by guaranteed ones, and starts "
        "by itself where its start margin at full load, all parts at ambient temperature, is above 1"
    )
    told.append("supply, load and ambient are those of the requirement's range, no tolerances of their own")
    if len(study.model.points) < study.range_points:
        told.append(
            "of its points those count at full load, and those where some limit was worst with one value at an end "
            "of its tolerance; --all-points takes all"
        )
    told.append("normal and lognormal: the tolerance is three standard deviations, nothing lies beyond")
    told.append(
        "values differ independently of each other; half a tolerance weighs the same units anew, and its gain "
        "stands with two standard errors: not certain where it is below three, since the largest of many gains "
        "is large by chance"
    )
    if study.sensitivity is not None:
        told.append(_about_shares(study.sensitivity))
    if study.wear is not None:
        told.append(_ageing(study.wear))
    return told


def _about_shares(found: Sensitivity) -> str:
    """How to read the shares."""
    held = f"; {len(found.held)} values that hardly matter are held at nominal" if found.held else ""
    return (
        "shares: 1 is all of a margin's variance; what values cause by themselves adds up to 1 at most, and to less "
        f"where they act through each other, which counts in all of these. Estimates from {found.samples} base "
        f"samples, shown within 0 to 1{held}; margins below {100.0 * LEAST_MARGIN:.0f} % count as that"
    )


def _ageing(wear: Wear) -> str:
    """What ages, and how."""
    known = wear.to_dict()
    parts = []
    if (used := known["capacitor_life_used"]) is not None:
        parts.append(
            f"the output capacitor has used {percent(used)} of its life by the 10 K rule, at the end of which it has "
            "20 % less capacitance and twice its ESR"
        )
    if (used := known["core_ageing_used"]) is not None:
        parts.append(
            f"the iron powder {percent(used)} of the hours after which its eddy loss is taken to have doubled"
        )
    where = f"after {wear.hours:g} h at nominal supply, full load and highest ambient"
    if not parts:
        return f"{where} nothing has aged"
    return f"{where} (median of the units) {', '.join(parts)}; nothing else ages"
