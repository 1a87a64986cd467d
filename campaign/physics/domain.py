"""Refusals that several functions of physics share. NaN passes: one unknown draw spoils no others."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]


def closed_orbit(eccentricity: ArrayLike) -> FloatArray:
    """Eccentricities as an array, all of closed orbits.

    Parameters
    ----------
    eccentricity : array_like
        e (dimensionless).

    Returns
    -------
    ndarray
        The same values (dimensionless), 0 <= e < 1 or NaN.

    Raises
    ------
    InputRefused
        If any is outside [0, 1).

    Notes
    -----
    Accuracy: exact.

    Source: definition of an ellipse.

    Examples
    --------
    >>> float(closed_orbit(0.5))
    0.5
    """
    e = np.asarray(eccentricity, dtype=np.float64)
    if e.size and not (e.min() >= 0.0 and e.max() < 1.0):
        outside = (e < 0.0) | (e >= 1.0)
        if bool(outside.any()):
            wrong = float(e[outside].flat[0])
            raise InputRefused(
                f"An eccentricity of {wrong!r} is no closed orbit.",
                why="An ellipse needs 0 <= e < 1.",
                hint="Give an eccentricity such as 0.71.",
                code="eccentricity-refused",
                details={"eccentricity": wrong},
            )
    return e


def finite_angle(angle_rad: ArrayLike, name: str) -> FloatArray:
    """Angles as an array, none of them infinite.

    Parameters
    ----------
    angle_rad : array_like
        Angle, rad.
    name : str
        What the angle is called in a refusal.

    Returns
    -------
    ndarray
        The same values, rad, finite or NaN.

    Raises
    ------
    InputRefused
        If any is infinite.

    Notes
    -----
    Accuracy: exact.

    Source: project convention.

    Examples
    --------
    >>> float(finite_angle(0.5, "mean anomaly"))
    0.5
    """
    angle = np.asarray(angle_rad, dtype=np.float64)
    if bool(np.isinf(angle).any()):
        raise InputRefused(
            f"The {name} is infinite.",
            why="An infinite angle has no place on the orbit.",
            hint=f"Give a finite {name} in radians.",
            code="anomaly-refused",
        )
    return angle


def positive(value: ArrayLike, name: str, example: str) -> FloatArray:
    """Values as an array, all above zero.

    Parameters
    ----------
    value : array_like
        Any unit.
    name, example : str
        What the value is called in a refusal, and an accepted form.

    Returns
    -------
    ndarray
        The same values in the same unit, > 0 or NaN.

    Raises
    ------
    InputRefused
        If any is zero or negative.

    Notes
    -----
    Accuracy: exact.

    Source: project convention.

    Examples
    --------
    >>> float(positive(3127.5, "period", "3127.5 d"))
    3127.5
    """
    array = np.asarray(value, dtype=np.float64)
    if bool((array <= 0.0).any()):
        wrong = float(array[array <= 0.0].flat[0])
        raise InputRefused(
            f"A {name} of {wrong!r} is not positive.",
            why=f"A {name} must be above zero.",
            hint=f"Give a {name} such as {example}.",
            code=f"{name.replace(' ', '-')}-refused",
            details={"value": wrong},
        )
    return array
