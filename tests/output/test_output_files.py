"""Files are written whole or not at all, and nothing of worth is written over.

Common practice, no source: beside the place first, to the disk, renamed.
"""

from __future__ import annotations

import errno
import os
import stat
import subprocess
import sys
import threading
from pathlib import Path

import pytest

from campaign.errors import InputRefused, NotFound, StorageFull
from campaign.output import files
from campaign.output.files import is_kept_file, write_whole


@pytest.fixture
def folder(tmp_path):
    """A folder of its own, so that left-overs show."""
    path = tmp_path / "folder"
    path.mkdir()
    return path


def names(folder):
    return sorted(path.name for path in folder.iterdir())


def test_a_file_is_written_in_utf_8_and_its_size_told(folder):
    assert write_whole(str(folder / "a.csv"), ["λ,", "b\n"]) == 5
    assert (folder / "a.csv").read_bytes() == "λ,b\n".encode()
    assert names(folder) == ["a.csv"]


def test_what_was_there_is_replaced_and_keeps_its_permissions(folder):
    path = folder / "a.csv"
    path.write_text("old")
    path.chmod(0o640)
    write_whole(str(path), ["new"])
    assert path.read_text() == "new"
    assert stat.S_IMODE(path.stat().st_mode) == 0o640


def test_a_new_file_has_the_permissions_that_the_user_wants(folder):
    before = os.umask(0o027)
    try:
        write_whole(str(folder / "a.csv"), [])
    finally:
        os.umask(before)
    assert stat.S_IMODE((folder / "a.csv").stat().st_mode) == 0o640


def test_a_link_stays_a_link(folder):
    (folder / "real.csv").write_text("old")
    (folder / "link.csv").symlink_to("real.csv")
    write_whole(str(folder / "link.csv"), ["new"])
    assert (folder / "link.csv").is_symlink()
    assert (folder / "real.csv").read_text() == "new"


@pytest.mark.parametrize("stop", [KeyboardInterrupt, ZeroDivisionError, SystemExit])
def test_an_end_half_way_leaves_the_old_file_and_nothing_else(stop, folder):
    def pieces():
        yield "half"
        raise stop

    (folder / "a.csv").write_text("old")
    with pytest.raises(stop):
        write_whole(str(folder / "a.csv"), pieces())
    assert names(folder) == ["a.csv"]
    assert (folder / "a.csv").read_text() == "old"


@pytest.mark.parametrize("step", ["write", "fsync", "replace"])
@pytest.mark.parametrize("number", [errno.ENOSPC, errno.EDQUOT, errno.EFBIG])
def test_a_full_disk_at_any_step_leaves_the_old_file_and_nothing_else(step, number, folder, monkeypatch):
    def fail(*_):
        raise OSError(number, os.strerror(number))

    (folder / "a.csv").write_text("old")
    monkeypatch.setattr(files.os, step, fail)
    with pytest.raises(StorageFull) as full:
        write_whole(str(folder / "a.csv"), ["new"])
    monkeypatch.undo()
    assert full.value.exit_status == 8
    assert names(folder) == ["a.csv"]
    assert (folder / "a.csv").read_text() == "old"


def test_a_device_that_is_full_is_told():
    if not Path("/dev/full").exists():
        pytest.skip("no such device here")
    with pytest.raises(StorageFull):
        write_whole("/dev/full", ["x"])


def test_a_limit_on_the_size_of_files_is_met_with_nothing_left_behind(folder):
    code = (
        "import resource, sys\n"
        "from campaign.output.files import write_whole; from campaign.errors import StorageFull\n"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (1000, 1000))\n"
        "try: write_whole(sys.argv[1], ['x' * 100] * 50)\n"
        "except StorageFull: sys.exit(8)"
    )
    root = Path(files.__file__).parents[2]
    done = subprocess.run(
        [sys.executable, "-B", "-c", code, folder / "a.csv"], env={"PYTHONPATH": str(root)}, check=False
    )
    assert done.returncode == 8
    assert names(folder) == []


def test_a_pipe_gets_the_pieces_and_stays_a_pipe(folder):
    path = folder / "pipe"
    os.mkfifo(path)
    got = []
    reader = threading.Thread(target=lambda: got.append(path.read_bytes()))
    reader.start()
    assert write_whole(str(path), ["a", "b"]) == 2
    reader.join(10)
    assert got == [b"ab"]
    assert stat.S_ISFIFO(path.stat().st_mode)


def test_a_reader_that_goes_away_is_no_refusal(folder):
    path = folder / "pipe"
    os.mkfifo(path)
    reader = threading.Thread(target=lambda: os.close(os.open(path, os.O_RDONLY)))
    reader.start()

    def pieces():
        reader.join(10)
        yield "x"

    with pytest.raises(BrokenPipeError):
        write_whole(str(path), pieces())


def test_a_missing_folder_is_told(folder):
    for act in (is_kept_file, lambda path: write_whole(path, [])):
        with pytest.raises(NotFound) as refused:
            act(str(folder / "none" / "a.csv"))
        assert (refused.value.code, refused.value.exit_status) == ("folder-missing", 4)


def test_a_folder_where_permission_is_missing_is_told(folder, monkeypatch):
    def fail(*_):
        raise PermissionError(errno.EACCES, "Permission denied")

    monkeypatch.setattr(files.os, "open", fail)
    with pytest.raises(InputRefused) as refused:
        write_whole(str(folder / "a.csv"), ["x"])
    assert refused.value.code == "file-not-writable"


@pytest.mark.parametrize(
    ("make", "kept"),
    [
        (lambda path: None, False),
        (lambda path: path.write_text("old"), True),
        (os.mkfifo, False),
    ],
)
def test_only_a_file_would_be_lost(make, kept, folder):
    make(folder / "a.csv")
    assert is_kept_file(str(folder / "a.csv")) is kept


@pytest.mark.parametrize(
    ("make", "code"),
    [
        (lambda path: path.mkdir(), "file-is-folder"),
        (lambda path: path.write_bytes(b"SQLite format 3\0" + bytes(100)), "file-is-database"),
    ],
)
def test_what_must_not_be_written_over_is_refused(make, code, folder):
    make(folder / "a.csv")
    with pytest.raises(InputRefused) as refused:
        is_kept_file(str(folder / "a.csv"))
    assert refused.value.code == code


@pytest.mark.parametrize("path", ["a\0b", "x" * 5_000])
def test_a_path_that_cannot_be_is_refused(path, folder):
    with pytest.raises(InputRefused) as refused:
        is_kept_file(str(folder) + "/" + path)
    assert refused.value.code == "file-not-writable"
