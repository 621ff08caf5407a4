"""Ambients that no junction could stand are refused before anything is run."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from buckdesign.design.ambient_limits import check_ambient, check_requirement_ambient
from buckdesign.design.design_file import read_design
from buckdesign.design.operating import simulate
from buckdesign.design.requirement import read_requirement
from buckdesign.design.resolve import resolve_design
from buckdesign.errors import InputError
from buckdesign.parts import load_tables
from buckdesign.studies.rectifier_choice import Over, rectifier_choice
from buckdesign.studies.rectifiers import compare_rectifiers

from .operating_designs import BENCH, bench, resolved_bench

NEED = """\
[supply]
voltage = "24 V"
[output]
voltage = "12 V"
current = "2 A"
ripple = "100 mV"
[limits]
ambient = ["20 degC", "130 degC"]
"""


def test_the_lowest_limit_counts_and_is_named() -> None:
    # table: the 1.5 A class stands 125 degC, less than transistor and rectifier of the bench supply
    resolved = resolved_bench()
    check_ambient(resolved, 124.9)
    with pytest.raises(InputError, match=r"ambient = 125 degC: .* regulator adjustable 1.5 A, 125 degC"):
        check_ambient(resolved, 125.0)
    own = resolved_bench({"transistor.junction_limit": "60 degC"})
    with pytest.raises(InputError, match="below the junction limit of the transistor 2N3791, 60 degC"):
        check_ambient(own, 70.0)


def test_what_stands_in_the_file_is_named_with_its_line(tmp_path: Path) -> None:
    path = tmp_path / "hot.design.toml"
    path.write_text(BENCH.replace('ambient = "25 degC"', 'ambient = "130 degC"'))
    line = path.read_text().split("\n").index('ambient = "130 degC"') + 1
    with pytest.raises(InputError) as caught:
        check_ambient(resolve_design(read_design(path)))
    assert str(caught.value).startswith(f'{path}:{line}: thermal.ambient = "130 degC": must be below')


def test_everything_that_runs_a_design_refuses_it() -> None:
    for run in (
        lambda: simulate(bench(), ambient_c=130.0),
        lambda: compare_rectifiers(bench(), ("1N5822",), ambient_c=130.0),
        lambda: rectifier_choice(bench(), Over.LOAD, ("1N5822",), ambient_c=130.0),
    ):
        with pytest.raises(InputError, match="ambient = 130 degC"):
            run()
    assert simulate(bench(), ambient_c=130.0, electrical_only=True).point.frequency_hz > 0.0


def test_a_requirement_that_no_regulator_could_stand(tmp_path: Path) -> None:
    path, tables = tmp_path / "hot.toml", load_tables()
    path.write_text(NEED)
    need = read_requirement(path)
    with pytest.raises(InputError) as caught:
        check_requirement_ambient(need, tables)
    assert str(caught.value) == (
        f'{path}:8: limits.ambient = "130 degC": must be below the junction limit of every regulator in the tables, '
        "125 degC"
    )
    cool = replace(need, limits=replace(need.limits, ambient=(20.0, 110.0)))
    check_requirement_ambient(cool, tables)
    # table: 1N5822 stands 125 degC, 2N4918 150 degC
    warm = replace(cool, prefer=replace(cool.prefer, rectifier=("1N5822",)), source=None)
    check_requirement_ambient(warm, tables)
    hot = replace(warm, limits=replace(warm.limits, ambient=(20.0, 124.9)))
    check_requirement_ambient(hot, tables)
