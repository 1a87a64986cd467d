"""Onsets that a light curve makes one suspect, and what to do about them."""

from __future__ import annotations

import math
import shlex

import numpy as np

from campaign.model.records import SystemRecord
from campaign.model.suspicion import Suspicion
from campaign.physics.timescales import utc_iso
from campaign.studies.cycles import nominal_period_d
from campaign.studies.judging import confirmed_spans
from campaign.studies.quietness import JudgedPhotometry, suspicious_points

# An excess older than this, or than this share of a period, belongs to an episode that nobody recorded.
RECENT_D = 5.0 * 365.25
RECENT_PERIODS = 0.25
# From so many points the light curve itself dates an episode.
_FOUND_POINTS = 3
_LONG_D = 99.5


def recent_start(record: SystemRecord, as_of: float) -> float:
    """From when on an excess that nothing explains makes one suspect an onset today.

    Parameters
    ----------
    record : SystemRecord
        The system; periods in days.
    as_of : float
        ``bmjd_tdb``.

    Returns
    -------
    float
        ``bmjd_tdb``: a quarter of the shortest adopted period ago, and at most five years.

    Notes
    -----
    Accuracy: a convention; what is older is a matter for ``episodes find``.

    Source: project convention.
    """
    periods = [nominal_period_d(s) for s in record.solutions if s.adopted]
    known = [p for p in periods if p is not None]
    return as_of - min([RECENT_D, *(RECENT_PERIODS * p for p in known)])


def suspicion_of(
    record: SystemRecord, judged: JudgedPhotometry, start: float, end: float
) -> Suspicion | None:
    """The suspected onset of a system between two instants, if there is one.

    Parameters
    ----------
    record : SystemRecord
        The system; what its confirmed and rejected episodes explain is not suspicious.
    judged : JudgedPhotometry
        Verdicts on its light curve, in order of time.
    start, end : float
        Span to look at, ``bmjd_tdb``.

    Returns
    -------
    Suspicion or None
        With the commands that decide it.

    Notes
    -----
    Accuracy: see ``campaign.studies.quietness.suspicious_points``. The first suspicious point is no onset:
    the rise began before it.

    Source: project convention.
    """
    places = suspicious_points(judged, start, end)
    times = judged.bmjd_tdb[places]
    open_ = np.ones(places.size, dtype=bool)
    for first, last, _ in confirmed_spans(record):
        open_ &= ~((times >= first) & (times <= last))
    places, times = places[open_], times[open_]
    if not places.size:
        return None
    name = shlex.quote(record.system.name)
    since, latest = (text or "" for text in utc_iso(times[[0, -1]]))
    bands = tuple(dict.fromkeys(judged.band[int(i)] for i in places))
    return Suspicion(
        system=record.system.name,
        since_bmjd_tdb=float(times[0]),
        since_utc=since,
        latest_bmjd_tdb=float(times[-1]),
        latest_utc=latest,
        points=int(places.size),
        bands=bands,
        excess_sigma=float(judged.excess_sigma[places].max()),
        confirm=_confirm(judged, int(places[0]), name, bands[0], places.size),
        reject="campaign amend N --quality bad"
        if places.size < _FOUND_POINTS
        else f"campaign episodes find {name} --propose, then campaign episodes reject N",
    )


def _confirm(judged: JudgedPhotometry, first: int, name: str, band: str, points: int) -> str:
    """The command that makes it knowledge: by the rise once there is one, else by the bracket."""
    if points >= _FOUND_POINTS:
        return f"campaign episodes find {name} --propose"
    onset = judged.bmjd_tdb[first]
    earlier = [i for i in np.flatnonzero(judged.is_quiet[:first]).tolist() if judged.band[i] == band]
    told = (utc_iso(np.array([onset]))[0] or "")[:10]
    if earlier:
        middle, sigma_d = bracket(float(judged.bmjd_tdb[earlier[-1]]), float(onset))
        told = f'"{(utc_iso(np.array([middle]))[0] or "")[:10]}±{max(sigma_d, 0.1):.2g} d"'
        if sigma_d >= _LONG_D:
            told = f'"{(utc_iso(np.array([middle]))[0] or "")[:10]}±{sigma_d:.0f} d"'
    return f"campaign episodes add {name} --onset {told} --band {shlex.quote(band)}"


def bracket(last_quiet: float, first_bright: float) -> tuple[float, float]:
    """Onset between the last point without an excess and the first with one, any date as probable.

    Parameters
    ----------
    last_quiet, first_bright : float
        ``bmjd_tdb``, days.

    Returns
    -------
    tuple of float
        Middle, and standard deviation in days: the width over the square root of 12, not half of it.

    Notes
    -----
    Accuracy: exact for a rise that shows at once.

    Source: variance of a uniform distribution.

    Examples
    --------
    >>> middle, sigma = bracket(58_270.0, 58_455.0)
    >>> middle, round(sigma, 4)
    (58362.5, 53.4049)
    """
    return 0.5 * (last_quiet + first_bright), (first_bright - last_quiet) / math.sqrt(12.0)
