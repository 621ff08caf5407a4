"""The built-in tables of parts: against their publications and against each other."""

import math
import subprocess
import sys
from dataclasses import FrozenInstanceError, fields
from itertools import pairwise
from pathlib import Path

import pytest

from buckdesign.constants import COPPER_RESISTIVITY
from buckdesign.errors import UnknownNameError
from buckdesign.parts import KINDS, Tables, load_tables
from buckdesign.parts.fields import columns_of


@pytest.fixture(scope="module")
def tables(tmp_path_factory: pytest.TempPathFactory) -> Tables:
    return load_tables(folder=tmp_path_factory.mktemp("nothing"))


def test_regulator_classes(tables: Tables) -> None:
    """Source: the classes' data sheets, as the rows name them (looked up)."""
    small = tables.regulator("adjustable 1.5 A")
    assert (small.reference_min, small.reference, small.reference_max) == (1.20, 1.25, 1.30)
    assert (small.adjust_current, small.adjust_current_max) == (50e-6, 100e-6)
    assert (small.quiescent_current, small.quiescent_current_max) == (3.5e-3, 10e-3)
    assert (small.current_limit, small.current_limit_min, small.current_limit_knee) == (2.2, 1.5, 15.0)
    assert (small.current_limit_far, small.current_limit_far_min) == (0.4, 0.15)
    assert (small.current_limit_far_voltage, small.max_difference) == (40.0, 40.0)
    assert (small.output_inductance, small.output_resistance) == (8e-8, 2e-3)
    assert (small.dropout, small.dropout_resistance) == (1.6, 0.4)
    middle, large = tables.regulator("adjustable 3 A"), tables.regulator("adjustable 5 A")
    assert (middle.current_limit, middle.current_limit_min, middle.max_difference) == (4.5, 3.0, 35.0)
    assert (large.reference_min, large.reference, large.reference_max) == (1.19, 1.24, 1.29)
    assert (large.current_limit, large.current_limit_min, large.junction_case) == (8.0, 5.0, 1.0)
    assert large.dropout + 5.0 * large.dropout_resistance == pytest.approx(2.7)


def test_transistor_limits(tables: Tables) -> None:
    """Source: 2N5883/D rev. 11, 2N5684/D, MIL-PRF-19500/379 (looked up)."""
    part = tables.transistor("2N5884")
    assert (part.collector_voltage, part.collector_current, part.junction_case) == (80.0, 25.0, 0.875)
    assert (10.0, 20.0) in part.gain_points
    assert part.transition_frequency_min == 4e6
    assert part.storage_time == 1e-6
    assert tables.transistor("2N3792").gain_points == ((1.0, 50.0), (3.0, 30.0), (5.0, 10.0), (10.0, 5.0))
    assert tables.transistor("2N5684").saturation_voltage_max == 1.0


def test_safe_area_of_transistors(tables: Tables) -> None:
    """Source: 1 s tests of MIL-PRF-19500/379 (40 V 3.75 A; 55 V or 65 V 0.9 A) and /466 (30 V 10 A), from memory."""
    small, large = tables.transistor("2N3792"), tables.transistor("2N5684")
    assert (small.breakdown_voltage, small.breakdown_current) == (40.0, 3.75)
    assert (small.breakdown_far_voltage, small.breakdown_far_current) == (65.0, 0.9)
    assert (large.breakdown_voltage, large.breakdown_current) == (30.0, 10.0)
    for part in tables.transistors.values():
        assert (part.breakdown_voltage is None) == (part.safe_area_how == ""), part.name
        if part.breakdown_voltage is not None and part.breakdown_current is not None:
            # no point may lie above the power that the thermal resistance allows at 25 degC (derived)
            power = (part.junction_limit_c - 25.0) / part.junction_case
            assert part.breakdown_voltage * part.breakdown_current <= 1.01 * power, part.name
            assert part.safe_area_how.startswith("from memory (unsure, within a factor of"), part.name


def test_gain_falls_with_current(tables: Tables) -> None:
    for part in tables.transistors.values():
        gains = [gain for _, gain in part.gain_points]
        assert gains == sorted(gains, reverse=True), part.name
        assert part.gain_points[-1][0] <= part.collector_current, part.name


def test_rectifier_limits(tables: Tables) -> None:
    """Source: Diodes Inc. DS23003, Vishay 88508 (looked up); recovery charge derived from its limits."""
    schottky = tables.rectifier("1N5822")
    assert (schottky.forward_voltage_1, schottky.forward_current_1) == (0.525, 3.0)
    assert (schottky.forward_voltage_2, schottky.forward_current_2) == (0.95, 9.4)
    assert (schottky.leakage, schottky.leakage_hot, schottky.leakage_hot_c) == (2e-3, 20e-3, 100.0)
    assert schottky.recovery_charge == 0.0
    for name in ("1N4933", "1N4934", "1N4935", "1N4936", "1N4937"):
        assert tables.rectifier(name).recovery_charge == pytest.approx(0.5 * 2.0 * 200e-9)


