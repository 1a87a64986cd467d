"""What the network knows scatters about the truth, and each status holds by construction, for any seed."""

from __future__ import annotations

import math

import numpy as np
import pytest
from sample_checks import draws_of, excess_sigma, interval95, onset_draws, record_of
from scipy.stats import norm

from campaign.model.measured import Measured

SEEDS = (7, 1, 2, 3, 4, 5, 6, 8, 9, 10)


@pytest.fixture(scope="module", params=SEEDS)
def any_sample(package, request):
    return package.make_sample(seed=request.param)


def truth_of_solution(truth, solution):
    """Name, truth and estimate of every element with an error."""
    elements, cycle = truth.elements, truth.cycle(solution.epoch_cycle)
    epoch = {
        "periastron": cycle.periastron_bmjd_tdb,
        "onset": cycle.onset_bmjd_tdb,
        "maximum": cycle.maximum_bmjd_tdb,
    }[solution.epoch_marks]
    yield "epoch", epoch, Measured(solution.epoch.bmjd_tdb, solution.epoch.minus_d, solution.epoch.plus_d)
    turn = 180.0 if solution.omega_of == "A" else 0.0
    for name in ("period_d", "eccentricity", "inclination_deg", "node_deg", "k_a_kms", "k_b_kms",
                 "gamma_kms", "a_au", "a_arcsec"):  # fmt: skip
        estimate = getattr(solution, name)
        if isinstance(estimate, Measured):
            yield name, getattr(elements, name), estimate
    if solution.omega_deg is not None:
        wrapped = (solution.omega_deg.value - elements.omega_b_deg - turn + 180.0) % 360.0 - 180.0
        yield "omega_deg", 0.0, Measured(wrapped, solution.omega_deg.minus, solution.omega_deg.plus)


def pull(true, estimate):
    """How many sigma the truth lies from the estimate, by the error on its own side."""
    return (true - estimate.value) / (estimate.plus if true > estimate.value else estimate.minus)


def all_pulls(sample):
    for record, truth in zip(sample.records, sample.truth.systems, strict=True):
        for solution in record.solutions:
            for name, true, estimate in truth_of_solution(truth, solution):
                if estimate.error_known:
                    yield record.system.name, name, pull(true, estimate)
        for episode in record.episodes:
            if episode.state == "rejected":
                continue
            cycle = truth.cycle(0 if episode.cycle is None else episode.cycle)
            for stage in ("onset", "maximum", "end"):
                dated = getattr(episode, stage)
                if dated is not None:
                    moment = dated.moment
                    estimate = Measured(moment.bmjd_tdb, moment.minus_d, moment.plus_d)
                    yield record.system.name, stage, pull(getattr(cycle, f"{stage}_bmjd_tdb"), estimate)


def test_estimates_lie_within_five_sigma_of_the_truth(any_sample):
    for system, name, sigma in all_pulls(any_sample):
        assert abs(sigma) < 5.0, (system, name)


def test_estimates_are_not_the_truth(any_sample):
    pulls = [abs(sigma) for *_, sigma in all_pulls(any_sample)]
    assert np.median(pulls) > 0.3


def test_dated_episodes_scatter_like_a_normal_of_their_errors(package):
    # Property of the normal distribution: mean 0, standard deviation 1; clipped at 2.5 sigma, its variance is
    # 1 - 2Q - 5 phi + 12.5 Q.
    pulls = np.array(
        [
            sigma
            for seed in range(40, 80)
            for system, name, sigma in all_pulls(package.make_sample(seed=seed))
            if name in ("onset", "maximum", "end") and system != "Bellows 5"
        ]
    )
    assert abs(pulls.mean()) < 3.0 / math.sqrt(pulls.size)
    clipped = 1 - 2 * norm.sf(2.5) - 2 * 2.5 * norm.pdf(2.5) + 2 * 6.25 * norm.sf(2.5)
    assert pulls.std() == pytest.approx(math.sqrt(clipped), abs=3.0 / math.sqrt(2 * pulls.size))


def test_texts_of_epochs_read_as_the_epochs(any_sample):
    for record in any_sample.records:
        moments = [s.epoch for s in record.solutions]
        moments += [d.moment for e in record.episodes for d in (e.onset, e.maximum, e.end) if d]
        for moment in moments:
            number = moment.text.removeprefix("BJD ").split("±")[0].split(" ")[0]
            # JD = MJD + 2400000.5 (reference sheet, section 3)
            assert float(number) - 2400000.5 == pytest.approx(moment.bmjd_tdb, abs=1e-6)
            assert (moment.scale, moment.place) == ("tdb", "barycentre")


def test_under_way_has_a_confirmed_onset_of_the_last_weeks_and_no_end(any_sample):
    record, as_of = record_of(any_sample, "Bellows 5"), any_sample.as_of_bmjd_tdb
    current = record.episodes[-1]
    assert current.state == "confirmed" and current.maximum is None and current.end is None
    assert 0.0 < as_of - current.onset.moment.bmjd_tdb < 60.0
    cycle = any_sample.truth.of("Bellows 5").cycle(current.cycle)
    assert cycle.onset_bmjd_tdb < as_of < cycle.maximum_bmjd_tdb


def test_late_is_past_its_interval_with_monthly_quiet_points_through_it(any_sample):
    record, as_of = record_of(any_sample, "Tinder 12"), any_sample.as_of_bmjd_tdb
    low, _, high = interval95(onset_draws(record, 1))
    assert high < as_of - 30.0
    assert all(episode.cycle < 1 for episode in record.episodes)
    times, sigma = excess_sigma(any_sample.photometry[record.system.id])
    since = times > low - 30.0
    gaps = np.diff(np.concatenate([times[since], [as_of]]))
    assert gaps.max() < 45.0
    assert np.all(sigma[since] < 5.0) and not np.any((sigma[since][1:] > 3.0) & (sigma[since][:-1] > 3.0))
    assert any_sample.truth.of("Tinder 12").cycle(1).onset_bmjd_tdb > as_of


