"""Tables that no one should have sent: all or nothing, line and column, and no byte that steers a terminal.

Expectations: the words of the issue (what must never happen), and for each table by hand where it is wrong.
"""

from __future__ import annotations

import contextlib
import io
import json
import shutil
import sqlite3
import sys
import unicodedata
from pathlib import Path

import pytest
from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st

from campaign.__main__ import run

HEAD = "system,HJD_UTC,band,mag,e_mag,note\n"
ROW = "Lantern 3,2461234.5,K,7.31,0.03,clear\n"
TABLE = HEAD + ROW + "LN3,2461235.5,K,7.32,0.03,\n"
LONG = "x" * 200_000
QUICK = (Phase.explicit, Phase.generate)


def steering(text):
    """Characters that steer a terminal or hide; a line feed ends a line."""
    return [c for c in text if c != "\n" and unicodedata.category(c) in {"Cc", "Cf", "Cs", "Zl", "Zp"}]


def count(database):
    with contextlib.closing(sqlite3.connect(database)) as connection:
        return connection.execute("SELECT count(*) FROM observations").fetchone()[0]


@pytest.fixture(scope="module")
def template(tmp_path_factory):
    """A database with one system, to be copied."""
    db = tmp_path_factory.mktemp("template") / "campaign.db"
    system = ["system", "add", "Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30", "--alias", "LN3"]
    for words in (["begin"], system):
        assert run([*words, "--quiet", "--db", str(db)]) == 0
    return db


@pytest.fixture
def kept(template, run_campaign, own_database):
    shutil.copy(template, own_database)
    return run_campaign


@pytest.fixture
def loaded(kept, own_database, tmp_path):
    """Loads a table and looks at what must be true of every load; its JSON, of data or of the error."""

    def load(table, *words):
        path = tmp_path / "table.csv"
        path.write_bytes(table if isinstance(table, bytes) else table.encode("utf-8", "surrogatepass"))
        before, rejects = count(own_database), tmp_path / "rejects.csv"
        plain = kept("load", str(path), "--dry-run", *words)
        ran = kept("load", str(path), "--json", "--rejects", str(rejects), *words)
        streams = [plain.out, plain.err, ran.out, ran.err]
        assert max(map(len, streams)) < 20_000
        # Cells to be mended are there whole.
        streams += [rejects.read_bytes().decode("utf-8")] if rejects.exists() else []
        assert not [stream for stream in streams if steering(stream)]
        rejects.unlink(missing_ok=True)
        assert plain.status == ran.status
        if ran.status:
            assert count(own_database) == before
            assert len([line for line in plain.err.splitlines() if line.startswith("  next: ")]) == 1
            return ran.error
        return ran.document["data"]

    return load


def cells(found):
    return [(cell["line"], cell["column"], cell["reason"]) for cell in found["details"]["bad"]]


def replaced(old, new):
    assert old in TABLE
    return TABLE.replace(old, new, 1)


@pytest.mark.parametrize(
    "table",
    [
        "\ufeff" + TABLE,
        TABLE.replace("\n", "\r\n"),
        TABLE.replace("\n", "\r"),
        "\ufeff" + TABLE.replace("\n", "\r\n") + "\r\n\r\n",
        TABLE.rstrip("\n"),
        TABLE.replace("2461234.5", " 2461234.5 "),
        replaced("clear", '"said ""clear"", [b]not[/b] \x3c3"'),
        "\n\n# made by hand\n" + TABLE,
        TABLE + ",,,,,\n\n   \n",
    ],
    ids=["mark", "crlf", "cr", "mark crlf", "no end", "spaces", "quotes", "comments", "empty rows"],
)
def test_what_is_only_unusual_is_loaded(loaded, table):
    assert loaded(table)["added"] == 2


