"""When a rise began: the posterior of the onset from a broken line in flux, its shape marginalised.

Below the onset the flux is the stars'; from there the dust's share rises to a top in one of several shapes
and then declines. Amplitude and top are free in every band, the onset is common. Where no point lies on the
rise, what remains is a bracket, whose early side reaches as far as the last quiet points allow.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from campaign.physics.lightcolumns import BoolArray, FloatArray, IntArray
from campaign.physics.riseshapes import RISE_WEIGHTS, rise_shapes

# Median, 68 % and 95 % equal-tailed: the order of every summary, which ends with the standard deviation.
SUMMARY = (0.5, 0.16, 0.84, 0.025, 0.975)
# How fast the flux declines after the top, per day of e-folding; any may be true.
_DECLINES_PER_D = np.array([0.0, 0.0006, 0.0012, 0.002, 0.003, 0.0045, 0.0065, 0.01])
_DECLINES_KEPT = 4
# Below this any length of the rise is as probable, above it any ratio of lengths; common practice, no source.
_USUAL_RISE_D = 100.0
_TOPS, _LAST_TOPS = 12, 14
_ONSETS = 41
_ROUNDS = 3
# ln of the probability, below its highest, that is not looked at: of onsets; of tops, whose grid is coarser.
_DEEPEST, _TOP_DEEPEST = 14.0, 12.0
_WILD_SIGMA = 3.5
_FIRST_TRUST, _SECOND_TRUST = 0.12, 0.03
_NEWTON_STEPS = 6
# No limit counts beyond so many sigma, and no dust outshines the stars so much: sums stay numbers.
_FARTHEST, _BRIGHTEST = 1e4, 1e6
_IMPOSSIBLE = -1e6  # ln of a probability; finite, so that differences stay numbers


@dataclass(frozen=True, slots=True, eq=False)
class BandPoints:
    """One band's points around a rise, in units of the stars' flux.

    ``excess`` is flux less the stars' (and less what an earlier episode left); for a limit, that of the
    limit. ``scale`` is by how much the point moves when its group's level moves by all of itself;
    ``group_sigma`` the one-sigma error of those levels, as shares. ``top_from`` and ``top_until`` bound the
    time of the top.
    """

    bmjd_tdb: FloatArray
    time_sigma_d: FloatArray
    excess: FloatArray
    sigma: FloatArray
    limit_side: IntArray
    scale: FloatArray
    group: IntArray
    group_sigma: FloatArray
    top_from: float
    top_until: float


@dataclass(frozen=True, slots=True, eq=False)
class RisePosterior:
    """Posterior of onset and, for each band, of top and amplitude; grids of equal steps.

    ``onset_bmjd_tdb`` and ``onset_density`` (per day), ``top_bmjd_tdb`` and ``top_density`` by band,
    ``amplitude`` and ``amplitude_errors`` (sizes below and above) by band in units of the stars' flux,
    ``shape_share`` in the order of ``riseshapes.RISE_NAMES``. ``chi2`` and ``dof`` are those of the best
    model over all bands; ``at_bound`` says that the onset leans on the earliest date that was allowed.
    """

    onset_bmjd_tdb: FloatArray
    onset_density: FloatArray
    top_bmjd_tdb: tuple[FloatArray, ...]
    top_density: tuple[FloatArray, ...]
    amplitude: FloatArray
    amplitude_errors: FloatArray
    shape_share: FloatArray
    chi2: float
    dof: int
    at_bound: bool


@dataclass(slots=True)
class _BandGrid:
    """ln of the likelihood of one band over (top, shape, onset, decline), and the amplitudes there."""

    tops: FloatArray
    declines: FloatArray
    ln: FloatArray
    amplitude: FloatArray
    information: FloatArray

    def over_declines(self, inflation: float) -> FloatArray:
        """ln of the likelihood over (top, shape, onset), any decline."""
        ln = self.ln / inflation if inflation > 1.0 else self.ln
        return _logsumexp(ln, axis=3)


def fit_rise(bands: Sequence[BandPoints], earliest: float, latest: float) -> RisePosterior:
    """Posterior of the onset that all bands share.

    Parameters
    ----------
    bands : sequence of BandPoints
        Points around the rise; the first band's top carries the prior. Days and units of the stars' flux.
    earliest, latest : float
        Onsets outside are not considered, ``bmjd_tdb``, days.

    Returns
    -------
    RisePosterior
        Days, per day, and units of the stars' flux.

    Raises
    ------
    ValueError
        If there is no band or no time between ``earliest`` and ``latest``.

    Notes
    -----
    Accuracy: grids are refined three times to a thirtieth of the interval that matters. Prior: onset flat,
    length of the rise flat up to 100 d and in its logarithm beyond, shapes as weighted; amplitude profiled
    (flat in its logarithm). A best chi-square above what noise explains widens everything by its root.

    Source: segmented regression by profile (Hudson 1966, JASA 61, 1097), levels of groups marginalised as
    common normal errors; limits as normal tails (Tobin 1958, Econometrica 26, 24).

    Examples
    --------
    >>> t = np.arange(0.0, 200.0, 10.0)
    >>> dust = np.clip(t - 100.0, 0.0, None) / 100.0
    >>> band = BandPoints(t, 0.0 * t, dust, np.full(t.size, 0.02), np.zeros(t.size, int), 1.0 + dust,
    ...     np.zeros(t.size, int), np.array([0.005]), 190.0, 190.0)
    >>> fit = fit_rise([band], 0.0, 190.0)
    >>> onset = posterior_quantiles(fit.onset_bmjd_tdb, fit.onset_density, [0.5])[0]
    >>> bool(abs(onset - 100.0) < 5.0)
    True
    """
    if not bands or not earliest < latest:
        raise ValueError("a rise needs points and some time to happen in")
    onsets = np.linspace(earliest, latest, _ONSETS)
    tops = [_top_grid(band.top_from, band.top_until) for band in bands]
    declines = [_DECLINES_PER_D for _ in bands]
    # A first look that no single point can lead astray: every flux is trusted to an eighth only.
    points = [replace(b, sigma=np.hypot(b.sigma, _FIRST_TRUST * b.scale)) for b in bands]
    inflation, chi2, dof = 1.0, 0.0, 1
    for turn in range(_ROUNDS):
        grids = [
            _band_grid(p, onsets, t, d, first=i == 0)
            for i, (p, t, d) in enumerate(zip(points, tops, declines, strict=True))
        ]
        own = [grid.over_declines(inflation) for grid in grids]
        by_band = [_logsumexp(ln, axis=0) for ln in own]
        ln = np.log(RISE_WEIGHTS)[:, None] + sum(by_band)
        top_lns = [_logsumexp(o + (ln - b), axis=(1, 2)) for o, b in zip(own, by_band, strict=True)]
        marginal = _logsumexp(ln, axis=0)
        if turn == _ROUNDS - 1:
            break
        trust = _SECOND_TRUST if turn == 0 else 0.0
        points = [_calmed(b, g, onsets, ln, trust) for b, g in zip(bands, grids, strict=True)]
        if turn > 0:
            chi2, dof = _goodness(points, grids, onsets, ln)
            inflation = max(1.0, chi2 / dof) if chi2 > dof + 2.0 * np.sqrt(2.0 * dof) else 1.0
        declines = [_likely_declines(g) for g in grids]
        count = _LAST_TOPS if turn == _ROUNDS - 2 else _TOPS
        tops = [_zoomed(g.tops, t, count, _TOP_DEEPEST) for g, t in zip(grids, top_lns, strict=True)]
        onsets = _zoomed(onsets, marginal, _ONSETS, _DEEPEST)
    shape = _logsumexp(ln, axis=1)
    share = np.exp(shape - shape.max())
    amplitude, amplitude_errors = _amplitudes(grids, ln, own, by_band, inflation)
    return RisePosterior(
        onsets,
        _density(onsets, marginal),
        tuple(g.tops for g in grids),
        tuple(_density(g.tops, t) for g, t in zip(grids, top_lns, strict=True)),
        amplitude,
        amplitude_errors,
        share / share.sum(),
        chi2,
        dof,
        bool(onsets[0] <= earliest + 1e-9 and marginal[0] > marginal.max() - 3.0),
    )


def posterior_quantiles(
    grid: FloatArray, density: FloatArray, shares: Sequence[float] | FloatArray
) -> FloatArray:
    """Quantiles of a density given at equal steps.

    Parameters
    ----------
    grid : ndarray
        Places in equal steps, days or any other unit.
    density : ndarray
        Density there, any scale.
    shares : sequence of float
        Probabilities (dimensionless), 0 to 1.

    Returns
    -------
    ndarray
        In the unit of ``grid`` (days).

    Notes
    -----
    Accuracy: linear between the places of the grid.

    Source: definition of a quantile, by the trapezium rule.

    Examples
    --------
    >>> grid = np.linspace(0.0, 1.0, 101)
    >>> posterior_quantiles(grid, np.ones(101), [0.16, 0.5]).round(3).tolist()
    [0.16, 0.5]
    """
    if grid.size == 1:
        return np.full(len(shares), grid[0])
    below = np.concatenate([[0.0], np.cumsum(0.5 * (density[1:] + density[:-1]) * np.diff(grid))])
    found: FloatArray = np.interp(np.asarray(shares) * below[-1], below, grid)
    return found


def posterior_summary(grid: FloatArray, density: FloatArray) -> FloatArray:
    """Median, 68 % and 95 % equal-tailed bounds, and standard deviation of a density at equal steps.

    Parameters
    ----------
    grid, density : ndarray
        Places in equal steps (days or any other unit) and the density there, any scale.

    Returns
    -------
    ndarray, shape (6,)
        Quantiles 0.5, 0.16, 0.84, 0.025, 0.975 and the standard deviation, in the unit of ``grid`` (days).

    Notes
    -----
    Accuracy: as :func:`posterior_quantiles`.

    Source: definitions.

    Examples
    --------
    >>> grid = np.linspace(-5.0, 7.0, 1201)
    >>> posterior_summary(grid, np.exp(-0.5 * (grid - 1.0) ** 2)).round(2).tolist()
    [1.0, 0.01, 1.99, -0.96, 2.96, 1.0]
    """
    quantiles = posterior_quantiles(grid, density, SUMMARY)
    total = float(density.sum())
    mean = float(density @ grid) / total
    spread = float(density @ (grid - mean) ** 2) / total
    return np.append(quantiles, np.sqrt(spread))


def _top_grid(first: float, last: float) -> FloatArray:
    return np.linspace(first, last, _TOPS) if last > first else np.array([first])


def _zoomed(grid: FloatArray, ln: FloatArray, count: int, deepest: float) -> FloatArray:
    """Equal steps over the part of a grid that matters, a step to spare on either side."""
    if grid.size == 1:
        return grid
    alive = np.flatnonzero(ln >= ln.max() - deepest)
    first, last = max(alive[0] - 1, 0), min(alive[-1] + 1, grid.size - 1)
    return np.linspace(grid[first], grid[last], count)


def _logsumexp(ln: FloatArray, axis: int | tuple[int, ...]) -> FloatArray:
    top = ln.max(axis=axis, keepdims=True)
    return np.asarray(np.log(np.exp(ln - top).sum(axis=axis)) + np.squeeze(top, axis=axis), dtype=np.float64)


def _likely_declines(grid: _BandGrid) -> FloatArray:
    """The declines that fit best at any onset and top, a few of them."""
    best = grid.ln.max(axis=(0, 1, 2))
    order = np.argsort(best)[::-1][:_DECLINES_KEPT]
    kept: FloatArray = grid.declines[np.sort(order[best[order] >= best[order[0]] - _DEEPEST])]
    return kept


def _band_grid(
    band: BandPoints, onsets: FloatArray, tops: FloatArray, declines: FloatArray, *, first: bool
) -> _BandGrid:
    """Likelihood of one band, the amplitude at its best for every (shape, onset, top, decline)."""
    measured = band.limit_side == 0
    t = band.bmjd_tdb[measured]
    weight = band.sigma[measured] ** -2.0
    projector, y, y_projected = _group_projector(band, measured, weight)
    # Points before the earliest onset are quiet in every model: they are in the groups' sums already.
    active = t > onsets[0]
    t, weight, projector, y = t[active], weight[active], projector[active], y[active]
    rise, fall = _templates(t, onsets, tops, declines)
    columns = np.concatenate([(weight * y)[:, None], projector], axis=1)
    # What the levels of groups explain is taken out of each product of two columns; before and after the top
    # add up, but for the product of the two.
    rise_sums, fall_sums = rise @ columns, fall @ columns
    rise_score = rise_sums[..., 0] - rise_sums[..., 1:] @ y_projected
    fall_score = fall_sums[..., 0] - fall_sums[..., 1:] @ y_projected
    rise_square = (rise * rise) @ weight - (rise_sums[..., 1:] ** 2).sum(axis=-1)
    fall_square = (fall * fall) @ weight - (fall_sums[..., 1:] ** 2).sum(axis=-1)
    shape = (*rise_square.shape, declines.size)
    both = np.matmul(
        rise_sums[..., 1:].reshape(tops.size, -1, projector.shape[1]),
        fall_sums[..., 1:].transpose(0, 2, 1),
    ).reshape(shape)
    information = rise_square[..., None] + fall_square[:, None, None, :] - 2.0 * both
    np.maximum(information, 1e-12, out=information)
    score = rise_score[..., None] + fall_score[:, None, None, :]
    amplitude = np.clip(score / information, 0.0, _BRIGHTEST)
    if not measured.all():
        amplitude, ln = _with_limits(band, ~measured, onsets, tops, declines, amplitude, information, score)
    else:
        ln = amplitude * (score - 0.5 * amplitude * information)
    length = tops[:, None] - onsets[None, :]
    prior = np.where(length > 0.0, 0.0, _IMPOSSIBLE)
    if first:
        prior = prior - np.log(np.maximum(length, 0.0) + _USUAL_RISE_D)
    ln += prior[:, None, :, None]
    return _BandGrid(tops, declines, ln, amplitude, information)


def _templates(
    t: FloatArray, onsets: FloatArray, tops: FloatArray, declines: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Rises (top, shape, onset, point) up to the top, and falls (top, decline, point) from there on."""
    before = t[None, :] <= tops[:, None]
    length = np.maximum(tops[:, None] - onsets[None, :], 1e-3)
    share = (t[None, None, :] - onsets[None, :, None]) / length[:, :, None]
    # Above the top nothing of the rise is left: a share below zero has risen to nothing.
    share = np.where(before[:, None, :], share, -1.0)
    rise = np.moveaxis(rise_shapes(share), 0, 1)
    age = np.clip(t[None, None, :] - tops[:, None, None], 0.0, None) * declines[None, :, None]
    fall = np.exp(-age) * ~before[:, None, :]
    return rise, fall


