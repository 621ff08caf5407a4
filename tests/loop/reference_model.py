"""Equations of the reference integration: algebra, derivatives, bounds and events of each mode.

Everything algebraic (output node, bound of ``i_R``, sliding switch node) is linear and solved in closed form.
The readings taken of the model are listed in `tests.loop.reference`.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from enum import Enum
from typing import Any, NamedTuple

import numpy as np

from buckdesign.loop.parameters import LoopParameters

STATE_SCALE = np.array([1.0, 10.0, 0.1, 1e-7, 10.0, 1e-7])
"""Typical size of i_L [A], v_C [V], i_R [A], q [C], v_H [V], swept charge [C]; multiplies ``atol``."""
FOLD_VOLTAGE = 0.5
COMPLEX_STEP = 1e-30
GRAZE = 1e-13
"""Current [A] by which a bound has to be passed, lest leaving it with zero slope count as a return."""


class Switch(Enum):
    """What holds the switch node."""

    SATURATED = "saturated"
    FREEWHEEL = "freewheel"
    ACTIVE = "active"
    RECOVERING = "recovering"
    RECOVERING_EMPTY = "recovering, choke empty"
    EMPTY = "empty"


class Clamp(Enum):
    """Where the regulator current is."""

    FREE = "free"
    LOW = "low"
    HIGH = "high"


class Piece(Enum):
    """Which straight line is the upper bound of the regulator current."""

    DRIVE = "drive"
    LIMIT = "limit"
    LINE = "line"
    FAR = "far"
    LOWEST = "lowest"


class Release(Enum):
    """When ``i_R`` leaves a moving upper bound.

    ``FOLLOW``: once it would move inward faster than the bound does (Filippov); it never exceeds the bound.
    ``AT_ZERO``: as soon as ``e - R_o i_R`` turns negative, so that ``i_R`` then lies above a bound that moves
    inward; in ``active`` as ``FOLLOW``, since there the node's positive feedback would make it chatter.
    """

    FOLLOW = "follow"
    AT_ZERO = "at zero"


class Load(Enum):
    """Which straight line the constant part of the load is on."""

    FULL = "full"
    FOLDED = "folded"
    NONE = "none"


class Mode(NamedTuple):
    """The discrete part of the state."""

    switch: Switch
    clamp: Clamp
    base: bool
    load: Load
    piece: Piece


class Point(NamedTuple):
    """Everything algebraic at one instant [A, V]."""

    choke: float
    available: float
    regulator: float
    output: float
    node: float
    error: float
    capacitor: float
    port: float


Event = tuple[str, float, Callable[[Point, list[float]], float]]


def folded(value: dict[Piece, float]) -> Piece:
    """Which piece of the fold-back applies."""
    lower = min(Piece.LIMIT, Piece.LINE, key=value.__getitem__)
    return max(lower, Piece.FAR, key=value.__getitem__)


def below_lowest(value: dict[Piece, float]) -> Piece:
    """Fold-back or drive resistor, whichever is lower."""
    return min(Piece.DRIVE, folded(value), key=value.__getitem__)


def highest(value: dict[Piece, float]) -> Piece:
    """Which piece is the upper bound."""
    return max(below_lowest(value), Piece.LOWEST, key=value.__getitem__)


class System:
    """The hybrid system of one circuit."""

    def __init__(self, parameters: LoopParameters, release: Release) -> None:
        p = self.p = parameters
        self.release = release
        self.conductance = 1 / p.r1 + 1 / p.r2 + 1 / p.hysteresis_resistance
        self.k = 1 - 1 / (p.r1 * self.conductance)
        self.feedback = 1 / (p.hysteresis_resistance * self.conductance)
        self.base_threshold = p.base_emitter / p.base_resistance
        self.lowest = max(p.quiescent_current, 0.0)
        self.ceiling = p.supply_voltage - p.saturation_voltage
        self.gain_rate = p.gain / p.charge_time
        self.line: tuple[float, float] | None = None
        span = p.current_limit_far_voltage - p.current_limit_knee
        slope = (p.current_limit - p.current_limit_far) / span if math.isfinite(span) else 0.0
        if slope > 0 and slope * p.drive_resistance < 1:
            if slope * (p.drive_resistance + p.esr) >= 1:
                raise ValueError("fold-back line steeper than drive resistor plus ESR allow")
            scale = 1 - slope * p.drive_resistance
            head = p.supply_voltage - p.base_emitter - p.current_limit_knee
            self.line = ((p.current_limit - slope * head) / scale, slope / scale)

    # ---- algebra

    def set_value(self) -> float:
        """Output at which ``e = 0`` with ``v_sw = v_out`` [V]."""
        p = self.p
        g = 1 / p.r1 + 1 / p.r2 if p.hysteresis_capacitance > 0 else self.conductance
        return p.r2 * (g * p.reference + p.adjust_current)

    def available(self, q: Any) -> Any:
        """Collector current that the charge carries [A], ``i (1 + i / I_K) = beta q / tau``."""
        x = self.gain_rate * q
        if x.real < 0:  # trial stages of the solver beyond "base off": continue smoothly
            return x * (1 - x / self.p.gain_knee)
        return 2 * x / (1 + (1 + 4 * x / self.p.gain_knee) ** 0.5)

    def charge(self, current: float) -> float:
        """Inverse of `available` [C]."""
        return current * (1 + current / self.p.gain_knee) / self.gain_rate

    def choke_inductance(self, current: Any) -> Any:
        """Incremental inductance [H]."""
        p = self.p
        if math.isinf(p.bias_current) or current.real <= 0:
            return p.inductance
        return p.inductance / (1 + (current / p.bias_current) ** p.bias_exponent)

    def _node_line(self, mode: Mode, choke: Any, available: Any, q: Any) -> tuple[Any, float, Any]:
        """Switch node as ``s0 + s1 v_out + s2 i_R``."""
        p = self.p
        match mode.switch:
            case Switch.SATURATED:
                return self.ceiling - p.saturation_resistance * choke, 0.0, 0.0
            case Switch.FREEWHEEL:
                return -(p.threshold + p.slope * (choke - available)), 0.0, 0.0
            case Switch.RECOVERING | Switch.RECOVERING_EMPTY:
                return 0.0, 0.0, 0.0
            case Switch.EMPTY:
                return 0.0, 1.0, 0.0
        h = self.choke_inductance(choke) * self.gain_rate / (1 + 2 * available / p.gain_knee)
        return p.choke_resistance * choke - h * (self.base_threshold + q / p.charge_time), 1.0, h

    def _load_line(self, load: Load) -> tuple[float, float]:
        """Load current as (conductance [S], constant [A])."""
        p = self.p
        if load is Load.FULL:
            return 1 / p.load_resistance, p.load_current
        return 1 / p.load_resistance + (p.load_current / FOLD_VOLTAGE if load is Load.FOLDED else 0.0), 0.0

    def bound_line(self, piece: Piece, base: bool) -> tuple[float, float]:
        """A piece of the upper bound as (constant [A], slope over ``v_out`` [S])."""
        p = self.p
        match piece:
            case Piece.DRIVE:
                total = p.drive_resistance + p.dropout_resistance + (0.0 if base else p.base_resistance)
                head = p.supply_voltage - p.dropout - (p.base_emitter if base else 0.0)
                return head / total, -1 / total
            case Piece.LIMIT:
                return p.current_limit, 0.0
            case Piece.LINE:
                return self.line if self.line else (math.inf, 0.0)
            case Piece.FAR:
                return (p.current_limit_far, 0.0) if self.line else (-math.inf, 0.0)
        return self.lowest, 0.0

    def _output_line(self, mode: Mode, y: Sequence[Any]) -> tuple[Any, ...]:
        """``v_out = A + B i_R``, with what led there."""
        p = self.p
        choke, v_c, _, q, v_h = y[:5]
        available = self.available(q)
        if mode.switch is Switch.ACTIVE:
            choke = available
        elif mode.switch in (Switch.EMPTY, Switch.RECOVERING_EMPTY):
            choke = 0.0
        s0, s1, s2 = self._node_line(mode, choke, available, q)
        a0 = (s0 - v_h) * self.feedback + p.adjust_current / self.conductance
        a1, a2 = s1 * self.feedback, s2 * self.feedback
        g, constant = self._load_line(mode.load)
        den = 1 + p.esr * (g + (self.k - a1) / p.r1)
        a = (v_c + p.esr * (choke - constant + a0 / p.r1)) / den
        b = p.esr * (1 + a2 / p.r1) / den
        return a, b, choke, available, (s0, s1, s2), (a0, a1, a2)

    def point(self, mode: Mode, y: Sequence[Any]) -> Point:
        """Solve the algebra in a given mode; ``y`` may be complex (for derivatives by complex step)."""
        a, b, choke, available, s, feed = self._output_line(mode, y)
        regulator = y[2]
        if mode.clamp is Clamp.LOW:
            regulator = self.lowest
        elif mode.clamp is Clamp.HIGH:
            c0, c1 = self.bound_line(mode.piece, mode.base)
            regulator = (c0 + c1 * a) / (1 - c1 * b)
        v = a + b * regulator
        node = s[0] + s[1] * v + s[2] * regulator
        port = self.k * v - (feed[0] + feed[1] * v + feed[2] * regulator)
        g, constant = self._load_line(mode.load)
        capacitor = choke + regulator - g * v - constant - port / self.p.r1
        return Point(choke, available, regulator, v, node, self.p.reference - port, capacitor, port)

    def derivative(self, mode: Mode, y: Sequence[Any], at: Point | None = None) -> list[Any]:
        """Time derivative of the six states."""
        p = self.p
        o = at or self.point(mode, y)
        q = y[3]
        dq = o.regulator - self.base_threshold - q / p.charge_time if mode.base else 0.0
        match mode.switch:
            case Switch.ACTIVE:
                di = self.gain_rate / (1 + 2 * o.available / p.gain_knee) * dq
            case Switch.EMPTY | Switch.RECOVERING_EMPTY:
                di = 0.0
            case _:
                di = (o.node - o.output - p.choke_resistance * o.choke) / self.choke_inductance(o.choke)
        free = mode.clamp is Clamp.FREE
        dr = (o.error - p.output_resistance * o.regulator) / p.output_inductance if free else 0.0
        dh = 0.0
        if p.hysteresis_capacitance > 0:
            v_adj = o.output - o.port
            dh = (o.node - y[4] - v_adj) / (p.hysteresis_resistance * p.hysteresis_capacitance)
        swept = mode.switch in (Switch.RECOVERING, Switch.RECOVERING_EMPTY)
        return [di, o.capacitor / p.capacitance, dr, dq, dh, o.available - o.choke if swept else 0.0]

    # ---- the bound of the regulator current

    def upper(self, output: float, base: bool) -> float:
        """Upper bound of ``i_R`` at a given output voltage [A]."""
        lines = {piece: self.bound_line(piece, base) for piece in Piece}
        value = {piece: c0 + c1 * output for piece, (c0, c1) in lines.items()}
        return value[highest(value)]

    def piece_values(self, mode: Mode, y: Sequence[float]) -> dict[Piece, float]:
        """Where ``i_R`` would be on each piece with the output node solved [A]."""
        a, b = self._output_line(mode, y)[:2]
        lines = {piece: self.bound_line(piece, mode.base) for piece in Piece}
        return {piece: (c0 + c1 * a) / (1 - c1 * b) for piece, (c0, c1) in lines.items()}

    def push(self, at: Point) -> float:
        """Rate of a free ``i_R`` [A/s]."""
        return (at.error - self.p.output_resistance * at.regulator) / self.p.output_inductance

    def outward(self, mode: Mode, y: list[float], at: Point) -> float:
        """``i_R`` stays on the bound while this is positive [A/s]; only for ``Clamp.HIGH``."""
        rate = self.derivative(mode, y, at)
        moved = self.point(mode, [a + 1j * COMPLEX_STEP * d for a, d in zip(y, rate, strict=True)])
        bound_rate = moved.regulator.imag / COMPLEX_STEP
        return self.push(at) - (bound_rate if self._follows(mode) else max(bound_rate, 0.0))

    def excess(self, mode: Mode, at: Point, margin: float = 0.0) -> float:
        """Positive once a free ``i_R`` has to be held at its upper bound."""
        over = at.regulator - self.upper(at.output, mode.base) - margin
        return over if self._follows(mode) else min(over, self.push(at))

    def _follows(self, mode: Mode) -> bool:
        return self.release is Release.FOLLOW or mode.switch is Switch.ACTIVE

    # ---- events

    def events(self, mode: Mode) -> list[Event]:
        """Events of a mode: (name, direction, function of point and state)."""
        return [*self._switch_events(mode), *self._base_events(mode), *self._clamp_events(mode),
                *self._load_events(mode)]

    def _switch_events(self, mode: Mode) -> Iterator[Event]:
        p = self.p
        match mode.switch:
            case Switch.ACTIVE:
                yield "ceiling", 1.0, lambda o, y: o.node - self.ceiling + p.saturation_resistance * o.choke
                yield "floor", -1.0, lambda o, y: o.node + p.threshold
                return
            case Switch.EMPTY:
                if mode.base:
                    yield "refill", -1.0, lambda o, y: o.output - self.ceiling
                return
        if mode.base:
            sign = 1.0 if mode.switch is Switch.FREEWHEEL else -1.0
            yield "meet", sign, lambda o, y: o.available - o.choke - sign * GRAZE * (1 + o.choke)
        if mode.switch is not Switch.RECOVERING_EMPTY:
            yield "choke empty", -1.0, lambda o, y: o.choke
        if mode.switch in (Switch.RECOVERING, Switch.RECOVERING_EMPTY):
            yield "swept", 1.0, lambda o, y: y[5] - p.recovery_charge

    def _base_events(self, mode: Mode) -> Iterator[Event]:
        if mode.base:
            yield "base off", -1.0, lambda o, y: y[3]
        else:
            yield "base on", 1.0, lambda o, y: o.regulator - self.base_threshold

    def _clamp_events(self, mode: Mode) -> Iterator[Event]:
        match mode.clamp:
            case Clamp.LOW:
                yield "leave low", 1.0, lambda o, y: o.error - self.p.output_resistance * self.lowest
            case Clamp.FREE:
                yield "reach low", -1.0, lambda o, y: o.regulator - self.lowest + GRAZE
                yield "reach high", 1.0, lambda o, y: self.excess(mode, o, GRAZE)
            case Clamp.HIGH:
                yield "leave high", -1.0, lambda o, y: self.outward(mode, y, o)
                yield from self._piece_events(mode)

    def _piece_events(self, mode: Mode) -> Iterator[Event]:
        """The bound changing from one straight line to another."""
        here = mode.piece

        def lead(name: str, choose: Callable[[dict[Piece, float]], Piece], sign: float) -> Event:
            def value(o: Point, y: list[float]) -> float:
                values = self.piece_values(mode, y)
                return sign * (values[choose(values)] - values[here])

            return "piece " + name, 1.0, value

        if here is Piece.LOWEST:
            yield lead("rest", below_lowest, 1.0)
            return
        yield lead("lowest", lambda values: Piece.LOWEST, 1.0)
        if here is Piece.DRIVE:
            yield lead("folded", folded, -1.0)
            return
        yield lead("drive", lambda values: Piece.DRIVE, -1.0)
        if self.line is None:
            return
        if here is Piece.LINE:
            yield lead("limit", lambda values: Piece.LIMIT, -1.0)
            yield lead("far", lambda values: Piece.FAR, 1.0)
        else:
            yield lead("line", lambda values: Piece.LINE, -1.0 if here is Piece.LIMIT else 1.0)

    def _load_events(self, mode: Mode) -> Iterator[Event]:
        if self.p.load_current == 0:
            return
        if mode.load is Load.FULL:
            yield "load folded", -1.0, lambda o, y: o.output - FOLD_VOLTAGE
        else:
            up = Load.FULL if mode.load is Load.FOLDED else Load.FOLDED
            level = FOLD_VOLTAGE if mode.load is Load.FOLDED else 0.0
            yield f"load {up.value}", 1.0, lambda o, y: o.output - level
        if mode.load is Load.FOLDED:
            yield "load none", -1.0, lambda o, y: o.output
