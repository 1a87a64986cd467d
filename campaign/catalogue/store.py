"""Opening the catalogue: reading, and writing with a journal.

Whoever writes gets a :class:`Writing`, which records every change (row, before, after) in the same
transaction as the change itself, under one operation that says who, when and by which command. An
operation that changed nothing leaves no trace.
"""

from __future__ import annotations

import secrets
import uuid
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from contextlib import contextmanager
from datetime import datetime
from typing import TYPE_CHECKING, Any

from sqlalchemy import ColumnElement, Connection, Engine, Table, and_, func, insert, select
from sqlalchemy import delete as sql_delete
from sqlalchemy import update as sql_update

import campaign
from campaign.catalogue.address import Address, Database, address_of
from campaign.catalogue.engine import BUSY_TIMEOUT_S, loading_engine, reading_engine, writing_engine
from campaign.catalogue.failures import translated
from campaign.catalogue.numbering import Numbering
from campaign.catalogue.opening import refuse_other_revision, roll_back_interrupted_write
from campaign.catalogue.tables import changes, operations
from campaign.catalogue.types import ValueRefused

if TYPE_CHECKING:
    from campaign.catalogue.guards import Cells

Values = Mapping[str, Any]

# Rows that one statement changes: a second or so on a slow disk, after which an interrupt is heard.
_PORTION = 50_000


