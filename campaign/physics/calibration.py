"""Do outcomes fall where forecasts put them? Coverage and probability integral transforms of many of them."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]

Verdict = Literal["too few", "nothing against", "too narrow", "too wide", "too early", "too late"]

# With fewer independent outcomes no coverage is worth a verdict: at 10 a true 68 % still comes out between
# 40 % and 90 % in 95 of 100 cases.
LEAST_OUTCOMES = 10
# A good forecaster is called bad in at most one of a hundred looks for each fault.
_SIGNIFICANCE = 0.01


@dataclass(frozen=True, slots=True)
class Calibration:
    """What the transforms of independent outcomes say of a forecaster; all dimensionless.

    ``coverage68`` and ``coverage95`` are shares of outcomes inside the central intervals, each with the 95 %
    interval of the share that they allow. ``mean`` is 1/2 and ``variance`` 1/12 for a true forecaster.
    Everything but ``count`` is None where there are no outcomes, ``ks_*`` and ranges with too few.
    """

    count: int
    verdict: Verdict
    mean: float | None = None
    variance: float | None = None
    coverage68: float | None = None
    coverage68_lo: float | None = None
    coverage68_hi: float | None = None
    coverage95: float | None = None
    coverage95_lo: float | None = None
    coverage95_hi: float | None = None
    ks_d: float | None = None
    ks_p: float | None = None


def central_coverage(transforms: FloatArray, share: float) -> float:
    """Share of outcomes inside the central interval that was to hold ``share`` of them.

    Parameters
    ----------
    transforms : ndarray, shape (n,)
        Probability integral transforms, in [0, 1] (dimensionless).
    share : float
        Of the interval, in (0, 1).

    Returns
    -------
    float
        In [0, 1] (dimensionless).

    Notes
    -----
    Accuracy: exact. Source: equal-tailed intervals (DEVELOPERS.md, Intervals).

    Examples
    --------
    >>> central_coverage(np.array([0.05, 0.12, 0.31, 0.47, 0.58, 0.66, 0.83, 0.97]), 0.68)
    0.625
    """
    return float(np.mean(np.abs(transforms - 0.5) <= 0.5 * share))


def judge_transforms(transforms: FloatArray) -> Calibration:
    """Judge a forecaster by the transforms of independent outcomes.

    Parameters
    ----------
    transforms : ndarray, shape (n,)
        One probability integral transform for each outcome, in [0, 1] (dimensionless).

    Returns
    -------
    Calibration
        Shares (dimensionless); ``verdict`` is 'too few' below ``LEAST_OUTCOMES``, whatever the numbers.

    Raises
    ------
    InputRefused
        For a transform outside [0, 1].

    Notes
    -----
    A verdict needs evidence at one in a hundred: too narrow (wide) when fewer (more) outcomes fall into the
    68 % or the 95 % interval than chance allows; too early (late) when they come later (earlier) than the
    median on the whole.

    Accuracy: exact binomial probabilities; the mean is compared with a normal error of 1/sqrt(12 n).

    Source: Dawid 1984, J. R. Stat. Soc. A 147, 278; Gneiting, Balabdaoui & Raftery 2007, J. R. Stat. Soc. B
    69, 243; Clopper & Pearson 1934, Biometrika 26, 404; Kolmogorov-Smirnov test by scipy.

    Examples
    --------
    >>> judge_transforms((np.arange(50) + 0.5) / 50).verdict
    'nothing against'
    >>> judge_transforms(np.repeat([0.01, 0.99], 20)).verdict
    'too narrow'
    """
    values = np.asarray(transforms, dtype=float)
    if not np.all((values >= 0.0) & (values <= 1.0)):
        raise InputRefused(
            "A probability integral transform lies between 0 and 1.",
            why="It is the probability that the forecast gave to dates before the outcome.",
            hint="For example 0.31.",
            code="transform-refused",
        )
    count = values.size
    if not count:
        return Calibration(0, "too few")
    coverage68, coverage95 = central_coverage(values, 0.68), central_coverage(values, 0.95)
    mean, variance = float(values.mean()), float(values.var())
    if count < LEAST_OUTCOMES:
        return Calibration(count, "too few", mean, variance, coverage68=coverage68, coverage95=coverage95)
    from scipy.stats import kstest

    test = kstest(values, "uniform")
    return Calibration(
        count,
        _verdict(values),
        mean,
        variance,
        coverage68,
        *_allowed(round(coverage68 * count), count),
        coverage95,
        *_allowed(round(coverage95 * count), count),
        float(test.statistic),
        float(test.pvalue),
    )


def _verdict(values: FloatArray) -> Verdict:
    from scipy.special import bdtr, bdtrc

    count = values.size
    for share in (0.68, 0.95):
        inside = round(central_coverage(values, share) * count)
        # Two intervals are looked at for each fault.
        if float(bdtr(inside, count, share)) < 0.5 * _SIGNIFICANCE:
            return "too narrow"
        if inside and float(bdtrc(inside - 1, count, share)) < 0.5 * _SIGNIFICANCE:
            return "too wide"
    late = (float(values.mean()) - 0.5) * math.sqrt(12.0 * count)
    if abs(late) > 2.5758:
        return "too early" if late > 0.0 else "too late"
    return "nothing against"


def _allowed(inside: int, count: int) -> tuple[float, float]:
    """The 95 % interval of a share of which ``inside`` of ``count`` were seen."""
    from scipy.special import betaincinv

    low = float(betaincinv(inside, count - inside + 1, 0.025)) if inside else 0.0
    high = float(betaincinv(inside + 1, count - inside, 0.975)) if inside < count else 1.0
    return low, high
