"""The stars' own light: its level in each band of each source, from the phases without dust.

Sources differ by hundredths to tenths of a magnitude for reasons that are none of the stars'. Each has a
level of its own, tied loosely to the other sources of the band, so that a new instrument is no onset.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from campaign.physics.lightcolumns import LN_PER_MAG, BoolArray, FloatArray, IntArray, LightColumns

# How far sources of one band differ, one sigma; common practice, no source.
SOURCE_OFFSET_MAG = 0.08
# Nobody's photometry is better than its error bars by less than this; common practice, no source.
FLOOR_MAG = 0.004
UNKNOWN_ERROR_MAG = 0.05
RED_BLOCK_D = 60.0
# No two sources of one band differ by so much: a group that stands so far above saw only dust.
IMPOSSIBLE_OFFSET_MAG = 0.3
_ENOUGH_POINTS = 5
# Limits this much deeper than a level, as many as its points, contradict it.
_DEEPER_MAG, _FEWEST_DEEPER = 0.05, 3
_MAD_TO_SIGMA = 1.4826
_FARTHEST_LN = 50.0
# Half of the shortest interval that holds 40 % of a normal distribution, in sigma.
_SHORTEST_SHARE, _SHORTEST_HALF = 0.4, 0.5244
# Where a star was never seen, its flux is anything below the deepest limit: centre and sigma.
_HIDDEN_BASE, _HIDDEN_SIGMA = 0.5, 0.29


@dataclass(frozen=True, slots=True, eq=False)
class StellarLevels:
    """Level of each group: magnitude, its one-sigma error, scatter beyond the error bars, red noise.

    ``base`` is the stars' flux in units of the flux at ``level_mag``: 1, or 0.5 where the stars were never
    seen and ``level_mag`` is the deepest limit. A level that is not known at all is NaN. ``points`` is how
    many quiet measurements a level rests on; 0 where it is borrowed from other sources of the band.
    """

    level_mag: FloatArray
    sigma_mag: FloatArray
    jitter_mag: FloatArray
    red_mag: FloatArray
    base: FloatArray
    base_sigma: FloatArray
    points: IntArray


def stellar_levels(columns: LightColumns, quiet: BoolArray) -> StellarLevels:
    """Level of every group from its quiet measurements.

    Parameters
    ----------
    columns : LightColumns
        The light curve; mag and days.
    quiet : ndarray of bool
        Which points are believed to show the stars alone (dimensionless).

    Returns
    -------
    StellarLevels
        Levels and errors, mag.

    Notes
    -----
    Accuracy: the error counts white noise, noise that is common to 60 days, and how far sources differ. The
    level is a mean after points at 4 sigma from the median were left out: outliers of a fifth of the points
    move it by less than its error.

    Source: median absolute deviation times 1.4826 (Rousseeuw & Croux 1993, JASA 88, 1273); levels of sources
    as a normal population about the band's, its width 0.08 mag (common practice, no source).

    Examples
    --------
    >>> n = 40
    >>> z = np.zeros(n)
    >>> curve = LightColumns(np.arange(n) * 9.0, z, 6.2 + 0.02 * np.cos(2.4 * np.arange(n)), z + 0.02,
    ...     np.zeros(n, np.int8), z, np.zeros(n, int), np.zeros(1, int))
    >>> levels = stellar_levels(curve, np.ones(n, bool))
    >>> round(float(levels.level_mag[0]), 2), bool(levels.sigma_mag[0] < 0.005)
    (6.2, True)
    """
    groups = columns.group_band.size
    level, variance = np.full(groups, np.nan), np.full(groups, np.inf)
    jitter, red = np.full(groups, FLOOR_MAG), np.zeros(groups)
    points = np.zeros(groups, dtype=np.int64)
    chosen = quiet & columns.measured
    for number in range(groups):
        mine = np.flatnonzero(chosen & (columns.group == number))
        points[number] = mine.size
        if mine.size:
            level[number], variance[number], jitter[number], red[number] = _own_level(
                columns.bmjd_tdb[mine], columns.mag[mine], columns.error_mag[mine]
            )
            if _is_contradicted(columns, quiet, number, level[number], points[number]):
                level[number], variance[number], points[number] = np.nan, np.inf, 0
                jitter[number], red[number] = FLOOR_MAG, 0.0
    base, base_sigma = np.ones(groups), np.zeros(groups)
    for band in np.unique(columns.group_band):
        mine = np.flatnonzero(columns.group_band == band)
        _tie_together(mine, level, variance, points)
        unknown = mine[np.isnan(level[mine])]
        if unknown.size:
            _hide(columns, quiet, unknown, band, level, base, base_sigma)
            variance[unknown] = 0.0
    return StellarLevels(level, np.sqrt(variance), jitter, red, base, base_sigma, points)


def _is_contradicted(columns: LightColumns, quiet: BoolArray, number: int, level: float, points: int) -> bool:
    """Whether as many limits say that the stars are fainter: then only dust was ever measured."""
    band = columns.group_band[number]
    deeper = quiet & (columns.limit_side > 0) & (columns.band == band) & (columns.mag > level + _DEEPER_MAG)
    return int(deeper.sum()) >= max(_FEWEST_DEEPER, points)


def _own_level(times: FloatArray, mags: FloatArray, errors: FloatArray) -> tuple[float, float, float, float]:
    """Level, its variance, scatter beyond the errors and red noise of one group's quiet measurements."""
    count = mags.size
    middle = float(np.median(mags))
    spread = _MAD_TO_SIGMA * float(np.median(np.abs(mags - middle)))
    known = errors[~np.isnan(errors)]
    typical = float(np.median(known)) if known.size else None
    jitter = FLOOR_MAG
    if typical is None:
        error = np.full(count, max(spread, FLOOR_MAG) if count >= _ENOUGH_POINTS else UNKNOWN_ERROR_MAG)
    else:
        error = np.where(np.isnan(errors), max(typical, UNKNOWN_ERROR_MAG), errors)
        if count >= 2 * _ENOUGH_POINTS:
            # The spread of few points is itself uncertain; errors are believed that far.
            beyond = spread**2 - float(np.median(error)) ** 2 * (1.0 + 1.5 / np.sqrt(count))
            jitter = max(FLOOR_MAG, float(np.sqrt(max(beyond, 0.0))))
    sigma = np.hypot(error, jitter)
    kept = np.abs(mags - middle) <= 4.0 * sigma
    weight = np.where(kept, sigma**-2.0, 0.0)
    if not weight.any():
        weight = sigma**-2.0
    level = float(weight @ mags / weight.sum())
    red, blocks = _red_noise(times[kept], (mags - level)[kept], sigma[kept])
    variance = 1.0 / float(weight.sum()) + red**2 / blocks + 1e-6
    return level, variance, jitter, red


