"""``campaign history`` and ``campaign undo``: who did what and when, in words, and the way back."""

from __future__ import annotations

import os
import signal

import pytest


def operations(ran):
    assert ran.status == 0, ran.err
    return {each["operation"]: each for each in ran.document["data"]["operations"]}


def listed(campaign):
    """Numbers of the observations in use."""
    found = campaign("observations", "--json", "--limit", "0").document["data"]["observations"]
    return {each["id"] for each in found}


@pytest.fixture
def loaded(watched, tmp_path):
    """Operation 17: a table of ten magnitudes of Quarry, observations 13 to 22."""
    rows = "".join(f"Quarry,{59000 + day},{7 + day / 100:.2f},0.02,K\n" for day in range(10))
    table = tmp_path / "table.csv"
    table.write_text("system,MJD,mag,e_mag,band\n" + rows)
    ran = watched("load", str(table), "--constant", "scale=utc", "--constant", "place=geocentre")
    assert ran.status == 0, ran.err
    return watched


# ------------------------------------------------------------------ history


def test_every_command_is_told_the_newest_first(watched):
    ran = watched("history", "--json", "--limit", "0")
    assert ran.document["schema"] == "campaign/history/1"
    found = operations(ran)
    assert list(found) == list(range(16, 0, -1))
    first = found[1]
    assert (first["who"], first["summary"]) == ("Ida Vik", "added system Lantern 3")
    assert first["command"].startswith("campaign system add 'Lantern 3' --ra 18:02:31.5")
    assert first["at"].endswith("Z")
    assert (first["undoes"], first["undone_by"], first["stands"]) == (None, None, True)
    assert [change["subject"] for change in first["changes"]] == ["system"]


def test_a_command_is_one_paragraph_in_words(watched):
    paragraphs = watched("history", "--limit", "0").out.split("\n")
    assert paragraphs[0].startswith("16  20") and "Ida Vik: " in paragraphs[0]
    text = "\n".join(paragraphs)
    assert "system Lantern 3: added: alias LN3, right ascension 18:02:31.50, declination -45:12:30.0" in text
    assert "site Cold Mesa: added: kind ground, latitude -31.2 deg, longitude east -70 deg" in text
    assert "observation 4 of Lantern 3: added: kind photometry" in text
    assert "value > 12.1 mag" in text


def test_what_a_correction_changed_is_told_before_and_after(watched):
    watched("amend", "1", "--mag", "7.35±0.02")
    watched("withdraw", "12", "--why", "wrong star")
    watched("system", "change", "Quarry", "--priority", "1", "--name", "Quarry 2")
    lines = watched("history", "--limit", "3").out.splitlines()
    assert "      value: 7.310 ± 0.030 mag → 7.350 ± 0.020 mag" in lines
    assert "    observation 1 of Lantern 3: replaced by 13" in lines
    assert "    observation 12 of Quarry 2: withdrawn (wrong star)" in lines
    assert "      priority: 3 → 1" in lines
    assert "      name: Quarry → Quarry 2" in lines
    assert lines[-1] == "There are older operations: see more with --limit N."


def test_a_system_has_its_own_history(watched):
    found = operations(watched("history", "Quarry", "--json"))
    assert list(found) == [16, 2]
    assert watched("history", "ln3", "--json").document["data"]["about"] == "Lantern 3"
    assert 16 not in operations(watched("history", "LN3", "--json"))


def test_an_observation_has_its_own_history_with_all_its_versions(watched):
    watched("amend", "1", "--mag", "7.35±0.02")
    watched("amend", "13", "--mag", "7.36±0.02")
    watched("withdraw", "14", "--why", "cloud")
    for number in ("1", "13", "14"):
        found = operations(watched("history", number, "--json"))
        assert list(found) == [19, 18, 17, 5]
        assert found[17]["changes"][0]["subject"] == "observation 1"
        assert found[17]["changes"][0]["action"] == "replaced by 13"
    out = watched("history", "13").out
    assert "7.310 ± 0.030 mag → 7.350 ± 0.020 mag" in out
    assert "observation 14 of Lantern 3: withdrawn (cloud)" in out


