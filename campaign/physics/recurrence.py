"""The next onset from dated onsets: a line through them, with the cycle-to-cycle scatter marginalised."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]

# Stated prior of the scatter when the dates alone say too little (fewer than two degrees of freedom):
# log-normal about one per cent of the period, a factor of e either way.
PRIOR_SCATTER_PERIODS = 0.01
PRIOR_LOG_WIDTH = 1.0
_GRID = 80
# With fewer degrees of freedom than this, dates of poor precision not counted, the prior is used too.
_LEAST_FREEDOM = 1.5
# Points at which the distribution function of a mixture is tabulated before it is inverted: 0.1 % of the
# width of a 95 % interval.
_TABLE = 257
_NEGLIGIBLE_WEIGHT = 1e-9


@dataclass(frozen=True, slots=True)
class RecurrencePrediction:
    """A predicted date as a mixture of normals over the scatter: arrays of one length.

    ``weights`` sum to 1 (dimensionless); ``means_d`` and ``sigmas_d`` are in days on the axis of the
    dates given; ``scatters_d`` is the scatter of each component, in days.
    """

    weights: FloatArray
    means_d: FloatArray
    sigmas_d: FloatArray
    scatters_d: FloatArray
    degrees_of_freedom: int
    prior_used: bool
    _table: list[FloatArray] = field(default_factory=list, repr=False, compare=False)

    def quantiles_d(self, shares: FloatArray) -> FloatArray:
        """Quantiles of the mixture, days, by inverting its tabulated distribution function.

        Stratified shares give stratified draws, so that the tails do not wander with the seed.
        """
        if not self._table:
            self._table.extend(self._distribution())
        table, cumulative = self._table
        return np.asarray(np.interp(shares, cumulative, table), dtype=np.float64)

    def _distribution(self) -> tuple[FloatArray, FloatArray]:
        from scipy.special import ndtr

        used = self.weights > _NEGLIGIBLE_WEIGHT
        weights, means, sigmas = self.weights[used], self.means_d[used], self.sigmas_d[used]
        centre, scale = float(weights @ means), self.typical_sigma_d
        reach = float(np.max(np.abs(means - centre) + 8.0 * sigmas)) / scale
        # Dense about the centre, wide in the tails of the largest scatter.
        table = centre + scale * np.sinh(np.linspace(-1.0, 1.0, _TABLE) * np.arcsinh(reach))
        return table, weights @ ndtr((table[None, :] - means[:, None]) / sigmas[:, None])

    @property
    def typical_sigma_d(self) -> float:
        """Geometric mean of the components' errors, days: unlike the variance, unmoved by long tails."""
        return float(np.exp(self.weights @ np.log(self.sigmas_d)))

    @property
    def sigma_d(self) -> float:
        """Standard deviation of the mixture, days."""
        mean = float(self.weights @ self.means_d)
        return float(np.sqrt(self.weights @ (self.sigmas_d**2 + (self.means_d - mean) ** 2)))


