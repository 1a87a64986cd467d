"""A line through dated events of several kinds, the cycle-to-cycle scatter marginalised; any kind of date.

What ``campaign.physics.recurrence`` does for one kind of event with normal errors, for onsets and maxima
together, for lopsided and bracketed dates, for a period that changes, and with the likelihood of the count.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.physics.datedlikelihood import DatedEvents, date_log_likelihood
from campaign.physics.recurrence import (
    PRIOR_LOG_WIDTH,
    PRIOR_SCATTER_PERIODS,
    RecurrencePrediction,
    needs_scatter_prior,
    scatter_grid,
)

FloatArray = NDArray[np.float64]

# So much of their deviation two events of one cycle share. Nobody knows it; with nearly all, a second date of
# a cycle averages the dating error but not the scatter, and where less is shared intervals are only too wide.
SHARED_SHARES = (0.9,)
# Points at which a likelihood that is not normal is looked at, for each scatter, and how much wider than
# the normal one that stands in for it they lie.
_POINTS = 128
_WIDER = 1.35
_HERMITE = 9
_NEGLIGIBLE = 1e-7


@dataclass(frozen=True, slots=True, eq=False)
class DatedLine:
    """Posterior of the coefficients, as a mixture: one entry a component.

    ``means`` (m, p) and ``covariances`` (m, p, p) in days; a component without a spread of its own has a
    covariance of zero. ``scatters_d`` (m,) is the scatter of events about the line. ``pivot`` is the cycle
    that the line is counted from, ``scatter_quantiles_d`` the scatter at 16, 50 and 84 %. ``log_evidence``
    compares counts of the same dates; the period's prior is even in its logarithm. ``best_log_likelihood`` is
    that of the best coefficients and scatter, for information criteria.
    """

    pivot: float
    weights: FloatArray
    means: FloatArray
    covariances: FloatArray
    scatters_d: FloatArray
    log_evidence: float
    best_log_likelihood: float
    scatter_quantiles_d: tuple[float, float, float]
    degrees_of_freedom: int
    prior_used: bool
    curved: bool = False

    def coefficients(self) -> tuple[FloatArray, FloatArray]:
        """Mean (p,) and covariance (p, p) of the coefficients, days."""
        mean = self.weights @ self.means
        apart = self.means - mean
        spread = np.einsum("m,mi,mj->ij", self.weights, apart, apart)
        return mean, spread + np.einsum("m,mij->ij", self.weights, self.covariances)

    def quantile_of(self, column: FloatArray, shares: FloatArray, *, with_scatter: bool) -> FloatArray:
        """Quantiles of a linear combination of the coefficients, days, with an event's scatter or without."""
        found: FloatArray = self.mixture(column, with_scatter=with_scatter).quantiles_d(shares)
        return found

    def mixture(self, column: FloatArray, *, with_scatter: bool) -> RecurrencePrediction:
        """The distribution of a linear combination of the coefficients, days."""
        variance = np.einsum("i,mij,j->m", column, self.covariances, column)
        own = self.scatters_d if with_scatter else np.full_like(self.scatters_d, 1e-9)
        return RecurrencePrediction(
            weights=self.weights,
            means_d=self.means @ column,
            sigmas_d=np.sqrt(np.maximum(variance, 0.0) + own**2),
            scatters_d=self.scatters_d,
            degrees_of_freedom=self.degrees_of_freedom,
            prior_used=self.prior_used,
        )

    def by_scatter(self) -> DatedLine:
        """The same with one normal component for each scatter: quicker, without the skewness within one."""
        values, place = np.unique(self.scatters_d, return_inverse=True)
        if values.size == self.scatters_d.size:
            return self
        weights = np.zeros(values.size)
        np.add.at(weights, place, self.weights)
        share = self.weights / weights[place]
        means = np.zeros((values.size, self.means.shape[1]))
        np.add.at(means, place, share[:, None] * self.means)
        apart = self.means - means[place]
        spread = self.covariances + apart[:, :, None] * apart[:, None, :]
        covariances = np.zeros((values.size, *spread.shape[1:]))
        np.add.at(covariances, place, share[:, None, None] * spread)
        return replace(self, weights=weights, means=means, covariances=covariances, scatters_d=values)

    def column(self, cycle: float, kind: int = 0) -> FloatArray:
        """What the date of a cycle has of each coefficient."""
        width = self.means.shape[1]
        row: FloatArray = _design(np.array([cycle - self.pivot]), np.array([kind]), width, self.curved)[0]
        return row


