"""What was known then: entries made later are hidden, and what held then counts."""

from __future__ import annotations

from dataclasses import replace

import pytest
from catalogue_examples import (
    FIRST,
    bare_system,
    full_episode,
    full_rule,
    full_solution,
    later,
    limit_solution,
    photometry,
)

from campaign.catalogue import episodes, observations, records, rules, solutions, store, systems
from campaign.errors import Conflict, NotFound
from campaign.model.measured import Measured


@pytest.fixture
def system_id(write):
    with write() as writing:
        return systems.add_system(writing, bare_system("Dim"))


def test_a_solution_entered_later_is_hidden(write, database, system_id):
    with write(later(10)) as writing:
        solutions.add_solution(writing, full_solution(system_id))
    with store.reading(database) as connection:
        assert records.load_records(connection, known_at=later(9.99))[0].solutions == ()
        assert len(records.load_records(connection, known_at=later(10))[0].solutions) == 1
        with pytest.raises(NotFound):
            solutions.find_solution(connection, system_id, "Orrery 2029", known_at=FIRST)


def test_what_was_adopted_then_counts(write, database, system_id):
    with write(later(0)) as writing:
        old = solutions.add_solution(writing, full_solution(system_id, "old"))
        new = solutions.add_solution(writing, full_solution(system_id, "new"))
        solutions.adopt_alone(writing, old)
    with write(later(10)) as writing:
        solutions.adopt_instead(writing, new)
    with write(later(20)) as writing:
        solutions.adopt_weighted(writing, system_id, {old: 1.0, new: 3.0})
    with write(later(30)) as writing:
        solutions.end_adoption(writing, old)

    def adopted(known_at):
        with store.reading(database) as connection:
            found = solutions.solutions_of(connection, system_id, known_at=known_at)
        return {solution.label: solution.weight for solution in found if solution.adopted}

    assert adopted(later(5)) == {"old": None}
    assert adopted(later(10)) == {"new": None}
    assert adopted(later(20)) == {"old": 1.0, "new": 3.0}
    assert adopted(later(30)) == {"new": 3.0}
    assert adopted(None) == {"new": 3.0}


def test_the_rule_in_force_then_counts(write, database, system_id):
    lag = replace(full_rule(system_id), kind="lag", note="first")
    with write(later(1)) as writing:
        rules.set_rule(writing, lag)
    with write(later(2)) as writing:
        rules.set_rule(writing, full_rule(system_id))
    with write(later(3)) as writing:
        assert rules.end_rule(writing, system_id)
        assert not rules.end_rule(writing, system_id)

    def kind(known_at):
        with store.reading(database) as connection:
            rule = rules.rule_of(connection, system_id, known_at=known_at)
        return None if rule is None else rule.kind

    assert [kind(later(days)) for days in (0, 1, 1.5, 2, 2.5, 3)] == [
        None,
        "lag",
        "lag",
        "separation",
        "separation",
        None,
    ]
    assert kind(None) is None


def test_an_episode_was_a_proposal_before_it_was_confirmed(write, database, system_id):
    with write(later(1)) as writing:
        proposed = replace(full_episode(system_id), state="proposed")
        episode_id = episodes.add_episode(writing, proposed)
    with write(later(2)) as writing:
        assert episodes.decide_episode(writing, episode_id, "confirmed")
        assert not episodes.decide_episode(writing, episode_id, "confirmed")
    with write(later(3)) as writing:
        amended = episodes.amend_episode(writing, episode_id, replace(full_episode(system_id), cycle=7))
    with write(later(4)) as writing:
        episodes.withdraw_episode(writing, amended)

    def states(known_at):
        with store.reading(database) as connection:
            found = episodes.episodes_of(connection, system_id, known_at=known_at)
        return [(episode.state, episode.cycle) for episode in found]

    assert states(later(0)) == []
    assert states(later(1.5)) == [("proposed", -1)]
    assert states(later(2)) == [("confirmed", -1)]
    assert states(later(3)) == [("confirmed", 7)]
    assert states(later(4)) == []
    assert states(None) == []


def test_a_withdrawn_or_unknown_episode_cannot_be_changed(write, system_id):
    with write() as writing:
        episode_id = episodes.add_episode(writing, full_episode(system_id))
        episodes.withdraw_episode(writing, episode_id)
        with pytest.raises(Conflict):
            episodes.decide_episode(writing, episode_id, "rejected")
        with pytest.raises(NotFound):
            episodes.withdraw_episode(writing, 99)


def test_observations_are_hidden_by_date_and_by_entry(write, database, system_id):
    with write(later(1)) as writing:
        first, _ = observations.add_observation(writing, photometry(system_id, 61500.0))
        wrong, _ = observations.add_observation(writing, photometry(system_id, 61510.0))
    with write(later(2)) as writing:
        better = photometry(system_id, 61510.0, value=Measured(9.9, 0.01, 0.01))
        right = observations.supersede_observation(writing, wrong, better)
    with write(later(3)) as writing:
        observations.withdraw_observation(writing, first)

    def numbers(**cutoffs):
        with store.reading(database) as connection:
            found = observations.observations_of(connection, **cutoffs)
            arrays = observations.photometry_arrays(connection, **cutoffs)
        assert [entry.id for entry in found] == [n for a in arrays.values() for n in a.id]
        return [entry.id for entry in found]

    assert numbers(known_at=FIRST) == []
    assert numbers(known_at=later(1)) == [first, wrong]
    assert numbers(known_at=later(2)) == [first, right]
    assert numbers(known_at=later(3)) == [right]
    assert numbers() == [right]
    assert numbers(known_at=later(1), as_of_bmjd_tdb=61505.0) == [first]
    assert numbers(as_of_bmjd_tdb=61510.0) == [right]
    assert numbers(as_of_bmjd_tdb=61509.9) == []


def test_a_solution_entered_and_adopted_at_one_instant_is_adopted_at_that_instant(write, database, system_id):
    with write(later(1)) as writing:
        solution_id = solutions.add_solution(writing, limit_solution(system_id))
        solutions.adopt_alone(writing, solution_id)
    with store.reading(database) as connection:
        (record,) = records.load_records(connection, [system_id], later(1))
    assert record.solutions[0].adopted
    assert record.solutions[0].weight is None
