"""``buckdesign sweep``: a design-space study."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from buckdesign.cli.console import is_ascii_only, note_compiling, print_data, print_note
from buckdesign.cli.options import ElectricalOnly, Force, Json, Output, Parts, new_application, tables_with
from buckdesign.cli.progress import ProgressNote

if TYPE_CHECKING:
    from buckdesign.studies.sweep import SweepResult

app = new_application(help="Compute a study over a design space.")

POINTS_FAIL = 4
"""Exit status where some points could not be computed."""

StudyFile = Annotated[Path, typer.Argument(metavar="STUDY", help="Study file.")]
Jobs = Annotated[
    int | None,
    typer.Option("--jobs", "-j", min=1, metavar="N", help="Processes; as many as processors by default."),
]


@app.command(epilog="Example: buckdesign sweep rail.study.toml --plot front.svg")
def sweep(
    study: StudyFile,
    output: Output = None,
    jobs: Jobs = None,
    cluster: Annotated[
        str | None,
        typer.Option("--cluster", metavar="ADDRESS", help="Dask scheduler, tcp://host:port, or local:N."),
    ] = None,
    electrical_only: ElectricalOnly = False,
    restart: Annotated[bool, typer.Option("--restart", help="Begin anew, whatever is there.")] = False,
    allow: Annotated[
        int | None, typer.Option("--allow", min=1, metavar="N", help="Most points, for more than usual.")
    ] = None,
    plot: Annotated[
        Path | None, typer.Option("--plot", metavar="FILE", help="The front, .svg or .png.")
    ] = None,
    effects: Annotated[
        Path | None,
        typer.Option("--effects", metavar="FILE", help="Each result against each varied key, .svg or .png."),
    ] = None,
    result: Annotated[
        list[str] | None,
        typer.Option("--result", metavar="COLUMN", help="A result to draw with --effects; more than once."),
    ] = None,
    parts: Parts = None,
    json: Json = False,
    force: Force = False,
) -> None:
    """Compute every point of a study into a table, and show the best of them.

    The same command goes on where an earlier run was broken off. Status 4 where some points could not be
    computed: their row says why. Points that violate a limit are data, and no failure.
    """
    from buckdesign.studies.sweep import run_sweep, sweep_task

    _check_files(plot, effects, output, parts, force)
    task = sweep_task(study, tables_with(parts), electrical_only=electrical_only)
    shown = _results(result, task.kinds) if result else None
    note_compiling()
    with ProgressNote("points") as progress:
        done = run_sweep(
            task, output, jobs=jobs, cluster=cluster, restart=restart, allow=allow,
            progress=progress, tell=print_note,
        )  # fmt: skip
    if done.failed == done.task.work.count and (plot or effects):
        print_note("no point could be computed: there is nothing to draw")
    else:
        _draw(done, plot, effects, shown, force)
    _print(done, json)
    if done.failed:
        raise typer.Exit(POINTS_FAIL)


def _check_files(
    plot: Path | None, effects: Path | None, output: Path | None, parts: list[Path] | None, force: bool
) -> None:
    from buckdesign.design.safe_write import check_writable_name
    from buckdesign.errors import FileAccessError, InputError
    from buckdesign.output.plots import figure_format

    given = {"--output": output, "--plot": plot, "--effects": effects}
    places = [path.absolute() for path in given.values() if path is not None]
    if len(set(places)) < len(places):
        named = [name for name, path in given.items() if path is not None and places.count(path.absolute()) > 1]
        raise InputError(f"{' and '.join(named)}: the same file for both")
    if output is not None and any(output.exists() and one.exists() and output.samefile(one) for one in parts or ()):
        raise FileAccessError(output, "the parts are read from this file; another name is wanted")

    for path in (plot, effects):
        if path is not None:
            figure_format(path)
            check_writable_name(path, force=force)


def _results(names: list[str], kinds: object) -> list[str]:
    from buckdesign.errors import InputError, nearest_names, quoted

    known = [name for name, kind in dict(kinds).items() if kind == "float"]  # type: ignore[call-overload]
    for name in names:
        if name not in known:
            near = ", ".join(quoted(one) for one in nearest_names(name, known))
            raise InputError(f"--result {quoted(name)}: no column of numbers, nearest: {near}")
    return names


def _draw(
    done: SweepResult, plot: Path | None, effects: Path | None, shown: list[str] | None, force: bool
) -> None:
    if plot is None and effects is None:
        return
    from buckdesign.design.safe_write import write_bytes_new, write_bytes_over
    from buckdesign.output.plots import figure_bytes, figure_format
    from buckdesign.output.study_plots import effects_figure, front_figure, main_results, study_points

    points = study_points(done)
    for path, make in (
        (plot, lambda: front_figure(points)),
        (effects, lambda: effects_figure(points, shown or main_results(points))),
    ):
        if path is not None:
            content = figure_bytes(make(), figure_format(path))
            (write_bytes_over if force else write_bytes_new)(path, content)
            print_note(f"written: {path}")


def _print(done: SweepResult, json: bool) -> None:
    from buckdesign.output.sweep_text import json_lines, sweep_text
    from buckdesign.output.text import plain_text

    if json:
        for line in json_lines(done):
            print_data(line)
        return
    text = sweep_text(done)
    print_data(plain_text(text) if is_ascii_only() else text)
