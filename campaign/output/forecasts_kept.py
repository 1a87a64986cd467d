"""Kept forecasts and how well they did: tables, words and documents."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Any

from campaign.model.forecasts import Quantiles
from campaign.model.verification import (
    ForecastScores,
    KeepingList,
    KeptForecast,
    ListedKeeping,
    Outcome,
    ScoredForecast,
    ScoreGroup,
    Unscored,
)
from campaign.output.console import Screen
from campaign.output.documents import document, plain
from campaign.output.tables import Cell, Column, print_table
from campaign.output.values import calendar_day
from campaign.output.wording import STATUS_STYLES, percent, signed_days, spread

_KEEPINGS = (
    Column("no.", "right"),
    Column("label", shrinks=True),
    Column("kept (UTC)", drop=2),
    Column("as of"),
    Column("until", drop=3),
    Column("systems", "right"),
    Column("forecasts", "right"),
    Column("to be scored", "right"),
    Column("version", drop=4),
)
_FORECASTS = (
    Column("date"),
    Column("±68 % (d)", "right"),
    Column("95 % (d)", "right", drop=1),
    Column("system", shrinks=True),
    Column("event"),
    Column("status"),
    Column("chance", "right", drop=2),
    Column("from", shrinks=True, drop=4, name="what it was forecast from"),
    Column("last date + period", drop=3),
)
_GROUPS = (
    Column("event"),
    Column("lead"),
    Column("forecasts", "right", drop=3),
    Column("outcomes", "right"),
    Column("CRPS (d)", "right"),
    Column("miss (d)", "right", drop=4, name="mean miss"),
    Column("skill", "right"),
    Column("in 68 %", "right"),
    Column("in 95 %", "right"),
    Column("log", "right", drop=5, name="mean log score"),
    Column("verdict", shrinks=True, min_width=10),
)
_SCORED = (
    Column("system", shrinks=True, min_width=10),
    Column("event"),
    Column("lead", "right"),
    Column("forecast"),
    Column("±68 % (d)", "right", drop=3),
    Column("came", shrinks=True, min_width=16),
    Column("miss (d)", "right"),
    Column("CRPS (d)", "right"),
    Column("PIT", "right", drop=1, name="PIT (share of the forecast before the outcome)"),
    Column("last + P", "right", drop=2, name="CRPS of last date plus period"),
    Column("log", "right", drop=5, name="log score"),
    Column("keeping", shrinks=True, drop=4),
)
_VERDICTS = {
    "nothing against": "nothing speaks against it",
    "too narrow": "intervals too narrow",
    "too wide": "intervals too wide",
    "too early": "forecasts too early",
    "too late": "forecasts too late",
}
_STYLES = {"too narrow": "bold yellow", "too early": "bold yellow", "too late": "bold yellow"}
_UNSCORED_SHOWN = 8


# ----------------------------------------------------------------------------------- what is kept


def render_kept(screen: Screen, found: KeepingList) -> None:
    """The keepings, or one of them with its forecasts."""
    if not found.keepings:
        screen.wrapped("No forecast is kept yet. Keep today's with: campaign forecast keep")
        return
    print_table(screen, _KEEPINGS, [_keeping_row(one) for one in found.keepings])
    if found.chosen is not None:
        screen.line("")
        print_table(screen, _FORECASTS, [_forecast_row(one) for one in _by_date(found.forecasts)])
        return
    last = found.keepings[-1].keeping
    screen.wrapped(f"Its forecasts: campaign forecast list {last.id}", style="dim")


def _by_date(forecasts: Sequence[KeptForecast]) -> list[KeptForecast]:
    """In order of their median, those without a date last."""
    return sorted(
        forecasts,
        key=lambda one: one.event.bmjd_tdb.median if one.event.bmjd_tdb is not None else float("inf"),
    )


def _keeping_row(one: ListedKeeping) -> tuple[str, ...]:
    keeping = one.keeping
    return (
        str(keeping.id),
        keeping.label or "",
        keeping.kept_at.strftime("%Y-%m-%d %H:%M"),
        (one.as_of_utc or "")[:10] or calendar_day(keeping.as_of_bmjd_tdb),
        calendar_day(keeping.until_bmjd_tdb),
        str(one.systems),
        str(one.forecasts),
        str(one.dated),
        keeping.program_version,
    )


def _forecast_row(one: KeptForecast) -> tuple[str | Cell, ...]:
    event, dates = one.event, one.event.bmjd_tdb
    calendar = "" if one.reference_bmjd_tdb is None else calendar_day(one.reference_bmjd_tdb)
    return (
        "no date" if dates is None else calendar_day(dates.median),
        "" if dates is None else spread(dates.median, dates.lo68, dates.hi68),
        "" if dates is None else spread(dates.median, dates.lo95, dates.hi95),
        event.system,
        event.event if event.cycle is None else f"{event.event} {event.cycle}",
        Cell(event.status, STATUS_STYLES.get(event.status, "")),
        "" if event.probability == 1.0 else percent(event.probability),
        _made_from(one),
        calendar,
    )


def _made_from(one: KeptForecast) -> str:
    inputs = one.inputs
    parts = [one.event.solution] if one.event.solution else []
    if inputs.rule is not None and one.event.rule is not None:
        parts.append(f"rule {inputs.rule.kind}")
    if inputs.episodes:
        parts.append(f"{len(inputs.episodes)} episode{'s' if len(inputs.episodes) > 1 else ''}")
    if inputs.photometry.points:
        parts.append(f"{inputs.photometry.points} magnitudes")
    return ", ".join(parts)


def kept_json(found: KeepingList, as_of: str) -> str:
    """Document ``forecast-list``; ``forecasts`` are those of one keeping, when it was asked for."""
    data: dict[str, Any] = {
        "keepings": [
            plain(one.keeping)
            | {
                "as_of_utc": one.as_of_utc,
                "systems": one.systems,
                "forecasts": one.forecasts,
                "scorable": one.dated,
            }
            for one in found.keepings
        ],
        "forecasts": None
        if found.chosen is None
        else [_forecast_data(one) for one in _by_date(found.forecasts)],
    }
    return document("forecast-list", _with_clocks(data), as_of=as_of)


_CLOCKS = frozenset({"kept_at", "known_at", "entered_at", "set_at", "decided_at", "newest_entered_at"})


def _with_clocks(data: Any) -> Any:
    """Times of entry as ISO texts that end in Z."""
    if isinstance(data, list):
        return [_with_clocks(each) for each in data]
    if isinstance(data, dict):
        return {
            key: value.replace(" ", "T").replace("+00:00", "Z")
            if key in _CLOCKS and isinstance(value, str)
            else _with_clocks(value)
            for key, value in data.items()
        }
    return data


def _forecast_data(one: KeptForecast) -> dict[str, Any]:
    data: dict[str, Any] = plain(one.event)
    data.pop("utc")
    count = len(one.quantiles_bmjd_tdb)
    return data | {
        "id": one.id,
        "keeping": one.keeping_id,
        "quantile_shares": [(place + 0.5) / count for place in range(count)],
        "quantiles_bmjd_tdb": list(one.quantiles_bmjd_tdb),
        "reference_bmjd_tdb": one.reference_bmjd_tdb,
        "reference_sigma_d": one.reference_sigma_d,
        "inputs": plain(one.inputs),
    }


# ----------------------------------------------------------------------------------- how they did


def render_scores(screen: Screen, scores: ForecastScores) -> None:
    """Scores together and one by one, and what was left out and why."""
    if not scores.scored:
        screen.wrapped(_nothing_scored(scores))
        _render_unscored(screen, scores)
        for text in scores.hidden:
            screen.wrapped(text + ".", label="· ", hang=2, style="dim")
        return
    print_table(screen, _GROUPS, [_group_row(one) for one in scores.groups])
    few = [one for one in scores.groups if one.verdict == "too few"]
    if few:
        screen.wrapped(
            "Too few outcomes to judge calibration where fewer than "
            f"{scores.least_outcomes} independent ones are confirmed: shares inside the intervals then say "
            "next to nothing.",
            hang=2,
        )
    screen.line("")
    kept = scores.system is None
    columns = _SCORED if kept else _SCORED[:-1]
    print_table(screen, columns, [_scored_row(one)[: len(columns)] for one in scores.scored])
    _render_unscored(screen, scores)
    for text in (*scores.hidden, *scores.assumptions):
        screen.wrapped(text + ".", label="· ", hang=2, style="dim")


def _nothing_scored(scores: ForecastScores) -> str:
    if scores.system is not None:
        return f"No past episode of {scores.system} could be forecast from what was known before it."
    if not scores.kept:
        return (
            "No forecast is kept yet, so there is nothing to score. Keep today's with: campaign forecast "
            "keep; or hold the method against past episodes: campaign forecast rehearse SYSTEM"
        )
    if scores.waiting:
        return (
            f"No outcome of the {scores.kept} kept forecasts is confirmed yet. Once one is, confirm it: "
            "campaign episodes confirm N, or campaign episodes add SYSTEM --onset ..."
        )
    return f"None of the {scores.kept} kept forecasts can be scored."


def _render_unscored(screen: Screen, scores: ForecastScores) -> None:
    if scores.unscored:
        screen.line("")
        screen.wrapped(f"Not scored: {len(scores.unscored)}", style="bold")
        told = _told_unscored(scores.unscored)
        for text in told[:_UNSCORED_SHOWN]:
            screen.wrapped(text, label="  ", hang=4)
        left = len(told) - _UNSCORED_SHOWN
        if left > 0:
            screen.wrapped(f"and {left} more; all of them with --json", label="  ", style="dim")
        if scores.system is not None and not scores.scored and not scores.entered_any_time:
            screen.wrapped(
                "A catalogue that was filled after the fact knew nothing before. To rehearse on entries of "
                f'any date: campaign forecast rehearse "{scores.system}" --entered-any-time',
            )
        if any(one.code == "contains-outcome" and one.keeping_id for one in scores.unscored):
            screen.wrapped(
                "A forecast that may contain its outcome proves nothing. Say until when the data of a "
                "solution reach (campaign solution add ... --data-until), and keep forecasts before the "
                "event."
            )
    others = []
    if scores.waiting:
        others.append(f"{scores.waiting} wait for a confirmed outcome")
    if scores.undatable:
        others.append(f"{scores.undatable} are of events that no episode dates, such as periastron")
    if others and (scores.scored or scores.unscored):
        screen.wrapped("Of the other kept forecasts, " + " and ".join(others) + ".")


def _told_unscored(unscored: Sequence[Unscored]) -> list[str]:
    """One line an event and reason, its lead times together."""
    leads: dict[tuple[str, str], list[str]] = {}
    for one in unscored:
        what = one.event if one.cycle is None else f"{one.event} {one.cycle}"
        of = f"keeping {one.keeping_id}, " if one.keeping_id else ""
        known = leads.setdefault((f"{of}{one.system}, {what}", one.why), [])
        if one.lead_asked_d is not None:
            known.append(_days(one.lead_asked_d))
    return [
        what + (f", {' and '.join(when)} before" if when else "") + f": {why}"
        for (what, why), when in leads.items()
    ]


def _group_row(one: ScoreGroup) -> tuple[str | Cell, ...]:
    verdict = one.verdict
    told = _VERDICTS.get(verdict) or f"too few to judge ({one.outcomes})"
    return (
        one.event,
        _lead_range(one),
        str(one.forecasts),
        str(one.outcomes),
        _short(one.mean_crps_d),
        signed_days(one.mean_miss_d),
        "" if one.skill is None else f"{one.skill:+.2f}".replace("-", "−"),
        percent(one.coverage68),
        percent(one.coverage95),
        "" if one.mean_log_score is None else _short(one.mean_log_score),
        Cell(told, _STYLES.get(verdict, "dim" if verdict == "too few" else "")),
    )


def _lead_range(one: ScoreGroup) -> str:
    low, high = one.lead_low_d, one.lead_high_d
    if high is None:
        return f"over {_days(low)}"
    if not math.isfinite(low) or high <= 0.0:
        return "after it began"
    if high - low <= 2.0:
        return _days(0.5 * (low + high))
    return f"to {_days(high)}" if low <= 0.0 else f"{_days(low)} to {_days(high)}"


def _days(days: float) -> str:
    """A span in days, or in years from one on."""
    return f"{days:.0f} d" if days < 365.0 else f"{days / 365.25:.3g} yr"


def _short(value: float) -> str:
    if not math.isfinite(value):
        return "excluded"
    return f"{value:.0f}" if abs(value) >= 99.5 else f"{value:.2g}"


def _scored_row(one: ScoredForecast) -> tuple[str | Cell, ...]:
    inside = one.lo95_bmjd_tdb <= one.outcome.bmjd_tdb <= one.hi95_bmjd_tdb
    keeping = one.keeping_label or (str(one.keeping_id) if one.keeping_id else "")
    calendar = "" if one.reference_crps_d is None else _short(one.reference_crps_d)
    return (
        one.system,
        one.event if one.outcome.cycle is None else f"{one.event} {one.outcome.cycle}",
        _days(one.lead_d),
        calendar_day(one.median_bmjd_tdb),
        spread(one.median_bmjd_tdb, one.lo68_bmjd_tdb, one.hi68_bmjd_tdb),
        _came(one.outcome),
        Cell(signed_days(one.miss_d), "" if inside else "bold yellow"),
        _short(one.crps_d),
        f"{one.pit:.2f}",
        calendar,
        "" if one.log_score is None else _short(one.log_score),
        keeping,
    )


def _came(outcome: Outcome) -> str:
    if outcome.first_bmjd_tdb is not None and outcome.last_bmjd_tdb is not None:
        # A day, month or year ends where the next one begins.
        first = calendar_day(outcome.first_bmjd_tdb + 0.01)
        last = calendar_day(outcome.last_bmjd_tdb - 0.01)
        return first if first == last else f"{first} … {last}"
    dates = Quantiles(outcome.bmjd_tdb)
    if outcome.minus_d is None or outcome.plus_d is None:
        return f"{calendar_day(dates.median)} (error unknown)"
    around = spread(dates.median, dates.median - outcome.minus_d, dates.median + outcome.plus_d)
    return f"{calendar_day(dates.median)} {around} d"


def scores_json(scores: ForecastScores) -> str:
    """Document ``forecast-score``, or ``forecast-rehearse`` of a rehearsal."""
    data: dict[str, Any] = plain(scores)
    name = "forecast-score" if scores.system is None else "forecast-rehearse"
    data.pop("as_of_utc")
    warnings: Sequence[str] = data.pop("warnings")
    for group in data["groups"]:
        group["calibration"] = group.pop("verdict").replace(" ", "-")
    if scores.system is None:
        data.pop("system")
        data.pop("leads_d")
        data.pop("entered_any_time")
        data.pop("hidden")
    return document(name, _with_clocks(data), as_of=scores.as_of_utc, warnings=warnings)
