"""Circuits that several tests of the loop share."""

from __future__ import annotations

from buckdesign.loop.parameters import LoopParameters

# the circuit of the published spot values: 24 V to 12 V at 2.5 A, directly coupled (invented)
SPOT = LoopParameters(
    supply_voltage=24.0, r1=240.0, r2=2050.0, hysteresis_resistance=1e6, output_inductance=0.2e-6,
    output_resistance=2e-3, current_limit=2.2, dropout=1.6, drive_resistance=22.0, base_resistance=22.0,
    charge_time=1e-6, gain=40.0, gain_knee=8.0, saturation_voltage=0.2, saturation_resistance=0.1, threshold=0.35,
    slope=0.05, inductance=220e-6, choke_resistance=0.08, capacitance=470e-6, esr=0.06, load_current=2.5, full_load=2.5,
)  # fmt: skip
