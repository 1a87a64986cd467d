"""Verdicts on a system's own photometry: levels taken outside its confirmed episodes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from campaign.model.arrays import PhotometryArrays
from campaign.model.records import SystemRecord
from campaign.studies.bands import photometric_system_key
from campaign.studies.quietness import JudgedPhotometry, judge_photometry


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
    error = 0.5 * (arrays.mag_minus + arrays.mag_plus)
    spans = [(start, end) for start, end, _ in confirmed_spans(record)]
    return judge_photometry(
        arrays.bmjd_tdb[past],
        arrays.mag[past],
        error[past],
        arrays.limit_side[past],
        [str(b) for b in arrays.band[past]],
        series_of(arrays, past),
        spans,
    )


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
