"""Observations on their way out: columns as agreed, in an order that no catalogue changes, by choice."""

from __future__ import annotations

import pytest
from catalogue_examples import bare_system, every_kind, full_site, later, photometry, space_site

from campaign.catalogue import observations, sites, store, systems, tables, types
from campaign.catalogue.exchanged import count_exchanged, exchanged_columns, exchanged_observations
from campaign.catalogue.listing import Filters
from campaign.model.exchange_columns import EXCHANGE_KINDS, exchange_columns
from campaign.model.observations import OBSERVATION_KINDS

OWN_TABLE = {
    "observations": tables.observations,
    "systems": tables.systems,
    "solutions": tables.solutions,
    "episodes": tables.episodes,
}
# Columns of exchanged tables that are kept under another name or in another table.
ELSEWHERE = {
    ("systems", "name"): tables.system_names.c.name,
    ("observations", "site"): tables.sites.c.name,
    ("observations", "site_time_zone"): tables.sites.c.time_zone,
    ("observations", "site_kind"): tables.sites.c.kind,
    ("systems", "star_a_spectral_type"): tables.stars.c.spectral_type,
    ("systems", "star_b_spectral_type"): tables.stars.c.spectral_type,
    ("systems", "rule_kind"): tables.dust_rules.c.kind,
    ("systems", "rule_note"): tables.dust_rules.c.note,
    ("observations", "source"): tables.sources.c.title,
    ("solutions", "source"): tables.sources.c.title,
    ("episodes", "source"): tables.sources.c.title,
    ("observations", "system"): tables.system_names.c.name,
    ("solutions", "system"): tables.system_names.c.name,
    ("episodes", "system"): tables.system_names.c.name,
    ("observations", "superseded_by"): tables.observations.c.uid,
}
# Documents in one cell, and what is told of a row.
NOT_KEPT = {"aliases", "covariance", "out_of_use"}


def rows_of(database, systems_wanted, **choice):
    with store.reading(database) as connection:
        return list(exchanged_observations(connection, systems_wanted, Filters(**choice)))


def column(rows, name):
    place = exchanged_columns().index(name)
    return [row[place] for row in rows]


@pytest.fixture
def filled(write):
    """Two systems with one observation of each kind, a superseded and a withdrawn one."""
    with write() as writing:
        dim = systems.add_system(writing, bare_system("Dim"))
        faint = systems.add_system(writing, bare_system("Faint"))
        mesa = sites.add_site(writing, full_site())
        kite = sites.add_site(writing, space_site())
        for entry in every_kind(dim, mesa):
            observations.add_observation(writing, entry)
        observations.add_observation(writing, photometry(faint, 61501.0, uid="b", band="L", site_id=kite))
        observations.add_observation(writing, photometry(faint, 61501.0, uid="a", band="K", quality="bad"))
        observations.add_observation(writing, photometry(faint, 61502.0, uid="c", source="Night book 12"))
    with write(later(1)) as writing:
        observations.supersede_observation(writing, 12, photometry(faint, 61502.5, uid="d"))
        observations.withdraw_observation(writing, 11)
    return (dim, "Dim"), (faint, "Faint")


def test_cells_come_in_the_order_of_the_agreed_columns(filled, database):
    agreed = tuple(each.name for each in exchange_columns("observations", also_out_of_use=True))
    assert exchanged_columns() == agreed
    assert all(len(row) == len(agreed) for row in rows_of(database, filled, out_of_use=True))
    assert {len(row) for row in rows_of(database, filled)} == {len(exchange_columns("observations"))}


@pytest.mark.parametrize("kind", EXCHANGE_KINDS)
def test_texts_and_words_are_those_that_the_catalogue_takes(kind):
    looked_at = 0
    for each in exchange_columns(kind, also_out_of_use=True):
        if not each.is_text or each.name in NOT_KEPT:
            continue
        kept = ELSEWHERE.get((kind, each.name))
        of_table = OWN_TABLE[kind].c[each.name].type if kept is None else kept.type
        if each.type == "word":
            assert set(each.words) == set(of_table.words), each.name
        else:
            assert isinstance(of_table, types.Line | types.Prose)
            assert each.longest == of_table.longest, each.name
            assert each.is_prose == isinstance(of_table, types.Prose), each.name
        looked_at += 1
    assert looked_at >= 7


def test_every_kind_of_observation_is_agreed():
    (kind,) = (each for each in exchange_columns("observations") if each.name == "kind")
    assert kind.words == OBSERVATION_KINDS


def test_ties_in_time_are_broken_by_uid_and_not_by_the_order_of_entry(filled, database):
    rows = rows_of(database, filled[1:], out_of_use=True)
    assert column(rows, "uid") == ["a", "b", "c", "d"]


def test_systems_come_in_the_order_asked_for(filled, database):
    there = column(rows_of(database, filled), "system")
    back = column(rows_of(database, filled[::-1]), "system")
    assert there == ["Dim"] * 9 + ["Faint"] * 2
    assert back == ["Faint"] * 2 + ["Dim"] * 9


def test_what_is_out_of_use_comes_only_when_asked_for_and_says_why(filled, database):
    assert column(rows_of(database, filled[1:]), "uid") == ["b", "d"]
    rows = rows_of(database, filled[1:], out_of_use=True)
    told = list(
        zip(column(rows, "uid"), column(rows, "out_of_use"), column(rows, "superseded_by"), strict=True)
    )
    assert told == [("a", "withdrawn", None), ("b", None, None), ("c", "superseded", "d"), ("d", None, None)]


def test_the_site_is_described_beside_the_observation(filled, database):
    (row,) = rows_of(database, filled[:1], kinds=("photometry",))
    described = [column([row], name)[0] for name in exchanged_columns() if name.startswith("site")]
    assert described == [
        "Cold Mesa", "ground", -31.25, -70.75, 2450.0, 20.0, None, None, "America/Santiago",
    ]  # fmt: skip


def test_units_are_told_as_others_know_them(filled, database):
    rows = rows_of(database, filled[:1])
    assert set(column(rows, "unit")) == {"mag", "Jy", "km/s", "Angstrom", "mas", "arcsec", None}


@pytest.mark.parametrize(
    ("choice", "uids"),
    [
        ({"bands": ("L",)}, ["b"]),
        ({"bands": ("K", "L")}, ["a", "b", "c", "d"]),
        ({"kinds": ("velocity",)}, []),
        ({"since_bmjd_tdb": 61501.5}, ["c", "d"]),
        ({"since_bmjd_tdb": 61501.0, "until_bmjd_tdb": 61501.0}, ["a", "b"]),
        ({"site_id": 2}, ["b"]),
        ({"source": "night BOOK"}, ["c"]),
        ({"source": "book%"}, []),
        ({"qualities": ("bad",)}, ["a"]),
    ],
    ids=str,
)
def test_observations_are_chosen_by_what_they_are(choice, uids, filled, database):
    rows = rows_of(database, filled[1:], out_of_use=True, **choice)
    assert column(rows, "uid") == uids
    with store.reading(database) as connection:
        counts = count_exchanged(connection, {filled[1][0]}, Filters(out_of_use=True, **choice))
    assert sum(counts.values()) == len(uids)


def test_counts_are_told_by_unit(filled, database):
    with store.reading(database) as connection:
        counts = count_exchanged(connection, {number for number, _ in filled}, Filters())
    assert counts == {"mag": 3, "jy": 2, "kms": 1, "angstrom": 1, "mas": 1, "arcsec": 1, None: 2}
