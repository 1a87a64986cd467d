"""No room left: one sentence, status 8, the file as it was.

Recipe: engineering notes 4.3, (b) a file-size limit, (c) a page limit, (a) a small file system as root.
"""

from __future__ import annotations

import os
import resource
import shutil
import subprocess
from pathlib import Path

import pytest
from reliability_examples import NOW, assert_sound, content, fill, point, start

from campaign.catalogue import observations, store
from campaign.errors import StorageFull

LIMITED = """
import resource, sys
from datetime import UTC, datetime
sys.path.insert(0, "tests/reliability")
from reliability_examples import point
from campaign.catalogue import observations, opening, store, upgrade
from campaign.errors import CampaignError
from pathlib import Path
database, action, limit = sys.argv[1], sys.argv[2], int(sys.argv[3])
import alembic.command
resource.setrlimit(resource.RLIMIT_FSIZE, (limit, limit))
try:
    if action == "begin":
        upgrade.begin_database(database, at=datetime.now(UTC))
    elif action == "upgrade":
        for module in (upgrade, opening):
            module.HEAD_REVISION, module.KNOWN_REVISIONS = "0004", ("0001", "0002", "0003", "0004")
        upgrade.upgrade_database(database)
    else:
        with store.writing(database, at=datetime.now(UTC), who="x", command="y") as writing:
            observations.add_observations(writing, [point(1, 100 + n) for n in range(20_000)])
except CampaignError as error:
    print(error.exit_status, error.code)
else:
    print("done")
"""


def run_limited(database: Path, action: str, limit: int) -> str:
    child = start(LIMITED, database, action, limit)
    out, err = child.communicate(timeout=120)
    assert err == ""
    return out.strip()


def test_a_load_that_meets_a_file_size_limit_leaves_the_catalogue_as_it_was(tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    fill(database)
    before = content(database)
    assert run_limited(database, "load", database.stat().st_size + 100_000) == "8 storage-full"
    assert_sound(database)
    assert content(database) == before
    assert run_limited(database, "load", resource.RLIM_INFINITY) == "done"


def test_a_first_start_without_room_can_be_repeated(tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    assert run_limited(database, "begin", 40_000) == "8 storage-full"
    assert run_limited(database, "begin", resource.RLIM_INFINITY) == "done"
    assert_sound(database)


def test_an_upgrade_without_room_for_its_snapshot_does_not_begin(tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    fill(database)
    before = database.read_bytes()
    assert run_limited(database, "upgrade", 40_000) == "8 storage-full"
    assert database.read_bytes() == before
    assert sorted(entry.name for entry in tmp_path.iterdir()) == ["campaign.db"]


def test_a_full_database_is_reported_as_full(tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    fill(database)
    before = content(database)
    with pytest.raises(StorageFull), store.writing(database, at=NOW, who="x", command="y") as writing:
        pages = writing.connection.exec_driver_sql("PRAGMA page_count").scalar()
        writing.connection.exec_driver_sql(f"PRAGMA max_page_count = {pages + 5}")
        observations.add_observations(writing, [point(1, 100 + n) for n in range(5000)])
    assert content(database) == before
    assert_sound(database)


@pytest.mark.slow
@pytest.mark.skipif(os.getuid() != 0, reason="needs root to mount a small file system")
def test_a_full_disk_loses_no_committed_batch(tmp_path: Path) -> None:
    disk = tmp_path / "disk"
    disk.mkdir()
    mounted = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=2m", "tmpfs", str(disk)], capture_output=True, check=False
    )
    if mounted.returncode != 0:
        pytest.skip("this machine does not let root mount a file system")
    try:
        database = disk / "campaign.db"
        fill(database)
        batches = 0
        with pytest.raises(StorageFull) as full:
            while True:
                with store.writing(database, at=NOW, who="x", command="y") as writing:
                    entries = [point(1, 1000 * (batches + 1) + n) for n in range(200)]
                    observations.add_observations(writing, entries)
                batches += 1
        assert full.value.exit_status == 8
        assert batches >= 3
        assert len(content(database)["observations"]) == 40 + 200 * batches
        assert_sound(database)
        shutil.copy(database, tmp_path / "copy.db")
        assert_sound(tmp_path / "copy.db")
    finally:
        subprocess.run(["umount", str(disk)], check=True)
