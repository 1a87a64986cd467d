"""The sample's own clock and a light Earth: UTC to barycentric TDB to about a second, seasons to a day.

Kept apart from the program's own time handling on purpose: the sample must not depend on what it tests.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

SAMPLE_AS_OF = "2027-03-01T00:00:00Z"
# The same instant at the barycentre in TDB: 37 s of leap seconds and 32.184 s.
AS_OF_BMJD_TDB = 61465.0 + 69.184 / 86400.0

DAYS_PER_YEAR = 365.25
J2000_MJD = 51544.5
_OBLIQUITY_RAD = np.radians(23.4392911)
_AU_LIGHT_D = 499.004783836 / 86400.0

# TAI - UTC in force from each MJD (UTC) on, as announced; the network's first data are of 1987.
_LEAP_FROM_MJD = np.array(
    [46247, 47161, 47892, 48257, 48804, 49169, 49534, 50083, 50630, 51179, 53736, 54832, 56109, 57204, 57754]
)  # fmt: skip
_LEAP_S = np.array([23, 24, 25, 26, 27, 28, 29, 30, 31, 32, 33, 34, 35, 36, 37], dtype=float)

# Mean elements at J2000 of the planets that move the Sun: longitude and its daily motion, perihelion
# (deg), eccentricity, semi-major axis (au), solar mass over planet mass. The ecliptic is flat here.
_PLANETS = np.array(
    [
        [34.396, 0.0830868, 14.73, 0.0484, 5.203, 1047.35],
        [49.954, 0.0334701, 92.60, 0.0539, 9.537, 3497.9],
        [313.238, 0.0117311, 170.95, 0.0473, 19.19, 22903.0],
        [304.880, 0.0059811, 44.96, 0.0086, 30.07, 19412.0],
    ]
)


def year_to_bmjd(julian_year: float) -> float:
    """MJD of a Julian year such as 2019.35."""
    return J2000_MJD + (julian_year - 2000.0) * DAYS_PER_YEAR


def ecliptic_deg(ra_deg: float, dec_deg: float) -> tuple[float, float]:
    """Ecliptic longitude and latitude of a position, deg, J2000."""
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    x = np.cos(dec) * np.cos(ra)
    y, z = np.cos(dec) * np.sin(ra), np.sin(dec)
    y, z = (
        y * np.cos(_OBLIQUITY_RAD) + z * np.sin(_OBLIQUITY_RAD),
        z * np.cos(_OBLIQUITY_RAD) - y * np.sin(_OBLIQUITY_RAD),
    )
    return float(np.degrees(np.arctan2(y, x))) % 360.0, float(np.degrees(np.arcsin(z)))


def sun_longitude_rad(mjd: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Ecliptic longitude of the Sun (J2000 equinox, 0.02 deg) and its distance in au."""
    days = mjd - J2000_MJD
    anomaly = np.radians(357.528 + 0.98560028 * days)
    longitude = 280.460 + 0.98564736 * days + 1.915 * np.sin(anomaly) + 0.020 * np.sin(2.0 * anomaly)
    # The formula is of the equinox of date; precession brings it back to J2000.
    longitude = longitude - 3.82e-5 * days
    distance = 1.00014 - 0.01671 * np.cos(anomaly) - 0.00014 * np.cos(2.0 * anomaly)
    return np.radians(longitude), distance


def elongation_deg(mjd: FloatArray, longitude_deg: float, latitude_deg: float) -> FloatArray:
    """Angle between a target (ecliptic coordinates) and the Sun, deg."""
    sun, _ = sun_longitude_rad(mjd)
    cosine = np.cos(np.radians(latitude_deg)) * np.cos(sun - np.radians(longitude_deg))
    angle: FloatArray = np.degrees(np.arccos(np.clip(cosine, -1.0, 1.0)))
    return angle


def _light_time_d(mjd: FloatArray, longitude_deg: float, latitude_deg: float) -> FloatArray:
    """Light time from the Earth's centre to the barycentre along the line of sight, days."""
    sun, distance = sun_longitude_rad(mjd)
    toward, tilt = np.radians(longitude_deg), np.cos(np.radians(latitude_deg))
    along = -distance * np.cos(sun - toward)
    days = mjd - J2000_MJD
    for mean, motion, perihelion, e, a, mass in _PLANETS:
        anomaly = np.radians(mean + motion * days - perihelion)
        angle = anomaly + np.radians(perihelion) + 2.0 * e * np.sin(anomaly)
        along -= a * (1.0 - e * np.cos(anomaly)) / mass * np.cos(angle - toward)
    delay: FloatArray = along * tilt * _AU_LIGHT_D
    return delay


def bmjd_from_utc(utc_mjd: FloatArray, longitude_deg: float, latitude_deg: float) -> FloatArray:
    """Barycentric MJD (TDB) of UTC instants on the Earth, good to about a second."""
    leap = _LEAP_S[np.searchsorted(_LEAP_FROM_MJD, utc_mjd, side="right") - 1]
    return utc_mjd + (leap + 32.184) / 86400.0 + _light_time_d(utc_mjd, longitude_deg, latitude_deg)


def utc_from_bmjd(bmjd_tdb: FloatArray, longitude_deg: float, latitude_deg: float) -> FloatArray:
    """The whole second of UTC from which ``bmjd_from_utc`` made these instants."""
    utc = bmjd_tdb - 69.184 / 86400.0
    for _ in range(3):
        utc = utc - (bmjd_from_utc(utc, longitude_deg, latitude_deg) - bmjd_tdb)
    return np.round(utc * 86400.0) / 86400.0


def iso_utc(utc_mjd: FloatArray) -> list[str]:
    """``2019-05-04T03:12:10Z`` for each UTC MJD."""
    seconds = np.round((utc_mjd - 40587.0) * 86400.0).astype(np.int64)
    return [f"{text}Z" for text in seconds.astype("datetime64[s]").astype(str)]
