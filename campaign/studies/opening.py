"""A first look at a catalogue: whether it can be read at all."""

from __future__ import annotations


def require_catalogue(db: str) -> None:
    """Open the catalogue for reading and close it again.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL (no unit).

    Raises
    ------
    DatabaseUnusable
        When it is missing, damaged, older or newer than this program, or no catalogue.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    from campaign.catalogue import store

    with store.reading(db):
        pass
