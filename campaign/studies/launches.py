"""When the dust of each cycle leaves the stars: the middle of its production window, and how wide that is."""

from __future__ import annotations

from collections.abc import Sequence
from copy import copy
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from campaign.model.forecasts import EventName
from campaign.model.instants import Moment
from campaign.model.systems import Episode
from campaign.physics.draws import stratified_normals
from campaign.studies.following import missing_since_onset
from campaign.studies.forecast import Forecaster

FloatArray = NDArray[np.float64]
Basis = Literal["window", "onset", "maximum", "end", "periastron"]

WINDOW_UNKNOWN = "width of the production window"
# What one date of a cycle alone stands in for the middle of its window, the best first.
_ALONE: tuple[EventName, ...] = ("maximum", "onset", "end", "periastron")


@dataclass(frozen=True, slots=True)
class Launch:
    """Draws of the launch of one cycle's shell, ``bmjd_tdb``; NaN in draws without an episode.

    ``spread_d`` is the launch with half the window's width counted as error, ``middle_d`` the middle
    itself. ``missing`` names the errors that nobody knows: then there is no interval.
    """

    cycle: int
    basis: Basis
    middle_d: FloatArray
    half_width_d: FloatArray
    spread_d: FloatArray
    observed: bool = False
    missing: tuple[str, ...] = ()

    @property
    def in_words(self) -> str:
        """What the launch is taken from."""
        return "the middle of the production window" if self.basis == "window" else f"the {self.basis} alone"

    @property
    def median_d(self) -> float:
        """Median launch, ``bmjd_tdb``; NaN when there is no episode in any draw."""
        # Of the middle: the width lies evenly about it, and its draws would only add noise.
        return float(np.nanmedian(self.middle_d)) if np.isfinite(self.middle_d).any() else float("nan")

    @property
    def sigma_d(self) -> float | None:
        """Standard deviation with half the window as error; None where an error is unknown."""
        if self.missing:
            return None
        return float(np.hypot(np.nanstd(self.middle_d), np.sqrt(np.nanmean(self.half_width_d**2))))

    @property
    def probability(self) -> float:
        """Share of the draws in which there is an episode at all (dimensionless)."""
        return float(np.mean(np.isfinite(self.spread_d)))


def launch_of(forecaster: Forecaster, unit: int, cycle: int, seed: int) -> Launch | None:
    """The launch of one cycle's shell.

    Parameters
    ----------
    forecaster : Forecaster
        Rows and units; instants ``bmjd_tdb``.
    unit : int
        Which unit.
    cycle : int
        Cycle (dimensionless).
    seed : int
        Of the draws within the window.

    Returns
    -------
    Launch or None
        None when the phase of that cycle is lost or nothing dates it.

    Notes
    -----
    What was observed of the cycle's episode stands in place of the forecast. A cycle of which one date
    alone can be given is launched then, with a window whose width is not known.
    Accuracy: that of the draws.

    Source: DEVELOPERS.md (Shells): middle of the production window, half its width counted as error.
    """
    one, draws = forecaster.units[unit], forecaster.sampler.draws
    datable = {event for row in one.rows for event in forecaster.rows[row].events}
    episode = one.confirmed(cycle)
    seen = {} if episode is None else _seen(episode)
    if not seen and _is_lost(forecaster, unit, cycle, datable):
        return None
    onset, end = (_date(forecaster, unit, cycle, e, episode, datable) for e in ("onset", "end"))
    z = _normals("launch within the window", draws, seed)
    if onset is not None and end is not None:
        middle, half = 0.5 * (onset[0] + end[0]), 0.5 * np.abs(end[0] - onset[0])
        missing = tuple(dict.fromkeys((*onset[1], *end[1])))
        observed = "onset" in seen and "end" in seen
        return Launch(cycle, "window", middle, half, middle + half * z, observed, missing)
    for event in _ALONE:
        date = _date(forecaster, unit, cycle, event, episode, datable)
        if date is not None:
            missing = tuple(dict.fromkeys((*date[1], WINDOW_UNKNOWN)))
            unknown = np.full(draws, np.nan)
            return Launch(cycle, event, date[0], unknown, date[0], event in seen, missing)  # type: ignore[arg-type]
    return None


