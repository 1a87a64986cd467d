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
    have shown an excess and did not.
    """

    bmjd_tdb: FloatArray
    excess_sigma: FloatArray
    is_quiet: NDArray[np.bool_]
    band: tuple[str, ...]

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
    for key in np.unique(keys):
        mine = keys == key
        found = stellar_level(mags[mine & ~inside & (sides == 0)])
        if found is None:
            continue
        level, scatter, points = found
        own = np.where(np.isnan(errors), scatter, errors)
        sigma = np.sqrt(own**2 + scatter**2 + scatter**2 / points)
        measured = mine & (sides == 0)
        excess[measured] = ((level - mags) / sigma)[measured]
        could_show = sigma * CONSECUTIVE_SIGMA <= max(DETECTABLE_MAG, CONSECUTIVE_SIGMA * 2.0 * scatter)
        quiet |= measured & could_show & (excess < CONSECUTIVE_SIGMA)
        quiet |= mine & (sides > 0) & (mags > level - DETECTABLE_MAG)
        saturated = mine & (sides < 0)
        excess[saturated] = ((level - mags) / sigma)[saturated].clip(min=0.0)
    return JudgedPhotometry(times, excess, quiet, tuple(bands))


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
    chosen = (judged.bmjd_tdb >= start) & (judged.bmjd_tdb <= end) & ~np.isnan(judged.excess_sigma)
    times, sigma = judged.bmjd_tdb[chosen], judged.excess_sigma[chosen]
    for i in range(times.size):
        if sigma[i] >= SINGLE_SIGMA:
            return float(times[i])
        if (
            i + 1 < times.size
            and sigma[i] >= CONSECUTIVE_SIGMA
            and sigma[i + 1] >= CONSECUTIVE_SIGMA
            and times[i + 1] - times[i] <= CONSECUTIVE_D
        ):
            return float(times[i])
    return None
