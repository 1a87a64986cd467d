"""Numbers as texts in tables of many forms, loaded and exported: equal to the last bit.

Expectations: the numbers that the tables were written with (by ``csv``, by hand, and by astropy for its own
forms), and Python's own reading of a decimal text, which is correctly rounded.
"""

from __future__ import annotations

import csv
import gzip
import io
import shutil

import numpy as np
import pytest
from exchange_examples import every_export, exported, names
from hypothesis import HealthCheck, Phase, given, settings
from hypothesis import strategies as st
from load_examples import begin, load

# An example that fails is short already; to make it shorter takes minutes.
QUICK = (Phase.explicit, Phase.generate)
FORMS = (
    "csv",
    "tsv",
    "semicolons",
    "bars",
    "quoted",
    "spaces",
    "places",
    "ecsv",
    "votable",
    "votable-binary",
)


@pytest.fixture(scope="module")
def begun(tmp_path_factory):
    return begin(tmp_path_factory.mktemp("bits") / "campaign.db")


def floats(low, high):
    return st.floats(low, high)


SIZES = floats(0.0, 1e308)
# Value, and what else a row of the kind needs; as many different numbers as the catalogue takes.
KINDS = {
    "photometry": ("mag", floats(-30.0, 40.0), {"band": st.sampled_from(["K", "L'", "[3.6]"])}),
    "velocity": ("RV", floats(-1e5, 1e5), {"star": st.sampled_from(["A", "B"])}),
    "position": ("rho_mas", floats(0.0, 1e308), {"theta": floats(-360.0, 360.0).map(repr)}),
    "shell": ("radius", floats(5e-324, 1e308), {"index": st.integers(1, 10**6).map(str)}),
    "line": ("EW", floats(-1e308, 1e308), {"species": st.sampled_from(["C III", "He II 4686"])}),
    "flux": ("flux", floats(-1e308, 1e308), {"band": st.sampled_from(["N", "Q"])}),
}
_WORDS = ("name", "note", "band", "star", "species")


@st.composite
def tables(draw):
    """A kind, and rows of texts by column."""
    kind = draw(st.sampled_from(list(KINDS)))
    value, numbers, others = KINDS[kind]
    row = st.fixed_dictionaries(
        {
            "name": st.sampled_from(["Lantern 3", "Keel 9"]),
            "BJD_TDB": floats(2_437_000.5, 2_469_000.5).map(repr),
            value: numbers.map(repr),
            f"e_{value}": st.just("") | SIZES.map(repr),
            "note": names,
            **others,
        }
    )
    rows = draw(st.lists(row, min_size=1, max_size=4, unique_by=lambda each: each["BJD_TDB"]))
    return kind, value, rows


def written(form, rows):
    """The table in one of the forms; ECSV and VOTable by astropy, with numbers as numbers."""
    # The name comes first: a line that begins with a # of a note would be a comment.
    columns = sorted(rows[0], key=lambda name: name != "name")
    if form in ("ecsv", "votable", "votable-binary"):
        return _by_astropy(form, columns, rows)
    divider = {"tsv": "\t", "semicolons": ";", "bars": "|"}.get(form, ",")
    if form in ("spaces", "places"):
        # A cell that a space would divide, or that is empty, needs a place of its own.
        width = {name: max(len(name), *(len(row[name]) for row in rows)) + 2 for name in columns}
        lines = [dict(zip(columns, columns, strict=True)), *rows]
        if form == "places":
            lines.insert(1, {name: "-" * (width[name] - 2) for name in columns})
        return "".join("".join(row[name].ljust(width[name]) for name in columns) + "\n" for row in lines)
    out = io.StringIO()
    quoting = csv.QUOTE_ALL if form == "quoted" else csv.QUOTE_MINIMAL
    writer = csv.DictWriter(out, columns, delimiter=divider, quoting=quoting)
    writer.writeheader()
    writer.writerows(rows)
    return out.getvalue()


