"""A forecast told step by step: elements, cycle count, arithmetic, and each term of the error in days."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import (
    EventForecast,
    EventName,
    ExplainedEvent,
    ExplainedSystem,
    MovedBy,
    VarianceTerm,
)
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.physics.recurrence import RecurrencePrediction
from campaign.studies.elements import cycle_count, elements
from campaign.studies.following import days_since_onset, needed_since_onset
from campaign.studies.forecast import COUNTED_FROM_ONSET
from campaign.studies.learned import LearnedDates
from campaign.studies.moved import moved_by
from campaign.studies.preparing import Prepared, Question, prepare
from campaign.studies.resolvable import explain_resolvable
from campaign.studies.rows import SCATTERS, ForecastRow
from campaign.studies.sampling import Sampler
from campaign.studies.upcoming import date_campaign, forecast_campaign
from campaign.studies.variance import nominal, terms_of, with_remainder

FloatArray = NDArray[np.float64]


def explain_system(
    record: SystemRecord,
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
    shells: Mapping[int, Sequence[Observation]] | None = None,
) -> ExplainedSystem:
    """Forecast one system and say how each date and its error came about.

    Parameters
    ----------
    record : SystemRecord
        The system.
    photometry : mapping of int to PhotometryArrays
        Its light curve by system id; may be empty.
    question : Question
        Window (``bmjd_tdb``), draws and seed.
    shells : mapping of int to sequence of Observation, optional
        Its logged shells by system id.

    Returns
    -------
    ExplainedSystem
        Sizes of the terms in days; their squares sum to the variance but for what is named as a
        remainder.

    Raises
    ------
    InputRefused
        If a rule or an element cannot be used.

    Notes
    -----
    Accuracy: terms of drawn events vary one quantity at a time, 20,000 stratified draws each.

    Source: propagation of errors, first order, with the remainder stated.
    """
    upcoming = forecast_campaign([record], photometry, question, shells)
    prepared = prepare([record], photometry, question)
    moves: dict[tuple[str | None, int], tuple[MovedBy, ...]] = {}
    if any(forecast.conditioning is not None for forecast in upcoming.events):
        moves = moved_by(date_campaign([record], photometry, question, shells), photometry, question)
    events = []
    for forecast in upcoming.events:
        if forecast.bmjd_tdb is None or forecast.cycle is None:
            continue
        if forecast.event == "resolvable":
            events.append(explain_resolvable(forecast, prepared, question, shells or {}))
        else:
            explained = _explain_event(forecast, prepared, question.seed)
            if forecast.event == "onset":
                nights = moves.get((forecast.solution, forecast.cycle), ())
                explained = replace(explained, moved_by=nights)
            events.append(explained)
    rows = [prepared.rows[i] for unit in prepared.units for i in unit.rows]
    return ExplainedSystem(
        system=record.system.name,
        elements=elements(rows, record.rule),
        cycle_count=cycle_count(prepared, upcoming.events),
        events=tuple(events),
        upcoming=upcoming,
        notes=tuple(dict.fromkeys(note for row in rows for note in (*row.notes, *row.assumptions))),
    )


# ------------------------------------------------------------------------------------------- events


@dataclass(frozen=True, slots=True)
class _Story:
    """How one solution comes to its date: in words, term by term, and the date without any error."""

    text: str
    terms: tuple[VarianceTerm, ...]
    centre: float


def _explain_event(forecast: EventForecast, prepared: Prepared, seed: int) -> ExplainedEvent:
    unit = next(u for u in prepared.units if u.label == forecast.solution or u.label is None)
    event, cycle = forecast.event, forecast.cycle
    assert cycle is not None
    if forecast.observed:
        return ExplainedEvent(forecast, "observed", _total_only(forecast))
    dating = [
        (i, w) for i, w in zip(unit.rows, unit.weights, strict=True) if event in prepared.rows[i].events
    ]
    episode = unit.confirmed(cycle) if COUNTED_FROM_ONSET in forecast.notes else None
    stories = []
    for i, _ in dating:
        row, learned = prepared.rows[i], prepared.learned.get(i)
        if episode is not None and episode.onset is not None:
            stories.append(_following_story(row, learned, event, cycle, episode.onset.moment, seed))
        elif learned is not None and event in SCATTERS:
            stories.append(_learned_story(learned, event, cycle))
        else:
            stories.append(_orbit_story(row, event, cycle, seed))
    if len(stories) == 1:
        return ExplainedEvent(forecast, stories[0].text, stories[0].terms)
    total = sum(w for _, w in dating)
    labels = [_label(prepared.rows[i]) for i, _ in dating]
    return ExplainedEvent(forecast, *_mixture_story(stories, labels, [w / total for _, w in dating]))


def _total_only(forecast: EventForecast) -> tuple[VarianceTerm, ...]:
    sigma = forecast.bmjd_tdb.sigma_d if forecast.bmjd_tdb is not None else None
    return (VarianceTerm("dating of the observation", sigma, ""),) if sigma else ()


def _learned_story(learned: LearnedDates, event: EventName, cycle: int) -> _Story:
    prediction = learned.predict(event, cycle)
    count = learned.cycles[event].size
    dated = f"{event} date" if count == 1 else f"{event} dates"
    text = f"line through {count} {dated}, carried to cycle {cycle}"
    centre = float(prediction.weights @ prediction.means_d)
    line = _learned_terms(
        prediction, "line: constant and period", "grows with the distance from the dated cycles"
    )
    return _Story(text, line, centre)


def _learned_terms(prediction: RecurrencePrediction, cause: str, note: str) -> tuple[VarianceTerm, ...]:
    scatter = float(np.sqrt(prediction.weights @ prediction.scatters_d**2))
    line = float(np.sqrt(prediction.weights @ (prediction.sigmas_d**2 - prediction.scatters_d**2)))
    prior = (
        "with the stated prior"
        if prediction.prior_used
        else f"{prediction.degrees_of_freedom} degrees of freedom"
    )
    terms = (
        VarianceTerm(cause, line, note),
        VarianceTerm("cycle-to-cycle scatter", scatter, f"marginalised, {prior}"),
    )
    return with_remainder(terms, prediction.sigma_d**2)


def _orbit_story(row: ForecastRow, event: EventName, cycle: int, seed: int) -> _Story:
    def draw(sampler: Sampler) -> FloatArray:
        return sampler.event_times(event, np.array([0]), np.array([cycle]))

    step = cycle - row.epoch_cycle
    epoch, period = row.values["epoch"][0], row.values["period_d"][0]
    base = epoch + step * period
    sign = "+" if step >= 0 else "-"
    text = (
        f"T({cycle}) = T0 {sign} {abs(step)} P = {epoch:.3f} {sign} {abs(step)} x {period:.4f} = {base:.3f}"
    )
    centre = nominal(row, draw, seed)
    if event != row.mark:
        text += f"; {event} = T({cycle}) {centre - base:+.2f} d{_reason(row, event)} = {centre:.3f}"
    scatter = getattr(row.rule, f"scatter_{event}_d", None) if event in SCATTERS else None
    terms = terms_of(
        row, draw, row.events[event], seed, scatter_d=scatter or 0.0,
        notes={"period_d": f"times {abs(step)}"}, extra=_covariance_terms(row, step),
    )  # fmt: skip
    return _Story(text, terms, centre)


def _covariance_terms(row: ForecastRow, step: int) -> tuple[VarianceTerm, ...]:
    covariance = row.solution.covariance if row.solution is not None else None
    both = covariance.between("epoch", "period_d") if covariance is not None else None
    if not both or not step:
        return ()
    size = float(np.copysign(np.sqrt(abs(2.0 * step * both)), step * both))
    return (VarianceTerm("covariance of epoch and period", size, ""),)


def _reason(row: ForecastRow, event: EventName) -> str:
    rule = row.rule
    if event not in SCATTERS or rule is None:
        return " (from e and omega)"
    if rule.kind == "separation":
        return " (window from the critical separation, plus the delay to condensation)"
    return f" (rule {rule.kind})"


def _following_story(
    row: ForecastRow, learned: LearnedDates | None, event: EventName, cycle: int, onset: Moment, seed: int
) -> _Story:
    """An event counted from the onset that was observed in its cycle."""
    dated = Measured(onset.bmjd_tdb, onset.minus_d, onset.plus_d).sigma
    dating = (
        VarianceTerm("dating of the observed onset", float("nan"), "error unknown")
        if dated is None
        else VarianceTerm("dating of the observed onset", dated, "")
    )
    if learned is not None:
        days, terms = _learned_lag(learned, event, cycle)
        return _Story(_counted(event, onset, days, ""), (dating, *terms), onset.bmjd_tdb + days)

    def draw(sampler: Sampler) -> FloatArray:
        return days_since_onset(sampler, None, 0, event, cycle)

    days = nominal(row, draw, seed)
    scatter = math.hypot(*(getattr(row.rule, f"scatter_{e}_d", None) or 0.0 for e in ("onset", event)))
    terms = terms_of(row, draw, needed_since_onset(row, event), seed, scatter_d=scatter)
    return _Story(_counted(event, onset, days, _reason(row, event)), (dating, *terms), onset.bmjd_tdb + days)


def _learned_lag(
    learned: LearnedDates, event: EventName, cycle: int
) -> tuple[float, tuple[VarianceTerm, ...]]:
    lag = learned.predict_lag(event)
    if lag is not None:
        cause = "mean time from the onset"
        return float(lag.weights @ lag.means_d), _learned_terms(lag, cause, "from the dated episodes")
    onset, later = (learned.predict(e, cycle) for e in ("onset", event))
    days = float(later.weights @ later.means_d - onset.weights @ onset.means_d)
    spread = math.hypot(onset.sigma_d, later.sigma_d)
    return days, (VarianceTerm("time from the onset", spread, "no episode has both dates"),)


def _counted(event: EventName, onset: Moment, days: float, reason: str) -> str:
    return (
        f"onset observed at {onset.bmjd_tdb:.3f}; {event} = onset {days:+.2f} d{reason} "
        f"= {onset.bmjd_tdb + days:.3f}"
    )


def _mixture_story(
    stories: Sequence[_Story], labels: Sequence[str], weights: Sequence[float]
) -> tuple[str, tuple[VarianceTerm, ...]]:
    share = np.array(weights)
    centres = np.array([story.centre for story in stories])
    mean = float(share @ centres)
    within = np.array(
        [sum(float(np.copysign(t.size_d**2, t.size_d)) for t in story.terms) for story in stories]
    )
    terms = (
        VarianceTerm(
            "between the solutions", float(np.sqrt(share @ (centres - mean) ** 2)), "their disagreement"
        ),
        VarianceTerm("within the solutions", float(np.sqrt(share @ within)), "their own errors"),
    )
    text = "\n".join(
        f"{label} ({w:.2g}): {story.text}" for label, w, story in zip(labels, weights, stories, strict=True)
    )
    return text, terms


def _label(row: ForecastRow) -> str:
    return row.solution.label if row.solution is not None else "episodes"