def test_the_minus_sign_of_typesetters_is_a_minus(loaded, own_database):
    assert loaded(replaced("7.31", "\u22121.46"))["added"] == 2
    with contextlib.closing(sqlite3.connect(own_database)) as connection:
        assert connection.execute("SELECT min(value) FROM observations").fetchone() == (-1.46,)


@pytest.mark.parametrize(
    ("table", "bad"),
    [
        (replaced("clear", "cle\0ar"), [(2, "note", "text-not-plain")]),
        (replaced("7.31", "7.\x0031"), [(2, "mag", "value-unreadable")]),
        (replaced("Lantern 3", "Lantern\x00 3"), [(2, "system", "system-not-found")]),
        (replaced("clear", "\x1b[2J\x1b]0;x\x07"), [(2, "note", "text-not-plain")]),
        (replaced("LN3", "\x1b[31mLN3"), [(3, "system", "system-not-found")]),
        (replaced("LN3", "[red]LN3[/red]"), [(3, "system", "system-not-found")]),
        (replaced("LN3", "LN3\u202e"), [(3, "system", "system-not-found")]),
        (replaced("clear", "cl\u200bear"), [(2, "note", "text-not-plain")]),
        (replaced("clear", "cl\u2028ear"), [(2, "note", "text-not-plain")]),
        (replaced(",clear", ""), [(2, None, "row-too-short")]),
        (replaced("clear", "clear,too"), [(2, None, "row-too-long")]),
        (replaced(ROW, "Lantern 3\n"), [(2, None, "row-too-short")]),
        (replaced("7.31", "nan"), [(2, "mag", "value-unreadable")]),
        (replaced("7.31", "inf"), [(2, "mag", "value-unreadable")]),
        (replaced("7.31", "1e400"), [(2, "mag", "value-unreadable")]),
        (replaced("7.31", "1e-400"), [(2, "mag", "value-unreadable")]),
        (replaced("7.31", "99.99"), [(2, "mag", "out-of-range")]),
        (replaced("0.03", "1e400"), [(2, "e_mag", "number-unreadable")]),
        (replaced("0.03", "NaN"), [(2, "e_mag", "number-unreadable")]),
        (replaced("0.03", "\u22120.03"), [(2, "e_mag", "error-negative")]),
        (replaced("2461234.5", "nan"), [(2, "HJD_UTC", "number-unreadable")]),
        (replaced("2461234.5", "1e400"), [(2, "HJD_UTC", "number-unreadable")]),
        (replaced("2461234.5", "-1"), [(2, "HJD_UTC", "instant-impossible")]),
        (replaced("7.31", "7_31"), [(2, "mag", "value-unreadable")]),
        (replaced("7.31", "\uff17.31"), [(2, "mag", "value-unreadable")]),
        (replaced("7.31", "0x7"), [(2, "mag", "unit-not-accepted")]),
        (replaced("7.31", "=7+1"), [(2, "mag", "value-unreadable")]),
        (replaced("clear", LONG), [(2, "note", "text-too-long")]),
        (replaced("LN3", LONG), [(3, "system", "system-not-found")]),
        (replaced("7.31", "7" * 200_000), [(2, "mag", "value-unreadable")]),
        (replaced("2461234.5", "2" * 200_000), [(2, "HJD_UTC", "number-unreadable")]),
        (replaced("0.03", "0." + "0" * 200_000), [(2, "e_mag", "number-unreadable")]),
        (replaced("K", "K" * 200_000), [(2, "band", "text-too-long")]),
        (replaced("K,7.31", ",x"), [(2, "band", "band-missing"), (2, "mag", "value-unreadable")]),
    ],
)  # fmt: skip
def test_what_is_wrong_is_told_with_line_column_and_reason(loaded, table, bad):
    found = loaded(table)
    assert (found["code"], cells(found)) == ("rows-refused", bad)
    assert all(cell["why"] and len(cell["text"]) <= 200 for cell in found["details"]["bad"])


