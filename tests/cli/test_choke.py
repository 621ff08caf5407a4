"""``buckdesign choke`` as a user runs it."""

from __future__ import annotations

import json
import re
import shlex
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from tests.cli.conftest import Outcome

Program = Callable[..., Outcome]

RING = ("--core", "R 26.9/14.5/11.1")
PLAIN = ("--material", "hydrogen-reduced iron 75")
WIRE = ("--wire", "1.0 mm")
WORK = ("--current", "2.5 A", "--ripple", "0.6 A", "--frequency", "20 kHz")
WIND = ("choke", "wind", *RING, *PLAIN, *WIRE)
SIZE = ("--outer", "26.9 mm", "--inner", "14.5 mm", "--height", "11.1 mm")
IDENTIFY = ("choke", "identify", *SIZE)
BIAS = ("choke", "bias", *RING, *PLAIN, "--turns", "57")

KEYS = {
    "core", "material", "turns", "wire_mm", "strands", "layers", "bore_fill", "turns_first_layer",
    "wire_length_m", "mean_turn_m", "resistance_ohm", "inductance_h", "inductance_biased_h", "field_a_per_m",
    "permeability_fraction", "flux_density_t", "flux_swing_t", "core_loss_w", "copper_loss_w",
    "temperature_rise_k", "temperature_rise_low_k", "fits", "warnings",
}  # fmt: skip


def values(outcome: Outcome) -> Any:
    return json.loads(outcome.out)