def _design(steps: FloatArray, kinds: NDArray[np.int64], width: int, curved: bool) -> FloatArray:
    """Columns: constant, step, one for each kind but the first, and half the square of the step."""
    offsets = width - 2 - int(curved)
    columns = [np.ones_like(steps), steps]
    columns += [(kinds == number + 1).astype(np.float64) for number in range(offsets)]
    if curved:
        columns.append(0.5 * steps**2)
    return np.stack(columns, axis=-1)


def fit_dated_line(
    cycles: FloatArray,
    kinds: NDArray[np.int64],
    events: DatedEvents,
    *,
    period_prior_d: tuple[float, float] | None = None,
    curved: bool = False,
    usual_scatter_d: float | None = None,
) -> DatedLine:
    """Fit date = c + P cycle (+ offset of its kind) (+ half of dP a cycle times its square) + deviation.

    Parameters
    ----------
    cycles : ndarray, shape (n,)
        Cycle numbers (dimensionless).
    kinds : ndarray of int, shape (n,)
        0 for the first kind of event, 1 for the next (dimensionless): each has an offset of its own.
    events : DatedEvents
        The dates, days.
    period_prior_d : (float, float), optional
        Period known otherwise and its one-sigma error, days.
    curved : bool
        Whether the period may change from cycle to cycle.
    usual_scatter_d : float, optional
        Centre of the scatter's stated prior, days, which is then used whatever the number of dates: for the
        comparison of counts. Otherwise as in ``campaign.physics.recurrence``.

    Returns
    -------
    DatedLine
        Days.

    Raises
    ------
    InputRefused
        If the dates determine no line.

    Notes
    -----
    Accuracy: exact given the scatter where all dates are normal; else importance sampling with 128 points a
    scatter, good to about 2 % of a width. Events of one cycle are taken to share nine tenths of their
    deviation, which is cautious: intervals are too wide where they share less.

    Source: Gelman et al. 2013, Bayesian Data Analysis, ch. 14.2, 5.7 and 10.4 (importance sampling);
    Gauss-Hermite quadrature for the shared part.

    Examples
    --------
    >>> events = DatedEvents(np.array([0.0, 1010, 1990, 3000]), np.ones(4), np.ones(4), np.zeros(4, bool))
    >>> line = fit_dated_line(np.arange(4.0), np.zeros(4, int), events)
    >>> median = line.quantile_of(line.column(4.0), np.array([0.5]), with_scatter=True)[0]
    >>> bool(abs(median - 3995) < 5)
    True
    """
    cycles = np.asarray(cycles, dtype=np.float64)
    kinds = np.asarray(kinds, dtype=np.int64)
    width = 2 + int(kinds.max(initial=0)) + int(curved)
    pivot = float(np.mean(cycles)) if cycles.size else 0.0
    design = _design(cycles - pivot, kinds, width, curved)
    extra = 0 if period_prior_d is None else 1
    known = np.vstack([design, np.eye(width)[1:2]]) if extra else design
    if cycles.size == 0 or np.linalg.matrix_rank(known) < width:
        raise InputRefused(
            "The dates do not determine a recurrence.",
            why=f"A line of {width} coefficients needs as many dates of different cycles.",
            hint="Confirm another episode: campaign episodes find SYSTEM",
            code="recurrence-undetermined",
        )
    mean, sigma = events.moments()
    origin = float(np.mean(mean))
    y = mean - origin
    rough = _rough(known, y, sigma, period_prior_d)
    period_d = abs(float(rough[1])) or 1.0
    freedom = cycles.size + extra - width
    usual = PRIOR_SCATTER_PERIODS * period_d if usual_scatter_d is None else usual_scatter_d
    prior_used = usual_scatter_d is not None or needs_scatter_prior(sigma, usual, freedom)
    if prior_used:
        scatters = scatter_grid(sigma, usual / PRIOR_SCATTER_PERIODS, y, cycles - pivot, True)
    else:
        # Residuals of the whole line, so that neither offsets nor a change of period look like scatter.
        rest = y - design @ rough
        scatters = scatter_grid(sigma, period_d, rest, np.zeros_like(rest), False)
    shares = SHARED_SHARES if width - int(curved) > 2 else (0.0,)
    s, share = (part.ravel() for part in np.meshgrid(scatters, shares))
    ln, means, covariances = _given_scatter(cycles, design, y, sigma, s, share, period_prior_d)
    # The grid is even in log(scatter): weight 1 there is the prior 1/scatter.
    prior = -0.5 * (np.log(s / usual) / PRIOR_LOG_WIDTH) ** 2 if prior_used else np.zeros_like(s)
    normalisation = np.log(np.exp(prior).sum())
    best = float((ln - 0.5 * np.linalg.slogdet(covariances)[1]).max()) - 0.5 * width * np.log(2.0 * np.pi)
    if events.are_normal:
        ln_weight = ln + prior
    else:
        shifted = DatedEvents(events.date_d - origin, events.minus_d, events.plus_d, events.bracketed)
        ln_weight, means = _sampled(shifted, cycles, design, means, covariances, s, share, period_prior_d)
        ln_weight = (ln_weight + prior[:, None]).ravel()
        covariances, s = np.zeros((means.shape[0], width, width)), np.repeat(s, _POINTS)
    top = float(ln_weight.max())
    weights = np.exp(ln_weight - top)
    kept = weights > _NEGLIGIBLE
    # A prior that is even in ln P: alias P/m has the same likelihood in m times less of P.
    evidence = top + np.log(weights.sum()) - normalisation - np.log(period_d)
    weights = weights[kept] / weights[kept].sum()
    means = means[kept]
    means[:, 0] += origin
    return DatedLine(
        pivot=pivot,
        weights=weights,
        means=means,
        covariances=covariances[kept],
        scatters_d=s[kept],
        log_evidence=float(evidence),
        best_log_likelihood=best,
        scatter_quantiles_d=_scatter_quantiles(s[kept], weights),
        degrees_of_freedom=freedom,
        prior_used=prior_used,
        curved=curved,
    )


