"""Drawn event times summed up: quantiles, spread, probability of happening at all and inside a window."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.physics.intervals import PROBABILITIES, row_quantiles
from campaign.physics.recurrence import RecurrencePrediction

FloatArray = NDArray[np.float64]

# Probabilities at which the distributions of onset and end are kept for the timeline and the status.
GRID: FloatArray = (np.arange(101, dtype=np.float64) + 0.5) / 101.0


@dataclass(frozen=True, slots=True)
class Window:
    """The span asked for and the instant of the question, all ``bmjd_tdb``."""

    start: float
    end: float
    as_of: float


@dataclass(slots=True)
class Summary:
    """Quantiles and probabilities of several drawn events, one row each."""

    quantiles: FloatArray
    sigma_d: FloatArray
    probability: FloatArray
    in_window: FloatArray
    grid: FloatArray | None


def summarise(times: FloatArray, window: Window, keep_grid: bool) -> Summary:
    """Quantiles, spread and probabilities of drawn event times.

    Parameters
    ----------
    times : ndarray, shape (n, draws)
        ``bmjd_tdb``; NaN where the event does not happen.
    window : Window
        For the probability inside it.
    keep_grid : bool
        Whether to keep the quantiles at GRID too.

    Returns
    -------
    Summary
        Rows in the order of ``times``.

    Notes
    -----
    Accuracy: that of the draws; with 20,000 stratified draws a bound of the 95 % interval is good to
    about 0.02 sigma.

    Source: equal-tailed quantiles (DEVELOPERS.md).
    """
    ordered = np.sort(times, axis=1)
    draws = times.shape[1]
    counts = draws - np.isnan(ordered).sum(axis=1)
    quantiles = row_quantiles(ordered, counts, PROBABILITIES)
    # Row by row, whatever else is in the block: a forecast must not depend on its neighbours.
    whole = counts == draws
    sigma = np.empty(times.shape[0])
    sigma[whole] = ordered[whole].std(axis=1)
    if not whole.all():
        some, n = ordered[~whole], np.maximum(counts[~whole], 1)
        shifted = np.nan_to_num(some - np.where(counts[~whole] > 0, some[:, 0], 0.0)[:, None])
        mean = shifted.sum(axis=1) / n
        sigma[~whole] = np.sqrt(np.maximum((shifted**2).sum(axis=1) / n - mean**2, 0.0))
    inside = ((ordered >= window.start) & (ordered <= window.end)).sum(axis=1) / draws
    return Summary(
        quantiles=quantiles,
        sigma_d=sigma,
        probability=counts / draws,
        in_window=inside,
        grid=row_quantiles(ordered, counts, GRID) if keep_grid else None,
    )


def summarise_recurrence(prediction: RecurrencePrediction, window: Window) -> Summary:
    """The same of a date learned from episodes, whose distribution is known without draws.

    Parameters
    ----------
    prediction : RecurrencePrediction
        A mixture of normals, days (``bmjd_tdb``).
    window : Window
        For the probability inside it.

    Returns
    -------
    Summary
        One row.

    Notes
    -----
    Accuracy: 0.3 % of the width of the 95 % interval, from the tabulated distribution function.

    Source: see ``campaign.physics.recurrence``.
    """
    inside = prediction.share_before(window.end) - prediction.share_before(window.start)
    return Summary(
        quantiles=prediction.quantiles_d(PROBABILITIES)[None, :],
        sigma_d=np.array([prediction.sigma_d]),
        probability=np.ones(1),
        in_window=np.array([inside]),
        grid=prediction.quantiles_d(GRID)[None, :],
    )


def summarise_observed(moment: Moment, window: Window) -> Summary:
    """The same of a date that was observed: a two-piece normal about the stated instant.

    Parameters
    ----------
    moment : Moment
        ``bmjd_tdb`` with its errors in days; an unknown error counts as zero and is reported elsewhere.
    window : Window
        For the probability inside it.

    Returns
    -------
    Summary
        One row.

    Notes
    -----
    Accuracy: exact.

    Source: two-piece normal with the stated value as median, see ``campaign.physics.draws``.
    """
    from scipy.special import ndtr, ndtri

    minus, plus = moment.minus_d or 0.0, moment.plus_d or 0.0

    def quantiles(shares: FloatArray) -> FloatArray:
        z = ndtri(shares)
        return np.asarray(moment.bmjd_tdb + np.where(z < 0.0, minus, plus) * z)[None, :]

    def before(instant: float) -> float:
        size = minus if instant < moment.bmjd_tdb else plus
        if size == 0.0:
            return float(instant >= moment.bmjd_tdb)
        return float(ndtr((instant - moment.bmjd_tdb) / size))

    return Summary(
        quantiles=quantiles(PROBABILITIES),
        sigma_d=np.array([Measured(moment.bmjd_tdb, minus, plus).sigma or 0.0]),
        probability=np.ones(1),
        in_window=np.array([before(window.end) - before(window.start)]),
        grid=quantiles(GRID),
    )


def share_before(grid: FloatArray, instant: float | FloatArray) -> FloatArray:
    """Probability that an event with quantiles ``grid`` happens before an instant, given it happens."""
    return np.asarray(np.interp(instant, grid, GRID, left=0.0, right=1.0), dtype=np.float64)
