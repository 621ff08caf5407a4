"""The start from rest: everything discharged, the supply switched on at once."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from buckdesign.design.elements import ResolvedDesign
from buckdesign.design.operated import Operated
from buckdesign.design.operating_point import SafeAreaBasis, Transient
from buckdesign.design.ratings import rating_data
from buckdesign.design.safe_area_check import allowed_current
from buckdesign.loop.accounting import (
    A_COND,
    A_DRIVE,
    A_IL_MAX,
    A_POWER_MAX,
    A_REGULATOR,
    A_SWITCH,
    A_VOUT_MAX,
)
from buckdesign.loop.parameters import LoopParameters
from buckdesign.loop.results import Trajectory, Waveforms, trajectory, waveforms
from buckdesign.physics.safe_area import DIRECT_TIME, safe_area_margin

SETTLED_SHARE = 0.01
"""Part of the mean output by which it may still stray from its steady band to count as settled [1]
(own choice)."""

SPANS = (0.02, 0.08, 0.32)
"""Times that are tried one after the other until the output has settled [s] (own choice)."""

SPACING = 400_000
"""Samples that a recording has room for [1]."""

_REST = (0.0, 0.0, 0.0, 0.0, 0.0)


def start_from_rest(operated: Operated, resolved: ResolvedDesign) -> tuple[Transient, Waveforms]:
    """Start of the first point.

    Parameters
    ----------
    operated : Operated
        Operating points; the steady state of the first tells when it has settled.
    resolved : ResolvedDesign
        The design.

    Returns
    -------
    tuple
        The transient, and its waveforms until twice the settling time, or all of it where it does not settle.
    """
    parameters = LoopParameters.from_row(operated.base_rows[0])
    loop = operated.loop
    low, high = (float(loop.column(f"output_{side}_v")[0]) for side in ("min", "max"))
    mean = float(loop.column("output_voltage_v")[0])
    slack = SETTLED_SHARE * abs(mean)
    settling, recorded = None, None
    for span in SPANS:
        recorded = waveforms(parameters, start=_REST, cycles=1_000_000, span=span, per_step=2)
        settling = _settling(recorded, low - slack, high + slack)
        full = len(recorded.samples) >= SPACING
        if settling is not None or full:
            break
    assert recorded is not None
    time = recorded.column("time_s")
    until = float(time[-1]) if settling is None else settling
    run = trajectory(parameters, start=_REST, cycles=1_000_000, span=max(until, 1e-6))
    transient = _transient(recorded, run, mean, settling, parameters)
    placed = _with_safe_area(transient, recorded, resolved, parameters, float(operated.ambient_c[0]))
    return placed, _shown(recorded, settling)


def _settling(recorded: Waveforms, low: float, high: float) -> float | None:
    """Last time outside the band; None where the output is outside in the last quarter of the recording."""
    time, output = recorded.column("time_s"), recorded.column("output_voltage_v")
    outside = np.flatnonzero((output < low) | (output > high))
    if len(outside) == 0:
        return 0.0
    last = float(time[outside[-1]])
    return last if last < 0.75 * float(time[-1]) else None


def _transient(
    recorded: Waveforms, run: Trajectory, mean: float, settling: float | None, parameters: LoopParameters
) -> Transient:
    """Peaks and energies; those of the run are exact, those of the samples reach beyond it."""
    output = recorded.column("output_voltage_v")
    reached = np.flatnonzero(output >= mean)
    accounts = run.accounts
    return Transient(
        peak_choke_a=max(float(accounts[A_IL_MAX]), float(recorded.column("choke_current_a").max())),
        peak_output_v=max(float(accounts[A_VOUT_MAX]), float(output.max())),
        lowest_output_v=float(output[reached[0] :].min()) if len(reached) else None,
        settling_s=settling,
        transistor_energy_j=float(accounts[A_COND] + accounts[A_SWITCH]),
        transistor_peak_w=max(float(accounts[A_POWER_MAX]), _peak_power(recorded, parameters)),
        regulator_energy_j=float(accounts[A_REGULATOR]),
        drive_resistor_energy_j=float(accounts[A_DRIVE]),
    )


def _with_safe_area(
    transient: Transient, recorded: Waveforms, resolved: ResolvedDesign, parameters: LoopParameters, ambient_c: float
) -> Transient:
    """The transient with its smallest distance to the safe area, case at ambient.

    The whole start counts as one pulse of its energy at its peak power: against the area for direct current where
    no pulse is known, else between it and that of the pulse.
    """
    energy, peak = transient.transistor_energy_j, transient.transistor_peak_w
    duration = energy / peak if peak > 0.0 else 0.0
    across = np.maximum(parameters.supply_voltage - recorded.column("switch_node_v"), 0.0)
    rating = rating_data([resolved])
    allowed = allowed_current(rating, across, np.array([ambient_c]), np.array([duration]))
    margin = float(np.min(safe_area_margin(recorded.column("collector_current_a"), allowed)))
    pulse = resolved.transistor.pulse_duration
    known = bool(np.isfinite(margin))
    basis = SafeAreaBasis.DIRECT
    if pulse is not None and duration < DIRECT_TIME:
        basis = SafeAreaBasis.PULSE if duration <= pulse else SafeAreaBasis.BETWEEN
    return replace(
        transient,
        stress_s=duration,
        safe_area_margin=margin if known else None,
        safe_area_basis=basis.value if known else None,
    )


def _peak_power(recorded: Waveforms, parameters: LoopParameters) -> float:
    across = parameters.supply_voltage - recorded.column("switch_node_v")
    return float((across * recorded.column("collector_current_a")).max())


def _shown(recorded: Waveforms, settling: float | None) -> Waveforms:
    """The part that is worth looking at."""
    if settling is None:
        return recorded
    time = recorded.column("time_s")
    until = max(2.0 * settling, 1e-3)
    return Waveforms(samples=recorded.samples[time <= until], cycles=recorded.cycles)
