"""Which photometry shows an excess over the stellar level, which is quiet, and which cannot tell."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.float64]

# A level needs so many points outside known episodes before anything is judged against it.
MINIMUM_LEVEL_POINTS = 5
# Nobody's photometry repeats better than this over years; it keeps a tiny quoted error from crying wolf.
REPEATABILITY_MAG = 0.02
# An excess of this size in one band is what a starting episode shows first; a limit or a point that could
# not have shown it says nothing.
DETECTABLE_MAG = 0.15
SINGLE_SIGMA = 5.0
CONSECUTIVE_SIGMA = 3.0
CONSECUTIVE_D = 30.0
# A wild point that its own source contradicts within so many days is no onset: dust does not go as fast.
CONTRADICTED_D = 2.0
# Standard error of a scaled median absolute deviation of n points, times the root of n: its efficiency is
# 37 % of that of the standard deviation (Rousseeuw & Croux 1993, JASA 88, 1273).
SCATTER_ERROR = 1.16
# Where a system has had wild points, a lone one must stand out from them by this factor.
WILD_FACTOR = 1.2


class StellarLevel(NamedTuple):
    """The stars' own magnitude in one band of one source, the scatter about it, and how many points."""

    mag: float
    scatter_mag: float
    points: int


def stellar_level(mag: FloatArray) -> StellarLevel | None:
    """The level of magnitudes of one band and source without dust.

    Parameters
    ----------
    mag : ndarray, shape (n,)
        Measured magnitudes outside episodes, mag.

    Returns
    -------
    StellarLevel or None
        mag; None from fewer than five points.

    Notes
    -----
    Accuracy: a median and a scaled median absolute deviation, robust while under half of the points hold
    unknown excess. The scatter is never below 0.02 mag.

    Source: median absolute deviation times 1.4826 (Rousseeuw & Croux 1993, JASA 88, 1273).
    """
    if mag.size < MINIMUM_LEVEL_POINTS:
        return None
    level = float(np.median(mag))
    scatter = max(1.4826 * float(np.median(np.abs(mag - level))), REPEATABILITY_MAG)
    return StellarLevel(level, scatter, int(mag.size))


@dataclass(frozen=True, slots=True)
class JudgedPhotometry:
    """Verdicts on a light curve, in order of time.

    ``excess_sigma`` is the brightening over the level of its own band and source in units of its own
    error and that level's scatter (NaN where no level is known); ``is_quiet`` marks points that would
    have shown an excess and did not. ``single_sigma`` is what a lone point must reach to be suspicious: 5
    (where it is None), and the scatter's own error; ``is_explained`` marks points inside rejected episodes.
    """

    bmjd_tdb: FloatArray
    excess_sigma: FloatArray
    is_quiet: NDArray[np.bool_]
    band: tuple[str, ...]
    single_sigma: FloatArray | None = None
    is_explained: NDArray[np.bool_] | None = None

    @property
    def last_quiet(self) -> float | None:
        quiet = self.bmjd_tdb[self.is_quiet]
        return float(quiet[-1]) if quiet.size else None


def judge_photometry(
    bmjd_tdb: FloatArray,
    mag: FloatArray,
    error_mag: FloatArray,
    limit_side: NDArray[np.int8],
    band: Sequence[str],
    source: Sequence[str],
    episodes: Sequence[tuple[float, float]],
    rejected: Sequence[tuple[float, float]] = (),
) -> JudgedPhotometry:
    """Judge every point against the stellar level of its own band and source.

    Parameters
    ----------
    bmjd_tdb : ndarray, shape (n,)
        Times, MJD (TDB, barycentre), any order.
    mag, error_mag : ndarray, shape (n,)
        Magnitudes and their errors, mag; NaN for an unknown error. For a limit, the bound.
    limit_side : ndarray of int8, shape (n,)
        0 measured; +1 fainter than ``mag``; -1 brighter than ``mag`` (saturated).
    band, source : sequences of str, length n
        Band, and instrument or source: levels are never shared between sources, so that a new
        instrument does not look like an onset.
    episodes : sequence of (float, float)
        Spans known to hold dust, ``bmjd_tdb``; left out of the level.
    rejected : sequence of (float, float)
        Spans of which somebody said that their excess is no episode, ``bmjd_tdb``.

    Returns
    -------
    JudgedPhotometry
        In order of time.

    Notes
    -----
    Accuracy: the level is a median and its scatter a scaled median absolute deviation, robust while
    under half of the points of a band and source hold unknown excess.

    Source: median absolute deviation times 1.4826 (Rousseeuw & Croux 1993, JASA 88, 1273).
    """
    order = np.argsort(bmjd_tdb, kind="stable")
    times = np.asarray(bmjd_tdb, dtype=float)[order]
    mags, errors = np.asarray(mag, dtype=float)[order], np.asarray(error_mag, dtype=float)[order]
    sides = np.asarray(limit_side)[order]
    bands = [band[i] for i in order]
    keys = np.array([f"{band[i]}\0{source[i]}" for i in order])
    inside = np.zeros(times.size, dtype=bool)
    for start, end in episodes:
        inside |= (times >= start) & (times <= end)
    excess = np.full(times.size, np.nan)
    quiet = np.zeros(times.size, dtype=bool)
    bound = np.full(times.size, SINGLE_SIGMA)
    for key in np.unique(keys):
        mine = keys == key
        found = stellar_level(mags[mine & ~inside & (sides == 0)])
        if found is None:
            continue
        level, scatter, points = found
        bound[mine] *= 1.0 + SCATTER_ERROR / np.sqrt(points)
        own = np.where(np.isnan(errors), scatter, errors)
        sigma = np.sqrt(own**2 + scatter**2 + scatter**2 / points)
        measured = mine & (sides == 0)
        excess[measured] = ((level - mags) / sigma)[measured]
        could_show = sigma * CONSECUTIVE_SIGMA <= max(DETECTABLE_MAG, CONSECUTIVE_SIGMA * 2.0 * scatter)
        quiet |= measured & could_show & (excess < CONSECUTIVE_SIGMA)
        quiet |= mine & (sides > 0) & (mags > level - DETECTABLE_MAG)
        saturated = mine & (sides < 0)
        excess[saturated] = ((level - mags) / sigma)[saturated].clip(min=0.0)
    explained = np.zeros(times.size, dtype=bool)
    for start, end in rejected:
        explained |= (times >= start) & (times <= end)
    return JudgedPhotometry(
        times,
        excess,
        quiet,
        tuple(bands),
        np.maximum(bound, _wild_sigma(times, excess, quiet, keys)),
        explained,
    )


