"""Draws reweighted by a likelihood, against closed forms; the wider component against the normal law.

The rows verif.truncated_normal and verif.imperfect_nondetections of checks_verification.csv (mpmath, scipy)
hold for a normal prior without a wider component; their own tolerance is that of the closed form. Stratified
draws reach them to 1e-4 of a sigma, which is what is claimed of draws.
"""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest
from scipy import stats

from campaign.physics.conditioned import (
    INFLATED_FACTOR,
    INFLATED_SHARE,
    condition_draws,
    weighted_quantiles,
)

REFERENCE = Path(__file__).parent.parent / "reference" / "checks_verification.csv"
COUNT = 200_000
STANDARD = stats.norm.ppf((np.arange(COUNT) + 0.5) / COUNT)


def rows(topic):
    with REFERENCE.open(newline="") as file:
        found = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert found, topic
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in found]


def moments(found):
    mean = float(found.weights @ found.dates_d)
    return mean, float(np.sqrt(found.weights @ (found.dates_d - mean) ** 2))


@pytest.mark.parametrize(("given", "expected"), rows("verif.truncated_normal"))
def test_perfect_detection_truncates(given, expected):
    mu, sigma, cut = given["mu"], given["sigma"], given["not_yet_started_at"]
    found = condition_draws(
        mu + sigma * STANDARD, lambda t: np.where(t < cut, -np.inf, 0.0), inflated_share=0.0
    )
    mean, sd = moments(found)
    assert mean == pytest.approx(float(expected["mean"]), abs=1e-4 * sigma)
    assert sd == pytest.approx(float(expected["sd"]), abs=1e-4 * sigma)
    quantiles = weighted_quantiles(found.dates_d, found.weights, np.array([0.5, 0.16, 0.84]))
    told = [float(expected[name]) for name in ("median", "q16", "q84")]
    assert quantiles == pytest.approx(told, abs=1e-4 * sigma)
    assert found.evidence == pytest.approx(1.0 - stats.norm.cdf((cut - mu) / sigma), abs=1e-5)


@pytest.mark.parametrize(("given", "expected"), rows("verif.imperfect_nondetections"))
def test_looks_that_may_miss_an_onset_exclude_less(given, expected):
    def log_likelihood(t):
        looks = zip(given["t_nondetection"], given["p_detect_if_onset_earlier"], strict=True)
        return sum(np.where(t < at, np.log1p(-p), 0.0) for at, p in looks)

    found = condition_draws(STANDARD, log_likelihood, inflated_share=0.0)
    mean, sd = moments(found)
    assert mean == pytest.approx(float(expected["mean"]), abs=1e-4)
    assert sd == pytest.approx(float(expected["sd"]), abs=1e-4)
    assert found.evidence == pytest.approx(float(expected["evidence"]), abs=1e-4)
    for at in given["t_nondetection"]:
        share = float(found.weights[found.dates_d < at].sum())
        assert share == pytest.approx(float(expected[f"P(onset<{at})"]), abs=1e-4)


def test_at_three_sigma_the_forecast_and_the_wider_one_are_equally_believed():
    """Bayes: 0.99 P(Z > 3) against 0.01 P(Z > 1); the tail of the normal law alone would end far too soon."""
    own = (1.0 - INFLATED_SHARE) * stats.norm.sf(3.0)
    wide = INFLATED_SHARE * stats.norm.sf(3.0 / INFLATED_FACTOR)
    found = condition_draws(STANDARD, lambda t: np.where(t < 3.0, -np.inf, 0.0))
    assert found.inflated_share == pytest.approx(wide / (own + wide), abs=0.01)
    assert 0.45 < found.inflated_share < 0.6
    upper = weighted_quantiles(found.dates_d, found.weights, np.array([0.975]))[0]
    assert upper > stats.truncnorm.ppf(0.975, 3.0, np.inf) + 1.0
    early = condition_draws(STANDARD, lambda t: np.where(t < 0.0, -np.inf, 0.0))
    assert early.inflated_share == pytest.approx(INFLATED_SHARE, abs=1e-3)


def test_a_draw_without_an_event_is_as_probable_as_no_event():
    dates = np.where(np.arange(COUNT) % 2 == 0, STANDARD, np.nan)
    found = condition_draws(dates, lambda t: np.where(t < 0.0, -np.inf, 0.0), inflated_share=0.0)
    # Half of the draws have an event, half of which are excluded: a third of what is left has one.
    assert found.weights[~np.isnan(found.dates_d)].sum() == pytest.approx(1.0 / 3.0, abs=1e-3)


def test_what_excludes_everything_leaves_no_draw():
    found = condition_draws(STANDARD[::100], lambda t: np.full(t.shape, -np.inf))
    assert (found.evidence, found.effective) == (0.0, 0.0)


def test_weighted_quantiles_are_those_of_repeated_values():
    values, counts = np.array([3.0, 1.0, 2.0]), np.array([2, 5, 3])
    shares = np.array([0.1, 0.5, 0.9])
    repeated = np.sort(np.repeat(values, counts))
    once = weighted_quantiles(values, counts.astype(float), shares)
    assert np.all(once >= repeated[0]) and np.all(np.diff(once) >= 0.0)
    even = weighted_quantiles(repeated, np.ones(10), shares)
    assert even == pytest.approx(np.quantile(repeated, shares, method="hazen"))