def test_recovery_charge_follows_the_triangle_law_where_it_says_so(tables: Tables) -> None:
    """Q = t_rr^2 (di/dt)/(2 (1 + S)) with 50 A/us and S = 0.5 (derived)."""
    derived = [part for part in tables.rectifiers.values() if "50 A/us" in part.recovery_how]
    assert len(derived) > 5
    for part in derived:
        assert part.recovery_time is not None
        assert part.recovery_charge == pytest.approx(part.recovery_time**2 * 50e6 / 3.0, rel=0.01)


def test_every_kind_of_rectifier_is_there_and_can_be_judged(tables: Tables) -> None:
    assert {part.kind for part in tables.rectifiers.values()} == {"Schottky", "ultrafast", "fast", "standard"}
    for part in tables.rectifiers.values():
        assert part.recovery_charge is not None, part.name
        assert (part.recovery_charge == 0.0) == (part.kind == "Schottky"), part.name
        assert part.leakage_hot is not None, part.name
        assert part.forward_voltage_1 < 1.5, part.name
        if "class" in part.name:
            assert part.how.startswith("from memory"), part.name
    rated = [part for part in tables.rectifiers.values() if part.average_current >= 5.0]
    assert {part.kind for part in rated} >= {"Schottky", "ultrafast", "standard"}


def test_capacitors_make_sense(tables: Tables) -> None:
    """ESR at 100 kHz below that of the loss tangent at 120 Hz, tan delta/(2 pi f C) (derived)."""
    for part in tables.capacitors.values():
        assert part.loss_tangent is not None
        assert part.ripple_current is not None
        low_frequency = part.loss_tangent / (2.0 * math.pi * 120.0 * part.capacitance)
        assert part.esr < low_frequency, part.name
        assert 0.02 < part.ripple_current**2 * part.esr < 0.7, part.name
        assert part.name == f"{part.kind} {part.capacitance * 1e6:g} uF {part.rated_voltage:g} V"
    voltages = {part.rated_voltage for part in tables.capacitors.values()}
    assert {16.0, 25.0, 35.0, 50.0, 63.0} <= voltages


def test_a_larger_capacitor_of_a_kind_is_no_worse(tables: Tables) -> None:
    """Within 5 %: a long slim can is as good as the next short one."""
    kinds: dict[tuple[str, float], list[tuple[float, float, float]]] = {}
    for part in tables.capacitors.values():
        assert part.ripple_current is not None
        row = (part.capacitance, part.esr, part.ripple_current)
        kinds.setdefault((part.kind, part.rated_voltage), []).append(row)
    for key, rows in kinds.items():
        if key[0] != "tantalum":
            rows.sort()
            for (_, esr, ripple), (_, next_esr, next_ripple) in pairwise(rows):
                assert next_esr < 1.05 * esr, key
                assert next_ripple > 0.95 * ripple, key


METRIC = [
    (0.500, 0.544, 0.566),
    (0.630, 0.679, 0.704),
    (0.800, 0.855, 0.884),
    (1.000, 1.062, 1.094),
    (1.250, 1.316, 1.349),
    (1.600, 1.670, 1.706),
    (2.000, 2.074, 2.112),
]
"""IEC 60317-0-1: diameter and largest overall diameters of grades 1 and 2, mm (from memory)."""


@pytest.mark.parametrize(("bare", "grade1", "grade2"), METRIC)
def test_metric_wire(tables: Tables, bare: float, grade1: float, grade2: float) -> None:
    wire = tables.wire(f"{bare} mm")
    assert wire.conductor_diameter == pytest.approx(bare * 1e-3, rel=1e-12)
    assert wire.outer_diameter_grade1 == pytest.approx(grade1 * 1e-3, abs=2e-6)
    assert wire.outer_diameter_grade2 == pytest.approx(grade2 * 1e-3, abs=2e-6)


def test_wire_resistance(tables: Tables) -> None:
    """IEC 60028: 1/58 ohm mm2/m; looked-up values 34.30 and 21.95 mohm/m for 0.8 and 1.0 mm."""
    assert tables.wire("0.8 mm").resistance == pytest.approx(34.30e-3, abs=5e-6)
    assert tables.wire("1.0 mm").resistance == pytest.approx(21.95e-3, abs=5e-6)
    for wire in tables.wires.values():
        area = math.pi / 4.0 * wire.conductor_diameter**2
        rounded = 2.0 * 6e-8 / wire.conductor_diameter
        assert wire.resistance == pytest.approx(COPPER_RESISTIVITY / area, rel=3e-5 + rounded), wire.name


