"""Invented campaigns that wait for an onset: elements with honest errors, light curves with everything else.

The true onset is drawn from the forecast's own distribution, for that is what a forecast claims; light curves
are those of find_simulations (rises of three shapes, none weighted as the project's, seasons behind the Sun,
offsets between sources, wild points), looked at on a random day.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from find_simulations import LEVEL_MAG, START, TrueEpisode, as_arrays, draw_visits, true_excess
from numpy.typing import NDArray
from studies_examples import lag_rule, moment, record, solution

from campaign.model.arrays import PhotometryArrays
from campaign.model.records import SystemRecord
from campaign.studies.preparing import Question
from campaign.studies.upcoming import date_campaign

FloatArray = NDArray[np.float64]
MEDIAN = START + 2_600.0
PERIOD = 3_000.0


@dataclass(frozen=True)
class Case:
    """One campaign on one day: its forecast before and after, and the truth."""

    truth: float
    as_of: float
    last_quiet: float
    status: str
    before: FloatArray
    after: FloatArray
    sigma: float


def draw_truth(rng: np.random.Generator, onset: float, rise: tuple[float, float]) -> TrueEpisode:
    top = onset + float(rng.uniform(*rise))
    shape, low, high = (("linear", 1.0, 1.0), ("faster", 1.2, 3.2), ("saturating", 1.0, 6.0))[
        int(rng.integers(3))
    ]
    amplitude = float(np.exp(rng.uniform(np.log(0.4), np.log(2.2))))
    return TrueEpisode(
        onset, top, top + float(rng.uniform(60.0, 220.0)), amplitude, shape, float(rng.uniform(low, high)),
        float(rng.uniform(60.0, 220.0)),
    )  # fmt: skip


def draw_curve(
    rng: np.random.Generator, episode: TrueEpisode, until: float, cadence_d: float
) -> PhotometryArrays:
    """What was observed up to a day, in K and L, by two sources."""
    rows = []
    sun = float(rng.uniform(0.0, 365.25))
    years = (until - START) / 365.25
    for band in ("K", "L"):
        for number in range(2):
            times = draw_visits(rng, years, 2.0 * cadence_d, sun)
            if band == "L":
                times = times[rng.random(times.size) < 0.5]
            sigma = float(np.exp(rng.uniform(np.log(0.02), np.log(0.1))))
            error = sigma * np.exp(0.1 * rng.normal(size=times.size))
            mag = (
                LEVEL_MAG[band]
                + 0.05 * rng.normal()
                - 2.5 * np.log10(1.0 + true_excess(episode, times, band))
            )
            mag = mag + error * rng.normal(size=times.size) + 0.006 * rng.normal(size=times.size)
            wild = rng.random(times.size) < 0.005
            rows.append((times, mag + np.where(wild, 0.3 * rng.normal(size=times.size), 0.0), error, band,
                         f"source {number}"))  # fmt: skip
    return as_arrays(rows)


def system(sigma: float, rise_d: float, median: float = MEDIAN) -> SystemRecord:
    """An orbit whose next onset is normal about ``median`` with this sigma."""
    orbit = solution(PERIOD, 0.0, period_error=0.0)
    orbit = replace(orbit, epoch=moment(median - PERIOD, sigma))
    return record(orbit, rule=lag_rule(0.0, rise_d, rise_d + 140.0))


def wait(
    seed: int,
    *,
    sigma: tuple[float, float] = (60.0, 200.0),
    cadence_d: float = 8.0,
    rise: tuple[float, float] = (40.0, 220.0),
) -> Case | None:
    """One campaign; None where its onset is suspected already."""
    rng = np.random.default_rng([seed, 11])
    size = float(np.exp(rng.uniform(*np.log(sigma))))
    truth = MEDIAN + size * float(rng.normal())
    as_of = MEDIAN + size * float(rng.uniform(-1.5, 2.0))
    arrays = draw_curve(rng, draw_truth(rng, truth, rise), as_of, cadence_d)
    one = system(size, 0.5 * sum(rise))
    question = Question(as_of, as_of, as_of + 6_000.0, events=("onset",), draws=4_000)
    found = date_campaign([one], {1: arrays}, question)
    for dated, event in zip(found.listed, found.events, strict=True):
        if event.cycle == 1:
            if event.status == "suspected":
                return None
            before = next(d for d in found.unconditioned if d.event == "onset" and d.cycle == 1)
            quiet = event.conditioning.last_quiet_bmjd_tdb if event.conditioning else -np.inf
            return Case(truth, as_of, quiet, event.status, before.grid, dated.grid, size)
    return None


def crps(grid: FloatArray, truth: float) -> float:
    """Of equal quantiles: mean |x - y| less half of the mean difference (Gneiting & Raftery 2007)."""
    ordered = np.sort(grid)
    n = ordered.size
    within = float((2.0 * np.arange(1, n + 1) - n - 1) @ ordered) * 2.0 / n**2
    return float(np.abs(ordered - truth).mean()) - 0.5 * within


def transform(grid: FloatArray, truth: float) -> float:
    shares = (np.arange(grid.size) + 0.5) / grid.size
    return float(np.interp(truth, grid, shares, left=0.25 / grid.size, right=1.0 - 0.25 / grid.size))
