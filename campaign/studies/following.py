"""What follows an observed onset: maximum and end counted from it, for which much of an orbit drops out."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from campaign.model.forecasts import EventName
from campaign.model.instants import Moment
from campaign.studies.learned import LearnedDates
from campaign.studies.rows import SPOKEN, ForecastRow
from campaign.studies.sampling import Sampler

FloatArray = NDArray[np.float64]

_DELAY = ("condensation_distance_au", "flow_speed_kms")


def needed_since_onset(row: ForecastRow, event: EventName) -> tuple[str, ...]:
    """Quantities on which the time from the onset to a later event depends.

    Parameters
    ----------
    row : ForecastRow
        A system with one solution and its rule.
    event : str
        ``maximum`` or ``end``.

    Returns
    -------
    tuple of str
        Names of ``row.values``; the epoch and whatever else both events share is not among them.

    Notes
    -----
    Accuracy: exact for the rules as defined.

    Source: differences of the rules of DEVELOPERS.md.
    """
    kind = row.rule.kind if row.rule is not None else ""
    if event not in row.events or "onset" not in row.events or kind == "learned":
        return ()
    if kind == "lag":
        return ("onset", event)
    if kind == "phase":
        return ("period_d", "onset", event)
    shared = {"epoch", "omega_b_deg", *_DELAY}
    window = tuple(name for name in row.events["onset"] if name not in shared)
    if event == "maximum" and "maximum_lag_d" in row.values:
        delay = tuple(name for name in _DELAY if name in row.values)
        return (*window, *delay, "maximum_lag_d")
    return window


def missing_since_onset(row: ForecastRow, event: EventName, onset: Moment) -> list[str]:
    """Names of the unknown errors that leave an event counted from an observed onset without an interval.

    Parameters
    ----------
    row : ForecastRow
        A system with one solution and its rule.
    event : str
        ``maximum`` or ``end``.
    onset : Moment
        The observed onset, ``bmjd_tdb`` with its errors in days.

    Returns
    -------
    list of str
        As a person calls them.

    Notes
    -----
    Accuracy: exact.

    Source: DEVELOPERS.md (an unknown error is never zero).
    """
    missing = [] if onset.minus_d is not None and onset.plus_d is not None else ["observed onset"]
    for name in needed_since_onset(row, event):
        _, minus, plus = row.values[name]
        if minus is None or plus is None:
            missing.append(SPOKEN[name])
    return missing


def days_since_onset(
    sampler: Sampler, learned: LearnedDates | None, index: int, event: EventName, cycle: int
) -> FloatArray:
    """Draws of the time from the onset to a later event of the same cycle.

    Parameters
    ----------
    sampler : Sampler
        Draws of all rows.
    learned : LearnedDates or None
        Dated episodes, where the rule is learned from them.
    index : int
        Row.
    event : str
        ``maximum`` or ``end``.
    cycle : int
        Cycle (dimensionless).

    Returns
    -------
    ndarray, shape (draws,)
        Days; NaN in draws without an episode.

    Notes
    -----
    Accuracy: that of the draws. A learned time rests on the episodes that have both dates.

    Source: DEVELOPERS.md (rules); see ``campaign.physics.recurrence``.
    """
    if learned is not None:
        lag = learned.predict_lag(event)
        if lag is not None:
            from scipy.special import ndtr

            return lag.quantiles_d(ndtr(sampler.normals[f"scatter {event}"]))
    at, which = np.array([cycle]), np.array([index])
    later, onset = (sampler.event_times(name, which, at)[0] for name in (event, "onset"))
    days: FloatArray = later - onset
    return days
