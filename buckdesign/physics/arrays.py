"""What all physics functions share: the number type, and ranges of validity as data."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

Real: TypeAlias = float | NDArray[np.float64]
Flag: TypeAlias = bool | np.bool_ | NDArray[np.bool_]
Ranges: TypeAlias = Mapping[str, Mapping[str, tuple[float, float]]]


def plain(value: Any) -> Any:
    """Turn an array without dimensions into a scalar and leave every other array as it is.

    Parameters
    ----------
    value : float or ndarray
        Any number or array [any unit].

    Returns
    -------
    float or ndarray
        The same value [same unit].

    Notes
    -----
    Derived: indexing with the empty tuple; only `numpy.where` and its like need it.

    Examples
    --------
    >>> import numpy as np
    >>> float(plain(np.array(2.0)))
    2.0
    """
    return np.asarray(value)[()]


def within(limits: tuple[float, float], value: Real) -> Flag:
    """Tell where a quantity lies inside a range of validity, ends included.

    Parameters
    ----------
    limits : tuple of float
        Lowest and highest value, one entry of a module's ``RANGES`` [same unit as `value`].
    value : float or ndarray
        The quantity [any unit].

    Returns
    -------
    bool or ndarray of bool
        True inside; NaN is outside.

    Notes
    -----
    Derived: two comparisons. The caller turns a False into a failed check or a warning.

    Examples
    --------
    >>> bool(within((0.0, 1.0), 1.5))
    False
    """
    result: Flag = plain((np.asarray(value) >= limits[0]) & (np.asarray(value) <= limits[1]))
    return result
