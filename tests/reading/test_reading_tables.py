"""Tables of text, of others, as cells. Expectations are the contents that each table was written with by
hand, or by astropy for its own forms."""

from __future__ import annotations

import gzip
import io

import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from campaign.errors import CampaignError, InputRefused, NotFound
from campaign.reading.foreign import read_foreign_table
from campaign.reading.tablefile import opened_table

patient = settings(max_examples=150, deadline=None)


def read(data, encoding=None):
    """Names, units, rows with their lines, and misfits of a table given as bytes."""
    with opened_table("-", io.BytesIO(data)) as file:
        table = read_foreign_table(file, encoding)
        rows, misfits = [], []
        for block in table.blocks:
            rows += zip(block.lines, zip(*block.columns, strict=True), strict=True)
            misfits += [misfit for misfit in block.misfits if misfit.code != "commented"]
    return [c.name for c in table.columns], [c.unit for c in table.columns], rows, misfits


@pytest.mark.parametrize(
    "text",
    [
        "name,mag\nLantern 3,7.31\nKeel 9,8.0\n",
        "name\tmag\nLantern 3\t7.31\nKeel 9\t8.0\n",
        "name;mag\nLantern 3;7.31\nKeel 9;8.0",
        'name,mag\n"Lantern 3",7.31\nKeel 9,8.0\n',
        "name       mag\nLantern 3  7.31\nKeel 9     8.0\n",
        'name mag\n"Lantern 3" 7.31\n"Keel 9" 8.0\n',
        "\ufeffname,mag\r\nLantern 3,7.31\r\nKeel 9,8.0\r\n",
        "name,mag\rLantern 3,7.31\rKeel 9,8.0\r",
        "name|mag\nLantern 3|7.31\nKeel 9|8.0\n",
    ],
)
def test_the_same_table_in_many_layouts(text):
    names, _, rows, misfits = read(text.encode())
    assert names == ["name", "mag"]
    assert rows == [(2, ("Lantern 3", "7.31")), (3, ("Keel 9", "8.0"))]
    assert not misfits


def test_columns_at_fixed_places_may_be_empty():
    text = (
        "system     HJD-2450000  mag    e_mag\n"
        "---------  -----------  -----  -----\n"
        "Lantern 3  1234.567      7.31  0.03\n"
        "Keel 9     1235.1              0.02\n"
        "Quill      1236.25      10.02\n"
    )
    names, _, rows, misfits = read(text.encode())
    assert names == ["system", "HJD-2450000", "mag", "e_mag"]
    assert rows == [
        (3, ("Lantern 3", "1234.567", "7.31", "0.03")),
        (4, ("Keel 9", "1235.1", "", "0.02")),
        (5, ("Quill", "1236.25", "10.02", "")),
    ]
    assert not misfits


def test_comments_units_and_rulers_are_no_rows():
    text = "# a campaign of 2031\n\nHJD,K,eK\nd,mag,mag\n# moon\n2451234.5,7.1,0.1\n\n  \n2451235.5,7.2,0.1\n"
    names, units, rows, _ = read(text.encode())
    assert (names, units) == (["HJD", "K", "eK"], ["d", "mag", "mag"])
    assert [line for line, _ in rows] == [6, 9]
    names, units, _, _ = read(b"HJD mag err\n[d] [mag] (mag)\n2451234.5 7.1 0.1\n")
    assert units == ["d", "mag", "mag"]


def test_names_may_stand_in_a_comment_or_nowhere():
    names, _, rows, _ = read(b"# all from the south\n# HJD mag err\n2451234.5 7.1 0.1\n")
    assert names == ["HJD", "mag", "err"]
    assert rows == [(3, ("2451234.5", "7.1", "0.1"))]
    names, _, rows, _ = read(b"2451234.5 7.1 0.1\n2451235.5 7.2 0.1\n")
    assert names == ["1", "2", "3"]
    assert [line for line, _ in rows] == [1, 2]


def test_rows_of_another_length_are_told_with_their_line():
    _, _, rows, misfits = read(b"a,b,c\n1,2,3\n1,2\n4,5,6\n1,2,3,4\n")
    assert [line for line, _ in rows] == [2, 4]
    assert [(m.line, m.cells, m.code) for m in misfits] == [
        (3, ("1", "2"), "row-too-short"),
        (5, ("1", "2", "3", "4"), "row-too-long"),
    ]


