"""What quiet observations do to a forecast, and what they do not (DEVELOPERS.md: Quiet observations).

Coverage, the transform's mean and variance and the scores are held against their exact values for a true
forecast; a truncation at the last quiet point is shown to be wrong where rises are slow.
"""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pytest
from conditioning_cases import crps, transform, wait
from scipy import stats
from studies_examples import (
    dates,
    episode,
    find,
    lag_rule,
    light_curve,
    quiet_curve,
    record,
    separation_rule,
    solution,
    upcoming,
)

from campaign.model.measured import Measured
from campaign.output.upcoming_document import upcoming_json
from campaign.studies import watch
from campaign.studies.preparing import Question

# Onset of cycle 1 at 61 000 +- 60 d.
ONSET, SIGMA = 61_000.0, 60.0
NOW = 61_040.0


def system_with(episodes=(), **fields):
    orbit = solution(3_000.0, 58_040.0, period_error=45.0, epoch_error=39.7, **fields)
    return record(orbit, rule=lag_rule(-40.0, 60.0, 200.0), episodes=episodes)


def told(curve, now=NOW, one=None, **question):
    return upcoming(
        one or system_with(), photometry={1: curve} if curve is not None else {}, now=now, **question
    )


def test_quiet_nights_move_the_onset_behind_them_and_maximum_and_end_with_it():
    before, after = told(None, start=60_000.0), told(quiet_curve(58_500.0, NOW, 10.0), start=60_000.0)
    first, then = (find(result, "onset", 1) for result in (before, after))
    assert dates(first)[:2] == pytest.approx((ONSET, SIGMA), abs=0.1)
    assert then.conditioning.before == first.bmjd_tdb
    # Truncated there, the median would be at the normal law's; a rise hides for a while, so it is earlier.
    cut = (NOW - 5.0 - ONSET) / SIGMA
    truncated = ONSET + SIGMA * stats.truncnorm.median(cut, np.inf)
    assert ONSET + 30.0 < then.bmjd_tdb.median < truncated
    assert then.bmjd_tdb.sigma_d < first.bmjd_tdb.sigma_d
    for event in ("maximum", "end"):
        moved = find(after, event, 1).bmjd_tdb.median - find(before, event, 1).bmjd_tdb.median
        assert moved == pytest.approx(then.bmjd_tdb.median - ONSET, abs=3.0)
    # Elements and other cycles stay what they are.
    assert find(after, "periastron", 1).bmjd_tdb == find(before, "periastron", 1).bmjd_tdb
    assert find(after, "onset", 2).bmjd_tdb == find(before, "onset", 2).bmjd_tdb


def test_the_later_the_last_quiet_night_the_later_the_onset():
    medians = [
        find(told(quiet_curve(58_500.0, now, 10.0), now), "onset", 1).bmjd_tdb.median
        for now in (60_850.0, 60_960.0, 61_000.0, 61_050.0, 61_100.0)
    ]
    assert medians[0] == pytest.approx(ONSET, abs=3.0)
    assert np.all(np.diff(medians) > 0.0)


def test_nothing_is_moved_by_points_that_say_nothing():
    shallow = light_curve(np.arange(58_500.0, NOW, 10.0).tolist(), [4.0] * 254, limit_side=-1)
    for curve in (None, quiet_curve(58_500.0, 60_700.0, 10.0), shallow):
        event = find(told(curve), "onset", 1)
        assert event.conditioning is None
        assert dates(event)[:2] == pytest.approx((ONSET, SIGMA), abs=0.1)


def test_status_is_that_of_the_interval_before_and_the_date_is_the_one_after():
    now = ONSET + 2.4 * SIGMA
    late = find(told(quiet_curve(58_500.0, now, 10.0), now), "onset", 1)
    assert late.status == "late"
    assert late.conditioning.before.hi95 < now < late.bmjd_tdb.hi95
    unseen = find(told(quiet_curve(58_500.0, ONSET - 20.0, 10.0), now), "onset", 1)
    assert unseen.status == "unseen"


def test_beyond_three_sigma_the_mixture_is_stated():
    now = ONSET + 3.6 * SIGMA
    event = find(told(quiet_curve(58_500.0, now, 10.0), now), "onset", 1)
    assert event.conditioning.inflated_share > 0.5
    (note,) = [n for n in event.notes if "mixture" in n]
    assert note.startswith("elements and data disagree") and "three times as large" in note
    # The tail of the normal law would leave it a few days.
    assert event.bmjd_tdb.hi95 - event.bmjd_tdb.median > 0.8 * SIGMA


