"""Making a catalogue and bringing an older one up to date. The only place that uses Alembic.

The whole upgrade is one transaction on a connection of its own that has foreign keys off. The write
lock is taken first and the revision read under it, so that of several programs that start at once one
does the work and the others find it done. An existing file is snapshotted under the same lock.
"""

from __future__ import annotations

import errno
import os
import re
import uuid
from collections.abc import Callable
from contextlib import closing, suppress
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

from sqlalchemy import Connection, func, inspect, select, text
from sqlalchemy import table as bare_table

import campaign
from campaign.catalogue.address import Address, Database, address_of
from campaign.catalogue.engine import migration_engine, sqlite_connection
from campaign.catalogue.failures import missing, translated
from campaign.catalogue.opening import foreign, holds_anything, newer, read_revision, refuse_other_revision
from campaign.catalogue.places import refuse_bad_place, refuse_unless_file
from campaign.catalogue.revision import FORMAT, HEAD_REVISION, KNOWN_REVISIONS
from campaign.catalogue.types import utc_text
from campaign.errors import CampaignError, DatabaseUnusable, StorageFull

if TYPE_CHECKING:
    from alembic.config import Config

SNAPSHOTS_KEPT = 3
_UNFINISHED = ".unfinished"
# Others may be upgrading: that takes longer than an everyday change.
LOCK_TIMEOUT_S = 60.0


@dataclass(frozen=True, slots=True)
class UpgradeReport:
    """What was done: nothing, when both revisions are equal. ``snapshot`` is the copy kept before."""

    created: bool
    from_revision: str | None
    to_revision: str
    snapshot: str | None = None


def begin_database(
    database: Database, *, at: datetime, lock_timeout_s: float = LOCK_TIMEOUT_S
) -> UpgradeReport:
    """Make a new catalogue. One that is there already is left as it is and reported as not created.

    Raises
    ------
    DatabaseUnusable
        When something else is there, the folder is missing, or the catalogue has another revision.
    DatabaseBusy, StorageFull
        With nothing made.
    """
    address = address_of(database)
    refuse_bad_place(address)

    def work(connection: Connection, revision: str | None) -> UpgradeReport:
        if revision is not None:
            refuse_other_revision(connection, address)
            return UpgradeReport(False, revision, revision)
        if holds_anything(connection):
            raise foreign(address)
        _migrate(connection)
        _describe_campaign(connection, at)
        return UpgradeReport(True, None, HEAD_REVISION)

    return _under_lock(address, work, lock_timeout_s, create=True)


def upgrade_database(database: Database, *, lock_timeout_s: float = LOCK_TIMEOUT_S) -> UpgradeReport:
    """Bring a catalogue to this program's revision, after a snapshot beside it (SQLite only).

    Raises
    ------
    DatabaseUnusable
        When there is no catalogue, it is newer, or the migrated one is not sound; it stays as it was.
    DatabaseBusy, StorageFull
        With nothing changed.
    """
    address = address_of(database)
    refuse_unless_file(address)

    def work(connection: Connection, revision: str | None) -> UpgradeReport:
        if revision is None:
            raise foreign(address) if holds_anything(connection) else missing(address)
        if revision == HEAD_REVISION:
            return UpgradeReport(False, revision, revision)
        if revision not in KNOWN_REVISIONS:
            raise newer(address, revision)
        snapshot = _take_snapshot(address) if address.is_file else None
        rows_before = _row_counts(connection)
        _migrate(connection)
        _refuse_unsound(connection, rows_before)
        return UpgradeReport(False, revision, HEAD_REVISION, snapshot)

    report = _under_lock(address, work, lock_timeout_s, create=False)
    if report.snapshot is not None:
        _drop_old_snapshots(address)
    return report


def migrations_folder() -> Path:
    """Where the migrations are: inside the installed package, else in the checkout.

    Looked for beside the package's own files, because an editable install may leave a stale copy elsewhere.
    """
    package = Path(campaign.__file__).parent
    installed = package / "_migrations"
    return installed if installed.is_dir() else package.parent / "migrations"


def alembic_config() -> Config:
    """Alembic's settings, made in code: there is no settings file at run time."""
    from alembic.config import Config

    config = Config()
    config.set_main_option("script_location", str(migrations_folder()).replace("%", "%%"))
    config.set_main_option("path_separator", "os")
    return config


def _under_lock(
    address: Address,
    work: Callable[[Connection, str | None], UpgradeReport],
    lock_timeout_s: float,
    *,
    create: bool,
) -> UpgradeReport:
    engine = migration_engine(address, lock_timeout_s, "rwc" if create else "rw")
    with translated(address), engine.connect() as connection:
        connection.begin()
        report = work(connection, read_revision(connection))
        if report.from_revision == report.to_revision:
            connection.rollback()
            return report
        connection.commit()
        if address.is_file:
            _refuse_damaged(connection, address)
    return report


def _migrate(connection: Connection) -> None:
    from alembic import command

    config = alembic_config()
    config.attributes["connection"] = connection
    command.upgrade(config, HEAD_REVISION)


