"""What a forecast must not depend on: other systems, their order, the seed beyond the noise of its draws."""

from __future__ import annotations

import json
from dataclasses import asdict, replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from studies_examples import (
    CLOCK,
    YEAR_D,
    dates,
    episode,
    lag_rule,
    quiet_curve,
    record,
    separation_rule,
    solution,
    upcoming,
)

from campaign.model.measured import Covariance, Limit, Measured, Range
from campaign.model.systems import DustRule
from campaign.studies import watch


def known(value, error):
    return Measured(value, error, error)


def campaign_of_every_kind():
    """One system of each way to forecast."""
    rng = np.random.default_rng(8)
    sky = {"eccentricity": known(0.55, 0.05), "omega_deg": known(80.0, 5.0), "omega_of": "A"}
    learned = [episode(k, 45_000.0 + 3_100.0 * k + 30 * rng.standard_normal()) for k in range(5)]
    correlated = Covariance(("period_d", "epoch"), ((25.0, -20.0), (-20.0, 64.0)))
    return [
        record(solution(period_error=5.0, **sky), rule=lag_rule(known(-40.0, 6.0)), number=1, name="lag"),
        record(
            solution(2_500.0, 59_000.0, a_au=known(11.0, 0.4), **sky),
            rule=separation_rule(known(5.2, 0.4), scatter_onset_d=5.0), number=2, name="grazing",
        ),
        record(rule=DustRule(1, 1, "learned"), episodes=learned, number=3, name="learned"),
        record(
            solution(2_800.0, 58_000.0, label="one", weight=0.6),
            solution(2_830.0, 58_050.0, label="two", id=2, weight=0.4, **sky),
            rule=lag_rule(), number=4, name="mixture",
        ),
        record(solution(Range(2_600.0, 2_700.0), 58_500.0), number=5, name="range"),
        record(solution(Limit(11_000.0, "above"), 49_000.0, epoch_marks="onset"), number=6, name="limit"),
        record(
            solution(3_050.0, 58_200.0, period_error=5.0, epoch_error=8.0, covariance=correlated, **sky),
            number=7, name="correlated",
        ),
        record(solution(Measured(3_333.0, 4.0, 19.0), 58_321.0, **sky), number=8, name="skewed"),
        record(solution(3_000.0, 58_000.0, period_error=None, **sky), number=9, name="no error"),
    ]  # fmt: skip


RECORDS = campaign_of_every_kind()


def events_of(result, name):
    return [e for e in result.events if e.system == name]


@pytest.fixture(scope="module")
def together():
    return upcoming(*RECORDS, draws=3_000)


@pytest.mark.parametrize("one", RECORDS, ids=[r.system.name for r in RECORDS])
def test_a_forecast_is_the_same_alone_and_among_others(one, together):
    alone = upcoming(one, draws=3_000)
    assert events_of(alone, one.system.name) == events_of(together, one.system.name)
    assert [b for b in alone.bases] == [b for b in together.bases if b.system == one.system.name]
    assert alone.dust_windows == tuple(w for w in together.dust_windows if w.system == one.system.name)


@given(order=st.permutations(range(len(RECORDS))))
@settings(max_examples=10, deadline=None)
def test_the_order_of_the_systems_changes_nothing(order):
    first, second = upcoming(*RECORDS, draws=500), upcoming(*(RECORDS[i] for i in order), draws=500)
    for one in RECORDS:
        assert events_of(first, one.system.name) == events_of(second, one.system.name)


def test_an_unrelated_system_with_a_light_curve_and_other_errors_changes_nothing(together):
    covariance = Covariance(("epoch", "omega_deg"), ((25.0, 400.0), (400.0, 8_100.0)))
    sky = {"eccentricity": known(0.01, 0.02), "omega_deg": known(1.0, 90.0), "omega_of": "B"}
    stranger = record(
        solution(4_321.0, 57_000.0, period_error=300.0, covariance=covariance, **sky),
        rule=lag_rule(known(-1.0, 50.0)), number=77, name="stranger",
    )  # fmt: skip
    more = upcoming(stranger, *RECORDS, draws=3_000, photometry={77: quiet_curve(55_000.0, 61_000.0)})
    for one in RECORDS:
        assert events_of(more, one.system.name) == events_of(together, one.system.name)


def bytes_of(result):
    return json.dumps(asdict(result), sort_keys=True).encode()


def test_the_same_seed_gives_the_same_bytes():
    first, second = (upcoming(*RECORDS, draws=2_000, seed=5) for _ in range(2))
    assert bytes_of(first) == bytes_of(second)


def by_event(result):
    return {(e.system, e.event, e.cycle): e for e in result.events}


def with_intervals(first, second):
    for key, one in by_event(first).items():
        two = by_event(second)[key]
        assert one.status == two.status
        assert (one.probability is None) == (two.probability is None)
        if one.bmjd_tdb is not None and one.bmjd_tdb.sigma_d is not None:
            yield np.array(dates(one)), np.array(dates(two))


def test_another_seed_gives_nearly_the_same_dates():
    first, second = (upcoming(*RECORDS, draws=20_000, seed=seed) for seed in (1, 2))
    assert by_event(first).keys() == by_event(second).keys()
    moved = 0
    for one, two in with_intervals(first, second):
        # A few hundredths of the error; a mixture with two humps has the least certain bounds.
        assert np.abs(one - two).max() < 0.1 * one[1]
        moved += bool((one != two).any())
    assert moved > 10


def test_more_draws_lead_to_the_same_answer():
    few, many = (upcoming(*RECORDS, draws=draws) for draws in (2_000, 40_000))
    for one, two in with_intervals(few, many):
        assert np.abs(one - two).max() < 0.25 * two[1]


def test_what_is_listed_does_not_change_what_it_says(together):
    """Fewer events, a narrower window or a threshold leave the numbers of what remains alone."""
    whole = {(e.system, e.event, e.cycle): e for e in together.events}
    fewer = upcoming(*RECORDS, draws=3_000, events=("maximum", "B in front"))
    assert {e.event for e in fewer.events} <= {"maximum", "B in front"}
    assert all(whole[e.system, e.event, e.cycle] == e for e in fewer.events)
    narrow = upcoming(*RECORDS, draws=3_000, years=4)
    assert narrow.events
    for event in narrow.events:
        full = whole[event.system, event.event, event.cycle]
        assert replace(full, probability_in_window=None) == replace(event, probability_in_window=None)
    likely = upcoming(*RECORDS, draws=3_000, min_probability=0.5)
    assert {(e.system, e.event, e.cycle) for e in likely.events} == {
        key for key, e in whole.items() if e.probability_in_window is None or e.probability_in_window >= 0.5
    }


def test_the_clock_does_not_enter_a_forecast_of_the_sample():
    """Its own date stands in for today, whatever the clock says."""
    campaign = watch.load_sample_campaign(["Kettle 7", "Quill 9"])
    asked = {
        "as_of": None, "start": None, "end": None, "within_d": 5 * YEAR_D, "events": (),
        "min_probability": 0.0, "draws": 1_000, "seed": None, "solutions": "adopted",
    }  # fmt: skip
    first, second = (
        watch.upcoming(campaign, watch.ask(campaign, now=now, **asked))
        for now in (CLOCK, CLOCK.replace(year=2050))
    )
    assert bytes_of(first) == bytes_of(second)
