"""Windings judged as arrays: against the physics functions one by one, and the choice among them."""

from __future__ import annotations

from dataclasses import fields
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from buckdesign.design.choke_heat import tabulated_round_wire_factor
from buckdesign.design.choke_layers import lay_wires, wires_by_layer
from buckdesign.design.choke_search import (
    Candidates,
    ChokeChoice,
    ChokeColumns,
    ChokeLimits,
    ChokeNeed,
    ChokeSpace,
    Duty,
    Rank,
    choke_columns,
    choose_chokes,
    evaluate_windings,
    pareto_set,
)
from buckdesign.errors import InputError, UnknownNameError
from buckdesign.parts import Tables, load_tables
from buckdesign.physics import bias, choke, convection, core_loss, ring, thermal, winding, wire

NEED = ChokeNeed(inductance=200e-6, current=2.5, ripple=0.6, frequency=20e3, ambient_c=40.0)
DUTY = Duty(current=2.5, ripple=1.5, frequency=50e3, duty=0.4, ambient_c=30.0)


@pytest.fixture(scope="module")
def tables() -> Tables:
    return load_tables(folder=Path("no own tables"))


@pytest.fixture(scope="module")
def columns(tables: Tables) -> ChokeColumns:
    return choke_columns(tables)


@pytest.fixture(scope="module")
def chosen(tables: Tables) -> ChokeChoice:
    return choose_chokes(tables, NEED)


def draw(columns: ChokeColumns, count: int, seed: int) -> Candidates:
    rng = np.random.default_rng(seed)
    powder = [index for index, one in enumerate(columns.materials) if one.kind == "iron powder"]
    return Candidates(
        ring=rng.integers(len(columns.rings), size=count),
        material=rng.choice(powder, size=count),
        wire=rng.integers(len(columns.wires), size=count),
        strands=rng.integers(1, 5, size=count),
        stack=rng.integers(1, 4, size=count),
        turns=rng.integers(5, 120, size=count),
        permeability=rng.uniform(0.9, 1.1, size=count),
    )


def test_the_table_of_layers_winds_as_the_walk_through_the_layers(columns: ChokeColumns) -> None:
    some = draw(columns, 5000, 11)
    height = columns.ring.height[some.ring] * some.stack
    walked = winding.wind(
        columns.ring.outer[some.ring],
        columns.ring.inner[some.ring],
        height,
        columns.wire.overall[some.wire],
        some.turns * some.strands,
    )
    row = some.ring * len(columns.wires) + some.wire
    looked = lay_wires(columns.layers, row, height, some.turns * some.strands)
    assert 0.2 < np.mean(walked.fits) < 0.9
    np.testing.assert_array_equal(looked.fits, walked.fits)
    np.testing.assert_array_equal(looked.layers, walked.layers)
    np.testing.assert_array_equal(looked.outside_layers, walked.outside_layers)
    np.testing.assert_array_equal(looked.first, walked.wires_first_layer)
    np.testing.assert_array_equal(looked.capacity, walked.capacity)
    np.testing.assert_allclose(looked.mean_turn, walked.mean_turn, rtol=1e-12)


@settings(deadline=None, max_examples=60)
@given(wires=st.integers(1, 400), thick=st.floats(0.2e-3, 3e-3))
def test_layers_of_one_winding_add_up(wires: int, thick: float) -> None:
    inside, outside = wires_by_layer(26.9e-3, 14.5e-3, thick, wires)
    walked = winding.wind(26.9e-3, 14.5e-3, 11.1e-3, thick, wires)
    assert sum(inside) == sum(outside) == min(wires, walked.capacity)
    assert len(inside) == walked.layers
    assert inside == sorted(inside, reverse=True)


def test_layers_of_the_published_one_layer_count() -> None:
    # Derived, N = floor(pi/asin(d/(ID-d))): bore 14.5 mm takes 39 wires of 1.062 mm and 50 of 0.855 mm.
    assert wires_by_layer(26.9e-3, 14.5e-3, 1.062e-3, 60)[0] == [39, 21]
    assert wires_by_layer(26.9e-3, 14.5e-3, 0.855e-3, 50) == ([50], [50])


