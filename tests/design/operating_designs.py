"""Designs for the tests of operating points: a bench supply of common practice, and loops of every regime.

The bench supply is the trade's usual example (common practice, no source): 20 V to 15 V at 3 A with a 200 uH
iron-powder choke, a 10 A class PNP and two ultrafast diodes in parallel; the parts round them are invented.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.design_file import Design, design_from_tree, design_with
from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.operating import operate_rows, points_of, rows_at
from buckdesign.design.resolve import resolve_design
from buckdesign.loop.parameters import COLUMN

BENCH = """
[supply]
voltage = "20 V"
[output]
voltage = "15 V"
current = "3 A"
[regulator]
part = "adjustable 1.5 A"
[network]
r1 = "240 ohm"
r2 = "2.7 kohm"
rh = "1 Mohm"
rbe = "22 ohm"
rdrive = "4.7 ohm"
rdrive_power = "5 W"
rbe_power = "0.25 W"
[transistor]
part = "2N3791"
[rectifier]
part = "1N5809"
parallel = 2
[choke]
core = "R 26.9/14.5/11.1"
material = "hydrogen-reduced iron 75"
turns = 47
wire = "1.0 mm"
[output_capacitor]
part = "low-impedance electrolytic 470 uF 25 V"
[input_capacitor]
part = "low-impedance electrolytic 1000 uF 35 V"
[thermal]
ambient = "25 degC"
heatsink = "3 K/W"
on_heatsink = ["transistor", "regulator", "rectifier"]
pad = "0.5 K/W"
"""

REQUIREMENT = """
[requirement.supply]
voltage = ["18 V", "20 V", "22 V"]
[requirement.output]
voltage = "15 V"
current = ["20 mA", "3 A"]
ripple = "250 mV"
tolerance = "5 %"
[requirement.limits]
frequency = ["4 kHz", "20 kHz"]
efficiency = 0.80
"""

BOUGHT = {
    "choke.core": None,
    "choke.material": None,
    "choke.turns": None,
    "choke.wire": None,
    "choke.inductance": "200 uH",
    "choke.resistance": "60 mohm",
    "choke.saturation": "6 A",
}
"""A bought choke instead of the winding."""


@cache
def _parsed(text: str) -> Design:
    return design_from_tree(tomllib.loads(text), lambda *steps: None, path=Path("bench.design.toml"))


def bench(changes: Mapping[str, Any] | None = None, *, requirement: bool = False) -> Design:
    """The bench supply, some of its values changed."""
    made = _parsed(BENCH + REQUIREMENT if requirement else BENCH)
    return design_with(made, changes) if changes else made


def resolved_bench(
    changes: Mapping[str, Any] | None = None, *, requirement: bool = False
) -> ResolvedDesign:
    return resolve_design(bench(changes, requirement=requirement))


def operated_bench(changes: Mapping[str, Any] | None = None, **points: Any) -> Any:
    """The bench supply operated at some points."""
    resolved = resolved_bench(changes)
    where = points_of(resolved, **points)
    return operate_rows(rows_at(resolved, where), resolved, where.ambient_c)


def random_rows(count: int, seed: int) -> NDArray[np.float64]:
    """Loop parameters of random supplies in all regimes (population of the loop's own benchmark, invented).

    A tenth each have no load, a load far above what the drive can carry, and too little supply.
    """
    draw = np.random.default_rng(seed)
    rows = np.repeat(rows_at(resolved_bench(), points_of(resolved_bench())), count, axis=0)

    def put(name: str, values: Any) -> None:
        rows[:, COLUMN[name]] = values

    supply = draw.uniform(15.0, 34.0, count)
    output = draw.uniform(4.0, supply - 5.0)
    coupled = draw.random(count) < 0.5
    put("supply_voltage", supply)
    put("r2", 240.0 * (output / 1.25 - 1.0))
    put(
        "hysteresis_resistance",
        np.where(
            coupled, np.exp(draw.uniform(*np.log([1e4, 8e4]), count)), draw.uniform(160e3, 3e6, count)
        ),
    )
    put("hysteresis_capacitance", np.where(coupled, draw.uniform(100e-12, 600e-12, count), 0.0))
    for name, low, high in (
        ("output_inductance", 0.04e-6, 0.25e-6),
        ("charge_time", 0.3e-6, 2e-6),
        ("gain", 25.0, 70.0),
        ("inductance", 100e-6, 630e-6),
        ("capacitance", 250e-6, 1600e-6),
        ("esr", 0.03, 0.2),
        ("load_current", 0.1, 3.0),
    ):
        put(name, draw.uniform(low, high, count))
    kind = draw.integers(0, 10, count)
    rows[kind == 0, COLUMN["load_current"]] = 0.0
    rows[kind == 1, COLUMN["load_current"]] = 40.0
    low = kind == 2
    rows[low, COLUMN["supply_voltage"]] = output[low] + 1.0
    return rows
