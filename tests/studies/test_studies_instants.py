"""From what was typed to the catalogue's axis. Oracle: astropy's time scales and light travel times."""

from __future__ import annotations

import pytest
from astropy import units as u
from astropy.coordinates import EarthLocation, SkyCoord
from astropy.time import Time
from studies_examples import stamp, system

from campaign.model.systems import Site
from campaign.reading.instants import read_instant
from campaign.studies import watch
from campaign.studies.instants import axis_instant, moment_of, spoken_moment
from campaign.studies.lightcurves import CataloguedCurves

LANTERN = system()
MESA = Site(1, "Cold Mesa", latitude_deg=-31.2, longitude_deg_east=-70.0, height_m=2_300.0)
KITE = Site(2, "High Kite", "space", elongation_min_deg=85.0, elongation_max_deg=135.0)


def arrival_at_the_barycentre(text, place):
    target = SkyCoord(LANTERN.ra_deg * u.deg, LANTERN.dec_deg * u.deg)
    where = EarthLocation.from_geodetic(*place) if place else EarthLocation.from_geocentric(0, 0, 0, u.m)
    seen = Time(text, scale="utc", location=where)
    return (seen.tdb + seen.light_travel_time(target, ephemeris="builtin")).mjd


@pytest.mark.parametrize("text", ["2019-01-15T04:05:06", "2023-06-30T23:59:59", "2024-09-30T12:00:00"])
def test_an_observation_is_carried_to_the_barycentre_of_the_solar_system(text):
    moment = moment_of(read_instant(text + "Z"), LANTERN, MESA)
    expected = arrival_at_the_barycentre(text, (-70.0, -31.2, 2_300.0))
    assert (moment.bmjd_tdb - expected) * 86_400.0 == pytest.approx(0.0, abs=0.02)
    assert (moment.text, moment.scale, moment.place) == (text + "Z", "utc", "observatory")


@pytest.mark.parametrize("site", [None, KITE])
def test_without_a_place_on_the_ground_the_centre_of_the_earth_stands_in(site):
    text = "2024-09-30T12:00:00"
    moment = moment_of(read_instant(text + "Z"), LANTERN, site)
    expected = arrival_at_the_barycentre(text, None)
    assert (moment.bmjd_tdb - expected) * 86_400.0 == pytest.approx(0.0, abs=0.02)
    on_the_ground = moment_of(read_instant(text + "Z"), LANTERN, MESA).bmjd_tdb
    assert abs(moment.bmjd_tdb - on_the_ground) * 86_400.0 < 0.0213  # the radius of the Earth over c


def test_a_barycentric_date_is_taken_as_it_is():
    moment = moment_of(read_instant("BJD 2461234.2±0.5"), LANTERN, MESA)
    assert moment.bmjd_tdb == pytest.approx(61_233.7, abs=1e-9)
    assert (moment.minus_d, moment.plus_d, moment.place) == (0.5, 0.5, "barycentre")


def test_heliocentric_and_barycentric_dates_differ_by_seconds():
    # Eastman, Siverd & Gaudi 2010: HJD in UTC is off BJD in TDB by the scale (69.184 s) and at most 4 s more.
    hjd = moment_of(read_instant("HJD 2461234.2"), LANTERN).bmjd_tdb
    assert abs((hjd - 61_233.7) * 86_400.0 - 69.184) < 4.5
    assert hjd != 61_233.7


def test_the_same_instant_of_two_systems_differs_by_their_light_times():
    other = system(2, "Anvil 1", parallax_mas=None)
    turned = moment_of(read_instant("2024-09-30T12:00:00Z"), LANTERN).bmjd_tdb
    opposite = moment_of(
        read_instant("2024-09-30T12:00:00Z"),
        type(other)(2, "Anvil 1", (LANTERN.ra_deg + 180.0) % 360.0, -LANTERN.dec_deg),
    ).bmjd_tdb
    scale_d = 69.184 / 86_400.0
    middle = 0.5 * (turned + opposite)
    assert middle - read_instant("2024-09-30T12:00:00Z").mjd == pytest.approx(scale_d, abs=1e-7)


def test_a_question_belongs_to_no_system_and_gets_no_light_time():
    typed = read_instant("2024-09-30T12:00:00Z")
    assert axis_instant(typed) == pytest.approx(Time("2024-09-30T12:00:00", scale="utc").tdb.mjd, abs=2e-8)


def test_the_echo_says_the_axis_and_the_date():
    said = spoken_moment(moment_of(read_instant("BJD 2461234.5"), LANTERN))
    assert said == "BMJD_TDB 61234.000000 (2026-07-12T23:58:51Z at the barycentre)"


# --------------------------------------------------------------- light curves fetched when looked at


def test_light_curves_are_read_once_and_only_those_asked_for(db, monkeypatch):
    from campaign.catalogue import observations
    from campaign.model.instants import Moment
    from campaign.model.measured import Measured
    from campaign.model.observations import Observation
    from campaign.studies import systems
    from campaign.studies.log import log_observations

    for name in ("Lantern 3", "Anvil 1"):
        systems.add_system(db, stamp(), system(0, name))
        draft = Observation(
            0, "", 0, "photometry", Moment(0.0), value=Measured(7.5, 0.02, 0.02), unit="mag", band="K"
        )
        log_observations(db, stamp(), name, [draft], "2031-04-06T03:00:00Z", None)
    asked = []
    whole = observations.photometry_arrays
    monkeypatch.setattr(
        observations, "photometry_arrays", lambda c, ids, **kw: asked.append(list(ids)) or whole(c, ids, **kw)
    )
    curves = watch.load_campaign(db, None, None, None).photometry
    assert isinstance(curves, CataloguedCurves) and len(curves) == 2 and asked == []
    first, second = curves
    assert curves[first].mag.tolist() == [7.5]
    assert curves[first] is curves[first]
    assert asked == [[first]]
    curves.fetch([first, second])
    assert asked == [[first], [second]]
    with pytest.raises(KeyError):
        curves[99]
