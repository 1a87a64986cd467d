"""Episodes found in a light curve, on the screen and as JSON."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import fields, replace

from campaign.model.curves import Curve, CurveMark
from campaign.model.forecasts import Quantiles
from campaign.model.found import EpisodesFound, FoundDate, FoundEpisode, FoundLevel, FoundMaximum
from campaign.model.measured import Measured
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.lightcurve import render_marked_curves
from campaign.output.tables import Column, print_table
from campaign.output.values import calendar_day, number
from campaign.output.wording import UTC_NOTE, day, spread

_COLUMNS = (
    Column("", align="right", name="number"),
    Column("onset"),
    Column("maximum"),
    Column("brighter by", align="right", drop=3),
    Column("end of production", drop=4),
    Column("half-decay", drop=6),
    Column("rise d", align="right", drop=7, name="length of the rise"),
    Column("decay d", align="right", drop=5, name="e-folding time of the decay"),
    Column("known as", drop=1),
)
_LEVELS = (
    Column("band"),
    Column("level mag", align="right"),
    Column("scatter", align="right", drop=2),
    Column("points", align="right", drop=1),
    Column("photometric system", shrinks=True, drop=3),
    Column("source", shrinks=True),
    Column("site", shrinks=True, drop=4),
)
_FORESIGHT = 0.35


def render_found(
    screen: Screen, found: EpisodesFound, *, drawn: int | None = None, levels: bool = False
) -> None:
    """What was found: a table, what cannot be told, the light curve; ``drawn`` is the episode to draw."""
    counts = f"{_count(found.measured, 'magnitude')} in {', '.join(found.bands)}"
    limits = f" and {_count(found.limits, 'limit')}" if found.limits else ""
    dates = f"{calendar_day(found.first_bmjd_tdb)} to {calendar_day(found.last_bmjd_tdb)}"
    screen.heading(f"{found.system}: {_count(len(found.episodes), 'episode')} in the light curve")
    screen.wrapped(f"{counts}{limits}, {dates}", style="dim")
    if found.episodes:
        screen.line("")
        print_table(screen, _COLUMNS, [_row(episode) for episode in found.episodes])
        _render_notes(screen, found.episodes)
    if found.quiet_note:
        screen.wrapped(found.quiet_note)
    if levels:
        screen.line("")
        print_table(screen, _LEVELS, [_level_row(level) for level in found.levels])
    screen.line("")
    _render_drawing(screen, found, drawn)
    if found.episodes:
        screen.line("")
        for assumption in found.assumptions:
            screen.wrapped(assumption, hang=2, style="dim")
        screen.wrapped(UTC_NOTE, hang=2, style="dim")


def found_json(found: EpisodesFound, now: str, proposed: Sequence[int] | None = None) -> str:
    """Document ``episodes-find``: everything but the points themselves."""
    data = {
        field.name: plain(getattr(found, field.name))
        for field in fields(found)
        if field.name not in {"curves", "warnings", "as_of_utc"}
    }
    if proposed is not None:
        data["proposed_ids"] = list(proposed)
    return document("episodes-find", data, as_of=found.as_of_utc or now, warnings=found.warnings)


def _count(count: int, what: str) -> str:
    return f"{count} {what}{'' if count == 1 else 's'}"


def _row(episode: FoundEpisode) -> tuple[str, ...]:
    best = episode.maxima[0] if episode.maxima else None
    return (
        str(episode.number),
        _onset(episode),
        "" if best is None else _date(best.date) + ("" if best.reached else ", so far"),
        "" if best is None else _brightening(best),
        _date(episode.end, with_band=False),
        _date(episode.half, with_band=False),
        _days(episode.rise_d),
        _days(episode.decay_d),
        _known(episode),
    )


def _onset(episode: FoundEpisode) -> str:
    if episode.onset is None:
        return f"before {calendar_day(episode.first_bright_bmjd_tdb)}"
    return _date(episode.onset)


def _date(date: FoundDate | None, *, with_band: bool = True) -> str:
    """Day and 68 % interval, with the band; ``?`` where the points do not bound it."""
    if date is None:
        return ""
    dates = date.bmjd_tdb
    band = f" in {date.band}" if date.band and with_band else ""
    doubt = "" if date.told else " ?"
    return (
        f"{day(date.utc.median, dates.median)} {spread(dates.median, dates.lo68, dates.hi68)} d{band}{doubt}"
    )


def _days(length: Quantiles | None) -> str:
    return "" if length is None else f"{length.median:.0f} {spread(length.median, length.lo68, length.hi68)}"


def _known(episode: FoundEpisode) -> str:
    if episode.known is None:
        return "brief" if episode.kind == "brief" else "new"
    return f"{episode.known.id}, {episode.known.state}"


def _render_notes(screen: Screen, episodes: Sequence[FoundEpisode]) -> None:
    for episode in episodes:
        for note in episode.notes:
            screen.wrapped(f"{episode.number}: {note}", hang=3)
        for later in episode.maxima[1:]:
            screen.wrapped(f"{episode.number}: {_other_band(later)}", hang=3, style="dim")
        for one in episode.brightenings:
            screen.wrapped(
                f"{episode.number}: secondary brightening about {day(one.utc, one.bmjd_tdb)}, "
                f"{one.lasts_d:.0f} d, by {one.excess:.2f} times the stars' flux, "
                f"{_count(one.points, 'point')}: no episode of its own",
                hang=3,
            )


def _other_band(maximum: FoundMaximum) -> str:
    return f"maximum {_date(maximum.date)}, brighter by {_brightening(maximum)}"


def _brightening(maximum: FoundMaximum) -> str:
    """By how much the whole became brighter, with the errors that those of the dust's flux make."""
    excess = maximum.excess
    if excess.minus is None or excess.plus is None:
        return f"{maximum.excess_mag:.2f} mag"
    ends = [
        2.5 * math.log10(1.0 + max(value, 0.0))
        for value in (excess.value - excess.minus, excess.value + excess.plus)
    ]
    return number(
        Measured(maximum.excess_mag, maximum.excess_mag - ends[0], ends[1] - maximum.excess_mag), "mag"
    )


