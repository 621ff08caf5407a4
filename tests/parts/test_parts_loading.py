"""The loader: users' tables, and every way a table can be wrong."""

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.errors import FaultsError, FileAccessError, InputError, TableError
from buckdesign.parts import KINDS, Tables, load_tables, user_folder
from buckdesign.parts.fields import columns_of
from buckdesign.parts.reading import read_rows

HEADER = (
    "name,kind,reverse_voltage [V],average_current [A],forward_voltage_1 [V],forward_current_1 [A],"
    "forward_limit,leakage [uA],junction_limit_c [degC]"
)
ROW = "drawer diode,Schottky,60,5,0.6,5,typ,200,150"


@pytest.fixture
def nowhere(tmp_path: Path) -> Path:
    return tmp_path / "nowhere"


def load(path: Path, nowhere: Path, text: str) -> Tables:
    path.write_text(text, encoding="utf-8")
    return load_tables([path], folder=nowhere)


def fault(path: Path, nowhere: Path, text: str) -> TableError:
    with pytest.raises(TableError) as caught:
        load(path, nowhere, text)
    assert "\n" not in str(caught.value)
    assert str(path) in str(caught.value)
    return caught.value


def test_a_user_row_adds_a_part(tmp_path: Path, nowhere: Path) -> None:
    tables = load(tmp_path / "own.csv", nowhere, f"# my drawer\n{HEADER}\n{ROW}\n")
    part = tables.rectifier("drawer diode")
    assert part.leakage == pytest.approx(200e-6, rel=1e-15)
    assert (part.source, part.how) == ("user table own.csv", "user")
    assert part.recovery_charge is None
    assert "1N5822" in tables.rectifiers


def test_a_user_row_replaces_a_part_by_name_and_the_last_file_wins(tmp_path: Path, nowhere: Path) -> None:
    first, second = tmp_path / "a.csv", tmp_path / "b.csv"
    first.write_text(f"{HEADER}\n{ROW.replace('drawer diode', '1n5822')}\n", encoding="utf-8")
    second.write_text(
        f"{HEADER}\n{ROW.replace('drawer diode', '1N5822').replace('60', '45')}\n", encoding="utf-8"
    )
    one = load_tables([first], folder=nowhere)
    both = load_tables([first, second], folder=nowhere)
    assert one.rectifier("1N5822").reverse_voltage == 60.0
    assert both.rectifier("1N5822").reverse_voltage == 45.0
    assert len(both.rectifiers) == len(load_tables(folder=nowhere).rectifiers)


