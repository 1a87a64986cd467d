"""How an undo goes about it, and how the catalogue looks afterwards, now and as it was known before.

Common practice of a journal, no source.
"""

from __future__ import annotations

import sqlite3

import pytest

from campaign.catalogue import episodes, journal, observations, sites, store, tables
from campaign.errors import Conflict, NotFound
from campaign.model.systems import Site
from campaign.studies import undo

# ------------------------------------------------------------------ in which order


def test_what_was_done_last_is_taken_back_first(keeper):
    def work(writing):
        for name in ("Cold Mesa", "Harrow Pass", "Far Ridge"):
            sites.add_site(writing, Site(0, name, latitude_deg=-31.0, longitude_deg_east=-70.0))

    taken_back = keeper.undo(keeper.catalogue(work, "three sites"))
    with store.reading(keeper.db) as connection:
        effects = journal.effects_of(connection, taken_back)
    assert [effect.row_id for effect in effects] == [3, 2, 1]


def test_names_that_changed_places_change_them_back(keeper):
    swapped = keeper.change("Dim", name="Gleam", aliases=("Dim",))
    assert keeper.names()[0] == ("Gleam", "Dim")
    back = keeper.undo(swapped)
    assert keeper.names()[0] == ("Dim", "Gleam")
    keeper.undo(back)
    assert keeper.names()[0] == ("Gleam", "Dim")


def test_a_correction_and_what_it_replaced_are_never_in_use_together(keeper):
    keeper.log("Dim", 1)
    amended = keeper.amend(1, 7.5)
    without = keeper.undo(amended)
    assert keeper.values() == {1: 7.0}
    keeper.undo(without)
    assert keeper.values() == {2: 7.5}


def test_a_mixture_is_put_back_as_it_was(keeper):
    for label in ("first", "second"):
        keeper.solution("Dim", label)
    keeper.adopt("Dim", {"first": 1.0, "second": 3.0})
    alone = keeper.adopt("Dim", "second")
    keeper.undo(alone)
    adopted = {s.label: s.weight for s in keeper.record("Dim").solutions if s.adopted}
    assert adopted == {"first": 1.0, "second": 3.0}


# ------------------------------------------------------------------ past the journal


@pytest.mark.parametrize(
    ("prepare", "statement"),
    [
        (lambda keeper: keeper.change("Dim", priority=1), "UPDATE systems SET priority = 7 WHERE id = 1"),
        (
            lambda keeper: keeper.undo(keeper.undo(keeper.site("Cold Mesa"))),
            "UPDATE sites SET withdrawn_at = '2031-05-01T00:00:00.000000Z'",
        ),
        (
            lambda keeper: keeper.undo(keeper.load("Dim", range(3))),
            "UPDATE observations SET withdrawn_at = '2031-05-01T00:00:00.000000Z' WHERE id = 2",
        ),
        (
            lambda keeper: keeper.undo(keeper.load("Dim", range(3))),
            "DELETE FROM observations WHERE id = 2",
        ),
    ],
)
def test_what_was_changed_past_the_journal_is_not_guessed_at(keeper, prepare, statement):
    number = prepare(keeper)
    connection = sqlite3.connect(keeper.db)
    connection.execute(statement)
    connection.commit()
    connection.close()
    with pytest.raises(Conflict) as refused:
        undo.undo(keeper.db, keeper.stamp(), number)
    assert refused.value.code == "changed-outside"
    assert "without a line in the journal" in refused.value.why
    assert keeper.newest() == number


def test_an_entry_that_no_operation_explains_holds_back_too(keeper):
    system = keeper.system("Glow")
    connection = sqlite3.connect(keeper.db)
    connection.execute("INSERT INTO stars (system_id, star, spectral_type) VALUES (3, 'B', 'O5')")
    connection.commit()
    connection.close()
    uses = "uses the system that this operation entered"
    assert keeper.refused(system) == {None: uses}
    with pytest.raises(Conflict) as refused:
        undo.preview_undo(keeper.db, "Ida Vik", system)
    assert refused.value.why == f"An entry that no operation explains {uses}."
    assert refused.value.hint == "Look at what happened since: campaign history."


