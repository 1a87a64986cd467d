"""``campaign observations``: every filter, what is shown of each kind, and the light curve in the terminal.

What passes which filter follows from what was logged (``LOGGED`` in conftest.py): common practice, no source.
"""

from __future__ import annotations

import pytest


def numbers(ran):
    assert ran.status == 0, ran.err
    return [each["id"] for each in ran.document["data"]["observations"]]


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        ((), [1, 12, 10, 2, 3, 5, 6, 7, 8, 9, 11, 4]),
        (("Lantern 3",), [1, 10, 2, 3, 5, 6, 7, 8, 9, 11, 4]),
        (("  lantern   3 ",), [1, 10, 2, 3, 5, 6, 7, 8, 9, 11, 4]),
        (("ln3",), [1, 10, 2, 3, 5, 6, 7, 8, 9, 11, 4]),
        (("Quarry",), [12]),
        (("--kind", "photometry"), [1, 12, 2, 3, 4]),
        (("--kind", "VELOCITY", "--kind", "shell"), [6, 9]),
        (("--kind", "remark"), [11]),
        (("--kind", "attempt"), [10]),
        (("--band", "K"), [1, 12, 2, 4]),
        (("--band", "K", "--band", "J"), [1, 12, 2, 3, 4]),
        (("--band", "k"), []),
        (("--from", "2021-06-03"), [7, 8, 9, 11, 4]),
        (("--from", "2022"), [4]),
        (("--until", "2021-04"), [1, 12, 10]),
        (("--until", "2021-04-07"), [1, 12]),
        (("--from", "2021-05-01", "--until", "2021-05-01"), [2, 3]),
        (("--from", "2021-06", "--until", "2021-06-02"), [5, 6]),
        (("--from", "MJD 59369", "--until", "2021.5"), [8, 9, 11]),
        (("--site", "cold mesa"), [1, 10, 2]),
        (("--site", "Harrow Pass"), [3]),
        (("--source", "book"), [1]),
        (("--source", "NIGHT"), [1]),
        (("--source", "100%"), [4]),
        (("--source", "(part 2)"), [4]),
        (("--source", "%"), [4]),
        (("--source", "_"), []),
        (("--source", "nobody"), []),
        (("--quality", "doubtful"), [2]),
        (("--quality", "bad", "--quality", "Doubtful"), [12, 2]),
        (("--quality", "good", "--kind", "photometry"), [1, 3, 4]),
        (("Lantern 3", "--kind", "photometry", "--band", "K", "--site", "Cold Mesa", "--until", "2021-04"),
         [1]),
        (("--limit", "3"), [9, 11, 4]),
        (("--limit", "0", "--kind", "photometry"), [1, 12, 2, 3, 4]),
    ],
)  # fmt: skip
def test_filters_let_through_what_they_say(watched, words, expected):
    assert numbers(watched("observations", *words, "--json")) == expected


def test_the_document_says_what_each_observation_is(watched):
    document = watched("observations", "Lantern 3", "--json", "--limit", "0").document
    assert document["schema"] == "campaign/observation-list/1"
    assert document["data"]["found"] == 11
    by_number = {each["id"]: each for each in document["data"]["observations"]}
    first = by_number[1]
    assert first["value"] == {"value": 7.31, "minus": 0.03, "plus": 0.03}
    assert (first["system"], first["kind"], first["unit"], first["band"]) == (
        "Lantern 3",
        "photometry",
        "mag",
        "K",
    )
    assert first["as_typed"] == {"text": "2021-04-07T03:12:10Z", "scale": "utc", "place": "observatory"}
    # Barycentric within the light time of an astronomical unit (499 s), and a minute of rounding.
    assert abs(first["bmjd_tdb"] - 59311.13345) < 0.0066
    assert (first["site"], first["source"], first["entered_by"]) == ("Cold Mesa", "Night book 3", "Ida Vik")
    assert (first["in_use"], first["operation"], first["superseded_by"]) == (True, 5, None)
    assert first["entered_at"].endswith("Z")
    assert by_number[4]["limit_side"] == "above"
    assert by_number[4]["limit_sigma"] == 3.0
    assert by_number[5]["value"]["value"] == pytest.approx(2.3e-3, rel=1e-12)
    assert by_number[5]["unit"] == "jy"
    assert by_number[6]["star"] == "A"
    assert by_number[8]["position_angle_deg"]["value"] == 143.0
    assert by_number[10]["value"] is None


