"""Whatever happens in a command, the user reads one message and a program one exit status."""

import json
import os
import pty
import re
import signal
import subprocess
import sys
from pathlib import Path

import pytest
from commands_examples import TABLE

from campaign.__main__ import run
from campaign.commands.tree import build_root

HERE = Path(__file__).resolve().parent
PROGRAM = [sys.executable, str(HERE / "commands_examples.py")]
ENVIRONMENT = {
    "PATH": os.environ["PATH"],
    "PYTHONPATH": f"{HERE.parents[1]}{os.pathsep}{HERE}",
    "HOME": "/nowhere",
}


def attempt(words, **more):
    return subprocess.run(words, check=False, **more)


def process(*words, **more):
    return attempt([*PROGRAM, *words], env=ENVIRONMENT, text=True, capture_output=True, **more)


@pytest.fixture
def campaign(capsys):
    """Run a line in this process: (exit status, stdout, stderr)."""

    def run_line(*words):
        status = run(words, build_root(TABLE))
        return status, *capsys.readouterr()

    return run_line


# Exit statuses as promised in the output contract (DEVELOPERS.md).
@pytest.mark.parametrize(
    ("kind", "status"),
    [("UsageRefused", 2), ("InputRefused", 3), ("NotFound", 4), ("Conflict", 5), ("DatabaseBusy", 6),
     ("DatabaseUnusable", 7)],
)  # fmt: skip
def test_an_error_of_ours_is_three_lines_and_its_status(campaign, kind, status):
    assert campaign("try", "refuse", kind) == (
        status,
        "",
        "campaign: Refused 'x'.\n  why:  A rule.\n  next: Write [b]x[/b].\n",
    )


def test_storage_full_ends_with_8():
    done = process("try", "refuse", "StorageFull")
    assert done.returncode == 8
    assert len(done.stderr.splitlines()) == 3


def test_text_from_the_user_is_shown_and_steers_nothing(campaign):
    _, _, told = campaign("try", "refuse", "NotFound", "--text", "\x1b]0;x\x07[red]\u202e\n:bomb:")
    assert told.splitlines()[0] == "campaign: Refused '\\x1b]0;x\\x07[red]\\u202e\\x0a:bomb:'."
    assert len(told.splitlines()) == 3


@pytest.mark.parametrize("place", [("--json", "x"), ("x", "--json")])
def test_with_json_the_error_is_an_object_on_stderr(campaign, place):
    words = [word if word == "--json" else "NotFound" for word in place]
    status, out, told = campaign("try", "refuse", *words)
    assert (status, out) == (4, "")
    assert json.loads(told) == {
        "error": {
            "code": "not-found",
            "message": "Refused 'x'.",
            "hint": "Write [b]x[/b].",
            "details": {"why": "A rule.", "given": "x"},
        }
    }


@pytest.mark.parametrize(
    "words",
    [("point",), ("point", "x", "--nope"), ("point", "x", "--draws", "many"), ("nothing",),
     ("point", "x", "-45:12"), ("try", "nothing"), ("--nope",), ("point", "x", "--dec")],
)  # fmt: skip
def test_usage_errors_have_three_lines_status_2_and_obey_json(campaign, words):
    status, out, told = campaign(*words)
    assert (status, out) == (2, "")
    assert len(told.splitlines()) == 3
    status, out, told = campaign(*words[:1], "--json", *words[1:])
    assert (status, out) == (2, "")
    assert set(json.loads(told)["error"]) == {"code", "message", "hint", "details"}


def test_a_negative_number_out_of_place_is_explained(campaign):
    _, _, told = campaign("point", "Lantern 3", "-45:12:30")
    assert "'-45:12:30' was read as an option" in told
    assert "--dec -45:12:30" in told
    status, out, _ = campaign("point", "Lantern 3", "--dec", "-45:12:30")
    assert status == 0
    assert "'-45:12:30'" in out


def test_near_names_are_offered(campaign):
    assert "Did you mean 'campaign point'?" in campaign("pont")[2]
    assert "Did you mean 'campaign try refuse'?" in campaign("refuse")[2]
    assert "Did you mean 'campaign try refuse'?" in campaign("try", "refus")[2]
    assert "Did you mean" not in campaign("zzzz")[2]
    assert "Did you mean --draws?" in campaign("point", "x", "--drawz", "3")[2]


def test_an_unexpected_error_is_told_without_a_traceback(campaign):
    status, out, told = campaign("fail", "zero")
    assert (status, out) == (1, "")
    assert told.splitlines()[0] == "campaign: The program failed: ZeroDivisionError: division by zero"
    assert "Traceback" not in told
    assert "--traceback" in told.splitlines()[2]


def test_a_traceback_is_there_for_who_asks(campaign, monkeypatch):
    for words in (("fail", "zero", "--traceback"), ("--traceback", "fail", "zero")):
        with pytest.raises(ZeroDivisionError):
            campaign(*words)
    monkeypatch.setenv("CAMPAIGN_TRACEBACK", "1")
    with pytest.raises(ZeroDivisionError):
        campaign("fail", "zero")
    assert campaign("try", "refuse", "NotFound", "--traceback")[0] == 4


def test_a_module_that_cannot_be_imported_is_unexpected(campaign):
    assert campaign("broken")[0] == 1


def test_words_after_a_double_dash_are_no_options_of_the_runner(campaign):
    status, out, _ = campaign("point", "--", "--json", "--traceback")
    assert status == 0
    assert out.startswith("('--json', ['--traceback'], None, None, 5, False,")


