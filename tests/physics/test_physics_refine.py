"""Epoch and period from dated events. Oracles: published and computed rows of the reference tables, scipy,
statsmodels, direct integration."""

from __future__ import annotations

import csv
import json
from datetime import date
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from scipy import integrate, optimize, stats

from campaign.errors import InputRefused
from campaign.physics.cyclecounts import possible_counts
from campaign.physics.datedlikelihood import DatedEvents, date_log_likelihood
from campaign.physics.datedline import fit_dated_line
from campaign.physics.linearephemeris import LinearEphemeris, fit_ephemeris
from campaign.physics.missedcycles import QuietProfile, missed_log_chance, single_event_period
from campaign.physics.recurrence import RecurrencePrediction, fit_recurrence

FOLDER = Path(__file__).parent.parent / "reference"
SHARES = np.array([0.025, 0.16, 0.5, 0.84, 0.975])
YEAR = 365.25


def checks(topic):
    with (FOLDER / "checks_refine.csv").open(newline="") as file:
        rows = [row for row in csv.DictReader(file) if row["topic"] == topic]
    assert rows, topic
    return [(json.loads(row["inputs"]), json.loads(row["expected"])) for row in rows]


def published(identifier):
    with (FOLDER / "published_periods.csv").open(newline="") as file:
        return next(row for row in csv.DictReader(file) if row["id"] == identifier)


def normal(dates, sigmas):
    dates, sigmas = np.asarray(dates, dtype=float), np.asarray(sigmas, dtype=float)
    return DatedEvents(dates, sigmas, sigmas, np.zeros(dates.size, dtype=bool))


def independent(epoch, epoch_sigma, period, period_sigma):
    """A published ephemeris whose epoch and period are independent."""
    return LinearEphemeris(epoch, period, epoch_sigma**2, period_sigma**2, 0.0, np.zeros(0), 0.0, 0)


# ----------------------------------------------------------- the line by the stated errors, never rescaled


def test_the_worked_line_has_its_full_covariance():
    ((given, expected),) = checks("ephem.linear_wls")
    line = fit_ephemeris(np.array(given["E"], float), np.array(given["T_JD"]), np.array(given["sigma_d"]))
    assert line.epoch_d == pytest.approx(float(expected["T0_JD"]), abs=1e-6)
    assert line.period_d == pytest.approx(float(expected["P_d"]), rel=1e-8)
    assert line.epoch_sigma_d == pytest.approx(float(expected["sigma_T0"]), rel=1e-8)
    assert line.period_sigma_d == pytest.approx(float(expected["sigma_P"]), rel=1e-8)
    assert line.covariance_d2 == pytest.approx(float(expected["cov_T0P"]), rel=1e-8)
    assert line.correlation == pytest.approx(float(expected["rho"]), rel=1e-8)
    assert line.chi2 == pytest.approx(float(expected["chi2"]), rel=1e-6)
    assert line.degrees_of_freedom == expected["dof"]
    assert line.residuals_d == pytest.approx([float(v) for v in expected["O-C_d"]], abs=2e-6)
    pivot = expected["E_pivot(minimum variance epoch, cov=0)"]
    assert line.best_cycle == pytest.approx(float(pivot), rel=1e-8)
    assert line.at(line.best_cycle)[1] == pytest.approx(float(expected["sigma_at_pivot"]), rel=1e-8)
    for ahead in (6, 7, 10):
        told = expected[f"predict_E{ahead}"]
        instant, sigma = line.at(ahead)
        assert instant == pytest.approx(float(told["T"]), abs=1e-5)
        assert sigma == pytest.approx(float(told["sigma_correct"]), rel=1e-7)
        assert abs(sigma - float(told["sigma_WRONG_no_covariance"])) > 4.0
    # What a least-squares routine that rescales by chi-square would claim: five times too sure.
    assert line.period_sigma_d > 4.0 * float(expected["sigma_P_rescaled_by_sqrt(chi2/dof)"])


