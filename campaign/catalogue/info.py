"""Facts about the campaign as a whole."""

from __future__ import annotations

from sqlalchemy import Connection, select

from campaign.catalogue.store import Writing
from campaign.catalogue.tables import campaign_info


def read_info(connection: Connection) -> dict[str, str]:
    """All facts by key: ``campaign_uid``, ``format``, ``begun_at``, and ``sample_as_of`` in the sample."""
    rows = connection.execute(select(campaign_info.c.key, campaign_info.c.value))
    return {key: value for key, value in rows}


def set_info(writing: Writing, key: str, value: str) -> bool:
    """Set one fact; False when it was so already."""
    found = writing.connection.execute(
        select(campaign_info.c.id).where(campaign_info.c.key == key)
    ).scalar_one_or_none()
    if found is not None:
        return writing.update(campaign_info, found, {"value": value})
    writing.insert(campaign_info, {"key": key, "value": value})
    return True
