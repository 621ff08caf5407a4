"""The choke bench in words and tables for the terminal."""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Sequence

from buckdesign.design.choke_ageing import temperature_text
from buckdesign.design.choke_bench import WoundChoke
from buckdesign.design.choke_bias import BiasCurve
from buckdesign.design.choke_identify import Identification
from buckdesign.design.choke_search import ChokeChoice
from buckdesign.output.text import Column, text_pairs, text_table
from buckdesign.units import format_quantity

_WIDTH = 96
_BIAS_STEP = 8


def wound_text(choke: WoundChoke) -> str:
    """A winding: what it is, what it does, what to mind.

    Parameters
    ----------
    choke : WoundChoke
        The winding.

    Returns
    -------
    str
        Several blocks.
    """
    blocks = [text_pairs(_winding(choke)), text_pairs(_electrical(choke))]
    if choke.work.current is not None:
        blocks.append(text_pairs(_work(choke)))
    return "\n\n".join([*blocks, *_remarks(choke.warnings, choke.notes)])


def choice_text(choice: ChokeChoice, chokes: Sequence[WoundChoke]) -> str:
    """The best chokes as a table.

    Parameters
    ----------
    choice : ChokeChoice
        All that do the job.
    chokes : sequence of WoundChoke
        The first of them.

    Returns
    -------
    str
        A table; a star marks the Pareto set; why others failed.
    """
    left, right = ("", "ring", "material"), ("loss", "rise", "L at bias", "bore", "volume")
    columns = [Column(heading=name) for name in left]
    columns += [Column(heading="turns", right=True), Column(heading="wire")]
    columns += [Column(heading=name, right=True) for name in right]
    best = set(choice.pareto.tolist())
    rows = [_row(choke, index in best) for index, choke in enumerate(chokes)]
    lines = [text_table(columns, rows), ""] if rows else []
    lines.append(f"{len(choice)} of {choice.evaluated} windings do it; * no other is both smaller and cooler")
    failed = [f"  {number} {reason}" for reason, number in choice.rejected.items() if number]
    if failed:
        lines += ["failed (one winding may fail several):", *failed]
    return "\n".join(lines)


def identification_text(found: Identification) -> str:
    """What a ring was recognised as.

    Parameters
    ----------
    found : Identification
        The result.

    Returns
    -------
    str
        Several blocks.
    """
    high = "no limit" if found.permeability_high is None else _plain(found.permeability_high)
    pairs = [
        ("kind", found.kind + (" (refused for a choke)" if found.refused else "")),
        (
            "permeability",
            f"{_plain(found.permeability)}, between {_plain(found.permeability_low)} and {high}",
        ),
        ("ring", found.ring or "in no table"),
        ("inductance factor", format_quantity(found.al_h, "H")),
        ("effective length, area", _effective(found)),
    ]
    columns = [Column(heading="material"), Column(heading="likelihood", right=True)]
    rows = [[one.material, f"{one.likelihood * 100:.1f} %"] for one in found.candidates]
    return "\n\n".join([text_pairs(pairs), text_table(columns, rows), *_remarks((), found.advice)])


def bias_text(curve: BiasCurve) -> str:
    """Inductance against direct current as a table.

    Parameters
    ----------
    curve : BiasCurve
        The curve.

    Returns
    -------
    str
        The law and the table.
    """
    law, half = curve.law, format_quantity(curve.law.half_field_a_per_m, "A/m")
    pairs = [
        ("winding", f"{curve.turns} turns on {_stacked(curve.stack)}{curve.core}, {curve.material}"),
        ("bias law", f"1/(1 + (H/{half})^{law.exponent:.3g}), exponent ± {law.exponent_uncertainty:.2g}"),
        ("from", law.origin),
        ("band", curve.band),
    ]
    if curve.fit is not None:
        pairs.append(("permeability", f"{_plain(curve.fit.permeability)} fitted"))
        pairs.append(("residual", f"{curve.fit.rms_residual * 100:.1f} % of the reading (rms)"))
    headings = ("current", "inductance", "low", "high", "left", "field")
    columns = [Column(heading=name, right=True) for name in headings]
    rows = [_bias_row(curve, index) for index in range(0, len(curve.current_a), _BIAS_STEP)]
    return "\n\n".join([text_pairs(pairs), text_table(columns, rows), *_remarks(curve.warnings, ())])


def _winding(choke: WoundChoke) -> list[tuple[str, str]]:
    wire = choke.made.wire
    strands = f"{choke.strands} x " if choke.strands > 1 else ""
    layers = ", ".join(str(number) for number in choke.wires_by_layer)
    fits = "fits" if choke.fits else f"DOES NOT FIT, at most {choke.turns_capacity} turns do"
    each = "each of " + str(choke.strands) + " strands, " if choke.strands > 1 else ""
    return [
        ("ring", f"{_stacked(choke.stack)}{choke.core}, {choke.material}"),
        ("winding", f"{choke.turns} turns of {strands}{wire.name}: {fits}"),
        ("bore", f"{choke.bore_fill * 100:.0f} % used, wires by layer {layers}"),
        ("cut", f"{each}{choke.wire_length_m:.2f} m ({choke.mean_turn_m * 1e3:.1f} mm a turn)"),
        ("copper", f"{format_quantity(choke.copper_kg, 'kg')}; {_ohms(choke)}"),
        ("wound size", f"{format_quantity(choke.volume_m3, 'm3')} around it"),
    ]


