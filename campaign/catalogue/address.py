"""Where a catalogue is: a SQLite file or a server, from a path or an SQLAlchemy URL."""

from __future__ import annotations

import os
from dataclasses import dataclass, field
from pathlib import Path

from sqlalchemy import URL, make_url
from sqlalchemy.exc import ArgumentError

from campaign.errors import InputRefused

Database = str | os.PathLike[str]


@dataclass(frozen=True, slots=True)
class Address:
    """One database. ``shown`` is safe to print: it never holds a password."""

    shown: str
    path: Path | None = None
    url: URL | None = field(default=None, repr=False)

    @property
    def is_file(self) -> bool:
        return self.path is not None


def address_of(database: Database) -> Address:
    """Read a path or URL.

    Raises
    ------
    InputRefused
        For a URL that cannot be read, that names neither SQLite nor PostgreSQL, or a database in memory.
    """
    text = os.fspath(database)
    if "://" not in text:
        return _file_address(text)
    scheme = text.split("://", 1)[0]
    try:
        url = make_url(text)
        backend = url.get_backend_name()
    except (ArgumentError, ValueError):
        # Neither the text nor the library's message is repeated: both may hold a password.
        raise _refused(f"The database URL that begins with {scheme}:// cannot be read.") from None
    if backend == "sqlite":
        return _file_address(url.database or "")
    if backend != "postgresql":
        raise _refused(f"Databases of the kind {scheme!r} are not supported.")
    shown = URL.create("postgresql", url.username, None, url.host, url.port, url.database)
    return Address(shown=shown.render_as_string(), url=url.set(drivername="postgresql+psycopg"))


def _file_address(text: str) -> Address:
    if text in ("", ":memory:"):
        raise _refused("A catalogue in memory would be lost at the end of the command.")
    if "\x00" in text:
        raise _refused("The path of the database holds a NUL character.")
    return Address(shown=text, path=Path(text))


def _refused(message: str) -> InputRefused:
    return InputRefused(
        message,
        why="A catalogue is a SQLite file or a PostgreSQL database.",
        hint="Give a path such as campaign.db, or a URL such as postgresql+psycopg://user@host/name.",
        code="database-address",
    )
