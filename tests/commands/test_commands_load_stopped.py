"""Loads that are stopped, by Ctrl-C or the machine, in every phase: nothing is left behind, and it says so.

Expectations: the words of the issue (Ctrl-C leaves nothing behind and says so) and the exit status of an
interrupt, 130 (common practice: 128 and the number of SIGINT).
"""

from __future__ import annotations

import contextlib
import os
import pty
import re
import signal
import sqlite3
import subprocess
import sys
import time

import pytest

HEAD = "system,HJD_UTC,band,mag,e_mag\n"
COMMAND = [sys.executable, "-m", "campaign", "load"]


def lines(rows):
    return "".join(
        f"Lantern 3,{2450000 + number * 0.01:.4f},K,{7.3 + number % 10 * 0.01:.2f},0.03\n"
        for number in range(rows)
    )


@pytest.fixture
def unchanged(kept, own_database):
    """Checks that the database is whole, and as it was when the test began."""
    before = own_database.read_bytes()
    names = {path.name for path in own_database.parent.iterdir()}

    def check(*others):
        assert kept("observations").status == 0
        with contextlib.closing(sqlite3.connect(own_database)) as connection:
            assert connection.execute("PRAGMA integrity_check").fetchone()[0] == "ok"
            assert connection.execute("SELECT count(*) FROM observations").fetchone()[0] == 0
        assert own_database.read_bytes() == before
        # After a kill the journal may lie there until somebody writes; what it holds was taken back above.
        found = {path.name for path in own_database.parent.iterdir()} - {f"{own_database.name}-journal"}
        assert found == names | set(others)

    return check


@pytest.mark.parametrize("sign", [signal.SIGINT, signal.SIGKILL], ids=["ctrl-c", "kill -9"])
def test_stopped_while_rows_are_written(unchanged, own_database, tmp_path, sign):
    (tmp_path / "large.csv").write_text(HEAD + lines(60_000))
    journal = f"{own_database}-journal"
    with subprocess.Popen(
        [*COMMAND, str(tmp_path / "large.csv"), "--rejects", str(tmp_path / "rejects.csv")],
        stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
    ) as process:  # fmt: skip
        until = time.monotonic() + 60.0
        # The journal lies there from the first change to the commit: the stop lands within the write.
        while not os.path.exists(journal) and process.poll() is None and time.monotonic() < until:
            time.sleep(0.001)
        process.send_signal(sign)
        out, err = process.communicate(timeout=60)
    assert out == ""
    if sign == signal.SIGINT:
        assert process.returncode == 130
        assert "Interrupted: nothing was loaded" in err
        assert not os.path.exists(journal)
    else:
        assert process.returncode == -signal.SIGKILL
    unchanged("large.csv")


