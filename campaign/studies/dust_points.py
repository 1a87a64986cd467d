"""Photometry of a system in janskys: each point with its zero point and the level of its own series."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.errors import NotFound
from campaign.model.arrays import PhotometryArrays
from campaign.model.dust import DustOverrides, LevelGiven
from campaign.model.observations import Observation
from campaign.physics.photometry import FLUX_ERROR_PER_MAG
from campaign.physics.zeropoints import ZERO_POINTS, zero_point
from campaign.studies.bands import photometric_system_key
from campaign.studies.judging import series_of
from campaign.studies.quietness import MINIMUM_LEVEL_POINTS, StellarLevel, stellar_level

FloatArray = NDArray[np.float64]

# Of a published zero point without an error, and of one that was recalled; common practice, no source.
PUBLISHED_ERROR, RECALLED_ERROR = 0.03, 0.05
# How sharp the brightness is at which a detector saturates; common practice, no source.
SATURATION_SHARPNESS = 0.05
# Longer waves than this are no dust of ours; um.
LONGEST_UM = 1000.0
FLUXES = "fluxes"
# In ``DustOverrides.zero_points_of``: for every photometric system that is not known here.
ANY_SYSTEM = "*"


@dataclass(frozen=True, slots=True)
class Zero:
    """Zero point of a band: Jy, its relative error, um, and what it is called."""

    flux_jy: float
    relative_error: float
    wavelength_um: float
    name: str
    assumed_error: bool = False


@dataclass(frozen=True, slots=True)
class Level:
    """The stars' magnitude in a series: the error of the level, and how much the stars flicker about it."""

    mag: float
    sigma_mag: float
    flicker_mag: float
    scatter_mag: float


@dataclass(frozen=True, slots=True, eq=False)
class LightPoints:
    """Points of every band in order of time; fluxes are kept as magnitudes from 1 Jy.

    ``group`` is a band of a photometric system, ``series`` a source and site of it. ``side`` is 0 for a
    measurement, +1 for 'fainter than', -1 for 'brighter than'.
    """

    bmjd_tdb: FloatArray
    mag: FloatArray
    error_mag: FloatArray
    side: NDArray[np.int8]
    limit_sigma: FloatArray
    band: tuple[str, ...]
    photometric_system: tuple[str, ...]
    source: tuple[str, ...]
    series: tuple[str, ...]


def light_points(arrays: PhotometryArrays | None, fluxes: Iterable[Observation]) -> LightPoints:
    """Good photometry and infrared fluxes of a system as one list.

    Parameters
    ----------
    arrays : PhotometryArrays or None
        Magnitudes (mag, ``bmjd_tdb``).
    fluxes : iterable of Observation
        Of kind ``flux``, Jy, with a band or a frequency; radio and X-rays are passed over.

    Returns
    -------
    LightPoints
        Magnitudes; of a flux -2.5 log10(F/Jy). A flux that is not positive becomes a limit at 3 sigma.

    Notes
    -----
    Accuracy: exact but for the logarithm. Source: Pogson 1856, MNRAS 17, 12.
    """
    columns: list[tuple[float, float, float, int, float, str, str, str, str]] = []
    if arrays is not None:
        good = arrays.quality == "good"
        keys = series_of(arrays, good)
        for i, key in zip(np.flatnonzero(good), keys, strict=True):
            band = str(arrays.band[i])
            error = 0.5 * float(arrays.mag_minus[i] + arrays.mag_plus[i])
            columns.append(
                (
                    float(arrays.bmjd_tdb[i]), float(arrays.mag[i]), error, int(arrays.limit_side[i]),
                    float(arrays.limit_sigma[i]), band, str(arrays.photometric_system[i]),
                    str(arrays.source[i]), f"{band}\0{key}",
                )
            )  # fmt: skip
    columns += [point for one in fluxes if (point := _flux_point(one)) is not None]
    columns.sort(key=lambda point: point[0])
    numbers = np.array([point[:5] for point in columns], dtype=np.float64).reshape(-1, 5)
    texts = [point[5:] for point in columns]
    return LightPoints(
        numbers[:, 0], numbers[:, 1], numbers[:, 2], numbers[:, 3].astype(np.int8), numbers[:, 4],
        *(tuple(text[i] for text in texts) for i in range(4)),
    )  # fmt: skip


