"""Numbers of rows that no other row ever had.

SQLite gives the number of the newest row again once that row is gone, and then a line of the journal would
seem to speak of another entry than the one that it was written for. PostgreSQL never does.
"""

from __future__ import annotations

from typing import Any

from sqlalchemy import Connection, Table, func, select

from campaign.catalogue.lifecycle import LOSING_ROWS
from campaign.catalogue.tables import changes


class Numbering:
    """Gives numbers to the new rows of one operation, which nobody else can write beside."""

    def __init__(self, connection: Connection) -> None:
        self._connection = connection
        self._given: dict[str, int] = {}

    def fresh(self, table: Table[Any]) -> dict[str, int]:
        """The number of a new row as a column, where the database itself might repeat one."""
        if self._connection.dialect.name != "sqlite" or table.name not in LOSING_ROWS:
            return {}
        if table.name not in self._given:
            self._given[table.name] = self._highest(table)
        self._given[table.name] += 1
        return {"id": self._given[table.name]}

    def _highest(self, table: Table[Any]) -> int:
        present = select(func.max(table.c.id)).scalar_subquery()
        told = select(func.max(changes.c.row_id)).where(changes.c.table_name == table.name).scalar_subquery()
        return max(number or 0 for number in self._connection.execute(select(present, told)).one())
