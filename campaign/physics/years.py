"""Decimal years: calendar, Julian and Besselian, to modified Julian dates and back."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import BESSELIAN_YEAR_D, JULIAN_YEAR_D, MJD_J2000

FloatArray = NDArray[np.float64]

# JD 2415020.31352, the epoch B1900.0, as MJD.
_MJD_B1900 = 15_019.81352
_GREGORIAN_CYCLE_D = 146_097.0
# MJD of 0001-01-01 in the proleptic Gregorian calendar.
_MJD_YEAR_1 = -678_575.0


def julian_epoch(mjd_tt: ArrayLike) -> FloatArray:
    """Julian epoch of an instant.

    Parameters
    ----------
    mjd_tt : array_like
        MJD in TT, days.

    Returns
    -------
    ndarray
        Julian epoch, yr.

    Notes
    -----
    Accuracy: rounding only.

    Source: J = 2000 + (JD_TT - 2451545)/365.25; IAU 1976.

    Examples
    --------
    >>> round(float(julian_epoch(53303.5)), 5)
    2004.81588
    """
    return 2000.0 + (np.asarray(mjd_tt, dtype=np.float64) - MJD_J2000) / JULIAN_YEAR_D


def mjd_of_julian_epoch(epoch_yr: ArrayLike) -> FloatArray:
    """Instant of a Julian epoch.

    Parameters
    ----------
    epoch_yr : array_like
        Julian epoch, yr.

    Returns
    -------
    ndarray
        MJD in TT, days.

    Notes
    -----
    Accuracy: rounding only.

    Source: J = 2000 + (JD_TT - 2451545)/365.25; IAU 1976.

    Examples
    --------
    >>> float(mjd_of_julian_epoch(2015.5))
    57205.875
    """
    return MJD_J2000 + (np.asarray(epoch_yr, dtype=np.float64) - 2000.0) * JULIAN_YEAR_D


def besselian_epoch(mjd_tt: ArrayLike) -> FloatArray:
    """Besselian epoch of an instant.

    Parameters
    ----------
    mjd_tt : array_like
        MJD in TT, days.

    Returns
    -------
    ndarray
        Besselian epoch, yr.

    Notes
    -----
    Accuracy: rounding only.

    Source: Lieske 1979, A&A 73, 282: B = 1900 + (JD - 2415020.31352)/365.242198781.

    Examples
    --------
    >>> round(float(besselian_epoch(53303.5)), 5)
    2004.81726
    """
    return 1900.0 + (np.asarray(mjd_tt, dtype=np.float64) - _MJD_B1900) / BESSELIAN_YEAR_D


def mjd_of_besselian_epoch(epoch_yr: ArrayLike) -> FloatArray:
    """Instant of a Besselian epoch.

    Parameters
    ----------
    epoch_yr : array_like
        Besselian epoch, yr.

    Returns
    -------
    ndarray
        MJD in TT, days.

    Notes
    -----
    Accuracy: rounding only.

    Source: Lieske 1979, A&A 73, 282: B = 1900 + (JD - 2415020.31352)/365.242198781.

    Examples
    --------
    >>> round(float(mjd_of_besselian_epoch(1950.0)), 6)
    33281.923459
    """
    return _MJD_B1900 + (np.asarray(epoch_yr, dtype=np.float64) - 1900.0) * BESSELIAN_YEAR_D


def calendar_year(mjd: ArrayLike) -> FloatArray:
    """Calendar decimal year: the year plus the elapsed fraction of that very year.

    Parameters
    ----------
    mjd : array_like
        MJD, days, in the scale in which the year is meant.

    Returns
    -------
    ndarray
        Decimal year, yr, in the proleptic Gregorian calendar.

    Notes
    -----
    Accuracy: rounding only (1e-5 d around the year 2000); leap seconds are not counted.

    Source: Gregorian calendar; years of 365 or 366 days.

    Examples
    --------
    >>> float(calendar_year(58666.5))
    2019.5
    """
    date = np.asarray(mjd, dtype=np.float64)
    year = np.floor(1.0 + (date - _MJD_YEAR_1) / (_GREGORIAN_CYCLE_D / 400.0))
    # The mean length of a year misses the true beginning by up to two days.
    year = np.where(date < _first_day(year), year - 1.0, year)
    year = np.where(date >= _first_day(year + 1.0), year + 1.0, year)
    begin = _first_day(year)
    return year + (date - begin) / (_first_day(year + 1.0) - begin)


def mjd_of_calendar_year(year: ArrayLike) -> FloatArray:
    """Instant of a calendar decimal year.

    Parameters
    ----------
    year : array_like
        Decimal year, yr, in the proleptic Gregorian calendar.

    Returns
    -------
    ndarray
        MJD, days, in the scale in which the year is meant.

    Notes
    -----
    Accuracy: rounding only (1e-5 d or better in these centuries).

    Source: Gregorian calendar; years of 365 or 366 days.

    Examples
    --------
    >>> round(float(mjd_of_calendar_year(2007.14)), 6)
    54152.1
    """
    decimal = np.asarray(year, dtype=np.float64)
    whole = np.floor(decimal)
    begin = _first_day(whole)
    return begin + (decimal - whole) * (_first_day(whole + 1.0) - begin)


def _first_day(year: FloatArray) -> FloatArray:
    """MJD of 1 January."""
    before = year - 1.0
    leap_days: FloatArray = np.floor(before / 4.0) - np.floor(before / 100.0) + np.floor(before / 400.0)
    return _MJD_YEAR_1 + 365.0 * before + leap_days
