"""``campaign load`` as it is typed. Expectations: the issue (exit statuses, what is shown where, the first 20
bad rows and all of them in JSON, a table that can be mended, nothing left of an interrupted load)."""

from __future__ import annotations

import gzip
import io
import json
import os
import shlex
import sqlite3
import sys
import unicodedata

import pytest

HEAD = "system,HJD_UTC,band,mag,e_mag\n"
GOOD = HEAD + "Lantern 3,2461234.5,K,7.31,0.03\nLN3,2461235.5,K,7.32,0.03\n"
BAD = GOOD + "Nobody,2461236.5,K,7.3,0.03\nLantern 3,2461237.5,K,bright,0.03\n"


@pytest.fixture
def table(tmp_path):
    def write(text, name="table.csv"):
        path = tmp_path / name
        path.write_bytes(text if isinstance(text, bytes) else text.encode())
        return str(path)

    return write


def count(database):
    with sqlite3.connect(database) as connection:
        found = connection.execute("SELECT count(*) FROM observations").fetchone()[0]
    connection.close()
    return found


def test_the_mapping_is_shown_on_stderr_and_the_result_on_stdout(kept, table):
    ran = kept("load", table(GOOD))
    assert ran.status == 0
    assert "column HJD_UTC" in ran.err
    assert "heliocentric" in ran.err
    assert "added 2" in ran.out
    assert "campaign undo" in ran.out
    assert "column" not in ran.out


def test_quiet_shows_neither(kept, table):
    ran = kept("load", table(GOOD), "--quiet")
    assert (ran.status, ran.out, ran.err) == (0, "", "")


def test_json_is_one_document_with_the_mapping(kept, table):
    ran = kept("load", table(GOOD), "--json")
    assert ran.status == 0
    assert ran.document["schema"] == "campaign/load/1"
    data = ran.document["data"]
    assert (data["kind"], data["added"], data["bad"], data["refused"]) == ("photometry", 2, [], False)
    assert {field["field"] for field in data["mapping"]["fields"]} >= {"system", "time", "band", "magnitude"}


def test_bad_rows_refuse_the_whole_table(kept, table, own_database, fingerprint):
    before = fingerprint()
    ran = kept("load", table(BAD))
    assert ran.status == 3
    assert ran.out == ""
    assert "system-not-found 1" in ran.err
    assert "Nothing was loaded: 2 of 4 rows cannot be." in ran.err
    assert fingerprint() == before


def test_the_first_twenty_are_shown_and_all_are_in_json(kept, table):
    text = HEAD + "".join(f"Nobody {n},2461236.5,K,7.3,0.03\n" for n in range(50))
    ran = kept("load", table(text))
    assert "Nobody 19" in ran.err
    assert "Nobody 20" not in ran.err
    assert "and 30 more" in ran.err
    error = kept("load", table(text), "--json").error
    assert error["code"] == "rows-refused"
    assert error["details"]["reasons"] == {"system-not-found": 50}
    bad = error["details"]["bad"]
    assert len(bad) == 50
    assert bad[49].keys() == {"file", "line", "column", "reason", "why", "text"}
    assert (bad[49]["line"], bad[49]["column"], bad[49]["text"]) == (51, "system", "Nobody 49")


def test_skip_bad_loads_the_rest_and_says_so_by_its_status(kept, table, own_database):
    ran = kept("load", table(BAD), "--skip-bad")
    assert ran.status == 3
    assert "added 2" in ran.out
    assert "2 bad rows left out" in ran.out
    assert count(own_database) == 2


def test_rejects_can_be_mended_and_loaded_again(kept, table, tmp_path, own_database):
    rejects = tmp_path / "rejects.csv"
    kept("load", table(BAD), "--skip-bad", "--rejects", str(rejects))
    text = rejects.read_text()
    assert text.splitlines()[0] == HEAD.strip() + ",reason"
    # Loaded as it stands it is refused again, for the same reasons and no others.
    again = kept("load", str(rejects), "--json").error["details"]["reasons"]
    assert again == {"system-not-found": 1, "value-unreadable": 1}
    rejects.write_text(text.replace("Nobody", "Lantern 3").replace("bright", "7.33"))
    assert kept("load", str(rejects)).status == 0
    assert count(own_database) == 4


