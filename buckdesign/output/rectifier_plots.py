"""Figures of the rectifier comparison: losses by mechanism, and losses over one quantity."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from buckdesign.output.plots import COLOURS, STYLE
from buckdesign.studies.rectifier_choice import Choice, Over, best_of
from buckdesign.studies.rectifiers import Comparison, RectifierRow

if TYPE_CHECKING:
    from matplotlib.figure import Figure

BARS = 24
"""Most rectifiers in the bar chart [1]."""

CURVES = 7
"""Most curves in a figure [1]."""

_AXES = {
    Over.FREQUENCY: (1e-3, "rate of the loop [kHz]"),
    Over.LOAD: (1.0, "load [A]"),
    Over.SUPPLY: (1.0, "supply [V]"),
    Over.AMBIENT: (1.0, "ambient [°C]"),
}


def shown_rows(comparison: Comparison, most: int) -> list[RectifierRow]:
    """The rows of least loss, the design's own always among them."""
    rows = list(comparison.rows[:most])
    if comparison.own not in rows:
        rows[-1] = comparison.own
    return rows


def bar_figure(comparison: Comparison) -> Figure:
    """Losses by mechanism, one stacked bar a rectifier.

    Parameters
    ----------
    comparison : Comparison
        The comparison.

    Returns
    -------
    Figure
        At most `BARS` bars, the smallest on top.
    """
    import matplotlib
    from matplotlib.figure import Figure

    rows = shown_rows(comparison, BARS)
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(7.5, 1.4 + 0.27 * len(rows)), layout="constrained")
        axes = figure.subplots()
        places = np.arange(len(rows))
        left = np.zeros(len(rows))
        for name, colour in zip(("conduction", "recovery", "leakage"), COLOURS, strict=False):
            width = np.array([getattr(row, f"{name}_w") for row in rows])
            axes.barh(places, width, left=left, color=colour, label=name, height=0.72)
            left += width
        for place, (row, total) in enumerate(zip(rows, left, strict=True)):
            text = f" {row.junction_c:.0f} °C" if row.junction_c is not None else ""
            axes.text(total, place, f"{text}{'' if row.holds else '  drops out'}", va="center", fontsize=7.5)
        names = [f"{row.label} (own)" if row is comparison.own else row.label for row in rows]
        axes.set_yticks(places, names)
        axes.invert_yaxis()
        axes.grid(visible=False, axis="y")
        axes.set_xlim(0.0, 1.18 * float(left.max()) if left.max() > 0.0 else 1.0)
        axes.set_xlabel("loss caused by the rectifier [W]; beside it the junction")
        axes.set_title(
            f"{comparison.supply_v:g} V, {comparison.load_a:.3g} A, ambient {comparison.ambient_c:g} °C",
            loc="left",
        )
        axes.set_axisbelow(True)
        axes.legend(loc="upper right", frameon=False)
    return figure


def choice_figure(choice: Choice) -> Figure:
    """Losses over one quantity, with the values at which the choice flips.

    Parameters
    ----------
    choice : Choice
        The curves.

    Returns
    -------
    Figure
        The rectifiers that are best somewhere, then those of least mean loss, at most `CURVES`.
    """
    import matplotlib
    from matplotlib.figure import Figure

    scale, label = _AXES[choice.over]
    values = choice.values * scale
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(7.5, 4.6), layout="constrained")
        axes = figure.subplots()
        for place, index in enumerate(_worth_drawing(choice)):
            curve = choice.curves[index]
            style = ("-", "--", ":")[place // len(COLOURS) % 3]
            colour = COLOURS[place % len(COLOURS)]
            axes.plot(values, curve.total_w, style, color=colour, label=_named(choice, index))
        for crossing in choice.crossings:
            axes.axvline(crossing.at * scale, color="#808080", linewidth=0.8, linestyle=(0, (4, 3)))
            axes.annotate(
                f"{crossing.at * scale:.3g}", (crossing.at * scale, 1.0), xycoords=("data", "axes fraction"),
                xytext=(2, -2), textcoords="offset points", va="top", fontsize=7.5, rotation=90,
            )  # fmt: skip
        if choice.over is Over.FREQUENCY:
            axes.set_xscale("log")
            axes.xaxis.set_major_formatter("{x:g}")
            axes.xaxis.set_minor_formatter("{x:g}")
        axes.set_ylim(bottom=0.0)
        axes.set_xlabel(label)
        axes.set_ylabel("loss caused by the rectifier [W]")
        axes.set_title("Where the choice of the rectifier flips", loc="left")
        if choice.curves:
            axes.legend(frameon=False, fontsize=8)
    return figure


def _named(choice: Choice, index: int) -> str:
    curve = choice.curves[index]
    return f"{curve.label} (own)" if curve.is_own else curve.label


def _worth_drawing(choice: Choice) -> list[int]:
    best = [int(index) for index in best_of(choice.curves) if index >= 0]
    first = list(dict.fromkeys(best))
    means = [np.nanmean(one.total_w) + np.isnan(one.total_w).mean() for one in choice.curves]
    others = [int(index) for index in np.argsort(means) if int(index) not in first]
    return (first + ([0] if choice.curves and 0 not in first else []) + [one for one in others if one != 0])[
        :CURVES
    ]
