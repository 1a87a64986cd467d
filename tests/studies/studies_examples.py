"""Invented systems, light curves and questions that the tests of the studies share; reference rows."""

from __future__ import annotations

import csv
import json
import re
from collections.abc import Mapping, Sequence
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import EventForecast, UpcomingResult
from campaign.model.instants import Moment
from campaign.model.kept import Stamp
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, DustRule, Episode, Solution, System
from campaign.studies.upcoming import Question, forecast_campaign

REFERENCE = Path(__file__).parent.parent / "reference"
YEAR_D = 365.25
NOW = 61_000.0
CLOCK = datetime(2031, 4, 7, 3, 12, 10, tzinfo=UTC)


def stamp(command: str = "campaign test") -> Stamp:
    return Stamp(CLOCK, "Ida Vik", command)


def check_rows(topic: str) -> list[tuple[dict[str, Any], dict[str, Any]]]:
    """Inputs and expected values of the rows of checks_forecast.csv with this topic."""
    with (REFERENCE / "checks_forecast.csv").open(newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert rows, topic
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in rows]


def published(identifier: str) -> dict[str, str]:
    """One row of published_events.csv or published_orbits.csv."""
    for name in ("published_events.csv", "published_orbits.csv"):
        with (REFERENCE / name).open(newline="") as file:
            for row in csv.DictReader(file):
                if row["id"] == identifier:
                    return row
    raise KeyError(identifier)


def numbers_in(text: str) -> list[float]:
    return [float(found) for found in re.findall(r"\d+(?:\.\d+)?", text)]


def moment(bmjd_tdb: float, error_d: float | None = 0.0) -> Moment:
    return Moment(bmjd_tdb, error_d, error_d)


def exact(value: float) -> Measured:
    return Measured(value, 0.0, 0.0)


def system(number: int = 1, name: str = "Lantern 3", **fields: Any) -> System:
    return System(number, name, 270.6, -45.2, **fields)


def solution(
    period_d: Any = 3000.0,
    epoch: float | None = 58_000.0,
    *,
    period_error: float | None = 3.0,
    epoch_error: float | None = 5.0,
    **fields: Any,
) -> Solution:
    """An adopted solution; a bare period gets the error given."""
    if isinstance(period_d, float):
        period_d = Measured(period_d, period_error, period_error)
    return Solution(
        **{
            "id": 1,
            "system_id": 1,
            "label": "orbit",
            "period_d": period_d,
            "epoch": None if epoch is None else moment(epoch, epoch_error),
            "adopted": True,
            "epoch_cycle": 0,
            **fields,
        }
    )


def lag_rule(
    onset: float | Measured = -40.0, maximum: float | None = 60.0, end: float | None = 200.0, **fields: Any
) -> DustRule:
    def offset(value: float | Measured | None) -> Measured | None:
        return exact(value) if isinstance(value, float) else value

    return DustRule(1, 1, "lag", onset=offset(onset), maximum=offset(maximum), end=offset(end), **fields)


def separation_rule(critical: Measured | float = 6.4, **fields: Any) -> DustRule:
    size = exact(critical) if isinstance(critical, float) else critical
    return DustRule(1, 1, "separation", critical_separation_au=size, **fields)


def episode(cycle: int | None, onset: float | None, **fields: Any) -> Episode:
    """A confirmed episode; onset, maximum and end as bmjd_tdb with an error of ``error_d`` (default 5 d)."""
    error_d = fields.pop("error_d", 5.0)
    dated = {
        name: None if when is None else DatedEvent(moment(when, error_d), "K")
        for name, when in (("onset", onset), ("maximum", fields.pop("maximum", None)),
                           ("end", fields.pop("end", None)))
    }  # fmt: skip
    number = fields.pop("number", 0 if cycle is None else cycle)
    return Episode(number, 1, cycle, **dated, **fields)


def record(
    *solutions: Solution, rule: DustRule | None = None, episodes: Sequence[Episode] = (), **fields: Any
) -> SystemRecord:
    one = system(**fields)
    return SystemRecord(
        one,
        tuple(replace(s, system_id=one.id) for s in solutions),
        None if rule is None else replace(rule, system_id=one.id),
        tuple(replace(e, system_id=one.id) for e in episodes),
    )


def light_curve(
    times: Sequence[float],
    mags: Sequence[float],
    *,
    error: float = 0.02,
    band: str | Sequence[str] = "K",
    source: str | Sequence[str] = "Cold Mesa",
    limit_side: Sequence[int] | int = 0,
    quality: str | Sequence[str] = "good",
    photometric_system: str | Sequence[str] = "",
) -> PhotometryArrays:
    n = len(times)

    def column(value: Any, kind: Any) -> Any:
        given = [value] * n if isinstance(value, str | int | float) else list(value)
        return np.array(given, dtype=kind)

    return PhotometryArrays(
        id=np.arange(n),
        bmjd_tdb=np.asarray(times, dtype=float),
        minus_d=np.zeros(n),
        plus_d=np.zeros(n),
        mag=np.asarray(mags, dtype=float),
        mag_minus=column(error, float),
        mag_plus=column(error, float),
        limit_side=column(limit_side, np.int8),
        limit_sigma=np.full(n, np.nan),
        band=column(band, np.str_),
        source=column(source, np.str_),
        site_id=np.full(n, -1),
        quality=column(quality, np.str_),
        photometric_system=column(photometric_system, np.str_),
    )


def quiet_curve(start: float, stop: float, step: float = 15.0, level: float = 7.5) -> PhotometryArrays:
    """Photometry that never leaves its level by more than it scatters."""
    times = np.arange(start, stop, step)
    wobble = 0.01 * np.sin(np.arange(times.size))
    return light_curve(times.tolist(), (level + wobble).tolist())


def upcoming(
    *records: SystemRecord,
    photometry: Mapping[int, PhotometryArrays] | None = None,
    now: float = NOW,
    years: float = 20.0,
    **question: Any,
) -> UpcomingResult:
    asked = Question(**{"as_of": now, "start": now, "end": now + years * YEAR_D, **question})
    return forecast_campaign(records, photometry or {}, asked)


def find(result: UpcomingResult, event: str, cycle: int | None = None, **fields: Any) -> EventForecast:
    """The one forecast of this event, of this cycle when given."""
    found = [
        e
        for e in result.events
        if e.event == event
        and (cycle is None or e.cycle == cycle)
        and all(getattr(e, name) == value for name, value in fields.items())
    ]
    assert found, f"no {event} of cycle {cycle} among {[(e.event, e.cycle) for e in result.events]}"
    return found[0]


def dates(event: EventForecast) -> tuple[float, ...]:
    """Median, sigma, and the bounds of 68 and 95 %."""
    q = event.bmjd_tdb
    assert q is not None
    return tuple(
        float("nan") if x is None else x for x in (q.median, q.sigma_d, q.lo68, q.hi68, q.lo95, q.hi95)
    )
