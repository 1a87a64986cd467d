"""Distance from a parallax, without inverting a noisy one."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

# Length scale of the exponentially decreasing space density prior (Astraatmadja & Bailer-Jones 2016; memory).
LENGTH_SCALE_PC = 1350.0
# Up to this relative error plain inversion and the posterior agree within a fraction of the error.
INVERT_UP_TO = 0.05


@dataclass(frozen=True, slots=True)
class ParallaxDistance:
    """Median distance in pc with errors to the 16 and 84 % quantiles; ``inverted`` when simply 1/parallax."""

    median_pc: float
    minus_pc: float
    plus_pc: float
    inverted: bool


def distance_from_parallax(
    parallax_mas: float, error_mas: float, length_scale_pc: float = LENGTH_SCALE_PC
) -> ParallaxDistance:
    """Distance of a star from its parallax.

    Parameters
    ----------
    parallax_mas : float
        Parallax, mas; may be negative when its error is large.
    error_mas : float
        One-sigma error, mas, >= 0.
    length_scale_pc : float
        Length scale L of the prior r^2 exp(-r/L), pc.

    Returns
    -------
    ParallaxDistance
        pc. Plain inversion with first-order error up to a relative error of 5 %, else the posterior.

    Notes
    -----
    Accuracy: 1e-3 of the width, from a grid of 20,000 distances; above 20 % relative error the prior
    matters and the result leans on the length scale.

    Source: Bailer-Jones 2015, PASP 127, 994, equation 17 (posterior); the length scale of 1.35 kpc is
    recalled from Astraatmadja & Bailer-Jones 2016, ApJ 832, 137 (memory).

    Examples
    --------
    >>> near = distance_from_parallax(2.0, 0.02)
    >>> near.median_pc, round(near.plus_pc, 1), near.inverted
    (500.0, 5.0, True)
    >>> far = distance_from_parallax(0.3, 0.1)
    >>> far.inverted, far.plus_pc > far.minus_pc
    (False, True)
    """
    if parallax_mas > 0.0 and error_mas <= INVERT_UP_TO * parallax_mas:
        distance = 1000.0 / parallax_mas
        error = distance * error_mas / parallax_mas
        return ParallaxDistance(distance, error, error, True)
    r = np.geomspace(1.0, 60.0 * length_scale_pc, 20_000)
    log_density = (
        2.0 * np.log(r)
        - r / length_scale_pc
        - 0.5 * ((parallax_mas - 1000.0 / r) / error_mas) ** 2
        + np.log(r)
    )
    density = np.exp(log_density - log_density.max())
    cumulative = np.cumsum(density)
    cumulative /= cumulative[-1]
    low, median, high = (float(x) for x in np.interp([0.16, 0.5, 0.84], cumulative, r))
    return ParallaxDistance(median, median - low, high - median, False)
