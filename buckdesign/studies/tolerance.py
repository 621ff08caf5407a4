"""Tolerance study of a design: yield by Monte Carlo, worst case, where the spread comes from, and ageing."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from buckdesign.design.ambient_limits import check_ambient
from buckdesign.design.design_file import Design
from buckdesign.design.requirement import Requirement
from buckdesign.design.resolve import resolve_design
from buckdesign.design.tolerances import Tolerance
from buckdesign.errors import InputError
from buckdesign.parts import Tables, load_tables
from buckdesign.studies.ageing import Wear, wear_of, wear_warnings
from buckdesign.studies.response import fitted_response
from buckdesign.studies.sensitivity import Sensitivity, shown_margins, sobol_sensitivity, values_that_matter
from buckdesign.studies.spreads import factors_at, unit_quantiles
from buckdesign.studies.study_effort import UNITS, StudyEffort
from buckdesign.studies.tolerance_defaults import PART_TABLE, SPECIFIED_L_O
from buckdesign.studies.tolerance_keys import Varied, varied_values
from buckdesign.studies.tolerance_result import SingleUnit, ToleranceStudy
from buckdesign.studies.unit_designs import UNIT_KEYS
from buckdesign.studies.unit_points import usual_point, whole_range, with_points, worst_places
from buckdesign.studies.unit_runs import UnitModel, UnitRuns
from buckdesign.studies.worst_case import WorstCase, WorstCorner, moved_alone, worst_case
from buckdesign.studies.yields import Tighter, tighter_yield

if TYPE_CHECKING:
    import pandas as pd

SPOT_CHECKED = 32
"""Passing units looked at again over the whole range [1] (own choice)."""


OUTPUT_INDUCTANCE = "regulator.output_inductance"

WORSE = 0.01
"""Difference of margins, or share of one, that counts as worse [1] (own choice)."""

CLOSE = 0.1
"""Margin from which on it does not matter which is worse [1] (own choice)."""


@dataclass(frozen=True, kw_only=True)
class Setting:
    """A design ready to be judged unit by unit.

    Attributes
    ----------
    varied : tuple of Varied
        What differs from unit to unit.
    model : UnitModel
        Computes units.
    whole : UnitModel
        The same over the whole range.
    seed : int
        Of the random numbers.
    """

    varied: tuple[Varied, ...]
    model: UnitModel
    whole: UnitModel
    seed: int

    def drawn(self, start: int, stop: int) -> dict[str, NDArray[np.float64]]:
        """Factors of some units on their nominal values by key [1], shape (stop - start,)."""
        places = [one.place for one in self.varied]
        shares = np.array(
            [unit_quantiles(self.seed, unit, places, len(UNIT_KEYS)) for unit in range(start, stop)]
        )
        return {
            one.key: factors_at(one.tolerance, shares[:, column]) for column, one in enumerate(self.varied)
        }


def prepare_units(
    design: Design,
    *,
    requirement: Requirement | None = None,
    tolerances: Mapping[str, Tolerance] | None = None,
    with_defaults: bool = False,
    tables: Tables | None = None,
    effort: StudyEffort | None = None,
) -> Setting:
    """Everything that the units of a design share.

    Parameters
    ----------
    design : Design
        The design.
    requirement : Requirement, optional
        What to count against; the one that the design carries where omitted.
    tolerances : Mapping, optional
        `Tolerance` by dotted key instead of the ``[tolerance]`` table of the design.
    with_defaults : bool
        Take the defaults of the trade for the values that the table leaves out.
    tables : Tables, optional
        Parts that the design names; the tables of the package where omitted.
    effort : StudyEffort, optional
        How much is done.

    Returns
    -------
    Setting
        Tolerances, points and the models.

    Raises
    ------
    InputError
        There is nothing to count against, a value is not allowed, or a part is not known.
    """
    how = StudyEffort() if effort is None else effort
    wanted = design.requirement if requirement is None else requirement
    if wanted is None:
        place = "design" if design.source is None else str(design.source)
        raise InputError(
            f"{place}: no requirement to count against; give [requirement.supply] and [requirement.output] in the "
            "design file, or --requirement FILE"
        )
    known = load_tables() if tables is None else tables
    resolved = resolve_design(design, known)
    check_ambient(resolved, wanted.limits.ambient[1])
    varied = varied_values(design, resolved, known, given=tolerances, with_defaults=with_defaults)
    points = whole_range(wanted, resolved)
    whole = UnitModel(
        nominal=resolved,
        requirement=wanted,
        points=points,
        usual=usual_point(wanted, points),
        electrical_only=how.electrical_only,
        jobs=how.jobs,
    )
    model = whole if how.all_points else with_points(whole, worst_places(whole, varied))
    return Setting(varied=varied, model=model, whole=whole, seed=how.seed)


def tolerance_study(
    design: Design,
    *,
    requirement: Requirement | None = None,
    tolerances: Mapping[str, Tolerance] | None = None,
    with_defaults: bool = False,
    tables: Tables | None = None,
    effort: StudyEffort | None = None,
    tell: Callable[[str], None] | None = None,
) -> ToleranceStudy:
    """Yield, worst case, sensitivity and ageing of a design.

    Parameters
    ----------
    design : Design
        The design.
    requirement : Requirement, optional
        What to count against; the one that the design carries where omitted.
    tolerances : Mapping, optional
        `Tolerance` by dotted key instead of the ``[tolerance]`` table of the design.
    with_defaults : bool
        Take the defaults of the trade for the values that the table leaves out.
    tables : Tables, optional
        Parts that the design names; the tables of the package where omitted.
    effort : StudyEffort, optional
        How much is done.
    tell : callable, optional
        Gets a few words at the beginning of each step.

    Returns
    -------
    ToleranceStudy
        All results.

    Raises
    ------
    InputError
        There is nothing to count against, a value is not allowed, or a part is not known.
    """
    how = StudyEffort() if effort is None else effort
    say = _say_nothing if tell is None else tell
    say("which points are worst")
    setting = prepare_units(
        design,
        requirement=requirement,
        tolerances=tolerances,
        with_defaults=with_defaults,
        tables=tables,
        effort=how,
    )
    model, varied = setting.model, setting.varied
    say("the worst corners")
    corners = worst_case(model.evaluate, varied)
    say(f"{how.units} units")
    factors = setting.drawn(0, how.units)
    runs = model.evaluate(factors)
    say(f"the same after {how.age_hours:g} h")
    wear, aged = _aged(model, runs, factors, how)
    wear_told = () if wear is None else wear_warnings(wear, model.nominal)
    say("where the spread comes from")
    return ToleranceStudy(
        varied=varied,
        model=model,
        range_points=len(setting.whole.points),
        seed=how.seed,
        factors=factors,
        runs=runs,
        worst_case=corners,
        sensitivity=_sensitivity(setting, corners, factors, runs, how),
        tighter=_tighter(varied, factors, runs),
        wear=wear,
        aged=aged,
        warnings=(*_warnings(setting, factors, runs, corners), *wear_told),
    )


def tolerance(
    design: Design,
    *,
    requirement: Requirement | None = None,
    tolerances: Mapping[str, Tolerance] | None = None,
    units: int = UNITS,
    seed: int = 0,
    electrical_only: bool = False,
    tables: Tables | None = None,
    jobs: int | None = None,
) -> pd.DataFrame:
    """Units of a design as a table; `tolerance_study` says more and can do less.

    Parameters
    ----------
    design : Design
        The design, see `buckdesign.read_design`.
    requirement : Requirement, optional
        What to count against; the one that the design carries where omitted.
    tolerances : Mapping, optional
        `Tolerance` by dotted key instead of the ``[tolerance]`` table of the design; defaults of the trade where
        there is neither.
    units : int
        Units drawn [1].
    seed : int
        Of the random numbers; unit `i` of a seed is always the same.
    electrical_only : bool
        No temperatures, no losses added on.
    tables : Tables, optional
        Parts that the design names; the tables of the package where omitted.
    jobs : int, optional
        Threads; all processors by default.

    Returns
    -------
    DataFrame
        One row a unit: its values, the keys of one simulation at its worst point, what it violates and its margins.
        ``attrs["summary"]`` and ``attrs["warnings"]`` hold what they sum up to.

    Raises
    ------
    InputError
        There is nothing to count against, a value is not allowed, or a part is not known.
    """
    effort = StudyEffort(units=units, seed=seed, electrical_only=electrical_only, jobs=jobs)
    return tolerance_study(
        design, requirement=requirement, tolerances=tolerances, tables=tables, effort=effort
    ).frame()


def one_unit(setting: Setting, unit: int) -> SingleUnit:
    """A single unit at every point, to look at it.

    Parameters
    ----------
    setting : Setting
        See `prepare_units`.
    unit : int
        Its number, 0 or more.

    Returns
    -------
    SingleUnit
        Its values, its margins and its operating points.

    Raises
    ------
    InputError
        The number is negative.
    """
    if unit < 0:
        raise InputError(f"unit {unit}: 0 or more is wanted")
    factors = setting.drawn(unit, unit + 1)
    operated, _ = setting.model.operated(factors)
    return SingleUnit(
        unit=unit,
        seed=setting.seed,
        varied=setting.varied,
        factors={key: float(one[0]) for key, one in factors.items()},
        runs=setting.model.evaluate(factors),
        points=operated.columns(),
        model=setting.model,
    )


def _say_nothing(text: str) -> None:
    """For who does not want to be told."""


def _aged(
    model: UnitModel, runs: UnitRuns, factors: Mapping[str, NDArray[np.float64]], how: StudyEffort
) -> tuple[Wear | None, UnitRuns | None]:
    if how.age_hours == 0.0:
        return None, None
    wear = wear_of(runs, model.nominal, how.age_hours)
    return wear, model.evaluate(wear.factors(factors))


def _sensitivity(
    setting: Setting,
    corners: WorstCase,
    factors: Mapping[str, NDArray[np.float64]],
    runs: UnitRuns,
    how: StudyEffort,
) -> Sensitivity | None:
    nominal = corners.nominal
    names = tuple(name for name in nominal.requirements if name in nominal.applied)
    columns = [nominal.names.index(name) for name in names]
    if not how.samples or not names:
        return None
    moved = moved_alone(corners.alone[columns], nominal.margin[0, columns])
    chosen, held = values_that_matter(setting.varied, moved)
    if not chosen:
        return None
    model = setting.model
    return sobol_sensitivity(
        lambda drawn: model.evaluate(drawn).margin[:, columns].T,
        chosen,
        held,
        names,
        how.samples,
        how.seed,
        fitted_response(chosen, factors, shown_margins(runs.margin[:, columns].T)),
    )


def _tighter(
    varied: Sequence[Varied], factors: Mapping[str, NDArray[np.float64]], runs: UnitRuns
) -> tuple[Tighter, ...]:
    passes = runs.passes
    found = [tighter_yield(one, factors[one.key], passes) for one in varied]
    return tuple(sorted(found, key=lambda one: (not one.is_certain, -one.gain)))


def _warnings(
    setting: Setting, factors: Mapping[str, NDArray[np.float64]], runs: UnitRuns, corners: WorstCase
) -> tuple[str, ...]:
    told = []
    failing = corners.nominal.violated(0)
    if failing:
        told.append(f"the design itself, with every value nominal, does not keep: {', '.join(failing)}")
    missed = _missed(setting, factors, runs)
    if missed:
        told.append(
            f"{missed} of {min(SPOT_CHECKED, int(runs.passes.sum()))} passing units fail at a point that was left "
            "out: the yield is a little lower than shown; every point counts with --all-points"
        )
    worse = worse_than_corners(runs, corners.worst)
    if worse:
        told.append(f"inside its tolerances a drawn unit is worse than every corner: {', '.join(worse)}")
    if any(one.key == OUTPUT_INDUCTANCE and one.source.startswith(PART_TABLE) for one in setting.varied):
        told.append(
            "the band of regulator.output_inductance is what is not known of this kind of regulator, more than what "
            "differs from unit to unit; it can't be bought tighter, but measured: put the value that reproduces the "
            f"frequency of a built unit into the design file, and a factor of {SPECIFIED_L_O:g} is taken"
        )
    if not corners.is_exhaustive:
        told.append(
            f"worst case: of 2^{len(setting.varied)} corners {corners.corners} were computed, a search and no proof"
        )
    return tuple(told)


def worse_than_corners(runs: UnitRuns, worst: Sequence[WorstCorner]) -> list[str]:
    """What some unit keeps less than the worst corner does, and which unit.

    Parameters
    ----------
    runs : UnitRuns
        Units drawn.
    worst : sequence of WorstCorner
        The worst corner of each limit.

    Returns
    -------
    list of str
        Names with units; of limits that are kept by far, none.
    """
    found = []
    for corner in worst:
        margin = runs.margins(corner.name)
        unit = int(margin.argmin())
        if margin[unit] < min(corner.margin - WORSE * max(abs(corner.margin), 1.0), CLOSE):
            found.append(f"{corner.name} (unit {unit})")
    return found


def _missed(setting: Setting, factors: Mapping[str, NDArray[np.float64]], runs: UnitRuns) -> int:
    """Of some passing units, how many fail over the whole range."""
    if len(setting.whole.points) == len(setting.model.points):
        return 0
    near = np.where(runs.passes, runs.least, np.inf)
    some = np.argsort(near, kind="stable")[: min(SPOT_CHECKED, int(runs.passes.sum()))]
    if not len(some):
        return 0
    again = setting.whole.evaluate({key: values[some] for key, values in factors.items()})
    return int(np.count_nonzero(~again.passes))
