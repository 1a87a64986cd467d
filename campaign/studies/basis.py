"""From dated events to what is shown: forecasts with status and notes, dust windows, what each rests on."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np

from campaign.model.forecasts import (
    MIXTURE,
    Conditioning,
    DustWindow,
    EventForecast,
    Quantiles,
    Status,
    SystemBasis,
    UtcQuantiles,
)
from campaign.model.measured import Limit, Measured, Range
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution
from campaign.physics.timescales import utc_iso
from campaign.studies.forecast import DatedEvent, ForecastUnit
from campaign.studies.learned import LearnedDates
from campaign.studies.reach import reach_note
from campaign.studies.rows import SCATTERS, ForecastRow
from campaign.studies.status import OnsetState, later_status, plain_status, visible_span_d
from campaign.studies.summaries import share_before

_TIMELINE_POINTS = 240


def event_forecasts(
    rows: Sequence[ForecastRow],
    units: Sequence[ForecastUnit],
    dated: Sequence[DatedEvent],
    states: Mapping[tuple[int, int | None], OnsetState],
    as_of: float,
) -> list[EventForecast]:
    """Result objects of the events to be shown.

    Parameters
    ----------
    rows, units : sequences
        What was forecast.
    dated : sequence of DatedEvent
        Events to show, ``bmjd_tdb``.
    states : mapping
        Onset states by (unit, cycle).
    as_of : float
        ``bmjd_tdb``.

    Returns
    -------
    list of EventForecast
        In the order given; UTC to the second.

    Notes
    -----
    Accuracy: that of the dates.

    Source: DEVELOPERS.md (output contract).
    """
    quantiles = np.array([d.quantiles if d.quantiles is not None else np.full(5, np.nan) for d in dated])
    iso = utc_iso(quantiles.ravel()) if quantiles.size else []
    told = _told(dated)
    result = []
    for i, one in enumerate(dated):
        unit = units[one.unit]
        row = rows[unit.rows[0]]
        state = states.get((one.unit, one.cycle))
        status, extra = _status(one, state, as_of)
        bmjd, utc = _dates(one, iso[5 * i : 5 * i + 5])
        ruled = one.event in SCATTERS or one.event == "resolvable"
        learned = ruled and row.rule is not None and row.rule.kind == "learned"
        result.append(
            EventForecast(
                system=row.record.system.name,
                event=one.event,
                cycle=one.cycle,
                basis="episodes" if learned else "orbit",
                solution=unit.label,
                rule=row.rule.kind if row.rule is not None and ruled else None,
                bmjd_tdb=bmjd,
                utc=utc,
                status=status,
                probability=one.probability,
                probability_in_window=one.in_window,
                phase_lost=one.phase_lost,
                probability_per_yr=one.probability_per_yr,
                observed=one.observed,
                disagreement_sigma=one.disagreement_sigma,
                notes=tuple([*extra, *one.notes, *_error_notes(one), *_mixture_notes(rows, unit, one)]),
                conditioning=told[i],
            )
        )
    return result


def _told(dated: Sequence[DatedEvent]) -> list[Conditioning | None]:
    """What quiet observations did to each event, with its instants in UTC too."""
    instants = []
    for one in dated:
        if one.conditioning is not None:
            q = one.conditioning.before
            instants += [q.median, q.lo68, q.hi68, q.lo95, q.hi95, one.conditioning.last_quiet_bmjd_tdb]
    iso = iter(utc_iso(np.array(instants, dtype=np.float64)) if instants else [])
    return [
        None
        if one.conditioning is None
        else replace(
            one.conditioning,
            before_utc=UtcQuantiles(*(next(iso) for _ in range(5))),
            last_quiet_utc=next(iso),
        )
        for one in dated
    ]


def _dates(one: DatedEvent, iso: Sequence[str | None]) -> tuple[Quantiles | None, UtcQuantiles | None]:
    if one.quantiles is None or np.isnan(one.quantiles[0]):
        return None, None
    median, low68, high68, low95, high95 = (float(q) for q in one.quantiles)
    if one.missing:
        return Quantiles(median), UtcQuantiles(iso[0])
    return (
        Quantiles(median, one.sigma_d, low68, high68, low95, high95),
        UtcQuantiles(iso[0], iso[1], iso[2], iso[3], iso[4]),
    )


def _status(one: DatedEvent, state: OnsetState | None, as_of: float) -> tuple[Status, list[str]]:
    if one.event == "onset" and state is not None:
        notes = [state.note] if state.note else []
        if state.suspected_bmjd_tdb is not None:
            since = utc_iso(np.array([state.suspected_bmjd_tdb]))[0]
            notes = [f"unexplained excess since {(since or '')[:10]}, not confirmed"]
        return state.status, notes
    if one.event in ("maximum", "end") and state is not None:
        return later_status(one, state, as_of), []
    return plain_status(one, as_of), []


def _error_notes(one: DatedEvent) -> list[str]:
    if not one.missing:
        return []
    return [f"error unknown: {', '.join(one.missing)}; no interval"]


def _mixture_notes(rows: Sequence[ForecastRow], unit: ForecastUnit, one: DatedEvent) -> list[str]:
    if len(unit.rows) == 1 or one.observed or one.event == "resolvable":
        return []
    dating = [(i, w) for i, w in zip(unit.rows, unit.weights, strict=True) if one.event in rows[i].events]
    if len(dating) == 1:
        solution = rows[dating[0][0]].solution
        return [f"from '{solution.label}' alone, which has what it needs"] if solution is not None else []
    weights = ", ".join(f"{w:.2g}" for _, w in dating)
    return [f"{MIXTURE} {len(dating)} solutions with weights {weights}"]


def dust_windows(
    rows: Sequence[ForecastRow],
    units: Sequence[ForecastUnit],
    dated: Sequence[DatedEvent],
    start: float,
    end: float,
    most: int,
) -> tuple[DustWindow, ...]:
    """Probability of dust production through the period shown, one curve a unit.

    Parameters
    ----------
    rows, units, dated : sequences
        What was forecast; instants ``bmjd_tdb``.
    start, end : float
        Period shown, ``bmjd_tdb``.
    most : int
        No more than so many units.

    Returns
    -------
    tuple of DustWindow
        Probabilities in [0, 1] at evenly spaced instants.

    Notes
    -----
    Accuracy: 1 %; without an end the span of ``visible_span_d`` stands in for it.

    Source: P(on at t) = P(onset <= t) - P(end <= t).
    """
    by_unit: dict[int, dict[tuple[str, int | None], DatedEvent]] = {}
    for one in dated:
        by_unit.setdefault(one.unit, {})[one.event, one.cycle] = one
    times = np.linspace(start, end, _TIMELINE_POINTS)
    result = []
    names = [rows[unit.rows[0]].record.system.name for unit in units]
    for position, events in list(by_unit.items())[:most]:
        row = rows[units[position].rows[0]]
        alone = names.count(names[position]) == 1
        total = np.zeros(times.size)
        for (event, cycle), onset in events.items():
            if event != "onset" or onset.grid is None or onset.quantiles is None or np.isnan(onset.grid[0]):
                continue
            finish = events.get(("end", cycle))
            span = visible_span_d(onset, finish, row.values.get("period_d", (3652.5, None, None))[0])
            grid = finish.grid if finish is not None and finish.grid is not None else onset.grid + span
            on = share_before(onset.grid, times) - share_before(grid, times)
            total += np.clip(on, 0.0, 1.0) * (onset.probability if onset.probability is not None else 1.0)
        if total.any():
            result.append(
                DustWindow(
                    names[position],
                    None,
                    tuple(float(t) for t in times),
                    tuple(float(p) for p in np.clip(total, 0.0, 1.0)),
                    None if alone else units[position].label,
                )
            )
    return tuple(result)


def describe_basis(
    rows: Sequence[ForecastRow],
    units: Sequence[ForecastUnit],
    learned: Mapping[int, LearnedDates],
    records: Sequence[SystemRecord],
) -> tuple[SystemBasis, ...]:
    """One line a unit: what its dates rest on, or why it has none.

    Parameters
    ----------
    rows, units : sequences
        What was forecast.
    learned : mapping of int to LearnedDates
        Rows dated from episodes.
    records : sequence of SystemRecord
        The systems.

    Returns
    -------
    tuple of SystemBasis
        In the order of the units.

    Notes
    -----
    Accuracy: words only.

    Source: project convention.
    """
    result = []
    for unit in units:
        first = rows[unit.rows[0]]
        parts = []
        for index in unit.rows:
            row = rows[index]
            if row.solution is not None:
                parts.append(describe_solution(row.solution))
        dates = learned.get(unit.rows[0])
        if dates is not None:
            count = max(dates.cycles[event].size for event in dates.events())
            parts.append(f"{count} dated episode{'s' if count > 1 else ''}")
        if not parts:
            confirmed = sum(1 for e in first.record.episodes if e.state == "confirmed")
            parts.append("no adopted solution")
            parts.append("one episode only, so no period" if confirmed == 1 else "no confirmed episode")
        if first.rule is not None and first.events and dates is None:
            parts.append(f"rule {first.rule.kind}")
            parts.extend(dict.fromkeys(note for i in unit.rows if (note := reach_note(rows[i]))))
        parts.extend(_notes_of([rows[i] for i in unit.rows]))
        result.append(SystemBasis(first.record.system.name, "; ".join(parts), bool(first.events)))
    return tuple(result)


def _notes_of(rows: Sequence[ForecastRow]) -> list[str]:
    """Notes of the rows of a unit; one that is not true of all of them names its solution."""
    notes: dict[str, None] = {}
    for row in rows:
        for note in row.notes:
            shared = all(note in other.notes for other in rows)
            label = "" if shared or row.solution is None else f"'{row.solution.label}': "
            notes[label + note] = None
    return list(notes)


def describe_solution(solution: Solution) -> str:
    """A solution in a few words: label, period with its error, epoch.

    Parameters
    ----------
    solution : Solution
        Period in days, epoch in ``bmjd_tdb``.

    Returns
    -------
    str
        One phrase.

    Notes
    -----
    Accuracy: rounded to the error.

    Source: project convention.
    """
    period = solution.period_d
    if isinstance(period, Measured):
        text = f"P {_with_error(period)} d"
    elif isinstance(period, Range):
        text = f"P {period.low / 365.25:.4g} to {period.high / 365.25:.4g} yr"
    elif isinstance(period, Limit):
        text = f"P {'>' if period.side == 'above' else '<'} {period.bound / 365.25:.4g} yr"
    else:
        text = "no period"
    weight = f" (weight {solution.weight:g})" if solution.weight is not None else ""
    return f"{solution.label}{weight}: {text}"


def _with_error(value: Measured) -> str:
    if value.minus is None or value.plus is None:
        return f"{value.value:.8g} (error unknown)"
    below, above = (f"{size:.3g}" if size < 999.5 else f"{size:.0f}" for size in (value.minus, value.plus))
    if value.minus == value.plus:
        return f"{value.value:.8g} ± {above}"
    return f"{value.value:.8g} +{above} -{below}"
