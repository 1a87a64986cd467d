"""Nothing in the sample is real, and nothing stands near a real dust maker or a real observatory."""

from __future__ import annotations

import re

import numpy as np
import pytest

# Dust-making colliding-wind binaries, J2000 degrees. Source: memory; used for distance only.
REAL_DUST_MAKERS = {
    "WR 19": (154.52, -58.27),
    "WR 48a": (198.17, -62.72),
    "WR 98a": (265.30, -30.54),
    "WR 104": (270.52, -23.63),
    "WR 112": (274.14, -18.98),
    "WR 125": (292.07, 19.56),
    "WR 137": (303.63, 36.66),
    "WR 147": (309.18, 40.35),
    "HD 36402": (81.52, -67.50),
}
# Observatories, latitude and longitude East in degrees. Source: memory; used for distance only.
REAL_OBSERVATORIES = {
    "Paranal": (-24.63, -70.40),
    "La Silla": (-29.26, -70.73),
    "Cerro Tololo": (-30.17, -70.81),
    "Leoncito": (-31.80, -69.30),
    "Mauna Kea": (19.83, -155.47),
    "Sutherland": (-32.38, 20.81),
    "Gamsberg": (-23.34, 16.23),
    "Siding Spring": (-31.27, 149.07),
    "Kitt Peak": (31.96, -111.60),
    "Mount Wilson": (34.22, -118.06),
    "Lick": (37.34, -121.64),
    "Teide": (28.30, -16.51),
    "Assy": (43.23, 77.87),
    "Maidanak": (38.67, 66.90),
}


def separation_deg(lon1, lat1, lon2, lat2):
    lon1, lat1, lon2, lat2 = np.radians([lon1, lat1, lon2, lat2])
    cosine = np.sin(lat1) * np.sin(lat2) + np.cos(lat1) * np.cos(lat2) * np.cos(lon1 - lon2)
    return np.degrees(np.arccos(np.clip(cosine, -1.0, 1.0)))


@pytest.mark.parametrize("real", REAL_DUST_MAKERS)
def test_no_system_is_within_two_degrees_of_a_real_dust_maker(sample, real):
    ra, dec = REAL_DUST_MAKERS[real]
    for record in sample.records:
        assert separation_deg(record.system.ra_deg, record.system.dec_deg, ra, dec) > 2.0


@pytest.mark.parametrize("real", REAL_OBSERVATORIES)
def test_no_station_is_within_a_degree_of_a_real_observatory(sample, real):
    latitude, longitude = REAL_OBSERVATORIES[real]
    for site in sample.sites:
        if site.kind == "ground":
            away = separation_deg(site.longitude_deg_east, site.latitude_deg, longitude, latitude)
            assert away > 1.0, site.name


def test_no_two_systems_stand_close_together(sample):
    places = [(r.system.ra_deg, r.system.dec_deg) for r in sample.records]
    for i, one in enumerate(places):
        assert all(separation_deg(*one, *other) > 5.0 for other in places[i + 1 :])


def test_no_name_looks_like_a_real_designation(sample):
    # How real designations look: common practice, no source.
    real = re.compile(
        r"\b(HD|HIP|HR|WR|TYC|NGC|IC|MR|GSC|SAO|BD|CD|CPD|LS|AS|Gaia|2MASS|WISE|IRAS|MSX|TIC|SMC|LMC|V\d|"
        r"[A-Z]{1,2} [A-Z][a-z]{2}\b|J\d{4,}|\d{4}[+-]\d)"
    )
    for record in sample.records:
        for name in (record.system.name, *record.system.aliases):
            assert not real.search(name), name


def test_every_system_says_that_it_is_invented(sample):
    assert all(record.system.notes.startswith("Invented.") for record in sample.records)
    assert all("Invented" in site.notes for site in sample.sites)


def test_sizes_are_those_of_such_binaries(sample):
    # Periods of years to decades, separations of tens of au, kpc, winds near 1 % of the speed of light:
    # common practice, no source.
    for record, truth in zip(sample.records, sample.truth.systems, strict=True):
        elements = truth.elements
        assert 4.0 < elements.period_d / 365.25 < 45.0
        assert 8.0 < elements.a_au < 40.0
        assert 1000.0 < elements.distance_pc < 5000.0
        assert 10.0 < elements.mass_a_msun + elements.mass_b_msun < 60.0
        for star in (record.system.star_a, record.system.star_b):
            assert 1200.0 < star.wind_speed_kms.value < 3300.0
