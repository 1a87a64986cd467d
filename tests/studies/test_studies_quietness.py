"""What a light curve says: excess over its own level, quiet, or nothing. Cases with known answers."""

from __future__ import annotations

import numpy as np
import pytest
from studies_examples import episode, light_curve, record

from campaign.studies.judging import judge
from campaign.studies.quietness import judge_photometry, suspected_since

NOW = 62_000.0
LEVEL = 7.5


def steady(count=30, start=60_000.0, step=10.0, level=LEVEL, scatter=0.02, seed=4):
    rng = np.random.default_rng(seed)
    return (start + step * np.arange(count)).tolist(), (level + scatter * rng.standard_normal(count)).tolist()


def judged(times, mags, episodes=(), now=NOW, **columns):
    return judge(record(episodes=episodes), light_curve(times, mags, **columns), now)


def test_a_steady_star_is_quiet_at_every_point():
    times, mags = steady()
    verdict = judged(times, mags)
    assert verdict.is_quiet.all()
    assert np.abs(verdict.excess_sigma).max() < 3.0
    assert verdict.last_quiet == times[-1]
    assert suspected_since(verdict, 0.0, NOW) is None


def test_the_excess_is_counted_in_errors_and_scatter_together():
    # Level 7.5, scatter 0.05, own error 0.03, 0.5 mag brighter: 0.5/hypot(0.05, 0.03) = 8.6 sigma, less what
    # the level itself is uncertain by.
    times = (60_000.0 + 10.0 * np.arange(400)).tolist()
    mags = (LEVEL + 0.05 * np.random.default_rng(1).standard_normal(400)).tolist()
    verdict = judged([*times, 64_500.0], [*mags, 7.0], error=0.03, now=65_000.0)
    assert verdict.excess_sigma[-1] == pytest.approx(0.5 / np.hypot(0.05, 0.03), rel=0.08)
    assert not verdict.is_quiet[-1]
    assert suspected_since(verdict, 60_000.0, 65_000.0) == 64_500.0


def test_a_new_instrument_with_an_offset_does_not_look_like_an_onset():
    old_t, old_m = steady(30)
    new_t, new_m = steady(12, start=60_400.0, level=LEVEL - 0.3, seed=5)
    source = ["old camera"] * 30 + ["new camera"] * 12
    verdict = judged([*old_t, *new_t], [*old_m, *new_m], source=source)
    assert verdict.is_quiet.all()
    assert suspected_since(verdict, 0.0, NOW) is None
    # Taken for one source the same points look like an onset, so the test can fail.
    careless = judged([*old_t, *new_t], [*old_m, *new_m])
    assert suspected_since(careless, 0.0, NOW) == new_t[0]


def test_the_first_points_of_a_new_instrument_say_nothing():
    old_t, old_m = steady(30)
    verdict = judged([*old_t, 60_400.0], [*old_m, 6.0], source=["old"] * 30 + ["new"])
    assert np.isnan(verdict.excess_sigma[-1])
    assert not verdict.is_quiet[-1]
    assert suspected_since(verdict, 0.0, NOW) is None


def test_bands_have_levels_of_their_own():
    times, mags = steady(20)
    verdict = judged([*times, *times], [*mags, *(np.array(mags) - 1.4)], band=["K"] * 20 + ["L"] * 20)
    assert verdict.is_quiet.all()


def test_photometric_systems_have_levels_of_their_own():
    times, mags = steady(20)
    verdict = judged(
        [*times, *times], [*mags, *(np.array(mags) + 1.85)], photometric_system=["Vega"] * 20 + ["AB"] * 20
    )
    assert verdict.is_quiet.all()


def test_four_points_make_no_level_and_five_do():
    for count, known in ((4, False), (5, True)):
        times, mags = steady(count)
        verdict = judged(times, mags)
        assert np.isfinite(verdict.excess_sigma).all() == known
        assert verdict.is_quiet.all() == known


def test_points_of_known_episodes_do_not_raise_the_level():
    times, mags = steady(20)
    bright_t = [61_000.0 + 10.0 * i for i in range(25)]
    seen = episode(1, 60_990.0, maximum=61_100.0, end=61_260.0)
    verdict = judged([*times, *bright_t], [*mags, *[6.5] * 25], [seen])
    assert (verdict.excess_sigma[20:] > 10.0).all()
    # Without that knowledge more than half of the points are bright, and the level is theirs.
    assert not (judged([*times, *bright_t], [*mags, *[6.5] * 25]).excess_sigma[20:] > 10.0).any()


@pytest.mark.parametrize(("bound", "quiet"), [(7.45, True), (7.36, True), (7.34, False), (6.0, False)])
def test_a_too_faint_limit_is_quiet_where_it_would_have_shown_an_excess(bound, quiet):
    # 0.15 mag above the level would have been seen only if the limit reaches as deep as that.
    times, mags = steady(20, scatter=0.001)
    verdict = judged([*times, 60_500.0], [*mags, bound], limit_side=[0] * 20 + [1])
    assert bool(verdict.is_quiet[-1]) is quiet
    assert np.isnan(verdict.excess_sigma[-1])


