"""``campaign undo``: take back one whole command."""

from __future__ import annotations

import time
from typing import TYPE_CHECKING, Annotated

import typer

from campaign.commands import common
from campaign.commands.common import (
    DbOption,
    DryRunOption,
    JsonOption,
    ObserverOption,
    QuietOption,
    YesOption,
)
from campaign.commands.interrupts import LateInterrupts
from campaign.commands.parsing import entry_number

if TYPE_CHECKING:
    from campaign.model.history import Undone
    from campaign.model.kept import Stamp


def undo(
    operation: Annotated[
        str | None,
        typer.Argument(
            metavar="[OPERATION]",
            help="Its number in the history; else the last of yours that stands. "
            "The number of an undo puts back what it took back.",
            show_default=False,
        ),
    ] = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    yes: YesOption = False,
    dry_run: DryRunOption = False,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Take back one whole command; nothing is erased."""
    from campaign.output import history as output
    from campaign.studies import undo as study

    place, stamp = common.database(db), common.stamp(observer)
    number = None if operation is None else entry_number(operation, "OPERATION")
    if dry_run or not yes:
        result = study.preview_undo(place, stamp.who, number)
        if not dry_run:
            output.render_undone(common.stderr_screen(), result)
            common.confirm("Do this?", yes=False)
            number = result.operation.id
    if not dry_run:
        result = _done(place, stamp, number, quiet)
    if json:
        common.write_json(output.undone_json(result, common.now_iso()))
    elif not quiet:
        output.render_undone(common.stdout_screen(), result)


def _done(place: str, stamp: Stamp, number: int | None, quiet: bool) -> Undone:
    """Do it, with progress; an interrupt stops it, unless it comes too late, and either is said."""
    from campaign.output.progress import Progress
    from campaign.studies import undo as study

    late = LateInterrupts()
    try:
        with late, Progress(common.stderr_screen(), time.monotonic, quiet=quiet) as progress:

            def told(stage: str, done: int, total: int | None) -> None:
                progress.told(stage, done, total)
                late.watch(stage)

            result = study.undo(place, stamp, number, told)
    except KeyboardInterrupt:
        common.tell("Interrupted: nothing was undone.", quiet=quiet)
        raise
    if late.came:
        common.tell("The interrupt came too late to keep the undo from being done.", quiet=quiet)
    return result