def test_every_quantity_is_that_of_the_physics_functions(columns: ChokeColumns) -> None:
    some = draw(columns, 600, 5)
    found = evaluate_windings(columns, some, DUTY)
    size, stuff = columns.ring, columns.material
    outer, inner = size.outer[some.ring], size.inner[some.ring]
    height, area = size.height[some.ring] * some.stack, size.area[some.ring] * some.stack
    law = stuff.half_field[some.material], stuff.exponent[some.material]
    factor = columns.factor[some.ring, some.material] * some.stack * some.permeability
    drive = some.turns * DUTY.current
    fraction = bias.ring_inductance_fraction(drive, outer, inner, *law)
    np.testing.assert_allclose(found.inductance_h, factor * some.turns**2, rtol=1e-12)
    np.testing.assert_allclose(found.permeability_fraction, fraction, rtol=1e-12)
    np.testing.assert_allclose(found.field_a_per_m, drive / size.length[some.ring], rtol=1e-12)
    swing = found.inductance_biased_h * DUTY.ripple / (some.turns * area)
    np.testing.assert_allclose(found.flux_swing_t, swing, rtol=1e-12)
    density = core_loss.three_term_loss_triangular(
        DUTY.frequency, swing / 2.0, DUTY.duty, *stuff.loss[:, some.material]
    )
    np.testing.assert_allclose(found.core_loss_w, density * size.volume[some.ring] * some.stack, rtol=1e-12)
    half, exponent = bias.ring_bias_law(some.turns, outer, inner, *law)
    linkage = choke.flux_linkage(found.inductance_h, DUTY.current + DUTY.ripple / 2.0, half, exponent)
    np.testing.assert_allclose(found.flux_density_t, linkage / (some.turns * area), rtol=6e-3)
    lay = winding.wind(outer, inner, height, columns.wire.overall[some.wire], some.turns * some.strands)
    length = winding.wire_length(some.turns, lay.mean_turn)
    copper = columns.wire.conductor[some.wire]
    known = np.isfinite(lay.mean_turn)
    np.testing.assert_allclose(
        found.resistance_ohm[known],
        np.asarray(wire.dc_resistance(length, copper, some.strands, 20.0))[known],
        rtol=1e-12,
    )


def test_loss_and_temperature_agree_with_each_other(columns: ChokeColumns) -> None:
    """The fixed point by brute force, with the exact Bessel functions."""
    some = draw(columns, 600, 7)
    found = evaluate_windings(columns, some, DUTY)
    overall, copper = columns.wire.overall[some.wire], columns.wire.conductor[some.wire]
    inner = columns.ring.inner[some.ring]
    wires = some.turns * some.strands
    far, bore, tall = winding.wound_dimensions(
        columns.ring.outer[some.ring],
        inner,
        columns.ring.height[some.ring] * some.stack,
        overall,
        found.layers,
        found.outside_layers,
    )
    area = ring.surface(far, bore, tall)
    porosity = winding.bore_porosity(wires, np.maximum(found.layers, 1.0), copper, inner, overall)
    good = found.fits & (found.temperature_rise_k < 100.0)
    assert good.sum() > 150
    rise = found.temperature_rise_k.copy()
    for _ in range(60):
        celsius = np.minimum(DUTY.ambient_c + rise, 200.0)
        depth = [wire.skin_depth(DUTY.frequency * order, celsius) for order in range(1, 6)]
        factors = [wire.winding_factor(copper, one, np.maximum(found.layers, 1.0), porosity) for one in depth]
        warm = found.resistance_ohm * wire.copper_resistivity(celsius) / wire.copper_resistivity(20.0)
        ripple = wire.ripple_copper_loss(warm, DUTY.ripple, DUTY.duty, np.stack(factors, axis=-1))
        loss = DUTY.current**2 * warm + ripple
        power = loss + found.core_loss_w
        rule = thermal.ring_rise_surface_rule(power, area)
        natural = convection.ring_rise(power, area, far, DUTY.ambient_c)
        rise = np.where(good, np.maximum(rule, natural), rise)
    np.testing.assert_allclose(found.copper_loss_w[good], np.asarray(loss)[good], rtol=3e-5)
    np.testing.assert_allclose(found.temperature_rise_k[good], rise[good], rtol=3e-5)
    np.testing.assert_allclose(found.temperature_rise_low_k[good], np.minimum(rule, natural)[good], rtol=3e-5)


