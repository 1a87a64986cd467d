"""Files of tables as plain bytes: from a path or standard input, packed by gzip or not."""

from __future__ import annotations

import gzip
import io
import os
import stat
import zlib
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any, BinaryIO, cast

from campaign.errors import CampaignError, InputRefused, NotFound

STANDARD_INPUT = "-"
HEAD_BYTES = 1 << 16
_GZIP = b"\x1f\x8b"
# What a file begins with that is no table of text, and what to do with it.
_OTHER_FORMS: tuple[tuple[bytes, str, str], ...] = (
    (b"PK\x03\x04", "a spreadsheet or zip archive", "Save the sheet as CSV, or unpack the archive first."),
    (b"\xd0\xcf\x11\xe0", "an old spreadsheet", "Save the sheet as CSV first."),
    (b"BZh", "packed by bzip2", "Unpack it first, for example bunzip2 FILE; gzip is read as it is."),
    (b"\xfd7zXZ", "packed by xz", "Unpack it first, for example unxz FILE; gzip is read as it is."),
    (b"(\xb5/\xfd", "packed by zstd", "Unpack it first; gzip is read as it is."),
    (b"SIMPLE  =", "a FITS file", "Convert its table to VOTable, ECSV or CSV first."),
    (b"%PDF", "a PDF document", "Copy the table out of it into a text file first."),
    (b"SQLite format 3", "a database", "Load a table; a whole campaign is copied with: campaign copy."),
    (b"PAR1", "a Parquet file", "Convert it to VOTable, ECSV or CSV first."),
)


@dataclass(frozen=True, slots=True)
class TableFile:
    """A table as bytes: ``head`` is what it begins with, ``stream`` gives all of it.

    ``size_bytes`` is the size of the file, None where it cannot be known beforehand; ``counter`` says how
    much of that has been read.
    """

    name: str
    head: bytes
    stream: BinaryIO
    size_bytes: int | None
    counter: ByteCounter


class ByteCounter:
    """How many bytes of the file itself have been read; ``heard`` is called whenever there are more."""

    def __init__(self) -> None:
        self.bytes = 0
        self.heard: Callable[[], None] | None = None

    def add(self, number: int) -> None:
        """Count some more."""
        self.bytes += number
        if self.heard is not None:
            self.heard()


class _Source(io.RawIOBase):
    """The bytes of ``stream``, counted; the operating system's complaints become errors of ours."""

    def __init__(self, stream: BinaryIO, name: str, counter: ByteCounter) -> None:
        self._stream = stream
        self._name = name
        self._counter = counter

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: Any) -> int:
        try:
            # One read of a pipe, not as many as it takes to fill the buffer.
            read = getattr(self._stream, "read1", self._stream.read)
            data = read(len(buffer))
        except (EOFError, gzip.BadGzipFile, zlib.error) as error:
            raise InputRefused(
                f"{self._name} is damaged.",
                why=f"It cannot be unpacked to its end ({error}).",
                hint="Fetch or copy the file again.",
                code="file-damaged",
            ) from error
        except OSError as error:
            raise _cannot_open(self._name, error) from error
        buffer[: len(data)] = data
        self._counter.add(len(data))
        return len(data)


@contextmanager
def opened_table(path: str, standard_input: BinaryIO | None) -> Iterator[TableFile]:
    """Open a table for reading; ``-`` means standard input.

    Raises
    ------
    NotFound
        ``file-not-found``.
    InputRefused
        ``file-unreadable``, ``file-is-folder``, ``file-empty``, ``file-not-table``; while it is read also
        ``file-damaged``.
    """
    if path == STANDARD_INPUT:
        if standard_input is None:
            raise InputRefused(
                "There is no standard input to read the table from.",
                hint="Name a file: campaign load FILE.",
                code="file-unreadable",
            )
        yield _table_file("standard input", standard_input, None)
        return
    try:
        opened = open(path, "rb")  # noqa: SIM115
    except (OSError, ValueError) as error:
        raise _cannot_open(path, error) from error
    with opened as stream:
        found = os.fstat(stream.fileno())
        size = found.st_size if stat.S_ISREG(found.st_mode) else None
        yield _table_file(path, stream, size)


def _table_file(name: str, stream: BinaryIO, size_bytes: int | None) -> TableFile:
    counter = ByteCounter()
    plain: BinaryIO = io.BufferedReader(_Source(stream, name, counter), HEAD_BYTES)
    head = _read_head(plain)
    if head.startswith(_GZIP):
        packed = gzip.GzipFile(fileobj=_Joined(head, plain), mode="rb")
        plain = io.BufferedReader(_Source(cast(BinaryIO, packed), name, ByteCounter()), HEAD_BYTES)
        head = _read_head(plain)
    if not head:
        raise InputRefused(
            f"{name} is empty.", why="It holds not one byte.", hint="Check the file.", code="file-empty"
        )
    for begin, kind, advice in _OTHER_FORMS:
        if head.startswith(begin):
            raise InputRefused(
                f"{name} is no table of text: it is {kind}.",
                why="CSV, TSV, text in columns, ECSV and VOTable are read, also packed by gzip.",
                hint=advice,
                code="file-not-table",
            )
    return TableFile(name, head, io.BufferedReader(_Joined(head, plain), HEAD_BYTES), size_bytes, counter)


class _Joined(io.RawIOBase):
    """Bytes that were read already, and the rest of their stream."""

    def __init__(self, head: bytes, rest: BinaryIO) -> None:
        self._head = head
        self._rest = rest

    def readable(self) -> bool:
        return True

    def readinto(self, buffer: Any) -> int:
        if self._head:
            piece, self._head = self._head[: len(buffer)], self._head[len(buffer) :]
        else:
            piece = self._rest.read(len(buffer))
        buffer[: len(piece)] = piece
        return len(piece)

    # What gzip asks of a file.
    def read(self, size: int = -1) -> bytes:
        if size < 0:
            return self.readall()
        return super().read(size) or b""


def _read_head(stream: BinaryIO) -> bytes:
    """Up to ``HEAD_BYTES``; a pipe gives them in pieces."""
    pieces: list[bytes] = []
    wanted = HEAD_BYTES
    while wanted:
        piece = stream.read(wanted)
        if not piece:
            break
        pieces.append(piece)
        wanted -= len(piece)
    return b"".join(pieces)


def _cannot_open(name: str, error: OSError | ValueError) -> CampaignError:
    if isinstance(error, FileNotFoundError | NotADirectoryError):
        return NotFound(
            f"There is no file {name}.",
            why="Nothing stands at this path, seen from the folder in which the command was given.",
            hint="Check the path; - reads from standard input.",
            code="file-not-found",
            details={"file": name},
        )
    if isinstance(error, IsADirectoryError):
        return InputRefused(
            f"{name} is a folder, not a file.",
            why="A table is one file.",
            hint="Name one file; several are loaded one after another.",
            code="file-is-folder",
        )
    reason = (error.strerror if isinstance(error, OSError) else None) or str(error)
    return InputRefused(
        f"{name} cannot be read.",
        why=f"The operating system says: {reason}.",
        hint="Check the path and its permissions.",
        code="file-unreadable",
    )