def test_in_a_pipe_an_observation_is_one_line_with_everything(watched):
    lines = watched("observations").out.splitlines()
    assert len(lines) == 1 + 12
    assert lines[0].split()[0] == "N"
    shown = {int(line.split()[0]): line for line in lines[1:]}
    assert "7.310 ± 0.030 mag" in shown[1] and "Night book 3" in shown[1] and "Cold Mesa" in shown[1]
    assert "doubtful" in shown[2] and "thin cirrus" in shown[2]
    assert "> 12.1 mag" in shown[4]
    assert "8.4 GHz" in shown[5]
    assert "star A He II 4686" in shown[6] and "km/s" in shown[6]
    assert "at 143.0 ± 2.0 deg" in shown[8]
    assert "shell 1" in shown[9]
    assert "cloud" in shown[10]
    assert "the finder shows a companion" in shown[11]
    assert "bad" in shown[12]


def test_what_is_the_same_of_all_is_said_once(watched):
    lines = watched("observations", "LN3", "--kind", "photometry").out.splitlines()
    assert lines[0] == "Lantern 3, photometry"
    assert "Lantern" not in "".join(lines[1:])
    assert "photometry" not in "".join(lines[1:])


def test_fewer_than_there_are_is_said(watched):
    ran = watched("observations", "--limit", "5")
    assert ran.out.splitlines()[0] == "Lantern 3"
    assert [int(line.split()[0]) for line in ran.out.splitlines()[2:]] == [7, 8, 9, 11, 4]
    assert "the latest 5 of 12" in ran.err
    assert watched("observations").err == ""


def test_what_is_out_of_use_is_shown_on_request_with_its_fate(watched):
    watched("amend", "1", "--mag", "7.35±0.03")
    watched("withdraw", "12", "--why", "wrong star in the aperture")
    watched("undo", "9", "--yes")
    assert set(numbers(watched("observations", "--json"))) == {13, *range(2, 12)} - {5}
    lines = watched("observations", "--withdrawn").out.splitlines()
    shown = {int(line.split()[0]): line for line in lines[1:]}
    assert shown.keys() == set(range(1, 14))
    assert shown[1].endswith("replaced by 13")
    assert shown[12].endswith("wrong star in the aperture")
    assert shown[5].endswith("taken back by an undo")
    by_number = {
        each["id"]: each
        for each in watched("observations", "--withdrawn", "--json").document["data"]["observations"]
    }
    assert by_number[1]["superseded_by"] == 13
    assert by_number[12]["withdrawn_why"] == "wrong star in the aperture"
    assert not by_number[5]["in_use"]
    assert by_number[13]["in_use"]


@pytest.mark.parametrize(
    ("words", "status", "code", "said"),
    [
        (("Lantern 4",), 4, "system-not-found", "Lantern 3"),
        (("--site", "Cold Mess"), 4, "site-not-found", "Cold Mesa"),
        (("--kind", "spectrum"), 3, "choice-refused", "photometry, flux, velocity"),
        (("--quality", "so-so"), 3, "choice-refused", "good, doubtful, bad"),
        (("--limit", "many"), 3, "number-refused", "--limit 50"),
        (("--limit", "-1"), 3, "number-refused", "--limit 50"),
        (("--limit", "1.5"), 3, "number-refused", "--limit 50"),
        (("--from", "2021-13"), 3, None, "month 13"),
        (("--until", "yesterday"), 3, None, "--until"),
        (("--from", "2022", "--until", "2021"), 3, "span-refused", "--from 2030 --until 2031-06"),
        (("--from", "2022", "--until", "2021", "--draw"), 3, "span-refused", "--until"),
        (("--source", "a\x1b[31mb"), 3, None, "--source"),
        (("--band", "K\n"), 3, None, "--band"),
        (("--nonsense",), 2, None, "--nonsense"),
        (("Lantern 3", "Quarry"), 2, None, "Quarry"),
    ],
)
def test_what_cannot_be_asked_is_refused_in_three_lines(watched, words, status, code, said):
    ran = watched("observations", *words)
    assert (ran.status, ran.out) == (status, "")
    assert len(ran.err.splitlines()) == 3
    assert said in ran.err
    assert "\x1b" not in ran.err
    error = watched("observations", *words, "--json").error
    assert {"code", "message", "hint", "details"} <= error.keys()
    assert code in (None, error["code"])


