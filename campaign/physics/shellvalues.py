"""Values with errors as dating shells passes them on: two-sided errors, quantiles, ratios of normals."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.physics.draws import stratified_normals, two_piece_within
from campaign.physics.intervals import NORMAL_QUANTILES, PROBABILITIES, row_quantiles

FloatArray = NDArray[np.float64]


class Sided(NamedTuple):
    """A value with the sizes of its errors below and above, one unit for all; None is unknown, 0 exact."""

    value: float
    minus: float | None = None
    plus: float | None = None

    @property
    def known(self) -> bool:
        return self.minus is not None and self.plus is not None

    @property
    def sigma(self) -> float:
        """Standard deviation of the two-piece normal whose median is the value; NaN when unknown."""
        if self.minus is None or self.plus is None:
            return float("nan")
        mean_square = 0.5 * (self.minus**2 + self.plus**2)
        return float(np.sqrt(mean_square - (self.plus - self.minus) ** 2 / (2.0 * np.pi)))


class Spread(NamedTuple):
    """One value with its standard deviation and equal-tailed 68 % and 95 % bounds; NaN is unknown."""

    value: float
    sigma: float
    lo68: float
    hi68: float
    lo95: float
    hi95: float


class Spreads(NamedTuple):
    """Several values with their standard deviations and bounds: arrays of one length; NaN is unknown."""

    value: FloatArray
    sigma: FloatArray
    lo68: FloatArray
    hi68: FloatArray
    lo95: FloatArray
    hi95: FloatArray

    def at(self, position: int) -> Spread:
        """The entry at one position."""
        return Spread(*(float(column[position]) for column in self))


class Uncertain(NamedTuple):
    """A value with its first-order standard deviation and draws of its distribution, shape (draws,)."""

    value: float
    sigma: float
    draws: FloatArray


def sided_spread(sided: Sided, positive: bool = True) -> Spread:
    """Quantiles of a stated value, a two-piece normal with the value as its median.

    Parameters
    ----------
    sided : Sided
        Value and errors, any unit.
    positive : bool
        Whether the quantity is above zero by nature; the part of the distribution below is then left out.

    Returns
    -------
    Spread
        In the unit of ``sided``; NaN but for the value where an error is unknown.

    Notes
    -----
    Accuracy: exact.

    Source: DEVELOPERS.md, The rules of the forecast (asymmetric errors).

    Examples
    --------
    >>> sided_spread(Sided(2.0, 0.1, 0.2)).hi68.__round__(4)
    2.1989
    """
    if sided.minus is None or sided.plus is None:
        return Spread(sided.value, *([float("nan")] * 5))
    bounds = two_piece_within(
        np.array([[sided.value]]),
        np.array([[sided.minus]]),
        np.array([[sided.plus]]),
        NORMAL_QUANTILES[None, 1:],
        low=0.0 if positive else -np.inf,
    )[0]
    return Spread(sided.value, sided.sigma, *(float(bound) for bound in bounds))


def draw_sided(name: str, sided: Sided, draws: int = 20_000, seed: int = 1) -> Uncertain:
    """Draws of a positive quantity with two-sided errors.

    Parameters
    ----------
    name : str
        Name of the quantity; its stream of random numbers depends on it and the seed alone.
    sided : Sided
        Value > 0 and errors, any unit; an unknown error gives draws of NaN.
    draws, seed : int
        Number of draws and seed (dimensionless).

    Returns
    -------
    Uncertain
        In the unit of ``sided``, all draws above zero.

    Notes
    -----
    Accuracy: quantiles to about 1 % of sigma at 20,000 draws.

    Source: inverse-transform sampling of a truncated two-piece normal (Devroye 1986, ch. II).

    Examples
    --------
    >>> period = draw_sided("period", Sided(20.0, 1.0, 1.0), 2000)
    >>> bool(abs(np.median(period.draws) - 20.0) < 0.01)
    True
    """
    if sided.minus is None or sided.plus is None:
        return Uncertain(sided.value, float("nan"), np.full(draws, np.nan))
    drawn = two_piece_within(
        np.array([[sided.value]]),
        np.array([[sided.minus]]),
        np.array([[sided.plus]]),
        stratified_normals([name], draws, seed)[name][None, :],
        low=np.finfo(np.float64).tiny,
    )[0]
    return Uncertain(sided.value, sided.sigma, drawn)


def spreads_of_draws(value: FloatArray, sigma: FloatArray, draws: FloatArray) -> Spreads:
    """Equal-tailed bounds of drawn distributions, beside a value and its standard deviation found otherwise.

    Parameters
    ----------
    value, sigma : ndarray, shape (rows,)
        In the unit of the draws.
    draws : ndarray, shape (rows, n)
        Any unit; a row with NaN has no bounds.

    Returns
    -------
    Spreads
        In the unit of the draws.

    Notes
    -----
    Accuracy: that of n draws, about 1 % of sigma at 20,000 stratified ones.

    Source: Hyndman & Fan 1996, American Statistician 50, 361 (definition 5).

    Examples
    --------
    >>> rows = np.arange(100.0)[None, :]
    >>> round(float(spreads_of_draws(np.array([49.5]), np.array([28.9]), rows).hi68[0]), 6)
    83.5
    """
    known = ~np.isnan(draws).any(axis=1)
    counts = np.where(known, draws.shape[1], 0).astype(np.int64)
    bounds = row_quantiles(np.sort(draws, axis=1), counts, PROBABILITIES[1:])
    bounds[~known] = np.nan
    return Spreads(value, sigma, *bounds.T)


def ratio_of_normals(
    top: ArrayLike, bottom: ArrayLike, var_top: ArrayLike, covariance: ArrayLike, var_bottom: ArrayLike
) -> Spreads:
    """Quantiles of the ratio of two correlated normal quantities, exactly.

    Parameters
    ----------
    top, bottom : array_like, shape (rows,)
        Means, any unit each (say arcsec and arcsec/yr); ``bottom`` not 0.
    var_top, covariance, var_bottom : array_like, shape (rows,)
        Their variances and covariance, in those units squared.

    Returns
    -------
    Spreads
        Ratio, in the unit of ``top`` a unit of ``bottom``; ``sigma`` is of first order. A bound that the
        data leave open, because ``bottom`` may be zero at that confidence, is NaN.

    Notes
    -----
    Accuracy: the bounds are exact, rounding apart: they hold the truth as often as they say, where
    first-order errors do so only while ``bottom`` is known well.

    Source: Fieller 1954, J. R. Statist. Soc. B 16, 175.

    Examples
    --------
    >>> age = ratio_of_normals([1.45], [0.0612], [0.03**2], [0.0], [0.0021**2])
    >>> round(float(age.value[0]), 4), round(float(age.sigma[0]), 4)
    (23.6928, 0.9493)
    """
    a, m, caa, cam, cmm = np.broadcast_arrays(
        *(
            np.atleast_1d(np.asarray(x, dtype=np.float64))
            for x in (top, bottom, var_top, covariance, var_bottom)
        )
    )
    ratio = a / m
    sigma = np.sqrt(np.maximum(caa - 2.0 * ratio * cam + ratio**2 * cmm, 0.0)) / np.abs(m)
    z = NORMAL_QUANTILES[1:, None]
    # Root of (q m - a)^2 = z^2 var(q m - a) on the side that z asks for.
    square = m**2 - z**2 * cmm
    middle = a * m - z**2 * cam
    root = np.sqrt(np.maximum(middle**2 - square * (a**2 - z**2 * caa), 0.0))
    with np.errstate(divide="ignore", invalid="ignore"):
        bounds = np.where(square > 0.0, (middle + np.sign(z) * root) / square, np.nan)
    return Spreads(ratio, sigma, *bounds)
