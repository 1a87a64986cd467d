"""Tables as CSV, ECSV, VOTable and JSON, read by other people's libraries.

astropy reads ECSV and VOTable, and judges the VOTable strictly; ``csv`` and ``json`` of Python read the
others. The forms are those of their standards: RFC 4180, ECSV 1.0 (astropy APE 6), VOTable 1.4 (IVOA 2019),
VOUnits 1.1, RFC 8259.
"""

from __future__ import annotations

import csv
import io
import json
import math

import pytest
from astropy import units
from astropy.io import votable
from astropy.table import Table

from campaign.errors import InputRefused
from campaign.model.exchange_columns import EXCHANGE_KINDS, exchange_columns
from campaign.model.exported import EXCHANGE_FORMS, OutgoingTable
from campaign.output.exchange import table_text

AWKWARD = (
    'Lantern, "the third"', "λ Cen é 星 😀", "a\\b\\n", "<b>&amp;]]>", "'quoted'", "#1", "  spaced  ",
    "=1+1", "[bold]", "-45", "None", "nan", "true",
)  # fmt: skip
NUMBERS = (0.1 + 0.2, 1e-300, -1.7976931348623157e308, 5e-324, 61234.123456789, -0.0, 1e22, 7.0)


def table(of="observations", /, *, value_unit="mag", **cells):
    """A table of the cells given column by column; the other columns are unknown."""
    columns = exchange_columns(of)
    count = max(len(each) for each in cells.values())
    rows = [tuple(cells[c.name][n] if c.name in cells else None for c in columns) for n in range(count)]
    return OutgoingTable(of, columns, iter(rows), count, value_unit)


def text_of(form, *args, **cells):
    return "".join(table_text(table(*args, **cells), form))


def awkward(form):
    count = max(len(AWKWARD), len(NUMBERS))
    return text_of(
        form,
        system=[AWKWARD[n % len(AWKWARD)] for n in range(count)],
        value=[NUMBERS[n % len(NUMBERS)] for n in range(count)],
        kind=["photometry"] * count,
        shell_index=[None, 3] + [2**31 - 1] * (count - 2),
        text=["two\nlines\tand \\n", *AWKWARD[1:]],
    )


def read_ecsv(text):
    return Table.read(text, format="ascii.ecsv")


def read_votable(text):
    return votable.parse(io.BytesIO(text.encode()), verify="exception").get_first_table().to_table()


def bare(cell):
    """A cell of astropy as a value of Python; masked and NaN are unknown."""
    if getattr(cell, "mask", False) is True or type(cell).__name__ == "MaskedConstant":
        return None
    value = cell.item() if hasattr(cell, "item") else cell
    return None if isinstance(value, float) and math.isnan(value) else value


# ---------------------------------------------------------------------------------------- by others


@pytest.mark.parametrize("kind", EXCHANGE_KINDS)
def test_astropy_finds_the_votable_without_any_violation(kind, tmp_path, capsys):
    path = tmp_path / "table.vot"
    path.write_text(text_of("votable", kind, system=[], name=[]), encoding="utf-8")
    assert votable.validate(str(path), output=io.StringIO(), xmllint=False)
    names = read_votable(path.read_text(encoding="utf-8")).colnames
    assert names == [column.name for column in exchange_columns(kind)]


def test_astropy_finds_awkward_texts_in_a_votable_without_any_violation(tmp_path):
    path = tmp_path / "table.vot"
    path.write_text(awkward("votable"), encoding="utf-8")
    told = io.StringIO()
    assert votable.validate(str(path), output=told, xmllint=False), told.getvalue()


@pytest.mark.parametrize("read", [read_ecsv, read_votable])
def test_astropy_reads_every_number_to_the_last_bit(read):
    form = "ecsv" if read is read_ecsv else "votable"
    found = read(awkward(form))["value"]
    for n, cell in enumerate(found):
        wanted = NUMBERS[n % len(NUMBERS)]
        assert float(cell) == wanted
        assert math.copysign(1, float(cell)) == math.copysign(1, wanted)


@pytest.mark.parametrize("read", [read_ecsv, read_votable])
def test_astropy_reads_every_text(read):
    form = "ecsv" if read is read_ecsv else "votable"
    found = read(awkward(form))
    # Both readers of astropy take spaces off the ends of a text, and keep everything else.
    assert [str(cell) for cell in found["system"]] == [text.strip() for text in AWKWARD]
    assert [bare(cell) for cell in found["shell_index"][:3]] == [None, 3, 2**31 - 1]


def test_lines_of_a_text_stay_in_a_votable_and_are_escaped_in_ecsv():
    assert str(read_votable(awkward("votable"))["text"][0]) == "two\nlines\tand \\n"
    assert str(read_ecsv(awkward("ecsv"))["text"][0]) == r"two\nlines\tand \\n"


def test_astropy_reads_unknown_as_masked():
    for read, form in ((read_ecsv, "ecsv"), (read_votable, "votable")):
        found = read(text_of(form, "solutions", label=["a", "b"], weight=[None, 0.5], adopted=[True, False]))
        assert [bare(cell) for cell in found["weight"]] == [None, 0.5]
        assert [bool(cell) for cell in found["adopted"]] == [True, False]
        assert bare(found["period_d"][0]) is None


@pytest.mark.parametrize("kind", EXCHANGE_KINDS)
def test_every_unit_is_one_of_the_standard_of_virtual_observatories(kind):
    unit_of = {column.name: column.unit for column in exchange_columns(kind) if column.unit}
    found = read_votable(text_of("votable", kind, system=[], name=[]))
    for name, unit in unit_of.items():
        # Neither unknown nor deprecated: both would warn, and warnings are errors here.
        assert units.Unit(unit, format="vounit") == found[name].unit == units.Unit(unit)
    assert unit_of


