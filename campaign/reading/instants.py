"""Instants as people type them, read into scale, place and error; and said back in one line.

The defaults, where the text does not say: scale and place as the caller gives them; ``BJD`` is TDB at
the barycentre; ``HJD`` is UTC at the heliocentre; ``J`` and ``B`` epochs are TT; ``Z`` and offsets are UTC.
"""

from __future__ import annotations

import math
import re
from decimal import Decimal, localcontext
from fractions import Fraction

from campaign.errors import InputRefused
from campaign.model.instants import Place, Scale, TypedInstant
from campaign.reading.dates import UTC_FROM_MJD, date_of_mjd, iso_of_mjd
from campaign.reading.expected import short
from campaign.reading.instantforms import (
    FormContext,
    FormRead,
    ImpossibleInstantError,
    read_form,
    ut_error_floor_d,
)
from campaign.reading.numbers import MINUS_SIGN, UNSIGNED, check_plain_text, read_number, refusal
from campaign.reading.units import YEAR_D, unit_factor
from campaign.reading.values import read_plain_value

EXAMPLE = "2031-04-07T03:12:10Z"
ACCEPTED_FORMS = (
    "2031-04-07T03:12:10Z, 2031-04-07, 2031-04-07/08 (the night), 2031-04, 2031, "
    "MJD 61234.5, JD 2461235.0, BJD 2461235.0, 2031.27, J2031.27, each with ±error"
)
_MAX_LENGTH = 120
_SCALES: dict[str, Scale] = {
    "UTC": "utc", "UT": "utc", "GMT": "utc", "TT": "tt", "TDB": "tdb", "TAI": "tai",
}  # fmt: skip
_SCALE_WORD = re.compile(r"(?:[_(]|(?<![A-Za-z_(]))(UTC|UT|GMT|TT|TDB|TAI)\)?(?![A-Za-z0-9_])", re.IGNORECASE)
_SYMMETRIC = re.compile(rf"±\s*(?P<size>{UNSIGNED})\s*(?P<unit>[^\W\d_].*)?")
_PAIR = rf"""(?:\+\s?(?P<plus_first>{UNSIGNED})\s*[/,]?\s*-\s?(?P<minus_second>{UNSIGNED})
              | -\s?(?P<minus_first>{UNSIGNED})\s*[/,]?\s*\+\s?(?P<plus_second>{UNSIGNED}))
            \s*(?P<unit>[^\W\d_].*)?"""
# On a date the pair must stand apart: in 2031-04-07 the signs are hyphens.
_SPACED_PAIR = re.compile(rf"(?P<head>.*\S)\s+{_PAIR}", re.VERBOSE)
_ATTACHED_PAIR = re.compile(
    rf"(?P<head>(?:[BH]?M?JD|J|B)?\s?[0-9]+\.[0-9]+){_PAIR}", re.VERBOSE | re.IGNORECASE
)
_PLACE_WORDS: dict[Place, str] = {
    "observatory": "at the observatory",
    "geocentre": "at the geocentre",
    "heliocentre": "at the heliocentre",
    "barycentre": "at the barycentre",
}


def _refuse(
    name: str, text: str, why: str, accepted: str = "", code: str = "instant-unreadable"
) -> InputRefused:
    return refusal(name, text, why, accepted or EXAMPLE, code)


def _take_scale_word(plain: str, name: str, text: str) -> tuple[str, Scale | None]:
    words = {_SCALES[word.upper()] for word in _SCALE_WORD.findall(plain)}
    if len(words) > 1:
        raise _refuse(name, text, "One time scale is expected, but there are two.")
    without = " ".join(_SCALE_WORD.sub(" ", plain).split())
    return without, (words.pop() if words else None)


def _take_error(plain: str, name: str, text: str) -> tuple[str, tuple[str, str, str] | None]:
    """Split off the typed error: (minus, plus, unit) as texts."""
    head, mark, _ = plain.partition("±")
    if mark:
        found = _SYMMETRIC.fullmatch(plain[len(head) :])
        if not found:
            why = "After ± a size of zero or more and a unit are expected, such as ±2 d."
            raise _refuse(name, text, why, f"{EXAMPLE} ±2 d")
        return head.rstrip(), (found["size"], found["size"], found["unit"] or "")
    found = _SPACED_PAIR.fullmatch(plain) or _ATTACHED_PAIR.fullmatch(plain)
    if not found:
        return plain, None
    minus = found["minus_first"] or found["minus_second"]
    plus = found["plus_first"] or found["plus_second"]
    return found["head"], (minus, plus, found["unit"] or "")


