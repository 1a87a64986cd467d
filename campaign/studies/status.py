"""What a cycle's state is today: expected, open, late, unseen, suspected, under way, over."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from campaign.model.forecasts import Status
from campaign.model.systems import Episode
from campaign.studies.forecast import DatedEvent
from campaign.studies.quietness import JudgedPhotometry, suspected_since

# Share of the onset's probability that quiet observations must cover before an episode is called late.
COVERED_SHARE = 0.95
# How long an episode can be seen when nothing says when it ends: this share of a period, at least 60 d.
VISIBLE_PERIODS = 0.03
VISIBLE_MINIMUM_D = 60.0
# An episode whose end nobody recorded or can forecast is taken to be over after this share of a period.
FORGOTTEN_PERIODS = 0.5
# An excess up to this share of a period before the interval counts as a suspected onset.
SEARCH_PERIODS = 0.1


@dataclass(frozen=True, slots=True)
class OnsetState:
    """Status of one cycle's onset and the sentence that supports it."""

    status: Status
    note: str = ""
    suspected_bmjd_tdb: float | None = None


def visible_span_d(onset: DatedEvent, end: DatedEvent | None, period_d: float) -> float:
    """How long an episode can be seen after its onset.

    Parameters
    ----------
    onset, end : DatedEvent
        Forecast of this cycle's onset and end of production.
    period_d : float
        Period, days.

    Returns
    -------
    float
        Days, > 0.

    Notes
    -----
    Accuracy: of the rule's own medians; without an end 3 % of the period and at least 60 d.

    Source: project convention, common practice.
    """
    if end is not None and end.quantiles is not None and onset.quantiles is not None:
        span = float(end.quantiles[0] - onset.quantiles[0])
        if np.isfinite(span) and span > 0.0:
            return max(span, VISIBLE_MINIMUM_D)
    return max(VISIBLE_PERIODS * period_d, VISIBLE_MINIMUM_D)


def covered_share(onset: DatedEvent, judged: JudgedPhotometry, visible_d: float) -> float:
    """Share of the onset's probability in which some quiet observation would have shown it.

    Parameters
    ----------
    onset : DatedEvent
        Forecast with its quantile grid.
    judged : JudgedPhotometry
        Light curve with verdicts.
    visible_d : float
        How long an episode can be seen, days.

    Returns
    -------
    float
        In [0, 1] (dimensionless).

    Notes
    -----
    Accuracy: 1 %, the step of the grid.

    Source: project convention (DEVELOPERS.md: late, unseen).
    """
    if onset.grid is None or np.isnan(onset.grid[0]):
        return 0.0
    quiet = judged.bmjd_tdb[judged.is_quiet]
    first_after = np.searchsorted(quiet, onset.grid, side="right")
    reachable = first_after < quiet.size
    following = quiet[np.minimum(first_after, max(quiet.size - 1, 0))] if quiet.size else np.array(np.inf)
    return float(np.mean(reachable & (following - onset.grid <= visible_d)))


def needs_photometry(onset: DatedEvent, episode: Episode | None, as_of: float, period_d: float) -> bool:
    """Whether the light curve can change the status of an onset today.

    Parameters
    ----------
    onset : DatedEvent
        Forecast of the onset.
    episode : Episode or None
        Confirmed episode of this cycle.
    as_of : float
        The instant of the question, ``bmjd_tdb``.
    period_d : float
        Period, days.

    Returns
    -------
    bool
        False for an onset that is seen, undated, or still far ahead.

    Notes
    -----
    Accuracy: as ``onset_state``.

    Source: project convention.
    """
    if onset.phase_lost or onset.quantiles is None or np.isnan(onset.quantiles[0]) or episode is not None:
        return False
    median, low95 = float(onset.quantiles[0]), float(onset.quantiles[3])
    return _search_start(median, low95, not onset.missing, period_d, as_of) <= as_of


