"""The forecast of a campaign as a JSON document for programs."""

from __future__ import annotations

from typing import Any

from campaign.model.forecasts import EventForecast, ExplainedEvent, ExplainedSystem, UpcomingResult
from campaign.output.documents import document, plain
from campaign.output.wording import UTC_NOTE, by_date


def upcoming_json(result: UpcomingResult, explained: ExplainedSystem | None = None) -> str:
    """The whole document ``campaign/upcoming/1``."""
    return document(
        "upcoming", upcoming_data(result, explained), as_of=result.as_of_utc, warnings=result.warnings
    )


def upcoming_data(result: UpcomingResult, explained: ExplainedSystem | None = None) -> dict[str, Any]:
    """What stands under ``data``; ``explanation`` is there only when one was asked for."""
    data = {
        "from_utc": result.from_utc,
        "until_utc": result.until_utc,
        "from_bmjd_tdb": result.from_bmjd_tdb,
        "until_bmjd_tdb": result.until_bmjd_tdb,
        "as_of_bmjd_tdb": result.as_of_bmjd_tdb,
        "events": [_event(event) for event in by_date(result.events)],
        "suspected": plain(result.suspicions),
        "dust_windows": plain(result.dust_windows),
        "bases": plain(result.bases),
        "draws": result.draws,
        "seed": result.seed,
        "assumptions": [*result.assumptions, UTC_NOTE],
    }
    if explained is not None:
        data["explanation"] = _explanation(explained)
    return data


def _event(event: EventForecast) -> dict[str, Any]:
    found = plain(event)
    assert isinstance(found, dict)
    return found


def _explanation(explained: ExplainedSystem) -> dict[str, Any]:
    return {
        "system": explained.system,
        "elements": [
            {"element": name, "value": value, "origin": origin} for name, value, origin in explained.elements
        ],
        "cycle_count": list(explained.cycle_count),
        "events": [_explained_event(each) for each in explained.events],
        "notes": list(explained.notes),
    }


def _explained_event(each: ExplainedEvent) -> dict[str, Any]:
    return {
        "event": each.forecast.event,
        "cycle": each.forecast.cycle,
        "solution": each.forecast.solution,
        "arithmetic": each.arithmetic,
        "terms": plain(each.terms),
        "moved_by": plain(each.moved_by),
    }
