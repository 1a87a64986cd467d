"""What the database drivers report, turned into errors that a user can act on.

SQLite is judged by the name of its result code, PostgreSQL by its five-character SQLSTATE; the wording
of their messages changes between versions and languages and decides nothing here.
"""

from __future__ import annotations

import re
import sqlite3
from collections.abc import Callable, Iterator
from contextlib import contextmanager

from sqlalchemy.exc import DBAPIError, TimeoutError

from campaign.catalogue.address import Address
from campaign.errors import (
    CampaignError,
    Conflict,
    DatabaseBusy,
    DatabaseUnusable,
    InputRefused,
    StorageFull,
)

_FREE_SPACE = "Free some space, then repeat the command."


@contextmanager
def translated(address: Address) -> Iterator[None]:
    """Raise what the driver reports inside this block as an error of ours."""
    try:
        yield
    except DBAPIError as error:
        raise translate(error.orig, address) from error
    except sqlite3.Error as error:
        raise translate(error, address) from error
    except UnicodeDecodeError as error:
        # Python's driver fails to decode SQLite's own report when that quotes damaged bytes.
        if bytes(error.object).startswith(b"malformed database schema"):
            raise _damaged(address) from error
        raise
    except TimeoutError as error:
        raise _busy(address) from error


def translate(original: BaseException | None, address: Address) -> CampaignError:
    """The error of ours that stands for a driver's error."""
    name = getattr(original, "sqlite_errorname", None)
    if name is not None:
        return _from_sqlite(str(name), address, str(original))
    if address.is_file:
        return _unusable(address, "database-failed", "SQLite could not carry out a statement.", str(original))
    state = getattr(original, "sqlstate", None)
    return _from_postgresql(state, address, _without_password(str(original), address))


def _from_sqlite(name: str, address: Address, text: str) -> CampaignError:
    if name.startswith("SQLITE_CONSTRAINT"):
        return _constraint(name.removeprefix("SQLITE_CONSTRAINT").strip("_").lower(), text)
    # The whole name first (SQLITE_IOERR_WRITE), then its family (SQLITE_IOERR).
    family = "_".join(name.split("_")[:2])
    make = _SQLITE_ERRORS.get(name) or _SQLITE_ERRORS.get(family)
    if make is not None:
        return make(address)
    return _unusable(address, "database-failed", f"SQLite could not work with {address.shown}.", text)


def _from_postgresql(state: str | None, address: Address, text: str) -> CampaignError:
    # The whole refused row, which PostgreSQL adds, would hide the reason.
    line = " ".join(text.split()).split(" DETAIL: Failing row contains")[0][:300]
    if state is None or state[:2] in ("08", "28", "3D", "57", "58", "F0"):
        return DatabaseUnusable(
            f"The database {address.shown} cannot be reached.",
            why=line,
            hint="Check host, port, user and that the server runs; give the password in ~/.pgpass.",
            code="database-unreachable",
        )
    if state[:2] == "23":
        kinds = {"23505": "unique", "23514": "check", "23503": "foreignkey", "23502": "notnull"}
        return _constraint(kinds.get(state, ""), line)
    if state in ("40001", "40P01", "55P03"):
        return _busy(address)
    if state in ("53100", "53200", "54000"):
        return _full(address)
    if state in ("42501", "25006"):
        return read_only(address)
    return _unusable(address, "database-failed", f"{address.shown} could not carry out a statement.", line)


def _constraint(kind: str, text: str) -> CampaignError:
    named = re.search(r"\b(?:ck|uq|fk)_\w+", text)
    details = {"constraint": kind, "name": named.group() if named else None, "database_message": text}
    if kind in ("check", "notnull", "datatype"):
        return InputRefused(
            "A value is outside what the catalogue accepts.",
            why=text,
            hint="Correct the value; nothing was changed.",
            code="value-out-of-range",
            details=details,
        )
    if kind == "foreignkey":
        return Conflict(
            "The change refers to something that is not in the catalogue, or that others still refer to.",
            why=text,
            hint="Nothing was changed; look at the entry again and repeat the command.",
            code="reference-broken",
            details=details,
        )
    return Conflict(
        "The catalogue already holds an entry that must be unique.",
        why=text,
        hint="Nothing was changed; look at the entry that is there and repeat the command.",
        code="not-unique",
        details=details,
    )


