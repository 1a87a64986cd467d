"""The dated table of one system."""

import io
import json
from dataclasses import fields

import pytest
from output_examples import START, utc_of
from rich.cells import cell_len

from campaign.model.forecasts import EphemerisResult, EphemerisRow
from campaign.output.console import Screen
from campaign.output.ephemeris import ephemeris_json, render_ephemeris


def table(angles=True):
    rows = tuple(
        EphemerisRow(
            START + 10.0 * i, utc_of(START + 10.0 * i), 7, 0.1 + i / 300, 33.25, 12.3456789012345, 6.5, 5.25,
            271.04 if angles else None, -12.5 if angles else None, 30.25 if angles else None,
        )
        for i in range(4)
    )  # fmt: skip
    return EphemerisResult("Lantern 3", "Orrel fit", utc_of(START), rows, ("A note.",), ("A warning.",))


def drawn(result, width):
    heard = io.StringIO()
    render_ephemeris(Screen(heard, width is not None, width), result)
    return heard.getvalue()


@pytest.mark.parametrize("width", [20, 40, 80, 160])
def test_it_keeps_inside_the_window_and_says_what_it_left_out(width):
    text = drawn(table(), width)
    assert max(cell_len(line) for line in text.splitlines()) <= width
    assert ("Left out" in text) == (width == 80 or width == 40)


def test_in_a_pipe_every_quantity_stands_on_the_line_of_its_date():
    line = next(line for line in drawn(table(), None).splitlines() if line.startswith("2031-04-18"))
    assert line.split() == [
        "2031-04-18", "00:00", "62974.0000", "7", "0.10333", "33.25", "12.346", "6.50", "5.25", "271.0",
        "−12.50", "30.25",
    ]  # fmt: skip


def test_quantities_that_the_elements_do_not_give_are_named():
    text = drawn(table(angles=False), 160)
    assert "Not given by the elements: position angle, velocity of A, velocity of B." in text
    assert "PA" not in text.splitlines()[2]


def test_json_keeps_every_digit_and_the_field_names_of_the_model():
    told = json.loads(ephemeris_json(table(angles=False)))
    assert told["schema"] == "campaign/ephemeris/1"
    row = told["data"]["rows"][0]
    assert set(row) == {field.name for field in fields(EphemerisRow)}
    assert row["separation_au"] == 12.3456789012345
    assert row["velocity_a_kms"] is None
