"""The cycle count: whole periods from one anchor, kept through later solutions and published counts."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest
from hypothesis import given
from hypothesis import strategies as st
from studies_examples import episode, find, lag_rule, record, solution, stamp, system, upcoming

from campaign.errors import Conflict, InputRefused, NotFound
from campaign.model.measured import Limit, Measured, Range
from campaign.model.systems import DustRule, Solution
from campaign.reading.instants import read_instant
from campaign.studies import solutions, systems, watch
from campaign.studies.cycles import count_is_safe, cycle_of, nominal_period_d, with_cycles


@given(
    cycle=st.integers(-200, 200),
    period=st.floats(200.0, 20_000.0),
    anchor=st.floats(20_000.0, 80_000.0),
    off=st.floats(-0.49, 0.49),
)
def test_an_epoch_belongs_to_the_nearest_whole_number_of_periods(cycle, period, anchor, off):
    assert cycle_of(anchor + (cycle + off) * period, anchor, period) == cycle


@pytest.mark.parametrize(
    ("cycles", "period_sigma", "safe"),
    [
        (0, 100.0, True),
        (10, 1.0, True),
        (49, 10.0, True),
        (50, 10.0, False),
        (-50, 10.0, False),
        (51, 10.0, False),
    ],
)
def test_a_count_is_safe_while_three_sigma_stay_under_half_a_period(cycles, period_sigma, safe):
    # 3 x 50 x 10 d = 1500 d is half of 3000 d: no longer under it.
    assert count_is_safe(cycles, 3_000.0, 0.0, period_sigma) is safe


def test_the_error_of_the_epoch_counts_too():
    # 3 hypot(300, 400) = 1500.
    assert not count_is_safe(40, 3_000.0, 300.0, 10.0)
    assert count_is_safe(40, 3_000.0, 299.0, 10.0)
    assert math.hypot(300.0, 400.0) == 500.0


def test_the_period_to_count_with():
    assert nominal_period_d(solution(3_000.0)) == 3_000.0
    assert nominal_period_d(solution(Range(2_900.0, 3_000.0))) == 2_950.0
    assert nominal_period_d(solution(Limit(11_000.0, "above"))) is None


# ------------------------------------------------------------------------------- of episodes


def cycles_of(found):
    return [e.cycle for e in found]


def test_episodes_are_counted_from_the_predicted_onset():
    seen = [episode(None, t, number=i) for i, t in enumerate((49_060.0, 55_020.0, 61_100.0))]
    assert cycles_of(with_cycles(record(episodes=seen), [(4, 58_000.0)], 3_000.0)) == [1, 3, 5]


def test_a_stored_cycle_is_kept_whatever_the_count_says():
    seen = [episode(7, 55_020.0), episode(None, 58_010.0, number=99)]
    assert cycles_of(with_cycles(record(episodes=seen), [(4, 58_000.0)], 3_000.0)) == [7, 4]


def test_without_an_orbit_the_smallest_gap_is_one_cycle():
    seen = [episode(None, t, number=i) for i, t in enumerate((43_000.0, 49_050.0, 52_000.0, 61_000.0))]
    # Gaps of 6050, 2950 and 9000 d.
    assert cycles_of(with_cycles(record(episodes=seen), [], None)) == [0, 2, 3, 6]


def test_one_episode_alone_is_cycle_zero():
    assert cycles_of(with_cycles(record(episodes=[episode(None, 50_000.0)]), [], None)) == [0]


def test_only_confirmed_episodes_count_in_order_of_time():
    seen = [
        episode(None, 61_000.0, number=1),
        replace(episode(None, 58_000.0, number=2), state="rejected"),
        replace(episode(None, 57_000.0, number=3), state="proposed"),
        episode(None, None, maximum=55_050.0, number=4),
    ]
    found = with_cycles(record(episodes=seen), [(0, 55_000.0)], 3_000.0)
    assert [(e.id, e.cycle) for e in found] == [(4, 0), (1, 2)]


def test_two_entries_of_one_cycle_are_told_as_one_episode():
    entered = [
        episode(None, 58_010.0, number=1),
        episode(None, None, end=58_260.0, number=2),
        episode(None, None, maximum=58_090.0, end=58_300.0, number=3),
    ]
    (one,) = with_cycles(record(episodes=entered), [(0, 58_000.0)], 3_000.0)
    dated = [d.moment.bmjd_tdb for d in (one.onset, one.maximum, one.end)]
    assert (one.id, one.cycle, dated) == (1, 0, [58_010.0, 58_090.0, 58_300.0])


def test_an_episode_entered_without_a_number_ends_the_wait_for_its_cycle():
    one = solution(3_000.0, 58_000.0)
    seen = episode(None, 60_950.0)
    found = find(upcoming(record(one, rule=lag_rule(), episodes=[seen]), now=61_000.0), "onset", 1)
    assert found.observed and found.status == "under way"


def test_an_onset_long_before_periastron_is_counted_by_the_rule_not_by_periastron():
    # The rule puts the onset 0.45 periods before periastron; an onset a bit early is still of that cycle.
    one = solution(3_000.0, 58_000.0)
    rule = DustRule(1, 1, "phase", onset=Measured(-0.45, 0.01, 0.01))
    early = episode(None, 61_000.0 - 0.55 * 3_000.0)
    result = upcoming(record(one, rule=rule, episodes=[early]), now=59_500.0, start=59_000.0)
    assert find(result, "onset", 1).observed


# ------------------------------------------------------------------------------- of solutions


@pytest.fixture
def lantern(db):
    systems.add_system(db, stamp(), system(0))
    return db


def add(db, label, period, epoch, *, adopt=False, cycle=None, marks="periastron", **elements):
    draft = Solution(0, 0, label, period_d=period, epoch_marks=marks, **elements)
    instant = read_instant(epoch, default_scale="tdb", default_place="barycentre") if epoch else None
    return solutions.add_solution(db, stamp(), "Lantern 3", draft, instant, None, cycle, adopt)


def stored(db):
    (one,) = watch.load_campaign(db, ["Lantern 3"], None, None).records
    return one.system, {s.label: s for s in one.solutions}


PERIOD = Measured(3_000.0, 3.0, 3.0)


def test_the_first_adopted_epoch_is_cycle_zero(lantern):
    kept = add(lantern, "first", PERIOD, "MJD 58000.0±5", adopt=True)
    assert kept.data["adopted"]
    one, found = stored(lantern)
    assert one.cycle_anchor_bmjd_tdb == pytest.approx(58_000.0)
    assert one.cycle_anchor_period_d == 3_000.0
    assert found["first"].epoch_cycle == 0


def test_nothing_is_anchored_before_something_is_adopted(lantern):
    kept = add(lantern, "first", PERIOD, "MJD 58000.0±5")
    one, found = stored(lantern)
    assert one.cycle_anchor_bmjd_tdb is None and found["first"].epoch_cycle is None
    assert any("adopt it with" in line for line in kept.lines)
    solutions.adopt_solutions(lantern, stamp(), "Lantern 3", {"first": None}, False)
    one, found = stored(lantern)
    assert one.cycle_anchor_bmjd_tdb == pytest.approx(58_000.0) and found["first"].epoch_cycle == 0


def test_a_later_solution_is_mapped_to_the_same_count(lantern):
    add(lantern, "first", PERIOD, "MJD 58000.0±5", adopt=True)
    kept = add(lantern, "second", Measured(2_990.0, 1.0, 1.0), "MJD 66985.0±2")
    assert kept.data["epoch_cycle"] == 3 and not kept.warnings
    solutions.adopt_solutions(lantern, stamp(), "Lantern 3", {"second": None}, True)
    one, found = stored(lantern)
    assert one.cycle_anchor_bmjd_tdb == pytest.approx(58_000.0)  # anchored once
    assert found["second"].epoch_cycle == 3
    result = watch.upcoming(*question(lantern, "MJD 66000"))
    assert find(result, "periastron", 3).bmjd_tdb.median == pytest.approx(66_985.0)


def question(db, now):
    campaign = watch.load_campaign(db, None, None, None)
    as_of = read_instant(now, default_scale="tdb")
    return campaign, watch.ask(
        campaign,
        now=stamp().at,
        as_of=as_of,
        start=None,
        end=None,
        within_d=None,
        events=(),
        min_probability=0.0,
        draws=2_000,
        seed=None,
        solutions="adopted",
    )


def test_solutions_added_before_the_first_adoption_are_counted_when_it_comes(lantern):
    add(lantern, "old", PERIOD, "MJD 49010.0±5", cycle=3)
    add(lantern, "new", PERIOD, "MJD 58000.0±5", adopt=True, cycle=6)
    _, found = stored(lantern)
    assert (found["old"].epoch_cycle, found["new"].epoch_cycle) == (-3, 0)
    # Their own counts stay what was printed: published = ours + offset.
    assert found["old"].epoch_cycle + found["old"].published_cycle_offset == 3
    assert found["new"].epoch_cycle + found["new"].published_cycle_offset == 6


def test_the_published_count_is_kept_as_an_offset(lantern):
    add(lantern, "first", PERIOD, "MJD 58000.0±5", adopt=True, cycle=11)
    add(lantern, "second", PERIOD, "MJD 64000.0±5", cycle=13)
    _, found = stored(lantern)
    assert [found[label].published_cycle_offset for label in ("first", "second")] == [11, 11]


def test_a_count_that_could_be_off_by_one_is_said(lantern):
    add(lantern, "first", PERIOD, "MJD 58000.0±5", adopt=True)
    kept = add(lantern, "poor", Measured(3_000.0, 130.0, 130.0), "MJD 45900.0±5")
    assert kept.data["epoch_cycle"] == -4
    assert any("may be off by one" in warning for warning in kept.warnings)


def test_a_conjunction_is_counted_by_the_periastron_that_it_leads_to(lantern):
    add(lantern, "first", PERIOD, "MJD 58000.0±5", adopt=True)
    # e = 0 and omega_B = 108 deg: B in front at nu = 162 deg, phase 0.45. Periastron is at 64 200, nearest to
    # cycle 2, though the conjunction itself lies nearer to cycle 3.
    kept = add(
        lantern,
        "second",
        PERIOD,
        "MJD 65550.0±5",
        marks="B in front",
        eccentricity=Measured(0.0, 0.0, 0.0),
        omega_deg=Measured(108.0, 1.0, 1.0),
        omega_of="B",
    )
    assert kept.data["epoch_cycle"] == 2


def test_one_system_has_one_adopted_solution_or_weighted_ones(lantern):
    add(lantern, "first", PERIOD, "MJD 58000.0±5", adopt=True)
    with pytest.raises(Conflict):
        add(lantern, "second", PERIOD, "MJD 58001.0±5", adopt=True)
    assert "second" not in stored(lantern)[1]  # all or nothing
    add(lantern, "second", PERIOD, "MJD 58001.0±5")
    with pytest.raises(Conflict):
        solutions.adopt_solutions(lantern, stamp(), "Lantern 3", {"second": None}, False)
    with pytest.raises(InputRefused) as refused:
        solutions.adopt_solutions(lantern, stamp(), "Lantern 3", {"first": 0.5, "second": None}, False)
    assert refused.value.code == "weights-missing"
    for weight in (0.0, -1.0, math.nan, math.inf):
        with pytest.raises(InputRefused):
            solutions.adopt_solutions(lantern, stamp(), "Lantern 3", {"first": 0.5, "second": weight}, False)
    kept = solutions.adopt_solutions(lantern, stamp(), "Lantern 3", {"first": 0.6, "second": 0.4}, False)
    assert kept.changed and {"first", "second"} == set(kept.data["adopted"])
    _, found = stored(lantern)
    assert {label: s.weight for label, s in found.items()} == {"first": 0.6, "second": 0.4}


def test_an_unknown_solution_or_system_is_not_found(lantern):
    add(lantern, "first", PERIOD, "MJD 58000.0±5")
    with pytest.raises(NotFound):
        solutions.adopt_solutions(lantern, stamp(), "Lantern 3", {"third": None}, False)
    with pytest.raises(NotFound):
        solutions.adopt_solutions(lantern, stamp(), "Lantern 9", {"first": None}, False)


def test_a_solution_that_says_nothing_is_refused(lantern):
    with pytest.raises(InputRefused) as refused:
        add(lantern, "empty", None, None)
    assert refused.value.code == "solution-empty"


def test_a_clock_reading_is_no_error_of_an_epoch(lantern):
    """An epoch typed to the second without an error: its error is unknown, not a second."""
    add(lantern, "first", PERIOD, "2017-09-04T00:00:00")
    add(lantern, "second", PERIOD, "2017-09-04")
    _, found = stored(lantern)
    assert found["first"].epoch.minus_d is None
    # A day given as a day is a day wide: width over the root of twelve.
    assert found["second"].epoch.plus_d == pytest.approx(1.0 / math.sqrt(12.0))


def test_correlations_become_a_covariance_with_the_errors(lantern):
    draft = Solution(0, 0, "first", period_d=PERIOD, eccentricity=Measured(0.5, 0.02, 0.02))
    epoch = read_instant("MJD 58000.0±5", default_scale="tdb", default_place="barycentre")
    solutions.add_solution(
        lantern,
        stamp(),
        "Lantern 3",
        draft,
        epoch,
        None,
        None,
        True,
        [("epoch", "period_d", -0.5), ("eccentricity", "epoch", 0.2)],
    )
    covariance = stored(lantern)[1]["first"].covariance
    assert covariance.between("period_d", "epoch") == pytest.approx(-0.5 * 5.0 * 3.0)
    assert covariance.between("eccentricity", "epoch") == pytest.approx(0.2 * 5.0 * 0.02)
    assert covariance.between("epoch", "epoch") == pytest.approx(25.0)
    assert covariance.between("eccentricity", "period_d") == 0.0


@pytest.mark.parametrize(
    "pairs",
    [
        [("epoch", "period_d", 0.9), ("epoch", "eccentricity", 0.9), ("period_d", "eccentricity", -0.9)],
        [("epoch", "period_d", 1.0)],
        [("epoch", "inclination_deg", 0.3)],
    ],
    ids=["that exclude each other", "of one", "with an element that has no error"],
)
def test_correlations_that_cannot_be_are_refused(lantern, pairs):
    draft = Solution(0, 0, "first", period_d=PERIOD, eccentricity=Measured(0.5, 0.02, 0.02))
    epoch = read_instant("MJD 58000.0±5", default_scale="tdb", default_place="barycentre")
    with pytest.raises(InputRefused) as refused:
        solutions.add_solution(lantern, stamp(), "Lantern 3", draft, epoch, None, None, True, pairs)
    assert refused.value.code == "correlation-refused"
    assert stored(lantern)[1] == {}