def _errors_d(
    form: FormRead, typed: tuple[str, str, str] | None, name: str, text: str
) -> tuple[float | None, float | None, float]:
    """Minus, plus and interval width in days: a typed error counts, but not below that of an interval."""
    if typed is None:
        return form.sigma_d, form.sigma_d, form.width_d
    minus_text, plus_text, unit_text = typed
    accepted = f"{EXAMPLE} ±2 d"
    if not unit_text and form.error_unit is None:
        why = f"The error of a {form.precision} needs its unit: d, month, yr or another."
        raise _refuse(name, text, why, accepted)
    if unit_text:
        factor = unit_factor(unit_text, "d", name, text, accepted)
    else:
        factor = YEAR_D if form.error_unit == "yr" else 1.0
    try:
        minus, plus = (factor * read_number(size, name) for size in (minus_text, plus_text))
    except InputRefused as refused:
        raise _refuse(name, text, refused.why, accepted) from refused
    if not (math.isfinite(minus) and math.isfinite(plus)):
        raise _refuse(name, text, "A finite error is expected.", accepted)
    floor = (form.sigma_d or 0.0) if form.width_d else 0.0
    width = form.width_d if max(minus, plus) <= floor else 0.0
    return max(minus, floor), max(plus, floor), width


def _explain(plain: str, name: str, text: str) -> InputRefused:
    """The refusal of a text that has none of the forms, with the likeliest reason."""
    bare = re.fullmatch(r"([0-9]{5,7})(\.[0-9]*)?", plain)
    if bare:
        kind = "JD" if len(bare[1]) == 7 else "MJD"
        accepted = f"{kind} {plain}"
        why = "A bare number is not told from a date: JD, MJD, HJD or BJD is expected in front of it."
        return _refuse(name, text, why, accepted if _is_accepted(accepted) else "MJD 61234.5")
    loose = re.fullmatch(r"([0-9]{4})[-/.]([0-9]{1,2})[-/.]([0-9]{1,2})", plain)
    if loose:
        accepted = f"{loose[1]}-{int(loose[2]):02d}-{int(loose[3]):02d}"
        why = "Dates are expected with hyphens and two digits for month and day."
        return _refuse(name, text, why, accepted if _is_accepted(accepted) else "2031-04-07")
    if re.match(r"[0-9]{1,2}[-/. ][0-9A-Za-z]+[-/. ][0-9]{2,4}", plain):
        return _refuse(name, text, "Dates are expected with the year first.", "2031-04-07")
    return _refuse(name, text, f"An instant is expected in one of these forms: {ACCEPTED_FORMS}.")


def _is_accepted(text: str) -> bool:
    try:
        read_instant(text)
    except InputRefused:
        return False
    return True


def read_instant(
    text: str,
    default_scale: Scale = "utc",
    default_place: Place = "observatory",
    name: str = "--at",
    *,
    longitude_deg_east: float | None = None,
) -> TypedInstant:
    """Read an instant in any accepted form.

    Parameters
    ----------
    text
        What was typed; see ``ACCEPTED_FORMS``, each also with a scale word and an error.
    default_scale, default_place
        What is meant where the text does not say.
    name
        The option or column, for the refusal.
    longitude_deg_east
        Of the site, if known: the centre of a night is then its local midnight and its width half a day;
        otherwise midnight UTC and a whole day.

    Returns
    -------
    TypedInstant
        A calendar day, month, year or night is the interval itself (centre, width, width/sqrt(12)); a minute,
        decimal year or epoch carries its rounding error; a time to the second has error zero; a Julian date
        without a typed error has an unknown one. A typed error replaces these, but cannot make a calendar
        interval narrower than it is.
        UTC before 1960 is universal time (scale ``ut``), with an error of at least 1 s (6 s before 1900,
        20 s before 1700, 10 min before 1600).

    Raises
    ------
    InputRefused
        Unreadable, impossible, or outside the years 1 to 9999.
    """
    try:
        plain = check_plain_text(text, name, _MAX_LENGTH).replace(MINUS_SIGN, "-")
    except InputRefused as refused:
        raise _refuse(name, text, refused.why) from refused
    plain = plain.replace("+/-", "±").replace("+-", "±")
    unscaled, scale_word = _take_scale_word(plain, name, text)
    head, typed_error = _take_error(unscaled, name, text)
    try:
        form = read_form(head, FormContext(scale_word, default_scale, default_place, longitude_deg_east))
    except ImpossibleInstantError as impossible:
        accepted = impossible.accepted if _is_accepted(impossible.accepted) else ""
        raise _refuse(name, text, impossible.why, accepted, "instant-impossible") from impossible
    if form is None:
        raise _explain(head, name, text)
    minus, plus, width = _errors_d(form, typed_error, name, text)
    scale = form.scale
    if scale == "utc" and form.mjd < UTC_FROM_MJD:
        scale = "ut"
    if scale == "ut":
        floor = ut_error_floor_d(form.mjd)
        minus, plus = (None if size is None else max(size, floor) for size in (minus, plus))
    day = form.mjd.numerator // form.mjd.denominator
    fraction = min(float(form.mjd - day), math.nextafter(1.0, 0.0))
    return TypedInstant(
        float(day), fraction, scale, form.place, minus, plus, form.precision, text.strip(), width
    )


