"""Make found episodes knowledge: propose them, confirm them, reject them; each command is one operation."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from sqlalchemy import Connection

from campaign.catalogue import episodes, store, systems
from campaign.errors import Conflict, InputRefused
from campaign.model.forecasts import Quantiles
from campaign.model.found import EpisodesFound, FoundDate, FoundEpisode
from campaign.model.instants import Moment
from campaign.model.kept import Kept, Stamp
from campaign.model.systems import DatedEvent, Episode
from campaign.physics.timescales import utc_iso
from campaign.reading.instants import read_instant
from campaign.studies.instants import moment_of

_STAGES = ("onset", "maximum", "end")
_JD_OF_MJD_0 = 2_400_000.5
# No date of a light curve is better than a minute, and zero would say that it is exact.
_LEAST_ERROR_D = 1.0 / 1440.0


def propose_episodes(db: str, stamp: Stamp, found: EpisodesFound) -> Kept:
    """Enter the found episodes that the catalogue does not know, as proposals to be confirmed or rejected.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    found : EpisodesFound
        See ``campaign.studies.find_episodes``; ``bmjd_tdb``, days.

    Returns
    -------
    Kept
        Numbers of the proposals; ``changed`` is False when all were known.

    Raises
    ------
    NotFound
        Unknown system.

    Notes
    -----
    Accuracy: the 68 % interval of each date becomes its one-sigma errors, each side by itself. Dates of which
    the points tell nothing are left out.

    Source: DEVELOPERS.md (episode).
    """
    new = [one for one in found.episodes if one.known is None and one.kind == "episode"]
    lines, numbers = [], []
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        system = systems.find_system(writing.connection, found.system)
        for one in new:
            dates = _dates(one)
            if not dates:
                lines.append(f"{system.name}: episode {one.number} of the curve has no date that can be kept")
                continue
            events = {
                stage: DatedEvent(moment_of(read_instant(text), system), band, method)
                for stage, (text, band, method) in dates.items()
            }
            episode = Episode(
                0,
                system.id,
                None,
                "proposed",
                source="",
                note=f"found in the light curve; {one.rise}",
                **events,
            )
            numbers.append(episodes.add_episode(writing, episode))
            lines.append(f"{system.name}: proposed episode {numbers[-1]} ({_spoken(episode)})")
        if numbers:
            writing.summarise(f"proposed {_episodes(len(numbers))} of {system.name}")
    known = [one.known.id for one in found.episodes if one.known is not None]
    if known:
        lines.append(f"{found.system}: known already as {', '.join(f'episode {number}' for number in known)}")
    if numbers:
        lines.append(f"make it knowledge with: campaign episodes confirm {' '.join(map(str, numbers))}")
    elif not known:
        lines.append(f"{found.system}: nothing to propose")
    return Kept(
        "episodes-propose",
        bool(numbers),
        tuple(lines),
        {"system": found.system, "ids": numbers, "known": known},
    )


def decide_episodes(db: str, stamp: Stamp, numbers: Sequence[int], *, confirm: bool) -> Kept:
    """Confirm or reject episodes by their numbers, all or none.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    numbers : sequence of int
        Their numbers, as ``episodes list`` shows them.
    confirm : bool
        Confirm; else reject.

    Returns
    -------
    Kept
        ``changed`` is False when all were so already.

    Raises
    ------
    NotFound, Conflict, InputRefused
        Unknown number; withdrawn; would lie over another confirmed episode; named twice.

    Notes
    -----
    Accuracy: exact. Source: DEVELOPERS.md (episode).
    """
    if len(set(numbers)) != len(numbers):
        raise InputRefused(
            "A number stands there twice.",
            why="Each episode is decided once.",
            hint=f"For example: {' '.join(str(number) for number in dict.fromkeys(numbers))}",
            code="number-twice",
        )
    state: episodes.EpisodeState = "confirmed" if confirm else "rejected"
    lines, changed = [], []
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        for number in numbers:
            name, episode, others = _found(writing.connection, number)
            if confirm:
                _refuse_overlap(name, episode, others)
            if episodes.decide_episode(writing, number, state):
                changed.append(number)
                lines.append(f"{name}: episode {number} {state} ({_spoken(episode)}); it was {episode.state}")
            else:
                lines.append(f"{name}: episode {number} was {state} already")
        if changed:
            many = "s" if len(changed) > 1 else ""
            writing.summarise(f"{state} episode{many} {', '.join(map(str, changed))}")
    return Kept(f"episodes-{'confirm' if confirm else 'reject'}", bool(changed), tuple(lines),
                {"ids": list(numbers), "state": state, "changed_ids": changed})  # fmt: skip


def _found(connection: Connection, number: int) -> tuple[str, Episode, tuple[Episode, ...]]:
    """Name of its system, the episode, and the others of that system."""
    system_id = episodes.system_of_episode(connection, number)
    known = episodes.episodes_of(connection, system_id)
    (episode,) = (one for one in known if one.id == number)
    name = systems.get_system(connection, system_id).name
    return name, episode, tuple(one for one in known if one.id != number)


def _refuse_overlap(name: str, episode: Episode, others: Sequence[Episode]) -> None:
    own = _span(episode)
    for other in others:
        if other.state != "confirmed" or own is None or (span := _span(other)) is None:
            continue
        if own[0] <= span[1] and span[0] <= own[1]:
            raise Conflict(
                f"Episode {episode.id} of {name} lies over the confirmed episode {other.id}.",
                why=f"Episode {other.id} is dated {_spoken(other)}: one burst would count twice.",
                hint=f"Reject one of them first, for example: campaign episodes reject {other.id}",
                code="episode-overlap",
                details={"episode": episode.id, "overlaps": other.id},
            )


def _span(episode: Episode) -> tuple[float, float] | None:
    """First and last date of an episode, a single date with its error."""
    moments = [event.moment for event in (episode.onset, episode.maximum, episode.end) if event is not None]
    if not moments:
        return None
    return (
        min(m.bmjd_tdb - (m.minus_d or 0.0 if len(moments) == 1 else 0.0) for m in moments),
        max(m.bmjd_tdb + (m.plus_d or 0.0 if len(moments) == 1 else 0.0) for m in moments),
    )


def _spoken(episode: Episode) -> str:
    told = [
        f"{stage} {_day(event.moment)}" for stage in _STAGES if (event := getattr(episode, stage)) is not None
    ]
    return "; ".join(told) or "without a date"


def _day(moment: Moment) -> str:
    """The day of a date with its errors in days, short."""
    iso = utc_iso(np.array([moment.bmjd_tdb]))[0]
    told = iso[:10] if iso else f"MJD {moment.bmjd_tdb:.1f}"
    if moment.minus_d is None or moment.plus_d is None:
        return told
    below, above = (
        f"{size:.2g}" if size < 99.5 else f"{size:.0f}" for size in (moment.minus_d, moment.plus_d)
    )
    return f"{told} ± {above} d" if below == above else f"{told} +{above} −{below} d"


def _dates(one: FoundEpisode) -> dict[str, tuple[str, str | None, str]]:
    """What of an episode is worth keeping, as text that reads back to the same date and errors."""
    rise = "broken line in flux" if one.rise == "covered" else "bracket, rise not covered"
    found: dict[str, tuple[str, str | None, str]] = {}
    if one.onset is not None:
        found["onset"] = (_text(one.onset.bmjd_tdb), one.onset.band, rise)
    best = one.maxima[0] if one.maxima else None
    if best is not None and best.reached and best.date.told:
        found["maximum"] = (_text(best.date.bmjd_tdb), best.date.band, "top of the broken line in flux")
    if one.end is not None and one.end.told:
        found["end"] = (_text(one.end.bmjd_tdb), one.end.band, "break of the decline")
    return _in_order(one, found)


def _in_order(
    one: FoundEpisode, found: dict[str, tuple[str, str | None, str]]
) -> dict[str, tuple[str, str | None, str]]:
    """Without a later stage whose median would come before an earlier one's."""
    medians: dict[str, FoundDate | None] = {
        "onset": one.onset,
        "maximum": one.maxima[0].date if one.maxima else None,
        "end": one.end,
    }
    kept: dict[str, tuple[str, str | None, str]] = {}
    latest = float("-inf")
    for stage in _STAGES:
        date = medians[stage]
        if stage in found and date is not None and date.bmjd_tdb.median >= latest:
            kept[stage] = found[stage]
            latest = date.bmjd_tdb.median
    return kept


def _text(quantiles: Quantiles) -> str:
    low, high = quantiles.lo68, quantiles.hi68
    assert low is not None
    assert high is not None
    minus, plus = (max(size, _LEAST_ERROR_D) for size in (quantiles.median - low, high - quantiles.median))
    return f"BJD {quantiles.median + _JD_OF_MJD_0:.3f} +{plus:.3f} -{minus:.3f}"


def _episodes(count: int) -> str:
    return f"{count} episode{'' if count == 1 else 's'}"
