"""A forecast told step by step: elements, cycle count, arithmetic, and each term of the error in days."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from copy import copy

import numpy as np

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import (
    EventForecast,
    EventName,
    ExplainedEvent,
    ExplainedSystem,
    VarianceTerm,
)
from campaign.model.records import SystemRecord
from campaign.model.systems import DustRule
from campaign.studies.elements import cycle_count, elements
from campaign.studies.learned import LearnedDates
from campaign.studies.preparing import Prepared, Question, prepare
from campaign.studies.rows import SCATTERS, SPOKEN, ForecastRow
from campaign.studies.sampling import Sampler
from campaign.studies.upcoming import forecast_campaign

# Terms smaller than this share of the whole are not worth a line.
_SMALL = 0.02
_DRAWS = 20_000


def explain_system(
    record: SystemRecord, photometry: Mapping[int, PhotometryArrays], question: Question
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
    upcoming = forecast_campaign([record], photometry, question)
    prepared = prepare([record], photometry, question)
    events = []
    for forecast in upcoming.events:
        if forecast.bmjd_tdb is None or forecast.cycle is None:
            continue
        events.append(_explain_event(forecast, prepared, question.seed))
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


def _explain_event(forecast: EventForecast, prepared: Prepared, seed: int) -> ExplainedEvent:
    unit = next(u for u in prepared.units if u.label == forecast.solution or u.label is None)
    cycle = forecast.cycle
    assert cycle is not None
    if forecast.observed:
        return ExplainedEvent(forecast, "observed", _total_only(forecast))
    learned = prepared.learned.get(unit.rows[0])
    if learned is not None and forecast.event in SCATTERS:
        return ExplainedEvent(forecast, *_learned_story(learned, forecast.event, cycle))
    dating = [
        (i, w) for i, w in zip(unit.rows, unit.weights, strict=True) if _dates(prepared.rows[i], forecast)
    ]
    stories = [_orbit_story(prepared.rows[i], forecast.event, cycle, seed) for i, _ in dating]
    if len(stories) == 1:
        return ExplainedEvent(forecast, *stories[0])
    rows = [i for i, _ in dating]
    total = sum(w for _, w in dating)
    weights = [w / total for _, w in dating]
    return ExplainedEvent(forecast, *_mixture_story(stories, prepared, rows, weights, forecast, seed))


def _dates(row: ForecastRow, forecast: EventForecast) -> bool:
    return forecast.event in row.events


def _total_only(forecast: EventForecast) -> tuple[VarianceTerm, ...]:
    sigma = forecast.bmjd_tdb.sigma_d if forecast.bmjd_tdb is not None else None
    return (VarianceTerm("dating of the observation", sigma, ""),) if sigma else ()


def _learned_story(
    learned: LearnedDates, event: EventName, cycle: int
) -> tuple[str, tuple[VarianceTerm, ...]]:
    prediction = learned.predict(event, cycle)
    scatter = float(np.sqrt(prediction.weights @ prediction.scatters_d**2))
    line = float(np.sqrt(prediction.weights @ (prediction.sigmas_d**2 - prediction.scatters_d**2)))
    count = learned.cycles[event].size
    prior = (
        "with the stated prior"
        if prediction.prior_used
        else f"{prediction.degrees_of_freedom} degrees of freedom"
    )
    dated = f"{event} date" if count == 1 else f"{event} dates"
    text = f"line through {count} {dated}, carried to cycle {cycle}"
    return text, (
        VarianceTerm("line: constant and period", line, "grows with the distance from the dated cycles"),
        VarianceTerm("cycle-to-cycle scatter", scatter, f"marginalised, {prior}"),
    )


def _orbit_story(
    row: ForecastRow, event: EventName, cycle: int, seed: int
) -> tuple[str, tuple[VarianceTerm, ...]]:
    step = cycle - row.epoch_cycle
    epoch, period = row.values["epoch"][0], row.values["period_d"][0]
    base = epoch + step * period
    sign = "+" if step >= 0 else "-"
    text = (
        f"T({cycle}) = T0 {sign} {abs(step)} P = {epoch:.3f} {sign} {abs(step)} x {period:.4f} = {base:.3f}"
    )
    nominal = _median(row, event, cycle, seed)
    if event != row.mark:
        text += f"; {event} = T({cycle}) {nominal - base:+.2f} d{_reason(row, event)} = {nominal:.3f}"
    return text, _terms(row, event, cycle, seed)


def _reason(row: ForecastRow, event: EventName) -> str:
    rule = row.rule
    if event not in SCATTERS or rule is None:
        return " (from e and omega)" if event != "periastron" else ""
    if rule.kind == "separation":
        return " (window from the critical separation, plus the delay to condensation)"
    return f" (rule {rule.kind})"


def _median(row: ForecastRow, event: EventName, cycle: int, seed: int) -> float:
    bare = _with_errors(row, set())
    times = Sampler([bare], 3, seed).event_times(event, np.array([0]), np.array([cycle]))
    return float(np.median(times))


def _with_errors(row: ForecastRow, kept: set[str]) -> ForecastRow:
    """The row with only the named errors left, and no scatter unless it is named."""
    one = copy(row)
    one.values = {
        name: (v, m if name in kept else 0.0, p if name in kept else 0.0)
        for name, (v, m, p) in row.values.items()
    }
    if row.rule is not None:
        one.rule = DustRule(
            id=0,
            system_id=row.rule.system_id,
            kind=row.rule.kind,
            scatter_onset_d=row.rule.scatter_onset_d if "scatter" in kept else 0.0,
            scatter_maximum_d=row.rule.scatter_maximum_d if "scatter" in kept else 0.0,
            scatter_end_d=row.rule.scatter_end_d if "scatter" in kept else 0.0,
        )
    return one


def _spread(row: ForecastRow, event: EventName, cycle: int, seed: int, kept: set[str]) -> float:
    times = Sampler([_with_errors(row, kept)], _DRAWS, seed).event_times(
        event, np.array([0]), np.array([cycle])
    )
    return float(np.nanstd(times)) if not np.all(np.isnan(times)) else 0.0


def _terms(row: ForecastRow, event: EventName, cycle: int, seed: int) -> tuple[VarianceTerm, ...]:
    needed = row.events[event]
    step = cycle - row.epoch_cycle
    terms: list[VarianceTerm] = []
    covariance = row.solution.covariance if row.solution is not None else None
    for name in needed:
        _, minus, plus = row.values[name]
        if minus is None or plus is None:
            terms.append(VarianceTerm(SPOKEN[name], float("nan"), "error unknown"))
            continue
        alone = row if covariance is None else _without_covariance(row)
        size = _spread(alone, event, cycle, seed, {name})
        note = f"times {abs(step)}" if name == "period_d" else ""
        if size > 0.0:
            terms.append(VarianceTerm(SPOKEN[name], size, note))
    scatter = (
        getattr(row.rule, f"scatter_{event}_d", None) if row.rule is not None and event in SCATTERS else None
    )
    if scatter:
        terms.append(VarianceTerm("cycle-to-cycle scatter", float(scatter), ""))
    if covariance is not None:
        both = covariance.between("epoch", "period_d")
        if both:
            size = float(np.sqrt(abs(2.0 * step * both)))
            terms.append(
                VarianceTerm("covariance of epoch and period", float(np.copysign(size, step * both)), "")
            )
    return _with_remainder(row, event, cycle, seed, terms)


def _without_covariance(row: ForecastRow) -> ForecastRow:
    one = copy(row)
    assert row.solution is not None
    from dataclasses import replace

    one.solution = replace(row.solution, covariance=None)
    return one


def _with_remainder(
    row: ForecastRow, event: EventName, cycle: int, seed: int, terms: list[VarianceTerm]
) -> tuple[VarianceTerm, ...]:
    if any(np.isnan(term.size_d) for term in terms):
        return tuple(terms)
    total = Sampler([row], _DRAWS, seed).event_times(event, np.array([0]), np.array([cycle]))
    variance = float(np.nanvar(total))
    kept = _SMALL * 0.1 * np.sqrt(variance)
    terms = [term for term in terms if abs(term.size_d) > kept]
    explained = sum(np.copysign(term.size_d**2, term.size_d) for term in terms)
    rest = variance - explained
    if abs(rest) > _SMALL * max(variance, 1e-12):
        size = float(np.copysign(np.sqrt(abs(rest)), rest))
        terms.append(VarianceTerm("together rather than one by one", size, "non-linear or correlated"))
    return tuple(terms)


def _mixture_story(
    stories: Sequence[tuple[str, tuple[VarianceTerm, ...]]],
    prepared: Prepared,
    rows: Sequence[int],
    weights: Sequence[float],
    forecast: EventForecast,
    seed: int,
) -> tuple[str, tuple[VarianceTerm, ...]]:
    assert forecast.cycle is not None
    share = np.array(weights)
    centres = np.array([_median(prepared.rows[i], forecast.event, forecast.cycle, seed) for i in rows])
    mean = float(share @ centres)
    within = np.array([np.sqrt(sum(t.size_d**2 for t in terms)) for _, terms in stories])
    terms = [
        VarianceTerm(
            "between the solutions", float(np.sqrt(share @ (centres - mean) ** 2)), "their disagreement"
        ),
        VarianceTerm("within the solutions", float(np.sqrt(share @ within**2)), "their own errors"),
    ]
    text = " | ".join(
        f"{_label(prepared.rows[i])} ({w:.2g}): {story}"
        for i, w, (story, _) in zip(rows, weights, stories, strict=True)
    )
    return text, tuple(terms)


def _label(row: ForecastRow) -> str:
    return row.solution.label if row.solution is not None else "episodes"
