"""The next date from dated recurrences. Oracles: least squares with Student's t (scipy.stats), and the
posterior integrated directly (scipy.integrate) where the stated prior of the scatter rules."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import integrate, optimize, stats

from campaign.errors import InputRefused
from campaign.physics.recurrence import predict_recurrence

SHARES = np.array([0.025, 0.16, 0.5, 0.84, 0.975])
PERIOD = 3_000.0


def dated(count, scatter, seed):
    rng = np.random.default_rng(seed)
    cycles = np.arange(count, dtype=float)
    return cycles, 40_000.0 + PERIOD * cycles + scatter * rng.standard_normal(count)


@pytest.mark.parametrize(("count", "seed"), [(5, 1), (6, 2), (8, 3), (12, 4), (20, 5)])
def test_many_dates_predict_as_ordinary_least_squares_with_students_t(count, seed):
    cycles, dates = dated(count, 25.0, seed)
    found = predict_recurrence(cycles, dates, np.full(count, 1e-3), count + 1.0)
    # Textbook prediction interval of a straight line with n - 2 degrees of freedom.
    fit = stats.linregress(cycles, dates)
    residual = dates - fit.intercept - fit.slope * cycles
    s = np.sqrt(np.sum(residual**2) / (count - 2))
    step = count + 1.0 - cycles.mean()
    width = s * np.sqrt(1.0 + 1.0 / count + step**2 / np.sum((cycles - cycles.mean()) ** 2))
    expected = fit.intercept + fit.slope * (count + 1.0) + width * stats.t.ppf(SHARES, count - 2)
    assert not found.prior_used
    assert found.degrees_of_freedom == count - 2
    span = expected[-1] - expected[0]
    assert found.quantiles_d(SHARES) == pytest.approx(expected, abs=0.03 * span / 2.0)


@pytest.mark.parametrize(("count", "seed"), [(3, 6), (4, 7), (9, 8)])
def test_with_a_known_period_only_the_constant_is_learned(count, seed):
    cycles, dates = dated(count, 25.0, seed)
    found = predict_recurrence(cycles, dates, np.full(count, 1e-3), count + 0.0, PERIOD, 0.0)
    # Textbook prediction interval of a mean with n - 1 degrees of freedom.
    folded = dates - PERIOD * cycles
    width = folded.std(ddof=1) * np.sqrt(1.0 + 1.0 / count)
    expected = folded.mean() + PERIOD * count + width * stats.t.ppf(SHARES, count - 1)
    assert found.degrees_of_freedom == count - 1
    assert found.quantiles_d(SHARES) == pytest.approx(expected, abs=0.03 * (expected[-1] - expected[0]) / 2.0)


def prior_density(scatter):
    """Design, section 4, 'a stated prior': log-normal about 1 % of the period, a factor of e either way."""
    return stats.lognorm.pdf(scatter, s=1.0, scale=0.01 * PERIOD)


def mixture_quantiles(sigma_given, likelihood=lambda s: 1.0):
    """Quantiles about zero of a normal whose scatter has the stated prior, by direct integration."""
    grid = np.exp(np.linspace(np.log(0.01 * PERIOD) - 8.0, np.log(0.01 * PERIOD) + 8.0, 4_001))
    weight = np.array([prior_density(s) * likelihood(s) * s for s in grid])
    total = integrate.simpson(weight, x=np.log(grid))

    def cumulative(x):
        return integrate.simpson(weight * stats.norm.cdf(x / sigma_given(grid)), x=np.log(grid)) / total

    return np.array([optimize.brentq(lambda x, q=q: cumulative(x) - q, -1e5, 1e5) for q in SHARES])


def test_one_date_and_an_orbit_rest_on_the_stated_prior():
    dating, sigma_period = 4.0, 6.0
    found = predict_recurrence(
        np.array([5.0]), np.array([50_000.0]), np.array([dating]), 7.0, PERIOD, sigma_period
    )
    assert found.prior_used
    # The dated onset carries its own deviation and error, the coming one its own deviation, over two periods.
    expected = mixture_quantiles(lambda s: np.sqrt(dating**2 + 2.0 * s**2 + (2.0 * sigma_period) ** 2))
    span = expected[-1] - expected[0]
    assert found.quantiles_d(SHARES) - 50_000.0 - 2.0 * PERIOD == pytest.approx(expected, abs=0.01 * span)


def test_two_dates_without_an_orbit_rest_on_the_stated_prior():
    dating = 3.0
    dates = np.array([50_000.0, 50_000.0 + PERIOD])
    found = predict_recurrence(np.array([0.0, 1.0]), dates, np.full(2, dating), 2.0)
    assert found.prior_used
    # Third date = 2 second - first, so five variances of a dated onset and one deviation more.
    expected = mixture_quantiles(lambda s: np.sqrt(5.0 * (dating**2 + s**2) + s**2))
    span = expected[-1] - expected[0]
    assert found.quantiles_d(SHARES) - 50_000.0 - 2.0 * PERIOD == pytest.approx(expected, abs=0.01 * span)


def test_two_dates_and_a_known_period_weigh_the_prior_by_their_difference():
    dating, apart = 3.0, 90.0
    dates = np.array([50_000.0 - apart / 2.0, 50_000.0 + PERIOD + apart / 2.0])
    found = predict_recurrence(np.array([0.0, 1.0]), dates, np.full(2, dating), 2.0, PERIOD, 0.0)
    assert found.prior_used
    expected = mixture_quantiles(
        lambda s: np.sqrt((dating**2 + s**2) / 2.0 + s**2),
        lambda s: stats.norm.pdf(apart, scale=np.sqrt(2.0 * (dating**2 + s**2))),
    )
    span = expected[-1] - expected[0]
    assert found.quantiles_d(SHARES) - 50_000.0 - 2.0 * PERIOD == pytest.approx(expected, abs=0.01 * span)


def test_standard_deviation_and_mean_are_those_of_the_mixture():
    cycles, dates = dated(6, 25.0, 9)
    found = predict_recurrence(cycles, dates, np.full(6, 2.0), 6.0)
    rng = np.random.default_rng(1)
    which = rng.choice(found.weights.size, 400_000, p=found.weights)
    drawn = rng.normal(found.means_d[which], found.sigmas_d[which])
    assert found.weights.sum() == pytest.approx(1.0, abs=1e-12)
    assert found.quantiles_d(SHARES) == pytest.approx(np.quantile(drawn, SHARES), abs=1.0)
    assert found.sigma_d == pytest.approx(drawn.std(), rel=0.02)


@given(shift=st.floats(-30_000.0, 30_000.0), turn=st.integers(-50, 50), seed=st.integers(0, 1000))
@settings(max_examples=40, deadline=None)
def test_neither_the_zero_of_time_nor_of_the_count_matters(shift, turn, seed):
    cycles, dates = dated(5, 20.0, seed)
    errors = np.array([5.0, 1.0, 8.0, 3.0, 2.0])
    first = predict_recurrence(cycles, dates, errors, 6.0).quantiles_d(SHARES)
    second = predict_recurrence(cycles + turn, dates + shift, errors, 6.0 + turn).quantiles_d(SHARES)
    assert second - shift == pytest.approx(first, abs=1e-4)


def test_a_badly_dated_onset_counts_for_little():
    cycles, dates = dated(6, 1.0, 11)
    spoilt = dates.copy()
    spoilt[2] += 400.0
    errors = np.full(6, 1.0)
    errors[2] = 500.0
    clean, dirty = (
        predict_recurrence(cycles, d, errors, 6.0).quantiles_d(np.array([0.5]))[0] for d in (dates, spoilt)
    )
    assert abs(clean - dirty) < 1.0


def test_the_farther_ahead_the_less_certain():
    cycles, dates = dated(5, 20.0, 12)
    widths = [
        np.ptp(predict_recurrence(cycles, dates, np.full(5, 2.0), ahead).quantiles_d(SHARES))
        for ahead in (5.0, 8.0, 15.0)
    ]
    assert widths[0] < widths[1] < widths[2]


@pytest.mark.parametrize(
    "errors",
    [(3.0, 3.0), (3.0,) * 3, (3.0,) * 3 + (300.0,) * 2, (3.0,) * 2 + (300.0,) * 3, (300.0,) * 5],
)
def test_intervals_hold_the_truth_when_the_dates_tell_little_of_the_scatter(errors):
    # 3,000 cases each, the truth drawn from the stated prior; |z| < 3 (DEVELOPERS.md, coverage).
    rng, cases, count = np.random.default_rng(2), 3_000, len(errors)
    held = {0.68: 0, 0.95: 0}
    for _ in range(cases):
        period = rng.uniform(1_500.0, 9_000.0)
        scatter = 0.01 * period * np.exp(rng.standard_normal())
        dating, cycles = rng.permutation(errors), np.arange(count, dtype=float)
        dates = cycles * period + np.hypot(scatter, dating) * rng.standard_normal(count)
        truth = count * period + scatter * rng.standard_normal()
        low95, low68, _, high68, high95 = predict_recurrence(cycles, dates, dating, count).quantiles_d(SHARES)
        held[0.68] += low68 <= truth <= high68
        held[0.95] += low95 <= truth <= high95
    for share, times in held.items():
        assert abs(times - share * cases) / np.sqrt(cases * share * (1 - share)) < 3.0


@pytest.mark.parametrize(("cycles", "period"), [([], None), ([3.0], None), ([3.0, 3.0], None), ([], 3000.0)])
def test_dates_that_determine_no_line_are_refused(cycles, period):
    with pytest.raises(InputRefused) as refused:
        predict_recurrence(
            np.array(cycles), np.full(len(cycles), 50_000.0), np.ones(len(cycles)), 5.0, period,
            None if period is None else 3.0,
        )  # fmt: skip
    assert refused.value.code == "recurrence-undetermined"
    assert refused.value.hint
