"""The chance of quiet points under an episode, against the same written out with whole matrices.

Oracle: scipy.stats.multivariate_normal with the full covariance, and plain averages over draws.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.stats import multivariate_normal, norm

from campaign.errors import InputRefused
from campaign.physics.onsetfit import BandPoints
from campaign.physics.quietchance import ExpectedEpisodes, quiet_log_likelihood
from campaign.physics.riseshapes import RISE_WEIGHTS, rise_shapes


def band(times, excess, sigma, group, group_sigma, side=None):
    times = np.asarray(times, dtype=float)
    none = np.zeros(times.size, dtype=int)
    return BandPoints(
        times, 0.0 * times, np.asarray(excess, dtype=float), np.full(times.size, sigma),
        none if side is None else np.asarray(side), np.ones(times.size), np.asarray(group),
        np.asarray(group_sigma), times[-1], times[-1],
    )  # fmt: skip


def draws(rng, count, bands):
    return ExpectedEpisodes(
        rng.uniform(30.0, 200.0, count),
        rng.uniform(80.0, 300.0, count),
        rng.uniform(0.3, 2.0, (count, bands)),
        np.zeros((count, bands)),
    )


def written_out(bands, onset, expected):
    """Average of multivariate normal densities over draws and shapes, and the same without dust."""
    terms, quiet = [], 0.0
    for draw in range(expected.rise_d.size):
        for shape, share in enumerate(RISE_WEIGHTS):
            term = np.log(share / expected.rise_d.size)
            for number, one in enumerate(bands):
                since = one.bmjd_tdb - onset
                dust = expected.amplitude[draw, number] * rise_shapes(since / expected.rise_d[draw])[shape]
                dust = dust * np.exp(
                    -np.clip(since - expected.rise_d[draw], 0, None) / expected.decline_d[draw]
                )
                m = one.limit_side == 0
                same = one.group[m][:, None] == one.group[m][None, :]
                covariance = np.diag(one.sigma[m] ** 2) + same * one.group_sigma[one.group[m]][:, None] ** 2
                term += multivariate_normal.logpdf(one.excess[m], dust[m], covariance)
                z = one.limit_side[~m] * (one.excess[~m] - dust[~m]) / one.sigma[~m]
                term += norm.logcdf(z).sum()
                if draw == 0 and shape == 0:
                    quiet += multivariate_normal.logpdf(one.excess[m], np.zeros(m.sum()), covariance)
                    quiet += norm.logcdf(one.limit_side[~m] * one.excess[~m] / one.sigma[~m]).sum()
            terms.append(term)
    return np.logaddexp.reduce(terms) - quiet


def test_it_is_the_average_over_what_the_points_share():
    rng = np.random.default_rng(3)
    times = np.sort(rng.uniform(0.0, 300.0, 14))
    k = band(times, 0.03 * rng.normal(size=14), 0.04, rng.integers(0, 2, 14), [0.02, 0.08])
    side = np.where(np.arange(9) % 3 == 0, 1, 0)
    other = np.sort(rng.uniform(0.0, 300.0, 9))
    ell = band(other, np.where(side, 0.5, 0.05 * rng.normal(size=9)), 0.1, np.zeros(9, int), [0.05], side)
    expected = draws(rng, 5, 2)
    onsets = np.array([-400.0, 20.0, 150.0, 280.0, 500.0])
    found = quiet_log_likelihood([k, ell], onsets, expected)
    for onset, value in zip(onsets, found, strict=True):
        assert value == pytest.approx(written_out([k, ell], onset, expected), abs=1e-8)


def test_an_onset_after_the_last_point_is_not_touched():
    rng = np.random.default_rng(4)
    k = band(np.arange(0.0, 100.0, 10.0), np.zeros(10), 0.03, np.zeros(10, int), [0.01])
    assert quiet_log_likelihood([k], np.array([100.0, 2_000.0]), draws(rng, 6, 1)) == pytest.approx(0.0)


def test_a_rise_that_began_shortly_before_the_last_quiet_point_is_still_possible():
    rng = np.random.default_rng(5)
    k = band(np.arange(0.0, 100.0, 10.0), np.zeros(10), 0.03, np.zeros(10, int), [0.01])
    ln = quiet_log_likelihood([k], np.array([-100.0, 40.0, 84.0]), draws(rng, 60, 1))
    assert ln[0] < ln[1] < ln[2] < 0.0
    assert np.exp(ln[0]) < 1e-4
    assert np.exp(ln[2]) > 0.3


def test_an_episode_that_has_faded_before_anybody_looked_is_not_excluded():
    k = band(np.arange(2_000.0, 2_100.0, 10.0), np.zeros(10), 0.03, np.zeros(10, int), [0.01])
    rng = np.random.default_rng(6)
    assert quiet_log_likelihood([k], np.array([-2_000.0]), draws(rng, 60, 1))[0] > -0.2


def test_an_uncertain_level_weakens_what_many_points_exclude():
    rng = np.random.default_rng(7)
    times = np.arange(0.0, 200.0, 5.0)
    expected = draws(rng, 40, 1)
    sure, unsure = (
        quiet_log_likelihood(
            [band(times, np.zeros(times.size), 0.05, np.zeros(times.size, int), [level])],
            np.array([150.0]), expected,
        )[0]
        for level in (1e-4, 0.3)
    )  # fmt: skip
    assert sure < unsure < 0.0


def test_draws_that_do_not_fit_the_bands_are_refused():
    rng = np.random.default_rng(8)
    k = band([0.0, 1.0], [0.0, 0.0], 0.1, [0, 0], [0.1])
    with pytest.raises(InputRefused):
        quiet_log_likelihood([k, k], np.array([0.0]), draws(rng, 3, 1))
