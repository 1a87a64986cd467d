"""Scores of forecasts, against reference rows, properscoring and direct integration by scipy."""

from __future__ import annotations

import csv
import json
import math
from pathlib import Path

import numpy as np
import properscoring
import pytest
from scipy.integrate import quad
from scipy.special import ndtr, ndtri
from scipy.stats import binom, kstest, norm, truncnorm

from campaign.errors import InputRefused
from campaign.physics.calibration import central_coverage, judge_transforms
from campaign.physics.datedscores import QuantileDistribution, score_date, score_span
from campaign.physics.verification import (
    crps_ensemble,
    crps_ensemble_fair,
    crps_normal,
    crps_truncated_normal,
    interval_score,
    log_score_between,
    log_score_normal,
    pinball_loss,
    skill_score,
    truncated_normal,
)

TABLE = Path(__file__).parent.parent / "reference" / "checks_verification.csv"
SHARES = (np.arange(101) + 0.5) / 101.0


def rows(topic):
    with TABLE.open(newline="") as file:
        found = [row for row in csv.DictReader(file) if row["topic"] == f"verif.{topic}"]
    assert found, topic
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in found]


def normal_by_quantiles(mean, sigma):
    return QuantileDistribution(mean + sigma * ndtri(SHARES), SHARES)


@pytest.mark.parametrize(("given", "expected"), rows("crps_gaussian"))
def test_a_normal_forecast_scores_as_published(given, expected):
    mean, sigma, observed = given["mu"], given["sigma"], given["y"]
    assert float(crps_normal(mean, sigma, observed)) == pytest.approx(float(expected["CRPS"]), rel=1e-10)
    assert float(log_score_normal(mean, sigma, observed)) == pytest.approx(
        float(expected["log_score_-ln_f"]), rel=1e-10
    )
    # Through its quantiles: the forecaster keeps those. 101 of them are good to 1e-3 of the spread.
    scores = score_date(normal_by_quantiles(mean, sigma), observed)
    assert scores.crps_d == pytest.approx(float(expected["CRPS"]), abs=2e-3 * sigma)
    assert scores.log_score == pytest.approx(float(expected["log_score_-ln_f"]), rel=1e-6)
    assert scores.pit == pytest.approx(float(expected["PIT"]), abs=1e-10)


@pytest.mark.parametrize(("given", "expected"), rows("crps_empirical"))
def test_an_ensemble_scores_as_published(given, expected):
    members = np.array(given["ensemble"])
    assert crps_ensemble(members, given["y"]) == pytest.approx(float(expected["CRPS_ecdf"]), abs=1e-11)
    if expected["CRPS_fair(m(m-1))"] is None:
        with pytest.raises(InputRefused):
            crps_ensemble_fair(members, given["y"])
    else:
        fair = float(expected["CRPS_fair(m(m-1))"])
        assert crps_ensemble_fair(members, given["y"]) == pytest.approx(fair, abs=1e-11)


@pytest.mark.parametrize(("given", "expected"), rows("crps_weighted"))
def test_a_weighted_ensemble_scores_as_published(given, expected):
    score = crps_ensemble(np.array(given["x"]), given["y"], np.array(given["w"]))
    assert score == pytest.approx(float(expected["CRPS"]), abs=1e-11)


def test_ensembles_agree_with_an_independent_program():
    # Oracle: properscoring 0.1 (crps_ensemble, crps_gaussian).
    random = np.random.default_rng(20310407)
    for size in (1, 2, 7, 300):
        members = 60_000.0 + 50.0 * random.standard_normal(size)
        weights = random.uniform(0.1, 2.0, size)
        observed = 60_000.0 + 80.0 * random.standard_normal()
        assert crps_ensemble(members, observed) == pytest.approx(
            float(properscoring.crps_ensemble(observed, members)), abs=1e-8
        )
        assert crps_ensemble(members, observed, weights) == pytest.approx(
            float(properscoring.crps_ensemble(observed, members, weights=weights)), abs=1e-8
        )
    means, sigmas, seen = random.normal(size=(3, 50)) * [[1.0], [0.3], [2.0]] + [[0.0], [2.0], [0.0]]
    assert crps_normal(means, sigmas, seen) == pytest.approx(
        properscoring.crps_gaussian(seen, means, sigmas), rel=1e-10
    )


def test_a_forecast_without_width_scores_its_absolute_error():
    # Gneiting & Raftery 2007: the score of a point is its absolute error.
    assert float(crps_normal(100.0, 0.0, 92.0)) == 8.0
    point = QuantileDistribution(np.full(5, 100.0), np.array([0.1, 0.3, 0.5, 0.7, 0.9]))
    scores = score_date(point, 92.0)
    assert (scores.log_score, scores.pit) == (None, 0.0)
    assert scores.crps_d == pytest.approx(8.0, rel=1e-12)


