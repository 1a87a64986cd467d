"""Tables of our own read back: every fault told with line and column, never an unexpected error.

Forms: RFC 4180, ECSV 1.0, VOTable 1.4, RFC 8259.
"""

from __future__ import annotations

import io
import json

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from campaign.errors import CampaignError, InputRefused
from campaign.model.exchange_columns import exchange_columns
from campaign.model.exported import EXCHANGE_FORMS, OutgoingTable
from campaign.output.exchange import table_text
from campaign.reading.exchange import HEAD_BYTES, read_exchange, recognise
from campaign.reading.exchange_models import (
    episode_from_row,
    observation_from_row,
    solution_from_row,
    system_from_row,
)

NAMES = [column.name for column in exchange_columns("observations")]
GOOD = {
    "uid": "u1", "system": "Lantern 3", "kind": "photometry", "bmjd_tdb": 61500.1, "time_minus_d": 0.001,
    "time_text": "2027-04-05T02:24:00Z", "time_scale": "utc", "time_place": "observatory", "value": 7.31,
    "value_minus": 0.03, "unit": "mag", "band": "K", "shell_index": 1, "quality": "good",
    "text": "two\nlines",
}  # fmt: skip


def exported(form, *rows, kind="observations"):
    columns = exchange_columns(kind)
    cells = [tuple(row.get(column.name) for column in columns) for row in rows]
    return "".join(table_text(OutgoingTable(kind, columns, iter(cells), len(cells)), form)).encode()


def read(data, form=None):
    return list(read_exchange(io.BytesIO(data), form or recognise(data[:HEAD_BYTES])).rows)


def fault(row):
    (one,) = row.faults
    return one


# ------------------------------------------------------------------------------------------- recognising


@pytest.mark.parametrize("form", EXCHANGE_FORMS)
@pytest.mark.parametrize("kind", ["observations", "systems", "solutions", "episodes"])
def test_our_own_tables_are_recognised(form, kind):
    data = exported(form, kind=kind)
    assert recognise(data[:HEAD_BYTES]) == form
    table = read_exchange(io.BytesIO(data), form)
    assert (table.kind, table.columns) == (kind, tuple(c.name for c in exchange_columns(kind)))
    assert list(table.rows) == []


@pytest.mark.parametrize(
    "head",
    [
        b"", b"\n", b"time,mag,e_mag\n1,2,3\n", b"uid,system,kind\n", b"\xff\xfe\x00", b'"unfinished',
        b'{"schema": "campaign/observations/1"}', b"<html><body>", b"# %ECSV 1.0\n# ---\n# datatype:\n",
        b'<?xml version="1.0"?><VOTABLE><RESOURCE><TABLE name="observations"><DATA><BINARY2>',
    ],
)  # fmt: skip
def test_tables_of_others_are_not_taken_for_ours(head):
    assert recognise(head) is None


def test_a_csv_with_byte_order_mark_carriage_returns_and_columns_in_another_order_is_ours():
    names = ["time_place", "time_scale", "time_text", "bmjd_tdb", "kind", "system", "uid"]
    data = ("\ufeff" + ",".join(names) + "\r\nbarycentre,tdb,,61500.1,remark,Dim,u1\r\n").encode()
    (row,) = read(data)
    assert row.faults == ()
    assert (row.cells["system"], row.cells["bmjd_tdb"], row.cells["time_text"]) == ("Dim", 61500.1, None)


# ------------------------------------------------------------------------------------- faults of cells


@pytest.mark.parametrize("form", EXCHANGE_FORMS)
def test_a_row_tells_its_line_and_its_cells(form):
    data = exported(form, GOOD, GOOD | {"uid": "u2"}, GOOD | {"uid": "u3"})
    rows = read(data)
    lines = data.decode().split("\n")
    for row, uid in zip(rows, ("u1", "u2", "u3"), strict=True):
        assert row.faults == ()
        assert {name: cell for name, cell in row.cells.items() if cell is not None} == GOOD | {"uid": uid}
        assert uid in lines[row.line - 1]


BAD_CELLS = [
    ("bmjd_tdb", "nan", "number-unreadable"),
    ("bmjd_tdb", "inf", "number-unreadable"),
    ("bmjd_tdb", "1e400", "number-unreadable"),
    ("value", "7,31", "number-unreadable"),
    ("value", "0x10", "number-unreadable"),
    ("value", "1_000", "number-unreadable"),
    ("value", "٧", "number-unreadable"),
    ("shell_index", "1.5", "number-unreadable"),
    ("shell_index", "99999999999", "number-unreadable"),
    ("kind", "photometrie", "word-unknown"),
    ("quality", "GOOD", "word-unknown"),
    ("band", "K\x1b[31m", "control-character"),
    ("band", "K\x00", "control-character"),
    ("band", "K\u202e", "control-character"),
    ("band", "two\nlines", "control-character"),
    ("text", "bell \x07", "control-character"),
    ("band", "K" * 51, "text-too-long"),
]


