"""A limit over operating points: value, limit, margin, where it applies."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.losses import Floats
from buckdesign.design.operating_point import Check
from buckdesign.units import format_quantity

_ROUNDING = 1e-9


@dataclass(frozen=True, kw_only=True)
class Limit:
    """One limit over all points.

    Attributes
    ----------
    name, unit : str
        What is limited; unit as in `buckdesign.units`.
    value, limit : NDArray
        Shape (n,); a value that is NaN where the limit applies does not hold.
    applies : NDArray
        Where the limit applies and is known, shape (n,).
    is_upper : bool
        Whether the value must stay below.
    room : NDArray or None
        Distance to the limit, positive where it holds; between value and limit where None.
    span : NDArray or None
        What the margin is relative to; the limit itself where None.
    typical : NDArray or None
        The value with typical parts, where `value` takes guaranteed ones.
    across : NDArray or None
        Voltage that a current was taken at [V], where the limit depends on it.
    note : str
        What a reader has to know.
    note_unknown : str
        What NaN stands for.
    """

    name: str
    unit: str
    value: Floats
    limit: Floats
    applies: NDArray[np.bool_]
    is_upper: bool = True
    room: Floats | None = None
    span: Floats | None = None
    typical: Floats | None = None
    across: Floats | None = None
    note: str = ""
    note_unknown: str = ""

    @property
    def margin(self) -> Floats:
        """Relative distance to the limit, positive where it holds [1], shape (n,)."""
        room = self.limit - self.value if self.is_upper else self.value - self.limit
        if self.room is not None:
            room = self.room
        span = np.abs(self.limit if self.span is None else self.span)
        return room / np.where(span > 0.0, span, 1.0)

    @property
    def holds(self) -> NDArray[np.bool_]:
        """Whether it holds, also where it does not apply, shape (n,)."""
        return ~self.applies | (self.margin >= -_ROUNDING)

    def at(self, index: int, where: str) -> Check:
        """The check of one point."""
        value = _finite(self.value[index])
        note = self.note_unknown if value is None else self.note
        if self.across is not None and value is not None:
            note = f"at {format_quantity(float(self.across[index]), 'V', ascii_only=True)}; {note}"
        if self.typical is not None and value is not None:
            typical = float(self.typical[index])
            if np.isfinite(typical) and abs(typical - value) > 5e-3 * abs(value):
                shown = format_quantity(typical, self.unit, ascii_only=True)
                note = f"{note}; typical {shown}" if note else f"typical {shown}"
        return Check(
            name=self.name,
            value=value,
            limit=_finite(self.limit[index]),
            margin=None if value is None else _finite(self.margin[index]),
            holds=bool(self.holds[index]),
            where=where,
            note=note,
            unit=self.unit,
        )


def _finite(value: Any) -> float | None:
    return float(value) if np.isfinite(value) else None


def upper_limit(name: str, unit: str, value: Floats, limit: Floats, note: str = "", **more: Any) -> Limit:
    """A limit that a value must stay below, wherever it is known.

    Parameters
    ----------
    name, unit : str
        See `Limit`.
    value, limit : NDArray
        Shape (n,).
    note : str
        What a reader has to know.
    **more
        Other attributes of `Limit`.

    Returns
    -------
    Limit
        It applies where `limit` is finite.
    """
    return Limit(
        name=name, unit=unit, value=value, limit=limit, applies=np.isfinite(limit), note=note, **more
    )
