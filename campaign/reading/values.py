"""Values with errors, limits and ranges as people publish them, read into one canonical unit.

The forms are those of the literature: ``3127.5±0.3``, ``3127.5(3)`` (error in the last digits),
``31.2 +0.4 -0.3``, ``(3.1±0.2)e-5``, ``0.30`` (error unknown, never zero), ``4.70±0`` (declared exact).
"""

from __future__ import annotations

import math
import re
from decimal import Decimal
from typing import Literal

from campaign.errors import InputRefused
from campaign.model.measured import Limit, Measured, Range
from campaign.reading.expected import Expected, short
from campaign.reading.numbers import (
    MAX_NUMBER_LENGTH,
    MINUS_SIGN,
    UNSIGNED,
    check_plain_text,
    quoted,
    read_number,
    refusal,
)
from campaign.reading.units import FAMILIES, unit_factor

_SIGNED = rf"[+-]?{UNSIGNED}"
_UNIT = r"(?P<unit>(?:[^\W\d_]|[%°\"'″′])[^±<>≤≥()]*)?"
_ERRORS = rf"""(?:
    \s*±\s*(?P<both>{UNSIGNED})
  | \((?P<digits>[0-9]{{1,18}})\)(?P<digits_exponent>[eE][+-]?[0-9]{{1,3}})?
  | \s*\+\s?(?P<plus_first>{UNSIGNED})\s*[/,]?\s*-\s?(?P<minus_second>{UNSIGNED})
  | \s*-\s?(?P<minus_first>{UNSIGNED})\s*[/,]?\s*\+\s?(?P<plus_second>{UNSIGNED})
)?"""
_PLAIN = re.compile(rf"(?P<value>{_SIGNED}){_ERRORS}\s*{_UNIT}", re.VERBOSE)
_GROUPED = re.compile(
    rf"\(\s*(?P<value>{_SIGNED}){_ERRORS}\s*\)(?:[eE](?P<power>[+-]?[0-9]{{1,3}}))?\s*{_UNIT}", re.VERBOSE
)
_POWER_OF_TEN = re.compile(r"\s*[x×]\s*10\s*\^?\s*([+-]?[0-9]{1,3}|[⁺⁻]?[⁰¹²³⁴⁵⁶⁷⁸⁹]{1,3})")
_SUPERSCRIPTS = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻⁺", "0123456789-+")
_PARENTHESISED_PAIR = re.compile(r"(?<=[0-9.])\s*\((\s*[+-][^()]*[+-][^()]*)\)(?![eE])")
_LIMIT = re.compile(r"(?P<sign>>=|<=|[<>≤≥])(?P<rest>.*)")
_RANGE_MARK = re.compile(r"\s*(?:[–—…]|\.\.(?!\.)|(?<=[^A-Za-z])to(?=[\s0-9+.-]))\s*")
_HYPHEN_RANGE = re.compile(rf"({UNSIGNED})(\s?)-\2({UNSIGNED})\s*{_UNIT}")
_UNIT_BEFORE_ERROR = re.compile(rf"{_SIGNED}\s*[^\s0-9+\-±().,<>=][^±<>()]*±.*")
_HALF_ERROR = re.compile(rf"{_SIGNED}\s*[+-]\s?{UNSIGNED}\s*{_UNIT}")


def _prepared(text: str, expected: Expected) -> str:
    """One spelling for each sign: ``±``, the ASCII minus and ``e`` for powers of ten."""
    if len(text) > MAX_NUMBER_LENGTH:
        raise expected.refuse(text, f"A value has at most {MAX_NUMBER_LENGTH} characters.")
    try:
        plain = check_plain_text(text, expected.name, MAX_NUMBER_LENGTH)
    except InputRefused as refused:
        raise expected.refuse(text, refused.why) from refused
    plain = plain.replace(MINUS_SIGN, "-").replace("+/-", "±").replace("+-", "±")
    plain = _POWER_OF_TEN.sub(lambda found: f"e{found[1].translate(_SUPERSCRIPTS)}", plain)
    return _PARENTHESISED_PAIR.sub(r" \1", plain)


def _shifted(number: str, power: str) -> str:
    """``number`` times ten to the ``power``, digit for digit (Decimal arithmetic would round)."""
    sign, digits, exponent = Decimal(number).as_tuple()
    return str(Decimal((sign, digits, int(exponent) + int(power))))


