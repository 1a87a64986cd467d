"""When a light curve stands above the stars' level: spans of excess, found by two states in sequence."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.physics.lightcolumns import LN_PER_MAG, BoolArray, FloatArray, LightColumns
from campaign.physics.stellarlevel import (
    StellarLevels,
    first_quiet,
    log_excess,
    point_sigma_mag,
    stellar_levels,
)

# What an excess may be, in units of the stars: equal chances from a trace to eight times.
_EXCESSES = np.geomspace(0.05, 8.0, 10)
# In a blue band dust may not show at all; so much of the chance is kept for that.
_BLIND_SHARE = 0.15
# A wild point among quiet ones, and how wild: common practice, no source.
_OUTLIER_SHARE, _OUTLIER_LN = 0.015, 0.3
# What the log odds of a span must pay for its beginning and its end.
_CHANGE_COST = 4.0
_LEAST_LOG_ODDS = 10.0
_POINT_SIGMA = 2.5
_FEWEST_POINTS, _FEWEST_NIGHTS = 3, 2
_NIGHT_D = 0.7
_ROUNDS = 3


@dataclass(frozen=True, slots=True)
class BrightSpan:
    """Points ``first`` to ``last`` (places in the light curve) stand above the level together."""

    first: int
    last: int
    log_odds: float


@dataclass(frozen=True, slots=True, eq=False)
class JudgedCurve:
    """A light curve with its levels, the noise of its points and its spans of excess.

    ``ln_excess`` is ln of flux over the stars' flux, ``sigma_ln`` its noise without the level's own error.
    """

    columns: LightColumns
    levels: StellarLevels
    ln_excess: FloatArray
    sigma_ln: FloatArray
    quiet: BoolArray
    spans: tuple[BrightSpan, ...]


def find_bright_spans(columns: LightColumns, known_bright: BoolArray | None = None) -> JudgedCurve:
    """Spans of excess of a light curve, and the levels that they are above.

    Parameters
    ----------
    columns : LightColumns
        The light curve in order of time; mag and days.
    known_bright : ndarray of bool, optional
        Points that are known to hold dust (dimensionless); they are left out of the level.

    Returns
    -------
    JudgedCurve
        Levels (mag), excess (dimensionless) and spans in order of time.

    Notes
    -----
    Accuracy: levels and spans are found in turn, three times. A span needs three points at 2.5 sigma in two
    nights, and log odds above 10: under 1 % of campaigns of pure noise have one, with red noise and with
    outliers (tests/studies/test_studies_find_calibration.py).

    Source: the most probable sequence of two states (Viterbi 1967, IEEE Trans. Inf. Theory 13, 260); quiet
    points normal with 1.5 % of outliers, bright ones with any excess from 0.05 to 8 times the stars.

    Examples
    --------
    >>> n = 60
    >>> z = np.zeros(n)
    >>> mag = 6.0 - np.where((np.arange(n) > 40) & (np.arange(n) < 50), 0.5, 0.0)
    >>> curve = LightColumns(np.arange(n) * 9.0, z, mag, z + 0.02, np.zeros(n, np.int8), z,
    ...     np.zeros(n, int), np.zeros(1, int))
    >>> [(span.first, span.last) for span in find_bright_spans(curve).spans]
    [(41, 49)]
    """
    quiet = first_quiet(columns)
    if known_bright is not None:
        quiet &= ~known_bright
    spans: list[BrightSpan] = []
    for _ in range(_ROUNDS):
        levels = stellar_levels(columns, quiet)
        ln_excess = log_excess(columns, levels)
        sigma_ln = LN_PER_MAG * point_sigma_mag(columns, levels)
        odds = _log_odds(columns, levels, ln_excess, sigma_ln)
        found = [BrightSpan(*span) for span in _best_spans(odds)]
        total = np.hypot(sigma_ln, LN_PER_MAG * levels.sigma_mag[columns.group])
        spans = [span for span in found if _is_real(columns, ln_excess / total, span)]
        new = _quiet_points(columns, spans, known_bright)
        if bool((new == quiet).all()):
            break
        quiet = new
    return JudgedCurve(columns, levels, ln_excess, sigma_ln, quiet, tuple(spans))


def _log_odds(
    columns: LightColumns, levels: StellarLevels, ln_excess: FloatArray, sigma_ln: FloatArray
) -> FloatArray:
    """ln of the chance of each point with dust over that without."""
    from scipy.special import log_ndtr, logsumexp

    counts = np.bincount(columns.group, minlength=columns.group_band.size)
    # A level's error moves all points of a group alike; ten of them are as many as ever count together.
    shared = LN_PER_MAG * levels.sigma_mag * np.sqrt(np.minimum(counts, 10))
    hidden = levels.base_sigma / levels.base
    s = np.sqrt(sigma_ln**2 + shared[columns.group] ** 2 + hidden[columns.group] ** 2)
    odds = np.zeros(ln_excess.size)
    usable = np.isfinite(ln_excess) & np.isfinite(s)
    grid = np.log1p(_EXCESSES)
    bright_share = np.log((1.0 - _BLIND_SHARE) / grid.size)
    # Half the distance between neighbours of the grid: between them it stays smooth.
    gaps = 0.5 * np.gradient(grid)

    x, own = ln_excess[usable], s[usable]
    side = columns.limit_side[usable]
    measured = side == 0
    quiet = np.logaddexp(
        np.log(1.0 - _OUTLIER_SHARE) + _log_normal(x, own),
        np.log(_OUTLIER_SHARE) + _log_normal(x, np.maximum(5.0 * own, _OUTLIER_LN)),
    )
    bright = logsumexp(_log_normal(x[:, None] - grid[None, :], np.hypot(own[:, None], gaps[None, :])), axis=1)
    chance = np.logaddexp(np.log(_BLIND_SHARE) + quiet, bright_share + bright) - quiet
    if not measured.all():
        width = np.where(side > 0, 1.0 / np.where(np.isfinite(columns.limit_sigma[usable]),
                                                  columns.limit_sigma[usable], 3.0), own)  # fmt: skip
        depth = side[:, None] * (x[:, None] - np.append(0.0, grid)[None, :]) / width[:, None]
        seen = np.log((1.0 - _OUTLIER_SHARE) * np.exp(log_ndtr(depth)) + _OUTLIER_SHARE)
        limits = np.logaddexp(
            np.log(_BLIND_SHARE) + seen[:, 0], bright_share + logsumexp(seen[:, 1:], axis=1)
        ) - seen[:, 0]  # fmt: skip
        chance = np.where(measured, chance, limits)
    odds[usable] = chance
    return odds


def _log_normal(x: FloatArray, sigma: FloatArray) -> FloatArray:
    value: FloatArray = -0.5 * (x / sigma) ** 2 - np.log(sigma)
    return value


def _best_spans(odds: FloatArray) -> list[tuple[int, int, float]]:
    """Spans of the most probable sequence of the two states."""
    cost = _CHANGE_COST
    in_quiet, in_bright = 0.0, -cost
    rose = np.zeros(odds.size, dtype=bool)
    fell = np.zeros(odds.size, dtype=bool)
    for place, value in enumerate(odds.tolist()):
        # The difference of the two never passes the cost of a change, either way.
        ahead = in_bright - in_quiet
        if ahead > cost:
            fell[place] = True
            in_quiet = in_bright - cost
        elif ahead < -cost:
            rose[place] = True
            in_bright = in_quiet - cost
        in_bright += value
    # The curve may end inside a span, at no cost.
    bright = in_bright > in_quiet
    spans, last = [], odds.size - 1
    for place in range(odds.size - 1, -1, -1):
        if bright and rose[place]:
            spans.append((place, last, float(odds[place : last + 1].sum())))
            bright = False
        elif not bright and fell[place]:
            bright, last = True, place - 1
    if bright:
        spans.append((0, last, float(odds[: last + 1].sum())))
    return spans[::-1]


def _is_real(columns: LightColumns, sigmas: FloatArray, span: BrightSpan) -> bool:
    """Enough points in enough nights above the level; a wild point or a wild night is no episode."""
    places = np.arange(span.first, span.last + 1)
    # Points without a level are NaN and never high.
    high = places[(sigmas[places] > _POINT_SIGMA) & (columns.limit_side[places] <= 0)]
    if high.size < _FEWEST_POINTS or span.log_odds < _LEAST_LOG_ODDS:
        return False
    nights = 1 + int((np.diff(columns.bmjd_tdb[high]) > _NIGHT_D).sum())
    return nights >= _FEWEST_NIGHTS


def _quiet_points(
    columns: LightColumns, spans: list[BrightSpan], known_bright: BoolArray | None
) -> BoolArray:
    """Everything outside the spans, with room before and after for what is too faint to be told."""
    times = columns.bmjd_tdb
    bright: NDArray[np.bool_] = np.zeros(times.size, dtype=bool)
    roomy = bright.copy()
    for span in spans:
        start, end = times[span.first], times[span.last]
        bright[span.first : span.last + 1] = True
        room = 0.5 * (end - start)
        roomy |= (times >= start - max(60.0, 0.5 * room)) & (times <= end + max(60.0, room))
    if known_bright is not None:
        bright, roomy = bright | known_bright, roomy | known_bright
    quiet = ~roomy
    for number in range(columns.group_band.size):
        mine = columns.group == number
        if int((quiet & mine & columns.measured).sum()) < 10:
            quiet |= mine & ~bright
    return quiet
