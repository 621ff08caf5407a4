"""Reading TOML with the line of every key."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.design.toml_source import LARGEST_FILE, parse_toml, read_toml
from buckdesign.design.toml_text import InlineTable, toml_text
from buckdesign.errors import FaultsError, FileAccessError

TEXT = '''\
# a comment with key = 1
title = "a = [1] # no comment"  # a comment
"quoted.key" = 1
a.b . "c d" = 0x1F

[supply]
voltage = ["21 V", # first
  "24 V",

  "29 V" ]
long = """several
lines "quoted" \\
[not.a.table]"""
literal = \'\'\'
also = "not a key"
\'\'\'
inline = { x = 1, y.z = [ { p = 1 }, { p = 2 } ] }
when = 1979-05-27T07:32:00Z
[requirement.supply]
voltage = 1
[[rows]]
n = 1
[rows.sub]
m = 2
[[rows]]
n = 3
[tolerance]
"choke.permeability" = "10 %"
'''


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("title",), 2),
        (("quoted.key",), 3),
        (("a", "b", "c d"), 4),
        (("supply",), 6),
        (("supply", "voltage"), 7),
        (("supply", "voltage", 0), 7),
        (("supply", "voltage", 1), 8),
        (("supply", "voltage", 2), 10),
        (("supply", "long"), 11),
        (("supply", "literal"), 14),
        (("supply", "inline", "y", "z", 1, "p"), 17),
        (("supply", "when"), 18),
        (("requirement", "supply", "voltage"), 20),
        (("rows", 0, "n"), 22),
        (("rows", 0, "sub", "m"), 24),
        (("rows", 1, "n"), 26),
        (("tolerance", "choke.permeability"), 28),
        (("supply", "no such key"), 6),
        (("no such table", "key"), 1),
    ],
)
def test_every_key_knows_its_line(path: tuple[str | int, ...], line: int) -> None:
    assert parse_toml(TEXT, Path("file.toml")).locate(*path) == line


def test_lines_are_those_of_a_file_with_crlf_and_byte_order_mark(tmp_path: Path) -> None:
    file = tmp_path / "dos.toml"
    file.write_bytes(b"\xef\xbb\xbf" + TEXT.replace("\n", "\r\n").encode())
    source = read_toml(file)
    assert source.tree["supply"]["voltage"] == ["21 V", "24 V", "29 V"]
    assert source.locate("tolerance", "choke.permeability") == 28


@pytest.mark.parametrize(
    ("text", "line"),
    [
        ("a = 1\nb = nope\n", 2),
        ("a = 1\na = 2\n", 2),
        ('[x]\ny = "open\n', 2),
        ("[x]\n[x]\n", 2),
        ("a = 4 V\n", 1),
        ("a = 1\nb = [1,\n", 2),
        ("a = 1\n\n\nb\n", 4),
    ],
)
def test_broken_toml_is_one_fault_with_its_line(text: str, line: int) -> None:
    with pytest.raises(FaultsError) as caught:
        parse_toml(text, Path("broken.toml"))
    (fault,) = caught.value.faults
    assert (fault.line, str(fault).startswith(f"broken.toml:{line}: ")) == (line, True)
    assert "not valid TOML" in fault.allowed
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("text", ["a = " + "[" * 5000, "a = " + "9" * 5000])
def test_monstrous_values_are_faults(text: str) -> None:
    with pytest.raises(FaultsError):
        parse_toml(text, Path("x.toml"))


def test_missing_file_folder_and_unreadable_path(tmp_path: Path) -> None:
    for path in (tmp_path / "none.toml", tmp_path, Path("a\0b")):
        with pytest.raises(FileAccessError) as caught:
            read_toml(path)
        assert caught.value.exit_status == 2


@pytest.mark.parametrize(
    ("data", "said"),
    [
        (b"a = 1\n\x00\x01\x02", ":2: a text file in TOML; this one is binary"),
        (b"a = 1\nb = 2\nc = '\xff'\n", ":3: a text file in TOML, encoded as UTF-8"),
        (b"#" * (LARGEST_FILE + 1), ":1: a text file of at most"),
    ],
)
def test_files_that_are_no_text(tmp_path: Path, data: bytes, said: str) -> None:
    file = tmp_path / "blob"
    file.write_bytes(data)
    with pytest.raises(FaultsError, match="blob") as caught:
        read_toml(file)
    assert said in str(caught.value)


_NAMES = st.text(max_size=8)
_SCALARS = (
    st.booleans()
    | st.integers(min_value=-(2**63), max_value=2**63 - 1)
    | st.floats(allow_nan=False)
    | st.text(max_size=20)
    | st.dates()
)
_VALUES = st.recursive(
    _SCALARS,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(_NAMES, inner, max_size=3).map(InlineTable),
    max_leaves=6,
)
_TABLES = st.recursive(
    st.dictionaries(_NAMES, _VALUES, max_size=3),
    lambda inner: st.dictionaries(_NAMES, inner | _VALUES, max_size=3),
    max_leaves=8,
)


@given(_TABLES)
def test_any_tree_survives_writing_and_every_key_has_the_line_it_stands_on(tree: dict[str, object]) -> None:
    text = toml_text(tree)
    assert tomllib.loads(text) == tree
    source = parse_toml(text, Path("tree.toml"))
    lines = text.split("\n")
    for path, line in source.lines.items():
        if isinstance(path[-1], str):
            escaped = toml_text({path[-1]: 0}).removesuffix(" = 0\n")
            assert escaped in lines[line - 1]
