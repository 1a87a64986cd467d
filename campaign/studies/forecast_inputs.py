"""What a forecast could know, whether that contains what came, and the simple forecast beside it."""

from __future__ import annotations

import math
from collections.abc import Sequence
from datetime import UTC, datetime, timedelta

from sqlalchemy import Connection

from campaign.catalogue.info import read_info
from campaign.catalogue.keepings import entry_times
from campaign.catalogue.observed import photometry_used
from campaign.model.forecasts import EventName
from campaign.model.systems import Episode
from campaign.model.verification import (
    Containing,
    ForecastInputs,
    Outcome,
    UsedEpisode,
    UsedPhotometry,
    UsedRule,
    UsedSolution,
)
from campaign.physics.timescales import tdb_to_utc
from campaign.studies.preparing import Prepared
from campaign.studies.rows import SCATTERS

_MJD_ZERO = datetime(1858, 11, 17, tzinfo=UTC)
_NOTHING = UsedPhotometry(0, None, None)


def clock_of(bmjd_tdb: float) -> datetime:
    """An instant of the axis as a clock shows it, to compare with times of entry.

    Parameters
    ----------
    bmjd_tdb : float
        Days, in the years 1 to 9999.

    Returns
    -------
    datetime
        Aware, UTC.

    Notes
    -----
    Accuracy: 1 s but on the day of a leap second; no light time. Source: time scales of IAU, through erfa.
    """
    day, rest = tdb_to_utc(bmjd_tdb)
    return _MJD_ZERO + timedelta(days=float(day), seconds=round(86_400.0 * float(rest)))


def clock_ahead(connection: Connection) -> timedelta:
    """How far the dates of a catalogue are ahead of the clock that its entries were made by.

    Parameters
    ----------
    connection : Connection
        To the catalogue.

    Returns
    -------
    timedelta
        Zero but for the invented sample, whose own date stands in for the day on which it was begun.

    Notes
    -----
    Accuracy: 1 s. Source: the catalogue.
    """
    facts = read_info(connection)
    own, begun = facts.get("sample_as_of"), facts.get("begun_at")
    if own is None or begun is None:
        return timedelta(0)
    return datetime.fromisoformat(own) - datetime.fromisoformat(begun)


