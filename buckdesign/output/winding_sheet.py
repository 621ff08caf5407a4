"""The winding sheet: one page to take to the bench, as text and as a drawing to scale."""

from __future__ import annotations

import math
import textwrap
from collections.abc import Sequence
from typing import TYPE_CHECKING

from buckdesign.design.choke_ageing import temperature_text
from buckdesign.design.choke_bench import WoundChoke
from buckdesign.design.choke_heat import HOTTEST_C
from buckdesign.output.text import Column, text_pairs, text_table
from buckdesign.physics.winding import CUT_LEAD_LENGTH
from buckdesign.units import format_quantity

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

TEST_FREQUENCY = "1 to 10 kHz"
"""Frequency of a hand-held meter at which a winding of this size is read (common practice)."""

CAUTIONS = (
    "Round off the edges of the ring or tape it: a nick in the enamel is a shorted turn.",
    "Every pass through the bore is one turn. Keep the first and the last turn apart.",
    "At work the winding gets hot; keep electrolytics away from it.",
)
"""What holds for every winding (common practice)."""

_WIDTH = 78
_PAGE = (210.0, 297.0)
_MARGIN = 15.0
_SCALES = (5.0, 4.0, 3.0, 2.5, 2.0, 1.5, 1.0, 0.5)
_MOST_CIRCLES = 4000


def sheet_text(choke: WoundChoke) -> str:
    """The winding sheet as text.

    Parameters
    ----------
    choke : WoundChoke
        The winding.

    Returns
    -------
    str
        Lines of at most 78 characters.
    """
    blocks = [f"WINDING SHEET: {_headline(choke)}\n" + "=" * _WIDTH]
    for title, pairs in _sections(choke):
        blocks.append(f"{title}\n" + text_pairs(_wrapped(pairs), indent=2))
    blocks.insert(2, "LAYERS\n" + textwrap.indent(_layer_table(choke), "  "))
    blocks.append("MIND\n" + "\n".join(_bullet(line) for line in _mind(choke)))
    return "\n\n".join(blocks) + "\n"


def sheet_figure(choke: WoundChoke) -> Figure:
    """The winding sheet as a page of A4 with the ring drawn to scale.

    Parameters
    ----------
    choke : WoundChoke
        The winding.

    Returns
    -------
    Figure
        The page; printed at 100 % the scale holds.
    """
    import matplotlib
    from matplotlib.figure import Figure

    from buckdesign.output.plots import STYLE

    with matplotlib.rc_context(STYLE):
        figure = Figure(figsize=(_PAGE[0] / 25.4, _PAGE[1] / 25.4))
        top = _text_block(figure, choke)
        _drawing(figure, choke, top)
    return figure


def _headline(choke: WoundChoke) -> str:
    stack = f"{choke.stack} x " if choke.stack > 1 else ""
    return f"{stack}{choke.core}, {choke.material}"


def _wire(choke: WoundChoke) -> str:
    wire = choke.made.wire
    strands = f"{choke.strands} strands of " if choke.strands > 1 else ""
    overall = wire.outer_diameter_grade1 * 1e3
    return f"{strands}{wire.name} (copper {choke.wire_mm:.3g} mm, with enamel at most {overall:.4g} mm)"


def _sections(choke: WoundChoke) -> list[tuple[str, list[tuple[str, str]]]]:
    return [
        ("WIND", _winding(choke)),
        ("CUT", _cutting(choke)),
        ("TEST", _testing(choke)),
        ("AT WORK", _working(choke)),
    ]


def _winding(choke: WoundChoke) -> list[tuple[str, str]]:
    fill = f"{choke.bore_fill * 100:.0f} % of the bore"
    if not choke.fits:
        fill += f"; DOES NOT FIT: the bore holds {choke.turns_capacity} turns"
    return [
        ("ring", _ring_size(choke)),
        ("wire", _wire(choke)),
        ("turns", f"{choke.turns}"),
        ("fill", fill),
    ]


def _ring_size(choke: WoundChoke) -> str:
    ring = choke.made.ring
    size = " x ".join(f"{x * 1e3:.4g}" for x in (ring.outer_diameter, ring.inner_diameter, ring.height))
    stacked = f", {choke.stack} stacked" if choke.stack > 1 else ""
    return f"{size} mm (outer x inner x height){stacked}"


def _cutting(choke: WoundChoke) -> list[tuple[str, str]]:
    pieces = f"{choke.strands} pieces of " if choke.strands > 1 else ""
    ends = f"two free ends of {CUT_LEAD_LENGTH * 1e3:.0f} mm each included"
    return [
        ("length", f"{pieces}{choke.wire_length_m:.2f} m, {ends}"),
        ("turn", f"{choke.mean_turn_m * 1e3:.1f} mm on average"),
        ("copper", format_quantity(choke.copper_kg, "kg")),
    ]


