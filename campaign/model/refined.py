"""A refined ephemeris: dated events, ways to count their cycles, the line through them, and what follows."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from campaign.model.forecasts import Quantiles, UtcQuantiles
from campaign.model.measured import Measured

RefinedEvent = Literal["onset", "maximum"]
# ``quiet``: an episode there would have shown; ``in part``: parts of its interval are covered; ``excess``:
# something was seen there that is no confirmed episode.
MissedVerdict = Literal["quiet", "in part", "not observed", "excess"]


@dataclass(frozen=True, slots=True)
class RefinedDate:
    """One dated event: what was observed, what the line says, and their difference, in days.

    Where ``bracketed``, the event lies anywhere between ``bmjd_tdb`` - ``minus_d`` and + ``plus_d``; else
    these are one-sigma errors, ``error_assumed`` where none was stated. ``sigma`` is O-C over its error, the
    scatter included.
    """

    episode: int
    cycle: int
    event: RefinedEvent
    band: str | None
    bmjd_tdb: float
    utc: str | None
    minus_d: float
    plus_d: float
    bracketed: bool
    error_assumed: bool
    computed_bmjd_tdb: float
    o_minus_c_d: float
    sigma: float


@dataclass(frozen=True, slots=True)
class MissedCycle:
    """A cycle without a known episode, and what was observed then; ``chance`` is that of the observations
    had an episode happened, over that without one."""

    cycle: int
    bmjd_tdb: Quantiles
    utc: UtcQuantiles
    verdict: MissedVerdict
    chance: float


@dataclass(frozen=True, slots=True)
class CycleCounting:
    """One way to count the cycles of the episodes (numbers of the system).

    ``divisor`` m above 1: the alias P/m of a count in the list. ``probability`` is of all that fit the dates,
    with the quiet observations; ``dates_share`` is the likelihood by the dates alone, relative to the best.
    ``chi2`` is that of the weighted line without any scatter.
    """

    number: int
    cycles: tuple[int, ...]
    divisor: int
    period_d: Measured
    chi2: float
    degrees_of_freedom: int
    dates_share: float
    quiet_chance: float
    probability: float
    excluded: bool
    missed: tuple[MissedCycle, ...]
    against_orbit_sigma: float | None = None


@dataclass(frozen=True, slots=True)
class PlainLine:
    """Weighted least squares by the stated errors, never rescaled; ``best_cycle`` has the least variance."""

    epoch_cycle: int
    epoch_bmjd_tdb: Measured
    period_d: Measured
    covariance_d2: float
    correlation: float
    best_cycle: float
    chi2: float
    degrees_of_freedom: int


@dataclass(frozen=True, slots=True)
class RefinedEphemeris:
    """T(k) = epoch + (k - epoch_cycle) period, the scatter marginalised; errors are one sigma.

    ``maximum_after_onset_d`` is the offset when both are fitted together. ``scatter_d`` is how far single
    events deviate; ``prior_used``: the dates alone do not tell it.
    """

    event: RefinedEvent
    epoch_cycle: int
    epoch_bmjd_tdb: Measured
    epoch_utc: str | None
    period_d: Measured
    covariance_d2: float
    best_cycle: float
    scatter_d: Measured
    prior_used: bool
    maximum_after_onset_d: Measured | None = None


@dataclass(frozen=True, slots=True)
class PeriodChange:
    """A period that changes: days a cycle; kept only when AICc falls by more than 2."""

    change_d_per_cycle: Measured | None
    aicc_gain: float | None
    kept: bool
    why: str


@dataclass(frozen=True, slots=True)
class OrbitComparison:
    """The orbit's own period and epoch beside those of the episodes; tensions are (episodes - orbit)/sigma.

    ``event_after_epoch_d`` is from what the orbit's epoch marks to the fitted event, of one cycle.
    ``event_tension_sigma`` compares the fitted event with the dust rule's own.
    """

    solution: str
    period_d: Measured | None
    period_tension_sigma: float | None
    combined_period_d: Measured | None
    epoch_marks: str
    event_after_epoch_d: Measured | None
    event_tension_sigma: float | None
    note: str = ""


@dataclass(frozen=True, slots=True)
class ForecastChange:
    """The next event as it is forecast now, and as it would be from the refined solution."""

    event: str
    cycle: int | None
    before: Quantiles | None
    before_utc: str | None
    after: Quantiles | None
    after_utc: str | None
    shift_d: float | None
    width_ratio: float | None
    text: str


@dataclass(frozen=True, slots=True)
class SingleEpisode:
    """What one episode and the time without another say: a lower limit and a probability a year."""

    event: RefinedEvent
    bmjd_tdb: float
    utc: str | None
    elapsed_d: float
    at_least_d: float | None
    at_least_share: float
    probability_per_yr: float | None
    covered_d: float


@dataclass(frozen=True, slots=True)
class Refinement:
    """What the dated episodes of a system say of its clock. Instants ``bmjd_tdb``."""

    system: str
    as_of_utc: str
    events: tuple[RefinedEvent, ...]
    episodes: int
    dates: tuple[RefinedDate, ...]
    counts: tuple[CycleCounting, ...]
    chosen: int | None
    ephemeris: RefinedEphemeris | None
    line: PlainLine | None
    next_event: Quantiles | None
    next_utc: UtcQuantiles | None
    next_cycle: int | None
    change_of_period: PeriodChange | None = None
    orbit: OrbitComparison | None = None
    forecast_change: ForecastChange | None = None
    single: SingleEpisode | None = None
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
