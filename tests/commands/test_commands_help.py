"""Every example in the help is a line that works."""

from __future__ import annotations

import shlex
from collections.abc import Callable, Iterator
from typing import Any

import pytest

from campaign.commands.tree import COMMANDS, Branch

RunCampaign = Callable[..., Any]


def _command_lines() -> Iterator[tuple[str, ...]]:
    for entry in COMMANDS:
        if isinstance(entry, Branch):
            yield from ((entry.name, leaf.name) for leaf in entry.leaves)
        else:
            yield (entry.name,)


def _examples(text: str) -> list[list[str]]:
    """The example lines of a help text as a shell would split them."""
    _, found, rest = text.partition("For example:\n")
    if not found:
        return []
    block = rest.split("\n\n")[0].replace("\\\n", " ")
    lines = [shlex.split(line, comments=True) for line in block.splitlines()]
    return [words[1:] for words in lines if words[:1] == ["campaign"]]


SETTING = (
    ("site", "add", "Cold Mesa", "--latitude", "-31", "--longitude", "70 W"),
    (
        "solution",
        "add",
        "Lantern 3",
        "--label",
        "visual 2025",
        "--period",
        "3130±4 d",
        "--epoch",
        "2026-08-01",
    ),
    (
        "solution",
        "add",
        "Lantern 3",
        "--label",
        "solution 1",
        "--period",
        "3125±4 d",
        "--epoch",
        "2026-08-09",
    ),
)
OURS = [("upcoming",), ("ephemeris",), ("log", "photometry"), ("log", "flux"), ("rule", "set"),
        ("solution", "adopt"), ("episodes", "add"), ("shells", "date"), ("shells", "expect"),
        ("winds",)]  # fmt: skip
FROM_NOTHING = [("system", "add"), ("site", "add")]


@pytest.mark.parametrize("command", OURS, ids=" ".join)
def test_the_examples_of_the_help_work(kept: RunCampaign, command: tuple[str, ...]) -> None:
    for words in SETTING:
        assert kept(*words).status == 0
    examples = _examples(kept(*command, "--help").out)
    assert examples
    for words in examples:
        ran = kept(*words)
        assert ran.status == 0, (words, ran.err)


@pytest.mark.parametrize("command", FROM_NOTHING, ids=" ".join)
def test_the_examples_of_what_comes_first_work(run_campaign: RunCampaign, command: tuple[str, ...]) -> None:
    run_campaign("begin")
    examples = _examples(run_campaign(*command, "--help").out)
    assert examples
    for words in examples:
        ran = run_campaign(*words)
        assert ran.status == 0, (words, ran.err)


def test_the_example_of_a_solution_works_on_the_example_of_a_system(run_campaign: RunCampaign) -> None:
    run_campaign("begin")
    for command in (("system", "add"), ("solution", "add")):
        for words in _examples(run_campaign(*command, "--help").out):
            ran = run_campaign(*words)
            assert ran.status == 0, (words, ran.err)


@pytest.mark.parametrize("command", list(_command_lines()), ids=" ".join)
def test_every_command_has_help_that_fits_a_small_terminal(
    run_campaign: RunCampaign, command: tuple[str, ...]
) -> None:
    ran = run_campaign(*command, "--help")
    assert ran.status == 0
    assert max(len(line) for line in ran.out.splitlines()) <= 80
    assert "--help" in ran.out
