"""``campaign observations``: what was logged and loaded."""

from __future__ import annotations

from typing import Annotated

import typer

from campaign.commands import common
from campaign.commands.common import DbOption, JsonOption, option
from campaign.commands.parsing import clock_instant, one_of, plain, upper_bound

Text = str | None
Many = list[str] | None


def observations(
    system: Annotated[
        str | None, typer.Argument(metavar="[SYSTEM]", help="Else of every system.", show_default=False)
    ] = None,
    kind: Annotated[
        Many, option("--kind", "KIND", "photometry, flux, velocity, ...; may be repeated.")
    ] = None,
    band: Annotated[Many, option("--band", "BAND", "As it is written, K or Ks; may be repeated.")] = None,
    from_: Annotated[Text, option("--from", "INSTANT", "Observed then or later.")] = None,
    until: Annotated[Text, option("--until", "INSTANT", "Observed then or before.")] = None,
    site: Annotated[Text, option("--site", "SITE", "Observed there.")] = None,
    source: Annotated[Text, option("--source", "TEXT", "A part of the source's title.")] = None,
    quality: Annotated[Many, option("--quality", "WORD", "good, doubtful, bad; may be repeated.")] = None,
    limit: Annotated[Text, option("--limit", "N", "The latest so many; else 100; 0 for all.")] = None,
    withdrawn: Annotated[
        bool, typer.Option("--withdrawn", help="Also those out of use, and why they are.", show_default=False)
    ] = False,
    draw: Annotated[
        bool, typer.Option("--draw", help="Draw the values against time instead.", show_default=False)
    ] = False,
    db: DbOption = None,
    json: JsonOption = False,
) -> None:
    """List observations with their numbers, or draw them."""
    from campaign.model.observations import OBSERVATION_KINDS
    from campaign.studies.observations import Wanted

    wanted = Wanted(
        system=system,
        kinds=_words(kind, OBSERVATION_KINDS, "--kind"),
        bands=None if not band else tuple(plain(each, "--band", 50) or "" for each in band),
        since=clock_instant(from_, "--from"),
        until=clock_instant(until, "--until"),
        site=site,
        source=plain(source, "--source", 500) or None,
        qualities=_words(quality, ("good", "doubtful", "bad"), "--quality"),
        out_of_use=withdrawn,
    )
    place = common.database(db)
    if draw and not json:
        from campaign.output.lightcurve import render_curves
        from campaign.studies.curves import curves_of

        render_curves(common.stdout_screen(), curves_of(place, wanted))
        return
    from campaign.output import observations as output
    from campaign.studies.observations import list_observations

    found = list_observations(place, wanted, upper_bound(limit, 100))
    if json:
        common.write_json(output.observations_json(found, common.now_iso()))
        return
    output.render_observations(common.stdout_screen(), found)
    for warning in found.warnings:
        common.tell(f"Warning: {warning}")
    if len(found.rows) < found.found:
        common.tell(
            f"These are the latest {len(found.rows):,} of {found.found:,}; --limit 0 shows all of them, "
            "and a filter fewer."
        )


def _words(texts: Many, accepted: tuple[str, ...], name: str) -> tuple[str, ...] | None:
    if not texts:
        return None
    return tuple(word for text in texts if (word := one_of(text, accepted, name)) is not None)
