"""Cycles of launches and periods between images: the sky drawn anew, the ephemeris carried by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest

from campaign.errors import InputRefused
from campaign.physics.shellcycles import cycle_posterior, periods_between_images, phase_of_launch
from campaign.physics.shellvalues import Sided


def test_a_launch_belongs_to_the_cycle_it_lies_nearest():
    found = cycle_posterior(1992.1, 0.5, 2000.0, 0.05, 8.0, 0.01)
    assert found.cycles[0] == -1
    # By hand: 1992.0 expected, error sqrt(0.5^2 + 0.05^2 + 0.01^2).
    assert found.offsets_sigma[0] == pytest.approx(0.1 / math.sqrt(0.2526), rel=1e-3)
    assert found.probabilities[0] > 0.9999


def test_a_period_known_poorly_leaves_old_launches_between_cycles():
    """60 years back the error of the period, 0.3 yr, has grown to 2.25 yr in seven and a half cycles."""
    sure = cycle_posterior(1936.0, 0.3, 2000.0, 0.05, 8.0, 0.01)
    unsure = cycle_posterior(1940.0, 2.0, 2000.0, 0.05, 8.0, 0.3)
    assert sure.probabilities[0] > 0.999
    assert set(unsure.cycles[:2].tolist()) == {-7, -8}
    assert 0.3 < unsure.probabilities[0] < 0.7
    assert unsure.probabilities.sum() == pytest.approx(1.0, abs=1e-3)


def test_the_probability_of_a_cycle_is_its_frequency():
    """4,000 invented launches of known cycle; |z| < 3 against the sum of the probabilities."""
    rng = np.random.default_rng(501)
    promised, right = [], []
    for _ in range(4_000):
        cycle = int(rng.integers(-8, 1))
        launched = 2000.0 + 8.0 * cycle
        # Epoch and period as somebody measured them, the launch as an image gives it.
        measured = launched + 2.0 * rng.standard_normal()
        epoch, period = 2000.0 + 0.3 * rng.standard_normal(), 8.0 + 0.1 * rng.standard_normal()
        found = cycle_posterior(measured, 2.0, epoch, 0.3, period, 0.1)
        # All cycles are as probable beforehand; those that were never drawn would spoil the tally.
        allowed = (found.cycles >= -8) & (found.cycles <= 0)
        weight = np.where(allowed, found.probabilities, 0.0)
        best = int(np.argmax(weight))
        promised.append(weight[best] / weight.sum())
        right.append(found.cycles[best] == cycle)
    promised = np.array(promised)
    z = (np.sum(right) - promised.sum()) / math.sqrt(np.sum(promised * (1.0 - promised)))
    assert abs(z) < 3.0


def test_the_covariance_of_epoch_and_period_counts():
    """Anticorrelated: towards later cycles the error shrinks (by hand)."""
    found = cycle_posterior(2081.0, 0.0, 2000.0, 1.0, 8.0, 0.1, covariance_yr2=-0.09)
    at = list(found.cycles).index(10)
    variance = 1.0 + 100 * 0.01 - 20 * 0.09
    assert found.offsets_sigma[at] == pytest.approx(1.0 / math.sqrt(variance), rel=1e-9)


def test_the_window_of_production_counts_as_an_error():
    found = cycle_posterior(2000.5, 0.0, 2000.0, 0.0, 8.0, 0.0, half_window_yr=0.25)
    assert found.offsets_sigma[0] == pytest.approx(2.0)


def test_two_images_allow_every_period_that_moves_the_pattern_alike():
    """interval = (n + fraction) P: 12 yr and half a spacing allow 24, 8, 4.8 ... yr."""
    found = periods_between_images(Sided(0.2, 0.01, 0.01), Sided(0.7, 0.01, 0.01), 12.0, shortest_yr=3.0)
    periods = sorted((each.period_yr for each in found), reverse=True)
    assert periods == pytest.approx([24.0, 8.0, 4.8, 12 / 3.5], rel=1e-9)
    assert sum(each.probability for each in found) == pytest.approx(1.0)
    # Nothing known beforehand: no period is nearly sure.
    assert max(each.probability for each in found) < 0.8
    (eight,) = [each for each in found if each.launches == 1]
    assert eight.period_sigma_yr == pytest.approx(8.0 / 1.5 * math.hypot(0.01, 0.01), rel=1e-9)


def test_a_period_from_elsewhere_chooses_among_them():
    found = periods_between_images(
        Sided(0.7, 0.01, 0.01), Sided(0.2, 0.01, 0.01), 12.0, period_yr=Sided(8.5, 0.5, 0.5)
    )
    # 12 yr = (2 - 0.5) x 8 yr: two launches between, and the innermost of the second image is younger.
    assert found[0].launches == 2
    assert found[0].period_yr == pytest.approx(8.0)
    assert found[0].probability > 0.99


def test_phases_are_counted_from_the_nearest_periastron():
    assert phase_of_launch([1999.2, 2000.8, 2003.999, 2004.0], 2000.0, 8.0).tolist() == pytest.approx(
        [-0.1, 0.1, 0.499875, -0.5]
    )


@pytest.mark.parametrize(
    "call",
    [
        lambda: cycle_posterior(2000.0, 0.1, 2000.0, 0.1, 0.0, 0.1),
        lambda: cycle_posterior(2000.0, math.nan, 2000.0, 0.1, 8.0, 0.1),
        lambda: periods_between_images(Sided(0.2), Sided(0.7, 0.1, 0.1), 12.0),
        lambda: periods_between_images(Sided(0.2, 0.1, 0.1), Sided(0.7, 0.1, 0.1), 0.0),
        lambda: phase_of_launch([2000.0], 2000.0, -8.0),
    ],
)
def test_what_cannot_be_weighed_is_refused(call):
    with pytest.raises(InputRefused):
        call()
