"""Verdicts on a system's own photometry: levels taken outside its confirmed episodes."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.arrays import PhotometryArrays
from campaign.model.records import SystemRecord
from campaign.studies.bands import photometric_system_key
from campaign.studies.quietness import JudgedPhotometry, judge_photometry

_REJECTED_D = 30.0
# Up to so many times the span of an episode after it, dust that was never seen to fade is still its own.
_TAIL_SPANS = 2.0


def judge(record: SystemRecord, arrays: PhotometryArrays, as_of: float) -> JudgedPhotometry:
    """Verdicts on a system's good photometry up to ``as_of``.

    Parameters
    ----------
    record : SystemRecord
        The system; its confirmed episodes are left out of the stellar level.
    arrays : PhotometryArrays
        Light curve, mag and ``bmjd_tdb``.
    as_of : float
        ``bmjd_tdb``.

    Returns
    -------
    JudgedPhotometry
        In order of time.

    Notes
    -----
    Accuracy: see ``campaign.studies.quietness``.

    Source: project convention.
    """
    past = (arrays.bmjd_tdb <= as_of) & (arrays.quality == "good")
    error = 0.5 * arrays.mag_minus + 0.5 * arrays.mag_plus
    spans = [(start, end) for start, end, _ in confirmed_spans(record)]
    judged = judge_photometry(
        arrays.bmjd_tdb[past],
        arrays.mag[past],
        error[past],
        arrays.limit_side[past],
        [str(b) for b in arrays.band[past]],
        series_of(arrays, past),
        spans,
        rejected_spans(record),
    )
    return _with_tails_explained(judged, spans)


def _with_tails_explained(judged: JudgedPhotometry, spans: list[tuple[float, float]]) -> JudgedPhotometry:
    """In each band, what follows a confirmed episode up to the first quiet point is still its dust."""
    if not spans or judged.is_explained is None:
        return judged
    explained = judged.is_explained.copy()
    names = np.array(judged.band)
    for start, end in spans:
        until = end + _TAIL_SPANS * (end - start)
        late = (judged.bmjd_tdb >= start) & (judged.bmjd_tdb <= until)
        for name in np.unique(names[late]):
            mine = np.flatnonzero(late & (names == name))
            calm = judged.is_quiet[mine] & (judged.bmjd_tdb[mine] > end)
            explained[mine[: int(np.argmax(calm)) if calm.any() else mine.size]] = True
    return replace(judged, is_explained=explained)


def rejected_spans(record: SystemRecord) -> list[tuple[float, float]]:
    """When a system's light held an excess of which somebody said that it is no episode.

    Parameters
    ----------
    record : SystemRecord
        The system and its episodes.

    Returns
    -------
    list of (float, float)
        From and until (``bmjd_tdb``): the dates of each rejected episode with their errors, and a month.

    Notes
    -----
    Accuracy: a convention, not a measurement.

    Source: project convention, common practice.
    """
    spans = []
    for episode in record.episodes:
        moments = [d.moment for d in (episode.onset, episode.maximum, episode.end) if d is not None]
        if episode.state == "rejected" and moments:
            first = min(m.bmjd_tdb - (m.minus_d or 0.0) for m in moments)
            last = max(m.bmjd_tdb + (m.plus_d or 0.0) for m in moments)
            spans.append((first - _REJECTED_D, last + _REJECTED_D))
    return spans


def confirmed_spans(record: SystemRecord) -> list[tuple[float, float, int | None]]:
    """When a system's light held, or may have held, the dust of its confirmed episodes.

    Parameters
    ----------
    record : SystemRecord
        The system and its episodes.

    Returns
    -------
    list of (float, float, int or None)
        From and until (``bmjd_tdb``) and the cycle of each; dust outlasts its production, so a generous
        tail is left.

    Notes
    -----
    Accuracy: a convention, not a measurement.

    Source: project convention, common practice.
    """
    spans = []
    for episode in record.episodes:
        dates = [d.moment.bmjd_tdb for d in (episode.onset, episode.maximum, episode.end) if d is not None]
        if episode.state == "confirmed" and dates:
            tail_d = max(2.0 * (max(dates) - min(dates)), 365.25)
            spans.append((min(dates) - 30.0, max(dates) + tail_d, episode.cycle))
    return spans


def series_of(arrays: PhotometryArrays, chosen: NDArray[np.bool_]) -> list[str]:
    """What a level is taken of, beside the band: photometric system, source and site, never mixed.

    Parameters
    ----------
    arrays : PhotometryArrays
        Light curve (mag, ``bmjd_tdb``).
    chosen : ndarray of bool
        Which points (dimensionless).

    Returns
    -------
    list of str
        One key a chosen point; equal keys share a level.

    Notes
    -----
    Accuracy: exact (no numbers). Source: DEVELOPERS.md (conventions: magnitudes and their systems).
    """
    return [
        f"{photometric_system_key(own)}\0{source}\0{site}"
        for own, source, site in zip(
            arrays.photometric_system[chosen], arrays.source[chosen], arrays.site_id[chosen], strict=True
        )
    ]