def inputs_by_unit(
    connection: Connection, prepared: Prepared, as_of: float, known_at: datetime | None
) -> tuple[ForecastInputs, ...]:
    """What each unit of a forecast could use.

    Parameters
    ----------
    connection : Connection
        To the catalogue that it was made from.
    prepared : Prepared
        Its rows and units; later episodes are hidden already.
    as_of : float
        Observations made later were hidden, ``bmjd_tdb``.
    known_at : datetime or None
        Entries made later were hidden.

    Returns
    -------
    tuple of ForecastInputs
        One a unit; instants ``bmjd_tdb``, entries by the clock.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    records = [prepared.rows[unit.rows[0]].record for unit in prepared.units]
    confirmed = [[e for e in record.episodes if e.state == "confirmed"] for record in records]
    solutions = [
        [(prepared.rows[row].solution, weight) for row, weight in zip(unit.rows, unit.weights, strict=True)]
        for unit in prepared.units
    ]
    rules = [prepared.rows[unit.rows[0]].rule for unit in prepared.units]
    points = photometry_used(
        connection, [record.system.id for record in records], as_of_bmjd_tdb=as_of, known_at=known_at
    )
    solution_times, rule_times, episode_times = entry_times(
        connection,
        {solution.id for several in solutions for solution, _ in several if solution is not None},
        {rule.id for rule in rules if rule is not None},
        {episode.id for several in confirmed for episode in several},
    )
    return tuple(
        ForecastInputs(
            tuple(
                UsedSolution(
                    solution.id, solution.label, weight if len(several) > 1 else None,
                    solution.data_until_bmjd_tdb, solution_times.get(solution.id),
                )
                for solution, weight in several
                if solution is not None
            ),
            None if rule is None else UsedRule(rule.id, rule.kind, rule_times.get(rule.id)),
            tuple(
                _used_episode(episode, _counted(unit.episodes, episode), episode_times.get(episode.id))
                for episode in episodes
            ),
            points.get(record.system.id, _NOTHING),
        )
        for unit, record, several, rule, episodes in zip(
            prepared.units, records, solutions, rules, confirmed, strict=True
        )
    )  # fmt: skip


def _counted(episodes: Sequence[Episode], wanted: Episode) -> int | None:
    """The cycle that an episode was counted to; the entered one where it was told with another."""
    return next((one.cycle for one in episodes if one.id == wanted.id), wanted.cycle)


def _used_episode(episode: Episode, cycle: int | None, decided_at: datetime | None) -> UsedEpisode:
    onset, maximum, end = (
        None if dated is None else dated.moment.bmjd_tdb
        for dated in (episode.onset, episode.maximum, episode.end)
    )
    return UsedEpisode(episode.id, cycle, onset, maximum, end, decided_at)


def reference_date(
    prepared: Prepared, unit: int, event: EventName, cycle: int | None, period_d: float
) -> tuple[float | None, float | None]:
    """The last date of the same stage plus whole periods: the forecast that a calendar could make.

    Parameters
    ----------
    prepared : Prepared
        Rows and units.
    unit : int
        Of what is forecast.
    event : str
        Onset, maximum or end.
    cycle : int or None
        Of what is forecast.
    period_d : float
        To add where no solution quotes one, days.

    Returns
    -------
    (float or None, float or None)
        Date in ``bmjd_tdb`` and its error in days, from the quoted errors of date and period; an error that
        nobody quoted counts as zero, as a calendar would have it. None where there was no date before.

    Notes
    -----
    Accuracy: none is claimed. Source: common practice, no source.
    """
    if event not in SCATTERS or cycle is None:
        return None, None
    last: tuple[int, Episode] | None = None
    for episode in prepared.units[unit].episodes:
        dated = getattr(episode, event)
        earlier = episode.cycle is not None and episode.cycle < cycle
        if dated is not None and earlier and (last is None or (episode.cycle or 0) > last[0]):
            last = (episode.cycle or 0, episode)
    quoted = prepared.rows[prepared.units[unit].rows[0]].values.get("period_d", (period_d, None, None))
    if last is None or math.isnan(quoted[0]):
        return None, None
    moment = getattr(last[1], event).moment
    cycles = cycle - last[0]
    dating = math.hypot(moment.minus_d or 0.0, moment.plus_d or 0.0)
    growing = cycles * math.hypot(quoted[1] or 0.0, quoted[2] or 0.0)
    return moment.bmjd_tdb + cycles * quoted[0], math.hypot(dating, growing) / math.sqrt(2.0)


def containing(
    inputs: ForecastInputs, outcome: Outcome, as_of: float, known_at: datetime | None, ahead: timedelta
) -> tuple[tuple[Containing, ...], tuple[str, ...]]:
    """Which inputs of a forecast may contain what came of it.

    Parameters
    ----------
    inputs : ForecastInputs
        What it used; instants ``bmjd_tdb``.
    outcome : Outcome
        What was confirmed, ``bmjd_tdb``.
    as_of : float
        The instant of the question, ``bmjd_tdb``.
    known_at : datetime or None
        Entries made later were hidden; None when entries of any date were let in knowingly.
    ahead : timedelta
        See ``clock_ahead``.

    Returns
    -------
    (tuple of str, tuple of str)
        Kinds of input, and the same in words; both empty for a forecast that may be scored.

    Notes
    -----
    Observations and dated episodes must be from before the outcome, a solution's data too. Where nobody said
    until when a solution's data reached, and for a rule, which carries no such date, the time of entry
    decides. A rule that is learned holds nothing of its own.

    Accuracy: by the dates themselves. Source: DEVELOPERS.md (As of).
    """
    happened = outcome.bmjd_tdb
    kinds: dict[Containing, None] = {}
    words: list[str] = []

    def add(kind: Containing, text: str) -> None:
        kinds[kind] = None
        words.append(text)

    at = clock_of(happened) - ahead
    newest = inputs.photometry.newest_bmjd_tdb
    if newest is not None and newest > happened:
        add("observations", "the light curve that it used goes on after the event")
    dates = [
        date
        for episode in inputs.episodes
        for date in (episode.onset_bmjd_tdb, episode.maximum_bmjd_tdb, episode.end_bmjd_tdb)
        if date is not None
    ]
    if any(date >= happened for date in dates):
        add("entries", "an episode that it used is dated then or later")
    elif known_at is not None and outcome.decided_at is not None and outcome.decided_at <= known_at:
        add("entries", "the outcome was in the catalogue already when it was made")
    elif known_at is not None and as_of < happened and known_at > at:
        add("entries", "it was made for a date before the event from entries made after it")
    for solution in inputs.solutions:
        until = solution.data_until_bmjd_tdb
        if until is not None and until > happened:
            add("solution", f"the data of its solution '{solution.label}' reach beyond the event")
        elif until is None and (solution.entered_at is None or solution.entered_at > at):
            add(
                "solution",
                f"its solution '{solution.label}' was entered after the event, and nobody said until when "
                "its data reach",
            )
    rule = inputs.rule
    given = rule is not None and rule.kind != "learned" and known_at is not None
    if rule is not None and given and (rule.set_at is None or rule.set_at > at):
        add("rule", "its dust rule was set after the event")
    return tuple(kinds), tuple(words)
