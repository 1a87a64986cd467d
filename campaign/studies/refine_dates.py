"""The dated events of a system's confirmed episodes, as a line is fitted to them."""

from __future__ import annotations

import contextlib
from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from campaign.errors import CampaignError, Conflict
from campaign.model.instants import Moment
from campaign.model.records import SystemRecord
from campaign.model.refined import RefinedEvent
from campaign.model.systems import DatedEvent, Episode
from campaign.physics.datedlikelihood import DatedEvents
from campaign.reading.instants import read_instant
from campaign.studies.learned import ASSUMED_DATING_PERIODS
from campaign.studies.preparing import episodes_with_cycles
from campaign.studies.rows import build_row

IntArray = NDArray[np.int64]
# An instant typed to the second says nothing of how well the event is known.
_CLOCK_READING_D = 60.0 / 86_400.0
# No episode begins before the one before has ended; a little longer, for what was not dated.
_LONGER = 1.2
_SHORTEST_D = 60.0


@dataclass(frozen=True, slots=True, eq=False)
class ChosenDates:
    """Dated events in order of time: which episode each belongs to (0, 1, ...), of which kind, and when.

    ``stored`` is the number that the catalogue's count gives to the cycle of each episode, None where none.
    ``assumed`` marks dates that had no error. ``shortest_period_d`` is how long the episodes last, in days.
    """

    episodes: tuple[Episode, ...]
    kinds_of: tuple[RefinedEvent, ...]
    owner: IntArray
    kinds: IntArray
    dated: tuple[DatedEvent, ...]
    events: DatedEvents
    assumed: NDArray[np.bool_]
    stored: tuple[int | None, ...]
    shortest_period_d: float
    notes: tuple[str, ...]


def choose_dates(record: SystemRecord, wanted: str | None) -> ChosenDates | None:
    """Collect the dates that a line is fitted to.

    Parameters
    ----------
    record : SystemRecord
        The system and its episodes; instants ``bmjd_tdb``.
    wanted : str or None
        'onset', 'maximum' or 'both'; None for what most episodes have.

    Returns
    -------
    ChosenDates or None
        Days; None where no confirmed episode has such a date.

    Raises
    ------
    Conflict
        Two confirmed episodes that lie over each other.

    Notes
    -----
    Accuracy: a date that stands for a whole day, month or year is a bracket of that width; one without an
    error is given 0.5 % of the shortest gap, and that is said.

    Source: DEVELOPERS.md (refined solutions).
    """
    episodes = _confirmed(record)
    names = _kinds(episodes, wanted)
    episodes = tuple(e for e in episodes if any(getattr(e, name) is not None for name in names))
    if not episodes:
        return None
    owner, kinds, dated = [], [], []
    for place, episode in enumerate(episodes):
        for kind, name in enumerate(names):
            event: DatedEvent | None = getattr(episode, name)
            if event is not None:
                owner.append(place)
                kinds.append(kind)
                dated.append(event)
    names, used = _used_kinds(names, kinds)
    centres = [_first_date(e, names) for e in episodes]
    gaps = [b - a for a, b in pairwise(centres) if b > a]
    assumed_d = ASSUMED_DATING_PERIODS * min(gaps) if gaps else 10.0
    told = [_told(event.moment) for event in dated]
    minus = np.array([assumed_d if t is None else t[0] for t in told])
    plus = np.array([assumed_d if t is None else t[1] for t in told])
    events = DatedEvents(
        np.array([event.moment.bmjd_tdb for event in dated]), minus, plus,
        np.array([t is not None and t[2] for t in told], dtype=bool),
    )  # fmt: skip
    assumed = np.array([t is None for t in told], dtype=bool)
    notes = []
    if assumed.any():
        notes.append(f"dates without an error are given 0.5 % of the shortest gap, {assumed_d:.3g} d")
    bands = {event.band for event in dated}
    if len(bands) > 1:
        spoken = ", ".join(sorted(b or "production itself" for b in bands))
        notes.append(f"dates of {spoken} stand together: later bands are dated later")
    lengths = [_length_d(e) for e in episodes]
    return ChosenDates(
        episodes, names, np.array(owner), np.array(used), tuple(dated), events, assumed,
        _stored(record, episodes), max(_LONGER * max(lengths), _SHORTEST_D), tuple(notes),
    )  # fmt: skip