def test_a_saturated_point_is_at_least_so_bright():
    times, mags = steady(20)
    bright = judged([*times, 60_500.0], [*mags, 6.9], limit_side=[0] * 20 + [-1])
    assert bright.excess_sigma[-1] > 5.0
    assert suspected_since(bright, 60_400.0, NOW) == 60_500.0
    faint = judged([*times, 60_500.0], [*mags, 8.0], limit_side=[0] * 20 + [-1])
    assert faint.excess_sigma[-1] == 0.0
    assert not faint.is_quiet[-1]


@pytest.mark.parametrize("quality", ["bad", "doubtful"])
def test_points_that_are_not_good_neither_suspect_nor_reassure(quality):
    times, mags = steady(20)
    verdict = judged([*times, 60_500.0], [*mags, 5.0], quality=["good"] * 20 + [quality])
    assert verdict.bmjd_tdb.size == 20
    assert suspected_since(verdict, 0.0, NOW) is None
    verdict = judged([*times, 60_500.0], [*mags, LEVEL], quality=["good"] * 20 + [quality])
    assert verdict.last_quiet == times[-1]


def test_a_point_too_uncertain_to_show_an_excess_is_not_quiet():
    times, mags = steady(20)
    error = [0.02] * 20 + [0.4]
    verdict = judged([*times, 60_500.0], [*mags, LEVEL], error=error)
    assert verdict.is_quiet[:20].all() and not verdict.is_quiet[-1]


def test_a_point_without_an_error_counts_with_the_scatter_of_its_source():
    times, mags = steady(200, scatter=0.05)
    verdict = judged([*times, 62_500.0], [*mags, 7.0], error=[0.0] * 200 + [float("nan")], now=63_000.0)
    assert verdict.excess_sigma[-1] == pytest.approx(0.5 / (0.05 * np.sqrt(2.0)), rel=0.15)


def test_points_after_the_question_are_not_looked_at():
    times, mags = steady(20)
    verdict = judged([*times, 60_500.0], [*mags, 5.0], now=60_499.0)
    assert suspected_since(verdict, 0.0, NOW) is None


def sequence(*sigmas_at):
    """A verdict whose excesses are exactly these (time, sigma) pairs after a long quiet past."""
    from campaign.studies.quietness import JudgedPhotometry

    times, sigma = (np.array(x) for x in zip(*sigmas_at, strict=True))
    return JudgedPhotometry(times, sigma, sigma < 3.0, ("K",) * times.size)


@pytest.mark.parametrize(
    ("points", "since"),
    [
        ([(0.0, 1.0), (10.0, 5.0)], 10.0),
        ([(0.0, 1.0), (10.0, 4.99)], None),
        ([(0.0, 3.0), (30.0, 3.0)], 0.0),
        ([(0.0, 3.0), (30.1, 3.0)], None),
        ([(0.0, 3.0), (10.0, 2.9), (20.0, 3.5)], None),
        ([(0.0, 2.0), (10.0, 3.1), (20.0, 3.2), (30.0, 9.0)], 10.0),
        ([(0.0, -9.0), (10.0, -9.0)], None),
    ],
)
def test_suspicion_takes_five_sigma_or_twice_three_within_a_month(points, since):
    assert suspected_since(sequence(*points), 0.0, 100.0) == since


def test_suspicion_looks_only_where_it_is_asked_to():
    points = sequence((0.0, 9.0), (50.0, 9.0))
    assert suspected_since(points, 1.0, 100.0) == 50.0
    assert suspected_since(points, 1.0, 49.0) is None


def test_the_order_of_the_points_does_not_matter():
    times, mags = steady(20)
    times, mags = np.array([*times, 60_500.0]), np.array([*mags, 6.0])
    turned = np.random.default_rng(2).permutation(times.size)
    plain, mixed = (
        judge_photometry(
            times[i], mags[i], np.full(21, 0.02), np.zeros(21, np.int8), ["K"] * 21, ["a"] * 21, []
        )
        for i in (np.arange(21), turned)
    )
    assert np.array_equal(plain.bmjd_tdb, mixed.bmjd_tdb)
    assert np.array_equal(plain.excess_sigma, mixed.excess_sigma)


def test_false_alarms_are_as_rare_as_the_normal_law_says():
    # 200 light curves of 100 points of a star that does nothing. Single points beyond 5 sigma: 3e-7 each;
    # two consecutive beyond 3 sigma: (1.35e-3)^2 each, 0.04 in all. Three or more would be a fault.
    alarms = 0
    for seed in range(200):
        times, mags = steady(100, step=12.0, scatter=0.03, seed=seed)
        alarms += suspected_since(judged(times, mags, error=0.0001), 0.0, NOW) is not None
    assert alarms < 3