def read_duration(text: str, name: str = "--within") -> float:
    """A length of time above zero in days: ``5yr``, ``90 d``, ``6 months``; a bare number is days.

    Raises
    ------
    InputRefused
        Unreadable, with an error, zero or negative.
    """
    return read_plain_value(text, "d", name, low=0.0, low_open=True, shown="5 yr")


def _exact_mjd(typed: TypedInstant) -> Fraction:
    return Fraction(typed.mjd_day) + Fraction(typed.mjd_fraction)


def _error_in_words(typed: TypedInstant) -> str:
    if typed.minus_d is None or typed.plus_d is None:
        return ""
    if typed.minus_d == typed.plus_d == 0.0:
        return ""
    largest = max(typed.minus_d, typed.plus_d)
    factor, unit = (1.0, "d") if largest >= 0.01 else (86400.0, "s")
    if typed.minus_d == typed.plus_d:
        return f"±{_rounded(factor * typed.plus_d)} {unit}"
    return f"+{_rounded(factor * typed.plus_d)} -{_rounded(factor * typed.minus_d)} {unit}"


def _rounded(size: float) -> str:
    """Two significant digits, whole numbers as they are, no exponent for the sizes that occur."""
    if size == 0.0:
        return "0"
    digits = max(0, 1 - math.floor(math.log10(size)))
    text = f"{size:.{digits}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def describe_instant(typed: TypedInstant) -> str:
    """One line that says how an instant was understood."""
    mjd = _exact_mjd(typed)
    where = f"{typed.scale.upper()} {_PLACE_WORDS[typed.place]}"
    error = _error_in_words(typed)
    to_second = iso_of_mjd(mjd, typed.scale)
    to_minute = to_second[:16].replace("T", " ")
    if typed.precision in ("day", "night", "month", "year"):
        return f"{_interval_in_words(typed)} (centre {to_minute}{f', {error}' if error else ''}), {where}"
    if typed.precision in ("decimal year", "Julian epoch", "Besselian epoch"):
        kind = f"calendar {typed.precision}" if typed.precision == "decimal year" else typed.precision
        return f"{to_minute} ({kind}{f', {error}' if error else ''}), {where}"
    if typed.precision == "Julian date":
        number = f"MJD {float(mjd):.6f}".rstrip("0").rstrip(".")
        return f"{to_second} {where} ({number}), {error or _no_error_in_words(typed)}"
    milliseconds = iso_of_mjd(mjd, typed.scale, 3)
    shown = to_minute if typed.precision == "minute" else milliseconds.removesuffix(".000")
    return f"{shown} {where}{f', {error}' if error else ''}"


def _no_error_in_words(typed: TypedInstant) -> str:
    return "error unknown" if typed.minus_d is None else "exact"


def _interval_in_words(typed: TypedInstant) -> str:
    """The interval itself: ``day 2031-04-07``, ``night 2031-04-07/08``, ``calendar year 2031``."""
    centre = date_of_mjd(int(typed.mjd_day)).isoformat()
    if typed.precision == "night":
        found = re.search(r"[0-9]{4}-[0-9]{2}-[0-9]{2}/[0-9-]+", typed.text.replace(MINUS_SIGN, "-"))
        return f"night {found[0]}" if found else "night"
    lengths = {"day": 10, "month": 7, "year": 4}
    kind = typed.precision if typed.precision == "day" else f"calendar {typed.precision}"
    return f"{kind} {centre[: lengths[typed.precision]]}"


def write_instant(typed: TypedInstant) -> str:
    """Text that reads back to the identical MJD, scale and errors, as a Julian date.

    The place is written where a text can say it (heliocentre, barycentre); the observatory and the
    geocentre are the reader's default place.
    """
    prefix = {"barycentre": "BMJD", "heliocentre": "HMJD"}.get(typed.place, "MJD")
    scale = "UTC" if typed.scale == "ut" else typed.scale.upper()
    with localcontext(prec=60):
        number = Decimal(int(typed.mjd_day)) + Decimal(repr(float(typed.mjd_fraction)))
    written = f"{prefix}_{scale} {number:f}"
    if typed.minus_d is None or typed.plus_d is None:
        return written
    if typed.minus_d == typed.plus_d:
        return f"{written} ±{short(typed.plus_d)} d"
    return f"{written} +{short(typed.plus_d)} -{short(typed.minus_d)} d"