def test_the_user_folder_is_merged_before_the_files(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    monkeypatch.setenv("APPDATA", str(tmp_path))
    folder = user_folder()
    folder.mkdir(parents=True)
    (folder / "own.csv").write_text(f"{HEADER}\n{ROW}\n", encoding="utf-8")
    assert load_tables().rectifier("drawer diode").reverse_voltage == 60.0
    later = tmp_path / "later.csv"
    later.write_text(f"{HEADER}\n{ROW.replace('60', '45')}\n", encoding="utf-8")
    assert load_tables([later]).rectifier("drawer diode").reverse_voltage == 45.0


def test_a_user_a_l_goes_before_the_published_ones(tmp_path: Path, nowhere: Path) -> None:
    text = "ring,material,al [nH]\nR 26.90/14.5/11.1,Hydrogen-reduced iron 75,95\n"
    tables = load(tmp_path / "al.csv", nowhere, text)
    for grade in ("hydrogen-reduced iron 75", "hydrogen-reduced iron 75 low loss"):
        factor = tables.inductance_factor("R 26.9/14.5/11.1", grade)
        assert factor is not None
        assert factor.al == pytest.approx(95e-9, rel=1e-15)


def test_every_kind_is_recognised_by_its_header(tmp_path: Path) -> None:
    schemas = {kind: columns_of(part) for kind, part in KINDS.items()}
    for kind, schema in schemas.items():
        header = ",".join(column.header for column in schema.values())
        assert read_rows(header + "\n", "x.csv", schemas, {}) == (kind, [])
        required = ",".join(column.header for column in schema.values() if column.required)
        assert read_rows(required + "\n", "x.csv", schemas, {})[0] == kind


def test_windows_line_ends_and_a_byte_order_mark(tmp_path: Path, nowhere: Path) -> None:
    path = tmp_path / "own.csv"
    path.write_bytes(b"\xef\xbb\xbf" + f"{HEADER}\r\n{ROW}\r\n".encode())
    assert load_tables([path], folder=nowhere).rectifier("drawer diode").reverse_voltage == 60.0


def test_a_wrong_number(tmp_path: Path, nowhere: Path) -> None:
    path = tmp_path / "own.csv"
    error = fault(path, nowhere, f"# remark\n{HEADER}\n\n{ROW.replace(',60,', ',sixty,')}\n")
    assert (error.row, error.column, error.value) == (4, "reverse_voltage [V]", "sixty")
    assert error.allowed == "a number above 0 in the unit of the header"


@pytest.mark.parametrize("cell", ["0", "-5", "nan", "inf", "1e999", "1_0", "0x10", "60 V", "٦"])
def test_numbers_that_are_none(tmp_path: Path, nowhere: Path, cell: str) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER}\n{ROW.replace(',60,', f',{cell},')}\n")
    assert (error.row, error.column, error.value) == (2, "reverse_voltage [V]", cell)


def test_a_decimal_comma(tmp_path: Path, nowhere: Path) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER}\n" + ROW.replace(",0.6,", ',"0,6",') + "\n")
    assert "decimal point" in error.allowed


def test_a_word_that_is_not_allowed(tmp_path: Path, nowhere: Path) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER}\n{ROW.replace('Schottky', 'shottky')}\n")
    assert (error.column, error.value) == ("kind", "shottky")
    assert error.allowed == "one of Schottky, ultrafast, fast, standard"


def test_a_missing_column(tmp_path: Path, nowhere: Path) -> None:
    short = HEADER.replace(",junction_limit_c [degC]", "")
    error = fault(tmp_path / "own.csv", nowhere, f"{short}\n{ROW.removesuffix(',150')}\n")
    assert (error.row, error.column) == (1, "junction_limit_c [degC]")
    assert error.allowed == "missing column of a rectifier table"


def test_a_short_row_and_a_long_row(tmp_path: Path, nowhere: Path) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER}\n{ROW.removesuffix(',150')}\n")
    assert (error.row, error.column) == (2, "junction_limit_c [degC]")
    assert "8 cells where the header has 9 columns" in error.allowed
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER}\n{ROW},1\n")
    assert "10 cells" in error.allowed


def test_an_empty_cell_that_is_needed(tmp_path: Path, nowhere: Path) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER}\n{ROW.replace(',60,', ',,')}\n")
    assert (error.column, error.allowed) == ("reverse_voltage [V]", "missing cell")


def test_a_misspelt_column(tmp_path: Path, nowhere: Path) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER},leekage_hot [mA]\n{ROW},1\n")
    assert error.row == 1
    assert "nearest: leakage_hot [A]" in error.allowed


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("[uA]", "[uV]", "a current in A is wanted"),
        ("leakage [uA]", "leakage", "needs a unit, such as leakage [A]"),
        ("forward_limit", "forward_limit [V]", "a text has no unit"),
    ],
)
def test_a_wrong_unit_in_the_header(tmp_path: Path, nowhere: Path, old: str, new: str, said: str) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER.replace(old, new)}\n{ROW}\n")
    assert error.row == 1
    assert said in error.allowed


