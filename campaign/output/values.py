"""Values with errors, limits and dates as short text for tables."""

from __future__ import annotations

import math
from datetime import date, timedelta

from campaign.model.instants import Moment
from campaign.model.measured import Limit, Measured, Range

_FIRST_DAY, _LAST_DAY = -678_575, 2_973_483  # 0001-01-01 and 9999-12-31


def number(value: Measured | Limit | Range | None, unit: str = "") -> str:
    """A value rounded to two digits of its error, with its unit; empty when there is none."""
    if value is None:
        return ""
    tail = f" {unit}" if unit else ""
    if isinstance(value, Limit):
        return f"{'>' if value.side == 'above' else '<'} {value.bound:.8g}{tail}"
    if isinstance(value, Range):
        return f"{value.low:.8g} to {value.high:.8g}{tail}"
    if value.minus is None or value.plus is None:
        return f"{value.value:.8g}{tail} (error unknown)"
    if value.minus == 0.0 and value.plus == 0.0:
        return f"{value.value:.8g}{tail} (exact)"
    smallest = min(error for error in (value.minus, value.plus) if error > 0.0)
    if (
        value.value != 0.0
        and (abs(value.value) < 1e-3 or abs(value.value) >= 1e7)
        and abs(value.value) > smallest
    ):
        return _scaled(value) + tail
    places = max(0, 1 - math.floor(math.log10(smallest)))
    middle = f"{value.value:.{places}f}"
    if value.is_symmetric:
        return f"{middle} ± {value.plus:.{places}f}{tail}"
    return f"{middle} +{value.plus:.{places}f} −{value.minus:.{places}f}{tail}"


def _scaled(value: Measured) -> str:
    power = math.floor(math.log10(abs(value.value)))
    inner = number(value.scaled(10.0**-power))
    return f"({inner})e{power:+d}"


def epoch(moment: Moment | None) -> str:
    """An epoch on the catalogue's axis with its error."""
    if moment is None:
        return ""
    return "MJD " + number(Measured(moment.bmjd_tdb, moment.minus_d, moment.plus_d)) + " TDB"


def calendar_day(mjd: float) -> str:
    """The day of an MJD, for people; the MJD itself where no calendar reaches."""
    days = math.floor(mjd)
    if not _FIRST_DAY <= days <= _LAST_DAY:
        return f"MJD {days}"
    return (date(1858, 11, 17) + timedelta(days=days)).isoformat()


def dated(moment: Moment) -> str:
    """A dated instant by its day, with its error in days."""
    minus, plus = moment.minus_d, moment.plus_d
    day = calendar_day(moment.bmjd_tdb)
    if minus is None or plus is None:
        return f"{day} (error unknown)"
    below, above = (f"{size:.2g}" if size < 99.5 else f"{size:.0f}" for size in (minus, plus))
    return f"{day} ± {above} d" if minus == plus else f"{day} +{above} −{below} d"


def period_in_years(period: Measured | Limit | Range | None) -> str:
    """A period in Julian years."""
    return "" if period is None else number(period.scaled(1.0 / 365.25), "yr")


def sexagesimal(value_deg: float, hours: bool) -> str:
    """A right ascension (to 0.01 s) or a declination (to 0.1 arcsec) for a table."""
    per_degree, places = (240.0, 2) if hours else (3600.0, 1)
    scale = 10**places
    ticks = round(abs(value_deg) * per_degree * scale)
    if hours:
        ticks %= 86_400 * scale
    whole, rest = divmod(ticks, 3600 * scale)
    minutes, seconds = divmod(rest, 60 * scale)
    sign = "" if hours else ("-" if value_deg < 0 else "+")
    return f"{sign}{whole:02d}:{minutes:02d}:{seconds / scale:0{3 + places}.{places}f}"
