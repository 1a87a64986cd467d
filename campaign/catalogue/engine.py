"""Engines that keep transactions in our own hands.

Left alone, SQLite's driver loses updates and tears migrations in half, because it begins and ends
transactions by rules of its own. Here the driver begins nothing; a hook does: ``BEGIN`` for readers and
``BEGIN IMMEDIATE`` for writers, who then never wait for a lock in the middle of their work.
"""

from __future__ import annotations

import os
import sqlite3
from functools import cache
from typing import Any, Final, Literal, cast
from urllib.parse import quote

from sqlalchemy import URL, Connection, Dialect, Engine, create_engine, event
from sqlalchemy.pool import NullPool

from campaign.catalogue.address import Address
from campaign.catalogue.places import refuse_unless_file
from campaign.errors import DatabaseUnusable

BUSY_TIMEOUT_S: Final = 5.0

# Any number will do on a server, as long as every campaign uses the same.
WRITERS_LOCK: Final = 7_305_114_262

# Compiled statements by dialect and form: as many as the program has.
_COMPILED: dict[Any, Any] = {}

# How a SQLite file may be opened: "ro" and "rw" never create it.
FileMode = Literal["ro", "rw", "rwc"]


def reading_engine(address: Address, busy_timeout_s: float = BUSY_TIMEOUT_S) -> Engine:
    """An engine whose transactions only read; a missing file stays missing."""
    if address.path is not None:
        refuse_unless_file(address)
        engine = _sqlite_engine(address, "ro", busy_timeout_s, foreign_keys=True)
        _begin_with(engine, "BEGIN")
        return engine
    engine = _postgresql_engine(address, busy_timeout_s)
    # One snapshot for all statements, as SQLite gives it.
    _begin_with(engine, "SET TRANSACTION ISOLATION LEVEL REPEATABLE READ, READ ONLY")
    return engine


def writing_engine(address: Address, busy_timeout_s: float = BUSY_TIMEOUT_S) -> Engine:
    """An engine whose transactions take the right to write at once; a missing file stays missing."""
    if address.path is not None:
        refuse_unless_file(address)
        engine = _sqlite_engine(address, "rw", busy_timeout_s, foreign_keys=True)
        _begin_with(engine, "BEGIN IMMEDIATE")
        return engine
    return _postgresql_writing_engine(address, busy_timeout_s)


def loading_engine(address: Address, busy_timeout_s: float) -> Engine:
    """An engine for writing many rows, of which ``campaign.catalogue.blocks`` looks up the references."""
    if address.path is not None:
        refuse_unless_file(address)
        return migration_engine(address, busy_timeout_s, "rw")
    return _postgresql_writing_engine(address, busy_timeout_s)


def migration_engine(address: Address, busy_timeout_s: float, mode: FileMode) -> Engine:
    """An engine for migrations: as for writing, with foreign keys off from the start.

    With foreign keys on, rebuilding a parent table deletes its children; and they cannot be switched
    inside a transaction.
    """
    if address.path is not None:
        engine = _sqlite_engine(address, mode, busy_timeout_s, foreign_keys=False)
        _begin_with(engine, "BEGIN IMMEDIATE")
        return engine
    return _postgresql_writing_engine(address, busy_timeout_s)


def sqlite_connection(
    address: Address, mode: FileMode, busy_timeout_s: float = BUSY_TIMEOUT_S, *, foreign_keys: bool = True
) -> sqlite3.Connection:
    """A connection of the driver that begins no transaction by itself."""
    # The path is quoted byte by byte: it may hold "?", "#", "%" or bytes that are not text.
    path = quote(os.fsencode(os.path.abspath(os.fspath(address.path or ""))))
    # The timeout comes first, so that even the settings below wait for other writers.
    connection = sqlite3.connect(
        f"file:{path}?mode={mode}", timeout=busy_timeout_s, isolation_level=None, uri=True
    )
    try:
        connection.execute(f"PRAGMA foreign_keys = {'ON' if foreign_keys else 'OFF'}")
        connection.execute("PRAGMA synchronous = FULL")
    except BaseException:
        connection.close()
        raise
    return connection


def _sqlite_engine(address: Address, mode: FileMode, busy_timeout_s: float, *, foreign_keys: bool) -> Engine:
    def connect() -> sqlite3.Connection:
        return sqlite_connection(address, mode, busy_timeout_s, foreign_keys=foreign_keys)

    dialect, url = _sqlite_dialect()
    return Engine(
        NullPool(cast(Any, connect), dialect=dialect),
        dialect,
        url,
        execution_options={"compiled_cache": _COMPILED},
    )


@cache
def _sqlite_dialect() -> tuple[Dialect, URL]:
    """One dialect for all files: a statement is compiled for a dialect, and so only once in a process.

    Compiling it is half of the time of a small query.
    """
    engine = create_engine("sqlite://", poolclass=NullPool)
    # The first connection tells it what the library can do; this one is in memory.
    engine.connect().close()
    return engine.dialect, engine.url


def _begin_with(engine: Engine, statement: str) -> None:
    def begin(connection: Connection) -> None:
        connection.exec_driver_sql(statement)

    event.listen(engine, "begin", begin)


def _postgresql_writing_engine(address: Address, busy_timeout_s: float) -> Engine:
    # One writer at a time, as on SQLite, so that what a study reads before it writes stays true. In a test of
    # four programs that count to fifty each, the server's own isolation lost 135 of 200 updates.
    engine = _postgresql_engine(address, busy_timeout_s)
    _begin_with(engine, f"SELECT pg_advisory_xact_lock({WRITERS_LOCK})")
    return engine


def _postgresql_engine(address: Address, busy_timeout_s: float) -> Engine:
    assert address.url is not None
    options: dict[str, Any] = {"options": f"-c lock_timeout={int(busy_timeout_s * 1000)}"}
    try:
        return create_engine(address.url, poolclass=NullPool, connect_args=options)
    except ModuleNotFoundError:
        raise DatabaseUnusable(
            "The driver for PostgreSQL is not installed.",
            why="It is not needed for a database in a file.",
            hint="Install it: pip install 'campaign[postgres]'",
            code="database-driver-missing",
        ) from None
