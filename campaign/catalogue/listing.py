"""Observations as a list: by filters, with who entered them and what became of them."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import ColumnElement, Connection, and_, func, select

from campaign.catalogue.converting import columns_of
from campaign.catalogue.naming import name_key
from campaign.catalogue.observed import READ_COLUMNS, observations_from_rows
from campaign.catalogue.tables import observations, operations, sources, system_names
from campaign.catalogue.types import Names
from campaign.model.history import ListedObservation

_FATE = (
    "entered_at",
    "operation_id",
    "superseded_by_id",
    "superseded_at",
    "withdrawn_at",
    "withdrawn_why",
)


@dataclass(frozen=True, slots=True)
class Filters:
    """Which observations are wanted; None does not filter.

    ``source`` is found anywhere in the title. Without ``out_of_use`` only what counts is listed.
    """

    numbers: Collection[int] | None = None
    system_id: int | None = None
    kinds: Collection[str] | None = None
    bands: Collection[str] | None = None
    since_bmjd_tdb: float | None = None
    until_bmjd_tdb: float | None = None
    site_id: int | None = None
    source: str | None = None
    qualities: Collection[str] | None = None
    out_of_use: bool = False


def find_observations(
    connection: Connection, filters: Filters, limit: int | None = None
) -> tuple[list[ListedObservation], int]:
    """The latest observations that pass the filters, in order of time, and how many pass in all."""
    condition = condition_of(filters)
    columns = observations.c
    found = connection.execute(select(func.count()).select_from(observations).where(condition)).scalar_one()
    rows = connection.execute(
        select(*columns_of(observations, (*READ_COLUMNS, *_FATE)), operations.c.who)
        .join(operations, operations.c.id == columns.operation_id)
        .where(condition)
        .order_by(columns.bmjd_tdb.desc(), columns.id.desc())
        .limit(limit)
    ).all()
    return _listed(connection, rows[::-1]), int(found)


def bands_in_use(connection: Connection, filters: Filters) -> list[str]:
    """Bands of the observations that pass the filters."""
    rows = select(observations.c.band).where(condition_of(filters), observations.c.band.is_not(None))
    return sorted(band for band in connection.execute(rows.distinct()).scalars() if band is not None)


def condition_of(filters: Filters) -> ColumnElement[bool]:
    """The condition that an observation passes the filters."""
    columns = observations.c
    conditions: list[ColumnElement[bool]] = []
    for column, wanted in (
        (columns.id, filters.numbers),
        (columns.kind, filters.kinds),
        (columns.band, filters.bands),
        (columns.quality, filters.qualities),
    ):
        if wanted is not None:
            conditions.append(column.in_(sorted(wanted)))
    if filters.system_id is not None:
        conditions.append(columns.system_id == filters.system_id)
    if filters.site_id is not None:
        conditions.append(columns.site_id == filters.site_id)
    if filters.since_bmjd_tdb is not None:
        conditions.append(columns.bmjd_tdb >= filters.since_bmjd_tdb)
    if filters.until_bmjd_tdb is not None:
        conditions.append(columns.bmjd_tdb <= filters.until_bmjd_tdb)
    if filters.source is not None:
        part = sources.c.source_key.contains(name_key(filters.source), autoescape=True)
        conditions.append(columns.source_id.in_(select(sources.c.id).where(part)))
    if not filters.out_of_use:
        conditions += [columns.superseded_at.is_(None), columns.withdrawn_at.is_(None)]
    return and_(*conditions) if conditions else columns.id.is_not(None)


def _listed(connection: Connection, rows: Sequence[Sequence[Any]]) -> list[ListedObservation]:
    # Also names of systems that were taken back, in use ones last so that they win.
    names = Names(
        (system_id, name)
        for system_id, name in connection.execute(
            select(system_names.c.system_id, system_names.c.name)
            .where(system_names.c.name_rank == 0)
            .order_by(system_names.c.withdrawn_at.is_(None), system_names.c.id)
        )
    )
    first = len(READ_COLUMNS)
    return [
        ListedObservation(
            observation=observation,
            system=names[observation.system_id],
            utc=None,
            entered_at=row[first],
            operation_id=row[first + 1],
            superseded_by_id=row[first + 2],
            superseded_at=row[first + 3],
            withdrawn_at=row[first + 4],
            withdrawn_why=row[first + 5],
            entered_by=row[first + 6],
        )
        for observation, row in zip(observations_from_rows(connection, rows), rows, strict=True)
    ]