def _scatter_quantiles(scatters: FloatArray, weights: FloatArray) -> tuple[float, float, float]:
    order = np.argsort(scatters)
    cumulative = np.cumsum(weights[order])
    last = scatters.size - 1
    low, middle, high = (
        float(scatters[order][min(int(np.searchsorted(cumulative, q)), last)]) for q in (0.16, 0.5, 0.84)
    )
    return low, middle, high


def _given_scatter(
    cycles: FloatArray, design: FloatArray, y: FloatArray, sigma: FloatArray, s: FloatArray,
    share: FloatArray, period_prior_d: tuple[float, float] | None,
) -> tuple[FloatArray, FloatArray, FloatArray]:  # fmt: skip
    """For each scatter: ln of the likelihood with the coefficients integrated out, their mean, covariance."""
    width = design.shape[1]
    same = (cycles[:, None] == cycles[None, :]) & ~np.eye(cycles.size, dtype=bool)
    variance = s[:, None, None] ** 2 * (np.eye(cycles.size) + share[:, None, None] * same)
    variance = variance + np.diag(sigma**2)
    inverse = np.linalg.inv(variance)
    information = np.einsum("ni,mnk,kj->mij", design, inverse, design)
    score = np.einsum("ni,mnk,k->mi", design, inverse, y)
    ln = 0.5 * (width - cycles.size) * np.log(2.0 * np.pi) - 0.5 * np.linalg.slogdet(variance)[1]
    if period_prior_d is not None:
        weight = max(period_prior_d[1], 1e-9) ** -2.0
        information[:, 1, 1] += weight
        score[:, 1] += weight * period_prior_d[0]
    covariance = np.linalg.inv(information)
    best = np.einsum("mij,mj->mi", covariance, score)
    rest = y[None, :] - best @ design.T
    ln = ln - 0.5 * np.einsum("mn,mnk,mk->m", rest, inverse, rest) + 0.5 * np.linalg.slogdet(covariance)[1]
    if period_prior_d is not None:
        ln -= 0.5 * weight * (best[:, 1] - period_prior_d[0]) ** 2
    return np.asarray(ln, dtype=np.float64), best, covariance


