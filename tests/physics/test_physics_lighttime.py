"""Light time to the barycentre. Checks from outside: the time.bjd rows of
tests/reference/checks_orbit_time.csv (source and basis in each row) and skyfield with the ephemeris DE421."""

from __future__ import annotations

import datetime
import socket
import warnings

import erfa
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from physics_reference import checks

from campaign.errors import InputRefused
from campaign.physics.constants import LIGHT_TIME_AU_S, MJD_ZERO_JD
from campaign.physics.lighttime import (
    barycentric_light_time_d,
    ephemeris_covers,
    heliocentric_light_time_d,
    to_barycentre,
    unit_vector,
)
from campaign.physics.timescales import to_tdb

patient = settings(max_examples=100, deadline=None)


def row_instant(inputs):
    moment = datetime.datetime.fromisoformat(inputs["utc_midexposure"]) - datetime.datetime(1858, 11, 17)
    return float(moment.days), moment.seconds / 86400.0


def row_site(inputs):
    site = inputs["site"]
    return None if site["name"] == "geocentre" else (site["lon_deg_E"], site["lat_deg"], site["h_m"])


@pytest.fixture
def no_network(monkeypatch):
    def refuse(*_, **__):
        raise AssertionError("a test opened a socket")

    monkeypatch.setattr(socket, "socket", refuse)
    monkeypatch.setattr(socket, "create_connection", refuse)


@pytest.fixture
def skyfield_ephemeris(no_network):
    from skyfield.api import Loader

    with warnings.catch_warnings():
        # The package warns of its Earth-orientation file, which is not used here.
        warnings.simplefilter("ignore", RuntimeWarning)
        from skyfield_data import get_skyfield_data_path

        load = Loader(get_skyfield_data_path(), verbose=False)
        ephemeris = load("de421.bsp")
    yield ephemeris, load.timescale(builtin=True)
    ephemeris.close()


@pytest.mark.parametrize(("inputs", "expected", "tolerance"), checks("time.bjd"))
def test_light_times_and_barycentric_dates_of_four_targets(inputs, expected, tolerance):
    assert tolerance == "0.01 s on ltt, 2e-7 d on JD"
    day, fraction = row_instant(inputs)
    ra, dec = inputs["target_icrs_deg"]
    site = row_site(inputs)
    tdb = sum(to_tdb(day, fraction, "utc"))
    to_sun = 86400.0 * float(heliocentric_light_time_d(tdb, ra, dec, site))
    to_barycentre_s = 86400.0 * float(barycentric_light_time_d(tdb, ra, dec, site))
    assert to_barycentre_s == pytest.approx(float(expected["ltt_bary_s"]), abs=0.01)
    assert to_sun == pytest.approx(float(expected["ltt_helio_s"]), abs=0.01)
    assert day + fraction + MJD_ZERO_JD == pytest.approx(float(expected["JD_UTC"]), abs=2e-7, rel=0)
    place = "geocentre" if site is None else "observatory"
    bjd = float(to_barycentre(day, fraction, "utc", place, ra, dec, site)) + MJD_ZERO_JD
    assert bjd == pytest.approx(float(expected["BJD_TDB"]), abs=2e-7, rel=0)
    assert 86400.0 * (bjd - (day + fraction + MJD_ZERO_JD)) == pytest.approx(
        float(expected["BJD_TDB_minus_JD_UTC_s"]), abs=0.01
    )
    # The same instant written as HJD in UTC leads to the same barycentric date.
    hjd = float(expected["HJD_UTC"]) - MJD_ZERO_JD
    assert day + fraction + to_sun / 86400.0 == pytest.approx(hjd, abs=2e-7, rel=0)
    from_hjd = float(to_barycentre(np.floor(hjd), hjd - np.floor(hjd), "utc", "heliocentre", ra, dec))
    assert from_hjd + MJD_ZERO_JD == pytest.approx(float(expected["BJD_TDB"]), abs=2e-7, rel=0)


def test_light_times_of_fifty_years_are_those_of_another_ephemeris(skyfield_ephemeris):
    ephemeris, scale = skyfield_ephemeris
    mjd = np.linspace(33282.0, 69000.0, 500)  # 1950 to 2047
    when = scale.tdb_jd(MJD_ZERO_JD + mjd)
    earth, sun = (ephemeris[name].at(when).position.au for name in ("earth", "sun"))
    for ra, dec in ((270.625, -23.5), (155.0, -59.7), (304.0, 36.65), (84.0, -69.1)):
        n = unit_vector(ra, dec)
        # erfa states 4.6 km rms and 13.4 km at most for the Earth about the barycentre: 45 us.
        found = 86400.0 * barycentric_light_time_d(mjd, ra, dec)
        assert found == pytest.approx(n @ earth * LIGHT_TIME_AU_S, abs=5e-5)
        found = 86400.0 * heliocentric_light_time_d(mjd, ra, dec)
        assert found == pytest.approx(n @ (earth - sun) * LIGHT_TIME_AU_S, abs=5e-5)


@patient
@given(st.floats(45000.0, 68000.0), st.floats(0.0, 360.0), st.floats(-89.0, 89.0))
def test_an_observatory_adds_at_most_21_ms(mjd, ra, dec):
    # The Earth's radius is 21.3 light-milliseconds.
    site = (-70.0, -31.2, 2300.0)
    offset_s = 86400.0 * (
        barycentric_light_time_d(mjd, ra, dec, site) - barycentric_light_time_d(mjd, ra, dec)
    )
    assert abs(offset_s) < 0.0213


