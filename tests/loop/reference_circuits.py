"""Random circuits for comparing the kernel with the reference. All ranges: invented, around bench values."""

from __future__ import annotations

import math

import numpy as np

from buckdesign.loop.parameters import LoopParameters

KINDS = (
    "direct", "coupled", "saturating", "recovery", "resistive", "foldback", "light", "linear", "stuck",
    "dropout", "overload", "mixed",
)


def _log(rng: np.random.Generator, low: float, high: float) -> float:
    return float(math.exp(rng.uniform(math.log(low), math.log(high))))


def _base_values(rng: np.random.Generator, coupled: bool) -> dict[str, float]:
    supply = float(rng.uniform(15.0, 34.0))
    values = {
        "supply_voltage": supply,
        "r1": 240.0,
        "hysteresis_resistance": _log(rng, 10e3, 80e3) if coupled else _log(rng, 160e3, 3e6),
        "hysteresis_capacitance": float(rng.uniform(100e-12, 600e-12)) if coupled else 0.0,
        "output_inductance": _log(rng, 0.04e-6, 0.25e-6),
        "output_resistance": 2e-3,
        "quiescent_current": float(rng.choice([0.0, 3.5e-3])),
        "current_limit": 2.2,
        "dropout": 1.6,
        "dropout_resistance": float(rng.choice([0.0, 0.4])),
        "drive_resistance": _log(rng, 10.0, 47.0),
        "base_resistance": _log(rng, 10.0, 47.0),
        "charge_time": _log(rng, 0.3e-6, 2e-6),
        "gain": float(rng.uniform(25.0, 70.0)),
        "gain_knee": float(rng.choice([8.0, math.inf])),
        "saturation_voltage": 0.2,
        "saturation_resistance": 0.1,
        "threshold": 0.35,
        "slope": 0.05,
        "inductance": _log(rng, 100e-6, 630e-6),
        "choke_resistance": 0.08,
        "capacitance": _log(rng, 250e-6, 1600e-6),
        "esr": _log(rng, 30e-3, 200e-3),
        "load_current": float(rng.uniform(0.1, 3.0)),
        "full_load": 3.0,
    }
    output = float(rng.uniform(4.0, supply - 5.0))
    return _with_output(values, output)


def _with_output(values: dict[str, float], output: float) -> dict[str, float]:
    """Set ``r2`` for an output voltage [V]."""
    g = 1 / values["r1"]
    if values["hysteresis_capacitance"] == 0:
        g += 1 / values["hysteresis_resistance"]
    return values | {"r2": (output - 1.25) / (1.25 * g + 50e-6)}


def _output(values: dict[str, float]) -> float:
    g = 1 / values["r1"]
    if values["hysteresis_capacitance"] == 0:
        g += 1 / values["hysteresis_resistance"]
    return 1.25 + values["r2"] * (1.25 * g + 50e-6)


def _saturating(rng: np.random.Generator) -> dict[str, float]:
    return {"bias_current": float(rng.uniform(3.0, 10.0)), "bias_exponent": float(rng.uniform(1.3, 1.5))}


def _foldback(rng: np.random.Generator) -> dict[str, float]:
    return {
        "current_limit_knee": float(rng.uniform(2.0, 8.0)),
        "current_limit_far_voltage": float(rng.uniform(60.0, 90.0)),
        "current_limit_far": float(rng.uniform(0.1, 0.4)),
        "current_limit": float(rng.uniform(0.4, 1.0)),
    }


def _resistive(values: dict[str, float], share: float) -> dict[str, float]:
    load = values["load_current"]
    return {"load_resistance": _output(values) / (share * load), "load_current": (1 - share) * load}


def _options(rng: np.random.Generator, kind: str, values: dict[str, float]) -> dict[str, float]:
    match kind:
        case "saturating":
            return _saturating(rng)
        case "recovery":
            return {"recovery_charge": _log(rng, 20e-9, 300e-9)}
        case "resistive":
            return _resistive(values, float(rng.choice([0.5, 1.0])))
        case "foldback":
            return _foldback(rng)
        case "light":
            return {"load_current": _log(rng, 0.08, 0.5)}
        case "linear":
            return {"load_current": float(rng.uniform(0.2, 0.9)) * 0.75 / values["base_resistance"],
                    "quiescent_current": 0.0}
        case "stuck":
            weak = {"hysteresis_resistance": 3e6, "inductance": 60e-6, "charge_time": 3e-6, "esr": 0.2}
            return _with_output(values | weak | {"hysteresis_capacitance": 0.0}, _output(values))
        case "dropout":
            return {"supply_voltage": _output(values) + float(rng.uniform(0.5, 2.0))}
        case "overload":
            return {"load_current": float(rng.uniform(10.0, 20.0))}
    return {}


def random_circuits(rng: np.random.Generator, n: int, kind: str = "mixed") -> list[LoopParameters]:
    """Draw circuits.

    Parameters
    ----------
    rng : numpy.random.Generator
        Source of randomness.
    n : int
        How many.
    kind : str
        One of `KINDS`: ``direct`` and ``coupled`` fix the feedback; the others add one option or regime to
        either feedback; ``mixed`` adds each of L(i), recovery, resistive load and fold-back with chance 1/2.
    """
    if kind not in KINDS:
        raise ValueError(f"kind {kind!r}: one of {', '.join(KINDS)}")
    circuits = []
    for _ in range(n):
        coupled = {"direct": False, "coupled": True}.get(kind, bool(rng.random() < 0.5))
        values = _base_values(rng, coupled)
        chosen = [kind]
        if kind == "mixed":
            chosen = [x for x in ("saturating", "recovery", "resistive", "foldback") if rng.random() < 0.5]
        for option in chosen:
            values |= _options(rng, option, values)
        circuits.append(LoopParameters(**values))
    return circuits
