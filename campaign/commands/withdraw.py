"""``campaign withdraw``: take observations out of use."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import (
    DbOption,
    DryRunOption,
    JsonOption,
    ObserverOption,
    QuietOption,
    option,
)
from campaign.commands.parsing import entry_number, plain
from campaign.errors import UsageRefused


def withdraw(
    numbers: Annotated[list[str], typer.Argument(metavar="N", help="Numbers of observations.")],
    why: Annotated[str | None, option("--why", "TEXT", "What is wrong with them; kept with each.")] = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    dry_run: DryRunOption = False,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Take observations out of use; they stay, with the reason."""
    from campaign.output import observations as output
    from campaign.studies import amend as study

    wanted = [entry_number(number, "N") for number in numbers]
    if why is None:
        if not common.asks_questions():
            raise UsageRefused(
                "--why is missing.",
                why="Whoever meets the observation later should learn what was wrong with it.",
                hint=f'For example: campaign withdraw {wanted[0]} --why "wrong star in the aperture".',
                details={"missing": "--why"},
            )
        why = common.ask("Why:")
    # The study has words of its own for a reason that says nothing.
    reason = (plain(why, "--why", 500) or "") if why.strip() else ""
    result = study.withdraw_observations(
        common.database(db), common.stamp(observer), wanted, reason, rehearse=dry_run
    )
    if json:
        common.write_json(output.withdrawn_json(result, common.now_iso()))
    elif not quiet:
        output.render_withdrawn(common.stdout_screen(), result)
