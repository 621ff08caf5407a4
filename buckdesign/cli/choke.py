"""``buckdesign choke``: wind a choke, choose one, recognise a ring, draw its bias curve."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from buckdesign.cli.choke_files import check_files, show, write_plot, write_sheet
from buckdesign.cli.console import print_note
from buckdesign.cli.options import Force, Json, Parts, new_application, quantity_option, tables_with

if TYPE_CHECKING:
    from buckdesign.design.choke_bench import ChokeWork, WoundChoke

app = new_application(
    no_args_is_help=True, help="Wind a choke, choose one, recognise a salvaged ring, draw its bias curve."
)

LIMIT_FAILS = 3
"""Exit status where turns do not fit, a limit is broken or nothing does the job."""

Core = Annotated[str, typer.Option("--core", metavar="RING", help='Ring, such as "R 26.9/14.5/11.1".')]
MaterialName = Annotated[
    str, typer.Option("--material", metavar="NAME", help='Material, such as "hydrogen-reduced iron 75".')
]
WireName = Annotated[str, typer.Option("--wire", metavar="NAME", help='Wire, such as "1.0 mm" or "AWG 18".')]
Stack = Annotated[int, typer.Option("--stack", metavar="N", help="Stacked rings.")]
Current = Annotated[float | None, quantity_option("--current", "A", "Mean (bias) current.")]
Ripple = Annotated[float | None, quantity_option("--ripple", "A", "Choke ripple current, peak to peak.")]
Frequency = Annotated[float | None, quantity_option("--frequency", "Hz", "Switching frequency.")]
Rise = Annotated[float, quantity_option("--duty", "%", "Share of the period in which the current rises.")]
Ambient = Annotated[float, quantity_option("--ambient", "degC", "Air around the choke.")]
Worst = Annotated[
    float | None, quantity_option("--worst-current", "A", "Largest current, such as start-up or overload.")
]
Plot = Annotated[Path | None, typer.Option("--plot", metavar="FILE", help="Draw it, .svg or .png.")]
Sheet = Annotated[
    Path | None, typer.Option("--sheet", metavar="FILE", help="Winding sheet for the bench, .svg or .txt.")
]


@app.command(
    epilog='Example: buckdesign choke wind --core "R 26.9/14.5/11.1" --material "hydrogen-reduced iron 75" '
    '--wire "1.0 mm" --inductance "200 uH" --current "2.5 A" --ripple "0.6 A" --frequency "20 kHz"'
)
def wind(
    core: Core,
    material: MaterialName,
    wire: WireName,
    turns: Annotated[int | None, typer.Option("--turns", metavar="N", help="Turns to wind.")] = None,
    inductance: Annotated[
        float | None, quantity_option("--inductance", "H", "Or: inductance wanted at the bias current.")
    ] = None,
    strands: Annotated[int, typer.Option("--strands", metavar="N", help="Parallel strands.")] = 1,
    stack: Stack = 1,
    permeability: Annotated[
        float, quantity_option("--permeability", "1", "Factor on the material's permeability.")
    ] = 1.0,
    current: Current = None,
    ripple: Ripple = None,
    voltage: Annotated[
        float | None,
        quantity_option("--voltage", "V", "Or: voltage across the choke while the current rises."),
    ] = None,
    frequency: Frequency = None,
    duty: Rise = 0.5,
    ambient: Ambient = 25.0,
    worst_current: Worst = None,
    sheet: Sheet = None,
    plot: Plot = None,
    parts: Parts = None,
    json: Json = False,
    force: Force = False,
) -> None:
    """Wind a choke and judge it: fit, wire, inductance, heat.

    Status 3 where the turns do not fit or a limit is broken.
    """
    from buckdesign.design.choke_bench import ChokeWork, WindingRequest, wind_choke
    from buckdesign.output.choke_text import wound_text

    check_files(plot, sheet, force)
    request = WindingRequest(
        core=core,
        material=material,
        wire=wire,
        turns=turns,
        inductance=inductance,
        strands=strands,
        stack=stack,
        permeability=permeability,
    )
    work = ChokeWork(
        current=current,
        ripple=ripple,
        voltage=voltage,
        frequency=frequency,
        duty=duty,
        ambient_c=ambient,
        worst_current=worst_current,
    )
    tables = tables_with(parts)
    choke = wind_choke(tables, request, work)
    figure = None if plot is None else _bias_figure(tables, choke)
    if sheet is not None:
        write_sheet(sheet, choke, force)
    if plot is not None and figure is not None:
        write_plot(plot, figure, force)
    show(choke.to_dict(), wound_text(choke), json)
    if not choke.holds:
        raise typer.Exit(LIMIT_FAILS)


@app.command(
    epilog='Example: buckdesign choke choose --inductance "200 uH" --current "2.5 A" --ripple "0.6 A" '
    '--frequency "20 kHz" --ambient "40 degC" --rank size'
)
def choose(
    inductance: Annotated[
        float, quantity_option("--inductance", "H", "Smallest inductance at the bias current.")
    ],
    current: Annotated[float, quantity_option("--current", "A", "Mean (bias) current.")],
    ripple: Annotated[float, quantity_option("--ripple", "A", "Choke ripple current, peak to peak.")],
    frequency: Annotated[float, quantity_option("--frequency", "Hz", "Switching frequency.")],
    duty: Rise = 0.5,
    ambient: Ambient = 25.0,
    worst_current: Worst = None,
    rank: Annotated[
        str, typer.Option("--rank", metavar="BY", help="Best first by loss, size or copper.")
    ] = "loss",
    core: Annotated[
        list[str] | None,
        typer.Option("--core", metavar="RING", help="Only this ring; may be given more than once."),
    ] = None,
    material: Annotated[
        list[str] | None,
        typer.Option("--material", metavar="NAME", help="Only this material; may be given more than once."),
    ] = None,
    wire: Annotated[
        list[str] | None,
        typer.Option("--wire", metavar="NAME", help="Only this wire; may be given more than once."),
    ] = None,
    most_strands: Annotated[
        int, typer.Option("--most-strands", metavar="N", help="Parallel strands at most.")
    ] = 4,
    most_stacked: Annotated[
        int, typer.Option("--most-stacked", metavar="N", help="Stacked rings at most.")
    ] = 2,
    core_limit: Annotated[float, quantity_option("--core-limit", "degC", "Hottest core.")] = 100.0,
    bore_fill: Annotated[
        float, quantity_option("--bore-fill", "%", "Share of the bore that is wound at most.")
    ] = 0.45,
    unsold: Annotated[
        bool,
        typer.Option(
            "--unsold", help="Also rings in materials in which no list of inductance factors has them."
        ),
    ] = False,
    count: Annotated[int, typer.Option("--count", metavar="N", help="Chokes to show.")] = 20,
    sheet: Sheet = None,
    plot: Plot = None,
    parts: Parts = None,
    json: Json = False,
    force: Force = False,
) -> None:
    """Choose among all that the tables allow.

    Every ring, material, wire, number of strands and of stacked rings is tried, with the turns that reach
    the inductance at the bias current. By hand 35 % of the bore is comfortable and 45 % full, the default
    limit. A sheet is that of the best. Status 3 where nothing does it.
    """
    from buckdesign.cli.choke_files import choice_title, parse_rank, whole
    from buckdesign.design.choke_bench import ChokeWork, wound_chokes
    from buckdesign.design.choke_search import ChokeLimits, ChokeNeed, ChokeSpace, choose_chokes
    from buckdesign.output.choke_text import choice_text

    check_files(plot, sheet, force)
    order, shown = parse_rank(rank), whole("--count", count)
    need = ChokeNeed(
        inductance=inductance,
        current=current,
        ripple=ripple,
        frequency=frequency,
        duty=duty,
        ambient_c=ambient,
        worst_current=worst_current,
    )
    space = ChokeSpace(
        rings=core,
        materials=material,
        wires=wire,
        strands=range(1, whole("--most-strands", most_strands) + 1),
        stacks=range(1, whole("--most-stacked", most_stacked) + 1),
        unpublished=unsold,
    )
    limits = ChokeLimits(core_c=core_limit, bore_fill=bore_fill)
    tables = tables_with(parts)
    choice = choose_chokes(tables, need, space=space, limits=limits, rank=order)
    work = ChokeWork(
        current=current,
        ripple=ripple,
        frequency=frequency,
        duty=duty,
        ambient_c=ambient,
        worst_current=worst_current,
    )
    chokes = wound_chokes(tables, choice, range(min(shown, len(choice))), work)
    pareto = wound_chokes(tables, choice, choice.pareto.tolist(), work)
    if len(choice) and sheet is not None:
        write_sheet(sheet, chokes[0], force)
    if len(choice) and plot is not None:
        from buckdesign.output.choke_plots import choice_figure

        write_plot(plot, choice_figure(choice, choice_title(need)), force)
    rows = {"rows": [one.to_dict() for one in chokes], "pareto": [one.to_dict() for one in pareto]}
    show(rows, choice_text(choice, chokes), json)
    if not len(choice):
        print_note("nothing of the tables does it within the limits; what failed is listed")
        raise typer.Exit(LIMIT_FAILS)


@app.command(
    epilog='Example: buckdesign choke identify --outer "26.9 mm" --inner "14.5 mm" --height "11.1 mm" '
    '--turns 20 --inductance "36 uH"'
)
def identify(
    outer: Annotated[float, quantity_option("--outer", "m", "Outer diameter.")],
    inner: Annotated[float, quantity_option("--inner", "m", "Inner diameter.")],
    height: Annotated[float, quantity_option("--height", "m", "Height.")],
    turns: Annotated[int, typer.Option("--turns", metavar="N", help="Turns of the test winding.")],
    inductance: Annotated[
        float, quantity_option("--inductance", "H", "Its inductance without direct current.")
    ],
    bias_current: Annotated[
        float | None, quantity_option("--bias-current", "A", "Direct current of a second reading.")
    ] = None,
    biased_inductance: Annotated[
        float | None, quantity_option("--biased-inductance", "H", "Inductance at that current.")
    ] = None,
    second_turns: Annotated[
        int | None, typer.Option("--second-turns", metavar="N", help="Turns of a second test winding.")
    ] = None,
    second_inductance: Annotated[
        float | None, quantity_option("--second-inductance", "H", "Its inductance.")
    ] = None,
    dimension_tolerance: Annotated[
        float, quantity_option("--dimension-tolerance", "%", "Error of the dimensions.")
    ] = 0.01,
    meter_tolerance: Annotated[
        float, quantity_option("--meter-tolerance", "%", "Error of the inductance meter.")
    ] = 0.03,
    parts: Parts = None,
    json: Json = False,
) -> None:
    """Recognise a ring by a test winding.

    A second reading under direct current, or a second test winding, makes it surer.
    """
    from buckdesign.design.choke_identify import RingSize, TestReading, identify_core
    from buckdesign.output.choke_text import identification_text

    size = RingSize(
        outer=outer,
        inner=inner,
        height=height,
        dimension_tolerance=dimension_tolerance,
        meter_tolerance=meter_tolerance,
    )
    reading = TestReading(
        turns=turns,
        inductance=inductance,
        bias_current=bias_current,
        biased_inductance=biased_inductance,
        second_turns=second_turns,
        second_inductance=second_inductance,
    )
    found = identify_core(tables_with(parts), size, reading)
    show(found.to_dict(), identification_text(found), json)


@app.command(
    epilog='Example: buckdesign choke bias --core "R 26.9/14.5/11.1" --material "hydrogen-reduced iron 75" '
    "--turns 57 --plot bias.svg"
)
def bias(
    core: Core,
    material: MaterialName,
    turns: Annotated[int, typer.Option("--turns", metavar="N", help="Turns.")],
    stack: Stack = 1,
    current: Annotated[
        float | None, quantity_option("--current", "A", "Largest current of the curve.")
    ] = None,
    points: Annotated[
        Path | None,
        typer.Option(
            "--points",
            metavar="FILE",
            help="Own readings, CSV with current_a,inductance_uh: the law is refitted to them and stored.",
        ),
    ] = None,
    output: Annotated[
        Path | None,
        typer.Option(
            "--output",
            "-o",
            metavar="FILE",
            help="Table for the refitted material; your parts folder without.",
        ),
    ] = None,
    plot: Plot = None,
    parts: Parts = None,
    json: Json = False,
    force: Force = False,
) -> None:
    """Show inductance against direct current.

    With the uncertainty of the bias law. Own readings refit the law for that ring; the result is stored as a
    material of your own, which every command then knows by the name that is printed.
    """
    from buckdesign.cli.choke_files import store
    from buckdesign.design.bias_points import read_bias_points
    from buckdesign.design.choke_bias import BiasRequest, bias_curve
    from buckdesign.errors import InputError
    from buckdesign.output.choke_text import bias_text

    check_files(plot, None, force)
    if output is not None and points is None:
        raise InputError("--output is for the material refitted to --points, which are missing")
    request = BiasRequest(core=core, material=material, turns=turns, stack=stack, most_current=current)
    readings = () if points is None else read_bias_points(points)
    curve = bias_curve(tables_with(parts), request, readings)
    stored = None if curve.fitted_material is None else store(curve.fitted_material, output, force)
    if plot is not None:
        from buckdesign.output.choke_plots import bias_figure

        write_plot(plot, bias_figure(curve), force)
    show(curve.to_dict(stored), bias_text(curve), json)


def _bias_figure(tables: Any, choke: WoundChoke) -> Any:
    """The bias curve of a wound choke."""
    from buckdesign.design.choke_bias import BiasRequest, bias_curve
    from buckdesign.output.choke_plots import bias_figure

    work: ChokeWork = choke.work
    if choke.made.material.bias_field is None:
        print_note(f"{choke.material}: no bias law is known, so there is nothing to draw")
        return None
    reach = None if work.current is None else 2.0 * work.peak
    request = BiasRequest(
        core=choke.core,
        material=choke.material,
        turns=choke.turns,
        stack=choke.stack,
        most_current=reach,
        permeability=choke.made.permeability,
    )
    return bias_figure(bias_curve(tables, request), work.current)
