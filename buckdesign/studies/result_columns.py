"""Columns of a table of operating points: the keys of one simulation, nested ones with dots."""

from __future__ import annotations

from buckdesign.design.losses import LOSSES
from buckdesign.design.sections import DEVICES

TEXT_COLUMNS: tuple[str, ...] = ("regime",)
"""Columns that hold words; all others hold numbers."""

TRUTH_COLUMNS: tuple[str, ...] = ("settled", "within_limits")
"""Columns that say whether: temperatures stand still; every limit of the parts, and of the requirement that a
design carries, is kept."""

RESULT_COLUMNS: tuple[str, ...] = (
    "supply_v", "load_a", "load_ohm", "ambient_c", "regime", "period_cycles", "cycle_spread", "frequency_hz",
    "duty", "start_margin", "active_fraction", "output_voltage_v", "ripple_v",
    *(f"choke_current_a.{name}" for name in ("mean", "min", "max", "rms")),
    "base_drive_a.max", "input_current_a.mean", "input_current_a.rms",
    "capacitor_current_a.input", "capacitor_current_a.output",
    "input_power_w", "output_power_w", "efficiency",
    *(f"losses_w.{name}" for name in LOSSES),
    "total_loss_w", "energy_residual", *(f"junction_c.{name}" for name in DEVICES), "choke_c",
    "choke_volume_cm3",
)  # fmt: skip
"""All of them, in the order of the table; see `buckdesign.design.operated.Operated.columns`."""