def test_stopped_while_rows_are_read_and_checked(unchanged):
    with subprocess.Popen(
        [*COMMAND, "-"], stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as process:
        # More than is read at once; the end of the table never comes.
        process.stdin.write(HEAD + lines(90_000))
        process.stdin.flush()
        said = ""
        while "note:" not in said:
            said += process.stderr.readline()
        process.send_signal(signal.SIGINT)
        said += process.stderr.read()
        assert process.wait(60) == 130
        assert process.stdout.read() == ""
    assert "Interrupted: nothing was loaded, and nothing was left behind." in said
    unchanged()


@pytest.fixture
def stopped_at(monkeypatch):
    """Presses Ctrl-C as soon as the program tells of a stage."""

    def stop(stage, after=1):
        from campaign.output.progress import Progress

        seen = []

        def told(self, name, done, total):
            seen.append(name)
            if seen.count(stage) == after:
                raise KeyboardInterrupt

        monkeypatch.setattr(Progress, "told", told)
        return seen

    return stop


@pytest.mark.parametrize(
    ("stage", "after"), [("reading", 1), ("checking", 1), ("writing", 1), ("writing", 2)]
)
def test_stopped_at_any_stage(kept, unchanged, stopped_at, tmp_path, stage, after):
    (tmp_path / "table.csv").write_text(HEAD + lines(50) + "Nobody,2461234.5,K,7.3,0.03\n")
    seen = stopped_at(stage, after)
    ran = kept(
        "load", str(tmp_path / "table.csv"), "--skip-bad", "--keep-mapping", "mine",
        "--rejects", str(tmp_path / "rejects.csv"),
    )  # fmt: skip
    assert seen[-1] == stage
    assert (ran.status, ran.out) == (130, "")
    assert "Interrupted: nothing was loaded" in ran.err
    unchanged("table.csv")


@pytest.mark.parametrize(
    "table",
    [
        "name,ra,dec\nQuill,10.0,20.0\nReed,11.0,21.0\n",
        "system,onset\nLantern 3,2021-03-14\nLN3,2030-03-14\n",
    ],
    ids=["systems", "episodes"],
)
def test_stopped_within_a_table_of_knowledge(kept, unchanged, stopped_at, tmp_path, table):
    (tmp_path / "table.csv").write_text(table)
    stopped_at("loading", 2)
    ran = kept("load", str(tmp_path / "table.csv"))
    assert (ran.status, ran.out) == (130, "")
    assert "Interrupted: nothing was loaded" in ran.err
    unchanged("table.csv")


def test_stopped_within_a_table_that_was_exported(kept, unchanged, stopped_at, own_database, tmp_path):
    (tmp_path / "table.csv").write_text(HEAD + lines(2_500))
    other = str(tmp_path / "other.db")
    assert kept("begin", "--db", other).status == 0
    system = ("Lantern 3", "--ra", "18:02:31.5", "--dec", "-45:12:30")
    assert kept("system", "add", *system, "--db", other).status == 0
    assert kept("load", str(tmp_path / "table.csv"), "--db", other).status == 0
    assert kept("export", "observations", "--to", str(tmp_path / "out.csv"), "--db", other).status == 0
    stopped_at("loading", 2)
    ran = kept("load", str(tmp_path / "out.csv"))
    assert (ran.status, ran.out) == (130, "")
    assert "Interrupted: nothing was loaded" in ran.err
    unchanged("table.csv", "other.db", "out.csv")


def test_an_interrupt_during_the_commit_stops_nothing_and_is_told_the_truth(
    kept, own_database, tmp_path, monkeypatch
):
    from sqlalchemy import Connection

    commit = Connection.commit

    def slow_commit(self):
        os.kill(os.getpid(), signal.SIGINT)
        commit(self)

    (tmp_path / "table.csv").write_text(HEAD + lines(5))
    monkeypatch.setattr(Connection, "commit", slow_commit)
    before = signal.getsignal(signal.SIGINT)
    ran = kept("load", str(tmp_path / "table.csv"))
    assert ran.status == 0
    assert "added 5" in ran.out
    assert "too late" in ran.err
    assert "nothing was loaded" not in ran.err
    assert signal.getsignal(signal.SIGINT) is before
    with contextlib.closing(sqlite3.connect(own_database)) as connection:
        assert connection.execute("SELECT count(*) FROM observations").fetchone()[0] == 5


def test_a_quiet_load_that_is_stopped_says_nothing(kept, unchanged, stopped_at, tmp_path):
    (tmp_path / "table.csv").write_text(HEAD + lines(5))
    stopped_at("writing")
    ran = kept("load", str(tmp_path / "table.csv"), "--quiet")
    assert (ran.status, ran.out, ran.err) == (130, "", "")
    unchanged("table.csv")


# ------------------------------------------------------------------------------ how far it is, on a terminal


def on_a_terminal(line, **environment):
    """What a real run shows on a terminal of its own, and what it came to."""
    leader, follower = pty.openpty()
    with subprocess.Popen(
        line, stdin=subprocess.DEVNULL, stdout=subprocess.PIPE, stderr=follower,
        env=os.environ | {"TERM": "xterm", "COLUMNS": "80", **environment},
    ) as process:  # fmt: skip
        os.close(follower)
        shown = b""
        with contextlib.suppress(OSError):
            while piece := os.read(leader, 65536):
                shown += piece
                yield process, shown.decode("utf-8", "replace")
        process.wait(60)
        yield process, shown.decode("utf-8", "replace")
    os.close(leader)


@pytest.mark.slow
def test_a_load_of_more_than_a_second_shows_a_bar_that_goes_away(kept, tmp_path):
    (tmp_path / "large.csv").write_text(HEAD + lines(400_000))
    for process, shown in on_a_terminal([*COMMAND, str(tmp_path / "large.csv")]):  # noqa: B007
        pass
    assert process.returncode == 0
    assert re.search(r"(reading|checking|writing) .*\d+%", shown)
    # The cursor is there again, and the line of the bar was wiped.
    assert shown.rindex("\x1b[?25h") > shown.rindex("\x1b[?25l")
    assert "\x1b[2K" in shown


@pytest.mark.slow
def test_ctrl_c_at_the_bar_gives_the_terminal_back(unchanged, tmp_path):
    (tmp_path / "large.csv").write_text(HEAD + lines(400_000))
    is_sent = False
    for process, shown in on_a_terminal([*COMMAND, str(tmp_path / "large.csv")]):
        if not is_sent and re.search(r"\d+%", shown):
            process.send_signal(signal.SIGINT)
            is_sent = True
    assert process.returncode == 130
    assert "Interrupted: nothing was loaded" in shown
    assert shown.rindex("\x1b[?25h") > shown.rindex("\x1b[?25l")
    unchanged("large.csv")
