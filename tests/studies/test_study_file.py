"""Study files: what they mean, and every fault at once."""

from __future__ import annotations

import json
import pickle
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from buckdesign.design.design_file import design_keys, keyed_design
from buckdesign.design.requirement import requirement_keys
from buckdesign.errors import FaultsError, FileAccessError
from buckdesign.parts import load_tables
from buckdesign.studies.space import GridSpace, Method, SampledSpace
from buckdesign.studies.study_file import Study, read_study

EXAMPLES = Path(__file__).parents[2] / "examples"
TABLES = load_tables(folder=Path("no such folder"))

# the study that the description of the file format shows, with the requirement of the radio as its design
SHOWN = """\
base = "radio.design.toml"
[vary]
"choke.turns" = { from = 30, to = 80, step = 2 }
"network.rh" = ["470 kohm", "1 Mohm", "2.2 Mohm"]
"output_capacitor.esr" = { from = "20 mohm", to = "200 mohm", count = 10, spacing = "log" }
"rectifier.part" = ["1N5822", "1N5811"]
"output.current" = ["0.5 A", "2.5 A"]
[vary.together]
"supply.voltage" = ["21 V", "29 V"]
"thermal.ambient" = ["5 degC", "40 degC"]
[best]
minimise = ["total_loss_w", "choke_volume_cm3"]
subject_to = ["choke_c < 100", "ripple_v < 120 mV"]
"""


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    for name in ("radio.design.toml", "logger.toml"):
        (tmp_path / name).touch()
    return tmp_path


def read(folder: Path, text: str, **columns: Any) -> Study:
    path = folder / "some.study.toml"
    path.write_text(text, encoding="utf-8")
    return read_study(path, TABLES, **columns)


def vary(folder: Path, text: str) -> Study:
    return read(folder, f'base = "radio.design.toml"\n[vary]\n{text}')


def redesign(folder: Path, text: str) -> Study:
    return read(folder, f'requirement = "logger.toml"\n[vary]\n{text}')


def faults(folder: Path, text: str) -> list[str]:
    with pytest.raises(FaultsError) as caught:
        read(folder, text)
    prefix = f"{folder / 'some.study.toml'}:"
    lines = str(caught.value).split("\n")
    assert all(line.startswith(prefix) for line in lines)
    return [line.removeprefix(prefix) for line in lines]


def vary_fault(folder: Path, text: str) -> str:
    """The one fault of a ``[vary]`` table, whose first line is line 3."""
    found = faults(folder, f'base = "radio.design.toml"\n[vary]\n{text}')
    assert len(found) == 1, found
    return found[0]


def column(study: Study, name: str) -> list[Any]:
    found = study.space.values(0, study.space.count)[name]
    return found if isinstance(found, list) else found.tolist()


def test_the_study_of_the_description(folder: Path) -> None:
    study = read(folder, SHOWN)
    assert study.path == folder / "some.study.toml"
    assert study.base == folder / "radio.design.toml"
    assert study.requirement is None
    assert isinstance(study.space, GridSpace)
    assert study.space.keys == (
        "choke.turns", "network.rh", "output_capacitor.esr", "rectifier.part", "output.current",
        "supply.voltage", "thermal.ambient",
    )  # fmt: skip
    assert study.space.count == 26 * 3 * 10 * 2 * 2 * 2
    assert study.minimise == ("total_loss_w", "choke_volume_cm3")
    assert study.maximise == ()
    assert [one.text for one in study.subject_to] == ["choke_c < 100", "ripple_v < 120 mV"]
    assert study.notes == ()
    last: dict[str, Any] = study.space.values(study.space.count - 1, study.space.count)
    assert {name: next(iter(values)) for name, values in last.items()} == {
        "choke.turns": 80, "network.rh": 2.2e6, "output_capacitor.esr": 0.2, "rectifier.part": "1N5811",
        "output.current": 2.5, "supply.voltage": 29.0, "thermal.ambient": 40.0,
    }  # fmt: skip
    assert last["choke.turns"].dtype == np.int64


