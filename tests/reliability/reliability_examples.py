"""What the reliability tests of the catalogue share: a filled database, its content, child programs."""

from __future__ import annotations

import hashlib
import sqlite3
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from sqlalchemy import Engine, event

from campaign.catalogue import episodes, observations, rules, sites, solutions, store, systems, upgrade
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.systems import DatedEvent, DustRule, Episode, Site, Solution, System

NOW = datetime(2031, 4, 7, 3, 12, 10, tzinfo=UTC)
CHECKOUT = Path(__file__).parents[2]


def point(system_id: int, number: int, observer: str = "Ida Vik") -> Observation:
    """A magnitude that differs from every other by its number and observer's initial."""
    return Observation(
        id=0,
        uid="",
        system_id=system_id,
        kind="photometry",
        moment=Moment(60_000.0 + number, 0.001, 0.001, f"MJD {60_000 + number}", "utc", "observatory"),
        value=Measured(7.0, 0.02, 0.02),
        unit="mag",
        band=f"K{observer[0]}",
        observer=observer,
    )


def solution(system_id: int, label: str) -> Solution:
    return Solution(
        0,
        system_id,
        label,
        period_d=Measured(3127.5, 0.3, 0.3),
        epoch=Moment(61_234.0, 0.5, 0.5),
        source=f"Quill on {label}",
    )


def fill(database: Path, points: int = 20) -> None:
    """Two systems with a little of everything."""
    upgrade.begin_database(database, at=NOW)
    with store.writing(database, at=NOW, who="Ida Vik", command="campaign test", summary="filled") as writing:
        sites.add_site(writing, Site(0, "Cold Mesa", latitude_deg=-31.0, longitude_deg_east=-70.0))
        for name in ("Lantern", "Quarry"):
            system_id = systems.add_system(writing, System(0, name, 10.0, -20.0, aliases=(f"{name} B",)))
            first = solutions.add_solution(writing, solution(system_id, "first"))
            solutions.add_solution(writing, solution(system_id, "second"))
            solutions.adopt_alone(writing, first)
            rules.set_rule(writing, DustRule(0, system_id, "lag", onset=Measured(-40.0, 5.0, 5.0)))
            episodes.add_episode(
                writing, Episode(0, system_id, 0, onset=DatedEvent(Moment(58_107.0, 3.0, 3.0), "K"))
            )
            entries = [point(system_id, number) for number in range(points)]
            observations.add_observations(writing, entries)


def content(database: Path) -> dict[str, list[tuple[object, ...]]]:
    """All rows of all tables."""
    connection = sqlite3.connect(f"file:{database}?mode=ro", uri=True)
    try:
        tables = connection.execute(
            "SELECT name FROM sqlite_master WHERE type = 'table' ORDER BY name"
        ).fetchall()
        return {name: connection.execute(f"SELECT * FROM {name} ORDER BY 1").fetchall() for (name,) in tables}
    finally:
        connection.close()


def assert_sound(database: Path) -> None:
    """The file is whole and no reference is broken."""
    connection = sqlite3.connect(database)
    try:
        assert connection.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
        assert connection.execute("PRAGMA foreign_key_check").fetchall() == []
    finally:
        connection.close()


class FaultError(Exception):
    pass


@contextmanager
def fault_at(number: int) -> Iterator[list[str]]:
    """Fail the n-th statement, counting the commit as one; yield the statements that were tried."""
    tried: list[str] = []

    def step(statement: str) -> None:
        tried.append(statement)
        if len(tried) == number:
            raise FaultError(statement)

    def statement(connection: Any, cursor: Any, text: str, *rest: Any) -> None:
        step(text)

    def commit(connection: Any) -> None:
        step("COMMIT")

    event.listen(Engine, "before_cursor_execute", statement)
    event.listen(Engine, "commit", commit)
    try:
        yield tried
    finally:
        event.remove(Engine, "before_cursor_execute", statement)
        event.remove(Engine, "commit", commit)


def digest(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def start(program: str, *arguments: object) -> subprocess.Popen[str]:
    """A Python program of its own, in the checkout, with pipes in and out."""
    return subprocess.Popen(
        [sys.executable, "-c", program, *map(str, arguments)],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        cwd=CHECKOUT,
    )


def release_at_once(children: list[subprocess.Popen[str]]) -> list[tuple[int, str, str]]:
    """Wait until every child has said that it is ready, let all go, and return status and output of each."""
    for child in children:
        assert child.stdout is not None
        assert child.stdout.readline() == "ready\n", child.communicate()[1]
    for child in children:
        assert child.stdin is not None
        child.stdin.write("go\n")
        child.stdin.flush()
    results = []
    for child in children:
        out, err = child.communicate(timeout=120)
        results.append((child.returncode, out, err))
    return results
