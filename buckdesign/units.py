"""Quantities in and out: text with a unit to an SI number and back.

The parser is strict. Each field expects one unit; accepted are

* a number and the unit with an SI prefix: ``220 uH``, ``4.7 kohm``, ``1e-6 H``, ``2 mΩ`` (both micro signs
  and ``u``; both ohm signs, ``ohm`` and ``Ohm``);
* trade notation (IEC 60062, the letter stands for the decimal point): ``4k7``, ``4K7``, ``0R1``, ``R47``,
  ``5L0`` (milliohm), ``2n2``, ``3V3``, and a number with the prefix alone: ``220u``, ``47k``;
* a number alone: the SI value, for ``degC`` in degC, for ``h`` in hours, for ``%`` a fraction.

``m`` is milli and ``M`` mega; ``K`` is kilo only in trade notation of a resistance. A decimal comma, a wrong
unit or a wrong case is an error that says what would be right.

Values are rounded once: ``0.08 uH`` gives exactly the float ``8e-08``.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from numbers import Real

from buckdesign.errors import QuantityError, quoted

PREFIXES: dict[str, int] = {
    "f": -15, "p": -12, "n": -9, "u": -6, "m": -3, "c": -2, "": 0, "k": 3, "M": 6, "G": 9, "T": 12,
}  # fmt: skip
"""Powers of ten of the SI prefixes in use (SI brochure, 9th edition, table 7)."""

_TRADE_OHM = {"L": -3, "m": -3, "R": 0, "k": 3, "K": 3, "M": 6, "G": 9}
_TRADE_FARAD = {"p": -12, "n": -9, "u": -6, "m": -3, "F": 0}
_TRADE_HENRY = {"n": -9, "u": -6, "m": -3, "H": 0}


@dataclass(frozen=True, kw_only=True)
class _Unit:
    """How one unit is read and printed."""

    quantity: str
    example: str
    labels: dict[str, int]
    ladder: tuple[tuple[int, str], ...]
    trade: dict[str, int]
    bare: dict[str, int]


def _prefixed(
    quantity: str,
    example: str,
    symbols: tuple[str, ...],
    prefixes: str,
    *,
    trade: dict[str, int] | None = None,
    bare: bool = True,
) -> _Unit:
    """A unit with SI prefixes; the first of `symbols` is printed."""
    known = ["", *prefixes]
    labels = {prefix + symbol: PREFIXES[prefix] for symbol in symbols for prefix in known}
    ladder = sorted((PREFIXES[prefix], prefix + symbols[0]) for prefix in known if prefix != "c")
    alone = {prefix: PREFIXES[prefix] for prefix in prefixes} if bare else {}
    if trade is _TRADE_OHM:
        alone |= {"R": 0, "K": 3}
    return _Unit(
        quantity=quantity, example=example, labels=labels, ladder=tuple(ladder), trade=trade or {}, bare=alone
    )


def _listed(quantity: str, example: str, labels: dict[str, int], printed: tuple[str, ...]) -> _Unit:
    """A unit whose labels are listed one by one; those in `printed` are used for printing."""
    ladder = tuple(sorted((labels[label], label) for label in printed))
    return _Unit(quantity=quantity, example=example, labels=labels, ladder=ladder, trade={}, bare={})


_UNITS: dict[str, _Unit] = {
    "V": _prefixed("a voltage in V", "12 V", ("V",), "numk", trade={"V": 0}),
    "A": _prefixed("a current in A", "2.5 A", ("A",), "pnumk"),
    "ohm": _prefixed("a resistance in ohm", "4.7 kohm", ("ohm", "Ohm", "Ω"), "numkMG", trade=_TRADE_OHM),
    "H": _prefixed("an inductance in H", "220 uH", ("H",), "pnum", trade=_TRADE_HENRY),
    "F": _prefixed("a capacitance in F", "470 uF", ("F",), "fpnum", trade=_TRADE_FARAD),
    "Hz": _prefixed("a frequency in Hz", "20 kHz", ("Hz",), "mkMG"),
    "s": _prefixed("a time in s", "1 us", ("s",), "fpnum"),
    "W": _prefixed("a power in W", "5 W", ("W",), "numkM"),
    "C": _prefixed("a charge in C (coulomb)", "200 nC", ("C",), "fpnum"),
    "J": _prefixed("an energy in J", "10 uJ", ("J",), "pnumk"),
    "T": _prefixed("a flux density in T", "300 mT", ("T",), "num", bare=False),
    "K": _prefixed("a temperature difference in K", "10 K", ("K",), "m", bare=False),
    "m": _prefixed("a length in m", "1.2 mm", ("m",), "numck", bare=False),
    "kg": _listed("a mass in kg", "35 g", {"mg": -6, "g": -3, "kg": 0}, ("mg", "g", "kg")),
    "m2": _listed(
        "an area in m2", "65.9 mm2",
        {"mm2": -6, "cm2": -4, "m2": 0}, ("mm2", "m2"),
    ),
    "m3": _listed(
        "a volume in m3", "4.28 cm3",
        {"mm3": -9, "cm3": -6, "m3": 0}, ("mm3", "cm3", "m3"),
    ),
    "K/W": _listed("a thermal resistance in K/W", "4 K/W", {"K/W": 0, "degC/W": 0, "°C/W": 0}, ("K/W",)),
    "V/s": _listed("a slope in V/s", "10 V/ms", {"V/s": 0, "V/ms": 3, "V/us": 6}, ("V/s", "V/ms", "V/us")),
    "A/s": _listed("a slope in A/s", "50 A/us", {"A/s": 0, "A/ms": 3, "A/us": 6}, ("A/s", "A/ms", "A/us")),
    "A/m": _listed("a field in A/m", "3 kA/m", {"A/m": 0, "A/cm": 2, "A/mm": 3, "kA/m": 3}, ("A/m", "kA/m")),
    "V/K": _listed(
        "a temperature coefficient in V/K", "-2 mV/K",
        {"uV/K": -6, "mV/K": -3, "V/K": 0}, ("uV/K", "mV/K", "V/K"),
    ),
    "W/m3": _listed(
        "a loss density in W/m3", "90 kW/m3",
        {"W/m3": 0, "kW/m3": 3, "mW/cm3": 3, "W/cm3": 6}, ("W/m3", "kW/m3"),
    ),
    "ohm/m": _listed(
        "a resistance by length in ohm/m", "22 mohm/m",
        {"ohm/m": 0, "mohm/m": -3, "ohm/km": -3, "Ω/m": 0, "mΩ/m": -3, "Ω/km": -3}, ("mohm/m", "ohm/m"),
    ),
    "1/K": _listed("a temperature coefficient in %/K", "5.5 %/K", {"1/K": 0, "%/K": -2}, ("%/K",)),
    "degC": _listed("a temperature in degC", "25 degC", {"degC": 0, "°C": 0}, ("degC",)),
    "%": _listed("a share in % (a number alone is a fraction)", "4 %", {"%": -2}, ("%",)),
    "h": _listed("a time in h", "2000 h", {"h": 0}, ("h",)),
    "1": _listed("a number without unit", "1.5", {"": 0}, ("",)),
}  # fmt: skip

UNITS: frozenset[str] = frozenset(_UNITS)
"""The unit names a field can expect."""

_SAME_SIGN = str.maketrans(
    {"\u2126": "\u03a9", "\u00b5": "u", "\u03bc": "u", "\u2212": "-", "\u2103": "\u00b0C"}
    | dict.fromkeys("\u00a0\u2009\u202f\t", " ")
)
_POWER_SIGN = str.maketrans("²³", "23")
_NUMBER = r"([+-]?)([0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE]([+-]?[0-9]{1,4}))?"
_PLAIN = re.compile(rf"{_NUMBER} *([^0-9.,+\- ][^ ]*)?")
_TRADE = re.compile(r"([+-]?)([0-9]*)([A-Za-z])([0-9]+) ?([^0-9 ][^ ]*)?")
_COMMA = re.compile(r"([0-9]),([0-9])")
_UNSURE_E = re.compile(r"[+-]?[0-9]+E[0-9]+")


def parse_quantity(text: str | float | int, unit: str) -> float:
    """The SI value of a quantity.

    Parameters
    ----------
    text : str, float or int
        A text as the module describes it, or a number that is taken as the SI value.
    unit : str
        The expected unit, one of `UNITS`.

    Returns
    -------
    float
        SI value; in degC for ``degC``, in hours for ``h``, a fraction for ``%``.

    Raises
    ------
    QuantityError
        If the text is no such quantity, or the value is a bool, NaN or infinite.

    Notes
    -----
    Trade notation after IEC 60062:2016 clause 5 (from memory).

    Examples
    --------
    >>> parse_quantity("4k7", "ohm"), parse_quantity("220 uH", "H"), parse_quantity("4 %", "%")
    (4700.0, 0.00022, 0.04)
    """
    spec = _spec(unit)
    if not isinstance(text, str):
        return _number(text, unit)
    tidy = text.translate(_SAME_SIGN).strip()
    value = None
    if not (unit == "ohm" and _UNSURE_E.fullmatch(tidy)):
        value = _read_plain(tidy, spec)
        if value is None:
            value = _read_trade(tidy, spec)
    if value is None:
        raise QuantityError(text, unit, _remedy(tidy, unit))
    if not math.isfinite(value):
        raise QuantityError(text, unit, f"too large; {spec.quantity} is wanted")
    return value


def format_quantity(value: float, unit: str, digits: int = 3, ascii_only: bool = False) -> str:
    """A quantity as text, the prefix chosen after rounding.

    Parameters
    ----------
    value : float
        SI value; in degC for ``degC``, in hours for ``h``, a fraction for ``%``.
    unit : str
        One of `UNITS`.
    digits : int
        Significant digits, at least 1; trailing zeros behind the point are left out.
    ascii_only : bool
        Write ``u``, ``ohm``, ``degC``, ``m2`` instead of the signs.

    Returns
    -------
    str
        Text that `parse_quantity` reads again.

    Raises
    ------
    QuantityError
        If the value is a bool, NaN or infinite.
    ValueError
        If `digits` is below 1.

    Examples
    --------
    >>> format_quantity(999.96, "ohm", ascii_only=True), format_quantity(2.2e-4, "H", ascii_only=True)
    ('1 kohm', '220 uH')
    """
    if digits < 1:
        raise ValueError("at least one significant digit is needed")
    spec = _spec(unit)
    number = _number(value, unit)
    sign = "-" if number < 0 else ""
    mantissa, exponent_text = f"{abs(number):.{digits - 1}e}".split("e")
    figures, exponent = mantissa.replace(".", ""), int(exponent_text)
    if number == 0:
        sign = ""
        power, label = next((rung for rung in spec.ladder if rung[0] == 0), spec.ladder[0])
        exponent = power
    else:
        power, label = _step(spec, exponent)
    body = _place_point(figures, exponent - power)
    label = label if ascii_only else _with_signs(label)
    return f"{sign}{body} {label}".rstrip()


def unit_exponent(label: str, unit: str) -> int:
    """The power of ten between a unit with prefix and the SI unit.

    Parameters
    ----------
    label : str
        Such as ``mA`` or ``mm2``.
    unit : str
        The expected unit, one of `UNITS`.

    Returns
    -------
    int
        -3 for ``mA`` in ``A``.

    Raises
    ------
    QuantityError
        If `label` is not `unit` with a prefix.
    """
    spec = _spec(unit)
    known = spec.labels.get(label.translate(_SAME_SIGN).translate(_POWER_SIGN).strip())
    if known is None:
        raise QuantityError(label, unit, f"{spec.quantity} is wanted, such as {_labels_shown(spec)}")
    return known


def _spec(unit: str) -> _Unit:
    spec = _UNITS.get(unit)
    if spec is None:
        raise ValueError(f"no unit is named {unit!r}; known: {', '.join(sorted(_UNITS))}")
    return spec


def _number(value: object, unit: str) -> float:
    """`value` as a finite float; bool, NaN, infinity and anything that is no number are refused."""
    quantity = _UNITS[unit].quantity
    if isinstance(value, bool) or not isinstance(value, Real):
        kind = "true/false" if isinstance(value, bool) else type(value).__name__
        raise QuantityError(value, unit, f"{quantity} is wanted, not {kind}")
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if not math.isfinite(number):
        raise QuantityError(value, unit, f"{quantity} is wanted, a finite number")
    return number


def _read_plain(text: str, spec: _Unit) -> float | None:
    match = _PLAIN.fullmatch(text)
    if match is None:
        return None
    sign, figures, power, label = match.groups()
    if label is None:
        shift: int | None = 0
    else:
        shift = spec.labels.get(label.translate(_POWER_SIGN))
        if shift is None and not (label == "K" and " K" in text):
            shift = spec.bare.get(label)
    if shift is None:
        return None
    return float(f"{sign}{figures}e{int(power or 0) + shift}")


def _read_trade(text: str, spec: _Unit) -> float | None:
    match = _TRADE.fullmatch(text)
    if match is None:
        return None
    sign, before, letter, after, label = match.groups()
    shift = spec.trade.get(letter)
    if shift is None or (not before and letter == "m") or (label is not None and spec.labels.get(label) != 0):
        return None
    return float(f"{sign}{before or '0'}.{after}e{shift}")


def _remedy(text: str, unit: str) -> str:
    """What is wrong with a text that could not be read, and what would be right."""
    spec = _UNITS[unit]
    wanted = f"{spec.quantity} is wanted, such as {quoted(spec.example)}"
    if not text:
        return f"empty; {wanted}"
    if _COMMA.search(text):
        pointed = _COMMA.sub(r"\1.\2", text)
        if pointed.count(".") == 1 and _reads(pointed, spec):
            return f"decimal comma; write {quoted(pointed)}"
        return f"comma; the decimal sign is a point and there is no grouping sign; {wanted}"
    if unit == "ohm" and _UNSURE_E.fullmatch(text):
        first, second = text.split("E")
        return f"E can mean ohm or a power of ten; write {first}R{second} or {first}e{second}"
    joined = text.replace(" ", "")
    if _TRADE.fullmatch(joined) and joined != text and _reads(joined, spec):
        return f"space inside; write {quoted(joined)}"
    match = _PLAIN.fullmatch(text)
    if match is None or match.group(4) is None:
        return f"no number with a unit; {wanted}"
    label = match.group(4)
    number = text[: match.start(4)].strip()
    near = _label_near(label, spec)
    if near is not None:
        return f"{quoted(label)} is not {spec.quantity}; write {number} {near}"
    owners = [other.quantity for other in _UNITS.values() if label in other.labels]
    if owners:
        return f"{quoted(label)} is {owners[0]}; {wanted}"
    return f"unknown unit {quoted(label)}; {wanted}"


def _reads(text: str, spec: _Unit) -> bool:
    return _read_plain(text, spec) is not None or _read_trade(text, spec) is not None


def _label_near(label: str, spec: _Unit) -> str | None:
    """The label of `spec` that `label` was probably meant to be: wrong case, kelvin for degC and the like."""
    if label == "K" and "K" in spec.bare:
        return "kohm"
    if "degC" in spec.labels and label in {"C", "deg", "°", "degc", "celsius", "Celsius"}:
        return "degC"
    single = label.removesuffix("s")
    if single in spec.labels:
        return single
    folded = label.casefold()
    ranked = [known for known in spec.labels if known.casefold() == folded and known.isascii()]
    shown = dict.fromkeys(known.replace("Ohm", "ohm") for known in ranked)
    return " or ".join(shown) or None


def _step(spec: _Unit, exponent: int) -> tuple[int, str]:
    """The rung of the ladder for a number whose first figure stands at 10**exponent."""
    below = [rung for rung in spec.ladder if rung[0] <= exponent]
    return below[-1] if below else spec.ladder[0]


def _place_point(figures: str, exponent: int) -> str:
    """The figures with the point behind place `exponent`; as a power of ten where that gets too long."""
    if not -4 <= exponent < 9:
        head, tail = figures[0], figures[1:].rstrip("0")
        return f"{head}.{tail}e{exponent}" if tail else f"{head}e{exponent}"
    if exponent < 0:
        whole, part = "0", "0" * (-exponent - 1) + figures
    else:
        padded = figures.ljust(exponent + 1, "0")
        whole, part = padded[: exponent + 1], padded[exponent + 1 :]
    part = part.rstrip("0")
    return f"{whole}.{part}" if part else whole


def _with_signs(label: str) -> str:
    signed = label.replace("ohm", "Ω").replace("degC", "°C")
    if signed[:1] == "u":
        signed = "µ" + signed[1:]
    signed = signed.replace("/u", "/µ")
    return signed[:-1] + {"2": "²", "3": "³"}[signed[-1]] if signed[-1:] in {"2", "3"} else signed


def _labels_shown(spec: _Unit) -> str:
    return ", ".join(label or "nothing" for _, label in spec.ladder)
