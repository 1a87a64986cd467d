"""Observations entered column by column are those entered one by one. Source of the expectations: the path of
single observations, which has tests of its own, and the issue (guards and digests are the same)."""

from __future__ import annotations

import shutil
from datetime import UTC, datetime

import numpy as np
import pytest
from catalogue_examples import FIRST, bare_system, full_site, later
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy import select

from campaign.catalogue import bulk, observations, sites, store, systems
from campaign.catalogue.tables import changes, operations
from campaign.catalogue.tables import observations as table
from campaign.catalogue.types import ValueRefused
from campaign.errors import Conflict
from campaign.model.columns import ObservationColumns, Words
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation

numbers = st.floats(allow_nan=False, allow_infinity=False, width=64).filter(lambda x: abs(x) < 1e15)
sizes = st.one_of(st.none(), st.floats(0.0, 10.0))
rows = st.fixed_dictionaries(
    {
        "system": st.integers(0, 2),
        "time": st.floats(20_000.0, 80_000.0),
        "value": numbers,
        "minus": sizes,
        "plus": sizes,
        "angle": st.one_of(st.none(), st.floats(-360.0, 360.0)),
        "band": st.sampled_from([None, "K", "k", "L'", "3.6 µm"]),
        "limit": st.sampled_from([None, "above", "below"]),
        "frequency": st.sampled_from([None, 8.6, 8.4]),
        "index": st.sampled_from([None, 1, 2]),
        "site": st.booleans(),
        "source": st.sampled_from([None, "Night book 12", "night  BOOK 12", "Orrery & Quill 2029"]),
        "text": st.sampled_from(["", "thin cloud", "two\nlines"]),
    }
)


def nan(values):
    return np.array([np.nan if value is None else value for value in values], dtype=np.float64)


def words(values):
    known = list(dict.fromkeys(value for value in values if value is not None))
    codes = [-1 if value is None else known.index(value) for value in values]
    return Words(known, np.array(codes, dtype=np.int32))


def columns_of(drawn, system_ids, site_id):
    def of(name):
        return [row[name] for row in drawn]

    return ObservationColumns(
        len(drawn),
        {"kind": "photometry", "unit": "mag", "time_scale": "utc", "time_place": "observatory"},
        {
            "bmjd_tdb": nan(of("time")),
            "value": nan(of("value")),
            "value_minus": nan(of("minus")),
            "value_plus": nan(of("plus")),
            "position_angle_deg": nan(of("angle")),
            "frequency_ghz": nan(of("frequency")),
            "limit_sigma": np.where(np.array([row["limit"] is None for row in drawn]), np.nan, 3.0),
        },
        {
            "system_id": np.array([system_ids[place] for place in of("system")]),
            "site_id": np.array([site_id if here else -1 for here in of("site")]),
            "shell_index": np.array([-1 if index is None else index for index in of("index")]),
        },
        {
            "band": words(of("band")),
            "limit_side": words(of("limit")),
            "source": words(of("source")),
            "text": words(of("text")),
        },
        {"time_text": [f"MJD {row['time']}" for row in drawn]},
    )


def alone(row, system_ids, site_id):
    return Observation(
        0, "", system_ids[row["system"]], "photometry",
        Moment(row["time"], None, None, f"MJD {row['time']}", "utc", "observatory"),
        value=Measured(row["value"], row["minus"], row["plus"]), unit="mag", limit_side=row["limit"],
        limit_sigma=None if row["limit"] is None else 3.0, band=row["band"], frequency_ghz=row["frequency"],
        position_angle_deg=None if row["angle"] is None else Measured(row["angle"]), shell_index=row["index"],
        site_id=site_id if row["site"] else None, source=row["source"], text=row["text"],
    )  # fmt: skip


def stored(database):
    left_out = {"id", "uid", "entered_at", "operation_id"}
    with store.reading(database) as connection:
        found = connection.execute(select(table)).mappings().all()
    return sorted(
        (repr([value for name, value in row.items() if name not in left_out]) for row in found), key=str
    )


