"""Which systems' new photometry makes one suspect an onset, said as soon as it is loaded."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection

from campaign.catalogue import observations, records
from campaign.model.suspicion import Suspicion
from campaign.studies.judging import judge
from campaign.studies.suspicion import RECENT_D, recent_start, suspicion_of

# Light curves are read for so many systems at once.
_PORTION = 100
# A table of more rows is an archive, not tonight's observations; ``upcoming`` says which onsets it suspects.
MOST_ROWS = 50_000
_SAME_INSTANT_D = 1e-7


def load_suspicions(
    connection: Connection,
    system_ids: NDArray[np.int64],
    bmjd_tdb: NDArray[np.float64],
    now_mjd: float,
) -> tuple[Suspicion, ...]:
    """Suspected onsets that rest on points just loaded.

    Parameters
    ----------
    connection
        To the catalogue with the new points in it.
    system_ids, bmjd_tdb : ndarray, shape (n,)
        System and instant (``bmjd_tdb``) of each new point.
    now_mjd : float
        The present, MJD; old episodes are not told as onsets.

    Returns
    -------
    tuple of Suspicion
        In order of the systems' numbers; none of more than 50,000 rows, which are not looked at.

    Notes
    -----
    Accuracy: see ``campaign.studies.quietness.suspicious_points``.

    Source: project convention.
    """
    if bmjd_tdb.size > MOST_ROWS:
        return ()
    recent = bmjd_tdb >= now_mjd - RECENT_D
    touched = np.unique(system_ids[recent])
    found = []
    for first in range(0, touched.size, _PORTION):
        ids = [int(number) for number in touched[first : first + _PORTION]]
        curves = observations.photometry_arrays(connection, ids)
        for record in records.load_records(connection, ids, include_retired=True):
            arrays = curves.get(record.system.id)
            if arrays is None:
                continue
            latest = float(arrays.bmjd_tdb.max())
            judged = judge(record, arrays, latest)
            start = max(recent_start(record, latest), now_mjd - RECENT_D)
            suspicion = suspicion_of(record, judged, start, latest)
            new = bmjd_tdb[recent & (system_ids == record.system.id)]
            if suspicion is not None and new.max() >= suspicion.since_bmjd_tdb - _SAME_INSTANT_D:
                found.append(suspicion)
    return tuple(found)
