"""Bad rows in a table of their own: not mended they are refused again for the same reasons; mended they go
in, and mean then what they mean in the table that they came from.

Expectations: the words of the issue ("a table that can be mended and loaded again"), and what the whole table
comes to where its bad cells were good from the beginning.
"""

from __future__ import annotations

import contextlib
import shutil
import sqlite3

import pytest

from campaign.__main__ import run

HEAD = "system,HJD_UTC,band,mag,e_mag\n"
# How the bad cell is spelled, and what was meant.
BAD, GOOD = "bright", "7.25"


@pytest.fixture(scope="module")
def template(tmp_path_factory):
    db = tmp_path_factory.mktemp("template") / "campaign.db"
    system = ["system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30", "--alias", "LN3"]
    for words in (["begin"], system):
        assert run([*words, "--quiet", "--db", str(db)]) == 0
    return db


@pytest.fixture
def program(template, run_campaign, own_database):
    shutil.copy(template, own_database)
    return run_campaign


def rows(database):
    names = "system_id, kind, bmjd_tdb, value, value_minus, unit, band, star, species, text, time_text"
    with contextlib.closing(sqlite3.connect(database)) as connection:
        return sorted(connection.execute(f"SELECT {names} FROM observations"), key=repr)


# A table whose head says units and how its times are counted.
VOTABLE = f"""<?xml version="1.0"?>
<VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"><RESOURCE>
<TIMESYS ID="t" timeorigin="2450000.0" timescale="TDB" refposition="BARYCENTER"/>
<TABLE><FIELD name="name" datatype="char" arraysize="*"/>
<FIELD name="time" datatype="double" unit="d" ref="t"/>
<FIELD name="RV" datatype="char" arraysize="*" unit="m/s"/><FIELD name="star" datatype="char" arraysize="*"/>
<DATA><TABLEDATA><TR><TD>LN3</TD><TD>7001.5</TD><TD>-45200</TD><TD>A</TD></TR>
<TR><TD>LN3</TD><TD>7002.5</TD><TD>{BAD}</TD><TD>A</TD></TR></TABLEDATA></DATA></TABLE></RESOURCE></VOTABLE>
"""
ECSV = f"""# %ECSV 1.0
# ---
# datatype:
# - {{name: name, datatype: string}}
# - {{name: BJD_TDB-2450000, datatype: float64, unit: d}}
# - {{name: RV, datatype: string, unit: m / s}}
# - {{name: star, datatype: string}}
name BJD_TDB-2450000 RV star
LN3 7001.5 -45200 A
LN3 7002.5 {BAD} A
"""
TABLES = {
    "csv": (HEAD + f"LN3,2461234.5,K,7.3,0.02\nLN3,2461235.5,K,{BAD},0.02\n", ()),
    "unit below": (f"name  HMJD_UTC  RV      star\n()    (d)   (m/s)   ()\nLN3   61234.5   {BAD}  A\n", ()),
    "unit beside": (f"name;BJD_TDB;RV (m/s);star\nLN3;2461234.5;{BAD};A\n", ()),
    "no names": (f"LN3 2461234.5 {BAD} 0.02\nLN3 2461235.5 7.3 0.02\n", (
        "--as", "photometry", "--column", "system=1", "--column", "time=2 as HJD_UTC", "--column", "mag=3",
        "--column", "e_mag=4", "--constant", "band=K",
    )),
    "said": (f"who,t,m [mmag]\nLN3,1234.5,{BAD}\n", (
        "--as", "photometry", "--column", "system=who", "--column", "time=t as HJD_UTC-2460000",
        "--column", "mag=m as mag", "--constant", "band=K",
    )),
    "groups": (f',K,,J,\nHJD_UTC,mag,err,mag,err\n2461234.5,{BAD},0.02,8.9,0.03\n', ("--system", "LN3")),
    "lines": (HEAD.strip() + f',note\nLN3,2461234.5,K,{BAD},0.02,"a, ""b"" =c"\n', ()),
    "votable": (VOTABLE, ()),
    "ecsv": (ECSV, ()),
}  # fmt: skip


