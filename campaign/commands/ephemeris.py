"""``campaign ephemeris``: the dated table of one orbit."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import AsOfOption, DbOption, JsonOption, option
from campaign.commands.parsing import clock_instant

Text = str | None


def ephemeris(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    from_: Annotated[Text, option("--from", "INSTANT", "First line; else now.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "Last line; else one period later.")] = None,
    step: Annotated[Text, option("--step", "SPAN", "As 30d; else a fortieth of the span.")] = None,
    solution: Annotated[Text, option("--solution", "LABEL", "Else the adopted one.")] = None,
    sample: Annotated[
        bool,
        typer.Option("--sample", help="On the invented sample campaign, no database.", show_default=False),
    ] = False,
    as_of: AsOfOption = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """Phase, true anomaly, separation, position and velocities, dated.

    \b
    For example:
      campaign ephemeris "Lantern 3" --from 2031-01-01 --until 2032-01-01 \\
        --step 30d
    """
    from campaign.output import ephemeris as output
    from campaign.reading.instants import read_duration
    from campaign.studies import watch

    asked = clock_instant(as_of, "--as-of")
    if sample:
        common.refuse_with_sample(db)
        campaign = watch.load_sample_campaign([system])
    else:
        campaign = watch.load_campaign(common.database(db), [system], None, asked)
    result = watch.tabulate(
        campaign,
        now=common.now_utc(),
        as_of=asked,
        start=clock_instant(from_, "--from"),
        end=clock_instant(until, "--until"),
        step_d=None if step is None else read_duration(step, name="--step"),
        label=solution,
    )
    if json:
        common.write_json(output.ephemeris_json(result))
    else:
        output.render_ephemeris(common.stdout_screen(), result)