def _by_astropy(form, columns, rows):
    from astropy.io.votable import from_table, writeto
    from astropy.table import MaskedColumn, Table

    table = Table()
    for name in columns:
        cells = [row[name] for row in rows]
        if name in _WORDS:
            table[name] = cells
        else:
            numbers = [float(cell or "nan") for cell in cells]
            table[name] = MaskedColumn(numbers, mask=np.isnan(numbers))
    if form == "ecsv":
        out = io.StringIO()
        table.write(out, format="ascii.ecsv")
        return out.getvalue()
    data = io.BytesIO()
    writeto(from_table(table), data, tabledata_format="tabledata" if form == "votable" else "binary2")
    return data.getvalue()


def check(drawn, form, packed, begun, tmp_path):
    """The numbers of a table, loaded, exported and taken out of the exported CSV by Python itself."""
    kind, value, rows = drawn
    if form == "votable-binary":
        # What astropy writes there of characters that need two units, it cannot read itself.
        rows = [row for row in rows if row["note"].isascii()]
    if form in ("spaces", "places"):
        # The notes of people have spaces and quotes in them, which such a table cannot tell from its own.
        rows = [{name: cell for name, cell in row.items() if name != "note"} for row in rows]
        if form == "spaces":
            rows = [
                {name: cell.replace(" ", "") if name == "name" else cell for name, cell in row.items()}
                for row in rows
                if row[f"e_{value}"] and " " not in row.get("species", "")
            ]
    if not rows:
        return
    db = shutil.copy(begun, tmp_path / "bits.db")
    data = written(form, rows)
    raw = data if isinstance(data, bytes) else data.encode()
    loaded = load(db, gzip.compress(raw) if packed else raw, kind=kind)
    assert (loaded.bad, loaded.added) == ((), len(rows))
    found = sorted(csv.DictReader(io.StringIO(exported(db, "observations", "csv").decode())), key=by_time)
    expected = sorted(rows, key=lambda row: float(row["BJD_TDB"]))
    for there, row in zip(found, expected, strict=True):
        assert there["system"].replace(" ", "") == row["name"].replace(" ", "")
        assert float(there["time_text"].removeprefix("BJD_TDB ")) == float(row["BJD_TDB"])
        assert float(there["value"]) == float(row[value])
        sizes = {there["value_minus"], there["value_plus"]}
        assert {float(each) for each in sizes if each} == (
            {float(row[f"e_{value}"])} if row[f"e_{value}"] else set()
        )
        if "theta" in row:
            assert float(there["position_angle_deg"]) == float(row["theta"])
        if "index" in row:
            assert int(there["shell_index"]) == int(row["index"])
        if "note" in row:
            text = there["text"]
            assert row["note"] in (text, text.removeprefix("'"))


def by_time(row):
    return float(row["time_text"].removeprefix("BJD_TDB "))


@pytest.mark.parametrize("form", FORMS)
@settings(max_examples=4, deadline=None, suppress_health_check=list(HealthCheck), phases=QUICK)
@given(drawn=tables(), packed=st.booleans())
def test_numbers_leave_the_catalogue_as_they_stood_in_the_table(form, drawn, packed, begun, tmp_path):
    check(drawn, form, packed, begun, tmp_path)


@pytest.mark.slow
@pytest.mark.parametrize("form", FORMS)
@settings(max_examples=120, deadline=None, suppress_health_check=list(HealthCheck), phases=QUICK)
@given(drawn=tables(), packed=st.booleans())
def test_many_more_numbers_do_so_too(form, drawn, packed, begun, tmp_path):
    check(drawn, form, packed, begun, tmp_path)


@settings(max_examples=3, deadline=None, suppress_health_check=list(HealthCheck), phases=QUICK)
@given(drawn=tables())
def test_what_was_loaded_and_exported_is_loaded_and_exported_as_the_same_bytes(drawn, begun, tmp_path):
    kind, _, rows = drawn
    one, two = (shutil.copy(begun, tmp_path / name) for name in ("one.db", "two.db"))
    load(one, written("csv", rows), kind=kind)
    for form in ("csv", "ecsv", "votable", "json"):
        data = exported(one, "observations", form)
        load(two, data)
        assert exported(two, "observations", form) == data
    assert every_export(one, "json") == every_export(two, "json")