def test_of_a_load_an_observation_tells_its_own_row(loaded):
    found = operations(loaded("history", "15", "--json"))
    assert list(found) == [17]
    change = found[17]["changes"][0]
    assert (change["subject"], change["action"], change["system"]) == ("observation 15", "loaded", "Quarry")
    value = next(field for field in change["fields"] if field["name"] == "value")
    assert (value["after"]["value"], value["unit"]) == (7.02, "mag")
    assert operations(loaded("history", "Quarry", "--json"))[17]["changes"][0]["rows"] == 10
    assert 17 not in operations(loaded("history", "Lantern 3", "--json"))


def test_filters_by_person_time_and_number(watched):
    watched("amend", "1", "--mag", "7.35±0.02", "--observer", "Tor Asp")
    assert list(operations(watched("history", "--by", "tor asp", "--json"))) == [17]
    assert 17 not in operations(watched("history", "--by", "Ida Vik", "--json"))
    assert list(operations(watched("history", "--operation", "3", "--json"))) == [3]
    assert operations(watched("history", "Quarry", "--operation", "3", "--json")) == {}
    assert operations(watched("history", "--from", "2999", "--json")) == {}
    assert operations(watched("history", "--until", "2020", "--json")) == {}
    assert len(operations(watched("history", "--from", "2020", "--until", "2999", "--json"))) == 17
    limited = watched("history", "--limit", "2", "--json").document["data"]
    assert ([each["operation"] for each in limited["operations"]], limited["more"]) == ([17, 16], True)


def test_nothing_done_is_said(watched, run_campaign):
    ran = watched("history", "--by", "Nobody")
    assert (ran.status, ran.out, ran.err) == (0, "Nothing of this kind was done to the catalogue.\n", "")


@pytest.mark.parametrize(
    ("words", "status", "code", "said"),
    [
        (("Lantern 4",), 4, "system-not-found", "Lantern 3"),
        (("99",), 4, "observation-not-found", "campaign observations"),
        (("--operation", "99"), 4, "operation-not-found", "campaign history"),
        (("--operation", "first"), 3, "number-refused", "12"),
        (("--limit", "x"), 3, "number-refused", "--limit 50"),
        (("--from", "2022", "--until", "2021"), 3, "span-refused", "--until"),
        (("--from", "soon"), 3, None, "--from"),
        (("--by", "a\x1b[2J"), 3, None, "--by"),
    ],
)
def test_a_history_that_cannot_be_told_is_refused(watched, words, status, code, said):
    ran = watched("history", *words)
    assert (ran.status, ran.out) == (status, ""), ran.err
    assert len(ran.err.splitlines()) == 3
    assert said in ran.err and "\x1b" not in ran.err
    assert code in (None, watched("history", *words, "--json").error["code"])


# ------------------------------------------------------------------ undo


def test_the_last_command_is_taken_back_and_put_back(watched):
    ran = watched("undo", "--yes")
    assert (ran.status, ran.err) == (0, "")
    lines = ran.out.splitlines()
    assert lines[0].startswith("undone: operation 16, ")
    assert lines[1] == "    observation 12 of Quarry: withdrawn"
    assert lines[2] == "this is operation 17; put it back with: campaign undo 17"
    assert listed(watched) == set(range(1, 12))
    again = watched("undo", "17", "--yes").out.splitlines()
    assert again[0].startswith("put back: operation 16, ")
    assert again[1] == "    observation 12 of Quarry: put back"
    assert again[2] == "this is operation 18; undo it again with: campaign undo 18"
    assert listed(watched) == set(range(1, 13))


def test_the_history_shows_what_was_taken_back(watched):
    watched("undo", "--yes")
    watched("undo", "17", "--yes")
    watched("undo", "15", "--yes")
    out = watched("history", "--limit", "5").out
    marks = [line.rpartition("[")[2].rstrip("]") for line in out.splitlines() if line[0].isdigit()]
    assert marks[:2] == ["undo of 15", "undo of 17"]
    assert marks[2] == "undo of 16, taken back by 18"
    assert marks[3] == "taken back by 17, and put back"
    assert marks[4] == "taken back by 19"
    found = operations(watched("history", "--json"))
    assert [found[n]["stands"] for n in (19, 18, 17, 16, 15)] == [True, True, False, True, False]


