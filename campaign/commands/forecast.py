"""``campaign forecast``: keep what is forecast, and see how well it did."""

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
from campaign.commands.parsing import clock_instant, count, one_of, plain

Text = str | None
SystemsOption = Annotated[
    list[str],
    typer.Option("--system", metavar="SYSTEM", help="Only this one; may be repeated.", show_default=False),
]
DrawsOption = Annotated[Text, option("--draws", "N", "Random draws a forecast; else 20000.")]
SeedOption = Annotated[Text, option("--seed", "N", "Of the random draws; else 1.")]


def keep(
    label: Annotated[Text, option("--label", "TEXT", "A name for what is kept, for later.")] = None,
    within: Annotated[Text, option("--within", "SPAN", "How far ahead, as 10yr or 90d; else 5yr.")] = None,
    system: SystemsOption = [],  # noqa: B006 - typer copies it
    known_at: Annotated[Text, option("--known-at", "INSTANT", "Hide entries made after it.")] = None,
    draws: DrawsOption = None,
    seed: SeedOption = None,
    as_of: AsOfOption = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Keep today's forecasts as they are, to be scored later.

    \b
    For example:
      campaign forecast keep
      campaign forecast keep --label "spring 2031" --within 10yr
    """
    from campaign.reading.instants import read_duration
    from campaign.studies import watch
    from campaign.studies.keep_forecasts import keep_forecasts

    place, name = common.database(db), plain(label, "--label", 100)
    asked, entered = clock_instant(as_of, "--as-of"), clock_instant(known_at, "--known-at")
    stamp = common.stamp(observer)
    campaign = watch.load_campaign(place, system or None, entered, asked)
    question = watch.ask(
        campaign,
        now=stamp.at,
        as_of=asked,
        start=None,
        end=None,
        within_d=None if within is None else read_duration(within, name="--within"),
        events=(),
        min_probability=0.0,
        draws=count(draws, "--draws", 100, 1_000_000),
        seed=count(seed, "--seed", 0, 2**31 - 1),
        solutions="adopted",
    )
    kept = keep_forecasts(place, stamp, campaign, question, label=name, known_at=entered)
    common.report(kept, json=json, quiet=quiet)


def list_(
    keeping: Annotated[
        str | None, typer.Argument(metavar="[KEEPING]", help="Number or label: show its forecasts.")
    ] = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """What forecasts are kept, or the forecasts of one keeping.

    \b
    For example:
      campaign forecast list
      campaign forecast list 1
    """
    from campaign.output import forecasts_kept as output
    from campaign.studies.keep_forecasts import list_kept

    found = list_kept(common.database(db), keeping)
    if json:
        common.write_json(output.kept_json(found, common.now_iso()))
    else:
        output.render_kept(common.stdout_screen(), found)


def score(
    keeping: Annotated[
        Text, option("--keeping", "KEEPING", "Only this one of what was kept, by number or label.")
    ] = None,
    system: SystemsOption = [],  # noqa: B006 - typer copies it
    as_of: AsOfOption = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """How well kept forecasts did, by what was confirmed since.

    \b
    For example:
      campaign forecast score
      campaign forecast score --system "Lantern 3"
    """
    from campaign.output import forecasts_kept as output
    from campaign.studies import watch
    from campaign.studies.score_forecasts import score_forecasts

    place = common.database(db)
    today = watch.today_of(place, common.now_utc(), clock_instant(as_of, "--as-of"))
    scores = score_forecasts(place, today, names=system or None, keeping=keeping)
    if json:
        common.write_json(output.scores_json(scores))
    else:
        output.render_scores(common.stdout_screen(), scores)


def rehearse(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    lead: Annotated[
        list[str],
        typer.Option(
            "--lead", metavar="SPAN", help="How long before, as 1yr or 90d; may be repeated. Else 1yr.",
            show_default=False,
        ),
    ] = [],  # noqa: B006 - typer copies it
    event: Annotated[
        list[str],
        typer.Option(
            "--event", metavar="EVENT", help="onset, maximum or end; may be repeated. Else onset.",
            show_default=False,
        ),
    ] = [],  # noqa: B006 - typer copies it
    entered_any_time: Annotated[
        bool,
        typer.Option("--entered-any-time", help="Use entries made later too.", show_default=False),
    ] = False,
    draws: DrawsOption = None,
    seed: SeedOption = None,
    as_of: AsOfOption = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:  # fmt: skip
    """Forecast past episodes from what was known before them.

    \b
    For example:
      campaign forecast rehearse "Lantern 3" --lead 90d --lead 1yr
      campaign forecast rehearse "Lantern 3" --entered-any-time
    """
    from campaign.output import forecasts_kept as output
    from campaign.reading.instants import read_duration
    from campaign.studies import watch
    from campaign.studies.rehearse import DEFAULT_LEADS_D
    from campaign.studies.rehearse import rehearse as study

    place = common.database(db)
    today = watch.today_of(place, common.now_utc(), clock_instant(as_of, "--as-of"))
    stages = tuple(dict.fromkeys(one_of(each, ("onset", "maximum", "end"), "--event") for each in event))
    scores = study(
        place,
        system,
        today,
        tuple(read_duration(each, name="--lead") for each in lead) or DEFAULT_LEADS_D,
        stages or ("onset",),  # type: ignore[arg-type]
        draws=count(draws, "--draws", 100, 1_000_000),
        seed=count(seed, "--seed", 0, 2**31 - 1),
        entered_any_time=entered_any_time,
    )
    if json:
        common.write_json(output.scores_json(scores))
    else:
        output.render_scores(common.stdout_screen(), scores)
