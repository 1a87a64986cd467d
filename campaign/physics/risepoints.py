"""The points that date a rise: excess in flux with its noise, and between which dates the top must lie."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from campaign.physics.brightspans import JudgedCurve
from campaign.physics.episodespans import EpisodeSpan, smoothed
from campaign.physics.lightcolumns import LN_PER_MAG, FloatArray, IntArray
from campaign.physics.onsetfit import BandPoints
from campaign.physics.stellarlevel import SOURCE_OFFSET_MAG

# The top lies where the smoothed excess is above this share of its highest, or beside it.
_PLATEAU_SHARE = 0.75
_QUIET_BEFORE_D = 500.0
_LEAST_LEVEL_POINTS = 3
# Of what an earlier episode left, this share is not known.
_TAIL_UNKNOWN = 0.3
# How many sigma of the sky's noise a limit is that does not say so.
_LIMIT_SIGMA = 3.0
_SATURATED_ERROR = 0.05


@dataclass(frozen=True, slots=True)
class LeftOver:
    """What an earlier episode still gives: height (in stars' flux) at a date, and e-folding time."""

    height: float
    bmjd_tdb: float
    decay_d: float

    def at(self, bmjd_tdb: FloatArray) -> FloatArray:
        """Excess at some instants (in units of the stars' flux)."""
        since = np.clip(bmjd_tdb - self.bmjd_tdb, 0.0, None)
        value: FloatArray = self.height * np.exp(-since / self.decay_d)
        return value


def band_points(
    curve: JudgedCurve, span: EpisodeSpan, band: int, earliest: float, tail: LeftOver | None
) -> BandPoints:
    """One band's points from the quiet before to the plateau of the top.

    Parameters
    ----------
    curve : JudgedCurve
        The light curve with its levels; days, mag.
    span : EpisodeSpan
        The episode; days.
    band : int
        Number of the band (dimensionless).
    earliest : float
        The earliest onset that will be considered, ``bmjd_tdb``, days.
    tail : LeftOver or None
        What an earlier episode left; a third of it is counted as unknown.

    Returns
    -------
    BandPoints
        Days and units of the stars' flux.

    Notes
    -----
    Accuracy: a level's error is that of its quiet points outside the fit, so that no point counts twice. A
    limit that is too faint is as soft as the sky's noise, one that is saturated as sure as a bright point.

    Source: censored terms as normal tails (Tobin 1958, Econometrica 26, 24).

    Examples
    --------
    >>> from campaign.physics.brightspans import find_bright_spans
    >>> from campaign.physics.episodespans import episode_spans
    >>> from campaign.physics.lightcolumns import LightColumns
    >>> n = 60
    >>> z, t = np.zeros(n), np.arange(n) * 9.0
    >>> flux = 1.0 + np.clip(1.0 - abs(t - 300) / 90, 0, None)
    >>> judged = find_bright_spans(LightColumns(t, z, 6.0 - 2.5 * np.log10(flux), z + 0.02,
    ...     np.zeros(n, np.int8), z, np.zeros(n, int), np.zeros(1, int)))
    >>> points = band_points(judged, episode_spans(judged)[0], 0, 150.0, None)
    >>> round(float(points.excess.max()), 2), points.top_from < 300 < points.top_until
    (0.97, True)
    """
    columns = curve.columns
    t = columns.bmjd_tdb
    mine = (columns.band == band) & np.isfinite(curve.ln_excess)
    top_from, top_until, stop = top_range(curve, span, band)
    chosen = np.flatnonzero(mine & (t >= earliest - _QUIET_BEFORE_D) & (t <= stop))
    return _band_points(curve, chosen, tail, max(top_from, earliest), max(top_until, earliest + 1.0))


def points_between(curve: JudgedCurve, band: int, start: float, stop: float) -> BandPoints:
    """One band's points of a stretch of time, as they stand, whatever they show.

    Parameters
    ----------
    curve : JudgedCurve
        The light curve with its levels; days, mag.
    band : int
        Number of the band (dimensionless).
    start, stop : float
        The stretch, ``bmjd_tdb``, days, both ends included.

    Returns
    -------
    BandPoints
        Days and units of the stars' flux; empty where the band has no point there.

    Notes
    -----
    Accuracy: as :func:`band_points`.

    Source: as :func:`band_points`.

    Examples
    --------
    >>> from campaign.physics.brightspans import find_bright_spans
    >>> from campaign.physics.lightcolumns import LightColumns
    >>> n = 60
    >>> z, t = np.zeros(n), np.arange(n) * 9.0
    >>> judged = find_bright_spans(LightColumns(t, z, z + 6.0, z + 0.02, np.zeros(n, np.int8), z,
    ...     np.zeros(n, int), np.zeros(1, int)))
    >>> points_between(judged, 0, 100.0, 200.0).bmjd_tdb.size
    11
    """
    columns = curve.columns
    t = columns.bmjd_tdb
    chosen = np.flatnonzero(
        (columns.band == band) & np.isfinite(curve.ln_excess) & (t >= start) & (t <= stop)
    )
    return _band_points(curve, chosen, None, stop, stop)


def _band_points(
    curve: JudgedCurve, chosen: IntArray, tail: LeftOver | None, top_from: float, top_until: float
) -> BandPoints:
    columns, levels = curve.columns, curve.levels
    t = columns.bmjd_tdb
    side = columns.limit_side[chosen].astype(np.int64)
    groups = columns.group[chosen]
    numbers, group = np.unique(groups, return_inverse=True)
    base = levels.base[groups]
    flux = np.exp(curve.ln_excess[chosen]) * base
    scale = np.maximum(flux, 0.7 * base)
    sigma = curve.sigma_ln[chosen] * scale
    stated = columns.limit_sigma[chosen]
    faint = flux / np.where(np.isfinite(stated) & (stated > 0.0), stated, _LIMIT_SIGMA)
    sigma = np.where(side > 0, faint, sigma)
    sigma = np.where(side < 0, np.maximum(sigma, _SATURATED_ERROR * flux), sigma)
    sigma = np.hypot(sigma, levels.base_sigma[groups])
    excess = flux - base
    if tail is not None:
        left = tail.at(t[chosen])
        excess, sigma = excess - left, np.hypot(sigma, _TAIL_UNKNOWN * left)
    inside = np.bincount(group[(side == 0) & curve.quiet[chosen]], minlength=numbers.size)
    return BandPoints(
        t[chosen], columns.time_sigma_d[chosen], excess, sigma, side, scale, group,
        _level_sigma(curve, numbers, inside), top_from, top_until,
    )  # fmt: skip


def _level_sigma(curve: JudgedCurve, numbers: IntArray, inside: IntArray) -> FloatArray:
    """Error of levels as a share of flux, as the quiet points outside the fit leave it."""
    own, whole = curve.levels.points[numbers], curve.levels.sigma_mag[numbers]
    outside = np.maximum(own - inside, 0)
    grown = whole * np.sqrt(own / np.maximum(outside, 1))
    loose = np.hypot(whole, SOURCE_OFFSET_MAG)
    sigma = np.where(own == 0, whole, np.where(outside >= _LEAST_LEVEL_POINTS, grown, loose))
    # Stars that were never seen: their flux is in the noise of each point already.
    value: FloatArray = np.where(curve.levels.base_sigma[numbers] > 0.0, 1e-6, LN_PER_MAG * sigma)
    return value


def top_range(curve: JudgedCurve, span: EpisodeSpan, band: int) -> tuple[float, float, float]:
    """Between which dates a band's top lies, and up to when its points are used.

    Parameters
    ----------
    curve : JudgedCurve
        The light curve with its levels; days, mag.
    span : EpisodeSpan
        The episode; days.
    band : int
        Number of the band (dimensionless).

    Returns
    -------
    tuple of float
        From the point before the plateau, to the point after it, and the last of the plateau: days.

    Notes
    -----
    Accuracy: the plateau is what stands above three quarters of the highest smoothed excess, or within two
    sigma of it; saturated points belong to it.

    Source: project convention.

    Examples
    --------
    >>> from campaign.physics.brightspans import find_bright_spans
    >>> from campaign.physics.episodespans import episode_spans
    >>> from campaign.physics.lightcolumns import LightColumns
    >>> n = 60
    >>> z, t = np.zeros(n), np.arange(n) * 9.0
    >>> flux = 1.0 + np.clip(1.0 - abs(t - 300) / 90, 0, None)
    >>> judged = find_bright_spans(LightColumns(t, z, 6.0 - 2.5 * np.log10(flux), z + 0.02,
    ...     np.zeros(n, np.int8), z, np.zeros(n, int), np.zeros(1, int)))
    >>> top_range(judged, episode_spans(judged)[0], 0)
    (270.0, 333.0, 324.0)
    """
    columns = curve.columns
    t = columns.bmjd_tdb
    mine = (columns.band == band) & np.isfinite(curve.ln_excess)
    own = np.flatnonzero(
        mine & (columns.limit_side <= 0) & (t >= span.start_bmjd_tdb) & (t <= span.stop_bmjd_tdb)
    )
    excess = np.expm1(curve.ln_excess[own])
    level = smoothed(excess)
    # A point certainly brighter than its limit may be the top, however bright the others.
    level = np.where(columns.limit_side[own] < 0, np.maximum(level, excess), level)
    sigma = (1.0 + np.clip(level, 0.0, None)) * curve.sigma_ln[own]
    highest = int(np.argmax(level))
    near = level >= min(_PLATEAU_SHARE * level[highest], level[highest] - 2.0 * sigma[highest])
    near |= columns.limit_side[own] < 0
    first, last = int(np.flatnonzero(near)[0]), int(np.flatnonzero(near)[-1])
    # Nothing beyond a deep dip belongs to this top.
    dips = np.flatnonzero(level < 0.5 * level[highest])
    first = max([first, *(int(d) + 1 for d in dips if d < highest)])
    last = min([last, *(int(d) - 1 for d in dips if d > highest)])
    earlier = np.flatnonzero(mine & (t < t[own[first]]))
    top_from = float(t[earlier[-1]]) if earlier.size else float(t[own[0]])
    after = own[last + 1] if last + 1 < own.size else own[last]
    return top_from, float(max(t[after], top_from + 1.0)), float(t[own[last]])


def left_over(curve: JudgedCurve, span: EpisodeSpan, before: EpisodeSpan | None) -> LeftOver | None:
    """What the earlier episode still gives when this one rises.

    Parameters
    ----------
    curve : JudgedCurve
        The light curve with its levels; days, mag.
    span, before : EpisodeSpan
        This episode and the one before it, None for none; days.

    Returns
    -------
    LeftOver or None
        Height in units of the stars' flux, date and e-folding time in days; None where this one rises from
        the stars' own level.

    Notes
    -----
    Accuracy: an exponential through the earlier top and the last point before the rise.

    Source: project convention.

    Examples
    --------
    >>> from campaign.physics.brightspans import find_bright_spans
    >>> from campaign.physics.episodespans import episode_spans
    >>> from campaign.physics.lightcolumns import LightColumns
    >>> n = 60
    >>> z, t = np.zeros(n), np.arange(n) * 9.0
    >>> flux = 1.0 + np.clip(1.0 - abs(t - 300) / 90, 0, None)
    >>> judged = find_bright_spans(LightColumns(t, z, 6.0 - 2.5 * np.log10(flux), z + 0.02,
    ...     np.zeros(n, np.int8), z, np.zeros(n, int), np.zeros(1, int)))
    >>> left_over(judged, episode_spans(judged)[0], None) is None
    True
    """
    if before is None or not span.from_valley:
        return None
    t = curve.columns.bmjd_tdb
    excess = smoothed(np.expm1(curve.ln_excess[before.points]))
    top = int(np.argmax(excess))
    height, place = max(float(excess[-1]), 1e-3), float(t[before.points[-1]])
    fallen = np.log(max(float(excess[top]) / height, 1.05))
    decay = (place - float(t[before.points[top]])) / fallen
    return LeftOver(height, place, float(np.clip(decay, 20.0, 1500.0)))
