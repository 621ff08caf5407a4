"""What the values of one row must satisfy together, by kind of part."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from itertools import pairwise
from typing import Any

_ORDER: dict[str, tuple[tuple[str, ...], ...]] = {
    "regulator": (
        ("reference_min", "reference", "reference_max"),
        ("adjust_current", "adjust_current_max"),
        ("quiescent_current", "quiescent_current_max"),
        ("current_limit_min", "current_limit"),
        ("current_limit_far", "current_limit"),
        ("current_limit_far_min", "current_limit_far"),
    ),
    "transistor": (
        ("breakdown_far_current", "breakdown_current"),
        ("breakdown_voltage", "collector_voltage"),
        ("breakdown_far_voltage", "collector_voltage"),
        ("pulse_voltage", "collector_voltage"),
    ),
    "rectifier": (("leakage", "leakage_hot"),),
    "capacitor": (),
    "wire": (),
    "ring": (),
    "material": (("saturation_hot", "saturation"), ("temperature_advice_c", "temperature_limit_c")),
    "inductance factor": (),
    "loss point": (),
}
"""Columns whose values must not fall from left to right."""

_RISING: dict[str, tuple[tuple[str, ...], ...]] = {
    "regulator": (("current_limit_knee", "current_limit_far_voltage"),),
    "transistor": (
        ("gain_1_current", "gain_2_current", "gain_3_current", "gain_4_current"),
        ("breakdown_voltage", "breakdown_far_voltage"),
    ),
    "rectifier": (
        ("forward_current_1", "forward_current_2"),
        ("forward_voltage_1", "forward_voltage_2"),
    ),
    "wire": (("conductor_diameter", "outer_diameter_grade1", "outer_diameter_grade2"),),
    "ring": (("inner_diameter", "outer_diameter"),),
}
"""Columns whose values must rise from left to right."""

_TOGETHER: dict[str, tuple[tuple[str, ...], ...]] = {
    "regulator": (("current_limit_knee", "current_limit_far", "current_limit_far_voltage"),),
    "transistor": (
        ("gain_2", "gain_2_current"),
        ("gain_3", "gain_3_current"),
        ("gain_4", "gain_4_current"),
        ("storage_time", "switching_current", "switching_base_current"),
        ("breakdown_voltage", "breakdown_current"),
        ("breakdown_far_voltage", "breakdown_far_current"),
        ("pulse_voltage", "pulse_current", "pulse_duration"),
    ),
    "rectifier": (
        ("forward_voltage_2", "forward_current_2"),
        ("leakage_hot", "leakage_hot_c"),
    ),
    "capacitor": (("life", "life_temperature_c"),),
    "ring": (("effective_length", "effective_area"),),
    "material": (
        ("bias_field", "bias_exponent"),
        ("bias_anchor", "bias_anchor_field"),
        ("loss_a", "loss_b", "loss_c", "loss_d"),
    ),
}
"""Columns that are given all or not at all."""

_NEEDS: dict[str, tuple[tuple[str, str], ...]] = {
    "transistor": (("breakdown_far_voltage", "breakdown_voltage"),),
}
"""Columns that stand only beside another: the first needs the second."""


def broken_rules(kind: str, values: Mapping[str, Any]) -> Iterator[tuple[str, object, str]]:
    """What does not fit together in a row.

    Parameters
    ----------
    kind : str
        Kind of part.
    values : mapping
        Values by attribute; absent ones are missing.

    Yields
    ------
    tuple of str, object, str
        Column, value and what is allowed.
    """
    for group in _ORDER.get(kind, ()):
        yield from _against_order(group, values, strict=False)
    for group in _RISING.get(kind, ()):
        yield from _against_order(group, values, strict=True)
    for group in _TOGETHER.get(kind, ()):
        given = [name for name in group if name in values]
        if given and len(given) < len(group):
            absent = next(name for name in group if name not in values)
            yield absent, None, f"wanted because {given[0]} is given"
    for name, needed in _NEEDS.get(kind, ()):
        if name in values and needed not in values:
            yield needed, None, f"wanted because {name} is given"


def _against_order(
    group: tuple[str, ...], values: Mapping[str, Any], *, strict: bool
) -> Iterator[tuple[str, object, str]]:
    given = [name for name in group if name in values]
    for low, high in pairwise(given):
        if values[high] < values[low] or (strict and values[high] == values[low]):
            yield (
                high,
                values[high],
                f"must be {'above' if strict else 'at least'} {low} ({values[low]:g} SI)",
            )
