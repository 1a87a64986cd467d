"""Systems with their names and stars."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Collection
from dataclasses import fields, replace
from datetime import datetime
from typing import Any

from sqlalchemy import ColumnElement, Connection, and_, or_, select, true

from campaign.catalogue.converting import (
    among,
    columns_of,
    in_use,
    kept,
    measured_names,
    measured_or_none,
    measured_values,
)
from campaign.catalogue.naming import name_key, nearest_names, tidy_name
from campaign.catalogue.store import Writing
from campaign.catalogue.tables import stars, system_names, systems
from campaign.catalogue.tables_systems import STAR_QUANTITIES
from campaign.catalogue.types import unreadable
from campaign.errors import Conflict, NotFound
from campaign.model.systems import Star, System, SystemState

_NAMES_IN_USE = system_names.c.withdrawn_at.is_(None)
_PLAIN = (
    "position_epoch_jyr",
    "ra_deg",
    "dec_deg",
    "pm_ra_cosdec_mas_yr",
    "pm_dec_mas_yr",
    "state",
    "priority",
    "notes",
    "cycle_anchor_bmjd_tdb",
    "cycle_anchor_period_d",
)


def add_system(writing: Writing, system: System) -> int:
    """Enter a system with its names and both stars; ``system.id`` is ignored.

    Raises
    ------
    Conflict
        ``name-taken``, when a name or alias already belongs to a system.
    InputRefused
        For a value that the columns refuse.
    """
    names = _names_of(system)
    _refuse_taken(writing.connection, names, None)
    system_id = writing.insert(systems, {**_system_values(system), "entered_at": writing.at})
    for rank, name in enumerate(names):
        _insert_name(writing, system_id, rank, name)
    for star in (system.star_a, system.star_b):
        set_star(writing, system_id, star)
    return system_id


def find_system(connection: Connection, name: str) -> System:
    """The system of that name or alias, whatever its case and spaces.

    Raises
    ------
    NotFound
        ``system-not-found``; ``details["nearest"]`` lists names like it.
    """
    found = connection.execute(
        select(system_names.c.system_id).where(system_names.c.name_key == name_key(name), _NAMES_IN_USE)
    ).scalar_one_or_none()
    if found is None:
        rows = connection.execute(select(system_names.c.name_key, system_names.c.name).where(_NAMES_IN_USE))
        known = {key: shown for key, shown in rows}
        raise _no_system(name, nearest_names(name, known), bool(known))
    return get_system(connection, found)


def get_system(connection: Connection, system_id: int) -> System:
    """The system of that number.

    Raises
    ------
    NotFound
    """
    found = load_systems(connection, {system_id}, include_retired=True)
    if not found:
        raise _no_system(f"number {system_id}", [], True)
    return found[0]


def list_systems(connection: Connection, *, include_retired: bool = False) -> list[System]:
    """All systems, in the order of entry."""
    return load_systems(connection, None, include_retired=include_retired)


def change_system(writing: Writing, before: System, after: System) -> bool:
    """Bring a system from ``before`` to ``after``; False when they are alike.

    Raises
    ------
    Conflict
        ``changed-meanwhile``, when somebody changed the same entry since ``before`` was read, with both
        versions in ``details``; ``name-taken``.
    """
    present = get_system(writing.connection, before.id)
    wanted = replace(after, id=before.id)
    _refuse_changed_meanwhile(before, wanted, present)
    differing = {f.name for f in fields(System) if getattr(before, f.name) != getattr(wanted, f.name)}
    wanted = replace(present, **{name: getattr(wanted, name) for name in differing})
    changed = writing.update(systems, before.id, _system_values(wanted))
    if differing & {"name", "aliases"}:
        changed |= _change_names(writing, wanted)
    changed |= set_star(writing, before.id, wanted.star_a)
    changed |= set_star(writing, before.id, wanted.star_b)
    return changed


def set_state(writing: Writing, system_id: int, state: SystemState) -> bool:
    """Change the state, for example to ``retired``; False when it was so already."""
    return writing.update(systems, system_id, {"state": state})


def set_star(writing: Writing, system_id: int, star: Star) -> bool:
    """Enter or replace what is known of one star; False when nothing differs."""
    found = writing.connection.execute(
        select(stars.c.id).where(stars.c.system_id == system_id, stars.c.star == star.star)
    ).scalar_one_or_none()
    values: dict[str, Any] = {"spectral_type": star.spectral_type}
    for name in STAR_QUANTITIES:
        values |= measured_values(name, getattr(star, name))
    if found is not None:
        return writing.update(stars, found, values)
    if star == Star(star.star):
        return False
    writing.insert(stars, {"system_id": system_id, "star": star.star, **values})
    return True


def set_cycle_anchor(
    writing: Writing, system_id: int, bmjd_tdb: float, period_d: float | None = None
) -> bool:
    """Fix where the system's cycle count starts, and the period that counted; False when it was so."""
    return writing.update(
        systems, system_id, {"cycle_anchor_bmjd_tdb": bmjd_tdb, "cycle_anchor_period_d": period_d}
    )


