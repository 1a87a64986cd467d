"""A level that bends into a line at one date: the broken line in whatever the values are in."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]

_PLACES_A_STEP = 24


@dataclass(frozen=True, slots=True)
class HingeFit:
    """Where a level bends: date, the ends of one sigma (chi-square higher by one), level and slope.

    ``low`` or ``high`` is None where the profile does not rise by one within the data.
    """

    bend: float
    low: float | None
    high: float | None
    level: float
    slope_per_d: float
    chi2: float
    dof: int


def fit_hinge(bmjd_tdb: ArrayLike, value: ArrayLike, sigma: ArrayLike) -> HingeFit:
    """Fit value = a before the bend, a + b (t - bend) after it.

    Parameters
    ----------
    bmjd_tdb : array_like, shape (n,)
        Times in days, any order.
    value, sigma : array_like, shape (n,)
        Values and one-sigma errors, in mag or any other unit.

    Returns
    -------
    HingeFit
        Days, and the unit of the values.

    Raises
    ------
    InputRefused
        With fewer than four points or three dates, or an error that is not positive.

    Notes
    -----
    Accuracy: the bend is a minimum of the profile to 1e-6 of the interval between points; the profile is
    searched at 24 places between neighbours. One straight line in magnitudes stands for one shape of the
    rise; ``campaign.physics.onsetfit`` counts the others too.

    Source: segmented regression by profile (Hudson 1966, JASA 61, 1097); interval by chi-square higher by one
    (Cash 1976, A&A 52, 307).

    Examples
    --------
    >>> t = np.arange(10.0)
    >>> fit = fit_hinge(t, np.where(t < 4.5, 6.0, 6.0 - 0.1 * (t - 4.5)), np.full(10, 0.01))
    >>> round(fit.bend, 4), round(fit.slope_per_d, 4)
    (4.5, -0.1)
    """
    t, y, s = (np.asarray(column, dtype=np.float64) for column in (bmjd_tdb, value, sigma))
    dates = np.unique(t)
    if t.size < 4 or dates.size < 3 or not bool((s > 0.0).all()):
        raise InputRefused(
            f"{t.size} points of {dates.size} dates cannot date a bend.",
            why="A level, a slope and a date need four points with positive errors, of three dates at least.",
            hint="Give more points around the rise.",
            code="too-few-points",
            details={"points": int(t.size), "dates": int(dates.size)},
        )
    weight = s**-2.0
    step = np.arange(_PLACES_A_STEP) / _PLACES_A_STEP
    # A bend beyond the last date but one leaves nothing of the slope.
    places = np.concatenate([a + (b - a) * step for a, b in pairwise(dates)])
    profile = _chi2(t, y, weight, places)[0]
    best = int(np.argmin(profile))
    bend = _refined(t, y, weight, places[max(best - 1, 0)], places[min(best + 1, places.size - 1)])
    chi2, level, slope = (float(part[0]) for part in _chi2(t, y, weight, np.array([bend])))
    return HingeFit(
        bend,
        _crossing(t, y, weight, places[places < bend][::-1], bend, chi2 + 1.0),
        _crossing(t, y, weight, places[places > bend], bend, chi2 + 1.0),
        level,
        slope,
        chi2,
        int(t.size) - 3,
    )


def _chi2(
    t: FloatArray, y: FloatArray, weight: FloatArray, bends: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Chi-square, level and slope at their best for each bend."""
    rise = np.clip(t[None, :] - bends[:, None], 0.0, None)
    one, line, square = weight.sum(), rise @ weight, (rise * rise) @ weight
    value, product = float(weight @ y), rise @ (weight * y)
    determinant = np.maximum(one * square - line**2, 1e-300)
    level = (square * value - line * product) / determinant
    slope = (one * product - line * value) / determinant
    residual = y[None, :] - level[:, None] - slope[:, None] * rise
    return (residual**2) @ weight, level, slope


def _refined(t: FloatArray, y: FloatArray, weight: FloatArray, low: float, high: float) -> float:
    from scipy.optimize import minimize_scalar

    found = minimize_scalar(
        lambda bend: float(_chi2(t, y, weight, np.array([bend]))[0][0]),
        bounds=(low, high),
        method="bounded",
        options={"xatol": 1e-7 * max(high - low, 1e-9)},
    )
    return float(found.x)


def _crossing(
    t: FloatArray, y: FloatArray, weight: FloatArray, outward: FloatArray, bend: float, level: float
) -> float | None:
    """Where the profile first rises to a level on the way outward."""
    from scipy.optimize import brentq

    above = np.flatnonzero(_chi2(t, y, weight, outward)[0] >= level) if outward.size else outward
    if not above.size:
        return None
    first = int(above[0])
    inner = bend if first == 0 else float(outward[first - 1])
    return float(
        brentq(
            lambda at: float(_chi2(t, y, weight, np.array([at]))[0][0]) - level, inner, float(outward[first])
        )
    )