@pytest.mark.parametrize("unit", ["mag", "Jy", "km/s", "Angstrom", "mas", "arcsec", "erg.s**-1.cm**-2"])
def test_values_have_a_unit_where_all_rows_share_it(unit):
    for read, form in ((read_ecsv, "ecsv"), (read_votable, "votable")):
        found = read(text_of(form, value_unit=unit, value=[1.5]))
        ratio = (1.0 * found["value"].unit) / (1.0 * units.Unit(unit)) if unit != "mag" else 1.0
        assert float(ratio) == pytest.approx(1.0, rel=1e-12)
        assert (found["value"].unit == units.mag) == (unit == "mag")
        assert read(text_of(form, value_unit=None, value=[1.5]))["value"].unit is None


def test_scale_and_place_of_the_instants_are_told():
    for kind in ("observations", "episodes", "solutions", "systems"):
        document = votable.parse(io.BytesIO(text_of("votable", kind, system=[]).encode()))
        (system,) = document.iter_timesys()
        assert (system.timescale, system.refposition, system.timeorigin) == (
            "TDB",
            "BARYCENTER",
            "MJD-origin",
        )
        on_axis = [column.name for column in exchange_columns(kind) if column.on_axis]
        pointing = [f.name for f in document.get_first_table().fields if f.ref == system.ID]
        assert pointing == on_axis
        meta = read_ecsv(text_of("ecsv", kind, system=[])).meta["TIMESYS"]
        assert (meta["timescale"], meta["refposition"]) == ("TDB", "BARYCENTER")
        assert meta["columns"] == on_axis
    (sky,) = document.iter_coosys()
    assert sky.system == "ICRS"
    assert [f.name for f in document.get_first_table().fields if f.ref == sky.ID] == ["ra_deg", "dec_deg"]


# -------------------------------------------------------------------------------------------- by hand


def test_csv_is_guarded_where_a_spreadsheet_would_run_a_text_and_numbers_never_are():
    rows = list(csv.DictReader(io.StringIO(awkward("csv"), newline="")))
    shown = [row["system"] for row in rows]
    assert shown[AWKWARD.index("=1+1")] == "'=1+1"
    assert shown[AWKWARD.index("-45")] == "'-45"
    others = [text for text in AWKWARD if text not in ("=1+1", "-45")]
    assert [text for text in shown if text in others] == others
    assert float(rows[2]["value"]) == -1.7976931348623157e308
    assert rows[2]["value"].startswith("-")


def test_csv_keeps_lines_and_quotes_as_rfc_4180_says():
    rows = list(csv.DictReader(io.StringIO(awkward("csv"), newline="")))
    assert rows[0]["text"] == "two\nlines\tand \\n"
    assert '"Lantern, ""the third"""' in awkward("csv")


def test_unknown_is_empty_in_csv_and_null_in_json():
    rows = list(csv.DictReader(io.StringIO(text_of("csv", value=[7.5], band=["K"]), newline="")))
    assert (rows[0]["value"], rows[0]["value_minus"], rows[0]["band"]) == ("7.5", "", "K")
    (row,) = json.loads(text_of("json", value=[7.5], band=["K"]))["data"]["rows"]
    assert (row["value"], row["value_minus"], row["band"]) == (7.5, None, "K")


def test_json_is_one_document_of_the_contract_with_units_and_meanings():
    document = json.loads(awkward("json"))
    assert list(document) == ["schema", "as_of", "data", "warnings"]
    assert document["schema"] == "campaign/export-observations/1"
    assert document["data"]["time"]["timescale"] == "TDB"
    (value,) = (each for each in document["data"]["columns"] if each["name"] == "value")
    assert value["unit"] == "mag"
    assert [row["system"] for row in document["data"]["rows"]] == list(AWKWARD)
    assert [row["value"] for row in document["data"]["rows"]][: len(NUMBERS)] == list(NUMBERS)
    assert awkward("json").isascii()


@pytest.mark.parametrize("form", EXCHANGE_FORMS)
def test_lines_end_in_a_line_feed_and_nothing_depends_on_the_moment(form, monkeypatch):
    first = awkward(form)
    monkeypatch.setenv("TZ", "Pacific/Kiritimati")
    assert awkward(form) == first
    assert "\r" not in first
    assert first.endswith("\n")


@pytest.mark.parametrize("form", EXCHANGE_FORMS)
def test_a_long_table_is_written_piece_by_piece_and_whole(form):
    def rows():
        for number in range(8_000):
            yield (f"u{number}", *[None] * (len(columns) - 1))

    columns = exchange_columns("observations")
    pieces = list(table_text(OutgoingTable("observations", columns, rows(), 8_000), form))
    assert len(pieces) > 1
    assert max(map(len, pieces)) < 2_000_000
    assert all(f"u{number}" in "".join(pieces) for number in (0, 999, 1_000, 7_999))


@pytest.mark.parametrize("form", EXCHANGE_FORMS)
def test_an_empty_text_and_none_are_the_same_bytes(form):
    assert text_of(form, band=[""], text=[""]) == text_of(form, band=[None], text=[None])


@pytest.mark.parametrize("character", ["\ufffe", "\uffff"])
def test_what_xml_cannot_hold_is_refused_and_other_forms_take_it(character):
    with pytest.raises(InputRefused, match="band") as refused:
        text_of("votable", band=[f"K{character}"])
    assert refused.value.code == "text-not-xml"
    assert character in text_of("csv", band=[f"K{character}"])
