"""What may be taken back, and what stands against it.

The rules are common practice of a journal, no source: a step is taken back when nothing that still stands
was built on it, and the refusal names what was.
"""

from __future__ import annotations

import pytest

from campaign.catalogue import solutions
from campaign.catalogue.numbering import Numbering
from campaign.model.systems import Star

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