def test_rejects_never_replace_a_file(kept, table, tmp_path):
    path = table(BAD)
    ran = kept("load", path, "--rejects", path)
    assert ran.status == 5
    with open(path) as file:
        assert file.read() == BAD


@pytest.mark.skipif(not os.path.exists("/dev/full"), reason="no device that is always full")
def test_good_rows_that_went_in_are_told_when_the_bad_ones_find_no_room(kept, table, own_database):
    ran = kept("load", table(BAD), "--skip-bad", "--rejects", "/dev/full")
    assert ran.status == 8
    assert count(own_database) == 2
    assert "in the catalogue all the same" in ran.err.splitlines()[-1]
    assert "Nothing was left" not in ran.err
    refused = kept("load", table(BAD), "--rejects", "/dev/full")
    assert refused.status == 8
    assert "in the catalogue" not in refused.err


def test_conflicts_are_shown_and_refused_until_also_is_said(kept, table, own_database):
    kept("load", table(GOOD))
    other = table(GOOD.replace("7.31", "7.51"), "other.csv")
    ran = kept("load", other)
    assert ran.status == 5
    assert "7.51" in ran.err
    assert "7.31" in ran.err
    assert count(own_database) == 2
    assert kept("load", other, "--also").status == 0
    assert count(own_database) == 3


def test_the_same_file_again_says_that_nothing_is_new(kept, table):
    path = table(GOOD)
    kept("load", path)
    ran = kept("load", path)
    assert ran.status == 0
    assert "nothing is new" in ran.out


def test_standard_input_packed_or_not(kept, own_database, monkeypatch):
    for data in (gzip.compress(GOOD.encode()), GOOD.replace("246123", "246124").encode()):
        monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(data)))
        assert kept("load", "-").status == 0
    assert count(own_database) == 4


def test_columns_constants_and_a_mapping_that_is_kept(kept, table, own_database):
    text = "t m s\n1234.5 7310 20\n1235.5 7320 20\n"
    words = ("--as", "photometry", "--column", "time=t as HJD_UTC-2460000", "--column", "mag=m as mmag",
             "--column", "e_mag=s", "--constant", "band=K", "--system", "LN3")  # fmt: skip
    ran = kept("load", table(text), *words, "--keep-mapping", "survey")
    assert ran.status == 0, ran.err
    assert "mapping kept as 'survey'" in ran.out
    assert kept("load", table(text.replace("123", "125"), "two.csv"), "--mapping", "survey").status == 0
    assert count(own_database) == 4


@pytest.mark.parametrize(
    ("words", "status"),
    [
        ((), 2),
        (("no-such-file.csv",), 4),
        (("FILE", "--as", "novel"), 3),
        (("FILE", "--column", "mag"), 2),
        (("FILE", "--column", "=x"), 2),
        (("FILE", "--column", "mag=mag", "--column", "mag=mag"), 2),
        (("FILE", "--constant", "colour=red"), 2),
        (("FILE", "--system", "x", "--constant", "system=y"), 2),
        (("FILE", "--mapping", "none"), 4),
        (("FILE", "--encoding", "rot13"), 3),
        (("FILE", "--system", "Nobody"), 4),
        (("FILE", "--constant", "site=Nowhere"), 4),
    ],
)
def test_what_cannot_be_meant_has_a_status_and_a_way_out(kept, table, words, status):
    path = table(GOOD)
    ran = kept("load", *[path if word == "FILE" else word for word in words])
    assert ran.status == status, ran.err
    assert "next:" in ran.err


@pytest.mark.parametrize(
    ("text", "said"),
    [
        (GOOD.replace("7.31", "99.99"), '--missing "99.99"'),
        (GOOD.replace("7.31", "n/a"), '--missing "n/a"'),
        (GOOD.replace(",", ";").replace("7.31", "7,31"), "--constant decimal=comma"),
        (GOOD.replace("7.31", ""), '--missing ""'),
        (GOOD.replace("24612", "612"), '--column "time=HJD_UTC as HJD_UTC-2400000"'),
        (GOOD.replace("24612", "12"), '--column "time=HJD_UTC as HJD_UTC-2450000"'),
    ],
)
def test_what_settles_many_bad_cells_at_once_is_said_and_works(kept, table, own_database, text, said):
    ran = kept("load", table(text))
    assert ran.status == 3
    assert said in ran.err.splitlines()[-1]
    flag, _, value = said.partition(" ")
    assert kept("load", table(text), flag, value.strip('"')).status == 0
    assert count(own_database) == (1 if flag == "--missing" else 2)


