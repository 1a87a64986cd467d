"""The README does what it says: its commands are run in order, as a reader types them, in an empty folder."""

from __future__ import annotations

import contextlib
import io
import os
import re
import subprocess
import sys
from dataclasses import dataclass
from pathlib import Path

import pytest

from campaign.__main__ import run

ROOT = Path(__file__).resolve().parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCK = re.compile(
    r"(?P<mark><!-- set-up: run by \.ci/run -->\n)?```(?P<kind>\w+)\n(?P<text>.*?)^```$", re.S | re.M
)
BLOCKS = [(found["kind"], found["text"], bool(found["mark"])) for found in BLOCK.finditer(README)]
SET_UP = [text.rstrip("\n") for kind, text, marked in BLOCKS if kind == "sh" and marked]
TOUR = [(kind, text) for kind, text, marked in BLOCKS if not marked and kind in {"sh", "text"}]


# Stands in for the program and tells the words that the shell made of a line: unit and record separators.
ECHO = "#!/bin/sh\nfor word in \"$@\"; do printf '%s\\037' \"$word\"; done\nprintf '\\036'\n"


def typed_in(block: str, folder: Path) -> list[list[str]]:
    """The words of each ``campaign`` line of a block, as a real shell hands them over."""
    program = folder / "bin" / "campaign"
    if not program.exists():
        program.parent.mkdir()
        program.write_text(ECHO, encoding="utf-8")
        program.chmod(0o755)
    done = subprocess.run(
        ["sh", "-euc", block],
        env={"PATH": f"{program.parent}{os.pathsep}{os.environ['PATH']}", "LC_ALL": "C.UTF-8"},
        cwd=folder, stdin=subprocess.DEVNULL, capture_output=True, encoding="utf-8", check=True,
    )  # fmt: skip
    return [record.split("\x1f")[:-1] for record in done.stdout.split("\x1e")[:-1]]


@dataclass(frozen=True)
class Shown:
    """One block of the page and what came of it."""

    kind: str
    text: str
    statuses: tuple[int, ...] = ()
    out: str = ""
    err: str = ""


@pytest.fixture(scope="module")
def told(tmp_path_factory) -> list[Shown]:
    """The whole tour in the order of the page, by somebody who reads along in an empty folder."""
    folder = tmp_path_factory.mktemp("reader")
    results = []
    with pytest.MonkeyPatch.context() as patch:
        patch.chdir(folder)
        patch.setenv("CAMPAIGN_DB", str(folder / "campaign.db"))
        patch.setenv("CAMPAIGN_OBSERVER", "Ida Vik")
        for kind, text in TOUR:
            out, err, statuses = io.StringIO(), io.StringIO(), []
            with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
                for words in typed_in(text, folder) if kind == "sh" else ():
                    patch.setattr(sys, "argv", ["campaign", *words])
                    statuses.append(run(words))
            results.append(Shown(kind, text, tuple(statuses), out.getvalue(), err.getvalue()))
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
    assert sum(len(block.statuses) for block in told) > 25
    for block in told:
        assert set(block.statuses) <= {0}, f"{block.text}\n{block.err}"
        assert "campaign: " not in block.err
        assert len(block.statuses) == len(re.findall(r"^campaign ", block.text, re.M)) or block.kind != "sh"


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
    for block in told:
        if block.kind == "sh":
            output = re.sub(r"\d", "#", block.out)
        else:
            for line in block.text.splitlines():
                assert re.sub(r"\d", "#", line) in output.splitlines()
                shown += 1
    assert shown >= 2


def test_the_status_of_the_tour_goes_from_expected_to_suspected_to_under_way(told):
    said = [
        next(status for status in ("suspected", "under way", "open", "expected") if status in line)
        for block in told
        for line in block.out.splitlines()
        if line.startswith("Lantern 3  onset")
    ]
    assert list(dict.fromkeys(said)) == ["expected", "suspected", "under way"]


def test_every_status_and_exit_status_is_explained():
    from campaign import errors
    from campaign.model.forecasts import STATUSES

    for status in STATUSES:
        assert re.search(rf"^\| {status} \| ", README, re.M), status
    kinds = [kind for kind in vars(errors).values() if isinstance(kind, type)]
    statuses = {kind.exit_status for kind in kinds if issubclass(kind, errors.CampaignError)}
    for number in {0, errors.EXIT_INTERRUPTED, errors.EXIT_BROKEN_PIPE} | statuses:
        assert re.search(rf"^\| {number} \| ", README, re.M), number
