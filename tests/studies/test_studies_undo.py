"""What may be taken back, what stands against it, and how the catalogue looks afterwards.

The rules are common practice of a journal, no source: a step is taken back when nothing that still stands
was built on it, and the refusal names what was.
"""

from __future__ import annotations

import sqlite3

import pytest
from undo_examples import Keeper, begun, keep_engines

from campaign.catalogue import journal, observations, sites, solutions, store
from campaign.catalogue.numbering import Numbering
from campaign.errors import Conflict, NotFound
from campaign.model.systems import Site, Star
from campaign.studies import undo


@pytest.fixture(scope="module")
def folder(tmp_path_factory):
    with keep_engines():
        yield begun(tmp_path_factory.mktemp("undo"))


@pytest.fixture
def keeper(folder):
    found = Keeper(folder)
    found.system("Dim", aliases=("Gleam",))
    found.system("Faint")
    return found


# ------------------------------------------------------------------ what holds the place of what would return


def test_a_star_that_was_described_again_holds_back_what_described_it_first(keeper):
    first = keeper.star("Dim", "O5")
    taken_back = keeper.undo(first)
    again = keeper.star("Dim", "O7")
    assert keeper.refused(taken_back) == {again: "entered the star again"}
    assert keeper.record("Dim").system.star_b.spectral_type == "O7"
    keeper.undo(again)
    keeper.undo(taken_back)
    assert keeper.record("Dim").system.star_b.spectral_type == "O5"


def test_so_it_is_where_an_older_program_gave_the_number_of_the_star_again(keeper, monkeypatch):
    monkeypatch.setattr(Numbering, "fresh", lambda numbering, table: {})
    taken_back = keeper.undo(keeper.star("Dim", "O5"))
    again = keeper.star("Dim", "O7")
    assert keeper.refused(taken_back) == {again: "entered the star again"}
    keeper.undo(again)
    other = keeper.star("Faint", "B0")
    back = keeper.undo(taken_back)
    assert keeper.record("Dim").system.star_b.spectral_type == "O5"
    assert keeper.record("Faint").system.star_b.spectral_type == "B0"
    keeper.undo(other)
    keeper.undo(back)
    assert keeper.record("Dim").system.star_b.spectral_type is None


def test_a_star_of_another_system_does_not(keeper):
    taken_back = keeper.undo(keeper.star("Dim", "O5"))
    keeper.star("Faint", "O7")
    keeper.undo(taken_back)
    assert keeper.record("Dim").system.star_b.spectral_type == "O5"
    assert keeper.record("Faint").system.star_b.spectral_type == "O7"


def test_a_later_change_of_a_star_is_put_back_onto_the_same_star(keeper):
    described, better = keeper.star("Dim", "O5"), keeper.star("Dim", "O6")
    without_better = keeper.undo(better)
    without_star = keeper.undo(described)
    other = keeper.star("Faint", "B0")
    keeper.undo(without_star)
    keeper.undo(without_better)
    assert keeper.record("Dim").system.star_b.spectral_type == "O6"
    assert keeper.record("Faint").system.star_b.spectral_type == "B0"
    keeper.undo(other)
    assert keeper.record("Dim").system.star_b.spectral_type == "O6"


def test_a_name_given_to_another_system_holds_back_its_return(keeper):
    taken_back = keeper.undo(keeper.change("Dim", aliases=("Ember",)))
    other = keeper.system("Ember")
    assert keeper.refused(taken_back) == {other: "gave the name to another system"}


def test_a_name_given_to_another_site_holds_back_its_return(keeper):
    taken_back = keeper.undo(keeper.site("Cold Mesa"))
    other = keeper.site("Cold Mesa")
    assert keeper.refused(taken_back) == {other: "gave the name to another site"}


def test_a_label_given_to_another_solution_holds_back_its_return(keeper):
    taken_back = keeper.undo(keeper.solution("Dim", "first"))
    other = keeper.solution("Dim", "first", epoch="2002-01-01")
    keeper.solution("Faint", "first")
    assert keeper.refused(taken_back) == {other: "gave the label to another solution"}


def test_the_same_observation_entered_again_holds_back_its_return(keeper):
    taken_back = keeper.undo(keeper.log("Dim", 1))
    again = keeper.log("Dim", 1)
    keeper.log("Faint", 1)
    assert keeper.refused(taken_back) == {again: "entered the same observation again"}


