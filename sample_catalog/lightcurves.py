"""Invented photometry: when somebody looked, and what the imaginary detectors gave."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.arrays import PhotometryArrays

from .instants import (
    AS_OF_BMJD_TDB,
    bmjd_from_utc,
    ecliptic_deg,
    elongation_deg,
    sun_longitude_rad,
    year_to_bmjd,
)
from .spec import SystemSpec, WatchSpec
from .stations import SERIES, SITES, WATCH_SHEETS, Series, reaches
from .truth import CampaignTruth, SystemTruth

FloatArray = NDArray[np.float64]

BANDS = "JHKLM"
# Dust in each band relative to K: contrast at maximum, decay time, days by which the maximum is later.
_CONTRAST = np.array([0.03, 0.22, 1.0, 3.2, 4.5])
_DECAY = np.array([0.8, 0.9, 1.0, 1.4, 1.8])
_LATER_D = np.array([0.0, 0.0, 0.0, 12.0, 25.0])
_END_LEVEL = 0.65  # what is left of the maximum's excess when production ends
_INTRINSIC_MAG = 0.008  # the stars' own flicker, in no error bar
_WEATHER_LOSS = 0.22
GROUND_ELONGATION_DEG = 48.0
_NIGHT_HALF_D = 0.15
_SECOND_D = 1.0 / 86400.0 / np.sqrt(12.0)
_DAY_D = 1.0 / np.sqrt(12.0)
# No outliers and no wild noise in the last years: statuses of today must not hang on one bad point.
_NO_OUTLIERS_AFTER = year_to_bmjd(2018.0)
_CALM_AFTER = year_to_bmjd(2024.5)


@dataclass(frozen=True, slots=True, eq=False)
class LightCurve:
    """One system's photometry, which series each point is of, and the nights lost to weather."""

    photometry: PhotometryArrays
    series: NDArray[np.int64]
    lost_utc_mjd: FloatArray
    lost_series: NDArray[np.int64]


@dataclass(slots=True)
class _Points:
    """Visits split by band, of all series together."""

    utc_mjd: list[FloatArray]
    seen_mjd: list[FloatArray]
    series: list[NDArray[np.int64]]
    band: list[NDArray[np.int64]]


def draw_light_curve(
    seed: int, spec: SystemSpec, truth: SystemTruth, campaign: CampaignTruth, first_id: int
) -> LightCurve:
    """All photometry of one system up to the sample's date, numbered from ``first_id`` in order of time."""
    rng = np.random.default_rng([seed, truth.system_id, 1])
    longitude, latitude = ecliptic_deg(spec.ra_deg, spec.dec_deg)
    points = _Points([], [], [], [])
    lost: list[FloatArray] = []
    lost_series: list[int] = []
    for number in spec.watch.series:
        series = SERIES[number]
        if not reaches(series.site_id, spec.dec_deg):
            continue
        visits, missed = _visits(rng, spec, series, longitude, latitude)
        if number == WATCH_SHEETS and spec.watch.visits_before_d:
            visits = np.sort(np.concatenate([visits, _asked_for(rng, spec.watch)]))
        _split_by_band(rng, points, number, visits, spec.watch)
        lost.append(missed)
        lost_series += [number] * missed.size
    photometry, series_of = _measure(rng, spec, truth, campaign, points)
    photometry = replace(photometry, id=first_id + np.arange(series_of.size, dtype=np.int64))
    return LightCurve(
        photometry,
        series_of,
        np.concatenate(lost) if lost else np.empty(0),
        np.array(lost_series, dtype=np.int64),
    )


