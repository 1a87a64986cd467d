"""Alarms: an onset is suspected at once, stays so until it is decided, and quiet stars rarely raise one.

The share of false alarms allowed, 1 in 1,000 observations, is the project's promise to its users; red noise,
wild points, seasons and offsets are drawn as in find_simulations, by no rule of the verdicts themselves.
"""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import pytest
from find_simulations import simulate
from studies_examples import episode, light_curve, record

from campaign.model.arrays import PhotometryArrays
from campaign.studies.judging import judge
from campaign.studies.quietness import suspicious_points
from campaign.studies.suspicion import bracket, suspicion_of

NOW = 61_000.0


def until(arrays, count):
    """The first points of a light curve."""
    return PhotometryArrays(**{f.name: getattr(arrays, f.name)[:count] for f in fields(arrays)})


def alarms(arrays):
    """How many observations raise an alarm as they come in, one after the other."""
    raised = 0
    for count in range(6, arrays.bmjd_tdb.size + 1):
        at = float(arrays.bmjd_tdb[count - 1])
        judged = judge(record(), until(arrays, count), at)
        if not judged.excess_sigma[-1] >= 3.0:
            continue
        places = suspicious_points(judged, at - 30.0, at)
        raised += bool(places.size) and places[-1] == count - 1
    return raised


def false_alarms(seeds, cadences, years):
    raised = points = 0
    for seed in seeds:
        curve = simulate(
            seed, cadence_d=cadences[seed % 3], episodes=0, years=years, red_mag=(0.0, 0.02, 0.03)[seed % 3]
        ).arrays
        raised += alarms(curve)
        points += curve.bmjd_tdb.size
    print(f"\n{raised} false alarms in {points} observations")
    return raised / points


@pytest.mark.slow
def test_quiet_stars_with_red_noise_and_wild_points_raise_one_alarm_in_a_thousand_observations_at_most():
    assert false_alarms(range(200), (6.0, 12.0, 25.0), 4.0) <= 1e-3
    assert false_alarms(range(24), (2.0, 3.0, 5.0), 3.0) <= 1e-3


def test_a_rise_is_told_long_before_its_top():
    """The other half of the promise: what does happen raises an alarm while it rises."""
    told = []
    for seed in range(12):
        found = simulate(seed, cadence_d=6.0, noise_mag=(0.02, 0.04), episodes=1, years=8.0, bands=("K",))
        one, curve = found.episodes[0], found.arrays
        during = (curve.bmjd_tdb > one.onset) & (curve.bmjd_tdb < one.top)
        if during.sum() < 6:
            continue
        last = int(np.flatnonzero(during)[-1]) + 1
        judged = judge(record(), until(curve, last), one.top)
        told.append(suspicious_points(judged, one.onset, one.top).size > 0)
    assert len(told) >= 8
    assert np.mean(told) >= 0.8


def steady_with(*excess):
    """A quiet star at 7.5 mag, every tenth day up to day 60 900, and what is told of it after that."""
    times = np.arange(60_000.0, 60_901.0, 10.0)
    mags = 7.5 + 0.02 * np.sin(2.3 * np.arange(times.size))
    return light_curve([*times, *(t for t, _ in excess)], [*mags, *(m for _, m in excess)])


def suspected(curve, now=NOW, **fields):
    one = record(**fields)
    return suspicion_of(one, judge(one, curve, now), now - 400.0, now)


def test_a_suspicion_says_since_when_where_and_how_to_decide():
    found = suspected(steady_with((60_915.0, 7.0)))
    assert (found.since_bmjd_tdb, found.points, found.bands) == (60_915.0, 1, ("K",))
    # Quiet on 60 900, bright on 60 915: any date between, so 15 d over the square root of 12.
    assert found.confirm == "campaign episodes add 'Lantern 3' --onset \"2025-08-20±4.3 d\" --band K"
    assert found.reject == "campaign amend N --quality bad"
    more = suspected(steady_with((60_915.0, 7.0), (60_925.0, 6.8), (60_935.0, 6.6)))
    assert (more.points, more.latest_bmjd_tdb) == (3, 60_935.0)
    assert more.confirm == "campaign episodes find 'Lantern 3' --propose"


def test_a_bracket_is_as_uncertain_as_a_uniform_distribution():
    """Check row verif.onset_bracket: sigma is the width over the square root of 12, not half of it."""
    assert bracket(58_270.0, 58_455.0) == (58_362.5, pytest.approx(53.4048999000, abs=1e-9))


def test_it_stands_until_it_is_confirmed_or_rejected():
    curve = steady_with((60_915.0, 7.0), (60_925.0, 6.8), (60_935.0, 6.6), (60_960.0, 7.5), (60_970.0, 7.5))
    assert suspected(curve) is not None
    seen = episode(1, 60_912.0)
    assert suspected(curve, episodes=[seen]) is None
    elsewhere = replace(episode(1, 60_700.0, maximum=60_720.0), state="rejected")
    assert suspected(curve, episodes=[elsewhere]) is not None
    whole = episode(1, 60_912.0, maximum=60_935.0)
    assert suspected(curve, episodes=[replace(whole, state="rejected")]) is None
    assert suspected(curve, episodes=[replace(whole, state="proposed")]) is not None
    bad = replace(curve, quality=np.where(curve.mag < 7.3, "bad", "good"))
    assert suspected(bad) is None


def test_the_late_tail_of_a_confirmed_episode_is_no_new_onset():
    """Dust of an episode is seen for longer in some bands than anybody would have thought."""
    seen = episode(1, 60_100.0, maximum=60_120.0)
    times = np.arange(58_000.0, 60_000.0, 20.0)
    tail = [60_130.0, 60_560.0, 60_600.0, 60_700.0]
    curve = light_curve([*times, *tail, 60_950.0], [*[7.5] * times.size, 6.0, 7.1, 7.1, 7.5, 7.1])
    found = suspected(curve, episodes=[seen])
    # What was quiet in between, and is bright again, is not that tail.
    assert (found.since_bmjd_tdb, found.points) == (60_950.0, 1)
    assert suspected(until(curve, times.size + 3), now=60_600.0, episodes=[seen]) is None


def test_a_bright_point_that_the_next_night_contradicts_is_no_onset():
    assert suspected(steady_with((60_915.0, 7.0), (60_916.0, 7.5))) is None
    # A week later it may have been dust for all that one point says.
    assert suspected(steady_with((60_915.0, 7.0), (60_922.0, 7.5))) is not None


def test_a_system_with_wild_points_needs_a_greater_excess_of_a_lone_point():
    """Dust only adds light: a point far below the level shows what its instrument does at times."""
    assert suspected(steady_with((60_915.0, 7.1))) is not None
    assert suspected(steady_with((60_905.0, 7.95), (60_915.0, 7.1))) is None
    assert suspected(steady_with((60_905.0, 7.95), (60_915.0, 6.6))) is not None
    assert suspected(steady_with((60_905.0, 7.95), (60_915.0, 7.1), (60_920.0, 7.1))) is not None
