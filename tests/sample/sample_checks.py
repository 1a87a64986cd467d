"""Helpers of the sample's tests: dates forecast from the estimates by plain Monte Carlo, nothing of ours."""

from __future__ import annotations

import numpy as np

from campaign.model.measured import Measured


def draws_of(measured, rng, size=40_000):
    """Two-piece normal with the value as its median (DEVELOPERS.md)."""
    z = rng.normal(size=size)
    return measured.value + z * np.where(z < 0.0, measured.minus, measured.plus)


def record_of(sample, name):
    return next(record for record in sample.records if record.system.name == name)


def onset_draws(record, cycle, solution=None):
    """Onset of one cycle from epoch, period and a rule of kind phase or lag, with its stated scatter."""
    rng = np.random.default_rng(5)
    solution = solution or next(s for s in record.solutions if s.adopted)
    epoch = Measured(solution.epoch.bmjd_tdb, solution.epoch.minus_d, solution.epoch.plus_d)
    period = draws_of(solution.period_d, rng)
    offset = draws_of(record.rule.onset, rng)
    if record.rule.kind == "phase":
        offset = offset * period
    scatter = (record.rule.scatter_onset_d or 0.0) * rng.normal(size=period.size)
    return draws_of(epoch, rng) + (cycle - solution.epoch_cycle) * period + offset + scatter


def interval95(draws):
    low, median, high = np.quantile(draws, [0.025, 0.5, 0.975])
    return low, median, high


def excess_sigma(arrays, band="K"):
    """Brightening of each measured point of a band over the median of its source, in its own errors."""
    chosen = (arrays.band == band) & (arrays.limit_side == 0) & (arrays.quality == "good")
    chosen &= ~np.isnan(arrays.mag_plus)
    times, mag, error = arrays.bmjd_tdb[chosen], arrays.mag[chosen], arrays.mag_plus[chosen]
    source = arrays.source[chosen]
    result = np.empty(times.size)
    for name in np.unique(source):
        mine = source == name
        level = np.median(mag[mine])
        result[mine] = (level - mag[mine]) / np.hypot(error[mine], 0.02)
    return times, result
