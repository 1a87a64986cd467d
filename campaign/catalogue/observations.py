"""Observations of every kind: entering, correcting and reading them.

Nothing is erased: a corrected observation supersedes the old row, a wrong one is withdrawn.
"""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from datetime import datetime
from hashlib import blake2b
from typing import TYPE_CHECKING, Any

from sqlalchemy import ColumnElement, Connection, and_, func, or_, select, true

from campaign.catalogue.converting import among, columns_of, kept, measured_or_none, measured_values
from campaign.catalogue.sites import find_site
from campaign.catalogue.sources import source_id, source_titles
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import observations, sites
from campaign.catalogue.types import Names
from campaign.errors import Conflict, NotFound
from campaign.model.instants import Moment
from campaign.model.observations import Observation

if TYPE_CHECKING:
    from campaign.model.arrays import PhotometryArrays

_KEYS_IN_STATEMENT = 500

_PLAIN = (
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
# What was measured, as against how well and by whom: two entries alike in these are one observation.
_SAMENESS = (
    "system_id",
    "kind",
    "unit",
    "limit_side",
    "band",
    "frequency_ghz",
    "energy_low_kev",
    "energy_high_kev",
    "star",
    "species",
    "feature",
    "measured_at",
    "shell_index",
    "site_id",
    "value",
    "position_angle_deg",
)


def add_observation(writing: Writing, observation: Observation) -> tuple[int, bool]:
    """Enter an observation, unless it is in the catalogue already.

    ``id`` is ignored; an empty ``uid`` is filled in. The site may be given by number or by name.

    Returns
    -------
    (int, bool)
        Its number, and whether it was there already: the same system, instant, kind, band, site and
        value, or the same ``uid``.
    """
    numbers = _Numbers(writing)
    row = _row(writing, observation, numbers)
    known = _already_logged(writing.connection, [row])
    found = known.get(row["uid"]) or known.get(row["sameness"])
    if found is not None:
        return found, True
    row["source_id"] = numbers.source(observation.source)
    return writing.insert(observations, {**row, "operation_id": writing.operation_id}), False


def add_observations(writing: Writing, entries: Sequence[Observation]) -> tuple[int, int]:
    """Enter many observations, and return how many were new and how many were there already."""
    numbers = _Numbers(writing)
    rows = [_row(writing, entry, numbers) for entry in entries]
    seen: set[str] = set(_already_logged(writing.connection, rows))
    fresh = []
    for row, entry in zip(rows, entries, strict=True):
        if row["uid"] in seen or row["sameness"] in seen:
            continue
        seen.update((row["uid"], row["sameness"]))
        # Only now, so that what is known already does not bring a source with it.
        row["source_id"] = numbers.source(entry.source)
        fresh.append(row)
    writing.insert_many(observations, fresh)
    return len(fresh), len(rows) - len(fresh)


def supersede_observation(writing: Writing, observation_id: int, observation: Observation) -> int:
    """Put a corrected observation in the place of another, which stays in the catalogue.

    Raises
    ------
    NotFound
    Conflict
        When the old one is out of use already, or the corrected one is in the catalogue already.
    """
    _refuse_out_of_use(writing.connection, observation_id)
    # The old row gives up its digest first: a correction of the error alone has the same one.
    writing.update(observations, observation_id, {"sameness": None})
    new_id, already_logged = add_observation(writing, observation)
    if already_logged:
        raise Conflict(
            "The corrected observation is in the catalogue already.",
            why=f"It is number {new_id}.",
            hint=f"Withdraw the wrong one instead: campaign withdraw {observation_id} --why ....",
            code="already-logged",
            details={"id": new_id},
        )
    writing.update(observations, observation_id, {"superseded_by_id": new_id, "superseded_at": writing.at})
    return new_id


def withdraw_observation(writing: Writing, observation_id: int) -> None:
    """Take an observation out of use; it stays in the catalogue.

    Raises
    ------
    NotFound
    Conflict
        When it is out of use already.
    """
    _refuse_out_of_use(writing.connection, observation_id)
    writing.update(observations, observation_id, {"sameness": None, "withdrawn_at": writing.at})


def get_observation(connection: Connection, observation_id: int) -> Observation:
    """The observation of that number, in use or not.

    Raises
    ------
    NotFound
    """
    found = _read(connection, observations.c.id == observation_id)
    if not found:
        raise _no_observation(observation_id)
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
)
_TIME = ("bmjd_tdb", "time_minus_d", "time_plus_d", "time_text", "time_scale", "time_place")
_VALUES = ("value", "value_minus", "value_plus")
_ANGLE = ("position_angle_deg", "position_angle_deg_minus", "position_angle_deg_plus")
_READ = ("id", "uid", "site_id", "source_id", *_TIME, *_VALUES, *_ANGLE, *_PLAIN)


