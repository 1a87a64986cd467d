"""The explanation of a forecast: its sum leads to the date, its terms to the error, and nothing is hidden.

Sums of squares are the textbook propagation of errors; dates are compared with those of the forecast itself.
"""

from __future__ import annotations

import math
import re

import numpy as np
import pytest
from studies_examples import (
    CLOCK,
    YEAR_D,
    episode,
    exact,
    find,
    lag_rule,
    quiet_curve,
    record,
    separation_rule,
    solution,
)

from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.systems import DustRule
from campaign.studies import watch
from campaign.studies.explain import explain_system
from campaign.studies.sample import load_sample
from campaign.studies.upcoming import Question


def known(value, error):
    return Measured(value, error, error)


def explained(one, now=61_000.0, years=12.0, start=None, photometry=None):
    first = now if start is None else start
    return explain_system(one, photometry or {}, Question(now, first, now + years * YEAR_D))


def event_of(told, event, cycle):
    (found,) = [e for e in told.events if e.forecast.event == event and e.forecast.cycle == cycle]
    return found


def signed_square_sum(terms):
    return sum(math.copysign(term.size_d**2, term.size_d) for term in terms)


def sample_names():
    return [
        r.system.name
        for r in load_sample().records
        if r.system.state == "episodic" and (r.solutions or r.episodes)
    ]


@pytest.mark.parametrize("name", sample_names())
def test_the_squares_of_the_terms_sum_to_the_variance(name):
    campaign = watch.load_sample_campaign([name])
    asked = {
        "now": CLOCK, "as_of": None, "start": None, "end": None, "within_d": 9 * YEAR_D, "events": (),
        "min_probability": 0.0, "draws": None, "seed": None, "solutions": "adopted",
    }  # fmt: skip
    told = watch.explain(campaign, watch.ask(campaign, **asked))
    assert told.system == name
    for event in told.events:
        # The terms are those of the elements, before any quiet observations.
        told = event.forecast.conditioning
        sigma = (event.forecast.bmjd_tdb if told is None else told.before).sigma_d
        if sigma is None:
            assert any(math.isnan(term.size_d) and term.note == "error unknown" for term in event.terms)
            continue
        assert signed_square_sum(event.terms) == pytest.approx(sigma**2, rel=0.03), event.forecast.event
        assert all(term.cause for term in event.terms)


@pytest.mark.parametrize("name", ["Kettle 7", "Thistle 2", "Candlewood 5", "Bellows 5"])
def test_the_sum_in_words_leads_to_the_date(name):
    campaign = watch.load_sample_campaign([name])
    asked = {
        "now": CLOCK, "as_of": None, "start": None, "end": None, "within_d": 6 * YEAR_D, "events": (),
        "min_probability": 0.0, "draws": None, "seed": None, "solutions": "adopted",
    }  # fmt: skip
    for event in watch.explain(campaign, watch.ask(campaign, **asked)).events:
        if event.forecast.observed:
            assert event.arithmetic == "observed"
            continue
        numbers = [
            float(x)
            for x in re.findall(
                r"(?<![\w(])[+-]? ?\d+\.\d+", event.arithmetic.replace("- ", "-").replace("+ ", "+")
            )
        ]
        q = event.forecast.bmjd_tdb
        # The median of the draws may lie aside of the nominal sum by a share of its error, not more.
        assert numbers[-1] == pytest.approx(q.median, abs=0.25 * q.sigma_d)
        if event.arithmetic.startswith("T(") and event.forecast.event == "periastron":
            t0, period, total = numbers[:3]
            step = int(re.search(r"[+-] (\d+) P", event.arithmetic)[1])
            assert t0 + step * period == pytest.approx(total, abs=0.001)


def test_each_term_is_the_error_that_its_input_alone_would_make():
    one = solution(3_000.0, 55_300.0, period_error=4.0, epoch_error=6.0)
    rule = lag_rule(known(-40.0, 5.0), scatter_onset_d=9.0)
    told = explained(record(one, rule=rule), start=60_000.0)
    sizes = {term.cause: term.size_d for term in event_of(told, "onset", 2).terms}
    assert sizes == pytest.approx(
        {"epoch": 6.0, "period": 8.0, "onset offset": 5.0, "cycle-to-cycle scatter": 9.0}, rel=0.01
    )
    (period,) = [t for t in event_of(told, "onset", 2).terms if t.cause == "period"]
    assert period.note == "times 2"


@pytest.mark.parametrize("correlation", [-0.8, 0.5])
def test_a_covariance_is_a_term_with_its_sign(correlation):
    both = correlation * 24.0
    one = solution(
        3_000.0, 55_300.0, period_error=4.0, epoch_error=6.0,
        covariance=Covariance(("epoch", "period_d"), ((36.0, both), (both, 16.0))),
    )  # fmt: skip
    told = event_of(explained(record(one), start=60_000.0), "periastron", 2)
    (term,) = [t for t in told.terms if "covariance" in t.cause]
    # 2 k cov, with its sign.
    assert math.copysign(term.size_d**2, term.size_d) == pytest.approx(4.0 * both, rel=1e-9)
    assert signed_square_sum(told.terms) == pytest.approx(36.0 + 4 * 16.0 + 4.0 * both, rel=0.03)


def test_a_missing_error_is_named_and_has_no_size():
    one = solution(3_000.0, 58_300.0, period_error=4.0, epoch_error=None)
    told = event_of(explained(record(one)), "periastron", 1)
    (term,) = [t for t in told.terms if math.isnan(t.size_d)]
    assert (term.cause, term.note) == ("epoch", "error unknown")
    assert told.forecast.bmjd_tdb.sigma_d is None