def test_a_unit_that_must_be_as_published(tmp_path: Path, nowhere: Path) -> None:
    text = "name,kind,permeability [1],loss_a [1]\nx,iron powder,75,1\n"
    assert "[Hz G^3 cm3/mW]" in fault(tmp_path / "own.csv", nowhere, text).allowed


def test_duplicates(tmp_path: Path, nowhere: Path) -> None:
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER}\n{ROW}\n{ROW.replace('drawer', 'Drawer')}\n")
    assert error.row == 3
    assert error.allowed == "stands in line 2 already"
    error = fault(tmp_path / "own.csv", nowhere, f"{HEADER},kind\n{ROW},fast\n")
    assert (error.row, error.column, error.allowed) == (1, "kind", "this column stands twice")


@pytest.mark.parametrize(
    ("text", "column", "said"),
    [
        (
            "name,outer_diameter [mm],inner_diameter [mm],height [mm]\nR 10/12/5,10,12,5\n",
            "outer_diameter",
            "must be above inner_diameter",
        ),
        (
            f"{HEADER},leakage_hot [uA],leakage_hot_c [degC]\n{ROW},100,100\n",
            "leakage_hot",
            "must be at least leakage",
        ),
        (f"{HEADER},leakage_hot [uA]\n{ROW},500\n", "leakage_hot_c", "wanted because leakage_hot is given"),
        (
            f"{HEADER},forward_voltage_2 [V],forward_current_2 [A]\n{ROW},0.7,5\n",
            "forward_current_2",
            "must be above forward_current_1",
        ),
    ],
)
def test_values_that_do_not_fit_together(
    tmp_path: Path, nowhere: Path, text: str, column: str, said: str
) -> None:
    error = fault(tmp_path / "own.csv", nowhere, text)
    assert (error.row, error.column) == (2, column)
    assert said in error.allowed


def test_all_faults_at_once(tmp_path: Path, nowhere: Path) -> None:
    rows = [ROW.replace(",60,", ",x,"), ROW.replace("Schottky", "y"), ROW.replace(",150", ",")]
    with pytest.raises(FaultsError) as caught:
        load(tmp_path / "own.csv", nowhere, "\n".join([HEADER, *rows]) + "\n")
    assert [fault.line for fault in caught.value.faults] == [2, 3, 4]
    assert caught.value.exit_status == 2


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "empty"),
        ("# only a remark\n\n", "empty"),
        ("a,b,c\n1,2,3\n", "no known column"),
        (HEADER.replace(",", ";") + "\n", "separated by commas"),
        (f'{HEADER}\n"{ROW}\n', "no CSV row"),
        (f"{HEADER}\n{ROW[:5]}\0{ROW[5:]}\n", "binary"),
    ],
)
def test_files_that_are_no_table(tmp_path: Path, nowhere: Path, text: str, said: str) -> None:
    assert said in str(fault(tmp_path / "own.csv", nowhere, text))


def test_a_binary_file(tmp_path: Path, nowhere: Path) -> None:
    path = tmp_path / "own.csv"
    path.write_bytes(bytes(range(128, 256)))
    with pytest.raises(TableError, match="no UTF-8 text"):
        load_tables([path], folder=nowhere)


def test_a_file_that_is_not_there(tmp_path: Path, nowhere: Path) -> None:
    with pytest.raises(FileAccessError, match=r"missing\.csv: No such file"):
        load_tables([tmp_path / "missing.csv"], folder=nowhere)
    with pytest.raises(FileAccessError, match=r"irectory|ermission"):
        load_tables([tmp_path], folder=nowhere)


@given(st.text(max_size=80))
def test_any_text_is_a_table_or_one_clear_error(text: str) -> None:
    schemas = {kind: columns_of(part) for kind, part in KINDS.items()}
    for start in ("", HEADER + "\n", HEADER + "\n" + ROW + "\n"):
        try:
            read_rows(start + text, "x.csv", schemas, {"source": "user", "how": "user"})
        except InputError as error:
            assert "x.csv" in str(error)
