"""A period without events says what comes first after it."""

from __future__ import annotations

from datetime import UTC, datetime

from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import Solution, System
from campaign.studies import watch


def asked(campaign: watch.Campaign, within_d: float) -> tuple[str, ...]:
    question = watch.ask(
        campaign, now=datetime(2026, 12, 1, tzinfo=UTC), as_of=None, start=None, end=None, within_d=within_d,
        events=(), min_probability=0.0, draws=1000, seed=None, solutions="adopted",
    )  # fmt: skip
    return watch.upcoming(campaign, question).assumptions


def test_an_empty_period_names_the_first_event_after_it() -> None:
    # Invented: 61233.7 + 3127.5 d = MJD 64361.2, which is 2035-02-03 in the calendar.
    solution = Solution(
        1, 1, "orbit", period_d=Measured(3127.5, 0.3, 0.3), epoch=Moment(61233.7, 0.5, 0.5), adopted=True,
        epoch_cycle=0,
    )  # fmt: skip
    campaign = watch.Campaign((SystemRecord(System(1, "Lantern 3", 270.6, -45.2), (solution,)),), {})
    said = [text for text in asked(campaign, 5 * 365.25) if text.startswith("nothing in this period")]
    assert said == ["nothing in this period; the first after it is periastron of Lantern 3, 2035-02-03"]
    assert not any(text.startswith("nothing") for text in asked(campaign, 10 * 365.25))


def test_a_campaign_without_any_forecast_says_nothing_of_a_next_event() -> None:
    campaign = watch.Campaign((SystemRecord(System(1, "Lantern 3", 270.6, -45.2)),), {})
    assert not any(text.startswith("nothing") for text in asked(campaign, 1000.0))
