"""Which quiet nights moved an onset most: the forecast as it was after each of them."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import MovedBy
from campaign.physics.conditioned import condition_draws, weighted_quantiles
from campaign.physics.timescales import utc_iso
from campaign.studies.conditioning import points_of
from campaign.studies.preparing import Question
from campaign.studies.quietpoints import QuietPoints
from campaign.studies.upcoming import DatedCampaign

FloatArray = NDArray[np.float64]

# So many nights are told; so many of the last ones are looked at one by one.
MOST_TOLD = 5
MOST_NIGHTS = 30
_NIGHT_D = 0.7


def moved_by(
    found: DatedCampaign,
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
) -> dict[tuple[str | None, int], tuple[MovedBy, ...]]:
    """The nights that moved each conditioned onset most, by (solution, cycle).

    Parameters
    ----------
    found : DatedCampaign
        The forecast of one system.
    photometry : mapping of int to PhotometryArrays
        Its light curve by system id.
    question : Question
        As it was asked.

    Returns
    -------
    dict
        In order of time; days by which the median moved when that night's points came in.

    Notes
    -----
    Accuracy: the moves of all nights sum to the whole move; a night says less the more is known before it.

    Source: project convention.
    """
    told = {}
    for onset in found.listed:
        if onset.event != "onset" or onset.conditioning is None or onset.cycle is None:
            continue
        before = next(
            d for d in found.unconditioned
            if (d.unit, d.cycle, d.event) == (onset.unit, onset.cycle, "onset")
        )  # fmt: skip
        points = points_of(before, found.prepared, found.forecaster, found.states, photometry, question)
        if points is not None and onset.conditioning.moved:
            draws = found.forecaster.unit_times(onset.unit, "onset", onset.cycle)
            label = found.prepared.units[onset.unit].label
            told[label, onset.cycle] = _moves(points, draws)
    return told


def _moves(points: QuietPoints, draws: FloatArray) -> tuple[MovedBy, ...]:
    nights = _nights(points)
    if not nights:
        return ()
    shown = nights[-MOST_NIGHTS:]
    medians = [_median(points.until(shown[0][0] - _NIGHT_D), draws)]
    medians += [_median(points.until(last), draws) for _, last in shown]
    shifts = np.diff(medians)
    chosen = np.sort(np.argsort(-np.abs(shifts), kind="stable")[:MOST_TOLD])
    iso = utc_iso(np.array([shown[int(i)][1] for i in chosen]))
    found = []
    for i, utc in zip(chosen.tolist(), iso, strict=True):
        first, last = shown[i]
        bands = tuple(
            name
            for name, band in zip(points.band_names, points.bands, strict=True)
            if ((band.bmjd_tdb >= first) & (band.bmjd_tdb <= last)).any()
        )
        found.append(MovedBy(last, utc or "", bands, float(shifts[i])))
    return tuple(found)


def _nights(points: QuietPoints) -> list[tuple[float, float]]:
    """First and last instant of each night with points, in order of time."""
    times = np.unique(np.concatenate([band.bmjd_tdb for band in points.bands]))
    parts = np.split(times, np.flatnonzero(np.diff(times) > _NIGHT_D) + 1)
    return [(float(part[0]), float(part[-1])) for part in parts if part.size]


def _median(points: QuietPoints, draws: FloatArray) -> float:
    found = condition_draws(draws, points.log_likelihood)
    there = ~np.isnan(found.dates_d)
    middle = weighted_quantiles(found.dates_d[there], found.weights[there], np.array([0.5]))
    return float(middle[0])
