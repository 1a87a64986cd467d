"""Writing files whole or not at all: beside their place first, on the disk, then renamed into it."""

from __future__ import annotations

import errno
import os
import secrets
import stat
from collections.abc import Iterable
from contextlib import suppress
from pathlib import Path

from campaign.errors import CampaignError, InputRefused, NotFound, StorageFull

_DATABASE = b"SQLite format 3\0"
_FULL = (errno.ENOSPC, errno.EDQUOT, errno.EFBIG)


def is_kept_file(path: str) -> bool:
    """Whether something that would be lost by writing is at ``path``.

    Raises
    ------
    CampaignError
        When nothing can be written there: a folder, or a folder that is missing.
    """
    if "\0" in path:
        raise _not_writable("The path", "It holds a character that no path can hold (U+0000).")
    try:
        found = os.stat(path)
    except (FileNotFoundError, NotADirectoryError):
        _refuse_missing_folder(path)
        return False
    except OSError as error:
        raise _cannot_write(path, error) from error
    if stat.S_ISDIR(found.st_mode):
        raise InputRefused(
            f"{path} is a folder, not a file.",
            why="A table is written into one file.",
            hint=f"Name the file inside it, for example --to {os.path.join(path, 'table.csv')}.",
            code="file-is-folder",
        )
    if stat.S_ISREG(found.st_mode) and not os.access(path, os.W_OK):
        raise _not_writable(path, "The file is protected against writing.")
    if stat.S_ISREG(found.st_mode) and _begins_with(path, _DATABASE):
        raise InputRefused(
            f"{path} is a database, and no table is written over it.",
            why="Everything that it holds would be lost.",
            hint="Name another file.",
            code="file-is-database",
        )
    return stat.S_ISREG(found.st_mode)


def write_whole(path: str, pieces: Iterable[str]) -> int:
    """Write a text file that is either all there or was never touched, and return its size in bytes.

    What is at ``path`` is replaced in one step; its permissions stay. Into what is no file (a pipe, a
    device) the pieces go one after another.

    Raises
    ------
    NotFound
        ``folder-missing``.
    InputRefused
        ``file-not-writable``.
    StorageFull
        No room; nothing is left behind.
    """
    try:
        return _write(path, pieces)
    except BrokenPipeError:
        raise
    except OSError as error:
        raise _cannot_write(path, error) from error


def _write(path: str, pieces: Iterable[str]) -> int:
    # A link stays a link: what it points at is replaced.
    target = os.path.realpath(path)
    mode = _mode_of(target)
    if mode is not None and not stat.S_ISREG(mode):
        with open(target, "wb", buffering=0) as stream:
            return _pour(stream.fileno(), pieces)
    _refuse_missing_folder(target)
    folder = os.path.dirname(target)
    beside = os.path.join(folder, f".campaign-{secrets.token_hex(8)}.part")
    descriptor = os.open(beside, os.O_WRONLY | os.O_CREAT | os.O_EXCL | os.O_CLOEXEC, 0o666)
    try:
        try:
            size = _pour(descriptor, pieces)
            if mode is not None:
                os.fchmod(descriptor, stat.S_IMODE(mode))
            os.fsync(descriptor)
        finally:
            os.close(descriptor)
        os.replace(beside, target)
    except BaseException:  # an interrupt leaves nothing behind either
        with suppress(OSError):
            os.unlink(beside)
        raise
    _sync_folder(folder)
    return size


def _begins_with(path: str, start: bytes) -> bool:
    try:
        with open(path, "rb") as stream:
            return stream.read(len(start)) == start
    except OSError:
        return False


def _pour(descriptor: int, pieces: Iterable[str]) -> int:
    size = 0
    for piece in pieces:
        data = memoryview(piece.encode("utf-8"))
        size += len(data)
        while data:
            data = data[os.write(descriptor, data) :]
    return size


def _mode_of(path: str) -> int | None:
    try:
        return os.stat(path).st_mode
    except FileNotFoundError:
        return None


def _sync_folder(folder: str) -> None:
    """Make the new name last; where folders cannot be synchronised it does so by itself in a while."""
    try:
        descriptor = os.open(folder, os.O_RDONLY)
    except OSError:
        return
    try:
        with suppress(OSError):
            os.fsync(descriptor)
    finally:
        os.close(descriptor)


def _refuse_missing_folder(path: str) -> None:
    folder = Path(path).absolute().parent
    if not folder.is_dir():
        raise NotFound(
            f"There is no folder {folder}.",
            why=f"{path} cannot be written without it.",
            hint="Make the folder first, or name another place.",
            code="folder-missing",
        )


def _cannot_write(path: str, error: OSError) -> CampaignError:
    if error.errno in _FULL:
        return StorageFull(
            f"{path} could not be written.",
            why=f"The place it goes to has no room left ({error.strerror}).",
            hint="Free some space or write somewhere else. Nothing was left behind.",
        )
    return _not_writable(path, f"The operating system says: {error.strerror or 'no reason'}.")


def _not_writable(path: str, why: str) -> InputRefused:
    return InputRefused(
        f"{path} cannot be written.",
        why=why,
        hint="Check the path and the permissions of its folder, or name another place.",
        code="file-not-writable",
    )
