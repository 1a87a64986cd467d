"""List observations by system, kind, band, dates, site, source and quality."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from dataclasses import dataclass, replace

from sqlalchemy import Connection

from campaign.catalogue import listing, sites, store, systems
from campaign.model.bands import BandUse
from campaign.model.history import ListedObservation, ObservationList
from campaign.model.instants import TypedInstant
from campaign.physics.timescales import utc_iso
from campaign.studies.bands import band_warnings, mixed_bands
from campaign.studies.instants import axis_instant, refuse_reversed


@dataclass(frozen=True, slots=True)
class Wanted:
    """What somebody asks for; None does not filter. ``out_of_use`` also shows what no longer counts."""

    system: str | None = None
    kinds: tuple[str, ...] | None = None
    bands: tuple[str, ...] | None = None
    since: TypedInstant | None = None
    until: TypedInstant | None = None
    site: str | None = None
    source: str | None = None
    qualities: tuple[str, ...] | None = None
    out_of_use: bool = False


def list_observations(db: str, wanted: Wanted, limit: int | None = None) -> ObservationList:
    """Observations that pass the filters, the latest ``limit`` of them, in order of time.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    wanted : Wanted
        The filters; a day, month or year given as a date counts whole.
    limit : int, optional
        At most so many.

    Returns
    -------
    ObservationList
        ``found`` counts all that pass.

    Raises
    ------
    NotFound
        Unknown system or site; the nearest names are in the details.

    Notes
    -----
    Accuracy: dates are compared without light time, up to 8.4 min. Source: the catalogue.
    """
    with store.reading(db) as connection:
        filters = filters_of(connection, wanted)
        rows, found = listing.find_observations(connection, filters, limit)
        warnings = _mixed(rows) if found else _nothing_found(connection, filters)
    return ObservationList(with_utc(rows), found, warnings=tuple(warnings))


def observations_by_number(connection: Connection, numbers: Collection[int]) -> tuple[ListedObservation, ...]:
    """Observations by number, in use or not.

    Parameters
    ----------
    connection : Connection
        An open catalogue.
    numbers : collection of int
        Numbers of observations; those that are not there are left out.

    Returns
    -------
    tuple of ListedObservation
        In order of time.

    Notes
    -----
    Accuracy: not applicable. Source: the catalogue.
    """
    filters = listing.Filters(numbers=numbers, out_of_use=True)
    return with_utc(listing.find_observations(connection, filters)[0])


def filters_of(connection: Connection, wanted: Wanted) -> listing.Filters:
    """Filters of the catalogue for what somebody asks for.

    Parameters
    ----------
    connection : Connection
        An open catalogue.
    wanted : Wanted
        As asked.

    Returns
    -------
    Filters
        Numbers in place of names, ``bmjd_tdb`` in place of dates.

    Raises
    ------
    NotFound
        Unknown system or site.
    InputRefused
        Dates that end before they begin.

    Notes
    -----
    Accuracy: dates without light time, up to 8.4 min. Source: project convention.
    """
    refuse_reversed(wanted.since, wanted.until)
    return listing.Filters(
        system_id=None if wanted.system is None else systems.find_system(connection, wanted.system).id,
        kinds=wanted.kinds,
        bands=wanted.bands,
        since_bmjd_tdb=_edge(wanted.since, -0.5),
        until_bmjd_tdb=_edge(wanted.until, 0.5),
        site_id=None if wanted.site is None else sites.find_site(connection, wanted.site).id,
        source=wanted.source,
        qualities=wanted.qualities,
        out_of_use=wanted.out_of_use,
    )


def with_utc(rows: Sequence[ListedObservation]) -> tuple[ListedObservation, ...]:
    """The same observations with their instant in UTC at the barycentre.

    Parameters
    ----------
    rows : sequence of ListedObservation
        Instants ``bmjd_tdb``.

    Returns
    -------
    tuple of ListedObservation
        ``utc`` is None outside the years 1 to 9999.

    Notes
    -----
    Accuracy: rounded to 1 s. Source: ``campaign.physics.timescales``.
    """
    texts = utc_iso([row.observation.moment.bmjd_tdb for row in rows])
    return tuple(replace(row, utc=text) for row, text in zip(rows, texts, strict=True))


def _edge(instant: TypedInstant | None, side: float) -> float | None:
    return None if instant is None else axis_instant(instant) + side * instant.width_d


def _mixed(rows: Sequence[ListedObservation]) -> list[str]:
    """Bands of the list in which magnitudes of more than one photometric system stand side by side."""
    uses = (
        BandUse(row.system, row.observation.band or "", row.observation.photometric_system, 1)
        for row in rows
        if row.observation.kind == "photometry" and row.in_use
    )
    return list(band_warnings([mixed for mixed in mixed_bands(uses) if mixed.photometric_systems]))


def _nothing_found(connection: Connection, filters: listing.Filters) -> list[str]:
    """Why nothing was found, where that is known: names of bands are taken as they are written."""
    if listing.find_observations(connection, listing.Filters(out_of_use=True), 1)[1] == 0:
        return [
            "the catalogue holds no observations yet; enter one with campaign log, a table with campaign load"
        ]
    if filters.bands is None:
        return []
    there = listing.bands_in_use(connection, replace(filters, bands=None))
    if not there:
        return []
    return [f"none in band {', '.join(sorted(filters.bands))}; there are: {', '.join(there)}"]
