"""Time scales UTC, TAI, TT, TDB and UT as two-part modified Julian dates, decimal years, ISO text."""

from __future__ import annotations

import erfa.ufunc as erfa_ufunc
import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]

MJD_ZERO_JD = 2_400_000.5
TT_MINUS_TAI_S = 32.184
DAY_S = 86_400.0
# UTC begins on 1960-01-01; earlier civil instants are UT.
FIRST_UTC_MJD = 36_934.0
_J2000_MJD = 51_544.5
_B1900_MJD = 15_019.81352
_TROPICAL_YEAR_D = 365.242198781
# Year 1, January 1 and year 10000, January 1 in the proleptic Gregorian calendar.
_YEAR_1_MJD, _YEAR_10000_MJD = -678_575.0, 2_973_484.0


def tdb_minus_tt_s(tt_mjd: ArrayLike) -> FloatArray:
    """Difference TDB - TT at the geocentre from the leading periodic terms.

    Parameters
    ----------
    tt_mjd : array_like
        MJD in TT (or TDB, which makes no difference here), days.

    Returns
    -------
    ndarray
        Seconds, within 0.0017.

    Notes
    -----
    Accuracy: 10 microseconds from 1600 to 2200.

    Source: Kaplan 2005, USNO Circular 179, equation 2.6.

    Examples
    --------
    >>> round(float(tdb_minus_tt_s(53750.892855138888)), 4)
    0.0004
    """
    t = (np.asarray(tt_mjd, dtype=float) - _J2000_MJD) / 36_525.0
    result: FloatArray = (
        0.001657 * np.sin(628.3076 * t + 6.2401)
        + 0.000022 * np.sin(575.3385 * t + 4.2970)
        + 0.000014 * np.sin(1256.6152 * t + 6.1969)
        + 0.000005 * np.sin(606.9777 * t + 4.0212)
        + 0.000005 * np.sin(52.9691 * t + 0.4444)
        + 0.000002 * np.sin(21.3299 * t + 5.5431)
        + 0.000010 * t * np.sin(628.3076 * t + 4.2490)
    )
    return result


def delta_t_s(year: ArrayLike) -> FloatArray:
    """Difference TT - UT before UTC existed.

    Parameters
    ----------
    year : array_like
        Decimal calendar year, up to 1961.

    Returns
    -------
    ndarray
        Seconds.

    Notes
    -----
    Accuracy: about 1 s after 1800, 10 s at 1600, minutes in antiquity.

    Source: Espenak & Meeus 2006, NASA/TP-2006-214141, polynomial expressions for Delta T (memory).

    Examples
    --------
    >>> round(float(delta_t_s(1950.0)), 2)
    29.07
    """
    y = np.asarray(year, dtype=float)
    pieces = (
        (-500.0, 0.0, 100.0, (10583.6, -1014.41, 33.78311, -5.952053, -0.1798452, 0.022174192, 0.0090316521)),
        (500.0, 1000.0, 100.0, (1574.2, -556.01, 71.23472, 0.319781, -0.8503463, -0.005050998, 0.0083572073)),
        (1600.0, 1600.0, 1.0, (120.0, -0.9808, -0.01532, 1.0 / 7129.0)),
        (1700.0, 1700.0, 1.0, (8.83, 0.1603, -0.0059285, 0.00013336, -1.0 / 1_174_000.0)),
        (
            1800.0, 1800.0, 1.0,
            (13.72, -0.332447, 0.0068612, 0.0041116, -0.00037436, 1.21272e-5, -1.699e-7, 8.75e-10),
        ),
        (1860.0, 1860.0, 1.0, (7.62, 0.5737, -0.251754, 0.01680668, -0.0004473624, 1.0 / 233_174.0)),
        (1900.0, 1900.0, 1.0, (-2.79, 1.494119, -0.0598939, 0.0061966, -0.000197)),
        (1920.0, 1920.0, 1.0, (21.20, 0.84493, -0.076100, 0.0020936)),
        (1941.0, 1950.0, 1.0, (29.07, 0.407, -1.0 / 233.0, 1.0 / 2547.0)),
    )  # fmt: skip
    result = -20.0 + 32.0 * ((y - 1820.0) / 100.0) ** 2
    for start, origin, unit, coefficients in pieces:
        value = np.polynomial.polynomial.polyval((y - origin) / unit, coefficients)
        result = np.where(y >= start, value, result)
    return np.asarray(result, dtype=float)