def _group_projector(
    band: BandPoints, measured: BoolArray, weight: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Columns that take out what an error of each group's level explains (Sherman-Morrison)."""
    y = band.excess[measured]
    scale, group = band.scale[measured], band.group[measured]
    numbers = np.arange(band.group_sigma.size)
    member = (group[:, None] == numbers[None, :]) * (scale * weight)[:, None]
    total = (scale[:, None] * member).sum(axis=0)
    variance = band.group_sigma**2
    projector = member * np.sqrt(variance / (1.0 + variance * total))[None, :]
    return projector, y, projector.T @ y


def _with_limits(
    band: BandPoints, limits: BoolArray, onsets: FloatArray,
    tops: FloatArray, declines: FloatArray, amplitude: FloatArray, information: FloatArray, score: FloatArray,
) -> tuple[FloatArray, FloatArray]:  # fmt: skip
    """Amplitude at its best and ln likelihood with too-faint and saturated points, by Newton's steps."""
    from scipy.special import log_ndtr

    # A limit before the earliest onset says the same of every model.
    limits = limits & (band.bmjd_tdb > onsets[0])
    t, bound, sigma = band.bmjd_tdb[limits], band.excess[limits], band.sigma[limits]
    side = band.limit_side[limits].astype(float)
    rise, fall = _templates(t, onsets, tops, declines)
    dust = rise[:, :, :, None, :] + fall[:, None, None]
    slope = -side * dust / sigma
    for _ in range(_NEWTON_STEPS):
        z = np.clip(side * (bound - amplitude[..., None] * dust) / sigma, -_FARTHEST, _FARTHEST)
        mills = np.exp(-0.5 * z * z - 0.9189385332046727 - log_ndtr(z))
        gradient = score - amplitude * information + (mills * slope).sum(axis=-1)
        curvature = information + (mills * (z + mills) * slope**2).sum(axis=-1)
        amplitude = np.clip(amplitude + gradient / np.maximum(curvature, 1e-12), 0.0, _BRIGHTEST)
    z = side * (bound - amplitude[..., None] * dust) / sigma
    return amplitude, amplitude * (score - 0.5 * amplitude * information) + log_ndtr(z).sum(axis=-1)


def _density(grid: FloatArray, ln: FloatArray) -> FloatArray:
    density: FloatArray = np.exp(ln - ln.max())
    area = float(np.trapezoid(density, grid)) if grid.size > 1 else 1.0
    if area > 0.0:
        density /= area
    return density


def _best(grid: _BandGrid, ln: FloatArray) -> tuple[int, int, int, int, float]:
    """The most probable cell of one band within the most probable shape and onset of all."""
    shape, onset = np.unravel_index(int(np.argmax(ln)), ln.shape)
    own = grid.ln[:, shape, onset]
    top, decline = np.unravel_index(int(np.argmax(own)), own.shape)
    amplitude = float(grid.amplitude[top, shape, onset, decline])
    return int(shape), int(onset), int(top), int(decline), amplitude


def _model(t: FloatArray, grid: _BandGrid, onsets: FloatArray, ln: FloatArray) -> FloatArray:
    """The best model's excess in one band at some instants."""
    shape, onset, top, decline, amplitude = _best(grid, ln)
    start, peak = float(onsets[onset]), float(grid.tops[top])
    rise = rise_shapes((t - start) / max(peak - start, 1e-3))[shape]
    fall = np.exp(-np.clip(t - peak, 0.0, None) * grid.declines[decline])
    model: FloatArray = amplitude * np.where(t <= peak, rise, fall)
    return model


def _calmed(
    band: BandPoints, grid: _BandGrid, onsets: FloatArray, ln: FloatArray, trust: float
) -> BandPoints:
    """Noise in proportion to the model's flux, not to the measured one, and wild points held back.

    An uncertain date is as much noise as the model changes within it. ``trust`` is the share of the flux to
    which the model itself is believed.
    """
    t, early_late = band.bmjd_tdb, band.time_sigma_d
    model = _model(t, grid, onsets, ln)
    moved = 0.5 * (_model(t + early_late, grid, onsets, ln) - _model(t - early_late, grid, onsets, ln))
    measured = band.limit_side == 0
    scale = np.where(measured, np.maximum(1.0 + model, 0.3), band.scale)
    sigma = np.where(measured, np.hypot(band.sigma * scale / band.scale, moved), band.sigma)
    wild = np.where(measured, np.abs(band.excess - model) / np.hypot(sigma, trust * scale), 0.0)
    sigma = np.where(wild > _WILD_SIGMA, sigma * wild / _WILD_SIGMA, sigma)
    return replace(band, sigma=sigma, scale=scale)


def _goodness(
    points: Sequence[BandPoints], grids: Sequence[_BandGrid], onsets: FloatArray, ln: FloatArray
) -> tuple[float, int]:
    """Chi-square of the best model over the points that it explains, and its degrees of freedom."""
    chi2, count = 0.0, 0
    for band, grid in zip(points, grids, strict=True):
        measured = band.limit_side == 0
        z = ((band.excess - _model(band.bmjd_tdb, grid, onsets, ln)) / band.sigma)[measured]
        chi2 += float((z**2).sum())
        count += z.size
    return chi2, max(count - 2 - 2 * len(points), 1)


def _amplitudes(
    grids: Sequence[_BandGrid], ln: FloatArray, own: Sequence[FloatArray], by_band: Sequence[FloatArray],
    inflation: float,
) -> tuple[FloatArray, FloatArray]:  # fmt: skip
    """Median and two-sided error of each band's amplitude: its own and what the unknown top and shape add."""
    value, sizes = [], []
    for grid, mine, total in zip(grids, own, by_band, strict=True):
        joint = mine + (ln - total)
        weight = np.exp(joint - joint.max())
        # The best decline of each stands for all of them.
        best = np.argmax(grid.ln, axis=3)[..., None]
        amplitude = np.take_along_axis(grid.amplitude, best, axis=3)[..., 0]
        information = np.take_along_axis(grid.information, best, axis=3)[..., 0]
        noise = np.sqrt(inflation / information)
        # Quantiles, for where the top is unseen a few models would put it anywhere.
        order = np.argsort(amplitude, axis=None)
        below = np.cumsum(weight.ravel()[order])
        middle, low, high = np.interp(
            np.array(SUMMARY[:3]) * below[-1], below - 0.5 * weight.ravel()[order], amplitude.ravel()[order]
        )
        value.append(middle)
        sizes.append(np.hypot([middle - low, high - middle], noise.flat[int(np.argmax(weight))]))
    return np.array(value), np.array(sizes)
