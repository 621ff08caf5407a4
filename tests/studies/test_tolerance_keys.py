"""Which values can differ from unit to unit, what that changes, and what is refused."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

from buckdesign.design.design_file import design_with, numeric_keys, read_design
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.operated import operate_rows, points_of, rows_at
from buckdesign.design.resolve import resolve_design
from buckdesign.design.tolerances import NOT_VARIED, Distribution, Tolerance
from buckdesign.errors import FaultsError, InputError
from buckdesign.parts import load_tables
from buckdesign.studies.tolerance_keys import DESIGN_FILE, varied_values
from buckdesign.studies.unit_designs import EDDY_LOSS, FIELDS, UNIT_KEYS, unit_design, value_of
from tests.design.operating_designs import BENCH, BOUGHT, REQUIREMENT, bench

FULL = {
    "network.ch": "330 pF",
    "thermal.heatsink": None,
    "thermal.on_heatsink": None,
    "thermal.regulator.heatsink": "9 K/W",
    "thermal.regulator.pad": "1 K/W",
    "thermal.transistor.heatsink": "3 K/W",
    "thermal.transistor.pad": "0.7 K/W",
    "thermal.rectifier.heatsink": "14 K/W",
    "thermal.rectifier.pad": "0.4 K/W",
    "rectifier.capacitance": "200 pF",
}
"""Every value that a winding's design can have, but for shared heat sink and common pad (invented)."""

SHARED = ("thermal.heatsink", "thermal.pad")

FILE_MEANS_MORE = ("output_capacitor.esr", "input_capacitor.esr", "rectifier.recovery_charge")
"""Keys that, given in a file, also stop what the value of a part follows: frequency, temperature, current."""


def resolved(changes: dict[str, Any] | None = None) -> ResolvedDesign:
    return resolve_design(bench(changes))


def designs_with_a_value() -> dict[str, ResolvedDesign]:
    wound, bought, shared = resolved(FULL), resolved({**FULL, **BOUGHT}), resolved()
    return {
        key: next(one for one in (wound, bought, shared) if value_of(one, key) is not None)
        for key in UNIT_KEYS
    }


def seen(design: ResolvedDesign) -> list[float]:
    """Everything that an operating point of a design shows, the parts' own limits too."""
    points = points_of(design, supply=[20.0, 20.0], load_current=[3.0, 0.6], ambient_c=30.0)
    operated = operate_rows(rows_at(design, points), design, points.ambient_c)
    columns = operated.columns()
    numbers = [columns[name] for name in columns if name != "regime"]
    return [*np.concatenate([np.ravel(np.asarray(one, dtype=float)) for one in numbers]), *operated.rows[0]]


def test_every_key_with_a_quantity_varies_or_is_refused() -> None:
    for key, kind in numeric_keys().items():
        refused = kind.unit == "degC" or key in NOT_VARIED or key.partition(".")[0] in NOT_VARIED
        assert refused != (key in UNIT_KEYS), key
    assert set(UNIT_KEYS) <= set(numeric_keys())


@pytest.mark.parametrize("key", UNIT_KEYS)
def test_every_key_scales_its_value_and_changes_what_is_seen(key: str) -> None:
    nominal = designs_with_a_value()[key]
    value = value_of(nominal, key)
    assert value is not None and value > 0.0
    unit = unit_design(nominal, {key: 1.25})
    if not key.startswith("thermal."):
        assert value_of(unit, key) == pytest.approx(1.25 * value)
    if key == "input_capacitor.capacitance":
        # only the loss factor at the rate of the loop sees it
        assert unit.input_capacitor != nominal.input_capacitor
        return
    same = np.isclose(seen(unit), seen(unit_design(nominal, {})), rtol=1e-9, equal_nan=True)
    assert not same.all(), f"{key} has no effect"


@pytest.mark.parametrize(
    "key",
    [
        *(f"network.{name}" for name in FIELDS["network"]),
        "regulator.reference", "regulator.output_inductance", "regulator.dropout",
        "transistor.gain", "transistor.gain_knee", "transistor.charge_time", "transistor.base_emitter",
        "transistor.junction_case", "rectifier.threshold", "rectifier.slope", "rectifier.capacitance",
        "rectifier.junction_case", "choke.permeability", "output_capacitor.capacitance",
        "thermal.transistor.heatsink", "thermal.rectifier.pad",
    ],
)  # fmt: skip
def test_a_unit_is_the_design_file_with_that_value(key: str) -> None:
    base = bench(FULL)
    nominal = resolve_design(base)
    value = value_of(nominal, key)
    assert value is not None
    by_file = resolve_design(design_with(base, {key: 1.1 * value}))
    assert seen(unit_design(nominal, {key: 1.1})) == pytest.approx(seen(by_file), rel=1e-7, nan_ok=True)