def test_a_study_is_small_and_survives_the_way_to_another_process(folder: Path) -> None:
    study = read(folder, SHOWN)
    packed = pickle.dumps(study)
    assert len(packed) < 8_000
    assert pickle.loads(packed) == study
    assert json.loads(json.dumps(study.tree)) == study.tree
    assert study.tree["vary"]["choke.turns"] == {"from": 30, "to": 80, "step": 2}


@pytest.mark.parametrize(
    ("key", "values", "wanted"),
    [
        ("choke.turns", "{ from = 30, to = 36, step = 4 }", [30, 34]),
        ("choke.turns", "{ from = 36, to = 30, step = -3 }", [36, 33, 30]),
        ("choke.turns", "{ from = 30, to = 50, count = 3 }", [30, 40, 50]),
        ("choke.turns", '{ from = 10, to = 80, count = 4, spacing = "log" }', [10, 20, 40, 80]),
        ("choke.turns", "{ from = 7, to = 7, count = 1 }", [7]),
        ("choke.turns", "[40, 30]", [40, 30]),
        ("output.current", '{ from = "0.1 A", to = "0.7 A", step = "0.2 A" }', [0.1, 0.3, 0.5, 0.7]),
        ("output.current", '{ from = 0, to = "1 A", step = "300 mA", spacing = "linear" }', [0.0, 0.3, 0.6, 0.9]),
        ("network.rh", '{ from = "1 Mohm", to = "10k", count = 3, spacing = "log" }', [1e6, 1e5, 1e4]),
        ("network.ch", '{ from = "100 pF", to = "300 pF", count = 3 }', [1e-10, 2e-10, 3e-10]),
        ("thermal.ambient", '{ from = "-10 degC", to = "40 degC", step = "25 K" }', [-10.0, 15.0, 40.0]),
        ("thermal.ambient", '{ from = "40 degC", to = 20, step = "-10 degC" }', [40.0, 30.0, 20.0]),
        ("thermal.ambient", "{ from = -10, to = 10, step = 10 }", [-10.0, 0.0, 10.0]),
        ("choke.core", '["R 26.9/14.5/11.1"]', ["R 26.9/14.5/11.1"]),
        ("regulator.current_limit_far", '[["0.4 A", "40 V"], ["0.3 A", "30 V"]]', [(0.4, 40.0), (0.3, 30.0)]),
        ("thermal.on_heatsink", '[["transistor"], ["transistor", "rectifier"]]',
         [("transistor",), ("transistor", "rectifier")]),
        ("output.tolerance", '{ from = "1 %", to = "3 %", step = "1 %" }', [0.01, 0.02, 0.03]),
    ],
)  # fmt: skip
def test_lists_and_ranges_of_design_keys(folder: Path, key: str, values: str, wanted: list[Any]) -> None:
    assert column(vary(folder, f'"{key}" = {values}'), key) == wanted


@pytest.mark.parametrize(
    ("key", "values", "wanted"),
    [
        ("supply.voltage", '["24 V", ["21 V", "24 V", "29 V"]]', [(24.0, 24.0, 24.0), (21.0, 24.0, 29.0)]),
        (
            "output.current",
            '{ from = "1 A", to = "2 A", step = "0.5 A" }',
            [(0.0, 1.0), (0.0, 1.5), (0.0, 2.0)],
        ),
        ("prefer.rectifier", '["1N5822", ["1N5822", "1N5811"]]', [("1N5822",), ("1N5822", "1N5811")]),
        ("limits.regular", "[true, false]", [True, False]),
        ("output.ripple", '["60 mV", "120 mV"]', [0.06, 0.12]),
    ],
)
def test_lists_and_ranges_of_requirement_keys(folder: Path, key: str, values: str, wanted: list[Any]) -> None:
    study = redesign(folder, f'"{key}" = {values}')
    assert (study.base, study.requirement) == (None, folder / "logger.toml")
    assert column(study, key) == wanted


