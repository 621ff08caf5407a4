"""The error tree: exit statuses, one line a fault, pickling."""

import pickle

import pytest

from buckdesign.errors import (
    BuckdesignError,
    Fault,
    FaultsError,
    FileAccessError,
    InfeasibleError,
    InputError,
    QuantityError,
    TableError,
    UnknownNameError,
    nearest_names,
)

FAULT = Fault("a.toml", 3, "output.voltage", "4,7 V", "decimal comma")
EXAMPLES = [
    QuantityError("4,7 V", "V", "decimal comma"),
    UnknownNameError("rectifier", "1N5282", ("1N5822", "1N5821")),
    TableError("parts.csv", 7, "leakage [mA]", "x", "a number"),
    FaultsError([FAULT, Fault("a.toml", None, "", None, "empty")]),
    FileAccessError("a.toml", "No such file or directory"),
]


@pytest.mark.parametrize("error", EXAMPLES, ids=lambda error: type(error).__name__)
def test_input_errors_end_with_status_2_and_can_be_pickled(error: InputError) -> None:
    assert isinstance(error, InputError)
    assert error.exit_status == 2
    again = pickle.loads(pickle.dumps(error))
    assert type(again) is type(error)
    assert str(again) == str(error)


def test_other_exit_statuses() -> None:
    assert BuckdesignError("x").exit_status == 1
    assert InfeasibleError("x").exit_status == 3
    assert issubclass(InfeasibleError, BuckdesignError)
    assert not issubclass(InfeasibleError, InputError)


@pytest.mark.parametrize(
    ("fault", "text"),
    [
        (FAULT, 'a.toml:3: output.voltage = "4,7 V": decimal comma'),
        (Fault("a.toml", None, "supply", None, "missing table"), "a.toml: supply: missing table"),
        (Fault("a.toml", 3, "x", 5, "a text"), "a.toml:3: x = 5: a text"),
        (Fault("a.toml", 3, "", "x y", "no row"), 'a.toml:3: "x y": no row'),
        (Fault("a.toml", None, "", None, "empty"), "a.toml: empty"),
        (Fault("a.toml", 1, "x", "a\nb\x1b[31m", "a\n text"), 'a.toml:1: x = "a?b?[31m": a text'),
    ],
)
def test_a_fault_is_one_line(fault: Fault, text: str) -> None:
    assert str(fault) == text


def test_a_long_value_is_cut() -> None:
    assert len(str(Fault("a.toml", 1, "x", "y" * 1000, "short"))) < 100


def test_all_faults_one_line_each() -> None:
    assert str(EXAMPLES[3]).splitlines() == [str(FAULT), "a.toml: empty"]
    with pytest.raises(ValueError, match="at least one"):
        FaultsError([])


def test_table_error_names_file_row_column_value_and_what_is_allowed() -> None:
    assert str(EXAMPLES[2]) == 'parts.csv:7: leakage [mA] = "x": a number'


def test_nearest_names() -> None:
    known = ["1N5817", "1N5822", "1N4001", "BYV28-200"]
    assert nearest_names("1n5282", known, 1) == ("1N5822",)
    assert nearest_names("anything", []) == ()
    error = UnknownNameError.among("rectifier", "byv28", known)
    assert error.nearest[0] == "BYV28-200"
    assert str(error).startswith('"byv28": unknown rectifier, nearest: "BYV28-200"')
    assert str(UnknownNameError("ring", "x")) == '"x": no ring is known'
