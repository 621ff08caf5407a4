"""The README and DEVELOPERS.md are true: commands, options, files, and the output that is shown."""

from __future__ import annotations

import re
import shutil
import sys
from collections.abc import Iterator
from contextlib import redirect_stderr, redirect_stdout
from io import StringIO
from pathlib import Path

import pytest

from buckdesign.cli.app import COMMANDS, run
from buckdesign.design.design_file import read_design
from buckdesign.design.requirement import read_requirement
from buckdesign.parts import load_tables
from buckdesign.studies.study_file import read_study
from tests import readme

ROOT = readme.ROOT
README = readme.text()
DEVELOPERS = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
EXAMPLES = list(readme.examples())

MENTION = re.compile(r"\bbuckdesign ((?:[a-z]+ ?){1,2})")
OPTION = re.compile(r"(?<![\w-])(--[a-z][a-z-]+)")
NOT_OURS = frozenset({"--editable", "--group", "--quiet", "--upgrade", "--nthreads"})
"""Options of pip in the two command lines, and of a cluster's worker."""


def helped(*words: str) -> str:
    """What ``--help`` of a command prints."""
    out = StringIO()
    with redirect_stdout(out), redirect_stderr(StringIO()):
        assert run([*words, "--help"]) == 0
    return out.getvalue()


def listed(page: str) -> list[str]:
    """The commands that a help page lists."""
    if "\nCommands:\n" not in page:
        return []
    rows = page.split("\nCommands:\n")[1].split("\n")
    return [row.split()[0] for row in rows if row.startswith("  ") and row[2] != " "]


def leaves() -> Iterator[tuple[str, ...]]:
    """Every command that does something."""
    for name in listed(helped()):
        inner = listed(helped(name))
        yield from ((name, one) for one in inner) if inner else [(name,)]


LEAVES = list(leaves())


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder as the README's reader has it, after the main job."""
    return readme.workplace(tmp_path_factory.mktemp("readme"))


@pytest.fixture(scope="module")
def page(place: Path) -> str:
    """What the main job prints."""
    return readme.run(readme.design_command(), place)


def test_the_job_stands_at_the_very_top() -> None:
    title, paragraph = README.split("\n\n")[:2]
    assert title == "# buckdesign"
    for word in ("regulator", "PNP transistor", "choke", "requirement", "frequency", "efficiency"):
        assert word in paragraph
    assert "\n" not in paragraph


def test_both_command_lines_are_there() -> None:
    assert readme.main_job().startswith("python3 -m venv .venv && ")
    assert readme.design_command().startswith("buckdesign design examples/")
    assert "--group test" in readme.tests() and readme.tests().endswith("-m pytest")


def test_every_command_is_in_the_readme_and_in_its_table() -> None:
    assert {leaf[0] for leaf in LEAVES} == set(COMMANDS)
    table = README.split("\n## Commands\n")[1].split("\n### ")[0]
    for leaf in LEAVES:
        assert f"`buckdesign {' '.join(leaf)}" in table, leaf


def test_every_command_of_the_readme_exists() -> None:
    code = re.findall(r"`([^`\n]+)`", re.sub(r"```.*?```", "", README, flags=re.DOTALL))
    shown = [text for text in code if text.startswith("buckdesign ")] + [one.command for one in EXAMPLES]
    names = {tuple(match.split()) for text in shown for match in MENTION.findall(text)}
    assert len(names) >= len(LEAVES)
    for words in names:
        assert words in LEAVES or words[:1] in LEAVES or words == ("parts", "list"), words


def test_every_option_of_the_readme_exists() -> None:
    pages = "".join([helped(), *(helped(*leaf) for leaf in LEAVES)])
    known = set(OPTION.findall(pages))
    for option in set(OPTION.findall(README)) - NOT_OURS:
        assert option in known, option


@pytest.mark.parametrize("leaf", LEAVES, ids=" ".join)
def test_every_option_of_a_command_is_in_the_readme(leaf: tuple[str, ...]) -> None:
    options = set(OPTION.findall(helped(*leaf).split("Options:")[1].split("Example:")[0]))
    assert options - {"--help"} <= set(OPTION.findall(README)) | {"--json", "--parts"}


