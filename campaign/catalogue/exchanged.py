"""Observations as rows of an exchanged table, one at a time: no table is too long for the memory."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from itertools import groupby
from operator import itemgetter
from typing import Any

from sqlalchemy import Connection, func, select

from campaign.catalogue.converting import among, columns_of, kept, measured_names
from campaign.catalogue.listing import Filters, condition_of
from campaign.catalogue.sources import source_titles
from campaign.catalogue.tables import observations, sites
from campaign.catalogue.types import unreadable
from campaign.model.exchange_columns import UNIT_WORDS, Cell

_BEFORE_UNIT = (
    "kind", "bmjd_tdb", "time_minus_d", "time_plus_d", "time_text", "time_scale", "time_place",
    "value", "value_minus", "value_plus",
)  # fmt: skip
_BEFORE_SITE = (
    "limit_side", "limit_sigma", "band", "photometric_system", "frequency_ghz", "energy_low_kev",
    "energy_high_kev", "star", "species", *measured_names("position_angle_deg"), "correlation", "feature",
    "measured_at", "plate_scale_error", "shell_index",
)  # fmt: skip
_BEFORE_SOURCE = ("observer", "instrument", "comparison_star")
_LAST = ("quality", "text")
_SITE = (
    "name", "kind", "latitude_deg", "longitude_deg_east", "height_m", "horizon_deg", "elongation_min_deg",
    "elongation_max_deg", "time_zone",
)  # fmt: skip
_READ = (
    "uid", *_BEFORE_UNIT, "unit", *_BEFORE_SITE, "site_id", *_BEFORE_SOURCE, "source_id", *_LAST,
    "superseded_by_id", "withdrawn_at", "withdrawn_why",
)  # fmt: skip
_UNIT = 1 + len(_BEFORE_UNIT)
_SITE_ID = _UNIT + 1 + len(_BEFORE_SITE)
_SOURCE_ID = _SITE_ID + 1 + len(_BEFORE_SOURCE)
_END = _SOURCE_ID + 1 + len(_LAST)
_BMJD_TDB = _READ.index("bmjd_tdb")
_ROWS_AT_ONCE = 2_000


def exchanged_columns() -> tuple[str, ...]:
    """Names of the columns that :func:`exchanged_observations` fills, in its order."""
    site = ("site", *(f"site_{name}" for name in _SITE[1:]))
    first = ("uid", "system", *_BEFORE_UNIT, "unit", *_BEFORE_SITE, *site)
    return (*first, *_BEFORE_SOURCE, "source", *_LAST, "out_of_use", "superseded_by", "withdrawn_why")


def exchanged_observations(
    connection: Connection, systems: Sequence[tuple[int, str]], filters: Filters
) -> Iterator[tuple[Cell, ...]]:
    """Rows of the chosen observations: system by system as given, then by time, then by ``uid``.

    Parameters
    ----------
    systems
        Number and primary name of each system wanted.
    filters
        Of other kinds than by system. The last three cells are there only where what is out of use is
        wanted too.
    """
    # Neither numbers nor the order of entry may show: they differ from catalogue to catalogue. What
    # sorts a text differs too, from database to database, so that ties in time are broken here.
    query = (
        select(*columns_of(observations, _READ))
        .where(condition_of(filters))
        .order_by(observations.c.bmjd_tdb)
    )
    cells_of = _Cells(connection, also_out_of_use=filters.out_of_use)
    for number, name in systems:
        rows = connection.execute(
            query.where(observations.c.system_id == number),
            execution_options={"yield_per": _ROWS_AT_ONCE},
        )
        for _, simultaneous in groupby(rows, itemgetter(_BMJD_TDB)):
            for row in sorted(simultaneous, key=itemgetter(0)):
                yield cells_of.row(name, row)


def count_exchanged(
    connection: Connection, system_ids: Collection[int], filters: Filters
) -> Mapping[str | None, int]:
    """How many of the chosen observations have a value in which unit."""
    columns = observations.c
    rows = connection.execute(
        select(columns.system_id, columns.unit, func.count())
        .where(among(columns.system_id, system_ids), condition_of(filters))
        .group_by(columns.system_id, columns.unit)
    )
    counts: dict[str | None, int] = {}
    for system_id, unit, number in rows.all():
        if kept(system_id, system_ids):
            counts[unit] = counts.get(unit, 0) + number
    return counts


class _Cells:
    """Turns rows of the table into rows of cells, with names in the place of numbers."""

    def __init__(self, connection: Connection, *, also_out_of_use: bool) -> None:
        self._titles = source_titles(connection)
        self._sites = {
            row[0]: tuple(row[1:]) for row in connection.execute(select(*columns_of(sites, ("id", *_SITE))))
        }
        self._no_site = (None,) * len(_SITE)
        self._also_out_of_use = also_out_of_use
        # Whoever took the place of another need not be among the chosen.
        self._uids = _uids_of_successors(connection) if also_out_of_use else {}

    def row(self, system: str, row: Any) -> tuple[Cell, ...]:
        unit, site_id, source_id = row[_UNIT], row[_SITE_ID], row[_SOURCE_ID]
        cells = (
            row[0],
            system,
            *row[1:_UNIT],
            UNIT_WORDS.get(unit, unit),
            *row[_UNIT + 1 : _SITE_ID],
            *(self._no_site if site_id is None else self._site(site_id)),
            *row[_SITE_ID + 1 : _SOURCE_ID],
            None if source_id is None else self._titles[source_id],
            *row[_SOURCE_ID + 1 : _END],
        )
        return cells + self._out_of_use(*row[_END:]) if self._also_out_of_use else cells

    def _site(self, number: int) -> tuple[Cell, ...]:
        if number not in self._sites:
            raise unreadable(f"a reference to site {number} that is not there")
        return self._sites[number]

    def _out_of_use(
        self, successor: int | None, withdrawn_at: object, withdrawn_why: str | None
    ) -> tuple[Cell, ...]:
        if successor is not None:
            return "superseded", self._uids[successor], withdrawn_why
        return (None if withdrawn_at is None else "withdrawn"), None, withdrawn_why


def _uids_of_successors(connection: Connection) -> dict[int, str]:
    columns = observations.c
    replaced = select(columns.superseded_by_id).where(columns.superseded_by_id.is_not(None))
    rows = connection.execute(select(columns.id, columns.uid).where(columns.id.in_(replaced)))
    return {number: uid for number, uid in rows}
