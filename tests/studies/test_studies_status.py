"""Every status of an onset, each reached by a smallest invented case (DEVELOPERS.md: Status)."""

from __future__ import annotations

import re
from dataclasses import replace

import numpy as np
import pytest
from scipy import stats
from studies_examples import (
    dates,
    episode,
    exact,
    find,
    lag_rule,
    light_curve,
    quiet_curve,
    record,
    separation_rule,
    solution,
    upcoming,
)

from campaign.model.forecasts import STATUSES
from campaign.model.measured import Measured
from campaign.model.systems import DustRule

# Onset of cycle 1 at 61 000 +- 25 d, so its 95 % interval runs from 60 951 to 61 049; then maximum and end.
ONSET, SIGMA, LOW95, HIGH95 = 61_000.0, 25.0, 60_951.0, 61_049.0
PERIOD = 3_000.0


def orbit(**fields):
    return solution(PERIOD, 58_040.0, period_error=15.0, epoch_error=20.0, **fields)


def system_with(episodes=(), rule=None, **fields):
    return record(orbit(**fields), rule=rule or lag_rule(-40.0, 60.0, 200.0), episodes=episodes)


def onset_at(now, photometry=None, one=None, **question):
    curves = {} if photometry is None else {1: photometry}
    return find(upcoming(one or system_with(), photometry=curves, now=now, **question), "onset", 1)


def curve_with_excess(start, stop, excess, step=15.0):
    """Quiet photometry at 7.5 mag except for the (time, mag) pairs of ``excess``."""
    quiet = quiet_curve(start, stop, step)
    times = np.concatenate([quiet.bmjd_tdb, [t for t, _ in excess]])
    mags = np.concatenate([quiet.mag, [m for _, m in excess]])
    order = np.argsort(times)
    return light_curve(times[order].tolist(), mags[order].tolist())


def test_the_case_has_the_interval_that_it_says():
    median, sigma, _, _, low95, high95 = dates(onset_at(60_500.0))
    assert (median, sigma) == pytest.approx((ONSET, SIGMA))
    assert (low95, high95) == pytest.approx((LOW95, HIGH95), abs=0.01)


def test_expected_before_the_interval_opens():
    assert onset_at(LOW95 - 1.0).status == "expected"
    assert onset_at(LOW95 - 1.0, quiet_curve(59_000.0, LOW95 - 1.0)).status == "expected"


def test_open_inside_the_interval():
    event = onset_at(LOW95 + 1.0)
    assert event.status == "open"
    assert "no quiet observation" in event.notes[0]
    event = onset_at(HIGH95 - 1.0, quiet_curve(59_000.0, HIGH95 - 9.0, 10.0))
    assert event.status == "open"
    assert event.notes[0].startswith("quiet") and "no onset then" in event.notes[0]


def test_late_once_the_interval_has_passed_and_quiet_observations_cover_it():
    now = HIGH95 + 30.0
    event = onset_at(now, quiet_curve(59_000.0, now, 20.0))
    assert event.status == "late"
    assert "disagree" in event.notes[0]
    # What should follow is late too, and the dates are not moved by a story.
    result = upcoming(system_with(), photometry={1: quiet_curve(59_000.0, now, 20.0)}, now=now, years=10)
    assert find(result, "maximum", 1).status == "late"
    assert find(result, "onset", 2).status == "expected"


def test_a_late_onset_stays_listed_beside_the_next_one():
    now = HIGH95 + 1_200.0
    result = upcoming(system_with(), photometry={1: quiet_curve(59_000.0, now, 20.0)}, now=now, years=8)
    onsets = {e.cycle: e.status for e in result.events if e.event == "onset"}
    assert onsets == {1: "late", 2: "expected"}


def test_unseen_when_nobody_looked():
    assert onset_at(HIGH95 + 30.0).status == "unseen"
    assert onset_at(HIGH95 + 30.0, quiet_curve(59_000.0, LOW95 - 20.0)).status == "unseen"
    assert onset_at(HIGH95 + 30.0).notes == ("no observation would have shown it",)


def test_unseen_when_the_looks_were_too_few_and_the_share_is_told():
    # One point just inside: it covers what would have begun before it, half of the interval.
    times = [*np.arange(59_000.0, 60_000.0, 30.0), ONSET]
    event = onset_at(HIGH95 + 60.0, light_curve(times, [7.5] * len(times)))
    assert event.status == "unseen"
    (share,) = re.findall(r"observations cover only (\d+)% of the onset's interval", event.notes[0])
    assert int(share) == pytest.approx(50, abs=1)


def test_an_unseen_cycle_leaves_the_list_after_a_year():
    soon = upcoming(system_with(), now=HIGH95 + 300.0, years=10)
    later = upcoming(system_with(), now=HIGH95 + 400.0, years=10)
    assert [e.cycle for e in soon.events if e.event == "onset"] == [1, 2]
    assert [e.cycle for e in later.events if e.event == "onset"] == [2]