def test_together_stands_where_the_file_has_it_and_there_may_be_several(folder: Path) -> None:
    text = """
"network.rh" = [1, 2]
together = [
    { "supply.voltage" = { from = 20, to = 24, count = 3 }, "thermal.ambient" = [5, 5, 9] },
    { "choke.turns" = [30, 40], "choke.strands" = [1, 2] },
]
"network.r1" = [3, 4]
"""
    study = vary(folder, text)
    assert study.space.keys == (
        "network.rh", "supply.voltage", "thermal.ambient", "choke.turns", "choke.strands", "network.r1",
    )  # fmt: skip
    assert study.space.count == 2 * 3 * 2 * 2
    rows = list(zip(*(column(study, name) for name in study.space.keys), strict=True))
    assert rows[:6] == [
        (1.0, 20.0, 5.0, 30, 1, 3.0),
        (1.0, 20.0, 5.0, 30, 1, 4.0),
        (1.0, 20.0, 5.0, 40, 2, 3.0),
        (1.0, 20.0, 5.0, 40, 2, 4.0),
        (1.0, 22.0, 5.0, 30, 1, 3.0),
        (1.0, 22.0, 5.0, 30, 1, 4.0),
    ]
    tables = '[[vary.together]]\n"choke.turns" = [1, 2]\n[[vary.together]]\n"choke.stack" = [1, 2]\n'
    assert vary(folder, tables).space.count == 4


def test_together_before_the_table_it_belongs_to_is_slowest(folder: Path) -> None:
    study = read(
        folder,
        'base = "radio.design.toml"\n[vary.together]\n"choke.turns" = [1, 2]\n[vary]\n"choke.stack" = [1, 2]\n',
    )
    assert study.space.keys == ("choke.turns", "choke.stack")


SAMPLE = """
[sample]
method = "{method}"
count = {count}
seed = 7
"""


@pytest.mark.parametrize("method", Method)
def test_samples_draw_from_ranges_and_choose_from_lists(folder: Path, method: Method) -> None:
    text = """
"network.rh" = { from = "10 kohm", to = "1 Mohm", spacing = "log" }
"choke.turns" = { from = 30, to = 60 }
"output.current" = { from = "0.5 A", to = "2.5 A", step = "1 A" }
"rectifier.part" = ["1N5822", "1N5811"]
[vary.together]
"supply.voltage" = { from = "21 V", to = "29 V" }
"thermal.ambient" = { from = "5 degC", to = "45 degC" }
"""
    study = vary(folder, text + SAMPLE.format(method=method.value, count=512))
    assert isinstance(study.space, SampledSpace)
    assert (study.space.method, study.space.count, study.space.seed) == (method, 512, 7)
    found = study.space.values(0, 512)
    # half of the values of a log range are below the middle in ratio, 100 kohm
    assert abs(np.sum(np.asarray(found["network.rh"]) < 1e5) - 256) < 40
    assert np.all((np.asarray(found["network.rh"]) >= 1e4) & (np.asarray(found["network.rh"]) <= 1e6))
    assert set(column(study, "choke.turns")) == set(range(30, 61))
    assert set(column(study, "output.current")) == {0.5, 1.5, 2.5}
    assert set(column(study, "rectifier.part")) == {"1N5822", "1N5811"}
    share = (np.asarray(found["supply.voltage"]) - 21.0) / 8.0
    assert np.allclose(np.asarray(found["thermal.ambient"]), 5.0 + 40.0 * share)


def test_a_spread_of_a_requirement_can_be_sampled(folder: Path) -> None:
    study = redesign(
        folder, '"output.current" = { from = 1, to = 2 }' + SAMPLE.format(method="sobol", count=8)
    )
    loads = column(study, "output.current")
    assert all(low == 0.0 and 1.0 <= high <= 2.0 for low, high in loads)
    assert len(set(loads)) == 8


def test_notes_tell_what_makes_a_sample_poor(folder: Path) -> None:
    text = '"network.rh" = [1, 2, 3]\n"network.r1" = [1, 2]\n'
    study = vary(folder, text + SAMPLE.format(method="sobol", count=100) + '[best]\nminimise = "ripple_v"')
    assert len(study.notes) == 2
    assert "100" in study.notes[0] and "64 or 128" in study.notes[0]
    assert "6 combinations" in study.notes[1]
    study = vary(folder, '"network.rh" = {from = 1, to = 2}\n' + SAMPLE.format(method="random", count=100))
    assert study.notes == ("no objective is given: total_loss_w is minimised",)


