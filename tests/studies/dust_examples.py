"""Invented systems whose dust is known: photometry of stars, dust, noise and shared errors."""

from __future__ import annotations

from dataclasses import dataclass, replace
from datetime import UTC, datetime
from typing import Any

import numpy as np
from astropy import units as u
from astropy.modeling.models import BlackBody

from campaign.model.arrays import PhotometryArrays
from campaign.model.dust import DustOverrides, DustResult
from campaign.model.instants import TypedInstant
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import Star, System
from campaign.physics.opacity import opacity_cm2_g, opacity_named
from campaign.physics.zeropoints import zero_point
from campaign.studies.dust import DustQuestion, tell_dust
from campaign.studies.watch import Campaign

NOTHING = DustOverrides()
NOW = datetime(2031, 4, 8, tzinfo=UTC)
AT_MJD = 62_000.0
# Band, photometric system, and the stars' own magnitude.
BANDS = (
    ("J", "2MASS", 7.0),
    ("H", "2MASS", 6.6),
    ("Ks", "2MASS", 6.2),
    ("W1", "WISE", 5.9),
    ("W2", "WISE", 5.7),
)
CARBON = opacity_named("zubko-0.1")

STAR_A = Star(
    "A", "WC7", mass_msun=Measured(13.0, 1.5, 1.5), luminosity_lsun=Measured(2e5, 2e4, 2e4),
    temperature_k=Measured(60_000.0, 3000.0, 3000.0), radius_rsun=Measured(4.0, 0.5, 0.5),
    mass_loss_msun_yr=Measured(2e-5, 5e-6, 5e-6), wind_speed_kms=Measured(2400.0, 100.0, 100.0),
)  # fmt: skip
STAR_B = Star(
    "B", "O5.5", mass_msun=Measured(30.0, 2.0, 2.0), luminosity_lsun=Measured(3e5, 3e4, 3e4),
    temperature_k=Measured(37_000.0, 2000.0, 2000.0), radius_rsun=Measured(12.0, 1.0, 1.0),
    mass_loss_msun_yr=Measured(1.5e-6, 4e-7, 4e-7), wind_speed_kms=Measured(2900.0, 100.0, 100.0),
)  # fmt: skip


def system(**changed: Any) -> System:
    base = System(
        1,
        "Lantern 3",
        270.631,
        -45.2083,
        distance_pc=Measured(2100.0, 150.0, 150.0),
        star_a=STAR_A,
        star_b=STAR_B,
    )
    return replace(base, **changed)


def instant(mjd: float) -> TypedInstant:
    return TypedInstant(float(int(mjd)), mjd % 1.0, "tdb", "barycentre", 0.0, 0.0, "second", f"MJD {mjd}")


def dust_jy(mass_msun: float, temperature_k: float, distance_pc: float, wavelength_um: float) -> float:
    """Flux of optically thin carbon by astropy alone."""
    kappa = float(opacity_cm2_g(CARBON, wavelength_um)) * u.cm**2 / u.g
    intensity = BlackBody(temperature_k * u.K)(wavelength_um * u.um) * u.sr
    return float((mass_msun * u.Msun * kappa * intensity / (distance_pc * u.pc) ** 2).to_value(u.Jy))


@dataclass
class Points:
    """Photometry in the making."""

    rows: list[tuple[float, float, float, int, str, str]]

    def add(self, mjd: float, mag: float, error: float, band: str, system_: str, side: int = 0) -> None:
        self.rows.append((mjd, mag, np.nan if side else error, side, band, system_))

    def arrays(self) -> PhotometryArrays:
        rows = sorted(self.rows)
        n = len(rows)
        mjd, mag, error, side, band, photometric = zip(*rows, strict=True)
        return PhotometryArrays(
            id=np.arange(1, n + 1), bmjd_tdb=np.array(mjd), minus_d=np.zeros(n), plus_d=np.zeros(n),
            mag=np.array(mag), mag_minus=np.array(error), mag_plus=np.array(error),
            limit_side=np.array(side, dtype=np.int8), limit_sigma=np.where(np.array(side) != 0, 3.0, np.nan),
            band=np.array(band), source=np.full(n, "notebook"), site_id=np.ones(n, dtype=np.int64),
            quality=np.full(n, "good"), photometric_system=np.array(photometric),
        )  # fmt: skip


def photometry(
    rng: np.random.Generator | None,
    dust: dict[float, tuple[float, float]],
    *,
    distance_pc: float = 2100.0,
    error_mag: float = 0.03,
    flicker_mag: float = 0.0,
    quiet: int = 24,
    bands: tuple[tuple[str, str, float], ...] = BANDS,
    opacity_factor: float = 1.0,
    deepest_mag: dict[str, float] | None = None,
) -> PhotometryArrays:
    """Quiet years, then dates with dust (mass in Msun and temperature in K by MJD).

    The published zero points are wrong by their own errors, once a band; the stars flicker; every magnitude
    has noise. Without ``rng`` nothing is wrong. A magnitude fainter than ``deepest_mag`` is told as a limit.
    """
    points = Points([])
    draw = (lambda: float(rng.normal())) if rng is not None else (lambda: 0.0)
    for band, photometric, star_mag in bands:
        zero = zero_point(photometric, band)
        relative = (zero.sigma_jy or 0.0) / zero.flux_jy
        true_zero = zero.flux_jy * (1.0 + relative * draw())
        star_jy = true_zero * 10.0 ** (-0.4 * star_mag)
        times = [(AT_MJD - 3000.0 + 60.0 * i, 0.0) for i in range(quiet)]
        times += [
            (mjd, opacity_factor * dust_jy(mass, t, distance_pc, zero.wavelength_um))
            for mjd, (mass, t) in dust.items()
        ]
        for mjd, extra in times:
            flux = star_jy * 10.0 ** (-0.4 * flicker_mag * draw()) + extra
            mag = -2.5 * np.log10(flux / true_zero) + error_mag * draw()
            deepest = (deepest_mag or {}).get(band)
            if deepest is not None and mag > deepest:
                points.add(mjd, deepest, error_mag, band, photometric, 1)
            else:
                points.add(mjd, float(mag), error_mag, band, photometric)
    return points.arrays()


def told(
    arrays: PhotometryArrays | None,
    overrides: DustOverrides = NOTHING,
    *,
    record: SystemRecord | None = None,
    **question: Any,
) -> DustResult:
    """The answer of the study, on a date unless said otherwise."""
    record = record or SystemRecord(system())
    if not question.keys() & {"on", "start", "cycle", "nothing"}:
        question["on"] = instant(AT_MJD)
    question.pop("nothing", None)
    asked = DustQuestion(NOW, **{"draws": 4000, **question})
    return tell_dust(Campaign((record,), {} if arrays is None else {1: arrays}), overrides, asked)
