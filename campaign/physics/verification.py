"""Scores of a forecast against what happened: proper scores, the probability integral transform, skill."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]


def crps_normal(
    mean: FloatArray | float, sigma: FloatArray | float, observed: FloatArray | float
) -> FloatArray:
    """Continuous ranked probability score of normal forecasts.

    Parameters
    ----------
    mean, sigma : float or ndarray
        Of the forecast, any unit; ``sigma`` >= 0 (at 0 the score is the absolute error).
    observed : float or ndarray
        What happened, same unit.

    Returns
    -------
    ndarray
        Score in the unit of ``sigma``; smaller is better.

    Notes
    -----
    Accuracy: a few units in the last place of the largest of its terms.

    Source: Gneiting, Raftery, Westveld & Goldman 2005, Mon. Weather Rev. 133, 1098, eq. 5.

    Examples
    --------
    >>> round(float(crps_normal(0.0, 1.0, 0.0)), 10)
    0.2336949773
    """
    from scipy.special import ndtr

    miss, size = np.asarray(observed, dtype=float) - mean, np.asarray(sigma, dtype=float)
    with np.errstate(divide="ignore", invalid="ignore"):
        z = miss / size
        score = size * (z * (2.0 * ndtr(z) - 1.0) + 2.0 * _density(z) - 1.0 / math.sqrt(math.pi))
    return np.where(size > 0.0, score, np.abs(miss))


def log_score_normal(
    mean: FloatArray | float, sigma: FloatArray | float, observed: FloatArray | float
) -> FloatArray:
    """Minus the natural logarithm of the density of a normal forecast at what happened.

    Parameters
    ----------
    mean, sigma : float or ndarray
        Of the forecast, any unit; ``sigma`` > 0.
    observed : float or ndarray
        What happened, same unit.

    Returns
    -------
    ndarray
        Score, ln of the unit; smaller is better.

    Notes
    -----
    Accuracy: a few units in the last place.

    Source: Good 1952, J. R. Stat. Soc. B 14, 107; Gneiting & Raftery 2007, JASA 102, 359.

    Examples
    --------
    >>> round(float(log_score_normal(0.0, 1.0, 1.0)), 6)
    1.418939
    """
    z = (np.asarray(observed, dtype=float) - mean) / sigma
    return np.asarray(0.5 * z**2 + np.log(sigma) + 0.5 * math.log(2.0 * math.pi))


def log_score_between(share_before_first: float, share_before_last: float) -> float:
    """Log score of an event of which only two dates are known between which it happened.

    Parameters
    ----------
    share_before_first, share_before_last : float
        Forecast probability that the event happens before the one and the other date, in [0, 1]
        (dimensionless).

    Returns
    -------
    float
        -ln of their difference (dimensionless); infinite where the forecast excludes what happened.

    Notes
    -----
    Accuracy: that of the difference of the two shares.

    Source: likelihood of an interval-censored date (Turnbull 1976, J. R. Stat. Soc. B 38, 290).

    Examples
    --------
    >>> round(log_score_between(0.25, 0.75), 6)
    0.693147
    """
    share = share_before_last - share_before_first
    return -math.log(share) if share > 0.0 else math.inf


def crps_ensemble(members: FloatArray, observed: float, weights: FloatArray | None = None) -> float:
    """Continuous ranked probability score of a forecast given as weighted values.

    Parameters
    ----------
    members : ndarray, shape (m,)
        Values, any unit and order.
    observed : float
        What happened, same unit.
    weights : ndarray, shape (m,), optional
        Their weights (dimensionless, >= 0); equal when not given.

    Returns
    -------
    float
        sum w |x - y| - 1/2 sum sum w w |x - x'|, in the unit of the members.

    Raises
    ------
    InputRefused
        Without members, or when the weights do not fit them.

    Notes
    -----
    Accuracy: exact for the stepped distribution; as a stand-in for a smooth one the score of its 101
    quantiles at evenly spaced shares is good to 1e-3 of the spread.

    Source: Gneiting & Raftery 2007, JASA 102, 359, eq. 21.

    Examples
    --------
    >>> crps_ensemble(np.array([1.0, 2.0, 4.0, 7.0]), 3.0)
    0.75
    """
    share = np.ones(members.size) if weights is None else np.asarray(weights, dtype=float)
    if not members.size or share.shape != members.shape or (share < 0.0).any() or not share.sum() > 0.0:
        raise InputRefused(
            "There is no forecast in these values.",
            why="Each value has one weight, none is negative, and they do not all vanish.",
            hint="Give at least one value, with as many weights as values or none at all.",
            code="ensemble-refused",
        )
    order = np.argsort(members, kind="stable")
    x, w = np.asarray(members, dtype=float)[order], share[order] / share.sum()
    # Counted from what happened, so that dates of 60,000 d do not cancel.
    x = x - observed
    before = np.cumsum(w) - 0.5 * w
    return float(w @ np.abs(x) - w @ (x * (2.0 * before - 1.0)))


def crps_ensemble_fair(members: FloatArray, observed: float) -> float:
    """The same for few equally likely draws: as if there were infinitely many of them.

    Parameters
    ----------
    members : ndarray, shape (m,)
        Draws, any unit; at least two.
    observed : float
        What happened, same unit.

    Returns
    -------
    float
        mean |x - y| - sum sum |x - x'| / (2 m (m - 1)), in the unit of the draws.

    Raises
    ------
    InputRefused
        For fewer than two draws.

    Notes
    -----
    Accuracy: unbiased for the distribution that was drawn from.

    Source: Ferro 2014, Q. J. R. Meteorol. Soc. 140, 1917.

    Examples
    --------
    >>> round(crps_ensemble_fair(np.array([1.0, 2.0, 4.0, 7.0]), 3.0), 6)
    0.333333
    """
    count = members.size
    if count < 2:
        raise InputRefused(
            "One draw has no spread.",
            why="The fair score divides by the number of pairs of draws.",
            hint="Give at least two draws.",
            code="ensemble-refused",
        )
    miss = float(np.abs(members - observed).mean())
    return miss - (miss - crps_ensemble(members, observed)) * count / (count - 1)


@dataclass(frozen=True, slots=True)
class TruncatedNormal:
    """A normal distribution of what is later than ``lower``; same unit throughout.

    ``survival`` is the probability (dimensionless) that the whole one gave to that.
    """

    location: float
    scale: float
    lower: float
    survival: float
    mean: float
    sigma: float

    def quantiles(self, shares: FloatArray) -> FloatArray:
        """Values below which ``shares`` of the probability lie."""
        from scipy.special import ndtri

        # From the upper tail, which does not round to 1 far out.
        return np.asarray(self.location - self.scale * ndtri(self.survival * (1.0 - shares)))


def truncated_normal(mean: float, sigma: float, lower: float) -> TruncatedNormal:
    """What is left of a normal forecast once nothing has happened until ``lower``.

    Parameters
    ----------
    mean, sigma : float
        Of the forecast before, any unit; ``sigma`` > 0.
    lower : float
        Until when it is certain that nothing happened, same unit.

    Returns
    -------
    TruncatedNormal
        Renormalised; its mean and standard deviation in that unit.

    Notes
    -----
    Accuracy: 1e-9 of ``sigma`` while ``lower`` is within 8 sigma of the mean.

    Source: Johnson, Kotz & Balakrishnan 1994, Continuous Univariate Distributions 1, sect. 13.10.1.

    Examples
    --------
    >>> left = truncated_normal(0.0, 1.0, 0.0)
    >>> left.survival, round(left.mean, 6), round(left.sigma, 6)
    (0.5, 0.797885, 0.60281)
    """
    from scipy.special import log_ndtr, ndtr

    a = (lower - mean) / sigma
    hazard = math.exp(-0.5 * a * a - 0.5 * math.log(2.0 * math.pi) - float(log_ndtr(-a)))
    variance = 1.0 + a * hazard - hazard * hazard
    return TruncatedNormal(
        mean, sigma, lower, float(ndtr(-a)), mean + sigma * hazard, sigma * math.sqrt(max(variance, 0.0))
    )


def crps_truncated_normal(mean: float, sigma: float, lower: float, observed: float) -> float:
    """Continuous ranked probability score of a normal forecast cut off below.

    Parameters
    ----------
    mean, sigma : float
        Of the whole normal distribution, any unit; ``sigma`` > 0.
    lower : float
        Where it is cut off, same unit.
    observed : float
        What happened, same unit; at or after ``lower``.

    Returns
    -------
    float
        Score in the unit of ``sigma``.

    Notes
    -----
    Accuracy: 1e-9 of ``sigma`` while at least 1e-4 of the probability is left.

    Source: Thorarinsdottir & Gneiting 2010, J. R. Stat. Soc. A 173, 371, eq. 5.

    Examples
    --------
    >>> round(crps_truncated_normal(0.0, 1.0, 0.5, 1.2), 9)
    0.142753017
    """
    from scipy.special import ndtr

    a, z = (lower - mean) / sigma, (observed - mean) / sigma
    p = float(ndtr(-a))
    inner = z * p * (2.0 * float(ndtr(z)) + p - 2.0) + 2.0 * float(_density(np.asarray(z))) * p
    return sigma / p**2 * (inner - float(ndtr(-math.sqrt(2.0) * a)) / math.sqrt(math.pi))


def interval_score(lower: float, upper: float, observed: float, alpha: float) -> float:
    """Score of a central interval that was to hold what happens in 1 - ``alpha`` of all cases.

    Parameters
    ----------
    lower, upper : float
        Its ends, any unit.
    observed : float
        What happened, same unit.
    alpha : float
        In (0, 1) (dimensionless).

    Returns
    -------
    float
        Its width and, outside, 2/alpha times the distance to it; in the unit of the ends.

    Notes
    -----
    Accuracy: exact.

    Source: Winkler 1972, JASA 67, 187; Gneiting & Raftery 2007, JASA 102, 359, eq. 43.

    Examples
    --------
    >>> interval_score(10.0, 20.0, 22.0, 0.1)
    50.0
    """
    outside = max(lower - observed, 0.0) + max(observed - upper, 0.0)
    return upper - lower + 2.0 / alpha * outside


def pinball_loss(quantile: float, observed: float, share: float) -> float:
    """Score of one quantile of a forecast.

    Parameters
    ----------
    quantile, observed : float
        The quantile and what happened, any unit.
    share : float
        What share of the cases was to be below it, in (0, 1) (dimensionless).

    Returns
    -------
    float
        share (y - q) above and (1 - share) (q - y) below it, in that unit.

    Notes
    -----
    Accuracy: exact.

    Source: Koenker & Bassett 1978, Econometrica 46, 33.

    Examples
    --------
    >>> round(pinball_loss(5.0, 7.0, 0.9), 9)
    1.8
    """
    miss = observed - quantile
    return share * miss if miss >= 0.0 else (share - 1.0) * miss


def skill_score(score: float, reference: float) -> float:
    """How much better a forecast is than a simple one: 1 perfect, 0 no better, negative worse.

    Parameters
    ----------
    score, reference : float
        Mean scores of both for the same cases, same unit, 0 being perfect.

    Returns
    -------
    float
        1 - score / reference (dimensionless); NaN where the reference is perfect.

    Notes
    -----
    Accuracy: exact.

    Source: Murphy 1988, Mon. Weather Rev. 116, 2417; Gneiting & Raftery 2007.

    Examples
    --------
    >>> round(skill_score(0.2, 0.35), 6)
    0.428571
    """
    return 1.0 - score / reference if reference > 0.0 else math.nan


def _density(z: FloatArray) -> FloatArray:
    return np.asarray(np.exp(-0.5 * z**2) / math.sqrt(2.0 * math.pi))