def load_systems(
    connection: Connection,
    system_ids: Collection[int] | None,
    *,
    include_retired: bool,
    known_at: datetime | None = None,
) -> list[System]:
    """Systems by number with names and stars, in three statements however many there are.

    With ``known_at`` those too that were taken back only after it; all values are the present ones.
    """
    wanted = and_(among(systems.c.id, system_ids), in_use(systems.c.withdrawn_at, known_at))
    names = _load_names(connection, system_ids, known_at)
    star_of = _load_stars(connection, among(stars.c.system_id, system_ids))
    shown: ColumnElement[bool] = true() if include_retired else systems.c.state != "retired"
    rows = connection.execute(
        select(*columns_of(systems, _COLUMNS)).where(wanted, shown).order_by(systems.c.id)
    )
    return [
        System(
            id=row[0],
            position_epoch_jyr=row[1],
            ra_deg=row[2],
            dec_deg=row[3],
            pm_ra_cosdec_mas_yr=row[4],
            pm_dec_mas_yr=row[5],
            state=row[6],
            priority=row[7],
            notes=row[8],
            cycle_anchor_bmjd_tdb=row[9],
            cycle_anchor_period_d=row[10],
            distance_pc=measured_or_none(row[11], row[12], row[13]),
            parallax_mas=measured_or_none(row[14], row[15], row[16]),
            name=_primary(names[row[0]], row[0]),
            aliases=tuple(names[row[0]][1:]),
            star_a=star_of.get((row[0], "A"), _UNKNOWN_A),
            star_b=star_of.get((row[0], "B"), _UNKNOWN_B),
        )
        for row in rows.all()
        if kept(row[0], system_ids)
    ]


_COLUMNS = ("id", *_PLAIN, *measured_names("distance_pc", "parallax_mas"))
_STAR_COLUMNS = ("system_id", "star", "spectral_type", *measured_names(*STAR_QUANTITIES))
_UNKNOWN_A, _UNKNOWN_B = Star("A"), Star("B")


def _load_stars(connection: Connection, wanted: ColumnElement[bool]) -> dict[tuple[int, str], Star]:
    rows = connection.execute(select(*columns_of(stars, _STAR_COLUMNS)).where(wanted))
    return {
        (row[0], row[1]): Star(
            row[1],
            row[2],
            measured_or_none(row[3], row[4], row[5]),
            measured_or_none(row[6], row[7], row[8]),
            measured_or_none(row[9], row[10], row[11]),
            measured_or_none(row[12], row[13], row[14]),
            measured_or_none(row[15], row[16], row[17]),
            measured_or_none(row[18], row[19], row[20]),
        )
        for row in rows.all()
    }


def _load_names(
    connection: Connection, system_ids: Collection[int] | None, known_at: datetime | None
) -> dict[int, list[str]]:
    """Names by system, the primary one first; of a system that was taken back those that it had then."""
    columns = system_names.c
    query = select(columns.system_id, columns.name).where(among(columns.system_id, system_ids))
    if known_at is None:
        query = query.where(_NAMES_IN_USE)
    else:
        query = query.join(systems, systems.c.id == columns.system_id).where(
            or_(
                and_(columns.withdrawn_at.is_(None), systems.c.withdrawn_at.is_(None)),
                columns.withdrawn_at == systems.c.withdrawn_at,
            )
        )
    names: dict[int, list[str]] = defaultdict(list)
    for system_id, name in connection.execute(query.order_by(columns.system_id, columns.name_rank)):
        names[system_id].append(name)
    return names