def test_quoted_cells_may_hold_what_divides():
    text = 'name,note,mag\n"Keel, 9","two\nlines",7.1\nx,"say ""hi""",7.2\n#c,1,2\n"y",,7.3\n'
    _, _, rows, misfits = read(text.encode())
    assert rows == [
        (2, ("Keel, 9", "two\nlines", "7.1")),
        (4, ("x", 'say "hi"', "7.2")),
        (6, ("y", "", "7.3")),
    ]
    assert not misfits


def test_a_quote_far_down_the_table_changes_nothing_above(tmp_path):
    rows = [f"s{n},{n}" for n in range(120_000)]
    rows[110_000] = '"s, 110000",110000'
    _, _, found, misfits = read(("name,n\n" + "\n".join(rows) + "\n").encode())
    assert len(found) == 120_000
    assert not misfits
    assert found[110_000] == (110_002, ("s, 110000", "110000"))
    assert found[119_999] == (120_001, ("s119999", "119999"))


@pytest.mark.parametrize("text", ['a,b\n1,2\n"x,3\n4,5\n', 'a,b\n1,2\n"x"y,3\n'])
def test_quotes_that_do_not_close_are_refused_with_the_line(text):
    with pytest.raises(InputRefused) as refused:
        read(text.encode())
    assert refused.value.code == "table-unreadable"
    assert refused.value.details["line"] == 3


def test_a_cell_of_two_hundred_kilobytes_is_a_cell():
    long = "x" * 200_000
    assert read(f"a,b\n{long},1\n".encode())[2] == [(2, (long, "1"))]
    assert read(f'a,b\n"{long}",1\n'.encode())[2] == [(2, (long, "1"))]


def test_bytes_that_are_no_utf8_are_refused_with_line_and_column():
    with pytest.raises(InputRefused) as refused:
        read("name,mag\nKeel,7\nÅse,8\n".encode("latin-1"))
    assert refused.value.code == "encoding-unreadable"
    assert (refused.value.details["line"], refused.value.details["column"]) == (3, 1)
    assert read("name,mag\nKeel,7\nÅse,8\n".encode("latin-1"), "latin-1")[2][1] == (3, ("Åse", "8"))


@pytest.mark.parametrize("encoding", ["utf-16", "utf-32"])
def test_wide_encodings_are_recognised_and_read_when_said(encoding):
    data = "name,mag\nÅse,8\n".encode(encoding)
    with pytest.raises(InputRefused) as refused:
        read(data)
    assert f"--encoding {encoding}" in refused.value.hint
    assert read(data, encoding)[2] == [(2, ("Åse", "8"))]


@pytest.mark.parametrize("encoding", ["punycode", "unicode_escape", "zip", "rot13", "idna", "\x1b[31m"])
def test_encodings_that_are_no_plain_rule_are_not_known(encoding):
    with pytest.raises(InputRefused) as refused:
        read(b"a,b\n1,2\n", encoding)
    assert refused.value.code == "encoding-refused"


def test_gzip_is_unpacked_by_what_it_begins_with(tmp_path):
    packed = gzip.compress(b"a,b\n1,2\n")
    assert read(packed)[2] == [(2, ("1", "2"))]
    with pytest.raises(InputRefused) as refused:
        read(packed[:-9])
    assert refused.value.code == "file-damaged"


def test_files_that_are_no_tables(tmp_path):
    for data, code in (
        (b"", "file-empty"),
        (b"# only\n\n# comments\n", "table-empty"),
        (b"PK\x03\x04xlsx", "file-not-table"),
    ):
        with pytest.raises(InputRefused) as refused:
            read(data)
        assert refused.value.code == code
    with pytest.raises(NotFound) as missing, opened_table(str(tmp_path / "none.csv"), None):
        pass
    assert missing.value.code == "file-not-found"
    for path in (str(tmp_path), "a\0b"):
        with pytest.raises(InputRefused), opened_table(path, None):
            pass
    with pytest.raises(InputRefused), opened_table("-", None):
        pass


CELLS = st.text(
    st.characters(codec="utf-8", exclude_characters='\n\r"', exclude_categories=["Cs"]), max_size=8
)


