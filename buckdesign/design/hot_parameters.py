"""Loop parameters at temperature, and at the currents, slopes and rate that a run of the loop has shown."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.elements import CapacitorElement, ResolvedDesign
from buckdesign.design.losses import Floats, copper_resistance_factor, data_by_point
from buckdesign.design.sections import DEVICES
from buckdesign.loop.parameters import COLUMN
from buckdesign.loop.results import SteadyStates
from buckdesign.physics.capacitor import (
    ESR_FREQUENCY,
    esr_at_frequency,
    esr_factor_at_temperature,
    ripple_rise,
)
from buckdesign.physics.pnp import (
    base_emitter_voltage,
    charge_time_at_temperature,
    gain,
    gain_at_temperature,
    saturation_with_drive,
)
from buckdesign.physics.recovery import (
    TEST_SLOPE,
    carrier_lifetime,
    charge_at_crossing,
    charge_at_temperature,
)
from buckdesign.physics.regulator import DROPOUT_TEMPERATURE_COEFFICIENT

REFERENCE_C = 25.0
"""Junction temperature of the tables' values [degC] (data sheets' usual condition)."""

SATURATION_COEFFICIENT = 3e-3
"""Change of the saturation resistance of a silicon power transistor [1/K] (from memory: the resistance of the
collector rises as carriers get slower)."""

PARAMETER_RANGE_C = (-55.0, 175.0)
"""Temperatures within which parameters are changed [degC]; beyond, those of the end are taken (from memory:
where the laws of temperature are known)."""

COPPER_CEILING_C = 300.0
"""Temperature up to which the copper's resistance is followed [degC] (own choice: the enamel has burnt)."""

SATURATION_SPAN = 0.3
"""Largest change of the saturation voltage by the drive that is followed [V] (own choice)."""

WET_KINDS = ("low-impedance electrolytic", "general-purpose electrolytic")
"""Kinds of capacitor whose ESR follows the temperature of a liquid electrolyte (common practice)."""

TRANSISTOR, REGULATOR, RECTIFIER = (DEVICES.index(name) for name in ("transistor", "regulator", "rectifier"))


@dataclass(frozen=True, kw_only=True)
class EsrLaw:
    """How the ESR of a capacitor follows frequency and temperature, one entry a point.

    Attributes
    ----------
    loss_factor, capacitance : NDArray
        At 120 Hz [1], NaN where the ESR does not follow the frequency; [F].
    is_wet : NDArray
        Whether it follows the temperature.
    ripple_rated : NDArray
        [A]; infinite where not known.
    """

    loss_factor: Floats
    capacitance: Floats
    is_wet: NDArray[np.bool_]
    ripple_rated: Floats

    def part(self, which: NDArray[np.intp]) -> EsrLaw:
        """Some of the points."""
        return EsrLaw(**{one.name: getattr(self, one.name)[which] for one in fields(self)})

    def esr(self, esr: Floats, frequency: Floats, ripple: Floats, ambient_c: Floats) -> Floats:
        """ESR at the rate of the loop and at the capacitor's temperature.

        Parameters
        ----------
        esr : NDArray
            At 100 kHz and 20 degC [ohm], shape (n,).
        frequency : NDArray
            Rate of the loop [Hz]; where it is 0 that of the tables is taken.
        ripple : NDArray
            Capacitor current, rms [A].
        ambient_c : NDArray
            [degC].

        Returns
        -------
        NDArray
            [ohm], shape (n,): at the middle of the band that `esr_factor_at_temperature` gives.
        """
        rate = np.where(frequency > 0.0, frequency, ESR_FREQUENCY)
        with_rate = esr_at_frequency(esr, self.loss_factor, self.capacitance, rate)
        hot = ambient_c + ripple_rise(ripple, self.ripple_rated)
        low, high = esr_factor_at_temperature(hot)
        return np.asarray(with_rate * np.where(self.is_wet, np.sqrt(low * high), 1.0), dtype=float)