def _wild_sigma(
    times: FloatArray, excess: FloatArray, quiet: NDArray[np.bool_], keys: NDArray[np.str_]
) -> FloatArray:
    """What each point must reach to stand out from the wild points before it.

    Dust only adds light: a point as far below the level is wild, and so is a bright one whose source is quiet
    again within days, or at its next point within a month. Their size is that of the wild points to come.
    """
    bound = np.full(times.size + 1, SINGLE_SIGMA)
    with np.errstate(invalid="ignore"):
        far = np.flatnonzero(np.abs(excess) >= SINGLE_SIGMA)
    if not far.size:
        return bound[:-1]
    contradicted = np.zeros(times.size, dtype=bool)
    # Only of the same source: another's level may have been taken in dust.
    for key in np.unique(keys[far]):
        same = np.flatnonzero((keys == key) & ~np.isnan(excess))
        t, calm = times[same], quiet[same]
        before = np.concatenate([[0], np.cumsum(calm)])
        for k in np.flatnonzero(np.abs(excess[same]) >= SINGLE_SIGMA).tolist():
            i, known_from = int(same[k]), int(same[k]) + 1
            if excess[i] > 0.0:
                first, last = np.searchsorted(t, [t[k] - CONTRADICTED_D, t[k] + CONTRADICTED_D])
                contradicted[i] = before[last] > before[first]
                after = k + 1
                if not (after < same.size and calm[after] and t[after] - t[k] <= CONSECUTIVE_D):
                    continue
                known_from = int(same[after]) + 1
            bound[known_from] = max(bound[known_from], WILD_FACTOR * float(np.abs(excess[i])))
    grown: FloatArray = np.maximum.accumulate(bound)[:-1]
    return np.where(contradicted, np.inf, grown)


def suspected_since(judged: JudgedPhotometry, start: float, end: float) -> float | None:
    """First instant of an unexplained excess between two instants.

    Parameters
    ----------
    judged : JudgedPhotometry
        Verdicts, in order of time.
    start, end : float
        Span to look at, ``bmjd_tdb``.

    Returns
    -------
    float or None
        ``bmjd_tdb`` of the first of one point at 5 sigma or of two consecutive points at 3 sigma within
        30 d; None when there is neither.

    Notes
    -----
    Accuracy: one false alarm in about 3 million normal points for the first criterion.

    Source: project convention, common practice.
    """
    found = suspicious_points(judged, start, end)
    return float(judged.bmjd_tdb[found[0]]) if found.size else None


def suspicious_points(judged: JudgedPhotometry, start: float, end: float) -> NDArray[np.int64]:
    """Places of the points between two instants that make an onset suspected.

    Parameters
    ----------
    judged : JudgedPhotometry
        Verdicts, in order of time.
    start, end : float
        Span to look at, ``bmjd_tdb``.

    Returns
    -------
    ndarray of int
        In order of time: points at 5 sigma (more, where the system has had wild points), and pairs of
        consecutive points at 3 sigma within 30 d.

    Notes
    -----
    Accuracy: under one false alarm in 1,000 observations of quiet stars with red noise and 1 % of wild
    points (tests/studies/test_studies_alarm.py).

    Source: project convention, common practice.
    """
    chosen = (judged.bmjd_tdb >= start) & (judged.bmjd_tdb <= end) & ~np.isnan(judged.excess_sigma)
    if judged.is_explained is not None:
        chosen &= ~judged.is_explained
    places = np.flatnonzero(chosen)
    times, sigma = judged.bmjd_tdb[places], judged.excess_sigma[places]
    bound = SINGLE_SIGMA if judged.single_sigma is None else judged.single_sigma[places]
    alarming = sigma >= bound
    high = sigma >= CONSECUTIVE_SIGMA
    pair = high[:-1] & high[1:] & (np.diff(times) <= CONSECUTIVE_D)
    alarming[:-1] |= pair
    alarming[1:] |= pair
    return places[alarming]
