"""What is exported comes back to the last bit, and a copy of a catalogue exports the same bytes.

Statements of the project (issue: observations in bulk): export, load into an empty catalogue, export.
"""

from __future__ import annotations

from dataclasses import replace

import exchange_examples as examples
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from studies_examples import episode, moment, solution, stamp, system

from campaign.catalogue import episodes, observations, solutions, store, systems
from campaign.catalogue.naming import name_key
from campaign.errors import NotFound
from campaign.model.exported import EXCHANGE_FORMS
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.reading.instants import read_instant
from campaign.studies.begin import begin_sample_campaign
from campaign.studies.exchange_rows import episode_cells, solution_cells, system_cells
from campaign.studies.export import Asked, outgoing_table
from campaign.studies.observations import Wanted

forms = pytest.mark.parametrize("form", EXCHANGE_FORMS)
quick = settings(
    max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow, HealthCheck.filter_too_much]
)


# --------------------------------------------------------------------------------- entries, one at a time


@forms
@quick
@given(data=st.data())
def test_a_system_with_its_rule_comes_back_to_the_last_bit(form, data):
    drawn = data.draw(examples.systems_at_random)
    rule = data.draw(st.none() | examples.rules_at_random)
    (back,) = examples.entries(examples.text_of("systems", form, [system_cells(drawn, rule)]))
    assert repr(back.system) == repr(drawn)
    assert repr(back.rule) == repr(rule)


@forms
@quick
@given(data=st.data())
def test_a_solution_comes_back_to_the_last_bit(form, data):
    drawn = data.draw(examples.solution())
    (back,) = examples.entries(examples.text_of("solutions", form, [solution_cells("Lantern 3", drawn)]))
    # repr tells every float to the last bit, and the sign of zero.
    assert (back.system, repr(back.solution)) == ("Lantern 3", repr(drawn))


@forms
@quick
@given(data=st.data())
def test_an_episode_comes_back_to_the_last_bit(form, data):
    drawn = data.draw(examples.episodes_at_random)
    (back,) = examples.entries(examples.text_of("episodes", form, [episode_cells("=Lantern", drawn)]))
    assert (back.system, repr(back.episode), back.withdrawn) == ("=Lantern", repr(drawn), False)


# ------------------------------------------------------------------------------------- through a catalogue


@pytest.fixture(scope="session")
def empty(tmp_path_factory):
    return examples.begin(tmp_path_factory.mktemp("empty") / "campaign.db")


@pytest.fixture
def new(empty, tmp_path):
    """Makes empty catalogues."""

    def make(name):
        (tmp_path / name).write_bytes(empty.read_bytes())
        return tmp_path / name

    return make


@pytest.fixture(scope="session")
def sample(tmp_path_factory):
    """The invented demo campaign in a database."""
    path = tmp_path_factory.mktemp("sample") / "campaign.db"
    begin_sample_campaign(str(path), stamp())
    return path


@forms
def test_the_whole_sample_comes_back_into_an_empty_catalogue_and_leaves_it_as_the_same_bytes(
    form, sample, new
):
    first = examples.every_export(sample, form)
    copy = new("copy.db")
    examples.bring(copy, first)
    assert examples.every_export(copy, form) == first
    assert min(map(len, first)) > 1_000


@forms
@settings(max_examples=8, deadline=None, suppress_health_check=list(HealthCheck))
@given(data=st.data())
def test_observations_of_any_kind_come_back_through_a_catalogue_as_the_same_bytes(form, new, data):
    drawn = data.draw(st.lists(examples.observation(), min_size=1, max_size=4))
    db = new("one.db")
    with store.writing(db, at=examples.CLOCK, who="Ida Vik", command="campaign test") as writing:
        systems.add_system(writing, data.draw(examples.systems_at_random))
    examples.observe(db, drawn)
    first = examples.every_export(db, form)
    copy = new("two.db")
    examples.bring(copy, first)
    assert examples.every_export(copy, form) == first


@forms
@settings(max_examples=8, deadline=None, suppress_health_check=list(HealthCheck))
@given(data=st.data())
def test_what_is_believed_of_a_system_comes_back_through_a_catalogue_as_the_same_bytes(form, new, data):
    drawn = data.draw(examples.systems_at_random)
    rule = data.draw(st.none() | examples.rules_at_random)
    believed = data.draw(st.lists(examples.solution(), max_size=3, unique_by=lambda s: name_key(s.label)))
    bursts = data.draw(st.lists(examples.episodes_at_random, max_size=3))
    tables = [
        examples.text_of("systems", form, [system_cells(drawn, rule)]),
        examples.text_of("solutions", form, [solution_cells(drawn.name, each) for each in believed]),
        examples.text_of("episodes", form, [episode_cells(drawn.name, each) for each in bursts]),
    ]
    db, copy = new("one.db"), new("two.db")
    examples.bring(db, tables)
    first = examples.every_export(db, form)
    examples.bring(copy, first)
    assert examples.every_export(copy, form) == first


