"""How many shells were launched between images: every period that the patterns of all images allow."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.shellvalues import Sided

FloatArray = NDArray[np.float64]

# Bursts of dust recur in years to decades.
SHORTEST_YR = 1.0
# Steps of the frequency in which a phase turns by so many of its errors over the whole span.
_STEP_SIGMA = 0.25
_MOST_STEPS = 200_000
_WIDE_SIGMA = 6.0
_LONGEST_SPANS = 1000.0


class LaunchCount(NamedTuple):
    """Launches from the first image to each, the period that goes with it, yr, and its probability."""

    launches: tuple[int, ...]
    period_yr: float
    probability: float


def launches_between(
    time_yr: ArrayLike,
    phase: ArrayLike,
    phase_sigma: ArrayLike,
    period_yr: Sided | None = None,
    shortest_yr: float = SHORTEST_YR,
) -> tuple[LaunchCount, ...]:
    """Count the shells launched between images from the patterns alone, or with a period from elsewhere.

    One image gives the age of a shell only up to whole periods: nested shells look alike after one period.

    Parameters
    ----------
    time_yr : array_like, shape (n,)
        Instants of the images, Julian years on any axis, ascending, n >= 2.
    phase, phase_sigma : array_like, shape (n,)
        Age of the first counted shell of each image in periods, and its error (dimensionless), > 0.
    period_yr : Sided, optional
        Period known from elsewhere, yr, with its errors; without it all are as probable, in their logarithm.
    shortest_yr : float
        Shortest period looked for without one, yr, > 0.

    Returns
    -------
    tuple of LaunchCount
        Most probable first; launches and probabilities are dimensionless, periods in yr.

    Raises
    ------
    InputRefused
        For fewer than two images, or an error that is unknown or zero.

    Notes
    -----
    The likelihood is that of the fractions of a period about their mean; counts that differ are told apart,
    periods of one count summed up. Images so near together that the pattern cannot have turned between them
    count no launch. Accuracy: the sum over frequencies is good to a per cent of a probability.

    Source: a shell's age grows by (t2 - t1)/P; Bayes' theorem with a flat prior in ln P.

    Examples
    --------
    >>> found = launches_between([2013.0, 2026.5, 2031.2], [0.189, 0.689, 0.211], [0.01] * 3)
    >>> found[0].launches, round(found[0].period_yr, 1)
    ((0, 1, 2), 9.0)
    >>> launches_between([2013.0, 2026.5], [0.189, 0.689], [0.01] * 2, Sided(9.2, 0.4, 0.4))[0].launches
    (0, 1)
    """
    time, turns, sigma = (
        np.atleast_1d(np.asarray(x, dtype=np.float64)) for x in (time_yr, phase, phase_sigma)
    )
    if time.size < 2 or not bool((sigma > 0.0).all()):
        raise InputRefused(
            "Launches between images cannot be counted.",
            why="It takes two images, and the errors of the ages of their shells.",
            hint="Give the radii of each image with their errors.",
            code="error-unknown",
        )
    away = time - time[0]
    frequency = _frequencies(float(away[-1]), float(sigma.min()), period_yr, shortest_yr)
    # Age at each image less what the frequency makes of the time passed: equal up to whole turns.
    rest = turns[None, :] - frequency[:, None] * away[None, :]
    whole = np.round(rest - rest[:, :1])
    left = rest - whole
    weight = sigma**-2.0
    mean = (left @ weight) / weight.sum()
    chi2 = ((left - mean[:, None]) ** 2) @ weight
    log_weight = -0.5 * chi2 + _log_prior(frequency, period_yr)
    share = np.exp(log_weight - log_weight.max())
    share /= share.sum()
    counts, member = np.unique(-whole.astype(np.int64), axis=0, return_inverse=True)
    member = member.ravel()
    total = np.bincount(member, weights=share)
    period = np.bincount(member, weights=share / frequency) / np.where(total > 0.0, total, 1.0)
    order = np.argsort(-total, kind="stable")
    return tuple(
        LaunchCount(tuple(int(n) for n in counts[i]), float(period[i]), float(total[i]))
        for i in order[:20]
        if total[i] > 1e-6
    )


def _frequencies(span_yr: float, sigma: float, period: Sided | None, shortest_yr: float) -> FloatArray:
    """Evenly spaced frequencies, 1/yr, fine enough that no phase turns by more than a part of its error."""
    step = _STEP_SIGMA * sigma / max(span_yr, 1e-6)
    if period is None:
        low, high = 1.0 / (_LONGEST_SPANS * max(span_yr, shortest_yr)), 1.0 / shortest_yr
    else:
        wide = _WIDE_SIGMA * max(period.sigma, 1e-6 * period.value)
        low = 1.0 / (period.value + wide)
        high = 1.0 / max(period.value - wide, min(shortest_yr, 0.5 * period.value))
        step = min(step, (high - low) / 200.0)
    count = int(np.clip((high - low) / step, 200, _MOST_STEPS))
    return np.linspace(low, high, count)


def _log_prior(frequency: FloatArray, period: Sided | None) -> FloatArray:
    """Density in frequency: flat in ln P, or normal in P."""
    if period is None:
        return -np.log(frequency)
    sigma = max(period.sigma, 1e-6 * period.value)
    log: FloatArray = -0.5 * ((1.0 / frequency - period.value) / sigma) ** 2 - 2.0 * np.log(frequency)
    return log