def test_nothing_found_says_why_where_it_is_known(watched):
    ran = watched("observations", "Lantern 3", "--band", "L")
    assert (ran.status, ran.out) == (0, "No observation passes the filters.\n")
    assert ran.err == "Warning: none in band L; there are: J, K\n"
    document = watched("observations", "Lantern 3", "--band", "L", "--json").document
    assert document["data"] == {"found": 0, "observations": []}
    assert document["warnings"] == ["none in band L; there are: J, K"]


def test_an_empty_catalogue_says_how_to_begin(run_campaign):
    run_campaign("begin")
    ran = run_campaign("observations")
    assert ran.out == "No observation passes the filters.\n"
    assert "campaign log" in ran.err and "campaign load" in ran.err
    assert run_campaign("observations", "--draw").out == "No observation with a value passes the filters.\n"


def test_without_a_database_it_says_how_to_begin(run_campaign):
    ran = run_campaign("observations")
    assert (ran.status, ran.out) == (7, "")
    assert "campaign begin" in ran.err


# ------------------------------------------------------------------ the light curve


def test_a_light_curve_is_drawn_with_a_strip_for_each_band(watched):
    ran = watched("observations", "Lantern 3", "--kind", "photometry", "--draw")
    assert (ran.status, ran.err) == (0, "")
    lines = ran.out.splitlines()
    assert lines[0] == "Lantern 3"
    strips = [line for line in lines if line.startswith("photometry")]
    assert [strip.partition(",")[0] for strip in strips] == ["photometry J", "photometry K"]
    assert strips[1].startswith("photometry K, mag, 3 points")
    assert "▽" in ran.out and "?" in ran.out
    assert "too faint to see" in lines[-1] and "doubtful" in lines[-1]
    assert "magnitudes grow downward" in lines[-1]


def test_a_drawing_takes_the_same_filters_as_the_list(watched):
    ran = watched("observations", "--draw", "--band", "K", "--until", "2021-04")
    assert "Lantern 3" in ran.out and "Quarry" in ran.out
    assert ran.out.count("photometry K, mag, 1 point") == 2
    assert "photometry J" not in ran.out
    nothing = watched("observations", "--draw", "--kind", "remark")
    assert (nothing.status, nothing.out) == (0, "No observation with a value passes the filters.\n")


def test_every_kind_with_a_value_can_be_drawn(watched):
    out = watched("observations", "Lantern 3", "--draw").out
    kinds = [line.split()[0].strip(",") for line in out.splitlines() if " point" in line]
    assert kinds == ["photometry", "photometry", "flux", "velocity", "line", "position", "shell"]
    assert "velocity star A He II 4686, km/s, 1 point" in out


def test_a_program_is_given_the_list_and_no_drawing(watched):
    assert numbers(watched("observations", "--draw", "--band", "J", "--json")) == [3]


@pytest.mark.parametrize(
    "words",
    [
        ("--from", "2021-04", "--until", "2021"),
        ("--from", "2021", "--until", "2021"),
        ("--from", "2021-04-07T03:12:10Z", "--until", "2021-04-07T03:12:10Z"),
        ("--from", "2021-12-31", "--until", "2022"),
    ],
)
def test_dates_that_touch_or_hold_each_other_may_be_asked(watched, words):
    assert watched("observations", *words).status == 0


@pytest.mark.parametrize(
    "words",
    [
        ("--from", "2022", "--until", "2021"),
        ("--from", "2021-05-02", "--until", "2021-05-01"),
        ("--from", "2022-01-01T00:00:01Z", "--until", "2021"),
        ("--from", "2021-04-07T03:12:10Z", "--until", "2021-04-07T03:12:09Z"),
    ],
)
def test_dates_with_nothing_between_are_refused(watched, words):
    assert watched("observations", *words, "--json").error["code"] == "span-refused"
    assert watched("history", *words, "--json").error["code"] == "span-refused"