def test_memory_that_is_not_enough_ends_with_8(campaign):
    status, out, told = campaign("fail", "memory")
    assert (status, out) == (8, "")
    assert len(told.splitlines()) == 3
    assert "memory" in told.splitlines()[0]


def test_an_interrupt_ends_with_130(campaign):
    assert campaign("fail", "interrupt") == (130, "", "")


def test_an_interrupt_from_the_keyboard_ends_with_130():
    with subprocess.Popen(
        [*PROGRAM, "flood", "--lines", "100000000"], env=ENVIRONMENT, stdout=subprocess.PIPE
    ) as child:
        child.stdout.readline()
        child.send_signal(signal.SIGINT)
        while child.stdout.read(65536):
            pass
        assert child.wait(timeout=20) == 130


def test_no_room_left_ends_with_8(campaign):
    status, _, told = campaign("fail", "full")
    assert status == 8
    assert len(told.splitlines()) == 3


@pytest.mark.parametrize(
    "words", [("flood",), ("point", "x"), ("--help",), ("try",), ("point", "--help"), ("--version",)]
)
def test_a_full_disk_behind_stdout_ends_with_8_and_three_lines(words):
    with open("/dev/full", "w") as full:
        done = attempt([*PROGRAM, *words], env=ENVIRONMENT, stdout=full, stderr=subprocess.PIPE, text=True)
    assert done.returncode == 8
    assert len(done.stderr.splitlines()) == 3


def test_a_full_disk_behind_stderr_is_silent():
    with open("/dev/full", "w") as full:
        done = attempt([*PROGRAM, "nothing"], env=ENVIRONMENT, stderr=full)
    assert done.returncode == 2


@pytest.mark.parametrize("words", [("flood",), ("--help",), ("point", "x")])
def test_a_reader_that_leaves_ends_with_141_and_silence(words):
    reader, writer = os.pipe()
    os.close(reader)
    done = attempt([*PROGRAM, *words], env=ENVIRONMENT, stdout=writer, stderr=subprocess.PIPE, text=True)
    os.close(writer)
    assert (done.returncode, done.stderr) == (141, "")


def test_a_reader_that_leaves_midway_ends_with_141_and_silence():
    with subprocess.Popen(
        [*PROGRAM, "flood"], env=ENVIRONMENT, stdout=subprocess.PIPE, stderr=subprocess.PIPE
    ) as child:
        assert child.stdout.readline().startswith(b"0 ")
        child.stdout.close()
        assert child.stderr.read() == b""
        assert child.wait(timeout=20) == 141


@pytest.mark.parametrize("closed", ["<&-", ">&-", "2>&-", "<&- >&- 2>&-"])
def test_closed_streams_are_no_error(closed):
    line = " ".join(f"'{word}'" for word in PROGRAM) + f" point x {closed}"
    assert attempt(["sh", "-c", line], env=ENVIRONMENT, capture_output=True).returncode == 0
    line = " ".join(f"'{word}'" for word in PROGRAM) + f" nothing {closed}"
    assert attempt(["sh", "-c", line], env=ENVIRONMENT, capture_output=True).returncode == 2


def test_a_question_without_anybody_to_answer_is_declined():
    done = process("try", "ask", stdin=subprocess.DEVNULL)
    assert (done.returncode, done.stdout) == (9, "")
    assert "--yes" in done.stderr.splitlines()[2]
    done = process("try", "ask", "--yes", stdin=subprocess.DEVNULL)
    assert (done.returncode, done.stdout, done.stderr) == (0, "data\n", "Done: \\x1b[31m\n")
    assert process("try", "ask", "--yes", "--quiet").stderr == ""


@pytest.mark.parametrize(("answer", "status"), [("y\n", 0), ("n\n", 9), ("\x04", 9)])
def test_a_question_on_a_terminal_is_answered_there(answer, status):
    leader, follower = pty.openpty()
    with subprocess.Popen(
        [*PROGRAM, "try", "ask"], env=ENVIRONMENT, stdin=follower, stderr=follower, stdout=subprocess.PIPE
    ) as child:
        os.close(follower)
        asked = b""
        while b"Do it? [y/N] " not in asked:
            asked += os.read(leader, 1000)
        os.write(leader, answer.encode())
        out = child.stdout.read()
        assert child.wait(timeout=20) == status
    os.close(leader)
    assert out == (b"data\n" if status == 0 else b"")


def test_a_narrow_locale_never_stops_an_answer():
    narrow = {"LC_ALL": "C", "PYTHONUTF8": "0", "PYTHONCOERCECLOCALE": "0"}
    done = attempt([*PROGRAM, "point", "Ω±"], env=ENVIRONMENT | narrow, capture_output=True)
    assert done.returncode == 0
    # What was typed is understood, although this locale has no such characters.
    assert any(form in done.stdout for form in ("Ω±".encode(), rb"\u03a9\xb1"))
    done = attempt([*PROGRAM, "try", "refuse", "InputRefused", "--text", "Ω±"], env=ENVIRONMENT | narrow,
                   capture_output=True)  # fmt: skip
    assert done.returncode == 3
    assert done.stderr.isascii()
    assert b"\\u03a9" in done.stderr


def test_it_runs_as_a_module():
    done = attempt(
        [sys.executable, "-m", "campaign", "--version"], env=ENVIRONMENT, capture_output=True, text=True
    )
    assert done.returncode == 0
    assert re.fullmatch(r"campaign \d+\.\d+\.\d+\n", done.stdout)
