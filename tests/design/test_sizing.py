"""Resistors around regulator and transistor, and the choice of parts by rating."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.design.capacitor_choices import input_capacitor, output_capacitors
from buckdesign.design.choices import (
    distinct_choices,
    rectifier_choices,
    regulator_choices,
    transistor_choices,
)
from buckdesign.design.elements import RegulatorElement, TransistorElement
from buckdesign.design.sizing import (
    base_drive,
    conduction_onset,
    divider,
    needed_supply,
    power_rating,
    range_loads,
    short_circuit_current,
    upper_resistor,
)
from buckdesign.errors import InfeasibleError
from buckdesign.parts import Tables, load_tables
from buckdesign.physics.preferred import nearest
from tests.design.requirements import BATTERY, LOGGER, RAIL, requirement


@pytest.fixture(scope="module")
def tables() -> Tables:
    return load_tables()


@pytest.fixture(scope="module")
def regulator(tables: Tables) -> RegulatorElement:
    return regulator_choices(RAIL, tables).choices[0].element


@pytest.fixture(scope="module")
def transistor(tables: Tables, regulator: RegulatorElement) -> TransistorElement:
    return transistor_choices(RAIL, tables, regulator).choices[0].element


def set_voltage(regulator: RegulatorElement, r1: float, r2: float, rh: float) -> float:
    """Kirchhoff's law at the adjust pin while the mean of the switch node is the output (derived)."""
    up = 1.0 / r1 + 1.0 / rh
    return regulator.reference + r2 * (regulator.reference * up + regulator.adjust_current)


@pytest.mark.parametrize("rh", [1e5, 1e6, float("inf")])
@pytest.mark.parametrize("output", [3.3, 5.0, 12.0, 13.8, 24.0])
def test_divider_meets_the_output_with_the_pull_of_the_feedback(
    regulator: RegulatorElement, output: float, rh: float
) -> None:
    need = requirement((30.0, 32.0, 34.0), output, (0.1, 1.0))
    r1, r2 = divider(need, regulator, rh)
    assert nearest(r1, "E24") == r1
    assert nearest(r2, "E96") == r2
    # E96 values lie at most 2.5 % apart, so that the nearest is within 1.25 % (IEC 60063)
    assert set_voltage(regulator, r1, r2, rh) == pytest.approx(output, rel=0.0125)


def test_ignoring_the_pull_would_miss_the_output(regulator: RegulatorElement) -> None:
    """With 100 kohm on 240 ohm and 2 kohm the pull is 20 mV a volt: it must be in the divider."""
    _, with_pull = divider(RAIL, regulator, 22e3)
    _, without = divider(RAIL, regulator, float("inf"))
    assert with_pull < without


def test_output_at_the_reference_is_refused(regulator: RegulatorElement) -> None:
    with pytest.raises(InfeasibleError, match="not above the regulator's reference"):
        divider(requirement(BATTERY, 1.25, (0.0, 1.0)), regulator, float("inf"))


def test_upper_resistor_carries_what_the_load_does_not(regulator: RegulatorElement) -> None:
    # The 1.5 A class needs up to 10 mA: 240 ohm carries 5.2 mA, 120 ohm 10.4 mA (table, Ohm's law).
    assert upper_resistor(requirement(BATTERY, 12.0, (0.0, 1.0)), regulator) == 120.0
    assert upper_resistor(requirement(BATTERY, 12.0, (0.02, 1.0)), regulator) == 240.0


def test_base_drive_suffices_at_the_lowest_supply(
    regulator: RegulatorElement, transistor: TransistorElement
) -> None:
    drive = base_drive(RAIL, regulator, transistor, 22.0)
    # Kirchhoff along the drive path at 21 V (derived)
    left = 21.0 - transistor.base_emitter_max - regulator.dropout - 12.0
    assert drive.available == pytest.approx(left / (drive.rdrive + regulator.dropout_resistance))
    assert drive.available >= 1.15 * drive.needed
    # peak of 1.25 x 2.5 A over the guaranteed gain there, and what the resistor takes
    gain = transistor.gain_min / (1.0 + 3.125 / transistor.gain_knee)
    assert drive.needed == pytest.approx(3.125 / gain + transistor.base_emitter_max / 22.0)
    assert nearest(drive.rdrive, "E12") == drive.rdrive


def test_next_larger_drive_resistor_would_not_do(
    regulator: RegulatorElement, transistor: TransistorElement
) -> None:
    drive = base_drive(RAIL, regulator, transistor, 22.0)
    left = 21.0 - transistor.base_emitter_max - regulator.dropout - 12.0
    assert left / (1.22 * drive.rdrive + regulator.dropout_resistance) < 1.15 * drive.needed


def test_too_little_headroom_is_infeasible_and_says_how_much(
    regulator: RegulatorElement, transistor: TransistorElement
) -> None:
    need = requirement((14.0, 14.5, 15.0), 12.0, (0.0, 2.5))
    with pytest.raises(InfeasibleError, match="the lowest supply leaves 2 V"):
        base_drive(need, regulator, transistor, 22.0)
    enough = needed_supply(need, regulator, transistor, 22.0)
    raised = requirement((enough + 0.01, enough + 0.5, enough + 1.0), 12.0, (0.0, 2.5))
    assert base_drive(raised, regulator, transistor, 22.0).rdrive >= 1.0


