"""Phases of orbital events measured from periastron, followed continuously through full turns."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from campaign.physics.kepler import mean_from_true

FloatArray = NDArray[np.float64]


def conjunction_offset_phase(eccentricity: FloatArray, true_anomaly_rad: FloatArray) -> FloatArray:
    """Phase from periastron at a true anomaly that may lie beyond half a turn.

    Unlike a phase in [0, 1), this grows without a jump as the true anomaly passes pi, so that draws
    about an apastron conjunction stay together.

    Parameters
    ----------
    eccentricity : ndarray
        In [0, 1) (dimensionless).
    true_anomaly_rad : ndarray
        True anomaly, rad, any number of turns; broadcast with ``eccentricity``.

    Returns
    -------
    ndarray
        Phase (dimensionless, in periods); 0 at periastron, 0.5 at apastron.

    Notes
    -----
    Accuracy: a few ulp times the condition number of the inverse.

    Source: tan(E/2) = sqrt((1-e)/(1+e)) tan(nu/2), M = E - e sin E.

    Examples
    --------
    >>> import numpy as np
    >>> round(float(conjunction_offset_phase(0.8, np.radians(270.0 - 120.0))), 12)
    0.160129880564
    """
    turns = np.rint(np.asarray(true_anomaly_rad) / (2.0 * np.pi))
    within = true_anomaly_rad - 2.0 * np.pi * turns
    return mean_from_true(within, eccentricity) / (2.0 * np.pi) + turns
