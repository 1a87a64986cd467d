"""What the dated episodes of a system say of its clock. Sources stand beside each expectation."""

from __future__ import annotations

from dataclasses import replace
from functools import lru_cache

import numpy as np
import pytest

from campaign.errors import Conflict, InputRefused, NotFound
from campaign.model.instants import Moment
from campaign.model.measured import Covariance, Measured
from campaign.model.records import SystemRecord
from campaign.model.systems import DatedEvent, DustRule, Episode, Solution, System
from campaign.studies.preparing import Question, prepare
from campaign.studies.refine import Refined, RefineQuestion, refine
from campaign.studies.refine_orbit import combine
from campaign.studies.sample import load_sample
from campaign.studies.watch import Campaign, load_sample_campaign

NOW = 61_000.0
SYSTEM = System(1, "Invented", 270.0, -45.0)


def dated(instant: float, error: float | None = 8.0, text: str = "") -> DatedEvent:
    return DatedEvent(Moment(instant, error, error, text), "K")


def onsets(*instants: float, error: float | None = 8.0) -> tuple[Episode, ...]:
    return tuple(Episode(n, 1, None, onset=dated(t, error)) for n, t in enumerate(instants, start=1))


def asked(
    episodes: tuple[Episode, ...], solutions: tuple[Solution, ...] = (), rule: DustRule | None = None,
    **words: object,
) -> Refined:  # fmt: skip
    campaign = Campaign((SystemRecord(SYSTEM, solutions, rule, episodes),), {})
    return refine(campaign, replace(RefineQuestion(NOW), **words))  # type: ignore[arg-type]


def orbit(period: float, sigma: float | None, **words: object) -> Solution:
    base = Solution(
        1, 1, "orbit", period_d=Measured(period, sigma, sigma), epoch=Moment(50_020.0, 10.0, 10.0),
        eccentricity=Measured(0.6, 0.02, 0.02), adopted=True, epoch_cycle=0,
    )  # fmt: skip
    return replace(base, **words)  # type: ignore[arg-type]


# The truth of the sample is its own file's: an invented campaign whose generator knows nothing of the fit.
SAMPLED = [
    "Thistle 2", "Quill 9", "Tallow 8", "Brazier 6",
    *(
        pytest.param(name, marks=pytest.mark.slow)
        for name in ("Kettle 7", "Bellows 5", "Flint 10", "Tinder 12", "Hollow 2", "Candlewood 5", "Brink 2")
    ),
]  # fmt: skip


@lru_cache(maxsize=20)
def sampled(name: str) -> Refined:
    campaign = load_sample_campaign([name])
    assert campaign.own_as_of is not None
    return refine(campaign, RefineQuestion(campaign.own_as_of))


@pytest.mark.parametrize("name", SAMPLED)
def test_the_samples_true_period_and_count_are_recovered(name: str) -> None:
    truth = next(one for one in load_sample().truth.systems if one.name == name)
    result = sampled(name).result
    assert result.ephemeris is not None
    period = result.ephemeris.period_d
    assert period.sigma is not None
    assert abs(period.value - truth.elements.period_d) < 2.5 * period.sigma
    true_onsets = {cycle.cycle: cycle.onset_bmjd_tdb for cycle in truth.cycles}
    for row in result.dates:
        assert abs(row.bmjd_tdb - true_onsets[row.cycle]) < 5.0 * max(row.minus_d, row.plus_d)
    # Every alias was watched for and not seen: where more than one count is open, the true one is taken.
    assert result.counts[result.chosen - 1].against_orbit_sigma is None or (
        abs(result.counts[result.chosen - 1].against_orbit_sigma) < 3.0
    )
    assert all(one.excluded for one in result.counts if one.divisor > 1 and one.number != result.chosen)


