"""The ``[vary]`` table of a study file: lists, ranges and groups of keys that step together."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from buckdesign.design.keys import CountKey, Key, PartKey, PartListKey, QuantityKey, Refused, SpreadKey
from buckdesign.design.schema import Reading
from buckdesign.design.toml_source import KeyPath
from buckdesign.design.toml_text import value_text
from buckdesign.errors import QuantityError, nearest_names, quoted
from buckdesign.parts.names import name_key
from buckdesign.studies.axis import (
    MOST_VALUES,
    Axis,
    Continuous,
    LinearSteps,
    Listed,
    LogSteps,
    Source,
    Spacing,
    Varied,
    WholeNumbers,
)
from buckdesign.studies.study_keys import fault_unknown, unknown_key
from buckdesign.units import format_quantity, parse_quantity

TOGETHER = "together"
"""Key under ``[vary]`` of what steps together."""

WANTED = (
    "a list of values, or a range { from = ..., to = ..., step = ... } "
    'or { from = ..., to = ..., count = ..., spacing = "log" }'
)

_RANGE_KEYS = ("from", "to", "step", "count", "spacing")


@dataclass(frozen=True, kw_only=True)
class _Range:
    """A range as far as it could be read; what is None was not given."""

    first: float
    last: float
    step: float | None
    count: int | None
    spacing: Spacing


@dataclass(kw_only=True)
class VaryReader:
    """Reads what a study varies and notes every fault.

    Attributes
    ----------
    keys : Mapping
        Keys that can be varied, by dotted name.
    kind : str
        The file that has them, such as ``design file``.
    is_sampled : bool
        Whether a range needs neither step nor count.
    reading : Reading
        Collects the faults.
    """

    keys: Mapping[str, Key]
    kind: str
    is_sampled: bool
    reading: Reading
    seen: dict[str, KeyPath] = field(default_factory=dict)

    def axes(self, raw: Any) -> tuple[Axis, ...]:
        """The axes of the table, in the order of the file; without those at fault.

        Parameters
        ----------
        raw : object
            What stands under ``vary``; None where nothing does.

        Returns
        -------
        tuple of Axis
            The axes.
        """
        if not isinstance(raw, Mapping) or not raw:
            self.reading.fault(("vary",), raw or None, f'keys to vary are wanted: [vary], "KEY" = {WANTED}')
            return ()
        found: list[Axis | None] = []
        for name, value in raw.items():
            at = ("vary", name)
            if name != TOGETHER:
                one = self._varied(name, value, at, is_alone=True)
                found.append(None if one is None else Axis(varied=(one,)))
            elif isinstance(value, list) and value:
                found += [self._group(group, (*at, index)) for index, group in enumerate(value)]
            else:
                found.append(self._group(value, at))
        return tuple(axis for axis in found if axis is not None)

    def _group(self, raw: Any, at: KeyPath) -> Axis | None:
        """Keys that step together."""
        if not isinstance(raw, Mapping) or not raw:
            self.reading.fault(at, raw or None, "a table of keys that step together is wanted")
            return None
        found = [self._varied(name, value, (*at, name), is_alone=False) for name, value in raw.items()]
        varied = [one for one in found if one is not None]
        if len(varied) < len(found) or not self._fit_together(varied, at):
            return None
        return Axis(varied=tuple(varied))

    def _fit_together(self, varied: list[Varied], at: KeyPath) -> bool:
        first = varied[0]
        for one in varied[1:]:
            if one.source.count != first.source.count:
                allowed = (
                    f"{_counted(one)}, but {quoted(first.name)} has {_counted(first)}: they step together"
                )
                if None in (one.source.count, first.source.count):
                    allowed += "; give the range a count"
                self.reading.fault((*at, one.name), None, allowed)
                return False
        lists = [
            [_comparable(one.key, value) for value in one.source.values]
            for one in varied
            if isinstance(one.source, Listed)
        ]
        if len(lists) < len(varied):
            return True
        steps = list(zip(*lists, strict=True))
        twice = _first_repeated(steps)
        if twice is not None:
            allowed = f"step {twice + 1} is the same as step {steps.index(steps[twice]) + 1}; each step once"
            self.reading.fault(at, None, allowed)
        return twice is None

    def _varied(self, name: str, raw: Any, at: KeyPath, *, is_alone: bool) -> Varied | None:
        key = self.keys.get(name)
        if key is None:
            shown = None if isinstance(raw, Mapping) else raw
            self.reading.fault(at, shown, unknown_key(name, raw, self.keys, self.kind))
            return None
        if name in self.seen:
            line = self.reading.locate(*self.seen[name])
            allowed = f"varied already in line {line}; a key is varied once"
            self.reading.fault(at, None if isinstance(raw, Mapping) else raw, allowed)
            return None
        self.seen[name] = at
        source: Source | None = None
        if isinstance(raw, list):
            source = self._listed(key, raw, at, is_alone=is_alone)
        elif isinstance(raw, Mapping):
            source = self._ranged(key, raw, at)
        else:
            self.reading.fault(at, raw, f"one value; {WANTED}")
        return None if source is None else Varied(name=name, key=key, source=source)

    def _listed(self, key: Key, raw: list[Any], at: KeyPath, *, is_alone: bool) -> Listed | None:
        if not raw:
            self.reading.fault(at, raw, f"an empty list; {WANTED}")
            return None
        if not isinstance(raw[0], list) and _is_one_value(key, raw):
            allowed = (
                f"one value, which is a list itself; a list of values is wanted: [{value_text(raw)}, ...]"
            )
            self.reading.fault(at, raw, allowed)
            return None
        values: dict[int, Any] = {}
        for index, one in enumerate(raw):
            try:
                values[index] = key.read(one, self.reading.tables)
            except Refused as refused:
                self.reading.fault((*at, index), None if isinstance(one, Mapping) else one, str(refused))
        same = [_comparable(key, value) for value in values.values()]
        twice = _first_repeated(same) if is_alone else None
        if twice is not None:
            index = list(values)[twice]
            self.reading.fault((*at, index), raw[index], "stands twice in the list; each value once")
        return Listed(values=tuple(values.values())) if len(values) == len(raw) else None

    def _ranged(self, key: Key, raw: Mapping[str, Any], at: KeyPath) -> Source | None:
        number = _number_key(key)
        if number is None:
            self.reading.fault(
                at, None, f"no range can be made of it; a list of values is wanted: {key.wanted}"
            )
            return None
        given = self._range(number, raw, at)
        if given is None:
            return None
        try:
            if given.count is not None:
                return _counted_steps(number, given)
            if given.step is not None:
                return _equal_steps(given)
        except _RangeRefused as refused:
            self.reading.fault((*at, refused.name), raw[refused.name], refused.text)
            return None
        if not self.is_sampled:
            self.reading.fault(at, None, "step or count is wanted, or a [sample] that draws from the range")
            return None
        if isinstance(number, CountKey):
            return WholeNumbers(first=int(given.first), last=int(given.last), spacing=given.spacing)
        return Continuous(first=given.first, last=given.last, spacing=given.spacing)

    def _range(self, number: QuantityKey | CountKey, raw: Mapping[str, Any], at: KeyPath) -> _Range | None:
        fault_unknown(raw, at, _RANGE_KEYS, self.reading)
        before = len(self.reading.faults)
        first = self._read(number, raw, at, "from")
        last = self._read(number, raw, at, "to")
        step = self._step(number, raw, at) if "step" in raw else None
        count = self._read(CountKey(most=MOST_VALUES), raw, at, "count") if "count" in raw else None
        spacing = self._spacing(raw, at)
        if "step" in raw and "count" in raw:
            self.reading.fault((*at, "count"), raw["count"], "either step or count, not both")
        if spacing is Spacing.LOG:
            self._check_log(number, raw, at, first, last)
        if len(self.reading.faults) > before or first is None or last is None or spacing is None:
            return None
        return _Range(first=first, last=last, step=step, count=count, spacing=spacing)

    def _read(self, key: QuantityKey | CountKey, raw: Mapping[str, Any], at: KeyPath, name: str) -> Any:
        if name not in raw:
            self.reading.fault((*at, name), None, f"missing; {key.wanted}")
            return None
        try:
            return key.read(raw[name], self.reading.tables)
        except Refused as refused:
            shown = None if isinstance(raw[name], Mapping) else raw[name]
            self.reading.fault((*at, name), shown, str(refused))
            return None

    def _step(self, number: QuantityKey | CountKey, raw: Mapping[str, Any], at: KeyPath) -> float | None:
        unit = "1" if isinstance(number, CountKey) else number.unit
        if unit == "degC" and not _is_in_celsius(raw["step"]):
            unit = "K"
        step = self._read(QuantityKey(unit=unit, minimum=-math.inf), raw, at, "step")
        if step is None:
            return None
        if isinstance(number, CountKey) and not float(step).is_integer():
            self.reading.fault((*at, "step"), raw["step"], "a whole number other than 0 is wanted")
        elif step == 0.0:
            self.reading.fault((*at, "step"), raw["step"], "a step other than 0 is wanted")
        return float(step)

    def _spacing(self, raw: Mapping[str, Any], at: KeyPath) -> Spacing | None:
        name = raw.get("spacing", Spacing.LINEAR.value)
        names = [one.value for one in Spacing]
        if name not in names:
            near = ", ".join(map(quoted, nearest_names(str(name), names)))
            shown = None if isinstance(name, Mapping) else name
            self.reading.fault((*at, "spacing"), shown, f"unknown spacing, nearest: {near}")
            return None
        return Spacing(name)

    def _check_log(
        self,
        number: QuantityKey | CountKey,
        raw: Mapping[str, Any],
        at: KeyPath,
        first: float | None,
        last: float | None,
    ) -> None:
        allowed = ""
        if "step" in raw:
            allowed = "log spacing goes with count, not with step"
        elif isinstance(number, QuantityKey) and number.unit == "degC":
            allowed = "log spacing of a temperature in degC has no meaning"
        elif first is not None and last is not None:
            if min(first, last) <= 0.0:
                allowed = "log spacing wants from and to above 0"
            elif not 0.0 < last / first < math.inf:
                allowed = "from and to are too far apart for log spacing"
        if allowed:
            self.reading.fault((*at, "spacing"), raw["spacing"], allowed)


class _RangeRefused(Exception):
    """A range without sense; `name` is the key of it that is wrong."""

    def __init__(self, name: str, text: str) -> None:
        super().__init__(name, text)
        self.name = name
        self.text = text


def _is_in_celsius(raw: Any) -> bool:
    """Whether a difference of temperatures was written in degC rather than K."""
    try:
        parse_quantity(raw, "degC")
    except QuantityError:
        return False
    return isinstance(raw, str)


def _equal_steps(given: _Range) -> LinearSteps:
    step = given.step
    assert step is not None
    if (given.last - given.first) * step < 0.0:
        side = "above" if step < 0.0 else "below"
        allowed = f"leads away from `to`, which is {side} `from`; a step {side} 0 is wanted"
        raise _RangeRefused("step", allowed)
    steps = LinearSteps.stepped(given.first, given.last, step)
    if steps.count > MOST_VALUES:
        raise _RangeRefused("step", f"gives {steps.count} values; at most {MOST_VALUES}")
    return steps


def _counted_steps(number: QuantityKey | CountKey, given: _Range) -> LinearSteps | LogSteps | Listed:
    count = given.count
    assert count is not None
    if count == 1 and given.first != given.last:
        raise _RangeRefused("count", "2 or more is wanted where `from` and `to` differ")
    if count > 1 and given.first == given.last:
        raise _RangeRefused("count", "1 is wanted where `from` and `to` are the same")
    if given.spacing is Spacing.LOG:
        steps = LogSteps(first=given.first, last=given.last, count=count)
        return _whole_log(steps) if isinstance(number, CountKey) else steps
    evenly = LinearSteps.counted(given.first, given.last, count)
    if isinstance(number, CountKey) and evenly.step.denominator != 1:
        raise _RangeRefused("count", _not_whole(float(evenly.value(1))))
    return evenly


def _whole_log(steps: LogSteps) -> Listed:
    """Values in equal ratios that are all whole numbers."""
    most = abs(int(steps.last) - int(steps.first)) + 1
    if steps.count > most:
        raise _RangeRefused("count", f"there are only {most} whole numbers from `from` to `to`")
    found = steps.at(np.arange(steps.count)).tolist()
    for value in found:
        if abs(value - round(value)) > 1e-9 * value:
            raise _RangeRefused("count", _not_whole(value))
    return Listed(values=tuple(round(value) for value in found))


def _not_whole(value: float) -> str:
    shown = format_quantity(value, "1", digits=6)
    return f"gives {shown} among others; a count that gives whole numbers, a step or a list is wanted"


def _is_one_value(key: Key, raw: list[Any]) -> bool:
    """Whether a list is one value of a key that takes nothing but lists."""
    if isinstance(key, PartListKey) or (isinstance(key, SpreadKey) and key.alone):
        return False
    try:
        key.read(raw, None)
    except Refused:
        return False
    return True


def _number_key(key: Key) -> QuantityKey | CountKey | None:
    """What one number of a range may be for a key; None where a range makes no sense."""
    if isinstance(key, QuantityKey | CountKey):
        return key
    return key.each if isinstance(key, SpreadKey) and key.alone else None


def _counted(one: Varied) -> str:
    count = one.source.count
    if count is None:
        return "a range without step and count"
    return f"{count} value" if count == 1 else f"{count} values"


def _comparable(key: Key, value: Any) -> Any:
    """Equal for values that mean the same."""
    if isinstance(key, PartKey):
        return name_key(value)
    return tuple(map(name_key, value)) if isinstance(key, PartListKey) else value


def _first_repeated(values: list[Any]) -> int | None:
    """Index of the first value that stands before already."""
    seen = set()
    for index, value in enumerate(values):
        if value in seen:
            return index
        seen.add(value)
    return None
