"""Every change is in the journal, in the same transaction, or it did not happen."""

from __future__ import annotations

import sqlite3
import subprocess
import sys

import pytest
from catalogue_examples import FIRST, bare_system, full_solution, full_system, later

import campaign
from campaign.catalogue import info, solutions, store, systems
from campaign.catalogue import tables as t
from campaign.errors import DatabaseBusy, InputRefused


def journal(database):
    with store.reading(database) as connection:
        operations = connection.execute(t.operations.select().order_by(t.operations.c.id)).all()
        changes = connection.execute(t.changes.select().order_by(t.changes.c.id)).all()
    return operations, changes


def test_an_operation_says_who_when_and_by_which_command(write, database):
    with write(later(3), "added Dim") as writing:
        systems.add_system(writing, bare_system("Dim"))
    (operation,), changes = journal(database)
    assert operation.who == "Ida Vik"
    assert operation.at == later(3)
    assert operation.command == "campaign test"
    assert operation.summary == "added Dim"
    assert operation.program_version == campaign.__version__
    assert {change.operation_id for change in changes} == {operation.id}
    assert [(change.table_name, change.action) for change in changes] == [
        ("systems", "insert"),
        ("system_names", "insert"),
    ]
    assert changes[0].before is None
    assert changes[0].after["dec_deg"] == 20.0
    assert changes[0].after["entered_at"] == "2031-04-10T03:12:10.123456Z"


def test_an_update_keeps_only_what_differs_before_and_after(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, full_system())
    with write() as writing:
        systems.set_cycle_anchor(writing, system_id, 61234.123456789, 3127.5)
        writing.update(t.systems, system_id, {"priority": 2, "notes": "new"})
        writing.summarise("noted")
    operations, changes = journal(database)
    assert operations[-1].summary == "noted"
    assert [(c.action, c.row_id, c.before, c.after) for c in changes[-2:]] == [
        (
            "update",
            system_id,
            {"cycle_anchor_bmjd_tdb": None, "cycle_anchor_period_d": None},
            {"cycle_anchor_bmjd_tdb": 61234.123456789, "cycle_anchor_period_d": 3127.5},
        ),
        ("update", system_id, {"notes": "first line\nsecond line"}, {"notes": "new"}),
    ]


