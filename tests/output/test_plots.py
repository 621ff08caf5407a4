"""Figures of waveforms, and long recordings thinned."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from buckdesign.design.operating import simulate
from buckdesign.errors import InputError
from buckdesign.loop.results import SAMPLES, Waveforms
from buckdesign.output.plots import figure_bytes, figure_format, waveform_figure
from buckdesign.output.waveform_file import thinned, waveform_csv
from tests.design.operating_designs import bench


@pytest.fixture(scope="module")
def found() -> Any:
    return simulate(bench())


def test_panels_show_the_waveforms(found: Any) -> None:
    recorded = found.cycles()
    figure = waveform_figure(recorded, "title", mean_output=15.4)
    panels = figure.axes
    assert len(panels) == 4
    assert panels[0].get_title(loc="left") == "title"
    assert panels[-1].get_xlabel() == "time [µs]"
    assert all("[" in axes.get_ylabel() for axes in panels)
    drawn = panels[0].lines[0].get_xydata()
    assert drawn[:, 0] == pytest.approx(recorded.column("time_s") * 1e6)
    assert drawn[:, 1] == pytest.approx(recorded.column("choke_current_a"))
    ripple = panels[1].lines[0].get_ydata()
    assert ripple == pytest.approx((recorded.column("output_voltage_v") - 15.4) * 1e3)
    assert {axes.get_xlim() for axes in panels} == {panels[0].get_xlim()}


def test_steady_cycles_are_those_of_the_averages(found: Any) -> None:
    recorded = found.cycles(5)
    assert recorded.cycles == 5
    point = found.point
    assert recorded.column("time_s")[-1] == pytest.approx(5.0 / point.frequency_hz, rel=1e-4)
    assert recorded.column("choke_current_a").max() == pytest.approx(point.choke_current_a["max"], rel=1e-4)
    swing = np.ptp(recorded.column("output_voltage_v"))
    assert swing == pytest.approx(point.ripple_v, rel=1e-3)


def test_a_start_is_drawn_in_volts() -> None:
    started = simulate(bench(), from_rest=True)
    assert started.start_waveforms is not None
    figure = waveform_figure(started.start_waveforms, "start")
    assert figure.axes[1].get_ylabel() == "output\n[V]"
    assert figure.axes[1].lines[0].get_ydata().max() > 15.0


def test_flat_lines_do_not_fill_the_panel_with_rounding() -> None:
    still = simulate(bench(), load_current=0.0)
    figure = waveform_figure(still.cycles(), "idle", mean_output=still.point.output_voltage_v)
    for axes in figure.axes:
        low, high = axes.get_ylim()
        assert high - low > 0.1


@pytest.mark.parametrize(("kind", "start"), [("svg", b"<?xml"), ("png", b"\x89PNG")])
def test_files_are_reproducible(found: Any, kind: str, start: bytes) -> None:
    made = [figure_bytes(waveform_figure(found.cycles(), "a", mean_output=15.4), kind) for _ in range(2)]
    assert made[0] == made[1]
    assert made[0].startswith(start)
    assert b"<dc:date>" not in made[0]


def test_format_by_ending() -> None:
    assert figure_format(Path("a/b.SVG")) == "svg"
    for name in ("b.pdf", "b"):
        with pytest.raises(InputError, match=r"ends in \.svg or \.png"):
            figure_format(Path(name))


def long_recording(count: int) -> Waveforms:
    samples = np.zeros((count, len(SAMPLES)))
    samples[:, 0] = np.arange(count) * 1e-6
    samples[:, 1] = np.random.default_rng(1).normal(size=count)
    samples[77, 1], samples[4321, 2], samples[99, 4] = 50.0, -9.0, 3.0
    return Waveforms(samples=samples, cycles=1)


def test_thinning_keeps_extremes_and_ends() -> None:
    whole = long_recording(100_000)
    less = thinned(whole, 2000)
    assert 300 < len(less.samples) <= 2001
    for column in (1, 2, 4):
        assert less.samples[:, column].max() == whole.samples[:, column].max()
        assert less.samples[:, column].min() == whole.samples[:, column].min()
    assert (np.diff(less.samples[:, 0]) > 0.0).all()
    assert less.samples[0, 0] == 0.0 and less.samples[-1, 0] == whole.samples[-1, 0]


def test_short_recordings_stay_as_they_are() -> None:
    whole = long_recording(5000)
    assert thinned(whole) is whole


def test_csv_has_units_and_words(found: Any) -> None:
    recorded = found.cycles(1)
    lines = waveform_csv(recorded).splitlines()
    assert len(lines) == len(recorded.samples) + 1
    heading = lines[0].split(",")
    assert heading[0] == "time_s" and heading[-1] == "mode" and "base_charge_coulomb" in heading
    back = np.array([[float(cell) for cell in line.split(",")[:-1]] for line in lines[1:]])
    assert back == pytest.approx(recorded.samples[:, :-1], rel=1e-8, abs=1e-300)
