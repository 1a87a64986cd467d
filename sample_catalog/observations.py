"""Every observation of the sample, written out as the catalogue keeps them."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation

from .instants import (
    AS_OF_BMJD_TDB,
    DAYS_PER_YEAR,
    bmjd_from_utc,
    ecliptic_deg,
    elongation_deg,
    iso_utc,
    utc_from_bmjd,
    year_to_bmjd,
)
from .lightcurves import GROUND_ELONGATION_DEG, LightCurve, at_night
from .orbits import sky_position, velocities_kms
from .spec import SystemSpec
from .stations import ATTEMPT_REASONS, SERIES, SITE_NAMES, SITES
from .systems import SYSTEMS
from .truth import CampaignTruth, SystemTruth

FloatArray = NDArray[np.float64]

_SECOND_D = float(1.0 / 86400.0 / np.sqrt(12.0))
_DAY_D = float(1.0 / np.sqrt(12.0))
_AU_YR_KMS = 4.740470464
_ATTEMPT_SHARE = 0.16
_SIDES = {0: None, 1: "above", -1: "below"}
_REMARKS = (
    "comparison star checked against two others: constant",
    "thin cirrus to the west, kept because the comparison agreed",
    "new filter wheel since last week",
    "mirror washed",
    "neighbour 9 arcsec away kept out of the aperture",
)


def make_observations(
    seed: int, truth: CampaignTruth, curves: Sequence[LightCurve]
) -> tuple[Observation, ...]:
    """Photometry first, with the ids of the arrays; then velocities, positions, shells and the rest."""
    found: list[Observation] = []
    for spec, one, curve in zip(SYSTEMS, truth.systems, curves, strict=True):
        found.extend(_photometry(spec, one, curve))
    for spec, one, curve in zip(SYSTEMS, truth.systems, curves, strict=True):
        rng = np.random.default_rng([seed, one.system_id, 3])
        for kind in (_velocities, _positions, _shells, _fluxes_and_lines, _remarks):
            found.extend(kind(rng, spec, one))
        found.extend(_attempts(rng, spec, one, curve))
    return tuple(
        replace(one, id=number, uid=f"sample-{number:06d}") for number, one in enumerate(found, start=1)
    )


def _moments(spec: SystemSpec, utc_mjd: FloatArray, day_only: bool = False) -> list[Moment]:
    """UTC at the observatory, to the second or to the day."""
    error = _DAY_D if day_only else _SECOND_D
    times = bmjd_from_utc(utc_mjd, *ecliptic_deg(spec.ra_deg, spec.dec_deg)).tolist()
    texts = [text[:10] if day_only else text for text in iso_utc(utc_mjd)]
    return [
        Moment(time, error, error, text, "utc", "observatory")
        for time, text in zip(times, texts, strict=True)
    ]


def _nights(
    rng: np.random.Generator, spec: SystemSpec, site_id: int, years: tuple[float, float], count: int
) -> FloatArray:
    """UTC of visits spread over years, at night and away from the Sun, to the second, in order."""
    start, stop = year_to_bmjd(years[0]), min(year_to_bmjd(years[1]), AS_OF_BMJD_TDB - 3.0)
    times = start + (stop - start) * rng.random(4 * count)
    up = elongation_deg(times, *ecliptic_deg(spec.ra_deg, spec.dec_deg)) > GROUND_ELONGATION_DEG
    times = at_night(
        rng, np.sort(times[up][:count]), spec.ra_deg, SITES[site_id - 1].longitude_deg_east or 0.0
    )
    return np.round(times * 86400.0) / 86400.0


def _photometry(spec: SystemSpec, truth: SystemTruth, curve: LightCurve) -> Iterator[Observation]:
    arrays = curve.photometry
    utc = utc_from_bmjd(arrays.bmjd_tdb, *ecliptic_deg(spec.ra_deg, spec.dec_deg))
    columns = zip(
        arrays.bmjd_tdb.tolist(), iso_utc(utc), arrays.minus_d.tolist(), arrays.mag.tolist(),
        arrays.mag_minus.tolist(), arrays.limit_side.tolist(), arrays.band.tolist(),
        arrays.quality.tolist(), curve.series.tolist(), strict=True,
    )  # fmt: skip
    for time, text, time_error, mag, error, side, band, quality, number in columns:
        series = SERIES[number]
        known = None if math.isnan(error) else error
        yield Observation(
            id=0,
            uid="",
            system_id=truth.system_id,
            kind="photometry",
            moment=Moment(
                time, time_error, time_error, text[:10] if series.day_only else text, "utc", "observatory"
            ),
            value=Measured(mag, known, known),
            unit="mag",
            limit_side=_SIDES[side],  # type: ignore[arg-type]
            limit_sigma=3.0 if side else None,
            band=band,
            photometric_system=series.photometric_system,
            site_id=series.site_id,
            site=SITE_NAMES[series.site_id],
            observer=series.observers[int(time / 30.0) % len(series.observers)],
            instrument=series.instrument,
            comparison_star=f"{spec.name} c{1 + number % 2}" if series.site_id != 5 else None,
            source=series.source,
            quality=quality,
        )


def _velocities(rng: np.random.Generator, spec: SystemSpec, truth: SystemTruth) -> Iterator[Observation]:
    if not spec.velocities:
        return
    # Half of them crowd around periastron, as a campaign would have them.
    even = _nights(rng, spec, 1, (1999.0, 2026.9), spec.velocities // 2)
    middle = 2000.0 + (truth.cycle(0).periastron_bmjd_tdb - year_to_bmjd(2000.0)) / DAYS_PER_YEAR
    span = 0.08 * truth.elements.period_d / DAYS_PER_YEAR
    near = _nights(rng, spec, 1, (middle - span, middle + span), spec.velocities - even.size)
    utc = np.sort(np.concatenate([even, near]))
    moments = _moments(spec, utc)
    true_a, true_b = velocities_kms(truth.elements, np.array([m.bmjd_tdb for m in moments]))
    for star, true, error, species in (("A", true_a, 7.0, "emission"), ("B", true_b, 4.5, "absorption")):
        sigma = np.round(error * np.exp(0.2 * rng.normal(size=utc.size)), 1)
        value = np.round(true + sigma * np.clip(rng.normal(size=utc.size), -3.0, 3.0), 1)
        for moment, kms, one_sigma in zip(moments, value.tolist(), sigma.tolist(), strict=True):
            yield Observation(
                0, "", truth.system_id, "velocity", moment, Measured(kms, one_sigma, one_sigma), "kms",
                star=star, species=species, site_id=1, site=SITE_NAMES[1], observer="Ivo Marrenby",
                instrument="Mesa spectrograph", source="Cold Mesa velocity books",
            )  # fmt: skip


def _positions(rng: np.random.Generator, spec: SystemSpec, truth: SystemTruth) -> Iterator[Observation]:
    if not spec.positions:
        return
    moments = _moments(spec, _nights(rng, spec, 4, (2011.0, 2026.8), spec.positions))
    separation, angle = sky_position(truth.elements, np.array([m.bmjd_tdb for m in moments]))
    z = np.clip(rng.normal(size=(2, separation.size)), -3.0, 3.0)
    sigma_mas = np.round(0.10 + 0.10 * rng.random(separation.size), 2)
    # A constant error across the line of sight is a larger angle when the stars are close.
    sigma_deg = np.round(np.degrees(sigma_mas / separation), 2)
    mas = np.round(separation + sigma_mas * z[0], 2)
    deg = np.round((angle + sigma_deg * z[1]) % 360.0, 2)
    rows = zip(moments, mas.tolist(), sigma_mas.tolist(), deg.tolist(), sigma_deg.tolist(), strict=True)
    for moment, one_mas, s_mas, one_deg, s_deg in rows:
        yield Observation(
            0, "", truth.system_id, "position", moment, Measured(one_mas, s_mas, s_mas), "mas",
            position_angle_deg=Measured(one_deg, s_deg, s_deg), correlation=0.0, site_id=4,
            site=SITE_NAMES[4], observer="Saskia Thornevall", instrument="ridge interferometer",
            source="Lamplight Ridge note 14",
        )  # fmt: skip


def _shells(rng: np.random.Generator, spec: SystemSpec, truth: SystemTruth) -> Iterator[Observation]:
    elements = truth.elements
    for epoch, year in enumerate(spec.shell_epochs_yr):
        utc = np.array([np.floor(year_to_bmjd(year)) + 0.5])
        moment = _moments(spec, utc, day_only=True)[0]
        middles = [
            0.5 * (c.onset_bmjd_tdb + c.end_bmjd_tdb)
            for c in reversed(truth.cycles)
            if c.onset_bmjd_tdb is not None and c.end_bmjd_tdb is not None
        ]
        ages_yr = [
            (moment.bmjd_tdb - middle) / DAYS_PER_YEAR for middle in middles if middle < moment.bmjd_tdb
        ]
        scale = 1.0 + 0.003 * float(np.clip(rng.normal(), -2.0, 2.0))
        for index, age_yr in enumerate(ages_yr[: spec.shells_seen], start=1):
            radius = spec.dust_speed_kms * age_yr / (_AU_YR_KMS * elements.distance_pc) * scale
            sigma = round(0.010 + 0.004 * index, 3)
            z = float(np.clip(rng.normal(), -2.5, 2.5))
            if epoch == 1 and index == spec.shells_seen - 1:
                continue  # a shell that nobody could make out in that image
            yield Observation(
                0, "", truth.system_id, "shell", moment,
                Measured(round(radius + sigma * z, 3), sigma, sigma), "arcsec",
                position_angle_deg=Measured(round((elements.node_deg + 90.0) % 360.0, 0), 5.0, 5.0),
                feature="limb", measured_at="peak", plate_scale_error=0.003,
                shell_index=index if epoch == 0 else None, site_id=5, site=SITE_NAMES[5],
                observer="pipeline", instrument="Farwatch imager", source="Farwatch release 3",
            )  # fmt: skip


def _fluxes_and_lines(
    rng: np.random.Generator, spec: SystemSpec, truth: SystemTruth
) -> Iterator[Observation]:
    if not spec.velocities:
        return
    moments = _moments(spec, _nights(rng, spec, 1, (2005.0, 2025.5), 24))
    z = np.clip(rng.normal(size=24), -2.5, 2.5).tolist()
    for n, moment in enumerate(moments[:8]):
        flux_jy = 1.6e-3 + 4.0e-5 * z[n]
        yield Observation(
            0, "", truth.system_id, "flux", moment, Measured(round(flux_jy, 6), 5.0e-5, 5.0e-5), "jy",
            frequency_ghz=8.4, site_id=3, site=SITE_NAMES[3], observer="Dilnara Osk",
            instrument="Pass dish pair", source="Harrow Pass radio table",
        )  # fmt: skip
    for n, moment in enumerate(moments[8:], start=8):
        yield Observation(
            0, "", truth.system_id, "line", moment, Measured(round(-640.0 + 12.0 * z[n], 1), 15.0, 15.0),
            "angstrom", species="C III 5696", site_id=1, site=SITE_NAMES[1], observer="Ivo Marrenby",
            instrument="Mesa spectrograph", source="Cold Mesa velocity books",
        )  # fmt: skip


def _remarks(rng: np.random.Generator, spec: SystemSpec, truth: SystemTruth) -> Iterator[Observation]:
    first = max(spec.watch.start_yr, 1993.2)
    last = (
        AS_OF_BMJD_TDB - max(spec.watch.stop_before_d, 20.0) - year_to_bmjd(2000.0)
    ) / DAYS_PER_YEAR + 2000.0
    for n, moment in enumerate(_moments(spec, _nights(rng, spec, 1, (first, last), 3))):
        yield Observation(
            0, "", truth.system_id, "remark", moment, site_id=1, site=SITE_NAMES[1],
            observer="Ysolde Kharne", text=_REMARKS[(truth.system_id + 2 * n) % len(_REMARKS)],
        )  # fmt: skip


def _attempts(
    rng: np.random.Generator, spec: SystemSpec, truth: SystemTruth, curve: LightCurve
) -> Iterator[Observation]:
    """Some of the nights lost to weather were written down."""
    kept = rng.random(curve.lost_utc_mjd.size) < _ATTEMPT_SHARE
    why = rng.integers(0, len(ATTEMPT_REASONS), curve.lost_utc_mjd.size)
    moments = _moments(spec, curve.lost_utc_mjd[kept])
    for moment, number, reason in zip(
        moments, curve.lost_series[kept].tolist(), why[kept].tolist(), strict=True
    ):
        series = SERIES[number]
        yield Observation(
            0, "", truth.system_id, "attempt", moment, site_id=series.site_id,
            site=SITE_NAMES[series.site_id], observer=series.observers[0], instrument=series.instrument,
            source=series.source, text=ATTEMPT_REASONS[reason],
        )  # fmt: skip
