"""Which operations concern a system, and which an observation with all its versions."""

from __future__ import annotations

from typing import Any

from sqlalchemy import Connection, Table, and_, func, or_, select

from campaign.catalogue.tables import changes, metadata, observations, stars, system_names, systems
from campaign.model.history import BulkEffect, Effect, RowEffect

_BULK_AGAIN = ("withdraw many", "restore many")


def operations_of_system(connection: Connection, system_id: int) -> set[int]:
    """Numbers of the operations that touched the system or anything that belongs to it."""
    columns = changes.c
    found = set(
        connection.execute(
            select(columns.operation_id).where(
                columns.table_name == systems.name, columns.row_id == system_id
            )
        ).scalars()
    )
    for table in _tables_of_systems():
        rows = (
            select(columns.operation_id)
            .join(table, table.c.id == columns.row_id)
            .where(columns.table_name == table.name, table.c.system_id == system_id)
            .distinct()
        )
        found.update(connection.execute(rows).scalars())
    found |= _of_removed_rows(connection, system_id)
    loads = set(
        connection.execute(
            select(observations.c.operation_id).where(observations.c.system_id == system_id).distinct()
        ).scalars()
    )
    return found | loads | _again(connection, loads)


def versions_of(connection: Connection, observation_id: int) -> list[int]:
    """Numbers of an observation's versions, the first entered first; its own among them."""
    first, columns = observation_id, observations.c
    seen = {first}
    while True:
        before = connection.execute(
            select(columns.id).where(columns.superseded_by_id == first).order_by(columns.id)
        ).scalars()
        earlier = next((number for number in before if number not in seen), None)
        if earlier is None:
            break
        first = earlier
        seen.add(first)
    found = [first]
    while True:
        after = connection.execute(
            select(columns.superseded_by_id).where(columns.id == found[-1])
        ).scalar_one_or_none()
        if after is None or after in found:
            return found
        found.append(after)


def operations_of_observations(connection: Connection, numbers: list[int]) -> set[int]:
    """Numbers of the operations that brought or changed these observations."""
    single = connection.execute(
        select(changes.c.operation_id).where(
            changes.c.table_name == observations.name, changes.c.row_id.in_(numbers)
        )
    ).scalars()
    brought = set(
        connection.execute(
            select(observations.c.operation_id).where(observations.c.id.in_(numbers))
        ).scalars()
    )
    return set(single) | brought | _again(connection, brought)


def rows_of_system(connection: Connection, brought_by: int, system_id: int) -> int:
    """How many observations of a system a load brought."""
    own = and_(observations.c.operation_id == brought_by, observations.c.system_id == system_id)
    return int(connection.execute(select(func.count()).where(own)).scalar_one())


def effects_on_observations(effects: list[Effect], numbers: list[int]) -> list[Effect]:
    """Only what concerns these observations, one by one."""
    return [
        effect
        for effect in effects
        if isinstance(effect, RowEffect) and effect.table == observations.name and effect.row_id in numbers
    ]


def load_of(effects: list[Effect]) -> BulkEffect | None:
    """The whole load that the operation brought, took back or put back."""
    return next((effect for effect in effects if isinstance(effect, BulkEffect)), None)


def _tables_of_systems() -> list[Table[Any]]:
    return [table for table in metadata.tables.values() if "system_id" in table.c]


def _of_removed_rows(connection: Connection, system_id: int) -> set[int]:
    """Operations on names and stars whose rows are gone: only the journal knows whose they were."""
    rows = connection.execute(
        select(changes.c.operation_id, changes.c.before, changes.c.after).where(
            changes.c.table_name.in_((system_names.name, stars.name)),
            or_(changes.c.action == "delete", changes.c.action == "insert"),
        )
    )
    return {row.operation_id for row in rows if (row.before or row.after or {}).get("system_id") == system_id}


def _again(connection: Connection, loads: set[int]) -> set[int]:
    """Operations that took back or put back one of these loads."""
    rows = connection.execute(
        select(changes.c.operation_id, changes.c.after).where(
            changes.c.table_name == observations.name, changes.c.action.in_(_BULK_AGAIN)
        )
    )
    return {row.operation_id for row in rows if row.after["brought_by"] in loads}
