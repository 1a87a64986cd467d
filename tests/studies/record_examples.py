"""A catalogue whose entries are made at dates of our choosing, for the record of forecasts."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from campaign.catalogue import episodes, observations, rules, solutions, store, systems
from campaign.model.forecasts import EventName
from campaign.model.instants import Moment, TypedInstant
from campaign.model.kept import Kept, Stamp
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, DustRule, Episode, Solution
from campaign.model.verification import ForecastScores
from campaign.studies import watch
from campaign.studies.forecast_inputs import clock_of
from campaign.studies.keep_forecasts import keep_forecasts
from campaign.studies.score_forecasts import score_forecasts
from campaign.studies.upcoming import Question

# 2028-08-19: forecasts are made about then.
NOW = 62_000.0


class Book:
    """A catalogue that was begun at a path; instants ``bmjd_tdb``, which the clock follows."""

    def __init__(self, path: Any) -> None:
        self.db = str(path)

    def writing(self, at: float) -> Any:
        return store.writing(self.db, at=clock_of(at), who="Ida Vik", command="campaign test")

    def enter(self, records: Sequence[SystemRecord], at: float = NOW - 10.0) -> list[int]:
        """Enter systems with everything that belongs to them; their numbers in the catalogue."""
        numbers = []
        with self.writing(at) as writing:
            for record in records:
                number = systems.add_system(writing, record.system)
                for solution in record.solutions:
                    entered = solutions.add_solution(writing, replace(solution, system_id=number))
                    if solution.adopted:
                        solutions.adopt_instead(writing, entered)
                if record.rule is not None:
                    rules.set_rule(writing, replace(record.rule, system_id=number))
                for episode in record.episodes:
                    episodes.add_episode(writing, replace(episode, system_id=number))
                numbers.append(number)
        return numbers

    def solution(self, number: int, solution: Solution, at: float) -> None:
        with self.writing(at) as writing:
            solutions.adopt_instead(
                writing, solutions.add_solution(writing, replace(solution, system_id=number))
            )

    def rule(self, number: int, rule: DustRule, at: float) -> None:
        with self.writing(at) as writing:
            rules.set_rule(writing, replace(rule, system_id=number))

    def point(self, number: int, when: float, at: float, mag: float = 7.5) -> None:
        moment = Moment(when, 0.0, 0.0, "typed", "tdb", "barycentre")
        with self.writing(at) as writing:
            observations.add_observation(
                writing,
                Observation(0, "", number, "photometry", moment, Measured(mag, 0.02, 0.02), "mag", band="K"),
            )

    def confirm(
        self, number: int, when: float, at: float, event: EventName = "onset", *, cycle: int | None = None,
        error_d: float | None = 0.0, text: str = "", method: str | None = None,
    ) -> None:  # fmt: skip
        dated = DatedEvent(Moment(when, error_d, error_d, text, "utc", "geocentre"), "K", method)
        with self.writing(at) as writing:
            episodes.add_episode(writing, Episode(0, number, cycle, **{event: dated}))  # type: ignore[arg-type]

    def keep(
        self, at: float = NOW, *, as_of: float | None = None, label: str | None = None, draws: int = 2000,
        years: float = 30.0, known_at: float | None = None,
    ) -> Kept:  # fmt: skip
        entered = None
        if known_at is not None:
            entered = TypedInstant(known_at, 0.0, "utc", "geocentre", 0.0, 0.0, "Julian date", "typed")
        campaign = watch.load_campaign(self.db, None, entered, None)
        start = at if as_of is None else as_of
        question = Question(start, start, start + 365.25 * years, draws=draws)
        return keep_forecasts(
            self.db, Stamp(clock_of(at), "Ida Vik", "campaign test"), campaign, question, label=label,
            known_at=entered,
        )  # fmt: skip

    def score(self, at: float = NOW + 20_000.0, **options: Any) -> ForecastScores:
        return score_forecasts(self.db, at, **options)