@patient
@given(
    st.integers(2, 4).flatmap(
        lambda width: st.lists(st.lists(CELLS, min_size=width, max_size=width), max_size=6)
    ),
    st.sampled_from(["\n", "\r\n", "\r"]),
)
def test_quoted_text_comes_back_as_it_was(rows, newline):
    width = len(rows[0]) if rows else 2
    # A row of nothing but the words of units would be taken for units; rows of a table hold numbers too.
    rows = [[*row[:-1], row[-1] + "7"] for row in rows]
    names = [f"c{n}x" for n in range(width)]
    lines = [",".join(names)] + [",".join(f'"{cell}"' for cell in row) for row in rows]
    _, _, found, misfits = read((newline.join(lines) + newline).encode())
    assert [list(cells) for _, cells in found] == rows
    assert [line for line, _ in found] == list(range(2, len(rows) + 2))
    assert not misfits


@patient
@given(st.binary(max_size=300), st.sampled_from([None, "latin-1", "utf-16", "shift_jis"]))
@example(b"\xff\xfe", None)
@example(b'a,"b\n', None)
@example(b"<VOTABLE", None)
@example(b"# %ECSV 1.0", None)
@example(b"\x1f\x8b", None)
@example(b"a b\n\x00\x00\n", None)
def test_any_bytes_are_a_table_or_refused(data, encoding):
    try:
        names, units, rows, _ = read(data, encoding)
    except CampaignError as error:
        assert error.message
        assert error.code
    else:
        assert len(names) == len(units)
        assert all(len(cells) == len(names) for _, cells in rows)


def astropy_table():
    import numpy as np
    from astropy.table import MaskedColumn, Table

    table = Table()
    table["system"] = ["Lantern 3", "Keel 9", "Åse"]
    table["bjd"] = [2461234.123456789, 2461235.5, 2461236.25]
    table["bjd"].unit = "d"
    table["mag"] = np.array([7.31, 8.25, 9.0], dtype=np.float32)
    table["mag"].unit = "mag"
    table["e_mag"] = MaskedColumn([0.03, 0.1, 0.02], mask=[False, True, False], unit="mag")
    table["n"] = [1, 2, 3]
    table["ok"] = [True, False, True]
    return table


EXPECTED = [
    (1, ("Lantern 3", "2461234.123456789", "7.31", "0.03", "1", "true")),
    (2, ("Keel 9", "2461235.5", "8.25", "", "2", "false")),
    (3, ("Åse", "2461236.25", "9.0", "0.02", "3", "true")),
]


def test_an_ecsv_table_of_astropy(tmp_path):
    table = astropy_table()
    table.write(tmp_path / "t.ecsv", format="ascii.ecsv")
    names, units, rows, _ = read((tmp_path / "t.ecsv").read_bytes())
    assert names == ["system", "bjd", "mag", "e_mag", "n", "ok"]
    assert units == [None, "d", "mag", "mag", None, None]
    assert rows == EXPECTED


def test_an_ecsv_table_whose_head_never_ends_is_refused(tmp_path):
    line = b"# - {name: mag, datatype: float64}\n"
    endless = b"# %ECSV 1.0\n# ---\n# datatype:\n" + line * 200_000
    (tmp_path / "t.ecsv.gz").write_bytes(gzip.compress(endless, 1))
    with opened_table(str(tmp_path / "t.ecsv.gz"), None) as file, pytest.raises(InputRefused) as refused:
        read_foreign_table(file)
    assert refused.value.code == "table-unreadable"
    assert "head" in refused.value.why


def test_a_long_ecsv_table_is_read_to_its_end():
    head = b"# %ECSV 1.0\n# ---\n# datatype:\n# - {name: mag, datatype: float64}\nmag\n"
    _, _, rows, _ = read(head + b"7.3125" + b"0" * 200 + b"\n" + b"7.3125\n" * 2)
    assert len(rows) == 3
    _, _, rows, _ = read(head + (b"7.3125" + b"0" * 200 + b"\n") * 22_000)
    assert len(rows) == 22_000


