"""Invented campaigns of one system: true onsets, those that somebody dated, and a light curve with gaps.

Nothing here is drawn from what is fitted: the scatter is even from none to three times the dating error,
rises are linear, a square or saturating, production declines exponentially, sources differ, whole years are
without observations, and a third of the episodes was recognised by nobody.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from campaign.model.arrays import PhotometryArrays
from campaign.model.instants import Moment
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, Episode, System

UNRECORDED = 0.35
START = 44_000.0


@dataclass(frozen=True)
class Clock:
    """True cycles of the dated episodes, their dates with errors, the truth of the next one."""

    cycles: np.ndarray
    dates: np.ndarray
    sigmas: np.ndarray
    onsets: np.ndarray
    period: float
    following: float


def draw_clock(rng: np.random.Generator, recorded: int) -> Clock:
    """So many dated onsets, others in between unrecorded; the scatter from 0 to 3 times the dating error."""
    period = rng.uniform(1500.0, 4500.0)
    dating = period * rng.uniform(0.005, 0.013)
    scatter = dating * rng.uniform(0.0, 3.0)
    cycles = [0]
    while len(cycles) < recorded:
        step = 1
        while rng.random() < UNRECORDED:
            step += 1
        cycles.append(cycles[-1] + step)
    every = np.arange(cycles[-1] + 2)
    onsets = START + period * (every + 0.3) + scatter * rng.standard_normal(every.size)
    chosen = np.array(cycles)
    sigmas = dating * rng.uniform(0.6, 1.6, chosen.size)
    dates = onsets[chosen] + sigmas * rng.standard_normal(chosen.size)
    return Clock(chosen, dates, sigmas, onsets, period, float(onsets[-1]))


def draw_light_curve(rng: np.random.Generator, clock: Clock, *, watched: float) -> PhotometryArrays:
    """K magnitudes of two sources: seasons of eight months, years without any, noise of 0.02 to 0.1 mag."""
    rise = rng.uniform(40.0, 160.0)
    end = rng.uniform(60.0, 200.0)
    noise = rng.uniform(0.02, 0.1)
    cadence = rng.uniform(12.0, 45.0)
    last = clock.dates[-1] + 400.0
    times = START + np.cumsum(cadence * rng.uniform(0.4, 1.6, int((last - START) / cadence * 1.4)))
    times = times[times < last]
    year = ((times - START) / 365.25).astype(int)
    years_on = rng.random(year.max() + 1) < watched
    up = np.cos(2.0 * np.pi * (times - START) / 365.25 + rng.uniform(0.0, 6.3)) < 0.5
    times = times[up & years_on[year]]
    excess = np.zeros(times.size)
    shape = int(rng.integers(3))
    for onset in clock.onsets[:-1]:
        amplitude = np.exp(rng.normal(np.log(1.0), 0.3))
        u = np.clip((times - onset) / rise, 0.0, 1.0)
        grown = (u, u**2, (1.0 - np.exp(-3.0 * u)) / (1.0 - np.exp(-3.0)))[shape]
        top = np.clip(times - onset - rise, 0.0, end)
        after = np.clip(times - onset - rise - end, 0.0, None)
        excess += amplitude * grown * 0.7 ** (top / end) * np.exp(-after / 120.0)
    source = np.where(rng.random(times.size) < 0.5, "patrol", "survey")
    offset = rng.normal(0.0, 0.05)
    mag = 7.2 - 2.5 * np.log10(1.0 + excess) + np.where(source == "patrol", offset, 0.0)
    mag = mag + noise * rng.standard_normal(times.size)
    count = times.size
    return PhotometryArrays(
        np.arange(count), times, np.full(count, np.nan), np.full(count, np.nan), mag, np.full(count, noise),
        np.full(count, noise), np.zeros(count, np.int8), np.full(count, np.nan), np.full(count, "K"), source,
        np.full(count, -1), np.full(count, "good"), np.full(count, ""),
    )  # fmt: skip


def record_of(clock: Clock, *, rise_d: float = 90.0) -> SystemRecord:
    """The system as somebody knows it: its dated onsets and, roughly, maxima."""
    episodes = tuple(
        Episode(
            number, 1, None,
            onset=DatedEvent(Moment(float(date), float(sigma), float(sigma)), "K"),
            maximum=DatedEvent(Moment(float(date) + rise_d, 20.0, 20.0), "K"),
        )
        for number, (date, sigma) in enumerate(zip(clock.dates, clock.sigmas, strict=True), start=1)
    )  # fmt: skip
    return SystemRecord(System(1, "Invented", 270.0, -45.0), (), None, episodes)
