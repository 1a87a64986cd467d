"""Dust pushed by starlight: speed, way and time in closed form, and their derivatives."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

_ITERATIONS = 60


def travel_time(
    radius: ArrayLike, launch_radius: ArrayLike, launch_speed: ArrayLike, terminal_speed: ArrayLike
) -> FloatArray:
    """Time from launch to a radius for dust whose acceleration falls with the square of the radius.

    Parameters
    ----------
    radius, launch_radius : array_like
        In one unit of length (au, km, arcsec), ``radius >= launch_radius > 0``.
    launch_speed, terminal_speed : array_like
        In that unit of length for each unit of time (yr, s), > 0; equal for constant speed, the second
        smaller for dust that is slowed down.

    Returns
    -------
    ndarray
        Time in the unit of the speeds (yr, s).

    Notes
    -----
    Accuracy: a few 1e-16 of the larger of the time and the launch radius over the terminal speed.

    Source: integral of dr/v with v^2 = v_inf^2 (1 - r_m/r), r_m = r0 (1 - v0^2/v_inf^2).

    Examples
    --------
    >>> au_d = 86400 / 149597870.7
    >>> round(float(travel_time(500.0, 50.0, 1500 * au_d, 2216.0440711877 * au_d)), 6)
    381.296533
    """
    r, r0 = np.asarray(radius, dtype=np.float64), np.asarray(launch_radius, dtype=np.float64)
    v0, v = np.asarray(launch_speed, dtype=np.float64), np.asarray(terminal_speed, dtype=np.float64)
    reach = r0 * (1.0 - (v0 / v) ** 2)
    time: FloatArray = (_way(r, reach) - _way(r0, reach)) / v
    # ln(sqrt r + sqrt(r - r_m)) enters as a difference: one logarithm of a ratio keeps its figures.
    time = time + reach * _log_ratio(r, r0, reach) / v
    return time


def speed_at(
    radius: ArrayLike, launch_radius: ArrayLike, launch_speed: ArrayLike, terminal_speed: ArrayLike
) -> FloatArray:
    """Speed at a radius, for the same dust as in :func:`travel_time`.

    Parameters
    ----------
    radius, launch_radius : array_like
        In one unit of length (au, km, arcsec), ``radius >= launch_radius > 0``.
    launch_speed, terminal_speed : array_like
        In any unit of speed (km/s), > 0.

    Returns
    -------
    ndarray
        Speed in that unit (km/s).

    Notes
    -----
    Accuracy: a few ulp.

    Source: energy, v^2 = v_inf^2 (1 - r_m/r), r_m = r0 (1 - v0^2/v_inf^2).

    Examples
    --------
    >>> round(float(speed_at(500.0, 50.0, 1500.0, 2216.0440711877)), 6)
    2155.171964
    """
    r, r0 = np.asarray(radius, dtype=np.float64), np.asarray(launch_radius, dtype=np.float64)
    v0, v = np.asarray(launch_speed, dtype=np.float64), np.asarray(terminal_speed, dtype=np.float64)
    speed: FloatArray = np.sqrt(v**2 * (1.0 - r0 / r) + v0**2 * r0 / r)
    return speed


def radius_after(
    time: ArrayLike, launch_radius: float, launch_speed: float, terminal_speed: float
) -> FloatArray:
    """Radius a time after launch, for the same dust as in :func:`travel_time`.

    Parameters
    ----------
    time : array_like
        Time since launch in the unit of the speeds (yr, s). Before the launch the way is continued at the
        launch speed.
    launch_radius : float
        Any unit of length (au, km, arcsec), > 0.
    launch_speed, terminal_speed : float
        In that unit for each unit of time, > 0.

    Returns
    -------
    ndarray
        Radius in the unit of ``launch_radius`` (au, km, arcsec).

    Notes
    -----
    Newton's method between the two straight lines that enclose the way; it converges from one side.
    Accuracy: 1e-12 of the radius.

    Source: inverse of :func:`travel_time`.

    Examples
    --------
    >>> au_d = 86400 / 149597870.7
    >>> round(float(radius_after(381.29653333, 50.0, 1500 * au_d, 2216.0440711877 * au_d)), 6)
    500.0
    """
    t = np.asarray(time, dtype=np.float64)
    after = np.maximum(t, 0.0)
    one, other = launch_radius + launch_speed * after, launch_radius + terminal_speed * after
    low, high = np.minimum(one, other), np.maximum(one, other)
    r = other.copy()
    for _ in range(_ITERATIONS):
        late = travel_time(r, launch_radius, launch_speed, terminal_speed) - after
        step = late * speed_at(r, launch_radius, launch_speed, terminal_speed)
        nearer = np.clip(r - step, low, high)
        moved = np.abs(nearer - r)
        r = nearer
        if bool((moved <= 1e-14 * r).all()):
            break
    radius: FloatArray = np.where(t < 0.0, launch_radius + launch_speed * t, r)
    return radius


def radius_slopes(
    radius: FloatArray, time: FloatArray, launch_radius: float, launch_share: float, terminal_speed: float
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Derivatives of the radius by time, launch radius, launch over terminal speed, and terminal speed.

    Parameters
    ----------
    radius : ndarray, shape (n,)
        Radii (arcsec) at those times, of :func:`radius_after`.
    time : ndarray, shape (n,)
        Times since launch (yr).
    launch_radius, terminal_speed : float
        In the same units (arcsec, arcsec/yr).
    launch_share : float
        Launch speed over terminal speed (dimensionless), > 0.

    Returns
    -------
    tuple of ndarray, each of shape (n,)
        Units of radius over those of each (arcsec/yr, dimensionless, arcsec, yr).

    Notes
    -----
    Accuracy: rounding.

    Source: implicit differentiation of the time of :func:`travel_time`.

    Examples
    --------
    >>> slopes = radius_slopes(np.array([2.0]), np.array([1.0]), 1.0, 1.0, 1.0)
    >>> [float(slope[0]) for slope in slopes[:2]]
    [1.0, 1.0]
    """
    w, v, r0 = launch_share, terminal_speed, launch_radius
    reach = r0 * (1.0 - w**2)
    r = np.maximum(radius, r0)
    root = np.sqrt(r - reach)
    speed = v * np.sqrt(1.0 - reach / r)
    # d time / d r_m at fixed ends, times the terminal speed.
    stretch = _log_ratio(r, np.asarray(r0), np.asarray(reach)) - np.sqrt(r) / root + 1.0 / w
    by_radius = -speed * ((1.0 - w**2) * stretch - 1.0 / w) / v
    by_share = speed * 2.0 * r0 * w * stretch / v
    by_speed = speed * time / v
    before = time < 0.0
    return (
        np.where(before, w * v, speed),
        np.where(before, 1.0, by_radius),
        np.where(before, v * time, by_share),
        np.where(before, w * time, by_speed),
    )


def _way(radius: FloatArray, reach: FloatArray) -> FloatArray:
    way: FloatArray = np.sqrt(radius * (radius - reach))
    return way


def _log_ratio(radius: FloatArray, launch_radius: FloatArray, reach: FloatArray) -> FloatArray:
    top = np.sqrt(radius) + np.sqrt(radius - reach)
    # r0 - r_m cannot be negative; rounding may say so when the dust starts from rest.
    bottom = np.sqrt(launch_radius) + np.sqrt(np.maximum(launch_radius - reach, 0.0))
    ratio: FloatArray = np.log(top / bottom)
    return ratio
