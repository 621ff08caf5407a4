"""Inductance against direct current: the table's law, own readings, the stored material."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from buckdesign.design.bias_points import BiasPoint, read_bias_points
from buckdesign.design.choke_bias import BiasRequest, bias_curve
from buckdesign.design.material_table import material_csv, material_file, store_material
from buckdesign.errors import FaultsError, FileAccessError, InputError, TableError
from buckdesign.parts import Material, Tables, load_tables
from buckdesign.physics.bias import ring_inductance_fraction

RING = "R 26.9/14.5/11.1"
PLAIN = "hydrogen-reduced iron 75"
REQUEST = BiasRequest(core=RING, material=PLAIN, turns=60)


@pytest.fixture(scope="module")
def tables() -> Tables:
    return load_tables(folder=Path("no own tables"))


def readings(half: float, exponent: float, inductance: float, noise: float = 0.0) -> list[BiasPoint]:
    """Readings on 60 turns of a ring with another law, with errors of a fixed seed."""
    rng = np.random.default_rng(3)
    current = np.array([0.0, 1.0, 2.0, 3.0, 5.0, 7.0])
    left = ring_inductance_fraction(60 * current, 26.9e-3, 14.5e-3, half, exponent)
    values = inductance * np.asarray(left) * (1.0 + rng.uniform(-noise, noise, size=len(current)))
    return [BiasPoint(current=float(i), inductance=float(v)) for i, v in zip(current, values, strict=True)]


class TestCurveOfTheTable:
    def test_it_passes_through_the_anchor(self, tables: Tables) -> None:
        # Maker's table at 50 Oe (3979 A/m), from memory: 51 % within 3 points for plain 75.
        curve = bias_curve(tables, REQUEST)
        left = curve.inductance_h / curve.inductance_h[0]
        at_anchor = np.interp(50 * 79.5775, curve.field_a_per_m, left)
        assert at_anchor == pytest.approx(0.51, abs=0.03)
        low = np.interp(50 * 79.5775, curve.field_a_per_m, curve.inductance_low_h) / curve.inductance_h[0]
        high = np.interp(50 * 79.5775, curve.field_a_per_m, curve.inductance_high_h) / curve.inductance_h[0]
        assert at_anchor - low == pytest.approx(0.03, abs=0.01)
        assert high - at_anchor == pytest.approx(0.03, abs=0.01)

    def test_it_falls_within_its_band(self, tables: Tables) -> None:
        curve = bias_curve(tables, REQUEST)
        assert curve.inductance_h[0] == pytest.approx(3600 * 90e-9)
        assert (np.diff(curve.inductance_h) < 0.0).all()
        assert (curve.inductance_low_h <= curve.inductance_h).all()
        assert (curve.inductance_h <= curve.inductance_high_h).all()
        assert curve.field_a_per_m[-1] <= 11.94e3 * (1 + 1e-9)

    def test_stack_and_permeability_scale_it(self, tables: Tables) -> None:
        other = BiasRequest(core=RING, material=PLAIN, turns=60, stack=2, permeability=0.9)
        once, twice = bias_curve(tables, REQUEST), bias_curve(tables, other)
        np.testing.assert_allclose(twice.inductance_h, 1.8 * once.inductance_h)

    def test_beyond_the_law_it_is_said(self, tables: Tables) -> None:
        far = BiasRequest(core=RING, material=PLAIN, turns=60, most_current=20.0)
        assert any("guess" in text for text in bias_curve(tables, far).warnings)

    def test_without_a_law_there_is_no_curve(self, tables: Tables) -> None:
        for name, word in (
            ("manganese-zinc ferrite 2300", "saturates"),
            ("nickel-iron powder 60", "readings"),
        ):
            with pytest.raises(InputError, match=word):
                bias_curve(tables, BiasRequest(core=RING, material=name, turns=10))

    @pytest.mark.parametrize(
        "wrong", [{"turns": 0}, {"stack": -1}, {"most_current": 0.0}, {"permeability": -1.0}]
    )
    def test_senseless_requests_are_refused(self, wrong: dict[str, float]) -> None:
        values = {"core": RING, "material": PLAIN, "turns": 60} | wrong
        with pytest.raises(InputError, match=next(iter(wrong)).split("_")[-1]):
            BiasRequest(**values)  # type: ignore[arg-type]


class TestOwnReadings:
    def test_the_law_is_found_again(self, tables: Tables) -> None:
        curve = bias_curve(tables, REQUEST, readings(6000.0, 1.4, 330e-6))
        assert curve.fit is not None
        assert curve.law.half_field_a_per_m == pytest.approx(6000.0, rel=0.02)
        assert curve.law.exponent == pytest.approx(1.4, abs=0.05)
        assert curve.fit.inductance_h == pytest.approx(330e-6, rel=0.01)
        assert curve.fit.rms_residual < 0.005

    def test_the_truth_lies_in_the_band(self, tables: Tables) -> None:
        curve = bias_curve(tables, REQUEST, readings(6000.0, 1.4, 330e-6, noise=0.03))
        drive = 60 * curve.current_a
        truth = 330e-6 * np.asarray(ring_inductance_fraction(drive, 26.9e-3, 14.5e-3, 6000.0, 1.4))
        inside = (curve.inductance_low_h <= truth) & (truth <= curve.inductance_high_h)
        assert inside.mean() > 0.9

    def test_one_reading_leans_on_the_table_and_says_so(self, tables: Tables) -> None:
        curve = bias_curve(tables, REQUEST, [BiasPoint(current=3.0, inductance=210e-6)])
        assert curve.law.exponent == pytest.approx(1.5, abs=0.05)
        assert np.interp(3.0, curve.current_a, curve.inductance_h) == pytest.approx(210e-6, rel=0.02)
        assert any("fewer than three" in text for text in curve.warnings)

    def test_another_material_is_suspected(self, tables: Tables) -> None:
        curve = bias_curve(tables, REQUEST, readings(4086.0, 1.5, 220e-6))
        assert any("another material" in text for text in curve.warnings)

    def test_scatter_is_said(self, tables: Tables) -> None:
        points = readings(4086.0, 1.5, 324e-6, noise=0.15)
        assert any("scatter" in text for text in bias_curve(tables, REQUEST, points).warnings)

    def test_a_material_without_a_law_gets_one(self, tables: Tables) -> None:
        request = BiasRequest(core=RING, material="iron-silicon-aluminium powder 60", turns=60)
        curve = bias_curve(tables, request, readings(9000.0, 1.6, 290e-6))
        assert curve.law.half_field_a_per_m == pytest.approx(9000.0, rel=0.05)


class TestStoredMaterial:
    @pytest.fixture
    def material(self, tables: Tables) -> Material:
        found = bias_curve(tables, REQUEST, readings(6000.0, 1.4, 330e-6)).fitted_material
        assert found is not None
        return found

    def test_the_loader_reads_it_back(self, material: Material, tmp_path: Path) -> None:
        path = store_material(material, tmp_path / "own.csv")
        own = load_tables([path], folder=tmp_path / "none")
        again = own.material(material.name)
        assert again.bias_field == pytest.approx(material.bias_field, rel=1e-8)
        assert again.permeability_tolerance == pytest.approx(material.permeability_tolerance)
        assert again.loss_coefficients == material.loss_coefficients
        assert again.how == "fitted"
        assert own.check() == load_tables(folder=tmp_path / "none").check()
        curve = bias_curve(own, BiasRequest(core=RING, material=material.name, turns=60))
        assert curve.inductance_h[0] == pytest.approx(330e-6, rel=0.01)

    def test_it_is_found_in_the_own_folder(
        self, material: Material, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
        path = store_material(material)
        assert path == material_file(material) and tmp_path in path.parents
        assert load_tables().material(material.name).kind == "iron powder"

    def test_only_another_content_needs_force(self, material: Material, tmp_path: Path) -> None:
        path = tmp_path / "own.csv"
        store_material(material, path)
        store_material(material, path)
        path.write_text("something else\n", encoding="utf-8")
        with pytest.raises(FileAccessError, match="force"):
            store_material(material, path)
        assert path.read_text(encoding="utf-8") == "something else\n"
        store_material(material, path, force=True)
        assert path.read_text(encoding="utf-8") == material_csv(material)


class TestReadingsFile:
    @pytest.mark.parametrize(
        "text",
        [
            "current_a,inductance_uh\n0,330\n2.5,250\n",
            "# own bench, invented\n\ncurrent [mA],note,inductance [mH]\n0,first,0.33\n2500,second,0.25\n",
            "\ufeffinductance_nh,current_a\n330000,0\n250000,2.5\n",
        ],
    )
    def test_units_stand_in_the_header(self, tmp_path: Path, text: str) -> None:
        path = tmp_path / "readings.csv"
        path.write_text(text, encoding="utf-8")
        first, second = read_bias_points(path)
        assert (first.current, first.inductance) == (0.0, pytest.approx(330e-6))
        assert (second.current, second.inductance) == (pytest.approx(2.5), pytest.approx(250e-6))

    @pytest.mark.parametrize(
        ("text", "message"),
        [
            ("", "is empty"),
            ("current_a,ripple_v\n1,2\n", "inductance: is missing"),
            ("current_v,inductance_uh\n1,2\n", "current_v"),
            ("current_a,inductance_uh\n0,330\n", "at least one reading under bias"),
        ],
    )
    def test_a_wrong_table_is_refused(self, tmp_path: Path, text: str, message: str) -> None:
        path = tmp_path / "readings.csv"
        path.write_text(text, encoding="utf-8")
        with pytest.raises((TableError, FaultsError), match=message):
            read_bias_points(path)

    def test_all_faults_at_once_with_their_lines(self, tmp_path: Path) -> None:
        path = tmp_path / "readings.csv"
        path.write_text("current_a,inductance_uh\n1,x\n-2,300\n3,0\n4\n", encoding="utf-8")
        with pytest.raises(FaultsError) as caught:
            read_bias_points(path)
        lines = str(caught.value).splitlines()
        assert [line.split(":")[1] for line in lines] == ["2", "3", "4", "5"]
        assert 'inductance = "x"' in lines[0] and 'current = "-2"' in lines[1]

    def test_files_that_cannot_be_read(self, tmp_path: Path) -> None:
        with pytest.raises(FileAccessError):
            read_bias_points(tmp_path / "none.csv")
        binary = tmp_path / "binary.csv"
        binary.write_bytes(b"\xff\xfe\x00\x01")
        with pytest.raises(TableError, match="UTF-8"):
            read_bias_points(binary)
