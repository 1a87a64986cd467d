"""A true forecaster's outcomes fall evenly into its forecasts; one made too narrow is found out.

Truth comes from elements drawn here (``calibration_cases``) by formulas of their own; forecasts are kept in a
catalogue, outcomes confirmed in it later, and both held against each other as anybody would do it.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from calibration_cases import NOW, orbit_case
from record_examples import Book

from campaign.catalogue import episodes
from campaign.model.forecasts import EventName
from campaign.model.instants import Moment
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, Episode
from campaign.model.verification import ForecastScores, ScoreGroup
from campaign.studies.rehearse import rehearse

DATING_D = 6.0


def narrower(record: SystemRecord, factor: float) -> SystemRecord:
    """The same estimates with their stated errors made smaller."""
    (solution,) = record.solutions
    assert record.rule is not None and record.rule.onset is not None and solution.epoch is not None
    period = solution.period_d
    return replace(
        record,
        solutions=(
            replace(
                solution,
                period_d=replace(period, minus=period.minus * factor, plus=period.plus * factor),  # type: ignore
                epoch=replace(
                    solution.epoch,
                    minus_d=solution.epoch.minus_d * factor,
                    plus_d=solution.epoch.plus_d * factor,
                ),  # type: ignore[operator]
            ),
        ),
        rule=replace(
            record.rule,
            onset=replace(
                record.rule.onset,
                minus=record.rule.onset.minus * factor,  # type: ignore[operator]
                plus=record.rule.onset.plus * factor,  # type: ignore[operator]
            ),
            scatter_onset_d=(record.rule.scatter_onset_d or 0.0) * factor,
        ),
    )


def scored(db: str, cases: int, seed: int, *, factor: float = 1.0, spans: bool = False) -> ForecastScores:
    """Keep forecasts of ``cases`` systems, let their onsets happen, confirm and score them."""
    rng = np.random.default_rng(seed)
    book = Book(db)
    kinds = ("lag", "phase")
    drawn = [orbit_case(rng, n, kinds[n % 2], n % 3 == 0, (0.0, 15.0)[n % 2]) for n in range(cases)]
    known = [narrower(case.record, factor) for case in drawn]
    known = [
        replace(each, solutions=(replace(each.solutions[0], data_until_bmjd_tdb=NOW - 100.0),))
        for each in known
    ]
    numbers = book.enter(known, at=NOW - 10.0)
    book.keep(NOW, years=60.0, draws=1000)
    with book.writing(NOW + 12_000.0) as writing:
        for number, case in zip(numbers, drawn, strict=True):
            assert case.truth is not None
            seen = case.truth + DATING_D * rng.standard_normal()
            error_d, method = DATING_D, None
            if spans:
                # Behind the Sun: anywhere in a gap of 40 to 160 d, with nothing known of where.
                width = rng.uniform(40.0, 160.0)
                seen = case.truth + width * rng.uniform(-0.5, 0.5)
                error_d, method = 0.34 * width, "bracket, rise not covered"
            onset = DatedEvent(Moment(seen, error_d, error_d), "K", method)
            episodes.add_episode(writing, Episode(0, number, case.cycle, onset=onset))
    return book.score(NOW + 15_000.0)


def all_leads(scores: ForecastScores) -> ScoreGroup:
    from campaign.studies.scoring import group_scores

    (group,) = group_scores(scores.scored, [(float("-inf"), None)])
    return group


def z_of(share: float | None, count: int, nominal: float) -> float:
    assert share is not None
    return float((share - nominal) / np.sqrt(nominal * (1.0 - nominal) / count))


def assert_calibrated(group: ScoreGroup, count: int) -> None:
    # Independent cases, so |z| < 3 (binomial; the mean and variance of n uniform numbers).
    assert abs(z_of(group.coverage68, count, 0.68)) < 3.0
    assert abs(z_of(group.coverage95, count, 0.95)) < 3.0
    assert abs((group.pit_mean - 0.5) * np.sqrt(12.0 * count)) < 3.0
    assert abs((group.pit_variance - 1.0 / 12.0) * np.sqrt(180.0 * count)) < 3.0
    assert group.ks_p > 0.0027


@pytest.mark.parametrize("spans", [False, True], ids=["dated", "bracketed"])
def test_outcomes_fall_evenly_into_true_forecasts(db, spans):
    group = all_leads(scored(db, 100, seed=31 + spans, spans=spans))
    # Of some the whole interval was past at the time: what is told of those is no forecast.
    assert group.outcomes > 0.95 * 100
    assert_calibrated(group, group.outcomes)
    assert group.verdict == "nothing against"


def test_a_forecaster_made_too_narrow_is_shown_as_such(db):
    group = all_leads(scored(db, 40, seed=7, factor=0.3))
    assert group.verdict == "too narrow"
    assert group.coverage68 < 0.5
    assert group.pit_variance > 0.1


@pytest.mark.slow
@pytest.mark.parametrize("spans", [False, True], ids=["dated", "bracketed"])
def test_outcomes_fall_evenly_into_true_forecasts_of_many_systems(db, spans):
    group = all_leads(scored(db, 4150, seed=310 + spans, spans=spans))
    assert group.outcomes > 4000
    assert_calibrated(group, group.outcomes)


@pytest.mark.slow
def test_rehearsals_of_learned_dates_are_true_and_beat_the_calendar(db):
    # Periodic with a scatter far above the dating error: the calendar carries one deviation on, the line
    # through all dates does not.
    from record_examples import NOW as LATE
    from studies_examples import episode, record

    from campaign.model.systems import DustRule

    rng = np.random.default_rng(19)
    book = Book(db)
    found = []
    for number in range(150):
        period = rng.uniform(1500.0, 3500.0)
        scatter = period * 0.01 * np.exp(rng.standard_normal() * 0.5)
        last = LATE - rng.uniform(10.0, 800.0)
        dates = last - period * np.arange(7)[::-1] + scatter * rng.standard_normal(7)
        seen = dates + 4.0 * rng.standard_normal(7)
        each = [episode(k, float(t), error_d=4.0, number=k) for k, t in enumerate(seen)]
        found.append(record(rule=DustRule(1, 1, "learned"), episodes=each, name=f"case {number}"))
    book.enter(found, at=LATE)
    scores = []
    event: tuple[EventName, ...] = ("onset",)
    for one in found:
        told = rehearse(
            book.db, one.system.name, LATE + 1_000.0, (500.0,), event, draws=1000, entered_any_time=True
        ).scored
        # The last of each alone: those of one system share dates.
        scores += [each for each in told if each.outcome.cycle == 6]
    assert len(scores) == 150
    from campaign.studies.scoring import group_scores

    (group,) = group_scores(scores, [(0.0, None)])
    assert_calibrated(group, 150)
    assert group.skill > 0.1
