"""Temperatures: correlations against the libraries `ht` and `fluids`, inverses, bands."""

from __future__ import annotations

import numpy as np
import pytest
from fluids.atmosphere import ATMOSPHERE_1976
from ht.conv_free_immersed import Nu_horizontal_cylinder_Churchill_Chu, Nu_vertical_plate_Churchill
from hypothesis import given
from hypothesis import strategies as st

from buckdesign.physics import convection, thermal


@given(st.floats(1e-2, 1e10), st.floats(0.6, 0.8))
def test_cylinder_against_ht(rayleigh: float, prandtl: float) -> None:
    expected = Nu_horizontal_cylinder_Churchill_Chu(prandtl, rayleigh / prandtl)
    assert convection.horizontal_cylinder_nusselt(rayleigh, prandtl) == pytest.approx(expected, rel=1e-10)


@given(st.floats(1e-1, 1e11), st.floats(0.6, 0.8))
def test_plate_against_ht(rayleigh: float, prandtl: float) -> None:
    expected = Nu_vertical_plate_Churchill(prandtl, rayleigh / prandtl)
    assert convection.vertical_plate_nusselt(rayleigh, prandtl) == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize("height", [0.0, 2000.0, 8000.0])
def test_air_against_fluids(height: float) -> None:
    air = ATMOSPHERE_1976(height)
    celsius = air.T - 273.15
    assert convection.air_viscosity(celsius) == pytest.approx(air.mu, rel=1e-6)
    assert convection.air_conductivity(celsius) == pytest.approx(air.k, rel=1e-6)


@pytest.mark.parametrize(
    ("celsius", "viscosity", "conductivity", "prandtl"),
    [
        (26.85, 184.6e-7, 26.3e-3, 0.707),
        (76.85, 208.2e-7, 30.0e-3, 0.700),
        (126.85, 230.1e-7, 33.8e-3, 0.690),
    ],
)
def test_air_against_a_textbook(
    celsius: float, viscosity: float, conductivity: float, prandtl: float
) -> None:
    """Incropera and DeWitt, Fundamentals of Heat and Mass Transfer, table A.4 (from memory)."""
    assert convection.air_viscosity(celsius) == pytest.approx(viscosity, rel=0.01)
    assert convection.air_conductivity(celsius) == pytest.approx(conductivity, rel=0.01)
    assert convection.air_prandtl(celsius) == pytest.approx(prandtl, rel=0.02)


def test_rayleigh_number_of_a_textbook_plate() -> None:
    """A 0.1 m plate at 75 degC in 25 degC air: nu 18.0e-6 m2/s, Pr 0.704 (from memory)."""
    expected = 9.81 * 50.0 * 1e-3 / 323.15 / 18.0e-6**2 * 0.704
    assert convection.rayleigh_number(50.0, 0.1, 50.0) == pytest.approx(expected, rel=0.02)


def test_simplified_plate_lies_within_its_physics_band() -> None:
    """CV-28: 20 % against the full correlation (derived)."""
    rise, height = 50.0, 0.1
    rayleigh = convection.rayleigh_number(rise, height, 50.0)
    nusselt = convection.vertical_plate_nusselt(rayleigh, convection.air_prandtl(50.0))
    full = nusselt * convection.air_conductivity(50.0) / height
    assert convection.plate_convection(rise, height) == pytest.approx(full, rel=0.2)


@given(st.floats(0.01, 30.0), st.floats(3e-4, 3e-2), st.floats(-20.0, 60.0), st.floats(0.05, 0.95))
def test_ring_rise_is_the_inverse_of_the_heat_flow(
    power: float, surface: float, ambient: float, emissivity: float
) -> None:
    diameter = np.sqrt(surface / 4.0)
    rise = convection.ring_rise(power, surface, diameter, ambient, emissivity)
    if rise < 250.0:
        back = convection.ring_heat_flow(rise, surface, diameter, ambient, emissivity)
        assert back == pytest.approx(power, rel=1e-6)


def test_two_methods_stay_within_a_factor_of_two() -> None:
    """The makers' rule is good to 25 %, the correlation to 20 % (from memory)."""
    power = np.array([0.2, 0.5, 1.0, 2.0, 4.0])
    rule = thermal.ring_rise_surface_rule(power, 31e-4)
    model = convection.ring_rise(power, 31e-4, 29e-3, 25.0)
    assert np.all((model / rule > 0.5) & (model / rule < 2.0))
    assert convection.ring_rise(0.0, 31e-4, 29e-3, 25.0) == 0.0


@given(st.floats(0.01, 20.0), st.floats(1e-4, 1e-1))
def test_surface_rule_slope_and_inverse(power: float, surface: float) -> None:
    rise = thermal.ring_rise_surface_rule(power, surface)
    assert thermal.ring_power_surface_rule(rise, surface) == pytest.approx(power)
    assert np.log2(thermal.ring_rise_surface_rule(2 * power, surface) / rise) == pytest.approx(0.833)


@given(st.floats(0.1, 30.0), st.floats(0.2, 5.0), st.floats(0.1, 2.0))
def test_ladder_and_needed_sink_are_inverse(power: float, case: float, pad: float) -> None:
    sink = thermal.sink_resistance_needed(power, 125.0, 40.0, case, pad)
    assert thermal.junction_temperature(power, 40.0, case, pad, sink) == pytest.approx(125.0)


def test_shared_sink_of_many_designs() -> None:
    power = np.array([[3.0, 1.0, 0.5], [6.0, 0.0, 0.0]])
    case, pad = np.array([1.0, 5.0, 2.0]), np.array([0.5, 1.5, 1.0])
    sink = np.array([4.0, 3.0])
    junction = thermal.shared_sink_junctions(power, 25.0, case, pad, sink)
    assert junction.shape == (2, 3)
    assert junction[1].tolist() == pytest.approx([43.0 + 9.0, 43.0, 43.0])
    alone = thermal.junction_temperature(6.0, 25.0, 1.0, 0.5, 3.0)
    assert junction[1, 0] == pytest.approx(alone)


def test_ageing_limits_are_in_order() -> None:
    assert thermal.CORE_UNAFFECTED_C < thermal.CORE_WARNING_C < thermal.CORE_FAULT_C
    for mountings in thermal.INSULATOR_RESISTANCE.values():
        assert all(0.0 < low < high for low, high in mountings.values())
