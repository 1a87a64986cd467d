"""The README does what it says: its commands are run in order, as a reader types them, in an empty folder."""

from __future__ import annotations

import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).resolve().parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCK = re.compile(
    r"(?P<mark><!-- set-up: run by \.ci/run -->\n)?```(?P<kind>\w+)\n(?P<text>.*?)^```$", re.S | re.M
)
BLOCKS = [(found["kind"], found["text"], bool(found["mark"])) for found in BLOCK.finditer(README)]
SET_UP = [text.rstrip("\n") for kind, text, marked in BLOCKS if kind == "sh" and marked]
TOUR = [(kind, text) for kind, text, marked in BLOCKS if not marked and kind in {"sh", "text"}]


@pytest.fixture(scope="module")
def reader(tmp_path_factory) -> dict[str, str]:
    """The surroundings of somebody who has installed the program and reads along in an empty folder."""
    folder = tmp_path_factory.mktemp("reader")
    programs = folder / "bin"
    programs.mkdir()
    program = programs / "campaign"
    program.write_text(f'#!/bin/sh\nexec {shlex.quote(sys.executable)} -m campaign "$@"\n', encoding="utf-8")
    program.chmod(0o755)
    return {
        "PATH": f"{programs}{os.pathsep}{os.environ['PATH']}",
        "PYTHONPATH": str(ROOT),
        "HOME": str(folder),
        "CAMPAIGN_DB": str(folder / "campaign.db"),
        "LC_ALL": "C.UTF-8",
        "FOLDER": str(folder),
    }


@pytest.fixture(scope="module")
def told(reader) -> list[tuple[str, str, subprocess.CompletedProcess[str] | None]]:
    """Every block of the tour with what came of it, in the order of the page."""
    results = []
    for kind, text in TOUR:
        done = None
        if kind == "sh":
            done = subprocess.run(
                ["sh", "-ec", text], cwd=reader["FOLDER"], env=reader, stdin=subprocess.DEVNULL,
                capture_output=True, encoding="utf-8", check=False, timeout=120,
            )  # fmt: skip
        results.append((kind, text, done))
    return results


def test_one_paragraph_then_two_commands_that_do_all_their_set_up():
    opening, first, between, second, *_ = re.split(r"^```(?:sh)?$", README, flags=re.M)
    paragraphs = [
        part for part in opening.split("\n\n") if not part.startswith(("#", "<!--", "See the forecast"))
    ]
    assert len([part for part in paragraphs if part.strip()]) == 1
    assert [first.strip(), second.strip()] == SET_UP
    for command in SET_UP:
        assert command.startswith("python3 -m venv .venv && .venv/bin/pip install ")
    assert SET_UP[0].endswith(".venv/bin/campaign upcoming --sample")
    assert SET_UP[1].endswith("-m pytest")
    assert "```" not in between


def test_the_machine_check_runs_these_two_commands_and_no_others():
    done = subprocess.run(
        [ROOT / ".ci" / "run", "--show"], cwd="/", capture_output=True, encoding="utf-8", check=True
    )
    assert done.stdout.splitlines() == SET_UP


def test_every_command_of_the_tour_works(told):
    for kind, text, done in told:
        if kind == "sh":
            assert done.returncode == 0, f"{text}\n{done.stderr}"
            assert "campaign: " not in done.stderr


def test_the_tour_has_every_command_of_a_first_forecast():
    typed = "\n".join(text for kind, text in TOUR if kind == "sh")
    for command in (
        "begin", "site add", "system add", "solution add", "rule set", "log photometry", "episodes add",
        "upcoming", "ephemeris",
    ):  # fmt: skip
        assert f"campaign {command} " in typed or f"campaign {command}\n" in typed


def test_every_output_shown_is_what_the_commands_before_it_print(told):
    """Digits are left out: they may move with the version of a library, words and columns may not."""
    output = ""
    shown = 0
    for kind, text, done in told:
        if kind == "sh":
            output = re.sub(r"\d", "#", done.stdout)
        else:
            for line in text.splitlines():
                assert re.sub(r"\d", "#", line) in output.splitlines()
                shown += 1
    assert shown >= 2


def test_the_tour_ends_with_a_dated_and_confirmed_episode(told):
    # What the page says about the status is what the program says, in this order.
    said = [
        next(status for status in ("suspected", "under way", "open", "expected") if status in line)
        for kind, _, done in told
        if kind == "sh"
        for line in done.stdout.splitlines()
        if line.startswith("Lantern 3  onset")
    ]
    assert [said[0], *dict.fromkeys(said[1:])] == ["expected", "expected", "suspected", "under way"]


def test_every_status_and_exit_status_is_explained():
    from campaign import errors
    from campaign.model.forecasts import STATUSES

    for status in STATUSES:
        assert re.search(rf"^\| {status} \| ", README, re.M), status
    kinds = [kind for kind in vars(errors).values() if isinstance(kind, type)]
    statuses = {kind.exit_status for kind in kinds if issubclass(kind, errors.CampaignError)}
    for number in {0, errors.EXIT_INTERRUPTED, errors.EXIT_BROKEN_PIPE} | statuses:
        assert re.search(rf"^\| {number} \| ", README, re.M), number
