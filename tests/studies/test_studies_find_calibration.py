"""Are the intervals of found episodes true? Simulated campaigns with known truth, by class of case.

The truth is drawn by rules that are not the fit's own (tests/studies/find_simulations.py): rises of any power
and pace, exponential production decline, sources with offsets, seasons, wild points, flicker. Nominal shares:
68 % and 95 % equal-tailed (definition); right means within three binomial standard deviations of them.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import pytest
from find_simulations import simulate, true_excess

from campaign.model.records import SystemRecord
from campaign.model.systems import System
from campaign.studies.find_episodes import find_in

RECORD = SystemRecord(System(1, "Vane 6", 40.0, -20.0))
FIRST_SEED = 50_000
CADENCE_D = {"dense": 8.0, "sparse": 35.0}


class Case(NamedTuple):
    """One found episode beside its truth: class, and for each date (truth, quantiles)."""

    cadence: str
    rise: str
    dates: dict


def cases_of(seed: int) -> tuple[list[Case], int, int]:
    """Matched episodes of one campaign, how many true ones it has, and how many found ones are of none."""
    cadence = ("dense", "sparse")[seed % 2]
    sim = simulate(seed, cadence_d=CADENCE_D[cadence], episodes=2, years=8.0)
    found = [one for one in find_in(RECORD, sim.arrays).episodes if one.kind == "episode"]
    cases, matched = [], set()
    for truth in sim.episodes:
        near = [
            (abs(one.first_bright_bmjd_tdb - truth.top), place)
            for place, one in enumerate(found)
            # First seen or seen again in the tail: four decay times later nothing is left in any band.
            if truth.onset - 60.0 < one.first_bright_bmjd_tdb < truth.end + 4.0 * truth.decay_d
        ]
        matched |= {place for _, place in near}
        if not near or (one := found[min(near)[1]]).onset is None:
            continue
        dates = {"onset": (truth.onset, one.onset.bmjd_tdb)}
        for maximum in one.maxima:
            later = 0.0 if maximum.date.band == "K" else 12.0
            if maximum.reached:
                dates[f"maximum {maximum.date.band}"] = (truth.top + later, maximum.date.bmjd_tdb)
        band = one.maxima[0].date.band
        later = 0.0 if band == "K" else 12.0
        if one.end is not None:
            dates["end"] = (truth.end + later, one.end.bmjd_tdb)
            grid = np.arange(truth.top + later, truth.end + 1200.0, 0.5)
            excess = true_excess(truth, grid, band)
            dates["half"] = (grid[np.argmax(excess < 0.5 * excess[0])], one.half.bmjd_tdb)
        cases.append(Case(cadence, one.rise, dates))
    return cases, len(sim.episodes), len(found) - len(matched)


@pytest.fixture(scope="module")
def campaigns():
    """1,000 campaigns of two episodes each: what about a minute of one core allows."""
    cases, true, strangers = [], 0, 0
    for number in range(1_000):
        some, count, more = cases_of(FIRST_SEED + number)
        cases += some
        true, strangers = true + count, strangers + more
    return cases, true, strangers


def shares(cases, date):
    """Number, how many sigma the 68 % and 95 % shares are from nominal, and the mean offset in errors."""
    pairs = [case.dates[date] for case in cases if date in case.dates]
    truth = np.array([pair[0] for pair in pairs])
    q = np.array([[d.median, d.lo68, d.hi68, d.lo95, d.hi95] for _, d in pairs]).T
    count = truth.size
    z68 = (np.mean((q[1] <= truth) & (truth <= q[2])) - 0.68) / np.sqrt(0.68 * 0.32 / count)
    z95 = (np.mean((q[3] <= truth) & (truth <= q[4])) - 0.95) / np.sqrt(0.95 * 0.05 / count)
    offset = float(np.mean((q[0] - truth) / (0.5 * (q[2] - q[1]))))
    return count, float(z68), float(z95), offset


@pytest.mark.slow
@pytest.mark.parametrize("cadence", ["dense", "sparse"])
def test_onset_intervals_are_true_where_the_rise_is_covered(campaigns, cadence):
    cases = [case for case in campaigns[0] if case.cadence == cadence and case.rise == "covered"]
    count, z68, z95, offset = shares(cases, "onset")
    print(f"{cadence}, rise covered: n {count}, 68 % z {z68:+.1f}, 95 % z {z95:+.1f}, offset {offset:+.2f}")
    assert count > 300
    assert abs(z68) < 3.0
    assert abs(z95) < 3.0


@pytest.mark.slow
def test_the_mean_offset_of_onsets_is_small_where_the_rise_is_covered(campaigns):
    cases = [case for case in campaigns[0] if case.rise == "covered"]
    count, _, _, offset = shares(cases, "onset")
    print(f"rise covered: n {count}, offset {offset:+.3f}")
    assert abs(offset) < 0.2


@pytest.mark.slow
@pytest.mark.parametrize("cadence", ["dense", "sparse"])
def test_onset_brackets_are_never_too_narrow_where_the_rise_is_in_a_gap(campaigns, cadence):
    cases = [case for case in campaigns[0] if case.cadence == cadence and case.rise == "not covered"]
    count, z68, z95, offset = shares(cases, "onset")
    print(f"{cadence}, rise in a gap: n {count}, 68 % z {z68:+.1f}, 95 % z {z95:+.1f}, offset {offset:+.2f}")
    assert count > 100
    assert z68 > -3.0
    assert z95 > -3.0


@pytest.mark.slow
@pytest.mark.parametrize("date", ["maximum K", "maximum L", "end", "half"])
def test_intervals_of_maximum_end_and_half_decay_are_never_too_narrow(campaigns, date):
    count, z68, z95, offset = shares(campaigns[0], date)
    print(f"{date}: n {count}, 68 % z {z68:+.1f}, 95 % z {z95:+.1f}, offset {offset:+.2f}")
    assert count > 1_000
    assert z68 > -3.0
    assert z95 > -3.0


@pytest.mark.slow
def test_nearly_every_true_episode_is_found_and_nearly_every_found_one_is_true(campaigns):
    cases, true, strangers = campaigns
    print(f"{true} true episodes, {len(cases)} found with an onset, {strangers} found that are of none")
    # Some lie in the gap behind the Sun whole, or began before the first point.
    assert len(cases) > 0.9 * true
    assert strangers <= 0.01 * true


NOISE = {
    "white": {},
    "red": {"red_mag": 0.02},
    "red and wild": {"red_mag": 0.03, "wild_share": 0.03},
    "offsets and wild": {"offset_mag": 0.1, "wild_share": 0.02},
}


def false_episodes(kind, campaigns, first_seed):
    """Campaigns of fifteen years without any episode, in which one is found all the same."""
    wrong = 0
    for number in range(campaigns):
        cadence = CADENCE_D[("dense", "sparse")[number % 2]]
        sim = simulate(first_seed + number, cadence_d=cadence, episodes=0, years=15.0, **NOISE[kind])
        wrong += bool(find_in(RECORD, sim.arrays).episodes)
    return wrong


@pytest.mark.parametrize("kind", NOISE)
def test_noise_has_no_episode(kind):
    assert false_episodes(kind, 40, 80_000) == 0


@pytest.mark.slow
@pytest.mark.parametrize("kind", NOISE)
def test_at_most_one_campaign_of_noise_in_a_hundred_has_a_false_episode(kind):
    wrong = false_episodes(kind, 600, 90_000)
    print(f"{kind}: {wrong} of 600")
    assert wrong <= 6
