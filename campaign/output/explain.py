"""The forecast of one system, step by step: elements, cycle count, each part of the error in days."""

from __future__ import annotations

import math
from collections.abc import Sequence

from campaign.model.forecasts import ExplainedEvent, ExplainedSystem, Quantiles, UtcQuantiles, VarianceTerm
from campaign.output.console import Screen
from campaign.output.tables import Column, print_table
from campaign.output.upcoming import render_bases, render_dates, render_notes
from campaign.output.wording import day, occasion, spread, yearly

_BAR_CELLS = 12


def render_explained(screen: Screen, explained: ExplainedSystem) -> None:
    """Write the dates of one system and how each came about."""
    render_dates(screen, explained.upcoming)
    if explained.elements or explained.events:
        screen.line("")
        screen.heading(f"How the dates of {explained.system} come about")
    if explained.elements:
        columns = (
            Column("element", shrinks=True, min_width=12),
            Column("value", shrinks=True, min_width=12),
            Column("from", shrinks=True, drop=1),
        )
        print_table(screen, columns, explained.elements)
    for line in explained.cycle_count:
        screen.wrapped(line)
    for event in explained.events:
        screen.line("")
        _render_event(screen, event)
    render_bases(screen, explained.upcoming)
    render_notes(screen, explained.upcoming)
    told = "; ".join(basis.text for basis in explained.upcoming.bases).split("; ")
    for line in explained.notes:
        if line not in told and not any(a.startswith(line) for a in explained.upcoming.assumptions):
            screen.wrapped(line, label="- ", hang=2)


def _render_event(screen: Screen, each: ExplainedEvent) -> None:
    screen.heading(f"{occasion(each.forecast)}: {_date(each)}")
    for line in each.arithmetic.splitlines():
        screen.wrapped(line, label="  ", hang=4)
    if each.terms:
        print_table(screen, _TERM_COLUMNS, _term_rows(each.terms))
    _render_conditioning(screen, each)


def _render_conditioning(screen: Screen, each: ExplainedEvent) -> None:
    """The date before and after the quiet observations, and the nights that moved it most."""
    told = each.forecast.conditioning
    if told is None:
        return
    count = "1 quiet observation" if told.observations == 1 else f"{told.observations} quiet observations"
    until = day(told.last_quiet_utc, told.last_quiet_bmjd_tdb)
    before = _interval(told.before, told.before_utc)
    if not told.moved:
        screen.wrapped(f"{count} until {until} leave nothing of this date.", label="  ", hang=4)
        return
    screen.wrapped(f"before quiet observations: {before}", label="  ", hang=4)
    after = _interval(each.forecast.bmjd_tdb, each.forecast.utc)
    screen.wrapped(f"after {count} until {until}: {after}", label="  ", hang=4)
    if each.forecast.status == "suspected":
        screen.wrapped("What is suspected since then is not counted.", label="  ", hang=4)
    if each.moved_by:
        nights = "; ".join(
            f"{day(night.utc, night.bmjd_tdb)} {', '.join(night.bands)} {_shift(night.shift_d)}"
            for night in each.moved_by
        )
        screen.wrapped(f"moved most by: {nights}", label="  ", hang=4)


def _shift(days: float) -> str:
    return f"{days:+.1f} d".replace("-", "−")


def _date(each: ExplainedEvent) -> str:
    if each.forecast.bmjd_tdb is None:
        return yearly(each.forecast)
    return f"{_interval(each.forecast.bmjd_tdb, each.forecast.utc)}, {each.forecast.status}"


def _interval(dates: Quantiles | None, utc: UtcQuantiles | None) -> str:
    """A date with its 68 % interval."""
    if dates is None:
        return ""
    interval = spread(dates.median, dates.lo68, dates.hi68)
    if dates.lo68 is not None:
        interval += ", 68 %" if interval.endswith("yr") else " d, 68 %"
    return f"{day(utc.median if utc else None, dates.median)} ({interval})"


_TERM_COLUMNS = (
    Column("part of the error", shrinks=True, min_width=18),
    Column("days", align="right"),
    Column("of variance", align="right", drop=2),
    Column("", drop=3, name="bars"),
    Column("note", shrinks=True, drop=1),
)


def _term_rows(terms: Sequence[VarianceTerm]) -> list[tuple[str, str, str, str, str]]:
    if any(math.isnan(term.size_d) for term in terms):
        # Shares of a whole that nobody knows would be false.
        return [(term.cause, _size(term.size_d), "", "", term.note) for term in terms]
    parts = [math.copysign(term.size_d**2, term.size_d) for term in terms]
    whole = sum(parts)
    largest = max(abs(term.size_d) for term in terms)
    rows = [
        (
            term.cause,
            _size(term.size_d),
            _share(part / whole) if whole > 0.0 else "",
            _bar(abs(term.size_d) / largest if largest > 0.0 else 0.0),
            term.note,
        )
        for term, part in zip(terms, parts, strict=True)
    ]
    if len(rows) > 1 and whole > 0.0:
        rows.append(("together", _size(math.sqrt(whole)), "100 %", "", ""))
    return rows


def _share(part: float) -> str:
    places = 0 if abs(part) >= 0.0095 else 1
    return f"{100.0 * part:.{places}f} %".replace("-", "−")


def _size(days: float) -> str:
    if math.isnan(days):
        return "unknown"
    return f"{days:.3g}".replace("-", "−") if abs(days) < 1000.0 else f"{days:.0f}".replace("-", "−")


def _bar(share: float) -> str:
    """A bar in half cells; a part that is not nothing shows at least half a cell."""
    halves = math.ceil(2 * _BAR_CELLS * share)
    return "█" * (halves // 2) + "▌" * (halves % 2)
