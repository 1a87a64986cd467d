"""``campaign refine``: period and epoch from dated episodes."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import AsOfOption, DbOption, JsonOption, ObserverOption, QuietOption, option
from campaign.commands.parsing import clock_instant, one_of, plain, whole_number
from campaign.errors import UsageRefused

Text = str | None
_EVENTS = ("onset", "maximum", "both")


def refine(
    system: Annotated[str, typer.Argument(metavar="SYSTEM", help="Name or alias.")],
    event: Annotated[
        Text, option("--event", "WHICH", "onset, maximum, or both with their offset; else onset.")
    ] = None,
    count: Annotated[
        Text, option("--count", "N", "Take this way to count the cycles, of those listed.")
    ] = None,
    orbit: Annotated[
        Text, option("--orbit", "LABEL", "Compare with this solution; else the adopted one.")
    ] = None,
    alone: Annotated[
        bool, typer.Option("--alone", help="The episodes alone, without any orbit.", show_default=False)
    ] = False,
    changing: Annotated[
        bool, typer.Option("--changing", help="See whether the period changes.", show_default=False)
    ] = False,
    all_counts: Annotated[
        bool, typer.Option("--all-counts", help="List excluded ways to count too.", show_default=False)
    ] = False,
    keep: Annotated[Text, option("--keep", "LABEL", "Keep the refined solution under this label.")] = None,
    adopt: Annotated[
        bool,
        typer.Option("--adopt", help="With --keep: forecast from it from now on.", show_default=False),
    ] = False,
    sample: Annotated[
        bool,
        typer.Option("--sample", help="On the invented sample campaign, no database.", show_default=False),
    ] = False,
    as_of: AsOfOption = None,
    known_at: Annotated[Text, option("--known-at", "INSTANT", "Hide entries made after it.")] = None,
    db: DbOption = None,
    observer: ObserverOption = None,
    json: JsonOption = False,
    quiet: QuietOption = False,
) -> None:
    """Period and epoch from dated episodes, and what would change.

    \b
    For example:
      campaign refine "Lantern 3"
      campaign refine "Lantern 3" --event both --keep "dust 2031" --adopt
    """
    from campaign.output import refine as output
    from campaign.studies import refine as study
    from campaign.studies import watch

    label = plain(keep, "--keep", 80)
    _refuse_odd(label, adopt, sample, alone, orbit)
    asked = clock_instant(as_of, "--as-of")
    if sample:
        common.refuse_with_sample(db, known_at)
        campaign = watch.load_sample_campaign([system])
    else:
        place = common.database(db)
        if label is not None:
            from campaign.studies.refine_keep import refuse_label

            refuse_label(place, system, label)
        campaign = watch.load_campaign(place, [system], clock_instant(known_at, "--known-at"), asked)
    question = study.RefineQuestion(
        as_of=study.asked_at(campaign, common.now_utc(), asked),
        event=one_of(event, _EVENTS, "--event"),
        count=None if count is None else whole_number(count, "--count", 1000, 2),
        orbit=plain(orbit, "--orbit", 80),
        alone=alone,
        curved=changing,
        label=label or "refined",
    )
    refined = study.refine(campaign, question)
    kept = None
    if label is not None:
        from campaign.studies.refine_keep import keep_refined

        kept = keep_refined(common.database(db), common.stamp(observer), refined, adopt=adopt)
    if json:
        common.write_json(output.refinement_json(refined.result, None if kept is None else kept.data))
        return
    output.render_refinement(common.stdout_screen(), refined.result, every_count=all_counts)
    for warning in refined.result.warnings:
        common.tell(f"Warning: {warning}", quiet=quiet)
    if kept is not None:
        common.report(kept, json=False, quiet=quiet)


def _refuse_odd(label: Text, adopt: bool, sample: bool, alone: bool, orbit: Text) -> None:
    if adopt and label is None:
        raise UsageRefused(
            "--adopt has nothing to adopt.",
            why="A refined solution is adopted as it is kept, under a label.",
            hint='For example --keep "dust 2031" --adopt.',
            code="label-missing",
        )
    if label is not None and sample:
        raise UsageRefused(
            "--keep does not go with --sample.",
            why="The sample campaign is made anew each time, without any database.",
            hint="Keep the sample in a database first: campaign begin --sample --db sample.db",
            code="sample-alone",
        )
    if alone and orbit is not None:
        raise UsageRefused(
            "--alone does not go with --orbit.",
            why="One leaves every orbit out, the other names one.",
            hint="Leave one of them out.",
            code="options-conflict",
        )
