"""Altitude of the Sun. Check from outside: skyfield with the ephemeris DE421."""

from __future__ import annotations

import socket
import warnings

import numpy as np
import pytest

from campaign.physics.constants import MJD_ZERO_JD
from campaign.physics.sun import sun_altitude_deg


@pytest.fixture
def sky(monkeypatch):
    from skyfield.api import Loader

    def refuse(*_, **__):
        raise AssertionError("a test opened a socket")

    monkeypatch.setattr(socket, "socket", refuse)
    monkeypatch.setattr(socket, "create_connection", refuse)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", RuntimeWarning)
        from skyfield_data import get_skyfield_data_path

        load = Loader(get_skyfield_data_path(), verbose=False)
        ephemeris = load("de421.bsp")
    yield ephemeris, load.timescale(builtin=True)
    ephemeris.close()


@pytest.mark.parametrize(
    ("longitude", "latitude"), [(-70.75, -31.25), (0.0, 0.0), (149.1, 52.0), (-155.5, 19.8)]
)
def test_the_sun_stands_where_another_library_puts_it(sky, longitude, latitude):
    from skyfield.api import wgs84

    ephemeris, scale = sky
    mjd = np.random.default_rng(21).uniform(43_000.0, 69_000.0, 200)  # 1976 to 2047
    when = scale.ut1_jd(mjd + MJD_ZERO_JD)
    place = ephemeris["earth"] + wgs84.latlon(latitude, longitude)
    altitude, _, _ = place.at(when).observe(ephemeris["sun"]).apparent().altaz()
    assert np.abs(sun_altitude_deg(mjd, longitude, latitude) - altitude.degrees).max() < 0.02


def test_arrays_broadcast():
    assert sun_altitude_deg([60000.0, 60000.5], [[0.0], [180.0]], 10.0).shape == (2, 2)
