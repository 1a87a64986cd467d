"""Nested dust shells: what is known of them, what an image says, and where they will be."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

ShellQuantityName = Literal["spacing_arcsec", "proper_motion_mas_yr", "speed_kms", "period_yr", "distance_pc"]
SHELL_QUANTITIES: tuple[ShellQuantityName, ...] = (
    "spacing_arcsec", "proper_motion_mas_yr", "speed_kms", "period_yr", "distance_pc",
)  # fmt: skip

# What the measured radii belong to: it decides what a radius says of the way travelled.
ShellFeature = Literal["limb", "ring", "plume"]
SHELL_FEATURES: tuple[ShellFeature, ...] = ("limb", "ring", "plume")

AccelerationVerdict = Literal["accelerated", "constant", "decelerated", "undecided"]


@dataclass(frozen=True, slots=True)
class ShellQuantity:
    """One of the five quantities that nested shells tie together, in the unit of its name.

    ``sigma`` and the equal-tailed bounds are None where an error that they need is unknown. ``origin``
    says whether it was stated or follows from the others; ``source`` where a stated one comes from
    (typed, catalogue, orbit, wind); ``basis`` names what a derived one rests on.
    """

    name: ShellQuantityName
    value: float
    sigma: float | None
    lo68: float | None
    hi68: float | None
    lo95: float | None
    hi95: float | None
    origin: Literal["given", "derived"]
    source: str = ""
    basis: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class ShellTension:
    """How far two determinations of one quantity lie apart: (first - against)/sigma of it, signed.

    ``sigma`` is None where an error is unknown. ``reasons`` says what would explain a high tension.
    """

    quantity: str
    determined_from: str
    against: str
    sigma: float | None
    value: float
    against_value: float
    reasons: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class DatedShell:
    """One shell of one image. The youngest visible has index 1; ages are years before the image.

    ``residual_sigma`` is the measured radius against the fit. ``phase`` is that of the launch in the
    orbit, in [-0.5, 0.5) about periastron; ``window_sigma`` the launch against the middle of the
    production window, its half width counted as error. None where nothing says so.
    """

    index: float
    radius_arcsec: float
    sigma_arcsec: float | None
    image_bmjd_tdb: float | None
    fitted_radius_arcsec: float | None
    residual_sigma: float | None
    age_yr: float | None
    age_sigma_yr: float | None
    age_lo68_yr: float | None = None
    age_hi68_yr: float | None = None
    age_lo95_yr: float | None = None
    age_hi95_yr: float | None = None
    launched_bmjd_tdb: float | None = None
    launched_sigma_d: float | None = None
    launched_utc: str | None = None
    cycle: int | None = None
    cycle_probability: float | None = None
    phase: float | None = None
    phase_sigma: float | None = None
    window_sigma: float | None = None
    feature: str | None = None
    observation_id: int | None = None
    notes: tuple[str, ...] = ()
    age_periods: float | None = None
    age_periods_sigma: float | None = None
    stated_index: int | None = None
    position_angle_deg: float | None = None


@dataclass(frozen=True, slots=True)
class ForeseenShell:
    """Where the shell of one cycle should stand in one image; ``measured`` says whether a radius is its.

    ``age_yr`` counts from the middle of the production window where an ephemeris gives it, else from the
    clock of the shells themselves; None of ``cycle`` then.
    """

    image_bmjd_tdb: float | None
    cycle: int | None
    age_yr: float
    radius_arcsec: float
    measured: bool


@dataclass(frozen=True, slots=True)
class ShellAssignment:
    """One way to count the shells: ``indices`` in the order of the radii (x.5 is a blend of two)."""

    indices: tuple[float, ...]
    probability: float
    missing: tuple[int, ...]
    blended: tuple[tuple[int, int], ...]
    meaning: str
    spacing_arcsec: float
    phase_of_youngest: float
    image_bmjd_tdb: float | None = None


@dataclass(frozen=True, slots=True)
class ShellAcceleration:
    """What the radii say of acceleration near the star. Ages: oldest shell, latest image.

    ``criterion_difference`` is the information criterion of constant speed minus that of acceleration:
    positive favours acceleration. Radii in arcsec, speeds as proper motion and, with a distance, km/s.
    """

    verdict: AccelerationVerdict
    criterion: str
    criterion_difference: float
    statement: str
    age_constant_yr: float | None
    age_constant_sigma_yr: float | None
    age_accelerated_yr: float | None
    age_accelerated_sigma_yr: float | None
    launch_radius_arcsec: float | None = None
    launch_radius_sigma_arcsec: float | None = None
    launch_motion_mas_yr: float | None = None
    launch_motion_sigma_mas_yr: float | None = None
    terminal_motion_mas_yr: float | None = None
    terminal_motion_sigma_mas_yr: float | None = None
    launch_speed_kms: float | None = None
    terminal_speed_kms: float | None = None


@dataclass(frozen=True, slots=True)
class ShellMotion:
    """The motion of one shell, or of all together (``label``), and its launch."""

    label: str
    epochs: int
    proper_motion_mas_yr: float
    sigma_mas_yr: float
    launched_bmjd_tdb: float | None = None
    launched_sigma_d: float | None = None
    chi2: float | None = None
    degrees_of_freedom: int | None = None


@dataclass(frozen=True, slots=True)
class ShellDatingResult:
    """Everything that `shells date` tells, for the screen, for programs and for Python."""

    system: str | None
    as_of_utc: str
    quantities: tuple[ShellQuantity, ...]
    shells: tuple[DatedShell, ...]
    tensions: tuple[ShellTension, ...]
    assignments: tuple[ShellAssignment, ...] = ()
    motions: tuple[ShellMotion, ...] = ()
    acceleration: ShellAcceleration | None = None
    chi2: float | None = None
    degrees_of_freedom: int | None = None
    error_scale: float | None = None
    phase_of_youngest: float | None = None
    phase_of_youngest_sigma: float | None = None
    span_yr: float | None = None
    span_sigma_yr: float | None = None
    foreseen: tuple[ForeseenShell, ...] = ()
    not_told: tuple[str, ...] = ()
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class ExpectedShell:
    """Where the shell of one cycle is at one date. ``probability`` is that it is launched by then."""

    cycle: int | None
    launched_bmjd_tdb: float
    launched_sigma_d: float | None
    launched_utc: str | None
    age_yr: float
    radius_arcsec: float
    radius_sigma_arcsec: float | None
    radius_lo68_arcsec: float | None
    radius_hi68_arcsec: float | None
    proper_motion_mas_yr: float
    proper_motion_sigma_mas_yr: float | None
    probability: float | None
    radius_au: float | None = None
    in_view: bool | None = None
    view_probability: float | None = None
    grain_temperature_k: float | None = None
    peak_wavelength_um: float | None = None


@dataclass(frozen=True, slots=True)
class ResolvableDate:
    """When the newest shell grows past the resolution or the inner working angle."""

    cycle: int | None
    limit_arcsec: float
    bmjd_tdb: float
    sigma_d: float | None
    utc: str | None


@dataclass(frozen=True, slots=True)
class ComingShell:
    """An episode that is still to come: when its shell is launched, in the middle of its window."""

    cycle: int | None
    launched_bmjd_tdb: float
    launched_sigma_d: float | None
    launched_utc: str | None


@dataclass(frozen=True, slots=True)
class ExpectedView:
    """All shells at one date."""

    bmjd_tdb: float
    utc: str | None
    shells: tuple[ExpectedShell, ...]
    in_view: int
    beyond_field: int
    within_limit: int


@dataclass(frozen=True, slots=True)
class ShellExpectation:
    """Everything that `shells expect` tells."""

    system: str
    as_of_utc: str
    views: tuple[ExpectedView, ...]
    resolvable: tuple[ResolvableDate, ...]
    quantities: tuple[ShellQuantity, ...]
    field_arcsec: float | None = None
    resolution_arcsec: float | None = None
    outer_radius_arcsec: float | None = None
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()
    coming: tuple[ComingShell, ...] = ()