def cycles_between(forecaster: Forecaster, unit: int, start: float, end: float) -> Sequence[int]:
    """Cycles whose launch may fall into a span.

    Parameters
    ----------
    forecaster : Forecaster
        Rows and units.
    unit : int
        Which unit.
    start, end : float
        The span, ``bmjd_tdb`` (days).

    Returns
    -------
    sequence of int
        Ascending; one more on either side, since a launch may lie far from periastron. Empty where
        nothing dates the system.

    Notes
    -----
    Accuracy: by the nominal period. Source: T_k = T_0 + k P.
    """
    rows = [row for row in forecaster.units[unit].rows if forecaster.rows[row].events]
    if not rows or not forecaster.period_d(rows[0]) > 0.0:
        return ()
    first, last = (forecaster.cycle_near(rows[0], instant) for instant in (start, end))
    return range(first - 1, last + 2)


@lru_cache(maxsize=16)
def _normals(name: str, draws: int, seed: int) -> FloatArray:
    return stratified_normals([name], draws, seed)[name]


def rough_span(forecaster: Forecaster, unit: int, cycle: int, seed: int) -> tuple[float, float] | None:
    """About when the shell of a cycle may be launched, from few draws: to find the cycles worth dating.

    Parameters
    ----------
    forecaster : Forecaster
        Rows and units.
    unit, cycle : int
        Which unit and cycle (dimensionless).
    seed : int
        Of the draws within the window.

    Returns
    -------
    (float, float) or None
        ``bmjd_tdb``, days, with a quarter of slack on either side; None where it has no launch.

    Notes
    -----
    Accuracy: good enough to leave out what is far away. Source: project convention.
    """
    few = copy(forecaster)
    few.sampler = forecaster.pilot
    launch = launch_of(few, unit, cycle, seed)
    if launch is None or not np.isfinite(launch.spread_d).any():
        return None
    low, high = float(np.nanmin(launch.spread_d)), float(np.nanmax(launch.spread_d))
    slack = 0.25 * (high - low)
    return low - slack, high + slack


def _seen(episode: Episode) -> set[str]:
    return {event for event in ("onset", "maximum", "end") if getattr(episode, event) is not None}


def _is_lost(forecaster: Forecaster, unit: int, cycle: int, datable: set[EventName]) -> bool:
    event = next((e for e in ("onset", *_ALONE) if e in datable), None)
    return event is not None and bool(forecaster.phase_lost([(unit, event, cycle)])[0])


def _date(
    forecaster: Forecaster,
    unit: int,
    cycle: int,
    event: EventName,
    episode: Episode | None,
    datable: set[EventName],
) -> tuple[FloatArray, tuple[str, ...]] | None:
    """Draws of one stage, and the errors that nobody knows; None where nothing dates it."""
    seen = None if episode is None else getattr(episode, event, None)
    if seen is not None:
        moment = seen.moment
        known = moment.minus_d is not None and moment.plus_d is not None
        return _observed(forecaster, event, moment), () if known else (f"observed {event}",)
    if event not in datable:
        return None
    one = forecaster.units[unit]
    if event == "end" and episode is not None and episode.onset is not None:
        since = forecaster.since_onset(unit, event, cycle)
        if np.isfinite(since).any():
            moment = episode.onset.moment
            lacking = [missing_since_onset(forecaster.rows[row], event, moment) for row in one.rows]
            onset = _observed(forecaster, "onset", moment)
            return onset + since, tuple(dict.fromkeys(name for names in lacking for name in names))
    unknown: dict[str, None] = {}
    for row in one.rows:
        unknown.update(dict.fromkeys(forecaster.rows[row].missing_errors(event, cycle)))
    return _together(forecaster, unit).unit_times(unit, event, cycle), tuple(unknown)


def _observed(forecaster: Forecaster, event: EventName, moment: Moment) -> FloatArray:
    """Draws of an observed date; onset and end of a burst were dated apart, each with its own error."""
    z = _normals(f"observed {event}", forecaster.sampler.draws, 1)
    drawn: FloatArray = moment.bmjd_tdb + np.where(z < 0.0, moment.minus_d or 0.0, moment.plus_d or 0.0) * z
    return drawn


def _together(forecaster: Forecaster, unit: int) -> Forecaster:
    """The same forecaster, in which the learned dates of one cycle err together.

    Onset and end of a cycle hang on the same line through the dated episodes; taken as independent, their
    middle would be too certain.
    """
    if not any(row in forecaster.learned for row in forecaster.units[unit].rows):
        return forecaster
    other, sampler = copy(forecaster), copy(forecaster.sampler)
    shared = sampler.normals["scatter onset"]
    sampler.normals = {**sampler.normals, "scatter maximum": shared, "scatter end": shared}
    other.sampler = sampler
    return other