@pytest.mark.parametrize(
    ("table", "code", "line", "column"),
    [
        (replaced("clear", "Ås").encode("latin-1"), "encoding-unreadable", 2, 33),
        (TABLE.encode("utf-16"), "encoding-unreadable", 1, 1),
        (TABLE.encode() + b"\xff\xfe", "encoding-unreadable", 4, 1),
        (TABLE.encode() + b"\xed\xa0\x80", "encoding-unreadable", 4, 1),
        (replaced("clear", '"clear').encode(), "table-unreadable", 2, None),
        (replaced("clear", '"cl"ear').encode(), "table-unreadable", 2, None),
    ],
)
def test_bytes_that_are_no_text_are_told_with_line_and_column(loaded, table, code, line, column):
    found = loaded(table)
    assert (found["code"], found["details"]["line"]) == (code, line)
    assert found["details"].get("column") == column


@pytest.mark.parametrize("encoding", ["latin-1", "utf-16", "utf-32", "cp1252"])
def test_other_encodings_are_read_when_they_are_named(loaded, own_database, encoding):
    assert loaded(replaced("clear", "Ås").encode(encoding), "--encoding", encoding)["added"] == 2
    with contextlib.closing(sqlite3.connect(own_database)) as connection:
        assert ("Ås",) in connection.execute("SELECT text FROM observations").fetchall()


@pytest.mark.parametrize("name", [LONG, "\x1b[31m", "a\0b", "[bold]", "\u202e", ""])
def test_any_name_of_a_column_is_only_a_name(loaded, name):
    found = loaded(replaced(",note", f",{name}"))
    assert found["added"] == 2
    assert all(len(unused) <= 200 for unused in found["mapping"]["unused"])


# ------------------------------------------------------------------------------------ any change of bytes

NASTY = [
    "\x00", "\x1b[31m", "\x1b]52;c;eA==\x07", "\u202e", "\ufeff", "nan", "1e400", "\u2212", "[/b]", "'", '"',
    ",", "\n", "\r", "\t", ";", "=1+1", "x" * 1000, "\x9b", "é", "\u2028", "#", "<", ">", "&", "{", "]", ":",
    "<!ENTITY x SYSTEM 'file:///etc/passwd'>", "&x;", "\x7f", "\x85", "\ud800",
]  # fmt: skip


@pytest.fixture(scope="module")
def begun(template, tmp_path_factory):
    """A database with two systems and observations, and the tables that are changed byte by byte."""
    folder = tmp_path_factory.mktemp("hostile")
    db, own = folder / "campaign.db", folder / "own.csv"
    own.write_text(TABLE.replace("LN3", "Keel 9"))
    shutil.copy(template, db)
    for words in (
        ["system", "add", "Keel 9", "--ra", "10:45:02", "--dec", "-59:40:48"],
        ["solution", "add", "Keel 9", "--label", "one", "--period", "900±2 d", "--epoch", "BJD 2457001±3"],
        ["load", str(own)],
        *(
            ["export", kind, "--to", str(folder / f"{kind}{ending}")]
            for kind in ("observations", "systems", "solutions")
            for ending in (".csv", ".ecsv", ".vot", ".json")
        ),
        ["amend", "1", "--mag", "7.4±0.03"], ["withdraw", "2", "--why", "the wrong star"],
        *(
            ["export", "observations", "--also-withdrawn", "--to", str(folder / f"past{ending}")]
            for ending in (".csv", ".json")
        ),
    ):  # fmt: skip
        assert run([*words, "--quiet", "--db", str(db)]) == 0
    tables = [TABLE.encode(), TABLE.replace(",", "\t").encode(), _foreign("ecsv"), _foreign("votable")]
    for path in sorted(folder.iterdir()):
        if path.name != "own.csv" and path.suffix != ".db":
            tables.append(path.read_bytes())
    return db, tables


