"""The main job: which events are coming, when, how sure that is, and what it rests on."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import numpy as np

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import EVENT_NAMES, EventForecast, EventName, UpcomingResult
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.physics.timescales import utc_iso
from campaign.studies.basis import describe_basis, dust_windows, event_forecasts
from campaign.studies.conditioning import condition_events
from campaign.studies.dateless import dateless_events
from campaign.studies.forecast import KEEP_LISTED_D, MOST_CYCLES, DatedEvent, Forecaster
from campaign.studies.lightcurves import CataloguedCurves
from campaign.studies.preparing import Prepared, Question, prepare
from campaign.studies.resolvable import resolvable_events
from campaign.studies.status import OnsetState, needs_photometry, onset_state
from campaign.studies.suspected import suspicions

# More than this and nobody reads a timeline.
TIMELINE_SYSTEMS = 200

__all__ = ["Prepared", "Question", "forecast_campaign", "onset_states", "prepare", "with_disagreement"]


def forecast_campaign(
    records: Sequence[SystemRecord],
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
    shells: Mapping[int, Sequence[Observation]] | None = None,
) -> UpcomingResult:
    """Forecast every event of every active system.

    Parameters
    ----------
    records : sequence of SystemRecord
        Systems with solutions, rule and episodes; retired ones are left out by the caller.
    photometry : mapping of int to PhotometryArrays
        Light curves by system id, for the status; may be empty.
    question : Question
        Window, instant of the question, events, draws and seed.
    shells : mapping of int to sequence of Observation, optional
        Logged shells by system id, for the event 'resolvable'.

    Returns
    -------
    UpcomingResult
        Events sorted by date, those without a date last; instants ``bmjd_tdb`` and UTC.

    Raises
    ------
    InputRefused
        If a rule or an element cannot be used.

    Notes
    -----
    Accuracy: normal dates are exact; drawn ones carry the error of the draws, about 0.02 sigma in the
    bounds of a 95 % interval at 20,000 draws.

    Source: DEVELOPERS.md (Forecast, Status, Phase lost).
    """
    found = date_campaign(records, photometry, question, shells)
    prepared, forecaster, dated, listed = found.prepared, found.forecaster, found.dated, found.listed
    events = list(found.events)
    if question.solutions == "each":
        events = with_disagreement(events)
    shown = {d.unit for d in listed}
    windows = dust_windows(
        prepared.rows, prepared.units, [d for d in dated if d.unit in shown], question.start, question.end,
        TIMELINE_SYSTEMS,
    )  # fmt: skip
    instants = utc_iso(np.array([question.as_of, question.start, question.end]))
    return UpcomingResult(
        as_of_bmjd_tdb=question.as_of,
        as_of_utc=instants[0] or "",
        from_bmjd_tdb=question.start,
        until_bmjd_tdb=question.end,
        from_utc=instants[1] or "",
        until_utc=instants[2] or "",
        events=tuple(sorted(events, key=_date_key)),
        dust_windows=windows,
        bases=describe_basis(prepared.rows, prepared.units, prepared.learned, records),
        draws=question.draws,
        seed=question.seed,
        assumptions=_assumptions(prepared),
        warnings=tuple(_cut_short(prepared, forecaster, listed)),
        suspicions=suspicions(prepared, photometry, question.as_of),
    )


@dataclass(frozen=True, slots=True)
class DatedCampaign:
    """Everything that was dated, with its distribution, and what of it is listed.

    ``events`` belong to ``listed`` one by one; what is listed has the quantiles that ``events`` leave out.
    ``unconditioned`` is what was dated as it was before quiet observations were counted in.
    """

    prepared: Prepared
    forecaster: Forecaster
    dated: tuple[DatedEvent, ...]
    listed: tuple[DatedEvent, ...]
    events: tuple[EventForecast, ...]
    unconditioned: tuple[DatedEvent, ...] = ()
    states: Mapping[tuple[int, int | None], OnsetState] = field(default_factory=dict)


def date_campaign(
    records: Sequence[SystemRecord],
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
    shells: Mapping[int, Sequence[Observation]] | None = None,
) -> DatedCampaign:
    """Date every event of every active system, with the whole distribution of each.

    Parameters
    ----------
    records, photometry, question, shells : as for ``forecast_campaign``
        Instants ``bmjd_tdb``.

    Returns
    -------
    DatedCampaign
        Events as they are forecast, in no order.

    Raises
    ------
    InputRefused
        If a rule or an element cannot be used.

    Notes
    -----
    Accuracy: as ``forecast_campaign``. Source: DEVELOPERS.md (Forecast, Status, Phase lost).
    """
    prepared = prepare(records, photometry, question)
    forecaster = Forecaster(prepared.rows, prepared.units, prepared.learned, question.draws, question.seed)
    # The status of an onset needs the end, whatever is listed.
    wanted = tuple(e for e in EVENT_NAMES if e in question.events or e in ("onset", "end"))
    dated = forecaster.run(question.window, wanted)
    dated += resolvable_events(prepared, forecaster, question, shells or {})
    states = onset_states(prepared, forecaster, dated, photometry, question)
    unconditioned = tuple(dated)
    dated = condition_events(prepared, forecaster, dated, states, photometry, question)
    listed = [d for d in dated if d.event in question.events and _is_listed(d, states, question)]
    listed.extend(dateless_events(prepared, question))
    listed = [d for d in listed if d.in_window is None or d.in_window >= question.min_probability]
    events = event_forecasts(prepared.rows, prepared.units, listed, states, question.as_of)
    return DatedCampaign(
        prepared, forecaster, tuple(dated), tuple(listed), tuple(events), unconditioned, states
    )


def onset_states(
    prepared: Prepared,
    forecaster: Forecaster,
    dated: Sequence[DatedEvent],
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
) -> dict[tuple[int, int | None], OnsetState]:
    """Status of every dated onset, by (unit, cycle).

    Parameters
    ----------
    prepared : Prepared
        Rows and units.
    forecaster : Forecaster
        For the periods, days.
    dated : sequence of DatedEvent
        All dated events, ``bmjd_tdb``.
    photometry : mapping of int to PhotometryArrays
        Light curves by system id; only those that can matter today are looked at.
    question : Question
        ``as_of`` in ``bmjd_tdb``.

    Returns
    -------
    dict
        Onset states.

    Notes
    -----
    Accuracy: see ``campaign.studies.status``.

    Source: DEVELOPERS.md (Status).
    """
    ends = {(d.unit, d.cycle): d for d in dated if d.event == "end"}
    onsets = [d for d in dated if d.event == "onset"]
    asked = []
    for onset in onsets:
        unit = prepared.units[onset.unit]
        episode = unit.confirmed(onset.cycle) if onset.cycle is not None else None
        period_d = forecaster.period_d(unit.rows[0])
        asked.append((onset, episode, period_d, needs_photometry(onset, episode, question.as_of, period_d)))
    if isinstance(photometry, CataloguedCurves):
        photometry.fetch([prepared.system_id(onset.unit) for onset, _, _, needed in asked if needed])
    states: dict[tuple[int, int | None], OnsetState] = {}
    for onset, episode, period_d, needed in asked:
        judged = prepared.judge(onset.unit, photometry, question.as_of) if needed else None
        end = ends.get((onset.unit, onset.cycle))
        states[onset.unit, onset.cycle] = onset_state(onset, end, episode, judged, question.as_of, period_d)
    return states


def _is_listed(
    event: DatedEvent,
    states: Mapping[tuple[int, int | None], OnsetState],
    question: Question,
) -> bool:
    if event.quantiles is None:
        return event.phase_lost
    if np.isnan(event.quantiles[0]):
        return False
    median, _, _, low, high = (float(q) for q in event.quantiles)
    if event.missing:
        low = high = median
    state = states.get((event.unit, event.cycle))
    if low <= question.end and high >= question.start:
        return True
    if event.event == "onset" and state is not None and high < question.start:
        recent = question.as_of - high < KEEP_LISTED_D
        if state.status in ("under way", "suspected", "late"):
            return _is_latest(event, states)
        return state.status == "unseen" and recent and _is_latest(event, states)
    return False


def _is_latest(event: DatedEvent, states: Mapping[tuple[int, int | None], OnsetState]) -> bool:
    """No later cycle of the same unit has anything but 'expected' to say."""
    assert event.cycle is not None
    # Cycles of a unit are dated without gaps.
    cycle = event.cycle + 1
    while (state := states.get((event.unit, cycle))) is not None:
        if state.status not in ("expected", "phase lost"):
            return False
        cycle += 1
    return True


def with_disagreement(events: Sequence[EventForecast]) -> list[EventForecast]:
    """Add how many sigma the solutions of one system differ by, event by event and cycle by cycle.

    Parameters
    ----------
    events : sequence of EventForecast
        Events of all units, the adopted solution of a system before the others.

    Returns
    -------
    list of EventForecast
        With ``disagreement_sigma`` (dimensionless) where two dates can be compared.

    Notes
    -----
    Accuracy: for normal dates; (first - second) / root of the summed variances.

    Source: DEVELOPERS.md (signed tension).
    """
    reference: dict[tuple[str, EventName, int | None], EventForecast] = {}
    result = []
    for event in events:
        if event.solution is not None and event.disagreement_sigma is not None:
            result.append(event)  # a mixture: it carries the disagreement of its own components
            continue
        key = (event.system, event.event, event.cycle)
        first = reference.setdefault(key, event)
        if first is not event and first.bmjd_tdb is not None and event.bmjd_tdb is not None:
            spread = np.hypot(first.bmjd_tdb.sigma_d or 0.0, event.bmjd_tdb.sigma_d or 0.0)
            if spread > 0.0:
                event = replace(  # noqa: PLW2901
                    event,
                    disagreement_sigma=float((event.bmjd_tdb.median - first.bmjd_tdb.median) / spread),
                )
        result.append(event)
    return result


def _date_key(event: EventForecast) -> tuple[bool, float, str]:
    dated = event.bmjd_tdb is not None
    return (not dated, event.bmjd_tdb.median if event.bmjd_tdb is not None else 0.0, event.system)


def _assumptions(prepared: Prepared) -> tuple[str, ...]:
    said: dict[str, list[str]] = {}
    for row in prepared.rows:
        for text in row.assumptions:
            said.setdefault(text, []).append(row.record.system.name)
    few = 4
    return tuple(
        f"{text} ({', '.join(names[:few])}{' and others' if len(names) > few else ''})"
        for text, names in said.items()
    )


def _cut_short(prepared: Prepared, forecaster: Forecaster, listed: Sequence[DatedEvent]) -> list[str]:
    """Systems with more dated cycles in the period than anybody reads."""
    dated = {one.unit for one in listed if not one.phase_lost}
    return [
        f"{prepared.rows[prepared.units[unit].rows[0]].record.system.name}: {count} cycles fall in this "
        f"period; only the first {MOST_CYCLES} are looked at"
        for unit, count in sorted(forecaster.cut.items())
        if unit in dated
    ]