class TestWind:
    def test_turns(self, program: Program) -> None:
        found = program(*WIND, "--turns", "48", *WORK, "--json")
        assert found.status == 0
        got = values(found)
        assert set(got) >= KEYS and None not in got.values()
        assert got["inductance_h"] == pytest.approx(48**2 * 90e-9)  # A_L 90 nH, looked up
        assert got["turns_first_layer"] == 39  # derived: floor(pi/asin(1.062/13.438))

    def test_inductance_at_the_bias_current(self, program: Program) -> None:
        found = program(*WIND, "--inductance", "200 uH", *WORK, "--json")
        assert values(found)["turns"] == 57 and values(found)["inductance_biased_h"] >= 200e-6

    def test_text_names_what_the_bench_needs(self, program: Program) -> None:
        found = program(*WIND, "--turns", "57", *WORK)
        assert found.status == 0
        for words in ("57 turns of 1.0 mm: fits", "2.49 m", "by two methods", "published"):
            assert words in found.out

    def test_what_is_not_given_is_null(self, program: Program) -> None:
        got = values(program(*WIND, "--turns", "48", "--json"))
        assert got["core_loss_w"] is None and got["field_a_per_m"] is None and got["fits"] is True

    def test_turns_that_do_not_fit(self, program: Program) -> None:
        found = program(*WIND, "--turns", "200", "--json")
        assert found.status == 3
        got = values(found)
        assert got["fits"] is False and got["turns"] == 200
        assert any("the bore holds 142" in text for text in got["warnings"])

    def test_too_hot_fails(self, program: Program) -> None:
        found = program(*WIND, "--turns", "57", "--current", "9 A")
        assert found.status == 3 and "the limit is 110" in found.out

    def test_ferrite_is_refused(self, program: Program) -> None:
        arguments = ("choke", "wind", *RING, "--material", "manganese-zinc ferrite 2300", *WIRE)
        found = program(*arguments, "--turns", "11", *WORK, "--json")
        assert found.status == 3
        assert any("refused" in text and "saturates at" in text for text in values(found)["warnings"])

    def test_published_example_from_the_voltage(self, program: Program) -> None:
        # Ageing note of an iron-powder distributor (looked up): 670 G and 4.9 W at 80 kHz, 45 V and 12.3 V.
        found = program(
            "choke", "wind", *RING, "--material", "hydrogen-reduced iron 75 low loss", "--wire", "AWG 14",
            "--turns", "14", "--current", "18 A", "--voltage", "45 V", "--frequency", "80 kHz",
            "--duty", "21.466 %", "--json",
        )  # fmt: skip
        got = values(found)
        assert got["flux_swing_t"] / 2.0 == pytest.approx(0.0670, rel=0.03)
        assert got["core_loss_w"] == pytest.approx(4.9, rel=0.03)
        assert got["resistance_ohm"] * 18.0**2 == pytest.approx(1.72, rel=0.05)
        assert found.status == 3  # as the note says: far too hot

    def test_files(self, program: Program, tmp_path: Path) -> None:
        sheet, text, plot = (tmp_path / name for name in ("sheet.svg", "sheet.txt", "bias.svg"))
        assert program(*WIND, "--turns", "57", *WORK, "--sheet", sheet, "--plot", plot).status == 0
        assert program(*WIND, "--turns", "57", *WORK, "--sheet", text).status == 0
        assert sheet.read_text().lstrip().startswith("<?xml") and "<svg" in plot.read_text()
        assert "WINDING SHEET" in text.read_text(encoding="utf-8")
        again = program(*WIND, "--turns", "57", "--sheet", text)
        assert again.status == 2 and "--force" in again.err and again.out == ""
        before = sheet.read_bytes()
        assert program(*WIND, "--turns", "57", *WORK, "--sheet", sheet, "--force").status == 0
        assert sheet.read_bytes() == before

    def test_what_has_no_bias_law_is_not_drawn(self, program: Program, tmp_path: Path) -> None:
        arguments = ("choke", "wind", *RING, "--material", "nickel-iron powder 60", *WIRE, "--turns", "20")
        found = program(*arguments, "--plot", tmp_path / "none.svg")
        assert found.status == 0 and "nothing to draw" in found.err
        assert list(tmp_path.iterdir()) == []

    @pytest.mark.parametrize(
        ("arguments", "words"),
        [
            (("--turns", "48", "--inductance", "200 uH"), "contradict"),
            ((), "turns or inductance"),
            (("--turns", "0"), "turns = 0"),
            (("--turns", "-4"), "turns = -4"),
            (("--turns", "4.5"), "--turns"),
            (("--inductance", "-200 uH"), "inductance"),
            (("--inductance", "200 pF"), "--inductance"),
            (("--turns", "48", "--current", "0 A"), "current = 0"),
            (("--turns", "48", "--current", "2 A", "--ripple", "1 A"), "frequency is wanted"),
            (("--turns", "48", "--strands", "0"), "strands = 0"),
            (("--turns", "48", "--stack", "-1"), "stack = -1"),
            (("--turns", "48", "--duty", "120 %", "--current", "2 A"), "duty"),
            (("--turns", "48", "--sheet", "sheet.pdf"), ".svg or .txt"),
            (("--turns", "48", "--plot", "bias.gif"), ".svg or .png"),
            (("--turns", "48", "--sheet", "no folder/sheet.svg"), "no folder"),
            (("--turns", "48", "--parts", "no file.csv"), "no such file"),
        ],
    )
    def test_bad_input(self, program: Program, arguments: tuple[str, ...], words: str) -> None:
        found = program(*WIND, *arguments)
        assert found.status == 2 and words in found.err and found.out == ""
        assert len(found.err.strip().splitlines()) == 1

    def test_wire_thicker_than_the_bore(self, program: Program) -> None:
        found = program(
            "choke", "wind", "--core", "R 3.18/1.57/1.27", "--material", "carbonyl iron 10", "--wire", "2 mm",
            "--turns", "2",
        )  # fmt: skip
        assert found.status == 2 and "thicker than the bore" in found.err

    def test_unknown_ring_names_the_nearest(self, program: Program) -> None:
        found = program("choke", "wind", "--core", "R 26.9/14.5/11.2", *PLAIN, *WIRE, "--turns", "9")
        assert found.status == 2 and "R 26.9/14.5/11.1" in found.err

    def test_ring_and_material_that_are_not_sold_together(self, program: Program) -> None:
        found = program(
            "choke", "wind", "--core", "R 12.7/7.7/4.83", "--material", "hydrogen-reduced iron 60", "--wire",
            "0.5 mm", "--turns", "20",
        )  # fmt: skip
        assert found.status == 0 and "not known to be sold" in " ".join(found.out.split())