# The last of the list, Brink 2, has a cycle without an episode next.
@pytest.mark.parametrize("name", SAMPLED[:-1])
def test_the_samples_next_onset_lies_in_the_interval(name: str) -> None:
    truth = next(one for one in load_sample().truth.systems if one.name == name)
    result = sampled(name).result
    following = {c.cycle: c.onset_bmjd_tdb for c in truth.cycles}.get(result.next_cycle)
    assert result.next_event is not None and result.next_event.lo95 is not None
    assert following is not None
    # Ten intervals of 95 %: one may miss by a little.
    room = 0.25 * (result.next_event.hi95 - result.next_event.lo95)
    assert result.next_event.lo95 - room < following < result.next_event.hi95 + room


def test_an_unconfirmed_burst_is_pointed_out_where_a_cycle_has_no_episode() -> None:
    # Tallow 8: "four dated episodes, one of five missed" is its story in the sample.
    result = sampled("Tallow 8").result
    (missed,) = result.counts[0].missed
    assert (missed.cycle, missed.verdict) == (1, "excess")


def test_without_observations_aliases_stay_open_and_are_told() -> None:
    result = asked(onsets(45_000.0, 51_000.0, 54_000.0)).result
    aliases = [one for one in result.counts if one.divisor > 1]
    assert aliases and not any(one.excluded for one in aliases)
    assert result.counts[0].cycles == (0, 2, 3)
    assert any("other ways to count remain" in warning for warning in result.warnings)
    assert any("no photometry" in assumption for assumption in result.assumptions)


def test_an_orbit_decides_between_counts_that_observations_leave_open() -> None:
    result = asked(onsets(44_000.0, 50_000.0, 53_000.0), (orbit(1_498.0, 5.0),)).result
    assert result.ephemeris is not None
    assert result.ephemeris.period_d.value == pytest.approx(1_500.0, abs=5.0)
    assert not result.counts[0].excluded
    asked_for = asked(onsets(44_000.0, 50_000.0, 53_000.0), count=1).result
    assert asked_for.ephemeris is not None
    assert asked_for.ephemeris.period_d.value == pytest.approx(3_000.0, abs=15.0)


def test_a_combination_is_the_weighted_mean_of_the_periods() -> None:
    # Two independent normal measurements of one quantity (common practice, no source).
    found = asked(onsets(50_000.0, 53_000.0, 56_010.0, 59_000.0), (orbit(3_010.0, 20.0),))
    own = found.result.ephemeris
    assert own is not None and found.proposal is not None
    sigma = own.period_d.sigma or 0.0
    weights = np.array([sigma, 20.0]) ** -2.0
    period = found.proposal.period_d
    assert isinstance(period, Measured)
    assert period.value == pytest.approx(weights @ [own.period_d.value, 3_010.0] / weights.sum(), rel=1e-9)
    assert period.sigma == pytest.approx(weights.sum() ** -0.5, rel=1e-9)
    comparison = found.result.orbit
    assert comparison is not None
    assert comparison.period_tension_sigma == pytest.approx(
        (own.period_d.value - 3_010.0) / np.hypot(sigma, 20.0), rel=1e-9
    )
    assert found.proposal.epoch == orbit(3_010.0, 20.0).epoch
    assert found.proposal.eccentricity == Measured(0.6, 0.02, 0.02)


def test_an_epoch_moves_with_the_period_as_their_covariance_says() -> None:
    # The conditional mean of a binormal distribution (common practice, no source).
    matrix = ((100.0, 150.0), (150.0, 400.0))
    tied = orbit(3_010.0, 20.0, covariance=Covariance(("epoch", "period_d"), matrix))
    own = asked(onsets(50_000.0, 53_000.0, 56_010.0, 59_000.0)).result.ephemeris
    assert own is not None
    variance = (own.period_d.sigma or 0.0) ** 2
    found = combine(own, tied)
    assert found is not None and found.epoch_bmjd_tdb is not None
    precision = np.linalg.inv(np.array(matrix)) + np.diag([0.0, 1.0 / variance])
    expected = np.linalg.inv(precision)
    shift = expected @ np.array([0.0, (own.period_d.value - 3_010.0) / variance])
    assert found.epoch_bmjd_tdb.value == pytest.approx(50_020.0 + shift[0], rel=1e-12)
    assert found.epoch_bmjd_tdb.sigma == pytest.approx(np.sqrt(expected[0, 0]), rel=1e-9)
    assert found.covariance_d2 == pytest.approx(expected[0, 1], rel=1e-9)
    assert found.period_d.sigma == pytest.approx(np.sqrt(expected[1, 1]), rel=1e-9)


