"""Design files: read, written, checked, and turned into what the loop model takes."""

from __future__ import annotations

import math
import os
import stat
import sys
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.design.design_file import (
    Design,
    design_from_tree,
    design_keys,
    design_to_toml,
    design_with,
    numeric_keys,
    read_design,
    write_design,
)
from buckdesign.design.resolve import loop_parameters, own_loop_parameters, resolve_design
from buckdesign.design.tolerances import Distribution, Tolerance
from buckdesign.design.toml_source import parse_toml
from buckdesign.errors import FaultsError, FileAccessError, InputError
from buckdesign.parts import load_tables

EXAMPLES = Path(__file__).parents[2] / "examples"
TABLES = load_tables(folder=Path("no such folder"))

FULL = """\
[supply]
voltage = "24 V"
resistance = "50 mohm"
[output]
voltage = "12 V"
current = "2.5 A"
[regulator]
part = "adjustable 1.5 A"
reference = "1.25 V"
adjust_current = "50 uA"
quiescent_current = "3.5 mA"
output_inductance = "0.08 uH"
output_resistance = "2 mohm"
current_limit = "2.2 A"
current_limit_knee = "15 V"
current_limit_far = ["0.4 A", "40 V"]
dropout = "1.6 V"
dropout_resistance = "0.4 ohm"
max_difference = "40 V"
[network]
r1 = "240 ohm"
r2 = "2.05 kohm"
rh = "1 Mohm"
ch = "330 pF"
rbe = "22 ohm"
rdrive = "22 ohm"
rdrive_power = "5 W"
[transistor]
part = "2N5884"
gain = 40
gain_knee = "8 A"
charge_time = "1 us"
base_emitter = "0.75 V"
saturation_voltage = "0.2 V"
saturation_resistance = "0.1 ohm"
[rectifier]
part = "1N5822"
parallel = 2
threshold = "0.35 V"
slope = "50 mohm"
[choke]
core = "R 26.9/14.5/11.1"
material = "hydrogen-reduced iron 75"
permeability = 1.0
stack = 1
turns = 48
wire = "1.0 mm"
strands = 1
[output_capacitor]
capacitance = "470 uF"
esr = "60 mohm"
[input_capacitor]
capacitance = "1000 uF"
esr = "50 mohm"
[thermal]
ambient = "25 degC"
heatsink = "4 K/W"
on_heatsink = ["transistor", "regulator"]
pad = "0.5 K/W"
[thermal.transistor]
pad = "1 K/W"
[thermal.rectifier]
heatsink = "20 K/W"
[requirement.supply]
voltage = ["21 V", "24 V", "29 V"]
[requirement.output]
voltage = "12 V"
current = ["20 mA", "2.5 A"]
ripple = "120 mV"
[tolerance]
"choke.permeability" = "10 %"
"output_capacitor.esr" = ["-50 %", "+100 %"]
"regulator.reference" = { tolerance = "4 %", distribution = "normal" }
"""


def read(text: str) -> Design:
    source = parse_toml(text, Path("a.design.toml"))
    return design_from_tree(source.tree, source.locate, path=source.path, tables=TABLES)


def faults(text: str) -> list[str]:
    with pytest.raises(FaultsError) as caught:
        read(text)
    return str(caught.value).split("\n")


def changed(old: str, new: str) -> str:
    assert FULL.count(old) >= 1
    return FULL.replace(old, new, 1)


def test_values_are_read_as_si() -> None:
    design = read(FULL)
    assert design.regulator.output_inductance == 8e-8
    assert design.regulator.current_limit_far == (0.4, 40.0)
    assert design.network.r2 == 2050.0
    assert design.network.ch == 330e-12
    assert design.choke.turns == 48
    assert design.choke.is_winding
    assert design.thermal.transistor is not None
    assert design.thermal.transistor.pad == 1.0
    assert design.requirement is not None
    assert design.requirement.supply.voltage == (21.0, 24.0, 29.0)
    assert design.tolerance["output_capacitor.esr"] == Tolerance(low=-0.5, high=1.0)
    assert design.tolerance["regulator.reference"].distribution is Distribution.NORMAL
    assert design.full_load == 2.5


