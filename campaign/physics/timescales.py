"""Time scales: from UTC, UT, TAI, TT to the catalogue's TDB, and back to UTC for people.

Instants are modified Julian dates in two parts, so that nothing is lost on the way; UTC is the quasi-MJD
of erfa, whose day has 86401 s when a leap second ends it. Leap seconds after the release of the installed
erfa are unknown: UTC in the future is counted with those known. Before 1960 there was no UTC, and universal
time stands in its place.
"""

from __future__ import annotations

import numpy as np
from erfa import ufunc
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.constants import DAY_S, JULIAN_YEAR_D, MJD_J2000, MJD_ZERO_JD
from campaign.physics.deltat import delta_t_s
from campaign.physics.nodes import needed_days

FloatArray = NDArray[np.float64]

_TT_MINUS_TAI_D = 32.184 / DAY_S
_UTC_FROM_MJD = 36_934.0  # 1960-01-01
_MJD_YEAR_1, _MJD_YEAR_10000 = -678_575.0, 2_973_484.0
# TDB - TT: amplitude (s), frequency (rad per Julian century), phase (rad).
_TDB_TERMS = (
    (0.001657, 628.3076, 6.2401),
    (0.000022, 575.3385, 4.2970),
    (0.000014, 1256.6152, 6.1969),
    (0.000005, 606.9777, 4.0212),
    (0.000005, 52.9691, 0.4444),
    (0.000002, 21.3299, 5.5431),
)


def to_tdb(mjd_day: ArrayLike, mjd_fraction: ArrayLike, scale: str) -> tuple[FloatArray, FloatArray]:
    """An instant in TDB.

    Parameters
    ----------
    mjd_day, mjd_fraction : array_like
        MJD in two parts whose sum is meant, days; they broadcast.
    scale : {'utc', 'ut', 'tai', 'tt', 'tdb'}
        The scale of the instant. UTC before 1960 is taken as UT; UT from 1960 on as UTC (0.9 s).

    Returns
    -------
    tuple of ndarray
        MJD in TDB in two parts, days: ``mjd_day`` as given, and the rest (which may leave [0, 1)).

    Raises
    ------
    InputRefused
        If the scale is another.

    Notes
    -----
    Accuracy: 2 us for UTC since 1960, TAI and TT (the place on Earth is left out); for UT before 1960 that
    of TT - UT: 1.2 s since 1900, 6 s since 1700, worse before. Leap seconds to come are not known.

    Source: IAU definitions of TAI, TT = TAI + 32.184 s and TDB through erfa (dat, dtdb: Fairhead & Bretagnon
    1990); Espenak & Meeus 2006 for TT - UT.

    Examples
    --------
    >>> day, fraction = to_tdb(53750.0, (21 * 3600 + 24 * 60 + 37.5) / 86400, "utc")
    >>> round((float(fraction) * 86400 - 21 * 3600 - 25 * 60), 5)
    42.68437
    """
    day, fraction = np.asarray(mjd_day, dtype=np.float64), np.asarray(mjd_fraction, dtype=np.float64)
    if scale == "tdb":
        return day, fraction
    day, fraction = np.broadcast_arrays(day, fraction)
    if scale in ("utc", "ut"):
        tt = _tt_of_universal(day, fraction)
    elif scale == "tai":
        tt = fraction + _TT_MINUS_TAI_D
    elif scale == "tt":
        tt = fraction
    else:
        raise InputRefused(
            f"'{scale}' is no time scale known here.",
            why="An instant needs its scale to be put on the common axis.",
            hint="Use one of utc, ut, tai, tt, tdb.",
            code="scale-refused",
        )
    return day[()], (tt + _tdb_minus_tt_d(day, tt))[()]


