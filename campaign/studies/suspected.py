"""Every system of a campaign that stands as suspected, until somebody confirms or rejects it."""

from __future__ import annotations

from collections.abc import Mapping

from campaign.model.arrays import PhotometryArrays
from campaign.model.suspicion import Suspicion
from campaign.studies.lightcurves import CataloguedCurves
from campaign.studies.preparing import Prepared
from campaign.studies.suspicion import recent_start, suspicion_of

# Of a campaign with more light curves than this only those are judged that a status needs.
MOST_CURVES = 300


def suspicions(
    prepared: Prepared, photometry: Mapping[int, PhotometryArrays], as_of: float
) -> tuple[Suspicion, ...]:
    """Every system that stands as suspected.

    Parameters
    ----------
    prepared : Prepared
        Units of a campaign, with the light curves that were judged for the status of their onsets.
    photometry : mapping of int to PhotometryArrays
        Light curves by system id.
    as_of : float
        The instant of the question, ``bmjd_tdb``.

    Returns
    -------
    tuple of Suspicion
        The latest first. With more than 300 light curves only those are looked at that the status of an onset
        needs; what comes in at other times is told when it is logged or loaded.

    Notes
    -----
    Accuracy: see ``campaign.studies.quietness.suspicious_points``.

    Source: DEVELOPERS.md (Status).
    """
    units: dict[int, int] = {}
    for unit in range(len(prepared.units)):
        units.setdefault(prepared.system_id(unit), unit)
    if len(photometry) <= MOST_CURVES:
        chosen = [number for number in units if number in photometry]
    else:
        chosen = [number for number in units if number in prepared.judged]
    if isinstance(photometry, CataloguedCurves):
        photometry.fetch(chosen)
    found = []
    for number in chosen:
        record = prepared.rows[prepared.units[units[number]].rows[0]].record
        judged = prepared.judge(units[number], photometry, as_of)
        if judged is not None:
            found.append(suspicion_of(record, judged, recent_start(record, as_of), as_of))
    return tuple(sorted((one for one in found if one is not None), key=lambda one: -one.since_bmjd_tdb))
