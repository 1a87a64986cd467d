"""Counting launches between images of nested shells, against the geometry of even motion."""

from __future__ import annotations

import numpy as np
import pytest

from campaign.errors import InputRefused
from campaign.physics.shellturns import launches_between
from campaign.physics.shellvalues import Sided


def images(period, years, first=2001.7):
    """Launches since the first image, and the age of the youngest shell in periods, by definition."""
    turns = (np.array(years) - first) / period
    whole = np.floor(turns)
    return tuple((whole - whole[0]).astype(int).tolist()), turns - whole


@pytest.mark.parametrize("period", [3.3, 8.0, 14.7, 31.0])
def test_a_period_from_elsewhere_counts_the_launches(period):
    years = [2004.1, 2011.9, 2024.6]
    launches, phase = images(period, years)
    best, *_ = launches_between(years, phase, [0.02] * 3, Sided(1.01 * period, 0.02 * period, 0.02 * period))
    assert best.launches == launches and best.probability > 0.95
    assert best.period_yr == pytest.approx(period, rel=0.02)


def test_two_images_alone_allow_many_periods_and_say_how_likely_each_is():
    years = [2004.1, 2017.6]
    launches, phase = images(9.0, years)
    found = launches_between(years, phase, [0.01, 0.01])
    assert sum(each.probability for each in found) == pytest.approx(1.0, abs=1e-3)
    assert found[0].probability < 0.9
    allowed = {each.launches: each.period_yr for each in found}
    # (t2 - t1) = (n + f2 - f1) P for every n that is not excluded.
    for (_, count), period in allowed.items():
        if period < 100.0:
            assert (count + phase[1] - phase[0]) * period == pytest.approx(13.5, rel=0.02)
    assert launches in allowed


def test_images_of_one_week_count_no_launch():
    _, phase = images(9.0, [2004.10, 2004.12])
    best, *_ = launches_between([2004.10, 2004.12], phase, [0.03, 0.03])
    assert best.launches == (0, 0) and best.probability > 0.9


def test_a_launch_between_two_near_images_is_seen_by_the_phase_that_starts_again():
    # The youngest shell of the first image is 0.98 periods old, that of the second 0.03: a new one came.
    best, *_ = launches_between([2010.0, 2010.45], [0.98, 0.03], [0.01, 0.01], Sided(9.0, 0.1, 0.1))
    assert best.launches == (0, 1)


def test_an_error_that_nobody_knows_is_refused():
    for sigma in ([0.0, 0.1], [np.nan, 0.1]):
        with pytest.raises(InputRefused):
            launches_between([2010.0, 2020.0], [0.1, 0.2], sigma)