def test_what_is_excluded_altogether_keeps_the_date_of_the_elements_and_says_so():
    now = ONSET + 25.0 * SIGMA
    event = find(told(quiet_curve(58_500.0, now, 10.0), now), "onset", 1)
    assert event.status == "late"
    assert not event.conditioning.moved
    assert event.bmjd_tdb == event.conditioning.before
    assert any("leave nothing of this forecast" in note for note in event.notes)


def test_a_cycle_that_may_have_no_episode_becomes_less_probable():
    orbit = solution(
        3_000.0, 58_000.0, period_error=20.0, epoch_error=20.0, eccentricity=Measured(0.6, 0.02, 0.02),
        a_au=Measured(15.0, 0.5, 0.5),
    )  # fmt: skip
    one = record(orbit, rule=separation_rule(Measured(6.2, 0.3, 0.3)))
    before = find(told(None, 61_000.0, one, start=60_000.0), "onset", 1)
    assert 0.1 < before.probability < 0.95
    after = find(told(quiet_curve(58_500.0, 61_000.0, 10.0), 61_000.0, one, start=60_000.0), "onset", 1)
    assert after.probability < before.probability - 0.05


def test_a_suspected_onset_counts_only_what_was_quiet_before():
    quiet = quiet_curve(58_500.0, NOW - 40.0, 10.0)
    times, mags = [*quiet.bmjd_tdb, NOW - 20.0, NOW - 1.0], [*quiet.mag, 7.0, 6.8]
    event = find(told(light_curve(times, mags)), "onset", 1)
    assert event.status == "suspected"
    assert event.conditioning.last_quiet_bmjd_tdb < NOW - 40.0
    alone = find(told(quiet), "onset", 1)
    assert event.bmjd_tdb.median == pytest.approx(alone.bmjd_tdb.median, abs=2.0)


def test_an_unknown_error_is_not_made_known_by_quiet_nights():
    one = record(solution(3_000.0, 58_040.0, period_error=None), rule=lag_rule())
    event = find(told(quiet_curve(58_500.0, NOW, 10.0), one=one, start=60_900.0), "onset", 1)
    assert event.conditioning is None and event.bmjd_tdb.sigma_d is None


def test_a_confirmed_onset_is_no_longer_conditioned():
    result = told(quiet_curve(58_500.0, 60_990.0, 10.0), one=system_with([episode(1, 61_000.0)]))
    assert all(event.conditioning is None for event in result.events if event.cycle == 1)


def test_the_forecast_does_not_depend_on_what_else_is_asked_for():
    curve = quiet_curve(58_500.0, NOW, 10.0)
    alone = find(told(curve, events=("onset",)), "onset", 1)
    assert alone == replace(find(told(curve), "onset", 1))
    other = record(solution(2_000.0, 58_000.0), rule=lag_rule(), number=2, name="Ember 4")
    both = upcoming(other, system_with(), photometry={1: curve}, now=NOW)
    assert find(both, "onset", 1, system="Lantern 3").bmjd_tdb.median == pytest.approx(
        alone.bmjd_tdb.median, abs=0.05
    )


def test_what_is_observed_later_does_not_count_before():
    whole, until = quiet_curve(58_500.0, 62_000.0, 10.0), quiet_curve(58_500.0, NOW + 1.0, 10.0)
    first, second = (find(told(curve), "onset", 1) for curve in (whole, until))
    assert first.bmjd_tdb == second.bmjd_tdb
    assert first.conditioning.last_quiet_bmjd_tdb == NOW


def test_the_story_of_a_system_names_the_nights_that_did_it():
    """Tinder 12 of the invented sample stayed quiet past its interval: each night moved the onset later."""
    campaign = watch.load_sample_campaign(["Tinder 12"])
    question = Question(campaign.own_as_of, campaign.own_as_of, campaign.own_as_of + 3_000.0)
    story = watch.explain(campaign, question)
    onset = next(each for each in story.events if each.forecast.event == "onset")
    told, nights = onset.forecast.conditioning, onset.moved_by
    assert 1 <= len(nights) <= 5
    assert [night.bmjd_tdb for night in nights] == sorted(night.bmjd_tdb for night in nights)
    assert all(night.shift_d > 1.0 and night.bands for night in nights)
    assert all(told.before.lo95 < night.bmjd_tdb <= told.last_quiet_bmjd_tdb for night in nights)
    # All nights together moved it from where it was to where it is; these few most of the way.
    whole = onset.forecast.bmjd_tdb.median - told.before.median
    assert 0.5 * whole < sum(night.shift_d for night in nights) <= whole + 1.0
    heard = json.loads(upcoming_json(story.upcoming, story))["data"]
    event = next(each for each in heard["events"] if each["event"] == "onset")
    assert event["conditioning"]["before"]["median"] == told.before.median
    assert event["conditioning"]["before_utc"]["median"].startswith("2026-10-03")
    step = next(each for each in heard["explanation"]["events"] if each["event"] == "onset")
    assert len(step["moved_by"]) == len(nights)


