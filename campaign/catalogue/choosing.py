"""A choice of observations as a condition of a statement."""

from __future__ import annotations

from sqlalchemy import ColumnElement, and_, select

from campaign.catalogue.naming import name_key
from campaign.catalogue.tables import observations, sources
from campaign.model.choice import ObservationChoice


def chosen(choice: ObservationChoice) -> ColumnElement[bool]:
    """The condition that an observation is of those asked for, its system apart.

    Numbers of systems may be too many for one statement: see ``converting.among``.
    """
    columns = observations.c
    conditions: list[ColumnElement[bool]] = []
    if not choice.also_out_of_use:
        conditions += [columns.superseded_at.is_(None), columns.withdrawn_at.is_(None)]
    if choice.kinds:
        conditions.append(columns.kind.in_(choice.kinds))
    if choice.bands:
        conditions.append(columns.band.in_(choice.bands))
    if choice.from_bmjd_tdb is not None:
        conditions.append(columns.bmjd_tdb >= choice.from_bmjd_tdb)
    if choice.until_bmjd_tdb is not None:
        conditions.append(columns.bmjd_tdb <= choice.until_bmjd_tdb)
    if choice.site_ids:
        conditions.append(columns.site_id.in_(choice.site_ids))
    if choice.source:
        part = name_key(choice.source)
        named = select(sources.c.id).where(sources.c.source_key.contains(part, autoescape=True))
        conditions.append(columns.source_id.in_(named))
    if choice.qualities:
        conditions.append(columns.quality.in_(choice.qualities))
    return and_(True, *conditions)
