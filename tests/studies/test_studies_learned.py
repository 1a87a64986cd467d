"""Forecasts from dated episodes, with and without an orbit. Oracles: scipy.stats, least squares by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy import stats
from studies_examples import dates, episode, find, lag_rule, record, solution, upcoming

from campaign.model.measured import Limit, Measured
from campaign.model.systems import DustRule

LEARNED = DustRule(1, 1, "learned")
PERIOD = 3_000.0
SHARES = np.array([0.5, 0.16, 0.84, 0.025, 0.975])


def burst(count, scatter=25.0, first=40_000.0, seed=1, **fields):
    rng = np.random.default_rng(seed)
    onsets = first + PERIOD * np.arange(count) + scatter * rng.standard_normal(count)
    return [
        episode(
            k,
            float(t),
            error_d=fields.get("error_d", 0.1),
            maximum=float(t) + 100.0 if fields.get("whole") else None,
            end=float(t) + 250.0 if fields.get("whole") else None,
        )
        for k, t in enumerate(onsets)
    ], onsets


def test_without_an_orbit_a_line_through_the_onsets_is_carried_on():
    seen, onsets = burst(7)
    found = find(upcoming(record(rule=LEARNED, episodes=seen)), "onset", 7)
    fit = stats.linregress(np.arange(7), onsets)
    residual = onsets - fit.intercept - fit.slope * np.arange(7)
    width = np.sqrt(np.sum(residual**2) / 5) * np.sqrt(1 + 1 / 7 + (7 - 3.0) ** 2 / 28.0)
    expected = fit.intercept + 7 * fit.slope + width * stats.t.ppf(SHARES, 5)
    median, _, low68, high68, low95, high95 = dates(found)
    assert (median, low68, high68, low95, high95) == pytest.approx(expected, abs=0.06 * width)
    assert (found.basis, found.solution, found.rule) == ("episodes", None, "learned")


def test_with_an_orbit_the_period_is_that_of_the_orbit():
    seen, onsets = burst(5)
    orbit = solution(PERIOD, 40_070.0, period_error=0.0, epoch_error=0.0)
    found = find(upcoming(record(orbit, rule=LEARNED, episodes=seen)), "onset", 7)
    lags = onsets - PERIOD * np.arange(5)
    width = lags.std(ddof=1) * np.sqrt(1.2)
    expected = lags.mean() + 7 * PERIOD + width * stats.t.ppf(SHARES, 4)
    median, _, low68, high68, low95, high95 = dates(found)
    assert (median, low68, high68, low95, high95) == pytest.approx(expected, abs=0.06 * width)
    assert found.solution == "orbit" and found.basis == "episodes"
    assert find(upcoming(record(orbit, rule=LEARNED, episodes=seen)), "periastron", 7).basis == "orbit"


def test_one_dated_onset_and_an_orbit_are_enough_and_the_prior_is_said():
    orbit = solution(PERIOD, 58_000.0, period_error=4.0)
    result = upcoming(record(orbit, rule=LEARNED, episodes=[episode(0, 57_900.0, error_d=2.0)]))
    found = find(result, "onset", 1)
    assert found.bmjd_tdb.median == pytest.approx(60_900.0, abs=3.0)
    assert any("stated prior" in text and "1 %" in text for text in result.assumptions)
    # Stated prior: scatter of 30 d within a factor of e, twice (the dated onset and the coming one).
    assert 40.0 < 0.5 * (found.bmjd_tdb.hi68 - found.bmjd_tdb.lo68) < 60.0


def test_many_well_dated_onsets_need_no_prior():
    seen, _ = burst(7)
    result = upcoming(record(rule=LEARNED, episodes=seen))
    assert not any("prior" in text for text in result.assumptions)


def test_two_episodes_without_an_orbit_are_enough_and_one_is_not():
    seen, _ = burst(2, first=55_000.0)
    result = upcoming(record(rule=LEARNED, episodes=seen))
    assert find(result, "onset", 3).bmjd_tdb.median == pytest.approx(64_000.0, abs=150.0)
    result = upcoming(record(rule=LEARNED, episodes=seen[:1]))
    assert result.events == ()
    (basis,) = result.bases
    assert not basis.has_forecast and "one episode only, so no period" in basis.text


def test_without_rule_and_orbit_the_episodes_still_teach():
    seen, _ = burst(4, whole=True, first=49_000.0)
    result = upcoming(record(episodes=seen))
    assert {e.event for e in result.events} == {"onset", "maximum", "end"}
    assert all(e.rule == "learned" and e.basis == "episodes" for e in result.events)
    assert "4 dated episodes" in result.bases[0].text
    assert "no dust rule" not in result.bases[0].text


def test_an_orbit_with_a_rule_of_its_own_does_not_learn():
    seen, _ = burst(4, first=49_000.0)
    orbit = solution(PERIOD, 58_000.0, epoch_cycle=3)
    onset = find(upcoming(record(orbit, rule=lag_rule(-40.0), episodes=seen)), "onset", 5)
    assert onset.rule == "lag" and onset.bmjd_tdb.median == pytest.approx(63_960.0)


def test_a_period_that_is_only_a_limit_gives_way_to_the_episodes():
    seen, _ = burst(4, first=49_000.0)
    limit = solution(Limit(2_000.0, "above"), 49_000.0, epoch_marks="onset")
    result = upcoming(record(limit, rule=LEARNED, episodes=seen))
    assert {e.event for e in result.events} == {"onset"}
    assert find(result, "onset", 4).bmjd_tdb.median == pytest.approx(61_000.0, abs=150.0)


def test_missed_cycles_leave_gaps_in_the_count_not_in_the_line():
    seen, _ = burst(6, scatter=0.5)
    with_gap = [e for e in seen if e.cycle != 3]
    whole, gapped = (
        find(upcoming(record(rule=LEARNED, episodes=e)), "onset", 7).bmjd_tdb for e in (seen, with_gap)
    )
    assert whole.median == pytest.approx(61_000.0, abs=3.0)
    assert gapped.median == pytest.approx(whole.median, abs=3.0)


def test_dates_without_an_error_get_a_stated_one():
    seen, _ = burst(5, scatter=0.01, error_d=None)
    result = upcoming(record(rule=LEARNED, episodes=seen))
    assert any("given 0.5 % of the period" in part for part in result.bases[0].text.split("; "))
    # Taken as exact, dates that agree to minutes would give an interval of minutes.
    found = find(result, "onset", 7)
    assert found.bmjd_tdb.sigma_d > 5.0


def test_only_confirmed_episodes_teach():
    seen, _ = burst(5)
    rejected = [*seen, replace(episode(5, 58_000.0), state="rejected")]
    first, second = (
        dates(find(upcoming(record(rule=LEARNED, episodes=e)), "onset", 7)) for e in (seen, rejected)
    )
    assert first == second


def test_dates_after_the_question_do_not_teach():
    seen, _ = burst(7)
    before = upcoming(record(rule=LEARNED, episodes=seen), now=52_500.0, years=12)
    alone = upcoming(record(rule=LEARNED, episodes=seen[:5]), now=52_500.0, years=12)
    assert [dates(e) for e in before.events] == [dates(e) for e in alone.events]


@pytest.mark.parametrize("ahead", [7, 9])
def test_onset_maximum_and_end_each_rest_on_their_own_dates(ahead):
    seen, onsets = burst(6, whole=True)
    result = upcoming(record(rule=LEARNED, episodes=seen), years=25)
    onset = find(result, "onset", ahead).bmjd_tdb
    for event, after in (("maximum", 100.0), ("end", 250.0)):
        assert find(result, event, ahead).bmjd_tdb.median - onset.median == pytest.approx(after, abs=1.0)
    without_ends = [replace(e, end=None) for e in seen]
    result = upcoming(record(rule=LEARNED, episodes=without_ends), years=25)
    assert {e.event for e in result.events} == {"onset", "maximum"}
    assert onsets.size == 6


def test_a_phase_lost_by_a_poor_recurrence_is_said():
    # Two onsets 3000 d apart, 27 cycles ago: the line cannot be carried so far.
    seen = [episode(0, 20_000.0, error_d=60.0), episode(1, 23_000.0, error_d=60.0)]
    found = find(upcoming(record(rule=LEARNED, episodes=seen)), "onset")
    assert found.phase_lost and found.bmjd_tdb is None


def test_a_period_without_an_error_is_not_a_prior():
    seen, _ = burst(4, first=49_000.0)
    orbit = replace(solution(PERIOD, 58_000.0), period_d=Measured(3_300.0))
    found = find(upcoming(record(orbit, rule=LEARNED, episodes=seen)), "onset")
    # A multiple of 3000 d after the dated ones, not of the 3300 d that nobody vouches for.
    assert (found.bmjd_tdb.median - 49_000.0 + 150.0) % PERIOD < 300.0
