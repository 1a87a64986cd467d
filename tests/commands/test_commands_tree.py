"""The table of commands: listed without importing any, and true to what it lists."""

import inspect
import os
import subprocess
import sys
from pathlib import Path

import pytest
from commands_examples import TABLE

from campaign.__main__ import run
from campaign.commands.tree import COMMANDS, Branch, Leaf, build_root

HERE = Path(__file__).resolve().parent
ENVIRONMENT = {"PATH": os.environ["PATH"], "PYTHONPATH": f"{HERE.parents[1]}{os.pathsep}{HERE}"}


def leaves(table):
    for entry in table:
        yield from entry.leaves if isinstance(entry, Branch) else (entry,)


@pytest.mark.parametrize("leaf", list(leaves((*COMMANDS, *TABLE[:-1]))), ids=lambda leaf: leaf.name)
def test_the_table_says_what_the_command_says(leaf):
    function = leaf.load()
    assert inspect.isfunction(function)
    assert inspect.getdoc(function).splitlines()[0] == leaf.help


def test_names_in_one_group_are_unique():
    for table in (COMMANDS, *(entry.leaves for entry in COMMANDS if isinstance(entry, Branch))):
        names = [entry.name for entry in table]
        assert len(set(names)) == len(names)


@pytest.mark.parametrize("words", [[], ["--help"]])
def test_help_lists_every_command_and_imports_none(capsys, words):
    assert run(words, build_root(TABLE)) == 0
    out = capsys.readouterr().out
    for entry in TABLE:
        assert f"  {entry.name}" in out
        assert entry.help in out
    assert "no_such_module_of_ours" not in sys.modules


@pytest.mark.parametrize("words", [["try"], ["try", "--help"]])
def test_a_group_lists_its_commands(capsys, words):
    assert run(words, build_root(TABLE)) == 0
    out = capsys.readouterr().out
    assert "campaign try COMMAND" in out
    assert "refuse  Raise an error of a kind." in out


def test_a_command_explains_itself(capsys):
    assert run(["try", "refuse", "--help"], build_root(TABLE)) == 0
    out = capsys.readouterr().out
    assert "Raise an error of a kind." in out
    assert "--text" in out


def test_help_is_plain_and_within_80_columns(capsys):
    for words in (["--help"], ["try", "--help"], ["point", "--help"]):
        run(words, build_root(TABLE))
        out = capsys.readouterr().out
        assert out.isascii()
        assert "\x1b" not in out
        assert max(map(len, out.splitlines())) <= 80


@pytest.mark.parametrize(
    ("words", "expected"),
    [
        (["x"], "('x', None, None, None, 5, False, 'DB')"),
        (["x", "a", "b", "--tag", "1", "--tag", "2", "--dec", "-00 30 10"],
         "('x', ['a', 'b'], '-00 30 10', ['1', '2'], 5, False, 'DB')"),
        (["x", "--draws", "7", "--json"], "('x', None, None, None, 7, True, 'DB')"),
    ],
)  # fmt: skip
def test_values_arrive_as_typed_whether_or_not_the_validator_is_skipped(capsys, monkeypatch, words, expected):
    monkeypatch.setenv("CAMPAIGN_DB", "DB")
    assert run(["point", *words], build_root(TABLE)) == 0
    quick = capsys.readouterr().out.splitlines()[0]
    monkeypatch.setattr("campaign.commands.tree.read_text_directly", list)
    assert run(["point", *words], build_root(TABLE)) == 0
    slow = capsys.readouterr().out.splitlines()[0]
    assert quick == slow == expected


def test_a_command_of_text_alone_loads_no_validator():
    done = subprocess.run(
        [sys.executable, HERE / "commands_examples.py", "point", "x", "--dec", "-1"],
        env=ENVIRONMENT, capture_output=True, text=True, check=True,
    )  # fmt: skip
    assert done.stdout.splitlines()[1] == "text only"


@pytest.mark.parametrize(
    ("typed", "offered"),
    [("", [entry.name for entry in TABLE]), ("try re", ["refuse"]), ("try ask --y", ["--yes"])],
)
def test_completion_offers_names_without_importing_a_command(typed, offered):
    asked = {
        "_CAMPAIGN_COMPLETE": "complete_bash",
        "COMP_WORDS": f"campaign {typed}",
        "COMP_CWORD": str(len(typed.split()) or 1),
    }
    done = subprocess.run(
        [sys.executable, HERE / "commands_examples.py"],
        env=ENVIRONMENT | asked, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert done.stdout.split() == offered


def test_help_needs_no_heavy_library():
    code = (
        "import sys; from campaign.__main__ import run; from campaign.commands.tree import build_root;"
        "from commands_examples import TABLE; run(['--help'], build_root(TABLE));"
        "heavy = {'rich', 'numpy', 'sqlalchemy', 'pydantic', 'erfa', 'platformdirs'};"
        "print(sorted(heavy & set(sys.modules)))"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], env=ENVIRONMENT, capture_output=True, text=True, check=True
    )
    assert done.stdout.splitlines()[-1] == "[]"


def test_a_leaf_is_loaded_by_name():
    leaf = Leaf("point", "Show what was understood.", "commands_examples", "point")
    assert leaf.load().__name__ == "point"
