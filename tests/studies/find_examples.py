"""Light curves made point by point for the tests of finding episodes. All numbers are invented."""

from __future__ import annotations

import numpy as np
from find_simulations import FloatArray, as_arrays

from campaign.model.arrays import PhotometryArrays
from campaign.model.instants import Moment
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, Episode, System

START = 55_000.0


def record(*episodes: Episode) -> SystemRecord:
    """A system with nothing known of it but some episodes."""
    return SystemRecord(System(1, "Vane 6", 40.0, -20.0), episodes=tuple(episodes))


def known(number: int, onset: float, end: float, state: str = "confirmed") -> Episode:
    dated = [DatedEvent(Moment(date, 5.0, 5.0)) for date in (onset, end)]
    return Episode(number, 1, None, state, onset=dated[0], end=dated[1])  # type: ignore[arg-type]


def burst(times: FloatArray, onset: float, rise_d: float = 90.0, height: float = 1.2) -> FloatArray:
    """Excess of one episode: a straight rise, half a rise long of slow decline, then decay."""
    top, end = onset + rise_d, onset + 1.5 * rise_d
    up = np.clip((times - onset) / rise_d, 0.0, 1.0)
    down = 1.0 - 0.3 * np.clip((times - top) / (end - top), 0.0, 1.0)
    return height * up * down * np.exp(-np.clip(times - end, 0.0, None) / 80.0)


def curve(
    excess: FloatArray, times: FloatArray, *, band: str = "K", source: str = "sheets", error: float = 0.02,
    seed: int = 1, level: float = 7.0,
) -> tuple[FloatArray, FloatArray, FloatArray, str, str]:  # fmt: skip
    """One row for :func:`find_simulations.as_arrays`: noisy magnitudes of a band and source."""
    noise = error * np.random.default_rng(seed).normal(size=times.size)
    mags = level - 2.5 * np.log10(1.0 + excess) + noise
    return times, mags, np.full(times.size, error), band, source


def light(*rows: tuple[FloatArray, FloatArray, FloatArray, str, str]) -> PhotometryArrays:
    return as_arrays(list(rows))


def times(first: float, last: float, step: float) -> FloatArray:
    return START + np.arange(first, last, step)