def test_a_time_column_of_astropy_keeps_its_scale(tmp_path):
    from astropy.table import Table
    from astropy.time import Time

    table = Table({"when": Time([61234.25, 61235.5], format="mjd", scale="tt"), "mag": [7.0, 8.0]})
    table.write(tmp_path / "t.ecsv", format="ascii.ecsv")
    with opened_table(str(tmp_path / "t.ecsv"), None) as file:
        found = read_foreign_table(file)
        block = next(found.blocks)
    assert (found.columns[0].scale, found.columns[0].offset_jd) == ("tt", "2400000.5")
    assert [float(cell) for cell in block.columns[0]] == [61234.25, 61235.5]


@pytest.mark.parametrize("form", ["tabledata", "binary", "binary2"])
def test_a_votable_of_astropy(tmp_path, form):
    from astropy.io.votable import from_table, writeto

    writeto(from_table(astropy_table()), str(tmp_path / "t.vot"), tabledata_format=form)
    names, units, rows, _ = read((tmp_path / "t.vot").read_bytes())
    assert names == ["system", "bjd", "mag", "e_mag", "n", "ok"]
    assert units[1:4] == ["d", "mag", "mag"]
    assert [(line, cells[:5]) for line, cells in rows] == [(line, cells[:5]) for line, cells in EXPECTED]


def test_the_timesys_of_a_votable_says_scale_place_and_origin():
    # VOTable 1.4, section 3.4: attributes of TIMESYS (memory).
    text = """<?xml version="1.0"?>
<VOTABLE version="1.4" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"><RESOURCE>
<TIMESYS ID="ts" timeorigin="2455000.0" timescale="TCB" refposition="BARYCENTER"/>
<TIMESYS ID="ts2" timeorigin="MJD-origin" timescale="TDB" refposition="BARYCENTER"/>
<TABLE><FIELD name="a" datatype="double" ref="ts"/><FIELD name="t" datatype="double" unit="d" ref="ts2"/>
<DATA><TABLEDATA><TR><TD>1.5</TD><TD>NaN</TD></TR></TABLEDATA></DATA></TABLE></RESOURCE></VOTABLE>"""
    with opened_table("-", io.BytesIO(text.encode())) as file:
        table = read_foreign_table(file)
        first, second = table.columns
        cells = next(table.blocks).columns
    assert (first.scale, first.place, first.offset_jd) == (None, "barycentre", "2455000.0")
    assert (second.scale, second.place, second.offset_jd) == ("tdb", "barycentre", "2400000.5")
    # A NaN is how a VOTable says that a float is not there.
    assert [list(column) for column in cells] == [["1.5"], [""]]


@pytest.mark.parametrize(
    ("text", "names"),
    [
        ('"","Time","Photometry","",""\nObject,UT date,K,err K,Notes\nA,2031-02-03,7.3,0.1,x\n',
         ["Object", "UT date", "K", "err K", "Notes"]),
        (",K,,J,,site\nDate,mag,err,mag,err,\n2031-02-03,7.3,0.1,8.9,0.1,x\n",
         ["Date", "K mag", "K err", "J mag", "J err", "site"]),
        # Not words over words: units below names, a row of words, names of which one is empty.
        ("name,K,\n,(mag),(mag)\nA,7.3,0.1\n", ["name", "K", ""]),
        ("name,band,\nA,K,good\nB,J,bad\n", ["name", "band", ""]),
    ],
    ids=["groups", "alike names", "units", "words"],
)  # fmt: skip
def test_words_that_a_spreadsheet_merged_over_the_names_only_group_them(text, names):
    assert read(text.encode())[0] == names


def test_a_space_inside_the_cells_of_one_column_divides_no_column():
    # Every name has a space at the same place, and nothing stands above what follows it.
    text = "name       mag   e_mag\nLantern 3  7.31  0.02\nLantern 4  7.4\n"
    names, _, rows, misfits = read(text.encode())
    assert (names, misfits) == (["name", "mag", "e_mag"], [])
    assert rows == [(2, ("Lantern 3", "7.31", "0.02")), (3, ("Lantern 4", "7.4", ""))]


def test_a_ruler_below_the_names_says_where_columns_are():
    # Words alone would fit too: an empty cell in each row, and a name of two words.
    text = "name       mag   e_mag  band\n---------  ----  -----  ----\nLantern 3  7.31         K\n"
    assert read(text.encode())[2] == [(3, ("Lantern 3", "7.31", "", "K"))]