def test_what_one_by_one_does_not_explain_is_said():
    # Grazing: the window is a strongly bent function of three inputs.
    one = solution(
        3_000.0,
        58_300.0,
        eccentricity=known(0.5, 0.03),
        a_au=known(12.0, 0.5),
        period_error=1.0,
        epoch_error=1.0,
    )
    told = event_of(explained(record(one, rule=separation_rule(known(6.1, 0.3))), start=60_000.0), "onset", 1)
    assert any(t.cause == "together rather than one by one" for t in told.terms)
    assert signed_square_sum(told.terms) == pytest.approx(told.forecast.bmjd_tdb.sigma_d**2, rel=0.03)


def test_two_solutions_differ_between_and_within():
    first = solution(3_000.0, 58_300.0, period_error=12.0, epoch_error=9.0, label="one", weight=0.6)
    second = solution(3_000.0, 58_500.0, period_error=30.0, epoch_error=16.0, label="two", id=2, weight=0.4)
    told = event_of(explained(record(first, second)), "periastron", 1)
    sizes = {term.cause: term.size_d for term in told.terms}
    # Law of total variance, by hand.
    assert sizes["between the solutions"] == pytest.approx(math.sqrt(0.24) * 200.0, rel=1e-6)
    assert sizes["within the solutions"] == pytest.approx(math.sqrt(0.6 * 225.0 + 0.4 * 34.0**2), rel=0.01)
    assert "one (0.6)" in told.arithmetic and "two (0.4)" in told.arithmetic


def test_an_episode_under_way_is_counted_from_its_observed_onset():
    one = solution(3_000.0, 58_000.0, period_error=40.0, epoch_error=30.0)
    rule = DustRule(1, 1, "lag", onset=known(-40.0, 3.0), maximum=known(60.0, 4.0), end=known(200.0, 12.0))
    told = explained(record(one, rule=rule, episodes=[episode(1, 60_980.0)]), start=60_900.0)
    end = event_of(told, "end", 1)
    assert end.arithmetic == "onset observed at 60980.000; end = onset +240.00 d (rule lag) = 61220.000"
    sizes = {term.cause: term.size_d for term in end.terms}
    assert sizes == pytest.approx(
        {"dating of the observed onset": 5.0, "onset offset": 3.0, "end offset": 12.0}, rel=0.01
    )
    onset = event_of(told, "onset", 1)
    assert onset.arithmetic == "observed" and [t.size_d for t in onset.terms] == pytest.approx(
        [5.0], rel=0.01
    )


def test_a_learned_rule_tells_how_many_dates_and_whether_a_prior_was_needed():
    rng = np.random.default_rng(1)
    many = [episode(k, 40_000.0 + 3_000.0 * k + 20.0 * rng.standard_normal(), error_d=2.0) for k in range(7)]
    told = event_of(explained(record(rule=DustRule(1, 1, "learned"), episodes=many)), "onset", 7)
    assert told.arithmetic == "line through 7 onset dates, carried to cycle 7"
    assert any("5 degrees of freedom" in term.note for term in told.terms)
    few = event_of(explained(record(rule=DustRule(1, 1, "learned"), episodes=many[-2:])), "onset", 7)
    assert any("with the stated prior" in term.note for term in few.terms)


def test_elements_are_told_with_their_errors_units_and_star():
    one = solution(
        Measured(3_000.0, 2.0, 3.0), 58_000.5, eccentricity=Measured(0.5),
        omega_deg=known(40.0, 2.0), omega_of="A", a_au=exact(11.0),
    )  # fmt: skip
    told = explained(record(one, rule=separation_rule(known(7.0, 0.2), scatter_onset_d=4.0)))
    lines = {name: (value, note) for name, value, note in told.elements}
    assert lines["period"] == ("3000 +3 -2 d", "8.2136 yr")
    assert lines["eccentricity"] == ("0.5 (error unknown)", "")
    assert lines["omega"] == ("40 ± 2 deg", "of star A")
    assert lines["critical separation"] == ("7 ± 0.2 au", "")
    assert lines["scatter of the onset"] == ("4 d", "cycle to cycle")
    assert lines["epoch (periastron)"][1] == "2017-09-04"  # MJD 58000 in any almanac


@pytest.mark.parametrize(
    ("period", "text"),
    [(Range(2_900.0, 3_100.0), "2900 to 3100 d"), (Limit(11_688.0, "above"), "> 11688 d")],
)
def test_a_period_that_is_no_value_is_told_as_it_is(period, text):
    told = explained(record(solution(period, 58_000.0)))
    assert dict((name, value) for name, value, _ in told.elements)["period"] == text


def test_the_count_of_cycles_is_told_with_the_published_one_and_its_safety():
    one = solution(3_000.0, 49_000.0, period_error=130.0, epoch_cycle=-3, published_cycle_offset=12)
    told = explained(record(one), start=58_000.0, years=0.5)
    text = "\n".join(told.cycle_count)
    assert "its epoch is cycle -3" in text
    assert "+12 ahead" in text
    assert "cycle 0: 3 periods after the epoch, count is safe" in text  # 3 x 390 d < 1500 d
    # Three sigma on the longer side reach half a period at the third cycle: 3 x 3 x 200 d > 1500 d.
    skewed = solution(Measured(3_000.0, 20.0, 200.0), 49_000.0, epoch_cycle=-3)
    told = explained(record(skewed), start=57_000.0, years=4.0)
    assert any("count may be off by one" in line for line in told.cycle_count)


def test_the_explanation_carries_the_forecast_itself():
    one = record(solution(), rule=lag_rule())
    told = explained(one, photometry={1: quiet_curve(59_000.0, 61_000.0)})
    assert {e.forecast for e in told.events} <= set(told.upcoming.events)
    assert find(told.upcoming, "periastron").system == told.system
    assert "no e and omega: conjunctions are not forecast" in told.notes
