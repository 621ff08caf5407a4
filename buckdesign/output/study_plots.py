"""Figures of a sweep: the front between two objectives, and each result against each varied key."""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from itertools import combinations
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.errors import InputError
from buckdesign.output.plots import COLOURS, STYLE
from buckdesign.studies.axis import LogSteps, Spacing
from buckdesign.studies.sweep import SweepResult
from buckdesign.studies.table_file import LIST_SEPARATOR

if TYPE_CHECKING:
    import pandas as pd
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

PAIRS, ACROSS = 15, 3
"""Most pairs of objectives in a figure (all of up to six), and how many stand side by side [1]."""

MOST_GROUPS = 24
"""Most different values of a key that get a bar of their own; more are drawn as points [1]."""

BINS = 15
"""Pieces in which the median of many different values is taken [1]."""

MOST_ROWS, MOST_KEYS = 12, 12
"""Most results and most varied keys in a figure [1]."""

MAIN_RESULTS = (
    "frequency_hz", "ripple_v", "output_voltage_v", "efficiency", "total_loss_w", "junction_c.transistor", "choke_c",
)  # fmt: skip
"""Results that are drawn where none are named, beside the objectives."""

MOST_TICKS = 8
"""Most numbers at an axis of groups [1]."""

PANEL, NAME, MOST_WIDE = 2.3, 0.15, 15.0
"""Width of a panel, of a name in it, and of the widest panel [inch]."""

TICK_WIDTH = 20
"""Characters in a line of a tick, beyond which it goes on in the next [1]."""

_FAINT = "#b9b9b9"
_UNITS = {"degC": "°C", "ohm": "Ω", "cm3": "cm³", "1": "", "%": ""}


@dataclass(frozen=True, kw_only=True)
class StudyPoints:
    """What the figures show.

    Attributes
    ----------
    sample : DataFrame
        Rows evenly spread over the table, those that could be computed.
    keeps : NDArray
        Which of them keep every constraint, shape (n,).
    front : DataFrame
        Rows on the front.
    objectives : tuple of str
        Columns, those to be small first.
    maximised : tuple of str
        Those of them that are to be large.
    keys : tuple of str
        Varied keys.
    logarithmic : frozenset of str
        Those that the study spaces in equal ratios.
    units : Mapping
        Unit by column, as `buckdesign.units` names it; absent: none.
    count : int
        Points that could be computed, of which `sample` has all or some.
    shown : Mapping
        Text of a tick by column and text of the table, where it is another one.
    """

    sample: pd.DataFrame
    keeps: NDArray[np.bool_]
    front: pd.DataFrame
    objectives: tuple[str, ...]
    maximised: tuple[str, ...]
    keys: tuple[str, ...]
    logarithmic: frozenset[str]
    units: Mapping[str, str]
    count: int
    shown: Mapping[tuple[str, str], str]

    def label(self, column: str) -> str:
        """A column with its unit, for an axis."""
        unit = self.units.get(column, "")
        shown = _UNITS.get(unit, unit)
        return f"{column} [{shown}]" if shown else column

    def short_label(self, column: str) -> str:
        """The same on two lines where it is long."""
        whole = self.label(column)
        if len(whole) <= 18:
            return whole
        head, dot, tail = whole.partition(".")
        return f"{head}.\n{tail}" if dot else whole.replace(" [", "\n[")

    @property
    def drawn(self) -> str:
        """How many of the points are drawn."""
        if len(self.sample) == self.count:
            return f"{self.count:,} points"
        return f"{len(self.sample):,} of {self.count:,} points, evenly spread"


