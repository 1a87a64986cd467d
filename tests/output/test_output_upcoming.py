"""The forecast on the screen: readable at 80 columns, richer at 160, harmless whatever the names."""

import io
import json
import os
import re
import subprocess
import sys
from pathlib import Path

import pytest
from output_examples import HOSTILE_NAME, START, dated, explained, forecast
from rich.cells import cell_len

from campaign.model.forecasts import STATUSES, EventForecast
from campaign.output.console import Screen
from campaign.output.explain import render_explained
from campaign.output.upcoming import render_upcoming
from campaign.output.upcoming_document import upcoming_json

ROOT = Path(__file__).resolve().parents[2]

# Issue contract (DEVELOPERS.md): the keys of one event, and the additions made since.
CONTRACT = {
    "system", "event", "cycle", "basis", "solution", "rule", "bmjd_tdb", "utc", "status", "probability",
    "probability_in_window", "phase_lost", "notes",
}  # fmt: skip
ADDITIONS = {"probability_per_yr", "observed", "disagreement_sigma", "conditioning"}


def drawn(result, width, colour=False, unicode=True, render=render_upcoming):
    heard = io.StringIO()
    render(Screen(heard, width is not None, width, colour, unicode), result)
    return heard.getvalue()


def rows_of(text, system):
    return [line for line in text.splitlines() if line.startswith(system)]


@pytest.mark.parametrize("width", [20, 40, 60, 80, 100, 130, 160, 240])
@pytest.mark.parametrize("unicode", [True, False])
@pytest.mark.parametrize("name", [None, HOSTILE_NAME, "灯" * 30])
def test_nothing_is_wider_than_the_window(width, unicode, name):
    for text in (
        drawn(forecast(name), width, unicode=unicode),
        drawn(explained(), width, unicode=unicode, render=render_explained),
    ):
        assert max(cell_len(line) for line in text.splitlines()) <= width
        if not unicode:
            assert text.replace("灯", "").isascii()


def test_at_80_columns_the_table_says_all_that_was_asked_for():
    text = drawn(forecast(), 80)
    assert "Left out" not in text
    heading = next(line for line in text.splitlines() if line.startswith("system"))
    assert heading.split() == [
        "system",
        "event",
        "UTC",
        "68",
        "%,",
        "d",
        "95",
        "%,",
        "d",
        "status",
        "days",
        "chance",
    ]
    assert re.search(r"^Lantern 3 +onset 7 +2033-06-28 ±12 +±24 +expected +\+812", text, re.M)


def test_at_160_columns_intervals_are_calendar_days():
    text = drawn(forecast(), 160)
    assert "Left out" not in text
    line = next(line for line in rows_of(text, "Lantern 3") if " onset " in line)
    assert re.split(r" {2,}", line.strip()) == [
        "Lantern 3", "onset", "7", "2033-06-28", "2033-06-16 … 2033-07-10", "2033-06-04 … 2033-07-21",
        "expected", "+812", "100 %", "100 %", "Orrel fit", "separation",
    ]  # fmt: skip


def test_events_stand_in_order_of_date_and_dateless_ones_last():
    text = drawn(forecast(), None)
    table = text.split("\n\n")[1].splitlines()[1:]
    dates = [re.search(r"\d{4}-\d\d-\d\d", line).group() for line in table[:-1]]
    assert dates == sorted(dates)
    assert table[-1].startswith("Drift")


@pytest.mark.parametrize("width", [80, 160, None])
def test_a_lost_phase_shows_a_chance_a_year_and_no_date(width):
    line = rows_of(drawn(forecast(), width), "Drift")[0]
    assert "8 %/yr" in line
    assert "phase lost" in line
    assert not re.search(r"\d{4}-\d\d", line)


def test_an_unknown_error_is_said_and_is_not_zero():
    assert "error unknown" in rows_of(drawn(forecast(), 160), "Quill")[0]
    # One line, in the columns of both intervals.
    assert rows_of(drawn(forecast(), 80), "Quill")[0].count("unknown") == 2


def test_chance_is_shown_where_the_event_may_not_happen_and_never_rounded_to_certainty():
    text = drawn(forecast(), 80)
    assert any("83 %" in line for line in rows_of(text, "Old Ferry"))
    assert any(">99 %" in line for line in rows_of(text, "Old Ferry"))
    assert "100 %" not in "".join(rows_of(text, "Lantern 3"))


@pytest.mark.parametrize("status", STATUSES)
def test_status_words_are_those_of_the_model(status):
    from dataclasses import replace

    result = replace(forecast(), events=(dated("Gannet", "onset", 1, START + 50.0, status=status),))
    for width in (80, 160, None):
        assert f" {status} " in rows_of(drawn(result, width), "Gannet")[0]


def test_solutions_side_by_side_are_told_apart_at_80_columns():
    from dataclasses import replace

    pair = (
        dated("Gannet", "onset", 1, START + 50.0, solution="Orrel fit"),
        dated("Gannet", "onset", 1, START + 90.0, solution="Vane fit", disagreement_sigma=2.4),
    )
    text = drawn(replace(forecast(), events=pair), 80)
    assert "Orrel" in rows_of(text, "Gannet")[0]
    assert "Vane" in rows_of(text, "Gannet")[1]
    assert "by Vane fit it is +2.4 sigma from the solution listed first" in " ".join(text.split())


