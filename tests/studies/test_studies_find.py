"""Episodes found in light curves: what is dated, what cannot be told, and what must not look like an onset.

The truth of every curve is what it was made with (invented, tests/studies/find_examples.py), or the truth
behind the sample campaign (invented, sample_catalog/truth.py).
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from find_examples import START, burst, curve, known, light, record, times

from campaign.errors import InputRefused
from campaign.studies.find_episodes import find_in
from campaign.studies.find_notes import overlap_warnings
from campaign.studies.sample import load_sample


def inside(dates, truth, widened=1.0):
    low = dates.median - widened * (dates.median - dates.lo95)
    return low <= truth <= dates.median + widened * (dates.hi95 - dates.median)


# ------------------------------------------------------------------------------------------ what is dated


def test_a_burst_is_dated_within_its_intervals_and_not_at_its_first_bright_point():
    t = times(0.0, 1500.0, 12.0)
    found = find_in(record(), light(curve(burst(t, START + 600.0), t)))
    (one,) = found.episodes
    assert (one.kind, one.rise, one.known) == ("episode", "covered", None)
    assert inside(one.onset.bmjd_tdb, START + 600.0)
    assert one.onset.bmjd_tdb.median < one.first_bright_bmjd_tdb
    assert inside(one.maxima[0].date.bmjd_tdb, START + 690.0)
    assert inside(one.end.bmjd_tdb, START + 735.0)
    # Half of the maximum is reached in the decay: 735 + 80 ln(1.4) (definition of an exponential).
    assert inside(one.half.bmjd_tdb, START + 735.0 + 80.0 * np.log(1.4))
    assert one.half.bmjd_tdb.median > one.end.bmjd_tdb.median
    assert inside(one.decay_d, 80.0)
    assert one.maxima[0].excess.value == pytest.approx(1.2, abs=3.0 * one.maxima[0].excess.plus)
    assert one.onset.utc.median.endswith("Z")


def test_all_bands_date_one_onset_and_longer_bands_have_a_later_maximum():
    t = times(0.0, 1500.0, 9.0)
    k = curve(burst(t, START + 600.0), t, seed=2)
    ell = curve(burst(t, START + 600.0, rise_d=130.0, height=4.0), t, band="L", seed=3, level=6.0)
    (one,) = find_in(record(), light(k, ell)).episodes
    by_band = {maximum.date.band: maximum.date.bmjd_tdb for maximum in one.maxima}
    assert one.onset.band is None
    assert inside(by_band["K"], START + 690.0)
    assert inside(by_band["L"], START + 730.0)
    assert inside(one.onset.bmjd_tdb, START + 600.0)
    (alone,) = find_in(record(), light(k, ell), bands=("K",)).episodes
    assert alone.onset.band == "K"


def test_several_episodes_of_one_curve_are_dated_each():
    t = times(0.0, 4000.0, 15.0)
    onsets = [START + 500.0, START + 1700.0, START + 2900.0]
    found = find_in(record(), light(curve(sum(burst(t, onset) for onset in onsets), t)))
    assert len(found.episodes) == 3
    assert all(inside(one.onset.bmjd_tdb, onset) for one, onset in zip(found.episodes, onsets, strict=True))


def test_an_episode_that_rises_from_the_last_one_is_an_episode_of_its_own():
    t = times(0.0, 1600.0, 6.0)
    found = find_in(record(), light(curve(burst(t, START + 500.0) + burst(t, START + 760.0), t)))
    assert len(found.episodes) == 2
    assert inside(found.episodes[1].onset.bmjd_tdb, START + 760.0, widened=1.5)


def test_a_short_bump_on_the_way_down_is_marked_and_is_no_episode():
    t = times(0.0, 1500.0, 4.0)
    bump = 0.35 * np.clip(1.0 - np.abs(t - START - 780.0) / 12.0, 0.0, None)
    (one,) = find_in(record(), light(curve(burst(t, START + 600.0) + bump, t))).episodes
    assert [round(b.bmjd_tdb - START - 780.0, -1) for b in one.brightenings] == [0.0]
    assert one.brightenings[0].lasts_d < 30.0


def test_a_smooth_decline_has_no_secondary_brightening():
    t = times(0.0, 1500.0, 4.0)
    (one,) = find_in(record(), light(curve(burst(t, START + 600.0), t))).episodes
    assert one.brightenings == ()


# ---------------------------------------------------------------------------------- what cannot be told


def test_a_rise_in_a_gap_is_a_bracket_that_reaches_before_the_last_quiet_point():
    t = times(0.0, 1500.0, 12.0)
    unseen = (t > START + 570.0) & (t < START + 720.0)
    t = t[~unseen]
    (one,) = find_in(record(), light(curve(burst(t, START + 600.0), t))).episodes
    dates = one.onset.bmjd_tdb
    assert one.rise == "not covered"
    assert any("rise not covered" in note for note in one.notes)
    assert inside(dates, START + 600.0)
    assert dates.hi95 - dates.lo95 > 0.5 * 150.0
    # A rise too faint for the last quiet point may have begun before it.
    assert dates.lo95 < one.last_quiet_bmjd_tdb < dates.median < one.first_bright_bmjd_tdb


def test_the_noisier_the_last_quiet_points_the_earlier_the_bracket_reaches():
    t = times(0.0, 1500.0, 20.0)
    t = t[(t < START + 570.0) | (t > START + 760.0)]
    reach = []
    for error in (0.01, 0.09):
        (one,) = find_in(record(), light(curve(burst(t, START + 620.0), t, error=error))).episodes
        reach.append(one.last_quiet_bmjd_tdb - one.onset.bmjd_tdb.lo95)
    assert reach[1] > reach[0]


def test_a_curve_that_begins_inside_an_episode_has_no_onset():
    t = times(700.0, 2000.0, 12.0)
    (one,) = find_in(record(), light(curve(burst(t, START + 600.0), t))).episodes
    assert one.rise == "before the curve"
    assert one.onset is None
    assert any("begins inside" in note for note in one.notes)


def test_an_episode_under_way_has_no_end_and_says_so():
    t = times(0.0, 670.0, 8.0)
    (one,) = find_in(record(), light(curve(burst(t, START + 600.0, rise_d=150.0), t))).episodes
    assert inside(one.onset.bmjd_tdb, START + 600.0)
    assert (one.end, one.half, one.decay_d) == (None, None, None)
    assert not one.maxima[0].reached
    assert any("decline not covered" in note for note in one.notes)
    assert any("brightest so far" in note for note in one.notes)


def test_what_is_observed_after_the_date_is_not_looked_at():
    t = times(0.0, 1500.0, 12.0)
    arrays = light(curve(burst(t, START + 600.0), t))
    assert find_in(record(), arrays, as_of=START + 590.0).episodes == ()
    assert len(find_in(record(), arrays, as_of=START + 700.0).episodes) == 1


# ----------------------------------------------------------------------- what must not look like an onset


def test_a_new_instrument_is_no_onset():
    early, late = times(0.0, 1500.0, 12.0), times(900.0, 2500.0, 12.0)
    quiet = curve(0.0 * early, early)
    # A tenth of a magnitude brighter: how far sources differ (common practice, no source).
    newcomer = curve(0.0 * late, late, source="other", level=6.9, seed=4)
    assert find_in(record(), light(quiet, newcomer)).episodes == ()


def test_a_constant_curve_has_no_episode_and_says_how_quiet_it_is():
    t = times(0.0, 1500.0, 12.0)
    row = (t, np.full(t.size, 7.0), np.full(t.size, 0.02), "K", "sheets")
    found = find_in(record(), light(row))
    assert found.episodes == ()
    assert "K keeps to its level" in found.quiet_note


def test_a_wild_night_is_no_episode():
    t = times(0.0, 1500.0, 12.0)
    row = curve(0.0 * t, t)
    row[1][40] -= 0.8
    assert find_in(record(), light(row)).episodes == ()


# ---------------------------------------------------------------------------------------- limits, levels


def with_limits(arrays, chosen, bound, side):
    mag, limit_side = arrays.mag.copy(), arrays.limit_side.copy()
    mag[chosen], limit_side[chosen] = bound, side
    error = np.where(chosen, np.nan, arrays.mag_minus)
    return replace(
        arrays, mag=mag, limit_side=limit_side, mag_minus=error, mag_plus=error,
        limit_sigma=np.where(chosen, 3.0, np.nan),
    )  # fmt: skip


def test_a_saturated_maximum_is_no_dip():
    t = times(0.0, 1500.0, 12.0)
    arrays = light(curve(burst(t, START + 600.0, height=3.0), t))
    arrays = with_limits(arrays, arrays.mag < 6.2, 6.2, -1)
    (one,) = find_in(record(), arrays).episodes
    assert inside(one.onset.bmjd_tdb, START + 600.0)
    assert inside(one.maxima[0].date.bmjd_tdb, START + 690.0)


def test_stars_too_faint_to_be_seen_do_not_hide_an_onset():
    t = times(0.0, 1500.0, 12.0)
    arrays = light(curve(burst(t, START + 600.0, height=6.0), t))
    # Nothing fainter than 6.8 is seen; the stars are at 7.0.
    arrays = with_limits(arrays, arrays.mag > 6.8, 6.8, 1)
    (one,) = find_in(record(), arrays).episodes
    assert inside(one.onset.bmjd_tdb, START + 600.0)


def test_a_band_of_limits_alone_is_told_beside_one_that_is_measured():
    t = times(0.0, 1500.0, 12.0)
    k = curve(burst(t, START + 600.0), t)
    m = curve(0.0 * t, t, band="M", level=5.0)
    arrays = light(k, m)
    arrays = with_limits(arrays, arrays.band == "M", 4.0, 1)
    found = find_in(record(), arrays)
    assert len(found.episodes) == 1
    assert any("Band M has limits only" in warning for warning in found.warnings)


def test_levels_are_those_of_each_source():
    t = times(0.0, 1500.0, 12.0)
    first = curve(0.0 * t, t)
    second = curve(0.0 * t, t + 3.0, source="other", level=7.12, seed=5)
    levels = {level.source: level for level in find_in(record(), light(first, second)).levels}
    assert levels["sheets"].level_mag.value == pytest.approx(7.0, abs=0.01)
    assert levels["other"].level_mag.value == pytest.approx(7.12, abs=0.01)
    assert levels["other"].points == t.size


# --------------------------------------------------------------------------------------------- bad input


def test_too_few_points_are_refused():
    t = times(0.0, 50.0, 12.0)
    with pytest.raises(InputRefused) as refused:
        find_in(record(), light(curve(0.0 * t, t)))
    assert (refused.value.code, refused.value.details["measured"]) == ("too-few-points", t.size)


def test_nothing_but_limits_is_refused():
    t = times(0.0, 500.0, 12.0)
    arrays = light(curve(0.0 * t, t))
    arrays = with_limits(arrays, np.ones(t.size, dtype=bool), 6.0, 1)
    with pytest.raises(InputRefused) as refused:
        find_in(record(), arrays)
    assert refused.value.code == "only-limits"


def test_a_band_that_nobody_observed_is_refused():
    t = times(0.0, 500.0, 12.0)
    with pytest.raises(InputRefused) as refused:
        find_in(record(), light(curve(0.0 * t, t)), bands=("L",))
    assert refused.value.details["bands"] == ["K"]


def test_points_entered_twice_count_once_and_points_that_disagree_are_told():
    t = times(0.0, 1500.0, 12.0)
    row = curve(burst(t, START + 600.0), t)
    once = find_in(record(), light(row))
    doubled = find_in(record(), light(row, row))
    assert doubled.measured == once.measured
    assert doubled.episodes[0].onset == once.episodes[0].onset
    assert any("Entered twice" in warning for warning in doubled.warnings)
    other = (t, row[1] + 0.01, *row[2:])
    assert any("At the instant of another" in w for w in find_in(record(), light(row, other)).warnings)


def test_mixed_photometric_systems_of_a_band_are_told_and_have_levels_of_their_own():
    t = times(0.0, 1500.0, 12.0)
    arrays = light(curve(0.0 * t, t), curve(0.0 * t, t + 5.0, seed=6, level=7.15))
    second = np.arange(arrays.mag.size) % 2 == 1
    arrays = replace(arrays, photometric_system=np.where(second, "Two", "One"))
    found = find_in(record(), arrays)
    assert found.episodes == ()
    assert len(found.levels) == 2
    assert any("photometric systems (One, Two)" in warning for warning in found.warnings)


def test_confirmed_episodes_that_overlap_are_told():
    t = times(0.0, 1500.0, 12.0)
    doubled = record(known(1, START + 600.0, START + 800.0), known(2, START + 700.0, START + 900.0))
    found = find_in(doubled, light(curve(burst(t, START + 600.0), t)))
    assert any("Confirmed episodes 1 and 2 overlap" in warning for warning in found.warnings)
    assert overlap_warnings(record(known(1, 0.0, 10.0), known(2, 20.0, 30.0))) == ()


def test_doubtful_points_are_left_out_and_counted():
    t = times(0.0, 1500.0, 12.0)
    arrays = light(curve(0.0 * t, t))
    quality = arrays.quality.astype("<U8")
    quality[:3] = "doubtful"
    found = find_in(record(), replace(arrays, quality=quality))
    assert (found.left_out, found.measured) == (3, t.size - 3)


def test_an_episode_of_the_catalogue_is_recognised_whatever_its_state():
    t = times(0.0, 1500.0, 12.0)
    arrays = light(curve(burst(t, START + 600.0), t))
    for state in ("confirmed", "proposed", "rejected"):
        (one,) = find_in(record(known(7, START + 610.0, START + 730.0, state)), arrays).episodes
        assert (one.known.id, one.known.state) == (7, state)


# ------------------------------------------------------------------------------------ the sample campaign


@pytest.fixture(scope="module")
def sampled():
    """Each found episode of the sample beside the true cycle it is of."""
    sample = load_sample()
    truths = {system.system_id: system for system in sample.truth.systems}
    pairs = []
    for one in sample.records:
        arrays = sample.photometry.get(one.system.id)
        if arrays is None:
            continue
        cycles = [cycle for cycle in truths[one.system.id].cycles if cycle.onset_bmjd_tdb is not None]
        for episode in find_in(one, arrays).episodes:
            near = [
                c
                for c in cycles
                if c.onset_bmjd_tdb - 60 < episode.first_bright_bmjd_tdb < c.end_bmjd_tdb + 250
            ]
            pairs.append((episode, near[0] if near else None, truths[one.system.id], arrays))
    return pairs


def test_every_episode_found_in_the_sample_is_a_true_one(sampled):
    assert len(sampled) >= 35
    assert all(cycle is not None for _, cycle, _, _ in sampled)


def test_the_true_onsets_and_ends_of_the_sample_lie_in_their_intervals(sampled):
    for dated, share68, share95 in (("onset", 0.68, 0.95), ("end", 0.68, 0.95)):
        hits = []
        for episode, cycle, _, _ in sampled:
            date = getattr(episode, dated)
            if date is None or (dated == "end" and not date.told):
                continue
            truth = getattr(cycle, f"{dated}_bmjd_tdb")
            q = date.bmjd_tdb
            hits.append((q.lo68 <= truth <= q.hi68, inside(q, truth), inside(q, truth, widened=2.0)))
        right68, right95, right = np.array(hits).mean(axis=0)
        count = len(hits)
        assert count >= 25
        # Not fewer than three sigma below the nominal share, and none far out.
        assert right68 > share68 - 3.0 * np.sqrt(share68 * (1.0 - share68) / count)
        assert right95 > share95 - 3.0 * np.sqrt(share95 * (1.0 - share95) / count)
        assert right > 0.96


def test_the_true_maxima_of_the_sample_in_k_lie_in_their_intervals(sampled):
    hits = []
    for episode, cycle, _, _ in sampled:
        hits += [
            inside(maximum.date.bmjd_tdb, cycle.maximum_bmjd_tdb)
            for maximum in episode.maxima
            if maximum.date.band == "K" and maximum.reached and maximum.date.told
        ]
    assert len(hits) >= 25
    assert np.mean(hits) > 0.95 - 3.0 * np.sqrt(0.95 * 0.05 / len(hits))


def test_the_well_watched_episodes_of_the_sample_are_found(sampled):
    """Those with ten or more K points between onset and end; the sample has nearly forty episodes in all."""
    found = {(truth.name, cycle.cycle) for _, cycle, truth, _ in sampled}
    seen = {}
    for _, _, truth, arrays in sampled:
        k = arrays.bmjd_tdb[(arrays.band == "K") & (arrays.quality == "good")]
        for cycle in truth.cycles:
            if cycle.onset_bmjd_tdb is not None:
                watched = (k > cycle.onset_bmjd_tdb) & (k < cycle.end_bmjd_tdb)
                seen[truth.name, cycle.cycle] = int(watched.sum())
    missing = [key for key, points in seen.items() if points >= 10 and key not in found]
    assert missing == []
