"""``buckdesign design``."""

from __future__ import annotations

import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from buckdesign.design.design_file import read_design
from buckdesign.design.requirement import read_requirement

Program = Callable[..., Any]

NEED = """\
# Data logger of a narrowboat (invented)
[supply]
voltage = ["21 V", "24 V", "29 V"]
[output]
voltage = "5 V"
current = ["30 mA", "0.8 A"]
ripple = "100 mV"
"""

HOPELESS = """\
[supply]
voltage = "24 V"
[output]
voltage = "1 V"
current = "2 A"
ripple = "100 mV"
"""


@pytest.fixture
def need(tmp_path: Path) -> Path:
    path = tmp_path / "logger.toml"
    path.write_text(NEED)
    return path


def test_writes_the_design_beside_the_requirement_and_says_what_to_do(program: Program, need: Path) -> None:
    outcome = program("design", need)
    assert outcome.status == 0
    target = need.with_name("logger.design.toml")
    assert f"written: {target}" in outcome.out
    design = read_design(target)
    assert design.requirement == read_requirement(need)
    for word in (
        "Parts",
        "Choke",
        "Behaviour",
        "Losses",
        "Hottest",
        "Heat sinks",
        "Checks",
        "First power-up",
        "Mind",
        "Assumed",
    ):
        assert f"\n{word}" in outcome.out
    assert f"{design.choke.turns} turns" in outcome.out
    assert "short-circuit protection" in outcome.out
    assert "searching" in outcome.err
    assert program("simulate", target).status == 0


def test_existing_design_is_kept_and_nothing_is_searched(program: Program, need: Path) -> None:
    target = need.with_name("logger.design.toml")
    target.write_text("mine")
    outcome = program("design", need)
    assert outcome.status == 2
    assert outcome.err.strip() == f"{target}: exists already; --force replaces it"
    assert outcome.out == ""
    assert target.read_text() == "mine"


def test_json_has_the_keys_that_scripts_rely_on(program: Program, need: Path, tmp_path: Path) -> None:
    target = tmp_path / "own name.toml"
    target.write_text("mine")
    outcome = program("design", need, "--json", "--output", target, "--force")
    found = json.loads(outcome.out)
    assert outcome.status == 0
    assert found["feasible"] is True
    assert found["design_file"] == str(target)
    assert read_design(target).output.voltage == 5.0
    assert not need.with_name("logger.design.toml").exists()
    assert found["blocking"] == []
    assert {"rh_ohm", "turns", "core", "transistor", "rdrive_power_w"} <= found["values"].keys()
    for corner in found["corners"]:
        assert {"supply_v", "load_a", "ambient_c", "frequency_hz", "ripple_v", "losses_w"} <= corner.keys()
    for check in found["checks"]:
        assert {"name", "value", "limit", "margin", "holds", "where", "note"} <= check.keys()
    assert isinstance(found["alternatives"], list)
    for device in ("transistor", "regulator", "rectifier"):
        assert {"heat_w", "needed_k_per_w", "without_sink_c", "needs_sink", "plate"} <= found["heat_sinks"][
            device
        ].keys()
    assert any("fuse" in text for text in found["warnings"])


def test_an_ambient_that_no_part_stands_is_status_2(program: Program, need: Path) -> None:
    need.write_text(NEED + '[limits]\nambient = "140 degC"\n')
    outcome = program("design", need)
    assert (outcome.status, outcome.out) == (2, "")
    assert outcome.err.count("\n") == 1 and "limits.ambient" in outcome.err and "125 degC" in outcome.err
    assert [one.name for one in need.parent.iterdir()] == ["logger.toml"]


def test_infeasible_requirement_says_what_blocks_it(program: Program, tmp_path: Path) -> None:
    path = tmp_path / "hopeless.toml"
    path.write_text(HOPELESS)
    outcome = program("design", path)
    assert outcome.status == 3
    assert "Infeasible" in outcome.out
    assert "output.voltage = 1 V" in outcome.out
    assert "No design file was written." in outcome.out
    assert sorted(one.name for one in tmp_path.iterdir()) == ["hopeless.toml"]


def test_infeasible_requirement_as_json(program: Program, tmp_path: Path) -> None:
    path = tmp_path / "hopeless.toml"
    path.write_text(HOPELESS)
    outcome = program("design", path, "--json")
    found = json.loads(outcome.out)
    assert outcome.status == 3
    assert found["feasible"] is False
    assert found["design_file"] is None
    assert {"key", "required", "reachable", "relax_to"} <= found["blocking"][0].keys()


@pytest.mark.parametrize(
    ("text", "fault"),
    [
        (NEED.replace('"5 V"', '"22 V"'), "output.voltage"),
        (NEED.replace("ripple", "ripples"), "ripples"),
        (NEED + '[prefer]\nrectifier = "1N9999"\n', "1N9999"),
        (NEED.replace('"100 mV"', '"-1 V"'), "output.ripple"),
    ],
)
def test_faulty_requirement_is_refused_in_lines(
    program: Program, tmp_path: Path, text: str, fault: str
) -> None:
    path = tmp_path / "faulty.toml"
    path.write_text(text)
    outcome = program("design", path)
    assert outcome.status == 2
    assert fault in outcome.err
    assert "Traceback" not in outcome.err
    assert [one.name for one in tmp_path.iterdir()] == ["faulty.toml"]


def test_unwritable_target_is_refused_at_once(program: Program, need: Path, tmp_path: Path) -> None:
    outcome = program("design", need, "--output", tmp_path / "nowhere" / "x.toml")
    assert outcome.status == 2
    assert "no folder" in outcome.err
