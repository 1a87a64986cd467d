"""A wind collision on screens of any width, in a pipe, and as a document."""

from __future__ import annotations

import io
import json
from dataclasses import fields, replace

import pytest
from output_examples import HOSTILE_NAME
from rich.cells import cell_len

from campaign.model.propagated import Propagated
from campaign.model.winds import WindRow, WindsResult
from campaign.output.console import Screen
from campaign.output.propagated import bare_phase, brief, in_millions, mostly, phase, told
from campaign.output.winds import render_winds, winds_json
from campaign.studies.watch import load_sample_campaign
from campaign.studies.winds import WindsQuestion, winds

NOW = 61_465.5


@pytest.fixture(scope="module")
def result() -> WindsResult:
    """An invented system of the sample that has everything."""
    record = load_sample_campaign(["Kettle 7"]).records[0]
    return winds(record, WindsQuestion(NOW, step_d=500.0, draws=400))


def drawn(result, width, *, unicode=True, **shown):
    heard = io.StringIO()
    render_winds(Screen(heard, width is not None, width, unicode=unicode), result, **shown)
    return heard.getvalue()


@pytest.mark.parametrize("width", [20, 40, 80, 120, 160])
def test_it_keeps_inside_the_window_and_says_what_it_left_out(result, width):
    text = drawn(result, width, forms=True, shape=True)
    assert max(cell_len(line) for line in text.splitlines()) <= width
    if width in (40, 80):
        assert f"Left out at {width} columns:" in text


def test_in_a_pipe_a_date_has_every_quantity_on_its_line(result):
    text = drawn(result, None)
    assert "Left out" not in text
    lines = text.splitlines()
    heading = next(line for line in lines if line.startswith("UTC") and "chi A law" in line)
    first = next(line for line in lines if line.startswith("2027-03-01"))
    for name in ("UTC", "phase", "D au", "to A au", "chi A", "chi B", "sight°", "through", "cavity"):
        assert name in heading
    row = result.rows[0]
    assert f"{row.separation_au.median:.1f}"[:3] in first
    assert row.seen_through in first


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (Propagated(-0.03, -0.0393, 0.008, -0.0476, -0.031, -0.05, -0.02), "−0.0393 ± 0.0083"),
        (Propagated(-3.4e-5, -3.4e-5, 2e-5, -5.6e-5, -1.4e-5, -8e-5, 0.0), "−0.000034 ± 0.000021"),
        (Propagated(0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0), "+0.0000 ± 0.0000"),
    ],
)
def test_a_phase_next_to_periastron_keeps_its_digits(value, text):
    assert phase(value) == text
    assert bare_phase(-3.4e-5) == "−0.000034"


def test_a_terminal_without_unicode_gets_plain_characters(result):
    assert drawn(result, 80, unicode=False, forms=True, shape=True).isascii()


def test_each_quantity_has_its_error_and_what_makes_most_of_it(result):
    text = drawn(result, 160)
    table = text.split("\n\n")[1]
    lines = [
        line for line in table.splitlines() if line.startswith(("momentum", "stagnation", "half-opening"))
    ]
    assert len(lines) == 4
    for line in lines:
        assert any(mark in line for mark in ("±", "+"))
        assert "star A, " in line and line.rstrip().endswith("%")
    assert "Errors mostly from: " in text


def test_other_forms_and_the_shape_come_on_request(result):
    plain = drawn(result, 120)
    assert "Eichler" not in plain and "across/D" not in plain
    asked = drawn(result, 120, forms=True, shape=True)
    for words in ("Canto, Raga & Wilkin 1996", "Eichler & Usov 1993", "Gayley 2009", "Pittard & Dawson 2018"):
        assert words in asked
    assert "across/D" in asked
    # Near its asymptote the surface may be out of reach within the errors; its error is known all the same.
    table = asked[asked.index("across/D") :].split("\n\n")[0]
    assert "out of reach" in table and "error unknown" not in table


def test_the_picture_is_the_same_above_and_below_the_line_of_the_stars(result):
    lines = drawn(result, 80).splitlines()
    middle = next(i for i, line in enumerate(lines) if "●" in line and "○" in line and "█" in line)
    above = [line.rstrip() for line in lines[middle - 8 : middle]]
    below = [line.rstrip() for line in lines[middle + 1 : middle + 9]]
    assert above == below[::-1]
    # The stronger wind is on the left, the surface between the stars nearer to the weaker, open to the right.
    axis = lines[middle]
    assert axis.index("●") < axis.index("█") < axis.index("○")
    share = (axis.index("█") - axis.index("●")) / (axis.index("○") - axis.index("●"))
    assert share == pytest.approx(result.stagnation_from_stronger_over_d.value, abs=0.08)
    assert above[0].index("█") > axis.index("○")


