"""Killed with signal 9 in the middle of writing: each command happened wholly or not at all.

Recipes: engineering notes 4.1 and 4.2. A round counts only if the kill landed inside the write, which a
journal that was left behind proves.
"""

from __future__ import annotations

import random
import sqlite3
import subprocess
import time
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from reliability_examples import NOW, assert_sound, content, digest, fill, start

from campaign.catalogue import store, systems, upgrade

LOADER = """
import sys
from datetime import UTC, datetime
sys.path.insert(0, "tests/reliability")
from reliability_examples import point
from campaign.catalogue import observations, store
database, batch = sys.argv[1], int(sys.argv[2])
print("ready", flush=True)
while True:
    with store.writing(database, at=datetime.now(UTC), who="Ida Vik", command=f"load {batch}") as writing:
        rows = [point(1, batch * 10_000 + number) for number in range(2000)]
        observations.add_observations(writing, rows)
    print(batch, flush=True)
    batch += 1
"""

# A small cache, so that the file itself is written before the commit, and a stop at a named boundary.
SMALL_CACHE = """
import sys, time
from datetime import UTC, datetime
from pathlib import Path
from sqlalchemy import Engine, event
from campaign.catalogue import opening, upgrade
event.listen(Engine, "connect", lambda connection, record: connection.execute("PRAGMA cache_size = 3"))
def hold(*arguments):
    print("mid", flush=True)
    time.sleep(60)
"""

BEGINNER = (
    SMALL_CACHE
    + """
upgrade._describe_campaign = hold
upgrade.begin_database(sys.argv[1], at=datetime.now(UTC))
"""
)

UPGRADER = (
    SMALL_CACHE
    + """
for module in (upgrade, opening):
    module.HEAD_REVISION, module.KNOWN_REVISIONS = "0004", ("0001", "0002", "0003", "0004")
upgrade.migrations_folder = lambda: Path(sys.argv[2])
setattr(upgrade, sys.argv[3], hold)
upgrade.upgrade_database(sys.argv[1])
"""
)

SECOND_MIGRATION = """
import sqlalchemy as sa
from alembic import op
revision, down_revision, branch_labels, depends_on = "0004", "0003", None, None
def upgrade():
    with op.batch_alter_table("observations", recreate="always") as batch:
        batch.add_column(sa.Column("nickname", sa.String(20)))
"""


@contextmanager
def running(program: str, *arguments: object) -> Iterator[subprocess.Popen[str]]:
    child = start(program, *arguments)
    try:
        yield child
    finally:
        child.kill()
        child.communicate()


def kill_at(line: str, program: str, *arguments: object) -> None:
    """Run a program until it says ``line``, then kill it."""
    with running(program, *arguments) as child:
        assert child.stdout is not None
        said = child.stdout.readline()
        if said != line + "\n":
            pytest.fail(f"said {said!r}: {child.communicate()[1]}")


def journal_of(database: Path) -> Path:
    return Path(f"{database}-journal")


def load_and_kill(database: Path, wanted: int, seed: int) -> int:
    """Kill until so many kills have landed inside a write; return how many were needed."""
    fill(database, points=1)
    chance = random.Random(seed)
    landed, next_batch = 0, 1
    rounds = 0
    while landed < wanted:
        rounds += 1
        assert rounds <= 10 * wanted
        with running(LOADER, database, next_batch) as child:
            assert child.stdout is not None
            assert child.stdout.readline() == "ready\n"
            # A busy machine comes to its writing later.
            time.sleep(chance.uniform(0.02, 0.25) * (1 + rounds // 5))
            child.kill()
            acknowledged = [int(line) for line in child.communicate()[0].split()]
        landed += journal_of(database).exists()
        with store.reading(database) as connection:
            assert len(systems.list_systems(connection)) == 2
        assert_sound(database)
        connection = sqlite3.connect(database)
        sizes = dict(
            connection.execute(
                "SELECT o.command, count(*) FROM observations b JOIN operations o ON o.id = b.operation_id"
                " WHERE o.command LIKE 'load %' GROUP BY o.id"
            )
        )
        journalled = connection.execute(
            "SELECT count(*) FROM changes c JOIN operations o ON o.id = c.operation_id"
            " WHERE o.command LIKE 'load %'"
        ).fetchone()
        connection.close()
        assert set(sizes.values()) <= {2000}
        assert journalled == (len(sizes),)
        batches = {int(command.split()[1]) for command in sizes}
        assert batches >= set(acknowledged)
        # A commit may be done before the word of it is out: one more than acknowledged, never two.
        assert batches <= set(range(1, max([next_batch - 1, *acknowledged]) + 2))
        next_batch = max(batches, default=0) + 1
    return rounds


def test_a_load_that_is_killed_is_whole_or_absent(tmp_path: Path) -> None:
    load_and_kill(tmp_path / "campaign.db", 2, seed=3)


@pytest.mark.slow
def test_twenty_killed_loads_are_each_whole_or_absent(tmp_path: Path) -> None:
    rounds = load_and_kill(tmp_path / "campaign.db", 20, seed=20)
    print(f"kills that landed inside a write and were survived: 20 of {rounds}")


def test_a_first_start_that_is_killed_can_be_repeated(tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    kill_at("mid", BEGINNER, database)
    assert journal_of(database).exists()
    assert database.stat().st_size > 0
    assert upgrade.begin_database(database, at=NOW).created
    assert_sound(database)
    assert not journal_of(database).exists()
    with store.reading(database) as connection:
        assert systems.list_systems(connection) == []


@pytest.fixture
def migrations(tmp_path: Path) -> Path:
    """The real migrations and an invented second one."""
    import shutil

    folder = tmp_path / "migrations"
    shutil.copytree(upgrade.migrations_folder(), folder, ignore=shutil.ignore_patterns("__pycache__"))
    (folder / "versions" / "0004_invented.py").write_text(SECOND_MIGRATION)
    return folder


@pytest.mark.parametrize("boundary", ["_refuse_unsound", "_flush_to_disk"])
def test_an_upgrade_that_is_killed_leaves_the_old_catalogue_and_can_be_repeated(
    boundary: str, tmp_path: Path, migrations: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    database = tmp_path / "campaign.db"
    fill(database, points=500)
    before_rows, before_bytes = content(database), digest(database)
    kill_at("mid", UPGRADER, database, migrations, boundary)
    if boundary == "_refuse_unsound":
        assert journal_of(database).exists()
        assert digest(database) != before_bytes
    with store.reading(database) as connection:
        assert len(systems.list_systems(connection)) == 2
    assert content(database) == before_rows
    assert digest(database) == before_bytes
    from campaign.catalogue import opening

    for module in (upgrade, opening):
        monkeypatch.setattr(module, "HEAD_REVISION", "0004")
        monkeypatch.setattr(module, "KNOWN_REVISIONS", ("0001", "0002", "0003", "0004"))
    monkeypatch.setattr(upgrade, "migrations_folder", lambda: migrations)
    report = upgrade.upgrade_database(database)
    assert report.to_revision == "0004"
    assert_sound(database)
    after = content(database)
    assert [row[:-1] for row in after["observations"]] == before_rows["observations"]
    assert not [entry for entry in tmp_path.iterdir() if entry.name.endswith(".unfinished")]
