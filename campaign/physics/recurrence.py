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
_GRID = 60
# With fewer degrees of freedom than this, dates of poor precision not counted, the prior is used too.
_LEAST_FREEDOM = 1.5
# Points at which the distribution function of a mixture is tabulated before it is inverted: good to
# 0.3 % of the width of a 95 % interval.
_TABLE = 161
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

    def share_before(self, instant_d: float) -> float:
        """Probability that the event happens before an instant (days on the axis of the dates)."""
        from scipy.special import ndtr

        return float(self.weights @ ndtr((instant_d - self.means_d) / self.sigmas_d))

    def _distribution(self) -> tuple[FloatArray, FloatArray]:
        from scipy.special import ndtr

        weights, means, sigmas = self.weights, self.means_d, self.sigmas_d
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
    def mean_d(self) -> float:
        """Mean of the mixture, days."""
        return float(self.weights @ self.means_d)

    @property
    def sigma_d(self) -> float:
        """Standard deviation of the mixture, days."""
        return float(np.sqrt(self.weights @ (self.sigmas_d**2 + (self.means_d - self.mean_d) ** 2)))


@dataclass(frozen=True, slots=True)
class RecurrenceFit:
    """A line through dated recurrences, one for each scatter of a grid: arrays of one length.

    ``pivot`` and ``origin_d`` are the mean cycle and date that the line is counted from; ``constants_d``
    and ``slopes_d`` are relative to them and to ``base_period_d``; ``covariances`` holds the variance of the
    constant, the covariance and the variance of the slope, days squared.
    """

    pivot: float
    origin_d: float
    base_period_d: float
    weights: FloatArray
    scatters_d: FloatArray
    constants_d: FloatArray
    slopes_d: FloatArray
    covariances: tuple[FloatArray, FloatArray, FloatArray]
    degrees_of_freedom: int
    prior_used: bool

    def at(self, cycle: float) -> RecurrencePrediction:
        """The date of a cycle: the line carried there, its error and the scatter of that cycle itself."""
        step = cycle - self.pivot
        own, both, slope = self.covariances
        line = own + 2.0 * step * both + step**2 * slope
        return RecurrencePrediction(
            weights=self.weights,
            means_d=self.origin_d + self.base_period_d * step + self.constants_d + self.slopes_d * step,
            sigmas_d=np.sqrt(line + self.scatters_d**2),
            scatters_d=self.scatters_d,
            degrees_of_freedom=self.degrees_of_freedom,
            prior_used=self.prior_used,
        )


def fit_recurrence(
    cycles: FloatArray,
    dates_d: FloatArray,
    sigmas_d: FloatArray,
    period_d: float | None = None,
    period_sigma_d: float | None = None,
) -> RecurrenceFit:
    """Fit a line to dated recurrences of one event, with the cycle-to-cycle scatter marginalised.

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
    period_d, period_sigma_d : float, optional
        Period and its error from the orbit, days.

    Returns
    -------
    RecurrenceFit
        Days; ``at(cycle)`` predicts any cycle.

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
    >>> fit = fit_recurrence(np.array([0.0, 1, 2, 3]), np.array([0.0, 1010, 1990, 3000]), np.ones(4))
    >>> out = fit.at(4)
    >>> bool(abs(float(out.weights @ out.means_d) - 3995) < 5)
    True
    """
    cycles = np.asarray(cycles, dtype=float)
    errors = np.asarray(sigmas_d, dtype=float)
    count = cycles.size
    with_prior = period_d is not None and period_sigma_d is not None
    if count == 0 or (not with_prior and np.ptp(cycles) == 0.0):
        raise InputRefused(
            "The dates do not determine a recurrence.",
            why="A line needs two dated onsets of different cycles, or one and a period with its error.",
            hint="Confirm another episode, or give the system a solution with a period such as 3650±30 d.",
            code="recurrence-undetermined",
        )
    # Work about the mean date and cycle: Julian dates would eat the precision of the normal equations.
    origin_d, pivot = float(np.mean(dates_d)), float(np.mean(cycles))
    x, y = cycles - pivot, np.asarray(dates_d, dtype=float) - origin_d
    base_period_d, prior_precision = 0.0, 0.0
    if with_prior:
        assert period_d is not None and period_sigma_d is not None
        prior_precision = np.inf if period_sigma_d == 0 else period_sigma_d**-2
        base_period_d, typical_period_d, freedom = period_d, abs(period_d), count - 1
        y = y - period_d * x
    else:
        typical_period_d, freedom = abs(float(np.sum(x * y) / np.sum(x * x))), count - 2
    usual_d = PRIOR_SCATTER_PERIODS * typical_period_d
    prior_used = needs_scatter_prior(errors, usual_d, freedom)
    scatters = scatter_grid(errors, typical_period_d, y, x, prior_used)
    w = 1.0 / (errors[None, :] ** 2 + scatters[:, None] ** 2)
    s0, s1, s2 = w.sum(1), w @ x, w @ (x * x)
    b0, b1 = w @ y, w @ (x * y)
    if np.isinf(prior_precision):
        zero = np.zeros_like(s0)
        constant, slope, covariances = b0 / s0, zero, (1.0 / s0, zero, zero)
        log_determinant = np.log(s0)
    else:
        s2 = s2 + prior_precision
        determinant = s0 * s2 - s1**2
        constant = (s2 * b0 - s1 * b1) / determinant
        slope = (s0 * b1 - s1 * b0) / determinant
        covariances = (s2 / determinant, -s1 / determinant, s0 / determinant)
        log_determinant = np.log(determinant)
    residual = y[None, :] - constant[:, None] - slope[:, None] * x[None, :]
    chi2 = (w * residual**2).sum(1)
    if with_prior and np.isfinite(prior_precision):
        chi2 = chi2 + prior_precision * slope**2
    log_like = -0.5 * chi2 + 0.5 * np.log(w).sum(1) - 0.5 * log_determinant
    # The grid is even in log(scatter): weight 1 there is the prior 1/scatter.
    if prior_used:
        log_like = log_like - 0.5 * (np.log(scatters / usual_d) / PRIOR_LOG_WIDTH) ** 2
    weights = np.exp(log_like - log_like.max())
    kept = weights > _NEGLIGIBLE_WEIGHT * weights.sum()
    weights = weights[kept] / weights[kept].sum()
    own, both, steep = (part[kept] for part in covariances)
    return RecurrenceFit(
        pivot=pivot,
        origin_d=origin_d,
        base_period_d=base_period_d,
        weights=weights,
        scatters_d=scatters[kept],
        constants_d=constant[kept],
        slopes_d=slope[kept],
        covariances=(own, both, steep),
        degrees_of_freedom=freedom,
        prior_used=prior_used,
    )


