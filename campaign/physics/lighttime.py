"""Light time from where something was observed to the barycentre of the solar system."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.constants import LIGHT_TIME_AU_D
from campaign.physics.earth import EarthDays, earth_along_au, earth_days, site_along_au
from campaign.physics.timescales import tdb_to_utc, to_tdb

FloatArray = NDArray[np.float64]

# Dates for which erfa's positions of Earth and Sun are claimed: the years 1900 to 2100.
EPHEMERIS_FIRST_MJD, EPHEMERIS_LAST_MJD = 15_020.0, 88_069.0
# Light crosses the Earth's orbit in less; what is known of the Earth serves instants so far apart.
_MARGIN_D = 0.01
# HJD to BJD: the two differ by under 10 s and Earth and Sun move too little in that for a third round.
_ROUNDS = 2


def unit_vector(ra_deg: ArrayLike, dec_deg: ArrayLike) -> FloatArray:
    """Direction of a target.

    Parameters
    ----------
    ra_deg, dec_deg : array_like
        ICRS right ascension and declination, deg; they broadcast.

    Returns
    -------
    ndarray, shape (..., 3)
        Unit vector (dimensionless) in ICRS axes.

    Notes
    -----
    Accuracy: rounding only.

    Source: spherical trigonometry.

    Examples
    --------
    >>> [round(float(x), 12) for x in unit_vector(90.0, 60.0)]
    [0.0, 0.5, 0.866025403784]
    """
    ra, dec = np.broadcast_arrays(
        np.radians(np.asarray(ra_deg, dtype=np.float64)), np.radians(np.asarray(dec_deg, dtype=np.float64))
    )
    return np.stack([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)], axis=-1)


def barycentric_light_time_d(
    mjd_tdb: ArrayLike,
    ra_deg: ArrayLike,
    dec_deg: ArrayLike,
    site_geodetic: tuple[float, float, float] | None = None,
) -> FloatArray:
    """Time that light from a target takes from the observer to the barycentre.

    Parameters
    ----------
    mjd_tdb : array_like
        MJD in TDB of the observation, days.
    ra_deg, dec_deg : array_like
        ICRS direction of the target, deg; broadcast with the instants.
    site_geodetic : tuple of float, optional
        East longitude (deg), latitude (deg), height (m) on WGS84; the geocentre when left out.

    Returns
    -------
    ndarray
        Light time, days, to add to the instant; negative when the observer is farther than the barycentre
        from the target.

    Notes
    -----
    Accuracy: 0.05 ms between 1900 and 2100 with the site, at most 21 ms worse without. Outside these
    years see :func:`ephemeris_covers`. The target is infinitely far and does not move; UT1 is read as UTC
    (at most 0.9 s, 1.4 us); polar motion and the bending of light by the Sun are left out.

    Source: r.n/c, Eastman, Siverd & Gaudi 2010, PASP 122, 935; erfa.epv00 (VSOP2000 fitted to DE405).

    Examples
    --------
    >>> round(float(barycentric_light_time_d(60389.209134, 270.625, -23.5)) * 86400, 2)
    -5.49
    """
    return _light_time_d(*_known(mjd_tdb), unit_vector(ra_deg, dec_deg), site_geodetic, 1)


def heliocentric_light_time_d(
    mjd_tdb: ArrayLike,
    ra_deg: ArrayLike,
    dec_deg: ArrayLike,
    site_geodetic: tuple[float, float, float] | None = None,
) -> FloatArray:
    """Time that light from a target takes from the observer to the centre of the Sun.

    Parameters
    ----------
    mjd_tdb : array_like
        MJD in TDB of the observation, days.
    ra_deg, dec_deg : array_like
        ICRS direction of the target, deg; broadcast with the instants.
    site_geodetic : tuple of float, optional
        East longitude (deg), latitude (deg), height (m) on WGS84; the geocentre when left out.

    Returns
    -------
    ndarray
        Light time, days, to add to the instant for HJD in the same scale.

    Notes
    -----
    Accuracy: as the barycentric light time, from which it differs by up to 5 s.

    Source: r.n/c with r from the Sun; erfa.epv00.

    Examples
    --------
    >>> round(float(heliocentric_light_time_d(60389.209134, 270.625, -23.5)) * 86400, 2)
    -7.17
    """
    return _light_time_d(*_known(mjd_tdb), unit_vector(ra_deg, dec_deg), site_geodetic, 0)


def to_barycentre(
    mjd_day: ArrayLike,
    mjd_fraction: ArrayLike,
    scale: str,
    place: str,
    ra_deg: ArrayLike,
    dec_deg: ArrayLike,
    site_geodetic: tuple[float, float, float] | None = None,
) -> FloatArray:
    """An instant in any scale and at any place as MJD in TDB at the barycentre.

    Parameters
    ----------
    mjd_day, mjd_fraction : array_like
        MJD in two parts whose sum is meant, days.
    scale : {'utc', 'ut', 'tai', 'tt', 'tdb'}
        Its time scale.
    place : {'observatory', 'geocentre', 'heliocentre', 'barycentre'}
        Where it is counted.
    ra_deg, dec_deg : array_like
        ICRS direction of the target, deg; all arrays broadcast.
    site_geodetic : tuple of float, optional
        East longitude (deg), latitude (deg), height (m) on WGS84, for the place 'observatory'.

    Returns
    -------
    ndarray
        MJD in TDB at the barycentre, days.

    Raises
    ------
    InputRefused
        If the scale or the place is another, or an observatory has no position.

    Notes
    -----
    Accuracy: 1 us from one double for the sum, plus that of the scale and of the light time; 0.05 ms in all
    for UTC between 1960 and 2100. Outside the years 1900 to 2100 the light time is computed all the same,
    and :func:`ephemeris_covers` says so.

    Source: Eastman, Siverd & Gaudi 2010, PASP 122, 935.

    Examples
    --------
    >>> bmjd = to_barycentre(60389.0, 5 / 24, "utc", "geocentre", 270.625, -23.5)
    >>> round(float(bmjd), 6)
    60389.209071
    """
    n = unit_vector(ra_deg, dec_deg)
    return to_barycentre_along(mjd_day, mjd_fraction, scale, place, n, site_geodetic)


def to_barycentre_along(
    mjd_day: ArrayLike,
    mjd_fraction: ArrayLike,
    scale: str,
    place: str,
    n: FloatArray,
    site_geodetic: tuple[float, float, float] | None = None,
) -> FloatArray:
    """The same as :func:`to_barycentre` for directions that are known already.

    Parameters
    ----------
    mjd_day, mjd_fraction : array_like
        MJD in two parts whose sum is meant, days.
    scale, place : str
        As in :func:`to_barycentre`.
    n : ndarray, shape (..., 3)
        Unit vectors of the targets in ICRS axes (dimensionless); broadcast with the instants.
    site_geodetic : tuple of float, optional
        East longitude (deg), latitude (deg), height (m) on WGS84, for the place 'observatory'.

    Returns
    -------
    ndarray
        MJD in TDB at the barycentre, days.

    Raises
    ------
    InputRefused
        If the scale or the place is another, or an observatory has no position.

    Notes
    -----
    Accuracy: as :func:`to_barycentre`.

    Source: Eastman, Siverd & Gaudi 2010, PASP 122, 935.

    Examples
    --------
    >>> n = unit_vector(270.625, -23.5)
    >>> round(float(to_barycentre_along(60389.0, 5 / 24, "utc", "geocentre", n)), 6)
    60389.209071
    """
    day, rest = to_tdb(mjd_day, mjd_fraction, scale)
    if place == "barycentre":
        return day + rest
    if place in ("observatory", "geocentre"):
        if place == "observatory" and site_geodetic is None:
            raise InputRefused(
                "An instant at an observatory needs the observatory's position.",
                why="The light time depends on it by up to 21 ms.",
                hint="Give the site, or count the instant at the geocentre.",
                code="site-missing",
            )
        site = site_geodetic if place == "observatory" else None
        return day + (rest + _light_time_d(*_known(day + rest), n, site, 1))
    if place == "heliocentre":
        # The observer's instant is not known, so it is approached from the Sun's.
        days = _earth_around(day + rest)
        at_earth = rest
        for _ in range(_ROUNDS):
            at_earth = rest - _light_time_d(day + at_earth, days, n, None, 0)
        return day + (at_earth + _light_time_d(day + at_earth, days, n, None, 1))
    raise InputRefused(
        f"'{place}' is no place known here.",
        why="An instant needs the place at which it is counted.",
        hint="Use one of observatory, geocentre, heliocentre, barycentre.",
        code="place-refused",
    )


def ephemeris_covers(mjd_tdb: ArrayLike) -> NDArray[np.bool_]:
    """Whether the stated accuracy of the light time holds at an instant.

    Parameters
    ----------
    mjd_tdb : array_like
        MJD in TDB, days.

    Returns
    -------
    ndarray of bool
        True (dimensionless) in the years 1900 to 2100.

    Notes
    -----
    Accuracy: the claim of the source. Beyond, the Earth's place about the Sun agrees with the mean
    elements of Simon et al. 1994 to 0.1 s of light from the year 1 to 5000 and to 0.8 s in 9999.

    Source: documentation of erfa.epv00.

    Examples
    --------
    >>> bool(ephemeris_covers(60000.0)), bool(ephemeris_covers(0.0))
    (True, False)
    """
    mjd = np.asarray(mjd_tdb, dtype=np.float64)
    return (mjd >= EPHEMERIS_FIRST_MJD) & (mjd < EPHEMERIS_LAST_MJD)


def _earth_around(mjd_tdb: FloatArray) -> EarthDays:
    return earth_days(np.where(np.isfinite(mjd_tdb), mjd_tdb, 0.0), _MARGIN_D)


def _known(mjd_tdb: ArrayLike) -> tuple[FloatArray, EarthDays]:
    """Instants, and the Earth around them."""
    mjd = np.asarray(mjd_tdb, dtype=np.float64)
    return mjd, earth_days(np.where(np.isfinite(mjd), mjd, 0.0))


def _light_time_d(
    mjd_tdb: FloatArray,
    days: EarthDays,
    n: FloatArray,
    site_geodetic: tuple[float, float, float] | None,
    origin: int,
) -> FloatArray:
    """``origin`` 0 is the Sun, 1 the barycentre."""
    finite = np.isfinite(mjd_tdb)
    safe = np.where(finite, mjd_tdb, 0.0)
    along_au = earth_along_au(days, safe, n, origin)
    if site_geodetic is not None:
        # UT1 is read as UTC; before the calendar begins and after it ends it does not matter.
        ut_day, ut_rest = tdb_to_utc(safe)
        inside = np.isfinite(ut_day)
        ut_day, ut_rest = np.where(inside, ut_day, 0.0), np.where(inside, ut_rest, 0.0)
        along_au = along_au + site_along_au(safe, ut_day, ut_rest, n, site_geodetic)
    return np.where(finite, along_au, np.nan)[()] * LIGHT_TIME_AU_D