@pytest.mark.parametrize(("given", "expected"), checks("ephem.deeg2015"))
def test_equal_errors_give_the_published_error_of_the_period(given, expected):
    cycles = np.arange(float(given["N"]))
    line = fit_ephemeris(cycles, 5_000.0 * cycles, np.full(cycles.size, given["sigma_T"]))
    assert line.period_sigma_d == pytest.approx(float(expected["sigma_P"]), rel=1e-9)
    assert line.epoch_sigma_d == pytest.approx(float(expected["sigma_T0_if_epoch_first"]), rel=1e-9)
    central = float(expected["sigma_T0_if_epoch_centre"])
    assert line.at(line.best_cycle)[1] == pytest.approx(central, rel=1e-9)


def test_statsmodels_and_scipy_find_the_same_line():
    regression = pytest.importorskip("statsmodels.api")
    rng = np.random.default_rng(5)
    cycles = np.array([0.0, 1, 3, 4, 7, 8])
    sigmas = rng.uniform(2.0, 20.0, 6)
    dates = 50_000.0 + 3_210.0 * cycles + sigmas * rng.standard_normal(6)
    line = fit_ephemeris(cycles, dates, sigmas)
    fit = regression.WLS(dates - 50_000.0, regression.add_constant(cycles), weights=sigmas**-2.0).fit()
    assert line.epoch_d - 50_000.0 == pytest.approx(fit.params[0], abs=1e-6)
    assert line.period_d == pytest.approx(fit.params[1], rel=1e-10)
    # statsmodels rescales by its own chi-square: undone, its covariance is ours.
    assert line.covariance_d2 == pytest.approx(fit.normalized_cov_params[0, 1], rel=1e-7)
    _, covariance = optimize.curve_fit(
        lambda e, t, p: t + p * e, cycles, dates - 50_000.0, p0=(0.0, 3_000.0), sigma=sigmas,
        absolute_sigma=True, jac=lambda e, t, p: np.stack([np.ones_like(e), e], axis=-1),
    )  # fmt: skip
    assert line.period_variance_d2 == pytest.approx(covariance[1, 1], rel=1e-6)


def test_two_events_carry_their_covariance_to_the_third():
    ((given, expected),) = checks("ephem.two_events")
    line = fit_ephemeris(
        np.array([0.0, 1.0]), np.array([given["T1"], given["T2"]]), np.array([given["s1"], given["s2"]])
    )
    instant, sigma = line.at(2.0)
    assert line.period_d == pytest.approx(expected["P_yr"], rel=1e-9)
    assert line.period_sigma_d == pytest.approx(float(expected["sigma_P"]), rel=1e-9)
    assert instant == pytest.approx(expected["next_T"], rel=1e-9)
    assert sigma == pytest.approx(float(expected["sigma_next(correct: T2+P, cov)"]), rel=1e-9)


def test_published_minima_of_eta_carinae_repeat_by_the_published_period():
    ((given, expected),) = checks("ephem.etacar_published")
    # R1: the two dated events give the published period within the error of the second.
    assert "2022.7" in published("R1")["published"]
    line = fit_ephemeris(
        np.array([0.0, 1.0]), np.array([given["T0_JD"], expected["T_JD"]]), np.array([0.5, 2.0])
    )
    assert line.period_d == pytest.approx(given["P_d"], abs=2.0)
    assert given["T0_JD"] + given["P_d"] == pytest.approx(expected["T_JD"], abs=0.5)
    for known, told in checks("ephem.etacar_predict2020"):
        ahead = independent(2_452_819.5, known["sigma_T0_d"], known["P_d"], known["sigma_P_d"])
        instant, sigma = ahead.at(float(known["E"]))
        assert instant == pytest.approx(float(told["T_JD"]), abs=0.05)
        assert sigma == pytest.approx(float(told["sigma_d"]), abs=0.001)
    ((days, interval),) = checks("ephem.etacar_xray")
    first, second = (date.fromisoformat(text) for text in days["minimum_starts"])
    pair = fit_ephemeris(
        np.array([0.0, 1.0]), np.array([first.toordinal(), second.toordinal()], float), np.ones(2)
    )
    assert pair.period_d == pytest.approx(float(interval["interval_d"]), abs=1e-9)