def test_every_example_file_is_in_the_readme_and_exists() -> None:
    named = set(re.findall(r"`(?:examples/)?([\w.]+\.toml)`", README)) - {"instrument_rail.design.toml"}
    assert named == {path.name for path in (ROOT / "examples").glob("*.toml")}


def test_the_files_shown_are_read_without_fault(tmp_path: Path) -> None:
    for mark in ("requirement file", "design file", "study file", "parts table"):
        (tmp_path / mark).write_text(readme.block(mark), encoding="utf-8")
    tables = load_tables((tmp_path / "parts table",))
    assert "R 25/15/10" in tables.rings
    assert read_requirement(tmp_path / "requirement file", tables).limits.efficiency == 0.80
    assert read_design(tmp_path / "design file", tables).choke.turns == 75
    shutil.copy(ROOT / "examples" / "radio_as_built.design.toml", tmp_path)
    with (tmp_path / "design file").open("a", encoding="utf-8") as file:
        file.write(readme.block("tolerance table"))
    assert len(read_design(tmp_path / "design file", tables).tolerance) == 4
    assert read_study(tmp_path / "study file", tables).space.count == 26 * 3 * 10 * 2 * 2


REPRODUCIBLE = [one for one in EXAMPLES if one.is_reproducible]
SEARCHED = [one for one in EXAMPLES if not one.is_reproducible]


@pytest.mark.parametrize("example", REPRODUCIBLE, ids=lambda one: " ".join(one.command.split()[1:3]))
def test_output_shown_is_what_the_command_prints(example: readme.Example, place: Path) -> None:
    assert readme.run(example.command, place).rstrip() == example.output.rstrip()


def form(text: str) -> list[str]:
    """The lines of a page without numbers, order and what depends on them: headings, and the first words."""
    return sorted({line.split("  ")[0].rstrip() for line in text.splitlines() if re.match(r"[A-Z]\w+", line)})


@pytest.mark.parametrize("example", SEARCHED, ids=lambda one: " ".join(one.command.split()[1:3]))
def test_output_of_simulations_has_the_form_shown(example: readme.Example, place: Path, page: str) -> None:
    found = readme.run(example.command, place)
    assert form(_without_numbers(found)) == form(_without_numbers(example.output))
    assert bool(found.strip()) == bool(example.output.strip())


def _without_numbers(text: str) -> str:
    return re.sub(r"[-+]?\d[\d.]*", "0", text)


def test_the_page_of_the_main_job_has_the_form_shown(place: Path, page: str) -> None:
    shown = list(readme.excerpts())
    assert len(shown) == 2
    for mark, text in shown:
        part = readme.excerpt(page, mark)
        assert form(_without_numbers(part)) == form(_without_numbers(text))
    assert "every requirement and every rating holds" in page.splitlines()[0]
    assert read_design(place / "instrument_rail.design.toml").output.voltage == 12.0


def test_the_python_shown_runs(place: Path) -> None:
    printed, shown = readme.run_python(readme.python_example(), place), readme.block("python output")
    assert printed.startswith("True R ")
    assert len(printed.splitlines()) == len(shown.splitlines()) == 6


def test_the_readme_is_read_without_anything_installed() -> None:
    imported = re.findall(r"^(?:from|import) ([\w.]+)", Path(readme.__file__).read_text(), re.MULTILINE)
    assert imported
    assert {name.split(".")[0] for name in imported} <= set(sys.stdlib_module_names)


def test_developers_names_every_package_and_script() -> None:
    folders = [path.name for path in (ROOT / "buckdesign").iterdir() if list(path.glob("*.py"))]
    assert len(folders) >= 7
    for name in [*folders, "cores_data", "examples", "tests"]:
        assert re.search(rf"\b{name}/", DEVELOPERS), name
    for path in sorted((ROOT / "tests" / "benchmarks").glob("*.py")):
        assert f"tests/benchmarks/{path.name}" in DEVELOPERS


def test_files_that_developers_names_exist() -> None:
    for name in re.findall(r"`([\w/]+/[\w.]+\.(?:py|csv|md|toml))`", DEVELOPERS):
        assert any((base / name).is_file() for base in (ROOT, ROOT / "buckdesign")), name