def _visits(
    rng: np.random.Generator, spec: SystemSpec, series: Series, longitude: float, latitude: float
) -> tuple[FloatArray, FloatArray]:
    """UTC of the visits of one series, and of those lost to weather."""
    watch = spec.watch
    start = year_to_bmjd(max(series.start_yr, watch.start_yr))
    stop = min(year_to_bmjd(series.end_yr), AS_OF_BMJD_TDB - max(watch.stop_before_d, 0.6))
    cadence = series.cadence_d / watch.thinning
    if stop <= start:
        return np.empty(0), np.empty(0)
    steps = cadence * (0.35 + 1.3 * rng.random(int((stop - start) / cadence * 1.25) + 8))
    times = start + np.cumsum(steps)
    times = times[times < stop]
    elongation = elongation_deg(times, longitude, latitude)
    site = SITES[series.site_id - 1]
    if site.elongation_min_deg is not None and site.elongation_max_deg is not None:
        up = (elongation > site.elongation_min_deg) & (elongation < site.elongation_max_deg)
    else:
        up = elongation > GROUND_ELONGATION_DEG
        times = at_night(rng, times, spec.ra_deg, site.longitude_deg_east or 0.0)
    for first, last in watch.skip_yr:
        up &= (times < year_to_bmjd(first)) | (times > year_to_bmjd(last))
    times = np.round(times[up & (times < stop)] * 86400.0) / 86400.0
    clouded = (rng.random(times.size) < _WEATHER_LOSS) & (site.kind == "ground")
    return times[~clouded], times[clouded]


def at_night(rng: np.random.Generator, times: FloatArray, ra_deg: float, east_deg: float) -> FloatArray:
    """Move each visit to that day's night, as near to culmination as the night allows."""
    sun, _ = sun_longitude_rad(times)
    hours_after_midnight = (np.degrees(sun) + 180.0 - ra_deg) / 360.0
    culmination = -(hours_after_midnight - np.round(hours_after_midnight))
    wanted = np.clip(culmination, -_NIGHT_HALF_D, _NIGHT_HALF_D) + 0.1 * (rng.random(times.size) - 0.5)
    night: FloatArray = np.floor(times) + (wanted - east_deg / 360.0) % 1.0
    return night


def _asked_for(rng: np.random.Generator, watch: WatchSpec) -> FloatArray:
    """Visits that certainly happened, whatever the weather."""
    before = np.array(watch.visits_before_d) + 0.3 * (rng.random(len(watch.visits_before_d)) - 0.5)
    return np.round((AS_OF_BMJD_TDB - before) * 86400.0) / 86400.0


def _split_by_band(
    rng: np.random.Generator, points: _Points, number: int, visits: FloatArray, watch: WatchSpec
) -> None:
    series = SERIES[number]
    asked = visits > AS_OF_BMJD_TDB - max(watch.visits_before_d, default=0.0) - 1.0
    for band, limits in series.bands.items():
        chosen = visits
        if limits.share < 1.0:
            # Extra bands are left out of visits asked for: those are K, as the watch sheets say.
            chosen = visits[(rng.random(visits.size) < limits.share) & ~(asked & (number == WATCH_SHEETS))]
        if band == "L" and series.site_id == 5:
            chosen = chosen + 300.0 / 86400.0
        points.utc_mjd.append(np.floor(chosen) + 0.5 if series.day_only else chosen)
        points.seen_mjd.append(chosen)
        points.series.append(np.full(chosen.size, number, dtype=np.int64))
        points.band.append(np.full(chosen.size, BANDS.index(band), dtype=np.int64))


