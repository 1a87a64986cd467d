"""Building blocks of the tables: the metadata with its naming convention, and groups of columns.

A measured quantity is three columns (``x``, ``x_minus``, ``x_plus``), an instant six. The same groups
are written out once more in the migrations, which must not change when this file does.
"""

from __future__ import annotations

from datetime import datetime
from typing import Any

from sqlalchemy import CheckConstraint, Column, ForeignKey, Index, MetaData, text

from campaign.catalogue.types import Choice, JsonText, Line, Prose, Real, UtcText, Whole

# Every constraint gets a name, because a constraint without one cannot be changed by a migration.
metadata = MetaData(
    naming_convention={
        "pk": "pk_%(table_name)s",
        "fk": "fk_%(table_name)s_%(column_0_N_name)s",
        "uq": "uq_%(table_name)s_%(column_0_N_name)s",
        "ix": "ix_%(table_name)s_%(column_0_N_name)s",
        "ck": "ck_%(table_name)s_%(constraint_name)s",
    }
)

SCALES = ("utc", "tt", "tdb", "tai", "ut")
PLACES = ("observatory", "geocentre", "heliocentre", "barycentre")

# One instance of each type serves all columns: building two hundred of them would show at start-up.
_REAL, _WHOLE, _UTC, _PROSE, _JSON = Real(), Whole(), UtcText(), Prose(), JsonText()
_SCALE, _PLACE, _TIME_TEXT = Choice(*SCALES), Choice(*PLACES), Line(200)

MaybeNumber = Column[float | None]
MaybeText = Column[str | None]
MeasuredColumns = tuple[MaybeNumber, MaybeNumber, MaybeNumber]
MomentColumns = tuple[MaybeNumber, MaybeNumber, MaybeNumber, MaybeText, MaybeText, MaybeText]


def identity() -> Column[int]:
    """The row's own number, given by the database."""
    return Column(_WHOLE, primary_key=True)


def number() -> Column[float]:
    """A finite float."""
    return Column(_REAL, nullable=False)


def maybe_number() -> MaybeNumber:
    """A finite float, NULL when unknown."""
    return Column(_REAL, nullable=True)


def whole() -> Column[int]:
    """A whole number."""
    return Column(_WHOLE, nullable=False)


def maybe_whole() -> Column[int | None]:
    """A whole number, NULL when unknown."""
    return Column(_WHOLE, nullable=True)


def line(length: int) -> Column[str]:
    """One line of text."""
    return Column(Line(length), nullable=False)


def maybe_line(length: int) -> MaybeText:
    """One line of text, NULL when unknown."""
    return Column(Line(length), nullable=True)


def prose() -> Column[str]:
    """Text of several lines, empty when there is none."""
    return Column(_PROSE, nullable=False)


def choice(*accepted: str) -> Column[str]:
    """One word of a closed list."""
    return Column(Choice(*accepted), nullable=False)


def maybe_choice(*accepted: str) -> MaybeText:
    """One word of a closed list, NULL when it does not apply."""
    return Column(Choice(*accepted), nullable=True)


def document() -> Column[Any]:
    """A JSON document."""
    return Column(_JSON, nullable=False)


def maybe_document() -> Column[Any]:
    """A JSON document that may be absent."""
    return Column(_JSON, nullable=True)


def reference(target: str) -> Column[int]:
    """A foreign key to ``target`` (``table.column``)."""
    return Column(_WHOLE, ForeignKey(target), nullable=False)


def maybe_reference(target: str) -> Column[int | None]:
    """A foreign key to ``target`` that may be absent."""
    return Column(_WHOLE, ForeignKey(target), nullable=True)


def instant() -> Column[datetime]:
    """When something was done to the catalogue, such as the entry of a row."""
    return Column(_UTC, nullable=False)


def maybe_instant() -> Column[datetime | None]:
    """When a row stopped being true; NULL while it still is."""
    return Column(_UTC, nullable=True)


def measured() -> MeasuredColumns:
    """Value, size of the lower error, size of the upper error; NULL error: unknown."""
    return maybe_number(), maybe_number(), maybe_number()


def moment() -> MomentColumns:
    """``bmjd_tdb``, its two errors in days, and text, scale and place as typed."""
    return (
        maybe_number(),
        maybe_number(),
        maybe_number(),
        Column(_TIME_TEXT, nullable=True),
        Column(_SCALE, nullable=True),
        Column(_PLACE, nullable=True),
    )


def partial_index(name: str, *columns: str, condition: str, unique: bool) -> Index:
    """An index over the rows that fulfil ``condition``.

    The migrations name the condition for PostgreSQL too. Here that would load its dialect, a tenth of the
    start-up of every command, for tables that only serve statements and are never created from here.
    """
    return Index(name, *columns, unique=unique, sqlite_where=text(condition))


def check(name: str, condition: str) -> CheckConstraint:
    """A named CHECK."""
    return CheckConstraint(condition, name=name)


def error_checks(*quantities: str) -> list[CheckConstraint]:
    """Errors are sizes, and there is none without a value."""
    return [
        check(
            quantity,
            f"{quantity}_minus >= 0 AND {quantity}_plus >= 0 AND ({quantity} IS NOT NULL"
            f" OR ({quantity}_minus IS NULL AND {quantity}_plus IS NULL))",
        )
        for quantity in quantities
    ]


def moment_checks(*prefixes: str) -> list[CheckConstraint]:
    """The same for instants: errors are sizes, and there is none without an instant."""
    return [
        check(
            f"{prefix}_errors",
            f"{prefix}_minus_d >= 0 AND {prefix}_plus_d >= 0 AND ({prefix}_bmjd_tdb IS NOT NULL"
            f" OR ({prefix}_minus_d IS NULL AND {prefix}_plus_d IS NULL))",
        )
        for prefix in prefixes
    ]
