"""The words in which an invented system is described before anything is drawn."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from campaign.model.systems import EpochMark, RuleKind, StarName, SystemState

Rise = Literal["linear", "fast", "saturating"]
Error = float | tuple[float, float] | None  # one sigma; (minus, plus); not stated


@dataclass(frozen=True, slots=True)
class StarSpec:
    """One star: true mass and wind, and what is printed of it."""

    spectral_type: str
    mass_msun: float
    wind_speed_kms: float
    mass_loss_msun_yr: float
    luminosity_lsun: float
    temperature_k: float
    radius_rsun: float


@dataclass(frozen=True, slots=True)
class DustSpec:
    """How dust truly follows the orbit, and how it looks.

    ``phase`` and ``lag`` use the three offsets (periods, days). ``separation`` uses the critical
    separation, which varies from cycle to cycle by ``critical_scatter_au``, and the travel time.
    ``contrast_k`` is the dust's flux over the stars' in K at maximum; ``decay_k_d`` its e-folding time.
    """

    kind: Literal["phase", "lag", "separation", "none"]
    onset: float = 0.0
    maximum: float = 0.0
    end: float = 0.0
    scatter_onset_d: float = 0.0
    scatter_maximum_d: float = 0.0
    scatter_end_d: float = 0.0
    critical_separation_au: float = 0.0
    critical_scatter_au: float = 0.0
    condensation_distance_au: float = 0.0
    flow_speed_kms: float = 0.0
    rise: Rise = "linear"
    contrast_k: float = 1.0
    decay_k_d: float = 150.0
    # Days by which one cycle's onset departs from the rule, where a case needs it.
    onset_shift_d: Mapping[int, float] = field(default_factory=dict)
    # (days after onset, duration, share of the contrast) of brief brightenings, by cycle.
    brief: Mapping[int, tuple[tuple[float, float, float], ...]] = field(default_factory=dict)


@dataclass(frozen=True, slots=True)
class SolutionSpec:
    """A solution to be drawn: which elements it states and how well.

    ``pull`` fixes, in sigma, how far an estimate lies above its truth where a case needs it;
    ``calm`` bounds the others' scatter to that many sigma; ``unstated`` is the scatter of an element
    whose error was never printed.
    """

    label: str
    source: str
    until_yr: float
    epoch_cycle: int
    errors: Mapping[str, Error]
    epoch_marks: EpochMark = "periastron"
    omega_of: StarName = "A"
    adopted: bool = True
    weight: float | None = None
    pull: Mapping[str, float] = field(default_factory=dict)
    unstated: Mapping[str, float] = field(default_factory=dict)
    calm: float = 2.5
    correlated: tuple[str, str, float] | None = None
    period_limit_yr: float | None = None
    published_cycle_offset: int | None = None
    note: str = ""


@dataclass(frozen=True, slots=True)
class RuleSpec:
    """A dust rule to be drawn: which quantities it states, how well, and the scatters as stated."""

    kind: RuleKind
    errors: Mapping[str, Error] = field(default_factory=dict)
    scatter_onset_d: float | None = None
    scatter_maximum_d: float | None = None
    scatter_end_d: float | None = None
    note: str = ""


@dataclass(frozen=True, slots=True)
class WatchSpec:
    """How a system was watched: which series, from when to when, and visits asked for by name.

    ``visits_before_d`` are days before the sample's date at which the watch sheets certainly have K.
    """

    series: tuple[int, ...]
    start_yr: float = 1987.0
    stop_before_d: float = 0.0
    thinning: float = 1.0
    visits_before_d: tuple[float, ...] = ()
    skip_yr: tuple[tuple[float, float], ...] = ()


@dataclass(frozen=True, slots=True)
class SystemSpec:
    """One invented system: its truth, its story, and what the network learnt of it."""

    name: str
    aliases: tuple[str, ...]
    story: str
    cases: tuple[str, ...]
    ra_deg: float
    dec_deg: float
    distance_pc: float
    distance_error: Error
    star_a: StarSpec
    star_b: StarSpec
    period_yr: float
    reference_cycle: int
    reference_bmjd_tdb: float
    eccentricity: float
    omega_b_deg: float
    inclination_deg: float
    node_deg: float
    gamma_kms: float
    k_mag: float
    colours: tuple[float, float, float, float]
    dust: DustSpec
    watch: WatchSpec
    solutions: tuple[SolutionSpec, ...] = ()
    rule: RuleSpec | None = None
    confirmed: tuple[int, ...] = ()
    proposed: tuple[int, ...] = ()
    rejected: tuple[int, ...] = ()
    dating_d: tuple[float, float, float] = (8.0, 12.0, 25.0)
    state: SystemState = "episodic"
    priority: int = 3
    by_parallax: bool = False
    stars_known: bool = False
    velocities: int = 0
    positions: int = 0
    shell_epochs_yr: tuple[float, ...] = ()
    shells_seen: int = 0
    dust_speed_kms: float = 0.0
    notes: str = ""
