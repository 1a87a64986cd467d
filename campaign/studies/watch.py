"""Load a campaign, from the database or the invented sample, and answer questions about what comes."""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime, timedelta
from difflib import get_close_matches
from functools import lru_cache

import numpy as np

from campaign.errors import InputRefused, NotFound
from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import (
    EVENT_NAMES,
    EphemerisResult,
    EventName,
    ExplainedSystem,
    UpcomingResult,
)
from campaign.model.instants import TypedInstant
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.reading.numbers import name_key
from campaign.studies.collecting import collector_at_rest
from campaign.studies.cycles import nominal_period_d
from campaign.studies.instants import axis_instant
from campaign.studies.lightcurves import CataloguedCurves
from campaign.studies.sampling import DEFAULT_DRAWS, DEFAULT_SEED
from campaign.studies.upcoming import Question, forecast_campaign

MJD_ZERO = datetime(1858, 11, 17, tzinfo=UTC)
DEFAULT_WITHIN_D = 5.0 * 365.25
DEFAULT_ROWS = 40
# How far ahead to look for the first event when the period asked for holds none.
NEXT_SEARCH_D = 60.0 * 365.25
# 0001-01-01 and 10000-01-01, proleptic Gregorian: the years that a date can be written in.
FIRST_DAY, LAST_DAY = -678_575.0, 2_973_484.0


@dataclass(frozen=True, slots=True)
class Campaign:
    """What a forecast works on: systems and light curves, and the date that stands in for today, if any."""

    records: tuple[SystemRecord, ...]
    photometry: Mapping[int, PhotometryArrays]
    own_as_of: float | None = None
    is_sample: bool = False
    shells: Mapping[int, tuple[Observation, ...]] = field(default_factory=dict)


