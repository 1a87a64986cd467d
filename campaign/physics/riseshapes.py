"""Shapes of a rise in flux: linear, faster and saturating, as shares of the whole rise.

Nobody knows beforehand how dust brightens; an onset that holds for one shape alone is too sure of itself.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

FloatArray = NDArray[np.float64]

RISE_NAMES = (
    "linear", "power 1.5", "power 2", "power 3", "s-shaped", "saturating 1.5", "saturating 3", "saturating 6",
)  # fmt: skip
# Faster rises hide their beginning, and a straight line fits what is seen of them: they have more weight than
# the line, or onsets come out late.
RISE_WEIGHTS = np.array([0.24, 0.13, 0.18, 0.15, 0.03, 0.13, 0.09, 0.05])


def rise_shapes(share: ArrayLike) -> FloatArray:
    """How much of the final excess each shape has reached after a share of the rise.

    Parameters
    ----------
    share : array_like
        Time since the onset over the length of the rise (dimensionless); below 0 nothing has risen,
        above 1 all has.

    Returns
    -------
    ndarray, shape (8, ...)
        Excess over its value at the top (dimensionless), in the order of ``RISE_NAMES``: 0 at the onset,
        1 at the top.

    Notes
    -----
    Accuracy: a few units in the last place.

    Source: project convention: u; u^1.5, u^2, u^3; 3u^2 - 2u^3; (1 - exp(-k u)) / (1 - exp(-k)) with k =
    1.5, 3 and 6.

    Examples
    --------
    >>> rise_shapes(0.5).round(3).tolist()
    [0.5, 0.354, 0.25, 0.125, 0.5, 0.679, 0.818, 0.953]
    """
    u = np.clip(np.asarray(share, dtype=np.float64), 0.0, 1.0)
    square = u * u
    cube = square * u
    # One exponential serves all three: exp(-3u) and exp(-6u) are its square and fourth power.
    left = np.exp(-1.5 * u)
    left_3 = left * left
    return np.stack(
        [
            u,
            u * np.sqrt(u),
            square,
            cube,
            3.0 * square - 2.0 * cube,
            (1.0 - left) / _SPAN_1_5,
            (1.0 - left_3) / _SPAN_3,
            (1.0 - left_3 * left_3) / _SPAN_6,
        ]
    )


_SPAN_1_5, _SPAN_3, _SPAN_6 = (float(-np.expm1(-k)) for k in (1.5, 3.0, 6.0))