def test_the_place_of_an_observatory_is_that_of_another_library(skyfield_ephemeris):
    from skyfield.api import wgs84

    ephemeris, scale = skyfield_ephemeris
    mjd = np.linspace(58849.0, 60676.0, 60)  # 2020 to 2024, where UT1 is measured
    when = scale.tdb_jd(MJD_ZERO_JD + mjd)
    observer = ephemeris["earth"] + wgs84.latlon(-31.2, -70.0, elevation_m=2300.0)
    place = observer.at(when).position.au - ephemeris["earth"].at(when).position.au
    for ra, dec in ((0.0, 0.0), (90.0, 0.0), (0.0, 90.0)):
        offset = 86400.0 * (
            barycentric_light_time_d(mjd, ra, dec, (-70.0, -31.2, 2300.0))
            - barycentric_light_time_d(mjd, ra, dec)
        )
        # UT1 - UTC is below 0.2 s in these years: 0.3 us; polar motion 0.05 us.
        assert offset == pytest.approx(unit_vector(ra, dec) @ place * LIGHT_TIME_AU_S, abs=5e-7)


@patient
@given(st.floats(20000.0, 80000.0), st.floats(0.0, 360.0), st.floats(-90.0, 90.0))
def test_a_heliocentric_date_leads_to_the_same_barycentric_date_as_the_observation(mjd, ra, dec):
    day = np.floor(mjd)
    bmjd = to_barycentre(day, mjd - day, "tdb", "geocentre", ra, dec)
    hmjd = mjd + heliocentric_light_time_d(mjd, ra, dec)
    again = to_barycentre(np.floor(hmjd), hmjd - np.floor(hmjd), "tdb", "heliocentre", ra, dec)
    assert float(again - bmjd) * 86400.0 == pytest.approx(0.0, abs=3e-6)  # three roundings of one double


def test_published_sizes_of_light_time_errors():
    # Eastman, Siverd & Gaudi 2010: HJD within about 4 s of BJD in common use (the Sun's distance from the
    # barycentre, 4 to 5 s at most), and light time up to 8.3 min on the ecliptic.
    ((_, expected, tolerance),) = [row.values for row in checks("time.size_of_mistake.table")]
    assert tolerance == "as printed"
    mjd = np.arange(51544.0, 63000.0, 3.0)  # 2000 to 2031
    ecliptic = (270.0, -23.44)
    to_sun = 86400.0 * heliocentric_light_time_d(mjd, *ecliptic)
    off = np.abs(86400.0 * barycentric_light_time_d(mjd, *ecliptic) - to_sun).max()
    assert off == pytest.approx(expected["HJD-BJD_max_s"], abs=0.5)
    half_swing_min = (to_sun.max() - to_sun.min()) / 120.0
    assert half_swing_min == pytest.approx(expected["JD_vs_BJD_ecliptic_max_min"], abs=0.01)


def test_dates_far_beyond_the_ephemeris_are_answered_and_marked():
    mjd = np.array([-678575.0, -678575.0 + 200_000.0, 15019.9, 15020.0, 60000.0, 88068.9, 88069.0, 2973483.0])
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        away = barycentric_light_time_d(mjd, 270.0, -23.44, (-70.0, -31.2, 2300.0))
    assert (np.abs(away) * 1440.0 < 8.6).all()
    assert ephemeris_covers(mjd).tolist() == [False, False, False, True, True, True, False, False]


def test_far_from_our_centuries_the_earth_is_where_mean_elements_put_it():
    # erfa.plan94: Simon et al. 1994. The Earth is 1/82.3 of the Moon's distance off the barycentre of both.
    mjd = 51544.5 + (np.linspace(1.0, 5000.0, 2000) - 2000.0) * 365.25
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", erfa.ErfaWarning)
        both = erfa.plan94(MJD_ZERO_JD, mjd, 3)["p"]
        moon = erfa.moon98(MJD_ZERO_JD, mjd)["p"]
    for ra, dec in ((0.0, 0.0), (90.0, 0.0), (0.0, 90.0)):
        expected = (both - moon / 82.3) @ unit_vector(ra, dec) * LIGHT_TIME_AU_S
        assert 86400.0 * heliocentric_light_time_d(mjd, ra, dec) == pytest.approx(expected, abs=0.1)


def test_an_instant_at_the_barycentre_gets_no_light_time():
    assert to_barycentre(60000.0, 0.25, "tdb", "barycentre", 10.0, 20.0) == 60000.25
    # From TT to TDB is under 2 ms.
    assert to_barycentre(60000.0, 0.25, "tt", "barycentre", 10.0, 20.0) == pytest.approx(60000.25, abs=2.1e-8)


def test_many_instants_at_once_and_one_unknown_among_them():
    found = to_barycentre(60000.0, [0.1, np.nan, 0.3], "utc", "observatory", 10.0, 20.0, (10.0, 50.0, 100.0))
    assert found.shape == (3,)
    assert np.isnan(found[1])
    assert found[2] == to_barycentre(60000.0, 0.3, "utc", "observatory", 10.0, 20.0, (10.0, 50.0, 100.0))


@pytest.mark.parametrize(
    ("scale", "place", "code"),
    [
        ("utc", "observatory", "site-missing"),
        ("utc", "moon", "place-refused"),
        ("local", "geocentre", "scale-refused"),
    ],
)
def test_what_cannot_be_placed_is_refused(scale, place, code):
    with pytest.raises(InputRefused) as refusal:
        to_barycentre(60000.0, 0.0, scale, place, 10.0, 20.0)
    assert refusal.value.code == code
    assert refusal.value.hint