def test_periastron_of_wr_19_returns_after_its_period():
    ((given, expected),) = checks("ephem.wr19")
    line = independent(given["periastron"], 0.0, given["P_yr"], given["sigma_P"])
    instant, sigma = line.at(given["E"])
    assert instant == pytest.approx(expected["next_periastron"], abs=0.005)
    assert sigma == pytest.approx(expected["sigma_yr_from_P"], abs=1e-12)


def test_one_cycle_alone_is_no_line():
    with pytest.raises(InputRefused, match="do not determine"):
        fit_ephemeris(np.array([1.0, 1.0]), np.array([5.0, 6.0]), np.ones(2))
    with pytest.raises(InputRefused, match="do not determine"):
        fit_ephemeris(np.array([0.0, 1.0]), np.array([5.0, 6.0]), np.array([1.0, 0.0]))
    with pytest.raises(InputRefused, match="do not determine"):
        fit_dated_line(np.zeros(2), np.zeros(2, int), normal([5.0, 6.0], [1.0, 1.0]))


# ---------------------------------------------------------------------------- lopsided and bracketed dates


@pytest.mark.parametrize("expected", [80.0, 96.0, 100.0, 107.0, 131.0])
@pytest.mark.parametrize(
    ("minus", "plus", "bracketed"), [(3.0, 9.0, False), (20.0, 2.0, False), (3.0, 9.0, True)]
)
def test_the_likelihood_of_a_date_is_its_convolution_with_the_scatter(expected, minus, plus, bracketed):
    scatter = 4.0

    def density(true):
        if bracketed:
            return 1.0 / (minus + plus) if 100.0 - minus < true < 100.0 + plus else 0.0
        return stats.norm.pdf(true, 100.0, minus if true < 100.0 else plus)

    edges = [100.0 - 8 * minus - 60.0, 100.0 - minus, 100.0, 100.0 + plus, 100.0 + 8 * plus + 60.0]
    integral = sum(
        integrate.quad(lambda t: density(t) * stats.norm.pdf(t, expected, scatter), a, b, epsabs=1e-14)[0]
        for a, b in pairwise(edges)
    )
    events = DatedEvents(np.array([100.0]), np.array([minus]), np.array([plus]), np.array([bracketed]))
    found = np.exp(date_log_likelihood(events, np.array([expected]), np.array(scatter)))[0]
    assert found == pytest.approx(integral, rel=1e-6, abs=1e-12)


@pytest.mark.parametrize(("count", "seed"), [(2, 1), (3, 2), (5, 3), (9, 4)])
def test_normal_dates_predict_as_the_recurrence_of_the_forecaster(count, seed):
    rng = np.random.default_rng(seed)
    cycles = np.arange(float(count))
    dates = 50_000.0 + 2_900.0 * cycles + 15.0 * rng.standard_normal(count)
    sigmas = rng.uniform(3.0, 9.0, count)
    line = fit_dated_line(cycles, np.zeros(count, int), normal(dates, sigmas))
    found = line.quantile_of(line.column(count + 1.0), SHARES, with_scatter=True)
    expected = fit_recurrence(cycles, dates, sigmas).at(count + 1.0).quantiles_d(SHARES)
    assert found == pytest.approx(expected, abs=0.005 * np.ptp(expected))


