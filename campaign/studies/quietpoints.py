"""What a system's quiet points say of an onset: the chance of all of them for each date it may have had."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.errors import InputRefused
from campaign.model.arrays import PhotometryArrays
from campaign.model.records import SystemRecord
from campaign.physics.brightspans import JudgedCurve, find_bright_spans
from campaign.physics.onsetfit import BandPoints
from campaign.physics.quietchance import ExpectedEpisodes, quiet_log_likelihood
from campaign.physics.risepoints import points_between
from campaign.studies.expected_episodes import expected_episodes
from campaign.studies.find_points import numbered_curve
from campaign.studies.judging import confirmed_spans, rejected_spans

FloatArray = NDArray[np.float64]

# Points that stand out by so much are the business of the alarm; as far below they are wild.
_QUIET_SIGMA = 3.0
# More points of one band than this are put together before the chance is worked out.
_MOST_POINTS = 40
# Dates at which the chance is worked out; between them it is interpolated.
_NODES = 24


@dataclass(frozen=True, slots=True, eq=False)
class QuietPoints:
    """A system's quiet points since a date, ready to say what they exclude.

    ``band_names`` and ``bands`` go together; ``expected`` are the episodes that would have shown.
    """

    band_names: tuple[str, ...]
    bands: tuple[BandPoints, ...]
    expected: ExpectedEpisodes

    @property
    def count(self) -> int:
        return sum(int(band.bmjd_tdb.size) for band in self.bands)

    @property
    def last_bmjd_tdb(self) -> float:
        return max(float(band.bmjd_tdb[-1]) for band in self.bands if band.bmjd_tdb.size)

    def until(self, bmjd_tdb: float) -> QuietPoints:
        """Only the points up to a date."""
        cut = tuple(_chosen(band, band.bmjd_tdb <= bmjd_tdb) for band in self.bands)
        return replace(self, bands=cut)

    def log_likelihood(self, onsets: FloatArray) -> FloatArray:
        """ln of the chance of all points, were this the onset, over that without an episode.

        The rise, the height, the levels of the stars and of the sources are the same for all points: it is
        averaged over them outside the product.
        """
        if not self.count or not onsets.size:
            return np.zeros(onsets.shape)
        last = self.last_bmjd_tdb
        before = onsets < last
        if not before.any():
            return np.zeros(onsets.shape)
        nodes = self._nodes(float(onsets[before].min()), last, onsets[before])
        bands = [_merged(band) for band in self.bands]
        ln = quiet_log_likelihood(bands, nodes, self.expected)
        found: FloatArray = np.interp(onsets, nodes, ln, right=0.0)
        return found

    def _nodes(self, first: float, last: float, onsets: FloatArray) -> FloatArray:
        even = np.linspace(first, last, _NODES // 2)
        dense = np.quantile(onsets, np.linspace(0.0, 1.0, _NODES // 2))
        times = np.concatenate([band.bmjd_tdb for band in self.bands])
        late = np.unique(times[times > first])[-_NODES // 2 :]
        return np.unique(np.concatenate([even, dense, late, [last]]))


def quiet_points(
    record: SystemRecord, arrays: PhotometryArrays, start: float, stop: float, rise_d: float | None
) -> QuietPoints | None:
    """A system's quiet points between two instants.

    Parameters
    ----------
    record : SystemRecord
        The system with its episodes.
    arrays : PhotometryArrays
        Light curve, mag and ``bmjd_tdb``.
    start, stop : float
        From and until, ``bmjd_tdb``; the levels are taken of all points until then.
    rise_d : float or None
        Time from onset to maximum by the system's rule, days.

    Returns
    -------
    QuietPoints or None
        None where there is nothing to say: no level, no point.

    Notes
    -----
    Accuracy: levels and noise as in ``campaign.physics.stellarlevel``; points of confirmed and rejected
    episodes are left out.

    Source: DEVELOPERS.md (quiet observation).
    """
    try:
        numbered = numbered_curve(record.system.name, arrays, None, stop)
    except InputRefused:
        return None
    columns = numbered.columns
    seen = [(first, last) for first, last, _ in confirmed_spans(record)]
    dusty = np.zeros(columns.bmjd_tdb.size, dtype=bool)
    for first, last in (*seen, *rejected_spans(record)):
        dusty |= (columns.bmjd_tdb >= first) & (columns.bmjd_tdb <= last)
    curve = find_bright_spans(columns, dusty)
    names, bands, numbers = [], [], []
    for number, name in enumerate(numbered.bands):
        found = points_between(curve, number, start, stop)
        kept = _chosen(found, _is_quiet(curve, found, dusty))
        if kept.bmjd_tdb.size:
            names.append(name)
            bands.append(kept)
            numbers.append((number, name))
    if not bands:
        return None
    return QuietPoints(tuple(names), tuple(bands), expected_episodes(curve, numbers, seen, rise_d))


def _is_quiet(curve: JudgedCurve, points: BandPoints, dusty: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Points that show the stars' own level, or a limit near it, outside known dust."""
    level = points.scale * points.group_sigma[points.group]
    measured = points.limit_side == 0
    far = np.abs(points.excess) > _QUIET_SIGMA * np.hypot(points.sigma, level)
    in_dust = np.isin(points.bmjd_tdb, curve.columns.bmjd_tdb[dusty])
    return np.asarray(((measured & ~far) | (points.limit_side > 0)) & ~in_dust)


def _chosen(points: BandPoints, chosen: NDArray[np.bool_]) -> BandPoints:
    return replace(
        points,
        bmjd_tdb=points.bmjd_tdb[chosen],
        time_sigma_d=points.time_sigma_d[chosen],
        excess=points.excess[chosen],
        sigma=points.sigma[chosen],
        limit_side=points.limit_side[chosen],
        scale=points.scale[chosen],
        group=points.group[chosen],
    )


def _merged(points: BandPoints) -> BandPoints:
    """Many measurements of one source put together over short spans; limits stay as they are."""
    count = points.bmjd_tdb.size
    if count <= _MOST_POINTS:
        return points
    t = points.bmjd_tdb
    width = max(float(t[-1] - t[0]) / _MOST_POINTS, 1e-3)
    span = ((t[-1] - t) // width).astype(np.int64)
    limits = points.limit_side != 0
    # A limit is a span of its own.
    key = np.where(limits, -1 - np.arange(count), span * points.group_sigma.size + points.group)
    _, place = np.unique(key, return_inverse=True)
    weight = points.sigma**-2.0
    total = np.bincount(place, weight)

    def mean(values: FloatArray) -> FloatArray:
        return np.asarray(np.bincount(place, weight * values) / total)

    first = np.zeros(total.size, dtype=np.int64)
    first[place[::-1]] = np.arange(count)[::-1]
    times = mean(t)
    order = np.argsort(times, kind="stable")
    return replace(
        points,
        bmjd_tdb=times[order],
        time_sigma_d=points.time_sigma_d[first][order],
        excess=mean(points.excess)[order],
        sigma=np.asarray(total**-0.5)[order],
        limit_side=points.limit_side[first][order],
        scale=mean(points.scale)[order],
        group=points.group[first][order],
    )
