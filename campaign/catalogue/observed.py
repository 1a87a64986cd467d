"""Reading observations: as dataclasses, as counts, and light curves as columns."""

from __future__ import annotations

from collections.abc import Collection, Sequence
from datetime import datetime
from typing import TYPE_CHECKING, Any

from sqlalchemy import ColumnElement, Connection, and_, func, select, true

from campaign.catalogue.converting import among, columns_of, in_use, kept, measured_or_none
from campaign.catalogue.sources import source_titles
from campaign.catalogue.tables import lapses, observations, sites, system_names
from campaign.catalogue.types import Names
from campaign.errors import NotFound
from campaign.model.bands import BandUse
from campaign.model.instants import Moment
from campaign.model.observations import Observation
from campaign.model.verification import UsedPhotometry

if TYPE_CHECKING:
    from campaign.model.arrays import PhotometryArrays

# Columns that bear the name of their field and its value as it is.
PLAIN_COLUMNS = (
    "system_id",
    "kind",
    "unit",
    "limit_side",
    "limit_sigma",
    "band",
    "photometric_system",
    "frequency_ghz",
    "energy_low_kev",
    "energy_high_kev",
    "star",
    "species",
    "correlation",
    "feature",
    "measured_at",
    "plate_scale_error",
    "shell_index",
    "observer",
    "instrument",
    "comparison_star",
    "quality",
    "text",
)


def get_observation(connection: Connection, observation_id: int) -> Observation:
    """The observation of that number, in use or not.

    Raises
    ------
    NotFound
    """
    found = _read(connection, observations.c.id == observation_id)
    if not found:
        raise no_observation(observation_id)
    return found[0]


def observations_of(
    connection: Connection,
    system_ids: Collection[int] | None = None,
    kinds: Collection[str] | None = None,
    *,
    as_of_bmjd_tdb: float | None = None,
    known_at: datetime | None = None,
) -> list[Observation]:
    """Observations in use, by system and then by time.

    Parameters
    ----------
    system_ids, kinds
        Only these; None for all.
    as_of_bmjd_tdb
        Hide what was observed later.
    known_at
        Hide what was entered later; what was in use then counts.
    """
    wanted = None if system_ids is None else set(system_ids)
    condition = and_(
        among(observations.c.system_id, wanted),
        true() if kinds is None else observations.c.kind.in_(sorted(kinds)),
        _in_use(as_of_bmjd_tdb, known_at),
    )
    return [found for found in _read(connection, condition) if kept(found.system_id, wanted)]


def count_observations(
    connection: Connection, system_ids: Collection[int] | None = None
) -> dict[int, dict[str, int]]:
    """How many observations are in use, by system and kind."""
    wanted = None if system_ids is None else set(system_ids)
    rows = connection.execute(
        select(observations.c.system_id, observations.c.kind, func.count())
        .where(among(observations.c.system_id, wanted), _in_use(None, None))
        .group_by(observations.c.system_id, observations.c.kind)
        .order_by(observations.c.system_id, observations.c.kind)
    )
    counts: dict[int, dict[str, int]] = {}
    for system_id, kind, number in rows.all():
        if kept(system_id, wanted):
            counts.setdefault(system_id, {})[kind] = number
    return counts


def photometry_used(
    connection: Connection,
    system_ids: Collection[int] | None,
    *,
    as_of_bmjd_tdb: float | None,
    known_at: datetime | None,
) -> dict[int, UsedPhotometry]:
    """How much of each light curve there was, and its newest point by time and by entry."""
    wanted = None if system_ids is None else set(system_ids)
    columns = observations.c
    rows = connection.execute(
        select(columns.system_id, func.count(), func.max(columns.bmjd_tdb), func.max(columns.entered_at))
        .where(
            among(columns.system_id, wanted),
            columns.kind == "photometry",
            _in_use(as_of_bmjd_tdb, known_at),
        )
        .group_by(columns.system_id)
    )
    return {row[0]: UsedPhotometry(row[1], row[2], row[3]) for row in rows.all() if kept(row[0], wanted)}


def band_uses(connection: Connection, system_ids: Collection[int] | None = None) -> list[BandUse]:
    """How many magnitudes in use are in which band and photometric system, by primary name."""
    wanted = None if system_ids is None else set(system_ids)
    columns = observations.c
    counted = (
        select(columns.system_id, columns.band, columns.photometric_system, func.count().label("points"))
        .where(
            among(columns.system_id, wanted),
            columns.kind == "photometry",
            _in_use(None, None),
        )
        .group_by(columns.system_id, columns.band, columns.photometric_system)
        .subquery()
    )
    rows = connection.execute(
        select(counted.c.system_id, system_names.c.name, *list(counted.c)[1:])
        .join(system_names, system_names.c.system_id == counted.c.system_id)
        .where(system_names.c.name_rank == 0, system_names.c.withdrawn_at.is_(None))
    )
    return [
        BandUse(name, band or "", own, points)
        for number, name, band, own, points in rows.all()
        if kept(number, wanted)
    ]


