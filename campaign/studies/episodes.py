"""Keep episodes: dated bursts, published or found, that are knowledge once confirmed."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import replace
from itertools import pairwise

from campaign.catalogue import episodes, records, store, systems
from campaign.errors import Conflict, InputRefused
from campaign.model.instants import Moment, TypedInstant
from campaign.model.kept import Kept, Stamp
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, Episode
from campaign.studies.instants import mjd_of_clock, moment_of, spoken_moment
from campaign.studies.preparing import episodes_with_cycles
from campaign.studies.rows import build_row

# Two entries are the same below this, days: the rounding of light time.
_SAME_D = 1e-6
# No system makes dust anew so soon after an onset, days.
_SAME_BURST_D = 30.0


def add_episode(
    db: str,
    stamp: Stamp,
    system_name: str,
    draft: Episode,
    dates: Mapping[str, tuple[TypedInstant, str | None, str | None]],
) -> Kept:
    """Add a confirmed episode with the dates that are known of it.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.
    system_name : str
        Name or alias.
    draft : Episode
        Cycle, source and note; its dates are filled in here.
    dates : mapping
        ``onset``, ``maximum``, ``end`` to (instant, band, method).

    Returns
    -------
    Kept
        What was written, with the instants as understood.

    Raises
    ------
    NotFound, InputRefused, Conflict
        Unknown system; no date or dates out of order; the cycle has one of these dates already.

    Notes
    -----
    Accuracy: instants as in ``campaign.studies.instants``. Source: DEVELOPERS.md (episode).
    """
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        return enter_episode(writing, system_name, draft, dates)


def enter_episode(
    writing: store.Writing,
    system_name: str,
    draft: Episode,
    dates: Mapping[str, tuple[TypedInstant, str | None, str | None]],
) -> Kept:
    """Add an episode within an operation that is under way.

    Parameters
    ----------
    writing : Writing
        The operation.
    system_name, draft, dates
        As for :func:`add_episode`.

    Returns
    -------
    Kept
        What was written, with the instants as understood.

    Raises
    ------
    NotFound, InputRefused, Conflict
        As :func:`add_episode`.

    Notes
    -----
    Accuracy: instants as in ``campaign.studies.instants``. Source: DEVELOPERS.md (episode).
    """
    if not dates:
        raise InputRefused(
            "The episode has no date.",
            why="At least one of onset, maximum and end has to be dated.",
            hint="For example --onset 2019-03-14±5.",
            code="episode-empty",
        )
    system = systems.find_system(writing.connection, system_name)
    known = episodes.episodes_of(writing.connection, system.id)
    _refuse_second_date(known, draft, dates, system.name)
    dated = {n: DatedEvent(moment_of(t, system), band, method) for n, (t, band, method) in dates.items()}
    same = next((e for e in known if e.state == "confirmed" and _says_the_same(e, draft, dated)), None)
    if same is not None:
        return _already_known(system.name, same)
    if draft.cycle is None:
        _refuse_same_burst(known, dated, system.name)
    ordered = [(n, dated[n].moment.bmjd_tdb) for n in ("onset", "maximum", "end") if n in dated]
    for (first, earlier), (second, later) in pairwise(ordered):
        if later < earlier:
            raise InputRefused(
                f"The {second} would come before the {first}.",
                why=f"The {first} is dated {earlier - later:.1f} d after the {second}.",
                hint="Check the dates; the order is onset, maximum, end.",
                code="episode-order",
            )
    episode = replace(
        draft,
        system_id=system.id,
        onset=dated.get("onset"),
        maximum=dated.get("maximum"),
        end=dated.get("end"),
    )
    episode_id = episodes.add_episode(writing, episode)
    writing.summarise(f"added a confirmed episode of {system.name}")
    lines = [f"{system.name}: confirmed episode {episode_id}"]
    lines.extend(f"{name} understood as {spoken_moment(event.moment)}" for name, event in dated.items())
    ahead = [name for name, event in dated.items() if event.moment.bmjd_tdb > mjd_of_clock(writing.at) + 1.0]
    return Kept(
        "episodes-add",
        True,
        tuple(lines),
        {"system": system.name, "id": episode_id, "cycle": draft.cycle},
        tuple(f"the {name} is dated in the future" for name in ahead),
    )


def _says_the_same(known: Episode, draft: Episode, dated: Mapping[str, DatedEvent]) -> bool:
    """Whether every date given is known already, in the same band and with the same error."""
    if draft.cycle not in (None, known.cycle):
        return False
    pairs = [(getattr(known, stage), event) for stage, event in dated.items()]
    return all(
        old is not None
        and old.band == new.band
        and abs(old.moment.bmjd_tdb - new.moment.bmjd_tdb) < _SAME_D
        and (old.moment.minus_d, old.moment.plus_d) == (new.moment.minus_d, new.moment.plus_d)
        for old, new in pairs
    )


def _already_known(system_name: str, known: Episode) -> Kept:
    data = {"system": system_name, "id": known.id, "cycle": known.cycle}
    return Kept("episodes-add", False, (f"{system_name}: already known as episode {known.id}",), data)


def _refuse_same_burst(known: Sequence[Episode], dated: Mapping[str, DatedEvent], system_name: str) -> None:
    """A stage dated nearly alike twice: two papers on one burst, which would read as a short period."""
    for episode in known:
        for stage, event in dated.items():
            found = getattr(episode, stage)
            if episode.state != "confirmed" or found is None:
                continue
            apart = abs(found.moment.bmjd_tdb - event.moment.bmjd_tdb)
            error = math.hypot(_size(found.moment), _size(event.moment))
            if apart > max(_SAME_BURST_D, 3.0 * error):
                continue
            raise Conflict(
                f"Episode {episode.id} of {system_name} has its {stage} {apart:.1f} d from this one.",
                why="So near it is one burst dated twice, and it would be read as a very short period.",
                hint=f"Keep the better date: campaign undo takes one back. If they are two bursts, say which "
                f'cycle this is: --cycle N (campaign episodes list "{system_name}").',
                code="episode-known",
                details={"episode": episode.id, "apart_d": apart},
            )


def _size(moment: Moment) -> float:
    return max(moment.minus_d or 0.0, moment.plus_d or 0.0)


def _refuse_second_date(
    known: Sequence[Episode], draft: Episode, dates: Mapping[str, object], system_name: str
) -> None:
    """A cycle has one onset, one maximum and one end; a stage still undated may come later."""
    for episode in known:
        if draft.cycle is None or episode.cycle != draft.cycle or episode.state != "confirmed":
            continue
        for stage in dates:
            found = getattr(episode, stage)
            if found is not None:
                raise Conflict(
                    f"Cycle {draft.cycle} of {system_name} has its {stage} already.",
                    why=f"Episode {episode.id} dates it {spoken_moment(found.moment)}.",
                    hint=f'See what is known with: campaign episodes list "{system_name}"',
                    code="episode-known",
                    details={"episode": episode.id},
                )


def list_episodes(db: str, system_name: str | None) -> list[tuple[str, Episode]]:
    """Episodes of one system or of all, oldest first.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    system_name : str or None
        Name or alias; None for all systems.

    Returns
    -------
    list of (str, Episode)
        System name and episode; instants ``bmjd_tdb``; confirmed ones with the cycle that the adopted
        solution gives them, where none was stated.

    Raises
    ------
    NotFound
        If the system is unknown.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    with store.reading(db) as connection:
        ids = None if system_name is None else [systems.find_system(connection, system_name).id]
        found = records.load_records(connection, ids, include_retired=True)
    return [(r.system.name, e) for r in sorted(found, key=lambda r: r.system.name) for e in counted(r)]


def counted(record: SystemRecord) -> tuple[Episode, ...]:
    """Episodes of a system, confirmed ones with the cycle that the adopted solution gives them.

    Parameters
    ----------
    record : SystemRecord
        A system; instants ``bmjd_tdb``.

    Returns
    -------
    tuple of Episode
        In the order of the record; a stated cycle stays.

    Notes
    -----
    Accuracy and source: see ``campaign.studies.cycles.with_cycles``.
    """
    adopted = next((s for s in record.solutions if s.adopted), None)
    known = {e.id: e for e in episodes_with_cycles(build_row(record, adopted))}
    return tuple(known.get(e.id, e) for e in record.episodes)