def test_brackets_predict_as_the_posterior_integrated_over_a_grid():
    cycles = np.array([0.0, 1.0, 2.0])
    events = DatedEvents(
        np.array([0.0, 3_000.0, 6_010.0]), np.full(3, 60.0), np.array([60.0, 15.0, 60.0]),
        np.array([True, False, True]),
    )  # fmt: skip
    line = fit_dated_line(cycles, np.zeros(3, int), events)
    found = line.quantile_of(line.column(3.0), SHARES, with_scatter=True)
    # The same by brute force: constant, period and scatter on a grid, the stated prior of the scatter.
    constant = np.linspace(-250.0, 250.0, 121)[:, None, None]
    period = np.linspace(2_750.0, 3_250.0, 121)[None, :, None]
    scatter = np.exp(np.linspace(np.log(30.0) - 3.5, np.log(30.0) + 3.0, 40))[None, None, :]
    expected = np.stack(np.broadcast_arrays(*(constant + period * k for k in cycles)), axis=-1)
    ln = date_log_likelihood(events, expected, scatter[..., None]).sum(-1)
    ln = ln - 0.5 * np.log(scatter / 30.0) ** 2
    weight = np.exp(ln - ln.max())
    nodes = np.linspace(8_300.0, 9_700.0, 400)
    total = np.zeros(nodes.size)
    for k in range(scatter.size):
        centre = (constant + 3.0 * period)[..., 0]
        histogram, edges = np.histogram(centre, bins=700, range=(7_500.0, 10_500.0), weights=weight[..., k])
        middle = 0.5 * (edges[1:] + edges[:-1])
        total += histogram @ stats.norm.cdf((nodes[None, :] - middle[:, None]) / scatter[0, 0, k])
    oracle = np.interp(SHARES, total / total[-1], nodes)
    assert found == pytest.approx(oracle, abs=0.03 * np.ptp(oracle))


def test_maxima_sharpen_a_line_of_onsets_and_find_their_offset():
    rng = np.random.default_rng(8)
    cycles = np.repeat(np.arange(6.0), 2)
    kinds = np.tile([0, 1], 6)
    dates = 50_000.0 + 3_000.0 * cycles + 140.0 * kinds + 8.0 * rng.standard_normal(12)
    both = fit_dated_line(cycles, kinds, normal(dates, np.full(12, 8.0)))
    alone = fit_dated_line(cycles[::2], np.zeros(6, int), normal(dates[::2], np.full(6, 8.0)))
    mean, covariance = both.coefficients()
    assert abs(mean[2] - 140.0) < 3.0 * np.sqrt(covariance[2, 2])
    assert covariance[1, 1] < alone.coefficients()[1][1, 1]


def test_a_known_period_pulls_the_line():
    events = normal([0.0, 3_030.0], [10.0, 10.0])
    free = fit_dated_line(np.array([0.0, 1.0]), np.zeros(2, int), events)
    tied = fit_dated_line(np.array([0.0, 1.0]), np.zeros(2, int), events, period_prior_d=(3_000.0, 1.0))
    assert free.coefficients()[0][1] == pytest.approx(3_030.0, abs=0.1)
    assert tied.coefficients()[0][1] == pytest.approx(3_000.0, abs=1.0)


# -------------------------------------------------------------------------------------- counts and aliases


def test_three_dates_allow_a_period_and_its_halves_and_thirds_alike():
    ((given, expected),) = checks("ephem.alias")
    dates = np.array(given["T_yr"]) * YEAR
    sigma = np.full(3, given["sigma_yr"] * YEAR)
    found = possible_counts(np.arange(3), np.zeros(3, int), normal(dates, sigma), 3.2 * YEAR)
    by_count = {tuple(one.cycles.tolist()): one for one in found}
    for row in expected["acceptable(chi2<6, dof=1)"]:
        one = by_count[tuple(row["E"])]
        plain = fit_ephemeris(np.array(row["E"], float), dates, sigma)
        assert plain.period_d / YEAR == pytest.approx(float(row["P_yr"]), rel=1e-5)
        assert plain.chi2 == pytest.approx(float(row["chi2"]), abs=1e-4)
        assert one.log_evidence == pytest.approx(0.0, abs=1e-6)
    assert [one.divisor for one in found[:3]] == [1, 2, 3]
    assert found[0].cycles.tolist() == [0, 2, 3]