def front_figure(points: StudyPoints) -> Figure:
    """The front: every pair of objectives, or one objective against each varied key.

    Parameters
    ----------
    points : StudyPoints
        What to show.

    Returns
    -------
    Figure
        Computed points in grey, those that keep every constraint darker, the front in colour.
    """
    import matplotlib
    from matplotlib.figure import Figure

    if len(points.objectives) == 1:
        return effects_figure(points, points.objectives)
    pairs = list(combinations(points.objectives, 2))[:PAIRS]
    with matplotlib.rc_context(STYLE):
        columns, rows = min(len(pairs), ACROSS), -(-len(pairs) // ACROSS)
        figure = Figure(figsize=(max(6.0, 4.2 * columns), 0.4 + 4.0 * rows), layout="constrained")
        panels = figure.subplots(rows, columns, squeeze=False).ravel()
        for axes in panels[len(pairs) :]:
            axes.remove()
        for axes, (across, up) in zip(panels[: len(pairs)], pairs, strict=True):
            _draw_pair(axes, points, across, up, joined=len(points.objectives) == 2)
        handles, names = panels[0].get_legend_handles_labels()
        figure.legend(handles, names, loc="outside upper left", ncols=3, frameon=False)
        _caption(figure, points.drawn)
    return figure


def _caption(figure: Figure, text: str) -> None:
    figure.supxlabel(text, fontsize=8.0, color="#666666", x=0.995, ha="right")


def _draw_pair(axes: Axes, points: StudyPoints, across: str, up: str, *, joined: bool) -> None:
    sample, keeps, front = points.sample, points.keeps, points.front
    if not keeps.all():
        axes.scatter(
            sample[across][~keeps], sample[up][~keeps], s=9, facecolors="none", edgecolors=_FAINT,
            linewidths=0.6, label="a constraint fails",
        )  # fmt: skip
    name = "computed" if keeps.all() else "every constraint holds"
    axes.scatter(sample[across][keeps], sample[up][keeps], s=9, color="#7d8794", linewidths=0, label=name)
    ordered = front.sort_values([across, up])
    if joined and len(ordered) > 1:
        style = _step_style(across in points.maximised)
        axes.plot(ordered[across], ordered[up], drawstyle=style, color=COLOURS[1], linewidth=1.0, zorder=2)
    axes.scatter(ordered[across], ordered[up], s=22, color=COLOURS[1], zorder=3, label="front")
    axes.set_xlabel(points.label(across) + _aim(across, points))
    axes.set_ylabel(points.label(up) + _aim(up, points))
    _focus(axes, points, across, up)


def _step_style(is_maximised: bool) -> Any:
    """Between two points of a front nothing better than the worse of both is known."""
    return "steps-pre" if is_maximised else "steps-post"


def _aim(column: str, points: StudyPoints) -> str:
    return ", large is good" if column in points.maximised else ", small is good"


def _focus(axes: Axes, points: StudyPoints, across: str, up: str) -> None:
    """Leave far outliers out of sight; the front is always seen."""
    for column, set_limits in ((across, axes.set_xlim), (up, axes.set_ylim)):
        values = points.sample[column].to_numpy(dtype=float)
        values = values[np.isfinite(values)]
        if len(values) < 20:
            continue
        low, high = np.quantile(values, (0.0, 0.98))
        shown = points.front[column].to_numpy(dtype=float)
        low, high = min(low, shown.min(initial=low)), max(high, shown.max(initial=high))
        span = high - low
        if span > 0.0:
            set_limits(low - 0.05 * span, high + 0.08 * span)


def effects_figure(points: StudyPoints, results: Sequence[str]) -> Figure:
    """Each result against each varied key.

    Parameters
    ----------
    points : StudyPoints
        What to show.
    results : sequence of str
        Columns; at most `MOST_ROWS` are drawn.

    Returns
    -------
    Figure
        One row a result, one column a varied key: span, middle half and median where a key has few values,
        else points and a running median; of all points, whether they keep the constraints or not.
    """
    import matplotlib
    from matplotlib.figure import Figure
    from matplotlib.ticker import EngFormatter, LogLocator, NullFormatter

    shown, keys = list(results)[:MOST_ROWS], list(points.keys)[:MOST_KEYS]
    with matplotlib.rc_context(STYLE):
        widths = [_panel_width(points.sample[key]) for key in keys]
        size = (max(4.5, 1.2 + sum(widths)), 0.9 + 1.75 * len(shown))
        figure = Figure(figsize=size, layout="constrained")
        panels = figure.subplots(
            len(shown), len(keys), squeeze=False, sharey="row", sharex="col", width_ratios=widths
        )
        for row, result in zip(panels, shown, strict=True):
            for axes, key in zip(row, keys, strict=True):
                _draw_effect(axes, points, key, result)
            row[0].set_ylabel(points.short_label(result))
            if points.sample[result].abs().max() >= 1e4:
                row[0].yaxis.set_major_formatter(EngFormatter(sep=""))
        for axes, key in zip(panels[-1], keys, strict=True):
            axes.set_xlabel(points.label(key))
            if _groups(points.sample[key]) is not None:
                continue
            if key in points.logarithmic:
                axes.xaxis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
                axes.xaxis.set_minor_formatter(NullFormatter())
            if key in points.logarithmic or not 1e-2 <= points.sample[key].abs().max() < 1e4:
                axes.xaxis.set_major_formatter(EngFormatter(sep=""))
        figure.align_ylabels(panels[:, 0])
        _caption(figure, _effects_caption(points, keys, results))
    return figure


def _panel_width(along: Any) -> float:
    """Width of a column [inch]: many names want room."""
    groups = _groups(along)
    many = len(groups) if groups is not None and isinstance(groups[0], str) else 0
    return min(max(PANEL, NAME * many), MOST_WIDE)


def _effects_caption(points: StudyPoints, keys: Sequence[str], results: Sequence[str]) -> str:
    groups = [_groups(points.sample[key]) for key in keys]
    parts = []
    if any(one is not None for one in groups):
        parts.append("bars: median, middle half, span")
    if any(one is None for one in groups):
        parts.append("lines: running median")
    parts.append(points.drawn)
    for what, drawn, whole in (("keys", len(keys), len(points.keys)), ("results", MOST_ROWS, len(results))):
        if drawn < whole:
            parts.append(f"first {drawn} of {whole} {what}")
    return "\n".join(("; ".join(parts[:-1]), parts[-1])) if len(keys) == 1 else "; ".join(parts)


def _draw_effect(axes: Axes, points: StudyPoints, key: str, result: str) -> None:
    values = points.sample[result].to_numpy(dtype=float)
    along = points.sample[key]
    groups = _groups(along)
    if groups is not None:
        _draw_groups(axes, groups, along, values)
        names = [_tick(one, points.shown.get((key, str(one)))) for one in groups]
        _name_groups(axes, names, thin=not isinstance(groups[0], str))
        return
    place = along.to_numpy(dtype=float)
    axes.scatter(place, values, s=4, color=_FAINT, linewidths=0)
    is_log = key in points.logarithmic
    if is_log:
        axes.set_xscale("log")
    middle, median = _running_median(np.log(place) if is_log else place, values)
    axes.plot(np.exp(middle) if is_log else middle, median, color=COLOURS[0])


def _groups(along: Any) -> list[Any] | None:
    """The different values of a key where they are few, in order."""
    different = sorted(along.unique().tolist(), key=_order)
    is_word = any(isinstance(one, str) for one in different)
    return different if is_word or len(different) <= MOST_GROUPS else None


def _order(value: Any) -> tuple[bool, Any]:
    """Lists of numbers in the order of the numbers, words in that of the alphabet."""
    if not isinstance(value, str):
        return False, (value,)
    try:
        return False, tuple(float(one) for one in value.split(LIST_SEPARATOR))
    except ValueError:
        return True, value


def _draw_groups(axes: Axes, groups: list[Any], along: Any, values: NDArray[np.float64]) -> None:
    places = np.arange(len(groups))
    for place, group in zip(places, groups, strict=True):
        some = values[(along == group).to_numpy()]
        some = some[np.isfinite(some)]
        if not len(some):
            continue
        low, first, middle, third, high = np.quantile(some, (0.0, 0.25, 0.5, 0.75, 1.0))
        axes.plot([place, place], [low, high], color=_FAINT, linewidth=1.2, zorder=1)
        width = max(2.0, 6.0 - 0.2 * len(groups))
        axes.plot([place, place], [first, third], color="#8aa3bd", linewidth=width, solid_capstyle="butt", zorder=2)
        axes.plot([place - 0.28, place + 0.28], [middle, middle], color=COLOURS[0], linewidth=1.6, zorder=3)
    axes.set_xlim(-0.6, len(groups) - 0.4)
    axes.grid(visible=False, axis="x")


def _name_groups(axes: Axes, names: Sequence[str], *, thin: bool) -> None:
    every = -(-len(names) // MOST_TICKS) if thin else 1
    places, names = range(0, len(names), every), names[::every]
    lines = [line for name in names for line in name.split("\n")]
    long = max(map(len, lines)) * len(names) > 22
    upright = long and len(names) > 4
    axes.set_xticks(
        places, names, rotation=90 if upright else 40 if long else 0,
        ha="center" if upright or not long else "right", fontsize=7.0 if long and len(names) > 12 else None,
    )  # fmt: skip


def _tick(value: Any, shown: str | None = None) -> str:
    if shown is not None:
        value = shown
    if isinstance(value, bool | np.bool_):
        return "true" if value else "false"
    if isinstance(value, str):
        return "\n".join(textwrap.wrap(value, TICK_WIDTH, break_on_hyphens=False)) or "-"
    from matplotlib.ticker import EngFormatter

    if abs(value) >= 1e4 or 0.0 < abs(value) < 1e-2:
        return str(EngFormatter(sep="")(float(f"{value:.3g}")))
    return f"{value:.3g}"


def _running_median(place: NDArray[np.float64], values: NDArray[np.float64]) -> tuple[Any, Any]:
    edges = np.linspace(place.min(), place.max(), BINS + 1)
    number = np.clip(np.digitize(place, edges) - 1, 0, BINS - 1)
    middle = 0.5 * (edges[1:] + edges[:-1])
    median = np.array([_median(values[number == one]) for one in range(BINS)])
    known = np.isfinite(median)
    return middle[known], median[known]


def _median(values: NDArray[np.float64]) -> float:
    known = values[np.isfinite(values)]
    return float(np.median(known)) if len(known) else float("nan")


def main_results(points: StudyPoints) -> list[str]:
    """The results that are drawn where none are named: objectives, then what every designer asks.

    Parameters
    ----------
    points : StudyPoints
        What is shown.

    Returns
    -------
    list of str
        Those of them that are known and not the same everywhere.
    """
    wanted = dict.fromkeys([*points.objectives, *MAIN_RESULTS])
    return [name for name in wanted if points.sample[name].nunique() > 1] or [points.objectives[0]]


def study_points(result: SweepResult) -> StudyPoints:
    """What the figures of a sweep show.

    Parameters
    ----------
    result : SweepResult
        A finished sweep.

    Returns
    -------
    StudyPoints
        Of the rows that could be computed.

    Raises
    ------
    InputError
        None could be computed.
    """
    sample = result.sample()
    sample = sample[sample["failure"] == ""]
    if not len(sample):
        raise InputError(f"{result.path}: no point could be computed, there is nothing to draw")
    objectives = result.task.objectives
    keeps = np.ones(len(sample), dtype=bool)
    if objectives.subject_to:
        keeps = sample["constraints_hold"].to_numpy(dtype=bool)
    return StudyPoints(
        sample=sample,
        keeps=keeps,
        front=result.front(),
        objectives=objectives.names,
        maximised=objectives.maximise,
        keys=tuple(result.task.study.space.keys),
        logarithmic=frozenset(
            one.name
            for axis in result.task.study.space.axes
            for one in axis.varied
            if isinstance(one.source, LogSteps) or getattr(one.source, "spacing", None) is Spacing.LOG
        ),
        units=result.task.units,
        count=result.summary.count - result.summary.failed,
        shown=_shown(result, sample),
    )


def _shown(result: SweepResult, sample: pd.DataFrame) -> dict[tuple[str, str], str]:
    """Texts of varied keys that a reader wants otherwise."""
    told = {}
    for key in result.task.study.space.keys:
        if result.task.kinds[key] == "text":
            for text in sample[key].unique().tolist():
                told[key, text] = result.task.shown_text(key, text)
    return told
