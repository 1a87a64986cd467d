"""Make a database, empty or filled with the invented sample campaign."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from campaign.catalogue import (
    episodes,
    info,
    observations,
    rules,
    sites,
    solutions,
    store,
    systems,
    upgrade,
)
from campaign.errors import Conflict
from campaign.model.kept import Kept, Stamp
from campaign.physics.timescales import utc_iso


def begin_campaign(db: str, stamp: Stamp) -> Kept:
    """Make an empty database by running every migration.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.

    Returns
    -------
    Kept
        ``changed`` is False when the database was already there.

    Raises
    ------
    DatabaseUnusable
        If the place cannot hold a database or holds something else.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    report = upgrade.begin_database(db, at=stamp.at)
    text = "made a new database" if report.created else "the database is already there; nothing was changed"
    return Kept("begin", report.created, (f"{text}: {_where(db)}",), {"database": _where(db)})


def begin_sample_campaign(db: str, stamp: Stamp) -> Kept:
    """Make a database and fill it with the invented sample campaign.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    stamp : Stamp
        Who, when, which command.

    Returns
    -------
    Kept
        Counts of what was written.

    Raises
    ------
    Conflict
        If the database already holds systems.

    Notes
    -----
    Accuracy: not applicable. Source: the project's own invented data.
    """
    from campaign.studies.sample import load_sample

    upgrade.begin_database(db, at=stamp.at)
    sample = load_sample()
    own_date = utc_iso(np.array([sample.as_of_bmjd_tdb]))[0] or ""
    with store.writing(db, at=stamp.at, who=stamp.who, command=stamp.command) as writing:
        if systems.list_systems(writing.connection, include_retired=True):
            raise Conflict(
                "The sample campaign was not added.",
                why=f"{_where(db)} already holds systems of its own.",
                hint="Begin it elsewhere: campaign begin --sample --db demo.db",
                code="database-not-empty",
            )
        counts = _fill(writing, sample)
        info.set_info(writing, "sample_as_of", own_date)
        writing.summarise(f"filled with the sample campaign: {counts['systems']} systems")
    lines = (
        f"made the sample campaign in {_where(db)}: {counts['systems']} systems, "
        f"{counts['episodes']} confirmed episodes, {counts['observations']} observations",
        f"everything in it is invented; its own date is {own_date}, which stands in for today there",
    )
    return Kept("begin", True, lines, {"database": _where(db), **counts, "sample_as_of": own_date})


def _fill(writing: store.Writing, sample: Any) -> dict[str, int]:
    site_ids = {site.id: sites.add_site(writing, site) for site in sample.sites}
    system_ids: dict[int, int] = {}
    episode_count = 0
    for record in sample.records:
        system_id = systems.add_system(writing, record.system)
        system_ids[record.system.id] = system_id
        weights: dict[int, float] = {}
        for solution in record.solutions:
            solution_id = solutions.add_solution(writing, replace(solution, system_id=system_id))
            if solution.adopted and solution.weight is None:
                solutions.adopt_alone(writing, solution_id)
            elif solution.adopted and solution.weight is not None:
                weights[solution_id] = solution.weight
        if weights:
            solutions.adopt_weighted(writing, system_id, weights)
        if record.rule is not None:
            rules.set_rule(writing, replace(record.rule, system_id=system_id))
        for episode in record.episodes:
            episodes.add_episode(writing, replace(episode, system_id=system_id))
            episode_count += 1
    rows = [
        replace(
            observation,
            system_id=system_ids[observation.system_id],
            site_id=None if observation.site_id is None else site_ids[observation.site_id],
        )
        for observation in sample.observations()
    ]
    added, _ = observations.add_observations(writing, rows)
    return {"systems": len(system_ids), "episodes": episode_count, "observations": added}


def _where(db: str) -> str:
    if "://" not in db:
        return db
    from sqlalchemy.engine import make_url

    return make_url(db).render_as_string(hide_password=True)


def upgrade_campaign(db: str) -> Kept:
    """Bring an older database up to date, after a snapshot.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.

    Returns
    -------
    Kept
        ``changed`` is False when it was up to date.

    Raises
    ------
    DatabaseUnusable
        If it is missing, foreign, damaged or newer than this program.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    report = upgrade.upgrade_database(db)
    data = {"database": _where(db), "from_revision": report.from_revision, "to_revision": report.to_revision}
    if report.from_revision == report.to_revision:
        return Kept("upgrade", False, (f"{_where(db)} is up to date",), data | {"snapshot": None})
    lines = [f"upgraded {_where(db)} from revision {report.from_revision} to {report.to_revision}"]
    if report.snapshot:
        lines.append(f"the database as it was is kept as {report.snapshot}")
    return Kept("upgrade", True, tuple(lines), data | {"snapshot": report.snapshot})
