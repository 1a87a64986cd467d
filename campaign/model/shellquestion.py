"""What is asked of the shell dater: measured radii and stated quantities, as typed or as logged."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

from campaign.model.measured import Measured
from campaign.model.shells import ShellFeature, ShellQuantityName


@dataclass(frozen=True, slots=True)
class ShellRadius:
    """One measured radius. ``image`` tells the images apart; None of ``bmjd_tdb``: nobody said when.

    ``plate_scale_error`` is relative and shared by all radii of one image; ``feature`` is what was measured,
    in the observer's own words.
    """

    radius_arcsec: Measured
    index: int | None = None
    bmjd_tdb: float | None = None
    bmjd_sigma_d: float | None = None
    image: str = ""
    measured_at: Literal["edge", "peak"] | None = None
    plate_scale_error: float | None = None
    feature: str | None = None
    position_angle_deg: Measured | None = None
    observation_id: int | None = None


@dataclass(frozen=True, slots=True)
class ShellQuestion:
    """What is stated and how it is to be taken.

    ``stated`` holds the quantities typed in the unit of their names; ``correlations`` are of pairs of them.
    ``feature`` and ``inclination_deg`` (of the ring's or plume's orbit to the sky) say how the radii project;
    without a feature they are taken as those of the limb. ``edge_offset_arcsec`` is how much larger an edge
    is than a peak, ``launch_radius_arcsec`` where dust condenses.
    """

    stated: Mapping[ShellQuantityName, Measured] = field(default_factory=dict)
    radii: tuple[ShellRadius, ...] = ()
    correlations: Mapping[tuple[ShellQuantityName, ShellQuantityName], float] = field(default_factory=dict)
    feature: ShellFeature | None = None
    inclination_deg: Measured | None = None
    edge_offset_arcsec: Measured | None = None
    launch_radius_arcsec: Measured | None = None
    scale_errors: bool = False
    missing_prior: float | None = None
    draws: int | None = None
    seed: int | None = None


@dataclass(frozen=True, slots=True)
class ExpectQuestion:
    """What is asked of the shells to come; instants ``bmjd_tdb``, angles arcsec.

    ``field_arcsec`` is the full width of the field of view; ``resolution_arcsec`` the radius within which
    no shell is told from the stars (resolution or inner working angle); ``outer_radius_arcsec`` the largest
    radius at which shells are still seen.
    """

    on_bmjd_tdb: float
    until_bmjd_tdb: float | None
    as_of_bmjd_tdb: float
    stated: Mapping[ShellQuantityName, Measured] = field(default_factory=dict)
    field_arcsec: float | None = None
    resolution_arcsec: float | None = None
    outer_radius_arcsec: float | None = None
    back: int | None = None
    draws: int | None = None
    seed: int | None = None
