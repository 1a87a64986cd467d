"""Several programs at one file at one instant: nothing lost, nothing doubled, nobody turned away.

Recipes: engineering notes 4.4 and 4.5. The driver left alone lost 423 of 600 updates in this test.
"""

from __future__ import annotations

import shutil
import sqlite3
from pathlib import Path

import pytest
from reliability_examples import assert_sound, content, fill, release_at_once, start

WRITER = """
import sys
from datetime import UTC, datetime
sys.path.insert(0, "tests/reliability")
from reliability_examples import point
from campaign.catalogue import info, observations, store
database, name, times = sys.argv[1], sys.argv[2], int(sys.argv[3])
print("ready", flush=True)
sys.stdin.readline()
for number in range(times):
    with store.writing(database, at=datetime.now(UTC), who=name, command="log", busy_timeout_s=30) as writing:
        count = int(info.read_info(writing.connection).get("count", "0"))
        info.set_info(writing, "count", str(count + 1))
        observations.add_observation(writing, point(1, 1000 + number, name))
print("done")
"""

STARTER = """
import sys
from datetime import UTC, datetime
from campaign.catalogue import upgrade
print("ready", flush=True)
sys.stdin.readline()
print(upgrade.begin_database(sys.argv[1], at=datetime.now(UTC)).created)
"""

UPGRADER = """
import sys
from pathlib import Path
from campaign.catalogue import opening, upgrade
for module in (upgrade, opening):
    module.HEAD_REVISION, module.KNOWN_REVISIONS = "0004", ("0001", "0002", "0003", "0004")
upgrade.migrations_folder = lambda: Path(sys.argv[2])
print("ready", flush=True)
sys.stdin.readline()
print(upgrade.upgrade_database(sys.argv[1]).snapshot)
"""

SECOND_MIGRATION = """
import sqlalchemy as sa
from alembic import op
revision, down_revision, branch_labels, depends_on = "0004", "0003", None, None
def upgrade():
    op.add_column("sites", sa.Column("nickname", sa.String(20)))
"""


def write_at_once(database: Path, writers: int, times: int) -> None:
    fill(database, points=1)
    names = [chr(ord("A") + number) for number in range(writers)]
    results = release_at_once([start(WRITER, database, name, times) for name in names])
    assert results == [(0, "done\n", "")] * writers
    assert_sound(database)
    connection = sqlite3.connect(database)
    (count,) = connection.execute("SELECT value FROM campaign_info WHERE key = 'count'").fetchone()
    logged = dict(connection.execute("SELECT observer, count(*) FROM observations GROUP BY observer"))
    operations = dict(connection.execute("SELECT who, count(*) FROM operations GROUP BY who"))
    (same,) = connection.execute("SELECT count(*) - count(DISTINCT uid) FROM observations").fetchone()
    connection.close()
    assert int(count) == writers * times
    assert {name: logged[name] for name in names} == dict.fromkeys(names, times)
    assert {name: operations[name] for name in names} == dict.fromkeys(names, times)
    assert same == 0


def test_three_observers_logging_at_once_lose_nothing(tmp_path: Path) -> None:
    write_at_once(tmp_path / "campaign.db", 3, 12)


@pytest.mark.slow
def test_four_observers_logging_fifty_times_each_at_once_lose_nothing(tmp_path: Path) -> None:
    write_at_once(tmp_path / "campaign.db", 4, 50)


def start_at_once(folder: Path, rounds: int) -> None:
    for number in range(rounds):
        database = folder / f"{number}.db"
        results = release_at_once([start(STARTER, database) for _ in range(4)])
        assert [(status, err) for status, _, err in results] == [(0, "")] * 4
        assert sorted(out for _, out, _ in results) == ["False\n"] * 3 + ["True\n"]
        assert_sound(database)
        assert len(content(database)["campaign_info"]) == 3


def test_four_first_starts_at_once_all_succeed_and_one_makes_the_database(tmp_path: Path) -> None:
    start_at_once(tmp_path, 1)


@pytest.mark.slow
def test_four_first_starts_at_once_six_times_over(tmp_path: Path) -> None:
    start_at_once(tmp_path, 6)


def upgrade_at_once(folder: Path, rounds: int) -> None:
    from campaign.catalogue.upgrade import migrations_folder

    migrations = folder / "migrations"
    shutil.copytree(migrations_folder(), migrations, ignore=shutil.ignore_patterns("__pycache__"))
    (migrations / "versions" / "0004_invented.py").write_text(SECOND_MIGRATION)
    for number in range(rounds):
        database = folder / str(number) / "campaign.db"
        database.parent.mkdir()
        fill(database)
        before = content(database)
        results = release_at_once([start(UPGRADER, database, migrations) for _ in range(4)])
        assert [(status, err) for status, _, err in results] == [(0, "")] * 4
        snapshot = database.with_name("campaign-before-0004.db")
        assert sorted(out for _, out, _ in results) == sorted(["None\n"] * 3 + [f"{snapshot}\n"])
        assert sorted(entry.name for entry in database.parent.iterdir()) == [snapshot.name, database.name]
        assert content(snapshot) == before
        assert content(database)["observations"] == before["observations"]
        assert content(database)["alembic_version"] == [("0004",)]
        assert_sound(database)


def test_four_upgrades_at_once_all_succeed_with_one_snapshot(tmp_path: Path) -> None:
    upgrade_at_once(tmp_path, 1)


@pytest.mark.slow
def test_four_upgrades_at_once_six_times_over(tmp_path: Path) -> None:
    upgrade_at_once(tmp_path, 6)