def test_a_whole_load_is_taken_back_as_one(loaded):
    assert listed(loaded) == set(range(1, 23))
    ran = loaded("undo", "--yes")
    assert "    10 observations: withdrawn (10 of Quarry)" in ran.out.splitlines()
    assert listed(loaded) == set(range(1, 13))
    document = loaded("undo", "18", "--yes", "--json").document
    assert document["schema"] == "campaign/undo/1"
    data = document["data"]
    assert (data["operation"], data["by"], data["first"], data["puts_back"]) == (18, 19, 17, True)
    assert data["changes"][0]["rows"] == 10
    assert listed(loaded) == set(range(1, 23))


def test_a_preview_says_the_same_and_changes_nothing(watched, fingerprint):
    before = fingerprint()
    ran = watched("undo", "--dry-run")
    assert (ran.status, ran.err) == (0, "")
    assert ran.out.splitlines()[0].startswith("would undo: operation 16, ")
    assert ran.out.splitlines()[1] == "    observation 12 of Quarry: withdrawn"
    data = watched("undo", "16", "--dry-run", "--json").document["data"]
    assert (data["operation"], data["by"]) == (16, None)
    assert fingerprint() == before


def test_nobody_there_to_ask_shows_the_preview_and_does_nothing(watched, fingerprint):
    before = fingerprint()
    ran = watched("undo")
    assert (ran.status, ran.out) == (9, "")
    assert "would undo: operation 16" in ran.err
    assert ran.err.splitlines()[-1] == "  next: Add --yes to agree beforehand."
    assert fingerprint() == before


@pytest.mark.parametrize(("answer", "status", "expected"), [("y", 0, 17), ("n", 9, 16), ("", 9, 16)])
def test_the_question_is_asked_and_the_answer_counts(watched, monkeypatch, answer, status, expected):
    from campaign.commands import common

    monkeypatch.setattr(common, "asks_questions", lambda: True)
    monkeypatch.setattr(common, "ask", lambda question: answer)
    ran = watched("undo")
    assert ran.status == status
    assert "would undo: operation 16" in ran.err
    assert max(operations(watched("history", "--json"))) == expected


def test_what_depends_on_it_is_named_with_the_next_command_to_type(loaded, fingerprint):
    loaded("amend", "15", "--mag", "7.5±0.1")
    loaded("withdraw", "16", "--why", "cloud")
    before = fingerprint()
    ran = loaded("undo", "17", "--yes")
    assert (ran.status, ran.out) == (5, "")
    what, why, hint = ran.err.splitlines()
    assert what.startswith("campaign: Operation 17 (loaded 10 photometry rows of 1 system")
    assert "cannot be undone: what came later depends on it" in what
    assert "Operation 19 (withdrew observation 16 of Quarry: cloud" in why
    assert "changed observation 15, which this load brought" in why
    assert hint == "  next: Undo the later one first: campaign undo 19."
    error = loaded("undo", "17", "--yes", "--json").error
    assert error["code"] == "depended-on"
    assert [each["operation"] for each in error["details"]["dependants"]] == [19, 18]
    assert fingerprint() == before
    for number in ("19", "18", "17"):
        assert loaded("undo", number, "--yes").status == 0
    assert listed(loaded) == set(range(1, 13))


def test_many_dependants_are_counted(watched):
    what, why, _ = watched("undo", "1", "--yes").err.splitlines()
    assert "Operation 1 (added system Lantern 3)" in what
    assert why.endswith("; and 8 more.")
    assert why.count("uses the system that this operation entered") == 3
    dependants = watched("undo", "1", "--yes", "--json").error["details"]["dependants"]
    assert [each["operation"] for each in dependants] == list(range(15, 4, -1))


def test_only_ones_own_last_command_is_meant_without_a_number(watched):
    watched("amend", "1", "--mag", "7.35±0.02", "--observer", "Tor Asp")
    assert watched("undo", "--dry-run").out.startswith("would undo: operation 16,")
    assert watched("undo", "--dry-run", "--observer", "Tor Asp").out.startswith("would undo: operation 17,")
    ran = watched("undo", "--observer", "Nobody", "--yes")
    assert ran.status == 4
    assert "There is nothing of Nobody to undo." in ran.err