def to_tdb(mjd_day: ArrayLike, mjd_fraction: ArrayLike, scale: str) -> tuple[FloatArray, FloatArray]:
    """Convert an instant to TDB.

    Parameters
    ----------
    mjd_day, mjd_fraction : array_like
        MJD in ``scale`` in two parts, days; for ``utc`` the quasi-MJD of erfa.
    scale : str
        ``utc``, ``tai``, ``tt``, ``tdb`` or ``ut`` (civil time before 1960).

    Returns
    -------
    (ndarray, ndarray)
        MJD in TDB in two parts, days.

    Raises
    ------
    InputRefused
        If the scale is unknown.

    Notes
    -----
    Accuracy: a few microseconds for UTC from 1960 to the last announced leap second; later leap seconds
    are unknown (1 s each); ``ut`` as ``delta_t_s``.

    Source: IAU SOFA Time Scale and Calendar Tools; erfa dat, dtdb.

    Examples
    --------
    >>> day, fraction = to_tdb(53750, 0.892100694444, "utc")
    >>> round((float(fraction) - 0.892100694444) * 86400, 3)
    65.184
    """
    day, fraction = np.asarray(mjd_day, dtype=float), np.asarray(mjd_fraction, dtype=float)
    if scale == "tdb":
        return day, fraction
    if scale == "tt":
        tt_day, tt_fraction = day, fraction
    elif scale == "tai":
        tt_day, tt_fraction = day, fraction + TT_MINUS_TAI_S / DAY_S
    elif scale == "utc":
        tai1, tai2, _ = erfa_ufunc.utctai(MJD_ZERO_JD + day, fraction)
        tt_day, tt_fraction = tai1 - MJD_ZERO_JD, tai2 + TT_MINUS_TAI_S / DAY_S
    elif scale == "ut":
        year = 2000.0 + (day + fraction - _J2000_MJD) / 365.2425
        tt_day, tt_fraction = day, fraction + delta_t_s(year) / DAY_S
    else:
        raise InputRefused(
            f"The time scale '{scale}' is unknown.",
            why="Known scales are utc, tai, tt, tdb and, before 1960, ut.",
            hint="For example 2031-04-07T03:12:10 TT.",
            code="scale-unknown",
        )
    difference = erfa_ufunc.dtdb(MJD_ZERO_JD + tt_day, tt_fraction, 0.0, 0.0, 0.0, 0.0)
    return tt_day, tt_fraction + difference / DAY_S


def tdb_to_utc(mjd_tdb: ArrayLike) -> FloatArray:
    """Convert TDB to UTC, or to UT before 1960.

    Parameters
    ----------
    mjd_tdb : array_like
        MJD in TDB, days.

    Returns
    -------
    ndarray
        Quasi-MJD in UTC, days, of the same shape.

    Notes
    -----
    Accuracy: 10 microseconds plus the step of a double MJD (0.6 microseconds) from 1960 to the last
    announced leap second; later leap seconds are unknown; before 1960 as ``delta_t_s``.

    Source: erfa taiutc; Kaplan 2005 for TDB - TT.

    Examples
    --------
    >>> round((62000.25 - float(tdb_to_utc(62000.25))) * 86400, 2)
    69.18
    """
    tdb = np.asarray(mjd_tdb, dtype=float)
    tt = tdb - tdb_minus_tt_s(tdb) / DAY_S
    tai_day = np.floor(tt)
    tai_fraction = (tt - tai_day) - TT_MINUS_TAI_S / DAY_S
    utc1, utc2, _ = erfa_ufunc.taiutc(MJD_ZERO_JD + tai_day, tai_fraction)
    utc = (utc1 - MJD_ZERO_JD) + utc2
    year = 2000.0 + (tt - _J2000_MJD) / 365.2425
    civil = tt - delta_t_s(year) / DAY_S
    return np.where(utc >= FIRST_UTC_MJD, utc, civil)


def utc_iso(bmjd_tdb: ArrayLike) -> list[str | None]:
    """UTC of TDB instants as text, to the second.

    Parameters
    ----------
    bmjd_tdb : array_like, shape (n,)
        MJD in TDB, days; NaN allowed.

    Returns
    -------
    list of str or None
        ``2031-04-07T03:12:10Z``; None for NaN and outside years 1 to 9999.

    Notes
    -----
    Accuracy: rounded to the nearest second; a leap second shows as ``23:59:60``.

    Source: ISO 8601; erfa d2dtf.

    Examples
    --------
    >>> utc_iso([57754.5, float("nan")])
    ['2017-01-01T11:58:51Z', None]
    """
    tdb = np.atleast_1d(np.asarray(bmjd_tdb, dtype=float)).ravel()
    known = np.isfinite(tdb) & (tdb > _YEAR_1_MJD + 1.0) & (tdb < _YEAR_10000_MJD - 1.0)
    utc = tdb_to_utc(np.where(known, tdb, _J2000_MJD))
    day = np.floor(utc)
    modern = utc >= FIRST_UTC_MJD
    # Only UTC has leap seconds; elsewhere days have 86 400 s.
    year, month, date, clock, _ = erfa_ufunc.d2dtf(b"UTC", 0, MJD_ZERO_JD + day, utc - day)
    parts = [year, month, date, clock["h"], clock["m"], clock["s"]]
    if not modern.all():
        plain = erfa_ufunc.d2dtf(b"UT1", 0, MJD_ZERO_JD + day, utc - day)
        other = [*plain[:3], plain[3]["h"], plain[3]["m"], plain[3]["s"]]
        parts = [np.where(modern, a, b) for a, b in zip(parts, other, strict=True)]
    rows = zip(known.tolist(), *(part.tolist() for part in parts), strict=True)
    return ["%04d-%02d-%02dT%02d:%02d:%02dZ" % tuple(row) if good else None for good, *row in rows]  # noqa: UP031