def _ohms(choke: WoundChoke) -> str:
    text = f"{format_quantity(choke.resistance_ohm, 'ohm')} at 20 \u00b0C"
    if choke.resistance_hot_ohm is not None:
        text += f", {format_quantity(choke.resistance_hot_ohm, 'ohm')} at work"
    return text


def _electrical(choke: WoundChoke) -> list[tuple[str, str]]:
    spread = choke.inductance_tolerance * 100.0
    pairs = [("inductance", f"{format_quantity(choke.inductance_h, 'H')} \u00b1 {spread:.0f} % without bias")]
    if choke.inductance_biased_h is not None and choke.work.current is not None:
        pairs.append(
            (
                "at bias",
                f"{format_quantity(choke.inductance_biased_h, 'H')} at "
                f"{format_quantity(choke.work.current, 'A')}, "
                f"{(choke.permeability_fraction or 0.0) * 100:.0f} % left "
                f"(field {format_quantity(choke.field_a_per_m or 0.0, 'A/m')})",
            )
        )
    return pairs


def _work(choke: WoundChoke) -> list[tuple[str, str]]:
    pairs = []
    if choke.flux_density_t is not None:
        text = f"{format_quantity(choke.flux_density_t, 'T')} at the peak"
        if choke.flux_swing_t is not None:
            text += f", swing {format_quantity(choke.flux_swing_t, 'T')} peak to peak"
        if choke.saturation_margin is not None:
            text += f", saturation {choke.saturation_margin:.2g} x away"
        pairs.append(("flux density", text))
    core = "not known" if choke.core_loss_w is None else format_quantity(choke.core_loss_w, "W")
    pairs.append(("core loss", core))
    if choke.copper_loss_w is not None:
        text = format_quantity(choke.copper_loss_w, "W")
        if choke.copper_ripple_loss_w is not None:
            text += f", of it {format_quantity(choke.copper_ripple_loss_w, 'W')} by the ripple"
        pairs.append(("copper loss", text))
    if choke.temperature_rise_k is not None and choke.temperature_rise_low_k is not None:
        pairs.append(("temperature", _temperature(choke)))
    return pairs


def _temperature(choke: WoundChoke) -> str:
    ambient = choke.work.ambient_c
    low, high = ambient + (choke.temperature_rise_low_k or 0.0), ambient + (choke.temperature_rise_k or 0.0)
    shown = temperature_text(high).replace(" degC", " \u00b0C")
    if shown.startswith("over"):
        return shown
    return f"{low:.0f} to {shown} by two methods, in air of {ambient:.0f} \u00b0C"


def _row(choke: WoundChoke, best: bool) -> list[str]:
    strands = f"{choke.strands} x " if choke.strands > 1 else ""
    return [
        "*" if best else "",
        f"{_stacked(choke.stack)}{choke.core}",
        choke.material,
        str(choke.turns),
        f"{strands}{choke.made.wire.name}",
        format_quantity(choke.total_loss_w or 0.0, "W"),
        f"{choke.temperature_rise_k or 0.0:.0f} K",
        format_quantity(choke.inductance_biased_h or 0.0, "H"),
        f"{choke.bore_fill * 100:.0f} %",
        format_quantity(choke.volume_m3, "m3"),
    ]


def _bias_row(curve: BiasCurve, index: int) -> list[str]:
    whole, at = curve.inductance_h[0], float(curve.inductance_h[index])
    return [
        format_quantity(float(curve.current_a[index]), "A"),
        format_quantity(at, "H"),
        format_quantity(float(curve.inductance_low_h[index]), "H"),
        format_quantity(float(curve.inductance_high_h[index]), "H"),
        f"{at / whole * 100:.0f} %",
        format_quantity(float(curve.field_a_per_m[index]), "A/m"),
    ]


def _effective(found: Identification) -> str:
    length, area = found.effective_length_m, found.effective_area_m2
    return f"{format_quantity(length, 'm')}, {format_quantity(area, 'm2')}"


def _plain(value: float) -> str:
    """Three digits, never with a power of ten."""
    return f"{float(f'{value:.3g}'):g}"


def _stacked(stack: int) -> str:
    return f"{stack} x " if stack > 1 else ""


def _remarks(warnings: Iterable[str], notes: Iterable[str]) -> list[str]:
    """Warnings with an exclamation mark, notes with a dash, each wrapped."""
    marked = [("! ", text) for text in warnings] + [("- ", text) for text in notes]
    return ["\n".join(_wrapped(mark, text) for mark, text in marked)] if marked else []


def _wrapped(mark: str, text: str) -> str:
    """A remark over several lines, broken between words only and never before a percent sign or a degree."""
    glue = "\u00a0"
    kept = text.replace(" degC", f"{glue}\u00b0C").replace(" %", f"{glue}%")
    lines = textwrap.fill(kept, _WIDTH, initial_indent=mark, subsequent_indent="  ", break_on_hyphens=False)
    return lines.replace(glue, " ")