def _foreign(form):
    from astropy.io.votable import from_table, writeto
    from astropy.table import Table

    table = Table({"name": ["Lantern 3"], "BJD": [2457001.5], "Kmag": [7.3], "e_Kmag": [0.1]})
    if form == "ecsv":
        out = io.StringIO()
        table.write(out, format="ascii.ecsv")
        return out.getvalue().encode()
    data = io.BytesIO()
    writeto(from_table(table), data)
    return data.getvalue()


# Where in the table (as a part of it), what is done there, with which text, length and byte.
change = st.tuples(
    st.floats(0.0, 1.0),
    st.sampled_from(["insert", "replace", "cut", "byte", "double"]),
    st.sampled_from(NASTY).map(lambda text: text.encode("utf-8", "surrogatepass")),
    st.integers(1, 200),
    st.integers(0, 255),
)
# A table, its changes, --skip-bad, --rejects, --json.
attacks = st.tuples(
    st.integers(0, 1000),
    st.lists(change, min_size=1, max_size=3),
    st.booleans(),
    st.booleans(),
    st.booleans(),
)


def changed(table, changes):
    """A table with some bytes inserted, replaced, cut or doubled."""
    raw = bytearray(table)
    for part, how, text, length, byte in changes:
        at = int(part * len(raw))
        if how == "insert":
            raw[at:at] = text
        elif how == "replace":
            raw[at : at + len(text)] = text
        elif how == "cut":
            del raw[at : at + length // 5 + 1]
        elif how == "double":
            raw[at:at] = raw[max(0, at - length) : at]
        else:
            raw[at : at + 1] = bytes([byte])
    return bytes(raw)


def attack(begun, folder, drawn):
    number, changes, skip, with_rejects, as_json = drawn
    source, tables = begun
    db, path, rejects = (folder / name for name in ("attacked.db", "table.bin", "rejects.csv"))
    shutil.copy(source, db)
    path.write_bytes(changed(tables[number % len(tables)], changes))
    rejects.unlink(missing_ok=True)
    words = ["load", str(path), "--db", str(db), "--observer", "Ida Vik"]
    words += ["--skip-bad"] * skip + ["--rejects", str(rejects)] * with_rejects + ["--json"] * as_json
    before = db.read_bytes()
    out, err = io.StringIO(), io.StringIO()
    with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
        status = run(words)
    said, told = out.getvalue(), err.getvalue()
    assert status in (0, 2, 3, 5), told
    assert not steering(said)
    assert not steering(told)
    if as_json:
        (json.loads(said) if said else json.loads(told))
    if status and not (skip and said):
        assert db.read_bytes() == before
        if as_json:
            assert json.loads(told)["error"]["hint"]
    if rejects.exists():
        text = rejects.read_bytes().decode("utf-8")
        assert not steering(text.replace("\t", " "))
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            # Not mended they are refused again, or are good as characters that can be seen; never a fault.
            assert run(["load", str(rejects), "--db", str(db), "--dry-run"]) in (0, 2, 3, 5)


@pytest.fixture(autouse=True)
def _typed(monkeypatch):
    monkeypatch.setattr(sys, "argv", ["campaign", "load"])


@settings(max_examples=25, deadline=None, suppress_health_check=list(HealthCheck), phases=QUICK)
@given(drawn=attacks)
def test_any_change_of_bytes_is_refused_or_loaded_whole(drawn, begun, tmp_path):
    attack(begun, tmp_path, drawn)


@pytest.mark.slow
@settings(max_examples=700, deadline=None, suppress_health_check=list(HealthCheck), phases=QUICK)
@given(drawn=attacks)
def test_many_more_changes_of_bytes_are_so_too(drawn, begun, tmp_path):
    attack(begun, tmp_path, drawn)


def test_random_bytes_from_standard_input_are_refused(kept, monkeypatch):
    class Input:
        buffer = io.BytesIO(bytes(range(256)) * 40)

    monkeypatch.setattr(sys, "stdin", Input())
    ran = kept("load", "-")
    assert ran.status == 3
    assert not steering(ran.err)
    assert Path("-").exists() is False