@settings(max_examples=40, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(drawn=st.lists(rows, min_size=1, max_size=12))
def test_both_ways_of_entering_make_the_same_rows(drawn, database, tmp_path):
    shutil.copy(database, tmp_path / "one.db")
    shutil.copy(database, tmp_path / "many.db")
    for path in (tmp_path / "one.db", tmp_path / "many.db"):
        with store.writing(path, at=FIRST, who="Ida Vik", command="test") as writing:
            system_ids = [systems.add_system(writing, bare_system(f"Lantern {n}")) for n in range(3)]
            site_id = sites.add_site(writing, full_site())
    with store.writing(tmp_path / "one.db", at=later(1), who="Ida Vik", command="test") as writing:
        for row in drawn:
            observations.add_observation(writing, alone(row, system_ids, site_id))
    columns = columns_of(drawn, system_ids, site_id)
    digests = bulk.digests_of(columns)
    _, first = np.unique(digests, axis=0, return_index=True)
    with store.writing(tmp_path / "many.db", at=later(1), who="Ida Vik", command="test") as writing:
        added = bulk.add_columns(writing, columns, digests, np.sort(first), lambda done: None)
    assert added == len(first)
    assert stored(tmp_path / "many.db") == stored(tmp_path / "one.db")


def some(system_id, size, **changes):
    base = {
        "bmjd_tdb": np.linspace(60_000.0, 60_100.0, size),
        "value": np.linspace(7.0, 8.0, size),
    }
    return ObservationColumns(
        size,
        {
            "system_id": system_id,
            "kind": "photometry",
            "unit": "mag",
            "time_scale": "tdb",
            "time_place": "barycentre",
        }
        | changes.pop("same", {}),
        base | changes.pop("numbers", {}),
        changes.pop("wholes", {}),
        changes.pop("words", {}),
        {"time_text": [f"row {n}" for n in range(size)]} | changes.pop("texts", {}),
    )


def add(write, columns):
    with write(at=later(1)) as writing:
        return bulk.add_columns(
            writing, columns, bulk.digests_of(columns), np.arange(columns.size), lambda done: None
        )


@pytest.fixture
def system_id(write):
    with write() as writing:
        return systems.add_system(writing, bare_system("Lantern 3"))


@pytest.mark.parametrize(
    ("changes", "column"),
    [
        ({"numbers": {"value_minus": np.array([0.1, np.inf, 0.1])}}, "value_minus"),
        ({"texts": {"time_text": ["a", "b\x1b[31m", "c"]}}, "time_text"),
        ({"texts": {"time_text": ["a", "b" * 201, "c"]}}, "time_text"),
        ({"texts": {"time_text": ["a", "\ud800", "c"]}}, "time_text"),
        ({"texts": {"time_text": ["a", 7, "c"]}}, "time_text"),
        ({"words": {"band": words(["K", "k" * 51, "K"])}}, "band"),
        ({"words": {"quality": words(["good", "superb", "good"])}}, "quality"),
        ({"wholes": {"shell_index": np.array([1, 2**31, 1])}}, "shell_index"),
        ({"words": {"limit_side": words(["above", "sideways", "above"])}}, "limit_side"),
    ],
)
def test_no_value_gets_past_the_guards(write, system_id, database, changes, column):
    with pytest.raises(ValueRefused) as refused:
        add(write, some(system_id, 3, **changes))
    assert (refused.value.details["column"], refused.value.details["row"]) == (column, 1)
    assert stored(database) == []


@pytest.mark.parametrize(
    "same",
    [{"instrument": "x\x07"}, {"observer": "y" * 201}, {"quality": "superb"}, {"limit_sigma": float("nan")}],
)
def test_what_is_alike_in_all_rows_passes_the_guards_too(write, system_id, database, same):
    with pytest.raises(ValueRefused):
        add(write, some(system_id, 3, same=same))
    assert stored(database) == []


@pytest.mark.parametrize(
    "text", ["Robert'); DROP TABLE observations;--", "50 % of ?1 and :a", "'", "\u2212 'x' ±"]
)
def test_text_that_is_alike_in_all_rows_comes_back_as_it_was(write, system_id, database, text):
    assert add(write, some(system_id, 3, same={"instrument": text, "source": text})) == 3
    with store.reading(database) as connection:
        found = observations.observations_of(connection, [system_id])
    assert [(each.instrument, each.source) for each in found] == [(text, text)] * 3


def test_a_load_is_one_operation_with_one_line_in_the_journal(write, system_id, database):
    assert add(write, some(system_id, 45_000)) == 45_000
    with store.reading(database) as connection:
        operation = (
            connection.execute(select(operations.c.id).order_by(operations.c.id.desc())).scalars().first()
        )
        lines = connection.execute(
            select(changes.c.action, changes.c.after).where(changes.c.operation_id == operation)
        ).all()
        rows_of_it = connection.execute(select(table.c.operation_id, table.c.uid)).all()
        arrays = observations.photometry_arrays(connection)[system_id]
    assert [tuple(line) for line in lines] == [("insert many", {"rows": 45_000})]
    assert {row.operation_id for row in rows_of_it} == {operation}
    assert len({row.uid for row in rows_of_it}) == 45_000
    assert arrays.bmjd_tdb.tolist() == np.linspace(60_000.0, 60_100.0, 45_000).tolist()


def test_nothing_is_left_of_a_load_that_was_stopped(write, system_id, database):
    def told(done):
        if done:
            raise KeyboardInterrupt

    columns = some(system_id, 45_000)
    with pytest.raises(KeyboardInterrupt), write(at=datetime(2031, 5, 1, tzinfo=UTC)) as writing:
        bulk.add_columns(writing, columns, bulk.digests_of(columns), np.arange(45_000), told)
    assert stored(database) == []


def test_known_rows_are_those_in_use_within_the_range(write, system_id, database):
    add(write, some(system_id, 11))
    with write(at=later(2)) as writing:
        ids = [row.id for row in observations.observations_of(writing.connection, [system_id])]
        observations.withdraw_observation(writing, ids[5], "a test")
        known = bulk.known_rows(writing.connection, system_id, "photometry", 60_020.0, 60_080.0)
        none = bulk.known_rows(writing.connection, system_id, "velocity", 0.0, 1e5)
    assert known.id.tolist() == ids[2:5] + ids[6:9]
    assert known.value.tolist() == pytest.approx([7.2, 7.3, 7.4, 7.6, 7.7, 7.8])
    assert none.id.size == 0


@pytest.mark.parametrize("size", [1, 50, 51, 20_049])
def test_a_load_leaves_no_row_out_whatever_its_number(database, system_id, size):
    with store.loading(database, at=later(1), who="Ida Vik", command="test") as writing:
        columns = some(system_id, size)
        rows = np.arange(size)
        assert bulk.add_columns(writing, columns, bulk.digests_of(columns), rows, lambda done: None) == size
    with store.reading(database) as connection:
        texts = connection.execute(select(table.c.time_text).order_by(table.c.bmjd_tdb)).scalars().all()
    assert sorted(texts) == sorted(f"row {n}" for n in range(size))


@pytest.mark.parametrize("column", ["system_id", "site_id", "superseded_by_id"])
@pytest.mark.parametrize("alike", [True, False])
def test_a_load_refers_to_nothing_that_is_not_there(database, system_id, column, alike):
    # Source: what the foreign keys of the tables say; a load looks them up in their place.
    wrong = {"same": {column: 77}} if alike else {"wholes": {column: np.array([1, 77, 1])}}
    columns = some(system_id, 3, **wrong)
    with (
        pytest.raises(LookupError, match=f"observations.{column} refers to"),
        store.loading(database, at=later(1), who="Ida Vik", command="test") as writing,
    ):
        bulk.add_columns(writing, columns, bulk.digests_of(columns), np.arange(3), lambda done: None)
    assert stored(database) == []


def test_a_load_enters_the_same_rows_as_any_writing(database, system_id, write, tmp_path):
    columns = some(system_id, 137, wholes={"shell_index": np.array([-1, *range(1, 137)])})
    shutil.copy(database, tmp_path / "other.db")
    add(write, columns)
    with store.loading(tmp_path / "other.db", at=later(1), who="Ida Vik", command="test") as writing:
        bulk.add_columns(writing, columns, bulk.digests_of(columns), np.arange(137), lambda done: None)
    assert stored(tmp_path / "other.db") == stored(database)


@pytest.mark.parametrize("size", [3, 300])
def test_a_load_enters_no_observation_twice(database, system_id, size):
    columns = some(
        system_id, size, numbers={"bmjd_tdb": np.full(size, 60_000.0), "value": np.full(size, 7.0)}
    )
    with (
        pytest.raises(Conflict),
        store.loading(database, at=later(1), who="Ida Vik", command="test") as writing,
    ):
        bulk.add_columns(writing, columns, bulk.digests_of(columns), np.arange(size), lambda done: None)
    assert stored(database) == []