def _confirmed(record: SystemRecord) -> tuple[Episode, ...]:
    """Confirmed episodes, several entries of one stated cycle told together; none over another."""
    by_cycle: dict[int, Episode] = {}
    found: list[Episode] = []
    for episode in record.episodes:
        if episode.state != "confirmed" or not _dates(episode):
            continue
        known = None if episode.cycle is None else by_cycle.get(episode.cycle)
        whole = episode if known is None else _together(known, episode)
        if known is None:
            found.append(whole)
        else:
            found[found.index(known)] = whole
        if whole.cycle is not None:
            by_cycle[whole.cycle] = whole
    found.sort(key=lambda e: min(_dates(e)))
    for first, second in pairwise(found):
        if min(_dates(second)) <= max(_dates(first)):
            raise Conflict(
                f"Episodes {first.id} and {second.id} of {record.system.name} lie over each other.",
                why="Both are confirmed: one burst would count as two, a very short period apart.",
                hint=f"Reject one of them, for example: campaign episodes reject {second.id}",
                code="episode-overlap",
                details={"episodes": [first.id, second.id]},
            )
    return tuple(found)


def _together(first: Episode, second: Episode) -> Episode:
    return replace(
        first,
        onset=first.onset or second.onset,
        maximum=first.maximum or second.maximum,
        end=first.end or second.end,
    )


def _dates(episode: Episode) -> list[float]:
    stages = (episode.onset, episode.maximum, episode.end)
    return [event.moment.bmjd_tdb for event in stages if event is not None]


def _length_d(episode: Episode) -> float:
    return max(_dates(episode)) - min(_dates(episode))


def _kinds(episodes: Sequence[Episode], wanted: str | None) -> tuple[RefinedEvent, ...]:
    if wanted == "both":
        return ("onset", "maximum")
    if wanted == "maximum":
        return ("maximum",)
    onsets = sum(e.onset is not None for e in episodes)
    maxima = sum(e.maximum is not None for e in episodes)
    if wanted is None and onsets < 2 <= maxima:
        return ("maximum",)
    return ("onset",)


def _used_kinds(
    names: tuple[RefinedEvent, ...], kinds: list[int]
) -> tuple[tuple[RefinedEvent, ...], list[int]]:
    """Without a kind of which there is no date."""
    there = sorted(set(kinds))
    return tuple(names[kind] for kind in there), [there.index(kind) for kind in kinds]


def _first_date(episode: Episode, names: Sequence[RefinedEvent]) -> float:
    return next(
        float(getattr(episode, name).moment.bmjd_tdb) for name in names if getattr(episode, name) is not None
    )


def _told(moment: Moment) -> tuple[float, float, bool] | None:
    """Errors to either side in days, and whether they bound a bracket; None where none is known."""
    if moment.minus_d is None or moment.plus_d is None:
        return None
    if moment.minus_d == moment.plus_d and moment.text:
        # What stood for a whole day, month or year was kept as typed.
        with contextlib.suppress(CampaignError):
            typed = read_instant(moment.text)
            if typed.width_d > 0.0 and abs(typed.width_d / np.sqrt(12.0) - moment.plus_d) < _CLOCK_READING_D:
                return 0.5 * typed.width_d, 0.5 * typed.width_d, True
    if max(moment.minus_d, moment.plus_d) < _CLOCK_READING_D:
        return None
    return max(moment.minus_d, _CLOCK_READING_D), max(moment.plus_d, _CLOCK_READING_D), False


def _stored(record: SystemRecord, episodes: Sequence[Episode]) -> tuple[int | None, ...]:
    adopted = next((s for s in record.solutions if s.adopted), None)
    known = {e.id: e.cycle for e in episodes_with_cycles(build_row(record, adopted))}
    return tuple(e.cycle if e.cycle is not None else known.get(e.id) for e in episodes)
