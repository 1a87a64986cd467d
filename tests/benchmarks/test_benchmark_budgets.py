"""The speed that the project promises: commands beside what they cannot avoid, a large campaign in seconds.

Budgets are promises to users. Ratios are taken within one run, between the least of
several interleaved runs, so that other work on the machine does not decide.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from pathlib import Path

import pytest
from benchmark_campaign import NOW, build_large_campaign

ROOT = Path(__file__).resolve().parents[2]
UNAVOIDABLE = "import typer, rich.table, sqlalchemy.orm, numpy"
LOG_RATIO, UPCOMING_RATIO = 1.6, 3.0
RUNS = 9
SYSTEMS, DRAWS = 10_000, 2_000
PEAK_MB, CONDITIONED_RATIO = 500.0, 1.5

# Everything that a forecast of the whole catalogue does: load, ask, forecast. Imports are counted too.
# Without light curves nothing is judged, and no date is conditioned on quiet observations.
FORECAST = f"""
import json, resource, sys, time
from dataclasses import replace
begin = time.perf_counter()
from datetime import datetime
from campaign.studies import watch
imported = time.perf_counter()
campaign = watch.load_campaign(sys.argv[1], None, None, None)
if sys.argv[3:] == ["dark"]:
    campaign = replace(campaign, photometry={{}})
loaded = time.perf_counter()
question = watch.ask(
    campaign, now=datetime.fromisoformat(sys.argv[2]), as_of=None, start=None, end=None, within_d=None,
    events=(), min_probability=0.0, draws={DRAWS}, seed=None, solutions="adopted",
)
result = watch.upcoming(campaign, question)
done = time.perf_counter()
print(json.dumps({{
    "import_s": imported - begin, "load_s": loaded - imported, "forecast_s": done - loaded,
    "all_s": done - begin, "cpu_s": time.process_time(),
    "peak_mb": resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0,
    "systems": len(campaign.records), "events": len(result.events), "bases": len(result.bases),
}}))
"""


@pytest.fixture
def python(tmp_path):
    """Run ``python WORDS`` on the checkout and a database of this test."""

    def run(*words: str) -> str:
        done = subprocess.run(
            [sys.executable, *words],
            cwd=tmp_path,
            env={
                "PATH": os.environ["PATH"],
                "PYTHONPATH": str(ROOT),
                "CAMPAIGN_DB": str(tmp_path / "campaign.db"),
                "CAMPAIGN_OBSERVER": "Ida Vik",
                "LC_ALL": "C.UTF-8",
            },
            stdout=subprocess.PIPE,
            encoding="utf-8",
            check=True,
        )
        return done.stdout

    return run


def least_s(python, lines) -> dict[str, float]:
    """The least wall time of each line, all of them in turn, so that a slow moment hits them alike."""
    least = dict.fromkeys(lines, float("inf"))
    for number in range(1, RUNS + 1):
        for name, words in lines.items():
            begin = time.perf_counter()
            python(*(word.replace("NUMBER", f"{number:02d}") for word in words))
            least[name] = min(least[name], time.perf_counter() - begin)
    return least


@pytest.mark.slow
def test_everyday_commands_cost_little_more_than_their_libraries(python):
    for words in (
        ("begin",),
        ("site", "add", "Cold Mesa", "--latitude", "-31.2", "--longitude", "-70", "--height", "2400"),
        ("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30"),
        ("solution", "add", "Lantern 3", "--period", "3127.5±0.3 d", "--epoch", "BJD 2461234.2±0.5",
         "--eccentricity", "0.71±0.02", "--adopt"),
    ):  # fmt: skip
        python("-m", "campaign", *words, "--quiet")
    log = ("log", "photometry", "Lantern 3", "K=7.31±0.03", "--at", "2026-04-NUMBERT03:12:10Z")
    least = least_s(
        python,
        {
            "unavoidable": ("-c", UNAVOIDABLE),
            "log": ("-m", "campaign", *log, "--site", "Cold Mesa"),
            "upcoming": ("-m", "campaign", "upcoming", "--sample"),
        },
    )
    logged = json.loads(python("-m", "campaign", "system", "show", "Lantern 3", "--json"))
    assert f'"photometry": {RUNS}' in json.dumps(logged), "every run has to log something new"
    figures = ", ".join(f"{name} {1000.0 * seconds:.0f} ms" for name, seconds in least.items())
    log_ratio = least["log"] / least["unavoidable"]
    upcoming_ratio = least["upcoming"] / least["unavoidable"]
    print(f"\n{figures}: log {log_ratio:.2f} x, upcoming --sample {upcoming_ratio:.2f} x")
    assert log_ratio <= LOG_RATIO
    assert upcoming_ratio <= UPCOMING_RATIO


@pytest.mark.slow
def test_ten_thousand_systems_fit_half_a_gigabyte_and_their_light_curves_cost_less_than_half_as_much_again(
    python, tmp_path
):
    database = tmp_path / "campaign.db"
    begin = time.perf_counter()
    build_large_campaign(database, SYSTEMS)
    print(f"\n{SYSTEMS} systems written in {time.perf_counter() - begin:.1f} s")

    def run(*words: str) -> dict[str, float]:
        figures: dict[str, float] = json.loads(python("-c", FORECAST, str(database), NOW.isoformat(), *words))
        return figures

    runs = [(run(), run("dark")) for _ in range(3)]
    best, dark = (min(each, key=lambda figures: figures["cpu_s"]) for each in zip(*runs, strict=True))
    for name, figures in (("with", best), ("without", dark)):
        told = ", ".join(f"{key} {value:.2f}" for key, value in figures.items())
        print(f"{name} light curves: {told}")
    assert best["systems"] == SYSTEMS
    assert best["bases"] == SYSTEMS
    assert best["events"] > SYSTEMS
    assert best["peak_mb"] <= PEAK_MB
    # Time of the processor, of all threads and from the start of the process. The aim is 6 s with all light
    # curves; the seconds of a machine are told above, what is held is the ratio within this run.
    assert best["cpu_s"] <= CONDITIONED_RATIO * dark["cpu_s"]
