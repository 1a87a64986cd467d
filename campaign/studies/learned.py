"""Rule 'learned': dates of the coming episode from the confirmed ones, with or without an orbit."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from campaign.model.forecasts import EventName
from campaign.model.measured import Measured
from campaign.model.systems import Episode
from campaign.physics.recurrence import (
    RecurrenceFit,
    RecurrencePrediction,
    fit_recurrence,
    predict_recurrence,
)
from campaign.studies.fitted import independent_of, is_fitted
from campaign.studies.rows import SCATTERS, ForecastRow

FloatArray = NDArray[np.float64]
# A dated event without a stated error is given this share of the period; said in the notes.
ASSUMED_DATING_PERIODS = 0.005


@dataclass(slots=True)
class LearnedDates:
    """Dated events of one system by cycle, and what they predict."""

    cycles: dict[EventName, FloatArray]
    dates_d: dict[EventName, FloatArray]
    sigmas_d: dict[EventName, FloatArray]
    period_d: float | None
    period_sigma_d: float | None
    rough_period_d: float
    notes: list[str] = field(default_factory=list)
    _fits: dict[EventName, RecurrenceFit] = field(default_factory=dict, repr=False)
    _known: dict[tuple[EventName, int], RecurrencePrediction] = field(default_factory=dict, repr=False)
    _events: tuple[EventName, ...] | None = field(default=None, repr=False)

    def events(self) -> tuple[EventName, ...]:
        """Events that these dates can predict."""
        if self._events is None:
            needed = 1 if self.period_sigma_d is not None else 2
            self._events = tuple(e for e in SCATTERS if np.unique(self.cycles[e]).size >= needed)
        return self._events

    def predict(self, event: EventName, cycle: int) -> RecurrencePrediction:
        """The date of a cycle; the line is fitted once and each cycle worked out once."""
        known = self._known.get((event, cycle))
        if known is None:
            fit = self._fits.get(event)
            if fit is None:
                fit = self._fits[event] = fit_recurrence(
                    self.cycles[event], self.dates_d[event], self.sigmas_d[event], self.period_d,
                    self.period_sigma_d,
                )  # fmt: skip
            known = self._known[event, cycle] = fit.at(cycle)
        return known

    def predict_lag(self, event: EventName) -> RecurrencePrediction | None:
        """Days from onset to a later event, from the episodes that have both; None where none has."""
        both, first, second = np.intersect1d(self.cycles["onset"], self.cycles[event], return_indices=True)
        if not both.size:
            return None
        lags = self.dates_d[event][second] - self.dates_d["onset"][first]
        errors = np.hypot(self.sigmas_d[event][second], self.sigmas_d["onset"][first])
        # A lag recurs without any period: the line through the lags is level, its period known exactly.
        period_d = self.rough_period_d
        numbers = np.arange(both.size, dtype=float) - both.size
        return predict_recurrence(numbers, lags + period_d * numbers, errors, 0.0, period_d, 0.0)

    def draws(self, event: EventName, cycle: int, normals: dict[str, FloatArray]) -> FloatArray:
        if event not in self.events():
            return np.full(normals[f"scatter {event}"].shape, np.nan)
        from scipy.special import ndtr

        return self.predict(event, cycle).quantiles_d(ndtr(normals[f"scatter {event}"]))


def learn(row: ForecastRow, episodes: tuple[Episode, ...]) -> LearnedDates | None:
    """Collect the confirmed dates of a system for the rule 'learned' or for a system without an orbit.

    Parameters
    ----------
    row : ForecastRow
        The row of the system; its period (d), when known with an error, is the prior.
    episodes : tuple of Episode
        Confirmed episodes with their cycles assigned; instants in ``bmjd_tdb``.

    Returns
    -------
    LearnedDates or None
        None when nothing can be predicted.

    Notes
    -----
    Accuracy: asymmetric dating errors enter by their standard deviation.

    Source: DEVELOPERS.md (rule ``learned``); see ``campaign.physics.recurrence``.
    """
    cycles: dict[EventName, list[float]] = {e: [] for e in SCATTERS}
    dates: dict[EventName, list[float]] = {e: [] for e in SCATTERS}
    sigmas: dict[EventName, list[float | None]] = {e: [] for e in SCATTERS}
    for episode in episodes:
        if episode.cycle is None:
            continue
        for event in SCATTERS:
            dated = getattr(episode, event)
            if dated is None:
                continue
            moment = dated.moment
            cycles[event].append(episode.cycle)
            dates[event].append(moment.bmjd_tdb)
            known = moment.minus_d is not None and moment.plus_d is not None
            sigmas[event].append(np.hypot(moment.minus_d, moment.plus_d) / np.sqrt(2.0) if known else None)
    period, minus, plus = _prior_period(row)
    period_sigma = None if minus is None or plus is None else float(np.hypot(minus, plus) / np.sqrt(2.0))
    if period_sigma is None:
        period = None
    notes: list[str] = []
    rough = period if period is not None else _rough_period(cycles["onset"], dates["onset"])
    if rough is None and "period_d" in row.values:
        rough = row.values["period_d"][0]
    if rough is None:
        return None
    if any(s is None for e in SCATTERS for s in sigmas[e]):
        share = 100.0 * ASSUMED_DATING_PERIODS
        notes.append(f"a dated event without an error is given {share:g} % of the period")
    assumed = ASSUMED_DATING_PERIODS * rough
    learned = LearnedDates(
        cycles={e: np.array(cycles[e], dtype=float) for e in SCATTERS},
        dates_d={e: np.array(dates[e], dtype=float) for e in SCATTERS},
        sigmas_d={
            e: np.array([assumed if s is None else s for s in sigmas[e]], dtype=float) for e in SCATTERS
        },
        period_d=period,
        period_sigma_d=period_sigma,
        rough_period_d=rough,
        notes=notes,
    )
    return learned if learned.events() else None


def _prior_period(row: ForecastRow) -> tuple[float | None, float | None, float | None]:
    """The orbit's own period: one that was fitted from these episodes would count them twice."""
    if row.solution is None or not is_fitted(row.solution):
        return row.values.get("period_d", (None, None, None))
    orbit = independent_of(row.solution, row.record.solutions)
    if orbit is None or not isinstance(orbit.period_d, Measured):
        return None, None, None
    return orbit.period_d.value, orbit.period_d.minus, orbit.period_d.plus


def _rough_period(cycles: list[float], dates: list[float]) -> float | None:
    if len(set(cycles)) < 2:
        return None
    return float(np.polynomial.polynomial.polyfit(cycles, dates, 1)[1])
