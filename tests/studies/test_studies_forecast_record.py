"""Forecasts are kept as they are, held against what came, and refused where they knew it."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from record_examples import NOW, Book
from scipy.stats import norm
from studies_examples import episode, find, lag_rule, moment, record, solution, stamp, upcoming

from campaign.catalogue import keepings, store
from campaign.errors import Conflict, InputRefused, NotFound
from campaign.model.systems import DustRule
from campaign.studies import undo
from campaign.studies.history import tell_history
from campaign.studies.keep_forecasts import list_kept
from campaign.studies.rehearse import rehearse
from campaign.studies.summaries import GRID

# Period 3000 d, epoch 58000: periastron 2 at 64000, onset 40 d before, sigma 5.2 to 7.8 d.
ONSET_2 = 63_960.0
SIGMA_D = math.hypot(5.0, 2.0 * 3.0)


@pytest.fixture
def book(db) -> Book:
    return Book(db)


@pytest.fixture
def orbit(book):
    """One system with an orbit whose data end before now."""
    known = solution(data_until_bmjd_tdb=NOW - 500.0)
    (number,) = book.enter([record(known, rule=lag_rule())])
    return number


def kept_of(book, event="onset", cycle=2):
    with store.reading(book.db) as connection:
        found = keepings.load_kept(connection)
    return [one for one in found if one.event.event == event and one.event.cycle == cycle]


# ------------------------------------------------------------------------------------------ keeping


def test_what_is_kept_is_what_upcoming_says(book, orbit):
    done = book.keep(label="spring")
    assert done.changed and done.data["label"] == "spring"
    (one,) = kept_of(book)
    told = find(upcoming(record(solution(), rule=lag_rule()), now=NOW, years=30.0, draws=2000), "onset", 2)
    assert one.event.bmjd_tdb == told.bmjd_tdb
    assert (one.event.status, one.event.probability) == (told.status, told.probability)
    assert (one.event.rule, one.event.solution) == (told.rule, told.solution)
    # Oracle: the normal distribution of the epoch's and the period's errors.
    wanted = norm(ONSET_2, SIGMA_D).ppf(GRID)
    assert np.array(one.quantiles_bmjd_tdb) == pytest.approx(wanted, abs=1e-6)
    assert one.inputs.solutions[0].data_until_bmjd_tdb == NOW - 500.0
    assert one.inputs.rule is not None and one.inputs.rule.kind == "lag"
    # Nothing that an episode could not date has a distribution to be scored by.
    (periastron,) = kept_of(book, "periastron")
    assert periastron.quantiles_bmjd_tdb == () and periastron.event.bmjd_tdb is not None


def test_keeping_twice_the_same_day_keeps_once_until_something_is_new(book, orbit):
    first = book.keep()
    again = book.keep(NOW + 0.2)
    assert first.changed and not again.changed
    assert again.data["keeping"] == first.data["keeping"]
    assert "nothing has changed" in again.lines[0]
    book.point(orbit, NOW - 3.0, NOW + 0.3)
    assert book.keep(NOW + 0.4).changed
    # Another day's forecast is another one, and so is one that gets a name.
    assert book.keep(NOW + 1.4).changed
    assert book.keep(NOW + 1.5, label="named").changed
    assert not book.keep(NOW + 1.5, label="NAMED").changed
    assert len(list_kept(book.db).keepings) == 4


def test_a_label_is_given_once(book, orbit):
    book.keep(label="spring")
    with pytest.raises(Conflict) as refused:
        book.keep(NOW + 400.0, label="Spring")
    assert refused.value.code == "label-taken"
    assert refused.value.hint
    assert len(list_kept(book.db).keepings) == 1


def test_nothing_to_keep_says_what_to_do(book):
    empty = book.keep()
    assert not empty.changed and "campaign system add" in empty.lines[1]
    book.enter([record(name="Faint")])
    nothing = book.keep()
    assert not nothing.changed and "campaign upcoming" in nothing.lines[1]
    assert list_kept(book.db).keepings == ()
    with pytest.raises(NotFound) as missing:
        list_kept(book.db, "spring")
    assert "campaign forecast keep" in missing.value.hint


def test_a_forecast_dated_ahead_is_told_as_such(book, orbit):
    assert book.keep(NOW).warnings == ()
    assert "ahead of today" in book.keep(NOW, as_of=NOW + 30.0).warnings[0]


def test_an_event_that_was_seen_is_no_forecast(book, orbit):
    book.confirm(orbit, NOW - 5.0, NOW - 4.0, cycle=2)
    book.keep()
    assert kept_of(book) == []
    assert len(kept_of(book, "maximum")) == 1


def test_a_keeping_is_one_operation_that_can_be_taken_back(book, orbit):
    book.keep(label="spring")
    (newest, *_) = tell_history(book.db).operations
    assert newest.operation.summary.endswith("of 1 system as 'spring'")
    assert [change.subject.split()[0] for change in newest.changes] == [
        "keeping",
        f"{len(newest.changes[1].note.split(', '))}",
    ]
    (of_system, *_) = tell_history(book.db, "Lantern 3").operations
    assert of_system.operation.id == newest.operation.id
    book.confirm(orbit, ONSET_2, ONSET_2 + 10.0)
    assert len(book.score().scored) == 1
    undo.undo(book.db, stamp(), newest.operation.id)
    assert book.score().kept == 0
    assert list_kept(book.db).keepings == ()
    book.keep(NOW + 1.0, label="spring")
    # What holds the label by now stands in the way of its return.
    with pytest.raises(Conflict) as refused:
        undo.undo(book.db, stamp(), newest.operation.id + 2)
    assert refused.value.code == "depended-on"


# ------------------------------------------------------------------------------------------ scoring


def test_a_forecast_is_scored_by_what_was_confirmed_later(book, orbit):
    book.keep()
    before = book.score()
    assert before.scored == () and before.waiting + before.undatable == before.kept > 3
    outcome = ONSET_2 + 10.0
    book.confirm(orbit, outcome, outcome + 5.0)
    (one,) = book.score().scored
    assert (one.event, one.outcome.cycle, one.miss_d) == ("onset", 2, pytest.approx(10.0))
    z = 10.0 / SIGMA_D
    # Gneiting et al. 2005, eq. 5, and the normal density; the quantiles are good to 1e-3 of the spread.
    crps = SIGMA_D * (z * (2 * norm.cdf(z) - 1) + 2 * norm.pdf(z) - 1 / math.sqrt(math.pi))
    assert one.crps_d == pytest.approx(crps, abs=2e-3 * SIGMA_D)
    assert one.log_score == pytest.approx(-norm.logpdf(outcome, ONSET_2, SIGMA_D), abs=1e-6)
    assert one.pit == pytest.approx(norm.cdf(z), abs=1e-9)
    assert one.lead_d == pytest.approx(outcome - NOW)
    # No episode came before, so there is nothing that a calendar could have said.
    assert one.reference_crps_d is None
    (group,) = book.score().groups
    assert (group.outcomes, group.verdict, group.skill) == (1, "too few", None)


def test_skill_is_against_the_last_date_plus_whole_periods(book):
    known = solution(data_until_bmjd_tdb=NOW - 500.0)
    (number,) = book.enter([record(known, rule=lag_rule(), episodes=[episode(0, 57_940.0, error_d=4.0)])])
    book.keep()
    (one,) = kept_of(book)
    assert one.reference_bmjd_tdb == pytest.approx(57_940.0 + 2 * 3000.0)
    assert one.reference_sigma_d == pytest.approx(math.hypot(4.0, 2 * 3.0))
    book.confirm(number, ONSET_2, ONSET_2 + 10.0)
    (scored,) = book.score().scored
    z = 20.0 / math.hypot(4.0, 6.0)
    crps = math.hypot(4.0, 6.0) * (z * (2 * norm.cdf(z) - 1) + 2 * norm.pdf(z) - 1 / math.sqrt(math.pi))
    assert scored.reference_crps_d == pytest.approx(crps, abs=0.02)
    (group,) = book.score().groups
    assert group.skill == pytest.approx(1.0 - scored.crps_d / crps, abs=0.01)


def test_a_month_is_a_span_and_not_its_middle(book, orbit):
    book.keep()
    book.confirm(orbit, ONSET_2, ONSET_2 + 40.0, error_d=31.0 / math.sqrt(12.0), text="2033-12")
    (one,) = book.score().scored
    first, last = one.outcome.first_bmjd_tdb, one.outcome.last_bmjd_tdb
    assert last - first == pytest.approx(31.0)
    law = norm(ONSET_2, SIGMA_D)
    assert one.log_score == pytest.approx(-math.log(law.cdf(last) - law.cdf(first)), abs=1e-6)
    assert law.cdf(first) <= one.pit <= law.cdf(last)
    assert book.score().scored[0].pit == one.pit


def test_a_day_with_an_error_of_its_own_is_no_span(book, orbit):
    # As tables have it: the day in one column, how uncertain it is in another.
    book.keep()
    book.confirm(orbit, ONSET_2, ONSET_2 + 40.0, error_d=9.0, text="2033-12-26")
    (one,) = book.score().scored
    assert not one.outcome.is_span
    assert one.outcome.plus_d == 9.0


def test_a_found_bracket_is_a_span_too(book, orbit):
    book.keep()
    book.confirm(orbit, ONSET_2 + 3.0, ONSET_2 + 90.0, error_d=34.0, method="bracket, rise not covered")
    (one,) = book.score().scored
    # 68 % of an even bracket lie within 34 d of its middle, so all of it within 50 d.
    assert one.outcome.first_bmjd_tdb == pytest.approx(ONSET_2 - 47.0)
    assert one.outcome.last_bmjd_tdb == pytest.approx(ONSET_2 + 53.0)


@pytest.mark.parametrize(
    ("spoil", "kind"),
    [
        (lambda book, n: book.point(n, ONSET_2 + 30.0, ONSET_2 + 31.0, 6.0), "observations"),
        (
            lambda book, n: book.solution(
                n, solution(label="newer", data_until_bmjd_tdb=ONSET_2 + 60.0), ONSET_2 + 1.0
            ),
            "solution",
        ),
        (lambda book, n: book.solution(n, solution(label="newer"), ONSET_2 + 50.0), "solution"),
        (lambda book, n: book.rule(n, lag_rule(onset=-35.0), ONSET_2 + 50.0), "rule"),
    ],
    ids=["light curve", "data of a solution", "solution without a date", "rule"],
)
def test_a_forecast_that_may_know_its_outcome_is_refused(book, orbit, spoil, kind):
    spoil(book, orbit)
    # Kept when the onset had passed and nobody had confirmed it yet.
    book.keep(ONSET_2 + 70.0)
    book.confirm(orbit, ONSET_2 + 12.0, ONSET_2 + 80.0)
    scores = book.score()
    refused = [one for one in scores.unscored if one.event == "onset"]
    assert [one.containing for one in refused] == [(kind,)]
    assert refused[0].why and refused[0].code == "contains-outcome"
    assert not [one for one in scores.scored if one.event == "onset"]


def test_late_but_honest_forecasts_are_scored(book, orbit):
    # The same, with nothing from after the onset: a solution entered late whose data ended in time.
    book.point(orbit, ONSET_2 - 30.0, ONSET_2 + 31.0)
    book.solution(orbit, solution(label="newer", data_until_bmjd_tdb=ONSET_2 - 60.0), ONSET_2 + 50.0)
    book.keep(ONSET_2 + 1.0)
    book.confirm(orbit, ONSET_2 + 3.0, ONSET_2 + 80.0)
    assert [one.event for one in book.score().scored] == ["onset"]
    assert book.score().groups[0].lead_high_d == 91.3


def test_a_forecast_for_a_past_date_does_not_count_what_was_entered_by_then(book, orbit):
    book.confirm(orbit, ONSET_2 + 3.0, ONSET_2 + 80.0)
    done = book.keep(ONSET_2 + 100.0, as_of=NOW)
    assert "campaign forecast rehearse" in done.warnings[0]
    scores = book.score()
    assert scores.scored == ()
    assert [one.containing for one in scores.unscored] == [("entries",)]


def test_a_past_date_is_forecast_honestly_only_without_later_entries(book):
    # Learned from episodes 0 and 1; the onset of cycle 2 is entered later, for the second time.
    learned = DustRule(1, 1, "learned")
    dates = {0: 50_000.0, 1: 53_000.0}
    (number,) = book.enter(
        [record(rule=learned, episodes=[episode(k, t) for k, t in dates.items()])], 53_500.0
    )
    book.keep(NOW, as_of=54_000.0, years=50.0)
    book.keep(NOW + 1.0, as_of=54_001.0, known_at=54_001.0, years=50.0)
    book.confirm(number, 56_010.0, NOW + 10.0, cycle=2)
    scores = book.score()
    assert [one.keeping_id for one in scores.scored] == [2]
    assert [(one.keeping_id, one.containing) for one in scores.unscored] == [(1, ("entries",))]


def test_an_episode_after_the_event_betrays_it(book):
    # Episodes 0, 1 and 3: the onset of cycle 2 lies between them.
    learned = DustRule(1, 1, "learned")
    dates = {0: 50_000.0, 1: 53_000.0, 3: 59_000.0}
    (number,) = book.enter(
        [record(rule=learned, episodes=[episode(k, t) for k, t in dates.items()])], 59_500.0
    )
    book.keep(NOW, years=50.0)
    (one,) = kept_of(book, cycle=4)
    book.confirm(number, one.event.bmjd_tdb.median - 3_100.0, NOW + 10.0, cycle=4)
    assert [each.containing for each in book.score().unscored] == [("entries",)]


def test_a_date_without_an_interval_cannot_be_scored(book):
    (number,) = book.enter(
        [record(solution(period_error=None, data_until_bmjd_tdb=NOW - 500.0), rule=lag_rule())]
    )
    book.keep()
    book.confirm(number, ONSET_2, ONSET_2 + 10.0)
    scores = book.score()
    assert [one.code for one in scores.unscored] == ["no-interval"]
    assert "error" in scores.unscored[0].why


def test_an_older_episode_found_later_does_not_move_the_outcome(book):
    # Without an orbit cycles are counted from the oldest episode; one more at the start moves the count.
    dates = {0: 50_000.0, 1: 53_000.0, 2: 56_000.0, 3: 59_000.0}
    drawn = [replace(episode(None, t), cycle=None) for t in dates.values()]
    (number,) = book.enter([record(rule=DustRule(1, 1, "learned"), episodes=drawn)])
    book.keep()
    assert kept_of(book, cycle=4)
    book.confirm(number, 47_000.0, NOW + 5.0, error_d=5.0)
    book.confirm(number, 62_030.0, NOW + 50.0, error_d=5.0)
    (one,) = book.score().scored
    assert (one.cycle, one.outcome.cycle) == (4, 5)
    assert one.miss_d == pytest.approx(30.0, abs=10.0)


def test_the_chance_of_no_episode_counts_in_the_log_score(book, orbit):
    book.keep()
    book.confirm(orbit, ONSET_2, ONSET_2 + 5.0)
    (sure,) = book.score().scored
    (one,) = kept_of(book)
    from campaign.studies.scoring import Forecasted, score_forecast

    half = Forecasted(
        1, None, "Lantern 3", "onset", 2, None, None, NOW, one.quantiles_bmjd_tdb, 0.5, None, None, 0.5
    )
    assert score_forecast(half, sure.outcome).log_score == pytest.approx(sure.log_score + math.log(2.0))
    never = replace(half, probability=0.0)
    assert score_forecast(never, sure.outcome).log_score == math.inf


# --------------------------------------------------------------------------------------- rehearsing


def rehearsed(book, **options):
    return rehearse(book.db, "Lantern 3", NOW + 20_000.0, **({"draws": 2000} | options))


def test_a_rehearsal_sees_only_what_was_known_then(book):
    onset = NOW + 1_000.0
    early = solution(epoch=59_040.0 + 1_000.0, label="early", data_until_bmjd_tdb=NOW - 900.0)
    # A perfect one made from the episode itself must not speak.
    late = solution(
        epoch=onset + 40.0,
        label="late",
        epoch_error=0.1,
        period_error=0.1,
        epoch_cycle=1,
        data_until_bmjd_tdb=onset + 30.0,
    )
    (number,) = book.enter([record(early, rule=lag_rule())], at=NOW - 800.0)
    book.solution(number, late, onset + 50.0)
    book.rule(number, lag_rule(onset=-40.0, scatter_onset_d=0.1), onset + 60.0)
    book.point(number, onset + 20.0, onset + 21.0, 6.0)
    book.confirm(number, onset, onset + 70.0, error_d=2.0)
    (one,) = rehearsed(book, leads_d=(365.25,)).scored
    assert one.solution == "early"
    told = find(upcoming(record(early, rule=lag_rule()), now=onset - 365.25, draws=2000), "onset", 1)
    assert one.median_bmjd_tdb == pytest.approx(told.bmjd_tdb.median, abs=0.05)
    assert one.lo95_bmjd_tdb == pytest.approx(told.bmjd_tdb.lo95, abs=0.3)
    # Let in by its time of entry, the late one still is not by its data.
    any_time = rehearsed(book, leads_d=(365.25,), entered_any_time=True)
    assert [each.solution for each in any_time.scored] == ["early"]
    assert any("'late'" in text for text in any_time.hidden)


def test_of_solutions_nobody_knows_until_when_only_the_time_of_entry_tells(book):
    onset = NOW + 1_000.0
    (number,) = book.enter([record(solution(epoch=onset + 40.0 - 3000.0), rule=lag_rule())], at=NOW)
    book.confirm(number, onset, onset + 70.0)
    assert len(rehearsed(book, leads_d=(365.25,)).scored) == 1
    scores = rehearsed(book, leads_d=(1_500.0,))
    assert [one.code for one in scores.unscored] == ["nothing-known"]
    any_time = rehearsed(book, leads_d=(365.25,), entered_any_time=True)
    assert any_time.scored == ()
    assert "nobody said until when" in any_time.hidden[0]


def test_a_rehearsal_forecasts_each_episode_from_the_earlier_ones(book):
    dates = [50_000.0, 53_010.0, 55_990.0, 59_000.0]
    (number,) = book.enter([record(rule=DustRule(1, 1, "learned"))], at=49_000.0)
    for date in dates:
        book.confirm(number, date, date + 100.0, error_d=3.0)
    scores = rehearsed(book, leads_d=(90.0, 365.25))
    assert [(one.outcome.cycle, one.lead_asked_d) for one in scores.scored] == [
        (2, 90.0), (2, 365.25), (3, 90.0), (3, 365.25),
    ]  # fmt: skip
    assert {one.why for one in scores.unscored} == {
        "no solution and no episode was known by then", "no solution and one episode was known by then",
    }  # fmt: skip
    assert [group.outcomes for group in scores.groups] == [2, 2]
    # 53010 + 3010 = 56020: the calendar's forecast of cycle 2.
    third = scores.scored[0]
    assert third.reference_crps_d is not None
    assert third.median_bmjd_tdb == pytest.approx(56_020.0, abs=15.0)


def test_bad_rehearsals_say_what_to_do(book):
    book.enter([record(solution(), rule=lag_rule())])
    with pytest.raises(Conflict) as empty:
        rehearsed(book)
    assert empty.value.code == "nothing-to-rehearse" and "episodes find" in empty.value.hint
    with pytest.raises(NotFound):
        rehearse(book.db, "Lantern 9", NOW)
    for leads, code in (((0.0,), "lead-refused"), ((1e6,), "lead-refused"), ((90.0, 90.0), "lead-twice")):
        with pytest.raises(InputRefused) as refused:
            rehearsed(book, leads_d=leads)
        assert refused.value.code == code


def test_one_episode_alone_is_told_and_not_scored(book):
    (number,) = book.enter([record(rule=DustRule(1, 1, "learned"))], at=49_000.0)
    book.confirm(number, 50_000.0, 50_100.0, error_d=3.0)
    scores = rehearsed(book)
    assert scores.scored == () and scores.groups == ()
    assert [one.code for one in scores.unscored] == ["nothing-known"]


def test_moments_of_outcomes_are_those_of_the_catalogue(book, orbit):
    book.keep()
    book.confirm(orbit, ONSET_2 + 1.0, ONSET_2 + 5.0, error_d=None)
    (one,) = book.score().scored
    # An unknown error counts as none, and is told as unknown.
    assert one.outcome.minus_d is None
    assert one.outcome.bmjd_tdb == moment(ONSET_2 + 1.0).bmjd_tdb


def test_in_the_invented_sample_its_own_date_stands_for_the_day_it_was_begun(book, orbit):
    # Begun by a clock years ahead of its own date: nothing in it was entered after an event to come.
    from campaign.catalogue import info

    with book.writing(ONSET_2 + 500.0) as writing:
        begun = info.read_info(writing.connection)["begun_at"]
        info.set_info(writing, "sample_as_of", begun)
        info.set_info(writing, "begun_at", f"{2034 + int(begun[:4]) - 2031}{begun[4:]}")
    rule = replace(lag_rule(), note="set later by the clock")
    book.rule(orbit, rule, ONSET_2 + 600.0)
    book.keep(ONSET_2 + 601.0, as_of=NOW)
    book.confirm(orbit, ONSET_2 + 3.0, ONSET_2 + 700.0)
    assert [one.event for one in book.score().scored] == ["onset"]
