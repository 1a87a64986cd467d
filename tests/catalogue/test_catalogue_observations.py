"""An observation goes in once, whatever way it is typed, and none is ever erased."""

from __future__ import annotations

from dataclasses import replace

import pytest
from catalogue_examples import bare_system, every_kind, full_site, later, photometry, space_site

from campaign.catalogue import observations, sites, store, systems
from campaign.catalogue import tables as t
from campaign.errors import Conflict, NotFound
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation


@pytest.fixture
def place(write):
    with write() as writing:
        return systems.add_system(writing, bare_system("Dim")), sites.add_site(writing, full_site())


def test_the_same_again_is_already_logged_and_leaves_no_trace(write, database, place):
    with write() as writing:
        first = [observations.add_observation(writing, entry) for entry in every_kind(*place)]
    before = database.read_bytes()
    with write(later(5)) as writing:
        again = [observations.add_observation(writing, entry) for entry in every_kind(*place)]
        assert observations.add_observations(writing, every_kind(*place)) == (0, 9)
    assert [number for number, _ in again] == [number for number, _ in first]
    assert all(already for _, already in again)
    assert database.read_bytes() == before


@pytest.mark.parametrize(
    "changes",
    [
        {"value": Measured(7.31, 0.05, 0.05)},
        {"observer": "Ida Vik"},
        {"instrument": "cam 3"},
        {"source": "Night book 12"},
        {"quality": "bad"},
        {"text": "again"},
        {"moment": Moment(61500.1 + 1e-10, None, None, "JD 2461500.6", "tdb", "barycentre")},
    ],
    ids=str,
)
def test_other_words_about_one_measurement_are_the_same_observation(changes, write, place):
    with write() as writing:
        number, _ = observations.add_observation(writing, photometry(place[0]))
    with write(later(1)) as writing:
        assert observations.add_observation(writing, photometry(place[0], **changes)) == (number, True)
        assert observations.add_observations(writing, [photometry(place[0], **changes)]) == (0, 1)
        assert not writing.changed


@pytest.mark.parametrize(
    "changes",
    [
        {"value": Measured(7.32, 0.03, 0.03)},
        {"band": "H"},
        {"site_id": 1},
        {"limit_side": "above", "limit_sigma": 3.0},
        {"moment": Moment(61500.1 + 2e-8, None, None, "", "utc", "observatory")},
    ],
    ids=str,
)
def test_another_value_band_site_instant_or_limit_is_another_observation(changes, write, place):
    with write() as writing:
        number, _ = observations.add_observation(writing, photometry(place[0]))
        other, already = observations.add_observation(writing, photometry(place[0], **changes))
    assert not already
    assert other != number