class TestChoose:
    NEED = ("choke", "choose", "--inductance", "200 uH", *WORK, "--ambient", "40 degC")

    def test_rows_and_pareto_set(self, program: Program) -> None:
        found = program(*self.NEED, "--count", "7", "--json")
        got = values(found)
        assert found.status == 0 and set(got) == {"rows", "pareto"} and len(got["rows"]) == 7
        for row in [*got["rows"], *got["pareto"]]:
            assert set(row) >= KEYS and row["fits"] and row["inductance_biased_h"] >= 200e-6 * (1 - 1e-9)
            assert 40.0 + row["temperature_rise_k"] <= 100.0
        losses = [row["core_loss_w"] + row["copper_loss_w"] for row in got["rows"]]
        assert losses == sorted(losses)

    def test_a_chosen_choke_can_be_wound(self, program: Program) -> None:
        row = values(program(*self.NEED, "--rank", "size", "--count", "1", "--json"))["rows"][0]
        found = program(
            "choke", "wind", "--core", row["core"], "--material", row["material"],
            "--turns", str(row["turns"]), "--wire", "AWG 22", "--strands", str(row["strands"]),
            "--stack", str(row["stack"]), *WORK, "--ambient", "40 degC", "--json",
        )  # fmt: skip
        assert row["wire_mm"] == pytest.approx(0.6438)  # AWG 22, ASTM B258
        again = values(found)
        assert again == {name: pytest.approx(v) if isinstance(v, float) else v for name, v in row.items()}

    def test_table_plot_and_sheet(self, program: Program, tmp_path: Path) -> None:
        plot, sheet = tmp_path / "choice.svg", tmp_path / "best.txt"
        found = program(*self.NEED, "--rank", "size", "--plot", plot, "--sheet", sheet)
        assert found.status == 0 and "windings do it" in found.out
        assert "<svg" in plot.read_text() and "WINDING SHEET: 2 x R 15.2/8.53/5.94" in sheet.read_text()

    def test_nothing_does_it(self, program: Program, tmp_path: Path) -> None:
        hard = ("choke", "choose", "--inductance", "20 mH", "--current", "25 A", *WORK[2:])
        found = program(*hard, "--json", "--plot", tmp_path / "none.svg")
        assert found.status == 3 and values(found) == {"rows": [], "pareto": []}
        assert list(tmp_path.iterdir()) == []
        assert "core too hot" in program(*hard).out

    @pytest.mark.parametrize(
        ("arguments", "words"),
        [
            (("--rank", "beauty"), "loss, size, copper"),
            (("--count", "0"), "--count = 0"),
            (("--most-strands", "0"), "--most-strands = 0"),
            (("--core", "R 1/2/3"), "unknown ring"),
            (("--duty", "0"), "duty"),
            (("--worst-current", "1 A"), "worst current"),
        ],
    )
    def test_bad_input(self, program: Program, arguments: tuple[str, ...], words: str) -> None:
        found = program(*self.NEED, *arguments)
        assert found.status == 2 and words in found.err and found.out == ""


class TestIdentify:
    def test_iron_powder(self, program: Program) -> None:
        found = program(*IDENTIFY, "--turns", "20", "--inductance", "36 uH", "--json")
        got = values(found)
        assert found.status == 0
        assert set(got) == {
            "permeability", "permeability_low", "permeability_high", "candidates", "kind",
            "effective_length_m", "effective_area_m2", "al_h", "advice",
        }  # fmt: skip
        assert got["kind"] == "iron powder"
        assert sum(one["likelihood"] for one in got["candidates"]) == pytest.approx(1.0)

    def test_ferrite(self, program: Program) -> None:
        found = program(*IDENTIFY, "--turns", "11", "--inductance", "365 uH")
        assert found.status == 0 and "refused for a choke" in found.out and "saturates at" in found.out

    def test_reading_under_bias(self, program: Program) -> None:
        arguments = ("--turns", "52", "--inductance", "243 uH", "--bias-current", "5 A")
        found = program(*IDENTIFY, *arguments, "--biased-inductance", "138 uH", "--json")
        assert values(found)["candidates"][0]["material"] == "hydrogen-reduced iron 75 low loss"

    @pytest.mark.parametrize(
        ("arguments", "words"),
        [
            (("--turns", "0", "--inductance", "36 uH"), "turns = 0"),
            (("--turns", "20", "--inductance", "0 H"), "inductance = 0"),
            (("--turns", "20", "--inductance", "36 uH", "--bias-current", "2 A"), "wanted together"),
            (("--turns", "20", "--inductance", "36 uH", "--outer", "10 mm"), "smaller than outer"),
            (("--turns", "20", "--inductance", "36 uH", "--height", "-1 mm"), "height"),
            (("--turns", "20", "--inductance", "36 uH", "--meter-tolerance", "60 %"), "meter tolerance"),
        ],
    )
    def test_bad_input(self, program: Program, arguments: tuple[str, ...], words: str) -> None:
        found = program(*IDENTIFY, *arguments)
        assert found.status == 2 and words in found.err and found.out == ""


