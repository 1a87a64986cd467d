"""Random draws: stratified, two-piece, cut to a domain. Oracles: definitions and scipy.stats."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from campaign.physics.draws import stratified_normals, two_piece_normal, two_piece_within

sizes = st.floats(0.01, 100.0)


def column(x):
    return np.array([[float(x)]])


def test_every_stratum_of_equal_probability_holds_exactly_one_draw():
    # Definition of Latin hypercube sampling (McKay, Beckman & Conover 1979).
    drawn = stratified_normals(["period_d", "epoch"], 5_000, 3)
    for z in drawn.values():
        strata = np.floor(stats.norm.cdf(z) * 5_000).astype(int)
        assert np.array_equal(np.sort(strata), np.arange(5_000))


def test_draws_of_different_names_are_independent():
    drawn = stratified_normals(["period_d", "epoch", "onset"], 20_000, 1)
    together = np.corrcoef(np.stack(list(drawn.values())))
    # The correlation of independent samples is normal with variance 1/n.
    assert np.abs(together[np.triu_indices(3, 1)]).max() < 4.0 / np.sqrt(20_000)


def test_draws_follow_the_normal_distribution_into_its_tails():
    z = stratified_normals(["epoch"], 20_000, 5)["epoch"]
    for share in (0.001, 0.025, 0.16, 0.5, 0.84, 0.975, 0.999):
        assert np.quantile(z, share) == pytest.approx(stats.norm.ppf(share), abs=0.02)
    assert stats.kstest(z, "norm").pvalue > 0.99  # stratified: nearer to the normal than chance


@given(seed=st.integers(0, 2**32), others=st.lists(st.text(min_size=1, max_size=12), max_size=4))
@settings(max_examples=30, deadline=None)
def test_a_name_gets_the_same_draws_whatever_else_is_asked_for(seed, others):
    alone = stratified_normals(["epoch"], 50, seed)["epoch"]
    among = stratified_normals([*others, "epoch"], 50, seed)["epoch"]
    assert np.array_equal(alone, among)


def test_another_seed_gives_other_draws():
    first, second = (stratified_normals(["epoch"], 100, seed)["epoch"] for seed in (1, 2))
    assert not np.any(first == second)


@given(value=st.floats(-1e5, 1e5), minus=sizes, plus=sizes)
@settings(max_examples=50, deadline=None)
def test_the_stated_value_of_an_asymmetric_error_is_its_median(value, minus, plus):
    z = stratified_normals(["x"], 4_000, 1)["x"][None, :]
    drawn = two_piece_normal(column(value), column(minus), column(plus), z)
    assert np.mean(drawn < value) == 0.5  # strata: exactly half
    assert np.quantile(drawn, stats.norm.cdf(-1.0)) == pytest.approx(value - minus, abs=0.01 * minus)
    assert np.quantile(drawn, stats.norm.cdf(1.0)) == pytest.approx(value + plus, abs=0.01 * plus)


@pytest.mark.parametrize(
    ("value", "error", "low", "high"),
    [(0.1, 0.2, 0.0, 1.0), (0.0, 0.05, 0.0, 1.0), (0.95, 0.1, 0.0, 1.0), (3.0, 4.0, 1e-6, np.inf)],
)
def test_a_value_near_the_edge_of_its_domain_is_a_truncated_normal(value, error, low, high):
    z = stratified_normals(["x"], 20_000, 1)["x"][None, :]
    drawn = two_piece_within(column(value), column(error), column(error), z, low, high)[0]
    oracle = stats.truncnorm((low - value) / error, (high - value) / error, loc=value, scale=error)
    assert drawn.min() >= low and drawn.max() <= high
    for share in (0.025, 0.16, 0.5, 0.84, 0.975):
        assert np.quantile(drawn, share) == pytest.approx(oracle.ppf(share), abs=0.003 * error)


def test_far_from_its_edges_a_domain_changes_nothing():
    z = stratified_normals(["x"], 1_000, 1)["x"][None, :]
    args = (column(0.5), column(0.02), column(0.04), z)
    assert np.array_equal(two_piece_within(*args, 0.0, 1.0), two_piece_normal(*args))


def test_each_row_has_its_own_value_and_an_unknown_value_stays_unknown():
    z = stratified_normals(["x"], 200, 1)["x"][None, :]
    value, error = np.array([[0.5], [np.nan], [0.05]]), np.array([[0.01], [0.0], [0.1]])
    drawn = two_piece_within(value, error, error, z, 0.0, 1.0)
    assert np.isnan(drawn[1]).all()
    assert np.isfinite(drawn[[0, 2]]).all() and (drawn[[0, 2]] >= 0.0).all()


def test_a_value_declared_exact_does_not_vary():
    z = stratified_normals(["x"], 100, 1)["x"][None, :]
    drawn = two_piece_within(column(0.0), column(0.0), column(0.0), z, 0.0, 1.0)
    assert np.array_equal(drawn, np.zeros((1, 100)))