def test_written_file_says_the_same_word_for_word() -> None:
    text = design_to_toml(read(FULL))
    assert [line for line in text.split("\n") if line] == FULL.rstrip().split("\n")


def test_values_without_their_text_are_written_so_that_they_read_the_same() -> None:
    design = read(FULL)
    assert design.requirement is not None
    bare = replace(design, given={}, requirement=replace(design.requirement, given={}))
    assert read(design_to_toml(bare)) == design


def test_example_is_read_and_written_the_same() -> None:
    path = EXAMPLES / "spot.design.toml"
    design = read_design(path, TABLES)
    assert parse_toml(design_to_toml(design), path).tree == parse_toml(path.read_text(), path).tree


@given(
    st.fixed_dictionaries(
        {
            "network.r2": st.floats(1e-3, 1e9),
            "choke.turns": st.integers(1, 100_000),
            "output_capacitor.esr": st.floats(0, 10),
            "transistor.gain": st.floats(1, 1e4),
            "thermal.ambient": st.floats(-200, 200),
            "network.ch": st.none() | st.floats(1e-12, 1e-3),
        }
    )
)
def test_any_values_survive_writing(values: dict[str, float | None]) -> None:
    design = design_with(read(FULL), values, TABLES)
    assert read(design_to_toml(replace(design, given={}))) == design
    assert design.network.r2 == values["network.r2"]
    assert design.network.ch == values["network.ch"]


def test_replaced_values_are_checked_like_a_file() -> None:
    design = read(FULL)
    assert design_with(design, {"choke.turns": "50"}, TABLES).choke.turns == 50
    assert design_with(design, {"supply.voltage": "21 V"}, TABLES).given["supply.resistance"] == "50 mohm"
    with pytest.raises(
        InputError, match=r'"choke.turn": unknown key of a design file, nearest: "choke.turns"'
    ):
        design_with(design, {"choke.turn": 50}, TABLES)
    with pytest.raises(FaultsError, match=r"network\.r1"):
        design_with(design, {"network.r1": "0 ohm"}, TABLES)


def test_keys_are_those_of_the_file_format() -> None:
    assert {"choke.turns", "thermal.transistor.pad", "regulator.current_limit_far"} <= set(design_keys())
    assert numeric_keys()["thermal.transistor.pad"].unit == "K/W"
    assert "choke.turns" not in numeric_keys()
    tree = parse_toml(FULL, Path("x")).tree
    for table in ("regulator", "network", "transistor", "rectifier", "choke"):
        assert {f"{table}.{key}" for key in tree[table]} <= set(design_keys())