# ------------------------------------------------------------------ which operation


def test_without_a_number_it_is_ones_own_last_that_stands(keeper):
    mine = keeper.log("Dim", 1)
    other = keeper.log("Dim", 2, band="J")
    by_other = keeper.undo(other, who="Tor Asp")
    with pytest.raises(NotFound) as nothing:
        undo.undo(keeper.db, keeper.stamp("Tor Asp"), None)
    assert nothing.value.code == "nothing-to-undo"
    preview = undo.preview_undo(keeper.db, "ida vik", None)
    assert preview.operation.id == mine
    keeper.undo(None)
    with pytest.raises(Conflict) as taken_back:
        undo.undo(keeper.db, keeper.stamp(), other)
    assert taken_back.value.code == "already-undone"
    assert taken_back.value.hint == f"To put it back: campaign undo {by_other}."


def test_what_was_put_back_is_the_last_of_whoever_put_it_back(keeper):
    logged = keeper.log("Dim", 1)
    keeper.log("Dim", 2)
    again = keeper.undo(keeper.undo(logged))
    preview = undo.preview_undo(keeper.db, "Ida Vik", None)
    assert (preview.operation.id, preview.first.id, preview.puts_back) == (again, logged, False)


def test_an_old_operation_is_known_by_its_first_number(keeper):
    logged = keeper.log("Dim", 1)
    again = keeper.undo(keeper.undo(logged))
    assert undo.preview_undo(keeper.db, "Ida Vik", logged).operation.id == again
    keeper.undo(logged)
    assert keeper.values() == {}


# ------------------------------------------------------------------ what was known when


def test_what_was_taken_back_is_known_to_have_been_there(keeper):
    keeper.load("Dim", range(3))
    then = keeper.clock
    loaded = keeper.newest()
    without = keeper.undo(loaded)
    between = keeper.clock
    keeper.undo(without)
    assert len(keeper.values(then)) == 3
    assert keeper.values(between) == {}
    assert len(keeper.values()) == 3
    # A second time: two lapses of the same entries.
    second = keeper.undo(loaded)
    later = keeper.clock
    keeper.undo(second)
    assert keeper.values(between) == keeper.values(later) == {}
    assert len(keeper.values(keeper.clock)) == 3


@pytest.mark.parametrize(
    ("enter", "seen"),
    [
        (lambda keeper: keeper.log("Dim", 1), lambda keeper, at: keeper.values(at)),
        (
            lambda keeper: keeper.solution("Dim", "first"),
            lambda keeper, at: keeper.record("Dim", at).solutions,
        ),
        (lambda keeper: keeper.episode("Dim", 1), lambda keeper, at: keeper.record("Dim", at).episodes),
        (lambda keeper: keeper.rule("Dim", -10.0), lambda keeper, at: keeper.record("Dim", at).rule),
    ],
)
def test_an_entry_was_out_of_use_while_it_was_taken_back(keeper, enter, seen):
    before = keeper.clock
    entered = enter(keeper)
    there = keeper.clock
    without = keeper.undo(entered)
    gone = keeper.clock
    keeper.undo(without)
    assert not seen(keeper, before)
    assert not seen(keeper, gone)
    assert seen(keeper, there) and seen(keeper, there) == seen(keeper, keeper.clock) == seen(keeper, None)


def test_a_correction_taken_back_leaves_each_version_its_time(keeper):
    keeper.log("Dim", 1)
    first = keeper.clock
    amended = keeper.amend(1, 7.5)
    better = keeper.clock
    without = keeper.undo(amended)
    back = keeper.clock
    keeper.undo(without)
    assert [keeper.values(at) for at in (first, better, back, None)] == [
        {1: 7.0}, {2: 7.5}, {1: 7.0}, {2: 7.5},
    ]  # fmt: skip


