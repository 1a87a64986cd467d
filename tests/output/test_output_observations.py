"""Observations as a list on any screen: one line each where it fits, and nothing that steers it."""

import io
import json
from dataclasses import replace
from datetime import UTC, datetime

import pytest
from output_examples import HOSTILE_NAME
from rich.cells import cell_len

from campaign.model.history import Amended, FieldChange, ListedObservation, ObservationList, Withdrawn
from campaign.model.instants import Moment
from campaign.model.measured import Measured
from campaign.model.observations import Observation
from campaign.output.console import Screen
from campaign.output.observations import (
    amended_json,
    observations_json,
    render_amended,
    render_observations,
    render_withdrawn,
    value_of,
    what_of,
    withdrawn_json,
)

AT = datetime(2031, 4, 7, 3, 12, 10, 123456, tzinfo=UTC)


def observation(number=1, **fields):
    given = {
        "kind": "photometry", "moment": Moment(61_234.5, 0.001, 0.001, "MJD 61234.5", "utc", "observatory"),
        "value": Measured(7.31, 0.03, 0.03), "unit": "mag", "band": "K",
    } | fields  # fmt: skip
    return Observation(number, f"uid-{number}", 7, **given)


def listed(number=1, system="Lantern 3", utc="2026-07-13T12:00:00Z", **fields):
    fate = {name: fields.pop(name) for name in list(fields) if name in
            ("superseded_by_id", "superseded_at", "withdrawn_at", "withdrawn_why")}  # fmt: skip
    return ListedObservation(observation(number, **fields), system, utc, AT, "Ida Vik", 12, **fate)


USUAL = ObservationList(
    (
        listed(1, photometric_system="Cold Mesa JHKLM", site="Cold Mesa", source="Cold Mesa watch sheets"),
        listed(22, value=Measured(12.1), limit_side="above", limit_sigma=3.0, quality="doubtful",
               photometric_system="Lamplight JHKL", site="Lamplight Ridge", source="Ridge patrol"),
        listed(333, value=Measured(6.0, 0.1, 0.2), band="M", site="Farwatch", source="Farwatch release 3"),
    ),
    found=3,
)  # fmt: skip
HOSTILE = ObservationList(
    (
        listed(1, system=HOSTILE_NAME, site=HOSTILE_NAME, source=HOSTILE_NAME, text=HOSTILE_NAME,
               band="\x1b[2J"),
        listed(2, system="灯" * 60, species="x" * 200, kind="line", unit="angstrom", band=None, star="A",
               text="a remark " * 40),
        listed(3, kind="remark", value=None, unit=None, band=None, utc=None, withdrawn_at=AT,
               withdrawn_why=HOSTILE_NAME, text="= 1 + 1"),
    ),
    found=12_345,
)  # fmt: skip


def rendered(render, thing, width=None, unicode=True, colour=False):
    heard = io.StringIO()
    render(Screen(heard, width is not None, width, colour, unicode), thing)
    return heard.getvalue()


@pytest.mark.parametrize("width", [160, 80, 60, 40, 20])
@pytest.mark.parametrize("found", [USUAL, HOSTILE], ids=["usual", "hostile"])
@pytest.mark.parametrize("unicode", [True, False])
def test_no_line_is_wider_than_the_window_and_none_steers_it(width, found, unicode):
    text = rendered(render_observations, found, width, unicode)
    assert max(cell_len(line) for line in text.splitlines()) <= width
    assert all(line.isprintable() for line in text.splitlines())
    for number in ("1", "2"):
        assert number in text


def test_at_80_columns_an_observation_is_one_line_and_the_rest_is_named():
    lines = rendered(render_observations, USUAL, 80).splitlines()
    assert lines[0] == "Lantern 3, photometry"
    rows = [line for line in lines if line.lstrip()[:1].isdigit()]
    assert [row.split()[0] for row in rows] == ["1", "22", "333"]
    assert len(lines) == 1 + 2 + 3 + 1
    assert lines[-1] == "Left out at 80 columns: site, source, entered by."
    assert "7.310 ± 0.030 mag" in rows[0] and "> 12.1 mag" in rows[1] and "6.00 +0.20 −0.10 mag" in rows[2]
    assert "doubtful" in rows[1]
    shorter = rendered(render_observations, ObservationList(USUAL.rows[:1], 1), 80).splitlines()
    assert "Cold Mesa JHKLM" in shorter[3] and "Cold Mesa" in shorter[3].rpartition("mag")[2]
    assert shorter[4] == "Left out at 80 columns: source, entered by."


def test_at_160_columns_nothing_is_left_out():
    text = rendered(render_observations, USUAL, 160)
    assert "Left out" not in text
    assert "Cold Mesa watch sheets" in text and "Ida Vik" in text


def test_in_a_pipe_each_observation_is_one_line_whatever_its_text():
    lines = rendered(render_observations, HOSTILE).splitlines()
    assert len(lines) == 1 + 3
    assert "\\x1b]0;owned\\x07" in lines[1] and "\\u202e" in lines[1] and "\\x1b[2J" in lines[1]
    assert "a remark a remark" in lines[2]
    assert "MJD 61234.5000 TDB" in lines[3]


def test_colour_comes_from_code_alone():
    text = rendered(render_observations, HOSTILE, 80, colour=True)
    assert "\x1b]0" not in text and "\x1b[31m" not in text and "\x1b[2J" not in text


def test_nothing_found_is_one_sentence():
    said = rendered(render_observations, ObservationList((), 0))
    assert said == "No observation passes the filters.\n"


