"""The open core table: geometry, A_L, bias anchors and loss against what is published."""

import csv
import math
import re
from collections.abc import Mapping
from pathlib import Path

import numpy as np
import pytest

from buckdesign.constants import MU_0, OERSTED
from buckdesign.parts import Material, Ring, Tables, load_tables

PUBLISHED = Path(__file__).parent / "published"
CORES = Path(__file__).parents[1] / "cores_data"


def published(name: str, *quantities: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8") as file:
        return [row for row in csv.DictReader(file) if row["quantity"] in quantities]


def inputs(row: Mapping[str, str]) -> dict[str, str]:
    return dict(pair.split("=") for pair in row["inputs"].split("; "))


def core_constant(ring: Ring) -> float:
    """C1 of a ring with rectangular section [1/m]; IEC 60205 (from memory)."""
    return 2.0 * math.pi / (ring.height * math.log(ring.outer_diameter / ring.inner_diameter))


def loss(material: Material, frequency: float, gauss: float) -> float:
    """Published three-term form [mW/cm3]."""
    coefficients = material.loss_coefficients
    assert coefficients is not None
    a, b, c, d = coefficients
    return frequency / (a / gauss**3 + b / gauss**2.3 + c / gauss**1.65) + d * frequency**2 * gauss**2


@pytest.fixture(scope="module")
def tables(tmp_path_factory: pytest.TempPathFactory) -> Tables:
    return load_tables(folder=tmp_path_factory.mktemp("nothing"))


def test_size_of_the_table(tables: Tables) -> None:
    assert len(tables.rings) == 28
    assert sum(len(factors) for factors in tables.inductance_factors.values()) == 146
    permeabilities = {tables.materials[material].permeability for _, material in tables.inductance_factors}
    assert permeabilities == {75.0, 100.0, 60.0, 55.0, 35.0, 25.0, 20.0, 10.0, 9.0, 8.5}


def test_rings_are_named_by_their_dimensions(tables: Tables) -> None:
    for ring in tables.rings.values():
        parts = (ring.outer_diameter, ring.inner_diameter, ring.height)
        assert ring.name == "R " + "/".join(f"{part * 1e3:g}" for part in parts)
    shapes = {(ring.outer_diameter, ring.inner_diameter, ring.height) for ring in tables.rings.values()}
    assert len(shapes) == len(tables.rings)


def test_published_effective_values_of_one_ring(tables: Tables) -> None:
    """Iron-powder catalogues: 64.9-65.0 mm, 65.9 mm2, 4.28 cm3 (from memory; volume confirmed)."""
    ring = tables.ring("R 26.9/14.5/11.1")
    assert ring.effective_length is not None
    assert 64.9e-3 <= ring.effective_length <= 65.0e-3
    assert ring.effective_area == pytest.approx(65.9e-6, rel=1e-12)
    assert ring.effective_volume == pytest.approx(4.28e-6, rel=1e-12)


def test_effective_values_follow_from_the_dimensions(tables: Tables) -> None:
    """Mean circumference and rounded section of the catalogues' convention (README of the table)."""
    known = [ring for ring in tables.rings.values() if ring.effective_length is not None]
    assert len(known) == 25
    for ring in known:
        assert ring.effective_length is not None
        assert ring.effective_area is not None
        mean = math.pi * (ring.outer_diameter + ring.inner_diameter) / 2.0
        rectangle = (ring.outer_diameter - ring.inner_diameter) / 2.0 * ring.height
        assert ring.effective_length == pytest.approx(mean, rel=0.01), ring.name
        assert 0.88 <= ring.effective_area / rectangle <= 0.97, ring.name
        assert ring.effective_volume == pytest.approx(
            ring.effective_length * ring.effective_area, rel=0.01
        ), ring.name


@pytest.mark.parametrize("row", published("al.csv", "A_L listed"), ids=lambda row: row["inputs"])
def test_listed_inductance_factor(tables: Tables, row: dict[str, str]) -> None:
    given = inputs(row)
    key = (tables.ring(given["ring"]).name, given["material"])
    listed = [factor for factor in tables.inductance_factors[key] if factor.how.startswith("looked up")]
    assert [factor.al for factor in listed] == [pytest.approx(float(row["expected"]) * 1e-9, rel=1e-12)]


def test_inductance_factor_by_formula(tables: Tables) -> None:
    (row,) = published("al.csv", "A_L formula")
    given = inputs(row)
    al = MU_0 * float(given["permeability"]) / core_constant(tables.ring(given["ring"]))
    assert al == pytest.approx(float(row["expected"]) * 1e-9, rel=float(row["rel_tol"]))


def test_turns_of_the_published_example(tables: Tables) -> None:
    (row,) = published("al.csv", "turns")
    given = inputs(row)
    factor = tables.inductance_factor(given["ring"], given["material"])
    assert factor is not None
    assert math.sqrt(12e-6 / factor.al) == pytest.approx(float(row["expected"]), rel=float(row["rel_tol"]))


def outliers(tables: Tables) -> set[tuple[str, str, str]]:
    """Ring, material and A_L in nH of the rows outside the bands around the formula."""
    bands = {
        (inputs(row)["permeability"], row["quantity"]): float(row["expected"])
        for row in published("al.csv", "lowest ratio", "highest ratio")
    }
    found = set()
    for (ring, material), factors in tables.inductance_factors.items():
        permeability = tables.materials[material].permeability
        band = "75" if permeability == 75.0 else "other"
        formula = MU_0 * permeability / core_constant(tables.rings[ring])
        for factor in factors:
            ratio = factor.al / formula
            if not bands[band, "lowest ratio"] <= ratio <= bands[band, "highest ratio"]:
                found.add((ring, material, f"{factor.al * 1e9:g}"))
    return found


def test_inductance_factors_agree_with_geometry_or_are_listed_as_outliers(tables: Tables) -> None:
    section = (CORES / "README.md").read_text(encoding="utf-8").split("### Outliers")[1].split("## ")[0]
    rows = re.findall(r"^\| (R [^|]+?) \| ([^|]+?) \| ([0-9.]+) \|", section, flags=re.MULTILINE)
    assert outliers(tables) == set(rows)
    for ring, material, al in rows:
        (row,) = [
            factor for factor in tables.inductance_factors[ring, material] if f"{factor.al * 1e9:g}" == al
        ]
        assert row.suspect


def test_a_suspect_value_gives_way(tables: Tables) -> None:
    factor = tables.inductance_factor("R 39.9/24.1/14.5", "hydrogen-reduced iron 75")
    assert factor is not None
    assert not factor.suspect
    assert factor.al == pytest.approx(100e-9, rel=1e-12)


def test_looked_up_goes_before_recalled(tables: Tables) -> None:
    factor = tables.inductance_factor("R 26.9/14.5/11.1", "hydrogen-reduced iron 75")
    assert factor is not None
    assert factor.al == pytest.approx(90e-9, rel=1e-12)
    assert len(tables.inductance_factors["R 26.9/14.5/11.1", "hydrogen-reduced iron 75"]) == 2


def test_recalled_list_is_near_the_looked_up_one(tables: Tables) -> None:
    for factors in tables.inductance_factors.values():
        for other in factors[1:]:
            assert other.suspect or other.al == pytest.approx(factors[0].al, rel=0.05)


def test_the_low_loss_grade_shares_the_list(tables: Tables) -> None:
    for (ring, material), factors in tables.inductance_factors.items():
        if material == "hydrogen-reduced iron 75":
            assert tables.inductance_factor(ring, "hydrogen-reduced iron 75 low loss") == factors[0]
    assert tables.inductance_factor("R 26.9/14.5/11.1", "manganese-zinc ferrite 2200") is None


ANCHORS = {
    "carbonyl iron 10": 0.99,
    "iron powder 35 low loss": 0.91,
    "iron powder 33 (a)": 0.84,
    "iron powder 33 (b)": 0.84,
    "iron powder 55 low loss": 0.74,
    "hydrogen-reduced iron 60": 0.62,
    "hydrogen-reduced iron 75 low loss": 0.59,
    "hydrogen-reduced iron 75": 0.51,
    "iron powder 100": 0.46,
}
"""Share of the initial permeability at 50 Oe; maker's table (from memory, 3 points either way)."""


def test_bias_law_is_exact_at_its_anchor(tables: Tables) -> None:
    for name, share in ANCHORS.items():
        material = tables.material(name)
        assert material.bias_field is not None
        assert material.bias_exponent is not None
        law = 1.0 / (1.0 + (50.0 * OERSTED / material.bias_field) ** material.bias_exponent)
        assert law == pytest.approx(share, rel=1e-8), name
        assert material.bias_anchor == pytest.approx(share, rel=1e-12)
        assert material.bias_anchor_field == pytest.approx(50.0 * OERSTED, rel=1e-10)


def test_half_fields_of_the_two_common_grades(tables: Tables) -> None:
    """51.4 Oe and 63.7 Oe with exponent 1.5 (derived from the anchors)."""
    for name, oersted in (("hydrogen-reduced iron 75", 51.4), ("hydrogen-reduced iron 75 low loss", 63.7)):
        material = tables.material(name)
        assert material.bias_exponent == 1.5
        assert material.bias_field == pytest.approx(oersted * OERSTED, rel=1e-3)


def test_bias_law_stays_below_saturation(tables: Tables) -> None:
    """mu falls monotonically and its integral over the field stays below the saturation estimate."""
    for material in tables.materials.values():
        if material.kind != "iron powder":
            assert material.bias_field is None
            continue
        assert material.bias_field is not None
        assert material.bias_exponent is not None
        assert material.bias_field_limit is not None
        assert material.saturation is not None
        field = np.linspace(0.0, material.bias_field_limit, 2001)
        mu = material.permeability / (1.0 + (field / material.bias_field) ** material.bias_exponent)
        assert np.all(np.diff(mu) < 0.0)
        assert MU_0 * np.trapezoid(mu, field) < material.saturation, material.name


def test_a_higher_permeability_sags_more(tables: Tables) -> None:
    powders = [one for one in tables.materials.values() if one.kind == "iron powder"]
    carbonyl = sorted(
        (one for one in powders if one.name.startswith("carbonyl")), key=lambda one: one.permeability
    )
    anchors = [one.bias_anchor or 0.0 for one in carbonyl]
    assert anchors == sorted(anchors, reverse=True)
    assert all(0.4 < (one.bias_anchor or 0.0) < 1.0 for one in powders)


@pytest.mark.parametrize("row", published("loss.csv", "loss density table"), ids=lambda row: row["inputs"])
def test_loss_against_the_published_table(tables: Tables, row: dict[str, str]) -> None:
    """Within 1.5 % or the rounding of the table, which is printed without decimals."""
    given = inputs(row)
    frequency, gauss = float(given["frequency"].split()[0]), float(given["flux"].split()[0])
    expected = float(row["expected"])
    value = loss(tables.material(given["material"]), frequency, gauss)
    assert value == pytest.approx(expected, rel=float(row["rel_tol"]), abs=0.5)
    (point,) = [
        point
        for point in tables.loss_points[given["material"]]
        if point.frequency == frequency and point.flux_density == pytest.approx(gauss * 1e-4)
    ]
    assert point.loss_density == pytest.approx(expected * 1e3)


@pytest.mark.parametrize("row", published("loss.csv", "loss density"), ids=lambda row: row["inputs"])
def test_loss_by_formula(tables: Tables, row: dict[str, str]) -> None:
    given = inputs(row)
    frequency, gauss = float(given["frequency"].split()[0]), float(given["flux"].split()[0])
    value = loss(tables.material(given["material"]), frequency, gauss)
    assert value == pytest.approx(float(row["expected"]), rel=float(row["rel_tol"]))


def test_every_loss_point_of_the_table(tables: Tables) -> None:
    assert sum(len(points) for points in tables.loss_points.values()) == 66
    for name, points in tables.loss_points.items():
        for point in points:
            value = loss(tables.material(name), point.frequency, point.flux_density * 1e4)
            assert value == pytest.approx(point.loss_density * 1e-3, rel=0.015, abs=0.5), point


def test_borrowed_loss_coefficients_say_so(tables: Tables) -> None:
    for material in tables.materials.values():
        if material.loss_as:
            assert material.loss_coefficients == tables.material(material.loss_as).loss_coefficients
            assert material.loss_how.startswith("assumed")
        elif material.kind == "iron powder":
            assert material.name in tables.loss_points


def test_kinds_and_saturation(tables: Tables) -> None:
    """Saturation by kind: ferrites below 0.6 T, powders above it (from memory)."""
    for material in tables.materials.values():
        assert material.saturation is not None
        assert (material.saturation < 0.6) == (material.kind == "ferrite"), material.name
        if material.kind == "iron powder":
            assert material.permeability <= 100.0
            assert (material.temperature_advice_c, material.temperature_limit_c) == (85.0, 110.0)
    ferrites = {one.permeability for one in tables.materials.values() if one.kind == "ferrite"}
    powders = {one.permeability for one in tables.materials.values() if one.kind == "other powder"}
    assert {2000.0, 2300.0, 3000.0, 5000.0, 10000.0, 800.0, 1000.0} <= ferrites
    assert {60.0, 75.0, 90.0, 125.0, 147.0, 160.0, 200.0, 300.0, 550.0} <= powders


def test_readme_names_every_column() -> None:
    text = (CORES / "README.md").read_text(encoding="utf-8")
    for path in sorted(CORES.glob("*.csv")):
        lines = path.read_text(encoding="utf-8").splitlines()
        assert lines[0].startswith("# Origin:"), path
        assert "CC0" in lines[0], path
        (header, *_) = [line for line in lines if not line.startswith("#")]
        section = text.split(f"## `{path.name}`")[1].split("\n## ")[0]
        for cell in header.split(","):
            name = cell.split(" [")[0]
            assert f"`{name}`" in section or name in ("loss_b", "loss_c"), (path, name)