def tdb_to_tt(mjd_day: ArrayLike, mjd_fraction: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """An instant of TDB in TT.

    Parameters
    ----------
    mjd_day, mjd_fraction : array_like
        MJD in TDB in two parts whose sum is meant, days; they broadcast.

    Returns
    -------
    tuple of ndarray
        MJD in TT in two parts, days: ``mjd_day`` as given, and the rest.

    Notes
    -----
    Accuracy: 2 us (the place on Earth is left out).

    Source: erfa.dtdb (Fairhead & Bretagnon 1990).

    Examples
    --------
    >>> day, fraction = tdb_to_tt(51544.5, 0.0)
    >>> round(float(fraction) * 86400e3, 3)
    0.099
    """
    day, fraction = np.broadcast_arrays(
        np.asarray(mjd_day, dtype=np.float64), np.asarray(mjd_fraction, dtype=np.float64)
    )
    return day[()], (fraction - _tdb_minus_tt_d(day, fraction))[()]


def tdb_to_utc(mjd_tdb: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """An instant of TDB in UTC, or in UT before 1960.

    Parameters
    ----------
    mjd_tdb : array_like
        MJD in TDB, days.

    Returns
    -------
    tuple of ndarray
        Whole day and fraction in [0, 1) of the quasi-MJD in UTC, days; NaN where the instant is not
        finite or lies outside the years 1 to 9999.

    Notes
    -----
    Accuracy: that of one double (1 us) and of TT - UT before 1960. Leap seconds to come are not known.

    Source: IAU definitions through erfa (dtdb, taiutc); Espenak & Meeus 2006 for TT - UT.

    Examples
    --------
    >>> day, fraction = tdb_to_utc(57754.0 + 69.184 / 86400)
    >>> round(float(day + fraction), 8)
    57754.0
    """
    mjd = np.asarray(mjd_tdb, dtype=np.float64)
    good = _in_calendar(mjd)
    day = np.floor(np.where(good, mjd, 0.0))
    rest = np.where(good, mjd, 0.0) - day
    utc_day, utc_rest = _universal_of_tt(day, rest - _tdb_minus_tt_d(day, rest))
    carry = np.floor(utc_rest)
    utc_day, utc_rest = utc_day + carry, utc_rest - carry
    return np.where(good, utc_day, np.nan)[()], np.where(good, utc_rest, np.nan)[()]


def utc_iso(bmjd_tdb: ArrayLike) -> list[str | None]:
    """Instants of TDB as text in UTC, or in UT before 1960.

    Parameters
    ----------
    bmjd_tdb : array_like
        MJD in TDB, days; taken in flat order.

    Returns
    -------
    list of str or None
        Such as ``2031-04-07T03:12:10Z``, rounded to 1 s; None where the instant is not finite or lies
        outside the years 1 to 9999. A leap second reads ``23:59:60``.

    Notes
    -----
    Accuracy: 0.5 s from rounding; TT - UT before 1960. Leap seconds to come are not known. Proleptic
    Gregorian calendar.

    Source: erfa (taiutc, d2dtf); TDB - TT from the leading terms in Kaplan 2005, USNO Circular 179, eq. 2.6
    (10 us, memory).

    Examples
    --------
    >>> utc_iso([57754.0 + 68.184 / 86400, 1e9])
    ['2016-12-31T23:59:60Z', None]
    """
    mjd = np.atleast_1d(np.asarray(bmjd_tdb, dtype=np.float64)).ravel()
    good = _in_calendar(mjd)
    day = np.floor(mjd[good])
    rest = mjd[good] - day
    utc_day, utc_rest = _universal_of_tt(day, rest - _leading_tdb_minus_tt_d(mjd[good]))
    # Status 1 says only that leap seconds of that year are not known, which the docstring says.
    year, month, date, clock, _ = ufunc.d2dtf(b"UTC", 0, utc_day + MJD_ZERO_JD, utc_rest)
    seconds = clock["h"].astype(np.int64) * 3600 + clock["m"] * 60 + clock["s"]
    days = (year - 1970).astype("datetime64[Y]").astype("datetime64[M]") + (month - 1)
    instants = days.astype("datetime64[D]") + (date - 1) + np.minimum(seconds, 86399).astype("timedelta64[s]")
    texts: list[str | None] = [text + "Z" for text in np.datetime_as_string(instants, unit="s").tolist()]
    for position in np.flatnonzero((clock["s"] == 60) | (year < 1) | (year > 9999)).tolist():
        # A leap second has no place in the calendar; at either end of it the change of scale may lead out.
        leap = 1 <= year[position] <= 9999
        text = texts[position]
        texts[position] = text[:17] + "60Z" if leap and text is not None else None
    found: list[str | None] = [None] * mjd.size
    for position, text in zip(np.flatnonzero(good).tolist(), texts, strict=True):
        found[position] = text
    return found


def _in_calendar(mjd: FloatArray) -> NDArray[np.bool_]:
    return (mjd >= _MJD_YEAR_1) & (mjd < _MJD_YEAR_10000)


def _tdb_minus_tt_d(day: FloatArray, rest: FloatArray) -> FloatArray:
    """Read off between whole days: the cubic through four of them is right to 1e-10 s."""
    # TT in place of TDB as the argument of the slow terms changes them by less than 1e-12 s.
    mjd = day + rest
    safe = np.where(np.isfinite(mjd), mjd, 0.0)
    whole = np.floor(safe)
    x = safe - whole
    index = whole.astype(np.int64)
    days = needed_days(index.ravel(), -1, 2)
    seconds: FloatArray = ufunc.dtdb(MJD_ZERO_JD, days.astype(np.float64), 0.0, 0.0, 0.0, 0.0)
    first = np.searchsorted(days, index - 1)
    before, left, right, after = (seconds[first + step] for step in range(4))
    # Newton's form: differences of neighbours, which are small, times products below one.
    steps = left - before, right - 2.0 * left + before, after - 3.0 * right + 3.0 * left - before
    y = x + 1.0
    between: FloatArray = before + y * (steps[0] + (y - 1.0) / 2.0 * (steps[1] + (y - 2.0) / 3.0 * steps[2]))
    return between / DAY_S


def _leading_tdb_minus_tt_d(mjd: FloatArray) -> FloatArray:
    century = (mjd - MJD_J2000) / (100.0 * JULIAN_YEAR_D)
    total = np.zeros_like(century)
    for amplitude, frequency, phase in _TDB_TERMS:
        total += amplitude * np.sin(frequency * century + phase)
    return total / DAY_S


def _year_of(mjd: FloatArray) -> FloatArray:
    return 2000.0 + (mjd - MJD_J2000) / JULIAN_YEAR_D


def _tt_of_universal(day: FloatArray, rest: FloatArray) -> FloatArray:
    """The second part of TT; the first is ``day``."""
    before = day + rest < _UTC_FROM_MJD
    result = rest + delta_t_s(_year_of(day + rest)) / DAY_S
    since = ~before & np.isfinite(day + rest)
    if bool(since.any()):
        jd = np.where(since, day, _UTC_FROM_MJD) + MJD_ZERO_JD
        _, tai, _ = ufunc.utctai(jd, np.where(since, rest, 0.0))
        result = np.where(since, tai + _TT_MINUS_TAI_D, result)
    return result


def _universal_of_tt(day: FloatArray, tt: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Whole-day part and the rest of UTC or UT."""
    ut = tt - delta_t_s(_year_of(day + tt)) / DAY_S
    _, utc, _ = ufunc.taiutc(day + MJD_ZERO_JD, tt - _TT_MINUS_TAI_D)
    return day, np.where(day + ut < _UTC_FROM_MJD, ut, utc)