def test_objectives(folder: Path) -> None:
    text = '"network.rh" = [1, 2]\n[best]\n'
    assert vary(folder, '"network.rh" = [1, 2]').minimise == ("total_loss_w",)
    assert vary(folder, text + 'subject_to = "network.rh > 1"').minimise == ("total_loss_w",)
    study = vary(folder, text + 'maximise = "efficiency"')
    assert (study.minimise, study.maximise) == ((), ("efficiency",))
    study = vary(folder, text + 'minimise = ["network.rh", "choke_current_a.max"]')
    assert study.minimise == ("network.rh", "choke_current_a.max")


def test_columns_that_only_a_redesign_has(folder: Path) -> None:
    body = '[vary]\n"output.ripple" = [0.1, 0.2]\n[best]\nminimise = "worst.ripple_v"\n'
    further = {"redesign_columns": ("worst.ripple_v",)}
    assert read(folder, f'requirement = "logger.toml"\n{body}', **further).minimise == ("worst.ripple_v",)
    with pytest.raises(FaultsError, match=r"worst\.ripple_v.*neither a varied key nor a result"):
        read(folder, f'base = "radio.design.toml"\n{body}', **further)


def test_columns_are_those_of_the_caller(folder: Path) -> None:
    text = f'{SHOWN.split("[best]")[0]}[best]\nmaximise = "yield"'
    assert read(folder, text, columns=("yield",)).maximise == ("yield",)
    with pytest.raises(FaultsError, match="neither a varied key nor a result"):
        read(folder, text)