def test_the_same_observation_entered_again_holds_back_the_return_of_its_load(keeper):
    taken_back = keeper.undo(keeper.load("Dim", range(5)))
    again = keeper.log("Dim", 3)
    keeper.log("Dim", 7)
    assert keeper.refused(taken_back) == {again: "entered the same observation again"}


# ------------------------------------------------------------------ what belongs to what returns


def test_an_observation_does_not_return_without_its_system(keeper):
    system = keeper.system("Glow")
    taken_back = keeper.undo(keeper.log("Glow", 1))
    gone = keeper.undo(system)
    assert keeper.refused(taken_back) == {gone: "took back the system it needs"}


def test_a_star_does_not_return_without_its_system(keeper):
    system = keeper.system("Glow")
    taken_back = keeper.undo(keeper.star("Glow", "O5"))
    gone = keeper.undo(system)
    assert keeper.refused(taken_back) == {gone: "took back the system it needs"}


def test_a_load_does_not_return_without_its_site(keeper):
    keeper.site("Harrow Pass")
    site = keeper.site("Cold Mesa")
    taken_back = keeper.undo(keeper.load("Dim", range(3), site="Cold Mesa"))
    gone = keeper.undo(site)
    assert keeper.refused(taken_back) == {gone: "took back the site it needs"}
    keeper.undo(gone)
    keeper.undo(taken_back)
    assert len(keeper.values()) == 3


def test_a_change_of_an_entry_does_not_return_without_the_entry(keeper):
    system = keeper.system("Glow")
    taken_back = keeper.undo(keeper.change("Glow", priority=1))
    gone = keeper.undo(system)
    assert keeper.refused(taken_back) == {gone: "took back the entry itself"}


def test_a_correction_does_not_return_without_the_load_that_it_corrected(keeper):
    loaded = keeper.load("Dim", range(3))
    taken_back = keeper.undo(keeper.amend(2, 7.5))
    gone = keeper.undo(loaded)
    assert keeper.refused(taken_back) == {gone: "took back the load that the observation came with"}
    keeper.undo(gone)
    keeper.undo(taken_back)
    assert keeper.values() == {1: 7.0, 3: 7.0, 4: 7.5}


def test_what_came_together_returns_together(keeper):
    system = keeper.system("Glow", aliases=("Ember",), star_a=Star("A", "WC7"))
    without = keeper.undo(system)
    assert ("Glow", "Ember") not in keeper.names()
    keeper.undo(without)
    assert ("Glow", "Ember") in keeper.names()
    assert keeper.record("Glow").system.star_a.spectral_type == "WC7"
    both = keeper.solution("Glow", "first", adopt=True)
    keeper.undo(keeper.undo(both))
    assert [s.label for s in keeper.record("Glow").solutions if s.adopted] == ["first"]


# ------------------------------------------------------------------ what was built on it


@pytest.mark.parametrize(
    ("build", "reason"),
    [
        (lambda keeper: keeper.log("Glow", 1), "uses the system that this operation entered"),
        (lambda keeper: keeper.load("Glow", range(3)), "uses the system that this operation entered"),
        (lambda keeper: keeper.episode("Glow", None), "uses the system that this operation entered"),
        (lambda keeper: keeper.rule("Glow", -10.0), "uses the system that this operation entered"),
        (lambda keeper: keeper.star("Glow", "O5"), "uses the system that this operation entered"),
        (lambda keeper: keeper.change("Glow", priority=1), "changed the same entry later"),
        (
            lambda keeper: keeper.change("Glow", aliases=("Ember",)),
            "uses the system that this operation entered",
        ),
    ],
)
def test_a_system_stays_while_something_is_kept_of_it(keeper, build, reason):
    system = keeper.system("Glow")
    built = build(keeper)
    assert keeper.refused(system) == {built: reason}
    keeper.undo(built)
    keeper.undo(system)
    assert ("Glow",) not in keeper.names()


def test_a_site_stays_while_an_observation_was_made_there(keeper):
    site = keeper.site("Cold Mesa")
    keeper.site("Harrow Pass")
    here = keeper.log("Dim", 1, site="Cold Mesa")
    keeper.log("Dim", 1, site="Harrow Pass")
    loaded = keeper.load("Faint", range(3), site="Cold Mesa")
    uses = "uses the site that this operation entered"
    assert keeper.refused(site) == {here: uses, loaded: uses}
    keeper.withdraw(1)
    assert keeper.refused(site) == {loaded: uses}