def _sizes(found: re.Match[str]) -> tuple[str | None, str | None, str]:
    """The texts of minus error, plus error and value, with every power of ten applied."""
    value = found["value"]
    power = found.groupdict().get("power")
    if found["digits"] is not None:
        error = _shifted(found["digits"], str(Decimal(value).as_tuple().exponent))
        exponent = found["digits_exponent"]
        if exponent:
            value, error = _shifted(value, exponent[1:]), _shifted(error, exponent[1:])
        minus: str | None = error
        plus: str | None = error
    elif found["both"] is not None:
        minus = plus = found["both"]
    else:
        minus = found["minus_first"] or found["minus_second"]
        plus = found["plus_first"] or found["plus_second"]
    if power:
        value = _shifted(value, power)
        minus = None if minus is None else _shifted(minus, power)
        plus = None if plus is None else _shifted(plus, power)
    return minus, plus, value


def _explain(plain: str, text: str, expected: Expected) -> InputRefused:
    """The refusal of a text that has none of the accepted forms, with the likeliest reason."""
    if "," in plain:
        with_point = plain.replace(",", ".")
        accepted = with_point if _is_accepted(with_point, expected) else None
        return expected.refuse(text, "A decimal point is expected; a comma is not accepted.", accepted)
    likely: tuple[tuple[bool, str], ...] = (
        (_LIMIT.fullmatch(plain) is not None, "One measured value is expected here, not a limit."),
        (re.search(r"±\s*[+-]", plain) is not None, "An error is a size: it has no sign, zero or more."),
        (_UNIT_BEFORE_ERROR.fullmatch(plain) is not None, "The unit is expected once, after the error."),
        (_HALF_ERROR.fullmatch(plain) is not None, "Two errors (+ and -) are expected, not one of them."),
    )
    for applies, why in likely:
        if applies:
            return expected.refuse(text, why)
    try:
        read_number(re.split(r"[\s±(]", plain, maxsplit=1)[0] or plain, expected.name)
    except InputRefused as refused:
        return expected.refuse(text, refused.why)
    return expected.refuse(text, "A number, its error and its unit are expected, in this order.")


def _is_accepted(text: str, expected: Expected) -> bool:
    try:
        _measured(text, text, expected)
    except InputRefused:
        return False
    return True


def _measured(plain: str, text: str, expected: Expected) -> Measured:
    """Read one prepared value with its errors into the canonical unit."""
    found = _PLAIN.fullmatch(plain) or _GROUPED.fullmatch(plain)
    if found is None:
        raise _explain(plain, text, expected)
    unit_text = found["unit"] or ""
    if re.match(r"[eE][+-]?[0-9]", unit_text):
        raise expected.refuse(text, "A finite number is expected; this exponent is too large.")
    try:
        minus, plus, value = (None if part is None else read_number(part) for part in _sizes(found))
    except InputRefused as refused:
        raise expected.refuse(text, refused.why) from refused
    assert value is not None
    factor = unit_factor(unit_text, expected.unit, expected.name, text, expected.example())
    read = Measured(value, minus, plus)
    if factor != 1.0:
        read = read.scaled(factor)
    if not all(math.isfinite(part) for part in (read.value, read.minus or 0.0, read.plus or 0.0)):
        raise expected.refuse(text, "A finite number is expected; this one is beyond what can be kept.")
    _check_holds(read.value, text, expected)
    return read


def _check_holds(value: float, text: str, expected: Expected) -> None:
    if not expected.holds(value):
        raise refusal(
            expected.name,
            text,
            f"{quoted(text)} is {value:.10g} {FAMILIES[expected.unit].symbol}".rstrip() + ".",
            expected.example(),
            "out-of-range",
            message=f"{expected.name} must be {expected.in_words()}.",
        )


def read_measured(
    text: str,
    unit: str = "d",
    name: str = "--period",
    *,
    low: float | None = None,
    high: float | None = None,
    low_open: bool = False,
    high_open: bool = False,
    shown: str = "",
) -> Measured:
    """Read one value with its errors.

    Parameters
    ----------
    text
        What was typed; a missing unit means the canonical unit.
    unit
        The canonical unit of the result, a key of ``campaign.reading.units.FAMILIES``.
    name
        The option or column, for the refusal.
    low, high
        Where the value may lie, in the canonical unit; ``low_open`` and ``high_open`` leave the bound out.
    shown
        The accepted form to show in a refusal; otherwise one is made up.

    Raises
    ------
    InputRefused
        Anything that is not one value in an accepted unit and range.
    """
    expected = Expected(unit, name, low, high, low_open, high_open, shown=shown)
    plain = _prepared(text, expected)
    if _range_ends(plain) is not None:
        raise expected.refuse(text, "One measured value is expected here, not a range.")
    return _measured(plain, text, expected)


def read_plain_value(
    text: str,
    unit: str,
    name: str,
    *,
    low: float | None = None,
    high: float | None = None,
    low_open: bool = False,
    high_open: bool = False,
    shown: str = "",
) -> float:
    """Read one value that has no error, such as a height or a length of time, into the canonical unit.

    ``shown`` is the accepted form to show in a refusal; otherwise one is made up. Other parameters and
    errors as ``read_measured``; a value with an error is refused.
    """
    expected = Expected(unit, name, low, high, low_open, high_open, with_error=False, shown=shown)
    plain = _prepared(text, expected)
    if _range_ends(plain) is not None:
        raise expected.refuse(text, "One value is expected here, not a range.")
    read = _measured(plain, text, expected)
    if read.minus is not None:
        raise expected.refuse(text, "A value without an error is expected here.")
    return read.value