@pytest.mark.parametrize(
    ("text", "line", "parts"),
    [
        ('"choke.turns" = 48', 3, ['vary."choke.turns" = 48', "one value", "a list of values"]),
        ('"choke.turns" = []', 3, ["an empty list"]),
        ('"choke.turns" = [30, 40.5, 50]', 3, ['"choke.turns"[1] = 40.5', "a whole number"]),
        ('"choke.turns" = [30,\n 40,\n 30]', 5, ['"choke.turns"[2] = 30', "stands twice"]),
        ('"network.rh" = ["1 Mohm", "1000k"]', 3, ['[1] = "1000k"', "stands twice"]),
        ('"choke.wire" = ["1 mm", "1.0 mm"]', 3, ['[1] = "1.0 mm"', "stands twice"]),
        ('"network.rh" = ["1 MHz"]', 3, ['[0] = "1 MHz"', "a resistance in ohm"]),
        ('"network.rh" = [{ from = 1 }]', 3, ["[0]: ", "not a table"]),
        ('"rectifier.part" = ["1N58222"]', 3, ["unknown rectifier", '"1N5822"']),
        ('"regulator.current_limit_far" = ["0.4 A", "40 V"]', 3,
         ['"regulator.current_limit_far" = ["0.4 A", "40 V"]: one value', '[["0.4 A", "40 V"], ...]']),
        ('"regulator.current_limit_far" = [["0.4 A", "40 V"], ["0.4 A"]]', 3, ["a list of two quantities"]),
        ('"choke.turn" = [3]', 3, ["unknown key of a design file", '"choke.turns"']),
        ('"output.ripple" = [3]', 3, ["unknown key of a design file"]),
        ('"choke" = [3]', 3, ["a table of a design file", '"choke.core"']),
        ('"thermal.transistor" = { pad = [3, 4] }', 3, ['in quotes: "thermal.transistor.pad"']),
        ("choke.turns = [3]", 3, ['in quotes: "choke.turns"']),
        ('[vary.choke]\nturns = [3]', 3, ['in quotes: "choke.turns"']),
        ("", 2, ["keys to vary are wanted"]),
        ('"choke.turns" = { to = 80, step = 2 }', 3, ['"choke.turns".from: missing']),
        ('"choke.turns" = { from = 30, step = 2 }', 3, ['"choke.turns".to: missing']),
        ('"choke.turns" = { from = 0, to = 80, step = 2 }', 3, [".from = 0", "1 or more"]),
        ('"network.rh" = { from = "1 V", to = 80, step = 2 }', 3, ['.from = "1 V"', "a resistance"]),
        ('"choke.turns" = { from = 30, to = 80 }', 3, ["step or count is wanted, or a [sample]"]),
        ('"choke.turns" = { from = 30, to = 80, step = 2, count = 3 }', 3, [".count = 3", "not both"]),
        ('"choke.turns" = { from = 30, to = 80, step = 0 }', 3, [".step = 0", "other than 0"]),
        ('"choke.turns" = { from = 30, to = 80, step = 0.5 }', 3, [".step = 0.5", "a whole number"]),
        ('"choke.turns" = { from = 30, to = 80, step = -2 }', 3, [".step = -2", "leads away", "above 0"]),
        ('"choke.turns" = { from = 80, to = 30, step = 2 }', 3, [".step = 2", "leads away", "below 0"]),
        ('"network.rh" = { from = 1, to = 2, step = "1 V" }', 3, ['.step = "1 V"', "a resistance"]),
        ('"network.rh" = { from = 1, to = 2, step = 1e-12 }', 3, [".step", "at most 1000000000"]),
        ('"choke.turns" = { from = 30, to = 80, count = 0 }', 3, [".count = 0", "1 or more"]),
        ('"choke.turns" = { from = 30, to = 80, count = 1 }', 3, [".count = 1", "2 or more"]),
        ('"choke.turns" = { from = 30, to = 30, count = 2 }', 3, [".count = 2", "1 is wanted"]),
        ('"choke.turns" = { from = 30, to = 35, count = 3 }', 3, [".count = 3", "32.5", "whole numbers"]),
        ('"choke.turns" = { from = 10, to = 80, count = 5, spacing = "log" }', 3, [".count = 5", "whole numbers"]),
        ('"choke.turns" = { from = 2, to = 4, count = 9, spacing = "log" }', 3, [".count = 9", "only 3 whole"]),
        ('"network.rh" = { from = 1, to = 2, count = 1e10 }', 3, [".count", "at most 1000000000"]),
        ('"network.rh" = { from = 1, to = 2, count = 3, spacing = "lin" }', 3, [".spacing", 'nearest: "linear"']),
        ('"network.rh" = { from = 1, to = 2, step = 1, spacing = "log" }', 3, [".spacing", "not with step"]),
        ('"network.ch" = { from = 1, to = 2, cuont = 3, step = 1 }', 3, [".cuont = 3", 'nearest: "count"']),
        ('"output.current" = { from = 0, to = 2, count = 3, spacing = "log" }', 3, [".spacing", "above 0"]),
        ('"thermal.ambient" = { from = 5, to = 40, count = 3, spacing = "log" }', 3, ["has no meaning"]),
        ('"thermal.ambient" = { from = 5, to = 40, step = "5 V" }', 3, ['.step = "5 V"', "temperature"]),
        ('"rectifier.part" = { from = 1, to = 2, step = 1 }', 3, ["no range", "the name of a rectifier"]),
        ('together = 3', 3, ["vary.together = 3", "a table of keys"]),
        ('together = {}', 3, ["a table of keys"]),
        ('together = [3]', 3, ["together[0] = 3", "a table of keys"]),
        ('[vary.together]\n"choke.turns" = [1, 2]\n"choke.stack" = [1, 2, 3]', 5,
         ['together."choke.stack": 3 values, but "choke.turns" has 2 values']),
        ('[vary.together]\n"choke.turns" = [1, 2, 1]\n"choke.stack" = [1, 2, 1]', 3, ["step 3 is the same as step 1"]),
        ('"choke.turns" = [1, 2]\n[vary.together]\n"choke.turns" = [1, 2]', 5, ["varied already in line 3"]),
        ('[[vary.together]]\n"choke.turns" = [1, 2]\n[[vary.together]]\n"choke.turns" = [1, 2]', 6,
         ["varied already in line 4"]),
    ],
)  # fmt: skip
def test_faults_of_what_is_varied(folder: Path, text: str, line: int, parts: list[str]) -> None:
    told = vary_fault(folder, text)
    assert told.startswith(f"{line}: ")
    for part in parts:
        assert part in told


