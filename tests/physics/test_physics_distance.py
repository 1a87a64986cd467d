"""Distance from a parallax. Checks from outside: the posterior integrated by scipy's adaptive quadrature, its
mode from the published cubic equation, and limits that follow from the definitions. No published table of
posteriors was at hand."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import quad

from campaign.errors import InputRefused
from campaign.physics.distance import distance_from_parallax

patient = settings(max_examples=60, deadline=None)
PRIOR = "exponentially decreasing space density prior"


def mode_pc(parallax_mas, error_mas, length_pc):
    """Bailer-Jones 2015, PASP 127, 994, eq. 19: r^3/L - 2 r^2 + (parallax/error^2) r - 1/error^2 = 0.

    From memory; it also follows by setting the derivative of the log posterior to zero."""
    parallax, error = parallax_mas / 1000.0, error_mas / 1000.0
    roots = np.roots([1.0 / length_pc, -2.0, parallax / error**2, -1.0 / error**2])
    real = roots[np.abs(roots.imag) < 1e-6 * np.abs(roots)].real
    return float(real[real > 0.0].min())


def share_below(r_pc, parallax_mas, error_mas, length_pc=1350.0):
    mode = mode_pc(parallax_mas, error_mas, length_pc)

    def log_density(r):
        return 2.0 * np.log(r) - r / length_pc - 0.5 * ((parallax_mas - 1000.0 / r) / error_mas) ** 2

    def mass(low, high):
        marks = np.unique(np.clip(np.concatenate([mode * np.geomspace(0.02, 50.0, 40), [r_pc]]), low, high))
        pieces = [
            quad(lambda r: np.exp(log_density(r) - log_density(mode)), a, b, epsabs=0.0, epsrel=1e-9)[0]
            for a, b in pairwise(marks)
        ]
        return sum(pieces)

    return mass(0.02 * mode, r_pc) / mass(0.02 * mode, 50.0 * mode)


def test_a_good_parallax_is_inverted_with_its_first_order_error():
    # 1/0.5 mas = 2000 pc; 4 % of it.
    assert distance_from_parallax(0.5, 0.02) == (2000.0, 80.0, 80.0, "plain inversion")
    assert distance_from_parallax(0.5, 0.025).method == "plain inversion"
    assert distance_from_parallax(0.5, 0.0251).method == PRIOR


@pytest.mark.parametrize(
    ("parallax", "error"),
    [(0.5, 0.1), (0.5, 0.026), (0.3, 0.3), (-0.2, 0.1), (0.05, 0.5), (10.0, 0.6), (0.0, 0.05)],
)
def test_the_quantiles_enclose_the_shares_that_quadrature_finds(parallax, error):
    found = distance_from_parallax(parallax, error)
    assert found.method == PRIOR
    for r, share in (
        (found.median_pc - found.minus_pc, 0.158655254),  # one sigma of a normal distribution
        (found.median_pc, 0.5),
        (found.median_pc + found.plus_pc, 0.841344746),
    ):
        assert share_below(r, parallax, error) == pytest.approx(share, abs=1e-4)


@patient
@given(st.floats(-3.0, 3.0), st.floats(-2.0, 0.5), st.floats(100.0, 5000.0))
def test_any_parallax_gives_a_positive_distance_with_positive_errors(size, log_error, length):
    found = distance_from_parallax(size, 10.0**log_error, length)
    assert 0.0 < found.minus_pc < found.median_pc
    assert found.plus_pc > 0.0


def test_without_information_the_prior_comes_back():
    # r^2 exp(-r/L) is a gamma distribution of shape 3: median 2.67406 L (scipy).
    from scipy.stats import gamma

    found = distance_from_parallax(0.0, 1e4)
    assert found.median_pc == pytest.approx(1350.0 * gamma(3).median(), rel=1e-4)
    assert found.plus_pc == pytest.approx(1350.0 * (gamma(3).ppf(0.841344746) - gamma(3).median()), rel=1e-4)


def test_the_method_changes_without_a_leap_in_the_distance():
    # At 5 % the prior moves the median by a fraction of the error.
    plain, posterior = distance_from_parallax(1.0, 0.05), distance_from_parallax(1.0, 0.05 + 1e-9)
    assert abs(plain.median_pc - posterior.median_pc) < 0.2 * plain.plus_pc


def test_a_near_star_with_a_poor_parallax_stays_near():
    # At 10 sigma the far tail has no weight: 1 pc within its error.
    found = distance_from_parallax(1000.0, 100.0)
    assert found.median_pc == pytest.approx(1.0, abs=0.1)
    assert found.plus_pc < 0.2


def test_a_negative_parallax_puts_the_star_far_away():
    assert distance_from_parallax(-0.2, 0.1).median_pc > distance_from_parallax(0.2, 0.1).median_pc


@pytest.mark.parametrize("numbers", [(np.nan, 0.1), (0.5, np.inf), (0.5, 0.0), (0.5, -0.1), (0.5, 0.1, 0.0)])
def test_impossible_parallaxes_are_refused(numbers):
    with pytest.raises(InputRefused) as refusal:
        distance_from_parallax(*numbers)
    assert refusal.value.code == "parallax-refused"
    assert refusal.value.hint
