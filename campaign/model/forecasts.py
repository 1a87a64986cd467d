"""What a forecast says: results that the terminal, JSON, exports and Python users share."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from campaign.model.suspicion import Suspicion

EventName = Literal["periastron", "onset", "maximum", "end", "A in front", "B in front", "resolvable"]
EVENT_NAMES: tuple[EventName, ...] = (
    "periastron", "onset", "maximum", "end", "A in front", "B in front", "resolvable",
)  # fmt: skip

Status = Literal["expected", "open", "late", "unseen", "suspected", "under way", "over", "phase lost", "past"]
STATUSES: tuple[Status, ...] = (
    "expected", "open", "late", "unseen", "suspected", "under way", "over", "phase lost", "past",
)  # fmt: skip


# How the note of an event begins that several weighted solutions date together.
MIXTURE = "mixture of"


@dataclass(frozen=True, slots=True)
class Quantiles:
    """A dated distribution in ``bmjd_tdb``; equal-tailed. Without an error only ``median`` is known."""

    median: float
    sigma_d: float | None = None
    lo68: float | None = None
    hi68: float | None = None
    lo95: float | None = None
    hi95: float | None = None


@dataclass(frozen=True, slots=True)
class UtcQuantiles:
    """The same instants in the UTC scale at the barycentre, ISO 8601, Z; None outside years 1-9999."""

    median: str | None = None
    lo68: str | None = None
    hi68: str | None = None
    lo95: str | None = None
    hi95: str | None = None


@dataclass(frozen=True, slots=True)
class Conditioning:
    """What quiet observations did to a date.

    ``before`` is the date without them. ``evidence`` is their chance under the forecast over their chance
    without any episode; ``inflated_share`` the weight of the component with larger errors. Without ``moved``
    they leave nothing of the forecast, and the date is that of the elements alone.
    """

    before: Quantiles
    observations: int
    last_quiet_bmjd_tdb: float
    evidence: float
    inflated_share: float
    moved: bool = True
    before_utc: UtcQuantiles | None = None
    last_quiet_utc: str | None = None


@dataclass(frozen=True, slots=True)
class EventForecast:
    """One event of one cycle of one system.

    ``bmjd_tdb`` is None when the phase is lost. ``probability`` is that the event happens at all,
    ``probability_in_window`` that it happens inside the window asked for; both None when an error that
    they need is unknown. ``probability_per_yr`` is given when no date can be.
    """

    system: str
    event: EventName
    cycle: int | None
    basis: Literal["orbit", "episodes"]
    solution: str | None
    rule: str | None
    bmjd_tdb: Quantiles | None
    utc: UtcQuantiles | None
    status: Status
    probability: float | None
    probability_in_window: float | None
    phase_lost: bool = False
    probability_per_yr: float | None = None
    observed: bool = False
    disagreement_sigma: float | None = None
    notes: tuple[str, ...] = ()
    conditioning: Conditioning | None = None


@dataclass(frozen=True, slots=True)
class DustWindow:
    """Probability that one system makes dust, at each of ``bmjd_tdb`` (for the timeline).

    ``solution`` is given where the solutions of a system stand side by side.
    """

    system: str
    cycle: int | None
    bmjd_tdb: tuple[float, ...]
    probability: tuple[float, ...]
    solution: str | None = None


@dataclass(frozen=True, slots=True)
class SystemBasis:
    """One line a system: what its dates rest on, or why it has none."""

    system: str
    text: str
    has_forecast: bool


@dataclass(frozen=True, slots=True)
class UpcomingResult:
    """The forecast of a campaign. Instants are ``bmjd_tdb``; ``*_utc`` are the same for people."""

    as_of_bmjd_tdb: float
    as_of_utc: str
    from_bmjd_tdb: float
    until_bmjd_tdb: float
    from_utc: str
    until_utc: str
    events: tuple[EventForecast, ...]
    dust_windows: tuple[DustWindow, ...]
    bases: tuple[SystemBasis, ...]
    draws: int
    seed: int
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
    suspicions: tuple[Suspicion, ...] = ()


@dataclass(frozen=True, slots=True)
class VarianceTerm:
    """One contribution to the variance of a date: its size in days, with sign when it is a covariance."""

    cause: str
    size_d: float
    note: str = ""


@dataclass(frozen=True, slots=True)
class MovedBy:
    """A night of quiet observations, and by how many days the median moved when it came in."""

    bmjd_tdb: float
    utc: str
    bands: tuple[str, ...]
    shift_d: float


@dataclass(frozen=True, slots=True)
class ExplainedEvent:
    """How one date came about: the sum in words and each term of its error, before any quiet observations.

    ``moved_by`` are the nights that moved it most since then.
    """

    forecast: EventForecast
    arithmetic: str
    terms: tuple[VarianceTerm, ...]
    moved_by: tuple[MovedBy, ...] = ()


@dataclass(frozen=True, slots=True)
class ExplainedSystem:
    """A forecast told step by step for one system."""

    system: str
    elements: tuple[tuple[str, str, str], ...]
    cycle_count: tuple[str, ...]
    events: tuple[ExplainedEvent, ...]
    upcoming: UpcomingResult
    notes: tuple[str, ...] = field(default=())


@dataclass(frozen=True, slots=True)
class EphemerisRow:
    """One line of a dated table; None where the elements do not give the quantity."""

    bmjd_tdb: float
    utc: str | None
    cycle: int
    phase: float
    true_anomaly_deg: float | None
    separation_au: float | None
    separation_mas: float | None
    projected_separation_mas: float | None
    position_angle_deg: float | None
    velocity_a_kms: float | None
    velocity_b_kms: float | None


@dataclass(frozen=True, slots=True)
class EphemerisResult:
    """The dated table of one system from one solution."""

    system: str
    solution: str
    as_of_utc: str
    rows: tuple[EphemerisRow, ...]
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
