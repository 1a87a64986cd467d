"""Between dataclasses of the model and columns of the tables."""

from __future__ import annotations

from collections.abc import Collection, Iterable
from datetime import datetime
from typing import Any

from sqlalchemy import Column, ColumnElement, Table, and_, or_, select, true

from campaign.catalogue.tables_history import lapses
from campaign.model.instants import Moment
from campaign.model.measured import Measured

# More numbers than this are not put into a statement: all rows are read and the others left out.
MOST_IN_STATEMENT = 500


def measured_values(name: str, quantity: Measured | None) -> dict[str, float | None]:
    """The three columns of a measured quantity."""
    if quantity is None:
        return {name: None, f"{name}_minus": None, f"{name}_plus": None}
    return {name: quantity.value, f"{name}_minus": quantity.minus, f"{name}_plus": quantity.plus}


def measured_names(*names: str) -> list[str]:
    """Names of the columns of measured quantities, in the order in which they are read."""
    return [f"{name}{part}" for name in names for part in ("", "_minus", "_plus")]


def measured_or_none(value: float | None, minus: float | None, plus: float | None) -> Measured | None:
    """A measured quantity from its three columns."""
    return None if value is None else Measured(value, minus, plus)


def moment_values(prefix: str, moment: Moment | None) -> dict[str, Any]:
    """The six columns of an instant."""
    return {
        f"{prefix}_bmjd_tdb": None if moment is None else moment.bmjd_tdb,
        f"{prefix}_minus_d": None if moment is None else moment.minus_d,
        f"{prefix}_plus_d": None if moment is None else moment.plus_d,
        f"{prefix}_text": None if moment is None else moment.text,
        f"{prefix}_scale": None if moment is None else moment.scale,
        f"{prefix}_place": None if moment is None else moment.place,
    }


def moment_names(prefix: str) -> list[str]:
    """Names of the six columns of an instant, in the order in which they are read."""
    return list(moment_values(prefix, None))


def columns_of(table: Table[Any], names: Iterable[str]) -> list[Column[Any]]:
    """Columns by name."""
    return [table.c[name] for name in names]


def among(column: Column[int], numbers: Collection[int] | None) -> ColumnElement[bool]:
    """The condition that ``column`` is one of ``numbers``; everything when they are None or too many."""
    if numbers is None or len(numbers) > MOST_IN_STATEMENT:
        return true()
    return column.in_(sorted(numbers))


def in_force(
    begin: Column[datetime], end: Column[datetime | None], known_at: datetime | None
) -> ColumnElement[bool]:
    """The condition that a row holds: now, or at ``known_at``."""
    return in_use(end, known_at) if known_at is None else and_(begin <= known_at, in_use(end, known_at))


def in_use(end: Column[datetime | None], known_at: datetime | None) -> ColumnElement[bool]:
    """The condition that a row is not ended or withdrawn: now, or at ``known_at``.

    What was taken back and put back again was out of use in between.
    """
    if known_at is None:
        return end.is_(None)
    table = end.table
    lapsed = select(lapses.c.row_id).where(
        lapses.c.table_name == table.name,
        lapses.c.row_id.is_not(None),
        lapses.c.from_at <= known_at,
        lapses.c.until_at > known_at,
    )
    return and_(or_(end.is_(None), end > known_at), table.c.id.not_in(lapsed))


def kept(number: int, numbers: Collection[int] | None) -> bool:
    """Whether a row belongs, for the case that :func:`among` had to let everything through."""
    return numbers is None or number in numbers