def test_a_group_of_a_list_and_a_bare_range_wants_a_count(folder: Path) -> None:
    text = '[vary.together]\n"choke.turns" = [1, 2]\n"network.rh" = { from = 1, to = 2 }\n'
    told = vary_fault(folder, text + SAMPLE.format(method="random", count=9))
    assert told.startswith('5: vary.together."network.rh": a range without step and count')
    assert told.endswith("give the range a count")


BODY = '[vary]\n"network.rh" = { from = 1, to = 2, count = 2 }\n'


@pytest.mark.parametrize(
    ("text", "wanted"),
    [
        (f'bass = "x"\n{BODY}', ['1: bass = "x": unknown key, nearest: "base"', "1: base: missing"]),
        (f'base = "radio.design.toml"\nrequirement = "logger.toml"\n{BODY}', ["2: requirement", "not both"]),
        (f'base = "nothing.toml"\n{BODY}', ['1: base = "nothing.toml": no such file']),
        (f'base = "."\n{BODY}', ["no such file"]),
        (f"base = 3\n{BODY}", ["1: base = 3: the path of a file in quotes"]),
        (
            f'base = "radio.design.toml"\n{BODY}[bset]\nminimise = 3',
            ['4: bset: unknown table, nearest: "base", "best"'],
        ),
        ('base = "radio.design.toml"\n', ["keys to vary are wanted"]),
        ('vary = 3\nbase = "radio.design.toml"\n', ["1: vary = 3: keys to vary are wanted"]),
        (f'base = "radio.design.toml"\nsample = 3\n{BODY}', ["2: sample = 3: a table is wanted"]),
        (f'base = "radio.design.toml"\nbest = 3\n{BODY}', ["2: best = 3: a table is wanted"]),
    ],
)
def test_faults_of_the_file(folder: Path, text: str, wanted: list[str]) -> None:
    told = "\n".join(faults(folder, text))
    for part in wanted:
        assert part in told


@pytest.mark.parametrize(
    ("table", "wanted"),
    [
        ("[sample]", ["4: sample.method: missing", '"latin hypercube"', "4: sample.count: missing"]),
        ('[sample]\nmethod = "halton"\ncount = 5', ['5: sample.method = "halton": one of "sobol"']),
        ('[sample]\nmethod = "sobol"\ncount = 0', ["6: sample.count = 0: a whole number, 1 or more"]),
        ('[sample]\nmethod = "sobol"\ncount = 2000000000', ["at most 1073741824"]),
        ('[sample]\nmethod = "latin hypercube"\ncount = 20000000', ["at most 10000000"]),
        ('[sample]\nmethod = "random"\ncount = 1e300', ["sample.count", "at most 1000000000000"]),
        ('[sample]\nmethod = "sobol"\ncount = 8\nseed = -1', ["7: sample.seed = -1: a whole number from 0"]),
        (
            '[sample]\nmethod = "sobol"\ncount = 8\nseeds = 1',
            ['sample.seeds = 1: unknown key, nearest: "seed"'],
        ),
        (
            '[best]\nminimize = "ripple_v"',
            ['5: best.minimize = "ripple_v": unknown key, nearest: "minimise"'],
        ),
        ("[best]\nminimise = []", ["best.minimise = []: an empty list"]),
        ("[best]\nminimise = 3", ["best.minimise = 3: the name of a column"]),
        ('[best]\nminimise = ["a",\n"riple_v"]', ['6: best.minimise[1] = "riple_v"', 'nearest: "ripple_v"']),
        ('[best]\nminimise = "regime"', ["a column of numbers is wanted"]),
        ('[best]\nminimise = ["ripple_v", "ripple_v"]', ["[1]", "stands twice"]),
        ('[best]\nminimise = "ripple_v"\nmaximise = "ripple_v"', ["6: best.maximise", "under minimise too"]),
        (
            '[best]\nsubject_to = ["ripple_v < 1 V",\n"ripple_v < 1 A"]',
            ["6: best.subject_to[1]", "position 12"],
        ),
        ("[best]\nsubject_to = 3", ["best.subject_to = 3: a column, one of"]),
        ('[best]\nsubject_to = ["network.r1 < 3"]', ["neither a varied key nor a result", '"network.rh"']),
    ],
)
def test_faults_of_sample_and_best(folder: Path, table: str, wanted: list[str]) -> None:
    told = "\n".join(faults(folder, f'base = "radio.design.toml"\n{BODY}{table}'))
    for part in wanted:
        assert part in told