@dataclass(frozen=True, kw_only=True)
class HotData:
    """What parameters follow, one entry a point.

    Attributes
    ----------
    forward_coefficient : NDArray
        Change of the rectifier's forward drop [V/K].
    lifetime, pieces : NDArray
        Lifetime of the carriers in a piece [s], NaN where the recovery charge stays as given; pieces in
        parallel.
    forced_gain : NDArray
        Collector over base current at which the saturation voltage was measured [1]; NaN: not followed.
    output : EsrLaw
        Of the output capacitor.
    input : EsrLaw
        Of the input capacitor.
    """

    forward_coefficient: Floats
    lifetime: Floats
    pieces: Floats
    forced_gain: Floats
    output: EsrLaw
    input: EsrLaw

    def part(self, which: NDArray[np.intp]) -> HotData:
        """Some of the points."""
        taken: dict[str, Any] = {}
        for one in fields(self):
            value = getattr(self, one.name)
            taken[one.name] = value.part(which) if isinstance(value, EsrLaw) else value[which]
        return HotData(**taken)


@dataclass(frozen=True, kw_only=True)
class _Flat:
    forward_coefficient: Floats
    lifetime: Floats
    pieces: Floats
    forced_gain: Floats
    output: Floats
    input: Floats


def hot_data(resolved: Sequence[ResolvedDesign]) -> HotData:
    """`HotData` of the design of each point."""
    depends = ("transistor", "rectifier", "output_capacitor", "input_capacitor")
    flat = data_by_point(resolved, _hot_record, _Flat, depends)
    return HotData(
        forward_coefficient=flat.forward_coefficient,
        lifetime=flat.lifetime,
        pieces=flat.pieces,
        forced_gain=flat.forced_gain,
        output=_law(flat.output),
        input=_law(flat.input),
    )


def _law(values: Floats) -> EsrLaw:
    loss_factor, capacitance, wet, rated = values.T
    return EsrLaw(loss_factor=loss_factor, capacitance=capacitance, is_wet=wet > 0.0, ripple_rated=rated)


def _hot_record(resolved: ResolvedDesign) -> dict[str, Any]:
    rectifier, transistor = resolved.rectifier, resolved.transistor
    lifetime = np.nan
    if rectifier.recovery_current is not None:
        lifetime = float(carrier_lifetime(rectifier.recovery_charge, rectifier.recovery_current, TEST_SLOPE))
    forced = transistor.saturation_forced_gain
    return {
        "forward_coefficient": rectifier.forward_coefficient,
        "lifetime": lifetime,
        "pieces": float(rectifier.parallel),
        "forced_gain": np.nan if forced is None else forced,
        "output": _esr_record(resolved.output_capacitor),
        "input": _esr_record(resolved.input_capacitor),
    }


def _esr_record(capacitor: CapacitorElement | None) -> tuple[float, ...]:
    if capacitor is None or capacitor.kind is None:
        return (np.nan, 1.0, 0.0, np.inf)
    loss_factor, rated = capacitor.loss_tangent, capacitor.ripple_current
    return (
        np.nan if loss_factor is None else loss_factor,
        capacitor.capacitance,
        float(capacitor.kind in WET_KINDS),
        np.inf if rated is None else rated,
    )


def parameters_at(
    rows: Floats,
    hot: HotData,
    junction_c: Floats,
    choke_c: Floats,
    ambient_c: Floats | None = None,
    loop: SteadyStates | None = None,
) -> Floats:
    """Loop parameters at temperatures.

    Parameters
    ----------
    rows : NDArray
        Parameters at 25 degC, copper and capacitors at 20 degC, shape (n, columns).
    hot : HotData
        Of the same points.
    junction_c, choke_c : NDArray
        Temperatures [degC], shape (n, 3) and (n,); NaN leaves a parameter as it is.
    ambient_c : NDArray, optional
        [degC], shape (n,); without, the ESR is left as it is.
    loop : SteadyStates, optional
        The run before; without, the recovery charge and the drive are those of the data sheets.

    Returns
    -------
    NDArray
        New rows: base-emitter voltage, gain, charge lifetime and saturation drop of the transistor,
        threshold and
        recovery charge of the rectifier, dropout of the regulator, resistance of the choke, ESR.
    """
    low, high = PARAMETER_RANGE_C
    warm = np.clip(np.where(np.isnan(junction_c), REFERENCE_C, junction_c), low, high)
    changed = rows.copy()
    _heat_transistor(changed, rows, warm[:, TRANSISTOR])
    threshold, dropout = COLUMN["threshold"], COLUMN["dropout"]
    drop = hot.forward_coefficient * (warm[:, RECTIFIER] - REFERENCE_C)
    changed[:, threshold] = np.maximum(rows[:, threshold] + drop, 0.2 * rows[:, threshold])
    less = DROPOUT_TEMPERATURE_COEFFICIENT * (warm[:, REGULATOR] - REFERENCE_C)
    changed[:, dropout] = np.maximum(rows[:, dropout] + less, 0.0)
    followed = np.minimum(choke_c, COPPER_CEILING_C)
    copper = np.where(np.isnan(choke_c), 1.0, copper_resistance_factor(followed))
    changed[:, COLUMN["choke_resistance"]] *= copper
    if loop is not None:
        _follow_loop(changed, rows, hot, warm, loop)
    if ambient_c is not None:
        rate = np.zeros(len(rows)) if loop is None else loop.column("frequency_hz")
        ripple = np.zeros(len(rows)) if loop is None else loop.column("output_capacitor_rms_a")
        changed[:, COLUMN["esr"]] = hot.output.esr(rows[:, COLUMN["esr"]], rate, ripple, ambient_c)
    return changed


