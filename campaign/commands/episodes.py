"""``campaign episodes``: dated bursts."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, ObserverOption, QuietOption, option
from campaign.commands.parsing import plain, whole_number

Text = str | None


def add(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    onset: Annotated[Text, option("--onset", "INSTANT", 'When production began: "2019-03-14±5 d".')] = None,
    maximum: Annotated[Text, option("--maximum", "INSTANT", "When it was greatest.")] = None,
    end: Annotated[Text, option("--end", "INSTANT", "When production ended.")] = None,
    band: Annotated[
        Text, option("--band", "BAND", "The band that it was dated in; else production itself.")
    ] = None,
    method: Annotated[Text, option("--method", "TEXT", "How it was dated.")] = None,
    cycle: Annotated[Text, option("--cycle", "N", "The system's cycle; else counted from the dates.")] = None,
    source: Annotated[Text, option("--source", "TEXT", "Who published it and where.")] = None,
    note: Annotated[Text, option("--note", "TEXT", "Anything worth knowing.")] = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Add a confirmed episode with the dates known of it.

    \b
    For example:
      campaign episodes add "Lantern 3" --onset "2019-03-14±5 d" \\
        --maximum 2019-06 --band K --source "..."
    """
    from campaign.model.systems import Episode
    from campaign.reading.instants import read_instant
    from campaign.studies import episodes as study

    how = plain(method, "--method", 80)
    where = plain(band, "--band", 24)
    dates = {
        stage: (read_instant(text, name=f"--{stage}"), where, how)
        for stage, text in (("onset", onset), ("maximum", maximum), ("end", end))
        if text is not None
    }
    draft = Episode(
        id=0,
        system_id=0,
        cycle=None if cycle is None else whole_number(cycle, "--cycle", 1_000_000, 11),
        source=plain(source, "--source", 400) or "",
        note=plain(note, "--note", 2000) or "",
    )
    kept = study.add_episode(common.database(db), common.stamp(observer), system, draft, dates)
    common.report(kept, json=json, quiet=quiet)


def list_(
    system: Annotated[str | None, typer.Argument(metavar="[SYSTEM]", help="Else of every system.")] = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """The dated episodes, oldest first."""
    from campaign.output import systems as output
    from campaign.studies import episodes as study

    found = study.list_episodes(common.database(db), system)
    if json:
        common.write_json(output.episodes_json(found, common.now_iso()))
    else:
        output.render_episodes(common.stdout_screen(), found)
