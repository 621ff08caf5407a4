"""The loop's public face: steady states of many designs, waveforms and trajectories of one.

Arrays in, arrays out; the compiled kernel behind it treats one design and a million alike.
"""

from __future__ import annotations

import os
from collections.abc import Sequence
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass
from enum import Enum
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from .accounting import A_TIME, ACCOUNTS
from .changes import classify
from .constants import CONSTANTS, DISCRETES, MODE_NAMES, ORDER, ROWS, STATES, X_VH, derive
from .following import TANGENT
from .parameters import COLUMNS, LoopParameters
from .sampling import SAMPLES, cycle_starts, record
from .sampling import WIDTH as SAMPLE_WIDTH
from .steady import OUTPUT, OUTPUTS, REGIMES, WIDTH, _residual, operating_start, solve_rows

if TYPE_CHECKING:
    import pandas as pd

Floats = NDArray[np.float64]


class Start(Enum):
    """Where the trajectory begins: at the operating point, or with everything discharged."""

    OPERATING = "operating"
    REST = "rest"


@dataclass(frozen=True, kw_only=True)
class Effort:
    """How long the kernel looks for a steady state.

    Attributes
    ----------
    plain : int
        Cycles iterated plainly before the orbit is closed by acceleration [1].
    accelerated : int
        Most evaluations of the return map in one attempt to close the orbit [1].
    more : int
        Further plain cycles, with attempts between them, before the loop is called irregular [1].
    patience : int
        The same where a rest point is stable as well, which bursts may find late [1].
    window : int
        Cycles averaged over where the loop is irregular [1].
    steps : int
        Most integration steps between two cycles [1].
    span : float
        Longest time between two cycles [s].
    tolerance : float
        Error of one step, relative to the load current, and in volts [1].
    """

    plain: int = 6
    accelerated: int = 20
    more: int = 18
    patience: int = 600
    window: int = 64
    steps: int = 20000
    span: float = 20.0
    tolerance: float = 5e-10

    def array(self, *, follow: bool = False) -> Floats:
        """The settings in the order that the kernel reads them, shape (9,)."""
        return np.array(
            [
                self.plain,
                self.accelerated,
                self.more,
                self.window,
                self.steps,
                self.span,
                self.patience,
                self.tolerance,
                float(follow),
            ],
            np.float64,
        )


STUDY = Effort()
DETAILED = Effort(more=620, patience=4000, window=500, steps=100000, tolerance=1e-12)


@dataclass(frozen=True, kw_only=True)
class SteadyStates:
    """Steady states of n designs.

    Attributes
    ----------
    values : NDArray
        One row a design, one column a quantity of `OUTPUTS`, shape (n, len(OUTPUTS)).
    ends : NDArray
        State (i_L, v_C, i_R, q, v_H, swept charge) at the end of the averaging window, shape (n, 6).
    """

    values: Floats
    ends: Floats

    def __len__(self) -> int:
        return len(self.values)

    def column(self, name: str) -> Floats:
        """One quantity of all designs, shape (n,)."""
        return self.values[:, OUTPUT[name]]

    def regimes(self) -> list[str]:
        """The regime of each design by name."""
        return [REGIMES[int(code)] for code in self.column("regime")]

    def record(self, index: int) -> dict[str, float]:
        """All quantities of one design by name."""
        return dict(zip(OUTPUTS, (float(value) for value in self.values[index]), strict=True))

    def frame(self) -> pd.DataFrame:
        """The table with the regime by name and irregular periods as missing values."""
        import pandas as pd

        frame = pd.DataFrame(self.values, columns=list(OUTPUTS))
        frame["regime"] = self.regimes()
        frame["period_cycles"] = frame["period_cycles"].where(frame["period_cycles"] >= 0)
        return frame


def _start_states(rows: Floats, start: Start) -> tuple[Floats, bool]:
    if start is Start.OPERATING:
        return np.zeros((1, 5)), False
    return np.zeros((len(rows), 5)), True