@pytest.mark.parametrize(("column", "text", "code"), BAD_CELLS)
def test_a_cell_that_cannot_be_is_told_with_line_and_column(column, text, code):
    head, *_ = exported("csv", GOOD).split(b"\n", 1)
    cells = [str(GOOD.get(name, "")) for name in NAMES]
    cells[NAMES.index(column)] = text
    line = ",".join('"' + cell + '"' for cell in cells)
    rows = read(head + b"\n" + line.encode() + b"\n" + exported("csv", GOOD).split(b"\n", 1)[1])
    assert (rows[0].line, fault(rows[0]).column, fault(rows[0]).code) == (2, column, code)
    assert fault(rows[0]).text == text[:200]
    assert rows[1].faults == ()


@pytest.mark.parametrize(
    ("column", "value"),
    [
        ("bmjd_tdb", "61500.1"), ("bmjd_tdb", True), ("bmjd_tdb", [1]), ("bmjd_tdb", 10**400),
        ("shell_index", 1.5), ("shell_index", True), ("shell_index", 2**31), ("band", 5), ("band", {"a": 1}),
        ("kind", "Photometry"), ("band", "\ud800"),
    ],
)  # fmt: skip
def test_a_value_of_json_that_cannot_be_is_told(column, value):
    document = json.loads(exported("json", GOOD))
    document["data"]["rows"][0][column] = value
    (row,) = read(json.dumps(document).encode())
    assert fault(row).column == column


def test_several_faults_of_a_row_are_all_told():
    data = exported("csv", GOOD).replace(b"photometry", b"x").replace(b"7.31", b"y")
    assert [each.column for each in read(data)[0].faults] == ["kind", "value"]


@pytest.mark.parametrize("cut", [-1, 1])
def test_a_ragged_row_is_told_and_the_others_are_read(cut):
    head, row = exported("csv", GOOD | {"text": None}).decode().splitlines()
    wrong = row + ",x" if cut > 0 else row.rsplit(",", 1)[0]
    rows = read("\n".join([head, wrong, row, ""]).encode())
    assert (fault(rows[0]).column, fault(rows[0]).code, rows[0].line) == (None, "row-misfit", 2)
    assert rows[1].faults == ()


def test_u2212_is_a_minus_sign():
    data = exported("csv", GOOD).decode().replace("7.31", "\u22127.31").encode()
    assert read(data)[0].cells["value"] == -7.31


# --------------------------------------------------------------------------------- tables that cannot be


def line_of(data, part):
    return data[: data.index(part)].count(b"\n") + 1


@pytest.mark.parametrize(
    ("form", "change", "line"),
    [
        ("csv", lambda d: d.replace(b",band,", b",bande,"), 1),
        ("csv", lambda d: d.replace(b",band,", b",value,"), 1),
        ("csv", lambda d: d + b'"unfinished', 4),
        ("csv", lambda d: d.replace(b"Lantern 3", b"Lant\xe9rn 3"), 2),
        ("csv", lambda d: d + b'x"y"z,"a"b\n', 4),
        ("ecsv", lambda d: d.replace(b'"kind": "observations"', b'"kind": "others"'), 1),
        ("votable", lambda d: d[:-200], lambda d: d.count(b"\n") + 1),
        ("votable", lambda d: d.replace(b"</TR>", b""), lambda d: line_of(d, b"</TABLEDATA")),
        ("votable", lambda d: d.replace(b"<VOTABLE", b"<!DOCTYPE x [<!ENTITY a 'b'>]><VOTABLE"), 1),
        ("votable", lambda d: d.replace(b'name="observations"', b'name="others"'), 1),
        ("json", lambda d: d[:-30], None),
        ("json", lambda d: d.replace(b'"format": 1', b'"format": 2'), 1),
        ("json", lambda d: d.replace(b'"rows": [', b'"lines": ['), 1),
        ("json", lambda d: b'{"schema": "campaign/export-systems/1", "data": ' + b"[" * 100_000, 1),
        ("json", lambda d: d.replace(b"7.31", b"7" * 5_000), None),
    ],
)  # fmt: skip
def test_a_table_that_cannot_be_read_is_refused_with_the_line(form, change, line):
    data = change(exported(form, GOOD))
    with pytest.raises(InputRefused) as refused:
        read(data, form)
    assert refused.value.code == "table-unreadable"
    assert refused.value.hint
    if line is not None:
        assert refused.value.details["line"] == (line(data) if callable(line) else line)


