"""Dates of every event of every cycle inside a window, drawn in blocks that fit the processor's cache."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from itertools import combinations

import numpy as np
from numpy.typing import NDArray

from campaign.model.forecasts import Conditioning, EventName
from campaign.model.systems import Episode
from campaign.physics.intervals import normal_quantiles
from campaign.studies.cycles import SAFE_SIGMA
from campaign.studies.following import days_since_onset, missing_since_onset
from campaign.studies.learned import LearnedDates
from campaign.studies.rows import SCATTERS, ForecastRow
from campaign.studies.sampling import MARK_CODES, RULE_CODES, Sampler
from campaign.studies.summaries import (
    GRID,
    Summary,
    Window,
    summarise,
    summarise_observed,
    summarise_recurrence,
)

FloatArray = NDArray[np.float64]
IntArray = NDArray[np.int64]

# Elements (draws times rows) of one block: a few arrays of this size stay in a core's cache.
_BLOCK = 131_072
_PILOT_DRAWS = 64
# How long an unseen or finished cycle stays on the list, days.
KEEP_LISTED_D = 365.25
# More cycles of one event than this are no forecast that anybody reads.
MOST_CYCLES = 100
# Sigma of the period that a neighbouring cycle may be nearer: a little beyond the 95 % interval.
_REACH = 2.5
# Typical sigma of a learned date within which its cycle is looked for; a slack comes on top.
_WIDE = 3.0
COUNTED_FROM_ONSET = "counted from the observed onset"


@dataclass(slots=True)
class ForecastUnit:
    """What is forecast as one: a single row, or a weighted mixture of rows of one system."""

    rows: tuple[int, ...]
    weights: tuple[float, ...]
    label: str | None
    episodes: tuple[Episode, ...] = ()
    watched: bool = False

    def confirmed(self, cycle: int) -> Episode | None:
        for episode in self.episodes:
            if episode.cycle == cycle:
                return episode
        return None


@dataclass(slots=True)
class DatedEvent:
    """One event of one cycle with its distribution; ``grid`` holds quantiles at GRID (bmjd_tdb)."""

    unit: int
    event: EventName
    cycle: int | None
    quantiles: FloatArray | None
    sigma_d: float | None
    probability: float | None
    in_window: float | None
    phase_lost: bool = False
    probability_per_yr: float | None = None
    grid: FloatArray | None = None
    missing: tuple[str, ...] = ()
    observed: bool = False
    disagreement_sigma: float | None = None
    notes: list[str] = field(default_factory=list)
    conditioning: Conditioning | None = None


def periastron_sigma_d(sampler: Sampler, index: IntArray, cycles: IntArray) -> FloatArray:
    """Analytic error of the marked event at a cycle.

    Parameters
    ----------
    sampler : Sampler
        Rows and their errors.
    index, cycles : ndarray of int, shape (n,)
        Rows and cycles.

    Returns
    -------
    ndarray, shape (n,)
        Standard deviation, days; an unknown error counts as zero here and is reported elsewhere.

    Notes
    -----
    Accuracy: exact for normal errors; for two-piece errors the standard deviation is exact.

    Source: var T_k = var T0 + k^2 var P + 2 k cov(T0, P).
    """
    step = cycles - sampler.epoch_cycle[index]
    variance = _variance(sampler.columns["epoch"][index]) + step**2 * _variance(
        sampler.columns["period_d"][index]
    )
    ranged = sampler.period_is_range[index]
    if ranged.any():
        half = sampler.columns["period_d"][index, 1]
        variance = np.where(
            ranged, _variance(sampler.columns["epoch"][index]) + step**2 * half**2 / 3.0, variance
        )
    for position, row in enumerate(index):
        if int(row) in sampler.correlated:
            solution = sampler.rows[row].solution
            covariance = solution.covariance if solution is not None else None
            both = covariance.between("epoch", "period_d") if covariance is not None else None
            variance[position] += 2.0 * step[position] * (both or 0.0)
    return np.sqrt(np.maximum(variance, 0.0))


def _variance(column: FloatArray) -> FloatArray:
    minus, plus = column[:, 1], column[:, 2]
    return 0.5 * (minus**2 + plus**2) - (plus - minus) ** 2 / (2.0 * np.pi)


class Forecaster:
    """Forecasts units of rows; keeps nothing but the sampler and a small pilot of it."""

    def __init__(
        self,
        rows: Sequence[ForecastRow],
        units: Sequence[ForecastUnit],
        learned: dict[int, LearnedDates],
        draws: int,
        seed: int,
    ) -> None:
        self.rows = rows
        self.units = units
        self.learned = learned
        self.unit_of_row = {row: u for u, unit in enumerate(units) for row in unit.rows}
        self.sampler = Sampler(rows, draws, seed, learned)
        # Cycles in the window of units that have more than MOST_CYCLES of them.
        self.cut: dict[int, int] = {}
        # The pilot only finds out which cycles can fall inside the window; no date comes from it.
        self.pilot = self.sampler if draws <= _PILOT_DRAWS else self.sampler.thinned(_PILOT_DRAWS, seed)

    # ---------------------------------------------------------------- which cycles

    def period_d(self, row: int) -> float:
        learned = self.learned.get(row)
        value = self.sampler.columns["period_d"][row, 0]
        return float(learned.rough_period_d) if learned is not None and np.isnan(value) else float(value)

    def tasks(self, window: Window, events: Sequence[EventName]) -> list[tuple[int, EventName, int]]:
        """(unit, event, cycle) triples that may matter for the window or for the status today.

        Of more than MOST_CYCLES cycles the first are taken; ``cut`` then says how many there are.
        """
        found: dict[tuple[int, EventName, int], None] = {}
        for event in events:
            index = np.array(
                [i for i, row in enumerate(self.rows) if event in row.events and i in self.unit_of_row],
                dtype=np.int64,
            )
            if not index.size:
                continue
            for row, low, high in zip(index, *self._cycle_span(event, index, window), strict=True):
                unit = self.unit_of_row[int(row)]
                count = int(high) - int(low) + 1
                if count > MOST_CYCLES:
                    self.cut[unit] = max(count, self.cut.get(unit, 0))
                for cycle in range(int(low), int(low) + min(count, MOST_CYCLES)):
                    found[(unit, event, cycle)] = None
        return list(found)

    def _cycle_span(self, event: EventName, index: IntArray, window: Window) -> tuple[IntArray, IntArray]:
        reference = np.array([self.cycle_near(int(i), window.start) for i in index], dtype=np.int64)
        low, high = self._reach(event, index, reference)
        has = ~np.isnan(low)
        period = np.array([self.period_d(int(i)) for i in index])
        slack = 0.25 * (high - low)
        start = np.full(index.size, window.start)
        if event in SCATTERS:
            keep = np.array([self._looks_back(int(i)) for i in index])
            start = np.minimum(start, window.as_of - np.where(keep, period, KEEP_LISTED_D))
        with np.errstate(invalid="ignore"):
            first = np.ceil((start - high - slack) / period)
            last = np.floor((window.end - low + slack) / period)
            # The error of the period widens the neighbours: one more cycle on either side may reach in.
            # Further ones cannot: a date as uncertain as that has lost its phase.
            errors = np.nan_to_num(self.sampler.columns["period_d"][index, 1:]).max(axis=1)
            before, after = first - 1.0, last + 1.0
            first -= high + before * period + _REACH * np.abs(before) * errors >= start - slack
            last += low + after * period - _REACH * np.abs(after) * errors <= window.end + slack
        first = np.where(has, first, 1)
        last = np.where(has, last, 0)
        return reference + first.astype(np.int64), reference + last.astype(np.int64)

    def _reach(self, event: EventName, index: IntArray, cycles: IntArray) -> tuple[FloatArray, FloatArray]:
        """Earliest and latest date that an event may well have; NaN where it never happens."""
        low, high = np.full(index.size, np.nan), np.full(index.size, np.nan)
        drawn = []
        for place, row in enumerate(index):
            learned = self.learned.get(int(row)) if event in SCATTERS else None
            if learned is not None and event in learned.events():
                prediction = learned.predict(event, int(cycles[place]))
                centre, size = prediction.mean_d, _WIDE * prediction.typical_sigma_d
                low[place], high[place] = centre - size, centre + size
            else:
                drawn.append(place)
        if drawn:
            pilot = self.pilot.event_times(event, index[drawn], cycles[drawn])
            happens = ~np.all(np.isnan(pilot), axis=1)
            some = np.array(drawn)[happens]
            low[some] = np.nanmin(pilot[happens], axis=1)
            high[some] = np.nanmax(pilot[happens], axis=1)
        return low, high

    def _looks_back(self, row: int) -> bool:
        unit = self.units[self.unit_of_row[row]]
        return unit.watched or bool(unit.episodes)

    def cycle_near(self, row: int, instant: float) -> int:
        """The cycle whose date is nearest to an instant, ``bmjd_tdb``."""
        learned = self.learned.get(row)
        epoch, period = self.sampler.columns["epoch"][row, 0], self.period_d(row)
        if learned is not None and (np.isnan(epoch) or self.rows[row].solution is None):
            event = learned.events()[0]
            last_cycle, last_date = learned.cycles[event][-1], learned.dates_d[event][-1]
            return int(last_cycle + round((instant - last_date) / period))
        return self.rows[row].epoch_cycle + round(float((instant - epoch) / period))

    # ---------------------------------------------------------------- dates

    def run(self, window: Window, events: Sequence[EventName], keep_grid: bool = True) -> list[DatedEvent]:
        """Date every event that may matter; see ``tasks``."""
        single: dict[EventName, list[tuple[int, int]]] = {event: [] for event in events}
        mixed: dict[EventName, list[tuple[int, int]]] = {event: [] for event in events}
        seen: list[tuple[int, EventName, int]] = []
        tasks = self.tasks(window, events)
        lost: dict[tuple[int, EventName], None] = {}
        for (unit, event, cycle), is_lost in zip(tasks, self.phase_lost(tasks), strict=True):
            one = self.units[unit]
            if is_lost:
                lost[unit, event] = None
            elif one.episodes and event in SCATTERS and one.confirmed(cycle) is not None:
                seen.append((unit, event, cycle))
            else:
                (mixed if len(one.rows) > 1 else single)[event].append((unit, cycle))
        dated = self.date_pairs(single, window, keep_grid)
        for event, pairs in mixed.items():
            dated.extend(self._dated_mixtures(event, pairs, window, keep_grid))
        dated.extend(self._dated_after_onset(unit, event, cycle, window) for unit, event, cycle in seen)
        dated.extend(self._without_date(unit, event, window) for unit, event in lost)
        return dated

    def date_pairs(
        self, pairs: Mapping[EventName, list[tuple[int, int]]], window: Window, keep_grid: bool = True
    ) -> list[DatedEvent]:
        """Date given (unit, cycle) pairs of each event; every unit has one row and nothing observed."""
        dated: list[DatedEvent] = []
        for event, chosen in pairs.items():
            drawn = []
            for unit, cycle in chosen:
                learned = self.learned.get(self.units[unit].rows[0]) if event in SCATTERS else None
                if learned is not None and event in learned.events():
                    summary = summarise_recurrence(learned.predict(event, cycle), window)
                    dated.append(self._collect(unit, event, cycle, summary, 0))
                else:
                    drawn.append((unit, cycle))
            dated.extend(self._dated_in_blocks(event, drawn, window, keep_grid))
        return dated

    def phase_lost(self, tasks: Sequence[tuple[int, EventName, int]]) -> NDArray[np.bool_]:
        """Of each task, whether 3 sigma of its date in any of its rows reach half a period."""
        lost = np.zeros(len(tasks), dtype=bool)
        where, rows, cycles = [], [], []
        for position, (unit, event, cycle) in enumerate(tasks):
            for row in self.units[unit].rows:
                learned = self.learned.get(row) if event in SCATTERS else None
                if learned is not None:
                    sigma = learned.predict(event, cycle).typical_sigma_d
                    lost[position] |= SAFE_SIGMA * sigma >= 0.5 * self.period_d(row)
                else:
                    where.append(position)
                    rows.append(row)
                    cycles.append(cycle)
        index, at = np.array(rows, dtype=np.int64), np.array(cycles, dtype=np.int64)
        sigmas = periastron_sigma_d(self.sampler, index, at)
        # A row without an epoch has no date to lose.
        half = (
            0.5 * self.sampler.columns["period_d"][index, 0] + 0.0 * self.sampler.columns["epoch"][index, 0]
        )
        np.logical_or.at(lost, np.array(where, dtype=np.int64), SAFE_SIGMA * sigmas >= half)
        return lost

    def _dated_in_blocks(
        self, event: EventName, pairs: list[tuple[int, int]], window: Window, keep_grid: bool
    ) -> list[DatedEvent]:
        result: list[DatedEvent] = []
        rows = np.array([self.units[unit].rows[0] for unit, _ in pairs], dtype=np.int64)
        cycles = np.array([cycle for _, cycle in pairs], dtype=np.int64)
        exact = self._exactly_normal(event, rows)
        step = max(1, _BLOCK // self.sampler.draws)
        for chosen, normal in ((np.flatnonzero(exact), True), (np.flatnonzero(~exact), False)):
            for start in range(0, chosen.size, 4096 if normal else step):
                block = chosen[start : start + (4096 if normal else step)]
                if normal:
                    summary = self._normal_summary(event, rows[block], cycles[block], window)
                else:
                    times = self.sampler.event_times(event, rows[block], cycles[block])
                    summary = summarise(times, window, keep_grid and event in SCATTERS)
                for position, where in enumerate(block):
                    unit, cycle = pairs[where]
                    result.append(self._collect(unit, event, cycle, summary, position))
        return result

    def _collect(
        self, unit: int, event: EventName, cycle: int, summary: Summary, position: int
    ) -> DatedEvent:
        one = self.units[unit]
        missing: dict[str, None] = {}
        for row in one.rows:
            missing.update(dict.fromkeys(self.rows[row].missing_errors(event, cycle)))
        probability: float | None = float(summary.probability[position])
        in_window: float | None = float(summary.in_window[position])
        if missing:
            in_window = None
            probability = None if probability is not None and probability < 1.0 else probability
        return DatedEvent(
            unit=unit,
            event=event,
            cycle=cycle,
            quantiles=summary.quantiles[position],
            sigma_d=float(summary.sigma_d[position]),
            probability=probability,
            in_window=in_window,
            grid=None if summary.grid is None else summary.grid[position],
            missing=tuple(missing),
        )

    def unit_times(self, unit: int, event: EventName, cycle: int) -> FloatArray:
        """Draws of one event of one unit, mixed by weight, shape (draws,)."""
        at = np.array([cycle])
        return self._mixed(unit, event, lambda i: self.sampler.event_times(event, np.array([i]), at)[0])

    def since_onset(self, unit: int, event: EventName, cycle: int) -> FloatArray:
        return self._mixed(
            unit, event, lambda i: days_since_onset(self.sampler, self.learned.get(i), i, event, cycle)
        )

    def _mixed(self, unit: int, event: EventName, draw: Callable[[int], FloatArray]) -> FloatArray:
        """Draws of the rows that date an event, by weight; the others leave their share to them."""
        one, draws = self.units[unit], self.sampler.draws
        parts, taken = [], 0
        for i, (row, weight) in enumerate(zip(one.rows, one.weights, strict=True)):
            last = i == len(one.rows) - 1
            count = draws - taken if last else round(weight * draws)
            if event in self.rows[row].events:
                parts.append(draw(row)[taken : taken + count])
            taken += count
        return np.concatenate(parts) if parts else np.full(draws, np.nan)

    def _dated_mixtures(
        self, event: EventName, pairs: list[tuple[int, int]], window: Window, keep_grid: bool
    ) -> list[DatedEvent]:
        """Mixtures of several solutions, the rows of a few units drawn together."""
        result: list[DatedEvent] = []
        draws = self.sampler.draws
        widest = max((len(self.units[unit].rows) for unit, _ in pairs), default=1)
        step = max(1, _BLOCK // (draws * widest))
        for start in range(0, len(pairs), step):
            block = pairs[start : start + step]
            owners, rows, cycles = [], [], []
            for place, (unit, cycle) in enumerate(block):
                dating = [row for row in self.units[unit].rows if event in self.rows[row].events]
                owners += [place] * len(dating)
                rows += dating
                cycles += [cycle] * len(dating)
            times = self.sampler.event_times(event, np.array(rows), np.array(cycles))
            by_unit: dict[int, dict[int, FloatArray]] = {place: {} for place in range(len(block))}
            for i, (place, row) in enumerate(zip(owners, rows, strict=True)):
                by_unit[place][row] = times[i]
            whole = np.stack(
                [
                    self._mixed(unit, event, by_unit[place].__getitem__)
                    for place, (unit, _) in enumerate(block)
                ]
            )
            summary = summarise(whole, window, keep_grid and event in SCATTERS)
            alone = summarise(times, window, False)
            for place, (unit, cycle) in enumerate(block):
                dated = self._collect(unit, event, cycle, summary, place)
                mine = [i for i, owner in enumerate(owners) if owner == place]
                dated.disagreement_sigma = _disagreement(alone.quantiles[mine, 0], alone.sigma_d[mine])
                result.append(dated)
        return result

    def _dated_after_onset(self, unit: int, event: EventName, cycle: int, window: Window) -> DatedEvent:
        """A stage of an episode that has been seen: observed itself, or counted from the observed onset."""
        one = self.units[unit]
        episode = one.confirmed(cycle)
        assert episode is not None
        seen = getattr(episode, event)
        notes: list[str] = []
        if seen is not None:
            summary = summarise_observed(seen.moment, window)
            notes.append(f"{event} observed" + (f" in {seen.band}" if seen.band else ""))
        else:
            times = self.unit_times(unit, event, cycle)
            if episode.onset is not None and event in ("maximum", "end"):
                since = self.since_onset(unit, event, cycle)
                if not np.all(np.isnan(since)):
                    moment = episode.onset.moment
                    times = since + self._observed_draws(moment.bmjd_tdb, moment.minus_d, moment.plus_d)
                    notes.append(COUNTED_FROM_ONSET)
            summary = summarise(times[None, :], window, True)
        dated = self._collect(unit, event, cycle, summary, 0)
        if seen is not None:
            error_known = seen.moment.minus_d is not None and seen.moment.plus_d is not None
            dated.missing = () if error_known else (f"observed {event}",)
            dated.probability = 1.0
            dated.observed = True
        elif notes and episode.onset is not None:
            lacking = (missing_since_onset(self.rows[row], event, episode.onset.moment) for row in one.rows)
            dated.missing = tuple(dict.fromkeys(name for names in lacking for name in names))
        if notes:
            # Of what the date now rests on: an unknown error of the orbit no longer matters.
            dated.in_window = None if dated.missing else float(summary.in_window[0])
        dated.notes.extend(notes)
        return dated

    def _observed_draws(self, value: float, minus: float | None, plus: float | None) -> FloatArray:
        z = self.sampler.normals["recurrence"]
        return value + np.where(z < 0.0, minus or 0.0, plus or 0.0) * z

    def _without_date(self, unit: int, event: EventName, window: Window) -> DatedEvent:
        period = self.period_d(self.units[unit].rows[0])
        chance = min(1.0, (window.end - window.start) / period)
        return DatedEvent(
            unit, event, None, None, None, None, chance, phase_lost=True,
            probability_per_yr=min(1.0, 365.25 / period),
            notes=["3 sigma of the extrapolated date reach half a period: the phase is lost"],
        )  # fmt: skip

    # ---------------------------------------------------------------- normal cases, no draws needed

    def _exactly_normal(self, event: EventName, rows: IntArray) -> NDArray[np.bool_]:
        """Rows whose date is a sum of normal errors: the marked event itself, and the rule 'lag'."""
        columns, sampler = self.sampler.columns, self.sampler
        normal: NDArray[np.bool_] = ~sampler.period_is_range[rows]
        for name in ("epoch", "period_d"):
            normal &= columns[name][rows, 1] == columns[name][rows, 2]
        # Far from zero, so that nothing of the period is cut off.
        normal &= columns["period_d"][rows, 0] > 6.0 * columns["period_d"][rows, 2]
        direct = sampler.mark[rows] == MARK_CODES.get(event, -1)
        if event in SCATTERS:
            lag = (sampler.rule[rows] == RULE_CODES["lag"]) & (sampler.mark[rows] == MARK_CODES["periastron"])
            direct |= lag & (columns[event][rows, 1] == columns[event][rows, 2])
            direct &= sampler.rule[rows] != RULE_CODES["learned"]
        both: NDArray[np.bool_] = normal & direct
        return both

    def _normal_summary(self, event: EventName, rows: IntArray, cycles: IntArray, window: Window) -> Summary:
        from scipy.special import ndtr

        sampler = self.sampler
        step = cycles - sampler.epoch_cycle[rows]
        mean = sampler.columns["epoch"][rows, 0] + step * sampler.columns["period_d"][rows, 0]
        variance = periastron_sigma_d(sampler, rows, cycles) ** 2
        if event in SCATTERS:
            lagged = sampler.mark[rows] != MARK_CODES.get(event, -1)
            offset = sampler.columns[event][rows]
            mean = mean + np.where(lagged, offset[:, 0], 0.0)
            variance = variance + np.where(lagged, offset[:, 2] ** 2 + sampler.scatter[event][rows] ** 2, 0.0)
        sigma = np.sqrt(variance)
        with np.errstate(divide="ignore", invalid="ignore"):
            inside = ndtr((window.end - mean) / sigma) - ndtr((window.start - mean) / sigma)
        certain = ((mean >= window.start) & (mean <= window.end)).astype(float)
        return Summary(
            quantiles=normal_quantiles(mean, sigma),
            sigma_d=sigma,
            probability=np.ones(rows.size),
            in_window=np.where(sigma > 0.0, inside, certain),
            grid=normal_quantiles(mean, sigma, GRID) if event in SCATTERS else None,
        )


def _disagreement(medians: FloatArray, sigmas_d: FloatArray) -> float | None:
    """Largest difference between solutions, in sigma of the difference, signed; None for a single one."""
    tensions = [
        float((medians[later] - medians[earlier]) / math.hypot(sigmas_d[earlier], sigmas_d[later]))
        for earlier, later in combinations(range(medians.size), 2)
        if math.hypot(sigmas_d[earlier], sigmas_d[later]) > 0.0
    ]
    return max((t for t in tensions if not math.isnan(t)), key=abs, default=None)