@pytest.mark.parametrize("key", SHARED)
def test_shared_sink_and_common_pad(key: str) -> None:
    base = bench()
    nominal = resolve_design(base)
    value = value_of(nominal, key)
    by_file = resolve_design(design_with(base, {key: 1.2 * float(value or 0.0)}))
    assert unit_design(nominal, {key: 1.2}).heat == by_file.heat


def test_inductance_and_saturation_of_a_bought_choke() -> None:
    base = bench(BOUGHT)
    nominal = resolve_design(base)
    for key in ("choke.inductance", "choke.resistance", "choke.saturation"):
        value = value_of(nominal, key)
        assert value == pytest.approx(numeric_keys()[key].read(BOUGHT[key], None))
        by_file = resolve_design(design_with(base, {key: 1.3 * float(value or 0.0)}))
        unit = unit_design(nominal, {key: 1.3}).choke
        for name in ("inductance", "resistance", "bias_current", "bias_exponent"):
            assert getattr(unit, name) == pytest.approx(getattr(by_file.choke, name))


def test_the_esr_is_scaled_at_every_frequency() -> None:
    unit, nominal = unit_design(resolved(), {"output_capacitor.esr": 2.0}), resolved()
    new, old = unit.output_capacitor, nominal.output_capacitor
    assert (new.esr, new.loss_tangent) == (2.0 * old.esr, 2.0 * (old.loss_tangent or np.nan))
    assert new.kind == old.kind


def test_only_the_eddy_part_of_the_core_loss_ages() -> None:
    nominal = resolved()
    assert nominal.choke.winding is not None
    before = nominal.choke.winding.material.loss_coefficients
    unit = unit_design(nominal, {EDDY_LOSS: 3.0})
    assert unit.choke.winding is not None and before is not None
    assert unit.choke.winding.material.loss_coefficients == (*before[:3], 3.0 * before[3])


def test_a_unit_is_held_to_its_own_values() -> None:
    unit = unit_design(resolved({"rectifier.parallel": 1}), {"transistor.gain": 0.8})
    transistor, regulator, rectifier = unit.transistor, unit.regulator, unit.rectifier
    assert transistor.gain_min == transistor.gain and regulator.current_limit_min == regulator.current_limit
    assert regulator.reference_min == regulator.reference == regulator.reference_max
    assert regulator.output_inductance_factor == 1.0
    assert (rectifier.threshold_limit, rectifier.slope_limit) == (rectifier.threshold, rectifier.slope)
    assert transistor.saturation_voltage_limit == transistor.saturation_voltage


def test_pieces_in_parallel_still_differ() -> None:
    nominal = resolved()
    unit = unit_design(nominal, {"rectifier.threshold": 1.1}).rectifier
    spread = nominal.rectifier.threshold_limit - nominal.rectifier.threshold
    assert nominal.rectifier.parallel == 2 and spread > 0.0
    assert unit.threshold_limit - unit.threshold == pytest.approx(spread)


def defaults(changes: dict[str, Any] | None = None) -> dict[str, Any]:
    base = bench(changes)
    return {one.key: one for one in varied_values(base, resolve_design(base), load_tables())}


def test_defaults_follow_the_parts() -> None:
    found = defaults()
    # part table of the 1.5 A class: reference 1.20 V to 1.30 V about 1.25 V, output inductance within a factor of 3
    reference = found["regulator.reference"].tolerance
    assert (reference.low, reference.high) == pytest.approx((-0.04, 0.04))
    inductance = found["regulator.output_inductance"].tolerance
    assert (1.0 + inductance.low, 1.0 + inductance.high) == pytest.approx((1.0 / 3.0, 3.0))
    assert inductance.distribution is Distribution.LOGNORMAL
    # design rule: typical gain is 1.6 times the guaranteed one
    assert 1.0 + found["transistor.gain"].tolerance.low == pytest.approx(1.0 / 1.6)
    # material table: iron powder within 10 %; capacitor table: within 20 %
    assert found["choke.permeability"].tolerance == Tolerance(low=-0.1, high=0.1)
    assert found["output_capacitor.capacitance"].tolerance == Tolerance(low=-0.2, high=0.2)
    assert found["network.r1"].tolerance == Tolerance(low=-0.01, high=0.01)
    assert all(one.source for one in found.values())
    assert list(found) == [key for key in numeric_keys() if key in found]


def test_defaults_follow_what_the_design_has() -> None:
    bought = defaults({**BOUGHT, "network.ch": "330 pF", "regulator.output_inductance": "0.1 uH"})
    assert {"choke.inductance", "choke.saturation", "network.ch"} <= bought.keys()
    assert "choke.permeability" not in bought and "network.ch" not in defaults()
    assert bought["regulator.output_inductance"].tolerance.high == pytest.approx(0.5)


TOLERANCE = """
[tolerance]
"network.r1" = "5 %"
"output_capacitor.esr" = { tolerance = ["-50 %", "+100 %"], distribution = "lognormal" }
"""