def test_doubles_inside_one_batch_go_in_once(write, database, place):
    with write() as writing:
        batch = [photometry(place[0], 61500.0 + n // 2) for n in range(10)]
        assert observations.add_observations(writing, batch) == (5, 5)
    with store.reading(database) as connection:
        assert observations.count_observations(connection) == {place[0]: {"photometry": 5}}
        assert len({o.uid for o in observations.observations_of(connection)}) == 5


def test_an_observation_keeps_the_identifier_it_came_with(write, place):
    uid = "01234567-89ab-8def-8123-456789abcdef"
    with write() as writing:
        number, _ = observations.add_observation(writing, photometry(place[0], uid=uid))
        assert observations.get_observation(writing.connection, number).uid == uid
        moved = photometry(place[0], 61999.0, uid=uid, value=Measured(9.0))
        assert observations.add_observation(writing, moved) == (number, True)


def test_a_site_may_be_given_by_name(write, place):
    with write() as writing:
        number, _ = observations.add_observation(writing, photometry(place[0], site="cold mesa"))
        found = observations.get_observation(writing.connection, number)
        assert (found.site_id, found.site) == (place[1], "Cold Mesa")
        with pytest.raises(NotFound):
            observations.add_observation(writing, photometry(place[0], 61600.0, site="Warm Mesa"))


def test_a_correction_keeps_the_old_row_and_may_change_the_error_only(write, database, place):
    with write() as writing:
        old, _ = observations.add_observation(writing, photometry(place[0]))
    with write(later(1)) as writing:
        better = photometry(place[0], value=Measured(7.31, 0.05, 0.05))
        new = observations.supersede_observation(writing, old, better)
    with store.reading(database) as connection:
        assert [o.id for o in observations.observations_of(connection)] == [new]
        assert observations.get_observation(connection, old).value == Measured(7.31, 0.03, 0.03)
        row = connection.execute(t.observations.select().where(t.observations.c.id == old)).one()
    assert row.superseded_by_id == new
    assert row.superseded_at == later(1)


def test_a_withdrawn_observation_can_be_logged_again(write, place):
    with write() as writing:
        old, _ = observations.add_observation(writing, photometry(place[0]))
        observations.withdraw_observation(writing, old)
        new, already = observations.add_observation(writing, photometry(place[0]))
    assert not already
    assert new != old


def test_what_is_out_of_use_cannot_be_changed_again(write, place):
    with write() as writing:
        old, _ = observations.add_observation(writing, photometry(place[0]))
        new = observations.supersede_observation(writing, old, photometry(place[0], band="H"))
        with pytest.raises(Conflict) as refused:
            observations.withdraw_observation(writing, old)
        assert refused.value.details["superseded_by"] == new
        with pytest.raises(NotFound):
            observations.withdraw_observation(writing, 99)
        with pytest.raises(NotFound):
            observations.get_observation(writing.connection, 99)


def test_a_correction_into_a_known_observation_is_refused_as_a_whole(write, database, place):
    with write() as writing:
        old, _ = observations.add_observation(writing, photometry(place[0]))
        observations.add_observation(writing, photometry(place[0], band="H"))
    before = database.read_bytes()
    with pytest.raises(Conflict), write() as writing:
        observations.supersede_observation(writing, old, photometry(place[0], band="H"))
    assert database.read_bytes() == before


def test_observations_come_by_system_and_time_and_kind(write, database, place):
    with write() as writing:
        other = systems.add_system(writing, bare_system("Bright"))
        kite = sites.add_site(writing, space_site())
        entries = [
            photometry(other, 61400.0),
            photometry(place[0], 61520.0),
            photometry(place[0], 61510.0, site_id=kite),
            Observation(0, "", place[0], "remark", Moment(61515.0), text="red"),
        ]
        observations.add_observations(writing, entries)
    with store.reading(database) as connection:
        found = observations.observations_of(connection)
        assert [(o.system_id, o.moment.bmjd_tdb) for o in found] == [
            (place[0], 61510.0),
            (place[0], 61515.0),
            (place[0], 61520.0),
            (other, 61400.0),
        ]
        remarks = observations.observations_of(connection, [place[0]], ["remark", "attempt"])
        assert [o.text for o in remarks] == ["red"]
        assert found[0].site == "High Kite"


def test_rows_of_a_batch_say_which_command_brought_them(write, database, place):
    with write(later(1), "loaded 3") as writing:
        entries = [photometry(place[0], 61500.0 + n) for n in range(3)]
        observations.add_observations(writing, entries)
        operation_id = writing.operation_id
    with store.reading(database) as connection:
        brought = connection.execute(
            t.observations.select().where(t.observations.c.operation_id == operation_id)
        ).all()
        journal = connection.execute(t.changes.select().where(t.changes.c.operation_id == operation_id)).all()
    assert len(brought) == 3
    assert [(c.table_name, c.row_id, c.action, c.after) for c in journal] == [
        ("observations", None, "insert many", {"rows": 3})
    ]
    uids = sorted(row.uid for row in brought)
    assert [row.uid for row in brought] == uids


def test_identifiers_have_the_form_of_a_uuid(write, place):
    import uuid

    with write() as writing:
        made = [uuid.UUID(writing.new_uid()) for _ in range(3)]
    assert {u.version for u in made} == {8}
    assert {u.variant for u in made} == {uuid.RFC_4122}
    assert len(set(made)) == 3
    with write() as writing:
        assert uuid.UUID(writing.new_uid()) not in made


def test_replacing_nothing_but_the_text_of_a_remark_is_another_remark(write, place):
    remark = Observation(0, "", place[0], "remark", Moment(61515.0), text="red")
    with write() as writing:
        first, _ = observations.add_observation(writing, remark)
        second, already = observations.add_observation(writing, replace(remark, text="blue"))
    assert not already
    assert second != first
