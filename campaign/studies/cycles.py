"""The cycle count: one integer axis a system, anchored once, to which everything else is mapped."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace
from itertools import pairwise

from campaign.model.measured import Measured, Range
from campaign.model.records import SystemRecord
from campaign.model.systems import Episode, Solution

# A count is safe only while three sigma of the extrapolated date stay under half a period.
SAFE_SIGMA = 3.0


def nominal_period_d(solution: Solution) -> float | None:
    """The period to count with: the value, or the middle of a range; None for a limit.

    Parameters
    ----------
    solution : Solution
        Any solution.

    Returns
    -------
    float or None
        Days.

    Notes
    -----
    Accuracy: none is claimed; it is for counting only.

    Source: project convention.
    """
    if isinstance(solution.period_d, Measured):
        return solution.period_d.value
    if isinstance(solution.period_d, Range):
        return 0.5 * (solution.period_d.low + solution.period_d.high)
    return None


def cycle_of(bmjd_tdb: float, anchor_bmjd_tdb: float, period_d: float) -> int:
    """Cycle number of an epoch: the nearest whole number of periods from the anchor.

    Parameters
    ----------
    bmjd_tdb, anchor_bmjd_tdb : float
        Epochs of the same kind of event, MJD (TDB, barycentre).
    period_d : float
        Period, days, > 0.

    Returns
    -------
    int
        Cycle (dimensionless).

    Notes
    -----
    Accuracy: exact count while ``count_is_safe``.

    Source: T_k = T0 + k P.
    """
    return round((bmjd_tdb - anchor_bmjd_tdb) / period_d)


def count_is_safe(cycles: int, period_d: float, epoch_sigma_d: float, period_sigma_d: float) -> bool:
    """Whether a count over so many cycles cannot be off by one at three sigma.

    Parameters
    ----------
    cycles : int
        Cycles from the epoch.
    period_d, epoch_sigma_d, period_sigma_d : float
        Period and the errors of epoch and period, days.

    Returns
    -------
    bool
        True while 3 sqrt(s_T^2 + (k s_P)^2) < P/2.

    Notes
    -----
    Accuracy: covariance between epoch and period is not used.

    Source: project convention (DEVELOPERS.md: phase lost).
    """
    return SAFE_SIGMA * math.hypot(epoch_sigma_d, cycles * period_sigma_d) < 0.5 * period_d


def with_cycles(
    record: SystemRecord, predicted: Sequence[tuple[int, float]], period_d: float | None
) -> tuple[Episode, ...]:
    """Give every confirmed episode its cycle: the stored one, else that of the nearest predicted onset.

    Parameters
    ----------
    record : SystemRecord
        The system and its episodes.
    predicted : sequence of (int, float)
        One (cycle, onset ``bmjd_tdb``) pair to count from; empty without an orbit.
    period_d : float or None
        Period to count with, days; without it the smallest gap between onsets is taken as one cycle.

    Returns
    -------
    tuple of Episode
        Confirmed episodes, oldest first, one a cycle where a cycle could be given; where two entries date
        the same stage of a cycle, the earlier entry in time is kept.

    Notes
    -----
    Accuracy: counts from the smallest gap are a guess that later alias tests may change.

    Source: project convention.
    """
    confirmed = [e for e in record.episodes if e.state == "confirmed" and _date(e) is not None]
    confirmed.sort(key=lambda e: _date(e) or 0.0)
    if not confirmed:
        return ()
    dates = [_date(e) or 0.0 for e in confirmed]
    if period_d is None:
        gaps = [b - a for a, b in pairwise(dates) if b - a > 1.0]
        period_d = min(gaps) if gaps else None
    if predicted:
        origin_cycle, origin = predicted[0]
    else:
        stored = [(e.cycle, d) for e, d in zip(confirmed, dates, strict=True) if e.cycle is not None]
        origin_cycle, origin = stored[0] if stored else (0, dates[0])
    result = []
    for episode, date in zip(confirmed, dates, strict=True):
        cycle = episode.cycle
        if cycle is None and period_d is not None:
            cycle = origin_cycle + cycle_of(date, origin, period_d)
        elif cycle is None:
            cycle = origin_cycle if date == origin else None
        result.append(replace(episode, cycle=cycle))
    return _one_a_cycle(result)


def _one_a_cycle(episodes: Sequence[Episode]) -> tuple[Episode, ...]:
    """Entries of one cycle told together: an onset logged first, its end in another entry later."""
    by_cycle: dict[int, Episode] = {}
    result: list[Episode] = []
    for episode in episodes:
        if episode.cycle is None:
            result.append(episode)
            continue
        known = by_cycle.get(episode.cycle)
        by_cycle[episode.cycle] = (
            episode
            if known is None
            else replace(
                known,
                onset=known.onset or episode.onset,
                maximum=known.maximum or episode.maximum,
                end=known.end or episode.end,
            )
        )
    return tuple(sorted([*result, *by_cycle.values()], key=lambda e: _date(e) or 0.0))


def _date(episode: Episode) -> float | None:
    for dated in (episode.onset, episode.maximum, episode.end):
        if dated is not None:
            return dated.moment.bmjd_tdb
    return None