def _red_noise(times: FloatArray, residuals: FloatArray, sigma: FloatArray) -> tuple[float, int]:
    """Scatter of 60-day means beyond white noise, mag, and the number of such blocks with points."""
    if times.size < 2 * _ENOUGH_POINTS:
        return 0.0, max(times.size, 1)
    block = ((times - times[0]) // RED_BLOCK_D).astype(np.int64)
    starts = np.flatnonzero(np.diff(block, prepend=block[0] - 1))
    counts = np.diff(np.append(starts, block.size))
    weight = sigma**-2.0
    total = np.add.reduceat(weight, starts)
    means = np.add.reduceat(weight * residuals, starts) / total
    several = counts > 1
    if several.sum() < _ENOUGH_POINTS:
        return 0.0, starts.size
    # Robust, and shrunk by its own uncertainty: noise alone shows no red noise.
    spread = (_MAD_TO_SIGMA * np.median(np.abs(means[several]))) ** 2
    white = float(np.median(1.0 / total[several]))
    beyond = spread - white * (1.0 + 2.0 / np.sqrt(several.sum()))
    return float(np.sqrt(max(beyond, 0.0))), int(starts.size)


def _tie_together(mine: IntArray, level: FloatArray, variance: FloatArray, points: IntArray) -> None:
    """Sources of one band lend each other their level, within how far sources differ; in place."""
    known = mine[points[mine] > 0]
    if not known.size:
        return
    width = SOURCE_OFFSET_MAG**2
    for number in mine:
        others = known[known != number]
        if not others.size:
            continue
        weight = 1.0 / (variance[others] + width)
        theirs = float(weight @ level[others] / weight.sum())
        prior = 1.0 / float(weight.sum()) + width
        if points[number] == 0:
            level[number], variance[number] = theirs, prior
        elif points[number] < 2 * _ENOUGH_POINTS:
            share = prior / (prior + variance[number])
            level[number] = share * level[number] + (1.0 - share) * theirs
            variance[number] *= share


def _hide(
    columns: LightColumns, quiet: BoolArray, unknown: IntArray, band: int, level: FloatArray,
    base: FloatArray, base_sigma: FloatArray,
) -> None:  # fmt: skip
    """Where stars were never seen: their flux lies below the deepest limit; in place."""
    faint = quiet & (columns.limit_side > 0) & (columns.band == band)
    if not faint.any():
        return
    level[unknown] = float(columns.mag[faint].max())
    base[unknown], base_sigma[unknown] = _HIDDEN_BASE, _HIDDEN_SIGMA


def first_quiet(columns: LightColumns) -> BoolArray:
    """A first guess which points show the stars alone: the densest level of each group, and all below it.

    Parameters
    ----------
    columns : LightColumns
        The light curve; mag and days.

    Returns
    -------
    ndarray of bool
        One for each point (dimensionless).

    Notes
    -----
    Accuracy: right while the quiet share of a group's points is over about two fifths, or its dust is
    spread over more magnitudes than its noise.

    Source: shortest interval with a given share of the points (Rousseeuw & Leroy 1987, Robust Regression and
    Outlier Detection, section 4.2), with two fifths in place of one half.

    Examples
    --------
    >>> n = 30
    >>> z = np.zeros(n)
    >>> mag = np.where(np.arange(n) < 20, 6.0 + 0.001 * np.arange(n), 5.0 - 0.05 * np.arange(n))
    >>> curve = LightColumns(np.arange(n) * 9.0, z, mag, z + 0.02, np.zeros(n, np.int8), z,
    ...     np.zeros(n, int), np.zeros(1, int))
    >>> int(first_quiet(curve).sum())
    20
    """
    quiet = columns.limit_side > 0
    centres: dict[int, tuple[float, float, int]] = {}
    for number in range(columns.group_band.size):
        mine = np.flatnonzero(columns.measured & (columns.group == number))
        if mine.size >= _ENOUGH_POINTS:
            centres[number] = _centre(columns, mine, 0.0)
    for band in np.unique(columns.group_band):
        groups = np.flatnonzero(columns.group_band == band)
        mine = np.flatnonzero(columns.measured & (columns.band == band))
        if mine.size >= _ENOUGH_POINTS and not any(int(g) in centres for g in groups):
            # Several sources with a few points each: together they have a level, to within their offsets.
            centres |= {int(g): _centre(columns, mine, SOURCE_OFFSET_MAG) for g in groups}
    for number, (centre, sigma, _) in centres.items():
        alike = [
            (own, count) for g, (own, _, count) in centres.items()
            if columns.group_band[g] == columns.group_band[number]
        ]  # fmt: skip
        if centre < _weighted_median(alike) - IMPOSSIBLE_OFFSET_MAG:
            continue
        quiet |= (columns.group == number) & columns.measured & (columns.mag > centre - 3.0 * sigma)
    return quiet


def _centre(columns: LightColumns, mine: IntArray, offset_mag: float) -> tuple[float, float, int]:
    """Densest level of some points, its sigma, and how many points there are."""
    errors = columns.error_mag[mine]
    known = errors[~np.isnan(errors)]
    typical = float(np.median(known)) if known.size else UNKNOWN_ERROR_MAG
    centre, sigma = _densest(np.sort(columns.mag[mine]))
    return centre, float(np.hypot(max(sigma, typical), offset_mag)), int(mine.size)


def _densest(ordered: FloatArray) -> tuple[float, float]:
    """Centre of the shortest interval that holds two fifths of the points, and the sigma it stands for."""
    count = max(3, int(np.ceil(_SHORTEST_SHARE * ordered.size)))
    widths = ordered[count - 1 :] - ordered[: ordered.size - count + 1]
    # Of equally dense ones the faintest: dust only adds light.
    place = int(widths.size - 1 - np.argmin(widths[::-1]))
    return 0.5 * float(ordered[place] + ordered[place + count - 1]), float(
        widths[place]
    ) / 2.0 / _SHORTEST_HALF


def _weighted_median(pairs: list[tuple[float, int]]) -> float:
    ordered = sorted(pairs)
    half = 0.5 * sum(count for _, count in ordered)
    total = 0
    for value, count in ordered:
        total += count
        if total >= half:
            return value
    return ordered[-1][0]


def point_sigma_mag(columns: LightColumns, levels: StellarLevels) -> FloatArray:
    """One-sigma noise of each point: its error bar, the scatter beyond it, and its share of red noise.

    Parameters
    ----------
    columns : LightColumns
        The light curve; mag and days.
    levels : StellarLevels
        See :func:`stellar_levels`; mag.

    Returns
    -------
    ndarray
        mag; the level's own error is not in it.

    Notes
    -----
    Accuracy: noise that is common to k points of 60 days is counted k times over, so that their mean has the
    right error although they are then treated as independent.

    Source: variance of a mean of correlated values.

    Examples
    --------
    >>> z = np.zeros(6)
    >>> curve = LightColumns(np.arange(6) * 400.0, z, z + 6.0, z + 0.03, np.zeros(6, np.int8), z,
    ...     np.zeros(6, int), np.zeros(1, int))
    >>> levels = stellar_levels(curve, np.ones(6, bool))
    >>> point_sigma_mag(curve, levels).round(4).tolist()
    [0.0303, 0.0303, 0.0303, 0.0303, 0.0303, 0.0303]
    """
    jitter, red = levels.jitter_mag[columns.group], levels.red_mag[columns.group]
    error = np.where(np.isnan(columns.error_mag), np.maximum(UNKNOWN_ERROR_MAG, jitter), columns.error_mag)
    variance = error**2 + jitter**2
    for number in np.flatnonzero(levels.red_mag > 0.0):
        mine = np.flatnonzero(columns.group == number)
        times = columns.bmjd_tdb[mine]
        near = np.searchsorted(times, times + RED_BLOCK_D / 2) - np.searchsorted(
            times, times - RED_BLOCK_D / 2
        )
        variance[mine] += red[mine] ** 2 * (np.minimum(near, 20) - 1)
    return np.sqrt(variance)


def log_excess(columns: LightColumns, levels: StellarLevels) -> FloatArray:
    """ln of flux over the stars' flux, point by point; for a limit, that of the limit.

    Parameters
    ----------
    columns : LightColumns
        The light curve; mag.
    levels : StellarLevels
        Levels, mag.

    Returns
    -------
    ndarray
        Natural logarithm (dimensionless); NaN where the level is unknown.

    Notes
    -----
    Accuracy: a few units in the last place.

    Source: m = -2.5 log10 F + constant (Pogson 1856, MNRAS 17, 12).

    Examples
    --------
    >>> z = np.zeros(6)
    >>> curve = LightColumns(np.arange(6) * 400.0, z, np.array([6, 6, 6, 6, 6, 5.0]), z + 0.03,
    ...     np.zeros(6, np.int8), z, np.zeros(6, int), np.zeros(1, int))
    >>> log_excess(curve, stellar_levels(curve, curve.mag > 5.5)).round(3).tolist()
    [0.0, 0.0, 0.0, 0.0, 0.0, 0.921]
    """
    excess: FloatArray = LN_PER_MAG * (levels.level_mag[columns.group] - columns.mag) - np.log(
        levels.base[columns.group]
    )
    # Beyond this no star differs from a mistyped magnitude, and squares stay numbers.
    return np.clip(excess, -_FARTHEST_LN, _FARTHEST_LN)
