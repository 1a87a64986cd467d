"""Keep today's forecasts exactly as they are, so that they can be held against what comes."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from datetime import timedelta

from sqlalchemy import Connection

import campaign as program
from campaign.catalogue import keepings, store
from campaign.model.forecasts import EventForecast
from campaign.model.instants import TypedInstant
from campaign.model.kept import Kept, Stamp
from campaign.model.verification import ForecastInputs, Keeping, KeepingList, KeptForecast, ListedKeeping
from campaign.physics.timescales import utc_iso
from campaign.reading.numbers import name_key
from campaign.studies.collecting import collector_at_rest
from campaign.studies.forecast import DatedEvent
from campaign.studies.forecast_inputs import inputs_by_unit, reference_date
from campaign.studies.rows import SCATTERS
from campaign.studies.upcoming import DatedCampaign, Question, date_campaign
from campaign.studies.watch import MJD_ZERO, Campaign, mjd_of


def keep_forecasts(
    db: str,
    stamp: Stamp,
    campaign: Campaign,
    question: Question,
    *,
    label: str | None = None,
    known_at: TypedInstant | None = None,
) -> Kept:
    """Keep the forecasts of a question: distributions, inputs, versions; one operation.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL of the catalogue that the campaign was loaded from.
    stamp : Stamp
        Who, when, which command.
    campaign : Campaign
        Systems and light curves.
    question : Question
        Instants ``bmjd_tdb``.
    label : str, optional
        A name for what is kept.
    known_at : TypedInstant, optional
        Entries made later were hidden from the campaign.

    Returns
    -------
    Kept
        ``changed`` is False where the very same was kept on the same day, or where nothing is forecast.

    Raises
    ------
    Conflict
        A label that other kept forecasts have.
    InputRefused
        A rule or element that cannot be used; a label that cannot be kept.

    Notes
    -----
    Accuracy: floats are kept to the last bit. An event that was observed already is no forecast and is left
    out. Source: DEVELOPERS.md (Keeping forecasts).
    """
    with collector_at_rest():
        dated = date_campaign(campaign.records, campaign.photometry, question, campaign.shells)
    # As the campaign was loaded.
    entered = stamp.at if known_at is None else MJD_ZERO + timedelta(days=known_at.mjd)
    cut = min(entered, stamp.at)
    keeping = Keeping(
        0, label, question.as_of, question.start, question.end, cut, stamp.at, question.draws,
        question.seed, program.__version__,
    )  # fmt: skip
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        found = _forecasts(writing.connection, dated, question, keeping)
        if not found:
            return Kept("forecast-keep", False, _nothing(campaign), {"keeping": None, "forecasts": 0})
        same = _kept_today(writing.connection, keeping, found)
        if same is not None:
            line = f"nothing has changed since {_named(same)} was kept on the same day; nothing more is kept"
            return Kept("forecast-keep", False, (line,), _data(same, found))
        number = keepings.add_keeping(writing, keeping, found)
        names = {one.event.system for one in found}
        many = f"{_count(len(found), 'forecast')} of {_count(len(names), 'system')}"
        writing.summarise(f"kept {many}" + (f" as '{label}'" if label else ""))
    kept = replace(keeping, id=number)
    day = (utc_iso([question.as_of])[0] or f"MJD {question.as_of:.1f}")[:10]
    lines = (f"kept {many} as of {day}: {_named(kept)}", _what_next(found))
    return Kept("forecast-keep", True, lines, _data(kept, found), _warnings(keeping, campaign.own_as_of))


def _forecasts(
    connection: Connection, dated: DatedCampaign, question: Question, keeping: Keeping
) -> list[KeptForecast]:
    inputs = inputs_by_unit(connection, dated.prepared, question.as_of, keeping.known_at)
    pairs = zip(dated.listed, dated.events, strict=True)
    return [_forecast(dated, one, event, inputs[one.unit]) for one, event in pairs if not event.observed]


def _forecast(
    dated: DatedCampaign, one: DatedEvent, event: EventForecast, inputs: ForecastInputs
) -> KeptForecast:
    prepared = dated.prepared
    period_d = dated.forecaster.period_d(prepared.units[one.unit].rows[0])
    date, sigma_d = reference_date(prepared, one.unit, one.event, one.cycle, period_d)
    return KeptForecast(0, 0, prepared.system_id(one.unit), event, quantiles_of(one), date, sigma_d, inputs)


def quantiles_of(one: DatedEvent) -> tuple[float, ...]:
    """The distribution of an event that can be scored some day.

    Parameters
    ----------
    one : DatedEvent
        ``bmjd_tdb``.

    Returns
    -------
    tuple of float
        Quantiles at ``campaign.studies.summaries.GRID``, ``bmjd_tdb``; empty without a date or with an error
        that is unknown, and for events that no episode dates.

    Notes
    -----
    Accuracy: to the last bit. Source: project convention.
    """
    if one.grid is None or one.missing or one.phase_lost or one.event not in SCATTERS:
        return ()
    dates = tuple(float(date) for date in one.grid)
    return dates if all(math.isfinite(date) for date in dates) else ()


def _kept_today(connection: Connection, keeping: Keeping, found: Sequence[KeptForecast]) -> Keeping | None:
    """A keeping of the same day that says the very same; one of another label counts only unlabelled."""
    wanted = [_content(one) for one in found]
    for other in keepings.list_keepings(connection):
        same_day = math.floor(other.as_of_bmjd_tdb) == math.floor(keeping.as_of_bmjd_tdb)
        same_label = keeping.label is None or (
            other.label is not None and name_key(other.label) == name_key(keeping.label)
        )
        if same_day and same_label and (other.draws, other.seed) == (keeping.draws, keeping.seed):
            kept = keepings.load_kept(connection, [other.id])
            if [_content(one) for one in kept] == wanted:
                return other
    return None


def _content(one: KeptForecast) -> tuple[object, ...]:
    event = one.event
    return (
        one.system_id, event.event, event.cycle, event.status, event.probability, event.bmjd_tdb,
        one.quantiles_bmjd_tdb, one.reference_bmjd_tdb, one.inputs,
    )  # fmt: skip


def _nothing(campaign: Campaign) -> tuple[str, ...]:
    if not campaign.records:
        return (
            "nothing to keep: there is no system yet",
            'begin with: campaign system add "NAME" --ra ... --dec ...',
        )
    return (
        "nothing to keep: no event is forecast in this period",
        "see why with: campaign upcoming; or look further ahead: campaign forecast keep --within 20yr",
    )


def _what_next(found: Sequence[KeptForecast]) -> str:
    dated = [one for one in found if one.quantiles_bmjd_tdb]
    if not dated:
        return "none of them has an onset, maximum or end with an interval, so none can be scored"
    return (
        f"{len(dated)} of them (onset, maximum, end) can be scored once their episodes are confirmed: "
        "campaign forecast score"
    )


def _warnings(keeping: Keeping, own_as_of: float | None) -> tuple[str, ...]:
    today = mjd_of(keeping.kept_at) if own_as_of is None else own_as_of
    if keeping.as_of_bmjd_tdb < today - 1.0:
        return (
            "this is what would have been forecast then, not what was: what the catalogue knew already will "
            "not score it; to hold the method against that: campaign forecast rehearse SYSTEM",
        )
    if keeping.as_of_bmjd_tdb > today + 1.0:
        return ("this is dated ahead of today: what will be observed until then is not in it",)
    return ()


def _data(keeping: Keeping, found: Sequence[KeptForecast]) -> dict[str, object]:
    return {
        "keeping": keeping.id,
        "label": keeping.label,
        "as_of_bmjd_tdb": keeping.as_of_bmjd_tdb,
        "forecasts": len(found),
        "systems": len({one.event.system for one in found}),
        "scorable": sum(1 for one in found if one.quantiles_bmjd_tdb),
    }


def _named(keeping: Keeping) -> str:
    return f"keeping {keeping.id}" + (f" '{keeping.label}'" if keeping.label else "")


def _count(number: int, word: str) -> str:
    return f"{number} {word}{'' if number == 1 else 's'}"


def list_kept(db: str, name: str | None = None) -> KeepingList:
    """What is kept, and the forecasts of one keeping.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    name : str, optional
        Number or label of a keeping whose forecasts are wanted.

    Returns
    -------
    KeepingList
        In the order in which they were kept; instants ``bmjd_tdb``.

    Raises
    ------
    NotFound
        No keeping of that number or label.

    Notes
    -----
    Accuracy: to the last bit. Source: the catalogue.
    """
    with store.reading(db) as connection:
        known = keepings.list_keepings(connection)
        counts = keepings.count_kept(connection)
        chosen = None if name is None else keepings.find_keeping(connection, name)
        forecasts = () if chosen is None else tuple(keepings.load_kept(connection, [chosen.id]))
    instants = utc_iso([one.as_of_bmjd_tdb for one in known])
    listed = tuple(
        ListedKeeping(one, utc, *counts.get(one.id, (0, 0, 0)))
        for one, utc in zip(known, instants, strict=True)
    )
    if chosen is not None:
        listed = tuple(one for one in listed if one.keeping.id == chosen.id)
    return KeepingList(listed, forecasts, chosen)
