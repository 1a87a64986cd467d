"""Places to observe from."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import fields
from typing import Any

from sqlalchemy import Connection, and_, select

from campaign.catalogue.converting import columns_of
from campaign.catalogue.naming import name_key, nearest_names, tidy_name
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import sites
from campaign.errors import Conflict, NotFound
from campaign.model.systems import Site

_FIELDS = tuple(field.name for field in fields(Site))


def add_site(writing: Writing, site: Site) -> int:
    """Enter a site; ``site.id`` is ignored.

    Raises
    ------
    Conflict
        ``site-taken``, when there is a site of that name.
    InputRefused
        For a value that the columns refuse.
    """
    values = _site_values(site)
    _refuse_taken(writing.connection, values, None)
    return writing.insert(sites, {**values, "entered_at": writing.at})


def change_site(writing: Writing, before: Site, after: Site) -> bool:
    """Bring a site from ``before`` to ``after``; False when they are alike.

    Raises
    ------
    Conflict
        ``changed-meanwhile``, when the catalogue no longer holds ``before``; ``site-taken``.
    """
    present = get_site(writing.connection, before.id)
    if present != before:
        raise Conflict(
            f"The site {present.name!r} was changed by somebody else in the meantime.",
            why="What was read before the change is no longer what the catalogue holds.",
            hint="Look at it again (campaign site list) and repeat your change.",
            code="changed-meanwhile",
            details={"read": str(before), "wanted": str(after), "present": str(present)},
        )
    values = _site_values(after)
    _refuse_taken(writing.connection, values, before.id)
    return writing.update(sites, before.id, values)


def find_site(connection: Connection, name: str) -> Site:
    """The site of that name, whatever its case and spaces.

    Raises
    ------
    NotFound
        ``site-not-found``; ``details["nearest"]`` lists names like it.
    """
    known = {name_key(site.name): site for site in list_sites(connection)}
    found = known.get(name_key(name))
    if found is not None:
        return found
    nearest = nearest_names(name, {key: site.name for key, site in known.items()})
    raise NotFound(
        f"There is no site named {name!r}.",
        why="The catalogue holds: " + ", ".join(repr(site.name) for site in known.values()) + "."
        if 0 < len(known) <= 10
        else f"The catalogue holds {len(known)} sites, none of that name.",
        hint="Did you mean " + " or ".join(f'"{near}"' for near in nearest) + "?"
        if nearest
        else 'See them with: campaign site list. Add one: campaign site add "NAME" --latitude ....',
        code="site-not-found",
        details={"name": name, "nearest": nearest},
    )


def get_site(connection: Connection, site_id: int) -> Site:
    """The site of that number.

    Raises
    ------
    NotFound
    """
    wanted = and_(sites.c.id == site_id, sites.c.withdrawn_at.is_(None))
    row = connection.execute(select(*columns_of(sites, _FIELDS)).where(wanted)).first()
    if row is None:
        raise NotFound(
            f"There is no site number {site_id}.",
            hint="See them with: campaign site list.",
            code="site-not-found",
        )
    return Site(*row)


def list_sites(connection: Connection) -> list[Site]:
    """All sites in the order of entry."""
    rows = connection.execute(
        select(*columns_of(sites, _FIELDS)).where(sites.c.withdrawn_at.is_(None)).order_by(sites.c.id)
    )
    return [Site(*row) for row in rows]


def _site_values(site: Site) -> dict[str, Any]:
    name = tidy_name(site.name)
    values = {field: getattr(site, field) for field in _FIELDS if field != "id"}
    return values | {"name": name, "name_key": name_key(name)}


def _refuse_taken(connection: Connection, values: Mapping[str, Any], own_id: int | None) -> None:
    row = connection.execute(
        select(sites.c.id, sites.c.name).where(
            sites.c.name_key == values["name_key"], sites.c.withdrawn_at.is_(None)
        )
    ).first()
    if row is not None and row.id != own_id:
        raise Conflict(
            f"There is already a site named {row.name!r}.",
            why="Names of sites are compared without regard to case and spaces.",
            hint="Choose another name, or look at the one there: campaign site list.",
            code="site-taken",
            details={"name": row.name},
        )
