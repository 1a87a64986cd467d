"""Catalogue, log and forecaster for binaries that make dust in bursts."""

from __future__ import annotations

from typing import TYPE_CHECKING

if TYPE_CHECKING:
    import os

    from campaign.face import Campaign

__version__ = "0.1.0"


def open(path: str | os.PathLike[str] | None = None) -> Campaign:
    """A catalogue for Python: its tables as DataFrames, its forecast as dataclasses.

    Parameters
    ----------
    path : str, path or None
        A file or an SQLAlchemy URL; None for ``$CAMPAIGN_DB``, else the user's data folder.

    Returns
    -------
    campaign.face.Campaign
        With ``observations``, ``systems``, ``solutions``, ``episodes`` and ``upcoming``. Nothing has to be
        closed.

    Raises
    ------
    DatabaseUnusable
        When there is no catalogue that can be read.
    """
    # Everything else is imported only now: importing the package stays quick.
    from campaign.face import Campaign

    return Campaign(path)
