"""Observed bursts of dust production. A changed episode is a new row; the old one stays, withdrawn."""

from __future__ import annotations

from collections.abc import Collection, Mapping
from datetime import datetime
from typing import Any, Literal

from sqlalchemy import ColumnElement, Connection, select

from campaign.catalogue.converting import among, columns_of, in_force, kept, moment_names, moment_values
from campaign.catalogue.sources import source_id, source_titles
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import changes, episodes, operations
from campaign.errors import Conflict, NotFound
from campaign.model.instants import Moment
from campaign.model.systems import DatedEvent, Episode

EpisodeState = Literal["proposed", "confirmed", "rejected"]

_STAGES = ("onset", "maximum", "end")


def add_episode(writing: Writing, episode: Episode) -> int:
    """Enter an episode; ``episode.id`` is ignored."""
    return _insert(writing, episode, None)


def decide_episode(writing: Writing, episode_id: int, state: EpisodeState) -> bool:
    """Confirm or reject an episode, or make it a proposal again; False when it was so already.

    Who asks what was known before the decision sees a proposal.
    """
    row = _present_row(writing.connection, episode_id)
    if row.state == state:
        return False
    decided_at = None if state == "proposed" else writing.at
    return writing.update(episodes, episode_id, {"state": state, "decided_at": decided_at})


def amend_episode(writing: Writing, episode_id: int, episode: Episode) -> int:
    """Put a corrected episode in the place of another, which stays in the catalogue as withdrawn.

    Raises
    ------
    NotFound
    Conflict
        When it was withdrawn before.
    """
    withdraw_episode(writing, episode_id)
    return _insert(writing, episode, episode_id)


def withdraw_episode(writing: Writing, episode_id: int) -> None:
    """Take an episode out of use; it stays in the catalogue.

    Raises
    ------
    NotFound
    Conflict
        When it was withdrawn before.
    """
    _present_row(writing.connection, episode_id)
    writing.update(episodes, episode_id, {"withdrawn_at": writing.at})


def system_of_episode(connection: Connection, episode_id: int) -> int:
    """Number of the system that an episode in use is of.

    Raises
    ------
    NotFound
    Conflict
        When it was withdrawn.
    """
    return int(_present_row(connection, episode_id).system_id)


def episodes_of(connection: Connection, system_id: int, *, known_at: datetime | None = None) -> list[Episode]:
    """The system's episodes as known at ``known_at``, in order of date."""
    return load_episodes(connection, {system_id}, known_at).get(system_id, [])


def load_episodes(
    connection: Connection, system_ids: Collection[int] | None, known_at: datetime | None
) -> dict[int, list[Episode]]:
    """Episodes by system, in order of their earliest date, in two statements."""
    in_use = in_force(episodes.c.entered_at, episodes.c.withdrawn_at, known_at)
    states = {} if known_at is None else _states_then(connection, known_at)
    return _load(connection, system_ids, in_use, states)


def load_withdrawn_episodes(
    connection: Connection, system_ids: Collection[int] | None
) -> dict[int, list[Episode]]:
    """Episodes out of use by system, in order of their earliest date."""
    return _load(connection, system_ids, episodes.c.withdrawn_at.is_not(None), {})


def _load(
    connection: Connection,
    system_ids: Collection[int] | None,
    condition: ColumnElement[bool],
    states: Mapping[int, EpisodeState],
) -> dict[int, list[Episode]]:
    rows = connection.execute(
        select(*columns_of(episodes, _COLUMNS))
        .where(among(episodes.c.system_id, system_ids), condition)
        .order_by(episodes.c.system_id, episodes.c.id)
    ).all()
    titles = source_titles(connection) if rows else {}
    by_system: dict[int, list[Episode]] = {}
    for row in rows:
        if kept(row[1], system_ids):
            episode = _episode(row, titles, states.get(row[0]) or row[3])
            by_system.setdefault(row[1], []).append(episode)
    for found in by_system.values():
        found.sort(key=_earliest_bmjd_tdb)
    return by_system


def _states_then(connection: Connection, known_at: datetime) -> dict[int, EpisodeState]:
    """The state at ``known_at`` of every episode that was decided later, from the journal.

    The row itself knows the last decision only, and one that was taken back not at all.
    """
    rows = connection.execute(
        select(changes.c.row_id, changes.c.before)
        .join(operations, operations.c.id == changes.c.operation_id)
        .where(
            changes.c.table_name == episodes.name, changes.c.action == "update", operations.c.at > known_at
        )
        .order_by(changes.c.id.desc())
    )
    return {row_id: before["state"] for row_id, before in rows if "state" in before}


_COLUMNS = (
    "id",
    "system_id",
    "cycle",
    "state",
    "source_id",
    "note",
    *(name for stage in _STAGES for name in (f"{stage}_band", f"{stage}_method", *moment_names(stage))),
)


def _episode(row: Any, titles: Mapping[int, str], state: EpisodeState) -> Episode:
    return Episode(
        id=row[0],
        system_id=row[1],
        cycle=row[2],
        state=state,
        onset=_dated_event(row[6:14]),
        maximum=_dated_event(row[14:22]),
        end=_dated_event(row[22:30]),
        source="" if row[4] is None else titles[row[4]],
        note=row[5],
    )


def _dated_event(columns: Any) -> DatedEvent | None:
    band, method, *moment = columns
    return None if moment[0] is None else DatedEvent(Moment(*moment), band, method)


def _earliest_bmjd_tdb(episode: Episode) -> tuple[float, int]:
    dates = [event.moment.bmjd_tdb for event in (episode.onset, episode.maximum, episode.end) if event]
    return (min(dates, default=float("inf")), episode.id)


def _insert(writing: Writing, episode: Episode, replaces_id: int | None) -> int:
    values: dict[str, Any] = {}
    for stage in _STAGES:
        event: DatedEvent | None = getattr(episode, stage)
        values |= moment_values(stage, None if event is None else event.moment)
        values[f"{stage}_band"] = None if event is None else event.band
        values[f"{stage}_method"] = None if event is None else event.method
    return writing.insert(
        episodes,
        {
            "system_id": episode.system_id,
            "cycle": episode.cycle,
            "state": episode.state,
            **values,
            "source_id": source_id(writing, episode.source),
            "note": episode.note,
            "entered_at": writing.at,
            "decided_at": None if episode.state == "proposed" else writing.at,
            "replaces_id": replaces_id,
        },
    )


def _present_row(connection: Connection, episode_id: int) -> Any:
    row = connection.execute(
        select(episodes.c.state, episodes.c.withdrawn_at, episodes.c.system_id).where(
            episodes.c.id == episode_id
        )
    ).first()
    if row is None:
        raise NotFound(
            f"There is no episode number {episode_id}.",
            why="None was ever entered under it.",
            hint="See their numbers with: campaign episodes list.",
            code="episode-not-found",
        )
    if row.withdrawn_at is not None:
        raise Conflict(
            f"Episode number {episode_id} was withdrawn before.",
            why="A withdrawn entry stays as it is.",
            hint="See the present ones with: campaign episodes list.",
            code="already-withdrawn",
        )
    return row
