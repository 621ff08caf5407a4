"""Figures of the choke bench: what they show, that labels stay inside, that they are reproducible."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from buckdesign.design.bias_points import BiasPoint
from buckdesign.design.choke_bias import BiasRequest, bias_curve
from buckdesign.design.choke_search import ChokeNeed, ChokeSpace, choose_chokes
from buckdesign.output.choke_plots import bias_figure, choice_figure
from buckdesign.output.plots import figure_bytes
from buckdesign.parts import load_tables

TABLES = load_tables(folder=Path("none"))
REQUEST = BiasRequest(core="R 26.9/14.5/11.1", material="hydrogen-reduced iron 75", turns=57)
NEED = ChokeNeed(inductance=200e-6, current=2.5, ripple=0.6, frequency=20e3)


def assert_labels_inside(figure: Figure) -> None:
    FigureCanvasAgg(figure).draw()
    (axes,) = figure.axes
    frame = axes.get_window_extent()
    for label in axes.texts:
        box = label.get_window_extent()
        assert frame.x0 <= box.x0 and box.x1 <= frame.x1, label.get_text()
        assert frame.y0 <= box.y0 and box.y1 <= frame.y1, label.get_text()
    boxes = [label.get_window_extent() for label in axes.texts]
    for index, box in enumerate(boxes):
        assert not any(box.overlaps(other) for other in boxes[index + 1 :])


def test_bias_figure_shows_curve_band_and_readings() -> None:
    points = [
        BiasPoint(current=i, inductance=uh * 1e-6) for i, uh in ((0.0, 300.0), (2.0, 240.0), (4.0, 180.0))
    ]
    curve = bias_curve(TABLES, REQUEST, points)
    (axes,) = bias_figure(curve).axes
    line, dots = axes.lines
    np.testing.assert_allclose(line.get_ydata(), curve.inductance_h * 1e6)
    np.testing.assert_allclose(dots.get_xdata(), [0.0, 2.0, 4.0])
    assert len(axes.collections) == 1
    assert axes.get_xlabel() == "direct current [A]" and axes.get_ylabel() == "inductance [\u00b5H]"


def test_bias_figure_marks_the_current_at_work() -> None:
    figure = bias_figure(bias_curve(TABLES, REQUEST), 2.5)
    assert_labels_inside(figure)
    assert "205 \u00b5H at 2.5 A" in figure.axes[0].texts[0].get_text()


@pytest.mark.parametrize(
    "space",
    [
        ChokeSpace(),
        ChokeSpace(rings=["R 26.9/14.5/11.1"]),
        ChokeSpace(
            rings=["R 26.9/14.5/11.1"], wires=["1 mm"], strands=[1], stacks=[1], materials=["iron powder 100"]
        ),
    ],
    ids=["everything", "one ring", "one choke"],
)
def test_choice_figure_marks_the_pareto_set(space: ChokeSpace) -> None:
    choice = choose_chokes(TABLES, NEED, space=space)
    figure = choice_figure(choice, "200 uH at 2.5 A")
    (axes,) = figure.axes
    best = axes.lines[1]
    np.testing.assert_allclose(best.get_xdata(), choice.windings.volume_m3[choice.pareto] * 1e6)
    np.testing.assert_allclose(best.get_ydata(), choice.windings.total_loss_w[choice.pareto])
    assert 1 <= len(axes.texts) <= 6
    FigureCanvasAgg(figure).draw()
    frame = axes.get_window_extent()
    for label in axes.texts:
        box = label.get_window_extent()
        assert frame.x0 <= box.x0 and box.x1 <= frame.x1 and frame.y0 <= box.y0, label.get_text()


def test_labels_of_the_choice_do_not_overlap() -> None:
    assert_labels_inside(choice_figure(choose_chokes(TABLES, NEED), "200 uH at 2.5 A"))


def test_figures_are_reproducible() -> None:
    curve = bias_curve(TABLES, REQUEST)
    first, second = (figure_bytes(bias_figure(curve, 2.5), "svg") for _ in range(2))
    assert first == second
