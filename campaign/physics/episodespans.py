"""Spans of excess cut into episodes: one top each, tails joined to what they belong to, brief ones apart."""

from __future__ import annotations

from dataclasses import dataclass, replace
from itertools import pairwise

import numpy as np

from campaign.physics.brightspans import JudgedCurve
from campaign.physics.lightcolumns import BoolArray, FloatArray, IntArray

# A dip between two tops parts episodes when it is so deep, so significant, and neither top is a blip.
_DIP_SHARE = 0.5
_DIP_SIGMA = 5.0
_LEAST_SHARE = 0.25
_BRIEF_SHARE = 0.2
# What is left of an episode comes and goes in the noise: such a span after it is its tail.
_TAIL_SHARE = 0.25


@dataclass(frozen=True, slots=True, eq=False)
class EpisodeSpan:
    """Where one episode lies in a light curve.

    ``band`` is the one that shows it best; ``points`` are the places of that band's points inside, saturated
    ones included. ``from_valley`` says that it rises from what an earlier one left, and
    ``to_valley`` that the next one rises from what it left.
    """

    start_bmjd_tdb: float
    top_bmjd_tdb: float
    stop_bmjd_tdb: float
    band: int
    points: IntArray
    from_valley: bool
    to_valley: bool
    brief: bool


def episode_spans(curve: JudgedCurve) -> tuple[EpisodeSpan, ...]:
    """Episodes of a judged light curve.

    Parameters
    ----------
    curve : JudgedCurve
        Levels, excess and spans; days.

    Returns
    -------
    tuple of EpisodeSpan
        In order of time, days.

    Notes
    -----
    Accuracy: two tops are two episodes when the flux between them falls below half of the lesser one, by 5
    sigma, and the lesser is at least a quarter of the greater. A span that lasts under a fifth of the others
    and reaches under half of them is brief.

    Source: project convention; tops by their prominence (common practice, no source).

    Examples
    --------
    >>> from campaign.physics.brightspans import find_bright_spans
    >>> from campaign.physics.lightcolumns import LightColumns
    >>> n = 90
    >>> z, t = np.zeros(n), np.arange(n) * 9.0
    >>> flux = 1.0 + np.clip(1.0 - abs(t - 300) / 60, 0, None) + np.clip(1.0 - abs(t - 420) / 60, 0, None)
    >>> curve = LightColumns(t, z, 6.0 - 2.5 * np.log10(flux), z + 0.02, np.zeros(n, np.int8), z,
    ...     np.zeros(n, int), np.zeros(1, int))
    >>> len(episode_spans(find_bright_spans(curve)))
    2
    """
    pieces: list[EpisodeSpan] = []
    for span in curve.spans:
        for piece in _cut(curve, span.first, span.last):
            if pieces and _is_tail(curve, pieces[-1], piece):
                pieces[-1] = _joined(pieces[-1], piece)
            else:
                pieces.append(piece)
    return tuple(_with_brief_marked(curve, pieces))


def smoothed(values: FloatArray) -> FloatArray:
    """Running median of three values; the two ends are the mean of two.

    Parameters
    ----------
    values : ndarray
        In order of time, any unit.

    Returns
    -------
    ndarray
        In the same unit.

    Notes
    -----
    Accuracy: exact; one wild value among three does not show.

    Source: running median (Tukey 1977, Exploratory Data Analysis, chapter 7).

    Examples
    --------
    >>> smoothed(np.array([1.0, 1.0, 9.0, 1.0, 2.0])).tolist()
    [1.0, 1.0, 1.0, 2.0, 1.5]
    """
    if values.size < 3:
        return values
    inner = np.median(np.stack([values[:-2], values[1:-1], values[2:]]), axis=0)
    return np.concatenate([[values[:2].mean()], inner, [values[-2:].mean()]])


def _cut(curve: JudgedCurve, first: int, last: int) -> list[EpisodeSpan]:
    columns = curve.columns
    inside = np.arange(first, last + 1)
    inside = inside[(columns.limit_side[inside] <= 0) & np.isfinite(curve.ln_excess[inside])]
    bands = columns.band
    strength = np.bincount(
        bands[inside],
        # A few very bright points say less of an episode than many: no point counts more than six sigma.
        weights=np.clip(curve.ln_excess[inside] / curve.sigma_ln[inside], 0.0, 6.0) ** 2,
    )
    band = int(np.argmax(strength))
    points = inside[bands[inside] == band]
    t = columns.bmjd_tdb
    excess = np.expm1(curve.ln_excess[points])
    level = smoothed(excess)
    sigma = (1.0 + np.clip(excess, 0.0, None)) * curve.sigma_ln[points]
    valleys = _valleys(t[points], level, sigma)
    edges = [0, *valleys, points.size]
    pieces = []
    for number, (low, high) in enumerate(pairwise(edges)):
        own = points[low:high]
        top = own[int(np.argmax(level[low:high]))]
        pieces.append(
            EpisodeSpan(
                float(t[first] if number == 0 else t[own[0]]),
                float(t[top]),
                float(t[last] if number == len(valleys) else t[own[-1]]),
                band,
                own,
                number > 0,
                number < len(valleys),
                False,
            )
        )
    return pieces


