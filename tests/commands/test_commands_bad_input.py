"""Bad input from outside: its exit status, three lines that help, and a database that it has not touched."""

from __future__ import annotations

import json
import multiprocessing
import os
import shutil
import sqlite3
import sys
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

RunCampaign = Callable[..., Any]
Fingerprint = Callable[[], str]
NOBODY = 65534

ADD_SYSTEM = ("system", "add", "New 1", "--ra", "18:02:31.5", "--dec")
ADD_SOLUTION = ("solution", "add", "LN3", "--label", "new")
LOG = ("log", "photometry", "LN3")
AT = ("--at", "2025-04-07T03:12:10Z")


def refused(ran: Any, status: int) -> list[str]:
    """The three lines of an error that stopped the command before it said anything else."""
    lines: list[str] = ran.err.splitlines()
    assert (ran.status, ran.out) == (status, ""), ran.err
    assert len(lines) == 3, ran.err
    assert lines[0].startswith("campaign: ")
    assert lines[1].startswith("  why:  ")
    assert lines[2].startswith("  next: ")
    assert "Traceback" not in ran.err
    return lines


def refused_as_json(ran: Any, status: int) -> dict[str, Any]:
    """The error object of the same refusal."""
    assert (ran.status, ran.out) == (status, "")
    error: dict[str, Any] = ran.error
    assert set(error) == {"code", "message", "hint", "details"}
    assert all(error[key] for key in ("code", "message", "hint"))
    assert error["details"]["why"]
    return error


