"""Catalogues that earlier programs made, with everything in them, come up to date whole."""

from __future__ import annotations

import shutil
import sqlite3
from pathlib import Path

import pytest
from alembic import command
from catalogue_examples import (
    FIRST,
    every_kind,
    full_episode,
    full_rule,
    full_site,
    full_solution,
    full_system,
    later,
    photometry,
)

from campaign.catalogue import (
    episodes,
    observations,
    records,
    rules,
    sites,
    solutions,
    store,
    systems,
    upgrade,
)
from campaign.catalogue.address import address_of
from campaign.catalogue.engine import migration_engine
from campaign.catalogue.revision import HEAD_REVISION, KNOWN_REVISIONS


def content(database: Path) -> dict[str, tuple[list[str], list[tuple[object, ...]]]]:
    """Columns and rows of every table."""
    connection = sqlite3.connect(database)
    names = [name for (name,) in connection.execute("SELECT name FROM sqlite_master WHERE type = 'table'")]
    found = {}
    for name in names:
        rows = connection.execute(f"SELECT * FROM {name} ORDER BY 1")
        found[name] = [column[0] for column in rows.description], rows.fetchall()
    connection.close()
    return found


@pytest.fixture
def filled(database, write):
    """A catalogue of this program with something in every table that revision 0001 had."""
    with write() as writing:
        site_id = sites.add_site(writing, full_site())
        system_id = systems.add_system(writing, full_system())
        first = solutions.add_solution(writing, full_solution(system_id))
        solutions.adopt_alone(writing, first)
        rules.set_rule(writing, full_rule(system_id))
        episodes.add_episode(writing, full_episode(system_id))
    with write(later(1)) as writing:
        observations.add_observations(writing, every_kind(system_id, site_id))
        wrong, _ = observations.add_observation(writing, photometry(system_id, 61700.0))
    with write(later(2)) as writing:
        observations.supersede_observation(writing, wrong, photometry(system_id, 61700.5))
        observations.withdraw_observation(writing, 1)
    return database


def at_revision(revision: str, filled: Path, target: Path) -> None:
    """What ``filled`` holds, as far as a program of ``revision`` could have written it."""
    with migration_engine(address_of(target), 5.0, "rwc").connect() as connection:
        connection.begin()
        config = upgrade.alembic_config()
        config.attributes["connection"] = connection
        command.upgrade(config, revision)
        connection.commit()
    old = sqlite3.connect(target)
    old.execute("ATTACH ? AS filled", (str(filled),))
    for (name,) in old.execute("SELECT name FROM main.sqlite_master WHERE type = 'table'").fetchall():
        if name != "alembic_version":
            columns = ", ".join(row[1] for row in old.execute(f"PRAGMA main.table_info({name})"))
            old.execute(f"INSERT INTO main.{name} ({columns}) SELECT {columns} FROM filled.{name}")
    old.commit()
    old.close()


@pytest.mark.parametrize("revision", KNOWN_REVISIONS[:-1])
def test_an_older_catalogue_keeps_every_value(revision, filled, tmp_path):
    old = tmp_path / "old.db"
    at_revision(revision, filled, old)
    before = content(old)
    for table in ("systems", "solutions", "adoptions", "dust_rules", "episodes", "observations", "changes"):
        assert before[table][1], table
    report = upgrade.upgrade_database(old)
    assert (report.from_revision, report.to_revision) == (revision, HEAD_REVISION)
    after = content(old)
    for table, (columns, rows) in before.items():
        if table != "alembic_version":
            assert after[table][0][: len(columns)] == columns
            assert [row[: len(columns)] for row in after[table][1]] == rows
    connection = sqlite3.connect(old)
    assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
    assert connection.execute("PRAGMA integrity_check").fetchone() == ("ok",)
    connection.close()
    with store.reading(old) as upgraded, store.reading(filled) as made:
        assert records.load_records(upgraded) == records.load_records(made)
        assert observations.observations_of(upgraded) == observations.observations_of(made)


@pytest.mark.parametrize("revision", KNOWN_REVISIONS[:-1])
def test_an_upgraded_catalogue_has_the_tables_of_a_new_one(revision, filled, begun, tmp_path):
    old = tmp_path / "old.db"
    at_revision(revision, filled, old)
    upgrade.upgrade_database(old)
    statements = []
    for path in (old, begun):
        connection = sqlite3.connect(path)
        rows = connection.execute("SELECT name, sql FROM sqlite_master WHERE sql IS NOT NULL").fetchall()
        connection.close()
        # A rebuilt table has its constraints in any order.
        statements.append(
            {name: sorted(line.strip(", \t") for line in sql.split("\n")) for name, sql in rows}
        )
    assert statements[0] == statements[1]


def test_the_snapshot_of_an_upgrade_is_the_older_catalogue(filled, tmp_path):
    old = tmp_path / "old.db"
    at_revision("0001", filled, old)
    kept = tmp_path / "kept.db"
    shutil.copy(old, kept)
    report = upgrade.upgrade_database(old)
    assert content(Path(str(report.snapshot))) == content(kept)


def test_an_upgraded_catalogue_takes_new_entries(filled, tmp_path):
    old = tmp_path / "old.db"
    at_revision("0001", filled, old)
    upgrade.upgrade_database(old)
    with store.writing(old, at=FIRST, who="Ida Vik", command="campaign test") as writing:
        system_id = systems.add_system(writing, full_system("Harbour"))
        solutions.add_solution(writing, full_solution(system_id))
        observations.add_observation(writing, photometry(system_id))
    with store.reading(old) as connection:
        assert systems.find_system(connection, "harbour").id == system_id