def test_an_adoption_is_taken_back_with_what_it_brought(watched):
    watched("solution", "add", "Quarry", "--label", "first", "--period", "3000±1 d", "--epoch",
            "BJD 2455000±1")  # fmt: skip
    watched("solution", "adopt", "Quarry", "first")
    ran = watched("undo", "--yes")
    lines = ran.out.splitlines()
    assert "    solution 'first' of Quarry: no longer adopted" in lines
    shown = watched("solution", "list", "Quarry", "--json").document["data"]
    assert not any(each["adopted"] for each in shown["solutions"])
    assert "    solution 'first' of Quarry: adopted" in watched("undo", "19", "--yes").out.splitlines()


@pytest.mark.parametrize(
    ("words", "status", "code", "said"),
    [
        (("99",), 4, "operation-not-found", "campaign history"),
        (("0",), 3, "number-refused", "12"),
        (("last",), 3, "number-refused", "12"),
        (("1.0",), 3, "number-refused", "12"),
        (("9" * 30,), 3, "number-refused", "12"),
        (("16", "15"), 2, None, "15"),
    ],
)
def test_an_operation_that_is_not_there_is_refused(watched, fingerprint, words, status, code, said):
    before = fingerprint()
    ran = watched("undo", *words, "--yes")
    assert (ran.status, ran.out) == (status, ""), ran.err
    assert len(ran.err.splitlines()) == 3
    assert said in ran.err
    assert code in (None, watched("undo", *words, "--yes", "--json").error["code"])
    assert fingerprint() == before


def test_what_was_taken_back_already_is_put_back_by_number(watched):
    watched("undo", "16", "--yes")
    ran = watched("undo", "16", "--yes")
    assert ran.status == 5
    assert "Operation 17 took it back" in ran.err
    assert ran.err.splitlines()[2] == "  next: To put it back: campaign undo 17."


def test_quiet_says_nothing_and_does_it(watched):
    ran = watched("undo", "--yes", "--quiet")
    assert (ran.status, ran.out, ran.err) == (0, "", "")
    assert listed(watched) == set(range(1, 12))


def test_an_interrupt_leaves_nothing_behind_and_says_so(loaded, fingerprint, monkeypatch):
    from campaign.output.progress import Progress

    def interrupted(progress, stage, done, total):
        raise KeyboardInterrupt

    before = fingerprint()
    monkeypatch.setattr(Progress, "told", interrupted)
    ran = loaded("undo", "--yes")
    assert (ran.status, ran.out, ran.err) == (130, "", "Interrupted: nothing was undone.\n")
    assert fingerprint() == before
    assert loaded("undo", "--yes", "--quiet").err == ""


def test_an_interrupt_that_comes_too_late_is_said_and_the_undo_is_done(loaded, monkeypatch):
    from campaign.catalogue.store import Writing

    finish = Writing.finish

    def interrupted(writing):
        os.kill(os.getpid(), signal.SIGINT)
        finish(writing)

    monkeypatch.setattr(Writing, "finish", interrupted)
    ran = loaded("undo", "--yes")
    assert (ran.status, ran.err) == (0, "The interrupt came too late to keep the undo from being done.\n")
    assert ran.out.startswith("undone: operation 17")
    assert listed(loaded) == set(range(1, 13))


def test_an_empty_catalogue_has_nothing_to_undo_and_no_history(run_campaign):
    run_campaign("begin")
    assert run_campaign("history").out == "Nothing of this kind was done to the catalogue.\n"
    ran = run_campaign("undo", "--yes")
    assert (ran.status, ran.out) == (4, "")
    assert "There is nothing of Ida Vik to undo." in ran.err


def test_names_and_remarks_cannot_steer_the_terminal(watched):
    """Loaded text is data: what looks like markup stays as typed, and no control character gets in."""
    hostile = "[red]x[/red] :bomb: \u202e {0} %s"
    assert watched("log", "remark", "Quarry", hostile, "--at", "2021-06-07").status in (0, 3)
    plain = "[red]x[/red] :bomb: {0} %s"
    assert watched("log", "remark", "Quarry", plain, "--at", "2021-06-07").status == 0
    for words in (("history",), ("observations",), ("undo", "--dry-run")):
        out = watched(*words).out
        assert "\u202e" not in out and "\x1b" not in out
    assert plain in watched("history").out
    assert plain in watched("observations").out
