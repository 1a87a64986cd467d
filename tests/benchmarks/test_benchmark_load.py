"""A million rows of photometry over 500 systems, beside what pandas takes to copy them without a look.

Budgets are promises to users: loaded, checked and indexed within 2 x the time of ``pandas.read_csv`` and
``DataFrame.to_sql`` (over SQLAlchemy, as pandas documents it and as the program itself writes) with at most
600 MB, one light curve of 2,000 points read back within 50 ms, a hundred rows loaded within 1.5 x of one
observation logged. All is compared within one run, the least of interleaved runs, in time of the processor:
what the wall clock shows on a machine that does nothing else.
"""

from __future__ import annotations

import json
import os
import shutil
import subprocess
import sys
import time
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pytest

import campaign
from campaign.catalogue import store, systems, upgrade
from campaign.model.systems import System

ROOT = Path(__file__).resolve().parents[2]
NOW = datetime(2031, 4, 7, tzinfo=UTC)
SYSTEMS, POINTS = 500, 2_000
ROWS = SYSTEMS * POINTS
LOAD_RATIO, PEAK_MB, READ_S, SMALL_RATIO = 2.0, 600.0, 0.050, 1.5
# The least of a few runs is what a way takes; a machine that was busy during the first ones gets more.
MORE_ROUNDS = (("SQLAlchemy",),) * 3
PANDAS = """
import sys
import pandas
{engine}
pandas.read_csv(sys.argv[1]).to_sql("photometry", engine, index=False)
"""
ENGINES = {
    "SQLAlchemy": "import sqlalchemy; engine = sqlalchemy.create_engine('sqlite:///' + sys.argv[2])",
    "the driver": "import sqlite3; engine = sqlite3.connect(sys.argv[2])",
}

# A process inherits the peak of the one that began it, so that a small one has to begin those measured.
MEASURED = """
import json, os, sys, time
said = os.open("said.txt", os.O_WRONLY | os.O_CREAT | os.O_TRUNC)
begin = time.perf_counter()
process = os.posix_spawn(
    sys.argv[1], sys.argv[1:], os.environ,
    file_actions=[(os.POSIX_SPAWN_DUP2, said, 1), (os.POSIX_SPAWN_DUP2, said, 2)],
)
_, status, used = os.wait4(process, 0)
print(json.dumps({
    "status": os.waitstatus_to_exitcode(status), "wall_s": time.perf_counter() - begin,
    "processor_s": used.ru_utime + used.ru_stime, "peak_mb": used.ru_maxrss / 1024.0,
}))
"""


class Cost:
    """The least that a command took, of several runs."""

    def __init__(self) -> None:
        self.wall_s = self.processor_s = float("inf")
        self.peak_mb = 0.0

    def run(self, folder: Path, *words: str) -> None:
        environment = {
            "PATH": os.environ["PATH"],
            "PYTHONPATH": str(ROOT),
            "CAMPAIGN_DB": str(folder / "campaign.db"),
            "CAMPAIGN_OBSERVER": "Ida Vik",
            "LC_ALL": "C.UTF-8",
        }
        run = subprocess.run(
            [sys.executable, "-c", MEASURED, sys.executable, *words],
            cwd=folder,
            env=environment,
            stdout=subprocess.PIPE,
            encoding="utf-8",
            check=True,
        )
        used = json.loads(run.stdout)
        assert used["status"] == 0, (words, (folder / "said.txt").read_text())
        self.wall_s = min(self.wall_s, used["wall_s"])
        self.processor_s = min(self.processor_s, used["processor_s"])
        self.peak_mb = max(self.peak_mb, used["peak_mb"])

    def __str__(self) -> str:
        return f"{self.processor_s:.2f} s of processor ({self.wall_s:.2f} s of wall), {self.peak_mb:.0f} MB"


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    """A catalogue of 500 systems, and a table of a million magnitudes in the order of a survey."""
    folder = tmp_path_factory.mktemp("million")
    upgrade.begin_database(folder / "empty.db", at=NOW)
    draw = np.random.default_rng(20310407)
    with store.writing(folder / "empty.db", at=NOW, who="Ida Vik", command="benchmark") as writing:
        for number in range(SYSTEMS):
            ra, dec = draw.uniform(0.0, 360.0), np.degrees(np.arcsin(draw.uniform(-1.0, 1.0)))
            systems.add_system(writing, System(0, f"Ember {number}", float(ra), float(dec)))
    hjd = np.sort(draw.uniform(2_452_000.0, 2_462_000.0, ROWS)) - 2_450_000.0
    system = draw.permuted(np.repeat(np.arange(SYSTEMS), POINTS))
    band = draw.choice(["J", "H", "K", "L"], ROWS)
    mag, error = draw.normal(7.3, 0.02, ROWS), draw.uniform(0.005, 0.04, ROWS)
    rows = zip(system.tolist(), hjd.tolist(), band.tolist(), mag.tolist(), error.tolist(), strict=True)
    with open(folder / "survey.csv", "w", encoding="utf-8") as table:
        table.write("system,HJD_UTC-2450000,band,mag,e_mag\n")
        table.writelines(f"Ember {n},{t:.5f},{b},{m:.3f},{e:.3f}\n" for n, t, b, m, e in rows)
    return folder


