"""Is this a catalogue of ours, of the right revision, and whole? Asked before anything else."""

from __future__ import annotations

from contextlib import closing

from sqlalchemy import Connection, inspect, text
from sqlalchemy.exc import OperationalError, ProgrammingError

from campaign.catalogue.address import Address
from campaign.catalogue.engine import sqlite_connection
from campaign.catalogue.failures import missing, translated
from campaign.catalogue.places import has_leftover_journal, refuse_unless_file
from campaign.catalogue.revision import HEAD_REVISION, KNOWN_REVISIONS
from campaign.errors import CampaignError, DatabaseUnusable

_REVISION = text(
    "SELECT v.version_num, i.value FROM alembic_version v LEFT JOIN campaign_info i ON i.key = 'format'"
)


def read_revision(connection: Connection) -> str | None:
    """The revision of the catalogue, or None where there is none of ours.

    On PostgreSQL a missing table ends the transaction, so the table is looked for first.
    """
    if connection.dialect.name != "sqlite":
        found = connection.execute(
            text(
                "SELECT to_regclass('alembic_version') IS NOT NULL"
                " AND to_regclass('campaign_info') IS NOT NULL"
            )
        ).scalar()
        if not found:
            return None
    try:
        row = connection.execute(_REVISION).first()
    except (OperationalError, ProgrammingError) as error:
        if getattr(error.orig, "sqlite_errorname", "") == "SQLITE_ERROR":
            return None
        raise
    return None if row is None or row[1] is None else str(row[0])


def holds_anything(connection: Connection) -> bool:
    """Whether there is any table or view."""
    found = inspect(connection)
    return bool(found.get_table_names() or found.get_view_names())


def refuse_other_revision(connection: Connection, address: Address) -> None:
    """Refuse a database that is not ours, or of another revision than this program's.

    Raises
    ------
    DatabaseUnusable
    """
    revision = read_revision(connection)
    if revision == HEAD_REVISION:
        return
    if revision is None:
        raise foreign(address) if holds_anything(connection) else missing(address)
    if revision in KNOWN_REVISIONS:
        raise older(address, revision)
    raise newer(address, revision)


def foreign(address: Address) -> DatabaseUnusable:
    """A database, but not one of ours."""
    return DatabaseUnusable(
        f"{address.shown} is a database, but not one of campaign.",
        why="The tables that campaign makes are not in it.",
        hint="Name another with --db, or begin a new one elsewhere: campaign begin --db FILE.",
        code="database-foreign",
    )


def older(address: Address, revision: str) -> DatabaseUnusable:
    """A catalogue that must be upgraded first."""
    return DatabaseUnusable(
        f"The database {address.shown} was made by an older campaign.",
        why=f"It has revision {revision}; this program works with revision {HEAD_REVISION}.",
        hint="Bring it up to date (a snapshot is kept beside it): campaign upgrade.",
        code="database-older",
        details={"revision": revision, "expected": HEAD_REVISION},
    )


def newer(address: Address, revision: str) -> DatabaseUnusable:
    """A catalogue from a later program."""
    return DatabaseUnusable(
        f"The database {address.shown} was made by a newer campaign.",
        why=f"Its revision {revision} is unknown here; this program works with revision {HEAD_REVISION}.",
        hint="Install the newer campaign: pip install --upgrade campaign.",
        code="database-newer",
        details={"revision": revision, "expected": HEAD_REVISION},
    )


def roll_back_interrupted_write(address: Address, busy_timeout_s: float) -> None:
    """Let SQLite finish what a killed writer left, which a connection that only reads may not do.

    Where it cannot be done (no permission, somebody writes just now) the reader tries as it is, and
    reports what it then finds.
    """
    if address.path is None or not has_leftover_journal(address.path):
        return
    refuse_unless_file(address)
    try:
        with translated(address), closing(sqlite_connection(address, "rw", busy_timeout_s)) as connection:
            # Any read takes the lock under which a leftover journal is played back.
            connection.execute("SELECT 1 FROM sqlite_master LIMIT 1")
    except CampaignError:
        return
