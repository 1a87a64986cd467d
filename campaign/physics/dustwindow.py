"""When dust production begins, peaks and ends relative to periastron, for a critical separation."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from campaign.physics.kepler import half_window_phase

FloatArray = NDArray[np.float64]

# 1 au/(km/s) in days: 149 597 870.7 km / 86 400 s (IAU 2012 Resolution B2 for the au).
AU_PER_KMS_D = 149_597_870.7 / 86_400.0


def travel_delay_d(distance_au: FloatArray, speed_kms: FloatArray) -> FloatArray:
    """Time for the flow to go from the collision to where dust condenses.

    Parameters
    ----------
    distance_au : ndarray
        Distance to the condensation radius, au, >= 0.
    speed_kms : ndarray
        Flow speed, km/s, > 0; broadcast with ``distance_au``.

    Returns
    -------
    ndarray
        Delay, days.

    Notes
    -----
    Accuracy: exact for constant speed.

    Source: kinematics; 1 au at 1000 km/s is 1.731456837 d.

    Examples
    --------
    >>> round(float(travel_delay_d(100.0, 2500.0)), 6)
    69.258273
    """
    return distance_au * AU_PER_KMS_D / speed_kms


def production_half_window_d(
    period_d: FloatArray, eccentricity: FloatArray, a_au: FloatArray, critical_separation_au: FloatArray
) -> FloatArray:
    """Time from periastron to the instant at which the separation reaches the critical one.

    Production runs while the separation is at most ``critical_separation_au``, which is symmetric
    about periastron.

    Parameters
    ----------
    period_d : ndarray
        Period, days, > 0.
    eccentricity : ndarray
        In [0, 1) (dimensionless).
    a_au, critical_separation_au : ndarray
        Semi-major axis and critical separation, au, > 0.

    Returns
    -------
    ndarray
        Half-window in days, in (0, P/2); NaN where the separation never gets so small; ``inf`` where
        it is always smaller and production never stops.

    Notes
    -----
    Accuracy: that of the closed-form inverse of Kepler's equation, a few ulp times its condition.

    Source: D = a(1 - e^2)/(1 + e cos nu) <= D_crit, with Kepler's equation.

    Examples
    --------
    >>> round(float(production_half_window_d(10.1 * 365.25, 0.8, 16.0, 6.4)), 6)
    113.6583
    """
    phase = half_window_phase(critical_separation_au / a_au, eccentricity)
    return np.where(phase >= 0.5, np.inf, phase * period_d)
