"""Everything that a forecast needs to know, in a handful of statements for the whole campaign."""

from __future__ import annotations

from collections.abc import Collection
from datetime import datetime

from sqlalchemy import Connection

from campaign.catalogue.episodes import load_episodes
from campaign.catalogue.rules import load_rules
from campaign.catalogue.solutions import load_solutions
from campaign.catalogue.systems import load_systems
from campaign.model.records import SystemRecord


def load_records(
    connection: Connection,
    system_ids: Collection[int] | None = None,
    known_at: datetime | None = None,
    include_retired: bool = False,
) -> list[SystemRecord]:
    """Systems with solutions, rule in force and episodes, in the order of entry.

    Parameters
    ----------
    system_ids
        Only these; None for all.
    known_at
        An aware datetime: entries made later are hidden, and what was in force then counts. Positions,
        names and stars are always the present ones.
    include_retired
        Whether retired systems come too.
    """
    wanted = None if system_ids is None else set(system_ids)
    found = load_systems(connection, wanted, include_retired=include_retired, known_at=known_at)
    solutions = load_solutions(connection, wanted, known_at)
    rules = load_rules(connection, wanted, known_at)
    episodes = load_episodes(connection, wanted, known_at)
    return [
        SystemRecord(
            system,
            tuple(solutions.get(system.id, ())),
            rules.get(system.id),
            tuple(episodes.get(system.id, ())),
        )
        for system in found
    ]
