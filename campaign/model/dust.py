"""Dust of a system: the question, and what grains, starlight and photometry say of it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from campaign.model.measured import Measured, Range
from campaign.model.propagated import Propagated

DustOrigin = Literal["catalogue", "dust rule", "option", "derived", "assumed"]
Pushed = Literal["free grains", "grains with their gas"]
BandUse = Literal["measured", "fainter than", "brighter than"]


@dataclass(frozen=True, slots=True)
class ZeroPointGiven:
    """Flux density of magnitude zero of a band as given by the user; None for every photometric system."""

    band: str
    photometric_system: str | None
    flux_jy: Measured
    wavelength_um: float


@dataclass(frozen=True, slots=True)
class LevelGiven:
    """The stars' own magnitude in a band as given by the user; None where they do not matter."""

    band: str
    mag: Measured | None


@dataclass(frozen=True, slots=True)
class DustOpacity:
    """Which opacity is used: a table by name, or a power law per gram of dust; its error as a share of it."""

    table: str | None = None
    kappa_cm2_g: Measured | None = None
    wavelength_um: float | None = None
    index: float | None = None
    error: float | None = None


@dataclass(frozen=True, slots=True)
class DustOverrides:
    """What the user says in place of the catalogue: inputs by key, opacity, zero points and levels.

    ``zero_points_of`` says which known photometric system stands in for one that is not known.
    ``extinction_k_mag`` is the interstellar extinction in K.
    """

    inputs: Mapping[str, Measured | Range] = field(default_factory=dict)
    opacity: DustOpacity = DustOpacity()
    zero_points: tuple[ZeroPointGiven, ...] = ()
    zero_points_of: Mapping[str, str] = field(default_factory=dict)
    levels: tuple[LevelGiven, ...] = ()
    extinction_k_mag: Measured | None = None
    distances_au: tuple[float, ...] = ()


@dataclass(frozen=True, slots=True)
class DustInput:
    """One number that went in."""

    key: str
    name: str
    value: Measured | Range
    unit: str
    origin: DustOrigin
    note: str = ""


@dataclass(frozen=True, slots=True)
class GrainAt:
    """How hot a grain is at a distance."""

    distance_au: float
    temperature_k: Propagated


@dataclass(frozen=True, slots=True)
class CondensationAt:
    """Where grains have a temperature, and how long the gas is on its way there.

    ``power_law_radius_au`` is what a power law continued into the ultraviolet would give, for comparison.
    """

    temperature_k: float
    radius_au: Propagated
    delay_d: Propagated | None
    power_law_radius_au: float | None


@dataclass(frozen=True, slots=True)
class DustPush:
    """How light drives grains that are free, or that carry their gas with them."""

    kind: Pushed
    opacity_cm2_g: Propagated
    beta: Propagated
    terminal_speed_kms: Propagated


@dataclass(frozen=True, slots=True)
class DustPhysics:
    """Grains in the stars' light. None is what the inputs do not give; ``rule_line`` is ready to type."""

    luminosity_lsun: Propagated
    grains: tuple[GrainAt, ...]
    condensation: tuple[CondensationAt, ...]
    condensation_radius_au: Propagated
    stagnation_from_a_au: Propagated | None
    travel_au: Propagated
    delay_d: Propagated | None
    launch_speed_kms: Propagated | None
    pushes: tuple[DustPush, ...]
    rule_line: str | None


@dataclass(frozen=True, slots=True)
class BandExcess:
    """One band near a date: what was seen, what the stars give, and what is left for the dust.

    ``dust_jy`` is the bound where ``use`` is no measurement. A band that is not fitted says why.
    ``zero_point_error_assumed`` is the share that stands in for an error of the zero point that nobody told.
    """

    band: str
    photometric_system: str
    zero_points: str
    use: BandUse
    points: int
    sources: tuple[str, ...]
    bmjd_tdb: float
    wavelength_um: float | None
    observed_jy: float | None
    star_jy: float | None
    dust_jy: float | None
    sigma_jy: float | None
    common_sigma_jy: float | None
    excess_sigma: float | None
    dust_over_star: float | None
    kappa_cm2_g: float | None
    fitted: bool
    reason: str = ""
    zero_point_error_assumed: float | None = None


@dataclass(frozen=True, slots=True)
class PairColour:
    """Temperature from the ratio of two bands; None where no temperature gives the ratio."""

    first: str
    second: str
    temperature_k: Propagated | None
    reason: str = ""


@dataclass(frozen=True, slots=True)
class DustVerdict:
    """What is wrong with a number; with ``meaningless`` no mass is given."""

    code: str
    text: str
    meaningless: bool


@dataclass(frozen=True, slots=True)
class OtherOpacity:
    """The same fluxes read with another opacity."""

    name: str
    temperature_k: float | None
    mass_msun: float | None
    chi2: float


@dataclass(frozen=True, slots=True)
class MeasuredDust:
    """Dust at one date, from photometry at most ``within_d`` away.

    ``temperature_origin`` says whether it was fitted, given, or is not known.
    """

    bmjd_tdb: float
    utc: str | None
    bands: tuple[BandExcess, ...]
    pairs: tuple[PairColour, ...]
    temperature_origin: Literal["fitted", "given", "none"]
    temperature_k: Propagated | None
    mass_msun: Propagated | None
    mass_upper_msun: float | None
    mass_g: Propagated | None
    luminosity_lsun: Propagated | None
    chi2: float | None
    degrees: int | None
    chi2_probability: float | None
    blackbody_radius_au: float | None
    grain_distance_au: float | None
    optical_depth: float | None
    other_opacities: tuple[OtherOpacity, ...]
    verdicts: tuple[DustVerdict, ...]
    within_d: float | None = None

    @property
    def is_meaningless(self) -> bool:
        return any(verdict.meaningless for verdict in self.verdicts)


@dataclass(frozen=True, slots=True)
class ProductionRate:
    """Change of the mass between two dates, a year."""

    start_bmjd_tdb: float
    end_bmjd_tdb: float
    start_utc: str | None
    end_utc: str | None
    rate_msun_yr: Propagated


@dataclass(frozen=True, slots=True)
class DustThrough:
    """An episode: dates with their dust, and how fast its mass changes between them."""

    epochs: tuple[MeasuredDust, ...]
    rates: tuple[ProductionRate, ...]
    cycle: int | None = None


@dataclass(frozen=True, slots=True)
class DustResult:
    """Everything that ``campaign dust`` tells."""

    system: str
    as_of_utc: str
    inputs: tuple[DustInput, ...]
    opacity: str
    opacity_source: str
    physics: DustPhysics | None = None
    measured: MeasuredDust | None = None
    through: DustThrough | None = None
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