@pytest.mark.parametrize(
    "excess",
    [[(ONSET - 3.0, 7.2)], [(ONSET - 20.0, 7.39), (ONSET - 3.0, 7.39)]],
    ids=["one point at more than 5 sigma", "two consecutive points at more than 3 sigma within 30 d"],
)
def test_suspected_by_an_unexplained_excess(excess):
    event = onset_at(ONSET, curve_with_excess(59_000.0, ONSET - 25.0, excess))
    assert event.status == "suspected"
    assert "unexplained excess since 20" in event.notes[0]


@pytest.mark.parametrize(
    "excess",
    [[(ONSET - 3.0, 7.39)], [(ONSET - 40.0, 7.39), (ONSET - 3.0, 7.39)], [(ONSET - 3.0, 7.8)]],
    ids=["one point at 4 sigma", "two at 4 sigma, more than 30 d apart", "fainter than the level"],
)
def test_not_suspected_by_less(excess):
    assert onset_at(ONSET, curve_with_excess(59_000.0, ONSET - 45.0, excess)).status == "open"


def test_an_excess_of_a_confirmed_episode_is_explained():
    """The bright points of cycle 0's own episode say nothing of cycle 1."""
    bright = [(58_010.0, 6.0), (58_060.0, 6.2), (58_150.0, 6.9)]
    seen = episode(0, 58_000.0, maximum=58_060.0, end=58_160.0)
    curve = curve_with_excess(57_000.0, 60_400.0, bright)
    assert onset_at(60_400.0, curve, system_with([seen])).status == "expected"


def test_an_earlier_missed_cycle_does_not_borrow_the_excess_of_the_present_one():
    curve = curve_with_excess(63_000.0, 64_000.0, [(64_005.0, 6.9)])
    result = upcoming(system_with(), photometry={1: curve}, now=64_010.0, years=5)
    onsets = {e.cycle: e.status for e in result.events if e.event == "onset"}
    assert onsets == {2: "suspected"}


def test_under_way_once_the_onset_is_confirmed():
    event = onset_at(ONSET + 40.0, one=system_with([episode(1, ONSET + 10.0)]))
    assert event.status == "under way"
    assert event.observed
    median, sigma, *_ = dates(event)
    assert (median, sigma) == pytest.approx((ONSET + 10.0, 5.0), rel=1e-3)
    assert event.notes[0] == "onset observed in K"


def test_over_once_the_end_is_observed_or_its_forecast_has_passed():
    whole = episode(1, ONSET + 10.0, maximum=ONSET + 90.0, end=ONSET + 230.0)
    before, after = (
        onset_at(now, one=system_with([whole]), start=60_000.0) for now in (ONSET + 200.0, ONSET + 231.0)
    )
    assert (before.status, after.status) == ("under way", "over")
    begun = system_with([episode(1, ONSET + 10.0)])
    # End 240 d after the onset, with the onset's own 5 d of error.
    before, after = (onset_at(now, one=begun, start=60_000.0) for now in (ONSET + 255.0, ONSET + 265.0))
    assert (before.status, after.status) == ("under way", "over")


def test_an_episode_without_any_end_is_not_under_way_for_ever():
    one = system_with([episode(1, ONSET)], rule=lag_rule(-40.0, None, None))
    before, after = (
        onset_at(now, one=one, start=60_000.0) for now in (ONSET + 1_000.0, ONSET + 0.6 * PERIOD)
    )
    assert (before.status, after.status) == ("under way", "over")
    assert "no end was ever recorded" in after.notes[0]


def grazing(photometry, now):
    """Periastron distance 6 +- 0.3 au, critical separation 6.1 au: an episode is a matter of chance."""
    one = record(
        solution(
            PERIOD, 58_000.0, period_error=3.0, epoch_error=3.0, eccentricity=exact(0.5),
            a_au=Measured(12.0, 0.6, 0.6),
        ),
        rule=separation_rule(6.1),
    )  # fmt: skip
    return find(upcoming(one, photometry={1: photometry}, now=now, start=60_000.0), "onset", 1)


def test_over_when_a_grazing_passage_stayed_quiet_throughout():
    event = grazing(quiet_curve(59_000.0, 61_500.0, 10.0), 61_500.0)
    assert 0.3 < event.probability < 0.9
    assert event.status == "over"
    assert event.notes[0].startswith("quiet throughout: no episode, which the rule gave")
    # The rule's own chance of no episode, as told.
    told = int(event.notes[0].split("gave ")[1].rstrip("%"))
    assert told == pytest.approx(100.0 * (1.0 - event.probability), abs=0.51)


def test_phase_lost_when_nobody_can_count_any_longer():
    lost = record(solution(PERIOD, 40_000.0, period_error=120.0), rule=lag_rule())
    statuses = {e.event: e.status for e in upcoming(lost).events}
    assert statuses == dict.fromkeys(("periastron", "onset", "maximum", "end"), "phase lost")


def test_past_for_what_needs_no_dust():
    result = upcoming(system_with(), now=61_045.0, start=60_000.0)
    assert find(result, "periastron", 1).status == "past"
    assert find(result, "periastron", 2).status == "expected"