def onset_state(
    onset: DatedEvent,
    end: DatedEvent | None,
    episode: Episode | None,
    judged: JudgedPhotometry | None,
    as_of: float,
    period_d: float,
) -> OnsetState:
    """Status of one cycle's onset at ``as_of``.

    Parameters
    ----------
    onset, end : DatedEvent
        Forecast of the onset and of the end of production, before conditioning on quiet data.
    episode : Episode or None
        Confirmed episode of this cycle.
    judged : JudgedPhotometry or None
        Photometry up to ``as_of`` with verdicts.
    as_of : float
        The instant of the question, ``bmjd_tdb``.
    period_d : float
        Period, days.

    Returns
    -------
    OnsetState
        Status and a supporting note.

    Notes
    -----
    Accuracy: a status is a rule, not a measurement; the rule is that of README.md.

    Source: DEVELOPERS.md (Status).
    """
    if onset.phase_lost or onset.quantiles is None:
        return OnsetState("phase lost")
    if episode is not None:
        return _seen_state(episode, end, as_of, period_d)
    median, _, _, low95, high95 = (float(q) for q in onset.quantiles)
    known = not onset.missing
    if judged is not None:
        since = suspected_since(judged, _search_start(median, low95, known, period_d, as_of), as_of)
        if since is not None:
            return OnsetState("suspected", "unexplained excess, not confirmed", since)
    if not known:
        return _state_without_error(median, as_of, period_d)
    if as_of < low95:
        return OnsetState("expected")
    if as_of <= high95:
        return OnsetState("open", _quiet_note(judged, as_of))
    if judged is not None and judged.bmjd_tdb.size:
        share = covered_share(onset, judged, visible_span_d(onset, end, period_d))
        chance = 1.0 if onset.probability is None else onset.probability
        if share >= COVERED_SHARE and chance < COVERED_SHARE:
            return OnsetState("over", f"quiet throughout: no episode, which the rule gave {1.0 - chance:.0%}")
        if share >= COVERED_SHARE:
            return OnsetState(
                "late",
                "the 95 % interval has passed and quiet observations cover it: elements and data disagree",
            )
        if share >= 0.005:
            return OnsetState("unseen", f"observations cover only {share:.0%} of the onset's interval")
    return OnsetState("unseen", "no observation would have shown it")


def _state_without_error(median: float, as_of: float, period_d: float) -> OnsetState:
    """Nobody knows how wide the interval is; half a period on, it is no longer this cycle's."""
    if as_of < median:
        return OnsetState("expected")
    if as_of - median > FORGOTTEN_PERIODS * period_d:
        return OnsetState("unseen", "half a period has passed since its date, whose error is unknown")
    return OnsetState("open")


def _search_start(median: float, low95: float, known: bool, period_d: float, as_of: float) -> float:
    """Excess long before the forecast belongs to an earlier, unrecorded episode."""
    earliest = (low95 if known else median) - SEARCH_PERIODS * period_d
    return max(earliest, as_of - 0.25 * period_d)


def _quiet_note(judged: JudgedPhotometry | None, as_of: float) -> str:
    if judged is None or judged.last_quiet is None:
        return "no quiet observation to say that it has not begun"
    return f"quiet {as_of - judged.last_quiet:.0f} d ago: no onset then"


def _seen_state(episode: Episode, end: DatedEvent | None, as_of: float, period_d: float) -> OnsetState:
    if episode.onset is not None and episode.onset.moment.bmjd_tdb > as_of:
        return OnsetState("expected")
    if episode.end is not None:
        return OnsetState("over" if episode.end.moment.bmjd_tdb <= as_of else "under way")
    if end is not None and end.quantiles is not None:
        over = float(end.quantiles[0]) if end.missing else float(end.quantiles[4])
        return OnsetState("over" if over < as_of else "under way")
    seen = [d.moment.bmjd_tdb for d in (episode.onset, episode.maximum) if d is not None]
    if seen and as_of - max(seen) > FORGOTTEN_PERIODS * period_d:
        return OnsetState("over", "no end was ever recorded, and half a period has passed")
    return OnsetState("under way", "no end is forecast or observed")


def later_status(event: DatedEvent, onset: OnsetState, as_of: float) -> Status:
    """Status of a maximum or an end, which follows that of its onset.

    Parameters
    ----------
    event : DatedEvent
        The maximum or the end.
    onset : OnsetState
        Status of the same cycle's onset.
    as_of : float
        ``bmjd_tdb``.

    Returns
    -------
    str
        One of the statuses of README.md.

    Notes
    -----
    Accuracy: as ``onset_state``.

    Source: DEVELOPERS.md (Status).
    """
    if event.phase_lost or event.quantiles is None:
        return "phase lost"
    if onset.status in ("late", "unseen"):
        return onset.status
    return plain_status(event, as_of)


def plain_status(event: DatedEvent, as_of: float) -> Status:
    """Expected, or past once the median has gone by.

    Parameters
    ----------
    event : DatedEvent
        Any event with a date.
    as_of : float
        ``bmjd_tdb``.

    Returns
    -------
    str
        ``expected``, ``past`` or ``phase lost``.

    Notes
    -----
    Accuracy: as the forecast.

    Source: DEVELOPERS.md (Status).
    """
    if event.phase_lost or event.quantiles is None:
        return "phase lost"
    return "past" if float(event.quantiles[0]) <= as_of else "expected"
