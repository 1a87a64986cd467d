"""Dates, spans, chances and counts of days in the few characters that a table has for them."""

from __future__ import annotations

import re
from collections.abc import Iterable

from campaign.model.forecasts import EVENT_NAMES, EventForecast, Status

UNKNOWN = "unknown"
ERROR_UNKNOWN = "error unknown"
DAYS_PER_YEAR = 365.25
# From this many days on, an interval is told in years.
_YEARS_FROM_D = 1000.0

_MINUS = re.compile(r"(?<![\w)\-.])-(?=[0-9])")

STATUS_STYLES: dict[Status, str] = {
    "under way": "bold green",
    "open": "bold yellow",
    "late": "bold yellow",
    "suspected": "bold yellow",
    "unseen": "magenta",
    "phase lost": "magenta",
    "over": "dim",
    "past": "dim",
}

UTC_NOTE = (
    "UTC dates are barycentric instants in the UTC scale, without light time (at most 8.4 min from "
    "arrival at Earth) and without leap seconds still to be announced."
)


def percent(probability: float | None) -> str:
    """A probability as a whole percentage; never rounded to certainty."""
    if probability is None:
        return UNKNOWN
    if 0.0 < probability < 0.005:
        return "<1 %"
    if 0.995 < probability < 1.0:
        return ">99 %"
    return f"{100.0 * probability:.0f} %"


def day(utc: str | None, bmjd_tdb: float) -> str:
    """The calendar day of an instant; its MJD where no calendar reaches."""
    return utc.partition("T")[0] if utc else f"MJD {bmjd_tdb:.0f}"


def minus_signs(text: str) -> str:
    """``text`` with U+2212 before its negative numbers; hyphens inside words, dates and ranges stay."""
    return _MINUS.sub("−", text)


def signed_days(days: float) -> str:
    """A count of days with its sign, as ``+812`` or ``−45``."""
    whole = round(days)
    return f"{whole:+d}".replace("-", "−") if whole else "0"


def spread(median: float, low: float | None, high: float | None) -> str:
    """An interval as its distance from the median: ``±12`` or ``−12/+15`` days, long ones as ``±3.1 yr``."""
    if low is None or high is None:
        return ERROR_UNKNOWN
    below, above = max(0.0, median - low), max(0.0, high - median)
    unit, scale = (" yr", DAYS_PER_YEAR) if max(below, above) >= _YEARS_FROM_D else ("", 1.0)
    short_below, short_above = _short(below / scale), _short(above / scale)
    if short_below == short_above:
        return f"±{short_below}{unit}"
    return f"−{short_below}/+{short_above}{unit}"


def _short(size: float) -> str:
    if size >= 9.95:
        return f"{size:.0f}"
    if size >= 0.095:
        return f"{size:.1f}"
    return f"{size:.1g}" if size > 0.0 else "0"


def between(low: str | None, high: str | None, low_mjd: float | None, high_mjd: float | None) -> str:
    """An interval by its calendar days, the same day said once."""
    if low_mjd is None or high_mjd is None:
        return ERROR_UNKNOWN
    first, last = day(low, low_mjd), day(high, high_mjd)
    return first if first == last else f"{first} … {last}"


def chance(event: EventForecast) -> str:
    """What a table says of the probability: nothing when the event is certain."""
    if event.observed:
        return "seen"
    return "" if event.probability == 1.0 else percent(event.probability)


def yearly(event: EventForecast) -> str:
    """What stands in place of a date when the phase is lost or the date is unknown."""
    if event.probability_per_yr is None:
        return "no date"
    return f"{percent(event.probability_per_yr)}/yr" if event.probability_per_yr < 1.0 else "each year"


def occasion(event: EventForecast) -> str:
    """The event with its cycle, as ``onset 7``."""
    return event.event if event.cycle is None else f"{event.event} {event.cycle}"


def by_date(events: Iterable[EventForecast]) -> list[EventForecast]:
    """Events in order of their median, those without a date last."""
    return sorted(
        events,
        key=lambda e: (
            e.bmjd_tdb.median if e.bmjd_tdb is not None else float("inf"),
            e.system,
            EVENT_NAMES.index(e.event),
        ),
    )