def missing(address: Address) -> DatabaseUnusable:
    """There is no database where one was expected."""
    return DatabaseUnusable(
        f"There is no campaign database at {address.shown}.",
        why="It was never begun there, or it was moved.",
        hint="Begin one: campaign begin (with --sample for an invented campaign), or name another with --db.",
        code="database-missing",
    )


def not_a_database(address: Address) -> DatabaseUnusable:
    """The file is something else."""
    return DatabaseUnusable(
        f"{address.shown} is not a campaign database.",
        why="The file is not in the format of SQLite.",
        hint="Name another file with --db, or start a new database there: campaign begin.",
        code="database-not-sqlite",
    )


def read_only(address: Address) -> DatabaseUnusable:
    """The database may be read but not changed."""
    return DatabaseUnusable(
        f"The database {address.shown} cannot be changed.",
        why="The file, its folder or your account on the server allows reading only.",
        hint="Ask for permission to write, or work on a copy of your own.",
        code="database-read-only",
    )


def _damaged(address: Address) -> DatabaseUnusable:
    return DatabaseUnusable(
        f"The database {address.shown} is damaged.",
        why="Parts of the file are not what SQLite wrote there.",
        hint="Keep the file as it is and put a copy from before beside it; name that one with --db.",
        code="database-damaged",
    )


def _cannot_open(address: Address) -> DatabaseUnusable:
    return DatabaseUnusable(
        f"The database {address.shown} cannot be opened.",
        why="The file or its folder does not allow it; a change also needs a journal in the same folder.",
        hint="Check the permissions of the file and its folder, or choose another with --db.",
        code="database-cannot-open",
    )


def _interrupted(address: Address) -> DatabaseUnusable:
    return DatabaseUnusable(
        f"The database {address.shown} holds a change that was interrupted.",
        why="It must be taken back before anybody can read, and you may not write there.",
        hint="Let somebody who may write run any command on it once, for example: campaign system list.",
        code="database-interrupted",
    )


def _disk_failed(address: Address) -> DatabaseUnusable:
    return _unusable(
        address,
        "database-io",
        f"Reading or writing the database {address.shown} failed.",
        "The disk or the network folder reported an error.",
    )


def _busy(address: Address) -> DatabaseBusy:
    return DatabaseBusy(
        f"The database {address.shown} is being changed by somebody else.",
        why="The other command did not finish in time.",
        hint="Repeat the command in a moment; nothing was changed.",
    )


def _full(address: Address) -> StorageFull:
    return StorageFull(
        f"There is no room left to write the database {address.shown}.",
        why="The disk is full, or a quota or file-size limit is reached; the change was taken back.",
        hint=_FREE_SPACE,
    )


def _unusable(address: Address, code: str, message: str, why: str) -> DatabaseUnusable:
    return DatabaseUnusable(
        message,
        why=why,
        hint="Try again; if it stays so, keep the file and name a copy from before with --db.",
        code=code,
    )


def _without_password(text: str, address: Address) -> str:
    password = address.url.password if address.url is not None else None
    return text.replace(str(password), "***") if password else text


_SQLITE_ERRORS: dict[str, Callable[[Address], CampaignError]] = {
    "SQLITE_BUSY": _busy,
    "SQLITE_LOCKED": _busy,
    "SQLITE_FULL": _full,
    # A quota or a file-size limit shows as a failed write, not as a full disk.
    "SQLITE_IOERR_WRITE": _full,
    "SQLITE_IOERR_TRUNCATE": _full,
    "SQLITE_IOERR": _disk_failed,
    "SQLITE_NOTADB": not_a_database,
    "SQLITE_CORRUPT": _damaged,
    "SQLITE_CANTOPEN": _cannot_open,
    "SQLITE_READONLY_ROLLBACK": _interrupted,
    "SQLITE_READONLY_RECOVERY": _interrupted,
    "SQLITE_READONLY": read_only,
    "SQLITE_PERM": read_only,
    "SQLITE_AUTH": read_only,
}