def test_short_circuit_current_is_limited_by_resistor_or_regulator(
    regulator: RegulatorElement, transistor: TransistorElement
) -> None:
    # (29 - 0.75 - 1.6) V over 33.4 ohm (Ohm's law); with 1 ohm the regulator's own limit rules
    expected = (29.0 - transistor.base_emitter - regulator.dropout) / (33.0 + regulator.dropout_resistance)
    assert short_circuit_current(RAIL, regulator, transistor, 33.0) == pytest.approx(expected)
    assert short_circuit_current(RAIL, regulator, transistor, 1.0) == regulator.current_limit


@given(st.floats(1e-3, 24.0))
def test_power_rating_is_twice_the_dissipation_at_least(dissipation: float) -> None:
    assert power_rating(dissipation) >= 2.0 * dissipation


def test_power_rating_past_the_largest_is_infeasible() -> None:
    with pytest.raises(InfeasibleError, match="largest on offer is 50 W"):
        power_rating(26.0)


def test_range_has_the_loads_that_count(regulator: RegulatorElement, transistor: TransistorElement) -> None:
    onset = conduction_onset(regulator, transistor, 240.0, 22.0)
    # V_BE/R_be less what the divider takes (derived)
    assert onset == pytest.approx(transistor.base_emitter / 22.0 - regulator.reference / 240.0)
    loads = range_loads(RAIL, onset)
    for wanted in (0.02, 1.2 * onset, 0.05, 0.125, 0.25, 0.625, 1.25, 2.5):
        assert any(load == pytest.approx(wanted) for load in loads)


@given(st.floats(0.0, 0.95), st.floats(0.0, 0.2))
def test_range_has_at_least_eight_loads_within_it(share: float, onset: float) -> None:
    need = requirement(BATTERY, 12.0, (2.5 * share, 2.5))
    loads = range_loads(need, onset)
    assert len(loads) >= 8
    assert loads[0] == 2.5 * share
    assert loads[-1] == 2.5
    assert list(loads) == sorted(set(loads))


def test_chosen_parts_keep_the_margins(tables: Tables, regulator: RegulatorElement) -> None:
    for choice in transistor_choices(RAIL, tables, regulator).choices:
        part = tables.transistor(choice.name)
        assert part.collector_voltage >= 1.25 * 29.0
        assert part.collector_current >= 3.0 * 2.5
    for one in rectifier_choices(RAIL, tables).choices:
        diode = tables.rectifier(one.name)
        assert diode.reverse_voltage >= 1.25 * 29.0
        assert diode.average_current >= 1.3 * 2.5 * (1.0 - 12.0 / 29.0)
    assert all(one.rated_voltage >= 1.5 * 12.0 for one in output_capacitors(RAIL, tables))
    chosen = input_capacitor(RAIL, tables, 1.3)
    assert chosen is not None
    assert chosen.part.rated_voltage >= 1.25 * 29.0
    assert (chosen.part.ripple_current or 0.0) * chosen.parallel >= 1.1 * 1.3


def test_grades_of_one_type_count_once(tables: Tables, regulator: RegulatorElement) -> None:
    names = [one.name for one in distinct_choices(transistor_choices(RAIL, tables, regulator).choices, 9)]
    assert not {"2N5883", "2N5884"} <= set(names)


def test_named_parts_need_only_keep_their_ratings(tables: Tables) -> None:
    """1N5821: 30 V for 29 V, without the margin, but within the rating."""
    named = replace(RAIL, prefer=replace(RAIL.prefer, rectifier=("1N5821",)))
    assert [one.name for one in rectifier_choices(named, tables).choices] == ["1N5821"]
    assert "1N5821" not in [one.name for one in rectifier_choices(RAIL, tables).choices]


def test_named_part_beyond_its_rating_says_what_it_lacks(tables: Tables) -> None:
    named = replace(RAIL, prefer=replace(RAIL.prefer, rectifier=("1N5817",)))
    found = rectifier_choices(named, tables)
    assert found.choices == ()
    lack = found.lacks[0]
    assert (lack.part, lack.what, lack.required, lack.offered) == ("1N5817", "reverse voltage", 29.0, 20.0)


def test_two_named_rectifiers_share_where_one_is_too_small(tables: Tables) -> None:
    """1 A diodes for 1.47 A mean: two of 1N5819 in parallel (table)."""
    need = requirement(BATTERY, 12.0, (0.0, 2.5), prefer={"rectifier": ("1N5819",)})
    assert [(one.name, one.parallel) for one in rectifier_choices(need, tables).choices] == [("1N5819", 2)]


def test_capacitors_that_die_within_a_year_are_passed_over(tables: Tables) -> None:
    hot = requirement(BATTERY, 12.0, (0.0, 1.0), ambient=(0.0, 90.0))
    # 2 000 h at 105 degC last 4 700 h at 90 + 5 degC by the ten-kelvin rule (common practice)
    assert all((one.life or 0.0) > 4000.0 for one in output_capacitors(hot, tables))
    assert any((one.life or 0.0) <= 2000.0 for one in output_capacitors(LOGGER, tables))
