"""From spans of excess to dated episodes: onset of all bands, top of each, end, decay and amplitude."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from campaign.physics.brightspans import JudgedCurve
from campaign.physics.declinefit import DeclinePosterior, fit_decline
from campaign.physics.episodespans import EpisodeSpan, episode_spans, smoothed
from campaign.physics.lightcolumns import LN_PER_MAG, BoolArray, FloatArray
from campaign.physics.onsetfit import BandPoints, RisePosterior, fit_rise, posterior_summary
from campaign.physics.risepoints import LeftOver, band_points, left_over, top_range

# How far before the first bright point an onset is looked for, in lengths of the rise and at least in days.
_BACK_RISES, _BACK_D = 3.0, 250.0
_SIGNIFICANT = 2.5
_NIGHT_D = 0.7
# A brightening on the way down: so significant (a single point more so), so large a share of the decline's
# course, and no longer than this.
_BUMP_SIGMA, _LONE_SIGMA, _BUMP_SHARE, _BUMP_D = 3.5, 6.0, 0.12, 40.0
# Its course is taken from so many points at least on either side, these many days away.
_BUMP_SIDE, _BUMP_WEEKS_D, _BUMP_FLOOR = 2, (20.0, 60.0), 0.02


@dataclass(frozen=True, slots=True)
class Brightening:
    """A short brightening on the way down: its place, how long and how high (units of the stars' flux)."""

    bmjd_tdb: float
    lasts_d: float
    excess: float
    points: int


@dataclass(frozen=True, slots=True, eq=False)
class BandTop:
    """One band's top: summary of its date (see :class:`DatedSpan`), and amplitude in stars' flux."""

    band: int
    top_bmjd_tdb: FloatArray
    amplitude: float
    amplitude_minus: float
    amplitude_plus: float
    points: int


@dataclass(frozen=True, slots=True, eq=False)
class DatedSpan:
    """One episode dated. A summary is median, 16, 84, 2.5 and 97.5 %, and standard deviation, in days.

    ``onset_bmjd_tdb`` is None where the curve begins inside the episode. ``rise_nights`` counts the nights on
    the rise: with none or one the onset is a bracket. ``top_is_reached`` says that points after the top show
    a decline. ``chi2`` and ``dof`` are those of the rise; ``onset_at_bound`` says that an earlier onset than
    was allowed is possible.
    """

    span: EpisodeSpan
    onset_bmjd_tdb: FloatArray | None
    onset_at_bound: bool
    last_quiet_bmjd_tdb: float | None
    first_bright_bmjd_tdb: float
    tops: tuple[BandTop, ...]
    rise_d: FloatArray | None
    rise_nights: int
    top_is_reached: bool
    decline: DeclinePosterior | None
    shape_share: FloatArray | None
    chi2: float
    dof: int
    brightenings: tuple[Brightening, ...]


def date_episodes(curve: JudgedCurve) -> tuple[DatedSpan, ...]:
    """Date every episode of a judged light curve.

    Parameters
    ----------
    curve : JudgedCurve
        See ``campaign.physics.brightspans.find_bright_spans``; mag and days.

    Returns
    -------
    tuple of DatedSpan
        In order of time; days, units of the stars' flux.

    Notes
    -----
    Accuracy: see ``campaign.physics.onsetfit`` and ``campaign.physics.declinefit``. Levels enter with the
    error that points outside the fit leave them, so that no point counts twice.

    Source: DEVELOPERS.md (how an episode is dated).

    Examples
    --------
    >>> from campaign.physics.brightspans import find_bright_spans
    >>> from campaign.physics.lightcolumns import LightColumns
    >>> n = 90
    >>> z, t = np.zeros(n), np.arange(n) * 9.0
    >>> flux = 1.0 + np.clip((t - 400) / 80, 0, 1) * np.exp(-np.clip(t - 480, 0, None) / 90)
    >>> curve = LightColumns(t, z, 6.0 - 2.5 * np.log10(flux), z + 0.02, np.zeros(n, np.int8), z,
    ...     np.zeros(n, int), np.zeros(1, int))
    >>> dated, = date_episodes(find_bright_spans(curve))
    >>> bool(abs(dated.onset_bmjd_tdb[0] - 400.0) < 6.0)
    True
    >>> bool(abs(dated.tops[0].top_bmjd_tdb[0] - 480.0) < 6.0)
    True
    """
    spans = episode_spans(curve)
    dated = []
    for number, span in enumerate(spans):
        before = spans[number - 1] if number else None
        dated.append(_date(curve, span, before))
    return tuple(dated)


def _date(curve: JudgedCurve, span: EpisodeSpan, before: EpisodeSpan | None) -> DatedSpan:
    columns = curve.columns
    t = columns.bmjd_tdb
    usable = np.isfinite(curve.ln_excess)
    first_bright = span.start_bmjd_tdb
    floor = t[0] if before is None else (before.top_bmjd_tdb if span.from_valley else before.stop_bmjd_tdb)
    informative = usable & (t < first_bright) & (t >= floor) & _tells(curve)
    last_quiet = float(t[informative][-1]) if informative.any() else None
    tail = left_over(curve, span, before)
    bands = _bands_of(curve, span)
    if last_quiet is None:
        return _begun_inside(curve, span, first_bright)
    reach = max(_BACK_RISES * (span.top_bmjd_tdb - first_bright), _BACK_D)
    earliest = max(last_quiet - reach, floor)
    if earliest >= last_quiet:
        earliest = last_quiet - 1.0
    points = [band_points(curve, span, band, earliest, tail) for band in bands]
    latest = max(min(p.top_until for p in points), first_bright)
    fit = fit_rise(points, earliest, max(latest, earliest + 1.0))
    onset = posterior_summary(fit.onset_bmjd_tdb, fit.onset_density)
    tops = _tops(fit, bands, points)
    rise = _rise_length(onset, tops[0].top_bmjd_tdb)
    nights = _nights_on_rise(curve, span, onset[0], fit, bands)
    decline = _decline(curve, span, tops[0], tail)
    return DatedSpan(
        span, onset, fit.at_bound, last_quiet, first_bright, tops, rise, nights,
        _is_past_top(curve, span), decline, fit.shape_share, fit.chi2, fit.dof,
        _brightenings(curve, span, tops[0]),
    )  # fmt: skip


def _tells(curve: JudgedCurve) -> BoolArray:
    """Points that could have shown an excess of six tenths of the unit of flux (the stars', where seen)."""
    measured = curve.columns.measured & (curve.sigma_ln < 0.15)
    base = curve.levels.base[curve.columns.group]
    limits = (curve.columns.limit_side > 0) & (base * np.expm1(curve.ln_excess) < 0.6)
    return measured | limits


def _bands_of(curve: JudgedCurve, span: EpisodeSpan) -> list[int]:
    """Bands that show the episode, the best first."""
    columns = curve.columns
    inside = (columns.bmjd_tdb >= span.start_bmjd_tdb) & (columns.bmjd_tdb <= span.stop_bmjd_tdb)
    high = inside & columns.measured & (curve.ln_excess > _SIGNIFICANT * curve.sigma_ln)
    counts = np.bincount(columns.band[high], minlength=int(columns.group_band.max()) + 1)
    return [span.band, *(int(b) for b in np.flatnonzero(counts >= 3) if b != span.band)]


def _tops(fit: RisePosterior, bands: list[int], points: list[BandPoints]) -> tuple[BandTop, ...]:
    return tuple(
        BandTop(
            band,
            posterior_summary(fit.top_bmjd_tdb[n], fit.top_density[n]),
            float(fit.amplitude[n]),
            float(fit.amplitude_errors[n, 0]),
            float(fit.amplitude_errors[n, 1]),
            int((points[n].limit_side == 0).sum()),
        )
        for n, band in enumerate(bands)
    )


def _rise_length(onset: FloatArray, top: FloatArray) -> FloatArray:
    """Quantiles of top less onset, their errors taken as independent; never negative."""
    middle = top[0] - onset[0]
    low = np.hypot(top[0] - top[[1, 3]], onset[[2, 4]] - onset[0])
    high = np.hypot(top[[2, 4]] - top[0], onset[0] - onset[[1, 3]])
    found: FloatArray = np.append(
        middle + np.array([0.0, -low[0], high[0], -low[1], high[1]]), np.hypot(top[5], onset[5])
    )
    return np.clip(found, 0.0, None)


def _nights_on_rise(
    curve: JudgedCurve, span: EpisodeSpan, onset: float, fit: RisePosterior, bands: list[int]
) -> int:
    """Nights whose points stand above the level and well below the top, before it."""
    columns = curve.columns
    t = columns.bmjd_tdb
    on_rise = np.zeros(t.size, dtype=bool)
    for number, band in enumerate(bands):
        excess = np.expm1(curve.ln_excess)
        top = posterior_summary(fit.top_bmjd_tdb[number], fit.top_density[number])[0]
        on_rise |= (
            (columns.band == band)
            & columns.measured
            & (t > onset)
            & (t < top)
            & (t >= span.start_bmjd_tdb)
            & (curve.ln_excess > 2.0 * curve.sigma_ln)
            & (excess < 0.85 * fit.amplitude[number])
        )
    nights = t[on_rise]
    return int(1 + (np.diff(nights) > _NIGHT_D).sum()) if nights.size else 0


def _is_past_top(curve: JudgedCurve, span: EpisodeSpan) -> bool:
    """Whether points after the highest show that it was the highest."""
    excess = np.expm1(curve.ln_excess[span.points])
    level = smoothed(excess)
    top = int(np.argmax(level))
    t = curve.columns.bmjd_tdb
    later = (t > t[span.points[top]]) & (curve.columns.band == span.band) & curve.columns.measured
    after = np.expm1(curve.ln_excess[later])
    sigma = (1.0 + np.clip(after, 0.0, None)) * curve.sigma_ln[later]
    return bool((after < level[top] - 3.0 * sigma).sum() >= 2)


def _decline(
    curve: JudgedCurve, span: EpisodeSpan, top: BandTop, tail: LeftOver | None
) -> DeclinePosterior | None:
    columns = curve.columns
    t = columns.bmjd_tdb
    stop = span.stop_bmjd_tdb + (0.0 if span.to_valley else 0.5 * (span.stop_bmjd_tdb - span.start_bmjd_tdb))
    chosen = (columns.band == span.band) & columns.measured & (t >= top.top_bmjd_tdb[0]) & (t <= stop)
    chosen &= np.isfinite(curve.ln_excess)
    if not span.to_valley:
        # Points of a later episode do not belong to this one's tail.
        later = [other for other in curve.spans if columns.bmjd_tdb[other.first] > span.stop_bmjd_tdb]
        if later:
            chosen &= t < t[later[0].first]
    excess = np.expm1(curve.ln_excess[chosen])
    level_error = LN_PER_MAG * curve.levels.sigma_mag[columns.group[chosen]]
    sigma = (1.0 + np.clip(excess, 0.0, None)) * np.hypot(curve.sigma_ln[chosen], level_error)
    if tail is not None:
        excess = excess - tail.at(t[chosen])
    spread = 0.5 * float(top.top_bmjd_tdb[2] - top.top_bmjd_tdb[1])
    return fit_decline(t[chosen], excess, sigma, float(top.top_bmjd_tdb[0]), spread)


def _brightenings(curve: JudgedCurve, span: EpisodeSpan, top: BandTop) -> tuple[Brightening, ...]:
    """Short brightenings on the way down, above the course of the band's points around them."""
    columns = curve.columns
    t = columns.bmjd_tdb
    own = span.points[(t[span.points] > top.top_bmjd_tdb[2]) & (columns.limit_side[span.points] == 0)]
    if own.size < 2 * _BUMP_SIDE:
        return ()
    excess = np.expm1(curve.ln_excess[own])
    course = _course(t[own], excess)
    sigma = (1.0 + np.clip(course, 0.0, None)) * curve.sigma_ln[own]
    above = excess - course
    high = np.flatnonzero((above > _BUMP_SIGMA * sigma) & (above > _BUMP_SHARE * course))
    found = []
    for group in np.split(high, np.flatnonzero(np.diff(high) > 1) + 1):
        best = int(group[np.argmax(above[group])]) if group.size else 0
        alone = group.size == 1 and above[best] < _LONE_SIGMA * sigma[best]
        if not group.size or alone or t[own[group[-1]]] - t[own[group[0]]] > _BUMP_D:
            continue
        before, after = t[own[max(group[0] - 1, 0)]], t[own[min(group[-1] + 1, own.size - 1)]]
        lasts = 0.5 * float(after - before + t[own[group[-1]]] - t[own[group[0]]])
        found.append(Brightening(float(t[own[best]]), lasts, float(above[best]), int(group.size)))
    return tuple(found)


def _course(t: FloatArray, excess: FloatArray) -> FloatArray:
    """The decline without what is short: between the points some weeks before and some weeks after each.

    Interpolated in the logarithm, where free decay is a straight line; NaN where a side has too few points.
    """
    ln = np.log(np.maximum(excess, _BUMP_FLOOR))
    near, far = _BUMP_WEEKS_D
    course = np.full(t.size, np.nan)
    for i, at in enumerate(t.tolist()):
        before = (t >= at - far) & (t <= at - near)
        after = (t >= at + near) & (t <= at + far)
        if before.sum() >= _BUMP_SIDE and after.sum() >= _BUMP_SIDE:
            x, y = ([float(part[side].mean()) for side in (before, after)] for part in (t, ln))
            course[i] = np.exp(y[0] + (y[1] - y[0]) * (at - x[0]) / (x[1] - x[0]))
    return course


def _begun_inside(curve: JudgedCurve, span: EpisodeSpan, first_bright: float) -> DatedSpan:
    """An episode that was under way when the curve began: no onset, perhaps a top, and a decline."""
    points = band_points(curve, span, span.band, first_bright - 1.0, None)
    if _nights_below_top(curve, span) >= 2:
        start = first_bright - 3.0 * max(span.top_bmjd_tdb - first_bright, 30.0)
        fit = fit_rise([points], start, max(points.top_until, start + 1.0))
        top = _tops(fit, [span.band], [points])[0]
    else:
        # The top may have been before the curve: what is known is the highest that was seen.
        until = top_range(curve, span, span.band)[1]
        height = smoothed(np.expm1(curve.ln_excess[span.points])).max()
        noise = float((1.0 + height) * np.median(curve.sigma_ln[span.points]))
        top = BandTop(
            span.band,
            np.array([first_bright, first_bright, until, first_bright, until, 0.5 * (until - first_bright)]),
            float(height),
            noise,
            noise,
            int(span.points.size),
        )
    return DatedSpan(
        span, None, False, None, first_bright, (top,), None, 0, _is_past_top(curve, span),
        _decline(curve, span, top, None), None, 0.0, 0, _brightenings(curve, span, top),
    )  # fmt: skip


def _nights_below_top(curve: JudgedCurve, span: EpisodeSpan) -> int:
    level = smoothed(np.expm1(curve.ln_excess[span.points]))
    top = int(np.argmax(level))
    return int((level[:top] < 0.8 * level[top]).sum())
