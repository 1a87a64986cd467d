"""A drawn date, reweighted by what the observations allow; with a wider component where they push it far.

Quoted errors of periods are often too small. A date that observations have pushed beyond three sigma of its
own error is no longer told by the tail of a normal distribution, but by the component that is wider.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# A forecast is believed but for one part in a hundred, in which its errors are three times as large: at three
# sigma both leave the same chance (0.00135 and 0.01 times 0.159). Common practice, no source.
INFLATED_SHARE = 0.01
INFLATED_FACTOR = 3.0


@dataclass(frozen=True, slots=True, eq=False)
class ConditionedDraws:
    """Draws of a date with weights that sum to 1; NaN where the event does not happen.

    First come the draws as they were, then the same stretched about their median. ``evidence`` is the chance
    of the observations over their chance without any event, ``inflated_share`` the part of the weight that
    stretched draws have, ``effective`` how many equally weighted draws would be as good.
    """

    dates_d: FloatArray
    weights: FloatArray
    evidence: float
    inflated_share: float
    effective: float


def condition_draws(
    dates_d: FloatArray,
    log_likelihood: Callable[[FloatArray], FloatArray],
    inflated_share: float = INFLATED_SHARE,
    inflated_factor: float = INFLATED_FACTOR,
) -> ConditionedDraws:
    """Reweight draws of a date by a likelihood.

    Parameters
    ----------
    dates_d : ndarray, shape (n,)
        Draws, days; NaN where the event does not happen.
    log_likelihood : callable
        ln of the chance of the observations, were this the date, over that without any event: array of days
        in, array out (dimensionless).
    inflated_share, inflated_factor : float
        Weight before the observations of the component that is wider, and by how much (dimensionless).

    Returns
    -------
    ConditionedDraws
        2n draws, days; their weights (dimensionless).

    Notes
    -----
    Accuracy: that of ``effective`` draws.

    Source: Bayes' theorem by importance weights (Robert & Casella 2004, Monte Carlo Statistical Methods,
    section 3.3).

    Examples
    --------
    >>> from scipy.special import ndtri
    >>> draws = ndtri((np.arange(20_000) + 0.5) / 20_000)
    >>> found = condition_draws(draws, lambda t: np.where(t < 0.0, -np.inf, 0.0), inflated_share=0.0)
    >>> bool(abs(found.weights @ found.dates_d - 0.797885) < 1e-3), round(found.evidence, 3)
    (True, 0.5)
    """
    happens = ~np.isnan(dates_d)
    middle = float(np.median(dates_d[happens])) if happens.any() else 0.0
    both = np.concatenate([dates_d, middle + inflated_factor * (dates_d - middle)])
    prior = np.repeat([1.0 - inflated_share, inflated_share], dates_d.size) / dates_d.size
    chance = np.ones(both.size)
    there = ~np.isnan(both)
    chance[there] = np.exp(np.minimum(log_likelihood(both[there]), 50.0))
    weights = prior * chance
    evidence = float(weights.sum())
    if evidence <= 0.0:
        return ConditionedDraws(both, prior, 0.0, inflated_share, 0.0)
    weights /= evidence
    return ConditionedDraws(
        both, weights, evidence, float(weights[dates_d.size :].sum()), float(1.0 / (weights @ weights))
    )


def weighted_quantiles(values: FloatArray, weights: FloatArray, shares: FloatArray) -> FloatArray:
    """Quantiles of weighted draws.

    Parameters
    ----------
    values : ndarray, shape (n,)
        Draws, any unit, none NaN.
    weights : ndarray, shape (n,)
        Their weights (dimensionless); need not sum to 1.
    shares : ndarray
        Probabilities (dimensionless).

    Returns
    -------
    ndarray
        In the unit of the draws.

    Notes
    -----
    Accuracy: half of each draw's weight lies on either side of it, linear between draws.

    Source: Hyndman & Fan 1996, American Statistician 50, 361 (definition 5), with weights.

    Examples
    --------
    >>> weighted_quantiles(np.array([1.0, 2.0, 3.0]), np.array([1.0, 1.0, 1.0]), np.array([0.5])).tolist()
    [2.0]
    """
    order = np.argsort(values, kind="stable")
    ordered, own = values[order], weights[order]
    cumulated = np.cumsum(own)
    found: FloatArray = np.interp(shares * cumulated[-1], cumulated - 0.5 * own, ordered)
    return found