def test_carried_requirement_may_leave_to_the_design_what_the_design_says() -> None:
    text = (
        FULL[: FULL.index("[requirement.supply]")] + '[requirement.limits]\nfrequency = ["4 kHz", "60 kHz"]\n'
    )
    need = read(text).requirement
    assert need is not None
    assert need.supply.voltage == (24.0, 24.0, 24.0)
    assert (need.output.voltage, need.output.current) == (12.0, (0.0, 2.5))
    assert need.output.ripple == math.inf
    assert read(design_to_toml(read(text))).requirement == need


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("[network]", "[netwrok]", 'unknown table, nearest: "network"'),
        ("[network]", "[netwrok]", "network: missing"),
        ('r1 = "240 ohm"\n', "", "network.r1: missing; a resistance in ohm"),
        ('r1 = "240 ohm"', 'r1 = "0 ohm"', "must be above 0"),
        ('r1 = "240 ohm"', 'r1 = "240 V"', '"V" is a voltage in V'),
        ('r1 = "240 ohm"', 'r1 = ["240 ohm"]', "one value, not a list"),
        ('r1 = "240 ohm"', 'R1 = "240 ohm"', 'unknown key, nearest: "r1"'),
        ('r2 = "2.05 kohm"', 'r2 = "2,05 kohm"', 'decimal comma; write "2.05 kohm"'),
        ('esr = "60 mohm"', "esr = -0.06", "must be 0 or more"),
        ("turns = 48", "turns = 48.5", "a whole number, 1 or more"),
        ("turns = 48", "turns = 0", "a whole number, 1 or more"),
        ("turns = 48", 'turns = "many"', "a whole number, 1 or more"),
        ("turns = 48", "turns = [48]", "one value, not a list"),
        ("parallel = 2", "parallel = true", "a whole number, 1 or more"),
        ("turns = 48\n", "", "choke.turns: missing in a winding"),
        ("turns = 48", 'turns = 48\ninductance = "220 uH"', "not both"),
        ('wire = "1.0 mm"', 'wire = "1.03 mm"', "unknown wire, nearest:"),
        ('core = "R 26.9/14.5/11.1"', 'core = "R 26.9/14.5/11.2"', 'nearest: "R 26.9/14.5/11.1"'),
        ('core = "R 26.9/14.5/11.1"', 'core = "R 3.18/1.57/1.27"', None),
        ('part = "2N5884"', 'part = "2N588"', "unknown transistor, nearest:"),
        ('part = "2N5884"', "part = 2", "the name of a transistor in quotes"),
        ('part = "adjustable 1.5 A"\nreference = "1.25 V"', "", "regulator.reference: missing, and no"),
        ('current_limit_far = ["0.4 A", "40 V"]', 'current_limit_far = "0.4 A"', "a list of two quantities"),
        (
            'current_limit_far = ["0.4 A", "40 V"]',
            'current_limit_far = ["0.4 A", "14 V"]',
            "above current_limit_knee",
        ),
        (
            'current_limit_far = ["0.4 A", "40 V"]',
            'current_limit_far = ["3 A", "40 V"]',
            "not be above current_limit",
        ),
        ('current = "2.5 A"\n', "", "output.current: missing (or output.resistance)"),
        ('on_heatsink = ["transistor", "regulator"]', 'on_heatsink = ["diode"]', '"diode" is unknown'),
        ('on_heatsink = ["transistor", "regulator"]\n', "", "thermal.on_heatsink: missing"),
        ('heatsink = "4 K/W"\n', "", "thermal.heatsink: missing"),
        ('"transistor", "regulator"]', '"transistor", "rectifier"]', "not both"),
        ('ambient = "25 degC"', 'ambient = "25 K"', "a temperature in degC is wanted"),
        ('ambient = "25 degC"', 'ambient = "-300 degC"', "must be above -273.15 degC"),
        (
            'voltage = ["21 V", "24 V", "29 V"]',
            'voltage = ["11 V", "24 V", "29 V"]',
            "below the lowest supply, 11 V",
        ),
        ('"choke.permeability" = "10 %"', '"choke.permeabilty" = "10 %"', 'nearest: "choke.permeability"'),
        (
            '"choke.permeability" = "10 %"',
            'choke.permeability = "10 %"',
            'goes in quotes: "choke.permeability"',
        ),
        ('"choke.permeability" = "10 %"', '"choke.permeability" = "10 V"', "a share in %"),
        ('"choke.permeability" = "10 %"', '"thermal.ambient" = "10 %"', "has no meaning"),
        ('"normal"', '"gauss"', '"gauss" is unknown'),
        ('["-50 %", "+100 %"]', '["+100 %", "-50 %"]', "wrong order"),
    ],
)
def test_one_fault_each(old: str, new: str, said: str | None) -> None:
    text = changed(old, new)
    if said is None:
        assert read(text).choke.core == "R 3.18/1.57/1.27"
        return
    found = faults(text)
    assert any(said in line for line in found), found
    assert all(line.startswith("a.design.toml:") for line in found)


def test_wire_thicker_than_the_bore_is_a_fault() -> None:
    text = changed('core = "R 26.9/14.5/11.1"', 'core = "R 3.18/1.57/1.27"').replace('"1.0 mm"', '"2.0 mm"')
    (line,) = faults(text)
    assert "choke.wire" in line
    assert "thinner than the bore of R 3.18/1.57/1.27, 1.57 mm" in line


def test_all_faults_come_at_once_in_the_order_of_the_file() -> None:
    text = FULL.replace('"24 V"', '"24 A"', 1).replace("gain = 40", "gain = -1").replace("turns", "turn", 1)
    found = faults(text)
    assert len(found) == 4
    assert [line.split(":")[1] for line in found] == sorted((line.split(":")[1] for line in found), key=int)


