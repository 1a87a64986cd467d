"""What lies where the database should be, asked of the operating system before SQLite opens anything.

SQLite would misreport some of it (a folder, a missing file), and take a file of a few bytes for an empty
database that it may overwrite. Nothing is opened here: closing a file would drop the locks that this
process holds on it.
"""

from __future__ import annotations

import errno
import os
import stat
from pathlib import Path
from typing import Final

from campaign.catalogue.address import Address
from campaign.catalogue.failures import missing, not_a_database
from campaign.errors import DatabaseUnusable

# No SQLite database with content is shorter, in bytes.
SMALLEST_PAGE: Final = 512

_NOT_THERE = (errno.ENOENT, errno.ENOTDIR)


def refuse_unless_file(address: Address) -> None:
    """Refuse a path at which there is no database file with content.

    Raises
    ------
    DatabaseUnusable
    """
    if address.path is not None and not _size_of_file(address, address.path):
        raise missing(address)


def refuse_bad_place(address: Address) -> None:
    """Refuse a path at which no database can be begun; one that is there already is no obstacle.

    Raises
    ------
    DatabaseUnusable
    """
    path = address.path
    if path is None or _size_of_file(address, path) is not None:
        return
    folder = path.absolute().parent
    if not folder.is_dir():
        raise DatabaseUnusable(
            f"The database {address.shown} cannot be begun.",
            why=f"There is no folder {folder}.",
            hint="Make the folder first, or name another place with --db.",
            code="folder-missing",
        )


def has_leftover_journal(path: Path) -> bool:
    """Whether a journal lies beside the database: somebody is writing, or was stopped while writing."""
    try:
        return Path(f"{path}-journal").exists()
    except OSError:
        return False


def _size_of_file(address: Address, path: Path) -> int | None:
    """Size in bytes, or None where nothing is."""
    try:
        found = path.stat()
    except OSError as error:
        if error.errno in _NOT_THERE:
            return None
        raise _cannot_look(address, error) from error
    if stat.S_ISDIR(found.st_mode):
        raise DatabaseUnusable(
            f"{address.shown} is a folder, not a database.",
            why="A catalogue is one file.",
            hint="Name the file inside it, for example --db " + os.path.join(address.shown, "campaign.db"),
            code="database-is-folder",
        )
    if not stat.S_ISREG(found.st_mode) or 0 < found.st_size < SMALLEST_PAGE:
        raise not_a_database(address)
    return found.st_size


def _cannot_look(address: Address, error: OSError) -> DatabaseUnusable:
    return DatabaseUnusable(
        f"The database {address.shown} cannot be looked at.",
        why=f"The operating system says: {error.strerror or 'no reason'}.",
        hint="Check the path and the permissions of its folders, or choose another database with --db.",
        code="database-cannot-open",
    )
