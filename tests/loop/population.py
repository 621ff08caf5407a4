"""A random population of designs as parameter rows; all ranges invented."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from buckdesign.loop.parameters import COLUMN, COLUMNS

Rows = NDArray[np.float64]


def _logarithmic(rng: np.random.Generator, low: float, high: float, n: int) -> Rows:
    return np.exp(rng.uniform(np.log(low), np.log(high), n))


def usual(n: int, seed: int) -> Rows:
    """Rows of the population that the speed is measured on, shape (n, len(COLUMNS))."""
    rng = np.random.default_rng(seed)
    supply = rng.uniform(15.0, 34.0, n)
    output = 4.0 + (supply - 9.0) * rng.random(n)
    coupled = rng.random(n) < 0.5
    columns = {
        "supply_voltage": supply,
        "r1": 240.0,
        "r2": (output - 1.25) / (1.25 / 240.0 + 50e-6),
        "hysteresis_resistance": np.where(
            coupled, _logarithmic(rng, 10e3, 80e3, n), _logarithmic(rng, 160e3, 3e6, n)
        ),
        "hysteresis_capacitance": np.where(coupled, rng.uniform(100e-12, 600e-12, n), 0.0),
        "reference": 1.25, "adjust_current": 50e-6,
        "output_inductance": rng.uniform(0.04e-6, 0.25e-6, n), "output_resistance": 2e-3,
        "quiescent_current": 0.0, "current_limit": 2.2, "current_limit_knee": np.inf,
        "current_limit_far_voltage": np.inf, "current_limit_far": 0.0,
        "dropout": 1.6, "dropout_resistance": 0.0, "drive_resistance": 22.0, "base_resistance": 22.0,
        "base_emitter": 0.75, "charge_time": rng.uniform(0.3e-6, 2e-6, n), "gain": rng.uniform(25.0, 70.0, n),
        "gain_knee": 8.0, "saturation_voltage": 0.2, "saturation_resistance": 0.1,
        "threshold": 0.35, "slope": 0.05, "recovery_charge": 0.0,
        "inductance": rng.uniform(100e-6, 630e-6, n), "bias_current": np.inf, "bias_exponent": 1.5,
        "choke_resistance": 0.08, "capacitance": rng.uniform(250e-6, 1600e-6, n),
        "esr": rng.uniform(0.03, 0.2, n), "load_current": rng.uniform(0.1, 3.0, n),
        "load_resistance": np.inf, "full_load": 3.0,
    }  # fmt: skip
    return _rows(columns, n)


def wide(n: int, seed: int) -> Rows:
    """Rows over all regimes, from no headroom to plenty, from milliamperes to overload, shape (n, len(COLUMNS))."""
    rng = np.random.default_rng(seed)
    rows = usual(n, seed)
    output = 1.25 + rows[:, COLUMN["r2"]] * (1.25 / 240.0 + 50e-6)
    load = _logarithmic(rng, 2e-3, 5.0, n)
    resistive = rng.random(n) < 0.4
    folded = rng.random(n) < 0.5
    columns = {
        "supply_voltage": output + _logarithmic(rng, 1.0, 25.0, n),
        "quiescent_current": np.where(rng.random(n) < 0.5, 0.0, 3.5e-3),
        "dropout_resistance": np.where(rng.random(n) < 0.5, 0.0, 0.4),
        "drive_resistance": _logarithmic(rng, 3.0, 60.0, n), "base_resistance": _logarithmic(rng, 8.0, 60.0, n),
        "bias_current": np.where(rng.random(n) < 0.5, np.inf, rng.uniform(2.0, 10.0, n)),
        "bias_exponent": rng.uniform(1.2, 1.6, n),
        "recovery_charge": np.where(rng.random(n) < 0.5, 0.0, _logarithmic(rng, 10e-9, 2e-6, n)),
        "load_current": np.where(resistive, 0.5 * load * (rng.random(n) < 0.5), load),
        "load_resistance": np.where(resistive, output / load, np.inf),
        "current_limit_knee": np.where(folded, 15.0, np.inf),
        "current_limit_far_voltage": np.where(folded, 40.0, np.inf),
        "current_limit_far": np.where(folded, 0.4, 0.0),
        "gain_knee": np.where(rng.random(n) < 0.3, np.inf, _logarithmic(rng, 1.0, 30.0, n)),
    }  # fmt: skip
    for name, values in columns.items():
        rows[:, COLUMN[name]] = values
    return rows


def _rows(columns: dict[str, float | Rows], n: int) -> Rows:
    rows = np.empty((n, len(COLUMNS)))
    for name, values in columns.items():
        rows[:, COLUMN[name]] = values
    return rows
