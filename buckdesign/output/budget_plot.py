"""The loss budget as horizontal stacked bars: the stage, and the regulator alone beside it."""

from __future__ import annotations

from typing import TYPE_CHECKING

from buckdesign.design.losses import LOSSES
from buckdesign.design.operating_point import OperatingPoint
from buckdesign.output.plots import STYLE
from buckdesign.units import format_quantity

if TYPE_CHECKING:
    from matplotlib.figure import Figure

COLOURS = {
    "transistor_conduction": "#1f4e79",
    "transistor_switching": "#4f81b5",
    "transistor_leakage": "#a9c4e0",
    "base": "#7d9cbf",
    "drive_resistor": "#c9803f",
    "regulator": "#b3541e",
    "rectifier": "#3f6b35",
    "rectifier_recovery": "#76a069",
    "rectifier_leakage": "#b5d0ac",
    "choke_copper": "#6b3f69",
    "choke_copper_ac": "#9b6f99",
    "choke_core": "#c9a9c7",
    "output_capacitor": "#5a5a5a",
    "input_capacitor": "#8c8c8c",
    "divider": "#bdbdbd",
}
"""One colour a loss: a hue for each part, shades within it."""

LABEL_SHARE = 0.06
"""Share of the longest bar from which a loss is named in it [1]."""


def budget_figure(point: OperatingPoint, title: str) -> Figure:
    """Every loss of an operating point in one bar, and the regulator alone in another.

    Parameters
    ----------
    point : OperatingPoint
        The point.
    title : str
        One line above it.

    Returns
    -------
    Figure
        Bars whose lengths are input minus output.
    """
    import matplotlib
    from matplotlib.figure import Figure

    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(8.0, 3.6), layout="constrained")
        axes = figure.subplots()
        longest = max(point.total_loss_w, 0.0 if point.linear is None else point.linear.loss_w, 1e-9)
        left = 0.0
        for name in LOSSES:
            width = point.losses_w[name]
            if width <= 0.0:
                continue
            shown = f"{name.replace('_', ' ')} {format_quantity(width, 'W', digits=2)}"
            axes.barh(0, width, left=left, color=COLOURS[name], label=shown, height=0.6)
            if width > LABEL_SHARE * longest:
                middle = left + width / 2
                axes.text(middle, 0, f"{width:.2g}", color="white", ha="center", va="center", fontsize=8)
            left += width
        names = [f"switching\n{point.total_loss_w:.3g} W"]
        if point.linear is not None:
            axes.barh(1, point.linear.loss_w, color="#d9d9d9", edgecolor="#808080", height=0.6)
            names.append(f"regulator alone\n{point.linear.loss_w:.3g} W")
        axes.set_yticks(range(len(names)), names)
        axes.invert_yaxis()
        axes.set_axisbelow(True)
        axes.grid(visible=False, axis="y")
        axes.set_xlabel("loss, input minus output [W]")
        axes.set_title(title, loc="left")
        figure.legend(loc="outside lower center", ncols=4, frameon=False, fontsize=7.5)
    return figure