def test_the_strips_have_periastron_in_the_middle(result):
    lines = drawn(result, 80).splitlines()
    (chi,) = [line for line in lines if line.startswith("chi of star A  ") and set(line[15:]) <= set("█▓▒░·")]
    (axis,) = [line for line in lines if line.startswith("phase  ")]
    assert len(chi) == 80
    assert axis.index(" 0 ") + 1 == pytest.approx(15 + 32, abs=1)
    # The gas is coolest nearest to periastron.
    order = "█▓▒░·"
    marks = [order.index(mark) for mark in chi[15:]]
    assert marks.index(min(marks)) == pytest.approx(32, abs=2)


def test_names_of_others_cannot_steer_the_terminal(result):
    text = drawn(replace(result, system=HOSTILE_NAME, solution=HOSTILE_NAME), 80)
    for character in ("\x1b", "\x07", "\u202e", "\x9b"):
        assert character not in text
    document = winds_json(replace(result, system=HOSTILE_NAME))
    assert document.isascii() and json.loads(document)["data"]["system"] == HOSTILE_NAME


def test_the_document_has_the_fields_of_the_model_with_their_units(result):
    told_document = json.loads(winds_json(result))
    assert set(told_document) == {"schema", "as_of", "data", "warnings"}
    assert told_document["schema"] == "campaign/winds/1"
    assert told_document["as_of"] == result.as_of_utc and told_document["as_of"].endswith("Z")
    names = {field.name for field in fields(WindsResult)} - {"as_of_utc", "warnings"}
    assert set(told_document["data"]) == names
    row = told_document["data"]["rows"][0]
    assert set(row) == {field.name for field in fields(WindRow)}
    assert set(row["separation_au"]) == {field.name for field in fields(Propagated)}
    assert row["separation_au"]["median"] == result.rows[0].separation_au.median
    assert row["chi_a"]["dominant"] == "mass loss of star A"
    assert told_document["data"]["cooling"][0]["half_window_d"]["value"] is None
    assert any("indicator only" in text for text in told_document["data"]["assumptions"])


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (None, ""),
        (Propagated(None, probability=0.0), ""),
        (Propagated(0.0452, unknown_errors=("wind speed of star A",)), "0.0452 (error unknown)"),
        (Propagated(9.0, 9.0, 1.0, 8.0, 10.0, 7.0, 11.0), "9.0 ± 1.0"),
        (Propagated(9.0, 9.0, 1.0, 8.5, 11.0, 7.0, 12.0), "9.00 +2.00 −0.50"),
        (Propagated(0.0, 0.0, 0.05, 0.0, 0.091, 0.0, 0.15), "0 … 0.091"),
        (Propagated(1.5047, 1.5047, 0.0, 1.5047, 1.5047, 1.5047, 1.5047), "1.505"),
        (Propagated(2e8, 2e8, 1e7, 1.9e8, 2.1e8, 1.8e8, 2.2e8), "(2.00 ± 0.10)e+8"),
    ],
)
def test_a_number_with_its_error(value, text):
    assert told(value) == text
    assert brief(value) == text.replace(" (error unknown)", " ?")


def test_a_number_in_millions_keeps_its_digits():
    value = Propagated(2e8, 2e8, 1e7, 1.9e8, 2.1e8, 1.8e8, 2.2e8, 1.0, "wind speed of star A", 0.8)
    assert told(in_millions(value), "MK") == "200 ± 10 MK"
    assert in_millions(None) is None
    assert mostly(in_millions(value)) == "wind speed of star A, 80 %"


@pytest.mark.parametrize(
    ("value", "text"),
    [
        (Propagated(None), ""),
        (Propagated(-0.0123), "−0.0123"),
        (Propagated(0.25, 0.25, 0.2, 0.05, 0.45), "+0.25 ± 0.20"),
        (Propagated(-0.01, -0.01, 0.001, -0.011, -0.009), "−0.0100 ± 0.0010"),
    ],
)
def test_a_phase_has_its_sign(value, text):
    assert phase(value) == text
    assert phase(value, error=False) == (f"{value.value:+.4f}".replace("-", "−") if text else "")
