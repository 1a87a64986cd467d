"""The history and an undo on any screen: nothing wider than the window, nothing that steers it."""

import io
import json
from datetime import UTC, datetime

import pytest
from output_examples import HOSTILE_NAME
from rich.cells import cell_len

from campaign.model.history import EntryChange, FieldChange, History, Operation, ToldOperation, Undone
from campaign.model.instants import Moment
from campaign.model.measured import Limit, Measured, Range
from campaign.output.console import Screen
from campaign.output.history import (
    history_json,
    render_history,
    render_undone,
    told_value,
    undone_json,
)

AT = datetime(2031, 4, 7, 3, 12, 10, 123456, tzinfo=UTC)
WIDTHS = [None, 160, 80, 40, 20]


def operation(number=12, summary="logged photometry", who="Ida Vik", **more):
    return Operation(number, AT, who, f"campaign log {summary}", summary, **more)


VALUE = FieldChange("value", "mag", Measured(7.31, 0.03, 0.03), Measured(7.35, 0.02, 0.02))
HOSTILE = History(
    HOSTILE_NAME,
    (
        ToldOperation(
            operation(13, f"renamed {HOSTILE_NAME}", f"Ida {HOSTILE_NAME}", undoes_id=11),
            (
                EntryChange(
                    "system", "changed", HOSTILE_NAME, (FieldChange("name", "", "Rook", HOSTILE_NAME),)
                ),
                EntryChange("observation 3", "withdrawn", HOSTILE_NAME, note=HOSTILE_NAME),
                EntryChange("observations", "loaded", rows=1_234_567),
            ),
        ),
        ToldOperation(operation(12), (EntryChange("observation 2", "replaced by 4", "Rook", (VALUE,)),)),
    ),
    more=True,
)


def rendered(thing, width=None, colour=False, unicode=True, **more):
    heard = io.StringIO()
    screen = Screen(heard, width is not None, width, colour, unicode)
    (render_undone if isinstance(thing, Undone) else render_history)(screen, thing, **more)
    return heard.getvalue()


@pytest.mark.parametrize("width", WIDTHS)
@pytest.mark.parametrize("unicode", [True, False])
def test_no_line_is_wider_than_the_window_and_none_steers_it(width, unicode):
    for thing in (HOSTILE, UNDONE):
        text = rendered(thing, width, unicode=unicode)
        assert all(line.isprintable() for line in text.splitlines())
        if width is not None:
            assert max(cell_len(line) for line in text.splitlines()) <= width
        assert "[red]Rook[/red]" in "".join(text.split()) or width == 20
        if not unicode:
            # Ours are spelled in ASCII; those of data are left to the terminal's encoding.
            assert "→" not in text and "±" not in text


def test_colour_comes_from_code_alone():
    shown = rendered(HOSTILE, 80, colour=True)
    assert "\x1b[1m" in shown
    assert "\x1b]0" not in shown and "\x1b[31m" not in shown


def test_in_a_pipe_each_entry_is_one_line():
    lines = rendered(HOSTILE).splitlines()
    assert lines[0].startswith("13  2031-04-07 03:12  Ida [red]Rook[/red] :bomb: \\x1b]0;owned")
    assert lines[0].endswith("[undo of 11]")
    assert lines[1].endswith(": changed")
    assert lines[2].startswith("      name: Rook → [red]Rook[/red]")
    assert lines[3].startswith("    observation 3 of [red]Rook[/red]")
    assert "withdrawn ([red]Rook" in lines[3]
    assert lines[4] == "    1,234,567 observations: loaded"
    assert lines[5] == "12  2031-04-07 03:12  Ida Vik: logged photometry"
    assert lines[6:8] == [
        "    observation 2 of Rook: replaced by 4",
        "      value: 7.310 ± 0.030 mag → 7.350 ± 0.020 mag",
    ]
    assert lines[8] == "There are older operations: see more with --limit N."
    assert len(lines) == 9


def test_an_operation_that_does_not_stand_is_marked_also_without_colour():
    taken_back = History("x", (ToldOperation(operation(undone_by_id=15, stands=False), ()),))
    assert rendered(taken_back).splitlines() == [
        "12  2031-04-07 03:12  Ida Vik: logged photometry  [taken back by 15]"
    ]
    again = History("x", (ToldOperation(operation(undone_by_id=15, stands=True), ()),))
    assert "[taken back by 15, and put back]" in rendered(again)


def test_a_long_list_of_entries_is_cut_and_says_where_the_rest_is():
    changes = tuple(EntryChange(f"observation {n}", "withdrawn", "Rook") for n in range(1, 31))
    one = History("x", (ToldOperation(operation(), changes),))
    lines = rendered(one).splitlines()
    assert len(lines) == 1 + 8 + 1
    assert lines[-1] == "    and 22 more entries; all of them: campaign history --operation 12"
    assert len(rendered(one, whole=True).splitlines()) == 1 + 30
    nine = History("x", (ToldOperation(operation(), changes[:9]),))
    assert "and 1 more entry; all of them" in rendered(nine)


def test_nothing_done_is_one_sentence():
    assert rendered(History("the catalogue", ())) == "Nothing of this kind was done to the catalogue.\n"