def _flux_point(one: Observation) -> tuple[float, float, float, int, float, str, str, str, str] | None:
    if one.quality != "good" or one.value is None or one.unit != "jy":
        return None
    band = one.band
    if one.frequency_ghz is not None:
        wavelength = 299_792.458 / one.frequency_ghz
        if wavelength > LONGEST_UM:
            return None
        band = band or f"{wavelength:.4g} um"
    if band is None:
        return None
    flux, sigma = one.value.value, one.value.sigma
    side = {None: 0, "above": -1, "below": 1}[one.limit_side]
    limit_sigma = one.limit_sigma or 3.0
    if side == 0 and flux <= 0.0:
        if not sigma:
            return None
        flux, side, limit_sigma = 3.0 * sigma, 1, 3.0
    if flux <= 0.0:
        return None
    error = float("nan") if sigma is None or side else sigma / (flux * FLUX_ERROR_PER_MAG)
    series = f"{band}\0{FLUXES}\0{one.photometric_system or ''}\0{one.source}\0{one.site_id}"
    mag = -2.5 * float(np.log10(flux))
    return (
        one.moment.bmjd_tdb, mag, error, side, limit_sigma, band, FLUXES, one.source or "", series,
    )  # fmt: skip


def zero_of(band: str, photometric_system: str, overrides: DustOverrides) -> Zero | str:
    """The zero point of a band, or why there is none.

    Parameters
    ----------
    band, photometric_system : str
        As logged; ``fluxes`` for what was logged in Jy (no unit).
    overrides : DustOverrides
        Zero points (Jy, um) and substitutes given by the user, which come first.

    Returns
    -------
    Zero or str
        Jy and um; else the reason, for people.

    Notes
    -----
    Accuracy: as published; where no error is known, 3 % are assumed, 5 % when the value was recalled.

    Source: ``campaign.physics.zeropoints``.
    """
    key = photometric_system_key(photometric_system)
    for given in overrides.zero_points:
        own = None if given.photometric_system is None else photometric_system_key(given.photometric_system)
        if given.band == band and own in (None, key):
            sigma = given.flux_jy.sigma
            relative = PUBLISHED_ERROR if sigma is None else sigma / given.flux_jy.value
            # A flux needs its wavelength only.
            flux, relative = (1.0, 0.0) if key == FLUXES else (given.flux_jy.value, relative)
            return Zero(flux, relative, given.wavelength_um, "as given", sigma is None)
    if key == FLUXES and band.endswith(" um"):
        return Zero(1.0, 0.0, float(band.removesuffix(" um")), "as logged")
    name = _table_of(band, key, photometric_system, overrides)
    if name is None:
        told = "a flux without a wavelength" if key == FLUXES else "the photometric system is not stated"
        return f"no zero point: {told}"
    try:
        zero = zero_point(name, band)
    except NotFound:
        return f"no zero point of {band} in '{name}'"
    if key == FLUXES:
        return Zero(1.0, 0.0, zero.wavelength_um, zero.photometric_system)
    if zero.sigma_jy is not None:
        return Zero(zero.flux_jy, zero.sigma_jy / zero.flux_jy, zero.wavelength_um, zero.photometric_system)
    assumed = PUBLISHED_ERROR if zero.basis == "published" else RECALLED_ERROR
    return Zero(zero.flux_jy, assumed, zero.wavelength_um, zero.photometric_system, True)


def require_stand_ins(overrides: DustOverrides) -> None:
    """Refuse a stand-in for zero points that is itself not known.

    Parameters
    ----------
    overrides : DustOverrides
        Names of photometric systems (no unit).

    Raises
    ------
    NotFound
        With what is known.

    Notes
    -----
    Accuracy: not applicable. Source: project convention.
    """
    known = {"".join(each.photometric_system.casefold().split()) for each in ZERO_POINTS}
    for name in overrides.zero_points_of.values():
        if "".join(name.casefold().split()) not in known:
            zero_point(name, "")