def test_a_grid_and_single_windings_give_the_same(columns: ChokeColumns) -> None:
    core, copper = draw(columns, 7, 1), draw(columns, 5, 2)
    grid = Candidates(
        ring=core.ring[:, None],
        material=core.material[:, None],
        stack=core.stack[:, None],
        turns=core.turns[:, None],
        wire=copper.wire,
        strands=copper.strands,
    )
    found = evaluate_windings(columns, grid, DUTY)
    assert found.fits.shape == (7, 5)
    for row, column in ((0, 0), (3, 4), (6, 2)):
        one = Candidates(
            ring=core.ring[row : row + 1],
            material=core.material[row : row + 1],
            stack=core.stack[row : row + 1],
            turns=core.turns[row : row + 1],
            wire=copper.wire[column : column + 1],
            strands=copper.strands[column : column + 1],
        )
        single = evaluate_windings(columns, one, DUTY)
        for item in fields(single):
            alone, among = getattr(single, item.name)[0], getattr(found, item.name)[row, column]
            assert among == pytest.approx(alone, rel=1e-12, nan_ok=True), item.name


def test_round_wire_factor_is_tabulated_closely() -> None:
    ratio = np.concatenate([np.linspace(0.0, 20.0, 3977), np.geomspace(20.0, 390.0, 200)])
    exact = np.asarray(wire.round_wire_factor(np.maximum(ratio, 1e-9), 1.0))
    np.testing.assert_allclose(tabulated_round_wire_factor(ratio), exact, rtol=2e-5)


def test_flux_far_beyond_the_half_field_is_still_right(columns: ChokeColumns) -> None:
    """A start-up current of 30 A through 60 turns, against quadrature over the radius."""
    names = [one.name for one in columns.materials]
    at = names.index("hydrogen-reduced iron 75")
    where = [one.name for one in columns.rings].index("R 26.9/14.5/11.1")
    one = Candidates(ring=np.array([where]), material=at, wire=0, turns=60)
    found = evaluate_windings(columns, one, Duty(current=2.5, worst_current=30.0))
    law = columns.material.half_field[at], columns.material.exponent[at]
    exact = choke.section_mean_flux_density(60 * 30.0, 26.9e-3, 14.5e-3, 75.0, *law)
    size = 26.9e-3, 14.5e-3, 11.1e-3
    formula = ring.inductance_factor(75.0, ring.core_constant_c1(*size))
    scale = columns.factor[where, at] / formula * ring.geometric_area(*size) / columns.ring.area[where]
    assert found.worst_flux_density_t[0] == pytest.approx(exact * scale, rel=1e-3)
    assert found.saturation_margin[0] == pytest.approx(1.4 / found.worst_flux_density_t[0])


def test_chosen_chokes_keep_every_limit(chosen: ChokeChoice) -> None:
    found, limits = chosen.windings, ChokeLimits()
    assert len(chosen) > 1000
    assert found.fits.all()
    assert found.inductance_biased_h.min() >= NEED.inductance * (1.0 - 1e-9)
    assert (NEED.ambient_c + found.temperature_rise_k).max() <= limits.core_c
    assert found.bore_fill.max() <= limits.bore_fill
    assert found.permeability_fraction.min() >= limits.inductance_fraction
    assert found.saturation_margin.min() >= limits.saturation_margin
    section = np.pi / 4.0 * chosen.columns.wire.conductor[chosen.candidates.wire] ** 2
    assert (NEED.current / (section * chosen.candidates.strands)).max() <= limits.current_density


def test_turns_are_the_fewest_that_reach_the_inductance(chosen: ChokeChoice) -> None:
    one = chosen.candidates
    fewer = Candidates(
        ring=one.ring,
        material=one.material,
        wire=one.wire,
        strands=one.strands,
        stack=one.stack,
        turns=one.turns - 1,
    )
    short = evaluate_windings(chosen.columns, fewer, NEED.as_duty())
    assert short.inductance_biased_h.max() < NEED.inductance


@pytest.mark.parametrize(
    ("rank", "column"),
    [(Rank.LOSS, "total_loss_w"), (Rank.SIZE, "volume_m3"), (Rank.COPPER, "copper_kg")],
)
def test_the_best_comes_first(tables: Tables, rank: Rank, column: str) -> None:
    values = getattr(choose_chokes(tables, NEED, rank=rank).windings, column)
    assert (np.diff(values) >= 0.0).all()
    assert values[0] < values[-1]


