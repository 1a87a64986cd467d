"""Names are found as people type them, and a wrong one leads to the right one."""

from __future__ import annotations

from dataclasses import replace

import pytest
from catalogue_examples import bare_system, full_site, full_solution, full_system

from campaign.catalogue import sites, solutions, store, systems
from campaign.catalogue.naming import name_key, nearest_names, tidy_name
from campaign.errors import Conflict, InputRefused, NotFound


@pytest.mark.parametrize(
    ("one", "other"),
    [
        ("Lantern 3", "lantern3"),
        ("Lantern 3", "  LANTERN \u00a0 3 "),
        ("V-7", "v\u22127"),
        ("V-7", "V\u20137"),
        ("Straße", "STRASSE"),
        ("\u212b", "Å"),
    ],
)
def test_two_spellings_of_one_name(one, other):
    assert name_key(one) == name_key(other)


@pytest.mark.parametrize("other", ["Lantern 4", "Lantern 33", "Lantem 3", "Lantern -3"])
def test_different_names_stay_different(other):
    assert name_key("Lantern 3") != name_key(other)


@pytest.mark.parametrize("name", ["", "   ", "\u00a0", "a\x1b[31m", "a\nb", "a\u202eb"])
def test_a_name_nobody_could_read_is_refused(name):
    with pytest.raises(InputRefused):
        tidy_name(name)


def test_markup_in_a_name_is_only_text(write, database):
    with write() as writing:
        systems.add_system(writing, bare_system("[red]Lantern[/red] :star:"))
    with store.reading(database) as connection:
        assert systems.find_system(connection, "[RED]lantern[/red]:star:").name == "[red]Lantern[/red] :star:"


@pytest.mark.parametrize("wanted", ["Lantern 4", "Lantem 3", "antern 3", "LANTERN", "lantern 3 of"])
def test_an_unknown_system_leads_to_the_nearest_name(wanted, write, database):
    with write() as writing:
        systems.add_system(writing, full_system("Lantern 3"))
        systems.add_system(writing, bare_system("Quarry"))
    with store.reading(database) as connection, pytest.raises(NotFound) as missing:
        systems.find_system(connection, wanted)
    assert missing.value.code == "system-not-found"
    assert any("Lantern 3" in near for near in missing.value.details["nearest"])
    assert "Quarry" not in missing.value.details["nearest"]
    assert "Lantern 3" in missing.value.hint


def test_nothing_like_it_offers_nothing(write, database):
    with write() as writing:
        systems.add_system(writing, bare_system("Quarry"))
    with store.reading(database) as connection, pytest.raises(NotFound) as missing:
        systems.find_system(connection, "xyzzy")
    assert missing.value.details["nearest"] == []
    assert nearest_names("", {"a": "A"}) == []


def test_an_empty_catalogue_says_how_to_add_the_first_system(database):
    with store.reading(database) as connection, pytest.raises(NotFound) as missing:
        systems.find_system(connection, "Lantern 3")
    assert "system add" in missing.value.hint


@pytest.mark.parametrize("name", ["LANTERN 3", "lantern3 åse", "Lantern  3 of the net"])
def test_a_taken_name_or_alias_is_refused_and_nothing_changes(name, write, database):
    with write() as writing:
        systems.add_system(writing, full_system())
    before = database.read_bytes()
    with pytest.raises(Conflict) as refused, write() as writing:
        systems.add_system(writing, replace(bare_system("New"), aliases=(name,)))
    assert refused.value.code == "name-taken"
    assert refused.value.details["system"] == "Lantern 3"
    assert database.read_bytes() == before


def test_an_alias_that_repeats_the_name_is_left_out(write, database):
    with write() as writing:
        system_id = systems.add_system(
            writing, replace(bare_system("Quarry"), aliases=("QUARRY", "Pit", " pit "))
        )
    with store.reading(database) as connection:
        assert systems.get_system(connection, system_id).aliases == ("Pit",)


def test_name_and_alias_can_change_places(write, database):
    with write() as writing:
        systems.add_system(writing, replace(bare_system("Quarry"), aliases=("Pit", "Hole")))
    with write() as writing:
        before = systems.find_system(writing.connection, "quarry")
        assert systems.change_system(writing, before, replace(before, name="Pit", aliases=("Quarry",)))
    with store.reading(database) as connection:
        found = systems.find_system(connection, "QUARRY")
        assert (found.name, found.aliases) == ("Pit", ("Quarry",))
        with pytest.raises(NotFound):
            systems.find_system(connection, "Hole")


def test_a_change_of_a_field_that_somebody_else_changed_is_refused_with_both_versions(write, database):
    with write() as writing:
        systems.add_system(writing, full_system())
    with store.reading(database) as connection:
        read_by_both = systems.find_system(connection, "Lantern 3")
    with write() as writing:
        systems.change_system(writing, read_by_both, replace(read_by_both, priority=1))
    with pytest.raises(Conflict) as refused, write() as writing:
        systems.change_system(writing, read_by_both, replace(read_by_both, priority=5))
    assert refused.value.code == "changed-meanwhile"
    assert refused.value.details["fields"] == {"priority": {"read": "2", "wanted": "5", "present": "1"}}
    with write() as writing:
        assert systems.change_system(writing, read_by_both, replace(read_by_both, notes="new"))
    with store.reading(database) as connection:
        found = systems.find_system(connection, "Lantern 3")
    assert (found.priority, found.notes) == (1, "new")


def test_a_star_becomes_better_known(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Quarry"))
        assert not systems.set_star(
            writing, system_id, systems.get_system(writing.connection, system_id).star_a
        )
        assert systems.set_star(writing, system_id, full_system().star_b)
        assert not systems.set_star(writing, system_id, full_system().star_b)
    with store.reading(database) as connection:
        found = systems.get_system(connection, system_id)
    assert found.star_b == full_system().star_b
    assert found.star_a == bare_system("Quarry").star_a


def test_a_label_is_found_in_any_case_and_is_unique_in_its_system(write):
    with write() as writing:
        one = systems.add_system(writing, bare_system("One"))
        two = systems.add_system(writing, bare_system("Two"))
        solutions.add_solution(writing, full_solution(one))
        solutions.add_solution(writing, full_solution(two))
        assert solutions.find_solution(writing.connection, one, "orrery2029").label == "Orrery 2029"
        with pytest.raises(Conflict) as taken:
            solutions.add_solution(writing, full_solution(one, "ORRERY  2029"))
        assert taken.value.code == "label-taken"
        with pytest.raises(NotFound) as missing:
            solutions.find_solution(writing.connection, one, "Orrery 2028")
        assert missing.value.details["nearest"] == ["Orrery 2029"]


def test_a_site_is_unique_by_name_and_an_unknown_one_leads_to_the_nearest(write):
    with write() as writing:
        sites.add_site(writing, full_site())
        with pytest.raises(Conflict) as taken:
            sites.add_site(writing, full_site("cold  mesa"))
        assert taken.value.code == "site-taken"
        with pytest.raises(NotFound) as missing:
            sites.find_site(writing.connection, "Cold Messa")
        assert missing.value.details["nearest"] == ["Cold Mesa"]


def test_a_changed_site_is_not_overwritten_blindly(write):
    with write() as writing:
        site_id = sites.add_site(writing, full_site())
        before = sites.get_site(writing.connection, site_id)
        assert sites.change_site(writing, before, replace(before, height_m=2500.0))
        with pytest.raises(Conflict) as refused:
            sites.change_site(writing, before, replace(before, height_m=2600.0))
        assert refused.value.code == "changed-meanwhile"
        assert sites.get_site(writing.connection, site_id).height_m == 2500.0