def test_unseen_is_past_its_interval_and_nobody_looked(any_sample):
    record, as_of = record_of(any_sample, "Hollow 2"), any_sample.as_of_bmjd_tdb
    low, _, high = interval95(onset_draws(record, 1))
    assert high < as_of
    assert any_sample.photometry[record.system.id].bmjd_tdb.max() < low
    onset = any_sample.truth.of("Hollow 2").cycle(1).onset_bmjd_tdb
    assert low - 10.0 < onset < high + 10.0


def test_suspected_shows_two_consecutive_excesses_and_nothing_confirmed(any_sample):
    record, as_of = record_of(any_sample, "Candlewood 5"), any_sample.as_of_bmjd_tdb
    times, sigma = excess_sigma(any_sample.photometry[record.system.id])
    assert np.all(sigma[-2:] > 3.0)
    assert times[-1] - times[-2] < 30.0
    assert sigma[-3] < 3.0
    assert all(e.onset.moment.bmjd_tdb < as_of - 3000.0 for e in record.episodes)
    assert any_sample.truth.of("Candlewood 5").cycle(1).onset_bmjd_tdb < times[-2]


def test_open_now_holds_the_sample_date_in_its_interval_and_is_quiet(any_sample):
    record, as_of = record_of(any_sample, "Sootfall 3"), any_sample.as_of_bmjd_tdb
    low, median, high = interval95(onset_draws(record, 1))
    assert low < as_of < high
    assert high - median > 1.3 * (median - low)
    times, sigma = excess_sigma(any_sample.photometry[record.system.id])
    assert as_of - times[-1] < 15.0
    recent = sigma[times > as_of - 400.0]
    assert np.all(recent < 5.0) and not np.any((recent[1:] > 3.0) & (recent[:-1] > 3.0))


def test_phase_is_lost_where_three_sigma_reach_half_a_period(any_sample):
    # Design, section 4: phase lost when 3 sigma(T_k) >= P/2.
    record, as_of = record_of(any_sample, "Flint 10"), any_sample.as_of_bmjd_tdb
    solution = record.solutions[0]
    period = solution.period_d
    cycles = math.ceil((as_of - solution.epoch.bmjd_tdb) / period.value)
    assert 3.0 * math.hypot(solution.epoch.plus_d, cycles * period.plus) >= 0.5 * period.value
    assert solution.eccentricity is None


def test_conflicting_solutions_disagree_by_several_sigma(any_sample):
    record = record_of(any_sample, "Brazier 6")
    first, second = record.solutions
    assert first.adopted and second.adopted and first.weight + second.weight == pytest.approx(1.0)
    dates = []
    for solution in (first, second):
        k = 1 - solution.epoch_cycle
        date = solution.epoch.bmjd_tdb + k * solution.period_d.value
        dates.append((date, math.hypot(solution.epoch.plus_d, k * solution.period_d.plus)))
    tension = (dates[0][0] - dates[1][0]) / math.hypot(dates[0][1], dates[1][1])
    assert 2.5 < abs(tension) < 6.0


def test_brink_leaves_it_open_whether_dust_forms_at_all(any_sample):
    # The pair never comes closer than a (1 - e): textbook.
    record = record_of(any_sample, "Brink 2")
    rng, solution = np.random.default_rng(3), record.solutions[0]
    nearest = draws_of(solution.a_au, rng) * (1.0 - draws_of(solution.eccentricity, rng))
    chance = np.mean(nearest < draws_of(record.rule.critical_separation_au, rng))
    assert 0.15 < chance < 0.85
    truth = any_sample.truth.of("Brink 2")
    assert truth.critical_separation_au == pytest.approx(
        truth.elements.a_au * (1.0 - truth.elements.eccentricity), rel=0.03
    )


def test_learned_systems_have_three_confirmed_onsets_or_more(any_sample):
    for name, with_orbit in (("Quill 9", True), ("Tallow 8", False)):
        record = record_of(any_sample, name)
        assert record.rule.kind == "learned"
        assert bool(record.solutions) is with_orbit
        assert sum(e.state == "confirmed" and e.onset is not None for e in record.episodes) >= 3
        assert all(e.cycle is not None for e in record.episodes)


def test_states_and_gaps_of_knowledge_are_as_told(any_sample):
    states = {record.system.name: record.system.state for record in any_sample.records}
    assert states["Marrow 4"] == "retired" and states["Hearth 9"] == "candidate"
    assert record_of(any_sample, "Hearth 9").solutions == ()
    anvil = record_of(any_sample, "Anvil 4").solutions[0]
    assert anvil.period_d.plus is None and anvil.epoch.plus_d is None and anvil.eccentricity is None
    cinder = record_of(any_sample, "Cinder 1")
    assert len([e for e in cinder.episodes if e.state == "confirmed"]) == 1
    assert record_of(any_sample, "Kettle 7").solutions[0].eccentricity.value > 0.8
    assert record_of(any_sample, "Thistle 2").solutions[0].eccentricity.value < 0.2


def test_the_next_five_years_are_rich(any_sample):
    as_of = any_sample.as_of_bmjd_tdb
    coming = {
        truth.name
        for truth, record in zip(any_sample.truth.systems, any_sample.records, strict=True)
        for cycle in truth.cycles
        if cycle.onset_bmjd_tdb is not None
        and as_of < cycle.onset_bmjd_tdb < as_of + 5 * 365.25
        and record.system.state == "episodic"
        and (record.solutions or record.episodes)
    }
    assert len(coming) >= 6