# ------------------------------------------------------------------------- many campaigns


@pytest.fixture(scope="module")
def campaigns():
    """2,000 campaigns on a random day each; those whose onset is suspected by then have no say."""
    return [case for seed in range(2_000) if (case := wait(seed)) is not None]


@pytest.mark.slow
def test_conditioned_forecasts_are_as_often_right_as_they_say(campaigns):
    """One transform a campaign: shares at 68 and 95 %, mean 1/2, variance 1/12, each within 3 sigma."""
    at = np.array([transform(case.after, case.truth) for case in campaigns])
    count = at.size
    assert count > 1_000
    z = {
        "mean": (at.mean() - 0.5) / np.sqrt(1.0 / 12.0 / count),
        "variance": (np.mean((at - 0.5) ** 2) - 1.0 / 12.0) / np.sqrt(1.0 / 180.0 / count),
    }
    for share in (0.68, 0.95):
        inside = np.mean(np.abs(at - 0.5) < share / 2.0)
        z[f"{share}"] = (inside - share) / np.sqrt(share * (1.0 - share) / count)
    print(f"\n{count} campaigns: " + ", ".join(f"{name} {value:+.2f}" for name, value in z.items()))
    assert all(abs(value) < 3.0 for value in z.values()), z
    # Without quiet observations the same forecasts come too early: the test can fail.
    before = np.array([transform(case.before, case.truth) for case in campaigns])
    assert (before.mean() - 0.5) / np.sqrt(1.0 / 12.0 / count) > 5.0


@pytest.mark.slow
def test_conditioned_forecasts_score_better(campaigns):
    """CRPS no worse on the whole; 20 % below where it was quiet past the median and a rise could not hide."""
    after = np.array([crps(case.after, case.truth) for case in campaigns])
    before = np.array([crps(case.before, case.truth) for case in campaigns])
    past = np.array([case.last_quiet - 40.0 > np.median(case.before) for case in campaigns])
    print(f"\nCRPS {after.mean():.1f} d for {before.mean():.1f} d; past the median {past.sum()} campaigns, "
          f"{after[past].mean():.1f} d for {before[past].mean():.1f} d")  # fmt: skip
    assert after.mean() <= before.mean()
    assert past.sum() > 120
    assert after[past].mean() <= 0.8 * before[past].mean()
    moved = np.array([not np.array_equal(case.after, case.before) for case in campaigns])
    for part in (past, moved & ~past):
        assert after[part].mean() <= before[part].mean()


@pytest.mark.slow
def test_truncation_at_the_last_quiet_night_is_wrong_where_rises_are_slow():
    """Slow rises hide for months: a forecast cut off at the last quiet night comes too late, too surely."""
    found = [
        case
        for seed in range(400)
        if (case := wait(seed, rise=(200.0, 400.0), sigma=(80.0, 250.0))) is not None
        and case.last_quiet > np.quantile(case.before, 0.05)
    ]
    ours, naive, scores = [], [], []
    for case in found:
        fine = np.interp(np.linspace(0.0, 1.0, 20_001), np.linspace(0.0, 1.0, case.before.size), case.before)
        left = fine[fine > case.last_quiet]
        if left.size < 50:
            continue
        shares = (np.arange(case.after.size) + 0.5) / case.after.size
        cut = np.quantile(left, shares)
        ours.append(transform(case.after, case.truth))
        naive.append(transform(cut, case.truth))
        scores.append((crps(case.after, case.truth), crps(cut, case.truth)))
    count = len(ours)
    mean_ours, mean_naive = np.mean(scores, axis=0)
    z_ours, z_naive = ((np.mean(at) - 0.5) * np.sqrt(12.0 * count) for at in (ours, naive))
    print(f"\n{count} campaigns: CRPS {mean_ours:.1f} d, truncated {mean_naive:.1f} d; mean of the transform "
          f"{z_ours:+.1f} and {z_naive:+.1f} sigma")  # fmt: skip
    assert count > 60
    assert mean_naive > mean_ours
    assert abs(z_ours) < 3.0 < -z_naive
