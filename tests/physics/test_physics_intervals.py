"""Equal-tailed intervals. Oracles: scipy.stats and numpy's quantiles."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from campaign.physics.intervals import NORMAL_QUANTILES, PROBABILITIES, normal_quantiles, row_quantiles


def test_the_intervals_are_equal_tailed_68_and_95_percent():
    # Design, section 4: 68 % and 95 %, the same probability cut off on each side.
    assert PROBABILITIES.tolist() == [0.5, 0.16, 0.84, 0.025, 0.975]
    assert pytest.approx(stats.norm.ppf(PROBABILITIES), abs=1e-12) == NORMAL_QUANTILES


@given(mean=st.floats(-1e5, 1e5), sigma=st.floats(0.0, 1e4))
@settings(max_examples=100, deadline=None)
def test_quantiles_of_a_normal(mean, sigma):
    (found,) = normal_quantiles(np.array([mean]), np.array([sigma]))
    assert found == pytest.approx(mean + sigma * stats.norm.ppf(PROBABILITIES), rel=1e-12, abs=1e-9)
    shares = np.array([0.001, 0.3, 0.999])
    (other,) = normal_quantiles(np.array([mean]), np.array([sigma]), shares)
    assert other == pytest.approx(mean + sigma * stats.norm.ppf(shares), rel=1e-12, abs=1e-9)


@given(st.lists(st.floats(-1e6, 1e6), min_size=1, max_size=60), st.integers(0, 8))
@settings(max_examples=150, deadline=None)
def test_quantiles_of_draws_are_those_of_numpy_and_leave_missing_draws_out(values, missing):
    padded = np.concatenate([np.sort(values), np.full(missing, np.nan)])[None, :]
    (found,) = row_quantiles(padded, np.array([len(values)]), PROBABILITIES)
    assert found == pytest.approx(np.quantile(values, PROBABILITIES, method="hazen"), rel=1e-9, abs=1e-9)


def test_a_row_without_any_draw_has_no_quantiles():
    found = row_quantiles(np.full((1, 5), np.nan), np.array([0]), PROBABILITIES)
    assert np.isnan(found).all()
