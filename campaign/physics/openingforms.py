"""Other published forms of the half-opening angle, to stand beside the thin-shell root.

They differ by what the shocked layers do: cool and mix, cool apart, or stay hot. Their spread is an honest
measure of what the geometry alone does not say.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]

# By how much the shocks flare beyond the contact surface (Pittard & Dawson 2018, MNRAS 477, 5640, abstract).
SHOCK_FLARE_DEG = 20.0
# Below this ratio all of the weaker wind is shocked (same source).
ALL_SHOCKED_BELOW = 0.02

_STEPS = 60


def fitted_half_opening_rad(eta: ArrayLike) -> FloatArray:
    """Half-opening angle by the classic fit to a radiative contact surface.

    Parameters
    ----------
    eta : array_like
        Momentum ratio (dimensionless), > 0.

    Returns
    -------
    ndarray
        Angle, rad; pi minus that of 1/eta where eta is above 1.

    Raises
    ------
    InputRefused
        If a ratio is zero or negative.

    Notes
    -----
    Accuracy: within 2 % of the thin-shell root between 0.001 and 1; at 1 it exceeds 90 degrees by 0.24.

    Source: Eichler & Usov 1993, ApJ 402, 271 (memory): 2.1 (1 - eta^(2/5)/4) eta^(1/3).

    Examples
    --------
    >>> round(float(np.degrees(fitted_half_opening_rad(0.1))), 7)
    50.2897399
    """
    ratio = positive(eta, "momentum ratio", "0.03")
    folded = np.minimum(ratio, 1.0 / ratio)
    angle = 2.1 * (1.0 - 0.25 * folded**0.4) * np.cbrt(folded)
    return np.where(ratio > 1.0, np.pi - angle, angle)


def adiabatic_half_opening_rad(eta: ArrayLike) -> FloatArray:
    """Half-opening angle when the shocked gas stays hot and gets its speed back.

    Parameters
    ----------
    eta : array_like
        Momentum ratio (dimensionless), > 0.

    Returns
    -------
    ndarray
        Angle, rad, in (0, pi).

    Raises
    ------
    InputRefused
        If a ratio is zero or negative.

    Notes
    -----
    Accuracy: rounding only, of the form itself.

    Source: Gayley 2009, ApJ 703, 89 (memory): eta = tan^4(t/2).

    Examples
    --------
    >>> round(float(np.degrees(adiabatic_half_opening_rad(0.1))), 7)
    58.7016937
    """
    return 2.0 * np.arctan(positive(eta, "momentum ratio", "0.03") ** 0.25)


def hydrodynamic_half_opening_rad(eta: ArrayLike) -> FloatArray:
    """Half-opening angle by a fit to hydrodynamic models.

    Parameters
    ----------
    eta : array_like
        Momentum ratio (dimensionless), > 0.

    Returns
    -------
    ndarray
        Angle, rad, in (0, pi).

    Raises
    ------
    InputRefused
        If a ratio is zero or negative.

    Notes
    -----
    Accuracy: rounding only, of the form itself.

    Source: fit attributed to Pittard & Dawson 2018, MNRAS 477, 5640 (memory): 2 atan(eta^(1/3)).

    Examples
    --------
    >>> round(float(np.degrees(hydrodynamic_half_opening_rad(0.1))), 7)
    49.7975806
    """
    return 2.0 * np.arctan(np.cbrt(positive(eta, "momentum ratio", "0.03")))


def unmixed_half_opening_rad(eta: ArrayLike) -> FloatArray:
    """Half-opening angle when both shocked layers cool and slide along each other without mixing.

    Parameters
    ----------
    eta : array_like
        Momentum ratio (dimensionless), > 0.

    Returns
    -------
    ndarray
        Angle t, rad, in (0, pi).

    Raises
    ------
    InputRefused
        If a ratio is zero or negative.

    Notes
    -----
    Accuracy: 1e-14 rad, by bisection.

    Source: radiative layers without mixing, attributed to Gayley 2009 (memory): the momenta across the axis
    that the two layers take up are equal, t - sin t cos t = eta (pi - t + sin t cos t).

    Examples
    --------
    >>> round(float(np.degrees(unmixed_half_opening_rad(0.1))), 7)
    45.0115238
    """
    ratio = positive(eta, "momentum ratio", "0.03")
    low, high = np.zeros_like(ratio), np.full_like(ratio, np.pi)
    for _ in range(_STEPS):
        middle = 0.5 * (low + high)
        taken = middle - 0.5 * np.sin(2.0 * middle)
        short = taken < ratio * (np.pi - taken)
        low, high = np.where(short, middle, low), np.where(short, high, middle)
    return np.where(np.isnan(ratio), np.nan, 0.5 * (low + high))


def adiabatic_momentum_ratio(half_opening: ArrayLike) -> FloatArray:
    """Momentum ratio from a half-opening angle, when the shocked gas stays hot.

    Parameters
    ----------
    half_opening : array_like
        Angle t, rad, in (0, pi).

    Returns
    -------
    ndarray
        eta (dimensionless).

    Notes
    -----
    Accuracy: rounding only.

    Source: inverse of ``adiabatic_half_opening_rad``.

    Examples
    --------
    >>> round(float(adiabatic_momentum_ratio(np.radians(55.0))), 9)
    0.073435609
    """
    return np.tan(0.5 * np.asarray(half_opening, dtype=np.float64)) ** 4
