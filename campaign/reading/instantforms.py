"""The forms in which an instant is written, each read into an exact MJD with what its precision implies."""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from decimal import Decimal
from fractions import Fraction
from typing import Literal

from campaign.model.instants import Place, Scale
from campaign.reading.dates import (
    END_MJD,
    FIRST_MJD,
    UTC_FROM_MJD,
    date_of_mjd,
    day_length_s,
    days_in_month,
    days_in_year,
    has_leap_second,
    mjd_of_date,
)

_UNIFORM = 1.0 / math.sqrt(12.0)  # standard deviation of an interval of width 1
_JD_OF_MJD_0 = Fraction(4_800_001, 2)
NIGHT_WIDTH_D = 0.5


class ImpossibleInstantError(Exception):
    """A text has the form of an instant, but there is no such instant.

    ``accepted`` is a form nearby that would be accepted, or empty. Never leaves ``campaign.reading``.
    """

    def __init__(self, why: str, accepted: str = "") -> None:
        super().__init__(why)
        self.why = why
        self.accepted = accepted


@dataclass(frozen=True, slots=True)
class FormContext:
    """What the rest of the text and the caller say: the scale word, if any, and the defaults."""

    scale_word: Scale | None
    default_scale: Scale
    default_place: Place
    longitude_deg_east: float | None

    @property
    def scale(self) -> Scale:
        return self.scale_word or self.default_scale


@dataclass(frozen=True, slots=True)
class FormRead:
    """An instant as its form alone gives it. ``sigma_d`` is None where the form implies no error."""

    mjd: Fraction
    precision: str
    scale: Scale
    place: Place
    sigma_d: float | None = 0.0
    width_d: float = 0.0
    error_unit: Literal["d", "yr"] | None = "d"


def _mjd_of_date(year: str, month: str, day: str) -> int:
    """MJD of a typed date, or why there is none."""
    if int(year) == 0:
        raise ImpossibleInstantError("Years 0001 to 9999 are expected.")
    if not 1 <= int(month) <= 12:
        raise ImpossibleInstantError(f"There is no month {month}; 01 to 12 are expected.", f"{year}-01-{day}")
    last = days_in_month(int(year), int(month))
    if not 1 <= int(day) <= last:
        why = f"{year}-{month} has the days 01 to {last}, not {day}."
        raise ImpossibleInstantError(why, f"{year}-{month}-{last if int(day) else '01'}")
    return mjd_of_date(int(year), int(month), int(day))


def _interval(start: int, days: float, precision: str, scale: Scale, place: Place) -> FormRead:
    centre = start + Fraction(days) / 2
    unit: Literal["d"] | None = "d" if precision == "day" else None
    return FormRead(centre, precision, scale, place, days * _UNIFORM, days, unit)


def _read_clock(found: re.Match[str], context: FormContext) -> FormRead:
    day = _mjd_of_date(found["year"], found["month"], found["day"])
    hour, minute, second = int(found["hour"]), int(found["minute"]), found["second"]
    date_text = f"{found['year']}-{found['month']}-{found['day']}"
    if hour > 23 or minute > 59:
        why = "Hours 00 to 23 and minutes 00 to 59 are expected; midnight is 00:00 of the next day."
        raise ImpossibleInstantError(why, f"{date_text}T23:59:00")
    scale = context.scale
    if found["offset"]:
        if context.scale_word not in (None, "utc"):
            raise ImpossibleInstantError(
                "Z and offsets belong to UTC; leave out either them or the scale word."
            )
        scale = "utc"
        day, hour, minute = _shifted_to_utc(day, hour, minute, found["offset"])
    seconds = Fraction(second or 0)
    if seconds >= 60:
        inserted = scale == "utc" and (hour, minute) == (23, 59) and has_leap_second(day)
        if seconds >= 61 or not inserted:
            why = "Seconds below 60 are expected: no leap second was inserted there."
            raise ImpossibleInstantError(why, f"{date_text}T{found['hour']}:{found['minute']}:59")
    length_s = day_length_s(day, scale)
    mjd = day + (3600 * hour + 60 * minute + seconds) / length_s
    if second is None:
        return FormRead(mjd, "minute", scale, context.default_place, 60.0 * _UNIFORM / 86400.0)
    return FormRead(mjd, "second", scale, context.default_place)