class _Numbers:
    """Numbers of sources and sites by what was typed, each looked up once."""

    def __init__(self, writing: Writing) -> None:
        self._writing = writing
        self._sources: dict[str | None, int | None] = {}
        self._sites: dict[str, int] = {}

    def source(self, text: str | None) -> int | None:
        if text not in self._sources:
            self._sources[text] = source_id(self._writing, text)
        return self._sources[text]

    def site(self, observation: Observation) -> int | None:
        if observation.site_id is not None or not observation.site:
            return observation.site_id
        if observation.site not in self._sites:
            self._sites[observation.site] = find_site(self._writing.connection, observation.site).id
        return self._sites[observation.site]


def _row(writing: Writing, observation: Observation, numbers: _Numbers) -> dict[str, Any]:
    """Everything but the source, which is entered only with an observation that is new."""
    moment = observation.moment
    row: dict[str, Any] = {
        "uid": observation.uid or writing.new_uid(),
        **{name: getattr(observation, name) for name in _PLAIN},
        "bmjd_tdb": moment.bmjd_tdb,
        "time_minus_d": moment.minus_d,
        "time_plus_d": moment.plus_d,
        "time_text": moment.text,
        "time_scale": moment.scale,
        "time_place": moment.place,
        **measured_values("value", observation.value),
        **measured_values("position_angle_deg", observation.position_angle_deg),
        "site_id": numbers.site(observation),
        "entered_at": writing.at,
    }
    row["sameness"] = _sameness(row)
    return row


def _sameness(row: Mapping[str, Any]) -> str:
    """Digest of what was measured; equal for two entries of one observation."""
    parts = [repr(_plain(row[name])) for name in _SAMENESS]
    # Conversions round: instants within half of 1e-8 d (0.4 ms) are one.
    parts.append(f"{row['bmjd_tdb']:.8f}")
    if row["value"] is None:
        parts.append(row["text"])
    return blake2b("\x1f".join(parts).encode("utf-8", "backslashreplace"), digest_size=16).hexdigest()


def _plain(value: Any) -> Any:
    """Numbers of numpy and whole numbers as floats, so that equal values have equal digits."""
    if isinstance(value, (int, float)):
        return float(value)
    return value


def _already_logged(connection: Connection, rows: Sequence[Mapping[str, Any]]) -> dict[str, int]:
    """Numbers of observations in the catalogue by ``uid`` and by ``sameness``, as far as in ``rows``."""
    found: dict[str, int] = {}
    for name in ("uid", "sameness"):
        column = observations.c[name]
        keys = [row[name] for row in rows]
        for first in range(0, len(keys), _KEYS_IN_STATEMENT):
            some = keys[first : first + _KEYS_IN_STATEMENT]
            for key, number in connection.execute(select(column, observations.c.id).where(column.in_(some))):
                found[key] = number
    return found


def _in_use(as_of_bmjd_tdb: float | None, known_at: datetime | None) -> ColumnElement[bool]:
    columns = observations.c
    conditions: list[ColumnElement[bool]] = []
    if known_at is None:
        conditions += [columns.superseded_at.is_(None), columns.withdrawn_at.is_(None)]
    else:
        conditions += [
            columns.entered_at <= known_at,
            or_(columns.superseded_at.is_(None), columns.superseded_at > known_at),
            or_(columns.withdrawn_at.is_(None), columns.withdrawn_at > known_at),
        ]
    if as_of_bmjd_tdb is not None:
        conditions.append(columns.bmjd_tdb <= as_of_bmjd_tdb)
    return and_(*conditions)


def _read(connection: Connection, condition: ColumnElement[bool]) -> list[Observation]:
    rows = connection.execute(
        select(*columns_of(observations, _READ))
        .where(condition)
        .order_by(observations.c.system_id, observations.c.bmjd_tdb, observations.c.id)
    ).all()
    if not rows:
        return []
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
            **dict(zip(_PLAIN, row[16:], strict=True)),
        )
        for row in rows
    ]


def _refuse_out_of_use(connection: Connection, observation_id: int) -> None:
    columns = observations.c
    row = connection.execute(
        select(columns.superseded_by_id, columns.withdrawn_at).where(columns.id == observation_id)
    ).first()
    if row is None:
        raise _no_observation(observation_id)
    if row.superseded_by_id is None and row.withdrawn_at is None:
        return
    reason = (
        "It was withdrawn before."
        if row.superseded_by_id is None
        else f"Number {row.superseded_by_id} took its place."
    )
    raise Conflict(
        f"Observation number {observation_id} is out of use already.",
        why=reason,
        hint="See what is in use with: campaign observations.",
        code="out-of-use",
        details={"superseded_by": row.superseded_by_id},
    )


def _no_observation(observation_id: int) -> NotFound:
    return NotFound(
        f"There is no observation number {observation_id}.",
        hint="See their numbers with: campaign observations.",
        code="observation-not-found",
    )
