"""Rehearse: forecast the past episodes of a system as if they had not happened, and score that."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime, timedelta
from itertools import pairwise

from campaign.catalogue import records, store, systems
from campaign.errors import Conflict, InputRefused
from campaign.model.arrays import PhotometryArrays
from campaign.model.forecasts import EventName
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution
from campaign.model.verification import (
    ForecastInputs,
    ForecastScores,
    Outcome,
    ScoredForecast,
    Unscored,
)
from campaign.physics.calibration import LEAST_OUTCOMES
from campaign.physics.timescales import utc_iso
from campaign.studies.collecting import collector_at_rest
from campaign.studies.forecast import DatedEvent
from campaign.studies.forecast_inputs import clock_ahead, clock_of, containing, inputs_by_unit, reference_date
from campaign.studies.keep_forecasts import quantiles_of
from campaign.studies.lightcurves import CataloguedCurves
from campaign.studies.outcomes import KnownOutcomes
from campaign.studies.sampling import DEFAULT_DRAWS, DEFAULT_SEED
from campaign.studies.score_forecasts import ASSUMPTIONS, outcomes_of
from campaign.studies.scoring import Forecasted, group_scores, place_in_span, score_forecast
from campaign.studies.upcoming import DatedCampaign, Question, date_campaign

DEFAULT_LEADS_D = (365.25,)
# Longest and shortest time that anybody forecasts ahead of an episode, days.
LONGEST_LEAD_D, SHORTEST_LEAD_D = 100.0 * 365.25, 1.0
# About so wide around a lead that was asked for are the leads of one group: leads differ by nothing else.
_SLACK_D = 0.5


@dataclass(frozen=True, slots=True)
class Then:
    """What was known of a system at one time, after three cutoffs: observed, entered, data of solutions."""

    record: SystemRecord
    photometry: Mapping[int, PhotometryArrays]
    known_at: datetime | None
    hidden: tuple[str, ...]


def rehearse(
    db: str,
    name: str,
    as_of: float,
    leads_d: Sequence[float] = DEFAULT_LEADS_D,
    events: Sequence[EventName] = ("onset",),
    *,
    draws: int | None = None,
    seed: int | None = None,
    entered_any_time: bool = False,
) -> ForecastScores:
    """Forecast each past episode from what was known some time before it, and score the forecasts.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    name : str
        Name or alias of the system.
    as_of : float
        Episodes dated later are hidden, ``bmjd_tdb``.
    leads_d : sequence of float
        How long before each episode, days, 1 to 36525.
    events : sequence of str
        Of onset, maximum and end.
    draws, seed : int, optional
        Of the random draws.
    entered_any_time : bool
        Let in entries of any date, as for a catalogue that was filled after the fact; observations, episodes
        and the data of solutions are cut all the same.

    Returns
    -------
    ForecastScores
        Scores in days; ``unscored`` says why an episode could not be forecast.

    Raises
    ------
    NotFound
        Unknown system.
    Conflict
        Without a confirmed episode that dates one of ``events``.
    InputRefused
        A lead time out of range.

    Notes
    -----
    A solution whose data reach beyond the time of the forecast is hidden, and so is one of which nobody said
    until when they reach unless it was entered by then. Where the adopted one is hidden, the one with the
    newest data speaks.

    Accuracy: see ``campaign.physics.datedscores``. Source: DEVELOPERS.md (Keeping forecasts, As of).
    """
    _refuse_leads(leads_d)
    with store.reading(db) as connection:
        system = systems.find_system(connection, name)
        (record,) = records.load_records(connection, {system.id}, include_retired=True)
        outcomes = outcomes_of(connection, [record], as_of)[system.id]
        ahead = clock_ahead(connection)
    past = sorted(
        (one for key, one in outcomes.by_event.items() if key[0] in events), key=lambda one: one.bmjd_tdb
    )
    if not past:
        raise _without_episodes(record, events)
    seed = DEFAULT_SEED if seed is None else seed
    work = _Rehearsal(db, record, outcomes, ahead, draws or DEFAULT_DRAWS, seed)
    with collector_at_rest():
        for event in events:
            for cycle in sorted(cycle for kind, cycle in outcomes.by_event if kind == event):
                for lead_d in sorted(leads_d):
                    work.forecast(event, cycle, lead_d, entered_any_time=entered_any_time)
    groups = group_scores(work.scored, [(lead - _SLACK_D, lead + _SLACK_D) for lead in sorted(leads_d)])
    return ForecastScores(
        as_of_utc=utc_iso([as_of])[0] or "",
        scored=tuple(work.scored),
        unscored=tuple(work.unscored),
        groups=groups,
        kept=len(work.scored) + len(work.unscored),
        least_outcomes=LEAST_OUTCOMES,
        system=system.name,
        leads_d=tuple(sorted(leads_d)),
        entered_any_time=entered_any_time,
        hidden=work.notes(),
        assumptions=(_cutoffs(entered_any_time), *ASSUMPTIONS),
    )


def _refuse_leads(leads_d: Sequence[float]) -> None:
    for lead in leads_d:
        if not SHORTEST_LEAD_D <= lead <= LONGEST_LEAD_D:
            raise InputRefused(
                f"A lead of {lead:g} d is out of range.",
                why="Forecasts are rehearsed from 1 day to 100 years before an episode.",
                hint="For example --lead 90d --lead 1yr.",
                code="lead-refused",
            )
    if len(set(leads_d)) != len(leads_d):
        raise InputRefused(
            "A lead stands there twice.",
            why="Each past episode is forecast once at each lead.",
            hint="For example --lead 90d --lead 1yr.",
            code="lead-twice",
        )


def _without_episodes(record: SystemRecord, events: Sequence[EventName]) -> Conflict:
    name, confirmed = record.system.name, [e for e in record.episodes if e.state == "confirmed"]
    wanted = " or ".join(events)
    return Conflict(
        f"{name} has no past episode to rehearse.",
        why=f"{len(confirmed)} confirmed episode{'s' if len(confirmed) > 1 else ''} and no dated {wanted}."
        if confirmed
        else "No episode of it is confirmed.",
        hint=f'Find them in the light curve: campaign episodes find "{name}", or add one: campaign episodes '
        f'add "{name}" --onset "2019-03-14±5 d"',
        code="nothing-to-rehearse",
    )


def _cutoffs(entered_any_time: bool) -> str:
    text = "each forecast saw only what was observed before its date, episodes dated before it and solutions "
    text += "whose data end before it"
    return text + (
        "; entries of any date were let in, so that rules, names and positions are the present ones"
        if entered_any_time
        else ", and of that only what was entered before it"
    )


class _Rehearsal:
    """Hindcasts of one system, one after another."""

    def __init__(
        self,
        db: str,
        record: SystemRecord,
        outcomes: KnownOutcomes,
        ahead: timedelta,
        draws: int,
        seed: int,
    ) -> None:
        self._db, self._record, self._outcomes, self._ahead = db, record, outcomes, ahead
        self._draws, self._seed = draws, seed
        self.scored: list[ScoredForecast] = []
        self.unscored: list[Unscored] = []
        self._hidden: dict[str, None] = {}

    def notes(self) -> tuple[str, ...]:
        """Solutions that were hidden from some forecast, and why."""
        return tuple(self._hidden)

    def forecast(self, event: EventName, cycle: int, lead_d: float, *, entered_any_time: bool) -> None:
        """Forecast one past event from before and score it, or say why not."""
        outcome = self._outcomes.by_event[event, cycle]
        as_of = outcome.bmjd_tdb - lead_d
        then = self._known(as_of, entered_any_time=entered_any_time)
        self._hidden.update(dict.fromkeys(then.hidden))
        reach = lead_d + self._longest_period_d(lead_d)
        question = Question(as_of, as_of, as_of + reach, (event,), draws=self._draws, seed=self._seed)
        dated = date_campaign([then.record], then.photometry, question)
        with store.reading(self._db) as connection:
            (inputs,) = inputs_by_unit(connection, dated.prepared, as_of, then.known_at)
        one = self._of_cycle(dated, event, cycle - self._outcomes.shift(inputs.episodes))
        why = self._why_not(then, dated, one)
        kinds, words = containing(inputs, outcome, as_of, then.known_at, self._ahead)
        if why is not None:
            self._leave(event, cycle, lead_d, *why)
        elif kinds:
            self.unscored.append(
                Unscored(0, None, self._record.system.name, event, cycle, "contains-outcome",
                         "; ".join(words), kinds, lead_d)
            )  # fmt: skip
        else:
            assert one is not None
            self._score(dated, one, inputs, outcome, as_of, lead_d)

    def _score(
        self, dated: DatedCampaign, one: DatedEvent, inputs: ForecastInputs, outcome: Outcome, as_of: float,
        lead_d: float,
    ) -> None:  # fmt: skip
        period_d = dated.forecaster.period_d(dated.prepared.units[one.unit].rows[0])
        date, sigma_d = reference_date(dated.prepared, one.unit, one.event, one.cycle, period_d)
        forecast = Forecasted(
            keeping_id=0,
            keeping_label=None,
            system=self._record.system.name,
            event=one.event,
            cycle=outcome.cycle,
            solution=dated.prepared.units[one.unit].label,
            rule=None if inputs.rule is None else inputs.rule.kind,
            as_of_bmjd_tdb=as_of,
            quantiles_bmjd_tdb=quantiles_of(one),
            probability=one.probability,
            reference_bmjd_tdb=date,
            reference_sigma_d=sigma_d,
            place=place_in_span(self._seed, len(self.scored)),
            lead_asked_d=lead_d,
        )
        self.scored.append(score_forecast(forecast, outcome))

    def _known(self, as_of: float, *, entered_any_time: bool) -> Then:
        """The system as it was known at a date: the three cutoffs."""
        known_at = None if entered_any_time else clock_of(as_of) - self._ahead
        number = self._record.system.id
        with store.reading(self._db) as connection:
            (record,) = records.load_records(connection, {number}, known_at=known_at, include_retired=True)
        allowed, hidden = [], []
        for solution in record.solutions:
            reason = _hidden_because(solution, as_of, known_at)
            if reason is None:
                allowed.append(solution)
            else:
                hidden.append(f"solution '{solution.label}' was hidden: {reason}")
        curves = CataloguedCurves(self._db, [number], as_of, known_at)
        return Then(replace(record, solutions=_speaking(allowed)), curves, known_at, tuple(hidden))

    def _longest_period_d(self, lead_d: float) -> float:
        """Far enough that the cycle is dated even when it is expected late."""
        from campaign.studies.cycles import nominal_period_d

        periods = [nominal_period_d(solution) or 0.0 for solution in self._record.solutions]
        dates = sorted(one.bmjd_tdb for one in self._outcomes.by_event.values())
        return max([*periods, *(later - earlier for earlier, later in pairwise(dates)), lead_d])

    def _of_cycle(self, dated: DatedCampaign, event: EventName, cycle: int) -> DatedEvent | None:
        for one in dated.dated:
            if one.event == event and one.cycle == cycle and not one.observed:
                return one
        return next((one for one in dated.dated if one.event == event and one.phase_lost), None)

    def _why_not(self, then: Then, dated: DatedCampaign, one: DatedEvent | None) -> tuple[str, str] | None:
        if one is not None and one.phase_lost:
            return "nothing-forecast", "the phase was lost by then"
        if one is None or one.quantiles is None:
            episodes = dated.prepared.units[0].episodes
            if not then.record.solutions and len(episodes) < 2:
                known = "one episode was" if episodes else "no episode was"
                return "nothing-known", f"no solution and {known} known by then"
            if then.record.rule is None and len(episodes) < 2:
                return "nothing-known", "no dust rule was known by then"
            return "nothing-forecast", "what was known by then dates no such event in this cycle"
        if one.missing:
            return "no-interval", f"error unknown: {', '.join(one.missing)}"
        if not quantiles_of(one):
            return "nothing-forecast", "the forecast was that no episode comes"
        return None

    def _leave(self, event: EventName, cycle: int, lead_d: float, code: str, why: str) -> None:
        self.unscored.append(Unscored(0, None, self._record.system.name, event, cycle, code, why, (), lead_d))


def _hidden_because(solution: Solution, as_of: float, known_at: datetime | None) -> str | None:
    until = solution.data_until_bmjd_tdb
    if until is not None:
        return "its data reach beyond the date of a forecast" if until > as_of else None
    # Entered before the date of the forecast, it can hold nothing later.
    return None if known_at is not None else "nobody said until when its data reach"


def _speaking(allowed: Sequence[Solution]) -> tuple[Solution, ...]:
    """The adopted ones; where they are hidden, the one with the newest data is taken for adopted."""
    if not allowed or any(solution.adopted for solution in allowed):
        return tuple(allowed)
    newest = max(allowed, key=lambda one: (one.data_until_bmjd_tdb or float("-inf"), one.id))
    return tuple(replace(one, adopted=True, weight=None) if one.id == newest.id else one for one in allowed)