def _shifted_to_utc(day: int, hour: int, minute: int, offset: str) -> tuple[int, int, int]:
    """The UTC day, hour and minute of a local clock with ``offset`` (``Z``, ``+02:00``, ``+0530``)."""
    if offset in ("Z", "z"):
        return day, hour, minute
    digits = offset[1:].replace(":", "").ljust(4, "0")
    minutes_east = 60 * int(digits[:2]) + int(digits[2:])
    if int(digits[2:]) > 59 or minutes_east > 15 * 60:
        raise ImpossibleInstantError(
            "An offset from UTC of at most 15 hours, with minutes below 60, is expected."
        )
    local = hour * 60 + minute + (minutes_east if offset[0] == "-" else -minutes_east)
    days, minute_of_day = divmod(local, 1440)
    return day + days, *divmod(minute_of_day, 60)


def _read_night(found: re.Match[str], context: FormContext) -> FormRead:
    if context.scale_word not in (None, "utc"):
        raise ImpossibleInstantError("A night is counted in UTC; leave the scale word out.")
    evening = _mjd_of_date(found["year"], found["month"], found["day"])
    if evening + 1 >= END_MJD:
        raise ImpossibleInstantError("Years 0001 to 9999 are expected.")
    morning = date_of_mjd(evening + 1)
    typed_month = found["next_month"] or f"{morning.month:02d}"
    typed_year = found["next_year"] or f"{morning.year:04d}"
    if f"{typed_year}-{typed_month}-{found['next_day']}" != morning.isoformat():
        why = f"A night lies between two dates in a row; after this one comes {morning.isoformat()}."
        accepted = f"{found['year']}-{found['month']}-{found['day']}/{morning.day:02d}"
        raise ImpossibleInstantError(why, accepted)
    # Without a longitude local midnight may be anywhere within half a day of midnight UTC.
    longitude = context.longitude_deg_east
    centre = Fraction(evening + 1) - Fraction(longitude or 0.0) / 360
    width = 1.0 if longitude is None else NIGHT_WIDTH_D
    scale: Scale = "utc"
    return FormRead(centre, "night", scale, "observatory", width * _UNIFORM, width)


def _read_day(found: re.Match[str], context: FormContext) -> FormRead:
    day = _mjd_of_date(found["year"], found["month"], found["day"])
    return _interval(day, 1.0, "day", context.scale, context.default_place)


def _read_month(found: re.Match[str], context: FormContext) -> FormRead:
    first = _mjd_of_date(found["year"], found["month"], "01")
    days = days_in_month(int(found["year"]), int(found["month"]))
    return _interval(first, float(days), "month", context.scale, context.default_place)


def _read_year(found: re.Match[str], context: FormContext) -> FormRead:
    first = _mjd_of_date(found["year"], "01", "01")
    days = float(days_in_year(int(found["year"])))
    return _interval(first, days, "year", context.scale, context.default_place)


def _read_decimal_year(found: re.Match[str], context: FormContext) -> FormRead:
    first = _mjd_of_date(found["year"], "01", "01")
    days = days_in_year(int(found["year"]))
    elapsed = Fraction(Decimal("0." + found["decimals"])) * days
    sigma_d = days * 10.0 ** -len(found["decimals"]) * _UNIFORM
    return FormRead(
        first + elapsed, "decimal year", context.scale, context.default_place, sigma_d, error_unit="yr"
    )


def _read_epoch(found: re.Match[str], context: FormContext) -> FormRead:
    """Julian and Besselian epochs, in terrestrial time unless a scale word says otherwise."""
    year = Fraction(Decimal(found["number"]))
    if found["letter"] in "Jj":
        # J2000.0 is JD 2451545.0 TT; the year has 365.25 d (IAU 1976 resolution).
        precision, year_d = "Julian epoch", Fraction(36525, 100)
        mjd = Fraction(103_089, 2) + (year - 2000) * year_d
    else:
        # B1900.0 is JD 2415020.31352; the tropical year has 365.242198781 d (Lieske 1979).
        precision, year_d = "Besselian epoch", Fraction("365.242198781")
        mjd = Fraction("2415020.31352") - _JD_OF_MJD_0 + (year - 1900) * year_d
    decimals = len(found["number"].partition(".")[2])
    sigma_d = float(year_d) * 10.0**-decimals * _UNIFORM
    return FormRead(
        mjd, precision, context.scale_word or "tt", context.default_place, sigma_d, error_unit="yr"
    )