@pytest.fixture
def file(tmp_path: Path) -> Path:
    return tmp_path / "bench.design.toml"


def test_a_table_of_its_own_replaces_the_defaults(file: Path) -> None:
    file.write_text(BENCH + REQUIREMENT + TOLERANCE)
    design = read_design(file)
    found = varied_values(design, resolve_design(design), load_tables())
    assert [one.key for one in found] == ["network.r1", "output_capacitor.esr"]
    assert {one.source for one in found} == {DESIGN_FILE}
    assert found[1].tolerance == Tolerance(low=-0.5, high=1.0, distribution=Distribution.LOGNORMAL)
    every = varied_values(design, resolve_design(design), load_tables(), with_defaults=True)
    assert len(every) > 15
    by = {one.key: one for one in every}
    assert by["network.r1"].tolerance.high == 0.05 and by["network.r2"].tolerance.high == 0.01


@pytest.mark.parametrize(
    ("line", "told"),
    [
        ('"transistor.collector_current" = "5 %"', "a rating"),
        ('"network.rdrive_power" = "5 %"', "a rating"),
        ('"output_capacitor.life" = "5 %"', "a rating"),
        ('"supply.voltage" = "5 %"', "the range of the requirement"),
        ('"output.current" = "5 %"', "the range of the requirement"),
        ('"thermal.ambient" = "5 %"', "share of a temperature"),
        ('"network.r3" = "5 %"', 'nearest: "network.r1"'),
        ('"network.r1" = { tolerance = "5 %", distribution = "gauss" }', '"uniform", "normal", "lognormal"'),
        ('"network.r1" = { tolerance = "5 %", distribution = ["normal"] }', '["normal"] is unknown'),
        ('"network.r1" = { tolerance = "100 %", distribution = "normal" }', '= "100 %": must be'),
        ('"network.r1" = ["10 %", "10 %"]', "both ends alike"),
        ('"network.r1" = ["10 %"]', "1 value, not 2"),
        ('"network.r1" = 10', 'write "10 %"'),
        ('"network.r1" = "10"', 'write "10 %"'),
        ('"network.r1" = "-5 %"', "counts both ways"),
        ('"network.r1" = "150 %"', '["-50 %", "+150 %"]'),
    ],
)
def test_refused_in_a_file(file: Path, line: str, told: str) -> None:
    file.write_text(f"{BENCH}[tolerance]\n{line}\n")
    number = file.read_text().splitlines().index(line) + 1
    with pytest.raises(FaultsError) as caught:
        read_design(file)
    assert told in str(caught.value) and f"{file}:{number}: " in str(caught.value)


@pytest.mark.parametrize(
    "key", ["network.ch", "choke.saturation", "rectifier.leakage", "thermal.regulator.pad"]
)
def test_nothing_to_spread(file: Path, key: str) -> None:
    text = BENCH.replace('part = "1N5809"', 'threshold = "0.8 V"\nslope = "20 mohm"')
    winding = 'core = "R 26.9/14.5/11.1"\nmaterial = "hydrogen-reduced iron 75"\nturns = 47\nwire = "1.0 mm"'
    text = text.replace(winding, 'inductance = "200 uH"\nresistance = "60 mohm"')
    file.write_text(f'{text}[tolerance]\n"network.r1" = "1 %"\n"{key}" = "5 %"\n')
    design = read_design(file)
    line = len(file.read_text().splitlines())
    with pytest.raises(FaultsError, match="nothing to spread") as caught:
        varied_values(design, resolve_design(design), load_tables())
    assert str(caught.value).startswith(f'{file}:{line}: tolerance."{key}" = "5 %": ')


@pytest.mark.parametrize(
    ("key", "told"),
    [("network.rx", "nearest"), ("supply.voltage", "range"), ("rectifier.reverse_voltage", "a rating")],
)
def test_refused_from_a_script(key: str, told: str) -> None:
    given = {key: Tolerance(low=-0.1, high=0.1)}
    with pytest.raises(InputError, match=told):
        varied_values(bench(), resolved(), load_tables(), given=given)


def test_no_width_at_all() -> None:
    none = Tolerance(low=0.0, high=0.0)
    some = {"network.r1": none, "network.r2": Tolerance(low=-0.1, high=0.1)}
    assert [one.key for one in varied_values(bench(), resolved(), load_tables(), given=some)] == [
        "network.r2"
    ]
    with pytest.raises(InputError, match="every tolerance is 0"):
        varied_values(bench(), resolved(), load_tables(), given={"network.r1": none})


def test_no_width_at_all_in_a_file(file: Path) -> None:
    file.write_text(f'{BENCH}[tolerance]\n"network.r1" = "0 %"\n')
    design = read_design(file)
    with pytest.raises(InputError, match="--defaults") as caught:
        varied_values(design, resolve_design(design), load_tables())
    assert str(caught.value).startswith(f"{file}: ")
