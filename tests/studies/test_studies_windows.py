"""Probability of dust through time, and facts of the trade about when dust is made.

"Common practice, no source" marks what everybody in the field knows.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from studies_examples import episode, exact, find, lag_rule, record, separation_rule, solution, upcoming

from campaign.errors import InputRefused
from campaign.model.measured import Measured
from campaign.reading.values import read_measured

LIGHT_KMS = 299_792.458  # SI


def known(value, error):
    return Measured(value, error, error)


def eccentric(e=0.8, **fields):
    return solution(
        exact(3_689.025), 61_500.0, epoch_error=0.0, eccentricity=exact(e), a_au=exact(16.0), **fields
    )


def curve(result, system="Lantern 3"):
    (window,) = [w for w in result.dust_windows if w.system == system]
    return np.array(window.bmjd_tdb), np.array(window.probability)


def test_dust_is_made_as_the_pair_nears_and_leaves_periastron_and_not_in_the_rest_of_the_orbit():
    # Common practice, no source.
    result = upcoming(
        record(eccentric(), rule=separation_rule(6.4)), now=60_900.0, start=60_500.0, end=65_400.0
    )
    times, probability = curve(result)
    phase = (times - 61_500.0) / 3_689.025
    phase -= np.round(phase)
    assert (probability[np.abs(phase) > 0.05] == 0.0).all()
    near = np.abs(phase) < 0.02
    assert near.any() and (probability[near] > 0.95).all()
    onset, end = (find(result, event, 0).bmjd_tdb.median for event in ("onset", "end"))
    assert onset < 61_500.0 < end
    assert (end - onset) / 3_689.025 < 0.1


@pytest.mark.parametrize("e", [0.3, 0.5, 0.8, 0.95])
def test_no_dust_at_apastron(e):
    # Common practice, no source: the critical separation set half-way between periastron and the mean.
    rule = separation_rule(16.0 * (1.0 - e) * 1.3)
    result = upcoming(record(eccentric(e), rule=rule), now=61_000.0, start=60_500.0, end=65_400.0)
    times, probability = curve(result)
    apastron = np.abs(np.abs((times - 61_500.0) / 3_689.025) - 0.5) < 0.03
    assert apastron.any()
    assert (probability[apastron] == 0.0).all()


def test_winds_near_one_percent_of_the_speed_of_light_are_thousands_of_km_per_second():
    # Common practice, no source.
    assert abs(0.01 * LIGHT_KMS - 3_000.0) < 3.0
    speed = read_measured("3000±100 km/s", "kms", "--wind-speed-a", low=0.0, high=LIGHT_KMS)
    assert speed == Measured(3_000.0, 100.0, 100.0)
    # At that speed the wind needs two months for the 100 au to where dust condenses.
    one = record(
        eccentric(),
        rule=separation_rule(6.4, condensation_distance_au=exact(100.0), flow_speed_kms=exact(3_000.0)),
    )
    result = upcoming(one, now=61_000.0)
    delay = find(result, "maximum", 0).bmjd_tdb.median - 61_500.0
    assert delay == pytest.approx(57.715, abs=0.001)  # checks_forecast.csv, dust.onset_delay


@pytest.mark.parametrize("text", ["300000 km/s", "299792.459 km/s", "3e8 km/s", "-20 km/s", "0 km/s"])
def test_a_wind_faster_than_light_or_standing_still_is_refused(text, run_campaign):
    assert run_campaign("begin").status == 0
    assert run_campaign("system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30").status == 0
    for words in (
        ("system", "change", "Lantern 3", "--wind-speed-a", text),
        ("rule", "set", "Lantern 3", "--separation", "6.4 au", "--condensation-distance", "100 au",
         "--flow-speed", text),
    ):  # fmt: skip
        refused = run_campaign(*words)
        assert refused.status == InputRefused.exit_status
        assert len(refused.err.strip().splitlines()) == 3
        assert "km/s" in refused.err


def test_a_wind_of_thousands_of_km_per_second_is_kept(run_campaign):
    assert run_campaign("begin").status == 0
    added = run_campaign(
        "system",
        "add",
        "Lantern 3",
        "--ra",
        "18:02:31.5",
        "--dec",
        "-45:12:30",
        "--wind-speed-a",
        "3000±200 km/s",
    )
    assert added.status == 0
    shown = run_campaign("system", "show", "Lantern 3", "--json").document
    assert "3000" in str(shown["data"])


# ------------------------------------------------------------------- the graded bar of the timeline


def test_the_probability_of_dust_is_that_of_onset_before_and_end_after():
    one = record(
        solution(3_000.0, 58_300.0, period_error=12.0, epoch_error=9.0),
        rule=lag_rule(known(-60.0, 20.0), None, known(200.0, 25.0)),
    )
    times, probability = curve(upcoming(one, now=60_900.0, start=61_000.0, end=62_000.0))
    # Two normals: P(on) = P(onset <= t) - P(end <= t).
    onset = stats.norm.cdf(times, 61_240.0, np.hypot(15.0, 20.0))
    end = stats.norm.cdf(times, 61_500.0, np.hypot(15.0, 25.0))
    assert probability == pytest.approx(onset - end, abs=0.02)
    assert probability.max() == pytest.approx(1.0, abs=0.01)


def test_a_probability_is_a_probability_and_an_episode_in_doubt_lowers_it():
    one = record(
        solution(3_000.0, 58_300.0, eccentricity=known(0.5, 0.02), a_au=known(12.0, 0.4)),
        rule=separation_rule(known(6.1, 0.2)),
    )
    result = upcoming(one, start=60_500.0, end=64_800.0)
    times, probability = curve(result)
    assert ((probability >= 0.0) & (probability <= 1.0)).all()
    chance = find(result, "onset", 1).probability
    assert 0.2 < chance < 0.95
    middle = np.abs(times - 61_300.0) < 10.0
    assert probability[middle].max() <= chance + 1e-9
    assert probability[middle].max() > 0.5 * chance


def test_cycles_that_overlap_never_exceed_certainty():
    one = record(
        solution(900.0, 58_300.0, period_error=40.0, epoch_error=30.0),
        rule=lag_rule(known(-400.0, 60.0), None, known(480.0, 60.0)),
    )
    _, probability = curve(upcoming(one, now=60_000.0, years=6))
    assert ((probability >= 0.0) & (probability <= 1.0)).all()
    assert probability.max() > 0.9


def test_an_observed_episode_is_certain_between_its_dates():
    one = record(
        solution(3_000.0, 58_300.0),
        rule=lag_rule(-60.0, 20.0, 200.0),
        episodes=[episode(1, 61_200.0, end=61_500.0, error_d=2.0)],
    )
    times, probability = curve(upcoming(one, now=61_600.0, start=61_000.0, end=62_000.0))
    inside = (times > 61_210.0) & (times < 61_490.0)
    assert (probability[inside] > 0.99).all()
    assert (probability[(times < 61_190.0) | (times > 61_510.0)] < 0.01).all()


def test_without_a_rule_nothing_is_said_of_dust():
    result = upcoming(record(solution()))
    assert result.dust_windows == ()
    assert "no dust rule: periastron alone" in result.bases[0].text


def test_solutions_side_by_side_have_windows_of_their_own():
    first = solution(3_000.0, 58_300.0, label="one")
    second = solution(3_000.0, 58_700.0, label="two", id=2, adopted=False)
    one = record(first, second, rule=lag_rule())
    assert [w.solution for w in upcoming(one).dust_windows] == [None]
    assert [w.solution for w in upcoming(one, solutions="each").dust_windows] == ["one", "two"]
