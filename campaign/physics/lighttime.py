"""Light time between an observer, the Sun's centre and the solar-system barycentre."""

from __future__ import annotations

import erfa.ufunc as erfa_ufunc
import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.physics.timescales import DAY_S, FIRST_UTC_MJD, MJD_ZERO_JD, tdb_to_utc, to_tdb

FloatArray = NDArray[np.float64]

# Light travel over 1 au, days (IAU 2012 au; c by definition).
AU_LIGHT_D = 149_597_870.7 / 299_792.458 / DAY_S
_AU_M = 149_597_870_700.0
_WGS84 = 1
# epv00 is fitted to 1900-2100; beyond, its error grows slowly.
EPHEMERIS_MJD = (15_020.0, 88_069.0)


def direction(ra_deg: float, dec_deg: float) -> FloatArray:
    """Unit vector to a target.

    Parameters
    ----------
    ra_deg, dec_deg : float
        ICRS position, deg.

    Returns
    -------
    ndarray, shape (3,)
        Unit vector in ICRS axes (dimensionless).

    Notes
    -----
    Accuracy: exact.

    Source: spherical to Cartesian coordinates.

    Examples
    --------
    >>> direction(0.0, 90.0).round(12).tolist()
    [0.0, 0.0, 1.0]
    """
    ra, dec = np.radians(ra_deg), np.radians(dec_deg)
    return np.array([np.cos(dec) * np.cos(ra), np.cos(dec) * np.sin(ra), np.sin(dec)])


def light_time_d(
    tdb_day: float,
    tdb_fraction: float,
    ra_deg: float,
    dec_deg: float,
    centre: str = "barycentre",
    site: tuple[float, float, float] | None = None,
) -> float:
    """How much later a plane wave from the target passes the barycentre (or the Sun) than the observer.

    Parameters
    ----------
    tdb_day, tdb_fraction : float
        Instant at the observer, MJD in TDB in two parts, days.
    ra_deg, dec_deg : float
        ICRS position of the target, deg.
    centre : str
        ``barycentre`` or ``heliocentre``.
    site : (float, float, float), optional
        Longitude (deg, east positive), latitude (deg, geodetic), height (m); the geocentre without it.

    Returns
    -------
    float
        Days, between -0.006 and 0.006; add it to the instant at the observer.

    Notes
    -----
    Accuracy: 5 microseconds from 1900 to 2100 for the geocentre; a site adds up to 21 ms, computed with
    UT1 = UTC (1.4 microseconds) and without precession of the pole (0.1 ms over a century). The target is
    infinitely far; proper motion and the relativistic Shapiro delay (under 0.1 ms away from the Sun) are
    left out.

    Source: Eastman, Siverd & Gaudi 2010, PASP 122, 935; erfa epv00.

    Examples
    --------
    >>> day, fraction = to_tdb(60389.0, 5.0 / 24.0, "utc")
    >>> round(86400 * light_time_d(float(day), float(fraction), 270.625, -23.5), 3)
    -5.486
    """
    heliocentric, barycentric, _ = erfa_ufunc.epv00(MJD_ZERO_JD + tdb_day, tdb_fraction)
    observer_au = np.array((heliocentric if centre == "heliocentre" else barycentric)["p"], dtype=float)
    if site is not None:
        observer_au = observer_au + _site_offset_au(tdb_day + tdb_fraction, site)
    return float(observer_au @ direction(ra_deg, dec_deg)) * AU_LIGHT_D


def _site_offset_au(mjd_tdb: float, site: tuple[float, float, float]) -> FloatArray:
    """Observer relative to the geocentre in axes of date, au."""
    longitude_deg, latitude_deg, height_m = site
    fixed, _ = erfa_ufunc.gd2gc(_WGS84, np.radians(longitude_deg), np.radians(latitude_deg), height_m)
    utc = float(tdb_to_utc(mjd_tdb))
    turn = float(erfa_ufunc.era00(MJD_ZERO_JD + np.floor(utc), utc - np.floor(utc)))
    cosine, sine = np.cos(turn), np.sin(turn)
    x, y, z = (float(c) for c in fixed)
    of_date = np.array([cosine * x - sine * y, sine * x + cosine * y, z]) / _AU_M
    # From the celestial intermediate axes to ICRS: precession and nutation of the pole, IAU 2006/2000B.
    tilt = erfa_ufunc.c2i06a(MJD_ZERO_JD, mjd_tdb)
    return np.asarray(tilt, dtype=float).T @ of_date


def to_barycentre(
    mjd_day: float,
    mjd_fraction: float,
    scale: str,
    place: str,
    ra_deg: float,
    dec_deg: float,
    site: tuple[float, float, float] | None = None,
) -> float:
    """Put an instant on the catalogue's axis: MJD in TDB at the solar-system barycentre.

    Parameters
    ----------
    mjd_day, mjd_fraction : float
        MJD in ``scale`` in two parts, days.
    scale : str
        ``utc``, ``tai``, ``tt``, ``tdb`` or ``ut``.
    place : str
        Where it holds: ``observatory``, ``geocentre``, ``heliocentre`` or ``barycentre``.
    ra_deg, dec_deg : float
        ICRS position of the target, deg.
    site : (float, float, float), optional
        Longitude (deg, east positive), latitude (deg), height (m) of the observatory.

    Returns
    -------
    float
        ``bmjd_tdb``, days.

    Raises
    ------
    InputRefused
        If scale or place are unknown.

    Notes
    -----
    Accuracy: 0.02 s and better from 1900 to 2100 (see ``light_time_d``); outside, the ephemeris of the
    Earth degrades to some 0.1 s over a millennium.

    Source: Eastman, Siverd & Gaudi 2010, PASP 122, 935.

    Examples
    --------
    >>> round(to_barycentre(60389.0, 5.0 / 24.0, "utc", "geocentre", 270.625, -23.5) + 2400000.5, 7)
    2460389.7090706
    """
    day, fraction = (float(part) for part in to_tdb(mjd_day, mjd_fraction, scale))
    if place == "barycentre":
        return day + fraction
    if place == "observatory":
        return day + (fraction + light_time_d(day, fraction, ra_deg, dec_deg, site=site))
    if place == "geocentre":
        return day + (fraction + light_time_d(day, fraction, ra_deg, dec_deg))
    if place != "heliocentre":
        raise InputRefused(
            f"The place '{place}' is unknown.",
            why="An instant holds at the observatory, the geocentre, the heliocentre or the barycentre.",
            hint="For example HJD 2461234.5 or BJD 2461234.5.",
            code="place-unknown",
        )
    # Back to the Earth, where the light passed a little earlier or later, then on to the barycentre.
    earth = fraction
    for _ in range(3):
        earth = fraction - light_time_d(day, earth, ra_deg, dec_deg, "heliocentre")
    return day + (earth + light_time_d(day, earth, ra_deg, dec_deg))


def ephemeris_reaches(mjd: float) -> bool:
    """Whether the Earth's ephemeris holds its accuracy at an instant.

    Parameters
    ----------
    mjd : float
        MJD, days.

    Returns
    -------
    bool
        True from 1900 to 2100.

    Notes
    -----
    Accuracy: not applicable (dimensionless).

    Source: documentation of erfa epv00.

    Examples
    --------
    >>> ephemeris_reaches(62000.0), ephemeris_reaches(-1000.0)
    (True, False)
    """
    return EPHEMERIS_MJD[0] <= mjd <= EPHEMERIS_MJD[1]


__all__ = ["FIRST_UTC_MJD", "direction", "ephemeris_reaches", "light_time_d", "to_barycentre"]
