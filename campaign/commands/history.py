"""``campaign history``: who changed what and when."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, option
from campaign.commands.parsing import clock_instant, entry_number, plain, upper_bound

Text = str | None


def history(
    about: Annotated[
        str | None,
        typer.Argument(
            metavar="[SYSTEM|N]",
            help="A system, or the number of an observation with all its versions; else everything.",
            show_default=False,
        ),
    ] = None,
    by: Annotated[Text, option("--by", "PERSON", "Only what this person did.")] = None,
    from_: Annotated[Text, option("--from", "INSTANT", "Only what was done from then on.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "Only what was done until then.")] = None,
    limit: Annotated[Text, option("--limit", "N", "At most so many; else 20; 0 for all.")] = None,
    operation: Annotated[Text, option("--operation", "N", "Only this one, with every entry.")] = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """Who changed what and when, newest first."""
    from campaign.output import history as output
    from campaign.studies import history as study

    found = study.tell_history(
        common.database(db),
        about,
        who=plain(by, "--by"),
        since=clock_instant(from_, "--from"),
        until=clock_instant(until, "--until"),
        limit=upper_bound(limit, 20),
        operation_id=None if operation is None else entry_number(operation, "--operation"),
    )
    if json:
        common.write_json(output.history_json(found, common.now_iso()))
    else:
        output.render_history(common.stdout_screen(), found, whole=operation is not None)
