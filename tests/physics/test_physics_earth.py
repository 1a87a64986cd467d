"""Reading slow functions off between whole days. Checks from outside: erfa itself, asked for each instant,
whose numbers the interpolation must give back; the sizes allowed are those that the docstrings state."""

from __future__ import annotations

import erfa
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from campaign.physics.constants import AU_KM, LIGHT_TIME_AU_S, MJD_ZERO_JD
from campaign.physics.earth import earth_along_au, earth_days, site_along_au
from campaign.physics.lighttime import to_barycentre, unit_vector
from campaign.physics.nodes import needed_days
from campaign.physics.timescales import to_tdb

patient = settings(max_examples=60, deadline=None)


@pytest.mark.parametrize("origin", [0, 1], ids=["sun", "barycentre"])
@pytest.mark.parametrize("axis", [0, 1, 2])
def test_the_earth_between_two_days_is_where_erfa_puts_it(origin, axis):
    mjd = np.random.default_rng(11).uniform(15_100.0, 88_000.0, 4_000)
    n = np.eye(3)[axis]
    from_erfa = erfa.epv00(MJD_ZERO_JD, mjd)[origin]["p"][:, axis]
    off_us = 1e6 * LIGHT_TIME_AU_S * np.abs(earth_along_au(earth_days(mjd), mjd, n, origin) - from_erfa)
    assert off_us.max() < 0.35


def test_an_observatory_between_two_days_is_where_erfa_puts_it():
    rng = np.random.default_rng(12)
    mjd = rng.uniform(50_000.0, 66_000.0, 1_000)
    n = rng.normal(size=(1_000, 3))
    n /= np.linalg.norm(n, axis=1)[:, None]
    place_m = erfa.gd2gc(1, np.radians(-70.0), np.radians(-31.2), 2300.0)
    matrix = erfa.c2t00b(MJD_ZERO_JD, mjd, MJD_ZERO_JD, mjd, 0.0, 0.0)
    celestial_m = np.einsum("nji,j->ni", matrix, place_m)
    expected_m = np.sum(celestial_m * n, axis=1)
    found_m = 1000.0 * AU_KM * site_along_au(mjd, np.floor(mjd), mjd % 1.0, n, (-70.0, -31.2, 2300.0))
    assert np.abs(found_m - expected_m).max() < 0.2


def test_tdb_between_two_days_is_that_of_erfa():
    mjd = np.random.default_rng(13).uniform(15_100.0, 88_000.0, 4_000)
    _, rest = to_tdb(np.floor(mjd), mjd % 1.0, "tt")
    expected_s = erfa.dtdb(MJD_ZERO_JD, mjd, 0.0, 0.0, 0.0, 0.0)
    # The difference of two fractions of a day is known to 1e-11 s; the docstring says 1e-10 s.
    assert np.abs((rest - mjd % 1.0) * 86400.0 - expected_s).max() < 1.2e-10


@patient
@given(
    st.lists(st.floats(30_000.0, 80_000.0), min_size=2, max_size=30),
    st.sampled_from(["observatory", "geocentre", "heliocentre"]),
    st.sampled_from(["utc", "tt", "tdb", "tai", "ut"]),
)
def test_one_instant_among_many_is_the_same_to_the_last_bit(instants, place, scale):
    # What is loaded a million at a time must be known again when it is logged one by one.
    mjd = np.array(instants)
    day, fraction = np.floor(mjd), mjd % 1.0
    ra, dec = np.linspace(0.0, 350.0, mjd.size), np.linspace(-80.0, 80.0, mjd.size)
    site = (149.1, -31.3, 1100.0)
    together = to_barycentre(day, fraction, scale, place, ra, dec, site)
    alone = [
        float(to_barycentre(day[i], fraction[i], scale, place, float(ra[i]), float(dec[i]), site))
        for i in range(mjd.size)
    ]
    assert together.tolist() == alone


def test_directions_are_the_same_to_the_last_bit_one_by_one():
    rng = np.random.default_rng(14)
    ra, dec = rng.uniform(0.0, 360.0, 1_003), rng.uniform(-90.0, 90.0, 1_003)
    together = unit_vector(ra, dec)
    assert all((unit_vector(a, d) == row).all() for a, d, row in zip(ra, dec, together, strict=True))


@patient
@given(st.lists(st.integers(-700_000, 3_000_000), max_size=20), st.integers(-2, 0), st.integers(0, 2))
def test_every_day_needed_is_there_once(days, first, last):
    found = needed_days(np.array(days, dtype=np.int64), first, last).tolist()
    assert found == sorted({day + step for day in days for step in range(first, last + 1)})
