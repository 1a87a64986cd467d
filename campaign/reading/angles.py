"""Positions on the sky and on Earth, and plain angles: sexagesimal or decimal, in degrees.

Sexagesimal texts are computed in whole fractions and rounded once, so ``-00 30 10`` keeps its sign
and ``23:59:59.999`` stays below 24 h.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction

from campaign.errors import InputRefused
from campaign.reading.expected import Expected
from campaign.reading.numbers import MINUS_SIGN, check_plain_text, quoted, read_number, refusal
from campaign.reading.units import unit_factor

_WHOLE = "[0-9]{1,3}"
_DECIMAL = r"[0-9]{1,3}(?:\.[0-9]*)?"
_COLONS = re.compile(rf"({_WHOLE})\s?:\s?(?:({_WHOLE})\s?:\s?)?({_DECIMAL})")
_SPACES = re.compile(rf"({_WHOLE}) (?:({_WHOLE}) )?({_DECIMAL})")
_LETTERS = re.compile(
    rf"""(?P<first>{_DECIMAL})\s?(?P<unit>h|d|°|deg)
    (?:\s?(?P<minutes>{_DECIMAL})\s?(?:m|′|'(?!')|arcmin)
       (?:\s?(?P<seconds>{_DECIMAL})\s?(?:s|″|"|''|arcsec)?)?
     )?""",
    re.VERBOSE,
)
_DEGREE_NUMBER = re.compile(r"(?P<number>[^\s°A-Za-z]+(?:[eE][+-]?[0-9]+)?)\s?(?P<unit>.*)")
_MAX_LENGTH = 60


@dataclass(frozen=True, slots=True)
class _Kind:
    """What an angle is: its name in refusals, an accepted form, and the unit of a sexagesimal text."""

    name: str
    example: str
    hours: bool = False

    def refuse(self, text: str, why: str, code: str = "angle-unreadable", message: str = "") -> InputRefused:
        return refusal(self.name, text, why, self.example, code, message=message)


def _plain(text: str, kind: _Kind) -> str:
    try:
        return check_plain_text(text, kind.name, _MAX_LENGTH).replace(MINUS_SIGN, "-")
    except InputRefused as refused:
        raise kind.refuse(text, refused.why) from refused


def _fields(body: str, kind: _Kind) -> tuple[list[str], bool] | None:
    """The sexagesimal fields of an unsigned text and whether they are hours; None if it is not one."""
    found = _COLONS.fullmatch(body) or _SPACES.fullmatch(body)
    if found:
        return [field for field in found.groups() if field is not None], kind.hours
    found = _LETTERS.fullmatch(body)
    if found:
        fields = [found[part] for part in ("first", "minutes", "seconds") if found[part] is not None]
        return fields, found["unit"] == "h"
    return None


def _exact_degrees(plain: str, text: str, kind: _Kind) -> Fraction:
    """Degrees of a prepared text, sexagesimal or decimal, before any range check."""
    sign = -1 if plain.startswith("-") else 1
    body = plain[1:].lstrip(" ") if plain[:1] in ("+", "-") else plain
    read = _fields(body, kind)
    if read is None:
        return _decimal_degrees(plain, text, kind)
    fields, in_hours = read
    if in_hours and not kind.hours:
        raise kind.refuse(text, "Degrees are expected here, not hours.")
    if any("." in field for field in fields[:-1]):
        raise kind.refuse(text, "Only the last of the fields may have a decimal point.")
    numbers = [Fraction(field.rstrip(".")) for field in fields]
    if any(number >= 60 for number in numbers[1:]):
        raise kind.refuse(text, "Minutes and seconds are expected to be below 60.", "out-of-range")
    total = sum((number / 60**place for place, number in enumerate(numbers)), Fraction(0))
    return sign * total * (15 if in_hours else 1)


def _decimal_degrees(plain: str, text: str, kind: _Kind) -> Fraction:
    found = _DEGREE_NUMBER.fullmatch(plain)
    number, unit = (found["number"], found["unit"]) if found else (plain, "")
    if unit not in ("", "d", "deg", "°", "degree", "degrees"):
        why = "Sexagesimal fields, or decimal degrees with or without 'deg', are expected."
        raise kind.refuse(text, why)
    try:
        read_number(number, kind.name)
    except InputRefused as refused:
        fields = "Whole numbers between colons are expected, the last one with or without decimals."
        raise kind.refuse(text, fields if ":" in number else refused.why) from refused
    return Fraction(Decimal(number))  # the decimal as typed, not its nearest float


def _refuse_outside(text: str, degrees: Fraction, kind: _Kind, must_be: str) -> InputRefused:
    why = f"{quoted(text)} is {float(degrees):.10g} degrees."
    return kind.refuse(text, why, "out-of-range", f"{kind.name} must be {must_be}.")


def read_right_ascension(text: str, name: str = "--ra") -> float:
    """Right ascension in degrees, 0 to below 360.

    ``18:02:31.5``, ``18 02 31.5`` and ``18h02m31.5s`` are hours; ``270.6``, ``270.6d``, ``270.6 deg``
    and ``270d36m`` are degrees.

    Raises
    ------
    InputRefused
        Unreadable, negative, 24 h or more, or minutes or seconds of 60 or more.
    """
    kind = _Kind(name, "18:02:31.5", hours=True)
    plain = _plain(text, kind)
    if plain.startswith("-"):
        raise kind.refuse(text, "Right ascension has no minus sign.", "out-of-range")
    degrees = _exact_degrees(plain, text, kind)
    if float(degrees) >= 360.0:
        raise _refuse_outside(text, degrees, kind, "from 0 to below 24 hours (360 degrees)")
    return float(degrees)


def read_declination(text: str, name: str = "--dec") -> float:
    """Declination in degrees, -90 to 90: ``-45:12:30``, ``-00 30 10``, ``-45d12m30s``, ``-45.2``.

    Raises
    ------
    InputRefused
        Unreadable, beyond a pole, or minutes or seconds of 60 or more.
    """
    return _read_within_poles(text, _Kind(name, "-45:12:30"))


def _read_within_poles(text: str, kind: _Kind) -> float:
    degrees = _exact_degrees(_plain(text, kind), text, kind)
    return _checked_poles(text, degrees, kind)


def _checked_poles(text: str, degrees: Fraction, kind: _Kind) -> float:
    if abs(degrees) > 90:
        raise _refuse_outside(text, degrees, kind, "from -90 to +90 degrees")
    return float(degrees)


def _split_hemisphere(plain: str, text: str, letters: str, kind: _Kind) -> tuple[str, int]:
    """Cut a hemisphere letter off the end; the second of ``letters`` is the negative one."""
    if plain[-1] not in letters:
        return plain, 1
    if plain.startswith(("-", "+")):
        raise kind.refuse(text, "Either a sign or a hemisphere letter is expected, not both.")
    return plain[:-1].rstrip(" "), (-1 if plain[-1] == letters[1] else 1)


def read_latitude(text: str, name: str = "--latitude") -> float:
    """Geodetic latitude in degrees, north positive: ``-31.2``, ``31.2 S``, ``31 12 00 S``, ``-31:12:00``.

    The hemisphere letter is a capital, because a small ``s`` means seconds.

    Raises
    ------
    InputRefused
        Unreadable, beyond a pole, or both a sign and a letter.
    """
    kind = _Kind(name, "-31.2")
    body, sign = _split_hemisphere(_plain(text, kind), text, "NS", kind)
    return _checked_poles(text, sign * _exact_degrees(body, text, kind), kind)


def read_longitude(text: str, name: str = "--longitude") -> float:
    """Longitude in degrees, east positive, returned from above -180 to 180.

    ``-70``, ``70.0 W``, ``13.5E``, ``289.9`` (east, up to 360).

    Raises
    ------
    InputRefused
        Unreadable, below -180, 360 or more, above 180 with a letter, or both a sign and a letter.
    """
    kind = _Kind(name, "70.0 W")
    plain = _plain(text, kind)
    body, sign = _split_hemisphere(plain, text, "EW", kind)
    degrees = sign * _exact_degrees(body, text, kind)
    if body != plain and not -180 <= degrees <= 180:
        raise _refuse_outside(text, degrees, kind, "at most 180 degrees East or West")
    if not -180 <= degrees < 360:
        raise _refuse_outside(text, degrees, kind, "from -180 to 180 degrees, east positive")
    if degrees > 180:
        degrees -= 360
    return 180.0 if degrees == -180 else float(degrees)


def read_angle(text: str, name: str = "angle", low: float | None = None, high: float | None = None) -> float:
    """Any angle in degrees: ``143.5``, ``-3.2 arcmin``, ``0.4 rad``, ``143:30:00``, ``143d30m``.

    Raises
    ------
    InputRefused
        Unreadable, in hours, or outside ``low`` to ``high``.
    """
    expected = Expected("deg", name, low, high, with_error=False)
    kind = _Kind(name, expected.example())
    plain = _plain(text, kind)
    found = _DEGREE_NUMBER.fullmatch(plain)
    if found and found["unit"] and _fields(plain.lstrip("+-"), kind) is None:
        factor = unit_factor(found["unit"], "deg", name, text, kind.example)
        try:
            degrees = Fraction(read_number(found["number"], name) * factor)
        except InputRefused as refused:
            raise kind.refuse(text, refused.why) from refused
        except OverflowError as too_large:
            raise kind.refuse(text, "A finite angle is expected.", "out-of-range") from too_large
    else:
        degrees = _exact_degrees(plain, text, kind)
    if not expected.holds(float(degrees)):
        raise _refuse_outside(text, degrees, kind, expected.in_words())
    return float(degrees)


def _sexagesimal(value: float, decimals: int) -> tuple[int, int, str]:
    """Whole units, minutes and seconds of a value of zero or more, rounded once with the carry done."""
    scale = 10**decimals
    ticks = round(Fraction(value) * 3600 * scale)
    minutes, ticks = divmod(ticks, 60 * scale)
    whole, minutes = divmod(minutes, 60)
    seconds = f"{ticks // scale:02d}" + (f".{ticks % scale:0{decimals}d}" if decimals else "")
    return whole, minutes, seconds


def write_right_ascension(right_ascension_deg: float, decimals: int = 2) -> str:
    """Right ascension as ``18:02:31.50`` (hours); rounding up at 24 h gives ``00:00:00.00``."""
    hours, minutes, seconds = _sexagesimal(right_ascension_deg / 15.0, decimals)
    return f"{hours % 24:02d}:{minutes:02d}:{seconds}"


def write_declination(declination_deg: float, decimals: int = 1) -> str:
    """Declination as ``-45:12:30.0`` (degrees), always with its sign."""
    degrees, minutes, seconds = _sexagesimal(abs(declination_deg), decimals)
    return f"{'-' if declination_deg < 0 else '+'}{degrees:02d}:{minutes:02d}:{seconds}"
