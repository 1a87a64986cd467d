"""Which observations somebody asks for."""

from __future__ import annotations

from dataclasses import dataclass

from campaign.model.observations import ObservationKind, Quality


@dataclass(frozen=True, slots=True)
class ObservationChoice:
    """Observations by what they are; None or an empty tuple chooses all.

    ``source`` is a part of the source's text, whatever its case and spaces; bands are compared as they
    stand. ``also_out_of_use`` lets in what was superseded or withdrawn.
    """

    system_ids: frozenset[int] | None = None
    kinds: tuple[ObservationKind, ...] = ()
    bands: tuple[str, ...] = ()
    from_bmjd_tdb: float | None = None
    until_bmjd_tdb: float | None = None
    site_ids: tuple[int, ...] = ()
    source: str = ""
    qualities: tuple[Quality, ...] = ()
    also_out_of_use: bool = False