def test_periods_that_disagree_are_not_averaged() -> None:
    found = asked(onsets(50_000.0, 53_000.0, 56_010.0, 59_000.0), (orbit(3_600.0, 5.0),))
    assert found.result.orbit is not None and "disagree" in found.result.orbit.note
    assert found.result.orbit.combined_period_d is None
    assert any("disagree" in warning for warning in found.result.warnings)
    assert found.proposal is not None and found.result.ephemeris is not None
    assert found.proposal.period_d == found.result.ephemeris.period_d


def test_a_fitted_solution_is_never_counted_beside_its_own_episodes() -> None:
    episodes = onsets(50_000.0, 53_000.0, 56_010.0, 59_000.0)
    rule = DustRule(0, 1, "learned")
    proposal = asked(episodes, rule=rule).proposal
    assert proposal is not None and proposal.source == "fitted from episodes"
    adopted = replace(proposal, id=7, adopted=True)
    again = asked(episodes, (adopted,), rule)
    assert again.result.orbit is None
    # The forecast that learns from the episodes takes no period from the same episodes as prior knowledge.
    question = Question(NOW, NOW, NOW + 4_000.0)
    plain, fitted = (
        prepare([SystemRecord(SYSTEM, solutions, rule, episodes)], {}, question).learned[0]
        for solutions in ((), (adopted,))
    )
    assert fitted.period_d is None
    assert fitted.predict("onset", 4).sigma_d == pytest.approx(plain.predict("onset", 4).sigma_d, rel=1e-9)


def test_two_episodes_give_a_period_whose_error_counts_scatter_and_dates() -> None:
    result = asked(onsets(50_000.0, 53_000.0)).result
    assert result.ephemeris is not None and result.ephemeris.prior_used
    # The dates alone: sqrt(2) times 8 d; the scatter, 1 % of the period, comes on top for both.
    assert result.line is not None
    assert result.line.period_d.sigma == pytest.approx(8.0 * np.sqrt(2.0), rel=1e-9)
    assert (result.ephemeris.period_d.sigma or 0.0) > np.sqrt(2.0) * np.hypot(8.0, 20.0)
    assert any(warning.startswith("two episodes") for warning in result.warnings)


def test_one_episode_gives_a_limit_and_a_chance_a_year() -> None:
    campaign = load_sample_campaign(["Cinder 1"])
    assert campaign.own_as_of is not None
    found = refine(campaign, RefineQuestion(campaign.own_as_of))
    single = found.result.single
    assert single is not None and found.proposal is None
    truth = next(one for one in load_sample().truth.systems if one.name == "Cinder 1")
    assert single.at_least_d is not None and single.at_least_d < truth.elements.period_d
    assert single.at_least_d > 0.9 * single.elapsed_d
    # Gott 1993: t / (T + t) after a wait of T without another one.
    assert single.probability_per_yr == pytest.approx(365.25 / (single.elapsed_d + 365.25), rel=0.25)
    bare = asked(onsets(50_000.0)).result.single
    assert bare is not None
    assert (bare.at_least_d, bare.probability_per_yr) == (None, None)