@pytest.mark.parametrize(("given", "expected"), rows("interval_score"))
def test_an_interval_scores_as_published(given, expected):
    score = interval_score(given["l"], given["u"], given["y"], given["alpha"])
    assert score == pytest.approx(float(expected["score"]), abs=1e-9)


@pytest.mark.parametrize(("given", "expected"), rows("pinball"))
def test_a_quantile_scores_as_published(given, expected):
    loss = pinball_loss(given["q"], given["y"], given["tau"])
    assert loss == pytest.approx(float(expected["loss"]), abs=1e-12)


@pytest.mark.parametrize(("given", "expected"), rows("skill"))
def test_skill_is_published(given, expected):
    assert skill_score(given["CRPS"], given["CRPS_ref"]) == pytest.approx(float(expected["CRPSS"]), abs=1e-12)
    assert math.isnan(skill_score(0.0, 0.0))


@pytest.mark.parametrize(("given", "expected"), rows("pit"))
def test_transforms_are_summed_up_as_published(given, expected):
    values = np.array(given["PIT"])
    found = judge_transforms(values)
    assert found.mean == pytest.approx(float(expected["mean"]), abs=1e-9)
    assert found.variance == pytest.approx(float(expected["var(uniform=1/12)"]), abs=1e-9)
    assert found.coverage68 == expected["coverage_68pct_central"]
    # Eight are too few to be judged; with the same ones twice the distance is that of the row.
    assert found.verdict == "too few"
    assert found.ks_p is None
    twice = judge_transforms(np.concatenate([values, values]))
    assert twice.ks_d == pytest.approx(float(expected["KS_D"]), abs=1e-9)


@pytest.mark.parametrize(("given", "expected"), rows("truncated_normal"))
def test_what_is_left_after_quiet_until_a_date(given, expected):
    left = truncated_normal(given["mu"], given["sigma"], given["not_yet_started_at"])
    assert left.survival == pytest.approx(float(expected["P(prior survives)=1-Phi(a)"]), rel=1e-9)
    for name, found in (
        ("mean", left.mean), ("sd", left.sigma), ("median", left.quantiles(np.array(0.5))),
        ("q16", left.quantiles(np.array(0.16))), ("q84", left.quantiles(np.array(0.84))),
    ):  # fmt: skip
        # The row's tolerance is relative to the offset from mu; its last digit is 1e-10 yr.
        offset = float(expected[name]) - (0.0 if name == "sd" else given["mu"])
        assert float(found) - (0.0 if name == "sd" else given["mu"]) == pytest.approx(
            offset, rel=1e-9, abs=2e-10
        )


def test_the_truncated_normal_agrees_with_scipy_far_out():
    # Oracle: scipy.stats.truncnorm.
    for a in (-6.0, -1.0, 0.0, 2.5, 6.0):
        left, oracle = truncated_normal(0.0, 1.0, a), truncnorm(a, np.inf)
        assert left.mean == pytest.approx(oracle.mean(), abs=1e-9)
        assert left.sigma == pytest.approx(oracle.std(), abs=1e-8)
        assert left.quantiles(np.array([0.025, 0.975])) == pytest.approx(oracle.ppf([0.025, 0.975]), abs=1e-8)


@pytest.mark.parametrize(("given", "expected"), rows("crps_truncated_normal"))
def test_a_truncated_normal_forecast_scores_as_published(given, expected):
    score = crps_truncated_normal(given["mu"], given["sigma"], given["lower"], given["y"])
    assert score == pytest.approx(float(expected["CRPS"]), abs=1e-9)


@pytest.mark.parametrize(("a", "y"), [(-2.0, 0.3), (0.0, 2.0), (1.5, 1.5), (2.5, 4.0)])
def test_the_score_of_a_truncated_normal_is_its_defining_integral(a, y):
    # Oracle: scipy.integrate.quad of (F(x) - 1[x >= y])^2.
    law = truncnorm(a, np.inf)
    before = quad(lambda x: law.cdf(x) ** 2, a, y)[0]
    after = quad(lambda x: law.sf(x) ** 2, y, np.inf)[0]
    assert crps_truncated_normal(0.0, 1.0, a, y) == pytest.approx(before + after, abs=1e-7)


