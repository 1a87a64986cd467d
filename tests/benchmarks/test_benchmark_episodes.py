"""How long finding episodes takes: 500 systems of 2,000 points in a minute of one core, and its growth."""

from __future__ import annotations

import sys
import time
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).resolve().parents[1] / "studies"))

from find_simulations import simulate

from campaign.model.records import SystemRecord
from campaign.model.systems import System
from campaign.studies.find_episodes import find_in

RECORD = SystemRecord(System(1, "Vane 6", 40.0, -20.0))
SYSTEMS, POINTS, BUDGET_S = 500, 2_000, 60.0
# So many different light curves stand for the 500; each is found anew every time.
DIFFERENT = 25


def light_curves(points: int, count: int):
    """Light curves of about so many points, an episode about every eight years; the cadence alone differs."""
    found = [
        simulate(number, cadence_d=3.75 * POINTS / points, episodes=4, years=32.0).arrays
        for number in range(count)
    ]
    sizes = [arrays.mag.size for arrays in found]
    assert 0.9 * points < min(sizes) <= max(sizes) < 1.1 * points
    return found


def seconds_each(curves) -> float:
    """Processor time of one light curve; other work on the machine does not count."""
    start = time.process_time()
    episodes = sum(len(find_in(RECORD, arrays).episodes) for arrays in curves)
    spent = time.process_time() - start
    assert episodes >= 3 * len(curves)
    return spent / len(curves)


@pytest.mark.slow
def test_500_systems_of_2000_points_take_less_than_a_minute_of_one_core():
    curves = light_curves(POINTS, DIFFERENT)
    seconds_each(curves[:2])
    whole = SYSTEMS * min(seconds_each(curves) for _ in range(2))
    print(f"{SYSTEMS} systems of {POINTS} points, four episodes each: {whole:.1f} s of one core")
    assert whole < BUDGET_S


@pytest.mark.slow
def test_time_grows_no_faster_than_the_number_of_points():
    sizes = (500, 1_000, 2_000, 4_000)
    curves = {points: light_curves(points, 8) for points in sizes}
    # The least of interleaved rounds, so that a busy machine does not decide.
    rounds = [{points: seconds_each(curves[points]) for points in sizes} for _ in range(3)]
    least = {points: min(each[points] for each in rounds) for points in sizes}
    for points in sizes:
        print(f"{points} points: {1e3 * least[points]:.0f} ms")
    assert least[4_000] < 8.0 * 1.3 * least[500]