def _describe_campaign(connection: Connection, at: datetime) -> None:
    for key, value in (("campaign_uid", str(uuid.uuid4())), ("format", FORMAT), ("begun_at", utc_text(at))):
        connection.execute(
            text("INSERT INTO campaign_info (key, value) VALUES (:key, :value)"), {"key": key, "value": value}
        )


def _table_names(connection: Connection) -> list[str]:
    return sorted(inspect(connection).get_table_names())


def _row_counts(connection: Connection) -> dict[str, int]:
    return {
        name: connection.execute(select(func.count()).select_from(bare_table(name))).scalar_one()
        for name in _table_names(connection)
        if name != "alembic_version"
    }


def _refuse_unsound(connection: Connection, rows_before: dict[str, int]) -> None:
    """Compare rows and references before the commit, while everything can still be taken back."""
    rows_after = _row_counts(connection)
    lost = {name: n for name, n in rows_before.items() if name in rows_after and rows_after[name] != n}
    broken = 0
    if connection.dialect.name == "sqlite":
        broken = len(connection.exec_driver_sql("PRAGMA foreign_key_check").fetchall())
    if lost or broken:
        raise DatabaseUnusable(
            "The upgrade was taken back: it would have changed the number of rows or broken references.",
            why=f"Other counts in: {', '.join(sorted(lost)) or 'no table'}; broken references: {broken}.",
            hint="The database is as it was. Please report this.",
            code="upgrade-unsound",
            details={"tables": sorted(lost), "broken_references": broken},
        )


def _refuse_damaged(connection: Connection, address: Address) -> None:
    found = connection.exec_driver_sql("PRAGMA quick_check(1)").scalar()
    connection.rollback()
    if found != "ok":
        raise DatabaseUnusable(
            f"The database {address.shown} is damaged.",
            why=f"The check after the upgrade found: {found}",
            hint="The snapshot from before is beside it, named -before-; name that one with --db.",
            code="database-damaged",
        )


def _take_snapshot(address: Address) -> str:
    """A consistent copy beside the database, complete on disk before its name appears.

    Called while the write lock is held, so the copy is exactly what will be upgraded.
    """
    path = address.path
    assert path is not None
    _drop_unfinished_snapshots(path)
    target = _free_snapshot_name(path)
    unfinished = path.with_name(f".{target.name}{_UNFINISHED}")
    try:
        with translated(address), closing(sqlite_connection(address, "ro", LOCK_TIMEOUT_S)) as connection:
            connection.execute("VACUUM INTO ?", (str(unfinished),))
        _flush_to_disk(unfinished)
        os.replace(unfinished, target)
        _flush_to_disk(target.parent)
    except OSError as error:
        raise _snapshot_failed(address, error) from error
    finally:
        with suppress(OSError):
            unfinished.unlink(missing_ok=True)
    return str(target)


def _snapshot_failed(address: Address, error: OSError) -> CampaignError:
    kind = StorageFull if error.errno in (errno.ENOSPC, errno.EDQUOT, errno.EFBIG) else DatabaseUnusable
    return kind(
        f"The snapshot of {address.shown} that must come before an upgrade could not be written.",
        why=error.strerror or str(error),
        hint="Make room and allow writing in the folder of the database; it was not changed.",
        code="snapshot-failed",
    )


def _snapshot_stem(path: Path) -> str:
    # campaign.db and campaign.sqlite may lie in one folder: only ".db" is left out of the name.
    return f"{path.stem if path.suffix == '.db' else path.name}-before-"


def _free_snapshot_name(path: Path) -> Path:
    stem = f"{_snapshot_stem(path)}{HEAD_REVISION}"
    candidate = path.with_name(f"{stem}.db")
    number = 2
    while candidate.exists():
        candidate = path.with_name(f"{stem}-{number}.db")
        number += 1
    return candidate


def _drop_unfinished_snapshots(path: Path) -> None:
    """Remove what killed upgrades left; the write lock says that no other is at work."""
    start = f".{_snapshot_stem(path)}"
    with suppress(OSError):
        for entry in path.absolute().parent.iterdir():
            if entry.name.startswith(start) and entry.name.endswith(_UNFINISHED):
                entry.unlink()


def _drop_old_snapshots(address: Address) -> None:
    """Keep the newest few. A snapshot that cannot be removed is no reason to fail an upgrade that is done."""
    path = address.path
    assert path is not None
    pattern = re.compile(re.escape(_snapshot_stem(path)) + r"[0-9a-z_]+(-[0-9]+)?\.db")
    with suppress(OSError):
        found = [entry for entry in path.absolute().parent.iterdir() if pattern.fullmatch(entry.name)]
        found.sort(key=lambda entry: entry.stat().st_mtime_ns, reverse=True)
        for old in found[SNAPSHOTS_KEPT:]:
            old.unlink()


def _flush_to_disk(path: Path) -> None:
    descriptor = os.open(path, os.O_RDONLY)
    try:
        os.fsync(descriptor)
    finally:
        os.close(descriptor)