def _measure(
    rng: np.random.Generator,
    spec: SystemSpec,
    truth: SystemTruth,
    campaign: CampaignTruth,
    points: _Points,
) -> tuple[PhotometryArrays, NDArray[np.int64]]:
    utc = np.concatenate(points.utc_mjd)
    order = np.argsort(utc, kind="stable")
    utc, seen = utc[order], np.concatenate(points.seen_mjd)[order]
    series, band = np.concatenate(points.series)[order], np.concatenate(points.band)[order]
    offsets, errors, faintest, brightest = _tables(campaign)
    times = bmjd_from_utc(utc, *ecliptic_deg(spec.ra_deg, spec.dec_deg))
    level = np.array([truth.star_mag[b] for b in BANDS])[band]
    true_mag = level - 2.5 * np.log10(1.0 + dust_over_star(spec, truth, seen, band))
    error, noise = _errors(rng, true_mag, errors[series, band], faintest[series, band], times)
    mag = true_mag + offsets[series, band] + noise
    quality = np.full(utc.size, "good", dtype="<U8")
    wild = (rng.random(utc.size) < 0.008) & (times < _NO_OUTLIERS_AFTER)
    quality[wild] = "doubtful"
    mag[wild] += 0.18 * rng.normal(size=int(wild.sum()))
    error[(rng.random(utc.size) < 0.025) & (times < _CALM_AFTER)] = np.nan
    mag, error = np.round(mag, 3), np.round(error, 3)
    too_faint, saturated = mag > faintest[series, band], mag < brightest[series, band]
    mag[too_faint] = faintest[series, band][too_faint]
    mag[saturated] = brightest[series, band][saturated]
    limit = too_faint | saturated
    error[limit] = np.nan
    day_only = np.array([one.day_only for one in SERIES])[series]
    time_error = np.where(day_only, _DAY_D, _SECOND_D)
    photometry = PhotometryArrays(
        id=np.zeros(utc.size, dtype=np.int64),
        bmjd_tdb=times,
        minus_d=time_error,
        plus_d=time_error,
        mag=mag,
        mag_minus=error,
        mag_plus=error,
        limit_side=too_faint.astype(np.int8) - saturated.astype(np.int8),
        limit_sigma=np.where(limit, 3.0, np.nan),
        band=np.array(list(BANDS))[band],
        source=np.array([one.source for one in SERIES])[series],
        site_id=np.array([one.site_id for one in SERIES], dtype=np.int64)[series],
        quality=quality,
        photometric_system=np.array([one.photometric_system for one in SERIES])[series],
    )
    return photometry, series


def _tables(campaign: CampaignTruth) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Offsets, errors and limits by (series, band)."""
    offsets, errors, faintest, brightest = np.zeros((4, len(SERIES), len(BANDS)))
    for row, series in enumerate(SERIES):
        for band, limits in series.bands.items():
            column = BANDS.index(band)
            offsets[row, column] = campaign.source_offsets_mag[series.source][band]
            errors[row, column] = limits.error_mag
            faintest[row, column], brightest[row, column] = limits.faintest_mag, limits.brightest_mag
    return offsets, errors, faintest, brightest


def _errors(
    rng: np.random.Generator, mag: FloatArray, floor: FloatArray, faintest: FloatArray, times: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Quoted errors, larger near the faint limit, and the noise that was really there."""
    faint = 10.0 ** (0.4 * np.minimum(mag - faintest, 0.0))
    error = np.minimum(floor * np.exp(0.15 * rng.normal(size=mag.size)) * (1.0 + 2.5 * faint), 0.30)
    z = rng.normal(size=(2, mag.size))
    z = np.where(times > _CALM_AFTER, np.clip(z, -2.0, 2.0), z)
    return error, error * z[0] + _INTRINSIC_MAG * z[1]


def dust_over_star(
    spec: SystemSpec, truth: SystemTruth, mjd: FloatArray, band: NDArray[np.int64]
) -> FloatArray:
    """Flux of the dust over that of the stars, per point; ``band`` counts along ``BANDS``."""
    excess = np.zeros(mjd.size)
    decay = truth.decay_k_d * _DECAY[band]
    later = _LATER_D[band]
    for cycle in truth.cycles:
        onset, maximum, end = cycle.onset_bmjd_tdb, cycle.maximum_bmjd_tdb, cycle.end_bmjd_tdb
        if onset is None or maximum is None or end is None:
            continue
        since = mjd - onset
        if not (since > 0.0).any():
            break
        risen = np.clip(since / (maximum - onset + later), 0.0, 1.0)
        production = np.clip((mjd - maximum - later) / (end - maximum), 0.0, 1.0)
        fading = np.clip(mjd - end - later, 0.0, None)
        one = _rise(truth.rise, risen) * (1.0 - (1.0 - _END_LEVEL) * production) * np.exp(-fading / decay)
        for after, duration, share in spec.dust.brief.get(cycle.cycle, ()):
            one += share * np.clip(1.0 - np.abs(since - after) / (0.5 * duration), 0.0, None)
        excess += one
    excess *= truth.contrast_k * _CONTRAST[band]
    return excess


def _rise(shape: str, share: FloatArray) -> FloatArray:
    if shape == "fast":
        share = share**2
    if shape == "saturating":
        share = (1.0 - np.exp(-3.0 * share)) / (1.0 - np.exp(-3.0))
    return share