def test_gauge_wire(tables: Tables) -> None:
    """ASTM B258: d = 0.127 mm x 92^((36 - n)/39), printed to four places."""
    gauges = [wire for wire in tables.wires.values() if wire.series == "AWG"]
    assert len(gauges) == 29
    for wire in gauges:
        number = int(wire.name.removeprefix("AWG "))
        exact = 0.127e-3 * 92.0 ** ((36 - number) / 39)
        assert wire.conductor_diameter == pytest.approx(exact, abs=6e-8), wire.name


def test_enamel_grows_with_the_wire(tables: Tables) -> None:
    for series in ("metric", "AWG"):
        wires = sorted(
            (wire for wire in tables.wires.values() if wire.series == series),
            key=lambda wire: wire.conductor_diameter,
        )
        for attribute in ("outer_diameter_grade1", "outer_diameter_grade2"):
            builds = [getattr(wire, attribute) - wire.conductor_diameter for wire in wires]
            assert builds == sorted(builds), (series, attribute)


@pytest.mark.parametrize(
    ("asked", "found"),
    [
        ("1 mm", "1.0 mm"),
        ("1.00mm", "1.0 mm"),
        ("0.50 mm", "0.5 mm"),
        ("awg18", "AWG 18"),
        ("18 AWG", "AWG 18"),
        ("AWG 18", "AWG 18"),
    ],
)
def test_wire_by_any_spelling(tables: Tables, asked: str, found: str) -> None:
    assert tables.wire(asked).name == found


def test_other_names_by_any_spelling(tables: Tables) -> None:
    assert tables.ring("26.9 / 14.5 / 11.1").name == "R 26.9/14.5/11.1"
    assert tables.ring("r26.90x14.50x11.10 mm").name == "R 26.9/14.5/11.1"
    assert tables.material("Hydrogen-reduced  iron 75").name == "hydrogen-reduced iron 75"
    assert tables.rectifier("1n5822").name == "1N5822"
    assert tables.regulator("adjustable 1.50 A").name == "adjustable 1.5 A"


@pytest.mark.parametrize(
    "kind", ["regulator", "transistor", "rectifier", "capacitor", "wire", "ring", "material"]
)
def test_unknown_name_lists_the_nearest(tables: Tables, kind: str) -> None:
    with pytest.raises(UnknownNameError) as caught:
        getattr(tables, kind)("no such thing")
    assert caught.value.kind == kind
    assert len(caught.value.nearest) == 3
    assert set(caught.value.nearest) <= set(getattr(tables, f"{kind}s"))


def test_misspelt_number_lists_the_right_one(tables: Tables) -> None:
    with pytest.raises(UnknownNameError, match='"1N5822"'):
        tables.rectifier("1N5282")


def test_every_row_says_where_it_comes_from(tables: Tables) -> None:
    odd = [problem for problem in tables.check() if problem.text.startswith("how")]
    assert odd == []
    for kind in ("regulators", "transistors", "rectifiers", "capacitors", "wires", "rings", "materials"):
        for part in getattr(tables, kind).values():
            assert part.source
            assert part.how


def test_check_reports_what_is_odd(tables: Tables) -> None:
    odd = {problem.name for problem in tables.check()}
    assert odd == {"R 39.9/24.1/14.5, hydrogen-reduced iron 75", "R 5.08/2.24/1.78, carbonyl iron 25"}


def test_parts_cannot_be_changed(tables: Tables) -> None:
    with pytest.raises(FrozenInstanceError):
        tables.rectifier("1N5822").slope = 1.0  # type: ignore[attr-defined]
    for part in KINDS.values():
        assert {item.name for item in fields(part)} == set(columns_of(part))  # type: ignore[arg-type]


def test_public_words_are_neutral() -> None:
    """No host names in the tables."""
    root = Path(__file__).parents[2]
    paths = [*(root / "buckdesign" / "parts" / "tables").glob("*.csv"), *(root / "cores_data").glob("*.*")]
    assert len(paths) >= 10
    for path in paths:
        text = path.read_text(encoding="utf-8").lower()
        assert not any(sign in text for sign in (".com", ".nl", ".net", ".org", ".cn", "http", "www")), path


def test_loading_is_light() -> None:
    code = (
        "import sys; from buckdesign.parts import load_tables; load_tables();"
        "print(sorted({'numpy', 'scipy', 'pandas', 'pydantic'} & set(sys.modules)))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"