def _primary(names: list[str], system_id: int) -> str:
    if not names:
        raise unreadable(f"system number {system_id} without a name")
    return names[0]


def _system_values(system: System) -> dict[str, Any]:
    values = {name: getattr(system, name) for name in _PLAIN}
    return (
        values
        | measured_values("distance_pc", system.distance_pc)
        | measured_values("parallax_mas", system.parallax_mas)
    )


def _names_of(system: System) -> list[str]:
    """Primary name first; an alias that differs only in case or spaces from an earlier name is left out."""
    names: dict[str, str] = {}
    for name in (system.name, *system.aliases):
        tidy = tidy_name(name)
        names.setdefault(name_key(tidy), tidy)
    return list(names.values())


def _insert_name(writing: Writing, system_id: int, rank: int, name: str) -> None:
    writing.insert(
        system_names, {"system_id": system_id, "name_rank": rank, "name": name, "name_key": name_key(name)}
    )


def _change_names(writing: Writing, system: System) -> bool:
    names = _names_of(system)
    _refuse_taken(writing.connection, names, system.id)
    wanted = {rank: name for rank, name in enumerate(names)}
    present = {
        row.name_rank: row
        for row in writing.connection.execute(
            select(system_names.c.id, system_names.c.name_rank, system_names.c.name).where(
                system_names.c.system_id == system.id, _NAMES_IN_USE
            )
        )
    }
    # Removed before anything is inserted, so that names can change places.
    stale = [rank for rank, row in present.items() if wanted.get(rank) != row.name]
    fresh = [rank for rank in wanted if rank in stale or rank not in present]
    for rank in stale:
        writing.delete(system_names, present[rank].id)
    for rank in fresh:
        _insert_name(writing, system.id, rank, wanted[rank])
    return bool(stale or fresh)


def _refuse_taken(connection: Connection, names: list[str], own_id: int | None) -> None:
    for name in names:
        row = connection.execute(
            select(system_names.c.system_id, system_names.c.name).where(
                system_names.c.name_key == name_key(name), _NAMES_IN_USE
            )
        ).first()
        if row is not None and row.system_id != own_id:
            holder = get_system(connection, row.system_id)
            raise Conflict(
                f"The name {name!r} already belongs to the system {holder.name!r}.",
                why="Names and aliases are compared without regard to case and spaces.",
                hint=f'Choose another name, or look at what is there: campaign system show "{holder.name}".',
                code="name-taken",
                details={"name": name, "system": holder.name},
            )


def _refuse_changed_meanwhile(before: System, wanted: System, present: System) -> None:
    clashes = {}
    for field in fields(System):
        old, new, now = (getattr(system, field.name) for system in (before, wanted, present))
        if old != new and now not in (old, new):
            clashes[field.name] = {"read": str(old), "wanted": str(new), "present": str(now)}
    if clashes:
        raise Conflict(
            f"The system {present.name!r} was changed by somebody else in the meantime.",
            why="Both changes concern: " + ", ".join(sorted(clashes)) + ".",
            hint=f'Look at it again (campaign system show "{present.name}") and repeat your change.',
            code="changed-meanwhile",
            details={"fields": clashes},
        )


def _no_system(name: str, nearest: list[str], any_known: bool) -> NotFound:
    if nearest:
        hint = "Did you mean " + " or ".join(f'"{near}"' for near in nearest) + "?"
    elif any_known:
        hint = "See all names with: campaign system list."
    else:
        hint = 'The catalogue is empty. Add the first: campaign system add "NAME" --ra ... --dec ....'
    return NotFound(
        f"There is no system named {name!r}.",
        why="No name or alias in the catalogue matches.",
        hint=hint,
        code="system-not-found",
        details={"name": name, "nearest": nearest},
    )