def test_a_decision_taken_back_was_a_decision_until_then(keeper):
    keeper.episode("Dim", 1)
    proposed = keeper.clock
    confirmed = keeper.decide(1, "confirmed")
    decided = keeper.clock
    keeper.undo(confirmed)
    states = [keeper.record("Dim", at).episodes[0].state for at in (proposed, decided, None)]
    assert states == ["proposed", "confirmed", "proposed"]


# ------------------------------------------------------------------ many rows


@pytest.mark.parametrize("portion", [1, 3, 10, 11, 50_000])
def test_a_load_is_taken_back_in_portions_and_each_is_told(keeper, monkeypatch, portion):
    keeper.log("Faint", 1)
    loaded = keeper.load("Dim", range(10))
    keeper.log("Faint", 2)
    monkeypatch.setattr(store, "_PORTION", portion)
    for left in (2, 12, 2):
        heard: list[tuple[str, int, int | None]] = []
        undone = undo.undo(keeper.db, keeper.stamp(), loaded, lambda *words: heard.append(words))  # noqa: B023
        loaded = undone.by_id
        assert len(keeper.values()) == left
        *portions, last = heard
        assert [done for _, done, _ in portions] == [
            min(n, 10) for n in range(portion, 10 + portion, portion)
        ]
        assert {(stage, total) for stage, _, total in portions} == {("undoing", 10)}
        assert last == ("finishing", 0, None)


def test_a_load_with_its_own_site_goes_and_comes_with_it_again_and_again(keeper):
    def work(writing):
        sites.add_site(writing, Site(0, "Cold Mesa", latitude_deg=-31.0, longitude_deg_east=-70.0))
        points = [keeper.point(writing, "Dim", day, site="Cold Mesa") for day in range(5)]
        observations.add_observations(writing, points)

    number = keeper.catalogue(work, "loaded a site and what was seen there")
    for left in (0, 5, 0, 5, 0):
        number = keeper.undo(number)
        assert len(keeper.values()) == left
    keeper.site("Cold Mesa")


def test_an_interrupt_between_portions_leaves_all_as_it_was(keeper, monkeypatch):
    loaded = keeper.load("Dim", range(10))
    monkeypatch.setattr(store, "_PORTION", 3)
    before = keeper.newest()

    def told(stage, done, total):
        if done >= 6:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        undo.undo(keeper.db, keeper.stamp(), loaded, told)
    assert len(keeper.values()) == 10
    assert keeper.newest() == before
    keeper.undo(loaded)
    assert keeper.values() == {}


def test_an_observation_entered_beside_a_load_goes_and_comes_with_it(keeper):
    def work(writing):
        observations.add_observations(writing, [keeper.point(writing, "Dim", day) for day in range(3)])
        observations.add_observation(writing, keeper.point(writing, "Faint", 1))

    number = keeper.catalogue(work, "a load and one more")
    for left in (0, 4, 0, 4):
        number = keeper.undo(number)
        assert len(keeper.values()) == left


def test_what_one_command_changed_twice_goes_back_to_where_it_began(keeper):
    keeper.episode("Dim", 1)

    def work(writing):
        episodes.decide_episode(writing, 1, "confirmed")
        episodes.decide_episode(writing, 1, "rejected")
        number = sites.add_site(writing, Site(0, "Cold Mesa", latitude_deg=-31.0, longitude_deg_east=-70.0))
        writing.update(tables.sites, number, {"notes": "first"})
        writing.update(tables.sites, number, {"notes": "second"})

    twice = keeper.catalogue(work, "decided twice")
    without = keeper.undo(twice)
    assert keeper.record("Dim").episodes[0].state == "proposed"
    keeper.undo(without)
    assert keeper.record("Dim").episodes[0].state == "rejected"
    with store.reading(keeper.db) as connection:
        assert [site.notes for site in sites.list_sites(connection)] == ["second"]
