"""Systems, stars, solutions, dust rules, sites and episodes."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Limit, Measured, Range

StarName = Literal["A", "B"]
SystemState = Literal["episodic", "persistent", "candidate", "retired"]
RuleKind = Literal["phase", "lag", "separation", "learned"]
EpochMark = Literal["periastron", "A in front", "B in front", "onset", "maximum"]

SYSTEM_STATES: tuple[SystemState, ...] = ("episodic", "persistent", "candidate", "retired")
RULE_KINDS: tuple[RuleKind, ...] = ("phase", "lag", "separation", "learned")
EPOCH_MARKS: tuple[EpochMark, ...] = ("periastron", "A in front", "B in front", "onset", "maximum")


@dataclass(frozen=True, slots=True)
class Star:
    """One star of a system. Star A and star B are fixed at entry and never re-sorted."""

    star: StarName
    spectral_type: str | None = None
    mass_msun: Measured | None = None
    luminosity_lsun: Measured | None = None
    temperature_k: Measured | None = None
    radius_rsun: Measured | None = None
    mass_loss_msun_yr: Measured | None = None
    wind_speed_kms: Measured | None = None


@dataclass(frozen=True, slots=True)
class System:
    """One binary (or multiple) under watch; position in ICRS at ``position_epoch_jyr``."""

    id: int
    name: str
    ra_deg: float
    dec_deg: float
    position_epoch_jyr: float = 2000.0
    pm_ra_cosdec_mas_yr: float | None = None
    pm_dec_mas_yr: float | None = None
    distance_pc: Measured | None = None
    parallax_mas: Measured | None = None
    state: SystemState = "episodic"
    priority: int = 3
    notes: str = ""
    aliases: tuple[str, ...] = ()
    star_a: Star = Star("A")
    star_b: Star = Star("B")
    cycle_anchor_bmjd_tdb: float | None = None
    cycle_anchor_period_d: float | None = None


@dataclass(frozen=True, slots=True)
class Solution:
    """One published or fitted set of orbital elements.

    ``period_d`` may be a limit or a range. ``omega_deg`` belongs to the star ``omega_of``.
    ``epoch_cycle`` is the system's cycle number of the epoch; ``published_cycle_offset`` is the
    published count minus the system's. ``weight`` is None for a solution adopted alone.
    """

    id: int
    system_id: int
    label: str
    period_d: Measured | Limit | Range | None = None
    epoch: Moment | None = None
    epoch_marks: EpochMark = "periastron"
    eccentricity: Measured | None = None
    omega_deg: Measured | None = None
    omega_of: StarName | None = None
    inclination_deg: Measured | None = None
    node_deg: Measured | None = None
    k_a_kms: Measured | None = None
    k_b_kms: Measured | None = None
    gamma_kms: Measured | None = None
    a_au: Measured | None = None
    a_arcsec: Measured | None = None
    covariance: Covariance | None = None
    source: str = ""
    data_until_bmjd_tdb: float | None = None
    adopted: bool = False
    weight: float | None = None
    epoch_cycle: int | None = None
    published_cycle_offset: int | None = None
    note: str = ""


@dataclass(frozen=True, slots=True)
class DustRule:
    """How onset, maximum and end of dust production follow from the orbit.

    ``onset``, ``maximum`` and ``end`` are offsets from periastron: in periods for ``phase``, in days
    for ``lag``; negative means before. For ``separation``, production runs while the separation is
    at most ``critical_separation_au`` and the dust appears after ``condensation_distance_au`` at
    ``flow_speed_kms``; ``maximum_lag_d`` replaces the delay for the maximum when given. The scatters
    are cycle-to-cycle standard deviations in days; None means that none was stated.
    """

    id: int
    system_id: int
    kind: RuleKind
    onset: Measured | None = None
    maximum: Measured | None = None
    end: Measured | None = None
    critical_separation_au: Measured | None = None
    condensation_distance_au: Measured | None = None
    flow_speed_kms: Measured | None = None
    maximum_lag_d: Measured | None = None
    scatter_onset_d: float | None = None
    scatter_maximum_d: float | None = None
    scatter_end_d: float | None = None
    note: str = ""


@dataclass(frozen=True, slots=True)
class Site:
    """A place to observe from: on the ground, or a space platform known by its solar-elongation range."""

    id: int
    name: str
    kind: Literal["ground", "space"] = "ground"
    latitude_deg: float | None = None
    longitude_deg_east: float | None = None
    height_m: float | None = None
    horizon_deg: float | None = None
    elongation_min_deg: float | None = None
    elongation_max_deg: float | None = None
    time_zone: str | None = None
    notes: str = ""


@dataclass(frozen=True, slots=True)
class DatedEvent:
    """When one stage of an episode happened, in which band, found by which method."""

    moment: Moment
    band: str | None = None
    method: str | None = None


@dataclass(frozen=True, slots=True)
class Episode:
    """One observed burst of dust production. Only ``confirmed`` episodes are knowledge."""

    id: int
    system_id: int
    cycle: int | None
    state: Literal["proposed", "confirmed", "rejected"] = "confirmed"
    onset: DatedEvent | None = None
    maximum: DatedEvent | None = None
    end: DatedEvent | None = None
    source: str = ""
    note: str = ""
