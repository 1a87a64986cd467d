"""How high the Sun stands, as well as an observer needs it to tell day from night."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import MJD_J2000

FloatArray = NDArray[np.float64]


def sun_altitude_deg(
    mjd_utc: ArrayLike, longitude_deg_east: ArrayLike, latitude_deg: ArrayLike
) -> FloatArray:
    """Altitude of the Sun's centre, without refraction.

    Parameters
    ----------
    mjd_utc : array_like
        MJD in UTC, days.
    longitude_deg_east, latitude_deg : array_like
        Of the observer, deg; all arrays broadcast.

    Returns
    -------
    ndarray
        Altitude, deg, -90 to 90.

    Notes
    -----
    Accuracy: 0.02 deg from 1950 to 2050 and 0.3 deg from 1600 to 2400; refraction, which lifts the Sun by
    0.57 deg at the horizon, and parallax (0.002 deg) are left out.

    Source: low-precision formulae for the Sun of the Astronomical Almanac, section C (memory); Greenwich mean
    sidereal time to first order, Explanatory Supplement 1992, eq. 2.24-1 (memory).

    Examples
    --------
    At noon of an equinox the Sun is near the zenith of the Gulf of Guinea.

    >>> bool(sun_altitude_deg(51623.5, 1.9, 0.0) > 89.5)
    True
    """
    days = np.asarray(mjd_utc, dtype=np.float64) - MJD_J2000
    mean_longitude = np.radians(280.460 + 0.9856474 * days)
    anomaly = np.radians(357.528 + 0.9856003 * days)
    ecliptic = mean_longitude + np.radians(1.915 * np.sin(anomaly) + 0.020 * np.sin(2.0 * anomaly))
    obliquity = np.radians(23.439 - 0.0000004 * days)
    right_ascension = np.arctan2(np.cos(obliquity) * np.sin(ecliptic), np.cos(ecliptic))
    declination = np.arcsin(np.sin(obliquity) * np.sin(ecliptic))
    sidereal_deg = 280.46062 + 360.98564737 * days + np.asarray(longitude_deg_east, dtype=np.float64)
    hour_angle = np.radians(sidereal_deg) - right_ascension
    latitude = np.radians(np.asarray(latitude_deg, dtype=np.float64))
    sine = np.sin(latitude) * np.sin(declination) + np.cos(latitude) * np.cos(declination) * np.cos(
        hour_angle
    )
    altitude: FloatArray = np.degrees(np.arcsin(np.clip(sine, -1.0, 1.0)))
    return altitude[()]