def _level_row(level: FoundLevel) -> tuple[str, ...]:
    return (
        level.band,
        "not known" if level.level_mag is None else number(level.level_mag),
        f"{level.scatter_mag:.3f}",
        str(level.points) if level.points else "borrowed",
        level.photometric_system,
        level.source,
        level.site,
    )


def _render_drawing(screen: Screen, found: EpisodesFound, drawn: int | None) -> None:
    chosen = [episode for episode in found.episodes if drawn is None or episode.number == drawn]
    band = _drawn_band(found, chosen)
    curves = [_with_level(curve, found.levels) for curve in found.curves if curve.of == band]
    span = _span(found, chosen) if drawn is not None else _margin(found.first_bmjd_tdb, found.last_bmjd_tdb)
    marks = [mark for episode in chosen for mark in _marks(episode, band)]
    render_marked_curves(screen, curves, marks, span)


def _drawn_band(found: EpisodesFound, episodes: Sequence[FoundEpisode]) -> str:
    """The band that shows the episodes best; without any, the one with most points."""
    bands = [episode.maxima[0].date.band or "" for episode in episodes if episode.maxima]
    if bands:
        return max(bands, key=bands.count)
    return max(found.curves, key=lambda curve: len(curve.points)).of


def _with_level(curve: Curve, levels: Sequence[FoundLevel]) -> Curve:
    """The curve with the level that most of its quiet points rest on."""
    own = [level for level in levels if level.band == curve.of and level.level_mag is not None]
    if not own:
        return curve
    best = max(own, key=lambda level: level.points)
    assert best.level_mag is not None
    return replace(curve, levels=(best.level_mag.value,))


def _marks(episode: FoundEpisode, band: str) -> list[CurveMark]:
    maximum = next((one.date for one in episode.maxima if one.date.band == band), None)
    dated = (("onset", episode.onset), ("maximum", maximum), ("end", episode.end))
    found = []
    for name, date in dated:
        if date is None:
            continue
        q = date.bmjd_tdb
        low68, high68 = q.median if q.lo68 is None else q.lo68, q.median if q.hi68 is None else q.hi68
        low95, high95 = low68 if q.lo95 is None else q.lo95, high68 if q.hi95 is None else q.hi95
        found.append(CurveMark(name, low95, low68, q.median, high68, high95))
    return found


def _span(found: EpisodesFound, episodes: Sequence[FoundEpisode]) -> tuple[float, float]:
    """Around the chosen episode, with some quiet on both sides."""
    if not episodes:
        return _margin(found.first_bmjd_tdb, found.last_bmjd_tdb)
    episode = episodes[0]
    first = episode.first_bright_bmjd_tdb
    if episode.onset is not None:
        first = episode.onset.bmjd_tdb.lo95 or episode.onset.bmjd_tdb.median
    room = max(_FORESIGHT * (episode.last_bright_bmjd_tdb - first), 60.0)
    return max(found.first_bmjd_tdb, first - room) - 1.0, min(
        found.last_bmjd_tdb, episode.last_bright_bmjd_tdb + room
    ) + 1.0


def _margin(first: float, last: float) -> tuple[float, float]:
    margin = max(0.01 * (last - first), 0.02)
    return first - margin, last + margin