def photometry_arrays(
    connection: Connection,
    system_ids: Collection[int] | None = None,
    *,
    as_of_bmjd_tdb: float | None = None,
    known_at: datetime | None = None,
) -> dict[int, PhotometryArrays]:
    """Light curves as columns, by system; systems without photometry are left out."""
    import numpy as np

    from campaign.model.arrays import PhotometryArrays

    wanted = None if system_ids is None else set(system_ids)
    rows = connection.execute(
        select(*columns_of(observations, _ARRAY_COLUMNS))
        .where(
            among(observations.c.system_id, wanted),
            observations.c.kind == "photometry",
            _in_use(as_of_bmjd_tdb, known_at),
        )
        .order_by(observations.c.system_id, observations.c.bmjd_tdb, observations.c.id)
    ).all()
    if not rows:
        return {}
    titles = source_titles(connection)
    columns = list(zip(*rows, strict=True))
    system = np.array(columns[0])
    starts = np.flatnonzero(np.r_[True, system[1:] != system[:-1]])
    # None becomes NaN, which is what an unknown error is in these columns.
    reals = [np.array(columns[index], dtype=np.float64) for index in range(2, 9)]
    side = np.array([_SIDE[value] for value in columns[9]], dtype=np.int8)
    band = np.array([value or "" for value in columns[10]])
    source = np.array(["" if value is None else titles[value] for value in columns[11]])
    site = np.array([-1 if value is None else value for value in columns[12]], dtype=np.int64)
    own_system = np.array([value or "" for value in columns[14]])
    quality, number = np.array(columns[13]), np.array(columns[1], dtype=np.int64)
    found = {}
    for first, last in zip(starts, [*starts[1:], len(system)], strict=True):
        if not kept(int(system[first]), wanted):
            continue
        part = slice(first, last)
        time, time_minus, time_plus, mag, mag_minus, mag_plus, limit_sigma = (x[part] for x in reals)
        found[int(system[first])] = PhotometryArrays(
            id=number[part],
            bmjd_tdb=time,
            minus_d=time_minus,
            plus_d=time_plus,
            mag=mag,
            mag_minus=mag_minus,
            mag_plus=mag_plus,
            limit_side=side[part],
            limit_sigma=limit_sigma,
            band=band[part],
            source=source[part],
            site_id=site[part],
            quality=quality[part],
            photometric_system=own_system[part],
        )
    return found


_SIDE = {None: 0, "above": 1, "below": -1}
_ARRAY_COLUMNS = (
    "system_id",
    "id",
    "bmjd_tdb",
    "time_minus_d",
    "time_plus_d",
    "value",
    "value_minus",
    "value_plus",
    "limit_sigma",
    "limit_side",
    "band",
    "source_id",
    "site_id",
    "quality",
    "photometric_system",
)
_TIME = ("bmjd_tdb", "time_minus_d", "time_plus_d", "time_text", "time_scale", "time_place")
_VALUES = ("value", "value_minus", "value_plus")
_ANGLE = ("position_angle_deg", "position_angle_deg_minus", "position_angle_deg_plus")
READ_COLUMNS = ("id", "uid", "site_id", "source_id", *_TIME, *_VALUES, *_ANGLE, *PLAIN_COLUMNS)


def _in_use(as_of_bmjd_tdb: float | None, known_at: datetime | None) -> ColumnElement[bool]:
    columns = observations.c
    conditions = [in_use(columns.superseded_at, known_at), in_use(columns.withdrawn_at, known_at)]
    if known_at is not None:
        # A whole load that was taken back and put back again was out of use in between.
        lapsed = select(lapses.c.brought_by_id).where(
            lapses.c.brought_by_id.is_not(None),
            lapses.c.table_name == observations.name,
            lapses.c.from_at <= known_at,
            lapses.c.until_at > known_at,
        )
        conditions += [columns.entered_at <= known_at, columns.operation_id.not_in(lapsed)]
    if as_of_bmjd_tdb is not None:
        conditions.append(columns.bmjd_tdb <= as_of_bmjd_tdb)
    return and_(*conditions)


def _read(connection: Connection, condition: ColumnElement[bool]) -> list[Observation]:
    rows = connection.execute(
        select(*columns_of(observations, READ_COLUMNS))
        .where(condition)
        .order_by(observations.c.system_id, observations.c.bmjd_tdb, observations.c.id)
    ).all()
    return observations_from_rows(connection, rows) if rows else []


def observations_from_rows(connection: Connection, rows: Sequence[Sequence[Any]]) -> list[Observation]:
    """Observations from rows that begin with ``READ_COLUMNS``."""
    titles = source_titles(connection)
    site_rows = connection.execute(select(sites.c.id, sites.c.name))
    site_names = Names((number, name) for number, name in site_rows)
    return [
        Observation(
            id=row[0],
            uid=row[1],
            site_id=row[2],
            site=None if row[2] is None else site_names[row[2]],
            source=None if row[3] is None else titles[row[3]],
            moment=Moment(*row[4:10]),
            value=measured_or_none(row[10], row[11], row[12]),
            position_angle_deg=measured_or_none(row[13], row[14], row[15]),
            **dict(zip(PLAIN_COLUMNS, row[16 : 16 + len(PLAIN_COLUMNS)], strict=True)),
        )
        for row in rows
    ]


def no_observation(observation_id: int) -> NotFound:
    """The error for a number that is not there."""
    return NotFound(
        f"There is no observation number {observation_id}.",
        why="Every observation that was entered has a number; this one has not been given.",
        hint="See their numbers with: campaign observations.",
        code="observation-not-found",
    )
