"""Commands that exist only for the tests of the runner and the tree; run as a program with ``python``."""

from __future__ import annotations

import errno
import os
import sys
from typing import Annotated

import typer

from campaign.commands.common import DbOption, JsonOption, QuietOption, YesOption, confirm, database, tell
from campaign.commands.tree import Branch, Leaf, build_root
from campaign.errors import (
    Conflict,
    DatabaseBusy,
    DatabaseUnusable,
    InputRefused,
    NotFound,
    StorageFull,
    UsageRefused,
)


def point(
    name: Annotated[str, typer.Argument(metavar="NAME")],
    words: Annotated[list[str] | None, typer.Argument(metavar="[WORD]...")] = None,
    dec: Annotated[str | None, typer.Option("--dec")] = None,
    tag: Annotated[list[str] | None, typer.Option("--tag")] = None,
    draws: Annotated[int, typer.Option("--draws")] = 5,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """Show what was understood."""
    typer.echo(repr((name, words, dec, tag, draws, json, database(db))))
    typer.echo("pydantic" if "pydantic" in sys.modules else "text only")


REFUSALS = {
    each.__name__: each
    for each in (UsageRefused, InputRefused, NotFound, Conflict, DatabaseBusy, DatabaseUnusable, StorageFull)
}


def refuse(
    kind: Annotated[str, typer.Argument(metavar="KIND")],
    text: Annotated[str, typer.Option("--text")] = "x",
    json: JsonOption = False,
) -> None:
    """Raise an error of a kind."""
    raise REFUSALS[kind](
        f"Refused '{text}'.", why="A rule.", hint=f"Write [b]{text}[/b].", details={"given": text}
    )


def fail(what: Annotated[str, typer.Argument(metavar="WHAT")], json: JsonOption = False) -> None:
    """Fail in a way that no command means to."""
    if what == "interrupt":
        raise KeyboardInterrupt
    if what == "full":
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))
    if what == "memory":
        raise MemoryError
    if what == "end":
        raise EOFError
    raise ZeroDivisionError(f"division by {what}")


def flood(lines: Annotated[int, typer.Option("--lines")] = 200_000) -> None:
    """Write many lines."""
    for number in range(lines):
        sys.stdout.write(f"{number} {'x' * 60}\n")


def ask(yes: YesOption = False, quiet: QuietOption = False) -> None:
    """Ask before doing it."""
    confirm("Do it?", yes=yes)
    tell("Done: \x1b[31m", quiet=quiet)
    typer.echo("data")


def _leaf(name: str, text: str) -> Leaf:
    return Leaf(name, text, "commands_examples", name, section="Try")


TABLE = (
    _leaf("point", "Show what was understood."),
    Branch(
        "try",
        "Things to try.",
        (_leaf("refuse", "Raise an error of a kind."), _leaf("ask", "Ask before doing it.")),
        "Try",
    ),
    _leaf("fail", "Fail in a way that no command means to."),
    _leaf("flood", "Write many lines."),
    Leaf(
        "broken",
        "A command whose module cannot be imported.",
        "no_such_module_of_ours",
        "broken",
        section="Other",
    ),
)

if __name__ == "__main__":
    import campaign.__main__ as runner

    runner.build_root = lambda: build_root(TABLE)
    runner.main()