# Words of the command, exit status, and what the three lines must hold.
REFUSALS = [
    # An unknown system, with the nearest names.
    (("system", "show", "Lantren 3"), 4, "Lantern 3"),
    (("upcoming", "--system", "Lantren 3"), 4, "Lantern 3"),
    (("log", "remark", "Lantren 3", "bright"), 4, "Lantern 3"),
    (("ephemeris", "Lantren 3"), 4, "Lantern 3"),
    (("rule", "show", "Lantren 3"), 4, "Lantern 3"),
    (("episodes", "add", "Lantren 3", "--onset", "2019-03-14"), 4, "Lantern 3"),
    # Elements that no orbit has.
    ((*ADD_SOLUTION, "--eccentricity", "1"), 3, "below 1"),
    ((*ADD_SOLUTION, "--eccentricity", "1.2±0.1"), 3, "below 1"),
    ((*ADD_SOLUTION, "--eccentricity", "-0.1"), 3, "at least 0"),
    ((*ADD_SOLUTION, "--eccentricity", "nan"), 3, "finite"),
    ((*ADD_SOLUTION, "--period", "0 d"), 3, "--period must be at least"),
    ((*ADD_SOLUTION, "--period", "-3127.5"), 3, "--period must be at least"),
    ((*ADD_SOLUTION, "--period", "\u22123127.5"), 3, "--period must be at least"),
    ((*ADD_SOLUTION, "--period", "1e400 d"), 3, "finite"),
    ((*ADD_SOLUTION, "--period", "1e300 d"), 3, "--period must be at least"),
    ((*ADD_SOLUTION, "--period", "1e-300 d"), 3, "--period must be at least"),
    ((*ADD_SOLUTION, "--period", "32..28 yr"), 3, "smaller to the larger"),
    ((*ADD_SOLUTION, "--period", "3000±-2 d"), 3, "error"),
    ((*ADD_SOLUTION, "--omega", "143"), 2, "--omega-of"),
    ((*ADD_SOLUTION, "--k-a", "0"), 3, "above 0"),
    (ADD_SOLUTION, 3, "--period"),
    ((*ADD_SOLUTION, "--period", "3000 d", "--published-cycle", "1e30"), 3, "--published-cycle"),
    # Instants that never were.
    ((*LOG, "K=7.3", "--at", "2025-02-30"), 3, "2025-02-28"),
    ((*LOG, "K=7.3", "--at", "2025-13-01"), 3, "month"),
    ((*LOG, "K=7.3", "--at", "2025-04-07/09"), 3, "2025-04-07/08"),
    ((*LOG, "K=7.3", "--at", "2025-04-07T25:00"), 3, "2025-04-07"),
    ((*LOG, "K=7.3", "--at", "yesterday"), 3, "2031-04-07"),
    ((*ADD_SOLUTION, "--epoch", "BJD nan"), 3, "BJD"),
    # Positions that are not in the sky or on the Earth.
    ((*ADD_SYSTEM, "95"), 3, "-90 to +90"),
    ((*ADD_SYSTEM, "-90:00:01"), 3, "-90 to +90"),
    ((*ADD_SYSTEM, "-00 60 10"), 3, "below 60"),
    (("system", "add", "New 1", "--ra", "24:00:00", "--dec", "0"), 3, "24 hours"),
    (("site", "add", "Top", "--latitude", "91", "--longitude", "0"), 3, "-90 to +90"),
    # Two solutions without weights, and one more beside the adopted one.
    (("solution", "adopt", "LN3", "orbit", "other"), 3, "weight"),
    (("solution", "adopt", "LN3", "other"), 5, "--instead"),
    (("solution", "adopt", "LN3", "orbit=0", "other=1"), 3, "positive"),
    (("solution", "adopt", "LN3", "orbit=-1", "other=2"), 3, "positive"),
    (("solution", "adopt", "LN3", "orbit=nan", "other=1"), 3, "finite"),
    (("solution", "adopt", "LN3", "nothing"), 4, "'orbit', 'other'"),
    (("solution", "show", "LN3", "nothing"), 4, "'orbit', 'other'"),
    (("ephemeris", "LN3", "--solution", "nothing"), 4, "'orbit', 'other'"),
    # Names that would forge what a terminal shows, or nothing at all.
    (("system", "add", "Red\x1b[31m", "--ra", "1", "--dec", "2"), 3, "U+001B"),
    (("system", "add", "Two\nlines", "--ra", "1", "--dec", "2"), 3, "U+000A"),
    (("system", "add", "Left\u202eright", "--ra", "1", "--dec", "2"), 3, "U+202E"),
    (("system", "add", "Zero\u200bwidth", "--ra", "1", "--dec", "2"), 3, "U+200B"),
    (("system", "add", "   ", "--ra", "1", "--dec", "2"), 3, "SYSTEM"),
    (("system", "add", "x" * 5000, "--ra", "1", "--dec", "2"), 3, "120 characters"),
    (("system", "change", "LN3", "--note", "bell\x07"), 3, "U+0007"),
    (("log", "remark", "LN3", "bell\x07"), 3, "U+0007"),
    (("system", "add", "--x", "--ra", "1", "--dec", "2"), 2, "--x"),
    (("system", "add", "lantern  3", "--ra", "1", "--dec", "2"), 5, "Lantern 3"),
    # Numbers out of all proportion.
    ((*LOG, "K=1e5", *AT), 3, "40 mag"),
    ((*LOG, "K=nan", *AT), 3, "finite"),
    ((*LOG, "K=7±-0.1", *AT), 3, "error"),
    (("log", "velocity", "LN3", "--star", "A", "--velocity", "1e9", *AT), 3, "km/s"),
    (("log", "shell", "LN3", "--radius", "0", *AT), 3, "above 0"),
    (("rule", "set", "LN3", "--lag-onset", "40", "--lag-end", "30"), 3, "before the onset"),
    (("rule", "set", "LN3", "--lag-onset", "1e9"), 3, "--lag-onset"),
    (("rule", "set", "LN3", "--phase-onset", "0", "--scatter", "-5"), 3, "--scatter"),
    (("rule", "set", "LN3", "--phase-onset", "0", "--scatter", "5±1"), 3, "--scatter"),
    (("upcoming", "--draws", "1"), 3, "100 to 1000000"),
    (("upcoming", "--seed", "-1"), 3, "--seed"),
    (("upcoming", "--within", "0d"), 3, "above 0"),
    (("upcoming", "--within", "-5yr"), 3, "above 0"),
    (("upcoming", "--from", "2035", "--until", "2030"), 3, "before it begins"),
    (("upcoming", "--min-probability", "1.5"), 3, "at most 1"),
    (("upcoming", "--event", "shells"), 3, "periastron"),
    (("upcoming", "--sample", "--known-at", "2020-01-01"), 2, "--known-at"),
    (("upcoming", "--sample", "--db", "some.db"), 2, "--db"),
    (("ephemeris", "LN3", "--sample", "--db", "some.db"), 2, "--db"),
    # Sites that are two things at once, or nowhere.
    (("site", "add", "Both", "--latitude", "5", "--longitude", "4", "--elongation", "85..135"), 3, "either"),
    (("site", "add", "Moon", "--latitude", "5", "--longitude", "4", "--time-zone", "Luna/A"), 3, "Etc/GMT"),
    (("site", "add", "Half", "--latitude", "5"), 3, "longitude"),
    (("site", "add", "Back", "--elongation", "135..85"), 3, "smaller to the larger"),
    # Lines that are no command.
    (("frob",), 2, "upcoming"),
    (("system", "shew", "LN3"), 2, "campaign system show"),
    (("upcoming", "--wihtin", "5yr"), 2, "--within"),
    (("system", "list", "--db", ""), 2, "--db"),
]  # fmt: skip


