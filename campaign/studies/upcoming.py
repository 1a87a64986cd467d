"""The main job: which events are coming, when, how sure that is, and what it rests on."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import EVENT_NAMES, EventForecast, EventName, UpcomingResult
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent as DatedEpisodeEvent
from campaign.model.systems import DustRule, Episode, Solution
from campaign.physics.timescales import utc_iso
from campaign.studies.basis import describe_basis, dust_windows, event_forecasts
from campaign.studies.cycles import nominal_period_d, with_cycles
from campaign.studies.forecast import DatedEvent, Forecaster, ForecastUnit, Window
from campaign.studies.judging import judge
from campaign.studies.learned import LearnedDates, learn
from campaign.studies.quietness import JudgedPhotometry
from campaign.studies.rows import ForecastRow, build_row
from campaign.studies.sampling import DEFAULT_DRAWS, DEFAULT_SEED
from campaign.studies.status import OnsetState, onset_state

# More than this and nobody reads a timeline.
TIMELINE_SYSTEMS = 200


@dataclass(frozen=True, slots=True)
class Question:
    """What is asked of the forecaster; instants are ``bmjd_tdb``.

    ``solutions`` is 'adopted' for one forecast a system (a mixture where solutions carry weights) or
    'each' for every solution side by side.
    """

    as_of: float
    start: float
    end: float
    events: tuple[EventName, ...] = EVENT_NAMES
    min_probability: float = 0.0
    draws: int = DEFAULT_DRAWS
    seed: int = DEFAULT_SEED
    solutions: str = "adopted"

    @property
    def window(self) -> Window:
        return Window(self.start, self.end, self.as_of)


@dataclass(slots=True)
class Prepared:
    """Rows and units of a campaign, ready to be forecast."""

    rows: list[ForecastRow]
    units: list[ForecastUnit]
    learned: dict[int, LearnedDates]
    judged: dict[int, JudgedPhotometry]


def forecast_campaign(
    records: Sequence[SystemRecord],
    photometry: Mapping[int, PhotometryArrays],
    question: Question,
) -> UpcomingResult:
    """Forecast every event of every active system.

    Parameters
    ----------
    records : sequence of SystemRecord
        Systems with solutions, rule and episodes; retired ones are left out by the caller.
    photometry : mapping of int to PhotometryArrays
        Light curves by system id, for the status; may be empty.
    question : Question
        Window, instant of the question, events, draws and seed.

    Returns
    -------
    UpcomingResult
        Events sorted by date, those without a date last; instants ``bmjd_tdb`` and UTC.

    Raises
    ------
    InputRefused
        If a rule or an element cannot be used.

    Notes
    -----
    Accuracy: normal dates are exact; drawn ones carry the error of the draws, about 0.02 sigma in the
    bounds of a 95 % interval at 20,000 draws.

    Source: design, section 4 (Forecast, Status, Phase lost).
    """
    prepared = prepare(records, photometry, question)
    forecaster = Forecaster(prepared.rows, prepared.units, prepared.learned, question.draws, question.seed)
    # The status of an onset needs the end, whatever is listed.
    wanted = tuple(e for e in EVENT_NAMES if e in question.events or e in ("onset", "end"))
    dated = forecaster.run(question.window, wanted)
    states = onset_states(prepared, forecaster, dated, question)
    listed = [d for d in dated if d.event in question.events and _is_listed(d, states, question)]
    listed = [d for d in listed if d.in_window is None or d.in_window >= question.min_probability]
    dateless = dateless_events(prepared, question)
    events = event_forecasts(prepared.rows, prepared.units, listed + dateless, states, question.as_of)
    if question.solutions == "each":
        events = with_disagreement(events)
    shown = {d.unit for d in listed}
    windows = dust_windows(
        prepared.rows, prepared.units, [d for d in dated if d.unit in shown], question.start, question.end,
        TIMELINE_SYSTEMS,
    )  # fmt: skip
    instants = utc_iso(np.array([question.as_of, question.start, question.end]))
    return UpcomingResult(
        as_of_bmjd_tdb=question.as_of,
        as_of_utc=instants[0] or "",
        from_bmjd_tdb=question.start,
        until_bmjd_tdb=question.end,
        from_utc=instants[1] or "",
        until_utc=instants[2] or "",
        events=tuple(sorted(events, key=_date_key)),
        dust_windows=windows,
        bases=describe_basis(prepared.rows, prepared.units, prepared.learned, records),
        draws=question.draws,
        seed=question.seed,
        assumptions=_assumptions(prepared),
    )


def prepare(
    records: Sequence[SystemRecord], photometry: Mapping[int, PhotometryArrays], question: Question
) -> Prepared:
    """Turn records into rows and units: which solution speaks for a system, and with what weight.

    Parameters
    ----------
    records : sequence of SystemRecord
        Active systems.
    photometry : mapping of int to PhotometryArrays
        Light curves by system id.
    question : Question
        Only ``as_of`` (``bmjd_tdb``) and ``solutions`` are used.

    Returns
    -------
    Prepared
        Rows, units, learned dates and judged light curves.

    Notes
    -----
    Accuracy: no numbers are changed.

    Source: design, section 2 (solution, rule) and 4 (Forecast).
    """
    prepared = Prepared([], [], {}, {})
    for whole in records:
        record = hide_later_episodes(whole, question.as_of)
        arrays = photometry.get(record.system.id)
        for solutions, weights in _speakers(record, question.solutions):
            rows = tuple(_add_row(prepared, record, solution) for solution in solutions)
            first = prepared.rows[rows[0]]
            unit = ForecastUnit(
                rows=rows,
                weights=weights,
                label=" + ".join(s.label for s in solutions if s is not None) or None,
                episodes=_episodes_with_cycles(first),
                watched=arrays is not None and arrays.bmjd_tdb.size > 0,
            )
            prepared.units.append(unit)
        if arrays is not None and arrays.bmjd_tdb.size:
            prepared.judged[record.system.id] = judge(record, arrays, question.as_of)
    return prepared


def hide_later_episodes(record: SystemRecord, as_of: float) -> SystemRecord:
    """The record without what had not happened at ``as_of`` (``bmjd_tdb``).

    Parameters
    ----------
    record : SystemRecord
        A system.
    as_of : float
        ``bmjd_tdb``.

    Returns
    -------
    SystemRecord
        Later episodes, maxima and ends removed.

    Notes
    -----
    Accuracy: by the dated instants themselves.

    Source: design, section 4 (As of).
    """
    kept = []
    for episode in record.episodes:
        cut = replace(
            episode,
            onset=_if_past(episode.onset, as_of),
            maximum=_if_past(episode.maximum, as_of),
            end=_if_past(episode.end, as_of),
        )
        if cut.onset or cut.maximum or cut.end:
            kept.append(cut)
    return replace(record, episodes=tuple(kept)) if kept or record.episodes else record


def _if_past(dated: DatedEpisodeEvent | None, as_of: float) -> DatedEpisodeEvent | None:
    return dated if dated is not None and dated.moment.bmjd_tdb <= as_of else None


def _speakers(record: SystemRecord, mode: str) -> list[tuple[tuple[Solution | None, ...], tuple[float, ...]]]:
    """Groups of solutions that are forecast together, with their weights."""
    adopted = [s for s in record.solutions if s.adopted]
    weighted = [s for s in adopted if s.weight is not None]
    groups: list[tuple[tuple[Solution | None, ...], tuple[float, ...]]] = []
    if len(weighted) > 1:
        total = sum(s.weight or 0.0 for s in weighted)
        groups.append((tuple(weighted), tuple((s.weight or 0.0) / total for s in weighted)))
    if mode == "each" and record.solutions:
        singles = sorted(record.solutions, key=lambda s: not s.adopted)
        return groups + [((s,), (1.0,)) for s in singles]
    return groups or [((adopted[0] if adopted else None,), (1.0,))]


def _add_row(prepared: Prepared, record: SystemRecord, solution: Solution | None) -> int:
    row = build_row(record, solution)
    position = len(prepared.rows)
    has_dates = "epoch" in row.values and "period_d" in row.values
    rule_learns = row.rule is not None and row.rule.kind == "learned"
    if (rule_learns or not has_dates) and record.episodes:
        learned = learn(row, _episodes_with_cycles(row))
        if learned is not None:
            prepared.learned[position] = learned
            for event in learned.events():
                row.events[event] = ()
            row.notes.extend(learned.notes)
            if row.rule is None or row.rule.kind != "learned":
                row.rule = DustRule(id=0, system_id=record.system.id, kind="learned")
                row.notes = [n for n in row.notes if n != "no dust rule: periastron alone"]
            if learned.predict(learned.events()[0], 0).prior_used:
                row.assumptions.append(
                    "few dated episodes: cycle-to-cycle scatter from the stated prior, 1 % of the period "
                    "within a factor of e"
                )
    prepared.rows.append(row)
    return position


def _episodes_with_cycles(row: ForecastRow) -> tuple[Episode, ...]:
    period = nominal_period_d(row.solution) if row.solution is not None else None
    predicted = []
    if row.solution is not None and "epoch" in row.values and period is not None:
        predicted.append((row.epoch_cycle, row.values["epoch"][0] + _onset_shift_d(row, period)))
    return with_cycles(row.record, predicted, period)


def _onset_shift_d(row: ForecastRow, period_d: float) -> float:
    """Nominal onset relative to periastron, only to count cycles with."""
    rule = row.rule
    if rule is None or rule.onset is None:
        return 0.0
    return rule.onset.value * (period_d if rule.kind == "phase" else 1.0)


def onset_states(
    prepared: Prepared, forecaster: Forecaster, dated: Sequence[DatedEvent], question: Question
) -> dict[tuple[int, int | None], OnsetState]:
    """Status of every dated onset, by (unit, cycle).

    Parameters
    ----------
    prepared : Prepared
        Rows and units.
    forecaster : Forecaster
        For the periods, days.
    dated : sequence of DatedEvent
        All dated events, ``bmjd_tdb``.
    question : Question
        ``as_of`` in ``bmjd_tdb``.

    Returns
    -------
    dict
        Onset states.

    Notes
    -----
    Accuracy: see ``campaign.studies.status``.

    Source: design, section 4 (Status).
    """
    ends = {(d.unit, d.cycle): d for d in dated if d.event == "end"}
    states: dict[tuple[int, int | None], OnsetState] = {}
    for onset in dated:
        if onset.event != "onset":
            continue
        unit = prepared.units[onset.unit]
        row = prepared.rows[unit.rows[0]]
        episode = unit.confirmed(onset.cycle) if onset.cycle is not None else None
        states[onset.unit, onset.cycle] = onset_state(
            onset,
            ends.get((onset.unit, onset.cycle)),
            episode,
            prepared.judged.get(row.record.system.id),
            question.as_of,
            forecaster.period_d(unit.rows[0]),
        )
    return states


def _is_listed(
    event: DatedEvent,
    states: Mapping[tuple[int, int | None], OnsetState],
    question: Question,
) -> bool:
    if event.quantiles is None:
        return event.phase_lost
    if np.isnan(event.quantiles[0]):
        return False
    median, _, _, low, high = (float(q) for q in event.quantiles)
    if event.missing:
        low = high = median
    state = states.get((event.unit, event.cycle))
    if low <= question.end and high >= question.start:
        return True
    if event.event == "onset" and state is not None and high < question.start:
        recent = question.as_of - high < 365.25
        if state.status in ("under way", "suspected", "late"):
            return _is_latest(event, states, question)
        return state.status == "unseen" and recent and _is_latest(event, states, question)
    return False


def _is_latest(
    event: DatedEvent, states: Mapping[tuple[int, int | None], OnsetState], question: Question
) -> bool:
    """No later cycle of the same unit has anything but 'expected' to say."""
    assert event.cycle is not None
    later = (s for (u, c), s in states.items() if u == event.unit and c is not None and c > event.cycle)
    return all(s.status in ("expected", "phase lost") for s in later)


def dateless_events(prepared: Prepared, question: Question) -> list[DatedEvent]:
    """Systems whose period is only a limit: no date, but a probability a year.

    Parameters
    ----------
    prepared : Prepared
        Rows and units.
    question : Question
        Window in ``bmjd_tdb``.

    Returns
    -------
    list of DatedEvent
        One for the marked event of each such system.

    Notes
    -----
    Accuracy: rests on a scale-free prior, P(period > p) = limit / p beyond a lower limit; below an upper
    limit the period is taken to be the limit itself.

    Source: Gott 1993, Nature 363, 315 (the scale-free survival law).
    """
    result = []
    for position, unit in enumerate(prepared.units):
        row = prepared.rows[unit.rows[0]]
        solution = row.solution
        if (
            row.period_limit is None
            or solution is None
            or solution.epoch is None
            or unit.rows[0] in prepared.learned
        ):
            continue
        event = _marked_event(solution)
        if event not in question.events:
            continue
        bound, since = row.period_limit.bound, question.as_of - solution.epoch.bmjd_tdb
        notes = [*row.notes]
        if row.period_limit.side == "above":
            survived = max(bound, since)
            until = question.end - solution.epoch.bmjd_tdb
            chance = max(0.0, 1.0 - survived / until) if until > 0 else 0.0
            yearly = 365.25 / (survived + 365.25) if since >= bound - 365.25 else 0.0
            earliest = utc_iso(np.array([solution.epoch.bmjd_tdb + bound]))[0]
            if since < bound and earliest:
                notes.append(f"not before {earliest[:10]}")
            notes.append("scale-free prior on the period")
        else:
            chance = min(1.0, (question.end - question.start) / bound)
            yearly = min(1.0, 365.25 / bound)
            notes.append("at least this often")
        result.append(
            DatedEvent(
                position, event, None, None, None, None, chance, phase_lost=True, probability_per_yr=yearly,
                notes=notes,
            )
        )  # fmt: skip
    return result


def _marked_event(solution: Solution) -> EventName:
    return solution.epoch_marks


def with_disagreement(events: Sequence[EventForecast]) -> list[EventForecast]:
    """Add how many sigma the solutions of one system differ by, event by event and cycle by cycle.

    Parameters
    ----------
    events : sequence of EventForecast
        Events of all units, the adopted solution of a system before the others.

    Returns
    -------
    list of EventForecast
        With ``disagreement_sigma`` (dimensionless) where two dates can be compared.

    Notes
    -----
    Accuracy: for normal dates; (first - second) / root of the summed variances.

    Source: design, section 4 (signed tension).
    """
    reference: dict[tuple[str, EventName, int | None], EventForecast] = {}
    result = []
    for event in events:
        if event.solution is not None and event.disagreement_sigma is not None:
            result.append(event)  # a mixture: it carries the disagreement of its own components
            continue
        key = (event.system, event.event, event.cycle)
        first = reference.setdefault(key, event)
        if first is not event and first.bmjd_tdb is not None and event.bmjd_tdb is not None:
            spread = np.hypot(first.bmjd_tdb.sigma_d or 0.0, event.bmjd_tdb.sigma_d or 0.0)
            if spread > 0.0:
                event = replace(  # noqa: PLW2901
                    event,
                    disagreement_sigma=float((event.bmjd_tdb.median - first.bmjd_tdb.median) / spread),
                )
        result.append(event)
    return result


def _date_key(event: EventForecast) -> tuple[bool, float, str]:
    dated = event.bmjd_tdb is not None
    return (not dated, event.bmjd_tdb.median if event.bmjd_tdb is not None else 0.0, event.system)


def _assumptions(prepared: Prepared) -> tuple[str, ...]:
    said: dict[str, list[str]] = {}
    for row in prepared.rows:
        for text in row.assumptions:
            said.setdefault(text, []).append(row.record.system.name)
    few = 4
    return tuple(
        f"{text} ({', '.join(names[:few])}{' and others' if len(names) > few else ''})"
        for text, names in said.items()
    )