def _testing(choke: WoundChoke) -> list[tuple[str, str]]:
    low, high = (choke.inductance_h * (1.0 + sign * choke.inductance_tolerance) for sign in (-1.0, 1.0))
    pairs = [
        (
            "inductance",
            f"{format_quantity(choke.inductance_h, 'H')} without direct current, at {TEST_FREQUENCY}; "
            f"accept {format_quantity(low, 'H')} to {format_quantity(high, 'H')} "
            f"(\u00b1{choke.inductance_tolerance * 100:.0f} %)",
        ),
        ("resistance", f"{format_quantity(choke.resistance_ohm, 'ohm')} at 20 \u00b0C with short leads"),
    ]
    if choke.inductance_biased_h is not None and choke.work.current is not None:
        left = (choke.permeability_fraction or 0.0) * 100.0
        pairs.append(
            (
                "under bias",
                f"{format_quantity(choke.inductance_biased_h, 'H')} ({left:.0f} %) at "
                f"{format_quantity(choke.work.current, 'A')} of direct current",
            )
        )
    return pairs


def _working(choke: WoundChoke) -> list[tuple[str, str]]:
    work, pairs = choke.work, []
    if work.current is None:
        return [("carries", "not given")]
    duty = format_quantity(work.current, "A")
    if work.ripple is not None and work.frequency is not None:
        duty += f", ripple {format_quantity(work.ripple, 'A')} peak to peak at "
        duty += format_quantity(work.frequency, "Hz")
    pairs.append(("carries", f"{duty}, air at {work.ambient_c:.0f} \u00b0C"))
    losses = [
        f"{name} {format_quantity(loss, 'W')}"
        for name, loss in (("copper", choke.copper_loss_w), ("core", choke.core_loss_w))
        if loss is not None
    ]
    pairs.append(("loss", ", ".join(losses)))
    if choke.temperature_rise_k is not None and choke.temperature_rise_low_k is not None:
        rises = choke.temperature_rise_low_k, choke.temperature_rise_k
        low, high = (work.ambient_c + rise for rise in rises)
        band = f"{low:.0f} to {temperature_text(high)}" if low <= HOTTEST_C else temperature_text(low)
        if round(low) == round(high):
            band = temperature_text(high)
        pairs.append(("temperature", f"{_signs(band)} (two methods)"))
    return pairs


def _mind(choke: WoundChoke) -> list[str]:
    return [*(_sentence(text) for text in choke.warnings), *CAUTIONS]


def _sentence(text: str) -> str:
    return _signs(text[0].upper() + text[1:] + ("" if text.endswith(".") else "."))


def _signs(text: str) -> str:
    return text.replace(" degC", " °C")


def _layer_rows(choke: WoundChoke) -> list[list[str]]:
    """Layer, turns in it, turns so far; a turn of several strands may lie in two layers."""
    rows, wires = [], 0
    for index, number in enumerate(choke.wires_by_layer, start=1):
        before = wires / choke.strands
        wires += number
        rows.append(
            [str(index), f"{_turns(wires / choke.strands - before)}", f"{_turns(wires / choke.strands)}"]
        )
    return rows


def _turns(value: float) -> str:
    return f"{value:.0f}" if abs(value - round(value)) < 1e-9 else f"{value:.1f}"


def _layer_table(choke: WoundChoke) -> str:
    columns = [
        Column(heading="layer in the bore", right=True),
        Column(heading="turns", right=True),
        Column(heading="turns so far", right=True),
    ]
    return text_table(columns, _layer_rows(choke))


def _wrapped(pairs: Sequence[tuple[str, str]]) -> list[tuple[str, str]]:
    room = _WIDTH - 4 - max(len(name) for name, _ in pairs)
    return [(name, "\n".join(textwrap.wrap(value, room))) for name, value in pairs]


def _bullet(line: str) -> str:
    return textwrap.fill(line, _WIDTH, initial_indent="  - ", subsequent_indent="    ")


def _text_block(figure: Figure, choke: WoundChoke) -> float:
    """Everything in words, from the top of the page down; gives the height where the drawing may begin."""
    page = _Page(figure)
    page.line(f"Winding sheet: {_headline(choke)}", size=13.0, weight="bold", gap=9.0)
    for title, pairs in _sections(choke):
        page.line(title.capitalize(), size=9.5, weight="bold", gap=5.0)
        for name, value in pairs:
            page.pair(name, value)
        page.skip(1.5)
    page.line("Mind", size=9.5, weight="bold", gap=5.0)
    for text in _mind(choke):
        page.pair("\u2013", text, indent=4.0, room=104)
    return page.height


