"""One operating point as an engineer reads it: the keys that scripts rely on."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, fields
from enum import Enum
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from buckdesign.design.capacitor_load import CapacitorLoad
    from buckdesign.design.heat_sinks import HeatSinks
    from buckdesign.design.linear_alternative import LinearAlternative


@dataclass(frozen=True, kw_only=True)
class Check:
    """One limit and how far a point is from it.

    Attributes
    ----------
    name : str
        What is limited.
    value, limit : float or None
        Both in `unit`; None where a value can't be given, such as a temperature in thermal runaway.
    margin : float or None
        Distance to the limit relative to it, positive where it holds [1].
    holds : bool
        Whether it holds.
    where : str
        Operating point.
    note : str
        What a reader has to know about it; empty: nothing.
    unit : str
        As in `buckdesign.units`.
    """

    name: str
    value: float | None
    limit: float | None
    margin: float | None
    holds: bool
    where: str
    note: str
    unit: str

    def to_dict(self) -> dict[str, Any]:
        """The check by key."""
        return {member.name: getattr(self, member.name) for member in fields(self)}


class SafeAreaBasis(Enum):
    """Which safe area a start is held against: for long, for one pulse, or for a time between."""

    DIRECT = "direct current"
    PULSE = "pulse"
    BETWEEN = "between pulse and direct current"


@dataclass(frozen=True, kw_only=True)
class Transient:
    """Start from rest: everything discharged, the supply switched on at once.

    Attributes
    ----------
    peak_choke_a, peak_output_v : float
        Largest choke current [A] and output voltage [V].
    lowest_output_v : float or None
        Lowest output after it first reached its mean value [V]; None where it never did.
    settling_s : float or None
        Time after which the output stays within the steady band [s]; None where it does not settle.
    transistor_energy_j, regulator_energy_j, drive_resistor_energy_j : float
        Energy until then, or over the whole run where it does not settle [J].
    transistor_peak_w : float
        Largest power in the transistor [W].
    stress_s : float
        Length of one pulse of the transistor's peak power that has its energy [s].
    safe_area_margin : float or None
        Distance to the transistor's safe operating area [1]; None: its ratings are not known. Second breakdown
        counts where it is known.
    safe_area_basis : str or None
        Which area that is, a value of `SafeAreaBasis`.
    """

    peak_choke_a: float
    peak_output_v: float
    lowest_output_v: float | None
    settling_s: float | None
    transistor_energy_j: float
    transistor_peak_w: float
    regulator_energy_j: float
    drive_resistor_energy_j: float
    stress_s: float = 0.0
    safe_area_margin: float | None = None
    safe_area_basis: str | None = None

    def to_dict(self) -> dict[str, Any]:
        """The transient by key."""
        return {member.name: getattr(self, member.name) for member in fields(self)}


@dataclass(frozen=True, kw_only=True)
class OperatingPoint:
    """A design at one operating point.

    Attributes
    ----------
    supply_v, load_a, load_ohm, ambient_c : float or None
        Supply [V], constant-current part [A] and resistive part of the load [ohm], ambient [degC].
    regime : str
        ``linear``, ``stuck``, ``dropout``, ``overload``, ``continuous`` or ``discontinuous``.
    period_cycles : int or None
        Cycles after which the oscillation repeats [1]; 0 without cycles, None: irregular.
    cycle_spread, duty, start_margin, active_fraction : float or None
        [1]; the margin is None where the base does not conduct.
    frequency_hz : float
        Mean rate of cycles [Hz]; 0 without cycles.
    output_voltage_v, ripple_v : float
        Mean [V] and peak to peak [V].
    choke_current_a, base_drive_a, input_current_a, capacitor_current_a : Mapping
        [A]: ``mean``, ``min``, ``max``, ``rms``; ``max``; ``mean``, ``rms``; ``input``, ``output``.
    input_power_w, output_power_w, total_loss_w : float
        [W].
    efficiency : float
        Output over input power [1].
    losses_w : Mapping
        By name [W]; they sum to input minus output.
    energy_residual : float
        Energy that the loop's accounts leave unexplained, relative to the input [1].
    junction_c : Mapping
        ``transistor``, ``regulator``, ``rectifier`` [degC]; None where not known or in thermal runaway.
    choke_c, choke_volume_cm3 : float or None
        [degC], envelope of the wound ring [cm3].
    transient : Transient or None
        Start from rest.
    capacitors : Mapping or None
        ``output``, ``input``: what they carry and how long they last.
    heat_sinks : HeatSinks or None
        What the devices need.
    linear : LinearAlternative or None
        The same job done by the regulator alone.
    checks : tuple of Check
        Limits.
    warnings, cautions, assumptions : tuple of str
        What to mind at this point; what to mind with this circuit at all; what had to be assumed.
    """

    supply_v: float
    load_a: float
    load_ohm: float | None
    ambient_c: float
    regime: str
    period_cycles: int | None
    cycle_spread: float
    frequency_hz: float
    duty: float
    start_margin: float | None
    active_fraction: float
    output_voltage_v: float
    ripple_v: float
    choke_current_a: Mapping[str, float]
    base_drive_a: Mapping[str, float]
    input_current_a: Mapping[str, float]
    capacitor_current_a: Mapping[str, float | None]
    input_power_w: float
    output_power_w: float
    efficiency: float
    losses_w: Mapping[str, float]
    total_loss_w: float
    energy_residual: float
    junction_c: Mapping[str, float | None]
    choke_c: float | None
    choke_volume_cm3: float | None
    transient: Transient | None = None
    capacitors: Mapping[str, CapacitorLoad | None] | None = None
    heat_sinks: HeatSinks | None = None
    linear: LinearAlternative | None = None
    checks: tuple[Check, ...] = ()
    warnings: tuple[str, ...] = ()
    cautions: tuple[str, ...] = ()
    assumptions: tuple[str, ...] = ()

    @property
    def holds(self) -> bool:
        """Whether every check holds."""
        return all(check.holds for check in self.checks)

    def to_dict(self) -> dict[str, Any]:
        """The point by key, for JSON: plain numbers, texts, lists and dicts; cautions among the warnings."""
        shown: dict[str, Any] = {}
        for member in fields(self):
            value = getattr(self, member.name)
            match value:
                case Transient():
                    shown[member.name] = value.to_dict()
                case tuple():
                    shown[member.name] = [one.to_dict() if isinstance(one, Check) else one for one in value]
                case Mapping():
                    shown[member.name] = {key: _plain(one) for key, one in value.items()}
                case _:
                    shown[member.name] = _plain(value)
        shown["warnings"] += shown.pop("cautions")
        return shown


def _plain(value: Any) -> Any:
    """The value, or what it is by key."""
    return value.to_dict() if hasattr(value, "to_dict") else value
