"""Where values come from: publications, data releases, people."""

from __future__ import annotations

from sqlalchemy import Connection, select

from campaign.catalogue.naming import name_key, tidy_name
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import sources
from campaign.catalogue.types import Names


def source_id(writing: Writing, text: str | None) -> int | None:
    """The number of a source, entered if it is new; None for empty text.

    The same words in other case or spacing are the same source.
    """
    if text is None or not text.strip():
        return None
    title = tidy_name(text)
    key = name_key(title)
    found = writing.connection.execute(
        select(sources.c.id).where(sources.c.source_key == key)
    ).scalar_one_or_none()
    if found is not None:
        return int(found)
    return writing.insert(sources, {"title": title, "source_key": key, "entered_at": writing.at})


def list_sources(connection: Connection) -> list[str]:
    """All sources in the order of entry."""
    return list(connection.execute(select(sources.c.title).order_by(sources.c.id)).scalars())


def source_titles(connection: Connection) -> Names:
    """Titles by number."""
    rows = connection.execute(select(sources.c.id, sources.c.title))
    return Names((number, title) for number, title in rows)