def test_bought_choke_has_no_winding_keys() -> None:
    start, end = FULL.index("[choke]"), FULL.index("[output_capacitor]")
    bought = FULL[:start] + '[choke]\ninductance = "220 uH"\nstack = 2\n' + FULL[end:]
    found = faults(bought.replace('"choke.permeability" = "10 %"\n', ""))
    assert any("choke.stack = 2: belongs to a winding" in line for line in found)
    assert any("choke.resistance: missing in a bought choke" in line for line in found)


class TestWriting:
    """Whole or not at all."""

    def test_new_file_then_refusal_then_force(self, tmp_path: Path) -> None:
        design, path = read(FULL), tmp_path / "x.design.toml"
        write_design(design, path)
        assert read_design(path, TABLES) == design
        path.write_text("kept")
        with pytest.raises(FileAccessError, match="--force"):
            write_design(design, path)
        assert path.read_text() == "kept"
        write_design(design, path, force=True)
        assert read_design(path, TABLES) == design
        assert [file.name for file in tmp_path.iterdir()] == ["x.design.toml"]

    def test_no_folder_or_a_folder_in_its_place(self, tmp_path: Path) -> None:
        for path in (tmp_path / "none" / "x.toml", tmp_path):
            for force in (False, True):
                with pytest.raises(FileAccessError):
                    write_design(read(FULL), path, force=force)
        assert list(tmp_path.iterdir()) == []

    @pytest.mark.skipif(
        sys.platform == "win32" or os.geteuid() == 0, reason="the superuser may write anywhere"
    )
    def test_folder_without_permission(self, tmp_path: Path) -> None:
        tmp_path.chmod(0o500)
        try:
            with pytest.raises(FileAccessError):
                write_design(read(FULL), tmp_path / "x.toml")
        finally:
            tmp_path.chmod(0o700)

    def test_a_write_that_fails_leaves_the_old_file_and_nothing_else(
        self, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        path = tmp_path / "x.toml"
        path.write_text("kept")

        def full_disk(descriptor: int) -> None:
            raise OSError(28, "No space left on device")

        monkeypatch.setattr(os, "fsync", full_disk)
        with pytest.raises(FileAccessError, match="No space left"):
            write_design(read(FULL), path, force=True)
        assert path.read_text() == "kept"
        assert [file.name for file in tmp_path.iterdir()] == ["x.toml"]

    @pytest.mark.skipif(sys.platform == "win32", reason="permission bits")
    def test_permissions_of_a_replaced_file_stay(self, tmp_path: Path) -> None:
        path = tmp_path / "x.toml"
        path.write_text("")
        path.chmod(0o640)
        write_design(read(FULL), path, force=True)
        assert stat.S_IMODE(path.stat().st_mode) == 0o640

    @pytest.mark.skipif(sys.platform == "win32", reason="links need rights there")
    def test_a_link_stays_a_link(self, tmp_path: Path) -> None:
        (tmp_path / "real.toml").write_text("")
        (tmp_path / "link.toml").symlink_to(tmp_path / "real.toml")
        write_design(read(FULL), tmp_path / "link.toml", force=True)
        assert (tmp_path / "link.toml").is_symlink()
        assert read_design(tmp_path / "real.toml", TABLES) == read(FULL)


class TestToTheLoop:
    """From table and overrides to the parameters of the loop model."""

    def test_inline_design_is_exactly_what_it_says(self) -> None:
        resolved = resolve_design(read_design(EXAMPLES / "spot.design.toml", TABLES), TABLES)
        row = own_loop_parameters(resolved)
        assert resolved.assumptions == ()
        assert row.to_dict() == {
            "supply_voltage": 24.0, "r1": 240.0, "r2": 2050.0, "hysteresis_resistance": 1e6,
            "hysteresis_capacitance": 0.0, "reference": 1.25, "adjust_current": 50e-6,
            "output_inductance": 0.2e-6, "output_resistance": 2e-3, "quiescent_current": 0.0,
            "current_limit": 2.2, "current_limit_knee": math.inf, "current_limit_far_voltage": math.inf,
            "current_limit_far": 0.0, "dropout": 1.6, "dropout_resistance": 0.0, "drive_resistance": 22.0,
            "base_resistance": 22.0, "base_emitter": 0.75, "charge_time": 1e-6, "gain": 40.0,
            "gain_knee": 8.0, "saturation_voltage": 0.2, "saturation_resistance": 0.1, "threshold": 0.35,
            "slope": 0.05, "recovery_charge": 0.0, "inductance": 220e-6, "bias_current": math.inf,
            "bias_exponent": 1.5, "choke_resistance": 0.08, "capacitance": 470e-6, "esr": 0.06,
            "load_current": 2.5, "load_resistance": math.inf, "full_load": 2.5,
        }  # fmt: skip

    def test_overrides_go_before_the_part_and_pieces_share(self) -> None:
        row = own_loop_parameters(resolve_design(read(FULL), TABLES))
        assert (row.gain, row.gain_knee, row.charge_time) == (40.0, 8.0, 1e-6)
        assert (row.threshold, row.slope) == (0.35, 0.025)
        assert (row.current_limit_knee, row.current_limit_far, row.current_limit_far_voltage) == (
            15.0,
            0.4,
            40.0,
        )

    def test_rectifier_by_name_is_88_percent_of_the_fit_through_its_limits(self) -> None:
        # 1N5822: 0.525 V at 3 A, 0.950 V at 9.4 A (Diodes Inc. DS23003); the line through both (derived)
        text = changed('threshold = "0.35 V"\nslope = "50 mohm"', "")
        rectifier = resolve_design(read(text), TABLES).rectifier
        assert rectifier.threshold_limit == pytest.approx(0.32578, rel=1e-4)
        assert rectifier.slope_limit == pytest.approx(66.406e-3, rel=1e-4)
        assert rectifier.threshold == pytest.approx(0.88 * 0.32578, rel=1e-4)
        assert rectifier.slope == pytest.approx(0.88 * 66.406e-3, rel=1e-4)

    def test_transistor_by_name_follows_the_gain_points_and_the_transition_frequency(self) -> None:
        design = design_with(
            read(FULL), {f"transistor.{key}": None for key in ("gain", "gain_knee", "charge_time")}, TABLES
        )
        part = TABLES.transistor("2N5884")
        (current_1, gain_1), (current_2, gain_2), *_ = part.gain_points
        transistor = resolve_design(design, TABLES).transistor
        for current, gain in ((current_1, gain_1), (current_2, gain_2)):
            assert transistor.gain_min / (1 + current / transistor.gain_knee) == pytest.approx(gain, rel=1e-9)
        assert transistor.gain == pytest.approx(1.6 * transistor.gain_min, rel=1e-12)
        assert part.transition_frequency_min is not None
        expected = transistor.gain_min / (2 * math.pi * part.transition_frequency_min)
        assert transistor.charge_time == pytest.approx(expected, rel=1e-12)

    def test_one_gain_point_or_a_steep_fall_take_the_knee_from_the_rating(self) -> None:
        # 2N6491: 20 at 5 A, 5 at 15 A falls faster than the law can; knee 15 A / 2.5
        keys = {f"transistor.{key}": None for key in ("gain", "gain_knee")}
        resolved = resolve_design(
            design_with(read(FULL), {**keys, "transistor.part": "2N6491"}, TABLES), TABLES
        )
        assert resolved.transistor.gain_knee == pytest.approx(6.0)
        assert resolved.transistor.gain_min == pytest.approx(20 * (1 + 5 / 6.0))
        assert any("2N6491" in text for text in resolved.assumptions)

    @pytest.mark.parametrize("name", list(TABLES.transistors))
    def test_every_transistor_gives_sane_values(self, name: str) -> None:
        keys = {
            f"transistor.{key}": None
            for key in ("gain", "gain_knee", "charge_time", "saturation_voltage", "saturation_resistance")
        }
        design = design_with(read(FULL), {**keys, "transistor.part": name}, TABLES)
        found = resolve_design(design, TABLES).transistor
        assert 1 < found.gain_min < found.gain < 1000
        assert 1e-9 < found.charge_time < 1e-5
        assert found.gain_knee > 0
        assert 0 < found.saturation_voltage <= found.saturation_voltage_limit < 1
        assert 0 < found.saturation_resistance <= found.saturation_resistance_limit

    @pytest.mark.parametrize("name", list(TABLES.rectifiers))
    def test_every_rectifier_gives_sane_values(self, name: str) -> None:
        keys = {f"rectifier.{key}": None for key in ("threshold", "slope")}
        found = resolve_design(
            design_with(read(FULL), {**keys, "rectifier.part": name}, TABLES), TABLES
        ).rectifier
        assert 0 < found.threshold <= found.threshold_limit < 1.2
        assert 0 <= found.slope <= found.slope_limit
        assert found.leakage_coefficient > 0

    def test_bought_choke_keeps_70_percent_at_its_saturation_current(self) -> None:
        text = (EXAMPLES / "spot.design.toml").read_text()
        text = text.replace('resistance = "80 mohm"', 'resistance = "80 mohm"\nsaturation = "5 A"')
        row = own_loop_parameters(resolve_design(read(text), TABLES))
        left = 1 / (1 + (5.0 / row.bias_current) ** row.bias_exponent)
        assert left == pytest.approx(0.7, rel=1e-12)

    def test_wound_choke_takes_the_published_factor(self) -> None:
        # 26.9/14.5/11.1, permeability 75: A_L 90 nH (looked up) or 93 nH (from memory)
        choke = resolve_design(read(FULL), TABLES).choke
        assert choke.winding is not None
        assert choke.winding.factor_is_published
        assert 90e-9 <= choke.winding.inductance_factor <= 93e-9
        assert choke.inductance == pytest.approx(choke.winding.inductance_factor * 48**2)
        # 48 turns x about 46 mm of 1.0 mm wire, 21.95 mohm/m (IEC 60028): within 10 %
        assert choke.resistance == pytest.approx(48 * 46e-3 * 21.95e-3, rel=0.1)
        # ring at 3 A and 60 turns keeps 61-65 % (3-5 points either way); the same ampere-turns with 48 turns
        left = 1 / (1 + (3.75 / choke.bias_current) ** choke.bias_exponent)
        assert 0.58 < left < 0.68

    def test_factor_stack_and_strands_scale(self) -> None:
        one = resolve_design(read(FULL), TABLES).choke
        values = {"choke.permeability": 0.9, "choke.stack": 2, "choke.strands": 2}
        two = resolve_design(design_with(read(FULL), values, TABLES), TABLES).choke
        assert two.inductance == pytest.approx(1.8 * one.inductance)
        assert two.bias_current == pytest.approx(one.bias_current)
        assert one.resistance / 2 < two.resistance < one.resistance

    def test_ungapped_ferrite_collapses_at_saturation(self) -> None:
        ferrite = next(name for name, part in TABLES.materials.items() if part.kind == "ferrite")
        resolved = resolve_design(design_with(read(FULL), {"choke.material": ferrite}, TABLES), TABLES)
        assert resolved.choke.bias_current < 2.5
        assert any("collapses" in text for text in resolved.assumptions)

    def test_heat_paths(self) -> None:
        heat = resolve_design(read(FULL), TABLES).heat
        assert (heat.shared_heatsink, heat.transistor.is_shared, heat.rectifier.is_shared) == (
            4.0,
            True,
            False,
        )
        assert (heat.transistor.pad, heat.regulator.pad, heat.rectifier.heatsink) == (1.0, 0.5, 20.0)

    def test_resistive_load_and_other_operating_points(self) -> None:
        text = (
            (EXAMPLES / "spot.design.toml").read_text().replace('current = "2.5 A"', 'resistance = "4.8 ohm"')
        )
        resolved = resolve_design(read(text), TABLES)
        row = own_loop_parameters(resolved)
        assert (row.load_current, row.load_resistance, row.full_load) == (0.0, 4.8, 2.5)
        other = loop_parameters(resolved, 21.0, 0.5)
        assert (other.supply_voltage, other.load_current, other.load_resistance) == (21.0, 0.5, math.inf)
