"""A straight line through dated events: epoch and period with their full covariance, never rescaled."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused

FloatArray = NDArray[np.float64]


@dataclass(frozen=True, slots=True, eq=False)
class LinearEphemeris:
    """T(E) = T0 + P E. Epoch and period in days, their variances and covariance in days squared.

    ``residuals_d`` are observed minus computed, in the order of the dates; ``chi2`` is dimensionless.
    """

    epoch_d: float
    period_d: float
    epoch_variance_d2: float
    period_variance_d2: float
    covariance_d2: float
    residuals_d: FloatArray
    chi2: float
    degrees_of_freedom: int

    @property
    def epoch_sigma_d(self) -> float:
        """One-sigma error of the epoch, days."""
        return float(np.sqrt(self.epoch_variance_d2))

    @property
    def period_sigma_d(self) -> float:
        """One-sigma error of the period, days."""
        return float(np.sqrt(self.period_variance_d2))

    @property
    def correlation(self) -> float:
        """Correlation of epoch and period (dimensionless)."""
        return self.covariance_d2 / (self.epoch_sigma_d * self.period_sigma_d)

    @property
    def best_cycle(self) -> float:
        """The cycle, not a whole number, at which the date has its least variance: quote the epoch there."""
        return -self.covariance_d2 / self.period_variance_d2

    def at(self, cycle: float) -> tuple[float, float]:
        """Date of a cycle and its one-sigma error, both in days, with the covariance."""
        variance = self.epoch_variance_d2 + 2.0 * cycle * self.covariance_d2
        variance += cycle**2 * self.period_variance_d2
        return self.epoch_d + cycle * self.period_d, float(np.sqrt(max(variance, 0.0)))


def fit_ephemeris(cycles: FloatArray, dates_d: FloatArray, sigmas_d: FloatArray) -> LinearEphemeris:
    """Weighted least squares of dates against cycles.

    Parameters
    ----------
    cycles : ndarray, shape (n,)
        Cycle numbers (dimensionless), at least two distinct ones.
    dates_d, sigmas_d : ndarray, shape (n,)
        Dates and their one-sigma errors, days; errors > 0.

    Returns
    -------
    LinearEphemeris
        Days and days squared. Errors are those that the stated ones give, whatever the residuals.

    Raises
    ------
    InputRefused
        Fewer than two distinct cycles, or an error that is not positive.

    Notes
    -----
    Accuracy: 1e-9 relative; the sums are taken about the weighted mean.

    Source: C = (X^T W X)^-1, var T(E) = C00 + 2 E C01 + E^2 C11 (Deeg 2015, A&A 578, A17, for equal errors).

    Examples
    --------
    >>> line = fit_ephemeris(np.arange(10.0), 100.0 + 50.0 * np.arange(10.0), np.ones(10))
    >>> round(line.period_d, 6), round(line.period_sigma_d, 6), round(line.best_cycle, 6)
    (50.0, 0.110096, 4.5)
    """
    cycles = np.asarray(cycles, dtype=np.float64)
    sigmas = np.asarray(sigmas_d, dtype=np.float64)
    if cycles.size < 2 or np.ptp(cycles) == 0.0 or not bool(np.all(sigmas > 0.0)):
        raise InputRefused(
            "The dates do not determine a period.",
            why="A line needs dated events of two different cycles, each with an error above zero.",
            hint="Confirm another episode: campaign episodes find SYSTEM",
            code="recurrence-undetermined",
        )
    weight = sigmas**-2.0
    total = float(weight.sum())
    # About the weighted means: Julian dates would eat the precision of the normal equations.
    pivot, origin = float(weight @ cycles) / total, float(weight @ (dates_d - dates_d[0])) / total
    x, y = cycles - pivot, dates_d - dates_d[0] - origin
    square = float(weight @ x**2)
    period = float(weight @ (x * y)) / square
    residuals = y - period * x
    return LinearEphemeris(
        epoch_d=float(dates_d[0]) + origin - period * pivot,
        period_d=period,
        epoch_variance_d2=1.0 / total + pivot**2 / square,
        period_variance_d2=1.0 / square,
        covariance_d2=-pivot / square,
        residuals_d=residuals,
        chi2=float(weight @ residuals**2),
        degrees_of_freedom=cycles.size - 2,
    )
