"""Episodes found in a light curve: dates with intervals, what they rest on, and what cannot be told."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from campaign.model.curves import Curve
from campaign.model.forecasts import Quantiles, UtcQuantiles
from campaign.model.measured import Measured

# ``covered``: points lie on the rise. ``not covered``: the onset is a bracket between a quiet point and a
# bright one. ``before the curve``: the first point was bright already, and no onset can be dated.
RiseCover = Literal["covered", "not covered", "before the curve"]
FoundKind = Literal["episode", "brief"]


@dataclass(frozen=True, slots=True)
class FoundDate:
    """When something happened. ``band`` None: of dust production, from all bands together.

    ``told`` is False where the interval is what was allowed, not what the points say.
    """

    bmjd_tdb: Quantiles
    utc: UtcQuantiles
    band: str | None = None
    told: bool = True


@dataclass(frozen=True, slots=True)
class FoundMaximum:
    """The maximum of one band: its date, and how bright the dust was in units of the stars' flux.

    ``excess_mag`` is by how much the whole became brighter. ``reached`` is False where no later point is
    fainter: the true maximum may still have come.
    """

    date: FoundDate
    excess: Measured
    excess_mag: float
    points: int
    reached: bool = True


@dataclass(frozen=True, slots=True)
class FoundBrightening:
    """A short brightening on the way down, no episode of its own; ``excess`` over the course around it."""

    bmjd_tdb: float
    utc: str | None
    lasts_d: float
    excess: float
    points: int


@dataclass(frozen=True, slots=True)
class KnownEpisode:
    """The episode of the catalogue that a found one agrees with in time."""

    id: int
    state: Literal["proposed", "confirmed", "rejected"]


@dataclass(frozen=True, slots=True)
class FoundEpisode:
    """One episode of a light curve. Times are ``bmjd_tdb``, lengths days.

    ``end`` is that of production (the break from slow decline to free decay), ``half`` when the excess was
    half of the maximum's, ``decay_d`` the e-folding time after production: an exponential has no end itself.
    ``last_quiet_bmjd_tdb`` and ``first_bright_bmjd_tdb`` bracket the onset, ``last_bright_bmjd_tdb`` is the
    last point above the level.
    ``hinge_magnitudes`` is the onset that a broken line in magnitudes gives, for comparison.
    """

    number: int
    kind: FoundKind
    rise: RiseCover
    onset: FoundDate | None
    maxima: tuple[FoundMaximum, ...]
    end: FoundDate | None
    half: FoundDate | None
    rise_d: Quantiles | None
    decay_d: Quantiles | None
    last_quiet_bmjd_tdb: float | None
    first_bright_bmjd_tdb: float
    last_bright_bmjd_tdb: float
    rise_nights: int
    chi2: float
    dof: int
    hinge_magnitudes: Quantiles | None = None
    brightenings: tuple[FoundBrightening, ...] = ()
    known: KnownEpisode | None = None
    notes: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class FoundLevel:
    """The stars' level in one band of one source: magnitude, its error, scatter beyond the error bars.

    ``points`` is how many quiet measurements it rests on; 0: borrowed from the other sources of the band.
    ``level_mag`` is None where the stars were never seen or the source saw only dust.
    """

    band: str
    source: str
    photometric_system: str
    site: str
    level_mag: Measured | None
    scatter_mag: float
    red_noise_mag: float
    points: int


@dataclass(frozen=True, slots=True)
class EpisodesFound:
    """What the light curve of one system says of its episodes; ``quiet_note`` where there are none."""

    system: str
    bands: tuple[str, ...]
    measured: int
    limits: int
    left_out: int
    first_bmjd_tdb: float
    last_bmjd_tdb: float
    as_of_utc: str | None
    episodes: tuple[FoundEpisode, ...]
    levels: tuple[FoundLevel, ...]
    curves: tuple[Curve, ...]
    assumptions: tuple[str, ...]
    warnings: tuple[str, ...]
    quiet_note: str | None = None
