"""Scores of dated forecasts that are known by their quantiles, against dates that are not exact either."""

from __future__ import annotations

import math
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.physics.verification import crps_ensemble, log_score_between

FloatArray = NDArray[np.float64]

# Equally likely values that stand for the error of an observed date.
_NODES = 41
# Points of the outer parts over which the slope of the tails is taken.
_TAIL = 4


@dataclass(frozen=True, slots=True)
class QuantileDistribution:
    """A distribution by its quantiles at rising shares; values in days.

    Between them, and beyond the outermost, it is read in normal scores, so that a normal distribution is one
    all through and no tail ends.
    """

    quantiles_d: FloatArray
    shares: FloatArray
    _knots: list[FloatArray] = field(default_factory=list, repr=False, compare=False)

    def __post_init__(self) -> None:
        values, shares = self.quantiles_d, self.shares
        rising = bool(np.all(np.diff(values) >= 0.0) and np.all(np.diff(shares) > 0.0))
        inside = bool(values.size and shares[0] > 0.0 and shares[-1] < 1.0)
        if values.shape != shares.shape or not (rising and inside and np.all(np.isfinite(values))):
            raise InputRefused(
                "These are not the quantiles of a distribution.",
                why="Values and shares rise together, and shares lie between 0 and 1.",
                hint="Give the quantiles in rising order, for example at shares 0.1, 0.5 and 0.9.",
                code="quantiles-refused",
            )

    @property
    def is_point(self) -> bool:
        """Whether all its probability lies at one date."""
        return bool(self.quantiles_d[-1] - self.quantiles_d[0] <= 0.0)

    def share_before(self, dates_d: FloatArray | float) -> FloatArray:
        """Probability that it is before each date."""
        from scipy.special import ndtr

        dates = np.asarray(dates_d, dtype=float)
        if self.is_point:
            return np.where(dates < self.quantiles_d[0], 0.0, 1.0)
        return np.asarray(ndtr(self._score(dates)[0]))

    def density(self, dates_d: FloatArray | float) -> FloatArray:
        """Probability a day at each date; NaN for a point."""
        dates = np.asarray(dates_d, dtype=float)
        if self.is_point:
            return np.full(dates.shape, np.nan)
        score, slope = self._score(dates)
        return np.asarray(np.exp(-0.5 * score**2) / math.sqrt(2.0 * math.pi) * slope)

    def _score(self, dates: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Normal score of each date, and its slope a day."""
        if not self._knots:
            self._knots.extend(self._table())
        x, z, slopes = self._knots
        place = np.searchsorted(x, dates, side="right")
        anchor = np.clip(place - 1, 0, x.size - 1)
        slope = slopes[place]
        return z[anchor] + slope * (dates - x[anchor]), slope

    def _table(self) -> tuple[FloatArray, FloatArray, FloatArray]:
        from scipy.special import ndtri

        # Equal quantiles are a step: the last of them counts.
        last = np.append(np.diff(self.quantiles_d) > 0.0, True)
        first = np.append(True, np.diff(self.quantiles_d) > 0.0)
        x = self.quantiles_d[last]
        z = ndtri(0.5 * (self.shares[first] + self.shares[last]))
        reach = min(_TAIL, x.size - 1)
        early = (z[reach] - z[0]) / (x[reach] - x[0])
        late = (z[-1] - z[-1 - reach]) / (x[-1] - x[-1 - reach])
        return x, z, np.concatenate([[early], np.diff(z) / np.diff(x), [late]])


@dataclass(frozen=True, slots=True)
class DatedScores:
    """Scores of one forecast: days, ln of days (dimensionless where only a span is known), a share."""

    crps_d: float
    log_score: float | None
    pit: float


def score_date(
    forecast: QuantileDistribution, observed_d: float, minus_d: float = 0.0, plus_d: float = 0.0
) -> DatedScores:
    """Scores against an observed date with its errors.

    Parameters
    ----------
    forecast : QuantileDistribution
        Days.
    observed_d : float
        The date on the same axis, days.
    minus_d, plus_d : float
        One-sigma errors of the date to either side, days, >= 0.

    Returns
    -------
    DatedScores
        Days; ``log_score`` is None where an exact date is held against a forecast without any width.

    Notes
    -----
    What is observed is the date and its error: the error is added to the forecast, so that a good forecast
    of a badly dated event is not called wrong.

    Accuracy: CRPS 1e-3 of the spread, from 101 quantiles; shares 1e-3.

    Source: Gneiting & Raftery 2007, JASA 102, 359; errors of observations in the forecast: Anderson 1996, J.
    Climate 9, 1518.

    Examples
    --------
    >>> from scipy.special import ndtri
    >>> shares = (np.arange(101) + 0.5) / 101
    >>> scores = score_date(QuantileDistribution(100.0 + 20.0 * ndtri(shares), shares), 155.0)
    >>> round(scores.crps_d, 1), round(scores.pit, 4)
    (43.8, 0.997)
    """
    if minus_d <= 0.0 and plus_d <= 0.0:
        dates = np.array([observed_d])
    else:
        from scipy.special import ndtri

        z = ndtri((np.arange(_NODES) + 0.5) / _NODES)
        dates = observed_d + np.where(z < 0.0, minus_d, plus_d) * z
    members = (forecast.quantiles_d[:, None] + (observed_d - dates)[None, :]).ravel()
    if not forecast.is_point:
        density = float(forecast.density(dates).mean())
        log_score: float | None = -math.log(density) if density > 0.0 else math.inf
    elif dates.size > 1:
        log_score = _log_score_of_error(forecast.quantiles_d[0], observed_d, minus_d, plus_d)
    else:
        log_score = None
    return DatedScores(
        crps_ensemble(members, observed_d), log_score, float(forecast.share_before(dates).mean())
    )


def _log_score_of_error(date_d: float, observed_d: float, minus_d: float, plus_d: float) -> float:
    """-ln of the density of a two-piece error, each half with its own width."""
    size = minus_d if date_d < observed_d else plus_d
    if size <= 0.0:
        return math.inf
    return 0.5 * ((date_d - observed_d) / size) ** 2 + math.log(size * math.sqrt(2.0 * math.pi))


def score_span(forecast: QuantileDistribution, first_d: float, last_d: float, place: float) -> DatedScores:
    """Scores against an event of which only a span is known in which it happened.

    Parameters
    ----------
    forecast : QuantileDistribution
        Days.
    first_d, last_d : float
        The span on the same axis, days.
    place : float
        A random number in [0, 1] that places the transform between those of the two ends (dimensionless).

    Returns
    -------
    DatedScores
        Days; ``crps_d`` counts only what the forecast puts outside the span, since inside nobody knows.

    Raises
    ------
    InputRefused
        If the span ends before it begins.

    Notes
    -----
    Accuracy: CRPS 1e-3 of the spread.

    Source: threshold-weighted score of Gneiting & Ranjan 2011, J. Bus. Econ. Stat. 29, 411, with weight zero
    in the span; randomised transform of Czado, Gneiting & Held 2009, Biometrics 65, 1254.

    Examples
    --------
    >>> from scipy.special import ndtri
    >>> shares = (np.arange(101) + 0.5) / 101
    >>> scores = score_span(QuantileDistribution(100.0 + 20.0 * ndtri(shares), shares), 110.0, 140.0, 0.5)
    >>> round(scores.log_score, 6)
    1.252507
    """
    if last_d < first_d:
        raise InputRefused(
            "The span ends before it begins.",
            why=f"{last_d:g} is before {first_d:g}.",
            hint="Give its first and last date in this order.",
            code="span-refused",
        )
    if last_d == first_d:
        return score_date(forecast, first_d)
    before, after = (float(share) for share in forecast.share_before(np.array([first_d, last_d])))
    # Dates inside the span are as good as any there: all of them are put where nothing is counted.
    members = np.where(
        forecast.quantiles_d < first_d,
        forecast.quantiles_d - first_d,
        np.maximum(forecast.quantiles_d - last_d, 0.0),
    )
    return DatedScores(
        crps_ensemble(members, 0.0), log_score_between(before, after), before + place * (after - before)
    )
