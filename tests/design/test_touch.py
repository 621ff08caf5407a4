"""Hot surfaces: which they are, how hot, and how long a hand may stay."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from buckdesign.design.operating import operate, points_of
from buckdesign.design.touch import surfaces, touch_cautions

from .operating_designs import BOUGHT, operated_bench, resolved_bench


def found(changes: Any = None, **points: Any) -> dict[str, float]:
    operated = operated_bench(changes, **points)
    return {one.name: float(one.temperature_c.max()) for one in surfaces(operated, resolved_bench(changes))}


def test_the_common_sink_carries_the_heat_of_all_on_it() -> None:
    operated = operated_bench()
    losses = operated.balance.losses
    inside = (
        "transistor_conduction", "transistor_switching", "transistor_leakage", "base", "rectifier_recovery",
        "regulator", "rectifier", "rectifier_leakage",
    )  # fmt: skip
    # derived: 3 K/W for everything that becomes heat in the three devices
    expected = 25.0 + 3.0 * sum(losses[name][0] for name in inside)
    assert found() == {
        "heat sink": pytest.approx(expected),
        "choke": pytest.approx(operated.balance.choke_c[0]),
    }


def test_own_sinks_and_cases_in_free_air() -> None:
    changes = {
        "thermal.heatsink": None,
        "thermal.on_heatsink": None,
        "thermal.transistor.heatsink": "5 K/W",
    }
    operated, resolved = operated_bench(changes), resolved_bench(changes)
    made = found(changes)
    assert made.keys() == {"heat sink of the transistor", "regulator case", "rectifier case", "choke"}
    junction, heat = operated.junction("regulator")[0], operated.balance.losses["regulator"][0]
    assert made["regulator case"] == pytest.approx(junction - resolved.regulator.junction_case * heat)
    assert 25.0 < made["heat sink of the transistor"] < operated.junction("transistor")[0]


@pytest.mark.parametrize(
    ("sink", "verdict"),
    [("8 K/W", "10 s at most"), ("10 K/W", "1 s at most"), ("16 K/W", "not at all")],
)
def test_each_surface_says_how_long_it_may_be_touched(sink: str, verdict: str) -> None:
    # IEC 62368-1 table 38, metal: 48, 51, 60, 70 degC for long, 1 min, 10 s, 1 s (from memory)
    changes = {"thermal.heatsink": sink}
    celsius = found(changes)["heat sink"]
    limits = {"10 s at most": (51.0, 60.0), "1 s at most": (60.0, 70.0), "not at all": (70.0, np.inf)}[verdict]
    assert limits[0] < celsius <= limits[1]
    (text,) = touch_cautions(operated_bench(changes), resolved_bench(changes))
    assert f"heat sink {celsius:.0f} degC, {verdict}" in text
    assert "IEC 62368-1 table 38, from memory" in text


def test_the_hottest_point_is_named_and_the_same_at_all() -> None:
    changes = {"thermal.heatsink": "10 K/W"}
    resolved = resolved_bench(changes)
    points = operate(resolved, points_of(resolved, load_current=[0.5, 3.0], ambient_c=40.0))
    first, last = ([text for text in one.cautions if "hot to the touch" in text] for one in points)
    assert first == last and "(at 20 V, 3 A, 40 degC)" in first[0]


def test_cool_surfaces_need_no_word() -> None:
    changes = BOUGHT | {"thermal.heatsink": "1 K/W"}
    assert touch_cautions(operated_bench(changes), resolved_bench(changes)) == []