def test_a_row_of_json_with_unknown_keys_is_told():
    document = json.loads(exported("json", GOOD))
    document["data"]["rows"][0]["bande"] = "K"
    document["data"]["rows"].append("row")
    rows = read(json.dumps(document).encode())
    assert [fault(row).code for row in rows] == ["row-misfit", "row-misfit"]


@settings(max_examples=150, deadline=None)
@given(
    st.sampled_from(EXCHANGE_FORMS),
    st.lists(
        st.tuples(st.floats(0, 1), st.sampled_from(["cut", "set", "add"]), st.binary(max_size=3)), max_size=4
    ),
)
def test_no_change_of_bytes_leads_to_an_unexpected_error(form, changes):
    data = bytearray(exported(form, GOOD, GOOD | {"text": 'a, "b"\n<c>&'}))
    for where, how, new in changes:
        place = int(where * (len(data) - 1))
        if how == "cut":
            del data[place : place + 5]
        elif how == "set":
            data[place : place + len(new)] = new
        else:
            data[place:place] = new
    found = recognise(bytes(data[:HEAD_BYTES]))
    try:
        rows = read(bytes(data), found or form)
        for row in rows:
            assert row.line >= 1
            if not row.faults:
                observation_from_row(row.cells)
    except InputRefused as refused:
        assert "line" in refused.details or "column" in refused.details


@settings(max_examples=100, deadline=None)
@given(st.sampled_from(EXCHANGE_FORMS), st.binary(max_size=300))
def test_no_bytes_at_all_lead_to_an_unexpected_error(form, data):
    recognise(data)
    with pytest.raises(InputRefused):
        read(data, form)


# ----------------------------------------------------------------------------------- rows that cannot be


def cells_of(**given):
    return {"system": "Dim", "label": "x", "name": "Dim", **given}


@pytest.mark.parametrize(
    ("from_row", "cells", "column"),
    [
        (observation_from_row, GOOD | {"system": None}, "system"),
        (observation_from_row, GOOD | {"bmjd_tdb": None}, "bmjd_tdb"),
        (observation_from_row, GOOD | {"value": None}, "value_minus"),
        (observation_from_row, GOOD | {"value_minus": -0.1}, "value_minus"),
        (observation_from_row, GOOD | {"time_minus_d": -0.1}, "time_minus_d"),
        (system_from_row, {"name": "Dim", "ra_deg": 1.0}, "dec_deg"),
        (system_from_row, cells_of(ra_deg=1.0, dec_deg=1.0, position_epoch_jyr=2000.0, state="episodic",
                                   aliases="Faint"), "aliases"),
        (system_from_row, cells_of(ra_deg=1.0, dec_deg=1.0, position_epoch_jyr=2000.0, state="episodic",
                                   aliases='{"a": 1}'), "aliases"),
        (solution_from_row, cells_of(period_d=5.0), "period_kind"),
        (solution_from_row, cells_of(period_kind="measured"), "period_kind"),
        (solution_from_row, cells_of(period_kind="range", period_d=5.0), "period_high_d"),
        (solution_from_row, cells_of(weight=0.5, adopted=False), "weight"),
        (solution_from_row, cells_of(covariance="[]"), "covariance"),
        (solution_from_row, cells_of(covariance='{"names": ["a"], "matrix": [[1, 2]]}'), "covariance"),
        (solution_from_row, cells_of(covariance='{"names": ["a"], "matrix": [[NaN]]}'), "covariance"),
        (solution_from_row, cells_of(covariance='{"names": ["a"], "matrix": [[true]]}'), "covariance"),
        (solution_from_row,
         cells_of(covariance=f'{{"names": ["a"], "matrix": [[{10**400}]]}}'), "covariance"),
        (solution_from_row, cells_of(covariance="[" * 100_000), "covariance"),
        (episode_from_row, {"system": ""}, "system"),
        (episode_from_row, cells_of(onset_bmjd_tdb=1.0, onset_plus_d=-1.0), "onset_plus_d"),
    ],
)  # fmt: skip
def test_cells_that_contradict_each_other_are_refused_with_the_column(from_row, cells, column):
    with pytest.raises(CampaignError) as refused:
        from_row(cells)
    assert refused.value.details["column"] == column
    assert refused.value.why