def _heat_transistor(changed: Floats, rows: Floats, junction_c: Floats) -> None:
    emitter, amplification, time = COLUMN["base_emitter"], COLUMN["gain"], COLUMN["charge_time"]
    changed[:, emitter] = np.maximum(base_emitter_voltage(rows[:, emitter], junction_c), 0.1)
    changed[:, amplification] = gain_at_temperature(rows[:, amplification], junction_c)
    changed[:, time] = charge_time_at_temperature(rows[:, time], junction_c)
    changed[:, COLUMN["saturation_resistance"]] *= 1.0 + SATURATION_COEFFICIENT * (junction_c - REFERENCE_C)


def _follow_loop(changed: Floats, rows: Floats, hot: HotData, junction_c: Floats, loop: SteadyStates) -> None:
    """Recovery charge and saturation voltage at the currents of a run."""
    bypassed = changed[:, COLUMN["base_emitter"]] / changed[:, COLUMN["base_resistance"]]
    drive = loop.column("regulator_max_a") - bypassed
    driven = drive > 1e-6
    drive = np.where(driven, drive, 1.0)
    knee = changed[:, COLUMN["gain_knee"]]
    charge, slope = COLUMN["recovery_charge"], turn_on_slope(changed, loop, drive)
    lifetime = np.where(np.isnan(hot.lifetime), 0.0, hot.lifetime)
    left = charge_at_crossing(valley_current(loop) / hot.pieces, slope / hot.pieces, lifetime)
    recovered = charge_at_temperature(hot.pieces * left, junction_c[:, RECTIFIER])
    changed[:, charge] = np.where(np.isnan(hot.lifetime) | ~driven, rows[:, charge], recovered)
    forced = loop.column("choke_max_a") / drive
    amplification = gain(loop.column("choke_max_a"), changed[:, COLUMN["gain"]], knee)
    sheet = np.where(np.isnan(hot.forced_gain), 1.0, hot.forced_gain)
    now = saturation_with_drive(forced, amplification, junction_c[:, TRANSISTOR])
    then = saturation_with_drive(np.minimum(sheet, amplification), amplification, REFERENCE_C)
    known = driven & ~np.isnan(hot.forced_gain) & (loop.column("choke_max_a") > 0.0)
    more = np.where(known, np.clip(now - then, -SATURATION_SPAN, SATURATION_SPAN), 0.0)
    voltage = COLUMN["saturation_voltage"]
    changed[:, voltage] = np.maximum(rows[:, voltage] + more, 0.25 * rows[:, voltage])


def valley_current(loop: SteadyStates) -> Floats:
    """Rectifier current just before the transistor turns on [A], shape (n,); a mean where cycles differ."""
    middle = np.maximum(2.0 * loop.column("choke_mean_a") - loop.column("choke_max_a"), 0.0)
    return np.where(loop.column("period_cycles") == 1.0, loop.column("choke_min_a"), middle)


def turn_on_slope(rows: Floats, loop: SteadyStates, drive: Floats) -> Floats:
    """Slope at which the transistor takes the choke's current over from the rectifier.

    Parameters
    ----------
    rows : NDArray
        Loop parameters, shape (n, columns).
    loop : SteadyStates
        Steady states of n points.
    drive : NDArray
        Largest base current [A], shape (n,).

    Returns
    -------
    NDArray
        [A/s], shape (n,).

    Notes
    -----
    Derived from charge control: ``beta i_B / tau`` with half of the largest base current, which is still
    rising.
    """
    amplification = gain(valley_current(loop), rows[:, COLUMN["gain"]], rows[:, COLUMN["gain_knee"]])
    return np.asarray(0.5 * amplification * drive / rows[:, COLUMN["charge_time"]], dtype=float)
