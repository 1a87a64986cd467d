"""What a limit says of a model: the probability that so bright a source was not seen, or saturated."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]


def limit_log_likelihood(
    model_flux: ArrayLike, limit_flux: ArrayLike, sigma: ArrayLike, side: ArrayLike = 1
) -> FloatArray:
    """ln of the probability of a limit, were the model true.

    Parameters
    ----------
    model_flux, limit_flux : array_like
        Flux of the model and of the limit, in one unit (Jy, or dimensionless in units of the stars' flux).
    sigma : array_like
        One-sigma noise of the flux in that unit, > 0.
    side : array_like
        +1 where the flux is below the limit (too faint), -1 where it is above (saturated); dimensionless.

    Returns
    -------
    ndarray
        Natural logarithm (dimensionless), <= 0.

    Notes
    -----
    Accuracy: 1e-12 relative, far tails included.

    Source: censored regression (Tobin 1958, Econometrica 26, 24): ln Phi(side (limit - model) / sigma); never
    a normal density at the limit.

    Examples
    --------
    >>> round(float(limit_log_likelihood(0.0025, 0.003, 0.001)), 6)
    -0.368946
    """
    from scipy.special import log_ndtr

    depth = np.asarray(side) * (np.asarray(limit_flux) - np.asarray(model_flux)) / np.asarray(sigma)
    value: FloatArray = log_ndtr(depth)
    return value
