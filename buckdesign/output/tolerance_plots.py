"""Figure of a tolerance study: yields, where the spread comes from, and what tighter parts bring."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from buckdesign.output.plots import COLOURS, STYLE
from buckdesign.output.tolerance_text import weakest
from buckdesign.studies.tolerance_result import ToleranceStudy
from buckdesign.studies.unit_runs import UnitRuns
from buckdesign.studies.yields import Yield, yield_of

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

BARS = 8
"""Most bars of a panel [1]."""

NEW, AGED = COLOURS[0], COLOURS[1]

UNCERTAIN = "#b0b0b0"
"""Colour of a gain that chance alone may have brought."""

_BAR = 0.36


def study_figure(study: ToleranceStudy, name: str) -> Figure:
    """The study as bars.

    Parameters
    ----------
    study : ToleranceStudy
        The results.
    name : str
        What the design is called.

    Returns
    -------
    Figure
        Yields with their 95 % intervals, new and aged; shares of the variance of the weakest requirement's margin;
        what half of a tolerance would bring.
    """
    import matplotlib
    from matplotlib.figure import Figure

    with matplotlib.rc_context(STYLE):
        gains = 0 < study.total.passed < study.total.units
        heights = (2.9, 2.6 if study.sensitivity else 0.5, 2.6 if gains else 0.5)
        figure = Figure(figsize=(8.5, sum(heights)), layout="constrained")
        panels = figure.subplots(3, 1, height_ratios=heights)
        _draw_yields(panels[0], study)
        _draw_sensitivity(panels[1], study)
        _draw_tighter(panels[2], study)
        figure.suptitle(f"Tolerances of {name}: {len(study.runs)} units, seed {study.seed}", fontsize=11.0)
    return figure


def _draw_yields(axes: Axes, study: ToleranceStudy) -> None:
    names = [name for name in study.runs.requirements if name in study.shown]
    labels = ["all of them", *names]
    places = np.arange(len(labels), dtype=float)
    _yield_bars(axes, places - _BAR / 2.0, _yields(study.runs, names), NEW, "new")
    if study.aged is not None and study.wear is not None:
        label = f"after {study.wear.hours:g} h"
        _yield_bars(axes, places + _BAR / 2.0, _yields(study.aged, names), AGED, label)
    axes.set_yticks(places, labels)
    axes.invert_yaxis()
    axes.grid(visible=False, axis="y")
    axes.set_xlim(0.0, 112.0)
    axes.set_xticks(range(0, 101, 20))
    axes.set_axisbelow(True)
    axes.set_xlabel("units that keep it at every point [%], with the 95 % interval")
    axes.set_title("Yield", loc="left")
    if study.aged is not None:
        axes.legend(loc="lower right", bbox_to_anchor=(1.0, 1.0), ncols=2, frameon=False, fontsize=8)


def _yields(runs: UnitRuns, names: list[str]) -> list[Yield]:
    single = [yield_of(runs.holds[:, runs.names.index(name)]) for name in names]
    return [yield_of(runs.passes), *single]


def _yield_bars(axes: Axes, places: np.ndarray, yields: list[Yield], colour: str, label: str) -> None:
    share = 100.0 * np.array([one.share for one in yields])
    ends = 100.0 * np.array([[one.share - one.low, one.high - one.share] for one in yields]).T
    bars = {"ecolor": "#404040", "elinewidth": 0.9, "capsize": 2.0}
    axes.barh(
        places, share, height=_BAR, color=colour, label=label, xerr=np.maximum(ends, 0.0), error_kw=bars
    )
    for place, one in zip(places, yields, strict=True):
        axes.text(100.0 * one.high + 1.0, place, f"{100.0 * one.share:.1f}", va="center", fontsize=7.5)


def _draw_sensitivity(axes: Axes, study: ToleranceStudy) -> None:
    found = study.sensitivity
    axes.grid(visible=False, axis="y")
    if found is None:
        _say(axes, "Where the spread comes from", "not computed")
        return
    name = weakest(study, found.names, 1)[0]
    row = found.names.index(name)
    order = found.order(name)[:BARS]
    places = np.arange(len(order), dtype=float)
    for shift, kind, colour, label in (
        (-_BAR / 2.0, "first", COLOURS[2], "by itself"),
        (_BAR / 2.0, "total", COLOURS[3], "in all it takes part in"),
    ):
        value, low, high = (
            np.clip(getattr(found, f"{kind}{end}")[row, order], 0.0, 1.0) for end in ("", "_low", "_high")
        )
        ends = np.maximum([value - low, high - value], 0.0)
        bars = {"ecolor": "#404040", "elinewidth": 0.9, "capsize": 2.0}
        axes.barh(places + shift, value, height=_BAR, color=colour, label=label, xerr=ends, error_kw=bars)
    axes.set_yticks(places, [found.keys[place] for place in order])
    axes.invert_yaxis()
    axes.set_axisbelow(True)
    axes.set_xlim(0.0, 1.04)
    axes.set_xlabel("share of the variance of the margin, with the 95 % interval")
    axes.set_title(f"Where the spread comes from: {name}", loc="left")
    axes.legend(loc="lower right", frameon=False, fontsize=8)


def _draw_tighter(axes: Axes, study: ToleranceStudy) -> None:
    axes.grid(visible=False, axis="y")
    if study.total.passed in (0, study.total.units):
        _say(
            axes,
            "Half the tolerance of one value",
            "every unit passes" if study.total.passed else "no unit passes",
        )
        return
    shown = study.tighter[:BARS]
    places = np.arange(len(shown), dtype=float)
    gain = 100.0 * np.array([one.gain for one in shown])
    error = 200.0 * np.array([one.gain_error if np.isfinite(one.gain_error) else 0.0 for one in shown])
    bars = {"ecolor": "#404040", "elinewidth": 0.9, "capsize": 2.0}
    certain = np.array([one.is_certain for one in shown])
    for which, colour, label in ((certain, NEW, "certain"), (~certain, UNCERTAIN, "may be chance")):
        if which.any():
            axes.barh(
                places[which], gain[which], height=2.0 * _BAR, color=colour, label=label,
                xerr=error[which], error_kw=bars,
            )  # fmt: skip
    axes.set_yticks(places, [one.key for one in shown])
    axes.invert_yaxis()
    axes.set_axisbelow(True)
    axes.axvline(0.0, color="#404040", linewidth=0.8)
    axes.set_xlabel("gain of the yield [points], with twice its standard error")
    axes.set_title("Half the tolerance of one value", loc="left")
    axes.legend(loc="lower right", frameon=False, fontsize=8)


def _say(axes: Axes, title: str, text: str) -> None:
    axes.set_title(title, loc="left")
    axes.set_axis_off()
    axes.text(0.0, 0.5, text, va="center", transform=axes.transAxes)
