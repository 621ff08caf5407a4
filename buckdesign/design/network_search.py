"""Hysteresis network, choke value and output capacitor, chosen by running the loop model.

A coarse grid over everything at a few critical points, then rounds of neighbours of the best at the corners
of the range. Both ways of coupling are searched: directly, with the feedback resistor found from the start
margin it leaves, and through a capacitor.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.requirement import Requirement
from buckdesign.design.scoring import (
    SMALL_POWER,
    Behaviour,
    PointGrid,
    Violations,
    behaviour,
    comfort,
    joined_points,
    point_grid,
    violations,
)
from buckdesign.design.sizing import ONSET_FACTOR, base_resistors, conduction_onset, lowest_nominal_highest
from buckdesign.design.trials import USUAL_FREQUENCY, Bench, Climate, Trials, grid, joined
from buckdesign.loop.results import Effort, steady_states

Floats = NDArray[np.float64]
Indices = NDArray[np.intp]

COARSE = Effort(plain=8, accelerated=16, more=16, patience=16, window=24, steps=3000, span=0.5)
"""Effort of the search: a rank, not a measurement."""

START_TARGETS = (1.9, 2.6, 3.8, 6.5, 13.0)
"""Start margins of the directly coupled candidates [1]: larger means more hysteresis, ripple and
regularity."""

RIPPLE_SHARES = (0.12, 0.2, 0.32, 0.5, 0.8, 1.25, 2.0)
"""Choke ripple over output current that the inductances are tried for [1]."""

COUPLED_RESISTORS = (8.2e3, 18e3, 39e3, 82e3)
"""Feedback resistors with a capacitor [ohm] (E12)."""

COUPLED_CAPACITORS = (100e-12, 220e-12, 470e-12, 1000e-12)
"""Feedback capacitors [F] (E6)."""

SMALL_RANGE = 8.0
"""Range of ambients whose lower end is not simulated in the search [K] (own choice)."""

SMALL_DRIVE_RESISTANCE = 4.7
"""Drive resistor below which it hardly limits a short circuit; each halving costs 0.5 [ohm] (own choice)."""

COUPLED_HANDICAP = 3.0
"""Score by which the best candidate with a capacitor may lag after the coarse grid [1]."""

LARGEST_FEEDBACK = 10e6
"""Largest resistor that is commonly sold [ohm] (common practice)."""

FREQUENCY_LIMITS = (8e3, 30e3)
"""Frequencies that a first inductance is sized for [Hz] (what the circuit reaches)."""

CHOKE_ENERGY = 20e-6
"""Energy in the choke at full load over output power that a usual ring holds [J/W] (common practice)."""

ADDED_LOSS = 0.01
"""Core and capacitor losses over output power, before there is a ring [1] (typical)."""

KEPT_COARSE, KEPT_PARENTS, KEPT_LAST = 40, 14, 8


@dataclass(frozen=True, kw_only=True)
class Found:
    """Candidates with what they do, best first.

    Attributes
    ----------
    trials : Trials
        n candidates.
    points : PointGrid
        Where they were simulated.
    behaviour : Behaviour
        What they do there.
    violations : Violations
        Of the requirement itself.
    score : ndarray
        Rank; smaller is better, shape (n,).
    """

    trials: Trials
    points: PointGrid
    behaviour: Behaviour
    violations: Violations
    score: Floats

    def __len__(self) -> int:
        return len(self.score)


def search_networks(
    requirement: Requirement, bench: Bench, *, spared: str | None = None, jobs: int | None = None
) -> Found:
    """Search networks, chokes and output capacitors with the loop model.

    Parameters
    ----------
    requirement : Requirement
        What is wanted.
    bench : Bench
        Parts and the way from candidates to loop parameters.
    spared : str, optional
        A line of the requirement (a field of `Violations`) that may give: all others go before it, and it is
        brought as near to its limit as they allow.
    jobs : int, optional
        Threads; all processors by default.

    Returns
    -------
    Found
        All candidates of the last rounds, best first; it may be that none keeps the requirement.
    """
    run = _Run(requirement=requirement, bench=bench, spared=spared, jobs=jobs)
    coarse = run.simulate(_coarse(requirement, bench), critical_points(requirement))
    coupled = np.flatnonzero(coarse.trials.ch > 0.0)
    direct = np.flatnonzero(coarse.trials.ch == 0.0)
    first = direct[:KEPT_COARSE]
    if _is_in_the_running(coarse, coupled, direct):
        first = np.concatenate([first, coupled[: KEPT_COARSE // 2]])
    points = corner_points(requirement, bench)
    lots = [coarse.trials.take(first)]
    for kept in (KEPT_PARENTS, KEPT_LAST):
        found = run.simulate(distinct(joined(lots)), points)
        parents = found.trials.take(_parents(found, kept))
        lots = [found.trials.take(np.arange(min(len(found), KEPT_COARSE))), neighbours(bench, parents)]
    return run.simulate(distinct(joined(lots)), points)


def _is_in_the_running(coarse: Found, coupled: Indices, direct: Indices) -> bool:
    """Whether candidates with a capacitor are worth simulating further: bursts at light load cost much
    time."""
    if len(coupled) == 0 or len(direct) == 0:
        return len(coupled) > 0
    return bool(coarse.score[coupled[0]] < coarse.score[direct[0]] + COUPLED_HANDICAP)


def critical_points(requirement: Requirement) -> PointGrid:
    """Points that tell most candidates apart: full load at both ends of the supply, half and light load."""
    low, nominal, high = requirement.supply.voltage
    load = requirement.output.current_max
    light = max(0.1 * load, requirement.output.current_min)
    half = max(0.5 * load, requirement.output.current_min)
    hot = PointGrid(
        supply=np.array([low, high, high, nominal]),
        load=np.array([load, load, light, half]),
        is_cold=np.zeros(4, dtype=bool),
    )
    if not has_cold(requirement):
        return hot
    return joined_points([hot, point_grid((high,), (load,), is_cold=True)])


def has_cold(requirement: Requirement) -> bool:
    """Whether the lowest ambient is far enough from the highest to be simulated too."""
    low, high = requirement.limits.ambient
    return high - low > SMALL_RANGE


def corner_points(requirement: Requirement, bench: Bench) -> PointGrid:
    """Both ends of the supply with the loads at which limits bind: smallest, just switching, a tenth, half,
    full.

    At the nominal supply, and at the lowest ambient, half and full load only.
    """
    low, high = requirement.output.current
    onset = ONSET_FACTOR * conduction_onset(
        bench.drawer.regulator.element,
        bench.drawer.transistors[0].element,
        bench.r1,
        base_resistors(high)[1],
    )
    loads = {load for load in (low, onset, 0.1 * high, 0.5 * high) if low <= load < high} | {high}
    lowest, nominal, highest = requirement.supply.voltage
    ends = lowest_nominal_highest((lowest, highest))
    upper = sorted(load for load in loads if load >= 0.5 * high)
    parts = [point_grid(ends, sorted(loads))]
    if lowest < nominal < highest:
        parts.append(point_grid((nominal,), upper))
    if has_cold(requirement):
        parts.append(point_grid(ends, upper, is_cold=True))
    return joined_points(parts)


def _coarse(requirement: Requirement, bench: Bench) -> Trials:
    """The first grid."""
    drawer, load = bench.drawer, requirement.output.current_max
    usual = usual_inductance(requirement)
    inductances = [usual / share for share in RIPPLE_SHARES]
    capacitors = spread(len(drawer.capacitors), 8)
    rbe = [base_resistors(load)[1]]
    targets = [(target, 0.0) for target in START_TARGETS]
    direct = grid(
        transistor=range(len(drawer.transistors)),
        capacitor=capacitors,
        inductance=inductances,
        network=targets,
        rectifier=[0],
        rbe=rbe,
    )
    feedback = np.minimum(bench.feedback_for_start(direct, direct.rh), LARGEST_FEEDBACK)
    direct = direct.with_values(rh=feedback)
    pairs = [(rh, ch) for rh in COUPLED_RESISTORS for ch in COUPLED_CAPACITORS]
    coupled = grid(
        transistor=[0],
        capacitor=spread(len(drawer.capacitors), 4),
        inductance=inductances[1::2],
        network=pairs,
        rectifier=[0],
        rbe=rbe,
    )
    return joined([direct, coupled])


def usual_inductance(requirement: Requirement) -> float:
    """Inductance at which the choke ripple equals the output current at a usual frequency [H]."""
    low, high = FREQUENCY_LIMITS
    band = requirement.limits.frequency
    frequency = USUAL_FREQUENCY if band is None else math.sqrt(max(band[0], 1.0) * band[1])
    frequency = min(max(frequency, low), high)
    output, supply = requirement.output, requirement.supply.voltage_nominal
    return output.voltage * (1.0 - min(output.voltage / supply, 0.95)) / frequency / output.current_max


def spread(count: int, most: int) -> list[int]:
    """At most so many indices, evenly over the range."""
    return sorted(set(np.linspace(0, count - 1, min(count, most)).round().astype(int).tolist()))


def distinct(trials: Trials) -> Trials:
    """Without repetitions, the first of equal ones kept."""
    table = np.column_stack(
        [
            trials.transistor,
            trials.rectifier,
            trials.capacitor,
            np.round(np.log(trials.inductance), 3),
            np.round(np.log(trials.rh), 3),
            trials.ch * 1e12,
            trials.rbe,
        ]
    )
    _, first = np.unique(table, axis=0, return_index=True)
    return trials.take(np.sort(first))


def neighbours(bench: Bench, parents: Trials) -> Trials:
    """Candidates one step away from each parent in one direction."""
    drawer = bench.drawer
    load = bench.requirement.output.current_max
    lots = [parents.with_values(rbe=np.full(len(parents), value)) for value in base_resistors(load)]
    lots += [parents.with_values(inductance=parents.inductance * step) for step in (0.7, 0.85, 1.2, 1.45)]
    lots += [parents.with_values(rh=parents.rh * step) for step in (0.68, 0.83, 1.2, 1.47)]
    lots += [
        parents.with_values(capacitor=np.clip(parents.capacitor + step, 0, len(drawer.capacitors) - 1))
        for step in (-2, -1, 1, 2)
    ]
    lots += [
        parents.with_values(rectifier=np.full(len(parents), other)) for other in range(len(drawer.rectifiers))
    ]
    coupled = parents.take(parents.ch > 0.0)
    if len(coupled):
        lots += [coupled.with_values(ch=coupled.ch * step) for step in (1 / 1.5, 1.5)]
    made = joined(lots)
    made = made.take((made.ch > 0.0) | (bench.start_margins(made) > 1.3))
    return made.take(made.rh <= LARGEST_FEEDBACK)


def _parents(found: Found, kept: int) -> Indices:
    """The best, with some of the other way of coupling among them."""
    coupled = found.trials.ch > 0.0
    order = np.arange(len(found))
    if len(found) == 0:
        return order
    other = order[coupled != coupled[0]][: max(2, kept // 4)]
    return np.unique(np.concatenate([order[:kept], other]))


@dataclass(frozen=True, kw_only=True)
class _Run:
    """Simulates and ranks candidates of one search."""

    requirement: Requirement
    bench: Bench
    spared: str | None
    jobs: int | None

    def simulate(self, trials: Trials, points: PointGrid) -> Found:
        """Run candidates at points and rank them."""
        requirement, bench = self.requirement, self.bench
        trials = trials.take(bench.is_drivable(trials))
        lots = [
            bench.rows(trials, supply, load, Climate.COLD if is_cold else Climate.HOT)
            for supply, load, is_cold in zip(points.supply, points.load, points.is_cold, strict=True)
        ]
        rows = np.stack(lots, axis=1).reshape(-1, lots[0].shape[1])
        loop = steady_states(rows, effort=COARSE, jobs=self.jobs)
        added = ADDED_LOSS * np.tile(points.load, len(trials)) * requirement.output.voltage
        done = behaviour(loop, added, len(points))
        start = bench.start_margins(trials)
        broken = violations(requirement, points, done, start, safe=False)
        wanted = violations(requirement, points, done, start, safe=True)
        score = 100.0 * self._weighed(broken) + 10.0 * self._weighed(wanted)
        score += comfort(requirement, points, done) + size_cost(requirement, bench, trials)
        order = np.argsort(score, kind="stable")
        return Found(
            trials=trials.take(order),
            points=points,
            behaviour=done.take(order),
            violations=broken.take(order),
            score=score[order],
        )

    def _weighed(self, broken: Violations) -> Floats:
        if self.spared is None:
            return broken.total
        return 10.0 * broken.without(self.spared) + getattr(broken, self.spared)


def size_cost(requirement: Requirement, bench: Bench, trials: Trials) -> Floats:
    """Cost of what is large or special.

    0.8 for each doubling of the choke's energy and 0.4 of capacitance beyond the usual, 0.5 for each halving
    of a small drive resistor, 0.7 for an output capacitor that is no ordinary one of low impedance.
    """
    output = requirement.output
    energy = 0.5 * trials.inductance * output.current_max**2
    usual = CHOKE_ENERGY * (output.voltage * output.current_max + SMALL_POWER)
    parts = bench.drawer.capacitors
    capacitance = np.array([one.capacitance for one in parts])[trials.capacitor]
    special = np.array([one.kind != "low-impedance electrolytic" for one in parts])[trials.capacitor]
    cost = 0.8 * np.maximum(np.log2(energy / usual), -0.5)
    cost = cost + 0.4 * np.maximum(np.log2(capacitance / 470e-6), 0.0) + 0.7 * special
    size = np.array([one.size for one in bench.drawer.transistors])[trials.transistor]
    size = size + np.array([one.size for one in bench.drawer.rectifiers])[trials.rectifier]
    drive = np.maximum(bench.drive_resistors(trials), 0.1)
    cost = cost + 0.5 * np.maximum(np.log2(SMALL_DRIVE_RESISTANCE / drive), 0.0)
    return cost + size + high_resistance_cost(trials.rh)


def high_resistance_cost(rh: Floats | float) -> Floats:
    """Cost of a hysteresis resistor beyond 4.7 Mohm, where dirt on the board matters: 1 for each doubling."""
    return np.maximum(np.log2(np.asarray(rh, dtype=float) / 4.7e6), 0.0)
