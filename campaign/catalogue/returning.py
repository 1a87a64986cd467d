"""What an entry needs in order to come back: its name or place free, and what it belongs to in use."""

from __future__ import annotations

from collections.abc import Collection, Iterator, Mapping, Sequence
from typing import Any

from sqlalchemy import Connection, Table, select

from campaign.catalogue.journal import in_portions
from campaign.catalogue.lifecycle import (
    FOLLOWING,
    MARKER_OF,
    MARKERS,
    SPOKEN,
    comes_back,
    entered_by,
    references,
    row_in_use,
    rows_out,
    withdrawn_by,
    withdrawn_load,
)
from campaign.catalogue.tables import (
    campaign_info,
    column_mappings,
    keepings,
    metadata,
    observations,
    sites,
    solutions,
    stars,
    system_names,
    systems,
)
from campaign.model.history import BulkEffect, Effect, RowEffect

# What only one entry in use may hold, and what another operation did that holds it now.
_UNIQUE: tuple[tuple[Table[Any], tuple[str, ...], str], ...] = (
    (system_names, ("name_key",), "gave the name to another system"),
    (system_names, ("system_id", "name_rank"), "changed the names of the system"),
    (stars, ("system_id", "star"), "entered the star again"),
    (sites, ("name_key",), "gave the name to another site"),
    (solutions, ("system_id", "label_key"), "gave the label to another solution"),
    (observations, ("sameness",), "entered the same observation again"),
    (column_mappings, ("name_key",), "gave the name to another mapping"),
    (keepings, ("label_key",), "gave the label to other kept forecasts"),
    (campaign_info, ("key",), "states the same fact"),
)
_PARENTS = (systems, sites, solutions)

Reason = tuple[int | None, str]


def holders_of_what_returns(connection: Connection, effects: Sequence[Effect]) -> Iterator[Reason]:
    """Operations that stand in the way of what would come back, each with the reason."""
    rows = [e for e in effects if isinstance(e, RowEffect) and comes_back(e)]
    loads = [e for e in effects if isinstance(e, BulkEffect) and comes_back(e)]
    for table, names, reason in _UNIQUE:
        going = rows_out(effects, table)
        for effect in rows:
            if effect.table == table.name:
                for number in _holders(connection, table, effect, names) - going:
                    yield entered_by(connection, table, number), reason
        if table is observations:
            for load in loads:
                for number in _same_as_load(connection, load):
                    yield entered_by(connection, table, number), reason
    yield from _out_of_use_themselves(connection, rows)
    for parent in _PARENTS:
        back = {e.row_id for e in rows if e.table == parent.name and _returns_to_use(e)}
        wanted = _parents_of_rows(connection, rows, parent) | _parents_of_loads(connection, loads, parent)
        for number in _out_of_use(connection, parent, wanted - back):
            yield withdrawn_by(connection, parent, number), f"took back the {SPOKEN[parent.name]} it needs"


def _returns_to_use(effect: RowEffect) -> bool:
    """Whether the row itself comes back, and not only a value of it."""
    return effect.kind != "changed" or bool(MARKERS & effect.before.keys())


def _out_of_use_themselves(connection: Connection, rows: Sequence[RowEffect]) -> Iterator[Reason]:
    """Entries of which only a value would come back, and which are out of use by now."""
    for table_name in {effect.table for effect in rows if effect.table in MARKER_OF}:
        table = metadata.tables[table_name]
        following = FOLLOWING.get(table_name, frozenset())
        numbers = {
            e.row_id
            for e in rows
            if e.table == table_name and not _returns_to_use(e) and not e.before.keys() <= following
        }
        for number in _out_of_use(connection, table, numbers):
            yield withdrawn_by(connection, table, number), "took back the entry itself"


def _holders(connection: Connection, table: Table[Any], effect: RowEffect, names: Sequence[str]) -> set[int]:
    """Rows in use that have what must be unique of the returning row."""
    wanted = _returning_values(connection, table, effect, names)
    if wanted is None or None in wanted.values():
        return set()
    held = [table.c[name] == value for name, value in wanted.items()]
    others = set(connection.execute(select(table.c.id).where(*held, row_in_use(table))).scalars())
    # A row that is gone holds nothing: its number may belong to another one by now.
    return others if effect.kind == "removed" else others - {effect.row_id}


def _returning_values(
    connection: Connection, table: Table[Any], effect: RowEffect, names: Sequence[str]
) -> Mapping[str, Any] | None:
    """What the returning row will hold; None when it holds that already."""
    if effect.kind != "changed":
        return {name: effect.before[name] for name in names}
    if not {*names, MARKER_OF.get(table.name)} & effect.before.keys():
        return None
    present = connection.execute(
        select(*[table.c[name] for name in names]).where(table.c.id == effect.row_id)
    ).first()
    values = {} if present is None else dict(zip(names, present, strict=True))
    return values | {name: effect.before[name] for name in names if name in effect.before}


def _same_as_load(connection: Connection, load: BulkEffect) -> Sequence[int]:
    """Observations in use that are the same as some of a load that was withdrawn."""
    digests = select(observations.c.former_sameness).where(
        withdrawn_load(load), observations.c.former_sameness.is_not(None)
    )
    same = select(observations.c.id).where(observations.c.sameness.in_(digests)).limit(1000)
    return connection.execute(same).scalars().all()


def _parents_of_rows(connection: Connection, rows: Sequence[RowEffect], parent: Table[Any]) -> set[int]:
    """Numbers of entries of ``parent`` to which returning rows refer."""
    found: set[Any] = set()
    for table_name in {effect.table for effect in rows}:
        table = metadata.tables[table_name]
        own = [effect for effect in rows if effect.table == table_name]
        for column, target in references(table):
            if target is parent:
                found.update(e.before[column.name] for e in own if column.name in e.before)
                for some in in_portions(e.row_id for e in own if column.name not in e.before):
                    found.update(connection.execute(select(column).where(table.c.id.in_(some))).scalars())
    return found - {None}


def _parents_of_loads(connection: Connection, loads: Sequence[BulkEffect], parent: Table[Any]) -> set[int]:
    found: set[Any] = set()
    for column, target in references(observations):
        if target is parent:
            for load in loads:
                rows = select(column).where(withdrawn_load(load)).distinct()
                found.update(connection.execute(rows).scalars())
    return found - {None}


def _out_of_use(connection: Connection, table: Table[Any], numbers: Collection[int]) -> set[int]:
    marker = table.c[MARKER_OF[table.name]]
    return {
        number
        for some in in_portions(numbers)
        for number in connection.execute(
            select(table.c.id).where(table.c.id.in_(some), marker.is_not(None))
        ).scalars()
    }
