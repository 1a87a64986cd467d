"""Hold kept forecasts against what was confirmed later, and refuse those that knew it."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from datetime import timedelta

from sqlalchemy import Connection

from campaign.catalogue import keepings, records, store, systems
from campaign.model.records import SystemRecord
from campaign.model.verification import (
    Containing,
    ForecastScores,
    Keeping,
    KeptForecast,
    Outcome,
    ScoredForecast,
    Unscored,
)
from campaign.physics.calibration import LEAST_OUTCOMES
from campaign.physics.timescales import utc_iso
from campaign.studies.forecast_inputs import clock_ahead, containing
from campaign.studies.outcomes import KnownOutcomes, known_outcomes
from campaign.studies.preparing import Question, prepare
from campaign.studies.rows import SCATTERS
from campaign.studies.scoring import Forecasted, group_scores, place_in_span, score_forecast

ASSUMPTIONS = (
    "CRPS in days, smaller is better: the miss and the width of a forecast together; of a span only what "
    "lies outside it counts",
    "the dating error of an outcome is added to the forecast",
    "skill is against the last date of the same stage plus whole periods, with their quoted errors (its "
    "CRPS: last + P): 1 is perfect, 0 no better, negative worse",
    "coverage and verdict rest on one forecast for each outcome, the last before it",
)


def score_forecasts(
    db: str, as_of: float, *, names: Sequence[str] | None = None, keeping: str | None = None
) -> ForecastScores:
    """Score every kept forecast whose event was confirmed since.

    Parameters
    ----------
    db : str
        Path or SQLAlchemy URL.
    as_of : float
        Outcomes dated later are hidden, ``bmjd_tdb``.
    names : sequence of str, optional
        Only these systems.
    keeping : str, optional
        Only this keeping, by number or label.

    Returns
    -------
    ForecastScores
        Scores in days; by event and lead time.

    Raises
    ------
    NotFound
        Unknown system or keeping.

    Notes
    -----
    Accuracy: see ``campaign.physics.datedscores``. Source: DEVELOPERS.md (Keeping forecasts).
    """
    with store.reading(db) as connection:
        ids = None if names is None else [systems.find_system(connection, name).id for name in names]
        known = {one.id: one for one in keepings.list_keepings(connection)}
        chosen = None if keeping is None else [keepings.find_keeping(connection, keeping).id]
        concerned = keepings.systems_kept(connection, chosen)
        concerned = concerned if ids is None else concerned & set(ids)
        found = records.load_records(connection, concerned, include_retired=True) if concerned else []
        outcomes = outcomes_of(connection, found, as_of)
        sorted_out = _Sorted(known, outcomes, clock_ahead(connection))
        # One keeping after the other: kept every night, they are many.
        for number in known if chosen is None else chosen:
            for one in keepings.load_kept(connection, [number]):
                if one.system_id in concerned:
                    sorted_out.take(one)
    return ForecastScores(
        as_of_utc=utc_iso([as_of])[0] or "",
        scored=tuple(sorted_out.scored),
        unscored=tuple(sorted_out.unscored),
        groups=group_scores(sorted_out.scored),
        waiting=sorted_out.waiting,
        undatable=sorted_out.undatable,
        kept=sorted_out.kept,
        least_outcomes=LEAST_OUTCOMES,
        assumptions=ASSUMPTIONS,
    )


def outcomes_of(
    connection: Connection, found: Sequence[SystemRecord], as_of: float
) -> dict[int, KnownOutcomes]:
    """Confirmed outcomes by system.

    Parameters
    ----------
    connection : Connection
        To the catalogue.
    found : sequence of SystemRecord
        Systems as they are known now.
    as_of : float
        Outcomes dated later are hidden, ``bmjd_tdb``.

    Returns
    -------
    dict of int to KnownOutcomes
        By system id; ``bmjd_tdb``.

    Notes
    -----
    Accuracy: see ``campaign.studies.outcomes``. Source: the catalogue.
    """
    prepared = prepare(found, {}, Question(as_of, as_of, as_of + 1.0))
    episodes = {episode.id for record in found for episode in record.episodes}
    decided = keepings.entry_times(connection, (), (), episodes)[2]
    return {
        prepared.system_id(unit): known_outcomes(prepared, unit, decided)
        for unit in range(len(prepared.units))
    }


class _Sorted:
    """Kept forecasts as they are scored, refused, or left to wait."""

    def __init__(
        self, known: Mapping[int, Keeping], outcomes: Mapping[int, KnownOutcomes], ahead: timedelta
    ) -> None:
        self.keepings, self.outcomes, self.ahead = known, outcomes, ahead
        self.scored: list[ScoredForecast] = []
        self.unscored: list[Unscored] = []
        self.kept = self.waiting = self.undatable = 0

    def take(self, one: KeptForecast) -> None:
        event = one.event
        self.kept += 1
        if event.event not in SCATTERS:
            self.undatable += 1
            return
        outcome = self._outcome(one)
        if outcome is None:
            self.waiting += 1
            return
        keeping = self.keepings[one.keeping_id]
        kinds, words = containing(one.inputs, outcome, keeping.as_of_bmjd_tdb, keeping.known_at, self.ahead)
        if kinds:
            self._refuse(one, keeping, "contains-outcome", "; ".join(words), kinds)
        elif not one.quantiles_bmjd_tdb:
            lost = event.phase_lost or event.bmjd_tdb is None
            why = "it gave no date" if lost else "it gave a date without an interval, an error being unknown"
            self._refuse(one, keeping, "no-interval", why)
        else:
            self.scored.append(score_forecast(_forecasted(one, keeping), outcome))

    def _outcome(self, one: KeptForecast) -> Outcome | None:
        known = self.outcomes.get(one.system_id)
        if known is None or one.event.cycle is None:
            return None
        cycle = one.event.cycle + known.shift(one.inputs.episodes)
        return known.by_event.get((one.event.event, cycle))

    def _refuse(
        self, one: KeptForecast, keeping: Keeping, code: str, why: str, kinds: tuple[Containing, ...] = ()
    ) -> None:
        event = one.event
        self.unscored.append(
            Unscored(keeping.id, keeping.label, event.system, event.event, event.cycle, code, why, kinds)
        )


def _forecasted(one: KeptForecast, keeping: Keeping) -> Forecasted:
    event = one.event
    return Forecasted(
        keeping_id=keeping.id,
        keeping_label=keeping.label,
        system=event.system,
        event=event.event,
        cycle=event.cycle,
        solution=event.solution,
        rule=event.rule,
        as_of_bmjd_tdb=keeping.as_of_bmjd_tdb,
        quantiles_bmjd_tdb=one.quantiles_bmjd_tdb,
        probability=event.probability,
        reference_bmjd_tdb=one.reference_bmjd_tdb,
        reference_sigma_d=one.reference_sigma_d,
        place=place_in_span(keeping.seed, one.id),
    )