@pytest.mark.parametrize(("given", "expected"), rows("imperfect_nondetections"))
def test_quiet_points_that_could_have_missed_it_leave_a_mixture_of_truncated_forecasts(given, expected):
    # posterior ~ prior x prod (1 - p_i)^[onset < t_i]: the more quiet points follow an onset, the less it is
    # believed. What lies after t_i is a truncated normal; differences of these are the pieces between.
    edges = [-8.0, *given["t_nondetection"]]
    misses = [1.0 - p for p in given["p_detect_if_onset_earlier"]]
    factors = [math.prod(misses[i:]) for i in range(len(misses))] + [1.0]
    after = [truncated_normal(0.0, 1.0, edge) for edge in edges] + [None]
    evidence = mean = square = 0.0
    shares = []
    for factor, begin, end in zip(factors, after[:-1], after[1:], strict=True):
        mass = begin.survival - (end.survival if end else 0.0)
        first = begin.survival * begin.mean - (end.survival * end.mean if end else 0.0)
        second = begin.survival * (begin.sigma**2 + begin.mean**2)
        second -= end.survival * (end.sigma**2 + end.mean**2) if end else 0.0
        evidence, mean, square = evidence + factor * mass, mean + factor * first, square + factor * second
        shares.append(factor * mass)
    assert evidence == pytest.approx(float(expected["evidence"]), abs=1e-10)
    assert mean / evidence == pytest.approx(float(expected["mean"]), abs=1e-10)
    sigma = math.sqrt(square / evidence - (mean / evidence) ** 2)
    assert sigma == pytest.approx(float(expected["sd"]), abs=1e-10)
    for edge, before in zip(given["t_nondetection"], np.cumsum(shares) / evidence, strict=False):
        assert before == pytest.approx(float(expected[f"P(onset<{edge:g})"]), abs=1e-10)


@pytest.mark.parametrize(("given", "expected"), rows("interval_censored_log_score"))
def test_an_event_known_between_two_dates_is_not_scored_at_their_middle(given, expected):
    first, last = given["event_known_only_between"]
    right = float(expected["-ln[F(b)-F(a)]"])
    exact = log_score_between(float(norm.cdf(first, 100, 20)), float(norm.cdf(last, 100, 20)))
    assert exact == pytest.approx(right, abs=1e-10)
    scores = score_span(normal_by_quantiles(100.0, 20.0), first, last, 0.5)
    assert scores.log_score == pytest.approx(right, abs=1e-10)
    wrong = float(expected["WRONG_midpoint_density"])
    assert abs(scores.log_score - wrong) > 3.0


@pytest.mark.parametrize(("given", "expected"), rows("onset_bracket"))
def test_a_bracket_counts_as_its_whole_width(given, expected):
    first, last = given["last_nondetection"], given["first_detection"]
    assert 0.5 * (first + last) == expected["midpoint"]
    assert (last - first) / math.sqrt(12.0) == pytest.approx(float(expected["sigma_uniform"]), abs=1e-9)
    # A forecast that is spread evenly over the bracket has a transform spread evenly from 0 to 1.
    even = QuantileDistribution(first + (last - first) * SHARES, SHARES)
    ends = [score_span(even, first, last, place).pit for place in (0.0, 1.0)]
    assert ends == pytest.approx([0.0, 1.0], abs=0.006)


def test_the_score_of_a_bracket_counts_only_what_lies_outside_it():
    # Oracle: scipy.integrate.quad of the same score; Gneiting & Ranjan 2011, weight zero inside.
    law, first, last = norm(100.0, 20.0), 110.0, 140.0
    wanted = (
        quad(lambda x: law.cdf(x) ** 2, -np.inf, first)[0] + quad(lambda x: law.sf(x) ** 2, last, np.inf)[0]
    )
    scores = score_span(normal_by_quantiles(100.0, 20.0), first, last, 0.5)
    assert scores.crps_d == pytest.approx(wanted, abs=2e-3 * 20.0)
    assert scores.crps_d < float(crps_normal(100.0, 20.0, 125.0))


def test_a_bracket_excluded_by_the_forecast_is_infinitely_surprising():
    point = QuantileDistribution(np.full(3, 100.0), np.array([0.2, 0.5, 0.8]))
    assert score_span(point, 110.0, 140.0, 0.5).log_score == math.inf
    with pytest.raises(InputRefused):
        score_span(point, 140.0, 110.0, 0.5)


def test_the_error_of_an_observed_date_widens_the_forecast():
    # A normal forecast of 20 d and a date good to 15 d: the difference is normal with 25 d.
    for miss in (0.0, 30.0, -70.0):
        scores = score_date(normal_by_quantiles(100.0, 20.0), 100.0 + miss, 15.0, 15.0)
        assert scores.crps_d == pytest.approx(float(crps_normal(0.0, 25.0, miss)), abs=0.1)
        # 41 values stand for the error; its tails are cut at 2.2 sigma.
        assert scores.log_score == pytest.approx(float(log_score_normal(0.0, 25.0, miss)), abs=0.12)
        assert scores.pit == pytest.approx(float(ndtr(miss / 25.0)), abs=0.003)


