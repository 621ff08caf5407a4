"""The winding sheet: everything on one page, to scale, the same bytes every time."""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from pathlib import Path
from typing import Any

import pytest

from buckdesign.design.choke_bench import ChokeWork, WindingRequest, WoundChoke, wind_choke
from buckdesign.output.plots import figure_bytes
from buckdesign.output.winding_sheet import CAUTIONS, sheet_figure, sheet_text
from buckdesign.parts import load_tables

A4 = (210.0 / 25.4 * 72.0, 297.0 / 25.4 * 72.0)


def wound(core: str = "R 26.9/14.5/11.1", **others: Any) -> WoundChoke:
    values: dict[str, Any] = {"material": "hydrogen-reduced iron 75", "wire": "1.0 mm", "turns": 57} | others
    work = ChokeWork(current=2.5, ripple=0.6, frequency=20e3, ambient_c=40.0)
    return wind_choke(load_tables(folder=Path("none")), WindingRequest(core=core, **values), work)


def svg(choke: WoundChoke) -> ET.Element:
    return ET.fromstring(figure_bytes(sheet_figure(choke), "svg"))


CASES = [
    pytest.param({}, id="two layers"),
    pytest.param({"turns": 14}, id="part of a layer"),
    pytest.param({"strands": 3, "wire": "0.5 mm", "stack": 2}, id="strands and a stack"),
    pytest.param({"turns": 200}, id="does not fit"),
    pytest.param({"core": "R 102/57.2/16.5", "turns": 28, "wire": "AWG 14", "strands": 4}, id="large"),
    pytest.param(
        {"core": "R 3.18/1.57/1.27", "material": "carbonyl iron 10", "wire": "0.2 mm", "turns": 9}, id="tiny"
    ),
    pytest.param({"core": "R 102/57.2/16.5", "turns": 2000, "wire": "0.125 mm", "strands": 4}, id="bands"),
]


def test_the_text_says_what_the_bench_needs() -> None:
    choke = wound()
    text = sheet_text(choke)
    for wanted in (
        "57",
        "2.49 m",  # length to cut
        "2     18            57",  # second layer
        "292 \u00b5H",  # without bias
        "263 \u00b5H",  # 10 % less
        "205 \u00b5H (70 %) at 2.5 A",
        "49 to 52 \u00b0C",
        "with enamel at most 1.062 mm",
    ):
        assert wanted in text, wanted
    assert all(caution.split(":")[0] in " ".join(text.split()) for caution in CAUTIONS)


@pytest.mark.parametrize("others", CASES)
def test_lines_fit_the_page(others: dict[str, Any]) -> None:
    lines = sheet_text(wound(**others)).splitlines()
    assert max(map(len, lines)) <= 78
    assert len(lines) < 66


def test_a_winding_that_does_not_fit_says_so() -> None:
    assert "DOES NOT FIT: the bore holds 142 turns" in sheet_text(wound(turns=200))


def test_without_a_duty_there_is_still_a_sheet() -> None:
    request = WindingRequest(core="R 26.9/14.5/11.1", material="carbonyl iron 10", wire="1 mm", turns=30)
    text = sheet_text(wind_choke(load_tables(folder=Path("none")), request))
    assert "not given" in text and "under bias" not in text


@pytest.mark.parametrize("others", CASES)
def test_the_drawing_is_one_page_and_nothing_leaves_it(others: dict[str, Any]) -> None:
    from matplotlib.backends.backend_agg import FigureCanvasAgg

    figure = sheet_figure(wound(**others))
    width, height = (size * 72.0 for size in figure.get_size_inches())
    assert (width, height) == pytest.approx(A4)
    canvas = FigureCanvasAgg(figure)
    canvas.draw()
    page = figure.bbox
    boxes = [text.get_window_extent() for text in figure.texts]
    for box in [*boxes, *(axes.get_window_extent() for axes in figure.axes)]:
        assert page.x0 <= box.x0 and box.x1 <= page.x1 and page.y0 <= box.y0 and box.y1 <= page.y1
    for index, box in enumerate(boxes):
        assert not any(box.overlaps(other) for other in boxes[index + 1 :])
    for axes in figure.axes:
        assert not any(axes.get_window_extent().overlaps(box) for box in boxes)


def test_every_wire_is_drawn_to_scale() -> None:
    from matplotlib.patches import Annulus, Circle

    choke = wound()
    (axes,) = sheet_figure(choke).axes
    circles = [patch for patch in axes.patches if isinstance(patch, Circle)]
    assert len(circles) == 2 * 57
    assert {round(circle.get_radius() * 2.0, 6) for circle in circles} == {1.062}
    (ring,) = (patch for patch in axes.patches if isinstance(patch, Annulus))
    assert ring.get_radii()[0] == pytest.approx(26.9 / 2.0)
    distances = {round((c.center[0] ** 2 + c.center[1] ** 2) ** 0.5, 3) for c in circles}
    bore, rim = 14.5 / 2.0, 26.9 / 2.0
    assert distances == {round(d, 3) for d in (bore - 0.531, bore - 1.593, rim + 0.531)}
    low, high = axes.get_xlim()
    share = axes.get_position().width * 210.0 / (high - low)
    caption = next(t.get_text() for t in axes.figure.texts if "scale" in t.get_text())
    assert f"scale {share:.3g} : 1" in caption


def test_wires_do_not_overlap() -> None:
    from matplotlib.patches import Circle

    (axes,) = sheet_figure(wound(turns=142)).axes
    centres = [patch.center for patch in axes.patches if isinstance(patch, Circle)]
    nearest = min(
        ((a[0] - b[0]) ** 2 + (a[1] - b[1]) ** 2) ** 0.5
        for index, a in enumerate(centres)
        for b in centres[index + 1 :]
    )
    assert nearest >= 1.062 * (1.0 - 1e-6)


def test_the_same_sheet_is_the_same_file_without_a_date() -> None:
    choke = wound()
    first, second = (figure_bytes(sheet_figure(choke), "svg") for _ in range(2))
    assert first == second
    assert not re.search(rb"20\d\d-\d\d-\d\d", first)
    assert svg(choke).tag.endswith("svg")
