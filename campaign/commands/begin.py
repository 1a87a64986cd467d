"""``campaign begin``."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, ObserverOption, QuietOption


def begin(
    sample: Annotated[
        bool, typer.Option("--sample", help="Fill it with the invented sample campaign.", show_default=False)
    ] = False,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Make the database, empty or with the sample campaign."""
    from campaign.studies import begin as study

    make = study.begin_sample_campaign if sample else study.begin_campaign
    common.report(make(common.new_database(db), common.stamp(observer)), json=json, quiet=quiet)
