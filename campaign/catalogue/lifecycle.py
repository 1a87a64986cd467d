"""How entries of each table go out of use and come back, and what refers to what."""

from __future__ import annotations

from collections.abc import Collection, Mapping, Sequence
from typing import Any, Final

from sqlalchemy import Column, ColumnElement, Connection, Table, and_, select, true

from campaign.catalogue.tables import (
    adoptions,
    campaign_info,
    changes,
    column_mappings,
    dust_rules,
    episodes,
    keepings,
    kept_forecasts,
    lapses,
    observations,
    sites,
    solutions,
    sources,
    stars,
    system_names,
    systems,
)
from campaign.model.history import BulkEffect, Effect, RowEffect

# The column that says since when a row is out of use.
MARKER_OF: Final[Mapping[str, str]] = {
    systems.name: "withdrawn_at",
    system_names.name: "withdrawn_at",
    sites.name: "withdrawn_at",
    solutions.name: "withdrawn_at",
    episodes.name: "withdrawn_at",
    observations.name: "withdrawn_at",
    keepings.name: "withdrawn_at",
    kept_forecasts.name: "withdrawn_at",
    adoptions.name: "ended_at",
    dust_rules.name: "ended_at",
}
MARKERS: Final = frozenset({"withdrawn_at", "ended_at", "superseded_at"})
# Tables whose rows can be removed: nobody asks for their past, and nothing refers to them.
LOSING_ROWS: Final = frozenset({system_names.name, stars.name, column_mappings.name, campaign_info.name})
# Words to refer to, and the past itself: what was entered there stays when its operation is taken back.
LASTING: Final = frozenset({sources.name, lapses.name})
# Follow from what was adopted, whenever that changes: no entry stands or falls with them.
FOLLOWING: Final[Mapping[str, frozenset[str]]] = {
    solutions.name: frozenset({"epoch_cycle", "published_cycle_offset"})
}
# Entries that other entries refer to, and what to call one.
SPOKEN: Final[Mapping[str, str]] = {
    systems.name: "system",
    sites.name: "site",
    solutions.name: "solution",
    episodes.name: "episode",
    observations.name: "observation",
}


def is_lasting(effect: Effect) -> bool:
    """Whether the effect stays when its operation is taken back."""
    return isinstance(effect, RowEffect) and effect.table in LASTING


def goes_out(effect: Effect) -> bool:
    """Whether taking the effect back puts entries out of use or removes them."""
    if isinstance(effect, BulkEffect):
        return effect.kind != "withdrawn"
    return effect.kind in ("added", "replaced") or cleared_marker(effect) is not None


def comes_back(effect: Effect) -> bool:
    """Whether taking the effect back brings entries or values back."""
    if isinstance(effect, BulkEffect):
        return effect.kind == "withdrawn"
    changed = effect.kind == "changed" and cleared_marker(effect) is None
    return changed or effect.kind in ("removed", "replaced")


def cleared_marker(effect: RowEffect) -> str | None:
    """The marker that the effect cleared: its operation had put the entry back."""
    for name in MARKERS & effect.before.keys():
        if effect.before[name] is not None and effect.after.get(name) is None and effect.kind == "changed":
            return name
    return None


def rows_out(effects: Sequence[Effect], table: Table[Any]) -> set[int]:
    """Numbers of the rows of ``table`` that go out of use one by one when the effects are taken back."""
    return {e.row_id for e in effects if isinstance(e, RowEffect) and e.table == table.name and goes_out(e)}


def loads_out(effects: Sequence[Effect]) -> Collection[int]:
    """Numbers of the loads whose observations go out of use when the effects are taken back."""
    return {e.brought_by for e in effects if isinstance(e, BulkEffect) and goes_out(e)}


def row_in_use(table: Table[Any]) -> ColumnElement[bool]:
    """The condition that a row counts now."""
    marker = MARKER_OF.get(table.name)
    if marker is None:
        return true()
    if table is observations:
        return and_(table.c.withdrawn_at.is_(None), table.c.superseded_at.is_(None))
    column: ColumnElement[Any] = table.c[marker]
    return column.is_(None)


def references(table: Table[Any]) -> list[tuple[Column[Any], Table[Any]]]:
    """Columns that refer to entries which people keep, each with the table that it refers to."""
    return [
        (key.parent, key.column.table)
        for key in sorted(table.foreign_keys, key=lambda key: str(key.parent.name))
        if key.column.name == "id" and key.column.table.name in SPOKEN
    ]


def withdrawn_load(effect: BulkEffect) -> ColumnElement[bool]:
    """The condition that an observation was withdrawn together with the load that it came with."""
    columns = observations.c
    return and_(
        columns.operation_id == effect.brought_by,
        columns.withdrawn_at == effect.withdrawn_at,
        columns.superseded_at.is_(None),
    )


def entered_by(connection: Connection, table: Table[Any], row_id: int) -> int | None:
    """The operation that last put this row into use."""
    marker = MARKER_OF.get(table.name)
    for row in _changes_backwards(connection, table, row_id):
        if row.action == "insert" or (row.action == "update" and row.after.get(marker, 0) is None):
            return int(row.operation_id)
    if table is not observations:
        return None
    brought = select(observations.c.operation_id).where(observations.c.id == row_id)
    return connection.execute(brought).scalar_one_or_none()


def withdrawn_by(connection: Connection, table: Table[Any], row_id: int) -> int | None:
    """The operation that last put this row out of use."""
    marker = MARKER_OF.get(table.name)
    for row in _changes_backwards(connection, table, row_id):
        if row.after is not None and row.after.get(marker) is not None:
            return int(row.operation_id)
    return None


def _changes_backwards(connection: Connection, table: Table[Any], row_id: int) -> Any:
    return connection.execute(
        select(changes.c.operation_id, changes.c.action, changes.c.after)
        .where(changes.c.table_name == table.name, changes.c.row_id == row_id)
        .order_by(changes.c.id.desc())
    ).all()
