"""The surface on which two winds meet, by the momentum balance of a thin shell.

``half_opening_rad`` is the asymptotic angle of the surface about the axis that points away from the star with
the stronger wind: the cone opens behind the other. A momentum ratio above 1 means that the star called weaker
is in fact the stronger; the angle is then above 90 degrees, and nothing jumps.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]

# Below this angle differences of nearly equal terms are summed as series.
_SMALL_RAD = 0.3
_STEPS = 200


def half_opening_rad(eta: ArrayLike) -> FloatArray:
    """Asymptotic half-opening angle of the contact surface: exact root of the thin-shell balance.

    Parameters
    ----------
    eta : array_like
        Momentum ratio (dimensionless), > 0, of weaker over stronger wind.

    Returns
    -------
    ndarray
        Angle t, rad, in (0, pi): below pi/2 for eta < 1, pi/2 at 1, and pi - t(1/eta) above.

    Raises
    ------
    InputRefused
        If a ratio is zero or negative.

    Notes
    -----
    Accuracy: 1e-13 relative. The shell is thin and mixed (both winds cool at once), does not rotate with the
    orbit, and nothing but ram pressure acts; hot shells are wider, see ``campaign.physics.openingforms``.

    Source: Canto, Raga & Wilkin 1996, ApJ 469, 729: tan t - t = pi eta/(1 - eta).

    Examples
    --------
    >>> [round(float(np.degrees(half_opening_rad(eta))), 5) for eta in (0.01, 0.1, 1.0)]
    [25.45374, 51.16014, 90.0]
    """
    ratio = positive(eta, "momentum ratio", "0.03")
    folded = np.minimum(ratio, 1.0 / ratio)

    start = np.minimum((3.0 * np.pi * folded) ** (1.0 / 3.0), 0.5 * np.pi)
    angle = _root(_momentum_excess, folded, 0.5 * np.pi, start)
    return np.where(ratio > 1.0, np.pi - angle, angle)


def momentum_ratio_from_half_opening(half_opening: ArrayLike) -> FloatArray:
    """Momentum ratio whose thin shell has a given asymptotic half-opening angle.

    Parameters
    ----------
    half_opening : array_like
        Angle t about the weaker star, rad, in (0, pi).

    Returns
    -------
    ndarray
        eta (dimensionless); above 1 for an angle beyond pi/2.

    Raises
    ------
    InputRefused
        If an angle is outside (0, pi).

    Notes
    -----
    Accuracy: 1e-14 relative.

    Source: Canto, Raga & Wilkin 1996, solved for eta = (tan t - t)/(pi + tan t - t).

    Examples
    --------
    >>> round(float(momentum_ratio_from_half_opening(np.radians(55.0))), 9)
    0.129706819
    """
    t = np.asarray(half_opening, dtype=np.float64)
    if bool(((t <= 0.0) | (t >= np.pi)).any()):
        raise InputRefused(
            "A half-opening angle lies outside 0 to 180 degrees.",
            why="It is the angle between the axis behind the weaker star and the contact surface.",
            hint="Give an angle such as 55 deg.",
            code="half-opening-refused",
        )
    part = _sine_less_angle(t)
    return part / (np.pi * np.cos(t) + part)


def contact_surface(theta_rad: ArrayLike, eta: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """The contact surface as seen from the weaker star.

    Parameters
    ----------
    theta_rad : array_like
        Angle at the weaker star from the direction to the stronger, rad, in [0, pi).
    eta : array_like
        Momentum ratio (dimensionless), > 0; broadcast with the angle.

    Returns
    -------
    tuple of ndarray
        Angle theta1 of the same point at the stronger star, rad, and its distance from the weaker star in
        units of the separation (dimensionless). The distance is infinite, and theta1 not a number, in
        directions that the surface never reaches: theta >= pi - t, with t the half-opening angle.

    Raises
    ------
    InputRefused
        If an angle is outside [0, pi), or a ratio is zero or negative.

    Notes
    -----
    Accuracy: 1e-11 relative, less near the asymptote, where the distance grows without bound.

    Source: Canto, Raga & Wilkin 1996: theta1 cot theta1 = 1 + eta (theta cot theta - 1),
    R = D sin theta1/sin(theta + theta1).

    Examples
    --------
    >>> theta1, distance = contact_surface(np.radians(90.0), 0.1)
    >>> round(float(np.degrees(theta1)), 6), round(float(distance), 9)
    (31.070406, 0.602534317)
    """
    theta = np.asarray(theta_rad, dtype=np.float64)
    if bool(((theta < 0.0) | (theta >= np.pi)).any()):
        raise InputRefused(
            "An angle at the weaker star lies outside 0 to 180 degrees.",
            why="It is counted from the direction to the stronger star.",
            hint="Give an angle such as 45 deg.",
            code="angle-refused",
        )
    ratio = positive(eta, "momentum ratio", "0.03")
    theta, ratio = np.broadcast_arrays(theta, ratio)
    reached = theta < np.pi - half_opening_rad(ratio)
    load = ratio * _one_less_x_cot(np.where(reached, theta, 0.0))
    start = np.minimum(np.sqrt(3.0 * load), np.pi * (1.0 - 0.5 / (1.0 + load)))
    theta1 = _root(_angle_excess, load, np.pi, start)
    near = _stagnation_limit(ratio)
    with np.errstate(invalid="ignore", divide="ignore"):
        distance = np.where(theta > 1e-7, np.sin(theta1) / np.sin(theta + theta1), near)
    distance = np.where(reached & (distance > 0.0), distance, np.inf)
    distance = np.where(np.isnan(ratio) | np.isnan(theta), np.nan, distance)
    return np.where(reached, theta1, np.nan), distance


def _stagnation_limit(ratio: FloatArray) -> FloatArray:
    root = np.sqrt(ratio)
    return root / (1.0 + root)


def _sine_less_angle(x: FloatArray) -> FloatArray:
    """sin x - x cos x."""
    square = x * x
    series = (
        x
        * square
        * (1 / 3 - square * (1 / 30 - square * (1 / 840 - square * (1 / 45360 - square / 3991680))))
    )
    return np.where(x < _SMALL_RAD, series, np.sin(x) - x * np.cos(x))


def _one_less_x_cot(x: FloatArray) -> FloatArray:
    """1 - x cot x."""
    with np.errstate(invalid="ignore", divide="ignore"):
        return np.where(x == 0.0, 0.0, _sine_less_angle(x) / np.sin(x))


def _momentum_excess(t: FloatArray, eta: FloatArray) -> tuple[FloatArray, FloatArray]:
    """(tan t - t)(1 - eta) - pi eta, times cos t, so that 90 degrees is no pole; and its slope."""
    part = _sine_less_angle(t)
    return part - eta * (part + np.pi * np.cos(t)), np.sin(t) * (t * (1.0 - eta) + np.pi * eta)


def _angle_excess(x: FloatArray, load: FloatArray) -> tuple[FloatArray, FloatArray]:
    """1 - x cot x - load, times sin x, so that pi is no pole; and its slope."""
    return _sine_less_angle(x) - load * np.sin(x), x * np.sin(x) - load * np.cos(x)


def _root(
    function: Callable[[FloatArray, FloatArray], tuple[FloatArray, FloatArray]],
    parameter: FloatArray,
    high: float,
    start: FloatArray,
) -> FloatArray:
    """The root in (0, high) of a function that turns from negative to positive there, element by element.

    Newton's steps, replaced by a bisection whenever they leave the bracket; elements leave the work as they
    settle, so that a few slow ones do not hold up the rest.
    """
    root = start.astype(np.float64).ravel()
    values = np.broadcast_to(parameter, start.shape).ravel()
    below, above = np.zeros_like(root), np.full_like(root, high)
    active = np.flatnonzero(np.isfinite(values))
    for _ in range(_STEPS):
        if not active.size:
            break
        x = root[active]
        value, slope = function(x, values[active])
        below[active] = np.where(value < 0.0, x, below[active])
        above[active] = np.where(value < 0.0, above[active], x)
        with np.errstate(invalid="ignore", divide="ignore"):
            trial = x - value / slope
        low, top = below[active], above[active]
        trial = np.where((trial > low) & (trial < top), trial, 0.5 * (low + top))
        trial = np.where(value == 0.0, x, trial)
        root[active] = trial
        active = active[np.abs(trial - x) > 2.0 * np.finfo(float).eps * np.abs(x)]
    root[~np.isfinite(values)] = np.nan
    return root.reshape(start.shape)