def predict_recurrence(
    cycles: FloatArray,
    dates_d: FloatArray,
    sigmas_d: FloatArray,
    next_cycle: float,
    period_d: float | None = None,
    period_sigma_d: float | None = None,
) -> RecurrencePrediction:
    """Predict the date of ``next_cycle`` from dated recurrences of the same event.

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
    Accuracy: that of ``fit_recurrence``.

    Source: as ``fit_recurrence``.

    Examples
    --------
    >>> import numpy as np
    >>> out = predict_recurrence(np.array([0.0, 1, 2, 3]), np.array([0.0, 1010, 1990, 3000]), np.ones(4), 4)
    >>> bool(abs(float(out.weights @ out.means_d) - 3995) < 5)
    True
    """
    return fit_recurrence(cycles, dates_d, sigmas_d, period_d, period_sigma_d).at(next_cycle)


def needs_scatter_prior(sigmas_d: FloatArray, usual_d: float, freedom: int) -> bool:
    """Whether the dates say too little of the scatter, so that the stated prior is used.

    Parameters
    ----------
    sigmas_d : ndarray, shape (n,)
        Dating errors, days.
    usual_d : float
        The scatter that is usual, days: ``PRIOR_SCATTER_PERIODS`` of the period.
    freedom : int
        Dates less the parameters of the line.

    Returns
    -------
    bool
        True (dimensionless) with fewer than two degrees of freedom, or where too few dates are good enough.

    Notes
    -----
    Accuracy: a rule, not a measurement. Source: project convention.

    Examples
    --------
    >>> needs_scatter_prior(np.full(3, 5.0), 30.0, 1), needs_scatter_prior(np.full(8, 5.0), 30.0, 6)
    (True, False)
    """
    # A date known far worse than the onsets usually scatter tells nothing of the scatter.
    telling = float(np.sum(usual_d**2 / (usual_d**2 + np.asarray(sigmas_d) ** 2)))
    return freedom < 2 or freedom - (len(sigmas_d) - telling) < _LEAST_FREEDOM


def scatter_grid(
    sigmas_d: FloatArray, period_d: float, y: FloatArray, x: FloatArray, prior_used: bool
) -> FloatArray:
    """Even grid in log(scatter) that holds all of the posterior.

    Parameters
    ----------
    sigmas_d : ndarray, shape (n,)
        Dating errors, days.
    period_d : float
        Period about which, days.
    y, x : ndarray, shape (n,)
        Dates (days) and cycles (dimensionless) about their means.
    prior_used : bool
        Whether the stated prior decides the range; else the dates do.

    Returns
    -------
    ndarray
        Scatters, days.

    Notes
    -----
    Accuracy: sixty steps; quantiles of a prediction are good to 1 % of its width. Source: project convention.

    Examples
    --------
    >>> grid = scatter_grid(np.ones(4), 1000.0, np.zeros(4), np.arange(4.0), True)
    >>> bool(grid[0] < 1.0 < 10.0 < 100.0 < grid[-1])
    True
    """
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