@pytest.mark.parametrize("name", TABLES)
def test_mended_rows_mean_what_they_mean_in_their_own_table(program, own_database, template, tmp_path, name):
    table, words = TABLES[name]
    path, rejects = tmp_path / "table", tmp_path / "rejects.csv"
    path.write_text(table.replace(BAD, GOOD))
    assert program("load", str(path), *words).status == 0
    meant = rows(own_database)
    shutil.copy(template, own_database)
    path.write_text(table)
    first = program("load", str(path), "--skip-bad", "--rejects", str(rejects), *words, "--json")
    assert (first.status, first.document["data"]["bad_rows"]) == (3, 1)
    again = program("load", str(rejects), *words, "--json").error["details"]
    assert again["reasons"] == first.document["data"]["reasons"]
    rejects.write_text(rejects.read_text().replace(BAD, GOOD))
    ran = program("load", str(rejects), *words)
    assert ran.status == 0, ran.err
    assert rows(own_database) == meant


@pytest.mark.parametrize("ending", [".csv", ".ecsv", ".vot"])
def test_bad_rows_of_an_exported_table_are_mended_too(program, own_database, template, tmp_path, ending):
    source, path, rejects = (tmp_path / name for name in ("source.csv", f"table{ending}", "rejects.csv"))
    notes = ["=1+1", "'=x", "back\\slash n\\n", 'said "so", twice', "&lt; <b>"]
    lines = [
        f'LN3,{2461234.5 + n},K,7.251,0.02,"{note.replace(chr(34), chr(34) * 2)}"\n'
        for n, note in enumerate(notes)
    ]
    source.write_text(HEAD.strip() + ",note\n" + "".join(lines))
    assert program("load", str(source)).status == 0
    assert program("log", "photometry", "LN3", "K=7.251±0.02", "--at", "2031-02-03T02:00:00Z").status == 0
    meant = rows(own_database)
    assert program("export", "observations", "--to", str(path)).status == 0
    path.write_text(path.read_text().replace("7.251", BAD))
    shutil.copy(template, own_database)
    ran = program("load", str(path), "--rejects", str(rejects), "--json")
    assert ran.error["details"]["bad_rows"] == len(meant)
    rejects.write_text(rejects.read_text().replace(BAD, "7.251"))
    ran = program("load", str(rejects))
    assert ran.status == 0, ran.err
    assert rows(own_database) == meant


@pytest.mark.parametrize(
    "row",
    [
        "LN3,2461234.5,K,7.3",
        "LN3,2461234.5,K",
        "LN3",
        "LN3,2461234.5,K,7.3,0.02,more",
        '"#LN3",2461234.5,K,7.3,0.02',
    ],
)
def test_a_row_that_was_not_mended_is_never_good(program, own_database, tmp_path, row):
    path, rejects = tmp_path / "table.csv", tmp_path / "rejects.csv"
    path.write_text(HEAD + row + "\n")
    first = program("load", str(path), "--rejects", str(rejects), "--json").error["details"]
    ran = program("load", str(rejects), "--json")
    assert (ran.status, rows(own_database)) == (3, [])
    again = ran.error["details"]
    assert (again["bad_rows"], again["reasons"]) == (first["bad_rows"], first["reasons"])


def test_bad_rows_of_mended_rows_have_only_their_last_reason(program, tmp_path):
    path, rejects, more = (tmp_path / name for name in ("table.csv", "rejects.csv", "more.csv"))
    path.write_text(HEAD + f"LN3,2461234.5,K,{BAD},-1\n")
    program("load", str(path), "--rejects", str(rejects))
    assert "error-negative" in rejects.read_text()
    rejects.write_text(rejects.read_text().replace(",-1,", ",0.02,"))
    program("load", str(rejects), "--rejects", str(more))
    head, row = more.read_text().splitlines()
    assert head == HEAD.strip() + ",reason"
    assert "value-unreadable" in row
    assert "error-negative" not in row