ODD = (
    "true",
    "nan",
    "inf",
    "1979-05-27",
    "-1",
    "[]",
    "{}",
    "[[]]",
    "[{}]",
    '""',
    '"\\u0000"',
    "1e400",
    "[[1], 2]",
)
SLOTS = (
    "base = {}\n[vary]\n'network.rh' = [1, 2]",
    "requirement = {}\n[vary]\n'supply.voltage' = [1, 2]",
    "vary = {}",
    "[vary]\n'network.rh' = {}",
    "[vary]\n'rectifier.part' = {}",
    "[vary]\n'thermal.on_heatsink' = [{}]",
    "[vary]\n'choke.turns' = [2, {}]",
    "[vary]\n'choke.turns' = {{ from = {}, to = 3, step = 1 }}",
    "[vary]\n'choke.turns' = {{ from = 3, to = {}, count = 2, spacing = 'log' }}",
    "[vary]\n'network.rh' = {{ from = 3, to = 7, step = {} }}",
    "[vary]\n'thermal.ambient' = {{ from = 3, to = 7, step = {} }}",
    "[vary]\n'network.rh' = {{ from = 3, to = 7, count = {} }}",
    "[vary]\n'network.rh' = {{ from = 3, to = 7, count = 3, spacing = {} }}",
    "[vary]\ntogether = {}",
    "[vary]\ntogether = [{{ 'network.rh' = {} }}]",
    "[sample]\nmethod = {}\ncount = 4",
    "[sample]\nmethod = 'sobol'\ncount = {}",
    "[sample]\nmethod = 'sobol'\ncount = 4\nseed = {}",
    "[best]\nminimise = {}",
    "[best]\nmaximise = [{}]",
    "[best]\nsubject_to = {}",
    "[best]\nsubject_to = [{}]",
)


@pytest.mark.parametrize("slot", SLOTS)
def test_whatever_stands_somewhere_is_told_with_its_line(folder: Path, slot: str) -> None:
    for odd in ODD:
        found = faults(folder, slot.format(odd))
        assert all(line.split(":")[0].isdigit() for line in found)
        assert all(len(line) < 700 and line.isprintable() for line in found)


def test_all_faults_come_at_once_in_the_order_of_the_file(folder: Path) -> None:
    text = """\
base = "nothing.toml"
[vary]
"choke.turns" = { from = 80, to = 30, step = 2, cuont = 3 }
"network.rh" = ["1 V", 3, 3, "2 A"]
"choke.stck" = [1]
[sample]
method = "sobl"
count = 0
[best]
minimise = "riple_v"
subject_to = ["choke_c", "regime == stuk"]
"""
    found = faults(folder, text)
    assert [line.split(":")[0] for line in found] == [
        "1",
        "3",
        "3",
        "4",
        "4",
        "4",
        "5",
        "7",
        "8",
        "10",
        "11",
        "11",
    ]


def test_a_file_that_is_not_there(tmp_path: Path) -> None:
    with pytest.raises(FileAccessError):
        read_study(tmp_path / "none.study.toml", TABLES)


def test_keys_that_can_be_varied_are_those_of_the_files() -> None:
    assert tuple(keyed_design()) == design_keys()
    assert keyed_design()["thermal.transistor.pad"].wanted.startswith("a thermal resistance")
    assert not any(name.startswith(("requirement", "tolerance")) for name in keyed_design())
    assert {"supply.voltage", "limits.regular", "prefer.core"} <= set(requirement_keys())


@pytest.mark.parametrize("path", sorted(EXAMPLES.glob("*.study.toml")), ids=lambda path: path.name)
def test_examples(path: Path) -> None:
    study = read_study(path, TABLES, redesign_columns=())
    assert study.notes == ()
    assert study.space.count > 1
    assert "invented" in path.read_text(encoding="utf-8")


def test_examples_are_there() -> None:
    assert len(list(EXAMPLES.glob("*.study.toml"))) >= 3
