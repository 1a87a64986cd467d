"""Equal-tailed intervals of drawn distributions, and of the normal ones that need no draws."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# Median, 68 % and 95 % equal-tailed: the order used by every caller.
PROBABILITIES = np.array([0.5, 0.16, 0.84, 0.025, 0.975])
# Standard normal quantiles at PROBABILITIES: Abramowitz & Stegun 1964, table 26.5, continued by scipy.
NORMAL_QUANTILES = np.array(
    [0.0, -0.994457883209753, 0.994457883209753, -1.9599639845400545, 1.9599639845400545]
)


def row_quantiles(sorted_draws: FloatArray, counts: NDArray[np.int64], shares: FloatArray) -> FloatArray:
    """Quantiles of each row of sorted draws whose NaN, if any, stand at the end.

    Parameters
    ----------
    sorted_draws : ndarray, shape (rows, draws)
        Ascending draws, any unit, NaN last.
    counts : ndarray of int, shape (rows,)
        Number of draws that are not NaN.
    shares : ndarray, shape (m,)
        Probabilities in [0, 1] (dimensionless).

    Returns
    -------
    ndarray, shape (rows, m)
        Quantiles in the unit of the draws; NaN where a row has no draws.

    Notes
    -----
    Accuracy: linear interpolation between order statistics at position ``share * count - 0.5``,
    which is unbiased for stratified draws.

    Source: Hyndman & Fan 1996, American Statistician 50, 361 (definition 5).

    Examples
    --------
    >>> import numpy as np
    >>> row_quantiles(np.array([[1.0, 2.0, 3.0, np.nan]]), np.array([3]), np.array([0.5])).tolist()
    [[2.0]]
    """
    last = np.maximum(counts - 1, 0)[:, None]
    position = np.clip(shares[None, :] * counts[:, None] - 0.5, 0.0, last)
    lower = np.floor(position).astype(np.int64)
    upper = np.minimum(lower + 1, last)
    fraction = position - lower
    below = np.take_along_axis(sorted_draws, lower, axis=1)
    above = np.take_along_axis(sorted_draws, upper, axis=1)
    return below + fraction * (above - below)


def normal_quantiles(mean: FloatArray, sigma: FloatArray, shares: FloatArray | None = None) -> FloatArray:
    """Quantiles of normal distributions.

    Parameters
    ----------
    mean, sigma : ndarray, shape (rows,)
        Mean and standard deviation, same unit; ``sigma`` >= 0.
    shares : ndarray, shape (m,), optional
        Probabilities (dimensionless); median, 68 % and 95 % bounds when not given.

    Returns
    -------
    ndarray, shape (rows, m)
        Quantiles in the unit of ``mean``.

    Notes
    -----
    Accuracy: a few units in the last place.

    Source: definition of the normal distribution; deviates by scipy.special.ndtri.

    Examples
    --------
    >>> import numpy as np
    >>> normal_quantiles(np.array([100.0]), np.array([10.0])).round(2).tolist()
    [[100.0, 90.06, 109.94, 80.4, 119.6]]
    """
    if shares is None:
        deviates = NORMAL_QUANTILES
    else:
        from scipy.special import ndtri

        deviates = ndtri(shares)
    quantiles: FloatArray = mean[:, None] + sigma[:, None] * deviates[None, :]
    return quantiles
