"""Options that many commands share, and the few things a command may ask of its surroundings.

Only here and in the runner are the clock, the environment and the standard streams touched.
"""

from __future__ import annotations

import os
import shlex
import sys
from datetime import UTC, datetime
from typing import TYPE_CHECKING, Annotated, Any

import typer

from campaign import settings
from campaign.errors import Declined, UsageRefused
from campaign.output.safe import visible

if TYPE_CHECKING:
    from campaign.model.kept import Kept, Stamp
    from campaign.output.console import Screen

DbOption = Annotated[
    str | None,
    typer.Option(
        "--db",
        metavar="PATH_OR_URL",
        help="The database: a path or an SQLAlchemy URL. Else $CAMPAIGN_DB, else the user's data folder.",
        show_default=False,
    ),
]
AsOfOption = Annotated[
    str | None,
    typer.Option(
        "--as-of",
        metavar="INSTANT",
        help="Take this instant in place of now, as 2031-04-07 or 2031-04-07T03:12:10Z; "
        "observations made after it are not looked at.",
        show_default=False,
    ),
]
ObserverOption = Annotated[
    str | None,
    typer.Option(
        "--observer",
        metavar="NAME",
        help="Who makes the entry. Else $CAMPAIGN_OBSERVER, else the login name.",
        show_default=False,
    ),
]
JsonOption = Annotated[
    bool, typer.Option("--json", help="Write one JSON document; errors become JSON too.", show_default=False)
]
QuietOption = Annotated[
    bool, typer.Option("--quiet", "-q", help="Say nothing but errors and data.", show_default=False)
]
YesOption = Annotated[
    bool, typer.Option("--yes", "-y", help="Agree to every question beforehand.", show_default=False)
]
DryRunOption = Annotated[
    bool, typer.Option("--dry-run", help="Show what would change and change nothing.", show_default=False)
]


def database(option: str | None) -> str:
    """Where the database is, as a path or URL.

    Raises
    ------
    UsageRefused
        When ``--db`` was given without a name, as an unset variable of a script would: falling back to
        another database would write to the wrong one.
    """
    if option is not None and not option.strip():
        raise UsageRefused(
            "--db names no database.",
            why="Its value is empty.",
            hint="Give a path or URL, for example --db campaign.db, or leave --db out.",
            code="database-unnamed",
        )
    return settings.database_location(option, os.environ)


def refuse_with_sample(db: str | None, known_at: str | None = None) -> None:
    """The sample campaign is no database and nobody entered it: these options would be passed over."""
    for name, value in (("--db", db), ("--known-at", known_at)):
        if value is not None:
            raise UsageRefused(
                f"{name} does not go with --sample.",
                why="The sample campaign is made anew each time, without any database.",
                hint="Leave one of them out; to keep the sample in a database: campaign begin --sample.",
                code="sample-alone",
            )


def observer(option: str | None) -> str:
    """Who is at work."""
    return settings.observer_name(option, os.environ)


def now_utc() -> datetime:
    """The clock. Nothing else in the program reads it."""
    return datetime.now(UTC)


def now_iso() -> str:
    """The clock to the second, as ``2031-04-07T03:12:10Z``."""
    return now_utc().strftime("%Y-%m-%dT%H:%M:%SZ")


def stdout_screen() -> Screen:
    """Where data go."""
    from campaign.output.console import screen_for

    return screen_for(sys.stdout, os.environ)


def stderr_screen() -> Screen:
    """Where everything else goes."""
    from campaign.output.console import screen_for

    return screen_for(sys.stderr, os.environ)


def write_json(text: str) -> None:
    """Write one document, as ``campaign.output.documents`` makes it, to stdout."""
    if sys.stdout is not None:
        sys.stdout.write(text)


def tell(text: str, *, quiet: bool = False) -> None:
    """Say one thing to the user on stderr, within the window."""
    if not quiet:
        stderr_screen().wrapped(text)


def asks_questions() -> bool:
    """Whether somebody is there to answer: both ends are a terminal."""
    return all(stream is not None and stream.isatty() for stream in (sys.stdin, sys.stderr))


def confirm(question: str, *, yes: bool) -> None:
    """Ask before something is changed in bulk.

    Raises
    ------
    Declined
        When the answer is no, or nobody is there to ask and ``--yes`` was not given.
    """
    if yes:
        return
    if not asks_questions():
        raise Declined(
            "Nothing was done.",
            why=f"This needs an answer and nobody is there to give it: {question}",
            hint="Add --yes to agree beforehand.",
        )
    if ask(f"{question} [y/N]").strip().lower() not in {"y", "yes"}:
        raise Declined(
            "Nothing was done.",
            why="The question was answered with no.",
            hint="Run the command again when you want the change.",
        )


def option(flag: str, metavar: str, text: str) -> Any:
    """A text option, declared in one line."""
    return typer.Option(flag, metavar=metavar, help=text, show_default=False)


def stamp(observer_option: str | None) -> Stamp:
    """Who makes an entry, when and with which command."""
    from campaign.model.kept import Stamp

    return Stamp(at=now_utc(), who=observer(observer_option), command=command_typed())


def command_typed() -> str:
    """The command as typed, without what could be a password."""
    words = ["campaign", *(visible(word) for word in sys.argv[1:])]
    return shlex.join("(database URL)" if "://" in word else word for word in words)[:2000]


def new_database(option_text: str | None) -> str:
    """Where a database is to be made; the user's data folder is made when it is the default."""
    place = database(option_text)
    if option_text is None and "CAMPAIGN_DB" not in os.environ:
        os.makedirs(os.path.dirname(place), exist_ok=True)
    return place


def report(kept: Kept, *, json: bool, quiet: bool) -> None:
    """Say what a keeping command did: JSON to stdout, or its lines, warnings to stderr."""
    from campaign.output.documents import document

    if json:
        write_json(
            document(
                kept.kind,
                dict(kept.data) | {"changed": kept.changed},
                as_of=now_iso(),
                warnings=kept.warnings,
            )
        )
        return
    if not quiet:
        screen = stdout_screen()
        for line in kept.lines:
            screen.wrapped(line)
    for warning in kept.warnings:
        tell(f"Warning: {warning}")


def ask(question: str) -> str:
    """One line from the user; the question goes to stderr, since stdout holds data alone.

    Raises
    ------
    Declined
        When the input ends.
    """
    sys.stderr.write(visible(question) + " ")
    sys.stderr.flush()
    try:
        answer = sys.stdin.readline()
    except KeyboardInterrupt:
        sys.stderr.write("\n")
        raise
    if not answer:
        sys.stderr.write("\n")
        raise Declined(
            "Nothing was done.",
            why="The input ended before the question was answered.",
            hint="Run the command again, or give the answer as an option.",
        )
    return answer.rstrip("\n")