def load_campaign(
    db: str,
    names: Sequence[str] | None,
    known_at: TypedInstant | None,
    as_of: TypedInstant | None,
    *,
    with_shells: bool = False,
) -> Campaign:
    """Load active systems, or the named ones, with their light curves.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    names : sequence of str or None
        Names or aliases; None for every system that is not retired.
    known_at, as_of : TypedInstant or None
        Hide entries, or observations, made after it.
    with_shells : bool
        Whether logged shells are needed too.

    Returns
    -------
    Campaign
        Ready to be forecast.

    Raises
    ------
    NotFound
        Unknown system; the nearest names are in the details.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    from campaign.catalogue import info, observations, records, store, systems

    entered = None if known_at is None else MJD_ZERO + timedelta(days=known_at.mjd)
    observed = None if as_of is None else axis_instant(as_of)
    with collector_at_rest(), store.reading(db) as connection:
        ids = None if names is None else [systems.find_system(connection, name).id for name in names]
        found = records.load_records(connection, ids, known_at=entered, include_retired=ids is not None)
        counts = observations.count_observations(connection, ids)
        seen = (
            observations.observations_of(
                connection, ids, ["shell"], as_of_bmjd_tdb=observed, known_at=entered
            )
            if with_shells
            else ()
        )
        own = info.read_info(connection).get("sample_as_of")
    own_as_of = None if own is None else mjd_of(datetime.fromisoformat(own.replace("Z", "+00:00")))
    watched = [number for number, kinds in counts.items() if kinds.get("photometry")]
    curves = CataloguedCurves(db, watched, observed, entered)
    return Campaign(tuple(found), curves, own_as_of, own is not None, _by_system(seen))


def load_sample_campaign(names: Sequence[str] | None, *, with_shells: bool = False) -> Campaign:
    """The invented sample campaign, without any database.

    Parameters
    ----------
    names : sequence of str or None
        Names or aliases; None for every system that is not retired.
    with_shells : bool
        Whether logged shells are needed too.

    Returns
    -------
    Campaign
        With its own date.

    Raises
    ------
    NotFound
        Unknown system.

    Notes
    -----
    Accuracy: not applicable. Source: the project's own invented data.
    """
    from campaign.studies.sample import load_sample

    sample = load_sample()
    records = tuple(sample.records)
    if names is None:
        chosen = tuple(r for r in records if r.system.state != "retired")
    else:
        chosen = tuple(_named(records, name) for name in names)
    seen = _sample_shells() if with_shells else {}
    return Campaign(chosen, dict(sample.photometry), sample.as_of_bmjd_tdb, True, seen)


@lru_cache(maxsize=1)
def _sample_shells() -> dict[int, tuple[Observation, ...]]:
    """The shells of the sample; all its observations are made to get at them."""
    from campaign.studies.sample import load_sample

    return _by_system(each for each in load_sample().observations() if each.kind == "shell")


def _by_system(observations: Iterable[Observation]) -> dict[int, tuple[Observation, ...]]:
    found: dict[int, list[Observation]] = {}
    for each in observations:
        found.setdefault(each.system_id, []).append(each)
    return {number: tuple(several) for number, several in found.items()}


def _named(records: Sequence[SystemRecord], name: str) -> SystemRecord:
    key = name_key(name)
    for record in records:
        if key in (name_key(record.system.name), *(name_key(alias) for alias in record.system.aliases)):
            return record
    names = [r.system.name for r in records]
    near = get_close_matches(name, names, n=3, cutoff=0.4)
    raise NotFound(
        f"The sample campaign has no system '{name}'.",
        why="Names match whatever their case and spaces.",
        hint=f"Nearest: {', '.join(near or names[:3])}.",
        code="system-not-found",
        details={"nearest": near},
    )


def mjd_of(at: datetime) -> float:
    """The TDB axis value of a clock reading.

    Parameters
    ----------
    at : datetime
        Aware datetime.

    Returns
    -------
    float
        MJD in TDB.

    Notes
    -----
    Accuracy: 2 ms, with the leap seconds of the clock's date.

    Source: time scales of IAU, through erfa.
    """
    passed = at - MJD_ZERO
    fraction = (passed.seconds + 1e-6 * passed.microseconds) / 86_400.0
    return axis_instant(
        TypedInstant(float(passed.days), fraction, "utc", "geocentre", 0.0, 0.0, "second", at.isoformat())
    )


def ask(
    campaign: Campaign,
    *,
    now: datetime,
    as_of: TypedInstant | None,
    start: TypedInstant | None,
    end: TypedInstant | None,
    within_d: float | None,
    events: tuple[EventName, ...],
    min_probability: float,
    draws: int | None,
    seed: int | None,
    solutions: str,
    resolution_arcsec: float | None = None,
) -> Question:
    """Put the question: from when, until when, as of when.

    Parameters
    ----------
    campaign : Campaign
        Its own date stands in for the clock, if it has one.
    now : datetime
        The clock.
    as_of, start, end : TypedInstant or None
        As typed.
    within_d : float or None
        Length of the period, days.
    events : tuple of str
        Empty for all.
    min_probability : float
        In [0, 1] (dimensionless).
    draws, seed : int or None
        Of the random draws.
    solutions : str
        'adopted' or 'each'.
    resolution_arcsec : float or None
        What an image resolves, arcsec; without it no shell has a date at which it is resolvable.

    Returns
    -------
    Question
        Instants ``bmjd_tdb``.

    Raises
    ------
    InputRefused
        If the period ends before it begins, or is given twice; if the event 'resolvable' is asked for without
        a resolution.

    Notes
    -----
    Accuracy: see ``campaign.studies.instants.axis_instant``. Source: project convention.
    """
    if "resolvable" in events and resolution_arcsec is None:
        raise InputRefused(
            "Nothing says what is resolvable.",
            why="That depends on the image: its resolution, or the inner working angle of a coronagraph.",
            hint="For example --event resolvable --resolution 0.1arcsec.",
            code="resolution-unstated",
        )
    today = _today(campaign, now, as_of)
    first = today if start is None else axis_instant(start)
    if end is not None and within_d is not None:
        raise InputRefused(
            "The end of the period is given twice.",
            why="--within counts from its start and --until names its end.",
            hint="Give one of them, for example --within 5yr.",
            code="span-refused",
        )
    last = axis_instant(end) if end is not None else first + (within_d or DEFAULT_WITHIN_D)
    if not last > first:
        raise InputRefused(
            "The period ends before it begins.",
            why="--until is not later than --from (or than now, when --from is not given).",
            hint="For example --from 2030-01-01 --until 2035-01-01, or --within 5yr.",
            code="span-refused",
        )
    if last > LAST_DAY or first < FIRST_DAY:
        raise InputRefused(
            "The period reaches beyond the years 1 to 9999.",
            why="No calendar date can be given there, and no ephemeris holds that long.",
            hint="For example --within 5yr, or --from 1700-01-01 --until 1800-01-01.",
            code="span-refused",
        )
    return Question(
        as_of=today,
        start=first,
        end=last,
        events=events or EVENT_NAMES,
        min_probability=min_probability,
        draws=draws or DEFAULT_DRAWS,
        seed=DEFAULT_SEED if seed is None else seed,
        solutions=solutions,
        resolution_arcsec=resolution_arcsec,
    )


def today_of(db: str, now: datetime, as_of: TypedInstant | None) -> float:
    """The instant that counts as today in a catalogue.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    now : datetime
        The clock.
    as_of : TypedInstant or None
        What was typed in its place; else the own date of an invented sample, else the clock.

    Returns
    -------
    float
        ``bmjd_tdb``, days.

    Notes
    -----
    Accuracy: see ``mjd_of``. Source: the catalogue.
    """
    from campaign.catalogue import info, store

    if as_of is not None:
        return axis_instant(as_of)
    with store.reading(db) as connection:
        own = info.read_info(connection).get("sample_as_of")
    return mjd_of(now if own is None else datetime.fromisoformat(own.replace("Z", "+00:00")))


def _today(campaign: Campaign, now: datetime, as_of: TypedInstant | None) -> float:
    if as_of is not None:
        return axis_instant(as_of)
    return campaign.own_as_of if campaign.own_as_of is not None else mjd_of(now)


def upcoming(campaign: Campaign, question: Question) -> UpcomingResult:
    """Forecast a campaign.

    Parameters
    ----------
    campaign : Campaign
        Systems and light curves.
    question : Question
        Instants ``bmjd_tdb``.

    Returns
    -------
    UpcomingResult
        See ``forecast_campaign``.

    Notes
    -----
    Accuracy: see ``forecast_campaign``. Source: DEVELOPERS.md.
    """
    with collector_at_rest():
        result = forecast_campaign(campaign.records, campaign.photometry, question, campaign.shells)
    return _with_date_note(_with_next(result, campaign, question), campaign, question)


def _with_next(result: UpcomingResult, campaign: Campaign, question: Question) -> UpcomingResult:
    """Where the period holds nothing, say what comes first after it."""
    if result.events or not any(basis.has_forecast for basis in result.bases):
        return result
    longer = replace(question, start=question.end, end=question.end + NEXT_SEARCH_D, min_probability=0.0)
    later = forecast_campaign(campaign.records, campaign.photometry, longer, campaign.shells).events
    dated = [event for event in later if event.utc is not None and event.utc.median is not None]
    if not dated:
        return result
    first = dated[0]
    day = (first.utc.median or "")[:10] if first.utc is not None else ""
    text = f"nothing in this period; the first after it is {first.event} of {first.system}, {day}"
    return replace(result, assumptions=(text, *result.assumptions))


def _with_date_note(result: UpcomingResult, campaign: Campaign, question: Question) -> UpcomingResult:
    if not campaign.is_sample:
        return result
    own = campaign.own_as_of is not None and abs(question.as_of - campaign.own_as_of) < 1e-6
    text = "everything in the sample campaign is invented"
    if own:
        text += f"; its own date {result.as_of_utc[:10]} stands in for today"
    return replace(result, assumptions=(text, *result.assumptions))


def explain(campaign: Campaign, question: Question) -> ExplainedSystem:
    """Forecast one system and say how each date came about.

    Parameters
    ----------
    campaign : Campaign
        Of one system.
    question : Question
        Instants ``bmjd_tdb``.

    Returns
    -------
    ExplainedSystem
        See ``campaign.studies.explain``.

    Notes
    -----
    Accuracy: see ``campaign.studies.explain``. Source: propagation of errors.
    """
    from campaign.studies.explain import explain_system

    told = explain_system(campaign.records[0], campaign.photometry, question, campaign.shells)
    found = _with_next(told.upcoming, campaign, question)
    return replace(told, upcoming=_with_date_note(found, campaign, question))


def tabulate(
    campaign: Campaign,
    *,
    now: datetime,
    as_of: TypedInstant | None,
    start: TypedInstant | None,
    end: TypedInstant | None,
    step_d: float | None,
    label: str | None,
) -> EphemerisResult:
    """The dated table of one orbit.

    Parameters
    ----------
    campaign : Campaign
        Of one system.
    now : datetime
        The clock.
    as_of, start, end : TypedInstant or None
        As typed; from now over one period when not given.
    step_d : float or None
        Days; a fortieth of the span when not given.
    label : str or None
        Solution; the adopted one when not given.

    Returns
    -------
    EphemerisResult
        See ``campaign.studies.ephemeris``.

    Raises
    ------
    Conflict, InputRefused
        No usable solution; a span or step that cannot be used.

    Notes
    -----
    Accuracy: nominal elements. Source: Kepler's equation.
    """
    from campaign.physics.timescales import utc_iso
    from campaign.studies.ephemeris import ephemeris
    from campaign.studies.systems import require_solution

    record = campaign.records[0]
    solution = require_solution(record, label)
    today = _today(campaign, now, as_of)
    first = today if start is None else axis_instant(start)
    last = axis_instant(end) if end is not None else first + (nominal_period_d(solution) or DEFAULT_WITHIN_D)
    step = step_d if step_d is not None else max((last - first) / DEFAULT_ROWS, 1e-6)
    table = ephemeris(record, solution, first, last, step, utc_iso(np.array([today]))[0] or "")
    adopted = sum(1 for s in record.solutions if s.adopted)
    if label is not None or adopted < 2:
        return table
    text = f"'{solution.label}' is one of {adopted} adopted solutions; the forecast mixes them"
    return replace(table, assumptions=(text, *table.assumptions))
