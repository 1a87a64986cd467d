"""Invented light curves with known episodes, drawn by rules that are not those of the fit.

Rises are linear, any power, or saturate at any pace, where the fit knows a few of each; production declines
exponentially, not linearly; sources have offsets, seasons end behind the Sun, a hundredth of the points
are wild, and the stars flicker. All numbers are invented.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from campaign.model.arrays import PhotometryArrays

FloatArray = NDArray[np.float64]
BANDS = ("K", "L")
LEVEL_MAG = {"K": 7.2, "L": 6.6}
START = 52_000.0


@dataclass(frozen=True)
class TrueEpisode:
    """Onset of production, top in K, end of production; days.

    ``shape`` is one of linear, faster, saturating; ``bend`` is the power, or the pace of the saturation.
    """

    onset: float
    top: float
    end: float
    amplitude: float
    shape: str
    bend: float
    decay_d: float


@dataclass(frozen=True)
class Simulated:
    """A light curve, its true episodes, and true offsets of its sources."""

    arrays: PhotometryArrays
    episodes: tuple[TrueEpisode, ...]


def true_rise(shape: str, bend: float, share: FloatArray) -> FloatArray:
    u = np.clip(share, 0.0, 1.0)
    if shape == "linear":
        return u
    if shape == "faster":
        return u**bend
    return (1.0 - np.exp(-bend * u)) / (1.0 - np.exp(-bend))


def true_excess(episode: TrueEpisode, times: FloatArray, band: str) -> FloatArray:
    """Dust's flux over the stars'; in L it is three times as much, later, and lasts longer."""
    later, times_k, slower = (0.0, 1.0, 1.0) if band == "K" else (12.0, 3.0, 1.3)
    top, end = episode.top + later, episode.end + later
    rise = true_rise(episode.shape, episode.bend, (times - episode.onset) / (top - episode.onset))
    production = 0.7 ** (np.clip(times - top, 0.0, end - top) / (end - top))
    decay = np.exp(-np.clip(times - end, 0.0, None) / (slower * episode.decay_d))
    return episode.amplitude * times_k * rise * production * decay


def draw_visits(rng: np.random.Generator, years: float, cadence_d: float, sun: float) -> FloatArray:
    """Nights of one source: a season of eight months a year, a quarter lost to weather."""
    count = int(years * 365.25 / cadence_d * 1.3) + 8
    times = START + np.cumsum(cadence_d * (0.4 + 1.2 * rng.random(count)))
    times = times[times < START + years * 365.25]
    up = np.cos(2.0 * np.pi * (times - sun) / 365.25) < 0.5
    return times[up & (rng.random(times.size) > 0.25)]


def draw_episodes(rng: np.random.Generator, years: float, count: int) -> tuple[TrueEpisode, ...]:
    """Episodes at nearly equal intervals, the first not at once."""
    period = years * 365.25 / count
    found = []
    for number in range(count):
        onset = START + period * (number + 0.25 + 0.25 * rng.random())
        top = onset + float(rng.uniform(40.0, 220.0))
        end = top + float(rng.uniform(60.0, 220.0))
        shape, low, high = (("linear", 1.0, 1.0), ("faster", 1.2, 3.2), ("saturating", 1.0, 6.0))[
            int(rng.integers(3))
        ]
        bend = float(rng.uniform(low, high))
        amplitude = float(np.exp(rng.uniform(np.log(0.5), np.log(2.5))))
        found.append(TrueEpisode(onset, top, end, amplitude, shape, bend, float(rng.uniform(60.0, 220.0))))
    return tuple(found)


def simulate(
    seed: int, *, cadence_d: float, noise_mag: tuple[float, float] = (0.02, 0.1), episodes: int = 1,
    years: float = 6.0, sources: int = 3, bands: tuple[str, ...] = BANDS, red_mag: float = 0.0,
    wild_share: float = 0.01, offset_mag: float = 0.05,
) -> Simulated:  # fmt: skip
    """One system's light curve with its truth."""
    rng = np.random.default_rng([seed, 5])
    truth = draw_episodes(rng, years, episodes) if episodes else ()
    sun = float(rng.uniform(0.0, 365.25))
    rows: list[tuple[FloatArray, FloatArray, FloatArray, str, str]] = []
    # Slow noise that all sources of a band see: the stars' own wandering, correlated over a month.
    nodes = START + np.arange(-60.0, years * 365.25 + 60.0, 5.0)
    for band in bands:
        wander = np.zeros(nodes.size)
        if red_mag:
            keep = np.exp(-5.0 / 30.0)
            for i in range(1, nodes.size):
                wander[i] = keep * wander[i - 1] + red_mag * np.sqrt(1 - keep**2) * rng.normal()
        for number in range(sources):
            times = draw_visits(rng, years, cadence_d * sources, sun)
            if number == sources - 1 and sources > 1:
                # The last instrument arrives late: its level must not look like an onset.
                times = times[times > START + 0.4 * years * 365.25]
            if band == "L":
                times = times[rng.random(times.size) < 0.5]
            sigma = float(np.exp(rng.uniform(np.log(noise_mag[0]), np.log(noise_mag[1]))))
            error = sigma * np.exp(0.1 * rng.normal(size=times.size))
            flux = 1.0 + sum((true_excess(one, times, band) for one in truth), np.zeros(times.size))
            mag = LEVEL_MAG[band] + offset_mag * rng.normal() - 2.5 * np.log10(flux)
            mag = mag + error * rng.normal(size=times.size) + 0.006 * rng.normal(size=times.size)
            mag = mag + np.interp(times, nodes, wander)
            wild = rng.random(times.size) < wild_share
            mag = mag + np.where(wild, 0.3 * rng.normal(size=times.size), 0.0)
            rows.append((times, mag, error, band, f"source {number}"))
    return Simulated(as_arrays(rows), truth)


def as_arrays(rows: list[tuple[FloatArray, FloatArray, FloatArray, str, str]]) -> PhotometryArrays:
    """Columns of times, magnitudes and errors of each band and source as the catalogue hands them over."""
    times = np.concatenate([row[0] for row in rows])
    order = np.argsort(times, kind="stable")
    count = times.size

    def text(place: int) -> NDArray[np.str_]:
        return np.concatenate([np.full(row[0].size, row[place]) for row in rows])[order]

    return PhotometryArrays(
        id=np.arange(count), bmjd_tdb=times[order], minus_d=np.full(count, 1e-5), plus_d=np.full(count, 1e-5),
        mag=np.concatenate([row[1] for row in rows])[order],
        mag_minus=np.concatenate([row[2] for row in rows])[order],
        mag_plus=np.concatenate([row[2] for row in rows])[order],
        limit_side=np.zeros(count, dtype=np.int8), limit_sigma=np.full(count, np.nan), band=text(3),
        source=text(4), site_id=np.ones(count, dtype=np.int64), quality=np.full(count, "good"),
        photometric_system=np.full(count, "One"),
    )  # fmt: skip
