"""A fault at the n-th statement of a correction or an undo, for every n: all as before, or all done.

The catalogue before and after is compared row by row, and a second try does what the first should have.
Recipe: engineering notes 4.11.
"""

from __future__ import annotations

import random
import shutil
import sqlite3
import time
from collections.abc import Callable
from datetime import timedelta
from pathlib import Path
from typing import Any

import pytest
from reliability_examples import NOW, FaultError, assert_sound, content, fault_at, fill, point, start

from campaign.catalogue import observations, store
from campaign.errors import CampaignError, Conflict
from campaign.model.kept import Stamp
from campaign.model.measured import Measured
from campaign.studies import amend, solutions, systems, undo

BOOK = "Quill on the first night"


def stamp(hours: float) -> Stamp:
    return Stamp(NOW + timedelta(hours=hours), "Ida Vik", "campaign test")


def newest(database: Path) -> int:
    return max(int(str(row[0])) for row in content(database)["operations"])


def load_many(database: Path, rows: int = 700) -> None:
    at = NOW + timedelta(hours=1)
    with store.writing(database, at=at, who="Ida Vik", command="campaign load", summary="load") as writing:
        entries = [point(1, 1_000 + number) for number in range(rows)]
        observations.add_observations(writing, entries)


def adopt_another(database: Path) -> None:
    solutions.adopt_solutions(str(database), stamp(1), "Lantern", {"second": None}, True)


def rename(database: Path) -> None:
    changes = {"name": "Lantern B", "star_b": {"spectral_type": "O5"}, "priority": 1}
    systems.change_system(str(database), stamp(1), "Lantern", changes)


def amend_one(database: Path) -> None:
    changes: dict[str, Any] = {"value": Measured(7.5, 0.1, 0.1), "source": BOOK}
    amend.amend_observation(str(database), stamp(1), 3, changes)


def withdraw_some(database: Path) -> None:
    amend.withdraw_observations(str(database), stamp(1), [3, 4, 5], "wrong star")


def undo_last(database: Path) -> None:
    undo.undo(str(database), stamp(2), newest(database))


def undo_again(database: Path) -> None:
    undo.undo(str(database), stamp(3), newest(database))


Work = Callable[[Path], None]

# What was done before, and what is then cut short.
CASES: dict[str, tuple[list[Work], Work]] = {
    "amend": ([], amend_one),
    "withdraw": ([], withdraw_some),
    "undo of a load": ([load_many], undo_last),
    "undo of an adoption": ([adopt_another], undo_last),
    "undo of a change of names and star": ([rename], undo_last),
    "undo of an amend": ([amend_one], undo_last),
    "undo of a withdrawal": ([withdraw_some], undo_last),
    "undo of the undo of a load": ([load_many, undo_last], undo_again),
    "undo of the undo of an adoption": ([adopt_another, undo_last], undo_again),
    "undo of the undo of an amend": ([amend_one, undo_last], undo_again),
    "undo of the undo of a change": ([rename, undo_last], undo_again),
}