def test_grades_of_others_in_a_column_of_quality_are_left_out_as_said(kept, table, own_database):
    text = GOOD.replace("e_mag", "e_mag,qual").replace("0.03", "0.03,A")
    ran = kept("load", table(text))
    assert ran.status == 3
    assert "--constant quality=good" in ran.err.splitlines()[-1]
    assert kept("load", table(text), "--constant", "quality=good").status == 0
    assert count(own_database) == 2


@pytest.mark.parametrize("word", ["bright", "9" * 300, "7.3.1", "1e400"])
def test_nothing_is_said_where_nothing_settles_them(kept, table, word):
    ran = kept("load", table(GOOD.replace("7.31", word)))
    assert ran.err.splitlines()[-1] == "  next: Mend the rows; the good ones go in with --skip-bad."


def test_the_examples_of_the_help_work(kept, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "lightcurve.csv").write_text("HJD,mag\n2461234.5,7.3\n")
    (tmp_path / "survey.txt.gz").write_bytes(gzip.compress(b"t m s\n11234.5 7.3 0.1\n"))
    (tmp_path / "velocities.tsv").write_text("name\tMJD\tRV\tstar\nLN3\t61234.1\t-45\tA\n")
    (tmp_path / "orbits.csv").write_text("system,label,P,T0\nLN3,new,3130±4,BJD 2461230±3\n")
    _, _, text = kept("load", "--help").out.partition("For example:\n")
    lines = text.split("\n\n")[0].replace("\\\n", " ").splitlines()
    examples = [words[1:] for line in lines if (words := shlex.split(line))[:1] == ["campaign"]]
    assert len(examples) == 4
    for words in examples:
        ran = kept(*words)
        assert ran.status == 0, (words, ran.err)
        assert "added 1 " in ran.out or "would add 1 " in ran.out


def test_nothing_is_written_before_the_mapping_is_shown(kept, table, own_database, fingerprint, monkeypatch):
    from campaign.output import loading

    before, seen = fingerprint(), []

    def shown(screen, understood):
        seen.append(fingerprint())

    monkeypatch.setattr(loading, "render_understood", shown)
    assert kept("load", table(GOOD)).status == 0
    assert seen == [before]
    assert fingerprint() != before


STEERING = "\x1b[31m\x1b]52;c;eA==\x07\x9b\u202e\x00[bold]x[/bold]:warning:"


@pytest.mark.parametrize("as_json", [False, True])
@pytest.mark.parametrize(
    "text",
    [
        HEAD + f"{STEERING},2461234.5,K,7.3,0.03\n",
        HEAD + f"Lantern 3,{STEERING},K,7.3,0.03\n",
        HEAD + f'Lantern 3,2461234.5,"{STEERING}",7.3,0.03\n',
        HEAD + f"Lantern 3,2461234.5,K,{STEERING},0.03\n",
        HEAD + f"Lantern 3,2461234.5,K,7.3,0.03,{STEERING}\n",
        f"system,HJD_UTC,band,mag,{STEERING}\nLantern 3,2461234.5,K,7.3,1\n",
        f"{STEERING},x\n1,2\n",
        GOOD.encode("utf-16"),
        b"\xff" + GOOD.encode(),
    ],
)
def test_nothing_from_a_table_steers_the_terminal(kept, table, text, as_json):
    ran = kept("load", table(text), *(["--json"] if as_json else []))
    for stream in (ran.out, ran.err):
        assert not [
            c for c in stream if c != "\n" and unicodedata.category(c) in {"Cc", "Cf", "Cs", "Zl", "Zp"}
        ]
    if as_json and ran.status:
        json.loads(ran.err)


def test_markup_in_a_note_is_kept_as_it_stands(kept, table, own_database):
    text = "system,HJD_UTC,band,mag,note\nLantern 3,2461234.5,K,7.3,[red]moon[/red] :warning:\n"
    assert kept("load", table(text)).status == 0
    with sqlite3.connect(own_database) as connection:
        assert (
            connection.execute("SELECT text FROM observations").fetchone()[0] == "[red]moon[/red] :warning:"
        )
    connection.close()
