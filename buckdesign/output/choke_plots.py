"""Figures of the choke bench: inductance under bias, and loss against volume of what can be wound."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

from buckdesign.design.choke_bias import BiasCurve
from buckdesign.design.choke_search import ChokeChoice

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_NAMED = 6
"""Chokes of the Pareto set that are named in the figure."""

_MOST_DOTS = 4000
"""Chokes drawn; of more an even sample, which keeps files small."""


def bias_figure(curve: BiasCurve, mark_current: float | None = None) -> Figure:
    """Inductance against direct current with its band.

    Parameters
    ----------
    curve : BiasCurve
        The curve.
    mark_current : float, optional
        A current to mark, such as the one at work [A].

    Returns
    -------
    Figure
        One panel; own readings as points.
    """
    import matplotlib
    from matplotlib.figure import Figure

    from buckdesign.output.plots import COLOURS, STYLE

    scale, unit = _henries(float(curve.inductance_h[0]))
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(7.0, 4.4), layout="constrained")
        axes = figure.subplots()
        low, high = curve.inductance_low_h * scale, curve.inductance_high_h * scale
        axes.fill_between(curve.current_a, low, high, color=COLOURS[0], alpha=0.18, lw=0.0, label=curve.band)
        axes.plot(curve.current_a, curve.inductance_h * scale, color=COLOURS[0], label="inductance")
        if curve.points:
            at = [one.current for one in curve.points]
            read = [one.inductance * scale for one in curve.points]
            axes.plot(at, read, "o", color=COLOURS[1], markersize=4.5, label="own readings")
        if mark_current is not None:
            _mark(axes, curve, mark_current, scale, unit)
        axes.set_xlim(0.0, float(curve.current_a[-1]))
        axes.set_ylim(0.0, float(high.max()) * 1.08)
        axes.set_xlabel("direct current [A]")
        axes.set_ylabel(f"inductance [{unit}]")
        stack = f"{curve.stack} x " if curve.stack > 1 else ""
        axes.set_title(f"{stack}{curve.core}, {curve.material}, {curve.turns} turns", loc="left")
        axes.legend(frameon=False, loc="upper right")
    return figure


def choice_figure(choice: ChokeChoice, title: str) -> Figure:
    """Loss against volume of all chokes that do a job, the Pareto set marked.

    Parameters
    ----------
    choice : ChokeChoice
        The chokes, at least one.
    title : str
        One line above it.

    Returns
    -------
    Figure
        One panel with logarithmic axes.
    """
    import matplotlib
    from matplotlib.figure import Figure

    from buckdesign.output.plots import COLOURS, STYLE

    volume, loss = choice.windings.volume_m3 * 1e6, choice.windings.total_loss_w
    shown = np.unique(np.linspace(0, len(volume) - 1, min(len(volume), _MOST_DOTS)).astype(int))
    best = choice.pareto
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(7.0, 5.0), layout="constrained")
        axes = figure.subplots()
        axes.plot(
            volume[shown], loss[shown], ".", color="#a9a9a9", markersize=2.5, label="can be wound, stays cool"
        )
        axes.plot(
            volume[best],
            loss[best],
            "o-",
            color=COLOURS[1],
            markersize=3.5,
            linewidth=1.0,
            label="no other is both smaller and cooler",
        )
        axes.set_xscale("log")
        axes.set_yscale("log")
        _plain_ticks(axes)
        axes.set_xlim(*_room(volume, below=0.27, above=0.05))
        axes.set_ylim(*_room(loss, below=0.15, above=0.22))
        _name_some(axes, choice, volume, loss)
        axes.set_xlabel("volume of the wound ring [cm\u00b3]")
        axes.set_ylabel("core and copper loss [W]")
        axes.set_title(title, loc="left")
        axes.legend(frameon=False, loc="upper right")
    return figure


def _henries(largest: float) -> tuple[float, str]:
    return (1e3, "mH") if largest >= 1e-3 else (1e6, "\u00b5H")


def _mark(axes: Axes, curve: BiasCurve, current: float, scale: float, unit: str) -> None:
    value = float(np.interp(current, curve.current_a, curve.inductance_h)) * scale
    axes.plot([current, current], [0.0, value], color="#606060", lw=0.8, ls="--")
    axes.plot([current], [value], "s", color="#606060", markersize=4.0)
    axes.annotate(
        f"{value:.3g} {unit} at {current:.3g} A", (current, value), xytext=(8, 6), textcoords="offset points"
    )


def _room(values: Any, *, below: float, above: float) -> tuple[float, float]:
    """Limits of a logarithmic axis with room for labels, as shares of its span."""
    low, high = float(values.min()), float(values.max())
    span = max(np.log(high / low), 1.0)
    return float(low * np.exp(-below * span)), float(high * np.exp(above * span))


def _plain_ticks(axes: Axes) -> None:
    """Numbers instead of powers of ten, also where an axis spans less than a decade."""
    from matplotlib.ticker import FuncFormatter, LogLocator, NullFormatter

    for axis in (axes.xaxis, axes.yaxis):
        axis.set_major_locator(LogLocator(base=10.0, subs=(1.0, 2.0, 5.0)))
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))
        axis.set_minor_formatter(NullFormatter())


def _name_some(axes: Axes, choice: ChokeChoice, volume: Any, loss: Any) -> None:
    """Names beside a few of the best, far enough apart to be read."""
    picked = _spread(np.log(volume[choice.pareto]), _NAMED)
    for index in choice.pareto[picked]:
        text = _label(choice, int(index))
        axes.annotate(
            text,
            (volume[index], loss[index]),
            xytext=(-6, -5),
            textcoords="offset points",
            fontsize=6.5,
            ha="right",
            va="top",
            color="#404040",
        )


def _label(choice: ChokeChoice, index: int) -> str:
    ring, _, wire = choice.names(index)
    strands, stack = int(choice.candidates.strands[index]), int(choice.candidates.stack[index])
    stacked = f"{stack} x " if stack > 1 else ""
    parallel = f"{strands} x " if strands > 1 else ""
    return f"{stacked}{ring}\n{int(choice.windings.turns[index])} turns {parallel}{wire}"


def _spread(position: Any, count: int) -> Sequence[int]:
    """Indices of those nearest to evenly spread positions."""
    if len(position) <= count:
        return list(range(len(position)))
    wanted = np.linspace(position[0], position[-1], count)
    return sorted({int(np.abs(position - one).argmin()) for one in wanted})