def test_no_event_is_said_in_words():
    from dataclasses import replace

    assert "No event falls in this period." in drawn(replace(forecast(), events=(), dust_windows=()), 80)


@pytest.mark.parametrize("width", [80, 160])
def test_colour_adds_nothing_that_words_do_not_say(width):
    coloured = drawn(forecast(), width, colour=True)
    assert "\x1b[" in coloured
    assert not re.search(r"\x1b\[[\d;]*(38|48);", coloured)
    assert re.sub(r"\x1b\[[\d;]*m", "", coloured) == drawn(forecast(), width)


@pytest.mark.parametrize("width", [20, 80, 160, None])
@pytest.mark.parametrize("colour", [True, False])
def test_a_hostile_name_stays_text(width, colour):
    text = re.sub(
        r"\x1b\[[\d;]*m", "", drawn(forecast(HOSTILE_NAME), width, colour=colour and width is not None)
    )
    assert not set(text) & set("\x1b\x07\x9b\u202e\r")
    assert "[red]Rook" in text
    if width is None:
        assert (
            len([line for line in text.splitlines() if "[red]Rook[/red] :bomb: \\x1b]0;owned" in line]) >= 2
        )


def test_the_dates_name_what_they_rest_on_and_who_has_none():
    text = " ".join(drawn(forecast(), 80).split())
    assert "Lantern 3 orbit of Orrel fit (P 3127.5 d), rule separation, cycle 6 seen in 2023" in text
    assert "Wren no forecast: no solution and no confirmed episode" in text
    assert "Warning: Quill has no error of its period." in text
    assert "8.4 min" in text
    assert "20000 draws, seed 1" in text


def test_the_explanation_lists_each_part_of_the_error_in_days():
    text = drawn(explained(), 80, render=render_explained)
    assert "onset 7: 2033-06-28 (±12 d, 68 %), expected" in text
    assert re.search(r"critical separation +11\.2 +97 % +█{12}", text)
    assert re.search(r"covariance of epoch and period +−0\.4 +−0\.1 % ", text)
    # 0.5² + 2.1² − 0.4² + 11.2² = 129.94, by hand
    assert re.search(r"together +11\.4 +100 %", text)
    assert "eccentricity" in text
    assert "the next periastron is cycle 7" in text


def test_json_events_have_exactly_the_keys_of_the_contract():
    told = json.loads(upcoming_json(forecast(HOSTILE_NAME)))
    assert told["schema"] == "campaign/upcoming/1"
    assert told["as_of"] == "2031-04-08T00:00:00Z"
    assert told["warnings"] == ["Quill has no error of its period."]
    for event in told["data"]["events"]:
        assert set(event) == CONTRACT | ADDITIONS
        for part, keys in (("bmjd_tdb", {"median", "sigma_d"}), ("utc", {"median"})):
            assert event[part] is None or set(event[part]) == keys | {"lo68", "hi68", "lo95", "hi95"}
    assert {event["system"] for event in told["data"]["events"]} >= {HOSTILE_NAME}


def test_json_dates_are_null_where_they_are_not_known():
    events = json.loads(upcoming_json(forecast()))["data"]["events"]
    drift = next(event for event in events if event["system"] == "Drift")
    assert drift["bmjd_tdb"] is None
    assert drift["utc"] is None
    assert drift["phase_lost"] is True
    quill = next(event for event in events if event["system"] == "Quill")
    assert quill["bmjd_tdb"] == {"median": START + 1500.0} | dict.fromkeys(
        ("sigma_d", "lo68", "hi68", "lo95", "hi95")
    )
    assert quill["probability"] is None


def test_json_fields_are_those_of_the_model():
    assert {field for field in EventForecast.__dataclass_fields__} == CONTRACT | ADDITIONS


def test_json_of_one_system_holds_its_explanation():
    told = json.loads(upcoming_json(explained().upcoming, explained()))
    step = told["data"]["explanation"]["events"][0]
    assert step["event"] == "onset"
    assert step["terms"][1] == {"cause": "period, 7 cycles on", "size_d": 2.1, "note": ""}


@pytest.mark.parametrize(
    "surroundings",
    [
        {"TZ": "Pacific/Kiritimati"},
        {"LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"},
        {"TERM": "dumb", "COLUMNS": "40"},
        {"FORCE_COLOR": "1", "TERM": "xterm-256color"},
    ],
)
def test_json_bytes_do_not_depend_on_the_surroundings(surroundings):
    code = (
        "import sys; from output_examples import *;"
        "from campaign.output.upcoming_document import upcoming_json;"
        "sys.stdout.write(upcoming_json(forecast(HOSTILE_NAME)))"
    )
    path = {"PYTHONPATH": f"{ROOT}{os.pathsep}{Path(__file__).parent}", "PATH": os.environ["PATH"]}
    done = subprocess.run(
        [sys.executable, "-c", code], env=path | surroundings, capture_output=True, check=True
    )
    assert done.stdout == upcoming_json(forecast(HOSTILE_NAME)).encode()


def test_a_narrow_table_says_what_a_wider_one_would_show():
    assert "A wider window also shows the chance in the period" in " ".join(drawn(forecast(), 80).split())
    assert "A wider window" not in drawn(forecast(), 200)
    assert "A wider window" not in drawn(forecast(), None)
