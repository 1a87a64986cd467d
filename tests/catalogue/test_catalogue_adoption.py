"""One solution is adopted alone, or several with weights; never two without."""

from __future__ import annotations

import math

import pytest
from catalogue_examples import bare_system, full_solution, later
from sqlalchemy import insert

from campaign.catalogue import solutions, store, systems
from campaign.catalogue.tables import adoptions
from campaign.errors import Conflict, InputRefused


@pytest.fixture
def three(write):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        return system_id, [
            solutions.add_solution(writing, full_solution(system_id, label)) for label in ("a", "b", "c")
        ]


def adopted(database):
    with store.reading(database) as connection:
        found = solutions.load_solutions(connection, None, None)
    return {s.label: s.weight for group in found.values() for s in group if s.adopted}


def test_a_second_one_without_weights_is_refused_with_status_5(write, database, three):
    _, (a, b, _) = three
    with write() as writing:
        solutions.adopt_alone(writing, a)
    before = database.read_bytes()
    with pytest.raises(Conflict) as refused, write() as writing:
        solutions.adopt_alone(writing, b)
    assert refused.value.exit_status == 5
    assert refused.value.code == "already-adopted"
    assert "'a'" in refused.value.why
    assert database.read_bytes() == before


def test_adopting_the_same_again_changes_nothing(write, database, three):
    _, (a, _, _) = three
    with write() as writing:
        solutions.adopt_alone(writing, a)
    before = database.read_bytes()
    with write(later(1)) as writing:
        solutions.adopt_alone(writing, a)
        assert not writing.changed
    assert database.read_bytes() == before


def test_one_takes_the_place_of_all_others(write, database, three):
    system_id, (a, b, c) = three
    with write() as writing:
        solutions.adopt_weighted(writing, system_id, {a: 0.2, b: 0.8})
    assert adopted(database) == {"a": 0.2, "b": 0.8}
    with write() as writing:
        solutions.adopt_instead(writing, c)
    assert adopted(database) == {"c": None}


def test_weights_are_the_whole_truth_from_then_on(write, database, three):
    system_id, (a, b, c) = three
    with write() as writing:
        solutions.adopt_alone(writing, a)
    with write() as writing:
        solutions.adopt_weighted(writing, system_id, {a: 0.5, b: 0.5})
    with write() as writing:
        solutions.adopt_weighted(writing, system_id, {b: 0.5, c: 2.0})
    assert adopted(database) == {"b": 0.5, "c": 2.0}
    with store.reading(database) as connection:
        kept = connection.execute(adoptions.select().where(adoptions.c.solution_id == b)).all()
    assert len(kept) == 1


@pytest.mark.parametrize("weight", [0.0, -1.0, math.nan, math.inf])
def test_a_weight_is_a_number_above_zero(weight, write, three):
    system_id, (a, b, _) = three
    with pytest.raises(InputRefused), write() as writing:
        solutions.adopt_weighted(writing, system_id, {a: 1.0, b: weight})


def test_the_database_itself_holds_one_unweighted_adoption_and_one_for_each_solution(write, three):
    system_id, (a, b, _) = three
    with write() as writing:
        solutions.adopt_alone(writing, a)
    for solution_id, weight in ((b, None), (a, 0.5)):
        row = {"system_id": system_id, "solution_id": solution_id, "weight": weight, "adopted_at": later(1)}
        with pytest.raises(Conflict) as refused, write() as writing:
            writing.connection.execute(insert(adoptions), row)
        assert refused.value.code == "not-unique"


def test_the_cycle_of_an_epoch_is_set_and_journalled(write, database, three):
    system_id, (a, _, _) = three
    with write() as writing:
        assert solutions.set_epoch_cycle(writing, a, 12, -4)
        assert not solutions.set_epoch_cycle(writing, a, 12, -4)
        assert systems.set_cycle_anchor(writing, system_id, 61234.5, 3127.5)
    with store.reading(database) as connection:
        found = solutions.find_solution(connection, system_id, "A")
        system = systems.get_system(connection, system_id)
    assert (found.epoch_cycle, found.published_cycle_offset) == (12, -4)
    assert (system.cycle_anchor_bmjd_tdb, system.cycle_anchor_period_d) == (61234.5, 3127.5)