def test_without_an_interval_an_onset_is_expected_until_its_median_and_open_after():
    one = record(solution(PERIOD, 58_040.0, period_error=None), rule=lag_rule())
    before, after = (onset_at(now, one=one, start=60_000.0) for now in (ONSET - 1.0, ONSET + 1.0))
    assert (before.status, after.status) == ("expected", "open")


def test_every_status_of_the_design_is_tested_here():
    # One word for each test above; a status added to the model needs a case of its own.
    assert set(STATUSES) == {
        "expected", "open", "late", "unseen", "suspected", "under way", "over", "phase lost", "past",
    }  # fmt: skip


# ------------------------------------------------------------------- what follows a confirmed onset


def test_a_confirmed_onset_makes_maximum_and_end_conditional():
    """The elements were 60 d off: what follows is counted from what was seen, not from them."""
    rule = DustRule(
        1, 1, "lag", onset=Measured(-40.0, 3.0, 3.0), maximum=Measured(60.0, 4.0, 4.0),
        end=Measured(200.0, 12.0, 12.0), scatter_onset_d=2.0, scatter_end_d=5.0,
    )  # fmt: skip
    result = upcoming(system_with([episode(1, ONSET + 60.0)], rule), now=ONSET + 70.0, years=3)
    for event, after, parts in (("maximum", 100.0, (5, 3, 4, 2)), ("end", 240.0, (5, 3, 12, 2, 5))):
        found = find(result, event, 1)
        median, sigma, *_ = dates(found)
        assert median == pytest.approx(ONSET + 60.0 + after, abs=0.5)
        # Dating of the onset, both offsets, the scatters of both: independent, so their squares add.
        assert sigma == pytest.approx(np.sqrt(np.sum(np.square(parts))), rel=0.02)
        assert "counted from the observed onset" in found.notes
    # Periastron does not care.
    assert (
        find(upcoming(system_with([episode(1, ONSET + 60.0)], rule), now=60_000.0), "periastron", 1).bmjd_tdb
        == find(upcoming(system_with((), rule), now=60_000.0), "periastron", 1).bmjd_tdb
    )


def test_the_next_cycle_is_not_moved_by_a_confirmed_onset():
    first, second = (
        find(upcoming(system_with(episodes), now=ONSET + 70.0, years=12), "onset", 2)
        for episodes in ((), [episode(1, ONSET + 60.0)])
    )
    assert dates(first) == pytest.approx(dates(second))


def test_a_rule_learned_from_episodes_counts_the_end_from_the_observed_onset():
    rng = np.random.default_rng(3)
    lengths = 200.0 + 10.0 * rng.standard_normal(6)
    starts = 43_000.0 + PERIOD * np.arange(6) + 60.0 * rng.standard_normal(6)
    known = [
        episode(k, s, end=s + d, error_d=1.0) for k, (s, d) in enumerate(zip(starts, lengths, strict=True))
    ]
    one = record(rule=DustRule(1, 1, "learned"), episodes=[*known, episode(6, 61_150.0, error_d=1.0)])
    found = find(upcoming(one, now=61_160.0, years=3), "end", 6)
    median, sigma, _, _, low95, high95 = dates(found)
    # Lengths scatter by 10 d, onsets by 60 d: counted from the onset only the first matters.
    mean, spread = lengths.mean(), lengths.std(ddof=1) * np.sqrt(1.0 + 1.0 / 6.0)
    assert median == pytest.approx(61_150.0 + mean, abs=1.0)
    width = spread * stats.t.ppf(0.975, 5)
    assert (low95, high95) == pytest.approx(
        (61_150.0 + mean - width, 61_150.0 + mean + width), abs=0.06 * width
    )
    assert sigma < 25.0


# ------------------------------------------------------------------------------------- as of


def test_an_earlier_as_of_hides_later_episodes_and_observations():
    curve = curve_with_excess(59_000.0, ONSET + 300.0, [(ONSET + 30.0, 6.5), (ONSET + 45.0, 6.4)])
    seen = episode(1, ONSET + 20.0, maximum=ONSET + 100.0, end=ONSET + 250.0)
    one = system_with([seen])
    told = {
        now: onset_at(now, curve, one, start=60_000.0).status
        for now in (LOW95 - 5.0, ONSET + 10.0, ONSET + 40.0, ONSET + 260.0)
    }
    assert list(told.values()) == ["expected", "open", "under way", "over"]
    # Before the confirmed date came, the forecast is what it was without the episode.
    with_it, without = (dates(onset_at(ONSET + 10.0, one=o, start=60_000.0)) for o in (one, system_with()))
    assert with_it == without


def test_an_excess_logged_later_suspects_nothing_before():
    curve = curve_with_excess(59_000.0, ONSET - 25.0, [(ONSET - 3.0, 6.9)])
    assert onset_at(ONSET - 4.0, curve).status == "open"
    assert onset_at(ONSET - 2.0, curve).status == "suspected"


def test_proposed_and_rejected_episodes_are_no_knowledge():
    for state in ("proposed", "rejected"):
        one = system_with([replace(episode(1, ONSET), state=state)])
        assert onset_at(ONSET + 10.0, one=one).status == "open"
        assert not onset_at(ONSET + 10.0, one=one).observed
