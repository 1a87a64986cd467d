"""Distance from a parallax, also from one that is poor or negative."""

from __future__ import annotations

from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]

# A parallax this good or better is simply inverted.
PLAIN_INVERSION_RELATIVE_ERROR = 0.05
DEFAULT_LENGTH_SCALE_PC = 1350.0
LEAST_ERROR_MAS = 1e-9
_GRID = 20_001
_WORTH_COUNTING = 40.0  # natural logarithms below the peak at which the posterior is dropped
_QUANTILES = (0.158655254, 0.5, 0.841344746)


class ParallaxDistance(NamedTuple):
    """A distance in pc with 16 % and 84 % errors, and how it was found."""

    median_pc: float
    minus_pc: float
    plus_pc: float
    method: Literal["plain inversion", "exponentially decreasing space density prior"]


def distance_from_parallax(
    parallax_mas: float, error_mas: float, length_scale_pc: float = DEFAULT_LENGTH_SCALE_PC
) -> ParallaxDistance:
    """Distance and its error from a measured parallax.

    Parameters
    ----------
    parallax_mas : float
        Measured parallax, mas; may be zero or negative.
    error_mas : float
        Its standard error, mas, at least 1e-9.
    length_scale_pc : float
        Length L of the prior, pc, > 0; only used when the relative error is above 5 %.

    Returns
    -------
    ParallaxDistance
        Median, and distances from it down to the 16 % and up to the 84 % quantile, pc; ``method`` says
        whether the parallax was inverted or a posterior was taken.

    Raises
    ------
    InputRefused
        If a number is not finite, the error is below 1e-9 mas or the length is not positive.

    Notes
    -----
    Accuracy: plain inversion leaves out terms of the square of the relative error (0.25 % at 5 %). The
    posterior's quantiles are good to 1e-5 of the distance; a poor parallax returns mostly the prior, whose
    L = 1.35 kpc suits the Galaxy at large (memory) and no particular region.

    Source: Bailer-Jones 2015, PASP 127, 994: posterior proportional to r^2 exp(-r/L) times the normal
    likelihood of the parallax 1/r.

    Examples
    --------
    >>> distance = distance_from_parallax(0.5, 0.02)
    >>> distance.median_pc, distance.minus_pc, distance.method
    (2000.0, 80.0, 'plain inversion')
    >>> distance_from_parallax(-0.2, 0.1).method
    'exponentially decreasing space density prior'
    """
    _check(parallax_mas, error_mas, length_scale_pc)
    if error_mas <= PLAIN_INVERSION_RELATIVE_ERROR * parallax_mas:
        median = 1000.0 / parallax_mas
        error = median * error_mas / parallax_mas
        return ParallaxDistance(median, error, error, "plain inversion")
    low, median, high = _posterior_quantiles(parallax_mas, error_mas, length_scale_pc)
    return ParallaxDistance(
        median, median - low, high - median, "exponentially decreasing space density prior"
    )


def _check(parallax_mas: float, error_mas: float, length_scale_pc: float) -> None:
    if not (np.isfinite(parallax_mas) and np.isfinite(error_mas) and np.isfinite(length_scale_pc)):
        raise InputRefused(
            "The parallax or its error is not a finite number.",
            why="A distance cannot be found from it.",
            hint="Give a parallax such as 0.48±0.05 mas.",
            code="parallax-refused",
        )
    if error_mas < LEAST_ERROR_MAS or length_scale_pc <= 0.0:
        raise InputRefused(
            "The error of the parallax or the length of the prior is not positive.",
            why=f"The distribution of distances needs an error of at least {LEAST_ERROR_MAS:g} mas.",
            hint="Give a parallax such as 0.48±0.05 mas.",
            code="parallax-refused",
        )


def _posterior_quantiles(parallax_mas: float, error_mas: float, length_pc: float) -> list[float]:
    def log_posterior(r: FloatArray) -> FloatArray:
        return 2.0 * np.log(r) - r / length_pc - 0.5 * ((parallax_mas - 1000.0 / r) / error_mas) ** 2

    # The mass lies between the nearest distance that the parallax allows and some lengths beyond the point
    # where the prior overtakes the likelihood; both ends are generous, since a grid in log r is cheap.
    nearest = 1000.0 / (max(parallax_mas, 0.0) + 40.0 * error_mas)
    turn = length_pc + np.sqrt(1000.0 * abs(parallax_mas) * length_pc) / error_mas
    far = turn + 1000.0 / max(parallax_mas, error_mas)
    coarse = np.geomspace(min(nearest, 1e-3 * length_pc), 100.0 * far, _GRID)
    height = log_posterior(coarse)
    within = np.flatnonzero(height > height.max() - _WORTH_COUNTING)
    first, last = max(int(within[0]) - 1, 0), min(int(within[-1]) + 1, coarse.size - 1)
    r = np.geomspace(coarse[first], coarse[last], _GRID)
    height = log_posterior(r)
    density = np.exp(height - height.max())
    mass = np.concatenate([[0.0], np.cumsum(0.5 * (density[1:] + density[:-1]) * np.diff(r))])
    return [float(x) for x in np.interp(_QUANTILES, mass / mass[-1], r)]
