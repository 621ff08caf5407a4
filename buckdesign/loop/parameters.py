"""A design as one row of numbers: what the loop kernel sees of it.

All values SI. "Absent" is written as the value that switches the effect off: ``hysteresis_capacitance``
0 (direct coupling), ``gain_knee`` infinite (no fall of gain), ``bias_current`` infinite (constant
inductance), ``current_limit_knee`` infinite (constant current limit), ``load_resistance`` infinite.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import asdict, dataclass, fields
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray


@dataclass(frozen=True, kw_only=True)
class LoopParameters:
    """One design at one operating point.

    Attributes
    ----------
    supply_voltage : float
        Supply at the emitter [V].
    r1, r2 : float
        Divider, regulator output to adjust pin and adjust pin to ground [ohm].
    hysteresis_resistance, hysteresis_capacitance : float
        Feedback from the switch node to the adjust pin [ohm], [F]; capacitance 0 means direct coupling.
    reference, adjust_current : float
        Regulator reference [V] and adjust-pin current [A].
    output_inductance, output_resistance : float
        Regulator output impedance at unity gain, ``L_o`` [H] and ``R_o`` [ohm].
    quiescent_current : float
        Current that always leaves at the regulator's output [A].
    current_limit : float
        Regulator current limit at small input-output difference [A].
    current_limit_knee, current_limit_far_voltage, current_limit_far : float
        The limit falls in a straight line from ``current_limit`` at the knee voltage [V] to
        ``current_limit_far`` [A] at ``current_limit_far_voltage`` [V] and stays there; knee infinite: constant.
    dropout, dropout_resistance : float
        Smallest input-output difference, threshold [V] and slope [ohm].
    drive_resistance, base_resistance : float
        ``R_drive`` and ``R_be`` [ohm].
    base_emitter : float
        Base-emitter voltage of the conducting transistor [V].
    charge_time : float
        Charge lifetime ``tau`` [s].
    gain, gain_knee : float
        Current gain at small collector current [1] and the knee current ``I_K`` [A].
    saturation_voltage, saturation_resistance : float
        Collector-emitter drop of the saturated transistor, threshold [V] and slope [ohm].
    threshold, slope : float
        Rectifier forward drop, threshold [V] and slope [ohm].
    recovery_charge : float
        Charge to sweep out of the rectifier before it blocks [C].
    inductance : float
        Choke inductance without bias [H].
    bias_current, bias_exponent : float
        ``L(i) = inductance / (1 + (i / bias_current) ** bias_exponent)``, incremental [A], [1].
    choke_resistance : float
        Winding resistance [ohm].
    capacitance, esr : float
        Output capacitor [F], [ohm].
    load_current : float
        Constant-current part of the load [A].
    load_resistance : float
        Resistive part of the load [ohm].
    full_load : float
        The design's full load [A]; separates dropout from overload.
    """

    supply_voltage: float
    r1: float
    r2: float
    hysteresis_resistance: float
    hysteresis_capacitance: float = 0.0
    reference: float = 1.25
    adjust_current: float = 50e-6
    output_inductance: float
    output_resistance: float
    quiescent_current: float = 0.0
    current_limit: float
    current_limit_knee: float = math.inf
    current_limit_far_voltage: float = math.inf
    current_limit_far: float = 0.0
    dropout: float
    dropout_resistance: float = 0.0
    drive_resistance: float
    base_resistance: float
    base_emitter: float = 0.75
    charge_time: float
    gain: float
    gain_knee: float = math.inf
    saturation_voltage: float
    saturation_resistance: float
    threshold: float
    slope: float
    recovery_charge: float = 0.0
    inductance: float
    bias_current: float = math.inf
    bias_exponent: float = 1.5
    choke_resistance: float
    capacitance: float
    esr: float
    load_current: float = 0.0
    load_resistance: float = math.inf
    full_load: float

    def row(self) -> NDArray[np.float64]:
        """The parameters as one row, shape (len(COLUMNS),), in the order of `COLUMNS`."""
        import numpy as np

        return np.array([float(getattr(self, name)) for name in COLUMNS])

    def to_dict(self) -> dict[str, float]:
        """The parameters by name."""
        return asdict(self)

    @classmethod
    def from_row(cls, row: Iterable[float]) -> LoopParameters:
        """The inverse of `row`."""
        return cls(**dict(zip(COLUMNS, (float(value) for value in row), strict=True)))


COLUMNS: tuple[str, ...] = tuple(f.name for f in fields(LoopParameters))
COLUMN: Mapping[str, int] = {name: index for index, name in enumerate(COLUMNS)}
