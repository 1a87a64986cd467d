"""Reading the journal: operations, who undid which, and what each came to row by row."""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from datetime import datetime
from typing import Any

from sqlalchemy import Connection, Row, Table, and_, select, true

from campaign.catalogue.converting import MOST_IN_STATEMENT
from campaign.catalogue.tables import changes, metadata, observations, operations
from campaign.catalogue.types import JsonText, UtcText, unreadable
from campaign.errors import NotFound
from campaign.model.history import BulkEffect, BulkKind, Effect, Operation, RowEffect

_BULK: dict[str, BulkKind] = {
    "insert many": "brought",
    "withdraw many": "withdrawn",
    "restore many": "restored",
}


class Undos:
    """Which operation took back which. An undo that was undone leaves its operation standing again."""

    def __init__(self, connection: Connection) -> None:
        rows = connection.execute(
            select(operations.c.id, operations.c.undoes_id).where(operations.c.undoes_id.is_not(None))
        )
        self._target_of: dict[int, int] = {row.id: row.undoes_id for row in rows}
        self._undo_of = {target: undo for undo, target in self._target_of.items()}

    def undo_of(self, operation_id: int) -> int | None:
        """The operation that took this one back."""
        return self._undo_of.get(operation_id)

    def chain(self, operation_id: int) -> list[int]:
        """The original operation, its undo, the undo of that, and so on."""
        root = operation_id
        while root in self._target_of:
            root = self._target_of[root]
        found = [root]
        while (undo := self._undo_of.get(found[-1])) is not None:
            found.append(undo)
        return found

    def stands(self, operation_id: int) -> bool:
        """Whether what the operation did holds."""
        chain = self.chain(operation_id)
        return (len(chain) - chain.index(operation_id)) % 2 == 1

    def without_effect_since(self, operation_id: int) -> set[int]:
        """Later operations that came to nothing, because they and their undos cancel out since then.

        Of a chain that does not cancel, its last operation stands for the rest.
        """
        idle: set[int] = set()
        for undo in self._target_of:
            if undo not in self._undo_of:
                later = [each for each in self.chain(undo) if each > operation_id]
                idle.update(later if len(later) % 2 == 0 else later[:-1])
        return idle


def get_operation(connection: Connection, operation_id: int, undos: Undos | None = None) -> Operation:
    """The operation of that number.

    Raises
    ------
    NotFound
    """
    found = operations_by_id(connection, {operation_id}, undos)
    if not found:
        raise NotFound(
            f"There is no operation number {operation_id}.",
            why="Every command that changed the catalogue has a number; this one has not been given.",
            hint="See the numbers with: campaign history.",
            code="operation-not-found",
        )
    return found[operation_id]


def operations_by_id(
    connection: Connection, numbers: Collection[int], undos: Undos | None = None
) -> dict[int, Operation]:
    """Operations by number, as far as there are any."""
    undos = undos or Undos(connection)
    return {
        row.id: _operation(row, undos)
        for some in in_portions(numbers)
        for row in connection.execute(select(*_OPERATION).where(operations.c.id.in_(some)))
    }


def list_operations(
    connection: Connection,
    numbers: Collection[int] | None = None,
    *,
    who: str | None = None,
    since: datetime | None = None,
    until: datetime | None = None,
    limit: int | None = None,
) -> list[Operation]:
    """Operations, newest first.

    Parameters
    ----------
    numbers
        Only these; None for all.
    who
        Only of this person, whatever the case.
    since, until
        Only those made from the one instant to the other.
    limit
        At most so many.
    """
    undos = Undos(connection)
    condition = and_(
        true() if since is None else operations.c.at >= since,
        true() if until is None else operations.c.at <= until,
    )
    if numbers is not None and len(numbers) <= MOST_IN_STATEMENT:
        condition = and_(condition, operations.c.id.in_(sorted(numbers)))
    rows = connection.execute(select(*_OPERATION).where(condition).order_by(operations.c.id.desc()))
    found: list[Operation] = []
    wanted_name = None if who is None else who.casefold()
    for row in rows:
        if limit is not None and len(found) >= limit:
            break
        if (numbers is None or row.id in numbers) and wanted_name in (None, row.who.casefold()):
            found.append(_operation(row, undos))
    return found


_OPERATION = [operations.c[n] for n in ("id", "at", "who", "command", "summary", "undoes_id")]