class _Page:
    """A cursor that writes down a page; lengths in mm."""

    def __init__(self, figure: Figure) -> None:
        self._figure = figure
        self.height = _PAGE[1] - _MARGIN

    def skip(self, gap: float) -> None:
        """Leave some room."""
        self.height -= gap

    def line(self, text: str, *, size: float, weight: str, gap: float) -> None:
        """One line."""
        self._put(_MARGIN, text, size, weight)
        self.height -= gap

    def pair(self, name: str, value: str, indent: float = 24.0, room: int = 90) -> None:
        """A name and a value that may take several lines."""
        self._put(_MARGIN, name, 8.5, "normal", "#505050")
        for part in textwrap.wrap(value, room):
            self._put(_MARGIN + indent, part, 8.5, "normal")
            self.height -= 4.2

    def _put(self, left: float, text: str, size: float, weight: str, colour: str = "black") -> None:
        self._figure.text(
            left / _PAGE[0],
            self.height / _PAGE[1],
            text,
            fontsize=size,
            fontweight=weight,
            color=colour,
            va="top",
            ha="left",
            parse_math=False,
        )


def _drawing(figure: Figure, choke: WoundChoke, top: float) -> None:
    """The ring from above, cut at half its height, at the largest scale that fits below the text."""
    room = top - _MARGIN - 12.0
    ring, overall = choke.made.ring, choke.made.wire.outer_diameter_grade1 * 1e3
    across = ring.outer_diameter * 1e3 + 2.0 * overall * max(len(choke.outside_wires), 1)
    scale = next((s for s in _SCALES if across * s <= min(room, 115.0)), min(room, 115.0) / across)
    size = across * scale
    bottom = top - 10.0 - size
    axes = figure.add_axes(
        (_MARGIN / _PAGE[0], bottom / _PAGE[1], size / _PAGE[0], size / _PAGE[1]), frameon=False
    )
    axes.set_xlim(-across / 2.0, across / 2.0)
    axes.set_ylim(-across / 2.0, across / 2.0)
    axes.set_axis_off()
    _ring(axes, choke)
    caption = f"Seen from above, cut at half height, scale {scale:.3g} : 1 when printed at 100 %"
    figure.text(_MARGIN / _PAGE[0], (top - 4.0) / _PAGE[1], caption, fontsize=8.0, color="#505050", va="top")
    _layers(figure, choke, _MARGIN + size + 8.0, top - 12.0)


def _ring(axes: Axes, choke: WoundChoke) -> None:
    from matplotlib.patches import Annulus

    ring = choke.made.ring
    outer, inner = ring.outer_diameter * 5e2, ring.inner_diameter * 5e2
    axes.add_patch(Annulus((0.0, 0.0), outer, outer - inner, facecolor="#c9c5bd", edgecolor="black", lw=0.8))
    wire = choke.made.wire.outer_diameter_grade1 * 1e3
    bore = [inner - wire * (layer + 0.5) for layer in range(len(choke.wires_by_layer))]
    rim = [outer + wire * (layer + 0.5) for layer in range(len(choke.outside_wires))]
    _wires(axes, choke.wires_by_layer, bore, wire)
    _wires(axes, choke.outside_wires, rim, wire)


def _wires(axes: Axes, layers: Sequence[int], radii: Sequence[float], wire: float) -> None:
    """Wires as circles; too many to see are drawn as bands."""
    from matplotlib.patches import Annulus, Circle

    from buckdesign.output.plots import COLOURS

    for layer, number in enumerate(layers):
        at, colour = radii[layer], COLOURS[layer % len(COLOURS)]
        if sum(layers) > _MOST_CIRCLES:
            axes.add_patch(Annulus((0.0, 0.0), at + wire / 2.0, wire, facecolor=colour, lw=0.0))
            continue
        for angle in _angles(number, at, wire):
            centre = at * math.cos(angle), at * math.sin(angle)
            axes.add_patch(Circle(centre, wire / 2.0, facecolor=colour, edgecolor="white", lw=0.3))


def _angles(number: int, radius: float, wire: float) -> list[float]:
    """Where the wires of a layer lie: evenly, with a gap at the bottom if there is room."""
    pitch = 2.0 * math.asin(min(wire / (2.0 * max(radius, wire / 2.0)), 1.0))
    gapped = 2.0 * math.pi / (number + 1)
    step = gapped if gapped >= pitch else 2.0 * math.pi / number
    return [math.pi / 2.0 + (index - (number - 1) / 2.0) * step for index in range(number)]


def _layers(figure: Figure, choke: WoundChoke, left: float, top: float) -> None:
    """The table of layers beside the drawing."""
    from buckdesign.output.plots import COLOURS

    rows = [["layer", "turns", "so far"], *_layer_rows(choke)]
    for index, row in enumerate(rows):
        height = top - 4.6 * index
        colour = "#505050" if index == 0 else COLOURS[(index - 1) % len(COLOURS)]
        for column, cell in enumerate(row):
            figure.text(
                (left + 14.0 * (column + 1)) / _PAGE[0],
                height / _PAGE[1],
                cell,
                fontsize=8.5,
                ha="right",
                va="top",
                color=colour if column == 0 else "black",
            )