@pytest.mark.parametrize(
    ("fields", "of", "value"),
    [
        ({}, "K", "7.310 ± 0.030 mag"),
        ({"photometric_system": "Harrow HK"}, "K Harrow HK", "7.310 ± 0.030 mag"),
        ({"value": Measured(6.0), "limit_side": "below", "limit_sigma": 5.0}, "K", "< 6 mag"),
        ({"kind": "flux", "unit": "jy", "band": None, "frequency_ghz": 8.4,
          "value": Measured(2.3e-3, 2e-4, 2e-4)},
         "8.4 GHz", "0.00230 ± 0.00020 Jy"),
        ({"kind": "flux", "unit": "erg/s/cm2", "band": None, "energy_low_kev": 0.5, "energy_high_kev": 10.0,
          "value": Measured(4.1e-12, 3e-13, 3e-13)}, "0.5 to 10 keV", "(4.10 ± 0.30)e-12 erg/s/cm2"),
        ({"kind": "velocity", "unit": "kms", "band": None, "star": "B", "species": "He II",
          "value": Measured(-45.2, 3.1, 3.1)},
         "star B He II", "-45.2 ± 3.1 km/s"),
        ({"kind": "position", "unit": "mas", "band": None, "value": Measured(12.1, 0.3, 0.3),
          "position_angle_deg": Measured(143.0, 2.0, 2.0)}, "", "12.10 ± 0.30 mas at 143.0 ± 2.0 deg"),
        ({"kind": "shell", "unit": "arcsec", "band": "L", "shell_index": 2, "feature": "limb",
          "measured_at": "edge", "value": Measured(1.2, 0.05, 0.05)},
         "L shell 2 limb edge", "1.200 ± 0.050 arcsec"),
        ({"kind": "remark", "unit": None, "band": None, "value": None}, "", ""),
    ],
)  # fmt: skip
def test_a_value_and_what_it_belongs_to_are_told_in_words(fields, of, value):
    assert what_of(observation(**fields)) == of
    assert value_of(observation(**fields)) == value


def test_the_document_has_units_nulls_and_fates():
    found = ObservationList(
        (
            listed(1, superseded_by_id=4, superseded_at=AT),
            listed(2, value=None, kind="remark", text=HOSTILE_NAME),
        ),
        2,
        warnings=(f"mixed {HOSTILE_NAME}",),
    )  # fmt: skip
    text = observations_json(found, "2031-04-07T00:00:00Z")
    assert "\x1b" not in text and "\u202e" not in text
    document = json.loads(text)
    assert document["schema"] == "campaign/observation-list/1"
    assert document["warnings"] == [f"mixed {HOSTILE_NAME}"]
    first, second = document["data"]["observations"]
    assert (first["bmjd_tdb"], first["bmjd_tdb_plus_d"], first["unit"]) == (61_234.5, 0.001, "mag")
    assert first["as_typed"] == {"text": "MJD 61234.5", "scale": "utc", "place": "observatory"}
    assert (first["in_use"], first["superseded_by"]) == (False, 4)
    assert first["superseded_at"] == first["entered_at"] == "2031-04-07T03:12:10.123456Z"
    assert (second["value"], second["text"], second["in_use"]) == (None, HOSTILE_NAME, True)
    assert "system_id" not in first and "site_id" not in first


CHANGES = (
    FieldChange("value", "mag", Measured(7.31, 0.03, 0.03), Measured(7.35, 0.02, 0.02)),
    FieldChange("note", "", None, HOSTILE_NAME),
)
AMENDED = Amended(HOSTILE_NAME, 13, 1, CHANGES, True, True, (f"kept {HOSTILE_NAME}",))


@pytest.mark.parametrize("width", [None, 80, 40, 20])
def test_a_correction_and_a_withdrawal_stay_in_the_window(width):
    withdrawn = Withdrawn(HOSTILE.rows, HOSTILE_NAME, True)
    for render, thing in ((render_amended, AMENDED), (render_withdrawn, withdrawn)):
        lines = rendered(render, thing, width).splitlines()
        assert all(line.isprintable() for line in lines)
        assert width is None or max(map(cell_len, lines)) <= width


def test_a_correction_says_what_was_what_is_and_where_the_old_one_went():
    lines = rendered(render_amended, replace(AMENDED, system="Rook")).splitlines()
    assert lines[0] == "amended observation 1 of Rook, now 13"
    assert lines[1] == "  value: 7.310 ± 0.030 mag → 7.350 ± 0.020 mag"
    assert lines[-1] == "number 1 is kept: campaign history 13"
    rehearsed = rendered(render_amended, replace(AMENDED, written=False)).splitlines()
    assert rehearsed[0].startswith("would amend observation 1 of [red]Rook")
    assert len(rehearsed) == 3
    document = json.loads(amended_json(AMENDED, "2031-04-07T00:00:00Z"))
    assert document["schema"] == "campaign/amend/1"
    assert (document["data"]["id"], document["data"]["replaces"]) == (13, 1)
    assert json.loads(amended_json(replace(AMENDED, written=False), ""))["data"]["id"] is None


def test_a_withdrawal_says_which_and_why():
    lines = rendered(render_withdrawn, Withdrawn(USUAL.rows[:1], "wrong star", True)).splitlines()
    assert lines == [
        "withdrew 1: Lantern 3, photometry K Cold Mesa JHKLM 7.310 ± 0.030 mag, 2026-07-13",
        "reason kept: wrong star; take it back with: campaign undo",
    ]
    would = rendered(render_withdrawn, Withdrawn(USUAL.rows[:1], "wrong star", False)).splitlines()
    assert len(would) == 1
    assert would[0].startswith("would withdraw 1: Lantern 3")
    data = json.loads(withdrawn_json(Withdrawn(USUAL.rows, "wrong star", True), ""))["data"]
    assert ([each["id"] for each in data["observations"]], data["why"]) == ([1, 22, 333], "wrong star")
