"""Where in its orbit a launch falls."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.domain import positive

FloatArray = NDArray[np.float64]


def phase_of_launch(launch_yr: ArrayLike, periastron_yr: float, period_yr: float) -> FloatArray:
    """Orbital phase at launch, signed about periastron.

    Parameters
    ----------
    launch_yr : array_like
        Launch dates, yr on any axis.
    periastron_yr, period_yr : float
        A periastron on that axis, yr, and the period, yr, > 0.

    Returns
    -------
    ndarray
        Phase in [-0.5, 0.5) (dimensionless); negative is before periastron.

    Raises
    ------
    InputRefused
        If the period is not positive.

    Notes
    -----
    Accuracy: a few ulp of the dates over the period.

    Source: definition of the phase.

    Examples
    --------
    >>> phase_of_launch([1999.0, 2009.0], 2000.0, 8.0).tolist()
    [-0.125, 0.125]
    """
    positive(period_yr, "period", "8.0 yr")
    turns = (np.asarray(launch_yr, dtype=np.float64) - periastron_yr) / period_yr
    phase: FloatArray = turns - np.floor(turns + 0.5)
    return phase
