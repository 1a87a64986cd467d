"""Where the Earth is, for many instants at once: read off between whole days."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from erfa import ufunc
from numpy.typing import ArrayLike, NDArray

from campaign.physics.constants import AU_KM, MJD_ZERO_JD
from campaign.physics.nodes import needed_days

FloatArray = NDArray[np.float64]

_WGS84 = 1


@dataclass(frozen=True, slots=True, eq=False)
class EarthDays:
    """The Earth at the days that some instants need.

    ``day`` is the MJD in TDB of each node, ascending, shape (m,). ``place_au`` and ``step_au`` (the motion
    in one day) have the shape (m, 2, 3): from the Sun first, from the barycentre second, in ICRS axes.
    """

    day: NDArray[np.int64]
    place_au: FloatArray
    step_au: FloatArray


def earth_days(mjd_tdb: ArrayLike, margin_d: float = 0.0) -> EarthDays:
    """The Earth at the days around some instants.

    Parameters
    ----------
    mjd_tdb : array_like
        MJD in TDB, days; finite.
    margin_d : float
        Instants within so many days of those given are served too.

    Returns
    -------
    EarthDays
        Places in au, motions in au a day.

    Notes
    -----
    Accuracy: that of the source, 4.6 km rms and 13.4 km at most from 1900 to 2100.

    Source: erfa.epv00 (VSOP2000 fitted to DE405).

    Examples
    --------
    >>> earth_days([60000.25, 60000.5]).day.tolist()
    [60000, 60001]
    """
    mjd = np.asarray(mjd_tdb, dtype=np.float64).ravel()
    low, high = np.floor(mjd - margin_d).astype(np.int64), np.floor(mjd + margin_d).astype(np.int64)
    day = needed_days(low, 0, 1)
    if margin_d > 0.0 and bool((high != low).any()):
        day = np.union1d(day, needed_days(high[high != low], 0, 1))
    # The status only says whether the date is within 1900 to 2100.
    around_sun, around_barycentre, _ = ufunc.epv00(MJD_ZERO_JD, day.astype(np.float64))
    return EarthDays(
        day,
        np.stack([around_sun["p"], around_barycentre["p"]], axis=1),
        np.stack([around_sun["v"], around_barycentre["v"]], axis=1),
    )


def earth_along_au(days: EarthDays, mjd_tdb: ArrayLike, n: FloatArray, origin: int) -> FloatArray:
    """How far the centre of the Earth is along a direction.

    Parameters
    ----------
    days : EarthDays
        Must hold the days around the instants.
    mjd_tdb : array_like
        MJD in TDB, days; finite.
    n : ndarray, shape (..., 3)
        Unit vector in ICRS axes; broadcasts with the instants.
    origin : {0, 1}
        0 counts from the Sun, 1 from the barycentre.

    Returns
    -------
    ndarray
        Component of the Earth's place along ``n``, au.

    Notes
    -----
    Accuracy: 0.1 km (0.35 us of light) from reading between two days, on top of the source: the cubic
    through places and motions of both ends leaves out h^4/384 of the fourth derivative.

    Source: Hermite interpolation; erfa.epv00.

    Examples
    --------
    >>> n = np.array([1.0, 0.0, 0.0])
    >>> round(float(earth_along_au(earth_days(60389.75), 60389.75, n, 0)), 6)
    -0.996021
    """
    mjd = np.asarray(mjd_tdb, dtype=np.float64)
    whole = np.floor(mjd)
    x = mjd - whole
    left = np.searchsorted(days.day, whole.astype(np.int64))
    # Written out, so that one instant and a million are summed in the same order.
    from_, to, begins, ends = (
        table[..., 0] * n[..., 0] + table[..., 1] * n[..., 1] + table[..., 2] * n[..., 2]
        for table in (
            days.place_au[left, origin],
            days.place_au[left + 1, origin],
            days.step_au[left, origin],
            days.step_au[left + 1, origin],
        )
    )
    way = to - from_
    along: FloatArray = from_ + x * (
        begins + x * ((3.0 * way - 2.0 * begins - ends) + x * (begins + ends - 2.0 * way))
    )
    return along


def site_along_au(
    mjd_tdb: ArrayLike,
    ut_day: ArrayLike,
    ut_fraction: ArrayLike,
    n: FloatArray,
    site_geodetic: tuple[float, float, float],
) -> FloatArray:
    """How far an observatory is from the centre of the Earth along a direction.

    Parameters
    ----------
    mjd_tdb : array_like
        MJD in TDB, days; finite.
    ut_day, ut_fraction : array_like
        The same instants as MJD in universal time, in two parts, days.
    n : ndarray, shape (..., 3)
        Unit vector in ICRS axes; broadcasts with the instants.
    site_geodetic : tuple of float
        East longitude (deg), latitude (deg), height (m) on WGS84.

    Returns
    -------
    ndarray
        Component of the observatory's place along ``n``, au.

    Notes
    -----
    Accuracy: 0.2 m (1 ns of light) from reading precession and nutation between two days; polar motion is
    left out (15 m), and UTC in place of UT1 turns the Earth by up to 0.9 s (420 m).

    Source: erfa.gd2gc, c2i00b and era00 (IAU 2000B precession-nutation and Earth rotation angle).

    Examples
    --------
    >>> pole = np.array([0.0, 0.0, 1.0])
    >>> round(float(site_along_au(51544.5, 51544.0, 0.4992, pole, (0.0, 90.0, 0.0))) * AU_KM, 1)
    6356.8
    """
    longitude, latitude, height_m = site_geodetic
    (x_m, y_m, z_m), _ = ufunc.gd2gc(_WGS84, np.radians(longitude), np.radians(latitude), height_m)
    mjd = np.asarray(mjd_tdb, dtype=np.float64)
    whole = np.floor(mjd)
    part = mjd - whole
    days = needed_days(whole.astype(np.int64).ravel(), 0, 1)
    left = np.searchsorted(days, whole.astype(np.int64))
    # TDB in place of TT: precession in 2 ms is nothing.
    to_intermediate = ufunc.c2i00b(MJD_ZERO_JD, days.astype(np.float64))
    turn = ufunc.era00(np.asarray(ut_day) + MJD_ZERO_JD, np.asarray(ut_fraction))
    cosine, sine = np.cos(turn), np.sin(turn)
    place_m = (x_m * cosine - y_m * sine, x_m * sine + y_m * cosine, z_m)
    along_m = np.zeros(np.broadcast_shapes(mjd.shape, n.shape[:-1]))
    for axis in range(3):
        begin, end = to_intermediate[left, axis], to_intermediate[left + 1, axis]
        row = begin + (end - begin) * part[..., np.newaxis]
        along_m = along_m + place_m[axis] * (
            row[..., 0] * n[..., 0] + row[..., 1] * n[..., 1] + row[..., 2] * n[..., 2]
        )
    result: FloatArray = along_m / (1000.0 * AU_KM)
    return result
