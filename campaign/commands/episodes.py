"""``campaign episodes``: dated bursts."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import (
    AsOfOption,
    DbOption,
    JsonOption,
    ObserverOption,
    QuietOption,
    option,
)
from campaign.commands.parsing import clock_instant, count, entry_number, plain, whole_number

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


def find(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    band: Annotated[
        list[str] | None, option("--band", "BAND", "Only this band, as it is written; may be repeated.")
    ] = None,
    episode: Annotated[
        Text, option("--episode", "N", "Draw the curve around this one of those found.")
    ] = None,
    levels: Annotated[
        bool, typer.Option("--levels", help="Show the stars' level in each source too.", show_default=False)
    ] = False,
    propose: Annotated[
        bool,
        typer.Option("--propose", help="Enter those not known yet, to be confirmed.", show_default=False),
    ] = False,
    as_of: AsOfOption = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Find episodes in the light curve: onset, maximum, end.

    \b
    For example:
      campaign episodes find "Lantern 3" --band K
      campaign episodes find "Lantern 3" --propose
    """
    from campaign.output import episodes as output
    from campaign.studies.decide_episodes import propose_episodes
    from campaign.studies.find_episodes import find_episodes

    place = common.database(db)
    bands = tuple(name for each in band or () if (name := plain(each, "--band", 50)))
    found = find_episodes(place, system, bands or None, clock_instant(as_of, "--as-of"))
    drawn = None if episode is None else count(episode, "--episode", 1, max(len(found.episodes), 1))
    kept = propose_episodes(place, common.stamp(observer), found) if propose else None
    if json:
        proposed = None if kept is None else kept.data["ids"]
        common.write_json(output.found_json(found, common.now_iso(), proposed))
        return
    output.render_found(common.stdout_screen(), found, drawn=drawn, levels=levels)
    for warning in found.warnings:
        common.tell(warning, quiet=quiet)
    if kept is not None:
        common.report(kept, json=False, quiet=quiet)


def confirm(
    numbers: Annotated[list[str], typer.Argument(metavar="N", help="Numbers of episodes.")],
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Confirm proposed episodes: from now on they are knowledge."""
    _decide(numbers, db, observer, confirm=True, json=json, quiet=quiet)


def reject(
    numbers: Annotated[list[str], typer.Argument(metavar="N", help="Numbers of episodes.")],
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Reject episodes: they stay, and count for nothing."""
    _decide(numbers, db, observer, confirm=False, json=json, quiet=quiet)


def _decide(numbers: list[str], db: Text, observer: Text, *, confirm: bool, json: bool, quiet: bool) -> None:
    from campaign.studies.decide_episodes import decide_episodes

    wanted = [entry_number(number, "N") for number in numbers]
    kept = decide_episodes(common.database(db), common.stamp(observer), wanted, confirm=confirm)
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