class TestBias:
    @pytest.fixture
    def readings(self, tmp_path: Path) -> Path:
        path = tmp_path / "readings.csv"
        path.write_text("current_a,inductance_uh\n0,300\n2,262\n4,205\n6,160\n", encoding="utf-8")  # invented
        return path

    def test_table_and_json(self, program: Program) -> None:
        found = program(*BIAS, "--json")
        got = values(found)
        assert found.status == 0 and got["fit"] is None and got["stored_file"] is None
        first, last = got["rows"][0], got["rows"][-1]
        assert first["inductance_h"] == pytest.approx(57**2 * 90e-9)
        assert last["inductance_low_h"] < last["inductance_h"] < last["inductance_high_h"]
        assert "uncertainty of the bias law" in program(*BIAS).out

    def test_own_readings_are_stored_and_known(
        self, program: Program, readings: Path, tmp_path: Path
    ) -> None:
        found = program(*BIAS, "--points", readings, "--json")
        got = values(found)
        assert found.status == 0 and "stored in" in found.err
        name = got["stored_material"]
        assert Path(got["stored_file"]).is_file() and got["fit"]["points"] == 4
        shown = program("choke", "wind", *RING, "--material", name, *WIRE, "--turns", "57", *WORK, "--json")
        assert shown.status == 0
        assert values(shown)["inductance_h"] == pytest.approx(got["inductance_h"], rel=1e-6)
        assert not any("sold" in text for text in values(shown)["warnings"])
        assert program(*BIAS, "--points", readings).status == 0

    def test_another_result_needs_force(self, program: Program, readings: Path, tmp_path: Path) -> None:
        table = tmp_path / "own.csv"
        assert program(*BIAS, "--points", readings, "--output", table).status == 0
        before = table.read_text()
        readings.write_text("current_a,inductance_uh\n0,290\n2,240\n4,190\n", encoding="utf-8")
        refused = program(*BIAS, "--points", readings, "--output", table)
        assert refused.status == 2 and "--force" in refused.err and table.read_text() == before
        assert program(*BIAS, "--points", readings, "--output", table, "--force").status == 0
        assert table.read_text() != before
        assert program("parts", "check", table).status == 0

    def test_plot(self, program: Program, readings: Path, tmp_path: Path) -> None:
        plot = tmp_path / "bias.png"
        assert program(*BIAS, "--points", readings, "--plot", plot).status == 0
        assert plot.read_bytes().startswith(b"\x89PNG")

    @pytest.mark.parametrize(
        ("arguments", "words"),
        [
            (("--current", "-1 A"), "current = -1"),
            (("--stack", "0"), "stack = 0"),
            (("--output", "own.csv"), "--points"),
            (("--points", "none.csv"), "none.csv"),
            (("--material", "manganese-zinc ferrite 2300"), "saturates"),
        ],
    )
    def test_bad_input(self, program: Program, arguments: tuple[str, ...], words: str) -> None:
        found = program(*BIAS, *arguments)
        assert found.status == 2 and words in found.err and found.out == ""

    def test_faults_of_the_readings_name_file_and_line(self, program: Program, tmp_path: Path) -> None:
        path = tmp_path / "readings.csv"
        path.write_text("current_a,inductance_uh\n0,300\n2,much\n", encoding="utf-8")
        found = program(*BIAS, "--points", path)
        assert found.status == 2 and f'{path}:3: inductance = "much"' in found.err


@pytest.mark.parametrize("command", ["wind", "choose", "identify", "bias"])
def test_the_example_of_the_help_runs(
    program: Program, command: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    text = " ".join(program("choke", command, "--help").out.split())
    found = re.search(r"Example: buckdesign (choke .*)$", text)
    assert found is not None
    assert program(*shlex.split(found.group(1))).status == 0


@pytest.mark.parametrize("arguments", [["choke", "--help"], ["choke", "wind", "-h"], ["choke", "bias", "-h"]])
def test_help_loads_nothing_heavy(arguments: list[str]) -> None:
    heavy = ("numpy", "scipy", "pandas", "matplotlib", "numba", "pydantic", "rich")
    code = (
        f"import sys; sys.argv = ['buckdesign', *{arguments!r}]\n"
        "from buckdesign.__main__ import main\n"
        "try:\n    main()\nexcept SystemExit:\n    pass\n"
        f"print('loaded:', *(name for name in {heavy!r} if name in sys.modules))"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, timeout=60, check=True
    )
    assert done.stdout.rstrip().splitlines()[-1] == "loaded:"


def test_ascii_terminals_get_no_other_signs(process: Callable[..., subprocess.CompletedProcess[str]]) -> None:
    done = process(*WIND, "--turns", "57", *WORK, PYTHONIOENCODING="ascii")
    assert done.returncode == 0 and done.stdout.isascii() and "uH +- 10 %" in done.stdout
