"""How errors reach a date: unknown is never zero, asymmetric keeps its median, covariances add up.

Statements of the DEVELOPERS.md; numbers by scipy.stats and by hand.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import optimize, stats
from studies_examples import (
    NOW,
    dates,
    episode,
    exact,
    find,
    lag_rule,
    moment,
    record,
    separation_rule,
    solution,
    upcoming,
)

from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.systems import DustRule, Star

DUST = {"onset", "maximum", "end"}
SKY = {"A in front", "B in front"}
ALL = {"periastron"} | DUST | SKY


def known(value, error):
    return Measured(value, error, error)


def rich_orbit(**fields):
    """Periastron of cycle 1 at 61 300, with every element that a date can need."""
    return solution(
        3_000.0, 58_300.0, eccentricity=known(0.6, 0.01), omega_deg=known(70.0, 3.0), omega_of="A", **fields
    )


def window_rule(**fields):
    return separation_rule(
        known(7.0, 0.2),
        **{"condensation_distance_au": known(100.0, 10.0), "flow_speed_kms": known(2_000.0, 100.0), **fields},
    )


def intervals(result):
    """Events of cycle 1 with an interval, and those with a bare median."""
    first = [e for e in result.events if e.cycle == 1 and e.bmjd_tdb is not None]
    with_interval = {e.event for e in first if e.bmjd_tdb.sigma_d is not None}
    for e in first:
        q = e.bmjd_tdb
        if e.event not in with_interval:
            assert (q.lo68, q.hi68, q.lo95, q.hi95) == (None,) * 4
            assert e.probability_in_window is None
            assert any(note.startswith("error unknown") for note in e.notes)
        else:
            assert e.probability_in_window is not None
            assert not any("error unknown" in note for note in e.notes)
    return with_interval, {e.event for e in first} - with_interval


def first_cycle(*arguments, **options):
    """Events of cycle 1, also those before periastron."""
    return upcoming(record(*arguments, **options), start=59_800.0, draws=2_000)


def blind(measured):
    return Measured(measured.value)


SEPARATION_CASES = {
    "epoch": ALL,
    "period_d": ALL,
    "eccentricity": ALL - {"periastron"},
    "omega_deg": SKY,
    "a_au": DUST,
    "critical_separation_au": DUST,
    "condensation_distance_au": DUST,
    "flow_speed_kms": DUST,
}


def without(orbit, rule, name):
    if name == "epoch":
        return replace(orbit, epoch=moment(orbit.epoch.bmjd_tdb, None)), rule
    if hasattr(orbit, name) and getattr(orbit, name) is not None:
        return replace(orbit, **{name: blind(getattr(orbit, name))}), rule
    return orbit, replace(rule, **{name: blind(getattr(rule, name))})


@pytest.mark.parametrize("name", SEPARATION_CASES)
def test_an_unknown_error_takes_the_interval_from_exactly_the_events_that_need_it(name):
    orbit, rule = rich_orbit(a_au=known(11.0, 0.2)), window_rule()
    complete, bare = intervals(first_cycle(orbit, rule=rule))
    assert (complete, bare) == (ALL, set())
    bad_orbit, bad_rule = without(orbit, rule, name)
    known_ones, unknown_ones = intervals(first_cycle(bad_orbit, rule=bad_rule))
    assert unknown_ones == SEPARATION_CASES[name]
    assert known_ones == ALL - SEPARATION_CASES[name]


@pytest.mark.parametrize("minus_known", [True, False])
def test_half_an_error_is_not_an_error(minus_known):
    half = Measured(0.6, 0.01, None) if minus_known else Measured(0.6, None, 0.01)
    orbit = replace(rich_orbit(a_au=known(11.0, 0.2)), eccentricity=half)
    _, bare = intervals(first_cycle(orbit, rule=window_rule()))
    assert bare == ALL - {"periastron"}


@pytest.mark.parametrize("stage", sorted(DUST))
def test_the_error_of_one_offset_matters_to_its_own_event_alone(stage):
    rule = DustRule(
        1, 1, "lag", onset=known(-40.0, 5.0), maximum=known(60.0, 5.0), end=known(200.0, 9.0)
    )  # fmt: skip
    rule = replace(rule, **{stage: blind(getattr(rule, stage))})
    _, bare = intervals(first_cycle(rich_orbit(), rule=rule))
    assert bare == {stage}


def test_a_lag_given_for_the_maximum_frees_it_from_the_delay():
    rule = window_rule(maximum_lag_d=known(50.0, 4.0), flow_speed_kms=Measured(2_000.0))
    _, bare = intervals(first_cycle(rich_orbit(a_au=known(11.0, 0.2)), rule=rule))
    assert bare == {"onset", "end"}
    rule = window_rule(maximum_lag_d=Measured(50.0))
    _, bare = intervals(first_cycle(rich_orbit(a_au=known(11.0, 0.2)), rule=rule))
    assert bare == {"maximum"}


SIZES = {
    "angle and distance": {"a_arcsec": known(0.0055, 0.0001), "distance_pc": known(2_000.0, 40.0)},
    "velocities": {
        "k_a_kms": known(26.0, 0.5),
        "k_b_kms": known(9.0, 0.3),
        "inclination_deg": known(62.0, 2.0),
    },
    "masses": {"star_a": known(12.0, 0.5), "star_b": known(25.0, 0.8)},
}


@pytest.mark.parametrize(("way", "name"), [(way, name) for way, names in SIZES.items() for name in names])
def test_each_quantity_behind_the_size_of_the_orbit_needs_its_error(way, name):
    def forecast(given):
        of_system = {k: v for k, v in given.items() if k == "distance_pc"}
        for star in ("star_a", "star_b"):
            if star in given:
                of_system[star] = Star(star[-1].upper(), mass_msun=given[star])
        of_orbit = {k: v for k, v in given.items() if k not in of_system and not k.startswith("star")}
        one = record(rich_orbit(**of_orbit), rule=window_rule(), **of_system)
        return intervals(upcoming(one, start=59_800.0, draws=2_000))

    given = SIZES[way]
    assert forecast(given) == (ALL, set())
    assert forecast({**given, name: blind(given[name])})[1] == DUST


def test_a_conjunction_marked_by_the_epoch_needs_no_errors_of_e_and_omega():
    one = rich_orbit(epoch_marks="A in front")
    one = replace(one, omega_deg=blind(one.omega_deg), eccentricity=blind(one.eccentricity))
    _, bare = intervals(first_cycle(one))
    assert bare == {"periastron", "B in front"}


def test_the_error_of_the_period_is_not_needed_in_the_cycle_of_the_epoch():
    one = replace(rich_orbit(), period_d=Measured(3_000.0), epoch=moment(61_300.0, 5.0), epoch_cycle=1)
    rule = lag_rule(known(-40.0, 5.0), None, None)
    with_interval, bare = intervals(first_cycle(one, rule=rule))
    assert with_interval == {"periastron", "onset"}
    assert bare == SKY  # their distance from periastron is a share of the period


def test_an_observed_onset_without_an_error_gives_what_follows_no_interval():
    seen = episode(1, 60_950.0, error_d=None)
    rule = DustRule(1, 1, "lag", onset=known(-40.0, 5.0), maximum=known(60.0, 5.0), end=known(200.0, 9.0))
    result = first_cycle(rich_orbit(), rule=rule, episodes=[seen])
    _, bare = intervals(result)
    assert {"onset", "maximum", "end"} <= bare
    assert find(result, "end", 1).bmjd_tdb.median == pytest.approx(60_950.0 + 240.0, abs=0.5)


def test_an_end_counted_from_an_observed_onset_still_needs_the_error_of_its_offset():
    seen = episode(1, 60_950.0)
    rule = DustRule(1, 1, "lag", onset=known(-40.0, 5.0), maximum=known(60.0, 5.0), end=Measured(200.0))
    with_interval, bare = intervals(first_cycle(rich_orbit(), rule=rule, episodes=[seen]))
    assert bare == {"end"}
    assert {"onset", "maximum"} <= with_interval


def test_an_end_counted_from_an_observed_onset_no_longer_needs_the_error_of_the_epoch():
    seen = episode(1, 60_950.0)
    orbit = replace(rich_orbit(), epoch=moment(58_300.0, None), period_d=Measured(3_000.0))
    rule = DustRule(1, 1, "lag", onset=known(-40.0, 5.0), maximum=known(60.0, 5.0), end=known(200.0, 9.0))
    with_interval, _ = intervals(first_cycle(orbit, rule=rule, episodes=[seen]))
    assert with_interval == DUST


# --------------------------------------------------------------------------- asymmetric errors


@given(
    minus=st.floats(0.5, 40.0),
    plus=st.floats(0.5, 40.0),
    cycles=st.integers(1, 3),
    what=st.sampled_from(["P", "T"]),
)
@settings(max_examples=20, deadline=None)
def test_an_asymmetric_error_keeps_the_stated_value_as_median(minus, plus, cycles, what):
    one = solution(exact(3_000.0), 61_300.0 - cycles * 3_000.0, epoch_error=0.0)
    step = cycles if what == "P" else 1
    if what == "P":
        one = replace(one, period_d=Measured(3_000.0, minus, plus))
    else:
        one = replace(one, epoch=replace(one.epoch, minus_d=minus, plus_d=plus))
    median, sigma, low68, high68, low95, high95 = dates(find(upcoming(record(one)), "periastron", cycles))
    size = step * max(minus, plus)
    assert median == pytest.approx(61_300.0, abs=0.002 * size)
    # Half of a normal on each side, each with its own width.
    for bound, share in ((low68, 0.16), (low95, 0.025), (high68, 0.84), (high95, 0.975)):
        width = step * (minus if share < 0.5 else plus)
        assert bound - 61_300.0 == pytest.approx(width * stats.norm.ppf(share), abs=0.02 * width)
    # Standard deviation of the two halves about their mean: textbook moments of a half-normal.
    second = 0.5 * (minus**2 + plus**2)
    mean = (plus - minus) / math.sqrt(2.0 * math.pi)
    assert sigma == pytest.approx(step * math.sqrt(second - mean**2), rel=0.01)


def test_an_asymmetric_offset_of_the_onset_skews_the_onset_alone():
    rule = DustRule(1, 1, "lag", onset=Measured(-40.0, 30.0, 5.0), maximum=known(60.0, 5.0))
    one = solution(exact(3_000.0), 58_300.0, epoch_error=0.0)
    result = upcoming(record(one, rule=rule))
    median, _, low68, high68, *_ = dates(find(result, "onset", 1))
    assert (median, low68, high68) == pytest.approx(
        (61_260.0, 61_260.0 - 30.0 * 0.99446, 61_260.0 + 5.0 * 0.99446), abs=0.3
    )
    median, _, low68, high68, *_ = dates(find(result, "maximum", 1))
    assert high68 - median == pytest.approx(median - low68, rel=1e-6)


# --------------------------------------------------------------------------- several solutions


def pooled(components, weights, share):
    def cumulative(x):
        return sum(w * stats.norm.cdf(x, m, s) for w, (m, s) in zip(weights, components, strict=True)) - share

    return optimize.brentq(cumulative, 50_000.0, 70_000.0)


@pytest.mark.parametrize("apart", [0.0, 60.0, 300.0])
@pytest.mark.parametrize("weights", [(0.6, 0.4), (3.0, 2.0)])
def test_weighted_solutions_are_forecast_as_their_pooled_normals(apart, weights):
    first = solution(3_000.0, 58_300.0, period_error=12.0, epoch_error=9.0, label="one", weight=weights[0])
    second = solution(
        3_000.0, 58_300.0 + apart, period_error=30.0, epoch_error=16.0, label="two", id=2, weight=weights[1]
    )
    found = find(upcoming(record(first, second)), "periastron", 1)
    components = [(61_300.0, 15.0), (61_300.0 + apart, 34.0)]
    median, sigma, low68, high68, low95, high95 = dates(found)
    for bound, share in ((median, 0.5), (low68, 0.16), (high68, 0.84), (low95, 0.025), (high95, 0.975)):
        expected = pooled(components, (0.6, 0.4), share)
        # Draws of a mixture: a few hundredths of its own width, wider where the two leave a gap.
        slope = sum(
            w * stats.norm.pdf(expected, m, s) for w, (m, s) in zip((0.6, 0.4), components, strict=True)
        )
        assert bound == pytest.approx(expected, abs=4.0 * math.sqrt(share * (1 - share) / 20_000) / slope)
    variance = 0.6 * 15.0**2 + 0.4 * 34.0**2 + 0.24 * apart**2
    assert sigma == pytest.approx(math.sqrt(variance), rel=0.02)
    assert any("mixture of 2 solutions with weights 0.6, 0.4" in note for note in found.notes)


def test_the_disagreement_of_weighted_solutions_is_told_in_sigma():
    first = solution(3_000.0, 58_300.0, period_error=12.0, epoch_error=9.0, label="one", weight=0.6)
    second = solution(3_000.0, 58_450.0, period_error=30.0, epoch_error=16.0, label="two", id=2, weight=0.4)
    found = find(upcoming(record(first, second)), "periastron", 1)
    assert found.disagreement_sigma == pytest.approx(150.0 / math.hypot(15.0, 34.0), rel=0.02)


def test_a_solution_that_dates_an_event_alone_speaks_for_it_alone():
    first = solution(3_000.0, 58_300.0, label="one", weight=0.6)
    second = replace(rich_orbit(), label="two", id=2, weight=0.4)
    both = find(first_cycle(first, second), "A in front", 1)
    alone = find(first_cycle(replace(second, weight=None)), "A in front", 1)
    assert dates(both) == pytest.approx(dates(alone), rel=0, abs=0.2 * dates(alone)[1])
    assert both.disagreement_sigma is None
    assert any("from 'two' alone" in note for note in both.notes)
    assert not any("mixture" in note for note in both.notes)


# --------------------------------------------------------------------------- covariance, period ranges


@given(
    sigma_t=st.floats(0.5, 40.0),
    sigma_p=st.floats(0.1, 20.0),
    correlation=st.floats(-0.95, 0.95),
    cycles=st.integers(-2, 5),
)
@settings(max_examples=40, deadline=None)
def test_the_variance_of_a_date_is_that_of_the_straight_line(sigma_t, sigma_p, correlation, cycles):
    both = correlation * sigma_t * sigma_p
    covariance = Covariance(("epoch", "period_d"), ((sigma_t**2, both), (both, sigma_p**2)))
    one = solution(
        3_000.0, 61_300.0 - cycles * 3_000.0, period_error=sigma_p, epoch_error=sigma_t, covariance=covariance
    )
    found = find(upcoming(record(one), start=61_000.0, now=61_000.0), "periastron", cycles)
    expected = math.sqrt(sigma_t**2 + cycles**2 * sigma_p**2 + 2.0 * cycles * both)
    assert found.bmjd_tdb.sigma_d == pytest.approx(expected, rel=1e-9, abs=1e-9)
    assert found.bmjd_tdb.hi95 - found.bmjd_tdb.median == pytest.approx(1.959964 * expected, rel=1e-6)


def test_correlated_elements_correlate_in_drawn_dates_too():
    # Conjunctions are drawn: with e and omega exact their error is that of epoch and period, correlated.
    covariance = Covariance(("period_d", "epoch"), ((100.0, -90.0), (-90.0, 100.0)))
    one = solution(
        3_000.0, 58_300.0, period_error=10.0, epoch_error=10.0, covariance=covariance,
        eccentricity=exact(0.3), omega_deg=exact(90.0), omega_of="B",
    )  # fmt: skip
    found = find(upcoming(record(one)), "A in front", 1)  # at periastron
    assert found.bmjd_tdb.sigma_d == pytest.approx(math.sqrt(20.0), rel=0.02)


def test_a_period_known_as_a_range_gives_an_even_spread():
    one = solution(Range(2_900.0, 3_100.0), 58_300.0, epoch_error=0.0)
    median, sigma, low68, high68, low95, high95 = dates(find(upcoming(record(one)), "periastron", 1))
    assert (median, sigma) == pytest.approx((61_300.0, 200.0 / math.sqrt(12.0)), abs=0.1)
    assert (low68, high68, low95, high95) == pytest.approx(
        (61_200.0 + 32.0, 61_200.0 + 168.0, 61_200.0 + 5.0, 61_200.0 + 195.0), abs=0.2
    )


# --------------------------------------------------------------------------- phase lost


@pytest.mark.parametrize(("factor", "lost"), [(0.999_999, False), (1.000_001, True)])
def test_the_phase_is_lost_exactly_where_three_sigma_reach_half_a_period(factor, lost):
    # 3 sigma = P/2 at the second cycle: sigma_T = 300 d, sigma_P = 200 d, P = 3 000 d.
    one = solution(
        3_000.0, 55_300.0, period_error=200.0 * factor, epoch_error=300.0 * factor, eccentricity=exact(0.4)
    )
    found = find(upcoming(record(one), years=4, start=60_000.0, now=60_000.0), "periastron")
    assert 3.0 * math.hypot(300.0, 2 * 200.0) == 1_500.0
    assert found.phase_lost is lost
    if lost:
        assert found.bmjd_tdb is None and found.utc is None and found.status == "phase lost"
        assert found.probability_per_yr == pytest.approx(365.25 / 3_000.0)
        assert any("phase is lost" in note for note in found.notes)
    else:
        assert found.bmjd_tdb.median == pytest.approx(61_300.0)


def test_a_lost_phase_tells_how_likely_the_event_is_in_the_window():
    # Whatever the phase, a window of a third of a period holds the event with probability one third.
    one = solution(3_000.0, 40_000.0, period_error=300.0)
    found = find(upcoming(record(one), years=1_000.0 / 365.25), "periastron")
    assert found.probability_in_window == pytest.approx(1.0 / 3.0)


@pytest.mark.parametrize(("start_yr", "end_yr"), [(0.0, 10.0), (5.0, 10.0), (20.0, 30.0)])
def test_a_lower_limit_of_the_period_gives_the_scale_free_chance_of_the_window(start_yr, end_yr):
    # P(period > p) = limit/p beyond the limit (Gott 1993); 40 quiet years have passed, the limit is 32 yr.
    since = 40.0
    one = solution(Limit(32.0 * 365.25, "above"), NOW - since * 365.25, epoch_marks="onset")
    result = upcoming(record(one), start=NOW + start_yr * 365.25, end=NOW + end_yr * 365.25)
    (found,) = result.events
    expected = since / (since + start_yr) - since / (since + end_yr)
    assert found.probability_in_window == pytest.approx(expected, rel=1e-9)
    assert found.probability_per_yr == pytest.approx(1.0 - since / (since + 1.0), rel=1e-9)


def test_before_its_lower_limit_nothing_recurs():
    one = solution(Limit(32.0 * 365.25, "above"), NOW - 20.0 * 365.25, epoch_marks="onset")
    (found,) = upcoming(record(one), years=10.0).events
    assert found.probability_in_window == 0.0
    assert any(note.startswith("not before") for note in found.notes)


def test_certain_dates_lie_in_or_out_of_the_window():
    one = solution(exact(3_000.0), 61_300.0, epoch_error=0.0)
    found = find(upcoming(record(one), start=60_000.0, end=66_000.0), "periastron", 1)
    assert (found.probability, found.probability_in_window) == (1.0, 1.0)


def test_the_probability_in_the_window_is_that_of_the_normal():
    one = solution(3_000.0, 58_300.0, period_error=30.0, epoch_error=40.0)
    found = find(upcoming(record(one), start=61_250.0, end=61_330.0, now=61_250.0), "periastron", 1)
    assert found.probability_in_window == pytest.approx(
        stats.norm.cdf(30.0 / 50.0) - stats.norm.cdf(-50.0 / 50.0), abs=1e-9
    )
    kept = upcoming(record(one), start=61_250.0, end=61_330.0, min_probability=0.5).events
    assert [e.event for e in kept] == ["periastron"]
    assert not upcoming(record(one), start=61_250.0, end=61_330.0, min_probability=0.6).events


def test_the_scatter_from_cycle_to_cycle_adds_to_the_onset_alone():
    one = solution(exact(3_000.0), 58_300.0, epoch_error=3.0)
    rule = lag_rule(known(-40.0, 4.0), 60.0, 200.0, scatter_onset_d=12.0)
    result = upcoming(record(one, rule=rule))
    sigmas = [find(result, e, 1).bmjd_tdb.sigma_d for e in ("onset", "maximum", "end")]
    assert sigmas == pytest.approx([13.0, 3.0, 3.0], rel=1e-9)
    assert not any("no cycle-to-cycle scatter" in text for text in result.assumptions)
    plain = upcoming(record(one, rule=lag_rule()))
    assert any("no cycle-to-cycle scatter stated" in text for text in plain.assumptions)


def test_intervals_nest_and_are_ordered():
    result = upcoming(record(rich_orbit(a_au=known(11.0, 0.2)), rule=window_rule()))
    for event in result.events:
        median, sigma, low68, high68, low95, high95 = dates(event)
        assert low95 < low68 < median < high68 < high95
        assert sigma > 0 and np.isfinite(sigma)
