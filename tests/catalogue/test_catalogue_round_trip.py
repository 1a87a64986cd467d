"""Whatever the model can say comes back from the catalogue to the last bit."""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np
import pytest
from catalogue_examples import (
    FIRST,
    bare_system,
    every_kind,
    full_episode,
    full_rule,
    full_site,
    full_solution,
    full_system,
    limit_solution,
    photometry,
    range_solution,
    space_site,
)
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from campaign.catalogue import (
    episodes,
    observations,
    records,
    rules,
    sites,
    solutions,
    sources,
    store,
    systems,
)
from campaign.model.instants import Moment
from campaign.model.measured import Limit, Measured, Range
from campaign.model.observations import OBSERVATION_KINDS, Observation
from campaign.model.systems import DatedEvent, Episode, Site, Solution, Star


def test_a_system_with_everything_known_comes_back(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, full_system())
        systems.set_cycle_anchor(writing, system_id, 61234.5, 3127.5)
    with store.reading(database) as connection:
        found = systems.find_system(connection, "Lantern 3")
    wanted = replace(full_system(), id=system_id, cycle_anchor_bmjd_tdb=61234.5, cycle_anchor_period_d=3127.5)
    assert found == wanted
    assert all(getattr(wanted, field.name) is not None for field in fields(wanted))