def predict_recurrence(
    cycles: FloatArray,
    dates_d: FloatArray,
    sigmas_d: FloatArray,
    next_cycle: float,
    period_d: float | None = None,
    period_sigma_d: float | None = None,
) -> RecurrencePrediction:
    """Predict the date of ``next_cycle`` from dated recurrences of the same event.

    The model is date = c + P cycle + deviation, where the deviations are normal with an unknown
    scatter, plus the dating errors. The constant has a flat prior; the period has a normal prior when
    an orbit gives one, else a flat one. Given the scatter everything is linear and exact; the scatter is
    marginalised on a grid. With enough dates its prior is 1/scatter, so that the prediction tends to
    Student's t with the usual degrees of freedom; with fewer than two degrees of freedom, or where most
    dates are known worse than onsets scatter, the stated log-normal prior (1 % of the period, width a
    factor of e) takes over.

    Parameters
    ----------
    cycles : ndarray, shape (n,)
        Cycle numbers (dimensionless), n >= 1; n >= 2 distinct ones without a period prior.
    dates_d, sigmas_d : ndarray, shape (n,)
        Dates and their one-sigma dating errors, days; errors >= 0.
    next_cycle : float
        Cycle to predict (dimensionless).
    period_d, period_sigma_d : float, optional
        Period and its error from the orbit, days.

    Returns
    -------
    RecurrencePrediction
        Mixture over the scatter, days.

    Raises
    ------
    InputRefused
        If the dates cannot determine a line.

    Notes
    -----
    Accuracy: the grid reproduces Student's t quantiles to 1 % of the width.

    Source: Gelman et al. 2013, Bayesian Data Analysis, ch. 14.2 (regression with unknown variance) and
    5.7 (prior on a scatter).

    Examples
    --------
    >>> import numpy as np
    >>> out = predict_recurrence(np.array([0.0, 1, 2, 3]), np.array([0.0, 1010, 1990, 3000]), np.ones(4), 4)
    >>> bool(abs(float(out.weights @ out.means_d) - 3995) < 5)
    True
    """
    cycles = np.asarray(cycles, dtype=float)
    count = cycles.size
    with_prior = period_d is not None and period_sigma_d is not None
    if count == 0 or (not with_prior and np.unique(cycles).size < 2):
        raise InputRefused(
            "The dates do not determine a recurrence.",
            why="A line needs two dated onsets of different cycles, or one and a period with its error.",
            hint="Confirm another episode, or give the system a solution with a period such as 3650±30 d.",
            code="recurrence-undetermined",
        )
    # Work about the mean date and cycle: Julian dates would eat the precision of the normal equations.
    origin_d, pivot = float(np.mean(dates_d)), float(np.mean(cycles))
    x, y = cycles - pivot, np.asarray(dates_d, dtype=float) - origin_d
    step = next_cycle - pivot
    if with_prior:
        assert period_d is not None and period_sigma_d is not None
        prior_precision = np.inf if period_sigma_d == 0 else period_sigma_d**-2
        typical_period_d, freedom = period_d, count - 1
        y = y - period_d * x
    else:
        prior_precision = 0.0
        typical_period_d = float(np.sum(x * y) / np.sum(x * x))
        freedom = count - 2
    # A date known far worse than the onsets usually scatter tells nothing of the scatter.
    usual_d = PRIOR_SCATTER_PERIODS * abs(typical_period_d)
    telling = float(np.sum(usual_d**2 / (usual_d**2 + np.asarray(sigmas_d, dtype=float) ** 2)))
    prior_used = freedom < 2 or freedom - (count - telling) < _LEAST_FREEDOM

    scatters = _scatter_grid(np.asarray(sigmas_d, dtype=float), abs(typical_period_d), y, x, prior_used)
    variance = np.asarray(sigmas_d, dtype=float)[None, :] ** 2 + scatters[:, None] ** 2
    w = 1.0 / variance
    s0, s1, s2 = w.sum(1), (w * x).sum(1), (w * x * x).sum(1)
    b0, b1 = (w * y).sum(1), (w * x * y).sum(1)
    if np.isinf(prior_precision):
        constant, slope = b0 / s0, np.zeros_like(s0)
        prediction_variance = 1.0 / s0
        log_determinant = np.log(s0)
    else:
        s2 = s2 + prior_precision
        determinant = s0 * s2 - s1**2
        constant = (s2 * b0 - s1 * b1) / determinant
        slope = (s0 * b1 - s1 * b0) / determinant
        prediction_variance = (s2 - 2.0 * step * s1 + step**2 * s0) / determinant
        log_determinant = np.log(determinant)
    residual = y[None, :] - constant[:, None] - slope[:, None] * x[None, :]
    chi2 = (w * residual**2).sum(1)
    if with_prior and np.isfinite(prior_precision):
        chi2 = chi2 + prior_precision * slope**2
    log_like = -0.5 * chi2 + 0.5 * np.log(w).sum(1) - 0.5 * log_determinant
    # The grid is even in log(scatter): weight 1 there is the prior 1/scatter.
    if prior_used:
        log_like = (
            log_like
            - 0.5
            * (np.log(scatters / (PRIOR_SCATTER_PERIODS * abs(typical_period_d))) / PRIOR_LOG_WIDTH) ** 2
        )
    weights = np.exp(log_like - log_like.max())
    weights /= weights.sum()
    base = origin_d + (period_d * step if with_prior and period_d is not None else 0.0)
    return RecurrencePrediction(
        weights=weights,
        means_d=base + constant + slope * step,
        sigmas_d=np.sqrt(prediction_variance + scatters**2),
        scatters_d=scatters,
        degrees_of_freedom=freedom,
        prior_used=prior_used,
    )


def _scatter_grid(
    sigmas_d: FloatArray, period_d: float, y: FloatArray, x: FloatArray, prior_used: bool
) -> FloatArray:
    """Even grid in log(scatter) that holds all of the posterior, days."""
    if prior_used:
        centre = np.log(PRIOR_SCATTER_PERIODS * period_d)
        return np.exp(np.linspace(centre - 4.5 * PRIOR_LOG_WIDTH, centre + 4.5 * PRIOR_LOG_WIDTH, _GRID))
    # The best dated onsets set the scale: one poor date must not hide a small scatter.
    floor = max(float(sigmas_d.min()), 1e-6 * period_d)
    w = 1.0 / (sigmas_d**2 + floor**2)
    across, up = x - w @ x / w.sum(), y - w @ y / w.sum()
    slope = float(w @ (across * up) / (w @ across**2)) if np.any(across != 0.0) else 0.0
    spread = float(np.sqrt(w @ (up - slope * across) ** 2 / w.sum()))
    dating = float(np.mean(1.0 / np.maximum(sigmas_d, floor) ** 2) ** -0.5)
    # Below a third of the dating error the scatter changes nothing; 1/scatter must stop somewhere.
    low = max(dating / 3.0, spread / 50.0, 1e-6 * period_d)
    high = max(100.0 * spread, 10.0 * float(np.sqrt(np.mean(sigmas_d**2))), 1e-3 * period_d)
    return np.exp(np.linspace(np.log(low), np.log(max(high, 2.0 * low)), _GRID))