def julian_epoch_to_mjd(julian_epoch_yr: ArrayLike) -> FloatArray:
    """MJD (TT) of a Julian epoch.

    Parameters
    ----------
    julian_epoch_yr : array_like
        As 2016.0, Julian years.

    Returns
    -------
    ndarray
        MJD in TT, days.

    Notes
    -----
    Accuracy: exact to rounding.

    Source: J = 2000 + (JD_TT - 2451545)/365.25 (IAU 1976; SOFA epj2jd).

    Examples
    --------
    >>> float(julian_epoch_to_mjd(1991.25)) + 2400000.5
    2448349.0625
    """
    result: FloatArray = _J2000_MJD + (np.asarray(julian_epoch_yr, dtype=float) - 2000.0) * 365.25
    return result


def mjd_to_julian_epoch(mjd_tt: ArrayLike) -> FloatArray:
    """Julian epoch of an MJD.

    Parameters
    ----------
    mjd_tt : array_like
        MJD in TT, days.

    Returns
    -------
    ndarray
        Julian years.

    Notes
    -----
    Accuracy: exact to rounding.

    Source: SOFA epj.

    Examples
    --------
    >>> round(float(mjd_to_julian_epoch(53303.5)), 5)
    2004.81588
    """
    result: FloatArray = 2000.0 + (np.asarray(mjd_tt, dtype=float) - _J2000_MJD) / 365.25
    return result


def besselian_epoch_to_mjd(besselian_epoch_yr: ArrayLike) -> FloatArray:
    """MJD (TT) of a Besselian epoch.

    Parameters
    ----------
    besselian_epoch_yr : array_like
        As 1950.0, Besselian years.

    Returns
    -------
    ndarray
        MJD in TT, days.

    Notes
    -----
    Accuracy: exact to rounding.

    Source: B = 1900 + (JD - 2415020.31352)/365.242198781 (Lieske 1979; SOFA epb2jd).

    Examples
    --------
    >>> round(float(besselian_epoch_to_mjd(1950.0)) + 2400000.5, 8)
    2433282.42345905
    """
    result: FloatArray = (
        _B1900_MJD + (np.asarray(besselian_epoch_yr, dtype=float) - 1900.0) * _TROPICAL_YEAR_D
    )
    return result


def mjd_to_besselian_epoch(mjd_tt: ArrayLike) -> FloatArray:
    """Besselian epoch of an MJD.

    Parameters
    ----------
    mjd_tt : array_like
        MJD in TT, days.

    Returns
    -------
    ndarray
        Besselian years.

    Notes
    -----
    Accuracy: exact to rounding.

    Source: SOFA epb.

    Examples
    --------
    >>> round(float(mjd_to_besselian_epoch(53303.5)), 5)
    2004.81726
    """
    result: FloatArray = 1900.0 + (np.asarray(mjd_tt, dtype=float) - _B1900_MJD) / _TROPICAL_YEAR_D
    return result


def calendar_year_to_mjd(year: float) -> float:
    """MJD of a calendar decimal year: the elapsed fraction of that very year.

    Parameters
    ----------
    year : float
        As 2018.5, years 1 to 9999.

    Returns
    -------
    float
        MJD in whatever scale the year was meant in, days.

    Raises
    ------
    InputRefused
        If the year is outside 1 to 9999.

    Notes
    -----
    Accuracy: exact to rounding; a year has 365 or 366 days.

    Source: Gregorian calendar.

    Examples
    --------
    >>> calendar_year_to_mjd(2018.5) + 2400000.5
    2458302.0
    """
    whole = int(np.floor(year))
    if not 1 <= whole <= 9998:
        raise InputRefused(
            f"The year {year:g} is outside the calendar used here.",
            why="Years run from 1 to 9998.",
            hint="For example 2031.27.",
            code="year-refused",
        )
    first, following = (float(erfa_ufunc.cal2jd(y, 1, 1)[1]) for y in (whole, whole + 1))
    return first + (year - whole) * (following - first)


def mjd_to_calendar_year(mjd: ArrayLike) -> FloatArray:
    """Calendar decimal year of an MJD.

    Parameters
    ----------
    mjd : array_like
        MJD in any scale, days.

    Returns
    -------
    ndarray
        Calendar years with the elapsed fraction of that year.

    Notes
    -----
    Accuracy: exact to rounding.

    Source: Gregorian calendar.

    Examples
    --------
    >>> round(float(mjd_to_calendar_year(53303.5)), 9)
    2004.81557377
    """
    date = np.asarray(mjd, dtype=float)
    year = erfa_ufunc.jd2cal(MJD_ZERO_JD, date)[0]
    first = erfa_ufunc.cal2jd(year, 1, 1)[1]
    following = erfa_ufunc.cal2jd(year + 1, 1, 1)[1]
    result: FloatArray = year + (date - first) / (following - first)
    return result