@pytest.fixture
def two_solutions(kept: RunCampaign) -> RunCampaign:
    """Lantern 3 with its adopted orbit and a second solution that is not."""
    added = kept(
        "solution", "add", "LN3", "--label", "other", "--period", "3140±4 d", "--epoch", "2026-09-16"
    )
    assert added.status == 0, added.err
    return kept


@pytest.mark.parametrize(
    ("words", "status", "says"), REFUSALS, ids=[ascii(" ".join(words))[1:60] for words, _, _ in REFUSALS]
)
def test_bad_input_is_refused_in_three_lines_and_changes_nothing(
    two_solutions: RunCampaign, fingerprint: Fingerprint, words: tuple[str, ...], status: int, says: str
) -> None:
    before = fingerprint()
    assert says in " ".join(refused(two_solutions(*words), status))
    refused_as_json(two_solutions(*words, "--json"), status)
    assert fingerprint() == before


def test_the_nearest_names_are_offered_to_programs_too(kept: RunCampaign) -> None:
    error = refused_as_json(kept("system", "show", "lantren3", "--json"), 4)
    assert error["code"] == "system-not-found"
    assert error["details"]["nearest"] == ["Lantern 3"]


# ------------------------------------------------------------------------------------- names of any kind


@pytest.mark.parametrize(
    "name",
    [
        "[red]Rot[/red]",
        "[/b] :warning: <b>",
        "Robert'); DROP TABLE systems;--",
        "100 %s {x} %(y)s",
        "Ñandú ★ 7",
        "星 3",
        "--x",
        "\u2212 4",
    ],
)
def test_a_name_of_visible_characters_is_kept_and_shown_as_it_is(
    run_campaign: RunCampaign, name: str
) -> None:
    run_campaign("begin")
    added = run_campaign("system", "add", "--ra", "18:02:31.5", "--dec", "-45:12:30", "--", name)
    assert added.status == 0, added.err
    shown = run_campaign("system", "show", "--", name)
    assert shown.out.splitlines()[0] == name
    document = run_campaign("system", "show", "--json", "--", name).document
    assert document["data"]["system"]["name"] == name


# ------------------------------------------------------------------------------- databases that are none


def test_a_missing_database_says_how_to_begin(run_campaign: RunCampaign, own_database: Path) -> None:
    assert "campaign begin" in refused(run_campaign("upcoming"), 7)[2]
    assert "campaign begin" in refused(run_campaign("log", "remark", "X", "bright"), 7)[2]
    refused_as_json(run_campaign("upcoming", "--json"), 7)
    assert not own_database.exists()


def test_a_text_file_is_no_database_and_stays_as_it_is(run_campaign: RunCampaign, own_database: Path) -> None:
    own_database.write_text("my notes on dust\n")
    for words in (("upcoming",), ("begin",), ("log", "remark", "X", "bright")):
        refused(run_campaign(*words), 7)
        refused_as_json(run_campaign(*words, "--json"), 7)
    assert own_database.read_text() == "my notes on dust\n"


def test_a_folder_is_no_database(run_campaign: RunCampaign, own_database: Path) -> None:
    own_database.mkdir()
    refused(run_campaign("upcoming"), 7)
    refused(run_campaign("begin"), 7)
    assert list(own_database.iterdir()) == []


def test_a_database_in_a_folder_that_is_not_there_is_not_begun(
    run_campaign: RunCampaign, tmp_path: Path
) -> None:
    refused(run_campaign("begin", "--db", str(tmp_path / "no" / "such" / "campaign.db")), 7)
    assert not (tmp_path / "no").exists()


def test_a_truncated_database_is_told_damaged_and_not_touched(
    kept: RunCampaign, own_database: Path, fingerprint: Fingerprint
) -> None:
    os.truncate(own_database, 20_000)
    before = fingerprint()
    refused(kept("system", "list"), 7)
    refused(kept("log", "remark", "LN3", "bright"), 7)
    assert fingerprint() == before


