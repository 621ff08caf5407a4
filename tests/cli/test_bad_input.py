"""Bad input reaches the user as one clear line a fault, with status 2, and nothing is half-written."""

from __future__ import annotations

import sys
import types
from collections.abc import Callable
from pathlib import Path
from typing import Annotated, Any

import pytest
import typer

from buckdesign.cli.app import COMMANDS
from buckdesign.cli.options import new_application, quantity_option

Program = Callable[..., Any]


@pytest.fixture
def reader(monkeypatch: pytest.MonkeyPatch) -> None:
    """A command that reads a requirement or a design and writes a design, as the real ones do."""
    application = new_application()

    @application.command()
    def reading(
        file: Path,
        output: Annotated[Path | None, typer.Option()] = None,
        force: bool = False,
        supply: Annotated[float, quantity_option("--supply", "V", "Supply voltage.")] = 24.0,
    ) -> None:
        """Read a file."""
        from buckdesign.cli.console import print_data
        from buckdesign.design.design_file import read_design, write_design
        from buckdesign.design.requirement import read_requirement

        if file.name.endswith(".design.toml"):
            design = read_design(file)
            if output is not None:
                write_design(design, output, force=force)
        else:
            read_requirement(file)
        print_data(f"{supply:g}")

    module = types.ModuleType("buckdesign.cli.reading")
    module.app = application  # type: ignore[attr-defined]
    monkeypatch.setitem(sys.modules, "buckdesign.cli.reading", module)
    monkeypatch.setitem(COMMANDS, "reading", "Read a file.")


GOOD = """\
[supply]
voltage = ["21 V", "24 V", "29 V"]
[output]
voltage = "12 V"
current = ["20 mA", "2.5 A"]
ripple = "120 mV"
"""


@pytest.mark.usefixtures("reader")
class TestFiles:
    """Requirement files as a command sees them."""

    @pytest.mark.parametrize(
        ("old", "new", "lines"),
        [
            ('ripple = "120 mV"\n', "", [3]),
            ("ripple", "rippel", [3, 6]),
            ('"12 V"', '"12 A"', [4]),
            ('"12 V"', "0", [4]),
            ('"12 V"', "-12", [4]),
            ('"12 V"', "inf", [4]),
            ('"12 V"', "nan", [4]),
            ('"12 V"', '"21 V"', [4]),
            ('"12 V"', '"12,5 V"', [4]),
            ('["21 V", "24 V", "29 V"]', '["29 V", "24 V", "21 V"]', [2]),
            ('"12 V"', "12 V", [4]),
            ("[output]", "[output", [3]),
            ('"120 mV"\n', '"120 mV"\n[prefer]\nrectifier = "1N5832"\n', [8]),
            ('"12 V"', '"12 kg"\nvoltag = 3\ncolour = "red"', [4, 5, 6]),
        ],
    )
    def test_each_fault_is_one_line_with_file_and_line(
        self, program: Program, tmp_path: Path, old: str, new: str, lines: list[int]
    ) -> None:
        assert old in GOOD
        path = tmp_path / "need.toml"
        path.write_text(GOOD.replace(old, new, 1))
        outcome = program("reading", path)
        assert (outcome.status, outcome.out) == (2, "")
        found = outcome.err.rstrip("\n").split("\n")
        assert [line.startswith(f"{path}:{number}: ") for line, number in zip(found, lines, strict=True)] == [
            True
        ] * len(lines)

    def test_the_good_file_is_good(self, program: Program, tmp_path: Path) -> None:
        path = tmp_path / "need.toml"
        path.write_text(GOOD)
        assert program("reading", path).status == 0

    @pytest.mark.parametrize("data", [b"\x7fELF\x00\x01", b"\xff\xfe\x00", b"a = '\xe9'"])
    def test_binary_file(self, program: Program, tmp_path: Path, data: bytes) -> None:
        path = tmp_path / "need.toml"
        path.write_bytes(data)
        outcome = program("reading", path)
        assert (outcome.status, outcome.err.count("\n")) == (2, 1)
        assert "a text file in TOML" in outcome.err

    def test_missing_file_and_folder(self, program: Program, tmp_path: Path) -> None:
        for path in (tmp_path / "none.toml", tmp_path):
            outcome = program("reading", path)
            assert (outcome.status, outcome.err.count("\n")) == (2, 1)
            assert str(path) in outcome.err


@pytest.mark.usefixtures("reader")
class TestOutput:
    """Files that a command writes."""

    DESIGN = Path(__file__).parents[2] / "examples" / "spot.design.toml"

    def test_existing_file_is_kept_unless_forced(self, program: Program, tmp_path: Path) -> None:
        path = tmp_path / "out.toml"
        path.write_text("kept")
        outcome = program("reading", self.DESIGN, "--output", path)
        assert (outcome.status, path.read_text()) == (2, "kept")
        assert "--force" in outcome.err
        assert program("reading", self.DESIGN, "--output", path, "--force").status == 0
        assert path.read_text().startswith("[supply]")

    def test_unwritable_places(self, program: Program, tmp_path: Path) -> None:
        (tmp_path / "file").write_text("")
        for path in (tmp_path / "none" / "out.toml", tmp_path, tmp_path / "file" / "out.toml"):
            outcome = program("reading", self.DESIGN, "--output", path, "--force")
            assert (outcome.status, outcome.out, outcome.err.count("\n")) == (2, "", 1)
            assert str(path) in outcome.err
        assert [file.name for file in tmp_path.iterdir()] == ["file"]


@pytest.mark.usefixtures("reader")
@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("24 A", "a current in A"),
        ("24,5", "decimal comma"),
        ("much", "a voltage in V"),
        ("inf", "a voltage in V"),
    ],
)
def test_quantity_on_the_command_line(program: Program, text: str, said: str) -> None:
    outcome = program("reading", TestOutput.DESIGN, "--supply", text)
    assert (outcome.status, outcome.err.count("\n")) == (2, 1)
    assert said in outcome.err
    assert program("reading", TestOutput.DESIGN, "--supply", "24.5 V").out == "24.5\n"
