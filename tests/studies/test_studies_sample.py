"""The invented sample through the real forecaster: each story that it tells is what the user sees.

The truth is that of the sample's generator, which knows nothing of the forecaster.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from studies_examples import CLOCK, YEAR_D

from campaign.studies import watch
from campaign.studies.sample import load_sample

# Whose elements are optimistic, as their stories say.
OPTIMISTIC = {"Tinder 12", "Brazier 6"}
WIDE = stats.norm.isf(0.0005)  # sigma of the bounds of 99.9 %


@pytest.fixture(scope="module")
def sample():
    return load_sample()


def forecast(**options):
    campaign = watch.load_sample_campaign(options.pop("names", None))
    asked = {
        "now": CLOCK, "as_of": None, "start": None, "end": None, "within_d": 15 * YEAR_D, "events": (),
        "min_probability": 0.0, "draws": 20_000, "seed": None, "solutions": "adopted", **options,
    }  # fmt: skip
    return watch.upcoming(campaign, watch.ask(campaign, **asked))


@pytest.fixture(scope="module")
def result():
    return forecast()


def of(result, system, event):
    found = [e for e in result.events if e.system == system and e.event == event]
    assert found, (system, event)
    return found[0]


@pytest.mark.parametrize(
    ("case", "status", "said"),
    [
        ("late", "late", "quiet observations cover it"),
        ("unseen", "unseen", "no observation"),
        ("suspected", "suspected", "unexplained excess since"),
        ("open now", "open", "quiet"),
        ("under way", "under way", "observed"),
        ("phase lost", "phase lost", "phase is lost"),
    ],
)
def test_each_status_promised_by_a_story_is_forecast(sample, result, case, status, said):
    names = [truth.name for truth in sample.truth.systems if case in truth.cases]
    assert names
    for name in names:
        onset = of(result, name, "onset")
        assert onset.status == status
        assert any(said in note for note in onset.notes), onset.notes


def test_all_other_onsets_to_come_are_expected(sample, result):
    special = {
        "late",
        "unseen",
        "suspected",
        "open now",
        "under way",
        "phase lost",
        "period is a lower limit",
    }
    plain = {truth.name for truth in sample.truth.systems if not special & set(truth.cases)}
    found = {e.system: e.status for e in reversed(result.events) if e.event == "onset" and e.system in plain}
    assert len(found) >= 6
    assert set(found.values()) == {"expected"}


def test_the_sample_has_its_own_today(sample, result):
    assert result.as_of_bmjd_tdb == pytest.approx(sample.as_of_bmjd_tdb, abs=1e-9)
    assert any("invented" in text and result.as_of_utc[:10] in text for text in result.assumptions)


def test_a_retired_system_is_left_out_and_a_candidate_is_named_without_a_forecast(sample, result):
    states = {record.system.name: record.system.state for record in sample.records}
    retired = {name for name, state in states.items() if state == "retired"}
    candidates = {name for name, state in states.items() if state == "candidate"}
    assert retired and candidates
    named = {basis.system: basis for basis in result.bases}
    assert not retired & set(named)
    assert not retired & {e.system for e in result.events}
    assert set(named) == set(states) - retired
    for name in candidates:
        assert not named[name].has_forecast
        assert "no adopted solution" in named[name].text
        assert name not in {e.system for e in result.events}


def test_a_retired_system_asked_for_by_name_is_forecast(sample):
    (name,) = [r.system.name for r in sample.records if r.system.state == "retired"]
    assert {e.system for e in forecast(names=[name]).events} == {name}


def test_a_missing_error_leaves_a_median_without_an_interval_and_says_which(sample, result):
    (name,) = [truth.name for truth in sample.truth.systems if "missing error" in truth.cases]
    event = of(result, name, "maximum")
    q = event.bmjd_tdb
    assert q.median > result.as_of_bmjd_tdb
    assert (q.sigma_d, q.lo68, q.hi68, q.lo95, q.hi95) == (None,) * 5
    assert (event.utc.lo68, event.utc.hi95) == (None, None) and event.utc.median
    assert event.probability_in_window is None
    assert any("error unknown" in note and "period" in note and "epoch" in note for note in event.notes)


def test_a_period_that_is_only_a_limit_gives_no_date_but_a_probability_a_year(sample, result):
    (truth,) = [truth for truth in sample.truth.systems if "period is a lower limit" in truth.cases]
    (event,) = [e for e in result.events if e.system == truth.name]
    assert event.bmjd_tdb is None and event.utc is None and event.phase_lost
    assert 0.0 < event.probability_per_yr < 1.0 / 32.0  # not more often than the limit allows
    assert any("longer than 32 yr" in note for note in event.notes)


def truth_of(truth, event):
    cycle = truth.cycle(event.cycle)
    return getattr(cycle, f"{event.event}_bmjd_tdb")


def test_cycles_are_counted_as_in_the_truth_and_the_truth_lies_where_the_forecast_says(sample, result):
    """Every dated onset and periastron: the truth of its cycle within the 99.9 % range."""
    truths = {truth.name: truth for truth in sample.truth.systems}
    checked = 0
    for event in result.events:
        if event.event not in ("onset", "periastron") or event.bmjd_tdb is None:
            continue
        if event.bmjd_tdb.sigma_d is None or event.system in OPTIMISTIC:
            continue
        true = truth_of(truths[event.system], event)
        if true is None:  # a cycle that truly passes without dust
            assert event.probability < 1.0
            continue
        q = event.bmjd_tdb
        # The 95 % bounds, stretched to 99.9 %, follow the skewness of the distribution.
        stretch = WIDE / stats.norm.isf(0.025)
        low = q.median - stretch * (q.median - q.lo95)
        high = q.median + stretch * (q.hi95 - q.median)
        assert low <= true <= high, (event.system, event.event, event.cycle)
        checked += 1
    assert checked >= 25


def test_optimistic_elements_are_as_wrong_as_their_stories_say(sample, result):
    """The exception above hides nothing else: these two really miss, or their solutions disagree."""
    truths = {truth.name: truth for truth in sample.truth.systems}
    late = of(result, "Tinder 12", "onset")
    true = truth_of(truths["Tinder 12"], late)
    assert true > late.conditioning.before.hi95
    # What was quiet since then has put that right.
    assert late.bmjd_tdb.lo95 < true < late.bmjd_tdb.hi95
    assert abs(of(result, "Brazier 6", "onset").disagreement_sigma) > 2.5


def test_solutions_side_by_side_show_their_disagreement(sample):
    result = forecast(names=["Brazier 6"], solutions="each", events=("periastron",))
    first = [e for e in result.events if e.cycle == 1]
    assert len(first) == 3  # the mixture and each of the two
    labels = {e.solution for e in first}
    assert {"dust dates", "velocities"} < labels
    single = {e.solution: e for e in first}
    one, other = single["dust dates"].bmjd_tdb, single["velocities"].bmjd_tdb
    by_hand = (other.median - one.median) / np.hypot(one.sigma_d, other.sigma_d)
    stated = [e.disagreement_sigma for e in first if e.disagreement_sigma is not None]
    assert any(abs(s) == pytest.approx(abs(by_hand), rel=0.05) for s in stated)


def test_a_grazing_system_tells_how_likely_an_episode_is_at_all(sample, result):
    (name,) = [
        t.name for t in sample.truth.systems if "critical separation near periastron distance" in t.cases
    ]
    onset = of(result, name, "onset")
    assert 0.15 < onset.probability < 0.85
    assert onset.probability_in_window == pytest.approx(onset.probability, abs=0.01)


def test_dates_of_fifteen_years_come_sorted_and_dateless_ones_last(result):
    medians = [e.bmjd_tdb.median if e.bmjd_tdb else np.inf for e in result.events]
    assert medians == sorted(medians)
    assert np.isfinite(medians[0]) and not np.isfinite(medians[-1])
