"""Waveforms as a CSV table, thinned so that it stays readable, extremes kept."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from buckdesign.loop.results import SAMPLES, Waveforms

MOST_SAMPLES = 20_000
"""Samples beyond which a recording is thinned [1] (own choice: a spreadsheet still draws them)."""

HEADINGS = {"base_charge_c": "base_charge_coulomb"}
"""Columns whose unit would be misread: elsewhere ``_c`` stands for degC."""

_EXTREMES = ("choke_current_a", "output_voltage_v", "regulator_current_a")


def thinned(waveforms: Waveforms, most: int = MOST_SAMPLES) -> Waveforms:
    """Fewer samples of a long recording.

    Parameters
    ----------
    waveforms : Waveforms
        The recording.
    most : int
        Samples to keep, about [1].

    Returns
    -------
    Waveforms
        As it was where it is short enough; else of each stretch the first sample and those with the extremes
        of choke current, output voltage and regulator current.
    """
    count = len(waveforms.samples)
    if count <= most:
        return waveforms
    edges = np.linspace(0, count, most // (1 + 2 * len(_EXTREMES)) + 1).astype(int)
    kept: list[NDArray[np.intp]] = [edges[:-1], np.array([count - 1])]
    for name in _EXTREMES:
        values = waveforms.column(name)
        for start, stop in pairwise(edges):
            part = values[start:stop]
            kept.append(np.array([start + int(part.argmin()), start + int(part.argmax())]))
    chosen = np.unique(np.concatenate(kept))
    return Waveforms(samples=waveforms.samples[chosen], cycles=waveforms.cycles)


def waveform_csv(waveforms: Waveforms) -> str:
    """Waveforms as CSV, one line a sample.

    Parameters
    ----------
    waveforms : Waveforms
        The recording, thinned if it is long.

    Returns
    -------
    str
        Text with a heading; the unit is the end of each name, the switch mode is a word. Two lines at one
        instant where a quantity jumps.
    """
    shown = thinned(waveforms)
    lines = [",".join(HEADINGS.get(name, name) for name in SAMPLES)]
    for row, mode in zip(shown.samples, shown.modes(), strict=True):
        lines.append(",".join([*(f"{value:.9g}" for value in row[:-1]), mode]))
    return "\n".join(lines) + "\n"