def _rough(
    known: FloatArray, y: FloatArray, sigma: FloatArray, period_prior_d: tuple[float, float] | None
) -> FloatArray:
    """Coefficients by weighted least squares, to see about which period it is and what is left."""
    if period_prior_d is not None:
        y, sigma = np.append(y, period_prior_d[0]), np.append(sigma, max(period_prior_d[1], 1e-9))
    trusted = np.maximum(sigma, 1e-6 * max(float(np.ptp(y)), 1.0))
    found, *_ = np.linalg.lstsq(known / trusted[:, None], y / trusted, rcond=None)
    return np.asarray(found, dtype=np.float64)


def _sampled(
    events: DatedEvents, cycles: FloatArray, design: FloatArray, best: FloatArray, covariance: FloatArray,
    s: FloatArray, share: FloatArray, period_prior_d: tuple[float, float] | None,
) -> tuple[FloatArray, FloatArray]:  # fmt: skip
    """Points about the normal solution of each scatter, with ln of their weights (scatter, point)."""
    width = design.shape[1]
    z = _even_normals(width)
    root = np.linalg.cholesky(covariance)
    points = best[:, None, :] + _WIDER * np.einsum("mij,qj->mqi", root, z)
    expected = np.asarray(points @ design.T, dtype=np.float64)
    ln: FloatArray = np.empty(expected.shape[:2])
    for value in np.unique(share):
        mine = share == value
        ln[mine] = _shared(events, cycles, expected[mine], s[mine], float(value))
    if period_prior_d is not None:
        ln = ln - 0.5 * ((points[..., 1] - period_prior_d[0]) / max(period_prior_d[1], 1e-9)) ** 2
    proposal = -0.5 * (z**2).sum(axis=1)[None, :] - np.linalg.slogdet(root)[1][:, None]
    proposal = proposal - width * np.log(_WIDER * np.sqrt(2.0 * np.pi))
    return np.asarray(ln - proposal - np.log(_POINTS)), points.reshape(-1, width)


def _shared(
    events: DatedEvents, cycles: FloatArray, expected: FloatArray, s: FloatArray, share: float
) -> FloatArray:
    """ln likelihood (scatter, point) of all dates when events of one cycle share part of their deviation."""
    if share == 0.0:
        alone: FloatArray = date_log_likelihood(events, expected, s[:, None, None]).sum(axis=-1)
        return alone
    nodes, node_weights = np.polynomial.hermite_e.hermegauss(_HERMITE)
    common = np.sqrt(share) * s[:, None, None]
    own = np.sqrt(1.0 - share) * s[:, None, None]
    terms = np.stack([date_log_likelihood(events, expected + common * u, own) for u in nodes])
    total = np.zeros(expected.shape[:2])
    for cycle in np.unique(cycles):
        mine = terms[..., cycles == cycle].sum(axis=-1)
        top = mine.max(axis=0)
        lead = np.log(node_weights / node_weights.sum())[:, None, None]
        total += top + np.log(np.exp(mine - top + lead).sum(axis=0))
    return total


def _even_normals(width: int) -> FloatArray:
    """Normal deviates that fill a space evenly, each with its opposite: the same ones each time."""
    from scipy.special import ndtri

    # The generalised golden ratio gives each dimension a stride of its own (Roberts 2018, memory).
    ratio = 2.0
    for _ in range(40):
        ratio = (1.0 + ratio) ** (1.0 / (width + 1.0))
    strides = ratio ** -np.arange(1.0, width + 1.0)
    share = (0.5 + strides[None, :] * np.arange(1.0, _POINTS // 2 + 1.0)[:, None]) % 1.0
    z = ndtri(np.clip(share, 1e-6, 1.0 - 1e-6))
    both = np.concatenate([z, -z])
    # Standardised as a whole, so that few points carry the covariance exactly.
    root = np.linalg.cholesky(both.T @ both / _POINTS)
    standard: FloatArray = np.linalg.solve(root, both.T).T
    return standard