class Writing:
    """One operation under way. Rows go in, change and leave through it, never past it."""

    def __init__(self, connection: Connection, *, at: datetime, who: str, command: str, summary: str) -> None:
        self.connection = connection
        self.at = at
        self.changed = False
        self._who = who
        self._command = command
        self._summary = summary
        self._operation_id: int | None = None
        self._undoes_id: int | None = None
        self._numbering = Numbering(connection)
        # 96 random bits name the operation; the last 32 number what it makes, so that identifiers
        # of one load follow each other and their index grows at one end.
        self._uid_base = secrets.randbits(96) << 32
        self._uids_made = 0

    @property
    def operation_id(self) -> int:
        """Number of this operation; its row is written when it is first asked for."""
        if self._operation_id is None:
            row = {
                "uid": self.new_uid(),
                "at": self.at,
                "who": self._who,
                "command": self._command,
                "summary": self._summary,
                "program_version": campaign.__version__,
                "undoes_id": self._undoes_id,
            }
            self._operation_id = _inserted(self.connection, operations, row)
        return self._operation_id

    def new_uid(self) -> str:
        """A fresh identifier in the form of a UUID (version 8: bits of our own choice)."""
        return self.new_uids(1)[0]

    def new_uids(self, number: int) -> list[str]:
        """Fresh identifiers, one after another."""
        base = self._uid_base & ~(0xF << 76) | (0x8 << 76)
        base = base & ~(0x3 << 62) | (0x2 << 62)
        # The last 32 bits are the last eight digits.
        begin = str(uuid.UUID(int=base))[:-8]
        first, self._uids_made = self._uids_made, self._uids_made + number
        if self._uids_made > 1 << 32:
            raise OverflowError("one operation makes at most 4294967296 rows")
        if number == 1:
            return [f"{begin}{first:08x}"]
        from campaign.catalogue.blocks import eight_digits

        return [begin + digits for digits in eight_digits(first, self._uids_made)]

    def summarise(self, summary: str) -> None:
        """Say in one line what the operation did; the last word counts."""
        self._summary = summary

    def undoes(self, operation_id: int) -> None:
        """Say, before anything is changed, which operation this one takes back."""
        if self._operation_id is not None:
            raise ValueError("the operation has begun already")
        self._undoes_id = operation_id
        self.changed = True

    def insert(self, table: Table[Any], values: Values) -> int:
        """Insert one row and return its number.

        Raises
        ------
        ValueRefused
            When a column must not hold the value; ``details`` names table and column.
        """
        number = {} if "id" in values else self._numbering.fresh(table)
        row_id = _inserted(self.connection, table, {**number, **values})
        kept = {name: value for name, value in values.items() if name != "id"}
        self._record(table, row_id, "insert", None, _stored(table, kept))
        return row_id

    def update(self, table: Table[Any], row_id: int, values: Values) -> bool:
        """Change columns of one row; what is equal already is left out. False when nothing differed."""
        before = self.stored_row(table, row_id)
        after = _stored(table, values)
        differing = [name for name in after if after[name] != before[name]]
        if not differing:
            return False
        self.connection.execute(
            sql_update(table).where(table.c.id == row_id).values({name: values[name] for name in differing})
        )
        self._record(
            table,
            row_id,
            "update",
            {name: before[name] for name in differing},
            {name: after[name] for name in differing},
        )
        return True

    def delete(self, table: Table[Any], row_id: int) -> None:
        """Remove one row; its columns stay in the journal."""
        before = self.stored_row(table, row_id)
        self.connection.execute(sql_delete(table).where(table.c.id == row_id))
        self._record(table, row_id, "delete", before, None)

    def insert_many(self, table: Table[Any], rows: Sequence[Values]) -> int:
        """Insert many rows with one line in the journal, and return their number.

        Only for tables whose rows carry ``operation_id``: that is how they are found again.
        """
        if "operation_id" not in table.c:
            raise ValueError(f"rows of {table.name} do not say which operation brought them")
        if not rows:
            return 0
        operation_id = self.operation_id
        # Columns that are unknown in every row need no place in the statement.
        given = sorted({name for row in rows for name, value in row.items() if value is not None})
        rows = [{name: row.get(name) for name in given} | {"operation_id": operation_id} for row in rows]
        try:
            self.connection.execute(insert(table), rows)
        except ValueRefused as refusal:
            for position, row in enumerate(rows):
                _name_culprit(refusal, table, row)
                if "column" in refusal.details:
                    refusal.details["row"] = position
                    break
            raise
        self._record(table, None, "insert many", None, {"rows": len(rows)})
        return len(rows)

    def insert_columns(
        self,
        table: Table[Any],
        same: Values,
        blocks: Iterable[Mapping[str, Cells]],
    ) -> int:
        """Insert blocks of rows given column by column, with one line in the journal; return their number.

        As :func:`insert_many`, for a million rows. ``same`` holds the columns that are alike in all rows;
        each block has the same columns.

        Raises
        ------
        ValueRefused
            When a column must not hold a value; ``details`` names table, column and row of the block.
        LookupError
            In :func:`loading`, when a row refers to one that is not there.
        """
        from campaign.catalogue.blocks import BlockInsertion

        own = _stored(table, {**same, "operation_id": self.operation_id})
        insertion = BlockInsertion(self.connection, table, own)
        total = sum(insertion.insert(block) for block in blocks)
        if total:
            self._record(table, None, "insert many", None, {"rows": total})
        return total

    def update_many(
        self,
        table: Table[Any],
        condition: ColumnElement[bool],
        values: Values,
        action: str,
        about: Values,
        told: Callable[[int], None],
    ) -> int:
        """Change all rows that fulfil ``condition`` with one line in the journal, and return their number.

        ``about`` is what the journal keeps, together with that number; it must tell how to find the rows.
        ``told`` gets the number of rows done after each portion.
        """
        number, rows = table.c.id, 0
        first, last = self.connection.execute(
            select(func.min(number), func.max(number)).where(condition)
        ).one()
        for start in () if first is None else range(first, last + 1, _PORTION):
            portion = and_(condition, number >= start, number < start + _PORTION)
            rows += self.connection.execute(sql_update(table).where(portion).values(values)).rowcount
            told(rows)
        if rows:
            self._record(table, None, action, None, {**about, "rows": rows})
        return rows

    def stored_row(self, table: Table[Any], row_id: int) -> dict[str, Any]:
        """The row as the database holds it.

        Raises
        ------
        LookupError
            When there is no such row: the caller took the number from somewhere else.
        """
        row = self.connection.execute(select(table).where(table.c.id == row_id)).mappings().first()
        if row is None:
            raise LookupError(f"{table.name} has no row {row_id}")
        return _stored(table, {name: value for name, value in row.items() if name != "id"})

    def finish(self) -> None:
        """Write the summary, or take back an operation that changed nothing. Called before the commit."""
        if self._operation_id is None:
            return
        own_row = operations.c.id == self._operation_id
        if self.changed:
            self.connection.execute(sql_update(operations).where(own_row).values(summary=self._summary))
        else:
            self.connection.execute(sql_delete(operations).where(own_row))

    def _record(self, table: Table[Any], row_id: int | None, action: str, before: Any, after: Any) -> None:
        self.connection.execute(
            insert(changes),
            {
                "operation_id": self.operation_id,
                "table_name": table.name,
                "row_id": row_id,
                "action": action,
                "before": before,
                "after": after,
            },
        )
        self.changed = True


