"""Calendar arithmetic: Gregorian dates (proleptic before 1582) and clock times to MJD and back.

In UTC the day that ends with a leap second lasts 86401 s, and its MJD is the quasi-MJD of erfa: the
fraction is counted in that longer day. Between 1960 and 1972 days differed from 86400 s by smaller steps,
which are followed too. Everything is exact (``Fraction``) until the caller rounds once.
"""

from __future__ import annotations

import math
import warnings
from datetime import date, timedelta
from fractions import Fraction
from functools import lru_cache

_ORDINAL_OF_MJD_0 = 678_576  # date(1858, 11, 17).toordinal()
FIRST_MJD = 1 - _ORDINAL_OF_MJD_0  # 0001-01-01
END_MJD = 2_973_484  # the end of 9999-12-31
UTC_FROM_MJD = 36_934  # 1960-01-01: before it there is no UTC, only universal time


def mjd_of_date(year: int, month: int, day: int) -> int:
    """MJD of the start of a date; ``ValueError`` if there is no such date in the years 1 to 9999."""
    return date(year, month, day).toordinal() - _ORDINAL_OF_MJD_0


def date_of_mjd(mjd_day: int) -> date:
    return date.fromordinal(mjd_day + _ORDINAL_OF_MJD_0)


def days_in_year(year: int) -> int:
    return 366 if (year % 4 == 0 and year % 100 != 0) or year % 400 == 0 else 365


def days_in_month(year: int, month: int) -> int:
    if month == 12:
        return 31
    return (date(year, month + 1, 1) - date(year, month, 1)) // timedelta(days=1)


@lru_cache(maxsize=4096)
def utc_day_length_s(mjd_day: int) -> Fraction:
    """Length of a UTC day in seconds: 86401 if a leap second ends it, 86400 before there was UTC."""
    if not UTC_FROM_MJD <= mjd_day < END_MJD - 1:
        return Fraction(86400)
    import erfa

    this, after = date_of_mjd(mjd_day), date_of_mjd(mjd_day + 1)
    with warnings.catch_warnings():
        # "Dubious year": leap seconds to come are unknown; a day to come is taken to have none.
        warnings.simplefilter("ignore", erfa.ErfaWarning)
        start = erfa.dat(this.year, this.month, this.day, 0.0)
        noon = erfa.dat(this.year, this.month, this.day, 0.5)
        end = erfa.dat(after.year, after.month, after.day, 0.0)
    # TAI-UTC drifted through the day until 1972; what is left after the drift is the step at its end.
    step_s = float(end) - (2.0 * float(noon) - float(start))
    return 86400 + Fraction(round(step_s * 1e6), 10**6)


def has_leap_second(mjd_day: int) -> bool:
    """Whether a leap second was inserted at the end of this UTC day."""
    return utc_day_length_s(mjd_day) > Fraction(172801, 2)


def day_length_s(mjd_day: int, scale: str) -> Fraction:
    return utc_day_length_s(mjd_day) if scale == "utc" else Fraction(86400)


def iso_of_mjd(mjd: Fraction, scale: str, decimals: int = 0) -> str:
    """``2031-04-07T03:12:10`` with ``decimals`` of a second, rounded; a leap second reads 23:59:60."""
    day = mjd.numerator // mjd.denominator
    length_s = day_length_s(day, scale)
    ticks_per_s = 10**decimals
    ticks = round((mjd - day) * length_s * ticks_per_s)
    if ticks >= length_s * ticks_per_s:
        # Rounding up ends the day, except on the last day that there is.
        day, ticks = (day + 1, 0) if day < END_MJD - 1 else (day, math.ceil(length_s * ticks_per_s) - 1)
    whole_s, rest = divmod(ticks, ticks_per_s)
    minute_of_day = min(whole_s // 60, 1439)
    hour, minute = divmod(minute_of_day, 60)
    second = whole_s - 60 * minute_of_day
    fraction = f".{rest:0{decimals}d}" if decimals else ""
    return f"{date_of_mjd(day).isoformat()}T{hour:02d}:{minute:02d}:{second:02d}{fraction}"
