"""What was confirmed of each event: a date with its errors, or a span of which nothing more is known."""

from __future__ import annotations

import math
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from datetime import datetime

from campaign.errors import InputRefused
from campaign.model.forecasts import EventName
from campaign.model.instants import Moment
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, Episode
from campaign.model.verification import Outcome, UsedEpisode
from campaign.reading.instants import read_instant
from campaign.studies.preparing import Prepared
from campaign.studies.rows import SCATTERS

# How the method of a date begins whose event happened unseen between two observations.
BRACKET = "bracket"
# Share of a span within one stated error of its middle: 68 % lie in the whole of what is stated.
_STATED_SHARE = 0.68


@dataclass(frozen=True, slots=True)
class KnownOutcomes:
    """Confirmed outcomes of one system by event and cycle, and the present cycle of each episode."""

    by_event: Mapping[tuple[EventName, int], Outcome]
    cycle_of: Mapping[int, int]

    def shift(self, used: Iterable[UsedEpisode]) -> int:
        """Cycles by which the count has moved since a forecast that knew these episodes."""
        for episode in used:
            now = self.cycle_of.get(episode.id)
            if now is not None and episode.cycle is not None:
                return now - episode.cycle
        return 0


def known_outcomes(prepared: Prepared, unit: int, decided: Mapping[int, datetime | None]) -> KnownOutcomes:
    """What is confirmed of one system, stage by stage.

    Parameters
    ----------
    prepared : Prepared
        Rows and units as of now.
    unit : int
        Of the system.
    decided : mapping of int to datetime or None
        When each episode was confirmed, by the clock.

    Returns
    -------
    KnownOutcomes
        Dates ``bmjd_tdb``.

    Notes
    -----
    Accuracy: see ``outcome_of``. Source: DEVELOPERS.md (episode, cycle).
    """
    record = prepared.rows[prepared.units[unit].rows[0]].record
    found: dict[tuple[EventName, int], Outcome] = {}
    for episode in prepared.units[unit].episodes:
        for event in SCATTERS:
            dated = getattr(episode, event)
            if dated is not None and episode.cycle is not None:
                entry = _entry_of(record, event, dated) or episode
                found[event, episode.cycle] = outcome_of(
                    dated, entry.id, episode.cycle, decided.get(entry.id)
                )
    return KnownOutcomes(found, {e.id: e.cycle for e in prepared.units[unit].episodes if e.cycle is not None})


def _entry_of(record: SystemRecord, event: EventName, dated: DatedEvent) -> Episode | None:
    """The entry that a stage comes from: several may date one cycle."""
    for episode in record.episodes:
        if episode.state == "confirmed" and getattr(episode, event) == dated:
            return episode
    return None


def outcome_of(dated: DatedEvent, episode_id: int, cycle: int | None, decided_at: datetime | None) -> Outcome:
    """One dated stage as an outcome.

    Parameters
    ----------
    dated : DatedEvent
        Date in ``bmjd_tdb``, errors in days.
    episode_id, cycle : int
        Whose it is.
    decided_at : datetime or None
        When it was confirmed.

    Returns
    -------
    Outcome
        A span where the date was typed as a day, month or year without an error of its own, or found as a
        bracket.

    Notes
    -----
    Accuracy: a typed span is exact. The ends of a found bracket follow from its 68 % errors as if the event
    were anywhere in it with equal right on either side of the median.

    Source: DEVELOPERS.md (limited precision is the interval itself).
    """
    moment = dated.moment
    first = last = None
    half = 0.5 * _width_d(moment)
    if half > 0.0:
        first, last = moment.bmjd_tdb - half, moment.bmjd_tdb + half
    elif (dated.method or "").startswith(BRACKET) and moment.minus_d and moment.plus_d:
        first = moment.bmjd_tdb - moment.minus_d / _STATED_SHARE
        last = moment.bmjd_tdb + moment.plus_d / _STATED_SHARE
    return Outcome(
        episode_id, cycle, moment.bmjd_tdb, moment.minus_d, moment.plus_d, first, last, dated.band, decided_at
    )


def _width_d(moment: Moment) -> float:
    """Width in days of the day, month or year that was typed; 0 for an instant, or with errors of its own."""
    if not moment.text or moment.minus_d is None or moment.minus_d != moment.plus_d:
        return 0.0
    try:
        typed = read_instant(moment.text, default_scale=moment.scale, default_place=moment.place)
    except InputRefused:
        # As some table had it; its errors were read then.
        return 0.0
    # A table may give a day, and in another column how uncertain it is.
    is_whole = math.isclose(typed.width_d, moment.minus_d * math.sqrt(12.0), rel_tol=1e-3)
    return typed.width_d if is_whole else 0.0