@contextmanager
def reading(database: Database, *, busy_timeout_s: float = BUSY_TIMEOUT_S) -> Iterator[Connection]:
    """A connection that sees one state of the catalogue and cannot change it.

    Leave the block before long computations: a writer cannot finish while somebody reads.

    Raises
    ------
    DatabaseUnusable
        When there is no database of this program and revision; the file is left as it is.
    DatabaseBusy
        When a writer holds the file for longer than the timeout.
    """
    address = address_of(database)
    roll_back_interrupted_write(address, busy_timeout_s)
    engine = reading_engine(address, busy_timeout_s)
    with translated(address), engine.connect() as connection, connection.begin():
        refuse_other_revision(connection, address)
        yield connection


@contextmanager
def writing(
    database: Database,
    *,
    at: datetime,
    who: str,
    command: str,
    summary: str = "",
    busy_timeout_s: float = BUSY_TIMEOUT_S,
) -> Iterator[Writing]:
    """One operation on the catalogue: committed as a whole at the end, or not at all.

    Raises
    ------
    DatabaseUnusable, DatabaseBusy, StorageFull
        As for reading, and when there is no room or no permission to write; nothing was changed then.
    """
    address = address_of(database)
    with _transaction(writing_engine(address, busy_timeout_s), address) as connection:
        operation = Writing(connection, at=at, who=who, command=command, summary=summary)
        yield operation
        operation.finish()
        connection.commit()


@contextmanager
def loading(
    database: Database, *, at: datetime, who: str, command: str, busy_timeout_s: float = BUSY_TIMEOUT_S
) -> Iterator[Writing]:
    """The same as :func:`writing`, for rows by the hundred thousand.

    References of what :meth:`Writing.insert_columns` enters are looked up a column at a time, and not by
    SQLite row by row. Beside them may go in only what refers to nothing but the operation.
    """
    address = address_of(database)
    with _transaction(loading_engine(address, busy_timeout_s), address) as connection:
        operation = Writing(connection, at=at, who=who, command=command, summary="")
        yield operation
        operation.finish()
        connection.commit()


@contextmanager
def rehearsing(
    database: Database,
    *,
    at: datetime,
    who: str,
    command: str,
    summary: str = "",
    busy_timeout_s: float = BUSY_TIMEOUT_S,
) -> Iterator[Writing]:
    """The same as :func:`writing`, but all of it is taken back at the end."""
    address = address_of(database)
    with _transaction(writing_engine(address, busy_timeout_s), address) as connection:
        yield Writing(connection, at=at, who=who, command=command, summary=summary)


@contextmanager
def _transaction(engine: Engine, address: Address) -> Iterator[Connection]:
    """A transaction that may write. Closing the connection takes back what was not committed."""
    with translated(address), engine.connect() as connection:
        connection.begin()
        refuse_other_revision(connection, address)
        yield connection


def _inserted(connection: Connection, table: Table[Any], values: Values) -> int:
    try:
        key = connection.execute(insert(table), values).inserted_primary_key
    except ValueRefused as refusal:
        _name_culprit(refusal, table, values)
        raise
    if key is None:
        raise LookupError(f"{table.name} gave no number for the new row")
    return int(key[0])


def _stored(table: Table[Any], values: Values) -> dict[str, Any]:
    """Values as the database holds them, which is what the journal keeps."""
    stored = {}
    for name, value in values.items():
        convert = getattr(table.c[name].type, "process_bind_param", None)
        try:
            stored[name] = value if convert is None else convert(value, None)
        except ValueRefused as refusal:
            refusal.details.setdefault("table", table.name)
            refusal.details.setdefault("column", name)
            raise
    return stored


def _name_culprit(refusal: ValueRefused, table: Table[Any], values: Values) -> None:
    """Add table and column to a refusal, which the column type itself cannot know."""
    try:
        _stored(table, values)
    except ValueRefused as again:
        refusal.details.update(again.details)
