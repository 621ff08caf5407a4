"""One design at many operating points, as a table."""

from __future__ import annotations

from typing import TYPE_CHECKING

from buckdesign.design.design_file import Design
from buckdesign.design.operating import operate_table, points_of
from buckdesign.design.resolve import resolve_design
from buckdesign.loop.results import STUDY, Effort
from buckdesign.parts import Tables

if TYPE_CHECKING:
    import pandas as pd
    from numpy.typing import ArrayLike


def simulate_many(
    design: Design,
    *,
    supply: ArrayLike | None = None,
    load_current: ArrayLike | None = None,
    load_resistance: ArrayLike | None = None,
    ambient_c: ArrayLike | None = None,
    electrical_only: bool = False,
    tables: Tables | None = None,
    effort: Effort = STUDY,
    jobs: int | None = None,
) -> pd.DataFrame:
    """Simulate a design at many operating points.

    Parameters
    ----------
    design : Design
        The design, see `buckdesign.read_design`.
    supply : array_like, optional
        Supplies [V]; what is omitted is as in the design. All arrays are broadcast to one shape (n,).
    load_current, load_resistance : array_like, optional
        Constant-current part [A] and resistive part of the load [ohm]; one given alone is the whole load.
    ambient_c : array_like, optional
        [degC].
    electrical_only : bool
        No temperatures and no losses added on.
    tables : Tables, optional
        Parts that the design names; the tables of the package where omitted.
    effort : Effort
        How long to look for each steady state.
    jobs : int, optional
        Threads; all processors by default.

    Returns
    -------
    DataFrame
        One row a point, columns as the keys of one simulation, nested ones with dots; NaN: not known.

    Raises
    ------
    InputError
        A value is not allowed, or a part is not known.
    """
    import pandas as pd

    resolved = resolve_design(design, tables)
    points = points_of(
        resolved,
        supply=supply,
        load_current=load_current,
        load_resistance=load_resistance,
        ambient_c=ambient_c,
    )
    return pd.DataFrame(
        operate_table(resolved, points, electrical_only=electrical_only, effort=effort, jobs=jobs)
    )