def steady_states(
    rows: Floats, *, start: Start = Start.OPERATING, starts: Floats | None = None, effort: Effort = STUDY,
    jobs: int | None = None, tangents: Floats | None = None,
) -> SteadyStates:  # fmt: skip
    """Steady state of every design.

    Parameters
    ----------
    rows : NDArray
        Designs as rows in the order of `COLUMNS`, shape (n, len(COLUMNS)), SI.
    start : Start
        Where each trajectory begins.
    starts : NDArray, optional
        Starting states (i_L, v_C, i_R, q, v_H) instead, shape (n, 5), SI; v_H counts only where there is C_h.
    effort : Effort
        How long to look for the steady state.
    jobs : int, optional
        Threads to share the designs; all processors by default.
    tangents : NDArray, optional
        Derivatives of the return maps of nearly the same designs, from whose ends these start, as an earlier
        run left them here, or zeros, shape (n, *TANGENT); changed into those of these designs.

    Returns
    -------
    SteadyStates
        One row a design.

    Raises
    ------
    ValueError
        Where the rows have another number of columns, or a value is not a number.
    """
    rows = np.ascontiguousarray(np.atleast_2d(rows), dtype=np.float64)
    if rows.shape[1] != len(COLUMNS):
        raise ValueError(f"a parameter row has {len(COLUMNS)} columns, got {rows.shape[1]}")
    if np.isnan(rows).any():
        raise ValueError("a parameter row holds a value that is not a number")
    begin, given = _start_states(rows, start)
    if starts is not None:
        begin, given = np.ascontiguousarray(starts, dtype=np.float64), True
    out = np.empty((len(rows), WIDTH))
    ends = np.empty((len(rows), STATES))
    settings = effort.array(follow=tangents is not None)
    kept = np.zeros((1, *TANGENT)) if tangents is None else tangents
    workers = max(1, jobs or os.cpu_count() or 1)
    if workers == 1 or len(rows) < 2:
        solve_rows(rows, begin, given, settings, out, ends, kept)
        return SteadyStates(values=out, ends=ends)
    size = max(1, min(256, -(-len(rows) // (4 * workers))))

    def share(first: int) -> None:
        part = slice(first, first + size)
        own = kept if tangents is None else kept[part]
        solve_rows(rows[part], begin[part] if given else begin, given, settings, out[part], ends[part], own)

    with ThreadPoolExecutor(workers) as pool:
        list(pool.map(share, range(0, len(rows), size)))
    return SteadyStates(values=out, ends=ends)


class _Machine:
    """Work arrays of one design, with its state."""

    def __init__(self, parameters: LoopParameters, start: Sequence[float] | None) -> None:
        self.row = parameters.row()
        self.c = np.empty(CONSTANTS)
        self.x = np.zeros(STATES)
        self.m = np.zeros(DISCRETES, np.int64)
        self.s = np.zeros((ROWS, ORDER + 1))
        derive(self.row, self.c)
        if start is None:
            operating_start(self.row, self.c, self.x)
        else:
            self.x[: len(start)] = start
            if parameters.hysteresis_capacitance <= 0.0:
                self.x[X_VH] = 0.0
        classify(self.c, self.x, self.m, self.s)


@dataclass(frozen=True, kw_only=True)
class Waveforms:
    """Sampled waveforms of one design.

    Attributes
    ----------
    samples : NDArray
        One row a sample, one column a quantity of `SAMPLES`, shape (n, len(SAMPLES)); two samples at one
        instant where a quantity jumps.
    cycles : int
        Cycles begun in the recording [1].
    """

    samples: Floats
    cycles: int

    def column(self, name: str) -> Floats:
        """One quantity over time, shape (n,)."""
        return self.samples[:, SAMPLES.index(name)]

    def modes(self) -> list[str]:
        """Switch mode at each sample by name."""
        return [MODE_NAMES[int(code)] for code in self.column("mode")]

    def frame(self) -> pd.DataFrame:
        """The samples as a table, the mode by name."""
        import pandas as pd

        frame = pd.DataFrame(self.samples, columns=list(SAMPLES))
        frame["mode"] = self.modes()
        return frame


def waveforms(
    parameters: LoopParameters, *, start: Sequence[float] | None = None, cycles: int = 3, span: float = 0.05,
    per_step: int = 8, spacing: float = float("inf"),
) -> Waveforms:  # fmt: skip
    """Waveforms from a starting state over some cycles.

    Parameters
    ----------
    parameters : LoopParameters
        The design at its operating point.
    start : sequence of float, optional
        Starting state (i_L, v_C, i_R, q, v_H, swept charge), SI, such as an end of `SteadyStates`; the
        operating start by default.
    cycles : int
        Cycles to record; the recording ends where the next cycle after them begins [1].
    span : float
        Longest time to record [s].
    per_step : int
        Least number of intervals that a step of the integrator is sampled in [1].
    spacing : float
        Largest distance between two samples, down to 400 a step [s].

    Returns
    -------
    Waveforms
        The samples, from time 0.
    """
    machine = _Machine(parameters, start)
    rows = np.empty((400_000, SAMPLE_WIDTH))
    filled, _, begun = record(
        machine.c, machine.x, machine.m, machine.s, cycles, span, per_step, min(spacing, 1e9), rows
    )
    return Waveforms(samples=rows[:filled].copy(), cycles=int(begun))


@dataclass(frozen=True, kw_only=True)
class Trajectory:
    """Beginnings of cycles from a starting state.

    Attributes
    ----------
    times : NDArray
        Time of each cycle's beginning [s], shape (n,).
    states : NDArray
        State (i_L, v_C, i_R, q, v_H, swept charge) there, shape (n, 6), SI.
    accounts : NDArray
        The kernel's accounts over the whole run, shape (ACCOUNTS,).
    end : NDArray
        State at the end, shape (6,).
    energy_residual : float
        Energy that the accounts leave unexplained, relative to the input [1].
    """

    times: Floats
    states: Floats
    accounts: Floats
    end: Floats
    energy_residual: float

    @property
    def duration(self) -> float:
        """Time run [s]."""
        return float(self.accounts[A_TIME])


def trajectory(
    parameters: LoopParameters, *, start: Sequence[float] | None = None, cycles: int = 500, span: float = 1.0
) -> Trajectory:
    """Run a design from a starting state without settling.

    Parameters
    ----------
    parameters : LoopParameters
        The design at its operating point.
    start : sequence of float, optional
        Starting state (i_L, v_C, i_R, q, v_H), SI; the operating start by default.
    cycles : int
        Stop where this many cycles have begun [1].
    span : float
        Stop after this time [s].

    Returns
    -------
    Trajectory
        Cycle beginnings and accounts.
    """
    machine = _Machine(parameters, start)
    first = machine.x.copy()
    times = np.empty(cycles)
    states = np.empty((cycles, STATES))
    accounts = np.empty(ACCOUNTS)
    begun = cycle_starts(machine.c, machine.x, machine.m, machine.s, cycles, span, times, states, accounts)
    return Trajectory(
        times=times[:begun].copy(), states=states[:begun].copy(), accounts=accounts, end=machine.x.copy(),
        energy_residual=float(_residual(machine.c, accounts, first, machine.x)),
    )  # fmt: skip


def at_operating_points(parameters: LoopParameters, **columns: Floats) -> Floats:
    """Rows of one design with some parameters varied together.

    Parameters
    ----------
    parameters : LoopParameters
        The design.
    **columns : NDArray
        Values by parameter name, all of one shape (n,), SI.

    Returns
    -------
    NDArray
        Rows for `steady_states`, shape (n, len(COLUMNS)).
    """
    length = max((np.size(values) for values in columns.values()), default=1)
    rows = np.repeat(parameters.row()[None, :], length, axis=0)
    for name, values in columns.items():
        rows[:, COLUMNS.index(name)] = values
    return rows


__all__ = [
    "DETAILED",
    "OUTPUTS",
    "REGIMES",
    "SAMPLES",
    "STUDY",
    "Effort",
    "LoopParameters",
    "Start",
    "SteadyStates",
    "Trajectory",
    "Waveforms",
    "at_operating_points",
    "steady_states",
    "trajectory",
    "waveforms",
]