def test_dates_of_a_whole_year_or_month_are_brackets() -> None:
    # A calendar year is 365 or 366 d wide, as typed; its standard deviation is the width over sqrt(12).
    years = ((48_074.5, 365.0, "1990"), (51_727.0, 366.0, "2000"), (55_379.5, 365.0, "2010"))
    episodes = tuple(
        Episode(n, 1, None, onset=dated(t, width / np.sqrt(12.0), text))
        for n, (t, width, text) in enumerate(years, start=1)
    )
    result = asked(episodes).result
    assert all(row.bracketed for row in result.dates)
    assert [row.plus_d for row in result.dates] == pytest.approx([182.5, 183.0, 182.5])
    assert result.ephemeris is not None
    period = result.ephemeris.period_d
    assert abs(period.value - 3_652.5) < 100.0
    assert 50.0 < (period.sigma or 0.0) < 200.0


def test_dates_without_an_error_get_one_and_it_is_said() -> None:
    result = asked(onsets(50_000.0, 53_000.0, 56_000.0, error=None)).result
    assert all(row.error_assumed for row in result.dates)
    # 0.5 % of the gap, as for the rule 'learned'.
    assert result.dates[0].plus_d == pytest.approx(15.0)
    assert any("without an error" in assumption for assumption in result.assumptions)


def test_maxima_are_used_with_their_offset_and_alone() -> None:
    episodes = tuple(
        Episode(n, 1, None, onset=dated(t), maximum=dated(t + 120.0))
        for n, t in enumerate((50_000.0, 53_005.0, 55_990.0, 59_000.0), start=1)
    )
    both = asked(episodes, event="both").result
    assert both.ephemeris is not None and both.ephemeris.maximum_after_onset_d is not None
    assert abs(both.ephemeris.maximum_after_onset_d.value - 120.0) < 15.0
    alone = asked(episodes, event="maximum")
    assert alone.result.ephemeris is not None and alone.result.ephemeris.event == "maximum"
    assert alone.proposal is not None and alone.proposal.epoch_marks == "maximum"
    only_maxima = tuple(replace(e, onset=None) for e in episodes)
    assert asked(only_maxima).result.events == ("maximum",)
    with pytest.raises(InputRefused, match="no confirmed episode"):
        asked(only_maxima, event="onset")


def test_a_change_of_period_is_kept_only_when_it_is_clear() -> None:
    cycles = np.arange(9.0)
    steady = 40_000.0 + 2_000.0 * cycles + np.array([3.0, -5, 4, -2, 1, 5, -4, 2, -3])
    found = asked(onsets(*steady), curved=True).result.change_of_period
    assert found is not None and not found.kept
    growing = steady + 0.5 * 4.0 * cycles**2
    kept = asked(onsets(*growing, error=3.0), curved=True).result
    assert kept.change_of_period is not None and kept.change_of_period.kept
    size = kept.change_of_period.change_d_per_cycle
    assert size is not None and abs(size.value - 4.0) < 3.0 * (size.sigma or 0.0)
    few = asked(onsets(*steady[:4]), curved=True).result.change_of_period
    assert few is not None and few.change_d_per_cycle is None and "needs" in few.why


def test_later_episodes_are_hidden_by_the_date_of_the_question() -> None:
    campaign = Campaign((SystemRecord(SYSTEM, (), None, onsets(50_000.0, 53_000.0, 56_000.0)),), {})
    assert refine(campaign, RefineQuestion(55_000.0)).result.episodes == 2


def test_what_cannot_be_refined_is_refused() -> None:
    with pytest.raises(InputRefused, match="no confirmed episode"):
        asked(())
    with pytest.raises(InputRefused) as proposed:
        asked((Episode(4, 1, None, state="proposed", onset=dated(50_000.0)),))
    assert "episodes confirm 4" in proposed.value.hint
    over = (
        Episode(1, 1, None, onset=dated(50_000.0), end=dated(50_300.0)),
        Episode(2, 1, None, onset=dated(50_200.0), end=dated(50_400.0)),
    )
    with pytest.raises(Conflict, match="lie over each other"):
        asked(over)
    with pytest.raises(InputRefused, match="no way 99"):
        asked(onsets(50_000.0, 53_000.0), count=99)
    with pytest.raises(NotFound):
        asked(onsets(50_000.0, 53_000.0), orbit="nowhere")
