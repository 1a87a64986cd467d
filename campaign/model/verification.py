"""Forecasts as they were kept, what came of them, and how well they did."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import datetime
from typing import Literal

from campaign.model.forecasts import EventForecast, EventName


@dataclass(frozen=True, slots=True)
class UsedSolution:
    """A solution that a forecast rested on; ``data_until_bmjd_tdb`` is None when nobody said."""

    id: int
    label: str
    weight: float | None
    data_until_bmjd_tdb: float | None
    entered_at: datetime | None


@dataclass(frozen=True, slots=True)
class UsedRule:
    """The dust rule that a forecast rested on; ``id`` is 0 when it was learned without being set."""

    id: int
    kind: str
    set_at: datetime | None


@dataclass(frozen=True, slots=True)
class UsedEpisode:
    """A confirmed episode that was known to a forecast; dates ``bmjd_tdb``."""

    id: int
    cycle: int | None
    onset_bmjd_tdb: float | None
    maximum_bmjd_tdb: float | None
    end_bmjd_tdb: float | None
    decided_at: datetime | None


@dataclass(frozen=True, slots=True)
class UsedPhotometry:
    """How much of the light curve was there, and its newest point by time and by entry."""

    points: int
    newest_bmjd_tdb: float | None
    newest_entered_at: datetime | None


@dataclass(frozen=True, slots=True)
class ForecastInputs:
    """Everything of the catalogue that a forecast of one system could use."""

    solutions: tuple[UsedSolution, ...] = ()
    rule: UsedRule | None = None
    episodes: tuple[UsedEpisode, ...] = ()
    photometry: UsedPhotometry = UsedPhotometry(0, None, None)


@dataclass(frozen=True, slots=True)
class KeptForecast:
    """One forecast as it was made.

    ``quantiles_bmjd_tdb`` are its quantiles at the shares (i + 1/2)/n; empty where it has no date, an error
    is unknown, or the event is none that an episode could date. ``reference_*`` is the last date of the same
    stage plus whole periods, with its quoted errors; None where there was none.
    """

    id: int
    keeping_id: int
    system_id: int
    event: EventForecast
    quantiles_bmjd_tdb: tuple[float, ...]
    reference_bmjd_tdb: float | None
    reference_sigma_d: float | None
    inputs: ForecastInputs


@dataclass(frozen=True, slots=True)
class Keeping:
    """What one ``forecast keep`` kept; instants ``bmjd_tdb`` but for the clock's."""

    id: int
    label: str | None
    as_of_bmjd_tdb: float
    from_bmjd_tdb: float
    until_bmjd_tdb: float
    known_at: datetime
    kept_at: datetime
    draws: int
    seed: int
    program_version: str


@dataclass(frozen=True, slots=True)
class ListedKeeping:
    """A keeping with counts of what is in it; ``dated`` ones can be scored some day."""

    keeping: Keeping
    as_of_utc: str | None
    forecasts: int
    systems: int
    dated: int


@dataclass(frozen=True, slots=True)
class KeepingList:
    """Keepings in order, and the forecasts of one of them when it was asked for."""

    keepings: tuple[ListedKeeping, ...]
    forecasts: tuple[KeptForecast, ...] = ()
    chosen: Keeping | None = None


@dataclass(frozen=True, slots=True)
class Outcome:
    """What was confirmed of an event later.

    A date with its one-sigma errors in days (None: unknown), or, when ``first_bmjd_tdb`` is given, a span of
    which nobody knows where in it it happened.
    """

    episode_id: int
    cycle: int | None
    bmjd_tdb: float
    minus_d: float | None
    plus_d: float | None
    first_bmjd_tdb: float | None = None
    last_bmjd_tdb: float | None = None
    band: str | None = None
    decided_at: datetime | None = None

    @property
    def is_span(self) -> bool:
        """Whether only a span is known."""
        return self.first_bmjd_tdb is not None


Containing = Literal["observations", "entries", "solution", "rule"]


@dataclass(frozen=True, slots=True)
class ScoredForecast:
    """One forecast held against what came; days, and shares (dimensionless).

    ``miss_d`` is the outcome less the median. ``reference_crps_d`` is the score of "last date plus period";
    None where there was no last date. ``keeping_id`` is 0 and ``lead_asked_d`` given in a rehearsal.
    """

    keeping_id: int
    keeping_label: str | None
    system: str
    event: EventName
    cycle: int | None
    solution: str | None
    rule: str | None
    lead_d: float
    median_bmjd_tdb: float
    lo68_bmjd_tdb: float
    hi68_bmjd_tdb: float
    lo95_bmjd_tdb: float
    hi95_bmjd_tdb: float
    outcome: Outcome
    outcome_utc: str | None
    miss_d: float
    crps_d: float
    log_score: float | None
    pit: float
    reference_crps_d: float | None
    probability: float | None
    lead_asked_d: float | None = None


@dataclass(frozen=True, slots=True)
class Unscored:
    """A forecast that is not scored, and why.

    ``code``: 'contains-outcome' with what of its inputs does, 'no-interval', 'nothing-known' (rehearsals), or
    'nothing-forecast'.
    """

    keeping_id: int
    keeping_label: str | None
    system: str
    event: EventName
    cycle: int | None
    code: str
    why: str
    containing: tuple[Containing, ...] = ()
    lead_asked_d: float | None = None


@dataclass(frozen=True, slots=True)
class ScoreGroup:
    """Scores of one kind of event at one range of lead times; ``outcomes`` are independent, forecasts not.

    Calibration is judged by one forecast for each outcome, the last before it. ``crps_d`` and
    ``reference_crps_d`` are means over the forecasts that both have; ``skill`` is 1 - their ratio.
    """

    event: EventName
    lead_low_d: float
    lead_high_d: float | None
    forecasts: int
    outcomes: int
    mean_crps_d: float
    mean_log_score: float | None
    mean_miss_d: float
    compared: int
    compared_crps_d: float | None
    reference_crps_d: float | None
    skill: float | None
    coverage68: float | None
    coverage68_lo: float | None
    coverage68_hi: float | None
    coverage95: float | None
    coverage95_lo: float | None
    coverage95_hi: float | None
    pit_mean: float | None
    pit_variance: float | None
    ks_d: float | None
    ks_p: float | None
    verdict: str


@dataclass(frozen=True, slots=True)
class ForecastScores:
    """How well forecasts did; ``waiting`` have no confirmed outcome yet, ``undatable`` can have none.

    ``system``, ``leads_d``, ``entered_any_time`` and ``hidden`` (which solutions were hidden from some
    forecast, and why) belong to a rehearsal.
    """

    as_of_utc: str
    scored: tuple[ScoredForecast, ...]
    unscored: tuple[Unscored, ...]
    groups: tuple[ScoreGroup, ...]
    waiting: int = 0
    undatable: int = 0
    kept: int = 0
    least_outcomes: int = 10
    system: str | None = None
    leads_d: tuple[float, ...] = ()
    entered_any_time: bool = False
    hidden: tuple[str, ...] = ()
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
