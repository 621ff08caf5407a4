"""Figures; the only place that knows the plotting library. A figure is returned, never shown."""

from __future__ import annotations

import io
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from buckdesign.errors import InputError, quoted
from buckdesign.loop.results import Waveforms
from buckdesign.output.waveform_file import thinned

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

FORMATS = ("svg", "png")
"""Endings of figure files."""

STYLE: Any = {
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.titlesize": 10.0,
    "axes.labelsize": 9.0,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.linewidth": 0.8,
    "axes.grid": True,
    "axes.formatter.useoffset": False,
    "grid.color": "#d9d9d9",
    "grid.linewidth": 0.6,
    "lines.linewidth": 1.3,
    "xtick.direction": "out",
    "ytick.direction": "out",
    "figure.dpi": 100.0,
    "savefig.dpi": 150.0,
    "svg.hashsalt": "buckdesign",
}
"""Settings of every figure; the fixed salt makes two drawings of the same data the same file."""

COLOURS = ("#1f4e79", "#b3541e", "#3f6b35", "#6b3f69")
"""Blue, orange, green and purple that stay apart in grey and for colour-blind readers."""


def waveform_figure(waveforms: Waveforms, title: str, *, mean_output: float | None = None) -> Figure:
    """Choke current, output, switch node and regulator current over a common time axis.

    Parameters
    ----------
    waveforms : Waveforms
        The recording.
    title : str
        One line above it.
    mean_output : float, optional
        Mean output [V]: the output is drawn as ripple about it; without, as it is.

    Returns
    -------
    Figure
        Four panels.
    """
    import matplotlib
    from matplotlib.figure import Figure

    shown = thinned(waveforms)
    time, unit = _time(shown.column("time_s"))
    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(7.5, 7.0), layout="constrained")
        panels = figure.subplots(4, 1, sharex=True)
        output, label = _output(shown, mean_output)
        curves = (
            (shown.column("choke_current_a"), "choke current\n[A]"),
            (output, label),
            (shown.column("switch_node_v"), "switch node\n[V]"),
            _current(shown.column("regulator_current_a")),
        )
        for axes, (values, name), colour in zip(panels, curves, COLOURS, strict=True):
            _draw(axes, time, values, name, colour)
        panels[0].set_title(title, loc="left")
        panels[-1].set_xlabel(f"time [{unit}]")
        panels[-1].set_xlim(float(time[0]), float(max(time[-1], time[0] + 1e-9)))
        figure.align_ylabels(panels)
    return figure


def _time(seconds: Any) -> tuple[Any, str]:
    return (seconds * 1e6, "µs") if seconds[-1] < 2e-3 else (seconds * 1e3, "ms")


def _output(shown: Waveforms, mean: float | None) -> tuple[Any, str]:
    volts = shown.column("output_voltage_v")
    if mean is None:
        return volts, "output\n[V]"
    return (volts - mean) * 1e3, f"output about\n{mean:.3f} V [mV]"


def _current(amperes: Any) -> tuple[Any, str]:
    if float(np.abs(amperes).max()) < 1.0:
        return amperes * 1e3, "regulator current\n[mA]"
    return amperes, "regulator current\n[A]"


def _draw(axes: Axes, time: Any, values: Any, name: str, colour: str) -> None:
    axes.plot(time, values, color=colour)
    axes.set_ylabel(name)
    low, high = float(values.min()), float(values.max())
    middle = 0.5 * (low + high)
    if high - low < 1e-3 * max(abs(middle), 1e-3):
        half = max(0.05 * abs(middle), 0.5)
        axes.set_ylim(middle - half, middle + half)
    else:
        axes.margins(y=0.1)
    if low < 0.0 < high or low == 0.0:
        axes.axhline(0.0, color="#808080", linewidth=0.8, zorder=0)


def figure_format(path: Path) -> str:
    """Format of a figure file by its ending.

    Raises
    ------
    InputError
        The ending is none that can be written.
    """
    ending = Path(path).suffix.lower().removeprefix(".")
    if ending not in FORMATS:
        allowed = " or ".join(f".{one}" for one in FORMATS)
        raise InputError(f"{quoted(str(path))}: a figure file ends in {allowed}")
    return ending


def figure_bytes(figure: Figure, kind: str) -> bytes:
    """Content of a figure file; the same figure gives the same bytes.

    Parameters
    ----------
    figure : Figure
        The figure.
    kind : str
        One of `FORMATS`.

    Returns
    -------
    bytes
        To be written as it is.
    """
    import matplotlib

    buffer = io.BytesIO()
    metadata = {"Date": None, "Creator": "buckdesign"} if kind == "svg" else {"Software": "buckdesign"}
    with matplotlib.rc_context(STYLE):
        figure.savefig(buffer, format=kind, metadata=metadata)
    return buffer.getvalue()