def _table_of(band: str, key: str, photometric_system: str, overrides: DustOverrides) -> str | None:
    """The photometric system whose zero points count: as the user says, its own, or the general stand-in."""
    of = {photometric_system_key(name): other for name, other in overrides.zero_points_of.items()}
    if key in of:
        return of[key]
    stated = "" if key == FLUXES else photometric_system
    if stated:
        try:
            zero_point(stated, band)
        except NotFound:
            return of.get(ANY_SYSTEM, stated)
        return stated
    return of.get(ANY_SYSTEM)


class Levels:
    """The stars' level of each series, from its points without dust.

    Parameters
    ----------
    points : LightPoints
        All of them, mag.
    dusty : sequence of (float, float)
        Spans known to hold dust (``bmjd_tdb``); left out of the levels.
    asked : (float, float)
        The span that is asked about (``bmjd_tdb``), left out as well.
    is_long : bool
        Whether a series that lies all inside the span asked about may make its level there; it is told in
        ``inside``.
    given : sequence of LevelGiven
        Levels of bands given by the user, mag; they come first.

    Notes
    -----
    Accuracy: the error of a median is 1.25 times that of a mean. What the scatter holds beyond the median
    error of the points is taken for the stars' own flicker.

    Source: ``campaign.studies.quietness``.
    """

    def __init__(
        self,
        points: LightPoints,
        dusty: Sequence[tuple[float, float]],
        asked: tuple[float, float],
        *,
        is_long: bool,
        given: Sequence[LevelGiven],
    ) -> None:
        known = points.side == 0
        for span in dusty:
            known &= ~_within(points, span)
        self._given = {one.band: one.mag for one in given}
        self._quiet = _by_series(points, known & ~_within(points, asked))
        self._also = _by_series(points, known) if is_long else {}
        self._points = points
        self._found: dict[str, Level | str] = {}
        self.inside: list[tuple[str, str]] = []

    def of(self, series: str, band: str) -> Level | str | None:
        """The level; why there is none; or None where the stars were said not to matter."""
        if band in self._given:
            mag = self._given[band]
            return None if mag is None else Level(mag.value, mag.sigma or 0.0, 0.0, mag.sigma or 0.0)
        if series not in self._found:
            self._found[series] = self._level(series)
        return self._found[series]

    def _level(self, series: str) -> Level | str:
        places = self._quiet.get(series, [])
        if len(places) < MINIMUM_LEVEL_POINTS <= len(self._also.get(series, [])):
            places = self._also[series]
            self.inside.append((self._points.band[places[0]], self._points.source[places[0]]))
        level: StellarLevel | None = stellar_level(self._points.mag[places]) if places else None
        if level is None:
            return (
                f"the stars' level is not known: {len(places)} quiet points of this source, "
                f"{MINIMUM_LEVEL_POINTS} are needed"
            )
        errors = self._points.error_mag[places]
        known = errors[~np.isnan(errors)]
        typical = float(np.median(known)) if known.size else level.scatter_mag
        flicker = float(np.sqrt(max(level.scatter_mag**2 - typical**2, 0.0)))
        sigma = 1.2533 * level.scatter_mag / float(np.sqrt(level.points))
        return Level(level.mag, sigma, flicker, level.scatter_mag)


def _within(points: LightPoints, span: tuple[float, float]) -> NDArray[np.bool_]:
    return np.asarray((points.bmjd_tdb >= span[0]) & (points.bmjd_tdb <= span[1]))


def _by_series(points: LightPoints, chosen: NDArray[np.bool_]) -> dict[str, list[int]]:
    found: dict[str, list[int]] = {}
    for i in np.flatnonzero(chosen).tolist():
        found.setdefault(points.series[i], []).append(i)
    return found
