"""``campaign upcoming``: the main job."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import AsOfOption, DbOption, JsonOption, option
from campaign.commands.parsing import clock_instant, count, one_of, plain_number

Text = str | None
DEFAULT_WITHIN = "5yr"


def upcoming(
    within: Annotated[
        Text, option("--within", "SPAN", f"From now on, as 5yr or 90d; else {DEFAULT_WITHIN}.")
    ] = None,
    from_: Annotated[Text, option("--from", "INSTANT", "Start of the period, in place of now.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "End of the period.")] = None,
    system: Annotated[
        list[str],
        typer.Option(
            "--system", metavar="SYSTEM", help="Only this one; may be repeated.", show_default=False
        ),
    ] = [],  # noqa: B006 - typer copies it
    event: Annotated[
        list[str],
        typer.Option(
            "--event",
            metavar="EVENT",
            help="periastron, onset, maximum, end, 'A in front', 'B in front', resolvable; may be repeated.",
            show_default=False,
        ),
    ] = [],  # noqa: B006 - typer copies it
    resolution: Annotated[
        Text,
        option("--resolution", "ANGLE", "Also when shells become resolvable at it, as 0.1arcsec."),
    ] = None,
    min_probability: Annotated[
        Text, option("--min-probability", "P", "Only events with at least this probability in the period.")
    ] = None,
    solutions: Annotated[
        bool, typer.Option("--solutions", help="Every solution of a system side by side.", show_default=False)
    ] = False,
    sample: Annotated[
        bool,
        typer.Option("--sample", help="On the invented sample campaign, no database.", show_default=False),
    ] = False,
    known_at: Annotated[Text, option("--known-at", "INSTANT", "Hide entries made after it.")] = None,
    draws: Annotated[Text, option("--draws", "N", "Random draws a forecast; else 20000.")] = None,
    seed: Annotated[Text, option("--seed", "N", "Of the random draws; else 1.")] = None,
    as_of: AsOfOption = None,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """The episodes to come: when, how sure, and why.

    \b
    For example:
      campaign upcoming --within 5yr
      campaign upcoming --system "Lantern 3"   # its forecast step by step
      campaign upcoming --event onset --from 2030-01-01 --until 2032-01-01
      campaign upcoming --resolution 0.1arcsec # and when shells can be told apart
      campaign upcoming --sample               # on an invented campaign
    """
    from campaign.output import upcoming_document as documents
    from campaign.studies import watch

    names = system or None
    asked = clock_instant(as_of, "--as-of")
    resolved = plain_number(
        resolution, "arcsec", "--resolution", low=0.0, low_open=True, high=3600.0, shown="0.1 arcsec"
    )
    if sample:
        common.refuse_with_sample(db, known_at=known_at)
        campaign = watch.load_sample_campaign(names, with_shells=resolved is not None)
    else:
        entered = clock_instant(known_at, "--known-at")
        campaign = watch.load_campaign(
            common.database(db), names, entered, asked, with_shells=resolved is not None
        )
    question = watch.ask(
        campaign,
        now=common.now_utc(),
        as_of=asked,
        start=clock_instant(from_, "--from"),
        end=clock_instant(until, "--until"),
        within_d=_span(within),
        events=tuple(_event(e) for e in event),
        min_probability=_fraction(min_probability),
        draws=count(draws, "--draws", 100, 1_000_000),
        seed=count(seed, "--seed", 0, 2**32 - 1),
        solutions="each" if solutions else "adopted",
        resolution_arcsec=resolved,
    )
    if names is not None and len(names) == 1 and not solutions:
        explained = watch.explain(campaign, question)
        if json:
            common.write_json(documents.upcoming_json(explained.upcoming, explained))
        else:
            from campaign.output.explain import render_explained

            render_explained(common.stdout_screen(), explained)
        return
    result = watch.upcoming(campaign, question)
    if json:
        common.write_json(documents.upcoming_json(result))
    else:
        from campaign.output.upcoming import render_upcoming

        render_upcoming(common.stdout_screen(), result)


def _span(text: str | None) -> float | None:
    if text is None:
        return None
    from campaign.reading.instants import read_duration

    days: float = read_duration(text, name="--within")
    return days


def _event(text: str):  # type: ignore[no-untyped-def]
    from campaign.model.forecasts import EVENT_NAMES

    return one_of(text, EVENT_NAMES, "--event")


def _fraction(text: str | None) -> float:
    if text is None:
        return 0.0
    return plain_number(text, "fraction", "--min-probability", low=0.0, high=1.0, shown="0.5") or 0.0
