"""Blocks of rows into a table: many to a statement, their references looked up a column at a time.

SQLite spends more on beginning and ending a statement than on a row of it. Many rows to a statement cost half
of as many statements, but only where it does not look up references by itself: with foreign keys on, such a
statement has to be ready to be taken back alone, and keeps a copy of every page it touches.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
from sqlalchemy import Connection, Table, select

from campaign.catalogue.guards import Cells, guarded_columns, insertion

_ROWS_IN_STATEMENT = 50
# SQLite binds at most 32,766.
_MOST_BOUND = 30_000
_KEYS_IN_STATEMENT = 500


class BlockInsertion:
    """Rows of one table, block by block; ``same`` is what all have alike, as the driver may have it."""

    def __init__(self, connection: Connection, table: Table[Any], same: Mapping[str, Any]) -> None:
        self._connection = connection
        self._table = table
        self._same = same
        self._by_number = connection.dialect.paramstyle == "qmark"
        self._is_alone = _looks_up_nothing(connection)
        self._there: dict[str, set[int]] = {}
        self._statements: dict[int, str] = {}
        if self._is_alone:
            for name, value in same.items():
                self._look_up(name, [value])

    def insert(self, block: Mapping[str, Cells]) -> int:
        """Insert one block, each with the same columns, and return the number of its rows.

        Raises
        ------
        ValueRefused
            When a column must not hold a value; ``details`` names table, column and row of the block.
        LookupError
            When a row refers to one that is not there.
        """
        places, columns = guarded_columns(self._table, block)
        if not self._by_number:
            columns = [columns[place] for place in places.values()]
        if self._is_alone:
            for name, place in places.items():
                self._look_up(name, columns[place])
        rows, width = len(columns[0]), len(columns)
        if any(len(column) != rows for column in columns):
            raise ValueError("the columns of a block have different lengths")
        cells: list[Any] = [None] * (rows * width)
        for place, column in enumerate(columns):
            cells[place::width] = column
        together = min(_ROWS_IN_STATEMENT, _MOST_BOUND // width) if self._is_alone else 1
        done = 0
        for number in dict.fromkeys((together, 1)):
            step = number * width
            until = len(cells) - (len(cells) - done) % step
            self._execute(places, number, [tuple(cells[at : at + step]) for at in range(done, until, step)])
            done = until
        return rows

    def _execute(self, places: Mapping[str, int], rows: int, bound: list[tuple[Any, ...]]) -> None:
        if not bound:
            return
        if rows not in self._statements:
            self._statements[rows] = insertion(
                self._connection.dialect, self._table, places, self._same, rows
            )
        self._connection.exec_driver_sql(self._statements[rows], bound)

    def _look_up(self, name: str, values: Iterable[Any]) -> None:
        """What foreign keys hold, where the database was told to leave it to us."""
        for key in self._table.c[name].foreign_keys:
            there = self._there.setdefault(name, set())
            wanted = sorted(set(values) - there - {None})
            for start in range(0, len(wanted), _KEYS_IN_STATEMENT):
                some = wanted[start : start + _KEYS_IN_STATEMENT]
                there.update(
                    self._connection.execute(select(key.column).where(key.column.in_(some))).scalars()
                )
            if missing := [value for value in wanted if value not in there]:
                raise LookupError(f"{self._table.name}.{name} refers to {missing[0]}, which is not there")


def _looks_up_nothing(connection: Connection) -> bool:
    if connection.dialect.name != "sqlite":
        return False
    return not connection.exec_driver_sql("PRAGMA foreign_keys").scalar_one()


def eight_digits(first: int, until: int) -> list[str]:
    """The whole numbers from ``first`` to before ``until`` in hexadecimal."""
    together = np.arange(first, until, dtype=np.uint32).astype(">u4").tobytes().hex()
    return [together[at : at + 8] for at in range(0, len(together), 8)]