def test_a_load_stays_while_one_of_it_was_corrected_or_withdrawn(keeper):
    loaded = keeper.load("Dim", range(5))
    amended, withdrawn = keeper.amend(2, 7.5), keeper.withdraw(4)
    changed = "changed observation {}, which this load brought"
    refused = keeper.refused(loaded)
    assert refused == {amended: changed.format(2), withdrawn: changed.format(4)}
    # The newest first: that is the one to begin with.
    assert list(refused) == [withdrawn, amended]
    keeper.undo(amended)
    keeper.undo(withdrawn)
    keeper.undo(loaded)
    assert keeper.values() == {}


def test_an_observation_stays_while_a_correction_of_it_counts(keeper):
    logged = keeper.log("Dim", 1)
    amended = keeper.amend(1, 7.5)
    again = keeper.amend(2, 8.0)
    assert set(keeper.refused(logged)) == {amended, again} or set(keeper.refused(logged)) == {amended}
    assert set(keeper.refused(amended)) == {again}
    keeper.undo(again)
    keeper.undo(amended)
    assert keeper.values() == {1: 7.0}


def test_one_field_may_be_taken_back_after_another_of_the_same_entry_changed(keeper):
    first = keeper.change("Dim", priority=1)
    keeper.change("Dim", notes="near the ecliptic")
    third = keeper.change("Dim", priority=2)
    assert keeper.refused(first) == {third: "changed the same entry later"}
    keeper.undo(third)
    keeper.undo(first)
    system = keeper.record("Dim").system
    assert (system.priority, system.notes) == (3, "near the ecliptic")


# ------------------------------------------------------------------ the state of a system


def test_what_is_adopted_is_taken_back_from_the_latest_backwards(keeper):
    keeper.solution("Dim", "first")
    keeper.solution("Dim", "second")
    keeper.solution("Faint", "first")
    first, second = keeper.adopt("Dim", "first"), keeper.adopt("Dim", "second")
    keeper.adopt("Faint", "first")
    assert keeper.refused(first)[second] == "changed the same entry later"
    keeper.undo(second)
    assert [s.label for s in keeper.record("Dim").solutions if s.adopted] == ["first"]
    keeper.undo(first)
    assert not any(s.adopted for s in keeper.record("Dim").solutions)
    assert any(s.adopted for s in keeper.record("Faint").solutions)


def test_a_weight_given_later_beside_it_holds_an_adoption_back(keeper):
    keeper.solution("Dim", "base", adopt=True)
    for label in ("first", "second", "third"):
        keeper.solution("Dim", label)
    both = keeper.adopt("Dim", {"first": 1.0, "second": 2.0})
    without = keeper.undo(both)
    third = keeper.adopt("Dim", "third")
    assert set(keeper.refused(without)) == {third}
    keeper.undo(third)
    keeper.undo(without)
    assert {s.label: s.weight for s in keeper.record("Dim").solutions if s.adopted} == {
        "first": 1.0,
        "second": 2.0,
    }


def test_another_adoption_in_the_meantime_holds_back_the_return_of_one(keeper):
    keeper.solution("Dim", "base", adopt=True)
    for label in ("first", "second"):
        keeper.solution("Dim", label)
    ended = keeper.catalogue(lambda writing: solutions.end_adoption(writing, 1), "ended the adoption")
    first = keeper.adopt("Dim", "first")
    without = keeper.undo(first)
    second = keeper.adopt("Dim", "second")
    # Nothing of the first adoption changed since, but the system rests on something else by now.
    assert keeper.refused(without) == {second: "adopted otherwise later"}
    assert second in keeper.refused(ended)


def test_a_dust_rule_set_later_holds_an_earlier_one_back(keeper):
    first = keeper.rule("Dim", -10.0)
    without = keeper.undo(first)
    second = keeper.rule("Dim", -20.0)
    keeper.rule("Faint", -30.0)
    assert keeper.refused(without) == {second: "set the dust rule later"}
    keeper.undo(second)
    keeper.undo(without)
    rule = keeper.record("Dim").rule
    assert rule is not None
    assert rule.onset is not None
    assert rule.onset.value == -10.0


# ------------------------------------------------------------------ the count of cycles