def test_four_years_are_seven_cycles_of_wr_25():
    # R2: the guess of about 4 years was an alias of 207.85 d.
    assert "207.85" in published("R2")["published"]
    dates = np.array([0.0, 7.0, 14.0]) * 207.85
    found = possible_counts(np.arange(3), np.zeros(3, int), normal(dates, np.full(3, 2.0)), 60.0)
    assert found[0].cycles.tolist() == [0, 1, 2]
    alias = next(one for one in found if one.divisor == 7)
    assert alias.period_d == pytest.approx(207.85, abs=0.5)
    assert alias.log_evidence == pytest.approx(found[0].log_evidence, abs=1e-3)


def test_a_period_from_two_events_has_an_error_that_covers_its_revision():
    # R3: 4.7 yr from two events became 5.1 yr with the third. With dates good to a quarter of a year, as
    # those of outbursts seen once a season are, the error from two events must allow that.
    assert "5.1" in published("R3")["published"]
    dates = normal(np.array([0.0, 4.7]) * YEAR, np.full(2, 0.25 * YEAR))
    found = fit_dated_line(np.array([0.0, 1.0]), np.zeros(2, int), dates)
    low, _, _, _, high = found.quantile_of(np.array([0.0, 1.0]), SHARES, with_scatter=False) / YEAR
    assert low < 4.7 < 5.1 < high


def test_a_count_is_safe_while_three_sigma_stay_under_half_a_period():
    from campaign.studies.cycles import count_is_safe

    ((given, expected),) = checks("ephem.cycle_count_rule")
    sigma = np.hypot(given["sigma_T_d"], given["gap_cycles"] * given["sigma_P_d"])
    assert sigma == pytest.approx(float(expected["sigma_after_gap_d"]), rel=1e-6)
    assert count_is_safe(given["gap_cycles"], given["P_d"], given["sigma_T_d"], given["sigma_P_d"])
    assert not count_is_safe(100, given["P_d"], given["sigma_T_d"], given["sigma_P_d"])


def test_one_episode_has_no_count_and_two_too_near_have_none_either():
    with pytest.raises(InputRefused, match="no period"):
        possible_counts(np.array([0]), np.array([0]), normal([5.0], [1.0]), 100.0)
    with pytest.raises(InputRefused, match="short"):
        possible_counts(
            np.arange(3), np.zeros(3, int), normal([0.0, 30.0, 30_000.0], [1.0, 1.0, 1.0]), 2_000.0
        )


# -------------------------------------------------------------------------------------- quiet observations


def test_what_was_not_observed_speaks_neither_way_and_nothing_speaks_more_than_a_thousandfold():
    line = RecurrencePrediction(np.ones(1), np.array([500.0]), np.array([20.0]), np.zeros(1), 1, True)
    dates = np.linspace(0.0, 1_000.0, 201)
    assert missed_log_chance(QuietProfile(dates, np.zeros(201)), line) == 0.0
    assert missed_log_chance(QuietProfile(dates, np.full(201, -900.0)), line) == pytest.approx(np.log(1e-3))
    half = QuietProfile(dates, np.where(dates < 500.0, -900.0, 0.0))
    assert missed_log_chance(half, line) == pytest.approx(np.log(0.5), abs=0.1)


def test_after_one_event_the_chance_of_a_year_is_that_of_a_scale_free_wait():
    # Gott 1993: having waited T, the next event comes within t with probability t / (T + t).
    dates = np.arange(10_000.0, 20_000.0, 20.0)
    profile = QuietProfile(dates, np.where(dates > 10_100.0, -20.0, 0.0))
    found = single_event_period(10_000.0, 5.0, profile, 20_000.0, 200.0)
    assert found is not None
    assert found.yearly == pytest.approx(365.25 / (10_000.0 + 365.25), rel=0.1)
    assert found.at_least_d == pytest.approx(10_000.0 / 0.95, rel=0.05)
    assert single_event_period(10_000.0, 5.0, QuietProfile(dates, np.zeros(500)), 20_000.0, 200.0) is None
