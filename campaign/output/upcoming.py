"""The forecast of a campaign on the screen: dated table, timeline, what the dates rest on, notes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

from rich.cells import cell_len

from campaign.model.forecasts import MIXTURE, EventForecast, UpcomingResult, UtcQuantiles
from campaign.output.console import Screen
from campaign.output.suspicion import render_suspicions
from campaign.output.tables import Cell, Column, Row, fits, print_table
from campaign.output.timeline import render_timeline
from campaign.output.wording import (
    ERROR_UNKNOWN,
    STATUS_STYLES,
    UNKNOWN,
    UTC_NOTE,
    between,
    by_date,
    chance,
    day,
    occasion,
    percent,
    signed_days,
    spread,
    yearly,
)

_COMPACT = (
    Column("system", shrinks=True, min_width=9),
    Column("solution", shrinks=True, drop=5),
    Column("event"),
    Column("UTC"),
    Column("68 %, d", shrinks=True, drop=1, min_width=7, name="68 % interval"),
    Column("95 %, d", shrinks=True, drop=4, min_width=7, name="95 % interval"),
    Column("status"),
    Column("days", align="right", drop=2, name="days from now"),
    Column("chance", align="right", drop=3),
)
_SOLUTION, _INTERVAL_68, _INTERVAL_95, _CHANCE = 1, 4, 5, 8
_FULL = (
    Column("system", shrinks=True, min_width=12),
    Column("event"),
    Column("cycle", align="right"),
    Column("median, UTC"),
    Column("68 % interval"),
    Column("95 % interval"),
    Column("status"),
    Column("days", align="right"),
    Column("chance", align="right"),
    Column("in period", align="right"),
    Column("from", shrinks=True, min_width=10),
    Column("rule"),
)
_LABEL_LIMIT = 20


def render_upcoming(screen: Screen, result: UpcomingResult) -> None:
    """Write the whole forecast."""
    if not result.bases:
        screen.wrapped(
            "No system is under watch. Add one with: campaign system add NAME --ra ... --dec ..., "
            "or look at the invented sample: campaign upcoming --sample"
        )
        return
    render_dates(screen, result)
    render_bases(screen, result)
    render_notes(screen, result)


def render_dates(screen: Screen, result: UpcomingResult) -> None:
    """Write the table of events and the timeline under it."""
    period = f"{_day(result.from_utc)} to {_day(result.until_utc)}"
    screen.heading(f"Events from {period}")
    screen.wrapped(f"Days are counted from {_day(result.as_of_utc)}; chance: that the event happens at all.")
    screen.line("")
    if result.events:
        _print_events(screen, result)
    else:
        screen.wrapped("No event falls in this period.")
    if result.suspicions:
        screen.line("")
        render_suspicions(screen, result.suspicions)
    screen.line("")
    render_timeline(screen, result)


def _print_events(screen: Screen, result: UpcomingResult) -> None:
    events = by_date(result.events)
    full = [_full_row(event, result.as_of_bmjd_tdb) for event in events]
    if fits(screen, _FULL, full):
        print_table(screen, _FULL, full)
        return
    compact = [_compact_row(event, result.as_of_bmjd_tdb) for event in events]
    columns = _compact_columns(compact)
    kept = list(range(len(columns)))
    if not _side_by_side(events):
        kept.remove(_SOLUTION)
    if not any(chance(event) for event in events):
        kept.remove(_CHANCE)
    print_table(screen, [columns[i] for i in kept], [[row[i] for i in kept] for row in compact])
    screen.wrapped(
        "A wider window also shows the chance in the period, the solution and the rule.", style="dim"
    )


def _side_by_side(events: Sequence[EventForecast]) -> bool:
    """Whether one occasion has several rows, which only their solution tells apart."""
    occasions = [(event.system, event.event, event.cycle) for event in events]
    return len(set(occasions)) < len(occasions)


def _full_row(event: EventForecast, as_of_bmjd_tdb: float) -> Row:
    dates, utc = event.bmjd_tdb, event.utc or UtcQuantiles()
    return (
        event.system,
        event.event,
        "" if event.cycle is None else str(event.cycle),
        _date(event),
        between(utc.lo68, utc.hi68, dates.lo68, dates.hi68) if dates else "",
        between(utc.lo95, utc.hi95, dates.lo95, dates.hi95) if dates else "",
        Cell(event.status, STATUS_STYLES.get(event.status, "")),
        signed_days(dates.median - as_of_bmjd_tdb) if dates else "",
        "seen" if event.observed else percent(event.probability),
        percent(event.probability_in_window),
        event.solution or event.basis,
        event.rule or "",
    )


def _compact_row(event: EventForecast, as_of_bmjd_tdb: float) -> Row:
    dates = event.bmjd_tdb
    return (
        event.system,
        event.solution or "",
        occasion(event),
        _date(event),
        _short(spread(dates.median, dates.lo68, dates.hi68)) if dates else "",
        _short(spread(dates.median, dates.lo95, dates.hi95)) if dates else "",
        Cell(event.status, STATUS_STYLES.get(event.status, "")),
        signed_days(dates.median - as_of_bmjd_tdb) if dates else "",
        "?" if chance(event) == UNKNOWN else chance(event),
    )


def _short(interval: str) -> str:
    """An interval in the few cells that a small window has for it."""
    return UNKNOWN if interval == ERROR_UNKNOWN else interval


def _date(event: EventForecast) -> str:
    if event.bmjd_tdb is None:
        return yearly(event)
    return day(event.utc.median if event.utc else None, event.bmjd_tdb.median)


def _compact_columns(rows: Sequence[Row]) -> list[Column]:
    """The compact columns, wide enough that no number is ever broken over two lines."""
    columns = list(_COMPACT)
    for i in (_INTERVAL_68, _INTERVAL_95):
        words = [word for row in rows for word in str(row[i]).split(" ")]
        least = max((cell_len(word) for word in words), default=0)
        columns[i] = replace(columns[i], min_width=max(least, columns[i].min_width))
    return columns


def render_bases(screen: Screen, result: UpcomingResult) -> None:
    """Write one entry a system on what its dates rest on."""
    if not result.bases:
        return
    screen.line("")
    screen.heading("What the dates rest on")
    names = [screen.spell(basis.system) for basis in result.bases]
    width = min(max(cell_len(name) for name in names), _LABEL_LIMIT)
    for name, basis in zip(names, result.bases, strict=True):
        label = name + " " * max(0, width - cell_len(name)) + "  "
        text = basis.text if basis.has_forecast else f"no forecast: {basis.text}"
        screen.wrapped(text, label=label, hang=min(width + 2, (screen.width or 80) // 3))


def render_notes(screen: Screen, result: UpcomingResult) -> None:
    """Write warnings, what was noted of single events, and what was assumed throughout."""
    screen.line("")
    screen.heading("Notes")
    for warning in result.warnings:
        screen.wrapped(warning, label="- Warning: ", hang=2, style="bold yellow")
    for line in event_notes(result.events):
        screen.wrapped(line, label="- ", hang=2)
    for line in (*result.assumptions, UTC_NOTE):
        screen.wrapped(line, label="- ", hang=2)
    screen.wrapped(f"Monte Carlo with {result.draws} draws, seed {result.seed}.", label="- ", hang=2)


def event_notes(events: Sequence[EventForecast]) -> list[str]:
    """Each note once a system, with the events that it is about."""
    about: dict[tuple[str, str], list[str]] = {}
    apart: dict[tuple[str, str], list[float]] = {}
    for event in by_date(events):
        notes = list(event.notes)
        mixture = next((note for note in notes if note.startswith(MIXTURE)), None)
        if event.disagreement_sigma is not None and mixture is not None:
            apart.setdefault((event.system, mixture), []).append(abs(event.disagreement_sigma))
        elif event.disagreement_sigma is not None:
            by = f"by {event.solution} it" if event.solution else "it"
            notes.append(f"{by} is {event.disagreement_sigma:+.1f} sigma from the solution listed first")
        for note in notes:
            about.setdefault((event.system, note), []).append(occasion(event))
    return [
        f"{system}, {', '.join(dict.fromkeys(occasions))}: {note}{_disagreement(apart.get((system, note)))}"
        for (system, note), occasions in about.items()
    ]


def _disagreement(sigmas: Sequence[float] | None) -> str:
    """How far the solutions of a mixture are apart, over all the events that it dates."""
    if not sigmas:
        return ""
    least, most = f"{min(sigmas):.1f}", f"{max(sigmas):.1f}"
    return f", which disagree by {least if least == most else f'{least} to {most}'} sigma"


def _day(utc: str) -> str:
    return utc.partition("T")[0]
