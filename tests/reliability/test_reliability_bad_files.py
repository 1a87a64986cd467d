"""Whatever lies where the database should be: the right status, something to do next, untouched bytes."""

from __future__ import annotations

import multiprocessing
import os
import random
import shutil
import sqlite3
import stat
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import alembic.command  # noqa: F401  (loaded here because a child without rights cannot load it later)
import pytest
from reliability_examples import NOW, digest, fill, point

from campaign.catalogue import observations, records, store, systems, upgrade
from campaign.errors import CampaignError
from campaign.model.systems import System

NOBODY = 65534


@pytest.fixture(scope="module")
def good(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("good") / "campaign.db"
    fill(path, points=400)
    return path


def read(database: Path) -> object:
    with store.reading(database, busy_timeout_s=0.1) as connection:
        return records.load_records(connection), observations.observations_of(connection)


def write(database: Path) -> object:
    with store.writing(database, at=NOW, who="x", command="y", busy_timeout_s=0.1) as writing:
        return observations.add_observation(writing, point(1, 5000))


def begin(database: Path) -> object:
    return upgrade.begin_database(database, at=NOW, lock_timeout_s=0.1)


def bring_up(database: Path) -> object:
    return upgrade.upgrade_database(database, lock_timeout_s=0.1)


ATTEMPTS = [read, write, begin, bring_up]


def text(good: Path) -> bytes:
    return b"system,period\nLantern,3127.5\n" * 400


def short_text(good: Path) -> bytes:
    return b"x"


def bytes_at_random(good: Path) -> bytes:
    return random.Random(1).randbytes(20_000)


def zeros(good: Path) -> bytes:
    return bytes(8192)


def header_only(good: Path) -> bytes:
    return good.read_bytes()[:100]


def first_half(good: Path) -> bytes:
    return good.read_bytes()[: good.stat().st_size // 2]


def all_but_the_last_page(good: Path) -> bytes:
    return good.read_bytes()[:-4096]


NOT_SQLITE = {"database-not-sqlite"}
DAMAGED = {"database-damaged", "database-not-sqlite"}


@pytest.mark.parametrize("attempt", ATTEMPTS)
@pytest.mark.parametrize(
    ("make", "codes"),
    [
        (text, NOT_SQLITE),
        (short_text, NOT_SQLITE),
        (bytes_at_random, NOT_SQLITE),
        (zeros, NOT_SQLITE),
        (header_only, DAMAGED),
        (first_half, DAMAGED),
        (all_but_the_last_page, DAMAGED),
    ],
)
def test_a_file_that_is_no_whole_database(
    attempt: Callable[[Path], object],
    make: Callable[[Path], bytes],
    codes: set[str],
    good: Path,
    tmp_path: Path,
) -> None:
    database = tmp_path / "campaign.db"
    database.write_bytes(make(good))
    before = digest(database)
    with pytest.raises(CampaignError) as refused:
        attempt(database)
    assert refused.value.exit_status == 7
    assert refused.value.code in codes
    assert refused.value.why
    assert refused.value.hint
    assert digest(database) == before
    assert [entry.name for entry in tmp_path.iterdir()] == ["campaign.db"]


@pytest.mark.parametrize("attempt", ATTEMPTS)
def test_a_database_of_another_program(attempt: Callable[[Path], object], tmp_path: Path) -> None:
    for number, statements in enumerate(
        [
            "CREATE TABLE recipes (name TEXT);",
            "CREATE TABLE alembic_version (version_num TEXT); INSERT INTO alembic_version VALUES ('0001');",
            "CREATE TABLE systems (id INTEGER); CREATE TABLE campaign_info (id INTEGER);",
            "CREATE VIEW v AS SELECT 1;",
        ]
    ):
        database = tmp_path / f"{number}.db"
        connection = sqlite3.connect(database)
        connection.executescript(statements)
        connection.close()
        before = digest(database)
        with pytest.raises(CampaignError) as refused:
            attempt(database)
        assert refused.value.exit_status == 7
        assert refused.value.code == "database-foreign"
        assert digest(database) == before


@pytest.mark.parametrize("attempt", ATTEMPTS)
def test_a_folder_in_place_of_the_file(attempt: Callable[[Path], object], tmp_path: Path) -> None:
    with pytest.raises(CampaignError) as refused:
        attempt(tmp_path)
    assert refused.value.exit_status == 7
    assert refused.value.code == "database-is-folder"


@pytest.mark.parametrize("attempt", ATTEMPTS)
def test_a_path_that_leads_nowhere(attempt: Callable[[Path], object], tmp_path: Path) -> None:
    (tmp_path / "file").write_text("x")
    for database in (
        tmp_path / "no" / "campaign.db",
        tmp_path / "file" / "campaign.db",
        tmp_path / ("x" * 300),
    ):
        with pytest.raises(CampaignError) as refused:
            attempt(database)
        assert refused.value.exit_status == 7
        assert refused.value.hint
    assert [entry.name for entry in tmp_path.iterdir()] == ["file"]


@pytest.mark.parametrize("attempt", [write, begin, bring_up])
def test_a_database_that_somebody_else_is_changing(
    attempt: Callable[[Path], object], good: Path, tmp_path: Path
) -> None:
    database = tmp_path / "campaign.db"
    shutil.copy(good, database)
    other = sqlite3.connect(database, isolation_level=None)
    other.execute("BEGIN IMMEDIATE")
    before = digest(database)
    with pytest.raises(CampaignError) as refused:
        attempt(database)
    assert refused.value.exit_status == 6
    read(database)
    other.execute("COMMIT")
    other.execute("BEGIN EXCLUSIVE")
    with pytest.raises(CampaignError) as refused:
        read(database)
    assert refused.value.exit_status == 6
    other.close()
    assert digest(database) == before


@pytest.mark.parametrize("seed", range(12))
def test_overwritten_pages_never_end_in_an_unexpected_error(seed: int, good: Path, tmp_path: Path) -> None:
    # Engineering notes 4.8. The first page stays: without it the file is no database at all.
    database = tmp_path / "campaign.db"
    chance = random.Random(seed)
    damaged = bytearray(good.read_bytes())
    pages = len(damaged) // 4096
    for page in chance.sample(range(1, pages), k=max(1, pages // 4)):
        damaged[page * 4096 : (page + 1) * 4096] = chance.randbytes(4096)
    database.write_bytes(bytes(damaged))
    before = digest(database)
    with pytest.raises(CampaignError) as refused:
        read(database)
    assert refused.value.exit_status == 7
    assert digest(database) == before


def read_flipped(good: Path, database: Path, seed: int) -> str:
    """Change a few bytes behind the header; say how reading ended."""
    chance = random.Random(seed)
    damaged = bytearray(good.read_bytes())
    for _ in range(chance.choice([1, 3, 20])):
        damaged[chance.randrange(100, len(damaged))] = chance.randrange(256)
    database.write_bytes(bytes(damaged))
    before = digest(database)
    try:
        read(database)
    except CampaignError as error:
        assert error.exit_status == 7, seed
        outcome = error.code
    else:
        outcome = "read"
    assert digest(database) == before, seed
    return outcome


def test_flipped_bytes_are_read_or_reported_and_never_crash(good: Path, tmp_path: Path) -> None:
    outcomes = {read_flipped(good, tmp_path / "campaign.db", seed) for seed in range(100)}
    assert {"read", "database-damaged"} <= outcomes


@pytest.mark.slow
def test_flipped_bytes_in_two_thousand_files(good: Path, tmp_path: Path) -> None:
    for seed in range(100, 2100):
        read_flipped(good, tmp_path / "campaign.db", seed)


# A user without rights. Root may do anything, so the work is done in a child that gives its rights up.


def _without_rights(function: Callable[[Path], object], database: Path, answers: Any) -> None:
    if os.getuid() == 0:
        os.setresuid(NOBODY, NOBODY, NOBODY)
    try:
        function(database)
        answers.put(("done", None, None))
    except CampaignError as error:
        answers.put((error.code, error.exit_status, error.hint))
    except BaseException as error:
        answers.put((repr(error), 1, None))


def without_rights(function: Callable[[Path], object], database: Path) -> tuple[str, int | None, str | None]:
    context = multiprocessing.get_context("fork")
    answers = context.Queue()
    child = context.Process(target=_without_rights, args=(function, database, answers))
    child.start()
    answer: tuple[str, int | None, str | None] = answers.get(timeout=30)
    child.join()
    return answer


@pytest.fixture
def shared_folder(good: Path) -> Iterator[Path]:
    """A folder that a user without rights can enter, with a database that everybody may read and write."""
    folder = Path(tempfile.mkdtemp())
    folder.chmod(0o777)
    shutil.copy(good, folder / "campaign.db")
    (folder / "campaign.db").chmod(0o666)
    yield folder
    folder.chmod(0o777)
    shutil.rmtree(folder)


def test_everybody_may_read_and_write_where_it_is_allowed(shared_folder: Path) -> None:
    assert without_rights(read, shared_folder / "campaign.db")[0] == "done"
    assert without_rights(write, shared_folder / "campaign.db")[0] == "done"


def test_a_database_in_a_read_only_folder_can_be_read_but_not_changed(shared_folder: Path) -> None:
    database = shared_folder / "campaign.db"
    shared_folder.chmod(0o555)
    before = digest(database)
    assert without_rights(read, database)[0] == "done"
    code, status, hint = without_rights(write, database)
    assert (code, status) in {("database-cannot-open", 7), ("database-read-only", 7)}
    assert hint
    assert digest(database) == before
    code, status, _ = without_rights(begin, shared_folder / "new.db")
    assert (code, status) == ("database-cannot-open", 7)
    assert not (shared_folder / "new.db").exists()


def test_a_read_only_file_can_be_read_but_not_changed(shared_folder: Path) -> None:
    database = shared_folder / "campaign.db"
    database.chmod(0o444)
    before = digest(database)
    assert without_rights(read, database)[0] == "done"
    for attempt in (write, begin, bring_up):
        code, status, hint = without_rights(attempt, database)
        if attempt is write:
            assert (code, status) == ("database-read-only", 7)
            assert hint
    assert digest(database) == before
    assert stat.S_IMODE(database.stat().st_mode) == 0o444


def test_a_file_that_may_not_be_read_or_reached(shared_folder: Path) -> None:
    database = shared_folder / "campaign.db"
    database.chmod(0o000)
    assert without_rights(read, database)[:2] == ("database-cannot-open", 7)
    shared_folder.chmod(0o000)
    for attempt in ATTEMPTS:
        assert without_rights(attempt, database)[:2] == ("database-cannot-open", 7)


def test_a_change_interrupted_where_nobody_may_write_is_explained(shared_folder: Path) -> None:
    database = shared_folder / "campaign.db"
    leave_half_a_change(database)
    shared_folder.chmod(0o555)
    database.chmod(0o444)
    code, status, hint = without_rights(read, database)
    assert (code, status) == ("database-interrupted", 7)
    assert hint
    shared_folder.chmod(0o777)
    database.chmod(0o666)
    assert without_rights(read, database)[0] == "done"
    assert not Path(f"{database}-journal").exists()


def leave_half_a_change(database: Path) -> None:
    """Stop a writer dead after it has begun to write into the file itself."""

    def write_and_stop(path: Path) -> None:
        with store.writing(path, at=NOW, who="x", command="y") as writing:
            writing.connection.exec_driver_sql("PRAGMA cache_size = 5")
            for number in range(300):
                systems.add_system(writing, System(0, f"Half {number}", 1.0, 1.0))
            os._exit(0)

    child = multiprocessing.get_context("fork").Process(target=write_and_stop, args=(database,))
    child.start()
    child.join()
    journal = Path(f"{database}-journal")
    assert journal.stat().st_size > 0
    journal.chmod(0o666)


def test_a_reader_takes_back_what_a_killed_writer_left(good: Path, tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    shutil.copy(good, database)
    before = digest(database)
    leave_half_a_change(database)
    assert digest(database) != before
    with store.reading(database) as connection:
        assert [system.name for system in systems.list_systems(connection)] == ["Lantern", "Quarry"]
    assert digest(database) == before
    assert not Path(f"{database}-journal").exists()