def _operation(row: Row[Any], undos: Undos) -> Operation:
    return Operation(
        id=row.id,
        at=row.at,
        who=row.who,
        command=row.command,
        summary=row.summary,
        undoes_id=row.undoes_id,
        undone_by_id=undos.undo_of(row.id),
        stands=undos.stands(row.id),
    )


def last_standing(connection: Connection, who: str) -> int | None:
    """The newest operation of this person that stands and is not itself an undo of one that does not.

    What was undone and put back counts at the moment when it was put back.
    """
    undos = Undos(connection)
    rows = connection.execute(select(operations.c.id, operations.c.who).order_by(operations.c.id.desc()))
    for row in rows:
        is_last = row.who.casefold() == who.casefold() and undos.undo_of(row.id) is None
        if is_last and len(undos.chain(row.id)) % 2 == 1:
            return int(row.id)
    return None


def effects_of(connection: Connection, operation_id: int) -> list[Effect]:
    """What an operation came to, one entry a row, in the order in which it first touched them."""
    rows = connection.execute(
        select(changes.c.table_name, changes.c.row_id, changes.c.action, changes.c.before, changes.c.after)
        .where(changes.c.operation_id == operation_id)
        .order_by(changes.c.id)
    ).all()
    bulk: list[Effect] = []
    by_row: dict[tuple[str, int], list[Row[Any]]] = {}
    for row in rows:
        if row.action in _BULK:
            bulk.append(_bulk_effect(operation_id, row))
        else:
            by_row.setdefault((row.table_name, row.row_id), []).append(row)
    brought = any(isinstance(each, BulkEffect) and each.kind == "brought" for each in bulk)
    single = [
        effect
        for (table, row_id), steps in by_row.items()
        if (effect := _row_effect(metadata.tables[table], row_id, steps)) is not None
        # Rows entered one by one beside a load carry its number, and go with it.
        and not (brought and table == observations.name and effect.kind == "added")
    ]
    return [*bulk, *single]


def _bulk_effect(operation_id: int, row: Row[Any]) -> BulkEffect:
    after = row.after
    at = after.get("withdrawn_at")
    return BulkEffect(
        kind=_BULK[row.action],
        brought_by=after.get("brought_by", operation_id),
        rows=after["rows"],
        withdrawn_at=None if at is None else datetime.fromisoformat(at),
    )


def _row_effect(table: Table[Any], row_id: int, steps: list[Row[Any]]) -> RowEffect | None:
    """The first state and the last, whatever was between them."""
    was_there = steps[0].action != "insert"
    before: dict[str, Any] = {}
    after: dict[str, Any] = {}
    for step in steps:
        if step.action == "update":
            before = step.before | before if was_there else before
            after |= step.after
        elif step.action == "delete":
            before = step.before | before if was_there else before
            after = {}
        else:
            # What was not given is NULL, and the journal does not say so.
            after = {column.name: None for column in table.c if column.name != "id"} | step.after
    is_there = steps[-1].action != "delete"
    before, after = from_journal(table, before), from_journal(table, after)
    if was_there and is_there:
        if any(step.action == "delete" for step in steps):
            return RowEffect(table.name, row_id, "replaced", before, after)
        differing = [name for name in after if after[name] != before[name]]
        if not differing:
            return None
        return RowEffect(
            table.name,
            row_id,
            "changed",
            {name: before[name] for name in differing},
            {name: after[name] for name in differing},
        )
    if was_there:
        return RowEffect(table.name, row_id, "removed", before, {})
    return RowEffect(table.name, row_id, "added", {}, after) if is_there else None


def from_journal(table: Table[Any], stored: Mapping[str, Any]) -> dict[str, Any]:
    """Values of the journal as the program uses them: instants and documents, not their text."""
    values = {}
    for name, value in stored.items():
        if name not in table.c:
            raise unreadable(f"the column {name!r} of {table.name} in its journal")
        kind = table.c[name].type
        kept_as_text = isinstance(kind, (UtcText, JsonText))
        values[name] = kind.process_result_value(value, None) if kept_as_text else value
    return values


def in_portions(numbers: Iterable[int]) -> Iterable[list[int]]:
    """Numbers in portions that fit a statement."""
    wanted = sorted(set(numbers))
    for first in range(0, len(wanted), MOST_IN_STATEMENT):
        yield wanted[first : first + MOST_IN_STATEMENT]