def test_a_system_of_which_only_the_position_is_known_comes_back(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
    with store.reading(database) as connection:
        found = systems.get_system(connection, system_id)
    assert found == replace(bare_system("Dim"), id=system_id)
    assert found.star_a == Star("A")
    assert found.distance_pc is None


@pytest.mark.parametrize("make", [full_solution, limit_solution, range_solution])
def test_a_solution_comes_back(make, write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        solution_id = solutions.add_solution(writing, make(system_id))
    with store.reading(database) as connection:
        found = solutions.solutions_of(connection, system_id)
    assert found == [replace(make(system_id), id=solution_id)]


def test_a_full_solution_leaves_no_field_of_the_model_untried():
    solution = full_solution(1)
    unset = {f.name for f in fields(Solution) if getattr(solution, f.name) in (None, "", False)}
    assert unset == {"id", "adopted", "weight"}
    rule = full_rule(1)
    assert all(getattr(rule, field.name) not in (None, "") for field in fields(rule))


def test_a_dust_rule_comes_back(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        rule_id = rules.set_rule(writing, full_rule(system_id))
    with store.reading(database) as connection:
        assert rules.rule_of(connection, system_id) == replace(full_rule(system_id), id=rule_id)


def test_an_episode_comes_back(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        full = episodes.add_episode(writing, full_episode(system_id))
        bare = episodes.add_episode(
            writing, Episode(0, system_id, None, "proposed", maximum=DatedEvent(Moment(50_000.0)))
        )
    with store.reading(database) as connection:
        found = episodes.episodes_of(connection, system_id)
    assert [episode.id for episode in found] == [bare, full]
    assert found[1] == replace(full_episode(system_id), id=full)
    assert found[0].onset is None
    assert found[0].maximum == DatedEvent(Moment(50_000.0))


@pytest.mark.parametrize("site", [full_site(), space_site()], ids=["ground", "space"])
def test_a_site_comes_back(site: Site, write, database):
    with write() as writing:
        site_id = sites.add_site(writing, site)
    with store.reading(database) as connection:
        assert sites.find_site(connection, site.name.upper()) == replace(site, id=site_id)
        assert sites.list_sites(connection) == [replace(site, id=site_id)]


def test_observations_of_every_kind_come_back(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        site_id = sites.add_site(writing, full_site())
        entered = every_kind(system_id, site_id)
        numbers = [observations.add_observation(writing, entry) for entry in entered]
    assert all(not already for _, already in numbers)
    with store.reading(database) as connection:
        found = [observations.get_observation(connection, number) for number, _ in numbers]
    assert {entry.kind for entry in found} == set(OBSERVATION_KINDS)
    for before, after in zip(entered, found, strict=True):
        site = "Cold Mesa" if before.site_id else None
        assert len(after.uid) == 36
        assert after == replace(before, id=after.id, uid=after.uid, site=site)


def test_every_field_of_an_observation_is_tried_above():
    entries = every_kind(1, 1)
    unset = {
        field.name
        for field in fields(Observation)
        if all(getattr(entry, field.name) in (None, "", 0) for entry in entries)
    }
    assert unset == {"id", "uid", "site"}


def test_a_record_gathers_all_of_one_system(write, database):
    with write() as writing:
        system_id = systems.add_system(writing, full_system())
        solution_id = solutions.add_solution(writing, full_solution(system_id))
        solutions.adopt_alone(writing, solution_id)
        rules.set_rule(writing, full_rule(system_id))
        episodes.add_episode(writing, full_episode(system_id))
        other = systems.add_system(writing, bare_system("Dim"))
        systems.set_state(writing, other, "retired")
    with store.reading(database) as connection:
        (record,) = records.load_records(connection)
        assert [r.system.id for r in records.load_records(connection, include_retired=True)] == [
            system_id,
            other,
        ]
        assert records.load_records(connection, [other]) == []
        assert records.load_records(connection, []) == []
    assert record.system.name == "Lantern 3"
    assert record.solutions == (replace(full_solution(system_id), id=solution_id, adopted=True),)
    assert record.rule is not None
    assert record.rule.kind == "separation"
    assert [episode.cycle for episode in record.episodes] == [-1]


def test_more_systems_than_fit_a_statement_are_still_told_apart(write, database):
    with write() as writing:
        numbers = [systems.add_system(writing, bare_system(f"Dim {n}")) for n in range(510)]
        for number in numbers:
            observations.add_observation(writing, photometry(number))
        rules.set_rule(writing, full_rule(numbers[0]))
    wanted = numbers[5:]
    with store.reading(database) as connection:
        found = records.load_records(connection, wanted)
        arrays = observations.photometry_arrays(connection, wanted)
        listed = observations.observations_of(connection, wanted)
        counts = observations.count_observations(connection, wanted)
    assert [record.system.id for record in found] == wanted
    assert list(arrays) == wanted
    assert [entry.system_id for entry in listed] == wanted
    assert counts == {number: {"photometry": 1} for number in wanted}
    assert len(wanted) > 500


errors = st.none() | st.floats(0, 1e300)
values = st.floats(allow_nan=False, allow_infinity=False)
periods = st.one_of(
    st.none(),
    st.builds(Measured, st.floats(1e-300, 1e300), errors, errors),
    st.builds(Limit, st.floats(1e-300, 1e300), st.sampled_from(["above", "below"]), st.floats(0.1, 10)),
    st.builds(lambda low, width: Range(low, low + width), st.floats(1, 1e6), st.floats(1, 1e6)),
)


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=60, deadline=None)
@given(
    period=periods,
    epoch=st.builds(Moment, values, errors, errors),
    gamma_kms=st.builds(Measured, values, errors, errors),
)
def test_no_bit_of_a_number_is_lost(period, epoch, gamma_kms, begun):
    with store.rehearsing(begun, at=FIRST, who="x", command="y") as writing:
        system_id = systems.add_system(writing, bare_system("Dim"))
        draft = Solution(0, system_id, "one", period_d=period, epoch=epoch, gamma_kms=gamma_kms)
        solution_id = solutions.add_solution(writing, draft)
        found = solutions.get_solution(writing.connection, solution_id)
    assert found == replace(draft, id=solution_id)


names = st.text(st.characters(exclude_categories=["Cc", "Cf", "Cs", "Zl", "Zp"]), min_size=1, max_size=60)


@settings(suppress_health_check=[HealthCheck.function_scoped_fixture], max_examples=60, deadline=None)
@given(name=names.filter(lambda text: text.strip()))
def test_any_visible_name_is_found_again_in_any_case_and_spacing(name, begun):
    with store.rehearsing(begun, at=FIRST, who="x", command="y") as writing:
        system_id = systems.add_system(writing, bare_system(name))
        for form in (name, f"  {name} ", name.lower(), name.casefold(), name.replace(" ", "")):
            assert systems.find_system(writing.connection, form).id == system_id


def test_a_light_curve_comes_back_as_columns(write, database):
    with write() as writing:
        dim = systems.add_system(writing, bare_system("Dim"))
        bright = systems.add_system(writing, bare_system("Bright"))
        entries = [
            photometry(bright, 61502.0, value=Measured(12.0), limit_side="above", limit_sigma=3.0, band="L"),
            photometry(dim, 61501.0, source="Night book 12"),
            photometry(dim, 61500.0, value=Measured(3.0), limit_side="below", limit_sigma=5.0, quality="bad"),
            Observation(0, "", dim, "remark", Moment(61500.0), text="not photometry"),
        ]
        observations.add_observations(writing, entries)
    with store.reading(database) as connection:
        arrays = observations.photometry_arrays(connection)
        assert observations.photometry_arrays(connection, [999]) == {}
    assert list(arrays) == [dim, bright]
    curve = arrays[dim]
    assert curve.bmjd_tdb.tolist() == [61500.0, 61501.0]
    assert curve.mag.tolist() == [3.0, 7.31]
    assert curve.limit_side.tolist() == [-1, 0]
    assert curve.limit_sigma[0] == 5.0
    assert np.isnan(curve.limit_sigma[1])
    assert np.isnan(curve.mag_minus[0])
    assert curve.mag_minus[1] == 0.03
    assert curve.source.tolist() == ["", "Night book 12"]
    assert curve.quality.tolist() == ["bad", "good"]
    assert curve.site_id.tolist() == [-1, -1]
    assert curve.band.tolist() == ["K", "K"]
    assert arrays[bright].limit_side.tolist() == [1]
    assert curve.limit_side.dtype == np.int8


def test_a_source_is_one_however_it_is_spelt(write, database):
    with write() as writing:
        first = sources.source_id(writing, "Orrery & Quill  2029")
        assert sources.source_id(writing, " orrery & quill 2029") == first
        assert sources.source_id(writing, "  ") is None
    with store.reading(database) as connection:
        assert sources.list_sources(connection) == ["Orrery & Quill 2029"]