def read_measured_or_bound(
    text: str,
    unit: str = "d",
    name: str = "--period",
    *,
    low: float | None = None,
    high: float | None = None,
    low_open: bool = False,
    high_open: bool = False,
    limit_sigma: float = 3.0,
) -> Measured | Limit | Range:
    """Read a value with errors, a limit (``>12.1``) or a range (``28–32 yr``, ``28..32``, ``28 to 32``).

    A hyphen makes a range only between two unsigned numbers set alike on both sides (``28-32 yr``).
    ``>=`` and ``<=`` are read as ``>`` and ``<``. Other parameters and errors as ``read_measured``.
    """
    expected = Expected(unit, name, low, high, low_open, high_open)
    if not (math.isfinite(limit_sigma) and limit_sigma > 0.0):
        why = "The level of a limit is a number of standard deviations above zero."
        raise refusal("--limit-sigma", str(limit_sigma), why, "3", "out-of-range")
    plain = _prepared(text, expected)
    limit = _LIMIT.fullmatch(plain)
    if limit:
        bound = _measured(limit["rest"].strip(), text, expected)
        if bound.minus is not None:
            raise expected.refuse(text, "A limit is one number; its level is given by --limit-sigma.")
        side: Literal["above", "below"] = "above" if limit["sign"] in (">", ">=", "≥") else "below"
        return Limit(bound.value, side, limit_sigma)
    ends = _range_ends(plain)
    if ends is None:
        return _measured(plain, text, expected)
    first, last = (_measured(end, text, expected) for end in ends)
    if first.minus is not None or last.minus is not None:
        raise expected.refuse(text, "The ends of a range are plain numbers without errors.")
    if not first.value < last.value:
        raise expected.refuse(text, "A range is expected to go from the smaller to the larger value.")
    return Range(first.value, last.value)


def _range_ends(plain: str) -> tuple[str, str] | None:
    """The two ends of a range, each with the unit, or None if the text is no range."""
    hyphen = _HYPHEN_RANGE.fullmatch(plain)
    if hyphen:
        unit = hyphen["unit"] or ""
        return f"{hyphen[1]} {unit}".strip(), f"{hyphen[3]} {unit}".strip()
    parts = _RANGE_MARK.split(plain)
    if len(parts) != 2:
        return None
    first, last = parts
    found = _PLAIN.fullmatch(last)
    if found and found["unit"] and re.fullmatch(_SIGNED, first):
        first = f"{first} {found['unit']}"
    return first, last


def write_measured(value: Measured | Limit | Range, unit: str) -> str:
    """Text that reads back to the identical value in the canonical ``unit``.

    The level of a limit is not part of the text.

    Raises
    ------
    ValueError
        Only one of the two errors is known: no text form says that.
    """
    symbol = f" {FAMILIES[unit].symbol}".rstrip()
    if isinstance(value, Limit):
        return f"{'>' if value.side == 'above' else '<'}{short(value.bound)}{symbol}"
    if isinstance(value, Range):
        return f"{short(value.low)} to {short(value.high)}{symbol}"
    if value.minus is None and value.plus is None:
        return f"{short(value.value)}{symbol}"
    if value.minus is None or value.plus is None:
        raise ValueError("a value needs both of its errors, or neither")
    if value.is_symmetric:
        return f"{short(value.value)}±{short(value.plus)}{symbol}"
    return f"{short(value.value)} +{short(value.plus)} -{short(value.minus)}{symbol}"


def read_assignment(text: str, name: str = "band") -> tuple[str, str]:
    """Split ``J=8.91±0.03`` into the band and the text of its value.

    Raises
    ------
    InputRefused
        No ``=``, nothing on one side of it, or a band that is not a short plain name.
    """
    band_text, equals, value_text = text.partition("=")
    why = "A band, an equals sign and a value are expected."
    if not equals or not band_text.strip() or not value_text.strip():
        raise refusal(name, text, why, "J=8.91±0.03", "assignment-unreadable")
    try:
        band = check_plain_text(band_text, name, 24)
        check_plain_text(value_text, name, MAX_NUMBER_LENGTH)
    except InputRefused as refused:
        raise refusal(name, text, refused.why, "J=8.91±0.03", "assignment-unreadable") from refused
    if not re.match(r"\w", band) or any(mark in band for mark in "<>±"):
        raise refusal(name, text, why, "J=8.91±0.03", "assignment-unreadable")
    return band, value_text.strip()
