"""Errors of results from errors of inputs, against closed forms."""

from __future__ import annotations

import numpy as np
import pytest

from campaign.model.measured import Measured, Range
from campaign.studies.propagation import DrawnTogether, Propagator, Uncertain

INPUTS = {
    "a": Uncertain("first", Measured(10.0, 1.0, 1.0)),
    "b": Uncertain("second", Measured(5.0, 0.2, 0.2)),
    "exact": Uncertain("third", Measured(2.0, 0.0, 0.0)),
    "vague": Uncertain("fourth", Measured(1.0)),
    "range": Uncertain("fifth", Range(2.0, 4.0)),
    "factor": Uncertain("sixth", Measured(1.0, 0.5, 1.0), by_factor=True),
}
DRAWS = 20_000


@pytest.fixture(scope="module")
def propagate():
    return Propagator(INPUTS, DRAWS, 1)


def test_a_sum_of_normal_errors_is_normal(propagate):
    found = propagate(lambda d: d["a"] + d["b"], ("a", "b"))
    assert found.value == 15.0
    assert found.sigma == pytest.approx(np.hypot(1.0, 0.2), rel=0.01)
    # Normal quantiles: 0.9945 and 1.9600 sigma (Abramowitz & Stegun 1964, table 26.5).
    assert found.hi68 - found.median == pytest.approx(0.9945 * np.hypot(1.0, 0.2), rel=0.02)
    assert found.hi95 - found.median == pytest.approx(1.96 * np.hypot(1.0, 0.2), rel=0.02)
    assert found.dominant == "first"
    assert found.dominant_share == pytest.approx(1.0 / 1.04, abs=0.01)


def test_what_is_exact_has_no_error_and_nothing_dominates(propagate):
    found = propagate(lambda d: d["exact"] ** 2, ("exact",))
    assert (found.value, found.sigma, found.dominant) == (4.0, 0.0, None)


def test_an_unknown_error_is_named_and_makes_no_interval(propagate):
    found = propagate(lambda d: d["a"] * d["vague"], ("a", "vague"))
    assert found.value == 10.0
    assert found.sigma is None
    assert found.unknown_errors == ("fourth",)


def test_a_range_is_even_between_its_ends(propagate):
    found = propagate(lambda d: d["range"], ("range",))
    assert found.value == 3.0
    assert found.sigma == pytest.approx(2.0 / np.sqrt(12.0), rel=0.01)
    assert (found.lo95, found.hi95) == pytest.approx((2.05, 3.95), abs=0.01)


def test_a_factor_is_normal_in_the_logarithm(propagate):
    found = propagate(lambda d: d["factor"], ("factor",))
    assert np.log(found.hi68) == pytest.approx(0.9945 * np.log(2.0), rel=0.02)
    assert np.log(found.lo68) == pytest.approx(-0.9945 * np.log(2.0), rel=0.02)


def test_draws_that_do_not_exist_are_counted_out(propagate):
    found = propagate(lambda d: np.sqrt(np.where(d["a"] > 10.0, d["a"] - 10.0, np.nan)), ("a",))
    assert found.probability == pytest.approx(0.5, abs=0.01)


def test_shares_are_those_of_the_interval_that_is_told(propagate):
    # Half of 68 % of an even range is 0.68 of its half-width; of a normal error 0.9945 sigma (Abramowitz &
    # Stegun 1964, table 26.5). Variances would give 75 % instead.
    found = propagate(lambda d: d["a"] + d["range"], ("a", "range"))
    assert found.dominant == "first"
    assert found.dominant_share == pytest.approx(0.9945**2 / (0.9945**2 + 0.68**2), abs=0.005)


def test_a_few_wild_draws_make_no_input_the_dominant_one(propagate):
    # A normal error passes 3.5 sigma in 2.3 of 10,000 cases (Abramowitz & Stegun 1964, table 26.1).
    found = propagate(lambda d: d["b"] + 1e4 * (d["a"] > 13.5), ("a", "b"))
    assert (found.dominant, found.dominant_share) == ("second", 1.0)


def test_what_was_drawn_together_is_one_cause():
    generator = np.random.default_rng(3)
    pair = generator.normal(size=DRAWS)
    fit = DrawnTogether("the fluxes", {"x": 1.0 + pair, "y": 1.0 - pair}, {"x": 1.0, "y": 1.0})
    propagate = Propagator({"b": INPUTS["b"]}, DRAWS, 1, fit)
    # Anticorrelated: their errors cancel in the sum.
    assert propagate(lambda d: d["x"] + d["y"], ("x", "y")).sigma == 0.0
    found = propagate(lambda d: d["x"] * d["b"], ("x", "b"))
    assert found.dominant == "the fluxes"