@pytest.fixture(scope="module")
def costs(folder):
    """Both ways in turn; the last catalogue stays."""
    costs = {name: Cost() for name in ("load", "pandas over SQLAlchemy", "pandas over the driver")}
    for number, over_what in enumerate((("SQLAlchemy",), ("SQLAlchemy", "the driver"), *MORE_ROUNDS)):
        if (
            number > 1
            and costs["load"].processor_s <= LOAD_RATIO * costs["pandas over SQLAlchemy"].processor_s
        ):
            break
        shutil.copy(folder / "empty.db", folder / "campaign.db")
        costs["load"].run(folder, "-m", "campaign", "load", "survey.csv", "--quiet")
        for name in over_what:
            (folder / "pandas.db").unlink(missing_ok=True)
            script = PANDAS.format(engine=ENGINES[name])
            costs[f"pandas over {name}"].run(folder, "-c", script, "survey.csv", "pandas.db")
    print()
    for name, cost in costs.items():
        ratio = costs["load"].processor_s / cost.processor_s
        print(f"{ROWS:,} rows, {name}: {cost}; load takes {ratio:.2f} x")
    return costs


@pytest.mark.slow
def test_a_million_rows_go_in_within_twice_the_time_of_a_bare_copy_and_600_mb(costs):
    assert costs["load"].processor_s <= LOAD_RATIO * costs["pandas over SQLAlchemy"].processor_s
    assert costs["load"].peak_mb <= PEAK_MB


@pytest.mark.slow
def test_one_light_curve_of_a_million_rows_is_read_back_within_50_ms(costs, folder):
    catalogue = campaign.open(folder / "campaign.db")
    wall_s, processor_s = [], []
    for number in range(0, SYSTEMS, 20):
        begin, used = time.perf_counter(), time.process_time()
        curve = catalogue.observations(system=f"Ember {number}")
        wall_s.append(time.perf_counter() - begin)
        processor_s.append(time.process_time() - used)
        assert len(curve) == POINTS
        assert curve["bmjd_tdb"].is_monotonic_increasing
    print(
        f"\n{POINTS:,} of {ROWS:,} rows as a DataFrame: least {1e3 * min(processor_s):.0f} ms of processor, "
        f"{1e3 * min(wall_s):.0f} ms of wall; the first {1e3 * processor_s[0]:.0f} ms"
    )
    # The first call imports pandas.
    assert np.median(processor_s) <= READ_S


@pytest.mark.slow
def test_a_hundred_rows_are_loaded_within_one_and_a_half_times_one_logged(folder, tmp_path):
    with open(folder / "survey.csv", encoding="utf-8") as table:
        (tmp_path / "night.csv").write_text("".join(next(table) for _ in range(101)))
    load, log = Cost(), Cost()
    for number in range(1, 7):
        shutil.copy(folder / "empty.db", tmp_path / "campaign.db")
        load.run(tmp_path, "-m", "campaign", "load", "night.csv")
        at = f"2026-04-{number:02d}T03:12:10Z"
        log.run(tmp_path, "-m", "campaign", "log", "photometry", "Ember 7", "K=7.31±0.03", "--at", at)
    ratio = load.processor_s / log.processor_s
    print(f"\nload of 100 rows: {load}; log of one: {log}; {ratio:.2f} x")
    assert ratio <= SMALL_RATIO


@pytest.mark.slow
def test_a_million_rows_are_taken_back_and_put_back_faster_than_they_were_loaded(costs, folder):
    told, undone, redone = Cost(), Cost(), Cost()
    undone.run(folder, "-m", "campaign", "undo", "2", "--yes")
    redone.run(folder, "-m", "campaign", "undo", "3", "--yes")
    told.run(folder, "-m", "campaign", "history", "Ember 7")
    print(f"\n{ROWS:,} rows, undo: {undone}; undo of that: {redone}; history of one system: {told}")
    assert max(undone.processor_s, redone.processor_s) <= costs["load"].processor_s
    with store.reading(folder / "campaign.db") as connection:
        in_use = "SELECT count(*) FROM observations WHERE withdrawn_at IS NULL"
        assert connection.exec_driver_sql(in_use).scalar_one() == ROWS


@pytest.mark.slow
def test_the_same_million_rows_again_add_nothing_in_less_than_twice_the_time_of_the_first(costs, folder):
    again = Cost()
    again.run(folder, "-m", "campaign", "load", "survey.csv", "--json")
    ratio = again.processor_s / costs["load"].processor_s
    print(f"\n{ROWS:,} rows that are there already: {again}; {ratio:.2f} x the first load")
    document = json.loads((folder / "said.txt").read_text().splitlines()[-1])
    assert (document["data"]["added"], document["data"]["already_known"]) == (0, ROWS)
    assert again.peak_mb <= PEAK_MB
    # The promise is of the first load; looking up what is there already may cost something on top.
    assert ratio <= 2.0