def test_quantiles_are_read_as_a_distribution_also_beyond_the_last():
    law = normal_by_quantiles(0.0, 1.0)
    for date in (-5.0, -2.7, 0.1, 3.5):
        assert float(law.share_before(date)) == pytest.approx(float(ndtr(date)), rel=1e-6)
        assert float(law.density(date)) == pytest.approx(float(norm.pdf(date)), rel=1e-6)
    # Half of it at one date, as where draws coincide: a step there, and a rise elsewhere.
    stepped = QuantileDistribution(np.array([0.0, 1.0, 1.0, 1.0, 2.0]), np.array([0.1, 0.3, 0.5, 0.7, 0.9]))
    assert float(stepped.share_before(1.0 - 1e-9)) <= float(stepped.share_before(1.0 + 1e-9))
    assert float(stepped.share_before(2.0)) == pytest.approx(0.9)
    total = quad(lambda x: float(law.density(x)), -8.0, 8.0, limit=200)[0]
    assert total == pytest.approx(1.0, abs=1e-6)


@pytest.mark.parametrize(
    ("values", "shares"),
    [([1.0, 0.0], [0.2, 0.8]), ([0.0, 1.0], [0.0, 1.0]), ([], []), ([0.0, math.nan], [0.2, 0.8])],
)
def test_what_is_no_distribution_is_refused(values, shares):
    with pytest.raises(InputRefused):
        QuantileDistribution(np.array(values), np.array(shares))


def test_the_log_score_and_the_ranked_score_are_proper():
    # Gneiting & Raftery 2007: on the average over the truth, the true forecast scores best.
    truth = normal_by_quantiles(0.0, 1.0)
    outcomes = ndtri((np.arange(400) + 0.5) / 400.0)
    for other in (
        normal_by_quantiles(0.0, 0.6),
        normal_by_quantiles(0.0, 1.6),
        normal_by_quantiles(0.5, 1.0),
    ):
        ours = [score_date(truth, y) for y in outcomes]
        theirs = [score_date(other, y) for y in outcomes]
        assert np.mean([s.crps_d for s in ours]) < np.mean([s.crps_d for s in theirs])
        assert np.mean([s.log_score for s in ours]) < np.mean([s.log_score for s in theirs])


def test_a_true_forecaster_is_seldom_called_wrong_and_a_narrow_one_often():
    random = np.random.default_rng(5)
    good = [judge_transforms(random.uniform(size=40)).verdict for _ in range(300)]
    # Four sides of intervals at 1 in 200 each and the mean at 1 in 100: at most 3 in 100, or 9 of 300; three
    # sigma of chance more are 18.
    assert sum(verdict != "nothing against" for verdict in good) <= 18
    # Forecast widths a third of the truth.
    narrow = [judge_transforms(ndtr(3.0 * random.standard_normal(40))).verdict for _ in range(100)]
    assert narrow.count("too narrow") > 95
    wide = [judge_transforms(ndtr(0.25 * random.standard_normal(40))).verdict for _ in range(100)]
    assert wide.count("too wide") > 95
    early = judge_transforms(ndtr(1.0 + 0.7 * np.random.default_rng(1).standard_normal(60)))
    assert early.verdict in ("too early", "too narrow")
    assert early.mean > 0.7


def test_intervals_of_coverage_are_those_of_clopper_and_pearson():
    # Oracle: the definition through scipy.stats.binom.
    values = np.concatenate([np.full(15, 0.5), np.full(5, 0.001)])
    found = judge_transforms(values)
    assert found.coverage68 == central_coverage(values, 0.68) == 0.75
    assert binom.sf(14, 20, found.coverage68_lo) == pytest.approx(0.025, abs=1e-9)
    assert binom.cdf(15, 20, found.coverage68_hi) == pytest.approx(0.025, abs=1e-9)
    assert found.ks_p == pytest.approx(kstest(values, "uniform").pvalue)


def test_a_transform_outside_its_range_is_refused_and_none_at_all_says_too_few():
    with pytest.raises(InputRefused):
        judge_transforms(np.array([0.2, 1.2]))
    assert judge_transforms(np.array([])).verdict == "too few"


def test_an_ensemble_without_weight_is_refused():
    for members, weights in (([], None), ([1.0], [0.0]), ([1.0, 2.0], [1.0]), ([1.0], [-1.0])):
        with pytest.raises(InputRefused):
            crps_ensemble(np.array(members), 0.0, None if weights is None else np.array(weights))