def magnitude(number, bmjd_tdb, uid):
    value = Measured(7.3, 0.02, 0.02)
    return Observation(0, uid, number, "photometry", moment(bmjd_tdb, 1e-5), value, "mag", band="K")


@pytest.fixture
def lanterns(new):
    """Three systems, entered in no order, with an episode and an observation out of use."""
    db = new("lanterns.db")
    with store.writing(db, at=examples.CLOCK, who="Ida Vik", command="campaign test") as writing:
        for name in ("lantern 4", "Anvil", "Lantern 3"):
            number = systems.add_system(writing, system(0, name))
            for label in ("limit", "Early"):
                solutions.add_solution(writing, solution(system_id=number, label=label))
            for cycle in (3, 4):
                entry = replace(episode(cycle, 58_000.0 + cycle), system_id=number)
                burst = episodes.add_episode(writing, entry)
                if cycle == 3:
                    episodes.withdraw_episode(writing, burst)
            observations.add_observation(writing, magnitude(number, 61_500.1, name))
            gone, _ = observations.add_observation(writing, magnitude(number, 60_000.0, f"{name} x"))
            observations.withdraw_observation(writing, gone)
    return db


def column(db, kind, name, **asked):
    with outgoing_table(str(db), Asked(kind, **asked)) as table:
        place = [each.name for each in table.columns].index(name)
        found = [row[place] for row in table.rows]
        assert table.row_count == len(found)
    return found


def test_rows_are_ordered_by_name_whatever_the_order_of_entry(lanterns):
    assert column(lanterns, "systems", "name") == ["Anvil", "Lantern 3", "lantern 4"]
    assert column(lanterns, "observations", "system") == ["Anvil", "Lantern 3", "lantern 4"]
    assert column(lanterns, "solutions", "label") == ["Early", "limit"] * 3


def test_what_is_out_of_use_comes_only_when_asked_for(lanterns):
    assert column(lanterns, "observations", "uid", systems=("anvil",)) == ["Anvil"]
    assert column(lanterns, "observations", "uid", systems=("anvil",), also_out_of_use=True) == [
        "Anvil x",
        "Anvil",
    ]
    assert column(lanterns, "episodes", "cycle", systems=("anvil",)) == [4]
    assert column(lanterns, "episodes", "out_of_use", systems=("anvil",), also_out_of_use=True) == [
        "withdrawn",
        None,
    ]


def test_a_day_is_asked_for_whole(lanterns):
    # MJD 51544 is 2000-01-01 (IAU, J2000.0 = JD 2451545.0 at noon), so that MJD 61500 is 2027-04-05.
    before, day, after = (
        read_instant(f"2027-04-0{number}", default_scale="utc", default_place="geocentre")
        for number in (4, 5, 6)
    )
    assert len(column(lanterns, "observations", "uid", wanted=Wanted(since=day, until=day))) == 3
    assert column(lanterns, "observations", "uid", wanted=Wanted(since=after)) == []
    assert column(lanterns, "observations", "uid", wanted=Wanted(until=before)) == []


def test_values_of_one_unit_are_told_to_have_it(lanterns):
    with outgoing_table(str(lanterns), Asked("observations")) as table:
        assert table.value_unit == "mag"
    with outgoing_table(str(lanterns), Asked("observations", wanted=Wanted(bands=("Q",)))) as table:
        assert (table.value_unit, table.row_count) == (None, 0)


@pytest.mark.parametrize("kind", ["observations", "systems", "solutions", "episodes"])
def test_an_unknown_system_is_refused_with_the_nearest(kind, lanterns):
    with pytest.raises(NotFound) as refused, outgoing_table(str(lanterns), Asked(kind, systems=("lantern",))):
        pass
    assert set(refused.value.details["nearest"]) >= {"Lantern 3", "lantern 4"}


def test_an_unknown_site_is_refused(lanterns):
    with (
        pytest.raises(NotFound),
        outgoing_table(str(lanterns), Asked("observations", wanted=Wanted(site="Cold"))),
    ):
        pass