@pytest.mark.parametrize(
    ("name", "value", "unit", "said"),
    [
        ("value", None, "mag", "none"),
        ("value", Measured(7.31, 0.03, 0.03), "mag", "7.310 ± 0.030 mag"),
        ("value", Measured(7.31, 0.02, 0.04), "kms", "7.310 +0.040 −0.020 km/s"),
        ("value", Measured(7.31), "jy", "7.31 Jy (error unknown)"),
        ("period", Limit(11_688.0, "above", 3.0), "d", "> 11688 d"),
        ("period", Range(3_000.0, 3_200.0), "d", "3000 to 3200 d"),
        ("right ascension", 270.63125, "deg", "18:02:31.50"),
        ("declination", -45.208333, "deg", "-45:12:30.0"),
        ("height", 2300.0, "m", "2300 m"),
        ("covariance", {"names": ["a"]}, "", "given"),
        ("epoch", Moment(61_234.2, 0.5, 0.5, "BJD 2461234.7±0.5"), "",
         "BJD 2461234.7±0.5 (BMJD_TDB 61234.20 ± 0.50)"),
        ("instant", Moment(61_234.123456789, 0.0, 0.0, ""), "", "BMJD_TDB 61234.123457"),
        ("epoch of cycle 0", 49_018.25, "BMJD_TDB", "BMJD_TDB 49018.25"),
        ("state", "episodic", "", "episodic"),
        ("priority", 3, "", "3"),
    ],
)  # fmt: skip
def test_values_are_told_in_their_units(name, value, unit, said):
    assert told_value(name, value, unit) == said


@pytest.mark.parametrize(
    ("before", "after", "said"),
    [
        (Measured(7.31, 0.03, 0.03), Measured(7.3100001, 0.03, 0.03),
         "7.31 +0.03 −0.03 → 7.3100001 +0.03 −0.03"),
        (Limit(12.1, "above", 3.0), Limit(12.1, "above", 5.0), "> 12.1 at 3 sigma → > 12.1 at 5 sigma"),
        (Moment(61_234.12345678, 0, 0, "x"), Moment(61_234.12345679, 0, 0, "x"),
         "BMJD_TDB 61234.123456780 → BMJD_TDB 61234.123456790"),
    ],
)  # fmt: skip
def test_what_differs_never_looks_alike(before, after, said):
    change = EntryChange("observation 2", "replaced by 4", "Rook", (FieldChange("value", "", before, after),))
    shown = rendered(History("x", (ToldOperation(operation(), (change,)),)))
    assert said in shown


UNDONE = Undone(
    operation(14, "took back operation 12"),
    operation(12, f"loaded {HOSTILE_NAME}"),
    (EntryChange("observations", "put back", rows=10_000, note=f"10,000 of {HOSTILE_NAME}"),),
    puts_back=True,
)


def test_an_undo_says_what_it_would_do_and_what_it_did():
    would = rendered(UNDONE).splitlines()
    assert would[0].startswith("would put back: operation 12, loaded [red]Rook")
    assert would[0].endswith("(Ida Vik, 2031-04-07 03:12 UTC)")
    assert would[1].startswith("    10,000 observations: put back (10,000 of [red]Rook")
    assert len(would) == 2
    from dataclasses import replace

    did = rendered(replace(UNDONE, by_id=15)).splitlines()
    assert did[0].startswith("put back: operation 12")
    assert did[2] == "this is operation 15; undo it again with: campaign undo 15"
    back = rendered(replace(UNDONE, puts_back=False, by_id=15)).splitlines()
    assert back[0].startswith("undone: operation 12")
    assert back[2] == "this is operation 15; put it back with: campaign undo 15"
    assert rendered(replace(UNDONE, puts_back=False)).startswith("would undo: operation 12")


def test_documents_hold_every_digit_and_null_for_unknown():
    document = json.loads(history_json(HOSTILE, "2031-04-07T00:00:00Z"))
    assert (document["schema"], document["as_of"]) == ("campaign/history/1", "2031-04-07T00:00:00Z")
    assert document["data"]["about"] == HOSTILE_NAME
    assert document["data"]["more"] is True
    first, second = document["data"]["operations"]
    assert first["at"] == "2031-04-07T03:12:10.123456Z"
    assert (first["operation"], first["undoes"], first["undone_by"], first["stands"]) == (13, 11, None, True)
    assert first["changes"][2] == {
        "subject": "observations", "action": "loaded", "system": None, "rows": 1_234_567, "note": "",
        "fields": [],
    }  # fmt: skip
    assert second["changes"][0]["fields"] == [
        {
            "name": "value", "unit": "mag",
            "before": {"value": 7.31, "minus": 0.03, "plus": 0.03},
            "after": {"value": 7.35, "minus": 0.02, "plus": 0.02},
        }
    ]  # fmt: skip
    undone = json.loads(undone_json(UNDONE, "2031-04-07T00:00:00Z"))["data"]
    assert (undone["operation"], undone["first"], undone["by"], undone["puts_back"]) == (14, 12, None, True)


def test_documents_carry_no_raw_control_character():
    text = history_json(HOSTILE, "2031-04-07T00:00:00Z")
    assert "\x1b" not in text and "\u202e" not in text and "\x9b" not in text