def _read_julian_date(found: re.Match[str], context: FormContext) -> FormRead:
    """JD, MJD, HJD, BJD: where no error is typed it is unknown; digits alone say nothing of it."""
    number = Fraction(Decimal(found["number"]))
    kind = found["kind"].upper()
    modified = kind.endswith("MJD")
    mjd = number if modified else number - _JD_OF_MJD_0
    if modified and number >= 2_400_000:
        why = "An MJD of our time has five digits before the point; with seven it is a JD."
        raise ImpossibleInstantError(why, f"{kind.replace('M', '')} {found['number']}")
    if not modified and number < 100_000:
        why = "A JD of our time has seven digits before the point; JD - 2400000.5 is the MJD."
        raise ImpossibleInstantError(why, f"{kind.replace('JD', 'MJD')} {found['number']}")
    scale, place = context.scale, context.default_place
    if kind[0] == "B":
        scale, place = context.scale_word or "tdb", "barycentre"
    elif kind[0] == "H":
        scale, place = context.scale_word or "utc", "heliocentre"
    sigma_d = None
    if found["last_digits"]:
        decimals = len(found["number"].partition(".")[2])
        sigma_d = float(Fraction(int(found["last_digits"]), 10**decimals))
    return FormRead(mjd, "Julian date", scale, place, sigma_d)


_DATE = r"(?P<year>[0-9]{4})-(?P<month>[0-9]{2})-(?P<day>[0-9]{2})"
_FORMS: tuple[tuple[re.Pattern[str], Callable[[re.Match[str], FormContext], FormRead]], ...] = (
    (
        re.compile(
            rf"{_DATE}[Tt ](?P<hour>[0-9]{{2}}):(?P<minute>[0-9]{{2}})"
            r"(?::(?P<second>[0-9]{2}(?:\.[0-9]+)?))?\s?(?P<offset>[Zz]|[+-][0-9]{2}(?::?[0-9]{2})?)?"
        ),
        _read_clock,
    ),
    (
        re.compile(
            rf"{_DATE}/(?:(?:(?P<next_year>[0-9]{{4}})-)?(?P<next_month>[0-9]{{2}})-)?(?P<next_day>[0-9]{{2}})"
        ),
        _read_night,
    ),
    (re.compile(_DATE), _read_day),
    (re.compile(r"(?P<year>[0-9]{4})-(?P<month>[0-9]{2})"), _read_month),
    (re.compile(r"(?P<year>[0-9]{4})"), _read_year),
    (re.compile(r"(?P<year>[0-9]{4})\.(?P<decimals>[0-9]{1,12})"), _read_decimal_year),
    (re.compile(r"(?P<letter>[JjBb])\s?(?P<number>[0-9]{1,4}(?:\.[0-9]{1,12})?)"), _read_epoch),
    (
        re.compile(
            r"(?P<kind>(?:[BH]?M?)JD)\s?(?P<number>[+-]?[0-9]{1,7}(?:\.[0-9]{0,40})?)"
            r"(?:\((?P<last_digits>[0-9]{1,12})\))?",
            re.IGNORECASE,
        ),
        _read_julian_date,
    ),
)


def read_form(plain: str, context: FormContext) -> FormRead | None:
    """Read one form, without scale word and error; None if the text has none of the accepted forms.

    Raises
    ------
    ImpossibleInstantError
        The text has a form, but there is no such instant in the years 1 to 9999.
    """
    for pattern, reader in _FORMS:
        found = pattern.fullmatch(plain)
        if found:
            form = reader(found, context)
            if not FIRST_MJD <= form.mjd < END_MJD:
                raise ImpossibleInstantError("Years 0001 to 9999 are expected.")
            return form
    return None


def ut_error_floor_d(mjd: Fraction) -> float:
    """The least one-sigma error of an instant given in universal time, before UTC began in 1960.

    The offset of universal from uniform time is known to about 1 s since 1900, 6 s since 1700, 20 s since
    1600, and to ten minutes before: so far do published reconstructions differ, rounded up (Espenak &
    Meeus 2006 against the table carried by skyfield).
    """
    if mjd >= UTC_FROM_MJD:
        return 0.0
    floors_s = ((1900, 1.0), (1700, 6.0), (1600, 20.0))
    seconds = next((s for year, s in floors_s if mjd >= mjd_of_date(year, 1, 1)), 600.0)
    return seconds / 86400.0