def test_nothing_beats_the_pareto_set(chosen: ChokeChoice) -> None:
    volume, loss = chosen.windings.volume_m3, chosen.windings.total_loss_w
    for index in chosen.pareto:
        better = (volume <= volume[index]) & (loss <= loss[index])
        better &= (volume < volume[index]) | (loss < loss[index])
        assert not better.any()
    worse = np.setdiff1d(np.arange(len(chosen)), chosen.pareto)[::50]
    for index in worse:
        assert ((volume[chosen.pareto] <= volume[index]) & (loss[chosen.pareto] <= loss[index])).any()


@settings(deadline=None, max_examples=50)
@given(st.lists(st.tuples(st.integers(0, 20), st.integers(0, 20)), max_size=30))
def test_pareto_set_by_brute_force(pairs: list[tuple[int, int]]) -> None:
    first = np.array([float(a) for a, _ in pairs])
    second = np.array([float(b) for _, b in pairs])
    found = {(first[i], second[i]) for i in pareto_set(first, second)}
    expected = {
        (a, b)
        for a, b in zip(first, second, strict=True)
        if not any((c <= a and d <= b) and (c < a or d < b) for c, d in zip(first, second, strict=True))
    }
    assert found == expected
    assert len(found) == len(pareto_set(first, second))


def test_all_windings_of_the_tables_are_judged(tables: Tables, chosen: ChokeChoice) -> None:
    published = int(chosen.columns.published[:, _useful(chosen.columns)].sum())
    thin = int((chosen.columns.wire.conductor <= ChokeLimits().conductor).sum())
    assert chosen.evaluated == published * 2 * thin * 4
    everything = choose_chokes(tables, NEED, space=ChokeSpace(unpublished=True))
    assert everything.evaluated > chosen.evaluated
    assert set(everything.rejected) == set(chosen.rejected)


def _useful(columns: ChokeColumns) -> list[int]:
    return [
        index
        for index, one in enumerate(columns.materials)
        if one.bias_field is not None and one.loss_coefficients is not None
    ]


def test_names_narrow_the_search(tables: Tables) -> None:
    space = ChokeSpace(
        rings=["26.9/14.5/11.1"], materials=["iron powder 33 (a)"], wires=["0.8 mm", "1 mm"], strands=[1]
    )
    found = choose_chokes(tables, NEED, space=space)
    assert 0 < found.evaluated <= 4
    assert found.columns.rings[0].name == "R 26.9/14.5/11.1"
    with pytest.raises(UnknownNameError):
        choose_chokes(tables, NEED, space=ChokeSpace(rings=["R 1/2/3"]))


def test_nothing_that_does_it_is_an_empty_choice(tables: Tables) -> None:
    hard = ChokeNeed(inductance=20e-3, current=25.0, ripple=0.6, frequency=20e3)
    found = choose_chokes(tables, hard)
    assert len(found) == 0
    assert found.pareto.size == 0
    assert found.rejected["core too hot"] > 0
    tiny = choose_chokes(tables, NEED, space=ChokeSpace(wires=["3.55 mm"]))
    assert (len(tiny), tiny.evaluated) == (0, 0)


@pytest.mark.parametrize(
    "wrong",
    [
        {"inductance": 0.0},
        {"current": -1.0},
        {"ripple": float("nan")},
        {"frequency": 0.0},
        {"duty": 1.0},
        {"worst_current": 1.0},
    ],
)
def test_senseless_needs_are_refused(wrong: dict[str, float]) -> None:
    values = {"inductance": 1e-4, "current": 2.0, "ripple": 0.5, "frequency": 2e4} | wrong
    with pytest.raises(InputError, match=next(iter(wrong)).replace("_", ".")):
        ChokeNeed(**values)


@pytest.mark.parametrize("space", [ChokeSpace(strands=[0]), ChokeSpace(stacks=[1.5])])  # type: ignore[list-item]
def test_senseless_numbers_are_refused(tables: Tables, space: ChokeSpace) -> None:
    with pytest.raises(InputError, match="whole number"):
        choose_chokes(tables, NEED, space=space)
