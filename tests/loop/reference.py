"""Reference integration of the loop model for the tests: plain, and independent of the package's kernel.

The hybrid system of `tests.loop.reference_model` is integrated mode by mode with
``scipy.integrate.solve_ivp`` and its event location; here are the rules that choose the next mode.

Readings taken where the model's description leaves room:

1. *Upper bound, leaving it.* ``Release.FOLLOW``: ``i_R`` follows the bound while ``(e - R_o i_R) / L_o >=
   d(bound)/dt`` along the constrained motion (Filippov); it leaves otherwise, also when the bound rises
   faster than ``i_R`` can. ``Release.AT_ZERO``: it leaves already when ``e - R_o i_R < 0`` and may then lie
   above a bound that moves inward; not in active, where this would chatter. The spot values certain to 1e-7
   are of the second kind; the first gives up to 4e-6 more.
2. *Upper bound, jumps.* A bound that jumps inward (the switch node jumps, ``v_out`` with it) carries
   ``i_R``; one that jumps outward (the base stops conducting) leaves ``i_R`` where it was and free.
3. *Bound below I_q.* ``i_R`` is then pinned to ``I_q``.
4. *Fold-back.* Differential with ``V_BE`` as printed even while the base does not conduct; beyond the far
   voltage the limit stays at its far value. ``s (R_drive + ESR) >= 1 > s R_drive`` has no unique algebra:
   refused.
5. *Load.* The fold below 0.5 V concerns the constant part only; a resistive part stays linear below 0 V.
6. *Saturated, i_av falls to i_L.* Freewheel if ``i_av - i_L`` falls in the freewheel field too, else
   active.
7. *Freewheel, i_av rises to i_L.* With recovery charge: recovering if ``i_av - i_L`` also rises with the
   node at 0 V, else active (no recovery afterwards). Without: saturated if it rises in the saturated field,
   else active.
8. *Recovering.* Swept charge counts from zero at each entry. Falling back to ``i_L``: as reading 6. Choke
   current reaching zero while recovering: held at zero, node still at 0 V, until the charge is swept.
9. *Empty with charge in the base* (``v_out`` above ``V_in - V_CE0``): once ``v_out`` falls below, ``i_av >
   0 = i_L``, so the node becomes saturated; the rule "empty leads to active" is for ``q = 0``.
10. *Active, q falls to zero*: empty, also when the node is then below ``v_out``.
11. *Cycles.* Every leaving of freewheel or empty counts, a return from recovering to freewheel included.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.integrate import solve_ivp

from buckdesign.loop.parameters import LoopParameters
from tests.loop.reference_model import (
    FOLD_VOLTAGE,
    STATE_SCALE,
    Clamp,
    Load,
    Mode,
    Piece,
    Release,
    Switch,
    System,
    below_lowest,
    folded,
    highest,
)

BETWEEN_CYCLES = (Switch.FREEWHEEL, Switch.EMPTY)
State = NDArray[np.float64]


class ReferenceStopped(RuntimeError):
    """A cap on evaluations or events was reached, or the solver gave up."""


@dataclass(frozen=True, kw_only=True)
class Settings:
    """How to integrate: tolerances [1], method, largest step [s] and the caps that end a hopeless run."""

    rtol: float = 1e-10
    atol: float = 1e-12
    method: str = "DOP853"
    max_step: float = 3e-6
    max_evaluations: int = 20_000_000
    max_events: int = 200_000


PRECISE = Settings()
FAST = Settings(rtol=1e-6, atol=1e-8, method="RK45", max_step=np.inf)


@dataclass
class Segment:
    """One stretch between two events: mode, begin and length [s], dense solution from its begin."""

    mode: Mode
    begin: float
    length: float
    solution: Any


@dataclass
class Run:
    """Outcome of `Reference.run`.

    ``cycle_times`` [s], ``cycle_states`` (6 numbers each) and ``cycle_modes`` are taken just after each cycle
    start; ``events`` holds (time [s], name, mode after); ``segments`` is empty unless asked for.
    """

    time: float
    state: State
    mode: Mode
    cycle_times: list[float] = field(default_factory=list)
    cycle_states: list[State] = field(default_factory=list)
    cycle_modes: list[Mode] = field(default_factory=list)
    events: list[tuple[float, str, Mode]] = field(default_factory=list)
    segments: list[Segment] = field(default_factory=list)
    evaluations: int = 0


class Reference(System):
    """The hybrid system of one circuit with its transitions and integration.

    Parameters
    ----------
    parameters : LoopParameters
        The circuit.
    settings : Settings
        Tolerances and caps.
    release : Release
        Reading 1.
    """

    def __init__(
        self,
        parameters: LoopParameters,
        settings: Settings = PRECISE,
        release: Release = Release.FOLLOW,
    ) -> None:
        super().__init__(parameters, release)
        self.settings = settings

    # ---- start

    def operating_start(self) -> tuple[State, Mode]:
        """``i_L`` = load, ``v_C`` = set value, ``i_R`` = I_q, ``q`` = 0, ``v_H`` at its DC value."""
        p = self.p
        v = self.set_value()
        choke = p.load_current + v / p.load_resistance
        v_h = p.reference if p.hysteresis_capacitance > 0 else 0.0
        return self._start([choke, v, self.lowest, 0.0, v_h, 0.0])

    def rest_start(self) -> tuple[State, Mode]:
        """Everything zero (``i_R`` = I_q)."""
        return self._start([0.0, 0.0, self.lowest, 0.0, 0.0, 0.0])

    def _start(self, y: list[float]) -> tuple[State, Mode]:
        switch = Switch.FREEWHEEL if y[0] > 0 else Switch.EMPTY
        base = y[2] > self.base_threshold
        mode = self.reconcile(Mode(switch, Clamp.LOW, base, Load.FULL, Piece.DRIVE), y)
        if switch is Switch.EMPTY and base and self.point(mode, y).output < self.ceiling:
            mode = self.reconcile(mode._replace(switch=Switch.ACTIVE), y)
        return np.array(y), mode

    # ---- transitions

    def reconcile(self, mode: Mode, y: list[float]) -> Mode:
        """Load line and clamp after the switch node or the base has jumped; may carry ``i_R`` in ``y``."""
        mode = self._load_at(mode, y)
        resistance = self.p.output_resistance
        left = False
        if mode.clamp is Clamp.LOW and self.point(mode, y).error > resistance * self.lowest:
            mode = mode._replace(clamp=Clamp.FREE)
        elif mode.clamp is Clamp.HIGH:
            mode, left = self._at_bound(mode, y)
        if mode.clamp is not Clamp.FREE:
            return mode
        at = self.point(mode, y)
        if self.excess(mode, at) > 0 and not left:
            mode, left = self._at_bound(mode, y)
        elif y[2] <= self.lowest and at.error <= resistance * y[2]:
            mode = mode._replace(clamp=Clamp.LOW)
        return mode

    def _at_bound(self, mode: Mode, y: list[float]) -> tuple[Mode, bool]:
        """Stay on the upper bound, or leave it; the second value says "left"."""
        values = self.piece_values(mode, y)
        piece = highest(values)
        if mode.clamp is Clamp.HIGH and y[2] < values[piece] - 1e-14:
            return mode._replace(clamp=Clamp.FREE), False
        mode = mode._replace(clamp=Clamp.HIGH, piece=piece)
        y[2] = values[piece]
        if self.outward(mode, y, self.point(mode, y)) < 0:
            return self._leave_bound(mode), True
        return mode, False

    @staticmethod
    def _leave_bound(mode: Mode) -> Mode:
        return mode._replace(clamp=Clamp.LOW if mode.piece is Piece.LOWEST else Clamp.FREE)

    def _load_at(self, mode: Mode, y: list[float]) -> Mode:
        if self.p.load_current == 0:
            return mode._replace(load=Load.FULL)
        if self.point(mode._replace(load=Load.FULL), y).output >= FOLD_VOLTAGE:
            return mode._replace(load=Load.FULL)
        negative = self.point(mode._replace(load=Load.NONE), y).output < 0
        return mode._replace(load=Load.NONE if negative else Load.FOLDED)

    def slip(self, mode: Mode, y: list[float], switch: Switch) -> float:
        """Rate of ``i_av - i_L`` in another switch mode [A/s]."""
        mode = mode._replace(switch=switch)
        rate = self.derivative(mode, y)
        return self.gain_rate / (1 + 2 * y[0] / self.p.gain_knee) * rate[3] - rate[0]

    def after(self, name: str, mode: Mode, y: list[float]) -> Mode:
        """Mode after an event; snaps the states in ``y`` onto what the event means."""
        at = self.point(mode, y)
        y[0], y[2] = at.choke, at.regulator
        first, _, rest = name.partition(" ")
        match first:
            case "load":
                return mode._replace(load=Load(rest))
            case "piece":
                return self._after_piece(rest, mode, y)
            case "reach":
                if rest == "low":
                    return mode._replace(clamp=Clamp.LOW)
                return mode._replace(clamp=Clamp.HIGH, piece=highest(self.piece_values(mode, y)))
            case "leave":
                if rest == "high":
                    return self._leave_bound(mode)
                pinned = self.upper(at.output, mode.base) <= self.lowest
                return mode._replace(clamp=Clamp.HIGH if pinned else Clamp.FREE, piece=Piece.LOWEST)
            case "base":
                mode = self._after_base(rest == "on", mode, y)
            case _:
                mode = self._after_switch(name, mode, y)
        return self.reconcile(mode, y)

    def _after_piece(self, which: str, mode: Mode, y: list[float]) -> Mode:
        values = self.piece_values(mode, y)
        match which:
            case "rest":
                piece = below_lowest(values)
            case "folded":
                piece = folded(values)
            case _:
                piece = Piece(which)
        mode = mode._replace(piece=piece)
        if self.outward(mode, y, self.point(mode, y)) < 0:
            return self._leave_bound(mode)
        return mode

    def _after_base(self, on: bool, mode: Mode, y: list[float]) -> Mode:
        y[3] = 0.0
        if not on:
            if mode.switch is Switch.ACTIVE:
                y[0] = 0.0
                mode = mode._replace(switch=Switch.EMPTY)
            return mode._replace(base=False)
        mode = mode._replace(base=True)
        if mode.switch is Switch.EMPTY and self.point(mode, y).output < self.ceiling:
            mode = mode._replace(switch=Switch.ACTIVE)
        return mode

    def _after_switch(self, name: str, mode: Mode, y: list[float]) -> Mode:
        old = mode.switch
        swept, y[5] = y[5], 0.0
        switch = Switch.SATURATED
        match name:
            case "floor":
                switch = Switch.FREEWHEEL
            case "refill":
                switch = Switch.SATURATED if y[3] > 0 else Switch.ACTIVE
            case "swept":
                if y[0] <= 0 and self.point(mode, y).output >= self.ceiling:
                    switch = Switch.EMPTY
            case "choke empty":
                y[0] = 0.0
                switch = Switch.EMPTY
                if old is Switch.RECOVERING:
                    switch, y[5] = Switch.RECOVERING_EMPTY, swept
                elif old is Switch.FREEWHEEL:
                    return self._after_base(y[2] > self.base_threshold, mode._replace(switch=switch), y)
            case "meet" if y[0] <= 0 and old is Switch.FREEWHEEL:
                return self._after_switch("choke empty", mode, y)
            case "meet":
                return self._after_meeting(mode, y)
        return mode._replace(switch=switch)

    def _after_meeting(self, mode: Mode, y: list[float]) -> Mode:
        """``i_av`` has come to ``i_L``."""
        y[3] = self.charge(y[0])
        if mode.switch is Switch.RECOVERING_EMPTY:
            return self._after_base(y[2] > self.base_threshold, mode._replace(switch=Switch.EMPTY), y)
        if mode.switch is Switch.FREEWHEEL:
            follow = Switch.RECOVERING if self.p.recovery_charge > 0 else Switch.SATURATED
            passes = self.slip(mode, y, follow) > 0
        else:
            follow = Switch.FREEWHEEL
            passes = self.slip(mode, y, follow) < 0
        return mode._replace(switch=follow if passes else Switch.ACTIVE)

    # ---- integration

    def _stretch(self, mode: Mode, y: State, horizon: float, dense: bool) -> Any:
        """Integrate one mode up to its first event or the horizon; gives solve_ivp's result, event names."""
        cache: dict[float, tuple[Any, list[float]]] = {}

        def at(t: float, state: State) -> tuple[Any, list[float]]:
            if t not in cache:
                cache.clear()
                values = state.tolist()
                cache[t] = (self.point(mode, values), values)
            return cache[t]

        def event(direction: float, function: Any) -> Any:
            def value(t: float, state: State) -> float:
                return float(function(*at(t, state)))

            value.terminal = True  # type: ignore[attr-defined]
            value.direction = direction  # type: ignore[attr-defined]
            return value

        listed = self.events(mode)
        s = self.settings
        result = solve_ivp(
            lambda t, state: self.derivative(mode, state.tolist()), (0.0, horizon), y, method=s.method,
            events=[event(direction, function) for _, direction, function in listed],
            rtol=s.rtol, atol=s.atol * STATE_SCALE, max_step=s.max_step, dense_output=dense,
        )
        return result, [listed[k][0] for k, times in enumerate(result.t_events) if len(times)]

    def run(
        self,
        start: tuple[State, Mode],
        span: float,
        cycles: int | None = None,
        keep: bool = False,
    ) -> Run:
        """Integrate for a time span [s], or up to the given number of cycle starts if that comes first.

        Raises
        ------
        ReferenceStopped
            At a cap of the settings, or when the solver fails.
        """
        y, mode = np.array(start[0], dtype=float), start[1]
        out = Run(0.0, y, mode)
        idle = 0
        while out.time < span and (cycles is None or len(out.cycle_times) < cycles):
            result, names = self._stretch(mode, y, span - out.time, keep)
            out.evaluations += result.nfev
            if result.status < 0:
                raise ReferenceStopped(f"{result.message} in {mode} at {out.time} s")
            length = float(result.t[-1])
            if keep:
                out.segments.append(Segment(mode, out.time, length, result.sol))
            out.time = out.time + length if names else span
            values = result.y[:, -1].tolist()
            old = mode.switch
            if names:
                mode = self.after(names[0], mode, values)
                out.events.append((out.time, names[0], mode))
            else:
                at = self.point(mode, values)
                values[0], values[2] = at.choke, at.regulator
            y = np.array(values)
            if old in BETWEEN_CYCLES and mode.switch not in BETWEEN_CYCLES:
                out.cycle_times.append(out.time)
                out.cycle_states.append(y)
                out.cycle_modes.append(mode)
            idle = idle + 1 if length == 0 else 0
            s = self.settings
            if idle > 20 or len(out.events) > s.max_events or out.evaluations > s.max_evaluations:
                raise ReferenceStopped(f"cap in {mode} at {out.time} s after {len(out.events)} events")
        out.state, out.mode = y, mode
        return out


def steady_span(parameters: LoopParameters, span: float, rtol: float = 1e-6) -> Run:
    """Integrate a time span [s] from the operating start with ``RK45``: the plain way, for timing."""
    settings = Settings(rtol=rtol, atol=rtol * 1e-2, method="RK45", max_step=np.inf)
    circuit = Reference(parameters, settings)
    return circuit.run(circuit.operating_start(), span)


def period_of(states: Sequence[State], tolerance: float = 1e-8, longest: int = 8) -> int | None:
    """Smallest lag in cycles at which the cycle-start states repeat, or None."""
    for lag in range(1, min(longest, len(states) - 1) + 1):
        pairs = range(max(len(states) - lag, lag), len(states))
        difference = [np.abs(states[k] - states[k - lag]) / STATE_SCALE for k in pairs]
        if np.max(difference) < tolerance:
            return lag
    return None
