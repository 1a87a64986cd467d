"""What a wind collision looks like: the question, and the result that terminal, JSON and Python share."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, Literal

from campaign.model.compositions import Composition
from campaign.model.instants import TypedInstant
from campaign.model.measured import Measured
from campaign.model.propagated import Propagated
from campaign.model.systems import StarName

Law = Literal["constant", "beta"]
Zone = Literal["cavity", "rim", "stronger wind"]
InputOrigin = Literal["catalogue", "option", "spectral type", "assumed"]


@dataclass(frozen=True, slots=True)
class WindOverrides:
    """What the user says in place of the catalogue: fields of stars, system and solution by their names.

    ``epoch`` is one of periastron.
    """

    star_a: Mapping[str, Any] = field(default_factory=dict)
    star_b: Mapping[str, Any] = field(default_factory=dict)
    system: Mapping[str, Any] = field(default_factory=dict)
    solution: Mapping[str, Any] = field(default_factory=dict)
    epoch: TypedInstant | None = None
    composition_a: Composition | None = None
    composition_b: Composition | None = None
    momentum_ratio_b_over_a: Measured | None = None
    beta: Measured | None = None
    flare_deg: Measured | None = None


@dataclass(frozen=True, slots=True)
class WindInput:
    """One number that went in."""

    name: str
    value: Measured
    unit: str
    origin: InputOrigin


@dataclass(frozen=True, slots=True)
class OpeningForm:
    """One published form of the half-opening angle about the star with the weaker wind."""

    name: str
    source: str
    half_opening_deg: Propagated


@dataclass(frozen=True, slots=True)
class SurfacePoint:
    """A point of the contact surface: ``angle_deg`` at the weaker star from the direction to the stronger.

    ``along_over_d`` counts from the stronger star through the weaker, ``across_over_d`` at right angles, in
    separations, for the nominal momentum ratio. A bound of the distance is None where the surface does not
    reach that direction any more.
    """

    angle_deg: float
    from_weaker_over_d: Propagated
    along_over_d: float
    across_over_d: float


@dataclass(frozen=True, slots=True)
class Cooling:
    """The cooling parameter of one wind around the orbit, at constant speed or with a velocity law.

    It is below 1 within ``half_window`` of periastron in the draws in which it crosses 1. An indicator: it
    decides nothing.
    """

    star: StarName
    law: Law
    periastron: Propagated
    apastron: Propagated
    half_window_periods: Propagated
    half_window_d: Propagated | None
    probability_crosses: float | None
    probability_always_above: float | None
    probability_always_below: float | None


@dataclass(frozen=True, slots=True)
class WindOfStar:
    """One wind and what the shock makes of it at terminal speed."""

    star: StarName
    role: Literal["stronger", "weaker"]
    spectral_type: str | None
    composition: Composition
    composition_origin: InputOrigin
    mean_weight: Propagated
    postshock_temperature_k: Propagated
    postshock_energy_kev: Propagated


@dataclass(frozen=True, slots=True)
class SightZone:
    """When the line of sight lies inside a cone: phases from periastron, in periods."""

    zone: Zone
    opening_deg: Propagated
    from_phase: Propagated
    until_phase: Propagated
    share_of_orbit: Propagated
    probability_ever: float | None
    probability_always: float | None


@dataclass(frozen=True, slots=True)
class Sightline:
    """The line of sight against the axis of the cone, which points through the star with the weaker wind."""

    least_angle_deg: Propagated
    greatest_angle_deg: Propagated
    cavity: SightZone
    cavity_and_rim: SightZone


@dataclass(frozen=True, slots=True)
class WindEvent:
    """A dated change: a cooling parameter crosses 1, or the line of sight enters or leaves a cone."""

    event: str
    cycle: int
    phase: float
    bmjd_tdb: Propagated
    utc: str | None
    probability: float | None


@dataclass(frozen=True, slots=True)
class ProfilePoint:
    """Nominal values at one phase from periastron, for pictures."""

    phase: float
    separation_au: float | None
    chi_a: float | None
    chi_b: float | None
    sightline_deg: float | None
    seen_through: Zone | None


@dataclass(frozen=True, slots=True)
class WindRow:
    """One line of the dated table; None where the inputs do not give the quantity."""

    bmjd_tdb: float
    utc: str | None
    cycle: int
    phase: Propagated
    separation_au: Propagated | None
    contact_from_a_au: Propagated | None
    contact_from_b_au: Propagated | None
    chi_a: Propagated | None
    chi_b: Propagated | None
    speed_a_kms: Propagated | None
    speed_b_kms: Propagated | None
    chi_a_beta: Propagated | None
    chi_b_beta: Propagated | None
    postshock_a_k: Propagated | None
    postshock_b_k: Propagated | None
    sightline_deg: Propagated | None
    seen_through: Zone | None
    probability_cavity: float | None
    probability_rim: float | None


@dataclass(frozen=True, slots=True)
class WindsResult:
    """The wind collision of one system through its orbit."""

    system: str
    solution: str | None
    as_of_utc: str
    stronger: StarName
    weaker: StarName
    roles_swapped: bool
    probability_roles_swapped: float | None
    momentum_ratio: Propagated
    stagnation_from_weaker_over_d: Propagated
    stagnation_from_stronger_over_d: Propagated
    half_opening_deg: Propagated
    shock_opening_deg: Propagated
    winds: tuple[WindOfStar, ...]
    forms: tuple[OpeningForm, ...]
    surface: tuple[SurfacePoint, ...]
    cooling: tuple[Cooling, ...]
    sightline: Sightline | None
    skew_periastron_deg: float | None
    skew_apastron_deg: float | None
    profile: tuple[ProfilePoint, ...]
    events: tuple[WindEvent, ...]
    rows: tuple[WindRow, ...]
    inputs: tuple[WindInput, ...]
    draws: int
    seed: int
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