@pytest.fixture(scope="module")
def good(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("good") / "campaign.db"
    fill(path)
    return path


# The rest is of the same kind and takes longer.
OFTEN = ("amend", "withdraw", "undo of a load", "undo of an adoption", "undo of an amend",
         "undo of the undo of a load")  # fmt: skip


@pytest.mark.parametrize(
    "case", [case if case in OFTEN else pytest.param(case, marks=pytest.mark.slow) for case in CASES]
)
def test_a_fault_at_any_statement_leaves_all_as_before(case: str, good: Path, tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    shutil.copy(good, database)
    earlier, work = CASES[case]
    for each in earlier:
        each(database)
    before = content(database)
    number, writes = 0, 0
    while True:
        number += 1
        with fault_at(number) as tried:
            try:
                work(database)
            except (FaultError, CampaignError):
                assert len(tried) == number
                assert content(database) == before, tried[-1]
                writes += tried[-1].startswith(("INSERT", "UPDATE", "DELETE"))
                continue
        break
    assert writes >= 4
    assert tried[-1] == "COMMIT"
    after = content(database)
    assert len(after["operations"]) == len(before["operations"]) + 1
    assert len(after["changes"]) > len(before["changes"])
    assert_sound(database)


@pytest.mark.parametrize("work", [load_many, adopt_another, rename, amend_one, withdraw_some])
def test_what_was_taken_back_twice_is_as_it_was(work: Work, good: Path, tmp_path: Path) -> None:
    """The entries in use, column by column, before, without and again with the command."""
    database = tmp_path / "campaign.db"
    shutil.copy(good, database)
    without = in_use(database)
    work(database)
    with_it = in_use(database)
    assert with_it != without
    for expected in (without, with_it, without, with_it):
        undo_last(database)
        assert in_use(database) == expected


def in_use(database: Path) -> dict[str, list[tuple[object, ...]]]:
    """All rows that count, with all that they say: not where they are kept, nor the entry's own history."""
    apart = {"id", "uid", "operation_id", "superseded_by_id", "former_sameness", "adopted_at"}
    out_of_use = ("withdrawn_at", "ended_at", "superseded_at")
    connection = sqlite3.connect(f"file:{database}?mode=ro", uri=True)
    connection.row_factory = sqlite3.Row
    found: dict[str, list[tuple[object, ...]]] = {}
    for table in ("systems", "system_names", "stars", "sites", "solutions", "adoptions", "dust_rules",
                  "episodes", "observations", "campaign_info", "column_mappings"):  # fmt: skip
        rows = [
            row
            for row in connection.execute(f"SELECT * FROM {table}")
            if all(row[name] is None for name in out_of_use if name in row.keys())  # noqa: SIM118
        ]
        found[table] = sorted(
            (tuple(row[name] for name in row.keys() if name not in apart) for row in rows),  # noqa: SIM118
            key=repr,
        )
    connection.close()
    return found


def test_a_refused_undo_leaves_no_trace(good: Path, tmp_path: Path) -> None:
    database = tmp_path / "campaign.db"
    shutil.copy(good, database)
    load_many(database)
    loaded = newest(database)
    amend.amend_observation(str(database), stamp(2), 100, {"value": Measured(8.0)})
    before = content(database)
    with pytest.raises(Conflict):
        undo.undo(str(database), stamp(3), loaded)
    assert content(database) == before


# Takes a load back and puts it back, over and over, and says each step once it is kept.
UNDOER = """
import sys
from datetime import UTC, datetime
from campaign.model.kept import Stamp
from campaign.studies import undo
database, number = sys.argv[1], int(sys.argv[2])
print(number, flush=True)
while True:
    number = undo.undo(database, Stamp(datetime.now(UTC), "Ida Vik", "campaign undo"), number).by_id
    print(number, flush=True)
"""


@pytest.mark.slow
def test_an_undo_that_is_killed_happened_wholly_or_not_at_all(good: Path, tmp_path: Path) -> None:
    """A kill that left a journal behind landed inside the write. Recipe: engineering notes 4.13."""
    database = tmp_path / "campaign.db"
    shutil.copy(good, database)
    load_many(database, 4_000)
    number, landed, rounds = newest(database), 0, 0
    chance = random.Random(20_310_407)
    while landed < 6:
        rounds += 1
        assert rounds < 60
        child = start(UNDOER, database, number)
        assert child.stdout is not None
        child.stdout.readline()
        time.sleep(chance.uniform(0.05, 0.6))
        child.kill()
        told, problem = child.communicate()
        assert problem == ""
        landed += Path(f"{database}-journal").exists()
        with store.reading(database):
            pass
        assert_sound(database)
        number = newest(database)
        # What was acknowledged is there; one more may have been kept without a word of it.
        acknowledged = [int(line) for line in told.split()]
        assert not acknowledged or number - acknowledged[-1] in (0, 1)
        assert loaded_in_use(database) == (4_000 if undo_depth(database, number) % 2 == 0 else 0)


def loaded_in_use(database: Path) -> int:
    connection = sqlite3.connect(f"file:{database}?mode=ro", uri=True)
    (found,) = connection.execute(
        "SELECT count(*) FROM observations WHERE withdrawn_at IS NULL AND bmjd_tdb >= 61000"
    ).fetchone()
    connection.close()
    return int(found)


def undo_depth(database: Path, number: int) -> int:
    """How many undos lie between an operation and the load at its beginning."""
    undoes = {int(str(row[0])): row[-1] for row in content(database)["operations"]}
    depth = 0
    while undoes[number] is not None:
        number, depth = int(str(undoes[number])), depth + 1
    return depth