def test_a_database_of_a_newer_program_is_left_alone(
    kept: RunCampaign, own_database: Path, fingerprint: Fingerprint
) -> None:
    with sqlite3.connect(own_database) as connection:
        connection.execute("update alembic_version set version_num = '9999'")
    connection.close()
    before = fingerprint()
    assert "newer" in refused(kept("system", "list"), 7)[0]
    refused(kept("log", "remark", "LN3", "bright"), 7)
    assert fingerprint() == before


@pytest.mark.slow
def test_a_database_that_somebody_else_is_changing_is_busy(kept: RunCampaign, own_database: Path) -> None:
    other = sqlite3.connect(own_database, isolation_level=None)
    other.execute("BEGIN EXCLUSIVE")
    try:
        refused(kept("log", "remark", "LN3", "bright"), 6)
    finally:
        other.execute("ROLLBACK")
        other.close()
    assert kept("log", "remark", "LN3", "bright").status == 0


@pytest.mark.parametrize("name", ["100%25 %s 50%.db", "a'b\"c;--.db", "blank space.db", "ünï.db", "#?&.db"])
def test_a_path_of_any_characters_is_a_path(run_campaign: RunCampaign, tmp_path: Path, name: str) -> None:
    path = str(tmp_path / name)
    assert run_campaign("begin", "--db", path).status == 0
    added = run_campaign("system", "add", "S", "--ra", "1", "--dec", "2", "--db", path)
    assert added.status == 0, added.err
    assert (tmp_path / name).is_file()


def test_a_path_in_no_known_encoding_can_be_written_to(run_campaign: RunCampaign, tmp_path: Path) -> None:
    path = os.fsdecode(os.fsencode(tmp_path) + b"/x\xffy.db")
    assert run_campaign("begin", "--db", path).status == 0
    added = run_campaign("system", "add", "S", "--ra", "1", "--dec", "2", "--db", path)
    assert added.status == 0, added.err


# --------------------------------------------------------------------- a user who may only read the folder


@pytest.fixture
def read_only(kept: RunCampaign, own_database: Path) -> Iterator[Path]:
    """The database in a folder that everybody may enter and read, and nobody may write."""
    folder = Path(tempfile.mkdtemp())
    path = folder / "campaign.db"
    shutil.copy(own_database, path)
    path.chmod(0o444)
    folder.chmod(0o555)
    yield path
    folder.chmod(0o777)
    shutil.rmtree(folder)


def _as_nobody(words: tuple[str, ...], out: Path, err: Path, answers: Any) -> None:
    from campaign.__main__ import run

    with out.open("w") as sys.stdout, err.open("w") as sys.stderr:
        if os.getuid() == 0:
            os.setresuid(NOBODY, NOBODY, NOBODY)
        answers.put(run(words))


def without_rights(tmp_path: Path, *words: str) -> Any:
    """Run a line in a child that has given up the rights of root, if it had them."""
    context = multiprocessing.get_context("fork")
    answers = context.Queue()
    out, err = tmp_path / "out.txt", tmp_path / "err.txt"
    child = context.Process(target=_as_nobody, args=(words, out, err, answers))
    child.start()
    status = answers.get(timeout=60)
    child.join()
    return _Said(status, out.read_text(), err.read_text())


class _Said:
    def __init__(self, status: int, out: str, err: str) -> None:
        self.status, self.out, self.err = status, out, err

    @property
    def error(self) -> Any:
        return json.loads(self.err)["error"]


def test_a_read_only_folder_can_be_read_and_not_written(
    kept: RunCampaign, read_only: Path, tmp_path: Path
) -> None:
    before = read_only.read_bytes()
    # In this process once, so that everything is imported before the rights are gone.
    for words in (("upcoming",), ("log", "remark", "LN3", "bright"), ("begin",)):
        assert kept(*words).status == 0
    there = ("--db", str(read_only))
    assert without_rights(tmp_path, "upcoming", *there).status == 0
    assert "cannot be" in refused(without_rights(tmp_path, "log", "remark", "LN3", "bright", *there), 7)[0]
    refused_as_json(without_rights(tmp_path, "log", "remark", "LN3", "bright", *there, "--json"), 7)
    new = read_only.with_name("new.db")
    refused(without_rights(tmp_path, "begin", "--db", str(new)), 7)
    assert read_only.read_bytes() == before
    assert [path.name for path in read_only.parent.iterdir()] == ["campaign.db"]