def _valleys(times: FloatArray, level: FloatArray, sigma: FloatArray) -> list[int]:
    """Places where a new episode begins to rise, by the prominence of the tops on either side."""
    if level.size < 5:
        return []
    found: list[int] = []
    pending = [(0, level.size)]
    while pending:
        low, high = pending.pop()
        part = level[low:high]
        if part.size < 5:
            continue
        highest = int(np.argmax(part))
        for step in (-1, 1):
            # From the top outward: the deepest place so far, and how far the curve climbs again.
            way = np.arange(highest, -1 if step < 0 else part.size, step)
            side = part[way]
            best = int(np.argmax(side - np.minimum.accumulate(side)))
            if best < 2:
                continue
            valley = int(np.argmin(side[: best + 1]))
            lesser, depth = side[best], side[valley]
            noise = float(np.hypot(sigma[low + way[best]], sigma[low + way[valley]]))
            place = low + int(way[valley])
            if (
                low < place < high - 1
                and depth < _DIP_SHARE * lesser
                and lesser - depth > _DIP_SIGMA * noise
                and lesser > _LEAST_SHARE * part[highest]
                and not _is_blip(times[low:high], part, highest, int(way[best]), 0.5 * (lesser + depth))
            ):
                found.append(place)
                pending += [(low, place), (place, high)]
                break
    return sorted(set(found))


def _is_blip(times: FloatArray, level: FloatArray, highest: int, lesser: int, half: float) -> bool:
    """Whether the lesser top is much shorter than the greater: a brief brightening, no episode."""
    return _width(times, level > half, lesser) < _BRIEF_SHARE * _width(
        times, level > 0.5 * level[highest], highest
    )


def _width(times: FloatArray, above: BoolArray, place: int) -> float:
    """How long a curve stays above, around one place; to half way to the neighbours outside."""
    below = np.flatnonzero(~above)
    before, after = below[below < place], below[below > place]
    start = times[0] if not before.size else 0.5 * (times[before[-1]] + times[before[-1] + 1])
    stop = times[-1] if not after.size else 0.5 * (times[after[0]] + times[after[0] - 1])
    return float(stop - start)


def _is_tail(curve: JudgedCurve, earlier: EpisodeSpan, later: EpisodeSpan) -> bool:
    if later.from_valley:
        return False
    duration = earlier.stop_bmjd_tdb - earlier.start_bmjd_tdb
    near = later.start_bmjd_tdb - earlier.stop_bmjd_tdb < max(duration, 60.0)
    # Longer bands shine on after shorter ones: heights are compared in the later one's band.
    columns = curve.columns
    t = columns.bmjd_tdb
    then = (t >= earlier.start_bmjd_tdb) & (t <= earlier.stop_bmjd_tdb) & (columns.band == later.band)
    then &= (columns.limit_side <= 0) & np.isfinite(curve.ln_excess)
    before = np.expm1(curve.ln_excess[then])
    highest = float(smoothed(before).max()) if before.size else _height(curve, earlier)
    return near and _height(curve, later) < _TAIL_SHARE * highest


def _joined(earlier: EpisodeSpan, later: EpisodeSpan) -> EpisodeSpan:
    points = np.concatenate([earlier.points, later.points]) if later.band == earlier.band else earlier.points
    return replace(earlier, stop_bmjd_tdb=later.stop_bmjd_tdb, points=points, to_valley=later.to_valley)


def _height(curve: JudgedCurve, span: EpisodeSpan) -> float:
    return float(smoothed(np.expm1(curve.ln_excess[span.points])).max())


def _with_brief_marked(curve: JudgedCurve, spans: list[EpisodeSpan]) -> list[EpisodeSpan]:
    if len(spans) < 2:
        return spans
    lasts = np.array([span.stop_bmjd_tdb - span.start_bmjd_tdb for span in spans])
    heights = np.array([_height(curve, span) for span in spans])
    marked = []
    for number, span in enumerate(spans):
        others = np.arange(len(spans)) != number
        brief = bool(
            lasts[number] < _BRIEF_SHARE * np.median(lasts[others])
            and heights[number] < 0.5 * np.median(heights[others])
        )
        marked.append(replace(span, brief=brief))
    return marked