def test_a_cycle_counted_from_an_epoch_holds_its_adoption_back(keeper):
    keeper.solution("Dim", "first")
    keeper.episode("Dim", 0)
    adopted = keeper.adopt("Dim", "first")
    keeper.episode("Dim", None, 58_500.0)
    keeper.episode("Faint", 2)
    counted = keeper.episode("Dim", 1, 61_000.0)
    counts = "counts cycles from the epoch adopted here"
    assert keeper.refused(adopted) == {counted: counts}
    later = keeper.solution("Dim", "second", epoch="2009-03-20")
    assert keeper.refused(adopted) == {counted: counts, later: counts}
    keeper.undo(counted)
    keeper.undo(later)
    keeper.undo(adopted)
    assert keeper.record("Dim").system.cycle_anchor_bmjd_tdb is None


def test_what_was_there_before_and_came_back_is_not_counted_from_a_later_epoch(keeper):
    keeper.solution("Dim", "first")
    earlier = keeper.episode("Dim", 0)
    adopted = keeper.adopt("Dim", "first")
    keeper.undo(keeper.undo(earlier))
    keeper.undo(adopted)
    assert keeper.record("Dim").system.cycle_anchor_bmjd_tdb is None
    assert [episode.cycle for episode in keeper.record("Dim").episodes] == [0]


def test_an_adoption_that_found_the_count_begun_is_not_held_back_by_it(keeper):
    keeper.solution("Dim", "first", adopt=True)
    keeper.solution("Dim", "second", epoch="2009-03-20")
    second = keeper.adopt("Dim", "second")
    keeper.episode("Dim", 1)
    anchor = keeper.record("Dim").system.cycle_anchor_bmjd_tdb
    keeper.undo(second)
    assert keeper.record("Dim").system.cycle_anchor_bmjd_tdb == anchor is not None


def test_a_solution_entered_and_adopted_at_once_does_not_hold_itself_back(keeper):
    entered = keeper.solution("Dim", "first", adopt=True)
    without = keeper.undo(entered)
    assert keeper.record("Dim").solutions == ()
    assert keeper.record("Dim").system.cycle_anchor_bmjd_tdb is None
    keeper.undo(without)
    record = keeper.record("Dim")
    assert [(s.label, s.epoch_cycle, s.adopted) for s in record.solutions] == [("first", 0, True)]
    assert record.system.cycle_anchor_bmjd_tdb is not None


def test_the_cycle_of_an_epoch_follows_the_adoption_and_holds_nothing_back(keeper):
    # 2009-03-20 is 3,000 days after 2001-01-01: common practice, no source.
    first = keeper.solution("Dim", "first")
    second = keeper.solution("Dim", "second", epoch="2009-03-20")
    adopted = keeper.adopt("Dim", "first")
    assert [s.epoch_cycle for s in keeper.record("Dim").solutions] == [0, 1]
    # The adoption gave the second solution its cycle; that alone does not build on it.
    gone = keeper.undo(second)
    assert keeper.refused(first)[adopted] in (
        "uses the solution that this operation entered",
        "changed the same entry later",
    )
    without = keeper.undo(adopted)
    assert [s.epoch_cycle for s in keeper.record("Dim").solutions] == [None]
    keeper.undo(without)
    keeper.undo(gone)
    assert [s.epoch_cycle for s in keeper.record("Dim").solutions] == [0, 1]


def test_a_published_count_follows_the_adoption_too(keeper):
    keeper.solution("Dim", "first")
    # The publication calls its epoch cycle 11; in the system's count it is cycle 1.
    second = keeper.solution("Dim", "second", epoch="2009-03-20", published_cycle=11)
    adopted = keeper.adopt("Dim", "first")
    counts = [(s.epoch_cycle, s.published_cycle_offset) for s in keeper.record("Dim").solutions]
    assert counts == [(0, None), (1, 10)]
    back = keeper.undo(keeper.undo(second))
    keeper.undo(adopted)
    counts = [(s.epoch_cycle, s.published_cycle_offset) for s in keeper.record("Dim").solutions]
    assert counts == [(None, None), (None, 11)]
    keeper.undo(back)
    assert [s.label for s in keeper.record("Dim").solutions] == ["first"]


def test_a_published_count_follows_also_while_its_solution_is_out_of_use(keeper):
    keeper.solution("Dim", "first")
    second = keeper.solution("Dim", "second", epoch="2009-03-20", published_cycle=11)
    adopted = keeper.adopt("Dim", "first")
    gone = keeper.undo(second)
    keeper.undo(adopted)
    keeper.undo(gone)
    counts = [(s.epoch_cycle, s.published_cycle_offset) for s in keeper.record("Dim").solutions]
    assert counts == [(None, None), (None, 11)]


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
