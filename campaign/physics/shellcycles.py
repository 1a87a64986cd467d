"""To which cycle a launch belongs, and which periods two images of one pattern allow."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from campaign.errors import InputRefused
from campaign.physics.domain import positive
from campaign.physics.shellvalues import Sided

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

_REACH = 5.0
_MOST_CYCLES = 200


class CyclePosterior(NamedTuple):
    """Cycles that a launch may belong to, most probable first, and how far each lies off, in sigma."""

    cycles: IntArray
    probabilities: FloatArray
    offsets_sigma: FloatArray


class AllowedPeriod(NamedTuple):
    """One period that two images allow: the number of whole launches between, and its probability."""

    launches: int
    period_yr: float
    period_sigma_yr: float
    probability: float


def cycle_posterior(
    launch_yr: float,
    launch_sigma_yr: float,
    expected_yr: float,
    expected_sigma_yr: float,
    period_yr: float,
    period_sigma_yr: float,
    covariance_yr2: float = 0.0,
    half_window_yr: float = 0.0,
) -> CyclePosterior:
    """Cycle of a launch, by an ephemeris whose cycles are all as probable beforehand.

    Parameters
    ----------
    launch_yr, launch_sigma_yr : float
        Launch date and its error, yr on any axis.
    expected_yr, expected_sigma_yr : float
        Middle of the production window of cycle 0, and its error, yr on the same axis.
    period_yr, period_sigma_yr : float
        Period > 0 and its error, yr.
    covariance_yr2 : float
        Covariance of ``expected_yr`` and ``period_yr``, yr^2.
    half_window_yr : float
        Half the width of the production window, yr, counted as an error.

    Returns
    -------
    CyclePosterior
        Cycles and probabilities (dimensionless) within 5 sigma, at least the nearest.

    Raises
    ------
    InputRefused
        If the period is not positive or an error is unknown.

    Notes
    -----
    Accuracy: exact for normal errors; at most 201 cycles about the nearest are weighed.

    Source: var(T_k) = var(T_0) + k^2 var(P) + 2 k cov(T_0, P); Bayes' theorem.

    Examples
    --------
    >>> found = cycle_posterior(2016.2, 0.5, 2000.0, 0.1, 8.0, 0.01)
    >>> int(found.cycles[0]), bool(found.probabilities[0] > 0.999)
    (2, True)
    """
    positive(period_yr, "period", "8.0 yr")
    known = (launch_sigma_yr, expected_sigma_yr, period_sigma_yr)
    if not np.isfinite(known).all():
        raise InputRefused(
            "The cycle of a launch cannot be weighed: an error is unknown.",
            why="How far a launch lies from each cycle is measured in errors.",
            hint="Give the errors of launch date, epoch and period.",
            code="error-unknown",
        )
    nearest = round((launch_yr - expected_yr) / period_yr)
    cycles = nearest + np.arange(-_MOST_CYCLES // 2, _MOST_CYCLES // 2 + 1)
    variance = (
        launch_sigma_yr**2
        + expected_sigma_yr**2
        + cycles**2 * period_sigma_yr**2
        + 2.0 * cycles * covariance_yr2
        + half_window_yr**2
    )
    sigma = np.sqrt(np.maximum(variance, 1e-30))
    offsets = (launch_yr - expected_yr - cycles * period_yr) / sigma
    log_weight = -0.5 * offsets**2 - np.log(sigma)
    weight = np.exp(log_weight - log_weight.max())
    weight /= weight.sum()
    kept = np.flatnonzero((np.abs(offsets) <= _REACH) | (weight == weight.max()))
    order = kept[np.argsort(-weight[kept], kind="stable")]
    return CyclePosterior(cycles[order].astype(np.int64), weight[order], offsets[order])


def periods_between_images(
    first_phase: Sided,
    second_phase: Sided,
    interval_yr: float,
    period_yr: Sided | None = None,
    shortest_yr: float = 0.5,
) -> tuple[AllowedPeriod, ...]:
    """Periods at which the pattern of one image grows into that of a later one.

    One image gives the age of the innermost shell only up to whole periods. Between two images the
    pattern moves out by a whole number of spacings and a fraction, and nobody may have counted them.

    Parameters
    ----------
    first_phase, second_phase : Sided
        Age of the innermost shell in periods (dimensionless), in each image.
    interval_yr : float
        Time from the first image to the second, yr, > 0.
    period_yr : Sided, optional
        Period known from elsewhere, yr; without it all allowed periods are as probable, in their logarithm.
    shortest_yr : float
        Shortest period looked for, yr, > 0.

    Returns
    -------
    tuple of AllowedPeriod
        Most probable first, in yr; at most 200.

    Raises
    ------
    InputRefused
        If the interval or the shortest period is not positive, or a phase has no error.

    Notes
    -----
    Accuracy: first order in the errors of the phases.

    Source: kinematics of evenly moving shells, interval = (n + f2 - f1) P.

    Examples
    --------
    >>> allowed = periods_between_images(Sided(0.2, 0.01, 0.01), Sided(0.7, 0.01, 0.01), 12.0, Sided(8, 1, 1))
    >>> allowed[0].launches, round(allowed[0].period_yr, 6)
    (1, 8.0)
    """
    positive(interval_yr, "interval between images", "8 yr")
    positive(shortest_yr, "shortest period", "0.5 yr")
    if not (first_phase.known and second_phase.known):
        raise InputRefused(
            "The periods that two images allow cannot be weighed: a phase has no error.",
            why="They follow from the fraction of a spacing by which the pattern moved.",
            hint="Give the radii with their errors.",
            code="error-unknown",
        )
    fraction = second_phase.value - first_phase.value
    sigma = float(np.hypot(first_phase.sigma, second_phase.sigma))
    launches = np.arange(np.ceil(-fraction + 1e-9), np.floor(interval_yr / shortest_yr - fraction) + 1.0)
    turns = launches + fraction
    likely = turns > max(2.0 * sigma, 1e-9)
    launches, turns = launches[likely][:_MOST_CYCLES], turns[likely][:_MOST_CYCLES]
    periods = interval_yr / turns
    errors = periods * sigma / turns
    weight = _prior(periods, errors, turns, period_yr)
    order = np.argsort(-weight, kind="stable")
    return tuple(
        AllowedPeriod(int(launches[i]), float(periods[i]), float(errors[i]), float(weight[i])) for i in order
    )


def _prior(periods: FloatArray, errors: FloatArray, turns: FloatArray, stated: Sided | None) -> FloatArray:
    if periods.size == 0:
        return periods
    if stated is None:
        # Flat in ln P: the fraction is measured alike for all, and d ln P = d turns/turns.
        weight = 1.0 / turns
    else:
        wide = np.hypot(errors, stated.sigma)
        log_weight = -0.5 * ((periods - stated.value) / wide) ** 2 - np.log(wide) + np.log(errors)
        weight = np.exp(log_weight - log_weight.max())
    return np.asarray(weight / weight.sum(), dtype=np.float64)


def phase_of_launch(launch_yr: ArrayLike, periastron_yr: float, period_yr: float) -> FloatArray:
    """Orbital phase at launch, signed about periastron.

    Parameters
    ----------
    launch_yr : array_like
        Launch dates, yr on any axis.
    periastron_yr, period_yr : float
        A periastron on that axis, yr, and the period, yr, > 0.

    Returns
    -------
    ndarray
        Phase in [-0.5, 0.5) (dimensionless); negative is before periastron.

    Raises
    ------
    InputRefused
        If the period is not positive.

    Notes
    -----
    Accuracy: a few ulp of the dates over the period.

    Source: definition of the phase.

    Examples
    --------
    >>> phase_of_launch([1999.0, 2009.0], 2000.0, 8.0).tolist()
    [-0.125, 0.125]
    """
    positive(period_yr, "period", "8.0 yr")
    turns = (np.asarray(launch_yr, dtype=np.float64) - periastron_yr) / period_yr
    phase: FloatArray = turns - np.floor(turns + 0.5)
    return phase