def test_a_removed_row_stays_in_the_journal_as_it_was_stored(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        solution_id = solutions.add_solution(writing, full_solution(system_id))
    with write() as writing:
        before = writing.stored_row(t.solutions, solution_id)
        writing.delete(t.solutions, solution_id)
    _, changes = journal(database)
    assert (changes[-1].action, changes[-1].row_id, changes[-1].after) == ("delete", solution_id, None)
    assert changes[-1].before == before
    assert before["covariance"].startswith('{"matrix"')
    assert before["epoch_bmjd_tdb"] == full_solution(1).epoch.bmjd_tdb


def test_an_operation_that_changed_nothing_leaves_no_trace(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
    before = database.read_bytes()
    with write() as writing:
        assert not systems.set_state(writing, system_id, "episodic")
    assert database.read_bytes() == before
    with write() as writing:
        assert writing.operation_id > 0
        assert not writing.changed
    assert len(journal(database)[0]) == 1


def test_a_failure_in_the_middle_takes_everything_back(write, database):
    before = database.read_bytes()

    class StopError(Exception):
        pass

    with pytest.raises(StopError), write() as writing:
        systems.add_system(writing, bare_system("Dim"))
        raise StopError
    assert database.read_bytes() == before
    with pytest.raises(KeyboardInterrupt), write() as writing:
        systems.add_system(writing, bare_system("Dim"))
        raise KeyboardInterrupt
    assert database.read_bytes() == before


def test_a_rehearsal_goes_the_whole_way_and_takes_it_back(database):
    before = database.read_bytes()
    with store.rehearsing(database, at=FIRST, who="Ida Vik", command="campaign test") as writing:
        systems.add_system(writing, bare_system("Dim"))
        assert writing.changed
        assert systems.find_system(writing.connection, "dim").name == "Dim"
    assert database.read_bytes() == before


def test_a_reader_cannot_write(database):
    before = database.read_bytes()
    with pytest.raises(campaign.errors.DatabaseUnusable) as refused, store.reading(database) as connection:
        connection.execute(t.sources.insert(), {"title": "x", "source_key": "x", "entered_at": FIRST})
    assert refused.value.code == "database-read-only"
    assert database.read_bytes() == before


def test_a_reader_sees_one_state_and_a_writer_does_not_wait_for_it_to_read(write, database):
    with store.reading(database) as connection:
        assert systems.list_systems(connection) == []
        with (
            pytest.raises(DatabaseBusy),
            store.writing(database, at=FIRST, who="x", command="y", busy_timeout_s=0.1) as writing,
        ):
            # Journal and rows can be written beside the reader; only the last step has to wait.
            systems.add_system(writing, bare_system("Dim"))
        assert systems.list_systems(connection) == []


def test_a_second_writer_waits_and_is_then_told_that_the_database_is_busy(write, database):
    with write() as writing:
        systems.add_system(writing, bare_system("Dim"))
        with (
            pytest.raises(DatabaseBusy) as busy,
            store.writing(database, at=FIRST, who="x", command="y", busy_timeout_s=0.2),
        ):
            pass
        assert busy.value.exit_status == 6
    with store.reading(database) as connection:
        assert len(systems.list_systems(connection)) == 1


def test_the_connection_has_the_safe_settings(write, database):
    with write() as writing:
        pragmas = {
            name: writing.connection.exec_driver_sql(f"PRAGMA {name}").scalar()
            for name in ("foreign_keys", "synchronous", "journal_mode", "busy_timeout")
        }
    assert pragmas == {"foreign_keys": 1, "synchronous": 2, "journal_mode": "delete", "busy_timeout": 5000}


def test_a_writer_holds_the_lock_from_the_start(write, database):
    with write():
        other = sqlite3.connect(database, timeout=0, isolation_level=None)
        with pytest.raises(sqlite3.OperationalError, match="locked"):
            other.execute("BEGIN IMMEDIATE")
        other.close()


def test_a_refused_value_names_its_column_in_an_update_too(write):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        with pytest.raises(InputRefused) as refused:
            writing.update(t.systems, system_id, {"dec_deg": float("nan")})
    assert refused.value.details == {"table": "systems", "column": "dec_deg"}


def test_rows_in_bulk_must_say_which_command_brought_them(write):
    with write() as writing:
        with pytest.raises(ValueError, match="operation"):
            writing.insert_many(t.systems, [{"ra_deg": 1.0}])
        assert writing.insert_many(t.observations, []) == 0
        with pytest.raises(LookupError):
            writing.update(t.systems, 99, {"priority": 1})


def test_facts_of_the_campaign(write, database):
    with write() as writing:
        assert info.set_info(writing, "sample_as_of", "2031-01-01")
        assert not info.set_info(writing, "sample_as_of", "2031-01-01")
        assert info.set_info(writing, "sample_as_of", "2031-01-02")
    with store.reading(database) as connection:
        facts = info.read_info(connection)
    assert facts["sample_as_of"] == "2031-01-02"
    assert facts["format"] == "1"
    assert facts["begun_at"] == "2031-04-07T03:12:10.123456Z"
    assert len(facts["campaign_uid"]) == 36


def test_everyday_opening_imports_nothing_heavy(database):
    program = (
        "import sys\n"
        "from datetime import datetime, UTC\n"
        "from campaign.catalogue import store, records, observations, sites, sources, episodes, info\n"
        "with store.reading(sys.argv[1]) as c: records.load_records(c)\n"
        "with store.writing(sys.argv[1], at=datetime.now(UTC), who='x', command='y'): pass\n"
        "heavy = {'alembic', 'sqlalchemy.orm', 'numpy', 'pandas', 'astropy', 'scipy', 'rich', 'psycopg'}\n"
        "print(sorted(heavy & set(sys.modules)))\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", program, str(database)], capture_output=True, text=True, check=True
    )
    assert done.stdout == "[]\n"
